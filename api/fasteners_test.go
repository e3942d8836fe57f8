package api_test

import (
	"encoding/json"
	"math"
	"net/http"
	"slices"
	"strings"
	"testing"

	"jointledger/store/storetest"
)

// spoiled is a change that a request does not survive: the pointers that are
// expected, and what the details must say.
type spoiled struct {
	why      string
	changes  map[string]any
	pointers []string
	says     string
}

func refuseAll(t *testing.T, c client, target string, body []byte, table []spoiled) {
	t.Helper()
	for _, bad := range table {
		a := c.do(t, post(target, edited(t, body, bad.changes)))
		if a.status != http.StatusUnprocessableEntity {
			t.Errorf("%s, %s: status %d: %.300s", target, bad.why, a.status, a.body)
			continue
		}
		details := ""
		for _, e := range a.problem.Errors {
			details += e.Detail + "; "
		}
		if !slices.Equal(a.pointers(), bad.pointers) || !strings.Contains(details, bad.says) {
			t.Errorf("%s, %s: at %q (%s), want %q saying %q", target, bad.why, a.pointers(), details, bad.pointers, bad.says)
		}
	}
}

// TestSplicesThatCannotBe: what no calculation can answer is refused where it
// stands, and a free motion is named.
func TestSplicesThatCannotBe(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	bay := object{"thickness": 0.1, "width": 1.25}
	pair := func(id string, first int) object {
		return object{"id": id, "e": 1.05e7, "first_row": first, "last_row": first + 1, "bays": []any{bay}}
	}
	table := []spoiled{
		{"unbalanced end loads", object{"/load_cases/0/ends/0/left": 990}, []string{"/load_cases/0/ends"}, "out of balance by 10 lbf"},
		{"an end load of nobody", object{"/load_cases/0/ends/0/member": "skin"}, []string{"/load_cases/0/ends/0/member"}, `no member "skin"`},
		{"a member twice", object{"/load_cases/0/ends/1/member": "cap"}, []string{"/load_cases/0/ends/1/member"}, "named twice"},
		{"a member without a path", object{
			"/members":           []any{pair("cap", 1), pair("strap", 1), object{"id": "stub", "e": 1.05e7, "first_row": 3, "last_row": 4, "bays": []any{bay}}},
			"/load_cases/0/ends": []any{},
		}, []string{"/members", "/members/2"}, `the member "stub" has no path`},
		{"rows outside a member", object{"/members/1/last_row": 5}, []string{"/members/1/last_row"}, "allowed are rows 1 to 4"},
		{"a first row after the last", object{"/members/1/first_row": 3, "/members/1/last_row": 2, "/members/1/bays": []any{}}, []string{"/members/1/last_row"}, "allowed are rows 3 to 4"},
		{"too few bays", object{"/members/0/bays": []any{bay}}, []string{"/members/0/bays"}, "found 1 bays"},
		{"too few pitches", object{"/pitches": []any{1, 1}}, []string{"/pitches"}, "found 2 pitches"},
		{
			"a mechanism",
			object{
				"/members":                   []any{pair("cap", 1), pair("strap", 1), pair("stub", 3), pair("plate", 3)},
				"/load_cases/0/ends":         []any{},
				"/load_cases/0/temperatures": []any{object{"member": "cap", "change": 10}},
			},
			[]string{"/members"},
			"no member runs from row 2 to row 3",
		},
		{"negative compliance", object{"/rows/2/compliance": -2.5e-6}, []string{"/rows/2/compliance"}, "must be more than 0"},
		{"no compliance", object{"/rows/2/compliance": removed}, []string{"/rows/2/compliance"}, "more than 0"},
		{"an unknown formula", object{"/compliance": "spring"}, []string{"/compliance"}, "no compliance formula"},
		{"a type of another size", object{"/rows/1/type": "unf-5/16-fsu95"}, []string{"/rows/1/diameter"}, "0.3125 in"},
		{"a type of no catalogue", object{"/rows/1/type": "unf-5/16-fsu96"}, []string{"/rows/1/type"}, "/v1/fastener-types"},
		{"a preload of nothing", object{"/rows/1/type": object{"preload": object{"torque": 50}}}, []string{"/rows/1/type/preload"}, "nut_factor"},
	}
	body := example(t, "calculateSplice", "capSplice")
	refuseAll(t, c, "/v1/splices", body, table)

	steps := example(t, "findSpliceSteps", "evenCap")
	refuseAll(t, c, "/v1/splices/steps", steps, []spoiled{
		{"unbalanced end loads", object{"/input/load_cases/0/ends/0/left": 990}, []string{"/input/load_cases/0/ends"}, "out of balance"},
		{"bounds of nobody", object{"/bounds/1/member": "skin"}, []string{"/bounds/1/member"}, "skin"},
		{"bounds that cross", object{"/bounds/1/least": 0.3}, []string{"/bounds/1/most"}, ""},
		{"a bay that is not there", object{"/bounds/0/bay": 4}, []string{"/bounds/0/bay"}, ""},
		{"no peak", object{"/goal": "least-volume"}, []string{"/peak"}, ""},
	})
}

// TestPatternsThatCannotBe.
func TestPatternsThatCannotBe(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	body := example(t, "calculateFastenerGroup", "everyChoice")
	many := make([]any, 1001)
	for i := range many {
		many[i] = []any{math.Cos(float64(i) / 200), math.Sin(float64(i) / 200)}
	}
	refuseAll(t, c, "/v1/fastener-groups", body, []spoiled{
		{
			"slots that leave a turn free",
			object{"/fasteners/1/slot_angle": 0, "/fasteners/2/slot_angle": 180},
			[]string{"/load_cases/0/moment", "/load_cases/1/point"},
			"free to turn about the point (0 in, ",
		},
		{
			"slots that leave a slide free",
			object{"/fasteners/1/slot_angle": 0, "/fasteners/2/slot_angle": 180, "/fasteners/1/x": 1},
			[]string{"/load_cases/0/force", "/load_cases/1/force"},
			"free to slide along 0° from the x axis",
		},
		{"a hole below the diameter", object{"/fasteners/1/hole_diameter": 0.49}, []string{"/fasteners/1/hole_diameter"}, "0.5 in"},
		{"a type of another size", object{"/fasteners/1/diameter": 0.375}, []string{"/fasteners/1/diameter"}, "is of 0.5 in"},
		{"no such type", object{"/fasteners/1/type": "unf-1/2"}, []string{"/fasteners/1/type"}, "/v1/fastener-types"},
		{"an unknown head", object{"/fasteners/2/type/head": "hexagonal"}, []string{"/fasteners/2/type/head"}, "countersunk-shear"},
		{"two preloads", object{"/fasteners/2/type/preload/nominal": 4000}, []string{"/fasteners/2/type/preload/torque"}, "beside nominal"},
		{"scatter of everything", object{"/fasteners/2/type/preload/scatter": 1}, []string{"/fasteners/2/type/preload"}, "below 1"},
		{"an unknown method", object{"/methods": []any{"elementary", "johnson"}, "/method_options": object{}}, []string{"/methods/1"}, "en-1993-1-8"},
		{"an unknown revision", object{"/methods": []any{"elementary@2"}, "/method_options": object{}}, []string{"/methods/0"}, "no method"},
		{"a method twice", object{"/methods": []any{"elementary", "elementary@1"}, "/method_options": object{}}, []string{"/methods/1"}, "named twice"},
		{"no method", object{"/methods": []any{}, "/method_options": object{}}, []string{"/methods"}, "at least 1"},
		{"options of an idle method", object{"/methods": []any{"elementary"}}, []string{"/method_options/aisc-360-j3", "/method_options/en-1993-1-8"}, "not in methods"},
		{"a basis of no kind", object{"/method_options/aisc-360-j3/basis": "wsd"}, []string{"/method_options/aisc-360-j3/basis"}, "lrfd"},
		{"γ_M2 below 1", object{"/method_options/en-1993-1-8/gamma_m2": 0.9}, []string{"/method_options/en-1993-1-8/gamma_m2"}, "from 1"},
		{"no such rules", object{"/rules/0": "custom"}, []string{"/rules/0"}, "/v1/rules"},
		{"rules twice", object{"/rules/1": "en-1993-1-8@1"}, []string{"/rules/1"}, "named before"},
		{"own rules of a built-in name", object{"/rules/1/id": "aisc-360"}, []string{"/rules/1/id"}, "another set"},
		{"an unknown measure", object{"/rules/1/rules/0/measure": "gauge"}, []string{"/rules/1/rules/0/measure"}, "gauge"},
		{"an unknown severity", object{"/rules/1/rules/0/severity": "fatal"}, []string{"/rules/1/rules/0/severity"}, "violation"},
		{"a rule of nothing", object{"/rules/1/rules/0/diameters": 0}, []string{"/rules/1/rules/0/diameters"}, "more than 0"},
		{"own rules without one", object{"/rules/1/rules": []any{}}, []string{"/rules/1/rules"}, "at least"},
		{"a formula without plates", object{"/plates": []any{}, "/out_of_plane": "centroid"}, []string{"/plates"}, "first two plates"},
		{"a formula without a modulus", object{"/fasteners/1/e": removed}, []string{"/fasteners/1/e"}, "2"},
		{"an unknown stiffness", object{"/stiffness": "rigid"}, []string{"/stiffness"}, "tate-rosenfeld"},
		{"an outline of 1,001 corners", object{"/plates/0/outline": many}, []string{"/plates/0/outline"}, "at most 1000"},
	})
	sizing := example(t, "sizeFastenerGroup", "boltsOfBracket")
	refuseAll(t, c, "/v1/fastener-groups/sizing", sizing, []spoiled{
		{"no diameters", object{"/diameters": []any{}, "/types": []any{}}, []string{"/diameters"}, "at least 1"},
		{"too few types", object{"/types": []any{"unf-10-fsu95"}}, []string{"/types"}, "3 diameters"},
		{"a type of another size", object{"/types/1": "unf-10-fsu95"}, []string{"/types/1"}, "0.19 in"},
		{"no such type", object{"/types/2": "m5"}, []string{"/types/2"}, "/v1/fastener-types"},
		{"a negative margin", object{"/target_margin": -0.1}, []string{"/target_margin"}, "0 or more"},
		{"a type that belongs to one diameter", object{"/types": removed, "/input/fasteners/0/type": "unf-1/4-fsu95"}, []string{"/input/fasteners/0/type"}, "belongs to one diameter"},
		{"an input that cannot be", object{"/input/fasteners/1/id": "1"}, []string{"/input/fasteners/1/id"}, "that of element 0"},
		{"fasteners in one place", object{"/input/fasteners/1/y": 0}, []string{"/input/fasteners/1/x"}, "same place"},
	})
}

// sized is an answer to a question of size.
type sized struct {
	Value     *float64
	Governing *struct{ Margin float64 }
	Reason    *string
	Result    *struct{ Verdict string }
	Trials    []struct {
		Diameter float64
		Holds    bool
		Margin   *float64
		Reason   *string
	}
}

func TestSizingOfPatterns(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	body := example(t, "sizeFastenerGroup", "boltsOfBracket")
	ask := func(changes map[string]any) (s sized) {
		c.do(t, post("/v1/fastener-groups/sizing?workings=none", edited(t, body, changes))).decode(t, http.StatusOK, &s)
		return s
	}
	// By hand: 1,500 lbf on A_t = 0.7854 (D - 0.9743/n)², 0.0200 in² of 10-32
	// and 0.0364 in² of 1/4-28 (ASME B1.1), at 95,000 psi.
	s := ask(nil)
	if s.Value == nil || *s.Value != 0.25 || len(s.Trials) != 2 || s.Trials[0].Holds || s.Reason != nil || s.Result.Verdict != "adequate" {
		t.Fatalf("%+v", s)
	}
	for i, area := range []float64{0.0200, 0.0364} {
		if by := 95000*area/1500 - 1; math.Abs(*s.Trials[i].Margin-by) > 0.005 {
			t.Errorf("trial %d: margin %v, by hand %v", i, *s.Trials[i].Margin, by)
		}
	}
	if s.Governing.Margin != *s.Trials[1].Margin {
		t.Errorf("the margin is %v, of its trial %v", s.Governing.Margin, *s.Trials[1].Margin)
	}
	if s = ask(object{"/target_margin": 0}); *s.Value != 0.19 {
		t.Errorf("without a margin %v", *s.Value)
	}
	s = ask(object{"/target_margin": 9})
	if s.Value != nil || s.Result != nil || s.Reason == nil || len(s.Trials) != 3 || s.Trials[2].Reason == nil {
		t.Errorf("of a margin that none reaches: %+v", s)
	}
	if s = ask(object{"/types": removed}); s.Value != nil || s.Trials[0].Reason == nil {
		t.Errorf("without any check: %+v", s)
	}
}

// quantities are the dimensions of members of requests, as powers of force and
// of length.
var quantities = map[string][2]int{
	"x": {0, 1}, "y": {0, 1}, "diameter": {0, 1}, "hole_diameter": {0, 1}, "thickness": {0, 1}, "countersink_depth": {0, 1},
	"head_diameter": {0, 1}, "pitch": {0, 1}, "point": {0, 1}, "outline": {0, 1}, "length": {0, 1}, "cap": {0, 1}, "width": {0, 1},
	"row_thickness": {0, 1}, "pitches": {0, 1}, "edge_distance": {0, 1}, "clearance": {0, 1}, "packing_thickness": {0, 1},
	"diameters": {0, 1}, "least": {0, 1}, "most": {0, 1},
	"shear_strength": {1, 0}, "tension_strength": {1, 0}, "force": {1, 0}, "pull_through_strength": {1, 0}, "nominal": {1, 0},
	"thermal_gain": {1, 0}, "thermal_loss": {1, 0}, "left": {1, 0}, "right": {1, 0},
	"fsu": {1, -2}, "ftu": {1, -2}, "e": {1, -2}, "moment": {1, 1}, "torque": {1, 1}, "compliance": {-1, 1},
}

// inSI turns a request in US units into one in SI.
func inSI(t *testing.T, body []byte) []byte {
	t.Helper()
	var turn func(v any, by float64) any
	turn = func(v any, by float64) any {
		switch v := v.(type) {
		case float64:
			return v * by
		case []any:
			for i := range v {
				v[i] = turn(v[i], by)
			}
		case map[string]any:
			inRule := v["measure"] != nil
			for name, member := range v {
				q := quantities[name]
				if inRule && name == "diameters" {
					q = [2]int{}
				}
				v[name] = turn(member, math.Pow(4.4482216152605, float64(q[0]))*math.Pow(25.4, float64(q[1])))
			}
		}
		return v
	}
	var root map[string]any
	if err := json.Unmarshal(body, &root); err != nil {
		t.Fatal(err)
	}
	turn(root, 1)
	units := root
	if input, ok := root["input"].(map[string]any); ok {
		units = input
	}
	if units["units"] != "US" {
		t.Fatal("the request is not in US units")
	}
	units["units"] = "SI"
	out, err := json.Marshal(root)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// judged is what an answer must say in any units.
type judged struct {
	Verdict string
	Checks  []struct {
		Member, Mode, Level, Status, Method string
		LoadCase                            string `json:"load_case"`
		Fastener                            *string
		Row                                 *int
		Margin                              *float64
	}
	Workings []struct{ Symbol, Member string }
	Findings []struct{ Severity, Code, Subject string }
}

// TestFastenersInBothUnits: the same joint in SI and in US has the same
// margins, steps and findings.
func TestFastenersInBothUnits(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	for _, what := range [][3]string{
		{"/v1/fastener-groups", "calculateFastenerGroup", "boltPattern"},
		{"/v1/fastener-groups", "calculateFastenerGroup", "everyChoice"},
		{"/v1/splices", "calculateSplice", "capSplice"},
		{"/v1/splices", "calculateSplice", "steppedJoint"},
	} {
		body := example(t, what[1], what[2])
		var us, si judged
		c.do(t, post(what[0], body)).decode(t, http.StatusOK, &us)
		c.do(t, post(what[0], inSI(t, body))).decode(t, http.StatusOK, &si)
		if us.Verdict != si.Verdict || len(us.Checks) != len(si.Checks) || len(us.Checks) == 0 || !slices.Equal(us.Workings, si.Workings) || !slices.Equal(us.Findings, si.Findings) {
			t.Errorf("%s: verdict %s and %s, %d and %d checks, %d and %d workings, %d and %d findings", what[2], us.Verdict, si.Verdict,
				len(us.Checks), len(si.Checks), len(us.Workings), len(si.Workings), len(us.Findings), len(si.Findings))
			continue
		}
		for i, a := range us.Checks {
			b := si.Checks[i]
			if a.Member != b.Member || a.Mode != b.Mode || a.Level != b.Level || a.Status != b.Status || a.Method != b.Method || (a.Margin == nil) != (b.Margin == nil) {
				t.Errorf("%s: %+v is %+v in SI", what[2], a, b)
			} else if a.Margin != nil && math.Abs(*a.Margin-*b.Margin) > 1e-9*(1+math.Abs(*a.Margin)) {
				t.Errorf("%s: %s %s has the margin %v, in SI %v", what[2], a.Member, a.Mode, *a.Margin, *b.Margin)
			}
		}
	}
	for _, what := range [][3]string{
		{"/v1/fastener-groups/sizing", "sizeFastenerGroup", "boltsOfBracket"},
		{"/v1/splices/steps", "findSpliceSteps", "evenCap"},
	} {
		body := example(t, what[1], what[2])
		var us, si struct {
			Value  float64
			After  struct{ Peak, Volume float64 }
			Result struct{ Verdict string }
		}
		c.do(t, post(what[0], body)).decode(t, http.StatusOK, &us)
		c.do(t, post(what[0], inSI(t, body))).decode(t, http.StatusOK, &si)
		if us.Result != si.Result || math.Abs(us.Value*25.4-si.Value) > 1e-9*si.Value || math.Abs(us.After.Peak-si.After.Peak) > 1e-4 ||
			math.Abs(us.After.Volume*25.4*25.4*25.4-si.After.Volume) > 1e-4*si.After.Volume || us.Value == 0 && us.After.Volume == 0 {
			t.Errorf("%s: %+v, in SI %+v", what[0], us, si)
		}
	}
}

package api_test

import (
	"encoding/json"
	"math"
	"net/http"
	"slices"
	"strconv"
	"strings"
	"testing"

	"jointledger/service"
	"jointledger/store/storetest"
)

// lugAnswer is what these tests read of an answer.
type lugAnswer struct {
	Verdict             string
	Checks              []lugCheck
	Findings            []struct{ Code, Subject, Message string }
	MethodOptions       map[string]map[string]any `json:"method_options"`
	StressConcentration []struct {
		Member, Symbol string
		Value          float64
	} `json:"stress_concentration"`
}

type lugCheck struct {
	Member, Mode, Level, Method, Status string
	Allowable, Margin                   *float64
	NominalMargin                       *float64 `json:"nominal_margin"`
	Message                             *string
}

// check finds a check by its place; a method may be left out.
func (a lugAnswer) check(t testing.TB, member, mode, level, method string) lugCheck {
	t.Helper()
	for _, c := range a.Checks {
		if c.Member == member && c.Mode == mode && c.Level == level && (method == "" || c.Method == method) {
			return c
		}
	}
	t.Fatalf("there is no check of %s %s at %s by %s", member, mode, level, method)
	return lugCheck{}
}

func (a lugAnswer) has(code string) bool {
	for _, f := range a.Findings {
		if f.Code == code {
			return true
		}
	}
	return false
}

// near compares with a value that was written down to so many digits.
func near(got *float64, want, within float64) bool {
	return got != nil && math.Abs(*got-want) <= within
}

type lugSizing struct {
	Value, Rounded *float64
	Governing      *lugCheck
	Result         *lugAnswer
	Reason         *string
}

// The examples of the document by hand. Thickness: shear-out planes of
// sqrt(40² - (12.5 sin 40°)²) - 12.5 cos 40° = 29.609147 mm at 270 MPa carry
// 15 988.94 N for each millimetre, and 86 250 N are to be carried.
func TestLugsAreSized(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	var found lugSizing
	body := example(t, "sizeLug", "thickness")
	c.do(t, post("/v1/lugs/sizing", body)).decode(t, http.StatusOK, &found)
	length := math.Sqrt(1600-math.Pow(12.5*math.Sin(40*math.Pi/180), 2)) - 12.5*math.Cos(40*math.Pi/180)
	least := 86250 / (2 * length * 270)
	if !near(found.Value, least, 1e-9) || !near(found.Rounded, 5.5, 0) || found.Reason != nil {
		t.Fatalf("%v rounded %v (%v), by hand %g and 5.5", found.Value, found.Rounded, found.Reason, least)
	}
	if found.Governing.Mode != "shear-out" || !near(found.Governing.Margin, 5.5/least-1, 1e-9) || found.Result.Verdict != "adequate" {
		t.Errorf("%+v", found)
	}
	// Without an increment the value itself is shown, and it holds.
	c.do(t, post("/v1/lugs/sizing", edited(t, body, map[string]any{"/increment": removed}))).decode(t, http.StatusOK, &found)
	if *found.Rounded != *found.Value || found.Result.Verdict != "adequate" || *found.Governing.Margin < 0 || *found.Governing.Margin > 1e-10 {
		t.Errorf("%v rounded %v with the margin %v", *found.Value, *found.Rounded, *found.Governing.Margin)
	}
	// A tolerance of 0.2 mm on the thickness asks for 0.2 mm more.
	c.do(t, post("/v1/lugs/sizing", edited(t, body, map[string]any{
		"/increment": removed, "/input/lug/thickness": map[string]any{"nominal": 12, "minus": 0.2, "plus": 0},
	}))).decode(t, http.StatusOK, &found)
	if !near(found.Value, least+0.2, 1e-9) || found.Result.Verdict != "adequate" || found.Governing.Message == nil {
		t.Errorf("%v with a tolerance, by hand %g", *found.Value, least+0.2)
	}
	// Too small bounds: nothing but a reason.
	found = lugSizing{}
	c.do(t, post("/v1/lugs/sizing", edited(t, body, map[string]any{"/bounds": []int{1, 5}}))).decode(t, http.StatusOK, &found)
	if found.Value != nil || found.Rounded != nil || found.Governing != nil || found.Result != nil || found.Reason == nil ||
		!strings.Contains(*found.Reason, "shear-out") || !strings.Contains(*found.Reason, "5 mm") {
		t.Errorf("%+v", found)
	}
	// The width, in inches: shear-out planes of 37 950/42 000 in, as in the
	// document's example.
	sin, cos := math.Sincos(40 * math.Pi / 180)
	wide := math.Hypot(37950.0/42000+0.375*cos, 0.375*sin) / 0.6
	c.do(t, post("/v1/lugs/sizing", example(t, "sizeLug", "width"))).decode(t, http.StatusOK, &found)
	if !near(found.Value, wide, 1e-9) || !near(found.Rounded, 2.0625, 0) || found.Governing.Mode != "shear-out" || *found.Governing.Margin < 0.1 {
		t.Errorf("%v rounded %v with the margin %v, by hand %v and 2.0625", *found.Value, *found.Rounded, *found.Governing.Margin, wide)
	}
}

// The pin, the clevis' hole and the edge distance go along, in the units of the
// question, and the answer is that of a request with the sizes found.
func TestWhatGoesAlongWithASize(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	joint := example(t, "calculateLug", "clevisJoint")
	ask := func(question map[string]any, input []byte) (found lugSizing) {
		t.Helper()
		question["input"] = map[string]any{}
		raw := edited(t, []byte(`{}`), map[string]any{})
		for name, value := range question {
			raw = edited(t, raw, map[string]any{"/" + name: value})
		}
		raw = []byte(strings.Replace(string(raw), `"input":{}`, `"input":`+string(input), 1))
		c.do(t, post("/v1/lugs/sizing", raw)).decode(t, http.StatusOK, &found)
		if found.Reason != nil {
			t.Fatal(*found.Reason)
		}
		return found
	}
	for name, k := range map[string]struct {
		question map[string]any
		sizes    func(x float64) map[string]any
	}{
		"hole": {map[string]any{"free": "hole_diameter", "bounds": []float64{15, 45}, "increment": 0.5}, func(x float64) map[string]any {
			return map[string]any{"/lug/hole_diameter": x, "/clevis/hole_diameter": x, "/pin/diameter": x - 5}
		}},
		"hole in a ratio": {map[string]any{"free": "hole_diameter", "bounds": []float64{15, 45}, "ratio": 0.75, "increment": 1}, func(x float64) map[string]any {
			return map[string]any{"/lug/hole_diameter": x, "/clevis/hole_diameter": x, "/pin/diameter": 0.75 * x}
		}},
		"width": {map[string]any{"free": "width", "bounds": []float64{40, 200}, "increment": 1}, func(x float64) map[string]any {
			return map[string]any{"/lug/width": x, "/lug/edge_distance": x / 2}
		}},
		"edge distance": {map[string]any{"free": "edge_distance", "bounds": []float64{40, 90}, "increment": 0.25}, func(x float64) map[string]any {
			return map[string]any{"/lug/edge_distance": x}
		}},
	} {
		found := ask(k.question, joint)
		var direct lugAnswer
		c.do(t, post("/v1/lugs", edited(t, joint, k.sizes(*found.Rounded)))).decode(t, http.StatusOK, &direct)
		if direct.Verdict != "adequate" || len(direct.Checks) != len(found.Result.Checks) {
			t.Fatalf("%s of %v: %s", name, *found.Rounded, direct.Verdict)
		}
		for i, check := range direct.Checks {
			if !near(check.Margin, *found.Result.Checks[i].Margin, 1e-12) {
				t.Errorf("%s of %v: %s %s has the margin %v, in the sizing %v", name, *found.Rounded, check.Member, check.Mode, *check.Margin, *found.Result.Checks[i].Margin)
			}
		}
	}
}

// The worst corner by hand stands in the document's example.
func TestTolerances(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	worn := example(t, "calculateLug", "wornHole")
	var a lugAnswer
	c.do(t, post("/v1/lugs", worn)).decode(t, http.StatusOK, &a)
	net, bearing := a.check(t, "lug", "net-section", "ultimate", ""), a.check(t, "lug", "bearing", "ultimate", "")
	if !near(net.Allowable, 293454, 1e-6) || !near(net.NominalMargin, 297000/86250.0-1, 1e-12) || *net.Message != "at /lug/thickness 11.9 mm, /lug/hole_diameter 25.2 mm" {
		t.Errorf("%v, nominal margin %v, %s", *net.Allowable, *net.NominalMargin, *net.Message)
	}
	if !near(bearing.Allowable, 214200, 1e-6) || !near(bearing.NominalMargin, 216000/86250.0-1, 1e-12) || *bearing.Message != "at /lug/thickness 11.9 mm, /lug/hole_diameter 25 mm" {
		t.Errorf("%v, nominal margin %v, %s", *bearing.Allowable, *bearing.NominalMargin, *bearing.Message)
	}
	var exact lugAnswer
	c.do(t, post("/v1/lugs", edited(t, worn, map[string]any{"/lug/thickness": 12, "/lug/hole_diameter": 25}))).decode(t, http.StatusOK, &exact)
	if plain := exact.check(t, "lug", "net-section", "ultimate", ""); plain.NominalMargin != nil || plain.Message != nil {
		t.Errorf("exact lengths, and there is a nominal margin or a message: %+v", plain)
	}
	// An undetermined check says why, and where.
	c.do(t, post("/v1/lugs", edited(t, worn, map[string]any{"/lug/material/fsu": removed}))).decode(t, http.StatusOK, &a)
	if shear := a.check(t, "lug", "shear-out", "ultimate", ""); shear.Status != "undetermined" || !strings.Contains(*shear.Message, "F_su") || !strings.Contains(*shear.Message, "at /lug/thickness") {
		t.Errorf("%+v: %s", shear, *shear.Message)
	}
}

// What is left out and follows another length follows it at each corner: a
// bushing is as long as its lug is thick. By hand, 400 MPa on the 20 mm pin:
// 400·20·11.9 = 95 200 N; with a length of its own, 10 mm, 80 000 N.
func TestDefaultsFollowAtEachCorner(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	joint := edited(t, example(t, "calculateLug", "clevisJoint"), map[string]any{"/lug/thickness": map[string]any{"nominal": 12, "minus": 0.1, "plus": 0.3}})
	var a lugAnswer
	c.do(t, post("/v1/lugs", joint)).decode(t, http.StatusOK, &a)
	if bushing := a.check(t, "bushing", "bushing-bearing", "limit", ""); !near(bushing.Allowable, 95200, 1e-6) || !strings.HasSuffix(*bushing.Message, "11.9 mm") {
		t.Errorf("%v, %s", *bushing.Allowable, *bushing.Message)
	}
	// The pin bends most between thick legs: at the upper limit.
	if bending := a.check(t, "pin", "pin-bending", "ultimate", ""); !strings.HasSuffix(*bending.Message, "12.3 mm") || *bending.Margin >= *bending.NominalMargin {
		t.Errorf("%+v: %s", bending, *bending.Message)
	}
	c.do(t, post("/v1/lugs", edited(t, joint, map[string]any{"/bushing/length": 10}))).decode(t, http.StatusOK, &a)
	if bushing := a.check(t, "bushing", "bushing-bearing", "limit", ""); !near(bushing.Allowable, 80000, 1e-6) {
		t.Errorf("%v", *bushing.Allowable)
	}
}

// TestEveryLengthMayHaveATolerance: those of the document, one by one.
func TestEveryLengthMayHaveATolerance(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	lengths := map[string]string{"LugHead": "/lug", "Clevis": "/clevis", "Pin": "/pin", "Bushing": "/bushing"}
	full := edited(t, example(t, "calculateLug", "clevisJoint"), map[string]any{
		"/lug/edge_distance": 42, "/lug/end_radius": 46, "/lug/offset": 1, "/lug/body_width": 80, "/lug/body_length": 90, "/pin/inner_diameter": 5, "/bushing/length": 12, "/bushing/interference": 0.02,
		"/clevis/edge_distance": 42, "/clevis/end_radius": 46, "/clevis/offset": 1, "/clevis/body_width": 80, "/clevis/body_length": 90, "/clevis/bushing/length": 7, "/clevis/bushing/interference": 0.02,
	})
	var joint any
	if err := json.Unmarshal(full, &joint); err != nil {
		t.Fatal(err)
	}
	tried := 0
	try := func(pointer string) {
		t.Helper()
		tried++
		at := joint
		for _, token := range strings.Split(pointer, "/")[1:] {
			at = at.(map[string]any)[token]
		}
		nominal, ok := at.(float64)
		if !ok {
			t.Fatalf("the example has no length at %s", pointer)
		}
		var a lugAnswer
		c.do(t, post("/v1/lugs", edited(t, full, map[string]any{pointer: map[string]any{"nominal": nominal, "minus": 0, "plus": 0.001}}))).decode(t, http.StatusOK, &a)
		if a.Checks[0].NominalMargin == nil {
			t.Errorf("%s: there is no nominal margin", pointer)
		}
	}
	for name, at := range lengths {
		for member, schema := range theDocument(t).model.Components.Schemas.GetOrZero(name).Schema().Properties.FromOldest() {
			if strings.HasSuffix(schema.GetReference(), "Length") || strings.HasSuffix(schema.GetReference(), "LengthOrZero") {
				try(at + "/" + member)
			}
		}
	}
	try("/clevis/bushing/length")
	try("/clevis/bushing/interference")
	if tried != 23 {
		t.Errorf("%d lengths, and there are 23", tried)
	}
}

// By hand, a round end with W/D = 80/25: K_tn = 0.85 + 0.95·3.2 = 3.89, on the
// bearing area K_tb = 3.89/(3.2 - 1). A lug ten holes wide is out of range.
func TestStressConcentration(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	var a lugAnswer
	c.do(t, post("/v1/lugs", example(t, "calculateLug", "wornHole"))).decode(t, http.StatusOK, &a)
	found := map[string]float64{}
	for _, w := range a.StressConcentration {
		found[w.Member+" "+w.Symbol] = w.Value
	}
	if net, bearing := found["lug K_tn"], found["lug K_tb"]; math.Abs(net-3.89) > 1e-12 || math.Abs(bearing-3.89/2.2) > 1e-12 {
		t.Errorf("K_tn %g, K_tb %g", net, bearing)
	}
	a = lugAnswer{}
	c.do(t, post("/v1/lugs", edited(t, example(t, "calculateLug", "lugSI"), map[string]any{"/lug/width": 200, "/lug/edge_distance": 100}))).decode(t, http.StatusOK, &a)
	if len(a.StressConcentration) != 0 || !a.has("stress-concentration") {
		t.Errorf("%v, %v", a.StressConcentration, a.Findings)
	}
}

// Several methods: the options that applied with their defaults, and methods
// that lie far apart. The joint by affdl-tr-69-42 is worked by hand in
// testdata/published/lug-affdl-derived-37.json.
func TestMethodsSideBySide(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	var a lugAnswer
	c.do(t, post("/v1/lugs", example(t, "calculateLug", "obliqueJoint"))).decode(t, http.StatusOK, &a)
	if joint := a.check(t, "joint", "joint", "ultimate", "affdl-tr-69-42@1"); !near(joint.Allowable, 121232.4, 0.05) || !near(joint.Margin, 0.756992, 5e-7) {
		t.Errorf("%v, margin %v", *joint.Allowable, *joint.Margin)
	}
	for method, options := range map[string]map[string]any{
		"asme-bth-1":     {"design_factor": 2.0, "clearance": "formula", "stiffened": false, "turning": false, "apply_special": false},
		"aisc-360-d5":    {"basis": "lrfd", "apply_special": false},
		"en-1993-1-8":    {"gamma_m0": 1.0, "gamma_m2": 1.25, "gamma_m6": 1.0},
		"elementary":     {"pin_bending_factor": 1.0},
		"affdl-tr-69-42": {"pin_bending_factor": 1.56},
	} {
		for name, value := range options {
			if found, ok := a.MethodOptions[method][name]; !ok || found != value {
				t.Errorf("%s.%s is %v, and was to be %v", method, name, found, value)
			}
		}
	}
	if set, ok := a.MethodOptions["affdl-tr-69-42"]["curve_set"].(map[string]any); !ok || set["id"] != "derived-1" || !strings.HasPrefix(set["digest"].(string), "sha256:") {
		t.Errorf("curve_set is %v", a.MethodOptions["affdl-tr-69-42"]["curve_set"])
	}
	if !a.has("method-spread") || !a.has("derived-curves") {
		t.Errorf("%+v", a.Findings)
	}
}

func TestLugMethodsAreListed(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	var list struct {
		Items []struct {
			ID, Kind, Mark string
			Options        []struct {
				Name    string
				Default any
			}
			Equations []struct{ Equation, Source, Mark string }
		}
	}
	c.do(t, get("/v1/methods?kind=lug")).decode(t, http.StatusOK, &list)
	var ids []string
	for _, m := range list.Items {
		ids = append(ids, m.ID)
		if m.Kind != "lug" || m.Mark == "" || len(m.Equations) == 0 {
			t.Errorf("%+v", m)
		}
		for _, o := range m.Options {
			if o.Name == "curve_set" && m.ID == "affdl-tr-69-42" && o.Default != "derived-1@1" {
				t.Errorf("the curve set of %s is %v when none is named", m.ID, o.Default)
			}
		}
	}
	if want := []string{"elementary", "affdl-tr-69-42", "melcon-hoblit", "asme-bth-1", "aisc-360-d5", "en-1993-1-8"}; !slices.Equal(ids, want) {
		t.Errorf("%q", ids)
	}
}

// A curve set by its id, by id@version and in place gives the same strengths;
// what the record keeps names its digest, and still gives its result when the
// id has a newer version.
func TestCurveSetsInUse(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	admin, analyst := w.callers[service.Admin], w.callers[service.Analyst]
	inline := example(t, "calculateLug", "ownCurves")
	place := "/method_options/melcon-hoblit/curve_set"
	net := func(body []byte) (float64, lugAnswer) {
		t.Helper()
		var a lugAnswer
		analyst.do(t, post("/v1/lugs", body)).decode(t, http.StatusOK, &a)
		return *a.check(t, "lug", "net-section", "ultimate", "").Allowable, a
	}
	// By hand, in the example: 0.9·480 mm²·500 MPa.
	if got, _ := net(inline); math.Abs(got-216000) > 1e-6 {
		t.Errorf("in place: %g", got)
	}
	named := edited(t, inline, map[string]any{place: "SM chart trial"})
	got, a := net(named)
	if math.Abs(got-216000) > 1e-6 {
		t.Errorf("by id: %g", got)
	}
	var registered struct{ Digest string }
	analyst.do(t, get("/v1/curve-sets/SM%20chart%20trial@1")).decode(t, http.StatusOK, &registered)
	reference := map[string]any{"id": "SM chart trial", "version": "1", "digest": registered.Digest}
	held := func(a lugAnswer, want map[string]any) bool {
		found, _ := a.MethodOptions["melcon-hoblit"]["curve_set"].(map[string]any)
		for name, value := range want {
			if found[name] != value {
				return false
			}
		}
		return len(found) == len(want)
	}
	if !held(a, reference) {
		t.Errorf("%v", a.MethodOptions)
	}

	var record struct {
		ID    string
		Input struct {
			MethodOptions map[string]map[string]any `json:"method_options"`
		}
	}
	entry := func(input []byte) []byte {
		whole := edited(t, example(t, "addRecord", "record"), map[string]any{"/input": "@"})
		return []byte(strings.Replace(string(whole), `"@"`, string(input), 1))
	}
	analyst.do(t, post("/v1/records", entry(named))).decode(t, http.StatusCreated, &record)
	if kept := record.Input.MethodOptions["melcon-hoblit"]["curve_set"].(map[string]any); kept["digest"] != registered.Digest {
		t.Errorf("the record keeps %v", kept)
	}

	// A newer version with K_t = 0.8 at W/D = 3: 192 000 N.
	newer := edited(t, example(t, "addCurveSet", "invented"), map[string]any{"/version": "2", "/charts/Kt/curves/0/points/1/1": 0.8})
	admin.do(t, post("/v1/curve-sets", newer)).want(t, http.StatusCreated)
	for name, want := range map[string]float64{"SM chart trial": 192000, "SM chart trial@2": 192000, "SM chart trial@1": 216000} {
		if got, _ := net(edited(t, inline, map[string]any{place: name})); math.Abs(got-want) > 1e-6 {
			t.Errorf("%s: %g, by hand %g", name, got, want)
		}
	}
	if got, _ := net(edited(t, inline, map[string]any{place: reference})); math.Abs(got-216000) > 1e-6 {
		t.Errorf("by reference: %g", got)
	}
	var replay struct {
		Recorded struct{ Reproduced bool }
		Current  struct{ Reproduced bool }
	}
	analyst.do(t, call{method: http.MethodPost, target: "/v1/records/" + record.ID + "/replay"}).decode(t, http.StatusOK, &replay)
	if !replay.Recorded.Reproduced {
		t.Error("the record is not reproduced from the curve set in the log")
	}
	var verification struct{ Verified, Recomputed bool }
	analyst.do(t, get("/v1/records/"+record.ID+"/verification")).decode(t, http.StatusOK, &verification)
	if !verification.Verified || !verification.Recomputed {
		t.Errorf("%+v", verification)
	}
	var list struct{ Items []struct{ ID string } }
	analyst.do(t, get("/v1/records?curve_set=SM%20chart%20trial@1")).decode(t, http.StatusOK, &list)
	if len(list.Items) != 1 || list.Items[0].ID != record.ID {
		t.Errorf("%+v", list)
	}
	// A set in place is kept whole.
	record.Input.MethodOptions = nil
	analyst.do(t, post("/v1/records", entry(inline))).decode(t, http.StatusCreated, &record)
	if kept := record.Input.MethodOptions["melcon-hoblit"]["curve_set"].(map[string]any); kept["charts"] == nil || kept["reader"] != "SM trial" {
		t.Errorf("the record keeps %v", kept)
	}
}

// manyCases are load cases of different ids.
func manyCases(n int) []any {
	list := make([]any, n)
	for i := range list {
		list[i] = map[string]any{"id": strconv.Itoa(i), "level": "limit", "force": 1, "angle": 0}
	}
	return list
}

// TestLugsRefused: every value of a lug's newer members that cannot be used,
// with the pointers of all of them.
func TestLugsRefused(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	c := w.callers[service.Admin]
	type changes = map[string]any
	type at = []string
	worn, joint, own := example(t, "calculateLug", "wornHole"), example(t, "calculateLug", "clevisJoint"), example(t, "calculateLug", "ownCurves")
	sizing, set := example(t, "sizeLug", "thickness"), example(t, "addCurveSet", "invented")
	tolerance := func(nominal, minus, plus float64) changes {
		return changes{"nominal": nominal, "minus": minus, "plus": plus}
	}
	place := "/method_options/melcon-hoblit/curve_set"
	kt := place + "/charts/Kt/curves/0"
	whole := changes{
		"id": "x", "version": "1", "method": "affdl-tr-69-42", "document": "invented", "reader": "SM", "tolerance": 0.05,
		"charts": changes{
			"Kn":     changes{"figure": "", "along": "D/W", "between": "q", "curves": []any{changes{"at": 0.1, "points": [][2]float64{{0.2, 0.9}, {0.3, 0.95}, {0.4, 0.97}, {0.5, 1.05}}}}},
			"K":      changes{"figure": "", "along": "e/D", "between": nil, "curves": []any{changes{"points": [][2]float64{{0.6, 1.5}, {0.8, 0.4}, {1.5, 1.1}}}}},
			"Kn@0.8": changes{"figure": "", "along": "W/D", "between": "q", "curves": []any{changes{"at": 0.1, "points": [][2]float64{{0.2, 0.9}, {0.3, 0.95}}}}},
		},
	}
	affdl := edited(t, joint, changes{"/methods": []any{"affdl-tr-69-42"}, "/method_options": changes{"affdl-tr-69-42": changes{"curve_set": whole}}})
	for _, k := range []struct {
		name, target string
		status       int
		body         []byte
		changes      changes
		pointers     at
	}{
		{"a tolerance that leaves nothing", "/v1/lugs", 422, worn, changes{"/lug/thickness": tolerance(12, 12, 0)}, at{"/lug/thickness/minus"}},
		{"negative tolerances", "/v1/lugs", 422, worn, changes{"/lug/thickness": tolerance(12, -0.1, -0.1)}, at{"/lug/thickness/minus", "/lug/thickness/plus"}},
		{"a nominal of nothing", "/v1/lugs", 422, worn, changes{"/lug/thickness": tolerance(0, 0, 1)}, at{"/lug/thickness/nominal"}},
		{"a nominal below nothing", "/v1/lugs", 422, joint, changes{"/clevis/gap": tolerance(-1, 0, 0)}, at{"/clevis/gap/nominal"}},
		{"a gap below nothing", "/v1/lugs", 422, joint, changes{"/clevis/gap": tolerance(0.5, 0.6, 0)}, at{"/clevis/gap/minus"}},
		{"a length beyond all", "/v1/lugs", 422, worn, changes{"/lug/edge_distance": tolerance(80, 0, 1e9)}, at{"/lug/edge_distance/plus"}},
		{"an interference below nothing", "/v1/lugs", 422, joint, changes{"/bushing/interference": tolerance(0.01, 0.02, 0)}, at{"/bushing/interference/minus"}},
		{"a pin that does not fit at a corner", "/v1/lugs", 422, joint, changes{"/bushing": removed, "/clevis/bushing": removed, "/pin/diameter": tolerance(25, 0, 0.1)}, at{"/pin/diameter"}},
		{
			"seven tolerances", "/v1/lugs", 422, joint,
			changes{
				"/lug/width": tolerance(80, 1, 1), "/lug/thickness": tolerance(12, 1, 1), "/lug/hole_diameter": tolerance(25, 0.1, 0.1), "/lug/edge_distance": tolerance(42, 1, 1),
				"/pin/diameter": tolerance(20, 0.1, 0), "/clevis/thickness": tolerance(7, 0.1, 0.1), "/clevis/gap": tolerance(0.5, 0.1, 0.1),
			},
			at{"/clevis/gap"},
		},
		{"too many load cases for their tolerances", "/v1/lugs/sizing", 422, sizing, changes{
			"/input/lug/thickness": tolerance(12, 1, 1), "/input/load_cases": manyCases(33334),
		}, at{"/input/load_cases"}},
		{"tolerances of no length", "/v1/lugs", 400, worn, changes{"/lug/section_depths": []any{tolerance(10, 1, 1), 10, 10, 10}}, at{"/lug/section_depths/0"}},
		{"a tolerance of a force", "/v1/lugs", 400, worn, changes{"/load_cases/0/force": tolerance(10, 1, 1)}, at{"/load_cases/0/force"}},
		{"a tolerance without a limit", "/v1/lugs", 400, worn, changes{"/lug/thickness": changes{"nominal": 12, "minus": 0.1}}, at{"/lug/thickness/plus"}},
		{"a tolerance with a median", "/v1/lugs", 400, worn, changes{"/lug/thickness": changes{"nominal": 12, "minus": 0.1, "plus": 0.1, "median": 12}}, at{"/lug/thickness/median"}},
		{"a tolerance in words", "/v1/lugs", 400, worn, changes{"/lug/thickness": changes{"nominal": "12", "minus": 0.1, "plus": 0.1}}, at{"/lug/thickness/nominal"}},

		{"section depths of nothing", "/v1/lugs", 422, joint, changes{"/lug/section_depths": []float64{10, 0, 10, -1}}, at{"/lug/section_depths/1", "/lug/section_depths/3"}},
		{"a leg that carries less than half", "/v1/lugs", 422, joint, changes{"/clevis/leg_share": 0.4}, at{"/clevis/leg_share"}},
		{"a moment share above 1", "/v1/lugs", 422, joint, changes{"/joint": "single-shear", "/clevis/moment_share": 1.1}, at{"/clevis/moment_share"}},
		{"a moment share in double shear", "/v1/lugs", 422, joint, changes{"/clevis/moment_share": 0.5}, at{"/clevis/moment_share"}},
		{"a body of no length", "/v1/lugs", 422, joint, changes{"/lug/body_length": 0, "/lug/body_width": -1}, at{"/lug/body_length", "/lug/body_width"}},
		{"more interference than hole", "/v1/lugs", 422, joint, changes{"/bushing/interference": 30}, at{"/bushing/interference"}},
		{"a flag in words", "/v1/lugs", 422, joint, changes{"/methods": []any{"asme-bth-1"}, "/method_options": changes{"asme-bth-1": changes{"stiffened": "yes", "clearance": "some", "design_factor": 0.5}}}, at{
			"/method_options/asme-bth-1/clearance", "/method_options/asme-bth-1/design_factor", "/method_options/asme-bth-1/stiffened",
		}},
		{"partial factors below 1", "/v1/lugs", 422, joint, changes{"/methods": []any{"en-1993-1-8"}, "/method_options": changes{"en-1993-1-8": changes{"gamma_m0": 0.9, "gamma_m9": 1}}}, at{
			"/method_options/en-1993-1-8/gamma_m0", "/method_options/en-1993-1-8/gamma_m9",
		}},
		{"options of a method that is not asked", "/v1/lugs", 422, joint, changes{"/method_options": changes{"aisc-360-d5": changes{}}}, at{"/method_options/aisc-360-d5"}},
		{"a method asked and compared", "/v1/lugs", 422, joint, changes{"/compare": []any{"elementary"}}, at{"/compare/0"}},

		{"a curve set that is none", "/v1/lugs", 422, own, changes{place: "nobody's"}, at{place}},
		{"a number for a curve set", "/v1/lugs", 422, own, changes{place: 1}, at{place}},
		{"a curve set of another method", "/v1/lugs", 422, own, changes{place: "derived-1"}, at{place}},
		{"another digest", "/v1/lugs", 422, own, changes{place: changes{"id": "SM chart trial", "version": "1", "digest": "sha256:" + strings.Repeat("0", 64)}}, at{place + "/digest"}},
		{"a reference to a version that is none", "/v1/lugs", 422, own, changes{place: changes{"id": "SM chart trial", "version": "9", "digest": "sha256:" + strings.Repeat("0", 64)}}, at{place}},
		{"a factor above 1 in place", "/v1/lugs", 422, own, changes{kt + "/points/2/1": 1.2}, at{kt + "/points/2"}},
		{"points that do not ascend in place", "/v1/lugs", 422, own, changes{kt + "/points/1/0": 1.5}, at{kt + "/points/1"}},
		{"a place of a curve alone", "/v1/lugs", 422, own, changes{kt + "/at": 1}, at{kt + "/at"}},
		{"a set of nobody", "/v1/lugs", 422, own, changes{place + "/reader": "", place + "/tolerance": 0.5}, at{place + "/reader", place + "/tolerance"}},
		{"an unknown chart", "/v1/lugs", 422, own, changes{place + "/charts": changes{"a/b~c": changes{"figure": "", "along": "W/D", "between": nil, "curves": []any{changes{"points": [][2]float64{{1, 0.5}, {2, 0.5}}}}}}}, at{place + "/charts/a~1b~0c"}},
		{"three impossible charts", "/v1/lugs", 422, affdl, nil, at{
			"/method_options/affdl-tr-69-42/curve_set/charts/K/curves/0/points/1",
			"/method_options/affdl-tr-69-42/curve_set/charts/Kn/curves/0/points/3",
			"/method_options/affdl-tr-69-42/curve_set/charts/Kn@0.8/along",
		}},
		{"a set with a colour", "/v1/lugs", 400, own, changes{place + "/colour": "red"}, at{place + "/colour"}},
		{"a set without a reader", "/v1/lugs", 400, own, changes{place + "/reader": removed}, at{place + "/reader"}},
		{"a point of one number", "/v1/lugs", 400, own, changes{kt + "/points/1": []float64{3}}, at{kt + "/points/1"}},
		{"a reference without a version", "/v1/lugs", 400, own, changes{place: changes{"id": "SM chart trial", "digest": "x"}}, at{place + "/version"}},

		{"a registered factor above 1", "/v1/curve-sets", 422, set, changes{"/charts/Kt/curves/0/points/2/1": 1.2}, at{"/charts/Kt/curves/0/points/2"}},
		{"a registered set of a method without charts", "/v1/curve-sets", 422, set, changes{"/method": "elementary"}, at{"/method"}},
		{"a registered set along something else", "/v1/curve-sets", 422, set, changes{"/charts/Kt/along": "e/D"}, at{"/charts/Kt/along"}},
		{"a curve in no place", "/v1/curve-sets", 422, set, changes{"/charts/Kt/between": "curve"}, at{"/charts/Kt/curves/0/at"}},
		{"a curve of one point", "/v1/curve-sets", 422, set, changes{"/charts/Kt/curves/0/points": [][2]float64{{1.5, 0.9}}}, at{"/charts/Kt/curves/0/points"}},
		{"a point beyond all", "/v1/curve-sets", 422, set, changes{"/charts/Kt/curves/0/points/2/0": 1e13}, at{"/charts/Kt/curves/0/points/2/0"}},
		{"no chart", "/v1/curve-sets", 422, set, changes{"/charts": changes{}}, at{"/charts"}},
		{"a set with a colour to register", "/v1/curve-sets", 400, set, changes{"/colour": "red"}, at{"/colour"}},
		{"a chart that says nothing of its curves", "/v1/curve-sets", 400, set, changes{"/charts/Kt/between": removed}, at{"/charts/Kt/between"}},

		{"a free dimension that is none", "/v1/lugs/sizing", 422, sizing, changes{"/free": "taper_angle"}, at{"/free"}},
		{"bounds upside down", "/v1/lugs/sizing", 422, sizing, changes{"/bounds": []float64{30, 1}}, at{"/bounds"}},
		{"bounds of nothing", "/v1/lugs/sizing", 422, sizing, changes{"/bounds/0": 0}, at{"/bounds/0"}},
		{"a ratio of nothing", "/v1/lugs/sizing", 422, sizing, changes{"/free": "width", "/ratio": 0}, at{"/ratio"}},
		{"a ratio of a thickness", "/v1/lugs/sizing", 422, sizing, changes{"/ratio": 0.5}, at{"/ratio"}},
		{"a pin wider than the hole", "/v1/lugs/sizing", 422, sizing, changes{"/free": "hole_diameter", "/ratio": 1.1}, at{"/ratio"}},
		{"an increment of nothing", "/v1/lugs/sizing", 422, sizing, changes{"/increment": 0}, at{"/increment"}},
		{"a target of nothing left", "/v1/lugs/sizing", 422, sizing, changes{"/target_margin": -1}, at{"/target_margin"}},
		{"a lug that cannot be", "/v1/lugs/sizing", 422, sizing, changes{"/input/lug/hole_diameter": 90, "/input/lug/width": 0, "/increment": -1}, at{"/increment", "/input/lug/width"}},
		{"a lug that no thickness mends", "/v1/lugs/sizing", 422, sizing, changes{"/input/lug/hole_diameter": 90}, at{"/input/lug/edge_distance", "/input/lug/hole_diameter"}},
		{"an unknown material", "/v1/lugs/sizing", 422, sizing, changes{"/input/lug/material": "unobtainium"}, at{"/input/lug/material"}},
		{"no bounds", "/v1/lugs/sizing", 400, sizing, changes{"/bounds": removed}, at{"/bounds"}},
		{"three bounds", "/v1/lugs/sizing", 400, sizing, changes{"/bounds": []float64{1, 2, 3}}, at{"/bounds"}},
		{"no input", "/v1/lugs/sizing", 400, sizing, changes{"/input": removed}, at{"/input"}},
		{"an input with a colour", "/v1/lugs/sizing", 400, sizing, changes{"/input/lug/colour": "red"}, at{"/input/lug/colour"}},
		{"an input of another type", "/v1/lugs/sizing", 400, sizing, changes{"/input": "lug"}, at{"/input"}},
		{"an input with a curve set with a colour", "/v1/lugs/sizing", 400, sizing, changes{
			"/input/methods":        []any{"melcon-hoblit"},
			"/input/method_options": changes{"melcon-hoblit": changes{"curve_set": changes{"colour": "red"}}},
		}, at{"/input/method_options/melcon-hoblit/curve_set/colour"}},
	} {
		a := c.do(t, post(k.target, edited(t, k.body, k.changes)))
		if a.status != k.status || a.problem == nil {
			t.Errorf("%s: %d: %.1000s", k.name, a.status, a.body)
		} else if !slices.Equal(a.pointers(), k.pointers) {
			t.Errorf("%s: found %q, want %q: %s", k.name, a.pointers(), k.pointers, a.body)
		}
	}
}

// TestSizingWithALostStore: a curve set that cannot be looked up is no fault of
// the request.
func TestSizingWithALostStore(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	c := w.callers[service.Reader]
	body := edited(t, example(t, "sizeLug", "thickness"), map[string]any{
		"/input/methods":        []any{"melcon-hoblit"},
		"/input/method_options": map[string]any{"melcon-hoblit": map[string]any{"curve_set": "SM chart trial"}},
	})
	var found lugSizing
	c.do(t, post("/v1/lugs/sizing", body)).decode(t, http.StatusOK, &found)
	if found.Reason == nil || !strings.Contains(*found.Reason, "undetermined") {
		t.Errorf("the set has only K_t, and the reason is %v", found.Reason)
	}
	c.store.Plan(failing(storetest.NotStored))
	c.do(t, post("/v1/lugs/sizing", body)).want(t, http.StatusServiceUnavailable)
	c.store.Plan(nil)
}

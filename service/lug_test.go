package service_test

import (
	"encoding/json"
	"errors"
	"fmt"
	"maps"
	"math"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"jointledger/service"
	"jointledger/store/storetest"
)

// mmPerInch and newtonPerPound are exact by definition.
const (
	mmPerInch      = 25.4
	newtonPerPound = 4.4482216152605
)

// inUS turns a document in SI into US units by the names of its members. What
// has no name here has no unit.
func inUS(v any, name string) any {
	length := []string{
		"width", "thickness", "hole_diameter", "edge_distance", "end_radius", "offset", "body_width", "body_length", "diameter",
		"inner_diameter", "gap", "interference", "length", "nominal", "minus", "plus", "section_depths",
	}
	stress := []string{"ftu", "fty", "ftu_cross", "fty_cross", "fcy", "fsu", "e", "ec", "fbru", "fbry"}
	switch v := v.(type) {
	case map[string]any:
		out := map[string]any{}
		for member, value := range v {
			out[member] = inUS(value, member)
		}
		if name == "" {
			out["units"] = "US"
		}
		return out
	case []any:
		out := make([]any, len(v))
		for i := range v {
			out[i] = inUS(v[i], name+"[]")
		}
		return out
	case float64:
		switch name = strings.TrimSuffix(name, "[]"); {
		case slices.Contains(length, name):
			return v / mmPerInch
		case slices.Contains(stress, name):
			return v / (newtonPerPound / (mmPerInch * mmPerInch))
		case name == "force":
			return v / newtonPerPound
		}
	}
	return v
}

// everyLug draws a joint in SI with every method and most of what a request can
// have.
func everyLug(t *rapid.T) map[string]any {
	between := func(name string, low, high float64) float64 { return rapid.Float64Range(low, high).Draw(t, name) }
	maybe := func(name string) bool { return rapid.Bool().Draw(t, name) }
	plate := map[string]any{
		"name": "SM plate, invented", "ftu": 450.0, "fty": between("fty", 300, 440), "ftu_cross": 440.0, "fty_cross": between("fty_cross", 290, 430),
		"fsu": 270.0, "fcy": 380.0, "e": 71000.0, "nu": 0.33, "elongation": between("elongation", 0.03, 0.15),
		"bearing": []any{
			map[string]any{"e_over_d": 1.5, "fbru": 680.0, "fbry": 560.0}, map[string]any{"e_over_d": 2.0, "fbru": 880.0, "fbry": 660.0},
		},
	}
	steel := map[string]any{"name": "SM steel, invented", "ftu": 1100.0, "fty": 900.0, "fsu": 660.0, "fcy": 900.0, "e": 200000.0, "nu": 0.3, "elongation": 0.12}
	hole := between("hole", 10, 40)
	head := func(name string) map[string]any {
		width := hole * between(name+" W/D", 1.5, 5)
		h := map[string]any{
			"shape": rapid.SampledFrom([]string{"round", "square", "tapered"}).Draw(t, name+" shape"), "width": width,
			"thickness": between(name+" thickness", 2, 30), "hole_diameter": hole, "edge_distance": width * between(name+" e/W", 0.5, 1), "material": plate,
		}
		if h["shape"] == "tapered" {
			h["taper_angle"] = between(name+" taper", 1, 40)
		}
		if maybe(name + " offset") {
			h["offset"] = hole * between(name+" offset/D", -0.2, 0.2)
		}
		if maybe(name + " body") {
			h["body_length"], h["body_width"] = 3*hole, width
		}
		if maybe(name + " depths") {
			h["section_depths"] = []any{hole, 0.9 * hole, 0.8 * hole, hole}
		}
		return h
	}
	d := map[string]any{
		"units": "SI", "title": "SM-4102 drawn at random",
		"methods": []any{"elementary", "affdl-tr-69-42"}, "compare": []any{"melcon-hoblit", "asme-bth-1", "aisc-360-d5", "en-1993-1-8"},
		"method_options": map[string]any{"melcon-hoblit": map[string]any{"curve_set": map[string]any{
			"id": "trial", "version": "1", "method": "melcon-hoblit", "document": "invented", "reader": "SM trial", "tolerance": 0.05,
			"charts": map[string]any{
				"Kbr":  curve("e/D", [][2]float64{{0.6, 0.1}, {1.5, 1.3}, {4, 2.2}}),
				"Kt":   curve("W/D", [][2]float64{{1.2, 0.98}, {3, 0.9}, {5, 0.75}}),
				"C":    curve("Pu/(D t Ftux)", [][2]float64{{0.01, 1.1}, {3, 1}}),
				"Ktru": curve("Aav/Abr", [][2]float64{{0.1, 0.1}, {2, 1.2}}),
				"Ktry": curve("Aav/Abr", [][2]float64{{0.1, 0.1}, {2, 1.2}}),
			},
		}}},
		"lug":     head("lug"),
		"factors": map[string]any{"ultimate": 1.5, "fitting": 1.15},
		"load_cases": []any{
			map[string]any{"id": "a", "level": "limit", "force": between("force", 1, 1e6), "angle": between("angle", 0, 360)},
			map[string]any{"id": "b", "level": "ultimate", "force": between("force b", 1, 1e6), "angle": float64(rapid.IntRange(0, 3).Draw(t, "quarter") * 90)},
		},
	}
	if maybe("pin") {
		bushed := maybe("bushing")
		pin := map[string]any{"diameter": hole * between("Dp/D", 0.9, 1), "material": steel}
		if bushed {
			pin["diameter"] = hole * between("Dp/D bushed", 0.6, 0.9)
			d["bushing"] = map[string]any{"material": steel, "interference": hole * 0.001}
		}
		if maybe("bore") {
			pin["inner_diameter"] = 0.3 * hole
		}
		d["pin"] = pin
		clevis := head("clevis")
		clevis["gap"] = between("gap", 0, 3)
		if bushed {
			clevis["bushing"] = map[string]any{"material": steel}
		}
		if maybe("single shear") {
			d["joint"] = "single-shear"
		}
		d["clevis"] = clevis
	}
	if maybe("tolerance") {
		h := d["lug"].(map[string]any)
		thickness := h["thickness"].(float64)
		h["thickness"] = map[string]any{"nominal": thickness, "minus": thickness / 50, "plus": thickness / 25}
	}
	return d
}

func curve(along string, points [][2]float64) map[string]any {
	list := make([]any, len(points))
	for i, p := range points {
		list[i] = []any{p[0], p[1]}
	}
	return map[string]any{"figure": "none", "along": along, "between": nil, "curves": []any{map[string]any{"points": list}}}
}

// lugAnswer is nil for a joint that cannot be, such as one with an offset that
// leaves no material beside the hole.
func lugAnswer(t *rapid.T, document any) *service.Result {
	body, err := json.Marshal(document)
	if err != nil {
		t.Fatal(err)
	}
	r, err := service.Calculate(service.Lug, body, service.View{})
	impossible(t, err)
	return r
}

// impossible fails on any error but that of values that cannot be.
func impossible(t *rapid.T, err error) {
	var p *service.Problem
	if err != nil && (!errors.As(err, &p) || p.Code != service.Invalid) {
		t.Fatal(err)
	}
}

// The same joint in both units has the same margins, by every method.
func TestLugsAreTheSameInBothUnits(t *testing.T) {
	methods := map[string]bool{}
	rapid.Check(t, func(t *rapid.T) {
		document := everyLug(t)
		si, us := lugAnswer(t, document), lugAnswer(t, inUS(document, ""))
		if si == nil && us == nil {
			return
		}
		if si == nil || us == nil {
			t.Fatal("it can be in one of the units only")
		}
		if len(si.Checks) != len(us.Checks) || si.Verdict != us.Verdict || len(si.Findings) != len(us.Findings) {
			t.Fatalf("%d checks, %s, %d findings and %d, %s, %d", len(si.Checks), si.Verdict, len(si.Findings), len(us.Checks), us.Verdict, len(us.Findings))
		}
		for i, a := range si.Checks {
			b := us.Checks[i]
			where := fmt.Sprintf("%s %s %s %s %s", a.Method, a.Member, a.Mode, a.Level, a.LoadCase)
			if a.Status != b.Status || a.Mode != b.Mode || a.Member != b.Member {
				t.Fatalf("%s: %s, and %s %s %s", where, a.Status, b.Member, b.Mode, b.Status)
			}
			if a.Margin == nil {
				continue
			}
			methods[a.Method] = true
			if math.Abs(*a.Margin-*b.Margin) > 1e-9*(1+math.Abs(*a.Margin)) {
				t.Fatalf("%s: %v in SI, %v in US", where, *a.Margin, *b.Margin)
			}
			if (a.NominalMargin == nil) != (b.NominalMargin == nil) || a.NominalMargin != nil && *a.NominalMargin < *a.Margin {
				t.Fatalf("%s: nominal margins %v and %v", where, a.NominalMargin, b.NominalMargin)
			}
		}
	})
	if len(methods) != 6 {
		t.Errorf("only %v gave margins", slices.Sorted(maps.Keys(methods)))
	}
}

// Sizing gives a value that holds as it is written, and the least one but for
// its twelfth digit.
func TestSizedLugsHold(t *testing.T) {
	s := open(t, storetest.SQLite(t), storetest.Signer(t))
	sized := func(t *rapid.T, question any) *service.LugSizing {
		body, err := json.Marshal(question)
		if err != nil {
			t.Fatal(err)
		}
		answer, err := s.SizeLug(t.Context(), body, service.View{NoWorkings: true})
		impossible(t, err)
		return answer
	}
	found := 0
	rapid.Check(t, func(t *rapid.T) {
		document := everyLug(t)
		units := rapid.SampledFrom([]string{"SI", "US"}).Draw(t, "units")
		if document["compare"] = []any{}; units == "US" {
			document = inUS(document, "").(map[string]any)
		}
		document["methods"] = []any{"elementary"}
		delete(document, "method_options")
		free := rapid.SampledFrom([]string{"thickness", "width", "hole_diameter", "edge_distance"}).Draw(t, "free")
		now := func(d map[string]any) float64 {
			switch x := d["lug"].(map[string]any)[free].(type) {
			case float64:
				return x
			case map[string]any:
				return x["nominal"].(float64)
			}
			return 0
		}(document)
		question := map[string]any{"input": document, "free": free, "bounds": []float64{now / 2, now * 3}, "target_margin": rapid.Float64Range(0, 0.3).Draw(t, "target")}
		answer := sized(t, question)
		if answer == nil || answer.Value == nil {
			return
		}
		found++
		for _, c := range answer.Result.Checks {
			if c.Status == "undetermined" || *c.Margin < question["target_margin"].(float64) {
				t.Fatalf("%s %s: %s, %v at %v", c.Member, c.Mode, c.Status, c.Margin, *answer.Value)
			}
		}
		if below := *answer.Value * (1 - 1e-9); below > now/2 {
			question["bounds"] = []float64{below, below * (1 + 1e-13)}
			if again := sized(t, question); again != nil && again.Value != nil {
				t.Fatalf("%v was found, and %v holds", *answer.Value, below)
			}
		}
	})
	if found == 0 {
		t.Error("nothing was ever found")
	}
}

// The README follows a clevis joint by hand: each row of its table is a working
// of the answer to its request, to the digits that stand there.
func TestReadmeFollowsTheClevisJoint(t *testing.T) {
	text, err := os.ReadFile("../README.md")
	if err != nil {
		t.Fatal(err)
	}
	_, section, found := strings.Cut(string(text), "## A clevis joint")
	section, _, ends := strings.Cut(section, "\n## ")
	_, request, asks := strings.Cut(section, "--json '")
	request, rest, closed := strings.Cut(request, "'\n")
	if !found || !ends || !asks || !closed {
		t.Fatal("the README has no such section")
	}
	r, err := service.Calculate(service.Lug, []byte(request), service.View{})
	if err != nil {
		t.Fatal(err)
	}
	rows := 0
	for line := range strings.Lines(rest) {
		cells := strings.Split(strings.TrimSpace(line), "|")
		if len(cells) != 6 || !strings.HasPrefix(cells[2], " `") {
			continue
		}
		rows++
		member, symbol, printed := strings.TrimSpace(cells[1]), strings.Trim(cells[2], " `"), strings.TrimSpace(cells[4])
		want, err := strconv.ParseFloat(printed, 64)
		if err != nil {
			t.Fatal(line)
		}
		_, decimals, _ := strings.Cut(printed, ".")
		if !slices.ContainsFunc(r.Workings, func(w service.Working) bool {
			return w.Member == member && w.Symbol == symbol && math.Abs(w.Value-want) <= 0.5001*math.Pow10(-len(decimals))
		}) {
			t.Errorf("no working of the %s has %s = %s", member, symbol, printed)
		}
	}
	if rows < 20 {
		t.Errorf("the table has %d rows", rows)
	}
	if g := r.Governing; g.Mode != "pin-combined" || math.Abs(*g.Margin-0.588) > 0.0005 {
		t.Errorf("%s governs with %v", g.Mode, *g.Margin)
	}
}

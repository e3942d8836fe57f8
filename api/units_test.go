package api_test

import (
	"encoding/json"
	"fmt"
	"math"
	"net/http"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"jointledger/store/storetest"
)

// The units of the documents: exact by definition, the international inch of
// 1959 and the pound-force of 0.45359237 kg at 9.80665 m/s².
const (
	millimetresPerInch = 25.4
	newtonsPerPound    = 4.4482216152605
)

// in turns what a document says in SI into one system of units.
type in string

func (u in) length(mm float64) float64 { return u.turn(mm, millimetresPerInch) }
func (u in) force(n float64) float64   { return u.turn(n, newtonsPerPound) }
func (u in) moment(nmm float64) float64 {
	return u.turn(nmm, newtonsPerPound*millimetresPerInch)
}

func (u in) stress(mpa float64) float64 {
	return u.turn(mpa, newtonsPerPound/(millimetresPerInch*millimetresPerInch))
}

func (u in) turn(si, per float64) float64 {
	if u == "US" {
		return si / per
	}
	return si
}

type object = map[string]any

// drawMaterial gives a material with some values left out.
func drawMaterial(t *rapid.T) func(in) object {
	name := rapid.StringMatching(`SM [a-z]{1,8}`).Draw(t, "material")
	values := map[string]float64{}
	for _, p := range []string{"ftu", "fty", "fsu", "fcy", "ftu_cross", "fty_cross"} {
		if rapid.IntRange(0, 9).Draw(t, p+" given") > 0 {
			values[p] = rapid.Float64Range(50, 1500).Draw(t, p)
		}
	}
	lo, hi := rapid.Float64Range(100, 2000).Draw(t, "fbru at 1.5"), rapid.Float64Range(100, 2500).Draw(t, "fbru at 2.0")
	return func(u in) object {
		m := object{"name": name, "bearing": []object{
			{"e_over_d": 1.5, "fbru": u.stress(lo), "fbry": u.stress(lo * 0.8)},
			{"e_over_d": 2.0, "fbru": u.stress(hi), "fbry": u.stress(hi * 0.8)},
		}}
		for p, v := range values {
			m[p] = u.stress(v)
		}
		return m
	}
}

func drawFactors(t *rapid.T) object {
	return object{
		"ultimate": rapid.Float64Range(1, 2).Draw(t, "u"), "fitting": rapid.Float64Range(1, 1.5).Draw(t, "s"),
		"special": []object{{"name": "casting", "value": rapid.Float64Range(1, 3).Draw(t, "casting"), "modes": []string{"bearing"}}},
	}
}

// drawLug gives a lug that can be calculated, in either system of units.
func drawLug(t *rapid.T) func(in) object {
	shape := rapid.SampledFrom([]string{"round", "square", "tapered"}).Draw(t, "shape")
	w := rapid.Float64Range(5, 300).Draw(t, "W")
	d := w * rapid.Float64Range(0.15, 0.6).Draw(t, "D/W")
	e := w * rapid.Float64Range(0.55, 1.5).Draw(t, "e/W")
	thickness := d * rapid.Float64Range(0.1, 2).Draw(t, "t/D")
	offset := w * rapid.Float64Range(-0.1, 0.1).Draw(t, "o/W")
	// The sides must not meet before the end.
	taper := rapid.Float64Range(0.05, 0.9).Draw(t, "β") * math.Atan((w/2-math.Abs(offset))/e) * 180 / math.Pi
	material, factors := drawMaterial(t), drawFactors(t)
	var angles, forces []float64
	for range rapid.IntRange(1, 4).Draw(t, "load cases") {
		angles = append(angles, rapid.SampledFrom([]float64{0, 180, 90, 37, 360, -90}).Draw(t, "α"))
		forces = append(forces, rapid.Float64Range(0, 1e6).Draw(t, "P"))
	}
	level := rapid.SampledFrom([]string{"limit", "ultimate"}).Draw(t, "level")
	return func(u in) object {
		lug := object{
			"shape": shape, "width": u.length(w), "thickness": u.length(thickness), "hole_diameter": u.length(d),
			"edge_distance": u.length(e), "offset": u.length(offset), "material": material(u),
		}
		if shape == "tapered" {
			lug["taper_angle"] = taper
		}
		var cases []object
		for i := range angles {
			cases = append(cases, object{"id": fmt.Sprint("L", i), "level": level, "force": u.force(forces[i]), "angle": angles[i]})
		}
		return object{"units": u, "methods": []string{"elementary", "affdl-tr-69-42"}, "lug": lug, "factors": factors, "load_cases": cases}
	}
}

// drawGroup gives a pattern that can be calculated, in either system of units.
func drawGroup(t *rapid.T) func(in) object {
	type place struct{ x, y, d float64 }
	var places []place
	columns, rows := rapid.IntRange(2, 4).Draw(t, "columns"), rapid.IntRange(2, 4).Draw(t, "rows")
	for i := range columns * rows {
		jitter := func(what string) float64 { return rapid.Float64Range(-5, 5).Draw(t, what) }
		places = append(places, place{float64(i%columns)*30 + jitter("x"), float64(i/columns)*30 + jitter("y"), rapid.Float64Range(3, 9).Draw(t, "D")})
	}
	draw := func(what string, most float64) (v [3]float64) {
		for i := range v {
			v[i] = rapid.Float64Range(-most, most).Draw(t, what)
		}
		return v
	}
	point, force, moment := draw("point", 500), draw("force", 1e5), draw("moment", 1e7)
	stiffness := rapid.SampledFrom([]string{"equal", "area"}).Draw(t, "stiffness")
	plate := rapid.Float64Range(1, 10).Draw(t, "t")
	material, factors := drawMaterial(t), drawFactors(t)
	shear, tension := rapid.Float64Range(1e3, 1e5).Draw(t, "V_1"), rapid.Float64Range(1e3, 1e5).Draw(t, "T_u")
	return func(u in) object {
		each := func(turn func(float64) float64, v [3]float64) [3]float64 {
			return [3]float64{turn(v[0]), turn(v[1]), turn(v[2])}
		}
		var fasteners []object
		for i, p := range places {
			fasteners = append(fasteners, object{
				"id": fmt.Sprint(i), "x": u.length(p.x), "y": u.length(p.y), "diameter": u.length(p.d),
				"type": object{"shear_strength": u.force(shear), "tension_strength": u.force(tension)},
			})
		}
		out := [][2]float64{{-15, -15}, {float64(columns)*30 - 15, -15}, {float64(columns)*30 - 15, float64(rows)*30 - 15}, {-15, float64(rows)*30 - 15}}
		for i := range out {
			out[i] = [2]float64{u.length(out[i][0]), u.length(out[i][1])}
		}
		return object{
			"units": u, "stiffness": stiffness, "fasteners": fasteners, "interaction": "2-2", "rules": []string{"common-practice"}, "factors": factors,
			"plates":     []object{{"id": "plate", "thickness": u.length(plate), "material": material(u), "outline": out}},
			"load_cases": []object{{"id": "L", "level": "ultimate", "point": each(u.length, point), "force": each(u.force, force), "moment": each(u.moment, moment)}},
		}
	}
}

// unitless is what two systems of units must agree on.
type unitless struct {
	Verdict string
	Checks  []struct {
		Member, Mode, Level, Status, Method string
		LoadCase                            string `json:"load_case"`
		Fastener                            *string
		Margin                              *float64
	}
	Findings []struct{ Code, Subject, Severity string }
	Shares   []struct{ Residual float64 }
}

// TestSIAndUSGiveTheSameMargins asks the same joint in both systems of units.
func TestSIAndUSGiveTheSameMargins(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	for target, draw := range map[string]func(*rapid.T) func(in) object{"/v1/lugs": drawLug, "/v1/fastener-groups": drawGroup} {
		t.Run(target, func(t *testing.T) {
			rapid.Check(t, func(r *rapid.T) {
				document := draw(r)
				ask := func(u in) (answer unitless) {
					body, err := json.Marshal(document(u))
					if err != nil {
						t.Fatal(err)
					}
					c.do(t, post(target+"?workings=none", body)).decode(t, http.StatusOK, &answer)
					return answer
				}
				si, us := ask("SI"), ask("US")
				if si.Verdict != us.Verdict || len(si.Checks) != len(us.Checks) || fmt.Sprint(si.Findings) != fmt.Sprint(us.Findings) {
					r.Fatalf("SI %+v\nUS %+v", si, us)
				}
				for i, a := range si.Checks {
					b := us.Checks[i]
					if a.Member != b.Member || a.Mode != b.Mode || a.Level != b.Level || a.Status != b.Status || (a.Margin == nil) != (b.Margin == nil) {
						r.Fatalf("SI %+v\nUS %+v", a, b)
					}
					if a.Margin != nil && math.Abs(*a.Margin-*b.Margin) > 1e-9*(1+math.Abs(*a.Margin)) {
						r.Fatalf("%s %s of %s: margin %.15g in SI and %.15g in US", a.Method, a.Mode, a.Member, *a.Margin, *b.Margin)
					}
				}
				for _, s := range append(si.Shares, us.Shares...) {
					if s.Residual > 1e-9 {
						r.Fatalf("residual %g", s.Residual)
					}
				}
			})
		})
	}
}

// TestBearingHasItsRange: at e/D of 1.2 nothing is extrapolated and the range
// is said; at 1.5 and 2.0 diameters typed in inches the rule is met and the
// value of the handbook holds (MIL-HDBK-5J section 1.4.7).
func TestBearingHasItsRange(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	type bearing struct {
		Verdict  string
		Findings []struct{ Code, Severity, Message string }
		Checks   []struct {
			Mode, Level, Status string
			Message             *string
			Allowable           *float64
		}
	}
	ask := func(target string, document object) (answer bearing) {
		t.Helper()
		body, err := json.Marshal(document)
		if err != nil {
			t.Fatal(err)
		}
		c.do(t, post(target+"?workings=none", body)).decode(t, http.StatusOK, &answer)
		return answer
	}
	material := object{"name": "SM plate", "ftu": 74000, "fty": 64000, "fsu": 42000, "bearing": []object{{"e_over_d": 1.5, "fbru": 107000, "fbry": 86000}, {"e_over_d": 2.0, "fbru": 140000, "fbry": 101000}}}
	factors := object{"ultimate": 1.5, "fitting": 1}
	lug := func(d, e float64) object {
		return object{
			"units": "US", "methods": []string{"elementary"}, "factors": factors, "load_cases": []object{{"id": "L", "level": "ultimate", "force": 10, "angle": 0}},
			"lug": object{"shape": "square", "width": 4, "thickness": 0.5, "hole_diameter": d, "edge_distance": e, "material": material},
		}
	}
	group := func(d, e float64) object {
		return object{
			"units": "US", "stiffness": "equal", "factors": factors, "rules": []string{"common-practice"},
			"fasteners":  []object{{"id": "1", "x": 0, "y": 0, "diameter": d}},
			"plates":     []object{{"id": "plate", "thickness": 0.5, "material": material, "outline": [][2]float64{{-e, -9}, {9, -9}, {9, 9}, {-e, 9}}}},
			"load_cases": []object{{"id": "L", "level": "ultimate", "point": []float64{0, 0, 0}, "force": []float64{-10, 0, 0}, "moment": []float64{0, 0, 0}}},
		}
	}
	for target, document := range map[string]object{"/v1/lugs": lug(1, 1.2), "/v1/fastener-groups": group(1, 1.2)} {
		a := ask(target, document)
		for _, check := range a.Checks {
			if check.Mode != "bearing" {
				continue
			}
			if check.Status != "undetermined" || check.Allowable != nil || !strings.Contains(*check.Message, "e/D 1.2 is below 1.5") {
				t.Errorf("%s at e/D 1.2: %+v", target, check)
			}
		}
		if a.Verdict != "undetermined" {
			t.Errorf("%s at e/D 1.2: %s", target, a.Verdict)
		}
	}
	// As typed: a decimal number, not a product of doubles.
	typed := func(x float64) (v float64) {
		if _, err := fmt.Sscan(fmt.Sprintf("%.4f", x), &v); err != nil {
			t.Fatal(err)
		}
		return v
	}
	for ratio, fbru := range map[float64]float64{1.5: 107000, 2: 140000} {
		// Every diameter from 0.100 to 1.000 in, each at its distance from one
		// straight side.
		const first, last = 100, 1000
		var fasteners []object
		for mils := first; mils <= last; mils++ {
			d := typed(float64(mils) / 1000)
			fasteners = append(fasteners, object{"id": fmt.Sprint(mils), "x": typed(ratio * d), "y": 10 * (mils - first), "diameter": d})
		}
		document := group(1, 1)
		document["fasteners"] = fasteners
		document["plates"] = []object{{"id": "plate", "thickness": 0.5, "material": material, "outline": [][2]float64{{0, -9}, {9, -9}, {9, 9999}, {0, 9999}}}}
		a := ask("/v1/fastener-groups", document)
		for _, f := range a.Findings {
			if f.Code == "edge-distance" && (f.Severity == "violation" || ratio == 2) {
				t.Errorf("at %g D: %s", ratio, f.Message)
			}
		}
		seen := 0
		for _, check := range a.Checks {
			if check.Mode != "bearing" || check.Level != "ultimate" {
				continue
			}
			if want := fbru * float64(first+seen) / 1000 * 0.5; check.Allowable == nil || math.Abs(*check.Allowable-want) > 1e-6*want {
				t.Errorf("at %g D, D %d mils: %+v, want %g", ratio, first+seen, check, want)
			}
			seen++
		}
		if seen != last-first+1 {
			t.Errorf("at %g D: %d fasteners in bearing, want %d", ratio, seen, last-first+1)
		}
		for mils := first; mils <= last; mils += 45 {
			d := typed(float64(mils) / 1000)
			seen := false
			for _, check := range ask("/v1/lugs", lug(d, typed(ratio*d))).Checks {
				if check.Mode == "bearing" && check.Level == "ultimate" {
					seen = check.Allowable != nil && math.Abs(*check.Allowable-fbru*d*0.5) <= 1e-6*fbru
				}
			}
			if !seen {
				t.Errorf("a lug with e of %g D, D %g: no bearing of the handbook's value", ratio, d)
			}
		}
	}
}

// TestGoverningKeepsNoMoreThanItsChecks: a large pattern without any check
// answers no shares of its own accord, where all would be without bound.
func TestGoverningKeepsNoMoreThanItsChecks(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	var cases []any
	for i := range 600 {
		cases = append(cases, object{"id": fmt.Sprint(i), "level": "limit", "point": []int{0, 0, 0}, "force": []int{i, 0, 0}, "moment": []int{0, 0, 0}})
	}
	body := edited(t, example(t, "calculateFastenerGroup", "sharingOnly"), object{"/load_cases": cases})
	for target, want := range map[string]int{"": 0, "?checks=governing": 0, "?checks=all": 600} {
		var a unitless
		c.do(t, post("/v1/fastener-groups"+target, body)).decode(t, http.StatusOK, &a)
		if len(a.Shares) != want {
			t.Errorf("%q: shares of %d load cases, want %d", target, len(a.Shares), want)
		}
	}
}

// TestMissingValueIsNamed: a material that lacks a value leaves that check
// undetermined, and the others stand.
func TestMissingValueIsNamed(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	var a struct {
		Verdict string
		Checks  []struct {
			Mode, Level, Status string
			Message             *string
		}
	}
	c.do(t, post("/v1/lugs", edited(t, example(t, "calculateLug", "lugSI"), map[string]any{"/lug/material/fsu": removed}))).decode(t, http.StatusOK, &a)
	for _, check := range a.Checks {
		if lacks := check.Mode == "shear-out"; lacks != (check.Status == "undetermined") || lacks && !strings.Contains(*check.Message, "F_su") {
			t.Errorf("%+v", check)
		}
	}
	if a.Verdict != "undetermined" || len(a.Checks) < 4 {
		t.Errorf("%+v", a)
	}
}

// TestExampleByHand follows the SI example of the document without the
// program's help: see the steps in its description.
func TestExampleByHand(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	var a struct {
		Checks []struct {
			Mode, Level       string
			Demand, Allowable float64
			Margin            float64
		}
	}
	c.do(t, post("/v1/lugs", example(t, "calculateLug", "lugSI"))).decode(t, http.StatusOK, &a)
	// Limit load 45 000 N; at ultimate times 1.5 times 1.15, at limit times 1.15.
	const ultimate, limit = 77625.0, 51750.0
	// Shear-out: planes 40° from the axis begin at 10 cos 40° = 7.660444 mm and
	// end on the arc of 30 mm at sqrt(900 - (10 sin 40°)²) = 29.303283 mm:
	// 2·12·21.642839·290 N.
	want := map[string]struct{ demand, allowable float64 }{
		"net-section ultimate": {ultimate, 2 * 12 * 20 * 500},
		"net-section limit":    {limit, 2 * 12 * 20 * 430},
		"shear-out ultimate":   {ultimate, 150634.16},
		"bearing ultimate":     {ultimate, 740 * 20 * 12}, // e/D = 30/20 = 1.5
		"bearing limit":        {limit, 590 * 20 * 12},
	}
	for _, check := range a.Checks {
		w, ok := want[check.Mode+" "+check.Level]
		if !ok || math.Abs(check.Demand-w.demand) > 1e-6 || math.Abs(check.Allowable-w.allowable) > 0.05 || math.Abs(check.Margin-(w.allowable/w.demand-1)) > 1e-6 {
			t.Errorf("%+v, want %+v", check, w)
		}
		delete(want, check.Mode+" "+check.Level)
	}
	if len(want) > 0 {
		t.Errorf("no checks of %v", want)
	}
}

package lug_test

import (
	"math"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

// Melcon and Hoblit on an invented set, by hand. A square lug of 50 x 12 with a
// 25 mm hole 50 mm from its end:
//
//	e/D 2: K_br 1.8, P_bru = 1.8 x 25 x 12 x 440 = 237,600 N
//	W/D 2: K_t 0.95, P_tu = 0.95 x 25 x 12 x 450 = 128,250 N, P_u the lesser
//	C 1: P_y = 370/440 x 128,250 = 107,846.59 N
//	h1 = h4 = 25 - 8.83883 = 16.16117, h2 = h3 = 12.5, h_av = 14.723615, over D 0.5889446
//	K_tru = K_try = 0.5889446: P_tru = 77,740.69 N, P_try = 65,372.85 N
//	45°: 1/(0.7071068^1.6 (128250^-1.6 + 77740.69^-1.6))^0.625 = 86,940.9 N
func TestMelconHoblitByHand(t *testing.T) {
	flat := func(along string, y float64) lug.Chart {
		return lug.Chart{Along: along, Curves: []lug.Curve{{Points: [][2]float64{{0.6, y}, {4, y}}}}}
	}
	set := &lug.CurveSet{ID: "invented", Version: "1", Method: melcon, Charts: map[string]lug.Chart{
		"Kbr": flat("e/D", 1.8), "C": flat("Pu/(D t Ftux)", 1),
		"Kt":   {Along: "W/D", Curves: []lug.Curve{{Points: [][2]float64{{1, 1}, {3, 0.9}}}}},
		"Ktru": {Along: "Aav/Abr", Curves: []lug.Curve{{Points: [][2]float64{{0.1, 0.1}, {1, 1}}}}},
		"Ktry": {Along: "Aav/Abr", Curves: []lug.Curve{{Points: [][2]float64{{0.1, 0.1}, {1, 1}}}}},
	}}
	j := bare()
	j.Lug.Shape, j.Lug.Width, j.Lug.EdgeDistance = lug.Square, 50, 50
	choice := []lug.Choice{{Method: melcon, Options: lug.Options{"curve_set": {Set: set}}}}
	hav := 6 / (4/(25-12.5*math.Sqrt2/2) + 2/12.5)
	across := hav / 25 * 25 * 12 * 440
	for _, c := range []struct {
		angle float64
		mode  strength.Mode
		level strength.Level
		want  float64
	}{
		{0, strength.ShearBearing, strength.Ultimate, 237600},
		{0, strength.NetSection, strength.Ultimate, 128250},
		{0, strength.ShearBearing, strength.Limit, 107846.5909},
		{90, strength.Transverse, strength.Ultimate, across},
		{270, strength.Transverse, strength.Limit, across * 370 / 440},
		{45, strength.Oblique, strength.Ultimate, math.Pow(math.Pow(math.Sqrt2/2, 1.6)*(math.Pow(128250, -1.6)+math.Pow(across, -1.6)), -0.625)},
	} {
		m := margin(t, prepare(t, j, choice, at(1000, c.angle)), "lug", c.mode, c.level)
		if math.Abs(m.Allowable-c.want) > 1e-6*c.want {
			t.Errorf("%s %s at %g°: %.3f, by hand %.3f", c.mode, c.level, c.angle, m.Allowable, c.want)
		}
	}
	for _, angle := range []float64{120, 180} {
		p := prepare(t, j, choice, at(1000, angle))
		if v := verdict(p, 1); v != strength.Undetermined {
			t.Errorf("a push at %g° is %s", angle, v)
		}
	}
}

func TestMelconHoblitNeedsCurves(t *testing.T) {
	m := margin(t, prepare(t, bare(), methods(melcon), at(1000, 0)), "lug", strength.ShearBearing, strength.Ultimate)
	if m.Status != strength.Undetermined || !strings.Contains(render(*m.Why), "Kbr, Kt, C or Kbry") {
		t.Errorf("without a set: %+v", m)
	}
	set := invented()
	delete(set.Charts, "Kt")
	choice := []lug.Choice{{Method: melcon, Options: lug.Options{"curve_set": {Set: set}}}}
	m = margin(t, prepare(t, bare(), choice, at(1000, 0)), "lug", strength.NetSection, strength.Ultimate)
	if m.Status != strength.Undetermined || !strings.Contains(render(*m.Why), "has no chart Kt") {
		t.Errorf("without Kt: %+v", m)
	}
}

// A chart with one curve for each material takes the one that the option names;
// the cut-off of 2.0 holds unless it is taken back; peaking shortens the arm.
func TestMelconHoblitOptions(t *testing.T) {
	set := invented()
	set.Charts["Kt"] = lug.Chart{Along: "W/D", Between: "curve", Curves: []lug.Curve{
		{At: 1, Points: [][2]float64{{1, 0.9}, {5, 0.9}}}, {At: 4, Points: [][2]float64{{1, 0.5}, {5, 0.5}}},
	}}
	set.Charts["Kbr"] = lug.Chart{Along: "e/D", Curves: []lug.Curve{{Points: [][2]float64{{0.5, 2.5}, {4, 2.5}}}}}
	run := func(o lug.Options, member string, mode strength.Mode) strength.Margin {
		o["curve_set"] = lug.Value{Set: set}
		return margin(t, prepare(t, hinge(), []lug.Choice{{Method: melcon, Options: o}}, at(1000, 0)), member, mode, strength.Ultimate)
	}
	if m := run(lug.Options{}, "lug", strength.NetSection); m.Status != strength.Undetermined {
		t.Errorf("no material curve: %+v", m)
	}
	if m := run(lug.Options{"material_curve": {Word: "4"}}, "lug", strength.NetSection); math.Abs(m.Allowable-0.5*660*450) > 1e-6 {
		t.Errorf("material curve 4: %+v", m)
	}
	if m := run(lug.Options{}, "lug", strength.ShearBearing); math.Abs(m.Allowable-2*25*12*440) > 1e-6 {
		t.Errorf("with the cut-off: %+v", m)
	}
	if m := run(lug.Options{"cut_off": {Flag: false}}, "lug", strength.ShearBearing); math.Abs(m.Allowable-2.5*25*12*440) > 1e-6 {
		t.Errorf("without the cut-off: %+v", m)
	}
	// (P/2)(3.5 + 0.5 + 0.5 x 3) = 2.75 P.
	if m := run(lug.Options{"peaking_factor": {Number: 0.5}}, "pin", strength.PinBending); math.Abs(m.Demand-2.75*1725) > 1e-9 {
		t.Errorf("peaking: %+v", m)
	}
	if _, wrong := lug.Prepare(hinge(), []lug.Choice{{Method: melcon, Options: lug.Options{"material_curve": {Word: "x"}}}}, usual(), at(1, 0)); len(wrong) != 1 {
		t.Errorf("a material curve that is no number: %v", wrong)
	}
}

func TestAISCProportions(t *testing.T) {
	j := lug.Joint{Lug: lug.Head{Shape: lug.Square, Width: 80, Thickness: 12, HoleDiameter: 25, EdgeDistance: 48, Material: plate()}, Pin: &lug.Pin{Diameter: 23.9, Material: steel()}}
	// b_e = min(24 + 16, 27.5) = 27.5: 1.33 b_e = 36.575 > 35.5; 2 b_e + Dp = 78.9 < 80; hole 25 > 24.9.
	p := prepare(t, j, methods("aisc-360-d5"), at(1, 0))
	for code, want := range map[string]bool{"proportion-end": true, "proportion-width": false, "proportion-hole": true} {
		if hasFinding(p, code) != want {
			t.Errorf("%s: %v", code, !want)
		}
	}
	lrfd := []lug.Choice{{Method: "aisc-360-d5", Options: lug.Options{"basis": {Word: "lrfd"}}}}
	m := margin(t, prepare(t, j, lrfd, at(1000, 0)), "lug", strength.Yielding, strength.Ultimate)
	if math.Abs(m.Allowable-0.9*380*80*12) > 1e-6 || m.Demand != 1500 {
		t.Errorf("gross yield by LRFD: %+v", m)
	}
}

// Methods with factors of their own take the fitting factor only when told to.
func TestSpecialFactorsOfOwnFactors(t *testing.T) {
	for _, apply := range []bool{false, true} {
		choice := []lug.Choice{{Method: "asme-bth-1", Options: lug.Options{"apply_special": {Flag: apply}}}}
		j := bare()
		j.Pin = &lug.Pin{Diameter: 25, Material: steel()}
		m := margin(t, prepare(t, j, choice, at(1000, 0)), "lug", strength.NetSection, strength.Limit)
		if want := map[bool]float64{false: 1000, true: 1150}[apply]; m.Demand != want {
			t.Errorf("apply_special %v: demand %g, expected %g", apply, m.Demand, want)
		}
	}
}

// EN 1993-1-8 table 3.10, replaceable pin: fy 355 (plate), d 50, d0 52, t 30,
// E 210000: bearing 0.6 x 30 x 50 x 355 = 319,500 N; contact: sigma =
// 0.591 sqrt(210000 F 2/(2500 x 30)) = 2.5 x 355 at F = 402,700 N.
func TestReplaceablePin(t *testing.T) {
	m := strength.Material{Ftu: 510, Fty: 355, E: 210000}
	j := lug.Joint{
		Lug: lug.Head{Shape: lug.Square, Width: 140, Thickness: 30, HoleDiameter: 52, EdgeDistance: 80, Material: m},
		Pin: &lug.Pin{Diameter: 50, Material: strength.Material{Ftu: 800, Fty: 640}},
	}
	choice := []lug.Choice{{Method: "en-1993-1-8", Options: lug.Options{"replaceable": {Flag: true}}}}
	p := prepare(t, j, choice, at(1000, 0))
	contact := math.Pow(2.5*355/0.591, 2) * 2500 * 30 / (210000 * 2)
	want := map[float64]bool{319500: true, contact: true}
	for k, c := range p.Checks() {
		if c.Mode == strength.Bearing && c.Level == strength.Limit {
			for w := range want {
				if math.Abs(margins(p, 0)[k].Allowable-w) < 1e-6*w {
					delete(want, w)
				}
			}
		}
	}
	if len(want) > 0 {
		t.Errorf("not found: %v", want)
	}
}

func TestStressConcentration(t *testing.T) {
	square := lug.Joint{Lug: hinge().Lug}
	square.Lug.Shape, square.Lug.HoleDiameter = lug.Square, 24 // D/W 0.3
	for _, c := range []struct {
		joint lug.Joint
		want  float64
	}{
		{square, 12.882 - 15.8142 + 8.07858 - 1.395009},
		{bare(), 0.85 + 0.95*3.2},
	} {
		steps := prepare(t, c.joint, methods("elementary"), at(1, 0)).StressConcentration()
		net, ok := working(steps, "K_tn")
		bearing, _ := working(steps, "K_tb")
		h := c.joint.Lug
		if !ok || math.Abs(net.Value-c.want) > 1e-9 || math.Abs(bearing.Value-c.want*h.HoleDiameter/(h.Width-h.HoleDiameter)) > 1e-9 {
			t.Errorf("%s: K_tn %.6f, K_tb %.6f, by hand %.6f", h.Shape, net.Value, bearing.Value, c.want)
		}
		if !strings.Contains(net.Source, "clearance") {
			t.Error("nothing is said of the clearance")
		}
	}
	narrow := bare()
	narrow.Lug.Width = 45 // W/D 1.8
	p := prepare(t, narrow, methods("elementary"), at(1, 0))
	if len(p.StressConcentration()) != 0 || !hasFinding(p, "stress-concentration") {
		t.Error("a factor outside its range")
	}
}

func TestMethodSpread(t *testing.T) {
	j := bare()
	j.Pin = &lug.Pin{Diameter: 25, Material: steel()}
	p := prepare(t, j, methods("elementary", "asme-bth-1"), at(50000, 0))
	for _, f := range p.Findings() {
		if f.Code == "method-spread" && f.Subject == "lug net-section" {
			return
		}
	}
	t.Error("a design factor of 3 beside 1.5 x 1.15 and nothing is said")
}

func TestComparedMethodsDoNotCount(t *testing.T) {
	choices := []lug.Choice{{Method: "elementary"}, {Method: "asme-bth-1", Compared: true}}
	p := prepare(t, bare(), choices, at(50000, 0)) // no pin: asme-bth-1 is undetermined
	if v := verdict(p, 1); v != strength.Adequate {
		t.Errorf("the verdict is %s", v)
	}
	if _, c := p.Governing(); p.Checks()[c].Compared {
		t.Error("a compared check governs")
	}
}

// The order of answers: member, method as asked, mode.
func TestOrderOfChecks(t *testing.T) {
	p := prepare(t, slim(), methods("asme-bth-1", affdl, "elementary"), at(1, 37))
	members := []string{"lug", "bushing", "clevis", "clevis-bushing", "pin", "joint"}
	asked := []string{"asme-bth-1@1", affdl + "@1", "elementary@1"}
	rank := func(c strength.Check) int {
		return 10000*position(members, c.Member) + 100*position(asked, c.Method) + int(c.Mode)
	}
	for k := 1; k < len(p.Checks()); k++ {
		if rank(p.Checks()[k]) < rank(p.Checks()[k-1]) {
			t.Errorf("%+v stands after %+v", p.Checks()[k], p.Checks()[k-1])
		}
	}
}

func position(all []string, s string) int {
	for i, a := range all {
		if a == s {
			return i
		}
	}
	return -1
}

// The pin of the Stress Analysis Manual bends plastically at ultimate: that it
// stays elastic at limit is a check of its own. A 20 mm pin through legs of 7 and
// a lug of 12 with gaps of 0.5: Z = π 20³/32 = 785.398 mm³, arm (7/2 + 12/4 +
// 0.5)/2 = 3.5 mm: 950 x 785.398 / 3.5 = 213,179.6 N. A pin without F_ty is told.
func TestAffdlPinStaysElasticAtLimit(t *testing.T) {
	find := func(j lug.Joint) (allowable float64, told bool) {
		p := prepare(t, j, methods(affdl), at(50000, 0))
		out := make([]strength.Margin, len(p.Checks()))
		p.Margins(0, out)
		for k, c := range p.Checks() {
			if c.Member == "pin" && c.Mode == strength.PinBending && c.Level == strength.Limit {
				allowable = out[k].Allowable
				if math.Abs(out[k].Demand-57500) > 1e-9 {
					t.Errorf("demand %g", out[k].Demand)
				}
			}
		}
		for _, f := range p.Findings() {
			told = told || f.Code == "pin-yield-not-checked"
		}
		return allowable, told
	}
	want := 950 * math.Pi * 8000 / 32 / 3.5
	if got, told := find(hinge()); math.Abs(got/want-1) > 1e-12 || told {
		t.Errorf("%g, by hand %g", got, want)
	}
	j := hinge()
	j.Pin.Material.Fty = 0
	if got, told := find(j); got != 0 || !told {
		t.Errorf("without F_ty: %g, told %v", got, told)
	}
}

package lug_test

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/interp"
	"jointledger/lug"
	"jointledger/strength"
)

const affdl = "affdl-tr-69-42"

func builtIn() *lug.CurveSet { return &lug.BuiltInCurveSets()[0] }

// Readings of the shape-preserving cubic agree with another implementation of
// Fritsch and Butland's slopes.
func TestChartsAreReadByPCHIP(t *testing.T) {
	points := [][2]float64{{0.10, 0.30}, {0.25, 0.55}, {0.33, 0.56}, {0.50, 0.90}, {0.60, 0.97}, {0.80, 1.0}}
	var xs, ys []float64
	for _, p := range points {
		xs, ys = append(xs, p[0]), append(ys, p[1])
	}
	var other interp.FritschButland
	if err := other.Fit(xs, ys); err != nil {
		t.Fatal(err)
	}
	for x := 0.2; x <= 0.66; x += 0.01 {
		set := *builtIn()
		set.ID, set.Charts = "own", map[string]lug.Chart{
			"K":  builtIn().Charts["K"],
			"Kn": {Along: "D/W", Curves: []lug.Curve{{Points: points}}},
		}
		j := bare()
		j.Lug.Shape = lug.Square
		j.Lug.Width = j.Lug.HoleDiameter / x
		j.Lug.EdgeDistance = j.Lug.Width
		got := workingOf(t, j, lug.Options{"curve_set": {Set: &set}}, 0, strength.NetSection, "K_n")
		if want := other.Predict(x); math.Abs(got-want) > 1e-9 {
			t.Errorf("at %.2f: %.12g, another implementation has %.12g", x, got, want)
		}
	}
}

// workingOf is a working of the lug's ultimate check of one mode.
func workingOf(t *testing.T, j lug.Joint, o lug.Options, angle float64, mode strength.Mode, symbol string) float64 {
	t.Helper()
	p := prepare(t, j, []lug.Choice{{Method: affdl, Options: o}}, at(1000, angle))
	for k, c := range p.Checks() {
		if c.Member == "lug" && c.Mode == mode && c.Level == strength.Ultimate {
			if w, ok := working(p.CaseWorkings(0, k, p.Workings(k, nil)), symbol); ok {
				return w.Value
			}
			out := make([]strength.Margin, len(p.Checks()))
			p.Margins(0, out)
			if out[k].Why != nil {
				t.Fatalf("no %s: %s", symbol, render(*out[k].Why))
			}
		}
	}
	t.Fatalf("no working %s", symbol)
	return 0
}

// The derived K a/D stands at 1.018 for e/D 1.25 and at 1.335 from 1.5 on; the
// manual's example is remembered to read 1.02 and 1.33.
func TestDerivedK(t *testing.T) {
	for _, c := range []struct{ ratio, product, tolerance float64 }{{1.25, 1.018, 0.0005}, {1.5, 1.335, 0.0005}, {2, 1.335, 1e-12}} {
		j := bare()
		j.Lug.Shape, j.Lug.EdgeDistance = lug.Square, c.ratio*25
		got := workingOf(t, j, nil, 0, strength.Bearing, "K")
		if c.ratio < 1.5 {
			got *= c.ratio - 0.5
		}
		if math.Abs(got-c.product) > c.tolerance {
			t.Errorf("e/D %g: %.5f, expected %g", c.ratio, got, c.product)
		}
	}
}

// An e/D that is 1.5 but for rounding is 1.5.
func TestFullEdgeWithinTolerance(t *testing.T) {
	j := bare()
	j.Lug.Shape, j.Lug.EdgeDistance = lug.Square, 37.5*(1-1e-12)
	if got := workingOf(t, j, nil, 0, strength.Bearing, "K"); got != 1.335 {
		t.Errorf("K is %.6f", got)
	}
}

// Kn between ratios r and strains q, by hand from the table: r = 0.85 lies half
// way between 0.8 and 0.9, q = 0.3 half way between 0.2 and 0.4, D/W = 0.5:
// r 0.9: (0.896 + 0.736)/2 = 0.816; r 0.8: (0.837 + 0.705)/2 = 0.771;
// Kn = (0.816 + 0.771)/2 = 0.7935.
func TestDerivedKn(t *testing.T) {
	j := bare()
	j.Lug.Width = 50
	m := &j.Lug.Material
	m.Ftu, m.Fty, m.Elongation = 500, 425, 0.10
	m.E = 500 / (0.3 * 0.10)
	if got := workingOf(t, j, nil, 0, strength.NetSection, "K_n"); math.Abs(got-0.7935) > 1e-12 {
		t.Errorf("K_n %.6f, by hand 0.7935", got)
	}
	// Below the first q of r = 0.9 and 0.8 (0.1 and 0.05) those values hold.
	m.E = 500 / (0.01 * 0.10)
	want := (0.931 + 0.870) / 2
	if got := workingOf(t, j, nil, 0, strength.NetSection, "K_n"); math.Abs(got-want) > 1e-12 {
		t.Errorf("K_n %.6f, by hand %.6f", got, want)
	}
	if !hasFinding(prepare(t, j, methods(affdl), at(1, 0)), "below-curves") {
		t.Error("no finding that the lower bound is used")
	}
}

func TestDerivedRanges(t *testing.T) {
	for _, c := range []struct {
		name, words string
		mode        strength.Mode
		angle       float64
		change      func(*lug.Head)
	}{
		{"brittle", "elongation", strength.Bearing, 0, func(h *lug.Head) { h.Material.Elongation = 0.049 }},
		{"thin", "D/t 5.1 is above 5, up to which", strength.Bearing, 0, func(h *lug.Head) { h.Thickness = 25 / 5.1 }},
		{"narrow", "W/D 1.2", strength.Bearing, 0, func(h *lug.Head) { h.Width = 30 }},
		{"weak in shear", "F_su/F_tu 0.5333", strength.Bearing, 0, func(h *lug.Head) { h.Material.Fsu = 240 }},
		{"short", "e/D 0.59 is outside 0.6", strength.Bearing, 0, func(h *lug.Head) { h.Shape, h.EdgeDistance = lug.Square, 0.59*25 }},
		{"no cross value", "F_tu,cross", strength.Bearing, 0, func(h *lug.Head) { h.Material.FtuCross = 0 }},
		{"wide", "D/W 0.1923 is outside 0.2", strength.NetSection, 0, func(h *lug.Head) { h.Width, h.EdgeDistance = 130, 65 }},
		{"low yield", "0.5556 is outside 0.6", strength.NetSection, 0, func(h *lug.Head) { h.Material.Fty = 250 }},
		{"strained", "q 0.45 is outside 0.05 to 0.4", strength.NetSection, 0, func(h *lug.Head) {
			h.Material.Fty, h.Material.E = 360, 450/(0.45*0.08)
		}},
		{"shorter than round", "nearer", strength.NetSection, 0, func(h *lug.Head) { h.Shape, h.EdgeDistance = lug.Square, 34 }},
		{"deep", "hav/D 1.193 is outside 0.33 to 1.1", strength.Transverse, 90, func(h *lug.Head) { h.Width = 80 }},
		{"soft across", "r 0.6364 is outside 0.65", strength.Transverse, 90, func(h *lug.Head) { h.Material.FtyCross = 280 }},
		{"no yield across", "F_ty,cross", strength.Oblique, 37, func(h *lug.Head) { h.Material.FtyCross = 0 }},
	} {
		j := lug.Joint{Lug: slim().Lug}
		c.change(&j.Lug)
		m := margin(t, prepare(t, j, methods(affdl), at(1000, c.angle)), "lug", c.mode, strength.Ultimate)
		if m.Status != strength.Undetermined || m.Why == nil || !strings.Contains(render(*m.Why), c.words) {
			why := ""
			if m.Why != nil {
				why = render(*m.Why)
			}
			t.Errorf("%s: %s %q", c.name, m.Status, why)
		}
	}
}

func TestAffdlFindings(t *testing.T) {
	j := hinge()
	j.Lug.Material.Bearing = nil
	j.Bushing.Interference = 0.15
	p, _ := lug.Prepare(j, methods(affdl), strength.Factors{Ultimate: 1.25, Fitting: 1}, at(1000, 0))
	for _, code := range []string{"yield-ratio", "cap-unknown", "derived-curves", "sustained-tension"} {
		if !hasFinding(p, code) {
			t.Errorf("no finding %s", code)
		}
	}
	p = prepare(t, hinge(), methods(affdl), at(1000, 0))
	for _, code := range []string{"yield-ratio", "cap-unknown", "sustained-tension"} {
		if hasFinding(p, code) {
			t.Errorf("a finding %s without reason", code)
		}
	}
}

// A press fit of 0.05 mm on the diameter, by hand: A 10, B 12.5, C 40 mm;
// steel 205000 MPa, 0.29; plate 71000 MPa, 0.33:
// (C²+B²)/(C²-B²) = 1756.25/1443.75 = 1.216450; (B²+A²)/(B²-A²) = 256.25/56.25 = 4.555556
// p = 0.025/{12.5/71000 (1.216450+0.33) + 12.5/205000 (4.555556-0.29)} = 0.025/(2.722623e-4+2.600949e-4) = 46.9609 MPa
// hoop of the lug 57.1256, of the bushing 2 p 156.25/56.25 = 260.894 MPa.
func TestPressFit(t *testing.T) {
	j := hinge()
	j.Bushing.Interference = 0.05
	p := prepare(t, j, methods(affdl), at(1000, 0))
	for member, want := range map[string]float64{"lug": 57.1256, "bushing": 260.894} {
		m := margin(t, p, member, strength.Yielding, strength.Limit)
		if math.Abs(m.Demand-want) > 1e-3 {
			t.Errorf("%s: %.5f, by hand %.5f", member, m.Demand, want)
		}
	}
}

func TestCurveSetChecks(t *testing.T) {
	sound := func() lug.CurveSet {
		return lug.CurveSet{ID: "a", Version: "1", Method: affdl, Charts: map[string]lug.Chart{
			"K":  {Along: "e/D", Between: "D/t", Curves: []lug.Curve{{At: 5, Points: [][2]float64{{0.6, 1.5}, {1, 1.4}, {1.5, 1.33}}}, {At: 10, Points: [][2]float64{{0.6, 1.4}, {1.5, 1.3}}}}},
			"Kn": {Along: "D/W", Curves: []lug.Curve{{Points: [][2]float64{{0.2, 0.8}, {0.5, 0.9}, {0.6, 1}}}}},
		}}
	}
	if set := sound(); len(set.Check()) != 0 {
		t.Fatalf("a sound set is refused: %v", set.Check())
	}
	for _, set := range lug.BuiltInCurveSets() {
		for _, f := range set.Check() {
			t.Errorf("the built-in %s: %s: %s", set.Name(), f.Pointer, render(f.Message))
		}
	}
	chart := func(s *lug.CurveSet, name string, change func(*lug.Chart)) {
		c := s.Charts[name]
		change(&c)
		s.Charts[name] = c
	}
	for pointer, change := range map[string]func(*lug.CurveSet){
		"/method":                      func(s *lug.CurveSet) { s.Method = "elementary" },
		"/tolerance":                   func(s *lug.CurveSet) { s.Tolerance = 0.3 },
		"/charts":                      func(s *lug.CurveSet) { s.Charts = nil },
		"/charts/Kx":                   func(s *lug.CurveSet) { s.Charts["Kx"] = s.Charts["K"] },
		"/charts/a~1b":                 func(s *lug.CurveSet) { s.Charts["a/b"] = s.Charts["K"] },
		"/charts/K/along":              func(s *lug.CurveSet) { chart(s, "K", func(c *lug.Chart) { c.Along = "D/W" }) },
		"/charts/K/between":            func(s *lug.CurveSet) { chart(s, "K", func(c *lug.Chart) { c.Between = "q" }) },
		"/charts/K/curves":             func(s *lug.CurveSet) { chart(s, "K", func(c *lug.Chart) { c.Between = "" }) },
		"/charts/Kn/curves":            func(s *lug.CurveSet) { chart(s, "Kn", func(c *lug.Chart) { c.Curves = nil }) },
		"/charts/K/curves/1/at":        func(s *lug.CurveSet) { s.Charts["K"].Curves[1].At = 5 },
		"/charts/Kn/curves/0/points":   func(s *lug.CurveSet) { s.Charts["Kn"].Curves[0].Points = [][2]float64{{0.2, 0.5}} },
		"/charts/Kn/curves/0/points/2": func(s *lug.CurveSet) { s.Charts["Kn"].Curves[0].Points[2][1] = 1.01 },
		"/charts/Kn/curves/0/points/1": func(s *lug.CurveSet) { s.Charts["Kn"].Curves[0].Points[1][0] = 0.1 },
		"/charts/K/curves/0/points/1":  func(s *lug.CurveSet) { s.Charts["K"].Curves[0].Points[1][1] = 0.2 },
		"/charts/K/curves/0/points/0":  func(s *lug.CurveSet) { s.Charts["K"].Curves[0].Points[0][0] = 0.4 },
		"/charts/K/curves/1/points/1":  func(s *lug.CurveSet) { s.Charts["K"].Curves[1].Points[1][1] = 1.4 },
	} {
		set := sound()
		change(&set)
		found := false
		for _, f := range set.Check() {
			found = found || f.Pointer == pointer && render(f.Message) != ""
		}
		if !found {
			t.Errorf("no fault at %s: %v", pointer, set.Check())
		}
	}
}

// Faults of a curve set stand where the request gives it.
func TestCurveSetOfARequest(t *testing.T) {
	for pointer, set := range map[string]*lug.CurveSet{
		"/method_options/affdl-tr-69-42/curve_set":        nil,
		"/method_options/affdl-tr-69-42/curve_set/charts": {ID: "a", Version: "1", Method: affdl},
	} {
		_, wrong := lug.Prepare(bare(), []lug.Choice{{Method: affdl, Options: lug.Options{"curve_set": {Set: set}}}}, usual(), at(1, 0))
		if len(wrong) != 1 || wrong[0].Pointer != pointer {
			t.Errorf("%v, expected one at %s", wrong, pointer)
		}
	}
}

// The depths of an offset hole depend on which side the load acts to. W 60,
// D 25, hole 5 mm toward +y: toward +y h1 = 30 - 5 - 8.83883 = 16.16117,
// h2 = 30 - 5 - 12.5 = 12.5, h3 = 25 - 12.5 = 12.5, h4 = 30 + 5 - 8.83883 =
// 26.16117; toward -y h1 and h4 change places and h2 = 22.5.
func TestDepthsOfAnOffsetHole(t *testing.T) {
	back := 12.5 * math.Sqrt2 / 2
	plus := 6 / (3/(25-back) + 1/12.5 + 1/12.5 + 1/(35-back))
	minus := 6 / (3/(35-back) + 1/22.5 + 1/12.5 + 1/(25-back))
	for _, c := range []struct{ offset, angle, want float64 }{{5, 90, plus}, {5, 270, minus}, {-5, 90, minus}, {-5, -90, plus}} {
		j := bare()
		j.Lug.Width, j.Lug.Offset = 60, c.offset
		if got := workingOf(t, j, nil, c.angle, strength.Transverse, "h_av"); math.Abs(got-c.want) > 1e-9 {
			t.Errorf("offset %g at %g°: %.6f, by hand %.6f", c.offset, c.angle, got, c.want)
		}
	}
}

// The built-in set is itself when it comes by way of a document, which keeps
// its points alone; another set cannot take its id.
func TestBuiltInSetByWayOfADocument(t *testing.T) {
	document := func() *lug.CurveSet {
		set := *builtIn()
		plain := lug.CurveSet{ID: set.ID, Version: set.Version, Method: set.Method, Charts: map[string]lug.Chart{}}
		for name, c := range set.Charts {
			own := lug.Chart{Figure: c.Figure, Along: c.Along, Between: c.Between}
			for _, curve := range c.Curves {
				own.Curves = append(own.Curves, lug.Curve{At: curve.At, Points: append([][2]float64(nil), curve.Points...)})
			}
			plain.Charts[name] = own
		}
		return &plain
	}
	choice := []lug.Choice{{Method: affdl, Options: lug.Options{"curve_set": {Set: document()}}}}
	p, q := prepare(t, slim(), choice, at(1000, 37)), prepare(t, slim(), methods(affdl), at(1000, 37))
	a, b := margins(p, 0), margins(q, 0)
	for k := range a {
		if a[k].Margin != b[k].Margin || a[k].Status != b[k].Status {
			t.Errorf("%+v: %+v, the built-in set %+v", p.Checks()[k], a[k], b[k])
		}
	}
	if !hasFinding(p, "derived-curves") {
		t.Error("it does not say that it is derived")
	}
	other := document()
	other.Charts["K"].Curves[0].Points[3][1] *= 1.01
	choice[0].Options["curve_set"] = lug.Value{Set: other}
	if _, wrong := lug.Prepare(slim(), choice, usual(), at(1000, 37)); len(wrong) != 1 {
		t.Errorf("other points under the id of the built-in set: %v", wrong)
	}
}

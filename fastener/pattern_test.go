package fastener

import (
	"fmt"
	"math"
	"regexp"
	"strings"
	"testing"

	"jointledger/strength"

	"pgregory.net/rapid"
)

func write(q strength.Quantity) string { return fmt.Sprintf("%.6g", q.Value) }

func faultText(faults []strength.Fault) string {
	var b strings.Builder
	for _, f := range faults {
		fmt.Fprintf(&b, "%s: %s\n", f.Pointer, f.Message.Render(write))
	}
	return b.String()
}

var plain = strength.Factors{Ultimate: 1.5, Fitting: 1.15}

func prepare(t testing.TB, p Pattern, cases ...PatternCase) *PreparedPattern {
	t.Helper()
	prepared, faults := PreparePattern(p, plain, cases)
	if len(faults) > 0 {
		t.Fatal(faultText(faults))
	}
	return prepared
}

// bracket is a pattern with everything: types, plates, rules, interaction.
func bracket() Pattern {
	bolt := &Type{Name: "SM-bolt 6", Source: "invented", Fsu: 655, Ftu: 1100, Thread: &Thread{Form: "iso", Pitch: 1, InShearPlane: true}}
	rated := &Type{Name: "SM-bolt 6 rated", Source: "invented", ShearStrength: 18000, TensionStrength: 21000}
	plate := &strength.Material{Name: "SM-plate", Source: "invented", Bearing: []strength.BearingStrength{
		{EOverD: 1.5, Fbru: 738, Fbry: 593}, {EOverD: 2, Fbru: 965, Fbry: 696},
	}}
	p := Pattern{Stiffness: "equal", Interaction: "2-2", Rules: RuleSets()}
	for i, at := range [][2]float64{{0, 0}, {40, 0}, {80, 5}, {0, 30}, {40, 30}, {80, 35}} {
		f := Fastener{ID: fmt.Sprint(i + 1), X: at[0], Y: at[1], Diameter: 6, Type: bolt, ShearPlanes: 1, ShearStiffness: float64(i + 1), TensionStiffness: float64(7 - i)}
		if i%2 == 1 {
			f.Type, f.ShearPlanes, f.Diameter = rated, 2, 8
		}
		p.Fasteners = append(p.Fasteners, f)
	}
	outline := [][2]float64{{-14, -10}, {95, -11}, {95, 50}, {-14, 46}}
	p.Plates = []Plate{
		{ID: "bracket", Thickness: 5, Material: plate, Outline: outline},
		{ID: "boom", Thickness: 4, Material: plate, Outline: outline, CountersinkDepth: 1},
	}
	return p
}

func spaceLoad(level strength.Level) PatternCase {
	return PatternCase{ID: "LC-" + level.String(), Level: level, Point: [3]float64{120, -20, 35}, Force: [3]float64{900, -2500, 4200}, Moment: [3]float64{20000, -30000, 50000}}
}

// Every symbol of every equation is itself a working of the same check, so that
// the margin can be followed by hand.
func TestWorkingsClose(t *testing.T) {
	for name, change := range variants() {
		t.Run(name, func(t *testing.T) {
			p := bracket()
			change(&p)
			prepared := prepare(t, p, spaceLoad(strength.Limit), spaceLoad(strength.Ultimate))
			margins := make([]strength.Margin, len(prepared.Checks()))
			followed := 0
			for i := range prepared.cases {
				prepared.Margins(i, margins)
				for c, check := range prepared.Checks() {
					if margins[c].Status == strength.NotExercised {
						continue
					}
					steps := prepared.CaseWorkings(i, c, prepared.Workings(c, nil))
					assertClosed(t, check, margins[c], steps)
					followPattern(t, check.Member+" "+check.Mode.String()+" "+check.Method, steps)
					followed++
				}
			}
			if followed == 0 {
				t.Error("no check was followed")
			}
		})
	}
}

var identifier = regexp.MustCompile(`[\p{L}][\p{L}\p{Nd}_']*(?:,[\p{L}\p{Nd}_']+)*`)

// functions are the identifiers that are no symbols.
var functions = map[string]bool{
	"sqrt": true, "min": true, "max": true, "exp": true, "cos": true, "sin": true, "Σ": true, "π": true,
	"solved": true, "for": true, "with": true, "and": true, "at": true, "once": true,
}

func assertClosed(t *testing.T, check strength.Check, m strength.Margin, steps []strength.Working) {
	t.Helper()
	known := map[string]bool{}
	weakest := strength.Given
	last := map[string]float64{}
	for _, s := range steps {
		known[s.Symbol] = true
		weakest = strength.Weakest(weakest, s.Mark)
		last[s.Symbol] = s.Value
	}
	for _, s := range steps {
		if math.IsNaN(s.Value) || math.IsInf(s.Value, 0) {
			t.Errorf("%s: %s is %g", check.Mode, s.Symbol, s.Value)
		}
		if s.Equation == "" && s.Source == "" {
			t.Errorf("%s: %s has neither equation nor source", check.Mode, s.Symbol)
		}
	}
	for _, s := range steps {
		for _, symbol := range identifier.FindAllString(s.Equation, -1) {
			if !functions[symbol] && !known[symbol] {
				t.Errorf("%s %s: %s = %s: no working explains %s", check.Member, check.Mode, s.Symbol, s.Equation, symbol)
			}
		}
	}
	if m.Status == strength.Undetermined {
		return
	}
	if weakest != check.Mark {
		t.Errorf("%s %s: mark %s, its workings make %s", check.Member, check.Mode, check.Mark, weakest)
	}
	if last["demand"] != m.Demand || last["MS"] != m.Margin {
		t.Errorf("%s %s: workings end at demand %g, margin %g, the check has %g, %g", check.Member, check.Mode, last["demand"], last["MS"], m.Demand, m.Margin)
	}
}

// fill gives a pattern's types and materials every value.
func fill(p *Pattern) {
	axis := 90.0
	for i := range p.Fasteners {
		t := *p.Fasteners[i].Type
		t.Ftu, t.Thread, t.Class, t.HeadDiameter = 800, &Thread{Form: "iso", Pitch: 1, InShearPlane: true}, "8.8", 12
		t.Preload = &Preload{Torque: 8000, NutFactor: 0.2, Scatter: 0.25, Relaxation: 0.05, LoadingPlane: 0.5, StiffnessRatio: 0.3, Friction: 0.3, SlipFactor: 1.2}
		if i == 2 {
			t.Preload = &Preload{Nominal: 15000, Scatter: 0.3, ThermalGain: 100, ThermalLoss: 50}
			t.PullThroughStrength = 9000
		}
		p.Fasteners[i].Type = &t
		p.Fasteners[i].HoleDiameter = p.Fasteners[i].Diameter + 0.5
	}
	for k := range p.Plates {
		m := *p.Plates[k].Material
		m.Ftu, m.Fty, m.Fsu, m.Fcy, m.E, m.Ec = 510, 440, 290, 430, 71e3, 73e3
		p.Plates[k].Material = &m
		p.Plates[k].AxisAngle = &axis
		p.Plates[k].Outline = append([][2]float64(nil), p.Plates[k].Outline...)
	}
}

func variants() map[string]func(*Pattern) {
	return map[string]func(*Pattern){
		"equal": func(*Pattern) {},
		"area":  func(p *Pattern) { p.Stiffness = "area" },
		"3-2":   func(p *Pattern) { p.Interaction = "3-2" },
		"en":    func(p *Pattern) { p.Interaction = "en-1993-1-8" },
		"methods": func(p *Pattern) {
			p.Methods, p.PackingThickness = StrengthMethods(), 8
			p.AISC.Basis = "asd"
			fill(p)
		},
		"rows":                 func(p *Pattern) { fill(p) },
		"rows at the ultimate": func(p *Pattern) { fill(p); p.InPlane = "instantaneous-centre" },
		"lrfd, far apart": func(p *Pattern) {
			p.Methods, p.Stiffness = []string{"aisc-360-j3", "en-1993-1-8"}, "area"
			fill(p)
			for i := range p.Fasteners {
				p.Fasteners[i].X *= 20
				p.Fasteners[i].Type.Thread.InShearPlane = i > 2
			}
			for k := range p.Plates {
				for i := range p.Plates[k].Outline {
					p.Plates[k].Outline[i][0] *= 20
				}
			}
		},
		"given": func(p *Pattern) { p.Stiffness = "given" },
		"tate-rosenfeld": func(p *Pattern) {
			p.Stiffness = "tate-rosenfeld"
			for i := range p.Fasteners {
				p.Fasteners[i].E, p.Fasteners[i].Nu = 200e3, 0.3
			}
			for k := range p.Plates {
				m := *p.Plates[k].Material
				m.E = 71e3
				p.Plates[k].Material = &m
			}
		},
		"slots": func(p *Pattern) {
			along, skew := 0.0, 40.0
			p.Stiffness, p.Fasteners[1].SlotAngle, p.Fasteners[4].SlotAngle = "given", &along, &skew
		},
		"heel":                 func(p *Pattern) { p.OutOfPlane = "heel" },
		"instantaneous centre": func(p *Pattern) { p.InPlane = "instantaneous-centre" },
	}
}

func TestWorkingsOfALineClose(t *testing.T) {
	p := bracket()
	p.Fasteners = p.Fasteners[:2]
	line := prepare(t, p, PatternCase{ID: "LC1", Level: strength.Limit, Point: [3]float64{10, 0, 0}, Force: [3]float64{0, 100, 900}, Moment: [3]float64{0, 700, 0}})
	p.Fasteners = p.Fasteners[:1]
	single := prepare(t, p, PatternCase{ID: "LC1", Level: strength.Limit, Force: [3]float64{10, 100, 900}})
	for _, prepared := range []*PreparedPattern{line, single} {
		margins := make([]strength.Margin, len(prepared.Checks()))
		prepared.Margins(0, margins)
		for c, check := range prepared.Checks() {
			if margins[c].Status != strength.NotExercised {
				steps := prepared.CaseWorkings(0, c, prepared.Workings(c, nil))
				assertClosed(t, check, margins[c], steps)
				followPattern(t, check.Member+" "+check.Mode.String()+" "+check.Method, steps)
			}
		}
	}
}

// drawPattern draws two or more rows of fasteners, as long or as broad as may
// be, each off its place by up to a third of the pitch, and a load in space.
func drawPattern(t *rapid.T) (Pattern, PatternCase) {
	jitter := rapid.Float64Range(-20, 20)
	n := rapid.IntRange(6, 24).Draw(t, "n")
	p := Pattern{Stiffness: rapid.SampledFrom([]string{"equal", "area", "given"}).Draw(t, "stiffness")}
	far := rapid.SampledFrom([]float64{0, 1e4}).Draw(t, "far")
	broad := math.Pow(10, rapid.Float64Range(-3, 1).Draw(t, "log broad"))
	sin, cos := math.Sincos(rapid.Float64Range(0, 7).Draw(t, "turned"))
	for i := range n {
		x := 60*float64(i%5) + jitter.Draw(t, "x")
		y := broad * (60*float64(i/5) + jitter.Draw(t, "y"))
		p.Fasteners = append(p.Fasteners, Fastener{
			ID: fmt.Sprint(i), X: far + x*cos - y*sin, Y: x*sin + y*cos,
			Diameter:         rapid.Float64Range(2, 30).Draw(t, "d"),
			ShearStiffness:   math.Pow(10, rapid.Float64Range(-6, 6).Draw(t, "log kv")),
			TensionStiffness: math.Pow(10, rapid.Float64Range(-6, 6).Draw(t, "log kt")),
		})
	}
	load := PatternCase{ID: "LC1", Level: rapid.SampledFrom([]strength.Level{strength.Limit, strength.Ultimate}).Draw(t, "level")}
	for k := range 3 {
		load.Point[k] = rapid.Float64Range(-500, 500).Draw(t, "point")
		load.Force[k] = rapid.Float64Range(-1e5, 1e5).Draw(t, "force")
		load.Moment[k] = rapid.Float64Range(-1e7, 1e7).Draw(t, "moment")
	}
	load.Point[0] += far
	return p, load
}

// The shares sum to the applied force and, about the load's point, to the
// applied moment.
func TestSharesBalanceTheLoad(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, load := drawPattern(t)
		prepared, faults := PreparePattern(p, plain, []PatternCase{load})
		if len(faults) > 0 {
			t.Fatal(faultText(faults))
		}
		shares := make([]Share, len(p.Fasteners))
		if residual := prepared.Shares(0, shares); !(residual <= 1e-9) {
			t.Fatalf("residual %g", residual)
		}
		assertBalanced(t, p, load, shares, 1e-9)
	})
}

func assertBalanced(t *rapid.T, p Pattern, load PatternCase, shares []Share, tolerance float64) {
	var force, moment [3]float64
	reach := 0.0
	for i, s := range shares {
		x, y, z := p.Fasteners[i].X-load.Point[0], p.Fasteners[i].Y-load.Point[1], -load.Point[2]
		f := [3]float64{s.Shear[0], s.Shear[1], s.Tension}
		for k := range 3 {
			force[k] += f[k]
		}
		moment[0] += y*f[2] - z*f[1]
		moment[1] += z*f[0] - x*f[2]
		moment[2] += x*f[1] - y*f[0]
		reach = max(reach, math.Hypot(math.Hypot(x, y), z))
	}
	size := math.Hypot(math.Hypot(load.Force[0], load.Force[1]), load.Force[2])
	turn := math.Hypot(math.Hypot(load.Moment[0], load.Moment[1]), load.Moment[2])
	for k := range 3 {
		if math.Abs(force[k]-load.Force[k]) > tolerance*(size+turn/reach) {
			t.Fatalf("force %d: %g, applied %g", k, force[k], load.Force[k])
		}
		if math.Abs(moment[k]-load.Moment[k]) > tolerance*(turn+size*reach) {
			t.Fatalf("moment %d: %g, applied %g", k, moment[k], load.Moment[k])
		}
	}
}

// Two load cases together share as the sum of each: the sharing is linear.
func TestSharesSuperpose(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, one := drawPattern(t)
		two := one
		for k := range 3 {
			two.Force[k] = rapid.Float64Range(-1e5, 1e5).Draw(t, "force 2")
			two.Moment[k] = rapid.Float64Range(-1e7, 1e7).Draw(t, "moment 2")
		}
		both := one
		for k := range 3 {
			both.Force[k] += two.Force[k]
			both.Moment[k] += two.Moment[k]
		}
		prepared, faults := PreparePattern(p, plain, []PatternCase{one, two, both})
		if len(faults) > 0 {
			t.Fatal(faultText(faults))
		}
		var shares [3][]Share
		scale := 0.0
		for i := range shares {
			shares[i] = make([]Share, len(p.Fasteners))
			prepared.Shares(i, shares[i])
			for _, s := range shares[i] {
				scale = max(scale, s.Resultant, math.Abs(s.Tension))
			}
		}
		for j := range p.Fasteners {
			a, b, c := shares[0][j], shares[1][j], shares[2][j]
			off := max(math.Abs(a.Shear[0]+b.Shear[0]-c.Shear[0]), math.Abs(a.Shear[1]+b.Shear[1]-c.Shear[1]), math.Abs(a.Tension+b.Tension-c.Tension))
			if off > 1e-9*scale {
				t.Fatalf("fastener %d: off by %g of %g", j, off, scale)
			}
		}
	})
}

func TestPatternFaults(t *testing.T) {
	square := [][2]float64{{-20, -20}, {120, -20}, {120, 60}, {-20, 60}}
	pure := func(m ...float64) PatternCase {
		return PatternCase{ID: "LC1", Level: strength.Limit, Moment: [3]float64(m)}
	}
	load := PatternCase{ID: "LC1", Level: strength.Limit, Point: [3]float64{0, 5, 0}, Force: [3]float64{100, 0, 0}}
	line := func(places ...float64) []Fastener {
		var all []Fastener
		for i := 0; i < len(places); i += 2 {
			all = append(all, Fastener{ID: fmt.Sprint(i / 2), X: places[i], Y: places[i+1], Diameter: 6})
		}
		return all
	}
	for name, c := range map[string]struct {
		pattern Pattern
		load    PatternCase
		want    map[string]string // pointer to a part of the message
	}{
		"nothing":                     {Pattern{Stiffness: "equal"}, load, map[string]string{"/fasteners": "at least one"}},
		"one fastener, moment":        {Pattern{Stiffness: "equal", Fasteners: line(0, 0)}, pure(0, 0, 10), map[string]string{"/load_cases/0/moment": "turning in the plane"}},
		"one fastener, eccentric":     {Pattern{Stiffness: "equal", Fasteners: line(0, 0)}, load, map[string]string{"/load_cases/0/point": "turning in the plane"}},
		"one fastener, rocking":       {Pattern{Stiffness: "equal", Fasteners: line(0, 0)}, pure(10, 0, 0), map[string]string{"/load_cases/0/moment": "rocking"}},
		"a line, moment about it":     {Pattern{Stiffness: "equal", Fasteners: line(0, 0, 10, 0, 30, 0)}, pure(10, 0, 0), map[string]string{"/load_cases/0/moment": "(0° from the x axis)"}},
		"a slanting line":             {Pattern{Stiffness: "equal", Fasteners: line(0.1, 0.1, 10.1, 10.1, 30.1, 30.1)}, pure(10, 0, 0), map[string]string{"/load_cases/0/moment": "(45° from the x axis)"}},
		"two in the same place":       {Pattern{Stiffness: "equal", Fasteners: line(0, 0, 10, 0, 0, 0)}, load, map[string]string{"/fasteners/2/x": "same place"}},
		"given without numbers":       {Pattern{Stiffness: "given", Fasteners: line(0, 0)}, load, map[string]string{"/fasteners/0/shear_stiffness": "positive", "/fasteners/0/tension_stiffness": "positive"}},
		"unknown words":               {Pattern{Stiffness: "soft", Interaction: "9-9", InPlane: "a", OutOfPlane: "b", Fasteners: line(0, 0)}, load, map[string]string{"/stiffness": "equal", "/interaction": "2-2", "/in_plane": "elastic", "/out_of_plane": "centroid"}},
		"outline crosses":             {outlined([][2]float64{{-20, -20}, {120, 60}, {120, -20}, {-20, 60}}, line(0, 0, 40, 0)), load, map[string]string{"/plates/0/outline": "crosses"}},
		"outline of two points":       {outlined([][2]float64{{-20, -20}, {120, 60}}, line(0, 0, 40, 0)), load, map[string]string{"/plates/0/outline": "at least 3"}},
		"outline without area":        {outlined([][2]float64{{-20, -20}, {0, 0}, {50, 50}}, line(0, 0, 40, 0)), load, map[string]string{"/plates/0/outline": "no area"}},
		"outline folds back":          {outlined([][2]float64{{-20, -20}, {120, -20}, {120, 60}, {120, 80}, {120, 60}, {-20, 60}}, line(0, 0, 40, 0)), load, map[string]string{"/plates/0/outline": "folds back"}},
		"outline repeats":             {outlined([][2]float64{{-20, -20}, {120, -20}, {120, -20}, {-20, 60}}, line(0, 0, 40, 0)), load, map[string]string{"/plates/0/outline": "the same"}},
		"hole centre outside":         {outlined(square, line(0, 0, 140, 0)), load, map[string]string{"/plates/0/outline": "not inside"}},
		"hole edge outside":           {outlined(square, line(0, 0, 118, 0)), load, map[string]string{"/plates/0/outline": "reaches the outline"}},
		"hole touches":                {outlined(square, line(0, 0, 117, 0)), load, map[string]string{"/plates/0/outline": "reaches the outline"}},
		"thread deeper than the bolt": {threaded("iso", 7), load, map[string]string{"/fasteners/0/type/thread/pitch": "no area"}},
		"thread unknown":              {threaded("round", 1), load, map[string]string{"/fasteners/0/type/thread/form": "unified"}},
	} {
		t.Run(name, func(t *testing.T) {
			prepared, faults := PreparePattern(c.pattern, plain, []PatternCase{c.load})
			if prepared != nil || len(faults) != len(c.want) {
				t.Fatalf("got %d faults, want %d:\n%s", len(faults), len(c.want), faultText(faults))
			}
			for _, f := range faults {
				if part, ok := c.want[f.Pointer]; !ok || !strings.Contains(f.Message.Render(write), part) {
					t.Errorf("%s: %s", f.Pointer, f.Message.Render(write))
				}
			}
		})
	}
}

func outlined(outline [][2]float64, fasteners []Fastener) Pattern {
	return Pattern{Stiffness: "equal", Fasteners: fasteners, Plates: []Plate{{ID: "plate", Thickness: 3, Outline: outline}}}
}

func threaded(form string, pitch float64) Pattern {
	return Pattern{Stiffness: "equal", Fasteners: []Fastener{{ID: "1", Y: 5, Diameter: 6, Type: &Type{Ftu: 800, Thread: &Thread{Form: form, Pitch: pitch}}}}}
}

// A line of fasteners bears everything but a moment about itself.
func TestALineBearsAMomentAcrossIt(t *testing.T) {
	p := Pattern{Stiffness: "equal"}
	for i := range 3 {
		p.Fasteners = append(p.Fasteners, Fastener{ID: fmt.Sprint(i), X: 3 * float64(i), Y: 4 * float64(i), Diameter: 1})
	}
	// A couple across the line of 5 mm steps: ±M/10 at its ends.
	prepared := prepare(t, p, PatternCase{ID: "LC1", Level: strength.Limit, Moment: [3]float64{80, -60, 0}})
	shares := make([]Share, 3)
	prepared.Shares(0, shares)
	for i, want := range []float64{-10, 0, 10} {
		if math.Abs(shares[i].Tension-want) > 1e-12 {
			t.Errorf("tension %d is %g, want %g", i, shares[i].Tension, want)
		}
	}
}

// An edge distance typed as exactly 1.5 D or 2.0 D in inches is one, for the
// rules and for bearing.
func TestTypedEdgeDistancePasses(t *testing.T) {
	material := &strength.Material{Name: "SM-plate", Bearing: []strength.BearingStrength{{EOverD: 1.5, Fbru: 700, Fbry: 600}, {EOverD: 2, Fbru: 900, Fbry: 700}}}
	set, _ := FindRules("common-practice")
	for _, ratio := range []struct {
		times float64
		fbru  float64
		warn  bool
	}{{1.5, 700, true}, {2, 900, false}} {
		for mil := 100; mil <= 1000; mil++ {
			d := float64(mil) / 1000 // typed, in
			// The typed decimal of ratio times d.
			var e float64
			if _, err := fmt.Sscan(fmt.Sprintf("%.4f", ratio.times*float64(mil)/1000), &e); err != nil {
				t.Fatal(err)
			}
			x := 7.0 // away from the origin, so that the distance is a rounded difference
			p := Pattern{Stiffness: "equal", Rules: []RuleSet{set}, Fasteners: []Fastener{{ID: "1", X: x * 25.4, Diameter: d * 25.4}}}
			p.Plates = []Plate{{ID: "p", Thickness: d * 25.4, Material: material, Outline: [][2]float64{
				{0, -100}, {(x + e) * 25.4, -100}, {(x + e) * 25.4, 100}, {0, 100},
			}}}
			prepared := prepare(t, p, PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{x * 25.4}, Force: [3]float64{1000}})
			margins := make([]strength.Margin, len(prepared.Checks()))
			prepared.Margins(0, margins)
			margins = margins[len(margins)-2:] // bearing, after a shear-out
			want := ratio.fbru * d * d * 25.4 * 25.4
			if math.Abs(margins[0].Allowable/want-1) > 1e-8 || margins[1].Status == strength.Undetermined {
				t.Fatalf("D %g in, e %g in: bearing %+v, want %g", d, e, margins[0], want)
			}
			for _, f := range prepared.Findings() {
				if f.Code == "edge-distance" && (f.Severity == strength.Violation || !ratio.warn) {
					t.Fatalf("D %g in, e %g in: %s", d, e, f.Message.Render(write))
				}
			}
		}
	}
}

func TestBearingOutsideItsRange(t *testing.T) {
	for name, c := range map[string]struct {
		change func(*Pattern)
		says   string
	}{
		"short edge":      {func(p *Pattern) { p.Plates[0].Outline = [][2]float64{{-7.2, -30}, {95, -30}, {95, 60}, {-7.2, 60}} }, "e/D 1.2 is below 1.5"},
		"thin plate":      {func(p *Pattern) { p.Plates[0].Thickness = 1 }, "t/D 0.1667 is below 0.18"},
		"no outline":      {func(p *Pattern) { p.Plates[0].Outline = nil }, "no outline"},
		"no bearing data": {func(p *Pattern) { p.Plates[0].Material = &strength.Material{Name: "bare"} }, "has no F_bru"},
	} {
		t.Run(name, func(t *testing.T) {
			p := bracket()
			c.change(&p)
			prepared := prepare(t, p, spaceLoad(strength.Ultimate))
			margins := make([]strength.Margin, len(prepared.Checks()))
			prepared.Margins(0, margins)
			for k, check := range prepared.Checks() {
				if check.Fastener == "1" && check.Member == "bracket" && check.Mode == strength.Bearing && check.Level == strength.Ultimate {
					if m := margins[k]; m.Status != strength.Undetermined || !strings.Contains(m.Why.Render(write), c.says) {
						t.Errorf("got %+v", m)
					}
				}
				if check.Member == memberFastener && margins[k].Status == strength.Undetermined {
					t.Error("a fastener's own check fell with the plate's")
				}
			}
		})
	}
}

func TestChecksAreInOrder(t *testing.T) {
	prepared := prepare(t, bracket(), spaceLoad(strength.Limit))
	var got []string
	for _, c := range prepared.Checks()[:9] {
		got = append(got, strings.Join([]string{c.Fastener, c.Member, c.Mode.String(), c.Level.String()}, " "))
	}
	want := []string{
		"1 fastener shear ultimate", "1 fastener tension ultimate", "1 fastener shear-tension ultimate",
		"1 bracket shear-out ultimate", "1 bracket bearing ultimate", "1 bracket bearing limit",
		"1 boom shear-out ultimate", "1 boom bearing ultimate", "1 boom bearing limit",
	}
	if strings.Join(got, ", ") != strings.Join(want, ", ") {
		t.Errorf("got %q", got)
	}
}

func TestNearestNeighbours(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 60).Draw(t, "n")
		fasteners := make([]Fastener, n)
		for i := range fasteners {
			fasteners[i].X = float64(rapid.IntRange(-5, 5).Draw(t, "x"))
			fasteners[i].Y = float64(rapid.IntRange(-20, 20).Draw(t, "y"))
		}
		for i, got := range NearestNeighbours(fasteners) {
			want := math.Inf(1)
			for j := range fasteners {
				if j != i {
					want = min(want, math.Hypot(fasteners[i].X-fasteners[j].X, fasteners[i].Y-fasteners[j].Y))
				}
			}
			if got.Distance != want {
				t.Fatalf("fastener %d: %g, want %g", i, got.Distance, want)
			}
		}
	})
}

func thousand() (Pattern, []PatternCase) {
	p := Pattern{Stiffness: "equal", Interaction: "2-2"}
	bolt := &Type{Name: "SM-bolt", ShearStrength: 18000, TensionStrength: 21000}
	for i := range 1000 {
		p.Fasteners = append(p.Fasteners, Fastener{ID: fmt.Sprint(i), X: float64(i%40) * 25, Y: float64(i/40) * 25, Diameter: 6, Type: bolt})
	}
	cases := make([]PatternCase, 1000)
	for i := range cases {
		a := float64(i)
		cases[i] = PatternCase{ID: fmt.Sprint(i), Level: strength.Limit, Point: [3]float64{a, 3 * a, 50}, Force: [3]float64{1e4 * math.Cos(a), 1e4 * math.Sin(a), 2e4}}
	}
	return p, cases
}

func TestACaseAllocatesNothing(t *testing.T) {
	prepared := prepare(t, bracket(), spaceLoad(strength.Limit))
	margins := make([]strength.Margin, len(prepared.Checks()))
	shares := make([]Share, 6)
	if n := testing.AllocsPerRun(20, func() { prepared.Margins(0, margins); prepared.Shares(0, shares) }); n != 0 {
		t.Errorf("%g allocations a load case", n)
	}
}

// BenchmarkThousandByThousand shares and checks 1,000 load cases on 1,000
// fasteners.
func BenchmarkThousandByThousand(b *testing.B) {
	p, cases := thousand()
	prepared := prepare(b, p, cases...)
	b.Run("shares", func(b *testing.B) {
		b.ReportAllocs()
		shares := make([]Share, len(p.Fasteners))
		for b.Loop() {
			for i := range cases {
				prepared.Shares(i, shares)
			}
		}
	})
	b.Run("margins", func(b *testing.B) {
		b.ReportAllocs()
		margins := make([]strength.Margin, len(prepared.Checks()))
		for b.Loop() {
			for i := range cases {
				prepared.Margins(i, margins)
			}
		}
	})
}

// BenchmarkPrepareTenThousand prepares 10,000 fasteners in one straight row,
// the worst case of the search for the nearest one.
func BenchmarkPrepareTenThousand(b *testing.B) {
	p := Pattern{Stiffness: "equal", Rules: RuleSets()}
	for i := range 10000 {
		p.Fasteners = append(p.Fasteners, Fastener{ID: fmt.Sprint(i), X: float64(i) * 25, Diameter: 6})
	}
	for b.Loop() {
		prepare(b, p, PatternCase{ID: "LC1", Level: strength.Limit, Force: [3]float64{1, 0, 0}})
	}
}

// Which part of a fastener's load a plate bears: all of it, half in an outer
// plate of a joint in double shear, or what is given.
func TestLoadShares(t *testing.T) {
	p := bracket()
	for i := range p.Fasteners {
		p.Fasteners[i].ShearPlanes = 2
	}
	p.Plates = append(p.Plates, p.Plates[1])
	p.Plates[2].ID, p.Plates[2].LoadShare = "strap", 0.6
	load := PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{40, 50.0 / 3, 0}, Force: [3]float64{6000, 0, 0}}
	prepared := prepare(t, p, load)
	shares := make([]Share, len(p.Fasteners))
	prepared.Shares(0, shares)
	margins := make([]strength.Margin, len(prepared.Checks()))
	prepared.Margins(0, margins)
	found := 0
	for k, c := range prepared.Checks() {
		part, ok := map[string]float64{"bracket": 1, "boom": 0.5, "strap": 0.6}[c.Member]
		if !ok || c.Fastener != "1" || c.Mode != strength.Bearing || c.Level != strength.Ultimate {
			continue
		}
		found++
		if want := part * shares[0].Resultant * 1.15; math.Abs(margins[k].Demand/want-1) > 1e-12 {
			t.Errorf("%s: demand %g, want %g", c.Member, margins[k].Demand, want)
		}
	}
	if found != 3 {
		t.Errorf("%d plates", found)
	}
	said := 0
	for _, f := range prepared.Findings() {
		if f.Code == "load-share" && f.Subject == "plate boom" {
			said++
		}
	}
	if said != 1 {
		t.Errorf("the default share of the boom is told %d times", said)
	}
}

// Fasteners that are pushed together, and limit checks from ultimate loads, are
// told once for all load cases.
func TestFindingsOfLoadCases(t *testing.T) {
	one, two := spaceLoad(strength.Ultimate), spaceLoad(strength.Ultimate)
	two.ID, two.Force[2] = "pushed", -40000
	count := map[string]string{}
	for _, f := range prepare(t, bracket(), one, two).Findings() {
		if f.Code == "compression" || f.Code == "limit-from-ultimate" {
			if count[f.Code] != "" {
				t.Errorf("%s is told twice", f.Code)
			}
			count[f.Code] = f.Message.Render(write)
		}
	}
	if !strings.Contains(count["compression"], `in "pushed"`) || !strings.HasPrefix(count["limit-from-ultimate"], "2 of 2") {
		t.Errorf("%q", count)
	}
}

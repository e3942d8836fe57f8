package fastener

import (
	"fmt"
	"strings"
	"testing"

	"jointledger/strength"
)

// found lists a pattern's layout findings as "severity code subject".
func found(p *PreparedPattern) map[string]string {
	all := map[string]string{}
	for _, f := range p.Findings() {
		all[f.Severity.String()+" "+f.Code+" "+f.Subject] = f.Message.Render(write)
	}
	return all
}

func rowOf(pitch, diameter float64, n int) []Fastener {
	var all []Fastener
	for i := range n {
		all = append(all, Fastener{ID: fmt.Sprint(i + 1), X: float64(i) * pitch, Diameter: diameter})
	}
	return all
}

// Each rule of the built-in sets, just met and just missed.
func TestRuleSetsAtTheirBounds(t *testing.T) {
	load := PatternCase{ID: "LC1", Level: strength.Limit, Force: [3]float64{100, 0, 0}}
	outline := func(edge, far float64) [][2]float64 {
		return [][2]float64{{-far, -edge}, {far + 500, -edge}, {far + 500, far}, {-far, far}}
	}
	const step = 1e-6
	for _, c := range []struct {
		set, finding string
		make         func(x float64) Pattern // x the measure
		bound        float64
		most         bool
	}{
		{"common-practice", "violation edge-distance fastener 1", func(x float64) Pattern { return outlined(outline(x, 60), rowOf(60, 10, 2)) }, 15, false},
		{"common-practice", "warning edge-distance fastener 1", func(x float64) Pattern { return outlined(outline(x, 60), rowOf(60, 10, 2)) }, 20, false},
		{"common-practice", "violation pitch fastener 2", func(x float64) Pattern { return outlined(outline(30, 60), rowOf(x, 10, 2)) }, 30, false},
		{"common-practice", "warning pitch fastener 2", func(x float64) Pattern { return outlined(outline(30, 60), rowOf(x, 10, 2)) }, 40, false},
		{"common-practice", "violation countersink-depth plate plate", func(x float64) Pattern {
			p := outlined(outline(30, 60), rowOf(60, 10, 2))
			p.Plates[0].CountersinkDepth = x
			return p
		}, 2.1, true},
		{"ac-43-13-1b", "violation edge-distance fastener 1", func(x float64) Pattern { return outlined(outline(x, 60), rowOf(60, 10, 2)) }, 20, false},
		{"ac-43-13-1b", "violation pitch fastener 1", func(x float64) Pattern { return outlined(outline(30, 60), rowOf(x, 10, 3)) }, 30, false},
		{"ac-43-13-1b", "violation pitch fastener 1", func(x float64) Pattern {
			p := outlined(outline(60, 90), rowOf(x, 10, 3))
			second := rowOf(x, 10, 3)
			for i := range second {
				second[i].ID, second[i].Y = "b"+second[i].ID, 50
			}
			p.Fasteners = append(p.Fasteners, second...)
			return p
		}, 40, false},
		{"en-1993-1-8", "violation edge-distance fastener 1", func(x float64) Pattern {
			p := outlined(outline(x, 60), rowOf(42, 10, 2))
			p.Fasteners[0].HoleDiameter = 11
			return p
		}, 13.2, false},
		{"en-1993-1-8", "violation pitch-along fastener 1", func(x float64) Pattern { return outlined(outline(30, 60), rowOf(x, 10, 2)) }, 22, false},
		{"en-1993-1-8", "violation pitch-across fastener 1", func(x float64) Pattern {
			p := outlined(outline(30, 90), rowOf(x, 10, 2))
			p.Fasteners[1].X, p.Fasteners[1].Y = 0, x
			return p
		}, 24, false},
		{"en-1993-1-8", "warning edge-distance-most fastener 1", func(x float64) Pattern { return outlined(outline(x, 400), rowOf(42, 10, 2)) }, 52, true},
		{"en-1993-1-8", "violation pitch-most fastener 1", func(x float64) Pattern { return outlined(outline(30, 60), rowOf(x, 10, 2)) }, 42, true},
		{"aisc-360", "violation pitch fastener 1", func(x float64) Pattern { return outlined(outline(30, 60), rowOf(x, 12, 2)) }, 32, false},
		{"aisc-360", "warning pitch fastener 1", func(x float64) Pattern { return outlined(outline(30, 60), rowOf(x, 12, 2)) }, 36, false},
		{"aisc-360", "violation edge-distance fastener 1", func(x float64) Pattern { return outlined(outline(x, 90), rowOf(72, 20, 2)) }, 26, false},
		{"aisc-360", "violation edge-distance fastener 1", func(x float64) Pattern { return outlined(outline(x, 90), rowOf(72, 40, 2)) }, 50, false},
		{"aisc-360", "violation edge-distance-most fastener 1", func(x float64) Pattern { return outlined(outline(x, 400), rowOf(72, 20, 2)) }, 36, true},
		{"aisc-360", "violation pitch-most fastener 1", func(x float64) Pattern { return outlined(outline(30, 90), rowOf(x, 20, 2)) }, 72, true},
	} {
		t.Run(fmt.Sprintf("%s %s %g", c.set, c.finding, c.bound), func(t *testing.T) {
			set, ok := FindRules(c.set)
			if !ok {
				t.Fatal("no such set")
			}
			for _, x := range []float64{c.bound - step, c.bound, c.bound + step} {
				p := c.make(x)
				p.Rules = []RuleSet{set}
				all := found(prepare(t, p, load))
				broken := x < c.bound
				if c.most {
					broken = x > c.bound
				}
				if _, got := all[c.finding]; got != broken {
					t.Errorf("at %.7g: found %t, want %t: %v", x, got, broken, all)
				}
			}
		})
	}
}

// Along the load: a fastener near one edge breaks the rule only when it pushes
// that way, and the finding names the load case.
func TestEdgeDistanceAlongTheLoad(t *testing.T) {
	own := RuleSet{ID: "own", Revision: 1, Source: "invented", Rules: []Rule{{Measure: EdgeDistanceAlong, Severity: strength.Violation, Diameters: 2}}}
	if faults := own.Check(); len(faults) > 0 {
		t.Fatal(faultText(faults))
	}
	p := outlined([][2]float64{{-15, -50}, {100, -50}, {100, 50}, {-15, 50}}, rowOf(40, 10, 2))
	p.Rules = []RuleSet{own}
	pull := PatternCase{ID: "away", Level: strength.Limit, Force: [3]float64{-100, 0, 0}}
	if all := found(prepare(t, p, pull)); all["violation edge-distance-along fastener 1"] != "" {
		t.Errorf("found %v", all)
	}
	// The attached member is pulled along +x: it bears back toward its edge at -15.
	toward := pull
	toward.ID, toward.Force[0] = "toward", 100
	all := found(prepare(t, p, pull, toward))
	if m := all["violation edge-distance-along fastener 1"]; !strings.Contains(m, `15 (1.5 D) in plate "plate" under load case "toward" is less than 20 (2 D)`) {
		t.Errorf("found %v", all)
	}
}

func TestOwnRulesAreChecked(t *testing.T) {
	bad := RuleSet{ID: "own", Rules: []Rule{{Measure: "tidiness", Severity: strength.Violation, Diameters: 1}, {Measure: Pitch, Diameters: 1}, {Measure: Pitch, Severity: strength.Note}, {Measure: Pitch, Severity: strength.Note, Length: -1}}}
	var pointers []string
	for _, f := range bad.Check() {
		pointers = append(pointers, f.Pointer)
	}
	if got := strings.Join(pointers, " "); got != "/rules/0/measure /rules/1/severity /rules/2/diameters /rules/3/diameters" {
		t.Error(got)
	}
	if len((RuleSet{}).Check()) != 1 {
		t.Error("a set without rules passes")
	}
}

func TestFindRules(t *testing.T) {
	for name, want := range map[string]bool{"common-practice": true, "common-practice@1": true, "common-practice@2": false, "aisc-360@1": true, "ours": false} {
		if _, ok := FindRules(name); ok != want {
			t.Errorf("%s: %t", name, ok)
		}
	}
}

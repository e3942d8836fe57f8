package fastener

import (
	"strings"
	"testing"

	"jointledger/strength"
)

// The least diameter whose shear holds: 4 fasteners of F_su 655 MPa under 60 kN
// at ultimate need π/4 d² 655 >= 15000 x 1.15, d >= 5.791 mm.
func TestSizeDiameter(t *testing.T) {
	bolt := &Type{Name: "SM-pin", Source: "invented", Fsu: 655}
	p := Pattern{Stiffness: "equal", Fasteners: rowOf(40, 3, 4)}
	for i := range p.Fasteners {
		p.Fasteners[i].Type = bolt
	}
	load := PatternCase{ID: "LC1", Level: strength.Ultimate, Force: [3]float64{60e3, 0, 0}}
	sizes := []Candidate{{Diameter: 8}, {Diameter: 5}, {Diameter: 6}, {Diameter: 5.79}}
	trials, faults := SizeDiameter(p, plain, []PatternCase{load}, sizes, 0)
	if len(faults) > 0 {
		t.Fatal(faultText(faults))
	}
	last := trials[len(trials)-1]
	if len(trials) != 3 || !last.Holds || last.Candidate.Diameter != 6 || last.Prepared.Checks()[last.Check].Mode != strength.Shear {
		t.Errorf("%+v", trials)
	}
	if trials[1].Holds || trials[1].Margin > 0 || trials[1].Candidate.Diameter != 5.79 {
		t.Errorf("%+v", trials[1])
	}
	// A target margin asks for more: at d 8 it is 655 x 50.265 / 17250 - 1 = 0.909.
	if trials, _ = SizeDiameter(p, plain, []PatternCase{load}, sizes, 0.9); trials[len(trials)-1].Candidate.Diameter != 8 || !trials[len(trials)-1].Holds {
		t.Errorf("%+v", trials)
	}
	if trials, _ = SizeDiameter(p, plain, []PatternCase{load}, sizes, 1); trials[len(trials)-1].Holds {
		t.Errorf("%+v", trials)
	}
}

func TestSizingSaysWhyNot(t *testing.T) {
	p := outlined([][2]float64{{-10, -6}, {130, -6}, {130, 6}, {-10, 6}}, rowOf(40, 3, 4))
	load := PatternCase{ID: "LC1", Level: strength.Ultimate, Force: [3]float64{60e3, 0, 0}}
	// A hole of 12 reaches the outline; one of 6 has no check at all.
	trials, faults := SizeDiameter(p, plain, []PatternCase{load}, []Candidate{{Diameter: 6}, {Diameter: 12}}, 0)
	if len(faults) > 0 || len(trials) != 2 {
		t.Fatal(trials, faultText(faults))
	}
	for i, part := range []string{"no check", "reaches the outline"} {
		if got := trials[i].Why.Render(write); trials[i].Holds || !strings.Contains(got, part) {
			t.Errorf("%d: %q", i, got)
		}
	}
	p.Fasteners[1].Type = &Type{Name: "rated", ShearStrength: 1e5}
	if _, faults = SizeDiameter(p, plain, []PatternCase{load}, []Candidate{{Diameter: 6}}, 0); len(faults) != 1 || faults[0].Pointer != "/fasteners/1/type" {
		t.Error(faultText(faults))
	}
}

// The catalogue's ids are unique, each is found, and a bolt of another size is
// refused.
func TestCatalogueTypes(t *testing.T) {
	seen := map[string]bool{}
	for _, c := range Types() {
		if seen[c.ID] || c.Thread.Pitch <= 0 || c.Mark == strength.Given || c.Source == "" {
			t.Errorf("%+v", c)
		}
		seen[c.ID] = true
	}
	bolt, ok := FindType("unf-1/4-fsu95-shank")
	if !ok {
		t.Fatal("no unf-1/4-fsu95-shank")
	}
	// 95 ksi on the shank of 1/4 in: 4,663 lbf.
	if a := bolt.shear(6.35, 1); a.value/4.4482216152605 < 4662.5 || a.value/4.4482216152605 > 4663.5 {
		t.Errorf("%g N", a.value)
	}
	p := Pattern{Stiffness: "equal", Fasteners: rowOf(40, 8, 2)}
	p.Fasteners[0].Type = &bolt
	if _, faults := PreparePattern(p, plain, nil); len(faults) != 1 || faults[0].Pointer != "/fasteners/0/diameter" {
		t.Error(faultText(faults))
	}
}

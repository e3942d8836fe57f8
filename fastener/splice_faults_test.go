package fastener

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"jointledger/strength"
)

func render(m strength.Message) string {
	return m.Render(func(q strength.Quantity) string { return fmt.Sprint(q.Value) })
}

func TestSpliceFaults(t *testing.T) {
	type change func(s *Splice, c *[]SpliceCase)
	tests := []struct {
		name, pointer, says string
		change              change
	}{
		{"unbalanced", "/load_cases/0/ends", "out of balance by -100", func(_ *Splice, c *[]SpliceCase) { (*c)[0].Ends[1].Right = 900 }},
		{"unknown end", "/load_cases/0/ends/1/member", `"m9"`, func(_ *Splice, c *[]SpliceCase) { (*c)[0].Ends[1].Member = "m9" }},
		{"end named twice", "/load_cases/0/ends/1/member", "twice", func(_ *Splice, c *[]SpliceCase) { (*c)[0].Ends[1].Member = "m1" }},
		{"unknown temperature", "/load_cases/0/temperatures/0/member", `"m9"`, func(_ *Splice, c *[]SpliceCase) {
			(*c)[0].Temperatures = []TemperatureChange{{"m9", 10}}
		}},
		{"no path", "/members/2", "no other member lies at its rows 5 to 5", func(s *Splice, _ *[]SpliceCase) {
			s.Members[0].LastRow, s.Members[0].Bays = 4, s.Members[0].Bays[:3]
			s.Members[1].LastRow, s.Members[1].Bays = 4, s.Members[1].Bays[:3]
			s.Members = append(s.Members, Member{ID: "m3", E: 70e3, FirstRow: 5, LastRow: 5})
		}},
		{"mechanism", "/members", "no member runs from row 2 to row 3, so all members of rows 1 to 2 move freely along the joint against those of rows 3 to 5", func(s *Splice, _ *[]SpliceCase) {
			right := slices.Clone(s.Members)
			for i := range s.Members {
				s.Members[i].LastRow, s.Members[i].Bays = 2, s.Members[i].Bays[:1]
				right[i].ID, right[i].FirstRow, right[i].Bays = right[i].ID+"r", 3, right[i].Bays[:2]
			}
			s.Members = append(s.Members, right...)
		}},
		{"row in no member", "/rows/4", "no member lies at row 5", func(s *Splice, _ *[]SpliceCase) {
			for i := range s.Members {
				s.Members[i].LastRow, s.Members[i].Bays = 4, s.Members[i].Bays[:3]
			}
		}},
		{"rows outside", "/members/0/last_row", "found row 6, allowed are rows 1 to 5", func(s *Splice, _ *[]SpliceCase) { s.Members[0].LastRow = 6 }},
		{"rows reversed", "/members/1/last_row", "found row 2, allowed are rows 4 to 5", func(s *Splice, _ *[]SpliceCase) {
			s.Members[1].FirstRow, s.Members[1].LastRow = 4, 2
		}},
		{"first row outside", "/members/1/first_row", "found row -1", func(s *Splice, _ *[]SpliceCase) { s.Members[1].FirstRow = -1 }},
		{"bays", "/members/0/bays", "found 3 bays, allowed is one fewer than the 5 rows", func(s *Splice, _ *[]SpliceCase) { s.Members[0].Bays = s.Members[0].Bays[:3] }},
		{"pitches", "/pitches", "found 3 pitches", func(s *Splice, _ *[]SpliceCase) { s.Pitches = s.Pitches[:3] }},
		{"row thickness", "/members/0/row_thickness", "found 2 thicknesses", func(s *Splice, _ *[]SpliceCase) { s.Members[0].RowThickness = []float64{1, 1} }},
		{"negative compliance", "/rows/2/compliance", "found -1e-05, allowed is more than 0", func(s *Splice, _ *[]SpliceCase) { s.Rows[2].Compliance = -1e-5 }},
		{"no compliance", "/rows/2/compliance", `"given" needs more than 0`, func(s *Splice, _ *[]SpliceCase) { s.Rows[2].Compliance = 0 }},
		{"negative clearance", "/rows/2/clearance", "found -1", func(s *Splice, _ *[]SpliceCase) { s.Rows[2].Clearance = -1 }},
		{"count", "/rows/2/count", "found -1", func(s *Splice, _ *[]SpliceCase) { s.Rows[2].Count = -1 }},
		{"installation", "/rows/2/installation", `found "glued"`, func(s *Splice, _ *[]SpliceCase) { s.Rows[2].Installation = "glued" }},
		{"unknown formula", "/compliance", `no compliance formula "hooke"`, func(s *Splice, _ *[]SpliceCase) { s.Compliance = "hooke" }},
		{"unknown formula compared", "/compare_compliance/1", `no compliance formula "hooke"`, func(s *Splice, _ *[]SpliceCase) {
			s.CompareCompliance = []string{ComplianceGiven, "hooke"}
		}},
		{"formula without thickness", "/members/1/row_thickness", `"huth" needs the thickness`, func(s *Splice, _ *[]SpliceCase) { s.Compliance = "huth" }},
		{"formula without modulus", "/rows/3/e", `"huth" needs the fastener's modulus`, func(s *Splice, _ *[]SpliceCase) { s.CompareCompliance = []string{"huth"} }},
		{"formula without ratio", "/rows/3/nu", `"rutman" needs the fastener's Poisson's ratio`, func(s *Splice, _ *[]SpliceCase) { s.Compliance = "rutman" }},
		{"holes fill the width", "/members/0/bays/0/width", "5 together, leave nothing of 5", func(s *Splice, _ *[]SpliceCase) { s.Members[0].Bays[0].Width = 5 }},
		{"countersink fills the thickness", "/members/0/countersink_depth", "2 leaves nothing of the thickness 2 at row 1", func(s *Splice, _ *[]SpliceCase) {
			s.Members[0].RowThickness, s.Members[0].CountersinkDepth = []float64{2, 3, 3, 3, 3}, 2
		}},
		{"edge distance", "/members/0/edge_distance", "found -1", func(s *Splice, _ *[]SpliceCase) { s.Members[0].EdgeDistance = -1 }},
		{"shear planes", "/rows/2/shear_planes", "found 3, allowed are 1 and 2", func(s *Splice, _ *[]SpliceCase) { s.Rows[2].ShearPlanes = 3 }},
		{"thread", "/rows/2/type/thread/pitch", "found 7", func(s *Splice, _ *[]SpliceCase) {
			s.Rows[2].Type = &Type{Fsu: 600, Thread: &Thread{Form: "iso", Pitch: 7}}
		}},
		{"symmetric of three", "/symmetric", "row 1 joins 3 members", func(s *Splice, _ *[]SpliceCase) {
			s.Symmetric = true
			s.Members = append(s.Members, s.Members[0])
		}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s, cases := uniformLap(5, 2, 2, 1e-5), pull(1000)
			test.change(&s, &cases)
			p, faults := PrepareSplice(s, noFactors, cases)
			if p != nil {
				t.Error("prepared all the same")
			}
			for _, f := range faults {
				if f.Pointer == test.pointer && strings.Contains(render(f.Message), test.says) {
					return
				}
			}
			for _, f := range faults {
				t.Errorf("found %s: %s", f.Pointer, render(f.Message))
			}
		})
	}
}

func TestAllSpliceFaultsAtOnce(t *testing.T) {
	s, cases := uniformLap(5, 2, 2, 1e-5), pull(1000)
	s.Members[0].E, s.Rows[1].Diameter, s.Pitches[3], cases[0].Ends[0].Left = 0, 0, 0, 1
	_, faults := PrepareSplice(s, noFactors, cases)
	var found []string
	for _, f := range faults {
		found = append(found, f.Pointer)
	}
	slices.Sort(found)
	want := []string{"/load_cases/0/ends", "/members/0/e", "/pitches/3", "/rows/1/diameter"}
	if !slices.Equal(found, want) {
		t.Errorf("found %q, want %q", found, want)
	}
}

// A formula without a form for double shear leaves the sharing undetermined.
func TestNoDoubleShearForm(t *testing.T) {
	for _, name := range []string{"swift", "rutman"} {
		s := uniformLap(3, 2, 2, 1e-5)
		s.Symmetric, s.Compliance = true, name
		p := mustPrepare(t, s, pull(1000))
		if p.Undetermined().Empty() || p.Findings()[0].Code != "no-sharing" {
			t.Errorf("%s: %q, findings %v", name, render(p.Undetermined()), p.Findings())
		}
		s.Compliance, s.CompareCompliance = ComplianceGiven, []string{name}
		p = mustPrepare(t, s, pull(1000))
		if !p.Undetermined().Empty() || p.Compared()[0].Why.Empty() {
			t.Errorf("%s compared: %v", name, p.Compared())
		}
	}
}

// No positive sizes and no loads bring a panic or a number that is none.
func TestSpliceStaysFinite(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 4, 8)
		size := func() float64 { return logUniform(t, 1e-9, 1e9, "size") }
		for i := range s.Members {
			m := &s.Members[i]
			m.E, m.Expansion = size(), size()
			for j := range m.Bays {
				m.Bays[j] = Bay{size(), size()}
			}
			m.RowThickness = nil
			for range len(m.Bays) + 1 {
				m.RowThickness = append(m.RowThickness, size())
			}
		}
		for i := range s.Rows {
			s.Rows[i] = Row{Diameter: size(), Compliance: size(), E: size(), Nu: 0.3, Clearance: size()}
			for _, m := range s.Members {
				for _, bay := range m.Bays {
					s.Rows[i].Diameter = min(s.Rows[i].Diameter, bay.Width/4)
					s.Rows[i].Clearance = min(s.Rows[i].Clearance, bay.Width/4)
				}
			}
			if rapid.Bool().Draw(t, "tight") {
				s.Rows[i].Clearance = 0
			}
		}
		for i := range s.Pitches {
			s.Pitches[i] = size()
		}
		s.Compliance = rapid.SampledFrom([]string{ComplianceGiven, "huth", "tate-rosenfeld", "swift", "rutman"}).Draw(t, "formula")
		p, _ := PrepareSplice(s, noFactors, cases)
		if p == nil {
			return
		}
		out := p.NewTransfers()
		for i := range cases {
			p.Transfers(i, &out)
			for _, l := range out.Interfaces {
				if !finite(l.Load) || !finite(l.Share) {
					t.Fatalf("%+v", l)
				}
			}
			for _, m := range out.Members {
				if !finite(m.Bearing) || !finite(m.Bypass) {
					t.Fatalf("%+v", m)
				}
			}
			if !finite(out.Residual) {
				t.Fatalf("residual %v", out.Residual)
			}
		}
	})
}

func finite(x float64) bool { return !math.IsInf(x, 0) && !math.IsNaN(x) }

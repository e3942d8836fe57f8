package fastener

import (
	"math"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"jointledger/strength"
)

// dressed is a lap whose rows and members have strengths, of invented values.
func dressed(n int) Splice {
	s := uniformLap(n, 2, 3, 1e-5)
	plate := &strength.Material{
		Name: "SM plate", Source: "invented", Ftu: 440, Fty: 370, Fcy: 360, Ec: 73e3,
		Bearing: []strength.BearingStrength{{EOverD: 1.5, Fbru: 650, Fbry: 520}, {EOverD: 2, Fbru: 850, Fbry: 620}},
	}
	for i := range s.Members {
		s.Members[i].Material, s.Members[i].EdgeDistance = plate, 10
		s.Members[i].RowThickness = slices.Repeat([]float64{2 + float64(i)}, n)
	}
	for i := range s.Rows {
		s.Rows[i].Type = &Type{Name: "SM rivet", Source: "invented", ShearStrength: 9000}
	}
	return s
}

func TestRowChecksAreInOrder(t *testing.T) {
	p := mustPrepare(t, dressed(2), pull(1000))
	var found []string
	for _, c := range p.Checks() {
		found = append(found, strings.Join([]string{string(rune('0' + c.Row)), c.Member, c.Mode.String(), c.Level.String(), c.Method}, " "))
	}
	var want []string
	for _, row := range []string{"1", "2"} {
		want = append(want, row+" fastener shear ultimate fastener-shear@1", row+" fastener shear ultimate plastic-sharing@1")
		for _, member := range []string{"m1", "m2"} {
			want = append(
				want, row+" "+member+" net-section ultimate row-net-section@1", row+" "+member+" net-section limit row-net-section@1",
				row+" "+member+" bearing ultimate plate-bearing@1", row+" "+member+" bearing limit plate-bearing@1",
			)
			if row == "1" {
				want = append(want, row+" "+member+" inter-fastener-buckling ultimate inter-fastener-buckling@1")
			}
		}
	}
	if !slices.Equal(found, want) {
		t.Errorf("checks\n%s\nwant\n%s", strings.Join(found, "\n"), strings.Join(want, "\n"))
	}
}

// A load in compression leaves the net section alone, and bears all the same.
func TestCompressionLeavesNetSectionAlone(t *testing.T) {
	p := mustPrepare(t, dressed(2), pull(-1000))
	margins := make([]strength.Margin, len(p.Checks()))
	p.Margins(0, margins)
	for i, c := range p.Checks() {
		if want := c.Mode != strength.NetSection && (c.Mode != strength.InterFastenerBuckling || c.Row == 1); (margins[i].Status == strength.Adequate) != want {
			t.Errorf("row %d %s %s: %v", c.Row, c.Member, c.Mode, margins[i].Status)
		}
	}
	if !slices.ContainsFunc(p.Findings(), func(f strength.Finding) bool { return f.Code == "compression" }) {
		t.Error("nothing says that compression is not checked")
	}
}

func TestRowChecksWithoutValues(t *testing.T) {
	tests := []struct {
		name, says string
		mode       strength.Mode
		change     func(*Splice)
	}{
		{"no edge distance", `member "m1" has no edge_distance`, strength.Bearing, func(s *Splice) { s.Members[0].EdgeDistance = 0 }},
		{"no thickness", `bearing of member "m1" needs its row_thickness`, strength.Bearing, func(s *Splice) { s.Members[0].RowThickness = nil }},
		{"small edge distance", "e/D 1.4 is below 1.5", strength.Bearing, func(s *Splice) { s.Members[0].EdgeDistance = 7 }},
		{"thin", "t/D 0.1 is below 0.18", strength.Bearing, func(s *Splice) { s.Members[0].RowThickness[0] = 0.5 }},
		{"no strength", `the material "bare" has no F_tu`, strength.NetSection, func(s *Splice) { s.Members[0].Material = &strength.Material{Name: "bare"} }},
		{"no fastener strength", "neither shear_strength nor fsu", strength.Shear, func(s *Splice) { s.Rows[0].Type = &Type{Name: "blank"} }},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s := dressed(2)
			test.change(&s)
			p := mustPrepare(t, s, pull(1000))
			margins := make([]strength.Margin, len(p.Checks()))
			p.Margins(0, margins)
			i := slices.IndexFunc(p.Checks(), func(c strength.Check) bool {
				return c.Row == 1 && c.Mode == test.mode && (c.Member == "m1" || c.Member == memberFastener)
			})
			if margins[i].Status != strength.Undetermined || !strings.Contains(render(*margins[i].Why), test.says) {
				t.Errorf("%+v", margins[i])
			}
		})
	}
}

// Without a compliance every check is undetermined and says why.
func TestNoSharingLeavesChecksUndetermined(t *testing.T) {
	s := dressed(3)
	s.Symmetric, s.Compliance = true, "swift"
	p := mustPrepare(t, s, pull(1000))
	margins := make([]strength.Margin, len(p.Checks()))
	p.Margins(0, margins)
	for i, m := range margins {
		if m.Status != strength.Undetermined || !strings.Contains(render(*m.Why), "swift has no form for double shear") {
			t.Errorf("%+v: %+v", p.Checks()[i], m)
		}
		if len(p.CaseWorkings(0, i, nil)) != 0 {
			t.Errorf("check %d has steps", i)
		}
	}
}

// A bay of 25 by 2 mm between rows 20 mm apart, protruding heads: F_e =
// 4 π² 73000/12 (2/20)² = 2401.6 MPa, above half of F_cy, so by Johnson's parabola
// 360 (1 - 360/(4 x 2401.6)) = 346.51 MPa on 50 mm²: 17,325 N.
func TestCompressedBayBuckles(t *testing.T) {
	p := mustPrepare(t, dressed(2), pull(-1000))
	margins := make([]strength.Margin, len(p.Checks()))
	p.Margins(0, margins)
	i := slices.IndexFunc(p.Checks(), func(c strength.Check) bool { return c.Mode == strength.InterFastenerBuckling && c.Member == "m1" })
	out := p.NewTransfers()
	p.Transfers(0, &out)
	// The bay of m1 carries what row 1 does not pass on.
	demand := 1.5 * (1000 + out.Interfaces[0].Load)
	if m := margins[i]; math.Abs(m.Allowable-17325) > 1 || math.Abs(m.Demand-demand) > 1e-9 {
		t.Errorf("%+v, demand by hand %v", m, demand)
	}
}

// Two straps of a symmetric joint are worth two, the fastener two planes.
func TestSymmetricCountsStrapsTwice(t *testing.T) {
	s := dressed(2)
	single := mustPrepare(t, s, pull(1000))
	s.Symmetric = true
	double := mustPrepare(t, s, pull(1000))
	a, b := make([]strength.Margin, len(single.Checks())), make([]strength.Margin, len(double.Checks()))
	single.Margins(0, a)
	double.Margins(0, b)
	for i, c := range single.Checks() {
		want := 2.0
		if c.Member == "m1" {
			want = 1
		}
		if a[i].Status != strength.NotExercised && math.Abs(b[i].Allowable/a[i].Allowable-want) > 1e-12 {
			t.Errorf("row %d %s %s: %g of single shear", c.Row, c.Member, c.Mode, b[i].Allowable/a[i].Allowable)
		}
	}
}

// Plastic sharing by strength: 2 : 1 rows take 2/3 and 1/3; doublers' rows end
// with what the end loads send through; a ring of members leaves it open.
func TestPlasticSharing(t *testing.T) {
	s := dressed(2)
	s.Rows[0].Type = &Type{Name: "strong", ShearStrength: 18000}
	p := mustPrepare(t, s, pull(-900))
	out := make([]float64, 2)
	if !p.PlasticLoads(0, out) || math.Abs(out[0]+600) > 1e-9 || math.Abs(out[1]+300) > 1e-9 {
		t.Errorf("plastic loads %v", out)
	}
	// Three members of which each two are neighbours somewhere.
	s = uniformLap(2, 2, 3, 1e-5)
	s.Members = append(s.Members, s.Members[0], s.Members[0])
	s.Members[2].ID, s.Members[3].ID = "m3", "m4"
	s.Members[1].LastRow, s.Members[1].Bays = 1, nil
	if p = mustPrepare(t, s, nil); p.PlasticLoads(0, nil) {
		t.Error("a ring of members has plastic loads")
	}
}

// In a stack without doubled paths the plastic loads balance every member.
func TestPlasticSharingBalances(t *testing.T) {
	found := 0
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 4, 8)
		p := mustPrepare(t, checked(t, s), cases)
		out := p.NewTransfers()
		p.Transfers(0, &out)
		loads := make([]float64, len(out.Interfaces))
		if !p.PlasticLoads(0, loads) {
			return
		}
		found++
		net := make([]float64, len(s.Members))
		for _, end := range cases[0].Ends {
			for m := range s.Members {
				if s.Members[m].ID == end.Member {
					net[m] += end.Left - end.Right
				}
			}
		}
		for i, f := range out.Interfaces {
			net[f.First] -= loads[i]
			net[f.Second] += loads[i]
		}
		for m, left := range net {
			if math.Abs(left) > 1e-9*out.Through {
				t.Fatalf("member %d keeps %v", m, left)
			}
		}
	})
	if found < 20 {
		t.Errorf("only %d stacks had plastic loads", found)
	}
}

func TestClosedFormFindings(t *testing.T) {
	steps := uniformLap(4, 1, 1, 1e-5)
	for j := range 3 {
		steps.Members[0].Bays[j].Thickness, steps.Members[1].Bays[j].Thickness = float64(3-j), float64(j+1)
	}
	uneven := uniformLap(3, 2, 3, 1e-5)
	uneven.Rows[1].Compliance = 2e-5
	tests := []struct {
		name string
		s    Splice
		says []string
	}{
		{"two equal rows", uniformLap(2, 2, 2, 1e-5), []string{"50/50"}},
		{"scarfed steps", steps, []string{"each of the 4 rows takes 1/4"}},
		{"uniform", uniformLap(5, 2, 2, 1e-5), []string{"the joint is uniform"}},
		{"rigid", uniformLap(5, 2, 3, 1e-14), []string{"the joint is uniform", "nearly rigid"}},
		{"soft", uniformLap(5, 2, 3, 1), []string{"the joint is uniform", "soft"}},
		{"uneven", uneven, nil},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			p := mustPrepare(t, test.s, pull(1000))
			var found []string
			for _, f := range p.Findings() {
				if f.Code == "closed-form" {
					found = append(found, render(f.Message))
				}
			}
			if len(found) != len(test.says) {
				t.Fatalf("found %q, want %q", found, test.says)
			}
			for i := range found {
				if !strings.Contains(found[i], test.says[i]) {
					t.Errorf("found %q, want %q", found[i], test.says[i])
				}
			}
		})
	}
}

// The closed form of the findings against the independent one of the tests,
// and against the solution for members that are not alike.
func TestUniformShares(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 200).Draw(t, "n")
		t1, t2, c := logUniform(t, 0.5, 10, "t1"), logUniform(t, 0.5, 10, "t2"), logUniform(t, 1e-9, 1e-2, "c")
		shares := make([]float64, n)
		f := 20 / (25 * t1 * 70e3)
		uniformShares(f, f, c, shares)
		for i, share := range shares {
			if want := closedForm(n, i+1, f/c); math.Abs(share-want) > 1e-9 {
				t.Fatalf("n %d f/C %g row %d: %v, want %v", n, f/c, i+1, share, want)
			}
		}
		uniformShares(f, 20/(25*t2*70e3), c, shares)
		p := mustPrepare(t, uniformLap(n, t1, t2, c), pull(1))
		out := p.NewTransfers()
		p.Transfers(0, &out)
		for i, l := range out.Interfaces {
			if math.Abs(shares[i]-l.Share) > 1e-9 {
				t.Fatalf("n %d row %d: %v, solved %v", n, i+1, shares[i], l.Share)
			}
		}
	})
}

func TestComplianceSpread(t *testing.T) {
	s := dressed(4)
	s.CompareCompliance = []string{"huth", "swift"}
	for i := range s.Rows {
		s.Rows[i].E = 110e3
	}
	p := mustPrepare(t, s, pull(1000))
	var found []string
	for _, f := range p.Findings() {
		if f.Code == "compliance-spread" {
			found = append(found, f.Subject)
			if !strings.Contains(render(f.Message), `by given it is`) {
				t.Errorf("%s", render(f.Message))
			}
		}
	}
	if !slices.Equal(found, s.CompareCompliance) {
		t.Errorf("compared %q", found)
	}
	own, other := p.NewTransfers(), p.NewTransfers()
	p.Transfers(0, &own)
	for k := range s.CompareCompliance {
		p.ComparedTransfers(k, 0, &other)
		direct := s
		direct.Compliance = s.CompareCompliance[k]
		q := mustPrepare(t, direct, pull(1000))
		alone := q.NewTransfers()
		q.Transfers(0, &alone)
		if !slices.Equal(alone.Interfaces, other.Interfaces) || slices.Equal(own.Interfaces, other.Interfaces) {
			t.Errorf("%s compared gives %v, alone %v", direct.Compliance, other.Interfaces, alone.Interfaces)
		}
	}
}

func TestRowMarginsAllocateNothing(t *testing.T) {
	p := mustPrepare(t, dressed(20), append(pull(1000), pull(-500)...))
	margins := make([]strength.Margin, len(p.Checks()))
	i := 0
	if n := testing.AllocsPerRun(100, func() {
		p.Margins(i, margins)
		i = 1 - i
	}); n != 0 {
		t.Errorf("%v allocations a load case", n)
	}
}

// The nominal stresses of a row: 1000 N on two rows 50/50, 5 mm fasteners in
// 25 by 2 mm: 500/(5 x 2) = 50 MPa bearing, 500/(25 x 2) = 10 MPa bypass.
func TestBearingAndBypassStress(t *testing.T) {
	s := dressed(2)
	s.Members[1].Bays[0].Thickness, s.Members[1].RowThickness = 2, []float64{2, 2}
	p := mustPrepare(t, s, pull(1000))
	out := p.NewTransfers()
	p.Transfers(0, &out)
	first := out.Members[0]
	if !first.HasStress || math.Abs(first.BearingStress-50) > 1e-9 || math.Abs(first.BypassStress-10) > 1e-9 {
		t.Errorf("%+v", first)
	}
	if second := out.Members[1]; math.Abs(second.Bearing-500) > 1e-9 || second.Bypass != 0 {
		t.Errorf("%+v", second)
	}
}

// Bypass is the load of the less loaded side, bearing the rest of the other.
func TestBearingAndBypass(t *testing.T) {
	for _, test := range []struct{ left, right, bearing, bypass float64 }{
		{1000, 674, 326, 674},
		{674, 1000, 326, 674},
		{-1000, -674, -326, -674},
		{0, 325, 325, 0},
		{500, -200, 700, -200},
		{-500, 200, -700, 200},
	} {
		if bearing, bypass := bearingBypass(test.left, test.right); bearing != test.bearing || bypass != test.bypass {
			t.Errorf("%v and %v: bearing %v, bypass %v; want %v, %v", test.left, test.right, bearing, bypass, test.bearing, test.bypass)
		}
	}
}

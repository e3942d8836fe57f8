package fastener

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"jointledger/strength"
)

var noFactors = strength.Factors{Ultimate: 1.5, Fitting: 1}

// logUniform draws a positive value with an even spread of its logarithm.
func logUniform(t *rapid.T, lo, hi float64, label string) float64 {
	return math.Exp(rapid.Float64Range(math.Log(lo), math.Log(hi)).Draw(t, label))
}

// uniformLap is a lap joint of two members of n equal rows.
func uniformLap(n int, t1, t2, compliance float64) Splice {
	s := Splice{Compliance: ComplianceGiven}
	for i, thickness := range []float64{t1, t2} {
		m := Member{ID: fmt.Sprint("m", i+1), E: 70e3}
		for range n - 1 {
			m.Bays = append(m.Bays, Bay{thickness, 25})
		}
		s.Members = append(s.Members, m)
	}
	for i := range n {
		s.Rows = append(s.Rows, Row{Diameter: 5, Compliance: compliance})
		if i > 0 {
			s.Pitches = append(s.Pitches, 20)
		}
	}
	return s
}

// pull loads the first member on the left and the second on the right.
func pull(p float64) []SpliceCase {
	return []SpliceCase{{ID: "pull", Level: strength.Limit, Ends: []End{{"m1", p, 0}, {"m2", 0, p}}}}
}

// drawSplice draws any stack that is one joint, and balanced loads with
// changes of temperature.
func drawSplice(t *rapid.T, mostMembers, mostRows int) (Splice, []SpliceCase) {
	n := rapid.IntRange(1, mostRows).Draw(t, "rows")
	count := rapid.IntRange(2, mostMembers).Draw(t, "members")
	s := Splice{Compliance: ComplianceGiven}
	for range n {
		s.Rows = append(s.Rows, Row{
			Count: rapid.IntRange(1, 4).Draw(t, "count"), Diameter: 5,
			Compliance: logUniform(t, 1e-6, 1e-4, "compliance"),
		})
	}
	for range n - 1 {
		s.Pitches = append(s.Pitches, logUniform(t, 5, 60, "pitch"))
	}
	// Each member starts where those before it have reached, so that all are
	// one joint; their order in the stack is drawn afterwards.
	reach := 1
	for i := range count {
		first := rapid.IntRange(1, reach).Draw(t, "first")
		last := rapid.IntRange(first, n).Draw(t, "last")
		if i == count-1 && reach < n {
			last = n
		}
		reach = max(reach, last)
		m := Member{
			ID: fmt.Sprint("m", i+1), E: logUniform(t, 40e3, 210e3, "e"), FirstRow: first, LastRow: last,
			Expansion: rapid.Float64Range(0, 3e-5).Draw(t, "expansion"),
		}
		for range last - first {
			m.Bays = append(m.Bays, Bay{logUniform(t, 0.5, 12, "thickness"), logUniform(t, 30, 100, "width")})
		}
		s.Members = append(s.Members, m)
	}
	s.Members = rapid.Permutation(s.Members).Draw(t, "stack")
	return s, []SpliceCase{drawCase(t, s, "1"), drawCase(t, s, "2")}
}

func drawCase(t *rapid.T, s Splice, id string) SpliceCase {
	c := SpliceCase{ID: id, Level: strength.Limit}
	sum := 0.0
	for i := range s.Members {
		end := End{s.Members[i].ID, float64(rapid.IntRange(-1e5, 1e5).Draw(t, "left")), float64(rapid.IntRange(-1e5, 1e5).Draw(t, "right"))}
		sum += end.Left - end.Right
		c.Ends = append(c.Ends, end)
		c.Temperatures = append(c.Temperatures, TemperatureChange{s.Members[i].ID, float64(rapid.IntRange(-60, 60).Draw(t, "change"))})
	}
	c.Ends[len(c.Ends)-1].Right += sum
	return c
}

func mustPrepare(t interface{ Fatalf(string, ...any) }, s Splice, cases []SpliceCase) *PreparedSplice {
	p, faults := PrepareSplice(s, noFactors, cases)
	if len(faults) > 0 {
		t.Fatalf("faults: %v", faults)
	}
	return p
}

// denseLoads solves the same splice as springs by displacements, in a full
// matrix: an independent formulation. It returns the load of each interface in
// the order of Transfers, and the largest of all loads.
func denseLoads(t interface{ Fatalf(string, ...any) }, s Splice, c SpliceCase) (loads []float64, largest float64) {
	type place struct{ member, row int }
	number := map[place]int{}
	var interfaces [][2]place
	for r := range s.Rows {
		previous := -1
		for m := range s.Members {
			if r+1 < s.Members[m].FirstRow || r+1 > s.Members[m].LastRow {
				continue
			}
			number[place{m, r}] = len(number)
			if previous >= 0 {
				interfaces = append(interfaces, [2]place{{previous, r}, {m, r}})
			}
			previous = m
		}
	}
	n := len(number)
	k, f := mat.NewDense(n, n, nil), mat.NewVecDense(n, nil)
	spring := func(a, b int, stiffness float64) {
		k.Set(a, a, k.At(a, a)+stiffness)
		k.Set(b, b, k.At(b, b)+stiffness)
		k.Set(a, b, k.At(a, b)-stiffness)
		k.Set(b, a, k.At(b, a)-stiffness)
	}
	force := func(i int, value float64) { f.SetVec(i, f.AtVec(i)+value) }
	changes := map[string]float64{}
	for _, change := range c.Temperatures {
		changes[change.Member] = change.Change
	}
	for m := range s.Members {
		member := &s.Members[m]
		for j, bay := range member.Bays {
			r := member.FirstRow - 1 + j
			a, b := number[place{m, r}], number[place{m, r + 1}]
			ea := bay.Width * bay.Thickness * member.E
			spring(a, b, ea/s.Pitches[r])
			heat := ea * member.Expansion * changes[member.ID]
			force(a, -heat)
			force(b, heat)
			largest = max(largest, math.Abs(heat))
		}
	}
	for _, end := range c.Ends {
		for m := range s.Members {
			if s.Members[m].ID == end.Member {
				force(number[place{m, s.Members[m].FirstRow - 1}], -end.Left)
				force(number[place{m, s.Members[m].LastRow - 1}], end.Right)
				largest = max(largest, math.Abs(end.Left), math.Abs(end.Right))
			}
		}
	}
	for _, i := range interfaces {
		row := s.Rows[i[0].row]
		spring(number[i[0]], number[i[1]], float64(row.Count)/row.Compliance)
	}
	k.Set(0, 0, 2*k.At(0, 0)) // holds the rigid motion; the loads balance
	var u mat.VecDense
	if err := u.SolveVec(k, f); err != nil {
		t.Fatalf("dense solve: %v", err)
	}
	for _, i := range interfaces {
		row := s.Rows[i[0].row]
		loads = append(loads, float64(row.Count)/row.Compliance*(u.AtVec(number[i[1]])-u.AtVec(number[i[0]])))
		largest = max(largest, math.Abs(loads[len(loads)-1]))
	}
	return loads, largest
}

func TestDenseSolve(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 5, 12)
		p := mustPrepare(t, s, cases)
		out := p.NewTransfers()
		for i := range cases {
			want, largest := denseLoads(t, s, cases[i])
			p.Transfers(i, &out)
			for k, load := range want {
				if got := out.Interfaces[k].Load; math.Abs(got-load) > 1e-9*largest {
					t.Fatalf("case %d interface %d: %v, dense %v", i, k, got, load)
				}
			}
		}
	})
}

func TestSpliceEquilibrium(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 6, 30)
		p := mustPrepare(t, s, cases)
		out := p.NewTransfers()
		p.Transfers(0, &out)
		if out.Residual > 1e-9 {
			t.Fatalf("residual %g", out.Residual)
		}
		// Each member's loads from row to row, summed from its end loads.
		largest := out.Through
		taken := map[[2]int]float64{}
		for _, i := range out.Interfaces {
			taken[[2]int{i.First, i.Row}] += i.Load
			taken[[2]int{i.Second, i.Row}] -= i.Load
			largest = max(largest, math.Abs(i.Load))
		}
		for _, end := range cases[0].Ends {
			for m := range s.Members {
				if s.Members[m].ID != end.Member {
					continue
				}
				load := end.Left
				for row := s.Members[m].FirstRow; row <= s.Members[m].LastRow; row++ {
					load -= taken[[2]int{m, row}]
				}
				if math.Abs(load-end.Right) > 1e-9*largest {
					t.Fatalf("member %d ends with %v, given %v", m, load, end.Right)
				}
			}
		}
		for _, m := range out.Members {
			if got := math.Abs(taken[[2]int{m.Member, m.Row}]); math.Abs(math.Abs(m.Bearing)-got) > 2e-9*largest {
				t.Fatalf("member %d row %d bears %v, its interfaces pass %v", m.Member, m.Row, m.Bearing, got)
			}
		}
	})
}

// closedForm is R_i/P = sinh(θ/2) cosh(θ((n+1)/2 - i))/sinh(nθ/2) for equal
// members, with its exponentials scaled so that none overflows.
func closedForm(n, i int, ratio float64) float64 {
	theta := math.Acosh(1 + ratio)
	a := theta * math.Abs(float64(n+1)/2-float64(i))
	top := (1 - math.Exp(-theta)) * (1 + math.Exp(-2*a))
	bottom := 2 * (1 - math.Exp(-float64(n)*theta))
	return top / bottom * math.Exp(theta/2+a-float64(n)*theta/2)
}

func TestClosedFormAgainstSolver(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 200).Draw(t, "n")
		ratio := logUniform(t, 1e-5, 1e6, "f/C")
		thickness := logUniform(t, 0.5, 20, "t")
		f := 20 / (25 * thickness * 70e3)
		p := mustPrepare(t, uniformLap(n, thickness, thickness, f/ratio), pull(1000))
		out := p.NewTransfers()
		p.Transfers(0, &out)
		for i, r := range out.Interfaces {
			if want := closedForm(n, i+1, ratio); math.Abs(r.Share-want) > 1e-9 {
				t.Fatalf("n %d f/C %g row %d: %v, closed form %v", n, ratio, i+1, r.Share, want)
			}
		}
	})
}

func TestTwoEqualRowsShareEqually(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		thickness := logUniform(t, 1e-2, 100, "t")
		p := mustPrepare(t, uniformLap(2, thickness, thickness, logUniform(t, 1e-9, 1, "c")), pull(rapid.Float64Range(1, 1e6).Draw(t, "p")))
		out := p.NewTransfers()
		p.Transfers(0, &out)
		for _, r := range out.Interfaces {
			if math.Abs(r.Share-0.5) > 1e-12 {
				t.Fatalf("share %v", r.Share)
			}
		}
	})
}

func TestScarfedStepsShareEqually(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 40).Draw(t, "n")
		s := uniformLap(n, 1, 1, logUniform(t, 1e-8, 1e-3, "c"))
		k1, k2 := logUniform(t, 0.1, 10, "t1"), 0.0
		k2 = k1
		for j := range n - 1 {
			s.Members[0].Bays[j].Thickness = k1 * float64(n-1-j)
			s.Members[1].Bays[j].Thickness = k2 * float64(j+1)
		}
		p := mustPrepare(t, s, pull(-5000))
		out := p.NewTransfers()
		p.Transfers(0, &out)
		for _, r := range out.Interfaces {
			if math.Abs(r.Share*float64(n)-1) > 1e-9 || math.Abs(r.Load*float64(n)+5000) > 1e-5 {
				t.Fatalf("n %d: share %v load %v", n, r.Share, r.Load)
			}
		}
	})
}

// Rigid fasteners leave all to the outer rows, in the ratio of the members'
// flexibilities; soft ones share equally.
func TestComplianceLimits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(3, 50).Draw(t, "n")
		t1, t2 := logUniform(t, 0.5, 10, "t1"), logUniform(t, 0.5, 10, "t2")
		rigid := mustPrepare(t, uniformLap(n, t1, t2, 1e-18), pull(1000))
		out := rigid.NewTransfers()
		rigid.Transfers(0, &out)
		first := (1 / t1) / (1/t1 + 1/t2)
		for i, r := range out.Interfaces {
			want := map[int]float64{0: first, n - 1: 1 - first}[i]
			if math.Abs(r.Share-want) > 1e-9 {
				t.Fatalf("rigid, row %d of %d: %v, want %v", i+1, n, r.Share, want)
			}
		}
		soft := mustPrepare(t, uniformLap(n, t1, t2, 1e9), pull(1000))
		soft.Transfers(0, &out)
		for i, r := range out.Interfaces {
			if math.Abs(r.Share*float64(n)-1) > 1e-9 {
				t.Fatalf("soft, row %d of %d: %v", i+1, n, r.Share)
			}
		}
	})
}

// Turning the stack upside down changes the sign of each interface's load only.
func TestReversedStack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 5, 12)
		p := mustPrepare(t, s, cases)
		turned := s
		turned.Members = nil
		for i := len(s.Members) - 1; i >= 0; i-- {
			turned.Members = append(turned.Members, s.Members[i])
		}
		q := mustPrepare(t, turned, cases)
		a, b := p.NewTransfers(), q.NewTransfers()
		p.Transfers(0, &a)
		q.Transfers(0, &b)
		type place struct{ row, first, second int }
		loads := map[place]float64{}
		last := len(s.Members) - 1
		for _, i := range b.Interfaces {
			loads[place{i.Row, last - i.Second, last - i.First}] = -i.Load
		}
		for _, i := range a.Interfaces {
			got, ok := loads[place{i.Row, i.First, i.Second}]
			if !ok || math.Abs(got-i.Load) > 1e-9*(a.Through+math.Abs(i.Load)) {
				t.Fatalf("row %d: %v against %v", i.Row, i.Load, got)
			}
		}
	})
}

func TestSuperposition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 5, 12)
		factor := float64(rapid.IntRange(-3, 3).Draw(t, "factor"))
		both := SpliceCase{ID: "both", Level: strength.Limit}
		for i := range s.Members {
			a, b := cases[0].Ends[i], cases[1].Ends[i]
			both.Ends = append(both.Ends, End{a.Member, a.Left + factor*b.Left, a.Right + factor*b.Right})
			both.Temperatures = append(both.Temperatures, TemperatureChange{
				a.Member, cases[0].Temperatures[i].Change + factor*cases[1].Temperatures[i].Change,
			})
		}
		p := mustPrepare(t, s, append(cases, both))
		var out [3]Transfers
		scale := 0.0
		for i := range out {
			out[i] = p.NewTransfers()
			p.Transfers(i, &out[i])
			scale = max(scale, out[i].Through)
			for _, l := range out[i].Interfaces {
				scale = max(scale, math.Abs(l.Load))
			}
		}
		for k := range out[2].Interfaces {
			want := out[0].Interfaces[k].Load + factor*out[1].Interfaces[k].Load
			if got := out[2].Interfaces[k].Load; math.Abs(got-want) > 1e-9*scale {
				t.Fatalf("interface %d: %v, sum %v", k, got, want)
			}
		}
	})
}

func TestNoAllocationPerCase(t *testing.T) {
	p := mustPrepare(t, uniformLap(50, 2, 3, 1e-5), append(pull(1000), pull(-500)...))
	out := p.NewTransfers()
	i := 0
	if n := testing.AllocsPerRun(100, func() {
		p.Transfers(i, &out)
		i = 1 - i
	}); n != 0 {
		t.Errorf("%v allocations a load case", n)
	}
}

func BenchmarkSplice10000Rows(b *testing.B) {
	s, cases := uniformLap(10000, 2, 3, 1e-5), pull(1000)
	for b.Loop() {
		p, faults := PrepareSplice(s, noFactors, cases)
		if len(faults) > 0 {
			b.Fatal(faults)
		}
		out := p.NewTransfers()
		p.Transfers(0, &out)
		if out.Residual > 1e-9 {
			b.Fatal(out.Residual)
		}
	}
}

func BenchmarkSplice10000RowsChecked(b *testing.B) {
	s, cases := dressed(10000), pull(1000)
	for b.Loop() {
		p, faults := PrepareSplice(s, noFactors, cases)
		if len(faults) > 0 {
			b.Fatal(faults)
		}
		p.Margins(0, make([]strength.Margin, len(p.Checks())))
	}
}

func BenchmarkSpliceLoadCase(b *testing.B) {
	p := mustPrepare(b, uniformLap(100, 2, 3, 1e-5), append(pull(1000), pull(-500)...))
	out := p.NewTransfers()
	b.ReportAllocs()
	for i := 0; b.Loop(); i = 1 - i {
		p.Transfers(i, &out)
	}
}

// Tension data of a row's type is told to be unread, not dropped silently.
func TestRowsTellWhatTheyDoNotRead(t *testing.T) {
	s := Splice{
		Compliance: ComplianceGiven,
		Members: []Member{
			{ID: "cap", E: 70000, Bays: []Bay{{2, 30}}},
			{ID: "strap", E: 70000, Bays: []Bay{{2, 30}}},
		},
		Pitches: []float64{25},
		Rows: []Row{
			{Diameter: 5, Compliance: 1e-5, Type: &Type{ShearStrength: 9000, PullThroughStrength: 4000}},
			{Diameter: 5, Compliance: 1e-5, Type: &Type{ShearStrength: 9000}},
		},
	}
	cases := []SpliceCase{{ID: "LC1", Level: strength.Limit, Ends: []End{{Member: "cap", Left: 1000}, {Member: "strap", Right: 1000}}}}
	p, faults := PrepareSplice(s, strength.Factors{Ultimate: 1.5, Fitting: 1.15}, cases)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	var told []string
	for _, f := range p.Findings() {
		if f.Code == "not-used" {
			told = append(told, f.Subject)
		}
	}
	if len(told) != 1 || told[0] != "row 1" {
		t.Errorf("told of %v, want row 1", told)
	}
}

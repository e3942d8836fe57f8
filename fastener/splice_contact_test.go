package fastener

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// Two rows between members that do not stretch, the second with a clearance of
// 0.1 mm, each fastener 1e-5 mm/N. The first row bears alone until it has
// deflected 0.1 mm, at 10,000 N; after that both deflect alike,
// 1e-5 R1 = 0.1 + 1e-5 R2 with R1 + R2 = P, so R1 = P/2 + 5,000 N.
func TestClearanceByHand(t *testing.T) {
	s := uniformLap(2, 1e6, 1e6, 1e-5)
	s.Rows[1].Clearance = 0.1
	loads := []float64{4000, -9999, 10000, 16000, -30000}
	first := []float64{4000, -9999, 10000, 13000, -20000}
	var cases []SpliceCase
	for _, p := range loads {
		cases = append(cases, pull(p)...)
	}
	p := mustPrepare(t, s, cases)
	out := p.NewTransfers()
	for i, want := range first {
		p.Transfers(i, &out)
		open := 0
		if math.Abs(loads[i]) < 1e4 {
			open = 1
		}
		// The members' stretch, 1e-11 mm/N, counts below 0.001 N.
		if got := out.Interfaces[0].Load; math.Abs(got-want) > 0.01 || out.Contact.Ended != ContactSettled || loads[i] != 10000 && out.Contact.Open != open {
			t.Errorf("at %v N the first row takes %v, by hand %v; %+v", loads[i], got, want, out.Contact)
		}
	}
}

// consistentLoads looks for the state of contact by trying every one: each
// interface open, or bearing one way or the other, solved in a full matrix by
// displacements. The loads of a consistent state are unique.
func consistentLoads(t *rapid.T, s Splice, c SpliceCase) ([]float64, float64) {
	n := len(s.Rows) // of two members: as many interfaces
	total := int(math.Pow(3, float64(n)))
	for code := range total {
		state := make([]int, n)
		for i, rest := 0, code; i < n; i, rest = i+1, rest/3 {
			state[i] = rest%3 - 1
		}
		trial := s
		trial.Rows = nil
		bearing := 0
		for i, row := range s.Rows {
			if state[i] == 0 && row.Clearance == 0 {
				bearing = -n
			}
			if state[i] != 0 {
				bearing++
			}
			trial.Rows = append(trial.Rows, row)
		}
		if bearing <= 0 {
			continue
		}
		loads, slips, largest, ok := denseState(trial, state, c)
		for i := range loads {
			g := s.Rows[i].Clearance
			if state[i] == 0 {
				ok = ok && math.Abs(slips[i]) <= g*(1+1e-9)
			} else if g > 0 {
				ok = ok && float64(state[i])*loads[i] >= -1e-9*largest
			}
		}
		if ok {
			return loads, largest
		}
	}
	t.Fatalf("no state of contact is consistent")
	return nil, 0
}

// denseState solves a lap of two members in a given state of contact. ok is
// false when the state leaves a mechanism.
func denseState(s Splice, state []int, c SpliceCase) (loads, slips []float64, largest float64, ok bool) {
	n := len(s.Rows)
	k, f := mat.NewDense(2*n, 2*n, nil), mat.NewVecDense(2*n, nil)
	spring := func(a, b int, stiffness, free float64) {
		k.Set(a, a, k.At(a, a)+stiffness)
		k.Set(b, b, k.At(b, b)+stiffness)
		k.Set(a, b, k.At(a, b)-stiffness)
		k.Set(b, a, k.At(b, a)-stiffness)
		f.SetVec(a, f.AtVec(a)-stiffness*free)
		f.SetVec(b, f.AtVec(b)+stiffness*free)
	}
	for m := range 2 {
		for j, bay := range s.Members[m].Bays {
			heat := 0.0
			for _, change := range c.Temperatures {
				if change.Member == s.Members[m].ID {
					heat = s.Members[m].Expansion * change.Change * s.Pitches[j]
				}
			}
			stiffness := bay.Width * bay.Thickness * s.Members[m].E / s.Pitches[j]
			spring(m*n+j, m*n+j+1, stiffness, heat)
			largest = max(largest, math.Abs(stiffness*heat))
		}
	}
	f.SetVec(0, f.AtVec(0)-c.Ends[0].Left)
	f.SetVec(2*n-1, f.AtVec(2*n-1)+c.Ends[1].Right)
	largest = max(largest, math.Abs(c.Ends[0].Left))
	for i, row := range s.Rows {
		if state[i] != 0 {
			spring(i, n+i, 1/row.Compliance, float64(state[i])*row.Clearance)
		}
	}
	k.Set(0, 0, 2*k.At(0, 0))
	var u mat.VecDense
	if err := u.SolveVec(k, f); err != nil {
		return nil, nil, 0, false
	}
	for i, row := range s.Rows {
		slip := u.AtVec(n+i) - u.AtVec(i)
		load := 0.0
		if state[i] != 0 {
			load = (slip - float64(state[i])*row.Clearance) / row.Compliance
		}
		slips, loads = append(slips, slip), append(loads, load)
	}
	return loads, slips, largest, true
}

func TestClearanceAgainstEveryState(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 5).Draw(t, "rows")
		s := uniformLap(n, 2, 3, 1e-5)
		for i := range s.Rows {
			s.Rows[i].Compliance = logUniform(t, 3e-6, 3e-5, "compliance")
			s.Rows[i].Clearance = rapid.SampledFrom([]float64{0, 0.013, 0.05, 0.117, 0.2}).Draw(t, "clearance")
		}
		for m := range s.Members {
			s.Members[m].Expansion = 2.3e-5
		}
		load := float64(rapid.IntRange(-40000, 40000).Draw(t, "p"))
		c := pull(load)[0]
		c.Temperatures = []TemperatureChange{{"m1", float64(rapid.IntRange(-80, 80).Draw(t, "change"))}}
		if load == 0 {
			return
		}
		want, largest := consistentLoads(t, s, c)
		p := mustPrepare(t, s, []SpliceCase{c})
		out := p.NewTransfers()
		p.Transfers(0, &out)
		if out.Contact.Ended == ContactStopped || out.Residual > 1e-9 {
			t.Fatalf("%+v, residual %g", out.Contact, out.Residual)
		}
		for i, l := range out.Interfaces {
			if math.Abs(l.Load-want[i]) > 1e-7*largest {
				t.Fatalf("row %d: %v, by trial %v; %+v", i+1, l.Load, want[i], out.Contact)
			}
		}
	})
}

// Random stacks of any shape settle, and what they settle to is consistent.
func TestClearanceSettles(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 5, 20)
		for i := range s.Rows {
			s.Rows[i].Clearance = rapid.SampledFrom([]float64{0, 1e-4, 0.01, 0.1, 1}).Draw(t, "clearance")
		}
		p := mustPrepare(t, s, cases)
		out := p.NewTransfers()
		for i := range cases {
			p.Transfers(i, &out)
			if out.Contact.Ended == ContactStopped || out.Residual > 1e-9 {
				t.Fatalf("%+v, residual %g", out.Contact, out.Residual)
			}
			for k, l := range out.Interfaces {
				g, taken := s.Rows[l.Row-1].Clearance, p.main.taken[k]
				if math.Abs(taken) > g || l.Load*taken < 0 || l.Load != 0 && math.Abs(taken) != g {
					t.Fatalf("interface %d: load %v with %v of %v taken up", k, l.Load, taken, g)
				}
			}
		}
	})
}

func TestClearanceAllocatesNothing(t *testing.T) {
	s := uniformLap(20, 2, 3, 1e-5)
	for i := range s.Rows {
		s.Rows[i].Clearance = 0.01 * float64(i%4)
	}
	p := mustPrepare(t, s, append(pull(20000), pull(-7000)...))
	out := p.NewTransfers()
	i := 0
	if n := testing.AllocsPerRun(20, func() {
		p.Transfers(i, &out)
		i = 1 - i
	}); n != 0 {
		t.Errorf("%v allocations a load case", n)
	}
}

// Taking up large clearances evens the load less and less as it grows: far
// above the clearances the shares are those without any.
func TestClearanceFadesUnderLoad(t *testing.T) {
	s := uniformLap(4, 2, 3, 1e-5)
	tight := mustPrepare(t, s, pull(1e9))
	for i := range s.Rows {
		s.Rows[i].Clearance = 0.1
	}
	loose := mustPrepare(t, s, pull(1e9))
	a, b := tight.NewTransfers(), loose.NewTransfers()
	tight.Transfers(0, &a)
	loose.Transfers(0, &b)
	for i := range a.Interfaces {
		if math.Abs(a.Interfaces[i].Share-b.Interfaces[i].Share) > 1e-4 {
			t.Errorf("row %d: %v and %v", i+1, a.Interfaces[i].Share, b.Interfaces[i].Share)
		}
	}
}

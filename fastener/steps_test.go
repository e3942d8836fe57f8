package fastener

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"jointledger/strength"
)

func bothMembers(least, most float64) []StepBound {
	return []StepBound{{Member: "m1", Least: least, Most: most}, {Member: "m2", Least: least, Most: most}}
}

func find(t interface{ Fatalf(string, ...any) }, s Splice, cases []SpliceCase, bounds []StepBound, goal StepGoal) StepsResult {
	result, faults := Steps(s, cases, bounds, goal)
	if len(faults) > 0 {
		t.Fatalf("faults: %v", faults)
	}
	return result
}

// Where the bounds allow scarfed steps, every row can take P/n, and no peak is
// lower than that.
func TestStepsFindTheScarf(t *testing.T) {
	for _, n := range []int{3, 4, 5, 8} {
		s := uniformLap(n, 4, 4, 1e-6)
		result := find(t, s, pull(1000), bothMembers(0.5, 10), StepGoal{Kind: GoalEven})
		if excess := result.After.Peak*float64(n) - 1; excess > 2e-4 || excess < -1e-9 {
			t.Errorf("%d rows: peak %.8f, 1/n is %.8f (%d evaluations)", n, result.After.Peak, 1/float64(n), result.Evaluations)
		}
		t.Logf("%d rows: %.6f to %.6f in %d evaluations", n, result.Before.Peak, result.After.Peak, result.Evaluations)
	}
}

// Three rows with bounds too narrow for the scarf, against every point of a
// fine grid.
func TestStepsAgainstGrid(t *testing.T) {
	s := uniformLap(3, 3, 3, 1e-6)
	bounds := bothMembers(2, 3)
	goals := map[string]StepGoal{"even": {Kind: GoalEven}, "least-volume": {Kind: GoalLeastVolume, Peak: 0.4}}
	for name, goal := range goals {
		result := find(t, s, pull(1000), bounds, goal)
		least := math.Inf(1)
		const steps = 16
		p := mustPrepare(t, s, pull(1000))
		q := newStepSearch(p, bounds)
		for code := range (steps + 1) * (steps + 1) * (steps + 1) * (steps + 1) {
			for i, rest := 0, code; i < 4; i, rest = i+1, rest/(steps+1) {
				q.thickness[q.free[i].span] = 2 + float64(rest%(steps+1))/steps
			}
			q.apply()
			state := q.state()
			if goal.Kind == GoalEven {
				least = min(least, state.Peak)
			} else if state.Peak <= goal.Peak {
				least = min(least, state.Volume)
			}
		}
		found := result.After.Peak
		if goal.Kind == GoalLeastVolume {
			found = result.After.Volume
			if !result.Reached || result.After.Peak > goal.Peak*(1+1e-8) {
				t.Errorf("%s: peak %v is not kept", name, result.After.Peak)
			}
		}
		if found > least*(1+1e-6) {
			t.Errorf("%s: found %.9g, the grid holds %.9g", name, found, least)
		}
		t.Logf("%s: found %.6g, best of the grid %.6g, %d evaluations", name, found, least, result.Evaluations)
	}
}

// The slope of the smooth objective against differences.
func TestStepSlope(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, cases := drawSplice(t, 4, 6)
		cases[0].Temperatures, cases[1].Temperatures = nil, nil
		p := mustPrepare(t, s, cases)
		if p.cases[0].through == 0 || len(p.stack.spans) == 0 {
			return
		}
		q := newStepSearch(p, nil)
		value := func() float64 {
			q.apply()
			return q.evenness(20)
		}
		value()
		slope := append([]float64(nil), q.slope...)
		for i := range slope {
			const h = 1e-4
			was := q.thickness[i]
			q.thickness[i] = was * math.Exp(h)
			up := value()
			q.thickness[i] = was * math.Exp(-h)
			down := value()
			q.thickness[i] = was
			if want := (up - down) / (2 * h); math.Abs(slope[i]-want) > 1e-5*(1+math.Abs(want)) {
				t.Fatalf("span %d: slope %v, differences %v", i, slope[i], want)
			}
		}
	})
}

// What is found keeps the bounds and is never worse than what was given.
func TestStepsKeepTheirBounds(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 5).Draw(t, "rows")
		s := uniformLap(n, logUniform(t, 2, 4, "t1"), logUniform(t, 2, 4, "t2"), logUniform(t, 1e-7, 1e-5, "c"))
		bounds := bothMembers(1.5, 5)
		goal := StepGoal{Kind: GoalEven}
		if rapid.Bool().Draw(t, "volume") {
			goal = StepGoal{GoalLeastVolume, rapid.Float64Range(0.3, 0.6).Draw(t, "peak")}
		}
		result := find(t, s, pull(1000), bounds, goal)
		for _, m := range result.Splice.Members {
			for _, b := range m.Bays {
				if b.Thickness < 1.5*(1-1e-9) || b.Thickness > 5*(1+1e-9) {
					t.Fatalf("thickness %v", b.Thickness)
				}
			}
		}
		switch {
		case goal.Kind == GoalEven && result.After.Peak > result.Before.Peak:
			t.Fatalf("peak %v, before %v", result.After.Peak, result.Before.Peak)
		case goal.Kind == GoalLeastVolume && result.Reached && result.After.Peak > goal.Peak*(1+1e-8):
			t.Fatalf("peak %v of %v", result.After.Peak, goal.Peak)
		case result.Reached && result.Before.Peak <= goal.Peak && result.After.Volume > result.Before.Volume*(1+1e-12):
			t.Fatalf("volume %v, before %v", result.After.Volume, result.Before.Volume)
		}
		// The answer stands by itself.
		p := mustPrepare(t, result.Splice, pull(1000))
		out := p.NewTransfers()
		p.Transfers(0, &out)
		peak := 0.0
		for _, i := range out.Interfaces {
			peak = max(peak, math.Abs(i.Share))
		}
		if math.Abs(peak-result.After.Peak) > 1e-9 {
			t.Fatalf("peak %v, solved anew %v", result.After.Peak, peak)
		}
	})
}

// With a peak that no steps reach, the evenest are given and said so; with one
// that all reach, every bay is as thin as it may be.
func TestLeastVolumeAtItsEnds(t *testing.T) {
	s := uniformLap(4, 3, 3, 1e-6)
	result := find(t, s, pull(1000), bothMembers(2, 4), StepGoal{GoalLeastVolume, 0.2})
	if result.Reached || result.After.Peak >= result.Before.Peak {
		t.Errorf("a peak under 1/n: %+v", result.After)
	}
	result = find(t, s, pull(1000), bothMembers(2, 4), StepGoal{GoalLeastVolume, 1})
	if want := 2.0 * 25 * 60 * 2; !result.Reached || math.Abs(result.After.Volume-want) > 1e-9*want {
		t.Errorf("any peak: volume %v, thinnest %v", result.After.Volume, want)
	}
}

// Load cases that share alike count once: a thousand multiples of one pull take
// no longer than the one.
func TestStepsCountLikeCasesOnce(t *testing.T) {
	s := uniformLap(4, 4, 4, 1e-6)
	one := find(t, s, pull(1000), bothMembers(0.5, 10), StepGoal{Kind: GoalEven})
	var many []SpliceCase
	for i := range 1000 {
		many = append(many, pull(float64(i+1)*17)...)
		many = append(many, pull(float64(i+1)*-17)...)
	}
	if all := find(t, s, many, bothMembers(0.5, 10), StepGoal{Kind: GoalEven}); math.Abs(all.After.Peak-one.After.Peak) > 1e-9 {
		t.Errorf("%v and %v", all.After.Peak, one.After.Peak)
	}
}

func TestStepFaults(t *testing.T) {
	even := StepGoal{Kind: GoalEven}
	tests := []struct {
		name, pointer, says string
		bounds              []StepBound
		goal                StepGoal
		change              func(*Splice, *[]SpliceCase)
	}{
		{"no bound", "/bounds", "at least one is needed", nil, even, nil},
		{"least", "/bounds/0/least", "found 0", []StepBound{{"m1", 0, 0, 2}}, even, nil},
		{"most", "/bounds/0/most", "at least the least", []StepBound{{"m1", 0, 2, 1}}, even, nil},
		{"member", "/bounds/0/member", `"m9"`, []StepBound{{"m9", 0, 1, 2}}, even, nil},
		{"bay", "/bounds/0/bay", "bays 1 to 2", []StepBound{{"m1", 3, 1, 2}}, even, nil},
		{"twice", "/bounds/1/member", "bay 2 of the member \"m1\" is bounded twice", []StepBound{{"m1", 0, 1, 2}, {"m1", 2, 1, 2}}, even, nil},
		{"goal", "/goal", `found "cheap"`, bothMembers(1, 2), StepGoal{Kind: "cheap"}, nil},
		{"peak", "/peak", "found 0", bothMembers(1, 2), StepGoal{Kind: GoalLeastVolume}, nil},
		{"splice", "/input/rows/1/compliance", "more than 0", bothMembers(1, 2), even, func(s *Splice, _ *[]SpliceCase) { s.Rows[1].Compliance = 0 }},
		{"clearance", "/input/rows/1/clearance", "allowed is 0", bothMembers(1, 2), even, func(s *Splice, _ *[]SpliceCase) { s.Rows[1].Clearance = 0.1 }},
		{"no form", "/input/compliance", "no form for double shear", bothMembers(1, 2), even, func(s *Splice, _ *[]SpliceCase) {
			s.Symmetric, s.Compliance = true, "swift"
		}},
		{"too large", "/input/load_cases", "found 6000", bothMembers(1, 2), even, func(_ *Splice, c *[]SpliceCase) {
			for i := range 2000 {
				*c = append(*c, SpliceCase{ID: "x", Level: strength.Limit, Ends: []End{{"m1", 1000, 0.4 * float64(i)}, {"m2", 0, 1000 - 0.4*float64(i)}}})
			}
		}},
		{"no load", "/input/load_cases", "no load case has end loads", bothMembers(1, 2), even, func(_ *Splice, c *[]SpliceCase) {
			*c = []SpliceCase{{ID: "1", Level: strength.Limit}}
		}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s, cases := uniformLap(3, 2, 2, 1e-5), pull(1000)
			if test.change != nil {
				test.change(&s, &cases)
			}
			_, faults := Steps(s, cases, test.bounds, test.goal)
			for _, f := range faults {
				if f.Pointer == test.pointer && strings.Contains(render(f.Message), test.says) {
					return
				}
			}
			for _, f := range faults {
				t.Errorf("found %s: %s", f.Pointer, render(f.Message))
			}
			if len(faults) == 0 {
				t.Error("no fault")
			}
		})
	}
}

package fastener

import (
	"fmt"
	"math"
	"strings"

	"jointledger/strength"
)

// Goals of finding steps.
const (
	// GoalEven makes the highest share of any row least.
	GoalEven = "even"
	// GoalLeastVolume makes the volume of the bays least with no share above a
	// given peak.
	GoalLeastVolume = "least-volume"
)

// StepBound lets the thickness of a member's bays be chosen, mm.
type StepBound struct {
	Member string
	// Bay counts from 1 at the member's left end; 0 is all of its bays.
	Bay         int
	Least, Most float64
}

// StepGoal is what the steps are to reach: Peak is the highest share allowed,
// read by GoalLeastVolume.
type StepGoal struct {
	Kind string
	Peak float64
}

// StepState is a splice's highest share of any row in any load case, where it
// is, and the volume of all its bays between row centres, mm³.
type StepState struct {
	Peak          float64
	Row           int // from 1
	First, Second int // indices of members
	LoadCase      string
	Volume        float64
}

// StepsResult holds the steps found. A share is the size of an interface's load
// over the load through the joint.
type StepsResult struct {
	// Splice is the splice with the thicknesses found. Thicknesses at rows, and
	// with them compliances and bearing, are left as they were given.
	Splice        Splice
	Before, After StepState
	// Reached tells that GoalLeastVolume keeps within its peak; where the search
	// found no steps that do, the result is that of GoalEven.
	Reached bool
	// Evaluations counts the splices that were solved.
	Evaluations int
}

// Steps finds the thicknesses of bays within bounds that reach a goal over all
// load cases with end loads. It is a local search, from the thicknesses given,
// the middle of the bounds and steps in proportion to each bay's share of the
// load, the best of which is kept; the result is never worse than the splice
// given where that keeps within the bounds.
//
// The faults carry pointers into {"input": splice, "bounds", "goal", "peak"}.
func Steps(s Splice, cases []SpliceCase, bounds []StepBound, goal StepGoal) (StepsResult, []strength.Fault) {
	s = s.withDefaults()
	p, spliceFaults := PrepareSplice(s, strength.Factors{Ultimate: 1, Fitting: 1}, cases)
	var faults faultList
	for _, f := range spliceFaults {
		faults = append(faults, strength.Fault{Pointer: "/input" + f.Pointer, Message: f.Message})
	}
	faults = append(faults, stepFaults(&s, bounds, goal)...)
	if len(faults) > 0 {
		return StepsResult{}, faults
	}
	p.keepUnlikeCases()
	if faults = steppable(p); len(faults) > 0 {
		return StepsResult{}, faults
	}
	search := newStepSearch(p, bounds)
	if n := len(search.free); n > stepMostBays {
		faults.add("/bounds", "found %d bays to be chosen, allowed are %d", n, stepMostBays)
		return StepsResult{}, faults
	}
	return search.find(goal), nil
}

// stepFaults checks bounds and goal.
func stepFaults(s *Splice, bounds []StepBound, goal StepGoal) (faults faultList) {
	if len(bounds) == 0 {
		faults.add("/bounds", "there is no bound; at least one is needed, or nothing may change")
	}
	bound := map[[2]int]bool{}
	for i, b := range bounds {
		at := func(name string) string { return splicePointer("bounds", i, name) }
		if !(b.Least > 0) {
			faults.add(at("least"), "found %v, allowed is more than 0", strength.Length.Of(b.Least))
		}
		if !(b.Most >= b.Least) {
			faults.add(at("most"), "found %v, allowed is at least the least, %v", strength.Length.Of(b.Most), strength.Length.Of(b.Least))
		}
		m := -1
		for k := range s.Members {
			if s.Members[k].ID == b.Member {
				m = k
			}
		}
		switch {
		case m < 0:
			faults.add(at("member"), "there is no member %q", b.Member)
			continue
		case len(s.Members[m].Bays) == 0:
			faults.add(at("member"), "the member %q lies at one row and has no bay", b.Member)
			continue
		case b.Bay < 0 || b.Bay > len(s.Members[m].Bays):
			faults.add(at("bay"), "found bay %d, allowed are bays 1 to %d of the member", b.Bay, len(s.Members[m].Bays))
			continue
		}
		for j := range s.Members[m].Bays {
			if b.Bay != 0 && b.Bay != j+1 {
				continue
			}
			if bound[[2]int{m, j}] {
				faults.add(at("member"), "bay %d of the member %q is bounded twice", j+1, b.Member)
				break
			}
			bound[[2]int{m, j}] = true
		}
	}
	switch goal.Kind {
	case GoalEven:
	case GoalLeastVolume:
		if !(goal.Peak > 0) {
			faults.add("/peak", "found %g, allowed is more than 0: the highest share of any row", goal.Peak)
		}
	default:
		faults.add("/goal", "found %q, allowed are %q and %q", goal.Kind, GoalEven, GoalLeastVolume)
	}
	return faults
}

// steppable tells what keeps a splice from being stepped.
func steppable(p *PreparedSplice) (faults faultList) {
	if !p.main.why.Empty() {
		faults.add("/input/compliance", "%v, so there are no shares to even", p.main.why)
	}
	for r := range p.splice.Rows {
		if p.splice.Rows[r].Clearance > 0 {
			faults.add(splicePointer("input", "rows", r, "clearance"), "found %v, allowed is 0: steps are found for fasteners without clearance",
				strength.Length.Of(p.splice.Rows[r].Clearance))
		}
	}
	switch shares := len(p.cases) * p.stack.interfaces(); {
	case len(p.cases) == 0:
		faults.add("/input/load_cases", "no load case has end loads, so there are no shares to even")
	case shares > stepMostShares:
		faults.add("/input/load_cases", "found %d shares, interfaces times load cases that do not share alike; allowed are %d", shares, stepMostShares)
	}
	return faults
}

// keepUnlikeCases leaves out load cases without end loads, and those whose loads
// are a multiple of an earlier one's, which shares alike.
func (p *PreparedSplice) keepUnlikeCases() {
	seen := map[string]bool{}
	var kept []preparedCase
	for i := range p.cases {
		c := &p.cases[i]
		if c.through == 0 {
			continue
		}
		if c.change == nil {
			key := c.pattern()
			if seen[key] {
				continue
			}
			seen[key] = true
		}
		kept = append(kept, *c)
	}
	p.cases = kept
}

// pattern writes the end loads in proportion to the load through the joint, to
// nine digits, the first that is not 0 positive.
func (c *preparedCase) pattern() string {
	var b strings.Builder
	sign := 0.0
	for m := range c.left {
		for _, load := range []float64{c.left[m], c.right[m]} {
			if sign == 0 && load != 0 {
				sign = math.Copysign(1, load)
			}
			fmt.Fprintf(&b, "%.9f ", sign*load/c.through+0)
		}
	}
	return b.String()
}

// state finds the highest share and the volume of the splice as it stands.
func (q *stepSearch) state() StepState {
	p, k := q.p, q.p.stack
	state := StepState{Volume: q.volume()}
	for i := range p.cases {
		c := &p.cases[i]
		p.main.solve(c)
		for x, node := range k.nodes {
			if !k.inner(x) {
				continue
			}
			if share := math.Abs(p.main.transfer[x-node.row]) / c.through; share > state.Peak {
				state.Peak, state.Row, state.LoadCase = share, node.row+1, c.id
				state.First, state.Second = node.member, k.nodes[x+1].member
			}
		}
	}
	q.evaluations++
	return state
}

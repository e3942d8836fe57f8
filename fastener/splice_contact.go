package fastener

import (
	"math"

	"gonum.org/v1/gonum/blas/blas64"
)

// Contact tells how the clearances of a load case were taken up.
type Contact struct {
	// Ended is empty without clearances, ContactSettled when every interface is
	// consistent (one that bears is pressed together, one that does not carries
	// nothing), ContactStopped when the iteration gave up: the loads then mean
	// nothing.
	Ended string
	// Steps counts the systems that were solved, Open the interfaces that do
	// not bear.
	Steps, Open int
}

// How an iteration over clearances ended.
const (
	ContactSettled = "settled"
	ContactStopped = "stopped"
)

const (
	// A fastener that is taking up its clearance is at first a spring that the
	// load of the joint would stretch by so many times its clearance, and at
	// least and at most so many times as soft as one that bears; multipliers
	// then take its load away.
	contactStretch = 1e3
	contactSofter  = 1e4
	contactSoftest = 1e9
	// Loads below this part of the largest are none.
	contactNone = 1e-12
	// Newton steps in all, and in one line search.
	contactMostSteps = 500
	contactMostCuts  = 60
)

// contact finds which interfaces bear. An interface with clearance g slips by
//
//	δ = c R + s,  s between -g and g, and s = g sign(R) where R is not 0
//
// so the loads minimise the work of solver plus Σ g|R|, a convex function. It is
// minimised by multipliers: s = clamp(σ + ρ R, -g, g) with ρ far above c makes
// the work smooth and piecewise quadratic; Newton's method with a line search
// finds its minimum in finitely many steps, then σ = s, until no open interface
// carries load.
type contact struct {
	clearance  []float64 // g of each interface, mm
	softness   []float64 // ρ of the load case, mm/N
	multiplier []float64 // σ, mm
	side       []int8    // to which side an interface bears; 0: it is open
	tangent    []float64
	factor     blas64.TriangularBand
	step, from []float64
	// How far each node has moved from the first of its member by stretching,
	// where each member's first node stands, and whether that is known yet.
	stretched, offset []float64
	placed            []bool
	result            Contact
}

// newContact makes room, or returns nil where no row has a clearance.
func newContact(k *stack, s *Splice) *contact {
	n := k.interfaces()
	c := &contact{
		clearance: make([]float64, n), softness: make([]float64, n), multiplier: make([]float64, n),
		side: make([]int8, n), tangent: make([]float64, n),
		step: make([]float64, k.unknowns), from: make([]float64, k.unknowns),
		stretched: make([]float64, len(k.nodes)), offset: make([]float64, len(s.Members)), placed: make([]bool, len(s.Members)),
	}
	some := false
	for x, node := range k.nodes {
		if i := x - node.row; k.inner(x) {
			c.clearance[i] = s.Rows[node.row].Clearance
			some = some || c.clearance[i] > 0
		}
	}
	if !some {
		return nil
	}
	c.factor.Data = make([]float64, k.unknowns*(k.band+1))
	return c
}

// settle takes up the clearances, from the loads that would be without them.
func (v *solver) settle(c *preparedCase) {
	k := v.contact
	k.result = Contact{Ended: ContactStopped}
	clear(k.multiplier)
	scale := c.through
	for _, r := range v.transfer {
		scale = max(scale, math.Abs(r))
	}
	for i, g := range k.clearance {
		soft := v.compliance[i]
		k.softness[i] = min(max(contactStretch*g/scale, contactSofter*soft), contactSoftest*soft)
	}
	for k.result.Steps < contactMostSteps && v.newton(c) {
		largest, stray := 0.0, 0.0
		for i, r := range v.transfer {
			largest = max(largest, math.Abs(r))
			if k.side[i] == 0 {
				stray = max(stray, math.Abs(r))
			}
		}
		copy(k.multiplier, v.taken)
		if stray <= contactNone*max(largest, c.through) {
			// Once more, so that what is cut off below is none but for rounding.
			if v.newton(c) {
				k.result.Ended = ContactSettled
			}
			break
		}
	}
	for i := range v.transfer {
		if k.side[i] == 0 {
			v.transfer[i] = 0
			k.result.Open++
		}
	}
	v.carryOn(c)
	v.placeOpen(c)
}

// carryOn finds the members' loads from left to right by equilibrium with the
// loads of the interfaces, once those that are none have been set to 0.
func (v *solver) carryOn(c *preparedCase) {
	intoNext := 0.0
	for x, node := range v.stack.nodes {
		load, _ := v.sides(x, c)
		load += intoNext
		if intoNext = 0; v.stack.inner(x) {
			intoNext = v.transfer[x-node.row]
			load -= intoNext
		}
		if !node.last {
			v.load[node.rightSpan] = load
		}
	}
}

// placeOpen finds what open interfaces take up by compatibility with those that
// bear: the multipliers are soft springs, through which the rounding of a load
// that is none shows as slip.
func (v *solver) placeOpen(c *preparedCase) {
	k := v.contact
	clear(k.offset)
	clear(k.placed)
	// k.offset runs along the members first, to find how each stretches.
	for x, node := range v.stack.nodes {
		if !node.first {
			k.offset[node.member] += v.elongation(node.leftSpan, c)
		}
		k.stretched[x] = k.offset[node.member]
	}
	clear(k.offset)
	k.placed[v.stack.nodes[0].member] = true
	for v.placeNext(true) || v.placeNext(false) {
	}
	for x, node := range v.stack.nodes {
		if i := x - node.row; v.stack.inner(x) && k.side[i] == 0 {
			v.taken[i] = max(-k.clearance[i], min(k.clearance[i], v.apart(x)))
		}
	}
}

// apart is the slip of the interface below node x by the places of its members.
func (v *solver) apart(x int) float64 {
	k, nodes := v.contact, v.stack.nodes
	return k.offset[nodes[x+1].member] + k.stretched[x+1] - (k.offset[nodes[x].member] + k.stretched[x])
}

// placeNext places members against those placed before, by interfaces that bear
// or by the first open one. It reports whether it placed any.
func (v *solver) placeNext(bearing bool) (placed bool) {
	k := v.contact
	for x, node := range v.stack.nodes {
		i := x - node.row
		if !v.stack.inner(x) || (k.side[i] != 0) != bearing {
			continue
		}
		below := v.stack.nodes[x+1].member
		gap := float64(v.compliance[i]*v.transfer[i]) + v.taken[i] - v.apart(x)
		switch {
		case k.placed[node.member] && !k.placed[below]:
			k.offset[below], k.placed[below] = k.offset[below]+gap, true
		case k.placed[below] && !k.placed[node.member]:
			k.offset[node.member], k.placed[node.member] = k.offset[node.member]-gap, true
		default:
			continue
		}
		if placed = true; !bearing {
			return true
		}
	}
	return placed
}

// takeUp finds the clearance taken up under the present loads, and whether any
// interface changed its side by it.
func (v *solver) takeUp() (changed bool) {
	k := v.contact
	for i, g := range k.clearance {
		z := k.multiplier[i] + float64(k.softness[i]*v.transfer[i])
		v.taken[i] = max(-g, min(g, z))
		var side int8
		switch {
		case g == 0, z >= g: // without clearance it bears both ways
			side = 1
		case z <= -g:
			side = -1
		}
		changed = changed || side != k.side[i]
		k.side[i] = side
	}
	return changed
}

// determinate takes clearances up where equilibrium alone gives the loads.
func (v *solver) determinate() {
	k := v.contact
	k.result = Contact{Ended: ContactSettled}
	for i, g := range k.clearance {
		switch r := v.transfer[i]; {
		case r != 0:
			v.taken[i] = math.Copysign(g, r)
		case g > 0:
			k.result.Open++
		}
	}
}

// newton minimises the work for the present multipliers. It reports whether it
// came to the minimum.
func (v *solver) newton(c *preparedCase) bool {
	k := v.contact
	v.takeUp()
	v.gradient(v.misfit, c)
	for k.result.Steps < contactMostSteps {
		k.result.Steps++
		for i := range k.tangent {
			if k.tangent[i] = v.compliance[i]; k.side[i] == 0 {
				k.tangent[i] += k.softness[i]
			}
		}
		if !v.factorInto(&k.factor, k.tangent) {
			return false
		}
		slope := v.aim()
		if changed := v.walk(c, 1); !changed {
			// Once more with the same factor, to refine.
			v.aim()
			v.walk(c, 1)
			return true
		}
		v.search(c, slope)
	}
	return false
}

// aim finds the step to the minimum of the present piece, and the slope of the
// work along it.
func (v *solver) aim() (slope float64) {
	k := v.contact
	for i, gap := range v.misfit {
		k.step[i] = -gap
	}
	backSolve(k.factor, k.step)
	copy(k.from, v.unknown)
	return dot(v.misfit, k.step)
}

// walk goes a part of the step from where it began.
func (v *solver) walk(c *preparedCase, part float64) (changed bool) {
	k := v.contact
	for i := range v.unknown {
		v.unknown[i] = k.from[i] + float64(part*k.step[i])
	}
	v.spread(c)
	changed = v.takeUp()
	v.gradient(v.misfit, c)
	return changed
}

// search finds about where the work is least along the step, by halving: its
// slope grows along the step.
func (v *solver) search(c *preparedCase, slope float64) {
	lo, hi := 0.0, 1.0
	at := dot(v.misfit, v.contact.step)
	for range contactMostCuts {
		if at <= 0.1*math.Abs(slope) {
			if at >= 0.1*slope || hi == 1 {
				return
			}
		}
		middle := (lo + hi) / 2
		v.walk(c, middle)
		if at = dot(v.misfit, v.contact.step); at > 0 {
			hi = middle
		} else {
			lo = middle
		}
	}
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += float64(a[i] * b[i])
	}
	return sum
}

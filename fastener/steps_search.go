package fastener

import (
	"math"

	"gonum.org/v1/gonum/optimize"
)

const (
	// The highest share is approached by Σ exp of sharper and sharper shares.
	stepSharpest = 3e5
	// Steps of one descent, and rounds of multipliers for a peak that is given.
	stepMostIterations = 300
	stepMostRounds     = 12
	// The largest task: shares, and bays to be chosen.
	stepMostShares = 5000
	stepMostBays   = 500
	// A peak is kept within this part of it.
	stepPeakWithin = 1e-9
)

// stepSearch varies the thicknesses of free bays. The variables y are free: the
// logarithm of a thickness swings between those of its bounds with sin y, so
// that a bound can be reached.
type stepSearch struct {
	p    *PreparedSplice
	free []freeBay

	thickness []float64 // of every span, mm
	weight    []float64 // of a load in the smooth objective, by interface
	adjoint   []float64 // by unknown
	slope     []float64 // of the objective by the logarithm of each span's thickness

	evaluations int
	best        []float64 // thicknesses of every span
	merit       float64   // of best
}

// freeBay is a span whose thickness may vary.
type freeBay struct {
	span       int
	middle, by float64 // of the logarithm: middle + by sin y
}

func newStepSearch(p *PreparedSplice, bounds []StepBound) *stepSearch {
	k := p.stack
	q := &stepSearch{
		p: p, thickness: make([]float64, len(k.spans)), slope: make([]float64, len(k.spans)),
		weight: make([]float64, k.interfaces()), adjoint: make([]float64, k.unknowns), merit: math.Inf(1),
	}
	for i, span := range k.spans {
		m := &p.splice.Members[span.member]
		q.thickness[i] = m.bay(span.bay).Thickness
		for _, b := range bounds {
			if b.Member == m.ID && (b.Bay == 0 || b.Bay == span.bay-(m.FirstRow-1)+1) {
				lo, hi := math.Log(b.Least), math.Log(b.Most)
				q.free = append(q.free, freeBay{i, (lo + hi) / 2, (hi - lo) / 2})
			}
		}
	}
	return q
}

// apply puts thicknesses into the equations and factors them.
func (q *stepSearch) apply() bool {
	v, k, s := &q.p.main, q.p.stack, &q.p.splice
	for i, span := range k.spans {
		m := &s.Members[span.member]
		v.flexibility[i] = s.Pitches[span.bay] / (m.bay(span.bay).Width * k.layers(span.member) * q.thickness[i] * m.E)
	}
	return k.unknowns == 0 || v.factorInto(&v.factor, v.compliance)
}

// set turns variables into thicknesses.
func (q *stepSearch) set(y []float64) bool {
	for i, f := range q.free {
		q.thickness[f.span] = math.Exp(f.middle + float64(f.by*math.Sin(y[i])))
	}
	return q.apply()
}

// volume is that of all bays between row centres, mm³.
func (q *stepSearch) volume() float64 {
	sum := 0.0
	for i := range q.thickness {
		sum += float64(q.bayVolume(i))
	}
	return sum
}

func (q *stepSearch) bayVolume(i int) float64 {
	span, s := q.p.stack.spans[i], &q.p.splice
	return s.Pitches[span.bay] * s.Members[span.member].bay(span.bay).Width * q.p.stack.layers(span.member) * q.thickness[i]
}

// keep remembers the present thicknesses if their merit is the least yet.
func (q *stepSearch) keep(merit float64) {
	if merit < q.merit {
		q.merit = merit
		q.best = append(q.best[:0], q.thickness...)
	}
}

// addSlope adds to slope what the weights of the present case's loads make, by
// the adjoint of the equations: with g(S, f) = 0 their compatibility, and
// ∂g/∂f = N ∂N/∂S, the change of Σ weight R with f is -N times the load that
// the adjoint puts into the span; and df/d(ln t) = -f.
func (q *stepSearch) addSlope() {
	v, k := &q.p.main, q.p.stack
	if k.unknowns == 0 {
		return
	}
	clear(q.adjoint)
	for x, node := range k.nodes {
		if !k.inner(x) {
			continue
		}
		w := q.weight[x-node.row]
		if node.left == node.right {
			continue
		}
		if node.left >= 0 {
			q.adjoint[node.left] += w
		}
		if node.right >= 0 {
			q.adjoint[node.right] -= w
		}
	}
	backSolve(v.factor, q.adjoint)
	at := func(t term) float64 {
		if t < 0 {
			return 0
		}
		return q.adjoint[t]
	}
	for i, span := range k.spans {
		q.slope[i] += float64(v.flexibility[i] * v.load[i] * (at(span.below) - at(span.above)))
	}
}

// eachShare solves every load case with end loads and gives its shares' sizes
// to visit, which returns the weight of each; with any weight the slope of the
// sum is added up.
func (q *stepSearch) eachShare(visit func(place int, share float64) (weight float64)) (peak float64) {
	v := &q.p.main
	q.evaluations++
	clear(q.slope)
	place := 0
	for i := range q.p.cases {
		c := &q.p.cases[i]
		v.solve(c)
		for j, r := range v.transfer {
			share := math.Abs(r) / c.through
			peak = max(peak, share)
			q.weight[j] = visit(place, share) / c.through
			if r < 0 {
				q.weight[j] = -q.weight[j]
			}
			place++
		}
		q.addSlope()
	}
	return peak
}

// evenness is the smooth stand-in of the highest share, ln Σ exp(β r)/β, shifted
// so that nothing overflows, and its slope.
func (q *stepSearch) evenness(sharpness float64) (value float64) {
	top := q.eachShare(func(int, float64) float64 { return 0 })
	sum := 0.0
	q.eachShare(func(_ int, share float64) float64 {
		e := math.Exp(sharpness * (share - top))
		sum += e
		return e
	})
	for i := range q.slope {
		q.slope[i] /= sum
	}
	q.keep(top)
	return top + math.Log(sum)/sharpness
}

// descend minimises value from y, whose slope by each span it leaves in q.slope.
func (q *stepSearch) descend(y []float64, value func() float64) []float64 {
	at, have := make([]float64, len(y)), false
	last := 0.0
	evaluate := func(y []float64) float64 {
		if have && equalTo(at, y) {
			return last
		}
		copy(at, y)
		have, last = true, math.MaxFloat64
		if q.set(y) {
			last = value()
		}
		return last
	}
	result, _ := optimize.Minimize(optimize.Problem{
		Func: evaluate,
		Grad: func(grad, y []float64) {
			evaluate(y)
			for i, f := range q.free {
				grad[i] = q.slope[f.span] * f.by * math.Cos(y[i])
			}
		},
	}, y, &optimize.Settings{
		MajorIterations: stepMostIterations, GradientThreshold: 1e-12,
		Converger: &optimize.FunctionConverge{Absolute: 1e-14, Iterations: 20},
	}, &optimize.BFGS{})
	// A line search that finds no more is an end like any other.
	if result == nil || len(result.X) != len(y) {
		return y
	}
	return result.X
}

func equalTo(a, b []float64) bool {
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return true
}

// starts returns where the search begins: the thicknesses given, the middle of
// the bounds, and thicknesses in proportion to the load that equal shares leave
// in each bay.
func (q *stepSearch) starts() [][]float64 {
	const inside = 0.9 // of the swing: at a bound the slope by y is none
	variable := func(logarithm func(f freeBay) float64) []float64 {
		y := make([]float64, len(q.free))
		for i, f := range q.free {
			if f.by > 0 {
				y[i] = math.Asin(max(-inside, min(inside, (logarithm(f)-f.middle)/f.by)))
			}
		}
		return y
	}
	given := append([]float64(nil), q.thickness...)
	return [][]float64{
		variable(func(f freeBay) float64 { return math.Log(given[f.span]) }),
		variable(func(f freeBay) float64 { return f.middle }),
		variable(func(f freeBay) float64 {
			share := q.scarf(f.span)
			return math.Log(float64(math.Exp(f.middle+f.by)*share) + float64(math.Exp(f.middle-f.by)*(1-share)))
		}),
	}
}

// scarf is the part of its greatest load that a bay carries when every row
// takes as much: falling along a member loaded on the left, growing along one
// loaded on the right.
func (q *stepSearch) scarf(span int) float64 {
	at := q.p.stack.spans[span]
	m := &q.p.splice.Members[at.member]
	bays := float64(len(m.Bays))
	part := (float64(at.bay-(m.FirstRow-1)) + 0.5) / bays
	left, right := 0.0, 0.0
	for i := range q.p.cases {
		if c := &q.p.cases[i]; c.left != nil {
			left, right = left+math.Abs(c.left[at.member]), right+math.Abs(c.right[at.member])
		}
	}
	if left+right == 0 {
		return 0.5
	}
	return (float64(left*(1-part)) + float64(right*part)) / max(left, right)
}

// even makes the highest share least.
func (q *stepSearch) even() {
	for _, y := range q.starts() {
		for sharpness := 30.0; sharpness <= stepSharpest; sharpness *= 10 {
			y = q.descend(y, func() float64 { return q.evenness(sharpness) })
		}
	}
}

// leastVolume makes the volume least with no share above the peak, from the
// steps that make the highest share least, which must keep it: multipliers of
// every share over the peak, and at the end a way back towards those steps as
// far as the peak asks.
func (q *stepSearch) leastVolume(peak float64) {
	feasible := append([]float64(nil), q.best...)
	copy(q.thickness, feasible)
	whole := q.volume()
	q.merit = whole

	places := len(q.p.cases) * q.p.stack.interfaces()
	multiplier, over := make([]float64, places), make([]float64, places)
	y := make([]float64, len(q.free))
	for i, f := range q.free {
		if f.by > 0 {
			y[i] = math.Asin(max(-0.9, min(0.9, (math.Log(feasible[f.span])-f.middle)/f.by)))
		}
	}
	penalty := 10.0
	for range stepMostRounds {
		y = q.descend(y, func() float64 {
			sum := 0.0
			q.eachShare(func(place int, share float64) float64 {
				over[place] = share/peak - 1
				push := max(0, multiplier[place]+float64(penalty*over[place]))
				sum += float64(push*push) / (2 * penalty)
				return push / peak
			})
			for _, f := range q.free {
				q.slope[f.span] += q.bayVolume(f.span) / whole
			}
			return sum + q.volume()/whole
		})
		q.set(y)
		q.eachShare(func(place int, share float64) float64 {
			over[place] = share/peak - 1
			return 0
		})
		q.retreat(feasible, peak)
		for i := range multiplier {
			multiplier[i] = max(0, multiplier[i]+float64(penalty*over[i]))
		}
		penalty = min(penalty*3, 1e6)
	}
	// The thinnest bays of all, where they keep the peak.
	for _, f := range q.free {
		q.thickness[f.span] = math.Exp(f.middle - f.by)
	}
	q.retreat(feasible, peak)
}

// retreat goes from the present thicknesses back towards feasible ones until
// no share is above the peak, and keeps what it finds.
func (q *stepSearch) retreat(feasible []float64, peak float64) {
	from := append([]float64(nil), q.thickness...)
	keeps := func(part float64) bool {
		for _, f := range q.free {
			q.thickness[f.span] = math.Pow(from[f.span], 1-part) * math.Pow(feasible[f.span], part)
		}
		if !q.apply() {
			return false
		}
		return q.state().Peak <= peak*(1+stepPeakWithin)
	}
	if keeps(0) {
		q.keep(q.volume())
		return
	}
	lo, hi := 0.0, 1.0
	for range 40 {
		middle := (lo + hi) / 2
		if keeps(middle) {
			hi = middle
			q.keep(q.volume())
		} else {
			lo = middle
		}
	}
}

// find searches for the goal.
func (q *stepSearch) find(goal StepGoal) StepsResult {
	result := StepsResult{Before: q.state()}
	given := append([]float64(nil), q.thickness...)
	if q.within() {
		q.keep(result.Before.Peak)
	}
	q.even()
	result.Reached = true
	if goal.Kind == GoalLeastVolume {
		if result.Reached = q.merit <= goal.Peak*(1+stepPeakWithin); result.Reached {
			q.leastVolume(goal.Peak)
			copy(q.thickness, given)
			if q.within() && result.Before.Peak <= goal.Peak*(1+stepPeakWithin) {
				q.keep(result.Before.Volume)
			}
		}
	}
	copy(q.thickness, given)
	copy(q.thickness, q.best)
	q.apply()
	result.After = q.state()
	result.Splice = q.stepped()
	result.Evaluations = q.evaluations
	return result
}

// within reports whether the present thicknesses keep their bounds.
func (q *stepSearch) within() bool {
	for _, f := range q.free {
		if math.Abs(math.Log(q.thickness[f.span])-f.middle) > f.by+1e-12 {
			return false
		}
	}
	return true
}

// stepped is the splice with the present thicknesses.
func (q *stepSearch) stepped() Splice {
	s := q.p.splice
	s.Members = append([]Member(nil), s.Members...)
	for m := range s.Members {
		s.Members[m].Bays = append([]Bay(nil), s.Members[m].Bays...)
	}
	for i, span := range q.p.stack.spans {
		m := &s.Members[span.member]
		m.Bays[span.bay-(m.FirstRow-1)].Thickness = q.thickness[i]
	}
	return s
}

package fastener

import (
	"math"

	"jointledger/strength"
)

// slender is the breadth of a group of fasteners over its length under which it
// cannot be trusted with a moment about its line: rounding of the coordinates
// alone would then decide the shares.
const slender = 1e-6

// straight is the same ratio under which the group is a line.
const straight = 1e-12

// elastic shares loads by stiffness on a rigid attached member.
//
// In plane each fastener resists its displacement in proportion to its shear
// stiffness; out of plane it stretches in proportion to its tension stiffness,
// both about the centroid of their own stiffness. Axes u, v are the principal
// ones of the tension stiffness, u along the greater spread.
//
// Source: in plane NASA RP-1228 (seen); out of plane derived from equilibrium
// of a rigid member on linear springs.
type elastic struct {
	weights
	x, y     []float64 // offsets from the shear centroid
	u, v     []float64 // offsets from the tension centroid, principal axes
	x0, y0   float64   // the first fastener: origin of small numbers
	cx, cy   float64   // shear centroid from there
	tx, ty   float64   // tension centroid from there
	xc, yc   float64
	xt, yt   float64
	sumV, j  float64
	sumT     float64
	cos, sin float64  // direction of u
	iu, iv   float64  // Σ k_t v² and Σ k_t u²
	iuv      float64  // Σ k_t u v
	reach    float64  // the farthest fastener from the shear centroid
	length   float64  // extent along u
	breadth  float64  // extent along v
	slots    *slotted // nil without slots
	heel     *heel    // nil unless the member turns about its outline
}

// centred is a load about the centroids: forces, the moment about z at the
// shear centroid and those about u and v at the tension centroid.
type centred struct {
	x, y, z    float64
	mz, mu, mv float64
}

func newElastic(p Pattern, w weights) *elastic {
	n := len(p.Fasteners)
	e := &elastic{
		weights: w,
		x0:      p.Fasteners[0].X, y0: p.Fasteners[0].Y,
	}
	e.x, e.y, e.cx, e.cy, e.sumV = offsets(p.Fasteners, e.kv)
	e.xc, e.yc = e.x0+e.cx, e.y0+e.cy
	for i := range n {
		e.j += float64(e.kv[i] * (float64(e.x[i]*e.x[i]) + float64(e.y[i]*e.y[i])))
		e.reach = max(e.reach, math.Hypot(e.x[i], e.y[i]))
	}
	var x, y []float64
	x, y, e.tx, e.ty, e.sumT = offsets(p.Fasteners, e.kt)
	e.xt, e.yt = e.x0+e.tx, e.y0+e.ty
	e.principal(x, y)
	e.slots = newSlotted(e)
	if p.OutOfPlane == "heel" {
		e.heel = newHeel(e, p.Plates[0].Outline)
	}
	return e
}

// offsets returns the places of the fasteners from the centroid of weights k,
// that centroid from the first fastener, and the sum of the weights. A second
// pass takes out what rounding left, which unequal weights would magnify.
func offsets(fasteners []Fastener, k []float64) (x, y []float64, cx, cy, sum float64) {
	x, y = make([]float64, len(k)), make([]float64, len(k))
	for i, f := range fasteners {
		x[i], y[i] = f.X-fasteners[0].X, f.Y-fasteners[0].Y
		sum += k[i]
	}
	for range 2 {
		var sx, sy float64
		for i := range k {
			sx += float64(k[i] * x[i])
			sy += float64(k[i] * y[i])
		}
		dx, dy := sx/sum, sy/sum
		cx, cy = cx+dx, cy+dy
		for i := range k {
			x[i], y[i] = x[i]-dx, y[i]-dy
		}
	}
	return x, y, cx, cy, sum
}

// principal turns the offsets from the tension centroid to principal axes.
func (e *elastic) principal(x, y []float64) {
	e.cos, e.sin = axis(x, y, nil)
	e.length, e.breadth = extent(x, y, e.cos, e.sin)
	line := e.breadth <= straight*e.length
	if !line {
		e.cos, e.sin = axis(x, y, e.kt)
	}
	e.u, e.v = make([]float64, len(x)), make([]float64, len(x))
	for i := range x {
		e.u[i] = float64(e.cos*x[i]) + float64(e.sin*y[i])
		if !line {
			e.v[i] = float64(e.cos*y[i]) - float64(e.sin*x[i])
		}
		e.iu += float64(e.kt[i] * e.v[i] * e.v[i])
		e.iv += float64(e.kt[i] * e.u[i] * e.u[i])
		e.iuv += float64(e.kt[i] * e.u[i] * e.v[i])
	}
}

// axis returns the direction of greatest spread of weighted points about their
// centroid; nil weights are equal.
func axis(x, y, k []float64) (cos, sin float64) {
	var mx, my, sum, xx, yy, xy float64
	weight := func(i int) float64 {
		if k == nil {
			return 1
		}
		return k[i]
	}
	for i := range x {
		sum += weight(i)
		mx += float64(weight(i) * x[i])
		my += float64(weight(i) * y[i])
	}
	mx, my = mx/sum, my/sum
	for i := range x {
		dx, dy := x[i]-mx, y[i]-my
		xx += float64(weight(i) * dx * dx)
		yy += float64(weight(i) * dy * dy)
		xy += float64(weight(i) * dx * dy)
	}
	sin, cos = math.Sincos(math.Atan2(2*xy, xx-yy) / 2)
	switch {
	case xy == 0 && xx >= yy:
		return 1, 0
	case xy == 0:
		return 0, 1
	}
	return cos, sin
}

// extent returns the size of the group along a direction and across it.
func extent(x, y []float64, cos, sin float64) (along, across float64) {
	loU, loV := math.Inf(1), math.Inf(1)
	hiU, hiV := math.Inf(-1), math.Inf(-1)
	for i := range x {
		u := float64(cos*x[i]) + float64(sin*y[i])
		v := float64(cos*y[i]) - float64(sin*x[i])
		loU, hiU, loV, hiV = min(loU, u), max(hiU, u), min(loV, v), max(hiV, v)
	}
	return hiU - loU, hiV - loV
}

// centre moves a load to the centroids. The fault names a motion that the load
// would drive and no fastener resists.
func (e *elastic) centre(c PatternCase, index int) (centred, strength.Fault) {
	at := func(cx, cy float64) (mx, my, mz float64) {
		px, py, pz := c.Point[0]-e.x0-cx, c.Point[1]-e.y0-cy, c.Point[2]
		return c.Moment[0] + (float64(py*c.Force[2]) - float64(pz*c.Force[1])),
			c.Moment[1] + (float64(pz*c.Force[0]) - float64(px*c.Force[2])),
			c.Moment[2] + (float64(px*c.Force[1]) - float64(py*c.Force[0]))
	}
	load := centred{x: c.Force[0], y: c.Force[1], z: c.Force[2]}
	_, _, load.mz = at(e.cx, e.cy)
	mx, my, _ := at(e.tx, e.ty)
	load.mu = float64(e.cos*mx) + float64(e.sin*my)
	load.mv = float64(e.cos*my) - float64(e.sin*mx)

	force := math.Hypot(math.Hypot(c.Force[0], c.Force[1]), c.Force[2])
	moment := math.Hypot(math.Hypot(c.Moment[0], c.Moment[1]), c.Moment[2])
	arm := math.Hypot(math.Hypot(c.Point[0]-e.x0, c.Point[1]-e.y0), c.Point[2]) +
		math.Hypot(e.cx, e.cy) + math.Hypot(e.tx, e.ty)
	nothing := strength.Within * (moment + float64(force*arm))
	settle := func(m *float64) bool {
		if math.Abs(*m) <= nothing {
			*m = 0
		}
		return *m != 0
	}
	pointer := caseField(index, "moment")
	if moment == 0 {
		pointer = caseField(index, "point")
	}
	fault := func(m strength.Message) (centred, strength.Fault) {
		return load, strength.Fault{Pointer: pointer, Message: m}
	}
	alone := len(e.fasteners) == 1
	switch {
	case e.slots != nil:
		if m, slides := e.slots.drift(e, load, nothing); !m.Empty() {
			if slides {
				pointer = caseField(index, "force")
			}
			return fault(m)
		}
	case alone && settle(&load.mz):
		return fault(strength.Say("nothing resists turning in the plane about fastener %q, which is alone: the load makes a moment of %v about its axis",
			e.fasteners[0].ID, strength.Moment.Of(load.mz)))
	}
	switch {
	case e.heel != nil:
	case alone && (settle(&load.mu) || settle(&load.mv)):
		return fault(strength.Say("nothing resists rocking out of the plane about fastener %q, which is alone: the load makes a moment of %v there",
			e.fasteners[0].ID, strength.Moment.Of(math.Hypot(load.mu, load.mv))))
	case !alone && e.breadth <= slender*e.length && settle(&load.mu):
		angle := math.Atan2(e.sin, e.cos) * 180 / math.Pi
		return fault(strength.Say("nothing resists turning about the line through the fasteners (%.4g° from the x axis): the load makes a moment of %v about it",
			angle, strength.Moment.Of(load.mu)))
	}
	return load, strength.Fault{}
}

// share fills the shares of a load and returns the residual.
func (e *elastic) share(load centred, out []Share) float64 {
	for i := range out {
		out[i] = Share{}
	}
	whole, touch := load, heelContact{}
	if e.heel != nil {
		if touch = e.heel.find(e, load); touch.kind != heelFree {
			load.z, load.mu, load.mv = 0, 0, 0
		}
	}
	e.distribute(load, out)
	rest, residual := e.imbalance(load, out)
	// Rounding of very unequal stiffnesses is shared out in its turn.
	for range 3 {
		if residual <= 1e-14 {
			break
		}
		e.distribute(rest, out)
		better, smaller := e.imbalance(load, out)
		if smaller >= residual {
			break
		}
		rest, residual = better, smaller
	}
	if touch.kind != heelFree {
		residual = max(residual, e.heel.stretch(e, whole, touch, out))
	}
	resultants(out)
	return residual
}

func resultants(out []Share) {
	for i := range out {
		s := &out[i]
		s.Resultant = math.Sqrt(float64(s.Shear[0]*s.Shear[0]) + float64(s.Shear[1]*s.Shear[1]))
	}
}

// settleShears completes shares whose shears came from elsewhere and returns
// the residual of these.
func (e *elastic) settleShears(load centred, out []Share) float64 {
	resultants(out)
	rest := load
	for i := range out {
		rest.x -= out[i].Shear[0]
		rest.y -= out[i].Shear[1]
		rest.mz -= float64(e.x[i]*out[i].Shear[1]) - float64(e.y[i]*out[i].Shear[0])
	}
	force := math.Sqrt(float64(load.x*load.x) + float64(load.y*load.y))
	if e.reach > 0 {
		force += math.Abs(load.mz) / e.reach
	}
	if force == 0 {
		return 0
	}
	residual := max(math.Abs(rest.x), math.Abs(rest.y)) / force
	if e.reach > 0 {
		residual = max(residual, math.Abs(rest.mz)/(force*e.reach))
	}
	return residual
}

// tilt returns the turns about u and v that moments about them make.
func (e *elastic) tilt(mu, mv float64) (a, b float64) {
	if e.iu == 0 {
		if e.iv == 0 {
			return 0, 0
		}
		return 0, mv / e.iv
	}
	d := float64(e.iu*e.iv) - float64(e.iuv*e.iuv)
	return (float64(mu*e.iv) + float64(mv*e.iuv)) / d, (float64(mv*e.iu) + float64(mu*e.iuv)) / d
}

func (e *elastic) distribute(load centred, out []Share) {
	if e.slots != nil {
		e.slots.distribute(e, load, out)
		e.stretch(load, out)
		return
	}
	dx, dy, dz := load.x/e.sumV, load.y/e.sumV, load.z/e.sumT
	turn := 0.0
	if e.j > 0 {
		turn = load.mz / e.j
	}
	a, b := e.tilt(load.mu, load.mv)
	x, y, u, v, kv, kt := e.x, e.y[:len(e.x)], e.u[:len(e.x)], e.v[:len(e.x)], e.kv[:len(e.x)], e.kt[:len(e.x)]
	out = out[:len(e.x)]
	for i := range x {
		s := &out[i]
		s.Shear[0] += float64(kv[i] * (dx - float64(turn*y[i])))
		s.Shear[1] += float64(kv[i] * (dy + float64(turn*x[i])))
		s.Tension += float64(kt[i] * (dz + float64(a*v[i]) - float64(b*u[i])))
	}
}

// stretch adds the tensions of a load.
func (e *elastic) stretch(load centred, out []Share) {
	a, b := e.tilt(load.mu, load.mv)
	for i := range out {
		out[i].Tension += float64(e.kt[i] * (load.z/e.sumT + float64(a*e.v[i]) - float64(b*e.u[i])))
	}
}

// imbalance returns what the shares leave of a load, and the largest part of it
// relative to the load: forces to the whole force and the couple of the moment
// at the pattern's reach, moments to that force at that reach.
func (e *elastic) imbalance(load centred, out []Share) (centred, float64) {
	rest := load
	for i := range out {
		s := &out[i]
		rest.x -= s.Shear[0]
		rest.y -= s.Shear[1]
		rest.z -= s.Tension
		rest.mz -= float64(e.x[i]*s.Shear[1]) - float64(e.y[i]*s.Shear[0])
		rest.mu -= float64(e.v[i] * s.Tension)
		rest.mv += float64(e.u[i] * s.Tension)
	}
	force := math.Sqrt(float64(load.x*load.x) + float64(load.y*load.y) + float64(load.z*load.z))
	if e.reach > 0 {
		force += math.Sqrt(float64(load.mz*load.mz)+float64(load.mu*load.mu)+float64(load.mv*load.mv)) / e.reach
	}
	if force == 0 {
		return rest, 0
	}
	residual := max(math.Abs(rest.x), math.Abs(rest.y), math.Abs(rest.z)) / force
	if e.reach > 0 {
		residual = max(residual, max(math.Abs(rest.mz), math.Abs(rest.mu), math.Abs(rest.mv))/(force*e.reach))
	}
	return rest, residual
}

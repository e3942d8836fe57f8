package fastener

import (
	"math"
	"slices"

	"jointledger/strength"
)

// heel shares tension when the rigid member may lift but not sink: it turns
// about the side or vertex of its outline that stays in contact.
//
// The lift w = w0 + a y - b x is nowhere negative on the outline and makes the
// energy ½ Σ k w² less the work of the load least; of the candidates that lift
// everywhere (free, turning about a side, about a vertex, shut), that is the one
// whose contact only presses, which is also the one whose load does most work.
// Holes lie inside the outline, so no fastener is pushed together. Only the
// outline's convex hull can touch.
//
// Source: T = k l (M + N l_N) / Σ(k l²) about a side in contact, common in
// hand analysis of brackets; the choice of the side derived from equilibrium.
type heel struct {
	hull [][2]float64 // principal axes, from the tension centroid, anticlockwise
	side []heelSide
}

// heelSide is a side of the hull: its inward normal, and Σ k l².
type heelSide struct {
	normal [2]float64
	offset float64 // l = normal · (u, v) + offset
	second float64
}

// heelKind is how the member touches.
type heelKind uint8

const (
	heelFree heelKind = iota
	heelSideContact
	heelVertexContact
	heelShut
)

// heelContact is the motion that a load makes: the lift w0 + a v - b u.
type heelContact struct {
	kind     heelKind
	index    int
	w0, a, b float64
}

func newHeel(e *elastic, outline [][2]float64) *heel {
	h := &heel{}
	for _, p := range outline {
		x, y := p[0]-e.x0-e.tx, p[1]-e.y0-e.ty
		h.hull = append(h.hull, [2]float64{float64(e.cos*x) + float64(e.sin*y), float64(e.cos*y) - float64(e.sin*x)})
	}
	h.hull = convexHull(h.hull)
	for i, p := range h.hull {
		q := h.hull[(i+1)%len(h.hull)]
		length := math.Hypot(q[0]-p[0], q[1]-p[1])
		s := heelSide{normal: [2]float64{-(q[1] - p[1]) / length, (q[0] - p[0]) / length}}
		s.offset = -float64(s.normal[0]*p[0]) - float64(s.normal[1]*p[1])
		for k := range e.u {
			l := float64(s.normal[0]*e.u[k]) + float64(s.normal[1]*e.v[k]) + s.offset
			s.second += float64(e.kt[k] * l * l)
		}
		h.side = append(h.side, s)
	}
	return h
}

// convexHull returns the hull anticlockwise, without points in line.
func convexHull(points [][2]float64) [][2]float64 {
	sorted := slices.Clone(points)
	slices.SortFunc(sorted, func(a, b [2]float64) int {
		if a[0] < b[0] || a[0] == b[0] && a[1] < b[1] {
			return -1
		}
		if a == b {
			return 0
		}
		return 1
	})
	half := func(all [][2]float64) [][2]float64 {
		var hull [][2]float64
		for _, p := range all {
			for len(hull) >= 2 {
				a, b := hull[len(hull)-2], hull[len(hull)-1]
				if (side{a[0], a[1], b[0], b[1]}).turn(p[0], p[1]) > 0 {
					break
				}
				hull = hull[:len(hull)-1]
			}
			hull = append(hull, p)
		}
		return hull[:len(hull)-1]
	}
	lower := half(sorted)
	slices.Reverse(sorted)
	return append(lower, half(sorted)...)
}

// find returns how the member lifts under a load.
func (h *heel) find(e *elastic, load centred) heelContact {
	best, most := heelContact{kind: heelShut}, 0.0
	try := func(c heelContact) {
		if work := float64(load.z*c.w0) + float64(load.mu*c.a) + float64(load.mv*c.b); work > most {
			best, most = c, work
		}
	}
	lift := func(c heelContact, p [2]float64) float64 {
		return c.w0 + float64(c.a*p[1]) - float64(c.b*p[0])
	}
	if e.iu > 0 || load.mu == 0 {
		c := heelContact{kind: heelFree, w0: load.z / e.sumT}
		c.a, c.b = e.tilt(load.mu, load.mv)
		up := true
		for _, p := range h.hull {
			size := math.Abs(c.w0) + math.Abs(c.a*p[1]) + math.Abs(c.b*p[0])
			up = up && lift(c, p) >= -1e-12*size
		}
		if up {
			return c
		}
	}
	for i, s := range h.side {
		turn := (float64(load.z*s.offset) + float64(load.mu*s.normal[1]) - float64(load.mv*s.normal[0])) / s.second
		if turn > 0 {
			try(heelContact{heelSideContact, i, turn * s.offset, turn * s.normal[1], -turn * s.normal[0]})
		}
	}
	n := len(h.hull)
	for i, p := range h.hull {
		c := heelContact{kind: heelVertexContact, index: i}
		var ok bool
		if c.a, c.b, ok = h.about(e, p, load.mu-float64(load.z*p[1]), load.mv+float64(load.z*p[0])); !ok {
			continue
		}
		c.w0 = float64(c.b*p[0]) - float64(c.a*p[1])
		size := func(q [2]float64) float64 { return math.Abs(c.a*(q[1]-p[1])) + math.Abs(c.b*(q[0]-p[0])) }
		rises := func(q [2]float64) bool {
			return float64(c.a*(q[1]-p[1]))-float64(c.b*(q[0]-p[0])) >= -1e-12*size(q)
		}
		if rises(h.hull[(i+1)%n]) && rises(h.hull[(i+n-1)%n]) {
			// Where the vertex also presses nothing does more work; asking for
			// that beats comparing works, which differ little near a tie.
			if float64(e.sumT*c.w0) >= load.z {
				return c
			}
			try(c)
		}
	}
	return best
}

// about returns the turns about vertex p under moments about it.
func (h *heel) about(e *elastic, p [2]float64, mu, mv float64) (a, b float64, ok bool) {
	// The second moments are those about the centroid, moved.
	iu := e.iu + float64(e.sumT*p[1]*p[1])
	iv := e.iv + float64(e.sumT*p[0]*p[0])
	iuv := e.iuv + float64(e.sumT*p[0]*p[1])
	d := float64(iu*iv) - float64(iuv*iuv)
	if d <= 1e-12*iu*iv {
		return 0, 0, false
	}
	return (float64(mu*iv) + float64(mv*iuv)) / d, (float64(mv*iu) + float64(mu*iuv)) / d, true
}

// stretch sets the tensions of a load that presses the outline somewhere, and
// returns the residual: the error of the equilibrium that the contact cannot
// make good, a moment about the side or vertex in contact.
func (h *heel) stretch(e *elastic, load centred, c heelContact, out []Share) float64 {
	size := 0.0
	for _, p := range h.hull {
		size = max(size, math.Hypot(p[0], p[1]))
	}
	force := math.Sqrt(float64(load.x*load.x)+float64(load.y*load.y)+float64(load.z*load.z)) + math.Hypot(load.mu, load.mv)/size
	residual := 0.0
	// A second pass shares out what rounding of very unequal stiffnesses left.
	for range 2 {
		var z, mu, mv float64
		for i := range out {
			out[i].Tension = max(e.kt[i]*(c.w0+float64(c.a*e.v[i])-float64(c.b*e.u[i])), 0)
			z += out[i].Tension
			mu += float64(e.v[i] * out[i].Tension)
			mv -= float64(e.u[i] * out[i].Tension)
		}
		if force == 0 {
			return 0
		}
		z, mu, mv = load.z-z, load.mu-mu, load.mv-mv
		switch c.kind {
		case heelSideContact:
			s := h.side[c.index]
			rest := float64(z*s.offset) + float64(mu*s.normal[1]) - float64(mv*s.normal[0])
			residual = math.Abs(rest) / (force * size)
			turn := rest / s.second
			c.w0, c.a, c.b = c.w0+float64(turn*s.offset), c.a+float64(turn*s.normal[1]), c.b-float64(turn*s.normal[0])
		case heelVertexContact:
			p := h.hull[c.index]
			mu, mv = mu-float64(z*p[1]), mv+float64(z*p[0])
			residual = max(math.Abs(mu), math.Abs(mv)) / (force * size)
			a, b, _ := h.about(e, p, mu, mv)
			c.a, c.b = c.a+a, c.b+b
			c.w0 = float64(c.b*p[0]) - float64(c.a*p[1])
		}
	}
	return residual
}

// place turns a point of the hull back to the axes of the pattern.
func (e *elastic) place(p [2]float64) (x, y float64) {
	return e.xt + float64(e.cos*p[0]) - float64(e.sin*p[1]), e.yt + float64(e.sin*p[0]) + float64(e.cos*p[1])
}

// caseSteps are the steps from a load case to the tension of fastener i.
func (h *heel) caseSteps(e *elastic, c PatternCase, load centred, i int, share Share) []strength.Working {
	found := h.find(e, load)
	steps := givenLoad(c, "P_x", "P_y", "P_z", "p_x", "p_y", "p_z", "M_ox", "M_oy")
	add := func(symbol string, value float64, unit strength.Unit, equation, source string) {
		step := patternStep(symbol, value, unit, equation, source, strength.Derived)
		steps = append(steps, step)
	}
	k := e.unit
	second := k.Times(strength.Area)
	turn := strength.Force.Over(k).Over(strength.Length)
	equation := ""
	switch found.kind {
	case heelSideContact:
		s := h.side[found.index]
		x, y := e.place(h.hull[found.index])
		nx, ny := float64(e.cos*s.normal[0])-float64(e.sin*s.normal[1]), float64(e.sin*s.normal[0])+float64(e.cos*s.normal[1])
		add("x_h", x, strength.Length, "", "a point of the side of the outline in contact")
		add("y_h", y, strength.Length, "", "a point of the side of the outline in contact")
		add("n_x", nx, strength.None, "", "normal of that side, inward")
		add("n_y", ny, strength.None, "", "normal of that side, inward")
		for j, f := range e.fasteners {
			l := float64(s.normal[0]*e.u[j]) + float64(s.normal[1]*e.v[j]) + s.offset
			step := patternStep("l", l, strength.Length, "n_x (x - x_h) + n_y (y - y_h)", sourceHeel, strength.Derived)
			step.Fastener = f.ID
			steps = append(steps, step)
		}
		moment := float64(load.z*s.offset) + float64(load.mu*s.normal[1]) - float64(load.mv*s.normal[0])
		add("M_h", moment, strength.Moment, "P_z (n_x (p_x - x_h) + n_y (p_y - y_h)) + n_y (M_ox - p_z P_y) - n_x (M_oy + p_z P_x)", "moment about that side")
		add("S", s.second, second, "Σ(k_t l²)", sourceHeel)
		equation = "k_t l M_h / S"
	case heelVertexContact:
		p := h.hull[found.index]
		x, y := e.place(p)
		add("x_h", x, strength.Length, "", "the vertex of the outline in contact")
		add("y_h", y, strength.Length, "", "the vertex of the outline in contact")
		xx, yy, xy := e.second()
		dx, dy := x-e.xt, y-e.yt
		add("I_xx", xx+float64(e.sumT*dy*dy), second, "Σ(k_t (y - y_h)²)", sourceHeel)
		add("I_yy", yy+float64(e.sumT*dx*dx), second, "Σ(k_t (x - x_h)²)", sourceHeel)
		add("I_xy", xy+float64(e.sumT*dx*dy), second, "Σ(k_t (x - x_h) (y - y_h))", sourceHeel)
		mx := float64(e.cos*load.mu) - float64(e.sin*load.mv) - float64(load.z*dy)
		my := float64(e.sin*load.mu) + float64(e.cos*load.mv) + float64(load.z*dx)
		add("M_x", mx, strength.Moment, "M_ox + (p_y - y_h) P_z - p_z P_y", "moment about that vertex")
		add("M_y", my, strength.Moment, "M_oy + p_z P_x - (p_x - x_h) P_z", "moment about that vertex")
		add("a", float64(e.cos*found.a)-float64(e.sin*found.b), turn, "(M_x I_yy + M_y I_xy) / (I_xx I_yy - I_xy²)", sourceHeel)
		add("b", float64(e.sin*found.a)+float64(e.cos*found.b), turn, "(M_y I_xx + M_x I_xy) / (I_xx I_yy - I_xy²)", sourceHeel)
		equation = "k_t (a (y - y_h) - b (x - x_h))"
	case heelFree:
		return e.centroidTension(c, load, i, share)
	}
	source := sourceHeel
	if found.kind == heelShut {
		source = "the load presses the member on everywhere: no fastener is stretched"
	}
	step := patternStep("T", share.Tension, strength.Force, equation, source, strength.Derived)
	step.Fastener = e.fasteners[i].ID
	return append(steps, step)
}

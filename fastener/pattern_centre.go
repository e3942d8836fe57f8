package fastener

import (
	"math"

	"jointledger/strength"
)

// Constants of the load-deformation curve of a bolt in bearing,
// R = R_ult (1 - e^(-10 Δ))^0.55 with Δ in inches, 0.34 in at the farthest.
//
// Source: AISC Steel Construction Manual part 7, instantaneous centre method
// (Crawford and Kulak), 95 % sure from memory.
const (
	curvePower   = 0.55
	curveAtMost  = 3.4 // 10 x 0.34
	farthestMove = 0.34 * 25.4
)

// instantaneous shares a load in plane at ultimate: the member turns about a
// point at which each fastener's force, square to its radius and by the curve of
// its deformation, balances the load. It is found by secant stiffnesses: each
// pass solves the linear pattern whose stiffnesses are R/Δ of the pass before,
// which leaves it in equilibrium throughout.
type instantaneous struct {
	strength []float64 // R_ult, N
	weight   []float64 // secant stiffness of the pass, scratch
	mark     strength.Mark
}

// atUltimate is what one load case comes to.
type atUltimate struct {
	factor float64 // on the load, to its ultimate value
	// The motion of the member at ultimate about the shear centroid: u, v and
	// turn, scaled so that the farthest fastener moves by 1.
	u, v, turn float64
}

// mostPasses bounds the iteration; each pass about halves the error. It is at
// its end when the motion stands still to within stillMotion of the farthest
// fastener's, or, once it nearly does, no longer comes nearer to that.
const (
	mostPasses   = 200
	stillMotion  = 1e-15
	nearlyMotion = 1e-9
)

// find returns the ultimate value of the in-plane part of a load.
func (c *instantaneous) find(e *elastic, load centred) (a atUltimate, ok bool) {
	if load.x == 0 && load.y == 0 && load.mz == 0 {
		return a, false
	}
	copy(c.weight, c.strength)
	var previous atUltimate
	moved := math.Inf(1)
	for range mostPasses {
		u, v, turn := c.solve(e, load)
		most := 0.0
		for i := range c.weight {
			most = max(most, math.Hypot(u-float64(turn*e.y[i]), v+float64(turn*e.x[i])))
		}
		if most == 0 {
			return a, false
		}
		// With weights R/d, d relative to the farthest, the load is carried
		// once it has grown by 1/most.
		a = atUltimate{1 / most, u / most, v / most, turn / most}
		for i := range c.weight {
			d := a.move(e, i)
			c.weight[i] = c.strength[i] * curve(d) / max(d, 1e-12)
		}
		// The factor alone may stand still while the motion does not.
		was := moved
		moved = math.Hypot(a.u-previous.u, a.v-previous.v) + float64(math.Abs(a.turn-previous.turn)*e.reach)
		if moved <= stillMotion || was <= nearlyMotion && moved >= was {
			break
		}
		previous = a
	}
	return a, true
}

// curve is R/R_ult at a part d of the farthest deformation.
func curve(d float64) float64 { return math.Pow(-math.Expm1(-curveAtMost*d), curvePower) }

// move is how far fastener i moves at ultimate, the farthest 1.
func (a atUltimate) move(e *elastic, i int) float64 {
	return math.Hypot(a.u-float64(a.turn*e.y[i]), a.v+float64(a.turn*e.x[i]))
}

// solve returns the motion of the pattern with the present weights.
func (c *instantaneous) solve(e *elastic, load centred) (u, v, turn float64) {
	var sum, mx, my, j float64
	for i, k := range c.weight {
		sum += k
		mx += float64(k * e.x[i])
		my += float64(k * e.y[i])
	}
	mx, my = mx/sum, my/sum
	for i, k := range c.weight {
		dx, dy := e.x[i]-mx, e.y[i]-my
		j += float64(k * (float64(dx*dx) + float64(dy*dy)))
	}
	if j > 0 {
		turn = (load.mz - float64(mx*load.y) + float64(my*load.x)) / j
	}
	return load.x/sum + float64(turn*my), load.y/sum - float64(turn*mx), turn
}

// share sets the shears of a load: those at ultimate, scaled to it.
func (c *instantaneous) share(e *elastic, load centred, out []Share) atUltimate {
	a, ok := c.find(e, load)
	for i := range out {
		out[i].Shear = [2]float64{}
		if !ok {
			continue
		}
		dx, dy := a.u-float64(a.turn*e.y[i]), a.v+float64(a.turn*e.x[i])
		k := c.weight[i] / a.factor
		out[i].Shear = [2]float64{k * dx, k * dy}
	}
	return a
}

// demand is the in-plane resultant of a load; of a moment alone the force that
// it makes at the farthest fastener.
func (c *instantaneous) demand(e *elastic, load centred) float64 {
	if load.x == 0 && load.y == 0 {
		return math.Abs(load.mz) / max(e.reach, math.SmallestNonzeroFloat64)
	}
	return math.Sqrt(float64(load.x*load.x) + float64(load.y*load.y))
}

// staticSteps are each fastener's place and strength, and the centroid that
// places are taken from.
func (c *instantaneous) staticSteps(p *PreparedPattern) []strength.Working {
	steps := p.sharing.shearSteps()
	for i := range p.pattern.Fasteners {
		f := &p.pattern.Fasteners[i]
		if f.Type == nil {
			continue
		}
		for _, s := range f.Type.shear(f.Diameter, f.planes()).steps {
			s.Member, s.Fastener, s.Method = memberPattern, f.ID, methodCentre
			steps = append(steps, s)
		}
	}
	return steps
}

// caseSteps follow a load to the ultimate one: the motion, each fastener's
// force and the sums that balance.
func (c *instantaneous) caseSteps(p *PreparedPattern, i int) []strength.Working {
	e, load, loadCase := p.sharing, p.loads[i], p.cases[i]
	a, ok := c.find(e, load)
	mark := strength.FromMemory(95)
	steps := append(givenLoad(loadCase, "P_x", "P_y", "p_x", "p_y", "M_oz"),
		patternStep("M_z", load.mz, strength.Moment, "M_oz + (p_x - x_c) P_y - (p_y - y_c) P_x", "moment about the centroid", strength.Seen))
	if !ok {
		return steps
	}
	add := func(symbol string, value float64, unit strength.Unit, equation, source, fastener string) {
		step := patternStep(symbol, value, unit, equation, source, mark)
		step.Fastener, step.Method = fastener, methodCentre
		steps = append(steps, step)
	}
	add("δ_0x", a.u*farthestMove, strength.Length, "", "motion of the centroid at ultimate, found by iteration; the sums below balance the load", "")
	add("δ_0y", a.v*farthestMove, strength.Length, "", "the same across", "")
	add("θ", a.turn*farthestMove, strength.None, "", "turn of the member at ultimate, in radians", "")
	var sx, sy, sm float64
	for j, f := range e.fasteners {
		dx, dy := a.u-float64(a.turn*e.y[j]), a.v+float64(a.turn*e.x[j])
		add("δ_x", dx*farthestMove, strength.Length, "δ_0x - θ (y - y_c)", sourceCentre, f.ID)
		add("δ_y", dy*farthestMove, strength.Length, "δ_0y + θ (x - x_c)", sourceCentre, f.ID)
		add("Δ", math.Hypot(dx, dy)*farthestMove, strength.Length, "sqrt(δ_x² + δ_y²)", sourceCentre+"; the farthest moves 0.34 in (8.636 mm), Δ_max", f.ID)
		r := c.strength[j] * curve(math.Hypot(dx, dy))
		add("R_f", r, strength.Force, "V_u (1 - exp(-3.4 Δ/Δ_max))^0.55", sourceCentre, f.ID)
		k := c.weight[j]
		sx, sy = sx+float64(k*dx), sy+float64(k*dy)
		sm += float64(e.x[j]*k*dy) - float64(e.y[j]*k*dx)
	}
	add("Δ_max", farthestMove, strength.Length, "", "AISC Manual part 7: 0.34 in", "")
	add("R_x", sx, strength.Force, "Σ(R_f δ_x/Δ)", "sum over the fasteners", "")
	add("R_y", sy, strength.Force, "Σ(R_f δ_y/Δ)", "sum over the fasteners", "")
	add("M_R", sm, strength.Moment, "Σ(R_f ((x - x_c) δ_y - (y - y_c) δ_x)/Δ)", "sum over the fasteners, about the centroid", "")
	equation := "sqrt((R_x² + R_y²) / (P_x² + P_y²))"
	if load.x == 0 && load.y == 0 {
		equation = "M_R / M_z"
	}
	add("λ_P", a.factor, strength.None, equation, "the factor on the load at which the farthest fastener has moved 0.34 in", "")
	return steps
}

// centreCheck is the pattern as a whole at ultimate, by its instantaneous centre.
type centreCheck struct {
	place
	why *strength.Message
}

// addCentre adds the check of the pattern as a whole.
func (p *PreparedPattern) addCentre() {
	c := &instantaneous{strength: make([]float64, len(p.pattern.Fasteners)), weight: make([]float64, len(p.pattern.Fasteners))}
	p.centre = c
	mark := strength.Weakest(strength.Seen, strength.FromMemory(95), p.sharing.mark)
	var why strength.Message
	for i := range p.pattern.Fasteners {
		f := &p.pattern.Fasteners[i]
		if f.Type == nil {
			why = strength.Say("fastener %q has no type, so its shear strength is not known", f.ID)
		} else if shear := f.Type.shear(f.Diameter, f.planes()); !shear.why.Empty() {
			why = shear.why
		} else {
			c.strength[i] = shear.value
			mark = strength.Weakest(mark, shear.mark())
		}
	}
	c.mark = mark
	if !why.Empty() {
		p.centre = nil
	}
	check := strength.Check{
		Member: memberPattern, Mode: strength.Shear, Level: strength.Ultimate, Unit: strength.Force,
		Method: methodCentre, Source: sourceCentre, Mark: mark,
	}
	at := p.place(0, check, safety{})
	at.c.Fastener = ""
	p.assessments = append(p.assessments, &centreCheck{at, reason(why)})
}

func (a *centreCheck) margin(c *caseState) strength.Margin {
	load := a.p.loads[c.index]
	if load.x == 0 && load.y == 0 && load.mz == 0 {
		return strength.Margin{}
	}
	if a.why != nil {
		return strength.Unknown(a.why)
	}
	demand := a.p.centre.demand(a.p.sharing, load)
	return strength.Compare(demand*a.factor[c.level], c.ultimate.factor*demand)
}

func (a *centreCheck) steps() []strength.Working {
	if a.why != nil {
		return a.p.sharing.shearSteps()
	}
	return a.p.centre.staticSteps(a.p)
}

func (a *centreCheck) caseSteps(c *caseState, i int) []strength.Working {
	if a.why != nil {
		return nil
	}
	e, load := a.p.sharing, a.p.loads[i]
	steps := a.p.centre.caseSteps(a.p, i)
	demand := a.p.centre.demand(e, load)
	equation, source := "sqrt(P_x² + P_y²)", "in-plane resultant"
	if load.x == 0 && load.y == 0 {
		steps = append(steps, patternStep("r_max", e.reach, strength.Length, "", "distance of the farthest fastener from the centroid", strength.Derived))
		equation, source = "max(M_z, -M_z) / r_max", "a moment alone, as the force that it makes at the farthest fastener"
	}
	steps = append(steps, patternStep("P", demand, strength.Force, equation, source, strength.Derived),
		patternStep("P_u", c.ultimate.factor*demand, strength.Force, "λ_P P", sourceCentre, strength.FromMemory(95)))
	return append(steps, a.demandSteps(c, "P", demand, "P_u", a.margin(c))...)
}

// shearMark is the weakest mark of the steps to the shears at a level.
func (p *PreparedPattern) shearMark(level strength.Level) strength.Mark {
	switch {
	case p.centre != nil && level == strength.Ultimate:
		return p.centre.mark
	case p.sharing.slots != nil:
		return strength.Weakest(strength.Derived, p.sharing.mark)
	}
	return strength.Weakest(strength.Seen, p.sharing.mark)
}

// shearSteps are the static steps to the shears that checks at a level take.
func (p *PreparedPattern) shearSteps(level strength.Level) []strength.Working {
	if p.centre != nil && level == strength.Ultimate {
		return p.centre.staticSteps(p)
	}
	return p.sharing.shearSteps()
}

// shearCaseSteps are the steps from load case i to the shear of a fastener in
// checks at a level.
func (p *PreparedPattern) shearCaseSteps(c *caseState, i int, level strength.Level, fastener int) []strength.Working {
	share := c.shares[level][fastener]
	if p.centre == nil || level != strength.Ultimate {
		return p.sharing.shearCaseSteps(p.cases[i], p.loads[i], fastener, share)
	}
	steps := p.centre.caseSteps(p, i)
	id, mark, moved := p.pattern.Fasteners[fastener].ID, strength.FromMemory(95), share.Resultant > 0
	for _, s := range []struct {
		symbol, equation string
		value            float64
	}{
		{"V_x", "R_f δ_x / (Δ λ_P)", share.Shear[0]},
		{"V_y", "R_f δ_y / (Δ λ_P)", share.Shear[1]},
		{"V", "R_f / λ_P", share.Resultant},
	} {
		if !moved {
			s.equation = "" // at the centre itself
		}
		step := patternStep(s.symbol, s.value, strength.Force, s.equation, "share at ultimate, scaled to the load", mark)
		step.Fastener = id
		steps = append(steps, step)
	}
	return steps
}

// allShearCaseSteps are the steps to the shears of every fastener.
func (p *PreparedPattern) allShearCaseSteps(c *caseState, i int, level strength.Level) []strength.Working {
	steps := p.shearCaseSteps(c, i, level, 0)
	for j := 1; j < len(p.pattern.Fasteners); j++ {
		own := p.shearCaseSteps(c, i, level, j)
		steps = append(steps, own[len(own)-3:]...) // V_x, V_y and V
	}
	return steps
}

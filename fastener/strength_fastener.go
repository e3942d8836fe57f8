package fastener

import "jointledger/strength"

// demands are the multipliers of a load for one check, by the level at which
// the load is given.
type demands [strength.Ultimate + 1]strength.Demand

func (p *PreparedPattern) demands(c strength.Check, safety strength.Safety, applySpecial bool) (d demands) {
	for _, given := range []strength.Level{strength.Limit, strength.Ultimate} {
		d[given] = p.factors.Demand(c, given, safety, applySpecial)
	}
	return d
}

// place is what the assessments of a pattern have in common.
type place struct {
	p       *PreparedPattern
	c       strength.Check
	i       int // the fastener
	demands demands
	factor  [strength.Ultimate + 1]float64
}

// place makes the place of a check at fastener i whose allowable is an
// unfactored strength.
func (p *PreparedPattern) place(i int, c strength.Check) place {
	return p.placeBy(i, c, strength.ByRegulation, false)
}

// placeBy is place for an allowable of another safety.
func (p *PreparedPattern) placeBy(i int, c strength.Check, safety strength.Safety, applySpecial bool) place {
	c.Fastener = p.pattern.Fasteners[i].ID
	at := place{p: p, c: c, i: i, demands: p.demands(c, safety, applySpecial)}
	for level, d := range at.demands {
		at.factor[level] = d.Factor()
	}
	return at
}

func (a *place) check() strength.Check { return a.c }

// demandSteps write a demand from the load of the given symbol, and the margin
// against the allowable of the given symbol.
func (a *place) demandSteps(c *caseState, symbol string, load float64, capacity string, m strength.Margin) []strength.Working {
	steps := a.demands[c.level].Workings(strength.Working{}, a.p.factors, symbol, load*a.factor[c.level], strength.Force)
	return append(steps, marginStep(m, capacity)...)
}

func marginStep(m strength.Margin, capacity string) []strength.Working {
	if m.Status != strength.Adequate && m.Status != strength.Inadequate {
		return nil
	}
	return []strength.Working{{Symbol: "MS", Value: m.Margin, Equation: capacity + " / demand - 1", Source: "margin of safety", Mark: strength.Given}}
}

// compare is strength.Compare for an allowable that may be unknown.
func compare(demand, allowable float64, why *strength.Message) strength.Margin {
	if why == nil {
		return strength.Compare(demand, allowable)
	}
	if demand > 0 {
		return strength.Unknown(why)
	}
	return strength.Margin{}
}

// reason makes the pointer of an undetermined check, nil where there is a value.
func reason(why strength.Message) *strength.Message {
	if why.Empty() {
		return nil
	}
	return &why
}

// shearCheck is a fastener in shear over its planes.
type shearCheck struct {
	place
	capacity float64
	why      *strength.Message
}

// tensionCheck is a fastener in tension.
type tensionCheck struct {
	place
	capacity float64
	why      *strength.Message
}

// interactionCheck is a fastener in shear and tension together.
type interactionCheck struct {
	place
	curve          interaction
	shear, tension float64
	why            *strength.Message
}

// addFastenerStrength adds the checks of fastener i itself.
func (p *PreparedPattern) addFastenerStrength(i int) {
	f := &p.pattern.Fasteners[i]
	if f.Type == nil {
		return
	}
	shear, tension := f.Type.shear(f.Diameter, f.planes()), f.Type.tension(f.Diameter)
	check := strength.Check{Member: memberFastener, Level: strength.Ultimate, Unit: strength.Force}

	check.Mode, check.Method, check.Source = strength.Shear, methodShear, sourceShear
	check.Mark = strength.Weakest(p.shearMark(check.Level), shear.mark())
	if p.pattern.InPlane != inPlaneCentre {
		p.assessments = append(p.assessments, &shearCheck{p.place(i, check), shear.value, reason(shear.why)})
	}

	check.Mode, check.Method, check.Source = strength.Tension, methodTension, sourceTension
	check.Mark = strength.Weakest(strength.Derived, tension.mark())
	p.assessments = append(p.assessments, &tensionCheck{p.place(i, check), tension.value, reason(tension.why)})

	curve, ok := interactions[p.pattern.Interaction]
	if !ok {
		return
	}
	why := shear.why
	if why.Empty() {
		why = tension.why
	}
	check.Mode, check.Unit, check.Method, check.Source = strength.ShearTension, strength.None, curve.method, curve.source
	check.Mark = strength.Weakest(strength.Derived, p.shearMark(check.Level), curve.mark, shear.mark(), tension.mark())
	p.assessments = append(p.assessments, &interactionCheck{p.place(i, check), curve, shear.value, tension.value, reason(why)})
}

// planes is the number of shear planes, 1 where none was given.
func (f *Fastener) planes() int { return max(f.ShearPlanes, 1) }

func (a *shearCheck) margin(c *caseState) strength.Margin {
	return compare(c.shares[a.c.Level][a.i].Resultant*a.factor[c.level], a.capacity, a.why)
}

func (a *shearCheck) steps() []strength.Working {
	f := &a.p.pattern.Fasteners[a.i]
	return append(a.p.shearSteps(a.c.Level), f.Type.shear(f.Diameter, f.planes()).steps...)
}

func (a *shearCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := c.shares[a.c.Level][a.i]
	return append(a.p.shearCaseSteps(c, i, a.c.Level, a.i),
		a.demandSteps(c, "V", share.Resultant, "V_u", a.margin(c))...)
}

func (a *tensionCheck) margin(c *caseState) strength.Margin {
	return compare(max(c.shares[a.c.Level][a.i].Tension, 0)*a.factor[c.level], a.capacity, a.why)
}

func (a *tensionCheck) steps() []strength.Working {
	f := &a.p.pattern.Fasteners[a.i]
	return append(a.p.sharing.tensionSteps(), f.Type.tension(f.Diameter).steps...)
}

func (a *tensionCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := c.shares[a.c.Level][a.i]
	return append(a.p.sharing.tensionCaseSteps(a.p.cases[i], a.p.loads[i], a.i, share),
		a.demandSteps(c, "T_p", max(share.Tension, 0), "T_u", a.margin(c))...)
}

// ratios are the demands over the allowables.
func (a *interactionCheck) ratios(c *caseState) (s, t float64) {
	share := &c.shares[a.c.Level][a.i]
	factor := a.factor[c.level]
	return share.Resultant * factor / a.shear, max(share.Tension, 0) * factor / a.tension
}

// margin is exercised by shear and tension together; either alone has its own
// check.
func (a *interactionCheck) margin(c *caseState) strength.Margin {
	share := &c.shares[a.c.Level][a.i]
	if !(share.Resultant > 0 && share.Tension > 0) {
		return strength.Margin{}
	}
	if a.why != nil {
		return strength.Unknown(a.why)
	}
	return strength.Compare(1, a.curve.reach(a.ratios(c)))
}

func (a *interactionCheck) steps() []strength.Working {
	f := &a.p.pattern.Fasteners[a.i]
	steps := append(a.p.shearSteps(a.c.Level), a.p.sharing.tensionSteps()...)
	steps = append(steps, f.Type.shear(f.Diameter, f.planes()).steps...)
	return append(steps, f.Type.tension(f.Diameter).steps...)
}

func (a *interactionCheck) caseSteps(c *caseState, i int) []strength.Working {
	share, load, loadCase := c.shares[a.c.Level][a.i], a.p.loads[i], a.p.cases[i]
	steps := append(a.p.shearCaseSteps(c, i, a.c.Level, a.i), a.p.sharing.tensionCaseSteps(loadCase, load, a.i, share)...)
	if a.why != nil {
		return steps
	}
	// The demand that Workings writes last is replaced by the two ratios.
	factors := func(symbol string) (steps []strength.Working, equation string) {
		steps = a.demands[c.level].Workings(strength.Working{}, a.p.factors, symbol, 0, strength.Force)
		last := len(steps) - 1
		return steps[:last], steps[last].Equation
	}
	names, shearDemand := factors("V")
	_, tensionDemand := factors("T_p")
	s, t := a.ratios(c)
	add := func(symbol string, value float64, equation, source string, mark strength.Mark) {
		names = append(names, strength.Working{Symbol: symbol, Value: value, Equation: equation, Source: source, Mark: mark})
	}
	add("R_s", s, shearDemand+" / V_u", "shear demand over its allowable", strength.Derived)
	add("R_t", t, tensionDemand+" / T_u", "tension demand over its allowable", strength.Derived)
	add("R", a.curve.value(s, t), a.curve.equation, a.curve.source, a.curve.mark)
	m := a.margin(c)
	add("demand", 1, "", "a combined check: the load as it is", strength.Given)
	add("λ", m.Allowable, a.curve.reachEquation, "the factor on the load that reaches the curve", strength.Derived)
	return append(append(steps, names...), marginStep(m, "λ")...)
}

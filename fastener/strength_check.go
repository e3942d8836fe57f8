package fastener

import "jointledger/strength"

// demands are the multipliers of a load for one check, by the level at which
// the load is given.
type demands [strength.Ultimate + 1]strength.Demand

// safety is whose factors of safety an allowable is meant to meet; the zero one
// is an unfactored strength.
type safety struct {
	kind         strength.Safety
	applySpecial bool
}

// place is what the assessments of a pattern have in common. What a margin
// reads stands together, what only workings read apart from it.
type place struct {
	i       int // the fastener
	level   strength.Level
	factor  [strength.Ultimate + 1]float64
	p       *PreparedPattern
	c       *strength.Check
	demands *demands
}

// place makes the place of a check at fastener i.
func (p *PreparedPattern) place(i int, c strength.Check, s safety) place {
	c.Fastener = p.pattern.Fasteners[i].ID
	at := place{p: p, c: &c, i: i, level: c.Level, demands: &demands{}}
	for _, given := range []strength.Level{strength.Limit, strength.Ultimate} {
		at.demands[given] = p.factors.Demand(&c, given, s.kind, s.applySpecial)
		at.factor[given] = at.demands[given].Factor()
	}
	return at
}

func (a *place) check() strength.Check { return *a.c }

// shareOf is the fastener's share that the check takes.
func (a *place) shareOf(c *caseState) *Share { return &c.shares[a.level][a.i] }

// demandSteps write a demand from the load of the given symbol, and the margin
// against the allowable of the given symbol.
func (a *place) demandSteps(c *caseState, symbol string, load float64, capacity string, m strength.Margin) []strength.Working {
	steps := a.demands[c.level].Workings(nil, strength.Working{}, a.p.factors, symbol, load*a.factor[c.level], a.c.Unit)
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

// loading is the part of a fastener's share that a check compares.
type loading uint8

const (
	byShear   loading = iota // V
	byTension                // T_p, never negative
	byBearing                // P_b = ψ V, the part that one plate bears
)

// fixedCheck compares a part of a fastener's share with an allowable that no
// load case changes; resistance works that out again for its steps.
type fixedCheck struct {
	place
	loading    loading
	plate      int     // of byBearing
	part       float64 // of the share
	capacity   float64
	symbol     string
	why        *strength.Message
	resistance func() allowable
}

// addFixed adds a check of an allowable whose last step is the allowable.
func (p *PreparedPattern) addFixed(i int, check strength.Check, on loading, plate int, s safety, resistance func() allowable) {
	a := resistance()
	if on == byTension {
		check.Mark = strength.Weakest(strength.Derived, a.mark())
	} else {
		check.Mark = strength.Weakest(p.shearMark(check.Level), a.mark())
	}
	fixed := &fixedCheck{place: p.place(i, check, s), loading: on, plate: plate, part: 1, capacity: a.value, why: reason(a.why), resistance: resistance}
	if on == byBearing {
		fixed.part = p.loadShare(i, plate)
	}
	if fixed.why == nil {
		fixed.symbol = a.steps[len(a.steps)-1].Symbol
	}
	p.assessments = append(p.assessments, fixed)
}

// load is the part of the share that the check compares.
func (a *fixedCheck) load(c *caseState) float64 {
	if a.loading == byTension {
		return max(a.shareOf(c).Tension, 0)
	}
	return a.shareOf(c).Resultant * a.part
}

func (a *fixedCheck) margin(c *caseState) strength.Margin {
	return compare(a.load(c)*a.factor[c.level], a.capacity, a.why)
}

func (a *fixedCheck) steps() []strength.Working {
	r := a.resistance()
	switch a.loading {
	case byTension:
		return append(a.p.sharing.tensionSteps(), r.steps...)
	case byBearing:
		a.p.shareStep(&r, a.i, a.plate)
	}
	return append(a.p.shearSteps(a.c.Level), r.steps...)
}

func (a *fixedCheck) caseSteps(c *caseState, i int) []strength.Working {
	var steps []strength.Working
	symbol, load := "V", a.load(c)
	switch a.loading {
	case byTension:
		symbol = "T_p"
		steps = a.p.sharing.tensionCaseSteps(a.p.cases[i], a.p.loads[i], a.i, *a.shareOf(c))
	case byBearing:
		symbol = "P_b"
		steps = append(a.p.shearCaseSteps(c, i, a.c.Level, a.i), bearingLoadStep(load))
	default:
		steps = a.p.shearCaseSteps(c, i, a.c.Level, a.i)
	}
	return append(steps, a.demandSteps(c, symbol, load, a.symbol, a.margin(c))...)
}

// bearingLoadStep is the load of one plate at a fastener.
func bearingLoadStep(load float64) strength.Working {
	return strength.Working{Symbol: "P_b", Value: load, Unit: strength.Force, Equation: "ψ V", Source: "load of this plate"}
}

// shareStep writes ψ, the part of a fastener's load that plate k bears.
func (p *PreparedPattern) shareStep(a *allowable, i, k int) {
	share, source := p.loadShare(i, k), "input: plates.load_share"
	if p.pattern.Plates[k].LoadShare == 0 {
		source = "the whole load of the fastener"
		if share < 1 {
			source = "an outer plate of a joint in double shear"
		}
	}
	a.add("ψ", share, strength.None, "", source, strength.Given)
}

// loadShare is the part of a fastener's load that a plate bears.
func (p *PreparedPattern) loadShare(i, k int) float64 {
	switch plate := &p.pattern.Plates[k]; {
	case plate.LoadShare > 0:
		return plate.LoadShare
	case k > 0 && p.pattern.Fasteners[i].planes() == 2:
		return 0.5
	}
	return 1
}

// interactionCheck is a fastener in shear and tension together.
type interactionCheck struct {
	place
	curve          interaction
	shear, tension float64
	names          [2]string // of the allowables
	why            *strength.Message
	resistance     func() (shear, tension allowable)
}

// addInteraction adds the combined check of fastener i.
func (p *PreparedPattern) addInteraction(i int, curve interaction, method string, level strength.Level, sf safety, resistance func() (shear, tension allowable)) {
	shear, tension := resistance()
	why := shear.why
	if why.Empty() {
		why = tension.why
	}
	check := strength.Check{
		Member: memberFastener, Mode: strength.ShearTension, Level: level, Unit: strength.None, Method: method, Source: curve.source,
		Mark: strength.Weakest(strength.Derived, p.shearMark(level), curve.mark, shear.mark(), tension.mark()),
	}
	a := &interactionCheck{
		place: p.place(i, check, sf), curve: curve, shear: shear.value, tension: tension.value, why: reason(why), resistance: resistance,
	}
	if a.why == nil {
		a.names = [2]string{shear.steps[len(shear.steps)-1].Symbol, tension.steps[len(tension.steps)-1].Symbol}
	}
	p.assessments = append(p.assessments, a)
}

// ratios are the demands over the allowables.
func (a *interactionCheck) ratios(c *caseState) (s, t float64) {
	share, factor := a.shareOf(c), a.factor[c.level]
	return share.Resultant * factor / a.shear, max(share.Tension, 0) * factor / a.tension
}

// margin is exercised by shear and tension together; either alone has its own
// check.
func (a *interactionCheck) margin(c *caseState) strength.Margin {
	if share := a.shareOf(c); !(share.Resultant > 0 && share.Tension > 0) {
		return strength.Margin{}
	}
	if a.why != nil {
		return strength.Unknown(a.why)
	}
	return strength.Compare(1, a.curve.reach(a.ratios(c)))
}

func (a *interactionCheck) steps() []strength.Working {
	shear, tension := a.resistance()
	steps := append(a.p.shearSteps(a.c.Level), a.p.sharing.tensionSteps()...)
	return append(append(steps, shear.steps...), tension.steps...)
}

func (a *interactionCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := a.shareOf(c)
	steps := append(a.p.shearCaseSteps(c, i, a.c.Level, a.i), a.p.sharing.tensionCaseSteps(a.p.cases[i], a.p.loads[i], a.i, *share)...)
	if a.why != nil {
		return steps
	}
	// The demand that Workings writes last is replaced by the two ratios.
	factors := func(symbol string) (steps []strength.Working, equation string) {
		steps = a.demands[c.level].Workings(nil, strength.Working{}, a.p.factors, symbol, 0, strength.Force)
		last := len(steps) - 1
		return steps[:last], steps[last].Equation
	}
	names, shearDemand := factors("V")
	_, tensionDemand := factors("T_p")
	s, t := a.ratios(c)
	add := func(symbol string, value float64, equation, source string, mark strength.Mark) {
		names = append(names, strength.Working{Symbol: symbol, Value: value, Equation: equation, Source: source, Mark: mark})
	}
	add("R_s", s, shearDemand+" / "+a.names[0], "shear demand over its allowable", strength.Derived)
	add("R_t", t, tensionDemand+" / "+a.names[1], "tension demand over its allowable", strength.Derived)
	add("R", a.curve.value(s, t), a.curve.equation, a.curve.source, a.curve.mark)
	m := a.margin(c)
	add("demand", 1, "", "a combined check: the load as it is", strength.Given)
	add("λ", m.Allowable, a.curve.reachEquation, "the factor on the load that reaches the curve", strength.Derived)
	return append(append(steps, names...), marginStep(m, "λ")...)
}

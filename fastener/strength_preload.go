package fastener

import (
	"math"

	"jointledger/strength"
)

// Preload is what is known of a bolt's tightening. A value of zero is its
// default.
type Preload struct {
	// Nominal is the mean initial preload in N; else Torque in N·mm over
	// NutFactor times the diameter.
	Nominal, Torque, NutFactor float64
	Scatter                    float64 // of the preload, a fraction: 0.35 is ±35 %
	Relaxation                 float64 // of the least preload lost, a fraction
	ThermalGain, ThermalLoss   float64 // N, most that temperature adds and takes
	LoadingPlane               float64 // n, 1
	StiffnessRatio             float64 // φ, bolt over bolt and members, 1
	SeparationFactor           float64 // 1
	Friction                   float64 // of the faying surfaces; 0: no slip check
	SlipFactor                 float64 // 1
}

const sourcePreload = "NASA-STD-5020, NASA TM-106943: preload, separation and bolt load"

func orOne(x float64) float64 {
	if x == 0 {
		return 1
	}
	return x
}

// addExtremes writes the least and the most preload in N.
//
// Source: NASA TM-106943 (torque P = T/(K d), scatter ±Γ), seen in part.
func (b *Preload) addExtremes(a *allowable, d float64) (least, most float64) {
	const given = "input: type.preload"
	mark := strength.FromMemory(90)
	nominal := b.Nominal
	if nominal > 0 {
		a.add("P_i", nominal, strength.Force, "", given, strength.Given)
	} else {
		nominal = b.Torque / (b.NutFactor * d)
		a.add("T_q", b.Torque, strength.Moment, "", given, strength.Given)
		a.add("K_n", b.NutFactor, strength.None, "", given, strength.Given)
		a.add("D", d, strength.Length, "", "input: fasteners.diameter", strength.Given)
		a.add("P_i", nominal, strength.Force, "T_q / (K_n D)", sourcePreload, mark)
	}
	a.add("Γ", b.Scatter, strength.None, "", given, strength.Given)
	a.add("ρ", b.Relaxation, strength.None, "", given, strength.Given)
	a.add("P_tg", b.ThermalGain, strength.Force, "", given, strength.Given)
	a.add("P_tl", b.ThermalLoss, strength.Force, "", given, strength.Given)
	most = float64((1+b.Scatter)*nominal) + b.ThermalGain
	least = max(float64((1-b.Scatter)*(1-b.Relaxation)*nominal)-b.ThermalLoss, 0)
	a.add("P_0max", most, strength.Force, "(1 + Γ) P_i + P_tg", sourcePreload, mark)
	a.add("P_0min", least, strength.Force, "max((1 - Γ) (1 - ρ) P_i - P_tl, 0)", sourcePreload, mark)
	return least, most
}

// tension returns the applied tension in N that breaks a preloaded bolt of
// strength ultimate: that strength where the joint separates first, after which
// the bolt bears the load alone; else what is left of it over n φ.
func (b *Preload) tension(ultimate allowable, d float64) allowable {
	a := ultimate
	if !a.why.Empty() {
		return a
	}
	_, most := b.addExtremes(&a, d)
	n, phi := orOne(b.LoadingPlane), orOne(b.StiffnessRatio)
	a.add("n_p", n, strength.None, "", "input: type.preload, 1 where not given", strength.Given)
	a.add("φ", phi, strength.None, "", "input: type.preload, 1 where not given", strength.Given)
	mark := strength.FromMemory(90)
	left := max(a.value-most, 0) / (n * phi)
	separation := math.Inf(1)
	if n*phi < 1 {
		separation = most / (1 - float64(n*phi))
		a.add("P_sep", separation, strength.Force, "P_0max / (1 - n_p φ)", "load at which the joint separates", mark)
	}
	if separation <= a.value {
		a.add("T_pu", a.value, strength.Force, "T_u", "P_sep <= T_u: separation comes before rupture, so preload does not count", mark)
		return a
	}
	a.value = left
	a.add("T_pu", left, strength.Force, "max(T_u - P_0max, 0) / (n_p φ)", "rupture comes before separation", mark)
	return a
}

// separation returns the tension in N at which the joint opens.
func (b *Preload) separation(d float64) (a allowable) {
	least, _ := b.addExtremes(&a, d)
	factor := orOne(b.SeparationFactor)
	a.add("FS_sep", factor, strength.None, "", "input: type.preload, 1 where not given", strength.Given)
	a.value = least / factor
	a.add("P_so", a.value, strength.Force, "P_0min / FS_sep", sourcePreload, strength.FromMemory(90))
	return a
}

// slipCheck is the friction of one fastener's clamping against its shear, the
// tension taking clamping away: the allowable is the shear at which it slips
// when shear and tension grow together.
type slipCheck struct {
	place
	least float64
}

// addPreload adds the checks of fastener i that preload makes.
func (p *PreparedPattern) addPreload(i int) {
	f := &p.pattern.Fasteners[i]
	b := f.Type.Preload
	if b == nil {
		return
	}
	check := strength.Check{Member: memberFastener, Unit: strength.Force, Method: methodPreload, Source: sourcePreload}
	check.Mode, check.Level = strength.Tension, strength.Ultimate
	p.addFixed(i, check, byTension, 0, safety{}, func() allowable { return b.tension(f.Type.tension(f.Diameter), f.Diameter) })
	if b.Friction > 0 {
		check.Mode, check.Level = strength.Slip, strength.Limit
		var a allowable
		least, _ := b.addExtremes(&a, f.Diameter)
		check.Mark = strength.Weakest(strength.Derived, p.shearMark(strength.Limit), a.mark())
		p.assessments = append(p.assessments, &slipCheck{p.place(i, check, safety{}), least})
	}
	check.Mode, check.Level = strength.Separation, strength.Limit
	p.addFixed(i, check, byTension, 0, safety{}, func() allowable { return b.separation(f.Diameter) })
}

func (a *slipCheck) preload() *Preload { return a.p.pattern.Fasteners[a.i].Type.Preload }

// limit is the shear at which the fastener slips; without an external tension
// or with one, growing together.
func (a *slipCheck) limit(s *Share) float64 {
	b := a.preload()
	grip := b.Friction * float64(a.p.pattern.Fasteners[a.i].planes()) / orOne(b.SlipFactor)
	loss := max(s.Tension, 0) * max(1-float64(orOne(b.LoadingPlane)*orOne(b.StiffnessRatio)), 0)
	return grip * a.least * s.Resultant / (s.Resultant + float64(grip*loss))
}

func (a *slipCheck) margin(c *caseState) strength.Margin {
	s := a.shareOf(c)
	if !(s.Resultant > 0) {
		return strength.Margin{}
	}
	return strength.Compare(s.Resultant*a.factor[c.level], a.limit(s))
}

func (a *slipCheck) steps() []strength.Working {
	var s allowable
	b, f := a.preload(), &a.p.pattern.Fasteners[a.i]
	b.addExtremes(&s, f.Diameter)
	const given = "input: type.preload, 1 where not given"
	s.add("n", float64(f.planes()), strength.None, "", "input: fasteners.shear_planes", strength.Given)
	s.add("μ", b.Friction, strength.None, "", "input: type.preload", strength.Given)
	s.add("FS_slip", orOne(b.SlipFactor), strength.None, "", given, strength.Given)
	s.add("n_p", orOne(b.LoadingPlane), strength.None, "", given, strength.Given)
	s.add("φ", orOne(b.StiffnessRatio), strength.None, "", given, strength.Given)
	return append(append(a.p.shearSteps(a.c.Level), a.p.sharing.tensionSteps()...), s.steps...)
}

func (a *slipCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := a.shareOf(c)
	steps := append(a.p.shearCaseSteps(c, i, a.c.Level, a.i), a.p.sharing.tensionCaseSteps(a.p.cases[i], a.p.loads[i], a.i, *share)...)
	if !(share.Resultant > 0) {
		return steps
	}
	steps = append(steps, strength.Working{
		Symbol: "V_slip", Value: a.limit(share), Unit: strength.Force, Mark: strength.Derived,
		Equation: "n μ/FS_slip P_0min V / (V + n μ/FS_slip max(1 - n_p φ, 0) T_p)",
		Source:   "friction of what clamping is left, shear and tension growing together",
	})
	return append(steps, a.demandSteps(c, "V", share.Resultant, "V_slip", a.margin(c))...)
}

package lug

import (
	"math"

	"jointledger/strength"
)

// The pin of a joint in double shear, of which each leg of the clevis is lug 1
// and the lug is lug 2. Written for the share λ of the load in the leg that has
// more: with λ = 1/2 each equation is the published one.

const (
	pinShearFactor   = 1.571  // 2 π/4 as the manual prints it
	pinBendingFactor = 0.1963 // 2 π/32 as the manual prints it
	tangPlastic      = 1.4    // k_bT of the outer tang
	ductilePin       = 1.56   // k_b of a reasonably ductile pin
)

var (
	eqPus      = Equation{Number: "9-12", Symbol: "P_us", Text: "1.571 (Dp^2 - dp^2) F_su / (2 λ)", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(97)}
	eqPub      = Equation{Number: "9-13", Symbol: "P_ub", Text: "0.1963 k_b (Dp^4 - dp^4) F_tu / (2 m Dp)", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(97)}
	eqPyb      = Equation{Symbol: "P_yb", Text: "F_ty Z_p / m", Unit: strength.Force, Source: "text-book strength of materials: a pin in bending, elastic at limit over the whole thicknesses", Mark: strength.Derived}
	eqPulb1    = Equation{Number: "9-10", Symbol: "P_u.LB1", Text: "min(P_u.L, P_u.B)", Unit: strength.Force, Source: affdlSource + ": one leg of the clevis", Mark: strength.FromMemory(95)}
	eqPulb2    = Equation{Number: "9-10", Symbol: "P_u.LB2", Text: "min(P_u.L, P_u.B)", Unit: strength.Force, Source: affdlSource + ": the lug", Mark: strength.FromMemory(95)}
	eqPulb     = Equation{Number: "9-11", Symbol: "P_u.LB", Text: "min(P_u.LB1 / λ, P_u.LB2)", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqWeak     = Equation{Number: "9-14", Symbol: "C", Text: "P_u.LB1 P_u.LB2 / (P_u.LB1 t2 + P_u.LB2 t1)", Unit: strength.Stiffness, Source: affdlSource + ", weak pin", Mark: strength.FromMemory(92)}
	eqPubMax   = Equation{Number: "9-15", Symbol: "P_ub,max", Text: "(C / λ) (sqrt(2 P_ub m / C + g^2) - g)", Unit: strength.Force, Source: affdlSource + ", weak pin", Mark: strength.FromMemory(92)}
	eqActive1  = Equation{Number: "9-17", Symbol: "b1", Text: "λ P_ub,max t1 / P_u.LB1", Unit: strength.Length, Source: affdlSource + ", active thickness of the legs", Mark: strength.FromMemory(92)}
	eqActive2  = Equation{Number: "9-17", Symbol: "2b2", Text: "P_ub,max t2 / P_u.LB2", Unit: strength.Length, Source: affdlSource + ", active thickness of the lug", Mark: strength.FromMemory(92)}
	eqTangWeak = Equation{Number: "9-21", Symbol: "P_t", Text: "P_tw / (1 + (3 / k_bT) (1 - min(b1 / t1, 1)))", Unit: strength.Force, Source: affdlSource + ", outer tang with a weak pin", Mark: strength.FromMemory(92)}
	eqTangK    = Equation{Symbol: "k_bT", Text: "1.4", Unit: strength.None, Source: affdlSource + ", plastic bending of the tang", Mark: strength.FromMemory(92)}
	eqStrong   = Equation{Symbol: "P_all", Text: "min(P_u.LB, P_us, P_tangs)", Unit: strength.Force, Source: affdlSource + ", strong pin: P_ub reaches P_u.LB or P_us", Mark: strength.FromMemory(92)}
	eqWeakAll  = Equation{Symbol: "P_all", Text: "min(P_u.LB, P_us, P_ub,max, P_tangs)", Unit: strength.Force, Source: affdlSource + ", weak pin; where b1 or 2b2 would exceed its thickness that lug is fully active and P_u.LB governs", Mark: strength.FromMemory(92)}
	eqTang1    = Equation{Symbol: "P_t1", Text: "P_t", Unit: strength.Force, Source: affdlSource + ": one leg of the clevis", Mark: strength.FromMemory(92)}
	eqTang2    = Equation{Symbol: "P_t2", Text: "P_t", Unit: strength.Force, Source: affdlSource + ": the lug", Mark: strength.FromMemory(92)}
	eqTangs    = Equation{Symbol: "P_tangs", Text: "min(P_t1 / λ, P_t2) / cosα", Unit: strength.Force, Source: affdlSource + ", tangs under the axial part of a pull", Mark: strength.FromMemory(92)}
	eqNoTangs  = Equation{Symbol: "P_all", Text: "min(P_u.LB, P_us)", Unit: strength.Force, Source: affdlSource + ", strong pin: P_ub reaches P_u.LB or P_us", Mark: strength.FromMemory(92)}
	eqWeakNo   = Equation{Symbol: "P_all", Text: "min(P_u.LB, P_us, P_ub,max)", Unit: strength.Force, Source: affdlSource + ", weak pin; where b1 or 2b2 would exceed its thickness that lug is fully active and P_u.LB governs", Mark: strength.FromMemory(92)}
	eqFaceWeak = Equation{Symbol: "m_f", Text: "λ (min(b1, t1)/2 + g)", Unit: strength.Length, Source: "statics: the moment at the face of the lug for each unit of load, the legs bearing on their active thickness", Mark: strength.Derived}
)

var affdlJointEquations = []*Equation{
	&eqPus, &eqPub, &eqPinArea, &eqPinModulus, &eqPinArm, &eqPyb, &eqPulb1, &eqPulb2, &eqPulb, &eqWeak, &eqPubMax, &eqActive1, &eqActive2, &eqTangK, &eqTangWeak, &eqTang1, &eqTang2, &eqTangs,
	&eqStrong, &eqWeakAll, &eqNoTangs, &eqWeakNo, &eqFaceWeak,
}

// affdlPin is the pin of a joint in double shear with what is settled of it.
type affdlPin struct {
	m            *affdl
	beam         *beam
	shear, bend  result // P_us and P_ub
	face         result // m_f over the whole thickness
	moment       result // M_u
	plane        result // V_u
	tang1, tang2 result // of the bodies, in N on each
	state        jointState
}

// jointState is the joint under one load case.
type jointState struct {
	of               *load
	why              *strength.Message
	one, two, lugs   float64 // P_u.LB1, P_u.LB2, P_u.LB
	weak             bool
	c, most, b1, b2x float64 // C, P_ub,max, b1, 2b2
}

func (m *affdl) pin() *affdlPin {
	p := &affdlPin{m: m, beam: m.beam()}
	p.shear = m.settle(p.shearStrength)
	p.bend = m.settle(p.bendingStrength)
	p.face = m.settle(p.beam.faceArm)
	p.moment = m.settle(p.ultimateMoment)
	p.plane = m.settle(p.beam.plane)
	p.tang1 = m.settle(m.clevis.tang)
	p.tang2 = m.settle(m.lug.tang)
	return p
}

// plastic is k_b: as chosen, or by the pin's elongation.
func (p *affdlPin) plastic(s *sheet) float64 {
	const option = "pin_bending_factor"
	if v, ok := p.m.choice.Options[option]; ok {
		return p.beam.plasticFactor(s, v.Number, "input: method_options."+p.m.method.ID+"."+option, strength.Given)
	}
	k, source := 1.0, affdlSource+", equation 9-13: elastic, for a pin whose elongation is below 5 % or not given"
	if strength.AtLeast(p.beam.pin.Material.Elongation, ductile) {
		k, source = ductilePin, affdlSource+", equation 9-13: a reasonably ductile pin, of at least 5 % elongation"
	}
	return p.beam.plasticFactor(s, k, source, strength.FromMemory(92))
}

// shearStrength is P_us in N on the joint.
func (p *affdlPin) shearStrength(s *sheet) float64 {
	defer s.under(memberPin)()
	d, bore := p.beam.diameters(s)
	share := p.m.clevis.legShare(s)
	return s.apply(&eqPus, pinShearFactor*(float64(d*d)-float64(bore*bore))*p.beam.property(s, strength.Fsu)/(2*share))
}

// bendingStrength is P_ub in N on the joint, over the full thicknesses.
func (p *affdlPin) bendingStrength(s *sheet) float64 {
	defer s.under(memberPin)()
	d, bore := p.beam.diameters(s)
	arm := p.beam.arm(s)
	k := p.plastic(s)
	return s.apply(&eqPub, pinBendingFactor*k*(float64(d*d*d*d)-float64(bore*bore*bore*bore))*p.beam.property(s, strength.Ftu)/(2*arm*d))
}

func (p *affdlPin) ultimateMoment(s *sheet) float64 {
	return s.apply(&eqPinFull, p.plastic(s)*float64(p.beam.property(s, strength.Ftu)*p.beam.modulus(s)))
}

// under is the joint under a load, kept until the next one.
func (p *affdlPin) under(l *load) *jointState {
	st := &p.state
	if st.of == l {
		return st
	}
	*st = jointState{of: l}
	m := p.m
	for _, end := range [...]struct {
		head *affdlHead
		to   *float64
	}{{m.clevis, &st.one}, {m.lug, &st.two}} {
		value, why := end.head.strengthAt(l)
		if end.head.bushing != nil {
			if why == nil {
				why = end.head.lining.why
			}
			value = min(value, end.head.lining.value)
		}
		if why != nil {
			st.why = why
			return st
		}
		*end.to = value
	}
	share := m.clevis.share
	st.lugs = min(st.one/share, st.two)
	if p.shear.why != nil || p.bend.why != nil {
		return st
	}
	p.activate(st)
	return st
}

// activate tells a weak pin from a strong one and finds the thicknesses that a
// weak pin leaves active. It follows from P = P1 b1 / (λ t1) = P2 2b2 / t2 and
// P λ (b1/2 + g + λ b2) = P_ub m.
func (p *affdlPin) activate(st *jointState) {
	share, t1, t2, g := p.m.clevis.share, p.m.clevis.head.Thickness, p.m.lug.head.Thickness, p.beam.gap
	st.weak = p.bend.value < st.lugs && p.bend.value < p.shear.value
	if !st.weak {
		return
	}
	arm := share * (t1/2 + g + float64(share*t2)/2)
	st.c = st.one * st.two / (float64(st.one*t2) + float64(st.two*t1))
	st.most = st.c / share * (math.Sqrt(2*p.bend.value*arm/st.c+float64(g*g)) - g)
	st.b1 = share * st.most * t1 / st.one
	st.b2x = st.most * t2 / st.two
}

// trace writes the joint's strengths under a load.
func (p *affdlPin) trace(s *sheet, l *load) *jointState {
	st := p.under(l)
	m := p.m
	for _, end := range [...]struct {
		head  *affdlHead
		e     *Equation
		value float64
	}{{m.clevis, &eqPulb1, st.one}, {m.lug, &eqPulb2, st.two}} {
		back := s.under(end.head.member)
		symbol, own := end.head.traceAt(s, l)
		e := *end.e
		e.Text = symbol
		if end.head.bushing != nil {
			lining := end.head.liningStrength(s)
			e.Text = "min(" + symbol + ", P_u.B)"
			own = min(own, lining)
		}
		s.apply(&e, own)
		back()
	}
	m.clevis.legShare(s)
	s.apply(&eqPulb, st.lugs)
	p.shearStrength(s)
	p.bendingStrength(s)
	if st.weak {
		s.apply(&eqWeak, st.c)
		s.apply(&eqPubMax, st.most)
		s.apply(&eqActive1, st.b1)
		s.apply(&eqActive2, st.b2x)
	}
	return st
}

// rest notes everything that the joint's strength rests on.
func (p *affdlPin) rest(s *sheet) {
	for _, h := range []*affdlHead{p.m.clevis, p.m.lug} {
		for _, r := range [...]result{h.along[0], h.across[0], h.across[1], h.lining} {
			s.rest(r)
		}
	}
	s.rest(p.shear)
	s.rest(p.bend)
	s.mark = strength.Weakest(s.mark, eqPubMax.Mark, eqPulb.Mark)
}

// joint adds the pin's and the joint's checks.
func (m *affdl) joint(p *affdlPin) {
	m.check(memberPin, strength.PinShear, strength.Ultimate, strength.Force, strength.ByRegulation, &eqPus, func(s *sheet) law {
		return fixed(anyWay, s.allow(eqPus.Symbol, p.shearStrength(s)))
	})
	m.check(memberPin, strength.PinBending, strength.Ultimate, strength.Force, strength.ByRegulation, &eqPubMax, p.bending)
	m.pinYield(p.beam)
	m.check(memberPin, strength.PinCombined, strength.Ultimate, strength.None, strength.ByRegulation, &eqPinCombined, p.combined)
	m.check(memberJoint, strength.WholeJoint, strength.Ultimate, strength.Force, strength.ByRegulation, &eqWeakAll, p.whole)
}

// pinYield checks at limit that the pin stays elastic. The manual's k_b of a
// ductile pin is plastic: at u 1.5 a pin that just holds has 1.04 F_tu, by the
// elastic formula, at limit. The manual itself asks for no yield strength of the
// pin, so that one without is only told.
func (m *affdl) pinYield(b *beam) {
	if b.pin.Material.Fty == 0 {
		m.found.add(strength.Warning, "pin-yield-not-checked", memberPin, affdlSource,
			"the material %q of the pin has no %s: that it stays elastic at limit is not checked", b.pin.Material.Name, strength.Fty)
		return
	}
	m.check(memberPin, strength.PinBending, strength.Limit, strength.Force, strength.ByRegulation, &eqPyb, func(s *sheet) law {
		return fixed(anyWay, s.allow(eqPyb.Symbol, s.apply(&eqPyb, b.property(s, strength.Fty)*b.modulus(s)/b.arm(s))))
	})
}

// needs says why nothing that involves the pin is known.
func (p *affdlPin) needs(s *sheet, results ...result) {
	for _, r := range results {
		if r.why != nil && s.why == nil {
			s.why = r.why
		}
	}
}

// bending is the bending of a weak pin; a strong one is not exercised by it.
func (p *affdlPin) bending(s *sheet) law {
	p.rest(s)
	p.needs(s, p.shear, p.bend)
	return law{
		sides: anyWay,
		margin: func(l *load, factor float64) strength.Margin {
			st := p.under(l)
			switch {
			case st.why != nil:
				return strength.Unknown(st.why)
			case !st.weak:
				return strength.Margin{}
			}
			return strength.Compare(factor*l.Force, st.most)
		},
		trace: func(s *sheet, l *load) { s.allow(eqPubMax.Symbol, p.trace(s, l).most) },
	}
}

// combined is bending and shear at the face of the lug, the legs bearing on the
// thickness that a weak pin leaves active.
func (p *affdlPin) combined(s *sheet) law {
	p.rest(s)
	s.mark = strength.Weakest(s.mark, p.moment.mark, p.face.mark)
	p.needs(s, p.shear, p.bend, p.moment, p.plane)
	share, t1, g := p.m.clevis.share, p.m.clevis.head.Thickness, p.beam.gap
	faceArm := func(st *jointState) float64 {
		if st.weak {
			return share * (min(st.b1, t1)/2 + g)
		}
		return p.face.value
	}
	return law{
		sides: anyWay,
		margin: func(l *load, factor float64) strength.Margin {
			st := p.under(l)
			if st.why != nil {
				return strength.Unknown(st.why)
			}
			demand := factor * l.Force
			return strength.Compare(1, 1/math.Hypot(demand*faceArm(st)/p.moment.value, demand*share/p.plane.value))
		},
		trace: func(s *sheet, l *load) {
			st := p.trace(s, l)
			if st.weak {
				s.apply(&eqFaceWeak, faceArm(st))
			} else {
				p.beam.faceArm(s)
			}
			p.ultimateMoment(s)
			p.beam.plane(s)
		},
		ratio: func(s *sheet, l *load, factored float64) {
			rm := s.apply(&eqPinBendingPart, factored*faceArm(p.under(l))/p.moment.value)
			rv := s.apply(&eqPinShearPart, factored*share/p.plane.value)
			s.apply(&eqPinCombined, 1/math.Hypot(rm, rv))
		},
	}
}

// tangs is what the bodies behind the heads let pass of a pull, in N on the
// joint: the outer one bends with a weak pin.
func (p *affdlPin) tangs(st *jointState, l *load) float64 {
	return min(p.outerTang(st)/p.m.clevis.share, p.tang2.value) / l.cos
}

// outerTang is P_t of one leg of the clevis.
func (p *affdlPin) outerTang(st *jointState) float64 {
	if !st.weak {
		return p.tang1.value
	}
	return p.tang1.value / (1 + float64(3/tangPlastic*(1-min(st.b1/p.m.clevis.head.Thickness, 1))))
}

// traceOuterTang writes P_t of one leg of the clevis.
func (p *affdlPin) traceOuterTang(s *sheet, st *jointState) {
	if !st.weak {
		p.m.clevis.tang(s)
		return
	}
	e := eqTangWeak
	e.Text = "F_tu wT t / (1 + (3 / k_bT) (1 - min(b1 / t1, 1)))"
	clevis := p.m.clevis
	clevis.property(s, strength.Ftu)
	clevis.bodyWidth(s)
	clevis.thickness(s)
	if clevis.bends() {
		clevis.offset(s)
		e.Text = "F_tu wT t / (1 + 6 |o| / wT) / (1 + (3 / k_bT) (1 - min(b1 / t1, 1)))"
	}
	s.apply(&eqTangK, tangPlastic)
	s.apply(&e, p.outerTang(st))
}

// whole is P_all of the joint.
func (p *affdlPin) whole(s *sheet) law {
	p.rest(s)
	p.needs(s, p.shear, p.bend)
	s.rest(p.tang1)
	s.rest(p.tang2)
	s.mark = strength.Weakest(s.mark, eqWeakAll.Mark)
	return law{
		sides: anyWay,
		margin: func(l *load, factor float64) strength.Margin {
			st := p.under(l)
			why := st.why
			if why == nil && l.sides&pull != 0 {
				if why = p.tang1.why; why == nil {
					why = p.tang2.why
				}
			}
			if why != nil {
				return strength.Unknown(why)
			}
			return strength.Compare(factor*l.Force, p.all(st, l))
		},
		trace: func(s *sheet, l *load) {
			st := p.trace(s, l)
			e := [...]*Equation{&eqNoTangs, &eqWeakNo, &eqStrong, &eqWeakAll}
			i := 0
			if st.weak {
				i = 1
			}
			if l.sides&pull != 0 {
				i += 2
				back := s.under(memberClevis)
				p.traceOuterTang(s, st)
				s.apply(&eqTang1, p.outerTang(st))
				back()
				back = s.under(memberLug)
				s.apply(&eqTang2, p.m.lug.tang(s))
				back()
				s.apply(&eqCos, l.cos)
				s.apply(&eqTangs, p.tangs(st, l))
			}
			s.allow(e[i].Symbol, s.apply(e[i], p.all(st, l)))
		},
	}
}

// all is P_all in N on the joint.
func (p *affdlPin) all(st *jointState, l *load) float64 {
	all := min(st.lugs, p.shear.value)
	if st.weak {
		all = min(all, st.most)
	}
	if l.sides&pull != 0 {
		all = min(all, p.tangs(st, l))
	}
	return all
}

// tangCheck adds the body behind a head; pin is given with the outer one of a
// joint in double shear, which bends with a weak pin.
func (m *affdl) tangCheck(h *affdlHead, pin *affdlPin) {
	switch {
	case pin == nil && !m.builder.joint.SingleShear:
		m.builder.tangCheck(h.part)
		return
	case pin == nil:
		m.check(h.member, strength.Tang, strength.Ultimate, strength.Force, strength.ByRegulation, &eqTang, func(s *sheet) law {
			return h.pulled(h.eccentricTang(s))
		})
		return
	}
	m.check(h.member, strength.Tang, strength.Ultimate, strength.Force, strength.ByRegulation, &eqTangWeak, func(s *sheet) law {
		s.rest(pin.tang1)
		pin.rest(s)
		pin.needs(s, pin.tang1)
		return law{
			sides: pull,
			margin: func(l *load, factor float64) strength.Margin {
				st := pin.under(l)
				if st.why != nil {
					return strength.Unknown(st.why)
				}
				return strength.Compare(factor*l.Force, pin.outerTang(st)/(h.share*l.cos))
			},
			trace: func(s *sheet, l *load) {
				st := pin.trace(s, l)
				pin.traceOuterTang(s, st)
				s.apply(&eqCos, l.cos)
				s.allow("P_t / (λ cosα)", pin.outerTang(st)/(h.share*l.cos))
			},
		}
	})
}

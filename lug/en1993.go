package lug

import (
	"math"

	"jointledger/strength"
)

// en1993 is the pin connection of EN 1993-1-8:2005, section 3.13.
var en1993 = Method{
	ID: "en-1993-1-8", Revision: 1,
	Title:  "EN 1993-1-8:2005, connections made with pins",
	Source: "EN 1993-1-8:2005 section 3.13, tables 3.9 and 3.10",
	Range:  "axial loads; solid pins; double shear for the pin's bending; one yield strength for plates along their axis",
	Mark:   weakestMark(enEquations),
	Modes: []strength.Mode{
		strength.NetSection, strength.ShearOut, strength.Bearing, strength.Tang, strength.BodyBending,
		strength.PinShear, strength.PinBending, strength.PinCombined,
	},
	Options: []Option{
		{Name: "gamma_m0", Meaning: "partial factor γM0", Kind: Number, Default: Value{Number: 1.0}, HasDefault: true, Least: 1, Most: 2},
		{Name: "gamma_m2", Meaning: "partial factor γM2", Kind: Number, Default: Value{Number: 1.25}, HasDefault: true, Least: 1, Most: 2},
		{Name: "gamma_m6", Meaning: "partial factor γM6,ser of a replaceable pin", Kind: Number, Default: Value{Number: 1.0}, HasDefault: true, Least: 1, Most: 2},
		{Name: "replaceable", Meaning: "the pin is meant to be replaced, which adds the checks of the serviceability load", Kind: Flag, HasDefault: true},
		applySpecial,
	},
	Equations: enEquations,
	prepare:   prepareEN,
}

const (
	enPlate = "EN 1993-1-8:2005 section 3.13, table 3.9, given thickness"
	enPin   = "EN 1993-1-8:2005 section 3.13, table 3.10"
)

var (
	eqENEnd         = Equation{Symbol: "F_a", Text: "max(0, e - D/2 - 2 D/3) 2 t F_ty / γ_M0", Unit: strength.Force, Source: enPlate + ": a >= F γM0 / (2 t fy) + 2 d0/3", Mark: strength.Seen}
	eqENEndLeast    = Equation{Symbol: "a_min", Text: "λ' demand γ_M0 / (2 t F_ty) + 2 D/3", Unit: strength.Length, Source: enPlate, Mark: strength.Seen}
	eqENSide        = Equation{Symbol: "F_c", Text: "max(0, c1 - D/2 - D/3) 2 t F_ty / γ_M0", Unit: strength.Force, Source: enPlate + ": c >= F γM0 / (2 t fy) + d0/3", Mark: strength.Seen}
	eqENSideLeast   = Equation{Symbol: "c_min", Text: "λ' demand γ_M0 / (2 t F_ty) + D/3", Unit: strength.Length, Source: enPlate, Mark: strength.Seen}
	eqENYield       = Equation{Symbol: "f_y", Text: "min(F_ty, F_typ)", Unit: strength.Stress, Source: enPin + ": the lower of plate and pin", Mark: strength.Seen}
	eqENYieldBush   = Equation{Symbol: "f_y", Text: "F_ty", Unit: strength.Stress, Source: enPin + ": the plate's; a bushing is not part of the table", Mark: strength.Seen}
	eqENBearing     = Equation{Symbol: "F_b,Rd", Text: "1.5 t_b Db f_y / γ_M0", Unit: strength.Force, Source: enPin + ", bearing", Mark: strength.Seen}
	eqENBearingSer  = Equation{Symbol: "F_b,Rd,ser", Text: "0.6 t_b Db f_y / γ_M6", Unit: strength.Force, Source: enPin + ", bearing of a replaceable pin", Mark: strength.Seen}
	eqENContact     = Equation{Symbol: "F_h", Text: "(2.5 f_y / (0.591 γ_M6))^2 Db^2 t_b / (E (D - Db))", Unit: strength.Force, Source: enPin + ": 0.591 sqrt(E F (d0 - d) / (d² t)) <= 2.5 fy / γM6, replaceable pin", Mark: strength.Seen}
	eqENShear       = Equation{Symbol: "F_v,Rd", Text: "0.6 A_p F_tu / γ_M2", Unit: strength.Force, Source: enPin + ", shear, one plane", Mark: strength.Seen}
	eqENMoment      = Equation{Symbol: "M_Rd", Text: "1.5 Z_p F_ty / γ_M0", Unit: strength.Moment, Source: enPin + ", bending", Mark: strength.Seen}
	eqENMomentSer   = Equation{Symbol: "M_Rd,ser", Text: "0.8 Z_p F_ty / γ_M6", Unit: strength.Moment, Source: enPin + ", bending of a replaceable pin", Mark: strength.Seen}
	eqENMomentPart  = Equation{Symbol: "R_M", Text: "P_d m / M_Rd", Unit: strength.None, Source: enPin + ", the greatest moment", Mark: strength.Seen}
	eqENShearPart   = Equation{Symbol: "R_V", Text: "P_d λ / F_v,Rd", Unit: strength.None, Source: enPin, Mark: strength.Seen}
	eqENInteraction = Equation{Symbol: "R", Text: "R_M^2 + R_V^2", Unit: strength.None, Source: enPin + ", combined shear and bending", Mark: strength.Seen}
	eqENCombined    = Equation{Symbol: "allowable", Text: "1 / sqrt(R)", Unit: strength.None, Source: enPin + ", combined shear and bending: (M/MRd)² + (Fv/FvRd)² <= 1", Mark: strength.Seen}
	eqENBody        = Equation{Symbol: "F_t", Text: "F_ty / γ_M0", Unit: strength.Force, Source: "EN 1993-1-1 section 6.2.3, gross section, with the bending of an offset hole by statics", Mark: strength.Derived}
)

var enEquations = gather(geometryEquations, []*Equation{
	&eqENEnd, &eqENEndLeast, &eqENSide, &eqENSideLeast, &eqENYield, &eqENYieldBush, &eqENBearing, &eqENBearingSer, &eqENContact,
	&eqENShear, &eqENMoment, &eqENMomentSer, &eqENMomentPart, &eqENShearPart, &eqENInteraction, &eqENCombined, &eqENBody,
	&eqPinArea, &eqPinModulus, &eqPinArm, &eqPinMoment,
}, bodyEquations)

type eurocode struct{ *builder }

func prepareEN(b *builder) {
	m := &eurocode{b}
	for _, p := range b.heads() {
		m.plate(p)
		b.bodyBendingCheck(p)
	}
	if b.joint.Pin != nil && b.joint.Clevis != nil {
		m.pin(b.beam())
	}
}

func (m *eurocode) gamma(s *sheet, which string) float64 {
	return m.chosen(s, "γ_M"+which, "gamma_m"+which)
}

func (m *eurocode) plate(p *part) {
	m.edge(p, strength.ShearOut, &eqENEnd, &eqENEndLeast, func(s *sheet) float64 { return p.edge(s) - p.hole(s)/2 }, 2.0/3)
	m.edge(p, strength.NetSection, &eqENSide, &eqENSideLeast, func(s *sheet) float64 { return p.side(s) - p.hole(s)/2 }, 1.0/3)
	m.axial(p, strength.Bearing, strength.Ultimate, strength.ByResistance, anyWay, &eqENBearing, func(s *sheet) float64 {
		return 1.5 * m.pressed(p, s) / m.gamma(s, "0")
	})
	m.axialTang(p, strength.Ultimate, strength.ByResistance, &eqENBody, func(s *sheet) float64 {
		return p.property(s, strength.Fty) / m.gamma(s, "0")
	})
	if !m.flag("replaceable") {
		return
	}
	m.axial(p, strength.Bearing, strength.Limit, strength.ByMethod, anyWay, &eqENBearingSer, func(s *sheet) float64 {
		return 0.6 * m.pressed(p, s) / m.gamma(s, "6")
	})
	// Contact stress rises with the play of the pin and is none without it.
	plays := p.varies.has(fieldPin) || p.varies.has(p.first+fieldHole)
	if p.pin == nil || p.bushing != nil || !plays && !strength.Less(p.pin.Diameter, p.head.HoleDiameter) {
		return
	}
	m.axial(p, strength.Bearing, strength.Limit, strength.ByMethod, anyWay, &eqENContact, func(s *sheet) float64 {
		stress := 2.5 * m.yield(p, s) / (0.591 * m.gamma(s, "6"))
		d := p.bearingDiameter(s)
		return stress * stress * d * d * p.bearingLength(s) / (p.property(s, strength.E) * (p.hole(s) - d))
	})
}

// edge adds a least distance from the hole's edge, as the load that it allows:
// (distance - part · d0) 2 t fy / γM0, never below nothing.
func (m *eurocode) edge(p *part, mode strength.Mode, e, least *Equation, distance func(*sheet) float64, part float64) {
	m.check(p.member, mode, strength.Ultimate, strength.Force, strength.ByResistance, e, func(s *sheet) law {
		m.bearsStraight(s)
		d, t := p.hole(s), p.thickness(s)
		fty, gamma := p.property(s, strength.Fty), m.gamma(s, "0")
		strip := 2 * t * fty / gamma
		value := s.apply(e, max(0, distance(s)-float64(part*d))*strip)
		k := fixed(pull|transverse, p.allow(s, e.Symbol, value))
		k.axialOnly = m.axialOnly()
		k.after = func(s *sheet, demand float64) {
			own := *least
			own.Text = "demand" + least.Text[len("λ' demand"):]
			if p.doubleLeg {
				own.Text = "λ " + own.Text
			}
			s.apply(&own, p.share*demand/strip+float64(part*d))
		}
		return k
	})
}

// yield is fy of a bearing, the lower of plate and pin.
func (m *eurocode) yield(p *part, s *sheet) float64 {
	p.pinDiameter(s)
	plate := p.property(s, strength.Fty)
	if p.pin == nil || p.bushing != nil {
		return s.apply(&eqENYieldBush, plate)
	}
	return s.apply(&eqENYield, min(plate, s.property(memberPin, &p.pin.Material, strength.Fty, "F_typ")))
}

// pressed is t d fy in N.
func (m *eurocode) pressed(p *part, s *sheet) float64 {
	return m.yield(p, s) * p.bearingDiameter(s) * p.bearingLength(s)
}

func (m *eurocode) pin(beam *beam) {
	solid := func(s *sheet) {
		if beam.pin.InnerDiameter != 0 {
			s.lack(strength.Say("the rules of EN 1993-1-8 section 3.13 are for solid pins"))
		}
	}
	shear := func(s *sheet) float64 {
		return s.apply(&eqENShear, 0.6*beam.area(s)*beam.property(s, strength.Ftu)/m.gamma(s, "2"))
	}
	moment := func(s *sheet) float64 {
		return s.apply(&eqENMoment, 1.5*beam.modulus(s)*beam.property(s, strength.Fty)/m.gamma(s, "0"))
	}
	m.check(memberPin, strength.PinShear, strength.Ultimate, strength.Force, strength.ByResistance, &eqENShear, func(s *sheet) law {
		solid(s)
		plane := shear(s)
		if m.joint.SingleShear {
			return fixed(anyWay, s.allow(eqENShear.Symbol, plane))
		}
		return fixed(anyWay, s.allow(eqENShear.Symbol+" / λ", plane/m.clevis.legShare(s)))
	})
	bending := func(level strength.Level, safety strength.Safety, e *Equation, capacity func(*sheet) float64) {
		m.check(memberPin, strength.PinBending, level, strength.Moment, safety, e, func(s *sheet) law {
			solid(s)
			m.bearsStraight(s)
			return beam.bends(s, e.Symbol, capacity(s))
		})
	}
	bending(strength.Ultimate, strength.ByResistance, &eqENMoment, moment)
	if m.flag("replaceable") {
		bending(strength.Limit, strength.ByMethod, &eqENMomentSer, func(s *sheet) float64 {
			return s.apply(&eqENMomentSer, 0.8*beam.modulus(s)*beam.property(s, strength.Fty)/m.gamma(s, "6"))
		})
	}
	m.check(memberPin, strength.PinCombined, strength.Ultimate, strength.None, strength.ByResistance, &eqENCombined, func(s *sheet) law {
		solid(s)
		m.bearsStraight(s)
		perMoment, perShear := beam.arm(s)/moment(s), m.clevis.legShare(s)/shear(s)
		return law{
			sides: anyWay,
			margin: func(l *load, factor float64) strength.Margin {
				return strength.Compare(1, 1/math.Hypot(factor*float64(l.Force*perMoment), factor*float64(l.Force*perShear)))
			},
			ratio: func(s *sheet, l *load, factored float64) {
				rm := s.apply(&eqENMomentPart, factored*perMoment)
				rv := s.apply(&eqENShearPart, factored*perShear)
				s.apply(&eqENInteraction, float64(rm*rm)+float64(rv*rv))
				s.apply(&eqENCombined, 1/math.Hypot(rm, rv))
			},
		}
	})
}

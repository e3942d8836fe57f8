package lug

import "jointledger/strength"

// elementary1 is the text-book hand calculation of an axially loaded lug: net
// section, two shear-out planes at 40°, handbook bearing, bushing and pin.
var elementary1 = Method{
	ID: "elementary", Revision: 1,
	Title:  "Elementary hand calculation of an axially loaded lug",
	Source: "text-book strength of materials; bearing values and their ranges as in MIL-HDBK-5J",
	Range:  "axial loads; e/D of at least 1.5 and t/D of at least 0.18 for bearing; pin at least 0.95 of an unbushed hole; double shear",
	Mark:   weakestMark(elementaryEquations),
	Modes: []strength.Mode{
		strength.NetSection, strength.ShearOut, strength.Bearing, strength.BushingBearing,
		strength.Tang, strength.BodyBending, strength.PinShear, strength.PinBending, strength.PinCombined,
	},
	Options: []Option{{
		Name: "pin_bending_factor", Meaning: "ultimate moment of the pin over its elastic one, k_b: 1 elastic, 1.7 fully plastic",
		Kind: Number, Default: Value{Number: 1}, HasDefault: true, Least: 1, Most: 1.7,
		Requires: "pin and clevis",
	}},
	Equations: elementaryEquations,
	prepare:   elementary,
}

const elementarySource = "text-book strength of materials"

// thinLug is the least t/D for which handbook bearing values hold.
//
// Source: MIL-HDBK-5J section 1.4.7, figure notes (seen).
const thinLug = 0.18

var (
	eqNetUltimate     = Equation{Symbol: "P_nu", Text: "F_tu A_net", Unit: strength.Force, Source: elementarySource + ": net section", Mark: strength.Derived}
	eqNetYield        = Equation{Symbol: "P_ny", Text: "F_ty A_net", Unit: strength.Force, Source: elementarySource + ": net section", Mark: strength.Derived}
	eqShearOut        = Equation{Symbol: "P_su", Text: "2 t L F_su", Unit: strength.Force, Source: elementarySource + ": shear-out of two planes 40° from the axis", Mark: strength.CommonPractice}
	eqBearingUltimate = Equation{Symbol: "P_bru", Text: "F_bru Db t_b", Unit: strength.Force, Source: elementarySource + ": bearing, with the handbook's value at e/D", Mark: strength.Derived}
	eqBearingYield    = Equation{Symbol: "P_bry", Text: "F_bry Db t_b", Unit: strength.Force, Source: elementarySource + ": bearing, with the handbook's value at e/D", Mark: strength.Derived}
	eqRatioOwn        = Equation{Symbol: "ρ", Text: "min(e/D, 2)", Unit: strength.None, Source: "e/D at which the handbook's bearing value is taken", Mark: strength.Derived}
	eqRatioFull       = Equation{Symbol: "ρ", Text: "2", Unit: strength.None, Source: "e/D at which the handbook's bearing value is taken", Mark: strength.Derived}
	eqRatioFrom       = Equation{Symbol: "ρ", Text: "1.5", Unit: strength.None, Source: "e/D at which the handbook's bearing value is taken", Mark: strength.Derived}
	eqHandbookLine    = Equation{Symbol: "F_br", Text: "F_br1 + (F_br2 - F_br1) (ρ - r1) / (r2 - r1)", Unit: strength.Stress, Source: "MIL-HDBK-5J section 1.4.7: a straight line between e/D 1.5 and 2.0, flat above", Mark: strength.Seen}
	eqBushing         = Equation{Symbol: "P_B", Text: "F_cy Dp t_b", Unit: strength.Force, Source: "common practice: compressive yield of the bushing over the pin's projected area", Mark: strength.CommonPractice}
)

var elementaryEquations = gather(geometryEquations, []*Equation{
	&eqNetUltimate, &eqNetYield, &eqShearOut, &eqRatioOwn, &eqRatioFull, &eqHandbookLine, &eqBearingUltimate, &eqBearingYield, &eqBushing,
}, bodyEquations, pinEquations)

func elementary(b *builder) {
	for _, p := range b.heads() {
		elementaryHead(b, p)
		b.body(p)
	}
	if b.joint.Pin == nil || b.joint.Clevis == nil {
		return
	}
	beam := b.beam()
	b.pinShear(beam)
	if b.joint.SingleShear {
		b.check(memberPin, strength.PinBending, strength.Ultimate, strength.Moment, strength.ByRegulation, &eqPinFull, func(s *sheet) law {
			b.bearsStraight(s)
			return law{sides: anyWay}
		})
		return
	}
	k, source := b.pinFactor()
	b.pinBending(beam, k, source, strength.Derived)
	b.pinCombined(beam, k, source, strength.Derived)
}

// pinFactor is the option pin_bending_factor and where it comes from.
func (b *builder) pinFactor() (k float64, source string) {
	if v, ok := b.choice.Options["pin_bending_factor"]; ok {
		return v.Number, "input: method_options." + b.method.ID + ".pin_bending_factor"
	}
	return b.number("pin_bending_factor"), "default of " + b.name + ": elastic"
}

// elementaryHead adds the checks of one head.
func elementaryHead(b *builder, p *part) {
	const on = pull | transverse
	b.axial(p, strength.NetSection, strength.Ultimate, strength.ByRegulation, on, &eqNetUltimate, func(s *sheet) float64 {
		return p.property(s, strength.Ftu) * p.netArea(s)
	})
	b.axial(p, strength.NetSection, strength.Limit, strength.ByRegulation, on, &eqNetYield, func(s *sheet) float64 {
		return p.property(s, strength.Fty) * p.netArea(s)
	})
	b.axial(p, strength.ShearOut, strength.Ultimate, strength.ByRegulation, on, &eqShearOut, func(s *sheet) float64 {
		return 2 * p.thickness(s) * p.shearOutLength(s) * p.property(s, strength.Fsu)
	})
	elementaryBearing(b, p, strength.Ultimate, strength.Fbru, &eqBearingUltimate)
	elementaryBearing(b, p, strength.Limit, strength.Fbry, &eqBearingYield)
	b.bushing(p)
}

// elementaryBearing adds bearing at one level. A pull bears toward the end, at
// the head's own e/D; a push bears into the body, where the end is no matter
// and the value of e/D 2.0 holds.
func elementaryBearing(b *builder, p *part, level strength.Level, property strength.Property, e *Equation) {
	allowable := func(s *sheet, l *load) float64 {
		ratio := &eqRatioFull
		if l.sides&push == 0 {
			p.edgeRatio(s)
			ratio = &eqRatioOwn
		}
		stress := p.handbookBearing(s, property, ratio)
		return p.allow(s, e.Symbol, s.apply(e, stress*p.bearingDiameter(s)*p.bearingLength(s)))
	}
	b.check(p.member, strength.Bearing, level, strength.Force, strength.ByRegulation, e, func(s *sheet) law {
		b.bearsStraight(s)
		p.closeFit(s)
		if ratio := s.apply(&eqThinness, p.thickness(s)/p.bearingDiameter(s)); strength.Less(ratio, thinLug) {
			s.lack(strength.Say("t/D %.4g is below %.4g, the least for which handbook bearing values hold", ratio, thinLug))
		}
		k := law{sides: anyWay, axialOnly: b.axialOnly()}
		for i, way := range [...]sides{pullAlong, pushAlong} {
			settled := b.settle(func(s *sheet) float64 { return allowable(s, &load{sides: way}) })
			s.rest(settled)
			k.along[i] = settled.known()
		}
		k.trace = func(s *sheet, l *load) {
			if l.axial() {
				allowable(s, l)
			}
		}
		return k
	})
}

// handbookBearing is F_bru or F_bry in MPa at an edge distance ratio of at
// least 1.5: by straight line up to 2.0, flat above, nothing below. at says
// which ratio that is.
func (p *part) handbookBearing(s *sheet, property strength.Property, at *Equation) float64 {
	ratio := strength.BearingFull
	switch at {
	case &eqRatioOwn:
		ratio = min(p.head.EdgeDistance/p.head.HoleDiameter, ratio)
	case &eqRatioFrom:
		ratio = strength.BearingFrom
	}
	m := &p.head.Material
	lo, hi, why := m.BearingBetween(property, ratio)
	if !why.Empty() {
		s.lack(why)
		return 0
	}
	s.mark = strength.Weakest(s.mark, m.MarkOf(property))
	given := func(symbol string, value float64, unit strength.Unit) {
		if s.recording() {
			s.keep(strength.Working{
				Member: p.member, Symbol: symbol, Value: value, Unit: unit, Source: materialSource(m), Mark: m.MarkOf(property),
			})
		}
	}
	symbol := string(property)
	start, end := lo.Value(property), hi.Value(property)
	if lo == hi {
		given(symbol, start, strength.Stress)
		return start
	}
	e := eqHandbookLine
	e.Symbol = symbol
	if s.recording() {
		given("r1", lo.EOverD, strength.None)
		given("r2", hi.EOverD, strength.None)
		given(symbol+"1", start, strength.Stress)
		given(symbol+"2", end, strength.Stress)
		e.Text = symbol + "1 + (" + symbol + "2 - " + symbol + "1) (ρ - r1) / (r2 - r1)"
	}
	s.apply(at, ratio)
	return s.apply(&e, start+float64((ratio-lo.EOverD)/(hi.EOverD-lo.EOverD)*(end-start)))
}

// bushing adds the bushing's compressive yield under the pin, at limit. It
// does not depend on the direction of the load.
func (b *builder) bushing(p *part) {
	if p.bushing == nil {
		return
	}
	b.check(p.bushingMember, strength.BushingBearing, strength.Limit, strength.Force, strength.ByRegulation, &eqBushing, func(s *sheet) law {
		s.read.add(p.first + fieldBushing)
		fcy := s.property(p.bushingMember, &p.bushing.Material, strength.Fcy, string(strength.Fcy))
		return fixed(anyWay, p.allow(s, eqBushing.Symbol, s.apply(&eqBushing, fcy*p.pinDiameter(s)*p.bearingLength(s))))
	})
}

package lug

import (
	"math"

	"jointledger/strength"
)

// The pin of a clevis joint is a beam on its two legs: each leg's pressure is
// even over its thickness, and so is the lug's.

var (
	eqPinArea    = Equation{Symbol: "A_p", Text: "π (Dp^2 - dp^2) / 4", Unit: strength.Area, Source: "section of the pin", Mark: strength.Derived}
	eqPinModulus = Equation{Symbol: "Z_p", Text: "π (Dp^4 - dp^4) / (32 Dp)", Unit: strength.Volume, Source: "section of the pin", Mark: strength.Derived}
	eqPinShear   = Equation{Symbol: "V_u", Text: "A_p F_su", Unit: strength.Force, Source: "text-book strength of materials: a pin in shear, one plane", Mark: strength.Derived}
	// With λ = 1/2 the arm is (t1/2 + t2/4 + g)/2, the form of the Stress
	// Analysis Manual, AFFDL-TR-69-42, chapter 9, equation 9-13.
	eqPinArm     = Equation{Symbol: "m", Text: "λ (t1/2 + g + λ t2/2)", Unit: strength.Length, Source: "statics: the greatest moment in the pin for each unit of load", Mark: strength.Derived}
	eqPinFaceArm = Equation{Symbol: "m_f", Text: "λ (t1/2 + g)", Unit: strength.Length, Source: "statics: the moment at the face of the lug for each unit of load", Mark: strength.Derived}
	eqPinMoment  = Equation{Symbol: "M", Text: "P m", Unit: strength.Moment, Source: "statics", Mark: strength.Derived}
	eqPinYield   = Equation{Symbol: "M_y", Text: "F_ty Z_p", Unit: strength.Moment, Source: "text-book strength of materials: a pin in bending, elastic", Mark: strength.Derived}
	eqPinPlastic = Equation{Symbol: "k_b", Text: "min(k, 16 (1 - (dp/Dp)^3) / (3 π (1 - (dp/Dp)^4)))", Unit: strength.None, Source: "a hollow pin reaches no more than its fully plastic moment", Mark: strength.Derived}
	eqPinFull    = Equation{Symbol: "M_u", Text: "k_b F_tu Z_p", Unit: strength.Moment, Source: "text-book strength of materials: a pin in bending", Mark: strength.Derived}
	// The form is that of EN 1993-1-8 3.13.
	eqPinBendingPart = Equation{Symbol: "R_M", Text: "P_d m_f / M_u", Unit: strength.None, Source: "moment at the face of the lug over its ultimate", Mark: strength.Derived}
	eqPinShearPart   = Equation{Symbol: "R_V", Text: "P_d λ / V_u", Unit: strength.None, Source: "shear at the face of the lug over its ultimate", Mark: strength.Derived}
	eqPinCombined    = Equation{Symbol: "allowable", Text: "1 / sqrt(R_M^2 + R_V^2)", Unit: strength.None, Source: "bending and shear act together at the face of the lug: (M/Mu)² + (V/Vu)² <= 1, the form of EN 1993-1-8 3.13", Mark: strength.Derived}
)

// eqMomentAllowed is the allowable of a check that is written in moments.
var eqMomentAllowed = Equation{Symbol: "allowable", Unit: strength.Moment, Source: "moment of the pin", Mark: strength.Given}

var pinEquations = []*Equation{
	&eqPinArea, &eqPinModulus, &eqPinShear, &eqPinArm, &eqPinFaceArm, &eqPinMoment, &eqPinYield,
	&eqPinPlastic, &eqPinFull, &eqPinBendingPart, &eqPinShearPart, &eqPinCombined,
}

// beam is the pin with the parts that it joins; both heads and the pin exist.
type beam struct {
	pin         *Pin
	lug, clevis *part
	gap         float64
	// peak gives γ, by which the load of the lug peaks toward its faces; nil: 1.
	peak func(*sheet) float64
}

func (b *builder) beam() *beam {
	return &beam{pin: b.joint.Pin, lug: b.lug, clevis: b.clevis, gap: b.joint.Clevis.Gap}
}

func (b *beam) diameters(s *sheet) (outer, bore float64) {
	outer = s.input(memberPin, "Dp", b.pin.Diameter, strength.Length, fieldPin)
	bore = s.input(memberPin, "dp", b.pin.InnerDiameter, strength.Length, fieldPinBore)
	return outer, bore
}

// area is the section of the pin in mm².
func (b *beam) area(s *sheet) float64 {
	d, bore := b.diameters(s)
	return s.apply(&eqPinArea, math.Pi/4*(float64(d*d)-float64(bore*bore)))
}

// modulus is the elastic section modulus of the pin in mm³.
func (b *beam) modulus(s *sheet) float64 {
	d, bore := b.diameters(s)
	return s.apply(&eqPinModulus, math.Pi/32*(float64(d*d*d*d)-float64(bore*bore*bore*bore))/d)
}

func (b *beam) property(s *sheet, p strength.Property) float64 {
	return s.property(memberPin, &b.pin.Material, p, string(p))
}

// plane is the ultimate strength of one shear plane in N.
func (b *beam) plane(s *sheet) float64 {
	return s.apply(&eqPinShear, b.area(s)*b.property(s, strength.Fsu))
}

// arms writes the thickness of a leg and the gap; t2 is the lug's thickness.
func (b *beam) arms(s *sheet) (share, t1, g float64) {
	t1 = s.input(memberClevis, "t1", b.clevis.head.Thickness, strength.Length, fieldsOfHead+fieldThickness)
	g = s.input(memberClevis, "g", b.gap, strength.Length, fieldGap)
	return b.clevis.legShare(s), t1, g
}

// arm is the greatest moment in the pin for each N of load, in mm: where the
// shear vanishes, λ t2 inside the lug's face.
func (b *beam) arm(s *sheet) float64 {
	share, t1, g := b.arms(s)
	t2 := s.input(memberLug, "t2", b.lug.head.Thickness, strength.Length, fieldThickness)
	if b.peak != nil {
		return s.apply(&eqMHPeakArm, share*(t1/2+g+float64(b.peak(s)*share*t2)/2))
	}
	return s.apply(&eqPinArm, share*(t1/2+g+float64(share*t2)/2))
}

// faceArm is the moment at the face of the lug for each N of load, in mm.
func (b *beam) faceArm(s *sheet) float64 {
	share, t1, g := b.arms(s)
	return s.apply(&eqPinFaceArm, share*(t1/2+g))
}

// plasticFactor is k_b, what the ultimate moment exceeds the elastic one by.
// 16/(3π) is a solid section fully plastic, and 1.7 its rounded value; a bore
// lowers it, and a hollow pin is held to its own.
func (b *beam) plasticFactor(s *sheet, k float64, source string, mark strength.Mark) float64 {
	if b.pin.InnerDiameter == 0 {
		return s.option("k_b", k, source, mark)
	}
	s.option("k", k, source, mark)
	d, bore := b.diameters(s)
	r := bore / d
	full := 16 / (3 * math.Pi) * (1 - float64(r*r*r)) / (1 - float64(r*r*r*r))
	return s.apply(&eqPinPlastic, min(k, full))
}

// pinShear checks the pin's shear planes at ultimate. No shear yield strength
// is published, so there is no check at limit.
func (b *builder) pinShear(beam *beam) {
	b.check(memberPin, strength.PinShear, strength.Ultimate, strength.Force, strength.ByRegulation, &eqPinShear, func(s *sheet) law {
		plane := beam.plane(s)
		if b.joint.SingleShear {
			return fixed(anyWay, s.allow("V_u", plane))
		}
		share := beam.clevis.legShare(s)
		return fixed(anyWay, s.allow("V_u / λ", plane/share))
	})
}

// bends sets the pin's greatest moment against its capacity.
func (b *beam) bends(s *sheet, symbol string, capacity float64) law {
	arm := b.arm(s)
	allowable := eqMomentAllowed
	allowable.Text = symbol
	s.apply(&allowable, capacity)
	return law{
		sides:   anyWay,
		measure: eqPinMoment.Symbol,
		margin: func(l *load, factor float64) strength.Margin {
			return strength.Compare(factor*float64(l.Force*arm), capacity)
		},
		trace: func(s *sheet, l *load) { s.apply(&eqPinMoment, l.Force*arm) },
	}
}

// pinBending checks the pin's greatest moment, at ultimate with k_b and at
// limit elastically.
func (b *builder) pinBending(beam *beam, k float64, kSource string, kMark strength.Mark) {
	b.check(memberPin, strength.PinBending, strength.Ultimate, strength.Moment, strength.ByRegulation, &eqPinFull, func(s *sheet) law {
		kb := beam.plasticFactor(s, k, kSource, kMark)
		return beam.bends(s, eqPinFull.Symbol, s.apply(&eqPinFull, kb*float64(beam.property(s, strength.Ftu)*beam.modulus(s))))
	})
	b.check(memberPin, strength.PinBending, strength.Limit, strength.Moment, strength.ByRegulation, &eqPinYield, func(s *sheet) law {
		return beam.bends(s, eqPinYield.Symbol, s.apply(&eqPinYield, beam.property(s, strength.Fty)*beam.modulus(s)))
	})
}

// pinCombined checks bending and shear together at the face of the lug, at
// ultimate.
func (b *builder) pinCombined(beam *beam, k float64, kSource string, kMark strength.Mark) {
	b.check(memberPin, strength.PinCombined, strength.Ultimate, strength.None, strength.ByRegulation, &eqPinCombined, func(s *sheet) law {
		shear := beam.plane(s)
		faceArm := beam.faceArm(s)
		kb := beam.plasticFactor(s, k, kSource, kMark)
		moment := s.apply(&eqPinFull, kb*float64(beam.property(s, strength.Ftu)*beam.modulus(s)))
		s.mark = strength.Weakest(s.mark, eqPinBendingPart.Mark, eqPinShearPart.Mark)
		perMoment, perShear := faceArm/moment, beam.clevis.share/shear
		return law{
			sides: anyWay,
			margin: func(l *load, factor float64) strength.Margin {
				return strength.Compare(1, 1/math.Hypot(factor*float64(l.Force*perMoment), factor*float64(l.Force*perShear)))
			},
			ratio: func(s *sheet, l *load, factored float64) {
				rm := s.apply(&eqPinBendingPart, factored*perMoment)
				rv := s.apply(&eqPinShearPart, factored*perShear)
				s.apply(&eqPinCombined, 1/math.Hypot(rm, rv))
			},
		}
	})
}

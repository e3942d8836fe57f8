package lug

import "jointledger/strength"

// aisc360D5 is the pin-connected member of AISC 360-16.
var aisc360D5 = Method{
	ID: "aisc-360-d5", Revision: 1,
	Title:  "AISC 360-16, pin-connected members",
	Source: "AISC 360-16 sections D5, J7 and D2",
	Range:  "axial tension; symmetric joints; proportions of section D5.2 as findings",
	Mark:   weakestMark(aiscEquations),
	Modes:  []strength.Mode{strength.NetSection, strength.ShearOut, strength.Bearing, strength.Yielding, strength.Tang, strength.BodyBending},
	Options: []Option{
		{Name: "basis", Meaning: "asd: strengths over Ω against the limit load; lrfd: strengths times φ against the ultimate load", Kind: Word, Words: []string{"asd", "lrfd"}, Default: Value{Word: "asd"}, HasDefault: true},
		applySpecial,
	},
	Equations: aiscEquations,
	prepare:   prepareAISC,
}

const (
	aiscSource = "AISC 360-16 section D5"
	aiscExtra  = 16.0 // mm, 0.63 in
)

var (
	eqAISCWidth   = Equation{Number: "D5-1", Symbol: "b_e,eff", Text: "min(2 t + b_0, b_e)", Unit: strength.Length, Source: aiscSource, Mark: strength.Seen}
	eqAISCExtra   = Equation{Symbol: "b_0", Text: "", Unit: strength.Length, Source: aiscSource + ".1: 16 mm, 0.63 in", Mark: strength.Seen}
	eqAISCRupture = Equation{Number: "D5-1", Symbol: "P_n", Text: "F_tu 2 t b_e,eff", Unit: strength.Force, Source: aiscSource, Mark: strength.Seen}
	eqAISCShear   = Equation{Number: "D5-2", Symbol: "P_n", Text: "0.6 F_tu 2 t (e - D/2 + Db/2)", Unit: strength.Force, Source: aiscSource, Mark: strength.Seen}
	eqAISCTapered = Equation{Number: "D5-2", Symbol: "P_n", Text: "0.6 F_tu 2 t (min(e, (W/2 - |o| - Db/2) / tan(β)) - D/2 + Db/2)", Unit: strength.Force, Source: aiscSource + "; the planes end at the converging sides: derived", Mark: strength.Derived}
	eqAISCBearing = Equation{Number: "J7-1", Symbol: "P_n", Text: "1.8 F_ty t_b Db", Unit: strength.Force, Source: "AISC 360-16 section J7", Mark: strength.Seen}
	eqAISCGross   = Equation{Number: "D2-1", Symbol: "P_n", Text: "F_ty wT t", Unit: strength.Force, Source: "AISC 360-16 section D2", Mark: strength.Seen}
	eqAISCOffset  = Equation{Symbol: "P_n", Text: "F_ty", Unit: strength.Force, Source: "AISC 360-16 section D2, gross section, with the bending of an offset hole by statics", Mark: strength.Derived}
)

var aiscEquations = gather(geometryEquations, []*Equation{
	&eqActualWidth, &eqAISCWidth, &eqAISCRupture, &eqAISCShear, &eqAISCTapered, &eqAISCBearing, &eqAISCGross, &eqAISCOffset,
}, bodyEquations)

// aisc is the method with its basis.
type aisc struct {
	*builder
	lrfd   bool
	level  strength.Level
	safety strength.Safety
}

func prepareAISC(b *builder) {
	m := &aisc{builder: b, lrfd: b.value("basis").Word == "lrfd", level: strength.Limit, safety: strength.ByMethod}
	if m.lrfd {
		m.level, m.safety = strength.Ultimate, strength.ByResistance
	}
	for _, p := range b.heads() {
		m.nominal(p, strength.NetSection, pull|transverse, &eqAISCRupture, 0.75, 2.00, func(s *sheet) float64 {
			return p.property(s, strength.Ftu) * 2 * p.thickness(s) * m.effective(p, s)
		})
		shear := &eqAISCShear
		if p.head.Shape == Tapered {
			shear = &eqAISCTapered
		}
		m.nominal(p, strength.ShearOut, pull|transverse, shear, 0.75, 2.00, func(s *sheet) float64 {
			p.pinDiameter(s)
			pin, end := p.bearingDiameter(s), p.edge(s)
			if p.head.Shape == Tapered {
				end = p.taperedEnd(s, pin/2)
			}
			return 0.6 * p.property(s, strength.Ftu) * 2 * p.thickness(s) * (end - p.hole(s)/2 + pin/2)
		})
		m.nominal(p, strength.Bearing, anyWay, &eqAISCBearing, 0.75, 2.00, func(s *sheet) float64 {
			p.pinDiameter(s)
			return 1.8 * p.property(s, strength.Fty) * p.bearingLength(s) * p.bearingDiameter(s)
		})
		m.nominal(p, strength.Yielding, pull|transverse, &eqAISCGross, 0.90, 1.67, func(s *sheet) float64 {
			return p.property(s, strength.Fty) * p.bodyWidth(s) * p.thickness(s)
		})
		if p.bends() {
			e := eqAISCOffset
			e.Text = "F_ty wT t / (1 + 6 |o| / wT)"
			m.nominal(p, strength.Tang, pull|transverse, &e, 0.90, 1.67, func(s *sheet) float64 {
				wt := p.bodyWidth(s)
				return p.property(s, strength.Fty) * wt * p.thickness(s) / (1 + 6*p.offset(s)/wt)
			})
		}
		b.bodyBendingCheck(p)
		m.proportions(p)
	}
}

// nominal adds a check of a nominal strength in N on the head, with φ or Ω.
func (m *aisc) nominal(p *part, mode strength.Mode, on sides, e *Equation, phi, omega float64, strengthOf func(*sheet) float64) {
	m.check(p.member, mode, m.level, strength.Force, m.safety, e, func(s *sheet) law {
		m.bearsStraight(s)
		nominal := s.apply(e, strengthOf(s))
		var allowable float64
		if m.lrfd {
			allowable = p.allow(s, "φ P_n", s.option("φ", phi, e.source(), strength.Seen)*nominal)
		} else {
			allowable = p.allow(s, "P_n / Ω", nominal/s.option("Ω", omega, e.source(), strength.Seen))
		}
		k := fixed(on, allowable)
		k.axialOnly = m.axialOnly()
		return k
	})
}

// effective is b_e of the standard, at most the actual width.
func (m *aisc) effective(p *part, s *sheet) float64 {
	actual, t := p.actualWidth(s), p.thickness(s)
	if s.recording() {
		w := s.record.heading
		w.Symbol, w.Value, w.Unit, w.Source, w.Mark = eqAISCExtra.Symbol, aiscExtra, strength.Length, eqAISCExtra.Source, eqAISCExtra.Mark
		s.keep(w)
	}
	return s.apply(&eqAISCWidth, min(2*t+aiscExtra, actual))
}

// proportions tells which of the proportions of section D5.2 a head misses.
func (m *aisc) proportions(p *part) {
	s := m.sheet()
	defer m.wipe(s)
	be := m.effective(p, s)
	end, hole := p.head.EdgeDistance-p.head.HoleDiameter/2, p.head.HoleDiameter
	const source = aiscSource + ".2"
	say := func(code, format string, args ...any) {
		m.found.add(strength.Violation, code, p.member, source, format, args...)
	}
	if strength.Less(end, 1.33*be) {
		say("proportion-end", "the end is %v from the hole and must be at least 1.33 b_e, %v", mm(end), mm(1.33*be))
	}
	if p.pin == nil {
		return
	}
	pin := p.bearingDiameter(s)
	if least := 2*be + pin; strength.Less(p.head.Width, least) {
		say("proportion-width", "the width %v must be at least 2 b_e plus the pin, %v", mm(p.head.Width), mm(least))
	}
	if strength.More(hole, pin+1) {
		say("proportion-hole", "the hole %v must not exceed the pin by more than 1 mm, %v, where the pin turns under load", mm(hole), mm(pin+1))
	}
}

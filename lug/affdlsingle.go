package lug

import (
	"math"
	"strings"

	"jointledger/strength"
)

// A joint in single shear: the two lugs pull past each other, and the moment of
// the pull is shared between them.

var (
	eqEccentric   = Equation{Symbol: "m_e", Text: "(t2 + t1)/2 + g", Unit: strength.Length, Source: affdlSource + ", single shear: the moment of both lugs for each unit of load", Mark: strength.FromMemory(80)}
	eqMomentWhole = Equation{Symbol: "μ", Text: "m_e", Unit: strength.Length, Source: "how the lugs share the moment is not known: each is taken with the whole, the worse of both extremes", Mark: strength.Derived}
	eqMomentLug   = Equation{Symbol: "μ", Text: "φ m_e", Unit: strength.Length, Source: affdlSource + ", single shear: the lug's part of the moment", Mark: strength.FromMemory(80)}
	eqMomentMate  = Equation{Symbol: "μ", Text: "(1 - φ) m_e", Unit: strength.Length, Source: affdlSource + ", single shear: the mating lug's part of the moment", Mark: strength.FromMemory(80)}
	eqStiff       = Equation{Symbol: "k_s", Text: "E wT t^3 / (12 l_b)", Unit: strength.Moment, Source: "bending stiffness of the body out of its plane, fixed at its support", Mark: strength.Derived}
	eqStiffShare  = Equation{Symbol: "φ", Text: "k_s2 / (k_s1 + k_s2)", Unit: strength.None, Source: affdlSource + ", single shear: by the members' bending stiffness", Mark: strength.FromMemory(80)}
	eqPinSingle   = Equation{Symbol: "P_us", Text: "(Dp^2 - dp^2) F_su / 1.273", Unit: strength.Force, Source: affdlSource + ", single shear", Mark: strength.FromMemory(80)}
	eqPinNear     = Equation{Symbol: "f_2", Text: "t2/2 - μ_2", Unit: strength.Length, Source: affdlSource + ", single shear, M/(P t) up to 3/8: the pin's moment in the lug for each unit of load", Mark: strength.FromMemory(80)}
	eqPinFar      = Equation{Symbol: "f_2", Text: "(t2/2) (sqrt(1 + (2 μ_2/t2)^2) - 1)", Unit: strength.Length, Source: affdlSource + ", single shear, M/(P t) above 3/8: the pin's moment in the lug for each unit of load", Mark: strength.FromMemory(80)}
	eqPinEither   = Equation{Symbol: "f", Text: "max(f_1, f_2)", Unit: strength.Length, Source: "the greater of the pin's moments in both lugs; between them it varies evenly", Mark: strength.Derived}
	eqPinExtremes = Equation{Symbol: "f", Text: "max(t2/2, t1/2, (t2/2) (sqrt(1 + (2 m_e/t2)^2) - 1), (t1/2) (sqrt(1 + (2 m_e/t1)^2) - 1))", Unit: strength.Length, Source: "how the lugs share the moment is not known: the greatest of the pin's moments at both extremes", Mark: strength.Derived}
	eqPinSingleM  = Equation{Symbol: "P_ub", Text: "k_b F_tu (Dp^4 - dp^4) / (10.19 Dp f)", Unit: strength.Force, Source: affdlSource + ", single shear", Mark: strength.FromMemory(80)}
	eqPinStress2  = Equation{Symbol: "f_b2", Text: "10.19 Dp P f_2 / (k_b (Dp^4 - dp^4))", Unit: strength.Stress, Source: affdlSource + ", single shear: the pin's bending stress in the lug, before factors", Mark: strength.FromMemory(80)}
	eqTangEcc     = Equation{Symbol: "P_t", Text: "F_tu wT t / (1 + 6 |o_b| / wT + 6 μ / t)", Unit: strength.Force, Source: "statics: tension of the body with the bending of the eccentric moment and of an offset hole", Mark: strength.Derived}
	singleOblique = strength.Say("the single shear of %s is for axial loads only", affdlSource)
)

// reverses is M/(P t) above which the lug's pressure on the pin reverses so far
// that the pin's moment is greatest inside the lug.
const reverses = 3.0 / 8

var affdlSingleEquations = []*Equation{
	&eqEccentric, &eqMomentWhole, &eqMomentLug, &eqMomentMate, &eqStiff, &eqStiffShare, &eqPinSingle, &eqPinNear, &eqPinFar,
	&eqPinEither, &eqPinExtremes, &eqPinSingleM, &eqPinStress2, &eqTangEcc,
}

// peak is where an eccentric moment adds to the even stress of a pull.
type peak uint8

const (
	peakBearing peak = iota
	peakSection
)

// peaked writes a strength; in single shear lowered by the eccentric moment
// over the thickness: F / (P/(b t) + 6 M/(k b t²)).
func (h *affdlHead) peaked(s *sheet, e *Equation, even float64, where peak) float64 {
	if !h.m.builder.joint.SingleShear {
		return s.apply(e, even)
	}
	name, symbol, t, ts := "bearing_peak_factor", "k_br", h.bearingLength(s), "t_b"
	if where == peakSection {
		name, symbol, t, ts = "section_bending_factor", "k_sec", h.thickness(s), "t"
	}
	k := s.option(symbol, h.m.number(name), "method_options."+h.m.method.ID+"."+name, strength.Given)
	own := *e
	own.Mark = strength.Weakest(e.Mark, strength.FromMemory(80))
	if s.recording() {
		own.Text = "(" + e.Text + ") / (1 + 6 μ / (" + symbol + " " + ts + "))"
		own.cited = e.source() + ", in single shear"
	}
	return s.apply(&own, even/(1+6*h.eccentricity(s)/(k*t)))
}

// straight lacks strengths that have no form in single shear.
func (m *affdl) straight(s *sheet) {
	if m.builder.joint.SingleShear {
		s.lack(singleOblique)
	}
}

// momentShare is the lug's share of the eccentric moment, where it is known:
// as given, or by the stiffness of both bodies.
func (m *affdl) momentShare(s *sheet) (share float64, known bool) {
	c := m.builder.joint.Clevis
	if c.MomentShare != nil {
		return s.input(memberClevis, "φ", *c.MomentShare, strength.None, fieldMomentShare), true
	}
	var stiffness [2]float64
	heads := [...]*part{m.builder.clevis, m.builder.lug}
	for _, p := range heads {
		if p.head.BodyLength == 0 || p.head.Material.E == 0 {
			return 0, false
		}
	}
	for i, p := range heads {
		e := eqStiff
		e.Symbol = [...]string{"k_s1", "k_s2"}[i]
		back := s.under(p.member)
		length := s.input(p.member, "l_b", p.head.BodyLength, strength.Length, p.first+fieldBodyLength)
		t := p.thickness(s)
		stiffness[i] = s.apply(&e, p.property(s, strength.E)*p.bodyWidth(s)*float64(t*t*t)/(12*length))
		back()
	}
	return s.apply(&eqStiffShare, stiffness[1]/(stiffness[0]+stiffness[1])), true
}

// wholeMoment is the moment of both lugs for each N of load, in mm.
func (m *affdl) wholeMoment(s *sheet) float64 {
	c := m.builder.joint.Clevis
	t1 := s.input(memberClevis, "t1", c.Thickness, strength.Length, fieldsOfHead+fieldThickness)
	t2 := s.input(memberLug, "t2", m.builder.joint.Lug.Thickness, strength.Length, fieldThickness)
	g := s.input(memberClevis, "g", c.Gap, strength.Length, fieldGap)
	return s.apply(&eqEccentric, (t2+t1)/2+g)
}

// eccentricity is the moment in a head for each N of load, in mm.
func (h *affdlHead) eccentricity(s *sheet) float64 {
	whole := h.m.wholeMoment(s)
	share, known := h.m.momentShare(s)
	switch {
	case !known:
		return s.apply(&eqMomentWhole, whole)
	case h.member == memberLug:
		return s.apply(&eqMomentLug, share*whole)
	}
	return s.apply(&eqMomentMate, (1-share)*whole)
}

// eccentricTang is the tension that the body bears in single shear, in N.
func (h *affdlHead) eccentricTang(s *sheet) float64 {
	ftu, wt, t := h.property(s, strength.Ftu), h.bodyWidth(s), h.thickness(s)
	offset := 0.0
	if h.head.Offset != 0 {
		s.read.add(h.first + fieldRestrained)
	}
	if h.bends() {
		offset = h.offset(s)
	}
	mu := h.eccentricity(s)
	e := eqTangEcc
	if s.recording() {
		e.Text = "F_tu wT t / (1 + 6 μ / t)"
		if h.bends() {
			e.Text = "F_tu wT t / (1 + 6 |o| / wT + 6 μ / t)"
		}
	}
	return s.apply(&e, ftu*wt*t/(1+6*offset/wt+6*mu/t))
}

// pinMoment is the greatest moment of the pin inside one lug for each N of
// load, in mm: t its thickness, mu the moment that the lug takes.
func pinMoment(t, mu float64) float64 {
	if mu <= reverses*t {
		return t/2 - mu
	}
	return t / 2 * (math.Hypot(1, 2*mu/t) - 1)
}

// singleShearPin adds the pin's checks.
func (m *affdl) singleShearPin() {
	beam := m.beam()
	p := &affdlPin{m: m, beam: beam}
	m.check(memberPin, strength.PinShear, strength.Ultimate, strength.Force, strength.ByRegulation, &eqPinSingle, func(s *sheet) law {
		d, bore := beam.diameters(s)
		return fixed(anyWay, s.allow(eqPinSingle.Symbol, s.apply(&eqPinSingle, (float64(d*d)-float64(bore*bore))*beam.property(s, strength.Fsu)/1.273)))
	})
	m.check(memberPin, strength.PinBending, strength.Ultimate, strength.Force, strength.ByRegulation, &eqPinSingleM, func(s *sheet) law {
		d, bore := beam.diameters(s)
		t1, t2 := m.clevis.head.Thickness, m.lug.head.Thickness
		whole := m.wholeMoment(s)
		share, known := m.momentShare(s)
		var f, f2 float64
		if known {
			mu2, mu1 := share*whole, (1-share)*whole
			f1 := m.pinMomentIn(s, "1", t1, mu1)
			f2 = m.pinMomentIn(s, "2", t2, mu2)
			f = s.apply(&eqPinEither, max(f1, f2))
		} else {
			f = s.apply(&eqPinExtremes, max(t2/2, t1/2, pinMoment(t2, whole), pinMoment(t1, whole)))
		}
		k := p.plastic(s)
		fourth := float64(d*d*d*d) - float64(bore*bore*bore*bore)
		allowable := s.allow(eqPinSingleM.Symbol, s.apply(&eqPinSingleM, k*beam.property(s, strength.Ftu)*fourth/(10.19*d*f)))
		l := fixed(anyWay, allowable)
		if known {
			l.trace = func(s *sheet, l *load) { s.apply(&eqPinStress2, 10.19*d*l.Force*f2/(k*fourth)) }
		}
		return l
	})
}

// pinMomentIn writes the pin's moment inside one lug.
func (m *affdl) pinMomentIn(s *sheet, lug string, t, mu float64) float64 {
	e, share := eqPinNear, eqMomentLug
	if mu > reverses*t {
		e = eqPinFar
	}
	if lug == "1" {
		share = eqMomentMate
	}
	share.Symbol = "μ_" + lug
	s.apply(&share, mu)
	if lug == "1" {
		e.Symbol = "f_1"
		e.Text = strings.ReplaceAll(strings.ReplaceAll(e.Text, "t2", "t1"), "μ_2", "μ_1")
	}
	return s.apply(&e, pinMoment(t, mu))
}

package lug

import (
	"math"

	"jointledger/strength"
)

// melconHoblit1 is the method of Melcon and Hoblit on curves that a reader has
// registered: none is built in.
var melconHoblit1 = Method{
	ID: "melcon-hoblit", Revision: 1,
	Title:  "Melcon and Hoblit, lugs and shear pins",
	Source: "F. M. Hoblit and M. A. Melcon, Product Engineering 1950 and 1953; Bruhn section D1; NASA TM X-73305 section B2",
	Range:  "a curve set of the caller; pulls and transverse loads up to 90° from the axis; charts within their points; symmetric joints",
	Mark:   weakestMark(melconEquations),
	Modes: []strength.Mode{
		strength.NetSection, strength.ShearBearing, strength.Transverse, strength.Oblique, strength.BushingBearing,
		strength.Tang, strength.BodyBending, strength.PinShear, strength.PinBending, strength.PinCombined,
	},
	Options: []Option{
		{Name: "curve_set", Meaning: "the charts Kbr, Kt, C or Kbry, Ktru, Ktry and gamma as their reader read them", Kind: CurveSetRef},
		{Name: "material_curve", Meaning: "the number of the curve to take from charts with one curve for each material", Kind: Word, Requires: "a curve set with such charts"},
		{Name: "cut_off", Meaning: "K_br is not taken above 2.0: aluminium plate, bar and hand forging of 0.5 in and more", Kind: Flag, Default: Value{Flag: true}, HasDefault: true},
		{Name: "peaking_factor", Meaning: "γ of the pin's bending, by which its load peaks toward the shear faces; without it from the chart gamma, or 1", Kind: Number, Least: 0.01, Most: 1, Requires: "pin and clevis"},
		{
			Name: "pin_bending_factor", Meaning: "ultimate moment of the pin over its elastic one, k_b: 1 elastic, 1.7 fully plastic",
			Kind: Number, Default: Value{Number: 1}, HasDefault: true, Least: 1, Most: 1.7, Requires: "pin and clevis",
		},
	},
	Equations: melconEquations,
	prepare:   prepareMelcon,
}

const (
	melconSource = "Bruhn section D1"
	nasaSource   = "NASA TM X-73305 section B2"
	bearingLimit = 2.0  // cut-off of K_br
	bushingOver  = 1.85 // bushing bearing over Fcy
)

var (
	eqWidthRatio  = Equation{Symbol: "W/D", Text: "2 c1 / D", Unit: strength.None, Source: geometrySource + ": of the least side", Mark: strength.Derived}
	eqMHFactor    = Equation{Symbol: "K_br'", Text: "min(K_br, 2.0)", Unit: strength.None, Source: melconSource + ": cut-off of aluminium plate, bar and hand forging of 0.5 in and more", Mark: strength.FromMemory(90)}
	eqMHBearing   = Equation{Symbol: "P_bru", Text: "K_br Db t_b F_tu,cross", Unit: strength.Force, Source: melconSource, Mark: strength.FromMemory(98)}
	eqMHBearingK  = Equation{Symbol: "P_bru", Text: "K_br' Db t_b F_tu,cross", Unit: strength.Force, Source: melconSource, Mark: strength.FromMemory(90)}
	eqMHTension   = Equation{Symbol: "P_tu", Text: "K_t A_net F_tu", Unit: strength.Force, Source: melconSource, Mark: strength.FromMemory(98)}
	eqMHLug       = Equation{Symbol: "P_u", Text: "min(P_bru, P_tu)", Unit: strength.Force, Source: melconSource, Mark: strength.FromMemory(95)}
	eqMHYieldAt   = Equation{Symbol: "x_C", Text: "P_u / (D t F_tu,cross)", Unit: strength.None, Source: melconSource, Mark: strength.FromMemory(95)}
	eqMHYield     = Equation{Symbol: "P_y", Text: "C (F_ty,cross / F_tu,cross) P_u", Unit: strength.Force, Source: melconSource, Mark: strength.FromMemory(95)}
	eqMHYieldN    = Equation{Symbol: "P_bry", Text: "K_bry Db t_b F_ty,cross", Unit: strength.Force, Source: nasaSource, Mark: strength.FromMemory(92)}
	eqMHBushing   = Equation{Symbol: "P_B", Text: "1.85 F_cy Dp t_b", Unit: strength.Force, Source: melconSource + ", at limit", Mark: strength.FromMemory(90)}
	eqMHAreas     = Equation{Symbol: "Aav/Abr", Text: "h_av / D", Unit: strength.None, Source: melconSource + ": section areas are depths times the thickness", Mark: strength.FromMemory(95)}
	eqMHAcross    = Equation{Symbol: "P_tru", Text: "K_tru D t_b F_tu,cross", Unit: strength.Force, Source: melconSource + ", transverse load", Mark: strength.FromMemory(95)}
	eqMHAcrossY   = Equation{Symbol: "P_try", Text: "K_try D t_b F_ty,cross", Unit: strength.Force, Source: melconSource + ", transverse load", Mark: strength.FromMemory(95)}
	eqMHOblique   = Equation{Symbol: "P_α", Text: "1 / ((|cosα| / P_u)^1.6 + (|sinα| / P_tru)^1.6)^0.625", Unit: strength.Force, Source: melconSource + ": Ra^1.6 + Rtr^1.6 = 1", Mark: strength.FromMemory(95)}
	eqMHObliqueY  = Equation{Symbol: "P_αy", Text: "1 / ((|cosα| / P_y)^1.6 + (|sinα| / P_try)^1.6)^0.625", Unit: strength.Force, Source: melconSource + ": Ra^1.6 + Rtr^1.6 = 1, at yield", Mark: strength.FromMemory(92)}
	eqMHPeakArm   = Equation{Symbol: "m", Text: "λ (t1/2 + g + γ λ t2/2)", Unit: strength.Length, Source: melconSource + ": with λ = 1/2 the arm is (t1/2 + g + γ t2/4)/2", Mark: strength.FromMemory(92)}
	eqMHGammaAt   = Equation{Symbol: "x_γ", Text: "P_u / (D t F_tu,cross)", Unit: strength.None, Source: melconSource + ", peaking", Mark: strength.FromMemory(85)}
	eqMHGammaEdge = Equation{Symbol: "r_γ", Text: "(e - D/2) / t", Unit: strength.None, Source: melconSource + ", peaking", Mark: strength.FromMemory(85)}
)

var melconEquations = gather(geometryEquations, []*Equation{
	&eqHoleRatio, &eqWidthRatio, &eqMHFactor, &eqMHBearing, &eqMHBearingK, &eqMHTension, &eqMHLug, &eqMHYieldAt, &eqMHYield, &eqMHYieldN,
	&eqMHBushing, &eqMHAreas, &eqMHAcross, &eqMHAcrossY, &eqMHOblique, &eqMHObliqueY, &eqMHPeakArm, &eqMHGammaAt, &eqMHGammaEdge,
}, depthEquations, bodyEquations, pinEquations)

// melcon is the method at work on one joint.
type melcon struct {
	*builder
	charts *charts
}

// melconHead is a head with its strengths settled, in N on the head itself, by
// level (limit, ultimate).
type melconHead struct {
	*part
	m           *melcon
	along       [2]result
	across      [2][2]result // and toward +y and -y
	alongPower  [2]float64
	acrossPower [2][2]float64
}

func prepareMelcon(b *builder) {
	m := &melcon{builder: b, charts: b.charts()}
	for _, p := range b.heads() {
		h := m.settleHead(p)
		m.head(h)
		if p == b.lug && b.joint.Pin != nil && b.joint.Clevis != nil {
			defer m.pin(h)
		}
	}
}

func (m *melcon) settleHead(p *part) *melconHead {
	h := &melconHead{part: p, m: m}
	h.along = [2]result{m.settle(h.yields), m.settle(h.ultimate)}
	for level, write := range [...]func(*sheet, int) float64{h.acrossYield, h.acrossUltimate} {
		for hand := range 2 {
			h.across[level][hand] = m.settle(func(s *sheet) float64 { return write(s, hand) })
			h.acrossPower[level][hand] = math.Pow(h.across[level][hand].value, -interactionPower)
		}
		h.alongPower[level] = math.Pow(h.along[level].value, -interactionPower)
	}
	return h
}

// head adds the checks of one head.
func (m *melcon) head(h *melconHead) {
	m.pulled(h, strength.NetSection, strength.Ultimate, &eqMHTension, h.tension)
	m.pulled(h, strength.ShearBearing, strength.Ultimate, &eqMHBearing, h.bearing)
	set := m.charts.set
	_, byC := m.chart("C")
	_, byK := m.chart("Kbry")
	if byC || !byK {
		m.pulled(h, strength.ShearBearing, strength.Limit, &eqMHYield, h.yieldByC)
	}
	if set != nil && byK {
		m.pulled(h, strength.ShearBearing, strength.Limit, &eqMHYieldN, h.yieldByK)
	}
	for level, at := range levels {
		ends := [...]*Equation{&eqMHAcrossY, &eqMHAcross}
		m.directed(h, strength.Transverse, at, acrossOnly, ends[level])
		ends = [...]*Equation{&eqMHObliqueY, &eqMHOblique}
		m.directed(h, strength.Oblique, at, oblique, ends[level])
	}
	if h.bushing != nil {
		m.check(h.bushingMember, strength.BushingBearing, strength.Limit, strength.Force, strength.ByRegulation, &eqMHBushing, func(s *sheet) law {
			s.read.add(h.first + fieldBushing)
			fcy := s.property(h.bushingMember, &h.bushing.Material, strength.Fcy, string(strength.Fcy))
			return fixed(anyWay, h.allow(s, eqMHBushing.Symbol, s.apply(&eqMHBushing, bushingOver*fcy*h.pinDiameter(s)*h.bearingLength(s))))
		})
	}
	m.body(h.part)
}

func (m *melcon) chart(name string) (Chart, bool) {
	if m.charts.set == nil {
		return Chart{}, false
	}
	c, ok := m.charts.set.Charts[name]
	return c, ok
}

// needs lacks everything without a curve set, and in single shear.
func (h *melconHead) needs(s *sheet) {
	h.m.bearsStraight(s)
	if h.m.charts.set == nil {
		s.lack(strength.Say("no curve set is built in for melcon-hoblit: register one with the charts Kbr, Kt, C or Kbry, Ktru and Ktry, and name it as the option curve_set"))
	}
}

var pushes = strength.Say("melcon-hoblit publishes no strength for a load that pushes into the body")

// pulled adds a check of a pull along the axis; a push has no published
// strength.
func (m *melcon) pulled(h *melconHead, mode strength.Mode, level strength.Level, e *Equation, write func(*sheet) float64) {
	m.check(h.member, mode, level, strength.Force, strength.ByRegulation, e, func(s *sheet) law {
		k := fixed(along, h.allow(s, e.Symbol, write(s)))
		k.along[1] = allowable{why: &pushes}
		return k
	})
}

// directed adds a check of a load with a transverse part.
func (m *melcon) directed(h *melconHead, mode strength.Mode, level strength.Level, on sides, e *Equation) {
	i := levelIndex(level)
	m.check(h.member, mode, level, strength.Force, strength.ByRegulation, e, func(s *sheet) law {
		s.rest(h.across[i][0])
		s.rest(h.across[i][1])
		if on == oblique {
			s.rest(h.along[i])
		}
		return law{
			sides: on,
			margin: func(l *load, factor float64) strength.Margin {
				value, why := h.strengthAt(l, i)
				if why != nil {
					return strength.Unknown(why)
				}
				return strength.Compare(factor*l.Force, value/h.share)
			},
			trace: func(s *sheet, l *load) {
				along, across := h.ultimate, h.acrossUltimate
				if level == strength.Limit {
					along, across = h.yields, h.acrossYield
				}
				value := across(s, l.hand)
				if on == oblique {
					along(s)
					s.apply(&eqCos, l.cos)
					s.apply(&eqSin, l.sin)
					value, _ = h.strengthAt(l, i)
					s.apply(e, value)
				}
				h.allow(s, e.Symbol, value)
			},
		}
	})
}

// strengthAt is the strength of the head under a load with a transverse part,
// in N on the head.
func (h *melconHead) strengthAt(l *load, level int) (float64, *strength.Message) {
	a, t := &h.along[level], &h.across[level][l.hand]
	switch {
	case l.sides&push != 0:
		return 0, &pushes
	case t.why != nil:
		return 0, t.why
	case l.sides == acrossOnly:
		return t.value, nil
	case a.why != nil:
		return 0, a.why
	}
	return math.Pow(float64(l.axialPower*h.alongPower[level])+float64(l.acrossPower*h.acrossPower[level][l.hand]), -1/interactionPower), nil
}

// read takes a factor from a chart of the set, if there is one.
func (h *melconHead) read(s *sheet, chart, symbol string, a spot) float64 {
	h.needs(s)
	if !s.known() {
		return 0
	}
	return h.m.charts.read(s, chart, symbol, a)
}

// edgeSpot is where charts along e/D are read.
func (h *melconHead) edgeSpot(s *sheet) spot {
	thickness := s.apply(&eqHoleRatio, h.hole(s)/h.thickness(s))
	return spot{
		x: h.shearRatio(s), along: "e/D", belowFirst: true,
		between: func(string) (float64, string) { return thickness, "D/t" },
	}
}

// bearing is P_bru, the shear-bearing strength.
func (h *melconHead) bearing(s *sheet) float64 {
	h.closeFit(s)
	k := h.read(s, "Kbr", "K_br", h.edgeSpot(s))
	e := &eqMHBearing
	if h.m.flag("cut_off") {
		e, k = &eqMHBearingK, s.apply(&eqMHFactor, min(k, bearingLimit))
	}
	return s.apply(e, k*h.bearingDiameter(s)*h.bearingLength(s)*h.property(s, strength.FtuCross))
}

// tension is P_tu, the net tension strength.
func (h *melconHead) tension(s *sheet) float64 {
	width := s.apply(&eqWidthRatio, 2*h.side(s)/h.hole(s))
	k := h.read(s, "Kt", "K_t", spot{x: width, along: "W/D"})
	return s.apply(&eqMHTension, k*h.netArea(s)*h.property(s, strength.Ftu))
}

// ultimate is P_u.
func (h *melconHead) ultimate(s *sheet) float64 {
	return s.apply(&eqMHLug, min(h.bearing(s), h.tension(s)))
}

// yields is P_y: by C where the set has it, else by K_bry.
func (h *melconHead) yields(s *sheet) float64 {
	if _, ok := h.m.chart("C"); !ok {
		if _, ok := h.m.chart("Kbry"); ok {
			e := eqMHLug
			e.Symbol, e.Text, e.Source = "P_y", "P_bry", nasaSource
			e.cited = nasaSource
			return s.apply(&e, h.yieldByK(s))
		}
	}
	return h.yieldByC(s)
}

func (h *melconHead) yieldByC(s *sheet) float64 {
	ultimate := h.ultimate(s)
	ftu, fty := h.property(s, strength.FtuCross), h.property(s, strength.FtyCross)
	c := h.readWith(s, "C", "C", ftu, ultimate)
	return s.apply(&eqMHYield, c*(fty/ftu)*ultimate)
}

// readWith reads the chart C at P_u / (D t Ftux).
func (h *melconHead) readWith(s *sheet, chart, symbol string, ftu, ultimate float64) float64 {
	if !s.known() {
		return 0
	}
	x := s.apply(&eqMHYieldAt, ultimate/(h.hole(s)*h.thickness(s)*ftu))
	return h.read(s, chart, symbol, spot{x: x, along: "Pu/(D t Ftux)"})
}

func (h *melconHead) yieldByK(s *sheet) float64 {
	h.closeFit(s)
	k := h.read(s, "Kbry", "K_bry", h.edgeSpot(s))
	return s.apply(&eqMHYieldN, k*h.bearingDiameter(s)*h.bearingLength(s)*h.property(s, strength.FtyCross))
}

func (h *melconHead) acrossUltimate(s *sheet, hand int) float64 {
	return h.acrossBy(s, hand, "Ktru", "K_tru", strength.FtuCross, &eqMHAcross)
}

func (h *melconHead) acrossYield(s *sheet, hand int) float64 {
	return h.acrossBy(s, hand, "Ktry", "K_try", strength.FtyCross, &eqMHAcrossY)
}

func (h *melconHead) acrossBy(s *sheet, hand int, chart, symbol string, p strength.Property, e *Equation) float64 {
	h.closeFit(s)
	hole := h.hole(s)
	k := h.read(s, chart, symbol, spot{x: s.apply(&eqMHAreas, h.depth(s, hand)/hole), along: "Aav/Abr"})
	return s.apply(e, k*hole*h.bearingLength(s)*h.property(s, p))
}

// pin adds the pin's checks.
func (m *melcon) pin(lug *melconHead) {
	beam := m.beam()
	m.pinShear(beam)
	k, source := m.pinFactor()
	beam.peak = func(s *sheet) float64 { return m.peaking(s, lug) }
	m.pinBending(beam, k, source, strength.Derived)
	if !m.joint.SingleShear {
		m.pinCombined(beam, k, source, strength.Derived)
	}
}

// peaking is γ: as given, from its chart, or 1.
func (m *melcon) peaking(s *sheet, lug *melconHead) float64 {
	m.bearsStraight(s)
	if v, ok := m.choice.Options["peaking_factor"]; ok {
		return s.option("γ", v.Number, "method_options.melcon-hoblit.peaking_factor", strength.Given)
	}
	if _, ok := m.chart("gamma"); !ok {
		return s.option("γ", 1, "no peaking: neither the option peaking_factor nor a chart gamma is given", strength.Derived)
	}
	defer s.under(memberLug)()
	ultimate := lug.ultimate(s)
	if !s.known() {
		return 0
	}
	x := s.apply(&eqMHGammaAt, ultimate/(lug.hole(s)*lug.thickness(s)*lug.property(s, strength.FtuCross)))
	r := s.apply(&eqMHGammaEdge, (lug.edge(s)-lug.hole(s)/2)/lug.thickness(s))
	return lug.read(s, "gamma", "γ", spot{
		x: x, along: "Pu/(D t Ftux)", between: func(string) (float64, string) { return r, "r_γ" },
	})
}

package lug

import (
	"math"

	"jointledger/strength"
)

// affdl1 is chapter 9 of the Stress Analysis Manual: lugs of at least 5 %
// elongation under loads of any direction, bushings, and the whole joint with a
// pin that may bend.
var affdl1 = Method{
	ID: "affdl-tr-69-42", Revision: 1,
	Title:  "Stress Analysis Manual, chapter 9: lugs and pinned joints",
	Source: "AFFDL-TR-69-42, chapter 9; equations from memory (92 to 97 %) with their algebra derived again, equation numbers from memory (70 %)",
	Range:  "materials of at least 5 % elongation; charts within their curve set; pin at least 0.95 of an unbushed hole; single shear under axial loads only",
	Mark:   weakestMark(affdlEquations),
	Modes: []strength.Mode{
		strength.NetSection, strength.Bearing, strength.Transverse, strength.Oblique, strength.Yielding, strength.BushingBearing,
		strength.Tang, strength.BodyBending, strength.PinShear, strength.PinBending, strength.PinCombined, strength.WholeJoint,
	},
	Options: []Option{
		{
			Name: "curve_set", Meaning: "the charts K, Kn, Ktru and Ktry as their reader read them",
			Kind: CurveSetRef, Default: Value{Set: derived1}, HasDefault: true,
		},
		{
			Name: "material_curve", Meaning: "the number of the curve to take from charts with one curve for each material",
			Kind: Word, Requires: "a curve set with such charts",
		},
		{
			Name: "pin_bending_factor", Meaning: "ultimate moment of the pin over its elastic one, k_b; without it 1.56 for a pin of at least 5 % elongation and 1 for any other",
			Kind: Number, Least: 1, Most: 1.7, Requires: "pin and clevis",
		},
		{
			Name: "bearing_peak_factor", Meaning: "k_br of the bearing that an eccentric moment adds: 1 elastic, 1.5 fully plastic",
			Kind: Number, Default: Value{Number: 1}, HasDefault: true, Least: 1, Most: 1.5, Requires: "single shear",
		},
		{
			Name: "section_bending_factor", Meaning: "k_b of the net section under an eccentric moment: 1 elastic, 1.5 fully plastic",
			Kind: Number, Default: Value{Number: 1}, HasDefault: true, Least: 1, Most: 1.5, Requires: "single shear",
		},
	},
	Equations: affdlEquations,
	prepare:   prepareAffdl,
}

const affdlSource = "AFFDL-TR-69-42 chapter 9"

// Limits of the method.
const (
	ductile   = 0.05  // least elongation of a lug, and of a reasonably ductile pin
	fullEdge  = 1.5   // e/D from which the end no longer matters
	oneCurve  = 5.0   // D/t at most, of figure 9-2
	yieldOver = 1.304 // ultimate over yield strength allowed: 1.5 / 1.15
	capMatter = 1.25  // e/D above which derived K needs the handbook's cap

	// interactionPower is the exponent of oblique loads.
	interactionPower = 1.6
)

var (
	eqEndRatio    = Equation{Symbol: "a", Text: "e - D/2", Unit: strength.Length, Source: geometrySource + ": hole to end", Mark: strength.Derived}
	eqEndTapered  = Equation{Symbol: "a", Text: "e_s - D/2", Unit: strength.Length, Source: geometrySource + ": hole to the end of the round head that stands for a tapered one", Mark: strength.Derived}
	eqHoleRatio   = Equation{Symbol: "D/t", Text: "D / t", Unit: strength.None, Source: geometrySource, Mark: strength.Derived}
	eqSideRatio   = Equation{Symbol: "D/W", Text: "D / (2 c1)", Unit: strength.None, Source: geometrySource + ": of the least side", Mark: strength.Derived}
	eqYieldRatio  = Equation{Symbol: "y", Text: "1.304", Unit: strength.None, Source: affdlSource + ", equation 9-3: 1.5 / 1.15", Mark: strength.FromMemory(97)}
	eqYieldLower  = Equation{Symbol: "y", Text: "u / 1.15", Unit: strength.None, Source: affdlSource + ", equation 9-3, for an ultimate factor below 1.5", Mark: strength.Derived}
	eqBearShort   = Equation{Number: "9-1", Symbol: "F_bru.L", Text: "K (a/D) F_tu,cross", Unit: strength.Stress, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBearLong    = Equation{Number: "9-2", Symbol: "F_bru.L", Text: "K F_tu,cross", Unit: strength.Stress, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBearYShort  = Equation{Number: "9-1", Symbol: "F_bry.L", Text: "K (a/D) F_ty,cross", Unit: strength.Stress, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBearYLong   = Equation{Number: "9-2", Symbol: "F_bry.L", Text: "K F_ty,cross", Unit: strength.Stress, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBearStress  = Equation{Number: "9-3", Symbol: "F_br,u", Text: "min(F_bru.L, y F_bry.L, F_bru, y F_bry)", Unit: strength.Stress, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBearYStress = Equation{Symbol: "F_br,y", Text: "min(F_bry.L, F_bry)", Unit: strength.Stress, Source: affdlSource + ": bearing yield, not above the handbook's", Mark: strength.FromMemory(92)}
	eqBearStrong  = Equation{Number: "9-3", Symbol: "P_bru.L", Text: "F_br,u Db t_b", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBearYield   = Equation{Symbol: "P_bry.L", Text: "F_br,y Db t_b", Unit: strength.Force, Source: affdlSource + ": bearing yield at limit", Mark: strength.FromMemory(92)}
	eqBearPush    = Equation{Symbol: "P_br.L", Text: "F_br,u Db t_b", Unit: strength.Force, Source: "bearing into the body, K of e/D 1.5: derived, no published source", Mark: strength.Derived}
	eqBearYPush   = Equation{Symbol: "P_bry.L", Text: "F_br,y Db t_b", Unit: strength.Force, Source: "bearing into the body, K of e/D 1.5: derived, no published source", Mark: strength.Derived}
	eqNetFactor   = Equation{Symbol: "r", Text: "F_ty / F_tu", Unit: strength.None, Source: affdlSource + ", figure 9-4", Mark: strength.FromMemory(95)}
	eqNetStrain   = Equation{Symbol: "q", Text: "F_tu / (E elongation)", Unit: strength.None, Source: affdlSource + ", figure 9-4, the elongation standing for the ultimate strain", Mark: strength.FromMemory(92)}
	eqNetU        = Equation{Number: "9-4", Symbol: "F_nu.L", Text: "K_n F_tu", Unit: strength.Stress, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqNetY        = Equation{Number: "9-5", Symbol: "F_ny.L", Text: "K_n F_ty", Unit: strength.Stress, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqNetStrong   = Equation{Number: "9-6", Symbol: "P_nu.L", Text: "min(F_nu.L, y F_ny.L) A_net", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqNetYieldL   = Equation{Number: "9-5", Symbol: "P_ny.L", Text: "F_ny.L A_net", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqLugStrong   = Equation{Number: "9-7", Symbol: "P_u.L", Text: "min(P_bru.L, P_nu.L)", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBushU       = Equation{Number: "9-9", Symbol: "P_u.B", Text: "y F_cy Dp t_b", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(95)}
	eqBushY       = Equation{Number: "9-8", Symbol: "P_y.B", Text: "F_cy Dp t_b", Unit: strength.Force, Source: affdlSource, Mark: strength.FromMemory(95)}

	eqCrossRatio = Equation{Symbol: "r_x", Text: "F_ty,cross / F_tu,cross", Unit: strength.None, Source: affdlSource + ", figure 9-8", Mark: strength.Derived}
	eqDepthRatio = Equation{Symbol: "hav/D", Text: "h_av / D", Unit: strength.None, Source: affdlSource + ", figure 9-8", Mark: strength.FromMemory(95)}
	eqTransverse = Equation{Symbol: "P_tru.L", Text: "min(K_tru F_tu,cross, y K_try F_ty,cross) D t_b", Unit: strength.Force, Source: affdlSource + ", transverse load", Mark: strength.FromMemory(95)}
	eqOblique    = Equation{Symbol: "P_α", Text: "P_u.L / (|cosα|^1.6 + (P_u.L / P_tru.L)^1.6 |sinα|^1.6)^0.625", Unit: strength.Force, Source: affdlSource + ", oblique load", Mark: strength.FromMemory(95)}
	eqObliqueIn  = Equation{Symbol: "P_α", Text: "1 / ((|cosα| / P_br.L)^1.6 + (|sinα| / P_tru.L)^1.6)^0.625", Unit: strength.Force, Source: "oblique load into the body: derived, no published source", Mark: strength.Derived}
)

var affdlEquations = gather(geometryEquations, []*Equation{
	&eqEndRatio, &eqEndTapered, &eqHoleRatio, &eqSideRatio, &eqYieldRatio, &eqYieldLower, &eqRatioFull, &eqRatioFrom, &eqHandbookLine,
	&eqBearShort, &eqBearLong, &eqBearYShort, &eqBearYLong, &eqBearStress, &eqBearYStress, &eqBearStrong, &eqBearYield, &eqBearPush, &eqBearYPush,
	&eqNetFactor, &eqNetStrain, &eqNetU, &eqNetY, &eqNetStrong, &eqNetYieldL, &eqLugStrong, &eqBushU, &eqBushY,
	&eqCrossRatio, &eqDepthRatio, &eqTransverse,
	&eqOblique, &eqObliqueIn,
}, depthEquations, bodyEquations, affdlJointEquations, affdlSingleEquations, pressEquations)

// affdl is the method at work on one joint.
type affdl struct {
	*builder
	charts      *charts
	lug, clevis *affdlHead // clevis nil without one
}

// affdlHead is a head with its strengths settled, in N on the head itself.
type affdlHead struct {
	*part
	m *affdl
	// By level (limit, ultimate) and way (pull, push), net section of a pull.
	bearing [2][2]result
	net     [2]result
	along   [2]result // ultimate, of a pull and of a push
	across  [2]result // ultimate, of a transverse load toward +y and -y
	lining  result    // the bushing's ultimate
	// The strengths to the power -1.6.
	alongPower, acrossPower [2]float64
}

func prepareAffdl(b *builder) {
	m := &affdl{builder: b, charts: b.charts()}
	m.sayYieldRatio()
	m.lug = m.settleHead(b.lug)
	m.head(m.lug)
	m.tangCheck(m.lug, nil)
	var pin *affdlPin
	if b.clevis != nil {
		m.clevis = m.settleHead(b.clevis)
		m.head(m.clevis)
		switch {
		case b.joint.Pin == nil:
		case b.joint.SingleShear:
			m.singleShearPin()
		default:
			pin = m.pin()
		}
		m.tangCheck(m.clevis, pin)
	}
	if pin != nil {
		m.joint(pin)
	}
}

func (m *affdl) sayYieldRatio() {
	u := m.factors.Ultimate
	switch {
	case strength.Less(u, 1.5):
		m.found.add(strength.Note, "yield-ratio", m.name, affdlSource,
			"the manual's 1.304 is 1.5/1.15; with an ultimate factor of %.6g it becomes %.6g", u, u/1.15)
	case strength.More(u, 1.5):
		m.found.add(strength.Note, "yield-ratio", m.name, affdlSource,
			"the manual's 1.304 is 1.5/1.15; it is kept with the larger ultimate factor of %.6g, on the safe side", u)
	}
}

// settleHead finds the strengths of a head in each direction.
func (m *affdl) settleHead(p *part) *affdlHead {
	h := &affdlHead{part: p, m: m}
	for way := range 2 {
		h.bearing[1][way], h.bearing[0][way] = m.settleBoth(func(s *sheet) (float64, float64) { return h.bears(s, way) })
	}
	h.net[1], h.net[0] = m.settleBoth(h.nets)
	h.along[0] = h.bearing[1][0].lesser(h.net[1])
	h.along[1] = h.bearing[1][1]
	for hand := range h.across {
		if hand == 1 && p.head.Offset == 0 {
			h.across[1] = h.across[0]
			continue
		}
		h.across[hand] = m.settle(func(s *sheet) float64 { return h.transverse(s, hand) })
	}
	for i := range 2 {
		h.alongPower[i] = math.Pow(h.along[i].value, -interactionPower)
		h.acrossPower[i] = math.Pow(h.across[i].value, -interactionPower)
	}
	if p.bushing != nil {
		h.lining = m.settle(h.liningStrength)
	}
	return h
}

// head adds the checks of one head.
func (m *affdl) head(h *affdlHead) {
	for level, at := range levels {
		m.netCheck(h, at, &h.net[level])
		m.bearingCheck(h, at, &h.bearing[level])
	}
	m.transverseCheck(h)
	m.obliqueCheck(h)
	m.lining(h)
	m.bodyBendingCheck(h.part)
	m.pressFit(h)
}

// netCheck adds the net section under a pull.
func (m *affdl) netCheck(h *affdlHead, level strength.Level, net *result) {
	end := [2]*Equation{&eqNetYieldL, &eqNetStrong}[levelIndex(level)]
	m.check(h.member, strength.NetSection, level, strength.Force, strength.ByRegulation, end, func(s *sheet) law {
		s.rest(*net)
		return law{
			sides: pullAlong, along: [2]allowable{net.over(h.share)},
			trace: func(s *sheet, _ *load) {
				ultimate, yield := h.nets(s)
				h.allow(s, end.Symbol, [...]float64{yield, ultimate}[levelIndex(level)])
			},
		}
	})
}

// bearingEnds are what the bearing of a pull and of a push ends in, by level.
var bearingEnds = [2][2]*Equation{{&eqBearYield, &eqBearYPush}, {&eqBearStrong, &eqBearPush}}

// bearingCheck adds the bearing under an axial load, a pull and a push.
func (m *affdl) bearingCheck(h *affdlHead, level strength.Level, ways *[2]result) {
	ends := &bearingEnds[levelIndex(level)]
	m.check(h.member, strength.Bearing, level, strength.Force, strength.ByRegulation, ends[0], func(s *sheet) law {
		s.rest(ways[0])
		s.rest(ways[1])
		return law{
			sides: along, along: [2]allowable{ways[0].over(h.share), ways[1].over(h.share)},
			trace: func(s *sheet, l *load) {
				ultimate, yield := h.bears(s, l.way)
				h.allow(s, ends[l.way].Symbol, [...]float64{yield, ultimate}[levelIndex(level)])
			},
		}
	})
}

// yieldRatio is what an ultimate strength may exceed the yield strength by.
func (m *affdl) yieldRatio(s *sheet) float64 {
	u := m.factors.Ultimate
	if !strength.Less(u, 1.5) {
		return s.apply(&eqYieldRatio, yieldOver)
	}
	s.input("", "u", u, strength.None, fieldUltimate)
	return s.apply(&eqYieldLower, u/1.15)
}

// elongates lacks a strength of a material that is not ductile enough.
func (h *affdlHead) elongates(s *sheet) {
	value := h.property(s, strength.Elongation)
	if s.known() && strength.Less(value, ductile) {
		s.lack(strength.Say("the elongation of %q is %.4g: the method holds for at least %.4g", h.head.Material.Name, value, ductile))
	}
}

// bearingFactor is K of figure 9-2 (9-3 for D/t above 5) at an e/D.
func (h *affdlHead) bearingFactor(s *sheet, ratio float64) float64 {
	c := h.m.charts
	hole := h.hole(s)
	thickness := s.apply(&eqHoleRatio, hole/h.thickness(s))
	if c.set.builtIn {
		if wide := 2 * h.side(s) / hole; strength.Less(wide, derivedWide) {
			s.lack(strength.Say("W/D %.4g (of the least side) is below %.4g, the least for the derived K", wide, derivedWide))
		}
		fsu, ftu := h.property(s, strength.Fsu), h.property(s, strength.Ftu)
		if s.known() && strength.Less(fsu/ftu, derivedShear) {
			s.lack(strength.Say("F_su/F_tu %.4g is below %.4g, the least for the derived K", fsu/ftu, derivedShear))
		}
	}
	text := derivedKSlopes
	if ratio >= fullEdge {
		text = "1.335"
	}
	return c.read(s, "K", "K", spot{
		x: ratio, along: "e/D", belowFirst: true, text: text,
		between: func(string) (float64, string) { return thickness, "D/t" },
		singleFallback: func() {
			if strength.More(thickness, oneCurve) {
				s.lack(strength.Say("D/t %.4g is above %.4g, up to which one curve of K holds", thickness, oneCurve))
			}
		},
	})
}

// bearingStress writes F_bru.L and F_bry.L in MPa with their caps: the lesser
// of them at ultimate and at limit. A push bears into the body, with K of e/D
// 1.5 and no end to shear out.
func (h *affdlHead) bearingStress(s *sheet, way int) (ultimate, yield float64) {
	h.elongates(s)
	h.closeFit(s)
	ftu, fty := h.property(s, strength.FtuCross), h.property(s, strength.FtyCross)
	ratio, capAt, end := fullEdge, &eqRatioFull, 1.0
	if way == 0 {
		ratio = h.shearRatio(s)
	}
	long := strength.AtLeast(ratio, fullEdge)
	if long {
		ratio = max(ratio, fullEdge) // which it meets within the tolerance
	} else {
		capAt = &eqRatioFrom
		hole := h.hole(s)
		e := &eqEndRatio
		if h.head.Shape == Tapered {
			e = &eqEndTapered
		}
		end = s.apply(e, h.shearEdge(s)-hole/2) / hole
	}
	k := h.bearingFactor(s, ratio)
	equation, equationY := &eqBearShort, &eqBearYShort
	if long {
		equation, equationY = &eqBearLong, &eqBearYLong
	}
	ultimate = s.apply(equation, k*end*ftu)
	yield = s.apply(equationY, k*end*fty)
	over := h.m.yieldRatio(s)

	ultimate = min(ultimate, over*yield)
	handbook := func(p strength.Property) (float64, bool) {
		for _, b := range h.head.Material.Bearing {
			if b.Value(p) > 0 {
				before := s.why
				value := h.handbookBearing(s, p, capAt)
				if s.why == before {
					return value, true
				}
				s.why = before
				return 0, false
			}
		}
		return 0, false
	}
	fbru, hasU := handbook(strength.Fbru)
	fbry, hasY := handbook(strength.Fbry)
	if hasU {
		ultimate = min(ultimate, fbru)
	}
	if hasY {
		ultimate, yield = min(ultimate, over*fbry), min(yield, fbry)
	}
	if !(hasU && hasY) && strength.More(ratio, capMatter) {
		s.find(strength.Warning, "cap-unknown", h.member, affdlSource,
			"the material %q has no handbook bearing values, above which the bearing strength of e/D %.4g must not go", h.head.Material.Name, ratio)
	}
	if !s.recording() {
		return s.apply(&eqBearStress, ultimate), s.apply(&eqBearYStress, yield)
	}
	e, ey := eqBearStress, eqBearYStress
	e.Text, ey.Text = "min(F_bru.L, y F_bry.L", "F_bry.L"
	if hasU {
		e.Text += ", F_bru"
	}
	if hasY {
		e.Text += ", y F_bry"
		ey.Text = "min(F_bry.L, F_bry)"
	}
	e.Text += ")"
	return s.apply(&e, ultimate), s.apply(&ey, yield)
}

// bears is the bearing strength of a pull or of a push, at ultimate and at
// limit, in N on the head.
func (h *affdlHead) bears(s *sheet, way int) (ultimate, yield float64) {
	ultimate, yield = h.bearingStress(s, way)
	area := h.bearingDiameter(s) * h.bearingLength(s)
	e, ey := &eqBearStrong, &eqBearYield
	if way == 1 {
		e, ey = &eqBearPush, &eqBearYPush
	}
	return h.peaked(s, e, ultimate*area, peakBearing), h.peaked(s, ey, yield*area, peakBearing)
}

// nets is the strength of the net section at ultimate and at limit, in N on
// the head.
func (h *affdlHead) nets(s *sheet) (ultimate, yield float64) {
	h.elongates(s)
	ftu, fty := h.property(s, strength.Ftu), h.property(s, strength.Fty)
	k := h.netFactor(s)
	ultimate, yield = s.apply(&eqNetU, k*ftu), s.apply(&eqNetY, k*fty)
	over, area := h.m.yieldRatio(s), h.netArea(s)
	return h.peaked(s, &eqNetStrong, min(ultimate, over*yield)*area, peakSection), h.peaked(s, &eqNetYieldL, yield*area, peakSection)
}

// netFactor is K_n of figure 9-4.
func (h *affdlHead) netFactor(s *sheet) float64 {
	c := h.m.charts
	c1 := h.side(s)
	width := s.apply(&eqSideRatio, h.hole(s)/(2*c1))
	if c.set.builtIn && strength.Less(h.edge(s), c1) {
		s.lack(strength.Say("the end is nearer to the hole centre, %v, than the side, %v: the derived Kn holds for heads at least as long as round ones", mm(h.head.EdgeDistance), mm(c1)))
	}
	r := func() float64 {
		return s.apply(&eqNetFactor, h.property(s, strength.Fty)/h.property(s, strength.Ftu))
	}
	q := func() float64 {
		return s.apply(&eqNetStrain, h.property(s, strength.Ftu)/(h.property(s, strength.E)*h.property(s, strength.Elongation)))
	}
	a := spot{x: width, along: "D/W", belowFirst: true, between: func(variable string) (float64, string) {
		if variable == "r" {
			return r(), "r"
		}
		return q(), "q"
	}}
	if chart, ok := c.set.Charts["Kn"]; ok {
		a.belowFirst = chart.Between != "r"
		return c.take(s, "Kn", &chart, "K_n", a)
	}
	if len(c.net) == 0 {
		s.lack(strength.Say("the curve set %s has no chart Kn", c.name))
		return 0
	}
	ratio := r()
	if !s.known() {
		return 0
	}
	return c.between(s, ratio, a)
}

var eqNetBetween = Equation{Symbol: "K_n", Text: "K_n1 + (K_n2 - K_n1) (r - r_1) / (r_2 - r_1)", Unit: strength.None, Source: "between the charts of two ratios r by straight line", Mark: strength.Derived}

// between takes K_n from the family of charts, by straight line between the two
// whose ratio r is next.
func (c *charts) between(s *sheet, r float64, a spot) float64 {
	first, last := c.net[0].r, c.net[len(c.net)-1].r
	if strength.Less(r, first) || strength.More(r, last) {
		s.lack(strength.Say("r = F_ty/F_tu of %.4g is outside %.4g to %.4g, the range of the charts Kn of curve set %s", r, first, last, c.name))
		return 0
	}
	k := 0
	for k < len(c.net)-1 && strength.More(r, c.net[k].r) {
		k++
	}
	hi := &c.net[k]
	if k == 0 || strength.AtLeast(r, hi.r) {
		return c.take(s, hi.name, &hi.chart, "K_n", a)
	}
	lo := &c.net[k-1]
	k1 := c.take(s, lo.name, &lo.chart, "K_n1", a)
	k2 := c.take(s, hi.name, &hi.chart, "K_n2", a)
	if s.recording() {
		s.option("r_1", lo.r, "curve set "+c.name+", chart "+lo.name, strength.Given)
		s.option("r_2", hi.r, "curve set "+c.name+", chart "+hi.name, strength.Given)
	}
	return s.apply(&eqNetBetween, k1+float64((r-lo.r)/(hi.r-lo.r)*(k2-k1)))
}

// pullStrength is P_u.L, pushStrength P_br.L, in N on the head.
func (h *affdlHead) pullStrength(s *sheet) float64 {
	bearing, _ := h.bears(s, 0)
	net, _ := h.nets(s)
	return s.apply(&eqLugStrong, min(bearing, net))
}

func (h *affdlHead) pushStrength(s *sheet) float64 {
	bearing, _ := h.bears(s, 1)
	return bearing
}

// transverse is P_tru.L in N on the head, of a load square to the axis.
func (h *affdlHead) transverse(s *sheet, hand int) float64 {
	h.m.straight(s)
	h.elongates(s)
	h.closeFit(s)
	ftu, fty := h.property(s, strength.FtuCross), h.property(s, strength.FtyCross)
	hole := h.hole(s)
	ratio := s.apply(&eqDepthRatio, h.depth(s, hand)/hole)
	read := func(chart, symbol, text string) float64 {
		if !s.known() {
			return 0
		}
		return h.m.charts.read(s, chart, symbol, spot{
			x: ratio, along: "hav/D", text: text,
			between: func(string) (float64, string) { return s.apply(&eqCrossRatio, fty/ftu), "r_x" },
		})
	}
	ultimate := read("Ktru", "K_tru", "min(min(0.90, 0.45 + 0.52 r_x) h_av/D, 0.85)")
	yield := read("Ktry", "K_try", "min(h_av/D, 1)")
	stress := min(ultimate*ftu, h.m.yieldRatio(s)*yield*fty)
	return s.apply(&eqTransverse, stress*hole*h.bearingLength(s))
}

// strengthAt is the strength of the head under a load, in N on the head.
//
// Oblique loads of a pull as published; the curve dips below P_tru before 90°
// and is not clamped. Into the body the same curve with the bearing strength
// of the body's side: derived, no published source.
func (h *affdlHead) strengthAt(l *load) (float64, *strength.Message) {
	a, t := &h.along[l.way], &h.across[l.hand]
	switch {
	case l.sides&along != 0:
		return a.value, a.why
	case l.sides == acrossOnly:
		return t.value, t.why
	case a.why != nil:
		return 0, a.why
	case t.why != nil:
		return 0, t.why
	}
	return math.Pow(float64(l.axialPower*h.alongPower[l.way])+float64(l.acrossPower*h.acrossPower[l.hand]), -1/interactionPower), nil
}

// traceAt writes the steps of strengthAt and returns the symbol of the strength.
func (h *affdlHead) traceAt(s *sheet, l *load) (symbol string, value float64) {
	if l.sides&transverse == 0 || l.sides&oblique != 0 {
		if l.way == 0 {
			symbol, value = eqLugStrong.Symbol, h.pullStrength(s)
		} else {
			symbol, value = eqBearPush.Symbol, h.pushStrength(s)
		}
	}
	if l.sides == acrossOnly || l.sides&oblique != 0 {
		symbol, value = eqTransverse.Symbol, h.transverse(s, l.hand)
	}
	if l.sides&oblique == 0 {
		return symbol, value
	}
	s.apply(&eqCos, l.cos)
	s.apply(&eqSin, l.sin)
	e := &eqOblique
	if l.way == 1 {
		e = &eqObliqueIn
	}
	value, _ = h.strengthAt(l)
	return e.Symbol, s.apply(e, value)
}

// transverseCheck adds a load square to the axis.
func (m *affdl) transverseCheck(h *affdlHead) {
	m.check(h.member, strength.Transverse, strength.Ultimate, strength.Force, strength.ByRegulation, &eqTransverse, func(s *sheet) law {
		return m.byDirection(h, s, acrossOnly)
	})
}

// obliqueCheck adds a load that is neither along nor across. There is no
// separate check at limit: the ratio y in both strengths holds every ultimate
// strength to u/1.15 of yield, so that none is left to find.
func (m *affdl) obliqueCheck(h *affdlHead) {
	m.check(h.member, strength.Oblique, strength.Ultimate, strength.Force, strength.ByRegulation, &eqOblique, func(s *sheet) law {
		return m.byDirection(h, s, oblique)
	})
}

func (m *affdl) byDirection(h *affdlHead, s *sheet, on sides) law {
	if on == oblique {
		s.rest(h.along[0])
		s.rest(h.along[1])
	}
	s.rest(h.across[0])
	s.rest(h.across[1])
	return law{
		sides: on,
		margin: func(l *load, factor float64) strength.Margin {
			value, why := h.strengthAt(l)
			if why != nil {
				return strength.Unknown(why)
			}
			return strength.Compare(factor*l.Force, value/h.share)
		},
		trace: func(s *sheet, l *load) {
			symbol, value := h.traceAt(s, l)
			h.allow(s, symbol, value)
		},
	}
}

// liningStrength is P_u.B in N on the head; it does not depend on direction.
func (h *affdlHead) liningStrength(s *sheet) float64 {
	defer s.under(h.bushingMember)()
	over := h.m.yieldRatio(s)
	return h.peaked(s, &eqBushU, over*h.liningPressed(s), peakBearing)
}

// liningYield is P_y.B in N on the head.
func (h *affdlHead) liningYield(s *sheet) float64 {
	defer s.under(h.bushingMember)()
	return h.peaked(s, &eqBushY, h.liningPressed(s), peakBearing)
}

// liningPressed is F_cy Dp t_b in N.
func (h *affdlHead) liningPressed(s *sheet) float64 {
	s.read.add(h.first + fieldBushing)
	return s.property(h.bushingMember, &h.bushing.Material, strength.Fcy, string(strength.Fcy)) * h.pinDiameter(s) * h.bearingLength(s)
}

// lining adds the bushing at ultimate and at limit.
func (m *affdl) lining(h *affdlHead) {
	if h.bushing == nil {
		return
	}
	m.check(h.bushingMember, strength.BushingBearing, strength.Ultimate, strength.Force, strength.ByRegulation, &eqBushU, func(s *sheet) law {
		return fixed(anyWay, h.allow(s, eqBushU.Symbol, h.liningStrength(s)))
	})
	m.check(h.bushingMember, strength.BushingBearing, strength.Limit, strength.Force, strength.ByRegulation, &eqBushY, func(s *sheet) law {
		return fixed(anyWay, h.allow(s, eqBushY.Symbol, h.liningYield(s)))
	})
}

package fastener

import (
	"math"

	"jointledger/strength"
)

// ENOptions are the choices of method en-1993-1-8; zero is the default.
type ENOptions struct {
	GammaM2      float64 // 1.25
	ApplySpecial bool    // special factors act on it too
}

func (o ENOptions) gammaM2() float64 {
	if o.GammaM2 == 0 {
		return 1.25
	}
	return o.GammaM2
}

const (
	sourceENShear   = "EN 1993-1-8 table 3.4, shear per shear plane: α_v f_ub A / γ_M2"
	sourceENTension = "EN 1993-1-8 table 3.4, tension: k_2 f_ub A_s / γ_M2"
	sourceENPunch   = "EN 1993-1-8 table 3.4, punching shear: 0.6 π d_m t_p f_u / γ_M2"
	sourceENBearing = "EN 1993-1-8 table 3.4, bearing: k_1 α_b f_u d t / γ_M2, each component of the load by itself"
	sourceENLong    = "EN 1993-1-8 section 3.8, long joints"
	sourceENPack    = "EN 1993-1-8 section 3.6.1(12), packing"
	rangeEN         = "e1, e2 >= 1.2 d0, p1 >= 2.2 d0, p2 >= 2.4 d0 (table 3.3)"
)

// weakInThread are the property classes whose α_v through the threads is 0.5.
var weakInThread = map[string]bool{"4.8": true, "5.8": true, "6.8": true, "10.9": true}

// fullInThread are those whose α_v through the threads is 0.6.
var fullInThread = map[string]bool{"4.6": true, "5.6": true, "8.8": true}

// enShear returns the shear resistance in N of a bolt over its planes, reduced
// for a long joint and for packing.
//
// Source: EN 1993-1-8 table 3.4 (seen), 3.8 and 3.6.1(12) (95 % from memory).
func (p *PreparedPattern) enShear(f *Fastener) (a allowable) {
	t := f.Type
	if t.Ftu == 0 {
		a.why = strength.Say("the fastener type %q has no ftu, which en-1993-1-8 needs as f_ub", t.Name)
		return a
	}
	gamma := p.pattern.EN.gammaM2()
	a.add("n", float64(f.planes()), strength.None, "", "input: fasteners.shear_planes", strength.Given)
	a.add("f_ub", t.Ftu, strength.Stress, "", t.source(), t.Mark)
	a.add("γ_M2", gamma, strength.None, "", "method_options: gamma_m2", strength.Given)
	alpha, area, symbol, source := 0.6, piQuarter*f.Diameter*f.Diameter, "A", "shank in the shear plane"
	if t.Thread != nil && t.Thread.InShearPlane {
		area, symbol = a.addTensileArea(t.Thread, f.Diameter), "A_t"
		source = "threads in the shear plane, property class " + t.Class
		if !fullInThread[t.Class] {
			alpha = 0.5
		}
		if !fullInThread[t.Class] && !weakInThread[t.Class] {
			source = "threads in the shear plane, property class not given: the lesser value"
		}
	} else {
		a.add("D", f.Diameter, strength.Length, "", "input: fasteners.diameter", strength.Given)
		a.add("A", area, strength.Area, "π/4 D²", "area of the shank", strength.Derived)
	}
	a.add("α_v", alpha, strength.None, "", "EN 1993-1-8 table 3.4: "+source, strength.Seen)
	equation := "n α_v f_ub " + symbol + " / γ_M2"
	a.value = float64(f.planes()) * alpha * t.Ftu * area / gamma
	if long := p.extent; long > 15*f.Diameter {
		beta := min(max(1-(long-float64(15*f.Diameter))/(200*f.Diameter), 0.75), 1)
		a.addDiameter(f.Diameter)
		a.add("L_j", long, strength.Length, "", "the longest distance between fasteners along their line", strength.Derived)
		a.add("β_Lf", beta, strength.None, "min(max(1 - (L_j - 15 D) / (200 D), 0.75), 1)", sourceENLong, strength.FromMemory(95))
		a.value, equation = a.value*beta, "β_Lf "+equation
	}
	if pack := p.pattern.PackingThickness; pack > f.Diameter/3 {
		beta := min(9*f.Diameter/(float64(8*f.Diameter)+float64(3*pack)), 1)
		a.addDiameter(f.Diameter)
		a.add("t_pack", pack, strength.Length, "", "input: packing_thickness", strength.Given)
		a.add("β_p", beta, strength.None, "min(9 D / (8 D + 3 t_pack), 1)", sourceENPack, strength.FromMemory(95))
		a.value, equation = a.value*beta, "β_p "+equation
	}
	a.add("F_v", a.value, strength.Force, equation, sourceENShear, strength.Seen)
	return a
}

// addDiameter adds the diameter unless it stands there already.
func (a *allowable) addDiameter(d float64) {
	for _, s := range a.steps {
		if s.Symbol == "D" {
			return
		}
	}
	a.add("D", d, strength.Length, "", "input: fasteners.diameter", strength.Given)
}

// enTension returns the tension resistance in N of a bolt.
func (p *PreparedPattern) enTension(f *Fastener) (a allowable) {
	t := f.Type
	switch {
	case t.Ftu == 0:
		a.why = strength.Say("the fastener type %q has no ftu, which en-1993-1-8 needs as f_ub", t.Name)
		return a
	case t.Thread == nil:
		a.why = strength.Say("the fastener type %q has no thread, which en-1993-1-8 needs for the tensile area", t.Name)
		return a
	}
	gamma, k2, source := p.pattern.EN.gammaM2(), 0.9, "other than countersunk"
	if t.countersunk() {
		k2, source = 0.63, "countersunk"
	}
	a.add("f_ub", t.Ftu, strength.Stress, "", t.source(), t.Mark)
	a.add("γ_M2", gamma, strength.None, "", "method_options: gamma_m2", strength.Given)
	area := a.addTensileArea(t.Thread, f.Diameter)
	a.add("k_2", k2, strength.None, "", "EN 1993-1-8 table 3.4: "+source, strength.Seen)
	a.value = k2 * t.Ftu * area / gamma
	a.add("F_t", a.value, strength.Force, "k_2 f_ub A_t / γ_M2", sourceENTension, strength.Seen)
	return a
}

// enPunching returns the punching resistance in N of plate k under the head or
// nut of a bolt.
func (p *PreparedPattern) enPunching(f *Fastener, plate *Plate) (a allowable) {
	switch {
	case f.Type.HeadDiameter == 0:
		a.why = strength.Say("the fastener type %q has no head_diameter, the mean across points and flats of head or nut", f.Type.Name)
		return a
	case plate.Material.Ftu == 0:
		a.why = strength.Say("the material %q has no %s", plate.Material.Name, strength.Ftu)
		return a
	}
	gamma := p.pattern.EN.gammaM2()
	a.add("d_m", f.Type.HeadDiameter, strength.Length, "", f.Type.source(), f.Type.Mark)
	a.add("t", plate.Thickness, strength.Length, "", "input: plates.thickness", strength.Given)
	a.add("f_u", plate.Material.Ftu, strength.Stress, "", materialSource(plate.Material), plate.Material.MarkOf(strength.Ftu))
	a.add("γ_M2", gamma, strength.None, "", "method_options: gamma_m2", strength.Given)
	a.value = 0.6 * math.Pi * f.Type.HeadDiameter * plate.Thickness * plate.Material.Ftu / gamma
	a.add("B_p", a.value, strength.Force, "0.6 π d_m t f_u / γ_M2", sourceENPunch, strength.Seen)
	return a
}

// spacing is what stands around a fastener along one way of the plate's axes,
// on both sides the least.
type spacing struct {
	edge, pitch float64 // +Inf where there is none
}

// enSpacings returns the spacing along and across the plate's axis. A fastener
// less than a hole's diameter off the line stands in it.
func (p *PreparedPattern) enSpacings(i, k int) (along, across spacing) {
	f := &p.pattern.Fasteners[i]
	cos, sin := p.pattern.Plates[k].axis()
	inf := math.Inf(1)
	next := [2][2]float64{{inf, inf}, {inf, inf}} // way, side
	for j := range p.pattern.Fasteners {
		if j == i {
			continue
		}
		g := &p.pattern.Fasteners[j]
		dx, dy := g.X-f.X, g.Y-f.Y
		d := [2]float64{float64(dx*cos) + float64(dy*sin), float64(dy*cos) - float64(dx*sin)}
		for way := range 2 {
			if strength.AtMost(max(f.hole(), g.hole()), math.Abs(d[1-way])) {
				continue
			}
			s := 0
			if d[way] < 0 {
				s = 1
			}
			next[way][s] = min(next[way][s], math.Abs(d[way]))
		}
	}
	ways := [2][2]float64{{cos, sin}, {-sin, cos}}
	var found [2]spacing
	for way := range 2 {
		found[way] = spacing{inf, inf}
		for s, sign := range [2]float64{1, -1} {
			if !math.IsInf(next[way][s], 0) {
				found[way].pitch = min(found[way].pitch, next[way][s])
				continue
			}
			r := cast(p.outlines[k], f.X, f.Y, sign*ways[way][0], sign*ways[way][1])
			found[way].edge = min(found[way].edge, r.length)
		}
	}
	return found[0], found[1]
}

// enResistance returns the bearing resistance in N for a load along a way with
// spacing s1 along and s2 across it, into a; symbols end in suffix.
func (a *allowable) enResistance(s1, s2 spacing, suffix string, d, d0, t, fu, fub, gamma float64) float64 {
	alpha, k1 := min(1, fub/fu), 2.5
	alphaTerms, k1Terms := "f_ub/f_u, 1", "2.5"
	if !math.IsInf(s1.edge, 0) {
		a.add("e_1"+suffix, s1.edge, strength.Length, "", "the least distance to the outline along the load's component", strength.Derived)
		alpha, alphaTerms = min(alpha, s1.edge/(3*d0)), alphaTerms+", e_1"+suffix+"/(3 D_h)"
	}
	if !math.IsInf(s1.pitch, 0) {
		a.add("p_1"+suffix, s1.pitch, strength.Length, "", "the least pitch along the load's component", strength.Derived)
		alpha, alphaTerms = min(alpha, s1.pitch/(3*d0)-0.25), alphaTerms+", p_1"+suffix+"/(3 D_h) - 1/4"
	}
	if !math.IsInf(s2.edge, 0) {
		a.add("e_2"+suffix, s2.edge, strength.Length, "", "the least distance to the outline across it", strength.Derived)
		k1, k1Terms = min(k1, float64(2.8*s2.edge/d0)-1.7), k1Terms+", 2.8 e_2"+suffix+"/D_h - 1.7"
	}
	if !math.IsInf(s2.pitch, 0) {
		a.add("p_2"+suffix, s2.pitch, strength.Length, "", "the least pitch across it", strength.Derived)
		k1, k1Terms = min(k1, float64(1.4*s2.pitch/d0)-1.7), k1Terms+", 1.4 p_2"+suffix+"/D_h - 1.7"
	}
	a.add("α_b"+suffix, alpha, strength.None, "min("+alphaTerms+")", sourceENBearing, strength.Seen)
	a.add("k_1"+suffix, k1, strength.None, "min("+k1Terms+")", sourceENBearing, strength.Seen)
	value := k1 * alpha * fu * d * t / gamma
	equation := "k_1" + suffix + " α_b" + suffix + " f_u D t_b / γ_M2"
	a.add("F_b"+suffix, value, strength.Force, equation, sourceENBearing, strength.Seen)
	return value
}

// enBearing returns the bearing resistances in N of plate k at fastener i along
// and across the plate's axis. A countersunk plate bears on its thickness less
// half the depth of the countersink; a single row across the load in single lap
// is held to 1.5 f_u d t / γ_M2.
//
// Range: the least spacings of table 3.3; outside them there is none.
// Source: EN 1993-1-8 table 3.4 (seen).
func (p *PreparedPattern) enBearing(i, k int) (a allowable, along, across float64) {
	f, plate := &p.pattern.Fasteners[i], &p.pattern.Plates[k]
	if p.outlines[k] == nil {
		a.why = strength.Say("plate %q has no outline, so the end and edge distances are not known", plate.ID)
		return a, 0, 0
	}
	if plate.Material.Ftu == 0 {
		a.why = strength.Say("the material %q has no %s", plate.Material.Name, strength.Ftu)
		return a, 0, 0
	}
	gamma := p.pattern.EN.gammaM2()
	d, d0, fu := f.Diameter, f.hole(), plate.Material.Ftu
	if f.Type == nil || f.Type.Ftu == 0 {
		a.why = strength.Say("fastener %q has no type with ftu, which en-1993-1-8 needs as f_ub", f.ID)
		return a, 0, 0
	}
	fub := f.Type.Ftu
	s1, s2 := p.enSpacings(i, k)
	for _, s := range []struct {
		name         string
		found, least float64
	}{
		{"e1", s1.edge, 1.2}, {"e2", s2.edge, 1.2}, {"p1", s1.pitch, 2.2}, {"p2", s2.pitch, 2.4},
	} {
		if strength.Less(s.found, s.least*d0) {
			a.why = strength.Say("%s %v is below %g d0 = %v, the least of EN 1993-1-8 table 3.3", s.name,
				strength.Length.Of(s.found), s.least, strength.Length.Of(s.least*d0))
			return a, 0, 0
		}
	}
	a.add("D", d, strength.Length, "", "input: fasteners.diameter", strength.Given)
	f.holeStep(&a)
	a.add("t", plate.Thickness, strength.Length, "", "input: plates.thickness", strength.Given)
	t := plate.Thickness - plate.CountersinkDepth/2
	a.add("h_cs", plate.CountersinkDepth, strength.Length, "", "input: plates.countersink_depth", strength.Given)
	a.add("t_b", t, strength.Length, "t - h_cs / 2", "EN 1993-1-8 table 3.4: less half the countersink", strength.Seen)
	a.add("f_u", fu, strength.Stress, "", materialSource(plate.Material), plate.Material.MarkOf(strength.Ftu))
	a.add("f_ub", fub, strength.Stress, "", f.Type.source(), f.Type.Mark)
	a.add("γ_M2", gamma, strength.None, "", "method_options: gamma_m2", strength.Given)
	cos, sin := plate.axis()
	a.add("c", cos, strength.None, "", "cosine of plates.axis_angle, the plate's axis from x", strength.Given)
	a.add("s", sin, strength.None, "", "sine of the same", strength.Given)
	along = a.enResistance(s1, s2, "a", d, d0, t, fu, fub, gamma)
	across = a.enResistance(s2, s1, "b", d, d0, t, fu, fub, gamma)
	single := p.enSingleRow(i, k)
	if single != [2]bool{} {
		most := 1.5 * fu * d * t / gamma
		a.add("F_b1", most, strength.Force, "1.5 f_u D t_b / γ_M2", "EN 1993-1-8 section 3.6.1(10): one bolt row in single lap", strength.Seen)
		if single[0] {
			along = min(along, most)
			a.add("F_bα", along, strength.Force, "min(F_ba, F_b1)", sourceENBearing, strength.Seen)
		}
		if single[1] {
			across = min(across, most)
			a.add("F_bβ", across, strength.Force, "min(F_bb, F_b1)", sourceENBearing, strength.Seen)
		}
	}
	return a, along, across
}

// enSingleRow tells, for a load along the axis of plate k and for one across it,
// whether fastener i stands in a single lap with all bolts in one row: none of
// them a hole's diameter ahead of another.
func (p *PreparedPattern) enSingleRow(i, k int) (single [2]bool) {
	if p.pattern.Fasteners[i].planes() != 1 {
		return single
	}
	cos, sin := p.pattern.Plates[k].axis()
	origin := p.pattern.Fasteners[0]
	var least, most [2]float64
	widest := 0.0
	for _, f := range p.pattern.Fasteners {
		x, y := f.X-origin.X, f.Y-origin.Y
		for way, d := range [2]float64{float64(x*cos) + float64(y*sin), float64(y*cos) - float64(x*sin)} {
			least[way], most[way] = min(least[way], d), max(most[way], d)
		}
		widest = max(widest, f.hole())
	}
	for way := range single {
		single[way] = strength.Less(most[way]-least[way], widest)
	}
	return single
}

// enBearingCheck is a plate in bearing whose load's components along and across
// its axis have resistances of their own, together on an ellipse.
type enBearingCheck struct {
	place
	plate         int
	share         float64
	along, across float64
	why           *strength.Message
}

// ratio is V over the resistance in the load's direction.
func (a *enBearingCheck) ratio(s *Share) float64 {
	cos, sin := a.p.pattern.Plates[a.plate].axis()
	u, v := float64(cos*s.Shear[0])+float64(sin*s.Shear[1]), float64(cos*s.Shear[1])-float64(sin*s.Shear[0])
	u, v = u/a.along, v/a.across
	return math.Sqrt(float64(u*u) + float64(v*v))
}

func (a *enBearingCheck) margin(c *caseState) strength.Margin {
	s := a.shareOf(c)
	if !(s.Resultant > 0) {
		return strength.Margin{}
	}
	if a.why != nil {
		return strength.Unknown(a.why)
	}
	return strength.Compare(s.Resultant*a.share*a.factor[c.level], s.Resultant/a.ratio(s))
}

func (a *enBearingCheck) steps() []strength.Working {
	s, _, _ := a.p.enBearing(a.i, a.plate)
	a.p.shareStep(&s, a.i, a.plate)
	return append(a.p.shearSteps(a.c.Level), s.steps...)
}

func (a *enBearingCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := a.shareOf(c)
	steps := a.p.shearCaseSteps(c, i, a.c.Level, a.i)
	if a.why != nil || !(share.Resultant > 0) {
		return steps
	}
	var s allowable
	one, two := "F_ba", "F_bb"
	single := a.p.enSingleRow(a.i, a.plate)
	if single[0] {
		one = "F_bα"
	}
	if single[1] {
		two = "F_bβ"
	}
	cos, sin := a.p.pattern.Plates[a.plate].axis()
	s.add("V_a", float64(cos*share.Shear[0])+float64(sin*share.Shear[1]), strength.Force, "c V_x + s V_y", "along the axis", strength.Derived)
	s.add("V_b", float64(cos*share.Shear[1])-float64(sin*share.Shear[0]), strength.Force, "c V_y - s V_x", "across the axis", strength.Derived)
	s.add("F_b", share.Resultant/a.ratio(share), strength.Force, "V / sqrt((V_a/"+one+")² + (V_b/"+two+")²)",
		"components by themselves (note 3 of the table), together on an ellipse", strength.Derived)
	steps = append(append(steps, s.steps...), bearingLoadStep(share.Resultant*a.share))
	return append(steps, a.demandSteps(c, "P_b", share.Resultant*a.share, "F_b", a.margin(c))...)
}

// axis is the unit direction of the plate's axis, along x where none is given.
func (p *Plate) axis() (cos, sin float64) {
	if p.AxisAngle == nil {
		return 1, 0
	}
	// Not folded into a positive turn: what rounds to one would point back.
	switch turned := math.Mod(*p.AxisAngle, 360); turned {
	case 0:
		return 1, 0
	case 90, -270:
		return 0, 1
	case 180, -180:
		return -1, 0
	case 270, -90:
		return 0, -1
	default:
		sin, cos = math.Sincos(turned * math.Pi / 180)
		return cos, sin
	}
}

// addENFastener adds the checks of fastener i by EN 1993-1-8. The check of the
// whole pattern at its instantaneous centre has no γ_M2, so that the fastener's
// own shear stands beside it.
func (p *PreparedPattern) addENFastener(i int) {
	f := &p.pattern.Fasteners[i]
	shear := func() allowable { return p.enShear(f) }
	tension := func() allowable { return p.enTension(f) }
	check := strength.Check{Member: memberFastener, Level: strength.Ultimate, Unit: strength.Force, Method: methodEN}
	check.Mode, check.Source = strength.Shear, sourceENShear
	p.addFixed(i, check, byShear, 0, p.enSafety(), shear)
	check.Mode, check.Source = strength.Tension, sourceENTension
	p.addFixed(i, check, byTension, 0, p.enSafety(), tension)
	p.addInteraction(i, interactions["en-1993-1-8"], methodEN, strength.Ultimate, p.enSafety(),
		func() (allowable, allowable) { return shear(), tension() })
}

// addENPlate adds the checks of plate k at fastener i by EN 1993-1-8.
func (p *PreparedPattern) addENPlate(i, k int) {
	f, plate := &p.pattern.Fasteners[i], &p.pattern.Plates[k]
	if plate.Material == nil {
		return
	}
	check := strength.Check{Member: plate.ID, Level: strength.Ultimate, Unit: strength.Force, Method: methodEN}
	bearing, along, across := p.enBearing(i, k)
	check.Mode, check.Source = strength.Bearing, sourceENBearing
	check.Mark = strength.Weakest(strength.Derived, p.shearMark(check.Level), bearing.mark())
	p.assessments = append(p.assessments, &enBearingCheck{
		p.place(i, check, p.enSafety()), k, p.loadShare(i, k), along, across, reason(bearing.why),
	})
	if f.Type != nil {
		check.Mode, check.Source = strength.PullThrough, sourceENPunch
		p.addFixed(i, check, byTension, 0, p.enSafety(), func() allowable { return p.enPunching(f, plate) })
	}
}

func (p *PreparedPattern) enSafety() safety {
	return safety{strength.ByResistance, p.pattern.EN.ApplySpecial}
}

package fastener

import (
	"math"

	"jointledger/strength"
)

// AISCOptions are the choices of method aisc-360-j3; zero is the default.
type AISCOptions struct {
	Basis string // "lrfd" (default) or "asd"
	// DeformationAllowed leaves the deformation of holes at service load out of
	// the design: 1.5 l_c t F_u <= 3.0 d t F_u in place of 1.2 and 2.4.
	DeformationAllowed bool
	ApplySpecial       bool
}

const (
	sourceAISCShear    = "AISC 360-16 J3.6, table J3.2: F_nv A_b"
	sourceAISCTension  = "AISC 360-16 J3.6, table J3.2: F_nt A_b"
	sourceAISCTogether = "AISC 360-16 J3.7, combined tension and shear, equation J3-3"
	sourceAISCBearing  = "AISC 360-16 J3.10, bearing and tearout, equation J3-6"
	sourceAISCFiller   = "AISC 360-16 J5.2, fillers"
	sourceAISCLong     = "AISC 360-16 table J3.2, note b: end-loaded connections longer than 38 in"
	rangeAISC          = "steel bolts and connected steel; strengths from F_u of the bolt"
	aiscLongJoint      = 38 * 25.4
)

func (o AISCOptions) asd() bool { return o.Basis == "asd" }

func (o AISCOptions) level() strength.Level {
	if o.asd() {
		return strength.Limit
	}
	return strength.Ultimate
}

func (o AISCOptions) safety() safety {
	if o.asd() {
		return safety{strength.ByMethod, o.ApplySpecial}
	}
	return safety{strength.ByResistance, o.ApplySpecial}
}

// reduce brings a nominal strength to the available one, φ 0.75 or Ω 2.
func (o AISCOptions) reduce(a *allowable, nominal, symbol string, value float64, source string) {
	if o.asd() {
		a.add("Ω", 2, strength.None, "", source, strength.Seen)
		a.value = value / 2
		a.add(symbol, a.value, strength.Force, nominal+" / Ω", source, strength.Seen)
		return
	}
	a.add("φ", 0.75, strength.None, "", source, strength.Seen)
	a.value = 0.75 * value
	a.add(symbol, a.value, strength.Force, "φ "+nominal, source, strength.Seen)
}

// start writes the bolt's strength and area, or says what is missing.
func (o AISCOptions) start(a *allowable, f *Fastener) (area float64, ok bool) {
	if f.Type.Ftu == 0 {
		a.why = strength.Say("the fastener type %q has no ftu, which aisc-360-j3 needs", f.Type.Name)
		return 0, false
	}
	area = piQuarter * f.Diameter * f.Diameter
	a.add("F_ub", f.Type.Ftu, strength.Stress, "", f.Type.source(), f.Type.Mark)
	a.add("D", f.Diameter, strength.Length, "", "input: fasteners.diameter", strength.Given)
	a.add("A_b", area, strength.Area, "π/4 D²", "nominal area of the unthreaded body", strength.Derived)
	return area, true
}

// aiscShear returns the available shear strength in N of a bolt: 0.450 F_u A_b a
// plane with threads in it, 0.563 F_u A_b without (95 % from memory), less for
// fillers (90 % from memory) and joints longer than 38 in (85 %).
func (p *PreparedPattern) aiscShear(f *Fastener) (a allowable) {
	area, ok := p.pattern.AISC.start(&a, f)
	if !ok {
		return a
	}
	part, source := 0.563, "threads excluded from the shear planes"
	if f.Type.Thread != nil && f.Type.Thread.InShearPlane {
		part, source = 0.450, "threads not excluded from the shear planes"
	}
	nominal := part * f.Type.Ftu
	a.add("r_v", part, strength.None, "", "AISC 360-16 table J3.2, commentary: "+source, strength.FromMemory(95))
	a.add("F_nv", nominal, strength.Stress, "r_v F_ub", sourceAISCShear, strength.FromMemory(95))
	a.add("n", float64(f.planes()), strength.None, "", "input: fasteners.shear_planes", strength.Given)
	value, equation := float64(f.planes())*nominal*area, "n F_nv A_b"
	if p.extent > aiscLongJoint {
		a.add("η_L", 0.833, strength.None, "", sourceAISCLong, strength.FromMemory(85))
		value, equation = value*0.833, "η_L "+equation
	}
	if pack := p.pattern.PackingThickness; pack > 0.25*25.4 {
		beta := max(1-float64(0.4*(pack/25.4-0.25)), 0.85)
		a.add("t_pack", pack, strength.Length, "", "input: packing_thickness", strength.Given)
		a.add("inch", 25.4, strength.Length, "", "1 in", strength.Derived)
		a.add("η_p", beta, strength.None, "max(1 - 0.4 (t_pack/inch - 0.25), 0.85)", sourceAISCFiller, strength.FromMemory(90))
		value, equation = value*beta, "η_p "+equation
	}
	a.add("R_nv", value, strength.Force, equation, sourceAISCShear, strength.FromMemory(95))
	p.pattern.AISC.reduce(&a, "R_nv", "V_c", value, sourceAISCShear)
	return a
}

// aiscTension returns the available tension strength in N, 0.75 F_u A_b.
func (p *PreparedPattern) aiscTension(f *Fastener) (a allowable) {
	area, ok := p.pattern.AISC.start(&a, f)
	if !ok {
		return a
	}
	a.add("F_nt", 0.75*f.Type.Ftu, strength.Stress, "0.75 F_ub", sourceAISCTension, strength.FromMemory(95))
	value := 0.75 * f.Type.Ftu * area
	a.add("R_nt", value, strength.Force, "F_nt A_b", sourceAISCTension, strength.FromMemory(95))
	p.pattern.AISC.reduce(&a, "R_nt", "T_c", value, sourceAISCTension)
	return a
}

// aiscTogether is F'_nt = 1.3 F_nt - F_nt f_rv / (φ F_nv) <= F_nt in the terms of
// ratios to the available strengths.
var aiscTogether = interaction{
	equation: "max((R_s + R_t) / 1.3, R_s, R_t)", source: sourceAISCTogether, reachEquation: "1 / R",
	mark:  strength.FromMemory(95),
	value: func(s, t float64) float64 { return max((s+t)/1.3, s, t) },
	reach: func(s, t float64) float64 { return 1 / max((s+t)/1.3, s, t) },
}

// aiscBearingCheck is a plate in bearing and tearout in the direction in which
// the fastener pushes it.
type aiscBearingCheck struct {
	place
	plate int
	share float64
	why   *strength.Message
}

func (p *PreparedPattern) addAISCBearing(i, k int) {
	plate := &p.pattern.Plates[k]
	if plate.Material == nil {
		return
	}
	var why strength.Message
	switch {
	case p.outlines[k] == nil:
		why = strength.Say("plate %q has no outline, so the clear distance is not known", plate.ID)
	case plate.Material.Ftu == 0:
		why = strength.Say("the material %q has no %s", plate.Material.Name, strength.Ftu)
	}
	o := p.pattern.AISC
	check := strength.Check{
		Member: plate.ID, Mode: strength.Bearing, Level: o.level(), Unit: strength.Force, Method: methodAISC, Source: sourceAISCBearing,
		Mark: strength.Weakest(strength.Derived, p.shearMark(o.level()), plate.Material.MarkOf(strength.Ftu)),
	}
	p.assessments = append(p.assessments, &aiscBearingCheck{p.place(i, check, o.safety()), k, p.loadShare(i, k), reason(why)})
}

// blocking is what ends the clear distance: the outline, or the hole of another
// fastener.
type blocking struct {
	clear float64
	ray   ray
	other int // -1 for the outline
}

// blocked returns the clear distance from the edge of hole i along a direction,
// to the outline of plate k or to a hole that the line through the centre meets.
func (p *PreparedPattern) blocked(i, k int, ux, uy float64) blocking {
	f := &p.pattern.Fasteners[i]
	found := blocking{ray: cast(p.outlines[k], f.X, f.Y, ux, uy), other: -1}
	found.clear = found.ray.length - f.hole()/2
	for _, j := range p.near[i] {
		g := &p.pattern.Fasteners[j]
		dx, dy := g.X-f.X, g.Y-f.Y
		along, off := float64(dx*ux)+float64(dy*uy), float64(dy*ux)-float64(dx*uy)
		r := g.hole() / 2
		if along <= 0 || math.Abs(off) >= r {
			continue
		}
		if clear := along - math.Sqrt(float64(r*r)-float64(off*off)) - f.hole()/2; clear < found.clear {
			found.clear, found.other = clear, int(j)
		}
	}
	found.clear = max(found.clear, 0)
	return found
}

// nominal returns the tearout and the bearing strength in N.
func (a *aiscBearingCheck) nominal(clear float64) (tearout, bearing float64) {
	tear, bear := 1.2, 2.4
	if a.p.pattern.AISC.DeformationAllowed {
		tear, bear = 1.5, 3
	}
	f, plate := &a.p.pattern.Fasteners[a.i], &a.p.pattern.Plates[a.plate]
	t := plate.bearingThickness()
	return tear * clear * t * plate.Material.Ftu, bear * f.Diameter * t * plate.Material.Ftu
}

// bearingThickness is what is left of a plate beside its countersink.
func (p *Plate) bearingThickness() float64 { return p.Thickness - p.CountersinkDepth }

func (a *aiscBearingCheck) margin(c *caseState) strength.Margin {
	s := a.shareOf(c)
	ux, uy, ok := push(a.plate, s)
	if !ok {
		return strength.Margin{}
	}
	if a.why != nil {
		return strength.Unknown(a.why)
	}
	tear, bear := a.nominal(a.p.blocked(a.i, a.plate, ux, uy).clear)
	available := 0.75 * min(tear, bear)
	if a.p.pattern.AISC.asd() {
		available = min(tear, bear) / 2
	}
	return strength.Compare(s.Resultant*a.share*a.factor[c.level], available)
}

func (a *aiscBearingCheck) steps() []strength.Working {
	var s allowable
	f, plate := &a.p.pattern.Fasteners[a.i], &a.p.pattern.Plates[a.plate]
	s.add("x", f.X, strength.Length, "", "input: fasteners.x", strength.Given)
	s.add("y", f.Y, strength.Length, "", "input: fasteners.y", strength.Given)
	s.add("D", f.Diameter, strength.Length, "", "input: fasteners.diameter", strength.Given)
	f.holeStep(&s)
	s.add("t", plate.Thickness, strength.Length, "", "input: plates.thickness", strength.Given)
	s.add("h_cs", plate.CountersinkDepth, strength.Length, "", "input: plates.countersink_depth", strength.Given)
	s.add("t_b", plate.bearingThickness(), strength.Length, "t - h_cs", "less the countersink", strength.Derived)
	if plate.Material.Ftu > 0 {
		s.add("F_u", plate.Material.Ftu, strength.Stress, "", materialSource(plate.Material), plate.Material.MarkOf(strength.Ftu))
	}
	a.p.shareStep(&s, a.i, a.plate)
	return append(a.p.shearSteps(a.c.Level), s.steps...)
}

func (a *aiscBearingCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := a.shareOf(c)
	steps := a.p.shearCaseSteps(c, i, a.c.Level, a.i)
	ux, uy, ok := push(a.plate, share)
	if !ok || a.why != nil {
		return steps
	}
	var s allowable
	pushSteps(&s, a.plate, ux, uy)
	b := a.p.blocked(a.i, a.plate, ux, uy)
	if b.other < 0 {
		b.ray.steps(&s, "l", "x", "y")
		s.add("l_c", b.clear, strength.Length, "max(l - D_h / 2, 0)", "clear distance along the load to the outline", strength.Derived)
	} else {
		g := &a.p.pattern.Fasteners[b.other]
		s.add("x_n", g.X, strength.Length, "", "input: fasteners.x of "+g.ID+", whose hole is met", strength.Given)
		s.add("y_n", g.Y, strength.Length, "", "input: fasteners.y of the same", strength.Given)
		s.add("D_n", g.hole(), strength.Length, "", "hole of the same", strength.Given)
		s.add("b", float64((g.Y-a.p.pattern.Fasteners[a.i].Y)*ux)-float64((g.X-a.p.pattern.Fasteners[a.i].X)*uy), strength.Length,
			"u_x (y_n - y) - u_y (x_n - x)", "its offset from the line of the load", strength.Derived)
		s.add("l_c", b.clear, strength.Length, "max(u_x (x_n - x) + u_y (y_n - y) - sqrt(D_n²/4 - b²) - D_h / 2, 0)",
			"clear distance along the load to that hole", strength.Derived)
	}
	tear, bear := a.nominal(b.clear)
	equations := [2]string{"1.2 l_c t_b F_u", "2.4 D t_b F_u"}
	if a.p.pattern.AISC.DeformationAllowed {
		equations = [2]string{"1.5 l_c t_b F_u", "3.0 D t_b F_u"}
	}
	s.add("R_nt", tear, strength.Force, equations[0], sourceAISCBearing, strength.Seen)
	s.add("R_nb", bear, strength.Force, equations[1], sourceAISCBearing, strength.Seen)
	s.add("R_n", min(tear, bear), strength.Force, "min(R_nt, R_nb)", sourceAISCBearing, strength.Seen)
	a.p.pattern.AISC.reduce(&s, "R_n", "R_a", min(tear, bear), sourceAISCBearing)
	steps = append(append(steps, s.steps...), bearingLoadStep(share.Resultant*a.share))
	return append(steps, a.demandSteps(c, "P_b", share.Resultant*a.share, "R_a", a.margin(c))...)
}

// addAISCFastener adds the checks of fastener i by AISC 360 J3. The check of the
// whole pattern at its instantaneous centre has no φ, so that the fastener's own
// shear stands beside it.
func (p *PreparedPattern) addAISCFastener(i int) {
	f := &p.pattern.Fasteners[i]
	o := p.pattern.AISC
	shear := func() allowable { return p.aiscShear(f) }
	tension := func() allowable { return p.aiscTension(f) }
	check := strength.Check{Member: memberFastener, Level: o.level(), Unit: strength.Force, Method: methodAISC}
	check.Mode, check.Source = strength.Shear, sourceAISCShear
	p.addFixed(i, check, byShear, 0, o.safety(), shear)
	check.Mode, check.Source = strength.Tension, sourceAISCTension
	p.addFixed(i, check, byTension, 0, o.safety(), tension)
	p.addInteraction(i, aiscTogether, methodAISC, o.level(), o.safety(), func() (allowable, allowable) { return shear(), tension() })
}

package fastener

import (
	"math"

	"jointledger/strength"
)

// shearOutCheck is a plate torn toward its outline in the direction in which a
// fastener pushes it.
type shearOutCheck struct {
	place
	plate int
	share float64
	why   *strength.Message
}

// The planes of shear-out start on the hole at 40° to the load: common practice,
// no source, as for lugs.
var sinShearOut, cosShearOut = math.Sincos(40 * math.Pi / 180)

// addShearOut adds the shear-out check of plate k at fastener i. Without an
// outline its bearing is undetermined already.
func (p *PreparedPattern) addShearOut(i, k int) {
	plate := &p.pattern.Plates[k]
	if plate.Material == nil || p.outlines[k] == nil {
		return
	}
	var why strength.Message
	if plate.Material.Fsu == 0 {
		why = strength.Say("the material %q has no %s", plate.Material.Name, strength.Fsu)
	}
	mark := strength.Weakest(strength.Derived, plate.Material.MarkOf(strength.Fsu))
	check := strength.Check{
		Member: plate.ID, Mode: strength.ShearOut, Level: strength.Ultimate, Unit: strength.Force,
		Method: methodShearOut, Source: sourceShearOut, Mark: strength.Weakest(p.shearMark(strength.Ultimate), mark),
	}
	p.assessments = append(p.assessments, &shearOutCheck{p.place(i, check, safety{}), k, p.loadShare(i, k), reason(why)})
}

// lengths returns the length of each shear plane, from the hole to the outline
// along the push, and where they start.
func (a *shearOutCheck) lengths(ux, uy float64) (rays [2]ray, starts [2][2]float64, behind float64) {
	f := &a.p.pattern.Fasteners[a.i]
	off, behind := f.hole()/2*sinShearOut, f.hole()/2*cosShearOut
	for n, h := range [2]float64{off, -off} {
		starts[n] = [2]float64{f.X - float64(h*uy), f.Y + float64(h*ux)}
		rays[n] = cast(a.p.outlines[a.plate], starts[n][0], starts[n][1], ux, uy)
	}
	return rays, starts, behind
}

func (a *shearOutCheck) margin(c *caseState) strength.Margin {
	share := a.shareOf(c)
	ux, uy, ok := push(a.plate, share)
	if !ok {
		return strength.Margin{}
	}
	if a.why != nil {
		return strength.Unknown(a.why)
	}
	rays, _, behind := a.lengths(ux, uy)
	length := max(min(rays[0].length, rays[1].length)-behind, 0)
	plate := &a.p.pattern.Plates[a.plate]
	return strength.Compare(share.Resultant*a.share*a.factor[c.level], 2*plate.Material.Fsu*plate.Thickness*length)
}

func (a *shearOutCheck) steps() []strength.Working {
	var s allowable
	f, plate := &a.p.pattern.Fasteners[a.i], &a.p.pattern.Plates[a.plate]
	s.add("x", f.X, strength.Length, "", "input: fasteners.x", strength.Given)
	s.add("y", f.Y, strength.Length, "", "input: fasteners.y", strength.Given)
	f.holeStep(&s)
	s.add("t", plate.Thickness, strength.Length, "", "input: plates.thickness", strength.Given)
	if a.why == nil {
		s.add("F_su,plate", plate.Material.Fsu, strength.Stress, "", materialSource(plate.Material), plate.Material.MarkOf(strength.Fsu))
	}
	a.p.shareStep(&s, a.i, a.plate)
	return append(a.p.shearSteps(a.c.Level), s.steps...)
}

func (a *shearOutCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := a.shareOf(c)
	steps := a.p.shearCaseSteps(c, i, a.c.Level, a.i)
	ux, uy, ok := push(a.plate, share)
	if !ok || a.why != nil {
		return steps
	}
	var s allowable
	pushSteps(&s, a.plate, ux, uy)
	rays, starts, behind := a.lengths(ux, uy)
	n, sign := 0, "+"
	if rays[1].length < rays[0].length {
		n, sign = 1, "-"
	}
	s.add("h", a.hole()/2*sinShearOut, strength.Length, "D_h / 2 sin(40°)", "offset of the planes", strength.Derived)
	s.add("x_0", behind, strength.Length, "D_h / 2 cos(40°)", "start of the planes on the hole", strength.Derived)
	flip := map[string]string{"+": "-", "-": "+"}
	s.add("x_p", starts[n][0], strength.Length, "x "+flip[sign]+" h u_y", "the plane of lesser length, which counts twice", strength.Derived)
	s.add("y_p", starts[n][1], strength.Length, "y "+sign+" h u_x", "the plane of lesser length, which counts twice", strength.Derived)
	rays[n].steps(&s, "l", "x_p", "y_p")
	length := max(rays[n].length-behind, 0)
	s.add("L", length, strength.Length, "max(l - x_0, 0)", sourceShearOut, strength.Derived)
	plate := &a.p.pattern.Plates[a.plate]
	s.add("P_so", 2*plate.Material.Fsu*plate.Thickness*length, strength.Force, "2 F_su,plate t L", sourceShearOut, strength.Derived)
	steps = append(append(steps, s.steps...), bearingLoadStep(share.Resultant*a.share))
	return append(steps, a.demandSteps(c, "P_b", share.Resultant*a.share, "P_so", a.margin(c))...)
}

func (a *shearOutCheck) hole() float64 { return a.p.pattern.Fasteners[a.i].hole() }

// hole is the diameter of the hole, the fastener's where none was given.
func (f *Fastener) hole() float64 { return max(f.HoleDiameter, f.Diameter) }

func (f *Fastener) holeStep(a *allowable) {
	source := "input: fasteners.hole_diameter"
	if f.HoleDiameter == 0 {
		source = "input: fasteners.diameter, no hole_diameter given"
	}
	a.add("D_h", f.hole(), strength.Length, "", source, strength.Given)
}

func materialSource(m *strength.Material) string {
	if m.Source == "" {
		return "input: material " + m.Name
	}
	return m.Source
}

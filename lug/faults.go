package lug

import (
	"math"
	"slices"
	"strconv"

	"jointledger/strength"
)

// faults collects what makes a joint impossible to calculate.
type faults []strength.Fault

func (f *faults) add(pointer, format string, args ...any) {
	*f = append(*f, strength.Fault{Pointer: pointer, Message: strength.Say(format, args...)})
}

func mm(x float64) strength.Quantity { return strength.Length.Of(x) }

func degrees(x float64) strength.Quantity { return strength.Degrees.Of(x) }

// check finds everything that is impossible about a joint.
func (j *Joint) check(f *faults) {
	j.Lug.check("/lug", f)
	j.checkBore("/lug", "/bushing", &j.Lug, j.Bushing, f)
	if j.Pin != nil && strength.AtLeast(j.Pin.InnerDiameter, j.Pin.Diameter) {
		f.add("/pin/inner_diameter", "the bore %v must be smaller than the pin, %v", mm(j.Pin.InnerDiameter), mm(j.Pin.Diameter))
	}
	c := j.Clevis
	if c == nil {
		if j.SingleShear {
			f.add("/clevis", "a joint in single shear needs its mating lug here")
		}
		return
	}
	c.Head.check("/clevis", f)
	j.checkBore("/clevis", "/clevis/bushing", &c.Head, c.Bushing, f)
	if c.Gap < 0 {
		f.add("/clevis/gap", "the gap is %v and must not be below zero", mm(c.Gap))
	}
	if j.SingleShear {
		if c.LegShare != 0 {
			f.add("/clevis/leg_share", "a joint in single shear has one mating lug and no share between legs")
		}
	} else {
		if c.LegShare != 0 && (c.LegShare < 0.5 || c.LegShare > 1) {
			f.add("/clevis/leg_share", "the share of the leg that has more is %.6g and must be from 0.5 to 1", c.LegShare)
		}
		if c.MomentShare != nil {
			f.add("/clevis/moment_share", "only a joint in single shear shares an eccentric moment")
		}
	}
	if m := c.MomentShare; m != nil && (*m < 0 || *m > 1) {
		f.add("/clevis/moment_share", "the lug's share of the moment is %.6g and must be from 0 to 1", *m)
	}
}

// checkBore finds what does not fit into a hole.
func (j *Joint) checkBore(head, bushing string, h *Head, b *Bushing, f *faults) {
	d := h.HoleDiameter
	switch {
	case b == nil && j.Pin != nil && strength.More(j.Pin.Diameter, d):
		f.add("/pin/diameter", "the pin, %v, is wider than the hole at %s/hole_diameter, %v", mm(j.Pin.Diameter), head, mm(d))
	case b != nil && j.Pin != nil && strength.AtLeast(j.Pin.Diameter, d):
		f.add(bushing, "the bushing has no wall: its outside is the hole, %v, and its inside the pin, %v", mm(d), mm(j.Pin.Diameter))
	}
	if b == nil {
		return
	}
	if b.Interference < 0 {
		f.add(bushing+"/interference", "the interference is %v and must not be below zero", mm(b.Interference))
	}
	if strength.AtLeast(b.Interference, d) {
		f.add(bushing+"/interference", "the interference %v must be smaller than the hole, %v", mm(b.Interference), mm(d))
	}
}

// check finds everything that is impossible about one head.
func (h *Head) check(at string, f *faults) {
	d, e, w := h.HoleDiameter, h.EdgeDistance, h.Width
	if strength.AtMost(e, d/2) {
		f.add(at+"/edge_distance", "the edge distance %v must be more than half the hole, %v", mm(e), mm(d/2))
	}
	h.checkShape(at, f)
	side := w/2 - math.Abs(h.Offset)
	switch {
	case strength.AtMost(w, d):
		f.add(at+"/hole_diameter", "the hole, %v, must be smaller than the width, %v", mm(d), mm(w))
	case strength.AtMost(side, d/2):
		f.add(at+"/offset", "an offset of %v leaves no material beside the hole: half the width less the offset is %v and must be more than %v",
			mm(h.Offset), mm(side), mm(d/2))
	case h.Shape == Tapered && h.TaperAngle > 0 && h.TaperAngle <= 45 && strength.AtMost(side*cosDegrees(h.TaperAngle), d/2):
		f.add(at+"/taper_angle", "a taper of %v leaves no material beside the hole: the side passes %v from its centre and must be more than %v away",
			degrees(h.TaperAngle), mm(side*cosDegrees(h.TaperAngle)), mm(d/2))
	}
	if h.SectionDepths != nil {
		for i, depth := range h.SectionDepths {
			if depth <= 0 {
				f.add(at+"/section_depths/"+strconv.Itoa(i), "the depth is %v and must be above zero", mm(depth))
			}
		}
	}
	if h.BodyWidth < 0 {
		f.add(at+"/body_width", "the width of the body is %v and must be above zero", mm(h.BodyWidth))
	}
	if h.BodyLength < 0 {
		f.add(at+"/body_length", "the length of the body is %v and must be above zero", mm(h.BodyLength))
	}
}

// checkShape finds fields that contradict the shape of the end.
func (h *Head) checkShape(at string, f *faults) {
	switch h.Shape {
	case Round:
		if strength.Less(h.EdgeDistance, h.Width/2) {
			f.add(at+"/edge_distance", "the edge distance %v of a round end must be at least half the width, %v; a shorter end is square or tapered",
				mm(h.EdgeDistance), mm(h.Width/2))
		}
		if h.EndRadius != 0 && strength.Less(h.EndRadius, h.EdgeDistance) {
			f.add(at+"/end_radius", "an arc of %v about the hole centre does not reach the end at %v", mm(h.EndRadius), mm(h.EdgeDistance))
		}
	case Tapered:
		if h.TaperAngle <= 0 || h.TaperAngle > 45 {
			f.add(at+"/taper_angle", "the taper is %v a side and must be above 0 and at most 45 degrees", degrees(h.TaperAngle))
			break
		}
		side, slope := h.Width/2-math.Abs(h.Offset), math.Tan(h.TaperAngle*math.Pi/180)
		if side > 0 && strength.More(h.EdgeDistance*slope, side) {
			f.add(at+"/edge_distance", "the converging side reaches the axis %v from the hole centre, so that there is no end at %v",
				mm(side/slope), mm(h.EdgeDistance))
		}
	}
	if h.Shape != Round && h.EndRadius != 0 {
		f.add(at+"/end_radius", "a %s end has no radius", h.Shape)
	}
	if h.Shape != Tapered && h.TaperAngle != 0 {
		f.add(at+"/taper_angle", "a %s lug has no taper", h.Shape)
	}
}

// checkCases finds load cases that have no meaning.
func checkCases(cases []LoadCase, f *faults) {
	if len(cases) == 0 {
		f.add("/load_cases", "at least one load case is needed")
	}
	for i := range cases {
		at := "/load_cases/" + strconv.Itoa(i)
		c := &cases[i]
		if c.Level != strength.Limit && c.Level != strength.Ultimate {
			f.add(at+"/level", "the level must be limit or ultimate")
		}
		if c.Force < 0 {
			f.add(at+"/force", "the force is %v and must not be below zero; its direction is the angle's", strength.Force.Of(c.Force))
		}
	}
}

// checkOptions finds options that a method does not have or cannot take.
func checkOptions(m *Method, options Options, f *faults) {
	at := "/method_options/" + m.ID
	for _, name := range sortedNames(options) {
		option, ok := m.option(name)
		if !ok {
			f.add(at+"/"+name, "the method %s has no option %q", m.ID, name)
			continue
		}
		option.check(at+"/"+name, m.ID, options[name], f)
	}
}

func (o *Option) check(at, method string, v Value, f *faults) {
	switch o.Kind {
	case Number:
		if strength.Less(v.Number, o.Least) || strength.More(v.Number, o.Most) {
			f.add(at, "the value is %.6g and must be from %.6g to %.6g", v.Number, o.Least, o.Most)
		}
	case Word:
		if len(o.Words) == 0 {
			if _, err := strconv.ParseFloat(v.Word, 64); err != nil {
				f.add(at, "%q is not the number of a curve", v.Word)
			}
		} else if !slices.Contains(o.Words, v.Word) {
			f.add(at, "%q is none of %q", v.Word, o.Words)
		}
	case CurveSetRef:
		switch {
		case v.Set == nil:
			f.add(at, "the method needs a curve set here")
		case v.Set.Method != method:
			f.add(at, "the curve set %s is of the method %q", v.Set.Name(), v.Set.Method)
		case builtInBy(v.Set.ID) != nil:
			if known := builtInBy(v.Set.ID); !v.Set.builtIn && !v.Set.equal(known) {
				f.add(at, "the id %q is that of the built-in curve set %s, and this one says something else", v.Set.ID, known.Name())
			}
		default:
			for _, wrong := range v.Set.Check() {
				f.add(at+wrong.Pointer, "%v", wrong.Message)
			}
		}
	}
}

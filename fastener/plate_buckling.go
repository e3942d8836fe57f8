package fastener

import (
	"math"

	"jointledger/strength"
)

// fixity is the coefficient c of a sheet between fasteners by their heads.
//
// Source: inter-rivet buckling, 4 and 3 seen, 1.5 and 1.0 from memory (85 %).
var fixity = map[string]struct {
	c    float64
	mark strength.Mark
}{
	HeadProtruding:         {4, strength.Seen},
	HeadRound:              {3, strength.Seen},
	HeadCountersunk:        {1.5, strength.FromMemory(85)},
	HeadCountersunkReduced: {1, strength.FromMemory(85)},
}

// interFastener returns the stress in MPa at which a sheet buckles between
// fasteners: F_e = c π² E_c/12 (t/p)², and above half of F_cy by Johnson's
// parabola F_cy (1 - F_cy/(4 F_e)). The 12 is the conservative form; others
// divide by 12 (1 - ν²).
func interFastener(m *strength.Material, head string, t, pitch float64) (a allowable) {
	if head == "" {
		head = HeadProtruding
	}
	for _, property := range []strength.Property{strength.Ec, strength.Fcy} {
		if m.Value(property) == 0 {
			a.why = strength.Say("the material %q has no %s", m.Name, property)
			return a
		}
	}
	c := fixity[head]
	a.add("c_f", c.c, strength.None, "", "fixity of a "+head+" head", c.mark)
	a.add("E_c", m.Ec, strength.Stress, "", materialSource(m), m.MarkOf(strength.Ec))
	a.add("F_cy", m.Fcy, strength.Stress, "", materialSource(m), m.MarkOf(strength.Fcy))
	a.add("t", t, strength.Length, "", "input: plates.thickness", strength.Given)
	a.add("p_r", pitch, strength.Length, "", "to the next row along the axis", strength.Derived)
	slimness := t / pitch
	elastic := c.c * math.Pi * math.Pi * m.Ec / 12 * slimness * slimness
	a.add("F_e", elastic, strength.Stress, "c_f π² E_c/12 (t/p_r)²", sourceBuckling, strength.FromMemory(85))
	a.value = elastic
	equation, source := "F_e", "elastic, F_e <= F_cy/2"
	if elastic > m.Fcy/2 {
		a.value = m.Fcy * (1 - m.Fcy/(4*elastic))
		equation, source = "F_cy (1 - F_cy/(4 F_e))", "Johnson's parabola, F_e > F_cy/2"
	}
	a.add("F_ir", a.value, strength.Stress, equation, source, strength.Derived)
	return a
}

// bucklingCheck is a plate pressed together between two of its rows.
type bucklingCheck struct {
	place
	rows     *rows
	section  *section
	capacity float64
	why      *strength.Message
}

func (p *PreparedPattern) buckling(r *rows, c *section) (a allowable) {
	f, plate := &p.pattern.Fasteners[c.first], &p.pattern.Plates[r.plate]
	if f.Type == nil {
		a.why = strength.Say("fastener %q has no type, so the form of its head is not known", f.ID)
		return a
	}
	return interFastener(plate.Material, f.Type.Head, plate.Thickness, c.next)
}

// addBuckling adds the buckling of plate k beyond the row whose first fastener
// is i.
func (p *PreparedPattern) addBuckling(i, k int) {
	r := p.rows[k]
	if r == nil {
		return
	}
	for n := range r.sections {
		c := &r.sections[n]
		if c.first != i || c.next == 0 || c.gross <= 0 {
			continue
		}
		a := p.buckling(r, c)
		check := strength.Check{
			Member: p.pattern.Plates[k].ID, Mode: strength.InterFastenerBuckling, Level: strength.Ultimate, Unit: strength.Stress,
			Method: methodBuckling, Source: sourceBuckling,
			Mark: strength.Weakest(strength.Derived, p.shearMark(strength.Ultimate), a.mark()),
		}
		p.assessments = append(p.assessments, &bucklingCheck{p.place(i, check, safety{}), r, c, a.value, reason(a.why)})
	}
}

// pressed is the mean stress of the whole section, pressing positive.
func (a *bucklingCheck) pressed() float64 {
	pull, _ := a.rows.through(a.c.Level, a.section)
	return max(-pull/a.section.gross, 0)
}

func (a *bucklingCheck) margin(c *caseState) strength.Margin {
	return compare(a.pressed()*a.factor[c.level], a.capacity, a.why)
}

func (a *bucklingCheck) steps() []strength.Working {
	s := a.rows.geometrySteps(a.p, a.section)
	s.add("A_gross", a.section.gross, strength.Area, "", "area across the row without holes, from the outline", strength.Derived)
	steps := append(a.p.shearSteps(a.c.Level), s.steps...)
	return append(steps, a.p.buckling(a.rows, a.section).steps...)
}

func (a *bucklingCheck) caseSteps(c *caseState, i int) []strength.Working {
	if a.why != nil || a.section.area <= 0 {
		return nil
	}
	steps := a.rows.throughSteps(a.p, c, i, a.c.Level, a.section)
	steps = append(steps, strength.Working{
		Symbol: "σ_c", Value: a.pressed(), Unit: strength.Stress, Equation: "max(- N / A_gross, 0)",
		Source: "mean stress between this row and the next", Mark: strength.Derived,
	})
	return append(steps, a.demandSteps(c, "σ_c", a.pressed(), "F_ir", a.margin(c))...)
}

package fastener

import (
	"math"
	"slices"

	"jointledger/strength"
)

// block is what may tear out of a plate toward its free end: tension across the
// last row, shear along the outer columns, on both sides or on one with the
// tension plane running to the plate's edge.
type block struct {
	name           string
	tension, shear float64 // net areas
}

// blocks returns the ways in which the plate of r may tear.
func (p *PreparedPattern) blocks(r *rows) []block {
	c := &r.sections[len(r.sections)-1]
	lo, hi := slices.Min(r.w), slices.Max(r.w)
	t := r.thickness
	origin := p.pattern.Fasteners[0]
	// gap is the length along a way from a point, less holes that it runs through.
	gap := func(s, w, ds, dw, length float64) float64 {
		for i := range p.pattern.Fasteners {
			radius := p.pattern.Fasteners[i].hole() / 2
			along := float64((r.s[i]-s)*ds) + float64((r.w[i]-w)*dw)
			off := float64((r.w[i]-w)*ds) - float64((r.s[i]-s)*dw)
			if math.Abs(off) >= radius {
				continue
			}
			half := math.Sqrt(float64(radius*radius) - float64(off*off))
			length -= max(min(along+half, length)-max(along-half, 0), 0)
		}
		return max(length, 0)
	}
	reach := func(w, ds, dw float64) float64 {
		x, y := float64(r.cos*c.station)-float64(r.sin*w), float64(r.sin*c.station)+float64(r.cos*w)
		ux, uy := float64(r.cos*ds)-float64(r.sin*dw), float64(r.sin*ds)+float64(r.cos*dw)
		return cast(p.outlines[r.plate], origin.X+x, origin.Y+y, ux, uy).length
	}
	down := func(w float64) float64 { return t * gap(c.station, w, -1, 0, reach(w, -1, 0)) }
	all := []block{
		{"from the column of least η to the edge beyond", t * gap(c.station, lo, 0, 1, reach(lo, 0, 1)), down(lo)},
		{"from the column of most η to the edge beyond", t * gap(c.station, hi, 0, -1, reach(hi, 0, -1)), down(hi)},
	}
	if hi > lo {
		all = append([]block{{"between the outer columns", t * gap(c.station, lo, 0, 1, hi-lo), down(lo) + down(hi)}}, all...)
	}
	return all
}

// blockCheck is a plate whose fasteners push a block of it out of its free end.
type blockCheck struct {
	place
	rows     *rows
	capacity float64
	why      *strength.Message
}

// blockStrength is F_tu A_nt + F_su A_nv of the weakest block, in N.
func (p *PreparedPattern) blockStrength(r *rows) (a allowable) {
	m := p.pattern.Plates[r.plate].Material
	for _, property := range []strength.Property{strength.Ftu, strength.Fsu} {
		if m.Value(property) == 0 {
			a.why = strength.Say("the material %q has no %s", m.Name, property)
			return a
		}
	}
	var weakest block
	a.value = math.Inf(1)
	for _, b := range p.blocks(r) {
		if value := float64(m.Ftu*b.tension) + float64(m.Fsu*b.shear); value < a.value && !math.IsInf(b.tension+b.shear, 0) {
			a.value, weakest = value, b
		}
	}
	if math.IsInf(a.value, 0) {
		a.why = strength.Say("the corner of the last row of plate %q does not lie inside its outline", p.pattern.Plates[r.plate].ID)
		return a
	}
	a.add("F_tu,plate", m.Ftu, strength.Stress, "", materialSource(m), m.MarkOf(strength.Ftu))
	a.add("F_su,plate", m.Fsu, strength.Stress, "", materialSource(m), m.MarkOf(strength.Fsu))
	a.add("A_nt", weakest.tension, strength.Area, "", "net area in tension across the last row, "+weakest.name+", from outline and holes", strength.Derived)
	a.add("A_nv", weakest.shear, strength.Area, "", "net area in shear from there to the free end", strength.Derived)
	a.add("P_bt", a.value, strength.Force, "F_tu,plate A_nt + F_su,plate A_nv", sourceBlock, strength.Derived)
	return a
}

// addBlock adds the block tearing of plate k at the first fastener of its last
// row.
func (p *PreparedPattern) addBlock(i, k int) {
	r := p.rows[k]
	if r == nil || r.sections[len(r.sections)-1].first != i {
		return
	}
	a := p.blockStrength(r)
	check := strength.Check{
		Member: p.pattern.Plates[k].ID, Mode: strength.BlockTearing, Level: strength.Ultimate, Unit: strength.Force,
		Method: methodBlock, Source: sourceBlock,
		Mark: strength.Weakest(strength.Derived, p.shearMark(strength.Ultimate), a.mark()),
	}
	p.assessments = append(p.assessments, &blockCheck{p.place(i, check, safety{}), r, a.value, reason(a.why)})
}

func (a *blockCheck) last() *section { return &a.rows.sections[len(a.rows.sections)-1] }

func (a *blockCheck) margin(c *caseState) strength.Margin {
	pull, _ := a.rows.through(a.c.Level, a.last())
	return compare(max(pull, 0)*a.factor[c.level], a.capacity, a.why)
}

func (a *blockCheck) steps() []strength.Working {
	s := a.rows.geometrySteps(a.p, a.last())
	steps := append(a.p.shearSteps(a.c.Level), s.steps...)
	return append(steps, a.p.blockStrength(a.rows).steps...)
}

func (a *blockCheck) caseSteps(c *caseState, i int) []strength.Working {
	if a.why != nil || a.last().area <= 0 {
		return nil
	}
	pull, _ := a.rows.through(a.c.Level, a.last())
	steps := a.rows.throughSteps(a.p, c, i, a.c.Level, a.last())
	steps = append(steps, strength.Working{
		Symbol: "P_f", Value: max(pull, 0), Unit: strength.Force, Equation: "max(N, 0)",
		Source: "what the fasteners push toward the free end", Mark: strength.Derived,
	})
	return append(steps, a.demandSteps(c, "P_f", max(pull, 0), "P_bt", a.margin(c))...)
}

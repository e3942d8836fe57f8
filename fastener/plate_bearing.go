package fastener

import (
	"slices"

	"jointledger/strength"
)

// bearingCheck is a plate borne upon by one fastener.
type bearingCheck struct {
	place
	plate    int
	share    float64
	edge     *edgeDistance // nil without an outline
	capacity float64
	why      *strength.Message
}

// addBearing adds the bearing checks of plate k at fastener i, ultimate and
// yield.
func (p *PreparedPattern) addBearing(i, k int, edges []edgeDistance) {
	plate := &p.pattern.Plates[k]
	if plate.Material == nil {
		return
	}
	var edge *edgeDistance
	if edges != nil {
		edge = &edges[i]
	}
	f := &p.pattern.Fasteners[i]
	for _, level := range []strength.Level{strength.Ultimate, strength.Limit} {
		capacity := bearing(f, plate, edge, level)
		check := strength.Check{
			Member: plate.ID, Mode: strength.Bearing, Level: level, Unit: strength.Force,
			Method: methodBearing, Source: sourceBearing,
			Mark: strength.Weakest(p.shearMark(level), capacity.mark()),
		}
		p.assessments = append(p.assessments, &bearingCheck{
			p.place(i, check), k, p.loadShare(i, k), edge, capacity.value, reason(capacity.why),
		})
	}
}

// loadShare is the part of a fastener's load that a plate bears.
func (p *PreparedPattern) loadShare(i, k int) float64 {
	switch plate := &p.pattern.Plates[k]; {
	case plate.LoadShare > 0:
		return plate.LoadShare
	case k > 0 && p.pattern.Fasteners[i].planes() == 2:
		return 0.5
	}
	return 1
}

// bearing returns the bearing strength in N of a plate at a fastener: F_bru D t
// at ultimate, F_bry D t at limit level, the stress by straight line between
// the ratios e/D for which it is given.
//
// A countersunk plate bears on its thickness less the whole depth (common
// practice, conservative).
//
// Range: e/D at least the least given (1.5 in handbooks), t/D at least 0.18;
// outside it there is none and why says so. Source: MIL-HDBK-5J section 1.4.7.
func bearing(f *Fastener, plate *Plate, edge *edgeDistance, level strength.Level) (a allowable) {
	stress, strong := strength.Fbru, "P_bru"
	if level == strength.Limit {
		stress, strong = strength.Fbry, "P_bry"
	}
	d, t := f.Diameter, plate.Thickness
	a.add("D", d, strength.Length, "", "input: fasteners.diameter", strength.Given)
	a.add("t", t, strength.Length, "", "input: plates.thickness", strength.Given)
	if edge == nil {
		a.why = strength.Say("plate %q has no outline, so the edge distance that %s depends on is not known", plate.ID, stress)
		return a
	}
	thick := "t"
	if plate.CountersinkDepth > 0 {
		thick, t = "t_b", t-plate.CountersinkDepth
		a.add("h_cs", plate.CountersinkDepth, strength.Length, "", "input: plates.countersink_depth", strength.Given)
		a.add("t_b", t, strength.Length, "t - h_cs", "countersunk bearing: thickness less the whole depth, conservative", strength.CommonPractice)
	}
	ratio := t / d
	a.add("t/D", ratio, strength.None, thick+" / D", "", strength.Given)
	a.steps = append(a.steps, edge.steps(f.X, f.Y).steps...)
	eOverD := edge.e / d
	a.add("e/D", eOverD, strength.None, "e / D", "", strength.Given)
	if strength.Less(ratio, leastThicknessToD) {
		a.why = strength.Say("t/D %.4g is below %.4g, the least for which bearing allowables hold", ratio, leastThicknessToD)
		return a
	}
	value, why := plate.Material.BearingAt(stress, eOverD)
	if !why.Empty() {
		a.why = why
		return a
	}
	a.addBearingStress(plate.Material, stress, eOverD, value)
	a.value = value * d * t
	a.add(strong, a.value, strength.Force, string(stress)+" D "+thick, sourceBearing, strength.Seen)
	return a
}

// addBearingStress writes the interpolation that Material.BearingAt made.
func (a *allowable) addBearingStress(m *strength.Material, stress strength.Property, eOverD, value float64) {
	pick := func(b strength.BearingStrength) float64 {
		if stress == strength.Fbry {
			return b.Fbry
		}
		return b.Fbru
	}
	given := slices.DeleteFunc(slices.Clone(m.Bearing), func(b strength.BearingStrength) bool { return pick(b) == 0 })
	slices.SortFunc(given, func(a, b strength.BearingStrength) int {
		if a.EOverD < b.EOverD {
			return -1
		}
		return 1
	})
	mark, source := m.MarkOf(stress), m.Source
	if source == "" {
		source = "input: material " + m.Name
	}
	eOverD = min(eOverD, strength.BearingFull)
	a.add("r", eOverD, strength.None, "min(e/D, 2)", "MIL-HDBK-5J section 1.4.7: none above that of 2.0", strength.Seen)
	for i, b := range given {
		last := i == len(given)-1
		if !last && !strength.AtMost(eOverD, b.EOverD) {
			continue
		}
		if i == 0 || strength.AtLeast(eOverD, b.EOverD) {
			a.add(string(stress), value, strength.Stress, "", source+", the value given for this e/D", mark)
			return
		}
		low := given[i-1]
		a.add("r_1", low.EOverD, strength.None, "", source, mark)
		a.add("r_2", b.EOverD, strength.None, "", source, mark)
		a.add("F_1", pick(low), strength.Stress, "", source, mark)
		a.add("F_2", pick(b), strength.Stress, "", source, mark)
		a.add(string(stress), value, strength.Stress, "F_1 + (r - r_1) / (r_2 - r_1) (F_2 - F_1)", "by straight line between the given ratios", strength.Seen)
		return
	}
}

func (a *bearingCheck) margin(c *caseState) strength.Margin {
	return compare(c.shares[a.c.Level][a.i].Resultant*a.share*a.factor[c.level], a.capacity, a.why)
}

func (a *bearingCheck) steps() []strength.Working {
	capacity := bearing(&a.p.pattern.Fasteners[a.i], &a.p.pattern.Plates[a.plate], a.edge, a.c.Level)
	source := "input: plates.load_share"
	if a.p.pattern.Plates[a.plate].LoadShare == 0 {
		source = "the whole load of the fastener"
		if a.share < 1 {
			source = "an outer plate of a joint in double shear"
		}
	}
	capacity.add("ψ", a.share, strength.None, "", source, strength.Given)
	return append(a.p.shearSteps(a.c.Level), capacity.steps...)
}

func (a *bearingCheck) caseSteps(c *caseState, i int) []strength.Working {
	share := c.shares[a.c.Level][a.i]
	steps := append(a.p.shearCaseSteps(c, i, a.c.Level, a.i),
		strength.Working{Symbol: "P_b", Value: share.Resultant * a.share, Unit: strength.Force, Equation: "ψ V", Source: "load of this plate"})
	capacity := "P_bru"
	if a.c.Level == strength.Limit {
		capacity = "P_bry"
	}
	return append(steps, a.demandSteps(c, "P_b", share.Resultant*a.share, capacity, a.margin(c))...)
}

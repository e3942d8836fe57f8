package fastener

import (
	"slices"

	"jointledger/strength"
)

// addBearing adds the bearing checks of plate k at fastener i, ultimate and
// yield.
func (p *PreparedPattern) addBearing(i, k int, edges []edgeDistance) {
	f, plate := &p.pattern.Fasteners[i], &p.pattern.Plates[k]
	if plate.Material == nil {
		return
	}
	var edge *edgeDistance
	if edges != nil {
		edge = &edges[i]
	}
	for _, level := range []strength.Level{strength.Ultimate, strength.Limit} {
		check := strength.Check{
			Member: plate.ID, Mode: strength.Bearing, Level: level, Unit: strength.Force,
			Method: methodBearing, Source: sourceBearing,
		}
		p.addFixed(i, check, byBearing, k, safety{}, func() allowable { return bearing(f, plate, edge, level) })
	}
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
		thick, t = "t_b", plate.bearingThickness()
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
	mark, source := m.MarkOf(stress), materialSource(m)
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

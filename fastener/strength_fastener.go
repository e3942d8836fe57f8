package fastener

import "jointledger/strength"

// addElementaryFastener adds the checks of fastener i by its rated strengths or
// its stresses.
func (p *PreparedPattern) addElementaryFastener(i int) {
	f := &p.pattern.Fasteners[i]
	shear := func() allowable { return f.Type.shear(f.Diameter, f.planes()) }
	tension := func() allowable { return f.Type.tension(f.Diameter) }
	check := strength.Check{Member: memberFastener, Level: strength.Ultimate, Unit: strength.Force}
	if p.pattern.InPlane != inPlaneCentre {
		check.Mode, check.Method, check.Source = strength.Shear, methodShear, sourceShear
		p.addFixed(i, check, byShear, 0, safety{}, shear)
	}
	check.Mode, check.Method, check.Source = strength.Tension, methodTension, sourceTension
	p.addFixed(i, check, byTension, 0, safety{}, tension)
	if curve, ok := interactions[p.pattern.Interaction]; ok {
		p.addInteraction(i, curve, curve.method, strength.Ultimate, safety{}, func() (allowable, allowable) { return shear(), tension() })
	}
}

// planes is the number of shear planes, 1 where none was given.
func (f *Fastener) planes() int { return max(f.ShearPlanes, 1) }

// addPullThrough adds the pull-through of the head of fastener i through its
// plate: against the allowable that was given, and undetermined for a
// countersunk head without one, since no published value fits every sheet.
func (p *PreparedPattern) addPullThrough(i int) {
	f := &p.pattern.Fasteners[i]
	if f.Type.PullThroughStrength == 0 && !f.Type.countersunk() {
		return
	}
	check := strength.Check{
		Member: memberFastener, Mode: strength.PullThrough, Level: strength.Ultimate, Unit: strength.Force,
		Method: methodPullThrough, Source: sourcePullThrough,
	}
	p.addFixed(i, check, byTension, 0, safety{}, func() (a allowable) {
		if f.Type.PullThroughStrength == 0 {
			a.why = strength.Say("a countersunk head can pull through its sheet; type %q has no pull_through_strength, which only tests give", f.Type.Name)
			return a
		}
		a.value = f.Type.PullThroughStrength
		a.add("P_pt", a.value, strength.Force, "", f.Type.source(), f.Type.Mark)
		return a
	})
}

package lug

import "jointledger/strength"

// Checks of methods that know axial loads only.

// axial adds such a check of one head: the strength that e gives, in N on the
// head, set against the load on the joint. A load with a transverse part leaves
// it undetermined.
func (b *builder) axial(p *part, mode strength.Mode, level strength.Level, safety strength.Safety, on sides, e *Equation, strengthOf func(*sheet) float64) {
	b.check(p.member, mode, level, strength.Force, safety, e, func(s *sheet) law {
		b.bearsStraight(s)
		k := fixed(on, p.allow(s, e.Symbol, s.apply(e, strengthOf(s))))
		k.axialOnly = b.axialOnly()
		return k
	})
}

// axialOnly says why a load with a transverse part has no margin.
func (b *builder) axialOnly() *strength.Message {
	if b.oblique == nil {
		why := strength.Say("%s computes axial loads only, and this one has a transverse part: choose a method with a transverse strength", b.method.ID)
		b.oblique = &why
	}
	return b.oblique
}

// bearsStraight lacks strengths that an eccentric load would lower.
func (b *builder) bearsStraight(s *sheet) {
	if b.joint.SingleShear {
		s.lack(strength.Say("%s takes no account of the eccentric moment of a joint in single shear: choose a method that does", b.method.ID))
	}
}

// axialTang adds the body behind the head where an offset hole bends it or its
// width is its own, with the stress that the method allows in a gross section.
func (b *builder) axialTang(p *part, level strength.Level, safety strength.Safety, e *Equation, stress func(*sheet) float64) {
	if !p.bends() && p.head.BodyWidth == 0 {
		return
	}
	own := *e
	own.Text += " wT t"
	if p.bends() {
		own.Text += " / (1 + 6 |o| / wT)"
	}
	b.axial(p, strength.Tang, level, safety, pull|transverse, &own, func(s *sheet) float64 {
		capacity, wt := stress(s)*p.bodyWidth(s)*p.thickness(s), p.bodyWidth(s)
		if p.head.Offset != 0 {
			s.read.add(p.first + fieldRestrained)
		}
		if !p.bends() {
			return capacity
		}
		return capacity / (1 + 6*p.offset(s)/wt)
	})
}

package lug

import (
	"math"

	"jointledger/strength"
)

// A press-fitted bushing stresses the lug without any load. Lamé's thick rings:
// inner radius A, interface B, outer C the nearest outline.

const sustained = 0.25 // of Ftu across, above which stress corrosion is a question

var (
	eqRingInner  = Equation{Symbol: "A", Text: "Dp / 2", Unit: strength.Length, Source: "press fit", Mark: strength.Derived}
	eqRingFace   = Equation{Symbol: "B", Text: "D / 2", Unit: strength.Length, Source: "press fit", Mark: strength.Derived}
	eqRingOuter  = Equation{Symbol: "C", Text: "min(e, c1)", Unit: strength.Length, Source: "press fit: the nearest outline", Mark: strength.Derived}
	eqRadial     = Equation{Symbol: "u_r", Text: "i / 2", Unit: strength.Length, Source: "press fit: radial interference", Mark: strength.Derived}
	eqPressure   = Equation{Symbol: "p", Text: "u_r / ((B/E_L) ((C^2 + B^2)/(C^2 - B^2) + ν_L) + (B/E_B) ((B^2 + A^2)/(B^2 - A^2) - ν_B))", Unit: strength.Stress, Source: "Lamé, thick rings; AFFDL-TR-69-42 chapter 9, press-fit bushings", Mark: strength.FromMemory(95)}
	eqHoop       = Equation{Symbol: "demand", Text: "p (C^2 + B^2) / (C^2 - B^2)", Unit: strength.Stress, Source: "Lamé: hoop tension at the bore of the lug", Mark: strength.FromMemory(95)}
	eqHoopInner  = Equation{Symbol: "demand", Text: "2 p B^2 / (B^2 - A^2)", Unit: strength.Stress, Source: "Lamé: hoop compression at the bore of the bushing", Mark: strength.FromMemory(95)}
	eqHoopAllow  = Equation{Symbol: "allowable", Text: "F_ty,cross", Unit: strength.Stress, Source: "press fit, yield across the grain", Mark: strength.Derived}
	eqInnerAllow = Equation{Symbol: "allowable", Text: "F_cy", Unit: strength.Stress, Source: "press fit, compressive yield of the bushing", Mark: strength.Derived}
)

var pressEquations = []*Equation{&eqRingInner, &eqRingFace, &eqRingOuter, &eqRadial, &eqPressure, &eqHoop, &eqHoopInner, &eqHoopAllow, &eqInnerAllow}

// pressFit adds the stresses of an interference at limit. They are never added
// to ultimate checks: yielding relieves them.
func (m *affdl) pressFit(h *affdlHead) {
	if h.bushing == nil || h.bushing.Interference == 0 && !h.varies.has(h.first+fieldInterference) {
		return
	}
	add := func(member string, e *Equation, stresses func(*sheet) (demand, allowable float64)) {
		m.check(member, strength.Yielding, strength.Limit, strength.Stress, strength.ByRegulation, e, func(s *sheet) law {
			demand, allowable := stresses(s)
			return law{
				sides: anyWay, unloaded: true,
				margin: func(*load, float64) strength.Margin { return strength.Compare(demand, allowable) },
			}
		})
	}
	add(h.member, &eqHoop, func(s *sheet) (float64, float64) {
		p, _, b, c := h.fitPressure(s)
		hoop := s.apply(&eqHoop, p*(float64(c*c)+float64(b*b))/(float64(c*c)-float64(b*b)))
		if ftu := h.head.Material.FtuCross; ftu > 0 && s.known() && hoop > sustained*ftu {
			s.find(strength.Warning, "sustained-tension", h.member, "press fit, threshold derived for this project",
				"the press fit keeps the bore at %v in tension, %.4g of F_tu across: a question of stress corrosion", strength.Stress.Of(hoop), hoop/ftu)
		}
		return hoop, s.apply(&eqHoopAllow, h.property(s, strength.FtyCross))
	})
	add(h.bushingMember, &eqHoopInner, func(s *sheet) (float64, float64) {
		p, a, b, _ := h.fitPressure(s)
		hoop := s.apply(&eqHoopInner, 2*p*float64(b*b)/(float64(b*b)-float64(a*a)))
		return hoop, s.apply(&eqInnerAllow, s.property(h.bushingMember, &h.bushing.Material, strength.Fcy, string(strength.Fcy)))
	})
}

// fitPressure is the pressure in MPa of the press fit, with the radii in mm.
func (h *affdlHead) fitPressure(s *sheet) (p, a, b, c float64) {
	a = s.apply(&eqRingInner, h.pinDiameter(s)/2)
	b = s.apply(&eqRingFace, h.hole(s)/2)
	c = s.apply(&eqRingOuter, min(h.edge(s), h.side(s)))
	u := s.apply(&eqRadial, s.input(h.bushingMember, "i", h.bushing.Interference, strength.Length, h.first+fieldInterference)/2)
	own, ring := &h.head.Material, &h.bushing.Material
	el, nl := s.property(h.member, own, strength.E, "E_L"), s.property(h.member, own, strength.Nu, "ν_L")
	eb, nb := s.property(h.bushingMember, ring, strength.E, "E_B"), s.property(h.bushingMember, ring, strength.Nu, "ν_B")
	rings := float64(b/el*((float64(c*c)+float64(b*b))/(float64(c*c)-float64(b*b))+nl)) +
		float64(b/eb*((float64(b*b)+float64(a*a))/(float64(b*b)-float64(a*a))-nb))
	p = u / rings
	if math.IsNaN(p) {
		p = 0
	}
	return s.apply(&eqPressure, p), a, b, c
}

package lug

import (
	"math"

	"jointledger/strength"
)

// asmeBTH1 is the pinned connection of ASME BTH-1-2008, section 3-3.3: below-
// the-hook lifting devices, strengths divided by a design factor.
var asmeBTH1 = Method{
	ID: "asme-bth-1", Revision: 1,
	Title:  "ASME BTH-1-2008, pinned connections of below-the-hook lifting devices",
	Source: "ASME BTH-1-2008 section 3-3.3",
	Range:  "axial loads; the limit load against strengths divided by the design factor; symmetric joints",
	Mark:   weakestMark(asmeEquations),
	Modes:  []strength.Mode{strength.NetSection, strength.ShearOut, strength.Bearing, strength.Fracture, strength.Tang, strength.BodyBending},
	Options: []Option{
		{Name: "design_factor", Meaning: "N_d: 2.0 for design category A, 3.0 for B, 6.0 for C", Kind: Number, Default: Value{Number: 3}, HasDefault: true, Least: 1, Most: 20},
		{Name: "clearance", Meaning: "C_r of the clearance between pin and hole: one, as allowed for Dp/Dh above 0.90, or by formula", Kind: Word, Words: []string{"one", "formula"}, Default: Value{Word: "one"}, HasDefault: true, Requires: "pin"},
		{Name: "stiffened", Meaning: "the plate is stiffened or held against dishing, which waives the limit of 4 t on the effective width", Kind: Flag, HasDefault: true},
		{Name: "turning", Meaning: "the pin turns under load for many cycles", Kind: Flag, HasDefault: true},
		applySpecial,
	},
	Equations: asmeEquations,
	prepare:   prepareASME,
}

// applySpecial is the option of methods with factors of their own.
var applySpecial = Option{
	Name: "apply_special", Meaning: "the fitting factor and special factors act on top of the method's own factors",
	Kind: Flag, HasDefault: true,
}

const (
	asmeSource    = "ASME BTH-1-2008 section 3-3.3.1"
	closePin      = 0.90 // Dp/Dh above which the clearance may be neglected
	fractureExtra = 1.20 // on the design factor, for strengths on Fu
)

var (
	eqActualWidth  = Equation{Symbol: "b_e", Text: "c1 - D/2", Unit: strength.Length, Source: geometrySource + ": from the hole to the nearer side", Mark: strength.Derived}
	eqClearOne     = Equation{Symbol: "C_r", Text: "1", Unit: strength.None, Source: "ASME BTH-1-2008 section 3-3.3.1: the clearance may be neglected for Dp/Dh above 0.90", Mark: strength.Seen}
	eqClearFormula = Equation{Symbol: "C_r", Text: "1 - 0.275 sqrt(1 - (Db / D)^2)", Unit: strength.None, Source: asmeSource, Mark: strength.FromMemory(95)}
	eqEffective    = Equation{Symbol: "b_eff", Text: "min(b_e, 4 t, 0.6 b_e (F_tu / F_ty) sqrt(D / b_e))", Unit: strength.Length, Source: asmeSource + ", effective width", Mark: strength.FromMemory(95)}
	eqEffectiveS   = Equation{Symbol: "b_eff", Text: "min(b_e, 0.6 b_e (F_tu / F_ty) sqrt(D / b_e))", Unit: strength.Length, Source: asmeSource + ", effective width, stiffened against dishing", Mark: strength.FromMemory(95)}
	eqASMETension  = Equation{Symbol: "P_t", Text: "C_r F_tu / (1.20 N_d) 2 t b_eff", Unit: strength.Force, Source: asmeSource + ", tension through the pin hole", Mark: strength.FromMemory(97)}
	eqASMEFracture = Equation{Symbol: "P_b", Text: "C_r F_tu / (1.20 N_d) (1.13 (e - D/2) + 0.92 b_e / (1 + b_e / D)) t", Unit: strength.Force, Source: asmeSource + ", single-plane fracture", Mark: strength.FromMemory(95)}
	eqPlaneAngle   = Equation{Symbol: "φ", Text: "55 Db / D", Unit: strength.Degrees, Source: asmeSource + ", double-plane shear", Mark: strength.FromMemory(95)}
	eqCurvedLoss   = Equation{Symbol: "Z'", Text: "r - sqrt(r^2 - ((Db/2) sin(φ))^2)", Unit: strength.Length, Source: asmeSource + ", what a curved end takes from the shear plane", Mark: strength.FromMemory(85)}
	eqTaperLoss    = Equation{Symbol: "Z'", Text: "max(0, e - (W/2 - |o| - (Db/2) sin(φ)) / tan(β))", Unit: strength.Length, Source: geometrySource + ": what a converging side takes from the shear plane", Mark: strength.Derived}
	eqShearArea    = Equation{Symbol: "A_v", Text: "max(0, 2 (e - D/2 + (Db/2) (1 - cos(φ)) - Z') t)", Unit: strength.Area, Source: asmeSource + ", double-plane shear, curved or tapered end", Mark: strength.FromMemory(85)}
	eqShearAreaF   = Equation{Symbol: "A_v", Text: "2 (e - D/2 + (Db/2) (1 - cos(φ))) t", Unit: strength.Area, Source: asmeSource + ", double-plane shear", Mark: strength.Seen}
	eqASMEShear    = Equation{Symbol: "P_v", Text: "0.70 F_tu / (1.20 N_d) A_v", Unit: strength.Force, Source: asmeSource + ", double-plane shear", Mark: strength.Seen}
	eqASMEBearing  = Equation{Symbol: "P_p", Text: "1.25 F_ty / N_d Db t_b", Unit: strength.Force, Source: "ASME BTH-1-2008 section 3-3.3.4, bearing", Mark: strength.FromMemory(92)}
	eqASMETurning  = Equation{Symbol: "P_p", Text: "0.63 F_ty / N_d Db t_b", Unit: strength.Force, Source: "ASME BTH-1-2008 section 3-3.3.4, bearing of a pin that turns under load", Mark: strength.FromMemory(92)}
	eqASMEBody     = Equation{Symbol: "P_T", Text: "F_ty / N_d", Unit: strength.Force, Source: "ASME BTH-1-2008 section 3-2.1, gross section, with the bending of an offset hole by statics", Mark: strength.FromMemory(92)}
)

var asmeEquations = gather(geometryEquations, []*Equation{
	&eqActualWidth, &eqClearOne, &eqClearFormula, &eqEffective, &eqEffectiveS, &eqASMETension, &eqASMEFracture,
	&eqPlaneAngle, &eqCurvedLoss, &eqTaperLoss, &eqShearArea, &eqShearAreaF, &eqASMEShear, &eqASMEBearing, &eqASMETurning, &eqASMEBody,
}, bodyEquations)

func prepareASME(b *builder) {
	for _, p := range b.heads() {
		h := &asmeHead{part: p, b: b}
		b.axial(p, strength.NetSection, strength.Limit, strength.ByMethod, pull|transverse, &eqASMETension, h.tension)
		b.axial(p, strength.ShearOut, strength.Limit, strength.ByMethod, pull|transverse, &eqASMEShear, h.shear)
		e := &eqASMEBearing
		if b.flag("turning") {
			e = &eqASMETurning
		}
		b.axial(p, strength.Bearing, strength.Limit, strength.ByMethod, anyWay, e, h.bearing)
		b.axial(p, strength.Fracture, strength.Limit, strength.ByMethod, pull|transverse, &eqASMEFracture, h.fracture)
		b.axialTang(p, strength.Limit, strength.ByMethod, &eqASMEBody, func(s *sheet) float64 {
			return p.property(s, strength.Fty) / h.factor(s)
		})
		b.bodyBendingCheck(p)
	}
}

// asmeHead is a head under the method. The hole is Dh and what bears in it Dp
// of the standard: the pin, or the bushing as one with its hole.
type asmeHead struct {
	*part
	b *builder
}

// factor is N_d.
func (h *asmeHead) factor(s *sheet) float64 { return h.b.chosen(s, "N_d", "design_factor") }

// chosen writes a number of the options.
func (b *builder) chosen(s *sheet, symbol, name string) float64 {
	return s.option(symbol, b.number(name), "method_options."+b.method.ID+"."+name, strength.Given)
}

// pinned lacks strengths of a pinned connection without its pin.
func (h *asmeHead) pinned(s *sheet) float64 {
	h.pinDiameter(s)
	return h.bearingDiameter(s)
}

// clearance is C_r, what the pin's play in the hole leaves.
func (h *asmeHead) clearance(s *sheet) float64 {
	pin, hole := h.pinned(s), h.hole(s)
	ratio := pin / hole
	if h.b.value("clearance").Word == "one" && strength.More(ratio, closePin) {
		return s.apply(&eqClearOne, 1)
	}
	return s.apply(&eqClearFormula, 1-float64(0.275*math.Sqrt(max(0, 1-float64(ratio*ratio)))))
}

func (p *part) actualWidth(s *sheet) float64 { return s.apply(&eqActualWidth, p.side(s)-p.hole(s)/2) }

func (h *asmeHead) tension(s *sheet) float64 {
	be, t, hole := h.actualWidth(s), h.thickness(s), h.hole(s)
	ftu, fty := h.property(s, strength.Ftu), h.property(s, strength.Fty)
	effective := min(be, 0.6*be*(ftu/fty)*math.Sqrt(hole/be))
	e := &eqEffectiveS
	if !h.b.flag("stiffened") {
		e, effective = &eqEffective, min(effective, 4*t)
	}
	effective = s.apply(e, effective)
	return h.clearance(s) * ftu / (fractureExtra * h.factor(s)) * 2 * t * effective
}

func (h *asmeHead) fracture(s *sheet) float64 {
	be, t, hole, e := h.actualWidth(s), h.thickness(s), h.hole(s), h.edge(s)
	return h.clearance(s) * h.property(s, strength.Ftu) / (fractureExtra * h.factor(s)) *
		(float64(1.13*(e-hole/2)) + float64(0.92*be/(1+be/hole))) * t
}

func (h *asmeHead) shear(s *sheet) float64 {
	pin, hole, t := h.pinned(s), h.hole(s), h.thickness(s)
	angle := s.apply(&eqPlaneAngle, 55*pin/hole) * math.Pi / 180
	length := h.edge(s) - hole/2 + float64(pin/2*(1-math.Cos(angle)))
	e := &eqShearAreaF
	y := pin / 2 * math.Sin(angle)
	switch h.head.Shape {
	case Round:
		r := h.endRadius(s)
		e = &eqShearArea
		length -= s.apply(&eqCurvedLoss, r-math.Sqrt(float64(r*r)-float64(y*y)))
	case Tapered:
		e = &eqShearArea
		length -= s.apply(&eqTaperLoss, h.edge(s)-h.taperedEnd(s, y))
	}
	area := s.apply(e, max(0, 2*length*t))
	return 0.70 * h.property(s, strength.Ftu) / (fractureExtra * h.factor(s)) * area
}

func (h *asmeHead) bearing(s *sheet) float64 {
	stress := 1.25
	if h.b.flag("turning") {
		stress = 0.63
	}
	return stress * h.property(s, strength.Fty) / h.factor(s) * h.pinned(s) * h.bearingLength(s)
}

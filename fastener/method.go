package fastener

import (
	"fmt"

	"jointledger/strength"
)

// Method describes one published method.
type Method struct {
	ID       string
	Revision int
	// Kind is "pattern", "splice", "strength" or "interaction".
	Kind                 string
	Title, Source, Range string
	Mark                 strength.Mark
	Equations            []Equation
}

// Equation is one equation of a method, in the symbols of its workings.
type Equation struct {
	Number, Text, Source string
	Mark                 strength.Mark
}

// Name is the method as checks carry it, id@revision.
func (m Method) Name() string { return fmt.Sprintf("%s@%d", m.ID, m.Revision) }

// The names that checks carry.
const (
	methodElastic     = "elastic-centroid@1"
	methodCentre      = "instantaneous-centre@1"
	methodShear       = "fastener-shear@1"
	methodTension     = "fastener-tension@1"
	methodBearing     = "plate-bearing@1"
	methodInteract22  = "interaction-2-2@1"
	sourceInPlane     = "NASA RP-1228, eccentric shear: direct share plus moment share about the centroid of stiffness"
	sourceOutOfPlane  = "rigid attached member on linear springs about the centroid of their stiffness"
	sourceSlotted     = "rigid attached member on springs that resist nothing along a slot"
	sourceHeel        = "rigid attached member turning about the side or vertex of its outline that stays in contact"
	sourceCentre      = "AISC Steel Construction Manual part 7, instantaneous centre of rotation"
	sourceBearing     = "MIL-HDBK-5J section 1.4.7: bearing stress on D t, by straight line between e/D 1.5 and 2.0"
	sourceShear       = "NASA RP-1228: F_su times the area in the shear plane, or the rated strength"
	sourceTension     = "the part standard's rated strength, else F_tu times the tensile stress area"
	sourceInteract22  = "ANC-5, Bruhn chapter D1: R_s² + R_t² = 1"
	rangeBearing      = "e/D at least 1.5 (below it only tests count), t/D at least 0.18"
	leastThicknessToD = 0.18
)

// Methods returns the methods of this package, compliance formulas aside, in
// the order of answers.
func Methods() []Method {
	return append([]Method{
		{
			ID: "elastic-centroid", Revision: 1, Kind: "pattern",
			Title:  "Elastic sharing about the stiffness centroid, all six load components",
			Source: sourceInPlane + "; " + sourceOutOfPlane,
			Range:  "a rigid attached member; leaves out prying and the flexibility of flanges",
			Mark:   strength.Derived,
			Equations: []Equation{
				{"1", "V_x = k_v (P_x/K_v - M_z (y - y_c)/J)", sourceInPlane, strength.Seen},
				{"2", "V_y = k_v (P_y/K_v + M_z (x - x_c)/J)", sourceInPlane, strength.Seen},
				{"3", "T = k_t (P_z/K_t + a (y - y_t) - b (x - x_t))", sourceOutOfPlane, strength.Derived},
				{"4", "T = k_t l M_h / Σ(k_t l²), heel on a side", sourceHeel, strength.Derived},
				{"5", "V = k_v (1 - s sᵀ) δ, slotted along s", sourceSlotted, strength.Derived},
			},
		},
		{
			ID: "instantaneous-centre", Revision: 1, Kind: "pattern",
			Title: "Eccentric shear at ultimate about the instantaneous centre", Source: sourceCentre,
			Range: "high-strength steel bolts in bearing, at ultimate; others with a caution",
			Mark:  strength.FromMemory(95),
			Equations: []Equation{
				{"1", "R = V_u (1 - exp(-10 Δ))^0.55, Δ in inches, 0.34 in at the farthest", sourceCentre, strength.FromMemory(95)},
			},
		},
		{
			ID: "fastener-shear", Revision: 1, Kind: "strength",
			Title: "Shear of a fastener, single or double", Source: sourceShear,
			Range: "any", Mark: strength.Derived,
			Equations: []Equation{{"1", "V_u = n F_su A_s", sourceShear, strength.Derived}},
		},
		{
			ID: "fastener-tension", Revision: 1, Kind: "strength",
			Title: "Tension of a fastener", Source: sourceTension,
			Range: "any; a fastener pushed together by its share is not in tension", Mark: strength.Derived,
			Equations: []Equation{
				{"1", "A_t = 0.7854 (D - 0.9743 p)²", "ASME B1.1", strength.Seen},
				{"2", "A_t = π/4 (D - 0.9382 p)²", "ISO 898-1", strength.FromMemory(97)},
				{"3", "T_u = F_tu A_t", sourceTension, strength.Derived},
			},
		},
		{
			ID: "plate-bearing", Revision: 1, Kind: "strength",
			Title: "Bearing of a plate at ultimate and yield", Source: sourceBearing,
			Range: rangeBearing, Mark: strength.Seen,
			Equations: []Equation{{"1", "P_bru = F_bru D t", sourceBearing, strength.Seen}, {"2", "P_bry = F_bry D t", sourceBearing, strength.Seen}},
		},
		interactionMethod("2-2", "Shear and tension on a circle"),
		interactionMethod("3-2", "Shear cubed and tension squared"),
		interactionMethod("nasa-5020-body", "Shear and tension, body in the shear plane"),
		interactionMethod("nasa-5020-thread", "Shear and tension, threads in the shear plane"),
		interactionMethod("en-1993-1-8", "Shear and tension of bolts in buildings"),
	}, spliceMethods()...)
}

func interactionMethod(word, title string) Method {
	curve := interactions[word]
	return Method{
		ID: "interaction-" + word, Revision: 1, Kind: "interaction", Title: title, Source: curve.source,
		Range: "shear and tension together; the margin is the factor on the load that reaches the curve, minus 1",
		Mark:  curve.mark, Equations: []Equation{{"1", "R = " + curve.equation + " <= 1", curve.source, curve.mark}},
	}
}

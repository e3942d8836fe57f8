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
	methodElastic      = "elastic-centroid@1"
	methodCentre       = "instantaneous-centre@1"
	methodShear        = "fastener-shear@1"
	methodTension      = "fastener-tension@1"
	methodBearing      = "plate-bearing@1"
	methodShearOut     = "plate-shear-out@1"
	methodPlateSection = "plate-net-section@1"
	methodBlock        = "plate-block-tearing@1"
	methodBuckling     = "inter-fastener-buckling@1"
	sourcePlateSection = "stress across a row of holes, N/A + M c/I of the net section, as of a lug's net section with its bending"
	sourceBlock        = "block tearing: F_tu on the net area in tension and F_su on that in shear"
	sourceBuckling     = "inter-rivet buckling, F_ir = η c π² E_c/12 (t/p)²"
	methodPreload      = "nasa-std-5020-preload@1"
	methodPullThrough  = "pull-through@1"
	methodAISC         = "aisc-360-j3@1"
	methodEN           = "en-1993-1-8@1"
	sourceShearOut     = "two planes from the hole at 40° to the load, as of a lug: 2 t L F_su"
	sourcePullThrough  = "the allowable given for this head and sheet"
	methodInteract22   = "interaction-2-2@1"
	sourceInPlane      = "NASA RP-1228, eccentric shear: direct share plus moment share about the centroid of stiffness"
	sourceOutOfPlane   = "rigid attached member on linear springs about the centroid of their stiffness"
	sourceSlotted      = "rigid attached member on springs that resist nothing along a slot"
	sourceHeel         = "rigid attached member turning about the side or vertex of its outline that stays in contact"
	sourceCentre       = "AISC Steel Construction Manual part 7, instantaneous centre of rotation"
	sourceBearing      = "MIL-HDBK-5J section 1.4.7: bearing stress on D t, by straight line between e/D 1.5 and 2.0"
	sourceShear        = "NASA RP-1228: F_su times the area in the shear plane, or the rated strength"
	sourceTension      = "the part standard's rated strength, else F_tu times the tensile stress area"
	sourceInteract22   = "ANC-5, Bruhn chapter D1: R_s² + R_t² = 1"
	rangeBearing       = "e/D at least 1.5 (below it only tests count), t/D at least 0.18"
	leastThicknessToD  = 0.18
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
		{
			ID: "plate-shear-out", Revision: 1, Kind: "strength",
			Title: "Shear-out of a plate along the load", Source: sourceShearOut,
			Range: "toward the outline; holes in between are the matter of pitch rules", Mark: strength.Derived,
			Equations: []Equation{{"1", "P_so = 2 F_su t L", sourceShearOut, strength.Derived}},
		},
		{
			ID: "plate-net-section", Revision: 1, Kind: "strength",
			Title: "Net section of a plate across its rows", Source: sourcePlateSection,
			Range: "plates with an axis_angle; straight across each row, not along a zigzag between staggered rows; elastic fibre stress", Mark: strength.Derived,
			Equations: []Equation{{"1", "σ = N / A_net + M c / I_net <= F_tu, F_ty", sourcePlateSection, strength.Derived}},
		},
		{
			ID: "plate-block-tearing", Revision: 1, Kind: "strength",
			Title: "Block tearing of a plate toward its free end", Source: sourceBlock,
			Range: "plates with an axis_angle and fasteners in rows and columns", Mark: strength.Derived,
			Equations: []Equation{{"1", "P_bt = F_tu A_nt + F_su A_nv", sourceBlock, strength.Derived}},
		},
		{
			ID: "inter-fastener-buckling", Revision: 1, Kind: "strength",
			Title: "Buckling of a plate between fasteners", Source: sourceBuckling,
			Range: "plates with an axis_angle, in compression between rows", Mark: strength.FromMemory(85),
			Equations: []Equation{
				{"1", "F_e = c_f π² E_c/12 (t/p)², c_f 4, 3, 1.5, 1", sourceBuckling, strength.FromMemory(85)},
				{"2", "F_ir = F_cy (1 - F_cy/(4 F_e)) above F_cy/2", "Johnson's parabola", strength.Derived},
			},
		},
		{
			ID: "nasa-std-5020-preload", Revision: 1, Kind: "strength",
			Title: "Preloaded bolts: tension, slip and separation", Source: sourcePreload,
			Range: "wherever type.preload is given", Mark: strength.FromMemory(90),
			Equations: []Equation{
				{"1", "P_0max = (1 + Γ) P_i + P_tg", sourcePreload, strength.FromMemory(90)},
				{"2", "P_0min = (1 - Γ) (1 - ρ) P_i - P_tl", sourcePreload, strength.FromMemory(90)},
				{"3", "T_pu = (T_u - P_0max) / (n_p φ), or T_u where the joint separates first", sourcePreload, strength.FromMemory(90)},
				{"4", "V_slip = n μ P_0min, less what tension takes of the clamping", sourcePreload, strength.Derived},
			},
		},
		{
			ID: "pull-through", Revision: 1, Kind: "strength",
			Title: "Pull-through of a head", Source: sourcePullThrough,
			Range: "undetermined for a countersunk head without a given allowable", Mark: strength.Given,
			Equations: []Equation{{"1", "P_pt, by test", sourcePullThrough, strength.Given}},
		},
		{
			ID: "aisc-360-j3", Revision: 1, Kind: "strength",
			Title: "Bolts and bearing by AISC 360-16 J3", Source: sourceAISCShear + "; " + sourceAISCBearing,
			Range: rangeAISC, Mark: strength.FromMemory(85),
			Equations: []Equation{
				{"J3-1", "R_n = F_nv A_b, F_nt A_b", sourceAISCShear, strength.FromMemory(95)},
				{"J3-3", "(R_s + R_t) / 1.3 <= 1", sourceAISCTogether, strength.FromMemory(95)},
				{"J3-6", "R_n = 1.2 l_c t F_u <= 2.4 d t F_u, φ 0.75, Ω 2", sourceAISCBearing, strength.Seen},
			},
		},
		{
			ID: "en-1993-1-8", Revision: 1, Kind: "strength",
			Title: "Bolts and bearing by EN 1993-1-8 table 3.4", Source: "EN 1993-1-8 table 3.4",
			Range: rangeEN, Mark: strength.FromMemory(95),
			Equations: []Equation{
				{"table 3.4", "F_v = α_v f_ub A / γ_M2", sourceENShear, strength.Seen},
				{"table 3.4", "F_b = k_1 α_b f_u d t / γ_M2", sourceENBearing, strength.Seen},
				{"table 3.4", "F_t = k_2 f_ub A_s / γ_M2", sourceENTension, strength.Seen},
				{"table 3.4", "B_p = 0.6 π d_m t_p f_u / γ_M2", sourceENPunch, strength.Seen},
				{"3.5", "β_Lf = 1 - (L_j - 15 d) / (200 d), 0.75 to 1", sourceENLong, strength.FromMemory(95)},
				{"3.3", "β_p = 9 d / (8 d + 3 t_p)", sourceENPack, strength.FromMemory(95)},
			},
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

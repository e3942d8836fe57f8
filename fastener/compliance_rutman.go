package fastener

import (
	"math"

	"jointledger/strength"
)

// rutman is the compliance of a fastener as a Timoshenko beam between the
// mid-planes of two plates, held at each by a bearing spring and a rotational
// spring in series of plate and fastener:
//
//	k_j = t_j/(1/E_j + 1/E_f),  r_j = t_j³/12/(1/E_j + 1/E_f)
//
// The plates do not rotate. With l = (t_1 + t_2)/2 between the mid-planes and m
// the moment at plate 1 per load, which least work gives,
//
//	m = (l/r_2 + l²/(2 E_f I)) / (1/r_1 + 1/r_2 + l/(E_f I))
//	C = 1/k_1 + 1/k_2 + l/(κ G A) + m²/r_1 + (l - m)²/r_2 + (m² l - m l² + l³/3)/(E_f I)
//
// κ = 9/10, the shear factor of a solid circle by the work of τ = V Q/(I b).
// mm, MPa, mm/N; single shear only.
//
// Source: Rutman et al. (2007) for the springs and the beam, seen; the closed
// form of two plates is derived.
var rutman = ComplianceFormula{
	ID: "rutman", Revision: 1,
	Title:  "Rutman: bearing and rotational springs of each plate, shank as a Timoshenko beam",
	Source: sourceRutman,
	Range:  "single shear, elastic, plates that do not rotate",
	Mark:   strength.Derived, needsNu: true,
	Equations: []Equation{
		{"1", "k_j = t_j/(1/E_j + 1/E_f), r_j = t_j³/12/(1/E_j + 1/E_f)", sourceRutman, strength.Seen},
		{"2", "C = 1/k_1 + 1/k_2 + l/(κ G A) + m²/r_1 + (l - m)²/r_2 + l ((m - l/2)² + l²/12)/(E_f I), m = (l/r_2 + l²/(2 E_f I))/(1/r_1 + 1/r_2 + l/(E_f I)), l = (t_1 + t_2)/2", sourceRutman + "; closed form by least work", strength.Derived},
	},
	single: rutmanSingle,
}

const sourceRutman = "Rutman et al. (2007)"

func rutmanSingle(i Interface, s *complianceSheet) float64 {
	spring := func(symbol string, value float64, unit strength.Unit, equation string) float64 {
		return s.add(symbol, value, unit, equation, sourceRutman, strength.Seen)
	}
	derived := func(symbol string, value float64, unit strength.Unit, equation string) float64 {
		return s.add(symbol, value, unit, equation, sourceRutman+"; closed form by least work", strength.Derived)
	}
	s.inputs(i, true)
	e1 := 1 / (1/i.E1 + 1/i.Ef)
	e2 := 1 / (1/i.E2 + 1/i.Ef)
	k1 := spring("k_1", i.T1*e1, strength.Stiffness, "t_1 / (1 / E_1 + 1 / E_f)")
	k2 := spring("k_2", i.T2*e2, strength.Stiffness, "t_2 / (1 / E_2 + 1 / E_f)")
	r1 := spring("r_1", i.T1*i.T1*i.T1/12*e1, strength.Moment, "t_1³ / (12 (1 / E_1 + 1 / E_f))")
	r2 := spring("r_2", i.T2*i.T2*i.T2/12*e2, strength.Moment, "t_2³ / (12 (1 / E_2 + 1 / E_f))")

	d := i.Diameter
	l := derived("l", (i.T1+i.T2)/2, strength.Length, "(t_1 + t_2) / 2")
	kappa := derived("κ", 0.9, strength.None, "9 / 10")
	g := derived("G_f", i.Ef/(2*(1+i.Nuf)), strength.Stress, "E_f / (2 (1 + ν_f))")
	a := derived("A", math.Pi/4*d*d, strength.Area, "π d² / 4")
	inertia := derived("I", math.Pi/64*d*d*d*d, strength.Quartic, "π d⁴ / 64")
	ei := i.Ef * inertia

	m := derived("m", (l/r2+l*l/(2*ei))/(1/r1+1/r2+l/ei), strength.Length,
		"(l / r_2 + l² / (2 E_f I)) / (1 / r_1 + 1 / r_2 + l / (E_f I))")
	bearing := derived("C_bearing", 1/k1+1/k2, strength.Compliance, "1 / k_1 + 1 / k_2")
	shear := derived("C_shear", l/(kappa*g*a), strength.Compliance, "l / (κ G_f A)")
	turning := derived("C_rotation", m*m/r1+(l-m)*(l-m)/r2, strength.Compliance, "m² / r_1 + (l - m)² / r_2")
	// (m² l - m l² + l³/3) with its cancellation taken out.
	bent := l * (float64((m-l/2)*(m-l/2)) + float64(l*l/12))
	bending := derived("C_bending", bent/ei, strength.Compliance, "l ((m - l / 2)² + l² / 12) / (E_f I)")
	return derived("C", bearing+shear+turning+bending, strength.Compliance,
		"C_bearing + C_shear + C_rotation + C_bending")
}

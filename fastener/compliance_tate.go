package fastener

import (
	"math"

	"jointledger/strength"
)

// tateRosenfeld is the compliance of a bolt from its shear, its bending and the
// bearing of bolt and plates.
//
// Double shear, per load on one shear plane (t_1 the middle plate, t_2 each
// strap, G, A, I of the bolt):
//
//	C_b = (2 t_2 + t_1)/(3 G A) + (8 t_2³ + 16 t_2² t_1 + 8 t_2 t_1² + t_1³)/(192 E_f I)
//	      + (2 t_2 + t_1)/(t_2 t_1 E_f) + 1/(t_2 E_2) + 2/(t_1 E_1)
//
// On the bolt's whole load the compliance is C_b/2: each shear plane carries
// half of it. Source: NACA TN 1051 (1946), remembered 95 %; the half derived
// term by term.
//
// Single shear, as later papers quote it under the same name, remembered 90 %:
//
//	C = 1/(E_f t_1) + 1/(E_f t_2) + 1/(E_1 t_1) + 1/(E_2 t_2)
//	    + 32 (t_1 + t_2)(1 + ν_f)/(9 E_f π d²)
//	    + 8 (t_1³ + 5 t_1² t_2 + 5 t_1 t_2² + t_2³)/(5 E_f π d⁴)
//
// All in mm, MPa and mm/N, on a fastener without slip and below yield.
var tateRosenfeld = ComplianceFormula{
	ID: "tate-rosenfeld", Revision: 1,
	Title:  "Tate and Rosenfeld: shear, bending and bearing of the bolt, bearing of the plates",
	Source: sourceTate,
	Range:  "elastic, no slip; double shear with equal straps, else the single-shear form of later papers",
	Mark:   strength.FromMemory(90), DoubleShear: true, needsNu: true,
	Equations: []Equation{
		{"double shear", "C_b = (2 t_2 + t_1)/(3 G A) + (8 t_2³ + 16 t_2² t_1 + 8 t_2 t_1² + t_1³)/(192 E_f I) + (2 t_2 + t_1)/(t_2 t_1 E_f) + 1/(t_2 E_2) + 2/(t_1 E_1), C = C_b/2 on the whole load", sourceTate, strength.FromMemory(95)},
		{"single shear", "C = 1/(E_f t_1) + 1/(E_f t_2) + 1/(E_1 t_1) + 1/(E_2 t_2) + 32 (t_1 + t_2)(1 + ν_f)/(9 E_f π d²) + 8 (t_1³ + 5 t_1² t_2 + 5 t_1 t_2² + t_2³)/(5 E_f π d⁴)", sourceTateSingle, strength.FromMemory(90)},
	},
	single: tateSingle, double: tateDouble,
}

const (
	sourceTate       = "Tate and Rosenfeld, NACA TN 1051 (1946)"
	sourceTateSingle = "single-shear form quoted under the name of Tate and Rosenfeld (NACA TN 1051) in later papers"
)

func tateSingle(i Interface, s *complianceSheet) float64 {
	mark := strength.FromMemory(90)
	term := func(symbol string, value float64, equation string) float64 {
		return s.add(symbol, value, strength.Compliance, equation, sourceTateSingle, mark)
	}
	s.inputs(i, true)
	t1, t2, d := i.T1, i.T2, i.Diameter
	bolt := term("C_bolt", 1/(i.Ef*t1)+1/(i.Ef*t2), "1 / (E_f t_1) + 1 / (E_f t_2)")
	plates := term("C_plates", 1/(i.E1*t1)+1/(i.E2*t2), "1 / (E_1 t_1) + 1 / (E_2 t_2)")
	shear := term("C_shear", 32*(t1+t2)*(1+i.Nuf)/(9*i.Ef*math.Pi*d*d),
		"32 (t_1 + t_2) (1 + ν_f) / (9 E_f π d²)")
	cubes := float64(t1*t1*t1) + float64(5*t1*t1*t2) + float64(5*t1*t2*t2) + float64(t2*t2*t2)
	bending := term("C_bending", 8*cubes/(5*i.Ef*math.Pi*d*d*d*d),
		"8 (t_1³ + 5 t_1² t_2 + 5 t_1 t_2² + t_2³) / (5 E_f π d⁴)")
	return term("C", bolt+plates+shear+bending, "C_bolt + C_plates + C_shear + C_bending")
}

func tateDouble(i Interface, s *complianceSheet) float64 {
	mark := strength.FromMemory(95)
	term := func(symbol string, value float64, unit strength.Unit, equation string) float64 {
		return s.add(symbol, value, unit, equation, sourceTate, mark)
	}
	s.inputs(i, true)
	tp, ts, d := i.T1, i.T2, i.Diameter
	g := term("G_f", i.Ef/(2*(1+i.Nuf)), strength.Stress, "E_f / (2 (1 + ν_f))")
	a := term("A", math.Pi/4*d*d, strength.Area, "π d² / 4")
	inertia := term("I", math.Pi/64*d*d*d*d, strength.Quartic, "π d⁴ / 64")
	length := float64(2*ts) + tp
	shear := term("C_shear", length/(3*g*a), strength.Compliance, "(2 t_2 + t_1) / (3 G_f A)")
	cubes := float64(8*ts*ts*ts) + float64(16*ts*ts*tp) + float64(8*ts*tp*tp) + float64(tp*tp*tp)
	bending := term("C_bending", cubes/(192*i.Ef*inertia), strength.Compliance,
		"(8 t_2³ + 16 t_2² t_1 + 8 t_2 t_1² + t_1³) / (192 E_f I)")
	bolt := term("C_bolt", length/(ts*tp*i.Ef), strength.Compliance, "(2 t_2 + t_1) / (t_2 t_1 E_f)")
	plates := term("C_plates", 1/(ts*i.E2)+2/(tp*i.E1), strength.Compliance, "1 / (t_2 E_2) + 2 / (t_1 E_1)")
	onPlane := term("C_b", shear+bending+bolt+plates, strength.Compliance,
		"C_shear + C_bending + C_bolt + C_plates")
	return s.add("C", onPlane/2, strength.Compliance, "C_b / 2",
		sourceTate+"; on the bolt's whole load, half of which passes each shear plane", mark)
}

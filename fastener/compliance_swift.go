package fastener

import "jointledger/strength"

// swift is the compliance
//
//	C = 5/(d E_f) + 0.8 (1/(t_1 E_1) + 1/(t_2 E_2))
//
// in mm, MPa and mm/N; single shear only. 5 and 0.8 are the constants for
// aluminium fasteners. Source: T. Swift (1971), remembered 95 %; a fastener
// modulus that is not the plates' is a generalisation, 85 %.
var swift = ComplianceFormula{
	ID: "swift", Revision: 1,
	Title:  "Swift: fitted to riveted aluminium fuselage joints",
	Source: sourceSwift,
	Range:  "single shear; constants of aluminium fasteners, a separate fastener modulus being a generalisation",
	Mark:   strength.FromMemory(85),
	Equations: []Equation{
		{"1", "C = 5/(d E_f) + 0.8 (1/(t_1 E_1) + 1/(t_2 E_2))", sourceSwift, strength.FromMemory(85)},
	},
	single: swiftSingle,
}

const sourceSwift = "Swift (1971)"

func swiftSingle(i Interface, s *complianceSheet) float64 {
	mark := strength.FromMemory(85)
	term := func(symbol string, value float64, equation string) float64 {
		return s.add(symbol, value, strength.Compliance, equation, sourceSwift, mark)
	}
	s.inputs(i, false)
	bolt := term("C_fastener", 5/(i.Diameter*i.Ef), "5 / (d E_f)")
	plates := term("C_plates", 0.8*(1/(i.T1*i.E1)+1/(i.T2*i.E2)), "0.8 (1 / (t_1 E_1) + 1 / (t_2 E_2))")
	return term("C", bolt+plates, "C_fastener + C_plates")
}

package fastener

import (
	"math"

	"jointledger/strength"
)

// huth is the empirical compliance fitted to lap joint tests:
//
//	C = ((t_1 + t_2)/(2 d))^a (b/n) [1/(t_1 E_1) + 1/(n t_2 E_2) + 1/(2 t_1 E_f) + 1/(2 n t_2 E_f)]
//
// with n = 1 in single shear, n = 2 in double shear (t_1 the middle member, t_2
// each strap; then on the whole fastener load, remembered 90 % and confirmed by
// comparison with C_b/2 of Tate and Rosenfeld); a = 2/3, b = 3.0 bolted metal,
// 2/5 and 2.2 riveted metal, 2/3 and 4.2 bolted carbon-epoxy. mm, MPa, mm/N.
//
// Source: H. Huth, ASTM STP 927 (1986), remembered 95 %.
var huth = ComplianceFormula{
	ID: "huth", Revision: 1,
	Title:  "Huth: fitted to tests of bolted and riveted lap joints",
	Source: sourceHuth,
	Range:  "bolted or riveted metal, bolted carbon-epoxy; single shear, double shear with equal straps",
	Mark:   strength.FromMemory(90), DoubleShear: true,
	Equations: []Equation{
		{"1", "C = ((t_1 + t_2)/(2 d))^a (b/n) [1/(t_1 E_1) + 1/(n t_2 E_2) + 1/(2 t_1 E_f) + 1/(2 n t_2 E_f)], n 1 in single and 2 in double shear; a 2/3, b 3.0 bolted; a 2/5, b 2.2 riveted; a 2/3, b 4.2 bolted-composite", sourceHuth, strength.FromMemory(90)},
	},
	single: huthForm, double: huthForm,
}

const sourceHuth = "Huth, ASTM STP 927 (1986)"

func huthForm(i Interface, s *complianceSheet) float64 {
	mark, n := strength.FromMemory(95), 1.0
	if i.DoubleShear {
		mark, n = strength.FromMemory(90), 2
	}
	a, b := 2.0/3, 3.0
	switch i.Installation {
	case Riveted:
		a, b = 0.4, 2.2
	case BoltedComposite:
		b = 4.2
	}
	installation := i.Installation
	if installation == "" {
		installation = Bolted
	}
	s.inputs(i, false)
	constant := func(symbol string, value float64, what string) {
		s.add(symbol, value, strength.None, "", sourceHuth+": "+what, mark)
	}
	constant("a", a, "exponent, "+installation)
	constant("b", b, "factor, "+installation)
	constant("n", n, "1 in single, 2 in double shear")
	term := func(symbol string, value float64, unit strength.Unit, equation string) float64 {
		return s.add(symbol, value, unit, equation, sourceHuth, mark)
	}
	slender := term("k", math.Pow((i.T1+i.T2)/(2*i.Diameter), a), strength.None, "((t_1 + t_2) / (2 d))^a")
	first := term("c_1", 1/(i.T1*i.E1)+1/(2*i.T1*i.Ef), strength.Compliance, "1 / (t_1 E_1) + 1 / (2 t_1 E_f)")
	second := term("c_2", 1/(n*i.T2*i.E2)+1/(2*n*i.T2*i.Ef), strength.Compliance, "1 / (n t_2 E_2) + 1 / (2 n t_2 E_f)")
	return term("C", slender*(b/n)*(first+second), strength.Compliance, "k (b / n) (c_1 + c_2)")
}

package fastener

import (
	"slices"

	"jointledger/strength"
)

// weights are the stiffnesses of the fasteners of a pattern, of which only the
// ratios matter.
type weights struct {
	fasteners []Fastener
	kv, kt    []float64
	unit      strength.Unit
	mark      strength.Mark
	steps     []stiffnessSteps // of each fastener
}

// stiffnessSteps are how one fastener's stiffnesses come about.
type stiffnessSteps struct{ shear, tension []strength.Working }

// The words of stiffness beside the compliance formulas.
const (
	stiffnessEqual = "equal"
	stiffnessArea  = "area"
	stiffnessGiven = "given"
)

// patternWeights returns the stiffness of each fastener by the pattern's choice.
func patternWeights(p Pattern) (weights, []strength.Fault) {
	n := len(p.Fasteners)
	w := weights{fasteners: p.Fasteners, kv: make([]float64, n), kt: make([]float64, n), steps: make([]stiffnessSteps, n)}
	step := func(symbol string, value float64, unit strength.Unit, equation, source string) strength.Working {
		return strength.Working{Member: memberPattern, Symbol: symbol, Value: value, Unit: unit, Equation: equation, Source: source}
	}
	one := func(i int, shear, tension strength.Working, before ...strength.Working) {
		w.kv[i], w.kt[i] = shear.Value, tension.Value
		w.steps[i] = stiffnessSteps{append(slices.Clone(before), shear), append(slices.Clone(before), tension)}
	}
	switch p.Stiffness {
	case stiffnessEqual:
		for i := range p.Fasteners {
			one(i, step("k_v", 1, strength.None, "", "stiffness: equal"), step("k_t", 1, strength.None, "", "stiffness: equal"))
		}
	case stiffnessArea:
		w.unit = strength.Area
		for i, f := range p.Fasteners {
			one(i, step("k_v", f.Diameter*f.Diameter, strength.Area, "D²", "stiffness: area"),
				step("k_t", f.Diameter*f.Diameter, strength.Area, "D²", "stiffness: area"),
				step("D", f.Diameter, strength.Length, "", "input: fasteners.diameter"))
		}
	case stiffnessGiven:
		for i, f := range p.Fasteners {
			one(i, step("k_v", f.ShearStiffness, strength.None, "", "input: fasteners.shear_stiffness"),
				step("k_t", f.TensionStiffness, strength.None, "", "input: fasteners.tension_stiffness"))
		}
	default:
		return w.byFormula(p)
	}
	return w, nil
}

// byFormula takes the shear stiffness from a compliance formula through the
// first two plates, and the tension stiffness as that of the shank stretched
// over the grip of these plates, E π/4 D² / (t_1 + t_2) (derived: heads and nuts
// taken as rigid).
func (w weights) byFormula(p Pattern) (weights, []strength.Fault) {
	if len(p.Plates) < 2 || p.Plates[0].Material == nil || p.Plates[1].Material == nil {
		return w, []strength.Fault{{Pointer: "/plates", Message: strength.Say(
			"stiffness %q goes through the first two plates, which need a material with e", p.Stiffness)}}
	}
	w.unit = strength.Stiffness
	one, two := p.Plates[0], p.Plates[1]
	grip := one.Thickness + two.Thickness
	var faults []strength.Fault
	for i, f := range p.Fasteners {
		c, steps, why := Compliance(p.Stiffness, Interface{
			T1: one.Thickness, E1: one.Material.E, T2: two.Thickness, E2: two.Material.E,
			Diameter: f.Diameter, Ef: f.E, Nuf: f.Nu, Installation: f.Installation, DoubleShear: f.planes() == 2,
		})
		if !why.Empty() {
			pointer := "/stiffness"
			if f.E <= 0 {
				pointer = field("fasteners", i, "e")
			}
			faults = append(faults, strength.Fault{Pointer: pointer, Message: strength.Say("fastener %q: %v", f.ID, why)})
			continue
		}
		last := steps[len(steps)-1]
		for k := range steps {
			steps[k].Member = memberPattern
			w.mark = strength.Weakest(w.mark, steps[k].Mark)
		}
		w.kv[i] = 1 / c
		w.kt[i] = piQuarter * f.E * f.Diameter * f.Diameter / grip
		steps = append(steps, strength.Working{
			Member: memberPattern, Symbol: "k_v", Value: w.kv[i], Unit: strength.Stiffness,
			Equation: "1 / " + last.Symbol, Source: "stiffness: " + p.Stiffness,
		})
		given := func(symbol string, value float64, unit strength.Unit, source string) strength.Working {
			return strength.Working{Member: memberPattern, Symbol: symbol, Value: value, Unit: unit, Source: source}
		}
		w.steps[i] = stiffnessSteps{steps, []strength.Working{
			given("D", f.Diameter, strength.Length, "input: fasteners.diameter"),
			given("E_f", f.E, strength.Stress, "input: fasteners.e"),
			given("t_1", one.Thickness, strength.Length, "input: plates.thickness"),
			given("t_2", two.Thickness, strength.Length, "input: plates.thickness"),
			{
				Member: memberPattern, Symbol: "k_t", Value: w.kt[i], Unit: strength.Stiffness,
				Equation: "π/4 E_f D² / (t_1 + t_2)", Source: "shank stretched over the grip", Mark: strength.Derived,
			},
		}}
	}
	return w, faults
}

// stiffnessWorkings write each fastener's place and one of its stiffnesses.
func (w *weights) stiffnessWorkings(which func(stiffnessSteps) []strength.Working) []strength.Working {
	steps := make([]strength.Working, 0, 4*len(w.fasteners))
	for i, f := range w.fasteners {
		steps = append(steps,
			strength.Working{Member: memberPattern, Symbol: "x", Value: f.X, Unit: strength.Length, Source: "input: fasteners.x"},
			strength.Working{Member: memberPattern, Symbol: "y", Value: f.Y, Unit: strength.Length, Source: "input: fasteners.y"})
		steps = append(steps, which(w.steps[i])...)
		for k := len(steps) - len(which(w.steps[i])) - 2; k < len(steps); k++ {
			steps[k].Fastener = f.ID
		}
	}
	return steps
}

func (w *weights) shearStiffnessSteps() []strength.Working {
	return w.stiffnessWorkings(func(s stiffnessSteps) []strength.Working { return s.shear })
}

func (w *weights) tensionStiffnessSteps() []strength.Working {
	return w.stiffnessWorkings(func(s stiffnessSteps) []strength.Working { return s.tension })
}

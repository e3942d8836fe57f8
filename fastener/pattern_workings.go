package fastener

import (
	"math"

	"jointledger/strength"
)

func patternStep(symbol string, value float64, unit strength.Unit, equation, source string, mark strength.Mark) strength.Working {
	return strength.Working{
		Member: memberPattern, Method: methodElastic, Symbol: symbol, Value: value, Unit: unit,
		Equation: equation, Source: source, Mark: mark,
	}
}

// shearSteps are the static steps of in-plane sharing.
func (e *elastic) shearSteps() []strength.Working {
	k := e.unit
	steps := append(e.shearStiffnessSteps(),
		patternStep("K_v", e.sumV, k, "Σ k_v", "over all fasteners", strength.Seen),
		patternStep("x_c", e.xc, strength.Length, "Σ(k_v x) / K_v", sourceInPlane, strength.Seen),
		patternStep("y_c", e.yc, strength.Length, "Σ(k_v y) / K_v", sourceInPlane, strength.Seen),
	)
	if e.slots != nil {
		return append(steps, e.slots.steps(e)...)
	}
	return append(steps, patternStep("J", e.j, k.Times(strength.Area), "Σ(k_v ((x - x_c)² + (y - y_c)²))", sourceInPlane, strength.Seen))
}

func givenLoad(c PatternCase, symbols ...string) []strength.Working {
	value := map[string]float64{
		"P_x": c.Force[0], "P_y": c.Force[1], "P_z": c.Force[2],
		"p_x": c.Point[0], "p_y": c.Point[1], "p_z": c.Point[2],
		"M_ox": c.Moment[0], "M_oy": c.Moment[1], "M_oz": c.Moment[2],
	}
	steps := make([]strength.Working, 0, len(symbols))
	for _, s := range symbols {
		unit, source := strength.Force, "input: load_cases.force"
		switch s[:2] {
		case "p_":
			unit, source = strength.Length, "input: load_cases.point"
		case "M_":
			unit, source = strength.Moment, "input: load_cases.moment"
		}
		steps = append(steps, patternStep(s, value[s], unit, "", source, strength.Given))
	}
	return steps
}

// shearCaseSteps are the steps from a load case to the shear of fastener i.
func (e *elastic) shearCaseSteps(c PatternCase, load centred, i int, share Share) []strength.Working {
	steps := append(givenLoad(c, "P_x", "P_y", "p_x", "p_y", "M_oz"),
		patternStep("M_z", load.mz, strength.Moment, "M_oz + (p_x - x_c) P_y - (p_y - y_c) P_x", "moment about the centroid", strength.Seen))
	x, y := "k_v (P_x/K_v - M_z (y - y_c)/J)", "k_v (P_y/K_v + M_z (x - x_c)/J)"
	source, mark := sourceInPlane, strength.Seen
	switch {
	case e.slots != nil:
		steps = append(steps, e.slots.caseSteps(e, load)...)
		x, y = "k_xx (δ_0x - θ (y - y_c)) + k_xy (δ_0y + θ (x - x_c))", "k_xy (δ_0x - θ (y - y_c)) + k_yy (δ_0y + θ (x - x_c))"
		source, mark = sourceSlotted, strength.Derived
	case e.j == 0:
		x, y = "k_v P_x/K_v", "k_v P_y/K_v"
	}
	for _, s := range []struct {
		symbol, equation string
		value            float64
	}{
		{"V_x", x, share.Shear[0]},
		{"V_y", y, share.Shear[1]},
		{"V", "sqrt(V_x² + V_y²)", share.Resultant},
	} {
		step := patternStep(s.symbol, s.value, strength.Force, s.equation, source, mark)
		step.Fastener = e.fasteners[i].ID
		steps = append(steps, step)
	}
	return steps
}

// tensionSteps are the static steps of out-of-plane sharing.
func (e *elastic) tensionSteps() []strength.Working {
	if e.heel != nil {
		return e.tensionStiffnessSteps()
	}
	return append(e.tensionStiffnessSteps(), e.centroidSteps()...)
}

// centroidSteps are those of sharing about the centroid of tension stiffness.
func (e *elastic) centroidSteps() []strength.Working {
	k := e.unit
	steps := append([]strength.Working(nil),
		patternStep("K_t", e.sumT, k, "Σ k_t", "over all fasteners", strength.Derived),
		patternStep("x_t", e.xt, strength.Length, "Σ(k_t x) / K_t", sourceOutOfPlane, strength.Derived),
		patternStep("y_t", e.yt, strength.Length, "Σ(k_t y) / K_t", sourceOutOfPlane, strength.Derived),
	)
	second := k.Times(strength.Area)
	switch {
	case e.iu == 0 && e.iv == 0:
		return steps
	case e.iu == 0:
		return append(steps,
			patternStep("c", e.cos, strength.None, "", "cosine of the direction of the line through the fasteners, from x", strength.Derived),
			patternStep("s", e.sin, strength.None, "", "sine of the same", strength.Derived),
			patternStep("I_l", e.iv, second, "Σ(k_t (c (x - x_t) + s (y - y_t))²)", sourceOutOfPlane, strength.Derived))
	}
	xx, yy, xy := e.second()
	return append(steps,
		patternStep("I_xx", xx, second, "Σ(k_t (y - y_t)²)", sourceOutOfPlane, strength.Derived),
		patternStep("I_yy", yy, second, "Σ(k_t (x - x_t)²)", sourceOutOfPlane, strength.Derived),
		patternStep("I_xy", xy, second, "Σ(k_t (x - x_t) (y - y_t))", sourceOutOfPlane, strength.Derived))
}

// second returns Σ k_t y², Σ k_t x² and Σ k_t x y about the tension centroid.
func (e *elastic) second() (xx, yy, xy float64) {
	for i := range e.u {
		x := float64(e.cos*e.u[i]) - float64(e.sin*e.v[i])
		y := float64(e.sin*e.u[i]) + float64(e.cos*e.v[i])
		xx += float64(e.kt[i] * y * y)
		yy += float64(e.kt[i] * x * x)
		xy += float64(e.kt[i] * x * y)
	}
	return xx, yy, xy
}

// tensionCaseSteps are the steps from a load case to the tension of fastener i.
func (e *elastic) tensionCaseSteps(c PatternCase, load centred, i int, share Share) []strength.Working {
	steps := e.stretchSteps(c, load, i, share)
	step := steps[len(steps)-1]
	step.Symbol, step.Value, step.Equation, step.Source = "T_p", math.Max(share.Tension, 0), "max(T, 0)", "pushing together is borne by contact of the plates"
	return append(steps, step)
}

// stretchSteps end at the tension T of fastener i.
func (e *elastic) stretchSteps(c PatternCase, load centred, i int, share Share) []strength.Working {
	if e.heel != nil {
		return e.heel.caseSteps(e, c, load, i, share)
	}
	return e.centroidTension(c, load, i, share)
}

func (e *elastic) centroidTension(c PatternCase, load centred, i int, share Share) []strength.Working {
	var steps []strength.Working
	if e.heel != nil {
		steps = e.centroidSteps()
	}
	steps = append(steps, givenLoad(c, "P_z")...)
	equation := "k_t P_z/K_t"
	if e.iv > 0 {
		mx := float64(e.cos*load.mu) - float64(e.sin*load.mv)
		my := float64(e.sin*load.mu) + float64(e.cos*load.mv)
		steps = append(steps, givenLoad(c, "P_x", "P_y", "p_x", "p_y", "p_z", "M_ox", "M_oy")...)
		steps = append(steps,
			patternStep("M_x", mx, strength.Moment, "M_ox + (p_y - y_t) P_z - p_z P_y", "moment about the centroid", strength.Derived),
			patternStep("M_y", my, strength.Moment, "M_oy + p_z P_x - (p_x - x_t) P_z", "moment about the centroid", strength.Derived))
		a, b := e.tilt(load.mu, load.mv)
		// A turn times a length is a stretch, a weight times a stretch a force.
		turn := strength.Force.Over(e.unit).Over(strength.Length)
		if e.iu == 0 {
			steps = append(steps, patternStep("M_l", -load.mv, strength.Moment, "M_x s - M_y c", sourceOutOfPlane, strength.Derived))
			equation = "k_t (P_z/K_t + M_l (c (x - x_t) + s (y - y_t))/I_l)"
		} else {
			steps = append(steps,
				patternStep("a", float64(e.cos*a)-float64(e.sin*b), turn, "(M_x I_yy + M_y I_xy) / (I_xx I_yy - I_xy²)", sourceOutOfPlane, strength.Derived),
				patternStep("b", float64(e.sin*a)+float64(e.cos*b), turn, "(M_y I_xx + M_x I_xy) / (I_xx I_yy - I_xy²)", sourceOutOfPlane, strength.Derived))
			equation = "k_t (P_z/K_t + a (y - y_t) - b (x - x_t))"
		}
	}
	step := patternStep("T", share.Tension, strength.Force, equation, sourceOutOfPlane, strength.Derived)
	step.Fastener = e.fasteners[i].ID
	return append(steps, step)
}

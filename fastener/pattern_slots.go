package fastener

import (
	"math"

	"jointledger/strength"

	"gonum.org/v1/gonum/mat"
)

// slotted shares loads in plane when some fasteners stand in slots, along which
// they resist nothing: k (1 - s sᵀ) with s the direction of the slot.
//
// A motion of the member is (u, v, θ reach) about the centroid of stiffness;
// flexibility turns a load (P_x, P_y, M_z / reach) into it. free spans the
// motions that no fastener resists.
//
// Source: derived, equilibrium of a rigid member on springs.
type slotted struct {
	cross       [][2]float64 // across each slot; zero where there is no slot
	reach       float64
	flexibility [3][3]float64
	free        [][3]float64
	unequal     bool // stiffnesses too far apart to be solved
}

// newSlotted returns nil where no fastener stands in a slot.
func newSlotted(e *elastic) *slotted {
	s := &slotted{cross: make([][2]float64, len(e.fasteners)), reach: e.reach}
	any := false
	for i, f := range e.fasteners {
		if f.SlotAngle != nil {
			any = true
			s.cross[i] = across(*f.SlotAngle)
		}
	}
	if !any {
		return nil
	}
	if s.reach == 0 {
		s.reach = 1
	}
	// Which motions are resisted is a matter of geometry, not of how stiffly.
	geometry := s.stiffness(e, func(int) float64 { return 1 })
	var eigen mat.EigenSym
	if !eigen.Factorize(geometry, true) {
		return s
	}
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	values := eigen.Values(nil)
	var kept []int
	for k, value := range values {
		if value > slender*slender*values[2] {
			kept = append(kept, k)
			continue
		}
		s.free = append(s.free, [3]float64{vectors.At(0, k), vectors.At(1, k), vectors.At(2, k)})
	}
	basis := mat.NewDense(3, max(len(kept), 1), nil)
	for column, k := range kept {
		for row := range 3 {
			basis.Set(row, column, vectors.At(row, k))
		}
	}
	if len(kept) == 0 {
		return s
	}
	var half, full, flexibility mat.Dense
	half.Mul(s.stiffness(e, func(i int) float64 { return e.kv[i] / e.sumV }), basis)
	full.Mul(basis.T(), &half)
	reduced := mat.NewSymDense(len(kept), nil)
	for i := range kept {
		for j := i; j < len(kept); j++ {
			reduced.SetSym(i, j, full.At(i, j))
		}
	}
	var factors mat.Cholesky
	var inverse mat.SymDense
	if !factors.Factorize(reduced) || factors.InverseTo(&inverse) != nil {
		s.unequal = true
		return s
	}
	var left mat.Dense
	left.Mul(basis, &inverse)
	flexibility.Mul(&left, basis.T())
	for i := range 3 {
		for j := range 3 {
			s.flexibility[i][j] = flexibility.At(i, j) / e.sumV
		}
	}
	return s
}

// across is the unit vector across a direction in degrees, exact along the axes.
func across(degrees float64) [2]float64 {
	switch turned := math.Mod(math.Mod(degrees, 180)+180, 180); turned {
	case 0:
		return [2]float64{0, 1}
	case 90:
		return [2]float64{-1, 0}
	default:
		sin, cos := math.Sincos(turned * math.Pi / 180)
		return [2]float64{-sin, cos}
	}
}

// stiffness is the matrix of the pattern for weights of its fasteners.
func (s *slotted) stiffness(e *elastic, weight func(int) float64) *mat.SymDense {
	sum := mat.NewSymDense(3, nil)
	for i := range s.cross {
		ways := [][2]float64{{1, 0}, {0, 1}}
		if s.cross[i] != [2]float64{} {
			ways = [][2]float64{s.cross[i]}
		}
		for _, n := range ways {
			a := [3]float64{n[0], n[1], (float64(n[1]*e.x[i]) - float64(n[0]*e.y[i])) / s.reach}
			for row := range 3 {
				for column := row; column < 3; column++ {
					sum.SetSym(row, column, sum.At(row, column)+float64(weight(i)*a[row]*a[column]))
				}
			}
		}
	}
	return sum
}

// motion returns u, v and θ under a load.
func (s *slotted) motion(load centred) (u, v, turn float64) {
	p := [3]float64{load.x, load.y, load.mz / s.reach}
	var m [3]float64
	for i := range 3 {
		for j := range 3 {
			m[i] += float64(s.flexibility[i][j] * p[j])
		}
	}
	return m[0], m[1], m[2] / s.reach
}

// drift says which free motion a load drives, empty where it drives none, and
// whether it is a slide. nothing is the moment that counts as none.
func (s *slotted) drift(e *elastic, load centred, nothing float64) (why strength.Message, slides bool) {
	if s.unequal {
		return strength.Say("the shear stiffnesses of the fasteners are too far apart to be shared with slots"), false
	}
	p := [3]float64{load.x, load.y, load.mz / s.reach}
	var m [3]float64
	for _, q := range s.free {
		work := float64(q[0]*p[0]) + float64(q[1]*p[1]) + float64(q[2]*p[2])
		for k := range 3 {
			m[k] += float64(work * q[k])
		}
	}
	size := math.Sqrt(float64(m[0]*m[0]) + float64(m[1]*m[1]) + float64(m[2]*m[2]))
	if size <= float64(strength.Within*math.Hypot(load.x, load.y))+nothing/s.reach {
		return strength.Message{}, false
	}
	if math.Abs(m[2]) <= slender*size {
		angle := math.Atan2(m[1], m[0]) * 180 / math.Pi
		return strength.Say("the slots leave the pattern free to slide along %.4g° from the x axis, and the load drives it that way", angle), true
	}
	turn := m[2] / s.reach
	at := func(x float64) strength.Quantity {
		if math.Abs(x) <= strength.Within*s.reach {
			x = 0
		}
		return strength.Length.Of(x)
	}
	return strength.Say("the slots leave the pattern free to turn about the point (%v, %v), and the load drives it that way",
		at(e.xc-m[1]/turn), at(e.yc+m[0]/turn)), false
}

// distribute adds the shear shares of a load.
func (s *slotted) distribute(e *elastic, load centred, out []Share) {
	u, v, turn := s.motion(load)
	for i := range out {
		dx, dy := u-float64(turn*e.y[i]), v+float64(turn*e.x[i])
		if n := s.cross[i]; n != [2]float64{} {
			along := float64(n[0]*dx) + float64(n[1]*dy)
			dx, dy = along*n[0], along*n[1]
		}
		out[i].Shear[0] += float64(e.kv[i] * dx)
		out[i].Shear[1] += float64(e.kv[i] * dy)
	}
}

// steps are the static steps of sharing with slots.
func (s *slotted) steps(e *elastic) []strength.Working {
	var steps []strength.Working
	var xx, xy, yy, xt, yt, tt float64
	k := e.unit
	for i, f := range e.fasteners {
		add := func(symbol string, value float64, unit strength.Unit, equation, source string, mark strength.Mark) {
			step := patternStep(symbol, value, unit, equation, source, mark)
			step.Fastener = f.ID
			steps = append(steps, step)
		}
		kxx, kxy, kyy := e.kv[i], 0.0, e.kv[i]
		equations := [3]string{"k_v", "0", "k_v"}
		if n := s.cross[i]; n != [2]float64{} {
			kxx, kxy, kyy = float64(e.kv[i]*n[0]*n[0]), float64(e.kv[i]*n[0]*n[1]), float64(e.kv[i]*n[1]*n[1])
			equations = [3]string{"k_v sin(α)²", "- k_v sin(α) cos(α)", "k_v cos(α)²"}
			add("α", *f.SlotAngle, strength.Degrees, "", "input: fasteners.slot_angle", strength.Given)
		}
		add("k_xx", kxx, k, equations[0], sourceSlotted, strength.Derived)
		add("k_xy", kxy, k, equations[1], sourceSlotted, strength.Derived)
		add("k_yy", kyy, k, equations[2], sourceSlotted, strength.Derived)
		x, y := e.x[i], e.y[i]
		xx, xy, yy = xx+kxx, xy+kxy, yy+kyy
		xt += float64(kxy*x) - float64(kxx*y)
		yt += float64(kyy*x) - float64(kxy*y)
		tt += float64(kyy*x*x) + float64(kxx*y*y) - float64(2*kxy*x*y)
	}
	static := func(symbol string, value float64, unit strength.Unit, equation string) {
		steps = append(steps, patternStep(symbol, value, unit, equation, sourceSlotted, strength.Derived))
	}
	static("K_xx", xx, k, "Σ k_xx")
	static("K_xy", xy, k, "Σ k_xy")
	static("K_yy", yy, k, "Σ k_yy")
	static("K_xθ", xt, k.Times(strength.Length), "Σ(k_xy (x - x_c) - k_xx (y - y_c))")
	static("K_yθ", yt, k.Times(strength.Length), "Σ(k_yy (x - x_c) - k_xy (y - y_c))")
	static("K_θ", tt, k.Times(strength.Area), "Σ(k_yy (x - x_c)² + k_xx (y - y_c)² - 2 k_xy (x - x_c) (y - y_c))")
	return steps
}

// caseSteps are the motion under a load case, which three equations fix.
func (s *slotted) caseSteps(e *elastic, load centred) []strength.Working {
	u, v, turn := s.motion(load)
	move := strength.Force.Over(e.unit)
	return []strength.Working{
		patternStep("δ_0x", u, move, "(P_x - K_xy δ_0y - K_xθ θ) / K_xx, with δ_0y and θ at once", sourceSlotted, strength.Derived),
		patternStep("δ_0y", v, move, "(P_y - K_xy δ_0x - K_yθ θ) / K_yy, with δ_0x and θ at once", sourceSlotted, strength.Derived),
		patternStep("θ", turn, move.Over(strength.Length), "(M_z - K_xθ δ_0x - K_yθ δ_0y) / K_θ, with δ_0x and δ_0y at once", sourceSlotted, strength.Derived),
	}
}

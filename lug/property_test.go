package lug_test

import (
	"math"
	"slices"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
	"pgregory.net/rapid"
)

// everyMethod is all methods, those on registered curves with an invented set.
func everyMethod() []lug.Choice {
	all := methods("elementary", affdl, "asme-bth-1", "aisc-360-d5", "en-1993-1-8")
	all[4].Options = lug.Options{"replaceable": {Flag: true}}
	return append(all, lug.Choice{Method: melcon, Options: lug.Options{"curve_set": {Set: invented()}}})
}

const melcon = "melcon-hoblit"

// invented are curves of no source, of the right shape and a wide range.
func invented() *lug.CurveSet {
	one := func(along string, points ...[2]float64) lug.Chart {
		return lug.Chart{Along: along, Curves: []lug.Curve{{Points: points}}}
	}
	return &lug.CurveSet{ID: "invented", Version: "1", Method: melcon, Document: "invented", Charts: map[string]lug.Chart{
		"Kbr": {Along: "e/D", Between: "D/t", Curves: []lug.Curve{
			{At: 3, Points: [][2]float64{{0.5, 0.1}, {1, 0.8}, {2, 1.8}, {4, 2.4}}},
			{At: 8, Points: [][2]float64{{0.5, 0.1}, {1, 0.7}, {2, 1.5}, {4, 1.8}}},
		}},
		"Kt":   one("W/D", [2]float64{1, 1}, [2]float64{2, 0.95}, [2]float64{5, 0.6}),
		"C":    one("Pu/(D t Ftux)", [2]float64{0, 1.1}, [2]float64{1, 1.05}, [2]float64{3, 0.8}),
		"Kbry": one("e/D", [2]float64{0.5, 0.1}, [2]float64{1, 0.8}, [2]float64{4, 2.2}),
		"Ktru": one("Aav/Abr", [2]float64{0.01, 0.01}, [2]float64{1, 0.9}, [2]float64{5, 1.2}),
		"Ktry": one("Aav/Abr", [2]float64{0.01, 0.01}, [2]float64{1, 0.8}, [2]float64{5, 1.1}),
	}}
}

// between draws a number evenly.
func between(t *rapid.T, name string, least, most float64) float64 {
	return rapid.Float64Range(least, most).Draw(t, name)
}

func drawMaterial(t *rapid.T, name string) strength.Material {
	ftu := between(t, name+" Ftu", 250, 1200)
	fty := ftu * between(t, name+" r", 0.6, 1)
	return strength.Material{
		Name: name, Ftu: ftu, Fty: fty, FtuCross: ftu * between(t, name+" across", 0.9, 1), FtyCross: fty * between(t, name+" yield across", 0.9, 1),
		Fcy: fty, Fsu: 0.6 * ftu, E: ftu * between(t, name+" E", 120, 220), Nu: 0.3, Elongation: between(t, name+" elongation", 0.05, 0.2),
		Bearing: []strength.BearingStrength{{EOverD: 1.5, Fbru: 1.45 * ftu, Fbry: 1.45 * fty}, {EOverD: 2, Fbru: 1.9 * ftu, Fbry: 1.6 * fty}},
	}
}

// drawHead draws a head of any shape around a hole.
func drawHead(t *rapid.T, name string, hole float64) lug.Head {
	h := lug.Head{
		Shape: lug.Shape(rapid.IntRange(0, 2).Draw(t, name+" shape")), HoleDiameter: hole,
		Width: hole * between(t, name+" W/D", 1.8, 4.5), Thickness: hole * between(t, name+" t/D", 0.21, 1.5), Material: drawMaterial(t, name),
	}
	h.EdgeDistance = h.Width * between(t, name+" e/W", 0.5, 1)
	switch h.Shape {
	case lug.Square:
		h.EdgeDistance = hole * between(t, name+" e/D", 0.65, 3)
	case lug.Tapered:
		h.TaperAngle = between(t, name+" taper", 1, 40)
		h.EdgeDistance = hole * between(t, name+" e/D", 0.65, 3)
	}
	if rapid.Bool().Draw(t, name+" offset?") {
		h.Offset = (h.Width - hole) * between(t, name+" offset", -0.2, 0.2)
	}
	if h.Shape == lug.Tapered {
		h.EdgeDistance = min(h.EdgeDistance, (h.Width/2-math.Abs(h.Offset))/math.Tan(h.TaperAngle*math.Pi/180))
	}
	if rapid.Bool().Draw(t, name+" supported?") {
		h.BodyLength = h.Width * between(t, name+" body", 1, 3)
	}
	return h
}

// drawJoint draws a whole joint in double shear.
func drawJoint(t *rapid.T) lug.Joint {
	hole := between(t, "D", 4, 60)
	j := lug.Joint{Lug: drawHead(t, "lug", hole), Pin: &lug.Pin{Material: drawMaterial(t, "pin")}}
	j.Clevis = &lug.Clevis{Head: drawHead(t, "clevis", hole), Gap: hole * between(t, "gap", 0, 0.1)}
	j.Pin.Diameter = hole * between(t, "Dp/D", 0.96, 1)
	if rapid.Bool().Draw(t, "bushed?") {
		j.Pin.Diameter = hole * between(t, "Dp/D bushed", 0.6, 0.95)
		j.Bushing, j.Clevis.Bushing = &lug.Bushing{Material: drawMaterial(t, "bushing")}, &lug.Bushing{Material: drawMaterial(t, "clevis bushing")}
		if rapid.Bool().Draw(t, "pressed?") {
			j.Bushing.Interference = hole * 0.001
		}
	}
	if rapid.Bool().Draw(t, "hollow?") {
		j.Pin.InnerDiameter = j.Pin.Diameter * between(t, "dp/Dp", 0.1, 0.9)
	}
	if rapid.Bool().Draw(t, "unequal legs?") {
		j.Clevis.LegShare = between(t, "leg share", 0.5, 1)
	}
	return j
}

func must(t *rapid.T, j lug.Joint, choices []lug.Choice, f strength.Factors, cases []lug.LoadCase) *lug.Prepared {
	p, wrong := lug.Prepare(j, choices, f, cases)
	for _, f := range wrong {
		t.Fatalf("%s: %s", f.Pointer, render(f.Message))
	}
	return p
}

func margins(p *lug.Prepared, i int) []strength.Margin {
	out := make([]strength.Margin, len(p.Checks()))
	p.Margins(i, out)
	return out
}

func settled(m strength.Margin) bool {
	return m.Status == strength.Adequate || m.Status == strength.Inadequate
}

func close9(a, b float64) bool { return math.Abs(a-b) <= 1e-9*max(math.Abs(a), math.Abs(b)) }

// drawAngle draws a direction, often a quarter turn.
func drawAngle(t *rapid.T) float64 {
	if rapid.Bool().Draw(t, "quarter?") {
		return 90 * float64(rapid.IntRange(-4, 8).Draw(t, "quarters"))
	}
	return between(t, "angle", -360, 720)
}

// Nothing but numbers comes out of any joint of any size, and what is
// undetermined says why.
func TestOnlyNumbersComeOut(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		if rapid.Bool().Draw(t, "extreme?") {
			size := rapid.SampledFrom([]float64{1e-9, 1e9}).Draw(t, "size")
			for _, x := range []*float64{&j.Lug.Thickness, &j.Lug.Width, &j.Pin.Material.Ftu, &j.Lug.Material.Fty, &j.Clevis.Gap, &j.Lug.Material.E, &j.Clevis.Thickness} {
				if rapid.Bool().Draw(t, "this?") {
					*x = size
				}
			}
		}
		j.SingleShear = j.Clevis.LegShare == 0 && rapid.Bool().Draw(t, "single?")
		force := rapid.SampledFrom([]float64{0, 1e-9, 1, 1e4, 1e12}).Draw(t, "force")
		p, wrong := lug.Prepare(j, everyMethod(), usual(), at(force, drawAngle(t)))
		if wrong != nil {
			return
		}
		for k, m := range margins(p, 0) {
			for _, x := range []float64{m.Demand, m.Allowable, m.Margin} {
				if math.IsNaN(x) || math.IsInf(x, 0) {
					t.Fatalf("%+v: %+v", p.Checks()[k], m)
				}
			}
			if m.Status == strength.Undetermined && (m.Why == nil || render(*m.Why) == "") {
				t.Fatalf("%+v does not say why", p.Checks()[k])
			}
			for _, w := range p.CaseWorkings(0, k, p.Workings(k, nil)) {
				if math.IsNaN(w.Value) || math.IsInf(w.Value, 0) {
					t.Fatalf("%+v: %+v", p.Checks()[k], w)
				}
			}
		}
	})
}

// Every symbol is explained in every joint that can be drawn.
func TestEverySymbolOfDrawnJoints(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		p := must(r, drawJoint(r), everyMethod(), usual(), at(20000, drawAngle(r)))
		explained(t, "drawn", p, 1)
	})
}

// Lengths times s give strengths times s², all else alike; but for
// aisc-360-d5, whose effective width has a length of its own.
func TestStrengthScalesWithSize(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		s := between(t, "scale", 0.05, 20)
		angle := drawAngle(t)
		choices := slices.DeleteFunc(everyMethod(), func(c lug.Choice) bool { return c.Method == "aisc-360-d5" })
		one := must(t, j, choices, usual(), at(1000, angle))
		big := must(t, scaled(j, s), choices, usual(), at(1000*s*s, angle))
		a, b := margins(one, 0), margins(big, 0)
		for k, c := range one.Checks() {
			if a[k].Status != b[k].Status {
				t.Fatalf("%+v: %s became %s", c, a[k].Status, b[k].Status)
			}
			if settled(a[k]) && !close9(a[k].Margin+1, b[k].Margin+1) {
				t.Fatalf("%+v: margin %.12g became %.12g", c, a[k].Margin, b[k].Margin)
			}
			if want := a[k].Allowable * math.Pow(s, float64(2*c.Unit.Force+c.Unit.Length)); settled(a[k]) && c.Unit != strength.None && !close9(b[k].Allowable, want) {
				t.Fatalf("%+v: allowable %.12g became %.12g, not %.12g", c, a[k].Allowable, b[k].Allowable, want)
			}
		}
	})
}

func scaled(j lug.Joint, s float64) lug.Joint {
	j = j.Clone()
	for _, h := range []*lug.Head{&j.Lug, &j.Clevis.Head} {
		for _, x := range []*float64{&h.Width, &h.Thickness, &h.HoleDiameter, &h.EdgeDistance, &h.Offset, &h.BodyLength, &h.BodyWidth} {
			*x *= s
		}
	}
	j.Clevis.Gap *= s
	j.Pin.Diameter *= s
	j.Pin.InnerDiameter *= s
	if j.Bushing != nil {
		j.Bushing.Interference *= s
	}
	return j
}

// Stresses times f give strengths times f: margins do not depend on units.
func TestStrengthScalesWithStress(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		f := between(t, "scale", 1e-3, 200)
		angle := drawAngle(t)
		one := must(t, j, everyMethod(), usual(), at(1000, angle))
		j = j.Clone()
		materials := []*strength.Material{&j.Lug.Material, &j.Clevis.Material, &j.Pin.Material}
		if j.Bushing != nil {
			materials = append(materials, &j.Bushing.Material, &j.Clevis.Bushing.Material)
		}
		for _, m := range materials {
			for _, x := range []*float64{&m.Ftu, &m.Fty, &m.FtuCross, &m.FtyCross, &m.Fcy, &m.Fsu, &m.E} {
				*x *= f
			}
			m.Bearing = slices.Clone(m.Bearing)
			for i := range m.Bearing {
				m.Bearing[i].Fbru *= f
				m.Bearing[i].Fbry *= f
			}
		}
		big := margins(must(t, j, everyMethod(), usual(), at(1000*f, angle)), 0)
		for k, m := range margins(one, 0) {
			if m.Status != big[k].Status || settled(m) && !close9(m.Margin+1, big[k].Margin+1) {
				t.Fatalf("%+v: %+v became %+v", one.Checks()[k], m, big[k])
			}
		}
	})
}

// More thickness never lowers the strength of net section, bearing, shear-out
// or bushing, nor that of the whole joint where wide bodies keep the tangs out.
func TestThicknessNeverHurts(t *testing.T) {
	modes := []strength.Mode{strength.NetSection, strength.Bearing, strength.ShearOut, strength.ShearBearing, strength.Fracture, strength.BushingBearing, strength.WholeJoint}
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		j.Lug.BodyWidth, j.Clevis.BodyWidth = 100*j.Lug.Width, 100*j.Clevis.Width
		j.Lug.BodyRestrained, j.Clevis.BodyRestrained = true, true
		thick := j.Clone()
		head := &thick.Lug
		if rapid.Bool().Draw(t, "clevis?") {
			head = &thick.Clevis.Head
		}
		head.Thickness *= between(t, "thicker", 1, 3)
		angle := drawAngle(t)
		one := must(t, j, everyMethod(), usual(), at(1000, angle))
		two := margins(must(t, thick, everyMethod(), usual(), at(1000, angle)), 0)
		for k, m := range margins(one, 0) {
			if slices.Contains(modes, one.Checks()[k].Mode) && settled(m) && settled(two[k]) && two[k].Allowable < m.Allowable*(1-1e-9) {
				t.Fatalf("%+v: %.12g fell to %.12g", one.Checks()[k], m.Allowable, two[k].Allowable)
			}
		}
	})
}

// An offset hole never beats, along the axis, the concentric one of the same
// least side.
func TestOffsetNeverHelps(t *testing.T) {
	modes := []strength.Mode{strength.NetSection, strength.Bearing, strength.ShearOut, strength.ShearBearing, strength.Fracture}
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		j.Lug.Offset = (j.Lug.Width - j.Lug.HoleDiameter) * between(t, "offset here", -0.4, 0.4)
		straight := j.Clone()
		straight.Lug.Width, straight.Lug.Offset = j.Lug.Width-2*math.Abs(j.Lug.Offset), 0
		one, wrong := lug.Prepare(j, everyMethod(), usual(), at(1000, 0))
		p, also := lug.Prepare(straight, everyMethod(), usual(), at(1000, 0))
		if wrong != nil || also != nil {
			return // no material is left beside the hole
		}
		best := map[strength.Check]float64{}
		for k, m := range margins(p, 0) {
			if settled(m) {
				c := p.Checks()[k]
				c.Mark = strength.Given
				best[c] = m.Allowable
			}
		}
		for k, m := range margins(one, 0) {
			c := one.Checks()[k]
			c.Mark = strength.Given
			if limit, ok := best[c]; ok && c.Member == "lug" && slices.Contains(modes, c.Mode) && settled(m) && m.Allowable > limit*(1+1e-9) {
				t.Fatalf("%+v: %.12g with the offset, %.12g without", c, m.Allowable, limit)
			}
		}
	})
}

// At an angle next to nothing the oblique strength is that along the axis, next
// to 90° that across, from either side; and it does not know left from right
// where the hole is concentric.
func TestObliqueMeetsItsEnds(t *testing.T) {
	const near = 1e-6
	seen := 0
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		j.Lug.Offset = 0
		if rapid.Bool().Draw(t, "depths?") {
			d := j.Lug.HoleDiameter * between(t, "depth", 0.4, 1)
			j.Lug.SectionDepths = &[4]float64{d, d, d, d}
		}
		for _, method := range []string{affdl, melcon} {
			choice := []lug.Choice{{Method: method}}
			if method == melcon {
				choice = everyMethod()[5:]
			}
			strengthAt := func(angle float64, modes ...strength.Mode) float64 {
				p := must(t, j, choice, usual(), at(1000, angle))
				least := math.Inf(1)
				for k, m := range margins(p, 0) {
					c := p.Checks()[k]
					if c.Member != "lug" || c.Level != strength.Ultimate || !slices.Contains(modes, c.Mode) || m.Status == strength.NotExercised {
						continue
					}
					if !settled(m) {
						return math.NaN()
					}
					least = min(least, m.Allowable)
				}
				return least
			}
			along := []strength.Mode{strength.NetSection, strength.Bearing, strength.ShearBearing}
			for _, c := range []struct {
				end, beside float64
				modes       []strength.Mode
			}{
				{0, near, along},
				{360, -near, along},
				{90, 90 - near, []strength.Mode{strength.Transverse}},
				{90, 90 + near, []strength.Mode{strength.Transverse}},
				{180, 180 - near, along},
				{270, -90 - near, []strength.Mode{strength.Transverse}},
				{270, 90 - near, []strength.Mode{strength.Transverse}},
			} {
				end, beside := strengthAt(c.end, c.modes...), strengthAt(c.beside, strength.Oblique)
				if math.IsNaN(end) || math.IsNaN(beside) {
					continue
				}
				seen++
				if math.Abs(end-beside) > 1e-6*end {
					t.Fatalf("%s: %.12g at %g°, %.12g at %.8g°", method, end, c.end, beside, c.beside)
				}
			}
		}
	})
	if seen < 100 {
		t.Errorf("only %d ends were compared", seen)
	}
}

// The pin of the Stress Analysis Manual: the thicknesses that a weak pin leaves
// active give its load again when they stand in the full formula, and it meets
// the strong pin where its bending over the full thicknesses just reaches the
// lugs.
func TestWeakPin(t *testing.T) {
	weak, strong := 0, 0
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		j.Lug.Shape, j.Clevis.Shape, j.Lug.TaperAngle, j.Clevis.TaperAngle = lug.Square, lug.Square, 0, 0
		j.Lug.EdgeDistance, j.Clevis.EdgeDistance = j.Lug.Width, j.Clevis.Width
		j.Pin.Material.Fsu = 10 * j.Pin.Material.Ftu // shear stays out
		j.Lug.BodyWidth, j.Clevis.BodyWidth = 100*j.Lug.Width, 100*j.Clevis.Width
		j.Lug.BodyRestrained, j.Clevis.BodyRestrained = true, true
		read := func() (map[string]float64, float64) {
			p := must(t, j, methods(affdl), usual(), at(1000, 0))
			out := margins(p, 0)
			for k, c := range p.Checks() {
				if c.Mode == strength.WholeJoint && settled(out[k]) {
					values := map[string]float64{}
					for _, w := range p.CaseWorkings(0, k, p.Workings(k, nil)) {
						values[w.Symbol] = w.Value
					}
					return values, out[k].Allowable
				}
			}
			return nil, 0
		}
		v, all := read()
		if v == nil {
			return
		}
		if most, ok := v["P_ub,max"]; ok {
			weak++
			share := v["λ"]
			// 9-13 with b1 for t1 and 2 b2 for t2, over the arm of the full one.
			arm := share * (v["b1"]/2 + v["g"] + share*v["2b2"]/2)
			if got := v["P_ub"] * v["m"] / arm; !close9(got, most) {
				t.Fatalf("the active thicknesses give %.12g, not %.12g", got, most)
			}
			if want := min(most, v["P_u.LB"], v["P_us"]); !close9(all, want) {
				t.Fatalf("the joint has %.12g, not %.12g", all, want)
			}
		} else {
			strong++
		}
		// Scale the pin's strength so that P_ub comes to stand on either side of P_u.LB.
		ftu, fsu := j.Pin.Material.Ftu, j.Pin.Material.Fsu
		var sides [2]float64
		for i, f := range []float64{1 - 1e-9, 1 + 1e-9} {
			j.Pin.Material.Ftu, j.Pin.Material.Fsu = ftu*f*v["P_u.LB"]/v["P_ub"], max(fsu, 10*ftu*v["P_u.LB"]/v["P_us"])
			_, sides[i] = read()
		}
		if math.Abs(sides[0]-sides[1]) > 1e-7*sides[1] {
			t.Fatalf("at the boundary the weak pin has %.12g, the strong one %.12g", sides[0], sides[1])
		}
	})
	if weak < 10 || strong < 10 {
		t.Errorf("%d weak and %d strong pins were drawn", weak, strong)
	}
}

// The factors of a demand are the same for every check of a kind: the margin is
// allowable over L u s, L s, or L / u as the level of load and check say.
func TestDemandsFollowTheLevels(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f := strength.Factors{Ultimate: between(t, "u", 1, 2), Fitting: between(t, "fitting", 1, 1.5)}
		f.Special = []strength.SpecialFactor{{Name: "bearing factor", Value: between(t, "special", 1, 3), Modes: []strength.Mode{strength.Bearing}}}
		cases := []lug.LoadCase{{ID: "l", Level: strength.Limit, Force: 1000}, {ID: "u", Level: strength.Ultimate, Force: 1000}}
		p := must(t, drawJoint(t), everyMethod(), f, cases)
		limit, ultimate := margins(p, 0), margins(p, 1)
		for k, c := range p.Checks() {
			if !settled(limit[k]) || c.Unit != strength.Force {
				continue
			}
			s := f.Fitting
			if c.Mode == strength.Bearing {
				s = max(s, f.Special[0].Value)
			}
			own := slices.Contains([]string{"asme-bth-1@1", "aisc-360-d5@1", "en-1993-1-8@1"}, c.Method) && c.Mode != strength.BodyBending
			if own {
				s = 1
			}
			atLimit, atUltimate := 1000*s, 1000*s/f.Ultimate
			if c.Level == strength.Ultimate {
				atLimit, atUltimate = 1000*s*f.Ultimate, 1000*s
			}
			if !close9(limit[k].Demand, atLimit) || !close9(ultimate[k].Demand, atUltimate) {
				t.Fatalf("%+v: demands %.12g and %.12g, not %.12g and %.12g", c, limit[k].Demand, ultimate[k].Demand, atLimit, atUltimate)
			}
		}
	})
}

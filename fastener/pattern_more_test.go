package fastener

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"jointledger/strength"

	"pgregory.net/rapid"
)

// Slots: the shares still balance the load, and none acts along its slot.
func TestSlottedSharesBalanceTheLoad(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, load := drawPattern(t)
		for i := range p.Fasteners {
			if i > 1 && rapid.Bool().Draw(t, "slotted") {
				angle := rapid.Float64Range(-400, 400).Draw(t, "angle")
				p.Fasteners[i].SlotAngle = &angle
			}
		}
		prepared, faults := PreparePattern(p, plain, []PatternCase{load})
		if len(faults) > 0 {
			t.Fatal(faultText(faults))
		}
		shares := make([]Share, len(p.Fasteners))
		if residual := prepared.Shares(0, shares); !(residual <= 1e-9) {
			t.Fatalf("residual %g", residual)
		}
		assertBalanced(t, p, load, shares, 1e-9)
		most := 0.0
		for _, s := range shares {
			most = max(most, s.Resultant)
		}
		for i, f := range p.Fasteners {
			if f.SlotAngle == nil {
				continue
			}
			sin, cos := math.Sincos(*f.SlotAngle * math.Pi / 180)
			if along := shares[i].Shear[0]*cos + shares[i].Shear[1]*sin; math.Abs(along) > 1e-10*most+1e-100 {
				t.Fatalf("fastener %d bears %g along its slot", i, along)
			}
		}
	})
}

// A hole slotted along x and a round one: the round one takes all of P_x, and
// the couple of an eccentric P_y is shared by statics alone.
func TestSlotByStatics(t *testing.T) {
	along := 0.0
	p := Pattern{Stiffness: "equal", Fasteners: []Fastener{
		{ID: "round", Diameter: 6}, {ID: "slot", X: 100, Diameter: 6, SlotAngle: &along},
	}}
	prepared := prepare(t, p, PatternCase{ID: "LC1", Level: strength.Limit, Point: [3]float64{150, 0, 0}, Force: [3]float64{700, -1000, 0}})
	shares := make([]Share, 2)
	prepared.Shares(0, shares)
	for i, want := range [][2]float64{{700, 500}, {0, -1500}} {
		for k := range 2 {
			if math.Abs(shares[i].Shear[k]-want[k]) > 1e-9 {
				t.Errorf("shear %d: %v, want %v", i, shares[i].Shear, want)
			}
		}
	}
}

func TestSlotsThatLeaveAFreeMotion(t *testing.T) {
	x, y := 0.0, 90.0
	slots := func(angles ...*float64) Pattern {
		p := Pattern{Stiffness: "equal"}
		for i, a := range angles {
			p.Fasteners = append(p.Fasteners, Fastener{ID: fmt.Sprint(i), X: 50 * float64(i), Diameter: 6, SlotAngle: a})
		}
		return p
	}
	load := func(fx, fy, mz float64) PatternCase {
		return PatternCase{ID: "LC1", Level: strength.Limit, Force: [3]float64{fx, fy, 0}, Moment: [3]float64{0, 0, mz}}
	}
	for name, c := range map[string]struct {
		pattern Pattern
		load    PatternCase
		says    string // empty: carried
	}{
		"all along x, pulled along x":  {slots(&x, &x), load(10, 0, 0), "free to slide along 0°"},
		"all along x, pulled along -x": {slots(&x, &x), load(-10, 0, 0), "free to slide along 180°"},
		"all along x, pulled along y":  {slots(&x, &x), load(0, 10, 0), ""},
		"all along y, turned":          {slots(&y, &y), load(0, 0, 10), "free to turn about the point"},
		"one slot alone, turned":       {slots(&x), load(0, 0, 10), "free to turn about the point (0, 0)"},
		"round and along the line":     {slots(nil, &x), load(0, 0, 10), ""},
		// The slot passes the turn about the round hole.
		"round and across the line": {slots(nil, &y), load(0, 0, 10), "free to turn about the point (0, 0)"},
	} {
		t.Run(name, func(t *testing.T) {
			_, faults := PreparePattern(c.pattern, plain, []PatternCase{c.load})
			if c.says == "" {
				if len(faults) > 0 {
					t.Error(faultText(faults))
				}
				return
			}
			if len(faults) != 1 || !strings.Contains(faults[0].Message.Render(write), c.says) || !strings.HasPrefix(faults[0].Pointer, "/load_cases/0/") {
				t.Error(faultText(faults))
			}
		})
	}
}

// heelPattern puts an outline around a drawn pattern.
func heelPattern(t *rapid.T) (Pattern, PatternCase) {
	p, load := drawPattern(t)
	var cx, cy, far float64
	for _, f := range p.Fasteners {
		cx, cy = cx+f.X/float64(len(p.Fasteners)), cy+f.Y/float64(len(p.Fasteners))
	}
	for _, f := range p.Fasteners {
		far = max(far, math.Hypot(f.X-cx, f.Y-cy)+f.Diameter)
	}
	n := rapid.IntRange(3, 8).Draw(t, "corners")
	turned := rapid.Float64Range(0, 7).Draw(t, "outline turned")
	var outline [][2]float64
	for i := range n {
		sin, cos := math.Sincos(turned + 2*math.Pi*float64(i)/float64(n))
		r := far * rapid.Float64Range(2.1, 2.5).Draw(t, "corner")
		outline = append(outline, [2]float64{cx + r*cos, cy + r*sin})
	}
	p.Plates = []Plate{{ID: "foot", Thickness: 10, Outline: outline}}
	return p, load
}

// Heel: nothing sinks into the support, nothing is pushed together, and what
// the fasteners do not balance a pressing contact on the outline does.
func TestHeelBalancesWithoutSinking(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, load := heelPattern(t)
		p.OutOfPlane = "heel"
		prepared, faults := PreparePattern(p, plain, []PatternCase{load})
		if len(faults) > 0 {
			t.Fatal(faultText(faults))
		}
		shares := make([]Share, len(p.Fasteners))
		if residual := prepared.Shares(0, shares); !(residual <= 1e-9) {
			t.Fatalf("residual %g", residual)
		}
		// What is left of the load about its own point: a push C at a place.
		mx := load.Moment[0] - load.Point[2]*load.Force[1]
		my := load.Moment[1] + load.Point[2]*load.Force[0]
		contact, reach := load.Force[2], 0.0
		for i, s := range shares {
			if s.Tension < 0 {
				t.Fatalf("fastener %d is pushed together: %g", i, s.Tension)
			}
			x, y := p.Fasteners[i].X-load.Point[0], p.Fasteners[i].Y-load.Point[1]
			contact -= s.Tension
			mx -= y * s.Tension
			my += x * s.Tension
			reach = max(reach, math.Hypot(x, y))
		}
		for _, o := range p.Plates[0].Outline {
			reach = max(reach, math.Hypot(o[0]-load.Point[0], o[1]-load.Point[1]))
		}
		size := math.Abs(load.Force[2]) + math.Hypot(mx, my)/reach
		if contact > 1e-9*size {
			t.Fatalf("the contact pulls: %g", contact)
		}
		if -contact <= 1e-9*size {
			if math.Hypot(mx, my) > 1e-8*size*reach {
				t.Fatalf("no contact, and a moment of %g, %g is left", mx, my)
			}
			return
		}
		// The push acts on the outline's hull: moved a little inward it lies inside.
		hx, hy := -my/contact+load.Point[0], mx/contact+load.Point[1]
		hull := convexHull(p.Plates[0].Outline)
		var cx, cy float64
		for _, h := range hull {
			cx, cy = cx+h[0]/float64(len(hull)), cy+h[1]/float64(len(hull))
		}
		in := 1e-6
		if !contains(sides(hull), hx+in*(cx-hx), hy+in*(cy-hy)) {
			t.Fatalf("the contact acts at (%g, %g), outside the outline %v", hx, hy, hull)
		}
	})
}

// With everything in tension, the whole outline lifting, heel is the linear
// solution.
func TestHeelInTensionIsLinear(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, load := heelPattern(t)
		linear, faults := PreparePattern(p, plain, []PatternCase{load})
		if len(faults) > 0 {
			t.Fatal(faultText(faults))
		}
		// Enough pull through the centroid of stiffness to lift every corner.
		e := linear.sharing
		load.Force, load.Moment, load.Point = [3]float64{0, 0, 1e6}, [3]float64{}, [3]float64{e.xt, e.yt, 0}
		load.Point[0] += 1e-3 * e.length
		load.Point[1] -= 1e-3 * e.breadth
		least := math.Inf(1)
		a, b := func() (float64, float64) { l, _ := e.centre(load, 0); return e.tilt(l.mu, l.mv) }()
		for _, o := range newHeel(e, p.Plates[0].Outline).hull {
			least = min(least, load.Force[2]/e.sumT+a*o[1]-b*o[0])
		}
		if least <= 0 {
			load.Point[0], load.Point[1] = e.xt, e.yt
		}
		var shares [2][]Share
		for i, word := range []string{"centroid", "heel"} {
			p.OutOfPlane = word
			prepared, faults := PreparePattern(p, plain, []PatternCase{load})
			if len(faults) > 0 {
				t.Fatal(faultText(faults))
			}
			shares[i] = make([]Share, len(p.Fasteners))
			prepared.Shares(0, shares[i])
		}
		for i := range p.Fasteners {
			if one, two := shares[0][i].Tension, shares[1][i].Tension; math.Abs(one-two) > 1e-9*load.Force[2] {
				t.Fatalf("fastener %d: %g linear, %g heel", i, one, two)
			}
		}
	})
}

// A bracket's foot under a moment turns about its lower side: by hand,
// T = k l M / Σ(k l²).
func TestHeelByHand(t *testing.T) {
	p := Pattern{Stiffness: "equal", OutOfPlane: "heel", Plates: []Plate{{ID: "foot", Thickness: 10, Outline: [][2]float64{{0, 0}, {100, 0}, {100, 200}, {0, 200}}}}}
	for i, at := range [][2]float64{{30, 40}, {70, 40}, {30, 160}, {70, 160}} {
		p.Fasteners = append(p.Fasteners, Fastener{ID: fmt.Sprint(i), X: at[0], Y: at[1], Diameter: 10})
	}
	// 1 kN 272 mm off the foot, downward: M_x = 272 Nm about the lower side.
	prepared := prepare(t, p, PatternCase{ID: "LC1", Level: strength.Limit, Point: [3]float64{50, 0, 272}, Force: [3]float64{0, -1000, 0}})
	shares := make([]Share, 4)
	prepared.Shares(0, shares)
	// Σ l² = 2 (40² + 160²) = 54400: T = 272000 l / 54400 = 5 l.
	for i, want := range []float64{200, 200, 800, 800} {
		if math.Abs(shares[i].Tension-want) > 1e-9 {
			t.Errorf("tension %d: %g, want %g", i, shares[i].Tension, want)
		}
	}
}

// Coefficients C of eccentrically loaded bolts by the instantaneous centre.
func TestInstantaneousCentreBalances(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, load := drawPattern(t)
		p.InPlane, load.Level = "instantaneous-centre", strength.Ultimate
		for i := range p.Fasteners {
			p.Fasteners[i].Type = &Type{Name: "bolt", ShearStrength: rapid.Float64Range(1e3, 1e5).Draw(t, "strength")}
		}
		prepared, faults := PreparePattern(p, plain, []PatternCase{load})
		if len(faults) > 0 {
			t.Fatal(faultText(faults))
		}
		shares := make([]Share, len(p.Fasteners))
		if residual := prepared.Shares(0, shares); !(residual <= 1e-9) {
			t.Fatalf("residual %g", residual)
		}
		assertBalanced(t, p, load, shares, 1e-9)
		margins := make([]strength.Margin, len(prepared.Checks()))
		prepared.Margins(0, margins)
		// At ultimate no fastener bears more than its strength at 0.34 in, and
		// the farthest bears just that.
		factor := margins[0].Allowable / (margins[0].Demand / 1.15)
		most, bound := 0.0, math.Pow(1-math.Exp(-3.4), 0.55)
		for i, s := range shares {
			most = max(most, factor*s.Resultant/p.Fasteners[i].Type.ShearStrength)
		}
		if math.Abs(most/bound-1) > 1e-9 {
			t.Fatalf("the most used fastener stands at %g of the curve's %g", most, bound)
		}
	})
}

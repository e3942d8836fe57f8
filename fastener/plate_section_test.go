package fastener

import (
	"fmt"
	"math"
	"testing"

	"jointledger/strength"

	"pgregory.net/rapid"
)

// strap is a strap 100 wide and 5 thick along x with two rows of two fasteners,
// 10 mm holes, free end at x = 0, held beyond x = 200.
func strap() Pattern {
	axis := 0.0
	m := &strength.Material{Name: "SM-plate", Source: "invented", Ftu: 480, Fty: 400, Fsu: 280, Fcy: 390, Ec: 72000, E: 71000}
	p := Pattern{Stiffness: "equal", Plates: []Plate{{ID: "strap", Thickness: 5, Material: m, AxisAngle: &axis, Outline: [][2]float64{{0, 0}, {200, 0}, {200, 100}, {0, 100}}}}}
	for i, at := range [][2]float64{{30, 30}, {30, 70}, {80, 30}, {80, 70}} {
		p.Fasteners = append(p.Fasteners, Fastener{ID: fmt.Sprint(i + 1), X: at[0], Y: at[1], Diameter: 10, Type: &Type{Name: "pin", ShearStrength: 1e5, TensionStrength: 1e5}})
	}
	return p
}

func TestNetSectionByHand(t *testing.T) {
	// 40 kN through the centroid of the group: 20 kN pass the first row, 40 the
	// second; A_net = 5 (100 - 20) = 400 mm².
	pull := PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{200, 50, 0}, Force: [3]float64{40e3, 0, 0}}
	p := prepare(t, strap(), pull)
	margins := make([]strength.Margin, len(p.Checks()))
	p.Margins(0, margins)
	found := 0
	for k, c := range p.Checks() {
		if c.Mode != strength.NetSection || c.Level != strength.Ultimate {
			continue
		}
		found++
		want := map[string]float64{"1": 50, "3": 100}[c.Fastener] * 1.15
		if m := margins[k]; math.Abs(m.Demand-want) > 1e-9 || m.Allowable != 480 {
			t.Errorf("row of %s: %+v, demand by hand %g", c.Fastener, m, want)
		}
	}
	if found != 2 {
		t.Fatalf("%d rows", found)
	}
	// Moved 10 mm up, the pull bends the second row by 400 Nm more: the segments
	// 0-25, 35-65, 75-100 have I = 5 (2 (50³ - 25³) + 2 x 15³)/3 = 375,833 mm⁴.
	pull.Point[1] = 60
	second := 5.0 / 3 * (2*(math.Pow(50, 3)-math.Pow(25, 3)) + 2*math.Pow(15, 3))
	p = prepare(t, strap(), pull)
	p.Margins(0, margins)
	for k, c := range p.Checks() {
		if c.Mode == strength.NetSection && c.Level == strength.Ultimate && c.Fastener == "3" {
			if want := (100 + 400e3*50/second) * 1.15; math.Abs(margins[k].Demand-want) > 1e-9 {
				t.Errorf("bent: %g, by hand %g", margins[k].Demand, want)
			}
		}
	}
}

func TestBlockTearingByHand(t *testing.T) {
	pull := PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{200, 50, 0}, Force: [3]float64{40e3, 0, 0}}
	// Between the columns: A_nt = 5 (40 - 10) = 150, A_nv = 2 x 5 (80 - 15) = 650:
	// 480 x 150 + 280 x 650 = 254 kN. From one column to the edge: A_nt =
	// 5 (70 - 15) = 275, A_nv = 325: 132 + 91 = 223 kN governs.
	assertCheck(t, prepare(t, strap(), pull), "plate-block-tearing@1", "strap", strength.BlockTearing, 46e3, 223e3)
}

func TestInterFastenerBucklingByHand(t *testing.T) {
	push := PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{200, 50, 0}, Force: [3]float64{-40e3, 0, 0}}
	p := strap()
	p.Plates[0].Thickness = 1
	// 20 kN on 100 mm² between the rows; F_e = 4 π² 72000/12 / 50² = 94.75 MPa.
	assertCheck(t, prepare(t, p, push), "inter-fastener-buckling@1", "strap", strength.InterFastenerBuckling, 230, 4*math.Pi*math.Pi*72000/12/2500)
}

// Elastic inter-fastener buckling of a sheet 0.05 in thick at 1 in pitch, E_c
// 10.5e6 psi, in psi: worked from the formula with the four fixities.
func TestInterFastenerStresses(t *testing.T) {
	const psi = 0.006894757293168361
	for head, want := range map[string]float64{HeadProtruding: 86359, HeadRound: 64769, HeadCountersunk: 32385, HeadCountersunkReduced: 21590} {
		m := &strength.Material{Ec: 10.5e6 * psi, Fcy: 200e3 * psi}
		if a := interFastener(m, head, 0.05*25.4, 25.4); math.Abs(a.value/psi-want) > 0.5 {
			t.Errorf("%s: %.1f psi, want %g", head, a.value/psi, want)
		}
	}
	// At F_e = F_cy/2 the parabola meets the elastic curve.
	m := &strength.Material{Ec: 70e3, Fcy: 2 * 4 * math.Pi * math.Pi * 70e3 / 12 * 1e-4}
	if a := interFastener(m, "", 1, 100); math.Abs(a.value/(m.Fcy/2)-1) > 1e-12 {
		t.Errorf("%g where the curves meet, F_cy/2 is %g", a.value, m.Fcy/2)
	}
}

// What passes beyond the last row is the whole load on the plate, whatever the
// axis; a plate turned with its load has the same margins.
func TestRowsTurnWithTheLoad(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := strap()
		load := PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{200, rapid.Float64Range(0, 100).Draw(t, "y"), 0}}
		load.Force = [3]float64{rapid.Float64Range(-4e4, 4e4).Draw(t, "fx"), rapid.Float64Range(-4e4, 4e4).Draw(t, "fy"), 0}
		degrees := rapid.Float64Range(-360, 360).Draw(t, "turned")
		sin, cos := math.Sincos(degrees * math.Pi / 180)
		turn := func(x, y float64) (float64, float64) { return x*cos - y*sin + 500, x*sin + y*cos - 300 }
		q, turned := strap(), load
		q.Plates[0].AxisAngle = &degrees
		for i := range q.Fasteners {
			q.Fasteners[i].X, q.Fasteners[i].Y = turn(q.Fasteners[i].X, q.Fasteners[i].Y)
		}
		for i, o := range q.Plates[0].Outline {
			q.Plates[0].Outline[i][0], q.Plates[0].Outline[i][1] = turn(o[0], o[1])
		}
		turned.Point[0], turned.Point[1] = turn(load.Point[0], load.Point[1])
		turned.Force[0], turned.Force[1] = load.Force[0]*cos-load.Force[1]*sin, load.Force[0]*sin+load.Force[1]*cos
		var margins [2][]strength.Margin
		for i, c := range []struct {
			p    Pattern
			load PatternCase
		}{{p, load}, {q, turned}} {
			prepared, faults := PreparePattern(c.p, plain, []PatternCase{c.load})
			if len(faults) > 0 {
				t.Fatal(faultText(faults))
			}
			margins[i] = make([]strength.Margin, len(prepared.Checks()))
			prepared.Margins(0, margins[i])
		}
		for k := range margins[0] {
			a, b := margins[0][k], margins[1][k]
			if max(a.Demand, b.Demand) < 1e-6 {
				continue // a mode that rounding alone exercises
			}
			if math.Abs(a.Demand-b.Demand) > 1e-7*(1+math.Abs(a.Demand)) || math.Abs(a.Allowable-b.Allowable) > 1e-7*(1+a.Allowable) {
				t.Fatalf("check %d: %+v, turned %+v", k, a, b)
			}
		}
	})
}

// An axis just short of a whole turn is no axis the other way round.
func TestAxisOfAPlate(t *testing.T) {
	for _, turns := range []float64{-2, -1, 0, 1, 2} {
		for quarter := range 4 {
			for _, off := range []float64{-1e-9, -2.2e-14, -1e-300, 0, 1e-300, 2.2e-14, 1e-9} {
				degrees := 360*turns + 90*float64(quarter) + off
				cos, sin := (&Plate{AxisAngle: &degrees}).axis()
				want := [4][2]float64{{1, 0}, {0, 1}, {-1, 0}, {0, -1}}[quarter]
				if math.Hypot(cos-want[0], sin-want[1]) > 1e-10 {
					t.Errorf("%v° points to (%v, %v)", degrees, cos, sin)
				}
			}
		}
	}
}

func TestStaggeredRowsAreTold(t *testing.T) {
	pull := PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{200, 50, 0}, Force: [3]float64{40e3, 0, 0}}
	p := strap()
	if m := found(prepare(t, p, pull))["warning staggered-rows plate strap"]; m != "" {
		t.Error(m)
	}
	p.Fasteners[1].X += 15
	if m := found(prepare(t, p, pull))["warning staggered-rows plate strap"]; m == "" {
		t.Error("rows 15 mm apart are not told")
	}
}

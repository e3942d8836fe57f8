package fastener

import (
	"math"
	"strings"
	"testing"

	"jointledger/strength"
)

// single is one M20 8.8 bolt in a plate 10 mm thick, pulled 50 kN along x and
// 20 kN along z; the second plate is pushed toward x = 60.
func single() Pattern {
	bolt := &Type{
		Name: "M20 8.8", Source: "invented", Ftu: 800, Fsu: 480, Class: "8.8", HeadDiameter: 32,
		Thread: &Thread{Form: "iso", Pitch: 2.5, InShearPlane: true},
	}
	steel := &strength.Material{Name: "plate", Source: "invented", Ftu: 430, Fsu: 250}
	outline := [][2]float64{{-100, -50}, {60, -50}, {60, 50}, {-100, 50}}
	return Pattern{
		Stiffness: "equal",
		Fasteners: []Fastener{{ID: "1", Diameter: 20, HoleDiameter: 22, Type: bolt}},
		Plates:    []Plate{{ID: "attached", Thickness: 10, Material: steel, Outline: outline}, {ID: "support", Thickness: 12, Material: steel, Outline: outline, CountersinkDepth: 4}},
	}
}

func pulled(level strength.Level) PatternCase {
	return PatternCase{ID: "LC1", Level: level, Force: [3]float64{50e3, 0, 20e3}}
}

// assertCheck compares one check's demand and allowable with a hand calculation.
func assertCheck(t *testing.T, p *PreparedPattern, method, member string, mode strength.Mode, demand, allowable float64) {
	t.Helper()
	margins := make([]strength.Margin, len(p.Checks()))
	p.Margins(0, margins)
	for k, c := range p.Checks() {
		if c.Method != method || c.Member != member || c.Mode != mode {
			continue
		}
		if m := margins[k]; !(math.Abs(m.Demand/demand-1) < 1e-4 && math.Abs(m.Allowable/allowable-1) < 1e-4) {
			t.Errorf("%s %s %s: demand %.7g, allowable %.7g; by hand %.7g, %.7g (%v)", method, member, mode, m.Demand, m.Allowable, demand, allowable, m)
		}
		return
	}
	t.Errorf("no check %s %s %s", method, member, mode)
}

func TestAISCByHand(t *testing.T) {
	p := single()
	p.Methods = []string{"aisc-360-j3"}
	p.PackingThickness = 12.7
	area := math.Pi * 100                              // π/4 20²
	shear := 0.75 * 0.45 * 800 * area * (1 - 0.4*0.25) // threads in the plane, 1/2 in of fillers
	lrfd := prepare(t, p, pulled(strength.Limit))      // x 1.5
	assertCheck(t, lrfd, "aisc-360-j3@1", "fastener", strength.Shear, 75e3, shear)
	assertCheck(t, lrfd, "aisc-360-j3@1", "fastener", strength.Tension, 30e3, 0.75*0.75*800*area)
	// R_s + R_t <= 1.3.
	together := 1.3 / (75e3/shear + 30e3/(0.75*0.75*800*area))
	assertCheck(t, lrfd, "aisc-360-j3@1", "fastener", strength.ShearTension, 1, min(together, shear/75e3))
	// The attached plate is pushed toward -x, its edge 100 away: 1.2 x 89 > 2.4 x 20.
	assertCheck(t, lrfd, "aisc-360-j3@1", "attached", strength.Bearing, 75e3, 0.75*2.4*20*10*430)
	// The support toward x = 60: l_c 49, still 58.8 > 48; its thickness less the countersink.
	assertCheck(t, lrfd, "aisc-360-j3@1", "support", strength.Bearing, 75e3, 0.75*2.4*20*8*430)
	p.AISC.Basis = "asd"
	asd := prepare(t, p, pulled(strength.Ultimate)) // / 1.5
	assertCheck(t, asd, "aisc-360-j3@1", "fastener", strength.Shear, 50e3/1.5, shear/0.75/2)
	assertCheck(t, asd, "aisc-360-j3@1", "support", strength.Bearing, 50e3/1.5, 2.4*20*8*430/2)
}

// A hole in the way ends the clear distance.
func TestAISCTearoutToTheNextHole(t *testing.T) {
	p := single()
	p.Methods = []string{"aisc-360-j3"}
	second := p.Fasteners[0]
	second.ID, second.X, second.Y = "2", 40, 3
	p.Fasteners = append(p.Fasteners, second)
	load := pulled(strength.Ultimate)
	load.Point = [3]float64{0, 1.5, 0}
	load.Force = [3]float64{80e3, 0, 0}
	// Along x from hole 1: 40 - sqrt(11² - 3²) - 11 = 18.417 mm.
	clear := 40 - math.Sqrt(11*11-9) - 11
	assertCheck(t, prepare(t, p, load), "aisc-360-j3@1", "support", strength.Bearing, 40e3, 0.75*1.2*clear*8*430)
}

func TestENByHand(t *testing.T) {
	p := single()
	p.Methods = []string{"en-1993-1-8"}
	root := 20 - 0.9382*2.5
	as := math.Pi / 4 * root * root
	en := prepare(t, p, pulled(strength.Ultimate))
	assertCheck(t, en, "en-1993-1-8@1", "fastener", strength.Shear, 50e3, 0.6*800*as/1.25)
	assertCheck(t, en, "en-1993-1-8@1", "fastener", strength.Tension, 20e3, 0.9*800*as/1.25)
	assertCheck(t, en, "en-1993-1-8@1", "fastener", strength.ShearTension, 1, 1/(50e3*1.25/(0.6*800*as)+20e3*1.25/(0.9*800*as)/1.4))
	assertCheck(t, en, "en-1993-1-8@1", "attached", strength.PullThrough, 20e3, 0.6*math.Pi*32*10*430/1.25)
	// e1 = 60: α_b = 60/66; e2 = 50: k_1 = min(2.8 x 50/22 - 1.7, 2.5) = 2.5; one
	// bolt in single lap is held to 1.5.
	assertCheck(t, en, "en-1993-1-8@1", "attached", strength.Bearing, 50e3, 1.5*430*20*10/1.25)
	p.Fasteners[0].ShearPlanes = 2
	p.Plates[1].LoadShare = 1
	en = prepare(t, p, pulled(strength.Ultimate))
	assertCheck(t, en, "en-1993-1-8@1", "fastener", strength.Shear, 50e3, 2*0.6*800*as/1.25)
	assertCheck(t, en, "en-1993-1-8@1", "attached", strength.Bearing, 50e3, 2.5*60/66*430*20*10/1.25)
	// Less half the countersink.
	assertCheck(t, en, "en-1993-1-8@1", "support", strength.Bearing, 50e3, 2.5*60/66*430*20*10/1.25)
	p.Fasteners[0].Type.Class = "10.9"
	p.PackingThickness = 10 // > 20/3: β_p = 180 / (160 + 30)
	en = prepare(t, p, pulled(strength.Ultimate))
	assertCheck(t, en, "en-1993-1-8@1", "fastener", strength.Shear, 50e3, 2*0.5*800*as/1.25*180/190)
}

func TestENBelowItsSpacings(t *testing.T) {
	p := single()
	p.Methods = []string{"en-1993-1-8"}
	p.Plates[0].Outline = [][2]float64{{-100, -50}, {26, -50}, {26, 50}, {-100, 50}} // 26 < 1.2 x 22
	prepared := prepare(t, p, pulled(strength.Ultimate))
	margins := make([]strength.Margin, len(prepared.Checks()))
	prepared.Margins(0, margins)
	for k, c := range prepared.Checks() {
		if c.Member == "attached" && c.Mode == strength.Bearing {
			if m := margins[k]; m.Status != strength.Undetermined || !strings.Contains(m.Why.Render(write), "e1 26 is below 1.2 d0") {
				t.Errorf("%+v", m)
			}
		}
	}
}

func TestENLongJoint(t *testing.T) {
	p := Pattern{Stiffness: "equal", Methods: []string{"en-1993-1-8"}}
	for i := range 9 {
		f := single().Fasteners[0]
		f.ID, f.X = string(rune('a'+i)), float64(i)*65
		p.Fasteners = append(p.Fasteners, f)
	}
	root := 20 - 0.9382*2.5
	// L_j 520 > 15 x 20: β 1 - 220/4000 = 0.945.
	load := PatternCase{ID: "LC1", Level: strength.Ultimate, Force: [3]float64{90e3, 0, 0}}
	assertCheck(t, prepare(t, p, load), "en-1993-1-8@1", "fastener", strength.Shear, 10e3, 0.945*0.6*800*math.Pi/4*root*root/1.25)
}

func TestPreloadByHand(t *testing.T) {
	p := single()
	bolt := p.Fasteners[0].Type
	bolt.TensionStrength = 200e3
	bolt.Preload = &Preload{
		Torque: 400e3, NutFactor: 0.2, Scatter: 0.25, Relaxation: 0.1, ThermalGain: 5e3, ThermalLoss: 2.5e3,
		LoadingPlane: 0.5, StiffnessRatio: 0.4, SeparationFactor: 1.2, Friction: 0.2, SlipFactor: 1.25,
	}
	// P_i = 400 Nm / (0.2 x 20 mm) = 100 kN; P_0max = 125 + 5 = 130, P_0min =
	// 0.75 x 0.9 x 100 - 2.5 = 65 kN; n φ = 0.2: P_sep = 130/0.8 = 162.5 < 200 kN.
	separates := prepare(t, p, pulled(strength.Limit))
	const method = "nasa-std-5020-preload@1"
	assertCheck(t, separates, method, "fastener", strength.Tension, 20e3*1.5*1.15, 200e3)
	assertCheck(t, separates, method, "fastener", strength.Separation, 20e3*1.15, 65e3/1.2)
	// Slip: 0.2/1.25 x 65 = 10.4 kN without tension; with it 10.4 x 50 / (50 + 0.16 x 0.8 x 20).
	assertCheck(t, separates, method, "fastener", strength.Slip, 50e3*1.15, 10.4e3*50/(50+0.16*0.8*20))
	bolt.TensionStrength = 150e3 // < P_sep: (150 - 130) / 0.2 = 100 kN
	assertCheck(t, prepare(t, p, pulled(strength.Limit)), method, "fastener", strength.Tension, 20e3*1.5*1.15, 100e3)
}

func TestPullThrough(t *testing.T) {
	p := single()
	p.Fasteners[0].Type.Head = HeadCountersunk
	prepared := prepare(t, p, pulled(strength.Ultimate))
	margins := make([]strength.Margin, len(prepared.Checks()))
	prepared.Margins(0, margins)
	for k, c := range prepared.Checks() {
		if c.Mode == strength.PullThrough && (margins[k].Status != strength.Undetermined || !strings.Contains(margins[k].Why.Render(write), "pull_through_strength")) {
			t.Errorf("%+v", margins[k])
		}
	}
	p.Fasteners[0].Type.PullThroughStrength = 31e3
	assertCheck(t, prepare(t, p, pulled(strength.Ultimate)), "pull-through@1", "fastener", strength.PullThrough, 23e3, 31e3)
}

// Shear-out runs the way in which the fastener pushes each plate.
func TestShearOutByHand(t *testing.T) {
	prepared := prepare(t, single(), pulled(strength.Ultimate))
	start := 11 * math.Cos(40*math.Pi/180)
	assertCheck(t, prepared, "plate-shear-out@1", "attached", strength.ShearOut, 57.5e3, 2*250*10*(100-start))
	assertCheck(t, prepared, "plate-shear-out@1", "support", strength.ShearOut, 57.5e3, 2*250*12*(60-start))
}

// Two bolts side by side across the load are one row in single lap, and along
// their line they are two: EN 1993-1-8 section 3.6.1(10).
//
//	across: 1.5 x 430 x 20 x 10 / 1.25 = 103,200 N (2.5 x 60/66 would be 156,364)
//	along:  α_b = 80/66 - 1/4 = 0.96212, k_1 = 2.5: 165,485 N
func TestENOneRowAcrossTheLoad(t *testing.T) {
	p := single()
	p.Methods = []string{"en-1993-1-8"}
	p.Plates = p.Plates[:1]
	p.Plates[0].Outline = [][2]float64{{-60, -120}, {60, -120}, {60, 120}, {-60, 120}}
	second := p.Fasteners[0]
	p.Fasteners[0].Y, second.ID, second.Y = -40, "2", 40
	p.Fasteners = append(p.Fasteners, second)
	load := PatternCase{ID: "LC1", Level: strength.Ultimate, Force: [3]float64{50e3, 0, 0}}
	assertCheck(t, prepare(t, p, load), "en-1993-1-8@1", "attached", strength.Bearing, 25e3, 1.5*430*20*10/1.25)
	load.Force = [3]float64{0, 50e3, 0}
	assertCheck(t, prepare(t, p, load), "en-1993-1-8@1", "attached", strength.Bearing, 25e3, 2.5*(80.0/66-0.25)*430*20*10/1.25)
}

// f_ub is part of the bearing: without it nothing says that f_ub/f_u is not less
// than the rest of α_b.
func TestENBearingNeedsTheBolt(t *testing.T) {
	for name, bolt := range map[string]*Type{"none": nil, "rated": {Name: "rated", ShearStrength: 1e5, TensionStrength: 1e5}} {
		p := single()
		p.Methods, p.Fasteners[0].Type = []string{"en-1993-1-8"}, bolt
		prepared := prepare(t, p, pulled(strength.Ultimate))
		margins := make([]strength.Margin, len(prepared.Checks()))
		prepared.Margins(0, margins)
		for k, c := range prepared.Checks() {
			if m := margins[k]; c.Mode == strength.Bearing && (m.Status != strength.Undetermined || !strings.Contains(m.Why.Render(write), "f_ub")) {
				t.Errorf("%s: %+v", name, m)
			}
		}
	}
}

// The instantaneous centre knows neither φ nor γ_M2: the shears of single bolts
// by these methods stay beside it. Two bolts 80 apart, 50 kN at an arm of 100:
// equilibrium asks 62.5 kN across of each and 25 kN along, 67.3 kN if shared
// evenly.
func TestOwnFactorsStandBesideTheInstantaneousCentre(t *testing.T) {
	for _, method := range []string{"aisc-360-j3", "en-1993-1-8"} {
		p := single()
		p.Methods, p.InPlane = []string{method}, inPlaneCentre
		p.Fasteners[0].Type.Fsu = 480
		second := p.Fasteners[0]
		p.Fasteners[0].Y, second.ID, second.Y = -40, "2", 40
		p.Fasteners = append(p.Fasteners, second)
		p.Plates = nil
		load := PatternCase{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{100, 0, 0}, Force: [3]float64{0, 50e3, 0}}
		prepared := prepare(t, p, load)
		margins := make([]strength.Margin, len(prepared.Checks()))
		prepared.Margins(0, margins)
		found := 0
		for k, c := range prepared.Checks() {
			if c.Method == method+"@1" && c.Mode == strength.Shear {
				found++
				if m := margins[k]; m.Demand < 62.5e3 || m.Demand > 75e3 {
					t.Errorf("%s: %+v", method, m)
				}
			}
		}
		if found != 2 {
			t.Errorf("%s: %d shears of single bolts", method, found)
		}
	}
}

// A plate whose shear strength is not given is not adequate in shear-out.
func TestShearOutNeedsItsStrength(t *testing.T) {
	p := single()
	p.Plates[0].Material.Fsu = 0
	prepared := prepare(t, p, pulled(strength.Ultimate))
	margins := make([]strength.Margin, len(prepared.Checks()))
	prepared.Margins(0, margins)
	found := 0
	for k, c := range prepared.Checks() {
		if c.Mode != strength.ShearOut {
			continue
		}
		found++
		if m := margins[k]; m.Status != strength.Undetermined || !strings.Contains(m.Why.Render(write), "F_su") {
			t.Errorf("%s: %+v", c.Member, m)
		}
		if steps := prepared.CaseWorkings(0, k, prepared.Workings(k, nil)); len(steps) == 0 {
			t.Errorf("%s: no workings", c.Member)
		}
	}
	if found != 2 {
		t.Errorf("%d shear-outs", found)
	}
}

package lug_test

import (
	"math"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
	"pgregory.net/rapid"
)

// The thinnest plain lug under 50 kN limit, by hand: shear-out governs with
// 2 x 29.60915 x 270 = 15,988.94 N for each mm, 86,250 N: 5.39435 mm.
func TestSizeThickness(t *testing.T) {
	want := lug.Sizing{Free: lug.FreeThickness, Least: 1, Most: 30, Increment: 0.5}
	got, wrong := lug.Size(bare(), methods("elementary"), usual(), at(50000, 0), want)
	if wrong != nil || !got.Found {
		t.Fatalf("%v %s", wrong, render(got.Reason))
	}
	length := math.Sqrt(1600-math.Pow(12.5*math.Sin(40*math.Pi/180), 2)) - 12.5*math.Cos(40*math.Pi/180)
	if least := 86250 / (2 * length * 270); math.Abs(got.Value-least) > 1e-9 || got.Rounded != 5.5 {
		t.Errorf("%.9f rounded %g, by hand %.9f and 5.5", got.Value, got.Rounded, least)
	}
	if c := got.Result.Checks()[got.Check]; c.Mode != strength.ShearOut || got.Joint.Lug.Thickness != 5.5 {
		t.Errorf("%s governs at %g mm", c.Mode, got.Joint.Lug.Thickness)
	}
}

// A wider hole helps bearing and hurts the net section: the range that holds
// lies inside the bounds. 8 mm thick, 32 mm wide, 40 kN limit, 69 kN ultimate.
// Ultimate bearing with e/D above 2: 880 D 8 >= 69,000 gives D >= 9.80114; at
// limit 660 D 8 >= 46,000 gives D >= 8.71212.
func TestSizeHole(t *testing.T) {
	j := bare()
	j.Lug.Shape, j.Lug.Width, j.Lug.Thickness, j.Lug.EdgeDistance = lug.Square, 32, 8, 30
	want := lug.Sizing{Free: lug.FreeHole, Least: 4, Most: 30}
	got, _ := lug.Size(j, methods("elementary"), usual(), at(40000, 0), want)
	if least := 69000.0 / (880 * 8); !got.Found || math.Abs(got.Value-least) > 1e-9 {
		t.Errorf("%.9f (%s), by hand %.9f", got.Value, render(got.Reason), least)
	}
	if m := margin(t, prepare(t, got.Joint, methods("elementary"), at(40000, 0)), "lug", strength.Bearing, strength.Ultimate); m.Margin < 0 {
		t.Errorf("the value found does not hold: %+v", m)
	}
}

// With ± 0.2 mm on the thickness the thinnest lug of TestSizeThickness is
// 0.2 mm thicker, 5.39435 + 0.2: it is its lower limit that has to hold.
func TestSizeHoldsAtTheWorstCorner(t *testing.T) {
	want := lug.Sizing{
		Free: lug.FreeThickness, Least: 1, Most: 30,
		Tolerances: []lug.Tolerance{{Pointer: "/lug/thickness", Minus: 0.2, Plus: 0.2}},
	}
	got, wrong := lug.Size(bare(), methods("elementary"), usual(), at(50000, 0), want)
	if wrong != nil || !got.Found {
		t.Fatalf("%v %s", wrong, render(got.Reason))
	}
	length := math.Sqrt(1600-math.Pow(12.5*math.Sin(40*math.Pi/180), 2)) - 12.5*math.Cos(40*math.Pi/180)
	if least := 86250/(2*length*270) + 0.2; math.Abs(got.Value-least) > 1e-9 {
		t.Errorf("%.9f, by hand %.9f", got.Value, least)
	}
}

// The pin and the clevis' hole go with the hole, the edge distance with the
// width.
func TestSizeTakesAlong(t *testing.T) {
	got, _ := lug.Size(hinge(), methods("elementary"), usual(), at(20000, 0), lug.Sizing{Free: lug.FreeHole, Least: 24, Most: 26})
	if !got.Found || got.Joint.Pin.Diameter != got.Value-5 || got.Joint.Clevis.HoleDiameter != got.Value {
		t.Errorf("%+v %s", got, render(got.Reason))
	}
	got, _ = lug.Size(bare(), methods("elementary"), usual(), at(20000, 0), lug.Sizing{Free: lug.FreeWidth, Least: 76, Most: 100, Ratio: 0.6})
	if !got.Found || got.Joint.Lug.EdgeDistance != 0.6*got.Value {
		t.Errorf("%+v %s", got.Joint.Lug, render(got.Reason))
	}
}

func TestSizeSaysWhyNot(t *testing.T) {
	weak := bare()
	weak.Lug.Material.Fsu = 0
	for name, c := range map[string]struct {
		joint lug.Joint
		want  lug.Sizing
		words string
	}{
		"too small":    {bare(), lug.Sizing{Free: lug.FreeThickness, Least: 1, Most: 5}, "lug shear-out (ultimate) in load case LC1 has a margin of -0.0731"},
		"undetermined": {weak, lug.Sizing{Free: lug.FreeThickness, Least: 1, Most: 50}, "is undetermined: the material"},
		"impossible":   {bare(), lug.Sizing{Free: lug.FreeEdge, Least: 5, Most: 39}, "/lug/edge_distance"},
		"no multiple":  {bare(), lug.Sizing{Free: lug.FreeThickness, Least: 1, Most: 6, Increment: 7}, "no multiple of 7"},
	} {
		got, wrong := lug.Size(c.joint, methods("elementary"), usual(), at(50000, 0), c.want)
		if got.Found {
			t.Errorf("%s: found %g", name, got.Value)
		}
		said := render(got.Reason)
		for _, f := range wrong {
			said += f.Pointer
		}
		if !strings.Contains(said, c.words) {
			t.Errorf("%s: %q", name, said)
		}
	}
	_, wrong := lug.Size(bare(), methods("elementary"), usual(), at(1, 0), lug.Sizing{Least: 5, Most: 5, Ratio: -1, Increment: -1, Target: -1})
	if len(wrong) != 4 {
		t.Errorf("faults of the question: %v", wrong)
	}
}

// What sizing finds holds, and a step of the scan below it does not.
func TestSizeIsLeast(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		j := drawJoint(t)
		cases := at(between(t, "force", 100, 1e5), 0)
		want := lug.Sizing{Free: lug.Free(rapid.IntRange(0, 3).Draw(t, "free")), Target: between(t, "target", 0, 0.5)}
		now := []float64{j.Lug.Thickness, j.Lug.Width, j.Lug.HoleDiameter, j.Lug.EdgeDistance}[want.Free]
		want.Least, want.Most = now/4, now*4
		got, wrong := lug.Size(j, methods("elementary"), usual(), cases, want)
		if wrong != nil || !got.Found {
			if wrong == nil && render(got.Reason) == "" {
				t.Fatal("nothing found and nothing said")
			}
			return
		}
		holds := func(x float64) bool {
			w := want
			w.Least, w.Most = x, x*(1+1e-12)
			again, _ := lug.Size(j, methods("elementary"), usual(), cases, w)
			return again.Found
		}
		if !holds(got.Value) {
			t.Fatalf("%g does not hold", got.Value)
		}
		if below := got.Value * (1 - 1e-9); below > want.Least && holds(below) {
			t.Fatalf("%g holds, and so does %g", got.Value, below)
		}
	})
}

package lug_test

import (
	"math"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

// pointed is a lug of 60 x 12 with a 25 mm hole, whose sides converge by 45° to
// a flat end 28 mm from the hole centre, on a pin that fills the hole.
func pointed() lug.Joint {
	j := bare()
	j.Pin = &lug.Pin{Diameter: 25, Material: steel()}
	j.Lug.Shape, j.Lug.Width, j.Lug.EdgeDistance, j.Lug.TaperAngle = lug.Tapered, 60, 28, 45
	return j
}

// Converging sides cut the shear planes short, in every method that has them.
// By hand, at y the plane ends at x = 30 - y:
//
//	affdl: y = 12.5 sin 40 = 8.03485, x = 21.96515; 2 · 0.617 (x/D - 0.38302) = 0.611553
//	of F_tu across: 0.611553 x 440 x 25 x 12 = 80,725 N (e/D of the end itself: 112,399)
//	asme: φ 55°, y = 10.2394, x = 19.7606; A_v = 2 x 12 (19.7606 - 12.5 cos 55°) = 302.179
//	P_v = 0.70 x 450/(1.20 x 3) x 302.179 = 26,440.6 N
//	aisc: y = 12.5, x = 17.5: 0.6 x 450 x 2 x 12 x 17.5 / 2 = 56,700 N
func TestTaperedEndsShearOutByHand(t *testing.T) {
	sin, cos := math.Sincos(55 * math.Pi / 180)
	for _, c := range []struct {
		method string
		mode   strength.Mode
		want   float64
	}{
		{affdl, strength.Bearing, 2 * 0.617 * ((30-12.5*math.Sin(40*math.Pi/180))/25 - 0.38302) * 440 * 25 * 12},
		{"asme-bth-1", strength.ShearOut, 0.70 * 450 / 3.6 * 2 * 12 * (30 - 12.5*sin - 12.5*cos)},
		{"aisc-360-d5", strength.ShearOut, 56700},
	} {
		p := prepare(t, pointed(), methods(c.method), at(10000, 0))
		out := make([]strength.Margin, len(p.Checks()))
		p.Margins(0, out)
		found := false
		for k, check := range p.Checks() {
			if check.Mode != c.mode || c.method == affdl && check.Level != strength.Ultimate {
				continue
			}
			found = true
			// The project's K has its constants rounded to five figures.
			if math.Abs(out[k].Allowable/c.want-1) > 2e-5 {
				t.Errorf("%s %s: %.6g, by hand %.6g", c.method, c.mode, out[k].Allowable, c.want)
			}
		}
		if !found {
			t.Errorf("%s has no %s", c.method, c.mode)
		}
	}
}

// Sides that meet before the end leave no end to have a distance.
func TestTaperedEndLiesBeforeItsPoint(t *testing.T) {
	for _, c := range []struct {
		edge, offset float64
		faults       bool
	}{{30, 0, false}, {30.1, 0, true}, {28, 2, false}, {28.1, -2, true}} {
		j := pointed()
		j.Lug.EdgeDistance, j.Lug.Offset = c.edge, c.offset
		_, wrong := lug.Prepare(j, methods("elementary"), usual(), at(1, 0))
		if (len(wrong) > 0) != c.faults || c.faults && wrong[0].Pointer != "/lug/edge_distance" {
			t.Errorf("end at %g, offset %g: %v", c.edge, c.offset, wrong)
		}
	}
}

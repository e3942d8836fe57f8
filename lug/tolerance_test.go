package lug_test

import (
	"math"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
	"pgregory.net/rapid"
)

// Each mode takes its own worst corner. Thickness 12 ± 0.1, hole 25 +0.2 -0:
// net section at 11.9 and 25.2: 450 (80 - 25.2) 11.9 = 293,454 N; bearing at
// 11.9 and 25: 720 x 25 x 11.9 = 214,200 N (at 25.2 it is 714.92 x 25.2 x 11.9).
func TestWorstCorners(t *testing.T) {
	lengths := []lug.Tolerance{
		{Pointer: "/lug/thickness", Minus: 0.1, Plus: 0.1}, {Pointer: "/lug/hole_diameter", Minus: 0, Plus: 0.2},
	}
	p, wrong := lug.PrepareToleranced(bare(), lengths, methods("elementary"), usual(), at(50000, 0))
	if wrong != nil {
		t.Fatal(wrong)
	}
	out := make([]strength.Margin, len(p.Checks()))
	p.Margins(0, out)
	for k, c := range p.Checks() {
		var want, usual float64
		var corner string
		switch {
		case c.Level == strength.Limit:
			continue
		case c.Mode == strength.NetSection:
			want, usual, corner = 293454, 297000, "at /lug/thickness 11.9, /lug/hole_diameter 25.2"
		case c.Mode == strength.Bearing:
			want, usual, corner = 214200, 216000, "at /lug/thickness 11.9, /lug/hole_diameter 25"
		default:
			continue
		}
		nominal := p.NominalMargin(0, k).Allowable
		if math.Abs(out[k].Allowable-want) > 1e-6 || math.Abs(nominal-usual) > 1e-6 || render(p.Corner(0, k)) != corner {
			t.Errorf("%s: %g (%s), nominal %g", c.Mode, out[k].Allowable, render(p.Corner(0, k)), nominal)
		}
		if w, ok := working(p.CaseWorkings(0, k, nil), "allowable"); !ok || w.Value != out[k].Allowable {
			t.Errorf("%s: the workings are of another corner: %v", c.Mode, w.Value)
		}
	}
}

func TestToleranceFaults(t *testing.T) {
	for _, c := range []struct {
		name    string
		lengths []lug.Tolerance
		pointer string
		words   string
	}{
		{"negative", []lug.Tolerance{{Pointer: "/lug/width", Minus: -1, Plus: 1}}, "/lug/width/minus", "below zero"},
		{"all of it", []lug.Tolerance{{Pointer: "/lug/thickness", Minus: 12, Plus: 1}}, "/lug/thickness/minus", "leaves nothing"},
		{"below nothing", []lug.Tolerance{{Pointer: "/pin/inner_diameter", Minus: 0.1}}, "/pin/inner_diameter/minus", "more than the length"},
		{"a pin that does not fit at a corner", []lug.Tolerance{
			{Pointer: "/pin/diameter", Minus: 0.1, Plus: 0.1}, {Pointer: "/lug/hole_diameter", Minus: 0.1, Plus: 0.1},
		}, "/pin/diameter", "/lug/hole_diameter 24.9"},
	} {
		j := bare()
		j.Pin = &lug.Pin{Diameter: 24.9, Material: steel()}
		_, wrong := lug.PrepareToleranced(j, c.lengths, methods("elementary"), usual(), at(1, 0))
		found := false
		for _, f := range wrong {
			found = found || f.Pointer == c.pointer && strings.Contains(render(f.Message), c.words)
		}
		if !found {
			t.Errorf("%s: %v", c.name, wrong)
		}
	}
	seven := make([]lug.Tolerance, lug.MostTolerances+1)
	for i := range seven {
		seven[i] = lug.Tolerance{Pointer: "/lug/width", Minus: 1, Plus: 1}
	}
	if _, wrong := lug.PrepareToleranced(bare(), seven, methods("elementary"), usual(), at(1, 0)); len(wrong) != 1 {
		t.Errorf("seven tolerances: %v", wrong)
	}
	for _, pointer := range []string{"/lug/material", "/lug/taper_angle", "/lug", "", "/pin/diameter", "/clevis/bushing/length"} {
		_, wrong := lug.PrepareToleranced(bare(), []lug.Tolerance{{Pointer: pointer, Plus: 1}}, methods("elementary"), usual(), at(1, 0))
		if len(wrong) != 1 || wrong[0].Pointer != pointer {
			t.Errorf("a tolerance of %q: %v", pointer, wrong)
		}
	}
}

// No margin is above the nominal one, and each is that of the joint built at
// the corner that is named.
func TestCornersAreTheWorst(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		j := drawJoint(r)
		lengths := []lug.Tolerance{
			{Pointer: "/lug/thickness", Minus: 0.01 * j.Lug.Thickness, Plus: 0.01 * j.Lug.Thickness},
			{Pointer: "/clevis/gap", Minus: 0, Plus: 0.1 * j.Clevis.Gap},
			{Pointer: "/pin/diameter", Minus: 0.005 * j.Pin.Diameter, Plus: 0},
		}
		p, wrong := lug.PrepareToleranced(j, lengths, everyMethod(), usual(), at(20000, drawAngle(r)))
		if wrong != nil {
			return
		}
		out, nominal := make([]strength.Margin, len(p.Checks())), make([]strength.Margin, len(p.Checks()))
		p.Margins(0, out)
		p.Nominal().Margins(0, nominal)
		for k, c := range p.Checks() {
			if settled(nominal[k]) && settled(out[k]) && out[k].Margin > nominal[k].Margin {
				r.Fatalf("%+v: %g above the nominal %g", c, out[k].Margin, nominal[k].Margin)
			}
			if nominal[k].Status > out[k].Status {
				r.Fatalf("%+v: %s, nominal %s", c, out[k].Status, nominal[k].Status)
			}
			if settled(out[k]) {
				if w, ok := working(p.CaseWorkings(0, k, nil), "margin"); !ok || w.Value != out[k].Margin {
					r.Fatalf("%+v: the workings have the margin %g, the check %g", c, w.Value, out[k].Margin)
				}
			}
		}
	})
}

// A check that only a limit of a length brings about is not lost with the
// nominal length: the bending by an offset of 2 mm, 450 x 80 x 12 / (1 + 12/80)
// = 375,652 N; the press fit of an interference; the play of a pin in its hole.
func TestLimitsBringChecksAbout(t *testing.T) {
	play := bare()
	play.Pin = &lug.Pin{Diameter: 25, Material: steel()}
	replaceable := []lug.Choice{{Method: "en-1993-1-8", Options: lug.Options{"replaceable": {Flag: true}}}}
	for _, c := range []struct {
		name    string
		joint   lug.Joint
		choices []lug.Choice
		length  lug.Tolerance
		mode    strength.Mode
		want    float64 // the allowable by hand; 0: any
	}{
		{"elementary", bare(), methods("elementary"), lug.Tolerance{Pointer: "/lug/offset", Minus: 2, Plus: 2}, strength.Tang, 432000 / 1.15},
		{"affdl", bare(), methods(affdl), lug.Tolerance{Pointer: "/lug/offset", Minus: 2, Plus: 2}, strength.Tang, 432000 / 1.15},
		{"aisc", play, methods("aisc-360-d5"), lug.Tolerance{Pointer: "/lug/offset", Minus: 2, Plus: 2}, strength.Tang, 380 * 80 * 12 / 1.67 / 1.15},
		{"press fit", hinge(), methods(affdl), lug.Tolerance{Pointer: "/bushing/interference", Minus: 0, Plus: 0.04}, strength.Yielding, 0},
		{"contact", play, replaceable, lug.Tolerance{Pointer: "/lug/hole_diameter", Minus: 0, Plus: 0.5}, strength.Bearing, math.Pow(2.5*380/0.591, 2) * 625 * 12 / (71000 * 0.5)},
	} {
		p, wrong := lug.PrepareToleranced(c.joint, []lug.Tolerance{c.length}, c.choices, usual(), at(1000, 0))
		if wrong != nil {
			t.Fatal(c.name, wrong)
		}
		out := make([]strength.Margin, len(p.Checks()))
		p.Margins(0, out)
		found := false
		for k, check := range p.Checks() {
			found = found || check.Mode == c.mode && out[k].Status != strength.NotExercised &&
				(c.want == 0 || math.Abs(out[k].Allowable/c.want-1) < 1e-9)
		}
		if !found {
			t.Errorf("%s: no %s of %g", c.name, c.mode, c.want)
		}
	}
}

package fastener

import (
	"fmt"
	"math"
	"testing"

	"jointledger/strength"

	"pgregory.net/rapid"
)

// Any input within the bounds of a request gives faults or finite numbers, and
// never panics.
func TestWildPatternsStayFinite(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		size := rapid.Custom(func(t *rapid.T) float64 { return math.Pow(10, rapid.Float64Range(-9, 9).Draw(t, "log size")) })
		signed := rapid.OneOf(rapid.Just(0.0), rapid.Float64Range(-10, 10), rapid.Float64Range(-1e12, 1e12))
		words := func(all ...string) string { return rapid.SampledFrom(all).Draw(t, "word") }
		p := Pattern{
			Stiffness: words("equal", "area", "given", "huth"), Interaction: words(append(InteractionWords(), "")...),
			InPlane: words("", "instantaneous-centre"), OutOfPlane: words("", "heel"), Rules: RuleSets(),
			Methods: [][]string{nil, StrengthMethods()}[rapid.IntRange(0, 1).Draw(t, "methods")],
		}
		for k := range rapid.IntRange(0, 2).Draw(t, "plates") {
			axis := rapid.Float64Range(-400, 400).Draw(t, "axis")
			half := rapid.SampledFrom([]float64{20, 1e3, 1e13}).Draw(t, "half")
			plate := Plate{ID: fmt.Sprint(k), Thickness: size.Draw(t, "t"), AxisAngle: &axis, Outline: [][2]float64{{-half, -half}, {half, -half}, {half, half}, {-half, half}}}
			if rapid.Bool().Draw(t, "material") {
				plate.Material = &strength.Material{Ftu: size.Draw(t, "ftu"), Fty: 1, Fsu: 1, Fcy: size.Draw(t, "fcy"), E: 1, Ec: size.Draw(t, "ec"), Bearing: []strength.BearingStrength{{EOverD: 1.5, Fbru: 1, Fbry: 1}}}
			}
			p.Plates = append(p.Plates, plate)
		}
		for i := range rapid.IntRange(1, 5).Draw(t, "fasteners") {
			f := Fastener{ID: fmt.Sprint(i), X: signed.Draw(t, "x"), Y: signed.Draw(t, "y"), Diameter: size.Draw(t, "d"), ShearStiffness: size.Draw(t, "kv"), TensionStiffness: size.Draw(t, "kt"), E: size.Draw(t, "e"), ShearPlanes: rapid.IntRange(0, 2).Draw(t, "planes")}
			if rapid.IntRange(0, 5).Draw(t, "slotted") == 0 {
				angle := rapid.Float64Range(-400, 400).Draw(t, "slot")
				f.SlotAngle = &angle
			}
			if rapid.Bool().Draw(t, "typed") {
				f.Type = &Type{ShearStrength: size.Draw(t, "vu"), Fsu: 1, Ftu: size.Draw(t, "ftu"), Thread: &Thread{Form: "iso", Pitch: f.Diameter / 10}, Preload: &Preload{Nominal: size.Draw(t, "preload"), StiffnessRatio: 0.3, Friction: 0.2}}
			}
			p.Fasteners = append(p.Fasteners, f)
		}
		cases := []PatternCase{{ID: "LC1", Level: strength.Limit}, {ID: "LC2", Level: strength.Ultimate}}
		for c := range cases {
			for k := range 3 {
				cases[c].Point[k], cases[c].Force[k], cases[c].Moment[k] = signed.Draw(t, "point"), signed.Draw(t, "force"), signed.Draw(t, "moment")
			}
		}
		prepared, faults := PreparePattern(p, plain, cases)
		if (prepared == nil) == (len(faults) == 0) {
			t.Fatal("neither an answer nor a fault")
		}
		for _, f := range faults {
			if f.Pointer == "" || f.Message.Render(write) == "" {
				t.Fatalf("%+v", f)
			}
		}
		if prepared == nil {
			return
		}
		finite := func(what string, v float64) {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Fatalf("%s is %g", what, v)
			}
		}
		margins := make([]strength.Margin, len(prepared.Checks()))
		shares := make([]Share, len(p.Fasteners))
		for i := range cases {
			finite("residual", prepared.Shares(i, shares))
			for _, s := range shares {
				finite("shear", s.Shear[0]+s.Shear[1]+s.Resultant)
				finite("tension", s.Tension)
			}
			prepared.Margins(i, margins)
			for k, m := range margins {
				finite(prepared.Checks()[k].Method, m.Demand+m.Allowable+m.Margin)
				for _, s := range prepared.CaseWorkings(i, k, prepared.Workings(k, nil)) {
					finite(prepared.Checks()[k].Method+" "+s.Symbol, s.Value)
				}
			}
		}
		for _, f := range prepared.Findings() {
			f.Message.Render(write)
		}
	})
}

package lug_test

import (
	"encoding/json"
	"math"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

// Invented materials of the Saltmarsh's tail boom hinge.
func plate() strength.Material {
	return strength.Material{
		Name: "SM plate, invented", Ftu: 450, Fty: 380, FtuCross: 440, FtyCross: 370, Fcy: 370, Fsu: 270, E: 71000, Nu: 0.33, Elongation: 0.08,
		Bearing: []strength.BearingStrength{{EOverD: 1.5, Fbru: 680, Fbry: 560}, {EOverD: 2.0, Fbru: 880, Fbry: 660}},
	}
}

func steel() strength.Material {
	return strength.Material{Name: "SM steel, invented", Ftu: 1100, Fty: 950, FtuCross: 1100, FtyCross: 950, Fcy: 1000, Fsu: 660, E: 205000, Nu: 0.29, Elongation: 0.12}
}

// hinge is a whole joint: a bushed round lug in a bushed clevis.
func hinge() lug.Joint {
	head := func(t float64) lug.Head {
		return lug.Head{Shape: lug.Round, Width: 80, Thickness: t, HoleDiameter: 25, EdgeDistance: 40, Material: plate()}
	}
	return lug.Joint{
		Lug: head(12), Bushing: &lug.Bushing{Material: steel()}, Pin: &lug.Pin{Diameter: 20, Material: steel()},
		Clevis: &lug.Clevis{Head: head(7), Gap: 0.5, Bushing: &lug.Bushing{Material: steel()}},
	}
}

// bare is a lug without pin, bushing or clevis.
func bare() lug.Joint { return lug.Joint{Lug: hinge().Lug} }

func usual() strength.Factors { return strength.Factors{Ultimate: 1.5, Fitting: 1.15} }

func at(force, angle float64) []lug.LoadCase {
	return []lug.LoadCase{{ID: "LC1", Level: strength.Limit, Force: force, Angle: angle}}
}

func methods(names ...string) []lug.Choice {
	var all []lug.Choice
	for _, n := range names {
		all = append(all, lug.Choice{Method: n})
	}
	return all
}

func prepare(t testing.TB, j lug.Joint, choices []lug.Choice, cases []lug.LoadCase) *lug.Prepared {
	t.Helper()
	p, wrong := lug.Prepare(j, choices, usual(), cases)
	for _, f := range wrong {
		t.Fatalf("%s: %s", f.Pointer, render(f.Message))
	}
	return p
}

// margin is what the first load case makes of a check.
func margin(t testing.TB, p *lug.Prepared, member string, mode strength.Mode, level strength.Level) strength.Margin {
	t.Helper()
	out := make([]strength.Margin, len(p.Checks()))
	p.Margins(0, out)
	for k, c := range p.Checks() {
		if c.Member == member && c.Mode == mode && c.Level == level {
			return out[k]
		}
	}
	t.Fatalf("no check %s %s %s", member, mode, level)
	return strength.Margin{}
}

func caseInput(t *testing.T, raw []byte) []byte {
	t.Helper()
	var c publishedCase
	if err := json.Unmarshal(raw, &c); err != nil {
		t.Fatal(err)
	}
	return c.Input
}

func TestFaultsNameTheirField(t *testing.T) {
	bad := func(change func(*lug.Joint)) lug.Joint {
		j := hinge()
		change(&j)
		return j
	}
	share := 1.5
	for _, c := range []struct {
		name    string
		joint   lug.Joint
		pointer string
	}{
		{"hole as wide as the lug", bad(func(j *lug.Joint) { j.Lug.HoleDiameter = 80 }), "/lug/hole_diameter"},
		{"end inside the hole", bad(func(j *lug.Joint) { j.Lug.Shape, j.Lug.EdgeDistance = lug.Square, 12.5 }), "/lug/edge_distance"},
		{"round end nearer than the sides", bad(func(j *lug.Joint) { j.Lug.EdgeDistance = 39.9 }), "/lug/edge_distance"},
		{"offset through the side", bad(func(j *lug.Joint) { j.Lug.Offset = -27.5 }), "/lug/offset"},
		{"taper on a round lug", bad(func(j *lug.Joint) { j.Lug.TaperAngle = 10 }), "/lug/taper_angle"},
		{"tapered without taper", bad(func(j *lug.Joint) { j.Lug.Shape = lug.Tapered }), "/lug/taper_angle"},
		{"taper above 45", bad(func(j *lug.Joint) { j.Lug.Shape, j.Lug.TaperAngle = lug.Tapered, 45.1 }), "/lug/taper_angle"},
		{"taper through the hole", bad(func(j *lug.Joint) {
			j.Lug.Shape, j.Lug.TaperAngle, j.Lug.Width, j.Lug.EdgeDistance = lug.Tapered, 45, 35, 20
		}), "/lug/taper_angle"},
		{"end radius on a square lug", bad(func(j *lug.Joint) { j.Lug.Shape, j.Lug.EndRadius = lug.Square, 40 }), "/lug/end_radius"},
		{"arc short of the end", bad(func(j *lug.Joint) { j.Lug.EndRadius = 39 }), "/lug/end_radius"},
		{"no depth", bad(func(j *lug.Joint) { j.Lug.SectionDepths = &[4]float64{1, 0, 1, 1} }), "/lug/section_depths/1"},
		{"pin wider than hole", bad(func(j *lug.Joint) { j.Bushing, j.Pin.Diameter = nil, 25.1; j.Clevis.HoleDiameter = 26 }), "/pin/diameter"},
		{"bushing without wall", bad(func(j *lug.Joint) { j.Pin.Diameter = 25; j.Clevis.HoleDiameter = 26 }), "/bushing"},
		{"clevis bushing without wall", bad(func(j *lug.Joint) { j.Clevis.HoleDiameter = 20 }), "/clevis/bushing"},
		{"bore as wide as the pin", bad(func(j *lug.Joint) { j.Pin.InnerDiameter = 20 }), "/pin/inner_diameter"},
		{"negative gap", bad(func(j *lug.Joint) { j.Clevis.Gap = -0.1 }), "/clevis/gap"},
		{"leg share below half", bad(func(j *lug.Joint) { j.Clevis.LegShare = 0.4 }), "/clevis/leg_share"},
		{"moment share in double shear", bad(func(j *lug.Joint) { s := 0.5; j.Clevis.MomentShare = &s }), "/clevis/moment_share"},
		{"moment share above one", bad(func(j *lug.Joint) { j.SingleShear = true; j.Clevis.MomentShare = &share }), "/clevis/moment_share"},
		{"leg share in single shear", bad(func(j *lug.Joint) { j.SingleShear = true; j.Clevis.LegShare = 0.5 }), "/clevis/leg_share"},
		{"single shear alone", bad(func(j *lug.Joint) { j.SingleShear = true; j.Clevis = nil }), "/clevis"},
		{"clevis hole as wide as its leg", bad(func(j *lug.Joint) { j.Clevis.HoleDiameter = 80 }), "/clevis/hole_diameter"},
		{"negative interference", bad(func(j *lug.Joint) { j.Bushing.Interference = -0.01 }), "/bushing/interference"},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, wrong := lug.Prepare(c.joint, methods("elementary"), usual(), at(1000, 0))
			if p != nil || len(wrong) == 0 {
				t.Fatal("it was accepted")
			}
			for _, f := range wrong {
				if f.Pointer == c.pointer && render(f.Message) != "" {
					return
				}
			}
			t.Errorf("no fault at %s among %v", c.pointer, wrong)
		})
	}
}

func TestFaultsOfTheRequest(t *testing.T) {
	_, wrong := lug.Prepare(bare(), []lug.Choice{
		{Method: "elementary@9"},
		{Method: "elementary", Compared: true, Options: lug.Options{"pin_bending_factor": {Number: 2}, "colour": {Word: "red"}}},
	}, usual(), []lug.LoadCase{{ID: "a", Force: -1}})
	want := []string{"/load_cases/0/level", "/load_cases/0/force", "/methods/0", "/method_options/elementary/colour", "/method_options/elementary/pin_bending_factor"}
	var got []string
	for _, f := range wrong {
		got = append(got, f.Pointer)
	}
	if strings.Join(got, " ") != strings.Join(want, " ") {
		t.Errorf("faults at %v, expected %v", got, want)
	}
	if _, wrong := lug.Prepare(bare(), nil, usual(), nil); len(wrong) != 2 {
		t.Errorf("no methods and no load cases: %v", wrong)
	}
}

// All faults come at once.
func TestFaultsComeTogether(t *testing.T) {
	j := hinge()
	j.Lug.HoleDiameter, j.Clevis.Gap, j.Pin.InnerDiameter = 90, -1, 30
	_, wrong := lug.Prepare(j, methods("elementary"), usual(), at(1, 0))
	if len(wrong) < 4 { // hole, edge distance, gap, bore
		t.Errorf("only %v", wrong)
	}
}

func TestMissingValuesLeaveTheOthers(t *testing.T) {
	j := bare()
	j.Lug.Material.Fsu = 0
	p := prepare(t, j, methods("elementary"), at(50000, 0))
	if m := margin(t, p, "lug", strength.ShearOut, strength.Ultimate); m.Status != strength.Undetermined || !strings.Contains(render(*m.Why), "F_su") {
		t.Errorf("shear-out without Fsu: %v", m)
	}
	if m := margin(t, p, "lug", strength.NetSection, strength.Ultimate); m.Status != strength.Adequate {
		t.Errorf("net section: %v", m)
	}
}

func TestBearingStaysInItsRange(t *testing.T) {
	short := bare()
	short.Lug.Shape, short.Lug.EdgeDistance = lug.Square, 30 // e/D 1.2
	thin := bare()
	thin.Lug.Thickness = 4.4 // t/D 0.176
	slack := bare()
	slack.Pin = &lug.Pin{Diameter: 23.7, Material: steel()} // Dp/D 0.948
	for name, c := range map[string]struct {
		joint lug.Joint
		words string
	}{
		"e/D": {short, "e/D 1.2 is below 1.5"},
		"t/D": {thin, "t/D 0.176 is below 0.18"},
		"fit": {slack, "Dp/D 0.948 is below 0.95"},
	} {
		m := margin(t, prepare(t, c.joint, methods("elementary"), at(50000, 0)), "lug", strength.Bearing, strength.Ultimate)
		if m.Status != strength.Undetermined || !strings.Contains(render(*m.Why), c.words) {
			t.Errorf("%s: %+v", name, m)
		}
	}
}

// An edge distance typed in inches as exactly 1.5 or 2 diameters is in range.
func TestTypedEdgeDistancesPass(t *testing.T) {
	for n := 100; n <= 1000; n++ {
		for _, ratio := range []float64{1.5, 2} {
			d := float64(n) / 1000
			j := bare()
			j.Lug.Shape, j.Lug.HoleDiameter, j.Lug.EdgeDistance = lug.Square, d*25.4, ratio*d*25.4
			j.Lug.Width, j.Lug.Thickness = 4*d*25.4, d*25.4
			m := margin(t, prepare(t, j, methods("elementary"), at(100, 0)), "lug", strength.Bearing, strength.Ultimate)
			if m.Status != strength.Adequate {
				t.Fatalf("D %g in, e/D %g: %+v", d, ratio, m)
			}
		}
	}
}

func TestElementaryIsAxial(t *testing.T) {
	for _, angle := range []float64{37, 90, 179.9, 270, 359} {
		p := prepare(t, hinge(), methods("elementary"), at(50000, angle))
		if m := margin(t, p, "lug", strength.Bearing, strength.Ultimate); m.Status != strength.Undetermined {
			t.Errorf("at %g°: %+v", angle, m)
		}
		if m := margin(t, p, "pin", strength.PinShear, strength.Ultimate); m.Status != strength.Adequate {
			t.Errorf("the pin at %g°: %+v", angle, m)
		}
	}
	for _, angle := range []float64{0, 360, -360, 720} {
		p := prepare(t, hinge(), methods("elementary"), at(50000, angle))
		if m := margin(t, p, "lug", strength.NetSection, strength.Ultimate); m.Status != strength.Adequate {
			t.Errorf("at %g°: %+v", angle, m)
		}
	}
	if v := verdict(prepare(t, hinge(), methods("elementary"), at(0, 0)), 1); v != strength.NotExercised {
		t.Errorf("without load: %v", v)
	}
}

func TestFindings(t *testing.T) {
	j := hinge()
	j.Lug.BodyRestrained, j.Lug.SectionDepths = true, &[4]float64{1, 1, 1, 1}
	j.Bushing, j.Clevis.Bushing = nil, nil
	j.Pin.Diameter = 24.2 // Dp/D 0.968
	p := prepare(t, j, methods("elementary"), []lug.LoadCase{
		{ID: "a", Level: strength.Ultimate, Force: 1000, Angle: 200}, {ID: "b", Level: strength.Limit, Force: 5000, Angle: 150},
	})
	for _, code := range []string{"limit-from-ultimate", "loose-pin", "body-bending-not-checked", "body-compression-not-checked", "leg-sharing", "not-used"} {
		if !hasFinding(p, code) {
			t.Errorf("no finding %s", code)
		}
	}
	for _, f := range p.Findings() {
		switch f.Code {
		case "body-bending-not-checked":
			// 5000 N sin 150° at half the hole, 12.5 mm; half of it in a leg.
			want := map[string]string{"lug": "31250", "clevis": "15625"}[f.Subject]
			if !strings.Contains(render(f.Message), want) || !strings.Contains(render(f.Message), "load case b") {
				t.Errorf("%s: %s", f.Subject, render(f.Message))
			}
		case "not-used":
			if f.Subject != "lug.section_depths, lug.body_restrained" {
				t.Errorf("not used: %s", f.Subject)
			}
		}
	}
	if hasFinding(prepare(t, hinge(), methods("elementary"), at(1, 0)), "not-used") {
		t.Error("a plain joint has unused fields")
	}
}

// The body as a cantilever: P sin 30° · 100 mm against 450 · 60² · 12 / 6.
func TestBodyBending(t *testing.T) {
	j := bare()
	j.Lug.BodyLength, j.Lug.BodyWidth = 100, 60
	m := margin(t, prepare(t, j, methods("elementary"), at(20000, 30)), "lug", strength.BodyBending, strength.Ultimate)
	want := 450 * 60 * 60 * 12 / 6 / (100 * 0.5)
	if math.Abs(m.Allowable-want) > 1e-6 || m.Demand != 20000*1.5*1.15 {
		t.Errorf("%+v, expected %g", m, want)
	}
}

func TestMethodsDescribeThemselves(t *testing.T) {
	for _, m := range lug.Methods() {
		if m.Title == "" || m.Source == "" || m.Range == "" || len(m.Modes) == 0 || len(m.Equations) == 0 {
			t.Errorf("%s does not say what it is", m.Name())
		}
		for _, e := range m.Equations {
			if e.Symbol == "" || e.Text == "" || e.Source == "" || e.Mark.Weaker(m.Mark) {
				t.Errorf("%s: equation %+v", m.Name(), e)
			}
		}
		for _, o := range m.Options {
			if o.Name == "" || o.Meaning == "" || (o.Kind == lug.Number) != (o.Most > 0) {
				t.Errorf("%s: option %+v", m.Name(), o)
			}
		}
		if got, ok := lug.Find(m.Name()); !ok || got.Name() != m.Name() {
			t.Errorf("%s cannot be found", m.Name())
		}
		if got, ok := lug.Find(m.ID); !ok || got.Revision < m.Revision {
			t.Errorf("%s has no latest revision", m.ID)
		}
	}
	for _, name := range []string{"", "elementary@", "elementary@01", "elementaryx", "Elementary"} {
		if _, ok := lug.Find(name); ok {
			t.Errorf("%q was found", name)
		}
	}
}

// slim is the hinge with heads narrow enough for every derived factor.
func slim() lug.Joint {
	j := hinge()
	j.Lug.Width, j.Clevis.Width = 70, 70
	return j
}

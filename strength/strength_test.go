package strength_test

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"jointledger/strength"
)

// The table of demands: L is the load as given, u the ultimate factor, s the
// largest of the fitting factor and the special factors that name the check.
func TestDemand(t *testing.T) {
	f := strength.Factors{Ultimate: 1.5, Fitting: 1.15, Special: []strength.SpecialFactor{
		{Name: "bearing factor", Value: 2, Modes: []strength.Mode{strength.Bearing}, Members: []string{"lug"}},
		{Name: "casting factor", Value: 1.25, Members: []string{"clevis"}, UltimateOnly: true},
		{Name: "small", Value: 1.1},
	}}
	check := func(member string, mode strength.Mode, level strength.Level) strength.Check {
		return strength.Check{Member: member, Mode: mode, Level: level}
	}
	for _, c := range []struct {
		name         string
		check        strength.Check
		given        strength.Level
		safety       strength.Safety
		applySpecial bool
		want         float64
		fromUltimate bool
	}{
		{"ultimate check, limit load: L u s", check("lug", strength.NetSection, strength.Ultimate), strength.Limit, strength.ByRegulation, false, 1.5 * 1.15, false},
		{"ultimate check, ultimate load: L s", check("lug", strength.NetSection, strength.Ultimate), strength.Ultimate, strength.ByRegulation, false, 1.15, false},
		{"limit check, limit load: L s", check("lug", strength.NetSection, strength.Limit), strength.Limit, strength.ByRegulation, false, 1.15, false},
		{"limit check, ultimate load: L s / u", check("lug", strength.NetSection, strength.Limit), strength.Ultimate, strength.ByRegulation, false, 1.15 / 1.5, true},
		{"special factor that names the check, not multiplied", check("lug", strength.Bearing, strength.Ultimate), strength.Limit, strength.ByRegulation, false, 1.5 * 2, false},
		{"special factor of another member", check("pin", strength.Bearing, strength.Ultimate), strength.Limit, strength.ByRegulation, false, 1.5 * 1.15, false},
		{"special factor at ultimate only", check("clevis", strength.NetSection, strength.Ultimate), strength.Limit, strength.ByRegulation, false, 1.5 * 1.25, false},
		{"special factor at ultimate only, at limit", check("clevis", strength.NetSection, strength.Limit), strength.Limit, strength.ByRegulation, false, 1.15, false},
		{"own factor, limit load: L", check("lug", strength.Fracture, strength.Limit), strength.Limit, strength.ByMethod, false, 1, false},
		{"own factor, ultimate load: L / u", check("lug", strength.Fracture, strength.Limit), strength.Ultimate, strength.ByMethod, false, 1 / 1.5, true},
		{"own factor with special ones: L s", check("lug", strength.Fracture, strength.Limit), strength.Limit, strength.ByMethod, true, 1.15, false},
		{"resistance, limit load: L u", check("lug", strength.Fracture, strength.Ultimate), strength.Limit, strength.ByResistance, false, 1.5, false},
		{"resistance, ultimate load: L", check("lug", strength.Fracture, strength.Ultimate), strength.Ultimate, strength.ByResistance, false, 1, false},
	} {
		d := f.Demand(&c.check, c.given, c.safety, c.applySpecial)
		if got := d.Factor(); math.Abs(got-c.want) > 1e-15 || d.FromUltimate != c.fromUltimate {
			t.Errorf("%s: factor %v, from ultimate %v; want %v, %v", c.name, got, d.FromUltimate, c.want, c.fromUltimate)
		}
		product := 100.0
		for _, w := range d.Workings(nil, strength.Working{}, f, "P", 100*d.Factor(), strength.Force) {
			switch w.Symbol {
			case "s":
				product *= w.Value
			case "u":
				if product *= w.Value; c.check.Level == strength.Limit {
					product /= w.Value * w.Value
				}
			case "demand":
				if math.Abs(w.Value-product) > 1e-12*product {
					t.Errorf("%s: the workings give %v and the demand is %v by %q", c.name, product, w.Value, w.Equation)
				}
			}
		}
	}
}

func TestMarksWeakenInOrder(t *testing.T) {
	order := []strength.Mark{
		strength.Given, strength.Seen, strength.FromCurveSet("a@1"), strength.Derived, strength.CommonPractice,
		strength.FromMemory(95), strength.FromMemory(60),
	}
	for i, m := range order {
		for j, n := range order {
			if m.Weaker(n) != (i > j) {
				t.Errorf("%q weaker than %q: %v", m, n, m.Weaker(n))
			}
		}
		parsed, ok := strength.ParseMark(m.String())
		if fromSet := i == 2; ok == fromSet || ok && parsed != m {
			t.Errorf("%q is read as %q, %v", m, parsed, ok)
		}
	}
	for _, text := range []string{"", "memory", "memory 0%", "memory 100%", "memory 5", "memory 05%", "Seen"} {
		if m, ok := strength.ParseMark(text); ok {
			t.Errorf("%q is read as %q", text, m)
		}
	}
}

// 7050-T7451 plate, .250-1.500 in, A values in ksi: MIL-HDBK-5J table
// 3.7.4.0(b1). Halfway between the ratios a straight line gives the mean.
func TestBearingAt(t *testing.T) {
	m := strength.Material{Name: "7050-T7451", Bearing: []strength.BearingStrength{
		{EOverD: 1.5, Fbru: 107, Fbry: 86}, {EOverD: 2, Fbru: 140, Fbry: 101},
	}}
	for _, c := range []struct {
		property strength.Property
		eOverD   float64
		want     float64
	}{
		{strength.Fbru, 1.5, 107},
		{strength.Fbru, 1.5 - 1e-10, 107},
		{strength.Fbru, 1.75, 123.5},
		{strength.Fbry, 1.75, 93.5},
		{strength.Fbru, 2, 140},
		{strength.Fbru, 3, 140},
	} {
		got, why := m.BearingAt(c.property, c.eOverD)
		if !why.Empty() || math.Abs(got-c.want) > 1e-6 {
			t.Errorf("%s at %v: %v %v, want %v", c.property, c.eOverD, got, why, c.want)
		}
	}
	for _, low := range []float64{1.2, 1.4999} {
		if got, why := m.BearingAt(strength.Fbru, low); why.Empty() {
			t.Errorf("e/D %v is extrapolated to %v", low, got)
		}
	}
	if _, why := (&strength.Material{}).BearingAt(strength.Fbru, 2); why.Empty() {
		t.Error("a material without bearing values has one")
	}
}

func TestCompareHasNoNumbersThatJSONCannotWrite(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		demand, allowable := rapid.Float64Min(0).Draw(t, "demand"), rapid.Float64Range(0, 1e300).Draw(t, "allowable")
		m := strength.Compare(demand, allowable)
		if math.IsNaN(m.Margin) || math.IsInf(m.Margin, 0) {
			t.Fatalf("margin %v", m.Margin)
		}
		if m.Status != strength.NotExercised && (m.Margin >= 0) != (m.Status == strength.Adequate) {
			t.Fatalf("margin %v is %s", m.Margin, m.Status)
		}
	})
}

func TestWithinTolerance(t *testing.T) {
	for milli := 100; milli <= 1000; milli++ {
		d := float64(milli) / 1000
		e := 1.5 * d * 25.4
		if !strength.AtLeast(e, d*25.4*1.5) || !strength.AtMost(e, d*25.4*1.5) || strength.Less(e, d*25.4*1.5) || strength.More(e, 1.5*(d*25.4)) {
			t.Errorf("1.5 x %v in is not 1.5 D", d)
		}
	}
	if strength.AtLeast(1-1e-8, 1) || strength.AtMost(1+1e-8, 1) {
		t.Error("the tolerance is wider than 1e-9")
	}
}

func TestMessagesAreWrittenInTheCallersUnits(t *testing.T) {
	m := strength.Say("%s is %v, %v wide", "it", strength.Length.Of(25.4), strength.Say("not %v", strength.Length.Of(50.8)))
	got := m.Render(func(q strength.Quantity) string {
		if q.Unit != strength.Length {
			t.Errorf("unit %v", q.Unit)
		}
		return map[float64]string{25.4: "1 in", 50.8: "2 in"}[q.Value]
	})
	if want := "it is 1 in, not 2 in wide"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

package fastener

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func drawInterface(t *rapid.T) Interface {
	return Interface{
		T1: logUniform(t, 0.5, 20, "t1"), E1: logUniform(t, 40e3, 210e3, "e1"),
		T2: logUniform(t, 0.5, 20, "t2"), E2: logUniform(t, 40e3, 210e3, "e2"),
		Diameter: logUniform(t, 2, 20, "d"), Ef: logUniform(t, 40e3, 210e3, "ef"), Nuf: 0.3,
		Installation: rapid.SampledFrom(Installations()).Draw(t, "installation"),
	}
}

// In single shear it does not matter which member comes first.
func TestComplianceIsSymmetric(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawInterface(t)
		b := a
		b.T1, b.E1, b.T2, b.E2 = a.T2, a.E2, a.T1, a.E1
		for _, f := range ComplianceFormulas() {
			ca, _, why := Compliance(f.ID, a)
			cb, _, _ := Compliance(f.Name(), b)
			if !why.Empty() || math.Abs(ca-cb) > 1e-12*ca {
				t.Fatalf("%s: %v and %v (%s)", f.ID, ca, cb, render(why))
			}
		}
	})
}

// Scaling all lengths by k divides every compliance by k, all moduli likewise.
func TestComplianceScales(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawInterface(t)
		a.DoubleShear = rapid.Bool().Draw(t, "double")
		k := logUniform(t, 0.01, 100, "k")
		b, c := a, a
		b.T1, b.T2, b.Diameter = k*a.T1, k*a.T2, k*a.Diameter
		c.E1, c.E2, c.Ef = k*a.E1, k*a.E2, k*a.Ef
		for _, f := range ComplianceFormulas() {
			ca, _, why := Compliance(f.ID, a)
			if a.DoubleShear != f.DoubleShear && a.DoubleShear {
				if why.Empty() {
					t.Fatalf("%s has no double-shear form, gave %v", f.ID, ca)
				}
				continue
			}
			for _, scaled := range []Interface{b, c} {
				if cs, _, _ := Compliance(f.ID, scaled); math.Abs(cs*k-ca) > 1e-12*ca {
					t.Fatalf("%s: %v, scaled %v", f.ID, ca, cs*k)
				}
			}
		}
	})
}

// The beam of Rutman's formula by another way: stiffness method, four degrees
// of freedom, solved by hand for equal plates. There the moment vanishes in the
// middle of the beam by symmetry, so each half is a cantilever of l/2 under P on
// its springs: 2 (1/k + (l/2)/(κ G A) + (l/2)²/r + (l/2)³/(3 E I)).
func TestRutmanOfEqualPlates(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawInterface(t)
		a.T2, a.E2 = a.T1, a.E1
		series := 1 / (1/a.E1 + 1/a.Ef)
		half := a.T1 / 2
		area := math.Pi * a.Diameter * a.Diameter / 4
		want := 2 * (1/(a.T1*series) + half*2.6/(0.9*a.Ef*area) + half*half*12/(math.Pow(a.T1, 3)*series) +
			half*half*half/(3*a.Ef*area*a.Diameter*a.Diameter/16))
		if got, _, _ := Compliance("rutman", a); math.Abs(got-want) > 1e-12*want {
			t.Fatalf("%v, by halves %v", got, want)
		}
	})
}

func TestComplianceRefuses(t *testing.T) {
	whole := Interface{T1: 2, E1: 70e3, T2: 3, E2: 70e3, Diameter: 5, Ef: 110e3, Nuf: 0.3}
	tests := []struct {
		name, formula, says string
		change              func(*Interface)
	}{
		{"unknown", "hooke", `no compliance formula "hooke"`, func(*Interface) {}},
		{"unknown revision", "huth@9", `no compliance formula "huth@9"`, func(*Interface) {}},
		{"values missing", "tate-rosenfeld", "needs the thickness of member 2, the fastener's modulus, the fastener's Poisson's ratio", func(i *Interface) {
			i.T2, i.Ef, i.Nuf = 0, 0, 0
		}},
		{"no double shear", "swift", "no form for double shear", func(i *Interface) { i.DoubleShear = true }},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			i := whole
			test.change(&i)
			c, workings, why := Compliance(test.formula, i)
			if c != 0 || workings != nil || !strings.Contains(render(why), test.says) {
				t.Errorf("%v, %d workings, %q", c, len(workings), render(why))
			}
		})
	}
}

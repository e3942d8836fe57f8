package lug_test

import (
	"slices"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

// functions and constants that an equation may use without explanation.
var spoken = []string{"sin", "cos", "tan", "sqrt", "min", "max", "π"}

// partner is the bushing of a head and the head of a bushing.
var partner = map[string]string{"lug": "bushing", "bushing": "lug", "clevis": "clevis-bushing", "clevis-bushing": "clevis"}

// identifiers returns the symbols that an equation uses.
func identifiers(equation string) []string {
	var found []string
	for _, word := range strings.FieldsFunc(equation, func(r rune) bool { return strings.ContainsRune(" ()+-*/^=<>|[]{}²³", r) }) {
		word = strings.TrimSuffix(word, ",")
		if word != "" && !strings.ContainsRune("0123456789.", rune(word[0])) && !slices.Contains(spoken, word) {
			found = append(found, word)
		}
	}
	return found
}

// Every symbol in an equation of a check's workings is itself a working of
// that check, and stands for one value; the margin and what it is made of are
// among them.
func TestEverySymbolIsExplained(t *testing.T) {
	files := publishedFiles(t)
	equations := 0
	for _, name := range sortedKeys(files) {
		r := decodeRequest(t, caseInput(t, files[name]))
		p := r.prepare(t)
		equations += explained(t, name, p, len(r.cases))
	}
	if equations < 100 {
		t.Errorf("only %d equations were seen", equations)
	}
}

func explained(t *testing.T, name string, p *lug.Prepared, cases int) (equations int) {
	t.Helper()
	out := make([]strength.Margin, len(p.Checks()))
	for k, c := range p.Checks() {
		for i := range cases {
			p.Margins(i, out)
			if out[k].Status != strength.Adequate && out[k].Status != strength.Inadequate {
				continue
			}
			what := strings.Join([]string{name, c.Member, c.Method, c.Mode.String(), c.Level.String()}, " ")
			steps := p.CaseWorkings(i, k, p.Workings(k, nil))
			type place struct{ member, symbol string }
			values := map[place]float64{}
			members := map[string]map[string]bool{}
			for _, w := range steps {
				here := place{w.Member, w.Symbol}
				if old, ok := values[here]; ok && old != w.Value {
					t.Errorf("%s: %s of %s has two values, %g and %g", what, w.Symbol, w.Member, old, w.Value)
				}
				values[here] = w.Value
				if members[w.Symbol] == nil {
					members[w.Symbol] = map[string]bool{}
				}
				members[w.Symbol][w.Member] = true
				if w.Source == "" && w.Equation == "" {
					t.Errorf("%s: %s has neither equation nor source", what, w.Symbol)
				}
			}
			for _, w := range steps {
				if w.Equation == "" {
					continue
				}
				equations++
				for _, symbol := range identifiers(w.Equation) {
					// A symbol is the step's own member's, or that of its bushing or of
					// the head that its bushing lines, or stands for one value only.
					if members[symbol][w.Member] || members[symbol][partner[w.Member]] {
						continue
					}
					distinct := map[float64]bool{}
					for member := range members[symbol] {
						distinct[values[place{member, symbol}]] = true
					}
					if len(distinct) != 1 {
						t.Errorf("%s: %s of %q = %s uses %q, which stands for %d values", what, w.Symbol, w.Member, w.Equation, symbol, len(distinct))
					}
				}
			}
			for symbol, want := range map[string]float64{"demand": out[k].Demand, "allowable": out[k].Allowable, "margin": out[k].Margin} {
				if got, ok := values[place{c.Member, symbol}]; !ok || !near(got, want) {
					t.Errorf("%s: the working %s is %g, the check's %g", what, symbol, got, want)
				}
			}
			for _, w := range steps {
				if w.Mark.Weaker(c.Mark) {
					t.Errorf("%s: %s is marked %q, weaker than the check, %q", what, w.Symbol, w.Mark, c.Mark)
				}
			}
		}
	}
	return equations
}

// near is equality within the rounding of a few operations.
func near(a, b float64) bool { return a-b <= 1e-12*max(a, b, -a, -b) && b-a <= 1e-12*max(a, b, -a, -b) }

// The same holds for joints of every kind, in every direction.
func TestEverySymbolOfEveryJoint(t *testing.T) {
	share := 0.3
	joints := map[string]func(*lug.Joint){
		"bushed":       func(*lug.Joint) {},
		"unbushed":     func(j *lug.Joint) { j.Bushing, j.Clevis.Bushing, j.Pin.Diameter = nil, nil, 25 },
		"hollow pin":   func(j *lug.Joint) { j.Pin.InnerDiameter, j.Clevis.LegShare = 10, 0.6 },
		"stiff pin":    func(j *lug.Joint) { j.Pin.Material.Ftu, j.Pin.Material.Fsu = 9000, 9000 },
		"weak pin":     func(j *lug.Joint) { j.Pin.Material.Ftu = 500 },
		"offset":       func(j *lug.Joint) { j.Lug.Offset, j.Clevis.Offset, j.Clevis.BodyWidth = 2, -2, 60 },
		"square":       func(j *lug.Joint) { j.Lug.Shape, j.Clevis.Shape = lug.Square, lug.Square; j.Bushing.Length = 10 },
		"tapered":      func(j *lug.Joint) { j.Lug.Shape, j.Lug.TaperAngle = lug.Tapered, 15 },
		"short":        func(j *lug.Joint) { j.Lug.EdgeDistance, j.Clevis.EdgeDistance = 35, 36 },
		"pressed":      func(j *lug.Joint) { j.Bushing.Interference, j.Clevis.Bushing.Interference = 0.03, 0.02 },
		"depths given": func(j *lug.Joint) { j.Lug.SectionDepths = &[4]float64{25, 22, 22, 25} },
		"supported":    func(j *lug.Joint) { j.Lug.BodyLength, j.Clevis.BodyLength = 80, 70 },
		"no handbook":  func(j *lug.Joint) { j.Lug.Material.Bearing = nil; j.Clevis.Material.Bearing[0].Fbry = 0 },
		"single shear": func(j *lug.Joint) { j.SingleShear = true },
		"single, shared": func(j *lug.Joint) {
			j.SingleShear, j.Clevis.MomentShare, j.Lug.Offset = true, &share, 1
		},
		"single, by stiffness": func(j *lug.Joint) { j.SingleShear, j.Lug.BodyLength, j.Clevis.BodyLength = true, 80, 70 },
	}
	var names []string
	for _, m := range lug.Methods() {
		names = append(names, m.Name())
	}
	for _, name := range sortedKeys(joints) {
		for _, u := range []float64{1.25, 1.5} {
			j := slim()
			joints[name](&j)
			var cases []lug.LoadCase
			for _, angle := range []float64{0, 37, 90, 143, 180, 217, 270, 323} {
				for _, level := range []strength.Level{strength.Limit, strength.Ultimate} {
					cases = append(cases, lug.LoadCase{ID: level.String(), Level: level, Force: 20000, Angle: angle})
				}
			}
			p, wrong := lug.Prepare(j, methods(names...), strength.Factors{Ultimate: u, Fitting: 1.15}, cases)
			if wrong != nil {
				t.Fatalf("%s: %v", name, wrong)
			}
			explained(t, name, p, len(cases))
		}
	}
}

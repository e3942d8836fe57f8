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
			steps := append(p.Workings(k), p.CaseWorkings(i, k)...)
			values := map[string]float64{}
			for _, w := range steps {
				if old, ok := values[w.Symbol]; ok && old != w.Value {
					t.Errorf("%s: %s has two values, %g and %g", what, w.Symbol, old, w.Value)
				}
				values[w.Symbol] = w.Value
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
					if _, ok := values[symbol]; !ok {
						t.Errorf("%s: %s = %s uses %q, which no working explains", what, w.Symbol, w.Equation, symbol)
					}
				}
			}
			for symbol, want := range map[string]float64{"demand": out[k].Demand, "allowable": out[k].Allowable, "margin": out[k].Margin} {
				if got, ok := values[symbol]; !ok || !near(got, want) {
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

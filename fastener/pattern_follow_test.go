package fastener

import (
	"maps"
	"math"
	"slices"
	"strings"
	"testing"

	"jointledger/strength"
)

// followPattern evaluates every equation of a check's workings as it is
// written, a symbol meaning that of the working's own fastener or else that of
// the pattern, and Σ running over the fasteners that have all its symbols.
func followPattern(t *testing.T, what string, steps []strength.Working) {
	t.Helper()
	scopes := map[string]map[string]float64{"": {}}
	for _, s := range steps {
		if scopes[s.Fastener] == nil {
			scopes[s.Fastener] = map[string]float64{}
		}
		if before, ok := scopes[s.Fastener][s.Symbol]; ok && before != s.Value {
			t.Errorf("%s: %s of %q is both %g and %g", what, s.Symbol, s.Fastener, before, s.Value)
		}
		scopes[s.Fastener][s.Symbol] = s.Value
	}
	known := func(fastener string) map[string]float64 {
		all := maps.Clone(scopes[""])
		maps.Copy(all, scopes[fastener])
		return all
	}
	for _, s := range steps {
		if s.Equation == "" {
			continue
		}
		equation, want := s.Equation, s.Value
		if left, ok := strings.CutPrefix(equation, "solved for λ: "); ok {
			equation, want = strings.TrimSuffix(left, " = 1"), 1
		}
		equation, _, _ = strings.Cut(equation, ", with ") // simultaneous equations
		f := follower{known: known(s.Fastener)}
		f.function = patternFunctions(&f, s.Fastener, scopes)
		m := f.follow(equation)
		if f.bad != "" {
			t.Errorf("%s: %s = %s: %s", what, s.Symbol, s.Equation, f.bad)
			continue
		}
		if math.Abs(m.value-want) > 1e-9*m.size+1e-12 {
			t.Errorf("%s: %s of %q = %s gives %.15g, the working says %.15g", what, s.Symbol, s.Fastener, s.Equation, m.value, want)
		}
	}
}

func patternFunctions(f *follower, outer string, scopes map[string]map[string]float64) func(string) (measured, bool) {
	return func(name string) (measured, bool) {
		switch name {
		case "sqrt":
			m := f.atom()
			return measured{math.Sqrt(m.value), math.Sqrt(m.size)}, true
		case "exp":
			m := f.atom()
			return exactly(math.Exp(m.value)), true
		case "sin", "cos":
			f.take('(')
			m := f.sum()
			f.take('°')
			f.take(')')
			sin, cos := math.Sincos(m.value * math.Pi / 180)
			if name == "sin" {
				return measured{sin, 1}, true
			}
			return measured{cos, 1}, true
		case "Σ":
			f.peek() // past spaces
			argument := identifier.FindString(string(f.rest))
			if f.rest[0] == '(' {
				depth := 0
				for n, r := range f.rest {
					depth += map[rune]int{'(': 1, ')': -1}[r]
					if depth == 0 {
						argument = string(f.rest[:n+1])
						break
					}
				}
			}
			f.rest = f.rest[len([]rune(argument)):]
			// Symbols that the equation's own fastener alone has are the row's.
			row := maps.Clone(scopes[""])
			for symbol, value := range scopes[outer] {
				if !slices.ContainsFunc(slices.Collect(maps.Keys(scopes)), func(other string) bool {
					_, has := scopes[other][symbol]
					return has && other != outer
				}) {
					row[symbol] = value
				}
			}
			var sum measured
			terms := 0
			for fastener, own := range scopes {
				if fastener == "" || !slices.ContainsFunc(identifier.FindAllString(argument, -1), func(symbol string) bool { _, has := own[symbol]; return has }) {
					continue
				}
				one := follower{known: maps.Clone(row)}
				maps.Copy(one.known, own)
				one.function = patternFunctions(&one, fastener, scopes)
				m := one.follow(argument)
				if one.bad != "" {
					continue // not a term of this sum
				}
				terms++
				sum = measured{sum.value + m.value, sum.size + m.size}
			}
			if terms == 0 {
				f.bad = "Σ" + argument + " has no term"
			}
			return sum, true
		}
		return measured{}, false
	}
}

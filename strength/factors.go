package strength

import "slices"

// Factors are the factors of safety on a load.
type Factors struct {
	Ultimate float64 // ultimate load over limit load, at least 1
	Fitting  float64 // at least 1
	Special  []SpecialFactor
}

// SpecialFactor takes the place of the fitting factor where it is the larger.
type SpecialFactor struct {
	Name, Basis string
	Value       float64
	Modes       []Mode   // all when empty
	Members     []string // all when empty
	// UltimateOnly keeps it away from checks at limit level.
	UltimateOnly bool
}

// Names reports whether the special factor bears on a check.
func (s SpecialFactor) Names(c *Check) bool {
	return (len(s.Modes) == 0 || slices.Contains(s.Modes, c.Mode)) &&
		(len(s.Members) == 0 || slices.Contains(s.Members, c.Member)) &&
		(c.Level == Ultimate || !s.UltimateOnly)
}

// Largest returns the factor s of a check, the largest of the fitting factor
// and the special factors that name it, and its name. They are never
// multiplied together.
//
// Source: 14 CFR 25.619, 25.625 (the highest pertinent factor, not a product).
func (f Factors) Largest(c *Check) (s float64, name string) {
	s, name = f.Fitting, "fitting factor"
	for _, special := range f.Special {
		if special.Names(c) && special.Value > s {
			s, name = special.Value, special.Name
		}
	}
	return s, name
}

// Safety says whose factors of safety an allowable is meant to meet.
type Safety uint8

const (
	// ByRegulation is an unfactored strength, met by loads with the factors
	// of the regulations.
	ByRegulation Safety = iota
	// ByMethod is a strength that its method has divided by a factor of its
	// own, met by the limit load.
	ByMethod
	// ByResistance is a strength reduced by a resistance factor, met by the
	// ultimate load.
	ByResistance
)

// Demand is the factor between a load as given and the demand of a check.
type Demand struct {
	// Special is s of the check, 1 where the method takes none.
	Special float64
	// SpecialName says which factor that is, empty where the method takes none.
	SpecialName string
	// Level is the load factor: u, 1 or 1/u.
	Level float64
	// LevelEquation writes it in symbols, empty where it is 1.
	LevelEquation string
	// FromUltimate tells that a limit demand comes from an ultimate load.
	FromUltimate bool
}

// Factor is the whole multiplier of the load.
func (d Demand) Factor() float64 { return d.Level * d.Special }

// Demand returns the factors on a load given at one level for check c. Special
// factors act on ByMethod and ByResistance only when applySpecial is set.
func (f Factors) Demand(c *Check, givenAt Level, safety Safety, applySpecial bool) Demand {
	d := Demand{Special: 1, Level: 1}
	if safety == ByRegulation || applySpecial {
		d.Special, d.SpecialName = f.Largest(c)
	}
	switch {
	case c.Level == Ultimate && givenAt == Limit:
		d.Level, d.LevelEquation = f.Ultimate, "u"
	case c.Level == Limit && givenAt == Ultimate:
		d.Level, d.LevelEquation, d.FromUltimate = 1/f.Ultimate, "1 / u", true
	}
	return d
}

// Workings appends the factors and the demand that they make of a load, with
// the fields of w (member, method, mode, load case) in each step. The load's
// symbol must already be explained by another working.
func (d Demand) Workings(steps []Working, w Working, f Factors, symbol string, demand float64, unit Unit) []Working {
	step := func(symbol string, value float64, unit Unit, equation, source string, mark Mark) Working {
		w := w
		w.Symbol, w.Value, w.Unit, w.Equation, w.Source, w.Mark = symbol, value, unit, equation, source, mark
		return w
	}
	equation := symbol
	if d.LevelEquation != "" {
		steps = append(steps, step("u", f.Ultimate, None, "", "given: factors.ultimate", Given))
		equation += map[string]string{"u": " u", "1 / u": " / u"}[d.LevelEquation]
	}
	if d.SpecialName != "" {
		steps = append(steps, step("s", d.Special, None, "",
			"given: "+d.SpecialName+", the largest that names this check (14 CFR 25.619, 25.625)", Given))
		equation = symbol + " s" + equation[len(symbol):]
	}
	return append(steps, step("demand", demand, unit, equation, "", Given))
}

package lug

import (
	"math"

	"jointledger/strength"
)

// sides are the directions in which a load acts on a head, or in which a load
// exercises a check.
type sides uint8

const (
	pull       sides = 1 << iota // toward the free end
	transverse                   // across
	push                         // into the body

	anyWay = pull | transverse | push
)

// load is a load case, worked out once.
type load struct {
	*LoadCase
	angle    float64 // degrees, from 0 up to 360
	sin, cos float64 // exact at multiples of 90°
	sides    sides   // none without force
	level    int     // index into a law's factors
}

// axial reports whether the load acts along the axis alone.
func (l *load) axial() bool { return l.sides&transverse == 0 }

func newLoad(c *LoadCase) load {
	l := load{LoadCase: c, level: levelIndex(c.Level)}
	l.angle = math.Mod(c.Angle, 360)
	if l.angle < 0 {
		l.angle += 360
	}
	// An angle within the tolerance of geometry limits of a quarter turn is one.
	if quarter := float64(math.Round(l.angle/90) * 90); math.Abs(l.angle-quarter) <= strength.Within*90 {
		l.angle = math.Mod(quarter, 360)
	}
	l.sin, l.cos = sinDegrees(l.angle), cosDegrees(l.angle)
	if c.Force > 0 {
		if l.cos > 0 {
			l.sides |= pull
		}
		if l.cos < 0 {
			l.sides |= push
		}
		if l.sin != 0 {
			l.sides |= transverse
		}
	}
	return l
}

func levelIndex(l strength.Level) int {
	if l == strength.Ultimate {
		return 1
	}
	return 0
}

// law is how a check meets a load case.
type law struct {
	sides sides // the load exercises the check when it has one of these
	// margin sets demand against allowable; factor is between the load as given
	// and the demand. Nil where nothing can be compared.
	margin func(l *load, factor float64) strength.Margin
	// trace writes the steps that the load case makes of the allowable and of
	// the measure of the load, the demand and the margin excepted. Nil: none.
	trace func(s *sheet, l *load)
	// measure is what the factors act on: the load P itself where it is empty,
	// else a symbol that trace has written.
	measure string
	// perLoad is that measure for each N of load; it is used with measure.
	perLoad func(l *load) float64
	// ratio writes, instead of demand and allowable, the steps of a combined
	// check at the factored load P_d. The demand is 1.
	ratio func(s *sheet, l *load, factored float64)
}

// fixed compares the load with an allowable that no load case changes.
func fixed(on sides, allowable float64) law {
	return law{sides: on, margin: func(l *load, factor float64) strength.Margin {
		return strength.Compare(factor*l.Force, allowable)
	}}
}

// Steps that every law ends with.
var (
	eqAllowable = Equation{Symbol: "allowable", Unit: strength.Force, Mark: strength.Given}
	eqMargin    = Equation{Symbol: "margin", Text: "allowable / demand - 1", Unit: strength.None, Source: "margin of safety", Mark: strength.Given}
)

// allow writes the allowable of a check as the load on the joint: the strength
// of the part, whose symbol is given, over its share of the load.
func (p *part) allow(s *sheet, symbol string, strengthOfPart float64) float64 {
	if !p.doubleLeg {
		return s.allow(symbol, strengthOfPart)
	}
	p.legShare(s)
	return s.allow(symbol+" / λ", strengthOfPart/p.share)
}

func (s *sheet) allow(equation string, value float64) float64 {
	e := eqAllowable
	e.Text = equation
	return s.apply(&e, value)
}

// legShare writes the share of the joint's load in the leg that has more.
func (p *part) legShare(s *sheet) float64 {
	return s.input(memberClevis, "λ", p.share, strength.None, fieldLegShare)
}

package lug

import (
	"math"

	"jointledger/strength"
)

// sides are the directions in which a load acts on a head, of which each load
// has one, or in which a load exercises a check.
type sides uint8

const (
	pullAlong   sides = 1 << iota // along the axis, toward the free end
	pushAlong                     // along the axis, into the body
	acrossOnly                    // square to the axis
	obliquePull                   // part pull, part across
	obliquePush                   // part push, part across

	along      = pullAlong | pushAlong
	oblique    = obliquePull | obliquePush
	pull       = pullAlong | obliquePull
	push       = pushAlong | obliquePush
	transverse = acrossOnly | oblique
	anyWay     = along | transverse
)

// load is a load case, worked out once.
type load struct {
	*LoadCase
	angle    float64 // degrees, from 0 up to 360
	sin, cos float64 // exact at multiples of 90°
	// The parts of the load to the power 1.6, for interaction curves.
	axialPower, acrossPower float64
	sides                   sides // none without force
	level                   int   // index into a check's factors
	way                     int   // 0 pulls or acts across, 1 pushes
	hand                    int   // 0 where the transverse part acts toward +y, 1 toward -y
}

// axial reports whether the load acts along the axis alone.
func (l *load) axial() bool { return l.sides&transverse == 0 }

// newLoads works out load cases, and finds what is wrong with them.
func newLoads(cases []LoadCase) (loads []load, wrong faults) {
	checkCases(cases, &wrong)
	loads = make([]load, len(cases))
	for i := range cases {
		loads[i] = newLoad(&cases[i])
	}
	return loads, wrong
}

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
	l.axialPower, l.acrossPower = math.Abs(l.cos), math.Abs(l.sin)
	if l.sin != 0 && l.cos != 0 {
		l.axialPower, l.acrossPower = math.Pow(l.axialPower, interactionPower), math.Pow(l.acrossPower, interactionPower)
	}
	if l.cos < 0 {
		l.way = 1
	}
	if l.sin < 0 {
		l.hand = 1
	}
	if c.Force > 0 {
		l.sides = direction(l.sin, l.cos)
	}
	return l
}

func direction(sin, cos float64) sides {
	switch {
	case cos == 0:
		return acrossOnly
	case sin == 0 && cos > 0:
		return pullAlong
	case sin == 0:
		return pushAlong
	case cos > 0:
		return obliquePull
	}
	return obliquePush
}

// levels are the levels at which loads are given, in the order of a check's
// factors.
var levels = [2]strength.Level{strength.Limit, strength.Ultimate}

func levelIndex(l strength.Level) int {
	if l == strength.Ultimate {
		return 1
	}
	return 0
}

// result is a number that was settled before the load cases, or the reason why
// there is none, with the weakest mark and the fields that it rests on.
type result struct {
	value float64
	why   *strength.Message
	mark  strength.Mark
	read  fieldSet
}

// settle runs a calculation once, for its number.
func (b *builder) settle(write func(*sheet) float64) result {
	s := b.sheet()
	defer b.wipe(s)
	value := write(s)
	return result{value: value, why: s.why, mark: s.mark, read: s.read}
}

// settleBoth runs a calculation of two numbers once.
func (b *builder) settleBoth(write func(*sheet) (one, other float64)) (result, result) {
	s := b.sheet()
	defer b.wipe(s)
	one, other := write(s)
	return result{one, s.why, s.mark, s.read}, result{other, s.why, s.mark, s.read}
}

// lesser is the lesser of two numbers, known when both are.
func (r result) lesser(than result) result {
	r.value = min(r.value, than.value)
	r.mark = strength.Weakest(r.mark, than.mark)
	r.read |= than.read
	if r.why == nil {
		r.why = than.why
	}
	return r
}

// over is the load on the joint with which a head of that share meets r.
func (r result) over(share float64) allowable { return allowable{r.value / share, r.why} }

// known drops how a number was found.
func (r result) known() allowable { return allowable{r.value, r.why} }

// rest notes that what is written next rests on a settled number.
func (s *sheet) rest(r result) {
	s.mark = strength.Weakest(s.mark, r.mark)
	s.read |= r.read
}

// allowable is what a load meets, or the reason why it is not known.
type allowable struct {
	value float64
	why   *strength.Message
}

// law is how a check meets a load case.
type law struct {
	sides sides // the load exercises the check when it has one of these
	// along are the allowables of a pull and of a push, or why there is none,
	// where margin is nil.
	along [2]allowable
	// axialOnly says why there is no margin for a load with a transverse part;
	// nil where along does not depend on the transverse part.
	axialOnly *strength.Message
	// margin sets demand against allowable; factor is between the load as given
	// and the demand.
	margin func(l *load, factor float64) strength.Margin
	// trace writes the steps that the load case makes of the allowable and of
	// the measure of the load, the demand and the margin excepted. Nil: none.
	trace func(s *sheet, l *load)
	// measure is what the factors act on: the load P itself where it is empty,
	// else a symbol that trace has written.
	measure string
	// ratio writes, instead of demand and allowable, the steps of a combined
	// check at the factored load P_d. The demand is 1.
	ratio func(s *sheet, l *load, factored float64)
	// after writes what else follows from the demand.
	after func(s *sheet, demand float64)
	// unloaded is a check that no load has part in: trace writes its demand.
	unloaded bool
}

// fixed compares the load with an allowable that no load case changes.
func fixed(on sides, value float64) law {
	return law{sides: on, along: [2]allowable{{value: value}, {value: value}}}
}

// Steps that every law ends with.
var (
	eqAllowable = Equation{Symbol: "allowable", Unit: strength.Force, Source: "load on the joint", Mark: strength.Given}
	eqMargin    = Equation{Symbol: "margin", Text: "allowable / demand - 1", Unit: strength.None, Source: "margin of safety", Mark: strength.Given}
	// eqUnity is the demand of a combined check.
	eqUnity = Equation{Symbol: "demand", Text: "1", Unit: strength.None, Source: "combined checks: the allowable is the factor on the load that reaches the limit curve", Mark: strength.Given}
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

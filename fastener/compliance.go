package fastener

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"jointledger/strength"
)

// ComplianceGiven is the word for compliances that the caller gives, in place
// of a formula's name.
const ComplianceGiven = "given"

// Installations that formulas distinguish.
const (
	Bolted          = "bolted"
	Riveted         = "riveted"
	BoltedComposite = "bolted-composite"
)

// Installations returns the words for how a fastener sits, in the order of
// answers.
func Installations() []string { return []string{Bolted, Riveted, BoltedComposite} }

// Interface is one fastener through the faying surface of two members. In
// double shear member 1 is the middle one and member 2 each of the two straps.
type Interface struct {
	T1, E1       float64 // thickness in mm and modulus in MPa of member 1
	T2, E2       float64 // of member 2
	Diameter     float64 // mm
	Ef, Nuf      float64 // modulus in MPa and Poisson's ratio of the fastener
	Installation string  // of Installations; empty is Bolted
	DoubleShear  bool
}

// ComplianceFormula is a published formula for the deflection of one fastener
// joint per load on the fastener.
type ComplianceFormula struct {
	ID       string
	Revision int
	// Title, Source and Range are texts for people; Mark is the weakest of the
	// formula's forms.
	Title, Source, Range string
	Mark                 strength.Mark
	Equations            []Equation
	// DoubleShear tells that there is a form for double shear.
	DoubleShear bool

	needsNu bool
	single  func(Interface, *complianceSheet) float64
	double  func(Interface, *complianceSheet) float64
}

// Name is the formula as records carry it, id@revision.
func (f ComplianceFormula) Name() string { return fmt.Sprintf("%s@%d", f.ID, f.Revision) }

// ComplianceFormulas returns every revision of the formulas ever released, in
// the order of answers. Their spread is two to three times: the choice is the
// analyst's.
func ComplianceFormulas() []ComplianceFormula {
	return []ComplianceFormula{tateRosenfeld, huth, swift, rutman}
}

// FindCompliance finds a formula by "id", its latest revision, or by
// "id@revision".
func FindCompliance(name string) (ComplianceFormula, bool) {
	id, revision, pinned := strings.Cut(name, "@")
	var found ComplianceFormula
	for _, f := range ComplianceFormulas() {
		if f.ID == id && (!pinned && f.Revision > found.Revision || pinned && strconv.Itoa(f.Revision) == revision) {
			found = f
		}
	}
	return found, found.Revision > 0
}

// Compliance returns the deflection per load, in mm/N on the fastener's total
// load through the interface, by the formula of that name, with the steps that
// lead to it. A message says why there is none: the formula is unknown, has no
// form for such an interface, or misses a value.
func Compliance(name string, i Interface) (c float64, workings []strength.Working, why strength.Message) {
	f, ok := FindCompliance(name)
	if !ok {
		return 0, nil, strength.Say("there is no compliance formula %q", name)
	}
	sheet := complianceSheet{method: f.Name()}
	c, why = f.evaluate(i, &sheet)
	if !why.Empty() {
		return 0, nil, why
	}
	return c, sheet.steps, why
}

// evaluate applies the formula; a nil sheet keeps no steps.
func (f *ComplianceFormula) evaluate(i Interface, sheet *complianceSheet) (float64, strength.Message) {
	if missing := f.missing(i); len(missing) > 0 {
		return 0, strength.Say("%s needs %s", f.ID, strings.Join(missing, ", "))
	}
	form := f.single
	if i.DoubleShear {
		form = f.double
	}
	if form == nil {
		return 0, f.noDoubleShear()
	}
	c := form(i, sheet)
	if !(c > 0) || math.IsInf(c, 0) {
		return 0, strength.Say("%s gives no number for these dimensions", f.ID)
	}
	return c, strength.Message{}
}

func (f *ComplianceFormula) noDoubleShear() strength.Message {
	return strength.Say("%s has no form for double shear here", f.ID)
}

// missing names the values that the formula lacks.
func (f *ComplianceFormula) missing(i Interface) []string {
	var names []string
	need := func(value float64, name string) {
		if !(value > 0) {
			names = append(names, name)
		}
	}
	need(i.T1, "the thickness of member 1")
	need(i.E1, "the modulus of member 1")
	need(i.T2, "the thickness of member 2")
	need(i.E2, "the modulus of member 2")
	need(i.Diameter, "the diameter")
	need(i.Ef, "the fastener's modulus")
	if f.needsNu {
		need(i.Nuf, "the fastener's Poisson's ratio")
	}
	return names
}

// complianceSheet collects the steps of a formula; a nil one keeps none.
type complianceSheet struct {
	method string
	steps  []strength.Working
}

func (s *complianceSheet) add(symbol string, value float64, unit strength.Unit, equation, source string, mark strength.Mark) float64 {
	if s != nil {
		s.steps = append(s.steps, strength.Working{
			Method: s.method, Symbol: symbol, Value: value, Unit: unit,
			Equation: equation, Source: source, Mark: mark,
		})
	}
	return value
}

// inputs writes what the interface gives.
func (s *complianceSheet) inputs(i Interface, nu bool) {
	given := func(symbol string, value float64, unit strength.Unit, source string) {
		s.add(symbol, value, unit, "", "given: "+source, strength.Given)
	}
	of1, of2 := "the first member at this row", "the second member at this row"
	if i.DoubleShear {
		of1, of2 = "the middle member at this row", "one strap at this row"
	}
	given("t_1", i.T1, strength.Length, "thickness of "+of1)
	given("E_1", i.E1, strength.Stress, "modulus of "+of1)
	given("t_2", i.T2, strength.Length, "thickness of "+of2)
	given("E_2", i.E2, strength.Stress, "modulus of "+of2)
	given("d", i.Diameter, strength.Length, "diameter of the fastener")
	given("E_f", i.Ef, strength.Stress, "modulus of the fastener")
	if nu {
		given("ν_f", i.Nuf, strength.None, "Poisson's ratio of the fastener")
	}
}

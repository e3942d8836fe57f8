package fastener

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"
	"unicode"

	"pgregory.net/rapid"

	"jointledger/strength"
)

// follower evaluates the equations of workings as they are written, from the
// values of the steps before: what somebody does who follows them by hand.
// Every result carries a size, the sum of the sizes of what was added up, to
// which its rounding is in proportion.
type follower struct {
	known map[string]float64
	rest  []rune
	bad   string
	// function reads what follows a name that is no symbol, where it knows one.
	function func(name string) (measured, bool)
}

type measured struct{ value, size float64 }

func exactly(v float64) measured { return measured{v, math.Abs(v)} }

func (f *follower) follow(equation string) measured {
	f.rest, f.bad = []rune(equation), ""
	m := f.sum()
	if f.peek() != 0 && f.bad == "" {
		f.bad = "cannot read " + string(f.rest)
	}
	return m
}

func (f *follower) peek() rune {
	for len(f.rest) > 0 && f.rest[0] == ' ' {
		f.rest = f.rest[1:]
	}
	if len(f.rest) == 0 {
		return 0
	}
	return f.rest[0]
}

func (f *follower) take(r rune) bool {
	if f.peek() == r {
		f.rest = f.rest[1:]
		return true
	}
	return false
}

func (f *follower) sum() measured {
	var m measured
	if f.take('-') {
		m = f.product()
		m.value = -m.value
	} else {
		m = f.product()
	}
	for {
		sign := 1.0
		switch {
		case f.take('+'):
		case f.take('-'):
			sign = -1
		default:
			return m
		}
		n := f.product()
		m = measured{m.value + sign*n.value, m.size + n.size}
	}
}

// product reads factors side by side and quotients, from left to right.
func (f *follower) product() measured {
	m := f.power()
	for {
		r := f.peek()
		switch {
		case f.take('/'):
			n := f.power()
			m = measured{m.value / n.value, m.size / math.Abs(n.value) * n.size / math.Abs(n.value)}
		case r == '(' || unicode.IsLetter(r) || unicode.IsDigit(r):
			n := f.power()
			m = measured{m.value * n.value, m.size * n.size}
		default:
			return m
		}
	}
}

func (f *follower) power() measured {
	m := f.atom()
	exponent := 1.0
	switch {
	case f.take('²'):
		exponent = 2
	case f.take('³'):
		exponent = 3
	case f.take('⁴'):
		exponent = 4
	case f.take('^'):
		exponent = f.atom().value
	}
	return measured{math.Pow(m.value, exponent), math.Pow(m.size, exponent)}
}

func (f *follower) atom() measured {
	switch r := f.peek(); {
	case f.take('('):
		m := f.sum()
		if !f.take(')') {
			f.bad = "a parenthesis is not closed"
		}
		return m
	case f.take('|'):
		m := f.sum()
		if !f.take('|') {
			f.bad = "a size is not closed"
		}
		return measured{math.Abs(m.value), m.size}
	case unicode.IsDigit(r):
		return exactly(f.number())
	case unicode.IsLetter(r):
		return f.named()
	}
	f.bad = "cannot read " + string(f.rest)
	f.rest = nil
	return measured{}
}

func (f *follower) number() float64 {
	n := 0
	for n < len(f.rest) && (unicode.IsDigit(f.rest[n]) || f.rest[n] == '.') {
		n++
	}
	value, err := strconv.ParseFloat(string(f.rest[:n]), 64)
	if err != nil {
		f.bad = err.Error()
	}
	f.rest = f.rest[n:]
	return value
}

func (f *follower) named() measured {
	name := identifier.FindString(string(f.rest))
	f.rest = f.rest[len([]rune(name)):]
	switch name {
	case "π":
		return exactly(math.Pi)
	case "min", "max":
		if !f.take('(') {
			f.bad = name + " without arguments"
		}
		m := f.sum()
		for f.take(',') {
			n := f.sum()
			if name == "max" {
				m.value = max(m.value, n.value)
			} else {
				m.value = min(m.value, n.value)
			}
			m.size = max(m.size, n.size)
		}
		if !f.take(')') {
			f.bad = name + " is not closed"
		}
		return m
	}
	if f.function != nil {
		if m, ok := f.function(name); ok {
			return m
		}
	}
	value, ok := f.known[name]
	if !ok {
		f.bad = name + " is not known yet"
	}
	return exactly(value)
}

// followWorkings holds every equation against the values of the steps before.
// It returns how many it followed.
func followWorkings(t interface{ Fatalf(string, ...any) }, what string, steps []strength.Working) (followed int) {
	f := follower{known: map[string]float64{}}
	for _, s := range steps {
		if s.Equation != "" {
			m := f.follow(s.Equation)
			if f.bad != "" {
				t.Fatalf("%s: %s = %s: %s", what, s.Symbol, s.Equation, f.bad)
			}
			slack := 0.0
			if s.Unit == strength.Force {
				slack = 1e-9 // N: loads that are none but for rounding
			}
			if math.Abs(m.value-s.Value) > 1e-9*m.size+slack {
				t.Fatalf("%s: %s = %s gives %.15g, the working says %.15g (size %g)", what, s.Symbol, s.Equation, m.value, s.Value, m.size)
			}
			followed++
		}
		f.known[s.Symbol] = s.Value
	}
	return followed
}

// checked dresses a splice with types, materials and thicknesses, of values
// that are invented.
func checked(t *rapid.T, s Splice) Splice {
	plate := &strength.Material{
		Name: "SM plate", Source: "invented", Mark: strength.FromMemory(85), Ftu: 440, Fty: 370, Fcy: 360, Ec: 73e3,
		Bearing: []strength.BearingStrength{{EOverD: 1.5, Fbru: 650, Fbry: 520}, {EOverD: 2, Fbru: 850, Fbry: 620}},
	}
	for i := range s.Members {
		m := &s.Members[i]
		m.Material, m.EdgeDistance = plate, rapid.Float64Range(8, 12).Draw(t, "edge")
		if rapid.Bool().Draw(t, "countersunk") {
			m.CountersinkDepth = 0.2
		}
		for range len(m.Bays) + 1 {
			m.RowThickness = append(m.RowThickness, logUniform(t, 2, 12, "row thickness"))
		}
	}
	types := []*Type{
		{Name: "SM rivet", Source: "invented", ShearStrength: 9000, Head: HeadCountersunkReduced},
		{Name: "SM bolt", Source: "invented", Fsu: 655, Ftu: 1100, Thread: &Thread{Form: "iso", Pitch: 0.8, InShearPlane: true}},
		{Name: "SM pin", Source: "invented", Mark: strength.Seen, Fsu: 660},
	}
	for i := range s.Rows {
		s.Rows[i].E, s.Rows[i].Nu = 110e3, 0.3
		s.Rows[i].Type = types[rapid.IntRange(0, 2).Draw(t, "type")]
		if rapid.Bool().Draw(t, "loose") {
			s.Rows[i].Clearance = 0.05
		}
	}
	return s
}

func TestSpliceWorkingsFollow(t *testing.T) {
	followed := map[string]int{}
	rapid.Check(t, func(rt *rapid.T) {
		s, cases := drawSplice(rt, 4, 6)
		s = checked(rt, s)
		s.Compliance = rapid.SampledFrom([]string{ComplianceGiven, "huth", "tate-rosenfeld", "swift", "rutman"}).Draw(rt, "formula")
		switch rapid.IntRange(0, 2).Draw(rt, "shape") {
		case 0:
			cases[0].Level = strength.Ultimate
		case 1: // two members in double shear
			s, cases = checked(rt, uniformLap(rapid.IntRange(2, 5).Draw(rt, "n"), 3, 4, 1e-5)), pull(-9e3)
			s.Symmetric = true
			s.Compliance = rapid.SampledFrom([]string{ComplianceGiven, "huth", "tate-rosenfeld"}).Draw(rt, "formula")
		}
		p, faults := PrepareSplice(s, strength.Factors{Ultimate: 1.5, Fitting: 1.15}, cases)
		if len(faults) > 0 {
			rt.Fatalf("faults: %v", faults)
		}
		margins := make([]strength.Margin, len(p.Checks()))
		p.Margins(0, margins)
		for c, check := range p.Checks() {
			if margins[c].Status == strength.NotExercised {
				continue
			}
			steps := p.CaseWorkings(0, c, p.Workings(c, nil))
			what := fmt.Sprintf("%s %s row %d", check.Method, check.Member, check.Row)
			followed[check.Method] += followWorkings(rt, what, steps)
			assertClosed(t, check, margins[c], steps)
		}
		if t.Failed() {
			rt.Fatalf("the workings do not close")
		}
	})
	for _, method := range []string{methodShear, methodBearing, methodNetSection, methodPlastic, methodBuckling} {
		if followed[method] < 100 {
			t.Errorf("%s: only %d equations were followed", method, followed[method])
		}
	}
}

// The members' closing steps are 0, which proves the solution by hand.
func TestSpliceWorkingsClose(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		s, cases := drawSplice(rt, 4, 6)
		p := mustPrepare(rt, checked(rt, s), cases)
		closing := 0
		out := p.NewTransfers()
		p.Transfers(0, &out)
		scale := out.Through
		for _, i := range out.Interfaces {
			scale = max(scale, math.Abs(i.Load))
		}
		for _, w := range p.sharingCaseSteps(0) {
			if strings.HasPrefix(w.Symbol, "closing_") {
				closing++
				if math.Abs(w.Value) > 1e-9*scale {
					rt.Fatalf("%s is %g of %g", w.Symbol, w.Value, scale)
				}
			}
		}
		if closing != len(s.Members) {
			rt.Fatalf("%d closing steps for %d members", closing, len(s.Members))
		}
	})
}

// Every formula's equations give the values that stand beside them.
func TestComplianceWorkingsFollow(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		i := drawInterface(t)
		i.DoubleShear = rapid.Bool().Draw(t, "double")
		for _, f := range ComplianceFormulas() {
			c, steps, why := Compliance(f.ID, i)
			if !why.Empty() {
				continue
			}
			last := steps[len(steps)-1]
			if followWorkings(t, f.ID, steps) < 3 || last.Symbol != "C" || last.Value != c {
				t.Fatalf("%s ends with %s = %v, the compliance is %v", f.ID, last.Symbol, last.Value, c)
			}
		}
	})
}

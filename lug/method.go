package lug

import (
	"slices"
	"strconv"
	"strings"

	"jointledger/strength"
)

// Choice asks for one method.
type Choice struct {
	Method   string // id@revision, or the id alone for the latest
	Compared bool   // its checks count neither for the verdict nor as governing
	Options  Options
}

// Options are a method's options by name; one that is absent has its default.
type Options map[string]Value

// Value is the value of an option, in the field of the option's kind.
type Value struct {
	Number float64
	Word   string
	Flag   bool
	Set    *CurveSet
}

// OptionKind says which field of a Value an option reads.
type OptionKind uint8

// The kinds of option.
const (
	Number OptionKind = iota
	Word
	Flag
	CurveSetRef
)

// Option is what a caller may choose of a method.
type Option struct {
	Name, Meaning string
	Kind          OptionKind
	Default       Value
	HasDefault    bool     // else the default follows from the joint, or there is none
	Words         []string // of a word; none where it is the number of a curve
	Least, Most   float64  // of a number
	// Requires says in words what the option needs to have an effect.
	Requires string
}

// Equation is one published or derived step of a method.
type Equation struct {
	Number string // in its source, where it has one
	Symbol string // what it gives
	Text   string // in symbols that are other workings
	Unit   strength.Unit
	Source string // document, section
	Mark   strength.Mark

	cited string // what source returns, kept by gather
}

// source names the document, the section and the equation.
func (e *Equation) source() string {
	switch {
	case e.cited != "":
		return e.cited
	case e.Number == "":
		return e.Source
	}
	return e.Source + ", equation " + e.Number
}

// Method is one published method in one revision. Changing any number that it
// gives means a new revision, and the old one stays in the registry.
type Method struct {
	ID        string
	Revision  int
	Title     string
	Source    string
	Range     string
	Mark      strength.Mark // the weakest of its equations
	Modes     []strength.Mode
	Options   []Option
	Equations []Equation
	prepare   func(*builder)
}

// Name is id@revision.
func (m Method) Name() string { return m.ID + "@" + strconv.Itoa(m.Revision) }

// option finds an option by its name.
func (m *Method) option(name string) (Option, bool) {
	i := slices.IndexFunc(m.Options, func(o Option) bool { return o.Name == name })
	if i < 0 {
		return Option{}, false
	}
	return m.Options[i], true
}

// registry holds every revision ever released, the revisions of a method in
// ascending order.
var registry = []Method{
	elementary1,
	affdl1,
	melconHoblit1,
	asmeBTH1,
	aisc360D5,
	en1993,
}

// Methods returns every method in every revision.
func Methods() []Method { return slices.Clone(registry) }

// Find returns the method named "id@revision", or "id" in its latest revision.
func Find(name string) (Method, bool) {
	for _, m := range slices.Backward(registry) {
		rest, ok := strings.CutPrefix(name, m.ID)
		if ok && (rest == "" || rest == "@"+strconv.Itoa(m.Revision)) {
			return m, true
		}
	}
	return Method{}, false
}

// weakestMark is the mark of a method: the weakest of its equations.
func weakestMark(equations []Equation) strength.Mark {
	weakest := strength.Given
	for i := range equations {
		weakest = strength.Weakest(weakest, equations[i].Mark)
	}
	return weakest
}

// gather copies equations out of their variables into a method's list, once
// their sources are written out.
func gather(lists ...[]*Equation) []Equation {
	var all []Equation
	for _, list := range lists {
		for _, e := range list {
			e.cited = e.source()
			all = append(all, *e)
		}
	}
	return all
}

package service

import (
	"errors"
	"fmt"
	"math"
	"reflect"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/go-playground/validator/v10"

	"jointledger/service/strictjson"
	"jointledger/strength"
)

// Bounds of what a document may say. They keep every product of the formulas
// within float64, and are far outside what anybody builds.
const (
	leastSize  = 1e-9
	mostSize   = 1e9
	mostAmount = 1e12
	mostText   = 2000
	mostID     = 200
)

// rule is a word for validate tags with what it asks, in words.
type rule struct {
	asks string
	ok   func(validator.FieldLevel) bool
}

var rules = map[string]rule{
	"size": {fmt.Sprintf("must be more than 0, from %g to %g", leastSize, mostSize), number(func(x float64) bool {
		return x >= leastSize && x <= mostSize
	})},
	"amount": {fmt.Sprintf("must be 0 or more, at most %g", mostAmount), number(func(x float64) bool {
		return x >= 0 && x <= mostAmount
	})},
	"signed": {fmt.Sprintf("must be between %g and %g", -mostAmount, mostAmount), number(func(x float64) bool {
		return math.Abs(x) <= mostAmount
	})},
	"factor":   {"must be from 1 to 1000", number(func(x float64) bool { return x >= 1 && x <= 1000 })},
	"share":    {"must be more than 0 and at most 1", number(func(x float64) bool { return x > 0 && x <= 1 })},
	"portion":  {"must be from 0 to 1", number(func(x float64) bool { return x >= 0 && x <= 1 })},
	"poisson":  {"must be at least 0 and less than 0.5", number(func(x float64) bool { return x >= 0 && x < 0.5 })},
	"angle":    {"must be between -36000 and 36000", number(func(x float64) bool { return math.Abs(x) <= 36000 })},
	"flexible": {"must be more than 0, from 1e-18 to 1e6", number(func(x float64) bool { return x >= 1e-18 && x <= 1e6 })},
	"margin":   {"must be more than -1 and at most 1000", number(func(x float64) bool { return x > -1 && x <= 1000 })},
	"text": {fmt.Sprintf("must be at most %d characters", mostText), func(fl validator.FieldLevel) bool {
		return utf8.RuneCountInString(fl.Field().String()) <= mostText
	}},
	"statement": {fmt.Sprintf("must be 1 to %d characters", mostText), func(fl validator.FieldLevel) bool {
		n := utf8.RuneCountInString(fl.Field().String())
		return n >= 1 && n <= mostText
	}},
	"id": {fmt.Sprintf("must be 1 to %d characters without control characters", mostID), func(fl validator.FieldLevel) bool {
		return isID(fl.Field().String())
	}},
	"version": {"must be a version such as 0.1.0", func(fl validator.FieldLevel) bool {
		_, ok := readVersion(fl.Field().String())
		return ok
	}},
	"mark": {"must be given, seen, derived, common practice or memory N%", func(fl validator.FieldLevel) bool {
		_, ok := strength.ParseMark(fl.Field().String())
		return ok
	}},
	"mode": {"must be one of the modes of checks", func(fl validator.FieldLevel) bool {
		_, ok := modeByWord[fl.Field().String()]
		return ok
	}},
}

func number(ok func(float64) bool) func(validator.FieldLevel) bool {
	return func(fl validator.FieldLevel) bool {
		x := fl.Field().Float()
		return !math.IsNaN(x) && ok(x)
	}
}

func isID(s string) bool {
	n := utf8.RuneCountInString(s)
	return n >= 1 && n <= mostID && strings.IndexFunc(s, unicode.IsControl) < 0
}

var modeByWord = func() map[string]strength.Mode {
	words := map[string]strength.Mode{}
	for _, m := range strength.Modes() {
		words[m.String()] = m
	}
	return words
}()

var validate = newValidator()

func newValidator() *validator.Validate {
	v := validator.New(validator.WithRequiredStructEnabled())
	for word, r := range rules {
		if err := v.RegisterValidation(word, r.ok); err != nil {
			panic(err) // a mistake in the table above
		}
	}
	v.RegisterTagNameFunc(func(f reflect.StructField) string {
		name, _, _ := strings.Cut(f.Tag.Get("json"), ",")
		return name
	})
	v.RegisterCustomTypeFunc(func(field reflect.Value) any {
		l := field.Addr().Interface().(*Length)
		if l.Object != nil {
			return 1.0 // allowed everywhere: faults.limits looks at what it is
		}
		return l.Plain
	}, Length{})
	return v
}

// check applies the validate tags of a document.
func (f *faults) check(document any) {
	var broken validator.ValidationErrors
	if err := validate.Struct(document); errors.As(err, &broken) {
		for _, e := range broken {
			f.add(pointerOf(e.Namespace()), "%s", asked(e))
		}
	}
}

// settle checks a document and resolves it, in this order: the objects that
// resolve puts into it are those of the catalogues, and sound. A rule about what
// resolve makes of the caller's own values must stand in resolve.
func (f *faults) settle(d document, look lookup) {
	f.check(d)
	d.resolve(look, f)
}

// pointerOf turns a validator's namespace, T.lug.charts[Kn@0.8].points[3], into
// a JSON pointer. The object in the place of a name has no token of its own.
func pointerOf(namespace string) string {
	_, path, _ := strings.Cut(namespace, ".")
	var b strings.Builder
	for path != "" {
		end := strings.IndexAny(path, ".[")
		if end < 0 {
			end = len(path)
		}
		if name := path[:end]; name != "Object" && name != "" {
			b.WriteString(pointer(name))
		}
		path = path[end:]
		for strings.HasPrefix(path, "[") {
			token, rest, _ := strings.Cut(path[1:], "]")
			b.WriteString(pointer(token))
			path = rest
		}
		path = strings.TrimPrefix(path, ".")
	}
	return b.String()
}

// asked says what a broken rule asks.
func asked(e validator.FieldError) string {
	found := fmt.Sprintf("%v", e.Value())
	if text, ok := e.Value().(string); ok {
		found = fmt.Sprintf("%.80q", text)
	}
	if r, ok := rules[e.Tag()]; ok {
		return r.asks + ", not " + found
	}
	switch e.Tag() {
	case "min":
		return fmt.Sprintf("must have at least %s element", e.Param())
	case "max":
		return fmt.Sprintf("must have at most %s elements", e.Param())
	case "unique":
		return "must not say the same twice"
	case "oneof":
		return fmt.Sprintf("must be one of %s, not %s", strings.Join(strings.Fields(e.Param()), ", "), found)
	}
	return fmt.Sprintf("breaks the rule %s", e.Tag())
}

// unique notes each id that stands twice in a list, at the later place.
func (f *faults) unique(list string, n int, id func(int) string) {
	first := make(map[string]int, n)
	for i := range n {
		if at, twice := first[id(i)]; twice {
			f.add(pointer(list, i, "id"), "the id %.80q is that of element %d too", id(i), at)
			continue
		}
		first[id(i)] = i
	}
}

// take adds what pure code found wrong, in the caller's units. What it says of
// a list whose elements have faults already only follows from those.
func (f *faults) take(found []strength.Fault, u Units) {
	above := map[string]bool{}
	for _, e := range f.list {
		for at := e.Pointer; at != "" && !above[at]; at = at[:strings.LastIndexByte(at, '/')] {
			above[at] = true
		}
	}
	for _, fault := range found {
		if above[fault.Pointer] {
			continue
		}
		f.add(fault.Pointer, "%s", u.say(fault.Message))
	}
}

// takeUnder is take for what was found in a member of the document.
func (f *faults) takeUnder(member string, found []strength.Fault, u Units) {
	moved := make([]strength.Fault, len(found))
	for i, fault := range found {
		moved[i] = strength.Fault{Pointer: member + fault.Pointer, Message: fault.Message}
	}
	f.take(moved, u)
}

// input decodes and resolves the document of a joint that is the member input
// of another. Bytes that are no such document are an error.
func (f *faults) input(raw strictjson.Raw, d document) error {
	if err := strictjson.Decode(raw, d); err != nil {
		return malformed(err, "/input")
	}
	var inner faults
	inner.settle(d, noRegistry{})
	if found := inner.problem(); found != nil {
		for _, e := range found.Under("/input").Errors {
			f.add(e.Pointer, "%s", e.Detail)
		}
	}
	return nil
}

package service

import (
	"errors"
	"reflect"
	"slices"
	"strings"
	"sync"

	"github.com/go-playground/validator/v10"

	"jointledger/lug"
	"jointledger/service/strictjson"
)

// Length is a dimension, exact or with its limits.
type Length = strictjson.Either[float64, Tolerance]

// Tolerance is a dimension between nominal - minus and nominal + plus.
type Tolerance struct {
	Nominal float64 `json:"nominal"`
	Minus   float64 `json:"minus"`
	Plus    float64 `json:"plus"`
}

// Nominal is the dimension itself, 0 for none.
func Nominal(l *Length) float64 {
	switch {
	case l == nil:
		return 0
	case l.Object != nil:
		return l.Object.Nominal
	}
	return l.Plain
}

// limited is a length of a document that came with its limits.
type limited struct {
	*Tolerance
	at   string // pointer from the document's root
	rule string // what its validate tag asks of the length
}

// toleranced finds the lengths of a document that came with their limits, in
// the order of its members.
func toleranced(document any) []limited {
	v := reflect.ValueOf(document).Elem()
	var found []limited
	for _, m := range lengthsOf(v.Type()) {
		member := v
		for _, i := range m.index {
			if member = reflect.Indirect(member); !member.IsValid() {
				break // an object that is left out
			}
			member = member.Field(i)
		}
		if member.Kind() == reflect.Pointer {
			member = member.Elem()
		}
		if !member.IsValid() {
			continue
		}
		if t := member.Addr().Interface().(*Length).Object; t != nil {
			found = append(found, limited{t, m.at, m.rule})
		}
	}
	return found
}

// lengthMember is where a type of document has a Length.
type lengthMember struct {
	index    []int
	at, rule string
}

var lengthMembers sync.Map // reflect.Type → []lengthMember

// lengthsOf finds the lengths of a type of document, once.
func lengthsOf(t reflect.Type) []lengthMember {
	if known, ok := lengthMembers.Load(t); ok {
		return known.([]lengthMember)
	}
	var found []lengthMember
	var walk func(t reflect.Type, index []int, at string)
	walk = func(t reflect.Type, index []int, at string) {
		if t.Kind() == reflect.Pointer {
			t = t.Elem()
		}
		if t.Kind() != reflect.Struct {
			return
		}
		for i := range t.NumField() {
			field := t.Field(i)
			name, _, _ := strings.Cut(field.Tag.Get("json"), ",")
			if name == "" && !field.Anonymous {
				continue
			}
			below, here := append(slices.Clone(index), i), at
			if !field.Anonymous {
				here += pointer(name)
			}
			if field.Type == reflect.TypeFor[Length]() || field.Type == reflect.TypeFor[*Length]() {
				found = append(found, lengthMember{below, here, strings.TrimPrefix(field.Tag.Get("validate"), "omitnil,")})
				continue
			}
			walk(field.Type, below, here)
		}
	}
	walk(t, nil, "")
	lengthMembers.Store(t, found)
	return found
}

// limits notes what cannot be of lengths with limits: each limit must be what
// the length itself may be.
func (f *faults) limits(lengths []limited) {
	breaks := func(x float64, rule string) string {
		var broken validator.ValidationErrors
		if errors.As(validate.Var(x, rule), &broken) {
			return asked(broken[0])
		}
		return ""
	}
	for i, l := range lengths {
		if i >= lug.MostTolerances {
			f.add(l.at, "is one of %d lengths with a tolerance, and at most %d may have one", len(lengths), lug.MostTolerances)
		}
		sound := true
		for _, part := range []struct {
			name, rule string
			value      float64
		}{{"nominal", l.rule, l.Nominal}, {"minus", "amount", l.Minus}, {"plus", "amount", l.Plus}} {
			if why := breaks(part.value, part.rule); why != "" {
				f.add(l.at+pointer(part.name), "%s", why)
				sound = false
			}
		}
		if !sound {
			continue
		}
		if why := breaks(l.Nominal-l.Minus, l.rule); why != "" {
			f.add(l.at+"/minus", "the least length %s", why)
		}
		if why := breaks(l.Nominal+l.Plus, l.rule); why != "" {
			f.add(l.at+"/plus", "the greatest length %s", why)
		}
	}
}

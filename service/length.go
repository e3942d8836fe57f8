package service

import (
	"errors"
	"reflect"
	"strings"

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

// nominal is the dimension itself, 0 for none.
func nominal(l *Length) float64 {
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
	var found []limited
	var walk func(v reflect.Value, at string)
	walk = func(v reflect.Value, at string) {
		if v = reflect.Indirect(v); !v.IsValid() || v.Kind() != reflect.Struct {
			return
		}
		for i := range v.NumField() {
			field := v.Type().Field(i)
			name, _, _ := strings.Cut(field.Tag.Get("json"), ",")
			if name == "" && !field.Anonymous {
				continue
			}
			member := reflect.Indirect(v.Field(i))
			switch {
			case field.Anonymous:
				walk(member, at)
			case member.IsValid() && member.Type() == reflect.TypeFor[Length]():
				if t := member.Addr().Interface().(*Length).Object; t != nil {
					found = append(found, limited{t, at + pointer(name), strings.TrimPrefix(field.Tag.Get("validate"), "omitnil,")})
				}
			default:
				walk(member, at+pointer(name))
			}
		}
	}
	walk(reflect.ValueOf(document), "")
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

package service

import (
	"errors"
	"fmt"
	"sort"
	"strconv"
	"strings"

	"jointledger/service/strictjson"
)

// Code names what went wrong; the API maps each to a status and a page.
type Code string

// The codes of all problems.
const (
	Malformed            Code = "malformed"
	Invalid              Code = "invalid"
	Unauthenticated      Code = "unauthenticated"
	Forbidden            Code = "forbidden"
	SeparationOfDuties   Code = "separation-of-duties"
	NotFound             Code = "not-found"
	Conflict             Code = "conflict"
	IdempotencyMismatch  Code = "idempotency-mismatch"
	TooLarge             Code = "too-large"
	UnsupportedMediaType Code = "unsupported-media-type"
	RateLimited          Code = "rate-limited"
	Unavailable          Code = "unavailable"
	Internal             Code = "internal"
	MethodNotAllowed     Code = "method-not-allowed"
	Misdirected          Code = "misdirected"
)

// Problem is an error that a caller can act on.
type Problem struct {
	Code   Code
	Detail string
	Errors []FieldError
}

// FieldError says what is wrong with one member of the body.
type FieldError struct {
	Pointer string `json:"pointer"` // RFC 6901, from the root of the body
	Detail  string `json:"detail"`
}

func (p *Problem) Error() string {
	text := p.Detail
	for _, e := range p.Errors {
		text += "; " + e.Pointer + " " + e.Detail
	}
	return text
}

// problem makes one without fields.
func problem(code Code, format string, args ...any) *Problem {
	return &Problem{Code: code, Detail: fmt.Sprintf(format, args...)}
}

// malformed turns an error of strictjson into a problem, its pointer under at.
func malformed(err error, at string) *Problem {
	var e *strictjson.Error
	if !errors.As(err, &e) {
		return &Problem{Code: Malformed, Detail: err.Error()}
	}
	return &Problem{
		Code: Malformed, Detail: "The body is not the JSON that is asked for here.",
		Errors: []FieldError{{at + e.Pointer, e.Detail}},
	}
}

// QueryFault is what is wrong with a parameter of a query, at the pointer that
// stands for it: a slash and its name.
func QueryFault(name, detail string) FieldError {
	return FieldError{pointer(strings.ToValidUTF8(name, "\uFFFD")), detail}
}

// MalformedQuery is the problem of a query that cannot be read.
func MalformedQuery(found ...FieldError) *Problem {
	return &Problem{Code: Malformed, Detail: "The query is not one that is known here.", Errors: found}
}

// faults collects what is wrong with the values of a document.
type faults struct {
	list []FieldError
	seen map[string]bool
	// cause is why a name could not be looked up at all, or what cannot be read.
	cause error
}

// lookedUp notes the error of a lookup: a fault of the name, or of the store.
func (f *faults) lookedUp(at string, err error) {
	if errors.Is(err, ErrUnavailable) {
		f.cause = err
	}
	f.add(at, "%s", err)
}

// malformed notes that a part which is read late is not the JSON asked for:
// the document as a whole is malformed then.
func (f *faults) malformed(err error, at string) {
	if f.cause == nil {
		f.cause = malformed(err, at)
	}
}

// join notes faults found in a part of a document.
func (f *faults) join(at string, found []FieldError) {
	for _, e := range found {
		f.add(at+e.Pointer, "%s", e.Detail)
	}
}

// add notes a fault unless its pointer has one already: the first says why,
// what follows from it says nothing more.
func (f *faults) add(pointer, format string, args ...any) {
	if f.seen[pointer] {
		return
	}
	if f.seen == nil {
		f.seen = map[string]bool{}
	}
	f.seen[pointer] = true
	f.list = append(f.list, FieldError{pointer, fmt.Sprintf(format, args...)})
}

// problem returns all faults as one problem, nil when there are none.
func (f *faults) problem() *Problem {
	if len(f.list) == 0 {
		return nil
	}
	sort.SliceStable(f.list, func(i, j int) bool { return f.list[i].Pointer < f.list[j].Pointer })
	return &Problem{Code: Invalid, Detail: "Some values cannot be used.", Errors: f.list}
}

// Under moves a problem's pointers below a member.
func (p *Problem) Under(member string) *Problem {
	moved := *p
	moved.Errors = make([]FieldError, len(p.Errors))
	for i, e := range p.Errors {
		moved.Errors[i] = FieldError{member + e.Pointer, e.Detail}
	}
	return &moved
}

var escapeToken = strings.NewReplacer("~", "~0", "/", "~1")

// pointer joins tokens into a JSON pointer. Documents make many of them that
// nobody reads.
func pointer(tokens ...any) string {
	b := make([]byte, 0, 48)
	for _, t := range tokens {
		b = append(b, '/')
		switch t := t.(type) {
		case int:
			b = strconv.AppendInt(b, int64(t), 10)
		case string:
			if strings.ContainsAny(t, "~/") {
				t = escapeToken.Replace(t)
			}
			b = append(b, t...)
		default:
			b = append(b, escapeToken.Replace(fmt.Sprint(t))...)
		}
	}
	return string(b)
}

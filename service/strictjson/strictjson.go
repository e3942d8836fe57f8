// Package strictjson reads and writes JSON without leniency. It refuses what
// JSON readers commonly let through: unknown, duplicate and wrongly cased
// members, nulls, trailing data, numbers beyond float64, missing members and
// deep nesting; and it writes the canonical form of RFC 8785.
//
// A struct field whose tag has omitzero is an optional member; every other
// field is a required one, which may be null only when it is a pointer.
package strictjson

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"maps"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"sync"

	"github.com/go-json-experiment/json"
	"github.com/go-json-experiment/json/jsontext"
)

// MaxDepth is the deepest nesting of objects and arrays that Decode takes.
const MaxDepth = 32

// Error says where a document is not what it should be.
type Error struct {
	Pointer string // RFC 6901, of the member itself also where it is missing
	Detail  string
}

func (e *Error) Error() string {
	if e.Pointer == "" {
		return e.Detail
	}
	return e.Pointer + ": " + e.Detail
}

// Words is a string type with a fixed set of values.
type Words interface{ Words() []string }

// Raw is a JSON value kept as it came.
type Raw = jsontext.Value

// Kinds of a Raw.
const (
	String = '"'
	Number = '0'
	Object = '{'
	Array  = '['
)

// Decode reads one JSON document into a pointer. The error is an *Error.
func Decode(data []byte, into any) error {
	if err := inspect(data, reflect.TypeOf(into).Elem()); err != nil {
		return err
	}
	if err := json.Unmarshal(data, into, json.RejectUnknownMembers(true)); err != nil {
		return explain(err)
	}
	return nil
}

// DecodeLoosely reads a document that needs no strictness, nulls included: only
// some of its members into a struct, or all of it into an any.
func DecodeLoosely(data []byte, into any) error { return json.Unmarshal(data, into) }

// DecodeSealed is DecodeLoosely into a struct, for bytes that this program has
// sealed: that no name stands twice was seen then.
func DecodeSealed(data []byte, into any) error {
	return json.Unmarshal(data, into, jsontext.AllowDuplicateNames(true))
}

// Members calls found with the value of each member that has one of the names,
// wherever it stands, but not within another of them.
func Members(data []byte, found func(name string, value Raw), names ...string) error {
	d := jsontext.NewDecoder(bytes.NewReader(data), jsontext.AllowDuplicateNames(true))
	for {
		token, err := d.ReadToken()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		// Within an object every other token is a name.
		parent, read := d.StackIndex(d.StackDepth())
		if token.Kind() != String || parent != Object || read%2 == 0 {
			continue
		}
		if name := token.String(); slices.Contains(names, name) {
			value, err := d.ReadValue()
			if err != nil {
				return err
			}
			found(name, value)
		}
	}
}

// Lines returns a function from pointers into a document to the lines, from 1,
// that they stand on; of a member that is missing, the line of what it is
// missing from.
func Lines(data []byte) func(pointer string) int {
	lines := map[string]int{"": 1}
	d := jsontext.NewDecoder(bytes.NewReader(data))
	for {
		if _, err := d.ReadToken(); err != nil {
			break
		}
		at := string(d.StackPointer())
		if _, known := lines[at]; !known {
			lines[at] = 1 + bytes.Count(data[:d.InputOffset()], []byte{'\n'})
		}
	}
	return func(pointer string) int {
		for {
			if line, ok := lines[pointer]; ok {
				return line
			}
			pointer = pointer[:max(strings.LastIndexByte(pointer, '/'), 0)]
		}
	}
}

// ours is how our own values are written: maps in order, and the values kept as
// they came without looking again for names that stand twice.
var ours = json.JoinOptions(json.Deterministic(true), jsontext.AllowDuplicateNames(true))

// Encode writes v as JSON in the order of its fields; a nil slice is [] and a
// nil pointer null.
func Encode(v any) ([]byte, error) { return json.Marshal(v, ours) }

// Spread writes v as Encode does, over lines that people can read.
func Spread(v any) ([]byte, error) { return json.Marshal(v, ours, jsontext.WithIndent("  ")) }

// Canonical writes v in the form of RFC 8785.
func Canonical(v any) ([]byte, error) {
	data, err := json.Marshal(v, ours)
	if err != nil {
		return nil, err
	}
	if ordered, ok := inOrder(data); ok {
		return ordered, nil
	}
	// A Raw of a caller's, with numbers or escapes of its own.
	value := jsontext.Value(data)
	if err := value.Canonicalize(); err != nil {
		return nil, err
	}
	return value, nil
}

// Compose writes an object in the form of RFC 8785 from the values of its members,
// which Canonical writes or which are in that form already, as a Raw is taken to
// be: large ones are not read again. Names must be plain ASCII letters and _.
func Compose(members map[string]any) ([]byte, error) {
	values, size := make(map[string]Raw, len(members)), 2
	for name, value := range members {
		raw, ok := value.(Raw)
		if !ok {
			text, err := Canonical(value)
			if err != nil {
				return nil, err
			}
			raw = text
		}
		values[name] = raw
		size += len(name) + len(raw) + 4
	}
	out := append(make([]byte, 0, size), '{')
	for i, name := range slices.Sorted(maps.Keys(values)) { // as RFC 8785 does, for ASCII
		if i > 0 {
			out = append(out, ',')
		}
		out = append(append(append(out, '"'), name...), '"', ':')
		out = append(out, values[name]...)
	}
	return append(out, '}'), nil
}

// Either is a plain string or number, or an object in its place. Object is nil
// for the plain form.
type Either[A string | float64, B any] struct {
	Plain  A
	Object *B
}

// UnmarshalJSONFrom implements json.UnmarshalerFrom.
func (e *Either[A, B]) UnmarshalJSONFrom(d *jsontext.Decoder) error {
	if d.PeekKind() == Object {
		e.Object = new(B)
		return json.UnmarshalDecode(d, e.Object)
	}
	return json.UnmarshalDecode(d, &e.Plain)
}

// MarshalJSONTo implements json.MarshalerTo.
func (e Either[A, B]) MarshalJSONTo(out *jsontext.Encoder) error {
	if e.Object != nil {
		return json.MarshalEncode(out, e.Object)
	}
	return json.MarshalEncode(out, e.Plain)
}

func (Either[A, B]) alternatives() (plain, object reflect.Type) {
	return reflect.TypeFor[A](), reflect.TypeFor[B]()
}

type either interface {
	alternatives() (plain, object reflect.Type)
}

// explain turns an error of the library into ours.
func explain(err error) *Error {
	var semantic *json.SemanticError
	var syntactic *jsontext.SyntacticError
	switch {
	case errors.As(err, &syntactic):
		detail := strings.TrimPrefix(syntactic.Err.Error(), "jsontext: ")
		if errors.Is(err, io.ErrUnexpectedEOF) {
			detail = "the document ends too early"
		}
		return &Error{string(syntactic.JSONPointer), fmt.Sprintf("not valid JSON at byte %d: %s", syntactic.ByteOffset, detail)}
	case errors.As(err, &semantic):
		switch {
		case errors.Is(err, json.ErrUnknownName):
			return &Error{string(semantic.JSONPointer), "there is no member of this name"}
		case errors.Is(err, strconv.ErrRange):
			return &Error{string(semantic.JSONPointer), "the number is out of range"}
		}
		return &Error{string(semantic.JSONPointer), "must be " + wanted(semantic.GoType)}
	case errors.Is(err, io.ErrUnexpectedEOF), errors.Is(err, io.EOF):
		return &Error{"", "the document ends too early"}
	}
	return &Error{"", err.Error()}
}

// wanted names a Go type in JSON's words.
func wanted(t reflect.Type) string {
	if t == nil {
		return "of another type"
	}
	for t.Kind() == reflect.Pointer {
		t = t.Elem()
	}
	if e, ok := reflect.Zero(t).Interface().(either); ok {
		plain, _ := e.alternatives()
		return wanted(plain) + " or an object"
	}
	switch t.Kind() {
	case reflect.String:
		return "a string"
	case reflect.Float64:
		return "a number"
	case reflect.Int, reflect.Int64:
		return "a whole number"
	case reflect.Bool:
		return "true or false"
	case reflect.Slice:
		return "an array"
	case reflect.Array:
		return fmt.Sprintf("an array of %d", t.Len())
	case reflect.Struct, reflect.Map:
		return "an object"
	}
	return "of another type"
}

// members is what inspect knows of a struct type.
type members struct {
	byName   map[string]memberOf
	required []string
}

// memberOf is a member of a struct type.
type memberOf struct {
	is       reflect.Type
	required int // its place among the required ones, -1 for an optional one
}

var known sync.Map // reflect.Type → *members

func membersOf(t reflect.Type) *members {
	if m, ok := known.Load(t); ok {
		return m.(*members)
	}
	m := &members{byName: map[string]memberOf{}}
	m.add(t)
	known.Store(t, m)
	return m
}

func (m *members) add(t reflect.Type) {
	for _, f := range reflect.VisibleFields(t) {
		if f.Anonymous || !f.IsExported() {
			continue
		}
		name, options, _ := strings.Cut(f.Tag.Get("json"), ",")
		member := memberOf{f.Type, -1}
		if !strings.Contains(options, "omitzero") {
			member.required = len(m.required)
			m.required = append(m.required, name)
		}
		m.byName[name] = member
	}
}

var (
	rawType   = reflect.TypeFor[Raw]()
	wordsType = reflect.TypeFor[Words]()
	nullable  = reflect.TypeFor[struct{}]() // stands for a member that is null and may be
)

// inspect finds what the library lets pass: nulls, missing members, unknown
// words and deep nesting.
func inspect(data []byte, t reflect.Type) error {
	d := jsontext.NewDecoder(bytes.NewReader(data))
	if err := inspectValue(d, t); err != nil {
		var own *Error
		if errors.As(err, &own) {
			return own
		}
		return explain(err)
	}
	return nil
}

// inspectValue reads one value; t is nil where any value may stand.
func inspectValue(d *jsontext.Decoder, t reflect.Type) error {
	kind := d.PeekKind()
	for t != nil && t.Kind() == reflect.Pointer {
		t = t.Elem()
	}
	if t == rawType && kind != 'n' {
		t = nil // whoever decodes it inspects it
	}
	if t != nil && t.Kind() == reflect.Struct {
		if e, ok := reflect.Zero(t).Interface().(either); ok {
			plain, object := e.alternatives()
			if t = plain; kind == Object {
				t = object
			}
		}
	}
	if (kind == Object || kind == Array) && d.StackDepth() >= MaxDepth {
		if _, err := d.ReadToken(); err != nil {
			return err
		}
		return &Error{string(d.StackPointer()), fmt.Sprintf("nested deeper than %d", MaxDepth)}
	}
	switch kind {
	case Object:
		return inspectObject(d, t)
	case Array:
		var element reflect.Type
		if t != nil && (t.Kind() == reflect.Slice || t.Kind() == reflect.Array) {
			element = t.Elem()
		}
		if _, err := d.ReadToken(); err != nil {
			return err
		}
		for d.PeekKind() != ']' {
			if err := inspectValue(d, element); err != nil {
				return err
			}
		}
		_, err := d.ReadToken()
		return err
	case 'n':
		if _, err := d.ReadToken(); err != nil || t == nullable || t == nil {
			return err
		}
		return &Error{string(d.StackPointer()), "must not be null; leave the member out"}
	}
	token, err := d.ReadToken()
	if err != nil {
		return err
	}
	if kind == String && t != nil && t.Implements(wordsType) {
		words := reflect.Zero(t).Interface().(Words).Words()
		for _, w := range words {
			if w == token.String() {
				return nil
			}
		}
		return &Error{string(d.StackPointer()), "must be one of " + strings.Join(words, ", ")}
	}
	return nil
}

func inspectObject(d *jsontext.Decoder, t reflect.Type) error {
	var known *members
	var element reflect.Type
	switch {
	case t != nil && t.Kind() == reflect.Struct:
		known = membersOf(t)
	case t != nil && t.Kind() == reflect.Map:
		element = t.Elem()
	}
	if _, err := d.ReadToken(); err != nil {
		return err
	}
	var found []bool
	if known != nil {
		found = make([]bool, len(known.required))
	}
	for d.PeekKind() != '}' {
		token, err := d.ReadToken()
		if err != nil {
			return err
		}
		next := element
		if known != nil {
			member, ok := known.byName[token.String()]
			if !ok {
				return &Error{string(d.StackPointer()), "there is no member of this name"}
			}
			next = member.is
			if member.required >= 0 {
				found[member.required] = true
				if d.PeekKind() == 'n' && next.Kind() == reflect.Pointer {
					next = nullable
				}
			}
		}
		if err := inspectValue(d, next); err != nil {
			return err
		}
	}
	if _, err := d.ReadToken(); err != nil {
		return err
	}
	if missing := slices.Index(found, false); missing >= 0 {
		return &Error{string(d.StackPointer().AppendToken(known.required[missing])), "is required"}
	}
	return nil
}

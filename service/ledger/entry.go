package ledger

import (
	"bytes"
	"errors"
	"fmt"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"jointledger/service/strictjson"
)

// MaxEntry is the most bytes that an entry may have.
const MaxEntry = 128 << 20

// Types are the types of entries.
var Types = []string{
	"record", "sign-off", "withdrawal", "curve-set", "release-decision", "key-added", "key-revoked",
}

// Envelope is an entry: who wrote what, when.
type Envelope struct {
	Type   string         // one of Types
	ID     string         // UUIDv7, in lower case
	At     string         // UTC, RFC 3339 with three decimals
	Author string         // 1 to 200 characters, none of them a control character
	Body   strictjson.Raw // an object in the form of RFC 8785
}

// The members of an entry in the order of RFC 8785. All values but the body
// and the author's have a fixed form without escapes, so that the form of the
// whole entry follows from its parts.
const (
	beforeAt     = `{"at":"`
	beforeAuthor = `","author":`
	beforeBody   = `,"body":`
	beforeID     = `,"id":"`
	beforeType   = `","type":"`
	afterType    = `"}`
)

const (
	lengthAt = len("2006-01-02T15:04:05.000Z")
	lengthID = len("01234567-89ab-7def-8123-456789abcdef")
)

// Seal writes an entry in its canonical form and hashes it. The error names
// each member that is not what [Envelope] says.
func Seal(e Envelope) (canonical []byte, leaf Hash, err error) {
	if err := e.check(); err != nil {
		return nil, Hash{}, err
	}
	author, err := strictjson.Canonical(e.Author)
	if err != nil {
		return nil, Hash{}, fmt.Errorf("author: %w", err)
	}
	size := len(e.At) + len(author) + len(e.Body) + len(e.ID) + len(e.Type) + 100
	if size > MaxEntry {
		return nil, Hash{}, fmt.Errorf("the entry has %d bytes; at most %d are kept", size, MaxEntry)
	}
	b := make([]byte, 0, size)
	b = append(append(b, beforeAt...), e.At...)
	b = append(append(b, beforeAuthor...), author...)
	b = append(append(b, beforeBody...), e.Body...)
	b = append(append(b, beforeID...), e.ID...)
	b = append(append(b, beforeType...), e.Type...)
	b = append(b, afterType...)
	return b, Leaf(b), nil
}

// Parse reads an entry. Bytes that Seal would not have written are refused.
// The body of the envelope is a part of canonical, not a copy.
func Parse(canonical []byte) (Envelope, error) {
	if len(canonical) > MaxEntry {
		return Envelope{}, fmt.Errorf("it has %d bytes; an entry has at most %d", len(canonical), MaxEntry)
	}
	e, err := Split(canonical)
	if err != nil {
		return Envelope{}, err
	}
	return e, e.check()
}

var errForm = errors.New(`it is not an entry {"at", "author", "body", "id", "type"} in canonical form (RFC 8785)`)

// Split takes apart the bytes of an entry that were found, by their hash, to be
// those that Seal wrote: it does not look into the body.
func Split(b []byte) (e Envelope, err error) {
	rest, ok := bytes.CutPrefix(b, []byte(beforeAt))
	if !ok || len(rest) < lengthAt {
		return e, errForm
	}
	e.At, rest = string(rest[:lengthAt]), rest[lengthAt:]
	if rest, ok = bytes.CutPrefix(rest, []byte(beforeAuthor)); !ok {
		return e, errForm
	}
	author, rest := cutString(rest)
	if author == nil {
		return e, errForm
	}
	if err := strictjson.Decode(author, &e.Author); err != nil {
		return e, fmt.Errorf("author: %w", err)
	}
	if again, err := strictjson.Canonical(e.Author); err != nil || !bytes.Equal(again, author) {
		return e, errForm
	}
	if rest, ok = bytes.CutPrefix(rest, []byte(beforeBody)); !ok {
		return e, errForm
	}
	// The other end: type and id.
	if rest, ok = bytes.CutSuffix(rest, []byte(afterType)); !ok {
		return e, errForm
	}
	at := bytes.LastIndexByte(rest, '"') + 1
	e.Type, rest = string(rest[at:]), rest[:at]
	if rest, ok = bytes.CutSuffix(rest, []byte(beforeType)); !ok || len(rest) < lengthID {
		return e, errForm
	}
	e.ID, rest = string(rest[len(rest)-lengthID:]), rest[:len(rest)-lengthID]
	if rest, ok = bytes.CutSuffix(rest, []byte(beforeID)); !ok {
		return e, errForm
	}
	e.Body = strictjson.Raw(rest)
	return e, nil
}

// cutString cuts a JSON string, with its quotes, off the front; nil where there
// is none.
func cutString(b []byte) (text, rest []byte) {
	if len(b) == 0 || b[0] != '"' {
		return nil, b
	}
	for i := 1; i < len(b); i++ {
		switch b[i] {
		case '\\':
			i++
		case '"':
			return b[:i+1], b[i+1:]
		}
	}
	return nil, b
}

// check names every member that is not as it must be.
func (e Envelope) check() error {
	var faults []string
	fault := func(format string, args ...any) { faults = append(faults, fmt.Sprintf(format, args...)) }
	if !slices.Contains(Types, e.Type) {
		fault("type: %.80q is none of %s", e.Type, strings.Join(Types, ", "))
	}
	if !isUUIDv7(e.ID) {
		fault("id: %.80q is not a version 7 UUID in lower case", e.ID)
	}
	if !isTime(e.At) {
		fault("at: %.80q is not a UTC time such as 2026-01-31T12:00:00.000Z", e.At)
	}
	if !isName(e.Author) {
		fault("author: %.80q is not a name of 1 to 200 characters without control characters", e.Author)
	}
	if len(e.Body) == 0 || e.Body[0] != strictjson.Object || !strictjson.IsCanonical(e.Body) {
		fault("body: is not an object in canonical form (RFC 8785)")
	}
	if len(faults) > 0 {
		return errors.New(strings.Join(faults, "; "))
	}
	return nil
}

// isName reports whether s has 1 to 200 characters, none of them a control
// character.
func isName(s string) bool {
	n := utf8.RuneCountInString(s)
	return n >= 1 && n <= 200 && utf8.ValidString(s) && strings.IndexFunc(s, unicode.IsControl) < 0
}

// isUUIDv7 reports whether s is a UUID of version 7 (RFC 9562 section 5.7) in
// the one form that this log writes.
func isUUIDv7(s string) bool {
	if len(s) != lengthID {
		return false
	}
	for i := range len(s) {
		switch c := s[i]; i {
		case 8, 13, 18, 23:
			if c != '-' {
				return false
			}
		case 14:
			if c != '7' {
				return false
			}
		case 19:
			if c != '8' && c != '9' && c != 'a' && c != 'b' {
				return false
			}
		default:
			if (c < '0' || c > '9') && (c < 'a' || c > 'f') {
				return false
			}
		}
	}
	return true
}

// isTime reports whether s is a UTC time of RFC 3339 with three decimals.
func isTime(s string) bool {
	if len(s) != lengthAt {
		return false
	}
	for i, want := range []byte("0000-00-00T00:00:00.000Z") {
		if want == '0' && (s[i] < '0' || s[i] > '9') || want != '0' && s[i] != want {
			return false
		}
	}
	number := func(from, to int) int {
		n, _ := strconv.Atoi(s[from:to]) // digits alone, as seen above
		return n
	}
	year, month, day := number(0, 4), number(5, 7), number(8, 10)
	if month < 1 || month > 12 || day < 1 || day > daysIn(year, month) {
		return false
	}
	return number(11, 13) < 24 && number(14, 16) < 60 && number(17, 19) < 60
}

func daysIn(year, month int) int {
	switch month {
	case 4, 6, 9, 11:
		return 30
	case 2:
		if year%4 == 0 && (year%100 != 0 || year%400 == 0) {
			return 29
		}
		return 28
	}
	return 31
}

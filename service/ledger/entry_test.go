package ledger

import (
	"bytes"
	"crypto/sha256"
	"encoding/json"
	"strings"
	"testing"

	"github.com/gowebpki/jcs"
	"pgregory.net/rapid"
)

// The bytes of an entry are those of an independent RFC 8785 implementation,
// and its leaf is RFC 6962's, hashed here by hand.
func TestSealIsRFC8785AndRFC6962(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		author := rapid.StringMatching(`[ -~äé€\x{1F529}]{1,60}`).Draw(t, "author")
		value := rapid.MapOf(rapid.String(), rapid.OneOf(
			rapid.Float64().AsAny(), rapid.String().AsAny(), rapid.Bool().AsAny(), rapid.SliceOf(rapid.Int32()).AsAny(),
		)).Draw(t, "body")
		plain, err := json.Marshal(value)
		if err != nil {
			t.Fatal(err)
		}
		body, err := jcs.Transform(plain)
		if err != nil {
			t.Fatal(err)
		}
		e := sampleEnvelope(rapid.IntRange(0, 1e6).Draw(t, "n"), body)
		e.Author = author
		e.Type = rapid.SampledFrom(Types).Draw(t, "type")
		canonical, leaf, err := Seal(e)
		if err != nil {
			t.Fatal(err)
		}
		wide, err := json.MarshalIndent(map[string]any{
			"type": e.Type, "id": e.ID, "body": json.RawMessage(body), "author": author, "at": e.At,
		}, "", "\t")
		if err != nil {
			t.Fatal(err)
		}
		want, err := jcs.Transform(wide)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(canonical, want) {
			t.Fatalf("sealed %s\nRFC 8785 %s", canonical, want)
		}
		if leaf != Hash(sha256.Sum256(append([]byte{0}, want...))) {
			t.Fatal("the leaf is not SHA-256(0x00 ‖ entry)")
		}
		back, err := Parse(canonical)
		if err != nil {
			t.Fatal(err)
		}
		if back.Type != e.Type || back.ID != e.ID || back.At != e.At || back.Author != e.Author || !bytes.Equal(back.Body, e.Body) {
			t.Fatalf("parsed %+v of %+v", back, e)
		}
	})
}

func TestSealNamesEveryFault(t *testing.T) {
	_, _, err := Seal(Envelope{Type: "note", ID: "1", At: "today", Author: "", Body: []byte("[]")})
	if err == nil {
		t.Fatal("sealed")
	}
	for _, member := range []string{"type: ", "id: ", "at: ", "author: ", "body: "} {
		if !strings.Contains(err.Error(), member) {
			t.Errorf("%q is not named in: %v", member, err)
		}
	}
}

func TestSealRefuses(t *testing.T) {
	for name, change := range map[string]func(*Envelope){
		"unknown type":         func(e *Envelope) { e.Type = "Record" },
		"UUIDv4":               func(e *Envelope) { e.ID = "01946c5e-0000-4abc-8def-000000000000" },
		"wrong variant":        func(e *Envelope) { e.ID = "01946c5e-0000-7abc-cdef-000000000000" },
		"upper case id":        func(e *Envelope) { e.ID = "01946C5E-0000-7abc-8def-000000000000" },
		"id without hyphens":   func(e *Envelope) { e.ID = "01946c5e000007abc08def00000000000000" },
		"local time":           func(e *Envelope) { e.At = "2026-01-31T12:00:00.000+" },
		"two decimals":         func(e *Envelope) { e.At = "2026-01-31T12:00:00.00Z" },
		"day 31 of June":       func(e *Envelope) { e.At = "2026-06-31T12:00:00.000Z" },
		"29 February 2026":     func(e *Envelope) { e.At = "2026-02-29T12:00:00.000Z" },
		"29 February 2100":     func(e *Envelope) { e.At = "2100-02-29T12:00:00.000Z" },
		"month 13":             func(e *Envelope) { e.At = "2026-13-01T12:00:00.000Z" },
		"day 0":                func(e *Envelope) { e.At = "2026-01-00T12:00:00.000Z" },
		"hour 24":              func(e *Envelope) { e.At = "2026-01-31T24:00:00.000Z" },
		"second 60":            func(e *Envelope) { e.At = "2026-01-31T23:59:60.000Z" },
		"control in author":    func(e *Envelope) { e.Author = "m\u0085reed" },
		"broken UTF-8":         func(e *Envelope) { e.Author = "m\xffreed" },
		"long author":          func(e *Envelope) { e.Author = strings.Repeat("é", 201) },
		"no body":              func(e *Envelope) { e.Body = nil },
		"null body":            func(e *Envelope) { e.Body = []byte("null") },
		"white space in body":  func(e *Envelope) { e.Body = []byte(`{"a": 1}`) },
		"body out of order":    func(e *Envelope) { e.Body = []byte(`{"b":1,"a":1}`) },
		"duplicate in body":    func(e *Envelope) { e.Body = []byte(`{"a":1,"a":1}`) },
		"1.0 in body":          func(e *Envelope) { e.Body = []byte(`{"a":1.0}`) },
		"number beyond double": func(e *Envelope) { e.Body = []byte(`{"a":1e999}`) },
		"-0 in body":           func(e *Envelope) { e.Body = []byte(`{"a":-0}`) },
		"needless escape":      func(e *Envelope) { e.Body = []byte(`{"a":"\u0041"}`) },
		"lone surrogate":       func(e *Envelope) { e.Body = []byte(`{"a":"\ud800"}`) },
		"two values":           func(e *Envelope) { e.Body = []byte(`{},"c":{}`) },
	} {
		e := sampleEnvelope(1, []byte(`{"a":1}`))
		if _, _, err := Seal(e); err != nil {
			t.Fatal(err)
		}
		change(&e)
		if canonical, _, err := Seal(e); err == nil {
			t.Errorf("%s: sealed %s", name, canonical)
		}
	}
	for _, at := range []string{"2024-02-29T23:59:59.999Z", "2000-02-29T00:00:00.000Z", "2026-12-31T00:00:00.000Z"} {
		e := sampleEnvelope(1, []byte(`{"a":1}`))
		e.At = at
		if _, _, err := Seal(e); err != nil {
			t.Error(err)
		}
	}
}

// Whatever differs from a sealed entry by a byte is refused or is another
// entry, sealed in exactly those bytes.
func TestParseEveryByte(t *testing.T) {
	canonical, _, err := Seal(sampleEnvelope(1, []byte(`{"a":[1,"é\n",null]}`)))
	if err != nil {
		t.Fatal(err)
	}
	for i := range canonical {
		for _, c := range []byte("\x00 \"\\,:{}[]09azAZ\x7f\x80\xff") {
			for _, changed := range [][]byte{
				append(append(bytes.Clone(canonical[:i]), c), canonical[i+1:]...),
				append(append(bytes.Clone(canonical[:i]), c), canonical[i:]...),
				append(bytes.Clone(canonical[:i]), canonical[i+1:]...),
			} {
				mustBeExact(t, changed)
			}
		}
	}
	for i := range canonical {
		if _, err := Parse(canonical[:i]); err == nil {
			t.Errorf("took the first %d bytes", i)
		}
	}
}

func mustBeExact(t *testing.T, b []byte) {
	t.Helper()
	e, err := Parse(b)
	if err != nil {
		return
	}
	again, _, err := Seal(e)
	if err != nil || !bytes.Equal(again, b) {
		t.Errorf("took %q, sealed it as %q (%v)", b, again, err)
	}
	if want, err := jcs.Transform(b); err != nil || !bytes.Equal(want, b) {
		t.Errorf("took %q, which RFC 8785 writes %q (%v)", b, want, err)
	}
}

func FuzzParse(f *testing.F) {
	canonical, _, err := Seal(sampleEnvelope(1, []byte(`{"a":[1,1e-7,"é\n",null]}`)))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(canonical)
	f.Add(bytes.Replace(canonical, []byte("m.reed"), []byte(`m.\u0072eed`), 1))
	f.Add([]byte(`{"at":"2026-01-31T12:00:00.000Z","author":"\`))
	f.Add([]byte(`{"at":"2026-01-31T12:00:00.000Z","author":"a","body":{},"id":"`))
	f.Fuzz(func(t *testing.T, b []byte) { mustBeExact(t, b) })
}

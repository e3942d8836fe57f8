package strictjson

import (
	"bytes"
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/go-json-experiment/json/jsontext"
	"github.com/gowebpki/jcs"
	"pgregory.net/rapid"
)

// canonicalOf is the canonical form by another implementation, nil where there
// is none.
func canonicalOf(data []byte) []byte {
	value := jsontext.Value(bytes.Clone(data))
	if err := value.Canonicalize(); err != nil {
		return nil
	}
	return value
}

// agrees checks IsCanonical against two other implementations: theirs write
// the canonical form, and what is canonical is written as it stands.
func agrees(t interface {
	Helper()
	Errorf(string, ...any)
}, data []byte,
) {
	t.Helper()
	is := IsCanonical(data)
	if want := bytes.Equal(canonicalOf(data), data) && len(data) > 0; is != want {
		t.Errorf("%q: %v, want %v", data, is, want)
	}
	if ordered, ok := inOrder(data); ok && !bytes.Equal(ordered, canonicalOf(data)) {
		t.Errorf("%q is put in order as %q, want %q", data, ordered, canonicalOf(data))
	} else if is && !ok {
		t.Errorf("%q cannot be put in order", data)
	}
	if is {
		if theirs, err := jcs.Transform(data); err != nil || !bytes.Equal(theirs, data) {
			t.Errorf("%q is written %q by the second: %v", data, theirs, err)
		}
	}
}

func TestIsCanonical(t *testing.T) {
	for _, text := range []string{
		``, ` `, `1`, `1 `, ` 1`, `01`, `-1`, `--1`, `+1`, `-0`, `0`, `0.0`, `-0.0`, `1.`, `.5`, `-.5`, `0.5`, `0.50`, `00.5`, `1.5.2`, `1e3`, `1E3`, `1000`, `1e21`, `1e+21`, `1e20`,
		`100000000000000000000`, `1000000000000000000000`, `0.000001`, `0.0000001`, `1e-7`, `1e-07`, `1.5e-7`, `-1e-7`, `0.0000015`, `123456789012345`, `1234567890123456`, `9007199254740993`, `9007199254740992`,
		`0.1`, `0.10000000000000001`, `0.30000000000000004`, `5e-324`, `1.7976931348623157e+308`, `1e999`, `1e400`, `-1e400`, `1e-400`, `123456789.123456`, `0.123456789012345`, `0.1234567890123456`, `1-2`, `1e`, `e1`, `NaN`, `Infinity`, `0x10`, `1_0`,
		`"a"`, `"é"`, `"\u00e9"`, `"\n"`, `"\u000a"`, `"\u000b"`, `"\u000B"`, `"\u001f"`, `"\u0020"`, `"\u007f"`, "\"\x7f\"", "\"\x01\"", `"\/"`, `"/"`, `"\\"`, `"\""`, `"\`, `"\u00`, `"\u001`, `"`, `"a`, `"\ud83d\udd29"`, `"🔩"`, `"\ud800"`, "\"\xff\"", "\"\xed\xa0\x80\"",
		"\"\u2028\"", `"\u2028"`, `"<&>"`, `"\u003c"`,
		`true`, `false`, `null`, `True`, `tru`, `nulll`, `[]`, `[ ]`, `[1,2]`, `[1, 2]`, `[1,]`, `[,1]`, `[1 2]`, `[`, `]`, `[[[]]]`,
		`{}`, `{"a":1}`, `{"a":1,"b":2}`, `{"b":1,"a":2}`, `{"a":1,"a":2}`, `{"a": 1}`, `{"a":1,}`, `{"a"}`, `{"a":}`, `{a:1}`, `{"":1,"a":2}`, `{"":1,"":2}`, `{"a":1,"aa":2}`, `{"aa":1,"a":2}`, `{"A":1,"a":2}`,
		// UTF-16 order is not that of UTF-8: U+1F529 is D83D DD29 there, before U+FB33.
		"{\"\U0001F529\":1,\"\uFB33\":2}", "{\"\uFB33\":1,\"\U0001F529\":2}", `{"a\n":1,"a!":2}`, `{"a!":1,"a\n":2}`, `{"a\\":1,"a]":2}`, `{"a\"":1,"a#":2}`, `{"é":1,"z":2}`, `{"z":1,"é":2}`,
		`{"a":{"b":[{"c":null}]}}`, `{}{}`, `1,2`,
	} {
		agrees(t, []byte(text))
	}
	if !IsCanonical([]byte(strings.Repeat("[", 900) + strings.Repeat("]", 900))) {
		t.Error("900 deep")
	}
	if IsCanonical([]byte(strings.Repeat("[", 1_000_000))) {
		t.Error("a million deep")
	}
}

func TestIsCanonicalOfRandomValues(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		value := rapid.MapOf(rapid.String(), rapid.OneOf(rapid.Float64().AsAny(), rapid.String().AsAny(), rapid.MapOf(rapid.String(), rapid.Int64().AsAny()).AsAny())).Draw(t, "value")
		data, err := Canonical(value)
		if err != nil {
			t.Fatal(err)
		}
		if !IsCanonical(data) {
			t.Errorf("%q is not canonical", data)
		}
		agrees(t, data)
		if len(data) > 2 {
			at := rapid.IntRange(0, len(data)-1).Draw(t, "at")
			data[at] = rapid.Byte().Draw(t, "byte")
			agrees(t, data)
		}
	})
}

// Numbers of every exponent, and all short decimals, against the second
// implementation.
func TestIsCanonicalOfNumbers(t *testing.T) {
	for bits := uint64(1); bits < 0x7ff0000000000000; bits += 0x0003_a5b7_c9d1_e3f5 {
		for _, f := range []float64{math.Float64frombits(bits), -math.Float64frombits(bits), math.Float64frombits(bits &^ (1<<44 - 1))} {
			if f == 0 {
				continue
			}
			text, err := jcs.NumberToJSON(f)
			if err != nil {
				t.Fatal(err)
			}
			agrees(t, []byte(text))
			if !IsCanonical([]byte(text)) {
				t.Fatalf("%s is not canonical", text)
			}
		}
	}
	for n := range 2000 {
		for places := range 12 {
			agrees(t, fmt.Appendf(nil, "%.*f", places, float64(n)/math.Pow10(places)))
		}
	}
}

// TestInOrder holds the quick way against the library's, on documents with their
// members in any order.
func TestInOrder(t *testing.T) {
	for _, text := range []string{
		`{"b":1,"a":2}`, `{"b":{"d":[{"z":1,"y":2},{}],"c":null},"a":"x"}`, `[{"b":1,"a":[]},{"a":1}]`, `{"a\n":1,"a!":2,"Z":3}`, "{\"\uFB33\":1,\"\U0001F529\":2,\"a\":3}", `{"c":1,"b":{},"a":[1,2,3]}`,
	} {
		if got, ok := inOrder([]byte(text)); !ok || !bytes.Equal(got, canonicalOf([]byte(text))) {
			t.Errorf("%s: %s, %t; want %s", text, got, ok, canonicalOf([]byte(text)))
		}
	}
	for _, text := range []string{`{"b":1,"a":2,"b":3}`, `{"a":1,"a":1}`, `{"b":1.0,"a":2}`, `{"b": 1,"a":2}`, `{"b":1,"a":2`, `{"b":1,}`, `[1,]`, `[,1]`, `{"b":1"a":2}`, `[1 2]`, ``} {
		if got, ok := inOrder([]byte(text)); ok {
			t.Errorf("%s was put in order as %s", text, got)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		names := rapid.SliceOfNDistinct(rapid.String(), 0, 8, rapid.ID).Draw(t, "names")
		var b bytes.Buffer
		b.WriteByte('{')
		for i, name := range names {
			if i > 0 {
				b.WriteByte(',')
			}
			quoted, err := Canonical(name)
			if err != nil {
				t.Fatal(err)
			}
			number := rapid.Float64().Draw(t, "value")
			if number == 0 {
				number = 0 // -0 is written as it is, which is not canonical
			}
			value, err := Encode(map[string]any{"v": number, "n": string(quoted)})
			if err != nil {
				t.Fatal(err)
			}
			b.Write(quoted)
			b.WriteByte(':')
			b.Write(value)
		}
		b.WriteByte('}')
		if got, ok := inOrder(b.Bytes()); !ok || !bytes.Equal(got, canonicalOf(b.Bytes())) {
			t.Errorf("%s: %s, %t; want %s", &b, got, ok, canonicalOf(b.Bytes()))
		}
	})
}

func FuzzIsCanonical(f *testing.F) {
	f.Add([]byte(`{"a":[1,-2.5e-7,"é\n\u001f",null,true],"b":{}}`))
	f.Add([]byte("{\"\U0001F529\":1,\"\uFB33\":0.1}"))
	f.Fuzz(func(t *testing.T, data []byte) { agrees(t, data) })
}

func BenchmarkIsCanonical(b *testing.B) {
	data, err := Canonical(map[string]any{"checks": slicesOf(60, map[string]any{
		"allowable": 97400.47250361, "compared": false, "demand": 86250, "level": "ultimate", "margin": 0.12930231884057963, "mark": "seen",
		"method": "elementary@1", "mode": "net-section", "source": "invented for this benchmark", "row": nil,
	})})
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(data)))
	for b.Loop() {
		if !IsCanonical(data) {
			b.Fatal("is not canonical")
		}
	}
}

func slicesOf(n int, value any) []any {
	all := make([]any, n)
	for i := range all {
		all[i] = value
	}
	return all
}

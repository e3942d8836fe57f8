package strictjson_test

import (
	"errors"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/gowebpki/jcs"
	"pgregory.net/rapid"

	"jointledger/service/strictjson"
)

type units string

func (units) Words() []string { return []string{"SI", "US"} }

type part struct {
	Width float64 `json:"width"`
}

type document struct {
	Units    units                                `json:"units"`
	Size     float64                              `json:"size"`
	Count    int                                  `json:"count,omitzero"`
	Parts    []part                               `json:"parts,omitzero"`
	Point    [2]float64                           `json:"point,omitzero"`
	Material strictjson.Either[string, part]      `json:"material,omitzero"`
	Between  *string                              `json:"between"`
	Free     strictjson.Raw                       `json:"free,omitzero"`
	Options  map[string]map[string]strictjson.Raw `json:"options,omitzero"`
}

func TestDecodeRefuses(t *testing.T) {
	const rest = `"units":"SI","size":1,"between":null`
	for name, c := range map[string]struct{ text, pointer string }{
		"nothing":            {``, ""},
		"half":               {`{"units":"SI"`, ""},
		"trailing text":      {`{` + rest + `} x`, ""},
		"second document":    {`{` + rest + `}{}`, ""},
		"unknown member":     {`{` + rest + `,"siez":1}`, "/siez"},
		"wrong case":         {`{` + rest + `,"Count":1}`, "/Count"},
		"duplicate member":   {`{` + rest + `,"size":2}`, "/size"},
		"missing member":     {`{"units":"SI","between":null}`, "/size"},
		"missing in a list":  {`{` + rest + `,"parts":[{"width":1},{}]}`, "/parts/1/width"},
		"null":               {`{"units":"SI","size":null,"between":null}`, "/size"},
		"null optional":      {`{` + rest + `,"parts":null}`, "/parts"},
		"null option":        {`{` + rest + `,"options":{"a":{"b":null}}}`, "/options/a/b"},
		"word":               {`{"units":"si","size":1,"between":null}`, "/units"},
		"beyond float64":     {`{"units":"SI","size":1e999,"between":null}`, "/size"},
		"not a number":       {`{"units":"SI","size":NaN,"between":null}`, ""},
		"string for number":  {`{"units":"SI","size":"1","between":null}`, "/size"},
		"fraction for count": {`{` + rest + `,"count":1.5}`, "/count"},
		"short array":        {`{` + rest + `,"point":[1]}`, "/point"},
		"long array":         {`{` + rest + `,"point":[1,2,3]}`, "/point"},
		"object inside":      {`{` + rest + `,"material":{"width":1,"high":2}}`, "/material/high"},
		"number for either":  {`{` + rest + `,"material":1}`, "/material"},
		"invalid UTF-8":      {"{" + rest + ",\"free\":\"\xff\"}", "/free"},
		"deep":               {`{` + rest + `,"free":` + strings.Repeat("[", 32) + strings.Repeat("]", 32) + `}`, "/free" + strings.Repeat("/0", 31)},
	} {
		t.Run(name, func(t *testing.T) {
			var d document
			err := strictjson.Decode([]byte(c.text), &d)
			var e *strictjson.Error
			if !errors.As(err, &e) {
				t.Fatalf("took %s: %v", c.text, err)
			}
			if c.pointer != "" && e.Pointer != c.pointer {
				t.Errorf("points at %q (%s), want %q", e.Pointer, e.Detail, c.pointer)
			}
		})
	}
}

func TestDecodeTakes(t *testing.T) {
	between := "D/t"
	for text, want := range map[string]document{
		`{"units":"SI","size":0,"between":null}`: {Units: "SI"},
		` {"units":"US","size":-1.5e3,"between":"D/t","material":"x","free":{"a":[null]},"point":[1,2]} `: {
			Units: "US", Size: -1500, Between: &between, Material: strictjson.Either[string, part]{Plain: "x"},
			Free: strictjson.Raw(`{"a":[null]}`), Point: [2]float64{1, 2},
		},
		`{"units":"US","size":1,"between":null,"material":{"width":2}}`: {
			Units: "US", Size: 1, Material: strictjson.Either[string, part]{Object: &part{2}},
		},
	} {
		var d document
		if err := strictjson.Decode([]byte(text), &d); err != nil {
			t.Errorf("%s: %v", text, err)
		}
		if diff := cmp.Diff(want, d); diff != "" {
			t.Errorf("%s: %s", text, diff)
		}
	}
}

func TestEncodeHasNoNullLists(t *testing.T) {
	text, err := strictjson.Encode(struct {
		List []int    `json:"list"`
		None *float64 `json:"none"`
	}{})
	if want := `{"list":[],"none":null}`; err != nil || string(text) != want {
		t.Errorf("got %s, %v; want %s", text, err, want)
	}
}

// The independent writer of RFC 8785 is github.com/gowebpki/jcs.
func TestCanonicalAgreesWithAnotherWriter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		value := rapid.MapOf(rapid.String(), rapid.OneOf(
			rapid.Float64().AsAny(), rapid.String().AsAny(), rapid.Bool().AsAny(),
			rapid.SliceOf(rapid.Float64()).AsAny(), rapid.MapOf(rapid.String(), rapid.Int16()).AsAny(),
		)).Draw(t, "value")
		plain, err := strictjson.Encode(value)
		if err != nil {
			t.Fatal(err)
		}
		want, err := jcs.Transform(plain)
		if err != nil {
			t.Fatal(err)
		}
		got, err := strictjson.Canonical(value)
		if err != nil || string(got) != string(want) {
			t.Fatalf("got %s, %v; want %s", got, err, want)
		}
		if !strictjson.IsCanonical(got) {
			t.Fatalf("%s is not taken as canonical", got)
		}
	})
}

func TestCompose(t *testing.T) {
	type inner struct {
		B string  `json:"b"`
		A float64 `json:"a"`
	}
	whole := struct {
		Part   inner          `json:"part"`
		Input  strictjson.Raw `json:"input"`
		InputD string         `json:"input_digest"`
		Empty  []int          `json:"empty"`
	}{inner{"é\n", 1e21}, strictjson.Raw(`{"x":[1,2]}`), "sha256:00", nil}
	want, err := strictjson.Canonical(whole)
	if err != nil {
		t.Fatal(err)
	}
	got, err := strictjson.Compose(map[string]any{"part": whole.Part, "input": whole.Input, "input_digest": whole.InputD, "empty": whole.Empty})
	if err != nil || string(got) != string(want) {
		t.Errorf("%s, %v; want %s", got, err, want)
	}
	if got, err := strictjson.Compose(nil); err != nil || string(got) != "{}" {
		t.Errorf("%s, %v", got, err)
	}
	if _, err := strictjson.Compose(map[string]any{"f": func() {}}); err == nil {
		t.Error("what is no JSON was written")
	}
}

func TestMembers(t *testing.T) {
	const document = `{"a": {"b": 1, "a": 2}, "b": "a", "c": ["a", "b", {"b": ["a", {"a": 3}], "d": {"a": null}}], "e": {"\u0061": true}}`
	var got []string
	if err := strictjson.Members([]byte(document), func(name string, value strictjson.Raw) {
		got = append(got, name+" "+string(value))
	}, "a", "b"); err != nil {
		t.Fatal(err)
	}
	want := []string{`a {"b": 1, "a": 2}`, `b "a"`, `b ["a", {"a": 3}]`, `a null`, `a true`}
	if !slices.Equal(got, want) {
		t.Errorf("found %q, want %q", got, want)
	}
	for _, broken := range []string{`{"a": `, `{"b": {"a": 1]}`, `[1, `} {
		if err := strictjson.Members([]byte(broken), func(string, strictjson.Raw) {}, "a"); err == nil {
			t.Errorf("%s was read to its end", broken)
		}
	}
}

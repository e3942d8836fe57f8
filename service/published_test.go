package service_test

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"jointledger/service"
)

// published calls do with the kind and the input of every published case.
func published(t *testing.T, do func(t *testing.T, kind service.Kind, input json.RawMessage)) {
	t.Helper()
	kinds := map[string]service.Kind{
		"lug": service.Lug, "fastener": service.FastenerGroup, "splice": service.Splice, "compliance": service.Splice,
	}
	files, err := filepath.Glob("../testdata/published/*.json")
	if err != nil || len(files) == 0 {
		t.Fatal("no published cases: ", err)
	}
	for _, path := range files {
		prefix, _, _ := strings.Cut(filepath.Base(path), "-")
		kind, ok := kinds[prefix]
		if !ok {
			t.Fatalf("%s is of no kind of joint", path)
		}
		text, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		type one struct {
			Title string          `json:"title"`
			Input json.RawMessage `json:"input"`
		}
		var file struct {
			one
			Cases []one `json:"cases"`
		}
		if err := json.Unmarshal(text, &file); err != nil {
			t.Fatalf("%s: %v", path, err)
		}
		if file.Cases == nil {
			file.Cases = []one{file.one}
		}
		for _, c := range file.Cases {
			t.Run(filepath.Base(path)+"/"+c.Title, func(t *testing.T) { do(t, kind, c.Input) })
		}
	}
}

// The packages of the calculations hold the published cases to their expected
// values; here their inputs, which are requests, pass the whole service.
func TestPublishedInputsAreAnswered(t *testing.T) {
	published(t, func(t *testing.T, kind service.Kind, input json.RawMessage) {
		r, err := service.Calculate(kind, input, service.View{})
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range r.Checks {
			if (c.Margin == nil) != (c.Status == "undetermined") || (c.Message == nil) == (c.Status == "undetermined") {
				t.Errorf("%s %s is %s with margin %v and message %v", c.Member, c.Mode, c.Status, c.Margin, c.Message)
			}
			if c.Margin != nil && math.Abs(*c.Allowable / *c.Demand - 1 - *c.Margin) > 1e-12*(1+math.Abs(*c.Margin)) {
				t.Errorf("%s %s: %v / %v - 1 is not %v", c.Member, c.Mode, *c.Allowable, *c.Demand, *c.Margin)
			}
		}
	})
}

// The record of a result keeps the resolved input; calculating that again must
// give the very same answer.
func TestResolvedInputIsARequestForTheSameAnswer(t *testing.T) {
	published(t, func(t *testing.T, kind service.Kind, input json.RawMessage) {
		service.CheckRoundTrip(t, kind, input)
	})
}

package service

import (
	"bytes"
	"encoding/json"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"

	"jointledger/fastener"
	"jointledger/lug"
	"jointledger/service/strictjson"
)

// freeze adds golden files for methods that have none. It never changes one.
var freeze = flag.Bool("freeze", false, "freeze a golden file for each method that has none")

const (
	goldenFolder = "../testdata/golden"
	// goldenInputs are joints to freeze for methods that no published case
	// uses.
	goldenInputs = "inputs.json"
)

// golden is a frozen calculation: the kind, the resolved input and the result,
// as a record keeps them.
type golden struct {
	Kind   Kind           `json:"kind"`
	Input  strictjson.Raw `json:"input"`
	Result strictjson.Raw `json:"result"`
}

// methods are those that the result rests on, alone and with each mode and
// level, and the compliance formulas that the input names.
func (g *golden) methods(t *testing.T) []string {
	t.Helper()
	var result struct {
		Checks []struct {
			Method string `json:"method"`
			Mode   string `json:"mode"`
			Level  string `json:"level"`
		} `json:"checks"`
	}
	if err := strictjson.DecodeLoosely(g.Result, &result); err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, c := range result.Checks {
		names = append(names, c.Method, c.Method+" "+c.Mode+" "+c.Level)
	}
	for _, f := range fastener.ComplianceFormulas() {
		if bytes.Contains(g.Input, []byte(`"`+f.Name()+`"`)) {
			names = append(names, f.Name())
		}
	}
	return names
}

// Every frozen calculation gives the same numbers, bit for bit on the machine
// type that froze it and within 1e-9 elsewhere.
func TestGolden(t *testing.T) {
	files, err := filepath.Glob(goldenFolder + "/*.json")
	if err != nil {
		t.Fatal(err)
	}
	files = slices.DeleteFunc(files, func(path string) bool { return filepath.Base(path) == goldenInputs })
	covered := map[string]bool{}
	for _, path := range files {
		text, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		var g golden
		if err := strictjson.Decode(text, &g); err != nil {
			t.Fatalf("%s: %v", path, err)
		}
		for _, m := range g.methods(t) {
			covered[m] = true
		}
		t.Run(filepath.Base(path), func(t *testing.T) {
			c, err := calculate(g.Kind, g.Input, View{}, noRegistry{})
			if err != nil {
				t.Fatalf("a recorded input is refused now: %v", err)
			}
			if !bytes.Equal(c.input, g.Input) {
				t.Errorf("the recorded input resolves to something else:\n%s\n%s", g.Input, c.input)
			}
			result, err := strictjson.Canonical(&c.result)
			if err != nil {
				t.Fatal(err)
			}
			d, err := compareResults(g.Result, result)
			if err != nil {
				t.Fatal(err)
			}
			if runtime.GOARCH == "amd64" && d.relative != 0 || !d.reproduced() {
				t.Errorf("the numbers of a frozen record changed (%s): what a method gives is fixed once it is released. "+
					"Put the old numbers back and give the method a new revision beside the old one.", d)
			}
		})
	}
	if *freeze {
		freezeMissing(t, covered)
	}
	for _, name := range releasedMethods() {
		if !covered[name] {
			t.Errorf("no golden file covers %s: go test ./service -run TestGolden -freeze", name)
		}
	}
}

// releasedMethods are those that records can rest on.
func releasedMethods() []string {
	var names []string
	for _, m := range lug.Methods() {
		names = append(names, m.Name())
	}
	for _, m := range fastener.Methods() {
		if m.Kind != "pattern" && m.Kind != "splice" {
			names = append(names, m.Name())
		}
	}
	for _, f := range fastener.ComplianceFormulas() {
		names = append(names, f.Name())
	}
	return names
}

// goldenCase is a joint to freeze; that of a published case has its kind in
// the name of its file.
type goldenCase struct {
	Kind  Kind
	Input json.RawMessage
}

// freezeMissing freezes the published cases that add a method or a kind of
// mode to what is covered.
func freezeMissing(t *testing.T, covered map[string]bool) {
	t.Helper()
	kinds := map[string]Kind{"lug": Lug, "fastener": FastenerGroup, "splice": Splice, "compliance": Splice}
	files, err := filepath.Glob("../testdata/published/*.json")
	if err != nil {
		t.Fatal(err)
	}
	for _, path := range append(files, filepath.Join(goldenFolder, goldenInputs)) {
		base := strings.TrimSuffix(filepath.Base(path), ".json")
		prefix, _, _ := strings.Cut(base, "-")
		text, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		var file struct {
			Input json.RawMessage
			Cases []goldenCase
		}
		if err := json.Unmarshal(text, &file); err != nil {
			t.Fatal(err)
		}
		if file.Cases == nil {
			file.Cases = append(file.Cases, goldenCase{Input: file.Input})
		}
		for i, one := range file.Cases {
			if one.Kind == "" {
				one.Kind = kinds[prefix]
			}
			c, err := calculate(one.Kind, one.Input, View{}, noRegistry{})
			if err != nil {
				t.Fatalf("%s: %v", path, err)
			}
			result, err := strictjson.Canonical(&c.result)
			if err != nil {
				t.Fatal(err)
			}
			g := golden{one.Kind, c.input, result}
			names := g.methods(t)
			if !slices.ContainsFunc(names, func(m string) bool { return !covered[m] }) {
				continue
			}
			canonical, err := strictjson.Canonical(g)
			if err != nil {
				t.Fatal(err)
			}
			name := filepath.Join(goldenFolder, fmt.Sprintf("%s-%d.json", base, i+1))
			f, err := os.OpenFile(name, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o644)
			if err != nil {
				t.Fatal(err)
			}
			if _, err := f.Write(canonical); err != nil {
				t.Fatal(err)
			}
			if err := f.Close(); err != nil {
				t.Fatal(err)
			}
			for _, m := range names {
				covered[m] = true
			}
		}
	}
}

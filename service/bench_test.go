package service_test

import (
	"encoding/json"
	"os"
	"strconv"
	"testing"

	"jointledger/service"
	"jointledger/store/storetest"
)

// hingeLug is the first example of the README.
const hingeLug = `{
  "units": "US", "title": "boom hinge, upper lug", "methods": ["elementary"],
  "lug": {"shape": "round", "width": 2, "thickness": 0.5, "hole_diameter": 0.75, "edge_distance": 1.125,
          "material": "7050-T7451-plate-0.250-1.500-L"},
  "factors": {"ultimate": 1.5, "fitting": 1.15},
  "load_cases": [{"id": "LC1", "level": "limit", "force": 18000, "angle": 0}]}`

func BenchmarkCalculateLug(b *testing.B) {
	for b.Loop() {
		if _, err := service.Calculate(service.Lug, []byte(hingeLug), service.View{}); err != nil {
			b.Fatal(err)
		}
	}
}

// envelope is the clevis joint with bushings at 37 degrees in n load cases,
// their forces and angles all different.
func envelope(b *testing.B, n int, change func(map[string]any)) []byte {
	b.Helper()
	text, err := os.ReadFile("../testdata/published/lug-affdl-derived-37.json")
	if err != nil {
		b.Fatal(err)
	}
	var published struct{ Input map[string]any }
	if err := json.Unmarshal(text, &published); err != nil {
		b.Fatal(err)
	}
	cases := make([]map[string]any, n)
	for i := range cases {
		cases[i] = map[string]any{"id": "LC" + strconv.Itoa(i), "level": "limit", "force": 10000 + i%30000, "angle": float64(i%3600) / 10}
	}
	published.Input["load_cases"] = cases
	if change != nil {
		change(published.Input)
	}
	body, err := json.Marshal(published.Input)
	if err != nil {
		b.Fatal(err)
	}
	return body
}

// BenchmarkLugSizing sizes the thickness of the same joint.
func BenchmarkLugSizing(b *testing.B) {
	s := open(b, storetest.SQLite(b), storetest.Signer(b))
	for _, cases := range []int{1, 1_000, 100_000} {
		b.Run(strconv.Itoa(cases), func(b *testing.B) {
			body := append([]byte(`{"free": "thickness", "bounds": [5, 60], "increment": 0.5, "input": `), envelope(b, cases, nil)...)
			body = append(body, '}')
			b.ReportAllocs()
			for b.Loop() {
				answer, err := s.SizeLug(b.Context(), body, service.View{NoWorkings: true})
				if err != nil || answer.Reason != nil {
					b.Fatal(err, answer)
				}
			}
		})
	}
}

// BenchmarkLugEnvelope answers whole requests, from bytes to the governing
// checks.
func BenchmarkLugEnvelope(b *testing.B) {
	tolerance := func(lengths ...string) func(map[string]any) {
		return func(input map[string]any) {
			head := input["lug"].(map[string]any)
			for _, name := range lengths {
				head[name] = map[string]any{"nominal": head[name], "minus": 0.1, "plus": 0.1}
			}
		}
	}
	for _, k := range []struct {
		name   string
		cases  int
		change func(map[string]any)
	}{
		{"1000", 1_000, nil},
		{"100000", 100_000, nil},
		{"1000 with 3 tolerances", 1_000, tolerance("width", "thickness", "hole_diameter")},
		{"100000 by 5 methods", 100_000, func(input map[string]any) {
			input["compare"] = []any{"elementary", "asme-bth-1", "aisc-360-d5", "en-1993-1-8"}
		}},
	} {
		b.Run(k.name, func(b *testing.B) {
			body := envelope(b, k.cases, k.change)
			b.ReportAllocs()
			for b.Loop() {
				if _, err := service.Calculate(service.Lug, body, service.View{NoWorkings: true}); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*k.cases), "ns/case")
		})
	}
}

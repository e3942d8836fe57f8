package service_test

import (
	"testing"

	"jointledger/service"
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

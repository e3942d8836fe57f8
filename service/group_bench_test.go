package service_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"jointledger/service"
)

// largePattern is a request of a square pattern of n x n bolts with a plate.
func largePattern(n, cases int) []byte {
	var b strings.Builder
	b.WriteString(`{"units": "SI", "title": "SM-900 bulkhead", "stiffness": "area", "interaction": "2-2", "rules": ["common-practice"], "fasteners": [`)
	for i := range n * n {
		fmt.Fprintf(&b, `%s{"id": "%d", "x": %d, "y": %d, "diameter": 6, "type": "m6-10.9"}`, comma(i), i, 24*(i%n), 24*(i/n))
	}
	side := 24*(n-1) + 15
	fmt.Fprintf(&b, `], "plates": [{"id": "bulkhead", "thickness": 5, "material": "7050-T7451-plate-0.250-1.500-L", "outline": [[-15, -15], [%d, -15], [%d, %d], [-15, %d]]}],
		"factors": {"ultimate": 1.5, "fitting": 1.15}, "load_cases": [`, side, side, side, side)
	for i := range cases {
		sin, cos := math.Sincos(float64(i))
		fmt.Fprintf(&b, `%s{"id": "%d", "level": "limit", "point": [%g, 400, 50], "force": [%g, %g, 9000], "moment": [0, 0, 1e6]}`, comma(i), i, 300+cos, 1e5*cos, 1e5*sin)
	}
	b.WriteString("]}")
	return []byte(b.String())
}

func comma(i int) string {
	if i == 0 {
		return ""
	}
	return ","
}

// BenchmarkCalculateLargePattern answers a request of 1,024 bolts in 1,000 load
// cases, from its bytes to the shares of the cases that govern.
func BenchmarkCalculateLargePattern(b *testing.B) {
	body := largePattern(32, 1000)
	b.SetBytes(int64(len(body)))
	for b.Loop() {
		r, err := service.Calculate(service.FastenerGroup, body, service.View{NoWorkings: true})
		if err != nil {
			b.Fatal(err)
		}
		if len(r.Margins) != 1000 || len(r.Shares) == 0 {
			b.Fatalf("%d margins, %d shares", len(r.Margins), len(r.Shares))
		}
	}
}

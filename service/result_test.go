package service_test

import (
	"fmt"
	"strings"
	"testing"

	"jointledger/service"
	"jointledger/service/strictjson"
)

// longSplice is a request of two straps and a number of rows.
func longSplice(rows int) []byte {
	list := func(n int, one string) string { return strings.TrimSuffix(strings.Repeat(one+",", n), ",") }
	bays := list(rows-1, `{"thickness": 2, "width": 30}`)
	return fmt.Appendf(nil, `{"units": "SI", "compliance": "given", "members": [{"id": "cap", "e": 72000, "bays": [%s]}, {"id": "strap", "e": 72000, "bays": [%s]}],
  "pitches": [%s], "rows": [%s], "factors": {"ultimate": 1.5, "fitting": 1.15},
  "load_cases": [{"id": "LC1", "level": "limit", "ends": [{"member": "cap", "left": 1000, "right": 0}, {"member": "strap", "left": 0, "right": 1000}]}]}`,
		bays, bays, list(rows-1, "25"), list(rows, `{"diameter": 5, "compliance": 1e-5, "type": {"name": "SM rivet", "shear_strength": 4000}}`))
}

// Every step stands once, in short answers and in long ones.
func TestStepsStandOnce(t *testing.T) {
	for _, c := range []struct {
		kind        service.Kind
		body        []byte
		least, most int
	}{
		{service.Lug, []byte(hingeLug), 20, 96},
		{service.FastenerGroup, largePattern(6, 1), 200, 100_000},
		{service.Splice, longSplice(2), 20, 96},
		{service.Splice, longSplice(100), 500, 100_000},
	} {
		r, err := service.Calculate(c.kind, c.body, service.View{})
		if err != nil {
			t.Fatal(err)
		}
		if n := len(r.Workings); n < c.least || n > c.most {
			t.Errorf("%s: %d steps, want %d to %d", c.kind, n, c.least, c.most)
		}
		seen := map[string]bool{}
		for _, w := range r.Workings {
			text, err := strictjson.Encode(w)
			if err != nil {
				t.Fatal(err)
			}
			if seen[string(text)] {
				t.Errorf("%s: twice: %s", c.kind, text)
			}
			seen[string(text)] = true
		}
	}
}

// BenchmarkCalculateLongSplice answers with all steps, whose number grows with
// the rows.
func BenchmarkCalculateLongSplice(b *testing.B) {
	for _, rows := range []int{100, 1000, 10_000} {
		b.Run(fmt.Sprint(rows), func(b *testing.B) {
			body := longSplice(rows)
			for b.Loop() {
				if _, err := service.Calculate(service.Splice, body, service.View{Checks: "governing"}); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*rows), "ns/row")
		})
	}
}

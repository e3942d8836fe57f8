package fastener

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// The factor to the curve brings the point onto it, and to no other place.
func TestInteractionReachesItsCurve(t *testing.T) {
	exponents := map[string][2]float64{"2-2": {2, 2}, "3-2": {3, 2}, "nasa-5020-body": {2.5, 1.5}, "nasa-5020-thread": {1.2, 2}}
	rapid.Check(t, func(t *rapid.T) {
		word := rapid.SampledFrom(InteractionWords()).Draw(t, "curve")
		s := math.Pow(10, rapid.Float64Range(-6, 6).Draw(t, "log s"))
		r := math.Pow(10, rapid.Float64Range(-6, 6).Draw(t, "log t"))
		reach := interactions[word].reach(s, r)
		value := (reach * s) + (reach*r)/1.4
		if e, ok := exponents[word]; ok {
			value = math.Pow(reach*s, e[0]) + math.Pow(reach*r, e[1])
		} else {
			value = max(value, reach*r)
		}
		if math.Abs(value-1) > 1e-14 {
			t.Fatalf("%s at %g, %g: factor %g stands at %.17g", word, s, r, reach, value)
		}
	})
}

package fastener

import (
	"math"

	"jointledger/strength"
)

// interaction is a curve of shear and tension together, R_s^p + R_t^q = 1 or
// another.
type interaction struct {
	method, equation, source, reachEquation string
	mark                                    strength.Mark
	// value is 1 on the curve; reach is the factor on both ratios, not both
	// zero, that brings it there.
	value, reach func(s, t float64) float64
}

const (
	sourceInteract32   = "ANC-5, Bruhn chapter D1: R_s³ + R_t² = 1"
	sourceInteractBody = "NASA-STD-5020, shear and tension with the body in the shear plane: R_s^2.5 + R_t^1.5 = 1"
	sourceInteractThre = "NASA-STD-5020, shear and tension with threads in the shear plane: R_s^1.2 + R_t^2 = 1"
	sourceInteractEN   = "EN 1993-1-8 table 3.4: R_s + R_t/1.4 <= 1 and R_t <= 1"
)

// interactions by the word of the request.
var interactions = map[string]interaction{
	"2-2": {
		method: methodInteract22, equation: "R_s² + R_t²", source: sourceInteract22,
		reachEquation: "1 / sqrt(R)", mark: strength.FromMemory(95),
		value: func(s, t float64) float64 { return float64(s*s) + float64(t*t) },
		reach: func(s, t float64) float64 { return 1 / math.Sqrt(float64(s*s)+float64(t*t)) },
	},
	"3-2": power("interaction-3-2@1", sourceInteract32, "R_s³ + R_t²", "solved for λ: (λ R_s)³ + (λ R_t)² = 1",
		strength.FromMemory(95), 3, 2),
	"nasa-5020-body": power("interaction-nasa-5020-body@1", sourceInteractBody, "R_s^2.5 + R_t^1.5", "solved for λ: (λ R_s)^2.5 + (λ R_t)^1.5 = 1",
		strength.FromMemory(95), 2.5, 1.5),
	"nasa-5020-thread": power("interaction-nasa-5020-thread@1", sourceInteractThre, "R_s^1.2 + R_t^2", "solved for λ: (λ R_s)^1.2 + (λ R_t)^2 = 1",
		strength.FromMemory(95), 1.2, 2),
	"en-1993-1-8": {
		method: "interaction-en-1993-1-8@1", equation: "max(R_s + R_t/1.4, R_t)", source: sourceInteractEN,
		reachEquation: "1 / R", mark: strength.Seen,
		value: func(s, t float64) float64 { return max(s+t/1.4, t) },
		reach: func(s, t float64) float64 { return 1 / max(s+t/1.4, t) },
	},
}

// InteractionWords returns the words of a pattern's interaction, in the order
// of answers.
func InteractionWords() []string {
	return []string{"2-2", "3-2", "nasa-5020-body", "nasa-5020-thread", "en-1993-1-8"}
}

// power is the curve R_s^p + R_t^q = 1, p and q at least 1.
func power(method, source, equation, reachEquation string, mark strength.Mark, p, q float64) interaction {
	return interaction{
		method: method, equation: equation, source: source, reachEquation: reachEquation, mark: mark,
		value: func(s, t float64) float64 { return math.Pow(s, p) + math.Pow(t, q) },
		reach: func(s, t float64) float64 { return powerReach(s, t, p, q) },
	}
}

// powerReach solves (λ s)^p + (λ t)^q = 1 for λ by Newton's method. The left
// side is convex and rises, and at the least of 1/s and 1/t it is at least 1, so
// the iteration falls to the root from there.
func powerReach(s, t, p, q float64) float64 {
	reach := min(1/s, 1/t)
	if math.IsInf(reach, 0) {
		return reach
	}
	for range 64 {
		a, b := math.Pow(reach*s, p), math.Pow(reach*t, q)
		step := reach * (a + b - 1) / (float64(p*a) + float64(q*b))
		reach -= float64(step)
		if math.Abs(step) <= 1e-16*reach {
			break
		}
	}
	return reach
}

package lug

import (
	"maps"
	"math"
	"slices"
	"strconv"
)

// The built-in curve set derived-1 stands in for the charts of AFFDL-TR-69-42,
// chapter 9. It is not read from them: every factor is derived or computed for
// this project, and every answer that uses it says so.

// derivedK is K of figure 9-2 for e/D from 0.6.
//
// Two shear planes 40° from the axis: K a/D = 2 · 0.617 [sqrt((e/D)² - sin²40°/4)
// - cos40°/2], with 0.617 the ratio of shear to tension strength at which the
// manual's example (1.02 and 1.33) is met within 0.5 %; above e/D 1.5 flat.
// Own plane-stress analyses: safe at e/D 0.75 to 1.0, up to 5 % high at 1.25,
// above that only with the handbook's cap.
func derivedK(edgeRatio, _ float64) float64 {
	if edgeRatio >= fullEdge {
		return derivedKFlat
	}
	return 2 * 0.617 * (math.Sqrt(float64(edgeRatio*edgeRatio)-0.10330) - 0.38302) / (edgeRatio - 0.5)
}

const (
	derivedKFlat   = 1.335
	derivedKSlopes = "2 * 0.617 (sqrt((e/D)^2 - 0.10330) - 0.38302) / (a/D)"
)

// derivedKtru is Ktru of figure 9-8 for hav/D from 0.33 to 1.1 and r = Ftyx/Ftux
// from 0.65 to 1: the lesser of a shear and a bending limit, own limit and
// strain-limited plane-stress analyses.
func derivedKtru(depthRatio, r float64) float64 {
	return min(min(0.90, 0.45+float64(0.52*r))*depthRatio, 0.85)
}

// derivedKtry is Ktry of figure 9-8 in the same range.
func derivedKtry(depthRatio, _ float64) float64 { return min(depthRatio, 1.0) }

// Ranges of the built-in factors, besides those of their points.
const (
	derivedThick   = 5.0  // K: D/t at most
	derivedWide    = 1.3  // K: W/D at least
	derivedShear   = 0.54 // K: Fsu/Ftu at least
	derivedDepth   = 0.33 // Ktru, Ktry: hav/D at least
	derivedDeepest = 1.1  // and at most
)

// derivedNet is Kn: the strain over the net section keeps its elastic shape and
// peaks at the ultimate strain; with a bilinear stress-strain curve (E to Fty,
// then straight to Ftu at εu) Kn is the mean stress over Ftu. Computed for
// round concentric lugs; within -5 and +2 % of two remembered readings.
// Rows are r = Fty/Ftu and q = Ftu/(E εu); columns D/W.
var derivedNet = []struct {
	r, q float64
	kn   [7]float64
}{
	{1.0, 0.1, [7]float64{.926, .960, .985, .995, 1.000, 1.000, 1.000}},
	{1.0, 0.2, [7]float64{.685, .771, .860, .905, .954, .990, 1.000}},
	{1.0, 0.4, [7]float64{.419, .495, .599, .671, .763, .847, .903}},
	{1.0, 0.6, [7]float64{.298, .356, .440, .503, .591, .680, .743}},
	{1.0, 0.8, [7]float64{.229, .274, .341, .391, .465, .540, .595}},
	{1.0, 1.0, [7]float64{.184, .220, .275, .315, .374, .435, .477}},
	{0.9, 0.1, [7]float64{.864, .891, .914, .925, .931, .938, .943}},
	{0.9, 0.2, [7]float64{.662, .738, .814, .853, .896, .928, .936}},
	{0.9, 0.4, [7]float64{.413, .486, .585, .651, .736, .811, .861}},
	{0.8, 0.05, [7]float64{.830, .838, .849, .857, .870, .882, .891}},
	{0.8, 0.1, [7]float64{.797, .819, .841, .851, .864, .877, .886}},
	{0.8, 0.2, [7]float64{.635, .700, .764, .798, .837, .865, .876}},
	{0.8, 0.4, [7]float64{.406, .475, .568, .629, .705, .773, .817}},
	{0.7, 0.05, [7]float64{.746, .758, .774, .787, .806, .824, .837}},
	{0.7, 0.1, [7]float64{.725, .745, .766, .779, .798, .818, .831}},
	{0.7, 0.2, [7]float64{.602, .656, .710, .740, .777, .803, .818}},
	{0.6, 0.05, [7]float64{.663, .679, .701, .718, .742, .767, .784}},
	{0.6, 0.1, [7]float64{.649, .668, .691, .709, .734, .759, .778}},
	{0.6, 0.2, [7]float64{.562, .606, .652, .680, .715, .743, .762}},
	{0.6, 0.4, [7]float64{.386, .447, .524, .572, .633, .688, .723}},
}

var derivedNetAt = [7]float64{0.20, 0.25, 0.333, 0.40, 0.50, 0.60, 0.667}

var derived1 = makeDerived1()

// BuiltInCurveSets returns the curve sets that need no registration.
func BuiltInCurveSets() []CurveSet { return []CurveSet{*derived1} }

// builtInBy finds the built-in set that a set is by its id.
func builtInBy(id string) *CurveSet {
	if id == derived1.ID {
		return derived1
	}
	return nil
}

// equal reports whether two sets say the same.
func (c *CurveSet) equal(d *CurveSet) bool {
	return c.Name() == d.Name() && c.Method == d.Method && maps.EqualFunc(c.Charts, d.Charts, func(a, b Chart) bool {
		return a.Along == b.Along && a.Between == b.Between && slices.EqualFunc(a.Curves, b.Curves, func(a, b Curve) bool {
			return a.At == b.At && slices.Equal(a.Points, b.Points)
		})
	})
}

func makeDerived1() *CurveSet {
	set := &CurveSet{
		ID: "derived-1", Version: "1", Method: "affdl-tr-69-42",
		Document:  "derived for this project; not the printed charts of AFFDL-TR-69-42, chapter 9",
		Reader:    "computed, not read",
		Tolerance: 0.05,
		builtIn:   true,
		Charts: map[string]Chart{
			"K":    {Figure: "in place of figure 9-2", Along: "e/D", Between: "D/t", Curves: []Curve{sampled(derivedThick, derivedK, 0.6, 10, 0.7, 0.8, 0.9, 1.0, 1.1, 1.2, 1.3, 1.4, 1.5)}, formula: derivedK},
			"Ktru": {Figure: "in place of figure 9-8", Along: "hav/D", Between: "r", formula: derivedKtru},
			"Ktry": {Figure: "in place of figure 9-8", Along: "hav/D", Curves: []Curve{sampled(0, derivedKtry, derivedDepth, derivedDeepest, 1.0)}, formula: derivedKtry},
		},
	}
	ktru := set.Charts["Ktru"]
	for _, r := range []float64{0.65, 0.75, 0.85, 1.0} {
		ktru.Curves = append(ktru.Curves, sampled(r, derivedKtru, derivedDepth, derivedDeepest, 0.6, 0.8, 0.9, 1.0))
	}
	set.Charts["Ktru"] = ktru
	for _, row := range derivedNet {
		name := netFamily + strconv.FormatFloat(row.r, 'g', -1, 64)
		chart := set.Charts[name]
		chart.Figure, chart.Along, chart.Between = "in place of figure 9-4, Fty/Ftu "+strconv.FormatFloat(row.r, 'g', -1, 64), "D/W", "q"
		curve := Curve{At: row.q}
		for i, kn := range row.kn {
			curve.Points = append(curve.Points, [2]float64{derivedNetAt[i], kn})
		}
		chart.Curves = append(chart.Curves, curve)
		set.Charts[name] = chart
	}
	set.net = set.netFamily()
	return set
}

// sampled shows a formula as a curve from least to most, with points between.
func sampled(at float64, formula func(x, at float64) float64, least, most float64, between ...float64) Curve {
	c := Curve{At: at, Points: [][2]float64{{least, formula(least, at)}}}
	for _, x := range append(between, most) {
		c.Points = append(c.Points, [2]float64{x, formula(x, at)})
	}
	return c
}

package lug

import (
	"cmp"
	"maps"
	"slices"
	"strconv"
	"strings"

	"jointledger/strength"
)

// CurveSet is a named, versioned, immutable table of a method's chart factors,
// with who read it from where and how exactly. A reader's controlled copy of
// the charts is the only authority for them, so that they are data.
type CurveSet struct {
	ID, Version string
	Method      string // the id of the method whose charts these are
	Document    string
	Reader      string
	Tolerance   float64 // of the reading, relative
	Charts      map[string]Chart

	builtIn bool       // every answer that uses it says that it is not the printed charts
	net     []netChart // the family Kn@r in ascending order of r, of a built-in set
}

// netChart is one chart of the family Kn@r.
type netChart struct {
	r     float64
	name  string
	chart Chart
}

// netFamily gathers the family Kn@r of a set in ascending order of r.
func (c *CurveSet) netFamily() []netChart {
	var family []netChart
	for name, chart := range c.Charts {
		if ratio, ok := strings.CutPrefix(name, netFamily); ok {
			if r, err := strconv.ParseFloat(ratio, 64); err == nil {
				family = append(family, netChart{r, name, chart})
			}
		}
	}
	slices.SortFunc(family, func(a, b netChart) int { return cmp.Compare(a.r, b.r) })
	return family
}

// Name is id@version.
func (c *CurveSet) Name() string { return c.ID + "@" + c.Version }

// Chart is one figure: a factor along an abscissa, on one or more curves.
type Chart struct {
	Figure  string
	Along   string // what the abscissa is
	Between string // what tells the curves apart; empty with one curve
	Curves  []Curve

	// formula gives the factor of a built-in chart, whose points are only there
	// to be looked at. Its second argument is the value of Between.
	formula func(along, between float64) float64
}

// Curve is one line of a chart; its range is that of its points.
type Curve struct {
	At     float64 // the value of Between
	Points [][2]float64
}

// What tells curves apart where it is not a number of the joint: the numbers
// of the curves in the figure, of which the option material_curve names one.
const betweenCurves = "curve"

// chartRule says what a chart of a method may be.
type chartRule struct {
	along   string
	between []string // besides none
	// Abscissae and factors that are possible at all.
	alongLeast, alongMost float64
	least, most           float64
	rises                 bool // the factor never falls along a curve
	byCurve               int  // -1: a curve with a larger At never lies higher, 1: never lower
	// product is subtracted from the abscissa to make what the factor is
	// multiplied by before it must rise.
	product float64
}

// The charts that a method reads. Kn may also be split into a family, one
// chart for each ratio r = Fty/Ftu, named Kn@r ("Kn@0.8").
//
// The limits are what is possible, not what is printed: a mean stress over the
// net section cannot exceed the strength, a longer end is never weaker, and
// strain limits bite harder with larger q = Ftu/(E εu).
var chartRules = map[string]map[string]chartRule{
	"affdl-tr-69-42": {
		"K":    {along: "e/D", between: []string{"D/t"}, alongLeast: 0.5, alongMost: 100, least: 0, most: 3, rises: true, product: 0.5, byCurve: -1},
		"Kn":   {along: "D/W", between: []string{"q", "r"}, alongLeast: 0, alongMost: 1, least: 0, most: 1},
		"Ktru": {along: "hav/D", between: []string{"r", betweenCurves}, alongLeast: 0, alongMost: 100, least: 0, most: 3, rises: true},
		"Ktry": {along: "hav/D", between: []string{"r", betweenCurves}, alongLeast: 0, alongMost: 100, least: 0, most: 3, rises: true},
	},
	// gamma is told apart by r, the end's length over the thickness, (e - D/2)/t.
	"melcon-hoblit": {
		"Kbr":   {along: "e/D", between: []string{"D/t"}, alongLeast: 0.5, alongMost: 100, least: 0, most: 4, rises: true, byCurve: -1},
		"Kt":    {along: "W/D", between: []string{betweenCurves}, alongLeast: 1, alongMost: 100, least: 0, most: 1},
		"C":     {along: "Pu/(D t Ftux)", alongLeast: 0, alongMost: 100, least: 0, most: 2},
		"Kbry":  {along: "e/D", between: []string{"D/t"}, alongLeast: 0.5, alongMost: 100, least: 0, most: 4, rises: true},
		"Ktru":  {along: "Aav/Abr", between: []string{betweenCurves}, alongLeast: 0, alongMost: 100, least: 0, most: 3, rises: true},
		"Ktry":  {along: "Aav/Abr", between: []string{betweenCurves}, alongLeast: 0, alongMost: 100, least: 0, most: 3, rises: true},
		"gamma": {along: "Pu/(D t Ftux)", between: []string{"r"}, alongLeast: 0, alongMost: 100, least: 0, most: 1},
	},
}

const netFamily = "Kn@"

// ruleOf finds the rule of a chart by its name.
func ruleOf(rules map[string]chartRule, name string) (chartRule, bool) {
	if r, ok := strings.CutPrefix(name, netFamily); ok {
		ratio, err := strconv.ParseFloat(r, 64)
		rule := rules["Kn"]
		rule.between, rule.byCurve = []string{"q"}, -1
		return rule, err == nil && ratio > 0 && ratio <= 1 && rule.along != ""
	}
	rule, ok := rules[name]
	return rule, ok
}

// Check finds what is impossible about a curve set, each with a pointer into
// the set such as /charts/Kn/curves/0/points/3.
func (c *CurveSet) Check() []strength.Fault {
	var wrong faults
	rules, ok := chartRules[c.Method]
	if !ok {
		wrong.add("/method", "the method %q reads no curve sets; those of %q do", c.Method, slices.Sorted(maps.Keys(chartRules)))
		return wrong
	}
	if c.Tolerance < 0 || c.Tolerance > 0.2 {
		wrong.add("/tolerance", "the reading tolerance is %.6g and must be from 0 to 0.2", c.Tolerance)
	}
	if len(c.Charts) == 0 {
		wrong.add("/charts", "the set has no charts")
	}
	for _, name := range slices.Sorted(maps.Keys(c.Charts)) {
		at := "/charts/" + pointerToken(name)
		rule, ok := ruleOf(rules, name)
		if !ok {
			wrong.add(at, "the method %s has no chart %q; it has %q", c.Method, name, slices.Sorted(maps.Keys(rules)))
			continue
		}
		chart := c.Charts[name]
		chart.check(at, &rule, &wrong)
	}
	return wrong
}

// pointerToken escapes a name for a JSON pointer (RFC 6901).
func pointerToken(name string) string {
	return strings.ReplaceAll(strings.ReplaceAll(name, "~", "~0"), "/", "~1")
}

func (c *Chart) check(at string, rule *chartRule, wrong *faults) {
	if c.Along != rule.along {
		wrong.add(at+"/along", "the chart lies along %q, and was given along %q", rule.along, c.Along)
	}
	if c.Between != "" && !slices.Contains(rule.between, c.Between) {
		wrong.add(at+"/between", "the curves are told apart by one of %q, and not by %q", rule.between, c.Between)
	}
	if len(c.Curves) == 0 {
		wrong.add(at+"/curves", "the chart has no curve")
	}
	if c.Between == "" && len(c.Curves) > 1 {
		wrong.add(at+"/curves", "there are %d curves and nothing that tells them apart", len(c.Curves))
	}
	for i := range c.Curves {
		curve := at + "/curves/" + strconv.Itoa(i)
		if i > 0 && c.Curves[i].At <= c.Curves[i-1].At {
			wrong.add(curve+"/at", "the curve at %.6g does not follow the one at %.6g: curves ascend", c.Curves[i].At, c.Curves[i-1].At)
		}
		c.Curves[i].check(curve, rule, wrong)
	}
	if rule.byCurve == 0 && c.Between != "q" || len(*wrong) > 0 {
		return
	}
	// Neighbouring curves are compared at the points of the second.
	for i := 1; i < len(c.Curves); i++ {
		lower := &c.Curves[i]
		for k, point := range lower.Points {
			if above, ok := c.Curves[i-1].read(point[0]); ok && strength.More(point[1], above) {
				wrong.add(at+"/curves/"+strconv.Itoa(i)+"/points/"+strconv.Itoa(k),
					"the factor %.6g lies above the curve at %.6g, %.6g there: it must not rise with %s", point[1], c.Curves[i-1].At, above, c.Between)
			}
		}
	}
}

func (c *Curve) check(at string, rule *chartRule, wrong *faults) {
	if len(c.Points) < 2 {
		wrong.add(at+"/points", "a curve needs at least two points and has %d", len(c.Points))
	}
	for i, point := range c.Points {
		here := at + "/points/" + strconv.Itoa(i)
		x, y := point[0], point[1]
		if x < rule.alongLeast || x > rule.alongMost {
			wrong.add(here, "%s of %.6g is outside what is possible, %.6g to %.6g", rule.along, x, rule.alongLeast, rule.alongMost)
		}
		if y <= rule.least || y > rule.most {
			wrong.add(here, "the factor %.6g is outside what is possible, above %.6g to %.6g", y, rule.least, rule.most)
		}
		if i == 0 {
			continue
		}
		before := c.Points[i-1]
		if x <= before[0] {
			wrong.add(here, "%s of %.6g does not follow %.6g: points ascend", rule.along, x, before[0])
			continue
		}
		switch {
		case !rule.rises:
		case rule.product == 0 && y < before[1]:
			wrong.add(here, "the factor falls from %.6g to %.6g: it must not fall with %s", before[1], y, rule.along)
		case rule.product != 0 && strength.Less(y*(x-rule.product), before[1]*(before[0]-rule.product)):
			wrong.add(here, "the strength falls from %.6g to %.6g (factor times %s less %.6g): it must not fall with %s",
				before[1]*(before[0]-rule.product), y*(x-rule.product), rule.along, rule.product, rule.along)
		}
	}
}

// read is the factor at an abscissa, false outside the range of the points.
//
// Between points a piecewise cubic Hermite interpolation that keeps the shape
// (PCHIP): no overshoot, monotonic where the points are. Slopes by F. N. Fritsch
// and J. Butland, SIAM J. Sci. Stat. Comput. 5 (1984) 300, for uneven steps;
// three-point slopes, limited, at the ends.
func (c *Curve) read(x float64) (float64, bool) {
	p := c.Points
	n := len(p)
	if n < 2 || strength.Less(x, p[0][0]) || strength.More(x, p[n-1][0]) {
		return 0, false
	}
	x = min(max(x, p[0][0]), p[n-1][0])
	k := 0
	for k < n-2 && x > p[k+1][0] {
		k++
	}
	h := p[k+1][0] - p[k][0]
	if !(h > 0) {
		return 0, false
	}
	m0, m1 := c.slope(k), c.slope(k+1)
	u := (x - p[k][0]) / h
	v := 1 - u
	return float64(v*v*(1+2*u)*p[k][1]) + float64(u*u*(1+2*v)*p[k+1][1]) +
		float64(h*u*v*v*m0) - float64(h*u*u*v*m1), true
}

// slope is the slope of the curve in point k.
func (c *Curve) slope(k int) float64 {
	n := len(c.Points)
	switch {
	case n == 2:
		return c.secant(0)
	case k == 0:
		return endSlope(c.step(0), c.step(1), c.secant(0), c.secant(1))
	case k == n-1:
		return endSlope(c.step(n-2), c.step(n-3), c.secant(n-2), c.secant(n-3))
	}
	left, right := c.secant(k-1), c.secant(k)
	if left*right <= 0 {
		return 0
	}
	w1, w2 := 2*c.step(k)+c.step(k-1), c.step(k)+2*c.step(k-1)
	return (w1 + w2) / (w1/left + w2/right)
}

func (c *Curve) step(k int) float64 { return c.Points[k+1][0] - c.Points[k][0] }

func (c *Curve) secant(k int) float64 { return (c.Points[k+1][1] - c.Points[k][1]) / c.step(k) }

// endSlope is the slope of the parabola through the last three points, kept
// from turning back or overshooting.
func endSlope(h0, h1, d0, d1 float64) float64 {
	slope := (float64((2*h0+h1)*d0) - float64(h0*d1)) / (h0 + h1)
	switch {
	case slope*d0 <= 0:
		return 0
	case d0*d1 <= 0 && abs(slope) > 3*abs(d0):
		return 3 * d0
	}
	return slope
}

func abs(x float64) float64 { return max(x, -x) }

// reading is a factor taken from a chart.
type reading struct {
	value      float64
	below      bool // the value of Between was under the first curve's
	lo, hi     int  // the curves between which it lies
	vlo, vhi   float64
	share      float64 // of the way from lo to hi
	outsideOf  string  // the variable that is outside the chart, empty: none
	from, upTo float64 // its range
	found      float64
}

// read takes the factor at an abscissa x and a value y of Between. Under the
// first curve its values hold where belowFirst says that they are the lower
// bound; elsewhere outside the curves there is none.
func (c *Chart) read(x, y float64, belowFirst bool) reading {
	var r reading
	n := len(c.Curves)
	if n == 0 {
		return reading{outsideOf: c.Along, found: x}
	}
	if c.Between != "" {
		first, last := c.Curves[0].At, c.Curves[n-1].At
		r.below = strength.Less(y, first)
		if r.below && !belowFirst || strength.More(y, last) {
			return reading{outsideOf: c.Between, from: first, upTo: last, found: y}
		}
		y = min(max(y, first), last)
		for r.lo < n-2 && y > c.Curves[r.lo+1].At {
			r.lo++
		}
		if n > 1 {
			r.hi = r.lo + 1
			r.share = (y - c.Curves[r.lo].At) / (c.Curves[r.hi].At - c.Curves[r.lo].At)
			// A curve with no share in the reading need not reach this far.
			if r.share == 0 {
				r.hi = r.lo
			}
			if r.share == 1 {
				r.lo, r.share = r.hi, 0
			}
		}
	}
	var ok bool
	for _, end := range [...]int{r.lo, r.hi} {
		curve := &c.Curves[end]
		if r.vhi, ok = curve.read(x); !ok {
			if len(curve.Points) < 2 {
				return reading{outsideOf: c.Along, found: x}
			}
			return reading{outsideOf: c.Along, from: curve.Points[0][0], upTo: curve.Points[len(curve.Points)-1][0], found: x}
		}
		if end == r.lo {
			r.vlo = r.vhi
		}
	}
	if c.formula != nil {
		r.value = c.formula(x, y)
		return r
	}
	r.value = r.vlo + float64(r.share*(r.vhi-r.vlo))
	return r
}

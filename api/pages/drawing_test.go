package pages_test

import (
	"encoding/xml"
	"io"
	"math"
	"strconv"
	"strings"
	"testing"

	"jointledger/api/pages"
	"jointledger/service"
)

// element is one element of a drawing.
type element struct {
	name       string
	class      []string
	attributes map[string]string
}

// number reads an attribute.
func (e element) number(t *testing.T, name string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(e.attributes[name], 64)
	if err != nil {
		t.Fatalf("<%s %s=%q>: %v", e.name, name, e.attributes[name], err)
	}
	return x
}

// numbers reads the numbers of a path, whatever its commands.
func (e element) numbers(t *testing.T) []float64 {
	t.Helper()
	var all []float64
	for _, field := range strings.FieldsFunc(e.attributes["d"], func(r rune) bool { return strings.ContainsRune("MLAZhv ", r) }) {
		x, err := strconv.ParseFloat(field, 64)
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, x)
	}
	return all
}

// drawn reads a drawing, which must be well formed, and returns the elements
// that have all classes.
func drawn(t *testing.T, svg string, classes ...string) []element {
	t.Helper()
	var found []element
	d := xml.NewDecoder(strings.NewReader(svg))
	for {
		token, err := d.Token()
		if err == io.EOF {
			return found
		}
		if err != nil {
			t.Fatalf("the drawing is not well formed: %v\n%s", err, svg)
		}
		start, ok := token.(xml.StartElement)
		if !ok {
			continue
		}
		e := element{name: start.Name.Local, attributes: map[string]string{}}
		for _, a := range start.Attr {
			e.attributes[a.Name.Local] = a.Value
			for _, bad := range []string{"NaN", "Inf"} {
				if strings.Contains(a.Value, bad) {
					t.Errorf("<%s %s=%q>", e.name, a.Name.Local, a.Value)
				}
			}
		}
		e.class = strings.Fields(e.attributes["class"])
		all := true
		for _, class := range classes {
			has := false
			for _, c := range e.class {
				has = has || c == class
			}
			all = all && has
		}
		if all {
			found = append(found, e)
		}
	}
}

func close(a, b float64) bool { return math.Abs(a-b) <= 1e-9*(1+math.Abs(b)) }

// content calculates an input as a record's page has it.
func content(t *testing.T, kind service.Kind, input string) *service.Content {
	t.Helper()
	c, err := newSite(t).service.Content(t.Context(), kind, []byte(input))
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// working is the first value of a symbol of a member.
func working(t *testing.T, r *service.Result, member, symbol string) float64 {
	t.Helper()
	for _, w := range r.Workings {
		if w.Member == member && w.Symbol == symbol {
			return w.Value
		}
	}
	t.Fatalf("there is no working %s of %s", symbol, member)
	return 0
}

func TestLugIsDrawnAsGiven(t *testing.T) {
	const given = `{"units": "SI", "methods": ["elementary"], "lug": {%SHAPE%, "thickness": 12, "hole_diameter": 25, "material": "7050-T7451-plate-0.250-1.500-L"},
		"pin": {"diameter": 20, "inner_diameter": 8, "material": "alloy-steel-125-ksi"}, "bushing": {"material": "alloy-steel-125-ksi"},
		"factors": {"ultimate": 1.5, "fitting": 1.15}, "load_cases": [{"id": "LC1", "level": "limit", "force": 50000, "angle": 0}]}`
	for _, c := range []struct {
		shape            string
		end, upper, down float64 // of the outline
	}{
		{`"shape": "round", "width": 80, "edge_distance": 45`, 45, 40, -40},
		{`"shape": "round", "width": 80, "edge_distance": 42, "end_radius": 50`, 42, 40, -40},
		{`"shape": "round", "width": 80, "edge_distance": 50, "offset": 4`, 50, 36, -44},
		{`"shape": "square", "width": 70, "edge_distance": 38`, 38, 35, -35},
		{`"shape": "tapered", "width": 80, "edge_distance": 40, "taper_angle": 20`, 40, 40, -40},
		{`"shape": "square", "width": 70, "edge_distance": 38, "body_width": 90`, 38, 45, -45},
	} {
		t.Run(c.shape, func(t *testing.T) {
			r := content(t, service.Lug, strings.Replace(given, "%SHAPE%", c.shape, 1))
			svg := string(pages.LugPlan(r.Lug, "lug", r.Result.Governing))
			for class, radius := range map[string]float64{"hole": 12.5, "pin": 10, "bore": 4} {
				circles := drawn(t, svg, class)
				if len(circles) != 1 || circles[0].number(t, "r") != radius || circles[0].number(t, "cx") != 0 || circles[0].number(t, "cy") != 0 {
					t.Errorf("%s: %+v, want one about the origin with the radius %v", class, circles, radius)
				}
			}
			// The corners of the outline; of an arc, its two ends.
			outline := drawn(t, svg, "solid")[0].attributes["d"]
			end, up, down := math.Inf(-1), math.Inf(-1), math.Inf(1)
			for _, command := range strings.FieldsFunc(strings.NewReplacer("M", ";", "L", ";", "A", ";").Replace(outline), func(r rune) bool { return r == ';' }) {
				fields := strings.Fields(command)
				x, _ := strconv.ParseFloat(fields[len(fields)-2], 64)
				y, _ := strconv.ParseFloat(fields[len(fields)-1], 64)
				if len(fields) == 7 { // an arc about the hole centre reaches its radius on the axis
					radius, _ := strconv.ParseFloat(fields[0], 64)
					if !close(math.Hypot(x, y), radius) {
						t.Errorf("the arc ends at %v, %v, which is not %v from the hole", x, y, radius)
					}
					end = math.Max(end, math.Min(radius, c.end))
				}
				end, up, down = math.Max(end, x), math.Max(up, y), math.Min(down, y)
			}
			if !close(end, c.end) || !close(up, c.upper) || !close(down, c.down) {
				t.Errorf("the outline reaches %v, %v and %v, want %v, %v and %v", end, up, down, c.end, c.upper, c.down)
			}
			// The shorter shear-out plane has the length that the calculation uses.
			shortest := math.Inf(1)
			for _, plane := range drawn(t, svg, "plane") {
				if y := math.Abs(plane.number(t, "y1")); !close(y, 12.5*math.Sin(40*math.Pi/180)) || plane.number(t, "y1") != plane.number(t, "y2") {
					t.Errorf("a plane at y %v", y)
				}
				if x := plane.number(t, "x1"); !close(x, 12.5*math.Cos(40*math.Pi/180)) {
					t.Errorf("a plane from x %v", x)
				}
				shortest = math.Min(shortest, plane.number(t, "x2")-plane.number(t, "x1"))
			}
			if want := working(t, r.Result, "lug", "L"); !close(shortest, want) {
				t.Errorf("the shear-out plane is %v long, and the workings have %v", shortest, want)
			}
		})
	}
}

// Both axes have one scale, and it is that which the drawing is made by.
func TestDrawingsHaveOneScale(t *testing.T) {
	r := content(t, service.Lug, hingeLug)
	for _, svg := range []string{string(pages.LugPlan(r.Lug, "lug", nil)), string(pages.JointSection(r.Lug, r.Result))} {
		transform := drawn(t, svg, "geometry")[0].attributes["transform"]
		_, scales, _ := strings.Cut(transform, "scale(")
		fields := strings.Fields(strings.TrimSuffix(scales, ")"))
		x, errX := strconv.ParseFloat(fields[0], 64)
		y, errY := strconv.ParseFloat(fields[1], 64)
		if errX != nil || errY != nil || x <= 0 || x != -y {
			t.Errorf("transform %q", transform)
		}
	}
}

func TestGoverningSectionIsMarked(t *testing.T) {
	r := content(t, service.Lug, hingeLug)
	for mode, want := range map[string]int{"net-section": 2, "shear-out": 2, "bearing": 1, "shear-bearing": 3, "fracture": 1, "transverse": 1, "tang": 1, "pin-bending": 1} {
		check := &service.Check{Member: "lug", Mode: mode, LoadCase: "landing"}
		if got := len(drawn(t, string(pages.LugPlan(r.Lug, "lug", check)), "governing")); got != want {
			t.Errorf("%s: %d marks, want %d", mode, got, want)
		}
		if got := len(drawn(t, string(pages.LugPlan(r.Lug, "clevis", check)), "governing")); got != 0 {
			t.Errorf("%s of the lug: %d marks on the clevis", mode, got)
		}
	}
	net := drawn(t, string(pages.LugPlan(r.Lug, "lug", &service.Check{Member: "lug", Mode: "net-section"})), "governing")
	if net[0].number(t, "y1") != 12.5 || net[0].number(t, "y2") != 35 || net[1].number(t, "y2") != -35 {
		t.Errorf("net section %+v", net)
	}
}

// AFFDL-TR-69-42 example 9.4.5: of each leg 0.350 in are active, of the lug
// 0.6346 in (readings and input from memory 75 %).
func TestJointIsDrawnInSection(t *testing.T) {
	r := content(t, service.Lug, published(t, "lug-affdl-9-4-5", ""))
	svg := string(pages.JointSection(r.Lug, r.Result))
	want := map[string][]float64{"lug": {0.75, 0.75}, "clevis": {0.5, 0.5, 0.5, 0.5}}
	for class, widths := range want {
		cuts := drawn(t, svg, "cut", class)
		if len(cuts) != len(widths) {
			t.Fatalf("%s: %d pieces, want %d", class, len(cuts), len(widths))
		}
		for i, cut := range cuts {
			if !close(cut.number(t, "width"), widths[i]) {
				t.Errorf("%s: thickness %v, want %v", class, cut.number(t, "width"), widths[i])
			}
		}
	}
	lug, leg := drawn(t, svg, "cut", "lug")[0], drawn(t, svg, "cut", "clevis")[0]
	if gap := leg.number(t, "x") - lug.number(t, "x") - lug.number(t, "width"); !close(gap, 0.1) {
		t.Errorf("gap %v", gap)
	}
	if height := lug.number(t, "height"); !close(height, 1.5-0.5) || lug.number(t, "y") != 0.5 {
		t.Errorf("the lug's upper half is %v high from %v", height, lug.number(t, "y"))
	}
	pin := drawn(t, svg, "pin")[0]
	if !close(pin.number(t, "height"), 0.75) {
		t.Errorf("pin %v", pin.number(t, "height"))
	}
	var legs, inner float64
	for _, line := range drawn(t, svg, "active") {
		a, b := line.number(t, "x1"), line.number(t, "x2")
		long := math.Abs(b - a)
		if math.Abs(a+b)/2 > 0.375 {
			legs += long / 4 // two legs, above and below the pin
		} else {
			inner += long / 2
		}
	}
	if math.Abs(legs-0.350) > 0.0005 || math.Abs(inner-0.6346) > 0.00005 {
		t.Errorf("active %v of a leg and %v of the lug, want 0.350 and 0.6346", legs, inner)
	}
}

func TestPatternIsDrawnAsGiven(t *testing.T) {
	r := content(t, service.FastenerGroup, bracketPattern)
	svg := string(pages.PatternPlan(r.Group, r.Result))
	circles := drawn(t, svg, "fastener")
	want := [][3]float64{{0, 0, 0.125}, {2, 0, 0.125}, {0, 1.5, 0.125}, {2, 1.5, 0.125}, {2, 2.1, 0.15625}}
	if len(circles) != len(want) {
		t.Fatalf("%d fasteners are drawn, want %d", len(circles), len(want))
	}
	for i, c := range circles {
		got := [3]float64{c.number(t, "cx"), c.number(t, "cy"), c.number(t, "r")}
		if got != want[i] {
			t.Errorf("fastener %d is drawn at %v, want %v", i+1, got, want[i])
		}
	}
	if got := drawn(t, svg, "solid")[0].numbers(t); len(got) != 8 || got[2] != 2.3 || got[3] != -0.5 || got[7] != 3 {
		t.Errorf("outline %v", got)
	}
	// 0.3 in from a side that 1.5 D would put at 0.375 in; 4 and 5 are 0.6 in
	// apart where 3 D asks for 0.75 in.
	sides, pitches := 0, 0
	for _, line := range drawn(t, svg, "broken", "violation") {
		long := math.Hypot(line.number(t, "x2")-line.number(t, "x1"), line.number(t, "y2")-line.number(t, "y1"))
		switch {
		case close(long, 0.3):
			sides++
		case close(long, 0.6):
			pitches++
		default:
			t.Errorf("a broken rule is drawn %v long", long)
		}
	}
	if sides != 3 || pitches != 2 {
		t.Errorf("%d edge distances and %d pitches are marked, want 3 and 2", sides, pitches)
	}
	// The vectors are in proportion to the shears and point as they do.
	vectors := drawn(t, svg, "vector", "head")
	shares := r.Result.Shares[0].Fasteners
	shafts := drawn(t, svg, "vector", "shaft")
	scale := math.NaN()
	for i, shaft := range shafts {
		from, tip := shaft.numbers(t), vectors[i].numbers(t)
		dx, dy := tip[0]-from[0], from[1]-tip[1]
		k := math.Hypot(dx, dy) / shares[i].ShearResultant
		if math.IsNaN(scale) {
			scale = k
		}
		// Pixels are written to a hundredth.
		if math.Abs(k/scale-1) > 0.002 || math.Abs(dx-shares[i].Shear[0]*k) > 0.05 || math.Abs(dy-shares[i].Shear[1]*k) > 0.05 {
			t.Errorf("fastener %d: vector %v, %v for the shear %v", i+1, dx, dy, shares[i].Shear)
		}
	}
	if len(shafts) != 5 {
		t.Errorf("%d vectors", len(shafts))
	}
}

func TestSpliceIsDrawnAsGiven(t *testing.T) {
	r := content(t, service.Splice, published(t, "splice-strength", "SM-4203"))
	svg := string(pages.SpliceSection(r.Splice, r.Result))
	pins := drawn(t, svg, "pin")
	if len(pins) != 4 {
		t.Fatalf("%d rows", len(pins))
	}
	for i, pin := range pins {
		if x := pin.number(t, "x") + 0.125; !close(x, float64(i)) || !close(pin.number(t, "width"), 0.25) {
			t.Errorf("row %d at %v, %v wide", i+1, x, pin.number(t, "width"))
		}
	}
	cap, bracket := drawn(t, svg, "cut", "lug"), drawn(t, svg, "cut", "clevis")
	if ratio := bracket[0].number(t, "height") / cap[0].number(t, "height"); !close(ratio, 1.6) {
		t.Errorf("the thicknesses are as %v, want 1.6", ratio)
	}
	// The caption tells by how much thicknesses are enlarged.
	if k := cap[0].number(t, "height") / 0.1; k != math.Trunc(k) || !strings.Contains(svg, "thickness ×"+pages.Number(k)) {
		t.Errorf("thicknesses are enlarged %v times, and the drawing does not say so", k)
	}
	if !close(bracket[0].number(t, "y")+bracket[0].number(t, "height"), cap[0].number(t, "y")) {
		t.Error("the members do not touch")
	}
	bars := drawn(t, svg, "bar")
	for i, bar := range bars {
		share := r.Result.Transfers[0].Rows[i].Interfaces[0].Share
		first := r.Result.Transfers[0].Rows[0].Interfaces[0].Share
		if got := bar.number(t, "height") / bars[0].number(t, "height"); !close(got, share/first) {
			t.Errorf("row %d: bar %v, want %v", i+1, got, share/first)
		}
	}
	if len(bars) != 4 {
		t.Errorf("%d bars", len(bars))
	}
}

func TestMarginsArePlotted(t *testing.T) {
	margins := []service.CaseMargin{{LoadCase: "a", Margin: new(0.5)}, {LoadCase: "b", Margin: new(-0.25)}, {LoadCase: "c", Margin: new(1.0)}, {LoadCase: "d"}}
	svg := string(pages.MarginsPlot(margins))
	zero := drawn(t, svg, "zero")[0].numbers(t)[1]
	good := drawn(t, svg, "points")[0].numbers(t)
	bad := drawn(t, svg, "points", "bad")[0].numbers(t)
	mark := drawn(t, svg, "mark")[0]
	if len(good) != 6 || len(bad) != 8 {
		t.Fatalf("points %v and %v", good, bad)
	}
	// 0.5 above and 1.0 above are in proportion, -0.25 lies below the line.
	if up, higher := zero-good[1], zero-good[4]; math.Abs(higher/up-2) > 0.001 {
		t.Errorf("margins 0.5 and 1.0 stand %v and %v above zero", up, higher)
	}
	if below := mark.number(t, "cy") - zero; math.Abs(below-(zero-good[1])/2) > 0.02 {
		t.Errorf("the margin -0.25 stands %v below zero", below)
	}
	if !strings.Contains(svg, "the least of all is −0.250 in b") {
		t.Error("the least margin is not told")
	}
	if got := pages.MarginsPlot([]service.CaseMargin{{LoadCase: "d"}}); got != "" {
		t.Errorf("a plot of nothing: %s", got)
	}
}

func TestTurningLoadIsPlottedByDirection(t *testing.T) {
	d := &service.LugDocument{}
	var margins []service.CaseMargin
	for _, angle := range []float64{0, 90, 180, 270} {
		d.LoadCases = append(d.LoadCases, service.LugLoadCase{Angle: angle})
		margins = append(margins, service.CaseMargin{LoadCase: "x", Margin: new(0.5)})
	}
	svg := string(pages.PolarPlot(d, margins))
	radius := drawn(t, svg, "zero")[0].number(t, "r")
	cx := drawn(t, svg, "zero")[0].number(t, "cx")
	points := drawn(t, svg, "points")[0].numbers(t)
	// M x y h 4.4 each; the mark is centred 2.2 to the right of x.
	for i, want := range [][2]float64{{1, 0}, {0, 1}, {-1, 0}, {0, -1}} {
		x, y := (points[3*i]+2.2-cx)/radius, (cx-points[3*i+1])/radius
		if math.Abs(x-1.5*want[0]) > 0.001 || math.Abs(y-1.5*want[1]) > 0.001 {
			t.Errorf("direction %v: %v, %v", want, x, y)
		}
	}
}

func TestCurvesArePlotted(t *testing.T) {
	chart := &service.Chart{Figure: "9-2", Along: "e/D", Curves: []service.Curve{{Points: [][2]float64{{0.5, 1}, {1, 2}, {1.5, 3}}}}}
	points := drawn(t, string(pages.ChartPlot(chart)), "curve")[0].numbers(t)
	if !close(points[2]-points[0], points[4]-points[2]) || points[5] >= points[3] || math.Abs((points[1]-points[3])-(points[3]-points[5])) > 0.011 {
		t.Errorf("a straight line is drawn as %v", points)
	}
}

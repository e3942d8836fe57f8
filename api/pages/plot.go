package pages

import (
	"cmp"
	"html/template"
	"math"
	"slices"
	"strconv"

	"jointledger/service"
)

func fixed(x float64, decimals int) string { return strconv.FormatFloat(x, 'f', decimals, 64) }

// axes is a plot with ticks on both sides, in pixels.
type axes struct {
	canvas
	fromX, toX, fromY, toY         float64 // values
	left, right, ceiling, floorPix float64 // pixels
}

func newAxes(width, height, fromX, toX, fromY, toY float64) *axes {
	a := &axes{fromX: fromX, toX: toX, fromY: fromY, toY: toY, left: 62, right: width - 16, ceiling: 14, floorPix: height - 44}
	a.width, a.height, a.scale = width, height, 1
	return a
}

func (a *axes) x(v float64) float64 { return a.left + (v-a.fromX)/(a.toX-a.fromX)*(a.right-a.left) }

func (a *axes) y(v float64) float64 {
	return a.floorPix - (v-a.fromY)/(a.toY-a.fromY)*(a.floorPix-a.ceiling)
}

// ticks are round values between two, about so many.
func ticks(from, to float64, about int) []float64 {
	step := niceBelow((to - from) / float64(about))
	var at []float64
	for k := math.Ceil(from/step - 1e-9); k*step <= to+step*1e-9 && len(at) < 40; k++ {
		at = append(at, k*step)
	}
	return at
}

func (a *axes) frame(nameX, nameY string, wholeX bool) {
	for _, v := range ticks(a.fromY, a.toY, 5) {
		p := trace().to("M", a.left, a.y(v)).to("L", a.right, a.y(v))
		a.labels.WriteString(`<path class="grid" d="` + p.b.String() + `"/>`)
		a.text("measure", "end", a.left-7, a.y(v)+4, number(v))
	}
	for _, v := range ticks(a.fromX, a.toX, 8) {
		if wholeX && v != math.Trunc(v) {
			continue
		}
		p := trace().to("M", a.x(v), a.floorPix).to("L", a.x(v), a.floorPix+5)
		a.labels.WriteString(`<path class="tick" d="` + p.b.String() + `"/>`)
		a.text("measure", "middle", a.x(v), a.floorPix+18, number(v))
	}
	p := trace().to("M", a.left, a.ceiling).to("L", a.left, a.floorPix).to("L", a.right, a.floorPix)
	a.labels.WriteString(`<path class="tick" d="` + p.b.String() + `"/>`)
	a.text("measure", "end", a.right, a.floorPix+36, nameX)
	a.text("measure", "start", 4, a.ceiling-2, nameY)
}

// mostPlotted is the margin above which points stand at the top of a plot:
// what holds by far needs no room.
const mostPlotted = 2

// marginsPlot shows the least margin of each load case in their order.
func marginsPlot(margins []service.CaseMargin) template.HTML {
	least, most, worst := math.Inf(1), 0.0, -1
	for i, m := range margins {
		if m.Margin == nil {
			continue
		}
		if *m.Margin < least {
			least, worst = *m.Margin, i
		}
		most = max(most, *m.Margin)
	}
	if worst < 0 {
		return ""
	}
	top := min(most, max(mostPlotted, 3*math.Abs(least)))
	a := newAxes(640, 260, 0.5, float64(len(margins))+0.5, min(0, least)-0.05*(top-min(0, least)), top*1.05+1e-9)
	a.ceiling = 24
	a.frame("load case, in the order given", "least margin", true)
	zero := trace().to("M", a.left, a.y(0)).to("L", a.right, a.y(0))
	a.labels.WriteString(`<path class="zero" d="` + zero.b.String() + `"/>`)
	a.text("measure", "end", a.right, a.y(0)-5, "0: just holds")
	good, bad := trace(), trace()
	size := min(3.2, max(1.1, (a.right-a.left)/float64(len(margins))/3))
	for i, m := range margins {
		if m.Margin == nil {
			continue
		}
		x, y := a.x(float64(i+1)), a.y(min(*m.Margin, top))
		if *m.Margin < 0 {
			s := size + 1
			bad.to("M", x-s, y-s).to("L", x+s, y+s).to("M", x-s, y+s).to("L", x+s, y-s)
			continue
		}
		good.to("M", x-size, y).to("h", 2*size)
	}
	a.labels.WriteString(`<path class="points" d="` + good.b.String() + `"/><path class="points bad" d="` + bad.b.String() + `"/>`)
	x, y := a.x(float64(worst+1)), a.y(least)
	a.labels.WriteString(`<circle class="mark" cx="` + pixel(x) + `" cy="` + pixel(y) + `" r="6"/>`)
	anchor, dx := "start", 10.0
	if x > 440 {
		anchor, dx = "end", -10
	}
	a.text("load-name", anchor, x+dx, y-7, clip(margins[worst].LoadCase, 24)+"  "+margin(&least))
	return a.figure("The least margin of " + number(float64(len(margins))) + " load cases; the least of all is " + margin(&least) + " in " + margins[worst].LoadCase + ".")
}

// turns reports whether the load of a lug turns: three directions or more.
func turns(d *service.LugDocument) bool {
	var seen []float64
	for _, c := range d.LoadCases {
		a := math.Mod(math.Mod(c.Angle, 360)+360, 360)
		if !slices.Contains(seen, a) {
			if seen = append(seen, a); len(seen) >= 3 {
				return true
			}
		}
	}
	return false
}

// polarPlot shows the least margin of each load case in its direction: the
// distance from the middle is the strength over the demand, the circle is
// where they are equal.
func polarPlot(d *service.LugDocument, margins []service.CaseMargin) template.HTML {
	const size, outer, most = 420.0, 160.0, 3.0
	c := &canvas{width: size, height: size, scale: 1}
	middle := size / 2
	at := func(angle, r float64) (float64, float64) {
		s, cs := math.Sincos(angle * math.Pi / 180)
		return middle + cs*r, middle - s*r
	}
	for _, r := range []float64{1, 2, 3} {
		class := "grid"
		if r == 1 {
			class = "zero"
		}
		c.labels.WriteString(`<circle class="` + class + `" cx="` + pixel(middle) + `" cy="` + pixel(middle) + `" r="` + pixel(r/most*outer) + `"/>`)
		x, y := at(52, r/most*outer)
		c.text("measure", "start", x+2, y-2, margin(new(r-1)))
	}
	for _, angle := range []float64{0, 90, 180, 270} {
		x, y := at(angle, outer)
		p := trace().to("M", middle, middle).to("L", x, y)
		c.labels.WriteString(`<path class="grid" d="` + p.b.String() + `"/>`)
		tx, ty := at(angle, outer+20)
		c.text("measure", "middle", tx, ty+4, number(angle)+"°")
	}
	good, bad := trace(), trace()
	least, worst := math.Inf(1), -1
	for i, m := range margins {
		if m.Margin == nil || i >= len(d.LoadCases) {
			continue
		}
		x, y := at(d.LoadCases[i].Angle, min(1+*m.Margin, most)/most*outer)
		if *m.Margin < least {
			least, worst = *m.Margin, i
		}
		if *m.Margin < 0 {
			bad.to("M", x-4, y-4).to("L", x+4, y+4).to("M", x-4, y+4).to("L", x+4, y-4)
			continue
		}
		good.to("M", x-2.2, y).to("h", 4.4)
	}
	if worst < 0 {
		return ""
	}
	c.labels.WriteString(`<path class="points" d="` + good.b.String() + `"/><path class="points bad" d="` + bad.b.String() + `"/>`)
	x, y := at(d.LoadCases[worst].Angle, min(1+least, most)/most*outer)
	c.labels.WriteString(`<circle class="mark" cx="` + pixel(x) + `" cy="` + pixel(y) + `" r="7"/>`)
	return c.figure("The least margin by the direction of the load; the least of all is " + margin(&least) + " at " + number(d.LoadCases[worst].Angle) + "°.")
}

// chartPlot draws the curves of one chart of a curve set.
func chartPlot(chart *service.Chart) template.HTML {
	area := emptyBox()
	for _, curve := range chart.Curves {
		for _, p := range curve.Points {
			area.include(p[0], p[1])
		}
	}
	if area.maxX <= area.minX {
		area.maxX = area.minX + 1
	}
	low := min(area.minY, max(0, area.minY-(area.maxY-area.minY)*0.1))
	if area.maxY <= low {
		area.maxY = low + 1
	}
	a := newAxes(640, 300, area.minX, area.maxX, low, area.maxY*1.02)
	a.right -= 62
	a.ceiling = 22
	a.frame(chart.Along, "", false)
	lastY := math.Inf(-1)
	type end struct{ x, y, at float64 }
	var ends []end
	for _, curve := range chart.Curves {
		p := trace()
		for k, point := range curve.Points {
			command := "L"
			if k == 0 {
				command = "M"
			}
			p.to(command, a.x(point[0]), a.y(point[1]))
		}
		a.labels.WriteString(`<path class="curve" d="` + p.b.String() + `"/>`)
		if curve.At != nil {
			last := curve.Points[len(curve.Points)-1]
			ends = append(ends, end{a.x(last[0]), a.y(last[1]), *curve.At})
		}
	}
	slices.SortFunc(ends, func(p, q end) int { return cmp.Compare(p.y, q.y) })
	for _, e := range ends {
		y := max(e.y+4, lastY+13)
		if y > a.height-6 {
			break
		}
		lastY = y
		a.text("measure", "start", e.x+6, y, number(e.at))
	}
	if chart.Between != nil && len(ends) > 0 {
		a.text("measure", "end", a.width-6, 12, "curves by "+clip(*chart.Between, 20))
	}
	return a.figure(clip(chart.Figure, 100) + ": " + strconv.Itoa(len(chart.Curves)) + " curves along " + chart.Along + ".")
}

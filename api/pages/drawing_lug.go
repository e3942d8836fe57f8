package pages

import (
	"html/template"
	"math"
	"slices"
	"strings"

	"jointledger/service"
)

// Shear-out planes leave the hole so many degrees from the axis: common practice,
// no source, as the workings have them.
const (
	shearPlaneDegrees = 40
	shearPlaneAngle   = shearPlaneDegrees * math.Pi / 180
)

// head is the outline of one lug, x from the hole centre toward the free end.
type head struct {
	shape             string
	hole              float64 // radius
	end, radius       float64
	upper, lower      float64 // distances to the sides at the hole
	taper             float64 // tangent
	behind            float64 // drawn length of the body
	bodyUp, bodyDown  float64
	width, bodyWidth  float64
	stepAt, thickness float64
}

func headOf(h *service.LugHead) head {
	out := head{
		shape: string(h.Shape), hole: service.Nominal(&h.HoleDiameter) / 2, end: service.Nominal(&h.EdgeDistance), radius: service.Nominal(h.EndRadius),
		width: service.Nominal(&h.Width), thickness: service.Nominal(&h.Thickness), bodyWidth: service.Nominal(h.BodyWidth),
	}
	offset := service.Nominal(h.Offset)
	out.upper, out.lower = out.width/2-offset, out.width/2+offset
	if out.radius == 0 {
		out.radius = out.end
	}
	if h.TaperAngle != nil && out.shape == "tapered" {
		out.taper = math.Tan(*h.TaperAngle * math.Pi / 180)
	}
	out.bodyUp, out.bodyDown = out.upper, out.lower
	if out.bodyWidth > 0 {
		out.bodyUp, out.bodyDown = out.bodyWidth/2-offset, out.bodyWidth/2+offset
	}
	out.stepAt = -max(out.width*0.75, out.hole*1.4)
	out.behind = out.width * 1.15
	return out
}

// reach is how far the outline goes toward the free end at y.
func (h *head) reach(y float64) float64 {
	switch h.shape {
	case "square":
		return h.end
	case "tapered":
		side := h.upper
		if y < 0 {
			side = h.lower
		}
		if h.taper == 0 {
			return h.end
		}
		return min(h.end, (side-math.Abs(y))/h.taper)
	}
	return min(h.end, math.Sqrt(max(0, h.radius*h.radius-y*y)))
}

// outline is the closed outline, from the body's upper corner around the end.
func (h *head) outline() *path {
	p := shape().to("M", -h.behind, h.bodyUp).to("L", h.stepAt, h.bodyUp).to("L", h.stepAt, h.upper)
	switch h.shape {
	case "square":
		p.to("L", h.end, h.upper).to("L", h.end, -h.lower)
	case "tapered":
		p.to("L", 0, h.upper).to("L", h.end, h.upper-h.end*h.taper).to("L", h.end, -h.lower+h.end*h.taper).to("L", 0, -h.lower)
	default:
		p.to("L", h.reach(h.upper), h.upper)
		if h.radius > h.end {
			// The end is cut flat before the arc is full.
			y := math.Sqrt(h.radius*h.radius - h.end*h.end)
			if y < h.upper {
				p.to("A", h.radius, h.radius, 0, 0, 0, h.end, y)
			}
			p.to("L", h.end, -min(y, h.lower))
		}
		p.to("A", h.radius, h.radius, 0, 0, 0, h.reach(-h.lower), -h.lower)
	}
	return p.to("L", h.stepAt, -h.lower).to("L", h.stepAt, -h.bodyDown).to("L", -h.behind, -h.bodyDown)
}

// lugPlan draws a head from above: outline, hole, bushing, pin, shear-out
// planes, the load, and the section that governs.
func lugPlan(d *service.LugDocument, member string, governing *service.Check) template.HTML {
	lug, bushing := &d.Lug, d.Bushing
	if member == "clevis" {
		lug, bushing = &d.Clevis.LugHead, d.Clevis.Bushing
	}
	h := headOf(lug)
	up, down := max(h.upper, h.bodyUp), max(h.lower, h.bodyDown)
	c := newCanvas(box{-h.behind, -down, h.end, up}, room{66, 30, 96, 84})
	c.path("solid", h.outline())
	c.circle("hole", 0, 0, h.hole)
	if d.Pin != nil {
		r := service.Nominal(&d.Pin.Diameter) / 2
		if bushing != nil {
			c.path("bushing", shape().to("M", h.hole, 0).to("A", h.hole, h.hole, 0, 1, 0, -h.hole, 0).to("A", h.hole, h.hole, 0, 1, 0, h.hole, 0).
				to("Z").to("M", r, 0).to("A", r, r, 0, 1, 1, -r, 0).to("A", r, r, 0, 1, 1, r, 0).to("Z"))
		}
		c.circle("pin", 0, 0, r)
		if inner := service.Nominal(d.Pin.InnerDiameter) / 2; inner > 0 {
			c.circle("bore", 0, 0, inner)
		}
	}
	x0, y0 := h.hole*math.Cos(shearPlaneAngle), h.hole*math.Sin(shearPlaneAngle)
	for _, y := range []float64{y0, -y0} {
		c.line("plane", x0, y, h.reach(y), y)
	}
	c.axis(-h.behind, 0, h.end, 0, 12)
	c.axis(0, -down, 0, up, 12)
	angle := drawnAngle(d, governing)
	if governing != nil && sameMember(governing.Member, member) {
		c.governingSection(&h, governing.Mode, angle)
	}
	c.load(angle, max(h.width/2, h.end), drawnLoad(d, governing))
	c.breakLine(-h.behind, h.bodyUp, -h.bodyDown)
	unit := " " + lengthUnit(d.Units)
	c.dimension(0, -down, h.end, -down, 0, 34, "e "+length(&lug.EdgeDistance)+unit)
	c.dimension(h.stepAt*0.9, h.upper, h.stepAt*0.9, -h.lower, -c.leftOf(h.stepAt*0.9)-24, 0, "W "+length(&lug.Width))
	c.label("measure", "end", -h.hole*0.75, -h.hole*0.75, -10, 20, "D "+length(&lug.HoleDiameter))
	c.scaleBar(d.Units)
	title := "The " + member + " seen along the pin, to scale: width " + length(&lug.Width) + unit + ", edge distance " + length(&lug.EdgeDistance) + unit + ", hole " + length(&lug.HoleDiameter) + unit + "."
	if governing != nil && sameMember(governing.Member, member) {
		title += " The " + words(governing.Mode) + " governs."
	}
	return c.figure(title)
}

// sameMember reports whether a check's member is shown with a head.
func sameMember(of, head string) bool {
	switch head {
	case "clevis":
		return of == "clevis" || of == "clevis-bushing"
	}
	return of != "clevis" && of != "clevis-bushing"
}

// drawnCase is the governing load case, else the first.
func drawnCase(d *service.LugDocument, governing *service.Check) *service.LugLoadCase {
	if governing != nil {
		if i := slices.IndexFunc(d.LoadCases, func(c service.LugLoadCase) bool { return c.ID == governing.LoadCase }); i >= 0 {
			return &d.LoadCases[i]
		}
	}
	return &d.LoadCases[0]
}

func drawnAngle(d *service.LugDocument, governing *service.Check) float64 {
	return drawnCase(d, governing).Angle
}

// drawnLoad names the load that is drawn.
func drawnLoad(d *service.LugDocument, governing *service.Check) string {
	c := drawnCase(d, governing)
	return clip(c.ID, 18) + "  " + number(c.Force) + " " + forceUnit(d.Units)
}

// leftOf is how many pixels a point is from the left side of the area.
func (c *canvas) leftOf(x float64) float64 { return (x - c.area.minX) * c.scale }

// axis draws a centre line that goes past its ends by so many pixels.
func (c *canvas) axis(x1, y1, x2, y2, past float64) {
	ax, ay := c.px(x1, y1)
	bx, by := c.px(x2, y2)
	size := math.Hypot(bx-ax, by-ay)
	ux, uy := (bx-ax)/size*past, (by-ay)/size*past
	p := trace().to("M", ax-ux, ay-uy).to("L", bx+ux, by+uy)
	c.labels.WriteString(`<path class="axis" d="` + p.b.String() + `"/>`)
}

// leader writes a text beside a point, so many pixels away, with a line to it.
func (c *canvas) leader(x, y, dx, dy float64, text string) {
	ax, ay := c.px(x, y)
	p := trace().to("M", ax, ay).to("L", ax+dx, ay+dy)
	c.labels.WriteString(`<path class="extension" d="` + p.b.String() + `"/>`)
	c.text("measure", "middle", ax+dx, ay+dy-4, text)
}

// breakLine shows that the body goes on.
func (c *canvas) breakLine(x, top, bottom float64) {
	ax, ay := c.px(x, top)
	_, by := c.px(x, bottom)
	mid := (ay + by) / 2
	p := trace().to("M", ax, ay-8).to("L", ax, mid-9).to("L", ax-6, mid-3).to("L", ax+6, mid+3).to("L", ax, mid+9).to("L", ax, by+8)
	c.labels.WriteString(`<path class="break" d="` + p.b.String() + `"/>`)
}

// load draws the load as an arrow from the hole centre past the outline.
func (c *canvas) load(angle, reach float64, name string) {
	s, cs := math.Sincos(angle * math.Pi / 180)
	cx, cy := c.px(0, 0)
	away := reach*c.scale + 50
	// What would leave the picture starts outside and points at the hole's
	// far side instead; the direction stays.
	endX, endY := cx+cs*away, cy-s*away
	shrink := 1.0
	for _, limit := range []struct{ at, from, least, most float64 }{{endX, cx, 12, c.width - 12}, {endY, cy, 12, c.height - 12}} {
		if limit.at < limit.least {
			shrink = min(shrink, (limit.from-limit.least)/(limit.from-limit.at))
		}
		if limit.at > limit.most {
			shrink = min(shrink, (limit.most-limit.from)/(limit.at-limit.from))
		}
	}
	endX, endY = cx+cs*away*shrink, cy-s*away*shrink
	c.arrow("load", cx, cy, endX, endY)
	anchor := "middle"
	switch {
	case endX > c.width-80:
		anchor = "end"
	case endX < 80:
		anchor = "start"
	}
	// Beside the arrow, on the side that is free.
	dy := -8.0
	if s < -0.3 {
		dy = 16
	}
	c.text("load-name", anchor, min(endX, c.width-4), min(max(endY+dy, 12), c.height-30), name)
}

// clip shortens a text for a place with little room.
func clip(s string, most int) string {
	runes := []rune(s)
	if len(runes) <= most {
		return s
	}
	return string(runes[:most-1]) + "…"
}

// governingSection marks where the governing check looks.
func (c *canvas) governingSection(h *head, mode string, angle float64) {
	s, cs := math.Sincos(angle * math.Pi / 180)
	x0, y0 := h.hole*math.Cos(shearPlaneAngle), h.hole*math.Sin(shearPlaneAngle)
	planes := func() {
		for _, y := range []float64{y0, -y0} {
			c.line("governing", x0, y, h.reach(y), y)
		}
	}
	bore := func() {
		r := h.hole
		c.path("governing", shape().to("M", s*r, -cs*r).to("A", r, r, 0, 0, 1, -s*r, cs*r))
	}
	switch mode {
	case "net-section":
		c.line("governing", 0, h.hole, 0, h.upper)
		c.line("governing", 0, -h.hole, 0, -h.lower)
	case "shear-out":
		planes()
	case "shear-bearing":
		planes()
		bore()
	case "fracture":
		c.line("governing", h.hole, 0, h.end, 0)
	case "transverse":
		if s >= 0 {
			c.line("governing", 0, h.hole, 0, h.upper)
		} else {
			c.line("governing", 0, -h.hole, 0, -h.lower)
		}
	case "oblique", "yielding":
		c.line("governing", 0, h.hole, 0, h.upper)
		c.line("governing", 0, -h.hole, 0, -h.lower)
		bore()
	case "tang", "body-bending":
		c.line("governing", h.stepAt, h.bodyUp, h.stepAt, -h.bodyDown)
	default:
		if strings.HasPrefix(mode, "pin") || mode == "joint" {
			c.circle("governing", 0, 0, h.hole*0.98)
			return
		}
		bore()
	}
}

// scaleBar shows a round length.
func (c *canvas) scaleBar(u service.Units) {
	long := niceBelow(110 / c.scale)
	y := c.height - 12
	p := trace().to("M", 14, y-4).to("L", 14, y).to("L", 14+long*c.scale, y).to("L", 14+long*c.scale, y-4)
	c.labels.WriteString(`<path class="scale" d="` + p.b.String() + `"/>`)
	c.text("measure", "start", 20+long*c.scale, y+1, number(long)+" "+lengthUnit(u))
}

// niceBelow is the largest of 1, 2 and 5 times a power of ten up to x.
func niceBelow(x float64) float64 {
	power := math.Pow(10, math.Floor(math.Log10(x)))
	for _, m := range []float64{5, 2, 1} {
		if m*power <= x*(1+1e-9) {
			return m * power
		}
	}
	return power
}

// jointSection draws the joint cut along the pin: lug, legs, gaps, bushings and
// pin, and the thickness that is active where the workings have it.
func jointSection(d *service.LugDocument, r *service.Result) template.HTML {
	lug, clevis := headOf(&d.Lug), headOf(&d.Clevis.LugHead)
	gap := service.Nominal(d.Clevis.Gap)
	single := d.Joint != nil && *d.Joint == "single-shear"
	type plate struct {
		h        *head
		from, to float64
		bushing  *service.LugBushing
	}
	half := lug.thickness / 2
	plates := []plate{{&lug, -half, half, d.Bushing}, {&clevis, half + gap, half + gap + clevis.thickness, d.Clevis.Bushing}}
	if !single {
		plates = append(plates, plate{&clevis, -half - gap - clevis.thickness, -half - gap, d.Clevis.Bushing})
	}
	area := emptyBox()
	for _, p := range plates {
		area.include(p.from, p.h.upper)
		area.include(p.to, -p.h.lower)
	}
	past := (area.maxX - area.minX) * 0.06
	pinFrom, pinTo := area.minX-past, area.maxX+past
	area.include(pinFrom, 0)
	area.include(pinTo, 0)
	c := newCanvas(area, room{20, 62, 90, 70})
	pin := 0.0
	if d.Pin != nil {
		pin = service.Nominal(&d.Pin.Diameter) / 2
	}
	for i, p := range plates {
		class := "cut lug"
		if i > 0 {
			class = "cut clevis"
		}
		c.rect(class, p.from, p.h.hole, p.to-p.from, p.h.upper-p.h.hole)
		c.rect(class, p.from, -p.h.lower, p.to-p.from, p.h.lower-p.h.hole)
		if p.bushing != nil && pin > 0 {
			long := service.Nominal(p.bushing.Length)
			if long == 0 {
				long = p.to - p.from
			}
			from := (p.from+p.to)/2 - long/2
			c.rect("bushing", from, pin, long, p.h.hole-pin)
			c.rect("bushing", from, -p.h.hole, long, p.h.hole-pin)
		}
	}
	if pin > 0 {
		c.rect("pin", pinFrom, -pin, pinTo-pinFrom, 2*pin)
		if inner := service.Nominal(d.Pin.InnerDiameter) / 2; inner > 0 {
			c.rect("bore", pinFrom, -inner, pinTo-pinFrom, 2*inner)
		}
	}
	c.axis(pinFrom, 0, pinTo, 0, 10)
	unit := " " + lengthUnit(d.Units)
	b1, has1 := workingOf(r, "b1")
	b2, has2 := workingOf(r, "2b2")
	note := ""
	if has1 && has2 && !single {
		// What exceeds its plate is the whole plate.
		b1, b2 = min(b1, clevis.thickness), min(b2, lug.thickness)
		for _, side := range []float64{-1, 1} {
			near := func(at, long float64) { // from a face, in the direction of side
				x := side * at
				for _, y := range []float64{pin, -pin} {
					c.line("governing active", x, y, x+side*long, y)
				}
			}
			near(half+gap, b1)
			near(half-b2/2, b2/2)
		}
		note = " Active thickness: " + number(b1) + unit + " of each leg, " + number(b2) + unit + " of the lug."
	}
	top := area.maxY
	c.dimension(-half, top, half, top, 0, -22, "t "+number(lug.thickness))
	for i, p := range plates[1:] {
		c.dimension(p.from, area.minY, p.to, area.minY, 0, 24, "t "+number(clevis.thickness))
		if i == 0 && gap > 0 && gap*c.scale > 3 {
			c.leader(half+gap/2, top, 0, -38, "gap "+number(gap))
		}
	}
	if pin > 0 {
		c.label("measure", "start", pinTo, 0, 12, -6, "Dp "+number(2*pin))
	}
	c.scaleBar(d.Units)
	return c.figure("The joint cut along the pin, to scale: lug " + number(lug.thickness) + unit + ", clevis " + number(clevis.thickness) + unit + ", gap " + number(gap) + unit + "." + note)
}

// workingOf finds the value of a symbol in the workings of the governing load
// case, else the last.
func workingOf(r *service.Result, name string) (found float64, ok bool) {
	for i := range r.Workings {
		w := &r.Workings[i]
		if w.Symbol != name {
			continue
		}
		found, ok = w.Value, true
		if r.Governing != nil && w.LoadCase != nil && *w.LoadCase == r.Governing.LoadCase {
			break
		}
	}
	return found, ok
}

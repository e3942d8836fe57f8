package pages

import (
	"html/template"
	"math"
	"strconv"
	"strings"
)

// canvas draws to scale. Its geometry is written in the lengths of the
// document, y upward, under one transform, so that what a reader of the SVG
// measures is what was given; labels and arrows are written in pixels beside.
type canvas struct {
	geometry, labels strings.Builder
	area             box
	scale            float64 // pixels a unit of length
	width, height    float64 // pixels
	left, top        float64 // pixels, of the area
}

// box is a rectangle of the document's lengths.
type box struct{ minX, minY, maxX, maxY float64 }

func (b *box) include(x, y float64) {
	b.minX, b.minY = min(b.minX, x), min(b.minY, y)
	b.maxX, b.maxY = max(b.maxX, x), max(b.maxY, y)
}

func emptyBox() box {
	return box{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
}

// room is what a drawing leaves around its area for labels, in pixels.
type room struct{ left, top, right, bottom float64 }

// The most pixels that a drawing has.
const (
	mostWidth  = 640
	mostHeight = 420
)

// newCanvas fits an area into a drawing, with room around it.
func newCanvas(area box, r room) *canvas {
	w, h := area.maxX-area.minX, area.maxY-area.minY
	scale := min((mostWidth-r.left-r.right)/w, (mostHeight-r.top-r.bottom)/h)
	return &canvas{
		area: area, scale: scale, left: r.left, top: r.top,
		width: max(200, w*scale+r.left+r.right), height: h*scale + r.top + r.bottom,
	}
}

// px turns a point into pixels.
func (c *canvas) px(x, y float64) (float64, float64) {
	return c.left + (x-c.area.minX)*c.scale, c.top + (c.area.maxY-y)*c.scale
}

// exact writes a measure with all of its digits, pixel to a hundredth.
func exact(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }
func pixel(x float64) string { return trimZeros(strconv.FormatFloat(x, 'f', 2, 64)) }

// path is the d of a path, in either space.
type path struct {
	b     strings.Builder
	write func(float64) string
}

func (p *path) to(command string, numbers ...float64) *path {
	p.b.WriteString(command)
	for i, n := range numbers {
		if i > 0 {
			p.b.WriteByte(' ')
		}
		p.b.WriteString(p.write(n))
	}
	return p
}

func shape() *path { return &path{write: exact} }
func trace() *path { return &path{write: pixel} }

func (c *canvas) path(class string, p *path) {
	c.geometry.WriteString(`<path class="` + class + `" d="` + p.b.String() + `"/>`)
}

func (c *canvas) circle(class string, x, y, r float64) {
	c.geometry.WriteString(`<circle class="` + class + `" cx="` + exact(x) + `" cy="` + exact(y) + `" r="` + exact(r) + `"/>`)
}

func (c *canvas) rect(class string, x, y, w, h float64) {
	c.geometry.WriteString(`<rect class="` + class + `" x="` + exact(x) + `" y="` + exact(y) + `" width="` + exact(w) + `" height="` + exact(h) + `"/>`)
}

func (c *canvas) line(class string, x1, y1, x2, y2 float64) {
	c.geometry.WriteString(`<line class="` + class + `" x1="` + exact(x1) + `" y1="` + exact(y1) + `" x2="` + exact(x2) + `" y2="` + exact(y2) + `"/>`)
}

// label writes a text at a point of the drawing, moved by so many pixels.
func (c *canvas) label(class, anchor string, x, y, dx, dy float64, text string) {
	px, py := c.px(x, y)
	c.text(class, anchor, px+dx, py+dy, text)
}

func (c *canvas) text(class, anchor string, px, py float64, text string) {
	c.labels.WriteString(`<text class="` + class + `" text-anchor="` + anchor + `" x="` + pixel(px) + `" y="` + pixel(py) + `">` + escape(text) + `</text>`)
}

// arrow draws an arrow between two points in pixels, its head at the second.
func (c *canvas) arrow(class string, x1, y1, x2, y2 float64) {
	dx, dy := x2-x1, y2-y1
	size := math.Hypot(dx, dy)
	if size == 0 {
		return
	}
	dx, dy = dx/size, dy/size
	head := min(9, size/2)
	p := trace().to("M", x1, y1).to("L", x2-dx*head*0.8, y2-dy*head*0.8)
	c.labels.WriteString(`<path class="` + class + ` shaft" d="` + p.b.String() + `"/>`)
	p = trace().to("M", x2, y2).to("L", x2-dx*head-dy*head*0.4, y2-dy*head+dx*head*0.4).
		to("L", x2-dx*head+dy*head*0.4, y2-dy*head-dx*head*0.4).to("Z")
	c.labels.WriteString(`<path class="` + class + ` head" d="` + p.b.String() + `"/>`)
}

// dimension draws a dimension line between two points of the drawing, moved
// aside by so many pixels, with its text.
func (c *canvas) dimension(x1, y1, x2, y2, dx, dy float64, text string) {
	ax, ay := c.px(x1, y1)
	bx, by := c.px(x2, y2)
	p := trace().to("M", ax, ay).to("L", ax+dx*1.15, ay+dy*1.15).to("M", bx, by).to("L", bx+dx*1.15, by+dy*1.15)
	c.labels.WriteString(`<path class="extension" d="` + p.b.String() + `"/>`)
	mx, my := (ax+bx)/2+dx, (ay+by)/2+dy
	ends := func(fromX, fromY, toX, toY float64) { c.arrow("dimension", fromX, fromY, toX, toY) }
	ends(mx, my, ax+dx, ay+dy)
	ends(mx, my, bx+dx, by+dy)
	if math.Abs(ax-bx) < math.Abs(ay-by) {
		anchor, shift := "end", -6.0
		if dx > 0 {
			anchor, shift = "start", 6
		}
		c.text("measure", anchor, mx+shift, my+4, text)
		return
	}
	shift := -5.0
	if dy > 0 {
		shift = 15
	}
	c.text("measure", "middle", mx, my+shift, text)
}

// figure closes the drawing. The title is what somebody hears who cannot see
// it.
func (c *canvas) figure(title string) template.HTML {
	transform := "translate(" + pixel(c.left-c.area.minX*c.scale) + " " + pixel(c.top+c.area.maxY*c.scale) + ") scale(" + exact(c.scale) + " " + exact(-c.scale) + ")"
	return template.HTML(`<svg viewBox="0 0 ` + pixel(c.width) + ` ` + pixel(c.height) + `" width="` + pixel(c.width) + `" height="` + pixel(c.height) +
		`" role="img" aria-label="` + escape(title) + `"><g class="geometry" transform="` + transform + `">` +
		c.geometry.String() + `</g><g>` + c.labels.String() + `</g></svg>`)
}

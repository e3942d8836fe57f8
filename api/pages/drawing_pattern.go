package pages

import (
	"html/template"
	"math"
	"slices"

	"jointledger/service"
)

// patternPlan draws a pattern: the outlines of its plates, the fasteners at
// their size, the shear on each as a vector with a disc that grows with it, and
// the edge distances and pitches that break a rule.
func patternPlan(d *service.GroupDocument, r *service.Result) template.HTML {
	area := emptyBox()
	for _, f := range d.Fasteners {
		area.include(f.X-f.Diameter, f.Y-f.Diameter)
		area.include(f.X+f.Diameter, f.Y+f.Diameter)
	}
	for _, plate := range *d.Plates {
		for _, p := range plate.Outline {
			area.include(p[0], p[1])
		}
	}
	shares, loadCase := drawnShares(r)
	c := newCanvas(area, room{24, 24, 24, 50})
	for i, plate := range *d.Plates {
		if len(plate.Outline) < 3 {
			continue
		}
		p := shape().to("M", plate.Outline[0][0], plate.Outline[0][1])
		for _, point := range plate.Outline[1:] {
			p.to("L", point[0], point[1])
		}
		class := "solid"
		if i > 0 {
			class = "outline"
		}
		c.path(class, p.to("Z"))
	}
	most := 0.0
	for i := range shares {
		most = max(most, shares[i].ShearResultant)
	}
	near := d.Neighbours()
	spacing := patternSpacing(d, near)
	if most > 0 {
		for i, f := range d.Fasteners {
			if i < len(shares) {
				c.circle("share", f.X, f.Y, f.Diameter/2+(spacing/2-f.Diameter/2)*0.85*math.Sqrt(shares[i].ShearResultant/most))
			}
		}
	}
	for _, f := range d.Fasteners {
		class := "fastener"
		if r != nil && r.Governing != nil && r.Governing.Fastener != nil && *r.Governing.Fastener == f.ID {
			class = "fastener governing"
		}
		c.circle(class, f.X, f.Y, f.Diameter/2)
	}
	c.brokenRules(d, r, near)
	few := len(d.Fasteners) <= 40
	long := 0.9 * spacing * c.scale
	for i, f := range d.Fasteners {
		x, y := c.px(f.X, f.Y)
		if most > 0 && i < len(shares) {
			s := shares[i].Shear
			c.arrow("vector", x, y, x+s[0]/most*long, y-s[1]/most*long)
		}
		if few {
			c.text("id", "end", x-f.Diameter/2*c.scale-3, y+f.Diameter/2*c.scale+9, clip(f.ID, 8))
		}
	}
	if r != nil && r.Centroid != nil {
		x, y := c.px(r.Centroid[0], r.Centroid[1])
		p := trace().to("M", x-7, y).to("L", x+7, y).to("M", x, y-7).to("L", x, y+7)
		c.labels.WriteString(`<path class="centroid" d="` + p.b.String() + `"/>`)
	}
	c.scaleBar(d.Units)
	title := "The pattern of " + number(float64(len(d.Fasteners))) + " fasteners, to scale."
	if loadCase != "" && most > 0 {
		title += " Arrows are the shear on each fastener in load case " + loadCase + ", the longest " + number(most) + " " + forceUnit(d.Units) + "."
	}
	return c.figure(title)
}

// patternSpacing is the least distance between two fasteners, or what stands
// for it.
func patternSpacing(d *service.GroupDocument, near []service.Neighbour) float64 {
	least := math.Inf(1)
	for _, n := range near {
		least = min(least, n.Distance)
	}
	if math.IsInf(least, 1) || least == 0 {
		return 4 * d.Fasteners[0].Diameter
	}
	return least
}

// drawnShares are those of the governing load case, else of the first listed.
func drawnShares(r *service.Result) ([]service.FastenerShare, string) {
	if r == nil || len(r.Shares) == 0 {
		return nil, ""
	}
	i := 0
	if r.Governing != nil {
		i = max(0, slices.IndexFunc(r.Shares, func(s service.CaseShares) bool { return s.LoadCase == r.Governing.LoadCase }))
	}
	return r.Shares[i].Fasteners, r.Shares[i].LoadCase
}

// brokenRules draws each edge distance and pitch that a finding is about.
func (c *canvas) brokenRules(d *service.GroupDocument, r *service.Result, near []service.Neighbour) {
	if r == nil {
		return
	}
	at := map[string]int{}
	for i, f := range d.Fasteners {
		at["fastener "+f.ID] = i
	}
	for _, finding := range r.Findings {
		i, ok := at[finding.Subject]
		if !ok || finding.Severity == "note" {
			continue
		}
		f := d.Fasteners[i]
		class := "broken " + finding.Severity
		switch finding.Code {
		case "edge-distance":
			if x, y, ok := nearestSide(d, f.X, f.Y); ok {
				c.line(class, f.X, f.Y, x, y)
			}
		case "pitch":
			if j := near[i].Index; j >= 0 {
				c.line(class, f.X, f.Y, d.Fasteners[j].X, d.Fasteners[j].Y)
			}
		}
	}
}

// nearestSide is the point of any outline that is closest to a point.
func nearestSide(d *service.GroupDocument, x, y float64) (atX, atY float64, ok bool) {
	least := math.Inf(1)
	for _, plate := range *d.Plates {
		for i, a := range plate.Outline {
			b := plate.Outline[(i+1)%len(plate.Outline)]
			dx, dy := b[0]-a[0], b[1]-a[1]
			along := 0.0
			if size := dx*dx + dy*dy; size > 0 {
				along = min(1, max(0, ((x-a[0])*dx+(y-a[1])*dy)/size))
			}
			px, py := a[0]+along*dx, a[1]+along*dy
			if distance := math.Hypot(px-x, py-y); distance < least {
				atX, atY, least, ok = px, py, distance, true
			}
		}
	}
	return atX, atY, ok
}

package pages

import (
	"html/template"
	"math"
	"slices"

	"jointledger/service"
)

// spliceSection draws members and rows in section, lengths to scale and
// thicknesses enlarged by the factor that it tells, with the load of each row
// as bars above it.
func spliceSection(d *service.SpliceDocument, r *service.Result) template.HTML {
	rows := len(d.Rows)
	x := make([]float64, rows)
	for i := 1; i < rows && i <= len(d.Pitches); i++ {
		x[i] = x[i-1] + d.Pitches[i-1]
	}
	end := 2.5 * d.Rows[0].Diameter
	if rows > 1 {
		end = (x[rows-1] - x[0]) / float64(rows-1) * 0.6
	}
	type layer struct {
		m         *service.SpliceMember
		thickness []float64 // of the bays from its first row on, and past its ends
		deep      float64
		last      int
	}
	layers := make([]layer, len(d.Members))
	sum := 0.0
	for i := range d.Members {
		m := &d.Members[i]
		l := layer{m: m, last: *m.LastRow}
		for _, b := range m.Bays {
			l.thickness = append(l.thickness, b.Thickness)
		}
		if len(l.thickness) == 0 && len(m.RowThickness) > 0 {
			l.thickness = m.RowThickness[:1]
		}
		if len(l.thickness) == 0 {
			l.thickness = []float64{d.Rows[0].Diameter / 2}
		}
		l.deep = slices.Max(l.thickness)
		sum += l.deep
		layers[i] = l
	}
	span := x[rows-1] + 2*end
	enlarged := 1.0
	if least := span / 7; sum < least {
		enlarged = math.Max(1, math.Floor(least/sum))
	}
	total := sum * enlarged
	bars := span / 4.5 // room for them above
	c := newCanvas(box{-end, -total, x[rows-1] + end, bars}, room{74, 8, 16, 66})
	y := 0.0
	for i, l := range layers {
		slot := l.deep * enlarged
		first := *l.m.FirstRow - 1
		place := func(from, to, thickness float64) {
			t := thickness * enlarged
			top := y - (slot-t)/2
			switch {
			case len(layers) > 1 && i == 0:
				top = y - (slot - t)
			case i == len(layers)-1:
				top = y
			}
			class := "cut clevis"
			if i%2 == 0 {
				class = "cut lug"
			}
			c.rect(class, from, top-t, to-from, t)
		}
		place(x[first]-end, x[first], l.thickness[0])
		for k := first; k < l.last-1 && k < rows-1; k++ {
			place(x[k], x[k+1], l.thickness[min(k-first, len(l.thickness)-1)])
		}
		lastRow := min(l.last, rows) - 1
		place(x[lastRow], x[lastRow]+end, l.thickness[len(l.thickness)-1])
		c.label("measure", "end", -end, y-slot/2, -6, 4, clip(l.m.ID, 10))
		y -= slot
	}
	for i, row := range d.Rows {
		class := "pin"
		if r != nil && r.Governing != nil && r.Governing.Row != nil && *r.Governing.Row == i+1 {
			class = "pin governing"
		}
		past := total * 0.08
		c.rect(class, x[i]-row.Diameter/2, -total-past, row.Diameter, total+2*past)
		c.label("id", "middle", x[i], -total, 0, 26, number(float64(i+1)))
	}
	loadCase := c.rowLoads(d, r, x, bars)
	c.scaleBar(d.Units)
	title := "The splice in section, lengths to scale"
	if enlarged > 1 {
		title += ", thicknesses " + number(enlarged) + " times theirs"
		c.text("measure", "end", c.width-14, c.height-11, "thickness ×"+number(enlarged))
	}
	if loadCase != "" {
		title += ". Bars are the share of the load that each row passes on in load case " + loadCase
	}
	return c.figure(title + ".")
}

// rowLoads draws a bar for each interface of each row, by its share.
func (c *canvas) rowLoads(d *service.SpliceDocument, r *service.Result, x []float64, room float64) string {
	if r == nil || len(r.Transfers) == 0 {
		return ""
	}
	i := 0
	if r.Governing != nil {
		i = max(0, slices.IndexFunc(r.Transfers, func(t service.CaseTransfers) bool { return t.LoadCase == r.Governing.LoadCase }))
	}
	t := &r.Transfers[i]
	most := 0.0
	for _, row := range t.Rows {
		for _, one := range row.Interfaces {
			most = max(most, math.Abs(one.Share))
		}
	}
	if most == 0 {
		return ""
	}
	base, tall := room*0.22, room*0.62
	pitch := 4 * d.Rows[0].Diameter
	for _, p := range d.Pitches {
		pitch = min(pitch, p)
	}
	for k, row := range t.Rows {
		if k >= len(x) || len(row.Interfaces) == 0 {
			continue
		}
		wide := min(pitch*0.5, 26/c.scale) / float64(len(row.Interfaces))
		for j, one := range row.Interfaces {
			left := x[k] + (float64(j)-float64(len(row.Interfaces))/2)*wide
			c.rect("bar", left, base, wide*0.9, tall*math.Abs(one.Share)/most)
			if len(t.Rows) <= 16 {
				dy := -5.0
				if j%2 == 1 {
					dy = -17
				}
				c.label("measure", "middle", left+wide*0.45, base+tall*math.Abs(one.Share)/most, 0, dy, percent(one.Share))
			}
		}
	}
	c.line("outline", c.area.minX, base, c.area.maxX, base)
	return t.LoadCase
}

func percent(share float64) string { return signed(trimZeros(fixed(100*share, 1))) + thinSpace + "%" }

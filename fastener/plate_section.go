package fastener

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"jointledger/strength"
)

// rows are the sections across a plate at each station of its fasteners along
// its axis, from the free end to where the plate is held or loaded. What the
// fasteners up to a station put on the plate passes through the section there.
type rows struct {
	plate     int
	cos, sin  float64
	order     []int32   // fasteners by station
	s, w      []float64 // of each fastener, along and across the axis
	sections  []section
	upTo      [strength.Ultimate + 1][]passing // of each in order
	thickness float64                          // t
}

// passing are the sums of what the fasteners up to one put on the plate: along
// the axis, across it, and the moment about the first fastener of the pattern.
type passing struct{ along, across, moment float64 }

// section is one row's section: net segments across it, and what they amount to.
type section struct {
	last     int // the last fastener of the row, in order
	first    int // the first fastener of the row, as in the request
	station  float64
	segments [][2]float64
	area     float64
	centre   float64 // of the net section, across
	second   float64
	gross    float64 // area without holes
	next     float64 // to the next row's station, 0 for the last
}

// tanCountersink widens a section's hole by the cone of a 100° countersink.
var tanCountersink = math.Tan(50 * math.Pi / 180)

// newRows returns nil for a plate without axis, outline or material.
func (p *PreparedPattern) newRows(k int) *rows {
	plate := &p.pattern.Plates[k]
	if plate.AxisAngle == nil || p.outlines[k] == nil || plate.Material == nil {
		return nil
	}
	n := len(p.pattern.Fasteners)
	r := &rows{plate: k, order: make([]int32, n), s: make([]float64, n), w: make([]float64, n), thickness: plate.Thickness}
	r.cos, r.sin = plate.axis()
	origin := p.pattern.Fasteners[0]
	for i, f := range p.pattern.Fasteners {
		r.order[i] = int32(i)
		x, y := f.X-origin.X, f.Y-origin.Y
		r.s[i] = float64(r.cos*x) + float64(r.sin*y)
		r.w[i] = float64(r.cos*y) - float64(r.sin*x)
	}
	slices.SortStableFunc(r.order, func(a, b int32) int {
		switch {
		case r.s[a] < r.s[b]:
			return -1
		case r.s[a] > r.s[b]:
			return 1
		}
		return 0
	})
	for from := 0; from < n; {
		to := from + 1
		tolerance := strength.Within * p.pattern.Fasteners[r.order[from]].hole()
		for to < n && r.s[r.order[to]]-r.s[r.order[from]] <= tolerance {
			to++
		}
		r.sections = append(r.sections, p.cut(r, from, to))
		from = to
	}
	for i := range r.sections[:len(r.sections)-1] {
		r.sections[i].next = r.sections[i+1].station - r.sections[i].station
	}
	for level := range r.upTo {
		r.upTo[level] = make([]passing, n)
	}
	return r
}

// cut makes the section through the row of the fasteners from..to in order.
func (p *PreparedPattern) cut(r *rows, from, to int) section {
	plate := &p.pattern.Plates[r.plate]
	c := section{last: to - 1, first: int(slices.Min(r.order[from:to])), station: r.s[r.order[from]]}
	origin := p.pattern.Fasteners[0]
	var crossings []float64
	for _, side := range p.outlines[r.plate] {
		s1, w1 := r.turn(side.x1-origin.X, side.y1-origin.Y)
		s2, w2 := r.turn(side.x2-origin.X, side.y2-origin.Y)
		if (s1 > c.station) != (s2 > c.station) {
			crossings = append(crossings, w1+float64((w2-w1)*((c.station-s1)/(s2-s1))))
		}
	}
	slices.Sort(crossings)
	var holes [][2]float64
	hole := func(i int32) bool {
		f := &p.pattern.Fasteners[i]
		radius, off := f.hole()/2, r.s[i]-c.station
		if math.Abs(off) >= radius {
			return false
		}
		half := math.Sqrt(float64(radius*radius)-float64(off*off)) + float64(plate.CountersinkDepth*plate.CountersinkDepth*tanCountersink)/(2*plate.Thickness)
		holes = append(holes, [2]float64{r.w[i] - half, r.w[i] + half})
		return true
	}
	// Holes of the row, and of rows so near that the section cuts them too.
	widest := 0.0
	for i := range p.pattern.Fasteners {
		widest = max(widest, p.pattern.Fasteners[i].hole()/2)
	}
	for at := from; at < len(r.order) && r.s[r.order[at]]-c.station < widest; at++ {
		hole(r.order[at])
	}
	for at := from - 1; at >= 0 && c.station-r.s[r.order[at]] < widest; at-- {
		hole(r.order[at])
	}
	slices.SortFunc(holes, func(a, b [2]float64) int {
		if a[0] < b[0] {
			return -1
		}
		return 1
	})
	t := plate.Thickness
	for i := 0; i+1 < len(crossings); i += 2 {
		lo, hi := crossings[i], crossings[i+1]
		// A part of the plate without a fastener of the row bears none of it.
		if !slices.ContainsFunc(r.order[from:to], func(i int32) bool { return lo < r.w[i] && r.w[i] < hi }) {
			continue
		}
		c.gross += float64(t * (hi - lo))
		at := lo
		for _, h := range holes {
			if h[1] <= at || h[0] >= hi {
				continue
			}
			if h[0] > at {
				c.segments = append(c.segments, [2]float64{at, h[0]})
			}
			at = h[1]
		}
		if at < hi {
			c.segments = append(c.segments, [2]float64{at, hi})
		}
	}
	var first, second float64
	for _, g := range c.segments {
		a, b := g[0], g[1]
		c.area += float64(t * (b - a))
		first += float64(t * (b - a) * ((a + b) / 2))
	}
	if c.area > 0 {
		c.centre = first / c.area
	}
	for _, g := range c.segments {
		a, b := g[0]-c.centre, g[1]-c.centre
		second += float64(t*(float64(b*b*b)-float64(a*a*a))) / 3
	}
	c.second = second
	return c
}

// staggered returns the first fastener of the first row that stands closer to
// the next than two holes, -1 where none does.
func (r *rows) staggered(p *PreparedPattern) int {
	for _, c := range r.sections {
		if c.next > 0 && c.next < 2*p.pattern.Fasteners[c.first].hole() {
			return c.first
		}
	}
	return -1
}

func (r *rows) turn(x, y float64) (s, w float64) {
	return float64(r.cos*x) + float64(r.sin*y), float64(r.cos*y) - float64(r.sin*x)
}

// sum fills the sums of one level's shares.
func (r *rows) sum(level strength.Level, p *PreparedPattern, shares []Share) {
	var sum passing
	for at, i := range r.order {
		part := p.loadShare(int(i), r.plate)
		if r.plate == 0 {
			part = -part // the fastener pushes the attached member back
		}
		along, across := r.turn(part*shares[i].Shear[0], part*shares[i].Shear[1])
		sum.along += along
		sum.across += across
		sum.moment += float64(r.s[i]*across) - float64(r.w[i]*along)
		r.upTo[level][at] = sum
	}
}

// through returns the pull and the moment through a section at its centre.
func (r *rows) through(level strength.Level, c *section) (pull, moment float64) {
	sum := r.upTo[level][c.last]
	return -sum.along, sum.moment - float64(c.station*sum.across) + float64(c.centre*sum.along)
}

// fibres returns the stress at the two edges of a section.
func (r *rows) fibres(level strength.Level, c *section) (one, two float64) {
	pull, moment := r.through(level, c)
	lo, hi := c.segments[0][0], c.segments[len(c.segments)-1][1]
	one, two = pull/c.area, pull/c.area
	if c.second > 0 {
		one += float64(moment*(lo-c.centre)) / c.second
		two += float64(moment*(hi-c.centre)) / c.second
	}
	return one, two
}

// netSectionCheck is a plate across one of its rows, in tension and bending in
// its plane, at the fibre most stretched.
type netSectionCheck struct {
	place
	rows     *rows
	section  *section
	strength strength.Property
	why      *strength.Message
}

// addNetSections adds the checks of the rows of plate k whose first fastener is
// i, ultimate and yield.
func (p *PreparedPattern) addNetSections(i, k int) {
	r := p.rows[k]
	if r == nil {
		return
	}
	plate := &p.pattern.Plates[k]
	for n := range r.sections {
		c := &r.sections[n]
		if c.first != i {
			continue
		}
		for _, level := range []strength.Level{strength.Ultimate, strength.Limit} {
			property := strength.Ftu
			if level == strength.Limit {
				property = strength.Fty
			}
			var why strength.Message
			switch {
			case c.area <= 0:
				why = strength.Say("holes leave nothing of plate %q across the row of fastener %q", plate.ID, p.pattern.Fasteners[i].ID)
			case plate.Material.Value(property) == 0:
				why = strength.Say("the material %q has no %s", plate.Material.Name, property)
			}
			check := strength.Check{
				Member: plate.ID, Mode: strength.NetSection, Level: level, Unit: strength.Stress, Method: methodPlateSection, Source: sourcePlateSection,
				Mark: strength.Weakest(strength.Derived, p.shearMark(level), plate.Material.MarkOf(property)),
			}
			p.assessments = append(p.assessments, &netSectionCheck{p.place(i, check, safety{}), r, c, property, reason(why)})
		}
	}
}

func (a *netSectionCheck) material() *strength.Material {
	return a.p.pattern.Plates[a.rows.plate].Material
}

func (a *netSectionCheck) margin(c *caseState) strength.Margin {
	if a.why != nil {
		return strength.Unknown(a.why)
	}
	one, two := a.rows.fibres(a.c.Level, a.section)
	return strength.Compare(max(one, two, 0)*a.factor[c.level], a.material().Value(a.strength))
}

func (a *netSectionCheck) steps() []strength.Working {
	s := a.rows.geometrySteps(a.p, a.section)
	if a.why == nil {
		s.add(string(a.strength), a.material().Value(a.strength), strength.Stress, "", materialSource(a.material()), a.material().MarkOf(a.strength))
	}
	return append(a.p.shearSteps(a.c.Level), s.steps...)
}

// geometrySteps are those of a section and of the places of the fasteners
// along and across the axis.
func (r *rows) geometrySteps(p *PreparedPattern, c *section) (a allowable) {
	plate := &p.pattern.Plates[r.plate]
	origin := p.pattern.Fasteners[0]
	s0, w0 := r.turn(origin.X, origin.Y) // places are counted from the axes of the pattern
	for _, s := range []struct {
		symbol, source string
		value          float64
	}{{"a_x", "cosine of plates.axis_angle", r.cos}, {"a_y", "sine of plates.axis_angle", r.sin}} {
		a.steps = append(a.steps, strength.Working{Member: plate.ID, Method: methodPlateSection, Symbol: s.symbol, Value: s.value, Source: s.source})
	}
	a.add("t", plate.Thickness, strength.Length, "", "input: plates.thickness", strength.Given)
	a.add("ξ_0", s0+c.station, strength.Length, "", "station of the row along the axis", strength.Derived)
	var area, first, second []string
	for n, g := range c.segments {
		lo, hi := fmt.Sprintf("η_a%d", n+1), fmt.Sprintf("η_b%d", n+1)
		const source = "an end of a net segment across the row, from outline and holes"
		a.add(lo, w0+g[0], strength.Length, "", source, strength.Derived)
		a.add(hi, w0+g[1], strength.Length, "", source, strength.Derived)
		area = append(area, "("+hi+" - "+lo+")")
		first = append(first, "("+hi+"² - "+lo+"²)")
		second = append(second, "(("+hi+" - η_0)³ - ("+lo+" - η_0)³)")
	}
	if len(c.segments) == 0 {
		return a
	}
	a.add("A_net", c.area, strength.Area, "t ("+strings.Join(area, " + ")+")", "net area across the row", strength.Derived)
	a.add("η_0", w0+c.centre, strength.Length, "t ("+strings.Join(first, " + ")+") / (2 A_net)", "its centre", strength.Derived)
	a.add("I_net", c.second, strength.Quartic, "t ("+strings.Join(second, " + ")+") / 3", "its second moment in the plane", strength.Derived)
	return a
}

// throughSteps write what passes through a section in a load case.
func (r *rows) throughSteps(p *PreparedPattern, c *caseState, i int, level strength.Level, cut *section) []strength.Working {
	steps := p.allShearCaseSteps(c, i, level)
	origin := p.pattern.Fasteners[0]
	s0, w0 := r.turn(origin.X, origin.Y)
	var a allowable
	for at := 0; at <= cut.last; at++ {
		j := int(r.order[at])
		id := p.pattern.Fasteners[j].ID
		add := func(symbol string, value float64, unit strength.Unit, equation, source string, mark strength.Mark) {
			step := patternStep(symbol, value, unit, equation, source, mark)
			step.Member, step.Method, step.Fastener = p.pattern.Plates[r.plate].ID, methodPlateSection, id
			a.steps = append(a.steps, step)
		}
		part := p.loadShare(j, r.plate)
		x, y := "ψ V_x", "ψ V_y"
		if r.plate == 0 {
			part, x, y = -part, "- ψ V_x", "- ψ V_y"
		}
		shear := c.shares[level][j].Shear
		add("ψ", math.Abs(part), strength.None, "", "part of the fastener's load that this plate bears", strength.Given)
		add("ξ", s0+r.s[j], strength.Length, "a_x x + a_y y", "along the axis", strength.Derived)
		add("η", w0+r.w[j], strength.Length, "a_x y - a_y x", "across the axis", strength.Derived)
		add("g_x", part*shear[0], strength.Force, x, "what the fastener puts on this plate; it lies between the free end and the row", strength.Derived)
		add("g_y", part*shear[1], strength.Force, y, "the same", strength.Derived)
	}
	pull, moment := r.through(level, cut)
	a.add("N", pull, strength.Force, "- Σ(a_x g_x + a_y g_y)", "pull through the row", strength.Derived)
	a.add("M", moment, strength.Moment, "Σ((ξ - ξ_0) (a_x g_y - a_y g_x) - (η - η_0) (a_x g_x + a_y g_y))", "moment through the row at its centre", strength.Derived)
	return append(steps, a.steps...)
}

func (a *netSectionCheck) caseSteps(c *caseState, i int) []strength.Working {
	if a.why != nil {
		return nil
	}
	steps := a.rows.throughSteps(a.p, c, i, a.c.Level, a.section)
	one, two := a.rows.fibres(a.c.Level, a.section)
	last := fmt.Sprintf("η_b%d", len(a.section.segments))
	fibre := "max(N / A_net + M (" + last + " - η_0) / I_net, N / A_net + M (η_a1 - η_0) / I_net, 0)"
	steps = append(steps, strength.Working{
		Symbol: "σ", Value: max(one, two, 0), Unit: strength.Stress, Equation: fibre,
		Source: "stress of the fibre most stretched, elastic; the section's shear is left out", Mark: strength.Derived,
	})
	return append(steps, a.demandSteps(c, "σ", max(one, two, 0), string(a.strength), a.margin(c))...)
}

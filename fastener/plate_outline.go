package fastener

import (
	"math"

	"jointledger/strength"
)

// mostOutlinePoints bounds the search for crossing sides, which compares each
// side with each other.
const mostOutlinePoints = 1000

// side is one straight side of an outline.
type side struct{ x1, y1, x2, y2 float64 }

// sides returns the sides of a closed polygon; a last point equal to the first
// closes it once.
func sides(outline [][2]float64) []side {
	n := len(outline)
	if n > 1 && outline[0] == outline[n-1] {
		n--
	}
	all := make([]side, 0, n)
	for i := range n {
		a, b := outline[i], outline[(i+1)%n]
		all = append(all, side{a[0], a[1], b[0], b[1]})
	}
	return all
}

// turn is twice the signed area of the triangle from the side to a point; zero
// when the point is on the side's line within the tolerance of limits.
func (s side) turn(x, y float64) float64 {
	p, q := float64((s.x2-s.x1)*(y-s.y1)), float64((s.y2-s.y1)*(x-s.x1))
	if t := p - q; math.Abs(t) > strength.Within*(math.Abs(p)+math.Abs(q)) {
		return t
	}
	return 0
}

func (s side) boxed(x, y float64) bool {
	return min(s.x1, s.x2) <= x && x <= max(s.x1, s.x2) && min(s.y1, s.y2) <= y && y <= max(s.y1, s.y2)
}

// meets reports whether two sides have a point in common.
func (s side) meets(t side) bool {
	a, b := s.turn(t.x1, t.y1), s.turn(t.x2, t.y2)
	c, d := t.turn(s.x1, s.y1), t.turn(s.x2, s.y2)
	if (a > 0 && b < 0 || a < 0 && b > 0) && (c > 0 && d < 0 || c < 0 && d > 0) {
		return true
	}
	return a == 0 && s.boxed(t.x1, t.y1) || b == 0 && s.boxed(t.x2, t.y2) ||
		c == 0 && t.boxed(s.x1, s.y1) || d == 0 && t.boxed(s.x2, s.y2)
}

// outlineFault says what keeps an outline from bounding an area.
func outlineFault(outline [][2]float64) strength.Message {
	if len(outline) > mostOutlinePoints {
		return strength.Say("an outline has at most %d points, found %d", mostOutlinePoints, len(outline))
	}
	all := sides(outline)
	if len(all) < 3 {
		return strength.Say("an outline needs at least 3 points, found %d", len(all))
	}
	for i, s := range all {
		if s.x1 == s.x2 && s.y1 == s.y2 {
			return strength.Say("points %d and %d of the outline are the same", i, (i+1)%len(all))
		}
	}
	inLine := true
	for _, s := range all {
		inLine = inLine && all[0].turn(s.x2, s.y2) == 0
	}
	if inLine {
		return strength.Say("the outline bounds no area: its points lie in one line")
	}
	for i, s := range all {
		next := all[(i+1)%len(all)]
		// Neighbours share a point; they overlap only by folding back.
		if s.turn(next.x2, next.y2) == 0 && float64((s.x2-s.x1)*(next.x2-next.x1))+float64((s.y2-s.y1)*(next.y2-next.y1)) < 0 {
			return strength.Say("the outline folds back on itself at point %d", (i+1)%len(all))
		}
	}
	for i, s := range all {
		for j := i + 2; j < len(all); j++ {
			if i == 0 && j == len(all)-1 {
				continue
			}
			if s.meets(all[j]) {
				return strength.Say("the outline crosses or touches itself: its sides %d and %d meet", i, j)
			}
		}
	}
	return strength.Message{}
}

// contains reports whether a point lies inside the polygon of the sides.
func contains(all []side, x, y float64) bool {
	inside := false
	for _, s := range all {
		if (s.y1 > y) != (s.y2 > y) && x < s.x1+float64((s.x2-s.x1)*((y-s.y1)/(s.y2-s.y1))) {
			inside = !inside
		}
	}
	return inside
}

// nearest returns the distance from a point to the nearest side, that side, and
// where along it the foot lies: 0 its first end, 1 its second.
func nearest(all []side, x, y float64) (distance float64, which int, along float64) {
	distance = math.Inf(1)
	for i, s := range all {
		dx, dy := s.x2-s.x1, s.y2-s.y1
		length := math.Hypot(dx, dy)
		ux, uy := dx/length, dy/length
		a := (float64(ux*(x-s.x1)) + float64(uy*(y-s.y1))) / length
		var d float64
		switch {
		case a <= 0:
			d, a = math.Hypot(x-s.x1, y-s.y1), 0
		case a >= 1:
			d, a = math.Hypot(x-s.x2, y-s.y2), 1
		default:
			d = math.Abs(float64(ux*(y-s.y1)) - float64(uy*(x-s.x1)))
		}
		if d < distance {
			distance, which, along = d, i, a
		}
	}
	return distance, which, along
}

// edgeDistance is the distance from a hole's centre to the nearest side.
type edgeDistance struct {
	e     float64
	side  side
	along float64
	// given is the source of a distance that is given as such.
	given string
}

// steps write the edge distance out, from the ends of the nearest side.
func (d edgeDistance) steps(x, y float64) (a allowable) {
	if d.given != "" {
		a.value = d.e
		a.add("e", d.e, strength.Length, "", d.given, strength.Given)
		return a
	}
	a.add("x", x, strength.Length, "", "input: fasteners.x", strength.Given)
	a.add("y", y, strength.Length, "", "input: fasteners.y", strength.Given)
	const given = "input: plates.outline, nearest side"
	const source = "hole centre to the nearest side of the outline"
	if d.along < 1 {
		a.add("x_1", d.side.x1, strength.Length, "", given, strength.Given)
		a.add("y_1", d.side.y1, strength.Length, "", given, strength.Given)
	}
	if d.along > 0 {
		a.add("x_2", d.side.x2, strength.Length, "", given, strength.Given)
		a.add("y_2", d.side.y2, strength.Length, "", given, strength.Given)
	}
	equation := "|(x_2 - x_1) (y - y_1) - (y_2 - y_1) (x - x_1)| / sqrt((x_2 - x_1)² + (y_2 - y_1)²)"
	switch d.along {
	case 0:
		equation = "sqrt((x - x_1)² + (y - y_1)²)"
	case 1:
		equation = "sqrt((x - x_2)² + (y - y_2)²)"
	}
	a.value = d.e
	a.add("e", d.e, strength.Length, equation, source, strength.Derived)
	return a
}

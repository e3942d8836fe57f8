package lug

import (
	"math"

	"jointledger/strength"
)

// A load across the head is carried by four sections around the hole.

const depthSource = "section depths of a head under a transverse load (AFFDL-TR-69-42 figure 9-8, NASA TM X-73305 section B2)"

var (
	eqDepth14    = Equation{Symbol: "h1", Text: "W/2 - o_y - D/2 cos(45)", Unit: strength.Length, Source: depthSource + ": from the bore 45° toward the body, parallel to the load, to the outline", Mark: strength.FromMemory(75)}
	eqDepth4     = Equation{Symbol: "h4", Text: "W/2 + o_y - D/2 cos(45)", Unit: strength.Length, Source: depthSource + ": as h1, on the other side", Mark: strength.FromMemory(75)}
	eqDepth2     = Equation{Symbol: "h2", Text: "W/2 - o_y - D/2", Unit: strength.Length, Source: depthSource + ": on the normal through the hole centre", Mark: strength.FromMemory(75)}
	eqDepth3     = Equation{Symbol: "h3", Text: "min(c1, e) - D/2", Unit: strength.Length, Source: depthSource + ": the least radial depth of the head", Mark: strength.FromMemory(75)}
	eqTowardPlus = Equation{Symbol: "o_y", Text: "o", Unit: strength.Length, Source: geometrySource + ": the offset toward the side that the load acts to", Mark: strength.Derived}
	eqTowardLess = Equation{Symbol: "o_y", Text: "-o", Unit: strength.Length, Source: geometrySource + ": the offset toward the side that the load acts to", Mark: strength.Derived}
	eqDepth      = Equation{Symbol: "h_av", Text: "6 / (3/h1 + 1/h2 + 1/h3 + 1/h4)", Unit: strength.Length, Source: depthSource, Mark: strength.FromMemory(95)}
)

var depthEquations = []*Equation{&eqTowardPlus, &eqTowardLess, &eqDepth14, &eqDepth2, &eqDepth3, &eqDepth4, &eqDepth}

// depth is h_av of a transverse load toward +y (hand 0) or -y (hand 1), in mm.
// +y is the side to which the load acts; h1 and h4 lie behind the hole, where
// every outline has parallel sides.
func (p *part) depth(s *sheet, hand int) float64 {
	var d [4]float64
	if own := p.head.SectionDepths; own != nil {
		for i := range d {
			d[i] = s.input(p.member, [...]string{"h1", "h2", "h3", "h4"}[i], own[i], strength.Length, p.first+fieldDepths)
		}
	} else {
		half, bore, end := p.width(s)/2, p.hole(s)/2, p.edge(s)
		c1 := p.side(s)
		toward := p.head.Offset
		e := &eqTowardPlus
		if hand == 1 {
			toward, e = -toward, &eqTowardLess
		}
		s.apply(e, toward)
		back := bore * math.Sqrt2 / 2
		d = [4]float64{
			s.apply(&eqDepth14, half-toward-back), s.apply(&eqDepth2, half-toward-bore),
			s.apply(&eqDepth3, min(c1, end)-bore), s.apply(&eqDepth4, half+toward-back),
		}
	}
	return s.apply(&eqDepth, 6/(3/d[0]+1/d[1]+1/d[2]+1/d[3]))
}

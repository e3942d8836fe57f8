package lug

import (
	"math"

	"jointledger/strength"
)

// part is a head in its place in the joint: its words, its bushing and pin,
// and how much of the joint's load is its own.
type part struct {
	member, bushingMember string
	first                 field // of its head's fields
	head                  *Head
	bushing               *Bushing
	pin                   *Pin
	share                 float64 // of the joint's load in this head
	doubleLeg             bool
	varies                fieldSet // of the joint
}

// Geometry is measured as x from the hole centre toward the free end, y across.
const geometrySource = "geometry of the head"

// Shear-out planes leave the hole 40° from the axis.
//
// Source: common practice of the trade's text-books.
const shearPlaneAngle = 40

var (
	sin40 = math.Sin(shearPlaneAngle * math.Pi / 180)
	cos40 = math.Cos(shearPlaneAngle * math.Pi / 180)
)

var (
	eqSide        = Equation{Symbol: "c1", Text: "W/2 - |o|", Unit: strength.Length, Source: geometrySource + ": the least distance from the hole centre to a side", Mark: strength.Derived}
	eqSideTapered = Equation{Symbol: "c1", Text: "(W/2 - |o|) cos(β)", Unit: strength.Length, Source: geometrySource + ": the least distance from the hole centre to a converging side", Mark: strength.Derived}
	eqNetArea     = Equation{Symbol: "A_net", Text: "2 t (c1 - D/2)", Unit: strength.Area, Source: geometrySource + ": pin pressures pass through the hole centre, so the wider side cannot be used up", Mark: strength.Derived}

	eqPlaneHeight   = Equation{Symbol: "y0", Text: "(D/2) sin(40)", Unit: strength.Length, Source: geometrySource + ": shear-out planes 40° from the axis", Mark: strength.CommonPractice}
	eqPlaneStart    = Equation{Symbol: "x0", Text: "(D/2) cos(40)", Unit: strength.Length, Source: geometrySource + ": shear-out planes 40° from the axis", Mark: strength.CommonPractice}
	eqPlaneRound    = Equation{Symbol: "L", Text: "min(e, sqrt(r^2 - y0^2)) - x0", Unit: strength.Length, Source: geometrySource + ": from the hole to the arc", Mark: strength.Derived}
	eqPlaneSquare   = Equation{Symbol: "L", Text: "e - x0", Unit: strength.Length, Source: geometrySource + ": from the hole to the flat end", Mark: strength.Derived}
	eqPlaneTapered  = Equation{Symbol: "L", Text: "min(e, (W/2 - |o| - y0)/tan(β)) - x0", Unit: strength.Length, Source: geometrySource + ": from the hole to the nearer converging side or the end", Mark: strength.Derived}
	eqShearEdge     = Equation{Symbol: "e_s", Text: "min(e, sqrt((L + x0)^2 + y0^2))", Unit: strength.Length, Source: geometrySource + ": edge distance of the round end with shear-out planes as long as those of the tapered one, on which bearing factors along e/D are taken", Mark: strength.Derived}
	eqShearRatio    = Equation{Symbol: "e/D", Text: "e_s / D", Unit: strength.None, Source: geometrySource, Mark: strength.Derived}
	eqEdgeRatio     = Equation{Symbol: "e/D", Text: "e / D", Unit: strength.None, Source: geometrySource, Mark: strength.Derived}
	eqBearingHole   = Equation{Symbol: "Db", Text: "D", Unit: strength.Length, Source: "bearing diameter: the bushing's outside, or the hole where there is no pin", Mark: strength.Derived}
	eqBearingPin    = Equation{Symbol: "Db", Text: "Dp", Unit: strength.Length, Source: "bearing diameter: the pin's", Mark: strength.Derived}
	eqBearingLength = Equation{Symbol: "t_b", Text: "min(t, l_B)", Unit: strength.Length, Source: "length in bearing: the thickness, or a shorter bushing's length", Mark: strength.Derived}
	eqWholeBearing  = Equation{Symbol: "t_b", Text: "t", Unit: strength.Length, Source: "length in bearing: the thickness", Mark: strength.Derived}
	eqThinness      = Equation{Symbol: "t/D", Text: "t / Db", Unit: strength.None, Source: geometrySource, Mark: strength.Derived}
)

var geometryEquations = []*Equation{
	&eqSide, &eqSideTapered, &eqNetArea, &eqPlaneHeight, &eqPlaneStart, &eqPlaneRound, &eqPlaneSquare, &eqPlaneTapered,
	&eqEdgeRatio, &eqShearEdge, &eqShearRatio, &eqBearingHole, &eqBearingPin, &eqBearingLength, &eqWholeBearing, &eqThinness,
}

func (p *part) width(s *sheet) float64 {
	return s.input(p.member, "W", p.head.Width, strength.Length, p.first+fieldWidth)
}

func (p *part) thickness(s *sheet) float64 {
	return s.input(p.member, "t", p.head.Thickness, strength.Length, p.first+fieldThickness)
}

func (p *part) hole(s *sheet) float64 {
	return s.input(p.member, "D", p.head.HoleDiameter, strength.Length, p.first+fieldHole)
}

func (p *part) edge(s *sheet) float64 {
	return s.input(p.member, "e", p.head.EdgeDistance, strength.Length, p.first+fieldEdge)
}

func (p *part) offset(s *sheet) float64 {
	return math.Abs(s.input(p.member, "o", p.head.Offset, strength.Length, p.first+fieldOffset))
}

func (p *part) taper(s *sheet) float64 {
	return s.input(p.member, "β", p.head.TaperAngle, strength.Degrees, p.first+fieldTaper)
}

func (p *part) property(s *sheet, property strength.Property) float64 {
	return s.property(p.member, &p.head.Material, property, string(property))
}

// pinDiameter writes the pin's diameter, or lacks it.
func (p *part) pinDiameter(s *sheet) float64 {
	if p.pin == nil {
		s.lack(strength.Say("the pin's diameter is needed and there is no pin"))
		return 0
	}
	return s.input(memberPin, "Dp", p.pin.Diameter, strength.Length, fieldPin)
}

// side is c1, the least distance from the hole centre to a side, in mm.
func (p *part) side(s *sheet) float64 {
	c := p.width(s)/2 - p.offset(s)
	if p.head.Shape != Tapered {
		return s.apply(&eqSide, c)
	}
	return s.apply(&eqSideTapered, c*cosDegrees(p.taper(s)))
}

// netArea is the area across the hole that a pull can use, in mm².
//
// An unequal wider side cannot be used up: the resultant of the pin's pressures
// passes through the hole centre, and (W - D) t would be up to twice too much.
func (p *part) netArea(s *sheet) float64 {
	t, c1, d := p.thickness(s), p.side(s), p.hole(s)
	return s.apply(&eqNetArea, 2*t*(c1-d/2))
}

// shearOutLength is the length of the lesser of the two shear-out planes, in
// mm. Unequal planes do not share, so the lesser counts for both. It is above
// zero in every head that Prepare accepts: end and sides pass clear of the hole.
func (p *part) shearOutLength(s *sheet) float64 {
	d, e := p.hole(s), p.edge(s)
	x0 := s.apply(&eqPlaneStart, d/2*cos40)
	if p.head.Shape == Square {
		return s.apply(&eqPlaneSquare, e-x0)
	}
	y0 := s.apply(&eqPlaneHeight, d/2*sin40)
	if p.head.Shape == Tapered {
		return s.apply(&eqPlaneTapered, p.taperedEnd(s, y0)-x0)
	}
	r := p.endRadius(s)
	return s.apply(&eqPlaneRound, min(e, math.Sqrt(float64(r*r)-float64(y0*y0)))-x0)
}

// endRadius is the radius of a round end about the hole centre, in mm.
func (p *part) endRadius(s *sheet) float64 {
	if p.head.EndRadius == 0 {
		return s.input(p.member, "r", p.head.EdgeDistance, strength.Length, p.first+fieldEdge)
	}
	return s.input(p.member, "r", p.head.EndRadius, strength.Length, p.first+fieldEndRadius)
}

func (p *part) edgeRatio(s *sheet) float64 {
	e, d := p.edge(s), p.hole(s)
	return s.apply(&eqEdgeRatio, e/d)
}

// shearEdge is the edge distance in mm at which factors along e/D are read that
// stand for shear-out too. They were found on round and square ends; converging
// sides cut the shear-out planes short, so a tapered end counts as the round one
// with planes as long.
func (p *part) shearEdge(s *sheet) float64 {
	e := p.edge(s)
	if p.head.Shape != Tapered {
		return e
	}
	along, across := p.shearOutLength(s)+float64(p.hole(s)/2*cos40), p.hole(s)/2*sin40
	return s.apply(&eqShearEdge, min(e, math.Hypot(along, across)))
}

// shearRatio is e/D of shearEdge.
func (p *part) shearRatio(s *sheet) float64 {
	if p.head.Shape != Tapered {
		return p.edgeRatio(s)
	}
	return s.apply(&eqShearRatio, p.shearEdge(s)/p.hole(s))
}

// taperedEnd is where a line along the axis, y from it, leaves a tapered end:
// at the nearer converging side or at the end, in mm from the hole centre.
func (p *part) taperedEnd(s *sheet, y float64) float64 {
	side := p.width(s)/2 - p.offset(s)
	return min(p.edge(s), (side-y)/math.Tan(p.taper(s)*math.Pi/180))
}

// bearingDiameter is what bears on the head's hole, in mm.
func (p *part) bearingDiameter(s *sheet) float64 {
	if p.bushing == nil && p.pin != nil {
		return s.apply(&eqBearingPin, p.pinDiameter(s))
	}
	if p.bushing != nil {
		s.read.add(p.first + fieldBushing)
	}
	return s.apply(&eqBearingHole, p.hole(s))
}

// bearingLength is how much of the thickness is in bearing, in mm. A bushing
// that is shorter than the head bears on its own length only; a longer one
// leaves the head its thickness.
func (p *part) bearingLength(s *sheet) float64 {
	t := p.thickness(s)
	if p.bushing == nil || p.bushing.Length == 0 {
		return s.apply(&eqWholeBearing, t)
	}
	length := s.input(p.bushingMember, "l_B", p.bushing.Length, strength.Length, p.first+fieldBushingLength)
	return s.apply(&eqBearingLength, min(t, length))
}

// Fits of an unbushed pin in its hole.
//
// Source: common practice, no source; a loose pin bears on a narrow strip.
const (
	looseFit   = 0.98 // below it a finding says so
	slackFit   = 0.95 // below it bearing strengths of a close fit do not hold
	bearingFit = "Dp/D %.4g is below %.4g: the bearing strength of a close-fitting pin does not hold"
)

// fit is Dp/D of an unbushed pin, 1 where a bushing or nothing fills the hole.
func (p *part) fit() float64 {
	if p.pin == nil || p.bushing != nil {
		return 1
	}
	return p.pin.Diameter / p.head.HoleDiameter
}

// closeFit lacks a bearing strength where the pin is slack in its hole.
func (p *part) closeFit(s *sheet) {
	if fit := p.fit(); strength.Less(fit, slackFit) {
		s.lack(strength.Say(bearingFit, fit, slackFit))
	}
}

// sinDegrees and cosDegrees are exact at multiples of 90°.
func sinDegrees(a float64) float64 {
	switch a {
	case 0, 180:
		return 0
	case 90:
		return 1
	case 270:
		return -1
	}
	return math.Sin(a * math.Pi / 180)
}

func cosDegrees(a float64) float64 {
	switch a {
	case 0:
		return 1
	case 90, 270:
		return 0
	case 180:
		return -1
	}
	return math.Cos(a * math.Pi / 180)
}

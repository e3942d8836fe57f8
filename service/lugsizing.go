package service

import (
	"context"
	"math"
	"strconv"

	"jointledger/lug"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// LugSizingRequest is the body of POST /v1/lugs/sizing: a lug with one
// dimension that may be chosen.
type LugSizingRequest struct {
	Input        strictjson.Raw `json:"input"`
	Free         string         `json:"free" validate:"oneof=thickness width hole_diameter edge_distance"`
	Bounds       [2]float64     `json:"bounds" validate:"dive,size"`
	Ratio        *float64       `json:"ratio,omitzero" validate:"omitnil,size"`
	Increment    *float64       `json:"increment,omitzero" validate:"omitnil,size"`
	TargetMargin *float64       `json:"target_margin,omitzero" validate:"omitnil,margin"`
}

// LugSizing is the least value that holds; without one all is null but the
// reason.
type LugSizing struct {
	Value     *float64 `json:"value"`
	Rounded   *float64 `json:"rounded"`
	Governing *Check   `json:"governing"`
	Result    *Result  `json:"result"`
	Reason    *string  `json:"reason"`
}

var freeDimensions = map[string]lug.Free{
	"thickness": lug.FreeThickness, "width": lug.FreeWidth, "hole_diameter": lug.FreeHole, "edge_distance": lug.FreeEdge,
}

// check notes what cannot be looked for.
func (r *LugSizingRequest) check(f *faults) {
	f.check(r)
	if r.Bounds[1] <= r.Bounds[0] {
		f.add("/bounds", "must ascend, and %g is not below %g", r.Bounds[0], r.Bounds[1])
	}
	switch {
	case r.Ratio == nil || r.Free == "width":
	case r.Free != "hole_diameter":
		f.add("/ratio", "is that of a free width (e/W) or hole_diameter (Dp/D), and has no meaning for %.80q", r.Free)
	case *r.Ratio > 1:
		f.add("/ratio", "must be at most 1, as the pin has to fit the hole, not %g", *r.Ratio)
	}
}

// SizeLug finds the least value of a dimension with which every check holds.
func (s *Service) SizeLug(ctx context.Context, body []byte, view View) (*LugSizing, error) {
	var request LugSizingRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, malformed(err, "")
	}
	var d LugDocument
	if err := strictjson.Decode(request.Input, &d); err != nil {
		return nil, malformed(err, "/input")
	}
	var f, inner faults
	request.check(&f)
	look := s.registry(ctx)
	inner.settle(&d, look)
	if inner.cause != nil {
		return nil, s.fail(f.under("/input", inner.cause))
	}
	d.cornersFit(mostSizedCorners, &inner)
	var found lug.Sized
	if len(f.list) == 0 && len(inner.list) == 0 {
		mm := d.Units.scale(strength.Length)
		var wrong []strength.Fault
		found, wrong = lug.Size(d.joint(), d.choices, d.Factors.strength(), d.cases(), lug.Sizing{
			Free: freeDimensions[request.Free], Least: request.Bounds[0] * mm, Most: request.Bounds[1] * mm,
			Ratio: value(request.Ratio), Increment: value(request.Increment) * mm, Target: value(request.TargetMargin),
			Tolerances: d.tolerances(),
		})
		inner.take(lugFaults(wrong), d.Units)
	}
	f.join("/input", inner.list)
	if p := f.problem(); p != nil {
		return nil, p
	}
	if !found.Found {
		return &LugSizing{Reason: text(d.Units.say(found.Reason))}, nil
	}
	least := d.Units.above(found.Value, request.Bounds[1])
	rounded := least
	if request.Increment != nil {
		rounded = d.Units.out(found.Rounded, strength.Length)
	}
	d.setFree(&request, rounded)
	sized, err := strictjson.Encode(&d)
	if err != nil {
		return nil, err
	}
	c, err := calculate(Lug, sized, view, look)
	if err != nil {
		return nil, s.fail(err)
	}
	s.count(&c.result)
	return &LugSizing{Value: &least, Rounded: &rounded, Governing: c.result.Governing, Result: &c.result}, nil
}

// setFree gives the free dimension a value, and what goes with it.
func (d *LugDocument) setFree(r *LugSizingRequest, x float64) {
	set := func(l *Length, x float64) {
		if x = fifteen(x); l.Object != nil {
			l.Object.Nominal = x
		} else {
			l.Plain = x
		}
	}
	h := &d.Lug
	switch freeDimensions[r.Free] {
	case lug.FreeThickness:
		set(&h.Thickness, x)
	case lug.FreeEdge:
		set(&h.EdgeDistance, x)
	case lug.FreeWidth:
		ratio := Nominal(&h.EdgeDistance) / Nominal(&h.Width)
		if r.Ratio != nil {
			ratio = *r.Ratio
		}
		set(&h.Width, x)
		set(&h.EdgeDistance, ratio*x)
	case lug.FreeHole:
		more := x - Nominal(&h.HoleDiameter)
		set(&h.HoleDiameter, x)
		if d.Clevis != nil {
			set(&d.Clevis.HoleDiameter, Nominal(&d.Clevis.HoleDiameter)+more)
		}
		switch {
		case d.Pin == nil:
		case r.Ratio != nil:
			set(&d.Pin.Diameter, *r.Ratio*x)
		default:
			set(&d.Pin.Diameter, Nominal(&d.Pin.Diameter)+more)
		}
	}
}

// above turns a length in mm into the caller's unit, rounded up at the twelfth
// digit: what is found between two trials must hold as it is written. It stays
// within the caller's bound.
func (u Units) above(length, bound float64) float64 {
	x := length / u.scale(strength.Length)
	for _, bits := range []float64{x, x * (1 + 1e-12), x * (1 + 1e-11)} {
		up, err := strconv.ParseFloat(strconv.FormatFloat(bits, 'e', 11, 64), 64)
		if err == nil && up >= x {
			return math.Min(up, bound)
		}
	}
	return bound
}

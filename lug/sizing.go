package lug

import (
	"math"

	"jointledger/strength"
)

// Free is the dimension of the lug that sizing may change.
type Free uint8

// The free dimensions.
const (
	// FreeThickness is the lug's thickness alone.
	FreeThickness Free = iota
	// FreeWidth takes the edge distance with it, in the ratio e/W.
	FreeWidth
	// FreeHole takes the pin and the clevis' hole with it.
	FreeHole
	// FreeEdge is the lug's edge distance alone.
	FreeEdge
)

// String returns the dimension's word.
func (f Free) String() string {
	return [...]string{"thickness", "width", "hole_diameter", "edge_distance"}[min(f, FreeEdge)]
}

// Sizing is what to look for.
type Sizing struct {
	Free        Free
	Least, Most float64 // bounds of the dimension, mm
	// Ratio is e/W of a free width, Dp/D of a free hole. 0: that of the joint
	// for a width, and for a hole the joint's own difference D - Dp, the wall
	// of a bushing or the play of a pin.
	Ratio     float64
	Increment float64 // mm, to whose next multiple the value is rounded up; 0: not
	Target    float64 // least margin of every check
	// Tolerances of the joint's lengths. They stay as they are about a length
	// that changes, and the worst corner has to hold.
	Tolerances []Tolerance
}

// Sized is what was found.
type Sized struct {
	Found   bool
	Value   float64 // the least that holds, mm
	Rounded float64 // rounded up to a multiple of the increment that holds too
	// Resolution is the step of the scan in mm: a range that holds and is
	// narrower than it can have been missed.
	Resolution float64
	// Joint is the joint at Rounded, Result its calculation. Where nothing was
	// found they are those at the upper bound, Result nil if it has faults: a
	// *Prepared, or with tolerances a *Toleranced.
	Joint  Joint
	Result strength.Calculation
	// Case and Check are what governs there: the least margin, or what is
	// undetermined. Check is -1 where no check is exercised.
	Case, Check int
	// Reason says why nothing was found.
	Reason strength.Message
}

const (
	scanSteps  = 256
	bisections = 60
)

// Size finds the least value of a dimension with which every check that is not
// compared holds its target margin in every load case; one that is undetermined
// does not hold. Margins need not be monotonic in the dimension: the bounds are
// scanned from below in even steps, and the first step that holds is narrowed
// down by bisection, so that the value found always holds itself. Faults are
// those of the request at either bound that no value between can mend.
func Size(j Joint, choices []Choice, f strength.Factors, cases []LoadCase, want Sizing) (Sized, []strength.Fault) {
	var wrong faults
	if !(want.Least > 0) || !(want.Most > want.Least) {
		wrong.add("/bounds", "the bounds are %v to %v and must ascend from above zero", mm(want.Least), mm(want.Most))
	}
	if want.Ratio < 0 {
		wrong.add("/ratio", "the ratio is %.6g and must be above zero", want.Ratio)
	}
	if want.Increment < 0 {
		wrong.add("/increment", "the increment is %v and must be above zero", mm(want.Increment))
	}
	if want.Target <= -1 {
		wrong.add("/target_margin", "the target margin is %.6g and must be above -1", want.Target)
	}
	if len(wrong) > 0 {
		return Sized{}, wrong
	}
	loads, wrong := newLoads(cases)
	if len(wrong) > 0 {
		return Sized{}, wrong
	}
	z := &sizer{joint: j, choices: choices, factors: f, loads: loads, want: want}
	step := (want.Most - want.Least) / scanSteps
	found := Sized{Resolution: step, Value: want.Least}
	k := 0
	for ; k <= scanSteps; k++ {
		if found.Value = z.at(k, step); z.holds(found.Value) {
			break
		}
	}
	if k > scanSteps {
		return z.none(found)
	}
	if k > 0 {
		below := z.at(k-1, step)
		for range bisections {
			if middle := below + (found.Value-below)/2; z.holds(middle) {
				found.Value = middle
			} else {
				below = middle
			}
		}
	}
	found.Found = true
	found.Rounded = found.Value
	if want.Increment > 0 {
		if !z.round(&found) {
			found.Found = false
			found.Reason = strength.Say("%v holds, and no multiple of %v from there up to %v does", mm(found.Value), mm(want.Increment), mm(want.Most))
		}
	}
	return z.show(found, found.Rounded), nil
}

// sizer tries values of the dimension.
type sizer struct {
	joint   Joint
	choices []Choice
	factors strength.Factors
	loads   []load
	want    Sizing
	last    int // the load case that failed last, tried first
	out     []strength.Margin
}

func (z *sizer) at(k int, step float64) float64 {
	if k == scanSteps {
		return z.want.Most
	}
	return z.want.Least + float64(float64(k)*step)
}

// with is the joint with the dimension at x.
func (z *sizer) with(x float64) Joint {
	j := z.joint.Clone()
	switch z.want.Free {
	case FreeThickness:
		j.Lug.Thickness = x
	case FreeEdge:
		j.Lug.EdgeDistance = x
	case FreeWidth:
		ratio := z.want.Ratio
		if ratio == 0 {
			ratio = z.joint.Lug.EdgeDistance / z.joint.Lug.Width
		}
		j.Lug.Width, j.Lug.EdgeDistance = x, ratio*x
	case FreeHole:
		more := x - z.joint.Lug.HoleDiameter
		j.Lug.HoleDiameter = x
		if j.Clevis != nil {
			j.Clevis.HoleDiameter += more
		}
		if j.Pin != nil && z.want.Ratio != 0 {
			j.Pin.Diameter = float64(z.want.Ratio * x)
		} else if j.Pin != nil {
			j.Pin.Diameter += more
		}
	}
	return j
}

// sound reports whether sizes that follow the free dimension are still sizes.
func (j *Joint) sound() bool {
	return (j.Pin == nil || j.Pin.Diameter > 0) && (j.Clevis == nil || j.Clevis.HoleDiameter > 0)
}

// variant is the joint at one value of the dimension.
type variant interface {
	strength.Calculation
	Governing() (loadCase, check int)
}

func (z *sizer) prepare(x float64) (variant, []strength.Fault) {
	j := z.with(x)
	if !j.sound() {
		return nil, []strength.Fault{{Pointer: "/pin/diameter", Message: strength.Say("a hole of %v leaves no pin", mm(x))}}
	}
	if len(z.want.Tolerances) > 0 {
		t, wrong := prepareToleranced(j, z.want.Tolerances, z.choices, z.factors, z.loads, nil)
		if t == nil { // which must not become a variant
			return nil, wrong
		}
		return t, nil
	}
	p, wrong := prepare(j, z.choices, z.factors, z.loads, nil)
	if p == nil {
		return nil, wrong
	}
	return p, nil
}

// holds reports whether every check holds in every load case.
func (z *sizer) holds(x float64) bool {
	p, wrong := z.prepare(x)
	if wrong != nil {
		return false
	}
	if z.holdsIn(p, z.last) {
		for i := range z.loads {
			if !z.holdsIn(p, i) {
				z.last = i
				return false
			}
		}
		return true
	}
	return false
}

func (z *sizer) holdsIn(p variant, i int) bool {
	checks := p.Checks()
	if len(z.out) < len(checks) {
		z.out = make([]strength.Margin, len(checks))
	}
	out := z.out[:len(checks)]
	p.Margins(i, out)
	for c, m := range out {
		if checks[c].Compared || m.Status == strength.NotExercised {
			continue
		}
		if m.Status == strength.Undetermined || m.Margin < z.want.Target {
			return false
		}
	}
	return true
}

// round moves Rounded up to the first multiple of the increment that holds.
func (z *sizer) round(found *Sized) bool {
	n := math.Ceil(found.Value/z.want.Increment - strength.Within)
	for tries := 0; tries <= scanSteps; tries++ {
		x := n * z.want.Increment
		if strength.More(x, z.want.Most) {
			return false
		}
		if z.holds(x) {
			found.Rounded = x
			return true
		}
		n++
	}
	return false
}

// show prepares the joint at x and finds what governs there.
func (z *sizer) show(found Sized, x float64) Sized {
	found.Joint, found.Check = z.with(x), -1
	if p, _ := z.prepare(x); p != nil {
		found.Result = p
		found.Case, found.Check = p.Governing()
	}
	return found
}

// none says why no value holds, by what stops the upper bound.
func (z *sizer) none(found Sized) (Sized, []strength.Fault) {
	_, low := z.prepare(z.want.Least)
	_, high := z.prepare(z.want.Most)
	if low != nil && high != nil {
		if same := common(low, high); len(same) > 0 {
			return Sized{}, same
		}
	}
	found = z.show(found, z.want.Most)
	found.Value = 0
	p, c := found.Result, found.Check
	switch {
	case p == nil:
		found.Reason = strength.Say("no value from %v to %v holds, tried every %v; at the upper bound %s: %v",
			mm(z.want.Least), mm(z.want.Most), mm(found.Resolution), high[0].Pointer, high[0].Message)
	case c < 0:
		found.Reason = strength.Say("no check is exercised")
	default:
		check, margins := p.Checks()[c], make([]strength.Margin, len(p.Checks()))
		p.Margins(found.Case, margins)
		m := margins[c]
		how := strength.Say("has a margin of %.4g", m.Margin)
		if m.Status == strength.Undetermined {
			how = strength.Say("is undetermined: %v", *m.Why)
		}
		found.Reason = strength.Say("no value from %v to %v holds, tried every %v; at the upper bound %s %s (%s) in load case %s %v",
			mm(z.want.Least), mm(z.want.Most), mm(found.Resolution), check.Member, check.Mode, check.Level, z.loads[found.Case].ID, how)
	}
	return found, nil
}

// common are the faults that stand at both bounds.
func common(low, high []strength.Fault) []strength.Fault {
	var same []strength.Fault
	for _, a := range low {
		for _, b := range high {
			if a.Pointer == b.Pointer {
				same = append(same, a)
				break
			}
		}
	}
	return same
}

// Governing returns the load case and the check, of those not compared, with
// the worst status and among them the least margin; check -1 where none is
// exercised. The first among equals governs.
func (p *Prepared) Governing() (loadCase, check int) { return governing(p, len(p.loads)) }

func governing(p strength.Calculation, cases int) (loadCase, check int) {
	check = -1
	checks := p.Checks()
	out := make([]strength.Margin, len(checks))
	var worst strength.Margin
	for i := range cases {
		p.Margins(i, out)
		for c, m := range out {
			if !checks[c].Compared && worse(m, worst) {
				worst, loadCase, check = m, i, c
			}
		}
	}
	return loadCase, check
}

// worse reports whether a is worse than b: by status, then by margin.
func worse(a, b strength.Margin) bool {
	if a.Status != b.Status {
		return a.Status > b.Status
	}
	return a.Status != strength.Undetermined && a.Margin < b.Margin
}

// Clone returns a joint that shares nothing that changes with j.
func (j Joint) Clone() Joint {
	j.Lug = j.Lug.clone()
	j.Bushing = clone(j.Bushing)
	j.Pin = clone(j.Pin)
	if j.Clevis = clone(j.Clevis); j.Clevis != nil {
		j.Clevis.Head = j.Clevis.clone()
		j.Clevis.Bushing = clone(j.Clevis.Bushing)
		j.Clevis.MomentShare = clone(j.Clevis.MomentShare)
	}
	return j
}

func (h Head) clone() Head {
	h.SectionDepths = clone(h.SectionDepths)
	return h
}

func clone[T any](p *T) *T {
	if p == nil {
		return nil
	}
	c := *p
	return &c
}

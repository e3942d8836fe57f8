package fastener

import (
	"slices"

	"jointledger/strength"
)

// Thread is the thread of a bolt.
type Thread struct {
	Form  string  // "unified" or "iso"
	Pitch float64 // mm
	// InShearPlane has the shear carried by the thread's tensile area; the
	// whole shank counts only where it is stated to lie in the shear plane.
	InShearPlane bool
}

// Type is what is known of a fastener's strength: rated strengths of its part
// standard, which come first, or stresses. A value of zero was not given.
type Type struct {
	Name, Source string
	Mark         strength.Mark

	ShearStrength, TensionStrength float64 // N, the shear on one plane
	Fsu, Ftu                       float64 // MPa
	Thread                         *Thread

	// Diameter in mm is that of a type that belongs to one; 0: any.
	Diameter     float64
	Head         string  // of Heads; empty is protruding
	HeadDiameter float64 // mm, mean across points and flats of head or nut
	Class        string  // property class of a metric bolt: "8.8"
	// PullThroughStrength in N is that of the head through its sheet, by test.
	PullThroughStrength float64
	Preload             *Preload
}

// The forms of head that methods distinguish.
const (
	HeadProtruding         = "protruding"
	HeadRound              = "round"
	HeadCountersunk        = "countersunk"       // of full height, a tension head
	HeadCountersunkReduced = "countersunk-shear" // of reduced height, a shear head
)

// Heads returns the words for forms of head.
func Heads() []string {
	return []string{HeadProtruding, HeadRound, HeadCountersunk, HeadCountersunkReduced}
}

func (t *Type) countersunk() bool {
	return t.Head == HeadCountersunk || t.Head == HeadCountersunkReduced
}

// Factors of the pitch in the tensile stress area of a thread.
//
// Source: ASME B1.1 (unified, 0.9743/n with n threads an inch), seen; ISO 898-1
// (metric, 0.9382 P), 97 % sure from memory, with the areas it gives seen.
const (
	unifiedPitchFactor = 0.9743
	isoPitchFactor     = 0.9382
)

// allowable is a strength with the steps to it; why says that there is none.
type allowable struct {
	value float64
	steps []strength.Working
	why   strength.Message
}

func (a *allowable) add(symbol string, value float64, unit strength.Unit, equation, source string, mark strength.Mark) {
	a.steps = append(a.steps, strength.Working{
		Symbol: symbol, Value: value, Unit: unit, Equation: equation, Source: source, Mark: mark,
	})
}

// mark is the weakest mark of the steps.
func (a *allowable) mark() strength.Mark {
	weakest := strength.Given
	for _, s := range a.steps {
		weakest = strength.Weakest(weakest, s.Mark)
	}
	return weakest
}

const piQuarter = 0.7853981633974483 // π/4

// addTensileArea adds the tensile stress area in mm² of a thread on diameter d:
// 0.7854 (D - 0.9743/n)² for unified and π/4 (d - 0.9382 P)² for metric threads.
// The caller has made sure that d exceeds the factor times the pitch.
func (a *allowable) addTensileArea(t *Thread, d float64) float64 {
	a.add("D", d, strength.Length, "", "input: fasteners.diameter", strength.Given)
	a.add("p", t.Pitch, strength.Length, "", "input: type.thread", strength.Given)
	root := d - float64(t.pitchFactor()*t.Pitch)
	if t.Form == "iso" {
		area := piQuarter * root * root
		a.add("A_t", area, strength.Area, "π/4 (D - 0.9382 p)²", "ISO 898-1, nominal stress area", strength.FromMemory(97))
		return area
	}
	area := 0.7854 * root * root
	a.add("A_t", area, strength.Area, "0.7854 (D - 0.9743 p)²", "ASME B1.1, tensile stress area", strength.Seen)
	return area
}

// faults tells what keeps the thread from having an area on diameter d; at is
// its place.
func (t *Thread) faults(at string, d float64) (faults []strength.Fault) {
	if !slices.Contains(threadForms, t.Form) {
		return append(faults, strength.Fault{Pointer: at + "/form", Message: strength.Say("%q is not known; allowed are %q", t.Form, threadForms)})
	}
	if deepest := d / t.pitchFactor(); t.Pitch <= 0 || t.Pitch >= deepest {
		faults = append(faults, strength.Fault{Pointer: at + "/pitch", Message: strength.Say(
			"found %v, allowed is more than 0 and less than %v, which leaves no area on a diameter of %v",
			strength.Length.Of(t.Pitch), strength.Length.Of(deepest), strength.Length.Of(d))})
	}
	return faults
}

func (t *Thread) pitchFactor() float64 {
	if t.Form == "iso" {
		return isoPitchFactor
	}
	return unifiedPitchFactor
}

// shear returns the shear strength in N over a number of planes: the rated
// strength of one plane, else Fsu on the shank π d²/4, or on the thread's
// tensile area where the thread lies in the shear plane.
func (t *Type) shear(d float64, planes int) (a allowable) {
	a.add("n", float64(planes), strength.None, "", "input: fasteners.shear_planes", strength.Given)
	switch {
	case t.ShearStrength > 0:
		a.add("V_1", t.ShearStrength, strength.Force, "", t.source(), t.Mark)
		a.value = float64(planes) * t.ShearStrength
		a.add("V_u", a.value, strength.Force, "n V_1", "rated strength of one plane times the planes", strength.Derived)
	case t.Fsu > 0:
		a.add("F_su", t.Fsu, strength.Stress, "", t.source(), t.Mark)
		if t.Thread != nil && t.Thread.InShearPlane {
			area := a.addTensileArea(t.Thread, d)
			a.value = float64(planes) * t.Fsu * area
			a.add("V_u", a.value, strength.Force, "n F_su A_t", "threads in the shear plane", strength.Derived)
			break
		}
		area := piQuarter * d * d
		a.add("D", d, strength.Length, "", "input: fasteners.diameter", strength.Given)
		a.add("A_s", area, strength.Area, "π/4 D²", "area of the shank", strength.Derived)
		a.value = float64(planes) * t.Fsu * area
		a.add("V_u", a.value, strength.Force, "n F_su A_s", "shank in the shear plane", strength.Derived)
	default:
		a.why = strength.Say("the fastener type %q has neither shear_strength nor fsu", t.Name)
	}
	return a
}

// tension returns the tension strength in N: the rated strength, else Ftu on
// the thread's tensile area.
func (t *Type) tension(d float64) (a allowable) {
	switch {
	case t.TensionStrength > 0:
		a.value = t.TensionStrength
		a.add("T_u", a.value, strength.Force, "", t.source(), t.Mark)
	case t.Ftu > 0 && t.Thread != nil:
		a.add("F_tu", t.Ftu, strength.Stress, "", t.source(), t.Mark)
		area := a.addTensileArea(t.Thread, d)
		a.value = t.Ftu * area
		a.add("T_u", a.value, strength.Force, "F_tu A_t", "tension on the thread", strength.Derived)
	case t.Ftu > 0:
		a.why = strength.Say("the fastener type %q has ftu but no thread, and no tension_strength", t.Name)
	default:
		a.why = strength.Say("the fastener type %q has neither tension_strength nor ftu with a thread", t.Name)
	}
	return a
}

func (t *Type) source() string {
	if t.Source == "" {
		return "input: type " + t.Name
	}
	return t.Source
}

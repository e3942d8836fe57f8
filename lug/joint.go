// Package lug computes pin-loaded lugs and whole pinned joints by published
// methods.
//
// Prepare takes a joint, the methods chosen, the factors of safety and the load
// cases, and settles everything that no load case changes: the geometry is
// measured and the allowables are found once. What is left of a load case is a
// few operations without allocation. Every number that a margin rests on can be
// asked for as a working, with its equation, its source and how it is known:
// a calculation is written on a sheet, and the sheet that is read is the one
// that was calculated on.
//
// All values are in N, mm, MPa and degrees. A joint that cannot be calculated
// is a list of faults; a value that is missing, or a method used outside its
// published range, leaves the check undetermined and says why. Nothing panics
// and no NaN or infinity comes out as long as none goes in.
package lug

import "jointledger/strength"

// Shape is the outline of a lug's free end.
type Shape uint8

// The shapes. x runs from the hole centre toward the free end.
const (
	// Round ends in an arc about the hole centre, cut by the parallel sides.
	Round Shape = iota
	// Square ends flat, square to the parallel sides.
	Square
	// Tapered ends flat; its sides converge from the hole centre on, and are
	// parallel behind it.
	Tapered
)

// String returns the shape's word.
func (s Shape) String() string {
	return [...]string{"round", "square", "tapered"}[min(s, Tapered)]
}

// Head is one lug, or one leg of a clevis. Lengths are in mm.
type Head struct {
	Shape        Shape
	Width        float64 // across the hole centre
	Thickness    float64
	HoleDiameter float64 // the outside of a bushing, where there is one
	EdgeDistance float64 // hole centre to the end along the axis
	EndRadius    float64 // of a round end, about the hole centre; 0: EdgeDistance
	TaperAngle   float64 // degrees a side, of a tapered end: above 0, up to 45
	Offset       float64 // of the hole from the middle of the width, signed
	// SectionDepths are h1 to h4 of the transverse strength where the picture of
	// the head does not follow from its shape.
	SectionDepths  *[4]float64
	BodyWidth      float64 // of the body behind the head; 0: Width
	BodyLength     float64 // hole centre to the support; 0: not given
	BodyRestrained bool    // the support takes the bending of an offset hole
	Material       strength.Material
}

// Bushing lines a hole. Lengths are in mm.
type Bushing struct {
	Material     strength.Material
	Interference float64 // diametral; 0: no press fit
	Length       float64 // 0: the lug's thickness
}

// Pin joins lug and clevis. Lengths are in mm.
type Pin struct {
	Diameter      float64
	InnerDiameter float64 // the bore of a hollow pin; 0: solid
	Material      strength.Material
}

// Clevis is what the lug is pinned to: two equal legs, or in single shear the
// one mating lug. Head describes one leg.
type Clevis struct {
	Head
	Gap         float64 // between each leg and the lug
	Bushing     *Bushing
	LegShare    float64  // of the load in the leg that has more; 0: 0.5
	MomentShare *float64 // of the eccentric moment in the lug, in single shear
}

// Joint is a lug, alone or with what it is pinned to.
type Joint struct {
	SingleShear bool
	Lug         Head
	Bushing     *Bushing
	Pin         *Pin
	Clevis      *Clevis

	// varies are the fields with tolerances: a check that one of their limits
	// brings about stands at all of them.
	varies fieldSet
}

// LoadCase is one load on the joint.
type LoadCase struct {
	ID    string
	Level strength.Level
	Force float64 // N, not negative
	// Angle is in degrees from the lug's axis, modulo 360: 0 pulls toward the
	// free end, 90 is transverse, 180 pushes into the body.
	Angle float64
}

// The members of a joint, in the order of answers.
const (
	memberLug           = "lug"
	memberBushing       = "bushing"
	memberClevis        = "clevis"
	memberClevisBushing = "clevis-bushing"
	memberPin           = "pin"
	memberJoint         = "joint"
)

// memberRank orders the members of answers.
func memberRank(member string) int {
	for i, m := range [...]string{memberLug, memberBushing, memberClevis, memberClevisBushing, memberPin} {
		if m == member {
			return i
		}
	}
	return 5
}

package fastener

import (
	"fmt"
	"slices"

	"jointledger/strength"
)

func field(list string, index int, name string) string {
	return fmt.Sprintf("/%s/%d/%s", list, index, name)
}

func caseField(index int, name string) string { return field("load_cases", index, name) }

const inPlaneCentre = "instantaneous-centre"

// The words that a pattern's choices take.
var (
	interactionWord = append([]string{""}, InteractionWords()...)
	inPlaneWords    = []string{"", "elastic", inPlaneCentre}
	outOfPlaneWords = []string{"", "centroid", "heel"}
	threadForms     = []string{"unified", "iso"}
)

func stiffnessWords() []string {
	words := []string{stiffnessEqual, stiffnessArea, stiffnessGiven}
	for _, f := range ComplianceFormulas() {
		words = append(words, f.ID, f.Name())
	}
	return words
}

// inputFaults checks everything but where the fasteners stand to each other,
// and fills the outlines.
func (p *PreparedPattern) inputFaults() []strength.Fault {
	var faults []strength.Fault
	fault := func(pointer, format string, args ...any) {
		faults = append(faults, strength.Fault{Pointer: pointer, Message: strength.Say(format, args...)})
	}
	word := func(pointer, found string, allowed []string) {
		if !slices.Contains(allowed, found) {
			fault(pointer, "%q is not known; allowed are %q", found, slices.DeleteFunc(slices.Clone(allowed), func(s string) bool { return s == "" }))
		}
	}
	word("/stiffness", p.pattern.Stiffness, stiffnessWords())
	word("/interaction", p.pattern.Interaction, interactionWord)
	word("/in_plane", p.pattern.InPlane, inPlaneWords)
	word("/out_of_plane", p.pattern.OutOfPlane, outOfPlaneWords)
	for i, m := range p.pattern.Methods {
		word(fmt.Sprintf("/methods/%d", i), m, StrengthMethods())
	}
	word("/method_options/aisc-360-j3/basis", p.pattern.AISC.Basis, []string{"", "lrfd", "asd"})
	if p.pattern.OutOfPlane == "heel" {
		switch {
		case len(p.pattern.Plates) == 0:
			fault("/plates", "out_of_plane \"heel\" needs the outline of the attached member, plates[0]")
		case len(p.pattern.Plates[0].Outline) == 0:
			fault("/plates/0/outline", "out_of_plane \"heel\" needs the outline of the attached member")
		}
	}
	for i, f := range p.pattern.Fasteners {
		if f.SlotAngle != nil && p.pattern.InPlane == inPlaneCentre {
			fault(field("fasteners", i, "slot_angle"), "in_plane \"instantaneous-centre\" does not go with slotted holes")
		}
		if f.ShearPlanes < 0 || f.ShearPlanes > 2 {
			fault(field("fasteners", i, "shear_planes"), "found %d, allowed are 1 and 2", f.ShearPlanes)
		}
		if p.pattern.Stiffness == stiffnessGiven {
			if f.ShearStiffness <= 0 {
				fault(field("fasteners", i, "shear_stiffness"), "stiffness \"given\" needs a positive shear stiffness, found %g", f.ShearStiffness)
			}
			if f.TensionStiffness <= 0 {
				fault(field("fasteners", i, "tension_stiffness"), "stiffness \"given\" needs a positive tension stiffness, found %g", f.TensionStiffness)
			}
		}
		if f.HoleDiameter != 0 && strength.Less(f.HoleDiameter, f.Diameter) {
			fault(field("fasteners", i, "hole_diameter"), "found %v, allowed is at least the fastener's diameter %v",
				strength.Length.Of(f.HoleDiameter), strength.Length.Of(f.Diameter))
		}
		if f.Type == nil {
			continue
		}
		if d := f.Type.Diameter; d > 0 && (strength.Less(f.Diameter, d) || strength.More(f.Diameter, d)) {
			fault(field("fasteners", i, "diameter"), "found %v, but type %q is of %v", strength.Length.Of(f.Diameter), f.Type.Name, strength.Length.Of(d))
		}
		word(field("fasteners", i, "type/head"), f.Type.Head, append([]string{""}, Heads()...))
		if b := f.Type.Preload; b != nil {
			if b.Nominal == 0 && (b.Torque == 0 || b.NutFactor == 0) {
				fault(field("fasteners", i, "type/preload"), "needs nominal, or torque with nut_factor")
			}
			if b.Scatter >= 1 || b.Relaxation >= 1 {
				fault(field("fasteners", i, "type/preload"), "scatter and relaxation are fractions below 1, found %g and %g", b.Scatter, b.Relaxation)
			}
		}
		if f.Type.Thread == nil {
			continue
		}
		faults = append(faults, f.Type.Thread.faults(field("fasteners", i, "type/thread"), f.Diameter)...)
	}
	for k, plate := range p.pattern.Plates {
		if plate.CountersinkDepth < 0 || plate.CountersinkDepth > plate.Thickness {
			fault(field("plates", k, "countersink_depth"), "found %v, allowed is 0 to the thickness %v",
				strength.Length.Of(plate.CountersinkDepth), strength.Length.Of(plate.Thickness))
		}
		if plate.LoadShare < 0 || plate.LoadShare > 1 {
			fault(field("plates", k, "load_share"), "found %g, allowed is more than 0, at most 1", plate.LoadShare)
		}
		if len(plate.Outline) == 0 {
			continue
		}
		pointer := field("plates", k, "outline")
		if why := outlineFault(plate.Outline); !why.Empty() {
			faults = append(faults, strength.Fault{Pointer: pointer, Message: why})
			continue
		}
		p.outlines[k] = sides(plate.Outline)
		for _, f := range p.pattern.Fasteners {
			e, _, _ := nearest(p.outlines[k], f.X, f.Y)
			switch {
			case !contains(p.outlines[k], f.X, f.Y):
				fault(pointer, "the centre of fastener %q is not inside the outline", f.ID)
			case strength.AtMost(e, f.hole()/2):
				fault(pointer, "the hole of fastener %q reaches the outline: its centre is %v from it, more than half its diameter, %v, is allowed",
					f.ID, strength.Length.Of(e), strength.Length.Of(f.hole()/2))
			}
		}
	}
	return faults
}

// coincidenceFaults names fasteners that stand in the hole of an earlier one.
func coincidenceFaults(fasteners []Fastener, near []Neighbour) []strength.Fault {
	var faults []strength.Fault
	for i, n := range near {
		if n.Index < 0 || n.Index > i || n.Distance > strength.Within*fasteners[i].Diameter {
			continue
		}
		faults = append(faults, strength.Fault{
			Pointer: field("fasteners", i, "x"),
			Message: strength.Say("fastener %q stands in the same place as fastener %q", fasteners[i].ID, fasteners[n.Index].ID),
		})
	}
	return faults
}

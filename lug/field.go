package lug

import "strings"

// field is one member of a request that a calculation may read.
type field uint8

// The fields. Those of the lug and of the clevis stand in the same order, so
// that a part finds its own by an offset.
const (
	fieldWidth field = iota
	fieldThickness
	fieldHole
	fieldEdge
	fieldEndRadius
	fieldTaper
	fieldOffset
	fieldDepths
	fieldBodyWidth
	fieldBodyLength
	fieldRestrained
	fieldBushing
	fieldInterference
	fieldBushingLength
	fieldsOfHead

	fieldGap = fieldsOfHead + iota - 1
	fieldLegShare
	fieldMomentShare
	fieldPin
	fieldPinBore
	fieldForce
	fieldAngle
	fieldUltimate
	fieldsInAll
)

var fieldPaths = [fieldsInAll]string{
	"lug.width", "lug.thickness", "lug.hole_diameter", "lug.edge_distance", "lug.end_radius",
	"lug.taper_angle", "lug.offset", "lug.section_depths", "lug.body_width", "lug.body_length", "lug.body_restrained",
	"bushing", "bushing.interference", "bushing.length",
	"clevis.width", "clevis.thickness", "clevis.hole_diameter", "clevis.edge_distance", "clevis.end_radius",
	"clevis.taper_angle", "clevis.offset", "clevis.section_depths", "clevis.body_width", "clevis.body_length", "clevis.body_restrained",
	"clevis.bushing", "clevis.bushing.interference", "clevis.bushing.length",
	"clevis.gap", "clevis.leg_share", "clevis.moment_share",
	"pin.diameter", "pin.inner_diameter",
	"load_cases.force", "load_cases.angle", "factors.ultimate",
}

// fieldAt is the set of the one field at a pointer, empty where there is none.
func fieldAt(pointer string) (set fieldSet) {
	for f := range fieldsInAll {
		if fieldPaths[f] == strings.ReplaceAll(strings.TrimPrefix(pointer, "/"), "/", ".") {
			set.add(f)
		}
	}
	return set
}

// path is where the field stands in a request.
func (f field) path() string { return fieldPaths[f] }

// fieldSet is a set of fields.
type fieldSet uint64

func (s *fieldSet) add(f field) { *s |= 1 << f }

func (s fieldSet) has(f field) bool { return s&(1<<f) != 0 }

// given returns the optional fields that a joint gives.
func (j *Joint) given() fieldSet {
	var set fieldSet
	head := func(h *Head, b *Bushing, at field) {
		note := func(is bool, f field) {
			if is {
				set.add(at + f)
			}
		}
		note(h.EndRadius != 0, fieldEndRadius)
		note(h.TaperAngle != 0, fieldTaper)
		note(h.Offset != 0, fieldOffset)
		note(h.SectionDepths != nil, fieldDepths)
		note(h.BodyWidth != 0, fieldBodyWidth)
		note(h.BodyLength != 0, fieldBodyLength)
		note(h.BodyRestrained, fieldRestrained)
		if b != nil {
			note(true, fieldBushing)
			note(b.Interference != 0, fieldInterference)
			note(b.Length != 0, fieldBushingLength)
		}
	}
	head(&j.Lug, j.Bushing, 0)
	if c := j.Clevis; c != nil {
		head(&c.Head, c.Bushing, fieldsOfHead)
		if c.Gap != 0 {
			set.add(fieldGap)
		}
		if c.LegShare != 0 {
			set.add(fieldLegShare)
		}
		if c.MomentShare != nil {
			set.add(fieldMomentShare)
		}
	}
	if j.Pin != nil {
		set.add(fieldPin)
		if j.Pin.InnerDiameter != 0 {
			set.add(fieldPinBore)
		}
	}
	return set
}

package service

import (
	"strings"
	"sync"

	"jointledger/fastener"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// FastenerTypeRef is a fastener type in full or by the id of a catalogue.
type FastenerTypeRef = strictjson.Either[string, FastenerType]

// FastenerType gives strengths of one shear plane and in tension, or the
// stresses and the thread that they follow from. A check asks for what it
// needs and is undetermined without.
type FastenerType struct {
	Name                string   `json:"name,omitzero" validate:"omitempty,id"`
	Source              string   `json:"source,omitzero" validate:"text"`
	Mark                string   `json:"mark,omitzero" validate:"omitempty,mark"`
	ShearStrength       *float64 `json:"shear_strength,omitzero" validate:"omitnil,size"`
	TensionStrength     *float64 `json:"tension_strength,omitzero" validate:"omitnil,size"`
	Fsu                 *float64 `json:"fsu,omitzero" validate:"omitnil,size"`
	Ftu                 *float64 `json:"ftu,omitzero" validate:"omitnil,size"`
	Thread              *Thread  `json:"thread,omitzero"`
	Diameter            *float64 `json:"diameter,omitzero" validate:"omitnil,size"`
	Head                *string  `json:"head,omitzero" validate:"omitnil,oneof=protruding round countersunk countersunk-shear"`
	HeadDiameter        *float64 `json:"head_diameter,omitzero" validate:"omitnil,size"`
	PropertyClass       string   `json:"property_class,omitzero" validate:"omitempty,id"`
	PullThroughStrength *float64 `json:"pull_through_strength,omitzero" validate:"omitnil,size"`
	Preload             *Preload `json:"preload,omitzero"`
}

// Thread is the thread of a fastener.
type Thread struct {
	Form         string  `json:"form" validate:"oneof=unified iso"`
	Pitch        float64 `json:"pitch" validate:"size"`
	InShearPlane *bool   `json:"in_shear_plane,omitzero"`
}

// Preload is what is known of a bolt's tightening: its nominal preload, or the
// torque with the nut factor.
type Preload struct {
	Nominal            *float64 `json:"nominal,omitzero" validate:"omitnil,size"`
	Torque             *float64 `json:"torque,omitzero" validate:"omitnil,size"`
	NutFactor          *float64 `json:"nut_factor,omitzero" validate:"omitnil,size"`
	Scatter            *float64 `json:"scatter,omitzero" validate:"omitnil,portion"`
	Relaxation         *float64 `json:"relaxation,omitzero" validate:"omitnil,portion"`
	ThermalGain        *float64 `json:"thermal_gain,omitzero" validate:"omitnil,amount"`
	ThermalLoss        *float64 `json:"thermal_loss,omitzero" validate:"omitnil,amount"`
	LoadingPlaneFactor *float64 `json:"loading_plane_factor,omitzero" validate:"omitnil,share"`
	StiffnessRatio     *float64 `json:"stiffness_ratio,omitzero" validate:"omitnil,share"`
	SeparationFactor   *float64 `json:"separation_factor,omitzero" validate:"omitnil,factor"`
	Friction           *float64 `json:"friction,omitzero" validate:"omitnil,amount"`
	SlipFactor         *float64 `json:"slip_factor,omitzero" validate:"omitnil,factor"`
}

// resolveFastenerType puts the object in the place of a catalogue's name and
// writes the defaults out.
func resolveFastenerType(ref *FastenerTypeRef, u Units, at string, f *faults) {
	if ref == nil {
		return
	}
	if ref.Object == nil {
		found, ok := catalogueTypes()[strings.ToLower(ref.Plain)]
		if !ok {
			f.add(at, "there is no fastener type %.80q in the catalogue (see /v1/fastener-types); give it as an object", ref.Plain)
		}
		object := u.fastenerTypeDocument(found)
		ref.Object = &object
	}
	d := ref.Object
	setDefault(&d.Head, fastener.HeadProtruding)
	if d.Thread != nil {
		setDefault(&d.Thread.InShearPlane, true)
	}
	if d.Preload != nil {
		d.Preload.resolve(at+"/preload", f)
	}
}

func (d *Preload) resolve(at string, f *faults) {
	for _, fraction := range []**float64{&d.Scatter, &d.Relaxation, &d.ThermalGain, &d.ThermalLoss, &d.Friction} {
		setDefault(fraction, 0)
	}
	for _, factor := range []**float64{&d.LoadingPlaneFactor, &d.StiffnessRatio, &d.SeparationFactor, &d.SlipFactor} {
		setDefault(factor, 1)
	}
	switch {
	case d.Nominal != nil && d.Torque != nil:
		f.add(at+"/torque", "is given beside nominal; give the one that the preload follows from")
	case d.Nominal == nil && (d.Torque == nil || d.NutFactor == nil):
		f.add(at, "needs nominal, or torque with nut_factor")
	}
}

// catalogueTypes are the types of the catalogue by id in lower case.
var catalogueTypes = sync.OnceValue(func() map[string]fastener.Type {
	byID := map[string]fastener.Type{}
	for _, t := range fastener.Types() {
		byID[strings.ToLower(t.ID)] = t.Type
	}
	return byID
})

// fastenerTypeDocument is the wire form of a type of the catalogue.
func (u Units) fastenerTypeDocument(t fastener.Type) FastenerType {
	given := func(x float64, unit strength.Unit) *float64 {
		if x == 0 {
			return nil
		}
		y := u.out(x, unit)
		return &y
	}
	d := FastenerType{
		Name: t.Name, Source: t.Source, Mark: t.Mark.String(),
		ShearStrength: given(t.ShearStrength, strength.Force), TensionStrength: given(t.TensionStrength, strength.Force),
		Fsu: given(t.Fsu, strength.Stress), Ftu: given(t.Ftu, strength.Stress),
		Diameter: given(t.Diameter, strength.Length), HeadDiameter: given(t.HeadDiameter, strength.Length),
		PropertyClass: t.Class, PullThroughStrength: given(t.PullThroughStrength, strength.Force),
	}
	if t.Head != "" {
		d.Head = &t.Head
	}
	if t.Thread != nil {
		d.Thread = &Thread{t.Thread.Form, u.out(t.Thread.Pitch, strength.Length), &t.Thread.InShearPlane}
	}
	return d
}

// fastenerType turns the wire form, resolved, into N, mm and MPa.
func (u Units) fastenerType(ref *FastenerTypeRef) *fastener.Type {
	if ref == nil {
		return nil
	}
	d := ref.Object
	mm, newton, stress := u.scale(strength.Length), u.scale(strength.Force), u.scale(strength.Stress)
	mark, _ := strength.ParseMark(d.Mark)
	t := &fastener.Type{
		Name: d.Name, Source: d.Source, Mark: mark,
		ShearStrength: value(d.ShearStrength) * newton, TensionStrength: value(d.TensionStrength) * newton,
		Fsu: value(d.Fsu) * stress, Ftu: value(d.Ftu) * stress,
		Diameter: value(d.Diameter) * mm, Head: *d.Head, HeadDiameter: value(d.HeadDiameter) * mm,
		Class: d.PropertyClass, PullThroughStrength: value(d.PullThroughStrength) * newton,
	}
	if d.Thread != nil {
		t.Thread = &fastener.Thread{Form: d.Thread.Form, Pitch: d.Thread.Pitch * mm, InShearPlane: *d.Thread.InShearPlane}
	}
	if b := d.Preload; b != nil {
		t.Preload = &fastener.Preload{
			Nominal: value(b.Nominal) * newton, Torque: value(b.Torque) * u.scale(strength.Moment), NutFactor: value(b.NutFactor),
			Scatter: *b.Scatter, Relaxation: *b.Relaxation, ThermalGain: *b.ThermalGain * newton, ThermalLoss: *b.ThermalLoss * newton,
			LoadingPlane: *b.LoadingPlaneFactor, StiffnessRatio: *b.StiffnessRatio, SeparationFactor: *b.SeparationFactor,
			Friction: *b.Friction, SlipFactor: *b.SlipFactor,
		}
	}
	return t
}

// FastenerTypeItem is a fastener type of the catalogue.
type FastenerTypeItem struct {
	ID   string       `json:"id"`
	Type FastenerType `json:"type"`
}

// FastenerTypeList is the catalogue of fastener types in some units.
type FastenerTypeList struct {
	Units Units              `json:"units"`
	Items []FastenerTypeItem `json:"items"`
}

// FastenerTypes lists the built-in fastener types, as a request may give them.
func FastenerTypes(units string) (*FastenerTypeList, error) {
	u, err := unitsOf(units)
	if err != nil {
		return nil, err
	}
	list := &FastenerTypeList{Units: u}
	for _, t := range fastener.Types() {
		item := FastenerTypeItem{t.ID, u.fastenerTypeDocument(t.Type)}
		setDefault(&item.Type.Head, fastener.HeadProtruding)
		list.Items = append(list.Items, item)
	}
	return list, nil
}

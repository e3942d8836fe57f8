package service

import (
	"cmp"
	"slices"

	"jointledger/service/strictjson"
	"jointledger/strength"
)

// Material is the wire form of a material, in the units of its document. Only
// what a check needs has to be there.
type Material struct {
	Name      string `json:"name,omitzero" validate:"omitempty,id"`
	Direction string `json:"direction,omitzero" validate:"text"`
	Basis     string `json:"basis,omitzero" validate:"text"`
	Source    string `json:"source,omitzero" validate:"text"`

	Ftu        *float64  `json:"ftu,omitzero" validate:"omitnil,size"`
	Fty        *float64  `json:"fty,omitzero" validate:"omitnil,size"`
	FtuCross   *float64  `json:"ftu_cross,omitzero" validate:"omitnil,size"`
	FtyCross   *float64  `json:"fty_cross,omitzero" validate:"omitnil,size"`
	Fcy        *float64  `json:"fcy,omitzero" validate:"omitnil,size"`
	Fsu        *float64  `json:"fsu,omitzero" validate:"omitnil,size"`
	E          *float64  `json:"e,omitzero" validate:"omitnil,size"`
	Ec         *float64  `json:"ec,omitzero" validate:"omitnil,size"`
	Nu         *float64  `json:"nu,omitzero" validate:"omitnil,poisson"`
	Elongation *float64  `json:"elongation,omitzero" validate:"omitnil,share"`
	Bearing    []Bearing `json:"bearing,omitzero" validate:"omitempty,min=1,max=20,unique=EOverD,dive"`

	// Mark says how the values are known, Marks those known otherwise, by the
	// name of their member.
	Mark  string            `json:"mark,omitzero" validate:"omitempty,mark"`
	Marks map[string]string `json:"marks,omitzero" validate:"omitempty,dive,keys,oneof=ftu fty ftu_cross fty_cross fcy fsu e ec nu elongation fbru fbry,endkeys,mark"`
}

// Bearing is a pair of bearing allowables at an edge distance ratio.
type Bearing struct {
	EOverD float64  `json:"e_over_d" validate:"size"`
	Fbru   *float64 `json:"fbru,omitzero" validate:"omitnil,size"`
	Fbry   *float64 `json:"fbry,omitzero" validate:"omitnil,size"`
}

// stresses returns the material with every stress and modulus turned.
func (m Material) stresses(turn func(float64) float64) Material {
	optional := func(x *float64) *float64 {
		if x == nil {
			return nil
		}
		y := turn(*x)
		return &y
	}
	for _, p := range []**float64{&m.Ftu, &m.Fty, &m.FtuCross, &m.FtyCross, &m.Fcy, &m.Fsu, &m.E, &m.Ec} {
		*p = optional(*p)
	}
	bearing := m.Bearing
	m.Bearing = nil
	for _, b := range bearing {
		m.Bearing = append(m.Bearing, Bearing{b.EOverD, optional(b.Fbru), optional(b.Fbry)})
	}
	return m
}

// MaterialRef is a material in full or by the id of a catalogue.
type MaterialRef = strictjson.Either[string, Material]

// properties pairs the wire's names with the trade's symbols.
var properties = map[string]strength.Property{
	"ftu": strength.Ftu, "fty": strength.Fty, "ftu_cross": strength.FtuCross, "fty_cross": strength.FtyCross,
	"fcy": strength.Fcy, "fsu": strength.Fsu, "e": strength.E, "ec": strength.Ec, "nu": strength.Nu,
	"elongation": strength.Elongation, "fbru": strength.Fbru, "fbry": strength.Fbry,
}

// resolveMaterial puts the object in the place of a catalogue's name.
func resolveMaterial(ref *MaterialRef, u Units, at string, f *faults) {
	if ref == nil || ref.Object != nil {
		return
	}
	i := slices.IndexFunc(materials, func(m CatalogueMaterial) bool { return m.ID == ref.Plain })
	if i < 0 {
		f.add(at, "there is no material %.80q in the catalogue (see /v1/materials); give it as an object", ref.Plain)
		ref.Object = &Material{}
		return
	}
	m := materials[i].in(u)
	*ref = MaterialRef{Object: &m}
}

// value reads an optional number.
func value(x *float64) float64 {
	if x == nil {
		return 0
	}
	return *x
}

// material turns the wire form into MPa.
func (u Units) material(m *Material) strength.Material {
	stress := u.scale(strength.Stress)
	s := strength.Material{
		Name: cmp.Or(m.Name, "unnamed"), Direction: m.Direction, Basis: m.Basis, Source: m.Source,
		Ftu: value(m.Ftu) * stress, Fty: value(m.Fty) * stress,
		FtuCross: value(m.FtuCross) * stress, FtyCross: value(m.FtyCross) * stress,
		Fcy: value(m.Fcy) * stress, Fsu: value(m.Fsu) * stress,
		E: value(m.E) * stress, Ec: value(m.Ec) * stress, Nu: value(m.Nu), Elongation: value(m.Elongation),
	}
	for _, b := range m.Bearing {
		s.Bearing = append(s.Bearing, strength.BearingStrength{
			EOverD: b.EOverD, Fbru: value(b.Fbru) * stress, Fbry: value(b.Fbry) * stress,
		})
	}
	s.Mark, _ = strength.ParseMark(m.Mark)
	for name, text := range m.Marks {
		if s.Marks == nil {
			s.Marks = map[strength.Property]strength.Mark{}
		}
		s.Marks[properties[name]], _ = strength.ParseMark(text)
	}
	return s
}

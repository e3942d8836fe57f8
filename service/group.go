package service

import (
	"jointledger/fastener"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// GroupDocument is the input of POST /v1/fastener-groups: one pattern of
// fasteners between a rigid attached member and its support.
type GroupDocument struct {
	Units       Units           `json:"units"`
	Title       *string         `json:"title,omitzero" validate:"omitnil,text"`
	Stiffness   string          `json:"stiffness" validate:"id"`
	Fasteners   []Fastener      `json:"fasteners" validate:"min=1,max=10000,dive"`
	Plates      *[]Plate        `json:"plates,omitzero" validate:"omitnil,max=20,dive"`
	Rules       *[]string       `json:"rules,omitzero" validate:"omitnil,max=20"`
	Interaction string          `json:"interaction,omitzero" validate:"omitempty,id"`
	InPlane     *string         `json:"in_plane,omitzero" validate:"omitnil,oneof=elastic instantaneous-centre"`
	OutOfPlane  *string         `json:"out_of_plane,omitzero" validate:"omitnil,oneof=centroid heel"`
	Factors     Factors         `json:"factors"`
	LoadCases   []GroupLoadCase `json:"load_cases" validate:"min=1,max=100000,dive"`
}

// Fastener is one fastener of a pattern.
type Fastener struct {
	ID               string           `json:"id" validate:"id"`
	X                float64          `json:"x" validate:"signed"`
	Y                float64          `json:"y" validate:"signed"`
	Diameter         float64          `json:"diameter" validate:"size"`
	Type             *FastenerTypeRef `json:"type,omitzero"`
	ShearPlanes      *int             `json:"shear_planes,omitzero" validate:"omitnil,oneof=1 2"`
	ShearStiffness   *float64         `json:"shear_stiffness,omitzero" validate:"omitnil,size"`
	TensionStiffness *float64         `json:"tension_stiffness,omitzero" validate:"omitnil,size"`
}

// Plate is one of the members that the fasteners join; the first is the
// attached one.
type Plate struct {
	ID               string       `json:"id" validate:"id"`
	Thickness        float64      `json:"thickness" validate:"size"`
	Material         *MaterialRef `json:"material,omitzero"`
	Outline          [][2]float64 `json:"outline,omitzero" validate:"omitempty,min=3,max=10000,dive,dive,signed"`
	CountersinkDepth *float64     `json:"countersink_depth,omitzero" validate:"omitnil,amount"`
	LoadShare        *float64     `json:"load_share,omitzero" validate:"omitnil,share"`
}

// FastenerTypeRef is a fastener type in full or by the id of a catalogue.
type FastenerTypeRef = strictjson.Either[string, FastenerType]

// FastenerType gives strengths of one shear plane and in tension, or the
// stresses and the thread that they follow from.
type FastenerType struct {
	Name            string   `json:"name,omitzero" validate:"omitempty,id"`
	Source          string   `json:"source,omitzero" validate:"text"`
	Mark            string   `json:"mark,omitzero" validate:"omitempty,mark"`
	ShearStrength   *float64 `json:"shear_strength,omitzero" validate:"omitnil,size"`
	TensionStrength *float64 `json:"tension_strength,omitzero" validate:"omitnil,size"`
	Fsu             *float64 `json:"fsu,omitzero" validate:"omitnil,size"`
	Ftu             *float64 `json:"ftu,omitzero" validate:"omitnil,size"`
	Thread          *Thread  `json:"thread,omitzero"`
}

// Thread is the thread of a fastener.
type Thread struct {
	Form         string  `json:"form" validate:"oneof=unified iso"`
	Pitch        float64 `json:"pitch" validate:"size"`
	InShearPlane *bool   `json:"in_shear_plane,omitzero"`
}

// GroupLoadCase is a force and a moment on the attached member at a point.
type GroupLoadCase struct {
	ID     string     `json:"id" validate:"id"`
	Level  Level      `json:"level"`
	Point  [3]float64 `json:"point" validate:"dive,signed"`
	Force  [3]float64 `json:"force" validate:"dive,signed"`
	Moment [3]float64 `json:"moment" validate:"dive,signed"`
}

// CaseShares is how the fasteners share one load case.
type CaseShares struct {
	LoadCase  string          `json:"load_case"`
	Fasteners []FastenerShare `json:"fasteners"`
	Residual  float64         `json:"residual"`
}

// FastenerShare is the force that the attached member puts on a fastener.
type FastenerShare struct {
	ID             string     `json:"id"`
	Shear          [2]float64 `json:"shear"`
	ShearResultant float64    `json:"shear_resultant"`
	Tension        float64    `json:"tension"`
}

// resolve writes every default out and puts objects in the place of names.
func (d *GroupDocument) resolve(_ lookup, f *faults) {
	setDefault(&d.Title, "")
	setDefault(&d.Plates, []Plate{})
	setDefault(&d.Rules, []string{})
	setDefault(&d.InPlane, "elastic")
	setDefault(&d.OutOfPlane, "centroid")
	f.unique("fasteners", len(d.Fasteners), func(i int) string { return d.Fasteners[i].ID })
	f.unique("plates", len(*d.Plates), func(i int) string { return (*d.Plates)[i].ID })
	f.unique("load_cases", len(d.LoadCases), func(i int) string { return d.LoadCases[i].ID })
	for i := range d.Fasteners {
		one := &d.Fasteners[i]
		setDefault(&one.ShearPlanes, 1)
		resolveFastenerType(one.Type, d.Units, pointer("fasteners", i, "type"), f)
	}
	names := []string{"fastener", "pattern"}
	for i := range *d.Plates {
		plate := &(*d.Plates)[i]
		names = append(names, plate.ID)
		resolveMaterial(plate.Material, d.Units, pointer("plates", i, "material"), f)
		setDefault(&plate.CountersinkDepth, 0)
	}
	for i, name := range *d.Rules {
		set, ok := fastener.FindRules(name)
		if !ok {
			f.add(pointer("rules", i), "there is no set of rules %.80q (see /v1/rules)", name)
			continue
		}
		(*d.Rules)[i] = set.Name()
	}
	d.Factors.resolve(names, f)
}

// resolveFastenerType puts the object in the place of a catalogue's name.
func resolveFastenerType(ref *FastenerTypeRef, _ Units, at string, f *faults) {
	if ref == nil {
		return
	}
	if ref.Object == nil {
		f.add(at, "there is no fastener type %.80q in the catalogue; give it as an object", ref.Plain)
		ref.Object = &FastenerType{}
	}
	if ref.Object.Thread != nil {
		setDefault(&ref.Object.Thread.InShearPlane, false)
	}
}

// fastenerType turns the wire form into N, mm and MPa.
func (u Units) fastenerType(ref *FastenerTypeRef) *fastener.Type {
	if ref == nil {
		return nil
	}
	d := ref.Object
	mark, _ := strength.ParseMark(d.Mark)
	t := &fastener.Type{
		Name: d.Name, Source: d.Source, Mark: mark,
		ShearStrength:   value(d.ShearStrength) * u.scale(strength.Force),
		TensionStrength: value(d.TensionStrength) * u.scale(strength.Force),
		Fsu:             value(d.Fsu) * u.scale(strength.Stress),
		Ftu:             value(d.Ftu) * u.scale(strength.Stress),
	}
	if d.Thread != nil {
		t.Thread = &fastener.Thread{
			Form: d.Thread.Form, Pitch: d.Thread.Pitch * u.scale(strength.Length), InShearPlane: *d.Thread.InShearPlane,
		}
	}
	return t
}

// pattern turns the document into N, mm and MPa.
func (d *GroupDocument) pattern() fastener.Pattern {
	mm, stiffness := d.Units.scale(strength.Length), d.Units.scale(strength.Stiffness)
	p := fastener.Pattern{Stiffness: d.Stiffness, Interaction: d.Interaction, InPlane: *d.InPlane, OutOfPlane: *d.OutOfPlane}
	for _, one := range d.Fasteners {
		p.Fasteners = append(p.Fasteners, fastener.Fastener{
			ID: one.ID, X: one.X * mm, Y: one.Y * mm, Diameter: one.Diameter * mm,
			Type: d.Units.fastenerType(one.Type), ShearPlanes: *one.ShearPlanes,
			ShearStiffness: value(one.ShearStiffness) * stiffness, TensionStiffness: value(one.TensionStiffness) * stiffness,
		})
	}
	for _, plate := range *d.Plates {
		out := fastener.Plate{
			ID: plate.ID, Thickness: plate.Thickness * mm, CountersinkDepth: value(plate.CountersinkDepth) * mm,
			LoadShare: value(plate.LoadShare),
		}
		if plate.Material != nil {
			m := d.Units.material(plate.Material.Object)
			out.Material = &m
		}
		for _, point := range plate.Outline {
			out.Outline = append(out.Outline, [2]float64{point[0] * mm, point[1] * mm})
		}
		p.Plates = append(p.Plates, out)
	}
	for _, name := range *d.Rules {
		set, _ := fastener.FindRules(name)
		p.Rules = append(p.Rules, set)
	}
	return p
}

func (d *GroupDocument) prepare(f *faults) *prepared {
	mm, newton, moment := d.Units.scale(strength.Length), d.Units.scale(strength.Force), d.Units.scale(strength.Moment)
	times := func(v [3]float64, by float64) [3]float64 { return [3]float64{v[0] * by, v[1] * by, v[2] * by} }
	cases := make([]fastener.PatternCase, len(d.LoadCases))
	for i, c := range d.LoadCases {
		cases[i] = fastener.PatternCase{
			ID: c.ID, Level: c.Level.strength(),
			Point: times(c.Point, mm), Force: times(c.Force, newton), Moment: times(c.Moment, moment),
		}
	}
	p, found := fastener.PreparePattern(d.pattern(), d.Factors.strength(), cases)
	f.take(found, d.Units)
	if len(f.list) > 0 {
		return nil
	}
	return &prepared{
		assembly: assembly{
			calculation: p, units: d.Units, methods: methodsOf(p),
			cases: loadCases(d.LoadCases, func(c *GroupLoadCase) string { return c.ID }),
		},
		places: len(d.Fasteners),
		add:    func(r *Result, loads []int) { d.addShares(p, r, loads) },
	}
}

// addShares fills in the centroid and the shares of the load cases wanted, of
// all when loads is nil.
func (d *GroupDocument) addShares(p *fastener.PreparedPattern, r *Result, loads []int) {
	centroid := p.Centroid()
	for i := range centroid {
		centroid[i] = d.Units.out(centroid[i], strength.Length)
	}
	r.Centroid = &centroid
	if loads == nil {
		for i := range d.LoadCases {
			loads = append(loads, i)
		}
	}
	shares := make([]fastener.Share, len(d.Fasteners))
	force := func(x float64) float64 { return d.Units.out(x, strength.Force) }
	for _, i := range loads {
		one := CaseShares{LoadCase: d.LoadCases[i].ID, Residual: p.Shares(i, shares)}
		for k, s := range shares {
			one.Fasteners = append(one.Fasteners, FastenerShare{
				ID: d.Fasteners[k].ID, Shear: [2]float64{force(s.Shear[0]), force(s.Shear[1])},
				ShearResultant: force(s.Resultant), Tension: force(s.Tension),
			})
		}
		r.Shares = append(r.Shares, one)
	}
}

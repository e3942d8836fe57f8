package service

import (
	"strings"

	"jointledger/fastener"
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
	Packing     *float64        `json:"packing_thickness,omitzero" validate:"omitnil,amount"`
	Rules       *[]RuleSetRef   `json:"rules,omitzero" validate:"omitnil,max=20,dive"`
	Methods     *[]string       `json:"methods,omitzero" validate:"omitnil,min=1,max=10"`
	Options     GroupOptions    `json:"method_options,omitzero"`
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
	HoleDiameter     *float64         `json:"hole_diameter,omitzero" validate:"omitnil,size"`
	Type             *FastenerTypeRef `json:"type,omitzero"`
	ShearPlanes      *int             `json:"shear_planes,omitzero" validate:"omitnil,oneof=1 2"`
	ShearStiffness   *float64         `json:"shear_stiffness,omitzero" validate:"omitnil,size"`
	TensionStiffness *float64         `json:"tension_stiffness,omitzero" validate:"omitnil,size"`
	E                *float64         `json:"e,omitzero" validate:"omitnil,size"`
	Nu               *float64         `json:"nu,omitzero" validate:"omitnil,poisson"`
	Installation     *string          `json:"installation,omitzero" validate:"omitnil,oneof=bolted riveted bolted-composite"`
	SlotAngle        *float64         `json:"slot_angle,omitzero" validate:"omitnil,angle"`
}

// Plate is one of the members that the fasteners join; the first is the
// attached one.
type Plate struct {
	ID               string       `json:"id" validate:"id"`
	Thickness        float64      `json:"thickness" validate:"size"`
	Material         *MaterialRef `json:"material,omitzero"`
	Outline          [][2]float64 `json:"outline,omitzero" validate:"omitempty,min=3,max=1000,dive,dive,signed"`
	AxisAngle        *float64     `json:"axis_angle,omitzero" validate:"omitnil,angle"`
	CountersinkDepth *float64     `json:"countersink_depth,omitzero" validate:"omitnil,amount"`
	LoadShare        *float64     `json:"load_share,omitzero" validate:"omitnil,share"`
}

// GroupOptions are the choices of methods of strength, of those that are asked
// for.
type GroupOptions struct {
	AISC *AISCOptions `json:"aisc-360-j3,omitzero"`
	EN   *ENOptions   `json:"en-1993-1-8,omitzero"`
}

// AISCOptions are the choices of method aisc-360-j3.
type AISCOptions struct {
	Basis              *string `json:"basis,omitzero" validate:"omitnil,oneof=lrfd asd"`
	DeformationAllowed *bool   `json:"deformation_allowed,omitzero"`
	ApplySpecial       *bool   `json:"apply_special,omitzero"`
}

// ENOptions are the choices of method en-1993-1-8.
type ENOptions struct {
	GammaM2      *float64 `json:"gamma_m2,omitzero" validate:"omitnil,factor"`
	ApplySpecial *bool    `json:"apply_special,omitzero"`
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

// resolve writes every default that is a value out and puts objects in the
// place of names. A hole's diameter follows the fastener's and a plate's share
// the planes of shear, so these stay out.
func (d *GroupDocument) resolve(_ lookup, f *faults) {
	setDefault(&d.Title, "")
	setDefault(&d.Plates, []Plate{})
	setDefault(&d.Packing, 0)
	setDefault(&d.Rules, []RuleSetRef{})
	setDefault(&d.InPlane, "elastic")
	setDefault(&d.OutOfPlane, "centroid")
	f.unique("fasteners", len(d.Fasteners), func(i int) string { return d.Fasteners[i].ID })
	f.unique("plates", len(*d.Plates), func(i int) string { return (*d.Plates)[i].ID })
	f.unique("load_cases", len(d.LoadCases), func(i int) string { return d.LoadCases[i].ID })
	if formula, ok := fastener.FindCompliance(d.Stiffness); ok {
		d.Stiffness = formula.Name()
	}
	for i := range d.Fasteners {
		one := &d.Fasteners[i]
		setDefault(&one.ShearPlanes, 1)
		setDefault(&one.Installation, fastener.Bolted)
		resolveFastenerType(one.Type, d.Units, pointer("fasteners", i, "type"), f)
	}
	names := []string{"fastener", "pattern"}
	for i := range *d.Plates {
		plate := &(*d.Plates)[i]
		names = append(names, plate.ID)
		resolveMaterial(plate.Material, d.Units, pointer("plates", i, "material"), f)
		setDefault(&plate.CountersinkDepth, 0)
	}
	resolveRules(*d.Rules, d.Units, f)
	d.resolveMethods(f)
	d.Factors.resolve(names, f)
}

// resolveMethods turns the names of methods into id@revision and writes their
// options out.
func (d *GroupDocument) resolveMethods(f *faults) {
	setDefault(&d.Methods, []string{"elementary"})
	methods := *d.Methods
	chosen := map[string]bool{}
	for i, name := range methods {
		word, pinned, ok := fastener.FindStrength(name)
		switch {
		case !ok:
			f.add(pointer("methods", i), "there is no method of strength %.80q; there are %s", name, strings.Join(fastener.StrengthMethods(), ", "))
			continue
		case chosen[word]:
			f.add(pointer("methods", i), "%s is named twice", pinned)
		}
		methods[i], chosen[word] = pinned, true
	}
	idle := func(id string) {
		f.add(pointer("method_options", id), "%s is not in methods", id)
	}
	switch aisc := &d.Options.AISC; {
	case chosen["aisc-360-j3"]:
		setDefault(aisc, AISCOptions{})
		setDefault(&(*aisc).Basis, "lrfd")
		setDefault(&(*aisc).DeformationAllowed, false)
		setDefault(&(*aisc).ApplySpecial, false)
	case *aisc != nil:
		idle("aisc-360-j3")
	}
	switch en := &d.Options.EN; {
	case chosen["en-1993-1-8"]:
		setDefault(en, ENOptions{})
		setDefault(&(*en).GammaM2, 1.25)
		setDefault(&(*en).ApplySpecial, false)
	case *en != nil:
		idle("en-1993-1-8")
	}
}

// groupOptions describes the options of methods of strength.
var groupOptions = map[string][]OptionItem{
	"aisc-360-j3": {
		{Name: "basis", Meaning: "load and resistance factors, or allowable strength", Type: "string", Default: "lrfd", Words: []string{"lrfd", "asd"}},
		{Name: "deformation_allowed", Meaning: "the deformation of holes at service load is no matter of the design: 1.5 l_c t F_u <= 3.0 d t F_u", Type: "boolean", Default: false},
		applySpecial,
	},
	"en-1993-1-8": {
		{Name: "gamma_m2", Meaning: "the partial factor γ_M2", Type: "number", Default: 1.25, Least: new(1.0), Most: new(1000.0)},
		applySpecial,
	},
}

var applySpecial = OptionItem{Name: "apply_special", Meaning: "fitting and special factors act on this method too", Type: "boolean", Default: false}

// Neighbour is the nearest other fastener of one.
type Neighbour = fastener.Neighbour

// Neighbours finds the nearest other fastener of each, in the document's units.
func (d *GroupDocument) Neighbours() []Neighbour {
	centres := make([]fastener.Fastener, len(d.Fasteners))
	for i, f := range d.Fasteners {
		centres[i] = fastener.Fastener{X: f.X, Y: f.Y}
	}
	return fastener.NearestNeighbours(centres)
}

// pattern turns the document into N, mm and MPa.
func (d *GroupDocument) pattern() fastener.Pattern {
	mm, stress, stiffness := d.Units.scale(strength.Length), d.Units.scale(strength.Stress), d.Units.scale(strength.Stiffness)
	p := fastener.Pattern{
		Stiffness: d.Stiffness, Interaction: d.Interaction, InPlane: *d.InPlane, OutOfPlane: *d.OutOfPlane,
		PackingThickness: *d.Packing * mm,
	}
	for _, name := range *d.Methods {
		if word, _, ok := fastener.FindStrength(name); ok {
			p.Methods = append(p.Methods, word)
		}
	}
	if o := d.Options.AISC; o != nil && o.Basis != nil {
		p.AISC = fastener.AISCOptions{Basis: *o.Basis, DeformationAllowed: *o.DeformationAllowed, ApplySpecial: *o.ApplySpecial}
	}
	if o := d.Options.EN; o != nil && o.GammaM2 != nil {
		p.EN = fastener.ENOptions{GammaM2: *o.GammaM2, ApplySpecial: *o.ApplySpecial}
	}
	for _, one := range d.Fasteners {
		p.Fasteners = append(p.Fasteners, fastener.Fastener{
			ID: one.ID, X: one.X * mm, Y: one.Y * mm, Diameter: one.Diameter * mm, HoleDiameter: value(one.HoleDiameter) * mm,
			Type: d.Units.fastenerType(one.Type), ShearPlanes: *one.ShearPlanes,
			ShearStiffness: value(one.ShearStiffness) * stiffness, TensionStiffness: value(one.TensionStiffness) * stiffness,
			E: value(one.E) * stress, Nu: value(one.Nu), Installation: *one.Installation, SlotAngle: one.SlotAngle,
		})
	}
	for _, plate := range *d.Plates {
		out := fastener.Plate{
			ID: plate.ID, Thickness: plate.Thickness * mm, CountersinkDepth: value(plate.CountersinkDepth) * mm,
			AxisAngle: plate.AxisAngle, LoadShare: value(plate.LoadShare),
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
	for i := range *d.Rules {
		p.Rules = append(p.Rules, d.Units.ruleSet(&(*d.Rules)[i]))
	}
	return p
}

// cases turns the load cases into N, mm and N·mm.
func (d *GroupDocument) cases() []fastener.PatternCase {
	mm, newton, moment := d.Units.scale(strength.Length), d.Units.scale(strength.Force), d.Units.scale(strength.Moment)
	times := func(v [3]float64, by float64) [3]float64 { return [3]float64{v[0] * by, v[1] * by, v[2] * by} }
	cases := make([]fastener.PatternCase, len(d.LoadCases))
	for i, c := range d.LoadCases {
		cases[i] = fastener.PatternCase{
			ID: c.ID, Level: c.Level.strength(),
			Point: times(c.Point, mm), Force: times(c.Force, newton), Moment: times(c.Moment, moment),
		}
	}
	return cases
}

func (d *GroupDocument) caseIDs() []string {
	return loadCases(d.LoadCases, func(c *GroupLoadCase) string { return c.ID })
}

func (d *GroupDocument) prepare(f *faults) *prepared {
	p, found := fastener.PreparePattern(d.pattern(), d.Factors.strength(), d.cases())
	f.take(found, d.Units)
	if len(f.list) > 0 {
		return nil
	}
	return &prepared{
		assembly: assembly{
			calculation: p, units: d.Units, methods: methodsOf(p),
			cases: d.caseIDs(),
		},
		places: len(d.Fasteners),
		add:    func(r *Result, loads []int) { d.addShares(p, r, loads) },
	}
}

// addShares fills in the centroid and the shares of the load cases wanted.
func (d *GroupDocument) addShares(p *fastener.PreparedPattern, r *Result, loads []int) {
	centroid := p.Centroid()
	for i := range centroid {
		centroid[i] = d.Units.out(centroid[i], strength.Length)
	}
	r.Centroid, r.Shares = &centroid, []CaseShares{}
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

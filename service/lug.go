package service

import (
	"slices"

	"jointledger/lug"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// LugDocument is the input of POST /v1/lugs: a pin-loaded lug, or the whole
// pinned joint.
type LugDocument struct {
	Units         Units                                `json:"units"`
	Title         *string                              `json:"title,omitzero" validate:"omitnil,text"`
	Methods       []string                             `json:"methods" validate:"min=1,max=50"`
	Compare       *[]string                            `json:"compare,omitzero" validate:"omitnil,max=50"`
	MethodOptions map[string]map[string]strictjson.Raw `json:"method_options,omitzero"`
	Joint         *string                              `json:"joint,omitzero" validate:"omitnil,oneof=double-shear single-shear"`
	Lug           LugHead                              `json:"lug"`
	Pin           *LugPin                              `json:"pin,omitzero"`
	Bushing       *LugBushing                          `json:"bushing,omitzero"`
	Clevis        *Clevis                              `json:"clevis,omitzero"`
	Factors       Factors                              `json:"factors"`
	LoadCases     []LugLoadCase                        `json:"load_cases" validate:"min=1,max=100000,dive"`

	// Made by resolve:
	choices []lug.Choice
	limited []limited // the lengths with a tolerance
}

// LugHead is a lug, or one leg of a clevis.
type LugHead struct {
	Shape          Shape       `json:"shape"`
	Width          Length      `json:"width" validate:"size"`
	Thickness      Length      `json:"thickness" validate:"size"`
	HoleDiameter   Length      `json:"hole_diameter" validate:"size"`
	EdgeDistance   Length      `json:"edge_distance" validate:"size"`
	EndRadius      *Length     `json:"end_radius,omitzero" validate:"omitnil,size"`
	TaperAngle     *float64    `json:"taper_angle,omitzero" validate:"omitnil,angle"`
	Offset         *Length     `json:"offset,omitzero" validate:"omitnil,signed"`
	SectionDepths  *[4]float64 `json:"section_depths,omitzero" validate:"omitnil,dive,size"`
	BodyWidth      *Length     `json:"body_width,omitzero" validate:"omitnil,size"`
	BodyLength     *Length     `json:"body_length,omitzero" validate:"omitnil,size"`
	BodyRestrained *bool       `json:"body_restrained,omitzero"`
	Material       MaterialRef `json:"material"`
}

// Clevis is the mating part: two legs of these dimensions, each carrying its
// share of the load, or in single shear the one mating lug.
type Clevis struct {
	LugHead
	Gap         *Length     `json:"gap,omitzero" validate:"omitnil,amount"`
	Bushing     *LugBushing `json:"bushing,omitzero"`
	LegShare    *float64    `json:"leg_share,omitzero" validate:"omitnil,share"`
	MomentShare *float64    `json:"moment_share,omitzero" validate:"omitnil,portion"`
}

// LugPin is the pin.
type LugPin struct {
	Diameter      Length      `json:"diameter" validate:"size"`
	InnerDiameter *Length     `json:"inner_diameter,omitzero" validate:"omitnil,amount"`
	Material      MaterialRef `json:"material"`
}

// LugBushing is a bushing between the hole and the pin.
type LugBushing struct {
	Material     MaterialRef `json:"material"`
	Interference *Length     `json:"interference,omitzero" validate:"omitnil,amount"`
	Length       *Length     `json:"length,omitzero" validate:"omitnil,size"`
}

// LugLoadCase is a force in the plane of the lug.
type LugLoadCase struct {
	ID    string  `json:"id" validate:"id"`
	Level Level   `json:"level"`
	Force float64 `json:"force" validate:"amount"`
	Angle float64 `json:"angle" validate:"angle"`
}

// Shape is the wire's word for the outline of a lug.
type Shape string

var shapes = map[Shape]lug.Shape{"round": lug.Round, "square": lug.Square, "tapered": lug.Tapered}

// Words implements strictjson.Words.
func (Shape) Words() []string { return []string{"round", "square", "tapered"} }

// resolve writes out every default that is a value. Those that follow another
// dimension (end_radius, body_width, a bushing's length) stay out, so that
// they follow it still when it is varied.
func (d *LugDocument) resolve(look lookup, f *faults) {
	setDefault(&d.Title, "")
	setDefault(&d.Compare, []string{})
	setDefault(&d.Joint, "double-shear")
	f.unique("load_cases", len(d.LoadCases), func(i int) string { return d.LoadCases[i].ID })
	head := func(h *LugHead, at string) {
		resolveMaterial(&h.Material, d.Units, at+"/material", f)
		setDefault(&h.Offset, Length{})
		setDefault(&h.BodyRestrained, false)
	}
	bushing := func(b *LugBushing, at string) {
		if b == nil {
			return
		}
		resolveMaterial(&b.Material, d.Units, at+"/material", f)
		setDefault(&b.Interference, Length{})
	}
	head(&d.Lug, "/lug")
	bushing(d.Bushing, "/bushing")
	if d.Pin != nil {
		resolveMaterial(&d.Pin.Material, d.Units, "/pin/material", f)
		setDefault(&d.Pin.InnerDiameter, Length{})
	}
	if d.Clevis != nil {
		head(&d.Clevis.LugHead, "/clevis")
		setDefault(&d.Clevis.Gap, Length{})
		if *d.Joint == "double-shear" {
			setDefault(&d.Clevis.LegShare, 0.5)
		}
		bushing(d.Clevis.Bushing, "/clevis/bushing")
	}
	d.limited = toleranced(d)
	f.limits(d.limited)
	d.Factors.resolve([]string{"lug", "bushing", "clevis", "clevis-bushing", "pin", "joint"}, f)
	d.resolveMethods(look, f)
}

// resolveMethods turns names into id@revision and writes each method's options
// out.
func (d *LugDocument) resolveMethods(look lookup, f *faults) {
	chosen := map[string]bool{}
	options := map[string]lug.Options{}
	choose := func(list string, names []string, compared bool) {
		for i, name := range names {
			at := pointer(list, i)
			m, ok := lug.Find(name)
			if !ok {
				f.add(at, "there is no lug method %.80q (see /v1/methods?kind=lug)", name)
				continue
			}
			if names[i] = m.Name(); chosen[m.Name()] {
				f.add(at, "%s is named twice", m.Name())
				continue
			}
			chosen[m.Name()] = true
			if options[m.ID] == nil && len(m.Options) > 0 {
				options[m.ID] = d.resolveOptions(m, look, f)
			}
			d.choices = append(d.choices, lug.Choice{Method: m.Name(), Compared: compared, Options: options[m.ID]})
		}
	}
	choose("methods", d.Methods, false)
	choose("compare", *d.Compare, true)
	for id := range d.MethodOptions {
		if options[id] != nil {
			continue
		}
		if _, ok := lug.Find(id); ok {
			f.add(pointer("method_options", id), "%s is neither in methods nor in compare, or has no options", id)
		} else {
			f.add(pointer("method_options", id), "there is no lug method %.80q", id)
		}
	}
}

// resolveOptions reads one method's options and writes them back in full.
func (d *LugDocument) resolveOptions(m lug.Method, look lookup, f *faults) lug.Options {
	given := d.MethodOptions[m.ID]
	resolved := map[string]strictjson.Raw{}
	options := lug.Options{}
	for _, o := range m.Options {
		at := pointer("method_options", m.ID, o.Name)
		raw, ok := given[o.Name]
		if ok {
			if v, ok := readOption(o, raw, look, at, f); ok {
				options[o.Name] = v
			}
		} else if o.HasDefault {
			v := o.Default
			if v.Set != nil {
				// By its name, and so in the record by its digest.
				v.Word = v.Set.Name()
			}
			options[o.Name] = v
		}
		if v, ok := options[o.Name]; ok {
			resolved[o.Name] = writeOption(o, v, raw)
		}
	}
	for name := range given {
		if !slices.ContainsFunc(m.Options, func(o lug.Option) bool { return o.Name == name }) {
			f.add(pointer("method_options", m.ID, name), "%s has no option of this name", m.ID)
		}
	}
	if d.MethodOptions == nil {
		d.MethodOptions = map[string]map[string]strictjson.Raw{}
	}
	d.MethodOptions[m.ID] = resolved
	return options
}

// joint turns the document into N, mm and MPa.
func (d *LugDocument) joint() lug.Joint {
	mm := d.Units.scale(strength.Length)
	length := func(l *Length) float64 { return Nominal(l) * mm }
	head := func(h *LugHead) lug.Head {
		out := lug.Head{
			Shape: shapes[h.Shape],
			Width: length(&h.Width), Thickness: length(&h.Thickness),
			HoleDiameter: length(&h.HoleDiameter), EdgeDistance: length(&h.EdgeDistance),
			EndRadius: length(h.EndRadius), TaperAngle: value(h.TaperAngle), Offset: length(h.Offset),
			BodyWidth: length(h.BodyWidth), BodyLength: length(h.BodyLength), BodyRestrained: *h.BodyRestrained,
			Material: d.Units.material(h.Material.Object),
		}
		if h.SectionDepths != nil {
			depths := *h.SectionDepths
			for i := range depths {
				depths[i] *= mm
			}
			out.SectionDepths = &depths
		}
		return out
	}
	bushing := func(b *LugBushing) *lug.Bushing {
		if b == nil {
			return nil
		}
		return &lug.Bushing{
			Material: d.Units.material(b.Material.Object), Interference: length(b.Interference), Length: length(b.Length),
		}
	}
	j := lug.Joint{SingleShear: *d.Joint == "single-shear", Lug: head(&d.Lug), Bushing: bushing(d.Bushing)}
	if d.Pin != nil {
		j.Pin = &lug.Pin{
			Diameter: length(&d.Pin.Diameter), InnerDiameter: length(d.Pin.InnerDiameter),
			Material: d.Units.material(d.Pin.Material.Object),
		}
	}
	if c := d.Clevis; c != nil {
		j.Clevis = &lug.Clevis{
			Head: head(&c.LugHead), Gap: length(c.Gap), Bushing: bushing(c.Bushing),
			LegShare: value(c.LegShare), MomentShare: c.MomentShare,
		}
	}
	return j
}

// tolerances are those of the joint's lengths.
func (d *LugDocument) tolerances() []lug.Tolerance {
	mm := d.Units.scale(strength.Length)
	var list []lug.Tolerance
	for _, l := range d.limited {
		list = append(list, lug.Tolerance{Pointer: l.at, Minus: l.Minus * mm, Plus: l.Plus * mm})
	}
	return list
}

// Load cases times combinations of limits of one calculation, and of a sizing,
// which makes some hundred.
const (
	mostCorners      = 1_000_000
	mostSizedCorners = 100_000
)

// cornersFit notes when the load cases are too many for the combinations of
// limits, and reports whether all can be calculated.
func (d *LugDocument) cornersFit(most int, f *faults) bool {
	tolerances := len(d.limited)
	if tolerances > lug.MostTolerances { // which is a fault already
		return false
	}
	corners := 1
	if tolerances > 0 {
		corners = 1<<tolerances + 1
	}
	if n := corners * len(d.LoadCases); n > most {
		f.add("/load_cases", "%d load cases at %d combinations of limits are %d, and at most %d can be calculated at once", len(d.LoadCases), corners, n, most)
		return false
	}
	return true
}

// cases turns the load cases into N.
func (d *LugDocument) cases() []lug.LoadCase {
	cases := make([]lug.LoadCase, len(d.LoadCases))
	newton := d.Units.scale(strength.Force)
	for i, c := range d.LoadCases {
		cases[i] = lug.LoadCase{ID: c.ID, Level: c.Level.strength(), Force: c.Force * newton, Angle: c.Angle}
	}
	return cases
}

func (d *LugDocument) prepare(f *faults) *prepared {
	p := &prepared{
		assembly: assembly{
			units: d.Units, methods: append(slices.Clone(d.Methods), *d.Compare...),
			cases: loadCases(d.LoadCases, func(c *LugLoadCase) string { return c.ID }),
		},
		places: 1,
	}
	var nominal *lug.Prepared
	var found []strength.Fault
	if tolerances := d.tolerances(); !d.cornersFit(mostCorners, f) || len(tolerances) == 0 {
		nominal, found = lug.Prepare(d.joint(), d.choices, d.Factors.strength(), d.cases())
		p.calculation = nominal
	} else {
		var t *lug.Toleranced
		if t, found = lug.PrepareToleranced(d.joint(), tolerances, d.choices, d.Factors.strength(), d.cases()); t != nil {
			p.calculation, p.corners, nominal = t, t, t.Nominal()
		}
	}
	f.take(lugFaults(found), d.Units)
	if len(f.list) > 0 {
		return nil
	}
	p.add = func(r *Result, _ []int) {
		r.MethodOptions = d.MethodOptions
		steps := nominal.StressConcentration()
		r.StressConcentration = make([]Working, len(steps))
		for i := range steps {
			r.StressConcentration[i] = d.Units.working(&steps[i])
		}
	}
	return p
}

// lugFaults leaves out what was said before: that the list of methods is empty,
// or what is wrong in it.
func lugFaults(found []strength.Fault) []strength.Fault {
	return slices.DeleteFunc(found, func(one strength.Fault) bool { return one.Pointer == "/methods" })
}

package pages

import (
	"errors"
	"net/http"
	"slices"
	"strconv"
	"strings"

	"jointledger/service"
)

type tryContent struct {
	Kind      string
	Path      string // of the API
	Form      map[string]string
	Chosen    map[string]bool // methods
	Methods   []service.MethodItem
	Materials []service.MaterialItem
	Formulas  []string // of stiffness or compliance
	Answer    *Answer
	Sent      string // the JSON
	Problem   *service.Problem
}

// choice and stock are the options of a field, with the one that is chosen.
type choice struct {
	Options []string
	Chosen  string
}

type stock struct {
	Items         []service.MaterialItem
	Chosen, Empty string
}

// form reads the fields of a form and keeps what cannot be read.
type form struct {
	values map[string]string
	wrong  []service.FieldError
}

func (f *form) fault(name, detail string) {
	f.wrong = append(f.wrong, service.FieldError{Pointer: name, Detail: detail})
}

// parse reads a number that somebody typed or pasted from a page.
func parse(text string) (float64, error) {
	return strconv.ParseFloat(strings.NewReplacer(minus, "-", thinSpace, "", "\u00a0", "", " ", "").Replace(text), 64)
}

// number reads a field that must be there.
func (f *form) number(name string) float64 {
	text := strings.TrimSpace(f.values[name])
	x, err := parse(text)
	if text == "" {
		f.fault(name, "is needed")
	} else if err != nil {
		f.fault(name, "must be a number, not "+strconv.Quote(clip(text, 40)))
	}
	return x
}

// optional reads a field that may be empty.
func (f *form) optional(name string) *float64 {
	if strings.TrimSpace(f.values[name]) == "" {
		return nil
	}
	x := f.number(name)
	return &x
}

func (f *form) length(name string) service.Length { return service.Length{Plain: f.number(name)} }

func (f *form) optionalLength(name string) *service.Length {
	x := f.optional(name)
	if x == nil {
		return nil
	}
	return &service.Length{Plain: *x}
}

// lines reads one item a line: so many words, then so many numbers.
func (f *form) lines(name string, words, numbers int, take func(words []string, numbers []float64)) {
	for i, line := range strings.Split(f.values[name], "\n") {
		fields := strings.Fields(strings.NewReplacer(",", " ", thinSpace, "").Replace(line))
		if len(fields) == 0 {
			continue
		}
		at := name + ", line " + strconv.Itoa(i+1)
		if len(fields) != words+numbers {
			f.fault(at, "must have "+strconv.Itoa(words+numbers)+" items, not "+strconv.Itoa(len(fields)))
			continue
		}
		values := make([]float64, numbers)
		for k, text := range fields[words:] {
			var err error
			if values[k], err = parse(text); err != nil {
				f.fault(at, strconv.Quote(clip(text, 40))+" is not a number")
			}
		}
		take(fields[:words], values)
	}
}

func (f *form) material(name string) service.MaterialRef {
	return service.MaterialRef{Plain: f.values[name]}
}

func (f *form) factors() service.Factors {
	return service.Factors{Ultimate: f.number("ultimate"), Fitting: f.number("fitting")}
}

// trials are the kinds of joint that can be tried, each with a first example
// that is set in the Saltmarsh's tail boom and invented.
var trials = map[service.Kind]struct {
	path  string
	start map[string]string
	read  func(f *form, methods []string) any
}{
	service.Lug: {"/v1/lugs", map[string]string{
		"units": "SI", "title": "SM-214 boom hinge", "shape": "round", "width": "80", "thickness": "12", "hole_diameter": "20", "edge_distance": "40",
		"taper_angle": "", "offset": "", "material": "7050-T7451-plate-0.250-1.500-L", "pin_diameter": "20", "pin_material": "alloy-steel-125-ksi", "bushing_material": "",
		"clevis_thickness": "7", "gap": "0.5", "clevis_material": "7050-T7451-plate-0.250-1.500-L", "ultimate": "1.5", "fitting": "1.15",
		"load_cases": "landing limit 42000 0\nbraking limit 30000 0", "methods": "elementary",
	}, readLug},
	service.FastenerGroup: {"/v1/fastener-groups", map[string]string{
		"units": "SI", "title": "SM-305 bracket to frame", "stiffness": "equal", "in_plane": "elastic", "rules": "common-practice",
		"fasteners": "1 0 0 6\n2 30 0 6\n3 0 30 6\n4 30 30 6\n5 0 60 6\n6 30 60 6", "shear_strength": "16000", "tension_strength": "14000",
		"plate_thickness": "4", "plate_material": "", "outline": "-8 -12\n42 -12\n42 72\n-8 72", "ultimate": "1.5", "fitting": "1.15",
		"load_cases": "landing limit 70 30 0 0 -6000 0 0 0 0",
	}, readGroup},
	service.Splice: {"/v1/splices", map[string]string{
		"units": "SI", "title": "SM-420 boom cap", "compliance": "huth", "members": "cap 72000 3 30\nstrap 72000 4 30",
		"rows": "1 6 110000 25\n1 6 110000 25\n1 6 110000 25\n1 6 110000 0", "installation": "bolted", "shear_strength": "16000",
		"ultimate": "1.5", "fitting": "1.15", "load_cases": "pull limit 20000",
	}, readSplice},
}

func readLug(f *form, methods []string) any {
	d := &service.LugDocument{Units: service.Units(f.values["units"]), Title: new(f.values["title"]), Methods: methods, Factors: f.factors()}
	d.Lug = service.LugHead{
		Shape: service.Shape(f.values["shape"]), Width: f.length("width"), Thickness: f.length("thickness"), HoleDiameter: f.length("hole_diameter"),
		EdgeDistance: f.length("edge_distance"), TaperAngle: f.optional("taper_angle"), Offset: f.optionalLength("offset"), Material: f.material("material"),
	}
	if strings.TrimSpace(f.values["pin_diameter"]) != "" {
		d.Pin = &service.LugPin{Diameter: f.length("pin_diameter"), Material: f.material("pin_material")}
	}
	if f.values["bushing_material"] != "" {
		d.Bushing = &service.LugBushing{Material: f.material("bushing_material")}
	}
	if strings.TrimSpace(f.values["clevis_thickness"]) != "" {
		leg := d.Lug
		leg.Thickness, leg.Material = f.length("clevis_thickness"), f.material("clevis_material")
		d.Clevis = &service.Clevis{LugHead: leg, Gap: f.optionalLength("gap")}
		if d.Bushing != nil {
			b := *d.Bushing
			d.Clevis.Bushing = &b
		}
	}
	f.lines("load_cases", 2, 2, func(w []string, n []float64) {
		d.LoadCases = append(d.LoadCases, service.LugLoadCase{ID: w[0], Level: service.Level(w[1]), Force: n[0], Angle: n[1]})
	})
	return d
}

func readGroup(f *form, _ []string) any {
	d := &service.GroupDocument{Units: service.Units(f.values["units"]), Title: new(f.values["title"]), Stiffness: f.values["stiffness"], Factors: f.factors()}
	if f.values["rules"] != "" {
		d.Rules = &[]service.RuleSetRef{{Plain: f.values["rules"]}}
	}
	d.InPlane = new(f.values["in_plane"])
	var kind *service.FastenerTypeRef
	if shear, tension := f.optional("shear_strength"), f.optional("tension_strength"); shear != nil || tension != nil {
		kind = &service.FastenerTypeRef{Object: &service.FastenerType{Name: "as typed", Source: "typed into the form", ShearStrength: shear, TensionStrength: tension}}
	}
	f.lines("fasteners", 1, 3, func(w []string, n []float64) {
		d.Fasteners = append(d.Fasteners, service.Fastener{ID: w[0], X: n[0], Y: n[1], Diameter: n[2], Type: kind})
	})
	if thickness := f.optional("plate_thickness"); thickness != nil {
		plate := service.Plate{ID: "attached", Thickness: *thickness}
		if f.values["plate_material"] != "" {
			plate.Material = new(f.material("plate_material"))
		}
		f.lines("outline", 0, 2, func(_ []string, n []float64) { plate.Outline = append(plate.Outline, [2]float64{n[0], n[1]}) })
		d.Plates = &[]service.Plate{plate}
	}
	f.lines("load_cases", 2, 9, func(w []string, n []float64) {
		d.LoadCases = append(d.LoadCases, service.GroupLoadCase{
			ID: w[0], Level: service.Level(w[1]), Point: [3]float64(n[0:3]), Force: [3]float64(n[3:6]), Moment: [3]float64(n[6:9]),
		})
	})
	return d
}

func readSplice(f *form, _ []string) any {
	d := &service.SpliceDocument{Units: service.Units(f.values["units"]), Title: new(f.values["title"]), Compliance: f.values["compliance"], Factors: f.factors()}
	var kind *service.FastenerTypeRef
	if shear := f.optional("shear_strength"); shear != nil {
		kind = &service.FastenerTypeRef{Object: &service.FastenerType{Name: "as typed", Source: "typed into the form", ShearStrength: shear}}
	}
	f.lines("rows", 0, 4, func(_ []string, n []float64) {
		count := int(n[0])
		if float64(count) != n[0] {
			f.fault("rows", "the number of fasteners in a row must be whole")
		}
		d.Rows = append(d.Rows, service.SpliceRow{Count: &count, Diameter: n[1], E: &n[2], Installation: new(f.values["installation"]), Type: kind})
		d.Pitches = append(d.Pitches, n[3])
	})
	if len(d.Pitches) > 0 {
		d.Pitches = d.Pitches[:len(d.Pitches)-1]
	}
	f.lines("members", 1, 3, func(w []string, n []float64) {
		m := service.SpliceMember{ID: w[0], E: n[0]}
		for range d.Pitches {
			m.Bays = append(m.Bays, service.SpliceBay{Thickness: n[1], Width: n[2]})
		}
		for range d.Rows {
			m.RowThickness = append(m.RowThickness, n[1])
		}
		d.Members = append(d.Members, m)
	})
	f.lines("load_cases", 2, 1, func(w []string, n []float64) {
		c := service.SpliceLoadCase{ID: w[0], Level: service.Level(w[1])}
		if last := len(d.Members) - 1; last > 0 {
			c.Ends = &[]service.SpliceEnd{{Member: d.Members[0].ID, Left: n[0]}, {Member: d.Members[last].ID, Right: n[0]}}
		}
		d.LoadCases = append(d.LoadCases, c)
	})
	return d
}

// tryOf prepares the form of a kind, filled with what was typed, or with the
// example.
func (p *Pages) tryOf(v *visit) (*tryContent, service.Kind, error) {
	kind := service.Kind(v.r.PathValue("kind"))
	trial, ok := trials[kind]
	if !ok {
		return nil, "", &service.Problem{Code: service.NotFound, Detail: "There is no form for this kind of joint."}
	}
	c := &tryContent{Kind: string(kind), Path: trial.path, Form: map[string]string{}, Chosen: map[string]bool{}}
	typed := v.r.Method == http.MethodPost
	for name, example := range trial.start {
		c.Form[name] = example
		if typed {
			c.Form[name] = strings.ReplaceAll(v.r.PostForm.Get(name), "\r\n", "\n")
		}
	}
	methods, err := service.Methods("")
	if err != nil {
		return nil, "", err
	}
	for _, m := range methods.Items {
		switch {
		case m.Kind == "lug":
			c.Methods = append(c.Methods, m)
		case m.Kind == "compliance":
			c.Formulas = append(c.Formulas, m.ID)
		}
	}
	chosen := v.r.PostForm["methods"]
	if !typed {
		chosen = strings.Fields(trial.start["methods"])
	}
	for _, name := range chosen {
		c.Chosen[name] = true
	}
	materials, err := service.Materials("")
	if err != nil {
		return nil, "", err
	}
	c.Materials = materials.Items
	return c, kind, nil
}

func (p *Pages) tryForm(v *visit) error { return p.tryAnswer(v) }

func (p *Pages) tryAnswer(v *visit) error {
	c, kind, err := p.tryOf(v)
	if err != nil {
		return err
	}
	f := &form{values: c.Form}
	var methods []string
	for _, m := range c.Methods {
		if c.Chosen[m.ID] && !slices.Contains(methods, m.ID) {
			methods = append(methods, m.ID)
		}
	}
	document := trials[kind].read(f, methods)
	if c.Sent, err = service.Spread(document); err != nil {
		return err
	}
	if len(f.wrong) > 0 {
		c.Problem = &service.Problem{Detail: "The form cannot be sent yet.", Errors: f.wrong}
	} else {
		content, err := p.service.Content(v.r.Context(), kind, []byte(c.Sent))
		if err != nil && !errors.As(err, &c.Problem) {
			return err
		}
		if err == nil {
			c.Answer = new(answerOf(content))
		}
	}
	p.show(v, http.StatusOK, "try", "Try a "+strings.ToLower(kindName(c.Kind)), c)
	return nil
}

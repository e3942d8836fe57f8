package service

import (
	"slices"

	"jointledger/fastener"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// SpliceDocument is the input of POST /v1/splices: members joined by rows of
// fasteners.
type SpliceDocument struct {
	Units      Units            `json:"units"`
	Title      *string          `json:"title,omitzero" validate:"omitnil,text"`
	Members    []SpliceMember   `json:"members" validate:"min=1,max=100,dive"`
	Pitches    []float64        `json:"pitches" validate:"max=10000,dive,size"`
	Rows       []SpliceRow      `json:"rows" validate:"min=1,max=10000,dive"`
	Compliance string           `json:"compliance" validate:"id"`
	Compare    *[]string        `json:"compare_compliance,omitzero" validate:"omitnil,max=20"`
	Symmetric  *bool            `json:"symmetric,omitzero"`
	Factors    Factors          `json:"factors"`
	LoadCases  []SpliceLoadCase `json:"load_cases" validate:"min=1,max=100000,dive"`
}

// SpliceMember is one layer of the stack, in stacking order.
type SpliceMember struct {
	ID               string       `json:"id" validate:"id"`
	E                float64      `json:"e" validate:"size"`
	Material         *MaterialRef `json:"material,omitzero"`
	FirstRow         *int         `json:"first_row,omitzero" validate:"omitnil,min=1"`
	LastRow          *int         `json:"last_row,omitzero" validate:"omitnil,min=1"`
	RowThickness     []float64    `json:"row_thickness,omitzero" validate:"omitempty,max=10000,dive,size"`
	Bays             []SpliceBay  `json:"bays" validate:"max=10000,dive"`
	Expansion        *float64     `json:"expansion,omitzero" validate:"omitnil,signed"`
	EdgeDistance     *float64     `json:"edge_distance,omitzero" validate:"omitnil,size"`
	CountersinkDepth *float64     `json:"countersink_depth,omitzero" validate:"omitnil,amount"`
}

// SpliceBay is the part of a member between two rows.
type SpliceBay struct {
	Thickness float64 `json:"thickness" validate:"size"`
	Width     float64 `json:"width" validate:"size"`
}

// SpliceRow is a row of equal fasteners side by side.
type SpliceRow struct {
	Count        *int             `json:"count,omitzero" validate:"omitnil,min=1,max=10000"`
	Diameter     float64          `json:"diameter" validate:"size"`
	E            *float64         `json:"e,omitzero" validate:"omitnil,size"`
	Nu           *float64         `json:"nu,omitzero" validate:"omitnil,poisson"`
	Installation *string          `json:"installation,omitzero" validate:"omitnil,oneof=bolted riveted bolted-composite"`
	Compliance   *float64         `json:"compliance,omitzero" validate:"omitnil,flexible"`
	Type         *FastenerTypeRef `json:"type,omitzero"`
	ShearPlanes  *int             `json:"shear_planes,omitzero" validate:"omitnil,oneof=1 2"`
	Clearance    *float64         `json:"clearance,omitzero" validate:"omitnil,amount"`
}

// SpliceLoadCase is a set of end loads, and of changes of temperature.
type SpliceLoadCase struct {
	ID           string              `json:"id" validate:"id"`
	Level        Level               `json:"level"`
	Ends         *[]SpliceEnd        `json:"ends,omitzero" validate:"omitnil,max=100,dive"`
	Temperatures []TemperatureChange `json:"temperatures,omitzero" validate:"omitempty,max=100,dive"`
}

// SpliceEnd is the load on a member's ends, tension positive.
type SpliceEnd struct {
	Member string  `json:"member" validate:"id"`
	Left   float64 `json:"left" validate:"signed"`
	Right  float64 `json:"right" validate:"signed"`
}

// TemperatureChange of a whole member, in the degrees of its expansion.
type TemperatureChange struct {
	Member string  `json:"member" validate:"id"`
	Change float64 `json:"change" validate:"signed"`
}

// CaseTransfers is how one load case goes through the rows.
type CaseTransfers struct {
	LoadCase string         `json:"load_case"`
	Rows     []RowTransfers `json:"rows"`
	Residual float64        `json:"residual"`
	// Contact tells how hole clearances were taken up, null without them.
	Contact *Contact `json:"contact"`
	// Plastic is the load of each interface if every row yields, row by row
	// in the order of rows; empty where it does not follow from the end loads.
	Plastic []float64 `json:"plastic"`
}

// Contact tells how an iteration over clearances ended.
type Contact struct {
	Ended string `json:"ended"`
	Steps int    `json:"steps"`
	Open  int    `json:"open"`
}

// RowTransfers is what one row passes on.
type RowTransfers struct {
	Row        int               `json:"row"`
	Interfaces []InterfaceLoad   `json:"interfaces"`
	Members    []SpliceMemberRow `json:"members"`
}

// InterfaceLoad is the tension that a row takes out of the first member and
// puts into the second.
type InterfaceLoad struct {
	Between [2]string `json:"between"`
	Load    float64   `json:"load"`
	Share   float64   `json:"share"`
}

// SpliceMemberRow is what a row does to a member.
type SpliceMemberRow struct {
	Member        string   `json:"member"`
	Bearing       float64  `json:"bearing"`
	Bypass        float64  `json:"bypass"`
	BearingStress *float64 `json:"bearing_stress"`
	BypassStress  *float64 `json:"bypass_stress"`
}

// ComparedTransfers is the sharing by another compliance.
type ComparedTransfers struct {
	Compliance string `json:"compliance"`
	// Message says why there is none, null where there is.
	Message *string `json:"message"`
	// LargestShift is the largest change of a share from the compliance asked
	// for.
	LargestShift *float64        `json:"largest_shift"`
	Transfers    []CaseTransfers `json:"transfers"`
}

func (d *SpliceDocument) resolve(_ lookup, f *faults) {
	setDefault(&d.Title, "")
	setDefault(&d.Compare, []string{})
	setDefault(&d.Symmetric, false)
	f.unique("members", len(d.Members), func(i int) string { return d.Members[i].ID })
	f.unique("load_cases", len(d.LoadCases), func(i int) string { return d.LoadCases[i].ID })
	names := []string{"fastener"}
	for i := range d.Members {
		m := &d.Members[i]
		names = append(names, m.ID)
		setDefault(&m.FirstRow, 1)
		setDefault(&m.LastRow, max(1, len(d.Rows)))
		setDefault(&m.CountersinkDepth, 0)
		resolveMaterial(m.Material, d.Units, pointer("members", i, "material"), f)
	}
	for i := range d.Rows {
		r := &d.Rows[i]
		setDefault(&r.Count, 1)
		setDefault(&r.Installation, fastener.Bolted)
		setDefault(&r.Clearance, 0)
		resolveFastenerType(r.Type, d.Units, pointer("rows", i, "type"), f)
	}
	for i := range d.LoadCases {
		setDefault(&d.LoadCases[i].Ends, []SpliceEnd{})
	}
	formula := func(name *string, at string) {
		if *name == fastener.ComplianceGiven {
			return
		}
		found, ok := fastener.FindCompliance(*name)
		if !ok {
			f.add(at, "there is no compliance formula %.80q (see /v1/methods?kind=compliance)", *name)
			return
		}
		*name = found.Name()
	}
	formula(&d.Compliance, "/compliance")
	for i, name := range *d.Compare {
		at := pointer("compare_compliance", i)
		formula(&name, at)
		if slices.Contains((*d.Compare)[:i], name) {
			f.add(at, "%s is named twice", name)
		}
		(*d.Compare)[i] = name
	}
	d.Factors.resolve(names, f)
}

// splice turns the document into N, mm and MPa.
func (d *SpliceDocument) splice() (fastener.Splice, []fastener.SpliceCase) {
	mm, stress, newton := d.Units.scale(strength.Length), d.Units.scale(strength.Stress), d.Units.scale(strength.Force)
	s := fastener.Splice{Compliance: d.Compliance, CompareCompliance: *d.Compare, Symmetric: *d.Symmetric}
	for _, p := range d.Pitches {
		s.Pitches = append(s.Pitches, p*mm)
	}
	for _, m := range d.Members {
		out := fastener.Member{
			ID: m.ID, E: m.E * stress, FirstRow: *m.FirstRow, LastRow: *m.LastRow, Expansion: value(m.Expansion),
			EdgeDistance: value(m.EdgeDistance) * mm, CountersinkDepth: value(m.CountersinkDepth) * mm,
		}
		if m.Material != nil {
			material := d.Units.material(m.Material.Object)
			out.Material = &material
		}
		for _, t := range m.RowThickness {
			out.RowThickness = append(out.RowThickness, t*mm)
		}
		for _, b := range m.Bays {
			out.Bays = append(out.Bays, fastener.Bay{Thickness: b.Thickness * mm, Width: b.Width * mm})
		}
		s.Members = append(s.Members, out)
	}
	for _, r := range d.Rows {
		out := fastener.Row{
			Count: *r.Count, Diameter: r.Diameter * mm, E: value(r.E) * stress, Nu: value(r.Nu), Installation: *r.Installation,
			Compliance: value(r.Compliance) * d.Units.scale(strength.Compliance), Clearance: value(r.Clearance) * mm,
			Type: d.Units.fastenerType(r.Type),
		}
		if r.ShearPlanes != nil {
			out.ShearPlanes = *r.ShearPlanes
		}
		s.Rows = append(s.Rows, out)
	}
	cases := make([]fastener.SpliceCase, len(d.LoadCases))
	for i, c := range d.LoadCases {
		cases[i] = fastener.SpliceCase{ID: c.ID, Level: c.Level.strength()}
		for _, e := range *c.Ends {
			cases[i].Ends = append(cases[i].Ends, fastener.End{Member: e.Member, Left: e.Left * newton, Right: e.Right * newton})
		}
		for _, t := range c.Temperatures {
			cases[i].Temperatures = append(cases[i].Temperatures, fastener.TemperatureChange(t))
		}
	}
	return s, cases
}

func (d *SpliceDocument) prepare(f *faults) *prepared {
	s, cases := d.splice()
	p, found := fastener.PrepareSplice(s, d.Factors.strength(), cases)
	f.take(found, d.Units)
	if len(f.list) > 0 {
		return nil
	}
	return &prepared{
		assembly: assembly{
			calculation: p, units: d.Units, methods: methodsOf(p),
			cases: loadCases(d.LoadCases, func(c *SpliceLoadCase) string { return c.ID }),
		},
		places: len(d.Rows),
		add:    func(r *Result, loads []int) { d.addTransfers(p, r, loads) },
	}
}

// addTransfers fills in how the load cases wanted go through the rows, and how
// other compliances would share them.
func (d *SpliceDocument) addTransfers(p *fastener.PreparedSplice, r *Result, loads []int) {
	r.Transfers, r.Compared = []CaseTransfers{}, []ComparedTransfers{}
	if !p.Undetermined().Empty() {
		return
	}
	room, plastic := p.NewTransfers(), []float64(nil)
	for _, i := range loads {
		p.Transfers(i, &room)
		one := d.transfers(i, &room)
		if plastic == nil {
			plastic = make([]float64, len(room.Interfaces))
		}
		if p.PlasticLoads(i, plastic) {
			for _, x := range plastic {
				one.Plastic = append(one.Plastic, d.Units.out(x, strength.Force))
			}
		}
		r.Transfers = append(r.Transfers, one)
	}
	for k, c := range p.Compared() {
		compared := ComparedTransfers{Compliance: c.Name, Transfers: []CaseTransfers{}}
		if !c.Why.Empty() {
			compared.Message = text(d.Units.say(c.Why))
			r.Compared = append(r.Compared, compared)
			continue
		}
		shift := 0.0
		for at, i := range loads {
			p.ComparedTransfers(k, i, &room)
			one := d.transfers(i, &room)
			shift = max(shift, largestShift(r.Transfers[at], one))
			compared.Transfers = append(compared.Transfers, one)
		}
		compared.LargestShift = &shift
		r.Compared = append(r.Compared, compared)
	}
}

// transfers writes one load case in the caller's units.
func (d *SpliceDocument) transfers(i int, t *fastener.Transfers) CaseTransfers {
	force := func(x float64) float64 { return d.Units.out(x, strength.Force) }
	stress := func(x float64) *float64 {
		y := d.Units.out(x, strength.Stress)
		return &y
	}
	out := CaseTransfers{LoadCase: d.LoadCases[i].ID, Rows: make([]RowTransfers, len(d.Rows)), Residual: t.Residual}
	for r := range out.Rows {
		out.Rows[r].Row = r + 1
	}
	for _, load := range t.Interfaces {
		row := &out.Rows[load.Row-1]
		row.Interfaces = append(row.Interfaces, InterfaceLoad{
			Between: [2]string{d.Members[load.First].ID, d.Members[load.Second].ID}, Load: force(load.Load), Share: load.Share,
		})
	}
	for _, load := range t.Members {
		member := SpliceMemberRow{Member: d.Members[load.Member].ID, Bearing: force(load.Bearing), Bypass: force(load.Bypass)}
		if load.HasStress {
			member.BearingStress, member.BypassStress = stress(load.BearingStress), stress(load.BypassStress)
		}
		row := &out.Rows[load.Row-1]
		row.Members = append(row.Members, member)
	}
	if t.Contact.Ended != "" {
		out.Contact = &Contact{t.Contact.Ended, t.Contact.Steps, t.Contact.Open}
	}
	return out
}

// largestShift is the largest change of a share between two sharings of one
// load case.
func largestShift(was, is CaseTransfers) float64 {
	shift := 0.0
	for r := range was.Rows {
		for k, load := range was.Rows[r].Interfaces {
			shift = max(shift, load.Share-is.Rows[r].Interfaces[k].Share, is.Rows[r].Interfaces[k].Share-load.Share)
		}
	}
	return shift
}

// methodsOf lists the methods of a calculation's checks, each once, in order.
func methodsOf(c strength.Calculation) []string {
	var methods []string
	for _, check := range c.Checks() {
		if !slices.Contains(methods, check.Method) {
			methods = append(methods, check.Method)
		}
	}
	return methods
}

// StepsRequest asks for the thicknesses of bays that even the load of the rows.
type StepsRequest struct {
	Input  strictjson.Raw `json:"input"`
	Bounds []StepBound    `json:"bounds" validate:"min=1,max=10000,dive"`
	Goal   string         `json:"goal" validate:"oneof=even least-volume"`
	Peak   *float64       `json:"peak,omitzero" validate:"omitnil,share"`
}

// StepBound lets a member's bays be chosen between two thicknesses.
type StepBound struct {
	Member string  `json:"member" validate:"id"`
	Bay    *int    `json:"bay,omitzero" validate:"omitnil,min=1"`
	Least  float64 `json:"least" validate:"size"`
	Most   float64 `json:"most" validate:"size"`
}

// StepsAnswer holds the steps found.
type StepsAnswer struct {
	Members []SteppedMember `json:"members"`
	Before  StepState       `json:"before"`
	After   StepState       `json:"after"`
	// Reached tells whether the peak that least-volume was given is kept.
	Reached     bool   `json:"reached"`
	Evaluations int    `json:"evaluations"`
	Result      Result `json:"result"`
}

// SteppedMember is a member with the bays found.
type SteppedMember struct {
	ID   string      `json:"id"`
	Bays []SpliceBay `json:"bays"`
}

// StepState is the highest share of any row, where it is, and the volume of
// the bays.
type StepState struct {
	Peak     float64   `json:"peak"`
	Row      int       `json:"row"`
	Between  [2]string `json:"between"`
	LoadCase string    `json:"load_case"`
	Volume   float64   `json:"volume"`
}

// Steps finds the steps of a splice.
func Steps(body []byte, view View) (*StepsAnswer, error) {
	var request StepsRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, malformed(err, "")
	}
	var d SpliceDocument
	var f faults
	if err := f.input(request.Input, &d); err != nil {
		return nil, err
	}
	f.check(&request)
	mm := d.Units.scale(strength.Length)
	var bounds []fastener.StepBound
	for _, b := range request.Bounds {
		bound := fastener.StepBound{Member: b.Member, Least: b.Least * mm, Most: b.Most * mm}
		if b.Bay != nil {
			bound.Bay = *b.Bay
		}
		bounds = append(bounds, bound)
	}
	s, cases := d.splice()
	found, wrong := fastener.Steps(s, cases, bounds, fastener.StepGoal{Kind: request.Goal, Peak: value(request.Peak)})
	f.take(wrong, d.Units)
	if p := f.problem(); p != nil {
		return nil, p
	}
	state := func(s fastener.StepState) StepState {
		return StepState{
			Peak: s.Peak, Row: s.Row, Between: [2]string{d.Members[s.First].ID, d.Members[s.Second].ID},
			LoadCase: s.LoadCase, Volume: d.Units.out(s.Volume, strength.Volume),
		}
	}
	answer := &StepsAnswer{
		Before: state(found.Before), After: state(found.After), Reached: found.Reached, Evaluations: found.Evaluations,
	}
	for i, m := range found.Splice.Members {
		for k, b := range m.Bays {
			d.Members[i].Bays[k].Thickness = d.Units.out(b.Thickness, strength.Length)
		}
		answer.Members = append(answer.Members, SteppedMember{m.ID, d.Members[i].Bays})
	}
	stepped, err := strictjson.Encode(&d)
	if err != nil {
		return nil, err
	}
	c, err := calculate(Splice, stepped, view, noRegistry{})
	if err != nil {
		return nil, err
	}
	answer.Result = c.result
	return answer, nil
}

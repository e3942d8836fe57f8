package pages

import (
	"fmt"
	"html/template"
	"strings"

	"jointledger/service"
)

// inputTable is a part of a record's input. Columns with a unit in their head
// hold numbers and are set to the right.
type inputTable struct {
	Title string
	Head  []column
	Rows  [][]string
	Long  bool // to be folded away on the screen
}

// Body is the rows as HTML. A table may have thousands of cells, and a template
// takes ten times as long for each.
func (t inputTable) Body() template.HTML {
	var b strings.Builder
	for _, row := range t.Rows {
		b.WriteString("<tr>")
		for i, cell := range row {
			if t.Head[i].Number {
				b.WriteString(`<td class="n">`)
			} else {
				b.WriteString("<td>")
			}
			b.WriteString(escape(cell))
			b.WriteString("</td>")
		}
		b.WriteString("</tr>\n")
	}
	return template.HTML(b.String())
}

type column struct {
	Name, Unit string
	Number     bool
}

// dimensions is a table of names, values and units.
func dimensions(title string) inputTable {
	return inputTable{Title: title, Head: []column{{Name: "What"}, {Name: "Value", Number: true}, {Name: "Unit"}}}
}

func (t *inputTable) add(cells ...string) { t.Rows = append(t.Rows, cells) }

func (t *inputTable) length(name string, l *service.Length, unit string) {
	if l != nil {
		t.add(name, length(l), unit)
	}
}

func (t *inputTable) number(name string, x *float64, unit string) {
	if x != nil {
		t.add(name, number(*x), unit)
	}
}

func factorsTable(f *service.Factors) inputTable {
	t := inputTable{Title: "Factors", Head: []column{{Name: "Factor"}, {Name: "Value", Number: true}, {Name: "Basis"}, {Name: "Acts on"}}}
	t.add("ultimate", number(f.Ultimate), "", "")
	t.add("fitting", number(f.Fitting), "", "")
	for _, s := range f.Special {
		on := append(append([]string{}, s.Members...), s.Modes...)
		if s.Level != nil && *s.Level != "both" {
			on = append(on, *s.Level+" only")
		}
		acts := strings.Join(on, ", ")
		if acts == "" {
			acts = "everything"
		}
		t.add(s.Name, number(s.Value), s.Basis, words(acts))
	}
	return t
}

// materialsTable lists materials by the member that they are of.
type materialsTable struct{ inputTable }

func newMaterials(u service.Units) *materialsTable {
	s := stressUnit(u)
	return &materialsTable{inputTable{Title: "Materials", Head: []column{
		{Name: "Member"},
		{Name: "Material"},
		{Name: "Ftu", Unit: s, Number: true},
		{Name: "Fty", Unit: s, Number: true},
		{Name: "Ftu across", Unit: s, Number: true},
		{Name: "Fty across", Unit: s, Number: true},
		{Name: "Fcy", Unit: s, Number: true},
		{Name: "Fsu", Unit: s, Number: true},
		{Name: "E", Unit: s, Number: true},
		{Name: "Elongation", Unit: "%", Number: true},
		{Name: "Source and mark"},
	}}}
}

func (t *materialsTable) material(member string, ref *service.MaterialRef) {
	if ref == nil || ref.Object == nil {
		return
	}
	m := ref.Object
	name := m.Name
	for _, more := range []string{m.Direction, m.Basis} {
		if more != "" {
			name += ", " + more
		}
	}
	elongation := "—"
	if m.Elongation != nil {
		elongation = number(100 * *m.Elongation)
	}
	source := m.Source
	if m.Mark != "" {
		source += " (" + m.Mark + ")"
	}
	for _, b := range m.Bearing {
		source += "; bearing at e/D " + number(b.EOverD) + ": Fbru " + value(b.Fbru) + ", Fbry " + value(b.Fbry)
	}
	t.add(member, optional(name), value(m.Ftu), value(m.Fty), value(m.FtuCross), value(m.FtyCross), value(m.Fcy), value(m.Fsu), value(m.E), elongation, strings.TrimPrefix(source, "; "))
}

func headTable(title string, h *service.LugHead, u service.Units) inputTable {
	t, unit := dimensions(title), lengthUnit(u)
	t.add("shape", string(h.Shape), "")
	t.length("width", &h.Width, unit)
	t.length("thickness", &h.Thickness, unit)
	t.length("hole diameter", &h.HoleDiameter, unit)
	t.length("edge distance", &h.EdgeDistance, unit)
	t.length("end radius", h.EndRadius, unit)
	t.number("taper angle", h.TaperAngle, "°")
	if h.Offset != nil && service.Nominal(h.Offset) != 0 {
		t.length("offset of the hole", h.Offset, unit)
	}
	if h.SectionDepths != nil {
		for i, depth := range h.SectionDepths {
			t.add("section depth "+number(float64(i+1)), number(depth), unit)
		}
	}
	t.length("body width", h.BodyWidth, unit)
	t.length("body length", h.BodyLength, unit)
	if h.BodyRestrained != nil && *h.BodyRestrained {
		t.add("body restrained", "yes", "")
	}
	return t
}

func bushingRows(t *inputTable, name string, b *service.LugBushing, unit string) {
	if b == nil {
		return
	}
	t.length(name+" length", b.Length, unit)
	if service.Nominal(b.Interference) != 0 {
		t.length(name+" interference", b.Interference, unit)
	}
}

func lugInputs(d *service.LugDocument) []inputTable {
	unit := lengthUnit(d.Units)
	lug := headTable("Lug", &d.Lug, d.Units)
	bushingRows(&lug, "bushing", d.Bushing, unit)
	tables := []inputTable{lug}
	if d.Clevis != nil {
		title := "Clevis, one leg"
		if d.Joint != nil && *d.Joint == "single-shear" {
			title = "Mating lug"
		}
		clevis := headTable(title, &d.Clevis.LugHead, d.Units)
		clevis.length("gap", d.Clevis.Gap, unit)
		clevis.number("share of the load in a leg", d.Clevis.LegShare, "")
		clevis.number("share of the moment", d.Clevis.MomentShare, "")
		bushingRows(&clevis, "bushing", d.Clevis.Bushing, unit)
		tables = append(tables, clevis)
	}
	if d.Pin != nil {
		pin := dimensions("Pin")
		pin.length("diameter", &d.Pin.Diameter, unit)
		if service.Nominal(d.Pin.InnerDiameter) != 0 {
			pin.length("bore", d.Pin.InnerDiameter, unit)
		}
		tables = append(tables, pin)
	}
	materials := newMaterials(d.Units)
	materials.material("lug", &d.Lug.Material)
	if d.Bushing != nil {
		materials.material("bushing", &d.Bushing.Material)
	}
	if d.Pin != nil {
		materials.material("pin", &d.Pin.Material)
	}
	if d.Clevis != nil {
		materials.material("clevis", &d.Clevis.Material)
		if d.Clevis.Bushing != nil {
			materials.material("clevis bushing", &d.Clevis.Bushing.Material)
		}
	}
	cases := inputTable{Title: "Load cases", Long: len(d.LoadCases) > mostCases, Head: []column{
		{Name: "Load case"}, {Name: "Level"}, {Name: "Force", Unit: forceUnit(d.Units), Number: true}, {Name: "Angle", Unit: "°", Number: true},
	}}
	for _, c := range d.LoadCases {
		cases.add(c.ID, string(c.Level), number(c.Force), number(c.Angle))
	}
	return append(tables, materials.inputTable, factorsTable(&d.Factors), cases)
}

func lugFigures(d *service.LugDocument, r *service.Result) []figure {
	figures := []figure{{Drawing: lugPlan(d, "lug", r.Governing), Caption: "The lug, to scale." + governs(r, "lug")}}
	if d.Clevis == nil {
		return figures
	}
	if r.Governing != nil && sameMember(r.Governing.Member, "clevis") {
		figures = append(figures, figure{Drawing: lugPlan(d, "clevis", r.Governing), Caption: "One leg of the clevis, to scale." + governs(r, "clevis")})
	}
	caption := "The joint cut along the pin, to scale."
	if _, ok := workingOf(r, "b1"); ok {
		caption += " The heavy lines along the pin are the thickness that is active under bending of the pin."
	}
	return append(figures, figure{Drawing: jointSection(d, r), Caption: caption})
}

// governs says what the mark in a drawing of a head means.
func governs(r *service.Result, head string) string {
	text := fmt.Sprintf(" Dashed: the shear-out planes, %d° from the axis.", shearPlaneDegrees)
	if r.Governing != nil && sameMember(r.Governing.Member, head) {
		text += " Heavy: where the governing check looks, " + words(r.Governing.Mode) + "."
	}
	return text
}

func groupInputs(d *service.GroupDocument) []inputTable {
	unit := lengthUnit(d.Units)
	how := dimensions("Pattern")
	how.add("stiffness", words(d.Stiffness), "")
	how.add("sharing in the plane", words(deref(d.InPlane)), "")
	how.add("sharing out of the plane", words(deref(d.OutOfPlane)), "")
	how.add("interaction", optional(d.Interaction), "")
	var rules []string
	for _, r := range *d.Rules {
		if r.Object != nil {
			rules = append(rules, r.Object.ID)
		} else {
			rules = append(rules, r.Plain)
		}
	}
	how.add("layout rules", optional(strings.Join(rules, ", ")), "")
	if d.Methods != nil {
		how.add("methods of strength", strings.Join(*d.Methods, ", "), "")
	}
	if d.Packing != nil && *d.Packing != 0 {
		how.number("packing thickness", d.Packing, unit)
	}
	fasteners := inputTable{Title: "Fasteners", Long: len(d.Fasteners) > 2*mostCases, Head: []column{
		{Name: "Fastener"},
		{Name: "x", Unit: unit, Number: true},
		{Name: "y", Unit: unit, Number: true},
		{Name: "Diameter", Unit: unit, Number: true},
		{Name: "Hole", Unit: unit, Number: true},
		{Name: "Slot", Unit: "°", Number: true},
		{Name: "Planes", Number: true},
		{Name: "Type"},
		{Name: "Shear strength", Unit: forceUnit(d.Units), Number: true},
		{Name: "Tension strength", Unit: forceUnit(d.Units), Number: true},
	}}
	for i := range d.Fasteners {
		f := &d.Fasteners[i]
		name, shear, tension := typeCells(f.Type)
		planes := 1
		if f.ShearPlanes != nil {
			planes = *f.ShearPlanes
		}
		fasteners.add(f.ID, number(f.X), number(f.Y), number(f.Diameter), value(f.HoleDiameter), value(f.SlotAngle), number(float64(planes)), name, shear, tension)
	}
	tables := []inputTable{how, fasteners}
	materials := newMaterials(d.Units)
	if len(*d.Plates) > 0 {
		plates := inputTable{Title: "Plates", Head: []column{{Name: "Plate"}, {Name: "Thickness", Unit: unit, Number: true}, {Name: "Outline", Unit: unit}}}
		for i := range *d.Plates {
			plate := &(*d.Plates)[i]
			var points []string
			for _, p := range plate.Outline {
				points = append(points, "("+number(p[0])+", "+number(p[1])+")")
			}
			plates.add(plate.ID, number(plate.Thickness), optional(strings.Join(points, " ")))
			materials.material(plate.ID, plate.Material)
		}
		tables = append(tables, plates)
	}
	if len(materials.Rows) > 0 {
		tables = append(tables, materials.inputTable)
	}
	force, moment := forceUnit(d.Units), momentUnit(d.Units)
	cases := inputTable{Title: "Load cases", Long: len(d.LoadCases) > mostCases, Head: []column{
		{Name: "Load case"}, {Name: "Level"}, {Name: "At x, y, z", Unit: unit, Number: true}, {Name: "Force x, y, z", Unit: force, Number: true}, {Name: "Moment x, y, z", Unit: moment, Number: true},
	}}
	triple := func(v [3]float64) string { return number(v[0]) + ", " + number(v[1]) + ", " + number(v[2]) }
	for _, c := range d.LoadCases {
		cases.add(c.ID, string(c.Level), triple(c.Point), triple(c.Force), triple(c.Moment))
	}
	return append(tables, factorsTable(&d.Factors), cases)
}

// typeCells are the name and the strengths of a fastener's type.
func typeCells(ref *service.FastenerTypeRef) (name, shear, tension string) {
	if ref == nil || ref.Object == nil {
		return "—", "—", "—"
	}
	t := ref.Object
	name = optional(t.Name)
	if t.Source != "" {
		name += ", " + t.Source
	}
	if t.Mark != "" {
		name += " (" + t.Mark + ")"
	}
	if t.Fsu != nil {
		name += "; Fsu " + number(*t.Fsu)
	}
	if t.Ftu != nil {
		name += "; Ftu " + number(*t.Ftu)
	}
	return name, value(t.ShearStrength), value(t.TensionStrength)
}

func groupFigures(d *service.GroupDocument, r *service.Result) []figure {
	caption := "The pattern, to scale; the cross is the centroid of its stiffness."
	if shares, name := drawnShares(r); len(shares) > 0 {
		caption += " Arrows: the shear that the attached member puts on each fastener in load case " + name + "; the area of a disc goes with it."
	}
	for _, f := range r.Findings {
		if (f.Code == "edge-distance" || f.Code == "pitch") && f.Severity != "note" {
			caption += " Heavy dashes: edge distances and pitches that break a rule."
			break
		}
	}
	return []figure{{Drawing: patternPlan(d, r), Caption: caption}}
}

func spliceInputs(d *service.SpliceDocument) []inputTable {
	unit, stress := lengthUnit(d.Units), stressUnit(d.Units)
	how := dimensions("Splice")
	how.add("compliance", words(d.Compliance), "")
	if d.Symmetric != nil && *d.Symmetric {
		how.add("symmetric", "yes: a middle member and one strap, counted twice", "")
	}
	members := inputTable{Title: "Members, in stacking order", Head: []column{
		{Name: "Member"}, {Name: "E", Unit: stress, Number: true}, {Name: "Rows"}, {Name: "Thickness of bays", Unit: unit}, {Name: "Width of bays", Unit: unit}, {Name: "Thickness at rows", Unit: unit},
	}}
	materials := newMaterials(d.Units)
	for i := range d.Members {
		m := &d.Members[i]
		var thick, wide []float64
		for _, b := range m.Bays {
			thick, wide = append(thick, b.Thickness), append(wide, b.Width)
		}
		members.add(m.ID, number(m.E), number(float64(*m.FirstRow))+"–"+number(float64(*m.LastRow)), series(thick), series(wide), series(m.RowThickness))
		materials.material(m.ID, m.Material)
	}
	rows := inputTable{Title: "Rows", Long: len(d.Rows) > 2*mostCases, Head: []column{
		{Name: "Row", Number: true},
		{Name: "Pitch to the next", Unit: unit, Number: true},
		{Name: "Fasteners", Number: true},
		{Name: "Diameter", Unit: unit, Number: true},
		{Name: "E", Unit: stress, Number: true},
		{Name: "Compliance", Unit: unit + "/" + forceUnit(d.Units), Number: true},
		{Name: "Installation"},
		{Name: "Type"},
	}}
	for i := range d.Rows {
		r := &d.Rows[i]
		pitch, count := "—", 1
		if i < len(d.Pitches) {
			pitch = number(d.Pitches[i])
		}
		if r.Count != nil {
			count = *r.Count
		}
		name, _, _ := typeCells(r.Type)
		rows.add(number(float64(i+1)), pitch, number(float64(count)), number(r.Diameter), value(r.E), value(r.Compliance), words(deref(r.Installation)), name)
	}
	tables := []inputTable{how, members, rows}
	if len(materials.Rows) > 0 {
		tables = append(tables, materials.inputTable)
	}
	cases := inputTable{Title: "Load cases", Long: len(d.LoadCases) > mostCases, Head: []column{
		{Name: "Load case"}, {Name: "Level"}, {Name: "Member"}, {Name: "Left end", Unit: forceUnit(d.Units), Number: true}, {Name: "Right end", Unit: forceUnit(d.Units), Number: true}, {Name: "Change of temperature", Unit: "°", Number: true},
	}}
	for _, c := range d.LoadCases {
		if c.Ends != nil {
			for _, e := range *c.Ends {
				cases.add(c.ID, string(c.Level), e.Member, number(e.Left), number(e.Right), "—")
			}
		}
		for _, t := range c.Temperatures {
			cases.add(c.ID, string(c.Level), t.Member, "—", "—", number(t.Change))
		}
	}
	return append(tables, factorsTable(&d.Factors), cases)
}

// series writes numbers in a row; equal ones once.
func series(all []float64) string {
	if len(all) == 0 {
		return "—"
	}
	same := true
	var out []string
	for _, x := range all {
		same = same && x == all[0]
		out = append(out, number(x))
	}
	if same && len(all) > 1 {
		return out[0] + " (all " + number(float64(len(all))) + ")"
	}
	return strings.Join(out, ", ")
}

func spliceFigures(d *service.SpliceDocument, r *service.Result) []figure {
	caption := "The splice in section; lengths to scale, thicknesses by the factor given."
	if len(r.Transfers) > 0 {
		caption += " Bars: the share of the load that each row passes on."
	}
	return []figure{{Drawing: spliceSection(d, r), Caption: caption}}
}

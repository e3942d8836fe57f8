package fastener

import (
	"math"

	"jointledger/strength"
)

const (
	methodNetSection = "row-net-section@1"
	methodPlastic    = "plastic-sharing@1"
	methodTransfer   = "row-load-transfer@1"

	sourceNetSection = "text-book net section: F_tu, F_ty on the width less the holes of the row, under bypass and bearing load together"
	sourcePlastic    = "at ultimate ductile rows are commonly taken to share in proportion to their strength (common practice, no source)"
	sourceTransfer   = "compatibility of consecutive rows: C_i R_i - C_i+1 R_i+1 = f_1 (P - S_i) - f_2 S_i, with equilibrium"
)

// spliceMethods are the methods of rows of fasteners.
func spliceMethods() []Method {
	return []Method{
		{
			ID: "row-load-transfer", Revision: 1, Kind: "splice",
			Title: "Load transfer through rows of fasteners on springs", Source: sourceTransfer,
			Range: "elastic members and fasteners in one line; clearances taken up row by row; leaves out secondary bending and friction",
			Mark:  strength.Derived,
			Equations: []Equation{
				{"1", "f = p / (w t E)", sourceTransfer, strength.Derived},
				{"2", "d = C R / n + s", "slip of an interface of n fasteners that has taken up the clearance s", strength.Derived},
				{"3", "d_i+1 = d_i + f_2 N_2 - f_1 N_1", sourceTransfer, strength.Derived},
			},
		},
		{
			ID: "row-net-section", Revision: 1, Kind: "splice",
			Title: "Net section of a member at a row", Source: sourceNetSection,
			Range: "tension; holes of the diameter and its clearance, side by side", Mark: strength.Derived,
			Equations: []Equation{{"1", "P_nu = F_tu (w - n D_h) t", sourceNetSection, strength.Derived}, {"2", "P_ny = F_ty (w - n D_h) t", sourceNetSection, strength.Derived}},
		},
		{
			ID: "plastic-sharing", Revision: 1, Kind: "splice",
			Title: "Fully plastic sharing of rows, a bound at ultimate", Source: sourcePlastic,
			Range: "ductile fasteners and members, where the end loads alone decide what passes between each two members", Mark: strength.CommonPractice,
			Equations: []Equation{{"1", "R_i = T Q_i / Σ Q", sourcePlastic, strength.CommonPractice}},
		},
	}
}

// rowCheck compares one demand with one allowable at a row.
type rowCheck struct {
	check  strength.Check
	row    int                            // from 0
	node   int                            // the member's place in the stack, of member checks; else -1
	factor [strength.Ultimate + 1]float64 // on a load given at that level

	capacity float64 // of all fasteners of the row
	why      *strength.Message
}

// addChecks lists the checks in the order of answers: row by row, the fastener
// and then the members in stacking order.
func (p *PreparedSplice) addChecks() {
	known := map[capacityKey]capacity{}
	for r := range p.splice.Rows {
		if p.stack.rows[r+1]-p.stack.rows[r] > 1 {
			p.addFastenerChecks(r, known)
		}
		for x := p.stack.rows[r]; x < p.stack.rows[r+1]; x++ {
			if p.splice.Members[p.stack.nodes[x].member].Material != nil {
				p.addMemberChecks(x, known)
			}
		}
	}
	p.checks = make([]strength.Check, len(p.rowChecks))
	for i := range p.rowChecks {
		p.checks[i] = p.rowChecks[i].check
	}
}

// capacity is what a check needs of an allowable: no steps.
type capacity struct {
	value float64
	why   *strength.Message
	mark  strength.Mark
}

// capacityKey is all that a capacity depends on: rows that are alike have it
// worked out once.
type capacityKey struct {
	member, mode, level     int
	count, planes           int
	diameter, clearance     float64
	fastener                Type // without what it points to
	thread                  Thread
	thickness, width, inBay float64
	bay                     Bay
	pitch                   float64
}

// capacityOf works out the capacity of a check at row, of the member at node,
// or of the fastener without one.
func (p *PreparedSplice) capacityOf(c strength.Check, row, node int, known map[capacityKey]capacity) capacity {
	r := &p.splice.Rows[row]
	key := capacityKey{
		member: -1, mode: int(c.Mode), level: int(c.Level),
		count: r.Count, planes: r.ShearPlanes, diameter: r.Diameter, clearance: r.Clearance,
	}
	if node < 0 {
		key.fastener = *r.Type
		if key.fastener.Thread, key.fastener.Preload = nil, nil; r.Type.Thread != nil {
			key.thread = *r.Type.Thread
		}
	} else {
		at := p.stack.nodes[node]
		m := &p.splice.Members[at.member]
		key.member, key.thickness, key.width, key.inBay = at.member, m.rowThickness(row), m.rowWidth(at), m.bayThickness(at)
		if c.Mode == strength.InterFastenerBuckling {
			key.bay, key.pitch = m.bay(row), p.splice.Pitches[row]
			if r.Type != nil {
				key.fastener = Type{Name: r.Type.Name, Head: r.Type.Head}
			}
		}
	}
	found, ok := known[key]
	if !ok {
		a := p.allowable(c, row, node)
		found = capacity{a.value, reason(a.why), a.mark()}
		known[key] = found
	}
	return found
}

// allowable works out the strength that a check compares with, with its steps.
func (p *PreparedSplice) allowable(c strength.Check, row, node int) allowable {
	switch {
	case node < 0:
		return p.splice.rowShear(row)
	case c.Mode == strength.NetSection:
		return p.netSection(node, c.Level)
	case c.Mode == strength.InterFastenerBuckling:
		return p.bayBuckling(node)
	}
	return p.rowBearing(node, c.Level)
}

func (p *PreparedSplice) addCheck(c strength.Check, row, node int, capacity capacity) {
	c.Row, c.Unit = row+1, strength.Force
	c.Mark = strength.Weakest(c.Mark, strength.Derived, capacity.mark)
	if !c.Compared {
		c.Mark = strength.Weakest(c.Mark, p.complianceMark)
	}
	check := rowCheck{check: c, row: row, node: node, capacity: capacity.value, why: capacity.why}
	for _, given := range []strength.Level{strength.Limit, strength.Ultimate} {
		check.factor[given] = p.factors.Demand(&c, given, strength.ByRegulation, false).Factor()
	}
	p.rowChecks = append(p.rowChecks, check)
}

func (p *PreparedSplice) addFastenerChecks(r int, known map[capacityKey]capacity) {
	if p.splice.Rows[r].Type == nil {
		return
	}
	c := strength.Check{Member: memberFastener, Mode: strength.Shear, Level: strength.Ultimate, Method: methodShear, Source: sourceShear, Mark: strength.Seen}
	capacity := p.capacityOf(c, r, -1, known)
	p.addCheck(c, r, -1, capacity)
	if p.plastic != nil {
		c.Method, c.Source, c.Mark, c.Compared = methodPlastic, sourcePlastic, strength.CommonPractice, true
		p.addCheck(c, r, -1, capacity)
	}
}

func (p *PreparedSplice) addMemberChecks(x int, known map[capacityKey]capacity) {
	node := p.stack.nodes[x]
	id := p.splice.Members[node.member].ID
	for _, level := range []strength.Level{strength.Ultimate, strength.Limit} {
		c := strength.Check{Member: id, Mode: strength.NetSection, Level: level, Method: methodNetSection, Source: sourceNetSection}
		p.addCheck(c, node.row, x, p.capacityOf(c, node.row, x, known))
	}
	if p.stack.rows[node.row+1]-p.stack.rows[node.row] > 1 {
		for _, level := range []strength.Level{strength.Ultimate, strength.Limit} {
			c := strength.Check{Member: id, Mode: strength.Bearing, Level: level, Method: methodBearing, Source: sourceBearing, Mark: strength.Seen}
			p.addCheck(c, node.row, x, p.capacityOf(c, node.row, x, known))
		}
	}
	if !node.last {
		c := strength.Check{Member: id, Mode: strength.InterFastenerBuckling, Level: strength.Ultimate, Method: methodBuckling, Source: sourceBuckling}
		p.addCheck(c, node.row, x, p.capacityOf(c, node.row, x, known))
	}
}

// ofRow turns the strength of one fastener into that of the row's fasteners,
// in each of a number of layers.
func (s *Splice) ofRow(a allowable, r int, each string, layers float64) allowable {
	if !a.why.Empty() {
		return a
	}
	n := float64(s.Rows[r].Count)
	equation := rowSymbol("n", r) + " " + each
	source := "all fasteners of the row"
	if layers > 1 {
		equation, source = "2 "+equation, source+", both straps"
	}
	a.value *= n * layers
	a.add("P_row", a.value, strength.Force, equation, source, strength.Derived)
	return a
}

// rowShear is the shear strength of a row's fasteners against the load of one
// interface.
func (s *Splice) rowShear(r int) allowable {
	row := &s.Rows[r]
	return s.ofRow(row.Type.shear(row.Diameter, row.ShearPlanes), r, "V_u", 1)
}

// rowBearing is the bearing strength of a member at a row.
func (p *PreparedSplice) rowBearing(x int, level strength.Level) (a allowable) {
	node := p.stack.nodes[x]
	m, row := &p.splice.Members[node.member], &p.splice.Rows[node.row]
	switch thickness := m.rowThickness(node.row); {
	case thickness == 0:
		a.why = strength.Say("bearing of member %q needs its row_thickness", m.ID)
		return a
	case m.EdgeDistance == 0:
		a.why = strength.Say("member %q has no edge_distance, on which bearing strength depends", m.ID)
		return a
	default:
		plate := Plate{ID: m.ID, Thickness: thickness, Material: m.Material, CountersinkDepth: m.CountersinkDepth}
		a = bearing(&Fastener{Diameter: row.Diameter}, &plate, &edgeDistance{e: m.EdgeDistance, given: "given: members.edge_distance"}, level)
	}
	each := "P_bru"
	if level == strength.Limit {
		each = "P_bry"
	}
	return p.splice.ofRow(a, node.row, each, p.stack.layers(node.member))
}

// rowWidth is the lesser width of the bays that adjoin a row, 0 without bays.
func (m *Member) rowWidth(node stackNode) float64 {
	width := math.Inf(1)
	if !node.first {
		width = m.bay(node.row - 1).Width
	}
	if !node.last {
		width = min(width, m.bay(node.row).Width)
	}
	if math.IsInf(width, 1) {
		return 0
	}
	return width
}

// netSection is the strength of a member's net section at a row,
// F_tu (w - n D_h) t at ultimate and F_ty (w - n D_h) t at limit level: w is the
// lesser width and, without a thickness at the row, t the lesser thickness of
// the bays that adjoin it.
func (p *PreparedSplice) netSection(x int, level strength.Level) (a allowable) {
	node := p.stack.nodes[x]
	m, row := &p.splice.Members[node.member], &p.splice.Rows[node.row]
	property := strength.Ftu
	if level == strength.Limit {
		property = strength.Fty
	}
	width := m.rowWidth(node)
	if width == 0 {
		a.why = strength.Say("member %q has no bay beside its only row, so the width of its net section is not known", m.ID)
		return a
	}
	strong := m.Material.Value(property)
	if strong == 0 {
		a.why = strength.Say("the material %q has no %s", m.Material.Name, property)
		return a
	}
	thickness, source := m.rowThickness(node.row), "given: members.row_thickness"
	if thickness == 0 {
		thickness, source = m.bayThickness(node), "given: members.bays.thickness, the lesser at the row"
	}
	a.add("w", width, strength.Length, "", "given: members.bays.width, the lesser at the row", strength.Given)
	a.add("t", thickness, strength.Length, "", source, strength.Given)
	a.add("D", row.Diameter, strength.Length, "", "given: rows.diameter", strength.Given)
	hole, equation := row.Diameter, "D"
	if row.Clearance > 0 {
		a.add("s_d", row.Clearance, strength.Length, "", "given: rows.clearance", strength.Given)
		hole += row.Clearance
		equation = "D + s_d"
	}
	a.add("D_h", hole, strength.Length, equation, "diameter of the hole", strength.Derived)
	layers := p.stack.layers(node.member)
	area := layers * (width - float64(float64(row.Count)*hole)) * thickness
	equation = "(w - " + rowSymbol("n", node.row) + " D_h) t"
	if layers > 1 {
		equation = "2 " + equation
	}
	a.add("A_net", area, strength.Area, equation, sourceNetSection, strength.Derived)
	a.add(string(property), strong, strength.Stress, "", materialSource(m.Material), m.Material.MarkOf(property))
	a.value = strong * area
	a.add("P_row", a.value, strength.Force, string(property)+" A_net", sourceNetSection, strength.Derived)
	return a
}

// bayBuckling is the strength of a member in compression between a row and the
// next, F_ir w t, by the form of the row's heads.
func (p *PreparedSplice) bayBuckling(x int) (a allowable) {
	node := p.stack.nodes[x]
	m, row := &p.splice.Members[node.member], &p.splice.Rows[node.row]
	if row.Type == nil {
		a.why = strength.Say("row %d has no type, so the form of its heads is not known", node.row+1)
		return a
	}
	bay := m.bay(node.row)
	a = interFastener(m.Material, row.Type.Head, bay.Thickness, p.splice.Pitches[node.row])
	if !a.why.Empty() {
		return a
	}
	a.add("w", bay.Width, strength.Length, "", "given: members.bays.width", strength.Given)
	equation := "F_ir w t"
	if layers := p.stack.layers(node.member); layers > 1 {
		equation = "2 " + equation
		a.value *= layers
	}
	a.value *= bay.Width * bay.Thickness
	a.add("P_row", a.value, strength.Force, equation, sourceBuckling, strength.Derived)
	return a
}

// bayThickness is the lesser thickness of the bays that adjoin a row.
func (m *Member) bayThickness(node stackNode) float64 {
	thickness := math.Inf(1)
	if !node.first {
		thickness = m.bay(node.row - 1).Thickness
	}
	if !node.last {
		thickness = min(thickness, m.bay(node.row).Thickness)
	}
	return thickness
}

// load is the load that a check sees in the case entered, before factors.
func (p *PreparedSplice) load(c *rowCheck) float64 {
	v, k := &p.main, p.stack
	if c.node >= 0 {
		left, right := v.sides(c.node, &p.cases[p.solved])
		switch c.check.Mode {
		case strength.NetSection:
			return max(left, right, 0)
		case strength.InterFastenerBuckling:
			return max(-right, 0)
		}
		return math.Abs(left - right)
	}
	from := v.transfer
	if c.check.Compared {
		from = p.plastic.load
	}
	largest := 0.0
	for i := k.rows[c.row] - c.row; i < k.rows[c.row+1]-c.row-1; i++ {
		largest = max(largest, math.Abs(from[i]))
	}
	return largest
}

// Margins implements strength.Calculation.
func (p *PreparedSplice) Margins(i int, out []strength.Margin) {
	why := p.enter(i)
	level := p.cases[i].level
	for c := range p.rowChecks {
		check := &p.rowChecks[c]
		if why != nil {
			out[c] = strength.Unknown(why)
			continue
		}
		out[c] = compare(p.load(check)*check.factor[level], check.capacity, check.why)
	}
}

// Checks implements strength.Calculation.
func (p *PreparedSplice) Checks() []strength.Check { return p.checks }

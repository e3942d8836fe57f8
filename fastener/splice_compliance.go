package fastener

import "jointledger/strength"

// interfaceAt is the interface below node x, as formulas see it.
func (k *stack) interfaceAt(s *Splice, x int) Interface {
	first, second := k.nodes[x], k.nodes[x+1]
	a, b := &s.Members[first.member], &s.Members[second.member]
	row := &s.Rows[first.row]
	return Interface{
		T1: a.rowThickness(first.row), E1: a.E,
		T2: b.rowThickness(first.row), E2: b.E,
		Diameter: row.Diameter, Ef: row.E, Nuf: row.Nu,
		Installation: row.Installation, DoubleShear: s.Symmetric,
	}
}

// rowThickness is the member's thickness at row r from 0; 0 when not given.
func (m *Member) rowThickness(r int) float64 {
	if len(m.RowThickness) == 0 {
		return 0
	}
	return m.RowThickness[r-(m.FirstRow-1)]
}

// complianceFaults tells what the compliance of that name lacks, at being the
// place of the name. why tells that the formula has no form for this joint.
func (s *Splice) complianceFaults(name, at string) (why strength.Message, faults faultList) {
	if name == ComplianceGiven {
		for r := range s.Rows {
			if c := s.Rows[r].Compliance; c == 0 {
				faults.add(splicePointer("rows", r, "compliance"), "compliance %q needs more than 0, found 0 or nothing", name)
			}
		}
		return why, faults
	}
	f, ok := FindCompliance(name)
	if !ok {
		faults.add(at, "there is no compliance formula %q; there are %q and %q", name, ComplianceGiven, complianceNames())
		return why, faults
	}
	if s.Symmetric && !f.DoubleShear {
		return f.noDoubleShear(), nil
	}
	return why, s.formulaFaults(&f)
}

// compliances finds the compliance of one fastener at each interface.
func (k *stack) compliances(s *Splice, name string) (c []float64, faults faultList) {
	c = make([]float64, k.interfaces())
	f, named := FindCompliance(name)
	for x, node := range k.nodes {
		switch {
		case !k.inner(x):
		case !named:
			c[x-node.row] = s.Rows[node.row].Compliance
		default:
			value, none := f.evaluate(k.interfaceAt(s, x), nil)
			if !none.Empty() {
				faults.add(splicePointer("rows", node.row), "%v", none)
			}
			c[x-node.row] = value
		}
	}
	return c, faults
}

func complianceNames() []string {
	var names []string
	for _, f := range ComplianceFormulas() {
		names = append(names, f.ID)
	}
	return names
}

// formulaFaults tells which values a formula needs and does not find.
func (s *Splice) formulaFaults(f *ComplianceFormula) (faults faultList) {
	for m := range s.Members {
		if len(s.Members[m].RowThickness) == 0 {
			faults.add(splicePointer("members", m, "row_thickness"), "the compliance formula %q needs the thickness at each row", f.ID)
		}
	}
	for r := range s.Rows {
		if !(s.Rows[r].E > 0) {
			faults.add(splicePointer("rows", r, "e"), "the compliance formula %q needs the fastener's modulus, more than 0", f.ID)
		}
		if f.needsNu && !(s.Rows[r].Nu > 0) {
			faults.add(splicePointer("rows", r, "nu"), "the compliance formula %q needs the fastener's Poisson's ratio, more than 0", f.ID)
		}
	}
	return faults
}

// ComplianceWorkings returns the steps to the compliance of one fastener at
// each interface of a row, counted from 1, as they are part of the workings of
// every check.
func (p *PreparedSplice) ComplianceWorkings(row int) []strength.Working {
	k, r := p.stack, row-1
	if r < 0 || r >= len(p.splice.Rows) || !p.main.why.Empty() {
		return nil
	}
	var steps []strength.Working
	for x := k.rows[r]; x < k.rows[r+1]-1; x++ {
		steps = append(steps, p.complianceSteps(x)...)
	}
	return steps
}

// complianceSteps are the steps to the compliance of the interface below node
// x; their member names both members.
func (p *PreparedSplice) complianceSteps(x int) []strength.Working {
	k, s := p.stack, &p.splice
	node := k.nodes[x]
	var sheet complianceSheet
	if f, ok := FindCompliance(s.Compliance); ok {
		sheet.method = f.Name()
		f.evaluate(k.interfaceAt(s, x), &sheet)
	} else {
		sheet.add("C", s.Rows[node.row].Compliance, strength.Compliance, "", "given: rows.compliance", strength.Given)
	}
	for i := range sheet.steps {
		sheet.steps[i].Row = node.row + 1
		sheet.steps[i].Member = s.Members[node.member].ID + "/" + s.Members[k.nodes[x+1].member].ID
	}
	return sheet.steps
}

// markOfCompliance is the weakest mark of the compliance's steps.
func (p *PreparedSplice) markOfCompliance() strength.Mark {
	mark := strength.Given
	for x := range p.stack.nodes {
		if p.main.why.Empty() && p.stack.inner(x) {
			for _, step := range p.complianceSteps(x) {
				mark = strength.Weakest(mark, step.Mark)
			}
			break
		}
	}
	return mark
}

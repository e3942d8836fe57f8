package fastener

import (
	"fmt"
	"strings"

	"jointledger/strength"
)

// memberSplice is the member of the steps that all checks share.
const memberSplice = "splice"

// rowSymbol is a symbol of row r from 0, or of the bay right of it.
func rowSymbol(symbol string, r int) string { return fmt.Sprintf("%s_%d", symbol, r+1) }

// Steps of the sharing carry members by their number in the stack: N_2_3 is the
// load of member 2 right of row 3, R_1_2_3 the load from member 1 to member 2
// at row 3.
func memberSymbol(symbol string, m, r int) string { return fmt.Sprintf("%s_%d_%d", symbol, m+1, r+1) }

func (k *stack) symbol(symbol string, x int) string {
	node := k.nodes[x]
	return fmt.Sprintf("%s_%d_%d_%d", symbol, node.member+1, k.nodes[x+1].member+1, node.row+1)
}

// sharingSheet collects the steps that all checks share.
type sharingSheet struct {
	steps    []strength.Working
	loadCase string
}

func (s *sharingSheet) add(row int, symbol string, value float64, unit strength.Unit, equation, source string, mark strength.Mark) {
	s.steps = append(s.steps, strength.Working{
		Member: memberSplice, Row: row + 1, Method: methodTransfer, LoadCase: s.loadCase,
		Symbol: symbol, Value: value, Unit: unit, Equation: equation, Source: source, Mark: mark,
	})
}

// Workings implements strength.Calculation. Steps of the sharing have the
// member "splice" and no mode: they are the same in every check.
func (p *PreparedSplice) Workings(c int, steps []strength.Working) []strength.Working {
	check := &p.rowChecks[c]
	switch {
	case check.check.Compared:
		steps = append(steps, p.plasticSteps(check.row)...)
	case p.main.why.Empty():
		steps = append(steps, p.sharingSteps()...)
	}
	return append(steps, stampRow(check, "", p.allowable(check.check, check.row, check.node).steps)...)
}

// CaseWorkings implements strength.Calculation.
func (p *PreparedSplice) CaseWorkings(i, c int, steps []strength.Working) []strength.Working {
	check := &p.rowChecks[c]
	if why := p.enter(i); why != nil {
		return steps
	}
	load := p.load(check)
	if check.check.Compared {
		steps = append(steps, p.plasticCaseSteps(i, check.row)...)
	} else {
		steps = append(steps, p.sharingCaseSteps(i)...)
	}
	symbol, equation, source := p.loadStep(check)
	own := []strength.Working{{Symbol: symbol, Value: load, Unit: strength.Force, Equation: equation, Source: source, Mark: strength.Derived}}
	level := p.cases[i].level
	demand := load * check.factor[level]
	own = p.factors.Demand(&check.check, level, strength.ByRegulation, false).Workings(own, strength.Working{}, p.factors, symbol, demand, strength.Force)
	own = append(own, marginStep(compare(demand, check.capacity, check.why), "P_row")...)
	return append(steps, stampRow(check, p.cases[i].id, own)...)
}

// rowSources names the places of a splice's request in steps that patterns
// share.
var rowSources = strings.NewReplacer(
	"input: fasteners.", "given: rows.", "input: type", "given: rows.type",
	"input: plates.thickness", "given: members.row_thickness, of the bay for buckling", "input: plates.", "given: members.", "input: material", "given: material",
)

// stampRow writes the place of a check into its own steps.
func stampRow(check *rowCheck, loadCase string, steps []strength.Working) []strength.Working {
	c := &check.check
	for i := range steps {
		s := &steps[i]
		s.Source = rowSources.Replace(s.Source)
		s.Member, s.Row, s.Method, s.Mode, s.Level, s.LoadCase = c.Member, c.Row, c.Method, c.Mode, c.Level, loadCase
	}
	return steps
}

// loadStep writes the load of a check from the loads of the sharing.
func (p *PreparedSplice) loadStep(c *rowCheck) (symbol, equation, source string) {
	k := p.stack
	if c.node >= 0 {
		left, right := k.sideSymbols(c.node)
		switch c.check.Mode {
		case strength.InterFastenerBuckling:
			return "N_c", "max(-" + right + ", 0)", "compression of the bay right of the row"
		case strength.NetSection:
			return "N", "max(" + left + ", " + right + ", 0)", "bypass and bearing load together, on the row's more loaded side"
		}
		return "B", "|" + left + " - " + right + "|", "load of all fasteners of the row on the member"
	}
	var terms []string
	for x := k.rows[c.row]; x < k.rows[c.row+1]-1; x++ {
		terms = append(terms, "|"+k.symbol("R", x)+"|")
	}
	equation = terms[0]
	if len(terms) > 1 {
		equation = "max(" + strings.Join(terms, ", ") + ")"
	}
	return "R", equation, "load of the row's fasteners through their most loaded interface"
}

// sideSymbols are the symbols of a member's load left and right of a row.
func (k *stack) sideSymbols(x int) (left, right string) {
	node := k.nodes[x]
	left, right = memberSymbol("N", node.member, node.row-1), memberSymbol("N", node.member, node.row)
	if node.first {
		left = rowSymbol("P_left", node.member)
	}
	if node.last {
		right = rowSymbol("P_right", node.member)
	}
	return left, right
}

// sharingSteps write the compliances and flexibilities.
func (p *PreparedSplice) sharingSteps() []strength.Working {
	k, s := p.stack, &p.splice
	var sheet sharingSheet
	known := map[Interface]string{}
	for r := range s.Rows {
		sheet.add(r, rowSymbol("n", r), float64(s.Rows[r].Count), strength.None, "", "given: rows.count", strength.Given)
		for x := k.rows[r]; x < k.rows[r+1]-1; x++ {
			i := x - r
			symbol, value := k.symbol("C", x), p.main.compliance[i]*float64(s.Rows[r].Count)
			if s.Compliance == ComplianceGiven {
				sheet.add(r, symbol, value, strength.Compliance, "", "given: rows.compliance", strength.Given)
				continue
			}
			at := k.interfaceAt(s, x)
			same, ok := known[at]
			if !ok {
				sheet.steps = append(sheet.steps, p.complianceSteps(x)...)
				known[at], same = symbol, "C"
			}
			sheet.add(r, symbol, value, strength.Compliance, same, "compliance of one fastener through this interface", strength.Derived)
		}
	}
	for i, span := range k.spans {
		m, j := &s.Members[span.member], span.bay
		bay := m.bay(j)
		if i == k.bays[j] {
			sheet.add(j, rowSymbol("p", j), s.Pitches[j], strength.Length, "", "given: pitches", strength.Given)
		}
		w, t, e := memberSymbol("w", span.member, j), memberSymbol("t", span.member, j), rowSymbol("E", span.member)
		sheet.add(j, w, bay.Width, strength.Length, "", "given: members.bays.width", strength.Given)
		sheet.add(j, t, bay.Thickness, strength.Length, "", "given: members.bays.thickness", strength.Given)
		sheet.add(j, e, m.E, strength.Stress, "", "given: members.e", strength.Given)
		layers := ""
		if k.layers(span.member) > 1 {
			layers = "2 "
		}
		sheet.add(j, memberSymbol("f", span.member, j), p.main.flexibility[i], strength.Compliance,
			rowSymbol("p", j)+" / ("+layers+w+" "+t+" "+e+")", sourceTransfer, strength.Derived)
	}
	return sheet.steps
}

// sharingCaseSteps write how a load case passes, from row to row. In the first
// row, and where more interfaces begin, loads come from the solution of all
// equations together; each row's other loads follow from those before it by
// compatibility, and the last step of each member, which closes at 0, proves
// the whole.
func (p *PreparedSplice) sharingCaseSteps(i int) []strength.Working {
	s, c := &p.splice, &p.cases[i]
	sheet := sharingSheet{loadCase: c.id}
	for m := range s.Members {
		left, right := 0.0, 0.0
		if c.left != nil {
			left, right = c.left[m], c.right[m]
		}
		first, last := s.Members[m].FirstRow-1, s.Members[m].LastRow-1
		sheet.add(first, rowSymbol("P_left", m), left, strength.Force, "", "given: load_cases.ends, 0 where not named", strength.Given)
		sheet.add(last, rowSymbol("P_right", m), right, strength.Force, "", "given: load_cases.ends, 0 where not named", strength.Given)
		if c.change != nil {
			sheet.add(first, rowSymbol("α", m), s.Members[m].Expansion, strength.None, "", "given: members.expansion, per degree", strength.Given)
			sheet.add(first, rowSymbol("ΔT", m), c.change[m], strength.None, "", "given: load_cases.temperatures, degrees, 0 where not named", strength.Given)
		}
	}
	for r := range s.Rows {
		p.rowSteps(&sheet, r)
	}
	return sheet.steps
}

// rowSteps write one row: its slips and loads, and the members' loads right of
// it.
func (p *PreparedSplice) rowSteps(sheet *sharingSheet, r int) {
	k, v, c := p.stack, &p.main, &p.cases[p.solved]
	from, to := k.rows[r], k.rows[r+1]
	follows := p.following(r)
	slip := func(x int) float64 {
		return float64(v.compliance[x-r]*v.transfer[x-r]) + v.taken[x-r]
	}
	for x := from; x < to-1; x++ {
		taken := ""
		if v.contact != nil && v.contact.clearance[x-r] > 0 {
			taken = k.symbol("s", x)
			sheet.add(r, taken, v.taken[x-r], strength.Length, "", "clearance taken up; of "+ContactSettled+" contact, within "+fmt.Sprintf("rows.%d.clearance", r), strength.Derived)
		}
		load, deflection := k.symbol("R", x), k.symbol("d", x)
		springs := k.symbol("C", x) + " " + load + " / " + rowSymbol("n", r)
		if follows[x] != "" {
			continue
		}
		sheet.add(r, load, v.transfer[x-r], strength.Force, "", "solution of all equations of compatibility together, proved by the closing steps", strength.Derived)
		if taken != "" {
			springs += " + " + taken
		}
		sheet.add(r, deflection, slip(x), strength.Length, springs, sourceTransfer, strength.Derived)
	}
	for x := from; x < to-1; x++ {
		if follows[x] == "" {
			continue
		}
		load, deflection, taken := k.symbol("R", x), k.symbol("d", x), ""
		if v.contact != nil && v.contact.clearance[x-r] > 0 {
			taken = " - " + k.symbol("s", x)
		}
		sheet.add(r, deflection, slip(x), strength.Length, follows[x], sourceTransfer, strength.Derived)
		sheet.add(r, load, v.transfer[x-r], strength.Force,
			rowSymbol("n", r)+" ("+deflection+taken+") / "+k.symbol("C", x), sourceTransfer, strength.Derived)
	}
	for x := from; x < to; x++ {
		left, right := v.sides(x, c)
		before, after := k.sideSymbols(x)
		equation, value := before, left
		if x+1 < to {
			equation += " - " + k.symbol("R", x)
			value -= v.transfer[x-r]
		}
		if x > from {
			equation += " + " + k.symbol("R", x-1)
			value += v.transfer[x-1-r]
		}
		if k.nodes[x].last {
			sheet.add(r, rowSymbol("closing", k.nodes[x].member), value-right, strength.Force,
				equation+" - "+after, "equilibrium: 0 but for rounding", strength.Derived)
			continue
		}
		sheet.add(r, after, right, strength.Force, equation, "equilibrium", strength.Derived)
	}
}

// following writes, for interfaces of row r by node, the slip that follows from
// row r-1 by compatibility of the bay between.
func (p *PreparedSplice) following(r int) map[int]string {
	follows := map[int]string{}
	if r == 0 {
		return follows
	}
	k := p.stack
	spans := k.spans[k.bays[r-1]:k.bays[r]]
	for i := 1; i < len(spans); i++ {
		a, b := spans[i-1].member, spans[i].member
		var terms []string
		last := -1
		for x := k.rows[r-1]; x < k.rows[r]; x++ {
			if m := k.nodes[x].member; m >= a && m < b {
				terms = append(terms, k.symbol("d", x))
			}
		}
		equation := strings.Join(terms, " + ") + " + " + p.elongation(spans[i]) + " - " + p.elongation(spans[i-1])
		for x := k.rows[r]; x < k.rows[r+1]; x++ {
			if m := k.nodes[x].member; m >= a && m < b {
				if last >= 0 {
					equation += " - " + k.symbol("d", last)
				}
				last = x
			}
		}
		follows[last] = equation
	}
	return follows
}

// elongation writes the elongation of a member in a bay.
func (p *PreparedSplice) elongation(span stackSpan) string {
	m, j := span.member, span.bay
	stretch := memberSymbol("f", m, j) + " " + memberSymbol("N", m, j)
	if p.cases[p.solved].change == nil {
		return stretch
	}
	return "(" + stretch + " + " + rowSymbol("α", m) + " " + rowSymbol("ΔT", m) + " " + rowSymbol("p", j) + ")"
}

// plasticSteps write the weights of the rows that share with row r.
func (p *PreparedSplice) plasticSteps(r int) []strength.Working {
	k, s := p.stack, &p.splice
	var sheet sharingSheet
	pairs := k.pairsAt(r)
	for row := range s.Rows {
		if !k.joins(row, pairs) && row != r {
			continue
		}
		sheet.add(row, rowSymbol("n", row), float64(s.Rows[row].Count), strength.None, "", "given: rows.count", strength.Given)
		if p.plastic.byArea {
			sheet.add(row, rowSymbol("D", row), s.Rows[row].Diameter, strength.Length, "", "given: rows.diameter", strength.Given)
			sheet.add(row, rowSymbol("Q", row), float64(s.Rows[row].Count)*s.Rows[row].Diameter*s.Rows[row].Diameter, strength.Area,
				rowSymbol("n", row)+" "+rowSymbol("D", row)+"²", "in proportion to the fasteners' areas, for want of a strength", strength.CommonPractice)
			continue
		}
		sheet.add(row, rowSymbol("Q", row), s.rowShear(row).value, strength.Force, "", "shear strength of all fasteners of the row, as in their own checks", strength.CommonPractice)
	}
	return asPlastic(sheet.steps)
}

// plasticCaseSteps write what passes between the members of row r, and its
// share.
func (p *PreparedSplice) plasticCaseSteps(i, r int) []strength.Working {
	k, c := p.stack, &p.cases[i]
	sheet := sharingSheet{loadCase: c.id}
	for m := range p.splice.Members {
		left, right := 0.0, 0.0
		if c.left != nil {
			left, right = c.left[m], c.right[m]
		}
		sheet.add(r, rowSymbol("P_left", m), left, strength.Force, "", "given: load_cases.ends, 0 where not named", strength.Given)
		sheet.add(r, rowSymbol("P_right", m), right, strength.Force, "", "given: load_cases.ends, 0 where not named", strength.Given)
	}
	between := func(pair int) string {
		return fmt.Sprintf("T_%d_%d", k.pairs[pair][0]+1, k.pairs[pair][1]+1)
	}
	passed := map[int][]string{} // by member, what others passed on to it
	for _, step := range p.plastic.peel {
		equation := rowSymbol("P_left", step.leaf) + " - " + rowSymbol("P_right", step.leaf)
		for _, term := range passed[step.leaf] {
			equation += term
		}
		into := " + "
		if k.pairs[step.pair][0] != step.leaf {
			equation, into = "-("+equation+")", " - "
		}
		passed[step.other] = append(passed[step.other], into+between(step.pair))
		sheet.add(r, between(step.pair), p.plastic.between[step.pair], strength.Force, equation,
			"equilibrium of the members beyond: what passes from the first to the second", strength.Derived)
	}
	for x := k.rows[r]; x < k.rows[r+1]-1; x++ {
		pair := k.pair[x-r]
		var all []string
		for row := range p.splice.Rows {
			if k.joins(row, []int{pair}) {
				all = append(all, rowSymbol("Q", row))
			}
		}
		sheet.add(r, k.symbol("R", x), p.plastic.load[x-r], strength.Force,
			between(pair)+" "+rowSymbol("Q", r)+" / ("+strings.Join(all, " + ")+")", sourcePlastic, strength.CommonPractice)
	}
	return asPlastic(sheet.steps)
}

func asPlastic(steps []strength.Working) []strength.Working {
	for i := range steps {
		steps[i].Method = methodPlastic
	}
	return steps
}

// pairsAt are the pairs of members that row r joins.
func (k *stack) pairsAt(r int) []int {
	return k.pair[k.rows[r]-r : max(k.rows[r+1]-r-1, k.rows[r]-r)]
}

// joins reports whether row r joins one of the pairs.
func (k *stack) joins(r int, pairs []int) bool {
	for _, a := range k.pairsAt(r) {
		for _, b := range pairs {
			if a == b {
				return true
			}
		}
	}
	return false
}

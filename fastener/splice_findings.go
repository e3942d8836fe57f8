package fastener

import (
	"fmt"
	"math"

	"jointledger/strength"
)

// allFindings gathers what is to be said, each thing once.
func (p *PreparedSplice) allFindings() []strength.Finding {
	var findings []strength.Finding
	say := func(severity strength.Severity, code, subject string, m strength.Message) {
		findings = append(findings, strength.Finding{Severity: severity, Code: code, Subject: subject, Message: m})
	}
	k, s := p.stack, &p.splice
	if !p.main.why.Empty() {
		say(strength.Warning, "no-sharing", "compliance", strength.Say("%v, so the rows' shares are undetermined", p.main.why))
	}
	untyped := 0
	for r := range s.Rows {
		switch t := s.Rows[r].Type; {
		case t == nil:
			untyped++
		case t.Preload != nil || t.PullThroughStrength > 0:
			say(strength.Note, "not-used", fmt.Sprintf("row %d", r+1), strength.Say("preload and pull_through_strength of its type are not read: the rows carry no tension"))
		}
		if k.rows[r+1]-k.rows[r] == 1 {
			say(strength.Warning, "row-joins-nothing", fmt.Sprintf("row %d", r+1), strength.Say("only the member %q lies at row %d: its fasteners carry nothing",
				s.Members[k.nodes[k.rows[r]].member].ID, r+1))
		}
	}
	if untyped > 0 {
		say(strength.Warning, "not-checked", "rows", strength.Say("%d of %d rows have no type: their fasteners' strength is not checked", untyped, len(s.Rows)))
	}
	for m := range s.Members {
		if s.Members[m].Material == nil {
			say(strength.Warning, "not-checked", "member "+s.Members[m].ID, strength.Say("it has no material: its strength is not checked"))
		} else if s.Members[m].CountersinkDepth > 0 {
			say(strength.Note, "countersunk-bearing", "member "+s.Members[m].ID, strength.Say(
				"bearing counts the thickness less the whole depth of the countersink, %v; the net section counts plain holes", strength.Length.Of(s.Members[m].CountersinkDepth)))
		}
	}
	findings = append(findings, p.closedForms()...)
	findings = append(findings, p.plasticFinding()...)
	findings = append(findings, p.spread()...)
	return append(findings, p.caseFindings()...)
}

// peak is the largest share of a load case: which interface, and how much.
type peak struct {
	share    float64
	at       int // interface
	loadCase string
}

func (a *peak) take(out *Transfers, loadCase string) {
	for i := range out.Interfaces {
		if share := math.Abs(out.Interfaces[i].Share); share > a.share {
			*a = peak{share, i, loadCase}
		}
	}
}

// spread tells how the largest share moves with the other compliances asked for.
func (p *PreparedSplice) spread() []strength.Finding {
	if len(p.compared) == 0 {
		return nil
	}
	var findings []strength.Finding
	out := p.NewTransfers()
	var own peak
	for i := range p.cases {
		if p.enter(i) == nil {
			p.Transfers(i, &out)
			own.take(&out, p.cases[i].id)
		}
	}
	place := func(a peak) strength.Message {
		f := out.Interfaces[a.at]
		return strength.Say("%.4g at row %d between %q and %q in %q", a.share, f.Row, p.splice.Members[f.First].ID, p.splice.Members[f.Second].ID, a.loadCase)
	}
	for k := range p.compared {
		c := &p.compared[k]
		finding := strength.Finding{Severity: strength.Note, Code: "compliance-spread", Subject: c.name}
		if !c.why.Empty() {
			finding.Message = strength.Say("not compared: %v", c.why)
			findings = append(findings, finding)
			continue
		}
		var other peak
		for i := range p.cases {
			p.ComparedTransfers(k, i, &out)
			other.take(&out, p.cases[i].id)
		}
		switch {
		case other.share == 0:
			continue
		case own.share == 0:
			finding.Message = strength.Say("by %s the largest share is %v", c.name, place(other))
		default:
			finding.Message = strength.Say("by %s the largest share is %v; by %s it is %v", c.name, place(other), p.splice.Compliance, place(own))
		}
		findings = append(findings, finding)
	}
	return findings
}

// caseFindings are those that load cases make.
func (p *PreparedSplice) caseFindings() []strength.Finding {
	var findings []strength.Finding
	say := func(severity strength.Severity, code, subject string, m strength.Message) {
		findings = append(findings, strength.Finding{Severity: severity, Code: code, Subject: subject, Message: m})
	}
	ultimate, open, stopped, compressed := 0, 0, 0, 0
	unexpanded := map[int]bool{}
	for i := range p.cases {
		c := &p.cases[i]
		if c.level == strength.Ultimate {
			ultimate++
		}
		for m, change := range c.change {
			if change != 0 && p.splice.Members[m].Expansion == 0 {
				unexpanded[m] = true
			}
		}
		if !p.main.why.Empty() {
			continue
		}
		p.enter(i)
		if p.main.contact != nil {
			switch result := p.main.contact.result; {
			case result.Ended == ContactStopped:
				stopped++
				continue
			case result.Open > 0:
				open++
			}
		}
		for x, node := range p.stack.nodes {
			if left, right := p.main.sides(x, c); p.splice.Members[node.member].Material != nil && min(left, right) < 0 {
				compressed++
				break
			}
		}
	}
	if p.main.contact != nil {
		say(strength.Note, "clearance", "rows", strength.Say("in %d of %d load cases some fasteners do not take up their clearance and carry nothing; contact is found at the load as given, so factored demands keep those shares", open, len(p.cases)))
	}
	if stopped > 0 {
		say(strength.Warning, "contact-not-settled", "rows", strength.Say("in %d of %d load cases the contact of clearances did not settle: their checks are undetermined", stopped, len(p.cases)))
	}
	if compressed > 0 {
		say(strength.Note, "compression", "members", strength.Say("in %d of %d load cases members with a material are compressed: they are checked for buckling between rows, not for that of the whole member, and their net section in tension only", compressed, len(p.cases)))
	}
	for m := range p.splice.Members {
		if unexpanded[m] {
			say(strength.Warning, "no-expansion", "member "+p.splice.Members[m].ID, strength.Say("its temperature changes but its expansion is 0 or was not given"))
		}
	}
	limitChecks := 0
	for i := range p.checks {
		if p.checks[i].Level == strength.Limit {
			limitChecks++
		}
	}
	if ultimate > 0 && limitChecks > 0 {
		say(strength.Note, "limit-from-ultimate", "load cases", strength.Say(
			"%d of %d load cases are given at ultimate: their checks at limit level take the load divided by the ultimate factor", ultimate, len(p.cases)))
	}
	return findings
}

// Findings implements strength.Calculation.
func (p *PreparedSplice) Findings() []strength.Finding { return p.findings }

// Cautions implements strength.Calculation.
func (p *PreparedSplice) Cautions() []string {
	cautions := []string{
		"The rows share by one line of axial springs: bending of members that do not lie in line, friction and yielding are left out.",
		"Published compliance formulas differ two to three times; compare_compliance shows how the shares move.",
	}
	if !p.splice.Symmetric && p.stack.deepest() > 2 && p.splice.Compliance != ComplianceGiven {
		cautions = append(cautions, "A stack of three or more members takes the single-shear form of the compliance formula at each interface, which is too soft for fasteners in double shear.")
	}
	return cautions
}

// deepest is the largest number of members at a row.
func (k *stack) deepest() int {
	most := 0
	for r := range len(k.rows) - 1 {
		most = max(most, k.rows[r+1]-k.rows[r])
	}
	return most
}

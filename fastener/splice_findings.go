package fastener

import "jointledger/strength"

// allFindings tells what is to be said of the joint.
func (p *PreparedSplice) allFindings() []strength.Finding {
	var findings []strength.Finding
	k := p.stack
	if !p.main.why.Empty() {
		findings = append(findings, strength.Finding{
			Severity: strength.Warning, Code: "no-sharing", Subject: "compliance",
			Message: strength.Say("%v, so the rows' shares are undetermined", p.main.why),
		})
	}
	for r := range p.splice.Rows {
		if k.rows[r+1]-k.rows[r] == 1 {
			findings = append(findings, strength.Finding{
				Severity: strength.Warning, Code: "row-joins-nothing", Subject: splicePointer("rows", r)[1:],
				Message: strength.Say("only the member %q lies at row %d: its fasteners carry nothing",
					p.splice.Members[k.nodes[k.rows[r]].member].ID, r+1),
			})
		}
	}
	return findings
}

// Cautions returns what the calculation leaves to the user.
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

package fastener

import (
	"jointledger/strength"
)

// allFindings gathers what is to be said, each thing once.
func (p *PreparedPattern) allFindings(edges [][]edgeDistance, near []Neighbour) []strength.Finding {
	var findings []strength.Finding
	say := func(severity strength.Severity, code, subject, source string, m strength.Message) {
		findings = append(findings, strength.Finding{Severity: severity, Code: code, Subject: subject, Message: m, Source: source})
	}
	for _, set := range p.pattern.Rules {
		findings = append(findings, p.layoutFindings(set, edges, near)...)
	}
	for i, n := range near {
		f := &p.pattern.Fasteners[i]
		if n.Index < 0 {
			continue
		}
		other := &p.pattern.Fasteners[n.Index]
		if least := (f.Diameter + other.Diameter) / 2; strength.AtMost(n.Distance, least) {
			say(strength.Violation, "holes-overlap", "fastener "+f.ID, "", strength.Say(
				"its hole runs into that of fastener %q: the centres are %v apart", other.ID, strength.Length.Of(n.Distance)))
		}
	}
	untyped := 0
	for _, f := range p.pattern.Fasteners {
		if f.Type == nil {
			untyped++
		}
	}
	if untyped > 0 {
		say(strength.Warning, "not-checked", "fasteners", "", strength.Say(
			"%d of %d fasteners have no type: their strength is not checked", untyped, len(p.pattern.Fasteners)))
	}
	for k, plate := range p.pattern.Plates {
		if plate.Material == nil {
			say(strength.Warning, "not-checked", "plate "+plate.ID, "", strength.Say("it has no material: its strength is not checked"))
			continue
		}
		if plate.CountersinkDepth > 0 {
			say(strength.Note, "countersunk-bearing", "plate "+plate.ID, "common practice, no source", strength.Say(
				"bearing counts the thickness less the whole depth of the countersink, %v", strength.Length.Of(plate.Thickness-plate.CountersinkDepth)))
		}
		if plate.AxisAngle == nil {
			say(strength.Warning, "not-checked", "plate "+plate.ID, "", strength.Say(
				"it has no axis_angle: sections across its rows, block tearing and buckling between fasteners are not checked"))
		} else if p.outlines[k] == nil {
			say(strength.Warning, "not-checked", "plate "+plate.ID, "", strength.Say(
				"it has no outline: sections across its rows, block tearing and buckling between fasteners are not checked"))
		}
		if r := p.rows[k]; r != nil {
			if near := r.staggered(p); near >= 0 {
				say(strength.Warning, "staggered-rows", "plate "+plate.ID, "", strength.Say(
					"rows stand closer than two holes along its axis, the first at fastener %q: sections run straight across each row, and a zigzag between rows may be weaker",
					p.pattern.Fasteners[near].ID))
			}
		}
		halved := 0
		for i := range p.pattern.Fasteners {
			if plate.LoadShare == 0 && p.loadShare(i, k) < 1 {
				halved++
			}
		}
		if halved > 0 {
			say(strength.Note, "load-share", "plate "+plate.ID, "", strength.Say(
				"it is taken as an outer plate in double shear and to bear half the load of %d fasteners; give load_share where it bears more", halved))
		}
	}
	return append(findings, p.caseFindings()...)
}

// caseFindings are those that load cases make.
func (p *PreparedPattern) caseFindings() []strength.Finding {
	var findings []strength.Finding
	ultimate, compressed := 0, 0
	worst := struct {
		tension            float64
		fastener, loadCase string
	}{}
	shares := p.state.shares[strength.Limit]
	for i, c := range p.cases {
		if c.Level == strength.Ultimate {
			ultimate++
		}
		p.sharing.share(p.loads[i], shares)
		scale := 0.0
		for _, s := range shares {
			scale = max(scale, s.Resultant, s.Tension, -s.Tension)
		}
		pushed := false
		for j, s := range shares {
			if s.Tension >= -strength.Within*scale {
				continue
			}
			pushed = true
			if s.Tension < worst.tension {
				worst.tension, worst.fastener, worst.loadCase = s.Tension, p.pattern.Fasteners[j].ID, c.ID
			}
		}
		if pushed {
			compressed++
		}
	}
	if compressed > 0 {
		findings = append(findings, strength.Finding{
			Severity: strength.Note, Code: "compression", Subject: "fastener " + worst.fastener,
			Message: strength.Say("in %d of %d load cases fasteners are pushed together, which contact of the plates bears and the tension check takes as 0; the most is %v at fastener %q in %q",
				compressed, len(p.cases), strength.Force.Of(-worst.tension), worst.fastener, worst.loadCase),
			Source: sourceOutOfPlane,
		})
	}
	limitChecks := 0
	for _, c := range p.checks {
		if c.Level == strength.Limit {
			limitChecks++
		}
	}
	if ultimate > 0 && limitChecks > 0 {
		findings = append(findings, strength.Finding{
			Severity: strength.Note, Code: "limit-from-ultimate", Subject: "load cases",
			Message: strength.Say("%d of %d load cases are given at ultimate: their checks at limit level take the load divided by the ultimate factor",
				ultimate, len(p.cases)),
		})
	}
	return findings
}

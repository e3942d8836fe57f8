package fastener

import (
	"fmt"
	"strconv"
	"strings"

	"jointledger/strength"
)

// RuleSet is a named practice of layout.
type RuleSet struct {
	ID            string
	Revision      int
	Title, Source string
	Mark          strength.Mark
	Rules         []Rule
}

// Name is the set as records carry it, id@revision.
func (r RuleSet) Name() string { return fmt.Sprintf("%s@%d", r.ID, r.Revision) }

// Rule bounds one measure of the layout.
type Rule struct {
	Measure  Measure
	Severity strength.Severity // of breaking it
	// The bound is Diameters D + Thicknesses t.
	Diameters, Thicknesses float64
}

// Measure is what a rule measures, by the word that findings carry as code.
type Measure string

// The measures.
const (
	// EdgeDistance is from a hole's centre to the nearest side, at least.
	EdgeDistance Measure = "edge-distance"
	// Pitch is from a fastener's centre to the nearest other, at least.
	Pitch Measure = "pitch"
	// CountersinkDepth is of a countersunk plate, at most.
	CountersinkDepth Measure = "countersink-depth"
)

// RuleSets returns the built-in sets, every revision ever released.
func RuleSets() []RuleSet {
	return []RuleSet{
		{
			ID: "common-practice", Revision: 1, Title: "Common practice of airframe layout",
			Source: "common practice, no source", Mark: strength.CommonPractice,
			Rules: []Rule{
				{Measure: EdgeDistance, Severity: strength.Violation, Diameters: 1.5},
				{Measure: EdgeDistance, Severity: strength.Warning, Diameters: 2},
				{Measure: Pitch, Severity: strength.Violation, Diameters: 3},
				{Measure: Pitch, Severity: strength.Warning, Diameters: 4},
				{Measure: CountersinkDepth, Severity: strength.Violation, Thicknesses: 0.7},
			},
		},
	}
}

// FindRules finds a set by "id", the latest revision, or by "id@revision".
func FindRules(name string) (RuleSet, bool) {
	id, revision, pinned := strings.Cut(name, "@")
	var found RuleSet
	for _, r := range RuleSets() {
		if r.ID == id && (!pinned && r.Revision > found.Revision || pinned && strconv.Itoa(r.Revision) == revision) {
			found = r
		}
	}
	return found, found.Revision > 0
}

// bound is the value that a rule asks for.
func (r Rule) bound(d, t float64) float64 {
	return float64(r.Diameters*d) + float64(r.Thicknesses*t)
}

// Asks writes the bound in symbols.
func (r Rule) Asks() string {
	if r.Thicknesses > 0 {
		return fmt.Sprintf("%g t", r.Thicknesses)
	}
	return fmt.Sprintf("%g D", r.Diameters)
}

// worst returns the severest broken rule of a measure; each measure is at
// least its bound, or at most where most is set.
func (r RuleSet) worst(measure Measure, found, d, t float64, most bool) (Rule, bool) {
	var worst Rule
	for _, rule := range r.Rules {
		broken := strength.Less(found, rule.bound(d, t))
		if most {
			broken = strength.More(found, rule.bound(d, t))
		}
		if rule.Measure == measure && broken && (worst.Severity == 0 || rule.Severity < worst.Severity) {
			worst = rule
		}
	}
	return worst, worst.Severity != 0
}

// layoutFindings holds a pattern against a set of rules.
func (p *PreparedPattern) layoutFindings(set RuleSet, edges [][]edgeDistance, near []neighbour) []strength.Finding {
	var findings []strength.Finding
	report := func(rule Rule, subject string, m strength.Message) {
		findings = append(findings, strength.Finding{
			Severity: rule.Severity, Code: string(rule.Measure), Subject: subject, Message: m,
			Source: set.Name() + ": " + set.Source,
		})
	}
	for i, f := range p.pattern.Fasteners {
		subject := "fastener " + f.ID
		d := f.Diameter
		for k, plate := range p.pattern.Plates {
			if edges[k] == nil {
				continue
			}
			e := edges[k][i].e
			if rule, broken := set.worst(EdgeDistance, e, d, plate.Thickness, false); broken {
				report(rule, subject, strength.Say("edge distance %v (%.4g D) in plate %q is less than %v (%s)",
					strength.Length.Of(e), e/d, plate.ID, strength.Length.Of(rule.bound(d, plate.Thickness)), rule.Asks()))
			}
		}
		if near[i].index < 0 {
			continue
		}
		if rule, broken := set.worst(Pitch, near[i].distance, d, 0, false); broken {
			report(rule, subject, strength.Say("pitch %v (%.4g D) to fastener %q is less than %v (%s)",
				strength.Length.Of(near[i].distance), near[i].distance/d, p.pattern.Fasteners[near[i].index].ID,
				strength.Length.Of(rule.bound(d, 0)), rule.Asks()))
		}
	}
	for _, plate := range p.pattern.Plates {
		if rule, broken := set.worst(CountersinkDepth, plate.CountersinkDepth, 0, plate.Thickness, true); broken {
			report(rule, "plate "+plate.ID, strength.Say("countersink depth %v is more than %v (%s)",
				strength.Length.Of(plate.CountersinkDepth), strength.Length.Of(rule.bound(0, plate.Thickness)), rule.Asks()))
		}
	}
	return findings
}

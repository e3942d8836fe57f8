package fastener

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"jointledger/strength"
)

// RuleSet is a named practice of layout, built in or the caller's own.
type RuleSet struct {
	ID            string
	Revision      int
	Title, Source string
	Mark          strength.Mark
	Rules         []Rule
}

// Name is the set as records carry it, id@revision.
func (r RuleSet) Name() string { return fmt.Sprintf("%s@%d", r.ID, r.Revision) }

// Rule bounds one measure of the layout by Diameters D + Thicknesses t + Length,
// but not more than Cap. D is the fastener's diameter; t the thickness of the
// plate, or of the thinnest where the measure is of no plate.
type Rule struct {
	Measure                Measure
	Severity               strength.Severity // of breaking it
	Diameters, Thicknesses float64
	Length, Cap            float64 // mm; a cap of 0 is none
	OfHole                 bool    // D is the hole's
	// Table gives the bound by diameter in place of the rest, which holds for
	// diameters above its last step.
	Table []Step
	Rows  Rows   // the patterns that it is for
	When  string // a condition that a reader must judge
}

// Step is a bound in mm for diameters up to one.
type Step struct{ UpTo, Bound float64 }

// Rows tells single rows of fasteners from several.
type Rows uint8

// The rows that a rule is for; zero is any.
const (
	SingleRow Rows = iota + 1
	SeveralRows
)

// Measure is what a rule measures, by the word that findings carry as code.
type Measure string

// The measures, in the order of answers. Along and across are the direction of
// a fastener's load, over all load cases: a neighbour within 45° of the line of
// the load is along it.
const (
	EdgeDistance      Measure = "edge-distance"       // hole centre to the nearest side, at least
	EdgeDistanceAlong Measure = "edge-distance-along" // hole centre to the outline the way it pushes, at least
	EdgeDistanceMost  Measure = "edge-distance-most"  // of the fastener nearest to a side, at most
	Pitch             Measure = "pitch"               // to the nearest other, at least
	PitchAlong        Measure = "pitch-along"         // to the nearest other along the load, at least
	PitchAcross       Measure = "pitch-across"        // to the nearest other across the load, at least
	PitchMost         Measure = "pitch-most"          // to the nearest other, at most
	CountersinkDepth  Measure = "countersink-depth"   // of a countersunk plate, at most
)

// Measures returns the measures in the order of answers.
func Measures() []Measure {
	return []Measure{EdgeDistance, EdgeDistanceAlong, EdgeDistanceMost, Pitch, PitchAlong, PitchAcross, PitchMost, CountersinkDepth}
}

// words for people, and whether the bound is the most.
var measureWords = map[Measure]struct {
	title string
	most  bool
}{
	EdgeDistance:      {"edge distance", false},
	EdgeDistanceAlong: {"edge distance along the load", false},
	EdgeDistanceMost:  {"edge distance", true},
	Pitch:             {"pitch", false},
	PitchAlong:        {"pitch along the load", false},
	PitchAcross:       {"pitch across the load", false},
	PitchMost:         {"pitch", true},
	CountersinkDepth:  {"countersink depth", true},
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

// Check says what keeps a caller's own set from being used; pointers start at
// the set.
func (r RuleSet) Check() []strength.Fault {
	var faults []strength.Fault
	fault := func(rule int, name, format string, args ...any) {
		faults = append(faults, strength.Fault{Pointer: field("rules", rule, name), Message: strength.Say(format, args...)})
	}
	if len(r.Rules) == 0 {
		faults = append(faults, strength.Fault{Pointer: "/rules", Message: strength.Say("a rule set needs at least one rule")})
	}
	for i, rule := range r.Rules {
		if !slices.Contains(Measures(), rule.Measure) {
			fault(i, "measure", "%q is not known; allowed are %q", string(rule.Measure), Measures())
		}
		if rule.Severity < strength.Violation || rule.Severity > strength.Note {
			fault(i, "severity", "allowed are violation, warning and note")
		}
		if rule.Diameters < 0 || rule.Thicknesses < 0 || rule.Length < 0 || rule.Cap < 0 {
			fault(i, "diameters", "diameters, thicknesses, length and cap are not negative")
		} else if rule.Diameters+rule.Thicknesses+rule.Length == 0 {
			fault(i, "diameters", "one of diameters, thicknesses and length must be more than 0")
		}
	}
	return faults
}

// bound is the value that a rule asks for, in mm.
func (r Rule) bound(f *Fastener, t float64) float64 {
	d := 0.0
	if f != nil {
		d = f.Diameter
		if r.OfHole {
			d = f.hole()
		}
		for _, step := range r.Table {
			if strength.AtMost(d, step.UpTo) {
				return step.Bound
			}
		}
	}
	b := float64(r.Diameters*d) + float64(r.Thicknesses*t) + r.Length
	if r.Cap > 0 {
		b = min(b, r.Cap)
	}
	return b
}

// Asks writes the bound in symbols: D the diameter, D_h the hole, t the
// thickness.
func (r Rule) Asks() strength.Message {
	var terms []string
	var lengths []any
	length := func(format string, x float64) string {
		lengths = append(lengths, strength.Length.Of(x))
		return format
	}
	d := "D"
	if r.OfHole {
		d = "D_h"
	}
	table := ""
	if len(r.Table) > 0 {
		table = length("by table up to D %v, above it ", r.Table[len(r.Table)-1].UpTo)
	}
	if r.Diameters > 0 {
		terms = append(terms, fmt.Sprintf("%.4g %s", r.Diameters, d))
	}
	if r.Thicknesses > 0 {
		terms = append(terms, fmt.Sprintf("%g t", r.Thicknesses))
	}
	if r.Length > 0 {
		terms = append(terms, length("%v", r.Length))
	}
	asks := strings.Join(terms, " + ")
	if r.Cap > 0 {
		asks = "min(" + asks + ", " + length("%v", r.Cap) + ")"
	}
	asks = table + asks
	switch r.Rows {
	case SingleRow:
		asks += ", single row"
	case SeveralRows:
		asks += ", several rows"
	}
	if r.When != "" {
		asks, lengths = asks+", %s", append(lengths, r.When)
	}
	return strength.Say(asks, lengths...)
}

// worst returns the severest broken rule of a measure.
func (r RuleSet) worst(measure Measure, found float64, f *Fastener, t float64, rows Rows) (Rule, bool) {
	var worst Rule
	for _, rule := range r.Rules {
		if rule.Measure != measure || rule.Rows != 0 && rule.Rows != rows {
			continue
		}
		bound := rule.bound(f, t)
		broken := strength.Less(found, bound)
		if measureWords[measure].most {
			broken = strength.More(found, bound)
		}
		if broken && (worst.Severity == 0 || rule.Severity < worst.Severity) {
			worst = rule
		}
	}
	return worst, worst.Severity != 0
}

// measures reports whether the set has a rule on one of the measures.
func (r RuleSet) measures(some ...Measure) bool {
	return slices.ContainsFunc(r.Rules, func(rule Rule) bool { return slices.Contains(some, rule.Measure) })
}

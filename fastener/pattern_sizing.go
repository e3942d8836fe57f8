package fastener

import (
	"slices"

	"jointledger/strength"
)

// Candidate is a diameter that a pattern may have, with the type that goes with
// it; a nil type keeps each fastener's own.
type Candidate struct {
	Diameter float64 // mm
	Type     *Type
}

// Trial is how a pattern did with a candidate.
type Trial struct {
	Candidate Candidate
	// Holds tells that every check in every load case reaches the target.
	Holds bool
	// Prepared is nil where the pattern cannot be calculated; Why says so then,
	// or names the first check that is undetermined.
	Prepared *PreparedPattern
	Why      strength.Message
	// Check, Case and Margin are of the least margin, Check -1 where there is none.
	Check, Case int
	Margin      float64
}

// SizeDiameter tries candidates from the least diameter up and stops at the
// first that holds every check with at least the target margin; holes keep
// their clearance. Margins need not rise with the diameter, since edge distance
// and pitch fall: each candidate is tried, none inferred. The faults are those
// of the input itself: a fastener whose strength belongs to one diameter, and a
// candidate that says no other.
func SizeDiameter(p Pattern, f strength.Factors, cases []PatternCase, candidates []Candidate, target float64) ([]Trial, []strength.Fault) {
	if len(candidates) == 0 {
		return nil, []strength.Fault{{Pointer: "/diameters", Message: strength.Say("needs at least one diameter")}}
	}
	keep := slices.ContainsFunc(candidates, func(c Candidate) bool { return c.Type == nil })
	var faults []strength.Fault
	for i, fastener := range p.Fasteners {
		if t := fastener.Type; keep && t != nil && (t.ShearStrength > 0 || t.TensionStrength > 0 || t.Thread != nil || t.Diameter > 0) {
			faults = append(faults, strength.Fault{Pointer: field("fasteners", i, "type"), Message: strength.Say(
				"type %q belongs to one diameter: give a type with each diameter, or fsu without rated strengths and thread", t.Name)})
		}
	}
	if len(faults) > 0 {
		return nil, faults
	}
	ascending := slices.Clone(candidates)
	slices.SortStableFunc(ascending, func(a, b Candidate) int {
		switch {
		case a.Diameter < b.Diameter:
			return -1
		case a.Diameter > b.Diameter:
			return 1
		}
		return 0
	})
	var trials []Trial
	for _, c := range ascending {
		trial := try(p, f, cases, c, target)
		trials = append(trials, trial)
		if trial.Holds {
			break
		}
	}
	return trials, nil
}

func try(p Pattern, f strength.Factors, cases []PatternCase, c Candidate, target float64) Trial {
	trial := Trial{Candidate: c, Check: -1}
	p.Fasteners = slices.Clone(p.Fasteners)
	for i := range p.Fasteners {
		fastener := &p.Fasteners[i]
		if fastener.HoleDiameter > 0 {
			fastener.HoleDiameter += c.Diameter - fastener.Diameter
		}
		fastener.Diameter = c.Diameter
		if c.Type != nil {
			fastener.Type = c.Type
		}
	}
	prepared, faults := PreparePattern(p, f, cases)
	if len(faults) > 0 {
		trial.Why = faults[0].Message
		return trial
	}
	trial.Prepared, trial.Holds = prepared, len(prepared.checks) > 0
	if !trial.Holds {
		trial.Why = strength.Say("there is no check: the fasteners have no type and the plates no material")
	}
	margins := make([]strength.Margin, len(prepared.checks))
	for i := range cases {
		prepared.Margins(i, margins)
		for k, m := range margins {
			switch m.Status {
			case strength.Undetermined:
				if trial.Holds = false; trial.Why.Empty() {
					trial.Why = *m.Why
				}
			case strength.Adequate, strength.Inadequate:
				if trial.Check < 0 || m.Margin < trial.Margin {
					trial.Check, trial.Case, trial.Margin = k, i, m.Margin
				}
			}
		}
	}
	if trial.Check >= 0 && trial.Margin < target {
		trial.Holds = false
	}
	return trial
}

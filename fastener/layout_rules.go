package fastener

import "jointledger/strength"

// tableJ34 is AISC 360 table J3.4: the least edge distance in mm by the bolt's
// diameter, in steps up to the diameter. Above it 1.25 d.
var tableJ34 = []Step{{16, 22}, {20, 26}, {22, 28}, {24, 30}, {27, 34}, {30, 38}, {36, 46}}

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
		{
			// The pitch of several rows is 60 % sure from memory, the rest seen.
			ID: "ac-43-13-1b", Revision: 1, Title: "Repairs of sheet structures",
			Source: "AC 43.13-1B paragraph 4-57", Mark: strength.FromMemory(60),
			Rules: []Rule{
				{Measure: EdgeDistance, Severity: strength.Violation, Diameters: 2},
				{Measure: Pitch, Severity: strength.Violation, Diameters: 3, Rows: SingleRow},
				{Measure: Pitch, Severity: strength.Violation, Diameters: 4, Rows: SeveralRows},
			},
		},
		{
			ID: "en-1993-1-8", Revision: 1, Title: "Spacings of bolts in buildings",
			Source: "EN 1993-1-8 table 3.3", Mark: strength.Seen,
			Rules: []Rule{
				{Measure: EdgeDistance, Severity: strength.Violation, Diameters: 1.2, OfHole: true},
				{Measure: PitchAlong, Severity: strength.Violation, Diameters: 2.2, OfHole: true},
				{Measure: PitchAcross, Severity: strength.Violation, Diameters: 2.4, OfHole: true},
				{Measure: EdgeDistanceMost, Severity: strength.Warning, Thicknesses: 4, Length: 40, When: "where the edge is exposed to weather"},
				{Measure: PitchMost, Severity: strength.Violation, Thicknesses: 14, Cap: 200},
			},
		},
		{
			ID: "aisc-360", Revision: 1, Title: "Spacings of bolts in steel buildings",
			Source: "AISC 360-16 J3.3, J3.4, J3.5", Mark: strength.Seen,
			Rules: []Rule{
				{Measure: Pitch, Severity: strength.Violation, Diameters: 8.0 / 3},
				{Measure: Pitch, Severity: strength.Warning, Diameters: 3},
				{Measure: EdgeDistance, Severity: strength.Violation, Table: tableJ34, Diameters: 1.25},
				{Measure: EdgeDistanceMost, Severity: strength.Violation, Thicknesses: 12, Cap: 150},
				{Measure: PitchMost, Severity: strength.Violation, Thicknesses: 24, Cap: 300},
			},
		},
	}
}

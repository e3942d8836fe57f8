package fastener

import (
	"math"

	"jointledger/strength"
)

// span is a distance that was found, to what, and in which load case.
type span struct {
	distance float64
	other    int32 // a fastener, or -1
	loadCase int32
}

// directed are the least distances along and across the load of one fastener.
type directed struct{ along, across span }

// layoutFindings holds a pattern against a set of rules.
func (p *PreparedPattern) layoutFindings(set RuleSet, edges [][]edgeDistance, near []Neighbour) []strength.Finding {
	var findings []strength.Finding
	rows := SeveralRows
	least := math.Inf(1)
	for i := range p.pattern.Fasteners {
		least = min(least, p.pattern.Fasteners[i].Diameter)
	}
	if p.sharing.breadth < least/2 {
		rows = SingleRow
	}
	check := func(measure Measure, found float64, f *Fastener, t float64, subject, where string, args ...any) {
		rule, broken := set.worst(measure, found, f, t, rows)
		if !broken {
			return
		}
		word, than := measureWords[measure], "less"
		if word.most {
			than = "more"
		}
		size := strength.Say("%v", strength.Length.Of(found))
		if f != nil {
			size = strength.Say("%v (%.4g D)", strength.Length.Of(found), found/f.Diameter)
		}
		findings = append(findings, strength.Finding{
			Severity: rule.Severity, Code: string(measure), Subject: subject,
			Message: strength.Say("%s %v%v is %s than %v (%s)", word.title, size, strength.Say(where, args...), than,
				strength.Length.Of(rule.bound(f, t)), rule.Asks()),
			Source: set.Name() + ": " + set.Source,
		})
	}
	thinnest := p.thinnest()
	var along, across []directed // of edges by plate and fastener, of pitches by fastener
	if set.measures(EdgeDistanceAlong, PitchAlong, PitchAcross) {
		along, across = p.directedDistances(set)
	}
	n := len(p.pattern.Fasteners)
	for i := range p.pattern.Fasteners {
		f := &p.pattern.Fasteners[i]
		subject := "fastener " + f.ID
		for k, plate := range p.pattern.Plates {
			if edges[k] == nil {
				continue
			}
			check(EdgeDistance, edges[k][i].e, f, plate.Thickness, subject, " in plate %q", plate.ID)
			if along == nil {
				continue
			}
			if m := along[k*n+i].along; !math.IsInf(m.distance, 0) {
				check(EdgeDistanceAlong, m.distance, f, plate.Thickness, subject, " in plate %q under load case %q", plate.ID, p.cases[m.loadCase].ID)
			}
		}
		if near[i].Index >= 0 {
			other := p.pattern.Fasteners[near[i].Index].ID
			check(Pitch, near[i].Distance, f, thinnest, subject, " to fastener %q", other)
			if len(p.pattern.Plates) > 0 {
				check(PitchMost, near[i].Distance, f, thinnest, subject, " to fastener %q", other)
			}
		}
		if across == nil {
			continue
		}
		for _, d := range []struct {
			measure Measure
			found   span
		}{{PitchAlong, across[i].along}, {PitchAcross, across[i].across}} {
			if d.found.other >= 0 {
				check(d.measure, d.found.distance, f, thinnest, subject, " to fastener %q under load case %q",
					p.pattern.Fasteners[d.found.other].ID, p.cases[d.found.loadCase].ID)
			}
		}
	}
	for k, plate := range p.pattern.Plates {
		check(CountersinkDepth, plate.CountersinkDepth, nil, plate.Thickness, "plate "+plate.ID, "")
		if edges[k] == nil || !set.measures(EdgeDistanceMost) {
			continue
		}
		// Of each side, the fastener nearest to it.
		nearest := map[side]int{}
		for i, e := range edges[k] {
			if j, ok := nearest[e.side]; !ok || e.e < edges[k][j].e {
				nearest[e.side] = i
			}
		}
		for _, s := range p.outlines[k] {
			if i, ok := nearest[s]; ok {
				f := &p.pattern.Fasteners[i]
				check(EdgeDistanceMost, edges[k][i].e, f, plate.Thickness, "fastener "+f.ID, " in plate %q", plate.ID)
			}
		}
	}
	return findings
}

// thinnest is the least thickness of the plates, 0 without plates.
func (p *PreparedPattern) thinnest() float64 {
	if len(p.pattern.Plates) == 0 {
		return 0
	}
	least := math.Inf(1)
	for _, plate := range p.pattern.Plates {
		least = min(least, plate.Thickness)
	}
	return least
}

// directedDistances returns, over all load cases, the least edge distance of
// each fastener the way it pushes each plate, and the least distances to other
// fasteners along and across its load.
func (p *PreparedPattern) directedDistances(set RuleSet) (edges, pitches []directed) {
	n := len(p.pattern.Fasteners)
	none := directed{span{math.Inf(1), -1, 0}, span{math.Inf(1), -1, 0}}
	edges, pitches = make([]directed, n*len(p.pattern.Plates)), make([]directed, n)
	for i := range edges {
		edges[i] = none
	}
	grove := plantGrove(p.pattern.Fasteners)
	thinnest := p.thinnest()
	around := make([][]int32, n)
	for i := range pitches {
		pitches[i] = none
		radius := 0.0
		for _, rule := range set.Rules {
			if rule.Measure == PitchAlong || rule.Measure == PitchAcross {
				radius = max(radius, rule.bound(&p.pattern.Fasteners[i], thinnest))
			}
		}
		grove.within(0, n, i, radius, &around[i])
	}
	wantEdges := set.measures(EdgeDistanceAlong)
	shares := p.state.shares[strength.Limit]
	for c := range p.cases {
		p.Shares(c, shares)
		for i := range shares {
			f := &p.pattern.Fasteners[i]
			for k := range p.pattern.Plates {
				ux, uy, ok := push(k, &shares[i])
				if !ok || !wantEdges || p.outlines[k] == nil {
					continue
				}
				if d := cast(p.outlines[k], f.X, f.Y, ux, uy).length; d < edges[k*n+i].along.distance {
					edges[k*n+i].along = span{d, -1, int32(c)}
				}
			}
			ux, uy, ok := push(1, &shares[i])
			if !ok {
				continue
			}
			for _, j := range around[i] {
				dx, dy := p.pattern.Fasteners[j].X-f.X, p.pattern.Fasteners[j].Y-f.Y
				found := &pitches[i].across
				if math.Abs(float64(dx*ux)+float64(dy*uy)) >= math.Abs(float64(dx*uy)-float64(dy*ux)) {
					found = &pitches[i].along
				}
				if d := math.Hypot(dx, dy); d < found.distance {
					*found = span{d, j, int32(c)}
				}
			}
		}
	}
	return edges, pitches
}

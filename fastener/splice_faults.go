package fastener

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"jointledger/strength"
)

// splicePointer writes a JSON pointer from its parts.
func splicePointer(parts ...any) string {
	var b strings.Builder
	for _, part := range parts {
		fmt.Fprintf(&b, "/%v", part)
	}
	return b.String()
}

// withDefaults writes the defaults out, in copies of what it changes.
func (s Splice) withDefaults() Splice {
	s.Members, s.Rows = slices.Clone(s.Members), slices.Clone(s.Rows)
	for i := range s.Members {
		m := &s.Members[i]
		if m.FirstRow == 0 {
			m.FirstRow = 1
		}
		if m.LastRow == 0 {
			m.LastRow = len(s.Rows)
		}
	}
	for i := range s.Rows {
		r := &s.Rows[i]
		if r.Count == 0 {
			r.Count = 1
		}
		if r.Installation == "" {
			r.Installation = Bolted
		}
		if r.ShearPlanes == 0 {
			r.ShearPlanes = 1
			if s.Symmetric {
				r.ShearPlanes = 2
			}
		}
	}
	return s
}

// faultList collects faults.
type faultList []strength.Fault

func (l *faultList) add(pointer, format string, args ...any) {
	*l = append(*l, strength.Fault{Pointer: pointer, Message: strength.Say(format, args...)})
}

// merge adds faults at places that have none yet.
func (l *faultList) merge(more faultList) {
	for _, f := range more {
		if !slices.ContainsFunc(*l, func(g strength.Fault) bool { return g.Pointer == f.Pointer }) {
			*l = append(*l, f)
		}
	}
}

// sizeFaults checks every member and row by itself. With none of these faults
// the topology of the splice is sound.
func (s *Splice) sizeFaults() faultList {
	var faults faultList
	n := len(s.Rows)
	if n == 0 {
		faults.add("/rows", "there is no row; at least one is needed")
	}
	if len(s.Members) == 0 {
		faults.add("/members", "there is no member; at least two are needed")
	}
	if len(s.Pitches) != max(n-1, 0) {
		faults.add("/pitches", "found %d pitches, allowed is one fewer than the %d rows", len(s.Pitches), n)
	}
	for j, pitch := range s.Pitches {
		if !(pitch > 0) {
			faults.add(splicePointer("pitches", j), "found %v, allowed is more than 0", strength.Length.Of(pitch))
		}
	}
	for i := range s.Members {
		s.memberFaults(i, &faults)
	}
	for i := range s.Rows {
		row := &s.Rows[i]
		at := func(name string) string { return splicePointer("rows", i, name) }
		if row.Count < 1 {
			faults.add(at("count"), "found %d fasteners, allowed is at least 1", row.Count)
		}
		if !(row.Diameter > 0) {
			faults.add(at("diameter"), "found %v, allowed is more than 0", strength.Length.Of(row.Diameter))
		}
		if !slices.Contains(Installations(), row.Installation) {
			faults.add(at("installation"), "found %q, allowed are %s", row.Installation, strings.Join(Installations(), ", "))
		}
		if row.Compliance < 0 {
			faults.add(at("compliance"), "found %v, allowed is more than 0", strength.Compliance.Of(row.Compliance))
		}
		if row.Clearance < 0 {
			faults.add(at("clearance"), "found %v, allowed is at least 0", strength.Length.Of(row.Clearance))
		}
		if row.ShearPlanes < 1 || row.ShearPlanes > 2 {
			faults.add(at("shear_planes"), "found %d, allowed are 1 and 2", row.ShearPlanes)
		}
		if t := row.Type; t != nil && t.Diameter > 0 && (strength.Less(row.Diameter, t.Diameter) || strength.More(row.Diameter, t.Diameter)) {
			faults.add(at("diameter"), "found %v, but type %q is of %v", strength.Length.Of(row.Diameter), t.Name, strength.Length.Of(t.Diameter))
		}
		if row.Type != nil && row.Type.Thread != nil {
			faults = append(faults, row.Type.Thread.faults(at("type")+"/thread", row.Diameter)...)
		}
	}
	return faults
}

func (s *Splice) memberFaults(i int, faults *faultList) {
	m, n := &s.Members[i], len(s.Rows)
	at := func(parts ...any) string { return splicePointer(append([]any{"members", i}, parts...)...) }
	if !(m.E > 0) {
		faults.add(at("e"), "found %v, allowed is more than 0", strength.Stress.Of(m.E))
	}
	for j, bay := range m.Bays {
		if !(bay.Thickness > 0) {
			faults.add(at("bays", j, "thickness"), "found %v, allowed is more than 0", strength.Length.Of(bay.Thickness))
		}
		if !(bay.Width > 0) {
			faults.add(at("bays", j, "width"), "found %v, allowed is more than 0", strength.Length.Of(bay.Width))
		}
	}
	for j, t := range m.RowThickness {
		if !(t > 0) {
			faults.add(at("row_thickness", j), "found %v, allowed is more than 0", strength.Length.Of(t))
		}
	}
	if m.EdgeDistance < 0 {
		faults.add(at("edge_distance"), "found %v, allowed is more than 0", strength.Length.Of(m.EdgeDistance))
	}
	if m.CountersinkDepth < 0 {
		faults.add(at("countersink_depth"), "found %v, allowed is at least 0", strength.Length.Of(m.CountersinkDepth))
	}
	if m.FirstRow < 1 || m.FirstRow > n {
		faults.add(at("first_row"), "found row %d, allowed are rows 1 to %d", m.FirstRow, n)
		return
	}
	if m.LastRow < m.FirstRow || m.LastRow > n {
		faults.add(at("last_row"), "found row %d, allowed are rows %d to %d", m.LastRow, m.FirstRow, n)
		return
	}
	rows := m.LastRow - m.FirstRow + 1
	if len(m.Bays) != rows-1 {
		faults.add(at("bays"), "found %d bays, allowed is one fewer than the %d rows of the member (rows %d to %d)",
			len(m.Bays), rows, m.FirstRow, m.LastRow)
	}
	if len(m.RowThickness) != 0 && len(m.RowThickness) != rows {
		faults.add(at("row_thickness"), "found %d thicknesses, allowed is one for each of the %d rows of the member (rows %d to %d)",
			len(m.RowThickness), rows, m.FirstRow, m.LastRow)
	}
	if len(m.Bays) == rows-1 {
		s.holeFaults(i, faults)
	}
}

// holeFaults checks that the holes of a row leave something of each bay beside
// it, and countersinks something of the thickness.
func (s *Splice) holeFaults(i int, faults *faultList) {
	m := &s.Members[i]
	for j := range m.Bays {
		r := m.FirstRow - 1 + j
		holes := max(s.Rows[r].holes(), s.Rows[r+1].holes())
		if bay := &m.Bays[j]; bay.Width > 0 && strength.AtLeast(holes, bay.Width) {
			faults.add(splicePointer("members", i, "bays", j, "width"), "the holes of the row beside it, %v together, leave nothing of %v",
				strength.Length.Of(holes), strength.Length.Of(bay.Width))
		}
	}
	for j, t := range m.RowThickness {
		if t > 0 && strength.AtLeast(m.CountersinkDepth, t) {
			faults.add(splicePointer("members", i, "countersink_depth"), "%v leaves nothing of the thickness %v at row %d",
				strength.Length.Of(m.CountersinkDepth), strength.Length.Of(t), m.FirstRow+j)
			break
		}
	}
}

// holes is the sum of the diameters of a row's holes.
func (r *Row) holes() float64 { return float64(r.Count) * (r.Diameter + r.Clearance) }

// pathFaults checks that the splice is one joint.
func (s *Splice) pathFaults(k *stack) faultList {
	var faults faultList
	n := len(s.Rows)
	met := make([]bool, len(s.Members))
	for r := range n {
		nodes := k.nodes[k.rows[r]:k.rows[r+1]]
		if len(nodes) == 0 {
			faults.add(splicePointer("rows", r), "no member lies at row %d", r+1)
		}
		for _, node := range nodes {
			met[node.member] = met[node.member] || len(nodes) > 1
		}
	}
	for m, ok := range met {
		if !ok {
			faults.add(splicePointer("members", m), "the member %q has no path for its load: no other member lies at its rows %d to %d",
				s.Members[m].ID, s.Members[m].FirstRow, s.Members[m].LastRow)
		}
	}
	for j := range n - 1 {
		if k.bays[j] == k.bays[j+1] {
			faults.add("/members", "a mechanism: no member runs from row %d to row %d, so all members of rows 1 to %d move freely along the joint against those of rows %d to %d",
				j+1, j+2, j+1, j+2, n)
		}
	}
	if s.Symmetric {
		s.symmetricFaults(k, &faults)
	}
	return faults
}

// symmetricFaults checks that each row joins one middle member to one strap.
func (s *Splice) symmetricFaults(k *stack, faults *faultList) {
	isStrap, isMiddle := make([]bool, len(s.Members)), make([]bool, len(s.Members))
	for r := range s.Rows {
		nodes := k.nodes[k.rows[r]:k.rows[r+1]]
		if len(nodes) > 2 {
			faults.add("/symmetric", "row %d joins %d members; a symmetric joint is given by its middle member and one strap, in this order",
				r+1, len(nodes))
			return
		}
		if len(nodes) == 2 {
			isMiddle[nodes[0].member], isStrap[nodes[1].member] = true, true
		}
	}
	for m := range s.Members {
		if isStrap[m] && isMiddle[m] {
			faults.add("/symmetric", "the member %q is the middle one at one row and a strap at another", s.Members[m].ID)
		}
	}
}

// prepareCases resolves the members that load cases name and checks balance.
func prepareCases(s *Splice, cases []SpliceCase) ([]preparedCase, faultList) {
	var faults faultList
	index := make(map[string]int, len(s.Members))
	for m := range s.Members {
		index[s.Members[m].ID] = m
	}
	prepared := make([]preparedCase, len(cases))
	for i := range cases {
		prepared[i] = prepareCase(s, &cases[i], i, index, &faults)
	}
	return prepared, faults
}

func prepareCase(s *Splice, c *SpliceCase, i int, index map[string]int, faults *faultList) preparedCase {
	p := preparedCase{id: c.ID, level: c.Level}
	at := func(parts ...any) string { return splicePointer(append([]any{"load_cases", i}, parts...)...) }
	resolve := func(list string, j int, id string, seen []bool) (int, bool) {
		m, ok := index[id]
		switch {
		case !ok:
			faults.add(at(list, j, "member"), "there is no member %q", id)
			return 0, false
		case seen[m]:
			faults.add(at(list, j, "member"), "the member %q is named twice", id)
			return 0, false
		}
		seen[m] = true
		return m, true
	}
	sound := true
	if len(c.Ends) > 0 {
		p.left, p.right = make([]float64, len(s.Members)), make([]float64, len(s.Members))
		seen := make([]bool, len(s.Members))
		toLeft, toRight := 0.0, 0.0
		for j, end := range c.Ends {
			m, ok := resolve("ends", j, end.Member, seen)
			if !ok {
				sound = false
				continue
			}
			p.left[m], p.right[m] = end.Left, end.Right
			toLeft += end.Left
			toRight += end.Right
			p.through += (math.Abs(end.Left) + math.Abs(end.Right)) / 2
		}
		if off := toRight - toLeft; sound && math.Abs(off) > strength.Within*p.through {
			faults.add(at("ends"), "the end loads are out of balance by %v: those on right ends sum to %v, those on left ends to %v; allowed is a difference of 0",
				strength.Force.Of(off), strength.Force.Of(toRight), strength.Force.Of(toLeft))
		}
	}
	if len(c.Temperatures) > 0 {
		p.change = make([]float64, len(s.Members))
		seen := make([]bool, len(s.Members))
		for j, t := range c.Temperatures {
			if m, ok := resolve("temperatures", j, t.Member, seen); ok {
				p.change[m] = t.Change
			}
		}
	}
	return p
}

package fastener

import "jointledger/strength"

// plasticSharing shares what passes between each two members among their rows
// in proportion to the rows' strength. It exists where the end loads alone
// decide what passes: where no two members meet by more than one way, so that
// taking off one member after another that meets only one other leaves none.
//
// Common practice for ductile joints at ultimate, no source; a bound beside the
// elastic sharing.
type plasticSharing struct {
	weight   []float64 // of each interface within its pair of members
	peel     []peel
	net      []float64 // what is left to pass out of each member
	between  []float64 // what passes between each pair
	load     []float64 // of each interface
	byArea   bool      // weights are n D², for want of a strength somewhere
	interior []int     // pair of each interface
}

// peel takes off a member that meets only one other.
type peel struct{ leaf, other, pair int }

func newPlastic(k *stack, s *Splice) *plasticSharing {
	q := &plasticSharing{
		weight: make([]float64, k.interfaces()), load: make([]float64, k.interfaces()),
		net: make([]float64, len(s.Members)), between: make([]float64, len(k.pairs)), interior: k.pair,
	}
	if q.peel = peelTree(k.pairs, len(s.Members)); q.peel == nil {
		return nil
	}
	strengths := make([]float64, len(s.Rows))
	for r := range s.Rows {
		if t := s.Rows[r].Type; t != nil {
			strengths[r] = s.rowShear(r).value
		}
		q.byArea = q.byArea || strengths[r] == 0
	}
	sums := make([]float64, len(k.pairs))
	for x, node := range k.nodes {
		if !k.inner(x) {
			continue
		}
		i, row := x-node.row, &s.Rows[node.row]
		q.weight[i] = strengths[node.row]
		if q.byArea {
			q.weight[i] = float64(float64(row.Count) * row.Diameter * row.Diameter)
		}
		sums[k.pair[i]] += float64(q.weight[i])
	}
	for i := range q.weight {
		q.weight[i] /= sums[k.pair[i]]
	}
	return q
}

// peelTree orders the members so that each meets only one of those after it; it
// returns nil where there is no such order.
func peelTree(pairs [][2]int, members int) []peel {
	meets := make([]int, members)
	for _, pair := range pairs {
		meets[pair[0]]++
		meets[pair[1]]++
	}
	var order []peel
	gone := make([]bool, len(pairs))
	for found := true; found; {
		found = false
		for k, pair := range pairs {
			leaf, other := pair[0], pair[1]
			if meets[leaf] != 1 {
				leaf, other = other, leaf
			}
			if gone[k] || meets[leaf] != 1 {
				continue
			}
			gone[k], found = true, true
			meets[leaf]--
			meets[other]--
			order = append(order, peel{leaf, other, k})
		}
	}
	if len(order) < len(pairs) || len(order) == 0 {
		return nil
	}
	return order
}

// share fills the loads for a load case. Changes of temperature leave them
// alone: yielding relieves what they cause.
func (q *plasticSharing) share(k *stack, c *preparedCase) {
	clear(q.net)
	for m := range q.net {
		if c.left != nil {
			q.net[m] = c.left[m] - c.right[m]
		}
	}
	for _, p := range q.peel {
		passes := q.net[p.leaf]
		q.net[p.other] += passes
		if k.pairs[p.pair][0] != p.leaf {
			passes = -passes
		}
		q.between[p.pair] = passes
	}
	for i, weight := range q.weight {
		q.load[i] = q.between[q.interior[i]] * weight
	}
}

// PlasticLoads fills out, one for each interface in the order of Transfers, with
// the loads of load case i when every row yields: what passes between two
// members is shared in proportion to the rows' strength, or to n D² where a row
// has no type. It returns false where the end loads alone do not decide what
// passes between each two members.
func (p *PreparedSplice) PlasticLoads(i int, out []float64) bool {
	if p.plastic == nil {
		return false
	}
	p.enter(i)
	copy(out, p.plastic.load)
	return true
}

// plasticFinding says what the compared checks are.
func (p *PreparedSplice) plasticFinding() []strength.Finding {
	if p.plastic == nil {
		return nil
	}
	weights := "strengths"
	if p.plastic.byArea {
		weights = "fasteners times squared diameters"
	}
	return []strength.Finding{{
		Severity: strength.Note, Code: "plastic-sharing", Subject: "rows", Source: sourcePlastic,
		Message: strength.Say("fully plastic sharing, in proportion to the rows' %s, is a bound at ultimate for ductile joints by common practice; the elastic shares are for limit load and fatigue", weights),
	}}
}

package fastener

// stack is the topology of a splice as its equations see it. Rows, members and
// bays count from 0 here; bay j lies between rows j and j+1.
//
// The unknowns are loads: in each bay with m members the sums of the loads of
// the first 1, 2, … m-1 of them in stacking order (the sum of all m is known
// from the end loads). Equilibrium then holds by construction, for fasteners of
// any compliance, and least work gives one symmetric positive definite system
// whose half bandwidth is at most the number of members.
type stack struct {
	rows     []int // nodes before each row, and all of them
	bays     []int // spans before each bay, and all of them
	nodes    []stackNode
	spans    []stackSpan
	unknowns int
	// band is the half bandwidth.
	band int
	// pairs lists which two members are joined anywhere, and pair gives each
	// interface's place in it.
	pair  []int
	pairs [][2]int
	// strap tells the straps of a symmetric joint, which count twice.
	strap []bool
}

// stackNode is a member at a row. Below it, but for the last of a row, lies an
// interface, number node - row.
type stackNode struct {
	member, row         int
	first, last         bool // row of its member
	left, right         term // sum of the loads of this member and those above it, either side of the row
	leftSpan, rightSpan int  // of this member, where there is one
}

// stackSpan is a member in a bay.
type stackSpan struct {
	member, bay  int
	above, below term // sums of the loads above it, and with its own
}

// term is a sum of member loads in a bay.
type term int

// Terms below zero are known: none of the bay's members, or all of them.
const (
	sumNone term = -1
	sumAll  term = -2
)

// newStack lays a splice out; its members' rows must be sound.
func newStack(s *Splice) *stack {
	k := &stack{}
	n := len(s.Rows)
	present := membersByRow(s)
	k.bays = append(k.bays, 0)
	for j := range n - 1 {
		above := sumNone
		for _, m := range present[j] {
			if s.Members[m].LastRow-1 == j {
				continue
			}
			below := term(k.unknowns)
			k.unknowns++
			k.spans = append(k.spans, stackSpan{member: m, bay: j, above: above, below: below})
			above = below
		}
		if last := len(k.spans) - 1; last >= k.bays[j] {
			k.spans[last].below = sumAll
			k.unknowns--
		}
		k.bays = append(k.bays, len(k.spans))
	}
	k.rows = append(k.rows, 0)
	for r, members := range present {
		left, right := sumNone, sumNone
		leftSpan, rightSpan := 0, 0
		if r > 0 {
			leftSpan = k.bays[r-1]
		}
		if r < n-1 {
			rightSpan = k.bays[r]
		}
		for _, m := range members {
			node := stackNode{member: m, row: r, first: s.Members[m].FirstRow-1 == r, last: s.Members[m].LastRow-1 == r}
			if !node.first {
				left, node.leftSpan = k.spans[leftSpan].below, leftSpan
				leftSpan++
			}
			if !node.last {
				right, node.rightSpan = k.spans[rightSpan].below, rightSpan
				rightSpan++
			}
			node.left, node.right = left, right
			k.nodes = append(k.nodes, node)
		}
		k.rows = append(k.rows, len(k.nodes))
	}
	numbers := map[[2]int]int{}
	k.strap = make([]bool, len(s.Members))
	for x, node := range k.nodes {
		k.couple(node.left, node.right)
		if !k.inner(x) {
			continue
		}
		below := k.nodes[x+1].member
		members := [2]int{node.member, below}
		number, ok := numbers[members]
		if !ok {
			number = len(k.pairs)
			numbers[members] = number
			k.pairs = append(k.pairs, members)
		}
		k.pair = append(k.pair, number)
		k.strap[below] = s.Symmetric
	}
	for _, span := range k.spans {
		k.couple(span.above, span.below)
	}
	return k
}

func (k *stack) couple(a, b term) {
	if a >= 0 && b >= 0 {
		k.band = max(k.band, int(max(a, b)-min(a, b)))
	}
}

// membersByRow lists the members at each row in stacking order.
func membersByRow(s *Splice) [][]int {
	present := make([][]int, len(s.Rows))
	for m := range s.Members {
		for r := s.Members[m].FirstRow - 1; r < s.Members[m].LastRow; r++ {
			present[r] = append(present[r], m)
		}
	}
	return present
}

// interfaces is the number of interfaces.
func (k *stack) interfaces() int { return len(k.nodes) - (len(k.rows) - 1) }

// inner reports whether an interface lies below node x.
func (k *stack) inner(x int) bool { return x+1 < k.rows[k.nodes[x].row+1] }

// bay returns the bay of a member right of row r.
func (m *Member) bay(r int) Bay { return m.Bays[r-(m.FirstRow-1)] }

// layers is 2 for a strap of a symmetric joint, which counts twice, else 1.
func (k *stack) layers(member int) float64 {
	if k.strap[member] {
		return 2
	}
	return 1
}

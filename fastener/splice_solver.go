package fastener

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"

	"jointledger/strength"
)

// solver holds the factored equations of a splice with one set of compliances,
// and the solution of the last case. Its least work reads
//
//	½ Σ f N² + ½ Σ c R² + Σ N e -> least,  f = p/(w t E),  c = C/count,  e = α ΔT p
//
// over the bays' loads N and the interfaces' loads R, both linear in the
// unknown sums of the stack.
type solver struct {
	why   strength.Message // there is no compliance, hence no sharing
	stack *stack

	flexibility []float64 // f of each span, mm/N
	compliance  []float64 // c of each interface of all fasteners of the row, mm/N
	stretch     []float64 // α p of each span, mm per degree
	diagonal    []float64 // of the system factored last

	factor   blas64.TriangularBand // Cholesky
	unknown  []float64
	misfit   []float64 // of compatibility, an element each unknown
	total    []float64 // load of all members in each bay
	load     []float64 // N of each span
	transfer []float64 // R of each interface
	taken    []float64 // clearance taken up at each interface, signed as R, mm
	residual float64
	contact  *contact  // nil without clearance
	net      []float64 // by pair of members, while shares are made
}

// prepare factors the equations; compliance is of one fastener, an interface.
func (v *solver) prepare(k *stack, s *Splice, compliance []float64) (faults faultList) {
	v.stack = k
	v.flexibility = make([]float64, len(k.spans))
	v.stretch = make([]float64, len(k.spans))
	for i, span := range k.spans {
		m := &s.Members[span.member]
		bay := m.bay(span.bay)
		v.flexibility[i] = s.Pitches[span.bay] / (bay.Width * k.layers(span.member) * bay.Thickness * m.E)
		v.stretch[i] = m.Expansion * s.Pitches[span.bay]
	}
	v.compliance = make([]float64, k.interfaces())
	for x, node := range k.nodes {
		if k.inner(x) {
			v.compliance[x-node.row] = compliance[x-node.row] / float64(s.Rows[node.row].Count)
		}
	}
	v.total = make([]float64, len(s.Pitches))
	v.load = make([]float64, len(k.spans))
	v.transfer = make([]float64, k.interfaces())
	v.taken = make([]float64, k.interfaces())
	v.net = make([]float64, len(k.pairs))
	v.contact = newContact(k, s)
	if k.unknowns == 0 {
		return nil
	}
	v.unknown = make([]float64, k.unknowns)
	v.misfit = make([]float64, k.unknowns)
	v.diagonal = make([]float64, k.unknowns)
	v.factor.Data = make([]float64, k.unknowns*(k.band+1))
	if !v.factorInto(&v.factor, v.compliance) {
		faults.add("/rows", "the compliances of the rows and the flexibilities of the bays differ by so much that their equations cannot be solved in double precision")
	}
	return faults
}

// factorInto factors the system with the given compliances of the interfaces,
// in the memory of factor. It calls the factorisation of mat.BandCholesky
// directly, since that type also estimates a condition number, in a time that
// grows with the square of the rows.
func (v *solver) factorInto(factor *blas64.TriangularBand, compliance []float64) (ok bool) {
	k := v.stack
	width := k.band + 1
	data := factor.Data
	clear(data)
	spring := func(a, b term, c float64) {
		if a == b {
			return
		}
		if a >= 0 {
			data[int(a)*width] += c
		}
		if b >= 0 {
			data[int(b)*width] += c
		}
		if a >= 0 && b >= 0 {
			data[int(min(a, b))*width+int(max(a, b)-min(a, b))] -= c
		}
	}
	for x, node := range k.nodes {
		if k.inner(x) {
			spring(node.left, node.right, compliance[x-node.row])
		}
	}
	for i, span := range k.spans {
		spring(span.above, span.below, v.flexibility[i])
	}
	for i := range v.diagonal {
		v.diagonal[i] = data[i*width]
		if !(v.diagonal[i] > 0) || math.IsInf(v.diagonal[i], 0) {
			return false
		}
	}
	*factor, ok = lapack64.Pbtrf(blas64.SymmetricBand{Uplo: blas.Upper, N: k.unknowns, K: k.band, Stride: width, Data: data})
	return ok
}

// backSolve solves the factored system in place.
func backSolve(factor blas64.TriangularBand, b []float64) {
	lapack64.Pbtrs(factor, blas64.General{Rows: len(b), Cols: 1, Stride: 1, Data: b})
}

// solve finds the loads of case c. It allocates nothing.
func (v *solver) solve(c *preparedCase) {
	v.sumEnds(c)
	clear(v.unknown)
	clear(v.taken)
	v.spread(c)
	if len(v.unknown) > 0 {
		v.gradient(v.unknown, c)
		for i := range v.unknown {
			v.unknown[i] = -v.unknown[i]
		}
		backSolve(v.factor, v.unknown)
		v.spread(c)
	}
	switch {
	case v.contact == nil:
	case len(v.unknown) == 0:
		v.determinate()
	default:
		v.settle(c)
	}
	v.findResidual(c)
}

// sumEnds finds the load of all members together in each bay.
func (v *solver) sumEnds(c *preparedCase) {
	clear(v.total)
	if c.left == nil {
		return
	}
	sum := 0.0
	for x, node := range v.stack.nodes {
		if node.first {
			sum += c.left[node.member]
		}
		if node.last {
			sum -= c.right[node.member]
		}
		if !v.stack.inner(x) && node.row < len(v.total) {
			v.total[node.row] = sum
		}
	}
}

// value is the sum of loads that a term of a bay stands for.
func (v *solver) value(t term, bay int) float64 {
	switch t {
	case sumNone:
		return 0
	case sumAll:
		return v.total[bay]
	}
	return v.unknown[t]
}

// spread turns the unknown sums into the loads of spans and interfaces.
func (v *solver) spread(c *preparedCase) {
	k := v.stack
	for i, span := range k.spans {
		v.load[i] = v.value(span.below, span.bay) - v.value(span.above, span.bay)
	}
	ends := 0.0
	for x, node := range k.nodes {
		if c.left != nil && node.first {
			ends += c.left[node.member]
		}
		if c.left != nil && node.last {
			ends -= c.right[node.member]
		}
		if !k.inner(x) {
			ends = 0
			continue
		}
		v.transfer[x-node.row] = v.value(node.left, node.row-1) - v.value(node.right, node.row) + ends
	}
}

// gradient adds to out, an element each unknown, how far compatibility of the
// present loads is missed, mm.
func (v *solver) gradient(out []float64, c *preparedCase) {
	k := v.stack
	clear(out)
	add := func(a, b term, gap float64) {
		if a == b {
			return
		}
		if a >= 0 {
			out[a] += gap
		}
		if b >= 0 {
			out[b] -= gap
		}
	}
	for x, node := range k.nodes {
		if k.inner(x) {
			i := x - node.row
			add(node.left, node.right, float64(v.compliance[i]*v.transfer[i])+v.taken[i])
		}
	}
	for i, span := range k.spans {
		add(span.below, span.above, v.elongation(i, c))
	}
}

// elongation of a span under the present loads, mm.
func (v *solver) elongation(i int, c *preparedCase) float64 {
	elongation := float64(v.flexibility[i] * v.load[i])
	if c.change != nil {
		elongation += float64(v.stretch[i] * c.change[v.stack.spans[i].member])
	}
	return elongation
}

// findResidual finds the largest error of equilibrium at a member and row, or of
// compatibility over the diagonal of its equation, both in N.
func (v *solver) findResidual(c *preparedCase) {
	k := v.stack
	v.residual = 0
	intoNext := 0.0 // from the interface above
	for x, node := range k.nodes {
		left, right := v.sides(x, c)
		error := left - right + intoNext
		if intoNext = 0; k.inner(x) {
			intoNext = v.transfer[x-node.row]
			error -= intoNext
		}
		v.residual = max(v.residual, math.Abs(error))
	}
	v.gradient(v.misfit, c)
	for i, gap := range v.misfit {
		v.residual = max(v.residual, math.Abs(gap)/v.diagonal[i])
	}
}

// sides returns a member's load on both sides of a row, the end loads among them.
func (v *solver) sides(x int, c *preparedCase) (left, right float64) {
	node := &v.stack.nodes[x]
	switch {
	case !node.first:
		left = v.load[node.leftSpan]
	case c.left != nil:
		left = c.left[node.member]
	}
	switch {
	case !node.last:
		right = v.load[node.rightSpan]
	case c.right != nil:
		right = c.right[node.member]
	}
	return left, right
}

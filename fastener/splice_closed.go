package fastener

import (
	"math"

	"jointledger/strength"
)

// uniformShares fills shares, one a row, with the closed form of a lap of n
// equal rows between members of flexibility f1 and f2 in every bay, the load
// passing from the first member's left end to the second's right end. With S_i
// the sum of the first i rows' shares,
//
//	S_i+1 - (2 + (f1+f2)/C) S_i + S_i-1 = -f1/C,  S_0 = 0, S_n = 1
//	S_i = S + ((1 - S) sinh(iθ) - S sinh((n-i)θ))/sinh(nθ),  S = f1/(f1+f2)
//	cosh θ = 1 + (f1+f2)/(2C)
//
// Derived. The hyperbolic sines are written in falling exponentials, so that
// none overflows.
func uniformShares(f1, f2, c float64, shares []float64) (theta float64) {
	n := float64(len(shares))
	// cosh θ - 1 = 2 sinh²(θ/2), which keeps small θ exact.
	theta = 2 * math.Asinh(math.Sqrt((f1+f2)/(4*c)))
	far := f1 / (f1 + f2)
	ratio := func(i float64) float64 { // sinh(iθ)/sinh(nθ)
		return math.Exp((i-n)*theta) * math.Expm1(-2*i*theta) / math.Expm1(-2*n*theta)
	}
	before := 0.0
	for i := range shares {
		at := float64(i + 1)
		sum := far + float64((1-far)*ratio(at)) - float64(far*ratio(n-at))
		shares[i] = sum - before
		before = sum
	}
	return theta
}

const (
	// From (f1 + f2)/C so far, or n² times so far, on a limit describes the
	// joint within about 1 % of the load.
	nearlyRigid = 1e4
	nearlySoft  = 1e-2
)

// closedForms tells when a lap of two members is one whose sharing is known in
// closed form, and how near the solution comes.
func (p *PreparedSplice) closedForms() []strength.Finding {
	s, k, v := &p.splice, p.stack, &p.main
	n := len(s.Rows)
	if !v.why.Empty() || v.contact != nil || len(s.Members) != 2 || n < 2 || len(k.spans) != 2*(n-1) {
		return nil
	}
	f1, f2, c := make([]float64, n-1), make([]float64, n-1), v.compliance
	for j := range n - 1 {
		f1[j], f2[j] = v.flexibility[2*j], v.flexibility[2*j+1]
	}
	equal := func(values []float64) bool {
		for _, x := range values {
			if !strength.AtMost(x, values[0]) || !strength.AtLeast(x, values[0]) {
				return false
			}
		}
		return true
	}
	if !equal(c) {
		return nil
	}
	unit := preparedCase{left: []float64{1, 0}, right: []float64{0, 1}, through: 1}
	v.solve(&unit)
	p.solved = -1
	off := func(closed []float64) (most float64) {
		for i, share := range closed {
			most = max(most, math.Abs(v.transfer[i]-share))
		}
		return most
	}
	var findings []strength.Finding
	say := func(m strength.Message) {
		findings = append(findings, strength.Finding{Severity: strength.Note, Code: "closed-form", Subject: "rows", Message: m, Source: sourceTransfer})
	}
	shares := make([]float64, n)
	if scarfed(f1, f2) {
		for i := range shares {
			shares[i] = 1 / float64(n)
		}
		if n == 2 {
			say(strength.Say("two equal rows between bays of equal flexibility share a load that passes from end to end 50/50; the solution is within %.1g of it", off(shares)))
			return findings
		}
		say(strength.Say("the steps are scarfed, each member's thickness in proportion to its load: each of the %d rows takes 1/%d of a load that passes from end to end; the solution is within %.1g of it", n, n, off(shares)))
	}
	if !equal(f1) || !equal(f2) {
		return findings
	}
	theta := uniformShares(f1[0], f2[0], c[0], shares)
	say(strength.Say("the joint is uniform: in closed form, cosh θ = 1 + (f_1 + f_2)/(2 C), θ = %.6g, the first row takes %.6g and the last %.6g of a load that passes from end to end; the solution is within %.1g of it in every row",
		theta, shares[0], shares[n-1], off(shares)))
	switch ratio := (f1[0] + f2[0]) / c[0]; {
	case ratio >= nearlyRigid:
		clear(shares)
		shares[0] += f1[0] / (f1[0] + f2[0])
		shares[n-1] += f2[0] / (f1[0] + f2[0])
		say(strength.Say("the fasteners are nearly rigid, (f_1 + f_2)/C = %.3g: in the limit the first row takes f_1/(f_1 + f_2) = %.6g, the last the rest and those between nothing; the solution is within %.1g of it", ratio, shares[0], off(shares)))
	case ratio*float64(n*n) <= nearlySoft:
		for i := range shares {
			shares[i] = 1 / float64(n)
		}
		say(strength.Say("the fasteners are soft, n² (f_1 + f_2)/C = %.3g: in the limit each of the %d rows takes 1/%d; the solution is within %.1g of it", ratio*float64(n*n), n, n, off(shares)))
	}
	return findings
}

// scarfed reports whether f_1 (P - S) = f_2 S in every bay with equal shares.
func scarfed(f1, f2 []float64) bool {
	n := len(f1) + 1
	for j := range f1 {
		left, right := float64(n-1-j)*f1[j], float64(j+1)*f2[j]
		if !strength.AtMost(left, right) || !strength.AtLeast(left, right) {
			return false
		}
	}
	return true
}

package lug

import (
	"math"

	"jointledger/strength"
)

// The body carries the load away behind the head. Its support is outside the
// calculation; what the head does to it is not.

var (
	eqTang        = Equation{Symbol: "P_t", Text: "F_tu wT t", Unit: strength.Force, Source: "statics: tension of the body behind the head", Mark: strength.Derived}
	eqTangOffset  = Equation{Symbol: "P_t", Text: "F_tu wT t / (1 + 6 |o| / wT)", Unit: strength.Force, Source: "statics: tension of the body with the bending of an offset hole", Mark: strength.Derived}
	eqBodyBending = Equation{Symbol: "M_b", Text: "F_tu wT^2 t / 6", Unit: strength.Moment, Source: "statics: elastic bending of the body at its support", Mark: strength.Derived}
	eqCos         = Equation{Symbol: "cosα", Text: "cos(α)", Unit: strength.None, Source: "direction of the load", Mark: strength.Given}
	eqSin         = Equation{Symbol: "sinα", Text: "sin(α)", Unit: strength.None, Source: "direction of the load", Mark: strength.Given}
)

var bodyEquations = []*Equation{&eqTang, &eqTangOffset, &eqBodyBending}

// bodyWidth is the width of the body behind the head, in mm.
func (p *part) bodyWidth(s *sheet) float64 {
	if p.head.BodyWidth == 0 {
		return s.input(p.member, "wT", p.head.Width, strength.Length, p.first+fieldWidth)
	}
	return s.input(p.member, "wT", p.head.BodyWidth, strength.Length, p.first+fieldBodyWidth)
}

// body adds the checks of the body behind a head: its tension where an offset
// hole bends it or its width is its own, and its bending by a transverse load
// where the support is given.
func (b *builder) body(p *part) {
	if p.bends() || p.head.BodyWidth != 0 {
		b.tangCheck(p)
	}
	b.bodyBendingCheck(p)
}

// tangCheck adds the tension of the body at ultimate.
func (b *builder) tangCheck(p *part) {
	e := &eqTang
	if p.bends() {
		e = &eqTangOffset
	}
	b.check(p.member, strength.Tang, strength.Ultimate, strength.Force, strength.ByRegulation, e, func(s *sheet) law {
		capacity := p.tang(s)
		if p.doubleLeg {
			p.legShare(s)
		}
		return p.pulled(capacity)
	})
}

// bodyBendingCheck adds the bending of the body at ultimate.
func (b *builder) bodyBendingCheck(p *part) {
	if p.head.BodyLength == 0 {
		return
	}
	b.check(p.member, strength.BodyBending, strength.Ultimate, strength.Force, strength.ByRegulation, &eqBodyBending, p.bodyBending)
}

// bends reports whether an offset hole bends the body, or may within its
// tolerance.
func (p *part) bends() bool {
	return (p.head.Offset != 0 || p.varies.has(p.first+fieldOffset)) && !p.head.BodyRestrained
}

// tang is the tension that the body bears with the bending of an offset hole,
// in N on the head.
func (p *part) tang(s *sheet) float64 {
	ftu, wt, t := p.property(s, strength.Ftu), p.bodyWidth(s), p.thickness(s)
	if p.head.Offset != 0 {
		s.read.add(p.first + fieldRestrained)
	}
	if !p.bends() {
		return s.apply(&eqTang, ftu*wt*t)
	}
	return s.apply(&eqTangOffset, ftu*wt*t/(1+6*p.offset(s)/wt))
}

// pulled sets the axial part of a pull against a capacity of the head P_t.
func (p *part) pulled(capacity float64) law {
	share := p.share
	return law{
		sides: pull,
		margin: func(l *load, factor float64) strength.Margin {
			return strength.Compare(factor*l.Force, capacity/(share*l.cos))
		},
		trace: func(s *sheet, l *load) {
			s.apply(&eqCos, l.cos)
			s.allow("P_t / ("+p.shareSymbol()+"cosα)", capacity/(share*l.cos))
		},
	}
}

// bodyBending is the body as a cantilever under the transverse part of a load:
// P sin α · body_length <= F_tu wT² t / 6.
func (p *part) bodyBending(s *sheet) law {
	ftu, wt, t := p.property(s, strength.Ftu), p.bodyWidth(s), p.thickness(s)
	arm := s.input(p.member, "l_b", p.head.BodyLength, strength.Length, p.first+fieldBodyLength)
	moment := s.apply(&eqBodyBending, ftu*wt*wt*t/6)
	share := p.share
	if p.doubleLeg {
		p.legShare(s)
	}
	allowable := func(l *load) float64 { return moment / (share * arm * math.Abs(l.sin)) }
	return law{
		sides: transverse,
		margin: func(l *load, factor float64) strength.Margin {
			return strength.Compare(factor*l.Force, allowable(l))
		},
		trace: func(s *sheet, l *load) {
			s.apply(&eqSin, l.sin)
			s.allow("M_b / ("+p.shareSymbol()+"l_b |sinα|)", allowable(l))
		},
	}
}

// shareSymbol stands before what one leg of a clevis takes of the load.
func (p *part) shareSymbol() string {
	if p.doubleLeg {
		return "λ "
	}
	return ""
}

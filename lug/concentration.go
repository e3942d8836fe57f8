package lug

import (
	"math"

	"jointledger/strength"
)

// Elastic stress concentration of the loaded hole, for whoever does fatigue: no
// check rests on it.

const (
	clearanceNote = "; a close-fitting pin, clearance raises it by 35 to 50 %"
	pinHoleSource = "R. E. Pilkey, Stress Concentration Factors, pin-loaded hole after Frocht and Hill 1940, 0.15 <= D/W <= 0.75" + clearanceNote
	roundSource   = "fit for a round end, within 7 % on the high side, W/D from 2 to 5" + clearanceNote
)

var (
	eqKtWide  = Equation{Symbol: "K_tn", Text: "12.882 - 52.714 (D/W) + 89.762 (D/W)^2 - 51.667 (D/W)^3", Unit: strength.None, Source: pinHoleSource, Mark: strength.FromMemory(90)}
	eqKtRound = Equation{Symbol: "K_tn", Text: "0.85 + 0.95 / (D/W)", Unit: strength.None, Source: roundSource, Mark: strength.FromMemory(60)}
	eqKtBear  = Equation{Symbol: "K_tb", Text: "K_tn D t / A_net", Unit: strength.None, Source: "the same stress over the bearing stress P/(D t)", Mark: strength.Derived}
)

// StressConcentration returns, for each head, the elastic stress concentration
// factor of its hole under an axial pull, on the net section (K_tn: the largest
// stress over P/A_net) and on the bearing area (K_tb: over P/(D t)). Outside
// the range of the fit there is none, and a finding says so.
func (p *Prepared) StressConcentration() []strength.Working {
	const most = 12 // steps of a head
	all := make([]strength.Working, 0, most*len(p.heads()))
	for _, part := range p.heads() {
		s := &sheet{record: &record{heading: strength.Working{Member: part.member}, lines: all, others: len(all)}}
		if part.concentration(s) {
			all = s.record.lines
		}
	}
	return all
}

// concentration writes K_tn and K_tb, unless the head is out of range.
func (p *part) concentration(s *sheet) bool {
	width := s.apply(&eqSideRatio, p.hole(s)/(2*p.side(s)))
	least, most := 0.15, 0.75
	if p.head.Shape == Round {
		least, most = 1.0/5, 1.0/2
	}
	if strength.Less(width, least) || strength.More(width, most) {
		s.find(strength.Note, "stress-concentration", p.member, clearanceNote[2:],
			"no elastic stress concentration is given: D/W of %.4g is outside %.4g to %.4g", width, least, most)
		return false
	}
	var k float64
	if p.head.Shape == Round {
		k = s.apply(&eqKtRound, 0.85+0.95/width)
	} else {
		k = s.apply(&eqKtWide, 12.882-float64(52.714*width)+float64(89.762*width*width)-float64(51.667*math.Pow(width, 3)))
	}
	s.apply(&eqKtBear, k*p.hole(s)*p.thickness(s)/p.netArea(s))
	return true
}

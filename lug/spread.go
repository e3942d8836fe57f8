package lug

import (
	"slices"

	"jointledger/strength"
)

// widely is how far the reserves of two methods for the same mode must lie
// apart to be told: derived, the usual scatter of hand methods is below it.
const widely = 1.25

// findSpread tells of each mode of a member to which methods give reserves that
// differ widely, each method by its least reserve in any load case.
func (p *Prepared) findSpread(f *findings) {
	least := make([]float64, len(p.checks)) // reserve, margin + 1; 0: none
	out := make([]strength.Margin, len(p.checks))
	for i := range p.loads {
		p.Margins(i, out)
		for c, m := range out {
			if reserve := m.Margin + 1; (m.Status == strength.Adequate || m.Status == strength.Inadequate) && (least[c] == 0 || reserve < least[c]) {
				least[c] = reserve
			}
		}
	}
	done := make([]bool, len(p.checks))
	for c := range p.checks {
		if done[c] {
			continue
		}
		// The least and the most of the methods' reserves for this mode.
		var low, high int
		var reserve []float64
		var methods []string
		for d := c; d < len(p.checks); d++ {
			if p.checks[d].Member != p.checks[c].Member || p.checks[d].Mode != p.checks[c].Mode || least[d] == 0 {
				continue
			}
			done[d] = true
			if i := slices.Index(methods, p.checks[d].Method); i >= 0 {
				reserve[i] = min(reserve[i], least[d])
				continue
			}
			methods, reserve = append(methods, p.checks[d].Method), append(reserve, least[d])
		}
		for i, r := range reserve {
			if r < reserve[low] {
				low = i
			}
			if r > reserve[high] {
				high = i
			}
		}
		if len(reserve) > 1 && reserve[high] > widely*reserve[low] {
			f.add(strength.Note, "method-spread", p.checks[c].Member+" "+p.checks[c].Mode.String(), "",
				"%s: the least margins of the methods lie apart, from %.4g by %s to %.4g by %s",
				p.checks[c].Mode, reserve[low]-1, methods[low], reserve[high]-1, methods[high])
		}
	}
}

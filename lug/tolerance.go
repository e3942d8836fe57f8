package lug

import (
	"strconv"
	"strings"

	"jointledger/strength"
)

// MostTolerances is how many lengths of a joint may have tolerances at once.
const MostTolerances = 6

// Tolerance is a length of a joint with its limits.
type Tolerance struct {
	Pointer     string // of the length in a lug request, which LengthAt knows
	Nominal     float64
	Minus, Plus float64 // mm, not negative
	// Set puts a value into a joint.
	Set func(*Joint, float64)
}

// Toleranced is a joint whose lengths have tolerances. It implements
// strength.Calculation: each margin is that of the corner of limits that is
// worst for its check and load case, the nominal lengths among them.
type Toleranced struct {
	nominal    *Prepared
	corners    []corner
	tolerances []Tolerance
	checks     []strength.Check
	out        []strength.Margin
	cases      []LoadCase
}

// corner is the joint with every length at one of its limits.
type corner struct {
	*Prepared
	upper uint // bit k: the k-th length is at its upper limit
	// index is, for each check of the nominal joint, that of the corner's same
	// check, -1 where a corner has none.
	index []int
}

var _ strength.Calculation = (*Toleranced)(nil)

// PrepareToleranced settles a joint at its nominal lengths and at every corner
// of their limits, at most 2^MostTolerances. Faults of a corner say which one.
func PrepareToleranced(j Joint, lengths []Tolerance, choices []Choice, f strength.Factors, cases []LoadCase) (*Toleranced, []strength.Fault) {
	var wrong faults
	if len(lengths) > MostTolerances {
		wrong.add("", "%d lengths have tolerances and at most %d may", len(lengths), MostTolerances)
		return nil, wrong
	}
	for _, l := range lengths {
		if l.Minus < 0 {
			wrong.add(l.Pointer+"/minus", "the tolerance is %v and must not be below zero", mm(l.Minus))
		}
		if l.Nominal > 0 && l.Minus >= l.Nominal && !strings.HasSuffix(l.Pointer, "/offset") {
			wrong.add(l.Pointer+"/minus", "the tolerance %v leaves nothing of the length, %v", mm(l.Minus), mm(l.Nominal))
		}
		if l.Plus < 0 {
			wrong.add(l.Pointer+"/plus", "the tolerance is %v and must not be below zero", mm(l.Plus))
		}
	}
	t := &Toleranced{tolerances: lengths, cases: cases}
	var varies fieldSet
	for _, l := range lengths {
		varies |= fieldAt(l.Pointer)
	}
	at := func(upper uint) (*Prepared, []strength.Fault) {
		own := j.Clone()
		own.varies = varies
		for k, l := range lengths {
			l.Set(&own, l.at(upper, k))
		}
		return Prepare(own, choices, f, cases)
	}
	p, found := at(nominalCorner)
	wrong = append(wrong, found...)
	if len(wrong) > 0 {
		return nil, wrong
	}
	t.nominal = p
	t.checks = append(t.checks, p.checks...)
	for upper := range uint(1) << len(lengths) {
		p, found := at(upper)
		for _, f := range found {
			wrong.add(f.Pointer, "%v (%v)", f.Message, t.describe(upper))
		}
		if len(found) > 0 {
			return nil, wrong
		}
		t.add(corner{Prepared: p, upper: upper})
	}
	t.add(corner{Prepared: t.nominal, upper: nominalCorner})
	return t, nil
}

// nominalCorner stands for all lengths at their nominal values, which is tried
// too: a margin need not be worst at a limit.
const nominalCorner = ^uint(0)

// at is the length's value at a corner, as the k-th of the lengths.
func (l *Tolerance) at(upper uint, k int) float64 {
	switch {
	case upper == nominalCorner:
		return l.Nominal
	case upper&(1<<k) != 0:
		return l.Nominal + l.Plus
	}
	return l.Nominal - l.Minus
}

// add lines the checks of a corner up with those of the nominal joint.
func (t *Toleranced) add(c corner) {
	next := 0
	c.index = make([]int, len(t.checks))
	for i := range t.checks {
		c.index[i] = -1
		for k := next; k < len(c.checks); k++ {
			if same(&t.checks[i], &c.checks[k]) {
				c.index[i], next = k, k+1
				t.checks[i].Mark = strength.Weakest(t.checks[i].Mark, c.checks[k].Mark)
				break
			}
		}
	}
	if n := len(c.checks); n > len(t.out) {
		t.out = make([]strength.Margin, n)
	}
	t.corners = append(t.corners, c)
}

func same(a, b *strength.Check) bool {
	return a.Member == b.Member && a.Method == b.Method && a.Mode == b.Mode && a.Level == b.Level && a.Source == b.Source
}

// Checks returns the checks of the nominal joint.
func (t *Toleranced) Checks() []strength.Check { return t.checks }

// Margins fills out with the worst corner of each check for load case i.
func (t *Toleranced) Margins(i int, out []strength.Margin) {
	for k := range t.checks {
		out[k] = strength.Margin{}
	}
	for c := range t.corners {
		corner := &t.corners[c]
		own := t.out[:len(corner.checks)]
		corner.Margins(i, own)
		for k, at := range corner.index {
			if at >= 0 && worse(own[at], out[k]) {
				out[k] = own[at]
			}
		}
	}
}

// NominalMargins fills out with the margins of the nominal joint.
func (t *Toleranced) NominalMargins(i int, out []strength.Margin) { t.nominal.Margins(i, out) }

// Nominal is the calculation of the nominal joint.
func (t *Toleranced) Nominal() *Prepared { return t.nominal }

// worst is the corner whose margin check k takes in load case i; -1: none.
func (t *Toleranced) worst(i, k int) int {
	var worst strength.Margin
	at := -1
	for c := range t.corners {
		corner := &t.corners[c]
		if corner.index[k] < 0 {
			continue
		}
		if m := corner.margin(i, corner.index[k]); worse(m, worst) {
			worst, at = m, c
		}
	}
	return at
}

// Corner says at which limits of the lengths check k has its margin in load
// case i; empty where no corner exercises it.
func (t *Toleranced) Corner(i, k int) strength.Message {
	c := t.worst(i, k)
	if c < 0 {
		return strength.Message{}
	}
	return t.describe(t.corners[c].upper)
}

// describe names a corner by its lengths.
func (t *Toleranced) describe(upper uint) strength.Message {
	format := "at"
	var args []any
	for k, l := range t.tolerances {
		if k > 0 {
			format += ","
		}
		format += " %s %v"
		args = append(args, l.Pointer, mm(l.at(upper, k)))
	}
	return strength.Say(format, args...)
}

// Workings returns nothing: which corner a check's steps come from depends on
// the load case.
func (t *Toleranced) Workings(int) []strength.Working { return nil }

// CaseWorkings returns all steps behind check k in load case i, at its corner.
func (t *Toleranced) CaseWorkings(i, k int) []strength.Working {
	c := t.worst(i, k)
	if c < 0 {
		return nil
	}
	corner := &t.corners[c]
	at := corner.index[k]
	steps := append(corner.Workings(at), corner.CaseWorkings(i, at)...)
	for s := range steps {
		steps[s].LoadCase = t.cases[i].ID
	}
	return steps
}

// Findings returns what is to be said of the nominal joint, and what only a
// corner gives rise to.
func (t *Toleranced) Findings() []strength.Finding {
	all := findings(t.nominal.Findings())
	for c := range t.corners {
		for _, f := range t.corners[c].Findings() {
			all.keep(f)
		}
	}
	return all
}

// Cautions returns what the calculation leaves to the user.
func (t *Toleranced) Cautions() []string { return t.nominal.Cautions() }

// LengthAt returns what puts a length into a joint, by its pointer in a lug
// request; false where no length stands there that can have a tolerance. A
// length of a member that the joint does not have is left alone.
func LengthAt(pointer string) (set func(*Joint, float64), ok bool) {
	set, ok = lengths[pointer]
	return set, ok
}

var lengths = lengthTable()

func lengthTable() map[string]func(*Joint, float64) {
	all := map[string]func(*Joint, float64){
		"/pin/diameter":       func(j *Joint, x float64) { with(j.Pin, func(p *Pin) { p.Diameter = x }) },
		"/pin/inner_diameter": func(j *Joint, x float64) { with(j.Pin, func(p *Pin) { p.InnerDiameter = x }) },
		"/clevis/gap":         func(j *Joint, x float64) { with(j.Clevis, func(c *Clevis) { c.Gap = x }) },
	}
	heads := map[string]func(*Joint) *Head{
		"/lug": func(j *Joint) *Head { return &j.Lug },
		"/clevis": func(j *Joint) *Head {
			if j.Clevis == nil {
				return nil
			}
			return &j.Clevis.Head
		},
	}
	for at, head := range heads {
		for name, set := range map[string]func(*Head, float64){
			"/width":         func(h *Head, x float64) { h.Width = x },
			"/thickness":     func(h *Head, x float64) { h.Thickness = x },
			"/hole_diameter": func(h *Head, x float64) { h.HoleDiameter = x },
			"/edge_distance": func(h *Head, x float64) { h.EdgeDistance = x },
			"/end_radius":    func(h *Head, x float64) { h.EndRadius = x },
			"/offset":        func(h *Head, x float64) { h.Offset = x },
			"/body_width":    func(h *Head, x float64) { h.BodyWidth = x },
			"/body_length":   func(h *Head, x float64) { h.BodyLength = x },
		} {
			all[at+name] = func(j *Joint, x float64) { with(head(j), func(h *Head) { set(h, x) }) }
		}
		for k := range 4 {
			all[at+"/section_depths/"+strconv.Itoa(k)] = func(j *Joint, x float64) {
				with(head(j), func(h *Head) { with(h.SectionDepths, func(d *[4]float64) { d[k] = x }) })
			}
		}
	}
	bushings := map[string]func(*Joint) *Bushing{
		"/bushing": func(j *Joint) *Bushing { return j.Bushing },
		"/clevis/bushing": func(j *Joint) *Bushing {
			if j.Clevis == nil {
				return nil
			}
			return j.Clevis.Bushing
		},
	}
	for at, bushing := range bushings {
		all[at+"/interference"] = func(j *Joint, x float64) { with(bushing(j), func(b *Bushing) { b.Interference = x }) }
		all[at+"/length"] = func(j *Joint, x float64) { with(bushing(j), func(b *Bushing) { b.Length = x }) }
	}
	return all
}

// with changes what p points to, if anything.
func with[T any](p *T, change func(*T)) {
	if p != nil {
		change(p)
	}
}

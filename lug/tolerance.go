package lug

import (
	"slices"
	"strings"

	"jointledger/strength"
)

// MostTolerances is how many lengths of a joint may have tolerances at once.
const MostTolerances = 6

// Tolerance is how far a length of a joint may lie from what the joint says.
type Tolerance struct {
	Pointer     string  // of the length in a lug request, such as /lug/width
	Minus, Plus float64 // mm, not negative
}

// Toleranced is a joint whose lengths have tolerances. It implements
// strength.Calculation: each margin is that of the corner of limits that is
// worst for its check and load case, the nominal lengths among them.
type Toleranced struct {
	nominal *Prepared
	corners []corner
	lengths []limited
	checks  []strength.Check
	out     []strength.Margin
	loads   []load
	// at is, for each check, the corner that is worst in the load case met, -1
	// where none exercises it; met is -1 while there is none.
	at   []int
	met  int
	kept []strength.Margin // of the load case met
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

// PrepareToleranced settles a joint at its nominal lengths, those of j, and at
// every corner of their limits, at most 2^MostTolerances. Faults of a corner
// say which one.
func PrepareToleranced(j Joint, tolerances []Tolerance, choices []Choice, f strength.Factors, cases []LoadCase) (*Toleranced, []strength.Fault) {
	loads, wrong := newLoads(cases)
	return prepareToleranced(j, tolerances, choices, f, loads, wrong)
}

func prepareToleranced(j Joint, tolerances []Tolerance, choices []Choice, f strength.Factors, loads []load, wrong faults) (*Toleranced, []strength.Fault) {
	wrong = slices.Clone(wrong)
	if len(tolerances) > MostTolerances {
		wrong.add("", "%d lengths have tolerances and at most %d may", len(tolerances), MostTolerances)
		return nil, wrong
	}
	t := &Toleranced{loads: loads, met: -1}
	for _, l := range tolerances {
		at := lengths[l.Pointer]
		if at == nil || at(&j) == nil {
			wrong.add(l.Pointer, "there is no length here that can have a tolerance")
			continue
		}
		limited := limited{l, *at(&j)}
		limited.check(&wrong)
		j.varies |= fieldAt(l.Pointer)
		t.lengths = append(t.lengths, limited)
	}
	p, found := t.prepare(j, nominalCorner, choices, f, wrong)
	if len(found) > 0 {
		return nil, found
	}
	t.nominal = p
	t.checks = append(t.checks, p.checks...)
	for upper := range uint(1) << len(t.lengths) {
		p, found := t.prepare(j, upper, choices, f, nil)
		for _, f := range found {
			wrong.add(f.Pointer, "%v (%v)", f.Message, t.describe(upper))
		}
		if len(found) > 0 {
			return nil, wrong
		}
		t.add(corner{Prepared: p, upper: upper})
	}
	t.add(corner{Prepared: t.nominal, upper: nominalCorner})
	t.at, t.kept = make([]int, len(t.checks)), make([]strength.Margin, len(t.checks))
	return t, nil
}

// prepare settles the joint at one corner.
func (t *Toleranced) prepare(j Joint, upper uint, choices []Choice, f strength.Factors, wrong faults) (*Prepared, []strength.Fault) {
	j = j.Clone()
	for k := range t.lengths {
		*lengths[t.lengths[k].Pointer](&j) = t.lengths[k].at(upper, k)
	}
	return prepare(j, choices, f, t.loads, wrong)
}

// limited is a length with its limits.
type limited struct {
	Tolerance
	nominal float64
}

// check finds limits that are none. An offset may have either sign, and what
// may be left out may be nothing.
func (l *limited) check(wrong *faults) {
	if l.Minus < 0 {
		wrong.add(l.Pointer+"/minus", "the tolerance is %v and must not be below zero", mm(l.Minus))
	}
	if l.Plus < 0 {
		wrong.add(l.Pointer+"/plus", "the tolerance is %v and must not be below zero", mm(l.Plus))
	}
	switch name := l.Pointer[strings.LastIndexByte(l.Pointer, '/')+1:]; {
	case name == "offset":
	case name == "gap" || name == "inner_diameter" || name == "interference":
		if l.nominal >= 0 && l.Minus > l.nominal {
			wrong.add(l.Pointer+"/minus", "the tolerance %v is more than the length, %v", mm(l.Minus), mm(l.nominal))
		}
	case l.nominal > 0 && l.Minus >= l.nominal:
		wrong.add(l.Pointer+"/minus", "the tolerance %v leaves nothing of the length, %v", mm(l.Minus), mm(l.nominal))
	}
}

// nominalCorner stands for all lengths at their nominal values, which is tried
// too: a margin need not be worst at a limit.
const nominalCorner = ^uint(0)

// at is the length's value at a corner, as the k-th of the lengths.
func (l *limited) at(upper uint, k int) float64 {
	switch {
	case upper == nominalCorner:
		return l.nominal
	case upper&(1<<k) != 0:
		return l.nominal + l.Plus
	}
	return l.nominal - l.Minus
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
	t.meet(i)
	copy(out, t.kept)
}

// meet finds the worst corners for load case i.
func (t *Toleranced) meet(i int) {
	if t.met == i {
		return
	}
	t.met = i
	for k := range t.checks {
		t.at[k], t.kept[k] = -1, strength.Margin{}
	}
	for c := range t.corners {
		corner := &t.corners[c]
		own := t.out[:len(corner.checks)]
		corner.Margins(i, own)
		for k, at := range corner.index {
			if at >= 0 && worse(own[at], t.kept[k]) {
				t.at[k], t.kept[k] = c, own[at]
			}
		}
	}
}

// NominalMargin is what load case i makes of check k of the nominal joint.
func (t *Toleranced) NominalMargin(i, k int) strength.Margin { return t.nominal.margin(i, k) }

// Governing returns what governs, as Prepared does.
func (t *Toleranced) Governing() (loadCase, check int) { return governing(t, len(t.loads)) }

// Nominal is the calculation of the nominal joint.
func (t *Toleranced) Nominal() *Prepared { return t.nominal }

// worst is the corner whose margin check k takes in load case i; -1: none.
func (t *Toleranced) worst(i, k int) int {
	t.meet(i)
	return t.at[k]
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
	for k := range t.lengths {
		l := &t.lengths[k]
		if k > 0 {
			format += ","
		}
		format += " %s %v"
		args = append(args, l.Pointer, mm(l.at(upper, k)))
	}
	return strength.Say(format, args...)
}

// Workings appends nothing: which corner a check's steps come from depends on
// the load case.
func (t *Toleranced) Workings(_ int, steps []strength.Working) []strength.Working { return steps }

// CaseWorkings appends all steps behind check k in load case i, at its corner.
func (t *Toleranced) CaseWorkings(i, k int, steps []strength.Working) []strength.Working {
	c := t.worst(i, k)
	if c < 0 {
		return steps
	}
	corner := &t.corners[c]
	at, others := corner.index[k], len(steps)
	steps = corner.CaseWorkings(i, at, corner.Workings(at, steps))
	for s := others; s < len(steps); s++ {
		steps[s].LoadCase = t.loads[i].ID
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

// lengths finds the lengths that can have a tolerance, by their pointers in a
// lug request; nil where the joint does not have that member.
var lengths = lengthTable()

func lengthTable() map[string]func(*Joint) *float64 {
	all := map[string]func(*Joint) *float64{
		"/pin/diameter":       within(pinOf, func(p *Pin) *float64 { return &p.Diameter }),
		"/pin/inner_diameter": within(pinOf, func(p *Pin) *float64 { return &p.InnerDiameter }),
		"/clevis/gap":         within(clevisOf, func(c *Clevis) *float64 { return &c.Gap }),
	}
	for at, head := range map[string]func(*Joint) *Head{
		"/lug":    func(j *Joint) *Head { return &j.Lug },
		"/clevis": within(clevisOf, func(c *Clevis) *Head { return &c.Head }),
	} {
		for name, length := range map[string]func(*Head) *float64{
			"/width":         func(h *Head) *float64 { return &h.Width },
			"/thickness":     func(h *Head) *float64 { return &h.Thickness },
			"/hole_diameter": func(h *Head) *float64 { return &h.HoleDiameter },
			"/edge_distance": func(h *Head) *float64 { return &h.EdgeDistance },
			"/end_radius":    func(h *Head) *float64 { return &h.EndRadius },
			"/offset":        func(h *Head) *float64 { return &h.Offset },
			"/body_width":    func(h *Head) *float64 { return &h.BodyWidth },
			"/body_length":   func(h *Head) *float64 { return &h.BodyLength },
		} {
			all[at+name] = within(head, length)
		}
	}
	for at, bushing := range map[string]func(*Joint) *Bushing{
		"/bushing":        func(j *Joint) *Bushing { return j.Bushing },
		"/clevis/bushing": within(clevisOf, func(c *Clevis) *Bushing { return c.Bushing }),
	} {
		all[at+"/interference"] = within(bushing, func(b *Bushing) *float64 { return &b.Interference })
		all[at+"/length"] = within(bushing, func(b *Bushing) *float64 { return &b.Length })
	}
	return all
}

func pinOf(j *Joint) *Pin { return j.Pin }

func clevisOf(j *Joint) *Clevis { return j.Clevis }

// within finds a part of a member of a joint, nil without the member.
func within[M, P any](member func(*Joint) *M, part func(*M) *P) func(*Joint) *P {
	return func(j *Joint) *P {
		if m := member(j); m != nil {
			return part(m)
		}
		return nil
	}
}

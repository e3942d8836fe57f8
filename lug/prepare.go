package lug

import (
	"cmp"
	"maps"
	"slices"
	"strconv"

	"jointledger/strength"
)

// Prepared is a joint with its methods, ready for any number of load cases. It
// implements strength.Calculation.
type Prepared struct {
	joint    Joint
	lug      *part
	clevis   *part // nil without one
	factors  strength.Factors
	loads    []load
	checks   []strength.Check
	laws     []settled
	findings []strength.Finding
	cautions []string
	several  bool // more than one method
}

var _ strength.Calculation = (*Prepared)(nil)

// settled is a check's law with what was settled about it.
type settled struct {
	law
	why     *strength.Message // without which there is no margin
	factor  [2]float64        // between the load and the demand, by the level of the load
	write   func(*sheet) law
	safety  strength.Safety
	special bool // special factors act on a method's own factors too
	place   int  // of its method in the request
}

// builder collects the checks of one method.
type builder struct {
	*Prepared
	method  *Method
	name    string // id@revision
	choice  Choice
	place   int // of the method in the request
	read    fieldSet
	found   *findings
	wiped   []*sheet
	special bool // special factors act on the method's own factors too
	oblique *strength.Message
}

// Prepare settles a joint: it measures the geometry, finds every allowable
// once, and works out each load case's direction. cases are kept, not copied.
// The faults are all there are, with pointers into a lug request; with any
// there is no calculation.
func Prepare(j Joint, choices []Choice, f strength.Factors, cases []LoadCase) (*Prepared, []strength.Fault) {
	loads, wrong := newLoads(cases)
	return prepare(j, choices, f, loads, wrong)
}

// prepare settles a joint for load cases that are worked out, so that variants
// of a joint share them. wrong is what was found of the load cases.
func prepare(j Joint, choices []Choice, f strength.Factors, loads []load, wrong faults) (*Prepared, []strength.Fault) {
	wrong = slices.Clone(wrong)
	j.check(&wrong)
	methods := make([]Method, len(choices))
	asked, compared := 0, 0
	for i, c := range choices {
		list, at := "/methods/", &asked
		if c.Compared {
			list, at = "/compare/", &compared
		}
		*at++
		m, ok := Find(c.Method)
		if !ok {
			wrong.add(list+strconv.Itoa(*at-1), "there is no method %q", c.Method)
			continue
		}
		methods[i] = m
		checkOptions(&m, c.Options, &wrong)
	}
	if asked == 0 {
		wrong.add("/methods", "at least one method is needed")
	}
	if len(wrong) > 0 {
		return nil, wrong
	}

	p := &Prepared{joint: j, factors: f, loads: loads, several: len(choices) > 1}
	p.place()
	p.checks = make([]strength.Check, 0, 12*len(p.heads())*len(choices))
	p.laws = make([]settled, 0, cap(p.checks))
	room := make(findings, 0, 8) // more than most joints have
	found := &room
	var read fieldSet
	for i := range choices {
		b := &builder{
			Prepared: p, method: &methods[i], name: methods[i].Name(), choice: choices[i], place: i,
			found: found,
		}
		b.special = b.flag("apply_special")
		methods[i].prepare(b)
		read |= b.read
	}
	p.sort()
	p.conclude(found, read)
	return p, nil
}

// place puts the heads of the joint in their places.
func (p *Prepared) place() {
	j := &p.joint
	p.lug = &part{member: memberLug, bushingMember: memberBushing, head: &j.Lug, bushing: j.Bushing, pin: j.Pin, share: 1, varies: j.varies}
	c := j.Clevis
	if c == nil {
		return
	}
	p.clevis = &part{
		member: memberClevis, bushingMember: memberClevisBushing, first: fieldsOfHead,
		head: &c.Head, bushing: c.Bushing, pin: j.Pin, share: 1, varies: j.varies,
	}
	if !j.SingleShear {
		p.clevis.doubleLeg, p.clevis.share = true, cmp.Or(c.LegShare, 0.5)
	}
}

// heads are the parts that have an outline.
func (p *Prepared) heads() []*part {
	if p.clevis == nil {
		return []*part{p.lug}
	}
	return []*part{p.lug, p.clevis}
}

// check adds one check. write puts its steps on a sheet and gives its law; it
// runs once now and again whenever the steps are asked for. source is the
// document, section and equation of its allowable.
func (b *builder) check(member string, mode strength.Mode, level strength.Level, unit strength.Unit,
	safety strength.Safety, source *Equation, write func(*sheet) law,
) {
	s := b.sheet()
	s.mark = source.Mark
	// Filled out where they stand: they are large.
	b.checks, b.laws = append(b.checks, strength.Check{}), append(b.laws, settled{})
	c, k := &b.checks[len(b.checks)-1], &b.laws[len(b.laws)-1]
	k.law = write(s)
	k.why, k.write, k.place, k.safety, k.special = s.why, write, b.place, safety, b.special
	c.Member, c.Mode, c.Level, c.Unit, c.Mark = member, mode, level, unit, s.mark
	c.Method, c.Source, c.Compared = b.name, source.source(), b.choice.Compared
	b.read |= s.read
	for i, at := range levels {
		k.factor[i] = b.factors.Demand(c, at, safety, b.special).Factor()
	}
	b.wipe(s)
}

// sheet is one on which numbers are settled, wiped if it was used before.
func (b *builder) sheet() *sheet {
	if n := len(b.wiped); n > 0 {
		s := b.wiped[n-1]
		b.wiped = b.wiped[:n-1]
		return s
	}
	return &sheet{found: b.found}
}

// wipe makes a sheet ready for another calculation.
func (b *builder) wipe(s *sheet) {
	*s = sheet{found: b.found}
	b.wiped = append(b.wiped, s)
}

// number is a numeric option, or its default.
func (b *builder) number(name string) float64 { return b.value(name).Number }

func (b *builder) flag(name string) bool { return b.value(name).Flag }

// value is an option as chosen, or its default.
func (b *builder) value(name string) Value {
	if v, ok := b.choice.Options[name]; ok {
		return v
	}
	o, _ := b.method.option(name)
	return o.Default
}

// sort puts the checks in the order of answers: member, method, mode.
func (p *Prepared) sort() {
	// What is compared, and the index, packed: a sort of numbers is stable and
	// ranks each check once.
	keys := make([]uint64, len(p.checks))
	for i := range keys {
		c := &p.checks[i]
		keys[i] = uint64(memberRank(c.Member))<<56 | uint64(p.laws[i].place)<<40 | uint64(c.Mode)<<32 | uint64(i)
	}
	slices.Sort(keys)
	from := func(at int) int { return int(uint32(keys[at])) }
	// The permutation is applied in place, cycle by cycle.
	for start := range keys {
		check, law := p.checks[start], p.laws[start]
		at := start
		for from(at) != start {
			next := from(at)
			p.checks[at], p.laws[at] = p.checks[next], p.laws[next]
			keys[at] = uint64(at)
			at = next
		}
		p.checks[at], p.laws[at] = check, law
		keys[at] = uint64(at)
	}
}

// Checks returns the checks in the order of answers. Not to be changed.
func (p *Prepared) Checks() []strength.Check { return p.checks }

// Margins fills out for load case i.
func (p *Prepared) Margins(i int, out []strength.Margin) {
	l := &p.loads[i]
	for c := range p.laws {
		k := &p.laws[c]
		switch {
		case k.sides&l.sides == 0:
			out[c] = strength.Margin{}
		case k.why != nil:
			out[c] = strength.Unknown(k.why)
		case k.margin != nil:
			out[c] = k.margin(l, k.factor[l.level])
		case k.axialOnly != nil && l.sides&transverse != 0:
			out[c] = strength.Unknown(k.axialOnly)
		case k.along[l.way].why != nil:
			out[c] = strength.Unknown(k.along[l.way].why)
		default:
			out[c] = strength.Compare(k.factor[l.level]*l.Force, k.along[l.way].value)
		}
	}
}

// margin is what load case i makes of check c.
func (p *Prepared) margin(i, c int) strength.Margin {
	one := Prepared{loads: p.loads[i : i+1], laws: p.laws[c : c+1]}
	var out [1]strength.Margin
	one.Margins(0, out[:])
	return out[0]
}

// Workings appends the steps behind check c that no load case changes.
func (p *Prepared) Workings(c int, steps []strength.Working) []strength.Working {
	s := p.fresh(c, "", steps)
	p.laws[c].write(s)
	return s.record.lines
}

// fresh is a sheet on which the steps of a check are written to be read, after
// the steps of others.
func (p *Prepared) fresh(c int, loadCase string, steps []strength.Working) *sheet {
	check := &p.checks[c]
	return &sheet{record: &record{
		heading: strength.Working{Member: check.Member, Method: check.Method, Mode: check.Mode, Level: check.Level, LoadCase: loadCase},
		lines:   steps,
		others:  len(steps),
	}}
}

// CaseWorkings appends the steps behind check c that load case i makes: the
// load, what its direction does, the factors, the demand and the margin.
func (p *Prepared) CaseWorkings(i, c int, steps []strength.Working) []strength.Working {
	l, k := &p.loads[i], &p.laws[c]
	m := p.margin(i, c)
	if m.Status == strength.NotExercised {
		return steps
	}
	s := p.fresh(c, l.ID, steps)
	s.input("", "P", l.Force, strength.Force, fieldForce)
	s.input("", "α", l.angle, strength.Degrees, fieldAngle)
	if k.why != nil {
		return s.record.lines
	}
	if k.trace != nil {
		k.trace(s, l)
	}
	if m.Status == strength.Undetermined {
		return s.record.lines
	}
	demand := p.factors.Demand(&p.checks[c], l.Level, k.safety, k.special)
	switch {
	case k.unloaded:
	case k.ratio != nil:
		factored := k.factor[l.level] * l.Force
		s.record.lines = demand.Workings(s.record.lines, s.record.heading, p.factors, "P", factored, strength.Force)
		s.record.lines[len(s.record.lines)-1].Symbol = "P_d"
		s.apply(&eqUnity, m.Demand)
		k.ratio(s, l, factored)
	default:
		s.record.lines = demand.Workings(s.record.lines, s.record.heading, p.factors, cmp.Or(k.measure, "P"), m.Demand, p.checks[c].Unit)
	}
	if k.after != nil {
		k.after(s, m.Demand)
	}
	s.apply(&eqMargin, m.Margin)
	return s.record.lines
}

// Findings returns what is to be said about the joint and its load cases.
func (p *Prepared) Findings() []strength.Finding {
	all := findings(slices.Clone(p.findings))
	if p.several {
		p.findSpread(&all)
	}
	return all
}

// Cautions returns what the calculation leaves to the user.
func (p *Prepared) Cautions() []string { return p.cautions }

// sortedNames returns the keys of options in order.
func sortedNames(o Options) []string { return slices.Sorted(maps.Keys(o)) }

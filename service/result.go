package service

import (
	"cmp"
	"slices"
	"strings"

	"jointledger/strength"
)

// Result is the answer to a calculation, in the units of its question.
// Members that only one kind of joint has are absent in the others.
type Result struct {
	Verdict   string         `json:"verdict"`
	Governing *Check         `json:"governing"`
	ByMethod  []MethodResult `json:"by_method"`
	Margins   []CaseMargin   `json:"margins"`
	Checks    []Check        `json:"checks"`
	Workings  []Working      `json:"workings"`
	Findings  []Finding      `json:"findings"`
	Cautions  []string       `json:"cautions"`

	extras

	Engine      string `json:"engine"`
	InputDigest string `json:"input_digest"`
}

// MethodResult is the verdict and least margin by one method.
type MethodResult struct {
	Method   string   `json:"method"`
	Verdict  string   `json:"verdict"`
	Margin   *float64 `json:"margin"`
	Compared bool     `json:"compared"`
}

// CaseMargin is the least margin in one load case.
type CaseMargin struct {
	LoadCase string   `json:"load_case"`
	Margin   *float64 `json:"margin"`
	Status   string   `json:"status"`
}

// Check is one comparison of a demand with an allowable.
type Check struct {
	Member        string   `json:"member"`
	Fastener      *string  `json:"fastener"`
	Row           *int     `json:"row"`
	Mode          string   `json:"mode"`
	Level         string   `json:"level"`
	LoadCase      string   `json:"load_case"`
	Unit          string   `json:"unit"`
	Demand        *float64 `json:"demand"`
	Allowable     *float64 `json:"allowable"`
	Margin        *float64 `json:"margin"`
	NominalMargin *float64 `json:"nominal_margin"`
	Status        string   `json:"status"`
	Message       *string  `json:"message"`
	Method        string   `json:"method"`
	Source        string   `json:"source"`
	Mark          string   `json:"mark"`
	Compared      bool     `json:"compared"`
}

// Working is one step of the hand calculation.
type Working struct {
	Member   string  `json:"member"`
	Fastener *string `json:"fastener"`
	Row      *int    `json:"row"`
	Method   *string `json:"method"`
	Mode     *string `json:"mode"`
	Level    *string `json:"level"`
	LoadCase *string `json:"load_case"`
	Symbol   string  `json:"symbol"`
	Value    float64 `json:"value"`
	Unit     string  `json:"unit"`
	Equation *string `json:"equation"`
	Source   *string `json:"source"`
	Mark     string  `json:"mark"`
}

// Finding is something to be told that is not a margin.
type Finding struct {
	Severity string  `json:"severity"`
	Code     string  `json:"code"`
	Subject  string  `json:"subject"`
	Message  string  `json:"message"`
	Source   *string `json:"source"`
}

// View says how much of an answer is wanted.
type View struct {
	NoWorkings bool
	Checks     string // "", "all", "governing"
}

// Sizes of an answer: above the first the governing checks are the default,
// above the second they are all there is.
const (
	governingAbove = 1_000
	refuseAllAbove = 100_000
)

// governingOnly decides between all checks and the governing ones for a joint
// of so many places in so many load cases.
func (v View) governingOnly(places, cases int) (bool, *Problem) {
	n := max(places, 1) * cases
	if v.Checks == "all" && n > refuseAllAbove {
		return false, problem(Invalid, "checks=all is for at most %d load cases times fasteners or rows, and these are %d; ask for checks=governing", refuseAllAbove, n)
	}
	return v.Checks == "governing" || v.Checks == "" && n > governingAbove, nil
}

// place says where a check of one load case stands.
type place struct{ load, check int }

// worst keeps the worst margin that it saw, and where.
type worst struct {
	margin strength.Margin
	at     place
}

// see compares by status, then by margin; the first of equals stays.
func (w *worst) see(m strength.Margin, at place) {
	if m.Status > w.margin.Status || m.Status == w.margin.Status && m.Margin < w.margin.Margin {
		*w = worst{m, at}
	}
}

// assembly turns a calculation into an answer.
type assembly struct {
	calculation strength.Calculation
	corners     corners  // of toleranced input, else nil
	cases       []string // ids
	methods     []string // as asked
	units       Units
}

// corners is what a calculation with tolerances knows besides: a margin is that
// of the worst combination of limits.
type corners interface {
	// NominalMargin is a margin with every length at nominal.
	NominalMargin(load, check int) strength.Margin
	// Corner says which combination is the worst.
	Corner(load, check int) strength.Message
}

// assemble runs every load case and writes down what is wanted. It returns
// also the load cases of which checks are kept.
func (a assembly) assemble(view View, governingOnly bool) (Result, []int) {
	checks := a.calculation.Checks()
	margins := make([]strength.Margin, len(checks))
	groupOf, groups := group(checks)

	worstOf := make([]worst, groups)
	var least worst // of all determined checks that count
	determined := false
	total := strength.NotExercised
	type methodState struct {
		status   strength.Status
		margin   *float64
		compared bool
	}
	byMethod := map[string]*methodState{}
	for i := range checks {
		if byMethod[checks[i].Method] == nil {
			byMethod[checks[i].Method] = &methodState{compared: checks[i].Compared}
		}
	}
	methodOf := make([]*methodState, len(checks))
	for i := range checks {
		methodOf[i] = byMethod[checks[i].Method]
	}

	result := Result{Margins: make([]CaseMargin, len(a.cases))}
	kept := []place{}
	var all []strength.Margin // of kept, while everything is kept
	for i := range a.cases {
		a.calculation.Margins(i, margins)
		status, leastHere := strength.NotExercised, (*float64)(nil)
		for c := range checks {
			m := margins[c]
			if m.Status == strength.NotExercised {
				continue
			}
			if governingOnly {
				worstOf[groupOf[c]].see(m, place{i, c})
			} else {
				kept, all = append(kept, place{i, c}), append(all, m)
			}
			known := m.Status != strength.Undetermined
			s := methodOf[c]
			s.status = max(s.status, m.Status)
			if known && (s.margin == nil || m.Margin < *s.margin) {
				s.margin = clone(&m.Margin)
			}
			if checks[c].Compared {
				continue
			}
			status = max(status, m.Status)
			if known && (leastHere == nil || m.Margin < *leastHere) {
				leastHere = &margins[c].Margin
			}
			if known && (!determined || m.Margin < least.margin.Margin) {
				least, determined = worst{m, place{i, c}}, true
			}
		}
		total = max(total, status)
		result.Margins[i] = CaseMargin{a.cases[i], clone(leastHere), status.String()}
	}
	result.Verdict = total.String()
	if determined {
		governing := a.check(least.at, least.margin)
		result.Governing = &governing
	}
	for _, name := range a.methods {
		s := byMethod[name]
		if s == nil {
			continue
		}
		result.ByMethod = append(result.ByMethod, MethodResult{name, s.status.String(), s.margin, s.compared})
	}
	if governingOnly {
		kept, all = keep(worstOf)
	}
	result.Checks = make([]Check, len(kept))
	var loads []int
	for k, at := range kept {
		result.Checks[k] = a.check(at, all[k])
		if len(loads) == 0 || loads[len(loads)-1] != at.load {
			loads = append(loads, at.load)
		}
	}
	if !governingOnly {
		loads = make([]int, len(a.cases))
		for i := range loads {
			loads[i] = i
		}
	}
	if !view.NoWorkings {
		result.Workings = a.workings(kept)
	}
	for _, f := range a.calculation.Findings() {
		result.Findings = append(result.Findings, Finding{f.Severity.String(), f.Code, f.Subject, a.units.say(f.Message), text(f.Source)})
	}
	result.Cautions = a.calculation.Cautions()
	result.Engine = Engine
	return result, loads
}

// group numbers the member, mode, level and method of each check: of each of
// those only the worst is kept in a short answer.
func group(checks []strength.Check) (of []int, n int) {
	type key struct {
		member, method string
		mode           strength.Mode
		level          strength.Level
	}
	numbers := map[key]int{}
	of = make([]int, len(checks))
	for i, c := range checks {
		k := key{c.Member, c.Method, c.Mode, c.Level}
		number, ok := numbers[k]
		if !ok {
			number = len(numbers)
			numbers[k] = number
		}
		of[i] = number
	}
	return of, len(numbers)
}

// keep returns what the groups saw, in the order of answers.
func keep(groups []worst) (kept []place, margins []strength.Margin) {
	groups = slices.DeleteFunc(groups, func(w worst) bool { return w.margin.Status == strength.NotExercised })
	slices.SortFunc(groups, func(a, b worst) int {
		return cmp.Or(cmp.Compare(a.at.load, b.at.load), cmp.Compare(a.at.check, b.at.check))
	})
	for _, w := range groups {
		kept, margins = append(kept, w.at), append(margins, w.margin)
	}
	return kept, margins
}

func (a assembly) check(at place, m strength.Margin) Check {
	c := &a.calculation.Checks()[at.check]
	out := Check{
		Member: c.Member, Fastener: text(c.Fastener), Row: row(c.Row), Mode: c.Mode.String(), Level: c.Level.String(),
		LoadCase: a.cases[at.load], Unit: a.units.name(c.Unit), Status: m.Status.String(), Method: c.Method,
		Source: c.Source, Mark: c.Mark.String(), Compared: c.Compared,
	}
	var said []string
	if m.Status == strength.Undetermined {
		if m.Why != nil {
			said = append(said, a.units.say(*m.Why))
		}
	} else {
		demand, allowable, margin := a.units.out(m.Demand, c.Unit), a.units.out(m.Allowable, c.Unit), m.Margin
		out.Demand, out.Allowable, out.Margin = &demand, &allowable, &margin
	}
	if a.corners != nil {
		said = append(said, a.units.say(a.corners.Corner(at.load, at.check)))
		if n := a.corners.NominalMargin(at.load, at.check); n.Status != strength.NotExercised && n.Status != strength.Undetermined {
			out.NominalMargin = &n.Margin
		}
	}
	out.Message = text(strings.Join(said, ", "))
	return out
}

// workings gathers the steps behind the kept checks, each once.
func (a assembly) workings(kept []place) []Working {
	var steps distinct
	static := make([]bool, len(a.calculation.Checks()))
	var some []strength.Working
	for _, at := range kept {
		if !static[at.check] {
			static[at.check] = true
			some = a.calculation.Workings(at.check, some[:0])
			steps.add(some)
		}
		some = a.calculation.CaseWorkings(at.load, at.check, some[:0])
		steps.add(some)
	}
	out := make([]Working, len(steps.list))
	for i := range steps.list {
		out[i] = a.units.working(&steps.list[i])
	}
	return out
}

// distinct keeps steps in the order of their coming, each once.
type distinct struct {
	list []strength.Working
	next []int32           // of list: the one before it of the same outline, plus one
	last map[outline]int32 // the last in list, plus one; nil of a short list
}

// outline is what most steps differ in: hashing the whole of them, texts of
// sources and all, would take longer than making them.
type outline struct {
	member, fastener, loadCase, symbol string
	row                                int
	mode                               strength.Mode
	level                              strength.Level
	value                              float64
}

func outlineOf(w *strength.Working) outline {
	return outline{w.Member, w.Fastener, w.LoadCase, w.Symbol, w.Row, w.Mode, w.Level, w.Value}
}

// A list of up to shortList steps, which most answers have, is searched through
// in less time than it takes to hash.
const shortList = 96

func (d *distinct) add(steps []strength.Working) {
	if d.list == nil {
		d.list = make([]strength.Working, 0, shortList)
	}
	for i := range steps {
		if w := &steps[i]; !d.has(w) {
			d.list = append(d.list, *w)
			d.index()
		}
	}
}

func (d *distinct) has(w *strength.Working) bool {
	if d.last == nil {
		for i := range d.list {
			if d.list[i].Value == w.Value && d.list[i] == *w {
				return true
			}
		}
		return false
	}
	for at := d.last[outlineOf(w)]; at > 0; at = d.next[at-1] {
		if d.list[at-1] == *w {
			return true
		}
	}
	return false
}

// index makes the steps of a list that is not short any more found by their
// outlines.
func (d *distinct) index() {
	if len(d.list) <= shortList {
		return
	}
	if d.last == nil {
		d.last = make(map[outline]int32, 4*shortList)
	}
	for i := len(d.next); i < len(d.list); i++ {
		key := outlineOf(&d.list[i])
		d.next = append(d.next, d.last[key])
		d.last[key] = int32(i + 1)
	}
}

// working writes one step in the caller's units. What it returns points into the
// step, which must stay as it is.
func (u Units) working(w *strength.Working) Working {
	return Working{
		Member: w.Member, Fastener: textAt(&w.Fastener), Row: row(w.Row), Method: textAt(&w.Method),
		Mode: modeTexts[w.Mode], Level: levelTexts[w.Level], LoadCase: textAt(&w.LoadCase),
		Symbol: w.Symbol, Value: u.out(w.Value, w.Unit), Unit: u.name(w.Unit),
		Equation: textAt(&w.Equation), Source: textAt(&w.Source), Mark: w.Mark.String(),
	}
}

// The words of modes and levels, null for none, without a copy for each step.
var (
	modeTexts  = textsOf(strength.Modes()...)
	levelTexts = textsOf(strength.Ultimate, strength.Limit)
)

func textsOf[T interface {
	comparable
	String() string
}](values ...T) map[T]*string {
	texts := make(map[T]*string, len(values))
	for _, v := range values {
		texts[v] = text(v.String())
	}
	return texts
}

// clone copies an optional number out of where it will be overwritten.
func clone(x *float64) *float64 {
	if x == nil {
		return nil
	}
	y := *x
	return &y
}

// text is null for none.
func text(s string) *string { return textAt(&s) }

// textAt is null for an empty text, and else the text where it stands.
func textAt(s *string) *string {
	if *s == "" {
		return nil
	}
	return s
}

// row is null for none.
func row(n int) *int {
	if n == 0 {
		return nil
	}
	return &n
}

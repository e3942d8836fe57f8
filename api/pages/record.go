package pages

import (
	"cmp"
	"errors"
	"html/template"
	"net/http"
	"slices"
	"strings"

	"jointledger/service"
)

type recordContent struct {
	*service.RecordDocument
	Answer
	Proof        string
	Whole        string // the input as it was hashed, where it is not too long
	Verification *service.Verification
	Replayed     *service.Replay
	Failed       string // why a replay gave nothing
}

// Answer is a result and its input, laid out to be read.
type Answer struct {
	Result    *service.Result
	Title     string
	Force     string // the unit
	Figures   []figure
	Open      int        // checks that are undetermined
	Checks    []checkRow // worst first
	More      []checkRow // beyond what is read at once
	Plots     []figure
	Listed    []service.CaseMargin // the margins, where they are few
	Shares    []service.CaseShares
	Transfers []service.CaseTransfers
	Steps     []stepGroup
	MoreSteps []stepGroup
	Sources   []string // numbered from 1
	Inputs    []inputTable
}

// figure is a drawing with what is to be said under it.
type figure struct {
	Drawing template.HTML
	Caption string
	Narrow  bool
}

// checkRow is a check with the number of its source.
type checkRow struct {
	service.Check
	Source int
}

// Place is the member of the check, and where in it.
func (c checkRow) Place() string { return placeIn(c.Member, c.Fastener, c.Row) }

func placeIn(member string, fastener *string, row *int) string {
	place := placeOf(fastener, row)
	switch {
	case place == "":
		return member
	case member == "fastener":
		return place
	}
	return member + ", " + place
}

func placeOf(fastener *string, row *int) string {
	switch {
	case fastener != nil:
		return "fastener " + *fastener
	case row != nil:
		return "row " + number(float64(*row))
	}
	return ""
}

// stepGroup is the hand calculation behind one check.
type stepGroup struct {
	Name, Method, LoadCase string
	Steps                  []step
}

type step struct {
	service.Working
	Source int // 0 for none
}

// Sizes of a page: what is over them is there, folded away.
const (
	mostChecks = 30
	mostGroups = 8
	mostCases  = 12
	mostWhole  = 20_000 // bytes of input that are shown as they are
	plotFrom   = 3      // load cases from which margins are plotted
)

// sources numbers texts in the order of their first use.
type sources struct {
	list []string
	at   map[string]int
}

func (s *sources) number(text string) int {
	if text == "" {
		return 0
	}
	if n, ok := s.at[text]; ok {
		return n
	}
	s.list = append(s.list, text)
	s.at[text] = len(s.list)
	return len(s.list)
}

// answerOf lays out a result.
func answerOf(content *service.Content) Answer {
	r := content.Result
	a := Answer{Result: r, Shares: r.Shares, Transfers: r.Transfers}
	if len(a.Shares) > mostCases {
		a.Shares = a.Shares[:mostCases]
	}
	if len(a.Transfers) > mostCases {
		a.Transfers = a.Transfers[:mostCases]
	}
	var units service.Units
	switch {
	case content.Lug != nil:
		units = content.Lug.Units
		a.Title = deref(content.Lug.Title)
		a.Inputs = lugInputs(content.Lug)
		a.Figures = lugFigures(content.Lug, r)
		if turns(content.Lug) {
			a.Plots = append(a.Plots, figure{
				Drawing: polarPlot(content.Lug, r.Margins), Narrow: true,
				Caption: "Least margin by the direction of the load, seen along the pin: 0° pulls toward the free end. The heavy circle is margin 0; margins above +2 stand on the outer circle.",
			})
		}
	case content.Group != nil:
		units = content.Group.Units
		a.Title = deref(content.Group.Title)
		a.Inputs = groupInputs(content.Group)
		a.Figures = groupFigures(content.Group, r)
	case content.Splice != nil:
		units = content.Splice.Units
		a.Title = deref(content.Splice.Title)
		a.Inputs = spliceInputs(content.Splice)
		a.Figures = spliceFigures(content.Splice, r)
	}
	a.Force = forceUnit(units)
	if len(r.Margins) >= plotFrom {
		if plot := marginsPlot(r.Margins); plot != "" {
			a.Plots = append(a.Plots, figure{Drawing: plot, Caption: "Least margin of each load case. What lies far above is drawn at the top edge."})
		}
	}
	if len(r.Margins) <= mostCases {
		a.Listed = r.Margins
	}
	numbered := sources{at: map[string]int{}}
	rows := make([]checkRow, len(r.Checks))
	for i, c := range r.Checks {
		rows[i] = checkRow{c, 0}
		if c.Status == "undetermined" && !c.Compared {
			a.Open++
		}
	}
	slices.SortStableFunc(rows, worstFirst)
	for i := range rows {
		rows[i].Source = numbered.number(rows[i].Check.Source)
	}
	a.Checks, a.More = splitAt(rows, mostChecks)
	a.Steps, a.MoreSteps = splitAt(stepsOf(r, &numbered), mostGroups)
	a.Sources = numbered.list
	return a
}

func splitAt[T any](list []T, most int) (first, rest []T) {
	if len(list) <= most {
		return list, nil
	}
	return list[:most], list[most:]
}

// worstFirst orders checks: those that count before those compared, the
// inadequate before the undetermined before the adequate, least margin first.
func worstFirst(a, b checkRow) int {
	rank := func(c checkRow) int {
		n := slices.Index([]string{"inadequate", "undetermined", "adequate"}, c.Status)
		if c.Compared {
			n += 10
		}
		return n
	}
	of := func(c checkRow) float64 {
		if c.Margin == nil {
			return 0
		}
		return *c.Margin
	}
	return cmp.Or(cmp.Compare(rank(a), rank(b)), cmp.Compare(of(a), of(b)))
}

// stepsOf groups the workings by the check that they stand behind, that of the
// governing check first.
func stepsOf(r *service.Result, numbered *sources) []stepGroup {
	type key struct {
		member, place, method, mode, level, loadCase string
	}
	var groups []stepGroup
	var keys []key
	at := map[key]int{}
	for _, w := range r.Workings {
		k := key{w.Member, placeOf(w.Fastener, w.Row), deref(w.Method), deref(w.Mode), deref(w.Level), deref(w.LoadCase)}
		i, ok := at[k]
		if !ok {
			i = len(groups)
			at[k] = i
			keys = append(keys, k)
			name := placeIn(w.Member, w.Fastener, w.Row)
			if k.mode != "" {
				name += ": " + words(k.mode)
			}
			if k.level != "" {
				name += ", " + k.level
			}
			groups = append(groups, stepGroup{Name: name, Method: k.method, LoadCase: k.loadCase})
		}
		groups[i].Steps = append(groups[i].Steps, step{w, 0})
	}
	g := cmp.Or(r.Governing, &service.Check{})
	order := make([]int, len(groups))
	for i := range order {
		order[i] = i
	}
	rank := func(i int) int {
		k := keys[i]
		switch {
		case k.member != g.Member || k.place != placeOf(g.Fastener, g.Row):
			return 3
		case k.mode == "":
			return 0 // what the member's checks share
		case k.mode == g.Mode && (k.level == g.Level || k.level == "") && (k.loadCase == g.LoadCase || k.loadCase == "") && (k.method == g.Method || k.method == ""):
			return 1
		}
		return 2
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(rank(a), rank(b)) })
	sorted := make([]stepGroup, len(groups))
	for i, from := range order {
		sorted[i] = groups[from]
		for k := range sorted[i].Steps {
			s := &sorted[i].Steps[k]
			s.Source = numbered.number(deref(s.Working.Source))
		}
	}
	return sorted
}

// recordOf reads a record for its page.
func (p *Pages) recordOf(v *visit) (*recordContent, error) {
	document, err := p.service.RecordByID(v.r.Context(), v.r.PathValue("id"))
	if err != nil {
		return nil, err
	}
	content, err := document.Content()
	if err != nil {
		return nil, err
	}
	c := &recordContent{RecordDocument: document, Answer: answerOf(content)}
	if len(document.Input) <= mostWhole {
		c.Whole = string(document.Input)
	}
	c.Proof, err = p.service.Proof(v.r.Context(), document.ID)
	return c, err
}

func (p *Pages) showRecord(v *visit, c *recordContent) error {
	p.show(v, http.StatusOK, "record", c.Subject.Part+" "+c.Subject.Joint, c)
	return nil
}

func (p *Pages) record(v *visit) error {
	c, err := p.recordOf(v)
	if err != nil {
		return err
	}
	return p.showRecord(v, c)
}

func (p *Pages) verify(v *visit) error {
	c, err := p.recordOf(v)
	if err != nil {
		return err
	}
	if c.Verification, err = p.service.Verify(v.r.Context(), c.ID); err != nil {
		return err
	}
	return p.showRecord(v, c)
}

func (p *Pages) replay(v *visit) error {
	c, err := p.recordOf(v)
	if err != nil {
		return err
	}
	c.Replayed, err = p.service.Replay(v.r.Context(), c.ID)
	var problem *service.Problem
	if errors.As(err, &problem) && problem.Code == service.Invalid {
		c.Failed = problem.Error()
	} else if err != nil {
		return err
	}
	return p.showRecord(v, c)
}

// sheet is the stylesheet that puts part, revision and digest on every printed
// page of a record. It stands by itself because the pages allow no styles
// within them.
func (p *Pages) sheet(v *visit) error {
	d, err := p.service.RecordByID(v.r.Context(), v.r.PathValue("id"))
	if err != nil {
		return err
	}
	joint := d.Subject.Joint
	if d.Subject.Aspect != "" {
		joint += ", " + d.Subject.Aspect
	}
	return v.send("text/css; charset=utf-8", []byte("@page{"+
		"@top-left{content:"+cssString("Part "+clip(d.Subject.Part, 40)+", revision "+clip(d.Subject.Revision, 20))+"}"+
		"@top-right{content:"+cssString(clip(joint, 50))+"}"+
		"@bottom-left{content:"+cssString(d.RecordDigest)+"}"+
		"@bottom-right{content:\"Page \" counter(page) \" of \" counter(pages)}}\n"), nil)
}

// cssString writes a text as a string of CSS. All but letters and digits is
// escaped, so that no text can end the string.
func cssString(s string) string {
	const hex = "0123456789abcdef"
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r == ' ':
			b.WriteRune(r)
		default:
			if r == 0 {
				r = '\ufffd'
			}
			b.WriteByte('\\')
			for shift := 20; shift >= 0; shift -= 4 {
				b.WriteByte(hex[r>>shift&0xf])
			}
			b.WriteByte(' ') // ends the escape, and is no part of the text
		}
	}
	b.WriteByte('"')
	return b.String()
}

// send answers something else than a page.
func (v *visit) send(media string, body []byte, err error) error {
	if err != nil {
		return err
	}
	v.w.Header().Set("Content-Type", media)
	_, _ = v.w.Write(body) // the reader has gone; nothing is lost
	return nil
}

// recordJSON, entryJSON and proofText are what the API answers, for those who
// are signed in by a browser.
func (p *Pages) recordJSON(v *visit) error {
	document, err := p.service.RecordByID(v.r.Context(), v.r.PathValue("id"))
	if err != nil {
		return err
	}
	text, err := service.Spread(document)
	return v.send("application/json", []byte(text), err)
}

func (p *Pages) entryJSON(v *visit) error {
	data, err := p.service.EntryBytes(v.r.Context(), v.r.PathValue("id"))
	return v.send("application/json", data, err)
}

func (p *Pages) proofText(v *visit) error {
	proof, err := p.service.Proof(v.r.Context(), v.r.PathValue("id"))
	return v.send("text/plain; charset=utf-8", []byte(proof), err)
}

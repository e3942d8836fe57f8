package service

import (
	"jointledger/fastener"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// RuleSetRef is a caller's own set of layout rules, or the name of a built-in
// one.
type RuleSetRef = strictjson.Either[string, RuleSet]

// RuleSet is a caller's own set of layout rules.
type RuleSet struct {
	ID       string       `json:"id" validate:"id"`
	Revision *int         `json:"revision,omitzero" validate:"omitnil,min=1"`
	Title    *string      `json:"title,omitzero" validate:"omitnil,text"`
	Source   *string      `json:"source,omitzero" validate:"omitnil,text"`
	Rules    []LayoutRule `json:"rules" validate:"min=1,max=100,dive"`
}

// LayoutRule bounds a measure by diameters D + thicknesses t + length, but not
// more than the cap.
type LayoutRule struct {
	Measure     string   `json:"measure"`
	Severity    string   `json:"severity" validate:"oneof=violation warning note"`
	Diameters   *float64 `json:"diameters,omitzero" validate:"omitnil,amount"`
	Thicknesses *float64 `json:"thicknesses,omitzero" validate:"omitnil,amount"`
	Length      *float64 `json:"length,omitzero" validate:"omitnil,amount"`
	Cap         *float64 `json:"cap,omitzero" validate:"omitnil,size"`
	OfHole      *bool    `json:"of_hole,omitzero"`
	When        *string  `json:"when,omitzero" validate:"omitnil,text"`
}

// resolveRules pins the names of built-in sets, which stay names, and writes
// the defaults of own ones out.
func resolveRules(refs []RuleSetRef, u Units, f *faults) {
	taken := map[string]bool{}
	for i := range refs {
		at := pointer("rules", i)
		own := refs[i].Object
		if own == nil {
			set, ok := fastener.FindRules(refs[i].Plain)
			switch refs[i].Plain = set.Name(); {
			case !ok:
				f.add(at, "there is no such set of rules (see /v1/rules)")
			case taken[set.ID]:
				f.add(at, "a set of rules %s is named before", set.ID)
			}
			taken[set.ID] = true
			continue
		}
		setDefault(&own.Revision, 1)
		setDefault(&own.Title, "")
		setDefault(&own.Source, "")
		for k := range own.Rules {
			rule := &own.Rules[k]
			setDefault(&rule.Diameters, 0)
			setDefault(&rule.Thicknesses, 0)
			setDefault(&rule.Length, 0)
			setDefault(&rule.OfHole, false)
			setDefault(&rule.When, "")
		}
		if _, builtIn := fastener.FindRules(own.ID); builtIn || taken[own.ID] {
			f.add(at+"/id", "%.80q is the id of another set of rules", own.ID)
		}
		taken[own.ID] = true
		for _, fault := range u.ruleSet(&refs[i]).Check() {
			f.add(at+fault.Pointer, "%s", u.say(fault.Message))
		}
	}
}

// ruleSet turns the wire form, resolved, into mm.
func (u Units) ruleSet(ref *RuleSetRef) fastener.RuleSet {
	own := ref.Object
	if own == nil {
		set, _ := fastener.FindRules(ref.Plain)
		return set
	}
	mm := u.scale(strength.Length)
	set := fastener.RuleSet{ID: own.ID, Revision: *own.Revision, Title: *own.Title, Source: *own.Source, Mark: strength.Given}
	for _, r := range own.Rules {
		set.Rules = append(set.Rules, fastener.Rule{
			Measure: fastener.Measure(r.Measure), Severity: severityByWord[r.Severity],
			Diameters: *r.Diameters, Thicknesses: *r.Thicknesses, Length: *r.Length * mm, Cap: value(r.Cap) * mm,
			OfHole: *r.OfHole, When: *r.When,
		})
	}
	return set
}

var severityByWord = func() map[string]strength.Severity {
	words := map[string]strength.Severity{}
	for _, s := range []strength.Severity{strength.Violation, strength.Warning, strength.Note} {
		words[s.String()] = s
	}
	return words
}()

// RuleSetItem is a built-in set of layout rules.
type RuleSetItem struct {
	ID       string     `json:"id"`
	Revision int        `json:"revision"`
	Name     string     `json:"name"` // id@revision
	Title    string     `json:"title"`
	Source   string     `json:"source"`
	Mark     string     `json:"mark"`
	Rules    []RuleItem `json:"rules"`
}

// RuleItem is one rule: the least, or most, that a measure may be. What does
// not apply is null.
type RuleItem struct {
	Measure     string     `json:"measure"`
	Asks        string     `json:"asks"`
	Severity    string     `json:"severity"`
	Diameters   float64    `json:"diameters"`
	Thicknesses float64    `json:"thicknesses"`
	Length      float64    `json:"length"`
	Cap         *float64   `json:"cap"`
	OfHole      bool       `json:"of_hole"`
	Table       []RuleStep `json:"table"`
	Rows        *string    `json:"rows"`
	When        *string    `json:"when"`
}

// RuleStep is a bound for diameters up to one.
type RuleStep struct {
	UpTo  float64 `json:"up_to"`
	Bound float64 `json:"bound"`
}

// RuleSetList lists sets of layout rules, their lengths in some units.
type RuleSetList struct {
	Units Units         `json:"units"`
	Items []RuleSetItem `json:"items"`
}

// Rules lists the built-in sets of layout rules.
func Rules(units string) (*RuleSetList, error) {
	u, err := unitsOf(units)
	if err != nil {
		return nil, err
	}
	list := &RuleSetList{Units: u}
	for _, r := range fastener.RuleSets() {
		item := RuleSetItem{
			ID: r.ID, Revision: r.Revision, Name: r.Name(), Title: r.Title, Source: r.Source, Mark: r.Mark.String(),
		}
		for _, rule := range r.Rules {
			item.Rules = append(item.Rules, u.ruleItem(rule))
		}
		list.Items = append(list.Items, item)
	}
	return list, nil
}

func (u Units) ruleItem(r fastener.Rule) RuleItem {
	length := func(x float64) float64 { return u.out(x, strength.Length) }
	item := RuleItem{
		Measure: string(r.Measure), Asks: u.say(r.Asks()), Severity: r.Severity.String(),
		Diameters: r.Diameters, Thicknesses: r.Thicknesses, Length: length(r.Length), OfHole: r.OfHole, When: text(r.When),
	}
	if r.Cap > 0 {
		most := length(r.Cap)
		item.Cap = &most
	}
	for _, step := range r.Table {
		item.Table = append(item.Table, RuleStep{length(step.UpTo), length(step.Bound)})
	}
	switch r.Rows {
	case fastener.SingleRow:
		item.Rows = text("single")
	case fastener.SeveralRows:
		item.Rows = text("several")
	}
	return item
}

package service

import (
	"slices"
	"strings"

	"jointledger/fastener"
	"jointledger/lug"
	"jointledger/strength"
)

// unitsOf reads the units that a catalogue is asked in; SI when not said,
// since a table of published values is not the caller's own number.
func unitsOf(given string) (Units, error) {
	switch {
	case given == "":
		return SI, nil
	case !slices.Contains(Units("").Words(), given):
		return "", MalformedQuery(QueryFault("units", "must be SI or US"))
	}
	return Units(given), nil
}

// MaterialItem is a material of the catalogue.
type MaterialItem struct {
	ID        string   `json:"id"`
	Revision  int      `json:"revision"`
	Thickness string   `json:"thickness"`
	Material  Material `json:"material"`
}

// MaterialList is the catalogue of materials in some units.
type MaterialList struct {
	Units Units          `json:"units"`
	Items []MaterialItem `json:"items"`
}

// Materials lists the built-in materials.
func Materials(units string) (*MaterialList, error) {
	u, err := unitsOf(units)
	if err != nil {
		return nil, err
	}
	list := &MaterialList{Units: u}
	for _, m := range materials {
		list.Items = append(list.Items, MaterialItem{m.ID, m.Revision, m.Thick, m.in(u)})
	}
	return list, nil
}

// MethodItem is a published method with what it rests on.
type MethodItem struct {
	ID        string         `json:"id"`
	Revision  int            `json:"revision"`
	Method    string         `json:"method"` // id@revision
	Kind      string         `json:"kind"`
	Title     string         `json:"title"`
	Source    string         `json:"source"`
	Range     string         `json:"range"`
	Mark      string         `json:"mark"`
	Modes     []string       `json:"modes"`
	Options   []OptionItem   `json:"options"`
	Equations []EquationItem `json:"equations"`
}

// OptionItem is an option of a method; what does not apply is null.
type OptionItem struct {
	Name     string   `json:"name"`
	Meaning  string   `json:"meaning"`
	Type     string   `json:"type"`
	Default  any      `json:"default"`
	Words    []string `json:"words"`
	Least    *float64 `json:"least"`
	Most     *float64 `json:"most"`
	Requires *string  `json:"requires"`
}

// EquationItem is one equation of a method.
type EquationItem struct {
	Number   string `json:"number"`
	Equation string `json:"equation"`
	Source   string `json:"source"`
	Mark     string `json:"mark"`
}

// MethodList lists methods.
type MethodList struct {
	Items []MethodItem `json:"items"`
}

// Methods lists the methods of a kind, of all kinds when it is empty.
func Methods(kind string) (*MethodList, error) {
	all := append(lugMethods(), fastenerMethods()...)
	if kind == "" {
		return &MethodList{all}, nil
	}
	var kinds []string
	for _, m := range all {
		if !slices.Contains(kinds, m.Kind) {
			kinds = append(kinds, m.Kind)
		}
	}
	if !slices.Contains(kinds, kind) {
		return nil, MalformedQuery(QueryFault("kind", "must be one of "+strings.Join(kinds, ", ")))
	}
	return &MethodList{slices.DeleteFunc(all, func(m MethodItem) bool { return m.Kind != kind })}, nil
}

func lugMethods() []MethodItem {
	var items []MethodItem
	for _, m := range lug.Methods() {
		item := MethodItem{
			ID: m.ID, Revision: m.Revision, Method: m.Name(), Kind: string(Lug), Title: m.Title,
			Source: m.Source, Range: m.Range, Mark: m.Mark.String(), Modes: words(m.Modes),
		}
		for _, e := range m.Equations {
			item.Equations = append(item.Equations, EquationItem{e.Number, e.Symbol + " = " + e.Text, e.Source, e.Mark.String()})
		}
		for _, o := range m.Options {
			item.Options = append(item.Options, optionItem(o))
		}
		items = append(items, item)
	}
	return items
}

func fastenerMethods() []MethodItem {
	var items []MethodItem
	for _, m := range fastener.Methods() {
		item := MethodItem{
			ID: m.ID, Revision: m.Revision, Method: m.Name(), Kind: m.Kind, Title: m.Title,
			Source: m.Source, Range: m.Range, Mark: m.Mark.String(),
			Options: groupOptions[m.ID], Equations: equationItems(m.Equations),
		}
		items = append(items, item)
	}
	for _, c := range fastener.ComplianceFormulas() {
		items = append(items, MethodItem{
			ID: c.ID, Revision: c.Revision, Method: c.Name(), Kind: "compliance", Title: c.Title,
			Source: c.Source, Range: c.Range, Mark: c.Mark.String(), Equations: equationItems(c.Equations),
		})
	}
	return items
}

func equationItems(equations []fastener.Equation) []EquationItem {
	var items []EquationItem
	for _, e := range equations {
		items = append(items, EquationItem{e.Number, e.Text, e.Source, e.Mark.String()})
	}
	return items
}

func optionItem(o lug.Option) OptionItem {
	item := OptionItem{Name: o.Name, Meaning: o.Meaning, Words: o.Words, Requires: text(o.Requires)}
	switch o.Kind {
	case lug.Number:
		item.Type, item.Least, item.Most = "number", &o.Least, &o.Most
		if o.HasDefault {
			item.Default = o.Default.Number
		}
	case lug.Word:
		item.Type = "string"
		if o.HasDefault {
			item.Default = o.Default.Word
		}
	case lug.Flag:
		item.Type = "boolean"
		if o.HasDefault {
			item.Default = o.Default.Flag
		}
	case lug.CurveSetRef:
		item.Type = "curve set"
		if o.HasDefault {
			item.Default = o.Default.Set.Name()
		}
	}
	return item
}

func words(modes []strength.Mode) []string {
	out := make([]string, len(modes))
	for i, m := range modes {
		out[i] = m.String()
	}
	return out
}

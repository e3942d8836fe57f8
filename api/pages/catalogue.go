package pages

import (
	"html/template"
	"maps"
	"net/http"
	"slices"

	"jointledger/service"
)

type materialsContent struct {
	Units  service.Units
	Stress string
	Items  []service.MaterialItem
}

func (p *Pages) materials(v *visit) error {
	list, err := service.Materials(v.r.URL.Query().Get("units"))
	if err != nil {
		return err
	}
	p.show(v, http.StatusOK, "materials", "Materials", materialsContent{list.Units, stressUnit(list.Units), list.Items})
	return nil
}

type fastenerTypesContent struct {
	Units                 service.Units
	Force, Stress, Length string
	Items                 []service.FastenerTypeItem
}

func (p *Pages) fastenerTypes(v *visit) error {
	list, err := service.FastenerTypes(v.r.URL.Query().Get("units"))
	if err != nil {
		return err
	}
	u := list.Units
	p.show(v, http.StatusOK, "fastener-types", "Fasteners", fastenerTypesContent{u, forceUnit(u), stressUnit(u), lengthUnit(u), list.Items})
	return nil
}

type methodsContent struct {
	Kinds []methodKind
}

type methodKind struct {
	Kind  string
	Items []service.MethodItem
}

func (p *Pages) methods(v *visit) error {
	list, err := service.Methods("")
	if err != nil {
		return err
	}
	var c methodsContent
	for _, m := range list.Items {
		i := slices.IndexFunc(c.Kinds, func(k methodKind) bool { return k.Kind == m.Kind })
		if i < 0 {
			i = len(c.Kinds)
			c.Kinds = append(c.Kinds, methodKind{Kind: m.Kind})
		}
		c.Kinds[i].Items = append(c.Kinds[i].Items, m)
	}
	p.show(v, http.StatusOK, "methods", "Methods", c)
	return nil
}

func (p *Pages) rules(v *visit) error {
	list, err := service.Rules(v.r.URL.Query().Get("units"))
	if err != nil {
		return err
	}
	p.show(v, http.StatusOK, "rules", "Layout rules", list)
	return nil
}

func (p *Pages) curveSets(v *visit) error {
	list, err := p.service.CurveSets(v.r.Context())
	if err != nil {
		return err
	}
	p.show(v, http.StatusOK, "curve-sets", "Curve sets", list)
	return nil
}

type curveSetContent struct {
	*service.CurveSetAnswer
	Charts []chartContent
}

type chartContent struct {
	Name  string
	Chart service.Chart
	Plot  template.HTML
}

func (p *Pages) curveSet(v *visit) error {
	set, err := p.service.CurveSetByName(v.r.Context(), v.r.PathValue("name"))
	if err != nil {
		return err
	}
	c := curveSetContent{CurveSetAnswer: set}
	for _, name := range slices.Sorted(maps.Keys(set.CurveSet.Charts)) {
		chart := set.CurveSet.Charts[name]
		c.Charts = append(c.Charts, chartContent{name, chart, chartPlot(&chart)})
	}
	p.show(v, http.StatusOK, "curve-set", "Curve set "+set.CurveSet.ID, c)
	return nil
}

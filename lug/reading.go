package lug

import (
	"strconv"

	"jointledger/strength"
)

// charts are the curve set of one method in use, with the material curve that
// the caller named.
type charts struct {
	set  *CurveSet
	name string // of the set
	net  []netChart
	// curve is the number of the material curve, where charts have such curves.
	curve      float64
	curveGiven bool
}

// charts takes the options curve_set and material_curve.
func (b *builder) charts() *charts {
	c := &charts{set: b.value("curve_set").Set}
	if c.set != nil {
		// A built-in set that came by way of a document is the built-in one.
		if known := builtInBy(c.set.ID); known != nil {
			c.set = known
		}
		c.name = c.set.Name()
		if c.net = c.set.net; c.net == nil {
			c.net = c.set.netFamily()
		}
		if c.set.builtIn {
			b.found.add(strength.Warning, "derived-curves", b.name, c.set.Document,
				"the chart factors are those of the built-in set %s, derived for this project: they are not the printed charts, which a reader's controlled copy must confirm", c.name)
		}
	}
	if v, ok := b.choice.Options["material_curve"]; ok {
		n, err := strconv.ParseFloat(v.Word, 64)
		c.curve, c.curveGiven = n, err == nil
	}
	return c
}

// spot is what a chart is read at: its abscissa and what tells its curves apart,
// each with its symbol in the workings.
type spot struct {
	x              float64
	along          string
	between        func(variable string) (y float64, symbol string)
	belowFirst     bool   // the first curve is a lower bound below it
	text           string // the equation, of a chart that follows a formula
	singleFallback func() // what a chart without Between still needs
}

// read takes a factor from a chart of the set and writes it under its symbol.
func (c *charts) read(s *sheet, name, symbol string, a spot) float64 {
	chart, ok := c.set.Charts[name]
	if !ok {
		s.lack(strength.Say("the curve set %s has no chart %s", c.name, name))
		return 0
	}
	return c.take(s, name, &chart, symbol, a)
}

func (c *charts) take(s *sheet, name string, chart *Chart, symbol string, a spot) float64 {
	var y float64
	var variable string
	switch chart.Between {
	case "":
		if a.singleFallback != nil {
			a.singleFallback()
		}
	case betweenCurves:
		if !c.curveGiven {
			s.lack(strength.Say("chart %s of curve set %s has one curve for each material: the option material_curve must give its number", name, c.name))
			return 0
		}
		y, variable = s.option("curve", c.curve, "input: method_options material_curve", strength.Given), "curve"
	default:
		y, variable = a.between(chart.Between)
	}
	r := chart.read(a.x, y, a.belowFirst)
	switch {
	case r.outsideOf == "":
	case r.outsideOf == chart.Between && r.from == r.upTo && a.belowFirst:
		s.lack(strength.Say("%s %.4g is above %.4g, up to which chart %s of curve set %s holds", r.outsideOf, r.found, r.upTo, name, c.name))
		return 0
	default:
		s.lack(strength.Say("%s %.4g is outside %.4g to %.4g, the range of chart %s of curve set %s", r.outsideOf, r.found, r.from, r.upTo, name, c.name))
		return 0
	}
	if r.below && chart.Between == "q" {
		s.find(strength.Note, "below-curves", name, c.set.Document,
			"q = F_tu/(E ε_u) of %.4g lies below the first curve of chart %s: the factor there, %.4g, is used as a lower bound", y, name, r.value)
	}
	mark := strength.FromCurveSet(c.name)
	s.mark = strength.Weakest(s.mark, mark)
	if !s.recording() || !s.known() {
		return r.value
	}
	source := "curve set " + c.name + ", chart " + name
	if chart.Figure != "" {
		source += " (" + chart.Figure + ")"
	}
	w := s.record.heading
	w.Mark = mark
	step := func(symbol string, value float64, equation, how string) {
		w.Symbol, w.Value, w.Equation, w.Source = symbol, value, equation, source+how
		s.keep(w)
	}
	readAt := ", read at " + a.along
	switch {
	case chart.formula != nil:
		step(symbol, r.value, a.text, "")
	case r.lo == r.hi:
		step(symbol, r.value, "", readAt)
	default:
		lo, hi := chart.Curves[r.lo].At, chart.Curves[r.hi].At
		step(symbol+",1", r.vlo, "", readAt+" on the curve "+formatted(lo))
		step(symbol+",2", r.vhi, "", readAt+" on the curve "+formatted(hi))
		step("y_"+symbol+",1", lo, "", ", its first curve")
		step("y_"+symbol+",2", hi, "", ", its second curve")
		step(symbol, r.value, symbol+",1 + ("+symbol+",2 - "+symbol+",1) ("+variable+" - y_"+symbol+",1) / (y_"+symbol+",2 - y_"+symbol+",1)", ", by straight line")
	}
	return r.value
}

func formatted(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

package lug

import "jointledger/strength"

// sheet is what a calculation is written on. The same code runs twice: once to
// find the numbers, when the sheet keeps only the weakest mark, the fields that
// were read and the first value that was missing; and again, recording, when
// somebody asks to see the steps.
type sheet struct {
	record *record // nil while only the numbers are wanted
	mark   strength.Mark
	read   fieldSet
	why    *strength.Message // the first reason for which there is no value
	found  *findings         // nil while recording: it was all said before
}

// record is what is written to be read.
type record struct {
	heading strength.Working // member, method, mode, level, load case of each step
	lines   []strength.Working
	others  int // of lines, the first ones, which are not of this record
}

// recording reports whether the steps will be read.
func (s *sheet) recording() bool { return s.record != nil }

// find says something about the joint that the calculation came across.
func (s *sheet) find(severity strength.Severity, code, subject, source, format string, args ...any) {
	if s.found != nil {
		s.found.add(severity, code, subject, source, format, args...)
	}
}

// under writes what follows as steps of another member, until the function that
// it returns is called.
func (s *sheet) under(member string) (back func()) {
	if !s.recording() {
		return func() {}
	}
	old := s.record.heading.Member
	s.record.heading.Member = member
	return func() { s.record.heading.Member = old }
}

// lack notes that the calculation has no value, and why. What is written after
// it means nothing and is not kept.
func (s *sheet) lack(why strength.Message) {
	if s.why == nil {
		s.why = &why
	}
}

// known reports whether nothing was lacking so far.
func (s *sheet) known() bool { return s.why == nil }

// apply writes the value of an equation and returns it.
func (s *sheet) apply(e *Equation, value float64) float64 {
	s.mark = strength.Weakest(s.mark, e.Mark)
	if s.recording() && s.known() {
		w := s.record.heading
		w.Symbol, w.Value, w.Unit, w.Equation, w.Source, w.Mark = e.Symbol, value, e.Unit, e.Text, e.source(), e.Mark
		s.keep(w)
	}
	return value
}

// input writes a value of the caller, which every method shares, and returns
// it. where is the field's path in the request.
func (s *sheet) input(member, symbol string, value float64, unit strength.Unit, f field) float64 {
	s.read.add(f)
	if s.recording() {
		w := strength.Working{Member: member, Symbol: symbol, Value: value, Unit: unit, Source: "input: " + f.path()}
		if f == fieldForce || f == fieldAngle {
			w.LoadCase = s.record.heading.LoadCase
		}
		s.keep(w)
	}
	return value
}

// option writes a number of the method's options.
func (s *sheet) option(symbol string, value float64, source string, mark strength.Mark) float64 {
	s.mark = strength.Weakest(s.mark, mark)
	if s.recording() {
		w := s.record.heading
		w.Mode, w.Level = 0, 0
		w.Symbol, w.Value, w.Source, w.Mark = symbol, value, source, mark
		s.keep(w)
	}
	return value
}

// property writes a value of a material under its symbol, or lacks it.
func (s *sheet) property(member string, m *strength.Material, p strength.Property, symbol string) float64 {
	value := m.Value(p)
	if value == 0 {
		s.lack(strength.Say("the material %q of the %s has no %s", m.Name, member, p))
		return 0
	}
	s.mark = strength.Weakest(s.mark, m.MarkOf(p))
	if s.recording() {
		unit := strength.Stress
		if p == strength.Nu || p == strength.Elongation {
			unit = strength.None
		}
		s.keep(strength.Working{
			Member: member, Symbol: symbol, Value: value, Unit: unit,
			Source: materialSource(m), Mark: m.MarkOf(p),
		})
	}
	return value
}

// materialSource says where a material's values stand.
func materialSource(m *strength.Material) string {
	if m.Source == "" {
		return "input: material " + m.Name
	}
	return m.Source + ": " + m.Name
}

// keep adds a line unless it stands there already.
func (s *sheet) keep(w strength.Working) {
	for i := s.record.others; i < len(s.record.lines); i++ {
		if s.record.lines[i].Symbol == w.Symbol && s.record.lines[i] == w {
			return
		}
	}
	s.record.lines = append(s.record.lines, w)
}

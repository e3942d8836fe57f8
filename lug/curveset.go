package lug

// CurveSet is a named, versioned, immutable table of a method's chart factors,
// with who read it from where and how exactly.
type CurveSet struct {
	ID, Version string
	Method      string // the id of the method whose charts these are
	Document    string
	Reader      string
	Tolerance   float64 // of the reading, relative
	Charts      map[string]Chart
}

// Name is id@version.
func (c *CurveSet) Name() string { return c.ID + "@" + c.Version }

// Chart is one figure: a factor along an abscissa, on one or more curves.
type Chart struct {
	Figure  string
	Along   string // what the abscissa is
	Between string // what tells the curves apart; empty with one curve
	Curves  []Curve
}

// Curve is one line of a chart; its range is that of its points.
type Curve struct {
	At     float64 // the value of Between
	Points [][2]float64
}

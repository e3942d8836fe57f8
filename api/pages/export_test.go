package pages

// For tests: what draws, the stylesheet, and how texts are set.
var (
	LugPlan       = lugPlan
	JointSection  = jointSection
	PatternPlan   = patternPlan
	SpliceSection = spliceSection
	MarginsPlot   = marginsPlot
	PolarPlot     = polarPlot
	ChartPlot     = chartPlot
	Number        = number
	MarginText    = margin
	EquationText  = equation
	UnitText      = unit
	CSSString     = cssString
	SafeBack      = safeBack
	Style         = string(style)
)

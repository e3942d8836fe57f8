package fastener

import (
	"slices"
	"strings"

	"jointledger/strength"
)

// Fastener is one fastener of a pattern, with its centre in the faying surface.
type Fastener struct {
	ID             string
	X, Y, Diameter float64 // mm
	HoleDiameter   float64 // mm; 0 is Diameter
	Type           *Type   // nil: sharing only
	ShearPlanes    int     // 1 or 2; 0 is 1
	// ShearStiffness and TensionStiffness are read by stiffness `given` only;
	// their ratios alone matter.
	ShearStiffness, TensionStiffness float64
	// E in MPa, Nu and Installation are read by compliance formulas.
	E, Nu        float64
	Installation string
	// SlotAngle is the direction of a slotted hole in degrees from x: along it
	// the fastener resists nothing; nil for a round hole.
	SlotAngle *float64
}

// Plate is one of the plates that the fasteners of a pattern join. The first is
// the attached member, on which the loads act.
type Plate struct {
	ID               string
	Thickness        float64            // mm
	Material         *strength.Material // nil: none given, no check
	Outline          [][2]float64       // mm, a polygon; empty: not given
	CountersinkDepth float64            // mm
	// AxisAngle is the direction in degrees from x in which the plate runs from
	// its free end to where it is held or loaded; nil: not given, then no check
	// of sections across the rows.
	AxisAngle *float64
	// LoadShare is the part of a fastener's load that this plate bears; 0 is
	// its default: 1, but for plates after the first at a fastener in double
	// shear, which are outer plates and bear half each.
	LoadShare float64
}

// Pattern is a group of fasteners through one stack of plates.
type Pattern struct {
	Stiffness   string // "equal", "area", "given" or a compliance formula
	Fasteners   []Fastener
	Plates      []Plate
	Rules       []RuleSet
	Interaction string // "" or of InteractionWords
	InPlane     string // "" or "elastic", or "instantaneous-centre" at ultimate
	OutOfPlane  string // "" or "centroid", or "heel" about plates[0]'s outline
	// Methods of strength, of StrengthMethods; none is "elementary".
	Methods []string
	AISC    AISCOptions
	EN      ENOptions
	// PackingThickness in mm is that of the packing or fillers at the shear
	// plane, which reduces the shear of some methods.
	PackingThickness float64
}

// PatternCase is one load on the attached member, at Point.
type PatternCase struct {
	ID                   string
	Level                strength.Level
	Point, Force, Moment [3]float64 // mm, N, N·mm
}

// Share is what one fastener takes of a load case, before factors: the shear
// that the attached member puts on it, and its tension, positive when a force
// along +z stretches it.
type Share struct {
	Shear              [2]float64
	Resultant, Tension float64
}

// PreparedPattern is a pattern ready for any number of load cases.
type PreparedPattern struct {
	pattern     Pattern
	factors     strength.Factors
	cases       []PatternCase
	sharing     *elastic
	centre      *instantaneous // nil unless asked for and possible
	loads       []centred
	outlines    [][]side
	rows        []*rows   // of each plate, nil without an axis
	extent      float64   // the longest distance between fasteners along their line
	near        [][]int32 // the neighbours that clear distances may meet
	checks      []strength.Check
	assessments []assessment
	state       caseState
	findings    []strength.Finding
}

// caseState is what the assessments of one load case read.
type caseState struct {
	index int
	level strength.Level
	// shares for the checks at each level: the same elastic ones, but those at
	// ultimate where the instantaneous centre gives them.
	shares   [strength.Ultimate + 1][]Share
	ultimate atUltimate
}

// assessment compares one demand with one allowable in every load case.
type assessment interface {
	check() strength.Check
	margin(c *caseState) strength.Margin
	// steps are the static workings, caseSteps those of load case i with its
	// state; both without place and method, which the pattern stamps.
	steps() []strength.Working
	caseSteps(c *caseState, i int) []strength.Working
}

// PreparePattern prepares a pattern for its load cases, or says everything that
// keeps it from being calculated.
func PreparePattern(p Pattern, f strength.Factors, cases []PatternCase) (*PreparedPattern, []strength.Fault) {
	prepared := &PreparedPattern{pattern: p, factors: f, cases: cases, outlines: make([][]side, len(p.Plates))}
	faults := prepared.inputFaults()
	if len(p.Fasteners) == 0 {
		return nil, append(faults, strength.Fault{Pointer: "/fasteners", Message: strength.Say("a pattern needs at least one fastener")})
	}
	near := NearestNeighbours(p.Fasteners)
	faults = append(faults, coincidenceFaults(p.Fasteners, near)...)
	if len(faults) > 0 {
		return nil, faults
	}
	weights, faults := patternWeights(p)
	if len(faults) > 0 {
		return nil, faults
	}
	prepared.sharing = newElastic(p, weights)
	prepared.loads = make([]centred, len(cases))
	for i, c := range cases {
		load, fault := prepared.sharing.centre(c, i)
		if !fault.Message.Empty() {
			faults = append(faults, fault)
		}
		prepared.loads[i] = load
	}
	if len(faults) > 0 {
		return nil, faults
	}
	prepared.extent = prepared.sharing.length
	edges := prepared.edgeDistances()
	prepared.addAssessments(edges)
	prepared.checks = make([]strength.Check, len(prepared.assessments))
	for i, a := range prepared.assessments {
		prepared.checks[i] = a.check()
	}
	shares := make([]Share, len(p.Fasteners))
	prepared.state.shares = [...][]Share{nil, shares, shares}
	if prepared.centre != nil {
		prepared.state.shares[strength.Ultimate] = make([]Share, len(p.Fasteners))
	}
	prepared.findings = prepared.allFindings(edges, near)
	return prepared, nil
}

// edgeDistances returns, for each plate with an outline, the edge distance of
// each fastener; nil for a plate without.
func (p *PreparedPattern) edgeDistances() [][]edgeDistance {
	edges := make([][]edgeDistance, len(p.pattern.Plates))
	for k, outline := range p.outlines {
		if outline == nil {
			continue
		}
		edges[k] = make([]edgeDistance, len(p.pattern.Fasteners))
		for i, f := range p.pattern.Fasteners {
			e, which, along := nearest(outline, f.X, f.Y)
			edges[k][i] = edgeDistance{e: e, side: outline[which], along: along}
		}
	}
	return edges
}

// The words of Pattern.Methods.
const (
	wordElementary = "elementary"
	wordAISC       = "aisc-360-j3"
	wordEN         = "en-1993-1-8"
)

// StrengthMethods returns the words of a pattern's methods of strength.
func StrengthMethods() []string { return []string{wordElementary, wordAISC, wordEN} }

// FindStrength finds a word of StrengthMethods by "word", its latest revision,
// or by "word@revision". Pinned is the latter, as records carry it: "elementary"
// stands for those of Methods that are its checks, which have the same revision.
func FindStrength(name string) (word, pinned string, ok bool) {
	const revision = "1" // each has had one only
	word, given, isPinned := strings.Cut(name, "@")
	ok = slices.Contains(StrengthMethods(), word) && (!isPinned || given == revision)
	return word, word + "@" + revision, ok
}

// addAssessments lists the checks in the order of answers: the pattern as a
// whole, then each fastener and the plates at it, by the methods in the order
// asked for.
func (p *PreparedPattern) addAssessments(edges [][]edgeDistance) {
	if p.pattern.InPlane == inPlaneCentre {
		p.addCentre()
	}
	methods := p.pattern.Methods
	if len(methods) == 0 {
		methods = []string{wordElementary}
	}
	if slices.Contains(methods, wordAISC) {
		p.near = neighbourhoods(p.pattern.Fasteners)
	}
	p.rows = make([]*rows, len(p.pattern.Plates))
	for k := range p.rows {
		if slices.Contains(methods, wordElementary) {
			p.rows[k] = p.newRows(k)
		}
	}
	for i := range p.pattern.Fasteners {
		if p.pattern.Fasteners[i].Type != nil {
			for _, m := range methods {
				switch m {
				case wordElementary:
					p.addElementaryFastener(i)
				case wordAISC:
					p.addAISCFastener(i)
				case wordEN:
					p.addENFastener(i)
				}
			}
			p.addPreload(i)
			p.addPullThrough(i)
		}
		for k := range p.pattern.Plates {
			for _, m := range methods {
				switch m {
				case wordElementary:
					p.addNetSections(i, k)
					p.addShearOut(i, k)
					p.addBearing(i, k, edges[k])
					p.addBlock(i, k)
					p.addBuckling(i, k)
				case wordAISC:
					p.addAISCBearing(i, k)
				case wordEN:
					p.addENPlate(i, k)
				}
			}
		}
	}
}

// Centroid returns the centroid of the shear stiffness, in mm.
func (p *PreparedPattern) Centroid() [2]float64 { return [2]float64{p.sharing.xc, p.sharing.yc} }

// Shares fills out, one for each fastener in order, with the shares of load
// case i at the level given, before factors; by the instantaneous centre, a case
// given at ultimate has those at its ultimate value, scaled to it. The residual
// is the largest error of equilibrium relative to the load. It allocates
// nothing and may be called from one goroutine at a time.
func (p *PreparedPattern) Shares(i int, out []Share) (residual float64) {
	residual = p.sharing.share(p.loads[i], out)
	if p.centre != nil && p.cases[i].Level == strength.Ultimate {
		p.centre.share(p.sharing, p.loads[i], out)
		residual = p.sharing.settleShears(p.loads[i], out)
	}
	return residual
}

// Checks implements strength.Calculation.
func (p *PreparedPattern) Checks() []strength.Check { return p.checks }

// Margins implements strength.Calculation.
func (p *PreparedPattern) Margins(i int, out []strength.Margin) {
	p.enter(i)
	for c, a := range p.assessments {
		out[c] = a.margin(&p.state)
	}
}

func (p *PreparedPattern) enter(i int) {
	s := &p.state
	s.index, s.level = i, p.cases[i].Level
	elastic := s.shares[strength.Limit]
	p.sharing.share(p.loads[i], elastic)
	if p.centre != nil {
		ultimate := s.shares[strength.Ultimate]
		copy(ultimate, elastic)
		s.ultimate = p.centre.share(p.sharing, p.loads[i], ultimate)
		p.sharing.settleShears(p.loads[i], ultimate)
	}
	for _, r := range p.rows {
		if r == nil {
			continue
		}
		r.sum(strength.Limit, p, elastic)
		r.sum(strength.Ultimate, p, s.shares[strength.Ultimate])
	}
}

// Workings implements strength.Calculation. Steps of the sharing have the
// member "pattern" and no mode: they are the same in every check.
func (p *PreparedPattern) Workings(c int, steps []strength.Working) []strength.Working {
	return append(steps, p.stamp(c, "", p.assessments[c].steps())...)
}

// CaseWorkings implements strength.Calculation.
func (p *PreparedPattern) CaseWorkings(i, c int, steps []strength.Working) []strength.Working {
	p.enter(i)
	return append(steps, p.stamp(c, p.cases[i].ID, p.assessments[c].caseSteps(&p.state, i))...)
}

// stamp writes the place of a check into steps that have none of their own.
func (p *PreparedPattern) stamp(c int, loadCase string, steps []strength.Working) []strength.Working {
	check := p.checks[c]
	for i := range steps {
		s := &steps[i]
		s.LoadCase = loadCase
		if s.Member != "" {
			continue
		}
		s.Member, s.Fastener, s.Method, s.Mode, s.Level = check.Member, check.Fastener, check.Method, check.Mode, check.Level
	}
	return steps
}

// Findings implements strength.Calculation.
func (p *PreparedPattern) Findings() []strength.Finding { return p.findings }

// Cautions implements strength.Calculation.
func (p *PreparedPattern) Cautions() []string {
	cautions := []string{
		"The attached member is taken as rigid: prying and the flexibility of flanges and plates are left out and may raise the tension and shear of single fasteners.",
		"Each fastener is taken to fill its hole and to share by stiffness alone: clearances, friction and yielding are left out.",
	}
	// 3 D: common practice, no source.
	if slices.ContainsFunc(p.checks, func(c strength.Check) bool { return c.Mode == strength.ShearOut }) {
		cautions = append(cautions, "Shear-out runs to the outline as if no other hole stood in its way: where fasteners follow each other along the load at less than 3 D, it is not on the safe side; a rule of pitch tells.")
	}
	if p.centre != nil {
		cautions = append(cautions, "The curve of the instantaneous centre was measured on high-strength steel bolts in bearing; for other fasteners its shares at ultimate are an assumption.")
	}
	if p.sharing.heel != nil {
		cautions = append(cautions, "The attached member is taken to turn about its outline on a rigid support: a flexible foot bears nearer to the fasteners, which raises their tension.")
	}
	return cautions
}

// The members of a pattern's workings and checks that are no plate.
const (
	memberPattern  = "pattern"
	memberFastener = "fastener"
)

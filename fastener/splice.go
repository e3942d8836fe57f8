package fastener

import (
	"jointledger/strength"
)

// Member is one layer of a splice: a plate that runs through consecutive rows.
type Member struct {
	ID       string
	E        float64            // MPa
	Material *strength.Material // nil: none given, no check
	// FirstRow and LastRow count from 1; zero is the first and the last row of
	// the splice.
	FirstRow, LastRow int
	// RowThickness is the thickness in mm at each of the member's rows, read
	// by compliance formulas and by bearing; it may be empty.
	RowThickness []float64
	// Bays lie between the member's rows, one fewer than they are.
	Bays      []Bay
	Expansion float64 // per degree
	// EdgeDistance is the least from the centre of a hole to the member's edge
	// that the fastener is pressed towards, mm; bearing needs it. 0: not given.
	EdgeDistance float64
	// CountersinkDepth in mm of the member's holes.
	CountersinkDepth float64
}

// Bay is the part of a member between two rows.
type Bay struct {
	Thickness, Width float64 // mm
}

// Row is one row of Count equal fasteners side by side.
type Row struct {
	Count        int     // 0 is 1
	Diameter     float64 // mm
	E, Nu        float64 // MPa and Poisson's ratio of the fastener; 0: not given
	Installation string  // of Installations; empty is Bolted
	// Compliance of one fastener through one interface, mm/N on the fastener's
	// load there; read when the splice's compliance is given.
	Compliance float64
	// Clearance is the diameter of the holes less that of the fastener, mm. The
	// fastener stands in the middle of its holes before it is loaded, so the
	// members at an interface slip by Clearance, either way, before it bears.
	Clearance float64
	Type      *Type // nil: sharing only
	// ShearPlanes of one fastener share the load of an interface: 1 or 2; 0 is
	// 2 in a symmetric joint, else 1.
	ShearPlanes int
}

// Splice is a stack of members joined by rows of fasteners. The fasteners of a
// row join the members that are neighbours there; a member that is absent from
// a row is passed over.
type Splice struct {
	Members []Member  // in stacking order
	Pitches []float64 // mm between consecutive rows
	Rows    []Row
	// Compliance is ComplianceGiven or the name of a formula, and
	// CompareCompliance more of them, to be run beside it.
	Compliance        string
	CompareCompliance []string
	// Symmetric tells that the members given are the middle one, whole, and one
	// of two equal straps, in this order, of a joint in double shear. Loads and
	// compliances are those of the whole joint and of the whole fastener.
	Symmetric bool
}

// SpliceCase is one set of end loads, and of changes of temperature.
type SpliceCase struct {
	ID    string
	Level strength.Level
	// Ends are the end loads; a member that is not named carries none.
	Ends         []End
	Temperatures []TemperatureChange
}

// End holds the loads on a member's ends in N, tension positive.
type End struct {
	Member      string
	Left, Right float64
}

// TemperatureChange of a whole member, in the degrees of its Expansion.
type TemperatureChange struct {
	Member string
	Change float64
}

// Transfers is how a load case goes through the rows.
type Transfers struct {
	// Through is the load through the joint, half the sum of all end loads'
	// sizes, to which the shares refer.
	Through float64
	// Interfaces and Members go row by row, and through each row in stacking
	// order.
	Interfaces []InterfaceLoad
	Members    []MemberLoad
	// Residual is the largest error of equilibrium at any member and row, or of
	// compatibility around any bay turned into a load, over the load through.
	Residual float64
	// Contact tells how clearances were taken up.
	Contact Contact
}

// InterfaceLoad is what the fasteners of a row pass between two members.
type InterfaceLoad struct {
	Row           int // from 1
	First, Second int // indices of members
	// Load is the tension in N that the row takes out of First and puts into
	// Second, going from left to right.
	Load float64
	// Share is Load over the load through the joint, positive the way that the
	// rows between these two members carry together; 0 without end loads.
	Share float64
}

// MemberLoad is what a row does to a member. Bypass is the member's load on
// the row's less loaded side, and Bearing the load of all fasteners of the row
// on it, with the sign that makes Bypass + Bearing the load on the more loaded
// side. Both in N, tension positive.
type MemberLoad struct {
	Row             int // from 1
	Member          int // index
	Bearing, Bypass float64
	// BearingStress is Bearing over the fasteners' D t, and BypassStress is
	// Bypass over the gross w t, MPa with the signs of the loads; HasStress
	// tells that the row's thickness and a bay beside it were given.
	BearingStress, BypassStress float64
	HasStress                   bool
}

// PreparedSplice is a splice whose equations are factored, ready for any
// number of load cases. It implements strength.Calculation and may be used from
// one goroutine at a time.
type PreparedSplice struct {
	splice   Splice
	factors  strength.Factors
	cases    []preparedCase
	stack    *stack
	main     solver
	solved   int // the case whose solution main holds, -1 for none
	compared []comparedSolver
	plastic  *plasticSharing // nil where there is none

	complianceMark strength.Mark
	unsettled      strength.Message
	rowChecks      []rowCheck
	checks         []strength.Check
	findings       []strength.Finding
}

// comparedSolver is the splice with another compliance.
type comparedSolver struct {
	name string
	solver
}

// preparedCase is a load case by index of member.
type preparedCase struct {
	id          string
	level       strength.Level
	left, right []float64 // N, nil without end loads
	change      []float64 // nil without changes of temperature
	through     float64   // half the sum of all end loads' sizes
}

// PrepareSplice checks a splice and its load cases, finds the compliances and
// factors the equations. The faults are all that stand in the way, each with a
// pointer into the request; with any of them there is no prepared splice.
func PrepareSplice(s Splice, f strength.Factors, cases []SpliceCase) (*PreparedSplice, []strength.Fault) {
	s = s.withDefaults()
	p := &PreparedSplice{splice: s, factors: f, solved: -1}
	faults := s.sizeFaults()
	var unsound faultList
	p.cases, unsound = prepareCases(&s, cases)
	if len(faults) > 0 {
		return nil, append(faults, unsound...)
	}
	p.stack = newStack(&s)
	faults = append(faults, s.pathFaults(p.stack)...)
	p.chooseCompliances(&faults)
	if faults = append(faults, unsound...); len(faults) > 0 {
		return nil, faults
	}
	if faults = p.prepareSolvers(); len(faults) > 0 {
		return nil, faults
	}
	p.plastic = newPlastic(p.stack, &p.splice)
	p.complianceMark = p.markOfCompliance()
	p.addChecks()
	p.findings = p.allFindings()
	return p, nil
}

// chooseCompliances checks the compliances that were asked for.
func (p *PreparedSplice) chooseCompliances(faults *faultList) {
	var missing faultList
	p.main.why, missing = p.splice.complianceFaults(p.splice.Compliance, "/compliance")
	faults.merge(missing)
	p.compared = make([]comparedSolver, len(p.splice.CompareCompliance))
	for i, name := range p.splice.CompareCompliance {
		c := &p.compared[i]
		c.name = name
		c.why, missing = p.splice.complianceFaults(name, splicePointer("compare_compliance", i))
		faults.merge(missing)
	}
}

// prepareSolvers factors the equations for each compliance.
func (p *PreparedSplice) prepareSolvers() (faults faultList) {
	prepare := func(v *solver, name string) {
		if !v.why.Empty() {
			return
		}
		c, none := p.stack.compliances(&p.splice, name)
		if len(none) == 0 {
			none = v.prepare(p.stack, &p.splice, c)
		}
		faults.merge(none)
	}
	prepare(&p.main, p.splice.Compliance)
	for i := range p.compared {
		prepare(&p.compared[i].solver, p.compared[i].name)
	}
	return faults
}

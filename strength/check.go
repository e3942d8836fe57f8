// Package strength holds the words that every joint calculation speaks:
// materials, factors, checks with their margins of safety, workings that let a
// reader follow each number by hand, and findings.
//
// Everything is pure and in N, mm and MPa. Values go in, values come out; an
// input that cannot be calculated is a Fault, a value that is missing leaves
// its checks Undetermined, and nothing panics.
package strength

// Level tells limit from ultimate, of a load and of a check.
type Level uint8

// The levels; zero is neither.
const (
	Limit Level = iota + 1
	Ultimate
)

// String returns the level's word, empty for none.
func (l Level) String() string {
	switch l {
	case Limit:
		return "limit"
	case Ultimate:
		return "ultimate"
	}
	return ""
}

// Mode is a way to fail. The order of the constants is the order of answers.
type Mode uint8

// The modes; zero is none.
const (
	NetSection Mode = iota + 1
	ShearOut
	Bearing
	ShearBearing
	Fracture
	Transverse
	Oblique
	Yielding
	BushingBearing
	Tang
	BodyBending
	PinShear
	PinBending
	PinCombined
	WholeJoint
	Shear
	Tension
	ShearTension
	Slip
	Separation
	BlockTearing
	InterFastenerBuckling
	PullThrough
)

var modeWords = [...]string{
	"", "net-section", "shear-out", "bearing", "shear-bearing", "fracture",
	"transverse", "oblique", "yielding", "bushing-bearing", "tang",
	"body-bending", "pin-shear", "pin-bending", "pin-combined", "joint",
	"shear", "tension", "shear-tension", "slip", "separation",
	"block-tearing", "inter-fastener-buckling", "pull-through",
}

// String returns the mode's word, empty for none.
func (m Mode) String() string { return modeWords[m] }

// Modes returns all modes in their order.
func Modes() []Mode {
	all := make([]Mode, 0, len(modeWords)-1)
	for m := NetSection; int(m) < len(modeWords); m++ {
		all = append(all, m)
	}
	return all
}

// Check is what no load case changes of one comparison of a demand with an
// allowable: its place in the joint, its mode and where its method comes from.
type Check struct {
	Member   string
	Fastener string // id in a pattern, else empty
	Row      int    // from 1 in a splice, else 0
	Mode     Mode
	Level    Level
	Unit     Unit
	Method   string // id@revision
	Source   string // document, section, equation
	Mark     Mark   // the weakest mark of all its workings
	Compared bool   // counts neither for the verdict nor as governing
}

// Status is how a check came out.
type Status uint8

// The statuses, from best to worst for a verdict; the zero status is a mode
// that the load does not exercise, which answers leave out.
const (
	NotExercised Status = iota
	Adequate
	Undetermined
	Inadequate
)

// String returns the status's word.
func (s Status) String() string {
	switch s {
	case Adequate:
		return "adequate"
	case Inadequate:
		return "inadequate"
	}
	return "undetermined"
}

// Margin is what one load case makes of a check. Demand, Allowable and Margin
// mean nothing when the status is Undetermined or NotExercised.
type Margin struct {
	Demand, Allowable, Margin float64
	Status                    Status
	Why                       *Message // of an undetermined check
}

// Compare sets a demand against an allowable, both of the same unit and not
// negative: margin = allowable / demand - 1. A demand of zero, or one so small
// that the margin has no number, does not exercise the check.
func Compare(demand, allowable float64) Margin {
	margin := allowable/demand - 1
	// The difference is not zero when the margin is infinite or no number.
	if !(demand > 0) || margin-margin != 0 {
		return Margin{}
	}
	status := Adequate
	if margin < 0 {
		status = Inadequate
	}
	return Margin{Demand: demand, Allowable: allowable, Margin: margin, Status: status}
}

// Unknown makes an undetermined margin.
func Unknown(why *Message) Margin { return Margin{Status: Undetermined, Why: why} }

// Working is one step of the hand calculation behind a check. Fields that do
// not apply are zero: an input that several modes share has no mode, a value
// that no load case changes no load case.
type Working struct {
	Member, Fastener string
	Row              int
	Method           string
	Mode             Mode
	Level            Level
	LoadCase         string
	Symbol           string
	Value            float64
	Unit             Unit
	Equation, Source string
	Mark             Mark
}

// Severity ranks a finding.
type Severity uint8

// The severities.
const (
	Violation Severity = iota + 1
	Warning
	Note
)

// String returns the severity's word.
func (s Severity) String() string {
	switch s {
	case Violation:
		return "violation"
	case Warning:
		return "warning"
	}
	return "note"
}

// Finding is something a user must be told that is not a margin.
type Finding struct {
	Severity Severity
	Code     string
	Subject  string
	Message  Message
	Source   string
}

// Fault is an input that cannot be calculated: where it stands, as a JSON
// pointer into the document of its kind, and what was found and is allowed.
type Fault struct {
	Pointer string
	Message Message
}

// Calculation is a joint prepared for any number of load cases.
type Calculation interface {
	// Checks returns the checks in the order of answers. Not to be changed.
	Checks() []Check
	// Margins fills out, one for each check, for load case i. It allocates
	// nothing and may be called from one goroutine at a time.
	Margins(i int, out []Margin)
	// Workings appends to steps those behind check c that no load case changes.
	Workings(c int, steps []Working) []Working
	// CaseWorkings appends to steps those behind check c that load case i
	// makes, the demand and its factors among them.
	CaseWorkings(i, c int, steps []Working) []Working
	// Findings returns what is to be said about the joint and its load cases.
	Findings() []Finding
	// Cautions returns what the calculation leaves to the user.
	Cautions() []string
}

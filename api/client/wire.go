package client

import "jointledger/service/strictjson"

// Raw is a JSON value as it came.
type Raw = strictjson.Raw

// Kind is a sort of joint.
type Kind string

// The kinds of joint.
const (
	Lug           Kind = "lug"
	FastenerGroup Kind = "fastener-group"
	Splice        Kind = "splice"
)

// View says how much of an answer is wanted; the zero value is the server's
// default.
type View struct {
	NoWorkings bool
	Checks     string // all or governing
}

// Result is the answer to a calculation, in the units of its question.
type Result struct {
	Verdict     string         `json:"verdict"`   // adequate, inadequate, undetermined
	Governing   *Check         `json:"governing"` // nil where no check has a margin
	ByMethod    []MethodResult `json:"by_method"`
	Margins     []CaseMargin   `json:"margins"`
	Checks      []Check        `json:"checks"`
	Workings    []Working      `json:"workings"`
	Findings    []Finding      `json:"findings"`
	Cautions    []string       `json:"cautions"`
	Shares      Raw            `json:"shares"`    // of a fastener pattern, else nil
	Centroid    *[2]float64    `json:"centroid"`  // of a fastener pattern, else nil
	Transfers   Raw            `json:"transfers"` // of a splice, else nil
	Options     Raw            `json:"method_options"`
	Engine      string         `json:"engine"`
	InputDigest string         `json:"input_digest"`
}

// MethodResult is the verdict and least margin by one method.
type MethodResult struct {
	Method   string   `json:"method"`
	Verdict  string   `json:"verdict"`
	Margin   *float64 `json:"margin"`
	Compared bool     `json:"compared"`
}

// CaseMargin is the least margin in one load case.
type CaseMargin struct {
	LoadCase string   `json:"load_case"`
	Margin   *float64 `json:"margin"`
	Status   string   `json:"status"`
}

// Check is one comparison of a demand with an allowable. Demand, Allowable and
// Margin are nil where the check is undetermined.
type Check struct {
	Member        string   `json:"member"`
	Fastener      *string  `json:"fastener"`
	Row           *int     `json:"row"`
	Mode          string   `json:"mode"`
	Level         string   `json:"level"`
	LoadCase      string   `json:"load_case"`
	Unit          string   `json:"unit"`
	Demand        *float64 `json:"demand"`
	Allowable     *float64 `json:"allowable"`
	Margin        *float64 `json:"margin"`
	NominalMargin *float64 `json:"nominal_margin"`
	Status        string   `json:"status"`
	Message       *string  `json:"message"`
	Method        string   `json:"method"`
	Source        string   `json:"source"`
	Mark          string   `json:"mark"`
	Compared      bool     `json:"compared"`
}

// Working is one step of the hand calculation.
type Working struct {
	Member   string  `json:"member"`
	Fastener *string `json:"fastener"`
	Row      *int    `json:"row"`
	Method   *string `json:"method"`
	Mode     *string `json:"mode"`
	Level    *string `json:"level"`
	LoadCase *string `json:"load_case"`
	Symbol   string  `json:"symbol"`
	Value    float64 `json:"value"`
	Unit     string  `json:"unit"`
	Equation *string `json:"equation"`
	Source   *string `json:"source"`
	Mark     string  `json:"mark"`
}

// Finding is something to be told that is not a margin.
type Finding struct {
	Severity string  `json:"severity"` // violation, warning, note
	Code     string  `json:"code"`
	Subject  string  `json:"subject"`
	Message  string  `json:"message"`
	Source   *string `json:"source"`
}

// Subject is what a record is about. Aspect may be empty.
type Subject struct {
	Part     string `json:"part"`
	Revision string `json:"revision"`
	Joint    string `json:"joint"`
	Aspect   string `json:"aspect,omitzero"`
}

// RecordRequest asks for a calculation to be put on record. Input is anything
// that is written as the JSON of its kind.
type RecordRequest struct {
	Subject        Subject `json:"subject"`
	GeometryDigest string  `json:"geometry_digest"`
	Kind           Kind    `json:"kind"`
	Input          any     `json:"input"`
	Note           string  `json:"note,omitzero"`
}

// Record is a calculation in the ledger. Input is the resolved one: defaults
// and catalogues' values written out.
type Record struct {
	ID             string      `json:"id"`
	Index          int64       `json:"index"`
	RecordedAt     string      `json:"recorded_at"`
	Author         string      `json:"author"`
	Subject        Subject     `json:"subject"`
	GeometryDigest string      `json:"geometry_digest"`
	Kind           Kind        `json:"kind"`
	Note           string      `json:"note"`
	Input          Raw         `json:"input"`
	Result         Result      `json:"result"`
	InputDigest    string      `json:"input_digest"`
	RecordDigest   string      `json:"record_digest"`
	State          string      `json:"state"` // recorded, checked, approved, withdrawn
	SignOffs       []SignOff   `json:"sign_offs"`
	Withdrawal     *Withdrawal `json:"withdrawal"`
}

// SignOff is a signature under a record.
type SignOff struct {
	ID        string `json:"id"`
	Index     int64  `json:"index"`
	At        string `json:"at"`
	Author    string `json:"author"`
	Role      string `json:"role"` // checked, approved
	Statement string `json:"statement"`
}

// Withdrawal takes a record back.
type Withdrawal struct {
	ID     string `json:"id"`
	Index  int64  `json:"index"`
	At     string `json:"at"`
	Author string `json:"author"`
	Reason string `json:"reason"`
}

// Appended is what became of a sign-off or a withdrawal.
type Appended struct {
	ID    string `json:"id"`
	Index int64  `json:"index"`
	At    string `json:"at"`
	State string `json:"state"` // of the record now
}

// RecordSummary is a record in a list.
type RecordSummary struct {
	ID             string   `json:"id"`
	Index          int64    `json:"index"`
	RecordedAt     string   `json:"recorded_at"`
	Author         string   `json:"author"`
	Subject        Subject  `json:"subject"`
	GeometryDigest string   `json:"geometry_digest"`
	Kind           Kind     `json:"kind"`
	Verdict        string   `json:"verdict"`
	Margin         *float64 `json:"margin"`
	RecordDigest   string   `json:"record_digest"`
	State          string   `json:"state"`
}

// RecordFilter selects records; an empty field selects all.
type RecordFilter struct {
	Part, Revision, Joint, Verdict, State string
	Kind                                  Kind
	Author, Method, Material, CurveSet    string
	Since, Until                          string // RFC 3339, inclusive and exclusive
	// Latest keeps only the latest per part, revision, joint, aspect and kind.
	Latest bool
	// PageSize is how many are fetched at a time, 1 to 500; the server's
	// default when 0.
	PageSize int
}

// Replay is what became of a record when it was computed again.
type Replay struct {
	// Recorded is the recorded input by the recorded methods.
	Recorded struct {
		Reproduced        bool     `json:"reproduced"`
		LargestDifference *float64 `json:"largest_difference"`
	} `json:"recorded"`
	// Current is the recorded input by the methods of today.
	Current struct {
		Reproduced        bool     `json:"reproduced"`
		Verdict           string   `json:"verdict"`
		Margin            *float64 `json:"margin"`
		LargestDifference *float64 `json:"largest_difference"`
	} `json:"current"`
}

// ReleaseRequest asks whether a part may be released.
type ReleaseRequest struct {
	Part     string         `json:"part"`
	Revision string         `json:"revision"`
	Joints   []ReleaseJoint `json:"joints"`          // 1 to 1,000
	Policy   string         `json:"policy,omitzero"` // the default one when empty
}

// ReleaseJoint is a joint with the digest of its geometry as it is now.
type ReleaseJoint struct {
	Joint          string `json:"joint"`
	GeometryDigest string `json:"geometry_digest"`
}

// The decisions of the gate.
const (
	Release = "release"
	Hold    = "hold"
)

// Decision is what the gate answers. ID and Index are nil for a dry run.
type Decision struct {
	ID           *string          `json:"id"`
	Index        *int64           `json:"index"`
	At           string           `json:"at"`
	Decision     string           `json:"decision"`
	Policy       string           `json:"policy"`
	PolicyDigest string           `json:"policy_digest"`
	Findings     []ReleaseFinding `json:"findings"`
}

// ReleaseFinding is one reason to hold.
type ReleaseFinding struct {
	Joint   string  `json:"joint"`
	Code    string  `json:"code"`
	Message string  `json:"message"`
	Record  *string `json:"record"`
}

// Part is what the ledger says of a part: the latest record of each joint,
// aspect and kind, by revision, newest first.
type Part struct {
	Part      string `json:"part"`
	Revisions []struct {
		Revision string          `json:"revision"`
		Records  []RecordSummary `json:"records"`
	} `json:"revisions"`
	Complete bool `json:"complete"` // false where the part has more joints than are listed
}

// Withdrawn names the one thing that does not hold any more.
type Withdrawn struct {
	Material string `json:"material,omitzero"`
	Method   string `json:"method,omitzero"`    // with or without its revision
	CurveSet string `json:"curve_set,omitzero"` // with or without its version
	Record   string `json:"record,omitzero"`
}

// Impact is what rests on something: records, newest first, and the decisions
// of the gate that rest on those.
type Impact struct {
	Records    []RecordSummary  `json:"records"`
	Decisions  []ImpactDecision `json:"decisions"`
	NextCursor *string          `json:"next_cursor"`
}

// ImpactDecision is a decision with those of the records that it rests on.
type ImpactDecision struct {
	ID       string   `json:"id"`
	Index    int64    `json:"index"`
	At       string   `json:"at"`
	Author   string   `json:"author"`
	Part     string   `json:"part"`
	Revision string   `json:"revision"`
	Decision string   `json:"decision"`
	Records  []string `json:"records"`
}

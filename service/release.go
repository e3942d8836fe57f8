package service

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"sync"
	"time"
	"unicode"

	"jointledger/service/ledger"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// releaseRequest is what a vault's check-in hook asks.
type releaseRequest struct {
	Part     string         `json:"part" validate:"id"`
	Revision string         `json:"revision" validate:"id"`
	Joints   []releaseJoint `json:"joints" validate:"min=1,max=1000,dive"`
	Policy   *string        `json:"policy,omitzero" validate:"omitnil,id"`
}

// releaseJoint is a joint with its geometry as the vault has it now.
type releaseJoint struct {
	Joint          string `json:"joint" validate:"id"`
	GeometryDigest string `json:"geometry_digest" validate:"id"`
}

// Decision is what the gate answers.
type Decision struct {
	ID           *string          `json:"id"`    // null for a dry run
	Index        *int64           `json:"index"` // null for a dry run
	At           string           `json:"at"`
	Decision     string           `json:"decision"`
	Policy       string           `json:"policy"`
	PolicyDigest string           `json:"policy_digest"`
	Findings     []ReleaseFinding `json:"findings"`
}

// The decisions.
const (
	Release = "release"
	Hold    = "hold"
)

// Text writes a decision in plain lines, the first of them release or hold.
func (d *Decision) Text() string {
	var b strings.Builder
	b.WriteString(d.Decision + "\n")
	for _, f := range d.Findings {
		line := f.Joint + ": " + f.Code + ": " + f.Message
		if f.Record != nil {
			line += " [record " + *f.Record + "]"
		}
		// What a caller wrote must not end a line or steer a terminal.
		b.WriteString(strings.Map(func(r rune) rune {
			if unicode.IsControl(r) {
				return ' '
			}
			return r
		}, line) + "\n")
	}
	return b.String()
}

// ReleaseFinding is one reason to hold.
type ReleaseFinding struct {
	Joint   string  `json:"joint"`
	Code    string  `json:"code"`
	Message string  `json:"message"`
	Record  *string `json:"record"`
}

const entryDecision = "release-decision"

// decisionBody is the body of a decision's entry.
type decisionBody struct {
	Part         string           `json:"part"`
	Revision     string           `json:"revision"`
	Joints       []releaseJoint   `json:"joints"`
	Decision     string           `json:"decision"`
	Policy       Policy           `json:"policy"`
	PolicyDigest string           `json:"policy_digest"`
	Findings     []ReleaseFinding `json:"findings"`
	// Records are those that the decision rests on, with their digests.
	Records []decisionRecord `json:"records"`
}

type decisionRecord struct {
	ID     string `json:"id"`
	Digest string `json:"record_digest"`
	State  State  `json:"state"`
}

// errAltered says that what the store has of an entry is not what was signed.
// It is answered as unavailable: no decision rests on altered rows.
var errAltered = fmt.Errorf("%w: the ledger's rows are not those that were signed", ErrUnavailable)

// Judge decides whether a part may be released. A dry run appends nothing.
func (s *Service) Judge(ctx context.Context, caller Caller, body []byte, dryRun bool, idempotency Idempotency) (*Decision, bool, error) {
	var request releaseRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, false, malformed(err, "")
	}
	return s.judgeRequest(ctx, caller, &request, dryRun, idempotency)
}

func (s *Service) judgeRequest(ctx context.Context, caller Caller, request *releaseRequest, dryRun bool, idempotency Idempotency) (*Decision, bool, error) {
	setDefault(&request.Policy, DefaultPolicy)
	var f faults
	f.check(request)
	first := map[string]bool{}
	for i, j := range request.Joints {
		if first[j.Joint] {
			f.add(pointer("joints", i, "joint"), "the joint %.80q is named twice", j.Joint)
		}
		first[j.Joint] = true
	}
	policy, known := s.policies[*request.Policy]
	if !known && isID(*request.Policy) {
		f.add("/policy", "there is no policy %.80q on this server", *request.Policy)
	}
	if found := f.problem(); found != nil {
		return nil, false, found
	}
	digest, err := policy.digest()
	if err != nil {
		return nil, false, err
	}
	for range mostJudgements {
		decision, again, err := s.judgeOnce(ctx, caller, request, policy, digest, dryRun, idempotency)
		if !errors.Is(err, errMoved) {
			return decision, again, s.fail(err)
		}
	}
	return nil, false, s.fail(fmt.Errorf("%w: the records of part %s, revision %s, kept changing", ErrUnavailable, request.Part, request.Revision))
}

// GateAsRecorded tells what the gate would answer now about a revision whose
// geometry is still that of its latest records. Nothing is appended.
func (s *Service) GateAsRecorded(ctx context.Context, caller Caller, part, revision string) (*Decision, error) {
	records, err := s.store.Records(ctx, Filter{Part: part, Revision: revision, Latest: true}, math.MaxInt64, mostOfPart)
	if err != nil {
		return nil, s.fail(err)
	}
	request := releaseRequest{Part: part, Revision: revision, Joints: []releaseJoint{}}
	named := map[string]bool{}
	for _, r := range records { // newest first
		if !named[r.Joint] {
			named[r.Joint] = true
			request.Joints = append(request.Joints, releaseJoint{r.Joint, r.GeometryDigest})
		}
	}
	decision, _, err := s.judgeRequest(ctx, caller, &request, true, Idempotency{})
	return decision, err
}

// mostJudgements is how often a part is judged anew because its records
// changed meanwhile.
const mostJudgements = 10

// errMoved says that the records changed under a decision before it was in the
// log.
var errMoved = errors.New("the records changed meanwhile")

// judgeOnce decides, and appends the decision if it still holds when its turn
// in the log comes.
func (s *Service) judgeOnce(ctx context.Context, caller Caller, request *releaseRequest, policy Policy, digest string, dryRun bool, idempotency Idempotency) (*Decision, bool, error) {
	head, err := s.store.Head(ctx)
	if err != nil {
		return nil, false, err
	}
	now := s.clock.Now()
	decided, err := s.judge(ctx, request, policy, now)
	if err != nil {
		return nil, false, err
	}
	decided.PolicyDigest = digest
	decision := &Decision{
		At: stamp(now), Decision: decided.Decision, Policy: policy.Name, PolicyDigest: digest, Findings: decided.Findings,
	}
	if dryRun {
		return decision, false, nil
	}
	entry, err := s.seal(entryDecision, caller, decided)
	if err != nil {
		return nil, false, err
	}
	done := s.log.append(&pending{
		ctx: ctx, entry: entry, answer: idempotency.answer(caller), judges: true, admit: s.unmoved(head.Size, decided),
	})
	switch {
	case done.err != nil:
		return nil, false, done.err
	case done.earlier != nil:
		if err := idempotency.replay(done.earlier); err != nil {
			return nil, false, err
		}
		if entry, err = s.store.Entry(ctx, done.earlier.Index); err != nil {
			return nil, false, err
		}
		decision, err = decisionOf(entry)
		return decision, true, err
	}
	var codes []string
	for _, f := range decided.Findings {
		codes = append(codes, f.Code)
	}
	s.watch.Decided(decided.Decision, codes)
	decision.ID, decision.Index, decision.At = &entry.ID, &done.index, entry.At
	return decision, false, nil
}

// unmoved admits a decision unless the log has grown, since the size at which
// it was made, by something that it would have looked at.
func (s *Service) unmoved(size int64, decided *decisionBody) func(context.Context) (State, error) {
	rests := map[string]bool{}
	for _, r := range decided.Records {
		rests[r.ID] = true
	}
	return func(ctx context.Context) (State, error) {
		return "", s.store.Entries(ctx, size, math.MaxInt64, func(e Entry) error {
			if rests[e.Target] || e.Type == entryRecord && e.Part == decided.Part && e.Revision == decided.Revision {
				return errMoved
			}
			return nil
		})
	}
}

// decisionOf shows an entry as the gate answered it.
func decisionOf(entry Entry) (*Decision, error) {
	envelope, err := ledger.Parse(entry.Bytes)
	if err != nil {
		return nil, err
	}
	var body decisionBody
	if err := strictjson.Decode(envelope.Body, &body); err != nil {
		return nil, err
	}
	return &Decision{
		ID: &entry.ID, Index: &entry.Index, At: entry.At, Decision: body.Decision,
		Policy: body.Policy.Name, PolicyDigest: body.PolicyDigest, Findings: body.Findings,
	}, nil
}

// judged is a record with all that the gate reads of it, from its own bytes.
type judged struct {
	entry Entry
	*recordHead
	state State
	roles map[string]bool
}

// judge looks at the latest record of each kind and aspect at each joint.
func (s *Service) judge(ctx context.Context, request *releaseRequest, policy Policy, now time.Time) (*decisionBody, error) {
	records, err := s.judgedRecords(ctx, request.Part, request.Revision)
	if err != nil {
		return nil, err
	}
	byJoint := map[string][]*judged{}
	var order []string
	for _, r := range records {
		joint := r.Subject.Joint
		if byJoint[joint] == nil {
			order = append(order, joint)
		}
		byJoint[joint] = append(byJoint[joint], r)
	}
	d := &decisionBody{
		Part: request.Part, Revision: request.Revision, Joints: request.Joints, Policy: policy,
		Findings: []ReleaseFinding{}, Records: []decisionRecord{},
	}
	named := map[string]bool{}
	for _, j := range request.Joints {
		named[j.Joint] = true
		if len(byJoint[j.Joint]) == 0 {
			d.hold(j.Joint, nil, "no-record", "there is no record of this joint under part %s, revision %s", request.Part, request.Revision)
		}
		for _, r := range byJoint[j.Joint] {
			d.Records = append(d.Records, decisionRecord{r.entry.ID, ledger.DigestText(r.entry.Leaf), r.state})
			d.look(j, r, policy, now)
		}
	}
	for _, joint := range order {
		if !named[joint] {
			d.hold(joint, nil, "joint-not-named", "this joint has records under part %s, revision %s, and the request leaves it out", request.Part, request.Revision)
		}
	}
	if d.Decision = Release; len(d.Findings) > 0 {
		d.Decision = Hold
	}
	return d, nil
}

func (d *decisionBody) hold(joint string, r *judged, code, format string, args ...any) {
	f := ReleaseFinding{Joint: joint, Code: code, Message: fmt.Sprintf(format, args...)}
	if r != nil {
		f.Record = &r.entry.ID
		about := string(r.Kind)
		if r.Subject.Aspect != "" {
			about += ", " + r.Subject.Aspect
		}
		f.Message = fmt.Sprintf("%s (%s)", f.Message, about)
	}
	d.Findings = append(d.Findings, f)
}

// look gives every reason that one record is to hold a joint.
func (d *decisionBody) look(j releaseJoint, r *judged, policy Policy, now time.Time) {
	hold := func(code, format string, args ...any) { d.hold(j.Joint, r, code, format, args...) }
	if r.state == Withdrawn {
		hold("withdrawn", "the latest record was withdrawn")
	}
	least := policy.leastMargin(j.Joint)
	switch {
	case r.Result.Verdict != "adequate":
		hold("not-adequate", "the latest record is %s", r.Result.Verdict)
	case least > 0:
		if m := r.Result.margin(); m == nil || strength.Less(*m, least) {
			hold("margin", "the least margin is below %g, which the policy asks for here", least)
		}
	}
	if r.GeometryDigest != j.GeometryDigest {
		hold("geometry-changed", "the latest record is for the geometry %.80q, and that of the joint is %.80q", r.GeometryDigest, j.GeometryDigest)
	}
	for _, role := range *policy.SignOffs {
		if !r.roles[role] {
			hold("not-"+role, "the latest record is not %s", role)
		}
	}
	for _, m := range r.Result.ByMethod {
		if why := policy.Methods.refuses(m.Method); why != "" && !m.Compared {
			hold("method", "the record rests on the method %s, which %s", m.Method, why)
		}
	}
	for _, t := range r.entry.Terms {
		why := ""
		switch {
		case t.Kind == termCurveSet:
			why = policy.CurveSets.refuses(t.Value)
		case t.Kind == termInline && policy.CurveSets != nil && len(policy.CurveSets.Allow) > 0:
			why = "came with the input, so that its name says nothing"
		}
		if why != "" {
			hold("curve-set", "the record rests on the curve set %s, which %s", t.Value, why)
		}
	}
	for _, f := range r.Result.Findings {
		barred := *policy.Violations == "hold" && f.Severity == "violation"
		for _, code := range policy.BarFindings {
			barred = barred || code == f.Code
		}
		if barred {
			hold("finding", "the record has the finding %s: %s", f.Code, f.Message)
		}
	}
	if policy.GreatestAgeDays != nil {
		at, err := time.Parse(time.RFC3339, r.entry.At)
		if days := now.Sub(at).Hours() / 24; err != nil || days > *policy.GreatestAgeDays {
			hold("too-old", "the record is of %s, more than %g days ago", r.entry.At, *policy.GreatestAgeDays)
		}
	}
	if policy.LeastEngine != nil && olderThan(r.Result.Engine, *policy.LeastEngine) {
		hold("engine", "the record was computed by version %s, before %s", r.Result.Engine, *policy.LeastEngine)
	}
}

// judgedRecords reads the latest records under a part and revision and checks
// each of their entries, and the columns that found them, against its bytes.
func (s *Service) judgedRecords(ctx context.Context, part, revision string) ([]*judged, error) {
	// Each record is read while the store goes on to the next, and to what is
	// about them.
	var entries []Entry
	var ids []string
	var found []*reading
	var work sync.WaitGroup
	defer work.Wait()
	if err := s.store.Latest(ctx, part, revision, func(e Entry) error {
		r := new(reading)
		entries, ids, found = append(entries, e), append(ids, e.ID), append(found, r)
		work.Go(func() { r.record, r.err = judgedRecord(e) })
		return nil
	}); err != nil {
		return nil, err
	}
	about, err := s.store.About(ctx, ids)
	if err != nil {
		return nil, err
	}
	inTree, err := s.inTree(ctx, entries, about)
	work.Wait()
	if err != nil {
		return nil, err
	}
	for i, r := range found {
		if r.err == nil {
			work.Go(func() { r.err = r.record.judge(about[ids[i]]) })
		}
	}
	work.Wait()
	records, errs := make([]*judged, len(found)), []error{inTree}
	for i, r := range found {
		records[i], errs = r.record, append(errs, r.err)
	}
	if err := errors.Join(errs...); err != nil {
		s.watch.Altered(err)
		return nil, err
	}
	return records, nil
}

// reading is what became of reading a record.
type reading struct {
	record *judged
	err    error
}

// inTree compares entries, whose leaves are those of their bytes, with the
// leaves that the tree was grown on.
func (s *Service) inTree(ctx context.Context, records []Entry, about map[string][]Entry) (altered, err error) {
	var entries []Entry
	for _, r := range records {
		entries = append(append(entries, r), about[r.ID]...)
	}
	indexes := make([]int64, len(entries))
	for i, e := range entries {
		indexes[i] = ledger.LeafIndex(e.Index)
	}
	leaves, err := s.store.Hashes(ctx, indexes)
	switch {
	case errors.Is(err, ErrNotFound):
		return fmt.Errorf("%w: the tree has no leaf of an entry", errAltered), nil
	case err != nil:
		return nil, err
	}
	for i, e := range entries {
		if leaves[i] != e.Leaf {
			altered = errors.Join(altered, fmt.Errorf("%w: entry %d (%s) is not the leaf that the tree has there", errAltered, e.Index, e.ID))
		}
	}
	return altered, nil
}

// judgedRecord reads a record from its bytes and compares what was stored
// beside them.
func judgedRecord(e Entry) (*judged, error) {
	is, record, err := sealedEntry(e.Bytes)
	if err == nil && record == nil {
		err = errors.New("it is no record")
	}
	if err != nil {
		return nil, fmt.Errorf("%w: entry %d: %w", errAltered, e.Index, err)
	}
	if err := sameColumns(e, is); err != nil {
		return nil, err
	}
	// The terms come from the bytes too: the gate asks them.
	e.Terms = is.Terms
	return &judged{entry: e, recordHead: record, roles: map[string]bool{}}, nil
}

// judge takes what the entries about the record say of it.
func (r *judged) judge(about []Entry) error {
	r.state = stateOf(about)
	for _, a := range about {
		if err := unaltered(a); err != nil {
			return err
		}
		if a.Type == entrySignOff {
			r.roles[a.Role] = true
		}
	}
	return nil
}

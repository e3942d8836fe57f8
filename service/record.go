package service

import (
	"context"
	"crypto/sha256"
	"encoding/base64"
	"errors"
	"fmt"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/google/uuid"

	"jointledger/service/ledger"
	"jointledger/service/strictjson"
)

// RecordRequest asks for a calculation to be put on record.
type RecordRequest struct {
	Subject        Subject        `json:"subject"`
	GeometryDigest string         `json:"geometry_digest" validate:"id"`
	Kind           Kind           `json:"kind"`
	Input          strictjson.Raw `json:"input"`
	Note           string         `json:"note,omitzero" validate:"text"`
}

// RecordDocument is a record as callers see it.
type RecordDocument struct {
	ID             string         `json:"id"`
	Index          int64          `json:"index"`
	RecordedAt     string         `json:"recorded_at"`
	Author         string         `json:"author"`
	Subject        subject        `json:"subject"`
	GeometryDigest string         `json:"geometry_digest"`
	Kind           Kind           `json:"kind"`
	Note           string         `json:"note"`
	Input          strictjson.Raw `json:"input"`
	Result         strictjson.Raw `json:"result"`
	InputDigest    string         `json:"input_digest"`
	RecordDigest   string         `json:"record_digest"`
	State          State          `json:"state"`
	SignOffs       []SignOff      `json:"sign_offs"`
	Withdrawal     *Withdrawal    `json:"withdrawal"`
}

// subject is Subject with every member present.
type subject struct {
	Part     string `json:"part"`
	Revision string `json:"revision"`
	Joint    string `json:"joint"`
	Aspect   string `json:"aspect"`
}

// SignOff is a signature under a record.
type SignOff struct {
	ID        string `json:"id"`
	Index     int64  `json:"index"`
	At        string `json:"at"`
	Author    string `json:"author"`
	Role      string `json:"role"`
	Statement string `json:"statement"`
}

// Withdrawal takes a record back, without changing it.
type Withdrawal struct {
	ID     string `json:"id"`
	Index  int64  `json:"index"`
	At     string `json:"at"`
	Author string `json:"author"`
	Reason string `json:"reason"`
}

// The types of entries.
const (
	entryRecord     = "record"
	entrySignOff    = "sign-off"
	entryWithdrawal = "withdrawal"
	entryCurveSet   = "curve-set"
)

// recordBody is the body of a record's entry. What it hashes is fixed for
// good.
type recordBody struct {
	Subject        subject        `json:"subject"`
	GeometryDigest string         `json:"geometry_digest"`
	Kind           Kind           `json:"kind"`
	Note           string         `json:"note"`
	Input          strictjson.Raw `json:"input"`
	InputDigest    string         `json:"input_digest"`
	Result         strictjson.Raw `json:"result"`
	MadeBy         madeBy         `json:"made_by"`
}

// canonical writes the body in the form that is hashed. Input and result are in
// it already.
func (b *recordBody) canonical() ([]byte, error) {
	return strictjson.Compose(map[string]any{
		"subject": b.Subject, "geometry_digest": b.GeometryDigest, "kind": b.Kind, "note": b.Note,
		"input": b.Input, "input_digest": b.InputDigest, "result": b.Result, "made_by": b.MadeBy,
	})
}

// head is what entryOf would read of the body, without reading it.
func (b *recordBody) head(r *Result) *recordHead {
	head := &recordHead{
		Subject: b.Subject, GeometryDigest: b.GeometryDigest, Kind: b.Kind, Input: b.Input,
		Result: resultHead{Verdict: r.Verdict},
	}
	if r.Governing != nil {
		head.Result.Governing = &governingHead{r.Governing.Margin}
	}
	for _, m := range r.ByMethod {
		head.Result.ByMethod = append(head.Result.ByMethod, methodHead{m.Method, m.Compared})
	}
	return head
}

// document shows the record of an entry with this body as callers see it before
// anything is said about it.
func (b *recordBody) document(entry Entry) *RecordDocument {
	return &RecordDocument{
		ID: entry.ID, Index: entry.Index, RecordedAt: entry.At, Author: entry.Author,
		Subject: b.Subject, GeometryDigest: b.GeometryDigest, Kind: b.Kind, Note: b.Note,
		Input: b.Input, Result: b.Result, InputDigest: b.InputDigest,
		RecordDigest: digestOf(entry),
		State:        Recorded,
	}
}

// madeBy names the program that computed a record.
type madeBy struct {
	Engine string `json:"engine"`
	Go     string `json:"go"`
	Arch   string `json:"arch"`
}

func thisProgram() madeBy { return madeBy{Engine, runtime.Version(), runtime.GOARCH} }

// Idempotency is what a caller sent to make its request repeatable.
type Idempotency struct {
	Key          string // empty for none
	Method, Path string
	Body         []byte
}

// answer prepares what is remembered of a request, nil without a key.
func (i Idempotency) answer(caller Caller) *Answer {
	if i.Key == "" {
		return nil
	}
	return &Answer{
		IdempotencyKey: IdempotencyKey{caller.Name, i.Method, i.Path, i.Key},
		RequestDigest:  sha256.Sum256(i.Body),
	}
}

// replay checks that a request is the one that was answered before.
func (i Idempotency) replay(earlier *Answer) error {
	if sha256.Sum256(i.Body) != earlier.RequestDigest {
		return problem(IdempotencyMismatch, "This Idempotency-Key was used for another body; use a new key for a new request.")
	}
	return nil
}

// Record computes a joint and appends the result. again is true when the same
// request was answered before and this is that answer.
func (s *Service) Record(ctx context.Context, caller Caller, asked []byte, idempotency Idempotency) (_ *RecordDocument, again bool, _ error) {
	var request RecordRequest
	if err := strictjson.Decode(asked, &request); err != nil {
		return nil, false, malformed(err, "")
	}
	var f faults
	f.check(&request)
	c, err := calculate(request.Kind, request.Input, View{}, s.registry(ctx))
	if err := f.under("/input", err); err != nil {
		return nil, false, s.fail(err)
	}
	s.count(&c.result)
	p, body, err := s.pendingRecord(ctx, caller, &request, c, idempotency)
	if err != nil {
		return nil, false, err
	}
	s.log.submit(p)
	entry, again, err := s.recorded(ctx, p, idempotency)
	if err != nil {
		return nil, false, err
	}
	if !again {
		return body.document(entry), false, nil
	}
	document, err := recordDocument(entry, nil)
	return document, true, err
}

// under joins what is wrong with an inner document, below a member, to the
// faults of the outer one.
func (f *faults) under(member string, err error) error {
	var inner *Problem
	switch {
	case errors.As(err, &inner) && inner.Code == Malformed:
		return inner.Under(member)
	case inner != nil && inner.Code == Invalid && len(inner.Errors) > 0:
		f.join(member, inner.Errors)
	case err != nil:
		return err
	}
	if found := f.problem(); found != nil {
		return found
	}
	return nil
}

// pendingRecord seals the record of a calculation.
func (s *Service) pendingRecord(ctx context.Context, caller Caller, request *RecordRequest, c *calculation, idempotency Idempotency) (*pending, *recordBody, error) {
	result, err := strictjson.Canonical(&c.result)
	if err != nil {
		return nil, nil, err
	}
	body := &recordBody{
		Subject:        subject(request.Subject),
		GeometryDigest: request.GeometryDigest, Kind: request.Kind, Note: request.Note,
		Input: c.input, InputDigest: c.inputDigest, Result: result, MadeBy: thisProgram(),
	}
	canonical, err := body.canonical()
	if err != nil {
		return nil, nil, err
	}
	columns, err := body.head(&c.result).columns()
	if err != nil {
		return nil, nil, err
	}
	entry, err := s.sealCanonical(entryRecord, caller, canonical)
	if err != nil {
		return nil, nil, err
	}
	entry.Columns = columns
	return &pending{ctx: ctx, entry: entry, answer: idempotency.answer(caller)}, body, nil
}

// recorded waits for what becomes of a submitted record, and returns its entry
// or that of the same request before.
func (s *Service) recorded(ctx context.Context, p *pending, idempotency Idempotency) (_ Entry, again bool, _ error) {
	done := <-p.done
	switch {
	case done.err != nil:
		return Entry{}, false, s.fail(done.err)
	case done.earlier != nil:
		if err := idempotency.replay(done.earlier); err != nil {
			return Entry{}, false, err
		}
		entry, err := s.store.Entry(ctx, done.earlier.Index)
		return entry, true, s.fail(err)
	}
	entry := p.entry
	entry.Index = done.index
	return entry, false, nil
}

// seal makes an entry of a body, stamped now.
func (s *Service) seal(kind string, caller Caller, body any) (Entry, error) {
	canonical, err := strictjson.Canonical(body)
	if err != nil {
		return Entry{}, err
	}
	entry, err := s.sealCanonical(kind, caller, canonical)
	if err != nil {
		return Entry{}, err
	}
	entry, _, err = sealedEntry(entry.Bytes)
	return entry, err
}

// sealCanonical makes an entry, but for its columns.
func (s *Service) sealCanonical(kind string, caller Caller, canonical []byte) (Entry, error) {
	id, err := uuid.NewV7()
	if err != nil {
		return Entry{}, err
	}
	e := Entry{Type: kind, ID: id.String(), At: stamp(s.clock.Now()), Author: caller.Name}
	e.Bytes, e.Leaf, err = ledger.Seal(ledger.Envelope{Type: e.Type, ID: e.ID, At: e.At, Author: e.Author, Body: canonical})
	return e, err
}

// recordDocument shows an entry and those about it as callers see a record.
func recordDocument(entry Entry, about []Entry) (*RecordDocument, error) {
	envelope, err := ledger.Parse(entry.Bytes)
	if err != nil {
		return nil, fmt.Errorf("entry %d: %w", entry.Index, err)
	}
	var body recordBody
	if err := strictjson.Decode(envelope.Body, &body); err != nil {
		return nil, fmt.Errorf("entry %d: %w", entry.Index, err)
	}
	document := body.document(entry)
	document.State = stateOf(about)
	for _, e := range about {
		envelope, err := ledger.Parse(e.Bytes)
		if err != nil {
			return nil, fmt.Errorf("entry %d: %w", e.Index, err)
		}
		switch e.Type {
		case entrySignOff:
			var b signOffBody
			if err := strictjson.Decode(envelope.Body, &b); err != nil {
				return nil, fmt.Errorf("entry %d: %w", e.Index, err)
			}
			document.SignOffs = append(document.SignOffs, SignOff{envelope.ID, e.Index, envelope.At, envelope.Author, b.Role, b.Statement})
		case entryWithdrawal:
			var b withdrawalBody
			if err := strictjson.Decode(envelope.Body, &b); err != nil {
				return nil, fmt.Errorf("entry %d: %w", e.Index, err)
			}
			document.Withdrawal = &Withdrawal{envelope.ID, e.Index, envelope.At, envelope.Author, b.Reason}
		}
	}
	return document, nil
}

// signOffBody and withdrawalBody are the bodies of the entries about a record.
type signOffBody struct {
	Record       string `json:"record"`
	RecordDigest string `json:"record_digest"`
	Role         string `json:"role"`
	Statement    string `json:"statement"`
}

type withdrawalBody struct {
	Record       string `json:"record"`
	RecordDigest string `json:"record_digest"`
	Reason       string `json:"reason"`
}

// stateOf derives a record's state from the entries about it.
func stateOf(about []Entry) State {
	state := Recorded
	for _, e := range about {
		switch {
		case e.Type == entryWithdrawal:
			return Withdrawn
		case e.Role == string(Checked) && state == Recorded:
			state = Checked
		case e.Role == string(Approved):
			state = Approved
		}
	}
	return state
}

// RecordByID returns a record with its state of now.
func (s *Service) RecordByID(ctx context.Context, id string) (*RecordDocument, error) {
	entry, err := s.record(ctx, id)
	if err != nil {
		return nil, err
	}
	about, err := s.store.About(ctx, []string{id})
	if err != nil {
		return nil, s.fail(err)
	}
	return recordDocument(entry, about[id])
}

// record finds the entry of a record.
func (s *Service) record(ctx context.Context, id string) (Entry, error) {
	entry, err := s.store.EntryByID(ctx, id)
	if errors.Is(err, ErrNotFound) || err == nil && entry.Type != entryRecord {
		return Entry{}, problem(NotFound, "There is no record %.80q.", id)
	}
	return entry, s.fail(err)
}

// EntryBytes returns the hashed bytes of a record, exactly.
func (s *Service) EntryBytes(ctx context.Context, id string) ([]byte, error) {
	entry, err := s.record(ctx, id)
	return entry.Bytes, err
}

// RecordSummary is a record in a list.
type RecordSummary struct {
	ID             string   `json:"id"`
	Index          int64    `json:"index"`
	RecordedAt     string   `json:"recorded_at"`
	Author         string   `json:"author"`
	Subject        subject  `json:"subject"`
	GeometryDigest string   `json:"geometry_digest"`
	Kind           string   `json:"kind"`
	Verdict        string   `json:"verdict"`
	Margin         *float64 `json:"margin"`
	RecordDigest   string   `json:"record_digest"`
	State          State    `json:"state"`
}

// RecordList is one page of records, newest first.
type RecordList struct {
	Items      []RecordSummary `json:"items"`
	NextCursor *string         `json:"next_cursor"`
}

// RecordQuery is what a list is asked for, in the words of the wire; empty
// for what was not given.
type RecordQuery struct {
	Part, Revision, Joint, Kind, Verdict, State string
	Author, Method, Material, CurveSet          string
	Since, Until, Latest, Cursor, Limit         string
}

// filter turns the words of the wire into a filter, the index to start under
// and the size of a page.
func (q RecordQuery) filter(f *faults, at string) (filter Filter, before int64, limit int) {
	filter = Filter{
		Part: q.Part, Revision: q.Revision, Joint: q.Joint, Kind: q.Kind, Verdict: q.Verdict, State: State(q.State),
		Author: q.Author, Method: q.Method, Material: q.Material, CurveSet: q.CurveSet, Latest: q.Latest == "true",
	}
	oneOf := func(name, given string, words ...string) {
		if given != "" && !slices.Contains(words, given) {
			f.add(at+pointer(name), "must be one of %s, not %.80q", strings.Join(words, ", "), given)
		}
	}
	oneOf("kind", q.Kind, Kind("").Words()...)
	oneOf("verdict", q.Verdict, "adequate", "inadequate", "undetermined")
	oneOf("state", q.State, string(Recorded), string(Checked), string(Approved), string(Withdrawn))
	oneOf("latest", q.Latest, "true", "false")
	for _, t := range []struct {
		name, given string
		bound       *string
	}{{"since", q.Since, &filter.Since}, {"until", q.Until, &filter.Until}} {
		if t.given == "" {
			continue
		}
		when, err := time.Parse(time.RFC3339, t.given)
		if err != nil {
			f.add(at+pointer(t.name), "must be a time in the form of RFC 3339, such as 2026-01-31T00:00:00Z, not %.80q", t.given)
			continue
		}
		// An entry's time has milliseconds: a bound between two of them
		// means the later.
		*t.bound = stamp(when.Add(time.Millisecond - 1).Truncate(time.Millisecond))
	}
	limit = 50
	if q.Limit != "" {
		n, err := strconv.Atoi(q.Limit)
		if err != nil || n < 1 || n > 500 {
			f.add(at+"/limit", "must be a whole number from 1 to 500, not %.80q", q.Limit)
		}
		limit = n
	}
	before = int64(1) << 62
	if q.Cursor != "" {
		index, err := readCursor(q.Cursor)
		if err != nil {
			f.add(at+"/cursor", "is not a cursor that this server gave")
		}
		before = index
	}
	return filter, before, limit
}

// Records lists records.
func (s *Service) Records(ctx context.Context, q RecordQuery) (*RecordList, error) {
	var f faults
	filter, before, limit := q.filter(&f, "")
	if found := f.problem(); found != nil {
		return nil, found
	}
	found, err := s.store.Records(ctx, filter, before, limit+1)
	if err != nil {
		return nil, s.fail(err)
	}
	list := &RecordList{Items: []RecordSummary{}}
	for i, r := range found {
		if i == limit {
			cursor := writeCursor(found[i-1].Index)
			list.NextCursor = &cursor
			break
		}
		list.Items = append(list.Items, summaryOf(r))
	}
	return list, nil
}

// A cursor is the index that the next page stands under, in a form that does
// not invite counting.
func writeCursor(index int64) string {
	return base64.RawURLEncoding.EncodeToString([]byte("before:" + strconv.FormatInt(index, 10)))
}

func readCursor(cursor string) (int64, error) {
	plain, err := base64.RawURLEncoding.DecodeString(cursor)
	if err != nil {
		return 0, err
	}
	var index int64
	_, err = fmt.Sscanf(string(plain), "before:%d", &index)
	if err == nil && writeCursor(index) != cursor {
		err = errors.New("not as written")
	}
	return index, err
}

// digestOf is the record digest of an entry.
func digestOf(e Entry) string { return ledger.DigestText(ledger.Leaf(e.Bytes)) }

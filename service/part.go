package service

import (
	"cmp"
	"context"
	"math"
	"slices"

	"jointledger/service/ledger"
	"jointledger/service/strictjson"
)

// Part is what the ledger says of a part: the latest record of each joint,
// aspect and kind, by revision.
type Part struct {
	Part string `json:"part"`
	// Revisions stand in the order of their latest records, newest first.
	Revisions []PartRevision `json:"revisions"`
	// Complete is false where the part has more joints than are listed; the
	// list of records has them all.
	Complete bool `json:"complete"`
}

// PartRevision is one revision of a part.
type PartRevision struct {
	Revision string          `json:"revision"`
	Records  []RecordSummary `json:"records"` // by joint, aspect and kind
}

// mostOfPart is how many joints of a part are listed, over all revisions.
const mostOfPart = 2000

// Part lists the joints of a part by revision.
func (s *Service) Part(ctx context.Context, part string) (*Part, error) {
	if !isID(part) {
		return nil, &Problem{Code: Invalid, Detail: "Some values cannot be used.", Errors: []FieldError{
			{"/part", "must be the part, 1 to 200 characters without control characters"},
		}}
	}
	found, err := s.store.Records(ctx, Filter{Part: part, Latest: true}, math.MaxInt64, mostOfPart+1)
	if err != nil {
		return nil, s.fail(err)
	}
	if len(found) == 0 {
		return nil, problem(NotFound, "There is no record of a part %.80q.", part)
	}
	p := &Part{Part: part, Complete: len(found) <= mostOfPart}
	at := map[string]int{}
	for _, r := range found[:min(len(found), mostOfPart)] {
		i, ok := at[r.Revision]
		if !ok {
			i = len(p.Revisions)
			at[r.Revision] = i
			p.Revisions = append(p.Revisions, PartRevision{Revision: r.Revision})
		}
		p.Revisions[i].Records = append(p.Revisions[i].Records, summaryOf(r))
	}
	for _, r := range p.Revisions {
		slices.SortFunc(r.Records, func(a, b RecordSummary) int {
			return cmp.Or(cmp.Compare(a.Subject.Joint, b.Subject.Joint), cmp.Compare(a.Subject.Aspect, b.Subject.Aspect), cmp.Compare(a.Kind, b.Kind))
		})
	}
	return p, nil
}

// summaryOf shows a stored record in a list.
func summaryOf(r Summary) RecordSummary {
	return RecordSummary{
		ID: r.ID, Index: r.Index, RecordedAt: r.At, Author: r.Author, Subject: subject(r.Subject),
		GeometryDigest: r.GeometryDigest, Kind: r.Kind, Verdict: r.Verdict, Margin: r.Margin,
		RecordDigest: ledger.DigestText(r.Leaf), State: r.State,
	}
}

// Changes is what differs between the latest records of two revisions.
type Changes struct {
	Part   string        `json:"part"`
	From   string        `json:"from"`
	To     string        `json:"to"`
	Joints []JointChange `json:"joints"`
}

// JointChange is one joint, aspect and kind that differs. Was is null where
// the joint is new, Is where it is gone.
type JointChange struct {
	Joint  string       `json:"joint"`
	Aspect string       `json:"aspect"`
	Kind   string       `json:"kind"`
	Was    *ChangeState `json:"was"`
	Is     *ChangeState `json:"is"`
	// Fields are the members of the input that differ, at most 200.
	Fields   []FieldChange `json:"fields"`
	Complete bool          `json:"complete"` // all of them are listed
}

// ChangeState is a record on one side of a comparison.
type ChangeState struct {
	Record         string   `json:"record"`
	GeometryDigest string   `json:"geometry_digest"`
	Verdict        string   `json:"verdict"`
	Margin         *float64 `json:"margin"`
	State          State    `json:"state"`
}

// FieldChange is a member of the input, by its JSON pointer, as JSON on either
// side; null where it is not there.
type FieldChange struct {
	Pointer string         `json:"pointer"`
	Was     strictjson.Raw `json:"was"`
	Is      strictjson.Raw `json:"is"`
}

// mostChanges is how many changed members of one joint are listed.
const mostChanges = 200

// Changes compares two revisions of a part, joint by joint.
func (s *Service) Changes(ctx context.Context, part, from, to string) (*Changes, error) {
	var f faults
	for _, one := range [][2]string{{"/part", part}, {"/from", from}, {"/to", to}} {
		if !isID(one[1]) {
			f.add(one[0], "must have 1 to %d characters and no control characters", mostID)
		}
	}
	if found := f.problem(); found != nil {
		return nil, found
	}
	c := &Changes{Part: part, From: from, To: to, Joints: []JointChange{}}
	type key struct{ joint, aspect, kind string }
	type side struct {
		state ChangeState
		input strictjson.Raw
	}
	sides := [2]map[key]side{}
	var order []key
	for i, revision := range []string{from, to} {
		records, err := s.judgedRecords(ctx, part, revision)
		if err != nil {
			return nil, s.fail(err)
		}
		sides[i] = map[key]side{}
		for _, r := range records {
			k := key{r.Subject.Joint, r.Subject.Aspect, string(r.Kind)}
			sides[i][k] = side{ChangeState{r.entry.ID, r.GeometryDigest, r.Result.Verdict, r.Result.margin(), r.state}, r.Input}
			if !slices.Contains(order, k) {
				order = append(order, k)
			}
		}
	}
	slices.SortFunc(order, func(a, b key) int {
		return cmp.Or(cmp.Compare(a.joint, b.joint), cmp.Compare(a.aspect, b.aspect), cmp.Compare(a.kind, b.kind))
	})
	for _, k := range order {
		change := JointChange{Joint: k.joint, Aspect: k.aspect, Kind: k.kind, Fields: []FieldChange{}, Complete: true}
		was, before := sides[0][k]
		is, after := sides[1][k]
		if before {
			change.Was = &was.state
		}
		if after {
			change.Is = &is.state
		}
		if before && after {
			var err error
			if change.Fields, err = fieldChanges(was.input, is.input); err != nil {
				return nil, err
			}
			if len(change.Fields) == 0 && was.state.GeometryDigest == is.state.GeometryDigest && was.state.Verdict == is.state.Verdict {
				continue
			}
			if len(change.Fields) > mostChanges {
				change.Fields, change.Complete = change.Fields[:mostChanges], false
			}
		}
		c.Joints = append(c.Joints, change)
	}
	return c, nil
}

// fieldChanges lists the members that differ between two inputs.
func fieldChanges(was, is strictjson.Raw) ([]FieldChange, error) {
	var a, b any
	if err := strictjson.DecodeLoosely(was, &a); err != nil {
		return nil, err
	}
	if err := strictjson.DecodeLoosely(is, &b); err != nil {
		return nil, err
	}
	found := []FieldChange{}
	err := walkChanges("", a, b, &found)
	return found, err
}

// absent stands for a member that is not there.
type absent struct{}

// walkChanges collects where two values differ, as deep as both go.
func walkChanges(at string, was, is any, found *[]FieldChange) error {
	if a, ok := was.(map[string]any); ok {
		if b, ok := is.(map[string]any); ok {
			names := []string{}
			for name := range a {
				names = append(names, name)
			}
			for name := range b {
				if _, both := a[name]; !both {
					names = append(names, name)
				}
			}
			slices.Sort(names)
			for _, name := range names {
				if err := walkChanges(at+pointer(name), member(a, name), member(b, name), found); err != nil {
					return err
				}
			}
			return nil
		}
	}
	if a, ok := was.([]any); ok {
		if b, ok := is.([]any); ok && len(a) == len(b) {
			for i := range a {
				if err := walkChanges(at+pointer(i), a[i], b[i], found); err != nil {
					return err
				}
			}
			return nil
		}
	}
	raw := [2]strictjson.Raw{}
	for i, value := range []any{was, is} {
		if _, missing := value.(absent); missing {
			value = nil
		}
		var err error
		if raw[i], err = strictjson.Canonical(value); err != nil {
			return err
		}
	}
	if string(raw[0]) != string(raw[1]) {
		*found = append(*found, FieldChange{at, raw[0], raw[1]})
	}
	return nil
}

func member(object map[string]any, name string) any {
	if value, ok := object[name]; ok {
		return value
	}
	return absent{}
}

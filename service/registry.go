package service

import (
	"context"
	"errors"
	"fmt"
	"slices"

	"jointledger/lug"
	"jointledger/service/ledger"
	"jointledger/service/strictjson"
)

// registry finds curve sets in the log.
type registry struct {
	ctx   context.Context
	store Store
}

// registry returns what is registered, for one request.
func (s *Service) registry(ctx context.Context) lookup { return registry{ctx, s.store} }

// curveSet finds a set by id, the latest registered, or by id@version.
func (r registry) curveSet(name string) (*CurveSet, error) {
	entry, err := r.store.CurveSet(r.ctx, name)
	if errors.Is(err, ErrNotFound) {
		return nil, fmt.Errorf("there is no curve set %.80q (see /v1/curve-sets)", name)
	}
	if err != nil {
		return nil, err
	}
	return curveSetOf(entry)
}

func curveSetOf(entry Entry) (*CurveSet, error) {
	envelope, err := ledger.Parse(entry.Bytes)
	if err != nil {
		return nil, fmt.Errorf("entry %d: %w", entry.Index, err)
	}
	var set CurveSet
	if err := strictjson.Decode(envelope.Body, &set); err != nil {
		return nil, fmt.Errorf("entry %d: %w", entry.Index, err)
	}
	return &set, nil
}

// CurveSetItem is a curve set in a list.
type CurveSetItem struct {
	ID        string   `json:"id"`
	Version   string   `json:"version"`
	Method    string   `json:"method"`
	Document  string   `json:"document"`
	Reader    string   `json:"reader"`
	Tolerance float64  `json:"tolerance"`
	Charts    []string `json:"charts"`
	Digest    string   `json:"digest"`
	BuiltIn   bool     `json:"built_in"`
	Index     *int64   `json:"index"` // of its entry, null for a built-in one
}

// CurveSetList lists curve sets.
type CurveSetList struct {
	Items []CurveSetItem `json:"items"`
}

// CurveSetAnswer is a whole curve set with its digest.
type CurveSetAnswer struct {
	CurveSet *CurveSet `json:"curve_set"`
	Digest   string    `json:"digest"`
	BuiltIn  bool      `json:"built_in"`
	Index    *int64    `json:"index"`
}

func curveSetItem(set *CurveSet, index *int64) (CurveSetItem, error) {
	digest, err := set.digest()
	item := CurveSetItem{
		ID: set.ID, Version: set.Version, Method: set.Method, Document: set.Document, Reader: set.Reader,
		Tolerance: set.Tolerance, Digest: digest, BuiltIn: index == nil, Index: index,
	}
	for name := range set.Charts {
		item.Charts = append(item.Charts, name)
	}
	slices.Sort(item.Charts)
	return item, err
}

// CurveSets lists the built-in and the registered curve sets.
func (s *Service) CurveSets(ctx context.Context) (*CurveSetList, error) {
	list := &CurveSetList{}
	for _, set := range lug.BuiltInCurveSets() {
		item, err := curveSetItem(curveSetDocument(&set), nil)
		if err != nil {
			return nil, err
		}
		list.Items = append(list.Items, item)
	}
	entries, err := s.store.CurveSets(ctx)
	if err != nil {
		return nil, s.fail(err)
	}
	for _, e := range entries {
		set, err := curveSetOf(e)
		if err != nil {
			return nil, err
		}
		item, err := curveSetItem(set, &e.Index)
		if err != nil {
			return nil, err
		}
		list.Items = append(list.Items, item)
	}
	return list, nil
}

// CurveSetByName returns the set id@version.
func (s *Service) CurveSetByName(ctx context.Context, name string) (*CurveSetAnswer, error) {
	answer := &CurveSetAnswer{BuiltIn: true}
	if set := builtInCurveSet(name); set != nil {
		answer.CurveSet = curveSetDocument(set)
	} else {
		entry, err := s.store.CurveSet(ctx, name)
		if errors.Is(err, ErrNotFound) {
			return nil, problem(NotFound, "There is no curve set %.80q.", name)
		}
		if err != nil {
			return nil, s.fail(err)
		}
		if answer.CurveSet, err = curveSetOf(entry); err != nil {
			return nil, err
		}
		answer.BuiltIn, answer.Index = false, &entry.Index
	}
	var err error
	answer.Digest, err = answer.CurveSet.digest()
	return answer, err
}

// RegisterCurveSet appends a curve set. The same id and version with the same
// content is answered as it stands; with other content it is a conflict.
func (s *Service) RegisterCurveSet(ctx context.Context, caller Caller, body []byte, idempotency Idempotency) (*CurveSetAnswer, bool, error) {
	var set CurveSet
	if err := strictjson.Decode(body, &set); err != nil {
		return nil, false, malformed(err, "")
	}
	var f faults
	set.check(&f)
	if found := f.problem(); found != nil {
		return nil, false, found
	}
	name := set.ID + "@" + set.Version
	digest, err := set.digest()
	if err != nil {
		return nil, false, err
	}
	for _, builtIn := range lug.BuiltInCurveSets() {
		if builtIn.ID == set.ID {
			return nil, false, problem(Conflict, "The id %s is that of a built-in curve set; choose another.", set.ID)
		}
	}
	entry, err := s.seal(entryCurveSet, caller, &set)
	if err != nil {
		return nil, false, err
	}
	var standing *Entry
	done := s.log.append(&pending{ctx: ctx, entry: entry, answer: idempotency.answer(caller), admit: func(ctx context.Context) (State, error) {
		found, err := s.store.CurveSet(ctx, name)
		if errors.Is(err, ErrNotFound) {
			return "", nil
		}
		if err != nil {
			return "", err
		}
		other, err := curveSetOf(found)
		if err != nil {
			return "", err
		}
		otherDigest, err := other.digest()
		if err == nil && otherDigest != digest {
			err = problem(Conflict, "The curve set %s is registered with other content (%s); register a new version.", name, otherDigest)
		}
		if err == nil {
			standing, err = &found, errStanding
		}
		return "", err
	}})
	index := done.index
	switch {
	case errors.Is(done.err, errStanding):
		index = standing.Index
	case done.err != nil:
		return nil, false, s.fail(done.err)
	case done.earlier != nil:
		if err := idempotency.replay(done.earlier); err != nil {
			return nil, false, err
		}
		index = done.earlier.Index
	}
	return &CurveSetAnswer{CurveSet: &set, Digest: digest, Index: &index}, done.earlier != nil, nil
}

// errStanding says that what is to be appended is in the log already.
var errStanding = errors.New("this stands in the log already")

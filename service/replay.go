package service

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"jointledger/service/ledger"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// reproducedWithin is the relative difference within which a number counts as
// reproduced on any machine.
const reproducedWithin = 1e-9

// Replay is what became of a record when it was computed again.
type Replay struct {
	Recorded ReplayRecorded `json:"recorded"`
	Current  ReplayCurrent  `json:"current"`

	refused *Problem // why today's methods do not take the input any more
}

// ReplayRecorded is the recorded input by the recorded revisions.
type ReplayRecorded struct {
	Reproduced        bool     `json:"reproduced"`
	LargestDifference *float64 `json:"largest_difference"`
}

// ReplayCurrent is the recorded input by the latest revisions.
type ReplayCurrent struct {
	Reproduced        bool     `json:"reproduced"`
	Verdict           string   `json:"verdict"`
	Margin            *float64 `json:"margin"`
	LargestDifference *float64 `json:"largest_difference"`
}

// Replay computes a record again, as it was recorded and by today's methods.
func (s *Service) Replay(ctx context.Context, id string) (*Replay, error) {
	entry, err := s.record(ctx, id)
	if err != nil {
		return nil, err
	}
	return s.replayEntry(ctx, entry, nil)
}

// replayEntry replays a record, and tells of one that does not hold any more.
func (s *Service) replayEntry(ctx context.Context, entry Entry, substitute *substitution) (*Replay, error) {
	r, err := s.replay(ctx, entry.Bytes, substitute)
	if err != nil || substitute != nil {
		return r, err
	}
	return r, s.fail(s.tellReplay(ctx, entry, r))
}

// replay computes an entry again; the current result with a material in the
// place of another, where that is asked.
func (s *Service) replay(ctx context.Context, canonical []byte, substitute *substitution) (*Replay, error) {
	look := s.registry(ctx)
	body, err := recordBodyOf(canonical)
	if err != nil {
		return nil, err
	}
	difference, err := recompute(body, look)
	var refused *Problem
	if errors.As(err, &refused) && refused.Code == Invalid {
		// By a revision that this program does not have, say.
		difference.structure = refused.Error()
	} else if err != nil {
		return nil, s.fail(err)
	}
	s.watch.Replayed(difference.reproduced())
	r := &Replay{Recorded: ReplayRecorded{difference.reproduced(), difference.largest()}}
	input, err := withLatestMethods(body.Input)
	if err != nil {
		return nil, err
	}
	if input, err = substituted(input, substitute); err != nil {
		return nil, err
	}
	now, err := calculate(body.Kind, input, View{}, look)
	if errors.As(err, &refused) && refused.Code == Invalid {
		r.Current.Verdict, r.refused = strength.Undetermined.String(), refused
		return r, nil
	}
	if err != nil {
		return nil, s.fail(err)
	}
	result, err := strictjson.Canonical(&now.result)
	if err != nil {
		return nil, err
	}
	if difference, err = compareResults(body.Result, result); err != nil {
		return nil, err
	}
	r.Current = ReplayCurrent{
		Reproduced: difference.reproduced(), Verdict: now.result.Verdict, LargestDifference: difference.largest(),
	}
	if now.result.Governing != nil {
		r.Current.Margin = now.result.Governing.Margin
	}
	return r, nil
}

func recordBodyOf(canonical []byte) (*recordBody, error) {
	envelope, err := ledger.Parse(canonical)
	if err != nil {
		return nil, err
	}
	var body recordBody
	if err := strictjson.Decode(envelope.Body, &body); err != nil {
		return nil, err
	}
	return &body, nil
}

// recompute computes a record by its recorded revisions and compares.
func recompute(body *recordBody, look lookup) (difference, error) {
	c, err := calculate(body.Kind, body.Input, View{}, look)
	if err != nil {
		return difference{}, err
	}
	if c.inputDigest != body.InputDigest {
		return difference{structure: "the input does not have its digest"}, nil
	}
	result, err := strictjson.Canonical(&c.result)
	if err != nil {
		return difference{}, err
	}
	return compareResults(body.Result, result)
}

// withLatestMethods takes the revisions off the names of methods.
func withLatestMethods(input strictjson.Raw) (strictjson.Raw, error) {
	var members map[string]strictjson.Raw
	if err := strictjson.Decode(input, &members); err != nil {
		return nil, err
	}
	for _, list := range []string{"methods", "compare"} {
		if members[list] == nil {
			continue
		}
		var names []string
		if err := strictjson.Decode(members[list], &names); err != nil {
			return nil, err
		}
		latest := []string{}
		for _, name := range names {
			id, _, _ := strings.Cut(name, "@")
			// Two revisions of one method become one.
			if !slices.Contains(latest, id) {
				latest = append(latest, id)
			}
		}
		raw, err := strictjson.Encode(latest)
		if err != nil {
			return nil, err
		}
		members[list] = raw
	}
	return strictjson.Encode(members)
}

// difference is how far two results are from each other.
type difference struct {
	relative  float64 // the largest of any number
	structure string  // what differs that is not a number; empty for nothing
}

func (d difference) reproduced() bool {
	return d.structure == "" && d.relative <= reproducedWithin
}

// largest is null where the results cannot be set against each other.
func (d difference) largest() *float64 {
	if d.structure != "" {
		return nil
	}
	return &d.relative
}

// wording are the members whose text may change with the program while the
// proof stays the same.
var wording = map[string]bool{
	"engine": true, "findings": true, "cautions": true, "message": true, "source": true, "equation": true, "mark": true,
	"method": true, "methods": true, "input_digest": true,
}

// compareResults sets two canonical results against each other.
func compareResults(was, is strictjson.Raw) (difference, error) {
	var a, b any
	if err := strictjson.DecodeLoosely(was, &a); err != nil {
		return difference{}, err
	}
	if err := strictjson.DecodeLoosely(is, &b); err != nil {
		return difference{}, err
	}
	var d difference
	d.compare("", a, b)
	return d, nil
}

func (d *difference) compare(at string, was, is any) {
	if d.structure != "" {
		return
	}
	switch was := was.(type) {
	case float64:
		now, ok := is.(float64)
		if !ok {
			break
		}
		if was != now {
			d.relative = max(d.relative, math.Abs(was-now)/max(math.Abs(was), math.Abs(now)))
		}
		return
	case []any:
		now, ok := is.([]any)
		if !ok || len(now) != len(was) {
			break
		}
		for i := range was {
			d.compare(at+pointer(i), was[i], now[i])
		}
		return
	case map[string]any:
		now, ok := is.(map[string]any)
		if !ok || len(now) != len(was) {
			break
		}
		for name, value := range was {
			if !wording[name] {
				d.compare(at+pointer(name), value, now[name])
			}
		}
		return
	default:
		if was == is {
			return
		}
	}
	d.structure = at
}

// Recomputer computes the records of a log again, in the log's order, with
// nothing but the log: the curve sets that records name are entries too.
type Recomputer struct {
	sets map[string]*CurveSet
	// Records counts those that were reproduced.
	Records int
}

// curveSet implements lookup.
func (r *Recomputer) curveSet(name string) (*CurveSet, error) {
	if set := r.sets[name]; set != nil {
		return set, nil
	}
	return nil, fmt.Errorf("the log has no curve set %.80q before this record", name)
}

// Entry takes the next entry. The error tells in a sentence what of a record
// does not hold.
func (r *Recomputer) Entry(e ledger.Envelope) error {
	switch e.Type {
	case entryCurveSet:
		var set CurveSet
		if err := strictjson.Decode(e.Body, &set); err != nil {
			return fmt.Errorf("its curve set cannot be read: %w", err)
		}
		if r.sets == nil {
			r.sets = map[string]*CurveSet{}
		}
		r.sets[set.ID+"@"+set.Version] = &set
	case entryRecord:
		var body recordBody
		if err := strictjson.Decode(e.Body, &body); err != nil {
			return fmt.Errorf("its record cannot be read: %w", err)
		}
		found, err := recompute(&body, r)
		switch {
		case err != nil:
			return fmt.Errorf("its record of joint %q, part %q, revision %q cannot be computed again: %w", body.Subject.Joint, body.Subject.Part, body.Subject.Revision, err)
		case !found.reproduced():
			return fmt.Errorf("its record of joint %q, part %q, revision %q was computed again from its input and does not give its result: %s", body.Subject.Joint, body.Subject.Part, body.Subject.Revision, found)
		}
		r.Records++
	}
	return nil
}

// String says what differs.
func (d difference) String() string {
	if d.structure != "" {
		return "it differs at " + d.structure
	}
	return fmt.Sprintf("numbers differ by up to %.3g relative", d.relative)
}

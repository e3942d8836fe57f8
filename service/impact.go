package service

import (
	"context"
	"math"
	"slices"
	"strings"

	"jointledger/service/strictjson"
)

// impactRequest asks what rests on something that does not hold any more.
type impactRequest struct {
	Withdrawn withdrawn `json:"withdrawn"`
	Cursor    *string   `json:"cursor,omitzero"`
}

// withdrawn names exactly one thing.
type withdrawn struct {
	Material string `json:"material,omitzero" validate:"omitempty,text"`
	Method   string `json:"method,omitzero" validate:"omitempty,id"`
	CurveSet string `json:"curve_set,omitzero" validate:"omitempty,text"`
	Record   string `json:"record,omitzero" validate:"omitempty,id"`
}

// Impact is what rests on something: records, newest first, and the decisions
// of the gate that rest on those.
type Impact struct {
	Records    []RecordSummary  `json:"records"`
	Decisions  []ImpactDecision `json:"decisions"`
	NextCursor *string          `json:"next_cursor"`
}

// ImpactDecision is a decision of the gate with those of the records that it
// rests on.
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

// impactPage is how many records one answer has.
const impactPage = 2000

// Impact finds every record and every decision that rests on a material, a
// method, a curve set or a record. A method or curve set without its revision
// means all of them.
func (s *Service) Impact(ctx context.Context, body []byte) (*Impact, error) {
	var request impactRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, malformed(err, "")
	}
	var f faults
	f.check(&request)
	w := request.Withdrawn
	named := 0
	for _, name := range []string{w.Material, w.Method, w.CurveSet, w.Record} {
		if name != "" {
			named++
		}
	}
	if named != 1 {
		f.add("/withdrawn", "must name one of material, method, curve_set and record, and %d are named", named)
	}
	before := int64(math.MaxInt64)
	if request.Cursor != nil {
		index, err := readCursor(*request.Cursor)
		if err != nil {
			f.add("/cursor", "is not a cursor that this server gave")
		}
		before = index
	}
	if found := f.problem(); found != nil {
		return nil, found
	}
	records, err := s.resting(ctx, w, before)
	if err != nil {
		return nil, s.fail(err)
	}
	impact := &Impact{Records: []RecordSummary{}, Decisions: []ImpactDecision{}}
	if len(records) > impactPage {
		records = records[:impactPage]
		cursor := writeCursor(records[impactPage-1].Index)
		impact.NextCursor = &cursor
	}
	var ids []string
	for _, r := range records {
		impact.Records, ids = append(impact.Records, summaryOf(r)), append(ids, r.ID)
	}
	decisions, err := s.store.Decisions(ctx, ids)
	if err != nil {
		return nil, s.fail(err)
	}
	for i, d := range decisions {
		if i == 0 || d.Decision.Index != decisions[i-1].Decision.Index {
			e := d.Decision
			impact.Decisions = append(impact.Decisions, ImpactDecision{e.ID, e.Index, e.At, e.Author, e.Part, e.Revision, e.Verdict, nil})
		}
		last := &impact.Decisions[len(impact.Decisions)-1]
		last.Records = append(last.Records, d.Record)
	}
	return impact, nil
}

// resting finds the records under an index that rest on something, newest
// first, one more than a page where there are more.
func (s *Service) resting(ctx context.Context, w withdrawn, before int64) ([]Summary, error) {
	if w.Record != "" {
		return s.restingOnRecord(ctx, w.Record)
	}
	filters := []Filter{{Material: w.Material, Method: w.Method, CurveSet: w.CurveSet}}
	switch {
	case w.Method != "" && !strings.Contains(w.Method, "@"):
		filters = nil
		for _, m := range append(lugMethods(), fastenerMethods()...) {
			if m.ID == w.Method {
				filters = append(filters, Filter{Method: m.Method})
			}
		}
	case w.CurveSet != "" && !strings.Contains(w.CurveSet, "@"):
		filters = nil
		sets, err := s.CurveSets(ctx)
		if err != nil {
			return nil, err
		}
		for _, set := range sets.Items {
			if set.ID == w.CurveSet {
				filters = append(filters, Filter{CurveSet: set.ID + "@" + set.Version})
			}
		}
	}
	var found []Summary
	for _, filter := range filters {
		page, err := s.store.Records(ctx, filter, before, impactPage+1)
		if err != nil {
			return nil, err
		}
		found = append(found, page...)
	}
	slices.SortFunc(found, func(a, b Summary) int { return int(b.Index - a.Index) })
	found = slices.CompactFunc(found, func(a, b Summary) bool { return a.Index == b.Index })
	return found[:min(len(found), impactPage+1)], nil
}

func (s *Service) restingOnRecord(ctx context.Context, id string) ([]Summary, error) {
	entry, err := s.record(ctx, id)
	if err != nil {
		return nil, err
	}
	about, err := s.store.About(ctx, []string{id})
	if err != nil {
		return nil, err
	}
	return []Summary{{Entry: entry, State: stateOf(about[id])}}, nil
}

package service

import (
	"context"
	"errors"
	"io"
	"runtime"
	"sync"

	"jointledger/service/strictjson"
	"jointledger/strength"
)

// replaysRequest asks which past margins change under today's methods, or with
// another material in the place of one.
type replaysRequest struct {
	Filter     replaysFilter `json:"filter"`
	Substitute *substitution `json:"substitute,omitzero"`
}

// replaysFilter selects records as a list does.
type replaysFilter struct {
	Part     string `json:"part,omitzero" validate:"omitempty,id"`
	Revision string `json:"revision,omitzero" validate:"omitempty,id"`
	Joint    string `json:"joint,omitzero" validate:"omitempty,id"`
	Kind     string `json:"kind,omitzero"`
	Verdict  string `json:"verdict,omitzero"`
	State    string `json:"state,omitzero"`
	Author   string `json:"author,omitzero" validate:"omitempty,id"`
	Method   string `json:"method,omitzero" validate:"omitempty,id"`
	Material string `json:"material,omitzero" validate:"omitempty,id"`
	CurveSet string `json:"curve_set,omitzero" validate:"omitempty,id"`
	Since    string `json:"since,omitzero"`
	Until    string `json:"until,omitzero"`
	Latest   bool   `json:"latest,omitzero"`
}

func (r replaysFilter) query() RecordQuery {
	q := RecordQuery{
		Part: r.Part, Revision: r.Revision, Joint: r.Joint, Kind: r.Kind, Verdict: r.Verdict, State: r.State,
		Author: r.Author, Method: r.Method, Material: r.Material, CurveSet: r.CurveSet, Since: r.Since, Until: r.Until,
	}
	if r.Latest {
		q.Latest = "true"
	}
	return q
}

// substitution puts a material in the place of every one of a name.
type substitution struct {
	Material string   `json:"material" validate:"id"`
	Units    Units    `json:"units"`
	With     Material `json:"with"`
}

// replayLine is one line of the answer; exactly one of its members is not
// null.
type replayLine struct {
	Replay   *replayItem     `json:"replay"`
	Progress *replayProgress `json:"progress"`
	Done     *replayDone     `json:"done"`
}

// replayItem is what became of one record.
type replayItem struct {
	Record     string         `json:"record"`
	Index      int64          `json:"index"`
	Subject    subject        `json:"subject"`
	Kind       string         `json:"kind"`
	State      State          `json:"state"`
	WasVerdict string         `json:"was_verdict"`
	WasMargin  *float64       `json:"was_margin"`
	Recorded   ReplayRecorded `json:"recorded"`
	Current    ReplayCurrent  `json:"current"`
	// SignChanges tells that the verdict or the sign of the margin is not what
	// it was.
	SignChanges bool `json:"sign_changes"`
	// Problem says why the record cannot be calculated now, null where it can.
	Problem *string `json:"problem"`
}

type replayProgress struct {
	Records int64 `json:"records"`
}

type replayDone struct {
	Records       int64 `json:"records"`
	SignChanges   int64 `json:"sign_changes"`
	NotReproduced int64 `json:"not_reproduced"`
}

// replayPage is how many records are computed between two lines of progress.
const replayPage = 200

// Replays prepares the replay of every record that a filter selects.
func (s *Service) Replays(ctx context.Context, body []byte) (func(context.Context, io.Writer) error, error) {
	var request replaysRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, malformed(err, "")
	}
	var f faults
	f.check(&request)
	filter, _, _ := request.Filter.query().filter(&f, "/filter")
	if found := f.problem(); found != nil {
		return nil, found
	}
	page, err := s.store.Records(ctx, filter, int64(1)<<62, replayPage)
	if err != nil {
		return nil, s.fail(err)
	}
	return func(ctx context.Context, w io.Writer) error {
		var done replayDone
		for {
			items, err := s.replayAll(ctx, page, request.Substitute)
			if err != nil {
				return err
			}
			for _, item := range items {
				done.Records++
				if item.SignChanges {
					done.SignChanges++
				}
				if !item.Recorded.Reproduced {
					done.NotReproduced++
				}
				if err := writeLine(w, replayLine{Replay: item}); err != nil {
					return err
				}
			}
			if len(page) < replayPage {
				return writeLine(w, replayLine{Done: &done})
			}
			if err := writeLine(w, replayLine{Progress: &replayProgress{done.Records}}); err != nil {
				return err
			}
			if page, err = s.store.Records(ctx, filter, page[len(page)-1].Index, replayPage); err != nil {
				return err
			}
		}
	}, nil
}

func writeLine(w io.Writer, line any) error {
	text, err := strictjson.Encode(line)
	if err != nil {
		return err
	}
	_, err = w.Write(append(text, '\n'))
	return err
}

// replayAll replays a page of records on all cores.
func (s *Service) replayAll(ctx context.Context, page []Summary, substitute *substitution) ([]*replayItem, error) {
	items, errs := make([]*replayItem, len(page)), make([]error, len(page))
	var work sync.WaitGroup
	slots := make(chan struct{}, runtime.GOMAXPROCS(0))
	for i := range page {
		slots <- struct{}{}
		work.Go(func() {
			items[i], errs[i] = s.replayItem(ctx, &page[i], substitute)
			<-slots
		})
	}
	work.Wait()
	return items, errors.Join(errs...)
}

func (s *Service) replayItem(ctx context.Context, summary *Summary, substitute *substitution) (*replayItem, error) {
	entry, err := s.store.Entry(ctx, summary.Index)
	if err != nil {
		return nil, err
	}
	item := &replayItem{
		Record: summary.ID, Index: summary.Index, Subject: subject(summary.Subject), Kind: summary.Kind, State: summary.State,
		WasVerdict: summary.Verdict, WasMargin: summary.Margin,
	}
	r, err := s.replayEntry(ctx, entry, substitute)
	if p := (*Problem)(nil); errors.As(err, &p) && p.Code != Unavailable {
		item.Problem = text(p.Error())
		item.Current.Verdict = strength.Undetermined.String()
		item.SignChanges = item.WasVerdict != item.Current.Verdict
		return item, nil
	}
	if err != nil {
		return nil, err
	}
	item.Recorded, item.Current = r.Recorded, r.Current
	if r.refused != nil {
		item.Problem = text(r.refused.Error())
	}
	negative := func(m *float64) bool { return m != nil && *m < 0 }
	item.SignChanges = item.WasVerdict != r.Current.Verdict || negative(item.WasMargin) != negative(r.Current.Margin)
	return item, nil
}

// in writes the material in the units of a document.
func (s *substitution) in(u Units) (strictjson.Raw, error) {
	return strictjson.Encode(s.With.stresses(func(x float64) float64 {
		if s.Units == u {
			return x
		}
		return x * s.Units.scale(strength.Stress) / u.scale(strength.Stress)
	}))
}

// substituted puts the material in the place of the named one, wherever an
// input has it.
func substituted(input strictjson.Raw, s *substitution) (strictjson.Raw, error) {
	if s == nil {
		return input, nil
	}
	var document struct {
		Units Units `json:"units"`
	}
	if err := strictjson.DecodeLoosely(input, &document); err != nil {
		return nil, err
	}
	with, err := s.in(document.Units)
	if err != nil {
		return nil, err
	}
	var members any
	if err := strictjson.DecodeLoosely(input, &members); err != nil {
		return nil, err
	}
	var replacement any
	if err := strictjson.DecodeLoosely(with, &replacement); err != nil {
		return nil, err
	}
	return strictjson.Encode(replaceMaterial(members, s.Material, replacement))
}

func replaceMaterial(value any, name string, with any) any {
	switch value := value.(type) {
	case []any:
		for i := range value {
			value[i] = replaceMaterial(value[i], name, with)
		}
	case map[string]any:
		for member, v := range value {
			material, _ := v.(map[string]any)
			if member == "material" && material["name"] == name {
				value[member] = with
			} else {
				value[member] = replaceMaterial(v, name, with)
			}
		}
	}
	return value
}

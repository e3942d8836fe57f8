package store_test

import (
	"cmp"
	"errors"
	"flag"
	"math"
	"path/filepath"
	"reflect"
	"slices"
	"testing"

	diff "github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"

	"jointledger/service"
	"jointledger/store"
	"jointledger/store/storetest"
)

// model is a store in the plainest words: a list, searched from end to end.
type model struct {
	head    service.Head
	entries []service.Entry
	answers map[service.IdempotencyKey]service.Answer
	keys    []service.Key
}

func (m *model) state(id string) service.State {
	state := service.Recorded
	for _, e := range m.entries {
		switch {
		case e.Target != id:
		case e.Type == "withdrawal":
			return service.Withdrawn
		case e.Role == "approved":
			state = service.Approved
		case e.Role == "checked" && state == service.Recorded:
			state = service.Checked
		}
	}
	return state
}

func (m *model) isLatest(r service.Entry) bool {
	for _, e := range m.entries[r.Index+1:] {
		if e.Type == "record" && e.Subject == r.Subject && e.Kind == r.Kind {
			return false
		}
	}
	return true
}

func (m *model) records(f service.Filter, before int64, limit int) []service.Summary {
	var found []service.Summary
	has := func(e service.Entry, kind, value string) bool {
		return value == "" || slices.Contains(e.Terms, service.Term{Kind: kind, Value: value})
	}
	is := func(asked, value string) bool { return asked == "" || asked == value }
	for _, e := range slices.Backward(m.entries) {
		state := m.state(e.ID)
		if e.Type == "record" && e.Index < before && len(found) < limit &&
			is(f.Part, e.Part) && is(f.Revision, e.Revision) && is(f.Joint, e.Joint) && is(f.Kind, e.Kind) && is(f.Verdict, e.Verdict) &&
			is(string(f.State), string(state)) && is(f.Author, e.Author) && has(e, "method", f.Method) && has(e, "material", f.Material) && has(e, "curve-set", f.CurveSet) &&
			e.At >= f.Since && (f.Until == "" || e.At < f.Until) && (!f.Latest || m.isLatest(e)) {
			e.Bytes, e.Terms = nil, nil
			found = append(found, service.Summary{Entry: e, State: state})
		}
	}
	return found
}

func (m *model) latest(part, revision string) []service.Entry {
	var found []service.Entry
	for _, e := range m.entries {
		if e.Type == "record" && e.Part == part && e.Revision == revision && m.isLatest(e) {
			e.Terms = nil
			found = append(found, e)
		}
	}
	return found
}

func (m *model) about(ids []string) map[string][]service.Entry {
	found := map[string][]service.Entry{}
	for _, e := range m.entries {
		if slices.Contains(ids, e.Target) && e.Target != "" && (e.Type == "sign-off" || e.Type == "withdrawal") {
			found[e.Target] = append(found[e.Target], e)
		}
	}
	return found
}

func (m *model) append(b service.Batch) {
	m.head = b.Head
	m.entries = append(m.entries, b.Entries...)
	for _, a := range b.Answers {
		m.answers[a.IdempotencyKey] = a
	}
	for _, k := range b.Keys {
		if k.Add != nil {
			m.keys = append(m.keys, *k.Add)
		}
		for i := range m.keys {
			if m.keys[i].ID == k.Revoke {
				m.keys[i].Revoked = k.At
			}
		}
	}
}

// machine drives both engines and the model through the same operations.
type machine struct {
	tb     testing.TB
	sqlite service.Store
	model  *model
	stores map[string]service.Store
	n      int
}

// same checks that every engine answers as the model does.
func same[T any](t *rapid.T, m *machine, what string, want T, ask func(s service.Store) (T, error)) {
	for engine, s := range m.stores {
		got, err := ask(s)
		if err != nil {
			t.Fatalf("%s: %s: %v", engine, what, err)
		}
		if reflect.DeepEqual(want, got) {
			continue // quick, and nearly always so
		}
		if d := diff.Diff(want, got, cmpopts.EquateEmpty()); d != "" {
			t.Fatalf("%s: %s (-model +engine):\n%s", engine, what, d)
		}
	}
}

var (
	parts     = rapid.SampledFrom([]string{"SM-110", "SM-120", "é", "E"})
	revisions = rapid.SampledFrom([]string{"A", "B"})
	joints    = rapid.SampledFrom([]string{"J1", "J2", "j1"})
	aspects   = rapid.SampledFrom([]string{"", "lower"})
	kinds     = rapid.SampledFrom([]string{"lug", "splice"})
	verdicts  = rapid.SampledFrom([]string{"adequate", "inadequate", "undetermined"})
	methods   = rapid.SampledFrom([]string{"elementary@1", "elementary@2"})
	materials = rapid.SampledFrom([]string{"plate", "Plate", "pl\x00ate"})
)

func (m *machine) entry(t *rapid.T) service.Entry {
	n := m.n
	m.n++
	kind := rapid.SampledFrom([]string{"record", "record", "record", "sign-off", "withdrawal", "curve-set", "release-decision"}).Draw(t, "type")
	var c service.Columns
	switch kind {
	case "record":
		c = service.Columns{
			Subject:        service.Subject{Part: parts.Draw(t, "part"), Revision: revisions.Draw(t, "revision"), Joint: joints.Draw(t, "joint"), Aspect: aspects.Draw(t, "aspect")},
			GeometryDigest: "g", Kind: kinds.Draw(t, "kind"), Verdict: verdicts.Draw(t, "verdict"),
		}
		if rapid.Bool().Draw(t, "has margin") {
			margin := rapid.Float64Range(-1, 10).Draw(t, "margin")
			c.Margin = &margin
		}
		c.Terms = rapid.SliceOfN(rapid.Custom(func(t *rapid.T) service.Term {
			switch rapid.IntRange(0, 2).Draw(t, "term") {
			case 0:
				return service.Term{Kind: "method", Value: methods.Draw(t, "method")}
			case 1:
				return service.Term{Kind: "material", Value: materials.Draw(t, "material")}
			}
			return service.Term{Kind: "curve-set", Value: "reed@1"}
		}), 0, 4).Draw(t, "terms")
		if len(c.Terms) == 0 {
			c.Terms = nil
		}
	case "sign-off", "withdrawal":
		c.Target = m.someID(t)
		if kind == "sign-off" {
			c.Role = rapid.SampledFrom([]string{"checked", "approved"}).Draw(t, "role")
		}
	case "release-decision":
		c = service.Columns{Subject: service.Subject{Part: parts.Draw(t, "part"), Revision: "A"}, Verdict: "hold"}
	}
	return seal(m.tb, 1, n, kind, c)
}

// someID is that of an entry that is in the log, or that comes before in the
// same batch.
func (m *machine) someID(t *rapid.T) string {
	return uuid(1, rapid.IntRange(0, max(0, m.n-1)).Draw(t, "target"))
}

func (m *machine) Append(t *rapid.T) {
	entries := rapid.SliceOfN(rapid.Custom(m.entry), 1, 12).Draw(t, "entries")
	b := on(m.tb, m.sqlite, m.model.head, entries...)
	for i := range b.Entries {
		if rapid.IntRange(0, 3).Draw(t, "answered") > 0 {
			continue
		}
		key := service.IdempotencyKey{Caller: "m.reed", Method: "POST", Path: "/v1/\xff", Key: entries[i].ID}
		b.Answers = append(b.Answers, service.Answer{IdempotencyKey: key, RequestDigest: b.Entries[i].Leaf, Index: b.Entries[i].Index, State: service.Recorded})
	}
	if rapid.IntRange(0, 4).Draw(t, "key") == 0 {
		b.Keys = append(b.Keys, service.KeyChange{Add: apiKey(m.n)})
		for _, k := range m.model.keys {
			if k.Revoked == "" {
				b.Keys = append(b.Keys, service.KeyChange{Revoke: k.ID, At: "2026-02-01T00:00:00.000Z"})
				break
			}
		}
	}
	for engine, s := range m.stores {
		if err := s.Append(m.tb.Context(), b); err != nil {
			t.Fatalf("%s: %v", engine, err)
		}
		if err := s.Append(m.tb.Context(), b); !errors.Is(err, service.ErrHeadMoved) {
			t.Fatalf("%s: the same batch again: %v", engine, err)
		}
	}
	m.model.append(b)
}

func (m *machine) Records(t *rapid.T) {
	maybe := func(g *rapid.Generator[string], name string) string {
		if rapid.IntRange(0, 3).Draw(t, "with "+name) > 0 {
			return ""
		}
		return g.Draw(t, name)
	}
	times := rapid.SampledFrom([]string{"2026-01-01T10:00:05.000Z", "2026-01-01T10:00:20.000Z", "2026-01-01T10:01:00.000Z"})
	states := rapid.SampledFrom([]string{"recorded", "checked", "approved", "withdrawn"})
	f := service.Filter{
		Part: maybe(parts, "part"), Revision: maybe(revisions, "revision"), Joint: maybe(joints, "joint"), Kind: maybe(kinds, "kind"),
		Verdict: maybe(verdicts, "verdict"), State: service.State(maybe(states, "state")), Author: maybe(rapid.SampledFrom([]string{"m.reed", "nobody"}), "author"),
		Method: maybe(methods, "method"), Material: maybe(materials, "material"), CurveSet: maybe(rapid.Just("reed@1"), "curve set"),
		Since: maybe(times, "since"), Until: maybe(times, "until"), Latest: rapid.IntRange(0, 3).Draw(t, "latest") == 0,
	}
	before, limit := int64(math.MaxInt64), rapid.IntRange(1, 20).Draw(t, "limit")
	if rapid.Bool().Draw(t, "from the middle") {
		before = rapid.Int64Range(0, m.model.head.Size+1).Draw(t, "before")
	}
	same(t, m, "records", m.model.records(f, before, limit), func(s service.Store) ([]service.Summary, error) {
		return s.Records(m.tb.Context(), f, before, limit)
	})
}

func (m *machine) Latest(t *rapid.T) {
	part, revision := parts.Draw(t, "part"), revisions.Draw(t, "revision")
	same(t, m, "latest", m.model.latest(part, revision), func(s service.Store) ([]service.Entry, error) {
		return latestOf(m.tb, s, part, revision)
	})
}

func (m *machine) Look(t *rapid.T) {
	ctx := m.tb.Context()
	same(t, m, "entries", m.model.entries, func(s service.Store) (found []service.Entry, err error) {
		err = s.Entries(ctx, 0, math.MaxInt64, func(e service.Entry) error {
			found = append(found, e)
			return nil
		})
		return found, err
	})
	ids := []string{m.someID(t), m.someID(t)}
	same(t, m, "about", m.model.about(ids), func(s service.Store) (map[string][]service.Entry, error) { return s.About(ctx, ids) })
	var keys []service.IdempotencyKey
	for key := range m.model.answers {
		keys = append(keys, key)
	}
	slices.SortFunc(keys, func(a, b service.IdempotencyKey) int { return cmp.Compare(a.Key, b.Key) })
	keys = append(keys[:min(len(keys), 3)], service.IdempotencyKey{Caller: "m.reed", Method: "POST", Path: "/", Key: "unknown"})
	answers := make([]*service.Answer, len(keys))
	for i, key := range keys {
		if a, ok := m.model.answers[key]; ok {
			answers[i] = &a
		}
	}
	same(t, m, "answered", answers, func(s service.Store) ([]*service.Answer, error) { return s.Answered(ctx, keys) })
}

// Check compares what is cheap to compare after every step.
func (m *machine) Check(t *rapid.T) {
	ctx := m.tb.Context()
	same(t, m, "head", m.model.head, func(s service.Store) (service.Head, error) { return s.Head(ctx) })
	same(t, m, "keys", m.model.keys, func(s service.Store) ([]service.Key, error) { return s.Keys(ctx) })
}

// Both engines give the same answers, and the same bytes and hashes, to the
// same operations, and those of the model.
func TestEnginesAgree(t *testing.T) {
	// Each check takes a new database of each engine.
	for name, value := range map[string]string{"rapid.checks": "12", "rapid.steps": "50"} {
		standing := flag.Lookup(name).Value.String()
		if err := flag.Set(name, value); err != nil {
			t.Fatal(err)
		}
		defer flag.Set(name, standing)
	}
	rapid.Check(t, func(r *rapid.T) {
		sqlite, err := store.OpenSQLite(t.Context(), filepath.Join(t.TempDir(), "ledger.db"))
		if err != nil {
			r.Fatal(err)
		}
		defer sqlite.Close()
		postgres := storetest.Postgres(t)
		m := &machine{
			tb: t, sqlite: sqlite, stores: map[string]service.Store{"SQLite": sqlite, "Postgres": postgres},
			model: &model{head: headOf(t, sqlite), answers: map[service.IdempotencyKey]service.Answer{}},
		}
		r.Repeat(rapid.StateMachineActions(m))
		for _, s := range m.stores {
			verify(t, s)
		}
	})
}

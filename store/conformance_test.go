package store_test

import (
	"bytes"
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store/storetest"
)

func TestEmptyLog(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		ctx := t.Context()
		if err := s.Ready(ctx); err != nil {
			t.Error(err)
		}
		if head := headOf(t, s); head != (service.Head{Root: ledger.EmptyRoot}) {
			t.Errorf("head %+v", head)
		}
		for _, name := range []string{"first", "second"} {
			id, err := s.Claim(ctx, service.Identity{Origin: name, VerifierKey: name + "+key"})
			if err != nil || id != (service.Identity{Origin: "first", VerifierKey: "first+key"}) {
				t.Errorf("claimed as %s: %+v, %v", name, id, err)
			}
		}
		if _, err := s.Entry(ctx, 0); !errors.Is(err, service.ErrNotFound) {
			t.Errorf("entry 0: %v", err)
		}
		if _, err := s.Key(ctx, [32]byte{}); !errors.Is(err, service.ErrNotFound) {
			t.Errorf("key: %v", err)
		}
		if keys, err := s.Keys(ctx); err != nil || len(keys) > 0 {
			t.Errorf("keys: %v, %v", keys, err)
		}
		if hashes, err := s.Hashes(ctx, nil); err != nil || len(hashes) > 0 {
			t.Errorf("hashes: %v, %v", hashes, err)
		}
		if _, err := s.Hashes(ctx, []int64{0}); !errors.Is(err, service.ErrNotFound) {
			t.Errorf("hash 0: %v", err)
		}
		if found, err := s.Records(ctx, service.Filter{}, math.MaxInt64, 10); err != nil || len(found) > 0 {
			t.Errorf("records: %v, %v", found, err)
		}
		verify(t, s)
	})
}

// latestOf lists the latest records of a part and revision.
func latestOf(tb testing.TB, s service.Store, part, revision string) (found []service.Entry, err error) {
	tb.Helper()
	err = s.Latest(tb.Context(), part, revision, func(e service.Entry) error {
		found = append(found, e)
		return nil
	})
	return found, err
}

// Everything that goes in comes out again, to the last bit, but for the sign of
// a zero, which the entry's own form (RFC 8785) does not have either.
func TestRoundTrip(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		ctx := t.Context()
		margin := func(f float64) *float64 { return &f }
		plain := record(t, 1, 0, "SM-110", "A", "J1")
		odd := seal(t, 1, 1, "record", service.Columns{
			Subject:        service.Subject{Part: "SM-110 'é' \"%_\\", Revision: "β", Joint: "🔩", Aspect: " lower "},
			GeometryDigest: "x", Kind: "splice", Verdict: "undetermined",
			Terms: []service.Term{{Kind: "material", Value: "a\x00b\n\ufeff"}, {Kind: "material", Value: "a\x00b\n\ufeff"}, {Kind: "method", Value: ""}},
		})
		entries := []service.Entry{plain, odd}
		for i, f := range []float64{math.MaxFloat64, -math.MaxFloat64, 5e-324, 0.1, math.Copysign(0, -1)} {
			e := record(t, 1, 2+i, "SM-120", "A", "J1")
			e.Margin = margin(f)
			entries = append(entries, e)
		}
		entries = append(entries, signOff(t, 1, 20, plain.ID, "checked"), withdrawal(t, 1, 21, odd.ID), seal(t, 1, 22, "curve-set", service.Columns{}))
		b := on(t, s, headOf(t, s), entries...)
		b.Answers = []service.Answer{answer("/v1/records", "k 1", 0), answer("/v1/\x00\xff", "k 1", 1), answer("/v1/records", "k 2", 2)}
		first, second := apiKey(1), apiKey(2)
		b.Keys = []service.KeyChange{{Add: second}, {Add: first}, {Revoke: second.ID, At: "2026-02-01T00:00:00.000Z"}}
		if err := s.Append(ctx, b); err != nil {
			t.Fatal(err)
		}
		if head := headOf(t, s); head != b.Head {
			t.Errorf("head %+v, want %+v", head, b.Head)
		}
		for i, want := range b.Entries {
			got, err := s.Entry(ctx, int64(i))
			if diff := cmp.Diff(want, got); err != nil || diff != "" {
				t.Errorf("entry %d: %v\n%s", i, err, diff)
			}
			if got, err = s.EntryByID(ctx, want.ID); err != nil || !cmp.Equal(want, got) {
				t.Errorf("entry %s: %v", want.ID, err)
			}
		}
		about, err := s.About(ctx, []string{odd.ID, plain.ID, plain.ID, "", "\x00", uuid(9, 9)})
		want := map[string][]service.Entry{plain.ID: {b.Entries[7]}, odd.ID: {b.Entries[8]}}
		if diff := cmp.Diff(want, about); err != nil || diff != "" {
			t.Errorf("about: %v\n%s", err, diff)
		}
		keys := []service.IdempotencyKey{
			b.Answers[2].IdempotencyKey, b.Answers[1].IdempotencyKey,
			{Caller: "m.reed", Method: "POST", Path: "/v1/records", Key: "k 3"},
			{Caller: "\x00"},
			b.Answers[0].IdempotencyKey, b.Answers[0].IdempotencyKey,
		}
		answers, err := s.Answered(ctx, keys)
		if diff := cmp.Diff([]*service.Answer{&b.Answers[2], &b.Answers[1], nil, nil, &b.Answers[0], &b.Answers[0]}, answers); err != nil || diff != "" {
			t.Errorf("answers: %v\n%s", err, diff)
		}
		second.Revoked = "2026-02-01T00:00:00.000Z"
		for _, at := range []string{"2026-03-02T00:00:00.000Z", "2026-03-01T00:00:00.000Z"} {
			if err := s.Touch(ctx, first.ID, at); err != nil {
				t.Error(err)
			}
		}
		first.LastUsed = "2026-03-02T00:00:00.000Z"
		stored, err := s.Keys(ctx)
		if diff := cmp.Diff([]service.Key{*second, *first}, stored); err != nil || diff != "" {
			t.Errorf("keys: %v\n%s", err, diff)
		}
		if key, err := s.Key(ctx, first.Hash); err != nil || key != *first {
			t.Errorf("key: %+v, %v", key, err)
		}
		for _, filter := range []service.Filter{{Material: "a\x00b\n\ufeff"}, {Part: odd.Part}, {Joint: "🔩", Latest: true}, {State: service.Withdrawn}} {
			found, err := s.Records(ctx, filter, math.MaxInt64, 10)
			if err != nil || len(found) != 1 || found[0].ID != odd.ID || found[0].State != service.Withdrawn || found[0].Bytes != nil || found[0].Terms != nil {
				t.Errorf("%+v: %+v, %v", filter, found, err)
			}
		}
		verify(t, s)
	})
}

func TestCurveSets(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		ctx := t.Context()
		set := func(n int, id, version string) service.Entry {
			return seal(t, 1, n, "curve-set", service.Columns{Terms: []service.Term{{Kind: "curve-set", Value: id + "@" + version}, {Kind: "curve-set-id", Value: id}}})
		}
		uses := record(t, 1, 5, "SM-110", "A", "J1")
		uses.Terms = []service.Term{{Kind: "curve-set", Value: "reed@1"}, {Kind: "curve-set-id", Value: "reed"}}
		e := put(t, s, set(0, "reed", "1"), set(1, "sedge", "1"), set(2, "reed", "2"), uses).Entries
		for name, want := range map[string]int{"reed": 2, "reed@1": 0, "reed@2": 2, "sedge": 1, "sedge@1": 1} {
			if got, err := s.CurveSet(ctx, name); err != nil || !cmp.Equal(got, e[want]) {
				t.Errorf("%s: %+v, %v", name, got, err)
			}
		}
		for _, name := range []string{"", "ree", "reed@3", "\x00", "\xff"} {
			if got, err := s.CurveSet(ctx, name); !errors.Is(err, service.ErrNotFound) {
				t.Errorf("%q: %+v, %v", name, got, err)
			}
		}
		all, err := s.CurveSets(ctx)
		if diff := cmp.Diff(e[:3], all); err != nil || diff != "" {
			t.Errorf("all: %v\n%s", err, diff)
		}
	})
}

// What cannot be text finds nothing and is not stored, in the same way.
func TestUnstorableTexts(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		ctx := t.Context()
		put(t, s, record(t, 1, 0, "SM-110", "A", "J1"))
		for _, bad := range []string{"\x00", "SM-110\x00", "\xff"} {
			if _, err := s.EntryByID(ctx, bad); !errors.Is(err, service.ErrNotFound) {
				t.Errorf("id %q: %v", bad, err)
			}
			if found, err := latestOf(t, s, bad, "A"); err != nil || len(found) > 0 {
				t.Errorf("latest of %q: %v, %v", bad, found, err)
			}
			for _, f := range []service.Filter{{Part: bad}, {Revision: bad}, {Joint: bad}, {Kind: bad}, {Verdict: bad}, {State: service.State(bad)}, {Author: bad}, {Method: bad}, {Material: bad}, {CurveSet: bad}, {Since: bad}, {Until: bad}} {
				if found, err := s.Records(ctx, f, math.MaxInt64, 10); err != nil || len(found) > 0 {
					t.Errorf("%+v: %v, %v", f, found, err)
				}
			}
			e := record(t, 1, 1, "SM-110", "A", "J1")
			e.Author = bad
			b := on(t, s, headOf(t, s), e)
			if err := s.Append(ctx, b); err == nil || errors.Is(err, service.ErrUnavailable) {
				t.Errorf("author %q: %v", bad, err)
			}
		}
		verify(t, s)
	})
}

// A batch that contradicts itself is refused, and leaves nothing.
func TestBadBatches(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		known := put(t, s, record(t, 1, 0, "SM-110", "A", "J1"))
		taken := answer("/v1/records", "taken", 1)
		b := on(t, s, known.Head, record(t, 1, 1, "SM-110", "A", "J1"))
		b.Answers, b.Keys = []service.Answer{taken}, []service.KeyChange{{Add: apiKey(1)}}
		if err := s.Append(t.Context(), b); err != nil {
			t.Fatal(err)
		}
		for name, spoil := range map[string]func(*service.Batch){
			"empty":            func(b *service.Batch) { b.Entries = nil },
			"head too far":     func(b *service.Batch) { b.Head.Size++ },
			"index of another": func(b *service.Batch) { b.Entries[1].Index = 0 },
			"a hash too few":   func(b *service.Batch) { b.Hashes = b.Hashes[1:] },
			"a hash too many":  func(b *service.Batch) { b.Hashes = append(b.Hashes, b.Hashes[0]) },
			"another leaf":     func(b *service.Batch) { b.Entries[1].Leaf[0] ^= 1 },
			"answer elsewhere": func(b *service.Batch) { b.Answers = []service.Answer{answer("/v1/records", "new", 1)} },
			"id taken":         func(b *service.Batch) { b.Entries[1].ID = known.Entries[0].ID },
			"id twice":         func(b *service.Batch) { b.Entries[1].ID = b.Entries[0].ID },
			"answer taken":     func(b *service.Batch) { b.Answers = []service.Answer{answer("/v1/records", "taken", 3)} },
			"key taken":        func(b *service.Batch) { b.Keys = []service.KeyChange{{Add: apiKey(1)}} },
			"revoke nothing":   func(b *service.Batch) { b.Keys = []service.KeyChange{{Revoke: "key-7"}} },
			"revoke twice": func(b *service.Batch) {
				b.Keys = []service.KeyChange{{Revoke: "key-1", At: "t"}, {Revoke: "key-1", At: "t"}}
			},
		} {
			before := dump(t, s)
			b := on(t, s, headOf(t, s), record(t, 2, 0, "SM-110", "A", "J1"), record(t, 2, 1, "SM-110", "A", "J2"))
			b.Answers, b.Keys = []service.Answer{answer("/v1/records", "fresh", 2)}, []service.KeyChange{{Add: apiKey(5)}}
			spoil(&b)
			if err := s.Append(t.Context(), b); err == nil || errors.Is(err, service.ErrUnavailable) || errors.Is(err, service.ErrHeadMoved) {
				t.Errorf("%s: %v", name, err)
			}
			if diff := cmp.Diff(before, dump(t, s)); diff != "" {
				t.Errorf("%s left something:\n%s", name, diff)
			}
		}
		verify(t, s)
	})
}

func TestHeadMovedLeavesNothing(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		ctx := t.Context()
		stale := headOf(t, s)
		put(t, s, record(t, 1, 0, "SM-110", "A", "J1"), record(t, 1, 1, "SM-110", "A", "J2"))
		late := on(t, s, stale, record(t, 2, 0, "SM-110", "A", "J3"))
		late.Answers, late.Keys = []service.Answer{answer("/v1/records", "k", 0)}, []service.KeyChange{{Add: apiKey(1)}}
		before := dump(t, s)
		if err := s.Append(ctx, late); !errors.Is(err, service.ErrHeadMoved) {
			t.Errorf("on a stale head: %v", err)
		}
		// The right size and another root: a log that forked elsewhere.
		forked := headOf(t, s)
		b := on(t, s, forked, record(t, 2, 1, "SM-110", "A", "J3"))
		b.Base.Root[0] ^= 1
		if err := s.Append(ctx, b); !errors.Is(err, service.ErrHeadMoved) {
			t.Errorf("on a forked head: %v", err)
		}
		if diff := cmp.Diff(before, dump(t, s)); diff != "" {
			t.Errorf("something is left:\n%s", diff)
		}
		if err := s.Append(ctx, on(t, s, headOf(t, s), record(t, 2, 1, "SM-110", "A", "J3"))); err != nil {
			t.Error(err)
		}
		verify(t, s)
	})
}

func TestCancelledCallsLeaveNothing(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		put(t, s, record(t, 1, 0, "SM-110", "A", "J1"))
		b := on(t, s, headOf(t, s), record(t, 1, 1, "SM-110", "A", "J1"))
		before := dump(t, s)
		cancelled, cancel := context.WithCancel(t.Context())
		cancel()
		if err := s.Append(cancelled, b); !errors.Is(err, service.ErrUnavailable) || !errors.Is(err, context.Canceled) {
			t.Errorf("append: %v", err)
		}
		if _, err := s.Entry(cancelled, 0); !errors.Is(err, service.ErrUnavailable) {
			t.Errorf("entry: %v", err)
		}
		if diff := cmp.Diff(before, dump(t, s)); diff != "" {
			t.Errorf("something is left:\n%s", diff)
		}
		if err := s.Append(t.Context(), b); err != nil {
			t.Error(err)
		}
	})
}

// Entries come in pages, none of which is too large, and stop when told.
func TestEntriesInPages(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		var entries []service.Entry
		for n := range 600 {
			entries = append(entries, record(t, 1, n, "SM-110", "A", "J1"))
		}
		for n := range 4 { // each more than a page
			e := record(t, 1, 1000+n, "SM-110", "A", "J1")
			var err error
			e.Bytes, e.Leaf, err = ledger.Seal(ledger.Envelope{Type: e.Type, ID: e.ID, At: e.At, Author: e.Author, Body: []byte(`{"a":"` + strings.Repeat("x", 5<<20) + `"}`)})
			if err != nil {
				t.Fatal(err)
			}
			entries = append(entries, e)
		}
		b := put(t, s, entries...)
		for _, span := range [][2]int64{{0, 604}, {0, 1 << 40}, {255, 257}, {590, 603}, {604, 700}, {10, 10}, {10, 5}} {
			var got []service.Entry
			if err := s.Entries(t.Context(), span[0], span[1], func(e service.Entry) error {
				got = append(got, e)
				return nil
			}); err != nil {
				t.Error(err)
			}
			want := b.Entries[min(span[0], 604):max(min(span[0], 604), min(span[1], 604))]
			if len(got) != len(want) {
				t.Errorf("%v: %d entries, want %d", span, len(got), len(want))
				continue
			}
			for i := range want {
				if !bytes.Equal(got[i].Bytes, want[i].Bytes) || got[i].ID != want[i].ID || len(got[i].Terms) != 2 {
					t.Fatalf("%v: entry %d differs", span, want[i].Index)
				}
			}
		}
		enough := errors.New("enough")
		n := 0
		if err := s.Entries(t.Context(), 0, 604, func(service.Entry) error {
			if n++; n == 300 {
				return enough
			}
			return nil
		}); !errors.Is(err, enough) || n != 300 {
			t.Errorf("stopped after %d with %v", n, err)
		}
		verify(t, s)
	})
}

// dump tells everything that a store has, by its own methods.
func dump(t testing.TB, s service.Store) map[string]any {
	t.Helper()
	ctx := t.Context()
	head := headOf(t, s)
	var entries []service.Entry
	if err := s.Entries(ctx, 0, 1<<40, func(e service.Entry) error {
		entries = append(entries, e)
		return nil
	}); err != nil {
		t.Fatal(err)
	}
	keys, err := s.Keys(ctx)
	if err != nil {
		t.Fatal(err)
	}
	list := func(f service.Filter) []service.Summary {
		found, err := s.Records(ctx, f, math.MaxInt64, 1000)
		if err != nil {
			t.Fatal(err)
		}
		return found
	}
	answers, err := s.Answered(ctx, []service.IdempotencyKey{
		answer("/v1/records", "k", 0).IdempotencyKey, answer("/v1/records", "fresh", 0).IdempotencyKey, answer("/v1/records", "new", 0).IdempotencyKey,
	})
	if err != nil {
		t.Fatal(err)
	}
	var hashes []ledger.Hash
	for i := int64(0); ; i++ {
		found, err := s.Hashes(ctx, []int64{i})
		if errors.Is(err, service.ErrNotFound) {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		hashes = append(hashes, found...)
	}
	return map[string]any{
		"head": head, "entries": entries, "keys": keys, "records": list(service.Filter{}), "latest": list(service.Filter{Latest: true}), "answers": answers, "hashes": hashes,
	}
}

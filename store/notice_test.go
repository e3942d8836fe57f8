package store_test

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"jointledger/service"
	"jointledger/store/storetest"
)

func TestDecisions(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		decision := func(n int, verdict string, records ...string) service.Entry {
			c := service.Columns{Subject: service.Subject{Part: "SM-110", Revision: "A"}, Verdict: verdict}
			for _, id := range records {
				c.Terms = append(c.Terms, service.Term{Kind: "record", Value: id})
			}
			return seal(t, 1, n, "release-decision", c)
		}
		a, b := record(t, 1, 0, "SM-110", "A", "J1"), record(t, 1, 1, "SM-110", "A", "J2")
		// A material may be called as a record is.
		named := record(t, 1, 2, "SM-110", "A", "J3")
		named.Terms = []service.Term{{Kind: "record", Value: a.ID}, {Kind: "material", Value: a.ID}}
		e := put(t, s, a, b, named, decision(3, "hold", a.ID), decision(4, "release", a.ID, b.ID), decision(5, "release")).Entries
		for i := range e {
			e[i].Bytes, e[i].Terms = nil, nil
		}
		for _, c := range []struct {
			asked []string
			want  []service.Resting
		}{
			{nil, nil},
			{[]string{"", "\x00", "\xff", uuid(9, 9)}, nil},
			{[]string{a.ID}, []service.Resting{{Record: a.ID, Decision: e[3]}, {Record: a.ID, Decision: e[4]}}},
			{[]string{b.ID, a.ID}, []service.Resting{{Record: a.ID, Decision: e[3]}, {Record: a.ID, Decision: e[4]}, {Record: b.ID, Decision: e[4]}}},
		} {
			got, err := s.Decisions(t.Context(), c.asked)
			if diff := cmp.Diff(c.want, got, cmpopts.EquateEmpty()); err != nil || diff != "" {
				t.Errorf("%q: %v\n%s", c.asked, err, diff)
			}
		}
	})
}

func TestNotices(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		ctx := t.Context()
		at := func(second string) string { return "2026-03-01T00:00:" + second + ".000Z" }
		notice := func(id, target, due string) service.Notice {
			return service.Notice{ID: id, Target: target, Body: []byte("{\"\x00\"}"), Due: at(due)}
		}
		take := func(now, until string, limit int, want ...string) []service.Notice {
			t.Helper()
			found, err := s.TakeNotices(ctx, at(now), at(until), limit)
			if err != nil {
				t.Fatal(err)
			}
			got := map[string]bool{}
			for _, n := range found {
				got[n.ID+">"+n.Target] = true
				if string(n.Body) != "{\"\x00\"}" || n.Due != at(until) {
					t.Errorf("taken: %+v", n)
				}
			}
			for _, w := range want {
				if !got[w] {
					t.Errorf("%s is not among those taken at %s: %v", w, now, got)
				}
			}
			if len(found) != len(want) {
				t.Errorf("%d taken at %s, want %v", len(found), now, want)
			}
			return found
		}
		waiting := func(want int64) {
			t.Helper()
			if n, err := s.NoticesWaiting(ctx); err != nil || n != want {
				t.Errorf("%d wait, %v, want %d", n, err, want)
			}
		}
		waiting(0)
		// With the entry that it is about, or with neither.
		b := on(t, s, headOf(t, s), record(t, 1, 0, "SM-110", "A", "J1"))
		b.Notices = []service.Notice{notice("n1", "vault", "05"), notice("n1", "plm", "05")}
		if err := s.Append(ctx, b); err != nil {
			t.Fatal(err)
		}
		if err := s.Append(ctx, b); err == nil {
			t.Fatal("appended twice")
		}
		moved := b
		moved.Notices = []service.Notice{notice("n9", "vault", "05")}
		if err := s.Append(ctx, moved); err == nil {
			t.Fatal("appended on another head")
		}
		waiting(2)
		// What is known for a target is not told it twice.
		if err := s.Notify(ctx, []service.Notice{notice("n1", "vault", "00"), notice("n2", "vault", "06")}); err != nil {
			t.Fatal(err)
		}
		waiting(3)
		take("04", "30", 10)
		take("05", "30", 1, take("05", "05", 10, "n1>vault", "n1>plm")[0].ID+">vault") // one lease ended at once
		take("06", "30", 10, "n1>plm", "n2>vault")
		take("29", "40", 10)
		if found := take("30", "40", 10, "n1>vault", "n1>plm", "n2>vault"); found[0].Attempts < 2 {
			t.Errorf("attempts of %+v", found[0])
		}
		for _, settle := range [][4]string{{"n1", "vault", at("31"), at("31")}, {"n1", "plm", "", at("35")}, {"absent", "vault", at("31"), at("31")}} {
			if err := s.SettleNotice(ctx, settle[0], settle[1], settle[2], settle[3]); err != nil {
				t.Fatal(err)
			}
		}
		waiting(2)
		take("35", "50", 10, "n1>plm")
		// A late failure does not bring back what was sent.
		if err := s.SettleNotice(ctx, "n1", "vault", "", at("00")); err != nil {
			t.Fatal(err)
		}
		take("59", "59", 10, "n1>plm", "n2>vault")
		if err := s.Notify(ctx, []service.Notice{notice("\x00", "vault", "00")}); err == nil || strings.Contains(err.Error(), "unavailable") {
			t.Errorf("an id that is no text: %v", err)
		}
	})
}

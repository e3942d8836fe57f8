package service_test

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"jointledger/service"
	"jointledger/store/storetest"
)

func impact(t testing.TB, s *service.Service, what, name string) *service.Impact {
	t.Helper()
	i, err := s.Impact(t.Context(), fmt.Appendf(nil, `{"withdrawn":{%q:%q}}`, what, name))
	if err != nil {
		t.Fatal(err)
	}
	return i
}

func TestImpact(t *testing.T) {
	const plate = "7050-T7451 plate"
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := openWith(t, store, "", service.Unwatched{})
		lug := put(t, s, recordOf("a", "", "lug", hingeLug), both...)
		affdl := put(t, s, recordOf("b", "", "lug", strings.Replace(hingeLug, `["elementary"]`, `["affdl-tr-69-42"]`, 1)), both...)
		group := put(t, s, recordOf("c", "", "fastener-group", pair(2000, 1)), both...)
		held := judge(t, s, ask("default", "a"))
		released := judge(t, s, ask("default", "a", "b", "c"))
		if held.Decision != service.Hold || released.Decision != service.Release {
			t.Fatalf("%s, %s", held.Decision, released.Decision)
		}
		found, err := s.RecordByID(t.Context(), lug)
		if err != nil {
			t.Fatal(err)
		}
		var input struct {
			Lug struct{ Material struct{ Name string } }
		}
		if err := json.Unmarshal(found.Input, &input); err != nil {
			t.Fatal(err)
		}
		for _, c := range []struct {
			what, name string
			records    []string // newest first
			decisions  map[string][]string
		}{
			{"material", input.Lug.Material.Name, []string{affdl, lug}, map[string][]string{*held.ID: {lug}, *released.ID: {lug, affdl}}},
			{"material", plate + " of another kind", nil, nil},
			{"method", "elementary@1", []string{lug}, map[string][]string{*held.ID: {lug}, *released.ID: {lug}}},
			{"method", "elementary", []string{lug}, map[string][]string{*held.ID: {lug}, *released.ID: {lug}}},
			{"method", "affdl-tr-69-42", []string{affdl}, map[string][]string{*released.ID: {affdl}}},
			{"method", "elementary@99", nil, nil},
			{"method", "unheard-of", nil, nil},
			{"curve_set", "derived-1@1", []string{affdl}, map[string][]string{*released.ID: {affdl}}},
			{"curve_set", "derived-1", []string{affdl}, map[string][]string{*released.ID: {affdl}}},
			{"record", group, []string{group}, map[string][]string{*released.ID: {group}}},
		} {
			got := impact(t, s, c.what, c.name)
			var records []string
			for _, r := range got.Records {
				records = append(records, r.ID)
			}
			if !slices.Equal(records, c.records) || got.NextCursor != nil {
				t.Errorf("%s %s: the records %v, want %v", c.what, c.name, records, c.records)
			}
			if len(got.Decisions) != len(c.decisions) {
				t.Errorf("%s %s: %d decisions, want %d", c.what, c.name, len(got.Decisions), len(c.decisions))
			}
			for _, d := range got.Decisions {
				slices.Sort(d.Records)
				want := slices.Sorted(slices.Values(c.decisions[d.ID]))
				if !slices.Equal(d.Records, want) || d.Part != "SM-1200" || d.Revision != "B" || (d.Decision == service.Release) != (d.ID == *released.ID) {
					t.Errorf("%s %s: decision %+v, want one on %v", c.what, c.name, d, want)
				}
			}
		}
	})
}

// told collects what is sent, and fails as often as it is told to.
type told struct {
	mu      sync.Mutex
	failing int
	got     []service.Notice
}

func (s *told) Send(_ context.Context, n service.Notice) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.got = append(s.got, n)
	if len(s.got) <= s.failing {
		return errors.New("busy")
	}
	return nil
}

func (s *told) sent() []service.Notice {
	s.mu.Lock()
	defer s.mu.Unlock()
	return slices.Clone(s.got)
}

// counting is a Watch that counts notices.
type counting struct {
	service.Unwatched
	mu             sync.Mutex
	sent, failed   int
	waits, waiting int64
}

func (c *counting) NoticeSent(_ service.Notice, err error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	if err != nil {
		c.failed++
	} else {
		c.sent++
	}
}

func (c *counting) NoticesWait(n int64) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.waits, c.waiting = c.waits+1, n
}

// set is a clock that a test sets.
type set struct {
	mu sync.Mutex
	at time.Time
}

func (c *set) Now() time.Time {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.at
}

func (c *set) move(d time.Duration) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.at = c.at.Add(d)
}

func openNotifying(t *testing.T, store service.Store, signer service.Signer, clock service.Clock, watch service.Watch, notify ...string) *service.Service {
	t.Helper()
	policies, err := service.NewPolicies(nil)
	if err != nil {
		t.Fatal(err)
	}
	s, err := service.New(t.Context(), service.Setup{Store: store, Clock: clock, Signer: signer, Policies: policies, Watch: watch, Notify: notify})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	return s
}

// A withdrawal under a release is told, in its own transaction, until it is
// taken.
func TestWithdrawalsUnderAReleaseAreTold(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		faulty := storetest.NewFaulty(store)
		clock, watch := &set{at: time.Date(2026, 3, 1, 8, 0, 0, 0, time.UTC)}, &counting{}
		s := openNotifying(t, faulty, storetest.Signer(t), clock, watch, "vault", "plm")
		waiting := func(when string, want int64) {
			t.Helper()
			if n, err := store.NoticesWaiting(t.Context()); err != nil || n != want {
				t.Errorf("%s: %d wait, %v, want %d", when, n, err, want)
			}
		}
		// Held, and never released: nobody is told.
		loose := put(t, s, recordOf("a", "", "lug", hingeLug))
		judge(t, s, ask("default", "a"))
		if _, err := withdraw(t, s, ada, loose); err != nil {
			t.Fatal(err)
		}
		waiting("not released", 0)
		id := put(t, s, recordOf("a", "", "lug", hingeLug), both...)
		d := judge(t, s, ask("default", "a"))
		// What is not appended is not told either.
		faulty.OnceIn("Append", storetest.NotStored)
		if _, err := withdraw(t, s, ada, id); code(t, err) != service.Unavailable {
			t.Fatal(err)
		}
		waiting("not withdrawn", 0)
		faulty.Plan(nil)
		done, err := withdraw(t, s, ada, id)
		if err != nil {
			t.Fatal(err)
		}
		waiting("withdrawn", 2)

		sender := &told{failing: 1}
		ctx, cancel := context.WithCancel(t.Context())
		ended := make(chan struct{})
		go func() { s.Deliver(ctx, sender); close(ended) }()
		until := func(what string, reached func() bool) {
			t.Helper()
			for range 600 {
				if reached() {
					return
				}
				time.Sleep(50 * time.Millisecond)
			}
			t.Fatalf("%s: not reached; sent %d", what, len(sender.sent()))
		}
		until("both tried", func() bool { return len(sender.sent()) == 2 })
		until("one taken", func() bool { n, _ := store.NoticesWaiting(t.Context()); return n == 1 })
		clock.move(4 * time.Second) // not due yet
		time.Sleep(1200 * time.Millisecond)
		if n := len(sender.sent()); n != 2 {
			t.Errorf("%d attempts before the pause is over, want 2", n)
		}
		clock.move(20 * time.Second)
		until("the other again", func() bool { return len(sender.sent()) == 3 })
		until("none left", func() bool { n, _ := store.NoticesWaiting(t.Context()); return n == 0 })
		clock.move(time.Minute)
		until("counted", func() bool { watch.mu.Lock(); defer watch.mu.Unlock(); return watch.waits >= 2 && watch.waiting == 0 })
		cancel()
		<-ended
		got := sender.sent()
		if got[2].Target != got[0].Target || got[0].Target == got[1].Target || got[2].Attempts != 2 {
			t.Errorf("attempts %+v", got)
		}
		for _, n := range got {
			var body struct {
				Type, Timestamp string
				Data            struct {
					Record, Reason string
					Subject        struct{ Part, Joint string }
					Releases       []struct{ ID, Part, Revision string }
				}
			}
			if err := json.Unmarshal(n.Body, &body); err != nil {
				t.Fatal(err)
			}
			if n.ID != done.ID || body.Type != "record.withdrawn" || body.Data.Record != id || body.Data.Reason != "wrong plate" ||
				body.Data.Subject.Joint != "a" || len(body.Data.Releases) != 1 || body.Data.Releases[0].ID != *d.ID || body.Timestamp != done.At {
				t.Errorf("notice %s: %s", n.ID, n.Body)
			}
		}
		if watch.sent != 2 || watch.failed != 1 {
			t.Errorf("%d sent and %d failed, want 2 and 1", watch.sent, watch.failed)
		}
	})
}

// A record under a release that does not hold by today's methods is told once,
// however it is replayed. The records are such as another program might have
// left: a lug under twice its load that was entered as adequate.
func TestReplaysThatTurnNegativeAreTold(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		signer, clock := storetest.Signer(t), &set{at: time.Date(2026, 3, 1, 8, 0, 0, 0, time.UTC)}
		s := openNotifying(t, store, signer, clock, service.Unwatched{}, "vault")
		elsewhere := strings.Replace(string(recordOf("x", "", "lug", weakLug)), "SM-1200", "SM-1300", 1)
		weak, err := store.EntryByID(t.Context(), put(t, s, []byte(elsewhere)))
		if err != nil {
			t.Fatal(err)
		}
		entered := func(joint string, change ...string) string {
			t.Helper()
			id := fmt.Sprintf("00000000-0000-7000-8000-%012x", joint[0])
			change = append(change, weak.ID, id, `"SM-1300"`, `"SM-1200"`, `"joint":"x"`, `"joint":"`+joint+`"`, `"verdict":"inadequate"`, `"verdict":"adequate"`)
			appendBytes(t, store, signer, strings.NewReplacer(change...).Replace(string(weak.Bytes)))
			for _, by := range []struct {
				caller service.Caller
				role   string
			}{{ben, "checked"}, {cleo, "approved"}} {
				if _, err := sign(t, s, by.caller, id, by.role); err != nil {
					t.Fatal(err)
				}
			}
			return id
		}
		negative := entered("a")
		refused := entered("b", `"hole_diameter":0.75`, `"hole_diameter":7.5`)              // wider than the lug
		unknown := entered("c", `"methods":["elementary@1"]`, `"methods":["elementary@9"]`) // which this program does not have
		unreleased := entered("d", `"revision":"B"`, `"revision":"C"`)
		sound := put(t, s, recordOf("e", "", "lug", hingeLug), both...)
		released := judge(t, s, ask("default", "a", "b", "c", "e"))
		if released.Decision != service.Release {
			t.Fatal(why(released))
		}
		replay := func(id, verdict string) {
			t.Helper()
			if r, err := s.Replay(t.Context(), id); err != nil || r.Current.Verdict != verdict || r.Recorded.Reproduced != (id == sound) {
				t.Errorf("%s: %+v, %v, want it %s", id, r, err, verdict)
			}
		}
		replay(sound, "adequate")
		replay(unreleased, "inadequate")
		if n, err := store.NoticesWaiting(t.Context()); err != nil || n != 0 {
			t.Fatalf("%d wait, %v, before a record under a release was replayed", n, err)
		}
		replay(negative, "inadequate")
		replay(refused, "undetermined")
		replay(unknown, "inadequate")
		replay(negative, "inadequate")
		stream, err := s.Replays(t.Context(), []byte(`{"filter": {"part": "SM-1200"}}`))
		if err != nil {
			t.Fatal(err)
		}
		if err := stream(t.Context(), io.Discard); err != nil {
			t.Fatal(err)
		}
		got, err := store.TakeNotices(t.Context(), "2026-03-02T00:00:00.000Z", "2026-03-03T00:00:00.000Z", 10)
		if err != nil || len(got) != 3 {
			t.Fatalf("%d notices, %v, want one of each", len(got), err)
		}
		for _, n := range got {
			var body struct {
				Type string
				Data struct {
					Record, Reason string
					Releases       []struct{ ID string }
				}
			}
			if err := json.Unmarshal(n.Body, &body); err != nil {
				t.Fatal(err)
			}
			// 34,087.47 lbf of shear-out against 62,100: margin -0.45109.
			const negativeNow = "by the methods of today it is inadequate, with the least margin -0.4510"
			want := map[string]string{negative: negativeNow, unknown: negativeNow, refused: "by the methods of today it cannot be computed"}[body.Data.Record]
			if want == "" || !strings.HasPrefix(body.Data.Reason, want) || body.Type != "record.negative" || len(body.Data.Releases) != 1 || body.Data.Releases[0].ID != *released.ID {
				t.Errorf("notice %s: %s", n.ID, n.Body)
			}
		}
	})
}

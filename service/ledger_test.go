package service_test

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store/storetest"
)

// open opens a service on a store; it is closed with the test.
func open(t testing.TB, store service.Store, signer service.Signer) *service.Service {
	t.Helper()
	policies, err := service.NewPolicies(nil)
	if err != nil {
		t.Fatal(err)
	}
	s, err := service.New(t.Context(), service.Setup{
		Store: store, Clock: &storetest.Ticking{Step: time.Second}, Signer: signer, Policies: policies, Watch: service.Unwatched{},
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	return s
}

// The callers of the tests.
var (
	ada   = service.Caller{Name: "ada", Role: service.Analyst}
	ben   = service.Caller{Name: "ben", Role: service.Checker}
	cleo  = service.Caller{Name: "cleo", Role: service.Approver}
	local = service.Caller{Name: "local", Role: service.Local}
)

// recordBody asks for the record of the example's lug at a joint.
func recordBody(joint string) []byte {
	return fmt.Appendf(nil, `{"subject":{"part":"SM-1200","revision":"B","joint":%q},"geometry_digest":"g1","kind":"lug","input":%s}`, joint, hingeLug)
}

func record(t testing.TB, s *service.Service, caller service.Caller, joint, key string) *service.RecordDocument {
	t.Helper()
	r, _, err := s.Record(t.Context(), caller, recordBody(joint), idempotency(recordBody(joint), key))
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func idempotency(body []byte, key string) service.Idempotency {
	return service.Idempotency{Key: key, Method: "POST", Path: "/v1/records", Body: body}
}

func sign(t testing.TB, s *service.Service, caller service.Caller, id, role string) (*service.Appended, error) {
	t.Helper()
	body := fmt.Appendf(nil, `{"role":%q,"statement":"looked at it"}`, role)
	a, _, err := s.SignOff(t.Context(), caller, id, body, service.Idempotency{})
	return a, err
}

func withdraw(t testing.TB, s *service.Service, caller service.Caller, id string) (*service.Appended, error) {
	t.Helper()
	a, _, err := s.Withdraw(t.Context(), caller, id, []byte(`{"reason":"wrong plate"}`), service.Idempotency{})
	return a, err
}

// code is the code of a problem, empty for no error.
func code(t testing.TB, err error) service.Code {
	t.Helper()
	if err == nil {
		return ""
	}
	var p *service.Problem
	if !errors.As(err, &p) {
		t.Fatalf("not a problem: %v", err)
	}
	return p.Code
}

func TestRecordIsKeptAsAnswered(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := open(t, store, storetest.Signer(t))
		made := record(t, s, ada, "hinge-upper", "")
		if made.Author != "ada" || made.Index != 0 || made.State != service.Recorded {
			t.Errorf("by %s at %d, %s", made.Author, made.Index, made.State)
		}
		found, err := s.RecordByID(t.Context(), made.ID)
		if err != nil {
			t.Fatal(err)
		}
		a, _ := json.Marshal(made)
		b, _ := json.Marshal(found)
		if !bytes.Equal(a, b) {
			t.Errorf("answered\n%s\nand found\n%s", a, b)
		}
		entry, err := s.EntryBytes(t.Context(), made.ID)
		if err != nil {
			t.Fatal(err)
		}
		if got := ledger.DigestText(ledger.Leaf(entry)); got != made.RecordDigest {
			t.Errorf("the entry's bytes have the digest %s, the record says %s", got, made.RecordDigest)
		}
		if _, err := s.RecordByID(t.Context(), "01a231a1-fc7f-7eba-8972-0ce0dbe3ceee"); code(t, err) != service.NotFound {
			t.Errorf("a record that is not there: %v", err)
		}
	})
}

func TestIdempotency(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := open(t, store, storetest.Signer(t))
		first := record(t, s, ada, "hinge-upper", "k")
		body := recordBody("hinge-upper")
		second, again, err := s.Record(t.Context(), ada, body, idempotency(body, "k"))
		if err != nil || !again || second.ID != first.ID {
			t.Errorf("the same request again: %v, again %v, %v", second, again, err)
		}
		other := recordBody("hinge-lower")
		if _, _, err := s.Record(t.Context(), ada, other, idempotency(other, "k")); code(t, err) != service.IdempotencyMismatch {
			t.Errorf("another body: %v", err)
		}
		if third, again, err := s.Record(t.Context(), ben, body, idempotency(body, "k")); err != nil || again || third.ID == first.ID {
			t.Errorf("the key of another caller: again %v, %v", again, err)
		}
		// A sign-off's repeated answer has the state of then, not of now.
		check := []byte(`{"role":"checked","statement":"looked at it"}`)
		key := service.Idempotency{Key: "s", Method: "POST", Path: "/v1/records/" + first.ID + "/sign-offs", Body: check}
		was, _, err := s.SignOff(t.Context(), ben, first.ID, check, key)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := sign(t, s, cleo, first.ID, "approved"); err != nil {
			t.Fatal(err)
		}
		is, again, err := s.SignOff(t.Context(), ben, first.ID, check, key)
		if err != nil || !again || *is != *was || is.State != service.Checked {
			t.Errorf("first %+v, then %+v, again %v, %v", was, is, again, err)
		}
	})
}

func TestSeparationOfDuties(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := open(t, store, storetest.Signer(t))
		id := record(t, s, cleo, "hinge-upper", "").ID
		steps := []struct {
			name   string
			caller service.Caller
			do     string
			want   service.Code
			state  service.State
		}{
			{"approval before a check", service.Caller{Name: "dora", Role: service.Approver}, "approved", service.Conflict, ""},
			{"a check by the author", cleo, "checked", service.SeparationOfDuties, ""},
			{"an approval by a checker's role", ben, "approved", service.Forbidden, ""},
			{"a check", service.Caller{Name: "dora", Role: service.Approver}, "checked", "", service.Checked},
			{"a second check", ben, "checked", service.Conflict, ""},
			{"an approval by the checker", service.Caller{Name: "dora", Role: service.Approver}, "approved", service.SeparationOfDuties, ""},
			{"an approval by the author", cleo, "approved", service.SeparationOfDuties, ""},
			{"an approval", service.Caller{Name: "emil", Role: service.Approver}, "approved", "", service.Approved},
			{"a withdrawal by another analyst", ada, "withdraw", service.Forbidden, ""},
			{"a withdrawal by an approver", service.Caller{Name: "emil", Role: service.Approver}, "withdraw", "", service.Withdrawn},
			{"a second withdrawal", cleo, "withdraw", service.Conflict, ""},
			{"a check after it", ben, "checked", service.Conflict, ""},
		}
		for _, step := range steps {
			var done *service.Appended
			var err error
			if step.do == "withdraw" {
				done, err = withdraw(t, s, step.caller, id)
			} else {
				done, err = sign(t, s, step.caller, id, step.do)
			}
			if got := code(t, err); got != step.want {
				t.Fatalf("%s: %q (%v), want %q", step.name, got, err, step.want)
			}
			if err == nil && done.State != step.state {
				t.Errorf("%s leaves it %s, want %s", step.name, done.State, step.state)
			}
		}
		found, err := s.RecordByID(t.Context(), id)
		if err != nil {
			t.Fatal(err)
		}
		if found.State != service.Withdrawn || len(found.SignOffs) != 2 || found.Withdrawal == nil || found.Withdrawal.Reason != "wrong plate" {
			t.Errorf("in the end %s with %d sign-offs, withdrawal %v", found.State, len(found.SignOffs), found.Withdrawal)
		}
	})
}

// In open mode everybody is the same author, so that nobody can sign.
func TestOpenModeCannotSign(t *testing.T) {
	s := open(t, storetest.SQLite(t), storetest.Signer(t))
	id := record(t, s, local, "hinge-upper", "").ID
	_, err := sign(t, s, local, id, "checked")
	if code(t, err) != service.SeparationOfDuties || !strings.Contains(err.Error(), "jointledger key add") {
		t.Errorf("%v", err)
	}
}

func TestProofsAndExportVerifyOffline(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		signer := storetest.Signer(t)
		s := open(t, store, signer)
		var ids []string
		for i := range 9 {
			ids = append(ids, record(t, s, ada, fmt.Sprintf("joint-%d", i), "").ID)
		}
		kept, err := s.Checkpoint(t.Context())
		if err != nil {
			t.Fatal(err)
		}
		if _, err := sign(t, s, ben, ids[4], "checked"); err != nil {
			t.Fatal(err)
		}
		if _, err := withdraw(t, s, ada, ids[5]); err != nil {
			t.Fatal(err)
		}
		key, err := ledger.NewKey(s.VerifierKey())
		if err != nil {
			t.Fatal(err)
		}
		for _, id := range ids {
			text, err := s.Proof(t.Context(), id)
			if err != nil {
				t.Fatal(err)
			}
			proof, err := ledger.ParseProof([]byte(text))
			if err != nil {
				t.Fatal(err)
			}
			entry, err := s.EntryBytes(t.Context(), id)
			if err != nil {
				t.Fatal(err)
			}
			if _, err := proof.Verify(entry, key); err != nil {
				t.Error(err)
			}
			if _, err := proof.Verify(append(bytes.Clone(entry), ' '), key); err == nil {
				t.Error("a proof holds for other bytes")
			}
		}
		exported := export(t, s, "")
		recomputer := &service.Recomputer{}
		verifier := ledger.NewVerifier(key)
		if err := verifier.Since(kept); err != nil {
			t.Fatal(err)
		}
		if err := verifier.Export(bytes.NewReader(exported), func(e ledger.Verified) error { return recomputer.Entry(e.Envelope) }); err != nil {
			t.Fatal(err)
		}
		if err := verifier.Done(); err != nil || recomputer.Records != 9 || verifier.Size() != 11 {
			t.Errorf("%d entries, %d records computed again, %v", verifier.Size(), recomputer.Records, err)
		}
		c, err := s.Consistency(t.Context(), "9", "11")
		if err != nil || len(c.Hashes) == 0 {
			t.Errorf("consistency %v, %v", c, err)
		}
		for _, bad := range [][2]string{{"", "11"}, {"12", ""}, {"5", "12"}, {"6", "5"}, {"x", ""}} {
			if _, err := s.Consistency(t.Context(), bad[0], bad[1]); code(t, err) != service.Invalid {
				t.Errorf("consistency from %q to %q: %v", bad[0], bad[1], err)
			}
		}
	})
}

func export(t testing.TB, s *service.Service, from string) []byte {
	t.Helper()
	stream, err := s.Export(t.Context(), from)
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	if err := stream(t.Context(), &b); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// A record whose result was changed and signed again, as by somebody who has
// the key, is found by computing it again.
func TestRecomputationFindsAChangedResult(t *testing.T) {
	s := open(t, storetest.SQLite(t), storetest.Signer(t))
	made := record(t, s, ada, "hinge-upper", "")
	entry, err := s.EntryBytes(t.Context(), made.ID)
	if err != nil {
		t.Fatal(err)
	}
	for name, change := range map[string][2]string{
		"a margin":  {`"margin":0.09782515717608153`, `"margin":0.25`},
		"a verdict": {`"verdict":"adequate"`, `"verdict":"inadequate"`},
		"an input":  {`"force":18000`, `"force":17000`},
	} {
		changed := bytes.Replace(entry, []byte(change[0]), []byte(change[1]), 1)
		if bytes.Equal(changed, entry) {
			t.Fatalf("%s was not changed", name)
		}
		envelope, err := ledger.Parse(changed)
		if err != nil {
			t.Fatal(err)
		}
		if err := (&service.Recomputer{}).Entry(envelope); err == nil || !strings.Contains(err.Error(), "hinge-upper") {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// Whatever call of the store fails, and whether or not it did its work, the
// retry with the same key gives one record.
func TestFaultsGiveOneRecord(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		faulty := storetest.NewFaulty(store)
		signer := storetest.Signer(t)
		s := open(t, faulty, signer)
		record(t, s, ada, "warm", "warm")
		calls := func() int {
			faulty.Plan(nil)
			record(t, open(t, faulty, signer), ada, "count", "count")
			return len(faulty.Calls())
		}()
		for n := range calls {
			for _, fault := range []storetest.Fault{storetest.NotStored, storetest.Stored} {
				name := fmt.Sprintf("joint-%d-%d", n, fault)
				body := recordBody(name)
				faulty.Once(n, fault)
				first, _, err := s.Record(t.Context(), ada, body, idempotency(body, name))
				if err == nil && first == nil {
					t.Fatal("no answer and no error")
				}
				if err != nil && code(t, err) != service.Unavailable {
					t.Errorf("%s: %v", name, err)
				}
				faulty.Plan(nil)
				if _, _, err := s.Record(t.Context(), ada, body, idempotency(body, name)); err != nil {
					t.Fatalf("%s, the retry: %v", name, err)
				}
				list, err := s.Records(t.Context(), service.RecordQuery{Joint: name})
				if err != nil || len(list.Items) != 1 {
					t.Errorf("%s is there %d times, %v", name, len(list.Items), err)
				}
			}
		}
		verifyAll(t, s)
	})
}

func verifyAll(t testing.TB, s *service.Service) int64 {
	t.Helper()
	key, err := ledger.NewKey(s.VerifierKey())
	if err != nil {
		t.Fatal(err)
	}
	verifier := ledger.NewVerifier(key)
	recomputer := &service.Recomputer{}
	if err := verifier.Export(bytes.NewReader(export(t, s, "")), func(e ledger.Verified) error { return recomputer.Entry(e.Envelope) }); err != nil {
		t.Fatal(err)
	}
	return verifier.Size()
}

// Many callers of two servers on one store make one log without gap or fork.
func TestReplicasShareOneLog(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		signer := storetest.Signer(t)
		replicas := []*service.Service{open(t, store, signer), open(t, store, signer)}
		const callers, each = 8, 5
		var work sync.WaitGroup
		for c := range callers {
			work.Go(func() {
				for i := range each {
					joint := fmt.Sprintf("joint-%d-%d", c, i)
					body := recordBody(joint)
					// A replica that keeps losing the race may say so.
					for {
						_, _, err := replicas[c%2].Record(context.Background(), ada, body, idempotency(body, joint))
						if err == nil {
							break
						}
						if code(t, err) != service.Unavailable {
							t.Errorf("%s: %v", joint, err)
							return
						}
					}
				}
			})
		}
		work.Wait()
		if size := verifyAll(t, replicas[0]); size != callers*each {
			t.Errorf("%d entries, want %d", size, callers*each)
		}
	})
}

// plugged is a store whose appends wait until it is unplugged, so that what
// comes meanwhile stands in one batch.
type plugged struct {
	service.Store
	plug atomic.Pointer[chan struct{}]
}

func (p *plugged) Append(ctx context.Context, b service.Batch) error {
	if plug := p.plug.Load(); plug != nil {
		<-*plug
	}
	return p.Store.Append(ctx, b)
}

// Of many who sign at once, one does, also where all stand in one batch.
func TestOneSignatureARole(t *testing.T) {
	storetest.Each(t, func(t *testing.T, inner service.Store) {
		store := &plugged{Store: inner}
		s := open(t, store, storetest.Signer(t))
		id := record(t, s, ada, "hinge-upper", "").ID
		var signed atomic.Int64
		var work sync.WaitGroup
		plug := make(chan struct{})
		store.plug.Store(&plug)
		work.Go(func() { record(t, s, ada, "in the way", "") })
		time.AfterFunc(200*time.Millisecond, func() { close(plug) })
		time.Sleep(50 * time.Millisecond)
		for i := range 8 {
			work.Go(func() {
				_, err := sign(t, s, service.Caller{Name: fmt.Sprint("checker-", i), Role: service.Checker}, id, "checked")
				switch code(t, err) {
				case "":
					signed.Add(1)
				case service.Conflict:
				default:
					t.Error(err)
				}
			})
		}
		work.Wait()
		if signed.Load() != 1 {
			t.Errorf("%d signed", signed.Load())
		}
	})
}

func TestAnotherKeyOrOriginIsRefused(t *testing.T) {
	store := storetest.SQLite(t)
	open(t, store, storetest.Signer(t))
	_, err := service.New(t.Context(), service.Setup{Store: store, Clock: service.SystemClock{}, Signer: storetest.Signer(t), Watch: service.Unwatched{}})
	if err == nil || !strings.Contains(err.Error(), "--signing-key") {
		t.Errorf("another key: %v", err)
	}
}

func TestKeys(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := open(t, store, storetest.Signer(t))
		ctx := t.Context()
		if isOpen, err := s.Open(ctx); err != nil || !isOpen {
			t.Errorf("open %v, %v before any key", isOpen, err)
		}
		secret, err := s.AddKey(ctx, "ada", service.Analyst)
		if err != nil {
			t.Fatal(err)
		}
		if isOpen, err := s.Open(ctx); err != nil || isOpen {
			t.Errorf("open %v, %v with a key", isOpen, err)
		}
		caller, err := s.Authenticate(ctx, secret)
		if err != nil || caller != ada {
			t.Errorf("%v, %v", caller, err)
		}
		if _, err := s.Authenticate(ctx, secret+"x"); code(t, err) != service.Unauthenticated {
			t.Errorf("a wrong key: %v", err)
		}
		if _, err := s.AddKey(ctx, "ada", service.Checker); err == nil {
			t.Error("a caller got a second role")
		}
		if _, err := s.AddKey(ctx, "ada", service.Analyst); err != nil {
			t.Errorf("a second key of the same role: %v", err)
		}
		for _, bad := range []struct {
			name string
			role service.Role
		}{{"", service.Reader}, {"x\n", service.Reader}, {"local", service.Reader}, {"x", "boss"}, {"x", service.Local}} {
			if _, err := s.AddKey(ctx, bad.name, bad.role); err == nil {
				t.Errorf("made a key for %q as %s", bad.name, bad.role)
			}
		}
		if n, err := s.RevokeKeys(ctx, "ada"); err != nil || n != 2 {
			t.Errorf("revoked %d, %v", n, err)
		}
		if _, err := s.Authenticate(ctx, secret); code(t, err) != service.Unauthenticated {
			t.Errorf("a revoked key: %v", err)
		}
		if exported := export(t, s, ""); bytes.Contains(exported, []byte(secret)) {
			t.Error("the log has the secret")
		}
		keys, err := s.Keys(ctx)
		if err != nil || len(keys) != 2 || keys[0].LastUsed == "" || keys[0].Revoked == "" {
			t.Errorf("%+v, %v", keys, err)
		}
	})
}

func TestRoles(t *testing.T) {
	ladder := []service.Role{service.Reader, service.Gate, service.Analyst, service.Checker, service.Approver}
	for i, have := range ladder {
		for j, need := range ladder {
			if have.May(need) != (i >= j) {
				t.Errorf("%s may %s: %v", have, need, have.May(need))
			}
		}
		if have.May(service.Admin) {
			t.Errorf("%s may admin", have)
		}
	}
	for _, need := range append(ladder, service.Admin) {
		if want := need == service.Reader || need == service.Gate || need == service.Admin; service.Admin.May(need) != want {
			t.Errorf("admin may %s: %v", need, !want)
		}
	}
}

// TestColumnsSayWhatTheEntrySays: the columns that a new record is stored with
// are those that are read from its bytes.
func TestColumnsSayWhatTheEntrySays(t *testing.T) {
	store := storetest.SQLite(t)
	s := open(t, store, storetest.Signer(t))
	negative := strings.Replace(hingeLug, `"force": 18000`, `"force": 90000`, 1)
	none := strings.Replace(hingeLug, `"angle": 0`, `"angle": 90`, 1)
	compared := strings.Replace(hingeLug, `"methods": ["elementary"],`, `"methods": ["elementary"], "compare": ["affdl-tr-69-42", "asme-bth-1"],`, 1)
	for i, input := range []string{hingeLug, negative, none, compared} {
		r, _, err := s.Record(t.Context(), ada, recordOf(fmt.Sprint("J", i), "tension", "lug", input), service.Idempotency{})
		if err != nil {
			t.Fatal(err)
		}
		stored, err := store.Entry(t.Context(), r.Index)
		if err != nil {
			t.Fatal(err)
		}
		read, err := service.EntryOf(stored.Bytes)
		if err != nil {
			t.Fatal(err)
		}
		read.Index = stored.Index
		if diff := cmp.Diff(read, stored, cmpopts.EquateEmpty()); diff != "" {
			t.Errorf("%s", diff)
		}
	}
}

package store_test

import (
	"crypto/sha256"
	"errors"
	"fmt"
	"strings"
	"testing"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store/storetest"
)

const origin = "ledger.example.org/saltmarsh"

// signer is of a key made from a fixed seed: for tests alone.
func signer(t testing.TB) (*ledger.Signer, *ledger.Key) {
	t.Helper()
	private, err := ledger.GenerateKey(strings.NewReader(strings.Repeat("seed", 8)), origin)
	if err != nil {
		t.Fatal(err)
	}
	s, err := ledger.NewSigner(private)
	if err != nil {
		t.Fatal(err)
	}
	key, err := ledger.NewKey(s.VerifierKey())
	if err != nil {
		t.Fatal(err)
	}
	return s, key
}

// uuid is the n-th id of a test; by tells writers apart.
func uuid(by, n int) string { return fmt.Sprintf("01946c5e-%04x-7abc-8def-%012x", by, n) }

// seal makes the n-th entry of a writer, with columns as a service makes them.
func seal(t testing.TB, by, n int, kind string, columns service.Columns) service.Entry {
	t.Helper()
	at := fmt.Sprintf("2026-01-%02dT10:%02d:%02d.000Z", 1+n/3600%28, n/60%60, n%60)
	e := service.Entry{ID: uuid(by, n), Type: kind, At: at, Author: []string{"m.reed", "a.sedge", "local"}[n%3], Columns: columns}
	body := fmt.Appendf(nil, `{"by":%d,"n":%d}`, by, n)
	var err error
	if e.Bytes, e.Leaf, err = ledger.Seal(ledger.Envelope{Type: kind, ID: e.ID, At: e.At, Author: e.Author, Body: body}); err != nil {
		t.Fatal(err)
	}
	return e
}

// record is a record of a joint.
func record(t testing.TB, by, n int, part, revision, joint string) service.Entry {
	t.Helper()
	margin := float64(n%5) - 1.5
	return seal(t, by, n, "record", service.Columns{
		Subject:        service.Subject{Part: part, Revision: revision, Joint: joint},
		GeometryDigest: "sha256:00", Kind: "lug", Verdict: []string{"inadequate", "adequate"}[n%2], Margin: &margin,
		Terms: []service.Term{{Kind: "method", Value: "elementary@1"}, {Kind: "material", Value: "invented plate"}},
	})
}

func signOff(t testing.TB, by, n int, target, role string) service.Entry {
	t.Helper()
	return seal(t, by, n, "sign-off", service.Columns{Target: target, Role: role})
}

func withdrawal(t testing.TB, by, n int, target string) service.Entry {
	t.Helper()
	return seal(t, by, n, "withdrawal", service.Columns{Target: target})
}

// on makes a batch of entries on a head.
func on(t testing.TB, s service.Store, base service.Head, entries ...service.Entry) service.Batch {
	t.Helper()
	key, _ := signer(t)
	b, err := storetest.BatchOn(t.Context(), s, key, base, entries)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// put appends entries to a log that nobody else appends to.
func put(t testing.TB, s service.Store, entries ...service.Entry) service.Batch {
	t.Helper()
	b := on(t, s, headOf(t, s), entries...)
	if err := s.Append(t.Context(), b); err != nil {
		t.Fatal(err)
	}
	return b
}

func headOf(t testing.TB, s service.Store) service.Head {
	t.Helper()
	head, err := s.Head(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	return head
}

// verify checks a whole log: that its entries are dense and are exactly what
// its head signs, and that the stored hashes are those of the tree.
func verify(t testing.TB, s service.Store) {
	t.Helper()
	_, key := signer(t)
	head := headOf(t, s)
	v := ledger.NewVerifier(key)
	var leaves []ledger.Hash
	if err := s.Entries(t.Context(), 0, 1<<40, func(e service.Entry) error {
		verified, err := v.Entry(e.Bytes)
		if err != nil {
			return err
		}
		if e.Index != verified.Index || e.Leaf != verified.Leaf || e.ID != verified.ID {
			return fmt.Errorf("entry %d is stored as %d, %s", verified.Index, e.Index, e.ID)
		}
		leaves = append(leaves, e.Leaf)
		return nil
	}); err != nil {
		t.Fatal(err)
	}
	if head.Size > 0 {
		if err := v.Checkpoint(head.Checkpoint); err != nil {
			t.Fatal(err)
		}
	}
	want, _, root, err := ledger.Grow(ledger.Tree{Root: ledger.EmptyRoot}, leaves, nil)
	if err != nil || root != head.Root {
		t.Fatalf("root %v, head %v, %v", root, head.Root, err)
	}
	indexes := make([]int64, len(want))
	for i := range indexes {
		indexes[i] = int64(i)
	}
	got, err := s.Hashes(t.Context(), indexes)
	if err != nil {
		t.Fatal(err)
	}
	for i := range want {
		if got[i] != want[i] {
			t.Fatalf("tree hash %d is another", i)
		}
	}
	if _, err := s.Hashes(t.Context(), []int64{int64(len(want))}); !errors.Is(err, service.ErrNotFound) {
		t.Fatalf("there are tree hashes beyond the log: %v", err)
	}
}

func answer(path, key string, index int64) service.Answer {
	return service.Answer{
		IdempotencyKey: service.IdempotencyKey{Caller: "m.reed", Method: "POST", Path: path, Key: key},
		RequestDigest:  sha256.Sum256([]byte(key)), Index: index, State: service.Recorded,
	}
}

func apiKey(n int) *service.Key {
	return &service.Key{ID: fmt.Sprintf("key-%d", n), Caller: "m.reed", Role: "analyst", Hash: sha256.Sum256(fmt.Append(nil, n)), Added: "2026-01-01T00:00:00.000Z"}
}

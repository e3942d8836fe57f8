package store_test

import (
	"errors"
	"testing"

	"jointledger/service"
	"jointledger/store/storetest"
)

func TestSessions(t *testing.T) {
	storetest.Each(t, func(t *testing.T, s service.Store) {
		ctx := t.Context()
		key := apiKey(1)
		b := on(t, s, headOf(t, s), record(t, 1, 0, "SM-110", "A", "J1"))
		b.Keys = []service.KeyChange{{Add: key}}
		if err := s.Append(ctx, b); err != nil {
			t.Fatal(err)
		}
		const morning, noon, evening = "2026-03-01T08:00:00.000Z", "2026-03-01T12:00:00.000Z", "2026-03-01T20:00:00.000Z"
		found := func(hash byte, now string, want bool) {
			t.Helper()
			got, err := s.SessionKey(ctx, [32]byte{hash}, now)
			if want && (err != nil || got != *key) || !want && !errors.Is(err, service.ErrNotFound) {
				t.Errorf("session %d at %s: %+v, %v", hash, now, got, err)
			}
		}
		for hash, until := range map[byte]string{1: noon, 2: evening} {
			if err := s.AddSession(ctx, service.Session{Hash: [32]byte{hash}, Key: key.ID, Until: until}, morning); err != nil {
				t.Fatal(err)
			}
		}
		found(1, morning, true)
		found(1, noon, false)
		found(2, noon, true)
		found(3, morning, false)
		if err := s.AddSession(ctx, service.Session{Hash: [32]byte{4}, Key: "no such key", Until: evening}, morning); err == nil {
			t.Error("a session of no key is kept")
		}
		if err := s.AddSession(ctx, service.Session{Hash: [32]byte{4}, Key: key.ID, Until: evening}, noon); err != nil {
			t.Fatal(err)
		}
		found(1, morning, false) // forgotten once it had ended
		for range 2 {
			if err := s.EndSession(ctx, [32]byte{2}); err != nil {
				t.Error(err)
			}
		}
		found(2, noon, false)
		found(4, noon, true)
		b = on(t, s, headOf(t, s), record(t, 1, 1, "SM-110", "A", "J1"))
		b.Keys = []service.KeyChange{{Revoke: key.ID, At: noon}}
		if err := s.Append(ctx, b); err != nil {
			t.Fatal(err)
		}
		key.Revoked = noon
		found(4, noon, true) // and the key says that it was revoked
	})
}

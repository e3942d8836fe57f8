package service_test

import (
	"testing"

	"jointledger/service"
	"jointledger/store/storetest"
)

func TestSessionEndsWithItsKey(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := open(t, store, storetest.Signer(t))
		secret, err := s.AddKey(t.Context(), "ada", service.Analyst)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := s.SignIn(t.Context(), secret+"x"); code(t, err) != service.Unauthenticated {
			t.Errorf("another key: %v", err)
		}
		sessions := make([]string, 2)
		for i := range sessions {
			if sessions[i], err = s.SignIn(t.Context(), secret); err != nil {
				t.Fatal(err)
			}
			if caller, err := s.CallerOf(t.Context(), sessions[i]); err != nil || caller != ada {
				t.Errorf("session %d is of %v, %v", i, caller, err)
			}
		}
		if _, err := s.CallerOf(t.Context(), ""); code(t, err) != service.Unauthenticated {
			t.Errorf("no session: %v", err)
		}
		if err := s.SignOut(t.Context(), sessions[0]); err != nil {
			t.Error(err)
		}
		if _, err := s.CallerOf(t.Context(), sessions[0]); code(t, err) != service.Unauthenticated {
			t.Errorf("after signing out: %v", err)
		}
		if _, err := s.CallerOf(t.Context(), sessions[1]); err != nil {
			t.Errorf("the other session: %v", err)
		}
		if _, err := s.RevokeKeys(t.Context(), "ada"); err != nil {
			t.Fatal(err)
		}
		if _, err := s.CallerOf(t.Context(), sessions[1]); code(t, err) != service.Unauthenticated {
			t.Errorf("after its key was revoked: %v", err)
		}
	})
}

package storetest

import (
	"errors"
	"slices"
	"testing"

	"jointledger/service"
)

func TestFaulty(t *testing.T) {
	inner := SQLite(t)
	f := NewFaulty(inner)
	claim := func(origin string) (service.Identity, error) {
		return f.Claim(t.Context(), service.Identity{Origin: origin, VerifierKey: "key"})
	}
	f.Once(1, NotStored)
	if _, err := f.Head(t.Context()); err != nil {
		t.Fatal(err)
	}
	if id, err := claim("first"); !errors.Is(err, service.ErrUnavailable) || !errors.Is(err, ErrInjected) || id != (service.Identity{}) {
		t.Errorf("not stored: %v, %v", id, err)
	}
	if want := []string{"Head", "Claim"}; !slices.Equal(f.Calls(), want) {
		t.Errorf("calls %v, want %v", f.Calls(), want)
	}
	f.OnceIn("Claim", Stored)
	if err := f.Ready(t.Context()); err != nil {
		t.Error(err)
	}
	if id, err := claim("second"); !errors.Is(err, ErrInjected) || id != (service.Identity{}) {
		t.Errorf("stored: %v, %v", id, err)
	}
	// The first was not stored and the second was, though both failed.
	if id, err := claim("third"); err != nil || id.Origin != "second" {
		t.Errorf("after the faults: %v, %v", id, err)
	}
}

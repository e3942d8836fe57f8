package service_test

import (
	"bytes"
	"context"
	"fmt"
	"strings"
	"testing"

	"jointledger/service"
	"jointledger/store/storetest"
)

// revised asks for the record of the example's lug with one word replaced.
func revised(revision, joint, was, is string) []byte {
	input := strings.Replace(hingeLug, was, is, 1)
	return fmt.Appendf(nil, `{"subject":{"part":"SM-1200","revision":%q,"joint":%q},"geometry_digest":"g","kind":"lug","input":%s}`, revision, joint, input)
}

func TestPartTellsWhatChangedBetweenRevisions(t *testing.T) {
	store := storetest.SQLite(t)
	s := open(t, store, storetest.Signer(t))
	keep := func(body []byte) *service.RecordDocument {
		t.Helper()
		r, _, err := s.Record(t.Context(), ada, body, service.Idempotency{})
		if err != nil {
			t.Fatal(err)
		}
		return r
	}
	keep(revised("A", "gone", "", ""))
	old := keep(revised("A", "hinge", "", ""))
	keep(revised("A", "same", "", ""))
	keep(revised("B", "same", "", ""))
	keep(revised("B", "hinge", `"thickness": 0.5`, `"thickness": 0.4`))
	now := keep(revised("B", "hinge", `"thickness": 0.5`, `"thickness": 0.25`))
	keep(revised("B", "new", "", ""))

	p, err := s.Part(t.Context(), "SM-1200")
	if err != nil {
		t.Fatal(err)
	}
	got := ""
	for _, r := range p.Revisions {
		got += r.Revision + ":"
		for _, one := range r.Records {
			got += " " + one.Subject.Joint
		}
		got += "; "
	}
	if want := "B: hinge new same; A: gone hinge same; "; got != want || !p.Complete {
		t.Errorf("%q, want %q", got, want)
	}
	if _, err := s.Part(t.Context(), "SM-9999"); code(t, err) != service.NotFound {
		t.Errorf("an unknown part: %v", err)
	}

	c, err := s.Changes(t.Context(), "SM-1200", "A", "B")
	if err != nil {
		t.Fatal(err)
	}
	if len(c.Joints) != 3 || c.Joints[0].Joint != "gone" || c.Joints[0].Is != nil || c.Joints[2].Joint != "new" || c.Joints[2].Was != nil {
		t.Fatalf("%+v", c.Joints)
	}
	hinge := c.Joints[1]
	if hinge.Joint != "hinge" || hinge.Was.Record != old.ID || hinge.Is.Record != now.ID || hinge.Is.Verdict != "inadequate" || hinge.Was.Verdict != "adequate" {
		t.Errorf("%+v", hinge)
	}
	if len(hinge.Fields) != 1 || hinge.Fields[0].Pointer != "/lug/thickness" || string(hinge.Fields[0].Was) != "0.5" || string(hinge.Fields[0].Is) != "0.25" {
		t.Errorf("%s", hinge.Fields)
	}
}

func TestVerifyFindsAlteredBytes(t *testing.T) {
	inner := storetest.SQLite(t)
	altered := &alteredStore{Store: inner}
	s := open(t, altered, storetest.Signer(t))
	r := record(t, s, ada, "hinge", "")
	record(t, s, ada, "other", "")
	v, err := s.Verify(t.Context(), r.ID)
	if err != nil {
		t.Fatal(err)
	}
	if !v.Verified || !v.Recomputed || v.Reason != nil || v.RecordDigest != r.RecordDigest || v.Index != 0 || v.Size != 2 {
		t.Errorf("%+v", v)
	}
	altered.change = func(canonical []byte) []byte {
		return bytes.Replace(canonical, []byte(`"thickness":0.5`), []byte(`"thickness":0.6`), 1)
	}
	if v, err = s.Verify(t.Context(), r.ID); err != nil {
		t.Fatal(err)
	}
	if v.Verified || v.Recomputed || v.Reason == nil || v.RecordDigest == r.RecordDigest {
		t.Errorf("altered: %+v", v)
	}
}

// alteredStore gives other bytes than were stored.
type alteredStore struct {
	service.Store
	change func([]byte) []byte
}

func (a *alteredStore) EntryByID(ctx context.Context, id string) (service.Entry, error) {
	e, err := a.Store.EntryByID(ctx, id)
	if a.change != nil {
		e.Bytes = a.change(e.Bytes)
	}
	return e, err
}

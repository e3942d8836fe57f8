// Package store keeps the ledger in a database: embedded SQLite, or Postgres
// for several servers on one log. Both implement service.Store, each in its
// engine's own SQL, and one conformance suite holds them to the same answers.
//
// A batch is one transaction that begins by comparing the head and swapping it,
// so that two servers never fork the log. The tables that are only added to
// refuse everything else by trigger; what goes past the triggers, such as an
// edited file, is found by verification.
package store

import (
	"cmp"
	"errors"
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"jointledger/service"
	"jointledger/service/ledger"
)

// unavailable wraps a failure of the engine, or of the way to it.
func unavailable(err error) error { return fmt.Errorf("%w: %w", service.ErrUnavailable, err) }

// storable reports whether a text can stand in a text column of either engine.
// Nothing else was ever stored, so a search for it finds nothing.
func storable(texts ...string) bool {
	for _, s := range texts {
		if strings.IndexByte(s, 0) >= 0 || !utf8.ValidString(s) {
			return false
		}
	}
	return true
}

// searchable reports whether all texts that a filter compares with text
// columns can stand there.
func searchable(f service.Filter) bool {
	return storable(f.Part, f.Revision, f.Joint, f.Kind, f.Verdict, string(f.State), f.Author, f.Since, f.Until)
}

// terms lists what a filter asks of what records rest on.
func terms(f service.Filter) []service.Term {
	var asked []service.Term
	for _, t := range []service.Term{{Kind: "material", Value: f.Material}, {Kind: "curve-set", Value: f.CurveSet}, {Kind: "method", Value: f.Method}} {
		if t.Value != "" {
			asked = append(asked, t)
		}
	}
	return asked
}

// check refuses a batch that contradicts itself: the defect is the caller's,
// and is better found before it is in the log.
func check(b service.Batch) error {
	n := int64(len(b.Entries))
	if n == 0 {
		return errors.New("an empty batch")
	}
	if b.Head.Size != b.Base.Size+n {
		return fmt.Errorf("%d entries do not lead from size %d to %d", n, b.Base.Size, b.Head.Size)
	}
	first := ledger.StoredHashCount(b.Base.Size)
	if want := ledger.StoredHashCount(b.Head.Size) - first; int64(len(b.Hashes)) != want {
		return fmt.Errorf("%d tree hashes for %d entries on %d; %d are wanted", len(b.Hashes), n, b.Base.Size, want)
	}
	for i, e := range b.Entries {
		if e.Index != b.Base.Size+int64(i) {
			return fmt.Errorf("entry %d of a batch on size %d has the index %d", i, b.Base.Size, e.Index)
		}
		if b.Hashes[ledger.LeafIndex(e.Index)-first] != e.Leaf {
			return fmt.Errorf("entry %d: its leaf is not in the tree hashes", e.Index)
		}
		if !storable(e.ID, e.Type, e.At, e.Author, e.Part, e.Revision, e.Joint, e.Aspect, e.GeometryDigest, e.Kind, e.Verdict, e.Target, e.Role) {
			return fmt.Errorf("entry %d: a text has a zero character or is not UTF-8", e.Index)
		}
	}
	for _, a := range b.Answers {
		if a.Index < b.Base.Size || a.Index >= b.Head.Size {
			return fmt.Errorf("the answer %q is of entry %d, which is not in the batch", a.Key, a.Index)
		}
		if !storable(a.Caller, a.Method, a.Key, string(a.State)) {
			return fmt.Errorf("the answer of entry %d: a text has a zero character or is not UTF-8", a.Index)
		}
	}
	if err := checkNotices(b.Notices); err != nil {
		return err
	}
	for _, k := range b.Keys {
		if k.Add != nil && !storable(k.Add.ID, k.Add.Caller, k.Add.Role, k.Add.Added, k.Add.Revoked, k.Add.LastUsed) || !storable(k.Revoke, k.At) {
			return errors.New("a key: a text has a zero character or is not UTF-8")
		}
	}
	return nil
}

func checkNotices(notices []service.Notice) error {
	for _, n := range notices {
		if !storable(n.ID, n.Target, n.Due) {
			return errors.New("a notice: a text has a zero character or is not UTF-8")
		}
	}
	return nil
}

// sortResting puts decisions in the order of the log.
func sortResting(found []service.Resting) {
	slices.SortStableFunc(found, func(a, b service.Resting) int {
		return cmp.Or(cmp.Compare(a.Decision.Index, b.Decision.Index), cmp.Compare(a.Record, b.Record))
	})
}

// defect is an error of a caller, not of the engine.
type defect struct{ string }

func (d defect) Error() string { return d.string }

// settled reports whether an error says already what it is.
func settled(err error) bool {
	var ours defect
	return err == nil || errors.As(err, &ours) ||
		errors.Is(err, service.ErrHeadMoved) || errors.Is(err, service.ErrNotFound) || errors.Is(err, service.ErrUnavailable)
}

// targets are the ids of the records that a batch says something about.
func targets(b service.Batch) []string {
	var ids []string
	for _, e := range b.Entries {
		if e.Target != "" {
			ids = append(ids, e.Target)
		}
	}
	return ids
}

// subject is what a record stands for among others: the latest of each is what
// a release rests on.
type subject struct {
	service.Subject
	kind string
}

// standing is a batch's records as they stand when it is in: Latest is false
// of one that a later one of the batch replaces.
type standing struct {
	index  int64
	latest bool
	subject
}

func standings(b service.Batch) []standing {
	seen := map[subject]bool{}
	var all []standing
	for _, e := range slices.Backward(b.Entries) {
		if e.Type != "record" {
			continue
		}
		of := subject{e.Subject, e.Kind}
		all = append(all, standing{e.Index, !seen[of], of})
		seen[of] = true
	}
	slices.Reverse(all)
	return all
}

// derivedState derives the state of the record r from the entries about it: one
// look into their index.
const derivedState = `CASE (SELECT max(CASE WHEN a.type = 'withdrawal' THEN 3 WHEN a.type <> 'sign-off' THEN 0 WHEN a.role = 'approved' THEN 2 WHEN a.role = 'checked' THEN 1 END)
	FROM entries a WHERE a.target = r.id AND a.target <> '') WHEN 3 THEN 'withdrawn' WHEN 2 THEN 'approved' WHEN 1 THEN 'checked' ELSE 'recorded' END`

// sameSubject finds the records n of the part, revision, joint, aspect and kind
// of the record r.
const sameSubject = `n.type = 'record' AND n.part = r.part AND n.revision = r.revision AND n.joint = r.joint AND n.aspect = r.aspect AND n.kind = r.kind`

// isLatest is true of the record r that no later one replaces; it is true of all
// where a list does not ask.
func isLatest(f service.Filter) string {
	if !f.Latest {
		return `1 = 1`
	}
	return `r.idx = (SELECT max(n.idx) FROM entries n WHERE ` + sameSubject + `)`
}

// listed checks a record that an index found against what the entries say: its
// state, and whether it is the latest.
func listed(f service.Filter, r *service.Summary, latest bool) error {
	if f.State != "" && r.State != f.State || f.Latest && !latest {
		return defect{fmt.Sprintf("the index over the standing of records has entry %d otherwise than the entries say", r.Index)}
	}
	return nil
}

// A page is what Entries reads at once: so many entries, and so many bytes
// before the last of them, so that a slow reader holds no transaction open.
const (
	pageEntries = 256
	pageBytes   = 4 << 20
)

package service

import (
	"context"
	"errors"
	"fmt"
	"slices"

	"jointledger/service/ledger"
)

// auditPage is how many entries' tree hashes are read at once.
const auditPage = 500

// Audit checks a log where it is stored: each entry by its bytes, what is
// stored beside the bytes, every hash of the tree, and the signed head. It does
// all that an export's verification does, and names the entry of which any row
// was altered. Each entry is handed to each. The error is a *ledger.Failure
// where something does not hold.
func Audit(ctx context.Context, store Store, verifier *ledger.Verifier, each func(ledger.Verified) error) error {
	head, err := store.Head(ctx)
	if err != nil {
		return err
	}
	tree := treeAudit{store: store, base: ledger.Tree{Root: ledger.EmptyRoot}, edge: map[int64]ledger.Hash{}}
	var page []Entry
	// A page's rows are compared with its bytes, and its tree hashes with its
	// leaves, before its entries with what was signed: rows name an entry.
	check := func() error {
		if err := tree.add(ctx, page); err != nil {
			return err
		}
		for _, e := range page {
			verified, err := verifier.Entry(e.Bytes)
			if err != nil {
				return err
			}
			if err := each(verified); err != nil {
				return &ledger.Failure{Index: e.Index, ID: e.ID, Reason: err.Error()}
			}
		}
		page = page[:0]
		return nil
	}
	err = store.Entries(ctx, 0, head.Size, func(e Entry) error {
		if next := verifier.Size() + int64(len(page)); e.Index != next {
			return &ledger.Failure{Index: next, Reason: fmt.Sprintf("it is missing: the next entry that is there has the index %d.", e.Index)}
		}
		if err := unaltered(e); err != nil {
			return &ledger.Failure{Index: e.Index, ID: e.ID, Reason: err.Error()}
		}
		if is, err := EntryOf(e.Bytes); err != nil || !slices.Equal(is.Terms, e.Terms) {
			return &ledger.Failure{Index: e.Index, ID: e.ID, Reason: "its terms are not the methods, materials and curve sets that its bytes name."}
		}
		if page = append(page, e); len(page) < auditPage {
			return nil
		}
		return check()
	})
	if err != nil {
		return err
	}
	if err := check(); err != nil {
		return err
	}
	if verifier.Size() != head.Size {
		return &ledger.Failure{Index: verifier.Size(), Reason: fmt.Sprintf("it is missing: the head is of %d entries.", head.Size)}
	}
	if head.Size > 0 {
		if err := verifier.Checkpoint(head.Checkpoint); err != nil {
			return err
		}
		if head.Root != tree.base.Root {
			return &ledger.Failure{Index: -1, Reason: fmt.Sprintf("The head's root is not that of its %d entries.", head.Size)}
		}
	}
	return verifier.Done()
}

// treeAudit compares stored tree hashes with those that the leaves give.
type treeAudit struct {
	store Store
	base  ledger.Tree // of the entries compared so far
	edge  map[int64]ledger.Hash
}

func (t *treeAudit) add(ctx context.Context, page []Entry) error {
	if len(page) == 0 {
		return nil
	}
	leaves := make([]ledger.Hash, len(page))
	for i, e := range page {
		leaves[i] = ledger.Leaf(e.Bytes)
	}
	read := func(indexes []int64) ([]ledger.Hash, error) {
		hashes := make([]ledger.Hash, len(indexes))
		for i, index := range indexes {
			hashes[i] = t.edge[index]
		}
		return hashes, nil
	}
	hashes, edge, root, err := ledger.Grow(t.base, leaves, read)
	if err != nil {
		return err
	}
	first := ledger.StoredHashCount(t.base.Size)
	indexes := make([]int64, len(hashes))
	for i := range indexes {
		indexes[i] = first + int64(i)
	}
	stored, err := t.store.Hashes(ctx, indexes)
	if errors.Is(err, ErrNotFound) {
		stored, err = t.present(ctx, indexes)
	}
	if err != nil {
		return err
	}
	for i := range hashes {
		if i < len(stored) && stored[i] == hashes[i] {
			continue
		}
		// The entry whose leaf completed the subtree of this hash.
		entry := int64(0)
		for ledger.StoredHashCount(t.base.Size+entry+1) <= indexes[i] {
			entry++
		}
		what := "is not the one that the entries give"
		if i >= len(stored) {
			what = "is missing"
		}
		return &ledger.Failure{
			Index: t.base.Size + entry, ID: page[entry].ID,
			Reason: fmt.Sprintf("the tree hash %d stored with it %s.", indexes[i], what),
		}
	}
	t.base, t.edge = ledger.Tree{Size: t.base.Size + int64(len(leaves)), Root: root}, edge
	return nil
}

// present reads hashes up to the first that is missing.
func (t *treeAudit) present(ctx context.Context, indexes []int64) ([]ledger.Hash, error) {
	var found []ledger.Hash
	for _, index := range indexes {
		one, err := t.store.Hashes(ctx, []int64{index})
		if errors.Is(err, ErrNotFound) {
			return found, nil
		}
		if err != nil {
			return nil, err
		}
		found = append(found, one...)
	}
	return found, nil
}

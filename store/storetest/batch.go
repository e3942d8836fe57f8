package storetest

import (
	"context"

	"jointledger/service"
	"jointledger/service/ledger"
)

// BatchOn makes a batch of entries on a head, up to the head that it leaves,
// which signer signs.
func BatchOn(ctx context.Context, s service.Store, signer service.Signer, base service.Head, entries []service.Entry) (service.Batch, error) {
	b := service.Batch{Base: base}
	leaves := make([]ledger.Hash, len(entries))
	for i, e := range entries {
		e.Index = base.Size + int64(i)
		leaves[i] = e.Leaf
		b.Entries = append(b.Entries, e)
	}
	hashes, _, root, err := ledger.Grow(ledger.Tree{Size: base.Size, Root: base.Root}, leaves, func(indexes []int64) ([]ledger.Hash, error) {
		return s.Hashes(ctx, indexes)
	})
	if err != nil {
		return b, err
	}
	b.Hashes, b.Head = hashes, service.Head{Size: base.Size + int64(len(entries)), Root: root}
	b.Head.Checkpoint, err = signer.Checkpoint(b.Head.Size, root)
	return b, err
}

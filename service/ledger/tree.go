package ledger

import (
	"errors"
	"fmt"
	"math/bits"

	"golang.org/x/mod/sumdb/tlog"
)

// ReadHashes returns stored hashes by their index in storage, as many as were
// asked for and in that order, or an error.
type ReadHashes = tlog.HashReaderFunc

// StoredHashCount returns how many hashes are stored of a tree of n leaves: the
// leaves and every complete subtree. The hashes that the next leaves add are
// stored from that index on.
func StoredHashCount(n int64) int64 { return tlog.StoredHashCount(n) }

// LeafIndex returns the index in storage of the leaf of entry n.
func LeafIndex(n int64) int64 { return tlog.StoredHashIndex(0, n) }

// ErrTree means that stored hashes do not give the root that was signed over
// them: the store was altered, and nothing may be added to it.
var ErrTree = errors.New("the stored tree hashes do not give the root of the log")

// Grow adds leaves to a tree. It returns the hashes to be stored from index
// StoredHashCount(base.Size) on, the root of the grown tree, and its right
// edge: the stored hashes, by index, that the next Grow reads.
//
// It reads the right edge of base, at most 53 hashes in one call, and fails
// with ErrTree when they do not give base.Root.
func Grow(base Tree, leaves []Hash, read ReadHashes) (hashes []Hash, edge map[int64]Hash, root Hash, err error) {
	if base.Size < 0 || base.Size > MaxSize-int64(len(leaves)) {
		return nil, nil, Hash{}, fmt.Errorf("a tree of %d leaves cannot grow by %d: at most %d are dealt with", base.Size, len(leaves), int64(MaxSize))
	}
	f := frontier{size: base.Size}
	if indexes := edgeIndexes(base.Size); len(indexes) > 0 {
		if f.peaks, err = read(indexes); err != nil {
			return nil, nil, Hash{}, err
		}
		if len(f.peaks) != len(indexes) {
			return nil, nil, Hash{}, fmt.Errorf("asked for %d stored hashes, got %d", len(indexes), len(f.peaks))
		}
	}
	if f.root() != base.Root {
		return nil, nil, Hash{}, fmt.Errorf("%w of %d entries", ErrTree, base.Size)
	}
	hashes = make([]Hash, 0, 2*len(leaves)+bits.Len64(uint64(base.Size)))
	for _, leaf := range leaves {
		hashes = f.add(leaf, hashes)
	}
	edge = make(map[int64]Hash, len(f.peaks))
	for i, index := range edgeIndexes(f.size) {
		edge[index] = f.peaks[i]
	}
	return hashes, edge, f.root(), nil
}

// edgeIndexes lists the indexes in storage of the complete subtrees that a tree
// of n leaves falls into, the largest first: one for each bit of n.
func edgeIndexes(n int64) []int64 {
	var indexes []int64
	start := int64(0)
	for level := bits.Len64(uint64(n)) - 1; level >= 0; level-- {
		if n&(1<<level) != 0 {
			indexes = append(indexes, tlog.StoredHashIndex(level, start>>level))
			start += 1 << level
		}
	}
	return indexes
}

// frontier is a tree as far as it matters for adding to it: the roots of its
// complete subtrees, the largest first.
type frontier struct {
	size  int64
	peaks []Hash
}

// add adds a leaf and appends to hashes what is to be stored for it: the leaf,
// then the subtrees that it completes, upwards.
func (f *frontier) add(leaf Hash, hashes []Hash) []Hash {
	hash := leaf
	hashes = append(hashes, hash)
	for range bits.TrailingZeros64(uint64(f.size + 1)) {
		last := len(f.peaks) - 1
		hash = tlog.NodeHash(f.peaks[last], hash)
		f.peaks = f.peaks[:last]
		hashes = append(hashes, hash)
	}
	f.peaks = append(f.peaks, hash)
	f.size++
	return hashes
}

func (f *frontier) root() Hash {
	if len(f.peaks) == 0 {
		return EmptyRoot
	}
	root := f.peaks[len(f.peaks)-1]
	for i := len(f.peaks) - 2; i >= 0; i-- {
		root = tlog.NodeHash(f.peaks[i], root)
	}
	return root
}

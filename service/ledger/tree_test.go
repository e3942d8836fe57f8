package ledger

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"slices"
	"testing"

	"golang.org/x/mod/sumdb/tlog"
)

// mth is the Merkle tree hash in the words of RFC 6962 section 2.1.
func mth(leaves []Hash) Hash {
	switch n := len(leaves); n {
	case 0:
		return sha256.Sum256(nil)
	case 1:
		return leaves[0]
	default:
		k := 1
		for 2*k < n {
			k *= 2
		}
		left, right := mth(leaves[:k]), mth(leaves[k:])
		return sha256.Sum256(slices.Concat([]byte{1}, left[:], right[:]))
	}
}

// The eight leaves and roots are those of the reference implementation's tests
// of Certificate Transparency (merkletree tests; from memory 95%, and each
// root agrees with the recursion above).
func TestRootsOfReference(t *testing.T) {
	inputs := []string{"", "00", "10", "2021", "3031", "40414243", "5051525354555657", "606162636465666768696a6b6c6d6e6f"}
	roots := []string{
		"6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d",
		"fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125",
		"aeb6bcfe274b70a14fb067a5e5578264db0fa9b51af5e0ba159158f329e06e77",
		"d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7",
		"4e3bbb1f7b478dcfe71fb631631519a3bca12c9aefca1612bfce4c13a86264d4",
		"76e67dadbcdf1e10e1b74ddc608abd2f98dfb16fbce75277b5232a127f2087ef",
		"ddb89be403809e325750d3d263cd78929c2942b7942a34b77e122c9594a74c8c",
		"5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328",
	}
	l := &sampleLog{}
	var leaves []Hash
	for i, input := range inputs {
		data, err := hex.DecodeString(input)
		if err != nil {
			t.Fatal(err)
		}
		leaves = append(leaves, Leaf(data))
		l.addLeaves(t, leaves[i:])
		if DigestText(l.tree.Root) != "sha256:"+roots[i] {
			t.Errorf("root of %d: %s, want %s", i+1, DigestText(l.tree.Root), roots[i])
		}
		if l.tree.Root != mth(leaves) {
			t.Errorf("root of %d is not that of RFC 6962", i+1)
		}
	}
	if DigestText(EmptyRoot) != "sha256:e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855" {
		t.Errorf("empty root %s", DigestText(EmptyRoot))
	}
}

// However a log is cut into batches, the stored hashes are those that tlog
// stores one by one, the root is RFC 6962's, and the edge that Grow returns is
// all that the next one reads.
func TestGrowInBatches(t *testing.T) {
	var leaves, stored []Hash
	for i := range 70 {
		leaf := Leaf(fmt.Append(nil, "leaf ", i))
		hashes, err := tlog.StoredHashesForRecordHash(int64(i), leaf, tlog.HashReaderFunc(func(indexes []int64) ([]Hash, error) {
			var found []Hash
			for _, index := range indexes {
				found = append(found, stored[index])
			}
			return found, nil
		}))
		if err != nil {
			t.Fatal(err)
		}
		leaves, stored = append(leaves, leaf), append(stored, hashes...)
	}
	for first := range len(leaves) + 1 {
		for second := first; second <= len(leaves); second++ {
			l := &sampleLog{}
			l.addLeaves(t, leaves[:first])
			edge, asked := l.edge, false
			hashes, _, root, err := Grow(l.tree, leaves[first:second], func(indexes []int64) ([]Hash, error) {
				asked = true
				if len(indexes) != len(edge) {
					t.Errorf("asked for %d, the edge has %d", len(indexes), len(edge))
				}
				var found []Hash
				for _, index := range indexes {
					if edge[index] != stored[index] {
						t.Fatalf("the edge of %d has another hash %d", first, index)
					}
					found = append(found, edge[index])
				}
				return found, nil
			})
			if err != nil {
				t.Fatal(err)
			}
			if asked != (first > 0) || root != mth(leaves[:second]) {
				t.Fatalf("%d, then %d: root or reads are wrong", first, second)
			}
			if !slices.Equal(append(l.stored, hashes...), stored[:StoredHashCount(int64(second))]) {
				t.Fatalf("%d, then %d: other hashes than tlog stores", first, second)
			}
		}
	}
}

func TestGrowRefusesAlteredHashes(t *testing.T) {
	l := newSampleLog(t, 21, []byte(`{"a":1}`)) // three subtrees: 16, 4, 1
	leaf := []Hash{Leaf([]byte("next"))}
	if len(l.edge) != 3 {
		t.Fatalf("the edge has %d hashes", len(l.edge))
	}
	for index := range l.edge {
		for bit := range 8 {
			l.stored[index][7] ^= 1 << bit
			if _, _, _, err := Grow(l.tree, leaf, l.read); !errors.Is(err, ErrTree) {
				t.Errorf("stored hash %d altered: %v", index, err)
			}
			l.stored[index][7] ^= 1 << bit
		}
	}
	if _, _, _, err := Grow(l.tree, leaf, l.read); err != nil {
		t.Error(err)
	}
	lost := errors.New("lost")
	if _, _, _, err := Grow(l.tree, leaf, func([]int64) ([]Hash, error) { return nil, lost }); !errors.Is(err, lost) {
		t.Errorf("a read error became %v", err)
	}
	if _, _, _, err := Grow(l.tree, leaf, func([]int64) ([]Hash, error) { return leaf, nil }); err == nil {
		t.Error("took one hash for three")
	}
	for _, size := range []int64{-1, MaxSize, 1<<63 - 1} {
		if _, _, _, err := Grow(Tree{size, l.tree.Root}, leaf, l.read); err == nil {
			t.Errorf("grew a tree of %d", size)
		}
	}
}

// Package ledger is the arithmetic of a log that can only be added to: what is
// hashed, the tree over it, the signed checkpoint of the tree, the proofs that
// follow from it, and the verification of an export by somebody who trusts
// nobody but a public key. It reads no file, clock or network.
//
// # What is hashed
//
// An entry is a JSON object {"type", "id", "at", "author", "body"} in the
// canonical form of RFC 8785. Its leaf is SHA-256(0x00 ‖ entry), that of
// RFC 6962 section 2.1, and its index is its position in the log, from 0.
//
// # The tree
//
// The Merkle tree of RFC 6962 section 2.1 stands over the leaves of all
// entries. Its complete subtrees are stored in the order of
// golang.org/x/mod/sumdb/tlog; [Grow] adds leaves to it.
//
// # What anybody can check
//
// A checkpoint is a signed note (C2SP signed-note) over origin, size and root,
// in the form of C2SP tlog-checkpoint. A [Proof] shows that one entry stands
// in the tree of a checkpoint (C2SP tlog-proof), [CheckConsistency] that a
// later tree only added to an earlier one, and a [Verifier] that an export is
// exactly what was signed. None of them says that an entry is true, or when it
// was written: the times are the server's word, the order is proven.
package ledger

import (
	"fmt"

	"golang.org/x/mod/sumdb/tlog"
)

// Hash is a SHA-256 hash: a leaf, a node or the root of the tree.
type Hash = tlog.Hash

// MaxSize is the largest size of a tree that is dealt with.
const MaxSize = 1 << 53

// Tree is a state of the log: its first Size entries, and the root over them.
type Tree struct {
	Size int64
	Root Hash
}

// EmptyRoot is the root of the tree without entries: the SHA-256 of nothing
// (RFC 6962 section 2.1).
var EmptyRoot = func() Hash {
	root, err := tlog.TreeHash(0, nil)
	if err != nil {
		panic(err) // it reads nothing for an empty tree
	}
	return root
}()

// Leaf hashes the canonical bytes of an entry as a leaf of the tree.
func Leaf(canonical []byte) Hash { return tlog.RecordHash(canonical) }

// DigestText writes a hash as digests are written: sha256:, then hex digits.
func DigestText(h Hash) string { return fmt.Sprintf("sha256:%x", h[:]) }

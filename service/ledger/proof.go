package ledger

import (
	"bytes"
	"errors"
	"fmt"
	"strconv"
	"strings"

	"golang.org/x/mod/sumdb/tlog"
)

// proofHeader is the first line of C2SP tlog-proof.
const proofHeader = "c2sp.org/tlog-proof@v1"

// maxProof is the most hashes that a proof in a tree of MaxSize can have.
const maxProof = 53

// Proof shows that an entry stands at an index in the tree of a checkpoint. It
// can be kept and checked without the log.
type Proof struct {
	Index      int64
	Hashes     []Hash // the audit path of RFC 6962 section 2.1.1, from the leaf upwards
	Checkpoint string // a signed note
}

// ProveInclusion returns the audit path of the entry at an index in the tree of
// the first size entries.
func ProveInclusion(size, index int64, read ReadHashes) ([]Hash, error) {
	if size < 1 || size > MaxSize || index < 0 || index >= size {
		return nil, fmt.Errorf("there is no entry %d among the first %d", index, size)
	}
	return tlog.ProveRecord(size, index, read)
}

// Text writes the proof in the form of C2SP tlog-proof.
func (p Proof) Text() string {
	var b strings.Builder
	b.WriteString(proofHeader + "\nindex " + strconv.FormatInt(p.Index, 10) + "\n")
	for _, h := range p.Hashes {
		b.WriteString(h.String() + "\n")
	}
	b.WriteString("\n" + p.Checkpoint)
	return b.String()
}

// ParseProof reads a proof. It takes the one form that Text writes, thus no
// extra data.
func ParseProof(text []byte) (Proof, error) {
	head, checkpoint, found := bytes.Cut(text, []byte("\n\n"))
	if !found {
		return Proof{}, errors.New("it has no checkpoint after a blank line")
	}
	lines := strings.Split(string(head), "\n")
	if lines[0] != proofHeader {
		return Proof{}, fmt.Errorf("its first line is not %s", proofHeader)
	}
	if len(lines) < 2 || len(lines) > 2+maxProof {
		return Proof{}, fmt.Errorf("it does not have an index and at most %d hashes", maxProof)
	}
	number, found := strings.CutPrefix(lines[1], "index ")
	index, err := strconv.ParseInt(number, 10, 64)
	if !found || err != nil || index < 0 || strconv.FormatInt(index, 10) != number {
		return Proof{}, fmt.Errorf("its second line, %.40q, is not an index", lines[1])
	}
	p := Proof{Index: index, Hashes: make([]Hash, len(lines)-2), Checkpoint: string(checkpoint)}
	for i, line := range lines[2:] {
		if p.Hashes[i], err = parseHash(line); err != nil {
			return Proof{}, fmt.Errorf("hash %d: %w", i+1, err)
		}
	}
	return p, nil
}

// Verify checks that an entry, by its canonical bytes, stands at the index in
// the tree that the key signed, and returns that tree.
func (p Proof) Verify(canonical []byte, key *Key) (Tree, error) {
	tree, err := key.Open(p.Checkpoint)
	if err != nil {
		return Tree{}, fmt.Errorf("the checkpoint of the proof: %w", err)
	}
	if p.Index >= tree.Size {
		return Tree{}, fmt.Errorf("the proof is of entry %d and its checkpoint is of %d entries", p.Index, tree.Size)
	}
	if err := tlog.CheckRecord(p.Hashes, tree.Size, tree.Root, p.Index, Leaf(canonical)); err != nil {
		return Tree{}, fmt.Errorf("the proof does not lead from this entry at index %d to the signed root: the entry or the proof was altered", p.Index)
	}
	return tree, nil
}

// ProveConsistency returns the proof of RFC 6962 section 2.1.2 that the tree of
// the first to entries only adds to that of the first from. It is empty where
// from is 0 or to.
func ProveConsistency(from, to int64, read ReadHashes) ([]Hash, error) {
	if from < 0 || from > to || to > MaxSize {
		return nil, fmt.Errorf("the first %d entries are not a part of the first %d", from, to)
	}
	if from == 0 {
		return []Hash{}, nil
	}
	return tlog.ProveTree(to, from, read)
}

// CheckConsistency checks a proof of ProveConsistency between two trees, both
// from signed checkpoints.
func CheckConsistency(proof []Hash, from, to Tree) error {
	if from.Size < 0 || from.Size > to.Size || to.Size > MaxSize {
		return fmt.Errorf("the later checkpoint is of %d entries, the earlier of %d: entries were removed", to.Size, from.Size)
	}
	if from.Size == 0 {
		if len(proof) > 0 || from.Root != EmptyRoot {
			return errors.New("every log adds to the empty one: no proof is wanted, and its root is that of an empty log")
		}
		return nil
	}
	if err := tlog.CheckTree(proof, to.Size, to.Root, from.Size, from.Root); err != nil {
		return fmt.Errorf("the log of %d entries does not begin with the %d entries of the earlier checkpoint, or the proof was altered", to.Size, from.Size)
	}
	return nil
}

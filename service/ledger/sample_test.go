package ledger

import (
	"bytes"
	"crypto/sha256"
	"fmt"
	"testing"

	"golang.org/x/mod/sumdb/tlog"
)

const sampleOrigin = "ledger.example.org/saltmarsh"

// sampleSigner is a key made from a fixed seed: for tests alone.
func sampleSigner(t testing.TB, seed string) (*Signer, *Key) {
	t.Helper()
	sum := sha256.Sum256([]byte(seed))
	private, err := GenerateKey(bytes.NewReader(sum[:]), sampleOrigin)
	if err != nil {
		t.Fatal(err)
	}
	signer, err := NewSigner(private)
	if err != nil {
		t.Fatal(err)
	}
	key, err := NewKey(signer.VerifierKey())
	if err != nil {
		t.Fatal(err)
	}
	return signer, key
}

// sampleEnvelope is the n-th entry of a sample log.
func sampleEnvelope(n int, body []byte) Envelope {
	return Envelope{
		Type:   "record",
		ID:     fmt.Sprintf("01946c5e-%04x-7abc-8def-%012x", n>>16, n),
		At:     fmt.Sprintf("2026-01-%02dT%02d:%02d:%02d.%03dZ", 1+n/8640000%28, n/360000%24, n/6000%60, n/100%60, n%1000),
		Author: "m.reed",
		Body:   body,
	}
}

// sampleLog keeps a log in memory: entries, and all stored hashes.
type sampleLog struct {
	entries [][]byte
	stored  []Hash
	tree    Tree
	edge    map[int64]Hash
}

func (l *sampleLog) read(indexes []int64) ([]Hash, error) {
	found := make([]Hash, len(indexes))
	for i, index := range indexes {
		if index >= int64(len(l.stored)) {
			return nil, fmt.Errorf("no stored hash %d", index)
		}
		found[i] = l.stored[index]
	}
	return found, nil
}

// add appends a batch of entries.
func (l *sampleLog) add(t testing.TB, entries ...Envelope) {
	t.Helper()
	leaves := make([]Hash, len(entries))
	for i, e := range entries {
		canonical, leaf, err := Seal(e)
		if err != nil {
			t.Fatal(err)
		}
		l.entries, leaves[i] = append(l.entries, canonical), leaf
	}
	l.addLeaves(t, leaves)
}

func (l *sampleLog) addLeaves(t testing.TB, leaves []Hash) {
	t.Helper()
	if l.tree.Size == 0 {
		l.tree.Root = EmptyRoot
	}
	hashes, edge, root, err := Grow(l.tree, leaves, l.read)
	if err != nil {
		t.Fatal(err)
	}
	if at := tlog.StoredHashCount(l.tree.Size); at != int64(len(l.stored)) {
		t.Fatalf("%d hashes stored of %d entries, tlog wants %d", len(l.stored), l.tree.Size, at)
	}
	l.stored, l.edge = append(l.stored, hashes...), edge
	l.tree = Tree{l.tree.Size + int64(len(leaves)), root}
}

// newSampleLog is a log of n entries, added in batches of 1, 2, 3, …
func newSampleLog(t testing.TB, n int, body []byte) *sampleLog {
	t.Helper()
	l := &sampleLog{}
	for batch := 1; len(l.entries) < n; batch++ {
		var entries []Envelope
		for i := len(l.entries); i < min(n, len(l.entries)+batch); i++ {
			entries = append(entries, sampleEnvelope(i, body))
		}
		l.add(t, entries...)
	}
	return l
}

// export writes the entries from an index on, and a checkpoint of all.
func (l *sampleLog) export(t testing.TB, from int, signer *Signer) []byte {
	t.Helper()
	var b bytes.Buffer
	for _, e := range l.entries[from:] {
		b.Write(e)
		b.WriteByte('\n')
	}
	line, err := CheckpointLine(l.checkpoint(t, signer))
	if err != nil {
		t.Fatal(err)
	}
	b.Write(line)
	b.WriteByte('\n')
	return b.Bytes()
}

func (l *sampleLog) checkpoint(t testing.TB, signer *Signer) string {
	t.Helper()
	checkpoint, err := signer.Checkpoint(l.tree.Size, l.tree.Root)
	if err != nil {
		t.Fatal(err)
	}
	return checkpoint
}

func sampleExport(t testing.TB, n int, body []byte) ([]byte, *Key) {
	t.Helper()
	signer, key := sampleSigner(t, "sample")
	return newSampleLog(t, n, body).export(t, 0, signer), key
}

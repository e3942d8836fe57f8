package ledger_test

import (
	"encoding/hex"
	"encoding/json"
	"os"
	"testing"

	"jointledger/service/ledger"
	"jointledger/service/strictjson"
)

// testdata/vectors holds a small ledger that make.py beside it wrote, in
// Python's standard library and from the published texts alone.
func TestVectorsOfAnotherImplementation(t *testing.T) {
	text, err := os.ReadFile("../../testdata/vectors/vectors.json")
	if err != nil {
		t.Fatal(err)
	}
	var v struct {
		PrivateKey  string `json:"private_key"`
		VerifierKey string `json:"verifier_key"`
		Entries     []struct {
			Envelope struct {
				Type, ID, At, Author string
				Body                 json.RawMessage
			}
			Canonical    string
			RecordDigest string `json:"record_digest"`
		}
		Roots       []string
		Checkpoints []string
		Proofs      []string
		Consistency []struct {
			From, To int64
			Hashes   [][]byte
		}
	}
	if err := json.Unmarshal(text, &v); err != nil {
		t.Fatal(err)
	}
	if len(v.Entries) == 0 || len(v.Roots) != len(v.Entries)+1 || len(v.Checkpoints) != len(v.Roots) || len(v.Proofs) != len(v.Entries) || len(v.Consistency) == 0 {
		t.Fatal("vectors are missing")
	}
	signer, err := ledger.NewSigner([]byte(v.PrivateKey))
	if err != nil {
		t.Fatal(err)
	}
	if signer.VerifierKey() != v.VerifierKey {
		t.Errorf("verifier key %s, want %s", signer.VerifierKey(), v.VerifierKey)
	}
	key, err := ledger.NewKey(v.VerifierKey)
	if err != nil {
		t.Fatal(err)
	}
	var leaves []ledger.Hash
	for i, e := range v.Entries {
		var body any
		if err := strictjson.DecodeLoosely(e.Envelope.Body, &body); err != nil {
			t.Fatal(err)
		}
		canonicalBody, err := strictjson.Canonical(body)
		if err != nil {
			t.Fatal(err)
		}
		canonical, leaf, err := ledger.Seal(ledger.Envelope{
			Type: e.Envelope.Type, ID: e.Envelope.ID, At: e.Envelope.At, Author: e.Envelope.Author, Body: canonicalBody,
		})
		if err != nil {
			t.Fatal(err)
		}
		if string(canonical) != e.Canonical {
			t.Errorf("entry %d:\n%s\nwant\n%s", i, canonical, e.Canonical)
		}
		if ledger.DigestText(leaf) != e.RecordDigest {
			t.Errorf("entry %d: digest %s, want %s", i, ledger.DigestText(leaf), e.RecordDigest)
		}
		leaves = append(leaves, leaf)
	}
	trees := make([]ledger.Tree, len(v.Roots))
	for n := range v.Roots {
		_, _, root, err := ledger.Grow(ledger.Tree{Root: ledger.EmptyRoot}, leaves[:n], nil)
		if err != nil {
			t.Fatal(err)
		}
		if hex.EncodeToString(root[:]) != v.Roots[n] {
			t.Errorf("root of %d: %x, want %s", n, root, v.Roots[n])
		}
		checkpoint, err := signer.Checkpoint(int64(n), root)
		if err != nil {
			t.Fatal(err)
		}
		if checkpoint != v.Checkpoints[n] {
			t.Errorf("checkpoint of %d:\n%s\nwant\n%s", n, checkpoint, v.Checkpoints[n])
		}
		if trees[n], err = key.Open(v.Checkpoints[n]); err != nil {
			t.Error(err)
		}
	}
	hashes, _, _, err := ledger.Grow(ledger.Tree{Root: ledger.EmptyRoot}, leaves, nil)
	if err != nil {
		t.Fatal(err)
	}
	read := func(indexes []int64) ([]ledger.Hash, error) {
		found := make([]ledger.Hash, len(indexes))
		for i, index := range indexes {
			found[i] = hashes[index]
		}
		return found, nil
	}
	size := int64(len(leaves))
	for i, want := range v.Proofs {
		path, err := ledger.ProveInclusion(size, int64(i), read)
		if err != nil {
			t.Fatal(err)
		}
		got := ledger.Proof{Index: int64(i), Hashes: path, Checkpoint: v.Checkpoints[size]}.Text()
		if got != want {
			t.Errorf("proof of %d:\n%s\nwant\n%s", i, got, want)
		}
		proof, err := ledger.ParseProof([]byte(want))
		if err != nil {
			t.Fatal(err)
		}
		if _, err := proof.Verify([]byte(v.Entries[i].Canonical), key); err != nil {
			t.Error(err)
		}
	}
	for _, c := range v.Consistency {
		proof, err := ledger.ProveConsistency(c.From, c.To, read)
		if err != nil {
			t.Fatal(err)
		}
		if len(proof) != len(c.Hashes) {
			t.Fatalf("consistency from %d to %d has %d hashes, want %d", c.From, c.To, len(proof), len(c.Hashes))
		}
		for i := range proof {
			if string(proof[i][:]) != string(c.Hashes[i]) {
				t.Errorf("consistency from %d to %d: hash %d is %x, want %x", c.From, c.To, i, proof[i], c.Hashes[i])
			}
		}
		if err := ledger.CheckConsistency(proof, trees[c.From], trees[c.To]); err != nil {
			t.Error(err)
		}
	}
}

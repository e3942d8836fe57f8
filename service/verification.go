package service

import (
	"context"
	"fmt"

	"jointledger/service/ledger"
)

// Verification tells whether a record stands in the log as it was signed, by
// the same code as the verification of an export.
type Verification struct {
	Verified     bool   `json:"verified"`
	RecordDigest string `json:"record_digest"` // of the stored bytes, hashed again
	Index        int64  `json:"index"`
	Size         int64  `json:"size"` // of the log that was signed
	Root         string `json:"root"` // of its tree, base64
	Origin       string `json:"origin"`
	VerifierKey  string `json:"verifier_key"`
	// Recomputed tells whether the recorded input gives the recorded result.
	Recomputed bool `json:"recomputed"`
	// Reason says what does not hold, null where all holds.
	Reason *string `json:"reason"`
}

// Verify checks a record's stored bytes: their form, the proof that leads from
// them to the signed checkpoint, and the calculation.
func (s *Service) Verify(ctx context.Context, id string) (*Verification, error) {
	entry, err := s.record(ctx, id)
	if err != nil {
		return nil, err
	}
	proof, err := s.Proof(ctx, id)
	if err != nil {
		return nil, err
	}
	v := &Verification{
		RecordDigest: digestOf(entry), Index: entry.Index, Origin: s.signer.Origin(), VerifierKey: s.signer.VerifierKey(),
	}
	tree, err := provenIn(entry.Bytes, proof, v.VerifierKey)
	v.Size, v.Root = tree.Size, tree.Root.String()
	if err != nil {
		v.Reason = text(err.Error())
		return v, nil
	}
	body, err := recordBodyOf(entry.Bytes)
	if err != nil {
		v.Reason = text(err.Error())
		return v, nil
	}
	found, err := recompute(body, s.registry(ctx))
	switch {
	case err != nil:
		v.Reason = text("the record cannot be computed again: " + err.Error())
	case !found.reproduced():
		v.Reason = text("the record was computed again from its input and does not give its result: " + found.String())
	default:
		v.Verified, v.Recomputed = true, true
	}
	return v, nil
}

// provenIn returns the signed tree that a proof leads to from an entry's bytes.
func provenIn(canonical []byte, proof, verifierKey string) (ledger.Tree, error) {
	if _, err := ledger.Parse(canonical); err != nil {
		return ledger.Tree{}, fmt.Errorf("the bytes are not those of an entry as this log writes them: %w", err)
	}
	key, err := ledger.NewKey(verifierKey)
	if err != nil {
		return ledger.Tree{}, err
	}
	p, err := ledger.ParseProof([]byte(proof))
	if err != nil {
		return ledger.Tree{}, fmt.Errorf("the proof: %w", err)
	}
	return p.Verify(canonical, key)
}

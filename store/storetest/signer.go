package storetest

import (
	"crypto/rand"
	"testing"

	"jointledger/service/ledger"
)

// Signer makes a key for a log of a test's own.
func Signer(t testing.TB) *ledger.Signer {
	t.Helper()
	text, err := ledger.GenerateKey(rand.Reader, "saltmarsh.example/jointledger")
	if err != nil {
		t.Fatal(err)
	}
	signer, err := ledger.NewSigner(text)
	if err != nil {
		t.Fatal(err)
	}
	return signer
}

package service

import (
	"bytes"
	"testing"

	"jointledger/service/strictjson"
)

// CheckRoundTrip calculates an input and then its resolved form.
func CheckRoundTrip(t *testing.T, kind Kind, input []byte) {
	t.Helper()
	first, err := calculate(kind, input, View{}, noRegistry{})
	if err != nil {
		t.Fatal(err)
	}
	second, err := calculate(kind, first.input, View{}, noRegistry{})
	if err != nil {
		t.Fatalf("the resolved input is refused: %v\n%s", err, first.input)
	}
	if !bytes.Equal(first.input, second.input) || first.inputDigest != second.inputDigest {
		t.Errorf("the resolved input resolves to something else:\n%s\n%s", first.input, second.input)
	}
	a, err := strictjson.Canonical(&first.result)
	if err != nil {
		t.Fatal(err)
	}
	b, err := strictjson.Canonical(&second.result)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(a, b) {
		t.Errorf("the resolved input gives another answer:\n%s\n%s", a, b)
	}
}

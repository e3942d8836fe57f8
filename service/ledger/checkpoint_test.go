package ledger

import (
	"crypto/rand"
	"strings"
	"testing"

	"github.com/transparency-dev/formats/log"
	"golang.org/x/mod/sumdb/note"
)

func TestKeys(t *testing.T) {
	private, err := GenerateKey(rand.Reader, sampleOrigin)
	if err != nil {
		t.Fatal(err)
	}
	signer, err := NewSigner(private)
	if err != nil {
		t.Fatal(err)
	}
	if signer.Origin() != sampleOrigin {
		t.Errorf("origin %q", signer.Origin())
	}
	// The note package derives the public key by its own way.
	key, err := note.NewVerifier(signer.VerifierKey())
	if err != nil {
		t.Fatal(err)
	}
	checkpoint, err := signer.Checkpoint(0, EmptyRoot)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := note.Open([]byte(checkpoint), note.VerifierList(key)); err != nil {
		t.Error(err)
	}
	for _, origin := range []string{"", "two words", "a+b", "a\nb", "a\u00a0b", "a\x7f", strings.Repeat("a", 201)} {
		if _, err := GenerateKey(rand.Reader, origin); err == nil {
			t.Errorf("made a key for the origin %q", origin)
		}
	}
	text := strings.TrimSpace(string(private))
	for name, bad := range map[string]string{
		"nothing":    "",
		"public key": signer.VerifierKey(),
		"cut short":  text[:len(text)-4],
		"two lines":  text + "\n" + text,
		"other name": strings.Replace(text, sampleOrigin, "ledger.example.org/reedbank", 1),
	} {
		if _, err := NewSigner([]byte(bad)); err == nil {
			t.Errorf("%s: taken as a signing key", name)
		} else if len(bad) > 40 && strings.Contains(err.Error(), text[len(text)-20:]) {
			t.Errorf("%s: the error gives the key away", name)
		}
	}
	for _, bad := range []string{"", text, signer.VerifierKey()[:40], "x" + signer.VerifierKey()} {
		if _, err := NewKey(bad); err == nil {
			t.Errorf("took the verifier key %q", bad)
		}
	}
}

// An independent reader of C2SP tlog-checkpoint reads what is signed here.
func TestCheckpointIsC2SP(t *testing.T) {
	signer, key := sampleSigner(t, "sample")
	l := newSampleLog(t, 21, []byte(`{"a":1}`))
	checkpoint := l.checkpoint(t, signer)
	verifier, err := note.NewVerifier(signer.VerifierKey())
	if err != nil {
		t.Fatal(err)
	}
	theirs, rest, _, err := log.ParseCheckpoint([]byte(checkpoint), sampleOrigin, verifier)
	if err != nil {
		t.Fatal(err)
	}
	if theirs.Origin != sampleOrigin || theirs.Size != 21 || Hash(theirs.Hash) != l.tree.Root || len(rest) > 0 {
		t.Errorf("they read %+v and %q", theirs, rest)
	}
	ours, err := key.Open(checkpoint)
	if err != nil || ours != l.tree {
		t.Errorf("we read %+v, %v", ours, err)
	}
	if _, err := signer.Checkpoint(-1, EmptyRoot); err == nil {
		t.Error("signed a negative size")
	}
	if _, err := signer.Checkpoint(MaxSize+1, EmptyRoot); err == nil {
		t.Error("signed a size out of range")
	}
}

// Texts that the key did sign, and that are still no checkpoints of this log.
func TestCheckpointIsStrict(t *testing.T) {
	signer, key := sampleSigner(t, "sample")
	root := Leaf([]byte("x")).String()
	sign := func(text string) string {
		signed, err := note.Sign(&note.Note{Text: text}, signer.note)
		if err != nil {
			t.Fatal(err)
		}
		return string(signed)
	}
	if _, err := key.Open(sign(sampleOrigin + "\n1\n" + root + "\n")); err != nil {
		t.Fatal(err)
	}
	for name, text := range map[string]string{
		"another origin":       "ledger.example.org/reedbank\n1\n" + root + "\n",
		"leading zero":         sampleOrigin + "\n01\n" + root + "\n",
		"plus sign":            sampleOrigin + "\n+1\n" + root + "\n",
		"negative":             sampleOrigin + "\n-1\n" + root + "\n",
		"space":                sampleOrigin + "\n1 \n" + root + "\n",
		"hexadecimal":          sampleOrigin + "\n0x1\n" + root + "\n",
		"2^62 + 1":             sampleOrigin + "\n4611686018427387905\n" + root + "\n",
		"2^63":                 sampleOrigin + "\n9223372036854775808\n" + root + "\n",
		"short root":           sampleOrigin + "\n1\n" + root[:40] + "\n",
		"long root":            sampleOrigin + "\n1\nAAAA" + root + "\n",
		"root without padding": sampleOrigin + "\n1\n" + strings.TrimRight(root, "=") + "\n",
		"other spelling":       sampleOrigin + "\n1\n" + respell(root) + "\n",
		"root of nothing":      sampleOrigin + "\n0\n" + root + "\n",
		"extension line":       sampleOrigin + "\n1\n" + root + "\nmore\n",
		"blank line":           sampleOrigin + "\n1\n" + root + "\n\n",
		"two lines":            sampleOrigin + "\n1\n",
	} {
		if tree, err := key.Open(sign(text)); err == nil {
			t.Errorf("%s: read as %+v", name, tree)
		}
	}
	stranger, _ := sampleSigner(t, "stranger")
	good := sign(sampleOrigin + "\n1\n" + root + "\n")
	foreign, err := stranger.Checkpoint(1, Leaf([]byte("x")))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := key.Open(foreign); err == nil || !strings.Contains(err.Error(), "not by the key given") {
		t.Errorf("another key: %v", err)
	}
	// With a witness's signature beside ours it stays good.
	line := foreign[strings.Index(foreign, "\n\n")+2:]
	if _, err := key.Open(good + line); err != nil {
		t.Errorf("with a second signature: %v", err)
	}
	for i := range len(good) {
		altered := []byte(good)
		altered[i] ^= 1
		if tree, err := key.Open(string(altered)); err == nil {
			t.Errorf("byte %d altered: read as %+v", i, tree)
		}
	}
}

// respell sets bits of a base64 text that its bytes do not use.
func respell(text string) string {
	const digits = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/"
	at := len(text) - 2 // the last digit carries four bits of a 32-byte hash
	return text[:at] + string(digits[strings.IndexByte(digits, text[at])|1]) + "="
}

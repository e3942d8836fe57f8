package ledger

import (
	"crypto/ed25519"
	"encoding/base64"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode"

	"golang.org/x/mod/sumdb/note"
	"golang.org/x/mod/sumdb/tlog"
)

// Signer signs the checkpoints of one log with its private key.
type Signer struct {
	note        note.Signer
	verifierKey string
}

// GenerateKey makes the private key of a new log, as the one line of text that
// [NewSigner] reads. The origin names the log for good; it has 1 to 200
// characters and neither spaces nor plus signs, such as
// ledger.example.org/saltmarsh.
func GenerateKey(rand io.Reader, origin string) ([]byte, error) {
	if err := checkOrigin(origin); err != nil {
		return nil, err
	}
	private, _, err := note.GenerateKey(rand, origin)
	if err != nil {
		return nil, err
	}
	return []byte(private + "\n"), nil
}

// NewSigner reads a private key. Its errors never repeat a part of the key.
func NewSigner(key []byte) (*Signer, error) {
	text := strings.TrimSuffix(string(key), "\n")
	signer, err := note.NewSigner(text)
	if err != nil {
		return nil, errors.New("it is not a signing key: one line PRIVATE+KEY+<origin>+<hash>+<key> is wanted")
	}
	if err := checkOrigin(signer.Name()); err != nil {
		return nil, err
	}
	// The last part is the algorithm's byte and the seed; NewSigner has seen
	// that it is well formed.
	seed, err := base64.StdEncoding.DecodeString(text[len("PRIVATE+KEY+")+len(signer.Name())+len("+01234567+"):])
	if err != nil {
		return nil, errors.New("it is not a signing key: its last part is not base64")
	}
	public := ed25519.NewKeyFromSeed(seed[1:]).Public().(ed25519.PublicKey)
	verifierKey, err := note.NewEd25519VerifierKey(signer.Name(), public)
	if err != nil {
		return nil, err
	}
	return &Signer{signer, verifierKey}, nil
}

// Origin is the name of the log, the first line of its checkpoints.
func (s *Signer) Origin() string { return s.note.Name() }

// VerifierKey is the public key, in the form that [NewKey] reads.
func (s *Signer) VerifierKey() string { return s.verifierKey }

// Checkpoint signs a state of the log.
func (s *Signer) Checkpoint(size int64, root Hash) (string, error) {
	if size < 0 || size > MaxSize {
		return "", fmt.Errorf("a checkpoint of %d entries cannot be made: at most %d are dealt with", size, int64(MaxSize))
	}
	signed, err := note.Sign(&note.Note{Text: checkpointText(s.Origin(), Tree{size, root})}, s.note)
	return string(signed), err
}

// Key is the public key of a log.
type Key struct{ note note.Verifier }

// NewKey reads a public key in the form of a signed note's verifier key,
// <origin>+<hash>+<key>, with or without an end of line.
func NewKey(verifierKey string) (*Key, error) {
	verifier, err := note.NewVerifier(strings.TrimSuffix(verifierKey, "\n"))
	if err != nil {
		return nil, errors.New("it is not a verifier key: one line <origin>+<hash>+<key> is wanted")
	}
	if err := checkOrigin(verifier.Name()); err != nil {
		return nil, err
	}
	return &Key{verifier}, nil
}

// Origin is the name of the log that the key belongs to.
func (k *Key) Origin() string { return k.note.Name() }

// Open reads a checkpoint. It refuses one that this key did not sign, or that
// is of another log. Signatures of others beside it, such as those of
// witnesses, do no harm and are not looked at.
func (k *Key) Open(checkpoint string) (Tree, error) {
	signed, err := note.Open([]byte(checkpoint), note.VerifierList(k.note))
	var invalid *note.InvalidSignatureError
	var unverified *note.UnverifiedNoteError
	switch {
	case errors.As(err, &invalid):
		return Tree{}, errors.New("its signature does not hold: the text or the signature was altered after signing")
	case errors.As(err, &unverified):
		by := unverified.Note.UnverifiedSigs[0]
		return Tree{}, fmt.Errorf("it is signed by %s+%08x, not by the key given, %s+%08x", by.Name, by.Hash, k.note.Name(), k.note.KeyHash())
	case err != nil:
		return Tree{}, errors.New("it is not a signed note")
	}
	origin, tree, err := parseCheckpoint(signed.Text)
	if err != nil {
		return Tree{}, err
	}
	if origin != k.Origin() {
		return Tree{}, fmt.Errorf("it is of the log %q; the key is of %q", origin, k.Origin())
	}
	return tree, nil
}

func checkpointText(origin string, tree Tree) string {
	return origin + "\n" + strconv.FormatInt(tree.Size, 10) + "\n" + tree.Root.String() + "\n"
}

// parseCheckpoint reads the text of C2SP tlog-checkpoint. Only the one spelling
// of each value is taken, and no extension lines: this log writes none.
func parseCheckpoint(text string) (origin string, tree Tree, err error) {
	lines := strings.Split(text, "\n")
	if len(lines) != 4 || lines[3] != "" {
		return "", Tree{}, errors.New("it does not have three lines: origin, size and root")
	}
	origin = lines[0]
	size, err := strconv.ParseInt(lines[1], 10, 64)
	if err != nil || size < 0 || size > MaxSize || strconv.FormatInt(size, 10) != lines[1] {
		return "", Tree{}, fmt.Errorf("its size, %.40q, is not a whole number from 0 to %d", lines[1], int64(MaxSize))
	}
	root, err := parseHash(lines[2])
	if err != nil {
		return "", Tree{}, fmt.Errorf("its root: %w", err)
	}
	if size == 0 && root != EmptyRoot {
		return "", Tree{}, errors.New("its root is not that of an empty log")
	}
	return origin, Tree{size, root}, nil
}

// parseHash reads the base64 of a hash, in its one spelling.
func parseHash(text string) (Hash, error) {
	h, err := tlog.ParseHash(text)
	if err != nil || h.String() != text {
		return Hash{}, fmt.Errorf("%.60q is not the base64 of a SHA-256 hash", text)
	}
	return h, nil
}

func checkOrigin(origin string) error {
	if !isName(origin) || strings.Contains(origin, "+") || strings.IndexFunc(origin, unicode.IsSpace) >= 0 {
		return fmt.Errorf("the origin %.80q is not a name of 1 to 200 characters without spaces, plus signs and control characters", origin)
	}
	return nil
}

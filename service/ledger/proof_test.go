package ledger

import (
	"slices"
	"strings"
	"testing"

	"github.com/transparency-dev/formats/proof"
)

// spoil calls check with every proof that differs from hashes by a bit, a
// missing or a needless hash.
func spoil(hashes []Hash, check func(what string, altered []Hash)) {
	for i := range hashes {
		altered := slices.Clone(hashes)
		altered[i][i%32] ^= 0x10
		check("corrupted", altered)
		check("left out", slices.Delete(slices.Clone(hashes), i, i+1))
		if i > 0 && hashes[i] != hashes[i-1] {
			altered := slices.Clone(hashes)
			altered[i], altered[i-1] = altered[i-1], altered[i]
			check("exchanged", altered)
		}
	}
	for i := range len(hashes) + 1 {
		check("put in", slices.Insert(slices.Clone(hashes), i, Leaf([]byte("more"))))
	}
}

func TestInclusion(t *testing.T) {
	signer, key := sampleSigner(t, "sample")
	for size := 1; size <= 18; size++ {
		l := newSampleLog(t, size, []byte(`{"a":1}`))
		checkpoint := l.checkpoint(t, signer)
		for index := range size {
			hashes, err := ProveInclusion(int64(size), int64(index), l.read)
			if err != nil {
				t.Fatal(err)
			}
			p := Proof{int64(index), hashes, checkpoint}
			if tree, err := p.Verify(l.entries[index], key); err != nil || tree != l.tree {
				t.Fatalf("entry %d of %d: %v, %v", index, size, tree, err)
			}
			spoil(hashes, func(what string, altered []Hash) {
				if _, err := (Proof{int64(index), altered, checkpoint}).Verify(l.entries[index], key); err == nil {
					t.Errorf("entry %d of %d verifies with a hash %s", index, size, what)
				}
			})
			for other := range size + 2 {
				if other != index {
					_, err := (Proof{int64(other), hashes, checkpoint}).Verify(l.entries[index], key)
					if err == nil || other >= size && !strings.Contains(err.Error(), "its checkpoint is of") {
						t.Errorf("entry %d of %d at %d: %v", index, size, other, err)
					}
				}
				if other < size && other != index {
					if _, err := p.Verify(l.entries[other], key); err == nil {
						t.Errorf("entry %d of %d verifies in the place of %d", other, size, index)
					}
				}
			}
			// Text, by us and by an independent reader of C2SP tlog-proof.
			back, err := ParseProof([]byte(p.Text()))
			if err != nil || back.Index != p.Index || back.Checkpoint != p.Checkpoint || !slices.Equal(back.Hashes, p.Hashes) {
				t.Fatalf("parsed %+v, %v", back, err)
			}
			var theirs proof.TLogProof
			if err := theirs.Unmarshal([]byte(p.Text())); err != nil {
				t.Fatal(err)
			}
			if theirs.Index != uint64(index) || string(theirs.Checkpoint) != checkpoint || len(theirs.Hashes) != len(hashes) {
				t.Fatalf("they read %+v", theirs)
			}
			for i, h := range theirs.Hashes {
				if Hash(h) != hashes[i] {
					t.Fatal("they read another hash")
				}
			}
			if string(theirs.Marshal()) != p.Text() {
				t.Fatal("they write it otherwise")
			}
		}
	}
	l := newSampleLog(t, 3, []byte(`{"a":1}`))
	for _, bad := range [][2]int64{{0, 0}, {3, 3}, {3, -1}, {-1, 0}, {MaxSize + 1, 0}} {
		if _, err := ProveInclusion(bad[0], bad[1], l.read); err == nil {
			t.Errorf("proved entry %d of %d", bad[1], bad[0])
		}
	}
	stranger, _ := sampleSigner(t, "stranger")
	hashes, err := ProveInclusion(3, 1, l.read)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := (Proof{1, hashes, l.checkpoint(t, stranger)}).Verify(l.entries[1], key); err == nil {
		t.Error("verifies under a stranger's checkpoint")
	}
}

func TestParseProofIsStrict(t *testing.T) {
	h := Leaf([]byte("x")).String()
	good := proofHeader + "\nindex 1\n" + h + "\n\ncheckpoint\n"
	if _, err := ParseProof([]byte(good)); err != nil {
		t.Fatal(err)
	}
	for name, text := range map[string]string{
		"nothing":        "",
		"no checkpoint":  proofHeader + "\nindex 1\n" + h + "\n",
		"another header": strings.Replace(good, "@v1", "@v2", 1),
		"no index":       proofHeader + "\n" + h + "\n\ncheckpoint\n",
		"only header":    proofHeader + "\n\ncheckpoint\n",
		"leading zero":   strings.Replace(good, "index 1", "index 01", 1),
		"negative":       strings.Replace(good, "index 1", "index -1", 1),
		"beyond int64":   strings.Replace(good, "index 1", "index 9223372036854775808", 1),
		"extra data":     strings.Replace(good, "index", "extra AAAA\nindex", 1),
		"short hash":     strings.Replace(good, h, h[4:], 1),
		"other spelling": strings.Replace(good, h, respell(h), 1),
		"CRLF":           strings.ReplaceAll(good, "\n", "\r\n"),
		"too many":       strings.Replace(good, h, strings.Repeat(h+"\n", 53)+h, 1),
	} {
		if p, err := ParseProof([]byte(text)); err == nil {
			t.Errorf("%s: read as %+v", name, p)
		}
	}
}

func FuzzParseProof(f *testing.F) {
	f.Add([]byte(proofHeader + "\nindex 1\n" + EmptyRoot.String() + "\n\ncheckpoint\n"))
	f.Add([]byte(proofHeader + "\nindex 0\n\n"))
	_, key := sampleSigner(f, "sample")
	f.Fuzz(func(t *testing.T, text []byte) {
		p, err := ParseProof(text)
		if err != nil {
			return
		}
		if p.Text() != string(text) {
			t.Errorf("took %q, writes it %q", text, p.Text())
		}
		if tree, err := p.Verify([]byte("nothing that was ever sealed"), key); err == nil {
			t.Errorf("verified in %+v", tree)
		}
	})
}

func TestConsistency(t *testing.T) {
	const most = 34
	l := newSampleLog(t, most, []byte(`{"a":1}`))
	trees := []Tree{{0, EmptyRoot}}
	for size := 1; size <= most; size++ {
		trees = append(trees, newSampleLog(t, size, []byte(`{"a":1}`)).tree)
	}
	for to := range most + 1 {
		for from := range to + 1 {
			hashes, err := ProveConsistency(int64(from), int64(to), l.read)
			if err != nil {
				t.Fatal(err)
			}
			if err := CheckConsistency(hashes, trees[from], trees[to]); err != nil {
				t.Fatalf("%d in %d: %v", from, to, err)
			}
			spoil(hashes, func(what string, altered []Hash) {
				if err := CheckConsistency(altered, trees[from], trees[to]); err == nil {
					t.Errorf("%d in %d holds with a hash %s", from, to, what)
				}
			})
			altered := trees[from]
			altered.Root[3] ^= 4
			if err := CheckConsistency(hashes, altered, trees[to]); err == nil {
				t.Errorf("%d in %d holds with the earlier root altered", from, to)
			}
			altered = trees[to]
			altered.Root[3] ^= 4
			// The empty log is the beginning of every log.
			if err := CheckConsistency(hashes, trees[from], altered); err == nil && from > 0 {
				t.Errorf("%d in %d holds with the later root altered", from, to)
			}
			if from < to {
				if err := CheckConsistency(hashes, trees[to], trees[from]); err == nil {
					t.Errorf("%d in %d holds", to, from)
				}
			}
		}
	}
	for _, bad := range [][2]int64{{-1, 3}, {4, 3}, {1, MaxSize + 1}} {
		if _, err := ProveConsistency(bad[0], bad[1], l.read); err == nil {
			t.Errorf("proved %d in %d", bad[0], bad[1])
		}
	}
}

package ledger

import (
	"bytes"
	"errors"
	"io"
	"slices"
	"strings"
	"testing"
	"testing/iotest"
)

// check verifies exports in order as the verify command does.
func check(key *Key, since string, each func(Verified) error, exports ...[]byte) error {
	v := NewVerifier(key)
	if since != "" {
		if err := v.Since(since); err != nil {
			return err
		}
	}
	for _, export := range exports {
		if err := v.Export(bytes.NewReader(export), each); err != nil {
			return err
		}
	}
	return v.Done()
}

func ignore(Verified) error { return nil }

func TestVerifyGoodExports(t *testing.T) {
	signer, key := sampleSigner(t, "sample")
	l := &sampleLog{}
	l.tree.Root = EmptyRoot
	empty, kept := l.export(t, 0, signer), l.checkpoint(t, signer)
	if err := check(key, kept, ignore, empty); err != nil {
		t.Error("the empty log:", err)
	}
	var exports [][]byte
	checkpoints := []string{kept}
	for i, size := range []int{1, 6, 6, 21} {
		from := len(l.entries)
		for len(l.entries) < size {
			l.add(t, sampleEnvelope(len(l.entries), sampleBody(i)))
		}
		exports = append(exports, l.export(t, from, signer))
		checkpoints = append(checkpoints, l.checkpoint(t, signer))
	}
	var seen int64
	each := func(e Verified) error {
		if e.Index != seen || e.Leaf != Leaf(l.entries[seen]) || e.ID != sampleEnvelope(int(seen), nil).ID {
			t.Errorf("handed %+v as entry %d", e.Envelope, seen)
		}
		seen++
		return nil
	}
	for _, kept := range checkpoints {
		for _, files := range [][][]byte{{l.export(t, 0, signer)}, exports, {empty, exports[0], l.export(t, 1, signer)}} {
			seen = 0
			if err := check(key, kept, each, files...); err != nil {
				t.Error(err)
			}
			if seen != 21 {
				t.Errorf("handed %d entries", seen)
			}
		}
	}
	// Read byte by byte, and without the last end of line.
	whole := l.export(t, 0, signer)
	v := NewVerifier(key)
	if err := v.Export(iotest.OneByteReader(bytes.NewReader(whole[:len(whole)-1])), ignore); err != nil {
		t.Error(err)
	}
}

func TestVerifyNamesWhatFails(t *testing.T) {
	signer, key := sampleSigner(t, "sample")
	stranger, _ := sampleSigner(t, "stranger")
	l := newSampleLog(t, 10, []byte(`{"note":"as drawn"}`))
	early := newSampleLog(t, 4, []byte(`{"note":"as drawn"}`))
	kept := early.checkpoint(t, signer)
	line := func(n int) []byte { return append(bytes.Clone(l.entries[n]), '\n') }
	foot := l.export(t, 10, signer)
	build := func(lines ...[]byte) []byte { return slices.Concat(lines...) }
	all := func() (lines [][]byte) {
		for i := range l.entries {
			lines = append(lines, line(i))
		}
		return append(lines, foot)
	}
	replaced := func(n int, old, new string) []byte {
		lines := all()
		lines[n] = bytes.Replace(lines[n], []byte(old), []byte(new), 1)
		if bytes.Equal(lines[n], line(n)) {
			t.Fatalf("%q is not in entry %d", old, n)
		}
		return build(lines...)
	}
	edited := func(edit func([][]byte) [][]byte) []byte { return build(edit(all())...) }
	const id3 = "01946c5e-0000-7abc-8def-000000000003"
	for _, c := range []struct {
		name   string
		export []byte
		since  string
		index  int64
		id     string
		says   string
	}{
		{"a note altered", replaced(5, "as drawn", "as built"), "", -1, "", "between entry 0 and entry 9"},
		{"a note altered, kept checkpoint before", replaced(5, "as drawn", "as built"), kept, -1, "", "between entry 4 and entry 9"},
		{"a note altered, kept checkpoint after", replaced(2, "as drawn", "as built"), kept, -1, "", "The first 4 entries are not those of the kept checkpoint: between entry 0 and entry 3"},
		{"an author altered", replaced(5, "m.reed", "m.reef"), kept, -1, "", "between entry 4 and entry 9"},
		{"a time altered", replaced(5, "2026", "2027"), kept, -1, "", "between entry 4 and entry 9"},
		{"a type altered", replaced(5, `"record"`, `"sign-off"`), kept, -1, "", "between entry 4 and entry 9"},
		{"an id altered", replaced(5, "-8def-", "-9def-"), kept, -1, "", "between entry 4 and entry 9"},
		{"a space put in", replaced(3, `"body":{`, `"body": {`), "", 3, id3, "body: is not an object in canonical form"},
		{"an unknown type", replaced(3, `"record"`, `"memo"`), "", 3, id3, "type: "},
		{"a member put in", replaced(3, `{"at"`, `{"as":1,"at"`), "", 3, "", "not an entry"},
		{"a needless escape", replaced(3, "m.reed", `m.\u0072eed`), "", 3, "", "not an entry"},
		{"a broken line", replaced(3, `}`, ``), "", 3, id3, "body: is not an object in canonical form"},
		{"an empty line", edited(func(l [][]byte) [][]byte { return slices.Insert(l, 3, []byte("\n")) }), "", 3, "", "not an entry"},
		{"an entry taken out", edited(func(l [][]byte) [][]byte { return slices.Delete(l, 5, 6) }), kept, -1, "", "of 10 entries and there are only 9: from entry 4 on"},
		{"an entry put in", edited(func(l [][]byte) [][]byte {
			extra, _, _ := Seal(sampleEnvelope(77, []byte(`{}`)))
			return slices.Insert(l, 5, append(extra, '\n'))
		}), kept, -1, "", "of 10 entries and there are 11: from entry 4 on"},
		{"an entry twice", edited(func(l [][]byte) [][]byte { return slices.Insert(l, 5, l[3]) }), "", 5, id3, "the same id"},
		{"two exchanged", edited(func(l [][]byte) [][]byte { l[6], l[7] = l[7], l[6]; return l }), kept, -1, "", "between entry 4 and entry 9"},
		{"the end missing", build(all()[:10]...), "", -1, "", "ends after entry 9 without a checkpoint"},
		{"cut within an entry", build(all()...)[:len(build(all()[:7]...))+60], "", 7, "", "not an entry"},
		{"cut within the checkpoint", build(all()...)[:len(build(all()...))-20], "", -1, "", "checkpoint after entry 9 cannot be read"},
		{"nothing", nil, "", -1, "", "ends before any entry"},
		{"more after the end", append(build(all()...), line(3)...), "", -1, "", "Something follows"},
		{"another log's checkpoint", build(append(all()[:10], early.export(t, 4, signer))...), "", -1, "", "of 4 entries and there are 10"},
		{"signed by another key", l.export(t, 0, stranger), "", -1, "", "not by the key given"},
		{"an older copy", early.export(t, 0, signer), l.checkpoint(t, signer), -1, "", "older copy"},
		{"a foreign kept checkpoint", build(all()...), early.checkpoint(t, stranger), -1, "", "kept checkpoint: it is signed by"},
		{"the signature altered", bytes.Replace(build(all()...), []byte(`\n"}`), []byte(`=\n"}`), 1), "", -1, "", "not a signed note"},
	} {
		err := check(key, c.since, ignore, c.export)
		var failed *Failure
		if !errors.As(err, &failed) {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		if failed.Index != c.index || failed.ID != c.id || !strings.Contains(failed.Error(), c.says) {
			t.Errorf("%s: index %d, id %q: %v; want index %d, id %q, %q", c.name, failed.Index, failed.ID, failed, c.index, c.id, c.says)
		}
	}
	// The other way round: what each case altered is good when it is not.
	if err := check(key, kept, ignore, build(all()...)); err != nil {
		t.Error(err)
	}
}

// A rewritten log that is signed anew, by the very key, agrees with itself and
// is still betrayed by a kept checkpoint.
func TestVerifyRewrittenLog(t *testing.T) {
	signer, key := sampleSigner(t, "sample")
	kept := newSampleLog(t, 4, []byte(`{"margin":-0.1}`)).checkpoint(t, signer)
	rewritten := newSampleLog(t, 10, []byte(`{"margin":0.1}`)).export(t, 0, signer)
	if err := check(key, "", ignore, rewritten); err != nil {
		t.Fatal(err)
	}
	if err := check(key, kept, ignore, rewritten); err == nil || !strings.Contains(err.Error(), "first 4 entries are not those of the kept checkpoint") {
		t.Errorf("rewritten: %v", err)
	}
}

func TestVerifyPassesErrorsOn(t *testing.T) {
	signer, key := sampleSigner(t, "sample")
	l := newSampleLog(t, 10, []byte(`{"a":1}`))
	export := l.export(t, 0, signer)
	err := check(key, "", func(e Verified) error {
		if e.Index == 6 {
			return errors.New("recomputed, the margin is -0.2, not 0.1")
		}
		return nil
	}, export)
	var failed *Failure
	if !errors.As(err, &failed) || failed.Index != 6 || err.Error() != "entry 6 (01946c5e-0000-7abc-8def-000000000006): recomputed, the margin is -0.2, not 0.1" {
		t.Errorf("a callback's error became %v", err)
	}
	lost := errors.New("the disk is gone")
	r := io.MultiReader(bytes.NewReader(export[:500]), iotest.ErrReader(lost))
	if err := NewVerifier(key).Export(r, ignore); !errors.Is(err, lost) || errors.As(err, &failed) && failed.Reason == "" {
		t.Errorf("a read error became %v", err)
	}
	if err := check(key, "", ignore, export, export); err == nil || !strings.Contains(err.Error(), "entry 10 (01946c5e-0000-7abc-8def-000000000000)") {
		t.Errorf("the same export twice: %v", err)
	}
}

// endless is a line that does not end; it counts what was read of it.
type endless struct{ read int64 }

func (e *endless) Read(p []byte) (int, error) {
	for i := range p {
		p[i] = 'x'
	}
	e.read += int64(len(p))
	return len(p), nil
}

func TestVerifyStopsAtEndlessLine(t *testing.T) {
	_, key := sampleSigner(t, "sample")
	e := &endless{}
	err := NewVerifier(key).Export(e, ignore)
	var failed *Failure
	if !errors.As(err, &failed) || failed.Index != 0 {
		t.Errorf("an endless line: %v", err)
	}
	if e.read > MaxEntry+4<<20 {
		t.Errorf("read %d bytes of it", e.read)
	}
}

package ledger

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"

	"jointledger/service/strictjson"
)

// Verified is an entry whose form was checked.
type Verified struct {
	Index int64
	Leaf  Hash
	Envelope
}

// Failure is the first thing about a log that does not hold.
type Failure struct {
	Index  int64  // of the entry; -1 where no single entry is meant
	ID     string // of the entry; empty where it cannot be read
	Reason string // a sentence, or what a callback said
}

func (f *Failure) Error() string {
	switch {
	case f.Index < 0:
		return f.Reason
	case f.ID == "":
		return fmt.Sprintf("entry %d: %s", f.Index, f.Reason)
	}
	return fmt.Sprintf("entry %d (%s): %s", f.Index, f.ID, f.Reason)
}

func failure(reason string, args ...any) *Failure {
	return &Failure{Index: -1, Reason: fmt.Sprintf(reason, args...)}
}

// Verifier checks a log from its exports and its public key alone: the form of
// each entry, that no id occurs twice, and that the entries, in their order,
// are exactly those that were signed.
//
// Times are not compared: an entry is stamped before it is given its place, by
// any of several servers, so that a later entry may carry an earlier time. The
// order of the log is its indexes, and that is proven.
//
// It holds one line and the 16 bytes of each entry's id, however long the log
// is.
type Verifier struct {
	key   *Key
	tree  frontier
	ids   map[[16]byte]struct{}
	ahead []Tree // kept checkpoints not reached yet
	good  int64  // the entries before it agree with a signed root
	room  []Hash
}

// NewVerifier begins at the start of the log that the key belongs to.
func NewVerifier(key *Key) *Verifier {
	return &Verifier{key: key, ids: map[[16]byte]struct{}{}}
}

// Size is the number of entries taken so far.
func (v *Verifier) Size() int64 { return v.tree.size }

// Since asks that the log begin with what a checkpoint that was kept earlier
// is of. It is to be called before the first entry.
func (v *Verifier) Since(checkpoint string) error {
	tree, err := v.key.Open(checkpoint)
	if err != nil {
		return failure("The kept checkpoint: %v.", err)
	}
	v.ahead = append(v.ahead, tree)
	return v.compare()
}

// Entry takes the next entry of the log, by its bytes.
func (v *Verifier) Entry(canonical []byte) (Verified, error) {
	e := Verified{Index: v.tree.size, Leaf: Leaf(canonical)}
	if e.Index >= MaxSize {
		return e, failure("The log has more than %d entries.", int64(MaxSize))
	}
	var err error
	if e.Envelope, err = Parse(canonical); err != nil {
		// What can be read of a bad entry helps to find it.
		id := ""
		if isUUIDv7(e.ID) {
			id = e.ID
		}
		return e, &Failure{e.Index, id, fmt.Sprintf("its bytes are not those of an entry as this log writes them: %v.", err)}
	}
	id := packUUID(e.ID)
	if _, twice := v.ids[id]; twice {
		return e, &Failure{e.Index, e.ID, "an earlier entry has the same id: an entry was put in twice, or an export was given twice."}
	}
	v.ids[id] = struct{}{}
	v.room = v.tree.add(e.Leaf, v.room[:0])
	return e, v.compare()
}

// place says how far the log was taken.
func (v *Verifier) place() string {
	if v.tree.size == 0 {
		return "before any entry"
	}
	return fmt.Sprintf("after entry %d", v.tree.size-1)
}

// compare compares the tree with the kept checkpoints that are of its size.
func (v *Verifier) compare() error {
	for i := 0; i < len(v.ahead); {
		if v.ahead[i].Size != v.tree.size {
			i++
			continue
		}
		if v.tree.root() != v.ahead[i].Root {
			return failure("The first %d entries are not those of the kept checkpoint: %s.", v.tree.size, v.between())
		}
		v.good = v.tree.size
		v.ahead = append(v.ahead[:i], v.ahead[i+1:]...)
	}
	return nil
}

// between says where the entries stopped being those that were signed.
func (v *Verifier) between() string {
	where := fmt.Sprintf("between entry %d and entry %d something was altered, exchanged, put in or taken out after it was signed", v.good, v.tree.size-1)
	if v.good == 0 {
		return where
	}
	return fmt.Sprintf("%s; the %d entries before agree with a signed checkpoint", where, v.good)
}

// Checkpoint checks that a checkpoint is of exactly the entries taken so far.
func (v *Verifier) Checkpoint(checkpoint string) error {
	tree, err := v.key.Open(checkpoint)
	if err != nil {
		return failure("The checkpoint %s: %v.", v.place(), err)
	}
	switch {
	case tree.Size > v.tree.size:
		return failure("The checkpoint is of %d entries and there are only %d: from entry %d on, entries were taken out, or an export before this one is missing.", tree.Size, v.tree.size, v.good)
	case tree.Size < v.tree.size:
		return failure("The checkpoint is of %d entries and there are %d: from entry %d on, entries were put in, or an export was given twice.", tree.Size, v.tree.size, v.good)
	case tree.Root != v.tree.root():
		return failure("The entries are not those that were signed: %s.", v.between())
	}
	v.good = tree.Size
	return nil
}

// Done checks, after the last entry, that every kept checkpoint was reached.
func (v *Verifier) Done() error {
	if len(v.ahead) > 0 {
		return failure("The kept checkpoint is of %d entries and the log given has only %d: it is an older copy, or entries were taken off its end.", v.ahead[0].Size, v.tree.size)
	}
	return nil
}

const beforeCheckpoint = `{"checkpoint":`

// Export takes a whole export: lines of entries and a last line
// {"checkpoint": "<signed note>"}. The first export begins at entry 0, and each
// follow-up where the one before it ended. Every entry is handed to each before
// the checkpoint below it has been checked; an error of it, told as a sentence,
// fails the entry.
//
// The error is a *Failure where the export does not hold, and that of r where
// it could not be read.
func (v *Verifier) Export(r io.Reader, each func(Verified) error) error {
	lines := bufio.NewReaderSize(r, 1<<20)
	var long []byte
	for {
		line, more, err := readLine(lines, &long)
		if err != nil {
			return err
		}
		if !more {
			return failure("The export ends %s without a checkpoint: its end is missing.", v.place())
		}
		if bytes.HasPrefix(line, []byte(beforeCheckpoint)) {
			if err := v.checkpointLine(line); err != nil {
				return err
			}
			break
		}
		e, err := v.Entry(line)
		if err != nil {
			return err
		}
		if err := each(e); err != nil {
			return &Failure{e.Index, e.ID, err.Error()}
		}
	}
	_, more, err := readLine(lines, &long)
	if err != nil {
		return err
	}
	if more {
		return failure("Something follows the checkpoint %s, which must be the last line of an export.", v.place())
	}
	return nil
}

func (v *Verifier) checkpointLine(line []byte) error {
	var last struct {
		Checkpoint string `json:"checkpoint"`
	}
	if err := strictjson.Decode(line, &last); err != nil {
		return failure("The line of the checkpoint %s cannot be read: %v.", v.place(), err)
	}
	return v.Checkpoint(last.Checkpoint)
}

// CheckpointLine writes the last line of an export, without an end of line.
func CheckpointLine(checkpoint string) ([]byte, error) {
	return strictjson.Canonical(struct {
		Checkpoint string `json:"checkpoint"`
	}{checkpoint})
}

// readLine returns the next line without its end, valid until the next call;
// more is false when there is none. long is room for lines that do not fit
// into the reader's buffer.
func readLine(r *bufio.Reader, long *[]byte) (line []byte, more bool, err error) {
	line, err = r.ReadSlice('\n')
	if err == bufio.ErrBufferFull {
		*long = (*long)[:0]
		for err == bufio.ErrBufferFull && len(*long) <= MaxEntry {
			*long = append(*long, line...)
			line, err = r.ReadSlice('\n')
		}
		*long = append(*long, line...)
		line = *long
		if err == bufio.ErrBufferFull {
			return line, true, nil // too long for an entry, and refused as one
		}
	}
	switch {
	case errors.Is(err, io.EOF):
		return line, len(line) > 0, nil
	case err != nil:
		return nil, false, err
	}
	return line[:len(line)-1], true, nil
}

// packUUID returns the 16 bytes of a UUID that was found to be well formed.
func packUUID(s string) (id [16]byte) {
	n := 0
	for i := range len(s) {
		c := s[i]
		switch {
		case c == '-':
			continue
		case c <= '9':
			c -= '0'
		default:
			c -= 'a' - 10
		}
		id[n/2] = id[n/2]<<4 | c
		n++
	}
	return id
}

package service

import (
	"context"
	"encoding/base64"
	"fmt"
	"io"
	"strconv"

	"jointledger/service/ledger"
)

// head returns the log's head; that of an empty log is signed here.
func (s *Service) head(ctx context.Context) (Head, error) {
	head, err := s.store.Head(ctx)
	if err != nil {
		return Head{}, s.fail(err)
	}
	if head.Size == 0 {
		head.Root = ledger.EmptyRoot
		if head.Checkpoint, err = s.signer.Checkpoint(0, head.Root); err != nil {
			return Head{}, err
		}
	}
	return head, nil
}

// reader reads tree hashes for proofs.
func (s *Service) reader(ctx context.Context) ledger.ReadHashes {
	return func(indexes []int64) ([]ledger.Hash, error) {
		if len(indexes) == 0 {
			return nil, nil
		}
		return s.store.Hashes(ctx, indexes)
	}
}

// VerifierKey is the public key that checks every checkpoint of this log.
func (s *Service) VerifierKey() string { return s.signer.VerifierKey() }

// Checkpoint is the signed head of the log, in C2SP tlog-checkpoint form.
func (s *Service) Checkpoint(ctx context.Context) (string, error) {
	head, err := s.head(ctx)
	return head.Checkpoint, err
}

// Proof shows that a record is in the log, in C2SP tlog-proof form.
func (s *Service) Proof(ctx context.Context, id string) (string, error) {
	entry, err := s.record(ctx, id)
	if err != nil {
		return "", err
	}
	head, err := s.head(ctx)
	if err != nil {
		return "", err
	}
	hashes, err := ledger.ProveInclusion(head.Size, entry.Index, s.reader(ctx))
	if err != nil {
		return "", s.fail(err)
	}
	return ledger.Proof{Index: entry.Index, Hashes: hashes, Checkpoint: head.Checkpoint}.Text(), nil
}

// Consistency shows that the log at one size only adds to the log at another.
type Consistency struct {
	From   int64    `json:"from"`
	To     int64    `json:"to"`
	Hashes []string `json:"hashes"`
}

// Consistency proves that the first to entries begin with the first from.
func (s *Service) Consistency(ctx context.Context, from, to string) (*Consistency, error) {
	head, err := s.head(ctx)
	if err != nil {
		return nil, err
	}
	var f faults
	size := func(name, given string, least, most, absent int64) int64 {
		if given == "" && absent >= 0 {
			return absent
		}
		n, err := strconv.ParseInt(given, 10, 64)
		if err != nil || n < least || n > most {
			f.add(pointer(name), "must be a size of the log from %d to %d, not %.80q", least, most, given)
		}
		return n
	}
	c := &Consistency{Hashes: []string{}}
	c.To = size("to", to, 0, head.Size, head.Size)
	c.From = size("from", from, 0, c.To, -1)
	if found := f.problem(); found != nil {
		return nil, found
	}
	hashes, err := ledger.ProveConsistency(c.From, c.To, s.reader(ctx))
	if err != nil {
		return nil, s.fail(err)
	}
	for _, h := range hashes {
		c.Hashes = append(c.Hashes, base64.StdEncoding.EncodeToString(h[:]))
	}
	return c, nil
}

// Export prepares the log from an index on, for an auditor: each entry's
// canonical bytes on a line, then the checkpoint of exactly these and those
// before.
func (s *Service) Export(ctx context.Context, from string) (func(context.Context, io.Writer) error, error) {
	head, err := s.head(ctx)
	if err != nil {
		return nil, err
	}
	start := int64(0)
	if from != "" {
		if start, err = strconv.ParseInt(from, 10, 64); err != nil || start < 0 || start > head.Size {
			return nil, &Problem{Code: Invalid, Detail: "Some values cannot be used.", Errors: []FieldError{
				{"/from", fmt.Sprintf("must be an index from 0 to %d, not %.80q", head.Size, from)},
			}}
		}
	}
	return func(ctx context.Context, w io.Writer) error {
		err := s.store.Entries(ctx, start, head.Size, func(e Entry) error {
			if _, err := w.Write(append(e.Bytes, '\n')); err != nil {
				return err
			}
			return nil
		})
		if err != nil {
			return err
		}
		end, err := ledger.CheckpointLine(head.Checkpoint)
		if err != nil {
			return err
		}
		_, err = w.Write(append(end, '\n'))
		return err
	}, nil
}

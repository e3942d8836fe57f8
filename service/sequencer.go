package service

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"jointledger/service/ledger"
)

// Limits of a batch; what does not fit waits for the next.
const (
	mostEntriesABatch = 256
	mostBytesABatch   = 32 << 20
	mostHeadMoves     = 50
)

// pending is an entry on its way into the log.
type pending struct {
	ctx    context.Context
	entry  Entry // but for its index
	keys   []KeyChange
	answer *Answer // with a request's idempotency key, nil without
	// admit checks, while nobody else can append, that the entry may be
	// appended, and returns the state that it leaves its record in.
	admit func(ctx context.Context) (State, error)
	// notices go into the transaction; admit may make them.
	notices []Notice
	// judges tells that the entry is a judgement of what the log says: nothing
	// but other judgements may stand before it in its batch.
	judges bool
	done   chan appended
}

// appended is what became of a pending entry.
type appended struct {
	index int64
	state State
	// earlier is set when the same request was answered before.
	earlier *Answer
	err     error
}

// sequencer gives entries their index. All that wait are appended in one
// transaction: the throughput is not one fsync an entry.
type sequencer struct {
	store  Store
	signer Signer
	watch  Watch
	queue  chan *pending
	stop   chan struct{}
	ended  sync.WaitGroup

	// Of the loop alone:
	head *Head                 // nil: unknown
	edge map[int64]ledger.Hash // stored hashes of the tree's right edge
	held []*pending            // left over from the last batch
}

func newSequencer(store Store, signer Signer, watch Watch) *sequencer {
	s := &sequencer{store: store, signer: signer, watch: watch, queue: make(chan *pending), stop: make(chan struct{})}
	s.ended.Add(1)
	go s.loop()
	return s
}

func (s *sequencer) close() {
	close(s.stop)
	s.ended.Wait()
}

// append waits until p is in the log or cannot be.
func (s *sequencer) append(p *pending) appended {
	s.submit(p)
	return <-p.done
}

// submit gives p its place among those that wait; what becomes of it is sent
// to p.done. Of two that one goroutine submits the first stands first.
func (s *sequencer) submit(p *pending) {
	p.done = make(chan appended, 1)
	select {
	case s.queue <- p:
	case <-p.ctx.Done():
		p.done <- appended{err: fmt.Errorf("%w: %w", ErrUnavailable, p.ctx.Err())}
	case <-s.stop:
		p.done <- appended{err: fmt.Errorf("%w: the server is shutting down", ErrUnavailable)}
	}
}

func (s *sequencer) loop() {
	defer s.ended.Done()
	for {
		batch := s.held
		s.held = nil
		if len(batch) == 0 {
			select {
			case p := <-s.queue:
				batch = append(batch, p)
			case <-s.stop:
				return
			}
		}
		s.write(s.gather(batch))
	}
}

// gather adds all that wait, up to the limits.
func (s *sequencer) gather(batch []*pending) []*pending {
	bytes := 0
	for _, p := range batch {
		bytes += len(p.entry.Bytes)
	}
	for len(batch) < mostEntriesABatch && bytes < mostBytesABatch {
		select {
		case p := <-s.queue:
			batch = append(batch, p)
			bytes += len(p.entry.Bytes)
		default:
			return batch
		}
	}
	return batch
}

// write appends a batch, again and again while other replicas are quicker.
func (s *sequencer) write(batch []*pending) {
	var err error
	for range mostHeadMoves {
		if batch, err = s.tryWrite(batch); err == nil || !errors.Is(err, ErrHeadMoved) {
			break
		}
	}
	if errors.Is(err, ErrHeadMoved) {
		err = fmt.Errorf("%w: other replicas kept appending first", ErrUnavailable)
	}
	for _, p := range batch {
		p.done <- appended{err: err}
	}
}

// tryWrite appends what may be appended of a batch and answers it. It returns
// what is still to be answered.
func (s *sequencer) tryWrite(batch []*pending) ([]*pending, error) {
	// The batch belongs to many callers; none of them may cancel the others.
	ctx := context.Background()
	if s.head == nil {
		head, err := s.store.Head(ctx)
		if err != nil {
			return batch, err
		}
		s.head, s.edge = &head, map[int64]ledger.Hash{}
	}
	batch, err := s.answerEarlier(ctx, batch)
	if err != nil || len(batch) == 0 {
		return batch, err
	}
	batch, states, err := s.admit(ctx, batch)
	if err != nil || len(batch) == 0 {
		return batch, err
	}
	out := Batch{Base: *s.head}
	leaves := make([]ledger.Hash, len(batch))
	for i, p := range batch {
		p.entry.Index = s.head.Size + int64(i)
		leaves[i] = p.entry.Leaf
		out.Entries = append(out.Entries, p.entry)
		out.Keys = append(out.Keys, p.keys...)
		out.Notices = append(out.Notices, p.notices...)
		if p.answer != nil {
			p.answer.Index, p.answer.State = p.entry.Index, states[i]
			out.Answers = append(out.Answers, *p.answer)
		}
	}
	if err := s.grow(ctx, &out, leaves); err != nil {
		s.head = nil
		return batch, err
	}
	begun := time.Now()
	err = s.store.Append(ctx, out)
	s.watch.Appended(outcomeOf(err), len(batch), time.Since(begun))
	if err != nil {
		s.head = nil // unknown: it may have been stored
		return batch, err
	}
	s.head = &out.Head
	for i, p := range batch {
		p.done <- appended{index: p.entry.Index, state: states[i]}
	}
	return nil, nil
}

// answerEarlier answers the requests that were answered before, and those
// whose callers have gone.
func (s *sequencer) answerEarlier(ctx context.Context, batch []*pending) ([]*pending, error) {
	var keys []IdempotencyKey
	for _, p := range batch {
		if p.answer != nil {
			keys = append(keys, p.answer.IdempotencyKey)
		}
	}
	var known []*Answer
	if len(keys) > 0 {
		var err error
		if known, err = s.store.Answered(ctx, keys); err != nil {
			s.head = nil
			return batch, err
		}
	}
	var left []*pending
	taken := map[IdempotencyKey]bool{}
	for _, p := range batch {
		var earlier *Answer
		if p.answer != nil {
			earlier, known = known[0], known[1:]
		}
		switch {
		case earlier != nil:
			p.done <- appended{earlier: earlier}
		case p.ctx.Err() != nil:
			p.done <- appended{err: fmt.Errorf("%w: %w", ErrUnavailable, p.ctx.Err())}
		case p.answer != nil && taken[p.answer.IdempotencyKey]:
			s.held = append(s.held, p)
		default:
			if p.answer != nil {
				taken[p.answer.IdempotencyKey] = true
			}
			left = append(left, p)
		}
	}
	return left, nil
}

// admit answers the entries that may not be appended. Two entries about one
// record never stand in one batch, nor does one after a decision that rests on
// that record, so that each is judged on what the log says.
func (s *sequencer) admit(ctx context.Context, batch []*pending) (left []*pending, states []State, err error) {
	about, changes := map[string]bool{}, false
	for i, p := range batch {
		if p.entry.Target != "" && about[p.entry.Target] || p.judges && changes {
			s.held = append(s.held, p)
			continue
		}
		about[p.entry.Target] = true
		var state State
		if p.admit != nil {
			if state, err = p.admit(ctx); errors.Is(err, ErrUnavailable) {
				s.head = nil
				return append(left, batch[i:]...), nil, err
			} else if err != nil {
				p.done <- appended{err: err}
				continue
			}
		}
		left, states = append(left, p), append(states, state)
		changes = changes || !p.judges
		for _, t := range p.entry.Terms {
			if t.Kind == termRecord {
				about[t.Value] = true
			}
		}
	}
	return left, states, nil
}

// grow adds the leaves to the tree and signs the new head.
func (s *sequencer) grow(ctx context.Context, out *Batch, leaves []ledger.Hash) error {
	read := func(indexes []int64) ([]ledger.Hash, error) {
		hashes := make([]ledger.Hash, len(indexes))
		var missing []int64
		for _, i := range indexes {
			if _, ok := s.edge[i]; !ok {
				missing = append(missing, i)
			}
		}
		if len(missing) > 0 {
			found, err := s.store.Hashes(ctx, missing)
			if err != nil {
				return nil, err
			}
			for k, i := range missing {
				s.edge[i] = found[k]
			}
		}
		for k, i := range indexes {
			hashes[k] = s.edge[i]
		}
		return hashes, nil
	}
	hashes, edge, root, err := ledger.Grow(ledger.Tree{Size: out.Base.Size, Root: out.Base.Root}, leaves, read)
	if err != nil {
		return err
	}
	size := out.Base.Size + int64(len(leaves))
	checkpoint, err := s.signer.Checkpoint(size, root)
	if err != nil {
		return err
	}
	out.Hashes, out.Head = hashes, Head{Size: size, Root: root, Checkpoint: checkpoint}
	s.edge = edge
	return nil
}

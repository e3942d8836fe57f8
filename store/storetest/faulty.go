package storetest

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"sync"

	"jointledger/service"
	"jointledger/service/ledger"
)

// Fault is how a call fails.
type Fault int

// The faults. To its caller NotStored and Stored look the same.
const (
	None      Fault = iota
	NotStored       // the call fails before it reaches the store
	Stored          // the store has done the call, and the answer is lost
	Broken          // the call fails as by a defect, with no error of service
)

// ErrInjected is in every failure that a Faulty makes, under
// service.ErrUnavailable unless it is Broken.
var ErrInjected = errors.New("failed on purpose")

// Faulty is a store whose calls fail as a plan says.
type Faulty struct {
	inner service.Store

	mu    sync.Mutex
	plan  func(n int, call string) Fault
	calls []string
}

var _ service.Store = (*Faulty)(nil)

// NewFaulty wraps a store; without a plan nothing fails.
func NewFaulty(inner service.Store) *Faulty { return &Faulty{inner: inner} }

// Plan forgets the calls made so far and decides over those to come: by their
// number, from 0, and the name of the method. Nil lets all through.
func (f *Faulty) Plan(plan func(n int, call string) Fault) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.plan, f.calls = plan, nil
}

// Once fails the n-th call from now, counted from 0 over all methods.
func (f *Faulty) Once(n int, fault Fault) {
	f.Plan(func(at int, _ string) Fault {
		if at == n {
			return fault
		}
		return None
	})
}

// OnceIn fails the next call of one method.
func (f *Faulty) OnceIn(method string, fault Fault) {
	done := false // under the lock of the plan
	f.Plan(func(_ int, call string) Fault {
		if done || call != method {
			return None
		}
		done = true
		return fault
	})
}

// Calls lists the calls since the plan was made, by method.
func (f *Faulty) Calls() []string {
	f.mu.Lock()
	defer f.mu.Unlock()
	return slices.Clone(f.calls)
}

func (f *Faulty) next(call string) Fault {
	f.mu.Lock()
	defer f.mu.Unlock()
	n := len(f.calls)
	f.calls = append(f.calls, call)
	if f.plan == nil {
		return None
	}
	return f.plan(n, call)
}

// do makes a call, or fails it; what a failed call found is not told.
func do[T any](f *Faulty, call string, inner func() (T, error)) (T, error) {
	var nothing T
	failed := fmt.Errorf("%w: %s: %w", service.ErrUnavailable, call, ErrInjected)
	switch f.next(call) {
	case NotStored:
		return nothing, failed
	case Stored:
		if _, err := inner(); err != nil {
			return nothing, err
		}
		return nothing, failed
	case Broken:
		return nothing, ErrInjected
	}
	return inner()
}

// nothing makes a call without a result one for do.
func nothing(err error) (struct{}, error) { return struct{}{}, err }

// Ready implements service.Store.
func (f *Faulty) Ready(ctx context.Context) error {
	_, err := do(f, "Ready", func() (struct{}, error) { return nothing(f.inner.Ready(ctx)) })
	return err
}

// Claim implements service.Store.
func (f *Faulty) Claim(ctx context.Context, id service.Identity) (service.Identity, error) {
	return do(f, "Claim", func() (service.Identity, error) { return f.inner.Claim(ctx, id) })
}

// Head implements service.Store.
func (f *Faulty) Head(ctx context.Context) (service.Head, error) {
	return do(f, "Head", func() (service.Head, error) { return f.inner.Head(ctx) })
}

// Append implements service.Store.
func (f *Faulty) Append(ctx context.Context, batch service.Batch) error {
	_, err := do(f, "Append", func() (struct{}, error) { return nothing(f.inner.Append(ctx, batch)) })
	return err
}

// Hashes implements service.Store.
func (f *Faulty) Hashes(ctx context.Context, indexes []int64) ([]ledger.Hash, error) {
	return do(f, "Hashes", func() ([]ledger.Hash, error) { return f.inner.Hashes(ctx, indexes) })
}

// Answered implements service.Store.
func (f *Faulty) Answered(ctx context.Context, keys []service.IdempotencyKey) ([]*service.Answer, error) {
	return do(f, "Answered", func() ([]*service.Answer, error) { return f.inner.Answered(ctx, keys) })
}

// Entry implements service.Store.
func (f *Faulty) Entry(ctx context.Context, index int64) (service.Entry, error) {
	return do(f, "Entry", func() (service.Entry, error) { return f.inner.Entry(ctx, index) })
}

// EntryByID implements service.Store.
func (f *Faulty) EntryByID(ctx context.Context, id string) (service.Entry, error) {
	return do(f, "EntryByID", func() (service.Entry, error) { return f.inner.EntryByID(ctx, id) })
}

// Entries implements service.Store. Stored fails it after the last entry.
func (f *Faulty) Entries(ctx context.Context, from, to int64, yield func(service.Entry) error) error {
	_, err := do(f, "Entries", func() (struct{}, error) { return nothing(f.inner.Entries(ctx, from, to, yield)) })
	return err
}

// About implements service.Store.
func (f *Faulty) About(ctx context.Context, records []string) (map[string][]service.Entry, error) {
	return do(f, "About", func() (map[string][]service.Entry, error) { return f.inner.About(ctx, records) })
}

// Records implements service.Store.
func (f *Faulty) Records(ctx context.Context, filter service.Filter, before int64, limit int) ([]service.Summary, error) {
	return do(f, "Records", func() ([]service.Summary, error) { return f.inner.Records(ctx, filter, before, limit) })
}

// CurveSet implements service.Store.
func (f *Faulty) CurveSet(ctx context.Context, name string) (service.Entry, error) {
	return do(f, "CurveSet", func() (service.Entry, error) { return f.inner.CurveSet(ctx, name) })
}

// CurveSets implements service.Store.
func (f *Faulty) CurveSets(ctx context.Context) ([]service.Entry, error) {
	return do(f, "CurveSets", func() ([]service.Entry, error) { return f.inner.CurveSets(ctx) })
}

// Latest implements service.Store.
func (f *Faulty) Latest(ctx context.Context, part, revision string, yield func(service.Entry) error) error {
	_, err := do(f, "Latest", func() (struct{}, error) { return nothing(f.inner.Latest(ctx, part, revision, yield)) })
	return err
}

// Key implements service.Store.
func (f *Faulty) Key(ctx context.Context, hash [32]byte) (service.Key, error) {
	return do(f, "Key", func() (service.Key, error) { return f.inner.Key(ctx, hash) })
}

// Keys implements service.Store.
func (f *Faulty) Keys(ctx context.Context) ([]service.Key, error) {
	return do(f, "Keys", func() ([]service.Key, error) { return f.inner.Keys(ctx) })
}

// Touch implements service.Store.
func (f *Faulty) Touch(ctx context.Context, id, at string) error {
	_, err := do(f, "Touch", func() (struct{}, error) { return nothing(f.inner.Touch(ctx, id, at)) })
	return err
}

// AddSession implements service.Store.
func (f *Faulty) AddSession(ctx context.Context, session service.Session, now string) error {
	_, err := do(f, "AddSession", func() (struct{}, error) { return nothing(f.inner.AddSession(ctx, session, now)) })
	return err
}

// SessionKey implements service.Store.
func (f *Faulty) SessionKey(ctx context.Context, hash [32]byte, now string) (service.Key, error) {
	return do(f, "SessionKey", func() (service.Key, error) { return f.inner.SessionKey(ctx, hash, now) })
}

// EndSession implements service.Store.
func (f *Faulty) EndSession(ctx context.Context, hash [32]byte) error {
	_, err := do(f, "EndSession", func() (struct{}, error) { return nothing(f.inner.EndSession(ctx, hash)) })
	return err
}

// Decisions implements service.Store.
func (f *Faulty) Decisions(ctx context.Context, records []string) ([]service.Resting, error) {
	return do(f, "Decisions", func() ([]service.Resting, error) { return f.inner.Decisions(ctx, records) })
}

// Notify implements service.Store.
func (f *Faulty) Notify(ctx context.Context, notices []service.Notice) error {
	_, err := do(f, "Notify", func() (struct{}, error) { return nothing(f.inner.Notify(ctx, notices)) })
	return err
}

// TakeNotices implements service.Store.
func (f *Faulty) TakeNotices(ctx context.Context, now, until string, limit int) ([]service.Notice, error) {
	return do(f, "TakeNotices", func() ([]service.Notice, error) { return f.inner.TakeNotices(ctx, now, until, limit) })
}

// SettleNotice implements service.Store.
func (f *Faulty) SettleNotice(ctx context.Context, id, target, sent, due string) error {
	_, err := do(f, "SettleNotice", func() (struct{}, error) { return nothing(f.inner.SettleNotice(ctx, id, target, sent, due)) })
	return err
}

// NoticesWaiting implements service.Store.
func (f *Faulty) NoticesWaiting(ctx context.Context) (int64, error) {
	return do(f, "NoticesWaiting", func() (int64, error) { return f.inner.NoticesWaiting(ctx) })
}

// Close implements service.Store; it never fails on purpose.
func (f *Faulty) Close() error { return f.inner.Close() }

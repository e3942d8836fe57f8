// Package service is the application: documents in and out, units,
// catalogues, calculations, records, and the ledger that keeps them. It knows
// no HTTP and no SQL; what it needs of the world it declares as small
// interfaces.
package service

import (
	"context"
	"errors"
	"fmt"
	"sync/atomic"
	"time"

	"jointledger/service/ledger"
)

// Clock tells the time.
type Clock interface{ Now() time.Time }

// SystemClock is the machine's clock.
type SystemClock struct{}

// Now implements Clock.
func (SystemClock) Now() time.Time { return time.Now() }

// Signer signs the heads of the log.
type Signer interface {
	// Origin is the first line of every checkpoint.
	Origin() string
	// VerifierKey is the public key in the form of a signed note.
	VerifierKey() string
	// Checkpoint returns the signed note of a tree.
	Checkpoint(size int64, root ledger.Hash) (string, error)
}

// Caller is who asks, as the API has found out.
type Caller struct {
	Name string
	Role Role
}

// Service answers everything that the API and the command line ask.
type Service struct {
	store    Store
	clock    Clock
	signer   Signer
	log      *sequencer
	callers  callers
	policies Policies
	watch    Watch
	notify   []string
	draining atomic.Bool
}

// Watch is told what an operator wants to see. Its methods return at once.
type Watch interface {
	// Calculated tells of an answer by a method.
	Calculated(method, verdict string)
	// Appended tells of a batch of entries that was to be appended, what became
	// of it and how long the store took.
	Appended(outcome Outcome, entries int, took time.Duration)
	// Replayed tells of a record that was computed again as it was recorded.
	Replayed(reproduced bool)
	// Decided tells of a decision of the gate and of the codes of its findings.
	Decided(decision string, codes []string)
	// Altered tells that stored rows are not those that were signed.
	Altered(err error)
	// NoticeSent tells of an attempt to deliver a notice, nil for success.
	NoticeSent(n Notice, err error)
	// NoticesWait tells how many notices wait to be delivered.
	NoticesWait(n int64)
}

// Outcome is what became of a batch.
type Outcome string

// The outcomes.
const (
	Stored Outcome = "stored"
	// Moved: another replica appended first, and the batch is made anew.
	Moved Outcome = "moved"
	// Failed: the store could not be reached, or refused.
	Failed Outcome = "failed"
)

// outcomeOf names what a store answered to an append.
func outcomeOf(err error) Outcome {
	switch {
	case err == nil:
		return Stored
	case errors.Is(err, ErrHeadMoved):
		return Moved
	}
	return Failed
}

// Unwatched is a Watch that nobody looks at.
type Unwatched struct{}

// Calculated implements Watch.
func (Unwatched) Calculated(string, string) {}

// Appended implements Watch.
func (Unwatched) Appended(Outcome, int, time.Duration) {}

// Replayed implements Watch.
func (Unwatched) Replayed(bool) {}

// Decided implements Watch.
func (Unwatched) Decided(string, []string) {}

// Altered implements Watch.
func (Unwatched) Altered(error) {}

// NoticeSent implements Watch.
func (Unwatched) NoticeSent(Notice, error) {}

// NoticesWait implements Watch.
func (Unwatched) NoticesWait(int64) {}

// Setup is what a service is made of.
type Setup struct {
	Store    Store
	Clock    Clock
	Signer   Signer
	Policies Policies
	Watch    Watch
	// Notify names the systems that are told when a release does not hold any
	// more.
	Notify []string
}

// New opens a service on a store. It refuses a log that belongs to another
// origin or key. Close stops it.
func New(ctx context.Context, setup Setup) (*Service, error) {
	store, signer := setup.Store, setup.Signer
	mine := Identity{Origin: signer.Origin(), VerifierKey: signer.VerifierKey()}
	stands, err := store.Claim(ctx, mine)
	if err != nil {
		return nil, err
	}
	if stands.Origin != mine.Origin {
		return nil, fmt.Errorf("this ledger has the origin %q and the server was started with %q: start it with --origin %s", stands.Origin, mine.Origin, stands.Origin)
	}
	if stands.VerifierKey != mine.VerifierKey {
		return nil, fmt.Errorf("this ledger is signed by the key %s and the server was given another: start it with the ledger's own --signing-key", stands.VerifierKey)
	}
	return &Service{
		store: store, clock: setup.Clock, signer: signer, policies: setup.Policies, watch: setup.Watch, notify: setup.Notify,
		log:     newSequencer(store, signer, setup.Watch),
		callers: callers{known: map[[32]byte]knownKey{}, touched: map[string]time.Time{}},
	}, nil
}

// Drain makes Ready fail, so that no new requests are sent here.
func (s *Service) Drain() { s.draining.Store(true) }

// Close waits for appends that have begun and stops.
func (s *Service) Close() { s.log.close() }

// Ready reports whether the service can do all of its work.
func (s *Service) Ready(ctx context.Context) error {
	if s.draining.Load() {
		return problem(Unavailable, "The server is shutting down.")
	}
	return s.fail(s.store.Ready(ctx))
}

// fail turns an error of the store into a problem.
func (s *Service) fail(err error) error {
	switch {
	case err == nil:
		return nil
	case errors.Is(err, ErrNotFound):
		return problem(NotFound, "There is nothing here.")
	case errors.Is(err, ErrUnavailable), errors.Is(err, ledger.ErrTree),
		errors.Is(err, context.Canceled), errors.Is(err, context.DeadlineExceeded):
		return &unavailable{err}
	}
	return err
}

// unavailable is a problem that keeps its cause for the log of the server.
type unavailable struct{ cause error }

func (u *unavailable) Error() string { return u.cause.Error() }

func (u *unavailable) As(target any) bool {
	p, ok := target.(**Problem)
	if ok {
		*p = problem(Unavailable, "The ledger cannot be reached just now. Nothing that was acknowledged is lost; try again with the same Idempotency-Key.")
	}
	return ok
}

// stamp writes a time as entries carry it.
func stamp(t time.Time) string { return t.UTC().Format("2006-01-02T15:04:05.000Z") }

// Calculate answers one document.
func (s *Service) Calculate(ctx context.Context, kind Kind, input []byte, view View) (*Result, error) {
	c, err := calculate(kind, input, view, s.registry(ctx))
	if err != nil {
		return nil, s.fail(err)
	}
	s.count(&c.result)
	return &c.result, nil
}

// count tells the operator of an answer.
func (s *Service) count(r *Result) {
	for _, m := range r.ByMethod {
		s.watch.Calculated(m.Method, m.Verdict)
	}
}

// Calculate answers one document without a ledger: only built-in and inline
// curve sets are known.
func Calculate(kind Kind, input []byte, view View) (*Result, error) {
	c, err := calculate(kind, input, view, noRegistry{})
	if err != nil {
		return nil, err
	}
	return &c.result, nil
}

package service

import (
	"context"
	"crypto/rand"
	"crypto/sha256"
	"crypto/subtle"
	"encoding/base64"
	"errors"
	"fmt"
	"slices"
	"sync"
	"time"

	"github.com/google/uuid"
)

// keyPrefix tells a key of this program from other secrets, for scanners.
const keyPrefix = "jlk_"

// How long a key that was found is not looked up again, and how often its use
// is written down.
const (
	keyRemembered = time.Second
	keyTouched    = time.Minute
)

// callers remembers keys for a moment.
type callers struct {
	mu      sync.Mutex
	known   map[[32]byte]knownKey
	touched map[string]time.Time // by key id
	closed  bool                 // a key was made: open mode is over for good
	asked   time.Time            // when the store was last asked for that
}

type knownKey struct {
	key Key
	at  time.Time
}

// Authenticate finds the caller of an API key. A revoked key is refused within
// a second on every replica.
func (s *Service) Authenticate(ctx context.Context, secret string) (Caller, error) {
	hash := sha256.Sum256([]byte(secret))
	now := s.clock.Now()
	s.callers.mu.Lock()
	known, ok := s.callers.known[hash]
	s.callers.mu.Unlock()
	if !ok || now.Sub(known.at) > keyRemembered {
		key, err := s.store.Key(ctx, hash)
		if errors.Is(err, ErrNotFound) {
			return Caller{}, problem(Unauthenticated, "This API key is not known here.")
		}
		if err != nil {
			return Caller{}, s.fail(err)
		}
		known = knownKey{key, now}
		s.callers.mu.Lock()
		if len(s.callers.known) > 10_000 {
			clear(s.callers.known)
		}
		s.callers.known[hash] = known
		s.callers.mu.Unlock()
	}
	if subtle.ConstantTimeCompare(known.key.Hash[:], hash[:]) != 1 || known.key.Revoked != "" {
		return Caller{}, problem(Unauthenticated, "This API key was revoked.")
	}
	s.touch(ctx, known.key.ID, now)
	return Caller{Name: known.key.Caller, Role: Role(known.key.Role)}, nil
}

// touch writes down that a key was used, at most once a minute. It may fail:
// it is for people, not for the proof.
func (s *Service) touch(ctx context.Context, id string, now time.Time) {
	s.callers.mu.Lock()
	due := now.Sub(s.callers.touched[id]) >= keyTouched
	if due {
		s.callers.touched[id] = now
	}
	s.callers.mu.Unlock()
	if due {
		_ = s.store.Touch(ctx, id, stamp(now))
	}
}

// Open reports whether no key was ever made.
func (s *Service) Open(ctx context.Context) (bool, error) {
	now := s.clock.Now()
	s.callers.mu.Lock()
	closed, recent := s.callers.closed, now.Sub(s.callers.asked) <= keyRemembered
	s.callers.mu.Unlock()
	if closed || recent {
		return !closed, nil
	}
	keys, err := s.store.Keys(ctx)
	if err != nil {
		return false, s.fail(err)
	}
	s.callers.mu.Lock()
	defer s.callers.mu.Unlock()
	s.callers.closed, s.callers.asked = len(keys) > 0, now
	return !s.callers.closed, nil
}

// The types of the entries about keys, and who writes them: whoever can run
// the program on the ledger's own machine.
const (
	entryKeyAdded   = "key-added"
	entryKeyRevoked = "key-revoked"
	operator        = "operator"
)

// keyBody is the body of an entry about a key. The key's hash is no part of
// it: the log says who could act, not how to find out their secret.
type keyBody struct {
	Key    string `json:"key"`
	Caller string `json:"caller"`
	Role   Role   `json:"role"`
}

// AddKey makes a key for a caller and returns the secret, which is stored
// nowhere. A caller has one role and any number of keys.
func (s *Service) AddKey(ctx context.Context, name string, role Role) (string, error) {
	switch {
	case !isID(name):
		return "", fmt.Errorf("a caller's name has 1 to %d characters and no control characters", mostID)
	case !slices.Contains(Roles(), role):
		return "", fmt.Errorf("there is no role %q; there are %v", role, Roles())
	case name == string(Local) || name == operator:
		return "", fmt.Errorf("the name %q is the program's own; choose another", name)
	}
	random := make([]byte, 32)
	if _, err := rand.Read(random); err != nil {
		return "", err
	}
	secret := keyPrefix + base64.RawURLEncoding.EncodeToString(random)
	id, err := uuid.NewV7()
	if err != nil {
		return "", err
	}
	entry, err := s.seal(entryKeyAdded, Caller{Name: operator}, keyBody{id.String(), name, role})
	if err != nil {
		return "", err
	}
	key := Key{ID: id.String(), Caller: name, Role: string(role), Hash: sha256.Sum256([]byte(secret)), Added: entry.At}
	done := s.log.append(&pending{
		ctx: ctx, entry: entry, keys: []KeyChange{{Add: &key}},
		admit: func(ctx context.Context) (State, error) {
			keys, err := s.store.Keys(ctx)
			if err != nil {
				return "", err
			}
			for _, k := range keys {
				if k.Caller == name && k.Revoked == "" && k.Role != string(role) {
					return "", fmt.Errorf("%s has the role %s; a caller has one role: revoke its keys first", name, k.Role)
				}
			}
			return "", nil
		},
	})
	return secret, s.fail(done.err)
}

// RevokeKeys revokes every key of a caller and returns how many there were.
func (s *Service) RevokeKeys(ctx context.Context, name string) (int, error) {
	keys, err := s.store.Keys(ctx)
	if err != nil {
		return 0, s.fail(err)
	}
	revoked := 0
	for _, k := range keys {
		if k.Caller != name || k.Revoked != "" {
			continue
		}
		entry, err := s.seal(entryKeyRevoked, Caller{Name: operator}, keyBody{k.ID, k.Caller, Role(k.Role)})
		if err != nil {
			return revoked, err
		}
		done := s.log.append(&pending{ctx: ctx, entry: entry, keys: []KeyChange{{Revoke: k.ID, At: entry.At}}})
		if done.err != nil {
			return revoked, s.fail(done.err)
		}
		revoked++
	}
	if revoked == 0 {
		return 0, fmt.Errorf("%s has no key that could be revoked", name)
	}
	return revoked, nil
}

// Keys lists all keys in the order of their making.
func (s *Service) Keys(ctx context.Context) ([]Key, error) {
	keys, err := s.store.Keys(ctx)
	return keys, s.fail(err)
}

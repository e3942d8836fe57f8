package service

import (
	"context"
	"crypto/rand"
	"crypto/sha256"
	"errors"
	"time"
)

// SessionTime is how long a browser stays signed in.
const SessionTime = 12 * time.Hour

// SignIn opens a session for the holder of an API key and returns its token,
// which is stored nowhere. A session ends by SignOut, with its key, or after
// SessionTime; on every replica at once.
func (s *Service) SignIn(ctx context.Context, secret string) (string, error) {
	if _, err := s.Authenticate(ctx, secret); err != nil {
		return "", err
	}
	key, err := s.store.Key(ctx, sha256.Sum256([]byte(secret)))
	if err != nil {
		return "", s.fail(err)
	}
	token, now := rand.Text(), s.clock.Now()
	session := Session{Hash: sha256.Sum256([]byte(token)), Key: key.ID, Until: stamp(now.Add(SessionTime))}
	return token, s.fail(s.store.AddSession(ctx, session, stamp(now)))
}

// CallerOf finds the caller of a session.
func (s *Service) CallerOf(ctx context.Context, token string) (Caller, error) {
	now := s.clock.Now()
	key, err := s.store.SessionKey(ctx, sha256.Sum256([]byte(token)), stamp(now))
	if errors.Is(err, ErrNotFound) {
		return Caller{}, problem(Unauthenticated, "Nobody is signed in here, or the session has ended.")
	}
	if err != nil {
		return Caller{}, s.fail(err)
	}
	if key.Revoked != "" {
		return Caller{}, problem(Unauthenticated, "The API key of this session was revoked.")
	}
	s.touch(ctx, key.ID, now)
	return Caller{Name: key.Caller, Role: Role(key.Role)}, nil
}

// SignOut ends a session.
func (s *Service) SignOut(ctx context.Context, token string) error {
	return s.fail(s.store.EndSession(ctx, sha256.Sum256([]byte(token))))
}

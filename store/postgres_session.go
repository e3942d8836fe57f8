package store

import (
	"context"
	"errors"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
)

// AddSession implements service.Store.
func (s *Postgres) AddSession(ctx context.Context, session service.Session, now string) error {
	if !storable(session.Key, session.Until, now) {
		return errors.New("a session's key or a time that is not text")
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	if _, err := s.pool.Exec(ctx, `DELETE FROM sessions WHERE until <= $1`, now); err != nil {
		return postgresError(err)
	}
	_, err := s.pool.Exec(ctx, `INSERT INTO sessions (hash, key_id, until) VALUES ($1, $2, $3)`, session.Hash[:], session.Key, session.Until)
	return postgresError(err)
}

// SessionKey implements service.Store.
func (s *Postgres) SessionKey(ctx context.Context, hash [32]byte, now string) (service.Key, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	rows, err := s.pool.Query(ctx, postgresKeyColumns+` WHERE id = (SELECT key_id FROM sessions WHERE hash = $1 AND until > $2)`, hash[:], now)
	if err != nil {
		return service.Key{}, postgresError(err)
	}
	k, err := pgx.CollectExactlyOneRow(rows, scanPostgresKey)
	return k, postgresError(err)
}

// EndSession implements service.Store.
func (s *Postgres) EndSession(ctx context.Context, hash [32]byte) error {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	_, err := s.pool.Exec(ctx, `DELETE FROM sessions WHERE hash = $1`, hash[:])
	return postgresError(err)
}

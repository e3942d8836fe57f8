package store

import (
	"context"
	"errors"

	"jointledger/service"
)

// AddSession implements service.Store.
func (s *SQLite) AddSession(ctx context.Context, session service.Session, now string) error {
	if !storable(session.Key, session.Until, now) {
		return errors.New("a session's key or a time that is not text")
	}
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	if _, err := s.write.ExecContext(ctx, `DELETE FROM sessions WHERE until <= ?`, now); err != nil {
		return sqliteError(err)
	}
	_, err := s.write.ExecContext(ctx, `INSERT INTO sessions (hash, key_id, until) VALUES (?, ?, ?)`, session.Hash[:], session.Key, session.Until)
	return sqliteError(err)
}

// SessionKey implements service.Store.
func (s *SQLite) SessionKey(ctx context.Context, hash [32]byte, now string) (service.Key, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	k, err := scanSQLiteKey(s.read.QueryRowContext(ctx, sqliteKeyColumns+` WHERE id = (SELECT key_id FROM sessions WHERE hash = ? AND until > ?)`, hash[:], now).Scan)
	if err != nil {
		return service.Key{}, sqliteError(err)
	}
	return k, nil
}

// EndSession implements service.Store.
func (s *SQLite) EndSession(ctx context.Context, hash [32]byte) error {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	_, err := s.write.ExecContext(ctx, `DELETE FROM sessions WHERE hash = ?`, hash[:])
	return sqliteError(err)
}

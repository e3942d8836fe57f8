package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"time"

	"modernc.org/sqlite"
	sqlite3 "modernc.org/sqlite/lib"

	"jointledger/service"
	"jointledger/service/ledger"
)

// SQLite is the embedded store: one file, one writer.
type SQLite struct {
	write *sql.DB // one connection
	read  *sql.DB
	known []migration
	// What every append runs, prepared.
	answered *sql.Stmt
	appends  map[string]*sql.Stmt
}

var _ service.Store = (*SQLite)(nil)

const (
	// sqliteTimeout ends a call that the engine does not answer.
	sqliteTimeout = 30 * time.Second
	// sqliteReaders is the number of connections that read at once.
	sqliteReaders = 8
)

// OpenSQLite opens the database in a file, which it makes, readable by its
// owner alone, where there is none, and brings its schema up to date.
func OpenSQLite(ctx context.Context, file string) (*SQLite, error) {
	return openSQLite(ctx, file, "sqlite")
}

func openSQLite(ctx context.Context, file, engine string) (*SQLite, error) {
	known, err := migrations(migrationFiles, engine)
	if err != nil {
		return nil, err
	}
	made, err := os.OpenFile(file, os.O_RDWR|os.O_CREATE, 0o600)
	if err != nil {
		return nil, fmt.Errorf("the ledger's file cannot be opened: %w; give a directory with --data that this user may write to", err)
	}
	if err := made.Close(); err != nil {
		return nil, err
	}
	if file, err = filepath.Abs(file); err != nil {
		return nil, err
	}
	s := &SQLite{known: known}
	if s.write, err = connectSQLite(file, "_txlock=immediate", "_pragma=temp_store(MEMORY)", "_pragma=journal_mode(WAL)", "_pragma=synchronous(FULL)"); err != nil {
		return nil, err
	}
	s.write.SetMaxOpenConns(1)
	if s.read, err = connectSQLite(file, "_pragma=query_only(1)"); err != nil {
		return nil, errors.Join(err, s.write.Close())
	}
	s.read.SetMaxOpenConns(sqliteReaders)
	s.read.SetMaxIdleConns(sqliteReaders)
	if err := s.migrate(ctx); err != nil {
		return nil, errors.Join(fmt.Errorf("%s: %w", file, err), s.Close())
	}
	if err := s.prepare(ctx); err != nil {
		return nil, errors.Join(fmt.Errorf("%s: %w", file, err), s.Close())
	}
	return s, nil
}

// prepare prepares the statements of appends: to do it for each append takes
// longer than to run them.
func (s *SQLite) prepare(ctx context.Context) (err error) {
	if s.answered, err = s.read.PrepareContext(ctx, sqliteAnswered); err != nil {
		return err
	}
	s.appends = make(map[string]*sql.Stmt, len(sqliteAppends))
	for _, text := range sqliteAppends {
		if s.appends[text], err = s.write.PrepareContext(ctx, text); err != nil {
			return err
		}
	}
	return nil
}

func connectSQLite(file string, options ...string) (*sql.DB, error) {
	options = append(options, "_defensive=1", "_pragma=foreign_keys(1)", "_pragma=busy_timeout(10000)")
	dsn := url.URL{Scheme: "file", Path: file, RawQuery: strings.Join(options, "&")}
	return sql.Open("sqlite", dsn.String())
}

// sqliteError tells a failure of the engine from a statement that was refused.
func sqliteError(err error) error {
	var failed *sqlite.Error
	if errors.As(err, &failed) {
		switch failed.Code() & 0xff {
		case sqlite3.SQLITE_ERROR, sqlite3.SQLITE_CONSTRAINT, sqlite3.SQLITE_MISMATCH, sqlite3.SQLITE_MISUSE, sqlite3.SQLITE_RANGE, sqlite3.SQLITE_TOOBIG:
			return err
		}
	}
	switch {
	case settled(err):
		return err
	case errors.Is(err, sql.ErrNoRows):
		return service.ErrNotFound
	}
	return unavailable(err)
}

const migrationsTable = `CREATE TABLE IF NOT EXISTS schema_migrations (version INTEGER PRIMARY KEY, name TEXT NOT NULL, sum TEXT NOT NULL, at TEXT NOT NULL)`

func (s *SQLite) migrate(ctx context.Context) error {
	for {
		todo, err := s.step(ctx)
		if err != nil {
			return err
		}
		if todo == 0 {
			return nil
		}
	}
}

// step applies one migration and returns how many there were to do.
func (s *SQLite) step(ctx context.Context) (int, error) {
	tx, err := s.write.BeginTx(ctx, nil) // immediate: nobody else migrates now
	if err != nil {
		return 0, sqliteError(err)
	}
	defer tx.Rollback()
	if _, err := tx.ExecContext(ctx, migrationsTable); err != nil {
		return 0, sqliteError(err)
	}
	todo, err := sqlitePending(ctx, tx, s.known)
	if err != nil || len(todo) == 0 {
		return 0, err
	}
	m := todo[0]
	if _, err := tx.ExecContext(ctx, m.sql); err != nil {
		return 0, fmt.Errorf("migration %s: %w", m.name, err)
	}
	if _, err := tx.ExecContext(ctx, `INSERT INTO schema_migrations VALUES (?, ?, ?, strftime('%Y-%m-%dT%H:%M:%fZ'))`, m.version, m.name, m.sum); err != nil {
		return 0, err
	}
	return len(todo), sqliteError(tx.Commit())
}

type sqliteQueryer interface {
	QueryContext(ctx context.Context, query string, args ...any) (*sql.Rows, error)
}

func sqlitePending(ctx context.Context, q sqliteQueryer, known []migration) ([]migration, error) {
	rows, err := q.QueryContext(ctx, `SELECT version, name, sum FROM schema_migrations ORDER BY version`)
	if err != nil {
		return nil, sqliteError(err)
	}
	var done []applied
	if err := each(rows, func() error {
		var a applied
		err := rows.Scan(&a.version, &a.name, &a.sum)
		done = append(done, a)
		return err
	}); err != nil {
		return nil, err
	}
	return pending(known, done)
}

// errEnough ends each without an error.
var errEnough = errors.New("enough")

// each calls scan on every row and closes them.
func each(rows *sql.Rows, scan func() error) error {
	defer rows.Close()
	for rows.Next() {
		if err := scan(); err == errEnough {
			return nil
		} else if err != nil {
			return sqliteError(err)
		}
	}
	return sqliteError(rows.Err())
}

// Ready implements service.Store.
func (s *SQLite) Ready(ctx context.Context) error {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	todo, err := sqlitePending(ctx, s.read, s.known)
	if err == nil && len(todo) > 0 {
		err = unavailable(fmt.Errorf("the schema lacks %s", todo[0].name))
	}
	return err
}

// Claim implements service.Store.
func (s *SQLite) Claim(ctx context.Context, id service.Identity) (service.Identity, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	if !storable(id.Origin, id.VerifierKey) {
		return service.Identity{}, errors.New("an origin or key that is not text")
	}
	// Nothing is inserted where a row stands: its trigger would refuse.
	if _, err := s.write.ExecContext(ctx, `INSERT INTO identity SELECT 1, ?, ? WHERE NOT EXISTS (SELECT 1 FROM identity)`, id.Origin, id.VerifierKey); err != nil {
		return service.Identity{}, sqliteError(err)
	}
	var stands service.Identity
	err := s.write.QueryRowContext(ctx, `SELECT origin, verifier_key FROM identity`).Scan(&stands.Origin, &stands.VerifierKey)
	return stands, sqliteError(err)
}

// Head implements service.Store.
func (s *SQLite) Head(ctx context.Context) (service.Head, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	return sqliteHead(ctx, s.read)
}

func sqliteHead(ctx context.Context, q interface {
	QueryRowContext(ctx context.Context, query string, args ...any) *sql.Row
},
) (h service.Head, err error) {
	var root []byte
	if err := q.QueryRowContext(ctx, `SELECT size, root, checkpoint FROM head`).Scan(&h.Size, &root, &h.Checkpoint); err != nil {
		return service.Head{}, sqliteError(err)
	}
	copy(h.Root[:], root)
	return h, nil
}

// Hashes implements service.Store.
func (s *SQLite) Hashes(ctx context.Context, indexes []int64) ([]ledger.Hash, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	found := make([]ledger.Hash, len(indexes))
	if len(indexes) == 0 {
		return found, nil
	}
	query, err := s.read.PrepareContext(ctx, `SELECT hash FROM tree_hashes WHERE idx = ?`)
	if err != nil {
		return nil, sqliteError(err)
	}
	defer query.Close()
	for i, index := range indexes {
		var hash []byte
		if err := query.QueryRowContext(ctx, index).Scan(&hash); err != nil {
			return nil, sqliteError(err)
		}
		copy(found[i][:], hash)
	}
	return found, nil
}

const sqliteAnswered = `SELECT request_digest, idx, state FROM idempotency WHERE caller = ? AND method = ? AND path = ? AND key = ?`

// Answered implements service.Store.
func (s *SQLite) Answered(ctx context.Context, keys []service.IdempotencyKey) ([]*service.Answer, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	found := make([]*service.Answer, len(keys))
	if len(keys) == 0 {
		return found, nil
	}
	for i, k := range keys {
		if !storable(k.Caller, k.Method, k.Key) {
			continue
		}
		a, digest := &service.Answer{IdempotencyKey: k}, []byte(nil)
		err := s.answered.QueryRowContext(ctx, k.Caller, k.Method, []byte(k.Path), k.Key).Scan(&digest, &a.Index, &a.State)
		switch err = sqliteError(err); {
		case err == nil:
			copy(a.RequestDigest[:], digest)
			found[i] = a
		case !errors.Is(err, service.ErrNotFound):
			return nil, err
		}
	}
	return found, nil
}

// Close implements service.Store.
func (s *SQLite) Close() error { return errors.Join(s.read.Close(), s.write.Close()) }

package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
	"github.com/jackc/pgx/v5/pgxpool"

	"jointledger/service"
	"jointledger/service/ledger"
)

// Postgres is the store of several servers on one log.
type Postgres struct {
	pool  *pgxpool.Pool
	known []migration
}

var _ service.Store = (*Postgres)(nil)

const (
	// postgresTimeout ends a call that the engine does not answer, also where
	// the network swallows everything.
	postgresTimeout = 10 * time.Second
	// postgresConnect ends an attempt to connect.
	postgresConnect = 5 * time.Second
	// migrationLock is the key of the advisory lock that migrations take: any
	// number that no other program on the database uses.
	migrationLock = 0x6a6f696e74
)

// postgresDefaults are set for every session unless the URL sets them. A server
// that hangs within a transaction lets go of the head after half a minute.
var postgresDefaults = map[string]string{
	"application_name":  "jointledger",
	"statement_timeout": "10s",
	"jit":               "off", // it costs more than these queries take
	// There is an index for every query. A plan made while a table was small
	// would go on reading it whole when it has grown.
	"enable_seqscan":                      "off",
	"idle_in_transaction_session_timeout": "30s",
}

// OpenPostgres connects to the database of a URL and brings its schema up to
// date. A database that cannot be reached is an error here; later it is
// service.ErrUnavailable, and the store recovers when it is back.
func OpenPostgres(ctx context.Context, url string) (*Postgres, error) {
	return openPostgres(ctx, url, "postgres")
}

func openPostgres(ctx context.Context, url, engine string) (*Postgres, error) {
	known, err := migrations(migrationFiles, engine)
	if err != nil {
		return nil, err
	}
	config, err := pgxpool.ParseConfig(url)
	if err != nil {
		return nil, fmt.Errorf("the database URL cannot be read: %w; give postgres://USER@HOST:PORT/DATABASE", err)
	}
	config.ConnConfig.ConnectTimeout = postgresConnect
	for name, value := range postgresDefaults {
		if _, set := config.ConnConfig.RuntimeParams[name]; !set {
			config.ConnConfig.RuntimeParams[name] = value
		}
	}
	pool, err := pgxpool.NewWithConfig(ctx, config)
	if err != nil {
		return nil, err
	}
	s := &Postgres{pool: pool, known: known}
	at := fmt.Sprintf("%s:%d, database %q", config.ConnConfig.Host, config.ConnConfig.Port, config.ConnConfig.Database)
	if err := s.reach(ctx); err != nil {
		pool.Close()
		return nil, fmt.Errorf("the Postgres server at %s does not take the connection: %w; check that it runs, that the URL names the right host, port, database and user, and that its pg_hba.conf lets this machine in", at, err)
	}
	if err := s.migrate(ctx); err != nil {
		pool.Close()
		return nil, fmt.Errorf("%s: %w", at, err)
	}
	return s, nil
}

func (s *Postgres) reach(ctx context.Context) error {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	return s.pool.Ping(ctx)
}

// postgresError tells a failure of the engine, or of the way to it, from a
// statement that was refused.
func postgresError(err error) error {
	var refused *pgconn.PgError
	if errors.As(err, &refused) {
		switch refused.Code[:2] {
		case "LD": // our own, see the migrations
			if refused.Code == "LD001" {
				return service.ErrHeadMoved
			}
			return err
		case "22", "23", "42", "P0": // data, constraints (and our triggers), syntax or rights, PL/pgSQL
			return err
		}
	}
	switch {
	case settled(err):
		return err
	case errors.Is(err, pgx.ErrNoRows):
		return service.ErrNotFound
	}
	return unavailable(err)
}

func (s *Postgres) migrate(ctx context.Context) error {
	for {
		// A server without the right to change the schema needs none for one
		// that is up to date.
		if todo, err := s.todo(ctx, s.pool); err == nil && len(todo) == 0 {
			return nil
		}
		err := s.step(ctx)
		var refused *pgconn.PgError
		switch {
		case errors.As(err, &refused) && refused.Code == "42501":
			return fmt.Errorf("the schema is not up to date and this role may not change it: run jointledger migrate as the owner of the tables, with --server-role for the servers' role: %w", err)
		case err != nil:
			return err
		}
	}
}

type postgresQueryer interface {
	Query(ctx context.Context, query string, args ...any) (pgx.Rows, error)
}

func (s *Postgres) todo(ctx context.Context, q postgresQueryer) ([]migration, error) {
	rows, err := q.Query(ctx, `SELECT version, name, sum FROM schema_migrations ORDER BY version`)
	if err != nil {
		return nil, err
	}
	done, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) (a applied, err error) {
		err = row.Scan(&a.version, &a.name, &a.sum)
		return a, err
	})
	if err != nil {
		return nil, err
	}
	return pending(s.known, done)
}

// step applies one migration, unless somebody else has just done it.
func (s *Postgres) step(ctx context.Context) error {
	return pgx.BeginFunc(ctx, s.pool, func(tx pgx.Tx) error {
		if _, err := tx.Exec(ctx, `SELECT pg_advisory_xact_lock($1)`, int64(migrationLock)); err != nil {
			return err
		}
		if _, err := tx.Exec(ctx, `CREATE TABLE IF NOT EXISTS schema_migrations (version int PRIMARY KEY, name text NOT NULL, sum text NOT NULL, at timestamptz NOT NULL DEFAULT now())`); err != nil {
			return err
		}
		todo, err := s.todo(ctx, tx)
		if err != nil || len(todo) == 0 {
			return err
		}
		m := todo[0]
		// A migration is many statements, and on a large log it takes its time.
		if _, err := tx.Exec(ctx, `SET LOCAL statement_timeout = 0`); err != nil {
			return err
		}
		if _, err := tx.Conn().PgConn().Exec(ctx, m.sql).ReadAll(); err != nil {
			return fmt.Errorf("migration %s: %w", m.name, err)
		}
		_, err = tx.Exec(ctx, `INSERT INTO schema_migrations (version, name, sum) VALUES ($1, $2, $3)`, m.version, m.name, m.sum)
		return err
	})
}

// Ready implements service.Store.
func (s *Postgres) Ready(ctx context.Context) error {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	todo, err := s.todo(ctx, s.pool)
	if err == nil && len(todo) > 0 {
		err = fmt.Errorf("the schema lacks %s", todo[0].name)
	}
	if err != nil {
		return unavailable(err)
	}
	return nil
}

// Claim implements service.Store.
func (s *Postgres) Claim(ctx context.Context, id service.Identity) (service.Identity, error) {
	if !storable(id.Origin, id.VerifierKey) {
		return service.Identity{}, errors.New("an origin or key that is not text")
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	if _, err := s.pool.Exec(ctx, `INSERT INTO identity (one, origin, verifier_key) VALUES (1, $1, $2) ON CONFLICT DO NOTHING`, id.Origin, id.VerifierKey); err != nil {
		return service.Identity{}, postgresError(err)
	}
	var stands service.Identity
	err := s.pool.QueryRow(ctx, `SELECT origin, verifier_key FROM identity`).Scan(&stands.Origin, &stands.VerifierKey)
	return stands, postgresError(err)
}

// Head implements service.Store.
func (s *Postgres) Head(ctx context.Context) (h service.Head, _ error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	var root []byte
	if err := s.pool.QueryRow(ctx, `SELECT size, root, checkpoint FROM head`).Scan(&h.Size, &root, &h.Checkpoint); err != nil {
		return service.Head{}, postgresError(err)
	}
	copy(h.Root[:], root)
	return h, nil
}

// Hashes implements service.Store.
func (s *Postgres) Hashes(ctx context.Context, indexes []int64) ([]ledger.Hash, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	found := make([]ledger.Hash, len(indexes))
	if len(indexes) == 0 {
		return found, nil
	}
	rows, err := s.pool.Query(ctx, `SELECT a.place, h.hash FROM unnest($1::bigint[]) WITH ORDINALITY a (idx, place) JOIN tree_hashes h USING (idx)`, indexes)
	if err != nil {
		return nil, postgresError(err)
	}
	var place int
	var hash []byte
	n := 0
	if _, err := pgx.ForEachRow(rows, []any{&place, &hash}, func() error {
		copy(found[place-1][:], hash)
		n++
		return nil
	}); err != nil {
		return nil, postgresError(err)
	}
	if n < len(indexes) {
		return nil, service.ErrNotFound
	}
	return found, nil
}

// Answered implements service.Store.
func (s *Postgres) Answered(ctx context.Context, keys []service.IdempotencyKey) ([]*service.Answer, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	found := make([]*service.Answer, len(keys))
	var places []int64
	var callers, methods, names []string
	var paths [][]byte
	for i, k := range keys {
		if !storable(k.Caller, k.Method, k.Key) {
			continue
		}
		places, callers, methods = append(places, int64(i)), append(callers, k.Caller), append(methods, k.Method)
		paths, names = append(paths, []byte(k.Path)), append(names, k.Key)
	}
	if len(places) == 0 {
		return found, nil
	}
	rows, err := s.pool.Query(ctx, `SELECT a.place, i.request_digest, i.idx, i.state
		FROM unnest($1::bigint[], $2::text[], $3::text[], $4::bytea[], $5::text[]) a (place, caller, method, path, key)
		JOIN idempotency i USING (caller, method, path, key)`, places, callers, methods, paths, names)
	if err != nil {
		return nil, postgresError(err)
	}
	var place, index int64
	var digest []byte
	var state string
	if _, err := pgx.ForEachRow(rows, []any{&place, &digest, &index, &state}, func() error {
		a := &service.Answer{IdempotencyKey: keys[place], Index: index, State: service.State(state)}
		copy(a.RequestDigest[:], digest)
		found[place] = a
		return nil
	}); err != nil {
		return nil, postgresError(err)
	}
	return found, nil
}

// Close implements service.Store.
func (s *Postgres) Close() error {
	s.pool.Close()
	return nil
}

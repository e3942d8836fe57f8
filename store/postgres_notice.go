package store

import (
	"context"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
)

// Decisions implements service.Store.
func (s *Postgres) Decisions(ctx context.Context, records []string) ([]service.Resting, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	values := make([][]byte, len(records))
	for i, id := range records {
		values[i] = []byte(id)
	}
	rows, err := s.pool.Query(ctx, `SELECT `+postgresColumns+`, t.value FROM terms t JOIN entries r ON r.idx = t.idx
		WHERE t.kind = 'record' AND t.value = ANY ($1) AND r.type = 'release-decision'`, values)
	if err != nil {
		return nil, postgresError(err)
	}
	found, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) (r service.Resting, err error) {
		var id []byte
		err = scanPostgres(row, &r.Decision, &id)
		r.Record = string(id)
		return r, err
	})
	sortResting(found)
	return found, postgresError(err)
}

// Notify implements service.Store.
func (s *Postgres) Notify(ctx context.Context, notices []service.Notice) error {
	if err := checkNotices(notices); err != nil {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	batch := &pgx.Batch{}
	queueNotices(batch, notices)
	return postgresError(s.pool.SendBatch(ctx, batch).Close())
}

func queueNotices(batch *pgx.Batch, notices []service.Notice) {
	for _, n := range notices {
		batch.Queue(`INSERT INTO notices (id, target, body, attempts, due, sent) VALUES ($1, $2, $3, 0, $4, '') ON CONFLICT DO NOTHING`, n.ID, n.Target, n.Body, n.Due)
	}
}

// TakeNotices implements service.Store.
func (s *Postgres) TakeNotices(ctx context.Context, now, until string, limit int) ([]service.Notice, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	rows, err := s.pool.Query(ctx, `UPDATE notices SET attempts = attempts + 1, due = $1 WHERE seq IN
		(SELECT seq FROM notices WHERE sent = '' AND due <= $2 ORDER BY due, seq LIMIT $3 FOR UPDATE SKIP LOCKED)
		RETURNING id, target, body, attempts, due`, until, now, limit)
	if err != nil {
		return nil, postgresError(err)
	}
	found, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) (n service.Notice, err error) {
		err = row.Scan(&n.ID, &n.Target, &n.Body, &n.Attempts, &n.Due)
		return n, err
	})
	return found, postgresError(err)
}

// SettleNotice implements service.Store.
func (s *Postgres) SettleNotice(ctx context.Context, id, target, sent, due string) error {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	_, err := s.pool.Exec(ctx, `UPDATE notices SET sent = $1, due = $2 WHERE id = $3 AND target = $4 AND sent = ''`, sent, due, id, target)
	return postgresError(err)
}

// NoticesWaiting implements service.Store.
func (s *Postgres) NoticesWaiting(ctx context.Context) (n int64, _ error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	err := s.pool.QueryRow(ctx, `SELECT count(*) FROM notices WHERE sent = ''`).Scan(&n)
	return n, postgresError(err)
}

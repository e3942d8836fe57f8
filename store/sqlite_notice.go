package store

import (
	"context"

	"jointledger/service"
)

// Decisions implements service.Store.
func (s *SQLite) Decisions(ctx context.Context, records []string) ([]service.Resting, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	query, err := s.read.PrepareContext(ctx, `SELECT `+sqliteColumns+` FROM terms t CROSS JOIN entries r ON r.idx = t.idx
		WHERE t.kind = 'record' AND t.value = ? AND r.type = 'release-decision' ORDER BY r.idx`)
	if err != nil {
		return nil, sqliteError(err)
	}
	defer query.Close()
	var found []service.Resting
	for _, id := range records {
		rows, err := query.QueryContext(ctx, []byte(id))
		if err != nil {
			return nil, sqliteError(err)
		}
		if err := each(rows, func() error {
			r := service.Resting{Record: id}
			err := scanSQLite(rows.Scan, &r.Decision)
			found = append(found, r)
			return err
		}); err != nil {
			return nil, err
		}
	}
	sortResting(found)
	return found, nil
}

// Notify implements service.Store.
func (s *SQLite) Notify(ctx context.Context, notices []service.Notice) error {
	if err := checkNotices(notices); err != nil {
		return err
	}
	return s.transact(ctx, func(ctx context.Context, tx sqliteTx) error { return tx.notify(ctx, notices) })
}

func (tx sqliteTx) notify(ctx context.Context, notices []service.Notice) error {
	return tx.each(ctx, sqliteAddNotice, func(yield func([]any) bool) {
		for _, n := range notices {
			if !yield([]any{n.ID, n.Target, n.Body, n.Due}) {
				return
			}
		}
	})
}

// TakeNotices implements service.Store.
func (s *SQLite) TakeNotices(ctx context.Context, now, until string, limit int) ([]service.Notice, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	rows, err := s.write.QueryContext(ctx, `UPDATE notices SET attempts = attempts + 1, due = ? WHERE seq IN
		(SELECT seq FROM notices WHERE sent = '' AND due <= ? ORDER BY due, seq LIMIT ?) RETURNING id, target, body, attempts, due`, until, now, limit)
	if err != nil {
		return nil, sqliteError(err)
	}
	var found []service.Notice
	err = each(rows, func() error {
		var n service.Notice
		err := rows.Scan(&n.ID, &n.Target, &n.Body, &n.Attempts, &n.Due)
		found = append(found, n)
		return err
	})
	return found, err
}

// SettleNotice implements service.Store.
func (s *SQLite) SettleNotice(ctx context.Context, id, target, sent, due string) error {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	_, err := s.write.ExecContext(ctx, `UPDATE notices SET sent = ?, due = ? WHERE id = ? AND target = ? AND sent = ''`, sent, due, id, target)
	return sqliteError(err)
}

// NoticesWaiting implements service.Store.
func (s *SQLite) NoticesWaiting(ctx context.Context) (n int64, _ error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	err := s.read.QueryRowContext(ctx, `SELECT count(*) FROM notices WHERE sent = ''`).Scan(&n)
	return n, sqliteError(err)
}

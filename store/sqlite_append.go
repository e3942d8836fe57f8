package store

import (
	"context"
	"database/sql"
	"fmt"
	"iter"

	"jointledger/service"
	"jointledger/service/ledger"
)

// The statements of an append.
const (
	sqliteSwapHead  = `UPDATE head SET size = ?, root = ?, checkpoint = ? WHERE size = ? AND root = ?`
	sqliteAddEntry  = `INSERT INTO entries VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`
	sqliteAddTerm   = `INSERT INTO terms VALUES (?, ?, ?, ?)`
	sqliteAddHash   = `INSERT INTO tree_hashes VALUES (?, ?)`
	sqliteAddAnswer = `INSERT INTO idempotency VALUES (?, ?, ?, ?, ?, ?, ?)`
	sqliteAddNotice = `INSERT INTO notices (id, target, body, attempts, due, sent) VALUES (?, ?, ?, 0, ?, '') ON CONFLICT DO NOTHING`
	sqliteReplaced  = `UPDATE standing SET latest = 0 WHERE idx = (SELECT max(idx) FROM entries INDEXED BY entries_subject
		WHERE type = 'record' AND part = ? AND revision = ? AND joint = ? AND aspect = ? AND kind = ? AND idx < ?)`
	sqliteAddStanding = `INSERT INTO standing VALUES (?, 'recorded', ?)`
	sqliteJudged      = `UPDATE standing SET state = (SELECT ` + derivedState + ` FROM entries r WHERE r.idx = standing.idx)
		WHERE idx = (SELECT idx FROM entries WHERE id = ?)`
)

// sqliteAppends are those that are prepared.
var sqliteAppends = []string{
	sqliteSwapHead, sqliteAddEntry, sqliteAddTerm, sqliteAddHash, sqliteAddAnswer, sqliteAddNotice, sqliteReplaced, sqliteAddStanding, sqliteJudged,
}

// sqliteTx is a transaction with the prepared statements.
type sqliteTx struct {
	*sql.Tx
	prepared map[string]*sql.Stmt
}

// Append implements service.Store.
func (s *SQLite) Append(ctx context.Context, b service.Batch) error {
	if err := check(b); err != nil {
		return err
	}
	return s.transact(ctx, func(ctx context.Context, tx sqliteTx) error { return tx.append(ctx, b) })
}

// transact runs statements in one transaction.
func (s *SQLite) transact(ctx context.Context, run func(context.Context, sqliteTx) error) error {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	tx, err := s.write.BeginTx(ctx, nil)
	if err != nil {
		return sqliteError(err)
	}
	defer tx.Rollback()
	// The end of the time ends the transaction; that each statement watches for
	// it too would cost more than the statement.
	if err := run(context.WithoutCancel(ctx), sqliteTx{tx, s.appends}); err != nil {
		return sqliteError(err)
	}
	return sqliteError(tx.Commit())
}

func (tx sqliteTx) append(ctx context.Context, b service.Batch) error {
	moved, err := tx.StmtContext(ctx, tx.prepared[sqliteSwapHead]).ExecContext(ctx, b.Head.Size, b.Head.Root[:], b.Head.Checkpoint, b.Base.Size, b.Base.Root[:])
	if err != nil {
		return err
	}
	if n, err := moved.RowsAffected(); err != nil {
		return err
	} else if n == 0 {
		return service.ErrHeadMoved
	}
	if err := tx.each(ctx, sqliteAddEntry, func(yield func([]any) bool) {
		for i := range b.Entries {
			e := &b.Entries[i]
			if !yield([]any{
				e.Index, e.ID, e.Type, e.At, e.Author, e.Leaf[:], e.Part, e.Revision, e.Joint, e.Aspect,
				e.GeometryDigest, e.Kind, e.Verdict, e.Margin, e.Target, e.Role, e.Bytes,
			}) {
				return
			}
		}
	}); err != nil {
		return err
	}
	if err := tx.each(ctx, sqliteAddTerm, func(yield func([]any) bool) {
		for _, e := range b.Entries {
			for place, t := range e.Terms {
				if !yield([]any{e.Index, place, t.Kind, []byte(t.Value)}) {
					return
				}
			}
		}
	}); err != nil {
		return err
	}
	first := ledger.StoredHashCount(b.Base.Size)
	if err := tx.each(ctx, sqliteAddHash, func(yield func([]any) bool) {
		for i := range b.Hashes {
			if !yield([]any{first + int64(i), b.Hashes[i][:]}) {
				return
			}
		}
	}); err != nil {
		return err
	}
	if err := tx.each(ctx, sqliteAddAnswer, func(yield func([]any) bool) {
		for i := range b.Answers {
			a := &b.Answers[i]
			if !yield([]any{a.Caller, a.Method, []byte(a.Path), a.Key, a.RequestDigest[:], a.Index, string(a.State)}) {
				return
			}
		}
	}); err != nil {
		return err
	}
	if err := tx.notify(ctx, b.Notices); err != nil {
		return err
	}
	for _, k := range b.Keys {
		if err := sqliteKey(ctx, tx.Tx, k); err != nil {
			return err
		}
	}
	return tx.standing(ctx, b)
}

// each runs one of the prepared statements with every row of arguments.
func (tx sqliteTx) each(ctx context.Context, text string, rows iter.Seq[[]any]) error {
	var statement *sql.Stmt
	for row := range rows {
		if statement == nil {
			statement = tx.StmtContext(ctx, tx.prepared[text])
		}
		if _, err := statement.ExecContext(ctx, row...); err != nil {
			return err
		}
	}
	return nil
}

func sqliteKey(ctx context.Context, tx *sql.Tx, k service.KeyChange) error {
	if k.Add != nil {
		if _, err := tx.ExecContext(ctx, `INSERT INTO keys (id, caller, role, hash, added, revoked, last_used) VALUES (?, ?, ?, ?, ?, ?, ?)`,
			k.Add.ID, k.Add.Caller, k.Add.Role, k.Add.Hash[:], k.Add.Added, k.Add.Revoked, k.Add.LastUsed); err != nil {
			return err
		}
	}
	if k.Revoke == "" {
		return nil
	}
	done, err := tx.ExecContext(ctx, `UPDATE keys SET revoked = ? WHERE id = ? AND revoked = ''`, k.At, k.Revoke)
	if err != nil {
		return err
	}
	n, err := done.RowsAffected()
	if err == nil && n == 0 {
		err = defect{fmt.Sprintf("there is no standing key %s to revoke", k.Revoke)}
	}
	return err
}

// standing brings the index over the standing of records up to date.
func (tx sqliteTx) standing(ctx context.Context, b service.Batch) error {
	records := standings(b)
	if err := tx.each(ctx, sqliteReplaced, func(yield func([]any) bool) {
		for _, r := range records {
			if r.latest && !yield([]any{r.Part, r.Revision, r.Joint, r.Aspect, r.kind, b.Base.Size}) {
				return
			}
		}
	}); err != nil {
		return err
	}
	if err := tx.each(ctx, sqliteAddStanding, func(yield func([]any) bool) {
		for _, r := range records {
			if !yield([]any{r.index, r.latest}) {
				return
			}
		}
	}); err != nil {
		return err
	}
	return tx.each(ctx, sqliteJudged, func(yield func([]any) bool) {
		for _, id := range targets(b) {
			if !yield([]any{id}) {
				return
			}
		}
	})
}

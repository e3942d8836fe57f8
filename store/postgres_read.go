package store

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
)

const postgresColumns = `r.idx, r.id, r.type, r.at, r.author, r.leaf, r.part, r.revision, r.joint, r.aspect, r.geometry_digest, r.kind, r.verdict, r.margin, r.target, r.role`

// scanPostgres reads postgresColumns, and what follows them.
func scanPostgres(row pgx.CollectableRow, e *service.Entry, more ...any) error {
	var leaf []byte
	if err := row.Scan(append([]any{
		&e.Index, &e.ID, &e.Type, &e.At, &e.Author, &leaf, &e.Part, &e.Revision, &e.Joint, &e.Aspect,
		&e.GeometryDigest, &e.Kind, &e.Verdict, &e.Margin, &e.Target, &e.Role,
	}, more...)...); err != nil {
		return err
	}
	copy(e.Leaf[:], leaf)
	return nil
}

// entries reads whole entries; rest follows FROM.
func (s *Postgres) entries(ctx context.Context, rest string, args ...any) ([]service.Entry, error) {
	found, err := s.withoutTerms(ctx, rest, args...)
	if err != nil {
		return nil, err
	}
	return found, postgresError(s.addTerms(ctx, found))
}

// withoutTerms is entries for such as have no terms.
func (s *Postgres) withoutTerms(ctx context.Context, rest string, args ...any) ([]service.Entry, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	rows, err := s.pool.Query(ctx, `SELECT `+postgresColumns+`, r.bytes FROM `+rest, args...)
	if err != nil {
		return nil, postgresError(err)
	}
	found, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) (e service.Entry, err error) {
		err = scanPostgres(row, &e, &e.Bytes)
		return e, err
	})
	return found, postgresError(err)
}

// addTerms reads what records rest on.
func (s *Postgres) addTerms(ctx context.Context, entries []service.Entry) error {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	at := map[int64]*service.Entry{}
	var indexes []int64
	for i := range entries {
		at[entries[i].Index], indexes = &entries[i], append(indexes, entries[i].Index)
	}
	if len(indexes) == 0 {
		return nil
	}
	rows, err := s.pool.Query(ctx, `SELECT idx, kind, value FROM terms WHERE idx = ANY ($1) ORDER BY idx, place`, indexes)
	if err != nil {
		return err
	}
	var index int64
	var kind string
	var value []byte
	_, err = pgx.ForEachRow(rows, []any{&index, &kind, &value}, func() error {
		e := at[index]
		e.Terms = append(e.Terms, service.Term{Kind: kind, Value: string(value)})
		return nil
	})
	return err
}

// Entry implements service.Store.
func (s *Postgres) Entry(ctx context.Context, index int64) (service.Entry, error) {
	return one(s.entries(ctx, `entries r WHERE r.idx = $1`, index))
}

// EntryByID implements service.Store.
func (s *Postgres) EntryByID(ctx context.Context, id string) (service.Entry, error) {
	if !storable(id) {
		return service.Entry{}, service.ErrNotFound
	}
	return one(s.entries(ctx, `entries r WHERE r.id = $1`, id))
}

// Entries implements service.Store.
func (s *Postgres) Entries(ctx context.Context, from, to int64, yield func(service.Entry) error) error {
	for from < to {
		page, err := s.entries(ctx, `(SELECT idx, sum(length(bytes)) OVER (ORDER BY idx) - length(bytes) AS before
				FROM entries WHERE idx >= $1 AND idx < $2 ORDER BY idx LIMIT $3) p
			JOIN entries r USING (idx) WHERE p.before < $4 ORDER BY r.idx`, from, to, pageEntries, pageBytes)
		if err != nil {
			return err
		}
		if len(page) == 0 {
			return nil
		}
		for _, e := range page {
			if err := yield(e); err != nil {
				return err
			}
		}
		from = page[len(page)-1].Index + 1
	}
	return nil
}

// About implements service.Store.
func (s *Postgres) About(ctx context.Context, records []string) (map[string][]service.Entry, error) {
	about := map[string][]service.Entry{}
	var known []string
	for _, id := range records {
		if id != "" && storable(id) {
			known = append(known, id)
		}
	}
	if len(known) == 0 {
		return about, nil
	}
	found, err := s.withoutTerms(ctx, `entries r WHERE r.target = ANY ($1) AND r.target <> '' AND r.type IN ('sign-off', 'withdrawal') ORDER BY r.idx`, known)
	if err != nil {
		return nil, err
	}
	for _, e := range found {
		about[e.Target] = append(about[e.Target], e)
	}
	return about, nil
}

// CurveSet implements service.Store.
func (s *Postgres) CurveSet(ctx context.Context, name string) (service.Entry, error) {
	return one(s.entries(ctx, curveSets+` AND EXISTS (SELECT 1 FROM terms t WHERE t.idx = r.idx AND t.kind IN ('curve-set', 'curve-set-id') AND t.value = $1)
		ORDER BY r.idx DESC LIMIT 1`, []byte(name)))
}

// CurveSets implements service.Store.
func (s *Postgres) CurveSets(ctx context.Context) ([]service.Entry, error) {
	return s.entries(ctx, curveSets+` ORDER BY r.idx`)
}

// Latest implements service.Store.
func (s *Postgres) Latest(ctx context.Context, part, revision string, yield func(service.Entry) error) error {
	if !storable(part, revision) {
		return nil
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	rows, err := s.pool.Query(ctx, `SELECT `+postgresColumns+`, r.bytes FROM entries r WHERE r.idx IN (SELECT max(idx) FROM entries
		WHERE type = 'record' AND part = $1 AND revision = $2 GROUP BY joint, aspect, kind) ORDER BY r.idx`, part, revision)
	if err != nil {
		return postgresError(err)
	}
	defer rows.Close()
	for rows.Next() {
		var e service.Entry
		if err := scanPostgres(rows, &e, &e.Bytes); err != nil {
			return postgresError(err)
		}
		if err := yield(e); err != nil {
			return err
		}
	}
	return postgresError(rows.Err())
}

// Records implements service.Store.
func (s *Postgres) Records(ctx context.Context, f service.Filter, before int64, limit int) ([]service.Summary, error) {
	if !searchable(f) {
		return nil, nil
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	query, args := postgresList(f, before, limit)
	rows, err := s.pool.Query(ctx, query, args...)
	if err != nil {
		return nil, postgresError(err)
	}
	found, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) (r service.Summary, err error) {
		var latest bool
		if err = scanPostgres(row, &r.Entry, &r.State, &latest); err == nil {
			err = listed(f, &r, latest)
		}
		return r, err
	})
	return found, postgresError(err)
}

// postgresList writes the query of a list.
func postgresList(f service.Filter, before int64, limit int) (string, []any) {
	var where []string
	var args []any
	// add takes a condition with %d for the number of each argument.
	add := func(condition string, values ...any) {
		numbers := make([]any, len(values))
		for i, v := range values {
			args = append(args, v)
			numbers[i] = len(args)
		}
		where = append(where, fmt.Sprintf(condition, numbers...))
	}
	from := `entries r`
	add(`r.type = 'record'`)
	add(`r.idx < $%d`, before)
	for _, equal := range [][2]string{
		{"part", f.Part}, {"revision", f.Revision}, {"joint", f.Joint}, {"kind", f.Kind}, {"verdict", f.Verdict}, {"author", f.Author},
	} {
		if equal[1] != "" {
			add(`r.`+equal[0]+` = $%d`, equal[1])
		}
	}
	if f.Since != "" {
		add(`r.at >= $%d`, f.Since)
	}
	if f.Until != "" {
		add(`r.at < $%d`, f.Until)
	}
	for _, t := range terms(f) {
		add(`EXISTS (SELECT 1 FROM terms t WHERE t.kind = $%d AND t.value = $%d AND t.idx = r.idx)`, t.Kind, []byte(t.Value))
	}
	if f.State != "" {
		from = `standing s JOIN entries r USING (idx)`
		add(`s.state = $%d`, string(f.State))
	}
	switch {
	case f.Latest && f.Part != "":
		// Walking the part would pass all records that are not the latest.
		revision := ``
		values := []any{f.Part}
		if f.Revision != "" {
			revision, values = ` AND revision = $%d`, append(values, f.Revision)
		}
		add(`r.idx IN (SELECT max(idx) FROM entries WHERE type = 'record' AND part = $%d`+revision+` GROUP BY part, revision, joint, aspect, kind)`, values...)
	case f.Latest:
		from = `standing s JOIN entries r USING (idx)`
		add(`s.latest`)
	}
	args = append(args, limit)
	return `SELECT ` + postgresColumns + `, ` + derivedState + `, ` + isLatest(f) + ` FROM ` + from + ` WHERE ` + strings.Join(where, ` AND `) +
		fmt.Sprintf(` ORDER BY r.idx DESC LIMIT $%d`, len(args)), args
}

const postgresKeyColumns = `SELECT id, caller, role, hash, added, revoked, last_used FROM keys`

func scanPostgresKey(row pgx.CollectableRow) (k service.Key, err error) {
	var hash []byte
	err = row.Scan(&k.ID, &k.Caller, &k.Role, &hash, &k.Added, &k.Revoked, &k.LastUsed)
	copy(k.Hash[:], hash)
	return k, err
}

// Key implements service.Store.
func (s *Postgres) Key(ctx context.Context, hash [32]byte) (service.Key, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	rows, err := s.pool.Query(ctx, postgresKeyColumns+` WHERE hash = $1`, hash[:])
	if err != nil {
		return service.Key{}, postgresError(err)
	}
	k, err := pgx.CollectExactlyOneRow(rows, scanPostgresKey)
	return k, postgresError(err)
}

// Keys implements service.Store.
func (s *Postgres) Keys(ctx context.Context) ([]service.Key, error) {
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	rows, err := s.pool.Query(ctx, postgresKeyColumns+` ORDER BY seq`)
	if err != nil {
		return nil, postgresError(err)
	}
	found, err := pgx.CollectRows(rows, scanPostgresKey)
	return found, postgresError(err)
}

// Touch implements service.Store.
func (s *Postgres) Touch(ctx context.Context, id, at string) error {
	if !storable(id, at) {
		return errors.New("a key's id or a time that is not text")
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	_, err := s.pool.Exec(ctx, `UPDATE keys SET last_used = $1 WHERE id = $2 AND last_used < $1`, at, id)
	return postgresError(err)
}

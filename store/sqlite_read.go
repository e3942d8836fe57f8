package store

import (
	"context"
	"database/sql"
	"errors"
	"math"
	"strings"

	"jointledger/service"
)

// sqliteColumns are those of an entry r that stand before its bytes.
const sqliteColumns = `r.idx, r.id, r.type, r.at, r.author, r.leaf, r.part, r.revision, r.joint, r.aspect, r.geometry_digest, r.kind, r.verdict, r.margin, r.target, r.role`

// scanSQLite reads sqliteColumns, and what follows them.
func scanSQLite(scan func(...any) error, e *service.Entry, more ...any) error {
	var leaf sql.RawBytes
	if err := scan(append([]any{
		&e.Index, &e.ID, &e.Type, &e.At, &e.Author, &leaf, &e.Part, &e.Revision, &e.Joint, &e.Aspect,
		&e.GeometryDigest, &e.Kind, &e.Verdict, &e.Margin, &e.Target, &e.Role,
	}, more...)...); err != nil {
		return err
	}
	copy(e.Leaf[:], leaf)
	return nil
}

// entries reads whole entries until they have most bytes; rest follows FROM.
func (s *SQLite) entries(ctx context.Context, most int, rest string, args ...any) ([]service.Entry, error) {
	found, err := s.withoutTerms(ctx, most, rest, args...)
	if err != nil {
		return nil, err
	}
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	return found, s.addTerms(ctx, found)
}

// withoutTerms is entries for such as have no terms.
func (s *SQLite) withoutTerms(ctx context.Context, most int, rest string, args ...any) ([]service.Entry, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	rows, err := s.read.QueryContext(ctx, `SELECT `+sqliteColumns+`, r.bytes FROM `+rest, args...)
	if err != nil {
		return nil, sqliteError(err)
	}
	var found []service.Entry
	size := 0
	if err := each(rows, func() error {
		if size >= most {
			return errEnough
		}
		var e service.Entry
		if err := scanSQLite(rows.Scan, &e, &e.Bytes); err != nil {
			return err
		}
		found, size = append(found, e), size+len(e.Bytes)
		return nil
	}); err != nil {
		return nil, err
	}
	return found, nil
}

// addTerms reads what records rest on.
func (s *SQLite) addTerms(ctx context.Context, entries []service.Entry) error {
	query, err := s.read.PrepareContext(ctx, `SELECT kind, value FROM terms WHERE idx = ? ORDER BY place`)
	if err != nil {
		return sqliteError(err)
	}
	defer query.Close()
	for i := range entries {
		e := &entries[i]
		rows, err := query.QueryContext(ctx, e.Index)
		if err != nil {
			return sqliteError(err)
		}
		if err := each(rows, func() error {
			var t service.Term
			var value []byte
			if err := rows.Scan(&t.Kind, &value); err != nil {
				return err
			}
			t.Value = string(value)
			e.Terms = append(e.Terms, t)
			return nil
		}); err != nil {
			return err
		}
	}
	return nil
}

func one(found []service.Entry, err error) (service.Entry, error) {
	switch {
	case err != nil:
		return service.Entry{}, err
	case len(found) == 0:
		return service.Entry{}, service.ErrNotFound
	}
	return found[0], nil
}

// Entry implements service.Store.
func (s *SQLite) Entry(ctx context.Context, index int64) (service.Entry, error) {
	return one(s.entries(ctx, math.MaxInt, `entries r WHERE r.idx = ?`, index))
}

// EntryByID implements service.Store.
func (s *SQLite) EntryByID(ctx context.Context, id string) (service.Entry, error) {
	if !storable(id) {
		return service.Entry{}, service.ErrNotFound
	}
	return one(s.entries(ctx, math.MaxInt, `entries r WHERE r.id = ?`, id))
}

// Entries implements service.Store.
func (s *SQLite) Entries(ctx context.Context, from, to int64, yield func(service.Entry) error) error {
	for from < to {
		page, err := s.entries(ctx, pageBytes, `entries r WHERE r.idx >= ? AND r.idx < ? ORDER BY r.idx LIMIT ?`, from, to, pageEntries)
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
func (s *SQLite) About(ctx context.Context, records []string) (map[string][]service.Entry, error) {
	about := map[string][]service.Entry{}
	for _, id := range records {
		if _, done := about[id]; done || id == "" || !storable(id) {
			continue
		}
		found, err := s.withoutTerms(ctx, math.MaxInt, `entries r WHERE r.target = ? AND r.target <> '' AND r.type IN ('sign-off', 'withdrawal') ORDER BY r.idx`, id)
		if err != nil {
			return nil, err
		}
		if len(found) > 0 {
			about[id] = found
		}
	}
	return about, nil
}

// curveSets finds entries of curve sets: few, however long the log is.
const curveSets = `entries r WHERE r.type = 'curve-set'`

// CurveSet implements service.Store.
func (s *SQLite) CurveSet(ctx context.Context, name string) (service.Entry, error) {
	return one(s.entries(ctx, math.MaxInt, curveSets+` AND EXISTS (SELECT 1 FROM terms WHERE idx = r.idx AND kind IN ('curve-set', 'curve-set-id') AND value = ?)
		ORDER BY r.idx DESC LIMIT 1`, []byte(name)))
}

// CurveSets implements service.Store.
func (s *SQLite) CurveSets(ctx context.Context) ([]service.Entry, error) {
	return s.entries(ctx, math.MaxInt, curveSets+` ORDER BY r.idx`)
}

// Latest implements service.Store.
func (s *SQLite) Latest(ctx context.Context, part, revision string, yield func(service.Entry) error) error {
	if !storable(part, revision) {
		return nil
	}
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	rows, err := s.read.QueryContext(ctx, `SELECT `+sqliteColumns+`, r.bytes FROM entries r WHERE r.idx IN (SELECT max(idx) FROM entries INDEXED BY entries_subject
		WHERE type = 'record' AND part = ? AND revision = ? GROUP BY joint, aspect, kind) ORDER BY r.idx`, part, revision)
	if err != nil {
		return sqliteError(err)
	}
	return each(rows, func() error {
		var e service.Entry
		if err := scanSQLite(rows.Scan, &e, &e.Bytes); err != nil {
			return err
		}
		return yield(e)
	})
}

// Records implements service.Store.
func (s *SQLite) Records(ctx context.Context, f service.Filter, before int64, limit int) ([]service.Summary, error) {
	if !searchable(f) {
		return nil, nil
	}
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	query, args := sqliteList(f, before, limit)
	rows, err := s.read.QueryContext(ctx, query, args...)
	if err != nil {
		return nil, sqliteError(err)
	}
	var found []service.Summary
	err = each(rows, func() error {
		var r service.Summary
		var latest bool
		if err := scanSQLite(rows.Scan, &r.Entry, &r.State, &latest); err != nil {
			return err
		}
		found = append(found, r)
		return listed(f, &r, latest)
	})
	return found, err
}

// sqliteList writes the query of a list. SQLite keeps no statistics by itself,
// so the index that leads is named: that of the narrowest condition as a rule,
// walked from the newest down, with all others looked at on the way.
func sqliteList(f service.Filter, before int64, limit int) (string, []any) {
	var where []string
	var args []any
	add := func(condition string, values ...any) {
		where, args = append(where, condition), append(args, values...)
	}
	const standing = `standing s CROSS JOIN entries r ON r.idx = s.idx`
	asked := terms(f)
	from, order := `entries r NOT INDEXED`, `r.idx`
	switch {
	case f.Part != "" && f.Revision != "" && f.Joint != "":
		from = `entries r INDEXED BY entries_subject`
	case f.Part != "":
		from = `entries r INDEXED BY entries_part`
	case f.Joint != "":
		from = `entries r INDEXED BY entries_joint`
	case f.Author != "":
		from = `entries r INDEXED BY entries_author`
	case len(asked) > 0:
		from, order = `terms t CROSS JOIN entries r ON r.idx = t.idx`, `t.idx`
		add(`t.kind = ? AND t.value = ?`, asked[0].Kind, []byte(asked[0].Value))
		add(`t.place = (SELECT min(place) FROM terms WHERE idx = t.idx AND kind = t.kind AND value = t.value)`)
		asked = asked[1:]
	case f.State != "":
		from, order = standing, `s.idx`
		add(`s.state = ?`, string(f.State))
	case f.Latest:
		from, order = standing, `s.idx`
	case f.Verdict != "":
		from = `entries r INDEXED BY entries_verdict`
	case f.Kind != "":
		from = `entries r INDEXED BY entries_kind`
	case f.Since != "" && f.Until != "":
		from = `entries r INDEXED BY entries_at`
	}
	add(`r.type = 'record'`)
	add(order+` < ?`, before)
	for _, equal := range [][2]string{
		{"part", f.Part}, {"revision", f.Revision}, {"joint", f.Joint}, {"kind", f.Kind}, {"verdict", f.Verdict}, {"author", f.Author},
	} {
		if equal[1] != "" {
			add(`r.`+equal[0]+` = ?`, equal[1])
		}
	}
	if f.Since != "" {
		add(`r.at >= ?`, f.Since)
	}
	if f.Until != "" {
		add(`r.at < ?`, f.Until)
	}
	for _, t := range asked {
		add(`EXISTS (SELECT 1 FROM terms WHERE kind = ? AND value = ? AND idx = r.idx)`, t.Kind, []byte(t.Value))
	}
	if f.State != "" && order != `s.idx` {
		add(`EXISTS (SELECT 1 FROM standing WHERE state = ? AND idx = r.idx)`, string(f.State))
	}
	switch {
	case f.Latest && f.Part != "":
		// Walking the part would pass all records that are not the latest.
		from = `entries r NOT INDEXED`
		revision := ``
		values := []any{f.Part}
		if f.Revision != "" {
			revision, values = ` AND revision = ?`, append(values, f.Revision)
		}
		add(`r.idx IN (SELECT max(idx) FROM entries INDEXED BY entries_subject WHERE type = 'record' AND part = ?`+revision+` GROUP BY part, revision, joint, aspect, kind)`, values...)
	case f.Latest && order != `s.idx`:
		add(`EXISTS (SELECT 1 FROM standing WHERE latest = 1 AND idx = r.idx)`)
	case f.Latest:
		add(`s.latest = 1`)
	}
	return `SELECT ` + sqliteColumns + `, ` + derivedState + `, ` + isLatest(f) + ` FROM ` + from + ` WHERE ` + strings.Join(where, ` AND `) +
		` ORDER BY ` + order + ` DESC LIMIT ?`, append(args, limit)
}

const sqliteKeyColumns = `SELECT id, caller, role, hash, added, revoked, last_used FROM keys`

func scanSQLiteKey(scan func(...any) error) (k service.Key, err error) {
	var hash []byte
	err = scan(&k.ID, &k.Caller, &k.Role, &hash, &k.Added, &k.Revoked, &k.LastUsed)
	copy(k.Hash[:], hash)
	return k, err
}

// Key implements service.Store.
func (s *SQLite) Key(ctx context.Context, hash [32]byte) (service.Key, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	k, err := scanSQLiteKey(s.read.QueryRowContext(ctx, sqliteKeyColumns+` WHERE hash = ?`, hash[:]).Scan)
	if err != nil {
		return service.Key{}, sqliteError(err)
	}
	return k, nil
}

// Keys implements service.Store.
func (s *SQLite) Keys(ctx context.Context) ([]service.Key, error) {
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	rows, err := s.read.QueryContext(ctx, sqliteKeyColumns+` ORDER BY seq`)
	if err != nil {
		return nil, sqliteError(err)
	}
	var found []service.Key
	err = each(rows, func() error {
		k, err := scanSQLiteKey(rows.Scan)
		found = append(found, k)
		return err
	})
	return found, err
}

// Touch implements service.Store.
func (s *SQLite) Touch(ctx context.Context, id, at string) error {
	if !storable(id, at) {
		return errors.New("a key's id or a time that is not text")
	}
	ctx, cancel := context.WithTimeout(ctx, sqliteTimeout)
	defer cancel()
	_, err := s.write.ExecContext(ctx, `UPDATE keys SET last_used = ? WHERE id = ? AND last_used < ?`, at, id, at)
	return sqliteError(err)
}

package store

import (
	"context"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
	"jointledger/service/ledger"
)

// Append implements service.Store. The swap of the head comes first: its row is
// locked from then on, so that others who append wait here and then find that
// the head has moved, before they have written anything.
func (s *Postgres) Append(ctx context.Context, b service.Batch) error {
	if err := check(b); err != nil {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	return postgresError(pgx.BeginFunc(ctx, s.pool, func(tx pgx.Tx) error {
		moved, err := tx.Exec(ctx, `UPDATE head SET size = $1, root = $2, checkpoint = $3 WHERE size = $4 AND root = $5`,
			b.Head.Size, b.Head.Root[:], b.Head.Checkpoint, b.Base.Size, b.Base.Root[:])
		if err != nil {
			return err
		}
		if moved.RowsAffected() == 0 {
			return service.ErrHeadMoved
		}
		return tx.SendBatch(ctx, postgresBatch(b)).Close()
	}))
}

// postgresBatch is everything that follows the swap of the head, in one round
// trip: one statement a table.
func postgresBatch(b service.Batch) *pgx.Batch {
	batch := &pgx.Batch{}
	queueEntries(batch, b.Entries)
	queueTerms(batch, b.Entries)
	queueHashes(batch, b)
	queueAnswers(batch, b.Answers)
	for _, k := range b.Keys {
		queueKey(batch, k)
	}
	queueStanding(batch, b)
	return batch
}

func queueEntries(batch *pgx.Batch, entries []service.Entry) {
	indexes, margins := make([]int64, len(entries)), make([]*float64, len(entries))
	leaves, bytes := make([][]byte, len(entries)), make([][]byte, len(entries))
	var texts [13][]string
	for i := range texts {
		texts[i] = make([]string, len(entries))
	}
	for i := range entries {
		e := &entries[i]
		indexes[i], leaves[i], margins[i], bytes[i] = e.Index, e.Leaf[:], e.Margin, e.Bytes
		for k, text := range [13]string{
			e.ID, e.Type, e.At, e.Author, e.Part, e.Revision, e.Joint, e.Aspect, e.GeometryDigest, e.Kind, e.Verdict, e.Target, e.Role,
		} {
			texts[k][i] = text
		}
	}
	batch.Queue(`INSERT INTO entries (idx, leaf, margin, bytes, id, type, at, author, part, revision, joint, aspect, geometry_digest, kind, verdict, target, role)
		SELECT * FROM unnest($1::bigint[], $2::bytea[], $3::float8[], $4::bytea[], $5::text[], $6::text[], $7::text[], $8::text[], $9::text[],
			$10::text[], $11::text[], $12::text[], $13::text[], $14::text[], $15::text[], $16::text[], $17::text[])`,
		indexes, leaves, margins, bytes, texts[0], texts[1], texts[2], texts[3], texts[4],
		texts[5], texts[6], texts[7], texts[8], texts[9], texts[10], texts[11], texts[12])
}

func queueTerms(batch *pgx.Batch, entries []service.Entry) {
	var indexes []int64
	var places []int32
	var kinds []string
	var values [][]byte
	for _, e := range entries {
		for place, t := range e.Terms {
			indexes, places = append(indexes, e.Index), append(places, int32(place))
			kinds, values = append(kinds, t.Kind), append(values, []byte(t.Value))
		}
	}
	if len(indexes) > 0 {
		batch.Queue(`INSERT INTO terms (idx, place, kind, value) SELECT * FROM unnest($1::bigint[], $2::int[], $3::text[], $4::bytea[])`, indexes, places, kinds, values)
	}
}

func queueHashes(batch *pgx.Batch, b service.Batch) {
	first := ledger.StoredHashCount(b.Base.Size)
	hashes := make([][]byte, len(b.Hashes))
	for i := range b.Hashes {
		hashes[i] = b.Hashes[i][:]
	}
	batch.Queue(`INSERT INTO tree_hashes (idx, hash) SELECT $1 + place - 1, hash FROM unnest($2::bytea[]) WITH ORDINALITY a (hash, place)`, first, hashes)
}

func queueAnswers(batch *pgx.Batch, answers []service.Answer) {
	if len(answers) == 0 {
		return
	}
	var callers, methods, keys, states []string
	var paths, digests [][]byte
	var indexes []int64
	for i := range answers {
		a := &answers[i]
		callers, methods, keys, states = append(callers, a.Caller), append(methods, a.Method), append(keys, a.Key), append(states, string(a.State))
		paths, digests, indexes = append(paths, []byte(a.Path)), append(digests, a.RequestDigest[:]), append(indexes, a.Index)
	}
	batch.Queue(`INSERT INTO idempotency (caller, method, path, key, request_digest, idx, state)
		SELECT * FROM unnest($1::text[], $2::text[], $3::bytea[], $4::text[], $5::bytea[], $6::bigint[], $7::text[])`,
		callers, methods, paths, keys, digests, indexes, states)
}

func queueKey(batch *pgx.Batch, k service.KeyChange) {
	if k.Add != nil {
		batch.Queue(`INSERT INTO keys (id, caller, role, hash, added, revoked, last_used) VALUES ($1, $2, $3, $4, $5, $6, $7)`,
			k.Add.ID, k.Add.Caller, k.Add.Role, k.Add.Hash[:], k.Add.Added, k.Add.Revoked, k.Add.LastUsed)
	}
	if k.Revoke == "" {
		return
	}
	batch.Queue(`UPDATE keys SET revoked = $1 WHERE id = $2 AND revoked = '' RETURNING id`, k.At, k.Revoke).Query(func(rows pgx.Rows) error {
		found, err := pgx.CollectRows(rows, pgx.RowTo[string])
		if err == nil && len(found) == 0 {
			err = errRevoke(k)
		}
		return err
	})
}

// queueStanding brings the index over the standing of records up to date.
func queueStanding(batch *pgx.Batch, b service.Batch) {
	if hasRecords(b) {
		batch.Queue(`UPDATE standing SET latest = false WHERE latest AND idx IN
			(SELECT (SELECT max(n.idx) FROM entries n WHERE `+sameSubject+` AND n.idx < $1) FROM entries r WHERE r.type = 'record' AND r.idx >= $1)`, b.Base.Size)
		batch.Queue(`INSERT INTO standing (idx, state, latest) SELECT r.idx, `+derivedState+`, NOT EXISTS (SELECT 1 FROM entries n WHERE `+sameSubject+` AND n.idx > r.idx)
			FROM entries r WHERE r.type = 'record' AND r.idx >= $1`, b.Base.Size)
	}
	if hasAbout(b) {
		batch.Queue(`UPDATE standing SET state = `+derivedState+` FROM entries r WHERE r.idx = standing.idx AND r.id IN
			(SELECT a.target FROM entries a WHERE a.target <> '' AND a.idx >= $1)`, b.Base.Size)
	}
}

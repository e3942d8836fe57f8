package store

import (
	"context"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
	"jointledger/service/ledger"
)

// Append implements service.Store. The batch goes out in one piece, which makes
// it one transaction and one round trip. The swap of the head comes first: its
// row is locked from then on, so that others who append wait here, find that
// the head has moved, and write nothing.
func (s *Postgres) Append(ctx context.Context, b service.Batch) error {
	if err := check(b); err != nil {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, postgresTimeout)
	defer cancel()
	batch := &pgx.Batch{}
	// For this transaction: each statement has one good plan, which is made once
	// and not for every batch. It may be made while the tables are empty, when a
	// sort of all rows seems no dearer than the index that has them in order.
	batch.Queue(`SELECT set_config('plan_cache_mode', 'force_generic_plan', true), set_config('enable_sort', 'off', true)`)
	batch.Queue(`SELECT swap_head($1, $2, $3, $4, $5)`, b.Base.Size, b.Base.Root[:], b.Head.Size, b.Head.Root[:], b.Head.Checkpoint)
	queueEntries(batch, b.Entries)
	queueTerms(batch, b.Entries)
	queueHashes(batch, b)
	queueAnswers(batch, b.Answers)
	for _, k := range b.Keys {
		queueKey(batch, k)
	}
	queueStanding(batch, b)
	queueNotices(batch, b.Notices)
	return postgresError(s.pool.SendBatch(ctx, batch).Close())
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
	if k.Revoke != "" {
		batch.Queue(`SELECT revoke_key($1, $2)`, k.Revoke, k.At)
	}
}

// queueStanding brings the index over the standing of records up to date.
func queueStanding(batch *pgx.Batch, b service.Batch) {
	var indexes []int64
	var latest []bool
	var of [5][]string // of the records that are the latest from now on
	for _, r := range standings(b) {
		indexes, latest = append(indexes, r.index), append(latest, r.latest)
		if r.latest {
			for i, text := range [5]string{r.Part, r.Revision, r.Joint, r.Aspect, r.kind} {
				of[i] = append(of[i], text)
			}
		}
	}
	if len(indexes) > 0 {
		// The latest before the batch stands next below it in the index over
		// subjects. It is looked for there by the whole of that index's key: by
		// equal columns and the greatest idx, the planner may instead read the
		// log backwards until it meets the subject.
		batch.Queue(`UPDATE standing SET latest = false WHERE idx = ANY (ARRAY(
			SELECT b.idx FROM unnest($2::text[], $3::text[], $4::text[], $5::text[], $6::text[]) r (part, revision, joint, aspect, kind), LATERAL (
				SELECT part, revision, joint, aspect, kind, idx FROM entries
				WHERE type = 'record' AND (part, revision, joint, aspect, kind, idx) < (r.part, r.revision, r.joint, r.aspect, r.kind, $1)
				ORDER BY part DESC, revision DESC, joint DESC, aspect DESC, kind DESC, idx DESC LIMIT 1
			) b WHERE (b.part, b.revision, b.joint, b.aspect, b.kind) = (r.part, r.revision, r.joint, r.aspect, r.kind)))`,
			b.Base.Size, of[0], of[1], of[2], of[3], of[4])
		batch.Queue(`INSERT INTO standing (idx, state, latest) SELECT idx, 'recorded', latest FROM unnest($1::bigint[], $2::boolean[]) r (idx, latest)`, indexes, latest)
	}
	if ids := targets(b); len(ids) > 0 {
		batch.Queue(`UPDATE standing SET state = `+derivedState+` FROM entries r WHERE r.id = ANY ($1) AND standing.idx = r.idx`, ids)
	}
}

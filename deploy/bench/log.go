package main

import (
	"context"
	"crypto/rand"
	"fmt"
	"path/filepath"
	"strconv"
	"time"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store"
	"jointledger/store/storetest"
)

// sealedEntries measures what the stores take of records that are calculated
// and sealed beforehand, with their index columns, tree hashes, signed head and
// idempotency keys. A batch has as many as callers wait.
func sealedEntries(ctx context.Context, b *bench) error {
	cluster, err := storetest.NewCluster()
	if err != nil {
		return err
	}
	defer func() { _ = cluster.Remove() }()
	base, err := newPgbench(ctx, b, cluster)
	if err != nil {
		return err
	}
	raw, err := newRawSQLite(ctx, b)
	if err != nil {
		return err
	}
	defer raw.close()
	b.report.table("engine", "entry", "a batch", "entries/s", "single-row commits/s", "ratio", "spread", "")
	for _, engine := range []struct {
		name string
		open func() (service.Store, error)
		base func(clients int) (float64, error)
	}{
		{"Postgres", func() (service.Store, error) { return store.OpenPostgres(ctx, cluster.URL()) }, base.commits},
		{"SQLite", func() (service.Store, error) {
			return store.OpenSQLite(ctx, filepath.Join(b.dir, "sealed.sqlite"))
		}, func(int) (float64, error) { return raw.commits(ctx, b.each) }},
	} {
		s, err := engine.open()
		if err != nil {
			return err
		}
		for _, size := range []struct {
			name string
			view service.View
		}{{"without workings", service.View{NoWorkings: true, Checks: "governing"}}, {"whole", service.View{}}} {
			for _, records := range []int{1, 8, 32} {
				var rates, bases, ratios []float64
				bytes := 0
				for range min(b.rounds, 3) { // making the batches takes long
					rate, length, err := appended(ctx, b, s, size.view, records)
					if err != nil {
						return err
					}
					commits, err := engine.base(records)
					if err != nil {
						return err
					}
					bytes = length
					rates, bases, ratios = append(rates, rate), append(bases, commits), append(ratios, rate/commits)
				}
				says := ""
				if records == 32 {
					says = reach(median(ratios) >= 1, "≥ 1")
				}
				b.report.row(engine.name, fmt.Sprintf("%s, %d bytes", size.name, bytes), records, median(rates), median(bases), median(ratios), spread(ratios), says)
			}
		}
		if err := s.Close(); err != nil {
			return err
		}
	}
	b.report.text("One batch after another by one connection; the time of making the batches is not counted. pgbench runs as many clients as a batch has entries, each commit of 64 bytes.")
	return nil
}

// appended appends batches and returns entries a second and the length of one.
func appended(ctx context.Context, b *bench, s service.Store, view service.View, records int) (rate float64, length int, _ error) {
	text, err := ledger.GenerateKey(rand.Reader, "bench.example/jointledger")
	if err != nil {
		return 0, 0, err
	}
	signer, err := ledger.NewSigner(text)
	if err != nil {
		return 0, 0, err
	}
	f, err := newFiller(signer, view)
	if err != nil {
		return 0, 0, err
	}
	head, err := s.Head(ctx)
	if err != nil {
		return 0, 0, err
	}
	var spent time.Duration
	for spent < b.each {
		batch, err := f.batch(ctx, s, head, records)
		if err != nil {
			return 0, 0, err
		}
		for _, e := range batch.Entries {
			length = len(e.Bytes)
			batch.Answers = append(batch.Answers, service.Answer{
				IdempotencyKey: service.IdempotencyKey{Caller: "bench", Method: "POST", Path: "/v1/records", Key: strconv.FormatInt(e.Index, 10)},
				RequestDigest:  e.Leaf, Index: e.Index,
			})
		}
		start := time.Now()
		if err := s.Append(ctx, batch); err != nil {
			return 0, 0, err
		}
		spent += time.Since(start)
		head = batch.Head
	}
	return float64(f.made) / spent.Seconds(), length, nil
}

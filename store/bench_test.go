package store_test

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"sync"
	"testing"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store"
	"jointledger/store/storetest"
)

// eachEngine runs a benchmark on a store of each engine.
func eachEngine(b *testing.B, bench func(b *testing.B, s service.Store)) {
	b.Run("SQLite", func(b *testing.B) { bench(b, storetest.SQLite(b)) })
	b.Run("Postgres", func(b *testing.B) { bench(b, storetest.Postgres(b)) })
}

// sized is a record with a body of a usual size, of one of 100 parts with 25
// joints each.
func sized(tb testing.TB, n int, body []byte) service.Entry {
	tb.Helper()
	margin := float64(n%7) / 10
	e := service.Entry{
		ID: uuid(1, n), Type: "record", At: fmt.Sprintf("2026-%02d-%02dT10:00:00.000Z", 1+n/100_000%12, 1+n/4000%28), Author: "m.reed",
		Columns: service.Columns{
			Subject:        service.Subject{Part: fmt.Sprintf("SM-%d", n%100), Revision: "A", Joint: fmt.Sprintf("J%d", n/100%25)},
			GeometryDigest: "sha256:00", Kind: "lug", Verdict: "adequate", Margin: &margin,
			Terms: []service.Term{{Kind: "method", Value: "elementary@1"}, {Kind: "material", Value: "invented plate"}},
		},
	}
	var err error
	if e.Bytes, e.Leaf, err = ledger.Seal(ledger.Envelope{Type: e.Type, ID: e.ID, At: e.At, Author: e.Author, Body: body}); err != nil {
		tb.Fatal(err)
	}
	return e
}

func bodyOf(size int) []byte {
	return append(append([]byte(`{"a":"`), bytes.Repeat([]byte("0123456789 net-section "), size/23)...), `"}`...)
}

// BenchmarkAppend appends batches as a group commit does. Beside each stands
// the baseline of the same disk at the same time: one fsync.
func BenchmarkAppend(b *testing.B) {
	b.Run("fsync", func(b *testing.B) {
		file, err := os.Create(filepath.Join(b.TempDir(), "file"))
		if err != nil {
			b.Fatal(err)
		}
		defer file.Close()
		page := make([]byte, 4096)
		for b.Loop() {
			if _, err := file.Write(page); err != nil {
				b.Fatal(err)
			}
			if err := file.Sync(); err != nil {
				b.Fatal(err)
			}
		}
	})
	body := bodyOf(6000)
	for _, size := range []int{1, 32, 256} {
		b.Run(strconv.Itoa(size), func(b *testing.B) {
			eachEngine(b, func(b *testing.B, s service.Store) {
				edge := map[int64]ledger.Hash{}
				head := headOf(b, s)
				n := 0
				for b.Loop() {
					b.StopTimer()
					batch := service.Batch{Base: head}
					var leaves []ledger.Hash
					for i := range size {
						e := sized(b, n, body)
						e.Index = int64(n)
						n++
						batch.Entries, leaves = append(batch.Entries, e), append(leaves, e.Leaf)
						batch.Answers = append(batch.Answers, answer("/v1/records", strconv.Itoa(n), head.Size+int64(i)))
					}
					read := func(indexes []int64) ([]ledger.Hash, error) {
						found := make([]ledger.Hash, len(indexes))
						for i, index := range indexes {
							found[i] = edge[index]
						}
						return found, nil
					}
					var err error
					if batch.Hashes, edge, batch.Head.Root, err = ledger.Grow(ledger.Tree{Size: head.Size, Root: head.Root}, leaves, read); err != nil {
						b.Fatal(err)
					}
					batch.Head.Size = head.Size + int64(size)
					head = batch.Head
					b.StartTimer()
					if err := s.Append(b.Context(), batch); err != nil {
						b.Fatal(err)
					}
				}
				b.ReportMetric(float64(b.N*size)/b.Elapsed().Seconds(), "entries/s")
			})
		})
	}
}

// rows is how many records the lists are searched in; JOINTLEDGER_BENCH_ROWS
// sets another.
func rows(b *testing.B) int {
	text := os.Getenv("JOINTLEDGER_BENCH_ROWS")
	if text == "" {
		return 100_000
	}
	n, err := strconv.Atoi(text)
	if err != nil {
		b.Fatal(err)
	}
	return n
}

// fill appends n records; every 50th is checked and every 1000th withdrawn.
func fill(b *testing.B, s service.Store, n int) {
	body := bodyOf(500)
	for i := 0; i < n; {
		var entries []service.Entry
		for range min(1000, n-i) {
			entries = append(entries, sized(b, i, body))
			i++
		}
		put(b, s, entries...)
		var about []service.Entry
		for k := i - len(entries); k < i; k += 50 {
			about = append(about, signOff(b, 2, k, uuid(1, k), "checked"))
			if k%1000 == 0 {
				about = append(about, withdrawal(b, 3, k, uuid(1, k)))
			}
		}
		put(b, s, about...)
	}
}

func BenchmarkRecords(b *testing.B) {
	n := rows(b)
	for _, engine := range []struct {
		name string
		open func() service.Store
	}{
		{"SQLite", func() service.Store {
			s := storetest.SQLite(b)
			fill(b, s, n)
			return s
		}},
		{"Postgres", func() service.Store {
			url := storetest.Database(b)
			s, err := store.OpenPostgres(b.Context(), url)
			if err != nil {
				b.Fatal(err)
			}
			b.Cleanup(func() { s.Close() })
			fill(b, s, n)
			// What the server does by itself within a minute.
			db, err := pgx.Connect(b.Context(), url)
			if err != nil {
				b.Fatal(err)
			}
			defer db.Close(b.Context())
			if _, err := db.Exec(b.Context(), `ANALYZE`); err != nil {
				b.Fatal(err)
			}
			return s
		}},
	} {
		open := sync.OnceValue(engine.open)
		b.Run(engine.name, func(b *testing.B) {
			s := open()
			for _, c := range []struct {
				name   string
				filter service.Filter
				before int64
				want   int
			}{
				{"all", service.Filter{}, math.MaxInt64, 50},
				{"part", service.Filter{Part: "SM-42"}, math.MaxInt64, 50},
				{"part, deep", service.Filter{Part: "SM-42"}, int64(n / 2), 50},
				{"part and joint", service.Filter{Part: "SM-42", Joint: "J7"}, math.MaxInt64, min(50, n/2500)},
				{"part, inadequate", service.Filter{Part: "SM-42", Verdict: "inadequate"}, math.MaxInt64, 0},
				{"part, latest", service.Filter{Part: "SM-42", Latest: true}, math.MaxInt64, 25},
				{"latest", service.Filter{Latest: true}, math.MaxInt64, 50},
				{"checked", service.Filter{State: service.Checked}, math.MaxInt64, 50},
				{"withdrawn", service.Filter{State: service.Withdrawn}, math.MaxInt64, min(50, n/1000)},
				{"inadequate", service.Filter{Verdict: "inadequate"}, math.MaxInt64, 0},
				{"material", service.Filter{Material: "invented plate"}, math.MaxInt64, 50},
				{"no such material", service.Filter{Material: "invented bar"}, math.MaxInt64, 0},
				{"a day", service.Filter{Since: "2026-01-05T00:00:00.000Z", Until: "2026-01-06T00:00:00.000Z"}, math.MaxInt64, 50},
			} {
				b.Run(c.name, func(b *testing.B) {
					for b.Loop() {
						found, err := s.Records(b.Context(), c.filter, c.before, 50)
						if err != nil || len(found) != c.want {
							b.Fatalf("%d found, want %d, %v", len(found), c.want, err)
						}
					}
				})
			}
			b.Run("release", func(b *testing.B) {
				for b.Loop() {
					if found, err := latestOf(b, s, "SM-42", "A"); err != nil || len(found) != 25 {
						b.Fatalf("%d found, %v", len(found), err)
					}
				}
			})
			b.Run("proof", func(b *testing.B) {
				size := headOf(b, s).Size
				for b.Loop() {
					if _, err := ledger.ProveInclusion(size, size/3, func(indexes []int64) ([]ledger.Hash, error) { return s.Hashes(b.Context(), indexes) }); err != nil {
						b.Fatal(err)
					}
				}
			})
		})
	}
}

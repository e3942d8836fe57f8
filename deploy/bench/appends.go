package main

import (
	"context"
	"database/sql"
	"fmt"
	"net/http"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"sync"
	"sync/atomic"
	"time"

	_ "modernc.org/sqlite" // the driver of the raw commits

	"jointledger/store/storetest"
)

// appends compares records a second, each a calculation, with what the engine
// itself commits: pgbench inserting single rows, and single rows into SQLite by
// its driver, both with the same durability.
func appends(ctx context.Context, b *bench) error {
	b.report.table("engine", "clients", "records/s", "single-row commits/s", "ratio", "spread", "µs of the server's processor a record", "")
	if err := b.appendsPostgres(ctx); err != nil {
		return err
	}
	if err := b.appendsSQLite(ctx); err != nil {
		return err
	}
	b.report.text("A record is calculated, brought into canonical form, hashed, stored with its index columns (some 20 kB) and answered whole; the generator's and Postgres's own processor time come on top of the server's.")
	return nil
}

// comparison is one line of the table.
type comparison struct {
	engine, want string
	clients      int
	reached      func(ratio float64) bool
	server       *process
	ours, base   func() (float64, error)
}

func (b *bench) compare(c comparison) error {
	var ours, base, ratios, costs []float64
	for range b.rounds {
		used, records := c.server.processor(), recordNumber.Load()
		x, err := c.ours()
		if err != nil {
			return err
		}
		costs = append(costs, (c.server.processor()-used)/float64(recordNumber.Load()-records)*1e6)
		y, err := c.base()
		if err != nil {
			return err
		}
		ours, base, ratios = append(ours, x), append(base, y), append(ratios, x/y)
	}
	says := ""
	if c.want != "" {
		says = reach(c.reached(median(ratios)), c.want)
	}
	b.report.row(c.engine, c.clients, median(ours), median(base), median(ratios), spread(ratios), median(costs), says)
	return nil
}

func (b *bench) appendsPostgres(ctx context.Context) error {
	data, cluster, remove, err := b.ledgers()
	if err != nil {
		return err
	}
	defer remove()
	p, err := b.serve("--data", data, "--database-url", cluster.URL())
	if err != nil {
		return err
	}
	defer func() { _ = p.stop() }()
	base, err := newPgbench(ctx, b, cluster)
	if err != nil {
		return err
	}
	for _, clients := range []int{1, 8, 32} {
		c := comparison{engine: "Postgres", clients: clients, server: p}
		switch clients {
		case 1:
			c.want, c.reached = "≥ 0.8", func(r float64) bool { return r >= 0.8 }
		case 32:
			c.want, c.reached = "≥ 1.2", func(r float64) bool { return r >= 1.2 }
		}
		c.ours = func() (float64, error) { return recordsASecond(ctx, p, clients, b.each) }
		c.base = func() (float64, error) { return base.commits(clients) }
		if err := b.compare(c); err != nil {
			return err
		}
	}
	return nil
}

func (b *bench) appendsSQLite(ctx context.Context) error {
	data, err := os.MkdirTemp(b.dir, "data-")
	if err != nil {
		return err
	}
	p, err := b.serve("--data", data)
	if err != nil {
		return err
	}
	defer func() { _ = p.stop() }()
	raw, err := newRawSQLite(ctx, b)
	if err != nil {
		return err
	}
	defer raw.close()
	for _, clients := range []int{1, 8, 32} {
		c := comparison{engine: "SQLite", clients: clients, server: p}
		if clients == 32 {
			c.want, c.reached = "≥ 4", func(r float64) bool { return r >= 4 }
		}
		c.ours = func() (float64, error) { return recordsASecond(ctx, p, clients, b.each) }
		c.base = func() (float64, error) { return raw.commits(ctx, b.each) }
		if err := b.compare(c); err != nil {
			return err
		}
	}
	return nil
}

// pgbench is the baseline on Postgres: its own client, inserting single rows.
type pgbench struct {
	run    func(name string, args ...string) (string, error)
	script string
	each   time.Duration
}

func newPgbench(ctx context.Context, b *bench, cluster *storetest.Cluster) (*pgbench, error) {
	p := &pgbench{script: filepath.Join(b.dir, "insert.sql"), each: b.each}
	p.run = func(name string, args ...string) (string, error) {
		cmd := exec.CommandContext(ctx, filepath.Join(cluster.Bin(), name), args...)
		cmd.Env = append(os.Environ(), "PGHOST="+cluster.Dir(), "PGUSER=postgres", "PGDATABASE=postgres")
		out, err := cmd.CombinedOutput()
		if err != nil {
			err = fmt.Errorf("%s: %w\n%s", name, err, out)
		}
		return string(out), err
	}
	if err := os.WriteFile(p.script, []byte("INSERT INTO bench (text) VALUES ('a row of a usual length for a baseline, sixty-four bytes of it');\n"), 0o644); err != nil {
		return nil, err
	}
	_, err := p.run("psql", "-qc", "CREATE TABLE bench (id bigint GENERATED ALWAYS AS IDENTITY PRIMARY KEY, text text NOT NULL)")
	return p, err
}

var transactions = regexp.MustCompile(`tps = ([0-9.]+)`)

// commits is how many it makes in a second.
func (p *pgbench) commits(clients int) (float64, error) {
	out, err := p.run("pgbench", "--no-vacuum", "--protocol=prepared", "--client="+strconv.Itoa(clients), "--jobs="+strconv.Itoa(min(clients, 2)),
		"--time="+strconv.Itoa(max(1, int(p.each.Seconds()))), "--file="+p.script)
	if err != nil {
		return 0, err
	}
	found := transactions.FindStringSubmatch(out)
	if found == nil {
		return 0, fmt.Errorf("pgbench says no rate:\n%s", out)
	}
	return strconv.ParseFloat(found[1], 64)
}

// rawSQLite is the baseline on SQLite: single rows by its driver, opened as the
// store opens its own.
type rawSQLite struct {
	db     *sql.DB
	insert *sql.Stmt
}

func newRawSQLite(ctx context.Context, b *bench) (*rawSQLite, error) {
	db, err := sql.Open("sqlite", "file:"+url.PathEscape(filepath.Join(b.dir, "raw.sqlite"))+"?_pragma=journal_mode(WAL)&_pragma=synchronous(FULL)&_txlock=immediate")
	if err != nil {
		return nil, err
	}
	db.SetMaxOpenConns(1)
	if _, err := db.ExecContext(ctx, `CREATE TABLE IF NOT EXISTS bench (id INTEGER PRIMARY KEY, text TEXT NOT NULL)`); err != nil {
		return nil, err
	}
	insert, err := db.PrepareContext(ctx, `INSERT INTO bench (text) VALUES ('a row of a usual length for a baseline, sixty-four bytes of it')`)
	return &rawSQLite{db, insert}, err
}

// commits is how many it makes in a second, by the one writer that there can be.
func (r *rawSQLite) commits(ctx context.Context, during time.Duration) (float64, error) {
	start, n := time.Now(), 0
	for ; time.Since(start) < during; n++ {
		if _, err := r.insert.ExecContext(ctx); err != nil {
			return 0, err
		}
	}
	return float64(n) / time.Since(start).Seconds(), nil
}

func (r *rawSQLite) close() { _ = r.db.Close() } // a baseline's data is thrown away

var recordNumber atomic.Int64

// recordsASecond lets clients record one after another.
func recordsASecond(ctx context.Context, p *process, clients int, during time.Duration) (float64, error) {
	client := http.Client{Timeout: 30 * time.Second, Transport: &http.Transport{MaxIdleConnsPerHost: clients, MaxConnsPerHost: clients}}
	defer client.CloseIdleConnections()
	var done atomic.Int64
	var failed atomic.Value
	var all sync.WaitGroup
	start := time.Now()
	for range clients {
		all.Go(func() {
			for time.Since(start) < during {
				n := recordNumber.Add(1)
				body := fmt.Appendf(nil, `{"subject":{"part":"SM-%d","revision":"A","joint":"J%d"},"geometry_digest":"sha256:00","kind":"lug","input":%s}`, n%1000, n/1000, typicalLug)
				if err := ask(ctx, &client, p, "/v1/records", body, "bench-"+strconv.FormatInt(n, 10)); err != nil {
					failed.Store(err)
					return
				}
				done.Add(1)
			}
		})
	}
	all.Wait()
	if err, _ := failed.Load().(error); err != nil {
		return 0, err
	}
	return float64(done.Load()) / time.Since(start).Seconds(), nil
}

package service_test

import (
	"bytes"
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store"
	"jointledger/store/storetest"
)

// tampered is a ledger in a database that somebody with every right gets at.
type tampered struct {
	key     *ledger.Key
	signer  *ledger.Signer
	kept    string   // a checkpoint of now
	earlier string   // one of before the last entry
	nothing string   // one of the empty log, which every log agrees with
	ids     []string // of the entries
	store   service.Store
	exec    func(t *testing.T, statement string, args ...any)
	query   func(t *testing.T, statement string, into ...any)
	place   string // of the n-th argument: ?1 or $1
}

func (d *tampered) arg(n int) string { return fmt.Sprint(d.place, n) }

// fill writes six records, a check and a withdrawal.
func (d *tampered) fill(t *testing.T, s *service.Service) {
	t.Helper()
	var err error
	if d.nothing, err = s.Checkpoint(t.Context()); err != nil {
		t.Fatal(err)
	}
	for i := range 6 {
		d.ids = append(d.ids, record(t, s, ada, fmt.Sprintf("joint-%d", i), fmt.Sprintf("key-%d", i)).ID)
	}
	check, err := sign(t, s, ben, d.ids[2], "checked")
	if err != nil {
		t.Fatal(err)
	}
	if d.earlier, err = s.Checkpoint(t.Context()); err != nil {
		t.Fatal(err)
	}
	withdrawn, err := withdraw(t, s, ada, d.ids[4])
	if err != nil {
		t.Fatal(err)
	}
	d.ids = append(d.ids, check.ID, withdrawn.ID)
	if d.kept, err = s.Checkpoint(t.Context()); err != nil {
		t.Fatal(err)
	}
	if d.key, err = ledger.NewKey(s.VerifierKey()); err != nil {
		t.Fatal(err)
	}
}

// rows are the tables that are tampered with.
var rows = []string{"terms", "entries", "tree_hashes", "head"}

// save keeps the rows as they are, and restore puts them back.
func (d *tampered) save(t *testing.T) {
	t.Helper()
	for _, table := range rows {
		d.exec(t, "CREATE TABLE saved_"+table+" AS SELECT * FROM "+table)
	}
}

func (d *tampered) restore(t *testing.T) {
	t.Helper()
	for _, table := range rows {
		d.exec(t, "DELETE FROM "+table)
	}
	for _, table := range slices.Backward(rows) {
		d.exec(t, "INSERT INTO "+table+" SELECT * FROM saved_"+table)
	}
}

// audit verifies the database with a kept checkpoint.
func (d *tampered) audit(t *testing.T, kept string) error {
	t.Helper()
	verifier := ledger.NewVerifier(d.key)
	if err := verifier.Since(kept); err != nil {
		t.Fatal(err)
	}
	recomputer := &service.Recomputer{}
	return service.Audit(t.Context(), d.store, verifier, func(e ledger.Verified) error { return recomputer.Entry(e.Envelope) })
}

// onSQLite makes a ledger in a file whose triggers are gone.
func onSQLite(t *testing.T) *tampered {
	t.Helper()
	file := filepath.Join(t.TempDir(), "ledger.sqlite")
	opened, err := store.OpenSQLite(t.Context(), file)
	if err != nil {
		t.Fatal(err)
	}
	d := &tampered{signer: storetest.Signer(t), place: "?", store: opened}
	d.fill(t, open(t, opened, d.signer))
	db, err := sql.Open("sqlite", file)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := errors.Join(db.Close(), opened.Close()); err != nil {
			t.Error(err)
		}
	})
	do := func(t *testing.T, work func(*sql.DB) error) {
		t.Helper()
		if err := work(db); err != nil {
			t.Fatal(err)
		}
	}
	do(t, func(db *sql.DB) error {
		rows, err := db.Query("SELECT name FROM sqlite_schema WHERE type = 'trigger'")
		if err != nil {
			return err
		}
		var names []string
		for rows.Next() {
			var name string
			if err := rows.Scan(&name); err != nil {
				return err
			}
			names = append(names, name)
		}
		if err := rows.Err(); err != nil {
			return err
		}
		for _, name := range names {
			if _, err := db.Exec("DROP TRIGGER " + name); err != nil {
				return err
			}
		}
		return nil
	})
	d.exec = func(t *testing.T, statement string, args ...any) {
		t.Helper()
		do(t, func(db *sql.DB) error {
			_, err := db.Exec("PRAGMA foreign_keys = off; PRAGMA ignore_check_constraints = on; "+statement, args...)
			return err
		})
	}
	d.query = func(t *testing.T, statement string, into ...any) {
		t.Helper()
		do(t, func(db *sql.DB) error { return db.QueryRow(statement).Scan(into...) })
	}
	d.save(t)
	return d
}

// onPostgres makes a ledger in a database and gets at it as its owner.
func onPostgres(t *testing.T) *tampered {
	t.Helper()
	url := storetest.Database(t)
	opened, err := store.OpenPostgres(t.Context(), url)
	if err != nil {
		t.Fatal(err)
	}
	d := &tampered{signer: storetest.Signer(t), place: "$", store: opened}
	d.fill(t, open(t, opened, d.signer))
	connection, err := pgx.Connect(t.Context(), url)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := errors.Join(connection.Close(context.Background()), opened.Close()); err != nil {
			t.Error(err)
		}
	})
	// Foreign keys are off; the triggers were made to fire all the same.
	if _, err := connection.Exec(t.Context(), "SET session_replication_role = replica"); err != nil {
		t.Fatal(err)
	}
	do := func(t *testing.T, work func(context.Context, *pgx.Conn) error) {
		t.Helper()
		if err := work(t.Context(), connection); err != nil {
			t.Fatal(err)
		}
	}
	do(t, func(ctx context.Context, c *pgx.Conn) error {
		for _, table := range []string{"identity", "head", "entries", "terms", "tree_hashes", "idempotency"} {
			if _, err := c.Exec(ctx, "ALTER TABLE "+table+" DISABLE TRIGGER ALL"); err != nil {
				return err
			}
		}
		return nil
	})
	d.exec = func(t *testing.T, statement string, args ...any) {
		t.Helper()
		do(t, func(ctx context.Context, c *pgx.Conn) error {
			_, err := c.Exec(ctx, statement, args...)
			return err
		})
	}
	d.query = func(t *testing.T, statement string, into ...any) {
		t.Helper()
		do(t, func(ctx context.Context, c *pgx.Conn) error { return c.QueryRow(ctx, statement).Scan(into...) })
	}
	d.save(t)
	return d
}

// Whatever is done to the rows behind the program's back, verification names
// the entry.
func TestTampering(t *testing.T) {
	type deed struct {
		name string
		do   func(t *testing.T, d *tampered)
		// entry is the index that must be named by its id, -1 where none can
		// be, and says a part of the sentence.
		entry int
		says  string
		// forget has no checkpoint that was kept.
		forget bool
	}
	execute := func(statement string) func(*testing.T, *tampered) {
		return func(t *testing.T, d *tampered) { d.exec(t, statement) }
	}
	deeds := []deed{
		{"an entry's index", execute("UPDATE entries SET idx = 1003 WHERE idx = 3"), 3, "missing", false},
		{"a term's index", execute("UPDATE terms SET idx = 5, place = 99 WHERE idx = 3 AND place = 0"), 3, "terms", false},
		{"a term's place", execute("UPDATE terms SET place = 99 WHERE idx = 3 AND place = 0"), 3, "terms", false},
		{"a term's kind", execute("UPDATE terms SET kind = 'material' WHERE idx = 3 AND kind = 'method'"), 3, "terms", false},
		{"a term's deletion", execute("DELETE FROM terms WHERE idx = 3 AND place = 0"), 3, "terms", false},
		{"a hash's index", execute("UPDATE tree_hashes SET idx = 5000 WHERE idx = 4"), 3, "missing", false},
		{"a hash's deletion", execute("DELETE FROM tree_hashes WHERE idx = 4"), 3, "missing", false},
		{"an entry's deletion", execute("DELETE FROM entries WHERE idx = 3"), 3, "missing", false},
		{"the last entry's deletion", execute("DELETE FROM entries WHERE idx = 7"), 7, "missing", false},
		{"all entries' deletion", execute("DELETE FROM entries"), 0, "missing", false},
		{"two entries' exchange", execute("UPDATE entries SET idx = 1000 WHERE idx = 2; UPDATE entries SET idx = 2 WHERE idx = 3; UPDATE entries SET idx = 3 WHERE idx = 1000"), -1, "", false},
		{"the head's size", execute("UPDATE head SET size = size - 1"), -1, "checkpoint", false},
		{"the head's checkpoint of before", func(t *testing.T, d *tampered) {
			d.exec(t, "UPDATE head SET checkpoint = "+d.arg(1), d.earlier)
		}, -1, "checkpoint", false},
		{"another key's signature", func(t *testing.T, d *tampered) {
			var root []byte
			d.query(t, "SELECT root FROM head", &root)
			checkpoint, err := storetest.Signer(t).Checkpoint(8, ledger.Hash(root))
			if err != nil {
				t.Fatal(err)
			}
			d.exec(t, "UPDATE head SET checkpoint = "+d.arg(1), checkpoint)
		}, -1, "checkpoint", false},
		{"bytes, hash and columns together", func(t *testing.T, d *tampered) {
			var entry []byte
			d.query(t, "SELECT bytes FROM entries WHERE idx = 3", &entry)
			entry = bytes.Replace(entry, []byte(`"author":"ada"`), []byte(`"author":"eve"`), 1)
			leaf := ledger.Leaf(entry)
			d.exec(t, "UPDATE entries SET bytes = "+d.arg(1)+", leaf = "+d.arg(2)+", author = 'eve' WHERE idx = 3", entry, leaf[:])
		}, 3, "tree hash", false},
		{"a result changed, and all that follows but the signature", func(t *testing.T, d *tampered) {
			forge(t, d, nil)
		}, 3, "computed again", false},
		{"the last entries taken off, with a signed head of then", func(t *testing.T, d *tampered) {
			d.exec(t, "DELETE FROM entries WHERE idx = 7")
			d.exec(t, "DELETE FROM terms WHERE idx = 7")
			d.exec(t, fmt.Sprint("DELETE FROM tree_hashes WHERE idx >= ", ledger.StoredHashCount(7)))
			tree, err := d.key.Open(d.earlier)
			if err != nil {
				t.Fatal(err)
			}
			d.exec(t, "UPDATE head SET size = 7, root = "+d.arg(1)+", checkpoint = "+d.arg(2), tree.Root[:], d.earlier)
		}, -1, "older copy", false},
		{"a result changed and everything signed again with the stolen key", func(t *testing.T, d *tampered) {
			forge(t, d, d.signer)
		}, 3, "computed again", true},
	}
	for _, column := range []string{"id", "type", "at", "author", "part", "revision", "joint", "aspect", "geometry_digest", "kind", "verdict", "target", "role"} {
		deeds = append(deeds, deed{"the column " + column, execute("UPDATE entries SET " + column + " = 'x' WHERE idx = 3"), 3, strings.ReplaceAll(column, "_", " "), false})
	}
	for column, entry := range map[string]int{"target": 6, "role": 6, "id": 6} {
		deeds = append(deeds, deed{"the column " + column + " of a sign-off", execute("UPDATE entries SET " + column + " = 'x' WHERE idx = 6"), entry, column, false})
	}
	named := map[string]int{"entries": 3, "tree_hashes": 3, "terms": 3, "head": -1}
	for _, c := range [][2]string{{"entries", "leaf"}, {"entries", "bytes"}, {"tree_hashes", "hash"}, {"terms", "value"}, {"head", "root"}} {
		table, column := c[0], c[1]
		deeds = append(deeds, deed{"a bit of " + table + "." + column, func(t *testing.T, d *tampered) {
			where := map[string]string{"entries": " WHERE idx = 3", "tree_hashes": " WHERE idx = 4", "terms": " WHERE idx = 3 AND place = 0", "head": ""}[table]
			var value []byte
			d.query(t, "SELECT "+column+" FROM "+table+where, &value)
			value = bytes.Clone(value)
			value[len(value)/2] ^= 1
			d.exec(t, "UPDATE "+table+" SET "+column+" = "+d.arg(1)+where, value)
		}, named[table], "", false})
	}
	deeds = append(deeds, deed{"the margin", execute("UPDATE entries SET margin = margin + 1 WHERE idx = 3"), 3, "margin", false})

	for engine, make := range map[string]func(*testing.T) *tampered{"SQLite": onSQLite, "Postgres": onPostgres} {
		t.Run(engine, func(t *testing.T) {
			d := make(t)
			for _, deed := range deeds {
				t.Run(deed.name, func(t *testing.T) {
					if err := d.audit(t, d.kept); err != nil {
						t.Fatalf("nothing was done: %v", err)
					}
					deed.do(t, d)
					kept := d.kept
					if deed.forget {
						kept = d.nothing
					}
					err := d.audit(t, kept)
					d.restore(t)
					var failed *ledger.Failure
					if !errors.As(err, &failed) {
						t.Fatalf("verification says %v", err)
					}
					if !strings.Contains(failed.Error(), deed.says) {
						t.Errorf("it says %q, want %q in it", failed, deed.says)
					}
					if deed.entry >= 0 && failed.Index != int64(deed.entry) {
						t.Errorf("it names entry %d, want %d: %v", failed.Index, deed.entry, failed)
					}
				})
			}
		})
	}
}

// forge changes the margin of entry 3 and makes everything that follows from
// its bytes follow; a signer, where there is one, signs the new head.
func forge(t *testing.T, d *tampered, signer *ledger.Signer) {
	t.Helper()
	var entry []byte
	d.query(t, "SELECT bytes FROM entries WHERE idx = 3", &entry)
	entry = bytes.ReplaceAll(entry, []byte(`0.09782515717608153`), []byte(`0.25`))
	is, err := service.EntryOf(entry)
	if err != nil {
		t.Fatal(err)
	}
	d.exec(t, "UPDATE entries SET bytes = "+d.arg(1)+", leaf = "+d.arg(2)+", margin = 0.25 WHERE idx = 3", entry, is.Leaf[:])
	leaves := make([]ledger.Hash, 8)
	for i := range leaves {
		var leaf []byte
		d.query(t, fmt.Sprint("SELECT leaf FROM entries WHERE idx = ", i), &leaf)
		leaves[i] = ledger.Hash(leaf)
	}
	hashes, _, root, err := ledger.Grow(ledger.Tree{Root: ledger.EmptyRoot}, leaves, nil)
	if err != nil {
		t.Fatal(err)
	}
	for i, hash := range hashes {
		d.exec(t, "UPDATE tree_hashes SET hash = "+d.arg(1)+fmt.Sprint(" WHERE idx = ", i), hash[:])
	}
	d.exec(t, "UPDATE head SET root = "+d.arg(1), root[:])
	if signer == nil {
		return
	}
	checkpoint, err := signer.Checkpoint(8, root)
	if err != nil {
		t.Fatal(err)
	}
	d.exec(t, "UPDATE head SET checkpoint = "+d.arg(1), checkpoint)
}

// An older copy of the whole database is a log that verifies; a checkpoint
// that was kept shows that it is not the latest.
func TestOlderCopyOfTheDatabase(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "ledger.sqlite")
	signer := storetest.Signer(t)
	opened, err := store.OpenSQLite(t.Context(), file)
	if err != nil {
		t.Fatal(err)
	}
	s := open(t, opened, signer)
	record(t, s, ada, "joint-0", "")
	older := export(t, s, "")
	record(t, s, ada, "joint-1", "")
	kept, err := s.Checkpoint(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	if err := opened.Close(); err != nil {
		t.Fatal(err)
	}
	key, err := ledger.NewKey(signer.VerifierKey())
	if err != nil {
		t.Fatal(err)
	}
	for _, remember := range []bool{false, true} {
		verifier := ledger.NewVerifier(key)
		if remember {
			if err := verifier.Since(kept); err != nil {
				t.Fatal(err)
			}
		}
		err := verifier.Export(bytes.NewReader(older), func(ledger.Verified) error { return nil })
		if err == nil {
			err = verifier.Done()
		}
		if (err != nil) != remember {
			t.Errorf("with a kept checkpoint %v: %v", remember, err)
		}
	}
	if _, err := os.Stat(file); err != nil {
		t.Error(err)
	}
}

package store

import (
	"database/sql"
	"path/filepath"
	"strings"
	"testing"
	"testing/fstest"
)

func TestMigrationsOfEachEngine(t *testing.T) {
	for _, engine := range []string{"sqlite", "postgres"} {
		all, err := migrations(migrationFiles, engine)
		if err != nil || len(all) == 0 {
			t.Errorf("%s: %d, %v", engine, len(all), err)
		}
	}
	for name, files := range map[string]fstest.MapFS{
		"a gap":    {"migrations/x/0001_a.sql": {}, "migrations/x/0003_c.sql": {}},
		"no digit": {"migrations/x/first.sql": {}},
		"none":     {},
	} {
		if all, err := migrations(files, "x"); err == nil {
			t.Errorf("%s: %v", name, all)
		}
	}
}

// A step that a ledger somewhere went through never changes: the program would
// refuse that ledger. These are the sums of the files as they were released; a
// change of the schema is a new file, with a new line here.
func TestReleasedMigrationsStay(t *testing.T) {
	released := map[string][]string{
		"postgres": {
			"114302c3f83662c00982dc6f9d45bd514f0d4e70762d037b253923042031c738",
			"7c5ce169bc41ae99b643a4e53e700d8a2106569fb40dacd3f1312a5af371a8e3",
			"8e52e11e930300e3ad997880aef9b05f4c2545f8ec5bd3fa1707a74d17ea5b23",
		},
		"sqlite": {
			"4f3ebc5bd04421b8b5d36868b554526c5a9601ce9eff9bb9f6756125ad1b2ab4",
			"d711824df043f931d776e83acd198ce6498d639d5ad148390919572dfb36d74c",
			"2ec2a8fdfd4b7ef0de15fc48522a8a803b85c2ada00cfd4c706b905582d355e3",
		},
	}
	for engine, sums := range released {
		all, err := migrations(migrationFiles, engine)
		if err != nil || len(all) != len(sums) {
			t.Fatalf("%s: %d steps, %v, want %d", engine, len(all), err, len(sums))
		}
		for i, m := range all {
			if m.sum != sums[i] {
				t.Errorf("%s/%s is not as it was released: its sum is %s", engine, m.name, m.sum)
			}
		}
	}
}

// steps are those of a program two releases on, the last of which is broken.
func steps(t *testing.T, engine string) []migration {
	t.Helper()
	known, err := migrations(migrationFiles, engine)
	if err != nil {
		t.Fatal(err)
	}
	return append(known,
		migration{len(known) + 1, "good", "CREATE TABLE later (a int); INSERT INTO later VALUES (1)", "sum of good"},
		migration{len(known) + 2, "broken", "CREATE TABLE latest (a int); INSERT INTO nowhere VALUES (1)", "sum of broken"},
	)
}

func TestSQLiteMigrates(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	s, err := OpenSQLite(t.Context(), file)
	if err != nil {
		t.Fatal(err)
	}
	released := s.known
	s.known = steps(t, "sqlite")
	if err := s.Ready(t.Context()); err == nil || !strings.Contains(err.Error(), "good") {
		t.Errorf("ready before migrating: %v", err)
	}
	if err := s.migrate(t.Context()); err == nil || !strings.Contains(err.Error(), "broken") {
		t.Errorf("a broken step: %v", err)
	}
	db, err := sql.Open("sqlite", file)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	tables := 0
	if err := db.QueryRow(`SELECT count(*) FROM sqlite_schema WHERE name IN ('later', 'latest')`).Scan(&tables); err != nil || tables != 1 {
		t.Errorf("%d tables, %v: the good step is to stand, and nothing of the broken", tables, err)
	}
	s.known = s.known[:len(s.known)-1]
	if err := s.Ready(t.Context()); err != nil {
		t.Error(err)
	}
	if err := s.Close(); err != nil {
		t.Error(err)
	}
	_, err = OpenSQLite(t.Context(), file)
	if err == nil || !strings.Contains(err.Error(), "start a newer program") {
		t.Errorf("a newer schema: %v", err)
	}
	if _, err := db.Exec(`DELETE FROM schema_migrations WHERE version > ?; UPDATE schema_migrations SET sum = 'another'`, len(released)); err != nil {
		t.Fatal(err)
	}
	if _, err := OpenSQLite(t.Context(), file); err == nil || !strings.Contains(err.Error(), "is not this program's") {
		t.Errorf("another step: %v", err)
	}
}

func TestPending(t *testing.T) {
	known := steps(t, "postgres")
	done := []applied{{1, known[0].name, known[0].sum}}
	for n := range known {
		if n > 0 {
			done = append(done, applied{n + 1, known[n].name, known[n].sum})
		}
		todo, err := pending(known, done)
		if err != nil || len(todo) != len(known)-n-1 {
			t.Errorf("after %d: %d to do, %v", n+1, len(todo), err)
		}
	}
	if _, err := pending(known[:1], done); err == nil {
		t.Error("took a newer schema")
	}
	done[1].version = 7
	if _, err := pending(known, done); err == nil {
		t.Error("took another version")
	}
}

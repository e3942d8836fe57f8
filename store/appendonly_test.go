package store_test

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/jackc/pgx/v5"

	"jointledger/service"
	"jointledger/store"
	"jointledger/store/storetest"
)

// onlyAddedTo are the tables that refuse every change of what stands in them.
var onlyAddedTo = []string{"entries", "terms", "tree_hashes", "idempotency", "identity"}

// filled fills every table of a store.
func filled(t *testing.T, s service.Store) {
	t.Helper()
	if _, err := s.Claim(t.Context(), service.Identity{Origin: origin, VerifierKey: "key"}); err != nil {
		t.Fatal(err)
	}
	b := on(t, s, headOf(t, s), record(t, 1, 0, "SM-110", "A", "J1"), record(t, 1, 1, "SM-110", "A", "J1"), signOff(t, 1, 2, uuid(1, 0), "checked"))
	b.Answers = []service.Answer{answer("/v1/records", "k", 0)}
	b.Keys = []service.KeyChange{{Add: apiKey(1)}}
	if err := s.Append(t.Context(), b); err != nil {
		t.Fatal(err)
	}
}

// refused runs statements of somebody with full rights on the database and
// checks that each is refused, and that the store is as it was.
func refused(t *testing.T, s service.Store, run func(statement string) error, statements []string) {
	t.Helper()
	before := dump(t, s)
	for _, statement := range statements {
		if err := run(statement); err == nil {
			t.Errorf("was not refused: %s", statement)
		} else if !strings.Contains(err.Error(), "only added to") && !strings.Contains(err.Error(), "written once") &&
			!strings.Contains(err.Error(), "only grows") && !strings.Contains(err.Error(), "has one row") &&
			!strings.Contains(err.Error(), "not deleted") && !strings.Contains(err.Error(), "added once") {
			t.Errorf("was refused for another reason: %s: %v", statement, err)
		}
	}
	if diff := cmp.Diff(before, dump(t, s)); diff != "" {
		t.Errorf("something changed:\n%s", diff)
	}
	verify(t, s)
}

func TestSQLiteRefusesChanges(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	s, err := store.OpenSQLite(t.Context(), file)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	filled(t, s)
	// A connection of another program: none of our settings.
	db, err := sql.Open("sqlite", file)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	var statements []string
	for _, table := range onlyAddedTo {
		columns := strings.Split(texts(t, db, `SELECT group_concat(name, ',') FROM pragma_table_info('`+table+`')`)[0], ",")
		if len(columns) < 2 {
			t.Fatalf("%s has the columns %v", table, columns)
		}
		for _, column := range columns {
			statements = append(statements,
				fmt.Sprintf(`UPDATE %s SET %s = %s`, table, column, column),
				fmt.Sprintf(`UPDATE OR REPLACE %s SET %s = (SELECT min(%s) FROM %s)`, table, column, column, table),
				fmt.Sprintf(`UPDATE OR IGNORE %s SET %s = (SELECT max(%s) FROM %s)`, table, column, column, table),
			)
		}
		statements = append(statements,
			`DELETE FROM `+table,
			`INSERT OR REPLACE INTO `+table+` SELECT * FROM `+table,
			`REPLACE INTO `+table+` SELECT * FROM `+table+` LIMIT 1`,
			`INSERT OR IGNORE INTO `+table+` SELECT * FROM `+table,
		)
	}
	const rest = `type, at, author, leaf, part, revision, joint, aspect, geometry_digest, kind, verdict, margin, target, role, bytes FROM entries WHERE idx = 1`
	statements = append(statements,
		// The next index, in place of an older entry by its id.
		`INSERT OR REPLACE INTO entries SELECT 3, id, `+rest,
		`INSERT INTO entries SELECT 7, 'new', `+rest,
		`INSERT INTO entries SELECT -1, 'new', `+rest,
		`INSERT INTO entries SELECT NULL, id, `+rest,
		`INSERT INTO tree_hashes SELECT max(idx) + 2, hash FROM tree_hashes`,
		`INSERT OR REPLACE INTO idempotency SELECT caller, method, path, key, zeroblob(32), 1, state FROM idempotency`,
		`UPDATE head SET size = 2`,
		`UPDATE head SET size = size`,
		`UPDATE head SET root = zeroblob(32)`,
		`DELETE FROM head`,
		`INSERT OR REPLACE INTO head VALUES (1, 0, zeroblob(32), '')`,
		`DELETE FROM keys`,
		`INSERT OR REPLACE INTO keys SELECT seq, id, caller, 'approver', hash, added, revoked, last_used FROM keys`,
	)
	refused(t, s, func(statement string) error {
		_, err := db.ExecContext(t.Context(), statement)
		return err
	}, statements)
}

// The index over the standing of records can be changed, and never makes a list
// lie: it is compared with the entries.
func TestStandingIsOnlyAnIndex(t *testing.T) {
	check := func(t *testing.T, s service.Store, run func(statement string) error) {
		filled(t, s)
		for _, c := range []struct {
			change string
			filter service.Filter
		}{
			{`UPDATE standing SET state = 'approved' WHERE idx = 0`, service.Filter{State: service.Approved}},
			{`UPDATE standing SET state = 'recorded'`, service.Filter{State: service.Recorded, Part: "SM-110"}},
			{`UPDATE standing SET latest = (1 = 1)`, service.Filter{Latest: true}},
			{`UPDATE standing SET latest = (1 = 1)`, service.Filter{Latest: true, Joint: "J1"}},
		} {
			if err := run(c.change); err != nil {
				t.Fatal(err)
			}
			found, err := s.Records(t.Context(), c.filter, 1<<40, 10)
			if err == nil || !strings.Contains(err.Error(), "otherwise than the entries say") || errors.Is(err, service.ErrUnavailable) {
				t.Errorf("after %s: %v, %v", c.change, found, err)
			}
		}
		latest, err := latestOf(t, s, "SM-110", "A")
		if err != nil || len(latest) != 1 || latest[0].Index != 1 {
			t.Errorf("latest for a release: %+v, %v", latest, err)
		}
	}
	t.Run("SQLite", func(t *testing.T) {
		file := filepath.Join(t.TempDir(), "ledger.db")
		s, err := store.OpenSQLite(t.Context(), file)
		if err != nil {
			t.Fatal(err)
		}
		defer s.Close()
		db, err := sql.Open("sqlite", file)
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close()
		check(t, s, func(statement string) error {
			_, err := db.ExecContext(t.Context(), statement)
			return err
		})
	})
	t.Run("Postgres", func(t *testing.T) {
		url := storetest.Database(t)
		s, err := store.OpenPostgres(t.Context(), url)
		if err != nil {
			t.Fatal(err)
		}
		defer s.Close()
		db := connect(t, url)
		check(t, s, func(statement string) error {
			_, err := db.Exec(t.Context(), statement)
			return err
		})
	})
}

func texts(t *testing.T, db *sql.DB, query string) (found []string) {
	t.Helper()
	rows, err := db.QueryContext(t.Context(), query)
	if err != nil {
		t.Fatal(err)
	}
	defer rows.Close()
	for rows.Next() {
		var s string
		if err := rows.Scan(&s); err != nil {
			t.Fatal(err)
		}
		found = append(found, s)
	}
	if rows.Err() != nil {
		t.Fatal(rows.Err())
	}
	return found
}

func TestPostgresRefusesChanges(t *testing.T) {
	url := storetest.Database(t)
	s, err := store.OpenPostgres(t.Context(), url)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	filled(t, s)
	for _, role := range []string{"origin", "replica"} {
		t.Run("as "+role, func(t *testing.T) {
			db := connect(t, url)
			if _, err := db.Exec(t.Context(), `SET session_replication_role = `+role); err != nil {
				t.Fatal(err)
			}
			var statements []string
			for _, table := range onlyAddedTo {
				rows, err := db.Query(t.Context(), `SELECT column_name FROM information_schema.columns WHERE table_name = $1`, table)
				if err != nil {
					t.Fatal(err)
				}
				columns, err := pgx.CollectRows(rows, pgx.RowTo[string])
				if err != nil || len(columns) < 2 {
					t.Fatalf("%s has the columns %v: %v", table, columns, err)
				}
				for _, column := range columns {
					statements = append(statements,
						fmt.Sprintf(`UPDATE %s SET %s = %s`, table, column, column),
						fmt.Sprintf(`INSERT INTO %s SELECT * FROM %s ON CONFLICT (%s) DO UPDATE SET %s = EXCLUDED.%s`, table, table, key(table), column, column),
					)
				}
				statements = append(statements, `DELETE FROM `+table, `TRUNCATE `+table+` CASCADE`)
			}
			statements = append(statements,
				`UPDATE head SET size = 2`, `UPDATE head SET root = root`, `DELETE FROM head`, `TRUNCATE head`, `DELETE FROM keys`, `TRUNCATE keys CASCADE`)
			refused(t, s, func(statement string) error {
				_, err := db.Exec(t.Context(), statement)
				return err
			}, statements)
		})
	}
}

// key names the columns of a table's primary key.
func key(table string) string {
	return map[string]string{
		"entries": "idx", "terms": "idx, place", "tree_hashes": "idx", "idempotency": "caller, method, path, key", "identity": "one",
	}[table]
}

func connect(t *testing.T, url string) *pgx.Conn {
	t.Helper()
	db, err := pgx.Connect(t.Context(), url)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { db.Close(context.Background()) })
	return db
}

// The rights that are granted to a server's role are enough for it, and do not
// let it change what stands.
func TestPostgresWithLeastRights(t *testing.T) {
	url := storetest.Database(t)
	owner, err := store.OpenPostgres(t.Context(), url)
	if err != nil {
		t.Fatal(err)
	}
	defer owner.Close()
	role := "server_of_" + strings.ToLower(url[strings.Index(url, "/test_")+len("/test_"):strings.Index(url, "?")])
	db := connect(t, url)
	exec := func(db *pgx.Conn, statement string) error {
		_, err := db.Exec(t.Context(), statement)
		return err
	}
	if err := exec(db, `CREATE ROLE `+role+` LOGIN`); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		db, err := pgx.Connect(context.Background(), url)
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close(context.Background())
		if _, err := db.Exec(context.Background(), `DROP OWNED BY `+role+`; DROP ROLE `+role); err != nil {
			t.Error(err)
		}
	})
	if err := owner.Grant(t.Context(), role+"_of_nobody"); err == nil || !strings.Contains(err.Error(), "CREATE ROLE") {
		t.Errorf("a role that does not exist: %v", err)
	}
	if err := owner.Grant(t.Context(), "postgres"); err == nil || !strings.Contains(err.Error(), "superuser") {
		t.Errorf("the superuser: %v", err)
	}
	as := strings.Replace(url, "postgres@", role+"@", 1)
	if s, err := store.OpenPostgres(t.Context(), as); err == nil || !strings.Contains(err.Error(), "jointledger migrate") {
		t.Errorf("without rights: %v, %v", s, err)
	}
	for range 2 { // again after every migration
		if err := owner.Grant(t.Context(), role); err != nil {
			t.Fatal(err)
		}
	}
	rows, err := db.Query(t.Context(), `SELECT relname FROM pg_class WHERE relkind = 'r' AND relnamespace = 'public'::regnamespace AND NOT has_table_privilege($1, oid, 'SELECT')`, role)
	if err != nil {
		t.Fatal(err)
	}
	if forgotten, err := pgx.CollectRows(rows, pgx.RowTo[string]); err != nil || len(forgotten) > 0 {
		t.Errorf("nothing is granted on %q: %v", forgotten, err)
	}
	s, err := store.OpenPostgres(t.Context(), as)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	filled(t, s)
	put(t, s, withdrawal(t, 1, 9, uuid(1, 1)))
	if err := s.Touch(t.Context(), "key-1", "2026-01-02T00:00:00.000Z"); err != nil {
		t.Error(err)
	}
	verify(t, s)
	server := connect(t, as)
	for _, statement := range slices.Concat([]string{
		`ALTER TABLE entries DISABLE TRIGGER ALL`, `DROP TRIGGER entries_change ON entries`, `DROP TABLE entries`, `DELETE FROM standing`, `UPDATE identity SET origin = origin`,
		`SET session_replication_role = replica`, `INSERT INTO head VALUES (2, 0, '', '')`, `DELETE FROM schema_migrations`, `DROP FUNCTION refuse_change CASCADE`,
	}, changes()) {
		if err := exec(server, statement); err == nil || !strings.Contains(err.Error(), "42501") {
			t.Errorf("%s: %v, not a want of rights", statement, err)
		}
	}
}

func changes() (statements []string) {
	for _, table := range []string{"entries", "terms", "tree_hashes", "idempotency"} {
		statements = append(statements, `UPDATE `+table+` SET idx = idx`, `DELETE FROM `+table, `TRUNCATE `+table+` CASCADE`)
	}
	return statements
}

// Package storetest gives tests their stores: an SQLite file or a Postgres
// database for each, a cluster of their own where they stop it, and a store
// that fails where it is told to.
package storetest

import (
	"context"
	"crypto/rand"
	"fmt"
	"net/url"
	"os"
	"path/filepath"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"

	"jointledger/service"
	"jointledger/store"
)

// Variable names the environment variable with the URL of a Postgres cluster on
// which tests may make databases.
const Variable = "JOINTLEDGER_TEST_POSTGRES"

// Database makes an empty database for a test and returns its URL. Without a
// cluster to make it on, the test fails: half of the stores would go untested.
func Database(t testing.TB) string {
	t.Helper()
	cluster := os.Getenv(Variable)
	if cluster == "" {
		t.Fatalf("%s is not set, and the Postgres half of the tests cannot run: run `make test`, or `go run ./store/throwaway -- go test ./...`, which start a cluster for it", Variable)
	}
	u, err := url.Parse(cluster)
	if err != nil {
		t.Fatalf("%s: %v", Variable, err)
	}
	name := "test_" + rand.Text()
	run(t, cluster, `CREATE DATABASE "`+name+`" TEMPLATE template0`)
	t.Cleanup(func() { run(t, cluster, `DROP DATABASE "`+name+`" WITH (FORCE)`) })
	u.Path = "/" + name
	return u.String()
}

func run(t testing.TB, url, statement string) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), time.Minute)
	defer cancel()
	connection, err := pgx.Connect(ctx, url)
	if err != nil {
		t.Fatal(err)
	}
	defer connection.Close(ctx)
	if _, err := connection.Exec(ctx, statement); err != nil {
		t.Fatal(fmt.Errorf("%s: %w", statement, err))
	}
}

// SQLite opens a store on a file of its own.
func SQLite(t testing.TB) *store.SQLite {
	t.Helper()
	s, err := store.OpenSQLite(t.Context(), filepath.Join(t.TempDir(), "ledger.db"))
	if err != nil {
		t.Fatal(err)
	}
	closed(t, s)
	return s
}

// Postgres opens a store on a database of its own.
func Postgres(t testing.TB) *store.Postgres {
	t.Helper()
	s, err := store.OpenPostgres(t.Context(), Database(t))
	if err != nil {
		t.Fatal(err)
	}
	closed(t, s)
	return s
}

func closed(t testing.TB, s service.Store) {
	t.Cleanup(func() {
		if err := s.Close(); err != nil {
			t.Error(err)
		}
	})
}

// Each runs a test on a store of each engine.
func Each(t *testing.T, test func(t *testing.T, s service.Store)) {
	t.Run("SQLite", func(t *testing.T) { test(t, SQLite(t)) })
	t.Run("Postgres", func(t *testing.T) { test(t, Postgres(t)) })
}

package store_test

import (
	"strings"
	"sync"
	"testing"

	"jointledger/store"
	"jointledger/store/storetest"
)

func TestPostgresMigratesOnce(t *testing.T) {
	url := storetest.Database(t)
	var opening sync.WaitGroup
	for range 6 {
		opening.Go(func() {
			s, err := store.OpenPostgres(t.Context(), url)
			if err != nil {
				t.Error(err)
				return
			}
			defer s.Close()
			if err := s.Ready(t.Context()); err != nil {
				t.Error(err)
			}
		})
	}
	opening.Wait()
	db := connect(t, url)
	for _, c := range []struct{ change, says string }{
		{`INSERT INTO schema_migrations (version, name, sum) VALUES (1000, 'later', '')`, "start a newer program"},
		{`DELETE FROM schema_migrations WHERE version = 1000; UPDATE schema_migrations SET sum = 'another'`, "is not this program's"},
	} {
		if _, err := db.Exec(t.Context(), c.change); err != nil {
			t.Fatal(err)
		}
		if s, err := store.OpenPostgres(t.Context(), url); err == nil {
			s.Close()
			t.Errorf("opened after %s", c.change)
		} else if !strings.Contains(err.Error(), c.says) {
			t.Errorf("after %s: %v", c.change, err)
		}
	}
}

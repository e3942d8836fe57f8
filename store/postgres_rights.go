package store

import (
	"context"
	_ "embed"
	"fmt"
	"strings"

	"github.com/jackc/pgx/v5"
)

//go:embed postgres_rights.sql
var postgresRights string

// Grant gives a role the rights that a server needs. The store must have been
// opened as the owner of the tables; a role that no right could hold back is
// refused.
func (s *Postgres) Grant(ctx context.Context, role string) error {
	return pgx.BeginFunc(ctx, s.pool, func(tx pgx.Tx) error {
		var super, member bool
		err := tx.QueryRow(ctx, `SELECT rolsuper, pg_has_role(rolname, current_user, 'MEMBER') FROM pg_roles WHERE rolname = $1`, role).Scan(&super, &member)
		switch {
		case err == pgx.ErrNoRows:
			return fmt.Errorf("there is no role %q: make it with CREATE ROLE %s LOGIN", role, pgx.Identifier{role}.Sanitize())
		case err != nil:
			return err
		case super:
			return fmt.Errorf("the role %q is a superuser, whom no right and no trigger holds back: give another", role)
		case member:
			return fmt.Errorf("the role %q is, or may become, the owner of the tables, who can take their triggers off: give another", role)
		}
		_, err = tx.Conn().PgConn().Exec(ctx, strings.ReplaceAll(postgresRights, "SERVER", pgx.Identifier{role}.Sanitize())).ReadAll()
		return err
	})
}

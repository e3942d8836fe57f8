package main

import (
	"context"
	"errors"
	"fmt"

	"jointledger/store"
)

// migrateCommand brings a database up to date as its owner, so that servers can
// run as a role that may not.
type migrateCommand struct {
	ServerRole string `help:"Postgres role to grant what a server needs, and no more." name:"server-role" placeholder:"ROLE"`
	place
}

// Run opens the store, which migrates it, and grants.
func (c migrateCommand) Run(ctx context.Context, std *streams) error {
	opened, err := c.open(ctx)
	if err != nil {
		return err
	}
	if c.ServerRole != "" {
		postgres, ok := opened.(*store.Postgres)
		if !ok {
			return errors.Join(errors.New("--server-role is for Postgres: the embedded database has no roles"), opened.Close())
		}
		if err := postgres.Grant(ctx, c.ServerRole); err != nil {
			return errors.Join(err, opened.Close())
		}
	}
	fmt.Fprintln(std.errs, "the schema is up to date")
	return opened.Close()
}

package main

import (
	"context"
	"fmt"
	"text/tabwriter"

	"jointledger/service"
)

// keyCommands manage API keys, on the ledger's own machine.
type keyCommands struct {
	Add    keyAddCommand    `cmd:"" help:"Make a key; it is printed once and stored nowhere."`
	List   keyListCommand   `cmd:"" help:"List all keys."`
	Revoke keyRevokeCommand `cmd:"" help:"Revoke every key of a caller."`
}

type keyAddCommand struct {
	Name string `arg:"" help:"The caller: a person or a program."`
	Role string `required:"" help:"reader, gate, analyst, checker, approver or admin."`
	place
}

// Run prints the key alone on standard output.
func (c keyAddCommand) Run(ctx context.Context, std *streams) error {
	s, closeAll, err := c.openService(ctx, service.Setup{Watch: service.Unwatched{}})
	if err != nil {
		return err
	}
	defer closeAll()
	secret, err := s.AddKey(ctx, c.Name, service.Role(c.Role))
	if err != nil {
		return err
	}
	_, err = fmt.Fprintln(std.out, secret)
	return err
}

type keyListCommand struct{ place }

// Run prints a table.
func (c keyListCommand) Run(ctx context.Context, std *streams) error {
	s, closeAll, err := c.openService(ctx, service.Setup{Watch: service.Unwatched{}})
	if err != nil {
		return err
	}
	defer closeAll()
	keys, err := s.Keys(ctx)
	if err != nil {
		return err
	}
	table := tabwriter.NewWriter(std.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(table, "CALLER\tROLE\tADDED\tLAST USED\tREVOKED\tID")
	for _, k := range keys {
		fmt.Fprintf(table, "%s\t%s\t%s\t%s\t%s\t%s\n", k.Caller, k.Role, k.Added, orDash(k.LastUsed), orDash(k.Revoked), k.ID)
	}
	return table.Flush()
}

func orDash(s string) string {
	if s == "" {
		return "-"
	}
	return s
}

type keyRevokeCommand struct {
	Name string `arg:"" help:"The caller."`
	place
}

// Run says how many keys were revoked.
func (c keyRevokeCommand) Run(ctx context.Context, std *streams) error {
	s, closeAll, err := c.openService(ctx, service.Setup{Watch: service.Unwatched{}})
	if err != nil {
		return err
	}
	defer closeAll()
	n, err := s.RevokeKeys(ctx, c.Name)
	if err != nil {
		return err
	}
	_, err = fmt.Fprintf(std.errs, "revoked %d keys of %s\n", n, c.Name)
	return err
}

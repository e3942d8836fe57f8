package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"time"

	"jointledger/service"
	"jointledger/service/ledger"
)

// verifyCommand checks exports offline.
type verifyCommand struct {
	KeyFile    string   `name:"key" required:"" help:"File with the ledger's public key, as GET /v1/ledger/key gives it." placeholder:"KEYFILE"`
	Since      []string `help:"File with a checkpoint that was kept earlier: the log must begin with its entries." placeholder:"CHECKPOINTFILE"`
	HashesOnly bool     `help:"Do not compute the records again."`
	Exports    []string `arg:"" optional:"" name:"export" help:"The export, then its follow-ups in their order; - is standard input."`

	Data        string `help:"Folder of an embedded database to verify in place of an export, every row of it." placeholder:"DIR"`
	DatabaseURL string `help:"Postgres URL, or @FILE, of a database to verify in place of an export." name:"database-url" placeholder:"URL"`
}

// progressEvery is how often a long run says how far it is.
const progressEvery = 2 * time.Second

// Run exits 0 only when everything holds.
func (c verifyCommand) Run(ctx context.Context, std *streams) error {
	if inDatabase := c.Data != "" || c.DatabaseURL != ""; inDatabase == (len(c.Exports) > 0) {
		return errors.New("give exports to verify, or one database with --data or --database-url")
	}
	text, err := os.ReadFile(c.KeyFile)
	if err != nil {
		return err
	}
	key, err := ledger.NewKey(string(text))
	if err != nil {
		return fmt.Errorf("%s: %w", c.KeyFile, err)
	}
	verifier := ledger.NewVerifier(key)
	recomputer := &service.Recomputer{}
	err = c.verify(ctx, verifier, recomputer, std)
	var failed *ledger.Failure
	if errors.As(err, &failed) {
		fmt.Fprintf(std.out, "does not hold: %s\n", failed)
		return exit(exitBad)
	}
	if err != nil {
		return err
	}
	recomputed := fmt.Sprintf("%d records were computed again and reproduced", recomputer.Records)
	if c.HashesOnly {
		recomputed = "no record was computed again"
	}
	fmt.Fprintf(std.out, "holds: %d entries of %s, each exactly as signed; %s\n", verifier.Size(), key.Origin(), recomputed)
	return nil
}

func (c verifyCommand) verify(ctx context.Context, verifier *ledger.Verifier, recomputer *service.Recomputer, std *streams) error {
	for _, path := range c.Since {
		checkpoint, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		if err := verifier.Since(string(checkpoint)); err != nil {
			return err
		}
	}
	said := time.Now()
	each := func(e ledger.Verified) error {
		if time.Since(said) > progressEvery {
			said = time.Now()
			fmt.Fprintf(std.errs, "entry %d, %s\n", e.Index, e.At)
		}
		if c.HashesOnly {
			return nil
		}
		return recomputer.Entry(e.Envelope)
	}
	if c.Data != "" || c.DatabaseURL != "" {
		return c.database(ctx, verifier, each)
	}
	for _, path := range c.Exports {
		if err := c.export(verifier, path, std.in, each); err != nil {
			return err
		}
	}
	return verifier.Done()
}

// database verifies a ledger where it is stored.
func (c verifyCommand) database(ctx context.Context, verifier *ledger.Verifier, each func(ledger.Verified) error) error {
	store, err := place{Data: c.Data, DatabaseURL: c.DatabaseURL}.open(ctx)
	if err != nil {
		return err
	}
	return errors.Join(service.Audit(ctx, store, verifier, each), store.Close())
}

func (c verifyCommand) export(verifier *ledger.Verifier, path string, in io.Reader, each func(ledger.Verified) error) error {
	if path == "-" {
		return verifier.Export(in, each)
	}
	file, err := os.Open(path)
	if err != nil {
		return err
	}
	return errors.Join(verifier.Export(file, each), file.Close())
}

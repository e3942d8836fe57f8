package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"time"

	"jointledger/api/client"
	"jointledger/service"
	"jointledger/service/strictjson"
)

// gateCommand asks a server whether a part may be released.
type gateCommand struct {
	Server   string        `required:"" help:"The server, such as https://ledger.example:8443." env:"JOINTLEDGER_SERVER" placeholder:"URL"`
	Part     string        `required:"" help:"The part." env:"JOINTLEDGER_PART" placeholder:"P"`
	Revision string        `required:"" help:"Its revision." env:"JOINTLEDGER_REVISION" placeholder:"R"`
	Joints   string        `required:"" help:"File with the joints as they are to be released: [{\"joint\": …, \"geometry_digest\": …}, …]." env:"JOINTLEDGER_JOINTS" placeholder:"FILE"`
	Policy   string        `help:"Policy of the server to ask under." default:"default" env:"JOINTLEDGER_POLICY" placeholder:"NAME"`
	OnError  string        `help:"What to do when the server cannot be asked: hold, or release with a warning." default:"hold" enum:"hold,release" env:"JOINTLEDGER_ON_ERROR" placeholder:"hold|release"`
	Timeout  time.Duration `help:"After this the server counts as one that cannot be asked." default:"10s" env:"JOINTLEDGER_TIMEOUT"`
}

// keyVariable has the API key: a secret is no argument that others can list.
const keyVariable = "JOINTLEDGER_KEY"

// Run exits 0 for release, 1 for hold and 2 where there is no answer.
func (c gateCommand) Run(ctx context.Context, std *streams) error {
	ctx, cancel := context.WithTimeout(ctx, c.Timeout)
	defer cancel()
	type outcome struct {
		decision *client.Decision
		err      error
	}
	// In a goroutine of its own: even a file that never ends must not hang a
	// check-in.
	ended := make(chan outcome, 1)
	go func() {
		decision, err := c.ask(ctx)
		ended <- outcome{decision, err}
	}()
	var got outcome
	select {
	case got = <-ended:
	case <-ctx.Done():
		got.err = fmt.Errorf("no answer within %s", c.Timeout)
	}
	var unusable *unusable
	switch {
	case errors.As(got.err, &unusable):
		return fmt.Errorf("the gate holds: %w", got.err)
	case got.err != nil && c.OnError == client.Release:
		fmt.Fprintf(std.errs, "jointledger: WARNING: part %s, revision %s, is released WITHOUT the gate, since --on-error release is set: %s\n", c.Part, c.Revision, got.err)
		return nil
	case got.err != nil:
		return fmt.Errorf("the gate could not be asked, and holds: %w", got.err)
	}
	printDecision(std.out, got.decision)
	if got.decision.Decision == client.Hold {
		return exit(exitBad)
	}
	return nil
}

// unusable is a request that cannot be answered as it is. It is never
// released: whoever writes the joints could open the gate with them.
type unusable struct{ error }

func (u *unusable) Unwrap() error { return u.error }

func (c gateCommand) ask(ctx context.Context) (*client.Decision, error) {
	text, err := os.ReadFile(c.Joints)
	if err != nil {
		return nil, &unusable{err}
	}
	var joints []client.ReleaseJoint
	if err := strictjson.Decode(text, &joints); err != nil {
		return nil, &unusable{fmt.Errorf("%s is not a list of joints: %w", c.Joints, err)}
	}
	server, err := client.New(c.Server, client.Options{Key: os.Getenv(keyVariable)})
	if err != nil {
		return nil, &unusable{err}
	}
	decision, err := server.ReleaseCheck(ctx, client.ReleaseRequest{Part: c.Part, Revision: c.Revision, Joints: joints, Policy: c.Policy})
	var refused *client.Problem
	if errors.As(err, &refused) && (refused.Status == 400 || refused.Status == 413 || refused.Status == 422) {
		return nil, &unusable{err}
	}
	return decision, err
}

// printDecision writes the lines that the server itself gives to a shell.
func printDecision(out io.Writer, d *client.Decision) {
	shown := service.Decision{Decision: d.Decision}
	for _, f := range d.Findings {
		shown.Findings = append(shown.Findings, service.ReleaseFinding(f))
	}
	fmt.Fprint(out, shown.Text())
}

// Jointledger computes pinned lugs and bolted joints by published methods,
// keeps every result in a ledger that proves it was only added to, and answers
// a release gate.
package main

import (
	"context"
	"crypto/rand"
	_ "embed"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"path/filepath"
	"strings"
	"syscall"

	"github.com/alecthomas/kong"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store"
)

//go:embed openapi.yaml
var openapi []byte

// Exit codes of commands that judge: the worst of what they judged.
const (
	exitGood     = 0
	exitBad      = 1
	exitUnusable = 2
)

// program is the command line.
type program struct {
	Serve   serveCommand     `cmd:"" help:"Answer over HTTP and keep the ledger."`
	Check   checkCommand     `cmd:"" help:"Calculate documents without a server: one answer a line."`
	Gate    gateCommand      `cmd:"" help:"Ask a server whether a part may be released: 0 release, 1 hold, 2 could not ask."`
	Verify  verifyCommand    `cmd:"" help:"Check exports of a ledger offline: every entry, proof and recomputation."`
	Migrate migrateCommand   `cmd:"" help:"Bring a database's schema up to date; servers do it too where they may."`
	Key     keyCommands      `cmd:"" help:"Make, list and revoke API keys."`
	Version kong.VersionFlag `help:"Print the version and leave."`
}

// exit ends the program with a code and without a further word.
type exit int

func (e exit) Error() string { return fmt.Sprintf("exit %d", int(e)) }

func main() { os.Exit(run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr)) }

// run is main without the process around it.
func run(args []string, in io.Reader, out, errs io.Writer) int {
	ctx, stop := signal.NotifyContext(context.Background(), syscall.SIGTERM, os.Interrupt)
	defer stop()
	var p program
	code := -1
	parser, err := kong.New(&p,
		kong.Name("jointledger"),
		kong.Description("Pinned lugs and bolted joints by published methods, on a ledger that proves it was only added to."),
		kong.Vars{"version": service.Engine},
		kong.Writers(out, errs),
		kong.Exit(func(c int) { code = c }),
		kong.BindTo(ctx, (*context.Context)(nil)),
		kong.Bind(&streams{in, out, errs}),
		kong.UsageOnError(),
	)
	if err != nil {
		panic(err) // a mistake in the tags above
	}
	parsed, err := parser.Parse(args)
	if code >= 0 {
		return code // help or version
	}
	if err != nil {
		fmt.Fprintf(errs, "jointledger: %s; see jointledger --help\n", err)
		return exitUnusable
	}
	err = parsed.Run()
	var silent exit
	switch {
	case err == nil:
		return exitGood
	case errors.As(err, &silent):
		return int(silent)
	}
	fmt.Fprintf(errs, "jointledger: %s\n", err)
	return exitUnusable
}

// streams are the standard ones.
type streams struct {
	in        io.Reader
	out, errs io.Writer
}

// place says where the ledger is and what signs it.
type place struct {
	Data        string `help:"Folder of the embedded database and the signing key." default:"./jointledger-data" env:"JOINTLEDGER_DATA" placeholder:"DIR"`
	DatabaseURL string `help:"Postgres URL in place of the embedded database; @FILE reads it from a file." env:"JOINTLEDGER_DATABASE_URL" name:"database-url" placeholder:"URL"`
	SigningKey  string `help:"File of the key that signs the ledger, made on first start; by default signing.key in the data folder." env:"JOINTLEDGER_SIGNING_KEY" placeholder:"FILE"`
	Origin      string `help:"Name of the ledger in its checkpoints; the first start fixes it." env:"JOINTLEDGER_ORIGIN" placeholder:"NAME"`
}

// defaultOrigin names a ledger whose owner gave it no name.
const defaultOrigin = "jointledger"

// signer reads the signing key, making it on first use.
func (p place) signer() (*ledger.Signer, error) {
	path := p.SigningKey
	if path == "" {
		path = filepath.Join(p.Data, "signing.key")
	}
	text, err := os.ReadFile(path)
	if errors.Is(err, os.ErrNotExist) {
		text, err = p.makeKey(path)
	}
	if err != nil {
		return nil, fmt.Errorf("cannot use the signing key: %w; --signing-key FILE names another", err)
	}
	signer, err := ledger.NewSigner(text)
	if err != nil {
		return nil, fmt.Errorf("%s is not a signing key: %w", path, err)
	}
	if p.Origin != "" && p.Origin != signer.Origin() {
		return nil, fmt.Errorf("the signing key %s is that of the origin %q, not %q: leave --origin out or give the other key", path, signer.Origin(), p.Origin)
	}
	return signer, nil
}

// makeKey writes a new signing key that only its owner can read. It never
// replaces one.
func (p place) makeKey(path string) ([]byte, error) {
	if err := os.MkdirAll(filepath.Dir(path), 0o700); err != nil {
		return nil, err
	}
	origin := p.Origin
	if origin == "" {
		origin = defaultOrigin
	}
	text, err := ledger.GenerateKey(rand.Reader, origin)
	if err != nil {
		return nil, err
	}
	file, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o600)
	if errors.Is(err, os.ErrExist) {
		return os.ReadFile(path)
	}
	if err != nil {
		return nil, err
	}
	if _, err = file.Write(text); err == nil {
		err = file.Sync()
	}
	return text, errors.Join(err, file.Close())
}

// open opens the store.
func (p place) open(ctx context.Context) (service.Store, error) {
	if p.DatabaseURL == "" {
		if err := os.MkdirAll(p.Data, 0o700); err != nil {
			return nil, fmt.Errorf("cannot make the data folder: %w; --data DIR names another", err)
		}
		return store.OpenSQLite(ctx, filepath.Join(p.Data, "ledger.sqlite"))
	}
	url := p.DatabaseURL
	if path, ok := strings.CutPrefix(url, "@"); ok {
		text, err := os.ReadFile(path)
		if err != nil {
			return nil, fmt.Errorf("cannot read the file of --database-url: %w", err)
		}
		url = strings.TrimSpace(string(text))
	}
	return store.OpenPostgres(ctx, url)
}

// openService opens the service on its store, and returns what closes both.
func (p place) openService(ctx context.Context, setup service.Setup) (_ *service.Service, closeAll func(), _ error) {
	signer, err := p.signer()
	if err != nil {
		return nil, nil, err
	}
	opened, err := p.open(ctx)
	if err != nil {
		return nil, nil, err
	}
	setup.Store, setup.Clock, setup.Signer = opened, service.SystemClock{}, signer
	s, err := service.New(ctx, setup)
	if err != nil {
		return nil, nil, errors.Join(err, opened.Close())
	}
	return s, func() {
		s.Close()
		_ = opened.Close() // every acknowledged append is on disk already
	}, nil
}

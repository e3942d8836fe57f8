package storetest

import (
	"bytes"
	"errors"
	"fmt"
	"net/url"
	"os"
	"os/exec"
	"os/user"
	"path/filepath"
	"runtime"
	"slices"
	"strconv"
	"syscall"
	"time"
)

// Cluster is a Postgres cluster of its own: on a private socket, without a
// network port, and gone with the process that made it.
type Cluster struct {
	dir     string
	bin     string
	owner   *syscall.Credential // nil for this process's own
	running chan error          // of the server, when it runs
	server  *os.Process
	// Log is where the server writes; it is removed with the cluster.
	Log string
}

// patience bounds the start and the stop of a cluster.
const patience = 60 * time.Second

// NewCluster makes a cluster and starts it.
func NewCluster() (*Cluster, error) {
	bin, err := findPostgres()
	if err != nil {
		return nil, err
	}
	owner, err := unprivileged()
	if err != nil {
		return nil, err
	}
	// A socket's path has at most 107 bytes, and a directory below /root
	// cannot be reached by another user.
	dir, err := os.MkdirTemp("/tmp", "jointledger-postgres-")
	if err != nil {
		return nil, err
	}
	c := &Cluster{dir: dir, bin: bin, owner: owner, Log: filepath.Join(dir, "log")}
	if err := c.make(); err != nil {
		return nil, errors.Join(err, os.RemoveAll(dir))
	}
	if err := c.Start(); err != nil {
		return nil, errors.Join(err, os.RemoveAll(dir))
	}
	return c, nil
}

// findPostgres returns the directory with initdb and postgres: the newest of
// Debian's, or that on the PATH.
func findPostgres() (string, error) {
	found, err := filepath.Glob("/usr/lib/postgresql/*/bin/initdb")
	if err != nil {
		return "", err
	}
	slices.SortFunc(found, func(a, b string) int { return version(a) - version(b) })
	if len(found) > 0 {
		return filepath.Dir(found[len(found)-1]), nil
	}
	if path, err := exec.LookPath("initdb"); err == nil {
		return filepath.Dir(path), nil
	}
	return "", errors.New("no Postgres was found, neither in /usr/lib/postgresql nor on the PATH: install it (Debian: apt-get install postgresql)")
}

func version(initdb string) int {
	n, _ := strconv.Atoi(filepath.Base(filepath.Dir(filepath.Dir(initdb)))) // 0 for a name that is no number
	return n
}

// unprivileged returns the credentials of a user that may run Postgres, which
// refuses root.
func unprivileged() (*syscall.Credential, error) {
	if os.Geteuid() != 0 {
		return nil, nil
	}
	for _, name := range []string{"postgres", "nobody"} {
		u, err := user.Lookup(name)
		if err != nil {
			continue
		}
		uid, err1 := strconv.ParseUint(u.Uid, 10, 32)
		gid, err2 := strconv.ParseUint(u.Gid, 10, 32)
		if err1 == nil && err2 == nil {
			return &syscall.Credential{Uid: uint32(uid), Gid: uint32(gid)}, nil
		}
	}
	return nil, errors.New("Postgres does not run as root, and there is neither a user postgres nor a user nobody to run it as")
}

func (c *Cluster) make() error {
	if err := os.Chmod(c.dir, 0o700); err != nil {
		return err
	}
	if c.owner != nil {
		if err := os.Chown(c.dir, int(c.owner.Uid), int(c.owner.Gid)); err != nil {
			return err
		}
	}
	init := c.command("initdb", "--pgdata="+c.data(), "--username=postgres", "--auth=trust", "--encoding=UTF8", "--locale=C.UTF-8", "--no-sync")
	if out, err := init.CombinedOutput(); err != nil {
		return fmt.Errorf("initdb: %w\n%s", err, out)
	}
	return nil
}

func (c *Cluster) data() string { return filepath.Join(c.dir, "data") }

func (c *Cluster) command(name string, args ...string) *exec.Cmd {
	cmd := exec.Command(filepath.Join(c.bin, name), args...)
	cmd.Dir = c.dir
	cmd.Env = append(os.Environ(), "LC_ALL=C.UTF-8", "TZ=UTC")
	cmd.SysProcAttr = &syscall.SysProcAttr{Credential: c.owner, Pdeathsig: syscall.SIGQUIT}
	return cmd
}

// Start starts the server of a stopped cluster and waits until it answers.
func (c *Cluster) Start() error {
	log, err := os.OpenFile(c.Log, os.O_CREATE|os.O_APPEND|os.O_WRONLY, 0o600)
	if err != nil {
		return err
	}
	defer log.Close()
	server := c.command("postgres", "-D", c.data(), "-k", c.dir, "-c", "listen_addresses=", "-c", "max_connections=200", "-c", "shared_buffers=256MB")
	server.Stdout, server.Stderr = log, log
	started, running := make(chan error), make(chan error, 1)
	go func() {
		// The signal on the parent's death follows the thread that forked.
		runtime.LockOSThread()
		err := server.Start()
		started <- err
		if err == nil {
			running <- server.Wait()
		}
	}()
	if err := <-started; err != nil {
		return err
	}
	c.server, c.running = server.Process, running
	for deadline := time.Now().Add(patience); time.Now().Before(deadline); time.Sleep(20 * time.Millisecond) {
		if c.command("pg_isready", "--quiet", "--host="+c.dir, "--timeout=1").Run() == nil {
			return nil
		}
		select {
		case err := <-running:
			c.server = nil
			return fmt.Errorf("postgres ended while starting: %w\n%s", err, c.lastOfLog())
		default:
		}
	}
	return errors.Join(fmt.Errorf("postgres did not answer within %v\n%s", patience, c.lastOfLog()), c.Stop())
}

func (c *Cluster) lastOfLog() []byte {
	text, err := os.ReadFile(c.Log)
	if err != nil {
		return []byte(err.Error())
	}
	lines := bytes.SplitAfter(text, []byte("\n"))
	return bytes.Join(lines[max(0, len(lines)-20):], nil)
}

// Stop stops the server at once, as a crash does: what it acknowledged is on
// disk, and the next start recovers it. A stopped cluster stays so.
func (c *Cluster) Stop() error {
	if c.server == nil {
		return nil
	}
	server := c.server
	c.server = nil
	if err := server.Signal(syscall.SIGQUIT); err != nil && !errors.Is(err, os.ErrProcessDone) {
		return err
	}
	select {
	case <-c.running: // ended; by our signal, thus not with status 0
		return nil
	case <-time.After(patience):
		return fmt.Errorf("postgres did not stop within %v: %w", patience, server.Kill())
	}
}

// Remove stops the cluster and deletes it.
func (c *Cluster) Remove() error { return errors.Join(c.Stop(), os.RemoveAll(c.dir)) }

// Dir is where the cluster's socket is, as PGHOST takes it.
func (c *Cluster) Dir() string { return c.dir }

// Bin is where the engine's own programs are.
func (c *Cluster) Bin() string { return c.bin }

// URL is that of the cluster's first database, as its superuser.
func (c *Cluster) URL() string {
	u := url.URL{Scheme: "postgres", User: url.User("postgres"), Path: "/postgres", RawQuery: url.Values{"host": {c.dir}}.Encode()}
	return u.String()
}

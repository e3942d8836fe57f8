package main

import (
	"bytes"
	"fmt"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"syscall"
	"testing"
	"time"

	"jointledger/store/storetest"
)

// TestOperationsPage runs every command of OPERATIONS.md in its order, in an
// empty folder, beside a Postgres cluster of its own.
func TestOperationsPage(t *testing.T) {
	page, err := os.ReadFile("OPERATIONS.md")
	if err != nil {
		t.Fatal(err)
	}
	var script strings.Builder
	script.WriteString("set -euxo pipefail\n")
	blocks := regexp.MustCompile("(?s)```sh\n(.*?)```").FindAllStringSubmatch(string(page), -1)
	for _, block := range blocks {
		script.WriteString(block[1])
		// So that there is something to back up and to compute again.
		if where := regexp.MustCompile(`key add ada --role admin (.*) >ada.key`).FindStringSubmatch(block[1]); where != nil {
			fmt.Fprintf(&script, "jointledger key add eva --role analyst %s >eva.key\n", where[1])
			script.WriteString(`curl -sS --fail -H "Authorization: Bearer $(cat eva.key)" http://127.0.0.1:8080/v1/records --json @record.json -o /dev/null` + "\n")
		}
	}
	// What an operator types last, to see that all of it did what it says.
	script.WriteString("kill -TERM $proxy $(jobs -p) && wait\n")
	if len(blocks) < 8 {
		t.Fatalf("the page has %d blocks of commands", len(blocks))
	}
	text := script.String()
	for _, port := range []string{"8080", "8081", "8082", "8083"} {
		text = strings.ReplaceAll(text, port, freePort(t))
	}

	cluster, err := storetest.NewCluster()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := cluster.Remove(); err != nil {
			t.Error(err)
		}
	})
	dir, bin := t.TempDir(), t.TempDir()
	program, err := filepath.Abs(os.Args[0])
	if err != nil {
		t.Fatal(err)
	}
	here, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	link := func(target, name string) {
		if err := os.Symlink(target, name); err != nil {
			t.Fatal(err)
		}
	}
	link(program, filepath.Join(bin, "jointledger"))
	link(program, filepath.Join(bin, "jointledger.new"))
	link(filepath.Join(here, "deploy"), filepath.Join(dir, "deploy"))
	write := func(name, text string) {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	write("record.json", string(recordOf("hinge-upper")))
	write("server_password", "invented")
	write("owner_url", fmt.Sprintf("postgres://postgres@/jointledger?host=%s", cluster.Dir()))
	write("server_url", fmt.Sprintf("postgres://jointledger_server:invented@/jointledger?host=%s", cluster.Dir()))

	cmd := exec.Command("bash", "-c", text)
	cmd.Dir = dir
	cmd.Env = append(os.Environ(), asProgram+"=1", "PATH="+bin+":"+cluster.Bin()+":"+os.Getenv("PATH"),
		"PGHOST="+cluster.Dir(), "PGUSER=postgres", "PGDATABASE=jointledger")
	cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true}
	var out bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &out
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	overdue := time.AfterFunc(2*time.Minute, func() { _ = syscall.Kill(-cmd.Process.Pid, syscall.SIGKILL) })
	err = cmd.Wait()
	overdue.Stop()
	_ = syscall.Kill(-cmd.Process.Pid, syscall.SIGKILL) // servers, after a failure
	if err != nil {
		t.Fatalf("%v\n%s", err, &out)
	}
	t.Log(&out)
	if n := strings.Count(out.String(), "holds: 3 entries of jointledger, each exactly as signed; 1 records"); n != 3 {
		t.Errorf("%d of 3 backups were proven", n)
	}
	checkSecrets(t, dir)
}

// checkSecrets looks where secrets must not be: in modes that others can read,
// and in logs.
func checkSecrets(t *testing.T, dir string) {
	t.Helper()
	var secrets []string
	for _, name := range []string{"data/signing.key", "backup/signing.key", "signing.key", "ada.key", "ben.key", "eva.key", "server_password"} {
		path := filepath.Join(dir, name)
		text, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		secrets = append(secrets, strings.TrimSpace(string(text)))
		if info, err := os.Stat(path); strings.HasSuffix(name, "signing.key") && (err != nil || info.Mode().Perm() != 0o600) {
			t.Errorf("%s: %v, %v", name, info.Mode(), err)
		}
	}
	logs, err := filepath.Glob(filepath.Join(dir, "serve*.log"))
	if err != nil || len(logs) != 4 {
		t.Fatalf("the logs are %q: %v", logs, err)
	}
	for _, path := range logs {
		text, err := os.ReadFile(path)
		if err != nil || len(text) == 0 {
			t.Errorf("%s: %d bytes, %v", path, len(text), err)
		}
		for _, secret := range secrets {
			if strings.Contains(string(text), secret) {
				t.Errorf("%s has a secret", path)
			}
		}
	}
}

// freePort is a port of the loopback that was free a moment ago.
func freePort(t testing.TB) string {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	_, port, err := net.SplitHostPort(l.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	return port
}

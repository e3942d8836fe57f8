package main

import (
	"bufio"
	"fmt"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// trace attaches strace to a server. It writes what it saw to a file and, where
// an injection is given, makes a call of the system fail or kills the server
// at it. Detach before reading the file.
func trace(t *testing.T, s *server, log, injection string) (detach func()) {
	t.Helper()
	strace, err := exec.LookPath("strace")
	if err != nil {
		t.Fatal("strace is needed to make calls of the system fail: run make test, which installs it, or install it (Debian: apt-get install strace)")
	}
	args := []string{"-f", "-p", strconv.Itoa(s.cmd.Process.Pid), "-o", log, "-e", "trace=fsync,pwrite64"}
	if injection != "" {
		args = append(args, "-e", "inject="+injection)
	}
	cmd := exec.Command(strace, args...)
	said, err := cmd.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	// It says a line when it has attached to all threads.
	line, err := bufio.NewReader(said).ReadString('\n')
	if err != nil || !strings.Contains(line, "attached") {
		t.Fatalf("strace cannot trace: %s %v", line, err)
	}
	return func() {
		_ = cmd.Process.Signal(syscall.SIGINT) // it may have ended with the server
		// It now and then waits for ever for a server that it has killed.
		late := time.AfterFunc(2*time.Second, func() { _ = cmd.Process.Kill() })
		defer late.Stop()
		_ = cmd.Wait() // its status is the signal
	}
}

// callsOf counts the calls of a kind in a log of strace.
func callsOf(t *testing.T, log, what string) int {
	t.Helper()
	text, err := os.ReadFile(log)
	if err != nil {
		t.Fatal(err)
	}
	return strings.Count(string(text), what)
}

// Each write and each fsync of an append fails, or is the server's last: what
// was acknowledged is there once, and the log verifies.
func TestFailingDisk(t *testing.T) {
	base := filepath.Join(t.TempDir(), "base")
	s := start(t, "--data", base)
	if response, body, err := post(s.url+"/v1/records", recordOf("before"), "before"); err != nil || response.StatusCode != http.StatusCreated {
		t.Fatalf("%v %s", err, body)
	}
	_ = s.stop(t, syscall.SIGTERM)

	fresh := func() (data, log string) {
		data = filepath.Join(t.TempDir(), "data")
		if err := os.CopyFS(data, os.DirFS(base)); err != nil {
			t.Fatal(err)
		}
		if err := os.Chmod(filepath.Join(data, "signing.key"), 0o600); err != nil {
			t.Fatal(err)
		}
		return data, filepath.Join(filepath.Dir(data), "strace")
	}
	// Which calls an append makes, counted once without a fault.
	data, log := fresh()
	s = start(t, "--data", data)
	detach := trace(t, s, log, "")
	if response, body, err := post(s.url+"/v1/records", recordOf("hit"), "hit"); err != nil || response.StatusCode != http.StatusCreated {
		t.Fatalf("%v %s", err, body)
	}
	detach()
	_ = s.stop(t, syscall.SIGKILL)
	calls := map[string]int{}
	for _, call := range []string{"pwrite64", "fsync"} {
		if calls[call] = callsOf(t, log, " "+call+"("); calls[call] == 0 {
			t.Fatalf("an append makes no %s, so nothing was traced or nothing is on disk", call)
		}
	}

	most := 3 // points a call and fault
	if os.Getenv("JOINTLEDGER_SOAK_KILLS") != "" {
		most = 1000
	}
	for call, points := range calls {
		for _, fault := range []string{"error=EIO", "signal=KILL"} {
			hits := 0
			for n := 1; n <= points; n += max(1, points/most) {
				t.Run(fmt.Sprintf("%s %s at %d of %d", call, fault, n, points), func(t *testing.T) {
					data, log := fresh()
					s := start(t, "--data", data)
					detach := trace(t, s, log, fmt.Sprintf("%s:%s:when=%d", call, fault, n))
					response, body, err := post(s.url+"/v1/records", recordOf("hit"), "hit")
					acknowledged := err == nil && response.StatusCode == http.StatusCreated
					if err == nil && !acknowledged && response.StatusCode != http.StatusServiceUnavailable {
						t.Errorf("answered %d %s", response.StatusCode, body)
					}
					detach()
					_ = s.stop(t, syscall.SIGKILL)
					// strace counts by thread, and an append may move to
					// another: not every late point is reached.
					if callsOf(t, log, "INJECTED")+callsOf(t, log, "killed by SIGKILL") > 0 {
						hits++
					}
					retryOnce(t, data, acknowledged)
				})
			}
			if hits == 0 {
				t.Errorf("%s: no %s was ever injected", call, fault)
			}
			t.Logf("%s %s: %d hit", call, fault, hits)
		}
	}
}

// retryOnce starts a server on what a fault left: what was acknowledged is
// there, and the retry with the same key gives one record in a log that
// verifies.
func retryOnce(t *testing.T, data string, acknowledged bool) {
	t.Helper()
	s := start(t, "--data", data)
	there := func() bool {
		status, list := get(t, s.url+"/v1/records?joint=hit")
		return status == http.StatusOK && strings.Count(string(list), `"index"`) == 1
	}
	if acknowledged && !there() {
		t.Error("it was acknowledged and is not there")
	}
	response, body, err := post(s.url+"/v1/records", recordOf("hit"), "hit")
	if err != nil || response.StatusCode != http.StatusCreated {
		t.Fatalf("the retry: %v %s", err, body)
	}
	if !there() {
		t.Error("after the retry it is not there once")
	}
	if out := verifyExport(t, s.url, 0); !strings.Contains(out, "2 entries") {
		t.Errorf("verify says %s", out)
	}
	_ = s.stop(t, syscall.SIGTERM)
}

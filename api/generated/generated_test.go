// Package generated holds openapi.yaml to its use by a general generator: the
// client that comes out compiles and calls a server. It is a module of its own,
// so that the program does not depend on what the generator does.
package generated

import (
	"bufio"
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// serve builds the program and starts it.
func serve(t *testing.T) (url string) {
	t.Helper()
	program := filepath.Join(t.TempDir(), "jointledger")
	build := exec.Command("go", "build", "-o", program, ".")
	build.Dir = filepath.Join("..", "..")
	if out, err := build.CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	server := exec.Command(program, "serve", "--listen", "127.0.0.1:0", "--data", t.TempDir())
	log, err := server.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := server.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		_ = server.Process.Kill() // it may have ended
		_ = server.Wait()
	})
	address := make(chan string, 1)
	go func() {
		for lines := bufio.NewScanner(log); lines.Scan(); {
			var line struct{ Msg, Address string }
			if json.Unmarshal(lines.Bytes(), &line) == nil && line.Msg == "serving" {
				address <- line.Address
			}
		}
	}()
	select {
	case url = <-address:
	case <-time.After(30 * time.Second):
		t.Fatal("the server does not serve")
	}
	return url
}

func TestAGeneratedClientCallsTheServer(t *testing.T) {
	dir := t.TempDir()
	for from, to := range map[string]string{"go.mod": "go.mod", "go.sum": "go.sum", "testdata/caller.go": "caller.go"} {
		text, err := os.ReadFile(from)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, to), text, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	generate := exec.Command("go", "tool", "oapi-codegen", "-generate", "types,client", "-package", "main",
		"-o", filepath.Join(dir, "client.go"), "../../openapi.yaml")
	if out, err := generate.CombinedOutput(); err != nil {
		t.Fatalf("no client can be generated: %v\n%s", err, out)
	}
	client, err := os.ReadFile(filepath.Join(dir, "client.go"))
	if err != nil {
		t.Fatal(err)
	}
	if strings.Contains(string(client), "float32") {
		t.Error("the generated client rounds numbers to 24 bits: a number in openapi.yaml has no format: double")
	}
	call := exec.Command("go", "run", ".", serve(t))
	call.Dir = dir
	out, err := call.CombinedOutput()
	if err != nil {
		t.Fatalf("the generated client does not work: %v\n%s", err, out)
	}
	// The margin of the README's first example.
	const want = "adequate 0.09782515717608153\nhold no-record\n422 /lug/thickness\n"
	if string(out) != want {
		t.Errorf("the generated client says\n%swant\n%s", out, want)
	}
}

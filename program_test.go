package main

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"

	"jointledger/store/storetest"
)

// asProgram makes the test binary be the program itself, so that tests can
// start, signal and kill it.
const asProgram = "JOINTLEDGER_TEST_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		main()
		return
	}
	testscript.Main(m, map[string]func(){"jointledger": main})
}

// The scripts in testdata/program use the command line as a person does.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{Dir: "testdata/program"})
}

// asProcess prepares the program with arguments.
func asProcess(args ...string) *exec.Cmd {
	cmd := exec.Command(os.Args[0], args...)
	cmd.Env = append(os.Environ(), asProgram+"=1")
	return cmd
}

// server is a running program.
type server struct {
	cmd *exec.Cmd
	url string
	log *bytes.Buffer
	end chan error
}

// start starts a server on a free port and waits until it serves.
func start(t testing.TB, args ...string) *server {
	t.Helper()
	cmd := asProcess(append([]string{"serve", "--listen", "127.0.0.1:0"}, args...)...)
	s := &server{cmd: cmd, log: &bytes.Buffer{}, end: make(chan error, 1)}
	pipe, err := s.cmd.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := s.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = s.cmd.Process.Kill() })
	address := make(chan string, 1)
	go func() {
		lines := bufio.NewScanner(pipe)
		lines.Buffer(nil, 1<<20)
		for lines.Scan() {
			s.log.Write(append(lines.Bytes(), '\n'))
			var line struct{ Msg, Address string }
			if json.Unmarshal(lines.Bytes(), &line) == nil && line.Msg == "serving" {
				address <- line.Address
			}
		}
		s.end <- s.cmd.Wait()
	}()
	select {
	case s.url = <-address:
	case err := <-s.end:
		t.Fatalf("the server ended: %v\n%s", err, s.log)
	case <-time.After(30 * time.Second):
		t.Fatalf("the server does not serve")
	}
	return s
}

// stop signals the server and returns how it ended.
func (s *server) stop(t testing.TB, signal syscall.Signal) error {
	t.Helper()
	if err := s.cmd.Process.Signal(signal); err != nil && !errors.Is(err, os.ErrProcessDone) {
		t.Fatal(err)
	}
	select {
	case err := <-s.end:
		return err
	case <-time.After(60 * time.Second):
		t.Fatal("the server did not end")
		return nil
	}
}

var httpClient = &http.Client{Timeout: 20 * time.Second}

func get(t testing.TB, url string) (int, []byte) {
	t.Helper()
	response, err := httpClient.Get(url)
	if err != nil {
		t.Fatal(err)
	}
	defer response.Body.Close()
	body, err := io.ReadAll(response.Body)
	if err != nil {
		t.Fatal(err)
	}
	return response.StatusCode, body
}

// post sends JSON; a broken connection is an error.
func post(url string, body []byte, key string) (*http.Response, []byte, error) {
	request, err := http.NewRequest(http.MethodPost, url, bytes.NewReader(body))
	if err != nil {
		return nil, nil, err
	}
	request.Header.Set("Content-Type", "application/json")
	if key != "" {
		request.Header.Set("Idempotency-Key", key)
	}
	response, err := httpClient.Do(request)
	if err != nil {
		return nil, nil, err
	}
	defer response.Body.Close()
	answer, err := io.ReadAll(response.Body)
	return response, answer, err
}

// hinge is the lug of the README's first example.
const hinge = `{"units": "US", "title": "boom hinge, upper lug", "methods": ["elementary"],
  "lug": {"shape": "round", "width": 2, "thickness": 0.5, "hole_diameter": 0.75, "edge_distance": 1.125,
          "material": "7050-T7451-plate-0.250-1.500-L"},
  "factors": {"ultimate": 1.5, "fitting": 1.15},
  "load_cases": [{"id": "LC1", "level": "limit", "force": 18000, "angle": 0}]}`

func recordOf(joint string) []byte {
	return fmt.Appendf(nil, `{"subject":{"part":"SM-1200","revision":"B","joint":%q},"geometry_digest":"g1","kind":"lug","input":%s}`, joint, hinge)
}

// eachStore runs a test with the arguments that put the ledger on each engine.
func eachStore(t *testing.T, test func(t *testing.T, args []string)) {
	t.Run("SQLite", func(t *testing.T) { test(t, []string{"--data", filepath.Join(t.TempDir(), "data")}) })
	t.Run("Postgres", func(t *testing.T) {
		test(t, []string{"--data", filepath.Join(t.TempDir(), "data"), "--database-url", storetest.Database(t)})
	})
}

// Twenty callers record while the server is killed and started again: every
// record that was acknowledged is there once, and the log verifies.
func TestKilledServerLosesNothing(t *testing.T) {
	kills := 10
	if soak := os.Getenv("JOINTLEDGER_SOAK_KILLS"); soak != "" {
		var err error
		if kills, err = strconv.Atoi(soak); err != nil {
			t.Fatal(err)
		}
	}
	eachStore(t, func(t *testing.T, args []string) {
		var mu sync.Mutex
		s := start(t, args...)
		address := func() string {
			mu.Lock()
			defer mu.Unlock()
			return s.url
		}
		ctx, cancel := context.WithCancel(context.Background())
		defer cancel()
		var acknowledged sync.Map // joint → id
		var work sync.WaitGroup
		for c := range 20 {
			work.Go(func() {
				for i := 0; ctx.Err() == nil; i++ {
					joint := fmt.Sprintf("joint-%d-%d", c, i)
					id, err := recordUntilAnswered(address, joint)
					if err != nil {
						t.Error(err)
						return
					}
					acknowledged.Store(joint, id)
				}
			})
		}
		for range kills {
			time.Sleep(250 * time.Millisecond)
			_ = s.stop(t, syscall.SIGKILL)
			next := start(t, args...)
			mu.Lock()
			s = next
			mu.Unlock()
		}
		time.Sleep(250 * time.Millisecond)
		cancel()
		work.Wait()

		count := compareWithListed(t, s.url, &acknowledged)
		if count < kills {
			t.Errorf("only %d records were acknowledged", count)
		}
		t.Logf("%d records over %d kills", count, kills)
		verifyExport(t, s.url, 0)
	})
}

// verifyExport takes the export and the key from a server and verifies them
// with the command.
func verifyExport(t testing.TB, url string, want int) string {
	t.Helper()
	dir := t.TempDir()
	for name, path := range map[string]string{"export": "/v1/export", "key": "/v1/ledger/key"} {
		status, body := get(t, url+path)
		if status != http.StatusOK {
			t.Fatalf("%s: %d", path, status)
		}
		if err := os.WriteFile(filepath.Join(dir, name), body, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	var out bytes.Buffer
	if code := run([]string{"verify", "--key", filepath.Join(dir, "key"), filepath.Join(dir, "export")}, nil, &out, io.Discard); code != want {
		t.Errorf("verify exits %d: %s", code, &out)
	}
	return out.String()
}

func TestPostgresLostAndBack(t *testing.T) {
	cluster, err := storetest.NewCluster()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := cluster.Remove(); err != nil {
			t.Error(err)
		}
	})
	s := start(t, "--data", t.TempDir(), "--database-url", cluster.URL())
	expect := func(path, body string, want int) {
		t.Helper()
		var status int
		var header http.Header
		if body == "" {
			response, err := httpClient.Get(s.url + path)
			if err != nil {
				t.Fatal(err)
			}
			response.Body.Close()
			status, header = response.StatusCode, response.Header
		} else {
			response, _, err := post(s.url+path, []byte(body), "")
			if err != nil {
				t.Fatal(err)
			}
			status, header = response.StatusCode, response.Header
		}
		if status != want {
			t.Errorf("%s: %d, want %d", path, status, want)
		}
		if want == http.StatusServiceUnavailable && header.Get("Retry-After") == "" {
			t.Errorf("%s: 503 without Retry-After", path)
		}
	}
	expect("/v1/records", string(recordOf("before")), http.StatusCreated)
	if err := cluster.Stop(); err != nil {
		t.Fatal(err)
	}
	expect("/v1/records", string(recordOf("without")), http.StatusServiceUnavailable)
	expect("/v1/records", "", http.StatusServiceUnavailable)
	expect("/readyz", "", http.StatusServiceUnavailable)
	expect("/healthz", "", http.StatusOK)
	expect("/v1/lugs", hinge, http.StatusOK)
	if err := cluster.Start(); err != nil {
		t.Fatal(err)
	}
	for deadline := time.Now().Add(20 * time.Second); ; time.Sleep(100 * time.Millisecond) {
		if status, _ := get(t, s.url+"/readyz"); status == http.StatusOK {
			break
		}
		if time.Now().After(deadline) {
			t.Fatal("the server did not recover")
		}
	}
	expect("/v1/records", string(recordOf("after")), http.StatusCreated)
	verifyExport(t, s.url, 0)
}

func TestStartSaysWhatToDo(t *testing.T) {
	for name, c := range map[string]struct {
		args []string
		want string
	}{
		"Postgres unreachable": {[]string{"serve", "--data", t.TempDir(), "--listen", "127.0.0.1:0", "--database-url", "postgres://nobody@127.0.0.1:1/none"}, "database"},
		"public address":       {[]string{"serve", "--data", t.TempDir(), "--listen", "0.0.0.0:0"}, "jointledger key add"},
		"bad policies":         {[]string{"serve", "--data", t.TempDir(), "--listen", "127.0.0.1:0", "--policies", "/dev/null"}, "policies"},
		"no command":           {nil, "serve"},
		"unknown flag":         {[]string{"serve", "--lisen", "x"}, "--lisen"},
		"bad listen":           {[]string{"serve", "--data", t.TempDir(), "--listen", "nowhere"}, "--listen"},
	} {
		t.Run(name, func(t *testing.T) {
			var errs bytes.Buffer
			if code := run(c.args, nil, io.Discard, &errs); code != exitUnusable || !strings.Contains(errs.String(), c.want) {
				t.Errorf("exits %d and says %s", code, &errs)
			}
			if strings.Count(errs.String(), "\n") > 3 && name != "no command" {
				t.Errorf("says too much: %s", &errs)
			}
		})
	}
}

func TestTermDrains(t *testing.T) {
	s := start(t, "--data", t.TempDir())
	// A request that has begun is answered though the server was told to go.
	reader, writer := io.Pipe()
	request, err := http.NewRequest(http.MethodPost, s.url+"/v1/lugs", reader)
	if err != nil {
		t.Fatal(err)
	}
	request.Header.Set("Content-Type", "application/json")
	answered := make(chan int, 1)
	go func() {
		response, err := httpClient.Do(request)
		if err != nil {
			t.Error(err)
			answered <- 0
			return
		}
		response.Body.Close()
		answered <- response.StatusCode
	}()
	if _, err := io.WriteString(writer, hinge[:100]); err != nil {
		t.Fatal(err)
	}
	time.Sleep(200 * time.Millisecond)
	if err := s.cmd.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	time.Sleep(500 * time.Millisecond)
	if _, err := io.WriteString(writer, hinge[100:]); err != nil {
		t.Fatal(err)
	}
	writer.Close()
	if status := <-answered; status != http.StatusOK {
		t.Errorf("the request was answered %d", status)
	}
	select {
	case err := <-s.end:
		if err != nil {
			t.Errorf("the server ended with %v\n%s", err, s.log)
		}
	case <-time.After(30 * time.Second):
		t.Error("the server did not end")
	}
}

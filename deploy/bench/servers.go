package main

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"net"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"syscall"
	"time"

	"jointledger/store/storetest"
)

// process is a server under measurement.
type process struct {
	cmd   *exec.Cmd
	url   string
	key   string        // API key of an approver, empty for none
	ready time.Duration // from its start to its first readiness
}

func freeAddress() (string, error) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return "", err
	}
	defer l.Close()
	return l.Addr().String(), nil
}

// launch starts a server and waits until it answers 200 under a path.
func launch(path, listen string, cmd *exec.Cmd) (*process, error) {
	// It ends with this process, whose thread must stay for that.
	runtime.LockOSThread()
	cmd.SysProcAttr = &syscall.SysProcAttr{Pdeathsig: syscall.SIGKILL}
	p := &process{cmd: cmd, url: "http://" + listen}
	start := time.Now()
	if err := cmd.Start(); err != nil {
		return nil, err
	}
	client := http.Client{Timeout: time.Second, Transport: &http.Transport{DisableKeepAlives: true}}
	for {
		response, err := client.Get(p.url + path)
		if err == nil {
			response.Body.Close()
			if response.StatusCode == http.StatusOK {
				p.ready = time.Since(start)
				return p, nil
			}
		}
		if time.Since(start) > 30*time.Second {
			return nil, errors.Join(fmt.Errorf("%s does not become ready: %w", cmd.Path, err), cmd.Process.Kill())
		}
		time.Sleep(time.Millisecond)
	}
}

// ledgers makes a folder and a Postgres cluster for ledgers; the cluster is gone
// after remove.
func (b *bench) ledgers() (data string, cluster *storetest.Cluster, remove func(), err error) {
	if data, err = os.MkdirTemp(b.dir, "data-"); err != nil {
		return "", nil, nil, err
	}
	if cluster, err = storetest.NewCluster(); err != nil {
		return "", nil, nil, err
	}
	return data, cluster, func() { _ = cluster.Remove() }, nil
}

// serve starts the program with a key on a ledger.
func (b *bench) serve(where ...string) (*process, error) {
	key, err := exec.Command(b.program, append([]string{"key", "add", "bench", "--role", "approver"}, where...)...).Output()
	if err != nil {
		return nil, fmt.Errorf("making a key: %w", err)
	}
	p, err := b.serveOnly(where...)
	if err == nil {
		p.key = strings.TrimSpace(string(key))
	}
	return p, err
}

func (b *bench) serveOnly(where ...string) (*process, error) {
	listen, err := freeAddress()
	if err != nil {
		return nil, err
	}
	return launch("/readyz", listen, exec.Command(b.program, append([]string{"serve", "--listen", listen}, where...)...))
}

// bare starts the handler that only decodes and encodes.
func (b *bench) bare() (*process, error) {
	listen, err := freeAddress()
	if err != nil {
		return nil, err
	}
	return launch("/readyz", listen, exec.Command(b.self, bareWord, listen))
}

func (p *process) stop() error {
	if err := p.cmd.Process.Signal(syscall.SIGTERM); err != nil {
		return err
	}
	return p.cmd.Wait()
}

// memory is a line of the process's status, in MiB.
func (p *process) memory(name string) float64 {
	text := field("/proc/"+strconv.Itoa(p.cmd.Process.Pid)+"/status", name)
	kib, _ := strconv.ParseFloat(strings.Fields(text + " 0")[0], 64) // 0 where it is unknown
	return kib / 1024
}

// processor is the time that the process has used, in seconds.
func (p *process) processor() float64 {
	stat := read("/proc/" + strconv.Itoa(p.cmd.Process.Pid) + "/stat")
	fields := strings.Fields(stat[strings.LastIndexByte(stat, ')')+1:])
	user, _ := strconv.ParseFloat(fields[11], 64)
	system, _ := strconv.ParseFloat(fields[12], 64)
	return (user + system) / 100 // USER_HZ
}

// wrk puts as much load on as the server takes, and returns requests a second.
func (b *bench) wrk(p *process, path string, body []byte, connections int) (float64, error) {
	script := filepath.Join(b.dir, "post.lua")
	text := fmt.Sprintf("wrk.method = \"POST\"\nwrk.headers[\"Content-Type\"] = \"application/json\"\nwrk.headers[\"Authorization\"] = \"Bearer %s\"\nwrk.body = [==[%s]==]\n"+
		"done = function(s) io.write(string.format(\"bad %%d\\n\", s.errors.status + s.errors.read + s.errors.write + s.errors.timeout)) end\n", p.key, body)
	if err := os.WriteFile(script, []byte(text), 0o600); err != nil {
		return 0, err
	}
	out, err := exec.Command("wrk", "-t2", "-c"+strconv.Itoa(connections), "-d"+strconv.Itoa(max(1, int(b.each.Seconds())))+"s", "-s", script, p.url+path).CombinedOutput()
	if err != nil {
		return 0, fmt.Errorf("wrk (Debian: apt-get install wrk): %w\n%s", err, out)
	}
	if !strings.Contains(string(out), "bad 0\n") {
		return 0, fmt.Errorf("wrk had answers that are no success:\n%s", out)
	}
	lines := bufio.NewScanner(bytes.NewReader(out))
	for lines.Scan() {
		if value, ok := strings.CutPrefix(lines.Text(), "Requests/sec:"); ok {
			return strconv.ParseFloat(strings.TrimSpace(value), 64)
		}
	}
	return 0, fmt.Errorf("wrk says no rate:\n%s", out)
}

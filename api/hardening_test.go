package api_test

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"log/slog"
	"net"
	"net/http"
	"net/http/httptest"
	"runtime"
	"strings"
	"sync"
	"testing"
	"time"

	"jointledger/api"
	"jointledger/service"
	"jointledger/store/storetest"
)

// target is a server under attack: open, on an empty SQLite file.
type target struct {
	address string
	service *service.Service
	log     *lockedBuffer
}

// attacked starts a server whose limits of time a test may shorten first.
func attacked(t *testing.T, change func(*http.Server)) target {
	t.Helper()
	signer := storetest.Signer(t)
	policies, err := service.NewPolicies(nil)
	if err != nil {
		t.Fatal(err)
	}
	written := &lockedBuffer{}
	log := slog.New(slog.NewJSONHandler(written, nil))
	metrics := api.NewMetrics(log)
	s, err := service.New(context.Background(), service.Setup{
		Store: storetest.SQLite(t), Clock: service.SystemClock{}, Signer: signer, Policies: policies, Watch: metrics,
	})
	if err != nil {
		t.Fatal(err)
	}
	server := httptest.NewUnstartedServer(nil)
	server.Config = api.Serve(api.New(s, api.Options{Log: log, Metrics: metrics}), log)
	server.Config.ConnState = metrics.Connection
	if change != nil {
		change(server.Config)
	}
	// httptest follows connections by the same hook; each is told.
	server.Start()
	t.Cleanup(func() {
		server.CloseClientConnections()
		server.Close()
		s.Close()
	})
	return target{server.Listener.Addr().String(), s, written}
}

type lockedBuffer struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (l *lockedBuffer) Write(p []byte) (int, error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.b.Write(p)
}

func (l *lockedBuffer) String() string {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.b.String()
}

func (a target) dial(t *testing.T) net.Conn {
	t.Helper()
	c, err := net.Dial("tcp", a.address)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	return c
}

// send writes a request as it is and returns the status of the answer, 0 for a
// connection that was closed without one.
func (a target) send(t *testing.T, request string) int {
	t.Helper()
	c := a.dial(t)
	go func() { _, _ = io.WriteString(c, request) }() // the server may close first
	return status(t, c, 20*time.Second)
}

func status(t *testing.T, c net.Conn, within time.Duration) int {
	t.Helper()
	if err := c.SetReadDeadline(time.Now().Add(within)); err != nil {
		t.Fatal(err)
	}
	response, err := http.ReadResponse(bufio.NewReader(c), nil)
	if err != nil {
		if timeout, ok := err.(net.Error); ok && timeout.Timeout() {
			t.Errorf("no answer and no end within %s", within)
		}
		return 0
	}
	defer response.Body.Close()
	return response.StatusCode
}

// drip sends a byte every so often until the other side closes, and returns how
// long that took.
func drip(t *testing.T, c net.Conn, begin string, every, patience time.Duration) time.Duration {
	t.Helper()
	start := time.Now()
	if _, err := io.WriteString(c, begin); err != nil {
		t.Fatal(err)
	}
	closed := make(chan struct{})
	go func() {
		_, _ = io.Copy(io.Discard, c)
		close(closed)
	}()
	for {
		select {
		case <-closed:
			return time.Since(start)
		case <-time.After(every):
		}
		if time.Since(start) > patience {
			t.Errorf("still open after %s", patience)
			return patience
		}
		_, _ = io.WriteString(c, "x") // an error is the close that is waited for
	}
}

// healthy fails unless an honest caller is answered at once.
func (a target) healthy(t *testing.T) {
	t.Helper()
	client := http.Client{Timeout: 5 * time.Second, Transport: &http.Transport{DisableKeepAlives: true}}
	response, err := client.Get("http://" + a.address + "/v1/records")
	if err != nil {
		t.Fatal(err)
	}
	response.Body.Close()
	if response.StatusCode != http.StatusOK {
		t.Errorf("an honest caller is answered %d", response.StatusCode)
	}
}

func (a target) metric(t *testing.T, name string) string {
	t.Helper()
	response, err := http.Get("http://" + a.address + "/metrics")
	if err != nil {
		t.Fatal(err)
	}
	defer response.Body.Close()
	lines := bufio.NewScanner(response.Body)
	for lines.Scan() {
		if value, ok := strings.CutPrefix(lines.Text(), name+" "); ok {
			return value
		}
	}
	t.Fatalf("no metric %s", name)
	return ""
}

func TestEverythingHasADeadline(t *testing.T) {
	s := api.Serve(http.NotFoundHandler(), slog.New(slog.DiscardHandler))
	for name, d := range map[string]time.Duration{
		"header": s.ReadHeaderTimeout, "read": s.ReadTimeout, "write": s.WriteTimeout, "idle": s.IdleTimeout,
	} {
		if d <= 0 || d > 2*time.Minute {
			t.Errorf("the %s deadline is %s", name, d)
		}
	}
	if s.MaxHeaderBytes != api.MostHeader {
		t.Errorf("headers of %d bytes are taken", s.MaxHeaderBytes)
	}
}

func TestSlowHeaders(t *testing.T) {
	a := attacked(t, func(s *http.Server) { s.ReadHeaderTimeout = 300 * time.Millisecond })
	var all sync.WaitGroup
	for range 50 {
		c := a.dial(t)
		all.Go(func() {
			if took := drip(t, c, "GET /healthz HTTP/1.1\r\nHost: localhost\r\nX-Slow: ", 50*time.Millisecond, 10*time.Second); took < 250*time.Millisecond {
				t.Errorf("cut after %s already", took)
			}
		})
	}
	a.healthy(t)
	all.Wait()
}

func TestSlowBodies(t *testing.T) {
	a := attacked(t, func(s *http.Server) { s.ReadTimeout = 500 * time.Millisecond })
	var all sync.WaitGroup
	for range 50 {
		c := a.dial(t)
		all.Go(func() {
			drip(t, c, "POST /v1/lugs HTTP/1.1\r\nHost: localhost\r\nContent-Type: application/json\r\nContent-Length: 1000\r\n\r\n{", 50*time.Millisecond, 10*time.Second)
		})
	}
	a.healthy(t)
	all.Wait()
	for deadline := time.Now().Add(5 * time.Second); a.metric(t, "jointledger_requests_in_flight") != "1"; time.Sleep(50 * time.Millisecond) {
		if time.Now().After(deadline) {
			t.Fatal("requests of slow bodies are still running")
		}
	}
}

// TestIdleConnections: those that say nothing, before a request and between
// two, are closed.
func TestIdleConnections(t *testing.T) {
	a := attacked(t, func(s *http.Server) { s.ReadHeaderTimeout, s.IdleTimeout = 300*time.Millisecond, 300*time.Millisecond })
	silent, resting := a.dial(t), a.dial(t)
	if _, err := io.WriteString(resting, "GET /healthz HTTP/1.1\r\nHost: localhost\r\n\r\n"); err != nil {
		t.Fatal(err)
	}
	for name, c := range map[string]net.Conn{"silent": silent, "resting": resting} {
		if err := c.SetReadDeadline(time.Now().Add(10 * time.Second)); err != nil {
			t.Fatal(err)
		}
		if _, err := io.Copy(io.Discard, c); err != nil {
			t.Errorf("a %s connection: %v", name, err)
		}
	}
}

func TestHeaders(t *testing.T) {
	a := attacked(t, nil)
	lines := func(n, size int) string {
		var b strings.Builder
		b.WriteString("GET /v1/records HTTP/1.1\r\nHost: localhost\r\nConnection: close\r\n")
		for i := range n {
			fmt.Fprintf(&b, "X-%d: %s\r\n", i, strings.Repeat("x", size))
		}
		return b.String() + "\r\n"
	}
	for name, c := range map[string]struct {
		request string
		want    int
	}{
		"many, within the limit": {lines(1000, 40), 200},
		"many, over the limit":   {lines(10_000, 40), 431},
		"one, within the limit":  {lines(1, api.MostHeader-1024), 200},
		"one, over the limit":    {lines(1, api.MostHeader+8192), 431},
		"without end":            {"GET /v1/records HTTP/1.1\r\nHost: localhost\r\nX: " + strings.Repeat("x", 4<<20), 431},
		"no host":                {"GET /v1/records HTTP/1.1\r\n\r\n", 400},
		"two lengths":            {"POST /v1/lugs HTTP/1.1\r\nHost: localhost\r\nContent-Length: 1\r\nContent-Length: 2\r\n\r\n{}", 400},
		"two kinds of length":    {"POST /v1/lugs HTTP/1.1\r\nHost: localhost\r\nContent-Length: 2\r\nTransfer-Encoding: gzip, chunked\r\n\r\n{}", 501},
		"a space too many":       {"GET /v1/records HTTP/1.1\r\nHost: localhost\r\nX : y\r\n\r\n", 400},
		"no HTTP":                {"\x16\x03\x01\x02\x00\x01\x00\x01\xfc\x03\x03\r\n\r\n", 400},
	} {
		t.Run(name, func(t *testing.T) {
			if found := a.send(t, c.request); found != c.want {
				t.Errorf("%d, want %d", found, c.want)
			}
		})
	}
	a.healthy(t)
}

// TestDeepJSON: nesting is refused at its limit, long before a stack or the
// processor feels it, wherever any value may stand.
func TestDeepJSON(t *testing.T) {
	a := attacked(t, nil)
	for _, frame := range []string{
		"%s",
		`{"units":"SI","lug":%s}`,
		`{"units":"SI","method_options":{"elementary":{"x":%s}}}`,
	} {
		for _, depth := range []int{33, 1000, 1_000_000} {
			for name, value := range map[string]string{
				"arrays":  strings.Repeat("[", depth) + strings.Repeat("]", depth),
				"objects": strings.Repeat(`{"a":`, depth) + "1" + strings.Repeat("}", depth),
				"open":    strings.Repeat("[", depth),
			} {
				body := fmt.Sprintf(frame, value)
				start := time.Now()
				response, err := http.Post("http://"+a.address+"/v1/lugs", "application/json", strings.NewReader(body))
				if err != nil {
					t.Fatal(err)
				}
				response.Body.Close()
				if response.StatusCode != http.StatusBadRequest {
					t.Errorf("%d %s in %s: %d", depth, name, frame, response.StatusCode)
				}
				if took := time.Since(start); took > 5*time.Second {
					t.Errorf("%d %s in %s took %s", depth, name, frame, took)
				}
			}
		}
	}
}

// TestManyConnections: five hundred that do nothing cost little, and nobody
// else notices.
func TestManyConnections(t *testing.T) {
	a := attacked(t, nil)
	var before, after runtime.MemStats
	runtime.GC()
	runtime.ReadMemStats(&before)
	const many = 500
	for range many {
		c := a.dial(t)
		if _, err := io.WriteString(c, "GET /healthz HTTP/1.1\r\n"); err != nil {
			t.Fatal(err)
		}
	}
	for range 10 {
		a.healthy(t)
	}
	runtime.GC()
	runtime.ReadMemStats(&after)
	if grown := (int64(after.HeapAlloc+after.StackInuse) - int64(before.HeapAlloc+before.StackInuse)) / many; grown > 64<<10 {
		t.Errorf("a connection costs %d bytes", grown)
	}
}

// TestIdleStreams: readers of an export that take nothing are cut, and hold
// nothing that others need meanwhile.
func TestIdleStreams(t *testing.T) {
	t.Cleanup(api.Hasten(500 * time.Millisecond))
	a := attacked(t, nil)
	note := strings.Repeat("x", 2000)
	record := func(n int) {
		body := fmt.Appendf(nil, `{"subject":{"part":"SM-1200","revision":"B","joint":"j%d"},"geometry_digest":"g","kind":"lug","note":%q,"input":{"units":"US","methods":["elementary"],
			"lug":{"shape":"round","width":2,"thickness":0.5,"hole_diameter":0.75,"edge_distance":1.125,"material":"7050-T7451-plate-0.250-1.500-L"},
			"factors":{"ultimate":1.5,"fitting":1.15},"load_cases":[{"id":"LC1","level":"limit","force":18000,"angle":0}]}}`, n, note)
		if _, _, err := a.service.Record(t.Context(), service.Caller{Name: "local", Role: service.Local}, body, service.Idempotency{}); err != nil {
			t.Error(err)
		}
	}
	var all sync.WaitGroup
	for worker := range 32 {
		all.Go(func() {
			for i := range 20 {
				record(worker*20 + i)
			}
		})
	}
	all.Wait()
	const readers = 40
	for range readers {
		c := a.dial(t)
		if err := c.(*net.TCPConn).SetReadBuffer(4096); err != nil {
			t.Fatal(err)
		}
		if _, err := io.WriteString(c, "GET /v1/export HTTP/1.1\r\nHost: localhost\r\n\r\n"); err != nil {
			t.Fatal(err)
		}
	}
	time.Sleep(100 * time.Millisecond)
	if found := a.metric(t, "jointledger_requests_in_flight"); found == "1" {
		t.Fatal("the streams ended by themselves: the export is too small for this test")
	}
	a.healthy(t)
	record(-1)
	for deadline := time.Now().Add(20 * time.Second); a.metric(t, "jointledger_requests_in_flight") != "1"; time.Sleep(50 * time.Millisecond) {
		if time.Now().After(deadline) {
			t.Fatal("idle streams are still open")
		}
	}
	if !strings.Contains(a.log.String(), "i/o timeout") {
		t.Error("the log does not say why the streams ended")
	}
}

// TestLargeBodiesTakeTurns: only so many are in memory at once; one too many
// waits and is then told to come back, and small ones pass by.
func TestLargeBodiesTakeTurns(t *testing.T) {
	t.Cleanup(api.Hasten(300 * time.Millisecond))
	a := attacked(t, nil)
	begin := fmt.Sprintf("POST /v1/lugs HTTP/1.1\r\nHost: localhost\r\nContent-Type: application/json\r\nContent-Length: %d\r\n\r\n%s", 2*api.LargeBody, strings.Repeat(" ", api.LargeBody))
	var held []net.Conn
	for range api.MostLarge {
		c := a.dial(t)
		if _, err := io.WriteString(c, begin); err != nil {
			t.Fatal(err)
		}
		held = append(held, c)
	}
	time.Sleep(200 * time.Millisecond)
	if found := a.send(t, begin); found != http.StatusServiceUnavailable {
		t.Errorf("one too many is answered %d", found)
	}
	if found := a.send(t, "POST /v1/lugs HTTP/1.1\r\nHost: localhost\r\nContent-Type: application/json\r\nContent-Length: 2\r\n\r\n{}"); found != http.StatusBadRequest {
		t.Errorf("a small one is answered %d", found)
	}
	for _, c := range held {
		if _, err := io.WriteString(c, strings.Repeat(" ", api.LargeBody)); err != nil {
			t.Fatal(err)
		}
		if found := status(t, c, 10*time.Second); found != http.StatusBadRequest {
			t.Errorf("one that had its turn is answered %d", found)
		}
	}
	if found := a.send(t, begin+strings.Repeat(" ", api.LargeBody)); found != http.StatusBadRequest {
		t.Errorf("the next is answered %d", found)
	}
}

// TestTraceReachesTheLog: the ids of a caller's trace are in every line about
// the request.
func TestTraceReachesTheLog(t *testing.T) {
	a := attacked(t, nil)
	const id, span = "4bf92f3577b34da6a3ce929d0e0e4736", "00f067aa0ba902b7"
	request, err := http.NewRequest(http.MethodGet, "http://"+a.address+"/v1/records", nil)
	if err != nil {
		t.Fatal(err)
	}
	request.Header.Set("traceparent", "00-"+id+"-"+span+"-01")
	response, err := http.DefaultClient.Do(request)
	if err != nil {
		t.Fatal(err)
	}
	response.Body.Close()
	a.healthy(t) // without a trace
	with, without := 0, 0
	for line := range strings.Lines(a.log.String()) {
		var said struct{ Msg, Request, Trace, Span string }
		if err := json.Unmarshal([]byte(line), &said); err != nil {
			t.Fatal(err)
		}
		switch {
		case said.Msg != "request":
		case said.Trace == id && said.Span == span && said.Request == response.Header.Get("X-Request-Id"):
			with++
		case said.Trace == "" && said.Span == "":
			without++
		}
	}
	if with != 1 || without != 1 {
		t.Errorf("%d lines with the trace and %d without\n%s", with, without, a.log)
	}
}

// TestSecretsStayOut: neither keys nor bodies reach the log or the metrics, also
// where they are refused.
func TestSecretsStayOut(t *testing.T) {
	a := attacked(t, nil)
	key, err := a.service.AddKey(t.Context(), "ada", service.Analyst)
	if err != nil {
		t.Fatal(err)
	}
	const unknown, inside = "jlk_a-key-that-is-not-known", "a-title-that-is-nobody's-business"
	for _, presented := range []string{key, unknown, key + "x"} {
		for _, body := range []string{`{"title":"` + inside, `{"units":"SI","title":"` + inside + `"}`} {
			request, err := http.NewRequest(http.MethodPost, "http://"+a.address+"/v1/lugs", strings.NewReader(body))
			if err != nil {
				t.Fatal(err)
			}
			request.Header.Set("Content-Type", "application/json")
			request.Header.Set("Authorization", "Bearer "+presented)
			response, err := http.DefaultClient.Do(request)
			if err != nil {
				t.Fatal(err)
			}
			answer, err := io.ReadAll(response.Body)
			if err != nil {
				t.Fatal(err)
			}
			response.Body.Close()
			if strings.Contains(string(answer), presented) {
				t.Errorf("an answer repeats the key: %s", answer)
			}
		}
	}
	response, err := http.Get("http://" + a.address + "/metrics")
	if err != nil {
		t.Fatal(err)
	}
	defer response.Body.Close()
	metrics, err := io.ReadAll(response.Body)
	if err != nil {
		t.Fatal(err)
	}
	for _, secret := range []string{key, unknown, inside} {
		if strings.Contains(a.log.String(), secret) || strings.Contains(string(metrics), secret) {
			t.Errorf("%s is in the log or in the metrics", secret)
		}
	}
	if !strings.Contains(a.log.String(), `"status":401`) || !strings.Contains(a.log.String(), `"status":400`) {
		t.Error("the requests are not in the log")
	}
}

package api_test

import (
	"bytes"
	"context"
	"encoding/json"
	"flag"
	"fmt"
	"io"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"os"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	v3 "github.com/pb33f/libopenapi/datamodel/high/v3"

	"jointledger/api"
	"jointledger/service"
	"jointledger/store/storetest"
)

// exercised is what the tests have seen of each operation: "GET /x 200".
var exercised struct {
	sync.Mutex
	seen map[string]bool
}

// TestMain fails a whole run that left an operation or a documented status
// out.
func TestMain(m *testing.M) {
	flag.Parse()
	exercised.seen = map[string]bool{}
	code := m.Run()
	if code == 0 && flag.Lookup("test.run").Value.String() == "" && flag.Lookup("test.list").Value.String() == "" {
		code = complete()
	}
	os.Exit(code)
}

func complete() int {
	d, err := readDocument()
	if err != nil {
		fmt.Println(err)
		return 1
	}
	code := 0
	for _, op := range d.operations() {
		for _, status := range op.statuses() {
			if key := op.method + " " + op.path + " " + status; !exercised.seen[key] {
				fmt.Println("FAIL: no test exercised", key)
				code = 1
			}
		}
	}
	return code
}

// testClock stands still until a test moves it.
type testClock struct {
	mu  sync.Mutex
	now time.Time
}

func (c *testClock) Now() time.Time {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.now
}

func (c *testClock) advance(d time.Duration) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.now = c.now.Add(d)
}

// client talks to a test server; every exchange is held against the document.
type client struct {
	url     string
	service *service.Service
	store   *storetest.Faulty
	clock   *testClock
	key     string // of the caller, empty for none
}

// serve starts a server without keys on an empty store.
func serve(t testing.TB, empty service.Store) client {
	t.Helper()
	return serveWith(t, empty, api.Options{})
}

// serveWith starts one with options of its own.
func serveWith(t testing.TB, empty service.Store, options api.Options) client {
	t.Helper()
	engine := storetest.NewFaulty(empty)
	signer := storetest.Signer(t)
	policies, err := service.NewPolicies(nil)
	if err != nil {
		t.Fatal(err)
	}
	log := slog.New(slog.DiscardHandler)
	metrics := api.NewMetrics(log)
	clock := &testClock{now: time.Date(2026, 5, 4, 9, 30, 0, 0, time.UTC)}
	s, err := service.New(context.Background(), service.Setup{Store: engine, Clock: clock, Signer: signer, Policies: policies, Watch: metrics})
	if err != nil {
		t.Fatal(err)
	}
	options.Log, options.Metrics, options.OpenAPI = log, metrics, theDocument(t).bytes
	handler := api.New(s, options)
	server := httptest.NewUnstartedServer(nil)
	server.Config = api.Serve(handler, log)
	server.Start()
	t.Cleanup(func() {
		server.Close()
		s.Close()
	})
	return client{url: server.URL, service: s, store: engine, clock: clock}
}

// crew is a server with a caller of every role.
func crew(t testing.TB, empty service.Store) map[service.Role]client {
	t.Helper()
	c := serve(t, empty)
	callers := map[service.Role]client{"": c}
	for _, role := range service.Roles() {
		key, err := c.service.AddKey(context.Background(), "SM "+string(role), role)
		if err != nil {
			t.Fatal(err)
		}
		caller := c
		caller.key = key
		callers[role] = caller
	}
	return callers
}

// call is a request to make.
type call struct {
	method, target string
	body           []byte
	chunked        bool // without Content-Length
	header         map[string]string
	host           string
}

// post is a call with a JSON body.
func post(target string, body []byte) call {
	return call{method: http.MethodPost, target: target, body: body, header: map[string]string{"Content-Type": "application/json"}}
}

func get(target string) call { return call{method: http.MethodGet, target: target} }

// with adds a header.
func (c call) with(name, value string) call {
	header := map[string]string{name: value}
	for n, v := range c.header {
		if n != name {
			header[n] = v
		}
	}
	c.header = header
	return c
}

// answer is what came back.
type answer struct {
	call
	status  int
	header  http.Header
	body    []byte
	problem *problem // of a status from 400 on
}

type problem struct {
	Type, Title, Detail, Instance string
	Status                        int
	Errors                        []struct{ Pointer, Detail string }
}

// pointers are those of the problem's errors.
func (a answer) pointers() []string {
	var list []string
	for _, e := range a.problem.Errors {
		list = append(list, e.Pointer)
	}
	return list
}

// decode reads the body of an answer that must have a status.
func (a answer) decode(t testing.TB, status int, into any) {
	t.Helper()
	a.want(t, status)
	if err := json.Unmarshal(a.body, into); err != nil {
		t.Fatal(err)
	}
}

// want fails unless the answer has a status.
func (a answer) want(t testing.TB, status int) answer {
	t.Helper()
	if a.status != status {
		t.Fatalf("%s %s: status %d, want %d: %.1000s", a.method, a.target, a.status, status, a.body)
	}
	return a
}

// do makes a call and holds the exchange against the document.
func (c client) do(t testing.TB, what call) answer {
	t.Helper()
	a, request, response := c.exchange(t, what)
	a.hold(t, request, response)
	return a
}

// exchange makes a call.
func (c client) exchange(t testing.TB, what call) (answer, *http.Request, *http.Response) {
	t.Helper()
	request, err := http.NewRequestWithContext(t.Context(), what.method, c.url+what.target, bytes.NewReader(what.body))
	if err != nil {
		t.Fatal(err)
	}
	if what.chunked {
		request.Body, request.ContentLength = io.NopCloser(bytes.NewReader(what.body)), -1
	}
	for name, value := range what.header {
		request.Header.Set(name, value)
	}
	if c.key != "" {
		request.Header.Set("Authorization", "Bearer "+c.key)
	}
	request.Host = what.host
	response, err := http.DefaultClient.Do(request)
	if err != nil {
		t.Fatal(err)
	}
	body, err := io.ReadAll(response.Body)
	if err != nil {
		t.Fatal(err)
	}
	response.Body.Close()
	a := answer{what, response.StatusCode, response.Header, body, nil}
	request.Host = ""
	return a, request, response
}

// hold holds an exchange against the document: the answer always, the request
// when it was accepted. The validator passes an empty and a null body, an
// unknown header and an undocumented body; those are looked for here.
func (a *answer) hold(t testing.TB, request *http.Request, response *http.Response) {
	t.Helper()
	d := theDocument(t)
	where := fmt.Sprintf("%s %.200s: %d", a.method, a.target, a.status)
	if a.status >= 400 {
		a.holdProblem(t, where)
	}
	op, ok := d.find(request)
	if !ok {
		if a.status != http.StatusNotFound && a.status != http.StatusMethodNotAllowed && a.status != http.StatusRequestEntityTooLarge && a.status != http.StatusMisdirectedRequest && a.status != http.StatusForbidden {
			t.Errorf("%s: the address is not documented", where)
		}
		return
	}
	response.Body = io.NopCloser(bytes.NewReader(a.body))
	if ok, errs := d.validator.ValidateHttpResponse(request, response); !ok {
		for _, err := range errs {
			t.Errorf("%s: %v\n%.2000s", where, err, a.body)
		}
		return
	}
	documented := op.Responses.Codes.GetOrZero(fmt.Sprint(a.status))
	asksBody := documented.Content != nil && documented.Content.Len() > 0
	hasBody := len(a.body) > 0 && !bytes.Equal(bytes.TrimSpace(a.body), []byte("null"))
	if noLines := len(a.body) == 0 && a.header.Get("Content-Type") == "application/x-ndjson"; hasBody != asksBody && !noLines {
		t.Errorf("%s: a body is documented: %t, and it is %.200q", where, asksBody, a.body)
	}
	d.holdLines(t, where, documented, a.body)
	for name := range a.header {
		// What HTTP servers say about their framing, and to browsers.
		if slices.Contains([]string{"Content-Length", "Content-Type", "Date", "X-Content-Type-Options", "Connection", "Vary"}, name) || strings.HasPrefix(name, "Access-Control-") {
			continue
		}
		known := false
		for header := range documented.Headers.FromOldest() {
			known = known || strings.EqualFold(header, name)
		}
		if !known {
			t.Errorf("%s: the header %s is not documented", where, name)
		}
	}
	// A stream of no lines is a request too, and for the validator a missing body.
	if noLines := len(a.call.body) == 0 && op.media() == "application/x-ndjson"; a.status < 400 && !noLines {
		request.Body = io.NopCloser(bytes.NewReader(a.call.body))
		if ok, errs := d.validator.ValidateHttpRequestSync(request); !ok {
			for _, err := range errs {
				t.Errorf("%s was accepted, and the document refuses it: %v\n%.2000s", where, err, a.call.body)
			}
		}
	}
	exercised.Lock()
	exercised.seen[fmt.Sprintf("%s %s %d", op.method, op.path, a.status)] = true
	exercised.Unlock()
}

// holdLines holds each line of a stream against the schema of its items, which
// OpenAPI 3.1 has no keyword for.
func (d *document) holdLines(t testing.TB, where string, documented *v3.Response, body []byte) {
	t.Helper()
	if documented.Content == nil {
		return
	}
	media := documented.Content.GetOrZero("application/x-ndjson")
	if media == nil {
		return
	}
	var item struct {
		Ref string `yaml:"$ref"`
	}
	if err := media.Extensions.GetOrZero("x-itemSchema").Decode(&item); err != nil {
		t.Fatal(err)
	}
	schema := d.model.Components.Schemas.GetOrZero(strings.TrimPrefix(item.Ref, "#/components/schemas/")).Schema()
	if len(body) > 0 && !bytes.HasSuffix(body, []byte("\n")) {
		t.Errorf("%s: the last line has no end: %.200s", where, body)
	}
	for line := range bytes.Lines(body) {
		if ok, errs := d.schemas.ValidateSchemaString(schema, string(line)); !ok {
			t.Errorf("%s: %v: %.2000s", where, errs, line)
		}
	}
}

// find finds the operation that a request is for; a literal path goes before
// one with parameters.
func (d *document) find(request *http.Request) (operation, bool) {
	given := strings.Split(request.URL.EscapedPath(), "/")
	var found operation
	ok := false
	for _, op := range d.operations() {
		template := strings.Split(op.path, "/")
		if op.method != request.Method || len(template) != len(given) {
			continue
		}
		matches := true
		for i, part := range template {
			matches = matches && (part == given[i] || strings.HasPrefix(part, "{") && given[i] != "")
		}
		if matches && (!ok || !strings.Contains(op.path, "{")) {
			found, ok = op, true
		}
	}
	return found, ok
}

// holdProblem holds an answer against RFC 9457 and the server's own types.
func (a *answer) holdProblem(t testing.TB, where string) {
	t.Helper()
	if media := a.header.Get("Content-Type"); media != "application/problem+json" {
		t.Fatalf("%s: media type %q: %.500s", where, media, a.body)
	}
	decoder := json.NewDecoder(bytes.NewReader(a.body))
	decoder.DisallowUnknownFields()
	a.problem = new(problem)
	if err := decoder.Decode(a.problem); err != nil {
		t.Fatalf("%s: %v: %.500s", where, err, a.body)
	}
	d := theDocument(t)
	if ok, errs := d.schemas.ValidateSchemaString(d.model.Components.Schemas.GetOrZero("Problem").Schema(), string(a.body)); !ok {
		t.Errorf("%s: %v: %s", where, errs, a.body)
	}
	status, known := api.ProblemTypes()[a.problem.Type]
	switch {
	case !known || status != a.status || a.problem.Status != a.status:
		t.Errorf("%s: type %s and status %d do not belong together", where, a.problem.Type, a.problem.Status)
	case a.problem.Instance != a.header.Get("X-Request-Id"):
		t.Errorf("%s: instance %s of the request %s", where, a.problem.Instance, a.header.Get("X-Request-Id"))
	case a.header.Get("Cache-Control") != "no-store":
		t.Errorf("%s: a problem that caches may keep", where)
	}
	if a.status >= 500 && a.status != http.StatusServiceUnavailable && !strings.Contains(t.Name(), "Defect") {
		t.Errorf("%s: %s", where, a.body)
	}
}

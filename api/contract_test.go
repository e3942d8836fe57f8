package api_test

import (
	"context"
	"fmt"
	"io"
	"net/http"
	"slices"
	"strings"
	"testing"
	"time"

	"jointledger/api"
	"jointledger/service"
	"jointledger/store/storetest"
)

// world is a server with callers and with something of everything that
// operations are about.
type world struct {
	callers map[service.Role]client
	record  string // id
	curves  string // id@version
}

func newWorld(t testing.TB, empty service.Store) world {
	t.Helper()
	d := theDocument(t)
	w := world{callers: crew(t, empty)}
	var record struct{ ID string }
	w.callers[service.Analyst].do(t, post("/v1/records", d.operation(t, "addRecord").examples(t)["record"])).decode(t, http.StatusCreated, &record)
	w.record = record.ID
	var set struct {
		CurveSet struct{ ID, Version string } `json:"curve_set"`
	}
	w.callers[service.Admin].do(t, post("/v1/curve-sets", d.operation(t, "addCurveSet").examples(t)["invented"])).decode(t, http.StatusCreated, &set)
	w.curves = set.CurveSet.ID + "@" + set.CurveSet.Version
	return w
}

// sample is a call of an operation that must succeed, with a body of its
// examples.
func (w world) sample(t testing.TB, op operation, body []byte) call {
	t.Helper()
	of := map[string]string{"{id}": w.record, "{name}": strings.ReplaceAll(w.curves, " ", "%20"), "{type}": "malformed"}
	target := op.path
	for parameter, value := range of {
		target = strings.ReplaceAll(target, parameter, value)
	}
	mark := "?"
	for _, p := range op.Parameters {
		if p.In == "query" && p.Required != nil && *p.Required {
			target += mark + p.Name + "=" + p.Example.Value
			mark = "&"
		}
	}
	what := call{method: op.method, target: target, body: body}
	if op.media() != "" {
		what = what.with("Content-Type", op.media())
	}
	return what
}

// caller is one that may call an operation with its example.
func (w world) caller(op operation) client {
	if op.OperationId == "checkRelease" {
		return w.callers[service.Gate] // the example is no dry run
	}
	return w.callers[op.least()]
}

// first is the first example of an operation's body.
func first(t testing.TB, op operation) []byte {
	t.Helper()
	examples := op.examples(t)
	for _, name := range sortedKeys(examples) {
		return examples[name]
	}
	return nil
}

func sortedKeys[T any](m map[string]T) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

func TestExamplesAreAnswered(t *testing.T) {
	storetest.Each(t, func(t *testing.T, empty service.Store) {
		w := newWorld(t, empty)
		for _, op := range theDocument(t).operations() {
			examples := op.examples(t)
			if len(examples) == 0 {
				examples = map[string][]byte{"": nil}
			}
			for _, name := range sortedKeys(examples) {
				a := w.caller(op).do(t, w.sample(t, op, examples[name]))
				if a.status >= 300 {
					t.Errorf("%s, example %s: %d: %.1000s", op.OperationId, name, a.status, a.body)
				}
			}
		}
	})
}

// TestRolesAreAsked gives every operation a caller without the role, and one
// without a key.
func TestRolesAreAsked(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	for _, op := range theDocument(t).operations() {
		if op.least() == "" {
			continue
		}
		what := w.sample(t, op, first(t, op))
		if a := w.callers[""].do(t, what); a.status != http.StatusUnauthorized {
			t.Errorf("%s without a key: %d", op.OperationId, a.status)
		}
		unknown := w.callers[""]
		unknown.key = "jlk_nobody"
		if a := unknown.do(t, what); a.status != http.StatusUnauthorized {
			t.Errorf("%s with an unknown key: %d", op.OperationId, a.status)
		}
		for _, role := range service.Roles() {
			if role.May(op.least()) {
				continue
			}
			// Who may not is told so before the body is looked at.
			spoilt := what
			if len(spoilt.body) > 0 {
				spoilt.body = []byte("{")
			}
			if a := w.callers[role].do(t, spoilt); a.status != http.StatusForbidden {
				t.Errorf("%s as %s: %d", op.OperationId, role, a.status)
			}
		}
	}
}

// TestEveryOperationRefuses sends each operation what none of them takes.
func TestEveryOperationRefuses(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	const scenario = "a body of more than sixteen mebibytes"
	large := append(make([]byte, 0, api.MostBody+1), `{"title":"`...)
	for len(large) <= api.MostBody {
		large = append(large, scenario...)
	}
	for _, op := range theDocument(t).operations() {
		c, what := w.caller(op), w.sample(t, op, first(t, op))
		join := "?"
		if strings.Contains(what.target, "?") {
			join = "&"
		}
		refuse := func(why string, status int, pointers []string, change func(*call)) {
			t.Helper()
			changed := what
			change(&changed)
			a := c.do(t, changed)
			if a.status != status || !slices.Equal(a.pointers(), pointers) {
				t.Errorf("%s, %s: %d at %q, want %d at %q", op.OperationId, why, a.status, a.pointers(), status, pointers)
			}
		}
		refuse("an unknown query parameter", 400, []string{"/colour~1~0"}, func(c *call) { c.target += join + "colour%2F~=red" })
		refuse("a query that is no UTF-8", 400, []string{"/\uFFFD"}, func(c *call) { c.target += join + "%ff=1" })
		refuse("a query that cannot be read", 400, nil, func(c *call) { c.target += join + "%zz" })
		refuse("a long address", 413, nil, func(c *call) { c.target += join + strings.Repeat("x", 8<<10) })
		if op.media() == "" {
			continue
		}
		refuse("a form", 415, nil, func(c *call) { *c = c.with("Content-Type", "application/x-www-form-urlencoded") })
		refuse("no media type", 415, nil, func(c *call) { *c = c.with("Content-Type", "") })
		if op.media() == "application/x-ndjson" {
			continue // a stream has no size, and each line its own answer
		}
		refuse("no body", 400, []string{""}, func(c *call) { c.body = nil })
		refuse("a large body", 413, nil, func(c *call) { c.body = large })
		refuse("a large body without its length", 413, nil, func(c *call) { c.body, c.chunked = large, true })
	}
}

// TestOpenModeIsForItsOwnMachine: a server without keys answers only its own
// machine's programs.
func TestOpenModeIsForItsOwnMachine(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	w := world{record: "none", curves: "none@1"}
	for _, op := range theDocument(t).operations() {
		what := w.sample(t, op, first(t, op))
		for _, host := range []string{"saltmarsh.example", "saltmarsh.example:8080", "127.0.0.1.saltmarsh.example", "10.0.0.7:8080", "localhost.saltmarsh.example"} {
			what := what
			what.host = host
			if a := c.do(t, what); a.status != http.StatusMisdirectedRequest {
				t.Errorf("%s for the host %s: %d", op.OperationId, host, a.status)
			}
		}
		for _, header := range []string{"Forwarded", "X-Forwarded-For", "X-Forwarded-Host", "X-Forwarded-Proto"} {
			if a := c.do(t, what.with(header, "192.0.2.7")); a.status != http.StatusForbidden {
				t.Errorf("%s with %s: %d", op.OperationId, header, a.status)
			}
		}
	}
	for _, host := range []string{"localhost", "LOCALHOST:8080", "127.0.0.1:9", "[::1]:8080", "127.8.9.1"} {
		a := c.do(t, call{method: http.MethodGet, target: "/v1/rules", host: host})
		a.want(t, http.StatusOK)
	}
}

// failing is a plan by which every call fails.
func failing(fault storetest.Fault) func(int, string) storetest.Fault {
	return func(int, string) storetest.Fault { return fault }
}

// TestUnavailable: while the store cannot be reached, what needs it says so and
// when to come back; what does not goes on.
func TestUnavailable(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	needless := []string{
		"calculateLug", "sizeLug", "calculateFastenerGroup", "sizeFastenerGroup", "calculateSplice", "findSpliceSteps", "answerBatch", "listMaterials", "listFastenerTypes", "listMethods", "listRules", "getLedgerKey",
		"explainProblem", "getOpenAPI", "getHealth", "getMetrics",
	}
	for _, op := range theDocument(t).operations() {
		w.caller(op).do(t, w.sample(t, op, first(t, op))) // the key is remembered
	}
	w.callers[service.Reader].store.Plan(failing(storetest.NotStored))
	for _, op := range theDocument(t).operations() {
		a := w.caller(op).do(t, w.sample(t, op, first(t, op)))
		if needs := !slices.Contains(needless, op.OperationId); needs != (a.status == http.StatusServiceUnavailable) {
			t.Errorf("%s: %d: %s", op.OperationId, a.status, a.body)
		}
	}
	w.callers[service.Reader].clock.advance(time.Minute)
	for _, op := range theDocument(t).operations() {
		if op.least() == "" {
			continue
		}
		a := w.caller(op).do(t, w.sample(t, op, first(t, op)))
		if a.status != http.StatusServiceUnavailable {
			t.Errorf("%s with a key that cannot be looked up: %d: %s", op.OperationId, a.status, a.body)
		}
	}
	w.callers[service.Reader].store.Plan(nil)
	for _, op := range theDocument(t).operations() {
		if a := w.caller(op).do(t, w.sample(t, op, first(t, op))); a.status >= 500 {
			t.Errorf("%s after all is well again: %d", op.OperationId, a.status)
		}
	}
}

// TestUnavailableInOpenMode: without keys a lost store is no lost key.
func TestUnavailableInOpenMode(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	c.do(t, get("/v1/records")).want(t, http.StatusOK)
	c.store.Plan(failing(storetest.NotStored))
	for _, later := range []time.Duration{0, time.Minute} {
		c.clock.advance(later)
		c.do(t, get("/v1/records")).want(t, http.StatusServiceUnavailable)
	}
	c.store.Plan(nil)
	c.do(t, get("/v1/records")).want(t, http.StatusOK)
}

// TestDefect: what no code of the application names is answered as a defect,
// without its cause.
func TestDefect(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	w.callers[service.Reader].store.Plan(failing(storetest.Broken))
	w.callers[service.Reader].clock.advance(time.Minute)
	for _, op := range theDocument(t).operations() {
		if op.Responses.Codes.GetOrZero("500") == nil {
			continue
		}
		a := w.caller(op).do(t, w.sample(t, op, first(t, op))).want(t, http.StatusInternalServerError)
		if strings.Contains(string(a.body), storetest.ErrInjected.Error()) {
			t.Errorf("%s tells its caller the cause: %s", op.OperationId, a.body)
		}
	}
}

// TestAddressesThatAreNone: 404 and 405 are problems too.
func TestAddressesThatAreNone(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	for _, target := range []string{"/nothing", "/v1", "/v1/", "/v1/lugs/", "/v1/records/x/y", "/problems/", "/problems/a/b"} {
		a := c.do(t, get(target)).want(t, http.StatusNotFound)
		if a.problem.Type != "/problems/not-found" {
			t.Errorf("%s: %s", target, a.problem.Type)
		}
	}
	for _, what := range []call{get("/v1/lugs"), {method: http.MethodDelete, target: "/v1/records/x"}, {method: http.MethodPut, target: "/v1/records"}, post("/healthz", nil)} {
		a := c.do(t, what).want(t, http.StatusMethodNotAllowed)
		if a.header.Get("Allow") == "" {
			t.Errorf("%s %s: no Allow header", what.method, what.target)
		}
	}
}

func TestNotFound(t *testing.T) {
	storetest.Each(t, func(t *testing.T, empty service.Store) {
		w := newWorld(t, empty)
		for _, op := range theDocument(t).operations() {
			if !strings.Contains(op.path, "{") {
				continue
			}
			parameter := op.path[strings.Index(op.path, "{") : strings.Index(op.path, "}")+1]
			for _, value := range []string{"0198f3a4-7a2c-7000-8000-000000000000", "x", "%00", "%ff", "a%2Fb", strings.Repeat("x", 4000), "%F0%9F%9B%A9"} {
				what := w.sample(t, op, first(t, op))
				what.target = strings.ReplaceAll(op.path, parameter, value)
				if a := w.caller(op).do(t, what); a.status != http.StatusNotFound {
					t.Errorf("%s with %s: %d: %.300s", op.OperationId, value, a.status, a.body)
				}
			}
		}
		for _, part := range []string{"SM-999", "%00", "%ff"} {
			if a := w.callers[service.Reader].do(t, get("/v1/parts?part="+part)); a.status != http.StatusNotFound && a.status != http.StatusUnprocessableEntity {
				t.Errorf("the part %s: %d: %s", part, a.status, a.body)
			}
		}
		for _, id := range []string{"0198f3a4-7a2c-7000-8000-000000000000", "x", "ÿ"} {
			body := []byte(`{"withdrawn":{"record":"` + id + `"}}`)
			w.callers[service.Reader].do(t, post("/v1/impact", body)).want(t, http.StatusNotFound)
		}
		for _, filter := range []string{"part=%00", "part=%ff", "material=%00", "author=%ff", "method=%00", "curve_set=%ff"} {
			var list struct{ Items []any }
			if w.callers[service.Reader].do(t, get("/v1/records?"+filter)).decode(t, 200, &list); len(list.Items) != 0 {
				t.Errorf("%s finds %d records", filter, len(list.Items))
			}
		}
	})
}

func TestProblemPages(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	schema := theDocument(t).model.Components.Schemas.GetOrZero("Problem").Schema()
	var documented []string
	for _, node := range schema.Properties.GetOrZero("type").Schema().Enum {
		documented = append(documented, node.Value)
	}
	slices.Sort(documented)
	served := sortedKeys(api.ProblemTypes())
	if !slices.Equal(documented, served) {
		t.Errorf("documented types %q, served %q", documented, served)
	}
	for _, kind := range served {
		a := c.do(t, get(kind)).want(t, http.StatusOK)
		for _, says := range []string{kind, fmt.Sprintf("Status %d", api.ProblemTypes()[kind]), "<h1>"} {
			if !strings.Contains(string(a.body), says) {
				t.Errorf("the page %s does not say %q", kind, says)
			}
		}
	}
}

// cutStore loses its engine in the middle of reading entries.
type cutStore struct{ service.Store }

func (s cutStore) Entries(ctx context.Context, from, to int64, yield func(service.Entry) error) error {
	read := 0
	return s.Store.Entries(ctx, from, to, func(e service.Entry) error {
		if read++; read > 1 {
			return service.ErrUnavailable
		}
		return yield(e)
	})
}

// TestStreamThatFailsIsCut: nobody takes half an export for a whole one.
func TestStreamThatFailsIsCut(t *testing.T) {
	c := serve(t, cutStore{storetest.SQLite(t)})
	for range 2 {
		c.do(t, post("/v1/records", example(t, "addRecord", "record"))).want(t, http.StatusCreated)
	}
	request, err := http.NewRequestWithContext(t.Context(), http.MethodGet, c.url+"/v1/export", nil)
	if err != nil {
		t.Fatal(err)
	}
	response, err := http.DefaultClient.Do(request)
	if err != nil {
		t.Fatal(err)
	}
	defer response.Body.Close()
	if body, err := io.ReadAll(response.Body); err == nil {
		t.Errorf("an export that failed ends as if it were whole: %.300s", body)
	}
}

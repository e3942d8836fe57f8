// Package fuzzing fuzzes the request path. It stands apart from the tests of
// the server because go test -fuzz compiles everything that it reaches anew,
// instrumented: an embedded database and a validator of OpenAPI would cost
// minutes. What they see is tested on the same bodies in package api.
package fuzzing

import (
	"context"
	"crypto/rand"
	"encoding/json"
	"io"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"os"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/pb33f/go-yaml"

	"jointledger/api"
	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/service/strictjson"
)

// memory keeps the ledger for as long as a test runs. It has what POST
// requests of a server without keys need.
type memory struct {
	service.Store
	mu      sync.Mutex
	head    service.Head
	hashes  []ledger.Hash
	entries []service.Entry
}

func (m *memory) Claim(_ context.Context, id service.Identity) (service.Identity, error) {
	return id, nil
}
func (m *memory) Keys(context.Context) ([]service.Key, error) { return nil, nil }

func (m *memory) Answered(_ context.Context, keys []service.IdempotencyKey) ([]*service.Answer, error) {
	return make([]*service.Answer, len(keys)), nil
}

func (m *memory) Head(context.Context) (service.Head, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.head, nil
}

func (m *memory) Append(_ context.Context, batch service.Batch) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.head, m.hashes, m.entries = batch.Head, append(m.hashes, batch.Hashes...), append(m.entries, batch.Entries...)
	return nil
}

func (m *memory) Hashes(_ context.Context, indexes []int64) ([]ledger.Hash, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	found := make([]ledger.Hash, len(indexes))
	for i, index := range indexes {
		found[i] = m.hashes[index]
	}
	return found, nil
}

// pick returns the entries that a test picks, in order.
func (m *memory) pick(is func(service.Entry) bool) []service.Entry {
	m.mu.Lock()
	defer m.mu.Unlock()
	var found []service.Entry
	for _, e := range m.entries {
		if is(e) {
			found = append(found, e)
		}
	}
	return found
}

// one returns the last of the entries that a test picks.
func (m *memory) one(is func(service.Entry) bool) (service.Entry, error) {
	found := m.pick(is)
	if len(found) == 0 {
		return service.Entry{}, service.ErrNotFound
	}
	return found[len(found)-1], nil
}

func (m *memory) Entry(_ context.Context, index int64) (service.Entry, error) {
	return m.one(func(e service.Entry) bool { return e.Index == index })
}

func (m *memory) EntryByID(_ context.Context, id string) (service.Entry, error) {
	return m.one(func(e service.Entry) bool { return e.ID == id })
}

func (m *memory) Entries(_ context.Context, from, to int64, yield func(service.Entry) error) error {
	for _, e := range m.pick(func(e service.Entry) bool { return e.Index >= from && e.Index < to }) {
		if err := yield(e); err != nil {
			return err
		}
	}
	return nil
}

func (m *memory) CurveSet(_ context.Context, name string) (service.Entry, error) {
	return m.one(func(e service.Entry) bool {
		return e.Type == "curve-set" && slices.ContainsFunc(e.Terms, func(t service.Term) bool { return t.Value == name })
	})
}

func (m *memory) About(_ context.Context, records []string) (map[string][]service.Entry, error) {
	about := map[string][]service.Entry{}
	for _, e := range m.pick(func(e service.Entry) bool { return e.Target != "" && slices.Contains(records, e.Target) }) {
		about[e.Target] = append(about[e.Target], e)
	}
	return about, nil
}

func (m *memory) Decisions(_ context.Context, records []string) ([]service.Resting, error) {
	var resting []service.Resting
	for _, e := range m.pick(func(e service.Entry) bool { return e.Type == "release-decision" }) {
		for _, t := range e.Terms {
			if t.Kind == "record" && slices.Contains(records, t.Value) {
				resting = append(resting, service.Resting{Record: t.Value, Decision: e})
			}
		}
	}
	return resting, nil
}

func (m *memory) Latest(_ context.Context, part, revision string, yield func(service.Entry) error) error {
	for _, e := range m.pick(func(e service.Entry) bool { return e.Type == "record" && e.Part == part && e.Revision == revision }) {
		if err := yield(e); err != nil {
			return err
		}
	}
	return nil
}

func (m *memory) Records(_ context.Context, _ service.Filter, before int64, limit int) ([]service.Summary, error) {
	var page []service.Summary
	for _, e := range slices.Backward(m.pick(func(e service.Entry) bool { return e.Type == "record" && e.Index < before })) {
		if len(page) < limit {
			page = append(page, service.Summary{Entry: e, State: service.Recorded})
		}
	}
	return page, nil
}

// operation is what the target needs of an operation of openapi.yaml.
type operation struct {
	path, media string
	examples    [][]byte
	statuses    []string
}

// posts reads the operations that take a body.
func posts(t testing.TB) ([]operation, []byte) {
	t.Helper()
	text, err := os.ReadFile("../../openapi.yaml")
	if err != nil {
		t.Fatal(err)
	}
	var document struct {
		Paths map[string]struct {
			Post struct {
				RequestBody struct {
					Content map[string]struct {
						Examples map[string]struct{ Value any }
					}
				} `yaml:"requestBody"`
				Responses map[string]any
			}
		}
	}
	if err := yaml.Unmarshal(text, &document); err != nil {
		t.Fatal(err)
	}
	var list []operation
	for path, item := range document.Paths {
		for media, body := range item.Post.RequestBody.Content {
			op := operation{path: path, media: media}
			for status := range item.Post.Responses {
				op.statuses = append(op.statuses, status)
			}
			for _, example := range body.Examples {
				text, isText := example.Value.(string)
				data := []byte(text)
				if !isText {
					if data, err = json.Marshal(example.Value); err != nil {
						t.Fatal(err)
					}
				}
				op.examples = append(op.examples, data)
			}
			list = append(list, op)
		}
	}
	slices.SortFunc(list, func(a, b operation) int { return strings.Compare(a.path, b.path) })
	if len(list) < 10 {
		t.Fatalf("openapi.yaml has %d operations with a body", len(list))
	}
	return list, text
}

var pointer = regexp.MustCompile(`^(/([^~/]|~[01])*)*$`)

// FuzzRequests sends any bytes to any operation that takes a body. Whatever
// they are, the answer has a status of openapi.yaml, is JSON or a problem of
// RFC 9457, and is never a defect of the server.
func FuzzRequests(f *testing.F) {
	list, document := posts(f)
	log := slog.New(slog.DiscardHandler)
	text, err := ledger.GenerateKey(rand.Reader, "saltmarsh.example/jointledger")
	if err != nil {
		f.Fatal(err)
	}
	signer, err := ledger.NewSigner(text)
	if err != nil {
		f.Fatal(err)
	}
	policies, err := service.NewPolicies(nil)
	if err != nil {
		f.Fatal(err)
	}
	metrics := api.NewMetrics(log)
	s, err := service.New(context.Background(), service.Setup{
		Store: &memory{head: service.Head{Root: ledger.EmptyRoot}}, Clock: service.SystemClock{}, Signer: signer, Policies: policies, Watch: metrics,
	})
	if err != nil {
		f.Fatal(err)
	}
	server := httptest.NewServer(api.New(s, api.Options{Log: log, Metrics: metrics, OpenAPI: document}))
	f.Cleanup(func() {
		server.Close()
		s.Close()
	})
	client := &http.Client{Timeout: time.Minute}
	send := func(t testing.TB, op operation, path string, body []byte) (int, []byte) {
		request, err := http.NewRequestWithContext(context.Background(), http.MethodPost, server.URL+path, strings.NewReader(string(body)))
		if err != nil {
			t.Fatal(err)
		}
		request.Header.Set("Content-Type", op.media)
		response, err := client.Do(request)
		if err != nil {
			t.Fatal(err)
		}
		defer response.Body.Close()
		answer, err := io.ReadAll(response.Body)
		if err != nil {
			t.Fatal(err)
		}
		return response.StatusCode, answer
	}
	var record struct{ ID string }
	for i, op := range list {
		if op.path == "/v1/records" {
			_, answer := send(f, op, op.path, op.examples[0])
			if err := json.Unmarshal(answer, &record); err != nil || record.ID == "" {
				f.Fatalf("no record: %v: %s", err, answer)
			}
		}
		for _, body := range op.examples {
			f.Add(uint8(i), body)
		}
		f.Add(uint8(i), []byte(`{"units":"SI"}`))
	}
	f.Fuzz(func(t *testing.T, which uint8, body []byte) {
		op := list[int(which)%len(list)]
		status, answer := send(t, op, strings.ReplaceAll(op.path, "{id}", record.ID), body)
		if status >= 500 || !slices.Contains(op.statuses, strconv.Itoa(status)) {
			t.Fatalf("%s: %d: %s", op.path, status, answer)
		}
		if status < 400 {
			for line := range strings.Lines(string(answer)) {
				var value any
				if err := strictjson.DecodeLoosely([]byte(line), &value); err != nil {
					t.Fatalf("%s: %v: %s", op.path, err, line)
				}
			}
			return
		}
		var p struct {
			Type, Title, Detail, Instance string
			Status                        int
			Errors                        []struct{ Pointer, Detail string }
		}
		if err := json.Unmarshal(answer, &p); err != nil || !strings.HasPrefix(p.Type, "/problems/") || p.Status != status || p.Title == "" || p.Detail == "" || p.Instance == "" {
			t.Fatalf("%s: no problem: %v: %s", op.path, err, answer)
		}
		for _, e := range p.Errors {
			if !pointer.MatchString(e.Pointer) || e.Detail == "" {
				t.Fatalf("%s: %q %q", op.path, e.Pointer, e.Detail)
			}
		}
	})
}

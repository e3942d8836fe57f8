package client_test

import (
	"bytes"
	"context"
	"errors"
	"io"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"jointledger/api"
	"jointledger/api/client"
	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store/storetest"
)

// boomLug is the upper lug of the tail boom hinge of the Saltmarsh survey
// glider, an invented aircraft.
var boomLug = map[string]any{
	"units": "US", "methods": []string{"elementary"},
	"lug": map[string]any{
		"shape": "round", "width": 2, "thickness": 0.5, "hole_diameter": 0.75, "edge_distance": 1.125,
		"material": "7050-T7451-plate-0.250-1.500-L",
	},
	"factors":    map[string]any{"ultimate": 1.5, "fitting": 1.15},
	"load_cases": []any{map[string]any{"id": "LC1", "level": "limit", "force": 18000, "angle": 0}},
}

// world is a server on its own ledger, with a key for each role, behind a
// gateway that a test may break.
type world struct {
	url     string
	keys    map[string]string
	gateway atomic.Pointer[func(next http.Handler, w http.ResponseWriter, r *http.Request)]
}

func newWorld(t *testing.T) *world {
	t.Helper()
	return newWorldWith(t, api.Options{})
}

func newWorldWith(t *testing.T, options api.Options) *world {
	t.Helper()
	signer := storetest.Signer(t)
	policies, err := service.NewPolicies(nil)
	if err != nil {
		t.Fatal(err)
	}
	log := slog.New(slog.DiscardHandler)
	metrics := api.NewMetrics(log)
	s, err := service.New(t.Context(), service.Setup{
		Store: storetest.SQLite(t), Clock: service.SystemClock{}, Signer: signer, Policies: policies, Watch: metrics,
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	v := &world{keys: map[string]string{}}
	for name, role := range map[string]service.Role{"ada": service.Analyst, "ben": service.Checker, "cleo": service.Approver, "vault": service.Gate} {
		if v.keys[name], err = s.AddKey(t.Context(), name, role); err != nil {
			t.Fatal(err)
		}
	}
	options.Log, options.Metrics = log, metrics
	handler := api.New(s, options)
	server := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if gateway := v.gateway.Load(); gateway != nil {
			(*gateway)(handler, w, r)
			return
		}
		handler.ServeHTTP(w, r)
	}))
	t.Cleanup(server.Close)
	v.url = server.URL
	return v
}

// by is the client of a caller.
func (v *world) by(t *testing.T, name string) *client.Client {
	t.Helper()
	c, err := client.New(v.url, client.Options{Key: v.keys[name], Pause: time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// failing makes the gateway do something else with the first n requests.
func (v *world) failing(n int32, how func(next http.Handler, w http.ResponseWriter, r *http.Request)) *atomic.Int32 {
	var seen atomic.Int32
	gateway := func(next http.Handler, w http.ResponseWriter, r *http.Request) {
		if seen.Add(1) <= n {
			how(next, w, r)
			return
		}
		next.ServeHTTP(w, r)
	}
	v.gateway.Store(&gateway)
	return &seen
}

func request(joint string) client.RecordRequest {
	return client.RecordRequest{
		Subject:        client.Subject{Part: "SM-2100", Revision: "B", Joint: joint},
		GeometryDigest: "sha256:01", Kind: client.Lug, Input: boomLug,
	}
}

func TestCalculate(t *testing.T) {
	v := newWorld(t)
	result, err := v.by(t, "vault").Calculate(t.Context(), client.Lug, boomLug, client.View{NoWorkings: true})
	if err != nil {
		t.Fatal(err)
	}
	// Net section by hand: (2 - 0.75) 0.5 74,000 / (18,000 x 1.5 x 1.15) - 1, with
	// F_tu = 74,000 psi of 7050-T7451 plate, MIL-HDBK-5J table 3.7.4.0(b1)
	// (value from memory 90 %).
	var net *client.Check
	for i, c := range result.Checks {
		if c.Mode == "net-section" && c.Level == "ultimate" {
			net = &result.Checks[i]
		}
	}
	if net == nil || net.Margin == nil {
		t.Fatalf("no margin of the net section in %+v", result.Checks)
	}
	want := 1.25*0.5*74000/(18000*1.5*1.15) - 1
	if d := *net.Margin - want; d > 1e-9 || d < -1e-9 {
		t.Errorf("the margin of the net section is %v, by hand %v", *net.Margin, want)
	}
	if len(result.Workings) != 0 || result.Governing == nil {
		t.Errorf("%d workings and governing %v", len(result.Workings), result.Governing)
	}
}

func TestProblemsComeBackAsErrors(t *testing.T) {
	v := newWorld(t)
	_, err := v.by(t, "vault").Calculate(t.Context(), client.Lug, map[string]any{"units": "US"}, client.View{})
	var p *client.Problem
	if !errors.As(err, &p) || p.Status != 400 || p.Code() != "malformed" || len(p.Errors) == 0 || p.Instance == "" {
		t.Errorf("a lug without dimensions: %v", err)
	}
	_, err = v.by(t, "vault").Record(t.Context(), request("hinge"))
	if !errors.As(err, &p) || p.Status != 403 || p.Code() != "forbidden" {
		t.Errorf("a record by the role gate: %v", err)
	}
	_, err = v.by(t, "nobody").RecordByID(t.Context(), "x")
	if !errors.As(err, &p) || p.Status != 401 {
		t.Errorf("without a key: %v", err)
	}
	_, err = v.by(t, "ada").RecordByID(t.Context(), "no/such?one")
	if !errors.As(err, &p) || p.Status != 404 || !strings.Contains(p.Detail, "no/such?one") {
		t.Errorf("a record that is not there: %v", err)
	}
}

// The whole life of a record: made, signed, released, withdrawn, held.
func TestFromRecordToRelease(t *testing.T) {
	v := newWorld(t)
	ctx := t.Context()
	gate := v.by(t, "vault")
	ask := client.ReleaseRequest{Part: "SM-2100", Revision: "B", Joints: []client.ReleaseJoint{{Joint: "hinge/upper", GeometryDigest: "sha256:01"}}}
	codes := func(d *client.Decision) (list []string) {
		for _, f := range d.Findings {
			list = append(list, f.Code)
		}
		return list
	}
	expect := func(when, decision string, want ...string) {
		t.Helper()
		d, err := gate.ReleaseCheck(ctx, ask)
		if err != nil {
			t.Fatal(err)
		}
		if d.Decision != decision || strings.Join(codes(d), " ") != strings.Join(want, " ") || d.ID == nil || d.Index == nil {
			t.Errorf("%s: %s %v, want %s %v", when, d.Decision, codes(d), decision, want)
		}
	}
	expect("without a record", client.Hold, "no-record")
	made, err := v.by(t, "ada").Record(ctx, request("hinge/upper"))
	if err != nil {
		t.Fatal(err)
	}
	expect("unsigned", client.Hold, "not-checked", "not-approved")
	for _, s := range [][2]string{{"ben", "checked"}, {"cleo", "approved"}} {
		done, err := v.by(t, s[0]).SignOff(ctx, made.ID, s[1], "followed by hand")
		if err != nil || done.State != s[1] {
			t.Fatalf("%v, %v", done, err)
		}
	}
	expect("signed", client.Release)
	dry, err := gate.DryRun(ctx, ask)
	if err != nil || dry.Decision != client.Release || dry.ID != nil || dry.Index != nil {
		t.Errorf("dry run: %+v, %v", dry, err)
	}
	replayed, err := gate.Replay(ctx, made.ID)
	if err != nil || !replayed.Recorded.Reproduced || !replayed.Current.Reproduced {
		t.Errorf("replay: %+v, %v", replayed, err)
	}
	if done, err := v.by(t, "ada").Withdraw(ctx, made.ID, "wrong plate"); err != nil || done.State != "withdrawn" {
		t.Fatalf("%v, %v", done, err)
	}
	expect("withdrawn", client.Hold, "withdrawn")
	found, err := gate.RecordByID(ctx, made.ID)
	if err != nil || found.Withdrawal == nil || len(found.SignOffs) != 2 || found.Result.Verdict != "adequate" {
		t.Errorf("the record: %+v, %v", found, err)
	}
	impact, err := gate.Impact(ctx, client.Withdrawn{Record: made.ID}, "")
	if err != nil || len(impact.Records) != 1 || len(impact.Decisions) != 3 || impact.Decisions[1].Decision != client.Release || impact.NextCursor != nil {
		t.Errorf("what rests on it: %+v, %v", impact, err)
	}
	part, err := gate.Part(ctx, "SM-2100")
	if err != nil || len(part.Revisions) != 1 || part.Revisions[0].Records[0].State != "withdrawn" {
		t.Errorf("the part: %+v, %v", part, err)
	}
	verifyExport(t, gate)
}

// verifyExport holds the export against the key, as an auditor does.
func verifyExport(t *testing.T, c *client.Client) {
	t.Helper()
	text, err := c.LedgerKey(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	key, err := ledger.NewKey(text)
	if err != nil {
		t.Fatal(err)
	}
	var export bytes.Buffer
	if err := c.Export(t.Context(), 0, &export); err != nil {
		t.Fatal(err)
	}
	checkpoint, err := c.Checkpoint(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	verifier := ledger.NewVerifier(key)
	if err := verifier.Since(checkpoint); err != nil {
		t.Fatal(err)
	}
	if err := verifier.Export(&export, func(ledger.Verified) error { return nil }); err != nil {
		t.Fatal(err)
	}
	if err := verifier.Done(); err != nil {
		t.Error(err)
	}
}

func TestRecordsGoThroughAllPages(t *testing.T) {
	v := newWorld(t)
	ada := v.by(t, "ada")
	for _, joint := range []string{"a", "b", "c", "d", "e"} {
		if _, err := ada.Record(t.Context(), request(joint)); err != nil {
			t.Fatal(err)
		}
	}
	var joints string
	for r, err := range ada.Records(t.Context(), client.RecordFilter{Part: "SM-2100", Kind: client.Lug, Latest: true, PageSize: 2}) {
		if err != nil {
			t.Fatal(err)
		}
		joints += r.Subject.Joint
	}
	if joints != "edcba" {
		t.Errorf("records of the joints %q, want edcba, newest first", joints)
	}
	for _, err := range ada.Records(t.Context(), client.RecordFilter{State: "lost"}) {
		var p *client.Problem
		if !errors.As(err, &p) || p.Status != 422 {
			t.Errorf("a state that does not exist: %v", err)
		}
	}
}

// An answer that never arrives is asked for again, and what it answered is in
// the ledger once.
func TestRetriesAppendOnce(t *testing.T) {
	lost := func(next http.Handler, w http.ResponseWriter, r *http.Request) {
		next.ServeHTTP(httptest.NewRecorder(), r)
		panic(http.ErrAbortHandler) // cuts the connection
	}
	unreached := func(_ http.Handler, _ http.ResponseWriter, r *http.Request) { panic(http.ErrAbortHandler) }
	busy := func(status int) func(http.Handler, http.ResponseWriter, *http.Request) {
		return func(_ http.Handler, w http.ResponseWriter, r *http.Request) {
			w.Header().Set("Retry-After", "0")
			w.WriteHeader(status)
		}
	}
	for name, how := range map[string]func(http.Handler, http.ResponseWriter, *http.Request){
		"answer lost": lost, "connection refused": unreached, "503": busy(503), "429": busy(429),
	} {
		t.Run(name, func(t *testing.T) {
			v := newWorld(t)
			seen := v.failing(2, how)
			made, err := v.by(t, "ada").Record(t.Context(), request("hinge"))
			if err != nil {
				t.Fatal(err)
			}
			if seen.Load() != 3 {
				t.Errorf("sent %d times, want 3", seen.Load())
			}
			n := 0
			for r, err := range v.by(t, "ada").Records(t.Context(), client.RecordFilter{}) {
				if err != nil {
					t.Fatal(err)
				}
				if n++; r.ID != made.ID {
					t.Errorf("the record %s is not the one answered, %s", r.ID, made.ID)
				}
			}
			if n != 1 {
				t.Errorf("%d records, want 1", n)
			}
			seen = v.failing(100, how)
			// The library repeats a request by itself on a connection that was
			// closed while idle, so that there may be more.
			if _, err := v.by(t, "ada").Record(t.Context(), request("hinge")); err == nil || seen.Load() < 4 || seen.Load() > 8 {
				t.Errorf("against a server that stays away: %v after %d attempts, want an error after 4", err, seen.Load())
			}
		})
	}
}

// What cannot succeed is not sent again.
func TestRefusalsAreNotRetried(t *testing.T) {
	v := newWorld(t)
	for _, status := range []int{400, 401, 403, 404, 409, 413, 422, 500, 302} {
		seen := v.failing(100, func(_ http.Handler, w http.ResponseWriter, r *http.Request) {
			w.Header().Set("Location", "/elsewhere")
			w.WriteHeader(status)
		})
		_, err := v.by(t, "vault").RecordByID(t.Context(), "x")
		var p *client.Problem
		if !errors.As(err, &p) || p.Status != status || seen.Load() != 1 {
			t.Errorf("%d: %v after %d attempts", status, err, seen.Load())
		}
	}
}

// The context ends everything: a server that never answers, a pause that the
// server asks for, an answer that trickles.
func TestTheContextEndsACall(t *testing.T) {
	v := newWorld(t)
	for name, how := range map[string]func(http.Handler, http.ResponseWriter, *http.Request){
		"silence": func(_ http.Handler, _ http.ResponseWriter, r *http.Request) { <-r.Context().Done() },
		"far Retry-After": func(_ http.Handler, w http.ResponseWriter, r *http.Request) {
			w.Header().Set("Retry-After", "3600")
			w.WriteHeader(503)
		},
		"half an answer": func(_ http.Handler, w http.ResponseWriter, r *http.Request) {
			_, _ = io.WriteString(w, "{")
			_ = http.NewResponseController(w).Flush()
			<-r.Context().Done()
		},
	} {
		t.Run(name, func(t *testing.T) {
			v.failing(100, how)
			ctx, cancel := context.WithTimeout(t.Context(), 200*time.Millisecond)
			defer cancel()
			began := time.Now()
			_, err := v.by(t, "vault").RecordByID(ctx, "x")
			if took := time.Since(began); err == nil || took > 5*time.Second {
				t.Errorf("%v after %s", err, took)
			}
		})
	}
}

// Whatever answers in the server's place must not be taken for a release.
func TestOnlyADecisionIsADecision(t *testing.T) {
	v := newWorld(t)
	for _, body := range []string{
		``, `{}`, `[]`, `null`, `{"decision":""}`, `{"decision":"Release","findings":[]}`, `<html>release</html>`,
		`{"decision":"release","findings":[{"joint":"a","code":"no-record","message":"m","record":null}]}`,
		`{"decision":"hold","findings":[]}`,
	} {
		v.failing(100, func(_ http.Handler, w http.ResponseWriter, r *http.Request) { _, _ = io.WriteString(w, body) })
		if d, err := v.by(t, "vault").ReleaseCheck(t.Context(), client.ReleaseRequest{}); err == nil {
			t.Errorf("%s is taken for the decision %+v", body, d)
		}
	}
}

func TestAddresses(t *testing.T) {
	for _, bad := range []string{"", "localhost:8080", "ftp://a", "http://", "http://a?b=c", "http://user@a", "::"} {
		if _, err := client.New(bad, client.Options{}); err == nil {
			t.Errorf("%q is taken for an address", bad)
		}
	}
}

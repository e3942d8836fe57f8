package client_test

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"iter"
	"net"
	"net/http"
	"net/url"
	"strings"
	"testing"
	"time"

	"jointledger/api"
	"jointledger/api/client"
)

func lugs(n int, change func(i int, l *client.BatchLine)) iter.Seq[client.BatchLine] {
	return func(yield func(client.BatchLine) bool) {
		for i := range n {
			l := client.BatchLine{Kind: client.Lug, Ref: fmt.Sprint(i), Input: boomLug}
			if change != nil {
				change(i, &l)
			}
			if !yield(l) {
				return
			}
		}
	}
}

func TestBatch(t *testing.T) {
	v := newWorld(t)
	want, err := v.by(t, "vault").Calculate(t.Context(), client.Lug, boomLug, client.View{NoWorkings: true, Checks: "governing"})
	if err != nil {
		t.Fatal(err)
	}
	n := 0
	for a, err := range v.by(t, "vault").Batch(t.Context(), client.View{NoWorkings: true, Checks: "governing"}, lugs(3000, func(i int, l *client.BatchLine) {
		if i%10 == 3 {
			l.Input = map[string]any{"units": "US"}
		}
	})) {
		if err != nil {
			t.Fatal(err)
		}
		if a.Ref == nil || *a.Ref != fmt.Sprint(n) {
			t.Fatalf("answer %d has the ref %v", n, a.Ref)
		}
		bad := n%10 == 3
		switch {
		case bad && (a.Result != nil || a.Problem == nil || a.Problem.Status != 400 || !strings.HasPrefix(a.Problem.Errors[0].Pointer, "/input/")):
			t.Errorf("answer %d to a lug without dimensions is %+v", n, a)
		case !bad && (a.Problem != nil || a.Result == nil || *a.Result.Governing.Margin != *want.Governing.Margin || a.Result.InputDigest != want.InputDigest || len(a.Result.Checks) != len(want.Checks) || len(a.Result.Workings) != 0):
			t.Errorf("answer %d is %+v", n, a)
		}
		n++
	}
	if n != 3000 {
		t.Errorf("%d answers to 3000 lines", n)
	}
}

// Each line stands for itself, whatever the others are.
func TestBatchLines(t *testing.T) {
	v := newWorld(t)
	good := `{"kind":"lug","ref":"good","input":{"units":"US","methods":["elementary"],"lug":{"shape":"round","width":2,"thickness":0.5,"hole_diameter":0.75,"edge_distance":1.125,"material":"7050-T7451-plate-0.250-1.500-L"},"factors":{"ultimate":1.5,"fitting":1.15},"load_cases":[{"id":"LC1","level":"limit","force":18000,"angle":0}]}}`
	record := func(more string) string {
		return strings.TrimSuffix(good, "}") + `,"record":{"subject":{"part":"SM-1","revision":"A","joint":"j"},"geometry_digest":"g"` + more + `}}`
	}
	lines := []struct{ text, want string }{
		{good, `{"ref":"good","result":{"verdict":"adequate"`},
		{"{", `{"ref":null,"problem":{"type":"/problems/malformed"`},
		{"null", `{"ref":null,"problem":{"type":"/problems/malformed"`},
		{`"` + strings.Repeat("a", 10<<20) + `"`, `{"ref":null,"problem":{"type":"/problems/malformed","title":"Malformed request","status":400,"detail":"The line is longer than 4 MiB."`},
		{good + good, `{"ref":null,"problem":{"type":"/problems/malformed"`},
		{`{"kind":"lug","ref":"r"}`, `{"ref":"r","problem":{"type":"/problems/malformed"`},
		{`{"kind":"beam","ref":"r","input":{}}`, `{"ref":"r","problem":{"type":"/problems/malformed"`},
		{strings.Replace(good, `"hole_diameter":0.75`, `"hole_diameter":2.5`, 1), `{"ref":"good","problem":{"type":"/problems/invalid"`},
		{strings.Replace(good, `"ref":"good",`, ``, 1), `{"ref":null,"result":{"verdict":"adequate"`},
		{record(``), `{"ref":"good","result":{"verdict":"adequate"`},
		{record(`,"idempotency_key":"k"`), `{"ref":"good","result":{"verdict":"adequate"`},
		{record(`,"idempotency_key":"k"`), `{"ref":"good","result":{"verdict":"adequate"`},
		{record(`,"idempotency_key":"k","note":"n"`), `{"ref":"good","problem":{"type":"/problems/idempotency-mismatch"`},
		{strings.Replace(record(``), `"part":"SM-1"`, `"part":""`, 1), `{"ref":"good","problem":{"type":"/problems/invalid"`},
	}
	var body strings.Builder
	for _, l := range lines {
		body.WriteString(l.text + "\n\n")
	}
	for _, who := range []string{"ada", "vault"} {
		request, err := http.NewRequestWithContext(t.Context(), http.MethodPost, v.url+"/v1/batches?workings=none", strings.NewReader(body.String()))
		if err != nil {
			t.Fatal(err)
		}
		request.Header.Set("Content-Type", "application/x-ndjson")
		request.Header.Set("Authorization", "Bearer "+v.keys[who])
		response, err := http.DefaultClient.Do(request)
		if err != nil {
			t.Fatal(err)
		}
		answers, err := io.ReadAll(response.Body)
		_ = response.Body.Close()
		if err != nil {
			t.Fatal(err)
		}
		got := strings.Split(strings.TrimSuffix(string(answers), "\n"), "\n")
		if len(got) != len(lines) {
			t.Fatalf("%d answers to %d lines", len(got), len(lines))
		}
		for i, l := range lines {
			want := l.want
			if who == "vault" && strings.Contains(l.text, `"record"`) {
				want = `{"ref":"good","problem":{"type":"/problems/forbidden"`
			}
			if !strings.HasPrefix(got[i], want) {
				t.Errorf("%s: %.100s\nis answered by %.200s\nwant %s", who, l.text, got[i], want)
			}
		}
		if who == "ada" && (!strings.Contains(got[10], `"replayed":false`) || !strings.Contains(got[11], `"replayed":true`)) {
			t.Errorf("the repeated record is answered by\n%.300s\n%.300s", got[10], got[11])
		}
	}
	n := 0
	for _, err := range v.by(t, "ada").Records(t.Context(), client.RecordFilter{}) {
		if err != nil {
			t.Fatal(err)
		}
		n++
	}
	if n != 2 {
		t.Errorf("%d records, want 2", n)
	}
	verifyExport(t, v.by(t, "ada"))
}

// Records of a batch stand in the log in the order of their lines: the last
// about a joint is the latest.
func TestBatchRecordsInOrder(t *testing.T) {
	v := newWorld(t)
	last := int64(-1)
	const lines = 300
	for a, err := range v.by(t, "ada").Batch(t.Context(), client.View{}, lugs(lines, func(i int, l *client.BatchLine) {
		l.Record = &client.BatchRecord{Subject: client.Subject{Part: "SM-1", Revision: "A", Joint: "j"}, GeometryDigest: fmt.Sprint(i), IdempotencyKey: fmt.Sprint(i)}
	})) {
		if err != nil || a.Record == nil {
			t.Fatalf("%+v, %v", a, err)
		}
		if a.Record.Index <= last {
			t.Fatalf("the index %d comes after %d", a.Record.Index, last)
		}
		last = a.Record.Index
	}
	for r, err := range v.by(t, "ada").Records(t.Context(), client.RecordFilter{Part: "SM-1", Latest: true}) {
		if err != nil || r.GeometryDigest != fmt.Sprint(lines-1) {
			t.Errorf("the latest is that of line %s, %v", r.GeometryDigest, err)
		}
	}
}

// A caller may stop reading answers, and the client ends the request.
func TestBatchStoppedByTheCaller(t *testing.T) {
	v := newWorld(t)
	taken := 0
	endless := lugs(1<<30, func(int, *client.BatchLine) { taken++ })
	n := 0
	for _, err := range v.by(t, "ada").Batch(t.Context(), client.View{NoWorkings: true}, endless) {
		if err != nil {
			t.Fatal(err)
		}
		if n++; n == 100 {
			break
		}
	}
	if n != 100 || taken > 1_000_000 {
		t.Errorf("%d answers, %d lines taken", n, taken)
	}
	answers(t, v)
}

// answers fails unless the server serves others.
func answers(t *testing.T, v *world) {
	t.Helper()
	began := time.Now()
	if _, err := v.by(t, "vault").Calculate(t.Context(), client.Lug, boomLug, client.View{}); err != nil {
		t.Errorf("the server does not serve others: %v", err)
	}
	if took := time.Since(began); took > 5*time.Second {
		t.Errorf("others wait for %s", took)
	}
}

// dial opens a batch by hand.
func (v *world) dial(t *testing.T) net.Conn {
	t.Helper()
	u, err := url.Parse(v.url)
	if err != nil {
		t.Fatal(err)
	}
	c, err := net.Dial("tcp", u.Host)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = c.Close() })
	fmt.Fprintf(c, "POST /v1/batches HTTP/1.1\r\nHost: %s\r\nAuthorization: Bearer %s\r\nContent-Type: application/x-ndjson\r\nTransfer-Encoding: chunked\r\n\r\n", u.Host, v.keys["ada"])
	return c
}

func chunk(w io.Writer, text string) error {
	_, err := fmt.Fprintf(w, "%x\r\n%s\r\n", len(text), text)
	return err
}

// A caller that sends nothing more, one that does not read, and one that hangs
// up: each ends soon, visibly cut, and the server serves others meanwhile.
func TestBatchThatStandsStillIsCut(t *testing.T) {
	v := newWorldWith(t, api.Options{StreamIdle: 2 * time.Second})
	t.Run("nothing comes", func(t *testing.T) {
		c := v.dial(t)
		if err := chunk(c, "{}\n"); err != nil {
			t.Fatal(err)
		}
		began := time.Now()
		_ = c.SetDeadline(began.Add(20 * time.Second))
		text, err := io.ReadAll(c)
		if err != nil && !errors.Is(err, io.ErrUnexpectedEOF) {
			t.Fatalf("not cut: %v", err)
		}
		if !strings.Contains(string(text), "/problems/malformed") || strings.HasSuffix(string(text), "0\r\n\r\n") {
			t.Errorf("the answer looks whole or lacks the first line:\n%s", text)
		}
		if took := time.Since(began); took < time.Second || took > 10*time.Second {
			t.Errorf("cut after %s, want about 2 s", took)
		}
	})
	t.Run("answers are not read", func(t *testing.T) {
		c := v.dial(t)
		ended := make(chan error, 1)
		go func() {
			for {
				if err := chunk(c, strings.Repeat("{}\n", 1000)); err != nil {
					ended <- err
					return
				}
			}
		}()
		answers(t, v)
		select {
		case <-ended:
		case <-time.After(20 * time.Second):
			t.Error("a caller that does not read is not cut")
		}
	})
	t.Run("the caller hangs up", func(t *testing.T) {
		c := v.dial(t)
		for range 10 {
			if err := chunk(c, strings.Repeat("{}\n", 100)); err != nil {
				t.Fatal(err)
			}
		}
		if _, err := bufio.NewReader(c).ReadString('\n'); err != nil {
			t.Fatal(err)
		}
		_ = c.Close()
		answers(t, v)
	})
	t.Run("slow but steady", func(t *testing.T) {
		n := 0
		slow := func(yield func(client.BatchLine) bool) {
			for line := range lugs(5, nil) {
				time.Sleep(800 * time.Millisecond)
				if !yield(line) {
					return
				}
			}
		}
		for _, err := range v.by(t, "ada").Batch(t.Context(), client.View{}, slow) {
			if err != nil {
				t.Fatal(err)
			}
			n++
		}
		if n != 5 {
			t.Errorf("%d answers, want 5", n)
		}
	})
}

func TestBatchNeedsItsMediaType(t *testing.T) {
	v := newWorld(t)
	for media, want := range map[string]int{"application/json": 415, "": 415, "application/x-ndjson; charset=utf-8": 200} {
		request, err := http.NewRequestWithContext(t.Context(), http.MethodPost, v.url+"/v1/batches", strings.NewReader("\n"))
		if err != nil {
			t.Fatal(err)
		}
		request.Header.Set("Content-Type", media)
		request.Header.Set("Authorization", "Bearer "+v.keys["ada"])
		response, err := http.DefaultClient.Do(request)
		if err != nil {
			t.Fatal(err)
		}
		_ = response.Body.Close()
		if response.StatusCode != want {
			t.Errorf("%q gives %d, want %d", media, response.StatusCode, want)
		}
	}
}

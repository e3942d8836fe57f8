package api_test

import (
	"bytes"
	"net/http"
	"strings"
	"testing"

	"github.com/prometheus/client_golang/prometheus/testutil/promlint"

	"jointledger/service"
	"jointledger/store/storetest"
)

// TestMetrics lints the exposition after every operation was called, and looks
// for what an alert would rest on.
func TestMetrics(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	for _, op := range theDocument(t).operations() {
		w.caller(op).do(t, w.sample(t, op, first(t, op)))
	}
	w.callers[service.Reader].do(t, get("/nothing/of/a/name/that/anybody/could/choose"))
	text := w.callers[""].do(t, get("/metrics")).want(t, http.StatusOK).body
	found, err := promlint.New(bytes.NewReader(text)).Lint()
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range found {
		t.Errorf("%s: %s", p.Metric, p.Text)
	}
	for _, line := range []string{
		`jointledger_request_duration_seconds_count{method="POST",route="/v1/records",status="201"} 2`,
		`jointledger_requests_in_flight 1`,
		`jointledger_panics_total 0`,
		`jointledger_altered_rows_total 0`,
		`jointledger_release_decisions_total{decision="hold"} 1`,
	} {
		if !strings.Contains(string(text), line+"\n") {
			t.Errorf("the metrics lack %s", line)
		}
	}
	for _, never := range []string{"anybody", w.record} {
		if strings.Contains(string(text), never) {
			t.Errorf("the metrics have a label of %q, which callers choose", never)
		}
	}
}

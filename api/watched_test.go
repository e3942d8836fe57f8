package api

import (
	"log/slog"
	"maps"
	"os"
	"regexp"
	"slices"
	"strings"
	"testing"

	"github.com/prometheus/client_golang/prometheus"
)

// metricNames are those that the registry knows, as Prometheus stores them.
func metricNames() map[string]bool {
	descriptions := make(chan *prometheus.Desc)
	go func() {
		NewMetrics(slog.New(slog.DiscardHandler)).registry.Describe(descriptions)
		close(descriptions)
	}()
	names := map[string]bool{}
	for d := range descriptions {
		name := regexp.MustCompile(`fqName: "(\w+)"`).FindStringSubmatch(d.String())[1]
		names[name] = true
		if strings.HasSuffix(name, "_seconds") || strings.HasSuffix(name, "_bytes") || strings.HasSuffix(name, "_entries") {
			for _, of := range []string{"_bucket", "_count", "_sum"} { // where it is a histogram
				names[name+of] = true
			}
		}
	}
	return names
}

// TestWatchedMetricsExist compares the names in the alert rules and in the
// dashboard with those of the registry, both ways.
func TestWatchedMetricsExist(t *testing.T) {
	exist := metricNames()
	if !exist["jointledger_requests_in_flight"] || !exist["process_open_fds"] {
		t.Fatalf("the registry was not read: %q", slices.Collect(maps.Keys(exist)))
	}
	watched := map[string]bool{}
	for _, file := range []string{"../deploy/prometheus/alerts.yaml", "../deploy/prometheus/alerts_test.yaml", "../deploy/grafana/jointledger.json"} {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		for _, name := range regexp.MustCompile(`\b(?:jointledger|process|go)_[a-z_]+`).FindAllString(string(text), -1) {
			watched[name] = true
			if !exist[name] {
				t.Errorf("%s watches %s, which does not exist", file, name)
			}
		}
	}
	for name := range exist {
		own := strings.HasPrefix(name, "jointledger_") && !strings.HasSuffix(name, "_bucket") && !strings.HasSuffix(name, "_count") && !strings.HasSuffix(name, "_sum")
		if own && !watched[name] && !watched[name+"_bucket"] && !watched[name+"_count"] {
			t.Errorf("%s is watched by no alert and on no dashboard", name)
		}
	}
}

// TestAlertsAreExplained: the operator finds each alert by its name.
func TestAlertsAreExplained(t *testing.T) {
	rules, err := os.ReadFile("../deploy/prometheus/alerts.yaml")
	if err != nil {
		t.Fatal(err)
	}
	page, err := os.ReadFile("../OPERATIONS.md")
	if err != nil {
		t.Fatal(err)
	}
	alerts := regexp.MustCompile(`alert: (\w+)`).FindAllStringSubmatch(string(rules), -1)
	if len(alerts) == 0 {
		t.Error("there are no alerts")
	}
	for _, alert := range alerts {
		if !strings.Contains(string(page), "`"+alert[1]+"`") {
			t.Errorf("OPERATIONS.md does not say what %s means", alert[1])
		}
	}
}

package api

import (
	"log/slog"
	"net"
	"net/http"
	"runtime"
	"time"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"
	"github.com/prometheus/client_golang/prometheus/promhttp"

	"jointledger/service"
)

// Metrics are what an operator watches. They implement service.Watch.
type Metrics struct {
	registry *prometheus.Registry
	requests *prometheus.HistogramVec
	bodies   prometheus.Histogram
	inFlight prometheus.Gauge
	panics   prometheus.Counter

	calculations *prometheus.CounterVec
	appends      *prometheus.HistogramVec
	groups       prometheus.Histogram
	appended     prometheus.Counter
	appendedAt   prometheus.Gauge
	decisions    *prometheus.CounterVec
	reasons      *prometheus.CounterVec
	replays      *prometheus.CounterVec
	altered      prometheus.Counter
	notices      *prometheus.CounterVec
	waiting      prometheus.Gauge
	connections  prometheus.Gauge
	log          *slog.Logger
}

// NewMetrics makes them, each at zero. What must never happen is logged too.
func NewMetrics(log *slog.Logger) *Metrics {
	m := &Metrics{
		log:      log,
		registry: prometheus.NewRegistry(),
		requests: prometheus.NewHistogramVec(prometheus.HistogramOpts{
			Name: "jointledger_request_duration_seconds", Help: "Time from the request line to the last byte of the answer.",
			Buckets: []float64{.0001, .00025, .0005, .001, .0025, .005, .01, .025, .05, .1, .25, .5, 1, 5, 30},
		}, []string{"method", "route", "status"}),
		bodies: prometheus.NewHistogram(prometheus.HistogramOpts{
			Name: "jointledger_request_body_bytes", Help: "Size of the bodies that were read.",
			Buckets: prometheus.ExponentialBuckets(256, 4, 9),
		}),
		inFlight: prometheus.NewGauge(prometheus.GaugeOpts{
			Name: "jointledger_requests_in_flight", Help: "Requests being answered.",
		}),
		panics: prometheus.NewCounter(prometheus.CounterOpts{
			Name: "jointledger_panics_total", Help: "Requests that ended in a defect of the program.",
		}),
	}
	m.calculations = prometheus.NewCounterVec(prometheus.CounterOpts{
		Name: "jointledger_calculations_total", Help: "Answers by method and verdict.",
	}, []string{"method", "verdict"})
	m.appends = prometheus.NewHistogramVec(prometheus.HistogramOpts{
		Name: "jointledger_append_duration_seconds", Help: "Time that the store took for a transaction of entries, by what became of it: stored, moved (another replica was first) or failed.",
		Buckets: []float64{.0005, .001, .0025, .005, .01, .025, .05, .1, .25, .5, 1, 2.5, 10},
	}, []string{"outcome"})
	m.groups = prometheus.NewHistogram(prometheus.HistogramOpts{
		Name: "jointledger_append_group_entries", Help: "Entries appended in one transaction.",
		Buckets: []float64{1, 2, 4, 8, 16, 32, 64, 128, 256},
	})
	m.appended = prometheus.NewCounter(prometheus.CounterOpts{
		Name: "jointledger_entries_appended_total", Help: "Entries that this server appended.",
	})
	m.appendedAt = prometheus.NewGauge(prometheus.GaugeOpts{
		Name: "jointledger_checkpoint_timestamp_seconds", Help: "When this server last signed a checkpoint over new entries; 0 before the first.",
	})
	m.decisions = prometheus.NewCounterVec(prometheus.CounterOpts{
		Name: "jointledger_release_decisions_total", Help: "Decisions of the gate.",
	}, []string{"decision"})
	m.reasons = prometheus.NewCounterVec(prometheus.CounterOpts{
		Name: "jointledger_release_findings_total", Help: "Reasons to hold, by code.",
	}, []string{"code"})
	m.altered = prometheus.NewCounter(prometheus.CounterOpts{
		Name: "jointledger_altered_rows_total", Help: "Times that stored rows were not those that were signed. Anything but 0 is an emergency.",
	})
	m.replays = prometheus.NewCounterVec(prometheus.CounterOpts{
		Name: "jointledger_replays_total", Help: "Records that were computed again as they were recorded, by outcome: reproduced or different. A difference says that this program does not compute what the recorded one did.",
	}, []string{"outcome"})
	m.connections = prometheus.NewGauge(prometheus.GaugeOpts{
		Name: "jointledger_connections", Help: "Connections that are open, idle ones too.",
	})
	build := prometheus.NewGauge(prometheus.GaugeOpts{
		Name: "jointledger_build_info", Help: "Always 1; the labels say which program this is.",
		ConstLabels: prometheus.Labels{"version": service.Engine, "go": runtime.Version()},
	})
	build.Set(1)
	// An alert on a rate needs the zero that it rises from.
	for _, outcome := range []service.Outcome{service.Stored, service.Moved, service.Failed} {
		m.appends.WithLabelValues(string(outcome))
	}
	m.replays.WithLabelValues(reproduced)
	m.replays.WithLabelValues(different)
	m.notices = prometheus.NewCounterVec(prometheus.CounterOpts{
		Name: "jointledger_notice_attempts_total", Help: "Attempts to deliver a notice to another system, by outcome.",
	}, []string{"target", "outcome"})
	m.waiting = prometheus.NewGauge(prometheus.GaugeOpts{
		Name: "jointledger_notices_waiting", Help: "Notices that were not delivered yet.",
	})
	m.registry.MustRegister(m.requests, m.bodies, m.inFlight, m.panics, m.connections, build,
		m.calculations, m.appends, m.groups, m.appended, m.appendedAt, m.decisions, m.reasons, m.replays, m.altered, m.notices, m.waiting,
		collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	return m
}

// Calculated implements service.Watch.
func (m *Metrics) Calculated(method, verdict string) {
	m.calculations.WithLabelValues(method, verdict).Inc()
}

// Appended implements service.Watch.
func (m *Metrics) Appended(outcome service.Outcome, entries int, took time.Duration) {
	m.appends.WithLabelValues(string(outcome)).Observe(took.Seconds())
	if outcome != service.Stored {
		return
	}
	m.groups.Observe(float64(entries))
	m.appended.Add(float64(entries))
	m.appendedAt.SetToCurrentTime()
}

// Decided implements service.Watch.
func (m *Metrics) Decided(decision string, codes []string) {
	m.decisions.WithLabelValues(decision).Inc()
	for _, code := range codes {
		m.reasons.WithLabelValues(code).Inc()
	}
}

// Outcomes of replays.
const (
	reproduced = "reproduced"
	different  = "different"
)

// Replayed implements service.Watch.
func (m *Metrics) Replayed(same bool) {
	outcome := different
	if same {
		outcome = reproduced
	}
	m.replays.WithLabelValues(outcome).Inc()
}

// Connection follows a connection from its first to its last state, as
// http.Server tells of them.
func (m *Metrics) Connection(_ net.Conn, state http.ConnState) {
	switch state {
	case http.StateNew:
		m.connections.Inc()
	case http.StateHijacked, http.StateClosed:
		m.connections.Dec()
	}
}

// Altered implements service.Watch.
func (m *Metrics) Altered(err error) {
	m.altered.Inc()
	m.log.Error("stored rows are not those that were signed", "error", err.Error())
}

// NoticeSent implements service.Watch.
func (m *Metrics) NoticeSent(n service.Notice, err error) {
	outcome := "sent"
	if err != nil {
		outcome = "failed"
		m.log.Warn("a notice was not taken", "notice", n.ID, "target", n.Target, "attempt", n.Attempts, "error", err.Error())
	}
	m.notices.WithLabelValues(n.Target, outcome).Inc()
}

// NoticesWait implements service.Watch.
func (m *Metrics) NoticesWait(n int64) { m.waiting.Set(float64(n)) }

func (m *Metrics) handler() http.Handler {
	return promhttp.HandlerFor(m.registry, promhttp.HandlerOpts{Registry: m.registry})
}

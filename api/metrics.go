package api

import (
	"log/slog"
	"net/http"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"
	"github.com/prometheus/client_golang/prometheus/promhttp"
)

// Metrics are what an operator watches. They implement service.Watch.
type Metrics struct {
	registry *prometheus.Registry
	requests *prometheus.HistogramVec
	bodies   prometheus.Histogram
	inFlight prometheus.Gauge
	panics   prometheus.Counter

	calculations *prometheus.CounterVec
	groups       prometheus.Histogram
	appended     prometheus.Counter
	appendedAt   prometheus.Gauge
	decisions    *prometheus.CounterVec
	reasons      *prometheus.CounterVec
	altered      prometheus.Counter
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
	m.registry.MustRegister(m.requests, m.bodies, m.inFlight, m.panics,
		m.calculations, m.groups, m.appended, m.appendedAt, m.decisions, m.reasons, m.altered,
		collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	return m
}

// Calculated implements service.Watch.
func (m *Metrics) Calculated(method, verdict string) {
	m.calculations.WithLabelValues(method, verdict).Inc()
}

// Grouped implements service.Watch.
func (m *Metrics) Grouped(entries int) {
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

// Altered implements service.Watch.
func (m *Metrics) Altered(err error) {
	m.altered.Inc()
	m.log.Error("stored rows are not those that were signed", "error", err.Error())
}

func (m *Metrics) handler() http.Handler {
	return promhttp.HandlerFor(m.registry, promhttp.HandlerOpts{Registry: m.registry})
}

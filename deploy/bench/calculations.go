package main

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"net/http"
	"os"
	"slices"
	"sync"
	"time"

	"github.com/go-json-experiment/json"
	"github.com/labstack/echo/v4"

	"jointledger/service"
)

// typicalLug is the README's first example: one lug, one method, one load case.
const typicalLug = `{"units":"US","title":"boom hinge","methods":["elementary"],
 "lug":{"shape":"round","width":2,"thickness":0.5,"hole_diameter":0.75,"edge_distance":1.125,"material":"7050-T7451-plate-0.250-1.500-L"},
 "factors":{"ultimate":1.5,"fitting":1.15},
 "load_cases":[{"id":"LC1","level":"limit","force":18000,"angle":0}]}`

// wholeJoint is that lug, bushed, with its pin and clevis.
const wholeJoint = `{"units":"US","title":"boom hinge","methods":["elementary"],
 "lug":{"shape":"round","width":2,"thickness":0.5,"hole_diameter":0.75,"edge_distance":1.125,"material":"7050-T7451-plate-0.250-1.500-L"},
 "bushing":{"material":"alloy-steel-180-ksi"},"pin":{"diameter":0.625,"material":"alloy-steel-180-ksi"},
 "clevis":{"shape":"round","width":2,"thickness":0.3,"hole_diameter":0.75,"edge_distance":1.125,"gap":0.02,"material":"7050-T7451-plate-0.250-1.500-L","bushing":{"material":"alloy-steel-180-ksi"}},
 "factors":{"ultimate":1.5,"fitting":1.15},
 "load_cases":[{"id":"LC1","level":"limit","force":18000,"angle":0}]}`

// bareWord makes this program the bare handler.
const bareWord = "bare"

// serveBare answers with Echo alone: a body is decoded into the same document,
// and the same result encoded, by the same JSON library. Nothing is checked,
// calculated, counted or logged.
func serveBare() {
	results := map[string]*service.Result{} // by view and shape of the question
	for _, body := range []string{typicalLug, wholeJoint} {
		for _, view := range []service.View{{}, {NoWorkings: true}} {
			result, err := service.Calculate(service.Lug, []byte(body), view)
			if err != nil {
				panic(err)
			}
			results[fmt.Sprint(view.NoWorkings, body == wholeJoint)] = result
		}
	}
	e := echo.New()
	e.HideBanner, e.HidePort = true, true
	e.GET("/readyz", func(c echo.Context) error { return c.NoContent(http.StatusOK) })
	e.POST("/v1/lugs", func(c echo.Context) error {
		body, err := io.ReadAll(c.Request().Body)
		if err != nil {
			return err
		}
		var document service.LugDocument
		if err := json.Unmarshal(body, &document); err != nil {
			return err
		}
		result := results[fmt.Sprint(c.QueryParam("workings") == "none", document.Clevis != nil)]
		answer, err := json.Marshal(result, json.Deterministic(true))
		if err != nil {
			return err
		}
		return c.Blob(http.StatusOK, "application/json", answer)
	})
	if err := e.Start(os.Args[2]); err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
}

// pair starts the program and the bare handler side by side.
func (b *bench) pair() (ours, bare *process, stop func(), _ error) {
	data, err := os.MkdirTemp(b.dir, "data-")
	if err != nil {
		return nil, nil, nil, err
	}
	if ours, err = b.serve("--data", data); err != nil {
		return nil, nil, nil, err
	}
	if bare, err = b.bare(); err != nil {
		return nil, nil, nil, err
	}
	return ours, bare, func() { _, _ = ours.stop(), bare.stop() }, nil
}

// calculations compares rates, and the processor time that a request costs the
// server, which other load on the machine moves less.
func calculations(_ context.Context, b *bench) error {
	ours, bare, stop, err := b.pair()
	if err != nil {
		return err
	}
	defer stop()
	b.report.table("answer", "requests/s", "bare Echo", "ratio", "spread", "µs of processor a request", "bare", "ratio", "")
	for _, of := range []struct{ name, path, body string }{
		{"typical lug, with workings", "/v1/lugs", typicalLug},
		{"typical lug, without", "/v1/lugs?workings=none", typicalLug},
		{"whole joint, with workings", "/v1/lugs", wholeJoint},
		{"whole joint, without", "/v1/lugs?workings=none", wholeJoint},
	} {
		var rates, bares, ratios, costs, bareCosts, costRatios []float64
		for range b.rounds {
			measure := func(p *process) (rate, cost float64, _ error) {
				before := p.processor()
				rate, err := b.wrk(p, of.path, []byte(of.body), 32)
				return rate, (p.processor() - before) / (rate * float64(max(1, int(b.each.Seconds())))) * 1e6, err
			}
			rate, cost, err := measure(ours)
			if err != nil {
				return err
			}
			bareRate, bareCost, err := measure(bare)
			if err != nil {
				return err
			}
			rates, bares, ratios = append(rates, rate), append(bares, bareRate), append(ratios, rate/bareRate)
			costs, bareCosts, costRatios = append(costs, cost), append(bareCosts, bareCost), append(costRatios, bareCost/cost)
		}
		b.report.row(of.name, median(rates), median(bares), median(ratios), spread(ratios),
			median(costs), median(bareCosts), median(costRatios), reach(median(ratios) >= 0.6, "≥ 0.6"))
	}
	b.report.text("32 connections by wrk. Resident memory after it %s MiB, at most %s MiB; the bare handler %s MiB.", figure(ours.memory("VmRSS")), figure(ours.memory("VmHWM")), figure(bare.memory("VmRSS")))
	return nil
}

// latency sends at a fixed rate, half of what the program takes, and counts from
// when each request was due.
func latency(ctx context.Context, b *bench) error {
	ours, bare, stop, err := b.pair()
	if err != nil {
		return err
	}
	defer stop()
	most, err := b.wrk(ours, "/v1/lugs", []byte(typicalLug), 32)
	if err != nil {
		return err
	}
	rate := most / 2
	b.report.text("At %s requests a second, half of the most with workings.", figure(rate))
	b.report.table("round", "p50 ms", "p99", "p99.9", "bare p50", "p99", "p99.9", "p99 ratio")
	var ratios []float64
	for round := range b.rounds {
		mine, err := paced(ctx, ours, rate, 2*b.each)
		if err != nil {
			return err
		}
		other, err := paced(ctx, bare, rate, 2*b.each)
		if err != nil {
			return err
		}
		ratio := quantile(mine, 0.99) / quantile(other, 0.99)
		ratios = append(ratios, ratio)
		b.report.row(round+1, quantile(mine, 0.5), quantile(mine, 0.99), quantile(mine, 0.999),
			quantile(other, 0.5), quantile(other, 0.99), quantile(other, 0.999), ratio)
	}
	b.report.text("p99 against bare Echo: median ratio %s (%s). %s (measured, not a gate).", figure(median(ratios)), spread(ratios), reach(median(ratios) <= 1.5, "≤ 1.5"))
	return nil
}

// paced sends a request whenever one is due, without waiting for others, and
// returns the sorted times to their answers in ms.
func paced(ctx context.Context, p *process, rate float64, during time.Duration) ([]float64, error) {
	client := http.Client{Timeout: 10 * time.Second, Transport: &http.Transport{MaxIdleConnsPerHost: 256, MaxConnsPerHost: 256}}
	defer client.CloseIdleConnections()
	var mu sync.Mutex
	var took []float64
	var failed error
	var all sync.WaitGroup
	start := time.Now()
	for i := 0; ; i++ {
		due := start.Add(time.Duration(float64(i) / rate * float64(time.Second)))
		if due.Sub(start) > during {
			break
		}
		time.Sleep(time.Until(due))
		all.Go(func() {
			err := ask(ctx, &client, p, "/v1/lugs", []byte(typicalLug), "")
			mu.Lock()
			defer mu.Unlock()
			took = append(took, time.Since(due).Seconds()*1000)
			if err != nil {
				failed = err
			}
		})
	}
	all.Wait()
	slices.Sort(took)
	return took, failed
}

// ask posts a body and reads the answer, which must be a success.
func ask(ctx context.Context, client *http.Client, p *process, path string, body []byte, idempotencyKey string) error {
	request, err := http.NewRequestWithContext(ctx, http.MethodPost, p.url+path, bytes.NewReader(body))
	if err != nil {
		return err
	}
	request.Header.Set("Content-Type", "application/json")
	request.Header.Set("Authorization", "Bearer "+p.key)
	if idempotencyKey != "" {
		request.Header.Set("Idempotency-Key", idempotencyKey)
	}
	response, err := client.Do(request)
	if err != nil {
		return err
	}
	defer response.Body.Close()
	if _, err := io.Copy(io.Discard, response.Body); err != nil {
		return err
	}
	if response.StatusCode >= 300 {
		return fmt.Errorf("%s answered %d", path, response.StatusCode)
	}
	return nil
}

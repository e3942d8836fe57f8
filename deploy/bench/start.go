package main

import (
	"context"
	"net/http"
	"os"
	"sync"
	"time"
)

// starts measures from the start of the process to its readiness, and what it
// takes when it does nothing and under load.
func starts(ctx context.Context, b *bench) error {
	info, err := os.Stat(b.program)
	if err != nil {
		return err
	}
	data, cluster, remove, err := b.ledgers()
	if err != nil {
		return err
	}
	defer remove()
	b.report.table("ledger", "start to ready, ms", "spread", "idle, MiB", "under load, MiB at most", "")
	for _, engine := range []struct {
		name  string
		where []string
	}{{"SQLite", []string{"--data", data}}, {"Postgres", []string{"--data", data + "-key", "--database-url", cluster.URL()}}} {
		first, err := b.serve(engine.where...)
		if err != nil {
			return err
		}
		if _, err := recordsASecond(ctx, first, 8, time.Second); err != nil {
			return err
		}
		if err := first.stop(); err != nil {
			return err
		}
		var ready, idle []float64
		var last *process
		for range 2*b.rounds + 1 {
			if last != nil {
				if err := last.stop(); err != nil {
					return err
				}
			}
			if last, err = b.serveOnly(engine.where...); err != nil {
				return err
			}
			ready = append(ready, float64(last.ready.Microseconds())/1000)
			time.Sleep(500 * time.Millisecond)
			idle = append(idle, last.memory("VmRSS"))
		}
		last.key = first.key
		if err := underLoad(ctx, last, b.each); err != nil {
			return err
		}
		b.report.row(engine.name, median(ready), spread(ready), median(idle), last.memory("VmHWM"), reach(median(ready) < 300 && median(idle) < 64, "< 300 ms, < 64 MiB idle"))
		if err := last.stop(); err != nil {
			return err
		}
	}
	b.report.text("The binary has %s MiB.", figure(float64(info.Size())/(1<<20)))
	return nil
}

// underLoad calculates and records at once.
func underLoad(ctx context.Context, p *process, during time.Duration) error {
	client := http.Client{Timeout: 10 * time.Second, Transport: &http.Transport{MaxIdleConnsPerHost: 32}}
	defer client.CloseIdleConnections()
	var all sync.WaitGroup
	var failed error
	all.Go(func() { _, failed = recordsASecond(ctx, p, 16, during) })
	for range 16 {
		all.Go(func() {
			for start := time.Now(); time.Since(start) < during; {
				if ask(ctx, &client, p, "/v1/lugs", []byte(typicalLug), "") != nil {
					return // the records' error tells
				}
			}
		})
	}
	all.Wait()
	return failed
}

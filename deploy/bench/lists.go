package main

import (
	"context"
	"crypto/rand"
	"encoding/base64"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"time"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/service/strictjson"
	"jointledger/store"
	"jointledger/store/storetest"
)

// lists fills a ledger step by step and times what is asked of it at each step.
func lists(ctx context.Context, b *bench) error {
	data, cluster, remove, err := b.ledgers()
	if err != nil {
		return err
	}
	defer remove()
	b.report.table(append([]string{"ledger", "records"}, questionNames()...)...)
	for _, engine := range []struct {
		name  string
		where []string
		open  func() (service.Store, error)
	}{
		{"SQLite", []string{"--data", data}, func() (service.Store, error) {
			return store.OpenSQLite(ctx, filepath.Join(data, "ledger.sqlite"))
		}},
		{"Postgres", []string{"--data", data, "--database-url", cluster.URL()}, func() (service.Store, error) {
			return store.OpenPostgres(ctx, cluster.URL())
		}},
	} {
		if err := listsOn(ctx, b, data, engine.name, engine.where, engine.open); err != nil {
			return fmt.Errorf("%s: %w", engine.name, err)
		}
	}
	b.report.text("Milliseconds, median and p99 of 200 requests one after another by one client. Records are of one lug with its governing check and no workings, of 1,000 parts with 25 joints each.")
	return nil
}

func listsOn(ctx context.Context, b *bench, data, name string, where []string, open func() (service.Store, error)) error {
	// The first start makes the signing key and the ledger, which stays without
	// API keys, so that pages answer without a sign-in.
	first, err := b.serveOnly(where...)
	if err != nil {
		return err
	}
	if err := first.stop(); err != nil {
		return err
	}
	text, err := os.ReadFile(filepath.Join(data, "signing.key"))
	if err != nil {
		return err
	}
	signer, err := ledger.NewSigner(text)
	if err != nil {
		return err
	}
	f, err := newFiller(signer, service.View{NoWorkings: true, Checks: "governing"})
	if err != nil {
		return err
	}
	for _, records := range b.records {
		engine, err := open()
		if err != nil {
			return err
		}
		began, had := time.Now(), f.made
		if err := f.fill(ctx, engine, records); err != nil {
			return err
		}
		if err := engine.Close(); err != nil {
			return err
		}
		fmt.Fprintf(os.Stderr, "%s: %d records in %s\n", name, records-had, time.Since(began).Round(time.Second))
		p, err := b.serveOnly(where...)
		if err != nil {
			return err
		}
		row := []any{name, records}
		for _, q := range questions {
			took, err := q.ask(p, f)
			if err != nil {
				return fmt.Errorf("%s at %d: %w", q.name, records, err)
			}
			row = append(row, took)
		}
		b.report.row(row...)
		if err := p.stop(); err != nil {
			return err
		}
	}
	return nil
}

// question is one request that is timed.
type question struct {
	name string
	path func(f *filler) string
}

var questions = []question{
	{"newest 50", func(*filler) string { return "/v1/records" }},
	{"of a part", func(*filler) string { return "/v1/records?part=SM-500&limit=50" }},
	{"latest of a part", func(*filler) string { return "/v1/records?part=SM-500&latest=true" }},
	{"inadequate", func(*filler) string { return "/v1/records?verdict=inadequate" }},
	{"last page", func(f *filler) string { return "/v1/records?cursor=" + f.cursor(60) }},
	{"one record", func(f *filler) string { return "/v1/records/" + f.middle }},
	{"proof", func(f *filler) string { return "/v1/records/" + f.middle + "/proof" }},
	{"consistency", func(f *filler) string { return "/v1/checkpoint/consistency?from=" + strconv.Itoa(f.made/3) }},
	{"part", func(*filler) string { return "/v1/parts?part=SM-500" }},
	{"home page", func(*filler) string { return "/" }},
	{"record page", func(f *filler) string { return "/records/" + f.middle }},
}

func questionNames() (names []string) {
	for _, q := range questions {
		names = append(names, q.name)
	}
	return names
}

// ask times a request.
func (q question) ask(p *process, f *filler) (string, error) {
	client := http.Client{Timeout: time.Minute, CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse }}
	defer client.CloseIdleConnections()
	var took []float64
	for range 200 {
		request, err := http.NewRequest(http.MethodGet, p.url+q.path(f), nil)
		if err != nil {
			return "", err
		}
		start := time.Now()
		response, err := client.Do(request)
		if err != nil {
			return "", err
		}
		body, err := io.ReadAll(response.Body)
		if err != nil {
			return "", err
		}
		response.Body.Close()
		took = append(took, time.Since(start).Seconds()*1000)
		if response.StatusCode != http.StatusOK {
			return "", fmt.Errorf("%d %.300s", response.StatusCode, body)
		}
	}
	sorted := slices.Sorted(slices.Values(took))
	return figure(quantile(sorted, 0.5)) + " / " + figure(quantile(sorted, 0.99)), nil
}

// filler appends records to a store as fast as it takes them, made of one that
// the program calculated.
type filler struct {
	signer *ledger.Signer
	body   map[string]any // of the sample's entry
	made   int
	middle string // id of a record in the middle
}

// newFiller calculates the record that all others are made of.
func newFiller(signer *ledger.Signer, view service.View) (*filler, error) {
	result, err := service.Calculate(service.Lug, []byte(typicalLug), view)
	if err != nil {
		return nil, err
	}
	text, err := strictjson.Canonical(result)
	if err != nil {
		return nil, err
	}
	return &filler{signer: signer, body: map[string]any{
		"geometry_digest": "sha256:00", "kind": "lug", "note": "", "input": strictjson.Raw(typicalLug), "input_digest": result.InputDigest,
		"result": strictjson.Raw(text), "made_by": map[string]string{"engine": service.Engine, "go": "go", "arch": "amd64"},
	}}, nil
}

// fill appends until there are so many records.
func (f *filler) fill(ctx context.Context, to service.Store, records int) error {
	head, err := to.Head(ctx)
	if err != nil {
		return err
	}
	for f.made < records {
		batch, err := f.batch(ctx, to, head, min(1000, records-f.made))
		if err != nil {
			return err
		}
		if half := int64(records/2) - int64(f.made-len(batch.Entries)); half >= 0 && half < int64(len(batch.Entries)) {
			f.middle = batch.Entries[half].ID
		}
		if err := to.Append(ctx, batch); err != nil {
			return err
		}
		head = batch.Head
	}
	return nil
}

// batch makes the next records, up to the signed head that they leave.
func (f *filler) batch(ctx context.Context, to service.Store, head service.Head, records int) (service.Batch, error) {
	var entries []service.Entry
	for range records {
		entry, err := f.entry(f.made)
		if err != nil {
			return service.Batch{}, err
		}
		f.made++
		entries = append(entries, entry)
	}
	return storetest.BatchOn(ctx, to, f.signer, head, entries)
}

func (f *filler) entry(n int) (service.Entry, error) {
	f.body["subject"] = map[string]string{"part": "SM-" + strconv.Itoa(n%1000), "revision": "A", "joint": "J" + strconv.Itoa(n/1000%25), "aspect": ""}
	body, err := strictjson.Canonical(f.body)
	if err != nil {
		return service.Entry{}, err
	}
	at := time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC).Add(time.Duration(n) * time.Second)
	var random [10]byte
	if _, err := rand.Read(random[:]); err != nil {
		return service.Entry{}, err
	}
	id := fmt.Sprintf("%08x-%04x-7%03x-8%03x-%012x", uint32(at.UnixMilli()>>16), uint16(at.UnixMilli()), uint16(random[0])<<4|uint16(random[1])>>4, uint16(random[2])<<4|uint16(random[3])>>4, random[4:])
	text, _, err := ledger.Seal(ledger.Envelope{Type: "record", ID: id, At: at.Format("2006-01-02T15:04:05.000Z"), Author: "bench", Body: body})
	if err != nil {
		return service.Entry{}, err
	}
	return service.EntryOf(text)
}

// cursor is that of a page under an index, as the server writes it.
func (f *filler) cursor(index int) string {
	return url.QueryEscape(base64.RawURLEncoding.EncodeToString([]byte("before:" + strconv.Itoa(index))))
}

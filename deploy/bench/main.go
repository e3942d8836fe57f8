// Bench measures the program against plain baselines on the same machine in the
// same run, and prints a table of ratios:
//
//	make bench
//	go run ./deploy/bench -only calculations,pure -o deploy/bench/2026-12-01.md
//
// A figure of one machine at one time says little; its ratio to a baseline that
// ran in turn with it says more. Whatever is compared is measured in rounds, one
// after the other, and the median of the rounds' ratios is told.
package main

import (
	"context"
	"flag"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"time"
)

// bench is one run.
type bench struct {
	program string // the built binary
	self    string // this binary, which is the bare handler too
	dir     string // for data, gone afterwards
	rounds  int
	each    time.Duration // of one measurement
	records []int
	report  *report
}

// part is one question of the run.
type part struct {
	name, title string
	run         func(context.Context, *bench) error
}

var parts = []part{
	{"calculations", "Calculations against a bare Echo handler", calculations},
	{"latency", "Latency of single calculations at half load", latency},
	{"appends", "Records against single-row commits", appends},
	{"log", "Records that are sealed already, against single-row commits", sealedEntries},
	{"pure", "Pure code: time of a load case", pure},
	{"start", "Start, memory, size", starts},
	{"lists", "Lists, proofs and pages as the ledger grows", lists},
}

func main() {
	if len(os.Args) > 1 && os.Args[1] == bareWord {
		serveBare()
		return
	}
	only := flag.String("only", "", "parts to run, separated by commas; all by default")
	out := flag.String("o", "", "file to keep the results in")
	rounds := flag.Int("rounds", 5, "rounds of each comparison")
	each := flag.Duration("each", 4*time.Second, "time of one measurement")
	most := flag.Int("records", 1_000_000, "records that lists are measured up to")
	flag.Parse()
	if err := run(*only, *out, *rounds, *each, *most); err != nil {
		fmt.Fprintln(os.Stderr, "bench:", err)
		os.Exit(1)
	}
}

func run(only, out string, rounds int, each time.Duration, most int) error {
	dir, err := os.MkdirTemp("", "jointledger-bench-")
	if err != nil {
		return err
	}
	defer os.RemoveAll(dir)
	self, err := os.Executable()
	if err != nil {
		return err
	}
	b := &bench{program: filepath.Join(dir, "jointledger"), self: self, dir: dir, rounds: rounds, each: each, report: &report{}}
	for _, n := range []int{1000, 100_000, 1_000_000} {
		if n <= most {
			b.records = append(b.records, n)
		}
	}
	build := exec.Command("go", "build", "-trimpath", "-o", b.program, ".")
	build.Env = append(os.Environ(), "CGO_ENABLED=0", "GOAMD64=v1")
	if text, err := build.CombinedOutput(); err != nil {
		return fmt.Errorf("building the program, from the module's folder: %w\n%s", err, text)
	}
	began := time.Now()
	if err := describe(b); err != nil {
		return err
	}
	for _, p := range parts {
		if only != "" && !strings.Contains(","+only+",", ","+p.name+",") {
			continue
		}
		fmt.Fprintln(os.Stderr, p.title)
		b.report.section(p.title)
		if err := p.run(context.Background(), b); err != nil {
			return fmt.Errorf("%s: %w", p.name, err)
		}
	}
	b.report.text("Took %s; load average at the end %s.", time.Since(began).Round(time.Second), loadAverage())
	text := b.report.String()
	if out != "" {
		if err := os.WriteFile(out, []byte(text), 0o644); err != nil {
			return err
		}
	}
	_, err = io.WriteString(os.Stdout, text)
	return err
}

package main

import (
	"bufio"
	"fmt"
	"io"
	"net/http"
	"os"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// BenchmarkBatches streams simple lugs through the program as a process of its
// own, the caller on the same cores: lines a second, the processor time of both
// for a line, which other work on the machine changes less, and the most memory
// that the server had resident. One operation is benchLines lines; -benchtime
// 50x streams a million.
func BenchmarkBatches(b *testing.B) {
	const benchLines = 20_000
	s := start(b, "--data", b.TempDir())
	line := `{"kind":"lug","ref":"hinge","input":` + strings.Join(strings.Fields(hinge), " ") + "}\n"
	body, send := io.Pipe()
	request, err := http.NewRequest(http.MethodPost, s.url+"/v1/batches?workings=none&checks=governing", body)
	if err != nil {
		b.Fatal(err)
	}
	request.Header.Set("Content-Type", "application/x-ndjson")
	permits := make(chan struct{})
	go func() {
		many := []byte(strings.Repeat(line, 100))
		for range permits {
			for range benchLines / 100 {
				if _, err := send.Write(many); err != nil {
					return
				}
			}
		}
		_ = send.Close() // never fails
	}()
	answer, err := (&http.Client{}).Do(begun(request, permits))
	if err != nil {
		b.Fatal(err)
	}
	defer answer.Body.Close()
	lines := bufio.NewReaderSize(answer.Body, 1<<20)
	take := func(n int) {
		for range n {
			got, err := lines.ReadSlice('\n')
			if err != nil || !strings.HasPrefix(string(got[:40]), `{"ref":"hinge","result":{"verdict":"adeq`) {
				b.Fatalf("%s, %v", got, err)
			}
		}
	}
	take(benchLines) // the one that begun has let through
	spent := processorTime(b, s.cmd.Process.Pid)
	for b.Loop() {
		permits <- struct{}{}
		take(benchLines)
	}
	spent = processorTime(b, s.cmd.Process.Pid) - spent
	lineCount := float64(b.N) * benchLines
	b.ReportMetric(lineCount/b.Elapsed().Seconds(), "lines/s")
	b.ReportMetric(spent.Seconds()*1e6/lineCount, "cpu-µs/line")
	b.ReportMetric(peakMiB(b, s.cmd.Process.Pid), "peak-MiB")
	close(permits)
}

// begun lets the first lines through: the answer begins with theirs.
func begun(request *http.Request, permits chan struct{}) *http.Request {
	go func() { permits <- struct{}{} }()
	return request
}

// processorTime is that of a process and of this one.
func processorTime(b *testing.B, pid int) time.Duration {
	b.Helper()
	var own syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &own); err != nil {
		b.Fatal(err)
	}
	stat, err := os.ReadFile(fmt.Sprintf("/proc/%d/stat", pid))
	if err != nil {
		b.Fatal(err)
	}
	// After the name in brackets; user and system time are fields 14 and 15, in
	// hundredths of a second (proc(5)).
	fields := strings.Fields(string(stat[strings.LastIndexByte(string(stat), ')')+2:]))
	total := time.Duration(own.Utime.Nano() + own.Stime.Nano())
	for _, field := range fields[11:13] {
		ticks, err := strconv.ParseInt(field, 10, 64)
		if err != nil {
			b.Fatal(err)
		}
		total += time.Duration(ticks) * 10 * time.Millisecond
	}
	return total
}

// peakMiB is the most memory that a process had resident.
func peakMiB(b *testing.B, pid int) float64 {
	b.Helper()
	status, err := os.ReadFile(fmt.Sprintf("/proc/%d/status", pid))
	if err != nil {
		b.Fatal(err)
	}
	_, after, _ := strings.Cut(string(status), "VmHWM:")
	fields := strings.Fields(after)
	if len(fields) == 0 {
		b.Fatal("the kernel does not tell the memory of a process")
	}
	kib, err := strconv.ParseFloat(fields[0], 64)
	if err != nil {
		b.Fatal(err)
	}
	return kib / 1024
}

package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"time"
)

// describe writes what the figures are figures of.
func describe(b *bench) error {
	sync, err := fsync(b.dir)
	if err != nil {
		return err
	}
	commit, err := exec.Command("git", "rev-parse", "--short", "HEAD").Output()
	if err != nil {
		commit = []byte("unknown")
	}
	changed := ""
	if text, err := exec.Command("git", "status", "--porcelain", "--untracked-files=no").Output(); err == nil && len(text) > 0 {
		changed = ", with changes"
	}
	fmt.Fprintf(b.report, "# Measured on %s\n", time.Now().UTC().Format("2006-01-02 15:04 UTC"))
	b.report.table("what", "")
	b.report.row("commit", strings.TrimSpace(string(commit))+changed)
	b.report.row("processor", fmt.Sprintf("%s, %d cores", field("/proc/cpuinfo", "model name"), runtime.NumCPU()))
	b.report.row("memory", field("/proc/meminfo", "MemTotal"))
	b.report.row("kernel", strings.TrimSpace(read("/proc/sys/kernel/osrelease")))
	b.report.row("Go", runtime.Version()+" "+runtime.GOARCH)
	b.report.row("one write of 4 KiB and fsync", fmt.Sprintf("%s µs, median of 200", figure(sync)))
	b.report.row("load average at the start", loadAverage())
	b.report.row("measurements", fmt.Sprintf("%d rounds of %s, median; generator and server share the cores", b.rounds, b.each))
	return nil
}

func loadAverage() string {
	return strings.Join(strings.Fields(read("/proc/loadavg"))[:3], " ")
}

// fsync is the time of one, in µs.
func fsync(dir string) (float64, error) {
	file, err := os.Create(filepath.Join(dir, "fsync"))
	if err != nil {
		return 0, err
	}
	defer file.Close()
	var took []float64
	page := make([]byte, 4096)
	for range 200 {
		start := time.Now()
		if _, err := file.Write(page); err != nil {
			return 0, err
		}
		if err := file.Sync(); err != nil {
			return 0, err
		}
		took = append(took, float64(time.Since(start).Microseconds()))
	}
	return median(took), nil
}

func read(path string) string {
	text, err := os.ReadFile(path)
	if err != nil {
		return ""
	}
	return string(text)
}

// field is the value of the first line "name : value".
func field(path, name string) string {
	for line := range strings.Lines(read(path)) {
		if before, after, ok := strings.Cut(line, ":"); ok && strings.TrimSpace(before) == name {
			return strings.TrimSpace(after)
		}
	}
	return "unknown"
}

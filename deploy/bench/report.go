package main

import (
	"fmt"
	"math"
	"slices"
	"strings"
)

// report is the results in Markdown.
type report struct{ strings.Builder }

func (r *report) section(title string) { fmt.Fprintf(r, "\n## %s\n\n", title) }

func (r *report) text(format string, args ...any) { fmt.Fprintf(r, "\n"+format+"\n", args...) }

// table writes a head; row its lines.
func (r *report) table(columns ...string) {
	fmt.Fprintf(r, "\n| %s |\n|%s\n", strings.Join(columns, " | "), strings.Repeat("---|", len(columns)))
}

func (r *report) row(cells ...any) {
	for _, c := range cells {
		if x, ok := c.(float64); ok {
			c = figure(x)
		}
		fmt.Fprintf(r, "| %v ", c)
	}
	r.WriteString("|\n")
}

// figure writes at least three figures.
func figure(x float64) string {
	switch size := math.Abs(x); {
	case size >= 100:
		return fmt.Sprintf("%.0f", x)
	case size >= 10:
		return fmt.Sprintf("%.1f", x)
	}
	return fmt.Sprintf("%.2f", x)
}

// reach says whether a figure is what it should be.
func reach(ok bool, want string) string {
	if ok {
		return want + ": reached"
	}
	return want + ": **not reached**"
}

func median(xs []float64) float64 {
	sorted := slices.Sorted(slices.Values(xs))
	if n := len(sorted); n%2 == 0 {
		return (sorted[n/2-1] + sorted[n/2]) / 2
	}
	return sorted[len(sorted)/2]
}

// spread is the least and the greatest.
func spread(xs []float64) string {
	return figure(slices.Min(xs)) + " to " + figure(slices.Max(xs))
}

// quantile of sorted values, the nearest rank.
func quantile(sorted []float64, q float64) float64 {
	return sorted[min(len(sorted)-1, int(math.Ceil(q*float64(len(sorted))))-1)]
}

// exponent is the slope of log y over log x by least squares.
func exponent(x, y []float64) float64 {
	var sx, sy, sxx, sxy float64
	for i := range x {
		a, b := math.Log(x[i]), math.Log(y[i])
		sx, sy, sxx, sxy = sx+a, sy+b, sxx+float64(a*a), sxy+float64(a*b)
	}
	n := float64(len(x))
	return (float64(n*sxy) - float64(sx*sy)) / (float64(n*sxx) - float64(sx*sx))
}

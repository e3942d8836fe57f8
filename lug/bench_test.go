package lug_test

import (
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

func benchmarkCase(b *testing.B, j lug.Joint, method string, angle float64) {
	p := prepare(b, j, methods(method), at(50000, angle))
	out := make([]strength.Margin, len(p.Checks()))
	b.ReportAllocs()
	for b.Loop() {
		p.Margins(0, out)
	}
}

func BenchmarkElementaryAxial(b *testing.B)  { benchmarkCase(b, bare(), "elementary", 0) }
func BenchmarkElementaryClevis(b *testing.B) { benchmarkCase(b, hinge(), "elementary", 0) }

func BenchmarkPrepareElementaryClevis(b *testing.B) {
	j, choices, cases := hinge(), methods("elementary"), at(50000, 0)
	b.ReportAllocs()
	for b.Loop() {
		if _, wrong := lug.Prepare(j, choices, usual(), cases); wrong != nil {
			b.Fatal(wrong)
		}
	}
}

func bareSlim() lug.Joint { return lug.Joint{Lug: slim().Lug} }

func BenchmarkAffdlAxial(b *testing.B)         { benchmarkCase(b, bareSlim(), affdl, 0) }
func BenchmarkAffdlOblique(b *testing.B)       { benchmarkCase(b, bareSlim(), affdl, 37) }
func BenchmarkAffdlClevisAxial(b *testing.B)   { benchmarkCase(b, slim(), affdl, 0) }
func BenchmarkAffdlClevisOblique(b *testing.B) { benchmarkCase(b, slim(), affdl, 37) }

func BenchmarkPrepareAffdlClevis(b *testing.B) {
	j, choices, cases := slim(), methods(affdl), at(50000, 37)
	b.ReportAllocs()
	for b.Loop() {
		if _, wrong := lug.Prepare(j, choices, usual(), cases); wrong != nil {
			b.Fatal(wrong)
		}
	}
}

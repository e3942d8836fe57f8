package main

import (
	"context"
	"fmt"
	"math"
	"runtime"
	"strconv"
	"time"

	"jointledger/fastener"
	"jointledger/lug"
	"jointledger/strength"
)

// timed times a call: the least of several runs that are long enough for the
// clock, in ns, and the allocations of one.
func timed(call func()) (ns, allocations float64) {
	n := 1
	for {
		start := time.Now()
		for range n {
			call()
		}
		if took := time.Since(start); took > 20*time.Millisecond {
			break
		}
		n *= 2
	}
	ns = math.Inf(1)
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	const runs = 7
	for range runs {
		start := time.Now()
		for range n {
			call()
		}
		ns = min(ns, float64(time.Since(start).Nanoseconds())/float64(n))
	}
	runtime.ReadMemStats(&after)
	return ns, math.Floor(float64(after.Mallocs-before.Mallocs) / float64(runs*n))
}

var factors = strength.Factors{Ultimate: 1.5, Fitting: 1.15}

// The parts are invented.
func plate() strength.Material {
	return strength.Material{
		Name: "SM plate", Source: "invented", Ftu: 450, Fty: 380, FtuCross: 440, FtyCross: 370, Fcy: 370, Fsu: 270, E: 71000, Ec: 72000, Nu: 0.33, Elongation: 0.08,
		Bearing: []strength.BearingStrength{{EOverD: 1.5, Fbru: 680, Fbry: 560}, {EOverD: 2, Fbru: 880, Fbry: 660}},
	}
}

func steel() strength.Material {
	return strength.Material{Name: "SM steel", Source: "invented", Ftu: 1100, Fty: 950, FtuCross: 1100, FtyCross: 950, Fcy: 1000, Fsu: 660, E: 205000, Nu: 0.29, Elongation: 0.12}
}

// hinge is a bushed round lug in a bushed clevis.
func hinge() lug.Joint {
	head := func(t float64) lug.Head {
		return lug.Head{Shape: lug.Round, Width: 70, Thickness: t, HoleDiameter: 25, EdgeDistance: 40, Material: plate()}
	}
	return lug.Joint{
		Lug: head(12), Bushing: &lug.Bushing{Material: steel()}, Pin: &lug.Pin{Diameter: 20, Material: steel()},
		Clevis: &lug.Clevis{Head: head(7), Gap: 0.5, Bushing: &lug.Bushing{Material: steel()}},
	}
}

// ballast is as much as the server keeps: with the least heap that there can be
// the garbage collector, which looks through all of this program's tables each
// time, would be timed too.
const ballast = 32 << 20

func pure(_ context.Context, b *bench) error {
	untouched := make([]byte, ballast)
	defer runtime.KeepAlive(untouched)
	if err := pureLugs(b); err != nil {
		return err
	}
	if err := purePatterns(b); err != nil {
		return err
	}
	return pureSplices(b)
}

func pureLugs(b *bench) error {
	b.report.table("lug method, whole joint", "checks", "axial load case, ns", "oblique, ns", "allocations", "prepare, ns")
	for _, m := range lug.Methods() {
		cases := []lug.LoadCase{
			{ID: "LC1", Level: strength.Limit, Force: 50000},
			{ID: "LC2", Level: strength.Limit, Force: 50000, Angle: 37},
		}
		joint, choices := hinge(), []lug.Choice{{Method: m.Name()}}
		p, faults := lug.Prepare(joint, choices, factors, cases)
		if len(faults) > 0 {
			return fmt.Errorf("%s: %v", m.Name(), faults)
		}
		margins := make([]strength.Margin, len(p.Checks()))
		axial, a := timed(func() { p.Margins(0, margins) })
		oblique, c := timed(func() { p.Margins(1, margins) })
		prepare, _ := timed(func() { lug.Prepare(joint, choices, factors, cases) })
		b.report.row(m.Name(), len(margins), axial, oblique, max(a, c), prepare)
	}
	b.report.text("melcon-hoblit has no built-in curve set, so most of its checks are undetermined here.")
	return nil
}

// grown is a table of sizes with its exponents.
type grown struct{ n, prepare, load []float64 }

func (g *grown) row(b *bench, n int, prepare, load, allocations float64) {
	g.n, g.prepare, g.load = append(g.n, float64(n)), append(g.prepare, prepare), append(g.load, load)
	b.report.row(n, prepare/1000, load/1000, load/float64(n), allocations)
}

// exponents are from a hundred on, where the constant part no longer hides
// them.
func (g *grown) exponents(b *bench, what string) {
	from := 0
	for from < len(g.n)-2 && g.n[from] < 100 {
		from++
	}
	prepare, load := exponent(g.n[from:], g.prepare[from:]), exponent(g.n[from:], g.load[from:])
	b.report.text("%s grow with exponent %s a load case and %s in preparing, from %g on: %s.", what, figure(load), figure(prepare), g.n[from], reach(prepare <= 1.1 && load <= 1.1, "≤ 1.1"))
}

func purePatterns(b *bench) error {
	b.report.table("fasteners", "prepare, µs", "load case, µs", "ns a fastener", "allocations")
	var g grown
	for _, n := range []int{10, 100, 1000, 10_000} {
		p := fastener.Pattern{Stiffness: "equal", Rules: fastener.RuleSets(), Interaction: "2-2"}
		kind := &fastener.Type{Name: "SM bolt", Source: "invented", ShearStrength: 20000, TensionStrength: 25000}
		columns := int(math.Ceil(math.Sqrt(float64(n))))
		for i := range n {
			p.Fasteners = append(p.Fasteners, fastener.Fastener{ID: strconv.Itoa(i), X: float64(i%columns) * 25, Y: float64(i/columns) * 25, Diameter: 6, Type: kind})
		}
		material, side := plate(), float64(columns)*25
		p.Plates = []fastener.Plate{{ID: "bracket", Thickness: 6, Material: &material, Outline: [][2]float64{{-15, -15}, {side, -15}, {side, side}, {-15, side}}}}
		cases := []fastener.PatternCase{{ID: "LC1", Level: strength.Ultimate, Point: [3]float64{side, 10, 20}, Force: [3]float64{1000, 2000, 500}, Moment: [3]float64{1e4, 0, 2e4}}}
		prepared, faults := fastener.PreparePattern(p, factors, cases)
		if len(faults) > 0 {
			return fmt.Errorf("%d fasteners: %v", n, faults)
		}
		margins := make([]strength.Margin, len(prepared.Checks()))
		load, allocations := timed(func() { prepared.Margins(0, margins) })
		prepare, _ := timed(func() { fastener.PreparePattern(p, factors, cases) })
		g.row(b, n, prepare, load, allocations)
	}
	g.exponents(b, "Patterns")
	return nil
}

func pureSplices(b *bench) error {
	b.report.table("rows", "prepare, µs", "load case, µs", "ns a row", "allocations")
	var g grown
	for _, n := range []int{3, 10, 100, 1000, 10_000} {
		s := fastener.Splice{Compliance: fastener.ComplianceGiven}
		material := plate()
		for i, thickness := range []float64{2, 3} {
			m := fastener.Member{ID: "m" + strconv.Itoa(i+1), E: 71e3, Material: &material, EdgeDistance: 10}
			for row := range n {
				m.RowThickness = append(m.RowThickness, thickness)
				if row > 0 {
					m.Bays = append(m.Bays, fastener.Bay{Thickness: thickness, Width: 25})
				}
			}
			s.Members = append(s.Members, m)
		}
		for row := range n {
			s.Rows = append(s.Rows, fastener.Row{Diameter: 5, Compliance: 1e-5, Type: &fastener.Type{Name: "SM rivet", Source: "invented", ShearStrength: 9000}})
			if row > 0 {
				s.Pitches = append(s.Pitches, 20)
			}
		}
		cases := []fastener.SpliceCase{{ID: "LC1", Level: strength.Limit, Ends: []fastener.End{{Member: "m1", Left: 1000}, {Member: "m2", Right: 1000}}}}
		prepared, faults := fastener.PrepareSplice(s, factors, cases)
		if len(faults) > 0 {
			return fmt.Errorf("%d rows: %v", n, faults)
		}
		margins, transfers := make([]strength.Margin, len(prepared.Checks())), prepared.NewTransfers()
		load, allocations := timed(func() {
			prepared.Transfers(0, &transfers)
			prepared.Margins(0, margins)
		})
		prepare, _ := timed(func() { fastener.PrepareSplice(s, factors, cases) })
		g.row(b, n, prepare, load, allocations)
	}
	g.exponents(b, "Splices")
	return nil
}

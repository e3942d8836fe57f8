//go:build crosscheck

package main_test

import (
	"bufio"
	"bytes"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"jointledger/fastener"
	"jointledger/strength"
)

// The cross-check runs splices, patterns and elastic lugs in CalculiX, a general
// finite-element program (Debian: calculix-ccx), and compares. The models and
// the table stay in crosscheckDir; run it by `make crosscheck`.
const crosscheckDir = "testdata/published/crosscheck"

// crosscheckRow is one comparison of the table.
type crosscheckRow struct {
	model, what      string
	ours, theirs     float64
	difference, most float64 // relative to the load or the value
}

func TestCrosscheck(t *testing.T) {
	version := calculixVersion(t)
	if err := os.MkdirAll(crosscheckDir, 0o755); err != nil {
		t.Fatal(err)
	}
	var rows []crosscheckRow
	for _, c := range crosscheckSplices() {
		rows = append(rows, checkSplice(t, c)...)
	}
	for _, c := range crosscheckPatterns() {
		rows = append(rows, checkPattern(t, c)...)
	}
	for _, c := range crosscheckLugs() {
		rows = append(rows, checkLug(t, c))
	}
	var table strings.Builder
	fmt.Fprintf(&table, "# Against a general finite-element program\n\n")
	fmt.Fprintf(&table, "CalculiX %s (Debian's calculix-ccx). Models are the `.inp` files beside this table; `make crosscheck` writes and runs them anew. N, mm, MPa.\n\n", version)
	fmt.Fprintf(&table, "Splices: trusses for the bays, springs for the fasteners. Patterns: a rigid body on springs, all six components. Differences of loads are relative to the load on the joint.\n\n")
	fmt.Fprintf(&table, "Lugs: plane stress, half a round lug, a rigid close-fitting pin without friction on contact springs; the largest hoop stress at the hole over the net-section stress. The formula is a fit that claims to be high by up to 7 %%.\n\n")
	fmt.Fprintf(&table, "| model | quantity | jointledger | CalculiX | difference |\n|---|---|---|---|---|\n")
	for _, r := range rows {
		fmt.Fprintf(&table, "| %s | %s | %.6g | %.6g | %.1e |\n", r.model, r.what, r.ours, r.theirs, r.difference)
		if !(math.Abs(r.difference) <= r.most) {
			t.Errorf("%s, %s: %.8g, CalculiX %.8g, differs by %.2e, allowed %.0e", r.model, r.what, r.ours, r.theirs, r.difference, r.most)
		}
	}
	if err := os.WriteFile(filepath.Join(crosscheckDir, "table.md"), []byte(table.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	if len(rows) < 60 {
		t.Errorf("only %d comparisons were made", len(rows))
	}
}

func calculixVersion(t *testing.T) string {
	out, err := exec.Command("ccx", "-v").CombinedOutput()
	found := regexp.MustCompile(`Version (\S+)`).FindSubmatch(out)
	if found == nil {
		t.Fatalf("CalculiX does not run (apt-get install calculix-ccx): %v %s", err, out)
	}
	return string(found[1])
}

// runCalculix keeps a model and solves it. The program's exit status tells
// nothing: its output is searched for errors, its results for rows.
func runCalculix(t *testing.T, name, model string) (dat, frd string) {
	t.Helper()
	if err := os.WriteFile(filepath.Join(crosscheckDir, name+".inp"), []byte(model), 0o644); err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "model.inp"), []byte(model), 0o644); err != nil {
		t.Fatal(err)
	}
	command := exec.Command("ccx", "model")
	command.Dir = dir
	out, err := command.CombinedOutput()
	if err != nil || bytes.Contains(out, []byte("*ERROR")) {
		t.Fatalf("%s: %v\n%s", name, err, out)
	}
	read := func(file string) string {
		data, err := os.ReadFile(filepath.Join(dir, file))
		if err != nil {
			t.Fatalf("%s: %v\n%s", name, err, out)
		}
		return string(data)
	}
	return read("model.dat"), read("model.frd")
}

// displacements reads the table of displacements by node.
func displacements(t *testing.T, dat string) map[int][3]float64 {
	t.Helper()
	u := map[int][3]float64{}
	for scanner := bufio.NewScanner(strings.NewReader(dat)); scanner.Scan(); {
		fields := strings.Fields(scanner.Text())
		if len(fields) != 4 {
			continue
		}
		node, err := strconv.Atoi(fields[0])
		if err != nil {
			continue
		}
		var at [3]float64
		for i := range at {
			if at[i], err = strconv.ParseFloat(fields[i+1], 64); err != nil {
				t.Fatal(err)
			}
		}
		u[node] = at
	}
	if len(u) == 0 {
		t.Fatalf("no displacements in\n%s", dat)
	}
	return u
}

// crosscheckSplice is a splice with one load case.
type crosscheckSplice struct {
	name   string
	splice fastener.Splice
	load   fastener.SpliceCase
}

// member runs through rows with a thickness for each bay.
func member(id string, e float64, first int, width float64, thickness ...float64) fastener.Member {
	m := fastener.Member{ID: id, E: e, FirstRow: first, LastRow: first + len(thickness)}
	for _, t := range thickness {
		m.Bays = append(m.Bays, fastener.Bay{Thickness: t, Width: width})
	}
	return m
}

func crosscheckSplices() []crosscheckSplice {
	rows := func(compliance ...float64) (rows []fastener.Row) {
		for _, c := range compliance {
			rows = append(rows, fastener.Row{Diameter: 5, Count: 1, Compliance: c})
		}
		return rows
	}
	limit := strength.Limit
	lap := fastener.Splice{
		Compliance: fastener.ComplianceGiven, Pitches: []float64{25, 25, 25}, Rows: rows(1.6e-5, 1.6e-5, 1.6e-5, 1.6e-5),
		Members: []fastener.Member{member("cap", 72e3, 1, 32, 2.5, 2.5, 2.5), member("bracket", 72e3, 1, 32, 4, 4, 4)},
	}
	butt := fastener.Splice{
		Compliance: fastener.ComplianceGiven, Pitches: []float64{20, 20, 40, 20, 20}, Rows: rows(1e-5, 1.2e-5, 1e-5, 1e-5, 1.2e-5, 1e-5),
		Members: []fastener.Member{
			member("upper strap", 72e3, 1, 60, 2, 3, 4, 3, 2), member("left plate", 72e3, 1, 60, 6, 6),
			member("right plate", 72e3, 4, 60, 6, 6), member("lower strap", 110e3, 1, 60, 2, 2, 2, 2, 2),
		},
	}
	butt.Rows[1].Count, butt.Rows[4].Count = 2, 3
	doubler := fastener.Splice{
		Compliance: fastener.ComplianceGiven, Pitches: []float64{15, 15, 15, 15, 15, 15}, Rows: rows(2e-5, 1e-5, 2e-5, 3e-5, 2e-5, 1e-5, 2e-5),
		Members: []fastener.Member{
			member("skin", 72e3, 1, 40, 1.6, 1.6, 1.6, 1.6, 1.6, 1.6), member("inner doubler", 72e3, 2, 40, 1, 1.2, 1.2, 1), member("outer doubler", 72e3, 3, 40, 0.8, 0.8),
		},
	}
	heated := fastener.Splice{
		Compliance: fastener.ComplianceGiven, Pitches: []float64{30, 30, 30, 30}, Rows: rows(8e-6, 8e-6, 9e-6, 8e-6, 8e-6),
		Members: []fastener.Member{member("skin", 70e3, 1, 50, 3, 3, 3, 3), member("steel strap", 200e3, 1, 50, 2, 2, 2, 2)},
	}
	heated.Members[0].Expansion, heated.Members[1].Expansion = 23e-6, 11.7e-6
	return []crosscheckSplice{
		{"splice-lap", lap, fastener.SpliceCase{ID: "pull", Level: limit, Ends: []fastener.End{{Member: "cap", Left: 20e3}, {Member: "bracket", Right: 20e3}}}},
		{"splice-butt", butt, fastener.SpliceCase{ID: "pull", Level: limit, Ends: []fastener.End{{Member: "left plate", Left: 50e3}, {Member: "right plate", Right: 50e3}}}},
		{"splice-doubler", doubler, fastener.SpliceCase{ID: "pull", Level: limit, Ends: []fastener.End{{Member: "skin", Left: 8e3, Right: 8e3}}}},
		{"splice-heated", heated, fastener.SpliceCase{
			ID: "pull hot", Level: limit, Ends: []fastener.End{{Member: "skin", Left: -4e3}, {Member: "steel strap", Right: -4e3}},
			Temperatures: []fastener.TemperatureChange{{Member: "skin", Change: 45}, {Member: "steel strap", Change: 30}},
		}},
	}
}

// checkSplice models the bays as trusses and the fasteners as springs.
func checkSplice(t *testing.T, c crosscheckSplice) []crosscheckRow {
	p, faults := fastener.PrepareSplice(c.splice, strength.Factors{Ultimate: 1.5, Fitting: 1}, []fastener.SpliceCase{c.load})
	if len(faults) > 0 {
		t.Fatalf("%s: %v", c.name, faults)
	}
	out := p.NewTransfers()
	p.Transfers(0, &out)

	s := c.splice
	node := func(m, row int) int { return 100*(m+1) + row }
	index := map[string]int{}
	var model strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&model, format+"\n", args...) }
	line("** %s: bays are trusses, fasteners springs; N, mm, MPa", c.name)
	for m := range s.Members {
		index[s.Members[m].ID] = m
		line("*NODE, NSET=MEMBER%d", m+1)
		x := 0.0
		for row := 1; row <= len(s.Rows); row++ {
			if row > 1 {
				x += s.Pitches[row-2]
			}
			if row >= s.Members[m].FirstRow && row <= s.Members[m].LastRow {
				line("%d, %.9e, %d., 0.", node(m, row), x, 10*m)
			}
		}
	}
	for m, member := range s.Members {
		line("*MATERIAL, NAME=MATERIAL%d\n*ELASTIC\n%.9e, 0.3\n*EXPANSION, ZERO=0.\n%.9e", m+1, member.E, member.Expansion)
		for j, bay := range member.Bays {
			element := node(m, member.FirstRow+j)
			line("*ELEMENT, TYPE=T3D2, ELSET=BAY%d", element)
			line("%d, %d, %d", element, element, element+1)
			line("*SOLID SECTION, ELSET=BAY%d, MATERIAL=MATERIAL%d\n%.9e", element, m+1, bay.Width*bay.Thickness)
		}
	}
	for k, i := range out.Interfaces {
		row := s.Rows[i.Row-1]
		line("*ELEMENT, TYPE=SPRING2, ELSET=FASTENER%d\n%d, %d, %d", k, 10000+k, node(i.First, i.Row), node(i.Second, i.Row))
		line("*SPRING, ELSET=FASTENER%d\n1, 1\n%.12e", k, float64(row.Count)/row.Compliance)
	}
	held := node(0, s.Members[0].FirstRow) // whose load the support gives
	line("*BOUNDARY")
	for m := range s.Members {
		line("MEMBER%d, 2, 3", m+1)
	}
	line("%d, 1, 1\n*INITIAL CONDITIONS, TYPE=TEMPERATURE", held)
	for m := range s.Members {
		line("MEMBER%d, 0.", m+1)
	}
	line("*STEP\n*STATIC\n*CLOAD")
	for _, end := range c.load.Ends {
		m := index[end.Member]
		line("%d, 1, %.9e", node(m, s.Members[m].FirstRow), -end.Left)
		line("%d, 1, %.9e", node(m, s.Members[m].LastRow), end.Right)
	}
	if len(c.load.Temperatures) > 0 {
		line("*TEMPERATURE")
		for _, change := range c.load.Temperatures {
			line("MEMBER%d, %.9e", index[change.Member]+1, change.Change)
		}
	}
	for m := range s.Members {
		line("*NODE PRINT, NSET=MEMBER%d\nU", m+1)
	}
	line("*END STEP")
	dat, _ := runCalculix(t, c.name, model.String())
	u := displacements(t, dat)
	var rows []crosscheckRow
	for _, i := range out.Interfaces {
		row := s.Rows[i.Row-1]
		theirs := float64(row.Count) / row.Compliance * (u[node(i.Second, i.Row)][0] - u[node(i.First, i.Row)][0])
		rows = append(rows, crosscheckRow{
			c.name, fmt.Sprintf("row %d, %s to %s", i.Row, s.Members[i.First].ID, s.Members[i.Second].ID),
			i.Load, theirs, (i.Load - theirs) / out.Through, 2e-5, // displacements are printed to seven digits
		})
	}
	return rows
}

// crosscheckPattern is a pattern with one load case.
type crosscheckPattern struct {
	name    string
	pattern fastener.Pattern
	load    fastener.PatternCase
}

func crosscheckPatterns() []crosscheckPattern {
	bolts := func(diameter float64, at ...[2]float64) (all []fastener.Fastener) {
		for i, xy := range at {
			all = append(all, fastener.Fastener{ID: strconv.Itoa(i + 1), X: xy[0], Y: xy[1], Diameter: diameter})
		}
		return all
	}
	square := fastener.Pattern{Stiffness: "equal", Fasteners: bolts(10, [2]float64{0, 0}, [2]float64{80, 0}, [2]float64{80, 60}, [2]float64{0, 60})}
	nine := fastener.Pattern{Stiffness: "area", Fasteners: bolts(
		8, [2]float64{-50, -30}, [2]float64{0, -34}, [2]float64{50, -30}, [2]float64{-55, 0}, [2]float64{3, 2},
		[2]float64{50, 0}, [2]float64{-45, 40}, [2]float64{0, 44}, [2]float64{62, 51},
	)}
	nine.Fasteners[2].Diameter, nine.Fasteners[6].Diameter, nine.Fasteners[8].Diameter = 12, 10, 6
	given := fastener.Pattern{Stiffness: "given", Fasteners: bolts(6, [2]float64{0, 0}, [2]float64{40, 5}, [2]float64{10, 30}, [2]float64{55, 45}, [2]float64{20, 70})}
	for i := range given.Fasteners {
		given.Fasteners[i].ShearStiffness, given.Fasteners[i].TensionStiffness = 1e4*float64(i+2), 3e4*float64(6-i)
	}
	u := strength.Ultimate
	return []crosscheckPattern{
		{"pattern-square", square, fastener.PatternCase{ID: "space", Level: u, Point: [3]float64{120, 20, 45}, Force: [3]float64{3000, -7000, 5000}, Moment: [3]float64{1e5, -2e5, 3e5}}},
		{"pattern-nine", nine, fastener.PatternCase{ID: "space", Level: u, Point: [3]float64{-15, 90, 30}, Force: [3]float64{-4000, 6000, 9000}, Moment: [3]float64{-2e5, 1e5, 5e5}}},
		{"pattern-given", given, fastener.PatternCase{ID: "space", Level: u, Point: [3]float64{25, 30, 60}, Force: [3]float64{8000, 2500, -6000}, Moment: [3]float64{3e5, 2e5, -1e5}}},
	}
}

// checkPattern models the attached member as a rigid body on springs.
func checkPattern(t *testing.T, c crosscheckPattern) []crosscheckRow {
	p, faults := fastener.PreparePattern(c.pattern, strength.Factors{Ultimate: 1.5, Fitting: 1}, []fastener.PatternCase{c.load})
	if len(faults) > 0 {
		t.Fatalf("%s: %v", c.name, faults)
	}
	shares := make([]fastener.Share, len(c.pattern.Fasteners))
	p.Shares(0, shares)

	stiffness := func(f fastener.Fastener) (shear, tension float64) {
		switch c.pattern.Stiffness {
		case "given":
			return f.ShearStiffness, f.TensionStiffness
		case "area":
			return 1e3 * f.Diameter * f.Diameter, 1e3 * f.Diameter * f.Diameter
		}
		return 1e5, 1e5
	}
	var model strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&model, format+"\n", args...) }
	line("** %s: a rigid attached member on a spring for each fastener and direction; N, mm", c.name)
	line("*NODE, NSET=FASTENERS")
	for i, f := range c.pattern.Fasteners {
		line("%d, %.9e, %.9e, 0.", i+1, f.X, f.Y)
	}
	line("*NODE\n1001, %.9e, %.9e, %.9e\n1002, %.9e, %.9e, %.9e", c.load.Point[0], c.load.Point[1], c.load.Point[2], c.load.Point[0], c.load.Point[1], c.load.Point[2])
	for i, f := range c.pattern.Fasteners {
		shear, tension := stiffness(f)
		for direction, k := range []float64{shear, shear, tension} {
			line("*ELEMENT, TYPE=SPRING1, ELSET=SPRING%d%d\n%d, %d", i+1, direction+1, 10*(i+1)+direction+1, i+1)
			line("*SPRING, ELSET=SPRING%d%d\n%d\n%.9e", i+1, direction+1, direction+1, k)
		}
	}
	line("*RIGID BODY, NSET=FASTENERS, REF NODE=1001, ROT NODE=1002\n*STEP\n*STATIC\n*CLOAD")
	for i := range 3 {
		line("1001, %d, %.9e\n1002, %d, %.9e", i+1, c.load.Force[i], i+1, c.load.Moment[i])
	}
	line("*NODE PRINT, NSET=FASTENERS\nU\n*END STEP")
	dat, _ := runCalculix(t, c.name, model.String())
	u := displacements(t, dat)
	largest := 0.0
	for _, s := range shares {
		largest = max(largest, s.Resultant, math.Abs(s.Tension))
	}
	var rows []crosscheckRow
	for i, f := range c.pattern.Fasteners {
		shear, tension := stiffness(f)
		for direction, ours := range []float64{shares[i].Shear[0], shares[i].Shear[1], shares[i].Tension} {
			k := shear
			if direction == 2 {
				k = tension
			}
			theirs := k * u[i+1][direction]
			rows = append(rows, crosscheckRow{
				c.name, fmt.Sprintf("fastener %s, %s", f.ID, [...]string{"V_x", "V_y", "T"}[direction]),
				ours, theirs, (ours - theirs) / largest, 2e-6,
			})
		}
	}
	return rows
}

// crosscheckLugs are the ratios W/D of round lugs.
func crosscheckLugs() []float64 { return []float64{2, 2.5, 3, 4, 5} }

//go:build crosscheck

package main_test

import (
	"bufio"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

// lugMesh is half a round lug in plane stress, of quadrilaterals with eight
// nodes, in the hole's radius from the hole's centre; the free end is at +x.
type lugMesh struct {
	nodes    [][2]float64
	elements [][8]int
	hole     []int // nodes at the hole, from the free end round to the body
	end, mid []int // nodes of the built-in end, and of the axis
	number   map[[2]int64]int
}

const (
	lugRound  = 48 // elements round half the hole
	lugOut    = 20 // from hole to outline
	lugLength = 3  // of the body behind, half widths
)

// node numbers a point, the same for points that are alike.
func (m *lugMesh) node(x, y float64) int {
	key := [2]int64{int64(math.Round(x * 1e7)), int64(math.Round(y * 1e7))}
	if n, ok := m.number[key]; ok {
		return n
	}
	m.nodes = append(m.nodes, [2]float64{x, y})
	m.number[key] = len(m.nodes)
	return len(m.nodes)
}

// patch fills a rectangle of parameters with elements.
func (m *lugMesh) patch(along, across int, point func(a, b float64) (x, y float64)) {
	at := func(a, b int) int { // in half elements
		x, y := point(float64(a)/float64(2*along), float64(b)/float64(2*across))
		return m.node(x, y)
	}
	for i := range along {
		for j := range across {
			a, b := 2*i, 2*j
			m.elements = append(m.elements, [8]int{
				at(a, b), at(a+2, b), at(a+2, b+2), at(a, b+2), at(a+1, b), at(a+2, b+1), at(a+1, b+2), at(a, b+1),
			})
		}
	}
}

func meshLug(ratio float64) *lugMesh {
	m := &lugMesh{number: map[[2]int64]int{}}
	half := ratio // of the width, in radii of the hole
	outline := func(angle float64) float64 {
		switch {
		case angle <= math.Pi/2:
			return half
		case angle <= 3*math.Pi/4:
			return half / math.Sin(angle)
		}
		return -half / math.Cos(angle)
	}
	ring := func(a, b float64) (x, y float64) {
		angle := math.Pi * b
		// Elements grow outwards by a fixed ratio, about 1.1 each.
		grown := math.Expm1(2*a) / math.Expm1(2)
		r := 1 + grown*(outline(angle)-1)
		return r * math.Cos(angle), r * math.Sin(angle)
	}
	m.patch(lugOut, lugRound, ring)
	for b := range 2*lugRound + 1 {
		x, y := ring(0, float64(b)/(2*lugRound))
		m.hole = append(m.hole, m.node(x, y))
	}
	// The body behind takes up the ring's nodes on x = -half.
	corner := 3 * lugRound / 4
	m.patch(12, lugRound-corner, func(a, b float64) (x, y float64) {
		_, y = ring(1, (float64(corner)+b*float64(lugRound-corner))/lugRound)
		return -half - a*lugLength*half, y
	})
	for i, p := range m.nodes {
		if math.Abs(p[0]+half+lugLength*half) < 1e-6 {
			m.end = append(m.end, i+1)
		}
		if math.Abs(p[1]) < 1e-6 {
			m.mid = append(m.mid, i+1)
		}
	}
	return m
}

const lugModulus = 70e3

// model writes the lug, 1 mm thick, with the hole's radius 10 mm, pulled by a
// rigid pin through springs that lie along its radii at the nodes bearing.
func (m *lugMesh) model(name string, bearing []int, stiffness, load float64) string {
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	line("** %s: half a round lug in plane stress on a rigid pin without friction; N, mm, MPa", name)
	line("*NODE, NSET=LUG")
	for i, p := range m.nodes {
		line("%d, %.6f, %.6f, 0.", i+1, 10*p[0], 10*p[1])
	}
	pin := len(m.nodes) + 1
	line("*NODE\n%d, 0., 0., 0.\n*ELEMENT, TYPE=CPS8, ELSET=LUG", pin)
	for i, e := range m.elements {
		line("%d, %s", i+1, strings.Trim(strings.ReplaceAll(fmt.Sprint(e), " ", ", "), "[]"))
	}
	line("*MATERIAL, NAME=ALUMINIUM\n*ELASTIC\n%e, 0.3\n*SOLID SECTION, ELSET=LUG, MATERIAL=ALUMINIUM\n1.", lugModulus)
	for i, n := range bearing {
		line("*ELEMENT, TYPE=SPRINGA, ELSET=CONTACT%d\n%d, %d, %d", i, 100000+i, pin, n)
		// Nodes in the middle of a side of a quadratic element take four times
		// a corner's part of a uniform pressure, those at corners two.
		part := 2.0
		if k := slices.Index(m.hole, n); k%2 == 1 {
			part = 4
		} else if k == 0 {
			part = 1
		}
		line("*SPRING, ELSET=CONTACT%d\n\n%.9e", i, part*stiffness)
	}
	line("*NSET, NSET=END")
	for _, n := range m.end {
		line("%d", n)
	}
	line("*NSET, NSET=AXIS")
	for _, n := range m.mid {
		line("%d", n)
	}
	line("*NSET, NSET=HOLE")
	for _, n := range m.hole {
		line("%d", n)
	}
	line("%d", pin)
	line("*BOUNDARY\nEND, 1, 1\nAXIS, 2, 2\n%d, 2, 3\n*STEP\n*STATIC\n*CLOAD\n%d, 1, %.9e", pin, pin, load/2)
	line("*NODE PRINT, NSET=HOLE\nU\n*NODE FILE\nU\n*EL FILE\nS\n*END STEP")
	return b.String()
}

// checkLug finds the stress concentration of a close-fitting rigid pin: nodes
// whose spring would pull are taken off until those that bear all push.
func checkLug(t *testing.T, ratio float64) crosscheckRow {
	name := fmt.Sprintf("lug-round-%g", ratio)
	mesh := meshLug(ratio)
	const load, rounds = 2000.0, 30
	// The springs of a node are a hundred times as stiff as the plate beside it.
	stiffness := 100 * lugModulus / lugRound
	bearing := slices.Clone(mesh.hole[:lugRound+1])
	var frd string
	settled := false
	for range rounds {
		var dat string
		dat, frd = runCalculix(t, name, mesh.model(name, bearing, stiffness, load))
		u := displacements(t, dat)
		pin := u[len(mesh.nodes)+1]
		kept := slices.DeleteFunc(slices.Clone(bearing), func(n int) bool {
			p, at := mesh.nodes[n-1], u[n]
			// Away from the pin's centre along the radius.
			return (at[0]-pin[0])*p[0]+(at[1]-pin[1])*p[1] > 0
		})
		if settled = len(kept) == len(bearing); settled {
			break
		}
		bearing = kept
	}
	if !settled {
		t.Fatalf("%s: contact did not settle", name)
	}
	stress := stresses(t, frd)
	largest := 0.0
	for _, n := range mesh.hole {
		p, s := mesh.nodes[n-1], stress[n]
		hoop := s[0]*p[1]*p[1] + s[1]*p[0]*p[0] - 2*s[3]*p[0]*p[1] // p has the length 1
		largest = max(largest, hoop)
	}
	theirs := largest / (load / (20*ratio - 20))

	j := lug.Joint{Lug: lug.Head{Shape: lug.Round, Width: 20 * ratio, Thickness: 1, HoleDiameter: 20, EdgeDistance: 10 * ratio}}
	p, faults := lug.Prepare(j, []lug.Choice{{Method: "elementary"}}, strength.Factors{Ultimate: 1.5, Fitting: 1}, []lug.LoadCase{{ID: "1", Level: strength.Limit, Force: load}})
	if len(faults) > 0 {
		t.Fatalf("%s: %v", name, faults)
	}
	for _, w := range p.StressConcentration() {
		if w.Symbol == "K_tn" {
			return crosscheckRow{name, fmt.Sprintf("K_tn at W/D %g", ratio), w.Value, theirs, w.Value/theirs - 1, 0.07}
		}
	}
	t.Fatalf("%s: no K_tn", name)
	return crosscheckRow{}
}

// stresses reads the nodal stresses (xx, yy, zz, xy, yz, zx) of a result file.
func stresses(t *testing.T, frd string) map[int][6]float64 {
	t.Helper()
	all := map[int][6]float64{}
	inside := false
	for scanner := bufio.NewScanner(strings.NewReader(frd)); scanner.Scan(); {
		text := scanner.Text()
		switch {
		case strings.HasPrefix(text, " -4  STRESS"):
			inside = true
		case strings.HasPrefix(text, " -3"):
			inside = false
		case inside && strings.HasPrefix(text, " -1"):
			node, err := strconv.Atoi(strings.TrimSpace(text[3:13]))
			if err != nil {
				t.Fatal(err)
			}
			var s [6]float64
			for i := range s {
				if s[i], err = strconv.ParseFloat(strings.TrimSpace(text[13+12*i:25+12*i]), 64); err != nil {
					t.Fatal(err)
				}
			}
			all[node] = s
		}
	}
	if len(all) == 0 {
		t.Fatal("no stresses in the result file")
	}
	return all
}

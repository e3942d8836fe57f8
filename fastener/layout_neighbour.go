package fastener

import (
	"cmp"
	"math"
	"slices"
)

// Neighbour is the nearest other fastener; the index is -1 where there is none.
type Neighbour struct {
	Index    int
	Distance float64 // between the centres
}

// grove is a balanced k-d tree laid out in one slice of indices: the middle of
// a range is its root, split along the longer side of the range's box.
type grove struct {
	fasteners []Fastener
	order     []int32
	byY       []bool // how the root at this place splits
}

// NearestNeighbours finds each fastener's nearest other one in O(n log² n),
// however they lie. Of equally near ones it returns any.
func NearestNeighbours(fasteners []Fastener) []Neighbour {
	g := plantGrove(fasteners)
	near := make([]Neighbour, len(fasteners))
	for i := range near {
		near[i] = Neighbour{-1, math.Inf(1)}
		g.search(0, len(g.order), i, &near[i])
	}
	return near
}

func plantGrove(fasteners []Fastener) *grove {
	g := &grove{fasteners: fasteners, order: make([]int32, len(fasteners)), byY: make([]bool, len(fasteners))}
	for i := range g.order {
		g.order[i] = int32(i)
	}
	g.plant(0, len(g.order))
	return g
}

// mostNeighbours bounds a neighbourhood; holes that do not overlap are fewer.
const mostNeighbours = 64

// neighbourhoods returns, for each fastener, the others whose holes a clear
// distance of twice its diameter may meet, from which on tearout does not govern.
func neighbourhoods(fasteners []Fastener) [][]int32 {
	g := plantGrove(fasteners)
	widest := 0.0
	for i := range fasteners {
		widest = max(widest, fasteners[i].hole())
	}
	all := make([][]int32, len(fasteners))
	for i := range fasteners {
		radius := float64(2*fasteners[i].Diameter) + fasteners[i].hole()/2 + widest
		g.within(0, len(g.order), i, radius, &all[i])
	}
	return all
}

// within gathers the fasteners nearer than radius to fastener i.
func (g *grove) within(from, to, i int, radius float64, found *[]int32) {
	if from >= to || len(*found) == mostNeighbours {
		return
	}
	middle := (from + to) / 2
	f := &g.fasteners[i]
	if root := g.order[middle]; int(root) != i {
		if other := &g.fasteners[root]; math.Hypot(other.X-f.X, other.Y-f.Y) < radius {
			*found = append(*found, root)
		}
	}
	ahead := f.X - g.at(middle, false)
	if g.byY[middle] {
		ahead = f.Y - g.at(middle, true)
	}
	if ahead <= radius {
		g.within(from, middle, i, radius, found)
	}
	if -ahead <= radius {
		g.within(middle+1, to, i, radius, found)
	}
}

func (g *grove) at(place int, byY bool) float64 {
	if f := &g.fasteners[g.order[place]]; byY {
		return f.Y
	} else {
		return f.X
	}
}

func (g *grove) plant(from, to int) {
	if to-from < 2 {
		return
	}
	loX, hiX, loY, hiY := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
	for _, i := range g.order[from:to] {
		f := &g.fasteners[i]
		loX, hiX, loY, hiY = min(loX, f.X), max(hiX, f.X), min(loY, f.Y), max(hiY, f.Y)
	}
	byY := hiY-loY > hiX-loX
	slices.SortFunc(g.order[from:to], func(a, b int32) int {
		if byY {
			return cmp.Compare(g.fasteners[a].Y, g.fasteners[b].Y)
		}
		return cmp.Compare(g.fasteners[a].X, g.fasteners[b].X)
	})
	middle := (from + to) / 2
	g.byY[middle] = byY
	g.plant(from, middle)
	g.plant(middle+1, to)
}

func (g *grove) search(from, to, i int, best *Neighbour) {
	if from >= to {
		return
	}
	middle := (from + to) / 2
	f := &g.fasteners[i]
	if root := int(g.order[middle]); root != i {
		other := &g.fasteners[root]
		if d := math.Hypot(other.X-f.X, other.Y-f.Y); d < best.Distance {
			*best = Neighbour{root, d}
		}
	}
	ahead := f.X - g.at(middle, false)
	if g.byY[middle] {
		ahead = f.Y - g.at(middle, true)
	}
	if ahead < 0 {
		g.search(from, middle, i, best)
		if -ahead < best.Distance {
			g.search(middle+1, to, i, best)
		}
		return
	}
	g.search(middle+1, to, i, best)
	if ahead <= best.Distance {
		g.search(from, middle, i, best)
	}
}

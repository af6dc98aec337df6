package grids

import (
	"cmp"
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// neighbourhood finds the places of the parts of one row after the other.
type neighbourhood struct {
	grid *cut
	row  int
	side []side // those that reach into the row
}

// farEnough is how far from an outline a place has to be, in cells, to be taken for inside whatever rounding does.
const farEnough = 1e-9

// place returns the place of a part: its centroid if it lies well inside, else a place in the middle of the longest run
// through the part at the height of the centroid, or at heights that leave other shares of the part below. Where a part
// is so thin that none is far enough from the outline, the farthest one inside is it.
func (n *neighbourhood) place(p portion) orb.Point {
	n.enter(p.row)
	g := n.grid
	corner := orb.Point{float64(p.column) * g.w, float64(p.row) * g.h}
	centroid := orb.Point{corner[0] + within(p.mx/p.area)*g.w, corner[1] + within(p.my/p.area)*g.h}
	enough := farEnough * min(g.w, g.h)
	best, farthest := centroid, -1.0
	if n.inside(centroid) {
		farthest = n.clearance(centroid)
	}
	for _, below := range []float64{0, 0.5, 0.3, 0.7, 0.1, 0.9} {
		if farthest > enough {
			break
		}
		y := centroid[1]
		if below > 0 {
			y = n.height(p, corner, below)
		}
		if at, ok := n.middle(y, corner[0], corner[0]+g.w); ok {
			if d := n.clearance(at); d > farthest {
				best, farthest = at, d
			}
		}
	}
	return best
}

func within(v float64) float64 { return min(max(v, 0), 1) }

// enter gathers the sides that reach into a row, those along x too.
func (n *neighbourhood) enter(row int) {
	if row == n.row {
		return
	}
	n.row, n.side = row, n.side[:0]
	south, north := float64(row)*n.grid.h, float64(row+1)*n.grid.h
	for _, s := range n.grid.side {
		if min(s.a[1], s.b[1]) <= north && max(s.a[1], s.b[1]) >= south {
			n.side = append(n.side, s)
		}
	}
}

// passing is where a line along x crosses the outline.
type passing struct {
	x    float64
	into int // 1 into the area from west to east, -1 out of it
}

// passings returns where the line along x at a height of this row crosses the outline, from west to east. A height is
// inside the area where more lead into it than out of it; where polygons overlap there may be several more.
func (n *neighbourhood) passings(y float64) []passing {
	var found []passing
	for _, s := range n.side {
		if into, ok := s.passing(y); ok {
			found = append(found, passing{crossingX(s, y), into})
		}
	}
	slices.SortFunc(found, func(a, b passing) int { return cmp.Or(cmp.Compare(a.x, b.x), cmp.Compare(a.into, b.into)) })
	return found
}

// passing reports whether a line along x crosses the side, and which way: the area is to its left.
func (s side) passing(y float64) (into int, ok bool) {
	if (s.a[1] > y) == (s.b[1] > y) {
		return 0, false
	}
	if s.a[1] > s.b[1] {
		return 1, true
	}
	return -1, true
}

// crossingX is taken from the lower end, as in Lattice.crossings.
func crossingX(s side, y float64) float64 {
	a, b := s.a, s.b
	if a[1] > b[1] {
		a, b = b, a
	}
	return a[0] + (y-a[1])/(b[1]-a[1])*(b[0]-a[0])
}

// inside reports whether a place of this row lies in the area.
func (n *neighbourhood) inside(at orb.Point) bool {
	depth := 0
	for _, s := range n.side {
		if into, ok := s.passing(at[1]); ok && crossingX(s, at[1]) <= at[0] {
			depth += into
		}
	}
	return depth > 0
}

// clearance is the distance of a place in this row to the outline, as far as it reaches into the row.
func (n *neighbourhood) clearance(at orb.Point) float64 {
	least := math.Inf(1)
	for _, s := range n.side {
		if away := max(min(s.a[0], s.b[0])-at[0], at[0]-max(s.a[0], s.b[0])); away > 0 && away*away >= least {
			continue
		}
		dx, dy := s.b[0]-s.a[0], s.b[1]-s.a[1]
		t := within(((at[0]-s.a[0])*dx + (at[1]-s.a[1])*dy) / (dx*dx + dy*dy))
		least = min(least, squared(at, orb.Point{s.a[0] + t*dx, s.a[1] + t*dy}))
	}
	return math.Sqrt(least)
}

// middle returns the middle of the longest run inside the area from west to east at a height, the first of runs alike.
func (n *neighbourhood) middle(y, west, east float64) (at orb.Point, ok bool) {
	longest, depth, from := 0.0, 0, 0.0
	for _, p := range n.passings(y) {
		if to := min(p.x, east); depth > 0 && to-from > longest*(1+1e-9) {
			longest = to - from
			at, ok = orb.Point{from + longest/2, y}, true
		}
		depth, from = depth+p.into, max(p.x, west)
	}
	return at, ok
}

// height returns the height in a cell below which a share of the part there lies, by halving.
func (n *neighbourhood) height(p portion, corner orb.Point, share float64) float64 {
	g := n.grid
	low, high := corner[1], corner[1]+g.h
	for range 50 {
		y := low + (high-low)/2
		if n.areaBelow(y, corner) < share*p.area*g.w*g.h {
			low = y
		} else {
			high = y
		}
	}
	return high
}

// areaBelow is the area of what lies in a cell below a height: the integral along the outline there of x dy, with x
// held within the cell.
func (n *neighbourhood) areaBelow(y float64, corner orb.Point) float64 {
	total := 0.0
	for _, s := range n.side {
		sign := 1.0
		if s.a[1] > s.b[1] {
			s.a, s.b, sign = s.b, s.a, -1
		}
		from, to := max(s.a[1], corner[1]), min(s.b[1], y)
		if from < to {
			total += sign * (to - from) * n.grid.heldMean(crossingX(s, from)-corner[0], crossingX(s, to)-corner[0])
		}
	}
	return total
}

// heldMean is the mean of x held between 0 and the width of a cell while x goes from a to b.
func (g *cut) heldMean(a, b float64) float64 {
	if a == b {
		return min(max(a, 0), g.w)
	}
	integral := func(x float64) float64 {
		held := min(max(x, 0), g.w)
		return held*held/2 + max(x-g.w, 0)*g.w
	}
	return (integral(b) - integral(a)) / (b - a)
}

package grids

import (
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// SharesIn returns the cells of a lattice that a shape covers at all, whether they are in the study area or not, ascending,
// with the true area in square metres that each has in common with it: exact in the plane, over the area scale at the
// cell's centre. Holes are left out whichever way rings turn; where polygons of the shape overlap, the area counts as
// often. Slivers of less than 1e-12 of a cell are left out. Vertices must be finite.
func SharesIn(l Lattice, shape orb.MultiPolygon) (cells []int, area []float64) {
	grid := cut{nx: l.NX, ny: l.NY, w: l.Cell, h: l.Cell, most: math.MaxInt}
	var met []portion
	for _, s := range sides(shape, orb.Point{l.X0, l.Y0}) {
		for _, piece := range grid.clip(s) {
			met = grid.along(met, piece)
		}
	}
	type common struct {
		cell int
		area float64
	}
	var found []common
	const sliver = 1e-12
	sweep(met, sliver, func(p portion) error { // its only error is that of emit
		if p.column < l.NX {
			k := p.row*l.NX + p.column
			found = append(found, common{k, p.area * l.CellAreaAt(k)})
		}
		return nil
	})
	slices.SortFunc(found, func(a, b common) int { return a.cell - b.cell })
	for _, c := range found {
		cells, area = append(cells, c.cell), append(area, c.area)
	}
	return cells, area
}

// clip returns what of a side bears on the cells of the grid: nothing of what lies above or below it, and what lies beside
// it moved to its edge, where the same cells are to the west of it.
func (g *cut) clip(s side) []side {
	width, height := float64(g.nx)*g.w, float64(g.ny)*g.h
	low, high := s.a, s.b
	if low[1] > high[1] {
		low, high = high, low
	}
	if !(low[1] < height && high[1] > 0) || low[1] == high[1] {
		return nil
	}
	at := func(y float64) orb.Point { return orb.Point{between(low[1], low[0], high[1], high[0], y), y} }
	from, to := low, high
	if from[1] < 0 {
		from = at(0)
	}
	if to[1] > height {
		to = at(height)
	}
	// Where the side passes the western and the eastern edge it is cut.
	stops := []orb.Point{from}
	for _, x := range []float64{0, width} {
		if (from[0] < x) != (to[0] < x) && from[0] != x && to[0] != x {
			stops = append(stops, orb.Point{x, between(from[0], from[1], to[0], to[1], x)})
		}
	}
	stops = append(stops, to)
	slices.SortStableFunc(stops, func(p, q orb.Point) int {
		switch {
		case p[1] < q[1]:
			return -1
		case p[1] > q[1]:
			return 1
		}
		return 0
	})
	var pieces []side
	for i := 1; i < len(stops); i++ {
		a, b := stops[i-1], stops[i]
		a[0], b[0] = min(max(a[0], 0), width), min(max(b[0], 0), width)
		if s.a[1] > s.b[1] {
			a, b = b, a
		}
		pieces = append(pieces, side{a, b})
	}
	return pieces
}

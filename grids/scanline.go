package grids

import (
	"cmp"
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// span is a run of cells in one row, i0 up to and without i1.
type span struct{ row, i0, i1 int }

// crossing is where an edge of a polygon meets the line through the centres of a row.
type crossing struct {
	row, polygon int
	x            float64
}

// spans returns the cells whose centres lie in shape, as runs sorted by row and column that do not overlap: even-odd
// within a polygon, so that holes are left out whichever way their rings turn; in shape if in any of its polygons. A
// centre on an edge belongs to the shape east or north of it, so shapes that share an edge never share a cell nor lose
// one between them. A polygon with a vertex that is not usable holds no cell.
func (l Lattice) spans(shape orb.MultiPolygon) []span {
	var found []crossing
	for p, polygon := range shape {
		if !usablePolygon(polygon) {
			continue
		}
		for _, ring := range polygon {
			for v := range ring {
				found = l.crossings(found, p, ring[v], ring[(v+1)%len(ring)])
			}
		}
	}
	slices.SortFunc(found, func(a, b crossing) int {
		return cmp.Or(cmp.Compare(a.row, b.row), cmp.Compare(a.polygon, b.polygon), cmp.Compare(a.x, b.x))
	})
	// crossings of a row and polygon come in pairs, since its rings are closed
	var out []span
	for c := 0; c+1 < len(found); c += 2 {
		s := span{found[c].row, firstFrom(l.centreX, found[c].x, l.X0, l.Cell, l.NX), 0}
		s.i1 = firstFrom(l.centreX, found[c+1].x, l.X0, l.Cell, l.NX)
		if s.i0 < s.i1 {
			out = append(out, s)
		}
	}
	return joined(out)
}

// crossings appends where the edge from a to b meets the rows. The edge is taken from its lower end, so that it comes
// out the same from both sides; its lower end belongs to it, its upper end does not.
func (l Lattice) crossings(found []crossing, polygon int, a, b orb.Point) []crossing {
	if a[1] > b[1] {
		a, b = b, a
	}
	first := firstFrom(l.centreY, a[1], l.Y0, l.Cell, l.NY)
	for j := first; j < l.NY; j++ {
		y := l.centreY(j)
		if y >= b[1] {
			break
		}
		x := a[0] + (y-a[1])/(b[1]-a[1])*(b[0]-a[0])
		found = append(found, crossing{j, polygon, x})
	}
	return found
}

// firstFrom is the first of n centres at or beyond v, n if there is none. The quotient is only a guess: what counts is
// the comparison with the centre itself.
func firstFrom(centre func(int) float64, v, origin, cell float64, n int) int {
	i := int(math.Max(0, math.Min(float64(n), math.Ceil((v-origin)/cell-0.5))))
	for i > 0 && centre(i-1) >= v {
		i--
	}
	for i < n && centre(i) < v {
		i++
	}
	return i
}

// joined sorts spans and joins those that meet or overlap.
func joined(s []span) []span {
	slices.SortFunc(s, func(a, b span) int { return cmp.Or(cmp.Compare(a.row, b.row), cmp.Compare(a.i0, b.i0)) })
	var out []span
	for _, s := range s {
		if n := len(out); n > 0 && out[n-1].row == s.row && s.i0 <= out[n-1].i1 {
			out[n-1].i1 = max(out[n-1].i1, s.i1)
			continue
		}
		out = append(out, s)
	}
	return out
}

func usablePolygon(p orb.Polygon) bool {
	for _, ring := range p {
		for _, v := range ring {
			if !usable(v[0], v[1]) {
				return false
			}
		}
	}
	return true
}

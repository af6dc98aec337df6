package grids

import (
	"math"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// Lattice is a regular grid of square cells. Cell k = j*NX + i is the i-th from the west and the j-th from the south;
// its centre is (X0 + (i+1/2) Cell, Y0 + (j+1/2) Cell), in metres in the plane of CRS.
type Lattice struct {
	CRS    crs.System
	X0, Y0 float64 // south-west corner of the south-west cell
	Cell   float64 // side of a cell
	NX, NY int
	Mask   []bool // true where a cell belongs to the study area; nil means everywhere
}

// Cells returns the number of cells, masked or not.
func (l Lattice) Cells() int { return l.NX * l.NY }

// In reports whether cell k belongs to the study area.
func (l Lattice) In(k int) bool { return l.Mask == nil || l.Mask[k] }

// Inside returns the number of cells that belong to the study area.
func (l Lattice) Inside() int {
	if l.Mask == nil {
		return l.Cells()
	}
	n := 0
	for _, in := range l.Mask {
		if in {
			n++
		}
	}
	return n
}

// Centre returns the centre of cell k.
func (l Lattice) Centre(k int) (x, y float64) { return l.centreX(k % l.NX), l.centreY(k / l.NX) }

func (l Lattice) centreX(i int) float64 { return l.X0 + (float64(i)+0.5)*l.Cell }

func (l Lattice) centreY(j int) float64 { return l.Y0 + (float64(j)+0.5)*l.Cell }

// Centres returns the centres of the cells of the study area in order, and which cells they are.
func (l Lattice) Centres() (cells []int, x, y []float64) {
	n := l.Inside()
	cells, x, y = make([]int, 0, n), make([]float64, 0, n), make([]float64, 0, n)
	for k := range l.Cells() {
		if l.In(k) {
			cx, cy := l.Centre(k)
			cells, x, y = append(cells, k), append(x, cx), append(y, cy)
		}
	}
	return cells, x, y
}

// Locate returns the cell that holds a place, whether it belongs to the study area or not; ok is false, and k -1, off
// the lattice and for NaN. A place on the edge between two cells is in the eastern or northern one; the lattice's own
// eastern and northern edges are in its last cells.
func (l Lattice) Locate(x, y float64) (k int, ok bool) {
	i, okx := along(x, l.X0, l.Cell, l.NX)
	j, oky := along(y, l.Y0, l.Cell, l.NY)
	if !okx || !oky {
		return -1, false
	}
	return j*l.NX + i, true
}

// along finds the cell of one axis. The quotient is only a guess: what counts is the comparison with the cell's edges.
func along(v, origin, cell float64, n int) (int, bool) {
	edge := func(i int) float64 { return origin + float64(i)*cell }
	if n < 1 || !(v >= origin && v <= edge(n)) {
		return 0, false
	}
	i := min(int((v-origin)/cell), n-1)
	if i > 0 && v < edge(i) {
		i--
	}
	if i < n-1 && v >= edge(i+1) {
		i++
	}
	return i, true
}

// Bound returns the corners of the lattice in the plane.
func (l Lattice) Bound() orb.Bound {
	return orb.Bound{
		Min: orb.Point{l.X0, l.Y0},
		Max: orb.Point{l.X0 + float64(l.NX)*l.Cell, l.Y0 + float64(l.NY)*l.Cell},
	}
}

// Outline returns the edge of cell k as a closed ring, counter-clockwise from its south-west corner. Neighbours share
// their corners to the last digit.
func (l Lattice) Outline(k int) orb.Ring {
	i, j := float64(k%l.NX), float64(k/l.NX)
	w, e := l.X0+i*l.Cell, l.X0+(i+1)*l.Cell
	s, n := l.Y0+j*l.Cell, l.Y0+(j+1)*l.Cell
	return orb.Ring{{w, s}, {e, s}, {e, n}, {w, n}, {w, s}}
}

// CellAreaAt returns the true ground area of cell k in square metres: Cell squared over the area scale at its centre.
func (l Lattice) CellAreaAt(k int) float64 {
	x, y := l.Centre(k)
	return l.Cell * l.Cell / l.CRS.AreaScale(x, y)
}

// Area returns the true ground area of the study area's cells in square metres.
func (l Lattice) Area() float64 {
	n, excess := 0, 0.0
	for k := range l.Cells() {
		if l.In(k) {
			n++
			excess += l.excess(k)
		}
	}
	return l.Cell * l.Cell * (float64(n) + excess)
}

// AreaOf returns the true ground area of the given cells in square metres.
func (l Lattice) AreaOf(cells []int) float64 {
	excess := 0.0
	for _, k := range cells {
		excess += l.excess(k)
	}
	return l.Cell * l.Cell * (float64(len(cells)) + excess)
}

// excess is by how much the ground in cell k is more than its share of the plane. Summing this, not the areas, keeps
// the area of n cells of an equal-area plane at n times one cell exactly.
func (l Lattice) excess(k int) float64 {
	x, y := l.Centre(k)
	return 1/l.CRS.AreaScale(x, y) - 1
}

// farthest is the largest coordinate that is calculated with: squares and products of differences stay finite.
const farthest = 1e150

// usable reports whether a coordinate pair is finite and within farthest; NaN is not.
func usable(x, y float64) bool { return math.Abs(x) <= farthest && math.Abs(y) <= farthest }

package batch

import (
	"errors"
	"fmt"
	"math"
	"math/bits"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/draft"

	"github.com/paulmach/orb"
)

// stance is where a region lies and what it shows.
type stance struct {
	response, unit string
	system         crs.System
	cells          int
	x0, y0, side   float64     // south-west corner and cell of its lattice
	plane          orb.Bound   // around its cells and the edge of its study area beside them, in its own plane
	edge           []orb.Point // places along the edge of plane in longitude and latitude; nil in local metres
	box            mapBox      // around its cells, in longitude and latitude or in local metres
}

func stanceOf(d draft.Draft) stance {
	s := stance{response: d.Response, unit: d.Unit, system: d.Lattice.CRS, cells: len(d.Cells),
		x0: d.Lattice.X0, y0: d.Lattice.Y0, side: d.Lattice.Cell, plane: boundOfCells(d.Lattice, d.Cells)}
	if len(d.Outline) > 0 {
		s.plane = s.plane.Union(commonBound(commonBound(d.Outline.Bound(), s.plane.Pad(s.side)), d.Lattice.Bound()))
	}
	s.box = planeBox(s.plane)
	if s.system.Geographic() {
		s.edge, s.box = globeBox(s.system, s.plane)
	}
	return s
}

// commonBound is what two boxes share; they must share something.
func commonBound(a, b orb.Bound) orb.Bound {
	return orb.Bound{
		Min: orb.Point{max(a.Min[0], b.Min[0]), max(a.Min[1], b.Min[1])},
		Max: orb.Point{min(a.Max[0], b.Max[0]), min(a.Max[1], b.Max[1])},
	}
}

// checkCells returns an error if a draft contradicts itself in what a mosaic takes from it.
func checkCells(d draft.Draft) error {
	l := d.Lattice
	if l.CRS == nil || !(l.Cell > 0) || l.NX < 1 || l.NY < 1 || l.NX > grids.MostCells/l.NY {
		return errors.New("its lattice has no extent")
	}
	for _, column := range [][]float64{d.Estimate, d.StandardError, d.Lower, d.Upper, d.CV, d.Nearest} {
		if len(column) != len(d.Cells) {
			return fmt.Errorf("%d values for %d cells", len(column), len(d.Cells))
		}
	}
	if d.Chance != nil && len(d.Chance) != len(d.Cells) {
		return fmt.Errorf("%d chances for %d cells", len(d.Chance), len(d.Cells))
	}
	last := int32(-1)
	for _, k := range d.Cells {
		if k <= last || int(k) >= l.Cells() {
			return fmt.Errorf("cell %d is not of its lattice or out of order", k)
		}
		last = k
	}
	return nil
}

// boundOfCells is the box around the cells of a list that is not empty.
func boundOfCells(l grids.Lattice, cells []int32) orb.Bound {
	i0, i1 := l.NX, -1
	for _, k := range cells {
		i0, i1 = min(i0, int(k)%l.NX), max(i1, int(k)%l.NX)
	}
	j0, j1 := int(cells[0])/l.NX, int(cells[len(cells)-1])/l.NX
	return orb.Bound{
		Min: orb.Point{l.X0 + float64(i0)*l.Cell, l.Y0 + float64(j0)*l.Cell},
		Max: orb.Point{l.X0 + float64(i1+1)*l.Cell, l.Y0 + float64(j1+1)*l.Cell},
	}
}

// mapBox is a box for finding regions that may meet: x around a middle, so that longitudes may run over 180.
type mapBox struct {
	x, halfX, south, north float64
	globe                  bool // x are longitudes
}

func (b mapBox) meets(o mapBox) bool {
	apart := b.x - o.x
	if b.globe {
		apart = math.Remainder(apart, 360)
	}
	return math.Abs(apart) <= b.halfX+o.halfX && b.south <= o.north && o.south <= b.north
}

func planeBox(b orb.Bound) mapBox {
	return mapBox{x: (b.Min[0] + b.Max[0]) / 2, halfX: (b.Max[0] - b.Min[0]) / 2, south: b.Min[1], north: b.Max[1]}
}

// What a box on the globe needs: places along each side of the plane's box, and a margin, as a share of the box, for what
// bends out between them. The sides of a box of a thousand kilometres bend by twenty or so, between 16 places by a 256th of that.
const (
	placesAlong = 16
	bendMargin  = 0.01
)

// globeBox returns places along the edge of a box of the plane, and the box in longitude and latitude that holds all of
// it: longitude and latitude have no extremes within the edge unless a pole lies there. Where a place of the edge is
// not on the globe the edge is nil and the box is the whole globe.
func globeBox(system crs.System, plane orb.Bound) (edge []orb.Point, box mapBox) {
	for _, p := range alongEdge(plane) {
		lon, lat := system.Inverse(p[0], p[1])
		if math.IsNaN(lon) || math.IsNaN(lat) {
			return nil, mapBox{halfX: 180, south: -90, north: 90, globe: true}
		}
		edge = append(edge, orb.Point{lon, lat})
	}
	middle, _ := system.Inverse(plane.Center()[0], plane.Center()[1])
	west, east, south, north := 0.0, 0.0, 90.0, -90.0
	for _, p := range edge {
		from := math.Remainder(p[0]-middle, 360)
		west, east = min(west, from), max(east, from)
		south, north = min(south, p[1]), max(north, p[1])
	}
	margin := bendMargin * max(east-west, north-south)
	box = mapBox{x: middle + (west+east)/2, halfX: (east-west)/2 + margin, south: south - margin, north: north + margin, globe: true}
	for _, pole := range [2]float64{-90, 90} {
		if x, y := system.Forward(0, pole); plane.Contains(orb.Point{x, y}) {
			box.halfX, box.south, box.north = 180, min(box.south, pole), max(box.north, pole)
		}
	}
	return edge, box
}

// alongEdge returns places along the edge of a box.
func alongEdge(b orb.Bound) []orb.Point {
	var places []orb.Point
	corner := [5]orb.Point{b.Min, {b.Max[0], b.Min[1]}, b.Max, {b.Min[0], b.Max[1]}, b.Min}
	for c := range 4 {
		for k := range placesAlong {
			f := float64(k) / placesAlong
			places = append(places, orb.Point{corner[c][0] + f*(corner[c+1][0]-corner[c][0]), corner[c][1] + f*(corner[c+1][1]-corner[c][1])})
		}
	}
	return places
}

// boundIn returns a box in another plane that holds all of the region; ok is false where there may be none, as for a
// region that goes far around the globe.
func (s stance) boundIn(system crs.System) (b orb.Bound, ok bool) {
	if s.system.Code() == system.Code() {
		return s.plane, true
	}
	const farAround = 60 // degrees
	polar := s.box.halfX == 180
	if s.edge == nil || s.box.halfX > farAround && !polar || s.box.north-s.box.south > farAround {
		return b, false
	}
	for i, p := range s.edge {
		x, y := system.Forward(p[0], p[1])
		switch {
		case math.IsNaN(x) || math.IsNaN(y):
			return b, false
		case i == 0:
			b = orb.Bound{Min: orb.Point{x, y}, Max: orb.Point{x, y}}
		default:
			b = b.Extend(orb.Point{x, y})
		}
	}
	return b.Pad(bendMargin * max(b.Max[0]-b.Min[0], b.Max[1]-b.Min[1])), true
}

// crossing brings places of one plane into another.
func crossing(from, to crs.System) func(x, y float64) (float64, float64) {
	if from.Code() == to.Code() {
		return func(x, y float64) (float64, float64) { return x, y }
	}
	return func(x, y float64) (float64, float64) { return to.Forward(from.Inverse(x, y)) }
}

// tileGround is what of a draft decides who shows a spot.
type tileGround struct {
	grids.Lattice
	cells   []int32
	nearest []float64
	outline orb.MultiPolygon
	edges   [][]outlineEdge // of the outline, by the rows of the lattice that they touch; nil until they are asked for
	// member has a bit for each cell of the lattice that is in the study area; before counts those in earlier words.
	member []uint64
	before []int32
}

func groundOf(d draft.Draft) *tileGround {
	words := (d.Lattice.Cells() + 63) / 64
	g := &tileGround{Lattice: d.Lattice, cells: d.Cells, nearest: d.Nearest, outline: d.Outline,
		member: make([]uint64, words), before: make([]int32, words)}
	for _, k := range d.Cells {
		g.member[k>>6] |= 1 << (k & 63)
	}
	n := 0
	for w, word := range g.member {
		g.before[w] = int32(n)
		n += bits.OnesCount64(word)
	}
	return g
}

func (g *tileGround) has(k int) bool { return g.member[k>>6]>>(k&63)&1 == 1 }

// row returns how many cells of the study area come before cell k: its row, if it is one of them.
func (g *tileGround) row(k int) int {
	return int(g.before[k>>6]) + bits.OnesCount64(g.member[k>>6]&(1<<(k&63)-1))
}

// at returns the row of the cell that holds a place of the plane; ok is false where there is none, and beyond the edge of
// the study area, out of which edge cells stand.
func (g *tileGround) at(x, y float64) (row int, ok bool) {
	k, ok := g.Locate(x, y)
	if !ok || !g.has(k) || g.outline != nil && g.onEdge(k) && !g.inOutline(k/g.NX, x, y) {
		return 0, false
	}
	return g.row(k), true
}

// onEdge reports whether one of the eight cells around a cell is not in the study area.
func (g *tileGround) onEdge(k int) bool {
	i, j := k%g.NX, k/g.NX
	if i == 0 || j == 0 || i == g.NX-1 || j == g.NY-1 {
		return true
	}
	for _, row := range [3]int{k - g.NX, k, k + g.NX} {
		if !g.has(row-1) || !g.has(row) || !g.has(row+1) {
			return true
		}
	}
	return false
}

// beside returns the row of the cell next to a place that no cell holds but that lies in the study area: its own cell has
// its centre beyond the border, and so may the neighbour's cell there, which would leave specks of blank paper along borders.
// Places in cells that were left out for being far from all observations have no such row.
func (g *tileGround) beside(x, y float64) (row int, ok bool) {
	k, ok := g.Locate(x, y)
	if !ok || g.outline == nil || g.has(k) {
		return 0, false
	}
	nearest, i, j := math.Inf(1), k%g.NX, k/g.NX
	for v := max(j-1, 0); v <= min(j+1, g.NY-1); v++ {
		for u := max(i-1, 0); u <= min(i+1, g.NX-1); u++ {
			cx, cy := g.Centre(v*g.NX + u)
			if d := math.Hypot(x-cx, y-cy); d < nearest && g.has(v*g.NX+u) {
				nearest, row = d, g.row(v*g.NX+u)
			}
		}
	}
	cx, cy := g.Centre(k)
	return row, !math.IsInf(nearest, 1) && g.inOutline(j, x, y) && !g.inOutline(j, cx, cy)
}

// outlineEdge is an edge of a polygon of the outline.
type outlineEdge struct {
	polygon int
	a, b    orb.Point
}

// inOutline reports whether a place in row j of the lattice lies in the outline: in some polygon and not in its holes.
// A ray to the east crosses the rings of that polygon an odd number of times; only the edges of the row are looked at.
func (g *tileGround) inOutline(j int, x, y float64) bool {
	if g.edges == nil {
		g.edges = g.edgesByRow()
	}
	inside, polygon := false, -1
	for _, e := range g.edges[j] {
		if e.polygon != polygon {
			if inside {
				return true
			}
			polygon = e.polygon
		}
		if (e.a[1] > y) != (e.b[1] > y) && x < e.a[0]+(y-e.a[1])/(e.b[1]-e.a[1])*(e.b[0]-e.a[0]) {
			inside = !inside
		}
	}
	return inside
}

func (g *tileGround) edgesByRow() [][]outlineEdge {
	rows := make([][]outlineEdge, g.NY)
	for number, polygon := range g.outline {
		for _, ring := range polygon {
			for i := range ring[:max(len(ring)-1, 0)] {
				e := outlineEdge{number, ring[i], ring[i+1]}
				// A row more on either side: which row a place is in is settled by comparison, not by this quotient.
				low, high := (min(e.a[1], e.b[1])-g.Y0)/g.Cell-1, (max(e.a[1], e.b[1])-g.Y0)/g.Cell+1
				for j := int(max(low, 0)); j <= int(min(high, float64(g.NY-1))); j++ {
					rows[j] = append(rows[j], e)
				}
			}
		}
	}
	return rows
}

// distance is how far the nearest observation is from the cell of a row; as far as can be where nobody knows.
func (g *tileGround) distance(row int) float64 {
	if d := g.nearest[row]; !math.IsNaN(d) {
		return d
	}
	return math.Inf(1)
}

// cellSpan is a range of columns and rows of a lattice, both ends included.
type cellSpan struct{ i0, i1, j0, j1 int }

// spanOf returns the cells of a lattice that may have their centres in a box; there are none if i1 < i0 or j1 < j0.
func spanOf(l grids.Lattice, b orb.Bound) cellSpan {
	cell := func(v, origin float64, n int) int { return int(min(max(0, (v-origin)/l.Cell), float64(n))) }
	return cellSpan{
		i0: cell(b.Min[0], l.X0, l.NX), i1: min(cell(b.Max[0], l.X0, l.NX), l.NX-1),
		j0: cell(b.Min[1], l.Y0, l.NY), j1: min(cell(b.Max[1], l.Y0, l.NY), l.NY-1),
	}
}

// each calls visit with the row and the centre of every cell of the study area in a span.
func (g *tileGround) each(s cellSpan, visit func(row int, x, y float64)) {
	for j := s.j0; j <= s.j1 && s.i0 <= s.i1; j++ {
		last := int32(j*g.NX + s.i1)
		for row := g.row(j*g.NX + s.i0); row < len(g.cells) && g.cells[row] <= last; row++ {
			x, y := g.Centre(int(g.cells[row]))
			visit(row, x, y)
		}
	}
}

// cellSet is a set of rows; its zero value is empty.
type cellSet struct {
	word []uint64
	n    int
}

func (s *cellSet) len() int { return s.n }

func (s *cellSet) has(row int) bool { return s.word != nil && s.word[row>>6]>>(row&63)&1 == 1 }

// add adds a row of n and reports whether it is new.
func (s *cellSet) add(row, n int) bool {
	if s.has(row) {
		return false
	}
	if s.word == nil {
		s.word = make([]uint64, (n+63)/64)
	}
	s.word[row>>6] |= 1 << (row & 63)
	s.n++
	return true
}

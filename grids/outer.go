package grids

import (
	"math"

	"github.com/paulmach/orb"
)

// sameVertex is how far apart two vertices may be, in parts of the extent of a shape, and be one: rounding alone puts that
// much between the ends of a border that two neighbours share.
const sameVertex = 1e-9

// OuterEdges returns the edges of a shape that no two of its polygons share, as rings: the edge of all of them together,
// if neighbours have the vertices of their common borders in common, up to rounding. Rings turn as those of the shape do, which must be
// counter-clockwise outside and clockwise around holes; a hole comes as a polygon of its own. It is for drawing, and not
// for what lies inside: borders that do not match stay, and what overlaps is not merged.
func OuterEdges(shape orb.MultiPolygon) orb.MultiPolygon {
	edges := map[[2]orb.Point]int{} // how often, less how often the other way
	var order [][2]orb.Point
	known := newVertices(shape.Bound())
	for _, polygon := range shape {
		for _, ring := range polygon {
			for i := 1; i < len(ring); i++ {
				e := [2]orb.Point{known.one(ring[i-1]), known.one(ring[i])}
				switch back := [2]orb.Point{e[1], e[0]}; {
				case e[0] == e[1]:
				case edges[back] > 0:
					edges[back]--
				default:
					edges[e]++
					order = append(order, e)
				}
			}
		}
	}
	from := map[orb.Point][]orb.Point{}
	for _, e := range order {
		if edges[e] > 0 {
			edges[e]--
			from[e[0]] = append(from[e[0]], e[1])
		}
	}
	var outer orb.MultiPolygon
	for _, e := range order {
		if len(from[e[0]]) == 0 {
			continue
		}
		if ring := follow(from, e[0]); len(ring) > 3 {
			outer = append(outer, orb.Polygon{ring})
		}
	}
	return outer
}

// follow takes a ring out of the edges that are left, from a vertex on.
func follow(from map[orb.Point][]orb.Point, start orb.Point) orb.Ring {
	ring := orb.Ring{start}
	for at := start; len(from[at]) > 0; {
		next := from[at][0]
		from[at] = from[at][1:]
		ring = append(ring, next)
		at = next
		if at == start {
			break
		}
	}
	return ring
}

// vertices are those met so far, by the square of a lattice that they lie in.
type vertices struct {
	corner orb.Point
	side   float64
	in     map[[2]int64]orb.Point
}

func newVertices(bound orb.Bound) *vertices {
	side := sameVertex * max(bound.Max[0]-bound.Min[0], bound.Max[1]-bound.Min[1], math.SmallestNonzeroFloat64/sameVertex)
	return &vertices{corner: bound.Min, side: side, in: map[[2]int64]orb.Point{}}
}

// one returns the vertex that was met at a place, which is the place itself when it is met for the first time.
func (v *vertices) one(p orb.Point) orb.Point {
	square := [2]int64{int64((p[0] - v.corner[0]) / v.side), int64((p[1] - v.corner[1]) / v.side)}
	for _, dx := range []int64{0, -1, 1} {
		for _, dy := range []int64{0, -1, 1} {
			q, there := v.in[[2]int64{square[0] + dx, square[1] + dy}]
			if there && math.Abs(q[0]-p[0]) <= v.side && math.Abs(q[1]-p[1]) <= v.side {
				return q
			}
		}
	}
	v.in[square] = p
	return p
}

package grids

import (
	"cmp"
	"slices"

	"github.com/paulmach/orb"
)

// ConvexHull returns the convex hull of places as a closed ring, counter-clockwise from the westernmost (of these the
// southernmost) place, without places in the middle of an edge (A. M. Andrew 1979, Inf. Process. Lett. 9:216-219). Places
// that are not finite are passed over. On one line the ring goes there and back and has no area; without a place it is
// nil. ConvexHull panics if the lengths differ.
func ConvexHull(x, y []float64) orb.Ring {
	p := distinct(x, y)
	if len(p) == 0 {
		return nil
	}
	half := func(ring orb.Ring, p orb.Point) orb.Ring {
		for len(ring) >= 2 && turn(ring[len(ring)-2], ring[len(ring)-1], p) <= 0 {
			ring = ring[:len(ring)-1]
		}
		return append(ring, p)
	}
	var lower, upper orb.Ring
	for i := range p {
		lower = half(lower, p[i])
		upper = half(upper, p[len(p)-1-i])
	}
	return append(lower, upper[1:]...)
}

// turn is positive where a, b, c turn left: twice the area of their triangle.
func turn(a, b, c orb.Point) float64 {
	return (b[0]-a[0])*(c[1]-a[1]) - (b[1]-a[1])*(c[0]-a[0])
}

// distinct returns the finite places, each once, sorted by x, then y: what follows does not depend on the order they
// came in.
func distinct(x, y []float64) []orb.Point {
	if len(x) != len(y) {
		panic("grids: x and y differ in number")
	}
	p := make([]orb.Point, 0, len(x))
	for i := range x {
		if usable(x[i], y[i]) {
			p = append(p, orb.Point{x[i] + 0, y[i] + 0})
		}
	}
	slices.SortFunc(p, func(a, b orb.Point) int {
		return cmp.Or(cmp.Compare(a[0], b[0]), cmp.Compare(a[1], b[1]))
	})
	return slices.Compact(p)
}

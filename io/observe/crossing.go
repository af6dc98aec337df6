package observe

import (
	"math"

	"github.com/paulmach/orb"
)

// sameLine is the distance, in parts of the extent of a ring, up to which a position lies on an edge. Outlines that were
// rounded or thinned cross themselves by less than that in many places, which moves no area.
const sameLine = 1e-6

// mostPairs bounds the work on one ring. Outlines of places take a few comparisons for each edge; what takes more is a
// riddle, and passes.
const mostPairs = 1 << 24

// crossing returns a point at which a ring crosses itself, and whether there is one: a ring is simple (OGC 06-103r4,
// section 6.1.11). To touch itself is let pass.
func crossing(ring orb.Ring) (orb.Point, bool) {
	if len(ring) < 5 { // a triangle
		return orb.Point{}, false
	}
	c := &crossings{ring: ring, off: sameLine * diagonal(ring.Bound()), boxes: make([]orb.Bound, 4*(len(ring)-1))}
	edges := stretch{box: 1, from: 0, to: len(ring) - 1}
	c.enclose(edges)
	return c.at, c.within(edges)
}

// crossings looks for edges that cross. The edges are halved again and again, and boxes around the halves tell which can
// have nothing in common.
type crossings struct {
	ring  orb.Ring
	off   float64     // distance from an edge up to which a position lies on it
	boxes []orb.Bound // the boxes of the halves of stretch i are 2i and 2i+1
	pairs int         // compared so far
	at    orb.Point
}

// stretch is some edges of a ring that follow each other, by the positions at which they start.
type stretch struct{ box, from, to int }

func (s stretch) halves() (a, b stretch) {
	middle := (s.from + s.to) / 2
	return stretch{2 * s.box, s.from, middle}, stretch{2*s.box + 1, middle, s.to}
}

// enclose finds the boxes of a stretch and all its halves.
func (c *crossings) enclose(s stretch) orb.Bound {
	var box orb.Bound
	if s.to-s.from == 1 {
		box = orb.MultiPoint{c.ring[s.from], c.ring[s.to]}.Bound()
	} else {
		a, b := s.halves()
		box = c.enclose(a).Union(c.enclose(b))
	}
	c.boxes[s.box] = box
	return box
}

// within reports whether two edges of a stretch cross.
func (c *crossings) within(s stretch) bool {
	if s.to-s.from == 1 {
		return false
	}
	a, b := s.halves()
	return c.within(a) || c.within(b) || c.between(a, b)
}

// between reports whether an edge of one stretch crosses one of another.
func (c *crossings) between(a, b stretch) bool {
	if c.pairs++; c.pairs > mostPairs || !c.boxes[a.box].Intersects(c.boxes[b.box]) {
		return false
	}
	if a.to-a.from == 1 && b.to-b.from == 1 {
		return c.cross(a.from, b.from)
	}
	if a.to-a.from < b.to-b.from {
		a, b = b, a
	}
	left, right := a.halves()
	return c.between(left, b) || c.between(right, b)
}

// cross reports whether two edges cross: the ends of each lie on different sides of the other. Neighbours share an end,
// which lies on no side.
func (c *crossings) cross(i, k int) bool {
	p, q, r, s := c.ring[i], c.ring[i+1], c.ring[k], c.ring[k+1]
	if !c.apart(p, q, r, s) || !c.apart(r, s, p, q) {
		return false
	}
	a, b := side(p, q, r), side(p, q, s)
	share := a / (a - b)
	c.at = orb.Point{r[0] + share*(s[0]-r[0]), r[1] + share*(s[1]-r[1])}
	return true
}

// apart reports whether r and s lie on different sides of the line through p and q.
func (c *crossings) apart(p, q, r, s orb.Point) bool {
	on := c.off * math.Hypot(q[0]-p[0], q[1]-p[1])
	a, b := side(p, q, r), side(p, q, s)
	return a > on && b < -on || a < -on && b > on
}

// side is twice the area of a triangle: above 0 where r lies to the left of the way from p to q.
func side(p, q, r orb.Point) float64 {
	return (q[0]-p[0])*(r[1]-p[1]) - (q[1]-p[1])*(r[0]-p[0])
}

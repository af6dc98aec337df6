package vector

import (
	"math"

	"github.com/paulmach/orb"
)

const (
	leafSize = 8
	// workPerEdge bounds the comparisons of boxes and edges for one polygon. Coasts take about 10 an edge.
	workPerEdge = 400
)

// edge is a straight piece of a ring.
type edge struct {
	a, b orb.Point
	ring int
}

// outlines is a binary tree over the edges of a polygon in the order of its rings: neighbours in a ring are neighbours
// on the ground, so that ranges of edges have small boxes. The range of a node is halved between its children 2i+1 and
// 2i+2 down to leafSize edges.
type outlines struct {
	edges []edge
	outer int // edges of the outer ring, which come first
	box   []orb.Bound
	work  int     // comparisons made
	most  int     // comparisons that may be made
	slack float64 // distance from an edge up to which a place lies on it

	crossed       bool
	first, second int // the edges that cross
}

func newOutlines(p orb.Polygon) *outlines {
	t := &outlines{}
	for i, r := range p {
		for k := 1; k < len(r); k++ {
			if r[k-1] != r[k] {
				t.edges = append(t.edges, edge{r[k-1], r[k], i})
			}
		}
		if i == 0 {
			t.outer = len(t.edges)
		}
	}
	nodes := 1
	for most := len(t.edges); most > leafSize; most = (most + 1) / 2 {
		nodes = 2*nodes + 1
	}
	t.most = workPerEdge * (len(t.edges) + 100)
	t.box = make([]orb.Bound, nodes)
	if len(t.edges) > 0 {
		t.fill(0, 0, len(t.edges))
	}
	return t
}

// fill computes the box of a node and of those below it.
func (t *outlines) fill(node, from, to int) {
	if to-from <= leafSize {
		b := orb.Bound{Min: t.edges[from].a, Max: t.edges[from].a}
		for _, e := range t.edges[from:to] {
			b = b.Extend(e.a).Extend(e.b)
		}
		t.box[node] = b
		return
	}
	middle := (from + to) / 2
	t.fill(2*node+1, from, middle)
	t.fill(2*node+2, middle, to)
	t.box[node] = t.box[2*node+1].Union(t.box[2*node+2])
}

// done counts a comparison and reports whether there is nothing more to look for.
func (t *outlines) done() bool {
	t.work++
	return t.crossed || t.work > t.most
}

// crossSelf looks for edges that cross within a node.
func (t *outlines) crossSelf(node, from, to int) {
	if t.done() {
		return
	}
	if to-from <= leafSize {
		for i := from; i < to; i++ {
			t.crossEdge(i, i+1, to)
		}
		return
	}
	middle := (from + to) / 2
	t.crossSelf(2*node+1, from, middle)
	t.crossSelf(2*node+2, middle, to)
	t.crossPair(2*node+1, from, middle, 2*node+2, middle, to)
}

// crossPair looks for an edge of one node that crosses one of another.
func (t *outlines) crossPair(n, from, to, m, start, end int) {
	if t.done() || !t.box[n].Intersects(t.box[m]) {
		return
	}
	switch {
	case to-from <= leafSize && end-start <= leafSize:
		for i := from; i < to; i++ {
			t.crossEdge(i, start, end)
		}
	case to-from >= end-start:
		middle := (from + to) / 2
		t.crossPair(2*n+1, from, middle, m, start, end)
		t.crossPair(2*n+2, middle, to, m, start, end)
	default:
		middle := (start + end) / 2
		t.crossPair(n, from, to, 2*m+1, start, middle)
		t.crossPair(n, from, to, 2*m+2, middle, end)
	}
}

// crossEdge looks for an edge of a range that crosses edge i.
func (t *outlines) crossEdge(i, from, to int) {
	for k := from; k < to; k++ {
		if t.done() {
			return
		}
		if t.cross(t.edges[i], t.edges[k]) {
			t.crossed, t.first, t.second = true, i, k
			return
		}
	}
}

// cross reports whether two edges cross in a place inside both. Edges that touch, and those closer to touching than the
// slack or than rounding can tell, do not.
func (t *outlines) cross(e, f edge) bool {
	for i := range e.a { // most edges that are compared lie apart
		if max(e.a[i], e.b[i]) < min(f.a[i], f.b[i]) || max(f.a[i], f.b[i]) < min(e.a[i], e.b[i]) {
			return false
		}
	}
	on := t.slack * math.Hypot(e.b[0]-e.a[0], e.b[1]-e.a[1])
	if side(e.a, e.b, f.a, on)*side(e.a, e.b, f.b, on) >= 0 {
		return false
	}
	on = t.slack * math.Hypot(f.b[0]-f.a[0], f.b[1]-f.a[1])
	return side(f.a, f.b, e.a, on)*side(f.a, f.b, e.b, on) < 0
}

// side returns 1 if c lies to the left of the line from a to b, -1 if to the right, and 0 if the triangle of the three is
// no larger than half of on, or rounding leaves it open: the error bound of the determinant is that of Shewchuk 1997, Discrete
// Comput. Geom. 18:305-363.
func side(a, b, c orb.Point, on float64) int {
	left, right := (a[0]-c[0])*(b[1]-c[1]), (a[1]-c[1])*(b[0]-c[0])
	const unit = 1.0 / (1 << 53)
	bound := math.Max(on, (3+16*unit)*unit*(math.Abs(left)+math.Abs(right)))
	switch d := left - right; {
	case d > bound:
		return 1
	case d < -bound:
		return -1
	}
	return 0
}

// meeting returns where two edges that cross do so.
func meeting(e, f edge) orb.Point {
	dx, dy := e.b[0]-e.a[0], e.b[1]-e.a[1]
	ux, uy := f.b[0]-f.a[0], f.b[1]-f.a[1]
	s := ((f.a[0]-e.a[0])*uy - (f.a[1]-e.a[1])*ux) / (dx*uy - dy*ux)
	return orb.Point{e.a[0] + s*dx, e.a[1] + s*dy}
}

// mostComparisons bounds the work on a ring whose crossings are looked for with slack.
const mostComparisons = 1 << 24

// Crossing returns a place at which a closed ring crosses itself, and whether there is one: a ring is simple (OGC 06-103r4,
// section 6.1.11). To touch itself is let pass, and so is to cross by no more than slack, a distance. Outlines as found on
// maps take a few comparisons for each edge; one so tangled that it takes far more passes.
func Crossing(r orb.Ring, slack float64) (at orb.Point, crosses bool) {
	t := newOutlines(orb.Polygon{r})
	if len(t.edges) == 0 {
		return orb.Point{}, false
	}
	t.slack, t.most = slack, mostComparisons
	t.crossSelf(0, 0, len(t.edges))
	if !t.crossed {
		return orb.Point{}, false
	}
	return meeting(t.edges[t.first], t.edges[t.second]), true
}

// isOutside reports whether a ring that does not cross the outer one lies outside of it. Midpoints of up to 8 of its
// edges decide by majority, since single ones may lie on the outer ring.
func (t *outlines) isOutside(r orb.Ring) bool {
	n := len(r) - 1
	step := (n + 7) / 8
	inside, outside := 0, 0
	for k := 0; k < n; k += step {
		middle := orb.Point{(r[k][0] + r[k+1][0]) / 2, (r[k][1] + r[k+1][1]) / 2}
		if t.crossings(middle, 0, 0, len(t.edges))%2 == 1 {
			inside++
		} else {
			outside++
		}
	}
	return outside > inside && t.work <= t.most
}

// crossings counts how often the ray from p towards greater x meets the outer ring within a node.
func (t *outlines) crossings(p orb.Point, node, from, to int) (n int) {
	b := t.box[node]
	t.work++
	if from >= t.outer || t.work > t.most || p[1] < b.Min[1] || p[1] > b.Max[1] || p[0] > b.Max[0] {
		return 0
	}
	if to-from > leafSize {
		middle := (from + to) / 2
		return t.crossings(p, 2*node+1, from, middle) + t.crossings(p, 2*node+2, middle, to)
	}
	for _, e := range t.edges[from:min(to, t.outer)] {
		if (e.a[1] > p[1]) != (e.b[1] > p[1]) && p[0] < e.a[0]+(p[1]-e.a[1])/(e.b[1]-e.a[1])*(e.b[0]-e.a[0]) {
			n++
		}
	}
	return n
}

package isolines

import (
	"math"

	"github.com/paulmach/orb"
)

// rings are the closed paths of a network whose segments are in the order of their squares.
type rings struct {
	*network
	across int       // squares in a row
	path   [][]int32 // segments of each ring
	of     []int32   // the ring of each segment, or -1
	parent []int32   // of a hole: a ring of the same polygon that lies west of it; of an outer ring: -1
}

// polygons makes the closed paths of a network into polygons, each hole with the outer ring it belongs to.
func (s *surface) polygons(n *network) orb.MultiPolygon {
	r := rings{network: n, across: s.nx + 1, of: make([]int32, len(n.segment))}
	for i := range r.of {
		r.of[i] = -1
	}
	n.paths(func(path []int32) {
		for _, i := range path {
			r.of[i] = int32(len(r.path))
		}
		r.path = append(r.path, path)
	})
	r.parent = make([]int32, len(r.path))
	for k := range r.parent {
		r.parent[k] = -1
		if !r.outer(int32(k)) {
			r.parent[k] = r.west(int32(k))
		}
	}
	area := make(orb.MultiPolygon, 0)
	polygon := make([]int32, len(r.path))
	for k, path := range r.path {
		if r.parent[k] < 0 {
			polygon[k] = int32(len(area))
			area = append(area, orb.Polygon{s.ring(n, path)})
		}
	}
	for k, path := range r.path {
		if r.parent[k] >= 0 {
			at := polygon[r.outermost(int32(k))]
			area[at] = append(area[at], s.ring(n, path))
		}
	}
	return area
}

// corner is the westernmost vertex of a ring, the southernmost of them: the segments that end and begin there.
func (r *rings) corner(k int32) (in, out int32) {
	path := r.path[k]
	least := 0
	for i := range path {
		p, q := r.segment[path[i]].from, r.segment[path[least]].from
		if p[0] < q[0] || p[0] == q[0] && p[1] < q[1] {
			least = i
		}
	}
	return path[(least+len(path)-1)%len(path)], path[least]
}

// outer reports whether a ring turns counter-clockwise, as its westernmost vertex tells.
func (r *rings) outer(k int32) bool {
	in, out := r.corner(k)
	return orientation(r.segment[in].from, r.segment[in].to, r.segment[out].to) > 0
}

// west finds the ring on the other side of the area west of a hole: that of the first segment to the west of one that goes
// up from the hole's westernmost vertex, or else up to it, right beside the vertex. That ring reaches farther west, so that
// going on from hole to hole ends at an outer ring.
func (r *rings) west(hole int32) int32 {
	in, out := r.corner(hole)
	up, height := out, r.segment[out].from[1]
	beside := func(g segment) bool { return g.to[1] <= height && height < g.from[1] } // goes down past the heights just above
	if r.segment[out].to[1] <= height {
		up = in
		beside = func(g segment) bool { return g.to[1] < height && height <= g.from[1] } // just below
	}
	g := r.segment[up]
	last := up
	for int(last)+1 < len(r.segment) && r.segment[last+1].square == g.square {
		last++
	}
	best := int32(-1)
	for i := last; i >= 0 && int(r.segment[i].square)/r.across == int(g.square)/r.across; i-- {
		c := r.segment[i]
		if best >= 0 && c.square != r.segment[best].square {
			break
		}
		if r.of[i] >= 0 && beside(c) && westOf(c, g) && (best < 0 || westOf(r.segment[best], c)) {
			best = i
		}
	}
	return r.of[best]
}

// outermost follows a hole's parents to the outer ring, and shortens the way for the next.
func (r *rings) outermost(k int32) int32 {
	top := k
	for r.parent[top] >= 0 {
		top = r.parent[top]
	}
	for r.parent[k] >= 0 && r.parent[k] != top {
		k, r.parent[k] = r.parent[k], top
	}
	return top
}

// westOf reports whether a is west of b, two segments that share a height and do not cross.
func westOf(a, b segment) bool {
	a, b = upward(a), upward(b)
	side := 0.0
	if a.from[1] >= b.from[1] {
		side = orientation(b.from, b.to, a.from)
	} else {
		side = -orientation(a.from, a.to, b.from)
	}
	if side != 0 {
		return side > 0
	}
	if a.to[1] <= b.to[1] {
		return orientation(b.from, b.to, a.to) > 0
	}
	return orientation(a.from, a.to, b.to) < 0
}

func upward(g segment) segment {
	if g.from[1] > g.to[1] {
		g.from, g.to = g.to, g.from
	}
	return g
}

// ring returns the vertices of a closed path without those that only halve the side of a cell at the outer edge.
func (s *surface) ring(n *network, path []int32) orb.Ring {
	r := make(orb.Ring, 0, len(path)+1)
	for _, g := range path {
		if p := n.segment[g].from; !s.halves(p) {
			r = append(r, p)
		}
	}
	return append(r, r[0])
}

// halves reports whether a place is the middle of a cell's side at the outer edge and no line ends there.
func (s *surface) halves(p orb.Point) bool {
	i, oki := halfStep(s.x, p[0])
	j, okj := halfStep(s.y, p[1])
	if !oki || !okj || (i+j)%2 == 0 || s.ends[p] {
		return false
	}
	one, other := s.class[(j+1)/2*(s.nx+2)+(i+1)/2], s.class[(j+2)/2*(s.nx+2)+(i+2)/2]
	return (one < 0) != (other < 0)
}

// halfStep is the number of a coordinate among the half-steps, if it is one of them.
func halfStep(step []float64, v float64) (int, bool) {
	last := len(step) - 1
	k := int(math.Round((v - step[0]) / (step[last] - step[0]) * float64(last)))
	return k, k >= 0 && k <= last && step[k] == v
}

package isolines

import (
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// network joins segments that end where others begin. The segments must meet in their ends alone, or be the same.
type network struct {
	segment  []segment
	from, to []int32 // numbers of the segments' ends
	first    []int32 // the segments that begin at v are leaving[first[v]:first[v+1]]
	leaving  []int32
	used     []bool
	place    []int32 // of the segment in the present path that begins at v, or -1
}

func newNetwork(segments []segment) *network {
	n := &network{segment: segments, from: make([]int32, len(segments)), to: make([]int32, len(segments)), used: make([]bool, len(segments))}
	number := make(map[orb.Point]int32, len(segments))
	find := func(p orb.Point) int32 {
		v, ok := number[p]
		if !ok {
			v = int32(len(number))
			number[p] = v
		}
		return v
	}
	for i, g := range segments {
		n.from[i], n.to[i] = find(g.from), find(g.to)
	}
	n.first = make([]int32, len(number)+1)
	for _, v := range n.from {
		n.first[v+1]++
	}
	for v := range len(number) {
		n.first[v+1] += n.first[v]
	}
	n.leaving = make([]int32, len(segments))
	n.place = make([]int32, len(number))
	fill := slices.Clone(n.first)
	for i, v := range n.from {
		n.leaving[fill[v]] = int32(i)
		fill[v]++
	}
	for v := range n.place {
		n.place[v] = -1
	}
	n.cancel()
	return n
}

func (n *network) leave(v int32) []int32 { return n.leaving[n.first[v]:n.first[v+1]] }

// cancel takes out pairs that run there and back: what lies between them has no width.
func (n *network) cancel() {
	for i := range n.segment {
		if n.used[i] {
			continue
		}
		for _, back := range n.leave(n.to[i]) {
			if !n.used[back] && n.to[back] == n.from[i] {
				n.used[i], n.used[back] = true, true
				break
			}
		}
	}
}

// paths joins the segments into paths as long as possible and hands each on: the open ones first, in the order of the
// segments they begin with. No path visits a place twice, but that a closed one ends where it begins.
func (n *network) paths(hand func(path []int32)) {
	surplus := make([]int32, len(n.place)) // segments that begin, less those that end
	for i, gone := range n.used {
		if !gone {
			surplus[n.from[i]]++
			surplus[n.to[i]]--
		}
	}
	for i := range n.segment {
		if v := n.from[i]; !n.used[i] && surplus[v] > 0 {
			surplus[v]--
			n.walk(int32(i), hand)
		}
	}
	for i := range n.segment {
		if !n.used[i] {
			n.walk(int32(i), hand)
		}
	}
}

// walk follows segments until none goes on, and hands on a closed path whenever it comes to where it was before.
func (n *network) walk(start int32, hand func(path []int32)) {
	var path []int32
	for at := start; at >= 0; at = n.next(at) {
		n.used[at] = true
		n.place[n.from[at]] = int32(len(path))
		path = append(path, at)
		if p := n.place[n.to[at]]; p >= 0 {
			n.hand(path[p:], hand)
			path = path[:p]
		}
	}
	if len(path) > 0 {
		n.hand(path, hand)
	}
}

// hand forgets where the path has been and hands on a copy.
func (n *network) hand(path []int32, hand func(path []int32)) {
	for _, i := range path {
		n.place[n.from[i]] = -1
	}
	hand(slices.Clone(path))
}

// next is the segment that goes on from the end of another, or -1. Where several do it is the one farthest to the left: so
// a path stays with the side it has on its left, and paths touch without crossing.
func (n *network) next(at int32) int32 {
	best, sharpest := int32(-1), math.Inf(-1)
	leaving := n.leave(n.to[at])
	if len(leaving) == 1 && !n.used[leaving[0]] {
		return leaving[0]
	}
	for _, i := range leaving {
		if n.used[i] {
			continue
		}
		if turn := n.turn(at, i); turn > sharpest {
			best, sharpest = i, turn
		}
	}
	return best
}

// turn is the angle between two segments, to the left positive.
func (n *network) turn(a, b int32) float64 {
	p, q, r := n.segment[a].from, n.segment[a].to, n.segment[b].to
	dot := (q[0]-p[0])*(r[0]-q[0]) + (q[1]-p[1])*(r[1]-q[1])
	return math.Atan2(orientation(p, q, r), dot)
}

// points returns the vertices of a path; a closed one ends with its first.
func (n *network) points(path []int32) []orb.Point {
	p := make([]orb.Point, 0, len(path)+1)
	for _, g := range path {
		p = append(p, n.segment[g].from)
	}
	return append(p, n.segment[path[len(path)-1]].to)
}

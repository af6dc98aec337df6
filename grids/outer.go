package grids

import "github.com/paulmach/orb"

// OuterEdges returns the edges of a shape that no two of its polygons share, as rings: the edge of all of them together,
// if neighbours have the vertices of their common borders in common. Rings turn as those of the shape do, which must be
// counter-clockwise outside and clockwise around holes; a hole comes as a polygon of its own. It is for drawing, and not
// for what lies inside: borders that do not match stay, and what overlaps is not merged.
func OuterEdges(shape orb.MultiPolygon) orb.MultiPolygon {
	edges := map[[2]orb.Point]int{} // how often, less how often the other way
	var order [][2]orb.Point
	for _, polygon := range shape {
		for _, ring := range polygon {
			for i := 1; i < len(ring); i++ {
				e := [2]orb.Point{ring[i-1], ring[i]}
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

package draft

import (
	"slices"

	"github.com/paulmach/orb"
)

// flat is a row of shapes in two arrays. Counts say how the vertices hang together: of a shape the number of its polygons,
// of each polygon the number of its rings, of each ring the number of its vertices, each followed by its parts; absent
// for nil.
type flat struct {
	count  []int32
	vertex []float64 // x and y in turn
}

// flatten lays out the outline and then the zones.
func flatten(d Draft) flat {
	var f flat
	f.add(d.Outline)
	for _, z := range d.Zones {
		f.add(z.Area)
	}
	return f
}

func (f *flat) add(area orb.MultiPolygon) {
	f.count = append(f.count, int32(length(area)))
	for _, polygon := range area {
		f.count = append(f.count, int32(length(polygon)))
		for _, ring := range polygon {
			f.count = append(f.count, int32(length(ring)))
			f.vertex = slices.Grow(f.vertex, 2*len(ring))
			for _, p := range ring {
				f.vertex = append(f.vertex, p[0], p[1])
			}
		}
	}
}

// take takes the next shape off; ok is false when the arrays have too few elements for what they say.
func (f *flat) take() (area orb.MultiPolygon, ok bool) {
	area, ok = parts[orb.MultiPolygon](f, len(f.count)-1)
	for i := 0; ok && i < len(area); i++ {
		area[i], ok = parts[orb.Polygon](f, len(f.count)-1)
		for j := 0; ok && j < len(area[i]); j++ {
			area[i][j], ok = f.ring()
		}
	}
	return area, ok
}

func (f *flat) ring() (ring orb.Ring, ok bool) {
	ring, ok = parts[orb.Ring](f, len(f.vertex)/2)
	for i := range ring {
		ring[i], f.vertex = orb.Point{f.vertex[0], f.vertex[1]}, f.vertex[2:]
	}
	return ring, ok
}

// parts takes a count off and makes room for that many parts, of which there can be at most most.
func parts[S ~[]T, T any](f *flat, most int) (S, bool) {
	if len(f.count) == 0 {
		return nil, false
	}
	n := int(f.count[0])
	f.count = f.count[1:]
	if n == absent {
		return nil, true
	}
	if n < 0 || n > most {
		return nil, false
	}
	return make(S, n), true
}

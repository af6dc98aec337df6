package draft

import (
	"slices"

	"github.com/paulmach/orb"
)

// flat is a row of shapes in two arrays. Counts say how the vertices hang together: of an area the number of its
// polygons, of each polygon the number of its rings, of each ring the number of its vertices, each followed by its parts;
// absent for nil. Where a shape may be of any kind, its kind stands before it.
type flat struct {
	count  []int32
	vertex []float64 // x and y in turn
}

// Kinds of shapes.
const (
	aPoint int32 = iota + 1
	somePoints
	aLine
	someLines
	aPolygon
	somePolygons
)

// flatten lays out the outline, then the zones, and then the places.
func flatten(d Draft) flat {
	var f flat
	f.add(d.Outline)
	for _, z := range d.Zones {
		f.add(z.Area)
	}
	for _, g := range d.ShapeOf {
		f.addShape(g)
	}
	return f
}

// addShape lays out a shape of any of the kinds, before which it puts the kind.
func (f *flat) addShape(g orb.Geometry) {
	switch g := g.(type) {
	case orb.Point:
		f.count = append(f.count, aPoint)
		f.vertex = append(f.vertex, g[0], g[1])
	case orb.MultiPoint:
		f.count = append(f.count, somePoints)
		f.addVertices(g)
	case orb.LineString:
		f.count = append(f.count, aLine)
		f.addVertices(g)
	case orb.MultiLineString:
		f.count = append(f.count, someLines, int32(length(g)))
		for _, line := range g {
			f.addVertices(line)
		}
	case orb.Polygon:
		f.count = append(f.count, aPolygon)
		f.addPolygon(g)
	case orb.MultiPolygon:
		f.count = append(f.count, somePolygons)
		f.add(g)
	}
}

func (f *flat) add(area orb.MultiPolygon) {
	f.count = append(f.count, int32(length(area)))
	for _, polygon := range area {
		f.addPolygon(polygon)
	}
}

func (f *flat) addPolygon(polygon orb.Polygon) {
	f.count = append(f.count, int32(length(polygon)))
	for _, ring := range polygon {
		f.addVertices(ring)
	}
}

func (f *flat) addVertices(points []orb.Point) {
	f.count = append(f.count, int32(length(points)))
	f.vertex = slices.Grow(f.vertex, 2*len(points))
	for _, p := range points {
		f.vertex = append(f.vertex, p[0], p[1])
	}
}

// takeShape takes the next shape of any kind off; ok is false when the arrays have too few elements for what they say.
func (f *flat) takeShape() (g orb.Geometry, ok bool) {
	if len(f.count) == 0 {
		return nil, false
	}
	kind := f.count[0]
	f.count = f.count[1:]
	switch kind {
	case aPoint:
		return f.point()
	case somePoints:
		return vertices[orb.MultiPoint](f)
	case aLine:
		return vertices[orb.LineString](f)
	case someLines:
		return f.lines()
	case aPolygon:
		return f.polygon()
	case somePolygons:
		return f.take()
	}
	return nil, false
}

// take takes the next area off; ok as for takeShape.
func (f *flat) take() (area orb.MultiPolygon, ok bool) {
	area, ok = parts[orb.MultiPolygon](f, len(f.count)-1)
	for i := 0; ok && i < len(area); i++ {
		area[i], ok = f.polygon()
	}
	return area, ok
}

func (f *flat) polygon() (polygon orb.Polygon, ok bool) {
	polygon, ok = parts[orb.Polygon](f, len(f.count)-1)
	for j := 0; ok && j < len(polygon); j++ {
		polygon[j], ok = vertices[orb.Ring](f)
	}
	return polygon, ok
}

func (f *flat) lines() (lines orb.MultiLineString, ok bool) {
	lines, ok = parts[orb.MultiLineString](f, len(f.count)-1)
	for i := 0; ok && i < len(lines); i++ {
		lines[i], ok = vertices[orb.LineString](f)
	}
	return lines, ok
}

func (f *flat) point() (p orb.Point, ok bool) {
	if len(f.vertex) < 2 {
		return p, false
	}
	p, f.vertex = orb.Point{f.vertex[0], f.vertex[1]}, f.vertex[2:]
	return p, true
}

// vertices takes a ring, a line or a number of points off.
func vertices[S ~[]orb.Point](f *flat) (points S, ok bool) {
	points, ok = parts[S](f, len(f.vertex)/2)
	for i := 0; ok && i < len(points); i++ {
		points[i], ok = f.point()
	}
	return points, ok
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

package observe

import (
	"math"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
)

// middle returns the point that stands for a geometry; NaN for none.
func middle(g orb.Geometry) orb.Point {
	switch g := g.(type) {
	case orb.Point:
		return g
	case orb.MultiPoint:
		return middleOfPoints(g)
	case orb.LineString:
		return middleOfLines([]orb.LineString{g})
	case orb.MultiLineString:
		return middleOfLines(g)
	case orb.Polygon:
		return middleOfPolygons([]orb.Polygon{g})
	case orb.MultiPolygon:
		return middleOfPolygons(g)
	}
	return orb.Point{math.NaN(), math.NaN()}
}

// balance is a mean of places by their weights.
type balance struct {
	x, y, weight float64
}

func (b *balance) add(p orb.Point, weight float64) {
	if weight > 0 {
		b.weight += weight
		b.x += (p[0] - b.x) * weight / b.weight
		b.y += (p[1] - b.y) * weight / b.weight
	}
}

func middleOfPoints(points []orb.Point) orb.Point {
	var b balance
	for _, p := range points {
		b.add(p, 1)
	}
	return orb.Point{b.x, b.y}
}

// middleOfLines weights straight pieces by their length. Lines without length are points.
func middleOfLines(lines []orb.LineString) orb.Point {
	var b balance
	var ends []orb.Point
	for _, l := range lines {
		for i := 1; i < len(l); i++ {
			p, q := l[i-1], l[i]
			b.add(orb.Point{p[0] + (q[0]-p[0])/2, p[1] + (q[1]-p[1])/2}, math.Hypot(q[0]-p[0], q[1]-p[1]))
		}
		ends = append(ends, l[0])
	}
	if b.weight == 0 {
		return middleOfPoints(ends)
	}
	return orb.Point{b.x, b.y}
}

// middleOfPolygons weights polygons by their area. Polygons without area are lines.
func middleOfPolygons(polygons []orb.Polygon) orb.Point {
	var b balance
	var outer []orb.LineString
	for _, p := range polygons {
		b.add(planar.CentroidArea(p))
		outer = append(outer, orb.LineString(p[0]))
	}
	if b.weight == 0 {
		return middleOfLines(outer)
	}
	return orb.Point{b.x, b.y}
}

// farthest returns the x and the y that are farthest from 0 in a geometry.
func farthest(g orb.Geometry) (far orb.Point) {
	eachPosition(g, func(p orb.Point) {
		for i, v := range p {
			if math.Abs(v) > math.Abs(far[i]) {
				far[i] = v
			}
		}
	})
	return far
}

// eachPosition calls do at every position of a geometry.
func eachPosition(g orb.Geometry, do func(orb.Point)) {
	switch g := g.(type) {
	case orb.Point:
		do(g)
	case orb.MultiPoint:
		each(g, do)
	case orb.LineString:
		each(g, do)
	case orb.MultiLineString:
		for _, l := range g {
			each(l, do)
		}
	case orb.Polygon:
		for _, r := range g {
			each(r, do)
		}
	case orb.MultiPolygon:
		for _, p := range g {
			eachPosition(p, do)
		}
	}
}

func each(points []orb.Point, do func(orb.Point)) {
	for _, p := range points {
		do(p)
	}
}

package grids

import (
	"errors"
	"fmt"
	"math"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// straightWithin is how far, in metres, a straight line in longitude and latitude may be from the line drawn for it in
// the plane: a hundredth of a cell of one metre.
const straightWithin = 0.01

// mostHalvings bounds how often one edge is cut in half.
const mostHalvings = 14

// ProjectGeometry brings a geometry in longitude and latitude (degrees) into the plane of sys. Edges are straight in
// longitude and latitude (RFC 7946, section 3.1.1) and bend in the plane: each is cut in half until its pieces lie within a
// centimetre of where they should. Cuts fall at the same places from either side, so neighbours keep sharing their
// edge. An edge from 179 to -179 degrees goes the long way round, as RFC 7946 has it; 179 to 181 goes the short way. A
// bound becomes a polygon; nil stays nil; the argument is not changed. It is an error if sys has no tie to the globe or
// a vertex has no image in it.
func ProjectGeometry(g orb.Geometry, sys crs.System) (orb.Geometry, error) {
	if g == nil {
		return nil, nil
	}
	if !sys.Geographic() {
		return nil, errLocal
	}
	p := projector{sys: sys}
	out := p.geometry(g)
	if p.lost != nil {
		return nil, fmt.Errorf("longitude %v, latitude %v has no place in %s", p.lost[0], p.lost[1], sys.Code())
	}
	return out, nil
}

var errLocal = errors.New("longitude and latitude cannot be brought into a local plane, which has no tie to the globe")

// projector carries the first place that had no image through a geometry.
type projector struct {
	sys  crs.System
	lost *orb.Point
}

func (p *projector) geometry(g orb.Geometry) orb.Geometry {
	switch g := g.(type) {
	case orb.Point:
		return p.point(g)
	case orb.MultiPoint:
		return orb.MultiPoint(each([]orb.Point(g), p.point))
	case orb.LineString:
		return p.line(g)
	case orb.MultiLineString:
		return orb.MultiLineString(each([]orb.LineString(g), p.line))
	case orb.Ring:
		return p.ring(g)
	case orb.Polygon:
		return p.polygon(g)
	case orb.MultiPolygon:
		return orb.MultiPolygon(each([]orb.Polygon(g), p.polygon))
	case orb.Bound:
		return p.polygon(g.ToPolygon())
	case orb.Collection:
		return orb.Collection(each([]orb.Geometry(g), p.geometry))
	}
	return nil
}

func each[T any](in []T, f func(T) T) []T {
	if in == nil {
		return nil
	}
	out := make([]T, len(in))
	for i := range in {
		out[i] = f(in[i])
	}
	return out
}

func (p *projector) polygon(g orb.Polygon) orb.Polygon { return each([]orb.Ring(g), p.ring) }

func (p *projector) ring(g orb.Ring) orb.Ring { return orb.Ring(p.line(orb.LineString(g))) }

func (p *projector) point(at orb.Point) orb.Point {
	x, y := p.sys.Forward(at[0], at[1])
	if !usable(x, y) && p.lost == nil {
		p.lost = &at
	}
	return orb.Point{x, y}
}

func (p *projector) line(g orb.LineString) orb.LineString {
	if len(g) == 0 {
		return g
	}
	out := append(make(orb.LineString, 0, len(g)), p.point(g[0]))
	for i := 1; i < len(g) && p.lost == nil; i++ {
		b := p.point(g[i])
		if p.lost == nil {
			out = p.bend(out, g[i-1], g[i], out[len(out)-1], b, mostHalvings)
		}
		out = append(out, b)
	}
	return out
}

// bend appends the cuts between two vertices, given in degrees and in the plane, without the vertices themselves. A
// piece is good if the points a quarter, half and three quarters along it lie close to its chord; one point alone would
// miss an edge that bends both ways.
func (p *projector) bend(out orb.LineString, a, b, pa, pb orb.Point, left int) orb.LineString {
	if a == b || left == 0 || p.lost != nil {
		return out
	}
	mid := middle(a, b)
	pm := p.point(mid)
	if p.straight(pa, pb, pm) && p.straight(pa, pb, p.point(middle(a, mid))) && p.straight(pa, pb, p.point(middle(mid, b))) {
		return out
	}
	out = p.bend(out, a, mid, pa, pm, left-1)
	out = append(out, pm)
	return p.bend(out, mid, b, pm, pb, left-1)
}

func middle(a, b orb.Point) orb.Point { return orb.Point{(a[0] + b[0]) / 2, (a[1] + b[1]) / 2} }

// straight reports whether m is close to the chord from a to b.
func (p *projector) straight(a, b, m orb.Point) bool {
	if b[0] < a[0] || b[0] == a[0] && b[1] < a[1] {
		a, b = b, a // the same verdict, to the last bit, from either side
	}
	length := math.Hypot(b[0]-a[0], b[1]-a[1])
	if length == 0 {
		return math.Hypot(m[0]-a[0], m[1]-a[1]) <= straightWithin
	}
	return math.Abs(turn(a, b, m))/length <= straightWithin
}

package vector

import (
	"math"

	"github.com/paulmach/orb"
)

// shapeOf reads the geometry with the given members; without a kind there is none.
func shapeOf(m members) (orb.Geometry, float64, *Fault) {
	switch {
	case m.kind == "":
		return nil, math.NaN(), newFault(faultMissing, "has no geometry")
	case isNull(m.coordinates):
		return nil, math.NaN(), newFault(faultBad, `its geometry has no "coordinates"`)
	}
	return shape(m.kind, m.coordinates)
}

// shape reads the coordinates of a geometry. The third number of a Point is z; z is NaN for other kinds and where
// there is none. The kind must be one of those that knownKind knows, and the text valid JSON.
func shape(kind string, text []byte) (g orb.Geometry, z float64, fault *Fault) {
	z = math.NaN()
	c := &coordinates{text: text, parts: []part{{}, {}, {"position", 0}}}
	if c.isEmpty() {
		return nil, z, newFault(faultEmpty, "its geometry is empty")
	}
	switch kind {
	case "Point":
		g, z = c.point()
	case "MultiPoint":
		g = orb.MultiPoint(c.positions())
	case "LineString":
		g = c.line()
	case "MultiLineString":
		c.parts[atRing].name = "line"
		var lines orb.MultiLineString
		c.list(atRing, func() { lines = append(lines, c.line()) })
		g = lines
	case "Polygon":
		c.parts[atRing].name = "ring"
		g = c.polygon()
	case "MultiPolygon":
		c.parts[atPolygon].name, c.parts[atRing].name = "polygon", "ring"
		g = c.multiPolygon()
	}
	if c.refused != nil {
		c.refused.Advice = adviceSkip
		return nil, math.NaN(), &Fault{faultBad, c.refused}
	}
	Orient(g)
	return g, z, nil
}

// knownKind reports whether shape reads geometries of a kind.
func knownKind(kind string) bool {
	switch kind {
	case "Point", "MultiPoint", "LineString", "MultiLineString", "Polygon", "MultiPolygon":
		return true
	}
	return false
}

// isEmpty reports whether the list has no elements.
func (c *coordinates) isEmpty() bool {
	ahead := *c
	return ahead.take('[') && ahead.take(']')
}

// point reads a position of two numbers or more: easting and northing or longitude and latitude, and then a height.
func (c *coordinates) point() (p orb.Point, z float64) {
	height := *c
	p, z = c.position(), math.NaN()
	n := 0
	height.list(-1, func() {
		if v := height.number(); n == 2 {
			z = v
		}
		n++
	})
	return p, z
}

func (c *coordinates) positions() (all []orb.Point) {
	c.list(atPosition, func() { all = append(all, c.position()) })
	return all
}

// line reads "an array of two or more positions" (RFC 7946 section 3.1.4).
func (c *coordinates) line() orb.LineString {
	l := orb.LineString(c.positions())
	if c.refused == nil && len(l) < 2 {
		c.refuse("has %s, and a line needs 2 or more", several(len(l), "position"))
	}
	return l
}

// Orient turns the rings of a Polygon or MultiPolygon in place, as RFC 7946 section 3.1.6 has them: the outer one
// anticlockwise, holes clockwise. A ring without area stays as it is, and so do other geometries. Longitudes are taken
// as numbers: a ring that jumps from 180 to -180 is seen as one that goes around the globe.
func Orient(g orb.Geometry) {
	switch g := g.(type) {
	case orb.Polygon:
		for i, ring := range g {
			wind(ring, i == 0)
		}
	case orb.MultiPolygon:
		for _, p := range g {
			Orient(p)
		}
	}
}

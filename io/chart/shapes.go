package chart

import (
	"errors"
	"fmt"

	"github.com/paulmach/orb"
)

// Shapes are areas, lines and points in plane metres with a number each. Geometry and Value have the same length, and so
// has Name unless it is nil.
type Shapes struct {
	// Geometry holds an orb.Polygon, MultiPolygon, LineString, MultiLineString, Point or MultiPoint each. A polygon's
	// rings after the first are holes, through which one sees what lies under it.
	Geometry []orb.Geometry
	// Value is the number of each; NaN, infinities and magnitudes of 1e300 and over are shown as "no value".
	Value []float64
	// Name is drawn where there is room for it; a name may be empty.
	Name []string
}

func (s Shapes) given() bool { return s.Geometry != nil }

func (s Shapes) check() error {
	n := len(s.Geometry)
	switch {
	case !s.given():
		return nil
	case n == 0:
		return errors.New("no shapes to draw")
	case len(s.Value) != n:
		return fmt.Errorf("%d shapes have %d values", n, len(s.Value))
	case s.Name != nil && len(s.Name) != n:
		return fmt.Errorf("%d shapes have %d names", n, len(s.Name))
	}
	for i, g := range s.Geometry {
		if err := checkShape(g); err != nil {
			return fmt.Errorf("shape %d%s: %w", i+1, s.called(i), err)
		}
	}
	return nil
}

// called is the name of a shape for messages, with a blank before it.
func (s Shapes) called(i int) string {
	if s.Name == nil || s.Name[i] == "" {
		return ""
	}
	return fmt.Sprintf(" %q", s.Name[i])
}

func checkShape(g orb.Geometry) error {
	if g == nil {
		return errors.New("there is no geometry")
	}
	p, ok := partsOf(g)
	if !ok {
		return fmt.Errorf("a %s cannot be drawn, only points, lines and polygons", g.GeoJSONType())
	}
	vertices := 0
	for points := range p.vertices() {
		vertices += len(points)
		for i, q := range points {
			if !finite(q[0]) || !finite(q[1]) {
				return fmt.Errorf("vertex %d is at (%g, %g)", i+1, q[0], q[1])
			}
		}
	}
	if vertices == 0 {
		return errors.New("it has no vertex")
	}
	return nil
}

// parts are a shape taken apart; one of the three is filled.
type parts struct {
	area  orb.MultiPolygon
	lines orb.MultiLineString
	dots  orb.MultiPoint
}

// partsOf takes a shape apart; ok is false for a geometry that Shapes cannot hold.
func partsOf(g orb.Geometry) (p parts, ok bool) {
	switch g := g.(type) {
	case orb.Polygon:
		p.area = orb.MultiPolygon{g}
	case orb.MultiPolygon:
		p.area = g
	case orb.LineString:
		p.lines = orb.MultiLineString{g}
	case orb.MultiLineString:
		p.lines = g
	case orb.Point:
		p.dots = orb.MultiPoint{g}
	case orb.MultiPoint:
		p.dots = g
	default:
		return p, false
	}
	return p, true
}

// vertices yields the rings, lines and points, each as its vertices.
func (p parts) vertices() func(yield func([]orb.Point) bool) {
	return func(yield func([]orb.Point) bool) {
		for _, polygon := range p.area {
			for _, ring := range polygon {
				if !yield(ring) {
					return
				}
			}
		}
		for _, line := range p.lines {
			if !yield(line) {
				return
			}
		}
		if len(p.dots) > 0 {
			yield(p.dots)
		}
	}
}

// bound is the box around all shapes.
func (s Shapes) bound() orb.Bound {
	b := s.Geometry[0].Bound()
	for _, g := range s.Geometry[1:] {
		b = b.Union(g.Bound())
	}
	return b
}

// areasOnly reports whether there are shapes, and neither lines nor points among them.
func (s Shapes) areasOnly() bool {
	for _, g := range s.Geometry {
		if p, _ := partsOf(g); p.area == nil {
			return false
		}
	}
	return s.given()
}

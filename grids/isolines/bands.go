package isolines

import (
	"errors"

	"github.com/paulmach/orb"

	"drumlin/grids"
)

// Band is where a surface is at least Low and below High: polygons with holes in the plane of the lattice, in metres. Rings end
// with their first point and turn as RFC 7946 has them, counter-clockwise outside and clockwise around holes; they do
// not cross or touch themselves, and touch each other in points at most.
type Band struct {
	Low, High float64
	Area      orb.MultiPolygon
}

// Bands returns the areas between each two neighbouring edges, ascending, without those that have none. The first edge may
// be -Inf and the last +Inf; the bands then cover the cells that have a value exactly and without overlap. Otherwise what is
// below the first edge, or not below the last, is left out. Inside, the bands meet along the lines that Lines gives for the edges.
// Values, errors and panics are as for Lines; fewer than two edges are an error too.
func Bands(l grids.Lattice, value []float64, edges []float64) ([]Band, error) {
	if len(edges) < 2 {
		return nil, errors.New("edges of bands: there must be two or more")
	}
	if err := checkLevels("edge", edges, true); err != nil || l.Cells() == 0 {
		return nil, err
	}
	s, err := newSurface(l, value, edges)
	if err != nil {
		return nil, err
	}
	segments := make([][]segment, len(edges)+1) // by class
	err = s.scan(func(level int, g segment) {
		segments[level+1] = append(segments[level+1], g)
		segments[level] = append(segments[level], segment{g.to, g.from, g.square})
	}, func(class int, g segment) {
		segments[class] = append(segments[class], g)
	})
	if err != nil {
		return nil, err
	}
	var bands []Band
	for class := 1; class < len(edges); class++ {
		area := s.polygons(newNetwork(segments[class]))
		if len(area) > 0 {
			bands = append(bands, Band{Low: edges[class-1], High: edges[class], Area: area})
		}
		segments[class] = nil
	}
	return bands, nil
}

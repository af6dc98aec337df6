package grids

import (
	"errors"
	"fmt"
	"math"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// Quadrature is a set of places that stand for a geometry: the mean of a function over the geometry is about the sum of
// Share times the function there.
type Quadrature struct {
	X, Y  []float64 // metres in the plane
	Share []float64 // of the geometry's ground, all above 0; they sum to 1
}

const (
	leastPoints = 9
	mostPoints  = 400
	leastShare  = 1e-9
)

// QuadratureOf returns places that stand for a geometry in the plane of sys. Pieces are no longer than spacing, in
// metres, if it is above 0 and finite, unless that took more than 400 places; there are 9 or more for lines and areas.
//
//   - A Point stands for itself, the positions of a MultiPoint for a like share each.
//   - A LineString or MultiLineString is cut into pieces of like length, at least one for every line that has a length,
//     each with the place in its middle and its length on the ground as its share. More than 400 lines get one each.
//   - A Polygon or MultiPolygon is cut by a regular grid over its bounding box. What lies in a cell gets a place at its
//     centroid and its area on the ground as its share, so that linear functions are integrated exactly in an equal-area
//     plane. Where the centroid falls outside or onto an outline, a place inside the same cell is taken. Holes are left
//     out whichever way rings turn; polygons that overlap count twice, and outlines must not cross themselves.
//
// What has a share below 1e-9 is dropped. Places come in a fixed order, and do not depend on where a ring starts or
// which way it turns but for rounding. It is an error if g is nil or of another kind, has no positions, length or area,
// or has a vertex that is not finite, or if sys has no area scale at a place.
func QuadratureOf(g orb.Geometry, sys crs.System, spacing float64) (Quadrature, error) {
	if !(spacing > 0) {
		spacing = math.Inf(1)
	}
	switch g := g.(type) {
	case nil:
		return Quadrature{}, errors.New("there is no geometry")
	case orb.Point:
		return quadratureOfPoints(orb.MultiPoint{g}, sys)
	case orb.MultiPoint:
		return quadratureOfPoints(g, sys)
	case orb.LineString:
		return quadratureOfLines(orb.MultiLineString{g}, sys, spacing)
	case orb.MultiLineString:
		return quadratureOfLines(g, sys, spacing)
	case orb.Polygon:
		return quadratureOfAreas(orb.MultiPolygon{g}, sys, spacing)
	case orb.MultiPolygon:
		return quadratureOfAreas(g, sys, spacing)
	}
	return Quadrature{}, fmt.Errorf("a %s has no points to stand for it: only points, lines and polygons do", g.GeoJSONType())
}

func quadratureOfPoints(points orb.MultiPoint, sys crs.System) (Quadrature, error) {
	var q Quadrature
	if len(points) == 0 {
		return q, errors.New("the geometry has no positions")
	}
	for i, p := range points {
		if !usable(p[0], p[1]) {
			return Quadrature{}, fmt.Errorf("position %d is not a finite place", i+1)
		}
		if _, err := areaScale(sys, p); err != nil {
			return Quadrature{}, err
		}
		q.add(p, 1)
	}
	return q.shared(), nil
}

func quadratureOfLines(lines orb.MultiLineString, sys crs.System, spacing float64) (Quadrature, error) {
	length := make([]float64, len(lines))
	total, present := 0.0, 0
	for i, line := range lines {
		for v, p := range line {
			if !usable(p[0], p[1]) {
				return Quadrature{}, fmt.Errorf("line %d has a vertex that is not a finite place", i+1)
			}
			if v > 0 {
				length[i] += math.Hypot(p[0]-line[v-1][0], p[1]-line[v-1][1])
			}
		}
		if length[i] > 0 {
			total += length[i]
			present++
		}
	}
	if present == 0 {
		return Quadrature{}, errors.New("the geometry has no length")
	}
	count := pieces(length, min(spacing, total/leastPoints))
	if sum(count) > mostPoints {
		// Every line rounds up, which adds less than a piece each.
		count = pieces(length, total/float64(max(0, mostPoints-present)))
	}
	var q Quadrature
	for i, line := range lines {
		piece := length[i] / count[i]
		for _, p := range middles(line, length[i], int(count[i])) {
			scale, err := areaScale(sys, p)
			if err != nil {
				return Quadrature{}, err
			}
			q.add(p, piece/math.Sqrt(scale))
		}
	}
	return q.shared(), nil
}

// pieces returns into how many pieces each line is cut for none to be longer than most: 0 without a length, else 1 or
// more.
func pieces(length []float64, most float64) []float64 {
	count := make([]float64, len(length))
	for i, l := range length {
		if l > 0 {
			count[i] = max(1, roundedUp(l/most))
		}
	}
	return count
}

// roundedUp takes no whole step more for what rounding has added.
func roundedUp(v float64) float64 { return math.Ceil(v * (1 - 1e-12)) }

func sum(v []float64) (total float64) {
	for _, v := range v {
		total += v
	}
	return total
}

// middles returns the middles of n pieces of like length along a line.
func middles(line orb.LineString, length float64, n int) []orb.Point {
	middle := make([]orb.Point, 0, n)
	behind := 0.0
	for v := 1; v < len(line) && len(middle) < n; v++ {
		a, b := line[v-1], line[v]
		step := math.Hypot(b[0]-a[0], b[1]-a[1])
		for len(middle) < n {
			along := (float64(len(middle)) + 0.5) / float64(n) * length
			if along > behind+step {
				break
			}
			t := max(0, (along-behind)/step)
			middle = append(middle, orb.Point{a[0] + t*(b[0]-a[0]), a[1] + t*(b[1]-a[1])})
		}
		behind += step
	}
	return middle
}

// areaScale returns the area scale at a place, which must have one.
func areaScale(sys crs.System, p orb.Point) (float64, error) {
	scale := sys.AreaScale(p[0], p[1])
	if !(scale > 0) || math.IsInf(scale, 1) {
		return 0, fmt.Errorf("the place (%.10g, %.10g) lies beyond the plane of %s", p[0], p[1], sys.Code())
	}
	return scale, nil
}

// add appends a place with its share of a whole not known yet.
func (q *Quadrature) add(p orb.Point, share float64) {
	q.X, q.Y, q.Share = append(q.X, p[0]), append(q.Y, p[1]), append(q.Share, share)
}

// shared returns q with shares of 1, without those that are too small.
func (q Quadrature) shared() Quadrature {
	total := sum(q.Share)
	var kept Quadrature
	for i, s := range q.Share {
		if s >= leastShare*total || len(q.Share) == 1 {
			kept.add(orb.Point{q.X[i], q.Y[i]}, s)
		}
	}
	total = sum(kept.Share)
	for i := range kept.Share {
		kept.Share[i] /= total
	}
	return kept
}

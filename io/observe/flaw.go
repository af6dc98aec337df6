package observe

import (
	"fmt"
	"math"
	"strconv"

	"drumlin/io/vector"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
)

// Flaws of geometries that can be read, but are no place where something could have been observed.
const (
	noArea        = "the polygon has no area"
	noLength      = "the line has no length"
	crossesItself = "the polygon crosses itself near"
)

// flawOf says what is wrong with a geometry; "" if nothing is, or if there is none.
func flawOf(g orb.Geometry) string {
	switch g := g.(type) {
	case orb.LineString:
		return flawOfLines([]orb.LineString{g})
	case orb.MultiLineString:
		return flawOfLines(g)
	case orb.Polygon:
		return flawOfPolygons([]orb.Polygon{g})
	case orb.MultiPolygon:
		return flawOfPolygons(g)
	}
	return ""
}

func flawOfLines(lines []orb.LineString) string {
	for _, l := range lines {
		for _, p := range l {
			if p != l[0] {
				return ""
			}
		}
	}
	return noLength
}

// flawOfPolygons looks for a ring that crosses itself, and for the area of all polygons together.
func flawOfPolygons(polygons []orb.Polygon) string {
	wide := false
	for _, polygon := range polygons {
		for _, ring := range polygon {
			if at, crosses := crossing(ring); crosses {
				return fmt.Sprintf("%s (%s)", crossesItself, positionWord(at, ring.Bound()))
			}
		}
		wide = wide || hasArea(polygon)
	}
	if !wide {
		return noArea
	}
	return ""
}

// sameLine is the distance, in parts of the extent of a ring, up to which a position lies on an edge. Outlines that were
// rounded or thinned cross themselves by less than that in many places, which moves no area.
const sameLine = 1e-6

// crossing returns a point at which a ring crosses itself, and whether there is one.
func crossing(ring orb.Ring) (orb.Point, bool) {
	return vector.Crossing(ring, sameLine*diagonal(ring.Bound()))
}

// hasArea reports whether the area of a polygon is more than what the rounding of its positions comes to.
func hasArea(polygon orb.Polygon) bool {
	const rounding = 4 * 0x1p-52
	far := farthest(polygon)
	near := make(orb.Polygon, len(polygon)) // seen from one of its positions, or the area of a small polygon would be lost
	for i, ring := range polygon {
		for _, p := range ring {
			near[i] = append(near[i], orb.Point{p[0] - polygon[0][0][0], p[1] - polygon[0][0][1]})
		}
	}
	return math.Abs(planar.Area(near)) > rounding*math.Hypot(far[0], far[1])*diagonal(polygon.Bound())
}

func diagonal(b orb.Bound) float64 { return math.Hypot(b.Max[0]-b.Min[0], b.Max[1]-b.Min[1]) }

// positionWord writes a position to about a thousandth of an extent.
func positionWord(p orb.Point, extent orb.Bound) string {
	decimals := max(0, 3-int(math.Floor(math.Log10(diagonal(extent)))))
	return strconv.FormatFloat(p[0], 'f', decimals, 64) + ", " + strconv.FormatFloat(p[1], 'f', decimals, 64)
}

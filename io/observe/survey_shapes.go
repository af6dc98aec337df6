package observe

import (
	"math"
	"strconv"
	"strings"

	"github.com/paulmach/orb"
)

// SurveyShapes describes geometries. Those that are missing or cannot be read count as that and in nothing else.
type SurveyShapes struct {
	Kinds []ShapeCount // of the kinds that there are, points first and polygons last

	Least, Most [2]float64 // extent of all positions; NaN where there are none
	Positions   int
	Heights     int // points with a third coordinate

	Missing   int // nothing, or a geometry without positions
	Bad       int // cannot be read
	Line, Row int // the first of these; 0 where there is none
	Reason    string

	CRS      string // by their SRID, of the first that is read; empty without one, and for features
	Others   int    // with another SRID than the first
	OtherRow int    // the first of these, from 1; 0 where there is none
}

// ShapeCount says how many rows have a geometry of one kind.
type ShapeCount struct {
	Kind string // as in GeoJSON, such as "MultiPolygon"
	Rows int
}

var shapeKinds = []string{"Point", "MultiPoint", "LineString", "MultiLineString", "Polygon", "MultiPolygon"}

// shapeSurvey makes the description of geometries, row by row.
type shapeSurvey struct {
	out    SurveyShapes
	kinds  map[string]int
	extent [2][2]float64 // least, most
	srid   int
	places placeCounter
}

// key differs between sites that differ.
func (s *site) key() string {
	if s.geometry == nil {
		return s.code
	}
	return string(appendGeometry(nil, s.geometry))
}

// newShapeSurvey begins a survey below rows of which none is a geometry: in some there is nothing, in others something
// else, and this first.
func newShapeSurvey(missing, bad int, first firstValue, format *Format) *shapeSurvey {
	s := &shapeSurvey{out: SurveyShapes{Missing: missing, Bad: bad}}
	if bad > 0 {
		s.out.Line, s.out.Row, s.out.Reason = first.line, first.row, parseSite(first.text, format).reason
	}
	if s.places.out.Without = missing + bad; s.places.out.Without > 0 {
		s.places.out.Row = 1
	}
	return s
}

// take counts the geometry of a row.
func (s *shapeSurvey) take(at *site, line, row int) {
	o := &s.out
	p := middle(at.geometry)
	s.places.take(p[0], p[1], row)
	switch {
	case at.geometry == nil && at.code == faultGeometry:
		if o.Bad++; o.Bad == 1 {
			o.Line, o.Row, o.Reason = line, row, at.reason
		}
		return
	case at.geometry == nil:
		o.Missing++
		return
	case s.kinds == nil:
		s.kinds, s.srid = map[string]int{}, at.srid
		s.extent = [2][2]float64{{math.Inf(1), math.Inf(1)}, {math.Inf(-1), math.Inf(-1)}}
	case at.srid != s.srid:
		if o.Others++; o.Others == 1 {
			o.OtherRow = row
		}
	}
	s.kinds[at.geometry.GeoJSONType()]++
	if !math.IsNaN(at.z) {
		o.Heights++
	}
	eachPosition(at.geometry, func(p orb.Point) {
		o.Positions++
		for i, v := range p {
			s.extent[0][i], s.extent[1][i] = min(s.extent[0][i], v), max(s.extent[1][i], v)
		}
	})
}

func (s *shapeSurvey) finish() *SurveyShapes {
	o := s.out
	o.Least, o.Most = [2]float64{math.NaN(), math.NaN()}, [2]float64{math.NaN(), math.NaN()}
	if s.kinds != nil {
		o.Least, o.Most = s.extent[0], s.extent[1]
	}
	for _, kind := range shapeKinds {
		if rows := s.kinds[kind]; rows > 0 {
			o.Kinds = append(o.Kinds, ShapeCount{kind, rows})
		}
	}
	if s.srid > 0 {
		o.CRS = "EPSG:" + strconv.Itoa(s.srid)
	}
	return &o
}

// shortestHex is the number of digits of the shortest EWKB: byte order, kind and a number of positions.
const shortestHex = 18

// couldBeShape reports whether a trimmed value may be WKT or EWKB: most values of a table are not, which is seen at a
// glance.
func couldBeShape(s string) bool {
	switch {
	case s == "":
		return false
	case s[0] == '0' || s[0] == '\\':
		return len(s) >= shortestHex
	case s[0]|0x20 >= 'a' && s[0]|0x20 <= 'z':
		return s[len(s)-1] == ')' || len(s) > 5 && strings.EqualFold(s[len(s)-5:], "empty")
	}
	return false
}

package draft

import (
	"drumlin/grids"
	"drumlin/io/chart"

	"github.com/paulmach/orb"
)

// Draft is all that the pictures of one region and its part of a mosaic are made of.
type Draft struct {
	Response string  // name of the column
	Unit     string  // of the estimate
	Factor   float64 // the per that the unit has in it
	Ratio    bool    // the estimate is itself a relative risk
	Spread   string  // what the uncertainty is shown as: StandardError or Variation

	Threshold *float64 // in the unit; nil means none
	Reference float64  // level that relative risks are taken against; 0 means none

	Title, Subtitle, Stamp string
	Foot                   []string // cautions

	// Lattice has no mask; Cells are its cells in the study area, ascending, one for each value. Cells is nil where the
	// values stand at places of the user's own: Lattice then has its CRS only.
	Lattice grids.Lattice
	Cells   []int32
	X, Y    []float64 // the places of the values in the plane, cell centres or places, in metres

	Estimate, StandardError, Lower, Upper, CV, Nearest []float64
	Chance                                             []float64 // nil without a threshold
	Relative, RelativeLower, RelativeUpper             []float64 // nil without a reference

	// The places that observations belong to, where they are areas, lines or points with rows of their own: each an
	// orb.Polygon, MultiPolygon, LineString, MultiLineString, Point or MultiPoint in plane metres, with the smoothed value
	// in the unit. All nil without such places; ShapeName may be nil beside them, and ShapeRelative is without a reference.
	ShapeOf                      []orb.Geometry
	ShapeName                    []string
	ShapeEstimate, ShapeRelative []float64

	Outline        orb.MultiPolygon // of the study area, in plane metres; may be nil
	Zones          []chart.Zone
	PlaceX, PlaceY []float64 // distinct places of the observations, in plane metres
}

// What the picture of the uncertainty shows.
const (
	StandardError = "standard error"
	Variation     = "coefficient of variation"
)

package grids

import (
	"errors"
	"math"

	"github.com/paulmach/orb"
)

// spacingsAway is how many median spacings from the nearest observation a cell may lie and still be mapped (common
// practice, no source).
const spacingsAway = 5

// flattest is the area, as a share of the longer side of the bounding box squared, below which a study area counts as a
// line: rounding alone gives observations on a slanting line that much.
const flattest = 1e-9

// StudyArea is the part of the plane that a map shows.
type StudyArea struct {
	Outline orb.MultiPolygon // the polygons that were given, or the convex hull of the observations
	Reach   float64          // cells farther than this from every observation are left out; +Inf where polygons were given
}

// NoAreaError is the error of a study area without area.
type NoAreaError struct {
	Given  bool // polygons were given; otherwise it is the hull of Places distinct places
	Places int
}

// Error says what has no area.
func (e *NoAreaError) Error() string {
	switch {
	case e.Given:
		return "the polygons of the study area enclose no area"
	case e.Places == 0:
		return "no observation has a place, so there is no study area"
	case e.Places == 1:
		return "all observations are at one place: their convex hull has no area to map"
	}
	return "all observations are on one line: their convex hull has no area to map"
}

// Hint says what to give instead.
func (e *NoAreaError) Hint() string {
	if e.Given {
		return "give polygons in the observations' coordinates or in longitude and latitude"
	}
	return "give the study area as polygons (within), or the places to predict at (at)"
}

// NewStudyArea returns the study area of observations at x and y: within, if it has a polygon, else the convex hull of
// the observations without what is farther than five times their median spacing from all of them. All are in the
// plane. Observations that are not finite are passed over; a vertex that is not finite is an error, and so is an area of
// nothing (*NoAreaError). NewStudyArea panics if the lengths differ.
func NewStudyArea(x, y []float64, within orb.MultiPolygon) (StudyArea, error) {
	if len(within) > 0 {
		return given(within)
	}
	hull := ConvexHull(x, y)
	s := StudyArea{Outline: orb.MultiPolygon{{hull}}, Reach: spacingsAway * MedianSpacing(x, y)}
	if flat(s.Outline) {
		return StudyArea{}, &NoAreaError{Places: len(distinct(x, y))}
	}
	return s, nil
}

func given(within orb.MultiPolygon) (StudyArea, error) {
	for _, p := range within {
		if !usablePolygon(p) {
			return StudyArea{}, errors.New("study area: a vertex is not a finite place")
		}
	}
	if flat(within) {
		return StudyArea{}, &NoAreaError{Given: true}
	}
	return StudyArea{Outline: within, Reach: math.Inf(1)}, nil
}

// flat reports whether m encloses no area to speak of.
func flat(m orb.MultiPolygon) bool {
	b := m.Bound()
	side := math.Max(b.Max[0]-b.Min[0], b.Max[1]-b.Min[1])
	return !(planeArea(m) > flattest*side*side)
}

// mask marks the cells of l whose centres lie in the study area, observations being at x and y. The reach is never less
// than from a cell's centre to its corner, or a cell with an observation in it could count as far from all of them.
func (s StudyArea) mask(l Lattice, x, y []float64) (mask []bool, cells int) {
	mask = make([]bool, l.Cells())
	reach := math.Max(s.Reach, l.Cell*math.Sqrt2/2)
	everywhere := math.IsInf(reach, 1)
	var near *finder
	if !everywhere {
		near = newFinder(distinct(x, y), -1)
	}
	for _, run := range l.spans(s.Outline) {
		for i := run.i0; i < run.i1; i++ {
			if everywhere || near.reaches(orb.Point{l.centreX(i), l.centreY(run.row)}, reach*reach) {
				mask[run.row*l.NX+i] = true
				cells++
			}
		}
	}
	return mask, cells
}

package vector

import (
	"fmt"
	"math"

	"github.com/paulmach/orb"
)

const degreeDecimals = 7

// outward returns a place of the plane as it is written: longitude and latitude, rounded, or the place itself.
func (out *writer) outward(p orb.Point) (orb.Point, error) {
	if math.IsNaN(p[0]+p[1]) || math.IsInf(p[0]+p[1], 0) {
		return p, fmt.Errorf("the place (%g, %g) is not finite", p[0], p[1])
	}
	if !out.globe {
		return p, nil
	}
	lon, lat := out.sys.Inverse(p[0], p[1])
	if math.IsNaN(lon) || math.IsNaN(lat) {
		return p, fmt.Errorf("the place (%g, %g) lies beyond the plane of %s", p[0], p[1], out.sys.Code())
	}
	return orb.Point{round(lon), round(lat)}, nil
}

// round rounds degrees as they are written, so that the winding and the closing of a ring are judged by the numbers
// a reader will see.
func round(degrees float64) float64 {
	const scale = 1e7
	return math.Round(degrees*scale) / scale
}

// polygon returns a polygon as it is written. Rings wind by the right-hand rule, the outer one anticlockwise and the
// holes clockwise (RFC 7946 section 3.1.6).
//
// RFC 7946 section 3.1.9 recommends to cut an object that crosses the antimeridian in two. A cell stays one polygon
// here, so that a cell is a feature with one outline; its longitudes, and those of a zone's part, run on past 180 or
// -180 instead of jumping (179.9, 180.1 and not 179.9, -179.9), which no reader can take for a band around the globe.
// The middle of the outline lies between -180 and 180.
func (out *writer) polygon(p orb.Polygon) (orb.Polygon, error) {
	written := make(orb.Polygon, len(p))
	middle := 0.0
	for i, ring := range p {
		r := make(orb.Ring, len(ring))
		for j, point := range ring {
			var err error
			if r[j], err = out.outward(point); err != nil {
				return nil, err
			}
		}
		if out.globe {
			r = shift(aroundPole(unroll(r)), middle)
			if i == 0 {
				middle = r.Bound().Center()[0]
			}
		}
		wind(r, i == 0)
		written[i] = r
	}
	return written, nil
}

// unroll makes the longitudes of a ring continuous: no step is longer than 180 degrees. Only the last position may
// then differ from the first, by a turn of 360, if the ring goes around a pole.
func unroll(r orb.Ring) orb.Ring {
	for i := 1; i < len(r); i++ {
		r[i][0] = round(r[i][0] - 360*math.Round((r[i][0]-r[i-1][0])/360))
	}
	return r
}

// aroundPole closes a ring that goes around a pole. On a map of longitude and latitude the pole is a line, so the ring
// goes up to it, along it and back.
func aroundPole(r orb.Ring) orb.Ring {
	if len(r) == 0 || r[0] == r[len(r)-1] {
		return r
	}
	pole := math.Copysign(90, r.Bound().Center()[1])
	return append(r, orb.Point{r[len(r)-1][0], pole}, orb.Point{r[0][0], pole}, r[0])
}

// shift moves a ring by whole turns until the middle of its longitudes is within 180 degrees of a longitude.
func shift(r orb.Ring, near float64) orb.Ring {
	turn := 360 * math.Round((r.Bound().Center()[0]-near)/360)
	if turn != 0 {
		for i := range r {
			r[i][0] = round(r[i][0] - turn)
		}
	}
	return r
}

// wind turns a ring anticlockwise if it is an outer one, clockwise if it is a hole. A ring without area stays as it is.
func wind(r orb.Ring, outer bool) {
	if o := r.Orientation(); o == orb.CW && outer || o == orb.CCW && !outer {
		r.Reverse()
	}
}

package vector

import (
	"fmt"
	"math"
	"strconv"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
)

const (
	adviceOutline = "correct the outline, for example by digitising it anew or by cutting the polygon where it crosses itself"
	// leastArea is the share of the square of its extent that the area of a ring must exceed: below it lies what the
	// rounding of coordinates leaves of a line.
	leastArea = 1e-12
)

// CheckArea returns a *Fault for a geometry that cannot stand for an area: another kind than Polygon or MultiPolygon,
// one without polygons, a polygon without rings, a ring of fewer than 4 positions, that is not closed, that has a
// position which is not finite or that has no area, outlines within one polygon that cross, with the place, and a hole
// outside of its polygon. The fault has the part, such as "polygon 2, ring 1", and neither a file nor a feature.
//
// Outlines may touch, at positions or along edges. Polygons of one MultiPolygon are not compared, nor holes with each
// other beyond their outlines. Outlines are compared by their boxes, which takes time of the order n log n for n
// positions of outlines as found on maps; those so tangled that it takes far longer are refused too.
func CheckArea(g orb.Geometry) error {
	switch g := g.(type) {
	case orb.Polygon:
		if fault := checkPolygon(g, ""); fault != nil {
			return fault
		}
		return nil
	case orb.MultiPolygon:
		for i, p := range g {
			if fault := checkPolygon(p, fmt.Sprintf("polygon %d, ", i+1)); fault != nil {
				return fault
			}
		}
		if len(g) == 0 {
			return newFault(faultEmpty, "has no polygons")
		}
		return nil
	case nil:
		return newFault(faultMissing, "has no geometry")
	}
	return &Fault{faultNotArea, &Error{What: fmt.Sprintf("is a %s, not an area", g.GeoJSONType()), Advice: "give a Polygon or a MultiPolygon"}}
}

// checkPolygon checks one polygon; within is put before the number of a ring.
func checkPolygon(p orb.Polygon, within string) *Fault {
	refuse := func(ring int, code, format string, args ...any) *Fault {
		return &Fault{code, &Error{Part: fmt.Sprintf("%sring %d", within, ring+1), What: fmt.Sprintf(format, args...), Advice: adviceOutline}}
	}
	if len(p) == 0 {
		return refuse(0, faultEmpty, "is absent")
	}
	for i, r := range p {
		if code, what := ringFault(r); code != "" {
			return refuse(i, code, "%s", what)
		}
	}
	t := newOutlines(p)
	t.crossSelf(0, 0, len(t.edges))
	if t.crossed {
		a, b := t.edges[t.first], t.edges[t.second]
		at := meeting(a, b)
		if i, j := min(a.ring, b.ring), max(a.ring, b.ring); i != j {
			return refuse(j, faultCrossing, "crosses ring %d near %s", i+1, placeText(at))
		}
		return refuse(a.ring, faultCrossing, "crosses itself near %s", placeText(at))
	}
	for i := 1; i < len(p); i++ {
		if t.isOutside(p[i]) {
			return refuse(i, faultHole, "is a hole that lies outside of the polygon, near %s", placeText(p[i][0]))
		}
	}
	if t.work > t.most {
		return refuse(0, faultTangled, "is too tangled for its outlines to be checked")
	}
	return nil
}

// ringFault says what is wrong with a ring by itself; its results are "" if nothing is.
func ringFault(r orb.Ring) (code, what string) {
	if len(r) < 4 {
		return faultBad, fmt.Sprintf("has %s, and a ring needs 4 or more", several(len(r), "position"))
	}
	for _, p := range r {
		if v := p[0] - p[0] + p[1] - p[1]; v != 0 {
			return faultBad, "has a position that is not finite"
		}
	}
	if r[0] != r[len(r)-1] {
		return faultBad, fmt.Sprintf("is not closed: it starts at %s and ends at %s", placeText(r[0]), placeText(r[len(r)-1]))
	}
	b := r.Bound()
	width, height := b.Max[0]-b.Min[0], b.Max[1]-b.Min[1]
	// Measured from a corner of the box, so that coordinates far from 0 do not drown the area.
	near := make(orb.Ring, len(r))
	for i, p := range r {
		near[i] = orb.Point{p[0] - b.Min[0], p[1] - b.Min[1]}
	}
	if !(math.Abs(planar.Area(near)) > leastArea*(width*width+height*height)) {
		return faultNoArea, "has no area, near " + placeText(r[0])
	}
	return "", ""
}

// placeText writes a place for a message: 10 digits tell metres on the globe.
func placeText(p orb.Point) string {
	number := func(v float64) string { return strconv.FormatFloat(v, 'g', 10, 64) }
	return "(" + number(p[0]) + ", " + number(p[1]) + ")"
}

package crs

import "math"

// shift is the seven-parameter transformation from a datum to WGS 84 in geocentric coordinates (EPSG Guidance Note 7-2,
// methods 9606, position vector, and 9607, coordinate frame, which is the same with the turns' signs changed; three
// translations alone are method 9603). Heights are nought on WGS 84. Its zero value says that longitude and latitude are
// those of WGS 84.
type shift struct {
	on         bool
	el         ellipsoid // of the datum
	move       vector    // metres
	turn       vector    // radians, as a position vector
	turnLength float64   // 1 + the square of the turn's length
	scale      float64   // 1 + the scale difference
}

type vector [3]float64

func (a vector) dot(b vector) float64 { return a[0]*b[0] + a[1]*b[1] + a[2]*b[2] }

func (a vector) cross(b vector) vector {
	return vector{a[1]*b[2] - a[2]*b[1], a[2]*b[0] - a[0]*b[2], a[0]*b[1] - a[1]*b[0]}
}

// plus is a + s b.
func (a vector) plus(s float64, b vector) vector {
	return vector{a[0] + s*b[0], a[1] + s*b[1], a[2] + s*b[2]}
}

func (a vector) times(s float64) vector { return vector{s * a[0], s * a[1], s * a[2]} }

// newShift takes translations in metres, turns of a position vector in seconds of arc, and the scale difference in parts
// per million: the seven numbers that turn the datum's coordinates into those of WGS 84.
func newShift(el ellipsoid, seven [7]float64) shift {
	const second = math.Pi / 180 / 3600
	s := shift{
		on:    true,
		el:    el,
		move:  vector{seven[0], seven[1], seven[2]},
		turn:  vector{seven[3] * second, seven[4] * second, seven[5] * second},
		scale: 1 + seven[6]*1e-6,
	}
	s.turnLength = 1 + s.turn.dot(s.turn)
	return s
}

// fromWGS84 gives longitude and latitude on the datum of a place on WGS 84, in degrees, and the height over the datum's
// ellipsoid that a place on that of WGS 84 has, in metres. The small turns are undone by turning back as much, which is
// what the published parameters mean by their reversal.
func (s *shift) fromWGS84(lon, lat float64) (lonThere, latThere, height float64) {
	p := wgs84.geocentric(lon, lat, 0).plus(-1, s.move).times(1 / s.scale)
	return s.el.geodetic(p.plus(-1, s.turn.cross(p)))
}

// toWGS84 is the exact inverse of fromWGS84: the height over the datum's ellipsoid is that of a place on WGS 84's, found
// in two rounds. (With the height left at nought the two directions would disagree by up to a millimetre.)
func (s *shift) toWGS84(lon, lat float64) (lonThere, latThere float64) {
	height, over := 0.0, 0.0
	for range 2 {
		q := s.el.geocentric(lon, lat, height)
		// the inverse of 1 - turn x, written out
		p := q.plus(1, s.turn.cross(q)).plus(s.turn.dot(q), s.turn).times(s.scale/s.turnLength).plus(1, s.move)
		lonThere, latThere, over = wgs84.geodetic(p)
		height -= over
	}
	return lonThere, latThere
}

// areaScale is the area on the datum's ellipsoid per area on that of WGS 84 at a place on WGS 84: what the shift makes of
// a small patch of the one, seen along the normal of the other, and dropped from its height.
func (s *shift) areaScale(lon, lat float64) float64 {
	lonThere, latThere, height := s.fromWGS84(lon, lat)
	n := normal(lon, lat)
	// the cofactors of fromWGS84's turning back, which areas go by
	turned := n.plus(-1, s.turn.cross(n)).plus(s.turn.dot(n), s.turn)
	sinφ, _ := sincosDegrees(latThere)
	meridian, across := s.el.curvature(sinφ)
	return turned.dot(normal(lonThere, latThere)) / (s.scale * s.scale * (1 + height/meridian) * (1 + height/across))
}

// normal is the unit vector that stands on an ellipsoid.
func normal(lon, lat float64) vector {
	sinλ, cosλ := sincosDegrees(lon)
	sinφ, cosφ := sincosDegrees(lat)
	return vector{cosφ * cosλ, cosφ * sinλ, sinφ}
}

// geocentric turns longitude and latitude in degrees and height in metres into geocentric coordinates (EPSG Guidance
// Note 7-2, method 9602).
func (el *ellipsoid) geocentric(lon, lat, height float64) vector {
	sinλ, cosλ := sincosDegrees(lon)
	sinφ, cosφ := sincosDegrees(lat)
	n := el.a / math.Sqrt(1-el.e2*sinφ*sinφ)
	return vector{(n + height) * cosφ * cosλ, (n + height) * cosφ * sinλ, ((1-el.e2)*n + height) * sinφ}
}

// geodetic is the inverse of geocentric, by B. R. Bowring (1976), Transformation from spatial to geographical
// coordinates, Survey Review 23:323-327. Its first round is good to a micrometre near the ground; there are two.
func (el *ellipsoid) geodetic(p vector) (lon, lat, height float64) {
	across, z := math.Hypot(p[0], p[1]), p[2]
	b := el.a * (1 - el.f)
	sinφ, cosφ := z, across*(1-el.e2) // of the latitude on the ellipsoid itself, times a length
	for range 2 {
		sinβ, cosβ := (1-el.f)*sinφ, cosφ // the reduced latitude
		r := math.Hypot(sinβ, cosβ)
		sinβ, cosβ = sinβ/r, cosβ/r
		sinφ, cosφ = z+el.e2/(1-el.e2)*b*sinβ*sinβ*sinβ, across-el.e2*el.a*cosβ*cosβ*cosβ
	}
	r := math.Hypot(sinφ, cosφ)
	sinφ, cosφ = sinφ/r, cosφ/r
	height = across*cosφ + z*sinφ - el.a*math.Sqrt(1-el.e2*sinφ*sinφ)
	return degrees(math.Atan2(p[1], p[0])), degrees(math.Atan2(sinφ, cosφ)), height
}

package crs

import "math"

// ellipsoid is an ellipsoid of revolution with what the projections ask of it over and over.
type ellipsoid struct {
	a, f  float64 // equatorial radius in metres; flattening
	e, e2 float64 // first eccentricity and its square
	qp    float64 // q at the pole; the authalic radius is a sqrt(qp/2)
}

func newEllipsoid(a, inverseFlattening float64) ellipsoid {
	f := 1 / inverseFlattening
	e2 := f * (2 - f)
	e := math.Sqrt(e2)
	return ellipsoid{a: a, f: f, e: e, e2: e2, qp: 1 + (1-e2)*math.Atanh(e)/e}
}

// authalic turns the sine and cosine of a geographic latitude into those of the authalic latitude (EPSG Guidance Note
// 7-2, method 9820). The cosine comes from qp - q written without cancellation, so it is exact up to the pole.
func (el *ellipsoid) authalic(sinφ, cosφ float64) (sinβ, cosβ float64) {
	s := math.Abs(sinφ)
	w := 1 - el.e2*s*s
	q := (1 - el.e2) * (s/w + math.Atanh(el.e*s)/el.e)
	t := cosφ * cosφ / (1 + s) // 1 - s
	rest := t*(1+el.e2*s)/w + (1-el.e2)*math.Atanh(el.e*t/(1-el.e2*s))/el.e
	p := rest / el.qp
	return math.Copysign(math.Min(q/el.qp, 1), sinφ), math.Sqrt(p * (2 - p))
}

// fromAuthalic is the inverse of authalic: the geographic latitude in radians, by Newton's iteration on the authalic
// latitude itself, which stays well conditioned at the poles where q does not. Three rounds reach the last digit.
func (el *ellipsoid) fromAuthalic(sinβ, cosβ float64) float64 {
	φ := math.Atan2(sinβ, cosβ)
	for range 6 {
		s, c := math.Sincos(φ)
		sb, cb := el.authalic(s, c)
		slope := 1.0
		if w := 1 - el.e2*s*s; cb > 0 {
			slope = 2 * (1 - el.e2) * c / (w * w * el.qp * cb)
		}
		step := (sinβ*cb - cosβ*sb) / slope
		φ += step
		if math.Abs(step) < 1e-15 {
			break
		}
	}
	return math.Max(-math.Pi/2, math.Min(math.Pi/2, φ))
}

// parallel is the radius of the circle of latitude, in units of the equatorial radius.
func (el *ellipsoid) parallel(sinφ, cosφ float64) float64 {
	return cosφ / math.Sqrt(1-el.e2*sinφ*sinφ)
}

// curvature gives the radii of curvature in metres: along the meridian and across it.
func (el *ellipsoid) curvature(sinφ float64) (meridian, across float64) {
	w := 1 - el.e2*sinφ*sinφ
	across = el.a / math.Sqrt(w)
	return across * (1 - el.e2) / w, across
}

// sincosDegrees is exact at multiples of 90 degrees and keeps small angles from them.
func sincosDegrees(d float64) (sin, cos float64) {
	quarter := math.Round(d / 90)
	sin, cos = math.Sincos((d - 90*quarter) * (math.Pi / 180))
	switch int(quarter) & 3 {
	case 1:
		return cos, -sin
	case 2:
		return -sin, -cos
	case 3:
		return -cos, sin
	}
	return sin, cos
}

// onGlobe reports whether longitude and latitude name a place. Longitudes up to a full turn either way are taken, so
// that tables counting 0 to 360 work; an easting that was handed in for a longitude is not.
func onGlobe(lon, lat float64) bool {
	return math.Abs(lon) <= 360 && math.Abs(lat) <= 90
}

// wrap brings a longitude, or a difference of two, to -180 .. 180.
func wrap(lon float64) float64 {
	return math.Remainder(lon, 360) + 0 // + 0 turns a negative zero into a plain one
}

func degrees(radians float64) float64 { return radians * (180 / math.Pi) }

func radians(degrees float64) float64 { return degrees * (math.Pi / 180) }

// nowhere is what Forward and Inverse return where there is nothing.
func nowhere() (float64, float64) { return math.NaN(), math.NaN() }

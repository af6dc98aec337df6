package crs

import "math"

// mercator is Mercator's projection on an ellipsoid, with the scale given on the equator or on a parallel (EPSG Guidance
// Note 7-2, methods 9804 and 9805).
type mercator struct {
	el     ellipsoid
	radius float64 // equatorial radius times the scale on the equator
}

var _ projection = mercator{}

func newMercator(el ellipsoid, scale float64) mercator { return mercator{el: el, radius: el.a * scale} }

// newMercatorParallel takes the latitude in degrees that is true to scale.
func newMercatorParallel(el ellipsoid, lat float64) mercator {
	return newMercator(el, el.parallel(sincosDegrees(lat)))
}

func (m mercator) forward(λ, φ float64) (x, y float64) {
	if !(math.Abs(φ) < 90) {
		return nowhere()
	}
	return m.radius * radians(λ), m.radius * m.el.isometric(φ)
}

func (m mercator) inverse(x, y float64) (λ, φ float64) {
	λ = degrees(x / m.radius)
	ψ := y / m.radius
	if !(math.Abs(λ) <= 180*(1+1e-12) && math.Abs(ψ) < isometricEnd) {
		return nowhere()
	}
	return λ, m.el.fromIsometric(ψ)
}

func (m mercator) areaScale(x, y float64) float64 {
	_, φ := m.inverse(x, y)
	k := m.radius / m.el.a / m.el.parallel(sincosDegrees(φ))
	return k * k
}

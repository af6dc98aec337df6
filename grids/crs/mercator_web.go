package crs

import "math"

// webMercator is the Mercator projection of a sphere fed with latitudes of an ellipsoid, as web maps have it (EPSG
// Guidance Note 7-2, method 1024). It is neither conformal nor equal-area.
type webMercator struct{ el ellipsoid }

var _ projection = webMercator{}

func (m webMercator) forward(λ, φ float64) (x, y float64) {
	if !(math.Abs(φ) < 90) {
		return nowhere()
	}
	return m.el.a * radians(λ), m.el.a * math.Asinh(tangent(φ))
}

func (m webMercator) inverse(x, y float64) (λ, φ float64) {
	λ = degrees(x / m.el.a)
	ψ := y / m.el.a
	if !(math.Abs(λ) <= 180*(1+1e-12) && math.Abs(ψ) < isometricEnd) {
		return nowhere()
	}
	return λ, degrees(math.Atan(math.Sinh(ψ)))
}

func (m webMercator) areaScale(x, y float64) float64 {
	_, φ := m.inverse(x, y)
	sinφ, cosφ := sincosDegrees(φ)
	along, across := m.el.curvature(sinφ)
	return m.el.a / cosφ / along * (m.el.a / cosφ / across)
}

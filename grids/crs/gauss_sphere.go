package crs

import "math"

// gaussSphere is the conformal map of an ellipsoid onto a sphere that keeps the scale true to the second order around
// one latitude (C. F. Gauss 1843; EPSG Guidance Note 7-2, methods 9809, 9815 and 1041, which all stand on it: their
// constants are the same ones). Longitudes are stretched by n, a little more than one.
type gaussSphere struct {
	el         ellipsoid
	n          float64
	c          float64 // isometric latitude on the sphere is n times that of the ellipsoid, plus c
	radius     float64
	sin0, cos0 float64 // of the origin's latitude on the sphere
}

// newGaussSphere takes the latitude of the origin in degrees.
func newGaussSphere(el ellipsoid, lat0 float64) gaussSphere {
	sinφ, cosφ := sincosDegrees(lat0)
	along, across := el.curvature(sinφ)
	g := gaussSphere{el: el, radius: math.Sqrt(along * across)}
	g.n = math.Sqrt(1 + el.e2*cosφ*cosφ*cosφ*cosφ/(1-el.e2))
	g.sin0 = sinφ / g.n
	g.cos0 = math.Sqrt((1 - g.sin0) * (1 + g.sin0))
	g.c = math.Atanh(g.sin0) - g.n*el.isometric(lat0)
	return g
}

// forward gives a unit vector: out of the equator at the central meridian, east of that, and towards the pole. It is
// NaN at the poles, and within a fraction of a degree of the meridian opposite, where the stretched sphere overlaps.
func (g *gaussSphere) forward(λ, φ float64) vector {
	Λ := g.n * λ
	if !(math.Abs(Λ) <= 180 && math.Abs(φ) < 90) {
		return vector{math.NaN(), math.NaN(), math.NaN()}
	}
	τ := math.Sinh(g.n*g.el.isometric(φ) + g.c)
	cosχ := 1 / math.Hypot(1, τ)
	sinΛ, cosΛ := sincosDegrees(Λ)
	return vector{cosχ * cosΛ, cosχ * sinΛ, τ * cosχ}
}

// inverse is that of forward; NaN at the poles.
func (g *gaussSphere) inverse(p vector) (λ, φ float64) {
	cosχ := math.Hypot(p[0], p[1])
	if !(cosχ > 1e-14) {
		return nowhere()
	}
	ψ := (math.Asinh(p[2]/cosχ) - g.c) / g.n
	return degrees(math.Atan2(p[1], p[0])) / g.n, g.el.fromIsometric(ψ)
}

// scale is the length on the sphere per length on the ellipsoid; NaN at the poles.
func (g *gaussSphere) scale(p vector) float64 {
	_, φ := g.inverse(p)
	return g.n * g.radius * math.Hypot(p[0], p[1]) / (g.el.a * g.el.parallel(sincosDegrees(φ)))
}

// origin gives the origin and the directions east and north there.
func (g *gaussSphere) origin() (up, east, north vector) {
	return vector{g.cos0, 0, g.sin0}, vector{0, 1, 0}, vector{-g.sin0, 0, g.cos0}
}

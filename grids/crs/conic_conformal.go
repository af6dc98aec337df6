package crs

import (
	"errors"
	"math"
)

// conformalConic is the Lambert conformal conic projection with one or two standard parallels (EPSG Guidance Note 7-2,
// methods 9801 and 9802).
type conformalConic struct {
	el     ellipsoid
	n      float64 // sine of the cone's angle, negative for a cone over the south pole
	size   float64 // a F k0: the radius of the equator in the plane
	origin float64 // radius of the parallel of the origin
}

var _ projection = conformalConic{}

// newConformalConic takes the latitude of the origin in degrees and the scale there.
func newConformalConic(el ellipsoid, lat0, scale float64) (conformalConic, error) {
	sinφ, cosφ := sincosDegrees(lat0)
	c := conformalConic{el: el, n: sinφ}
	if math.Abs(sinφ) < 1e-9 || cosφ < 1e-9 {
		return c, errors.New("a cone touches the globe neither at the equator nor at a pole: use mercator or polar-stereographic")
	}
	c.size = el.a * scale * el.parallel(sinφ, cosφ) / c.n * math.Exp(c.n*el.isometric(lat0))
	c.origin = c.radius(lat0)
	return c, nil
}

// newConformalConicTwo takes the latitude of the origin and those of the two parallels that are true to scale, in
// degrees.
func newConformalConicTwo(el ellipsoid, lat0, parallel1, parallel2 float64) (conformalConic, error) {
	m1, m2 := el.parallel(sincosDegrees(parallel1)), el.parallel(sincosDegrees(parallel2))
	c := conformalConic{el: el}
	switch {
	case m1 < 1e-9 || m2 < 1e-9 || math.Abs(parallel1+parallel2) < 1e-7:
		return c, errParallels
	case math.Abs(parallel1-parallel2) < 1e-7:
		c.n, _ = sincosDegrees((parallel1 + parallel2) / 2)
	default:
		c.n = math.Log(m1/m2) / (el.isometric(parallel2) - el.isometric(parallel1))
	}
	if lat0*c.n <= -90*math.Abs(c.n) {
		return c, errors.New("lat0 is the pole that the cone is open to")
	}
	c.size = el.a * m1 / c.n * math.Exp(c.n*el.isometric(parallel1))
	c.origin = c.radius(lat0)
	return c, nil
}

var errParallels = errors.New("parallel1 and parallel2 are between the poles and not as far north as south of the equator")

// radius is that of a parallel in the plane, with the sign of n.
func (c conformalConic) radius(φ float64) float64 {
	if math.Abs(φ) == 90 && φ*c.n > 0 {
		return 0
	}
	return c.size * math.Exp(-c.n*c.el.isometric(φ))
}

func (c conformalConic) forward(λ, φ float64) (x, y float64) {
	if φ*c.n <= -90*math.Abs(c.n) { // the pole infinitely far off
		return nowhere()
	}
	ρ := c.radius(φ)
	s, cos := math.Sincos(c.n * radians(λ))
	return ρ * s, c.origin - ρ*cos
}

func (c conformalConic) inverse(x, y float64) (λ, φ float64) {
	sign := math.Copysign(1, c.n)
	down := c.origin - y
	ρ := sign * math.Hypot(x, down)
	λ = degrees(math.Atan2(sign*x, sign*down)) / c.n
	ψ := math.Log(c.size/ρ) / c.n
	if ρ == 0 {
		return 0, sign * 90
	}
	if !(math.Abs(λ) <= 180*(1+1e-12) && ψ*sign > -isometricEnd) { // the slit of the cone, and what is too far out
		return nowhere()
	}
	return λ, c.el.fromIsometric(ψ)
}

func (c conformalConic) areaScale(x, y float64) float64 {
	_, φ := c.inverse(x, y)
	m := c.el.parallel(sincosDegrees(φ))
	if !(m > 1e-15) { // at the pole the scale has no bound
		return math.NaN()
	}
	k := c.n * math.Hypot(x, c.origin-y) / (c.el.a * m)
	return k * k
}

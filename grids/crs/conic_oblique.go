package crs

import "math"

// obliqueConic is the conformal conic projection of the conformal sphere with a slanting cone, as the Czech and Slovak
// grid has it (J. Krovak 1922; EPSG Guidance Note 7-2, method 1041, with eastings and northings). The plane's origin is
// the tip of the cone.
type obliqueConic struct {
	sphere     gaussSphere
	sinα, cosα float64 // distance of the cone's axis from the pole, on the sphere and the central meridian
	n          float64 // sine of the cone's angle
	size       float64 // radius in the plane of the great circle square to the axis
}

var _ projection = obliqueConic{}

// newObliqueConic takes, in degrees, the latitude of the origin, the distance of the cone's axis from the pole and the
// pseudo-parallel on which scale holds.
func newObliqueConic(el ellipsoid, lat0, axis, parallel, scale float64) obliqueConic {
	c := obliqueConic{sphere: newGaussSphere(el, lat0)}
	c.sinα, c.cosα = sincosDegrees(axis)
	var cosine float64
	c.n, cosine = sincosDegrees(parallel)
	c.size = scale * c.sphere.radius * cosine / c.n * math.Exp(c.n*math.Atanh(c.n))
	return c
}

// frame gives three directions at right angles: along the axis, east, and square to both on the side of the equator.
func (c obliqueConic) frame() (axis, east, side vector) {
	return vector{c.sinα, 0, c.cosα}, vector{0, 1, 0}, vector{c.cosα, 0, -c.sinα}
}

func (c obliqueConic) forward(λ, φ float64) (x, y float64) {
	at := c.sphere.forward(λ, φ)
	axis, east, side := c.frame()
	sine := at.dot(axis)
	if !(math.Abs(sine) < 1-1e-12) { // within some metres of the axis or the point opposite
		return nowhere()
	}
	ρ := c.size * math.Exp(-c.n*math.Atanh(sine))
	s, cos := math.Sincos(c.n * math.Atan2(at.dot(east), at.dot(side)))
	return ρ * s, -ρ * cos
}

// onSphere gives the place as a unit vector and the cosine of its latitude over the cone; NaN where there is none.
func (c obliqueConic) onSphere(x, y float64) (at vector, cosine float64) {
	ψ := math.Log(c.size/math.Hypot(x, y)) / c.n
	θ := math.Atan2(x, -y) / c.n
	if !(math.Abs(θ) <= math.Pi*(1+1e-12) && math.Abs(ψ) < 14.5) {
		return vector{}, math.NaN()
	}
	axis, east, side := c.frame()
	sin, cos := math.Sincos(θ)
	cosine = 1 / math.Cosh(ψ)
	return axis.times(math.Tanh(ψ)).plus(cosine*sin, east).plus(cosine*cos, side), cosine
}

func (c obliqueConic) inverse(x, y float64) (λ, φ float64) {
	at, cosine := c.onSphere(x, y)
	if math.IsNaN(cosine) {
		return nowhere()
	}
	return c.sphere.inverse(at)
}

func (c obliqueConic) areaScale(x, y float64) float64 {
	at, cosine := c.onSphere(x, y)
	k := c.n * math.Hypot(x, y) / (c.sphere.radius * cosine) * c.sphere.scale(at)
	return k * k
}

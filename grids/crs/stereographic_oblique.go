package crs

import "math"

// obliqueStereographic is the stereographic projection of the conformal sphere (EPSG Guidance Note 7-2, method 9809).
type obliqueStereographic struct {
	sphere gaussSphere
	k0     float64
}

var _ projection = obliqueStereographic{}

// newObliqueStereographic takes the latitude of the centre in degrees and the scale there.
func newObliqueStereographic(el ellipsoid, lat0, scale float64) obliqueStereographic {
	return obliqueStereographic{sphere: newGaussSphere(el, lat0), k0: scale}
}

func (p obliqueStereographic) forward(λ, φ float64) (x, y float64) {
	at := p.sphere.forward(λ, φ)
	up, east, north := p.sphere.origin()
	b := 1 + at.dot(up)
	if !(b > 1e-12) { // within some metres of the point opposite
		return nowhere()
	}
	r := 2 * p.k0 * p.sphere.radius / b
	return r * at.dot(east), r * at.dot(north)
}

// onSphere gives the place as a unit vector, and the tangent of half its distance from the centre.
func (p obliqueStereographic) onSphere(x, y float64) (at vector, half float64) {
	r := 2 * p.k0 * p.sphere.radius
	u, v := x/r, y/r
	half = math.Hypot(u, v)
	up, east, north := p.sphere.origin()
	w := 1 + half*half
	return up.times((1-half*half)/w).plus(2*u/w, east).plus(2*v/w, north), half
}

func (p obliqueStereographic) inverse(x, y float64) (λ, φ float64) {
	at, half := p.onSphere(x, y)
	if !(half < polarEnd) {
		return nowhere()
	}
	return p.sphere.inverse(at)
}

func (p obliqueStereographic) areaScale(x, y float64) float64 {
	at, half := p.onSphere(x, y)
	if !(half < polarEnd) {
		return math.NaN()
	}
	k := p.k0 * (1 + half*half) * p.sphere.scale(at)
	return k * k
}

package crs

import "math"

// polarEnd is the tangent of half the distance from the pole beyond which a polar plane has nothing: a dozen metres
// from the other pole.
const polarEnd = 1e6

// polarStereographic is the stereographic projection on a pole, with the scale given there or on a parallel (EPSG Guidance
// Note 7-2, methods 9810, variant A, and 9829, variant B).
type polarStereographic struct {
	el   ellipsoid
	pole float64 // 1 north, -1 south
	k0   float64 // scale at the pole
	size float64 // radius at which the tangent is one
}

var _ projection = polarStereographic{}

// newPolarStereographic takes 1 for the north pole or -1 for the south pole, and the scale there.
func newPolarStereographic(el ellipsoid, pole, scale float64) polarStereographic {
	return polarStereographic{el: el, pole: pole, k0: scale, size: 2 * el.a * scale / polarStretch(&el)}
}

// newPolarStereographicParallel takes the latitude in degrees that is true to scale; its sign tells the pole.
func newPolarStereographicParallel(el ellipsoid, parallel float64) polarStereographic {
	pole := math.Copysign(1, parallel)
	sinφ, cosφ := sincosDegrees(pole * parallel)
	k0 := 1.0
	if cosφ > 0 {
		k0 = el.parallel(sinφ, cosφ) * polarStretch(&el) / (2 * math.Exp(-el.isometric(pole*parallel)))
	}
	return newPolarStereographic(el, pole, k0)
}

func polarStretch(el *ellipsoid) float64 {
	return math.Sqrt(math.Pow(1+el.e, 1+el.e) * math.Pow(1-el.e, 1-el.e))
}

func (p polarStereographic) forward(λ, φ float64) (x, y float64) {
	τ := p.el.conformal(tangent(p.pole * φ))
	t := math.Hypot(1, τ) - τ
	if τ > 0 {
		t = 1 / (math.Hypot(1, τ) + τ)
	}
	if !(t < polarEnd) {
		return nowhere()
	}
	sinλ, cosλ := sincosDegrees(λ)
	return p.size * t * sinλ, -p.pole * p.size * t * cosλ
}

func (p polarStereographic) inverse(x, y float64) (λ, φ float64) {
	t := math.Hypot(x, y) / p.size
	if !(t < polarEnd) {
		return nowhere()
	}
	return degrees(math.Atan2(x, -p.pole*y)), p.pole * p.latitude(t)
}

// latitude is that of a place t from the pole, counted towards it.
func (p polarStereographic) latitude(t float64) float64 {
	if t < 1e-16 {
		return 90
	}
	return degrees(math.Atan(p.el.fromConformal((1/t - t) / 2)))
}

func (p polarStereographic) areaScale(x, y float64) float64 {
	t := math.Hypot(x, y) / p.size
	if !(t < polarEnd) {
		return math.NaN()
	}
	k := p.k0
	if t > 1e-9 {
		k = p.size * t / (p.el.a * p.el.parallel(sincosDegrees(p.latitude(t))))
	}
	return k * k
}

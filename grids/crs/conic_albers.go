package crs

import "math"

// albers is the Albers equal-area conic projection (EPSG Guidance Note 7-2, method 9822).
type albers struct {
	el     ellipsoid
	n      float64 // sine of the cone's angle, negative for a cone over the south pole
	c      float64 // C of the Guidance Note
	origin float64 // radius of the parallel of the origin
}

var _ projection = albers{}

// newAlbers takes the latitude of the origin and those of the two parallels that are true to scale, in degrees.
func newAlbers(el ellipsoid, lat0, parallel1, parallel2 float64) (albers, error) {
	p := albers{el: el}
	m1, m2 := el.parallel(sincosDegrees(parallel1)), el.parallel(sincosDegrees(parallel2))
	q1, q2 := p.q(parallel1), p.q(parallel2)
	switch {
	case m1 < 1e-9 || m2 < 1e-9 || math.Abs(parallel1+parallel2) < 1e-7:
		return p, errParallels
	case math.Abs(parallel1-parallel2) < 1e-7:
		p.n, _ = sincosDegrees((parallel1 + parallel2) / 2)
	default:
		p.n = (m1 - m2) * (m1 + m2) / (q2 - q1)
	}
	p.c = m1*m1 + p.n*q1
	p.origin = p.radius(lat0)
	return p, nil
}

func (p albers) q(φ float64) float64 {
	sinβ, _ := p.el.authalic(sincosDegrees(φ))
	return sinβ * p.el.qp
}

// radius is that of a parallel in the plane, with the sign of n.
func (p albers) radius(φ float64) float64 {
	return p.el.a * math.Sqrt(math.Max(0, p.c-p.n*p.q(φ))) / p.n
}

func (p albers) forward(λ, φ float64) (x, y float64) {
	ρ := p.radius(φ)
	s, c := math.Sincos(p.n * radians(λ))
	return ρ * s, p.origin - ρ*c
}

func (p albers) inverse(x, y float64) (λ, φ float64) {
	sinβ, λ := p.place(x, y)
	if math.IsNaN(λ) {
		return nowhere()
	}
	return λ, degrees(p.el.fromAuthalic(sinβ, math.Sqrt((1-sinβ)*(1+sinβ))))
}

// place gives the sine of the authalic latitude and the longitude; the longitude is NaN in the slit of the cone and off
// the ring between the two poles.
func (p albers) place(x, y float64) (sinβ, λ float64) {
	sign := math.Copysign(1, p.n)
	down := p.origin - y
	r := p.n * math.Hypot(x, down) / p.el.a
	sinβ = (p.c - r*r) / (p.n * p.el.qp)
	λ = degrees(math.Atan2(sign*x, sign*down)) / p.n
	if !(math.Abs(sinβ) <= 1+1e-12 && math.Abs(λ) <= 180*(1+1e-12)) {
		return math.NaN(), math.NaN()
	}
	return math.Max(-1, math.Min(1, sinβ)), λ
}

func (p albers) areaScale(x, y float64) float64 {
	if _, λ := p.place(x, y); math.IsNaN(λ) {
		return math.NaN()
	}
	return 1
}

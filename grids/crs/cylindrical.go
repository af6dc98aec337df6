package crs

import "math"

// cylindrical is the Lambert cylindrical equal-area projection on an ellipsoid (EPSG Guidance Note 7-2, method 9835).
type cylindrical struct {
	el    ellipsoid
	k0    float64 // scale along the equator
	reach float64 // northing of the pole
}

var _ projection = cylindrical{}

// newCylindrical takes the latitude in degrees that is true to scale.
func newCylindrical(el ellipsoid, parallel float64) cylindrical {
	k0 := el.parallel(sincosDegrees(parallel))
	return cylindrical{el: el, k0: k0, reach: el.a * el.qp / (2 * k0)}
}

func (c cylindrical) forward(λ, φ float64) (x, y float64) {
	sinβ, _ := c.el.authalic(sincosDegrees(φ))
	return c.el.a * c.k0 * radians(λ), c.reach * sinβ
}

func (c cylindrical) inverse(x, y float64) (λ, φ float64) {
	if math.IsNaN(c.areaScale(x, y)) {
		return nowhere()
	}
	sinβ := math.Max(-1, math.Min(1, y/c.reach))
	return degrees(x / (c.el.a * c.k0)), degrees(c.el.fromAuthalic(sinβ, math.Sqrt((1-sinβ)*(1+sinβ))))
}

func (c cylindrical) areaScale(x, y float64) float64 {
	if !(math.Abs(y) <= c.reach*(1+1e-12) && math.Abs(x) <= math.Pi*c.el.a*c.k0*(1+1e-12)) {
		return math.NaN()
	}
	return 1
}

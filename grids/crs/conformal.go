package crs

import "math"

// conformal is the tangent of the conformal latitude from that of the geographic one.
func (el *ellipsoid) conformal(τ float64) float64 {
	h := math.Hypot(1, τ)
	σ := math.Sinh(el.e * math.Atanh(el.e*τ/h))
	return τ*math.Hypot(1, σ) - σ*h
}

// fromConformal is the inverse of conformal, by Newton's iteration (Karney 2011, equations 19 to 21).
func (el *ellipsoid) fromConformal(τc float64) float64 {
	τ := τc / (1 - el.e2)
	for range 8 {
		at := el.conformal(τ)
		step := (τc - at) * (1 + (1-el.e2)*τ*τ) / ((1 - el.e2) * math.Hypot(1, τ) * math.Hypot(1, at))
		τ += step
		if math.Abs(step) <= 1e-15*math.Abs(τ) {
			break
		}
	}
	return τ
}

// tangent of an angle in degrees, finite at the poles.
func tangent(d float64) float64 {
	sin, cos := sincosDegrees(d)
	return sin / math.Max(cos, 1e-17)
}

// isometricEnd is the isometric latitude beyond which nothing is told from the pole.
const isometricEnd = 38

// isometric is the isometric latitude of a latitude in degrees, the height of Mercator's map of a globe of radius one.
// At the poles it is some 39 and not infinite.
func (el *ellipsoid) isometric(φ float64) float64 { return math.Asinh(el.conformal(tangent(φ))) }

// fromIsometric is the inverse of isometric; beyond isometricEnd it is the pole.
func (el *ellipsoid) fromIsometric(ψ float64) float64 {
	if math.Abs(ψ) > isometricEnd {
		return math.Copysign(90, ψ)
	}
	return degrees(math.Atan(el.fromConformal(math.Sinh(ψ))))
}

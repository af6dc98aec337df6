package response

// Shaped is a distribution with a shape parameter that can be estimated beside the smoothness. The search moves the
// shape on a working scale, a log or a logit, inside a box; natural values are what is reported.
type Shaped interface {
	Distribution
	// ShapeName returns the shape's word: "theta", "correlation", "power".
	ShapeName() string
	// Shape returns the shape as reported.
	Shape() float64
	// Working returns the shape on the working scale.
	Working() float64
	// WithWorking returns the distribution with another shape.
	WithWorking(s float64) Shaped
	// WithShape returns the distribution with another shape, as reported; the error says what it may be.
	WithShape(v float64) (Shaped, error)
	// Box returns the bounds of the search on the working scale.
	Box() (lo, hi float64)
	// Simpler names the distribution that the shape's lower or upper bound stands for; empty if it stands for none.
	Simpler(upper bool) string
	// ShapeAt returns the derivatives of At's fields in the working shape, at fixed eta. Deviance's includes that of the
	// saturated log-likelihood, so that Deviance/2 - Saturated keeps its meaning.
	ShapeAt(o Obs, eta float64) ShapePoint
	// SaturatedSlope returns dSaturated/dworking at fixed phi.
	SaturatedSlope(o Obs, phi float64) float64
}

// ShapePoint holds the derivatives of a Point's fields in the working shape.
type ShapePoint struct {
	Deviance, Score, Weight, Expected float64
}

// Dispersed is a distribution whose dispersion phi is estimated by restricted likelihood.
type Dispersed interface {
	Distribution
	// ScaleSlope returns dSaturated/dlog phi.
	ScaleSlope(o Obs, phi float64) float64
}

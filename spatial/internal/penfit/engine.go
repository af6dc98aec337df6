// Package penfit is the numeric core of every fit: penalised iteratively reweighted least squares for the coefficients
// and a gradient search for the smoothness, over an engine that knows the size and the structure of the data.
//
// With D(b) the deviance and S_lambda = sum_j lambda_j S_j, the mode minimises D(b) + b'S_lambda b; H = X'WX + S_lambda
// at the mode. Smoothness minimises the exact Laplace restricted likelihood (Wood 2011, J. R. Statist. Soc. B 73:3-36),
//
//	V = D_p/(2 phi) - l_s(phi) + (log|H| - log|S_lambda|_+)/2 - M/2 log(2 pi phi),   D_p = D + b'S_lambda b,
//
// or generalised cross-validation, each with its exact gradient in log lambda.
package penfit

import "context"

// RowFunc is called once for every row of a pass with the row's linear predictor (without offset) and returns the
// weight with which the row enters the Gram matrix and the value it enters the right-hand side with. It is called
// from several goroutines, for different rows.
type RowFunc func(row int, linear float64) (weight, value float64)

// Engine owns whatever depends on the number of rows and on the structure of the basis. Coefficients are ordered as
// the engine likes; every vector over coefficients has length Coefs. An Engine is used by one goroutine at a time.
type Engine interface {
	Rows() int
	Coefs() int
	// Penalties returns the number of smoothing parameters.
	Penalties() int
	// Pass visits every row once at coefficients beta. It leaves X'v for Score and, if gram is set, X'WX for Factor.
	Pass(ctx context.Context, beta []float64, at RowFunc, gram bool) error
	// Score returns X'v of the last pass. The slice belongs to the engine.
	Score() []float64
	// Factor factors H = X'WX + S_lambda with the Gram matrix of the last pass that made one. It reports whether H is
	// positive definite.
	Factor(lambda []float64) bool
	// LogDet returns log|H|.
	LogDet() float64
	// Solve overwrites b with H^-1 b.
	Solve(b []float64)
	// PenaltyTo writes S_j beta to dst.
	PenaltyTo(dst []float64, j int, beta []float64)
	// LogDetPenalty returns log|S_lambda|_+ and its derivatives in log lambda.
	LogDetPenalty(lambda []float64) (value float64, slope []float64)
	// NullDim returns the dimension M of the null space of S_lambda.
	NullDim() int
	// Traces returns tr(H^-1 S_j) for each penalty.
	Traces() []float64
	// LinearTo writes X beta to dst.
	LinearTo(ctx context.Context, dst, beta []float64) error
	// LeveragesTo writes x_i'H^-1 x_i to dst.
	LeveragesTo(ctx context.Context, dst []float64) error
	// EdfSlopes returns d tr(H^-1 X'WX)/d log lambda_j, given the rows' dw_i/d log lambda_j; slopes is nil where
	// weights are constant.
	EdfSlopes(ctx context.Context, lambda []float64, slopes [][]float64) ([]float64, error)
	// Range returns for each log lambda the box inside which searching makes sense for the Gram matrix of the last
	// pass: at its upper end the term is its null space to rounding, at its lower end the penalty is not felt.
	Range() (lo, hi []float64)
}

// Package penfit is the numeric core of every fit: penalised iteratively reweighted least squares for the coefficients
// and a gradient search for the smoothness, over an engine that knows the size and the structure of the data.
//
// With D(b) the deviance and S_lambda = sum_j lambda_j S_j, the mode minimises D(b) + b'S_lambda b; H = G + S_lambda
// at the mode, G the Gram matrix X'WX, or minus the second derivative of the log-likelihood (times phi) where the rows'
// linear predictors are not linear in b. Smoothness minimises the exact Laplace restricted likelihood (Wood 2011, J. R.
// Statist. Soc. B 73:3-36),
//
//	V = D_p/(2 phi) - l_s(phi) + (log|H| - log|S_lambda|_+)/2 - M/2 log(2 pi phi),   D_p = D + b'S_lambda b,
//
// or generalised cross-validation, each with its exact gradient in log lambda.
package penfit

import (
	"context"

	"gonum.org/v1/gonum/mat"
)

// RowFunc is called once for every row of a pass with the row's linear predictor (without offset) and its tangent x'b,
// x the predictor's derivative in the coefficients; the two are the same where the predictor is linear in b. It returns
// the weight with which the row enters the Gram matrix and the value it enters the right-hand side with. It is called
// from several goroutines, for different rows.
type RowFunc func(row int, linear, tangent float64) (weight, value float64)

// Gram says which Gram matrix a pass makes. The two differ only where linear predictors are not linear in b.
type Gram int

const (
	NoGram  Gram = iota
	Working      // X'WX, of the model linearised at the coefficients
	Newton       // X'WX less the sum of the rows' values times their second derivatives: values must be scores
)

// Motion is how a fit moves with one point of the search.
type Motion struct {
	Beta   []float64 // d beta
	Weight []float64 // d weight, of each row
	Score  []float64 // d score, of each row
}

// Engine owns whatever depends on the number of rows and on the structure of the basis. Coefficients are ordered as
// the engine likes; every vector over coefficients has length Coefs. X, with rows x_i, is the derivative of the rows'
// linear predictors at the coefficients of the last pass. An Engine is used by one goroutine at a time.
type Engine interface {
	Rows() int
	Coefs() int
	// Curved reports whether linear predictors are not linear in the coefficients, so that Gram matrices differ.
	Curved() bool
	// Penalties returns the number of smoothing parameters.
	Penalties() int
	// Pass visits every row once at coefficients beta. It leaves X'v for Score and, if asked to, a Gram matrix G for
	// Factor.
	Pass(ctx context.Context, beta []float64, at RowFunc, gram Gram) error
	// Score returns X'v of the last pass. The slice belongs to the engine.
	Score() []float64
	// Factor factors H = G + S_lambda with the Gram matrix of the last pass that made one. It reports whether H is
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
	// LinearTo writes the rows' linear predictors at beta to dst.
	LinearTo(ctx context.Context, dst, beta []float64) error
	// TangentTo writes X d to dst: how linear predictors move along d.
	TangentTo(ctx context.Context, dst, d []float64) error
	// LeveragesTo writes x_i'H^-1 x_i to dst.
	LeveragesTo(ctx context.Context, dst []float64) error
	// GramTraces returns tr(H^-1 dG) along each motion.
	GramTraces(ctx context.Context, moves []Motion) ([]float64, error)
	// EdfSlopes returns d tr(H^-1 G)/d log lambda_j along the motion of each; moves is nil where G is constant.
	EdfSlopes(ctx context.Context, lambda []float64, moves []Motion) ([]float64, error)
	// Range returns for each log lambda the box inside which searching makes sense for the Gram matrix of the last
	// pass: at its upper end the term is its null space to rounding, at its lower end the penalty is not felt.
	Range() (lo, hi []float64)
	// Gram returns G of the last pass that made one.
	Gram() *mat.SymDense
	// Factored returns the upper triangular R with R'R = H, Coefs x Coefs row-major, which is what predictions need: the
	// variance of x'b is phi times the squared length of R'^-1 x.
	Factored() []float64
}

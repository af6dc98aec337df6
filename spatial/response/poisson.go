package response

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// Poisson is the distribution of counts with the log link; people, area, effort or expected counts enter as a log
// offset of the linear predictor.
type Poisson struct{}

func (Poisson) Name() string                  { return "poisson" }
func (Poisson) Link() string                  { return "log" }
func (Poisson) KnownDispersion() bool         { return true }
func (Poisson) Curvature() Curvature          { return Observed }
func (Poisson) ConstantWeight() bool          { return false }
func (Poisson) Mean(eta float64) float64      { return math.Exp(eta) }
func (Poisson) MeanSlope(eta float64) float64 { return math.Exp(eta) }
func (Poisson) Linear(mean float64) float64   { return math.Log(mean) }

// Start returns the count moved towards the overall mean, so that zeros have a logarithm.
func (Poisson) Start(o Obs, overall float64) float64 { return (o.Y + overall) / 2 }

// At returns the contributions of o at eta.
func (Poisson) At(o Obs, eta float64) Point {
	mu := math.Exp(eta)
	w := o.Weight * mu
	deviance := math.Inf(1)
	if !math.IsInf(mu, 1) {
		deviance = 2 * o.Weight * (xlogy(o.Y, mu) - (o.Y - mu))
	}
	return Point{
		Deviance: deviance, Score: o.Weight * (o.Y - mu),
		Weight: w, Slope: w, Expected: w, ExpectedSlope: w,
	}
}

// Pearson returns w (y - mean)^2 / mean, and 0 for a zero count where the mean underflows.
func (Poisson) Pearson(o Obs, eta float64) float64 {
	mu := math.Exp(eta)
	switch {
	case mu == o.Y:
		return 0
	case math.IsInf(mu, 1):
		return mu
	}
	return o.Weight * (o.Y - mu) * (o.Y - mu) / mu
}

// LogLikelihood returns w times the log probability of the count.
func (Poisson) LogLikelihood(o Obs, eta, _ float64) float64 {
	return o.Weight * (o.Y*eta - math.Exp(eta) - lgamma(o.Y+1))
}

// Saturated returns w times the log probability of the count at mean y.
func (Poisson) Saturated(o Obs, _ float64) float64 {
	return o.Weight * (xlogy(o.Y, 1) - o.Y - lgamma(o.Y+1))
}

// CDF returns the distribution function below and at the count, by the incomplete gamma function.
func (Poisson) CDF(o Obs, eta, _ float64) (below, upTo float64) {
	mu := math.Exp(eta)
	if o.Y > 0 {
		below = mathext.GammaIncRegComp(o.Y, mu)
	}
	return below, mathext.GammaIncRegComp(o.Y+1, mu)
}

func lgamma(x float64) float64 {
	l, _ := math.Lgamma(x)
	return l
}

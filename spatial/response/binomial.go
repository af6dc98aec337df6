package response

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// Binomial is the distribution of the number positive among trials, with the logit link.
type Binomial struct{}

func (Binomial) Name() string          { return "binomial" }
func (Binomial) Link() string          { return "logit" }
func (Binomial) KnownDispersion() bool { return true }
func (Binomial) Curvature() Curvature  { return Observed }
func (Binomial) ConstantWeight() bool  { return false }

// Mean returns the probability 1/(1 + exp(-eta)).
func (Binomial) Mean(eta float64) float64 { p, _ := logistic(eta); return p }

// MeanSlope returns p (1 - p).
func (Binomial) MeanSlope(eta float64) float64 { p, q := logistic(eta); return p * q }

// Linear returns log(p/(1 - p)).
func (Binomial) Linear(p float64) float64 { return math.Log(p) - math.Log1p(-p) }

// Start returns the row's share of positives moved towards the overall one.
func (Binomial) Start(o Obs, overall float64) float64 { return (o.Y + overall) / (o.Trials + 1) }

// At returns the contributions of o at eta.
func (Binomial) At(o Obs, eta float64) Point {
	p, q := logistic(eta)
	m := o.Trials
	w := o.Weight * m * p * q
	slope := w * (q - p)
	return Point{
		Deviance: 2 * o.Weight * (xlogy(o.Y, m*p) + xlogy(m-o.Y, m*q)), Score: o.Weight * (o.Y*q - (m-o.Y)*p),
		Weight: w, Slope: slope, Expected: w, ExpectedSlope: slope,
	}
}

// Pearson returns w (y - m p)^2 / (m p q), and 0 where p rounds to the share of positives at 0 or 1.
func (Binomial) Pearson(o Obs, eta float64) float64 {
	p, q := logistic(eta)
	r := o.Y*q - (o.Trials-o.Y)*p
	if r == 0 {
		return 0
	}
	return o.Weight * r * r / (o.Trials * p * q)
}

// LogLikelihood returns w times the log probability of the number positive.
func (Binomial) LogLikelihood(o Obs, eta, _ float64) float64 {
	return o.Weight * (logChoose(o.Trials, o.Y) - o.Y*softplus(-eta) - (o.Trials-o.Y)*softplus(eta))
}

// Saturated returns w times the log probability of the number positive at p = y/m.
func (Binomial) Saturated(o Obs, _ float64) float64 {
	return o.Weight * (logChoose(o.Trials, o.Y) + xlogy(o.Y, o.Trials) + xlogy(o.Trials-o.Y, o.Trials))
}

// CDF returns the distribution function below and at the number positive, by the incomplete beta function.
func (Binomial) CDF(o Obs, eta, _ float64) (below, upTo float64) {
	p, q := logistic(eta)
	at := func(k float64) float64 { // P(Y <= k)
		switch {
		case k < 0:
			return 0
		case k >= o.Trials:
			return 1
		case q > 0 && p > 0:
			return mathext.RegIncBeta(o.Trials-k, k+1, q)
		case p > 0: // p = 1 to rounding: every trial positive
			return 0
		}
		return 1
	}
	return at(o.Y - 1), at(o.Y)
}

// logistic returns p = 1/(1 + exp(-eta)) and 1 - p, both to full relative accuracy.
func logistic(eta float64) (p, q float64) {
	if eta < 0 {
		e := math.Exp(eta)
		return e / (1 + e), 1 / (1 + e)
	}
	e := math.Exp(-eta)
	return 1 / (1 + e), e / (1 + e)
}

// softplus returns log(1 + exp(x)).
func softplus(x float64) float64 {
	if x > 0 {
		return x + math.Log1p(math.Exp(-x))
	}
	return math.Log1p(math.Exp(x))
}

func logChoose(m, y float64) float64 { return lgamma(m+1) - lgamma(y+1) - lgamma(m-y+1) }

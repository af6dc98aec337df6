// Package response holds the distributions of a response and their links, one small type a file. It knows nothing of
// space: an observation comes with its linear predictor (offset included) and leaves with its contributions to the
// likelihood and their derivatives.
//
// A distribution is y ~ distribution(mean mu, dispersion phi/w) with link g(mu) = eta. Deviances, scores and weights
// are free of phi: with D the deviance, score = -1/2 dD/deta and weight = 1/2 d2D/deta2.
package response

import (
	"fmt"
	"math"
	"strings"
)

// Obs is one observation.
type Obs struct {
	Y      float64 // measured value, count, or number positive
	Trials float64 // number examined; 1 where the distribution has no trials
	Weight float64 // prior weight w: the dispersion is phi/w
}

// Point is what one observation contributes at a linear predictor.
type Point struct {
	Deviance      float64 // w times the unit deviance; +Inf where the mean overflows
	Score         float64 // -1/2 dDeviance/deta
	Weight        float64 // 1/2 d2Deviance/deta2, the observed weight; may be negative
	Slope         float64 // dWeight/deta
	Expected      float64 // the expectation of Weight, never negative
	ExpectedSlope float64 // dExpected/deta
}

// Distribution is a distribution of the response with its link. Implementations are small values, safe for
// concurrent use.
type Distribution interface {
	// Name returns the distribution's word: "gaussian", "poisson", "binomial".
	Name() string
	// Link returns the link's word: "identity", "log", "logit".
	Link() string
	// KnownDispersion reports whether phi is 1 rather than estimated.
	KnownDispersion() bool
	// Curvature says which weights enter the determinant of the restricted likelihood and the covariance.
	Curvature() Curvature
	// ConstantWeight reports whether the weights do not depend on the linear predictor.
	ConstantWeight() bool
	// At returns the contributions of o at linear predictor eta, offset included.
	At(o Obs, eta float64) Point
	// Mean returns g^-1(eta): the mean of y, or of y/trials for a binomial.
	Mean(eta float64) float64
	// MeanSlope returns dMean/deta.
	MeanSlope(eta float64) float64
	// Linear returns g(mean).
	Linear(mean float64) float64
	// Start returns a mean inside the link's domain from which iterations may start, given the overall mean.
	Start(o Obs, overall float64) float64
	// Pearson returns (y - mean)^2 w / V(mean), free of phi.
	Pearson(o Obs, eta float64) float64
	// LogLikelihood returns the log-likelihood of o with every constant, at dispersion phi.
	LogLikelihood(o Obs, eta, phi float64) float64
	// Saturated returns the log-likelihood of o were its mean its own value, at dispersion phi.
	Saturated(o Obs, phi float64) float64
	// CDF returns P(Y < y) and P(Y <= y) at linear predictor eta; equal for continuous distributions.
	CDF(o Obs, eta, phi float64) (below, upTo float64)
}

// Curvature says which of the two weights counts.
type Curvature int

const (
	Observed Curvature = iota // minus the second derivative of the log-likelihood
	Expected                  // its expectation
)

// New returns the distribution of that name with that link; an empty link means the distribution's own. A shape has a
// middling value from which a search may start. The error names the links there are.
func New(name, link string) (Distribution, error) {
	switch name + " " + link {
	case "gaussian ", "gaussian identity":
		return Gaussian{}, nil
	case "gaussian log":
		return GaussianLog{}, nil
	case "poisson ", "poisson log":
		return Poisson{}, nil
	case "negative-binomial ", "negative-binomial log":
		return NegativeBinomial{Theta: 5}, nil
	case "binomial ", "binomial logit":
		return Binomial{}, nil
	case "binomial complementary-log-log":
		return BinomialCloglog{}, nil
	case "beta-binomial ", "beta-binomial logit":
		return BetaBinomial{Correlation: 0.05}, nil
	case "gamma ", "gamma log":
		return Gamma{}, nil
	case "tweedie ", "tweedie log":
		return Tweedie{Power: 1.5}, nil
	}
	for _, n := range Names() {
		if n == name {
			return nil, fmt.Errorf("distribution %s has no link %q: it takes %s", name, link, Links(name))
		}
	}
	last := len(Names()) - 1
	return nil, fmt.Errorf("there is no distribution %q: choose %s or %s", name, strings.Join(Names()[:last], ", "), Names()[last])
}

// Names returns the words of the distributions.
func Names() []string {
	return []string{"gaussian", "poisson", "negative-binomial", "binomial", "beta-binomial", "gamma", "tweedie"}
}

// Links returns the words of the links of a distribution, its own first.
func Links(name string) []string {
	switch name {
	case "gaussian":
		return []string{"identity", "log"}
	case "poisson", "negative-binomial", "gamma", "tweedie":
		return []string{"log"}
	case "binomial":
		return []string{"logit", "complementary-log-log"}
	case "beta-binomial":
		return []string{"logit"}
	}
	return nil
}

// xlogy returns x log(x/y), and 0 for x = 0.
func xlogy(x, y float64) float64 {
	if x == 0 {
		return 0
	}
	return x * math.Log(x/y)
}

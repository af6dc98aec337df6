package rates

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// CountLimits returns the exact limits of the mean of a Poisson count, at a confidence between 0 and 1 such as 0.95
// (Garwood 1936, Biometrika 28:437-442): were the mean lower, a count as large or larger would have a probability of
// (1-confidence)/2, were it upper, a count as small or smaller. At a count of 0, lower is 0, and the confidence is
// at least the one asked for at every mean. Limits of a rate are these divided by what the count was made over.
//
// A count that is not whole, such as one shared out between places, gets the quantiles of the gamma distributions of
// shapes count and count+1 that hold at whole ones. They run smoothly between those, and have no exact meaning.
//
// Limits are right to 1e-12 of themselves. Both are NaN if count is negative or not finite, or confidence is not above 0
// and below 1.
func CountLimits(count, confidence float64) (lower, upper float64) {
	if !(count >= 0) || math.IsInf(count, 1) || !isConfidence(confidence) {
		return math.NaN(), math.NaN()
	}
	tail := (1 - confidence) / 2
	if count > 0 {
		lower = gammaQuantile(count, tail, false)
	}
	return lower, gammaQuantile(count+1, tail, true)
}

// mostTrials bounds the time that ShareLimits takes, which grows with the square root of the trials.
const mostTrials = 1e12

// ShareLimits returns the exact limits of a share of which positive out of trials were seen, at a confidence between 0
// and 1 (Clopper & Pearson 1934, Biometrika 26:404-413): were the share lower, as many positive ones or more would have a
// probability of (1-confidence)/2, were it upper, as many or fewer. Without a positive one, lower is 0, and with nothing
// else, upper is 1; so 0 out of 0 has the limits 0 and 1.
//
// Numbers that are not whole get the quantiles of the beta distributions that hold at whole ones, as in CountLimits.
//
// Limits are right to 1e-12 of themselves. Both are NaN if positive is negative or more than trials, trials is more than
// 1e12, or confidence is not above 0 and below 1.
func ShareLimits(positive, trials, confidence float64) (lower, upper float64) {
	if !(positive >= 0 && positive <= trials && trials <= mostTrials) || !isConfidence(confidence) {
		return math.NaN(), math.NaN()
	}
	tail := (1 - confidence) / 2
	others := trials - positive
	lower, upper = 0, 1
	if positive > 0 {
		lower, _ = betaQuantile(positive, others+1, tail)
	}
	if others > 0 {
		// The upper limit of a share is what the lower limit of the other one leaves.
		_, upper = betaQuantile(others, positive+1, tail)
	}
	return lower, upper
}

func isConfidence(c float64) bool { return c > 0 && c < 1 }

// manyCounts is the shape from which the normal quantile and its corrections give a gamma quantile to rounding.
const manyCounts = 1e8

// leastShape is the shape below which the quantiles here, at most 2^(-1/shape), are too small for a float64.
const leastShape = 1. / 1100

// gammaQuantile returns where the lower or the upper tail of the gamma distribution of a shape is p, at most 1/2.
func gammaQuantile(shape, p float64, upper bool) float64 {
	if shape < leastShape {
		return 0
	}
	tail := logLowerGamma
	z := distuv.UnitNormal.Quantile(p)
	if upper {
		tail, z = logUpperGamma, -z
	}
	if shape >= manyCounts {
		// Cornish & Fisher 1938, Rev. Int. Stat. Inst. 5:307-320; what is left out is of the order 1/shape.
		root := math.Sqrt(shape)
		return shape + z*root + (z*z-1)/3 + z*(z*z-7)/(36*root)
	}
	return solve(shape, math.Log(p), func(x float64) (log, slope float64) {
		log = tail(shape, x)
		slope = math.Exp(logGammaTerm(shape, x) + math.Log(shape) - log)
		if upper {
			slope = -slope
		}
		return log, slope
	})
}

// betaQuantile returns where the lower tail of a beta distribution is p, at most 1/2, b being 1 or more: the place x, and
// 1-x to as many digits.
func betaQuantile(a, b, p float64) (x, rest float64) {
	if a < leastShape {
		return 0, 1
	}
	odds := solve(a/b, math.Log(p), func(odds float64) (log, slope float64) {
		x, rest := odds/(1+odds), 1/(1+odds)
		log = logLowerBeta(a, b, x, rest)
		return log, math.Exp(logBetaTerm(a, b, x, rest) - log)
	})
	return odds / (1 + odds), 1 / (1 + odds)
}

// solve returns the x > 0 at which the logarithm of a tail is target, by Newton's rule in the logarithm of x, from the
// x given. The tails here are concave in it (the densities of the logarithm of a gamma variable and of the log odds of
// a beta variable are log-concave, and so are their tails: Prekopa 1973, Acta Sci. Math. 34:335-343), so that after the
// first step the rule comes nearer from one side, whatever the start. x is multiplied, not kept as a logarithm, which
// would cost digits. An x too small for a float64 is 0.
func solve(x, target float64, tail func(x float64) (log, slope float64)) float64 {
	const (
		steps  = 100
		enough = 1e-11 // the rule squares it
	)
	for range steps {
		log, slope := tail(x)
		step := (target - log) / slope
		x *= math.Exp(step)
		if x == 0 || math.Abs(step) < enough {
			break
		}
	}
	return x
}

package response

import "math"

// The density of a tweedie distribution at y > 0 is sum_j P(N = j) gamma(y; j), N Poisson (Dunn & Smyth 2005,
// Statistics and Computing 15:267-280). Writing out the terms at mean y, all constants fold into one function of two
// numbers, y density = H(z, power), z = w y^(2-power)/phi:
//
//	H = sqrt(a)/(2 pi) sum_{j>=1} exp(-r(j) - r(a j) - D(j, lambda)/(power-1))
//
// with a = (2-power)/(power-1), lambda = z/(2-power), r the remainder of Stirling's formula and D(j, lambda) =
// j log(j/lambda) - j + lambda. The large exponentials of the series, its log-gammas and the deviance have cancelled by
// algebra, so what is left can be summed to rounding at any z, largest term first.
//
// Long series. The terms F(j) are an entire function of j, zero at 0, -1, -2, ...; by Poisson's summation formula
// h sum F(h k + c) differs from the integral of F by about exp(-n (1 - cos(2 pi (power-1)/h))) of it, n =
// lambda/(power-1). Two things follow. A sum with whole steps h > 1 will do while that is below rounding, which keeps
// the number of terms under a hundred. And where it is below rounding for h = 1, the integral's asymptotic series in
// 1/z, the saddlepoint form sqrt(z/(2 pi)) with its corrections, stands for the sum once z is large enough for its
// first omitted term to vanish too. Steps and form are chosen from z and the power alone: sum and saddlepoint agree to
// rounding where the choice changes, in value and slopes, so a search that crosses it sees one smooth function.

const (
	// tweedieNats is the exponent below which exp(-tweedieNats) counts as nothing.
	tweedieNats = 45
	// tweedieSaddle is the z from which the asymptotic series may be used.
	tweedieSaddle = 64
)

// tweedieH holds log H and its derivatives.
type tweedieH struct {
	value   float64
	size    float64 // dvalue/dlog z
	working float64 // dvalue/dworking at fixed z, working = logit(power - 1)
}

// tweedieLogH returns log H at log z, with alpha = 2 - power and beta = power - 1.
func tweedieLogH(logZ, alpha, beta float64) tweedieH {
	z := math.Exp(logZ)
	if z >= tweedieSaddle && tweedieExcess(z, alpha, beta, 1) >= tweedieNats {
		return tweedieSaddlepoint(logZ, alpha, beta)
	}
	return newTweedieSum(logZ, alpha, beta).outwards(tweedieStep(z, alpha, beta, tweedieNats))
}

// tweedieExcess returns minus the log of the relative difference between a sum with step h and the integral.
func tweedieExcess(z, alpha, beta, h float64) float64 {
	return z / (alpha * beta) * (1 - math.Cos(math.Min(math.Pi, 2*math.Pi*beta/h)))
}

// tweedieStep returns the longest whole step whose sum differs from the integral by no more than exp(-nats) of it; 1,
// the series itself, where there is none.
func tweedieStep(z, alpha, beta, nats float64) float64 {
	cos := 1 - nats*alpha*beta/z
	if !(cos > -1) {
		return 1
	}
	return math.Max(1, math.Floor(2*math.Pi*beta/math.Acos(cos)))
}

// tweedieSum adds terms relative to the first one.
type tweedieSum struct {
	alpha, beta, a    float64
	lambda, logLambda float64
	first             float64 // log of the first term
	largest           float64 // log of the largest term so far
	total             float64
	size, working     float64 // sums of the terms times the derivatives of their logs
}

func newTweedieSum(logZ, alpha, beta float64) *tweedieSum {
	return &tweedieSum{
		alpha: alpha, beta: beta, a: alpha / beta,
		lambda: math.Exp(logZ) / alpha, logLambda: logZ - math.Log(alpha),
	}
}

// outwards sums from the term nearest lambda, where they are largest, up and then down in whole steps. The log of a term
// is concave in j, so that what follows a term too small to count is smaller still.
func (t *tweedieSum) outwards(step float64) tweedieH {
	start := math.Max(1, math.Round(t.lambda))
	for j := start; t.add(j); j += step {
	}
	for j := start - step; j >= 1 && t.add(j); j -= step {
	}
	return tweedieH{
		value:   0.5*math.Log(t.a) - math.Log(2*math.Pi) + t.first + math.Log(step*t.total),
		size:    t.size / (t.beta * t.total),
		working: t.working/t.total - 0.5,
	}
}

// add adds term j and reports whether it still counted.
func (t *tweedieSum) add(j float64) bool {
	deviance := halfPoissonDeviance(j, t.lambda, t.logLambda)
	portions, _ := stirlingRest(j)
	amount, slope := stirlingRest(t.a * j)
	log := -portions - amount - deviance/t.beta
	if t.total == 0 {
		t.first, t.largest = log, log
	}
	t.largest = math.Max(t.largest, log)
	term := math.Exp(log - t.first)
	t.total += term
	t.size += term * (j - t.lambda)
	t.working += term * (t.a*(j*slope+deviance) + (j - t.lambda))
	return log > t.largest-tweedieNats
}

// tweedieCorrections holds the polynomials in q = (power-1)(2-power) by which the powers 1/z, 1/z^2, ... enter log H.
// Laplace's method on the integral, in exact fractions; that they depend on q alone follows from the symmetry of the
// integral in j and a j. At q = 0 they are minus Stirling's, and the first is the usual correction of a saddlepoint
// density, kurtosis/8 - 5 skewness^2/24 = power (power-3)/(24 z).
var tweedieCorrections = [...][]float64{
	{-1. / 12, -1. / 24},
	{0, -1. / 24, -1. / 48},
	{1. / 360, -7. / 1440, -17. / 288, -161. / 5760},
	{0, 1. / 80, -17. / 720, -41. / 288, -367. / 5760},
	{-1. / 1260, 11. / 3360, 20687. / 362880, -4081. / 34560, -33667. / 69120, -120257. / 580608},
	{0, -5. / 504, 47. / 1120, 167. / 567, -11627. / 17280, -37303. / 17280, -39793. / 45360},
}

// tweedieSaddlepoint returns log H by the saddlepoint form with six corrections.
func tweedieSaddlepoint(logZ, alpha, beta float64) tweedieH {
	q, u := alpha*beta, math.Exp(-logZ)
	turn := q * (alpha - beta) // dq/dworking
	h := tweedieH{value: 0.5 * (logZ - math.Log(2*math.Pi)), size: 0.5}
	power := 1.0
	for k, polynomial := range tweedieCorrections {
		power *= u
		var value, slope float64
		for i := len(polynomial) - 1; i >= 0; i-- {
			slope = slope*q + value
			value = value*q + polynomial[i]
		}
		h.value += value * power
		h.size -= float64(k+1) * value * power
		h.working += slope * turn * power
	}
	return h
}

// halfPoissonDeviance returns x log(x/mean) - x + mean for x, mean > 0, without cancellation where they are close
// (Loader 2000, "Fast and accurate computation of binomial probabilities").
func halfPoissonDeviance(x, mean, logMean float64) float64 {
	difference := x - mean
	if math.Abs(difference) >= 0.1*(x+mean) {
		return x*(math.Log(x)-logMean) - difference
	}
	v := difference / (x + mean)
	sum, power := difference*v, 2*x*v
	for k := 3.0; ; k += 2 {
		power *= v * v
		next := sum + power/k
		if !(math.Abs(next-sum) > 0) { // so written that it ends at NaN too
			return next
		}
		sum = next
	}
}

// stirlingRest returns log gamma(x+1) - (x + 1/2) log x + x - log(2 pi)/2 and its slope, for x > 0.
func stirlingRest(x float64) (rest, slope float64) {
	if x < 15 {
		rest = lgamma(x+1) - (x+0.5)*math.Log(x) + x - 0.5*math.Log(2*math.Pi)
		return rest, stirlingRestSlope(x)
	}
	u := 1 / x
	v := u * u
	rest = u * (1./12 - v*(1./360-v*(1./1260-v*(1./1680-v*(1./1188)))))
	slope = -v * (1./12 - v*(3./360-v*(5./1260-v*(7./1680-v*(9./1188)))))
	return rest, slope
}

// stirlingRestSlope returns digamma(x) + 1/(2x) - log x for 0 < x < 15, by recurrence from above 15.
func stirlingRestSlope(x float64) float64 {
	sum, high := 0.5/x, x
	for ; high < 15; high++ {
		sum -= 1 / high
	}
	_, slope := stirlingRest(high)
	return sum + math.Log(high/x) - 0.5/high + slope
}

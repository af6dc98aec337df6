package response

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/distuv"
)

// Tweedie is the distribution of amounts with exact zeros, a Poisson number of gamma portions, with the log link:
// variance phi mean^Power / w, 1 < Power < 2. Its density has no closed form and is summed; see tweedieSum.
type Tweedie struct {
	Power float64
}

// tweedieEdge keeps the power this far from 1 and from 2.
const tweedieEdge = 0.01

func (Tweedie) Name() string                  { return "tweedie" }
func (Tweedie) Link() string                  { return "log" }
func (Tweedie) KnownDispersion() bool         { return false }
func (Tweedie) Curvature() Curvature          { return Observed }
func (Tweedie) ConstantWeight() bool          { return false }
func (Tweedie) Mean(eta float64) float64      { return math.Exp(eta) }
func (Tweedie) MeanSlope(eta float64) float64 { return math.Exp(eta) }
func (Tweedie) Linear(mean float64) float64   { return math.Log(mean) }

// Start returns the amount moved towards the overall mean, so that zeros have a logarithm.
func (Tweedie) Start(o Obs, overall float64) float64 { return (o.Y + overall) / 2 }

func (Tweedie) ShapeName() string { return "power" }
func (d Tweedie) Shape() float64  { return d.Power }

// Working returns the logit of Power - 1.
func (d Tweedie) Working() float64 { return math.Log((d.Power - 1) / (2 - d.Power)) }

// WithWorking returns the distribution whose power minus one has logit s.
func (d Tweedie) WithWorking(s float64) Shaped { return Tweedie{Power: 1 + 1/(1+math.Exp(-s))} }

// WithShape returns the distribution with another power. The error says what it may be.
func (Tweedie) WithShape(power float64) (Shaped, error) {
	if !(power >= 1+tweedieEdge && power <= 2-tweedieEdge) {
		return nil, fmt.Errorf("the power of a tweedie distribution is between %g and %g, not %g", 1+tweedieEdge, 2-tweedieEdge, power)
	}
	return Tweedie{Power: power}, nil
}

// Box returns the bounds that stand for powers of 1.01 and 1.99.
func (Tweedie) Box() (lo, hi float64) {
	hi = math.Log((1 - tweedieEdge) / tweedieEdge)
	return -hi, hi
}

// Simpler returns gamma for the upper bound. Nothing stands at the lower one: there amounts come in whole multiples of
// phi, which a poisson distribution of the amounts themselves is not.
func (Tweedie) Simpler(upper bool) string {
	if upper {
		return "gamma"
	}
	return ""
}

// exponents returns 2 - power and power - 1. Their product is dpower/dworking.
func (d Tweedie) exponents() (alpha, beta float64) { return 2 - d.Power, d.Power - 1 }

// parts returns y mean^(1-power) and mean^(2-power), whose difference is the score of a row of weight 1.
func (d Tweedie) parts(y, eta float64) (own, mean float64) {
	alpha, beta := d.exponents()
	mean = math.Exp(alpha * eta)
	if y > 0 {
		own = math.Exp(math.Log(y) - beta*eta)
	}
	return own, mean
}

// score returns (y - mean) mean^(1-power), to full relative precision where the mean is near y.
func (d Tweedie) score(y, eta float64) float64 {
	own, mean := d.parts(y, eta)
	if t := math.Log(y) - eta; math.Abs(t) < 1 {
		return mean * math.Expm1(t)
	}
	return own - mean
}

// At returns the contributions of o at eta. The observed weight is positive for every amount.
func (d Tweedie) At(o Obs, eta float64) Point {
	alpha, beta := d.exponents()
	own, mean := d.parts(o.Y, eta)
	w := o.Weight
	return Point{
		Deviance: w * d.unitDeviance(o.Y, eta), Score: w * d.score(o.Y, eta),
		Weight: w * (beta*own + alpha*mean), Slope: w * (alpha*alpha*mean - beta*beta*own),
		Expected: w * mean, ExpectedSlope: w * alpha * mean,
	}
}

// unitDeviance returns the deviance of a row of weight 1,
//
//	2 y^alpha (h(alpha t)/alpha + h(-beta t)/beta),  h(x) = exp(x) - 1 - x,  t = eta - log y,
//
// a form in which no term is negative, so nothing cancels at either end of the powers or near the mean.
func (d Tweedie) unitDeviance(y, eta float64) float64 {
	alpha, beta := d.exponents()
	switch {
	case math.IsInf(math.Exp(eta), 1):
		return math.Inf(1)
	case y == 0:
		return 2 * math.Exp(alpha*eta) / alpha
	}
	t := eta - math.Log(y)
	return 2 * math.Pow(y, alpha) * t * t * (alpha*expRest(alpha*t) + beta*expRest(-beta*t))
}

// ShapeAt returns the derivatives of At's fields in the logit of power - 1.
func (d Tweedie) ShapeAt(o Obs, eta float64) ShapePoint {
	alpha, beta := d.exponents()
	p := d.At(o, eta)
	return ShapePoint{
		Deviance: o.Weight * d.unitDevianceSlope(o.Y, eta),
		Score:    -alpha * beta * eta * p.Score,
		Weight:   alpha * beta * (p.Score - eta*p.Weight),
		Expected: -alpha * beta * eta * p.Expected,
	}
}

func (d Tweedie) unitDevianceSlope(y, eta float64) float64 {
	alpha, beta := d.exponents()
	if y == 0 {
		return 2 * beta * math.Exp(alpha*eta) * (1/alpha - eta)
	}
	log := math.Log(y)
	t := eta - log
	level := alpha*expRest(alpha*t) + beta*expRest(-beta*t)
	turn := expRestSlope(-beta*t) - expRestSlope(alpha*t)
	return 2 * alpha * beta * math.Pow(y, alpha) * t * t * (turn - log*level)
}

// Pearson returns w (y - mean)^2 / mean^power.
func (d Tweedie) Pearson(o Obs, eta float64) float64 {
	alpha, _ := d.exponents()
	if o.Y == 0 {
		return o.Weight * math.Exp(alpha*eta)
	}
	t := math.Log(o.Y) - eta
	log := t // log |y/mean - 1|, which is t to rounding where exp(t) would overflow
	if t < 40 {
		log = math.Log(math.Abs(math.Expm1(t)))
	}
	return o.Weight * math.Exp(alpha*eta+2*log)
}

// LogLikelihood returns the log density of a positive amount, or the log probability of a zero.
func (d Tweedie) LogLikelihood(o Obs, eta, phi float64) float64 {
	return d.Saturated(o, phi) - o.Weight*d.unitDeviance(o.Y, eta)/(2*phi)
}

// Saturated returns the log density of a positive amount at mean y, and 0 for a zero.
func (d Tweedie) Saturated(o Obs, phi float64) float64 {
	s, _, _ := d.SaturatedSlopes(o, phi)
	return s
}

// ScaleSlope returns dSaturated/dlog phi.
func (d Tweedie) ScaleSlope(o Obs, phi float64) float64 {
	_, scale, _ := d.SaturatedSlopes(o, phi)
	return scale
}

// SaturatedSlope returns dSaturated/dworking at fixed phi.
func (d Tweedie) SaturatedSlope(o Obs, phi float64) float64 {
	_, _, working := d.SaturatedSlopes(o, phi)
	return working
}

// SaturatedSlopes returns Saturated, ScaleSlope and SaturatedSlope from one sum, at the cost of each alone.
func (d Tweedie) SaturatedSlopes(o Obs, phi float64) (value, scale, working float64) {
	if o.Y == 0 {
		return 0, 0, 0
	}
	alpha, beta := d.exponents()
	log := math.Log(o.Y)
	s := tweedieLogH(math.Log(o.Weight/phi)+alpha*log, alpha, beta)
	return s.value - log, -s.size, s.working - alpha*beta*log*s.size
}

// CDF returns the distribution function: below and at zero it steps from 0 to the chance of no portion, above zero both
// values are equal.
func (d Tweedie) CDF(o Obs, eta, phi float64) (below, upTo float64) {
	alpha, _ := d.exponents()
	logSize := math.Log(o.Weight/phi) + alpha*eta
	none := math.Exp(-math.Exp(logSize) / alpha)
	if o.Y <= 0 {
		return 0, none
	}
	p := math.Min(1, math.Max(none, d.cdf(logSize, eta-math.Log(o.Y))))
	return p, p
}

// tweedieLarge is the gamma shape at the mean number of portions from which the distribution function is the tail
// formula's. There the two agree to 4e-10, and beyond it gonum's incomplete gamma function runs out of iterations.
const tweedieLarge = 1e6

// cdf returns P(Y <= y) for y > 0, with t = log(mean/y). The number of portions is Poisson with mean size/alpha, the
// sum of j portions is gamma with shape j alpha/beta. The sum goes outwards from where its terms are largest, with the
// step of tweedieStep halved because here the amounts below y count too.
func (d Tweedie) cdf(logSize, t float64) float64 {
	alpha, beta := d.exponents()
	size := math.Exp(logSize)
	if size/beta > tweedieLarge {
		return d.tail(size, t)
	}
	lambda, logLambda := size/alpha, logSize-math.Log(alpha)
	x := math.Exp(logSize-t) / beta
	step := tweedieStep(size*math.Min(1, math.Exp(-alpha*t)), alpha, beta, 4*tweedieNats)
	none := math.Exp(-lambda)
	sum := 0.0
	start := math.Max(1, math.Round(lambda*math.Min(1, math.Exp(-alpha*t))))
	add := func(j float64) bool {
		rest, _ := stirlingRest(j)
		term := math.Exp(-rest-halfPoissonDeviance(j, lambda, logLambda)) / math.Sqrt(2*math.Pi*j) *
			mathext.GammaIncReg(j*alpha/beta, x)
		sum += term
		return term > 1e-18*(none+sum)
	}
	for j := start; add(j); j += step {
	}
	for j := start - step; j >= 1 && add(j); j -= step {
	}
	return none + step*sum
}

// tail returns P(Y <= y) by the modified directed deviance of Barndorff-Nielsen (1986, Biometrika 73:307-322), of error
// O(size^-3/2).
func (d Tweedie) tail(size, t float64) float64 {
	alpha, beta := d.exponents()
	own := size * math.Exp(-alpha*t) // w y^(2-power)/phi
	level := alpha*expRest(alpha*t) + beta*expRest(-beta*t)
	r := -t * math.Sqrt(2*own*level)
	if !(math.Abs(r) < 40) {
		return distuv.UnitNormal.CDF(math.Copysign(40, -t))
	}
	correction := d.Power / (6 * math.Sqrt(size)) // the limit where y is the mean
	if math.Abs(t) > 1e-7 {
		u := math.Sqrt(own) * math.Expm1(-beta*t) / beta
		correction = math.Log(u/r) / r
	}
	return distuv.UnitNormal.CDF(r + correction)
}

// expRest returns (exp(x) - 1 - x)/x^2.
func expRest(x float64) float64 {
	if math.Abs(x) > 0.5 {
		return (math.Expm1(x) - x) / (x * x)
	}
	sum, term := 0.5, 0.5
	for k := 3.0; math.Abs(term) > 1e-17; k++ {
		term *= x / k
		sum += term
	}
	return sum
}

// expRestSlope returns ((x - 1) exp(x) + 1)/x^2, which is d(expRest(x) x)/dx.
func expRestSlope(x float64) float64 {
	if math.Abs(x) > 0.5 {
		return ((x-1)*math.Exp(x) + 1) / (x * x)
	}
	sum, term := 0.5, 0.5
	for k := 3.0; math.Abs(term) > 1e-17; k++ {
		term *= x / k
		sum += term * (k - 1)
	}
	return sum
}

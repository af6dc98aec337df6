package response

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// Gamma is the distribution of positive amounts whose standard deviation grows with the mean, with the log link: the
// variance is phi mu^2/w. Amounts are above zero.
type Gamma struct{}

func (Gamma) Name() string                  { return "gamma" }
func (Gamma) Link() string                  { return "log" }
func (Gamma) KnownDispersion() bool         { return false }
func (Gamma) Curvature() Curvature          { return Observed }
func (Gamma) ConstantWeight() bool          { return false }
func (Gamma) Mean(eta float64) float64      { return math.Exp(eta) }
func (Gamma) MeanSlope(eta float64) float64 { return math.Exp(eta) }
func (Gamma) Linear(mean float64) float64   { return math.Log(mean) }

// Start returns the amount moved towards the overall mean, since a very small one has a far-off logarithm.
func (Gamma) Start(o Obs, overall float64) float64 { return (o.Y + overall) / 2 }

// At returns the contributions of o at eta. The observed weight w y/mu is always positive.
func (Gamma) At(o Obs, eta float64) Point {
	ratio := o.Y * math.Exp(-eta)
	return Point{
		Deviance: 2 * o.Weight * gammaHalfDeviance(o.Y, eta), Score: o.Weight * (ratio - 1),
		Weight: o.Weight * ratio, Slope: -o.Weight * ratio, Expected: o.Weight,
	}
}

// gammaHalfDeviance returns y/mu - 1 - log(y/mu).
func gammaHalfDeviance(y, eta float64) float64 {
	if math.IsInf(math.Exp(eta), 1) {
		return math.Inf(1)
	}
	change := y*math.Exp(-eta) - 1
	if math.Abs(change) < 0.3 {
		return change * shortfall(change)
	}
	return change - (math.Log(y) - eta)
}

// Pearson returns w (y - mean)^2/mean^2.
func (Gamma) Pearson(o Obs, eta float64) float64 {
	change := o.Y*math.Exp(-eta) - 1
	return o.Weight * change * change
}

// LogLikelihood returns the log density at shape w/phi.
func (d Gamma) LogLikelihood(o Obs, eta, phi float64) float64 {
	return d.Saturated(o, phi) - o.Weight/phi*gammaHalfDeviance(o.Y, eta)
}

// Saturated returns the log density at mean y: k log k - k - log Gamma(k) - log y with k = w/phi.
func (Gamma) Saturated(o Obs, phi float64) float64 {
	k := o.Weight / phi
	return math.Log(k/(2*math.Pi))/2 - stirlingError(k) - math.Log(o.Y)
}

// ScaleSlope returns dSaturated/dlog phi = -k (log k - digamma(k)).
func (Gamma) ScaleSlope(o Obs, phi float64) float64 {
	k := o.Weight / phi
	if k > farRungs {
		return -0.5 - endSeries(&endOne, 1/k)
	}
	return -k * logLessDigamma(k)
}

// logLessDigamma returns log k - digamma(k), k > 0, by recurrence up to where Stirling's series holds (Abramowitz & Stegun
// 1964, 6.3.6 and 6.3.18).
func logLessDigamma(k float64) float64 {
	far, sum := k, 0.0
	for ; far < farRungs; far++ {
		sum += 1 / far
	}
	return math.Log(k/far) + sum + (0.5+endSeries(&endOne, 1/far))/far
}

// CDF returns the distribution function twice, by the incomplete gamma function.
func (Gamma) CDF(o Obs, eta, phi float64) (below, upTo float64) {
	k := o.Weight / phi
	p := 1.0
	if x := k * o.Y * math.Exp(-eta); !math.IsInf(x, 1) {
		p = mathext.GammaIncReg(k, x)
	}
	return p, p
}

package response

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// Gaussian is the normal distribution with the identity link: variance phi/w.
type Gaussian struct{}

func (Gaussian) Name() string             { return "gaussian" }
func (Gaussian) Link() string             { return "identity" }
func (Gaussian) KnownDispersion() bool    { return false }
func (Gaussian) Curvature() Curvature     { return Observed }
func (Gaussian) ConstantWeight() bool     { return true }
func (Gaussian) Mean(eta float64) float64 { return eta }

// MeanSlope returns 1.
func (Gaussian) MeanSlope(float64) float64 { return 1 }

// Linear returns the mean itself.
func (Gaussian) Linear(mean float64) float64 { return mean }

// Start returns the overall mean: one step of least squares leads from anywhere to the answer.
func (Gaussian) Start(_ Obs, overall float64) float64 { return overall }

// At returns the contributions of o at eta.
func (Gaussian) At(o Obs, eta float64) Point {
	r := o.Y - eta
	return Point{Deviance: o.Weight * r * r, Score: o.Weight * r, Weight: o.Weight, Expected: o.Weight}
}

// Pearson returns w (y - mean)^2.
func (Gaussian) Pearson(o Obs, eta float64) float64 { return o.Weight * (o.Y - eta) * (o.Y - eta) }

// LogLikelihood returns the log density at variance phi/w.
func (g Gaussian) LogLikelihood(o Obs, eta, phi float64) float64 {
	return gaussianLog(o, eta, phi)
}

// Saturated returns the log density at its top.
func (g Gaussian) Saturated(o Obs, phi float64) float64 { return gaussianLog(o, o.Y, phi) }

// CDF returns the normal distribution function twice.
func (g Gaussian) CDF(o Obs, eta, phi float64) (below, upTo float64) {
	return gaussianCDF(o, eta, phi)
}

// GaussianLog is the normal distribution with the log link: effects multiply, errors add. Its restricted likelihood
// takes the expected weights, since observed ones turn negative where y exceeds twice the mean.
type GaussianLog struct{}

func (GaussianLog) Name() string                  { return "gaussian" }
func (GaussianLog) Link() string                  { return "log" }
func (GaussianLog) KnownDispersion() bool         { return false }
func (GaussianLog) Curvature() Curvature          { return Expected }
func (GaussianLog) ConstantWeight() bool          { return false }
func (GaussianLog) Mean(eta float64) float64      { return math.Exp(eta) }
func (GaussianLog) MeanSlope(eta float64) float64 { return math.Exp(eta) }
func (GaussianLog) Linear(mean float64) float64   { return math.Log(mean) }

// Start returns the observation pulled up to at least a tenth of the overall mean, since it may be negative.
func (GaussianLog) Start(o Obs, overall float64) float64 { return math.Max(o.Y, overall/10) }

// At returns the contributions of o at eta.
func (GaussianLog) At(o Obs, eta float64) Point {
	mu := math.Exp(eta)
	r := o.Y - mu
	w := o.Weight
	return Point{
		Deviance: w * r * r, Score: w * r * mu,
		Weight: w * mu * (2*mu - o.Y), Slope: w * mu * (4*mu - o.Y),
		Expected: w * mu * mu, ExpectedSlope: 2 * w * mu * mu,
	}
}

// Pearson returns w (y - mean)^2.
func (GaussianLog) Pearson(o Obs, eta float64) float64 {
	r := o.Y - math.Exp(eta)
	return o.Weight * r * r
}

// LogLikelihood returns the log density at variance phi/w.
func (GaussianLog) LogLikelihood(o Obs, eta, phi float64) float64 {
	return gaussianLog(o, math.Exp(eta), phi)
}

// Saturated returns the log density at its top.
func (GaussianLog) Saturated(o Obs, phi float64) float64 { return gaussianLog(o, o.Y, phi) }

// CDF returns the normal distribution function twice.
func (GaussianLog) CDF(o Obs, eta, phi float64) (below, upTo float64) {
	return gaussianCDF(o, math.Exp(eta), phi)
}

func gaussianLog(o Obs, mean, phi float64) float64 {
	v := phi / o.Weight
	return -0.5 * (math.Log(2*math.Pi*v) + (o.Y-mean)*(o.Y-mean)/v)
}

func gaussianCDF(o Obs, mean, phi float64) (below, upTo float64) {
	p := distuv.UnitNormal.CDF((o.Y - mean) / math.Sqrt(phi/o.Weight))
	return p, p
}

// ScaleSlope returns -1/2.
func (Gaussian) ScaleSlope(Obs, float64) float64 { return -0.5 }

// ScaleSlope returns -1/2.
func (GaussianLog) ScaleSlope(Obs, float64) float64 { return -0.5 }

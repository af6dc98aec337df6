package response

import "math"

// BinomialCloglog is the distribution of the number positive among trials with the complementary log-log link:
// p = 1 - exp(-exp(eta)), the chance of at least one event where events are poisson with mean exp(eta). The link is not
// the binomial's own, so observed and expected weights differ.
type BinomialCloglog struct{}

func (BinomialCloglog) Name() string          { return "binomial" }
func (BinomialCloglog) Link() string          { return "complementary-log-log" }
func (BinomialCloglog) KnownDispersion() bool { return true }
func (BinomialCloglog) Curvature() Curvature  { return Observed }
func (BinomialCloglog) ConstantWeight() bool  { return false }

// Mean returns the probability 1 - exp(-exp(eta)).
func (BinomialCloglog) Mean(eta float64) float64 { return -math.Expm1(-math.Exp(eta)) }

// MeanSlope returns exp(eta - exp(eta)).
func (BinomialCloglog) MeanSlope(eta float64) float64 { return math.Exp(eta - math.Exp(eta)) }

// Linear returns log(-log(1 - p)).
func (BinomialCloglog) Linear(p float64) float64 { return math.Log(-math.Log1p(-p)) }

// Start returns the row's share of positives moved towards the overall one.
func (BinomialCloglog) Start(o Obs, overall float64) float64 { return Binomial{}.Start(o, overall) }

// At returns the contributions of o at eta. With mu = exp(eta), g = mu/(exp(mu) - 1) and c = mu + g - 1, dg/deta = -g c;
// the score is y g - (m - y) mu and the weight, minus its derivative, y g c + (m - y) mu. It is never negative.
func (d BinomialCloglog) At(o Obs, eta float64) Point {
	mu := math.Exp(eta)
	m, y := o.Trials, o.Y
	var negative float64 // (m - y) mu, where not 0 times infinity
	if y < m {
		negative = (m - y) * mu
	}
	point := Point{Deviance: d.deviance(o, eta), Score: -o.Weight * negative, Weight: o.Weight * negative, Slope: o.Weight * negative}
	if mu > 700 { // g is below 1e-300
		return point
	}
	g, c := cloglogTerms(mu)
	point.Score += o.Weight * y * g
	point.Weight += o.Weight * y * g * c
	point.Slope += o.Weight * y * g * (mu - c*(c+g))
	point.Expected = o.Weight * m * mu * g
	point.ExpectedSlope = o.Weight * m * mu * g * (1 - c)
	return point
}

// cloglogTerms returns g = mu/(exp(mu) - 1) and c = mu + g - 1, about mu/2 for small mu. The series is that of
// h coth h - 1 with h = mu/2 (Abramowitz & Stegun 1964, 4.5.67).
func cloglogTerms(mu float64) (g, c float64) {
	if mu == 0 {
		return 1, 0
	}
	g = mu / math.Expm1(mu)
	if mu > 0.5 {
		return g, mu + g - 1
	}
	x := mu * mu
	return g, mu/2 + x*(1./12+x*(-1./720+x*(1./30240+x*(-1./1209600+x*(1./47900160+x*(-691./1307674368000+x/74724249600))))))
}

// logShare returns log p and log(1 - p), finite as long as exp(eta) is.
func (BinomialCloglog) logShare(eta float64) (logP, logQ float64) {
	mu := math.Exp(eta)
	switch {
	case mu < 1e-8:
		return eta - mu/2, -mu
	case mu < 1:
		return math.Log(-math.Expm1(-mu)), -mu
	}
	return math.Log1p(-math.Exp(-mu)), -mu
}

func (d BinomialCloglog) deviance(o Obs, eta float64) (dev float64) {
	logP, logQ := d.logShare(eta)
	own, rest := o.Y/o.Trials, (o.Trials-o.Y)/o.Trials
	logOwn, logRest := math.Log(own), math.Log1p(-own)
	if own > 0.5 {
		logOwn, logRest = math.Log1p(-rest), math.Log(rest)
	}
	if own > 0 {
		dev += o.Y * (logOwn - logP)
	}
	if rest > 0 {
		dev += (o.Trials - o.Y) * (logRest - logQ)
	}
	return 2 * o.Weight * math.Max(0, dev)
}

// logit returns log(p/(1 - p)), where the binomial with its own link has the same probability.
func (d BinomialCloglog) logit(eta float64) float64 {
	logP, logQ := d.logShare(eta)
	return logP - logQ
}

// Pearson returns w (y - m p)^2 / (m p q).
func (d BinomialCloglog) Pearson(o Obs, eta float64) float64 {
	return Binomial{}.Pearson(o, d.logit(eta))
}

// LogLikelihood returns w times the log probability of the number positive.
func (d BinomialCloglog) LogLikelihood(o Obs, eta, _ float64) float64 {
	logP, logQ := d.logShare(eta)
	l := logChoose(o.Trials, o.Y)
	if o.Y > 0 {
		l += o.Y * logP
	}
	if o.Y < o.Trials {
		l += (o.Trials - o.Y) * logQ
	}
	return o.Weight * l
}

// Saturated returns w times the log probability of the number positive at p = y/m.
func (BinomialCloglog) Saturated(o Obs, phi float64) float64 { return Binomial{}.Saturated(o, phi) }

// CDF returns the distribution function below and at the number positive.
func (d BinomialCloglog) CDF(o Obs, eta, phi float64) (below, upTo float64) {
	return Binomial{}.CDF(o, d.logit(eta), phi)
}

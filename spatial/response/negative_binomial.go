package response

import (
	"fmt"
	"math"
)

// NegativeBinomial is the distribution of counts that vary more than poisson ones, with the log link: the variance is
// mu + mu^2/theta. Nothing in it is a difference of gamma functions, so that it goes over into the poisson one to rounding as
// theta grows. Counts are whole numbers.
type NegativeBinomial struct {
	Theta float64 // positive and finite; the larger, the nearer to poisson
}

// The search for theta ends at these; at the upper one the variance of a count of a thousand is a ten-thousandth above
// the poisson one.
const (
	leastTheta = 1e-3
	mostTheta  = 1e7
)

func (NegativeBinomial) Name() string                  { return "negative-binomial" }
func (NegativeBinomial) Link() string                  { return "log" }
func (NegativeBinomial) KnownDispersion() bool         { return true }
func (NegativeBinomial) Curvature() Curvature          { return Observed }
func (NegativeBinomial) ConstantWeight() bool          { return false }
func (NegativeBinomial) Mean(eta float64) float64      { return math.Exp(eta) }
func (NegativeBinomial) MeanSlope(eta float64) float64 { return math.Exp(eta) }
func (NegativeBinomial) Linear(mean float64) float64   { return math.Log(mean) }

// ShapeName returns "theta".
func (NegativeBinomial) ShapeName() string { return "theta" }

// Shape returns theta.
func (d NegativeBinomial) Shape() float64 { return d.Theta }

// Working returns log theta.
func (d NegativeBinomial) Working() float64 { return math.Log(d.Theta) }

// WithWorking returns the distribution with theta = exp(s).
func (NegativeBinomial) WithWorking(s float64) Shaped { return NegativeBinomial{Theta: math.Exp(s)} }

// WithShape returns the distribution with another theta. The error says what theta may be.
func (NegativeBinomial) WithShape(theta float64) (Shaped, error) {
	if !(theta >= leastTheta && theta <= mostTheta) {
		return nil, fmt.Errorf("theta of a negative-binomial distribution is between %g and %g, not %g", leastTheta, mostTheta, theta)
	}
	return NegativeBinomial{Theta: theta}, nil
}

// Box returns the bounds of log theta.
func (NegativeBinomial) Box() (lo, hi float64) { return math.Log(leastTheta), math.Log(mostTheta) }

// Simpler returns "poisson" for the upper bound.
func (NegativeBinomial) Simpler(upper bool) string {
	if upper {
		return "poisson"
	}
	return ""
}

// Start returns the count moved towards the overall mean, so that zeros have a logarithm.
func (NegativeBinomial) Start(o Obs, overall float64) float64 { return (o.Y + overall) / 2 }

// nbParts holds what everything below is made of. With t = 1/theta and x = t mu: r = 1/(1+x), s = x/(1+x), information =
// mu r, the expected weight, and logRise = log(1+x). None overflows, whatever eta.
type nbParts struct{ mu, t, x, r, s, information, logRise float64 }

func (d NegativeBinomial) parts(eta float64) (n nbParts) {
	n.mu, n.t = math.Exp(eta), 1/d.Theta
	n.x = n.t * n.mu
	if n.x <= 1 {
		n.r = 1 / (1 + n.x)
		n.s, n.information, n.logRise = n.x*n.r, n.mu*n.r, math.Log1p(n.x)
		return n
	}
	inverse := d.Theta * math.Exp(-eta)
	n.s = 1 / (1 + inverse)
	n.r, n.information = inverse*n.s, d.Theta*n.s
	n.logRise = eta - math.Log(d.Theta) + math.Log1p(inverse)
	return n
}

// At returns the contributions of o at eta. The observed weight mu (1 + t y)/(1 + t mu)^2 is always positive.
func (d NegativeBinomial) At(o Obs, eta float64) Point {
	n := d.parts(eta)
	weight := o.Weight * n.information * n.r * (1 + n.t*o.Y)
	return Point{
		Deviance: 2 * o.Weight * d.halfDeviance(o.Y, eta, n), Score: o.Weight * (o.Y*n.r - n.information),
		Weight: weight, Slope: weight * (n.r - n.s),
		Expected: o.Weight * n.information, ExpectedSlope: o.Weight * n.information * n.r,
	}
}

// halfDeviance returns y log(y/mu) - (y + theta) log((y + theta)/(mu + theta)), by whichever of four forms does not make it
// a difference of larger terms: where the count and its mean exceed theta it is
// theta log(mu/y) - (y + theta) log((1 + theta/y)/(1 + theta/mu)), and near y = mu both lose their linear parts.
func (d NegativeBinomial) halfDeviance(y, eta float64, n nbParts) float64 {
	off := y - n.mu
	near := math.Abs(off) < n.mu/2
	switch {
	case math.IsInf(n.mu, 1):
		return math.Inf(1)
	case y == 0:
		return d.Theta * n.logRise
	case n.x >= 1 && n.t*y >= 0.5:
		a := -off / y // mu/y = 1 + a
		b := a * n.r  // (1 + theta/y)/(1 + theta/mu) = 1 + b
		if near {
			return math.Max(0, d.Theta*(a*a*n.t*y*n.r-a*shortfall(a)+(1+n.t*y)*b*shortfall(b)))
		}
		return d.Theta*(eta-math.Log(y)) - (y+d.Theta)*math.Log1p(b)
	case near:
		return math.Max(0, off*(excess(off/n.mu)-excess(n.t*off*n.r)))
	}
	return y*(math.Log(y)-eta) - (y+d.Theta)*d.logRatio(y, n)
}

// logRatio returns log((y + theta)/(mu + theta)).
func (d NegativeBinomial) logRatio(y float64, n nbParts) float64 {
	if change := n.t * (y - n.mu) * n.r; change > -0.5 {
		return math.Log1p(change)
	}
	return math.Log1p(n.t*y) - n.logRise
}

// ShapeAt returns the derivatives in log theta.
func (d NegativeBinomial) ShapeAt(o Obs, eta float64) ShapePoint {
	n := d.parts(eta)
	return ShapePoint{
		Deviance: 2 * o.Weight * (d.slope(o.Y, n, 0) - d.slope(o.Y, d.ownMean(o.Y), 0)),
		Score:    o.Weight * (o.Y*n.r - n.information) * n.s,
		Weight:   o.Weight * n.information * n.r * (2*n.s*(1+n.t*o.Y) - n.t*o.Y),
		Expected: o.Weight * n.information * n.s,
	}
}

// slope returns minus the derivative of the log-likelihood in log theta, of which rise is the part that does not depend
// on the mean.
func (d NegativeBinomial) slope(y float64, n nbParts, rise float64) float64 {
	tail := d.Theta * (n.logRise - n.s)
	if n.x < 0.5 {
		tail = d.Theta * lag(n.x)
	}
	return rise - y*n.s + tail
}

// ownMean returns the parts at mean y.
func (d NegativeBinomial) ownMean(y float64) nbParts { return d.parts(math.Log(y)) }

// SaturatedSlope returns dSaturated/dlog theta.
func (d NegativeBinomial) SaturatedSlope(o Obs, _ float64) float64 {
	return -o.Weight * d.slope(o.Y, d.ownMean(o.Y), ladder(1/d.Theta, o.Y).rise)
}

// Pearson returns w (y - mu)^2/(mu + mu^2/theta), and 0 for a zero count where the mean underflows.
func (d NegativeBinomial) Pearson(o Obs, eta float64) float64 {
	n := d.parts(eta)
	if n.mu == o.Y {
		return 0
	}
	relative := -1.0
	if o.Y > 0 {
		relative = o.Y*math.Exp(-eta) - 1
	}
	return o.Weight * (o.Y*n.r - n.information) * relative
}

// LogLikelihood returns w times the log probability of the count.
func (d NegativeBinomial) LogLikelihood(o Obs, eta, _ float64) float64 {
	return o.Weight * d.logProbability(o.Y, eta)
}

// logProbability is the saturated one less half the deviance, so that nothing cancels for large counts.
func (d NegativeBinomial) logProbability(y, eta float64) float64 {
	return d.logTop(y) - d.halfDeviance(y, eta, d.parts(eta))
}

// Saturated returns w times the log probability of the count at mean y.
func (d NegativeBinomial) Saturated(o Obs, _ float64) float64 { return o.Weight * d.logTop(o.Y) }

// logTop returns the log probability of a count at its own mean, with gamma functions written by Stirling's formula, whose
// large terms are gone: -1/2 log(2 pi y (1 + t y)) + error(y + theta) - error(theta) - error(y), after Loader (2000), "Fast
// and accurate computation of binomial probabilities".
func (d NegativeBinomial) logTop(y float64) float64 {
	if y == 0 {
		return 0
	}
	return stirlingError(y+d.Theta) - stirlingError(d.Theta) - stirlingError(y) - (math.Log(2*math.Pi*y)+math.Log1p(y/d.Theta))/2
}

// leastProbability ends sums of probabilities: nearer to 0 numbers lose digits, and the last of them no longer shrinks when
// multiplied by a factor just below 1.
const leastProbability = 1e-306

// CDF returns the distribution function below and at the count: the probabilities on the side away from the mean are
// added one by one, or where these would be very many from the series of the incomplete beta function.
func (d NegativeBinomial) CDF(o Obs, eta, _ float64) (below, upTo float64) {
	n := d.parts(eta)
	y := o.Y
	own := math.Exp(d.logProbability(y, eta))
	if math.Sqrt(n.mu)+n.x > 1e4 {
		return d.farCDF(y, n, own)
	}
	rest, p := 0.0, own
	if y < n.mu {
		for k := y; k > 0 && p > 1e-18*rest+leastProbability; k-- {
			p *= k / (n.information * (1 + n.t*(k-1)))
			rest += p
		}
		return fromBelow(rest, own)
	}
	for k := y; p > 1e-18*rest+leastProbability; k++ {
		p *= n.information * (1 + n.t*k) / (k + 1)
		rest += p
	}
	return fromAbove(rest, own)
}

// farCDF returns the distribution function from the probability of the count itself: P(Y <= y) is the incomplete beta
// function I_r(theta, y+1), which is that probability times s (y + theta)/theta times a hypergeometric series of positive
// terms (DLMF 8.17.8). Far above the mean, where the probability underflows, it is 1.
func (d NegativeBinomial) farCDF(y float64, n nbParts, own float64) (below, upTo float64) {
	if y > n.mu && own < leastProbability {
		return 1, 1
	}
	sum, term := 1.0, 1.0
	for k := 1.0; ; k++ {
		ratio := (y + d.Theta + k) * n.r / (d.Theta + k)
		term *= ratio
		sum += term
		if ratio < 1 && term <= 1e-17*sum*(1-ratio) {
			break
		}
	}
	upTo = math.Min(1, own*n.s*(1+y/d.Theta)*sum)
	return math.Max(0, upTo-own), upTo
}

package response

import (
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/stat/distuv"
)

// Sampler is a distribution that responses can be drawn from.
type Sampler interface {
	Distribution
	// Draw returns a response at linear predictor eta, offset included: its mean is the distribution's, times o.Trials,
	// its variance the distribution's own times phi/o.Weight. Where the dispersion is known phi is 1, or what scales the
	// variance. o.Y is not looked at. phi is positive and finite.
	//
	// With phi/o.Weight other than 1 there is no poisson, binomial, negative-binomial or beta-binomial variable with that
	// variance. What is wider than a poisson or binomial variable is a negative-binomial count or a beta-binomial number of
	// the mean and variance asked for. What is narrower is a mean of several poisson counts, or the share of a larger number
	// of trials (the nearest whole number of them), and so no whole number, which these two do not need. The
	// negative-binomial and the beta-binomial do: they round up or down at random, which keeps the mean and adds at most 1/4
	// to the variance. A variance beyond that of rows with all or no trials positive cannot be had, and gives such rows.
	Draw(random *rand.Rand, o Obs, eta, phi float64) float64
}

var (
	_ Sampler = Gaussian{}
	_ Sampler = GaussianLog{}
	_ Sampler = Poisson{}
	_ Sampler = NegativeBinomial{}
	_ Sampler = Binomial{}
	_ Sampler = BinomialCloglog{}
	_ Sampler = BetaBinomial{}
	_ Sampler = Gamma{}
	_ Sampler = Tweedie{}
)

// Draw returns a normal variable with variance phi/w.
func (Gaussian) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	return eta + math.Sqrt(phi/o.Weight)*random.NormFloat64()
}

// Draw returns a normal variable with variance phi/w, which may be negative.
func (GaussianLog) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	return math.Exp(eta) + math.Sqrt(phi/o.Weight)*random.NormFloat64()
}

// Draw returns a count with variance phi mu/w; see Sampler for what it is unless phi/w is 1.
func (Poisson) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	return drawCount(random, math.Exp(eta), phi/o.Weight)
}

// Draw returns a count with variance phi (mu + mu^2/theta)/w; see Sampler for what it is unless phi/w is 1.
func (d NegativeBinomial) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	mean := math.Exp(eta)
	return drawWhole(random, drawCount(random, mean, phi*(1+mean/d.Theta)/o.Weight))
}

// Draw returns a number positive with variance phi m p q/w; see Sampler for what it is unless phi/w is 1.
func (Binomial) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	p, q := logistic(eta)
	return drawPositives(random, o.Trials, p, q, phi/o.Weight)
}

// Draw returns a number positive with variance phi m p q/w; see Sampler for what it is unless phi/w is 1.
func (d BinomialCloglog) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	return drawPositives(random, o.Trials, d.Mean(eta), math.Exp(-math.Exp(eta)), phi/o.Weight)
}

// Draw returns a number positive with variance phi m p q (1 + (m-1) rho)/w; see Sampler for what it is unless phi/w is 1.
func (d BetaBinomial) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	p, q := logistic(eta)
	return drawWhole(random, drawPositives(random, o.Trials, p, q, phi*(1+(o.Trials-1)*d.Correlation)/o.Weight))
}

// Draw returns a gamma variable of shape w/phi. One that would round to 0, which the distribution does not have, is the
// least number above it.
func (Gamma) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	k := o.Weight / phi
	return math.Max(math.Exp(eta+drawLogGamma(random, k)-math.Log(k)), math.SmallestNonzeroFloat64)
}

// Draw returns the sum of a poisson number of gamma portions, of mean w mu^(2-p)/(phi (2-p)), shape (2-p)/(p-1) and scale
// phi (p-1) mu^(p-1)/w (Dunn & Smyth 2005, Stat. Comput. 15:267-280). The sum of n portions is itself gamma.
func (d Tweedie) Draw(random *rand.Rand, o Obs, eta, phi float64) float64 {
	alpha, beta := d.exponents()
	logScale := math.Log(phi / o.Weight)
	portions := drawPoisson(random, math.Exp(alpha*eta-logScale)/alpha)
	if portions == 0 {
		return 0
	}
	log := drawLogGamma(random, portions*alpha/beta) + logScale + math.Log(beta) + beta*eta
	return math.Max(math.Exp(log), math.SmallestNonzeroFloat64)
}

// drawCount returns a count with the given mean and variance factor times as large.
func drawCount(random *rand.Rand, mean, factor float64) float64 {
	if factor > 1 { // a poisson count whose mean is gamma with shape theta = mean/(factor-1) and scale factor-1
		scale := factor - 1
		return drawPoisson(random, math.Exp(drawLogGamma(random, mean/scale)+math.Log(scale)))
	}
	return drawPoisson(random, mean/factor) * factor
}

// drawPositives returns a number positive of m trials with mean m p, q = 1 - p, and variance m p q factor.
func drawPositives(random *rand.Rand, m, p, q, factor float64) float64 {
	n := math.Max(1, math.Round(m/math.Min(factor, 1)))
	if factor > 1 && m > 1 {
		p, q = drawShare(random, p, q, (factor-1)/(m-1))
	}
	y := drawBinomial(random, n, p, q)
	if n == m {
		return y
	}
	return y / n * m
}

// drawWhole rounds y up or down at random, with mean y.
func drawWhole(random *rand.Rand, y float64) float64 {
	whole := math.Floor(y)
	if y != whole && random.Float64() < y-whole {
		return whole + 1
	}
	return whole
}

// drawShare returns a beta variable with mean p, q = 1 - p, and variance p q rho, with its complement: the ratio of two
// gamma variables, as logarithms since both may underflow.
func drawShare(random *rand.Rand, p, q, rho float64) (share, rest float64) {
	if rho >= 1 || p == 0 || q == 0 {
		if random.Float64() < p {
			return 1, 0
		}
		return 0, 1
	}
	sum := (1 - rho) / rho
	return logistic(drawLogGamma(random, p*sum) - drawLogGamma(random, q*sum))
}

// drawLogGamma returns the logarithm of a gamma variable with shape k >= 0 and scale 1. Where the variable itself might
// underflow that is log G(k+1) + log(U)/k, U uniform (Marsaglia & Tsang 2000, ACM Trans. Math. Softw. 26:363-372).
func drawLogGamma(random *rand.Rand, k float64) float64 {
	switch {
	case math.IsNaN(k):
		return k
	case k < 1:
		return drawLogGamma(random, k+1) - random.ExpFloat64()/k
	}
	return math.Log(distuv.Gamma{Alpha: k, Beta: 1, Src: random}.Rand())
}

const (
	countOneByOne = 10   // up to this mean, draws count events
	countNormal   = 1e15 // beyond this mean, where whole numbers are about as close as numbers are, they are rounded normal ones
)

// drawPoisson returns a poisson count: one by one for small means, else by transformed rejection, algorithm PTRS of
// Hormann (1993, Insur. Math. Econ. 12:39-45), with probabilities in a form that does not cancel for large means.
func drawPoisson(random *rand.Rand, mean float64) float64 {
	switch {
	case mean < countOneByOne:
		n := 0.0
		for t := random.ExpFloat64(); t < mean; t += random.ExpFloat64() {
			n++
		}
		return n
	case !(mean < countNormal):
		return math.Round(mean + math.Sqrt(mean)*random.NormFloat64())
	}
	logMean := math.Log(mean)
	b := 0.931 + 2.53*math.Sqrt(mean)
	a := -0.059 + 0.02483*b
	inverse := 1.1239 + 1.1328/(b-3.4)
	sure := 0.9277 - 3.6224/(b-2)
	for {
		u, v := random.Float64()-0.5, random.Float64()
		us := 0.5 - math.Abs(u)
		k := math.Floor((2*a/us+b)*u + mean + 0.43)
		if us >= 0.07 && v <= sure {
			return k
		}
		if k < 0 || us < 0.013 && v > us {
			continue
		}
		if math.Log(v*inverse/(a/(us*us)+b)) <= logPoisson(k, mean, logMean) {
			return k
		}
	}
}

// logPoisson returns the log probability of count k, by Stirling's formula with its error (Loader 2000).
func logPoisson(k, mean, logMean float64) float64 {
	if k == 0 {
		return -mean
	}
	rest, _ := stirlingRest(k)
	return -halfPoissonDeviance(k, mean, logMean) - rest - math.Log(2*math.Pi*k)/2
}

// drawBinomial returns the number positive of n trials, n a whole number, p + q = 1: by inversion where it is small, BINV
// of Kachitvichyanukul & Schmeiser (1988, Commun. ACM 31:216-222), else by transformed rejection, BTRS of Hormann (1993,
// J. Stat. Comput. Simul. 46:101-110).
func drawBinomial(random *rand.Rand, n, p, q float64) float64 {
	switch {
	case math.IsNaN(n * p):
		return math.NaN()
	case p > q:
		return n - drawBinomial(random, n, q, p)
	case n*p < countOneByOne:
		return invertBinomial(random, n, p, q)
	}
	spread := math.Sqrt(n * p * q)
	b := 1.15 + 2.53*spread
	a := -0.0873 + 0.0248*b + 0.01*p
	c := n*p + 0.5
	alpha := (2.83 + 5.1/b) * spread
	sure := 0.92 - 4.2/b
	top := logBinomial(math.Floor((n+1)*p), n, p, q)
	for {
		u, v := random.Float64()-0.5, random.Float64()
		us := 0.5 - math.Abs(u)
		k := math.Floor((2*a/us+b)*u + c)
		if us >= 0.07 && v <= sure {
			return k
		}
		if k < 0 || k > n {
			continue
		}
		if math.Log(v*alpha/(a/(us*us)+b)) <= logBinomial(k, n, p, q)-top {
			return k
		}
	}
}

// invertBinomial goes up from 0 until the distribution function passes a uniform number. A number that rounding keeps it
// from passing is drawn anew.
func invertBinomial(random *rand.Rand, n, p, q float64) float64 {
	none, odds := math.Exp(n*math.Log1p(-p)), p/q
	for {
		u, chance := random.Float64(), none
		for k := 0.0; k <= n && (chance > 0 || k == 0); k++ {
			if u < chance {
				return k
			}
			u -= chance
			chance *= odds * (n - k) / (k + 1)
		}
	}
}

// logBinomial returns the log probability of k positive among n trials, as logPoisson does.
func logBinomial(k, n, p, q float64) float64 {
	switch k {
	case 0:
		return n * math.Log1p(-p)
	case n:
		return n * math.Log(p)
	}
	all, _ := stirlingRest(n)
	yes, _ := stirlingRest(k)
	no, _ := stirlingRest(n - k)
	return all - yes - no - halfPoissonDeviance(k, n*p, math.Log(n*p)) - halfPoissonDeviance(n-k, n*q, math.Log(n*q)) -
		math.Log(2*math.Pi*k*((n-k)/n))/2
}

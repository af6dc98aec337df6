package rates

import "math"

const unit = 1.0 / (1 << 53)

// logLowerGamma is the logarithm of the lower tail of the gamma distribution of a shape at x, by the series DLMF 8.7.1
// times exp(-x), whose terms are positive. It takes of the order of the square root of shape many up to x = shape.
func logLowerGamma(shape, x float64) float64 {
	sum, term := 1.0, 1.0
	for k := shape + 1; term > unit*sum; k++ {
		term *= x / k
		sum += term
	}
	return logGammaTerm(shape, x) + math.Log(sum)
}

// logUpperGamma is the logarithm of the upper tail, for x > shape-1, by the continued fraction DLMF 8.9.2, contracted.
func logUpperGamma(shape, x float64) float64 {
	sum := fraction(x+1-shape, func(i float64) (num, den float64) { return i * (shape - i), x + 2*i + 1 - shape })
	return logGammaTerm(shape, x) + math.Log(shape/sum)
}

// logGammaTerm is the logarithm of x^shape exp(-x) / Gamma(shape+1): for a whole shape, the Poisson probability of it.
// Set apart as by Loader 2000 ("Fast and accurate computation of binomial probabilities"), so that nothing large
// cancels: the rest of Stirling's formula, and the deviance.
func logGammaTerm(shape, x float64) float64 {
	return -stirlingRest(shape) - deviance(shape, x) - math.Log(2*math.Pi*shape)/2
}

// logLowerBeta is the logarithm of the lower tail of a beta distribution at x, rest being 1-x, by the continued fraction
// of DiDonato & Morris 1992, ACM Trans. Math. Softw. 18:360-373 (section 4; the even part of DLMF 8.17.22), which takes
// both x and rest, so that nothing cancels near 1 either.
func logLowerBeta(a, b, x, rest float64) float64 {
	short := a - (a+b)*x // of the mean, times a+b
	if x > rest {
		short = (a+b)*rest - b
	}
	if short < 0 {
		// Beyond the mean the fraction of the other tail is the one that converges fast.
		return math.Log1p(-math.Exp(logLowerBeta(b, a, rest, x)))
	}
	sum := fraction(a*(short+1)/(a+1), func(m float64) (num, den float64) {
		before, after := a+2*m-1, a+2*m+1
		num = (a + m - 1) / before * ((a + b + m - 1) / before) * m * (b - m) * x * x
		return num, m + m*(b-m)*x/before + (a+m)/after*(short+1+m*(1+rest))
	})
	return logBetaTerm(a, b, x, rest) - math.Log(sum)
}

// logBetaTerm is the logarithm of x^a rest^b / B(a, b), set apart as in logGammaTerm.
func logBetaTerm(a, b, x, rest float64) float64 {
	n := a + b
	return stirlingRest(n) - stirlingRest(a) - stirlingRest(b) - deviance(a, n*x) - deviance(b, n*rest) +
		math.Log(a/n*b/(2*math.Pi))/2
}

// fraction is the continued fraction first + num(1)/(den(1) + num(2)/(den(2) + ...)), by the rule of Lentz 1976,
// Appl. Opt. 15:668-671, with the care for zeros of Thompson & Barnett 1986, J. Comput. Phys. 64:490-509.
func fraction(first float64, part func(i float64) (num, den float64)) float64 {
	const tiny = 1e-300
	away := func(v float64) float64 {
		if v == 0 {
			return tiny
		}
		return v
	}
	value := away(first)
	c, d := value, 0.0
	const (
		same = 8 * unit // c and d come with a few roundings each
		most = 1 << 24  // never met: it takes of the order of the square root of the counts many
	)
	for i := 1.0; i < most; i++ {
		num, den := part(i)
		d = 1 / away(den+num*d)
		c = away(den + num/c)
		value *= c * d
		if math.Abs(c*d-1) <= same || num == 0 {
			break
		}
	}
	return value
}

// deviance is v log(v/mean) + mean - v, for v > 0.
func deviance(v, mean float64) float64 {
	if r := mean / v; r < 0.5 || r > 2 {
		return v*(math.Log(v)-math.Log(mean)) + mean - v
	}
	d := (mean - v) / v
	return v * (d - math.Log1p(d))
}

// stirlingRest is log Gamma(v+1) less Stirling's v log v - v + log(2 pi v)/2.
func stirlingRest(v float64) float64 {
	if v < 16 {
		l, _ := math.Lgamma(v + 1)
		return l - (v*math.Log(v) - v + math.Log(2*math.Pi*v)/2)
	}
	// DLMF 5.11.1; the next term is below 1e-16 here.
	s := 1 / (v * v)
	return (1./12 - s*(1./360-s*(1./1260-s*(1./1680-s*(1./1188-s*691./360360))))) / v
}

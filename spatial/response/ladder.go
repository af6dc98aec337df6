package response

import "math"

// The negative binomial and the beta-binomial are products over a ladder 1, 1+u, 1+2u, ... 1+(n-1)u. Their
// log-likelihoods can be written with differences of log-gamma functions, but those cancel as u goes to 0, which is where
// both become the simpler distributions. The sums here do not: the first rungs are added as they stand, the others by the
// Euler-Maclaurin formula (Abramowitz & Stegun 1964, 23.1.30 and 23.1.31), whose integrals are written without
// cancellation. No sum visits more than 32 rungs, however long the ladder; relative errors are near 1e-15.

// rungs holds sums over j = 0 .. n-1 with v = 1 + j u. Derivatives in log u: inverse' = -lean, lean' = 2 steep - lean, and
// rise is that of the sum of log v.
type rungs struct {
	inverse float64 // sum of 1/v
	rise    float64 // sum of j u/v
	lean    float64 // sum of j u/v^2
	steep   float64 // sum of j u/v^3
}

// The Euler-Maclaurin formula begins at a rung whose step is at most 1/farRungs of its height: seven terms then leave
// less than 1e-16.
const farRungs = 16

// Bernoulli numbers B_2 .. B_14 divided as the derivatives of log v, 1/v, 1/v^2 and 1/v^3 ask for: B_k/(k (k-1)), B_k/k,
// B_k and B_k (k+1)/2.
var (
	endLog   = [7]float64{1. / 12, -1. / 360, 1. / 1260, -1. / 1680, 1. / 1188, -691. / 360360, 1. / 156}
	endOne   = [7]float64{1. / 12, -1. / 120, 1. / 252, -1. / 240, 1. / 132, -691. / 32760, 1. / 12}
	endTwo   = [7]float64{1. / 6, -1. / 30, 1. / 42, -1. / 30, 5. / 66, -691. / 2730, 7. / 6}
	endThree = [7]float64{1. / 4, -1. / 12, 1. / 12, -3. / 20, 5. / 12, -691. / 420, 35. / 4}
)

// endSeries returns the sum of c_i w^(2i+1).
func endSeries(c *[7]float64, w float64) float64 {
	x := w * w
	return w * (c[0] + x*(c[1]+x*(c[2]+x*(c[3]+x*(c[4]+x*(c[5]+x*c[6]))))))
}

// firstFar returns how many of n rungs are to be added one by one.
func firstFar(u, n float64) float64 {
	a := 0.0
	if u*farRungs > 1 {
		a = math.Ceil(farRungs - 1/u)
	}
	if n-a < farRungs {
		return n
	}
	return a
}

// climb returns t/p, at most 1e300, and 0 for t = 0: the step of a ladder from p upwards in units of p.
func climb(t, p float64) float64 {
	if t == 0 {
		return 0
	}
	return math.Min(t/p, 1e300)
}

// ladder returns the sums over n rungs, n a whole number, 0 <= u <= 1e300.
func ladder(u, n float64) (s rungs) {
	if u == 0 {
		return rungs{inverse: n}
	}
	a := firstFar(u, n)
	for j := 0.0; j < a; j++ {
		x := j * u
		g := 1 / (1 + x)
		c := x * g
		s.inverse += g
		s.rise += c
		c *= g
		s.lean += c
		s.steep += c * g
	}
	if a >= n {
		return s
	}
	// From rung a, of height 1/g, to rung n, of height 1/G; c = 1 - g and C = 1 - G.
	g, G := 1/(1+a*u), 1/(1+n*u)
	c, C := a*u*g, n*u*G
	length := n - a
	r := length * u * g // (1/G)/(1/g) - 1
	log := math.Log1p(r)
	whole := log / r
	short := 1 - whole // either may be small
	if r < 0.5 {
		short = shortfall(r)
	}
	s.inverse += length * g * whole
	s.rise += length * (c + g*short)
	if r < 1 {
		s.lean += length * g * (C - short)
	} else {
		s.lean += log/u - length*g*G
	}
	s.steep += length / 2 * (c*g*G*G + C*g*g*G + 2*c*C*g*G)
	one, two, three := endSeries(&endOne, u*g)*g, endSeries(&endTwo, u*g)*g*g, endSeries(&endThree, u*g)*g*g*g
	ONE, TWO, THREE := endSeries(&endOne, u*G)*G, endSeries(&endTwo, u*G)*G*G, endSeries(&endThree, u*G)*G*G*G
	s.inverse += (g-G)/2 + one - ONE
	s.rise += (c-C)/2 - one + ONE
	s.lean += (c*g-C*G)/2 + one - two - ONE + TWO
	s.steep += (c*g*g-C*G*G)/2 + two - three - TWO + THREE
	return s
}

// logLadder returns the sum of log(1 + j u) over j = 0 .. n-1.
func logLadder(u, n float64) float64 {
	if u > 1 && n > 1 { // begin at the second rung, where the steps are shorter than the height
		return (n-1)*math.Log1p(u) + logLadder(u/(1+u), n-1)
	}
	a := firstFar(u, n)
	product := 0.0 // of the first rungs, less 1; at most 32! as u <= 1
	for j := 1.0; j < a; j++ {
		product += j * u * (1 + product)
	}
	sum := math.Log1p(product)
	if a >= n {
		return sum
	}
	r := (n - a) * u / (1 + a*u)
	first, rise := math.Log1p(a*u), math.Log1p(r)
	sum += (n-a)*(first+excess(r)) - rise/2
	return sum + endSeries(&endLog, u/(1+n*u)) - endSeries(&endLog, u/(1+a*u))
}

// logProduct returns the sum of log(p + j t) over j = 0 .. n-1, with log p given apart since p may underflow.
func logProduct(logP, p, t, n float64) float64 {
	switch {
	case n == 0:
		return 0
	case t <= p:
		return n*logP + logLadder(climb(t, p), n)
	}
	return logP + (n-1)*math.Log(p+t) + logLadder(t/(p+t), n-1)
}

// shortfall returns 1 - log(1+r)/r, about r/2 for small r.
func shortfall(r float64) float64 {
	if s := r / (2 + r); math.Abs(s) < 0.2 {
		return s - (1-s)*atanhExcess(s)
	}
	return 1 - math.Log1p(r)/r
}

// excess returns ((1+r) log(1+r) - r)/r, about r/2 for small r; r >= -1.
func excess(r float64) float64 {
	if s := r / (2 + r); math.Abs(s) < 0.2 {
		return s + (1+s)*atanhExcess(s)
	}
	if r <= -1 {
		return -1
	}
	return (1+r)*math.Log1p(r)/r - 1
}

// lag returns log(1+x) - x/(1+x), about x^2/2 for small x >= 0.
func lag(x float64) float64 {
	if x < 0.5 {
		return x * (x/(1+x) - shortfall(x))
	}
	return math.Log1p(x) - 1/(1+1/x)
}

// atanhExcess returns artanh(s)/s - 1 for |s| < 0.2.
func atanhExcess(s float64) float64 {
	x := s * s
	return x * (1./3 + x*(1./5+x*(1./7+x*(1./9+x*(1./11+x*(1./13+x*(1./15+x*(1./17+x*(1./19+x*(1./21+x/23))))))))))
}

// stirlingError returns log Gamma(x+1) - (x + 1/2) log x + x - log(2 pi)/2 for x > 0, the error of Stirling's formula (A&S
// 6.1.37). Below 16 it goes up by error(x) - error(x+1) = (x + 1/2) log(1 + 1/x) - 1 = artanh(s)/s - 1, s = 1/(2x+1).
func stirlingError(x float64) (sum float64) {
	if x < 2.5 {
		return lgamma(x+1) - (x+0.5)*math.Log(x) + x - math.Log(2*math.Pi)/2
	}
	for ; x < farRungs; x++ {
		sum += atanhExcess(1 / (2*x + 1))
	}
	return sum + endSeries(&endLog, 1/x)
}

// fromBelow and fromAbove return P(Y < y) and P(Y <= y), neither below 0 nor above 1, from the sum of the probabilities on
// one side of y and that of y itself.
func fromBelow(rest, own float64) (below, upTo float64) {
	return math.Min(1, rest), math.Min(1, rest+own)
}

func fromAbove(rest, own float64) (below, upTo float64) {
	return math.Max(0, 1-(rest+own)), math.Max(0, 1-rest)
}

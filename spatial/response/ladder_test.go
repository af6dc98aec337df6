package response

import (
	"fmt"
	"math"
	"testing"
)

// tally is a compensated sum (Neumaier 1974).
type tally struct{ sum, lost float64 }

func (s *tally) add(x float64) {
	t := s.sum + x
	if math.Abs(s.sum) >= math.Abs(x) {
		s.lost += s.sum - t + x
	} else {
		s.lost += x - t + s.sum
	}
	s.sum = t
}

func (s *tally) value() float64 { return s.sum + s.lost }

// within fails unless got is within a relative tolerance of want.
func within(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol*math.Abs(want)) && got != want {
		t.Errorf("%s: got %.17g, want %.17g, off by %.2g", what, got, want, got/want-1)
	}
}

// TestLadderAgreesWithDirectSums goes rung by rung with compensated sums, over steps and lengths on both sides of where
// the Euler-Maclaurin formula takes over.
func TestLadderAgreesWithDirectSums(t *testing.T) {
	steps := []float64{0, 1e-300, 1e-20, 1e-12, 1e-8, 1e-5, 1e-3, 0.02, 0.0624, 1. / 16, 0.0626, 0.07, 0.1, 0.3, 0.999, 1, 1.001, 7, 200, 1e5, 1e12, 1e300}
	lengths := []float64{0, 1, 2, 3, 15, 16, 17, 18, 25, 31, 32, 33, 60, 333, 5000, 123456}
	for _, u := range steps {
		for _, n := range lengths {
			var inverse, rise, lean, steep, log tally
			for j := 0.0; j < n; j++ {
				v := 1 + j*u
				inverse.add(1 / v)
				rise.add(j * u / v)
				lean.add(j * u / v / v)
				steep.add(j * u / v / v / v)
				log.add(math.Log1p(j * u))
			}
			got := ladder(u, n)
			what := func(s string) string { return fmt.Sprintf("u = %g, n = %g: %s", u, n, s) }
			within(t, what("inverse"), got.inverse, inverse.value(), 2e-15)
			within(t, what("rise"), got.rise, rise.value(), 2e-15)
			within(t, what("lean"), got.lean, lean.value(), 2e-15)
			within(t, what("steep"), got.steep, steep.value(), 4e-15)
			within(t, what("log"), logLadder(u, n), log.value(), 2e-15)
		}
	}
}

// TestLongLadders takes ten million rungs. Where the step is of order one gamma functions do not cancel,
// sum log(1 + j u) = n log u + log Gamma(1/u + n) - log Gamma(1/u), and sums of reciprocals are harmonic numbers
// (Abramowitz & Stegun 1964, 6.1.22, 6.3.2 and 6.3.18). For short steps two power sums of the first integers are enough.
func TestLongLadders(t *testing.T) {
	const n = 1e7
	harmonic := func(n float64) float64 { // n large
		const euler = 0.57721566490153286060651209008240243 // A&S 6.1.3
		return math.Log(n) + euler + 1/(2*n) - 1/(12*n*n)
	}
	for u, want := range map[float64]float64{
		0.2: 5 * (harmonic(n+4) - 25./12), 0.5: 2 * (harmonic(n+1) - 1), 1: harmonic(n), 2: harmonic(2*n) - harmonic(n)/2,
	} {
		within(t, fmt.Sprintf("u = %g: log", u), logLadder(u, n), n*math.Log(u)+lgamma(1/u+n)-lgamma(1/u), 1e-14)
		within(t, fmt.Sprintf("u = %g: inverse", u), ladder(u, n).inverse, want, 2e-15)
	}
	const u = 1e-17 // j u up to 1e-10
	first, second := float64(n)*(n-1)/2, float64(n)*(n-1)*(2*n-1)/6
	within(t, "short steps: log", logLadder(u, n), u*first-u*u*second/2, 1e-14)
	within(t, "short steps: rise", ladder(u, n).rise, u*first-u*u*second, 1e-14)
	within(t, "short steps: lean", ladder(u, n).lean, u*first-2*u*u*second, 1e-14)
	within(t, "short steps: steep", ladder(u, n).steep, u*first-3*u*u*second, 1e-14)
	within(t, "short steps: inverse", ladder(u, n).inverse, n-u*first, 1e-15)
}

// TestLogProductNearTheEdges checks the sum of log(p + j t) where p underflows or t vanishes.
func TestLogProductNearTheEdges(t *testing.T) {
	for _, p := range []float64{0, 1e-320, 1e-300, 1e-8, 0.4, 1} {
		for _, step := range []float64{0, 1e-12, 0.03, 0.5, 99} {
			for _, n := range []float64{0, 1, 2, 40} {
				logP := math.Log(p)
				if p == 0 {
					logP = -760 // as if from the predictor
				}
				var want tally
				for j := 0.0; j < n; j++ {
					if j == 0 || step == 0 {
						want.add(logP)
					} else if p == 1 {
						want.add(math.Log1p(j * step))
					} else {
						want.add(math.Log(p + j*step))
					}
				}
				within(t, fmt.Sprintf("p = %g, t = %g, n = %g", p, step, n), logProduct(logP, p, step, n), want.value(), 1e-14)
			}
		}
	}
}

// TestSmallLogarithms checks the three functions of log(1+r) against their power series.
func TestSmallLogarithms(t *testing.T) {
	for _, r := range []float64{1e-200, 1e-10, 1e-3, 0.01, 0.1, 0.3, -1e-9, -0.01, -0.3} {
		var short, over, late tally
		for k := 60.0; k >= 2; k-- {
			c := math.Pow(-r, k-1)
			short.add(-c / k)             // 1 - log(1+r)/r
			over.add(-c / k / (k - 1))    // ((1+r) log(1+r) - r)/r
			late.add(c * r * (k - 1) / k) // log(1+r) - r/(1+r)
		}
		within(t, fmt.Sprintf("shortfall(%g)", r), shortfall(r), short.value(), 2e-15)
		within(t, fmt.Sprintf("excess(%g)", r), excess(r), over.value(), 2e-15)
		if r > 0 && r < 0.3 {
			within(t, fmt.Sprintf("lag(%g)", r), lag(r), -late.value(), 2e-15)
		}
	}
	for _, r := range []float64{0.6, 3, 1e5, 1e300} {
		within(t, "shortfall", shortfall(r), 1-math.Log1p(r)/r, 1e-15)
		within(t, "excess", excess(r), math.Log1p(r)+(math.Log1p(r)/r-1), 1e-15)
		within(t, "lag", lag(r), math.Log1p(r)-r/(1+r), 1e-15)
	}
	within(t, "excess(-1)", excess(-1), -1, 0)
}

// TestStirlingError compares with log factorials as sums of logarithms and, at half numbers, with
// Gamma(n + 1/2) = sqrt(pi) 1 3 5 ... (2n-1)/2^n (A&S 6.1.12).
func TestStirlingError(t *testing.T) {
	for n := 1.0; n <= 40; n++ {
		var whole, half tally
		for j := 1.0; j <= n; j++ {
			whole.add(math.Log(j))
			half.add(math.Log(j - 0.5))
		}
		half.add(math.Log(math.Pi) / 2)
		error := func(logGamma, x float64) float64 { // of Stirling's formula for log Gamma(x+1)
			return logGamma - (x+0.5)*math.Log(x) + x - math.Log(2*math.Pi)/2
		}
		size := 5e-16 * (1 + n*math.Log(n+1))
		close(t, fmt.Sprint("whole ", n), stirlingError(n), error(whole.value(), n), size)
		close(t, fmt.Sprint("half ", n), stirlingError(n-0.5), error(half.value(), n-0.5), size)
	}
	within(t, "far", stirlingError(1e9), 1/12e9, 1e-15)
}

// centralSlope returns f'(0) by central differences with three extrapolations (Richardson 1911), and the largest |f|.
func centralSlope(f func(h float64) float64) (slope, size float64) {
	var row [4]float64
	h := 0.08
	for k := range row {
		up, down := f(h), f(-h)
		size = math.Max(size, math.Max(math.Abs(up), math.Abs(down)))
		last := row
		row[0] = (up - down) / (2 * h)
		for i, four := 1, 4.0; i <= k; i, four = i+1, 4*four {
			row[i] = (four*row[i-1] - last[i-1]) / (four - 1)
		}
		h /= 2
	}
	return row[3], size
}

// checkDerivatives compares everything that is a derivative with differences of what it is the derivative of. Differences
// over steps of 0.01 lose 1e-13 of the size of the function or of the terms it is made of.
func checkDerivatives(t *testing.T, d Distribution, o Obs, eta float64) {
	t.Helper()
	terms := o.Weight * (o.Y + o.Trials) * (1 + math.Abs(eta) + math.Log1p(o.Y+o.Trials))
	near := func(what string, got float64, f func(h float64) float64) {
		t.Helper()
		want, size := centralSlope(f)
		if !(math.Abs(got-want) <= 1e-8*math.Abs(got)+1e-13*(size+terms)) {
			t.Errorf("%+v, %+v at %g: %s %.12g, differences say %.12g", d, o, eta, what, got, want)
		}
	}
	at := func(h float64) Point { return d.At(o, eta+h) }
	p := at(0)
	near("score", p.Score, func(h float64) float64 { return -at(h).Deviance / 2 })
	near("score against the likelihood", p.Score, func(h float64) float64 { return d.LogLikelihood(o, eta+h, 1) })
	near("weight", p.Weight, func(h float64) float64 { return -at(h).Score })
	near("slope", p.Slope, func(h float64) float64 { return at(h).Weight })
	near("slope of the expected weight", p.ExpectedSlope, func(h float64) float64 { return at(h).Expected })
	near("slope of the mean", d.MeanSlope(eta), func(h float64) float64 { return d.Mean(eta + h) })
	s, ok := d.(Shaped)
	if !ok {
		return
	}
	other := func(h float64) Shaped { return s.WithWorking(s.Working() + h) }
	q := s.ShapeAt(o, eta)
	near("shape slope of the deviance", q.Deviance, func(h float64) float64 { return other(h).At(o, eta).Deviance })
	near("shape slope of the score", q.Score, func(h float64) float64 { return other(h).At(o, eta).Score })
	near("shape slope of the weight", q.Weight, func(h float64) float64 { return other(h).At(o, eta).Weight })
	near("shape slope of the expected weight", q.Expected, func(h float64) float64 { return other(h).At(o, eta).Expected })
	near("shape slope of the saturated likelihood", s.SaturatedSlope(o, 1), func(h float64) float64 { return other(h).Saturated(o, 1) })
}

// checkSaturation holds the deviance against the two log-likelihoods.
func checkSaturation(t *testing.T, d Distribution, o Obs, eta, phi float64) {
	t.Helper()
	dev, l, sat := d.At(o, eta).Deviance, d.LogLikelihood(o, eta, phi), d.Saturated(o, phi)
	size := 1 + math.Abs(l) + math.Abs(sat) + dev/phi + o.Y*math.Abs(math.Log(o.Y+1))
	if !(math.Abs(l-sat+dev/(2*phi)) <= 1e-14*size) || dev < 0 {
		t.Errorf("%+v, %+v at %g: log-likelihood %.17g, saturated %.17g, deviance %.17g", d, o, eta, l, sat, dev)
	}
}

// checkFarOut goes where means overflow, underflow or round to 0 and 1; up to 700 every number is finite.
func checkFarOut(t *testing.T, d Distribution, o Obs) {
	t.Helper()
	for _, eta := range []float64{-800, -746, -720, -700, -300, -40, 40, 300, 700, 709.5, 720, 800} {
		p := d.At(o, eta)
		numbers := []float64{p.Deviance, p.Score, p.Weight, p.Slope, p.Expected, p.ExpectedSlope, d.Mean(eta), d.MeanSlope(eta),
			d.LogLikelihood(o, eta, 1.3), d.Pearson(o, eta)}
		if s, ok := d.(Shaped); ok {
			q := s.ShapeAt(o, eta)
			numbers = append(numbers, q.Deviance, q.Score, q.Weight, q.Expected)
		}
		for i, v := range numbers {
			if math.IsNaN(v) || math.IsInf(v, 0) && math.Abs(eta) <= 700 && i < 8 {
				t.Errorf("%+v, %+v at %g: number %d of %v", d, o, eta, i, numbers)
			}
		}
		if p.Deviance < 0 || p.Expected < 0 || d.LogLikelihood(o, eta, 1.3) > d.Saturated(o, 1.3)+1e-12 || d.Pearson(o, eta) < 0 {
			t.Errorf("%+v, %+v at %g: %v", d, o, eta, numbers)
		}
		below, upTo := d.CDF(o, eta, 1.3)
		if !(0 <= below && below <= upTo && upTo <= 1) {
			t.Errorf("%+v, %+v at %g: distribution function %g, %g", d, o, eta, below, upTo)
		}
	}
}

func BenchmarkLadder(b *testing.B) {
	for _, u := range []float64{1e-6, 0.3, 50} {
		for _, n := range []float64{10, 100, 1e7} {
			b.Run(fmt.Sprintf("u=%g/n=%g", u, n), func(b *testing.B) {
				for b.Loop() {
					ladder(u, n)
				}
			})
		}
	}
}

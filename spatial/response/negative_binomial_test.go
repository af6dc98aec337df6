package response

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

var _ Shaped = NegativeBinomial{}

var (
	nbThetas = []float64{1e-3, 0.1, 0.7, 1, 2.5, 30, 1e3, 1e6, 1e7}
	nbCounts = []float64{0, 1, 2, 5, 17, 40, 333, 20000}
)

// TestNegativeBinomialIsAGammaMixture integrates poisson probabilities over a gamma distribution of the mean, the
// definition of Greenwood & Yule (1920), with gonum's densities and the trapezium rule in log rate, which is exact to
// rounding for such integrands.
func TestNegativeBinomialIsAGammaMixture(t *testing.T) {
	for _, theta := range []float64{0.4, 1, 2.5, 30, 1e3} {
		for _, mu := range []float64{0.02, 0.8, 6, 70} {
			for _, y := range []float64{0, 1, 2, 5, 17, 40} {
				rate := distuv.Gamma{Alpha: theta, Beta: theta}
				var want tally
				const h = 1. / 512
				for v := -90.0; v < 8; v += h {
					g := math.Exp(v)
					want.add(h * math.Exp(distuv.Poisson{Lambda: mu * g}.LogProb(y)+rate.LogProb(g)+v))
				}
				o, eta := Obs{Y: y, Trials: 1, Weight: 1.5}, math.Log(mu)
				got := NegativeBinomial{theta}.LogLikelihood(o, eta, 1)
				within(t, fmt.Sprintf("theta %g, mean %g, count %g", theta, mu, y), math.Exp(got/1.5), want.value(), 2e-12)
			}
		}
	}
}

// TestNegativeBinomialSums checks that probabilities sum to one and have the mean and the variance mu + mu^2/theta, that
// the distribution function is their sum, and that the expected weight is the mean of the observed one and of the squared
// score.
func TestNegativeBinomialSums(t *testing.T) {
	for _, theta := range []float64{0.7, 1, 2.5, 30, 1e3, 1e6} {
		for _, mu := range []float64{0.02, 0.8, 6, 70} {
			d, eta := NegativeBinomial{theta}, math.Log(mu)
			var one, mean, variance, weight, square, pearson tally
			var expected float64
			for y := 0.0; y < 8000; y++ {
				o := Obs{Y: y, Trials: 1, Weight: 1}
				f := math.Exp(d.LogLikelihood(o, eta, 1))
				p := d.At(o, eta)
				below, upTo := d.CDF(o, eta, 1)
				if math.Abs(below-one.value()) > 2e-13 || math.Abs(upTo-one.value()-f) > 2e-13 {
					t.Fatalf("theta %g, mean %g, count %g: distribution function %g, %g, sum %g", theta, mu, y, below, upTo, one.value())
				}
				one.add(f)
				mean.add(f * y)
				variance.add(f * (y - mu) * (y - mu))
				weight.add(f * p.Weight)
				square.add(f * p.Score * p.Score)
				pearson.add(f * d.Pearson(o, eta))
				expected = p.Expected
			}
			what := func(s string) string { return fmt.Sprintf("theta %g, mean %g: %s", theta, mu, s) }
			within(t, what("sum"), one.value(), 1, 1e-12)
			within(t, what("mean"), mean.value(), mu, 1e-12)
			within(t, what("variance"), variance.value(), mu+mu*mu/theta, 2e-12)
			within(t, what("mean weight"), weight.value(), expected, 1e-12)
			within(t, what("mean squared score"), square.value(), expected, 2e-12)
			within(t, what("mean of Pearson"), pearson.value(), 1, 2e-12)
		}
	}
}

func TestNegativeBinomialDerivatives(t *testing.T) {
	for _, theta := range nbThetas {
		for _, y := range nbCounts {
			for _, eta := range []float64{-6, -1.2, 0, 0.7, 3, 6, math.Log(y+0.01) + 0.003, 9.9} {
				d, o := NegativeBinomial{theta}, Obs{Y: y, Trials: 1, Weight: 1.7}
				checkSaturation(t, d, o, eta, 1)
				if theta == nbThetas[0] || theta == nbThetas[len(nbThetas)-1] {
					d.Theta *= 1.0001 // inside the box
				}
				checkDerivatives(t, d, o, eta)
			}
		}
	}
}

// TestNegativeBinomialGoesOverIntoPoisson takes theta to infinity; the first term of the difference is
// ((y - mu)^2 - y)/(2 theta), and a difference of log-gamma functions would have lost it.
func TestNegativeBinomialGoesOverIntoPoisson(t *testing.T) {
	for _, y := range []float64{0, 1, 3, 20, 500} {
		for _, eta := range []float64{-4, 0, 1.7, 5} {
			o := Obs{Y: y, Trials: 1, Weight: 1}
			near, limit := NegativeBinomial{1e15}, Poisson{}
			p, q := near.At(o, eta), limit.At(o, eta)
			what := func(s string) string { return fmt.Sprintf("y = %g, eta = %g: %s", y, eta, s) }
			size := 1e-13 * (1 + y*math.Abs(eta))
			for name, pair := range map[string][2]float64{
				"deviance": {p.Deviance, q.Deviance}, "score": {p.Score, q.Score}, "weight": {p.Weight, q.Weight},
				"slope": {p.Slope, q.Slope}, "expected": {p.Expected, q.Expected}, "its slope": {p.ExpectedSlope, q.ExpectedSlope},
				"log-likelihood": {near.LogLikelihood(o, eta, 1), limit.LogLikelihood(o, eta, 1)},
				"saturated":      {near.Saturated(o, 1), limit.Saturated(o, 1)}, "Pearson": {near.Pearson(o, eta), limit.Pearson(o, eta)},
			} {
				if d := math.Abs(pair[0] - pair[1]); !(d <= size+2e-10*math.Abs(pair[1])) {
					t.Errorf("%s: %.17g, poisson %.17g", what(name), pair[0], pair[1])
				}
			}
			below, upTo := near.CDF(o, eta, 1)
			wantBelow, wantUpTo := limit.CDF(o, eta, 1)
			close(t, what("P(Y < y)"), below, wantBelow, 1e-11)
			close(t, what("P(Y <= y)"), upTo, wantUpTo, 1e-11)

			mu := math.Exp(eta)
			first := -((y-mu)*(y-mu) - y) / 2 // dl/dlog theta times theta
			got := (near.SaturatedSlope(o, 1) - near.ShapeAt(o, eta).Deviance/2) * 1e15
			if !(math.Abs(got-first) <= 1e-10*(y*y+mu*mu+y)) {
				t.Errorf("%s: %.15g, first term %.15g", what("slope of the log-likelihood in log theta"), got, first)
			}
		}
	}
}

// TestNegativeBinomialGeometric takes theta = 1, where P(Y > y) = s^(y+1) with s = mu/(1 + mu), up to means for which
// CDF gives up summing.
func TestNegativeBinomialGeometric(t *testing.T) {
	for _, mu := range []float64{1e-6, 0.3, 20, 9000, 1e5, 1e9} {
		for _, share := range []float64{0, 0.01, 0.5, 1, 3, 12} {
			y := math.Floor(share * mu)
			o := Obs{Y: y, Trials: 1, Weight: 1}
			below, upTo := NegativeBinomial{1}.CDF(o, math.Log(mu), 1)
			logS := -math.Log1p(1 / mu)
			what := fmt.Sprintf("mean %g, count %g", mu, y)
			close(t, what, upTo, -math.Expm1((y+1)*logS), 1e-12)
			close(t, what, below, -math.Expm1(y*logS), 1e-12)
			within(t, what, NegativeBinomial{1}.LogLikelihood(o, math.Log(mu), 1), y*logS-math.Log1p(mu), 2e-14)
		}
	}
}

// TestNegativeBinomialCDFGoesOn checks that the two ways to the distribution function agree where they meet, at
// sqrt(mu) + mu/theta = 10^4.
func TestNegativeBinomialCDFGoesOn(t *testing.T) {
	for _, theta := range []float64{0.4, 5, 1e3, 1e7} {
		summing := func(eta float64) bool { return math.Sqrt(math.Exp(eta))+math.Exp(eta)/theta <= 1e4 }
		low, high := 0.0, 20.0
		for range 60 { // until both sides of the switch are at the same mean
			if mid := (low + high) / 2; summing(mid) {
				low = mid
			} else {
				high = mid
			}
		}
		for _, z := range []float64{-2.5, -0.5, 0.1, 1.5, 3} {
			mu := math.Exp(low)
			o := Obs{Y: math.Floor(mu + z*math.Sqrt(mu+mu*mu/theta)), Trials: 1, Weight: 1}
			if o.Y < 0 {
				continue
			}
			summed, _ := NegativeBinomial{theta}.CDF(o, low, 1)
			fraction, _ := NegativeBinomial{theta}.CDF(o, high, 1)
			if !(summed > 1e-4 && summed < 1) || summed == fraction {
				t.Errorf("theta %g, count %g: P = %g shows nothing", theta, o.Y, summed)
			}
			close(t, fmt.Sprintf("theta %g, count %g", theta, o.Y), summed, fraction, 1e-10)
		}
	}
}

// TestNegativeBinomialLargeCounts compares the deviance near y = mu, where its terms cancel, with its power series in
// e = (y - mu)/mu: with r = theta/(mu + theta) and s = 1 - r, mu (e^2 r - e^3 (1 - s^2)/3 + e^4 (1 - s^3)/6 - ...).
func TestNegativeBinomialLargeCounts(t *testing.T) {
	for _, theta := range []float64{0.01, 1, 50, 1e4, 1e7} {
		for _, y := range []float64{100, 5e4, 1e7} {
			for _, e := range []float64{-1e-4, -3e-6, 2e-5} {
				eta := math.Log(y / (1 + e))
				e := math.Expm1(math.Log(y) - eta) // of the predictor as it was rounded
				mu := math.Exp(eta)
				s := mu / (mu + theta)
				want := mu * (e*e*theta/(mu+theta) - e*e*e*(1-s*s)/3 + e*e*e*e*(1-s*s*s)/6)
				got := NegativeBinomial{theta}.At(Obs{Y: y, Trials: 1, Weight: 1}, eta).Deviance
				within(t, fmt.Sprintf("theta %g, count %g, e %g", theta, y, e), got, want, 1e-11+1e-14/math.Abs(e))
			}
		}
	}
}

func TestNegativeBinomialFarOut(t *testing.T) {
	for _, theta := range nbThetas {
		for _, y := range []float64{0, 1, 3, 50, 1e6} {
			checkFarOut(t, NegativeBinomial{theta}, Obs{Y: y, Trials: 1, Weight: 2})
		}
	}
}

func TestNegativeBinomialShape(t *testing.T) {
	d := NegativeBinomial{2.5}
	lo, hi := d.Box()
	within(t, "lower bound", math.Exp(lo), 1e-3, 1e-14)
	within(t, "upper bound", math.Exp(hi), 1e7, 1e-14)
	within(t, "theta there and back", d.WithWorking(d.Working()).Shape(), 2.5, 1e-15)
	if d.Simpler(true) != "poisson" || d.Simpler(false) != "" || d.ShapeName() != "theta" {
		t.Errorf("%q, %q, %q", d.Simpler(true), d.Simpler(false), d.ShapeName())
	}
	if s, err := d.WithShape(7); err != nil || s.Shape() != 7 {
		t.Errorf("theta 7: %v, %v", s, err)
	}
	for _, theta := range []float64{0, -1, 1e8, math.NaN(), math.Inf(1)} {
		if _, err := d.WithShape(theta); err == nil {
			t.Errorf("theta %g is accepted", theta)
		}
	}
}

func BenchmarkNegativeBinomial(b *testing.B) {
	for _, y := range []float64{3, 300} {
		d, o := NegativeBinomial{2.5}, Obs{Y: y, Trials: 1, Weight: 1}
		b.Run(fmt.Sprintf("At/y=%g", y), func(b *testing.B) {
			for b.Loop() {
				d.At(o, 1.3)
			}
		})
		b.Run(fmt.Sprintf("ShapeAt/y=%g", y), func(b *testing.B) {
			for b.Loop() {
				d.ShapeAt(o, 1.3)
			}
		})
		b.Run(fmt.Sprintf("SaturatedSlope/y=%g", y), func(b *testing.B) {
			for b.Loop() {
				d.SaturatedSlope(o, 1)
			}
		})
	}
}

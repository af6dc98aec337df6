package response

import (
	"fmt"
	"math"
	"math/big"
	"testing"
)

var _ Shaped = BetaBinomial{}

var (
	bbCorrelations = []float64{1e-7, 1e-6, 1e-3, 0.06, 0.3, 0.8, 0.99}
	bbRows         = []Obs{{0, 1, 1.7}, {1, 1, 1.7}, {0, 12, 1.7}, {1, 12, 1.7}, {6, 12, 1.7}, {12, 12, 1.7}, {3, 90, 0.4}, {57, 90, 0.4}, {90, 90, 0.4},
		{117, 200, 0.4}, {20, 5000, 1}, {4100, 5000, 1}}
)

// exactBetaBinomial multiplies the probability of Skellam (1948) out with 200 bits:
// C(m, y) prod (p + j t) prod (q + j t)/prod (1 + j t).
func exactBetaBinomial(y, m int, p, q, t float64) float64 {
	number := func(x float64) *big.Float { return new(big.Float).SetPrec(200).SetFloat64(x) }
	rung := func(base float64, j int) *big.Float {
		x := number(t)
		return x.Add(x.Mul(x, number(float64(j))), number(base))
	}
	result := new(big.Float).SetPrec(200).SetInt(new(big.Int).Binomial(int64(m), int64(y)))
	for j := range y {
		result.Mul(result, rung(p, j))
	}
	for j := range m - y {
		result.Mul(result, rung(q, j))
	}
	for j := range m {
		result.Quo(result, rung(1, j))
	}
	f, _ := result.Float64()
	return f
}

func TestBetaBinomialProducts(t *testing.T) {
	for _, rho := range bbCorrelations {
		d := BetaBinomial{rho}
		for _, m := range []int{1, 2, 9, 60} {
			for y := 0; y <= m; y += 1 + m/20 {
				for _, eta := range []float64{-9, -2, 0, 0.4, 5} {
					p, q := logistic(eta)
					want := exactBetaBinomial(y, m, p, q, rho/(1-rho))
					got := d.LogLikelihood(Obs{Y: float64(y), Trials: float64(m), Weight: 1.3}, eta, 1) / 1.3
					close(t, fmt.Sprintf("rho %g, %d of %d, eta %g", rho, y, m, eta), got, math.Log(want), 1e-14*(10+float64(m)))
				}
			}
		}
	}
}

// TestBetaBinomialUniform takes the uniform distribution of the probability, for which every number positive is as likely:
// 1/(m+1), and P(Y <= y) = (y+1)/(m+1).
func TestBetaBinomialUniform(t *testing.T) {
	d := BetaBinomial{1. / 3}
	for _, m := range []float64{1, 5, 100, 1e4, 1e6} {
		for _, share := range []float64{0, 0.1, 0.5, 0.7, 1} {
			o := Obs{Y: math.Round(share * m), Trials: m, Weight: 1}
			what := fmt.Sprintf("%g of %g", o.Y, m)
			close(t, what+": log-likelihood", d.LogLikelihood(o, 0, 1), -math.Log(m+1), 1e-15*(20+m))
			below, upTo := d.CDF(o, 0, 1)
			close(t, what+": distribution function below", below, o.Y/(m+1), 1e-14*(10+m/10))
			close(t, what+": distribution function", upTo, (o.Y+1)/(m+1), 1e-14*(10+m/10))
		}
	}
}

// TestBetaBinomialSums checks that probabilities sum to one with mean m p and variance m p q (1 + (m-1) rho), that the
// distribution function is their sum, and that the expected weight is the mean of the observed one and of the squared
// score; beyond sumTrials it is the information of the first two moments, which is less.
func TestBetaBinomialSums(t *testing.T) {
	for _, rho := range []float64{0, 1e-6, 1e-3, 0.06, 0.3, 0.8, 0.99} {
		for _, m := range []float64{1, 2, 9, 60, sumTrials, sumTrials + 1, 2000} {
			for _, eta := range []float64{-9, -2, 0, 0.4, 5} {
				d := BetaBinomial{rho}
				p, q := logistic(eta)
				what := func(s string) string { return fmt.Sprintf("rho %g, %g trials, eta %g: %s", rho, m, eta, s) }
				var one, mean, variance, weight, square, pearson tally
				var expected float64
				for y := 0.0; y <= m; y++ {
					o := Obs{Y: y, Trials: m, Weight: 1}
					f := math.Exp(d.LogLikelihood(o, eta, 1))
					r := d.row(y, m-y, p, q)
					if y == 0 {
						expected = d.At(o, eta).Expected
					}
					if m <= 60 || math.Mod(y, 29) == 0 {
						below, upTo := d.CDF(o, eta, 1)
						if math.Abs(below-one.value()) > 1e-11 || math.Abs(upTo-one.value()-f) > 1e-11 {
							t.Errorf("%s: distribution function %.15g, %.15g, sum %.15g", what(fmt.Sprint(y)), below, upTo, one.value())
						}
					}
					one.add(f)
					mean.add(f * y)
					variance.add(f * (y - m*p) * (y - m*p))
					weight.add(f * r.weight())
					square.add(f * r.score() * r.score())
					pearson.add(f * d.Pearson(o, eta))
				}
				tol := 1e-14 * (100 + m)
				within(t, what("sum"), one.value(), 1, tol)
				within(t, what("mean"), mean.value(), m*p, tol)
				within(t, what("variance"), variance.value(), m*p*q*(1+(m-1)*rho), tol)
				within(t, what("mean of Pearson"), pearson.value(), 1, tol)
				within(t, what("mean weight"), weight.value(), square.value(), 4*tol*(1+m*p*q/square.value()))
				if m <= sumTrials {
					within(t, what("expected weight"), expected, square.value(), 4*tol)
					continue
				}
				within(t, what("information of two moments"), expected, (m*p*q)*(m*p*q)/variance.value(), 4*tol)
				if expected > square.value()*(1+tol) {
					t.Errorf("%s: %g is above %g", what("information of two moments"), expected, square.value())
				}
			}
		}
	}
}

// TestBetaBinomialWeights compares with the sums as the reference states them (README of testdata/reference), where they
// do not cancel, and meets a negative weight.
func TestBetaBinomialWeights(t *testing.T) {
	negative := 0
	for _, rho := range bbCorrelations[2:] {
		for _, o := range bbRows {
			for _, eta := range []float64{-2.5, -0.8, 0.1, 1.3} {
				p, q := logistic(eta)
				step := rho / (1 - rho)
				var up, down, upSquare, downSquare tally
				for j := 0.0; j < o.Y; j++ {
					up.add(1 / (p + j*step))
					upSquare.add(1 / (p + j*step) / (p + j*step))
				}
				for j := 0.0; j < o.Trials-o.Y; j++ {
					down.add(1 / (q + j*step))
					downSquare.add(1 / (q + j*step) / (q + j*step))
				}
				first, second := up.value()-down.value(), upSquare.value()+downSquare.value()
				got := BetaBinomial{rho}.At(o, eta)
				size := o.Weight * p * q * (up.value() + down.value())
				what := fmt.Sprintf("rho %g, %+v, eta %g", rho, o, eta)
				if want := o.Weight * p * q * first; math.Abs(got.Score-want) > 1e-14*size {
					t.Errorf("%s: score %.15g, want %.15g", what, got.Score, want)
				}
				if want := o.Weight * p * q * (p*q*second - (q-p)*first); math.Abs(got.Weight-want) > 1e-14*size {
					t.Errorf("%s: weight %.15g, want %.15g", what, got.Weight, want)
				}
				if got.Weight < 0 {
					negative++
				}
			}
		}
	}
	if negative == 0 {
		t.Error("no negative weight met")
	}
}

func TestBetaBinomialDerivatives(t *testing.T) {
	for _, rho := range bbCorrelations {
		for _, o := range bbRows {
			for _, eta := range []float64{-30, -6, -1.2, 0, 0.7, 3, 12} {
				d := BetaBinomial{rho}
				checkSaturation(t, d, o, eta, 1)
				checkDerivatives(t, d, o, eta)
			}
		}
	}
}

// TestBetaBinomialOwnShare checks the probability that maximises a row's likelihood: the score vanishes, values beside it
// do worse, rows mirrored give it mirrored, and it goes from y/m for rho near 0 to 1/2 for rho near 1.
func TestBetaBinomialOwnShare(t *testing.T) {
	for _, rho := range []float64{0, 1e-7, 1e-4, 0.01, 0.1, 0.5, 0.99} {
		d := BetaBinomial{rho}
		for _, o := range []Obs{{1, 2, 1}, {1, 3, 1}, {1, 1000, 1}, {7, 12, 1}, {30, 1000, 1}, {499, 1000, 1}, {999, 1000, 1}, {3, 1e6, 1}, {1, 1e7, 1}, {2e6, 1e7, 1}} {
			y, n := o.Y, o.Trials-o.Y
			own, mirror := d.ownShare(y, n), d.ownShare(n, y)
			r := d.row(y, n, own.p, own.q)
			what := fmt.Sprintf("rho %g, %g of %g", rho, y, o.Trials)
			if s := r.score(); math.Abs(s) > 1e-13*(own.q*r.yes.inverse+own.p*r.no.inverse) {
				t.Errorf("%s: p* = %.15g has score %g", what, own.p, s)
			}
			within(t, what+": mirrored", mirror.q, own.p, 1e-15)
			top := d.Saturated(o, 1)
			for _, shift := range []float64{-0.3, -0.01, 0.01, 0.3} {
				eta := own.logP - own.logQ
				if l := d.LogLikelihood(o, eta+shift, 1); l > top-1e-6*shift*shift {
					t.Errorf("%s: log-likelihood %.15g at %g from p*, where it is %.15g", what, l, shift, top)
				}
			}
			if rho == 0 {
				within(t, what, own.p, y/o.Trials, 1e-13)
			}
		}
	}
	if p := (BetaBinomial{0.99999}).ownShare(3, 20).p; math.Abs(p-0.5) > 1e-4 {
		t.Errorf("rho near 1: p* = %g", p)
	}
	for _, y := range []float64{0, 8} {
		own := BetaBinomial{0.2}.ownShare(y, 8-y)
		within(t, "p* at the edge", own.p, y/8, 0)
		close(t, "log-likelihood there", BetaBinomial{0.2}.Saturated(Obs{y, 8, 1}, 1), 0, 1e-14)
	}
}

// TestBetaBinomialGoesOverIntoBinomial takes rho to 0; the first term of the difference of the log-likelihoods is
// rho (y (y-1)/(2 p) + n (n-1)/(2 q) - m (m-1)/2), and a difference of log-gamma functions would have lost it.
func TestBetaBinomialGoesOverIntoBinomial(t *testing.T) {
	for _, rho := range []float64{0, 1e-15} {
		for _, o := range bbRows {
			for _, eta := range []float64{-4, -0.6, 0, 1.7} {
				near, limit := BetaBinomial{rho}, Binomial{}
				p, q := near.At(o, eta), limit.At(o, eta)
				mean, rest := logistic(eta)
				what := func(s string) string { return fmt.Sprintf("rho %g, %+v, eta %g: %s", rho, o, eta, s) }
				first := rho * o.Trials * o.Trials / (mean * rest) // bounds the first term of what differs
				for name, pair := range map[string][2]float64{
					"deviance": {p.Deviance, q.Deviance}, "score": {p.Score, q.Score}, "weight": {p.Weight, q.Weight},
					"slope": {p.Slope, q.Slope}, "expected": {p.Expected, q.Expected}, "its slope": {p.ExpectedSlope, q.ExpectedSlope},
					"log-likelihood": {near.LogLikelihood(o, eta, 1), limit.LogLikelihood(o, eta, 1)},
					"saturated":      {near.Saturated(o, 1), limit.Saturated(o, 1)}, "Pearson": {near.Pearson(o, eta), limit.Pearson(o, eta)},
				} {
					if d := math.Abs(pair[0] - pair[1]); !(d <= 1e-11*math.Abs(pair[1])+1e-14*o.Trials+first) {
						t.Errorf("%s: %.17g, binomial %.17g", what(name), pair[0], pair[1])
					}
				}
				below, upTo := near.CDF(o, eta, 1)
				wantBelow, wantUpTo := limit.CDF(o, eta, 1)
				close(t, what("P(Y < y)"), below, wantBelow, 1e-10)
				close(t, what("P(Y <= y)"), upTo, wantUpTo, 1e-10)
				if rho == 0 {
					continue
				}
				y, n, m := o.Y, o.Trials-o.Y, o.Trials
				terms := [3]float64{y * (y - 1) / (2 * mean), n * (n - 1) / (2 * rest), m * (m - 1) / 2}
				got := (near.SaturatedSlope(o, 1) - near.ShapeAt(o, eta).Deviance/2) / rho
				if want := o.Weight * (terms[0] + terms[1] - terms[2]); math.Abs(got-want) > 1e-9*(1+terms[0]+terms[1]+terms[2]) {
					t.Errorf("%s: %.15g, first term %.15g", what("slope of the log-likelihood in logit rho"), got, want)
				}
			}
		}
	}
}

func TestBetaBinomialFarOut(t *testing.T) {
	for _, rho := range append([]float64{0}, bbCorrelations...) {
		for _, o := range bbRows {
			checkFarOut(t, BetaBinomial{rho}, o)
		}
	}
	// All positive where none is expected: for any rho the first of them costs -2 log p.
	within(t, "deviance far out", BetaBinomial{0.4}.At(Obs{1, 1, 1}, -700).Deviance, 1400, 1e-14)
}

func TestBetaBinomialShape(t *testing.T) {
	d := BetaBinomial{0.08}
	lo, hi := d.Box()
	within(t, "lower bound", d.WithWorking(lo).Shape(), 1e-7, 1e-13)
	within(t, "upper bound", d.WithWorking(hi).Shape(), 0.99, 1e-14)
	within(t, "working scale", d.Working(), math.Log(0.08/0.92), 1e-15)
	within(t, "correlation there and back", d.WithWorking(d.Working()).Shape(), 0.08, 1e-15)
	if d.Simpler(false) != "binomial" || d.Simpler(true) != "" || d.ShapeName() != "correlation" {
		t.Errorf("%q, %q, %q", d.Simpler(false), d.Simpler(true), d.ShapeName())
	}
	if s, err := d.WithShape(0.3); err != nil || s.Shape() != 0.3 {
		t.Errorf("correlation 0.3: %v, %v", s, err)
	}
	for _, rho := range []float64{0, -0.1, 1, 7, math.NaN()} {
		if _, err := d.WithShape(rho); err == nil {
			t.Errorf("correlation %g is accepted", rho)
		}
	}
}

func BenchmarkBetaBinomial(b *testing.B) {
	for _, m := range []float64{10, 50, 200, 1000, 1e7} {
		d, o := BetaBinomial{0.08}, Obs{Y: math.Round(0.3 * m), Trials: m, Weight: 1}
		b.Run(fmt.Sprintf("At/trials=%g", m), func(b *testing.B) {
			for b.Loop() {
				d.At(o, -0.4)
			}
		})
		b.Run(fmt.Sprintf("ShapeAt/trials=%g", m), func(b *testing.B) {
			for b.Loop() {
				d.ShapeAt(o, -0.4)
			}
		})
		b.Run(fmt.Sprintf("own share/trials=%g", m), func(b *testing.B) {
			for b.Loop() {
				d.ownShare(o.Y, o.Trials-o.Y)
			}
		})
		b.Run(fmt.Sprintf("expected/trials=%g", m), func(b *testing.B) {
			for b.Loop() {
				d.information(o.Trials, 0.4, 0.6)
			}
		})
	}
}

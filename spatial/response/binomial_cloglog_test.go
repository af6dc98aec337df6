package response

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

var cloglogRows = []Obs{{0, 1, 1.7}, {1, 1, 1.7}, {0, 9, 1}, {3, 9, 1}, {9, 9, 1}, {40, 250, 0.3}, {249, 250, 0.3}}

// TestCloglogAgreesWithGonum compares with gonum's distuv.Binomial at p = 1 - exp(-exp(eta)), and sums over the outcomes.
func TestCloglogAgreesWithGonum(t *testing.T) {
	d := BinomialCloglog{}
	for _, m := range []float64{1, 9, 250} {
		for _, eta := range []float64{-7, -2, -0.3, 0, 0.6, 1.4} {
			own := distuv.Binomial{N: m, P: d.Mean(eta)}
			var weight, square, pearson, upToHere tally
			for y := 0.0; y <= m; y++ {
				o := Obs{Y: y, Trials: m, Weight: 1}
				what := fmt.Sprintf("y %g of %g, eta %g", y, m, eta)
				close(t, what+": log-likelihood", d.LogLikelihood(o, eta, 1), own.LogProb(y), 1e-12)
				f := math.Exp(d.LogLikelihood(o, eta, 1))
				p := d.At(o, eta)
				weight.add(f * p.Weight)
				square.add(f * p.Score * p.Score)
				pearson.add(f * d.Pearson(o, eta))
				below, upTo := d.CDF(o, eta, 1)
				close(t, what+": distribution function below", below, upToHere.value(), 1e-12)
				upToHere.add(f)
				close(t, what+": distribution function", upTo, upToHere.value(), 1e-12)
			}
			want := d.At(Obs{Y: 0, Trials: m, Weight: 1}, eta).Expected
			what := fmt.Sprintf("%g trials, eta %g", m, eta)
			within(t, what+": sum", upToHere.value(), 1, 1e-12)
			within(t, what+": mean weight", weight.value(), want, 1e-12)
			within(t, what+": mean squared score", square.value(), want, 1e-12)
			within(t, what+": mean of Pearson", pearson.value(), 1, 1e-12)
		}
	}
}

func TestCloglogDerivatives(t *testing.T) {
	for _, o := range cloglogRows {
		for _, eta := range []float64{-20, -9, -3, -0.9, -0.65, -0.3, 0, 0.7, 1.8, 3} {
			checkDerivatives(t, BinomialCloglog{}, o, eta)
			checkSaturation(t, BinomialCloglog{}, o, eta, 1)
		}
	}
}

// TestCloglogRarely checks the limit of small probabilities: positives of many trials are poisson with mean m exp(eta).
func TestCloglogRarely(t *testing.T) {
	for _, y := range []float64{0, 1, 4} {
		const m, eta = 1e9, -20.0
		got, want := BinomialCloglog{}.At(Obs{Y: y, Trials: m, Weight: 1}, eta), Poisson{}.At(Obs{Y: y, Weight: 1}, eta+math.Log(m))
		close(t, "deviance", got.Deviance, want.Deviance, 2e-8)
		close(t, "score", got.Score, want.Score, 2e-8)
		close(t, "weight", got.Weight, want.Weight, 2e-8)
		close(t, "slope", got.Slope, want.Slope, 2e-8)
	}
}

func TestCloglogFarOut(t *testing.T) {
	for _, o := range cloglogRows {
		checkFarOut(t, BinomialCloglog{}, o)
	}
	// All positive where nearly none is expected: -2 log p = -2 eta.
	within(t, "deviance far out", BinomialCloglog{}.At(Obs{1, 1, 1}, -700).Deviance, 1400, 1e-14)
	// None positive where all are expected: 2 exp(eta).
	within(t, "deviance far up", BinomialCloglog{}.At(Obs{0, 1, 1}, 300).Deviance, 2*math.Exp(300), 1e-14)
}

func TestCloglogStartAndLink(t *testing.T) {
	d := BinomialCloglog{}
	for _, o := range cloglogRows {
		if eta := d.Linear(d.Start(o, 0.37)); math.IsNaN(eta) || math.IsInf(eta, 0) {
			t.Errorf("start of %+v has predictor %g", o, eta)
		}
	}
	for _, eta := range []float64{-30, -1, 0, 1.1} {
		close(t, "link of the mean", d.Linear(d.Mean(eta)), eta, 1e-13)
	}
}

func BenchmarkCloglogAt(b *testing.B) {
	for b.Loop() {
		BinomialCloglog{}.At(Obs{3, 9, 1}, -0.7)
	}
}

package response

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

var _ Dispersed = Gamma{}

var gammaAmounts = []float64{1e-3, 0.2, 1, 3.7, 90, 1e5}

// TestGammaAgreesWithGonum compares with gonum's distuv.Gamma of shape w/phi and rate w/(phi mu).
func TestGammaAgreesWithGonum(t *testing.T) {
	for _, phi := range []float64{0.003, 0.1, 0.7, 1, 4, 50} {
		for _, y := range gammaAmounts {
			for _, eta := range []float64{-3, 0, 1.2, 4} {
				o := Obs{Y: y, Trials: 1, Weight: 1.4}
				k, mu := o.Weight/phi, math.Exp(eta)
				own := distuv.Gamma{Alpha: k, Beta: k / mu}
				what := fmt.Sprintf("phi %g, y %g, eta %g", phi, y, eta)
				within(t, what+": log density", Gamma{}.LogLikelihood(o, eta, phi), own.LogProb(y), 1e-12)
				within(t, what+": saturated", Gamma{}.Saturated(o, phi), distuv.Gamma{Alpha: k, Beta: k / y}.LogProb(y), 1e-12*(1+k))
				below, upTo := Gamma{}.CDF(o, eta, phi)
				close(t, what+": distribution function", upTo, own.CDF(y), 1e-13)
				close(t, what+": distribution function below", below, upTo, 0)
				within(t, what+": Pearson", Gamma{}.Pearson(o, eta), (y-own.Mean())*(y-own.Mean())/own.Variance()*phi, 1e-11)
			}
		}
	}
}

// TestGammaMoments integrates over the density by the trapezium rule in log y.
func TestGammaMoments(t *testing.T) {
	for _, phi := range []float64{0.01, 0.3, 1.5} {
		const eta, h = 0.8, 1. / 256
		var one, mean, variance, weight, square tally
		for v := -60.0; v < 8; v += h {
			o := Obs{Y: math.Exp(v), Trials: 1, Weight: 1.3}
			f := h * math.Exp(Gamma{}.LogLikelihood(o, eta, phi)+v)
			p := Gamma{}.At(o, eta)
			one.add(f)
			mean.add(f * o.Y)
			variance.add(f * (o.Y - math.Exp(eta)) * (o.Y - math.Exp(eta)))
			weight.add(f * p.Weight)
			square.add(f * p.Score * p.Score)
		}
		within(t, "integral", one.value(), 1, 1e-12)
		within(t, "mean", mean.value(), math.Exp(eta), 1e-12)
		within(t, "variance", variance.value(), phi/1.3*math.Exp(2*eta), 1e-12)
		within(t, "mean weight", weight.value(), Gamma{}.At(Obs{Y: 1, Weight: 1.3}, eta).Expected, 1e-12)
		within(t, "mean squared score", square.value(), phi*1.3, 1e-12)
	}
}

func TestGammaDerivatives(t *testing.T) {
	for _, y := range gammaAmounts {
		for _, eta := range []float64{-3, -0.4, 0, 1.2, 4, math.Log(y) + 0.01} {
			o := Obs{Y: y, Trials: 1, Weight: 0.6}
			checkDerivatives(t, Gamma{}, o, eta)
			for _, phi := range []float64{1e-4, 0.01, 0.04, 0.3, 1, 9, 300} {
				checkSaturation(t, Gamma{}, o, eta, phi)
			}
		}
	}
	for _, phi := range []float64{1e-6, 1e-3, 0.03, 0.0375, 0.038, 0.05, 0.3, 1, 7, 200} {
		o := Obs{Y: 2.3, Trials: 1, Weight: 0.6}
		want, size := centralSlope(func(h float64) float64 { return Gamma{}.Saturated(o, phi*math.Exp(h)) })
		if got := (Gamma{}).ScaleSlope(o, phi); !(math.Abs(got-want) <= 1e-9*math.Abs(got)+3e-13*size) {
			t.Errorf("slope in log phi at %g: %.15g, differences say %.15g", phi, got, want)
		}
	}
}

// TestLogLessDigamma takes digamma at whole and half numbers from sums of reciprocals (Abramowitz & Stegun 1964, 6.3.2
// and 6.3.4).
func TestLogLessDigamma(t *testing.T) {
	const euler = 0.57721566490153286060651209008240243 // A&S 6.1.3
	for k := 1.0; k <= 40; k++ {
		var whole, half tally
		for j := 1.0; j <= k; j++ {
			if j < k {
				whole.add(1 / j)
			}
			half.add(2 / (2*j - 1))
		}
		whole.add(-euler)
		half.add(-euler - 2*math.Ln2)
		close(t, fmt.Sprint("whole ", k), logLessDigamma(k), math.Log(k)-whole.value(), 2e-15)
		close(t, fmt.Sprint("half ", k), logLessDigamma(k+0.5), math.Log(k+0.5)-half.value(), 2e-15)
	}
}

// TestGammaNearTheMean compares the deviance with its series e^2 - 2 e^3/3 + e^4/2 in e = (y - mu)/mu.
func TestGammaNearTheMean(t *testing.T) {
	for _, y := range []float64{0.5, 1, 1000} {
		for _, off := range []float64{-1e-3, 1e-6, 3e-3} {
			eta := math.Log(y) - off
			e := math.Expm1(math.Log(y) - eta)
			got := Gamma{}.At(Obs{Y: y, Trials: 1, Weight: 1}, eta).Deviance
			within(t, fmt.Sprintf("y %g, off %g", y, off), got, e*e-2*e*e*e/3+e*e*e*e/2, 1e-12+2e-15/math.Abs(off)+2*math.Abs(off*off*off))
		}
	}
}

func TestGammaFarOut(t *testing.T) {
	for _, y := range []float64{1e-6, 1, 7, 1e3} {
		checkFarOut(t, Gamma{}, Obs{Y: y, Trials: 1, Weight: 2})
	}
}

func BenchmarkGamma(b *testing.B) {
	o := Obs{Y: 3, Trials: 1, Weight: 1}
	b.Run("At", func(b *testing.B) {
		for b.Loop() {
			Gamma{}.At(o, 1.3)
		}
	})
	b.Run("ScaleSlope", func(b *testing.B) {
		for b.Loop() {
			Gamma{}.ScaleSlope(o, 0.3)
		}
	})
}

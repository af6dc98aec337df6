package rates

import (
	"flag"
	"fmt"
	"math"
	"math/big"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
	"pgregory.net/rapid"
)

// Properties are tried at the same places in every run; -rapid.seed on the command line still wins.
func init() {
	if err := flag.Set("rapid.seed", "20250101"); err != nil {
		panic(err)
	}
}

// Values of Garwood's table as reprinted in many handbooks; from memory, each also confirmed by the sums of tails below.
func TestCountLimitsPublished(t *testing.T) {
	for _, test := range []struct {
		count, confidence, lower, upper float64
		digits                          float64 // the last one printed
	}{
		{0, 0.95, 0, 3.689, 1e-3},
		{1, 0.95, 0.0253, 5.572, 1e-3},
		{2, 0.95, 0.242, 7.225, 1e-3},
		{5, 0.95, 1.623, 11.668, 1e-3},
		{10, 0.95, 4.795, 18.390, 1e-3},
		{20, 0.95, 12.217, 30.888, 1e-3},
		{50, 0.95, 37.111, 65.919, 1e-3},
		{100, 0.95, 81.364, 121.627, 1e-3},
		{0, 0.99, 0, 5.298, 1e-3},
		{1, 0.99, 0.00501, 7.430, 1e-3},
		{10, 0.99, 3.717, 21.398, 1e-3},
	} {
		lower, upper := CountLimits(test.count, test.confidence)
		if math.Abs(lower-test.lower) > 0.51*test.digits || math.Abs(upper-test.upper) > 0.51*test.digits {
			t.Errorf("%g at %g: %.6g to %.6g, want %g to %g", test.count, test.confidence, lower, upper, test.lower, test.upper)
		}
	}
}

// From memory, each confirmed by the sums of tails below.
func TestShareLimitsPublished(t *testing.T) {
	for _, test := range []struct{ positive, trials, lower, upper float64 }{
		{10, 100, 0.0490, 0.1762},
		{0, 10, 0, 0.3085},
		{1, 10, 0.0025, 0.4450},
		{5, 20, 0.0866, 0.4910},
	} {
		lower, upper := ShareLimits(test.positive, test.trials, 0.95)
		if math.Abs(lower-test.lower) > 0.51e-4 || math.Abs(upper-test.upper) > 0.51e-4 {
			t.Errorf("%g of %g: %.6g to %.6g, want %g to %g", test.positive, test.trials, lower, upper, test.lower, test.upper)
		}
	}
}

const bits = 96

func exact(v float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(v) }

// tails sums the terms of a distribution over whole numbers from both sides of its mode, each from its neighbour, until
// they no longer matter, and returns the shares of the sum at k or less and at k or more. Nothing but the ratio of
// neighbours, ratio(j) = term(j+1)/term(j), is known of it.
func tails(k, mode, last float64, ratio func(j float64) *big.Float) (atMost, atLeast float64) {
	all, below, above := exact(0), exact(0), exact(0)
	add := func(j float64, term *big.Float) bool {
		all.Add(all, term)
		if j <= k {
			below.Add(below, term)
		}
		if j >= k {
			above.Add(above, term)
		}
		return term.MantExp(nil) > all.MantExp(nil)-70
	}
	term := exact(1)
	for j := mode; j <= last && add(j, term); j++ {
		term = new(big.Float).Mul(term, ratio(j))
	}
	term = exact(1)
	for j := mode - 1; j >= 0; j-- {
		if term = new(big.Float).Quo(term, ratio(j)); !add(j, term) {
			break
		}
	}
	atMost, _ = new(big.Float).Quo(below, all).Float64()
	atLeast, _ = new(big.Float).Quo(above, all).Float64()
	return atMost, atLeast
}

func poissonTails(count, mean float64) (atMost, atLeast float64) {
	return tails(count, math.Floor(mean), math.Inf(1), func(j float64) *big.Float {
		return new(big.Float).Quo(exact(mean), exact(j+1))
	})
}

func binomialTails(positive, trials, share float64) (atMost, atLeast float64) {
	rest := new(big.Float).Sub(exact(1), exact(share))
	odds := new(big.Float).Quo(exact(share), rest)
	return tails(positive, math.Floor(trials*share), trials, func(j float64) *big.Float {
		r := new(big.Float).Quo(exact(trials-j), exact(j+1))
		return r.Mul(r, odds)
	})
}

var confidences = []float64{0.5, 0.8, 0.95, 0.99, 0.9999}

// The tails at the limits are what they are meant to be. A limit has 53 bits, which leaves of a tail about
// 1e-16 times the square root of the count times a few; so 1e-12 is asked for of the tail where it can be had.
func TestCountLimitsTails(t *testing.T) {
	for _, count := range []float64{0, 1, 2, 3, 5, 10, 15, 16, 17, 20, 50, 100, 137, 1000, 12345, 1e6, 99999999, 1e9} {
		for _, confidence := range confidences {
			if count > 1e6 && confidence != 0.9999 {
				continue // half a second each
			}
			want := (1 - confidence) / 2
			lower, upper := CountLimits(count, confidence)
			if atMost, _ := poissonTails(count, upper); math.Abs(atMost-want) > 1e-12 {
				t.Errorf("%g at %g: upper %.17g leaves %.15g, want %g", count, confidence, upper, atMost, want)
			}
			if count == 0 {
				continue
			}
			if _, atLeast := poissonTails(count, lower); math.Abs(atLeast-want) > 1e-12 {
				t.Errorf("%g at %g: lower %.17g leaves %.15g, want %g", count, confidence, lower, atLeast, want)
			}
		}
	}
}

// A limit near 1 has its last digit at 1e-16, which is worth up to trials times that of a tail.
func TestShareLimitsTails(t *testing.T) {
	for _, trials := range []float64{1, 2, 3, 10, 20, 33, 100, 1000, 12345, 1e6} {
		for _, share := range []float64{0, 1e-5, 0.01, 0.1, 0.5, 0.75, 0.999, 1} {
			positive := math.Round(share * trials)
			for _, confidence := range confidences {
				want := (1 - confidence) / 2
				tolerance := 1e-12
				if share > 0.9 {
					tolerance += trials * unit / 4
				}
				lower, upper := ShareLimits(positive, trials, confidence)
				if positive < trials {
					if atMost, _ := binomialTails(positive, trials, upper); math.Abs(atMost-want) > tolerance {
						t.Errorf("%g of %g at %g: upper %.17g leaves %.15g, want %g", positive, trials, confidence, upper, atMost, want)
					}
				}
				if positive > 0 {
					if _, atLeast := binomialTails(positive, trials, lower); math.Abs(atLeast-want) > tolerance {
						t.Errorf("%g of %g at %g: lower %.17g leaves %.15g, want %g", positive, trials, confidence, lower, atLeast, want)
					}
				}
			}
		}
	}
}

// Limits that have formulas of their own.
func TestLimitsClosedForms(t *testing.T) {
	same := func(what string, got, want float64) {
		t.Helper()
		if math.Abs(got-want) > 1e-13*math.Abs(want) {
			t.Errorf("%s: %.17g, want %.17g", what, got, want)
		}
	}
	for _, confidence := range append(confidences, 1e-6, 1-1e-12) {
		tail := (1 - confidence) / 2
		at := fmt.Sprintf(" at %g", confidence)
		lower, upper := CountLimits(0, confidence)
		same("upper of none"+at, upper, -math.Log(tail))
		same("lower of none"+at, lower, 0)
		lower, _ = CountLimits(1, confidence)
		same("lower of one"+at, lower, -math.Log1p(-tail))
		for _, n := range []float64{1, 10, 4321, 1e9, 1e12} {
			of := fmt.Sprintf(" of %g%s", n, at)
			lower, upper = ShareLimits(0, n, confidence)
			same("lower of none"+of, lower, 0)
			same("upper of none"+of, upper, -math.Expm1(math.Log(tail)/n))
			lower, upper = ShareLimits(n, n, confidence)
			same("lower of all"+of, lower, math.Exp(math.Log(tail)/n))
			same("upper of all"+of, upper, 1)
			lower, _ = ShareLimits(1, n, confidence)
			same("lower of one"+of, lower, -math.Expm1(math.Log1p(-tail)/n))
		}
	}
	if lower, upper := ShareLimits(0, 0, 0.95); lower != 0 || upper != 1 {
		t.Errorf("0 of 0: %g to %g", lower, upper)
	}
}

// Between whole numbers: the tails of shapes of a half have the complementary error function and a finite sum
// (DLMF 8.4.6 and 8.8.2); others are tried against gonum's quantiles, which are good to about 1e-8.
func TestCountLimitsBetween(t *testing.T) {
	half := func(shape, x float64) (upperTail float64) {
		upperTail = math.Erfc(math.Sqrt(x))
		for a := 0.5; a < shape; a++ {
			upperTail += math.Exp(a*math.Log(x) - x - logGamma(a+1))
		}
		return upperTail
	}
	for _, count := range []float64{0.5, 1.5, 2.5, 7.5, 20.5} {
		lower, upper := CountLimits(count, 0.95)
		if got := half(count, lower); math.Abs(got-0.975) > 1e-13 {
			t.Errorf("%g: lower %.17g leaves %.15g", count, lower, 1-got)
		}
		if got := half(count+1, upper); math.Abs(got-0.025) > 1e-13 {
			t.Errorf("%g: upper %.17g leaves %.15g", count, upper, got)
		}
	}
	for _, count := range []float64{0.9, 3.3, 15.99, 16.01, 77.7, 1234.5} {
		lower, upper := CountLimits(count, 0.9)
		wantLower := distuv.Gamma{Alpha: count, Beta: 1}.Quantile(0.05)
		wantUpper := distuv.Gamma{Alpha: count + 1, Beta: 1}.Quantile(0.95)
		if math.Abs(lower/wantLower-1) > 1e-8 || math.Abs(upper/wantUpper-1) > 1e-8 {
			t.Errorf("%g: %.12g to %.12g, want %.12g to %.12g", count, lower, upper, wantLower, wantUpper)
		}
	}
}

func logGamma(v float64) float64 {
	l, _ := math.Lgamma(v)
	return l
}

// The way from Newton's rule to the expansion is smooth: both sides agree to 1e-15 of the limit.
func TestManyCounts(t *testing.T) {
	for _, p := range []float64{0.25, 0.025, 0.00005} {
		for _, upper := range []bool{false, true} {
			below, above := gammaQuantile(math.Nextafter(manyCounts, 0), p, upper), gammaQuantile(manyCounts, p, upper)
			if math.Abs(above/below-1) > 1e-15 {
				t.Errorf("%g, upper %v: %.17g and %.17g", p, upper, below, above)
			}
		}
	}
}

// Tiny counts have tiny lower limits, down to 0 where a float64 ends: then x^a/Gamma(a+1) is all there is.
func TestCountLimitsTiny(t *testing.T) {
	for _, count := range []float64{0.3, 0.1, 0.02, 1e-3, 1e-9, 5e-324} {
		lower, upper := CountLimits(count, 0.95)
		want := math.Exp((math.Log(0.025) + logGamma(count+1)) / count)
		if math.Abs(lower-want) > 1e-4*want || !(upper >= -math.Log(0.025)*(1-1e-15) && upper < 5) {
			t.Errorf("%g: %g to %g, want %g", count, lower, upper, want)
		}
	}
}

func TestLimitsProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		confidence := rapid.Float64Range(0.01, 0.9999).Draw(t, "confidence")
		trials := math.Exp(rapid.Float64Range(-2, 16).Draw(t, "log trials"))
		if rapid.Bool().Draw(t, "whole") {
			trials = math.Ceil(trials)
		}
		positive := trials * rapid.Float64Range(0, 1).Draw(t, "share")
		lower, upper := ShareLimits(positive, trials, confidence)
		if !(0 <= lower && lower < upper && upper <= 1) {
			t.Fatalf("%g of %g at %g: %g to %g", positive, trials, confidence, lower, upper)
		}
		wider, wide := ShareLimits(positive, trials, (1+confidence)/2)
		if wider > lower || wide < upper {
			t.Fatalf("%g of %g: %g to %g are wider than %g to %g", positive, trials, lower, upper, wider, wide)
		}
		// Gamma limits: of more, larger.
		low, high := CountLimits(positive, confidence)
		lowNext, highNext := CountLimits(positive+1, confidence)
		if !(0 <= low && low < high && low < lowNext && high < highNext) {
			t.Fatalf("%g at %g: %g to %g, then %g to %g", positive, confidence, low, high, lowNext, highNext)
		}
		// A tail of the beta distribution by gonum, as good as it is.
		if positive > 0.01 && positive < trials && trials < 1e4 { // beyond, it is not
			got := distuv.Beta{Alpha: positive, Beta: trials - positive + 1}.CDF(lower)
			if want := (1 - confidence) / 2; math.Abs(got-want) > 1e-7 {
				t.Fatalf("%g of %g at %g: %g leaves %g", positive, trials, confidence, lower, got)
			}
		}
	})
}

func TestLimitsInvalid(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct{ count, confidence float64 }{
		{-1, 0.95}, {nan, 0.95}, {inf, 0.95}, {1, 0}, {1, 1}, {1, nan}, {1, -0.5}, {1, 95},
	} {
		if lower, upper := CountLimits(c.count, c.confidence); !math.IsNaN(lower) || !math.IsNaN(upper) {
			t.Errorf("%v: %g to %g", c, lower, upper)
		}
	}
	for _, c := range []struct{ positive, trials, confidence float64 }{
		{-1, 5, 0.95}, {6, 5, 0.95}, {nan, 5, 0.95}, {1, nan, 0.95}, {1, inf, 0.95}, {1, 2e12, 0.95}, {1, 5, 1}, {1, 5, 0},
	} {
		if lower, upper := ShareLimits(c.positive, c.trials, c.confidence); !math.IsNaN(lower) || !math.IsNaN(upper) {
			t.Errorf("%v: %g to %g", c, lower, upper)
		}
	}
}

func BenchmarkLimits(b *testing.B) {
	for _, n := range []float64{10, 1e4, 1e7, 1e9} {
		b.Run(fmt.Sprintf("count=%g", n), func(b *testing.B) {
			for b.Loop() {
				CountLimits(n, 0.95)
			}
		})
		b.Run(fmt.Sprintf("trials=%g", n), func(b *testing.B) {
			for b.Loop() {
				ShareLimits(n/2, n, 0.95)
			}
		})
	}
	b.Run("trials=1e12", func(b *testing.B) {
		for b.Loop() {
			ShareLimits(5e11, 1e12, 0.95)
		}
	})
}

package response

import (
	"math"
	"math/big"
	"testing"
)

// links are those that mixtures are of.
var links = []string{"identity", "log", "logit", "complementary-log-log"}

func mixed(link string, share, eta []float64) *Mixture {
	var m Mixture
	MixerOf(link).MixTo(&m, share, eta)
	return &m
}

// TestMixtureDerivatives holds the ratios against differences of one another.
func TestMixtureDerivatives(t *testing.T) {
	share := []float64{0.1, 0.35, 0.3, 0.25}
	for _, link := range links {
		for _, eta := range [][]float64{{-1, 0.3, 0.8, -0.2}, {-4, 1.5, -2, 0.7}, {-9, -8, -9.5, -12}, {1.2, 1.2, 1.2, 1.2}} {
			m := mixed(link, share, eta)
			for r := range eta {
				at := func(h float64) *Mixture {
					x := append([]float64(nil), eta...)
					x[r] += h
					return mixed(link, share, x)
				}
				slope := func(of func(m *Mixture) float64) float64 { // central differences, extrapolated
					const h = 1e-3
					d := func(h float64) float64 { return (of(at(h)) - of(at(-h))) / (2 * h) }
					return (4*d(h/2) - d(h)) / 3
				}
				check := func(what string, got, want float64) {
					t.Helper()
					if !(math.Abs(got-want) <= 1e-10*math.Max(1, math.Abs(want))) {
						t.Errorf("%s at %v, point %d: %s %.13g, differences say %.13g", link, eta, r, what, got, want)
					}
				}
				check("first", m.First[r], slope(func(m *Mixture) float64 { return m.Linear }))
				check("bend's slope", m.BendSlope*m.First[r], slope(func(m *Mixture) float64 { return m.Bend }))
				for q := range eta {
					first, second := m.Bend*m.First[q]*m.First[r], m.Bend*m.Second[q]*m.First[r]
					if q == r {
						first, second = first+m.Second[q], second+m.Third[q]
					}
					check("first's slope", first, slope(func(m *Mixture) float64 { return m.First[q] }))
					check("second's slope", second, slope(func(m *Mixture) float64 { return m.Second[q] }))
				}
			}
		}
	}
}

// TestMixtureFarOut holds linear predictors and first derivatives against numbers of 2400 bits where means round to 0 or 1,
// and asks for finite ones throughout.
func TestMixtureFarOut(t *testing.T) {
	share := []float64{0.25, 0.5, 0.25}
	for _, link := range links {
		for _, eta := range [][]float64{
			{-500, -499, -500.5}, {-500, -30, -31}, {-40, -20, 0}, {30, 31, 29.5}, {-30, 2, 3}, {0, 40, 80}, {490, 500, 495}, {-500, 500, 3}, {500, 500, 500},
		} {
			m := mixed(link, share, eta)
			for q, v := range append([]float64{m.Linear}, m.First...) {
				if bad(v) {
					t.Errorf("%s at %v: value %d is %v", link, eta, q, v)
				}
			}
			most := math.Max(eta[0], math.Max(eta[1], eta[2]))
			if link == "complementary-log-log" && most > 12 { // exp(-exp(eta)) is too small even for those
				continue
			}
			exact, slopes := whole(link, share, eta, m.Linear)
			if !(exact <= 4e-15*math.Max(1, math.Abs(m.Linear))) {
				t.Errorf("%s at %v: linear predictor %.16g is off by %.2g", link, eta, m.Linear, exact)
			}
			for q, p := range m.First {
				if !(math.Abs(p-slopes[q]) <= 2e-13*slopes[q]) {
					t.Errorf("%s at %v: derivative %d is %.16g, want %.16g", link, eta, q, p, slopes[q])
				}
			}
		}
	}
	// The row's number of events is that of its quietest point, to 1e-200 here.
	m := mixed("complementary-log-log", share, []float64{490, 480, 495})
	if !(math.Abs(m.Linear-480) < 1e-12) || !(math.Abs(m.First[1]-1) < 1e-12) || m.First[0] != 0 || m.Second[0] != 0 || m.Third[2] != 0 {
		t.Errorf("many events: %+v", m)
	}
}

// TestMixtureOfOnePoint is the point.
func TestMixtureOfOnePoint(t *testing.T) {
	for _, link := range links {
		for _, eta := range []float64{-500, -20, -1, 0, 0.5, 3, 30, 500} {
			m := mixed(link, []float64{1}, []float64{eta})
			if !(math.Abs(m.Linear-eta) <= 4e-15*math.Max(1, math.Abs(eta))) || !(math.Abs(m.First[0]-1) < 1e-14) {
				t.Errorf("%s at %v: %v, derivative %v", link, eta, m.Linear, m.First[0])
			}
		}
	}
}

func bad(v float64) bool { return math.IsNaN(v) || math.IsInf(v, 0) }

const bits = 2400

func number(v float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(v) }

// exponential returns exp(x): the series after 2^-n of the argument, squared n times.
func exponential(x *big.Float) *big.Float {
	const n = 40
	small := new(big.Float).SetPrec(bits).SetMantExp(x, -n)
	sum, term := number(1), number(1)
	for k := 1; k < 400; k++ {
		term.Mul(term, small)
		term.Quo(term, number(float64(k)))
		sum.Add(sum, term)
	}
	for range n {
		sum.Mul(sum, sum)
	}
	return sum
}

// inverse returns h and h' of a link.
func inverse(link string, eta float64) (h, slope *big.Float) {
	one, e := number(1), exponential(number(eta))
	sum := func(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Add(a, b) }
	times := func(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Mul(a, b) }
	switch link {
	case "identity":
		return number(eta), one
	case "log":
		return e, e
	case "logit":
		h = new(big.Float).SetPrec(bits).Quo(e, sum(one, e))
		return h, times(h, new(big.Float).SetPrec(bits).Sub(one, h))
	}
	q := exponential(new(big.Float).Neg(e))
	return new(big.Float).SetPrec(bits).Sub(one, q), times(e, q)
}

// whole returns by how much linear misses the mixture's linear predictor, and its first derivatives.
func whole(link string, share, eta []float64, linear float64) (miss float64, slopes []float64) {
	at, slope := inverse(link, linear)
	mean := number(0)
	var own []*big.Float
	for q, s := range share {
		h, d := inverse(link, eta[q])
		mean.Add(mean, new(big.Float).SetPrec(bits).Mul(number(s), h))
		own = append(own, new(big.Float).SetPrec(bits).Mul(number(s), d))
	}
	mean.Sub(mean, at)
	miss, _ = mean.Quo(mean, slope).Float64()
	for _, d := range own {
		v, _ := d.Quo(d, slope).Float64()
		slopes = append(slopes, v)
	}
	return math.Abs(miss), slopes
}

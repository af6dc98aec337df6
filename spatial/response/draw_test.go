package response

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// drawCase is a distribution at a linear predictor from which draws are made.
type drawCase struct {
	dist   Sampler
	eta    float64
	trials float64
	weight float64
	phi    float64
	// whole says that phi/weight is 1 or the distribution continuous, so that draws follow CDF; else only mean and variance
	// are as asked for.
	whole bool
}

func (c drawCase) String() string {
	name := c.dist.Name() + " " + c.dist.Link()
	if s, ok := c.dist.(Shaped); ok {
		name += fmt.Sprintf(" %g", s.Shape())
	}
	return fmt.Sprintf("%s eta=%.3g trials=%g weight=%g phi=%g", name, c.eta, c.trials, c.weight, c.phi)
}

// variance is phi V/w, written down anew from the definitions.
func (c drawCase) variance() float64 {
	mu, m, unit := c.dist.Mean(c.eta), c.trials, 1.0
	switch d := c.dist.(type) {
	case Poisson:
		unit = mu
	case NegativeBinomial:
		unit = mu + mu*mu/d.Theta
	case Binomial, BinomialCloglog:
		unit = m * mu * (1 - mu)
	case BetaBinomial:
		unit = m * mu * (1 - mu) * (1 + (m-1)*d.Correlation)
	case Gamma:
		unit = mu * mu
	case Tweedie:
		unit = math.Pow(mu, d.Power)
	}
	return c.phi * unit / c.weight
}

func drawCases() (list []drawCase) {
	one := func(d Sampler, mean, trials float64) {
		list = append(list, drawCase{d, d.Linear(mean), trials, 1, 1, true})
	}
	for _, w := range []float64{1, 0.2, 30} {
		list = append(list, drawCase{Gaussian{}, -3, 1, w, 2, true}, drawCase{GaussianLog{}, 1.2, 1, w, 2, true})
		for _, phi := range []float64{0.001, 0.3, 4} {
			for _, eta := range []float64{-20, 0.5, 20} {
				list = append(list, drawCase{Gamma{}, eta, 1, w, phi, true})
			}
		}
	}
	for _, mean := range []float64{0.01, 0.7, 9.9, 10, 10.1, 37, 1e3, 1e5} {
		one(Poisson{}, mean, 1)
		for _, theta := range []float64{0.1, 2, 50, 1e7} {
			one(NegativeBinomial{Theta: theta}, mean, 1)
		}
	}
	for _, m := range []float64{1, 2, 19, 20, 40, 1000, 1e5} {
		for _, p := range []float64{0.002, 0.26, 0.5, 0.9} {
			one(Binomial{}, p, m)
			one(BinomialCloglog{}, p, m)
			if m <= 1000 {
				for _, rho := range []float64{1e-7, 0.02, 0.3, 0.9} {
					one(BetaBinomial{Correlation: rho}, p, m)
				}
			}
		}
	}
	for _, power := range []float64{1.05, 1.5, 1.9} {
		for _, phi := range []float64{0.2, 3} {
			for _, eta := range []float64{-1, 2} {
				list = append(list, drawCase{Tweedie{Power: power}, eta, 1, 1, phi, true}, drawCase{Tweedie{Power: power}, eta, 1, 2.5, phi, true})
			}
		}
	}
	for _, scale := range [][2]float64{{3, 1}, {0.4, 1}, {1, 2.4}, {7.5, 1}, {30, 1}} { // weight and phi
		list = append(list, drawCase{Poisson{}, 1.5, 1, scale[0], scale[1], false}, drawCase{NegativeBinomial{Theta: 2}, 1.5, 1, scale[0], scale[1], false},
			drawCase{Binomial{}, -1, 40, scale[0], scale[1], false}, drawCase{BinomialCloglog{}, -1, 40, scale[0], scale[1], false},
			drawCase{BetaBinomial{Correlation: 0.1}, -1, 40, scale[0], scale[1], false})
	}
	return list
}

// TestDraws compares draws with the mean and variance by the definitions, and by the distance of Kolmogorov with the
// distribution function, which is tested elsewhere: for the discrete ones a uniform number places a draw between P(Y < y)
// and P(Y <= y) (Dunn & Smyth 1996), so that the places are uniform. With 3000 draws sqrt(n) times the distance exceeds
// 2.2 in one of 8000 cases (Kolmogorov 1933), a mean is off by 5 standard errors in less; the seed is fixed.
func TestDraws(t *testing.T) {
	const n = 3000
	for k, c := range drawCases() {
		t.Run(c.String(), func(t *testing.T) {
			random := rand.New(rand.NewPCG(11, uint64(k)))
			place := make([]float64, n)
			var mean, square, fourth float64
			want, variance := c.dist.Mean(c.eta)*c.trials, c.variance()
			for i := range place {
				o := Obs{Y: math.NaN(), Trials: c.trials, Weight: c.weight}
				o.Y = c.dist.Draw(random, o, c.eta, c.phi)
				if wholeNumbers := c.dist.Name() == "negative-binomial" || c.dist.Name() == "beta-binomial"; wholeNumbers && o.Y != math.Round(o.Y) {
					t.Fatalf("%g is no whole number", o.Y)
				}
				z := (o.Y - want) / math.Sqrt(variance)
				mean += z / n
				square += z * z / n
				fourth += z * z * z * z / n
				if c.whole {
					below, upTo := c.dist.CDF(o, c.eta, c.phi)
					place[i] = below + (upTo-below)*random.Float64()
				}
			}
			if math.Abs(mean) > 5/math.Sqrt(n) {
				t.Errorf("mean off by %.3g standard deviations", mean)
			}
			// Heavy tails have no stable standard error of the variance; the distance below sees them.
			most := 1.0
			if name := c.dist.Name(); !c.whole && (name == "negative-binomial" || name == "beta-binomial") {
				most += 0.25 / variance // what rounding adds
			}
			if se := math.Sqrt(math.Max(fourth-square*square, 1e-6) / n); fourth < 100 && (square < 1-5*se || square > most+5*se) {
				t.Errorf("variance %.4g times what it should be, standard error %.2g", square, se)
			}
			if c.whole {
				if d := distance(place) * math.Sqrt(n); d > 2.2 {
					t.Errorf("distance %.3g/sqrt(n) from the distribution function", d)
				}
			}
		})
	}
}

// distance is Kolmogorov's between a sample and the uniform distribution. It sorts the sample.
func distance(u []float64) (d float64) {
	slices.Sort(u)
	n := float64(len(u))
	for i, v := range u {
		d = math.Max(d, math.Max(v-float64(i)/n, float64(i+1)/n-v))
	}
	return d
}

// TestDrawsOfLargeNumbers compares counts of a mean up to 1e9 and numbers positive of up to 1e7 trials with the normal
// distribution: their skewness is below 0.001, so that the distance between the two is below 0.0002 (common practice, no
// source), a fiftieth of what is allowed.
func TestDrawsOfLargeNumbers(t *testing.T) {
	const n = 20000
	for k, c := range []drawCase{
		{dist: Poisson{}, eta: math.Log(1e7), trials: 1, weight: 1, phi: 1},
		{dist: Poisson{}, eta: math.Log(1e9), trials: 1, weight: 1, phi: 1},
		{dist: Poisson{}, eta: math.Log(1e9), trials: 1, weight: 1e4, phi: 1},
		{dist: Poisson{}, eta: math.Log(1e16), trials: 1, weight: 1, phi: 1},
		{dist: NegativeBinomial{Theta: 1e7}, eta: math.Log(1e9), trials: 1, weight: 1, phi: 1},
		{dist: Binomial{}, eta: 0, trials: 1e7, weight: 1, phi: 1},
		{dist: Binomial{}, eta: 2.5, trials: 1e7, weight: 1, phi: 1},
		{dist: BinomialCloglog{}, eta: -1, trials: 1e7, weight: 1, phi: 1},
		{dist: BetaBinomial{Correlation: 1e-6}, eta: -1, trials: 1e7, weight: 1, phi: 1},
		{dist: Tweedie{Power: 1.5}, eta: 20, trials: 1, weight: 1, phi: 0.01},
		{dist: Gamma{}, eta: 200, trials: 1, weight: 1, phi: 1e-8},
	} {
		t.Run(c.String(), func(t *testing.T) {
			random := rand.New(rand.NewPCG(12, uint64(k)))
			want, deviation := c.dist.Mean(c.eta)*c.trials, math.Sqrt(c.variance())
			place := make([]float64, n)
			for i := range place {
				y := c.dist.Draw(random, Obs{Trials: c.trials, Weight: c.weight}, c.eta, c.phi)
				place[i] = distuv.UnitNormal.CDF((y - want) / deviation)
			}
			if d := distance(place) * math.Sqrt(n); d > 2.2 {
				t.Errorf("distance %.3g/sqrt(n) from the normal distribution", d)
			}
		})
	}
}

// TestSmallCountsByChiSquared compares the frequencies of single counts with their probabilities where each is expected at
// least five times (Pearson 1900), around the means at which the algorithms change.
func TestSmallCountsByChiSquared(t *testing.T) {
	const n = 40000
	for k, c := range []drawCase{
		{dist: Poisson{}, eta: math.Log(9.99), trials: 1}, {dist: Poisson{}, eta: math.Log(10), trials: 1}, {dist: Poisson{}, eta: math.Log(60), trials: 1},
		{dist: NegativeBinomial{Theta: 1.5}, eta: 2, trials: 1},
		{dist: Binomial{}, eta: 0, trials: 19}, {dist: Binomial{}, eta: 0, trials: 20}, {dist: Binomial{}, eta: 1, trials: 300},
		{dist: BinomialCloglog{}, eta: 0.5, trials: 60}, {dist: BetaBinomial{Correlation: 0.2}, eta: -1, trials: 25},
	} {
		t.Run(c.String(), func(t *testing.T) {
			random := rand.New(rand.NewPCG(13, uint64(k)))
			seen := map[float64]float64{}
			for i := 0; i < n; i++ {
				seen[c.dist.Draw(random, Obs{Trials: c.trials, Weight: 1}, c.eta, 1)]++
			}
			var square, cells, rest, others float64 = 0, 0, n, n
			for y := 0.0; y < 400 && (c.dist.Name() == "poisson" || c.dist.Name() == "negative-binomial" || y <= c.trials); y++ {
				expected := n * math.Exp(c.dist.LogLikelihood(Obs{Y: y, Trials: c.trials, Weight: 1}, c.eta, 1))
				if expected < 5 {
					continue
				}
				square += (seen[y] - expected) * (seen[y] - expected) / expected
				cells++
				rest -= expected
				others -= seen[y]
			}
			if rest >= 5 {
				square += (others - rest) * (others - rest) / rest
				cells++
			}
			if p := (distuv.ChiSquared{K: cells - 1}).Survival(square); p < 1e-4 {
				t.Errorf("chi-squared %.1f in %g cells: p = %.2g", square, cells, p)
			}
		})
	}
}

// TestDrawsAtTheEdges: what a draw is where parameters leave nothing to chance, and that it is always what the
// distribution can give.
func TestDrawsAtTheEdges(t *testing.T) {
	random := rand.New(rand.NewPCG(14, 1))
	o := Obs{Trials: 7, Weight: 1}
	for i := 0; i < 200; i++ {
		for _, c := range []struct {
			got, want float64
		}{
			{Poisson{}.Draw(random, o, -800, 1), 0},
			{NegativeBinomial{Theta: 1e-3}.Draw(random, o, -800, 1), 0},
			{Binomial{}.Draw(random, o, -800, 1), 0},
			{Binomial{}.Draw(random, o, 800, 1), 7},
			{BinomialCloglog{}.Draw(random, o, 10, 1), 7},
			{BetaBinomial{Correlation: 0.5}.Draw(random, o, 800, 1), 7},
			{Tweedie{Power: 1.5}.Draw(random, o, -200, 1), 0},
		} {
			if c.got != c.want {
				t.Errorf("got %g, want %g", c.got, c.want)
			}
		}
		if y := (BetaBinomial{Correlation: 0.9}).Draw(random, Obs{Trials: 7, Weight: 1e-3}, 0.2, 1); y != 0 && y != 7 {
			t.Errorf("a variance out of reach: got %g", y)
		}
		if y := (Gamma{}).Draw(random, o, 0, 1e5); !(y > 0) {
			t.Errorf("gamma: got %g", y)
		}
		if y := (Binomial{}).Draw(random, Obs{Trials: 3, Weight: 2.7}, 5, 1); !(y >= 0 && y <= 3) {
			t.Errorf("a share of more trials: got %g", y)
		}
		if y := (BetaBinomial{Correlation: 0.2}).Draw(random, o, math.NaN(), 1); !math.IsNaN(y) {
			t.Errorf("nothing to draw from: got %g", y)
		}
	}
}

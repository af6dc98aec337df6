package response

import (
	"encoding/csv"
	"encoding/json"
	"flag"
	"fmt"
	"math"
	"os"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
	"pgregory.net/rapid"
)

// Property tests draw the same cases in every run unless -rapid.seed says otherwise.
func init() { flag.Set("rapid.seed", "20250101") }

var all = []Distribution{Gaussian{}, GaussianLog{}, Poisson{}, Binomial{}}

func name(d Distribution) string { return d.Name() + " " + d.Link() }

// close fails unless got is within tol of want, relative where want is larger than one.
func close(t rapid.TB, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol*math.Max(1, math.Abs(want))) && got != want {
		t.Errorf("%s: got %.17g, want %.17g", what, got, want)
	}
}

// drawn is an observation the distribution can give, with a linear predictor where nothing overflows.
func drawn(t *rapid.T, d Distribution) (o Obs, eta, phi float64) {
	o = Obs{Trials: 1, Weight: rapid.Float64Range(0.1, 5).Draw(t, "weight")}
	eta, phi = rapid.Float64Range(-5, 5).Draw(t, "eta"), 1
	switch d.Name() {
	case "gaussian":
		o.Y, phi = rapid.Float64Range(-10, 10).Draw(t, "y"), rapid.Float64Range(0.01, 20).Draw(t, "phi")
	case "poisson":
		o.Y = float64(rapid.IntRange(0, 60).Draw(t, "y"))
	case "binomial":
		m := rapid.IntRange(1, 60).Draw(t, "trials")
		o.Trials, o.Y = float64(m), float64(rapid.IntRange(0, m).Draw(t, "y"))
	}
	return o, eta, phi
}

// TestLikelihoodAndCDFAgreeWithGonum compares with gonum's distuv, and the discrete distribution functions also with
// the plain sum of probabilities.
func TestLikelihoodAndCDFAgreeWithGonum(t *testing.T) {
	for _, d := range all {
		t.Run(name(d), rapid.MakeCheck(func(t *rapid.T) {
			o, eta, phi := drawn(t, d)
			below, upTo := d.CDF(o, eta, phi)
			switch d.Name() {
			case "gaussian":
				n := distuv.Normal{Mu: d.Mean(eta), Sigma: math.Sqrt(phi / o.Weight)}
				close(t, "log-likelihood", d.LogLikelihood(o, eta, phi), n.LogProb(o.Y), 1e-12)
				close(t, "saturated", d.Saturated(o, phi), n.LogProb(n.Mu), 1e-12)
				close(t, "distribution function", upTo, n.CDF(o.Y), 1e-14)
				close(t, "distribution function below", below, upTo, 0)
			case "poisson":
				p := distuv.Poisson{Lambda: math.Exp(eta)}
				close(t, "log-likelihood", d.LogLikelihood(o, eta, phi), o.Weight*p.LogProb(o.Y), 1e-12)
				if o.Y > 0 {
					close(t, "saturated", d.Saturated(o, phi), o.Weight*distuv.Poisson{Lambda: o.Y}.LogProb(o.Y), 1e-12)
				}
				close(t, "distribution function", upTo, p.CDF(o.Y), 1e-12)
				close(t, "sum of probabilities", upTo, sum(p.Prob, o.Y), 1e-12)
				close(t, "sum of probabilities below", below, sum(p.Prob, o.Y-1), 1e-12)
			case "binomial":
				b := distuv.Binomial{N: o.Trials, P: d.Mean(eta)}
				close(t, "log-likelihood", d.LogLikelihood(o, eta, phi), o.Weight*b.LogProb(o.Y), 1e-11)
				if o.Y > 0 && o.Y < o.Trials {
					close(t, "saturated", d.Saturated(o, phi), o.Weight*distuv.Binomial{N: o.Trials, P: o.Y / o.Trials}.LogProb(o.Y), 1e-11)
				}
				close(t, "distribution function", upTo, b.CDF(o.Y), 1e-12)
				close(t, "sum of probabilities", upTo, sum(b.Prob, o.Y), 1e-11)
				close(t, "sum of probabilities below", below, sum(b.Prob, o.Y-1), 1e-11)
			}
		}))
	}
	// One mean for one observation certain to happen.
	close(t, "no count expected", Poisson{}.Saturated(Obs{Weight: 1}, 1), 0, 0)
	close(t, "all positive", Binomial{}.Saturated(Obs{Y: 3, Trials: 3, Weight: 1}, 1), 0, 1e-14)
}

func sum(prob func(float64) float64, upTo float64) (s float64) {
	for k := 0.0; k <= upTo; k++ {
		s += prob(k)
	}
	return s
}

// TestReferenceDistributions holds the rows of the shared reference that belong to distributions at hand: scipy's
// distribution functions and densities (testdata/reference/scoring, tolerances as stated there).
func TestReferenceDistributions(t *testing.T) {
	const dir = "../../testdata/reference/scoring/"
	f, err := os.Open(dir + "distributions.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	raw, err := os.ReadFile(dir + "distributions.json")
	if err != nil {
		t.Fatal(err)
	}
	var want struct {
		Below      []float64 `json:"cdf_below"`
		UpTo       []float64 `json:"cdf"`
		LogDensity []float64 `json:"log_density"`
		Deviance   []float64 `json:"unit_deviance"`
	}
	if err := json.Unmarshal(raw, &want); err != nil {
		t.Fatal(err)
	}
	seen := map[string]int{}
	for i, r := range rows[1:] {
		var d Distribution
		for _, own := range []Distribution{Gaussian{}, Poisson{}, Binomial{}} {
			if own.Name() == r[0] {
				d = own
			}
		}
		if d == nil {
			continue
		}
		seen[r[0]]++
		number := func(k int) float64 {
			v, err := strconv.ParseFloat(r[k], 64)
			if err != nil {
				t.Fatal(err)
			}
			return v
		}
		o, mean, phi := Obs{Y: number(1), Trials: 1, Weight: 1}, number(2), number(3)
		if r[0] == "binomial" {
			o.Trials = number(5)
			mean /= o.Trials
		}
		eta := d.Linear(mean)
		what := func(s string) string { return fmt.Sprintf("row %d, %s: %s", i+1, r[0], s) }
		below, upTo := d.CDF(o, eta, phi)
		close(t, what("P(Y < y)"), below, want.Below[i], 1e-10)
		close(t, what("P(Y <= y)"), upTo, want.UpTo[i], 1e-10)
		close(t, what("log density"), d.LogLikelihood(o, eta, phi), want.LogDensity[i], 1e-9)
		close(t, what("unit deviance"), d.At(o, eta).Deviance, want.Deviance[i], 1e-10)
	}
	if seen["gaussian"] == 0 || seen["poisson"] == 0 || seen["binomial"] == 0 {
		t.Errorf("rows of each distribution: %v", seen)
	}
}

// TestDevianceIsTwiceTheLikelihoodLost checks that -deviance/(2 phi) is the log-likelihood minus the saturated one, and
// that no mean does better than the observation's own.
func TestDevianceIsTwiceTheLikelihoodLost(t *testing.T) {
	for _, d := range all {
		t.Run(name(d), rapid.MakeCheck(func(t *rapid.T) {
			o, eta, phi := drawn(t, d)
			dev, l, sat := d.At(o, eta).Deviance, d.LogLikelihood(o, eta, phi), d.Saturated(o, phi)
			size := math.Abs(l) + math.Abs(sat) + dev/phi
			if !(math.Abs(l-sat+dev/(2*phi)) <= 1e-12*(1+size)) {
				t.Errorf("log-likelihood %.15g, saturated %.15g, deviance %.15g at phi %g", l, sat, dev, phi)
			}
			if !(sat >= l-1e-12*(1+size)) || dev < -1e-12*(1+size) {
				t.Errorf("the saturated log-likelihood %.15g is below %.15g", sat, l)
			}
		}))
	}
}

// TestDerivatives compares score and weights with central differences, one extrapolation each.
func TestDerivatives(t *testing.T) {
	for _, d := range all {
		t.Run(name(d), rapid.MakeCheck(func(t *rapid.T) {
			o, eta, _ := drawn(t, d)
			eta = math.Min(eta, 3)
			at := func(h float64) Point { return d.At(o, eta+h) }
			p := at(0)
			size := 1 + p.Deviance + math.Abs(p.Score) + math.Abs(p.Weight)
			near := func(what string, got, want float64) {
				t.Helper()
				if !(math.Abs(got-want) <= 1e-8*size) {
					t.Errorf("%s of %+v at %g: %.12g, differences say %.12g", what, o, eta, got, want)
				}
			}
			near("score", p.Score, -slope(func(h float64) float64 { return at(h).Deviance })/2)
			near("weight", p.Weight, -slope(func(h float64) float64 { return at(h).Score }))
			near("slope", p.Slope, slope(func(h float64) float64 { return at(h).Weight }))
			near("slope of the expected weight", p.ExpectedSlope, slope(func(h float64) float64 { return at(h).Expected }))
			near("slope of the mean", d.MeanSlope(eta), slope(func(h float64) float64 { return d.Mean(eta + h) }))
			near("link of the mean", d.Linear(d.Mean(eta)), eta)
			if p.Expected < 0 {
				t.Errorf("an expected weight of %g", p.Expected)
			}
		}))
	}
}

// slope returns f'(0) by central differences.
func slope(f func(h float64) float64) float64 {
	central := func(h float64) float64 { return (f(h) - f(-h)) / (2 * h) }
	const h = 1e-3
	return (4*central(h/2) - central(h)) / 3
}

// TestExpectedWeightIsTheMeanOfTheObservedOne sums over the outcomes, or integrates over them.
func TestExpectedWeightIsTheMeanOfTheObservedOne(t *testing.T) {
	for _, eta := range []float64{-3, -0.4, 0, 1.3, 2.5} {
		for _, d := range all {
			o := Obs{Trials: 1, Weight: 1.7}
			var mean, score float64
			add := func(prob float64) {
				p := d.At(o, eta)
				mean += prob * p.Weight
				score += prob * p.Score
			}
			switch d.Name() {
			case "gaussian":
				n := distuv.Normal{Mu: d.Mean(eta), Sigma: 0.8}
				const h = 0.01
				for z := -10.0; z <= 10; z += h { // the trapezium rule is exact to rounding here
					o.Y = n.Mu + z*n.Sigma
					add(distuv.UnitNormal.Prob(z) * h)
				}
			case "poisson":
				for k := 0.0; k < 200; k++ {
					o.Y = k
					add(distuv.Poisson{Lambda: math.Exp(eta)}.Prob(k))
				}
			case "binomial":
				o.Trials = 23
				for k := 0.0; k <= o.Trials; k++ {
					o.Y = k
					add(distuv.Binomial{N: o.Trials, P: d.Mean(eta)}.Prob(k))
				}
			}
			want := d.At(o, eta).Expected
			close(t, fmt.Sprintf("%s at %g: mean of the weights", name(d), eta), mean, want, 1e-11)
			close(t, fmt.Sprintf("%s at %g: mean of the scores", name(d), eta), score, 0, 1e-10)
		}
	}
}

// TestPearsonIsTheSquaredResidualOverTheVariance takes the variances from gonum's distuv.
func TestPearsonIsTheSquaredResidualOverTheVariance(t *testing.T) {
	for _, d := range all {
		t.Run(name(d), rapid.MakeCheck(func(t *rapid.T) {
			o, eta, _ := drawn(t, d)
			mean, variance := d.Mean(eta), 1.0
			switch d.Name() {
			case "poisson":
				variance = distuv.Poisson{Lambda: mean}.Variance()
			case "binomial":
				b := distuv.Binomial{N: o.Trials, P: mean}
				mean, variance = b.Mean(), b.Variance()
			}
			close(t, "Pearson", d.Pearson(o, eta), o.Weight*(o.Y-mean)*(o.Y-mean)/variance, 1e-11)
		}))
	}
}

// TestExtremePredictorsGiveNoNaN goes where means overflow, underflow or round to 0 and 1.
func TestExtremePredictorsGiveNoNaN(t *testing.T) {
	for _, d := range all {
		for _, y := range []float64{0, 1, 3, 7} {
			for _, eta := range []float64{-800, -746, -700, -40, 40, 350, 700, 710, 800} {
				o := Obs{Y: y, Trials: 1, Weight: 2}
				if d.Name() == "binomial" {
					o.Trials = 7
				}
				p := d.At(o, eta)
				if math.IsNaN(p.Deviance) || p.Deviance < 0 {
					t.Errorf("%s, y = %g, eta = %g: deviance %g", name(d), y, eta, p.Deviance)
				}
				if l := d.LogLikelihood(o, eta, 1.3); math.IsNaN(l) || l > d.Saturated(o, 1.3)+1e-12 {
					t.Errorf("%s, y = %g, eta = %g: log-likelihood %g, saturated %g", name(d), y, eta, l, d.Saturated(o, 1.3))
				}
				below, upTo := d.CDF(o, eta, 1.3)
				if !(0 <= below && below <= upTo && upTo <= 1) {
					t.Errorf("%s, y = %g, eta = %g: distribution function %g, %g", name(d), y, eta, below, upTo)
				}
				if r := d.Pearson(o, eta); math.IsNaN(r) || r < 0 {
					t.Errorf("%s, y = %g, eta = %g: Pearson %g", name(d), y, eta, r)
				}
				if math.Abs(eta) <= 350 && (p.Score != p.Score || p.Weight != p.Weight || p.Slope != p.Slope || p.Expected != p.Expected) {
					t.Errorf("%s, y = %g, eta = %g: %+v", name(d), y, eta, p)
				}
			}
		}
	}
	// A count of 3 where almost none is expected: the deviance is 2 (3 log(3/mu) - 3 + mu), finite while mu is a number.
	close(t, "deviance far out", Poisson{}.At(Obs{Y: 3, Weight: 1}, -700).Deviance, 2*(3*(math.Log(3)+700)-3), 1e-14)
}

// TestStartsLieInsideTheDomain checks that iterations can begin at any observation.
func TestStartsLieInsideTheDomain(t *testing.T) {
	for _, d := range all {
		t.Run(name(d), rapid.MakeCheck(func(t *rapid.T) {
			o, _, _ := drawn(t, d)
			overall := 0.37
			if eta := d.Linear(d.Start(o, overall)); math.IsNaN(eta) || math.IsInf(eta, 0) {
				t.Errorf("start of %+v is %g, with predictor %g", o, d.Start(o, overall), eta)
			}
		}))
	}
}

func TestNewNamesWhatThereIs(t *testing.T) {
	for _, d := range all {
		got, err := New(d.Name(), d.Link())
		if err != nil || got != d {
			t.Errorf("New(%q, %q) = %v, %v", d.Name(), d.Link(), got, err)
		}
	}
	for _, n := range Names() {
		d, err := New(n, "")
		if err != nil || d.Link() != Links(n)[0] {
			t.Errorf("%s without a link: %v, %v", n, d, err)
		}
	}
	for request, want := range map[[2]string]string{
		{"cauchy", ""}:          `there is no distribution "cauchy": choose gaussian, poisson, negative-binomial, binomial, beta-binomial, gamma or tweedie`,
		{"", "log"}:             `there is no distribution "": choose gaussian, poisson, negative-binomial, binomial, beta-binomial, gamma or tweedie`,
		{"poisson", "identity"}: `distribution poisson has no link "identity": it takes [log]`,
		{"gaussian", "logit"}:   `distribution gaussian has no link "logit": it takes [identity log]`,
	} {
		if _, err := New(request[0], request[1]); err == nil || err.Error() != want {
			t.Errorf("New(%q) says %v, want %s", request, err, want)
		}
	}
}

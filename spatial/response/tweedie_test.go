package response

import (
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"
	"pgregory.net/rapid"
)

var (
	_ Shaped    = Tweedie{}
	_ Dispersed = Tweedie{}
)

var tweediePowers = []float64{1.01, 1.03, 1.2, 1.37, 1.5, 1.66, 1.85, 1.99}

const referenceFolder = "../../testdata/reference/"

func readTable(t *testing.T, file string) []map[string]string {
	t.Helper()
	f, err := os.Open(referenceFolder + file)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	table := make([]map[string]string, len(rows)-1)
	for i, r := range rows[1:] {
		table[i] = map[string]string{}
		for k, name := range rows[0] {
			table[i][name] = r[k]
		}
	}
	return table
}

func readNumber(t *testing.T, text string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func readExpected(t *testing.T, file string, into any) {
	t.Helper()
	raw, err := os.ReadFile(referenceFolder + file)
	if err == nil {
		err = json.Unmarshal(raw, into)
	}
	if err != nil {
		t.Fatal(err)
	}
}

// TestTweedieReferenceDistributions holds the compound sums of testdata/reference/scoring, to the tolerances stated
// there.
func TestTweedieReferenceDistributions(t *testing.T) {
	var want struct {
		Below      []float64 `json:"cdf_below"`
		UpTo       []float64 `json:"cdf"`
		LogDensity []float64 `json:"log_density"`
		Deviance   []float64 `json:"unit_deviance"`
		Variance   []float64
	}
	readExpected(t, "scoring/distributions.json", &want)
	seen := 0
	for i, row := range readTable(t, "scoring/distributions.csv") {
		if row["distribution"] != "tweedie" {
			continue
		}
		seen++
		d := Tweedie{Power: readNumber(t, row["power"])}
		o, phi := Obs{Y: readNumber(t, row["y"]), Trials: 1, Weight: 1}, readNumber(t, row["phi"])
		mean := readNumber(t, row["mean"])
		eta := d.Linear(mean)
		below, upTo := d.CDF(o, eta, phi)
		if o.Y > 0 {
			close(t, fmt.Sprintf("row %d: P(Y < y)", i+1), below, want.Below[i], 1e-10)
		} else if below != 0 {
			t.Errorf("row %d: P(Y < 0) = %g", i+1, below)
		}
		close(t, fmt.Sprintf("row %d: P(Y <= y)", i+1), upTo, want.UpTo[i], 1e-10)
		close(t, fmt.Sprintf("row %d: log density", i+1), d.LogLikelihood(o, eta, phi), want.LogDensity[i], 1e-9)
		close(t, fmt.Sprintf("row %d: unit deviance", i+1), d.At(o, eta).Deviance, want.Deviance[i], 1e-10)
		variance := (o.Y - mean) * (o.Y - mean) * phi / want.Variance[i]
		close(t, fmt.Sprintf("row %d: Pearson", i+1), d.Pearson(o, eta), variance, 1e-12)
	}
	if seen != 9 {
		t.Errorf("%d rows of tweedie, not 9", seen)
	}
}

// TestTweedieReferenceGLM puts the reference's coefficients (testdata/reference/glm: statsmodels, IRLS) into the score
// equations, and compares deviance and Pearson's sum there.
func TestTweedieReferenceGLM(t *testing.T) {
	var want struct {
		Fits map[string]struct {
			Names        []string
			Coefficients []float64
			Deviance     float64
			Pearson      float64 `json:"pearson_chi2"`
			Scale        float64
			Se           []float64
		}
	}
	readExpected(t, "glm/expected.json", &want)
	fit := want.Fits["tweedie"]
	d := Tweedie{Power: 1.5}
	score := make([]float64, len(fit.Names))
	var deviance, pearson float64
	for _, row := range readTable(t, "glm/data.csv") {
		x := []float64{1, readNumber(t, row["x1"]), readNumber(t, row["x2"]), 0, 0}
		switch row["group"] {
		case "b":
			x[3] = 1
		case "c":
			x[4] = 1
		}
		var eta float64
		for k, b := range fit.Coefficients {
			eta += b * x[k]
		}
		o := Obs{Y: readNumber(t, row["rainfall"]), Trials: 1, Weight: 1}
		p := d.At(o, eta)
		deviance += p.Deviance
		pearson += d.Pearson(o, eta)
		for k := range score {
			score[k] += x[k] * p.Score
		}
	}
	for k, name := range fit.Names {
		// The coefficients are good to 1e-9, and the information per unit of a coefficient is scale/se^2.
		if limit := 1e-9 * fit.Scale / (fit.Se[k] * fit.Se[k]); !(math.Abs(score[k]) < limit) {
			t.Errorf("score of %s: %g, above %g", name, score[k], limit)
		}
	}
	close(t, "deviance", deviance, fit.Deviance, 1e-10)
	close(t, "Pearson", pearson, fit.Pearson, 1e-10)
}

// TestTweedieReferencePenalised computes the log-likelihood with all constants, the deviance and Pearson's dispersion of
// the fits of testdata/reference/penalised_tweedie from their linear predictors. The file's likelihoods agree with a
// Bessel form and a compound sum to 4e-13 relative.
func TestTweedieReferencePenalised(t *testing.T) {
	type fit struct {
		Phi, Loglik, Deviance, Power, Edf float64
		Dispersion                        float64   `json:"pearson_dispersion"`
		Linear                            []float64 `json:"linear_predictor"`
	}
	var want struct {
		Fixed     fit
		Fisher    fit `json:"optimum_fisher"`
		Observed  fit `json:"optimum_observed"`
		Power     float64
		Estimated struct {
			Fisher   fit `json:"optimum_fisher"`
			Observed fit `json:"optimum_observed"`
		} `json:"power_estimated"`
	}
	readExpected(t, "penalised_tweedie/expected.json", &want)
	rows := readTable(t, "penalised_tweedie/data.csv")
	for name, f := range map[string]fit{
		"fixed": want.Fixed, "fisher": want.Fisher, "observed": want.Observed,
		"power estimated, fisher": want.Estimated.Fisher, "power estimated, observed": want.Estimated.Observed,
	} {
		if f.Power == 0 {
			f.Power = want.Power
		}
		d := Tweedie{Power: f.Power}
		var likelihood, deviance, pearson float64
		for i, row := range rows {
			o := Obs{Y: readNumber(t, row["z"]), Trials: 1, Weight: 1}
			likelihood += d.LogLikelihood(o, f.Linear[i], f.Phi)
			deviance += d.At(o, f.Linear[i]).Deviance
			pearson += d.Pearson(o, f.Linear[i])
		}
		close(t, name+": log-likelihood", likelihood, f.Loglik, 1e-11)
		close(t, name+": deviance", deviance, f.Deviance, 1e-11)
		close(t, name+": dispersion", pearson/(float64(len(rows))-f.Edf), f.Dispersion, 1e-10)
	}
}

// inverted returns the density at y > 0 by numerical inversion of the transform of a Poisson sum of gamma portions,
// exp(lambda ((1 - g s)^-a - 1)). The contour 1 - g s = c (1 + i x/2)^2 goes through the saddle and round the cut; along
// it the trapezium rule converges geometrically. The density is exp(scale) value, value being a sum of terms up to 1.
func inverted(y, mean, phi, power float64) (value, scale float64) {
	lambda := math.Pow(mean, 2-power) / (phi * (2 - power))
	a, g := (2-power)/(power-1), phi*(power-1)*math.Pow(mean, power-1)
	c := math.Pow(mean/y, power-1)
	exponent := func(v complex128) complex128 {
		b := complex(c, 0) * v // 1 - g s
		return complex(lambda, 0)*(cmplx.Exp(complex(-a, 0)*cmplx.Log(b))-1) - (1-b)*complex(y/g, 0)
	}
	top := real(exponent(1))
	width := 1 / math.Sqrt(lambda*math.Pow(c, -a)*a*(1+a))
	h := math.Min(width/8, 0.05/(1+a))
	var sum float64
	for k := 0.0; ; k++ {
		w := complex(1, k*h/2)
		term := real(cmplx.Exp(exponent(w*w)-complex(top, 0)) * w) // dv = i w dx
		if k == 0 {
			term /= 2
		}
		sum += term
		x := k * h
		if x > 12*width && c*y/g*x*x/4 > 45 { // the gamma part falls as exp(-c y/g x^2/4)
			break
		}
	}
	return sum * h / math.Pi, top + math.Log(c/g)
}

// TestTweedieDensityByInversion compares with the numerical inversion, which knows no series, over powers and sizes on
// either side of the change to the saddlepoint form.
func TestTweedieDensityByInversion(t *testing.T) {
	compared := 0
	for _, power := range tweediePowers {
		d := Tweedie{Power: power}
		for _, mean := range []float64{0.02, 1, 300} {
			for _, size := range []float64{0.3, 2, 20, 63, 66, 250, 3000} {
				phi := math.Pow(mean, 2-power) / size
				for _, ratio := range []float64{0.3, 0.8, 1, 1.1, 2.5} {
					y := mean * ratio
					got := d.LogLikelihood(Obs{Y: y, Trials: 1, Weight: 1}, math.Log(mean), phi)
					want, scale := inverted(y, mean, phi, power)
					// The exponent's parts are good to 1e-16 of them, the sum to 1e-14 of its largest term.
					exponent := size / ((power - 1) * (2 - power))
					if !(math.Abs(math.Exp(got-scale)-want) < 1e-14+2e-15*(1+exponent)*want) {
						t.Errorf("power %g, mean %g, size %g, y %g: density %.15g, inversion says %.15g", power, mean, size, y, math.Exp(got-scale), want)
					}
					if want > 1e-4 {
						compared++
					}
				}
			}
		}
	}
	// Below power 1.03 and size 2 the density has dips between its lattice of peaks that the sum only sees as near zero.
	if compared < 750 {
		t.Errorf("the inversion gave a density to four digits or more in %d cases only", compared)
	}
}

// TestTweedieDensityAndCDFByMixture adds gonum's gamma densities and distribution functions over gonum's Poisson
// probabilities, and checks that a weight is a divisor of phi.
func TestTweedieDensityAndCDFByMixture(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := Tweedie{Power: rapid.Float64Range(1.01, 1.99).Draw(t, "power")}
		eta, phi := rapid.Float64Range(-4, 4).Draw(t, "eta"), rapid.Float64Range(0.05, 20).Draw(t, "phi")
		o := Obs{Trials: 1, Weight: rapid.Float64Range(0.2, 5).Draw(t, "weight")}
		mean := d.Mean(eta)
		o.Y = mean * math.Exp(rapid.Float64Range(-3, 2).Draw(t, "log ratio"))
		scale := phi / o.Weight
		lambda := math.Pow(mean, 2-d.Power) / (scale * (2 - d.Power))
		number := distuv.Poisson{Lambda: lambda}
		density, below := 0.0, number.Prob(0)
		none := below
		last := lambda * math.Max(1, math.Pow(o.Y/mean, 2-d.Power)) // where the terms of the density are largest
		last += 12*math.Sqrt(last) + 40
		if last > 3e4 {
			t.Skip("a longer sum than is worth while")
		}
		for j := 1.0; j < last; j++ {
			portion := distuv.Gamma{
				Alpha: j * (2 - d.Power) / (d.Power - 1), Beta: 1 / (scale * (d.Power - 1) * math.Pow(mean, d.Power-1)),
			}
			density += math.Exp(number.LogProb(j) + portion.LogProb(o.Y))
			below += number.Prob(j) * portion.CDF(o.Y)
		}
		if density > 1e-290 {
			// A term's log is a difference of numbers up to the last portion's log-gamma, good to 1e-16 of them.
			size := lambda / (d.Power - 1) * math.Log(3+lambda/(d.Power-1))
			close(t, "log density", d.LogLikelihood(o, eta, phi), math.Log(density), 1e-13+1e-15*size)
		}
		lo, up := d.CDF(o, eta, phi)
		close(t, "P(Y <= y)", up, below, 1e-11)
		if lo != up {
			t.Errorf("P(Y < y) = %g, P(Y <= y) = %g at a positive amount", lo, up)
		}
		lo, up = d.CDF(Obs{Trials: 1, Weight: o.Weight}, eta, phi)
		close(t, "P(Y <= 0)", up, none, 1e-12)
		close(t, "log P(Y = 0)", d.LogLikelihood(Obs{Trials: 1, Weight: o.Weight}, eta, phi), -lambda, 1e-12)
		if lo != 0 {
			t.Errorf("P(Y < 0) = %g", lo)
		}
	})
}

// TestTweedieMoments integrates the density over log y by the trapezium rule, geometric for so smooth a function: with
// the zeros it is one, mean and variance are mu and phi mu^power / w, scores have mean 0, observed weights the expected
// one, and the part of it up to a point is the distribution function.
func TestTweedieMoments(t *testing.T) {
	for _, power := range []float64{1.01, 1.1, 1.3, 1.5, 1.7, 1.85} {
		for _, phi := range []float64{0.02, 0.5, 3} {
			d, o := Tweedie{Power: power}, Obs{Trials: 1, Weight: 1.4}
			eta := 0.4
			mu := math.Exp(eta)
			variance := phi / o.Weight * math.Pow(mu, power)
			_, none := d.CDF(o, eta, phi)
			zero := d.At(o, eta)
			total, mean, square := none, 0.0, none*mu*mu
			score, weight := none*zero.Score, none*zero.Weight
			h := 0.02 * math.Min(1, math.Sqrt(phi)) * math.Min(1, 10*(power-1))
			// Near zero the density goes as y^(a-1).
			lo := math.Max(-690, -40*math.Max(1, (power-1)/(2-power)))
			for x := lo; x < 12; x += h {
				o.Y = math.Exp(x)
				p := h * math.Exp(d.LogLikelihood(o, eta, phi)+x)
				if mid := total + p/2; math.Abs(x-0.3) < h/2 {
					// The trapezium rule to an inner point carries an error of h^2/12 times the slope of y density.
					y := h * (d.At(o, eta).Score/phi + 1)
					_, upTo := d.CDF(o, eta, phi)
					close(t, fmt.Sprintf("power %g, phi %g: P(Y <= %.3f)", power, phi, o.Y), upTo, mid, math.Abs(p*y)+p*0.5)
				}
				at := d.At(o, eta)
				total += p
				mean += p * o.Y
				square += p * (o.Y - mu) * (o.Y - mu)
				score += p * at.Score
				weight += p * at.Weight
			}
			what := func(s string) string { return fmt.Sprintf("power %g, phi %g: %s", power, phi, s) }
			close(t, what("sum of the density"), total, 1, 1e-10)
			close(t, what("mean"), mean/mu, 1, 1e-10)
			close(t, what("variance"), square/variance, 1, 1e-10)
			close(t, what("mean of the scores"), score, 0, 1e-10)
			close(t, what("mean of the weights"), weight, zero.Expected, 1e-10)
		}
	}
}

// TestTweedieDeviance integrates the definition, 2 int_mu^y (y - m)/m^power dm (McCullagh & Nelder 1989, section 9.2),
// in log m.
func TestTweedieDeviance(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := Tweedie{Power: rapid.Float64Range(1.01, 1.99).Draw(t, "power")}
		log := rapid.Float64Range(-18.5, 18.5).Draw(t, "log y")
		o := Obs{Y: math.Exp(log), Trials: 1, Weight: 1}
		eta := log + rapid.Float64Range(-1, 1).Draw(t, "near")*rapid.SampledFrom([]float64{1e-7, 1e-3, 0.3, 6}).Draw(t, "distance")
		want := 2 * quad.Fixed(func(s float64) float64 {
			return o.Y * math.Abs(math.Expm1(s-log)) * math.Exp((1-d.Power)*s)
		}, math.Min(log, eta), math.Max(log, eta), 60, quad.Legendre{}, 0)
		got := d.At(o, eta).Deviance
		// Log y is good to 2e-16 of itself and the deviance goes as the square of the distance.
		distance := math.Abs(eta - log)
		if slip := 5e-16 * (1 + math.Abs(log)); !(math.Abs(got-want)*distance*distance <= want*(1e-13*distance*distance+2*slip*(distance+slip))) {
			t.Errorf("deviance %.16g, the integral is %.16g", got, want)
		}
	})
}

// differences returns f'(0) and a bound on its own rounding error: central differences, extrapolated twice, over a
// length h on which f is smooth, f being good to noise.
func differences(f func(float64) float64, h, noise float64) (slope, bound float64) {
	central := func(h float64) float64 { return (f(h) - f(-h)) / (2 * h) }
	a, b, c := central(h), central(h/2), central(h/4)
	ab, bc := (4*b-a)/3, (4*c-b)/3
	return (16*bc - ab) / 15, math.Abs(bc-ab)/100 + 10*noise/h
}

// TestTweedieDerivatives compares every derivative with differences: in the linear predictor, in log phi and in the
// working power.
func TestTweedieDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := Tweedie{Power: rapid.Float64Range(1.012, 1.988).Draw(t, "power")}
		o := Obs{Trials: 1, Weight: rapid.Float64Range(0.1, 5).Draw(t, "weight")}
		eta := rapid.Float64Range(-5, 5).Draw(t, "eta")
		phi := math.Exp(rapid.Float64Range(-9, 4).Draw(t, "log phi"))
		if rapid.IntRange(0, 4).Draw(t, "zero") > 0 {
			o.Y = math.Exp(eta + rapid.Float64Range(-4, 4).Draw(t, "log ratio"))
		}
		shifted := func(h float64) Tweedie { return d.WithWorking(d.Working() + h).(Tweedie) }
		near := func(what string, got float64, f func(float64) float64, scale float64) {
			t.Helper()
			want, bound := differences(f, 0.02*math.Min(1, 5*(d.Power-1)), 1e-15*scale)
			if !(math.Abs(got-want) <= bound+1e-10*(1+math.Abs(got))) {
				t.Errorf("%s of %+v at %g, phi %g: %.12g, differences say %.12g within %.2g", what, o, eta, phi, got, want, bound)
			}
		}
		p, s := d.At(o, eta), d.ShapeAt(o, eta)
		alpha, beta := d.exponents()
		own, mean := d.parts(o.Y, eta)
		scale := 20 * o.Weight * (mean + own)
		at := func(h float64) Point { return d.At(o, eta+h) }
		turned := func(h float64) Point { return shifted(h).At(o, eta) }
		near("score", p.Score, func(h float64) float64 { return -at(h).Deviance / 2 }, scale)
		near("weight", p.Weight, func(h float64) float64 { return -at(h).Score }, scale)
		near("slope", p.Slope, func(h float64) float64 { return at(h).Weight }, scale)
		near("expected slope", p.ExpectedSlope, func(h float64) float64 { return at(h).Expected }, scale)
		near("shape's deviance", s.Deviance, func(h float64) float64 { return turned(h).Deviance }, scale/alpha)
		near("shape's score", s.Score, func(h float64) float64 { return turned(h).Score }, scale)
		near("shape's weight", s.Weight, func(h float64) float64 { return turned(h).Weight }, scale)
		near("shape's expected", s.Expected, func(h float64) float64 { return turned(h).Expected }, scale)

		saturated := d.Saturated(o, phi)
		size := 20 + 20*math.Abs(saturated) + 30*math.Abs(math.Log(o.Y+1e-9))
		size /= alpha * beta // what a rounding of the power is in its logit
		near("scale", d.ScaleSlope(o, phi), func(h float64) float64 { return d.Saturated(o, phi*math.Exp(h)) }, size)
		near("saturated", d.SaturatedSlope(o, phi), func(h float64) float64 { return shifted(h).Saturated(o, phi) }, size)
	})
}

// TestTweedieFormsAgreeWhereTheyChange compares sum and saddlepoint form, and sums in long and in single steps, near the
// places where one takes over from the other: values and slopes to rounding, so that a search sees no step.
func TestTweedieFormsAgreeWhereTheyChange(t *testing.T) {
	same := func(what string, got, want tweedieH, tol float64) {
		t.Helper()
		close(t, what+": value", got.value, want.value, tol)
		close(t, what+": slope in log z", got.size, want.size, tol)
		close(t, what+": slope in the working power", got.working, want.working, tol)
	}
	for _, power := range tweediePowers {
		alpha, beta := 2-power, power-1
		z := float64(tweedieSaddle)
		for tweedieExcess(z, alpha, beta, 1) < tweedieNats {
			z *= 1.001
		}
		for _, z := range []float64{z, 1.2 * z, 3 * z} {
			what := fmt.Sprintf("power %g, z %g", power, z)
			log := math.Log(z)
			plain := newTweedieSum(log, alpha, beta).outwards(1)
			same(what+", saddlepoint", tweedieSaddlepoint(log, alpha, beta), plain, 3e-13)
		}
		changes, last := 0, 1.0
		for log := -6.0; log < math.Log(z); log += 0.003 {
			step := tweedieStep(math.Exp(log), alpha, beta, tweedieNats)
			if step == last {
				continue
			}
			changes++
			what := fmt.Sprintf("power %g, z %g, step %g", power, math.Exp(log), step)
			plain := newTweedieSum(log, alpha, beta).outwards(1)
			same(what, newTweedieSum(log, alpha, beta).outwards(step), plain, 3e-13)
			last = step
		}
		if changes == 0 && power > 1.1 { // below, the saddlepoint form comes before any long step
			t.Errorf("power %g: no change of steps", power)
		}
	}
}

// TestTweedieSaddlepointError checks the order of what the saddlepoint form leaves out, against the sum: with the
// corrections it falls as z^-7, so that halving z multiplies it by 128 or so, and without them as 1/z.
func TestTweedieSaddlepointError(t *testing.T) {
	for _, power := range []float64{1.3, 1.5, 1.7, 1.9} {
		alpha, beta := 2-power, power-1
		left := func(z float64) (corrected, plain float64) {
			log := math.Log(z)
			sum := newTweedieSum(log, alpha, beta).outwards(1).value
			return tweedieSaddlepoint(log, alpha, beta).value - sum, 0.5*math.Log(z/(2*math.Pi)) - sum
		}
		c8, p8 := left(10)
		c16, p16 := left(20)
		if r := c8 / c16; !(r > 64 && r < 256) || math.Abs(c16) > 1e-11 {
			t.Errorf("power %g: errors %g at z = 10, %g at 20", power, c8, c16)
		}
		// power (3 - power)/(24 z), the textbook's first correction with skewness power/sqrt(z), kurtosis power (2 power - 1)/z.
		close(t, "first correction at 20", p16*20, power*(3-power)/24, 1e-2)
		if p8/p16 < 1.9 || p8/p16 > 2.1 {
			t.Errorf("power %g: plain errors %g at z = 10, %g at 20", power, p8, p16)
		}
	}
}

// TestTweedieTail compares the tail formula with the mixture where one takes over from the other, and checks that the
// distribution function only rises.
func TestTweedieTail(t *testing.T) {
	for _, power := range tweediePowers {
		d := Tweedie{Power: power}
		size := tweedieLarge * (power - 1) * 0.999
		for k := -7.0; k <= 7; k += 0.25 {
			x := k / math.Sqrt(size)
			close(t, fmt.Sprintf("power %g, %g deviations", power, -k), d.tail(size, x), d.cdf(math.Log(size), x), 4e-10)
		}
		close(t, "at the mean", d.tail(size, 2e-7), d.tail(size, 0.5e-7)-1.5e-7*math.Sqrt(size/(2*math.Pi)), 1e-9)
		for _, size := range []float64{0.1, 30, 1e4, 1e9} {
			last := 0.0
			for k := -60.0; k <= 60; k++ {
				_, p := d.CDF(Obs{Y: math.Exp(k / 8 / math.Sqrt(math.Max(1, size/10))), Trials: 1, Weight: size}, 0, 1)
				if !(p >= last-1e-9 && p <= 1) {
					t.Errorf("power %g, size %g: %g after %g", power, size, p, last)
				}
				last = p
			}
		}
	}
}

// TestTweedieExtremes goes to the ends of powers, amounts, means and dispersions: everything is a number there, and the
// likelihood never exceeds the saturated one.
func TestTweedieExtremes(t *testing.T) {
	for _, power := range []float64{1.01, 1.5, 1.99} {
		d := Tweedie{Power: power}
		for _, y := range []float64{0, 1e-8, 1e-3, 1, 7, 1e4, 1e8} {
			for _, eta := range []float64{-300, -40, -3, 0, 2, 40, 300} {
				o := Obs{Y: y, Trials: 1, Weight: 2}
				p, s := d.At(o, eta), d.ShapeAt(o, eta)
				for _, v := range []float64{
					p.Deviance, p.Score, p.Weight, p.Slope, p.Expected, p.ExpectedSlope,
					s.Deviance, s.Score, s.Weight, s.Expected, d.Pearson(o, eta),
				} {
					if math.IsNaN(v) || math.IsInf(v, 0) {
						t.Errorf("power %g, y %g, eta %g: %+v, %+v, Pearson %g", power, y, eta, p, s, d.Pearson(o, eta))
						break
					}
				}
				if p.Deviance < 0 || !(p.Weight > 0 && p.Expected > 0) {
					t.Errorf("power %g, y %g, eta %g: %+v", power, y, eta, p)
				}
				if mean := math.Exp(eta); math.Abs(eta) <= 40 {
					ratio := d.Pearson(o, eta) / (2 * (y - mean) * (y - mean) / math.Pow(mean, power))
					if !(math.Abs(ratio-1) < 1e-12) && y != mean {
						t.Errorf("power %g, y %g, eta %g: Pearson %g, %g times (y - mean)^2/V", power, y, eta, d.Pearson(o, eta), ratio)
					}
				}
				for _, phi := range []float64{1e-9, 1e-3, 1, 1e3, 1e9} {
					value, scale, working := d.SaturatedSlopes(o, phi)
					l := d.LogLikelihood(o, eta, phi)
					if math.IsNaN(value+scale+working) || math.IsInf(value+scale+working, 0) || !(l <= value) || math.IsInf(l, 0) {
						t.Errorf("power %g, y %g, eta %g, phi %g: saturated %g, %g, %g, log-likelihood %g", power, y, eta, phi, value, scale, working, l)
					}
					if below, upTo := d.CDF(o, eta, phi); !(0 <= below && below <= upTo && upTo <= 1) {
						t.Errorf("power %g, y %g, eta %g, phi %g: distribution function %g, %g", power, y, eta, phi, below, upTo)
					}
				}
			}
			// Means that overflow or underflow.
			for _, eta := range []float64{-800, -746, 710, 800} {
				o := Obs{Y: y, Trials: 1, Weight: 2}
				dev := d.At(o, eta).Deviance
				if math.IsNaN(dev) || dev < 0 || (eta >= 710) != math.IsInf(dev, 1) && eta >= 710 {
					t.Errorf("power %g, y %g, eta %g: deviance %g", power, y, eta, dev)
				}
				if l := d.LogLikelihood(o, eta, 1.3); math.IsNaN(l) || l > d.Saturated(o, 1.3) {
					t.Errorf("power %g, y %g, eta %g: log-likelihood %g", power, y, eta, l)
				}
				if below, upTo := d.CDF(o, eta, 1.3); !(0 <= below && below <= upTo && upTo <= 1) {
					t.Errorf("power %g, y %g, eta %g: distribution function %g, %g", power, y, eta, below, upTo)
				}
				if r := d.Pearson(o, eta); math.IsNaN(r) || r < 0 {
					t.Errorf("power %g, y %g, eta %g: Pearson %g", power, y, eta, r)
				}
			}
		}
	}
	// What is not an amount, or no dispersion, has no density, and the sums end.
	for _, o := range []Obs{{Y: -1, Weight: 1}, {Y: math.NaN(), Weight: 1}, {Y: 1, Weight: math.NaN()}} {
		if v := (Tweedie{Power: 1.5}).LogLikelihood(o, 0, 1); !math.IsNaN(v) {
			t.Errorf("log-likelihood of %+v is %g", o, v)
		}
	}
	// At a mean of exp(300) and power 1.99 the deviance of 1 is 2 (100 (exp(3) - 1) + (exp(-297) - 1)/0.99).
	d := Tweedie{Power: 1.99}
	close(t, "deviance far out", d.At(Obs{Y: 1, Weight: 1}, 300).Deviance, 2*(math.Expm1(300*(2-d.Power))/(2-d.Power)-1/(d.Power-1)), 1e-12)
}

// TestTweedieWorkingScale checks the round trip, the box and the names of its ends.
func TestTweedieWorkingScale(t *testing.T) {
	for _, power := range tweediePowers {
		d := Tweedie{Power: power}
		close(t, "power there and back", d.WithWorking(d.Working()).Shape(), power, 1e-15)
	}
	lo, hi := Tweedie{Power: 1.5}.Box()
	close(t, "lowest power", Tweedie{Power: 1.5}.WithWorking(lo).Shape(), 1.01, 1e-15)
	close(t, "highest power", Tweedie{Power: 1.5}.WithWorking(hi).Shape(), 1.99, 1e-15)
	close(t, "half way", Tweedie{Power: 1.5}.Working(), 0, 0)
	d := Tweedie{Power: 1.5}
	if d.ShapeName() != "power" || d.Simpler(false) != "" || d.Simpler(true) != "gamma" {
		t.Errorf("shape %q, simpler %q and %q", d.ShapeName(), d.Simpler(false), d.Simpler(true))
	}
}

// BenchmarkTweedieRow times one row, by power and by z = w y^(2-power)/phi.
func BenchmarkTweedieRow(b *testing.B) {
	for _, power := range []float64{1.01, 1.5, 1.99} {
		d := Tweedie{Power: power}
		for _, z := range []float64{0.1, 3, 50, 1000} {
			o := Obs{Y: 1, Trials: 1, Weight: z}
			b.Run(fmt.Sprintf("saturated/power=%g/z=%g", power, z), func(b *testing.B) {
				for b.Loop() {
					d.SaturatedSlopes(o, 1)
				}
			})
			b.Run(fmt.Sprintf("distribution/power=%g/z=%g", power, z), func(b *testing.B) {
				for b.Loop() {
					d.CDF(o, 0.1, 1)
				}
			})
		}
		b.Run(fmt.Sprintf("at/power=%g", power), func(b *testing.B) {
			for b.Loop() {
				d.At(Obs{Y: 2, Trials: 1, Weight: 1}, 0.1)
			}
		})
		b.Run(fmt.Sprintf("shape/power=%g", power), func(b *testing.B) {
			for b.Loop() {
				d.ShapeAt(Obs{Y: 2, Trials: 1, Weight: 1}, 0.1)
			}
		})
	}
}

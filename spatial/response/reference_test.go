package response

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// TestScoringReference holds scipy's distribution functions, densities and deviances for the gamma and the negative
// binomial distribution (testdata/reference/scoring, tolerances as stated there).
func TestScoringReference(t *testing.T) {
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
		var d Distribution
		switch row["distribution"] {
		case "gamma":
			d = Gamma{}
		case "negative-binomial":
			d = NegativeBinomial{Theta: readNumber(t, row["theta"])}
		default:
			continue
		}
		seen++
		mean := readNumber(t, row["mean"])
		o, eta, phi := Obs{Y: readNumber(t, row["y"]), Trials: 1, Weight: 1}, d.Linear(mean), readNumber(t, row["phi"])
		what := func(s string) string { return fmt.Sprintf("row %d, %s: %s", i+1, d.Name(), s) }
		below, upTo := d.CDF(o, eta, phi)
		close(t, what("P(Y < y)"), below, want.Below[i], 1e-12)
		close(t, what("P(Y <= y)"), upTo, want.UpTo[i], 1e-12)
		close(t, what("log density"), d.LogLikelihood(o, eta, phi), want.LogDensity[i], 1e-12)
		close(t, what("unit deviance"), d.At(o, eta).Deviance, want.Deviance[i], 1e-12)
		close(t, what("Pearson"), d.Pearson(o, eta), (o.Y-mean)*(o.Y-mean)*phi/want.Variance[i], 1e-12)
	}
	if seen != 18 {
		t.Errorf("%d rows, not 18", seen)
	}
}

// TestGLMReference fits plain generalised linear models by Fisher scoring and compares with statsmodels
// (testdata/reference/glm). Standard errors there are from the expected information.
func TestGLMReference(t *testing.T) {
	var want struct {
		Fits map[string]struct {
			Coefficients, Se []float64
			Deviance, Scale  float64
			Pearson          float64 `json:"pearson_chi2"`
			Loglik           float64
		}
	}
	readExpected(t, "glm/expected.json", &want)
	rows := readTable(t, "glm/data.csv")
	n, k := len(rows), 5
	x := mat.NewDense(n, k, nil)
	for i, row := range rows {
		x.SetRow(i, []float64{1, readNumber(t, row["x1"]), readNumber(t, row["x2"]), 0, 0})
		if g := row["group"]; g > "a" {
			x.Set(i, 3+int(g[0]-'b'), 1)
		}
	}
	for _, c := range []struct {
		fit, column string
		d           Distribution
	}{
		{"gamma", "amount", Gamma{}}, {"negative_binomial", "overdispersed", NegativeBinomial{Theta: 1.8}},
		{"binomial_cloglog", "positive", BinomialCloglog{}},
	} {
		fit := want.Fits[c.fit]
		obs := make([]Obs, n)
		for i, row := range rows {
			obs[i] = Obs{Y: readNumber(t, row[c.column]), Trials: 1, Weight: 1}
			if c.column == "positive" {
				obs[i].Trials = readNumber(t, row["trials"])
			}
		}
		beta := mat.NewVecDense(k, nil)
		var eta, step mat.VecDense
		var chol mat.Cholesky
		for range 40 {
			eta.MulVec(x, beta)
			score, information := mat.NewVecDense(k, nil), mat.NewSymDense(k, nil)
			for i, o := range obs {
				p := c.d.At(o, eta.AtVec(i))
				score.AddScaledVec(score, p.Score, x.RowView(i))
				information.SymRankOne(information, p.Expected, x.RowView(i))
			}
			if !chol.Factorize(information) || chol.SolveVecTo(&step, score) != nil {
				t.Fatal(c.fit, "is singular")
			}
			beta.AddVec(beta, &step)
		}
		var deviance, pearson, likelihood float64
		eta.MulVec(x, beta)
		scale := fit.Scale
		for i, o := range obs {
			deviance += c.d.At(o, eta.AtVec(i)).Deviance
			pearson += c.d.Pearson(o, eta.AtVec(i))
			likelihood += c.d.LogLikelihood(o, eta.AtVec(i), scale)
		}
		close(t, c.fit+": deviance", deviance, fit.Deviance, 1e-11)
		close(t, c.fit+": Pearson", pearson, fit.Pearson, 1e-11)
		close(t, c.fit+": log-likelihood", likelihood, fit.Loglik, 1e-11)
		if !c.d.KnownDispersion() {
			close(t, c.fit+": scale", pearson/float64(n-k), scale, 1e-11)
		}
		var covariance mat.SymDense
		if err := chol.InverseTo(&covariance); err != nil {
			t.Fatal(err)
		}
		for j, b := range fit.Coefficients {
			close(t, fmt.Sprintf("%s: coefficient %d", c.fit, j), beta.AtVec(j), b, 1e-10)
			within(t, fmt.Sprintf("%s: standard error %d", c.fit, j), math.Sqrt(scale*covariance.At(j, j)), fit.Se[j], 1e-8)
		}
	}
}

// TestPenalisedReference recomputes the sums of the penalised fits of testdata/reference from their linear predictors,
// offset included; those of the beta-binomial row by row where the file has rows.
func TestPenalisedReference(t *testing.T) {
	type fit struct {
		Deviance, Loglik, Phi, Edf, Theta, Rho float64
		Saturated                              float64   `json:"saturated_loglik"`
		Dispersion                             float64   `json:"pearson_dispersion"`
		Linear                                 []float64 `json:"linear_predictor"`
		Weights                                []float64 `json:"observed_weights"`
		Own                                    []float64 `json:"saturated_probability"`
	}
	type file struct {
		Fixed        fit
		Contaminated fit `json:"fixed_contaminated"`
		Fisher       fit `json:"optimum_fisher"`
		Observed     fit `json:"optimum_observed"`
		Theta        float64
		Estimated    struct {
			Observed fit `json:"optimum_observed"`
		} `json:"theta_estimated"`
	}
	check := func(what string, f fit, d Distribution, rows []map[string]string, column string) {
		if len(f.Linear) != 120 {
			t.Errorf("%s: %d rows", what, len(f.Linear))
			return
		}
		var deviance, pearson, likelihood, saturated float64
		for i, row := range rows {
			o := Obs{Y: readNumber(t, row[column]), Trials: 1, Weight: 1}
			if column == "positive" {
				o.Trials = readNumber(t, row["trials"])
			}
			p := d.At(o, f.Linear[i])
			deviance += p.Deviance
			pearson += d.Pearson(o, f.Linear[i])
			likelihood += d.LogLikelihood(o, f.Linear[i], f.Phi)
			saturated += d.Saturated(o, f.Phi)
			if f.Weights != nil {
				close(t, fmt.Sprintf("%s: weight of row %d", what, i+1), p.Weight, f.Weights[i], 1e-12)
			}
			if f.Own != nil {
				own := d.(BetaBinomial).ownShare(o.Y, o.Trials-o.Y).p
				close(t, fmt.Sprintf("%s: saturated probability of row %d", what, i+1), own, f.Own[i], 1e-13)
			}
		}
		close(t, what+": deviance", deviance, f.Deviance, 1e-11)
		close(t, what+": log-likelihood", likelihood, f.Loglik, 1e-11)
		if f.Saturated != 0 {
			close(t, what+": saturated log-likelihood", saturated, f.Saturated, 1e-11)
		}
		close(t, what+": dispersion", pearson/(120-f.Edf), f.Dispersion, 1e-10)
	}

	var gamma, nb, bb file
	readExpected(t, "penalised_gamma/expected.json", &gamma)
	rows := readTable(t, "penalised_gamma/data.csv")
	check("gamma, fixed", gamma.Fixed, Gamma{}, rows, "z")
	check("gamma, optimum", gamma.Observed, Gamma{}, rows, "z")

	readExpected(t, "penalised_negative_binomial/expected.json", &nb)
	rows = readTable(t, "penalised_negative_binomial/data.csv")
	check("negative binomial, fixed", nb.Fixed, NegativeBinomial{nb.Theta}, rows, "count")
	check("negative binomial, optimum", nb.Observed, NegativeBinomial{nb.Theta}, rows, "count")
	check("negative binomial, theta estimated", nb.Estimated.Observed, NegativeBinomial{nb.Estimated.Observed.Theta}, rows, "count")

	readExpected(t, "penalised_beta_binomial/expected.json", &bb)
	rows = readTable(t, "penalised_beta_binomial/data.csv")
	check("beta-binomial, fixed", bb.Fixed, BetaBinomial{bb.Fixed.Rho}, rows, "positive")
	check("beta-binomial, optimum", bb.Observed, BetaBinomial{bb.Observed.Rho}, rows, "positive")
	rows = readTable(t, "penalised_beta_binomial/data_contaminated.csv")
	check("beta-binomial, contaminated", bb.Contaminated, BetaBinomial{bb.Contaminated.Rho}, rows, "positive")
	if bb.Fixed.Weights == nil || bb.Fixed.Own == nil || bb.Contaminated.Weights == nil {
		t.Error("the beta-binomial rows are missing")
	}
}

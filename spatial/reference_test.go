package spatial

import (
	"context"
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"
)

// The reference values of testdata/reference were computed with dense general-purpose numerics (numpy, scipy,
// statsmodels) and checked by a second route; testdata/reference/README.md holds their definitions and tolerances.
const reference = "../testdata/reference"

// table reads a CSV of testdata/reference into columns of text.
func table(t testing.TB, path string) map[string][]string {
	t.Helper()
	f, err := os.Open(filepath.Join(reference, path))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	out := map[string][]string{}
	for j, name := range rows[0] {
		for _, r := range rows[1:] {
			out[name] = append(out[name], r[j])
		}
	}
	return out
}

func numbers(t testing.TB, text []string) []float64 {
	t.Helper()
	v := make([]float64, len(text))
	for i, s := range text {
		var err error
		if v[i], err = strconv.ParseFloat(s, 64); err != nil {
			t.Fatal(err)
		}
	}
	return v
}

func places(t testing.TB, path string) Places {
	t.Helper()
	d := table(t, path)
	return Places{X: numbers(t, d["x"]), Y: numbers(t, d["y"])}
}

func expected(t testing.TB, path string, into any) {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join(reference, path))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(raw, into); err != nil {
		t.Fatal(err)
	}
}

// near fails unless got is within tol of want, absolutely.
func near(t testing.TB, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: got %.15g, want %.15g, off by %.2g (allowed %.2g)", what, got, want, math.Abs(got-want), tol)
	}
}

// nearAll fails unless every got is within tol of want; relative if rel is set.
func nearAll(t testing.TB, what string, got, want []float64, tol float64, rel bool) {
	t.Helper()
	if len(got) != len(want) || len(want) == 0 {
		t.Fatalf("%s: %d values, want %d", what, len(got), len(want))
	}
	worst, at := 0.0, 0
	for i := range got {
		d := math.Abs(got[i] - want[i])
		if rel {
			d /= math.Abs(want[i])
		}
		if !(d <= worst) {
			worst, at = d, i
		}
	}
	if !(worst <= tol) {
		t.Errorf("%s: value %d: got %.15g, want %.15g, off by %.2g (allowed %.2g)", what, at, got[at], want[at], worst, tol)
	}
}

func fit(t testing.TB, m Model, d Data, o Options) *Surface {
	t.Helper()
	if m.MaxKnots == 0 {
		m.MaxKnots = 1000 // full rank: every place is a knot
	}
	s, err := Fit(context.Background(), m, d, o)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func predict(t testing.TB, s *Surface, at Places, z ...Covariate) (eta, se []float64) {
	t.Helper()
	eta, se = make([]float64, at.Len()), make([]float64, at.Len())
	if err := s.PredictTo(context.Background(), eta, se, at, z); err != nil {
		t.Fatal(err)
	}
	return eta, se
}

// linear returns the rows' linear predictors, offset included, from the fitted means.
func (s *Surface) linear(d Data) []float64 {
	eta := make([]float64, len(d.Response))
	for i, mu := range s.rows.Fitted {
		if d.Trials != nil {
			mu /= d.Trials[i]
		}
		eta[i] = s.dist.Linear(mu)
	}
	return eta
}

func given(lambda float64) Smoothness { return Smoothness{Method: Given, Lambda: lambda} }

func TestReferenceInterpolation(t *testing.T) {
	d := table(t, "tps_interp/data.csv")
	data := Data{Response: numbers(t, d["z"]), Places: places(t, "tps_interp/data.csv")}
	at := places(t, "tps_interp/points.csv")
	var want struct {
		Fits []struct {
			Lambda            float64
			Fitted, Predicted []float64
			Edf               float64
			J                 float64
		}
		LambdaInfinite struct{ Plane, Predicted []float64 } `json:"lambda_infinite"`
	}
	expected(t, "tps_interp/expected.json", &want)
	if len(want.Fits) != 8 {
		t.Fatalf("%d fits", len(want.Fits))
	}
	for _, w := range want.Fits {
		s := fit(t, Model{Distribution: "gaussian", Smoothness: given(w.Lambda)}, data, Options{})
		eta, _ := predict(t, s, at)
		nearAll(t, "fitted", s.Rows().Fitted, w.Fitted, 1e-8, false)
		nearAll(t, "predicted", eta, w.Predicted, 1e-8, false)
		near(t, "degrees of freedom", s.Report().DF, w.Edf, 1e-7)
	}
	plane := fit(t, Model{Distribution: "gaussian", Smoothness: given(1e10)}, data, Options{})
	eta, _ := predict(t, plane, at)
	nearAll(t, "plane", eta, want.LambdaInfinite.Predicted, 1e-7, false)
}

// chosen is a fit as the reference gives it.
type chosen struct {
	Lambda           float64
	LogLambda        float64 `json:"log_lambda"`
	Edf, Sigma2      float64
	RemlCoefficients float64 `json:"reml_coefficients"`
	Reml             float64
	Gcv              float64
	Fitted           []float64
	Predicted        []float64
	FittedSE         []float64 `json:"fitted_se"`
	PredictedSE      []float64 `json:"predicted_se"`
}

func (w chosen) check(t *testing.T, s *Surface, at Places, z ...Covariate) {
	t.Helper()
	r := s.Report()
	near(t, "log lambda", math.Log(r.Lambda), math.Log(w.Lambda), 1e-6)
	near(t, "degrees of freedom", r.DF, w.Edf, 1e-6)
	near(t, "dispersion, relative", r.Dispersion/w.Sigma2, 1, 1e-7)
	if !r.Converged {
		t.Errorf("not converged: gradient %g", r.ProjectedGradient)
	}
	nearAll(t, "fitted", s.Rows().Fitted, w.Fitted, 1e-7, false)
	eta, se := predict(t, s, at, z...)
	nearAll(t, "predicted", eta, w.Predicted, 1e-7, false)
	nearAll(t, "standard error, relative", se, w.PredictedSE, 1e-6, true)
}

func TestReferenceThinPlateREMLAndGCV(t *testing.T) {
	for _, name := range []string{"synthetic", "real"} {
		t.Run(name, func(t *testing.T) {
			d := table(t, "tps_reml_gcv/"+name+"_data.csv")
			data := Data{Response: numbers(t, d["z"]), Places: places(t, "tps_reml_gcv/"+name+"_data.csv")}
			at := places(t, "tps_reml_gcv/"+name+"_points.csv")
			var want struct {
				Reml, Gcv chosen
				Grid      struct {
					LogLambda      []float64 `json:"log_lambda"`
					Reml, Edf, Gcv []float64
				}
				Half float64 `json:"half_log_det_TtT"`
			}
			expected(t, "tps_reml_gcv/"+name+".json", &want)
			s := fit(t, Model{Distribution: "gaussian"}, data, Options{})
			want.Reml.check(t, s, at)
			near(t, "restricted likelihood", s.Report().CriterionValue, want.Reml.RemlCoefficients, 1e-8)
			_, se := predict(t, s, data.Places)
			nearAll(t, "standard error at the data, relative", se, want.Reml.FittedSE, 1e-6, true)

			g := fit(t, Model{Distribution: "gaussian", Smoothness: Smoothness{Method: GCV}}, data, Options{})
			want.Gcv.check(t, g, at)
			near(t, "cross-validation", g.Report().CriterionValue, want.Gcv.Gcv, 1e-8)

			for i, l := range want.Grid.LogLambda {
				s := fit(t, Model{Distribution: "gaussian", Smoothness: given(math.Exp(l))}, data, Options{})
				near(t, "degrees of freedom on the grid", s.Report().DF, want.Grid.Edf[i], 1e-7)
				near(t, "restricted likelihood on the grid", s.Report().CriterionValue, want.Grid.Reml[i]+want.Half, 1e-7)
			}
		})
	}
}

func TestReferenceLowRank(t *testing.T) {
	d := table(t, "low_rank/data.csv")
	data := Data{Response: numbers(t, d["z"]), Places: places(t, "low_rank/data.csv")}
	at, knots := places(t, "low_rank/points.csv"), places(t, "low_rank/knots.csv")
	var want struct {
		Reml  chosen
		Fixed chosen `json:"fixed_lambda"`
	}
	expected(t, "low_rank/expected.json", &want)
	s := fit(t, Model{Distribution: "gaussian"}, data, Options{Knots: knots})
	want.Reml.check(t, s, at)
	near(t, "restricted likelihood", s.Report().CriterionValue, want.Reml.RemlCoefficients, 1e-8)
	f := fit(t, Model{Distribution: "gaussian", Smoothness: given(want.Fixed.Lambda)}, data, Options{Knots: knots})
	want.Fixed.check(t, f, at)
	near(t, "restricted likelihood at a given lambda", f.Report().CriterionValue, want.Fixed.RemlCoefficients, 1e-7)

	// The reference chose its knots by the same farthest-point rule.
	own := fit(t, Model{Distribution: "gaussian", MaxKnots: 40}, data, Options{})
	near(t, "log lambda with knots of our own choice", math.Log(own.Report().Lambda), want.Reml.LogLambda, 1e-6)
}

func TestReferenceNonGaussian(t *testing.T) {
	type fixed struct {
		Lambda, Edf, Deviance, Loglik, Phi float64
		Pearson                            float64   `json:"pearson_dispersion"`
		Linear                             []float64 `json:"linear_predictor"`
		LinearSE                           []float64 `json:"linear_predictor_se"`
		Predicted                          []float64 `json:"predicted_linear"`
		PredictedSE                        []float64 `json:"predicted_linear_se"`
		Reml                               float64
	}
	type want struct {
		Fixed fixed
		Opt   fixed `json:"optimum_fisher"`
		Grid  struct {
			LogLambda []float64 `json:"log_lambda"`
			Reml      []float64 `json:"reml_fisher"`
			Edf       []float64
			Deviance  []float64
		}
	}
	for _, c := range []struct {
		name, dist, link, data, points, json, response, exposure, trials string
	}{
		{"poisson", "poisson", "", "penalised_poisson/data.csv", "penalised_poisson/points.csv", "penalised_poisson/expected.json", "count", "exposure", ""},
		{"poisson, North Carolina", "poisson", "", "penalised_poisson/real_data.csv", "penalised_poisson/real_points.csv", "penalised_poisson/real.json", "count", "exposure", ""},
		{"binomial", "binomial", "", "penalised_binomial/data.csv", "penalised_binomial/points.csv", "penalised_binomial/expected.json", "positive", "", "trials"},
		{"gaussian, log link", "gaussian", "log", "gaussian_log/data.csv", "gaussian_log/points.csv", "gaussian_log/expected.json", "z", "", ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			tab := table(t, c.data)
			d := Data{Response: numbers(t, tab[c.response]), Places: places(t, c.data)}
			if c.exposure != "" {
				d.Exposure = numbers(t, tab[c.exposure])
			}
			if c.trials != "" {
				d.Trials = numbers(t, tab[c.trials])
			}
			at := places(t, c.points)
			var w want
			expected(t, c.json, &w)
			m := Model{Distribution: c.dist, Link: c.link}

			fixedAt := m
			fixedAt.Smoothness = given(w.Fixed.Lambda)
			s := fit(t, fixedAt, d, Options{})
			near(t, "degrees of freedom", s.Report().DF, w.Fixed.Edf, 1e-6)
			near(t, "deviance", s.Report().Deviance, w.Fixed.Deviance, 1e-7)
			near(t, "log-likelihood", s.Report().LogLikelihood, w.Fixed.Loglik, 1e-7)
			near(t, "Pearson dispersion", s.Report().Pearson, w.Fixed.Pearson, 1e-7)
			near(t, "dispersion", s.Report().Dispersion, w.Fixed.Phi, 1e-7)
			nearAll(t, "linear predictor", s.linear(d), w.Fixed.Linear, 1e-7, false)
			eta, se := predict(t, s, at)
			nearAll(t, "predicted", eta, w.Fixed.Predicted, 1e-7, false)
			nearAll(t, "standard error, relative", se, w.Fixed.PredictedSE, 1e-6, true)

			o := fit(t, m, d, Options{})
			near(t, "log lambda", math.Log(o.Report().Lambda), math.Log(w.Opt.Lambda), 1e-5) // stated tolerance 1e-4
			near(t, "restricted likelihood", o.Report().CriterionValue, w.Opt.Reml, 1e-7)    // stated 1e-6
			near(t, "degrees of freedom at the optimum", o.Report().DF, w.Opt.Edf, 1e-4)
			near(t, "dispersion at the optimum, relative", o.Report().Dispersion/w.Opt.Phi, 1, 1e-5)
			eta, se = predict(t, o, at)
			nearAll(t, "predicted at the optimum", eta, w.Opt.Predicted, 1e-4, false)
			nearAll(t, "standard error at the optimum, relative", se, w.Opt.PredictedSE, 1e-4, true)

			for i, l := range w.Grid.LogLambda {
				g := m
				g.Smoothness = given(math.Exp(l))
				s := fit(t, g, d, Options{})
				near(t, "degrees of freedom on the grid", s.Report().DF, w.Grid.Edf[i], 1e-6)
				near(t, "deviance on the grid", s.Report().Deviance, w.Grid.Deviance[i], 1e-6)
				near(t, "restricted likelihood on the grid", s.Report().CriterionValue, w.Grid.Reml[i], 1e-6)
			}
		})
	}
}

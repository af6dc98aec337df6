package spatial

import (
	"math"
	"testing"
)

// TestReferenceShapes holds the distributions with a shape or a dispersion of their own against the reference's optima
// with observed weights, at a given shape and with the shape chosen by restricted likelihood.
func TestReferenceShapes(t *testing.T) {
	type optimum struct {
		Lambda, Reml, Deviance, Phi, Loglik, Theta, Power float64
		Edf                                               float64   `json:"edf_observed"`
		Linear                                            []float64 `json:"linear_predictor"`
		Predicted                                         []float64 `json:"predicted_linear"`
		PredictedSE                                       []float64 `json:"predicted_linear_se_observed"`
	}
	var want struct {
		Theta, Power   float64
		Fixed          optimum
		Observed       optimum `json:"optimum_observed"`
		ThetaEstimated struct {
			OptimumObserved optimum `json:"optimum_observed"`
		} `json:"theta_estimated"`
		PowerEstimated struct {
			OptimumObserved optimum `json:"optimum_observed"`
		} `json:"power_estimated"`
		Grid struct {
			LogLambda []float64 `json:"log_lambda"`
			Reml      []float64 `json:"reml_observed"`
			Deviance  []float64
		}
	}
	for _, c := range []struct {
		dist, response string
		exposure       bool
	}{{"gamma", "z", false}, {"negative-binomial", "count", true}, {"tweedie", "z", false}} {
		t.Run(c.dist, func(t *testing.T) {
			folder := "penalised_" + map[string]string{"gamma": "gamma", "negative-binomial": "negative_binomial", "tweedie": "tweedie"}[c.dist]
			want.Theta, want.Power = 0, 0
			expected(t, folder+"/expected.json", &want)
			tab := table(t, folder+"/data.csv")
			d := Data{Response: numbers(t, tab[c.response]), Places: places(t, folder+"/data.csv")}
			if c.exposure {
				d.Exposure = numbers(t, tab["exposure"])
			}
			at := places(t, folder+"/points.csv")
			m := Model{Distribution: c.dist}
			shape := map[string]float64{"negative-binomial": want.Theta, "tweedie": want.Power}[c.dist]
			if shape > 0 {
				m.Shape = &shape
			}
			fixed := m
			fixed.Smoothness = given(want.Fixed.Lambda)
			f := fit(t, fixed, d, Options{})
			near(t, "degrees of freedom", f.Report().DF, want.Fixed.Edf, 1e-6)
			near(t, "deviance", f.Report().Deviance, want.Fixed.Deviance, 1e-7)
			nearAll(t, "linear predictor", f.linear(d), want.Fixed.Linear, 1e-7, false)
			for i, l := range want.Grid.LogLambda {
				g := m
				g.Smoothness = given(math.Exp(l))
				s := fit(t, g, d, Options{})
				near(t, "deviance on the grid", s.Report().Deviance, want.Grid.Deviance[i], 1e-6)
				if c.dist == "negative-binomial" { // at a given lambda the others take their dispersion from Pearson's statistic
					near(t, "restricted likelihood on the grid", s.Report().CriterionValue, want.Grid.Reml[i], 1e-6)
				}
			}
			check := func(t *testing.T, m Model, w optimum) {
				t.Helper()
				s := fit(t, m, d, Options{})
				r := s.Report()
				if !r.Converged {
					t.Errorf("not converged: gradient %g", r.ProjectedGradient)
				}
				near(t, "log lambda", math.Log(r.Lambda), math.Log(w.Lambda), 1e-5) // stated 1e-4
				near(t, "restricted likelihood", r.CriterionValue, w.Reml, 1e-7)    // stated 1e-6
				near(t, "degrees of freedom", r.DF, w.Edf, 1e-4)
				near(t, "dispersion, relative", r.Dispersion/w.Phi, 1, 1e-5)
				near(t, "log-likelihood", r.LogLikelihood, w.Loglik, 1e-4)
				eta, se := predict(t, s, at)
				nearAll(t, "predicted", eta, w.Predicted, 1e-4, false)
				nearAll(t, "standard error, relative", se, w.PredictedSE, 1e-4, true)
				if w.Theta > 0 {
					near(t, "theta, relative", r.Shape/w.Theta, 1, 1e-4)
				}
				if w.Power > 0 {
					near(t, "power", r.Shape, w.Power, 1e-5)
				}
			}
			check(t, m, want.Observed)
			m.Shape = nil
			switch c.dist {
			case "negative-binomial":
				check(t, m, want.ThetaEstimated.OptimumObserved)
			case "tweedie":
				check(t, m, want.PowerEstimated.OptimumObserved)
			}
		})
	}
}

func TestReferenceBetaBinomial(t *testing.T) {
	type result struct {
		Lambda, Rho, Deviance, Loglik float64
		Reml                          float64   `json:"reml_observed"`
		Edf                           float64   `json:"edf_observed"`
		Linear                        []float64 `json:"linear_predictor"`
		Predicted                     []float64 `json:"predicted_linear"`
		PredictedSE                   []float64 `json:"predicted_linear_se_observed"`
	}
	var want struct {
		Fixed        result
		Contaminated result `json:"fixed_contaminated"`
		Optimum      result `json:"optimum_observed"`
		Grid         struct {
			LogLambda []float64 `json:"log_lambda"`
			Rho       []float64
			Reml      [][]float64 `json:"reml_observed"`
		}
	}
	expected(t, "penalised_beta_binomial/expected.json", &want)
	read := func(name string) Data {
		tab := table(t, "penalised_beta_binomial/"+name)
		return Data{Response: numbers(t, tab["positive"]), Trials: numbers(t, tab["trials"]), Places: places(t, "penalised_beta_binomial/"+name)}
	}
	at := places(t, "penalised_beta_binomial/points.csv")
	check := func(t *testing.T, m Model, d Data, w result, tol float64) {
		t.Helper()
		s := fit(t, m, d, Options{})
		r := s.Report()
		near(t, "log lambda", math.Log(r.Lambda), math.Log(w.Lambda), 1e-5) // stated 1e-4
		near(t, "correlation, relative", r.Shape/w.Rho, 1, 1e-4)
		near(t, "restricted likelihood", r.CriterionValue, w.Reml, 1e-7) // stated 1e-6
		near(t, "degrees of freedom", r.DF, w.Edf, 10*tol)
		near(t, "deviance", r.Deviance, w.Deviance, 10*tol)
		near(t, "log-likelihood", r.LogLikelihood, w.Loglik, 10*tol)
		nearAll(t, "linear predictor", s.linear(d), w.Linear, tol, false)
		eta, se := predict(t, s, at)
		nearAll(t, "predicted", eta, w.Predicted, tol, false)
		nearAll(t, "standard error, relative", se, w.PredictedSE, 10*tol, true)
	}
	m := Model{Distribution: "beta-binomial", Shape: &want.Fixed.Rho, Smoothness: given(want.Fixed.Lambda)}
	check(t, m, read("data.csv"), want.Fixed, 1e-7)
	check(t, m, read("data_contaminated.csv"), want.Contaminated, 1e-7) // two observed weights are negative
	check(t, Model{Distribution: "beta-binomial"}, read("data.csv"), want.Optimum, 1e-5)
	d := read("data.csv")
	for i, l := range want.Grid.LogLambda {
		for j := range want.Grid.Rho {
			m := Model{Distribution: "beta-binomial", Shape: &want.Grid.Rho[j], Smoothness: given(math.Exp(l))}
			near(t, "restricted likelihood on the grid", fit(t, m, d, Options{}).Report().CriterionValue, want.Grid.Reml[i][j], 1e-6)
		}
	}
}

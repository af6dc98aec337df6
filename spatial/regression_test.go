package spatial

import (
	"context"
	"math"
	"testing"
)

// category turns text into a covariate with sorted levels.
func category(name string, text []string) Covariate {
	c := Covariate{Name: name}
	seen := map[string]int32{}
	for _, s := range text {
		seen[s] = 0
	}
	for _, s := range sortedKeys(seen) {
		seen[s] = int32(len(c.Level))
		c.Level = append(c.Level, s)
	}
	for _, s := range text {
		c.Code = append(c.Code, seen[s])
	}
	return c
}

func sortedKeys(m map[string]int32) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	for i := range keys {
		for j := i; j > 0 && keys[j] < keys[j-1]; j-- {
			keys[j], keys[j-1] = keys[j-1], keys[j]
		}
	}
	return keys
}

func TestReferenceCovariates(t *testing.T) {
	read := func(path string) []Covariate {
		d := table(t, path)
		return []Covariate{{Name: "u", Number: numbers(t, d["u"])}, {Name: "v", Number: numbers(t, d["v"])}, category("soil", d["soil"])}
	}
	d := table(t, "with_covariates/data.csv")
	z, at := read("with_covariates/points.csv"), places(t, "with_covariates/points.csv")
	type result struct {
		chosen
		Coefficients []float64
		SE           []float64 `json:"coefficients_se"`
		Intercept    float64   `json:"intercept_surface_centred"`
		InterceptSE  float64   `json:"intercept_surface_centred_se"`
		EdfSurface   float64   `json:"edf_surface"`
	}
	var want struct{ Unweighted, Weighted result }
	expected(t, "with_covariates/expected.json", &want)
	m := Model{Distribution: "gaussian", Effects: []Effect{{Name: "u", Role: Linear}, {Name: "v", Role: Linear}, {Name: "soil", Role: Category}}}
	for name, w := range map[string]result{"unweighted": want.Unweighted, "weighted": want.Weighted} {
		t.Run(name, func(t *testing.T) {
			data := Data{Response: numbers(t, d["z"]), Places: places(t, "with_covariates/data.csv"), Covariates: read("with_covariates/data.csv")}
			if name == "weighted" {
				data.Weight = numbers(t, d["weight"])
			}
			s := fit(t, m, data, Options{})
			w.check(t, s, at, z...)
			r := s.Report()
			near(t, "restricted likelihood", r.CriterionValue, w.RemlCoefficients, 1e-8)
			near(t, "degrees of freedom of the surface", r.SurfaceDF, w.EdfSurface, 1e-6)
			c := r.Coefficients
			near(t, "intercept", c[0].Estimate, w.Intercept, 1e-7)
			near(t, "intercept's error, relative", c[0].StandardError/w.InterceptSE, 1, 1e-6)
			for j, name := range []string{"u", "v", "soil=loam", "soil=sand"} {
				if c[j+1].Name != name {
					t.Errorf("coefficient %d is called %q, want %q", j, c[j+1].Name, name)
				}
				near(t, name, c[j+1].Estimate, w.Coefficients[j], 1e-7)
				near(t, name+"'s error, relative", c[j+1].StandardError/w.SE[j], 1, 1e-6)
			}
		})
	}
}

// TestReferenceRegressions holds fits without a surface against statsmodels' generalised linear models.
func TestReferenceRegressions(t *testing.T) {
	d := table(t, "glm/data.csv")
	n := len(d["x1"])
	base := Data{Places: Places{X: make([]float64, n), Y: make([]float64, n)},
		Covariates: []Covariate{{Name: "x1", Number: numbers(t, d["x1"])}, {Name: "x2", Number: numbers(t, d["x2"])}, category("group", d["group"])}}
	var want struct {
		Fits map[string]struct {
			Coefficients, SE             []float64
			Deviance, Scale, Loglik, Aic float64
		}
	}
	expected(t, "glm/expected.json", &want)
	logAmount := numbers(t, d["amount"])
	for i := range logAmount {
		logAmount[i] = math.Log(logAmount[i])
	}
	for name, c := range map[string]struct {
		dist     string
		response []float64
		set      func(*Data)
		scaleAIC float64
	}{
		"poisson":           {"poisson", numbers(t, d["count"]), func(x *Data) { x.Exposure = numbers(t, d["exposure"]) }, 0},
		"binomial":          {"binomial", numbers(t, d["positive"]), func(x *Data) { x.Trials = numbers(t, d["trials"]) }, 0},
		"gaussian_weighted": {"gaussian", logAmount, func(x *Data) { x.Weight = numbers(t, d["exposure"]) }, 2},
	} {
		t.Run(name, func(t *testing.T) {
			data := base
			data.Response = c.response
			c.set(&data)
			m := Model{Distribution: c.dist, Surface: None, Effects: []Effect{{Name: "x1", Role: Linear}, {Name: "x2", Role: Linear}, {Name: "group", Role: Category}}}
			s := fit(t, m, data, Options{})
			w, r := want.Fits[name], s.Report()
			if len(w.Coefficients) != 5 {
				t.Fatal("no reference")
			}
			for j, got := range r.Coefficients {
				near(t, got.Name, got.Estimate, w.Coefficients[j], 1e-9)
				near(t, got.Name+"'s error, relative", got.StandardError/w.SE[j], 1, 1e-8)
			}
			near(t, "deviance", r.Deviance, w.Deviance, 1e-8)
			near(t, "dispersion", r.Dispersion, w.Scale, 1e-9)
			if r.KnownDispersion { // statsmodels evaluates the normal's likelihood at another scale
				near(t, "log-likelihood", r.LogLikelihood, w.Loglik, 1e-8)
				near(t, "AIC", r.AIC, w.Aic, 1e-8)
			}
			near(t, "total degrees of freedom", r.DF, 5, 1e-9)
		})
	}
}

// TestNISTLinearRegression goes through the certified sets of NIST's Statistical Reference Datasets (linear least
// squares regression, 15 digits from 500-digit arithmetic). Filip's polynomial loses every digit in normal equations.
func TestNISTLinearRegression(t *testing.T) {
	var want struct {
		Tolerance map[string]any
		Sets      map[string]struct {
			Estimate []float64 `json:"certified_estimate"`
			SE       []float64 `json:"certified_se"`
			SD       float64   `json:"certified_residual_sd"`
		}
	}
	expected(t, "glm/nist.json", &want)
	for name, tol := range map[string]float64{"norris": 1e-11, "longley": 1e-8, "filip": 1e-6} {
		t.Run(name, func(t *testing.T) {
			if want.Tolerance[name] != tol {
				t.Fatalf("the reference allows %v", want.Tolerance[name])
			}
			d := table(t, "glm/nist_"+name+".csv")
			y := numbers(t, d["y"])
			data := Data{Response: y, Places: Places{X: make([]float64, len(y)), Y: make([]float64, len(y))}}
			m := Model{Distribution: "gaussian", Surface: None}
			add := func(name string, v []float64) {
				m.Effects = append(m.Effects, Effect{Name: name, Role: Linear})
				data.Covariates = append(data.Covariates, Covariate{Name: name, Number: v})
			}
			switch name {
			case "norris":
				add("x", numbers(t, d["x"]))
			case "longley":
				for _, x := range []string{"x1", "x2", "x3", "x4", "x5", "x6"} {
					add(x, numbers(t, d[x]))
				}
			case "filip":
				x := numbers(t, d["x"])
				power := append([]float64(nil), x...)
				for k := 1; k <= 10; k++ {
					add("x"+string(rune('0'+k)), append([]float64(nil), power...))
					for i := range power {
						power[i] *= x[i]
					}
				}
			}
			r := fit(t, m, data, Options{}).Report()
			w := want.Sets[name]
			for j, c := range r.Coefficients {
				near(t, c.Name+", relative", c.Estimate/w.Estimate[j], 1, tol)
				near(t, c.Name+"'s error, relative", c.StandardError/w.SE[j], 1, tol)
			}
			near(t, "residual standard deviation, relative", math.Sqrt(r.Dispersion)/w.SD, 1, tol)
		})
	}
}

func TestReferenceZoneTotals(t *testing.T) {
	tab := table(t, "penalised_poisson/data.csv")
	d := Data{Response: numbers(t, tab["count"]), Exposure: numbers(t, tab["exposure"]), Places: places(t, "penalised_poisson/data.csv")}
	var want struct {
		Lambda  float64
		Lattice struct {
			CellArea float64 `json:"cell_area"`
		}
		Zones []struct {
			Zone          string
			Total, Mean   float64
			StandardError float64 `json:"standard_error"`
			PosteriorMean float64 `json:"posterior_mean"`
			PosteriorSD   float64 `json:"posterior_sd"`
			Draws         struct {
				Count     float64
				SDError   float64 `json:"sd_error"`
				MeanError float64 `json:"mean_error"`
			}
		}
		CellLinear []float64 `json:"cell_linear"`
		CellSE     []float64 `json:"cell_linear_se"`
	}
	expected(t, "zone_totals/expected.json", &want)
	s := fit(t, Model{Distribution: "poisson", Smoothness: given(want.Lambda)}, d, Options{})
	at := places(t, "zone_totals/cells.csv")
	eta, se := predict(t, s, at)
	nearAll(t, "cells", eta, want.CellLinear, 1e-7, false)
	nearAll(t, "cells' errors, relative", se, want.CellSE, 1e-6, true)
	cells := table(t, "zone_totals/cells.csv")
	var sets []Share
	for _, z := range want.Zones {
		var set Share
		for k, in := range cells[z.Zone] {
			if in == "1" {
				set.Index, set.Weight = append(set.Index, int32(k)), append(set.Weight, want.Lattice.CellArea)
			}
		}
		sets = append(sets, set)
	}
	const draws = 20000
	sums, err := s.Sums(context.Background(), at, nil, sets, draws, 7)
	if err != nil {
		t.Fatal(err)
	}
	for k, z := range want.Zones {
		near(t, z.Zone+" total, relative", sums[k].Value/z.Total, 1, 1e-7)
		near(t, z.Zone+" error, relative", sums[k].Delta/z.StandardError, 1, 1e-6)
		more := math.Sqrt(z.Draws.Count / draws) // the reference's Monte Carlo errors belong to its own number of draws
		near(t, z.Zone+" standard deviation of draws", sums[k].DrawSD(), z.PosteriorSD, 4*more*z.Draws.SDError)
		var mean float64
		for _, v := range sums[k].Draws {
			mean += v / draws
		}
		near(t, z.Zone+" mean of draws", mean, z.PosteriorMean, 4*more*z.Draws.MeanError)
	}
}

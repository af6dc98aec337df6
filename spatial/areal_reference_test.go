package spatial

import (
	"context"
	"math"
	"strconv"
	"testing"

	"drumlin/spatial/internal/penfit"
	"drumlin/spatial/response"
)

// arealFit is what testdata/reference/poisson_areal says of the fit at one smoothness. Unmarked figures have the expected
// Hessian, observed ones the true one, which is what a fit is told with.
type arealFit struct {
	Lambda, Edf, Deviance, Loglik float64
	EdfObserved                   float64 `json:"edf_observed"`
	RemlFisher                    float64 `json:"reml_fisher"`
	RemlObserved                  float64 `json:"reml_observed"`
	Alpha, Delta                  []float64
	FittedMean                    []float64   `json:"fitted_mean"`
	LogMeanSE                     []float64   `json:"log_mean_se"`
	InsideWeight                  []float64   `json:"inside_weight"`
	InsideLinear                  []float64   `json:"inside_linear"`
	InsideLinearSE                []float64   `json:"inside_linear_se"`
	WorkingRows                   [][]float64 `json:"working_rows_first_three"`
	Predicted                     []float64   `json:"predicted_linear"`
	PredictedSE                   []float64   `json:"predicted_linear_se"`
	PredictedSEObserved           []float64   `json:"predicted_linear_se_observed"`
	Pearson                       float64     `json:"pearson_dispersion"`
}

// arealReference reads the counts of rectangles with the people at points inside them.
func arealReference(t *testing.T) (d Data, inside, knots, points Places) {
	t.Helper()
	areas, in := table(t, "poisson_areal/areas.csv"), table(t, "poisson_areal/inside.csv")
	d = Data{Response: numbers(t, areas["count"]), Exposure: numbers(t, areas["people"])}
	inside = Places{X: numbers(t, in["x"]), Y: numbers(t, in["y"])}
	d.Places = Places{X: inside.X, Y: inside.Y, Share: numbers(t, in["people"])}
	for q, area := range in["area"] {
		if n, err := strconv.Atoi(area); err != nil || n > len(d.Places.Start) {
			d.Places.Start = append(d.Places.Start, int32(q))
		}
	}
	d.Places.Start = append(d.Places.Start, int32(len(inside.X)))
	return d, inside, places(t, "poisson_areal/knots.csv"), places(t, "poisson_areal/points.csv")
}

func TestReferenceAreas(t *testing.T) {
	d, inside, knots, points := arealReference(t)
	var want struct {
		Fixed arealFit
		Grid  struct {
			LogLambda []float64 `json:"log_lambda"`
			Fisher    []float64 `json:"reml_fisher"`
			Observed  []float64 `json:"reml_observed"`
		}
	}
	expected(t, "poisson_areal/expected.json", &want)
	w := want.Fixed
	s := fit(t, Model{Distribution: "poisson", Smoothness: given(w.Lambda)}, d, Options{Knots: knots})
	r := s.Report()
	near(t, "degrees of freedom", r.DF, w.EdfObserved, 1e-7) // stated 1e-6
	near(t, "deviance", r.Deviance, w.Deviance, 1e-8)
	near(t, "log-likelihood", r.LogLikelihood, w.Loglik, 1e-8)
	near(t, "restricted likelihood", r.CriterionValue, w.RemlObserved, 1e-7) // stated 1e-6
	nearAll(t, "fitted mean", s.Rows().Fitted, w.FittedMean, 1e-7, false)
	eta, se := predict(t, s, points)
	nearAll(t, "predicted", eta, w.Predicted, 1e-7, false)
	nearAll(t, "standard error, relative", se, w.PredictedSEObserved, 1e-6, true)
	eta, _ = predict(t, s, inside)
	nearAll(t, "inside", eta, w.InsideLinear, 1e-7, false)
	eta, _ = predict(t, s, d.Places)
	for i, e := range eta {
		near(t, "predictor of an area", e+math.Log(d.Exposure[i]), math.Log(w.FittedMean[i]), 1e-9)
	}
	weights := make([]float64, 0, len(inside.X))
	for i := range d.Response {
		from, to := d.Places.Start[i], d.Places.Start[i+1]
		share := make([]float64, to-from)
		for q := range share {
			share[q] = d.Places.Share[int(from)+q] / d.Exposure[i]
		}
		var m response.Mixture
		response.MixerOf("log").MixTo(&m, share, w.InsideLinear[from:to])
		weights = append(weights, m.First...)
	}
	nearAll(t, "inside weights", weights, w.InsideWeight, 1e-12, false)

	for i, l := range want.Grid.LogLambda {
		g := fit(t, Model{Distribution: "poisson", Smoothness: given(math.Exp(l))}, d, Options{Knots: knots})
		near(t, "restricted likelihood on the grid", g.Report().CriterionValue, want.Grid.Observed[i], 1e-7)
		_, _, reml := expectedHessian(t, g, d)
		near(t, "restricted likelihood on the grid, expected Hessian", reml, want.Grid.Fisher[i], 1e-7)
	}

	e, edf, reml := expectedHessian(t, s, d)
	near(t, "degrees of freedom, expected Hessian", edf, w.Edf, 1e-7)
	near(t, "restricted likelihood, expected Hessian", reml, w.RemlFisher, 1e-7)
	_, se = predict(t, e, points)
	nearAll(t, "standard error, expected Hessian, relative", se, w.PredictedSE, 1e-6, true)
	_, se = predict(t, e, inside)
	nearAll(t, "standard error inside, expected Hessian, relative", se, w.InsideLinearSE, 1e-6, true)
	_, se = predict(t, e, d.Places)
	nearAll(t, "standard error of areas, expected Hessian, relative", se, w.LogMeanSE, 1e-6, true)
}

// expectedHessian returns the surface with the expected Hessian in place of the true one, with its degrees of freedom and
// its restricted likelihood.
func expectedHessian(t *testing.T, s *Surface, d Data) (e *Surface, edf, reml float64) {
	t.Helper()
	ctx := context.Background()
	var err error
	if d.Places, err = d.Places.settled(); err != nil {
		t.Fatal(err)
	}
	f, err := newRefitter(ctx, s, d)
	if err != nil {
		t.Fatal(err)
	}
	engine := f.problem.Engine
	at := func(i int, linear, _ float64) (weight, value float64) {
		pt := s.dist.At(response.Obs{Y: d.Response[i], Trials: 1, Weight: 1}, linear+math.Log(d.Exposure[i]))
		return pt.Expected, pt.Score
	}
	lambda := []float64{s.report.Lambda / (s.core.basis.Scale * s.core.basis.Scale)}
	var logDet [2]float64
	for k, gram := range []penfit.Gram{penfit.Newton, penfit.Working} { // observed and expected weights are the same here
		if err := engine.Pass(ctx, s.beta, at, gram); err != nil || !engine.Factor(lambda) {
			t.Fatal("no factor", err)
		}
		logDet[k] = engine.LogDet()
	}
	c := *s
	c.factor = engine.Factored()
	edf = float64(engine.Coefs()) - lambda[0]*engine.Traces()[0]
	return &c, edf, s.report.CriterionValue + (logDet[1]-logDet[0])/2
}

// TestReferenceAreasWorkingRows holds the engine's tangents against the reference's working rows, which are in raw columns.
func TestReferenceAreasWorkingRows(t *testing.T) {
	d, _, knots, _ := arealReference(t)
	var want struct{ Fixed arealFit }
	expected(t, "poisson_areal/expected.json", &want)
	w := want.Fixed
	s := fit(t, Model{Distribution: "poisson", Smoothness: given(w.Lambda)}, d, Options{Knots: knots})
	var err error
	if d.Places, err = d.Places.settled(); err != nil {
		t.Fatal(err)
	}
	f, err := newRefitter(context.Background(), s, d)
	if err != nil {
		t.Fatal(err)
	}
	nothing := func(int, float64, float64) (weight, value float64) { return 0, 0 }
	tangent := make([]float64, len(d.Response))
	if err := f.problem.Engine.Pass(context.Background(), s.beta, nothing, penfit.NoGram); err != nil {
		t.Fatal(err)
	}
	if err := f.problem.Engine.TangentTo(context.Background(), tangent, s.beta); err != nil {
		t.Fatal(err)
	}
	raw := append(append([]float64(nil), w.Alpha...), w.Delta...)
	if len(w.WorkingRows) != 3 {
		t.Fatalf("%d working rows", len(w.WorkingRows))
	}
	for i, row := range w.WorkingRows {
		near(t, "tangent", tangent[i], dot(row, raw), 1e-8)
	}
}

// TestReferenceAreasDrawnTogether shrinks the areas to points: the fit must go over into that of point data, the difference
// falling as the square of the areas' size.
func TestReferenceAreasDrawnTogether(t *testing.T) {
	d, _, knots, points := arealReference(t)
	var want struct {
		Fixed  arealFit
		Points struct {
			CentreX      []float64 `json:"centre_x"`
			CentreY      []float64 `json:"centre_y"`
			Edf, Loglik  float64
			Deviance     float64
			Predicted    []float64 `json:"predicted_linear"`
			PredictedSEs []float64 `json:"predicted_linear_se"`
		} `json:"points_limit"`
		Shrink struct {
			Steps []struct {
				Factor, Edf, Deviance float64
				Predicted             []float64 `json:"predicted_linear"`
			}
		}
	}
	expected(t, "poisson_areal/expected.json", &want)
	m := Model{Distribution: "poisson", Smoothness: given(want.Fixed.Lambda)}
	centres := d.Places.centres()
	nearAll(t, "centres x", centres.X, want.Points.CentreX, 1e-12, false)
	nearAll(t, "centres y", centres.Y, want.Points.CentreY, 1e-12, false)
	single := d
	single.Places = centres
	limit := fit(t, m, single, Options{Knots: knots})
	near(t, "degrees of freedom of points", limit.Report().DF, want.Points.Edf, 1e-7)
	near(t, "deviance of points", limit.Report().Deviance, want.Points.Deviance, 1e-8)
	atLimit, se := predict(t, limit, points)
	nearAll(t, "predicted from points", atLimit, want.Points.Predicted, 1e-7, false)
	nearAll(t, "standard error from points, relative", se, want.Points.PredictedSEs, 1e-6, true)

	var difference []float64
	for _, step := range want.Shrink.Steps {
		drawn := d
		drawn.Places.X, drawn.Places.Y = append([]float64(nil), d.Places.X...), append([]float64(nil), d.Places.Y...)
		for i := range d.Response {
			for q := d.Places.Start[i]; q < d.Places.Start[i+1]; q++ {
				drawn.Places.X[q] = centres.X[i] + step.Factor*(d.Places.X[q]-centres.X[i])
				drawn.Places.Y[q] = centres.Y[i] + step.Factor*(d.Places.Y[q]-centres.Y[i])
			}
		}
		s := fit(t, m, drawn, Options{Knots: knots})
		eta, _ := predict(t, s, points)
		nearAll(t, "predicted from drawn areas", eta, step.Predicted, 1e-7, false)
		near(t, "deviance of drawn areas", s.Report().Deviance, step.Deviance, 1e-8)
		most := 0.0
		for i := range eta {
			most = math.Max(most, math.Abs(eta[i]-atLimit[i]))
		}
		difference = append(difference, most)
	}
	// Factors are 1, 0.3, 0.1, 0.01, 0.001, 0.
	near(t, "difference at a hundredth over that at a tenth", difference[3]/difference[2], 0.01, 2e-4)
	near(t, "difference at a thousandth over that at a hundredth", difference[4]/difference[3], 0.01, 1e-4)
	near(t, "difference at nothing", difference[5], 0, 1e-10)
}

package spatial

import (
	"context"
	"math"
	"strings"
	"testing"
)

// field reads a table of testdata; its README.md holds the sources.
func field(t testing.TB, name string) map[string][]string { return table(t, "../"+name) }

// chooseVariation is FitVariation with Fit.
func chooseVariation(t testing.TB, m Model, d Data) (*Surface, Variation) {
	t.Helper()
	s, v, err := FitVariation(context.Background(), m, func(ctx context.Context, m Model) (*Surface, error) { return Fit(ctx, m, d, Options{}) })
	if err != nil {
		t.Fatal(err)
	}
	if r := s.Report(); !r.Converged || r.Distribution != v.Chosen {
		t.Errorf("converged %v, %s fitted and %s chosen", r.Converged, r.Distribution, v.Chosen)
	}
	return s, v
}

// TestMalariaVariesMoreThanBinomial: of some 500 people a village the binomial distribution takes nearly all degrees of
// freedom there are for a surface and calls noise signal; the beta-binomial is chosen and keeps a few. At the same
// lambda the binomial's standard errors are too small by far more than half.
func TestMalariaVariesMoreThanBinomial(t *testing.T) {
	tab := field(t, "burkina_faso_malaria.csv")
	lon, lat := numbers(t, tab["lon"]), numbers(t, tab["lat"])
	const degree = 111.2e3 // metres, on a sphere
	narrow := math.Cos(mean(lat) * math.Pi / 180)
	for i := range lon {
		lon[i], lat[i] = lon[i]*degree*narrow, lat[i]*degree
	}
	d := Data{Response: numbers(t, tab["positive"]), Trials: numbers(t, tab["examined"]), Places: Places{X: lon, Y: lat}}
	s, v := chooseVariation(t, Model{Distribution: "binomial"}, d)
	plain := fit(t, Model{Distribution: "binomial"}, d, Options{})
	if v.Chosen != "beta-binomial" || !strings.HasPrefix(v.Reason, "the restricted likelihood is better by 7") || !strings.HasSuffix(v.Reason, "with extra variation (correlation 0.256)") {
		t.Errorf("%s because %s", v.Chosen, v.Reason)
	}
	if a, b := plain.Report().DF, s.Report().DF; !(a > 100) || !(b < 15) {
		t.Errorf("%g degrees of freedom of 109 rows, %g with extra variation", a, b)
	}
	at := fit(t, Model{Distribution: "binomial", Smoothness: given(s.Report().Lambda)}, d, Options{})
	_, less := predict(t, at, d.Places)
	_, more := predict(t, s, d.Places)
	least, sum := math.Inf(1), 0.0
	for i := range less {
		least = math.Min(least, more[i]/less[i])
		sum += more[i] / less[i] / float64(len(less))
	}
	if t.Logf("standard errors are %.1f times those of the binomial at the same lambda on average, %.1f at least", sum, least); !(least > 2) {
		t.Errorf("standard errors are %g times those of the binomial at the same lambda, on average %g", least, sum)
	}
}

// TestCountsVaryMoreThanPoisson: photon counts scatter far more about a smooth surface than their Poisson errors, and
// webworms keep together, with the treatments in the model or without.
func TestCountsVaryMoreThanPoisson(t *testing.T) {
	tab := field(t, "rongelap_radiation.csv")
	radiation := Data{Response: numbers(t, tab["counts"]), Exposure: numbers(t, tab["time_s"]), Places: Places{X: numbers(t, tab["x_m"]), Y: numbers(t, tab["y_m"])}}
	tab = field(t, "beet_webworms.csv")
	const apart, long = 0.5588, 0.9144 // 22 inches, 3 feet
	x, y := numbers(t, tab["col"]), numbers(t, tab["row"])
	for i := range x {
		x[i], y[i] = long*x[i], apart*y[i]
	}
	webworms := Data{Response: numbers(t, tab["y"]), Places: Places{X: x, Y: y}, Covariates: []Covariate{category("trt", tab["trt"])}}
	for _, c := range []struct {
		name   string
		d      Data
		m      Model
		theta  [2]float64
		df     [2]float64 // at least with poisson, at most without
		gained float64
	}{
		{"radiation", radiation, Model{}, [2]float64{5, 12}, [2]float64{120, 30}, 50},
		{"webworms", webworms, Model{MaxKnots: 100}, [2]float64{1.5, 3.5}, [2]float64{30, 40}, 15},
		{"webworms by treatment", webworms, Model{MaxKnots: 100, Effects: []Effect{{Name: "trt", Role: Category}}}, [2]float64{1.5, 4}, [2]float64{25, 35}, 15},
	} {
		c.m.Distribution = "poisson"
		s, v := chooseVariation(t, c.m, c.d)
		plain, r := fit(t, c.m, c.d, Options{}).Report(), s.Report()
		t.Logf("%s: %s; %.1f degrees of freedom, %.1f with poisson", c.name, v.Reason, r.DF, plain.DF)
		if v.Chosen != "negative-binomial" || !(v.PlainCriterion-v.ExtraCriterion > c.gained) || !strings.Contains(v.Reason, "with extra variation (theta ") {
			t.Errorf("%s: %s because %s", c.name, v.Chosen, v.Reason)
		}
		if !(r.Shape > c.theta[0] && r.Shape < c.theta[1]) || !(plain.DF > c.df[0]) || !(r.DF < c.df[1]) || !(r.DF < plain.DF) {
			t.Errorf("%s: theta %g, %g degrees of freedom, %g with poisson", c.name, r.Shape, r.DF, plain.DF)
		}
	}
}

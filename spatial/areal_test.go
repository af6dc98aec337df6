package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"drumlin/spatial/response"
)

// strips are rows of up to most points each, with responses of every kind drawn from one surface and covariates.
func strips(rows, most int, seed uint64, dist response.Distribution) Data {
	random := rand.New(rand.NewPCG(seed, 8))
	d := Data{Places: Places{Start: []int32{0}}}
	u, soil, team := make([]float64, rows), make([]int32, rows), make([]int32, rows)
	var level [8]float64
	for k := range level {
		level[k] = 0.3 * random.NormFloat64()
	}
	var m response.Mixture
	for i := range rows {
		x, y, angle := 4000*random.Float64(), 3000*random.Float64(), 2*math.Pi*random.Float64()
		u[i], soil[i], team[i] = random.Float64(), int32(random.IntN(3)), int32(random.IntN(8))
		var share, eta []float64
		total := 0.0
		n := 1 + random.IntN(most)
		for q := range n {
			px, py := x+120*float64(q)*math.Cos(angle), y+120*float64(q)*math.Sin(angle)
			d.Places.X, d.Places.Y = append(d.Places.X, px), append(d.Places.Y, py)
			share = append(share, 0.5+random.Float64())
			total += share[q]
			eta = append(eta, 0.5+0.8*math.Sin(px/900)*math.Cos(py/700)-0.5*u[i]*u[i]+0.2*float64(soil[i])+level[team[i]])
		}
		d.Places.Share, d.Places.Start = append(d.Places.Share, share...), append(d.Places.Start, int32(len(d.Places.X)))
		for q := range share {
			share[q] /= total
		}
		response.MixerOf(dist.Link()).MixTo(&m, share, eta)
		o, phi, linear := response.Obs{Trials: 1, Weight: 1}, 1.0, m.Linear
		switch kindOf(dist) {
		case counts, amounts:
			e := 1 + 4*random.Float64()
			d.Exposure = append(d.Exposure, e)
			linear += math.Log(e)
		case shares:
			o.Trials = float64(10 + random.IntN(30))
			d.Trials = append(d.Trials, o.Trials)
		default:
			phi = 0.1
		}
		d.Response = append(d.Response, dist.(response.Sampler).Draw(random, o, linear, phi))
	}
	d.Covariates = []Covariate{{Name: "u", Number: u}, {Name: "soil", Code: soil, Level: []string{"clay", "loam", "sand"}},
		{Name: "team", Code: team, Level: strings.Split("ABCDEFGH", "")}}
	return d
}

func distOf(t *testing.T, m Model) response.Distribution {
	t.Helper()
	d, err := m.distribution()
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// many are models with every part there is.
func many() map[string]Model {
	curve, group := Effect{Name: "u", Role: Curve}, Effect{Name: "team", Role: Group}
	slope, steps := Effect{Name: "u", Role: Linear}, Effect{Name: "soil", Role: Category}
	return map[string]Model{
		"poisson":              {Distribution: "poisson", SmoothnessUncertainty: true, Effects: []Effect{curve, steps, group}},
		"poisson, scaled":      {Distribution: "poisson", ScaleVariation: true, Effects: []Effect{slope, group}},
		"poisson, validated":   {Distribution: "poisson", Smoothness: Smoothness{Method: GCV}, Effects: []Effect{slope}},
		"poisson, shrunk":      {Distribution: "poisson", Shrink: true, Effects: []Effect{steps}},
		"poisson, no surface":  {Distribution: "poisson", Surface: None, Effects: []Effect{slope, steps}},
		"poisson, by soil":     {Distribution: "poisson", SurfacePer: "soil", Effects: []Effect{slope}},
		"negative-binomial":    {Distribution: "negative-binomial", SmoothnessUncertainty: true, Effects: []Effect{slope}},
		"binomial":             {Distribution: "binomial", Effects: []Effect{curve, group}},
		"binomial, events":     {Distribution: "binomial", Link: "complementary-log-log", Effects: []Effect{slope}},
		"beta-binomial":        {Distribution: "beta-binomial", Effects: []Effect{slope}},
		"gamma":                {Distribution: "gamma", SmoothnessUncertainty: true, Effects: []Effect{curve}},
		"tweedie":              {Distribution: "tweedie", Effects: []Effect{slope}},
		"gaussian":             {Distribution: "gaussian", Effects: []Effect{curve, steps, group}},
		"gaussian, log":        {Distribution: "gaussian", Link: "log", Effects: []Effect{slope}},
		"gaussian, validated":  {Distribution: "gaussian", Smoothness: Smoothness{Method: GCV}, Effects: []Effect{slope}},
		"gaussian, smoothness": {Distribution: "gaussian", Smoothness: given(1e9), Effects: []Effect{group}},
	}
}

// TestRowsOfOnePoint fits sets of one point each and the points themselves: all that is told must be the same to rounding.
func TestRowsOfOnePoint(t *testing.T) {
	for name, m := range many() {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			d := strips(240, 1, 3, distOf(t, m))
			points := d
			points.Places = Places{X: d.Places.X, Y: d.Places.Y}
			m.MaxKnots = 30
			a, b := fit(t, m, points, Options{}), fit(t, m, d, Options{})
			ra, rb := a.Report(), b.Report()
			near(t, "degrees of freedom", rb.DF, ra.DF, 1e-5)
			near(t, "deviance, relative", rb.Deviance/ra.Deviance, 1, 1e-8)
			if !bad(ra.CriterionValue) {
				near(t, "criterion, relative", rb.CriterionValue/ra.CriterionValue, 1, 1e-10)
			}
			if !bad(ra.AICCorrected) {
				near(t, "corrected AIC", rb.AICCorrected, ra.AICCorrected, 1e-5)
			}
			for k, c := range ra.Coefficients {
				near(t, c.Name, rb.Coefficients[k].Estimate, c.Estimate, 1e-6)
				near(t, c.Name+", standard error", rb.Coefficients[k].StandardError, c.StandardError, 1e-6)
			}
			for k, f := range a.Effects() {
				nearAll(t, f.Name, b.Effects()[k].Estimate, f.Estimate, 1e-6, false)
				nearAll(t, f.Name+", standard error", b.Effects()[k].StandardError, f.StandardError, 1e-6, false)
				near(t, f.Name+", overlap", b.Effects()[k].Overlap, f.Overlap, 1e-6)
			}
			nearAll(t, "leverage", b.Rows().Leverage, a.Rows().Leverage, 1e-6, false)
			nearAll(t, "residual", b.Rows().Quantile, a.Rows().Quantile, 1e-5, false)
			eta, se := predict(t, a, points.Places, d.Covariates...)
			own, ownSE := predict(t, b, d.Places, d.Covariates...)
			nearAll(t, "predicted", own, eta, 1e-6, false)
			nearAll(t, "standard error", ownSE, se, 1e-6, false)
			near(t, "autocorrelation", b.ResidualAutocorrelation(d.Places).I, a.ResidualAutocorrelation(points.Places).I, 1e-6)
			ta, err := a.TestCurves(d.Covariates)
			if err != nil {
				t.Fatal(err)
			}
			tb, err := b.TestCurves(d.Covariates)
			if err != nil {
				t.Fatal(err)
			}
			for k := range ta {
				near(t, "curve test", tb[k].P, ta[k].P, 1e-5)
			}
		})
	}
}

// TestComparisonOfRowsOfOnePoint also goes through subsets of rows and draws.
func TestComparisonOfRowsOfOnePoint(t *testing.T) {
	ctx := context.Background()
	m := Model{Distribution: "poisson", MaxKnots: 20, Effects: []Effect{{Name: "team", Role: Group}}}
	d := strips(120, 1, 5, distOf(t, m))
	points := d
	points.Places = Places{X: d.Places.X, Y: d.Places.Y}
	list := []Candidate{{Name: "all", Model: m}, {Name: "plain", Model: Model{Distribution: "poisson", MaxKnots: 20}}}
	var told [2][]Comparison
	var tests [2][]BootstrapTest
	for k, d := range []Data{points, d} {
		var err error
		if told[k], err = Compare(ctx, list, d, Options{}, nil); err != nil {
			t.Fatal(err)
		}
		s := fit(t, m, d, Options{})
		surface, err := s.TestVariation(ctx, d, 19, 1)
		if err != nil {
			t.Fatal(err)
		}
		groups, err := s.TestGroups(ctx, d, 19, 1)
		if err != nil {
			t.Fatal(err)
		}
		tests[k] = append(groups, surface)
	}
	for k, a := range told[0] {
		b := told[1][k]
		near(t, "log score", b.LogScore, a.LogScore, 1e-6)
		near(t, "its standard error", b.LogScoreSE, a.LogScoreSE, 1e-6)
		near(t, "difference", b.Difference, a.Difference, 1e-6)
		near(t, "AIC", b.AIC, a.AIC, 1e-5)
	}
	for k, a := range tests[0] {
		b := tests[1][k]
		if near(t, a.Of, b.Statistic, a.Statistic, 1e-5); a.Exceeded != b.Exceeded || a.Draws != 19 || b.Failed != a.Failed {
			t.Errorf("%+v, of points %+v", b, a)
		}
	}
}

// TestSetsOfPoints goes through everything that takes rows, with rows that are sets.
func TestSetsOfPoints(t *testing.T) {
	ctx := context.Background()
	for name, m := range many() {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			d := strips(200, 9, 11, distOf(t, m))
			m.MaxKnots = 30
			s := fit(t, m, d, Options{Workers: 1})
			if r := s.Report(); !r.Converged || r.Rows != 200 {
				t.Errorf("not converged, or not all rows: %+v", r)
			}
			// What the fit has of its rows is what is predicted for them.
			eta, se := predict(t, s, d.Places, d.Covariates...)
			for i, mu := range s.Rows().Fitted {
				linear := eta[i]
				if d.Exposure != nil {
					linear += math.Log(d.Exposure[i])
				}
				if d.Trials != nil {
					mu /= d.Trials[i]
				}
				near(t, "fitted, relative", s.Mean(linear)/mu, 1, 1e-9)
				if !(se[i] > 0) {
					t.Fatalf("row %d: standard error %v", i, se[i])
				}
			}
			// A row's level is the mean of its points' levels, and its error that of a small step of every coefficient.
			of := d.Places.owners()
			each := make([]Covariate, len(d.Covariates))
			rows := make([]int, len(of))
			for q, i := range of {
				rows[q] = int(i)
			}
			for k, z := range d.Covariates {
				each[k] = z.only(rows)
			}
			inside, _ := predict(t, s, Places{X: d.Places.X, Y: d.Places.Y}, each...)
			for i := range eta {
				mean, total := 0.0, 0.0
				for q := d.Places.Start[i]; q < d.Places.Start[i+1]; q++ {
					mean += d.Places.Share[q] * s.Mean(inside[q])
					total += d.Places.Share[q]
				}
				near(t, "level, relative", s.Mean(eta[i])/(mean/total), 1, 1e-10)
			}
			// The same bytes from four goroutines, and from what was stored.
			four := fit(t, m, d, Options{Workers: 4})
			if !reflect.DeepEqual(four.Report().Coefficients, s.Report().Coefficients) || !reflect.DeepEqual(four.Rows(), s.Rows()) {
				t.Error("four workers say something else")
			}
			back, err := Restore(s.State(), 2)
			if err != nil {
				t.Fatal(err)
			}
			eta2, se2 := predict(t, back, d.Places, d.Covariates...)
			if !reflect.DeepEqual(eta, eta2) || !reflect.DeepEqual(se, se2) {
				t.Error("the restored surface predicts something else")
			}
			if i := s.ResidualAutocorrelation(d.Places).I; bad(i) {
				t.Errorf("autocorrelation %v", i)
			}
			if _, err := s.TestCurves(d.Covariates); err != nil {
				t.Error(err)
			}
		})
	}
	m := Model{Distribution: "poisson", Effects: []Effect{{Name: "team", Role: Group}}}
	d := strips(150, 9, 12, distOf(t, m))
	s, v, err := FitVariation(ctx, m, func(ctx context.Context, m Model) (*Surface, error) {
		s, path, err := FitKnots(ctx, m, d, Options{}, 100)
		if err == nil && len(path) == 0 {
			t.Error("no way to enough knots")
		}
		return s, err
	})
	if err != nil || v.Reason == "" {
		t.Fatal(err, v)
	}
	m = s.Model()
	m.MaxKnots = 30
	told, err := Compare(ctx, []Candidate{{Name: "one", Model: m}}, d, Options{}, nil)
	if err != nil || len(told[0].Missing) > 0 || bad(told[0].LogScore) {
		t.Errorf("%v, %+v", err, told)
	}
	s = fit(t, m, d, Options{})
	for _, test := range []func() ([]BootstrapTest, error){
		func() ([]BootstrapTest, error) { return s.TestGroups(ctx, d, 19, 1) },
		func() ([]BootstrapTest, error) {
			one, err := s.TestVariation(ctx, d, 19, 1)
			return []BootstrapTest{one}, err
		},
	} {
		list, err := test()
		if err != nil || len(list) != 1 || list[0].Draws != 19 || list[0].Failed > 1 || !(list[0].Statistic > 0) {
			t.Errorf("%v, %+v", err, list)
		}
	}
}

// TestValidationOfFewSets has far more coefficients than rows. Where the penalty is weak the likelihood's second derivative
// has no sign there, and degrees of freedom counted with it run off to minus infinity: the search must not follow.
func TestValidationOfFewSets(t *testing.T) {
	m := Model{Distribution: "poisson", MaxKnots: 200, Smoothness: Smoothness{Method: GCV}, Effects: []Effect{{Name: "u", Role: Linear}}}
	d := strips(40, 60, 105, distOf(t, m))
	for q := range d.Places.X {
		d.Places.X[q] *= 0.2
	}
	if r := fit(t, m, d, Options{}).Report(); !r.Converged || !(r.DF >= 4 && r.DF < 40) {
		t.Errorf("converged %v with %g degrees of freedom, gradient %g", r.Converged, r.DF, r.ProjectedGradient)
	}
}

// TestErrorOfASet is the delta method by differences: each coefficient moved a little.
func TestErrorOfASet(t *testing.T) {
	for _, link := range []string{"logit", "complementary-log-log"} {
		m := Model{Distribution: "binomial", Link: link, MaxKnots: 20, Effects: []Effect{{Name: "team", Role: Group}}}
		d := strips(150, 400, 4, distOf(t, m)) // some larger than a block
		s := fit(t, m, d, Options{})
		at := d.Places.only([]int{0, 1, 2, 3, 4, 5})
		z := []Covariate{{Name: "team", Code: []int32{0, 1, 2, 3, 8, 8}, Level: append(strings.Split("ABCDEFGH", ""), "new")}}
		_, se := predict(t, s, at, z...)
		g := make([][]float64, at.Len())
		for k := range s.beta {
			const h = 1e-4
			moved := *s
			moved.beta = append([]float64(nil), s.beta...)
			moved.beta[k] += h
			up, _ := predict(t, &moved, at, z...)
			moved.beta[k] -= 2 * h
			down, _ := predict(t, &moved, at, z...)
			for i := range g {
				g[i] = append(g[i], (up[i]-down[i])/(2*h))
			}
		}
		for i := range g {
			want := math.Pow(s.errorOf(g[i]), 2)
			if i >= 4 { // a team the data did not have moves all points alike, which the constant's column does as well
				want += s.phi * s.border.Effects[0].Unseen * g[i][0] * g[i][0]
			}
			near(t, fmt.Sprintf("%s, row %d: standard error, relative", link, i), se[i]/math.Sqrt(want), 1, 1e-6)
		}
	}
}

// TestPlacesThatCannotBe names the row.
func TestPlacesThatCannotBe(t *testing.T) {
	m := Model{Distribution: "poisson", MaxKnots: 20}
	good := strips(40, 5, 2, distOf(t, m))
	from := int(good.Places.Start[6])
	for name, c := range map[string]struct {
		change func(p *Places)
		says   string
	}{
		"no points":          {func(p *Places) { p.Start[6] = p.Start[7] }, "row 7 has no points that count"},
		"nothing counts":     {func(p *Places) { clear(p.Share[from:p.Start[7]]) }, "row 7 has no points that count"},
		"a negative share":   {func(p *Places) { p.Share[from] = -0.5 }, "row 7: a point with a share of -0.5"},
		"a share of nothing": {func(p *Places) { p.Share[from] = math.NaN() }, "row 7: a point with a share of NaN"},
		"an infinite share":  {func(p *Places) { p.Share[from] = math.Inf(1) }, "row 7: a point with a share of +Inf"},
		"no place":           {func(p *Places) { p.Y[from] = math.NaN() }, "row 7: a point whose place is not a finite number"},
	} {
		d := good
		d.Places = good.Places.only(all(good.Places.Len()))
		c.change(&d.Places)
		_, err := Fit(context.Background(), m, d, Options{})
		var e *Error
		if !errors.As(err, &e) || e.Message != c.says || e.Advice == "" {
			t.Errorf("%s: %v", name, err)
		}
	}
	// Points that count nothing, and shares left out, change nothing.
	d := good
	d.Places.Share = nil
	a := fit(t, m, d, Options{})
	d.Places = d.Places.only(all(d.Places.Len()))
	d.Places.Share = make([]float64, len(d.Places.X))
	for q := range d.Places.Share {
		d.Places.Share[q] = 3
	}
	d.Places.X, d.Places.Y, d.Places.Share = append(d.Places.X, 1e6), append(d.Places.Y, 1e6), append(d.Places.Share, 0)
	d.Places.Start[d.Places.Len()]++
	b := fit(t, m, d, Options{})
	near(t, "degrees of freedom", b.Report().DF, a.Report().DF, 1e-8)

	// A covariate that is the areas' mean eastings cannot be told apart from the surface's slope.
	east := Covariate{Name: "east", Number: good.Places.centres().X}
	good.Covariates = append(good.Covariates, east)
	m.Effects = []Effect{{Name: "east", Role: Linear}}
	_, err := Fit(context.Background(), m, good, Options{})
	var e *Error
	if !errors.As(err, &e) || !strings.Contains(e.Message, `"east" cannot be told apart from`) {
		t.Errorf("eastings: %v", err)
	}
}

func all(n int) []int {
	list := make([]int, n)
	for i := range list {
		list[i] = i
	}
	return list
}

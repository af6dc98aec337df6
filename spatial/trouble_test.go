package spatial

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
	"time"
)

// number is a covariate from a function of place.
func number(name string, at Places, f func(x, y float64) float64) Covariate {
	c := Covariate{Name: name}
	for i := range at.X {
		c.Number = append(c.Number, f(at.X[i], at.Y[i]))
	}
	return c
}

// replaced returns d with another response.
func replaced(d Data, f func(i int, x, y float64) float64) Data {
	r := make([]float64, len(d.Response))
	for i := range r {
		r[i] = f(i, d.Places.X[i], d.Places.Y[i])
	}
	d.Response = r
	return d
}

// TestUnfittable holds each kind of data that cannot be fitted against the sentence that says why. The advice must be
// there too where the reader can do something.
func TestUnfittable(t *testing.T) {
	gaussian, poisson, binomial := sample("gaussian", 120, 101), sample("poisson", 120, 101), sample("binomial", 120, 101)
	noise := rand.New(rand.NewPCG(102, 0))
	white := func(float64, float64) float64 { return noise.NormFloat64() }
	with := func(d Data, z ...Covariate) Data { d.Covariates = z; return d }
	at := func(d Data, x, y func(i int) float64) Data {
		n := len(d.Response)
		p := Places{X: make([]float64, n), Y: make([]float64, n)}
		for i := range p.X {
			p.X[i], p.Y[i] = x(i), y(i)
		}
		d.Places = p
		return d
	}
	steps := func(values ...float64) func(int) float64 {
		return func(i int) float64 { return values[i%len(values)] }
	}
	head := func(d Data, n int) Data {
		d.Response = d.Response[:n]
		d.Places = Places{X: d.Places.X[:n], Y: d.Places.Y[:n]}
		if d.Exposure != nil {
			d.Exposure = d.Exposure[:n]
		}
		if d.Trials != nil {
			d.Trials = d.Trials[:n]
		}
		return d
	}
	linear := func(names ...string) (e []Effect) {
		for _, n := range names {
			e = append(e, Effect{Name: n, Role: Linear})
		}
		return e
	}
	u := number("u", gaussian.Places, white)
	scaledU := Covariate{Name: "v", Number: make([]float64, 120)}
	sum := Covariate{Name: "s", Number: make([]float64, 120)}
	for i, v := range u.Number {
		scaledU.Number[i] = 3 - 2*v
		sum.Number[i] = v + gaussian.Places.X[i]
	}
	sheet := func(x, y float64) bool { return x+0.3*y > 0.6 }
	for _, c := range []struct {
		name, dist, link, want string
		d                      Data
		m                      Model
		noAdvice               bool
	}{
		{name: "no rows", dist: "gaussian", want: "there are no observations", d: Data{}, noAdvice: true},
		{name: "one place", dist: "gaussian", want: "a surface needs at least 3 distinct places, and the rows have 1", d: at(gaussian, steps(5), steps(7))},
		{name: "two places", dist: "poisson", want: "a surface needs at least 3 distinct places, and the rows have 2", d: at(poisson, steps(0, 1), steps(0, 1))},
		{name: "collinear places", dist: "gaussian", want: "the places lie on one line, so a surface over the plane cannot be had",
			d: at(gaussian, func(i int) float64 { return 3 * float64(i) }, func(i int) float64 { return 400 - 0.7*float64(i) })},
		{name: "collinear places, far away", dist: "binomial", want: "the places lie on one line, so a surface over the plane cannot be had",
			d: at(binomial, func(i int) float64 { return 4e6 + float64(i) }, steps(5e6))},
		{name: "two knots", dist: "gaussian", want: "a surface needs at least 4 knots, 2 were allowed", d: gaussian, m: Model{MaxKnots: 2}},
		{name: "collinear covariates", dist: "gaussian", want: `covariate "v" cannot be told apart from u`, d: with(gaussian, u, scaledU), m: Model{Effects: linear("u", "v")}},
		{name: "collinear covariates, no surface", dist: "gaussian", want: `covariate "v" cannot be told apart from u`, d: with(gaussian, u, scaledU),
			m: Model{Effects: linear("u", "v"), Surface: None}},
		{name: "x as a covariate beside the surface", dist: "poisson", want: `covariate "easting" cannot be told apart from x`,
			d: with(poisson, number("easting", poisson.Places, func(x, _ float64) float64 { return 1000 * x })), m: Model{Effects: linear("easting")}},
		{name: "a covariate made of x and another", dist: "gaussian", want: `covariate "s" cannot be told apart from x, u`, d: with(gaussian, u, sum), m: Model{Effects: linear("u", "s")}},
		{name: "a constant covariate", dist: "gaussian", want: `covariate "c" has the same value in every row`,
			d: with(gaussian, number("c", gaussian.Places, func(_, _ float64) float64 { return 0.1 })), m: Model{Effects: linear("c")}},
		{name: "a covariate of zeros", dist: "gaussian", want: `covariate "c" has the same value in every row`,
			d: with(gaussian, number("c", gaussian.Places, func(_, _ float64) float64 { return 0 })), m: Model{Effects: linear("c"), Surface: None}},
		{name: "a category with one level", dist: "gaussian", want: `covariate "soil" has one level only, "clay": there is nothing to compare`,
			d: with(gaussian, Covariate{Name: "soil", Code: make([]int32, 120), Level: []string{"clay", "sand"}}), m: Model{Effects: []Effect{{Name: "soil", Role: Category}}}},
		{name: "a covariate twice", dist: "gaussian", want: `covariate "u" cannot be told apart from u`, d: with(gaussian, u), m: Model{Effects: linear("u", "u")}},
		{name: "no such covariate", dist: "gaussian", want: `there is no covariate "u"`, d: gaussian, m: Model{Effects: linear("u")}, noAdvice: true},
		{name: "a number as a category", dist: "gaussian", want: `covariate "u" is not of the kind its effect needs`, d: with(gaussian, u), m: Model{Effects: []Effect{{Name: "u", Role: Category}}}, noAdvice: true},
		{name: "a covariate that is not a number", dist: "gaussian", want: `row 1: covariate "c" is not a finite number`,
			d: with(gaussian, number("c", gaussian.Places, func(_, _ float64) float64 { return math.NaN() })), m: Model{Effects: linear("c")}},
		{name: "positives separated by a plane", dist: "binomial", want: "positives are separated: a straight line or a covariate parts the rows that are all positive",
			d: replaced(binomial, func(i int, x, y float64) float64 {
				if sheet(x, y) {
					return binomial.Trials[i]
				}
				return 0
			})},
		{name: "positives separated by a covariate, no surface", dist: "binomial", want: "positives are separated: a straight line or a covariate parts the rows that are all positive",
			d: with(replaced(binomial, func(i int, x, y float64) float64 {
				if sheet(x, y) {
					return binomial.Trials[i]
				}
				return 0
			}), number("c", binomial.Places, func(x, y float64) float64 { return x + 0.3*y })), m: Model{Effects: linear("c"), Surface: None}},
		{name: "a level without counts", dist: "poisson", want: "the level runs off to zero: a straight line or a covariate parts the rows with zero counts",
			d: with(replaced(poisson, func(i int, x, y float64) float64 {
				if i%3 == 0 {
					return 0
				}
				return 1 + poisson.Response[i]
			}), Covariate{Name: "habitat", Level: []string{"water", "land", "shore"}, Code: func() (c []int32) {
				for i := 0; i < 120; i++ {
					c = append(c, int32(i%3))
				}
				return c
			}()}), m: Model{Effects: []Effect{{Name: "habitat", Role: Category}}}},
		{name: "all counts zero", dist: "poisson", want: "every count is zero, so no level can be estimated", d: replaced(poisson, func(int, float64, float64) float64 { return 0 })},
		{name: "a negative count", dist: "poisson", want: "row 4: a count of -1 is negative", d: replaced(poisson, func(i int, _, _ float64) float64 {
			if i == 3 {
				return -1
			}
			return poisson.Response[i]
		})},
		{name: "none positive", dist: "binomial", want: "positives are separated: every row has none positive, so no level can be estimated", d: replaced(binomial, func(int, float64, float64) float64 { return 0 })},
		{name: "all positive", dist: "binomial", want: "positives are separated: every row has all positive, so no level can be estimated", d: replaced(binomial, func(i int, _, _ float64) float64 { return binomial.Trials[i] })},
		{name: "more positives than trials", dist: "binomial", want: "row 2: 31 positive of ", d: replaced(binomial, func(i int, _, _ float64) float64 {
			if i == 1 {
				return 31
			}
			return 1
		})},
		{name: "no trials", dist: "binomial", want: "positives need the number examined behind them", d: Data{Response: poisson.Response, Places: poisson.Places}},
		{name: "trials behind counts", dist: "poisson", want: "trials go with positives, not with the poisson distribution", d: Data{Response: poisson.Response, Places: poisson.Places, Trials: binomial.Trials}},
		{name: "a denominator behind measurements", dist: "gaussian", want: "a denominator goes with counts, not with the gaussian distribution",
			d: Data{Response: gaussian.Response, Places: gaussian.Places, Exposure: poisson.Exposure}},
		{name: "a constant response", dist: "gaussian", want: "the response is 2.5 in every row: there is no variation to map", d: replaced(gaussian, func(int, float64, float64) float64 { return 2.5 }), noAdvice: true},
		{name: "a negative mean under a log link", dist: "gaussian", link: "log", want: "the mean response is -", d: replaced(gaussian, func(i int, _, _ float64) float64 { return gaussian.Response[i] - 5 })},
		{name: "a log link over six powers of ten", dist: "gaussian", link: "log", want: "the mean runs off to zero, or spans too many powers of ten for normal errors: the log link cannot follow",
			d: func() Data {
				d := sample("gaussian", 120, 9)
				d.Response[7] = 1e6
				return d
			}(), m: Model{MaxKnots: 60}},
		{name: "not a number", dist: "gaussian", want: "row 8: a response or place that is not a finite number", d: replaced(gaussian, func(i int, _, _ float64) float64 {
			if i == 7 {
				return math.NaN()
			}
			return 1
		})},
		{name: "infinite", dist: "poisson", want: "row 8: a response or place that is not a finite number", d: replaced(poisson, func(i int, _, _ float64) float64 {
			if i == 7 {
				return math.Inf(1)
			}
			return 1
		})},
		{name: "a place that is not a number", dist: "gaussian", want: "row 3: a response or place that is not a finite number", d: at(gaussian, steps(0, 1, math.NaN()), steps(0, 1))},
		{name: "no exposure", dist: "poisson", want: "row 1: a denominator or weight that is not a positive number",
			d: Data{Response: poisson.Response, Places: poisson.Places, Exposure: make([]float64, 120)}},
		{name: "infinite weight", dist: "gaussian", want: "row 1: a denominator or weight that is not a positive number",
			d: Data{Response: gaussian.Response[:3], Places: Places{X: []float64{0, 1, 0}, Y: []float64{0, 0, 1}}, Weight: []float64{math.Inf(1), 1, 1}}},
		{name: "two rows that are sets of points", dist: "poisson", want: "2 observations cannot settle 3 unpenalised coefficients",
			d: Data{Response: []float64{1, 2}, Places: Places{X: []float64{0, 1, 2}, Y: []float64{0, 1, 3}, Start: []int32{0, 2, 3}, Share: []float64{1, 1, 1}}}},
		{name: "as many coefficients as rows", dist: "gaussian", want: "5 observations cannot settle 5 unpenalised coefficients and a variance",
			d: head(with(gaussian, u2("u", 5, noise), u2("v", 5, noise)), 5), m: Model{Effects: linear("u", "v")}},
		{name: "more coefficients than rows", dist: "poisson", want: "4 observations cannot settle 6 unpenalised coefficients",
			d: head(with(poisson, u2("u", 4, noise), u2("v", 4, noise), u2("w", 4, noise)), 4), m: Model{Effects: linear("u", "v", "w")}},
		{name: "more coefficients than rows, no surface", dist: "gaussian", want: "2 observations cannot settle 4 unpenalised coefficients",
			d: head(with(gaussian, u2("u", 2, noise), u2("v", 2, noise), u2("w", 2, noise)), 2), m: Model{Effects: linear("u", "v", "w"), Surface: None}},
		{name: "a negative smoothness", dist: "gaussian", want: "a smoothness of -1 is not a number from 0 up", d: gaussian, m: Model{Smoothness: given(-1)}},
		{name: "a smoothness that is not a number", dist: "gaussian", want: "a smoothness of NaN is not a number from 0 up", d: gaussian, m: Model{Smoothness: given(math.NaN())}},
	} {
		t.Run(c.name, func(t *testing.T) {
			c.m.Distribution, c.m.Link = c.dist, c.link
			s, err := Fit(context.Background(), c.m, c.d, Options{})
			if err == nil {
				t.Fatalf("fitted: %+v", s.Report())
			}
			var e *Error
			if !errors.As(err, &e) {
				t.Fatalf("%v is no *Error", err)
			}
			if s != nil {
				t.Error("a surface beside the error")
			}
			if !strings.Contains(err.Error(), c.want) {
				t.Errorf("says %q, want %q", err, c.want)
			}
			if strings.HasSuffix(err.Error(), ".") || strings.ToLower(err.Error()[:1]) != err.Error()[:1] {
				t.Errorf("%q is not in the manner of an error", err)
			}
			if e.Hint() == "" && !c.noAdvice {
				t.Errorf("%q comes without advice", err)
			}
			if !e.FitFailed() {
				t.Error("not marked as a fit that could not be had")
			}
		})
	}
}

func u2(name string, n int, random *rand.Rand) Covariate {
	c := Covariate{Name: name}
	for i := 0; i < n; i++ {
		c.Number = append(c.Number, random.NormFloat64())
	}
	return c
}

// sound fails unless the surface is an answer: converged, every figure a number, standard errors not negative.
func sound(t *testing.T, s *Surface, at Places, z ...Covariate) {
	t.Helper()
	r := s.Report()
	if !r.Converged {
		t.Errorf("not converged after %d iterations, gradient %g", r.Iterations, r.ProjectedGradient)
	}
	for what, v := range map[string]float64{"degrees of freedom": r.DF, "dispersion": r.Dispersion, "deviance": r.Deviance, "deviance share": r.DevianceShare,
		"log-likelihood": r.LogLikelihood, "criterion": r.CriterionValue, "Pearson": r.Pearson, "AIC": r.AIC} {
		if bad(v) {
			t.Errorf("%s is %g", what, v)
		}
	}
	low := -1e-9
	if r.Distribution == "beta-binomial" { // observed weights may be negative
		low = -0.2
	}
	eta, se := predict(t, s, at, z...)
	for i := range eta {
		if bad(eta[i]) || bad(se[i]) || se[i] < 0 {
			t.Fatalf("predicted %g with standard error %g", eta[i], se[i])
		}
	}
	for i, v := range s.Rows().Quantile {
		if bad(v) || bad(s.Rows().Fitted[i]) || bad(s.Rows().Deviance[i]) || !(s.Rows().Leverage[i] > low && s.Rows().Leverage[i] < 1+1e-9) {
			t.Fatalf("row %d: quantile residual %g, fitted %g, deviance residual %g, leverage %g", i+1, v, s.Rows().Fitted[i], s.Rows().Deviance[i], s.Rows().Leverage[i])
		}
	}
}

// flat fails unless the data chose the plane.
func flat(t *testing.T, s *Surface) {
	t.Helper()
	if r := s.Report(); !(math.Abs(r.DF-3) < 0.01) || !r.AtUpper {
		t.Errorf("%.4f degrees of freedom with lambda %g, at the top: %v", r.DF, r.Lambda, r.AtUpper)
	}
}

// TestAwkwardDataFits goes through data that are unusual but have an answer.
func TestAwkwardDataFits(t *testing.T) {
	at := grid(12)
	t.Run("duplicate places with conflicting values", func(t *testing.T) {
		for _, dist := range distributions {
			d := sample(dist, 150, 111)
			for i := 0; i < 50; i++ {
				d.Places.X[i], d.Places.Y[i] = d.Places.X[50+i%10], d.Places.Y[50+i%10]
			}
			s := fit(t, Model{Distribution: dist}, d, Options{})
			sound(t, s, at)
			if r := s.Report(); r.Knots != 100 || r.DistinctPlaces != 100 {
				t.Errorf("%d knots at %d distinct places, want 100", r.Knots, r.DistinctPlaces)
			}
		}
	})
	t.Run("every place twice", func(t *testing.T) {
		for _, dist := range distributions {
			d := sample(dist, 160, 112)
			for i := 0; i < 80; i++ {
				d.Places.X[i], d.Places.Y[i] = d.Places.X[80+i], d.Places.Y[80+i]
			}
			s := fit(t, Model{Distribution: dist, MaxKnots: 500}, d, Options{Area: at})
			sound(t, s, at)
			if r := s.Report(); r.Knots-r.KnotsInGaps != 80 {
				t.Errorf("%d knots at places", r.Knots-r.KnotsInGaps)
			}
		}
	})
	t.Run("three places", func(t *testing.T) {
		d := sample("gaussian", 30, 113)
		for i := range d.Response {
			d.Places.X[i], d.Places.Y[i] = []float64{0, 1, 0.4}[i%3], []float64{0, 0.2, 1}[i%3]
		}
		s := fit(t, Model{Distribution: "gaussian"}, d, Options{})
		sound(t, s, at)
		if r := s.Report(); math.Abs(r.DF-3) > 1e-9 || !math.IsNaN(r.Lambda) || r.Knots != 3 {
			t.Errorf("%g degrees of freedom, lambda %g, %d knots", r.DF, r.Lambda, r.Knots)
		}
		want := [3]float64{} // the plane through the means
		for i, z := range d.Response {
			want[i%3] += z / 10
		}
		for i, v := range s.Rows().Fitted {
			near(t, "mean of the place", v, want[i%3], 1e-10)
		}
	})
	t.Run("four places", func(t *testing.T) {
		d := sample("poisson", 40, 114)
		for i := range d.Response {
			d.Places.X[i], d.Places.Y[i] = float64(i%2), float64(i/2%2)
		}
		sound(t, fit(t, Model{Distribution: "poisson"}, d, Options{}), at)
	})
	t.Run("constant counts with a denominator", func(t *testing.T) {
		for _, share := range []bool{false, true} {
			d := sample("poisson", 100, 115)
			d.Exposure = append([]float64(nil), d.Exposure...)
			for i := range d.Response {
				d.Response[i], d.Exposure[i] = 5, 2.5
				if share { // the rate is constant, not the count
					d.Response[i] = float64(1 + i%7)
					d.Exposure[i] = d.Response[i] / 2
				}
			}
			for _, method := range []Method{REML, GCV} {
				s := fit(t, Model{Distribution: "poisson", Smoothness: Smoothness{Method: method}}, d, Options{Area: at})
				sound(t, s, at)
				flat(t, s)
				eta, _ := predict(t, s, at)
				for _, v := range eta {
					near(t, "log rate", v, math.Log(2), 1e-6)
				}
				near(t, "share of the deviance", s.Report().DevianceShare, 0, 1e-12)
			}
		}
	})
	t.Run("constant share of positives", func(t *testing.T) {
		d := sample("binomial", 100, 115)
		for i := range d.Response {
			d.Response[i], d.Trials[i] = 3, 12
		}
		s := fit(t, Model{Distribution: "binomial"}, d, Options{})
		sound(t, s, at)
		flat(t, s)
		eta, _ := predict(t, s, at)
		near(t, "logit", eta[0], math.Log(0.25/0.75), 1e-6)
	})
	t.Run("a gaussian plane without error", func(t *testing.T) {
		for _, size := range []float64{1, 1e9, 1e-9} {
			d := replaced(sample("gaussian", 100, 116), func(_ int, x, y float64) float64 { return size * (1 + 2*x - 3*y) })
			s := fit(t, Model{Distribution: "gaussian"}, d, Options{})
			sound(t, s, at)
			eta, se := predict(t, s, at)
			for i := range eta {
				near(t, "plane", eta[i]/size, 1+2*at.X[i]-3*at.Y[i], 1e-9)
				if !(se[i] < 1e-8*size) {
					t.Fatalf("size %g: standard error %g", size, se[i])
				}
			}
			if r := s.Report(); math.Abs(r.DevianceShare-1) > 1e-12 {
				t.Errorf("share of the deviance %g", r.DevianceShare)
			}
		}
	})
	t.Run("a smooth surface without error", func(t *testing.T) {
		d := replaced(sample("gaussian", 200, 117), func(_ int, x, y float64) float64 { return math.Sin(4*x) * math.Cos(3*y) })
		for _, knots := range []int{60, 150} {
			s := fit(t, Model{Distribution: "gaussian", MaxKnots: knots}, d, Options{})
			sound(t, s, at)
			eta, _ := predict(t, s, at)
			for i, v := range eta {
				near(t, "surface", v, math.Sin(4*at.X[i])*math.Cos(3*at.Y[i]), 0.1)
			}
		}
		all := fit(t, Model{Distribution: "gaussian"}, d, Options{}) // a knot a row: it interpolates
		nearAll(t, "fitted", all.Rows().Fitted, d.Response, 1e-6, false)
	})
	t.Run("one huge count", func(t *testing.T) {
		for _, knots := range []int{40, 500} {
			d := sample("poisson", 150, 118)
			d.Response[17] = 1e6
			s := fit(t, Model{Distribution: "poisson", MaxKnots: knots}, d, Options{})
			sound(t, s, at)
		}
	})
	t.Run("no counts in half of the area", func(t *testing.T) {
		d := sample("poisson", 300, 119)
		d = replaced(d, func(i int, x, _ float64) float64 {
			if x < 0.5 {
				return 0
			}
			return d.Response[i]
		})
		s := fit(t, Model{Distribution: "poisson", MaxKnots: 100}, d, Options{})
		sound(t, s, at)
		west, east := 0.0, 0.0
		for i, mu := range s.Rows().Fitted {
			if d.Places.X[i] < 0.4 {
				west += mu
			} else if d.Places.X[i] > 0.6 {
				east += mu
			}
		}
		if !(west < 0.02*east) {
			t.Errorf("expected counts in the empty half %g, in the other %g", west, east)
		}
	})
	t.Run("no positives in half of the area", func(t *testing.T) {
		d := sample("binomial", 300, 119)
		d = replaced(d, func(i int, x, _ float64) float64 {
			if x < 0.5 {
				return 0
			}
			return d.Response[i]
		})
		sound(t, fit(t, Model{Distribution: "binomial", MaxKnots: 100}, d, Options{}), at)
	})
	t.Run("one positive in all", func(t *testing.T) {
		d := sample("binomial", 100, 120)
		centre := 0
		for i := range d.Response {
			if math.Hypot(d.Places.X[i]-0.5, d.Places.Y[i]-0.5) < math.Hypot(d.Places.X[centre]-0.5, d.Places.Y[centre]-0.5) {
				centre = i
			}
		}
		for _, m := range []Model{{Distribution: "binomial", MaxKnots: 50}, {Distribution: "poisson", MaxKnots: 50}} {
			one := replaced(d, func(i int, _, _ float64) float64 {
				if i == centre {
					return 1
				}
				return 0
			})
			if m.Distribution == "poisson" {
				one.Trials = nil
			}
			s := fit(t, m, one, Options{})
			sound(t, s, at)
			t.Logf("%s: %.2f degrees of freedom", m.Distribution, s.Report().DF)
		}
	})
	t.Run("negative responses under a log link", func(t *testing.T) {
		d := sample("gaussian", 200, 121)
		negative := 0
		for i, z := range d.Response {
			d.Response[i] = z - 0.05
			if d.Response[i] < 0 {
				negative++
			}
		}
		if negative < 5 {
			t.Fatalf("%d negative responses", negative)
		}
		sound(t, fit(t, Model{Distribution: "gaussian", Link: "log", MaxKnots: 80}, d, Options{}), at)
	})
	t.Run("more coefficients than rows", func(t *testing.T) {
		for _, dist := range distributions {
			d := sample(dist, 12, 122)
			z := u2("u", 12, rand.New(rand.NewPCG(1, 2)))
			d.Covariates = []Covariate{z}
			s := fit(t, Model{Distribution: dist, Effects: []Effect{{Name: "u", Role: Linear}}}, d, Options{})
			z.Number = make([]float64, at.Len())
			sound(t, s, at, z)
		}
	})
	t.Run("denominators over twelve powers of ten", func(t *testing.T) {
		d := sample("poisson", 300, 123)
		random := rand.New(rand.NewPCG(124, 0))
		d.Exposure = append([]float64(nil), d.Exposure...)
		for i := range d.Response {
			d.Exposure[i] = math.Pow(10, -6+12*random.Float64())
		}
		d = drawFrom("poisson", d.Places, d.Exposure, nil, franke, random)
		s := fit(t, Model{Distribution: "poisson", MaxKnots: 100}, d, Options{})
		sound(t, s, at)
	})
	t.Run("more knots allowed than places", func(t *testing.T) {
		s := fit(t, Model{Distribution: "gaussian", MaxKnots: 100000}, sample("gaussian", 60, 125), Options{})
		sound(t, s, at)
		if s.Report().Knots != 60 {
			t.Errorf("%d knots", s.Report().Knots)
		}
	})
	t.Run("millimetres over thirty kilometres", func(t *testing.T) {
		d := sample("poisson", 150, 126)
		for i := range d.Response {
			d.Places.X[i], d.Places.Y[i] = 5e8+3e7*d.Places.X[i], 6e9+3e7*d.Places.Y[i]
		}
		s := fit(t, Model{Distribution: "poisson", MaxKnots: 80}, d, Options{})
		sound(t, s, Places{X: []float64{5e8, 5.15e8}, Y: []float64{6.03e9, 6.015e9}})
	})
	t.Run("neighbours much nearer than the rest", func(t *testing.T) {
		d := sample("gaussian", 200, 127)
		for i := 0; i < 100; i++ {
			d.Places.X[i], d.Places.Y[i] = d.Places.X[100+i]+3e-5, d.Places.Y[100+i]
		}
		sound(t, fit(t, Model{Distribution: "gaussian"}, d, Options{}), at)
	})
	t.Run("no surface", func(t *testing.T) {
		for _, dist := range distributions {
			d := sample(dist, 80, 128)
			s, err := Fit(context.Background(), Model{Distribution: dist, Surface: None}, d, Options{})
			if err != nil {
				t.Fatal(err)
			}
			sound(t, s, at)
			r := s.Report()
			var y, m float64
			for i, v := range d.Response {
				y += v
				switch dist {
				case "gaussian":
					m++
				case "poisson":
					m += d.Exposure[i]
				case "binomial":
					m += d.Trials[i]
				}
			}
			eta, se := predict(t, s, at)
			near(t, dist+" level", s.Mean(eta[0]), y/m, 1e-10)
			near(t, dist+" degrees of freedom", r.DF, 1, 1e-9)
			near(t, dist+" deviance share", r.DevianceShare, 0, 1e-10)
			information := map[string]float64{"gaussian": m / r.Dispersion, "poisson": y, "binomial": y * (1 - y/m)}[dist] // of a mean, a log rate, a logit
			near(t, dist+" standard error", se[0], 1/math.Sqrt(information), 1e-9)
		}
	})
}

// TestScaleOfTheResponseIsOfNoConsequence: estimates and standard errors go with the unit, lambda stays.
func TestScaleOfTheResponseIsOfNoConsequence(t *testing.T) {
	at := grid(10)
	for _, link := range []string{"identity", "log"} {
		d := sample("gaussian", 200, 131)
		for i := range d.Response {
			d.Response[i] += 0.3
		}
		m := Model{Distribution: "gaussian", Link: link, MaxKnots: 70}
		a := fit(t, m, d, Options{})
		etaA, seA := predict(t, a, at)
		for _, c := range []float64{1e-9, 1e9} {
			b := fit(t, m, replaced(d, func(i int, _, _ float64) float64 { return c * d.Response[i] }), Options{})
			sound(t, b, at)
			etaB, seB := predict(t, b, at)
			lambda := b.Report().Lambda
			for i := range etaB {
				if link == "log" { // the mean scales, its logarithm shifts; the deviance, and with it lambda, goes with c^2
					etaB[i] -= math.Log(c)
				} else {
					etaB[i] /= c
					seB[i] /= c
				}
			}
			if link == "log" {
				lambda /= c * c
			}
			nearAll(t, link+" estimate", etaB, etaA, 1e-8, false)
			nearAll(t, link+" standard error", seB, seA, 1e-8, false)
			near(t, link+" log lambda", math.Log(lambda), math.Log(a.Report().Lambda), 1e-6)
			near(t, link+" dispersion, relative", b.Report().Dispersion/(c*c)/a.Report().Dispersion, 1, 1e-7)
			near(t, link+" degrees of freedom", b.Report().DF, a.Report().DF, 1e-6)
			near(t, link+" share of the deviance", b.Report().DevianceShare, a.Report().DevianceShare, 1e-9)
		}
	}
}

func TestCancelledFitStopsSoon(t *testing.T) {
	d := sample("poisson", 3000, 132)
	m := Model{Distribution: "poisson", MaxKnots: 150}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	began := time.Now()
	if s, err := Fit(ctx, m, d, Options{}); !errors.Is(err, context.Canceled) || s != nil {
		t.Errorf("a fit cancelled before it began: %v", err)
	}
	if took := time.Since(began); took > time.Second {
		t.Errorf("took %v", took)
	}
	ctx, cancel = context.WithTimeout(context.Background(), 60*time.Millisecond)
	defer cancel()
	began = time.Now()
	if _, err := Fit(ctx, m, d, Options{}); !errors.Is(err, context.DeadlineExceeded) {
		t.Errorf("a fit out of time: %v", err)
	}
	if took := time.Since(began); took > 2*time.Second {
		t.Errorf("took %v", took)
	}
	s := fit(t, Model{Distribution: "gaussian"}, sample("gaussian", 50, 133), Options{})
	ctx, cancel = context.WithCancel(context.Background())
	cancel()
	at := grid(50)
	if err := s.PredictTo(ctx, make([]float64, at.Len()), make([]float64, at.Len()), at, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled predictions: %v", err)
	}
}

// TestLengthsThatDifferPanic: the caller's mistake, not the data's.
func TestLengthsThatDifferPanic(t *testing.T) {
	d := sample("poisson", 30, 134)
	s := fit(t, Model{Distribution: "poisson"}, d, Options{})
	z := Covariate{Name: "u", Number: make([]float64, 29)}
	k := Covariate{Name: "u", Code: make([]int32, 31), Level: []string{"a"}}
	withU := fit(t, Model{Distribution: "poisson", Effects: []Effect{{Name: "u", Role: Linear}}}, func(d Data) Data {
		d.Covariates = []Covariate{u2("u", 30, rand.New(rand.NewPCG(1, 1)))}
		return d
	}(d), Options{})
	do := func(change func(*Data)) func() {
		return func() {
			c := d
			change(&c)
			Fit(context.Background(), Model{Distribution: "poisson"}, c, Options{})
		}
	}
	at := grid(3)
	for name, f := range map[string]func(){
		"response":    do(func(d *Data) { d.Response = d.Response[:29] }),
		"no response": do(func(d *Data) { d.Response = nil }),
		"exposure":    do(func(d *Data) { d.Exposure = d.Exposure[:29] }),
		"trials":      do(func(d *Data) { d.Trials = make([]float64, 31) }),
		"weight":      do(func(d *Data) { d.Weight = make([]float64, 1) }),
		"y":           do(func(d *Data) { d.Places.Y = d.Places.Y[:29] }),
		"more y":      do(func(d *Data) { d.Places.Y = append([]float64{1}, d.Places.Y...) }),
		"covariate":   do(func(d *Data) { d.Covariates = []Covariate{z} }),
		"category":    do(func(d *Data) { d.Covariates = []Covariate{k} }),
		"eta":         func() { s.PredictTo(context.Background(), make([]float64, 8), make([]float64, 9), at, nil) },
		"se":          func() { s.PredictTo(context.Background(), make([]float64, 9), make([]float64, 8), at, nil) },
		"prediction's y": func() {
			s.PredictTo(context.Background(), make([]float64, 9), make([]float64, 9), Places{X: at.X, Y: at.Y[:8]}, nil)
		},
		"prediction's u": func() {
			withU.PredictTo(context.Background(), make([]float64, 9), make([]float64, 9), at, []Covariate{z})
		},
		"covariate of a sum": func() { withU.Sums(context.Background(), at, []Covariate{z}, nil, 1, 1) },
	} {
		t.Run(name, func(t *testing.T) {
			defer func() {
				v, ok := recover().(string)
				if !ok || !strings.HasPrefix(v, "spatial: ") {
					t.Errorf("no panic of our own, but %v", v)
				}
			}()
			f()
		})
	}
}

// TestPredictionsSayWhatIsMissing: a covariate that is not there is an error, an unknown level is not a number.
func TestPredictionsSayWhatIsMissing(t *testing.T) {
	d := sample("gaussian", 60, 135)
	soil := Covariate{Name: "soil", Level: []string{"clay", "loam", "sand"}}
	for i := range d.Response {
		soil.Code = append(soil.Code, int32(i%2)*2) // no loam
	}
	d.Covariates = []Covariate{soil}
	s := fit(t, Model{Distribution: "gaussian", Effects: []Effect{{Name: "soil", Role: Category}}}, d, Options{})
	at := grid(2)
	eta, se := make([]float64, 4), make([]float64, 4)
	if err := s.PredictTo(context.Background(), eta, se, at, nil); err == nil || err.Error() != `there is no covariate "soil"` {
		t.Errorf("without the covariate: %v", err)
	}
	names := s.Report().Coefficients
	if len(names) != 2 || names[1].Name != "soil=sand" {
		t.Errorf("coefficients %v", names)
	}
	z := Covariate{Name: "soil", Level: []string{"sand", "loam", "clay"}, Code: []int32{0, 1, 2, 0}} // another order of levels
	if err := s.PredictTo(context.Background(), eta, se, at, []Covariate{z}); err != nil {
		t.Fatal(err)
	}
	if !math.IsNaN(eta[1]) || !math.IsNaN(se[1]) || bad(eta[0]) || bad(se[2]) {
		t.Errorf("predicted %v, standard errors %v", eta, se)
	}
	z.Code[1] = 2
	was := append([]float64(nil), eta...)
	if err := s.PredictTo(context.Background(), eta, se, at, []Covariate{z}); err != nil {
		t.Fatal(err)
	}
	if was[0] != eta[0] || was[2] != eta[2] {
		t.Errorf("an unknown level in one row changes others: %v, %v", was, eta)
	}
	z.Code = []int32{2, 2, 2, 2}
	clay, _ := predict(t, s, at, z)
	near(t, "step from clay to sand", eta[0]-clay[0], names[1].Estimate, 1e-10)
}

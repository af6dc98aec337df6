package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// spreadSample gives observations of Franke's function under one of shapedTruths, with its model.
func spreadSample(c shapedTruth, at Places, seed uint64) (Data, Model) {
	random := rand.New(rand.NewPCG(seed, 71))
	d := Data{Places: at}
	for i, x := range at.X {
		d.Response = append(d.Response, c.draw(random, c.a+c.b*franke(x, at.Y[i]), 1, 20))
	}
	if c.dist == "beta-binomial" || c.dist == "binomial" {
		d.Trials = repeatTo(at.Len(), 20)
	}
	return d, Model{Distribution: c.dist, Link: c.link, MaxKnots: 60}
}

// emptied returns d with nothing in the western half.
func emptied(d Data) Data {
	return replaced(d, func(i int, x, _ float64) float64 {
		if x < 0.5 {
			return 0
		}
		return d.Response[i]
	})
}

// extremes returns the least and the largest value.
func extremes(v []float64) (lo, hi float64) { return slices.Min(v), slices.Max(v) }

// TestAwkwardPlacesOfShapes goes through unusual layouts and values with each distribution that has a shape, a dispersion
// or a link of its own. Every one has an answer, except amounts of 0 under gamma, which are refused.
func TestAwkwardPlacesOfShapes(t *testing.T) {
	at := grid(12)
	for k, c := range shapedTruths {
		draw := func(n int) Places { return scattered(n, rand.New(rand.NewPCG(uint64(k), 72))) }
		t.Run("two clusters "+c.dist, func(t *testing.T) { // errors between them are several times those inside
			p := draw(150)
			for i := range p.X {
				p.X[i], p.Y[i] = 0.05+0.15*p.X[i]+0.75*float64(i%2), 0.05+0.15*p.Y[i]+0.75*float64(i%2)
			}
			d, m := spreadSample(c, p, 1)
			s := fit(t, m, d, Options{Area: at})
			sound(t, s, at)
			_, between := predict(t, s, Places{X: []float64{0.5, 0.2}, Y: []float64{0.5, 0.8}})
			_, own := predict(t, s, p)
			if _, worst := extremes(own); !(between[0] > 1.2*mean(own)) || !(between[1] > 1.5*worst) {
				t.Errorf("standard errors between the clusters %v, at the rows %g on average, %g at most", between, mean(own), worst)
			}
		})
		t.Run("one corner "+c.dist, func(t *testing.T) { // errors grow with the distance from it
			p := draw(150)
			for i := range p.X {
				p.X[i], p.Y[i] = 0.3*p.X[i], 0.3*p.Y[i]
			}
			d, m := spreadSample(c, p, 2)
			s := fit(t, m, d, Options{Area: at})
			sound(t, s, at)
			_, se := predict(t, s, Places{X: []float64{0.2, 0.5, 0.75, 1}, Y: []float64{0.2, 0.5, 0.75, 1}})
			if !slices.IsSorted(se) || !(se[3] > 4*se[0]) {
				t.Errorf("standard errors away from the corner: %v", se)
			}
		})
		t.Run("two rows a place "+c.dist, func(t *testing.T) { // a knot a place
			p := draw(160)
			copy(p.X[80:], p.X[:80])
			copy(p.Y[80:], p.Y[:80])
			d, m := spreadSample(c, p, 3)
			m.MaxKnots = 200
			s := fit(t, m, d, Options{})
			sound(t, s, at)
			if r := s.Report(); r.Knots != 80 || r.DistinctPlaces != 80 {
				t.Errorf("%d knots at %d places", r.Knots, r.DistinctPlaces)
			}
			eta, _ := predict(t, s, p)
			nearAll(t, "both rows of a place", eta[80:], eta[:80], 1e-12, false)
		})
		t.Run("one huge row "+c.dist, func(t *testing.T) { // it takes a bump of its own, or sways trials little
			d, m := spreadSample(c, draw(200), 4)
			const huge = 17
			if d.Trials != nil {
				d.Trials[huge], d.Response[huge] = 1e6, 9e5
			} else {
				d.Response[huge] = 1e6
			}
			s := fit(t, m, d, Options{})
			sound(t, s, at)
			// A million trials are worth no more than some for a beta-binomial, whose rows vary by themselves; a binomial
			// follows them.
			share := s.Rows().Fitted[huge] / d.Response[huge]
			if c.dist == "beta-binomial" && !(share < 0.9) || c.dist == "binomial" && !(math.Abs(share-1) < 0.01) {
				t.Errorf("fitted %g of the huge row", share)
			}
			if lo, _ := extremes(s.linear(d)); bad(lo) || lo < -8 {
				t.Errorf("least linear predictor %g", lo)
			}
		})
		t.Run("half the area zero "+c.dist, func(t *testing.T) { // low there, high in the other half; errors finite
			d, m := spreadSample(c, draw(200), 5)
			d = emptied(d)
			if c.dist == "gamma" {
				_, err := Fit(context.Background(), m, d, Options{})
				var e *Error
				if !errors.As(err, &e) || e.Hint() != "use tweedie where amounts can be 0, or leave the row out" {
					t.Errorf("zeros under gamma: %v", err)
				}
				return
			}
			s := fit(t, m, d, Options{})
			sound(t, s, at)
			eta, _ := predict(t, s, Places{X: []float64{0.15, 0.85}, Y: []float64{0.3, 0.3}})
			if !(s.Mean(eta[0]) < 0.1*s.Mean(eta[1])) {
				t.Errorf("level %g in the empty half, %g in the other", s.Mean(eta[0]), s.Mean(eta[1]))
			}
		})
		t.Run("three places "+c.dist, func(t *testing.T) { // the plane, without a penalty
			p := Places{}
			for i := 0; i < 90; i++ {
				p.X, p.Y = append(p.X, []float64{0, 1, 0.4}[i%3]), append(p.Y, []float64{0, 0.2, 1}[i%3])
			}
			d, m := spreadSample(c, p, 6)
			s := fit(t, m, d, Options{})
			sound(t, s, at)
			if r := s.Report(); math.Abs(r.DF-3) > 1e-9 || !math.IsNaN(r.Lambda) || r.Knots != 3 {
				t.Errorf("%g degrees of freedom, lambda %g, %d knots", r.DF, r.Lambda, r.Knots)
			}
			eta, _ := predict(t, s, Places{X: []float64{0, 1, 0.4}, Y: []float64{0, 0.2, 1}})
			if c.dist == "gamma" { // whose estimates of a place are its means, whatever the dispersion
				sum := [3]float64{}
				for i, y := range d.Response {
					sum[i%3] += y / 30
				}
				for j, v := range eta {
					near(t, "mean of the place", math.Exp(v), sum[j], 1e-9)
				}
			}
		})
	}
}

// TestLevelSeenOnce: a category's level with one row fits it exactly and has leverage one; where that row is a zero count
// the level runs off and the fit is refused. As a group it is drawn to the others and has an answer in both cases.
func TestLevelSeenOnce(t *testing.T) {
	d := simulated(150, 81)
	soil := &d.Covariates[1]
	soil.Level = append(soil.Level, "peat")
	const once = 40
	soil.Code[once] = 3
	model := func(dist string, role Role) Model {
		return Model{Distribution: dist, MaxKnots: 40, Effects: []Effect{{Name: "soil", Role: role}}}
	}
	exact := func(s *Surface) {
		t.Helper()
		sound(t, s, d.Places, d.Covariates...)
		near(t, "leverage of the row", s.Rows().Leverage[once], 1, 1e-9)
		near(t, "its fitted value", s.Rows().Fitted[once], d.Response[once], 1e-7)
	}
	exact(fit(t, model("gaussian", Category), d, Options{}))
	for i := range d.Response {
		d.Response[i] = float64(i % 4)
	}
	for _, dist := range []string{"poisson", "negative-binomial"} {
		d.Response[once] = 3
		exact(fit(t, model(dist, Category), d, Options{}))
		d.Response[once] = 0
		_, err := Fit(context.Background(), model(dist, Category), d, Options{})
		var e *Error
		if !errors.As(err, &e) || e.Message != "the level runs off to zero: a straight line or a covariate parts the rows with zero counts from the others" || !e.FitFailed() {
			t.Errorf("%s, a zero count: %v", dist, err)
		}
		s := fit(t, model(dist, Group), d, Options{})
		sound(t, s, d.Places, d.Covariates...)
		if h := s.Rows().Leverage[once]; !(h < 0.5) {
			t.Errorf("%s as a group: leverage %g", dist, h)
		}
	}
}

// TestConstantCovariates are refused in every role, with what to do.
func TestConstantCovariates(t *testing.T) {
	d := simulated(60, 82)
	d.Covariates = append(d.Covariates, Covariate{Name: "c", Number: repeatTo(60, 4)}, Covariate{Name: "k", Code: make([]int32, 60), Level: []string{"only", "never"}})
	for _, c := range []struct {
		m            Model
		want, advice string
	}{
		{Model{Effects: []Effect{{Name: "c", Role: Linear}}}, `covariate "c" has the same value in every row`, "leave it out"},
		{Model{Effects: []Effect{{Name: "c", Role: Curve}}}, `a curve of "c": a curve needs at least 3 distinct values, and there is 1`, "leave it out"},
		{Model{Effects: []Effect{{Name: "k", Role: Category}}}, `covariate "k" has one level only, "only": there is nothing to compare`, "leave k out"},
		{Model{Effects: []Effect{{Name: "k", Role: Group}}}, `covariate "k" has one level only, "only": there is nothing to compare`, "leave k out"},
		{Model{SurfacePer: "k"}, `covariate "k" has one level only, "only": there is nothing to compare`, "leave --surface-per out"},
	} {
		c.m.Distribution, c.m.MaxKnots = "gaussian", 20
		_, err := Fit(context.Background(), c.m, d, Options{})
		var e *Error
		if !errors.As(err, &e) || e.Message != c.want || e.Hint() != c.advice || !e.FitFailed() {
			t.Errorf("%v, want %s", err, c.want)
		}
	}
}

// same fails unless two fits are one to within what the search leaves open.
func same(t *testing.T, a, b *Surface, tol float64) {
	t.Helper()
	at := grid(8)
	x, y := a.Report(), b.Report()
	etaA, seA := predict(t, a, at)
	etaB, seB := predict(t, b, at)
	nearAll(t, "estimates", etaB, etaA, tol, false)
	nearAll(t, "standard errors, relative", seB, seA, tol, true)
	near(t, "degrees of freedom", y.DF, x.DF, 20*tol)
	near(t, "log-likelihood", y.LogLikelihood, x.LogLikelihood, 20*tol)
	near(t, "restricted likelihood", y.CriterionValue, x.CriterionValue, 20*tol)
}

// TestShapesAtTheirBounds: without extra variation the shape goes to its bound, the simpler distribution is named and is
// what was fitted. For half of all samples of a simpler distribution the restricted likelihood is largest there, in the
// others close by (Self & Liang 1987, JASA 82:605).
func TestShapesAtTheirBounds(t *testing.T) {
	for dist, extra := range map[string]string{"poisson": "negative-binomial", "binomial": "beta-binomial"} {
		bound := 0
		for seed := uint64(0); seed < 12; seed++ {
			d := sample(dist, 200, seed)
			m := Model{Distribution: dist, MaxKnots: 50}
			simple := fit(t, m, d, Options{})
			s, v, err := FitVariation(context.Background(), m, func(ctx context.Context, m Model) (*Surface, error) { return Fit(ctx, m, d, Options{}) })
			if err != nil {
				t.Fatal(err)
			}
			m.Distribution = extra
			e := fit(t, m, d, Options{})
			r := e.Report()
			if !r.Converged {
				t.Errorf("%s, seed %d: not converged", extra, seed)
			}
			if r.Simpler == "" {
				continue
			}
			bound++
			if want := fmt.Sprintf("the %s went back to the %s: there is no extra variation", extra, dist); r.Simpler != dist || v.Chosen != dist || v.Reason != want || s.Report().Distribution != dist {
				t.Errorf("%s: simpler %q, chosen %s because %s", extra, r.Simpler, v.Chosen, v.Reason)
			}
			same(t, simple, e, 1e-5)
			near(t, "AIC counts the shape", r.AIC, simple.Report().AIC+2, 1e-3)
		}
		if t.Logf("%s: at the bound in %d of 12 samples", extra, bound); bound < 3 || bound == 12 {
			t.Errorf("%s: at the bound in %d of 12 samples", extra, bound)
		}
	}
}

// TestTweediePowersAtTheirBounds: amounts from a gamma distribution take the power to its upper bound or near, and at the
// bound the fit is about the gamma fit (variance mu^1.99); whole multiples of one portion take it to 1.01, where amounts
// are multiples of the dispersion.
func TestTweediePowersAtTheirBounds(t *testing.T) {
	upper, lower := 0, 0
	at := grid(8)
	for seed := uint64(0); seed < 6; seed++ {
		d, m := spreadSample(shapedTruths[2], scattered(200, rand.New(rand.NewPCG(seed, 73))), seed)
		gamma := fit(t, m, d, Options{})
		m.Distribution = "tweedie"
		s := fit(t, m, d, Options{})
		sound(t, s, at)
		r := s.Report()
		if !(r.Shape > 1.85) {
			t.Errorf("power %g for gamma amounts", r.Shape)
		}
		if r.Simpler == "gamma" {
			upper++
			near(t, "power", r.Shape, 1.99, 1e-6)
			near(t, "dispersion, relative", r.Dispersion/gamma.Report().Dispersion, 1, 0.02)
			near(t, "degrees of freedom", r.DF, gamma.Report().DF, 0.2)
			want, _ := predict(t, gamma, at)
			got, _ := predict(t, s, at)
			nearAll(t, "estimates", got, want, 0.01, false)
		}
		// Counts of portions of exactly 2.5.
		d = sample("poisson", 200, seed)
		d.Exposure = nil
		for i := range d.Response {
			d.Response[i] *= 2.5
		}
		s = fit(t, m, d, Options{})
		sound(t, s, at)
		if r = s.Report(); !(r.Shape < 1.3) || r.Simpler != "" {
			t.Errorf("power %g for multiples of a portion, simpler %q", r.Shape, r.Simpler)
		}
		if r.Shape < 1.0101 {
			lower++
			near(t, "the portion", r.Dispersion, 2.5, 0.1)
		}
	}
	if t.Logf("powers at the upper bound %d, at the lower %d of 6", upper, lower); upper == 0 || lower == 0 {
		t.Errorf("powers at the upper bound %d, at the lower %d of 6", upper, lower)
	}
}

// grouped is n normal rows of a surface in the given number of groups of standard deviation 1.
func grouped(n, levels int, seed uint64) Data {
	random := rand.New(rand.NewPCG(seed, 84))
	d := Data{Places: scattered(n, random)}
	g, u := Covariate{Name: "g"}, make([]float64, levels)
	for k := range u {
		u[k] = random.NormFloat64()
		g.Level = append(g.Level, fmt.Sprint(k))
	}
	for i := 0; i < n; i++ {
		g.Code = append(g.Code, int32(i%levels))
		d.Response = append(d.Response, franke(d.Places.X[i], d.Places.Y[i])+u[i%levels]+0.5*random.NormFloat64())
	}
	d.Covariates = []Covariate{g}
	return d
}

// TestManyGroups: a thousand levels are fitted, and the variances found; one more is refused before any work, as a
// request that is too large rather than data that are unfit.
func TestManyGroups(t *testing.T) {
	m := Model{Distribution: "gaussian", MaxKnots: 40, Effects: []Effect{{Name: "g", Role: Group}}}
	levels := 1000
	if testing.Short() {
		levels = 300
	}
	r := fit(t, m, grouped(2*levels, levels, 1), Options{}).Report()
	between := r.Dispersion / r.Smooths[1].Lambda
	if !r.Converged || !(math.Abs(between-1) < 4*math.Sqrt(2.0/float64(levels))) || !(math.Abs(r.Dispersion-0.25) < 0.25*6*math.Sqrt(2.0/float64(levels))) {
		t.Errorf("converged %v, variance between %g, within %g; the truth is 1 and 0.25", r.Converged, between, r.Dispersion)
	}
	for _, surface := range []Kind{ThinPlate, None} {
		m.Surface = surface
		_, err := Fit(context.Background(), m, grouped(2002, 1001, 2), Options{})
		var e *Error
		if !errors.As(err, &e) || !e.Request || e.FitFailed() || e.Hint() == "" {
			t.Fatalf("1001 levels: %v", err)
		}
		if want := fmt.Sprintf("1001 columns of covariates beside %d of the surface are more than can be fitted (1000, ", map[Kind]int{ThinPlate: 40, None: 1}[surface]); !strings.HasPrefix(e.Message, want) {
			t.Errorf("1001 levels: %s", e.Message)
		}
	}
}

// TestGroupsBesideOthers: a group crossed with surfaces per level is found in its size; beside its own category, or
// surfaces for each of its levels, there is nothing left of it: no degrees of freedom, a penalty at its top, the rest of
// the fit as without it.
func TestGroupsBesideOthers(t *testing.T) {
	d := simulated(300, 82)
	for _, own := range []bool{false, true} {
		m := Model{Distribution: "gaussian", MaxKnots: 40, SurfacePer: "soil", OwnSmoothness: own, Effects: []Effect{{Name: "depth", Role: Curve}, {Name: "site", Role: Group}}}
		s := fit(t, m, d, Options{})
		sound(t, s, d.Places, d.Covariates...)
		r := s.Report()
		group := r.Smooths[len(r.Smooths)-1]
		if between := r.Dispersion / group.Lambda; group.AtUpper || !(between > 0.02 && between < 0.3) || !(r.Dispersion > 0.03 && r.Dispersion < 0.05) {
			t.Errorf("own smoothness %v: variance between groups %g, within %g; the truth is 0.09 and 0.04", own, between, r.Dispersion)
		}
	}
	for name, c := range map[string]struct{ with, without Model }{
		"its own category": {Model{Effects: []Effect{{Name: "site", Role: Group}, {Name: "site", Role: Category}}}, Model{Effects: []Effect{{Name: "site", Role: Category}}}},
		"its own surfaces": {Model{SurfacePer: "soil", Effects: []Effect{{Name: "soil", Role: Group}}}, Model{SurfacePer: "soil"}},
	} {
		for _, m := range []*Model{&c.with, &c.without} {
			m.Distribution, m.MaxKnots = "gaussian", 30
		}
		a, b := fit(t, c.with, d, Options{}), fit(t, c.without, d, Options{})
		sound(t, a, d.Places, d.Covariates...)
		r := a.Report()
		if group := r.Smooths[len(r.Smooths)-1]; !group.AtUpper || math.Abs(group.DF) > 1e-6 {
			t.Errorf("%s: %+v", name, group)
		}
		near(t, name+": degrees of freedom", r.DF, b.Report().DF, 1e-3)
		nearAll(t, name+": fitted", a.Rows().Fitted, b.Rows().Fitted, 1e-4, false)
	}
}

// TestCurvesOfFewRows: a level with two values has no curve and is named; with three its curve is a line or nearly.
func TestCurvesOfFewRows(t *testing.T) {
	for _, few := range []int{2, 3, 5} {
		d := simulated(200, 83)
		soil, n := &d.Covariates[1], 0
		for i, k := range soil.Code {
			if k == 2 {
				if n++; n > few {
					soil.Code[i] = 0
				}
			}
		}
		m := Model{Distribution: "gaussian", MaxKnots: 40, Effects: []Effect{{Name: "depth", Role: Curve, Per: "soil"}}}
		s, err := Fit(context.Background(), m, d, Options{})
		if few == 2 {
			if want := `a curve of "depth" for soil=sand: a curve needs at least 3 distinct values, and there are 2`; err == nil || err.Error() != want {
				t.Errorf("two rows: %v", err)
			}
			continue
		}
		if err != nil {
			t.Fatal(err)
		}
		sound(t, s, d.Places, d.Covariates...)
		r := s.Report()
		if sand := r.Smooths[3]; !(sand.DF >= 1-1e-6 && sand.DF <= float64(few-1)+1e-6) {
			t.Errorf("%d rows: %+v", few, sand)
		}
		if clay := r.Smooths[1]; !(clay.DF > 5) { // the others are as they would be
			t.Errorf("%d rows: %+v", few, clay)
		}
	}
}

// TestKnotsUntilTheFitSettles goes through the ways in which FitKnots ends: the fit no longer moves; every place has a
// knot; the most that are allowed. On the way knots double, degrees of freedom do not fall, and the end is the fit with
// that many knots from the start.
func TestKnotsUntilTheFitSettles(t *testing.T) {
	waves := func(n int) Data {
		random := rand.New(rand.NewPCG(uint64(n), 85))
		d := Data{Places: scattered(n, random)}
		for i, x := range d.Places.X {
			d.Response = append(d.Response, distuv.Poisson{Lambda: 10 + 8*math.Sin(25*x)*math.Sin(25*d.Places.Y[i]), Src: random}.Rand())
		}
		return d
	}
	for _, c := range []struct {
		name  string
		d     Data
		m     Model
		most  int
		knots []int
		ends  string
	}{
		{"settles", sample("poisson", 120, 120), Model{Distribution: "poisson"}, 0, []int{50, 100}, "settled"},
		{"settles late", sample("gaussian", 900, 86), Model{Distribution: "gaussian"}, 0, []int{50, 100, 200, 400}, "settled"},
		{"a knot a place", sample("gaussian", 40, 87), Model{Distribution: "gaussian"}, 0, []int{40}, "full"},
		{"all places at the second step", waves(80), Model{Distribution: "poisson"}, 0, []int{50, 80}, "full"},
		{"the most", waves(700), Model{Distribution: "poisson"}, 120, []int{50, 100, 120}, "most"},
		{"fewer than the first", waves(200), Model{Distribution: "poisson"}, 30, []int{30}, "most"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, path, err := FitKnots(context.Background(), c.m, c.d, Options{}, c.most)
			if err != nil {
				t.Fatal(err)
			}
			var knots []int
			for k, step := range path {
				knots = append(knots, step.Knots)
				if first := k == 0; math.IsNaN(step.RMS) != first || math.IsNaN(step.Most) != first || !first && !(step.RMS <= step.Most) {
					t.Errorf("step %d: %+v", k, step)
				}
				if k > 0 && !(step.DF > path[k-1].DF-0.5) {
					t.Errorf("degrees of freedom fall from %g to %g", path[k-1].DF, step.DF)
				}
				if settled := step.RMS <= SettledRMS && step.Most <= SettledMost; settled != (c.ends == "settled" && k == len(path)-1) {
					t.Errorf("step %d of %d: %+v", k+1, len(path), step)
				}
			}
			if !slices.Equal(knots, c.knots) {
				t.Errorf("knots %v, want %v: %+v", knots, c.knots, path)
			}
			sound(t, s, grid(6))
			c.m.MaxKnots = knots[len(knots)-1]
			afresh := fit(t, c.m, c.d, Options{})
			same(t, afresh, s, 1e-5)
			near(t, "degrees of freedom on the path", path[len(path)-1].DF, afresh.Report().DF, 1e-4)
		})
	}
	s, path, err := FitKnots(context.Background(), Model{Distribution: "gaussian", Surface: None}, sample("gaussian", 50, 88), Options{}, 0)
	if err != nil || len(path) != 0 || s.Report().Knots != 0 {
		t.Errorf("no surface: %v, %v", path, err)
	}
}

// TestFractionsAreNoCounts: distributions with extra variation are over whole numbers, and say so.
func TestFractionsAreNoCounts(t *testing.T) {
	d := simulated(60, 4)
	d.Covariates = nil
	for i := range d.Response {
		d.Response[i] = 2.5
	}
	trials := repeatTo(60, 7)
	for dist, want := range map[string]string{
		"negative-binomial": "row 1: 2.5 is not a whole number, and negative-binomial needs one",
		"beta-binomial":     "row 1: 2.5 is not a whole number, and beta-binomial needs one",
	} {
		if d.Trials = nil; dist == "beta-binomial" {
			d.Trials = trials
		}
		_, err := Fit(context.Background(), Model{Distribution: dist, MaxKnots: 20}, d, Options{})
		var e *Error
		if !errors.As(err, &e) || e.Message != want || e.Advice == "" {
			t.Errorf("%s: %v", dist, err)
		}
	}
}

package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// simulated returns places with a covariate, a category and groups, and a gaussian response made of all of them.
func simulated(n int, seed uint64) Data {
	random := rand.New(rand.NewPCG(seed, 9))
	d := Data{}
	depth, soil, site := Covariate{Name: "depth"}, Covariate{Name: "soil", Level: []string{"clay", "loam", "sand"}}, Covariate{Name: "site"}
	level := make([]float64, 12)
	for k := range level {
		site.Level = append(site.Level, fmt.Sprintf("s%02d", k))
		level[k] = 0.3 * random.NormFloat64()
	}
	for i := 0; i < n; i++ {
		x, y, z := random.Float64(), random.Float64(), 10*random.Float64()
		k, g := int32(random.IntN(3)), int32(random.IntN(12))
		d.Places.X, d.Places.Y = append(d.Places.X, x), append(d.Places.Y, y)
		depth.Number, soil.Code, site.Code = append(depth.Number, z), append(soil.Code, k), append(site.Code, g)
		d.Response = append(d.Response, math.Sin(4*x)*math.Cos(3*y)+0.8*math.Sin(z)+0.4*float64(k)+level[g]+0.2*random.NormFloat64())
	}
	d.Covariates = []Covariate{depth, soil, site}
	return d
}

// TestCurveAtLargeLambdaIsALine: a curve whose penalty is beyond bounds is the least-squares line (common practice, no
// source). The data are a line with noise, so restricted likelihood takes the penalty there or close.
func TestCurveAtLargeLambdaIsALine(t *testing.T) {
	random := rand.New(rand.NewPCG(4, 4))
	n := 200
	d := Data{Places: Places{X: make([]float64, n), Y: make([]float64, n)}}
	z := Covariate{Name: "z"}
	for i := 0; i < n; i++ {
		v := 5 * random.Float64()
		z.Number = append(z.Number, v)
		d.Response = append(d.Response, 1+2*v+0.1*random.NormFloat64()*(1-2*float64(i%2)))
	}
	d.Covariates = []Covariate{z}
	line := fit(t, Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "z", Role: Linear}}}, d, Options{})
	for seed := uint64(0); ; seed++ {
		curve := fit(t, Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "z", Role: Curve}}}, d, Options{})
		sm := curve.Report().Smooths[0]
		if !sm.AtUpper { // not for this noise: draw another
			for i := range d.Response {
				d.Response[i] = 1 + 2*z.Number[i] + 0.1*random.NormFloat64()
			}
			if seed == 20 {
				t.Fatal("the data never chose a line")
			}
			continue
		}
		line = fit(t, Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "z", Role: Linear}}}, d, Options{})
		near(t, "degrees of freedom", curve.Report().DF, 2, 1e-4)
		nearAll(t, "fitted", curve.Rows().Fitted, line.Rows().Fitted, 1e-5, false)
		return
	}
}

// TestBalancedOneWayLayout compares a random intercept with the restricted-likelihood estimates of the balanced one-way
// random-effects analysis of variance, which are closed: sigma2 = MSE, sigma2_u = (MSA - MSE)/m (Searle, Casella &
// McCulloch 1992, Variance Components, ch. 4).
func TestBalancedOneWayLayout(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 1))
	const groups, m = 9, 7
	d := Data{Places: Places{X: make([]float64, groups*m), Y: make([]float64, groups*m)}}
	g := Covariate{Name: "g"}
	mean, grand := make([]float64, groups), 0.0
	for k := 0; k < groups; k++ {
		g.Level = append(g.Level, fmt.Sprint(k))
		u := 1.5 * random.NormFloat64()
		for j := 0; j < m; j++ {
			y := 10 + u + random.NormFloat64()
			d.Response, g.Code = append(d.Response, y), append(g.Code, int32(k))
			mean[k] += y / m
			grand += y / (groups * m)
		}
	}
	d.Covariates = []Covariate{g}
	var within, between float64
	for i, y := range d.Response {
		within += (y - mean[g.Code[i]]) * (y - mean[g.Code[i]])
	}
	for _, v := range mean {
		between += m * (v - grand) * (v - grand)
	}
	mse, msa := within/(groups*(m-1)), between/(groups-1)
	s := fit(t, Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "g", Role: Group}}}, d, Options{})
	r := s.Report()
	near(t, "variance within", r.Dispersion, mse, 1e-7*mse)
	want := (msa - mse) / m
	near(t, "variance between", r.Dispersion/r.Smooths[0].Lambda, want, 1e-6*want)
	near(t, "intercept", r.Coefficients[0].Estimate, grand, 1e-9)

	at := Places{X: []float64{0, 0, 0}, Y: []float64{0, 0, 0}}
	eta, se := predict(t, s, at, Covariate{Name: "g", Code: []int32{0, 1, 1}, Level: []string{"0", "new"}})
	shrunk := grand + (mean[0]-grand)*want/(want+mse/m)
	near(t, "a known group is shrunk towards the mean", eta[0], shrunk, 1e-8)
	near(t, "an unseen group has the mean", eta[1], grand, 1e-9)
	// Var(mean) = (sigma2_u + sigma2/m)/groups; an unseen group adds sigma2_u.
	near(t, "an unseen group's error", se[1]*se[1], want+(want+mse/m)/groups, 1e-6)
	average, averageSE := predict(t, s, at)
	near(t, "without the group, its average level", average[0], grand, 1e-9)
	near(t, "and its error", averageSE[0]*averageSE[0], (want+mse/m)/groups, 1e-6)
}

// TestPoissonGroupsAgainstBruteForceLaplace evaluates the Laplace criterion of a tiny model with the test's own Newton
// iterations and dense algebra, and looks for its minimum by golden section.
func TestPoissonGroupsAgainstBruteForceLaplace(t *testing.T) {
	count := []float64{3, 5, 2, 9, 12, 7, 1, 0, 2, 4, 6, 15}
	code := []int32{0, 0, 0, 1, 1, 1, 2, 2, 2, 3, 3, 3}
	laplace := func(lambda float64) float64 {
		b := make([]float64, 5) // intercept, four groups
		b[0] = math.Log(5)
		var chol mat.Cholesky
		value := 0.0
		for step := 0; step < 60; step++ {
			h, g := mat.NewSymDense(5, nil), mat.NewVecDense(5, nil)
			value = 0
			for k := 1; k < 5; k++ {
				h.SetSym(k, k, lambda)
				g.SetVec(k, -lambda*b[k])
				value += lambda * b[k] * b[k] / 2
			}
			for i, y := range count {
				k := int(code[i]) + 1
				eta := b[0] + b[k]
				mu := math.Exp(eta)
				l, _ := math.Lgamma(y + 1)
				value -= y*eta - mu - l
				g.SetVec(0, g.AtVec(0)+y-mu)
				g.SetVec(k, g.AtVec(k)+y-mu)
				h.SetSym(0, 0, h.At(0, 0)+mu)
				h.SetSym(0, k, h.At(0, k)+mu)
				h.SetSym(k, k, h.At(k, k)+mu)
			}
			chol.Factorize(h)
			var d mat.VecDense
			if err := chol.SolveVecTo(&d, g); err != nil {
				t.Fatal(err)
			}
			for k := range b {
				b[k] += d.AtVec(k)
			}
		}
		return value + (chol.LogDet()-4*math.Log(lambda)-math.Log(2*math.Pi))/2
	}
	lo, hi := math.Log(0.05), math.Log(50.0)
	for hi-lo > 1e-9 {
		a, b := lo+0.381966*(hi-lo), lo+0.618034*(hi-lo)
		if laplace(math.Exp(a)) < laplace(math.Exp(b)) {
			hi = b
		} else {
			lo = a
		}
	}
	n := len(count)
	d := Data{Response: count, Places: Places{X: make([]float64, n), Y: make([]float64, n)},
		Covariates: []Covariate{{Name: "g", Code: code, Level: []string{"a", "b", "c", "d"}}}}
	r := fit(t, Model{Distribution: "poisson", Surface: None, Effects: []Effect{{Name: "g", Role: Group}}}, d, Options{}).Report()
	near(t, "criterion", r.CriterionValue, laplace(r.Smooths[0].Lambda), 1e-9)
	near(t, "log lambda", math.Log(r.Smooths[0].Lambda), (lo+hi)/2, 1e-6)
}

// TestSurfacesPerLevel: with a penalty each and one dispersion, surfaces of levels are what separate fits at the same
// lambda give.
func TestSurfacesPerLevel(t *testing.T) {
	d := simulated(240, 3)
	m := Model{Distribution: "gaussian", SurfacePer: "soil", MaxKnots: 30, Smoothness: given(0.01)}
	knots := fit(t, Model{Distribution: "gaussian", MaxKnots: 30, Smoothness: given(0.01)}, d, Options{}).knots
	o := Options{Knots: Places{X: knots.X, Y: knots.Y}}
	all := fit(t, m, d, o)
	for level := int32(0); level < 3; level++ {
		one := Data{}
		for i, k := range d.Covariates[1].Code {
			if k == level {
				one.Response = append(one.Response, d.Response[i])
				one.Places.X, one.Places.Y = append(one.Places.X, d.Places.X[i]), append(one.Places.Y, d.Places.Y[i])
			}
		}
		alone := fit(t, Model{Distribution: "gaussian", Smoothness: given(0.01)}, one, o)
		code := make([]int32, len(one.Response))
		for i := range code {
			code[i] = level
		}
		want, wantSE := predict(t, alone, one.Places)
		got, gotSE := predict(t, all, one.Places, Covariate{Name: "soil", Code: code, Level: d.Covariates[1].Level})
		nearAll(t, "surface", got, want, 1e-9, false)
		scale := math.Sqrt(all.Report().Dispersion / alone.Report().Dispersion)
		for i := range wantSE {
			wantSE[i] *= scale
		}
		nearAll(t, "its error", gotSE, wantSE, 1e-8, true)
	}
	own := m
	own.Smoothness, own.OwnSmoothness = Smoothness{}, true
	if got := len(fit(t, own, d, o).Report().Smooths); got != 3 {
		t.Errorf("%d penalties for three surfaces with one each", got)
	}
	own.OwnSmoothness = false
	if got := len(fit(t, own, d, o).Report().Smooths); got != 1 {
		t.Errorf("%d penalties for three surfaces that share one", got)
	}
}

// TestEverythingTogether fits a surface, a curve for each level, a group and a category, and checks that every part is
// found: the degrees of freedom add up, the search converged, stored surfaces predict the same.
func TestEverythingTogether(t *testing.T) {
	d := simulated(900, 5)
	m := Model{Distribution: "gaussian", MaxKnots: 60, Effects: []Effect{{Name: "depth", Role: Curve, Per: "soil"}, {Name: "site", Role: Group}}}
	s := fit(t, m, d, Options{})
	r := s.Report()
	if !r.Converged || len(r.Smooths) != 5 {
		t.Fatalf("converged %v with %d penalties", r.Converged, len(r.Smooths))
	}
	sum := 1 + 2 + r.SurfaceDF // intercept, steps of soil
	for _, v := range r.Smooths[1:] {
		sum += v.DF
	}
	near(t, "degrees of freedom add up", sum, r.DF, 1e-8)
	if r.Dispersion < 0.034 || r.Dispersion > 0.047 {
		t.Errorf("residual variance %g, the truth is 0.04", r.Dispersion)
	}
	between := r.Dispersion / r.Smooths[4].Lambda
	if between < 0.02 || between > 0.3 {
		t.Errorf("variance between groups %g, the truth is 0.09", between)
	}
	restored, err := Restore(s.State(), 1)
	if err != nil {
		t.Fatal(err)
	}
	a, aSE := predict(t, s, d.Places, d.Covariates...)
	b, bSE := predict(t, restored, d.Places, d.Covariates...)
	nearAll(t, "restored", b, a, 0, false)
	nearAll(t, "restored error", bSE, aSE, 0, false)
	nearAll(t, "prediction at the rows", a, s.Rows().Fitted, 1e-9, false)
}

// TestShrinkLetsTheSurfaceVanish: without any spatial variation the surface keeps next to no degrees of freedom in most
// samples, where without shrinkage it keeps at least its two slopes.
func TestShrinkLetsTheSurfaceVanish(t *testing.T) {
	random := rand.New(rand.NewPCG(12, 2))
	vanished := 0
	for rep := 0; rep < 20; rep++ {
		d := Data{}
		for i := 0; i < 150; i++ {
			d.Places.X, d.Places.Y = append(d.Places.X, random.Float64()), append(d.Places.Y, random.Float64())
			d.Response = append(d.Response, random.NormFloat64())
		}
		r := fit(t, Model{Distribution: "gaussian", MaxKnots: 40, Shrink: true}, d, Options{}).Report()
		if r.SurfaceDF < 0.3 {
			vanished++
		}
		if plain := fit(t, Model{Distribution: "gaussian", MaxKnots: 40}, d, Options{}).Report(); plain.SurfaceDF < 2-1e-6 {
			t.Fatalf("without shrinkage %g degrees of freedom", plain.SurfaceDF)
		}
	}
	if vanished < 7 {
		t.Errorf("the surface vanished in %d of 20 samples", vanished)
	}
}

// TestTermRefusals names what is wrong with an effect.
func TestTermRefusals(t *testing.T) {
	d := simulated(80, 2)
	d.Covariates = append(d.Covariates, Covariate{Name: "flag", Number: repeatTo(80, 0, 1)})
	big := Covariate{Name: "big"}
	for i := 0; i < 80; i++ {
		big.Level, big.Code = append(big.Level, fmt.Sprint(i)), append(big.Code, int32(i))
	}
	d.Covariates = append(d.Covariates, big)
	for name, c := range map[string]struct {
		m    Model
		want string
	}{
		"a curve of two values":       {Model{Effects: []Effect{{Name: "flag", Role: Curve}}}, `a curve of "flag": a curve needs at least 3 distinct values, and there are 2`},
		"a curve and a line of one":   {Model{Effects: []Effect{{Name: "depth", Role: Linear}, {Name: "depth", Role: Curve}}}, `covariate "depth straight" cannot be told apart from depth`},
		"a curve of a category":       {Model{Effects: []Effect{{Name: "soil", Role: Curve}}}, `covariate "soil" is not of the kind its effect needs`},
		"surfaces of one place each":  {Model{SurfacePer: "big"}, `80 observations cannot settle 240 unpenalised coefficients`},
		"an unknown surface category": {Model{SurfacePer: "nothing"}, `there is no covariate "nothing"`},
	} {
		c.m.Distribution, c.m.MaxKnots = "gaussian", 20
		_, err := Fit(context.Background(), c.m, d, Options{})
		var e *Error
		if !errors.As(err, &e) || e.Message != c.want {
			t.Errorf("%s: %v, want %s", name, err, c.want)
		}
	}
}

func repeatTo(n int, values ...float64) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = values[i%len(values)]
	}
	return v
}

// TestScaledVariation: with the variance scaled, a fit to counts that are three times as scattered as Poisson allows
// keeps about the degrees of freedom of the truth, its dispersion is found, and at a given lambda estimates are those of
// the plain fit with errors larger by the square root of the dispersion (Wedderburn 1974, Biometrika 61:439-447).
func TestScaledVariation(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 6))
	d := Data{}
	for i := 0; i < 500; i++ {
		x, y := random.Float64(), random.Float64()
		mu := 6 * math.Exp(math.Sin(4*x)*math.Cos(2*y))
		// A gamma-mixed Poisson count with variance 3 mu: shape mu/2, scale 2.
		d.Response = append(d.Response, poissonDraw(random, gammaDraw(random, mu/2)*2))
		d.Places.X, d.Places.Y = append(d.Places.X, x), append(d.Places.Y, y)
	}
	plain := fit(t, Model{Distribution: "poisson", MaxKnots: 100}, d, Options{}).Report()
	scaled := fit(t, Model{Distribution: "poisson", MaxKnots: 100, ScaleVariation: true}, d, Options{}).Report()
	if !scaled.Converged || scaled.KnownDispersion || scaled.Dispersion < 2.3 || scaled.Dispersion > 3.7 {
		t.Errorf("converged %v, dispersion %g, the truth is 3", scaled.Converged, scaled.Dispersion)
	}
	if scaled.DF > 0.6*plain.DF || !math.IsNaN(scaled.AIC) {
		t.Errorf("%g degrees of freedom scaled, %g plain, AIC %g", scaled.DF, plain.DF, scaled.AIC)
	}
	m := Model{Distribution: "poisson", MaxKnots: 100, Smoothness: given(scaled.Lambda)}
	a := fit(t, m, d, Options{})
	m.ScaleVariation = true
	b := fit(t, m, d, Options{})
	want, wantSE := predict(t, a, d.Places)
	got, gotSE := predict(t, b, d.Places)
	nearAll(t, "estimates at one lambda", got, want, 1e-9, false)
	for i := range wantSE {
		wantSE[i] *= math.Sqrt(b.Report().Pearson)
	}
	nearAll(t, "errors at one lambda", gotSE, wantSE, 1e-9, true)
}

// gammaDraw draws from the gamma distribution of that shape and scale 1 (Marsaglia & Tsang 2000).
func gammaDraw(random *rand.Rand, shape float64) float64 {
	if shape < 1 {
		return gammaDraw(random, shape+1) * math.Pow(random.Float64(), 1/shape)
	}
	d := shape - 1.0/3
	for {
		x := random.NormFloat64()
		v := math.Pow(1+x/math.Sqrt(9*d), 3)
		if v > 0 && math.Log(random.Float64()) < x*x/2+d-d*v+d*math.Log(v) {
			return d * v
		}
	}
}

func poissonDraw(random *rand.Rand, mu float64) (k float64) {
	for p := random.Float64(); p > math.Exp(-mu); p *= random.Float64() {
		k++
	}
	return k
}

// TestSmoothnessUncertainty rebuilds the first-order correction from fits at given lambdas alone: the added variance at a
// place is (d eta/d rho)^2 / V”(rho), both by central differences of what such fits report.
func TestSmoothnessUncertainty(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 8))
	d := Data{}
	for i := 0; i < 200; i++ {
		x, y := random.Float64(), random.Float64()
		d.Places.X, d.Places.Y = append(d.Places.X, x), append(d.Places.Y, y)
		d.Response = append(d.Response, poissonDraw(random, 4*math.Exp(math.Sin(5*x)*y)))
	}
	m := Model{Distribution: "poisson", MaxKnots: 60}
	at := Places{X: []float64{0.2, 0.5, 0.9}, Y: []float64{0.3, 0.5, 0.95}}
	plain := fit(t, m, d, Options{})
	_, se := predict(t, plain, at)
	m.SmoothnessUncertainty = true
	with := fit(t, m, d, Options{})
	_, more := predict(t, with, at)
	const h = 0.02
	side := func(step float64) (Report, []float64) {
		g := Model{Distribution: "poisson", MaxKnots: 60, Smoothness: given(plain.Report().Lambda * math.Exp(step))}
		s := fit(t, g, d, Options{})
		eta, _ := predict(t, s, at)
		return s.Report(), eta
	}
	up, etaUp := side(h)
	mid, _ := side(0)
	down, etaDown := side(-h)
	curvature := (up.CriterionValue - 2*mid.CriterionValue + down.CriterionValue) / (h * h)
	for i := range se {
		slope := (etaUp[i] - etaDown[i]) / (2 * h)
		near(t, "added variance, relative", (more[i]*more[i]-se[i]*se[i])/(slope*slope/curvature), 1, 2e-3)
	}
	if r := with.Report(); !(r.AICCorrected > r.AIC) || math.IsNaN(plain.Report().AIC) || !math.IsNaN(plain.Report().AICCorrected) {
		t.Errorf("AIC %g, corrected %g", r.AIC, r.AICCorrected)
	}
	sums, err := with.Sums(context.Background(), at, nil, []Share{{Index: []int32{0}, Weight: []float64{1}}}, 40000, 1)
	if err != nil {
		t.Fatal(err)
	}
	logs := sums[0].Draws
	mean, ss := 0.0, 0.0
	for _, v := range logs {
		mean += math.Log(v) / float64(len(logs))
	}
	for _, v := range logs {
		ss += (math.Log(v) - mean) * (math.Log(v) - mean) / float64(len(logs)-1)
	}
	near(t, "spread of draws, relative", math.Sqrt(ss)/more[0], 1, 4/math.Sqrt(2*40000))
	restored, err := Restore(with.State(), 1)
	if err != nil {
		t.Fatal(err)
	}
	_, again := predict(t, restored, at)
	nearAll(t, "restored", again, more, 0, false)
}

// TestEffectFigures holds the effects' figures against predictions: a curve's difference between two values is that of
// the linear predictor, and a band at a slope's mean is the error of the overall level.
func TestEffectFigures(t *testing.T) {
	d := simulated(400, 8)
	u := Covariate{Name: "u"}
	random := rand.New(rand.NewPCG(2, 2))
	for range d.Response {
		u.Number = append(u.Number, 3+random.NormFloat64())
	}
	d.Covariates = append(d.Covariates, u)
	m := Model{Distribution: "gaussian", MaxKnots: 40, Effects: []Effect{{Name: "u", Role: Linear}, {Name: "soil", Role: Category}, {Name: "depth", Role: Curve}, {Name: "site", Role: Group}}}
	s := fit(t, m, d, Options{})
	at := Places{X: []float64{0.5, 0.5}, Y: []float64{0.5, 0.5}}
	level := func(z ...Covariate) float64 {
		base := []Covariate{{Name: "u", Number: []float64{3, 3}}, {Name: "soil", Code: []int32{0, 0}, Level: d.Covariates[1].Level}, {Name: "depth", Number: []float64{5, 5}}}
		for _, c := range z {
			for i := range base {
				if base[i].Name == c.Name {
					base[i] = c
				}
			}
			if c.Name == "site" {
				base = append(base, c)
			}
		}
		eta, _ := predict(t, s, at, base...)
		return eta[1] - eta[0]
	}
	figures := s.Effects()
	if len(figures) != 4 {
		t.Fatalf("%d figures", len(figures))
	}
	slope, step, curve, group := figures[0], figures[1], figures[2], figures[3]
	near(t, "slope", slope.Estimate[80]-slope.Estimate[10], level(Covariate{Name: "u", Number: []float64{slope.X[10], slope.X[80]}}), 1e-9)
	near(t, "step", step.Estimate[2]-step.Estimate[1], level(Covariate{Name: "soil", Code: []int32{1, 2}, Level: d.Covariates[1].Level}), 1e-9)
	near(t, "curve", curve.Estimate[70]-curve.Estimate[20], level(Covariate{Name: "depth", Number: []float64{curve.X[20], curve.X[70]}}), 1e-9)
	near(t, "group", group.Estimate[3]-group.Estimate[1], level(Covariate{Name: "site", Code: []int32{1, 3}, Level: d.Covariates[2].Level}), 1e-9)
	overall := s.errorOf(s.mean)
	least := math.Inf(1)
	for _, se := range slope.StandardError {
		least = math.Min(least, se)
	}
	if least < overall || least > 1.02*overall {
		t.Errorf("the slope's band is narrowest at %g, the overall level has %g", least, overall)
	}
	sum := 0.0
	row := make([]float64, 0)
	for _, z := range d.Covariates[0].Number {
		i := int(z / 10 * 100)
		row = append(row, curve.Estimate[min(i, 100)])
	}
	for _, v := range row {
		sum += v / float64(len(row))
	}
	near(t, "the curve is zero on average over the rows", sum, 0, 0.03)
	for _, f := range figures {
		if !(f.Overlap >= 0 && f.Overlap < 0.35) {
			t.Errorf("%s, drawn independently, overlaps with the rest by %g", f.Name, f.Overlap)
		}
	}

	// A covariate that is nearly a function of place overlaps with the surface, and one that is exactly so more.
	place := Covariate{Name: "u"}
	for i := range d.Response {
		place.Number = append(place.Number, math.Sin(3*d.Places.X[i])+0.05*random.NormFloat64())
	}
	d.Covariates[3] = place
	confounded := fit(t, m, d, Options{}).Effects()[0]
	if confounded.Overlap < 0.8 {
		t.Errorf("a covariate made of place overlaps by %g only", confounded.Overlap)
	}
}

// TestOverlapAgainstDenseAlgebra recomputes one effect's overlap from rows: a weighted penalised regression of its
// contribution on everything else, by normal equations made in the test.
func TestOverlapAgainstDenseAlgebra(t *testing.T) {
	d := simulated(150, 21)
	m := Model{Distribution: "gaussian", MaxKnots: 15, Effects: []Effect{{Name: "depth", Role: Curve}, {Name: "soil", Role: Category}}}
	s := fit(t, m, d, Options{})
	n := len(d.Response)
	basis, curve := s.core.basis, s.border.Effects[0].Curve[0]
	k := basis.Dim() + 2
	x := mat.NewDense(n, k, nil)
	row, bend := make([]float64, basis.Dim()), make([]float64, curve.Dim())
	var w coreScratch
	f := make([]float64, n)
	straight := dot(s.border.functional(0, 3), s.beta[basis.Dim():basis.Dim()+3])
	for i := 0; i < n; i++ {
		s.core.oneTo(row, basis.Dim(), d.Places.X[i:i+1], d.Places.Y[i:i+1], &w.spread)
		for j, v := range row {
			x.Set(i, j, v)
		}
		if l := d.Covariates[1].Code[i]; l > 0 {
			x.Set(i, basis.Dim()+int(l)-1, 1)
		}
		curve.RowTo(bend, d.Covariates[0].Number[i])
		f[i] = straight*bend[0] + dot(bend[1:], s.beta[basis.Dim()+3:])
	}
	h, right := mat.NewDense(k, k, nil), mat.NewVecDense(k, nil)
	h.Mul(x.T(), x)
	right.MulVec(x.T(), mat.NewVecDense(n, f))
	lambda := s.report.Smooths[0].Lambda / (basis.Scale * basis.Scale)
	for j := 3; j < basis.Dim(); j++ {
		h.Set(j, j, h.At(j, j)+lambda)
	}
	var b, fitted mat.VecDense
	if err := b.SolveVec(h, right); err != nil {
		t.Fatal(err)
	}
	fitted.MulVec(x, &b)
	mean, rss, ss := 0.0, 0.0, 0.0
	for _, v := range f {
		mean += v / float64(n)
	}
	for i, v := range f {
		rss += (v - fitted.AtVec(i)) * (v - fitted.AtVec(i))
		ss += (v - mean) * (v - mean)
	}
	near(t, "overlap", s.Effects()[0].Overlap, 1-rss/ss, 1e-9)
}

package spatial

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"drumlin/spatial/response"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

// imhof returns the chance that a sum of weighted chi-squared variables exceeds x, weight[r] with df[r] degrees of freedom,
// by the formula of Imhof (1961, Biometrika 48:419-426), integrated by Simpson's rule up to u = most.
func imhof(x float64, weight, df []float64, most float64) float64 {
	at := func(u float64) float64 {
		theta, log := -x*u/2, 0.0
		for r, w := range weight {
			theta += df[r] / 2 * math.Atan(w*u)
			log += df[r] / 4 * math.Log1p(w*w*u*u)
		}
		return math.Sin(theta) / (u * math.Exp(log))
	}
	const step = 0.01
	h := step / math.Max(1, x/20)
	n := 2 * int(most/h/2)
	slope := -x / 2 // the integrand at 0
	for r, w := range weight {
		slope += df[r] * w / 2
	}
	sum := slope + at(float64(n)*h)
	for i := 1; i < n; i++ {
		sum += float64(2+2*(i%2)) * at(float64(i)*h)
	}
	return 0.5 + sum*h/3/math.Pi
}

// TestImhofAgainstItsTable checks the tests' own reference with values of table 1 of Imhof (1961), quoted from memory, for
// 0.6, 0.3 and 0.1 times chi-squared variables of 2, 2, 2 and of 6, 4, 2 degrees of freedom.
func TestImhofAgainstItsTable(t *testing.T) {
	weight := []float64{0.6, 0.3, 0.1}
	for _, c := range []struct {
		x, want float64
		df      []float64
	}{
		{2, 0.3998, []float64{2, 2, 2}}, {6, 0.0161, []float64{2, 2, 2}},
		{1, 0.9973, []float64{6, 4, 2}}, {5, 0.4353, []float64{6, 4, 2}}, {12, 0.0088, []float64{6, 4, 2}},
	} {
		near(t, "chance", imhof(c.x, weight, c.df, 400), c.want, 5.01e-5)
	}
	sum := 0.0 // with two degrees of freedom each, by partial fractions: a mixture of exponential variables
	for i, w := range weight {
		part := math.Exp(-2 / (2 * w))
		for j, v := range weight {
			if j != i {
				part *= w / (w - v)
			}
		}
		sum += part
	}
	near(t, "partial fractions", imhof(2, weight, []float64{2, 2, 2}, 1000), sum, 1e-8)
}

// mixture returns the weights of the reference distribution with their degrees of freedom, as Wood (2013) has them.
func mixture(k int, nu float64) (weight, df []float64) {
	side := math.Sqrt(1 - nu*nu)
	return []float64{1, (1 + nu + side) / 2, (1 + nu - side) / 2}, []float64{float64(k - 1), 1, 1}
}

// TestMixedTail compares with Imhof's integral, for an estimated dispersion that of the difference with the weighted
// chi-squared variable of the dispersion; and for two terms with the convolution of the two.
func TestMixedTail(t *testing.T) {
	for _, k := range []int{4, 11} {
		for _, nu := range []float64{0.03, 0.4, 0.95} {
			weight, df := mixture(k, nu)
			for _, x := range []float64{0.3, 3, 28} {
				near(t, "chi-squared", mixedTail(x, k, nu, 0), imhof(x, weight, df, 600), 3e-8)
				for _, residual := range []float64{5, 60} {
					near(t, "F", mixedTail(x, k, nu, residual), imhof(0, append(weight, -x/residual), append(df, residual), 200), 3e-8)
				}
			}
		}
	}
	for _, nu := range []float64{0.1, 0.5, 0.9} { // P = 2 int_0^z phi(z) P(chi^2 > (x - low z^2)/high) dz + P(low Z^2 > x)
		weight, _ := mixture(1, nu)
		high, low := weight[1], weight[2]
		one := distuv.ChiSquared{K: 1}
		for _, x := range []float64{0.3, 4, 40} {
			z, n := math.Sqrt(x/low), 200000
			sum := one.Survival(x / low)
			for i := 0; i < n; i++ { // z sin: the root at the end becomes smooth
				sin, cos := math.Sincos(math.Pi / 2 * (float64(i) + 0.5) / float64(n))
				at := z * sin
				sum += 2 * distuv.UnitNormal.Prob(at) * one.Survival((x-low*at*at)/high) * z * cos * math.Pi / 2 / float64(n)
			}
			got := mixedTail(x, 1, nu, 0)
			near(t, "two terms", got/sum, 1, 1e-8)
		}
	}
}

// TestMixedTailAtWholeRanks: at its ends the mixture is a chi-squared or F variable with k and k+1 degrees of freedom, also
// far out where the chance is tiny.
func TestMixedTailAtWholeRanks(t *testing.T) {
	for _, k := range []int{1, 2, 6, 18} {
		for _, x := range []float64{0.1, 5, 60, 900} {
			for _, residual := range []float64{0, 8, 300} {
				for c, nu := range []float64{1e-9, 1 - 1e-9} {
					got, want := mixedTail(x, k, nu, residual), tail(x, float64(k+c), residual)
					tol := 1e-3 // of a weight of 3e-5 beside 1 at x = 900
					if want > 1e-20 {
						tol = 3e-4
					}
					if math.Abs(got/want-1) > tol {
						t.Errorf("k=%d nu=%g x=%g residual=%g: got %g, want %g", k, nu, x, residual, got, want)
					}
				}
			}
		}
	}
	near(t, "F of 3 and 10 degrees of freedom at its 5 % point (Fisher & Yates 1963, from memory)", tail(3*3.7083, 3, 10), 0.05, 2e-6)
}

// curveSample returns n rows whose response hangs on z by effect, and the model that has a curve of z.
func curveSample(random *rand.Rand, n int, dist string, surface Kind, effect func(z float64) float64) (Model, Data) {
	z := Covariate{Name: "z"}
	d := Data{}
	var sampler response.Sampler
	o := response.Obs{Trials: 1, Weight: 1}
	switch dist {
	case "gaussian":
		sampler = response.Gaussian{}
	case "poisson":
		sampler = response.Poisson{}
	}
	for i := 0; i < n; i++ {
		v := random.Float64()
		z.Number = append(z.Number, v)
		d.Places.X, d.Places.Y = append(d.Places.X, random.Float64()), append(d.Places.Y, random.Float64())
		d.Response = append(d.Response, sampler.Draw(random, o, 1+effect(v), 1))
	}
	d.Covariates = []Covariate{z}
	return Model{Distribution: dist, Surface: surface, MaxKnots: 15, Effects: []Effect{{Name: "z", Role: Curve}}}, d
}

// TestCurveThatIsALine: where the penalty is at its bound the curve is a line, DF is 1, and the test is the t-test of the
// slope of an ordinary regression (common practice, no source).
func TestCurveThatIsALine(t *testing.T) {
	lines := 0
	for seed := uint64(0); seed < 12; seed++ {
		m, d := curveSample(rand.New(rand.NewPCG(seed, 21)), 60, "gaussian", None, func(z float64) float64 { return z })
		s := fit(t, m, d, Options{})
		if !s.report.Smooths[0].AtUpper {
			continue
		}
		lines++
		list, err := s.TestCurves(d.Covariates)
		if err != nil {
			t.Fatal(err)
		}
		m.Effects[0].Role = Linear
		line := fit(t, m, d, Options{})
		slope := line.report.Coefficients[1]
		ratio := slope.Estimate / slope.StandardError
		near(t, "degrees of freedom", list[0].DF, 1, 1e-4)
		near(t, "residual degrees of freedom", list[0].ResidualDF, 58, 1e-4)
		near(t, "statistic", list[0].Statistic, ratio*ratio, 2e-3*ratio*ratio)
		near(t, "p", list[0].P, 2*distuv.StudentsT{Sigma: 1, Nu: 58}.CDF(-math.Abs(ratio)), 2e-3)
	}
	if lines < 3 {
		t.Fatalf("only %d of the samples gave a line", lines)
	}
}

// TestUnpenalisedCurve: without a penalty to speak of the test is the F-test of all columns against none (common practice,
// no source).
func TestUnpenalisedCurve(t *testing.T) {
	m, d := curveSample(rand.New(rand.NewPCG(5, 22)), 120, "gaussian", None, func(z float64) float64 { return math.Sin(9 * z) })
	s := fit(t, m, d, Options{})
	list, err := s.TestCurves(d.Covariates)
	if err != nil {
		t.Fatal(err)
	}
	full := list[0]
	c := s.border.Effects[0].Curve[0]
	plain := Data{Response: d.Response, Places: d.Places}
	regression := Model{Distribution: "gaussian", Surface: None}
	row := make([]float64, c.Dim())
	for j := 0; j < c.Dim(); j++ {
		name := string(rune('a' + j))
		column := Covariate{Name: name}
		for _, v := range d.Covariates[0].Number {
			c.RowTo(row, v)
			column.Number = append(column.Number, row[j])
		}
		plain.Covariates = append(plain.Covariates, column)
		regression.Effects = append(regression.Effects, Effect{Name: name, Role: Linear})
	}
	r := fit(t, regression, plain, Options{}).report
	size, free := float64(c.Dim()), float64(r.Rows)-r.DF
	f := (r.ConstantDev - r.Deviance) / size / (r.Deviance / free)

	// The same coefficients and covariance, handed to the test as they are.
	fitted := fit(t, regression, plain, Options{})
	grams, err := s.border.Effects[0].curveGrams(d.Covariates)
	if err != nil {
		t.Fatal(err)
	}
	k, q := fitted.core.columns(), fitted.border.size()
	b := make([]float64, q)
	g := make([][]float64, q)
	for j := range b {
		g[j] = make([]float64, len(fitted.beta))
		fitted.addFree(g[j], j, q, 1)
		b[j] = dot(g[j][k:], fitted.beta[k:])
	}
	v := mat.NewSymDense(q, nil)
	for i := range g {
		for j := i; j < q; j++ {
			sum := append([]float64(nil), g[i]...)
			for l := range sum {
				sum[l] += g[j][l]
			}
			li, lj, lij := fitted.length(g[i]), fitted.length(g[j]), fitted.length(sum)
			v.SetSym(i, j, fitted.phi*(lij*lij-li*li-lj*lj)/2)
		}
	}
	whole := CurveTest{DF: size, ResidualDF: free}
	whole.wald(b, v, grams[0])
	near(t, "statistic", whole.Statistic, f*size, 1e-5*f*size)
	near(t, "log p", math.Log(whole.P), math.Log(tail(f*size, size, free)), 1e-4)
	if !(full.DF > 3 && full.DF < size && full.P < 1e-4) {
		t.Errorf("a curve that bends: %.3g degrees of freedom, p = %.2g", full.DF, full.P)
	}
}

// TestSizeOfCurveTests counts over 200 seeded samples without any effect how often p is below 0.05: between 2 and 9 % of
// the time. (Measured over 1000 samples each: gaussian, poisson, binomial and negative-binomial, with a surface and
// without, 60 and 200 rows: 4.8 to 6.7 %; a level of 20 % is exceeded by 22 to 25 %.) A middling effect is found.
func TestSizeOfCurveTests(t *testing.T) {
	samples, least, most := 200, 0.02, 0.09
	if testing.Short() {
		samples, least, most = 60, 0, 0.135 // 8 of 60 or fewer 199 times in 200
	}
	for k, c := range []struct {
		dist    string
		surface Kind
	}{{"gaussian", None}, {"gaussian", ThinPlate}, {"poisson", None}, {"poisson", ThinPlate}} {
		p := func(seed uint64, effect func(float64) float64) float64 {
			m, d := curveSample(rand.New(rand.NewPCG(seed, 30+uint64(k))), 80, c.dist, c.surface, effect)
			s, err := Fit(context.Background(), m, d, Options{Workers: 1})
			if err != nil {
				t.Fatal(err)
			}
			list, err := s.TestCurves(d.Covariates)
			if err != nil {
				t.Fatal(err)
			}
			return list[0].P
		}
		size, power := 0.0, 0.0
		for seed := uint64(0); seed < uint64(samples); seed++ {
			if p(seed, func(float64) float64 { return 0 }) < 0.05 {
				size += 1 / float64(samples)
			}
			if seed < 40 && p(seed, func(z float64) float64 { return 0.7 * math.Sin(6*z) }) < 0.05 {
				power += 1.0 / 40
			}
		}
		t.Logf("%s, surface %v: size %.3f, power %.2f", c.dist, c.surface == ThinPlate, size, power)
		if size < least || size > most || power < 0.85 {
			t.Errorf("%s, surface %v: size %.3f, power %.2f", c.dist, c.surface == ThinPlate, size, power)
		}
	}
}

// TestCurvesOfLevels: a curve for each level of a category is tested by itself, on its own rows, and a restored surface
// gives the same figures.
func TestCurvesOfLevels(t *testing.T) {
	d := simulated(400, 3)
	random := rand.New(rand.NewPCG(1, 23))
	for i, k := range d.Covariates[1].Code {
		d.Response[i] = 0.3*float64(k) + 0.5*random.NormFloat64()
		if k == 1 {
			d.Response[i] += math.Sin(d.Covariates[0].Number[i])
		}
	}
	m := Model{Distribution: "gaussian", Surface: None, SmoothnessUncertainty: true, Effects: []Effect{{Name: "depth", Role: Curve, Per: "soil"}}}
	s := fit(t, m, d, Options{})
	list, err := s.TestCurves(d.Covariates)
	if err != nil {
		t.Fatal(err)
	}
	if len(list) != 3 || list[1].Name != "depth, soil=loam" {
		t.Fatalf("got %+v", list)
	}
	for k, c := range list {
		if flat := k != 1; flat && c.P < 0.01 || !flat && c.P > 1e-12 {
			t.Errorf("%s: p = %.3g with %.3g degrees of freedom", c.Name, c.P, c.DF)
		}
	}
	restored, err := Restore(s.State(), 1)
	if err != nil {
		t.Fatal(err)
	}
	again, err := restored.TestCurves(d.Covariates)
	if err != nil {
		t.Fatal(err)
	}
	for k := range list {
		if again[k] != list[k] {
			t.Errorf("restored: got %+v, want %+v", again[k], list[k])
		}
	}
	if _, err := s.TestCurves(nil); err == nil {
		t.Error("no error without covariates")
	}
}

package spatial

import (
	"flag"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

// Property tests draw the same cases in every run unless -rapid.seed says otherwise.
func init() { flag.Set("rapid.seed", "20250101") }

// franke is the principal test function of Franke (1979), on the unit square.
func franke(x, y float64) float64 {
	return 0.75*math.Exp(-(sq(9*x-2)+sq(9*y-2))/4) + 0.75*math.Exp(-sq(9*x+1)/49-(9*y+1)/10) +
		0.5*math.Exp(-(sq(9*x-7)+sq(9*y-3))/4) - 0.2*math.Exp(-sq(9*x-4)-sq(9*y-7))
}

func sq(v float64) float64 { return v * v }

func scattered(n int, random *rand.Rand) Places {
	p := Places{X: make([]float64, n), Y: make([]float64, n)}
	for i := range p.X {
		p.X[i], p.Y[i] = random.Float64(), random.Float64()
	}
	return p
}

// grid is a lattice of n x n points over the unit square.
func grid(n int) (p Places) {
	for j := 0; j < n; j++ {
		for i := 0; i < n; i++ {
			p.X, p.Y = append(p.X, (float64(i)+0.5)/float64(n)), append(p.Y, (float64(j)+0.5)/float64(n))
		}
	}
	return p
}

// drawFrom gives observations of the truth f at places: errors of 0.2 for gaussian, f the mean; counts with exposure
// and log rate -0.5 + 2 f; positives with trials and logit -1.5 + 2.5 f, as in testdata/reference/coverage_truth.
func drawFrom(dist string, at Places, exposure, trials []float64, f func(x, y float64) float64, random *rand.Rand) Data {
	d := Data{Places: at, Response: make([]float64, at.Len())}
	for i := range d.Response {
		v := f(at.X[i], at.Y[i])
		switch dist {
		case "gaussian":
			d.Response[i] = v + 0.2*random.NormFloat64()
		case "poisson":
			d.Response[i] = distuv.Poisson{Lambda: exposure[i] * math.Exp(-0.5+2*v), Src: random}.Rand()
			d.Exposure = exposure
		case "binomial":
			d.Response[i] = distuv.Binomial{N: trials[i], P: 1 / (1 + math.Exp(1.5-2.5*v)), Src: random}.Rand()
			d.Trials = trials
		}
	}
	return d
}

// sample is n observations of Franke's function at scattered places.
func sample(dist string, n int, seed uint64) Data {
	random := rand.New(rand.NewPCG(seed, 11))
	exposure, trials := make([]float64, n), make([]float64, n)
	for i := range exposure {
		exposure[i], trials[i] = math.Exp(0.7+0.5*random.NormFloat64()), float64(2+random.IntN(28))
	}
	return drawFrom(dist, scattered(n, random), exposure, trials, franke, random)
}

var distributions = []string{"gaussian", "poisson", "binomial"}

// kernel is r^2 log r / (8 pi) between two places, as the books write it (Wahba 1990).
func kernel(x0, y0, x1, y1 float64) float64 {
	r := math.Hypot(x0-x1, y0-y1)
	if r == 0 {
		return 0
	}
	return r * r * math.Log(r) / (8 * math.Pi)
}

// krige is universal kriging of the noise-free surface by its saddle system, with generalised covariance
// (sigma2/lambda) eta, drift 1, x, y and nugget sigma2/weight: means and standard deviations at places.
func krige(t testing.TB, d Data, lambda, sigma2 float64, at Places) (mean, sd []float64) {
	t.Helper()
	n, p := d.Places.Len(), d.Places
	a := mat.NewDense(n+3, n+3, nil)
	z := mat.NewVecDense(n+3, nil)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			a.Set(i, j, kernel(p.X[i], p.Y[i], p.X[j], p.Y[j]))
		}
		w := 1.0
		if d.Weight != nil {
			w = d.Weight[i]
		}
		a.Set(i, i, lambda/w)
		for k, v := range []float64{1, p.X[i], p.Y[i]} {
			a.Set(i, n+k, v)
			a.Set(n+k, i, v)
		}
		z.SetVec(i, d.Response[i])
	}
	m := at.Len()
	b := mat.NewDense(n+3, m, nil)
	for j := 0; j < m; j++ {
		for i := 0; i < n; i++ {
			b.Set(i, j, kernel(p.X[i], p.Y[i], at.X[j], at.Y[j]))
		}
		b.Set(n, j, 1)
		b.Set(n+1, j, at.X[j])
		b.Set(n+2, j, at.Y[j])
	}
	var lu mat.LU
	lu.Factorize(a)
	var s mat.Dense
	if err := lu.SolveTo(&s, false, b); err != nil {
		t.Fatal(err)
	}
	for j := 0; j < m; j++ {
		mean = append(mean, mat.Dot(s.ColView(j), z))
		sd = append(sd, math.Sqrt(math.Max(0, -sigma2/lambda*mat.Dot(s.ColView(j), b.ColView(j)))))
	}
	return mean, sd
}

// TestKrigingOfTheTestIsTheReference's makes sure that the independent algebra is what it should be.
func TestKrigingOfTheTestIsTheReference(t *testing.T) {
	d := table(t, "tps_reml_gcv/synthetic_data.csv")
	data := Data{Response: numbers(t, d["z"]), Places: places(t, "tps_reml_gcv/synthetic_data.csv")}
	var want struct {
		Reml struct {
			Lambda, Sigma2 float64
			Predicted      []float64
			Process        []float64 `json:"predicted_process_se"`
		}
	}
	expected(t, "tps_reml_gcv/synthetic.json", &want)
	mean, sd := krige(t, data, want.Reml.Lambda, want.Reml.Sigma2, places(t, "tps_reml_gcv/synthetic_points.csv"))
	nearAll(t, "kriged mean", mean, want.Reml.Predicted, 1e-7, false)
	nearAll(t, "process standard error, relative", sd, want.Reml.Process, 1e-6, true)
}

// TestStandardErrorIsThatOfKriging: at the data the surface's standard error is the process's; between them the mean
// agrees and the surface claims no more error than the process (Wahba 1983).
func TestStandardErrorIsThatOfKriging(t *testing.T) {
	for _, c := range []struct {
		name   string
		scale  float64
		weight bool
	}{{"unit square", 1, false}, {"weighted", 1, true}, {"kilometres", 30, false}} {
		t.Run(c.name, func(t *testing.T) {
			d := sample("gaussian", 90, 31)
			random := rand.New(rand.NewPCG(32, 0))
			for i := range d.Response {
				d.Places.X[i] *= c.scale
				d.Places.Y[i] *= c.scale
				if c.weight {
					d.Weight = append(d.Weight, 0.2+3*random.Float64())
				}
			}
			s := fit(t, Model{Distribution: "gaussian"}, d, Options{})
			r := s.Report()
			eta, se := predict(t, s, d.Places)
			mean, sd := krige(t, d, r.Lambda, r.Dispersion, d.Places)
			nearAll(t, "mean at the data", eta, mean, 1e-8, false)
			nearAll(t, "standard error at the data, relative", se, sd, 1e-6, true)
			between := grid(15)
			for i := range between.X {
				between.X[i] *= c.scale
				between.Y[i] *= c.scale
			}
			eta, se = predict(t, s, between)
			mean, sd = krige(t, d, r.Lambda, r.Dispersion, between)
			nearAll(t, "mean between the data", eta, mean, 1e-8, false)
			for i := range se {
				if !(se[i] <= sd[i]*(1+1e-6)) {
					t.Fatalf("standard error %g between the data, of the process %g", se[i], sd[i])
				}
			}
		})
	}
}

// TestStandardErrorGrowsInAHole: knots in the gap bring the standard error to the process's and leave mean, degrees of
// freedom and restricted likelihood as they are, since the best surface bends at the data only.
func TestStandardErrorGrowsInAHole(t *testing.T) {
	all := sample("gaussian", 400, 41)
	inHole := func(x, y float64) bool { return math.Hypot(x-0.45, y-0.5) < 0.27 }
	d := Data{}
	for i := range all.Response {
		if !inHole(all.Places.X[i], all.Places.Y[i]) {
			d.Response = append(d.Response, all.Response[i])
			d.Places.X, d.Places.Y = append(d.Places.X, all.Places.X[i]), append(d.Places.Y, all.Places.Y[i])
		}
	}
	without := fit(t, Model{Distribution: "gaussian"}, d, Options{})
	with := fit(t, Model{Distribution: "gaussian"}, d, Options{Area: grid(60)})
	a, b := without.Report(), with.Report()
	if a.KnotsInGaps != 0 || b.KnotsInGaps == 0 || a.Knots != d.Places.Len() || b.Knots != a.Knots+b.KnotsInGaps {
		t.Fatalf("%d knots, %d in gaps; with the area %d, %d in gaps", a.Knots, a.KnotsInGaps, b.Knots, b.KnotsInGaps)
	}
	near(t, "degrees of freedom", b.DF, a.DF, 1e-5)
	near(t, "log lambda", math.Log(b.Lambda), math.Log(a.Lambda), 1e-5)
	near(t, "restricted likelihood", b.CriterionValue, a.CriterionValue, 1e-6)
	near(t, "dispersion, relative", b.Dispersion/a.Dispersion, 1, 1e-6)
	at := grid(40)
	etaA, seA := predict(t, without, at)
	etaB, seB := predict(t, with, at)
	nearAll(t, "mean", etaB, etaA, 1e-6, false)
	_, sd := krige(t, d, a.Lambda, a.Dispersion, at)
	least, worst, off, cells := math.Inf(1), 0.0, 0.0, 0.0
	for i := range at.X {
		if inHole(at.X[i], at.Y[i]) {
			cells++
			least = math.Min(least, seA[i]/sd[i])
			worst = math.Max(worst, math.Abs(seB[i]/sd[i]-1))
			off += math.Abs(seB[i]/sd[i] - 1)
		}
	}
	t.Logf("%g cells in the hole: without knots there the standard error falls to %.2f of the process's; with %d of them it is off by %.1f %% on average, at most %.1f %%",
		cells, least, b.KnotsInGaps, 100*off/cells, 100*worst)
	if !(off/cells < 0.03 && worst < 0.08) {
		t.Errorf("in the hole the standard error is off the process's by %.1f %% on average, %.1f %% at most", 100*off/cells, 100*worst)
	}
	if !(least < 0.6) {
		t.Errorf("the hole is no test: without knots in it the standard error is %.2f of the process's", least)
	}
}

// TestLargeLambdaGivesTheLeastSquaresPlane solves for the plane by QR.
func TestLargeLambdaGivesTheLeastSquaresPlane(t *testing.T) {
	d := sample("gaussian", 80, 51)
	random := rand.New(rand.NewPCG(52, 0))
	for range d.Response {
		d.Weight = append(d.Weight, 0.5+random.Float64())
	}
	n := d.Places.Len()
	x, y := mat.NewDense(n, 3, nil), mat.NewVecDense(n, nil)
	for i, z := range d.Response {
		w := math.Sqrt(d.Weight[i])
		x.SetRow(i, []float64{w, w * d.Places.X[i], w * d.Places.Y[i]})
		y.SetVec(i, w*z)
	}
	var c mat.VecDense
	if err := c.SolveVec(x, y); err != nil {
		t.Fatal(err)
	}
	s := fit(t, Model{Distribution: "gaussian", Smoothness: given(1e9)}, d, Options{})
	at := grid(9)
	eta, _ := predict(t, s, at)
	for i := range eta {
		near(t, "plane", eta[i], c.AtVec(0)+c.AtVec(1)*at.X[i]+c.AtVec(2)*at.Y[i], 1e-8)
	}
	near(t, "degrees of freedom", s.Report().DF, 3, 1e-6)
}

// TestSmallLambdaInterpolates compares with the saddle system at lambda = 0.
func TestSmallLambdaInterpolates(t *testing.T) {
	d := sample("gaussian", 70, 53)
	at := grid(12)
	mean, _ := krige(t, d, 1e-13, 0, at)
	for _, lambda := range []float64{0, 1e-13} {
		s := fit(t, Model{Distribution: "gaussian", Smoothness: given(lambda)}, d, Options{})
		nearAll(t, "fitted", s.Rows().Fitted, d.Response, 1e-7, false)
		eta, se := predict(t, s, at)
		nearAll(t, "between the data", eta, mean, 1e-6, false)
		for _, v := range se {
			if math.IsInf(v, 0) {
				t.Errorf("lambda %g: standard error %g", lambda, v)
				break
			}
		}
	}
}

// leastSquares solves the penalised least-squares problem of a low-rank thin plate by one QR of the augmented matrix in
// radial coefficients (no crossproducts of the model matrix), and returns fitted values.
func leastSquares(t testing.TB, d Data, knots Places, lambda float64) []float64 {
	t.Helper()
	n, k := d.Places.Len(), knots.Len()
	tk := mat.NewDense(k, 3, nil)
	for j := 0; j < k; j++ {
		tk.SetRow(j, []float64{1, knots.X[j], knots.Y[j]})
	}
	var qr mat.QR
	qr.Factorize(tk)
	var q mat.Dense
	qr.QTo(&q)
	z := q.Slice(0, k, 3, k)
	radial := func(p Places) *mat.Dense {
		e := mat.NewDense(p.Len(), k, nil)
		for i := range p.X {
			for j := range knots.X {
				e.Set(i, j, kernel(p.X[i], p.Y[i], knots.X[j], knots.Y[j]))
			}
		}
		return e
	}
	var ez, zez, ekz mat.Dense
	ez.Mul(radial(d.Places), z)
	ekz.Mul(radial(knots), z)
	zez.Mul(z.T(), &ekz)
	sym := mat.NewSymDense(k-3, nil)
	for i := 0; i < k-3; i++ {
		for j := i; j < k-3; j++ {
			sym.SetSym(i, j, (zez.At(i, j)+zez.At(j, i))/2)
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(sym) {
		t.Fatal("the test's own penalty is singular")
	}
	var u mat.TriDense
	chol.UTo(&u)
	a, b := mat.NewDense(n+k-3, k, nil), mat.NewVecDense(n+k-3, nil)
	for i := 0; i < n; i++ {
		a.Set(i, 0, 1)
		a.Set(i, 1, d.Places.X[i])
		a.Set(i, 2, d.Places.Y[i])
		for j := 0; j < k-3; j++ {
			a.Set(i, 3+j, ez.At(i, j))
		}
		b.SetVec(i, d.Response[i])
	}
	for i := 0; i < k-3; i++ {
		for j := i; j < k-3; j++ {
			a.Set(n+i, 3+j, math.Sqrt(lambda)*u.At(i, j))
		}
	}
	var c, f mat.VecDense
	qr.Factorize(a)
	if err := qr.SolveVecTo(&c, false, b); err != nil {
		if _, poor := err.(mat.Condition); !poor {
			t.Fatal(err)
		}
	}
	f.MulVec(a, &c)
	return f.RawVector().Data[:n]
}

// TestKnotsThatAlmostCoincide holds the normal equations of the engine against QR. Crossproducts of raw radial
// functions are off by 2e-3 here; the whitened columns keep 1e-8.
func TestKnotsThatAlmostCoincide(t *testing.T) {
	for _, c := range []struct{ apart, tol float64 }{{1e-3, 1e-8}, {3e-5, 1e-7}} {
		d := sample("gaussian", 400, 61)
		random := rand.New(rand.NewPCG(62, 0))
		knots := scattered(60, random)
		for j := 0; j < 60; j++ {
			a := 2 * math.Pi * random.Float64()
			knots.X, knots.Y = append(knots.X, knots.X[j]+c.apart*math.Cos(a)), append(knots.Y, knots.Y[j]+c.apart*math.Sin(a))
		}
		for _, lambda := range []float64{1e-9, 1e-6, 1e-3} {
			s := fit(t, Model{Distribution: "gaussian", Smoothness: given(lambda)}, d, Options{Knots: knots})
			want := leastSquares(t, d, knots, lambda)
			nearAll(t, "fitted", s.Rows().Fitted, want, c.tol, false)
		}
	}
}

// TestMoreKnotsThanNeededChangeLittle doubles an adequate number of knots.
func TestMoreKnotsThanNeededChangeLittle(t *testing.T) {
	at := grid(30)
	for _, dist := range distributions {
		d := sample(dist, 1000, 71)
		few := fit(t, Model{Distribution: dist, MaxKnots: 150}, d, Options{Area: at})
		many := fit(t, Model{Distribution: dist, MaxKnots: 300}, d, Options{Area: at})
		etaFew, seFew := predict(t, few, at)
		etaMany, _ := predict(t, many, at)
		var moved, se, largest float64
		for i := range etaFew {
			moved += math.Abs(etaMany[i]-etaFew[i]) / float64(len(etaFew))
			largest = math.Max(largest, math.Abs(etaMany[i]-etaFew[i]))
			se += seFew[i] / float64(len(etaFew))
		}
		t.Logf("%s: %.1f and %.1f degrees of freedom; the fit moves by %.3f mean standard errors, at most %.3f", dist, few.Report().DF, many.Report().DF, moved/se, largest/se)
		if !(moved < 0.1*se) {
			t.Errorf("%s: doubling the knots moves the fit by %.3f mean standard errors", dist, moved/se)
		}
	}
}

// TestOrderOfRowsIsOfNoConsequence permutes them, covariates and weights included.
func TestOrderOfRowsIsOfNoConsequence(t *testing.T) {
	at := grid(10)
	for _, dist := range distributions {
		d := sample(dist, 400, 81)
		random := rand.New(rand.NewPCG(82, 0))
		depth := Covariate{Name: "depth"}
		for range d.Response {
			d.Weight = append(d.Weight, 0.5+random.Float64())
			depth.Number = append(depth.Number, random.NormFloat64())
		}
		d.Covariates = []Covariate{depth}
		order := random.Perm(len(d.Response))
		by := func(v []float64) []float64 {
			if v == nil {
				return nil
			}
			out := make([]float64, len(v))
			for i, j := range order {
				out[i] = v[j]
			}
			return out
		}
		p := Data{Response: by(d.Response), Exposure: by(d.Exposure), Trials: by(d.Trials), Weight: by(d.Weight),
			Places: Places{X: by(d.Places.X), Y: by(d.Places.Y)}, Covariates: []Covariate{{Name: "depth", Number: by(depth.Number)}}}
		m := Model{Distribution: dist, MaxKnots: 60, Effects: []Effect{{Name: "depth", Role: Linear}}}
		a, b := fit(t, m, d, Options{}), fit(t, m, p, Options{})
		z := Covariate{Name: "depth", Number: make([]float64, at.Len())}
		etaA, seA := predict(t, a, at, z)
		etaB, seB := predict(t, b, at, z)
		nearAll(t, dist+" mean", etaB, etaA, 1e-9, false)
		nearAll(t, dist+" standard error", seB, seA, 1e-9, false)
		near(t, dist+" log lambda", math.Log(b.Report().Lambda), math.Log(a.Report().Lambda), 1e-7)
		nearAll(t, dist+" fitted, relative", b.Rows().Fitted, by(a.Rows().Fitted), 1e-9, true)
	}
}

// TestUnitsAndOriginOfPlacesAreOfNoConsequence: lambda goes with the square of the unit of length, the restricted
// likelihood with the logarithm of the columns x and y (testdata/reference/README.md); a turned map is the same map.
func TestUnitsAndOriginOfPlacesAreOfNoConsequence(t *testing.T) {
	at := grid(10)
	turn := func(p Places, c, angle, shift float64) (q Places) {
		sin, cos := math.Sincos(angle)
		for i := range p.X {
			q.X = append(q.X, c*(cos*p.X[i]-sin*p.Y[i])+shift)
			q.Y = append(q.Y, c*(sin*p.X[i]+cos*p.Y[i])-shift)
		}
		return q
	}
	for _, dist := range distributions {
		d := sample(dist, 300, 91)
		a := fit(t, Model{Distribution: dist, MaxKnots: 80}, d, Options{Area: at})
		etaA, seA := predict(t, a, at)
		for _, c := range []struct {
			name                string
			scale, angle, shift float64
			tol                 float64
		}{
			{"metres far from the origin", 1000, 0, 4e6, 1e-7}, // 4e6 m leaves 10 digits of a kilometre
			{"millimetres", 1e6, 0, 0, 1e-9}, {"turned", 1, 0.7, 0, 1e-9}, {"degrees of a small map", 1e-3, 0, 20, 1e-7},
		} {
			moved := d
			moved.Places = turn(d.Places, c.scale, c.angle, c.shift)
			area := turn(at, c.scale, c.angle, c.shift)
			b := fit(t, Model{Distribution: dist, MaxKnots: 80}, moved, Options{Area: area})
			etaB, seB := predict(t, b, area)
			what := dist + ", " + c.name + ": "
			if a.Report().Knots != b.Report().Knots || a.Report().KnotsInGaps != b.Report().KnotsInGaps {
				t.Errorf("%s%d knots (%d in gaps), were %d (%d)", what, b.Report().Knots, b.Report().KnotsInGaps, a.Report().Knots, a.Report().KnotsInGaps)
			}
			nearAll(t, what+"mean", etaB, etaA, c.tol, false)
			nearAll(t, what+"standard error", seB, seA, c.tol, false)
			near(t, what+"log lambda", math.Log(b.Report().Lambda), math.Log(a.Report().Lambda)+2*math.Log(c.scale), 1e-5)
			near(t, what+"degrees of freedom", b.Report().DF, a.Report().DF, 1e-5)
			near(t, what+"restricted likelihood", b.Report().CriterionValue, a.Report().CriterionValue+2*math.Log(c.scale), 1e-6)
		}
	}
}

// TestWeightTwoIsTheRowTwice: for poisson and binomial in every figure; for gaussian in the estimates at a given
// smoothness, since two rows also say more of the variance than one.
func TestWeightTwoIsTheRowTwice(t *testing.T) {
	at := grid(10)
	twice := func(v []float64) []float64 {
		if v == nil {
			return nil
		}
		return append(append([]float64(nil), v...), v...)
	}
	for _, dist := range distributions {
		d := sample(dist, 150, 95)
		weighted, doubled := d, Data{Response: twice(d.Response), Exposure: twice(d.Exposure), Trials: twice(d.Trials),
			Places: Places{X: twice(d.Places.X), Y: twice(d.Places.Y)}}
		for range d.Response {
			weighted.Weight = append(weighted.Weight, 2)
		}
		m := Model{Distribution: dist, MaxKnots: 60}
		if dist == "gaussian" {
			m.Smoothness = given(1e-3)
		}
		a, b := fit(t, m, weighted, Options{}), fit(t, m, doubled, Options{})
		etaA, seA := predict(t, a, at)
		etaB, seB := predict(t, b, at)
		nearAll(t, dist+" mean", etaB, etaA, 1e-8, false)
		near(t, dist+" degrees of freedom", b.Report().DF, a.Report().DF, 1e-6)
		near(t, dist+" deviance, relative", b.Report().Deviance/a.Report().Deviance, 1, 1e-8)
		if dist != "gaussian" {
			nearAll(t, dist+" standard error", seB, seA, 1e-8, false)
			near(t, dist+" log lambda", math.Log(b.Report().Lambda), math.Log(a.Report().Lambda), 1e-6)
			near(t, dist+" restricted likelihood", b.Report().CriterionValue, a.Report().CriterionValue, 1e-7)
			near(t, dist+" log-likelihood", b.Report().LogLikelihood, a.Report().LogLikelihood, 1e-7)
		}
	}
}

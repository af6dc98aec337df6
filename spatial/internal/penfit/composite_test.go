package penfit

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"drumlin/spatial/response"
)

// areal is a model of rows that are sets of most points or fewer, and data drawn from it.
func areal(t *testing.T, dist response.Distribution, rows, most int, seed uint64, workers int) (Problem, *Composite) {
	t.Helper()
	random := rand.New(rand.NewPCG(seed, 2))
	const p = 12
	mixer := response.MixerOf(dist.Link())
	m := matrix{p: p}
	start, share := []int32{0}, []float64(nil)
	obs := make([]response.Obs, rows)
	var offset []float64
	for i := range obs {
		x, z := random.Float64(), random.Float64()
		n, total := 1+random.IntN(most), 0.0
		var own, eta []float64
		for q := 0; q < n; q++ {
			a, b := x+0.4*random.Float64(), z+0.4*random.Float64()
			row := make([]float64, p)
			row[0], row[1] = 1, a-0.5
			for k := 0; k < 6; k++ {
				row[2+k] = math.Cos(float64(k+1)*math.Pi*a) / float64(k+1)
			}
			for k := 0; k < 4; k++ {
				row[8+k] = math.Cos(float64(k+1)*math.Pi*b) / float64(k+1)
			}
			m.data = append(m.data, row...)
			own, eta = append(own, 0.1+random.Float64()), append(eta, 0.8*math.Sin(5*a)+0.6*b*b)
			total += own[q]
		}
		for q := range own {
			own[q] /= total
		}
		share, start = append(share, own...), append(start, int32(len(share)+n))
		var mix response.Mixture
		mixer.MixTo(&mix, own, eta)
		o, phi, linear := response.Obs{Trials: 1, Weight: 0.5 + random.Float64()}, 0.1, mix.Linear
		if dist.KnownDispersion() {
			phi = 1
		}
		switch dist.Name() {
		case "poisson", "negative-binomial", "tweedie":
			e := 0.5 + 5*random.Float64()
			offset = append(offset, math.Log(e))
			linear += offset[i]
			o.Weight = 1
		case "binomial", "beta-binomial":
			o.Trials, o.Weight = float64(4+random.IntN(30)), 1
		}
		o.Y = dist.(response.Sampler).Draw(random, o, linear, phi)
		obs[i] = o
	}
	e, err := NewComposite(context.Background(), m, start, share, mixer, []Ridge{{{2, 6}}, {{8, 4}}}, workers)
	if err != nil {
		t.Fatal(err)
	}
	return Problem{Engine: e, Dist: dist, Obs: obs, Offset: offset, EstimateShape: true}, e
}

// TestCompositeGradients compares the exact gradients of both criteria with central differences, off the optimum.
func TestCompositeGradients(t *testing.T) {
	for _, dist := range all(t) {
		for name, c := range map[string]Criterion{"reml": REML, "gcv": GCV} {
			shaped, isShaped := dist.(response.Shaped)
			if c == GCV && isShaped { // cannot choose a shape
				continue
			}
			t.Run(dist.Name()+" "+dist.Link()+" "+name, func(t *testing.T) {
				p, _ := areal(t, dist, 150, 7, 3, 2)
				f := newFitter(context.Background(), p)
				if _, err := f.start([]float64{math.NaN(), math.NaN()}); err != nil {
					t.Fatal(err)
				}
				value := func(rho []float64) float64 {
					v, _, err := f.score(c, rho)
					if err != nil {
						t.Fatal(err)
					}
					return v
				}
				for n, rho := range [][]float64{{-2, 1}, {1.5, -1}, {4, 4}} {
					if isShaped {
						rho = append(rho, shaped.Working()+[]float64{-0.7, 0.2, 0.9}[n])
					}
					_, g, err := f.score(c, rho)
					if err != nil {
						t.Fatal(err)
					}
					for j := range rho {
						want := richardson(func(h float64) float64 {
							x := append([]float64(nil), rho...)
							x[j] += h
							return value(x)
						})
						if d := math.Abs(g[j]-want) / math.Max(1, math.Abs(g[j])); !(d < 1e-8) {
							t.Errorf("rho %v, component %d: gradient %.12g, differences say %.12g", rho, j, g[j], want)
						}
					}
				}
			})
		}
	}
}

// TestCompositeGramIsTheHessian holds the Newton Gram matrix against differences of the score, and the working one against
// the tangents, which TangentTo must give.
func TestCompositeGramIsTheHessian(t *testing.T) {
	ctx := context.Background()
	for _, dist := range all(t) {
		p, e := areal(t, dist, 60, 9, 5, 1)
		f := newFitter(ctx, p)
		random := rand.New(rand.NewPCG(7, 7))
		beta := make([]float64, e.Coefs())
		for k := range beta {
			beta[k] = 0.4 * random.NormFloat64()
		}
		score := func(k int, h float64) []float64 {
			b := append([]float64(nil), beta...)
			b[k] += h
			if _, err := f.evaluate(b, response.Observed, NoGram); err != nil {
				t.Fatal(err)
			}
			return append([]float64(nil), e.Score()...)
		}
		size := 0.0
		slope := make([][]float64, len(beta))
		for k := range beta {
			const h = 1e-3 // central differences with one extrapolation
			wide, narrow := [2][]float64{score(k, h), score(k, -h)}, [2][]float64{score(k, h/2), score(k, -h/2)}
			slope[k] = make([]float64, len(beta))
			for l := range beta {
				slope[k][l] = (4*(narrow[0][l]-narrow[1][l])/h - (wide[0][l]-wide[1][l])/(2*h)) / 3
				size = math.Max(size, math.Abs(slope[k][l]))
			}
		}
		if _, err := f.evaluate(beta, response.Observed, Newton); err != nil {
			t.Fatal(err)
		}
		gram := e.Gram()
		for k := range beta {
			for l := range beta {
				if d := math.Abs(gram.At(k, l) + slope[k][l]); !(d < 1e-9*size) {
					t.Fatalf("%s %s: element %d, %d is %.12g, differences say %.12g", dist.Name(), dist.Link(), k, l, gram.At(k, l), -slope[k][l])
				}
			}
		}
		if dist.ConstantWeight() {
			continue
		}
		if _, err := f.evaluate(beta, response.Expected, Working); err != nil {
			t.Fatal(err)
		}
		gram = e.Gram()
		tangent := make([][]float64, len(beta))
		for k := range beta {
			unit := make([]float64, len(beta))
			unit[k] = 1
			tangent[k] = make([]float64, e.Rows())
			if err := e.TangentTo(ctx, tangent[k], unit); err != nil {
				t.Fatal(err)
			}
		}
		for k := range beta {
			for l := range beta {
				want := 0.0
				for i, pt := range f.point {
					want += pt.Expected * tangent[k][i] * tangent[l][i]
				}
				if d := math.Abs(gram.At(k, l) - want); !(d < 1e-12*size) {
					t.Fatalf("%s %s: working element %d, %d is %.15g, want %.15g", dist.Name(), dist.Link(), k, l, gram.At(k, l), want)
				}
			}
		}
	}
}

// TestCompositeOfSinglePoints is point data: both engines must agree to rounding.
func TestCompositeOfSinglePoints(t *testing.T) {
	ctx := context.Background()
	for _, dist := range all(t) {
		for _, c := range []Criterion{REML, GCV, Quasi} {
			_, shaped := dist.(response.Shaped)
			if shaped && c == GCV || c == Quasi && (shaped || !dist.KnownDispersion()) {
				continue
			}
			composite, e := areal(t, dist, 300, 1, 9, 2)
			dense, err := NewDense(ctx, e.points.design, e.ridges, 2)
			if err != nil {
				t.Fatal(err)
			}
			points := composite
			points.Engine = dense
			want, err := Fit(ctx, points, c, nil)
			if err != nil {
				t.Fatal(dist, err)
			}
			got, err := Fit(ctx, composite, c, nil)
			if err != nil {
				t.Fatal(dist, err)
			}
			for k := range want.Beta {
				if d := math.Abs(got.Beta[k] - want.Beta[k]); !(d < 1e-6) {
					t.Errorf("%s %s %v: coefficient %d is %.12g, point data say %.12g", dist.Name(), dist.Link(), c, k, got.Beta[k], want.Beta[k])
				}
			}
			if d := math.Abs(got.Value - want.Value); !(d < 1e-9*math.Abs(want.Value)) {
				t.Errorf("%s %s %v: criterion %.14g, point data say %.14g", dist.Name(), dist.Link(), c, got.Value, want.Value)
			}
			if d := math.Abs(got.Edf - want.Edf); !(d < 1e-5) {
				t.Errorf("%s %s %v: %.12g degrees of freedom, point data say %.12g", dist.Name(), dist.Link(), c, got.Edf, want.Edf)
			}
		}
	}
}

// TestCompositeWithTheIdentity is a linear model of averaged rows.
func TestCompositeWithTheIdentity(t *testing.T) {
	ctx := context.Background()
	for _, c := range []Criterion{REML, GCV} {
		sets, e := areal(t, response.Gaussian{}, 120, 8, 13, 2)
		averaged := matrix{p: e.p, data: make([]float64, e.Rows()*e.p)}
		for i := range e.Rows() {
			for q := e.start[i]; q < e.start[i+1]; q++ {
				for k := range e.p {
					averaged.data[i*e.p+k] += e.share[q] * e.points.kept[int(q)*e.p+k]
				}
			}
		}
		dense, err := NewDense(ctx, averaged, e.ridges, 2)
		if err != nil {
			t.Fatal(err)
		}
		rows := sets
		rows.Engine = dense
		want, err := Fit(ctx, rows, c, nil)
		if err != nil {
			t.Fatal(err)
		}
		got, err := Fit(ctx, sets, c, nil)
		if err != nil {
			t.Fatal(err)
		}
		for k := range want.Beta {
			if d := math.Abs(got.Beta[k] - want.Beta[k]); !(d < 1e-9) {
				t.Errorf("%v: coefficient %d is %.14g, averaged rows say %.14g", c, k, got.Beta[k], want.Beta[k])
			}
		}
		if !(math.Abs(got.Value-want.Value) < 1e-11*math.Abs(want.Value)) || !(math.Abs(got.Edf-want.Edf) < 1e-9) {
			t.Errorf("%v: criterion %.14g and %.14g degrees of freedom, averaged rows say %.14g and %.14g", c, got.Value, got.Edf, want.Value, want.Edf)
		}
	}
}

// TestCompositeSearchEndsWhereTheGradientVanishes fits each distribution with two penalties.
func TestCompositeSearchEndsWhereTheGradientVanishes(t *testing.T) {
	for _, dist := range all(t) {
		for _, c := range []Criterion{REML, GCV, Quasi} {
			_, shaped := dist.(response.Shaped)
			if shaped && c == GCV || c == Quasi && (shaped || !dist.KnownDispersion()) {
				continue
			}
			p, _ := areal(t, dist, 300, 6, 4, 2)
			r, err := Fit(context.Background(), p, c, nil)
			if err != nil {
				t.Fatal(dist, err)
			}
			if !r.Converged || r.Gradient > 1e-6 || r.Iterations > 25 {
				t.Errorf("%s %s %v: converged %v after %d iterations and %d passes, gradient %g", dist.Name(), dist.Link(), c, r.Converged, r.Iterations, r.Passes, r.Gradient)
			}
		}
	}
}

// TestCompositeBytes fits with rows kept or made afresh, some of them larger than a block of points, by one goroutine and
// by four: the bits must be the same.
func TestCompositeBytes(t *testing.T) {
	ctx := context.Background()
	var first *Result
	for _, workers := range []int{1, 4} {
		for _, kept := range []bool{true, false} {
			p, e := areal(t, response.Poisson{}, 40, 500, 6, workers)
			if !kept {
				e.points.kept = nil
				for w := range e.scratch {
					e.scratch[w].points = make([]float64, e.mostPoints()*e.p)
				}
			}
			r, err := Fit(ctx, p, REML, nil)
			if err != nil {
				t.Fatal(err)
			}
			if first == nil {
				first = r
			}
			for k, b := range r.Beta {
				if math.Float64bits(b) != math.Float64bits(first.Beta[k]) {
					t.Fatalf("%d workers, rows kept %v: coefficient %d is %v, before it was %v", workers, kept, k, b, first.Beta[k])
				}
			}
			if r.Value != first.Value || r.Edf != first.Edf {
				t.Errorf("%d workers, rows kept %v: criterion %v and %v degrees of freedom, before %v and %v", workers, kept, r.Value, r.Edf, first.Value, first.Edf)
			}
		}
	}
}

package penfit

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"drumlin/spatial/response"
)

// matrix is a design held in memory.
type matrix struct {
	p    int
	data []float64
}

func (m matrix) Rows() int { return len(m.data) / m.p }
func (m matrix) Cols() int { return m.p }
func (m matrix) BlockTo(dst []float64, from, to, _ int) {
	copy(dst, m.data[from*m.p:to*m.p])
}

// problem is a model with two unpenalised and two penalised groups of columns, and data drawn from it.
func problem(t *testing.T, dist response.Distribution, n int, seed uint64) Problem {
	t.Helper()
	random := rand.New(rand.NewPCG(seed, 1))
	const p = 12
	m := matrix{p: p, data: make([]float64, n*p)}
	obs := make([]response.Obs, n)
	var offset []float64
	for i := range obs {
		x, z := random.Float64(), random.Float64()
		row := m.data[i*p : (i+1)*p]
		row[0], row[1] = 1, x-0.5
		for k := 0; k < 6; k++ {
			row[2+k] = math.Cos(float64(k+1)*math.Pi*x) / float64(k+1)
		}
		for k := 0; k < 4; k++ {
			row[8+k] = math.Cos(float64(k+1)*math.Pi*z) / float64(k+1)
		}
		eta := 0.8*math.Sin(5*x) + 0.6*z*z
		obs[i] = response.Obs{Y: eta + 0.3*random.NormFloat64(), Trials: 1, Weight: 1}
		switch dist.Name() + dist.Link() {
		case "gaussianidentity":
			obs[i].Weight = 0.5 + random.Float64()
		case "gaussianlog":
			obs[i].Y = math.Exp(eta) + 0.4*random.NormFloat64()
		case "poissonlog":
			e := 0.5 + 3*random.Float64()
			offset = append(offset, math.Log(e))
			obs[i].Y = draw(random, func(u float64) bool { return u < e*math.Exp(eta)/40 }, 40)
		case "negative-binomiallog", "tweedielog", "gammalog":
			k := 2 + 3*random.Float64()
			mu := math.Exp(eta) * k
			y := 0.0
			for j := 0; j < 12; j++ { // sums of exponentials, some of them missing: positive and scattered, or zero
				if dist.Name() == "gamma" || random.Float64() < 0.2 {
					y += random.ExpFloat64() * mu / 3
				}
			}
			offset = append(offset, math.Log(k))
			obs[i].Y = y
			if dist.Name() == "negative-binomial" {
				obs[i].Y = math.Floor(y)
			}
		case "beta-binomiallogit":
			obs[i].Trials = float64(5 + random.IntN(40))
			p := dist.Mean(eta + 0.6*random.NormFloat64())
			obs[i].Y = draw(random, func(u float64) bool { return u < p }, int(obs[i].Trials))
		case "binomiallogit", "binomialcomplementary-log-log":
			obs[i].Trials = float64(1 + random.IntN(9))
			obs[i].Y = draw(random, func(u float64) bool { return u < dist.Mean(eta) }, int(obs[i].Trials))
		}
	}
	e, err := NewDense(context.Background(), m, []Ridge{{{2, 6}}, {{8, 4}}}, 2)
	if err != nil {
		t.Fatal(err)
	}
	return Problem{Engine: e, Dist: dist, Obs: obs, Offset: offset, EstimateShape: true}
}

// draw counts successes in m trials.
func draw(random *rand.Rand, success func(u float64) bool, m int) (y float64) {
	for k := 0; k < m; k++ {
		if success(random.Float64()) {
			y++
		}
	}
	return y
}

// all returns every distribution with every link.
func all(t *testing.T) (list []response.Distribution) {
	for _, name := range response.Names() {
		for _, link := range response.Links(name) {
			d, err := response.New(name, link)
			if err != nil {
				t.Fatal(err)
			}
			list = append(list, d)
		}
	}
	return list
}

// TestGradients compares the exact gradients of both criteria with central differences, off the optimum.
func TestGradients(t *testing.T) {
	for _, dist := range all(t) {
		for name, c := range map[string]Criterion{"reml": REML, "gcv": GCV} {
			shaped, isShaped := dist.(response.Shaped)
			if c == GCV && isShaped { // cannot choose a shape
				continue
			}
			t.Run(dist.Name()+" "+dist.Link()+" "+name, func(t *testing.T) {
				f := newFitter(context.Background(), problem(t, dist, 300, 11))
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

// richardson returns the derivative at 0 by central differences with one extrapolation.
func richardson(f func(float64) float64) float64 {
	central := func(h float64) float64 { return (f(h) - f(-h)) / (2 * h) }
	const h = 2e-3
	return (4*central(h/2) - central(h)) / 3
}

// TestSearchEndsWhereTheGradientVanishes fits each distribution with two penalties.
func TestSearchEndsWhereTheGradientVanishes(t *testing.T) {
	for _, dist := range all(t) {
		for _, c := range []Criterion{REML, GCV} {
			if _, ok := dist.(response.Shaped); ok && c == GCV {
				continue
			}
			r, err := Fit(context.Background(), problem(t, dist, 400, 5), c, nil)
			if err != nil {
				t.Fatal(dist, err)
			}
			if !r.Converged || r.Gradient > 1e-6 || r.Iterations > 25 {
				t.Errorf("%s %s: converged %v after %d iterations and %d passes, gradient %g", dist.Name(), dist.Link(), r.Converged, r.Iterations, r.Passes, r.Gradient)
			}
		}
	}
}

// TestMinimiseFindsBoxedMinima searches quadratics whose minima lie inside and outside the box.
func TestMinimiseFindsBoxedMinima(t *testing.T) {
	quadratic := func(centre []float64) objective {
		return func(x []float64) (float64, []float64, error) {
			a, b := x[0]-centre[0], x[1]-centre[1]
			return 3*a*a + 2*a*b + b*b, []float64{6*a + 2*b, 2*a + 2*b}, nil
		}
	}
	lo, hi := []float64{-5, -5}, []float64{5, 5}
	m, err := minimise(context.Background(), quadratic([]float64{1, -2}), []float64{4, 4}, lo, hi)
	if err != nil || !m.converged || math.Abs(m.x[0]-1) > 1e-8 || math.Abs(m.x[1]+2) > 1e-8 {
		t.Errorf("inside: %+v, %v", m, err)
	}
	// With x1 held at 5 the minimum over x0 is at 1 - (5-9)/3 = 7/3.
	m, err = minimise(context.Background(), quadratic([]float64{1, 9}), []float64{-4, -4}, lo, hi)
	if err != nil || !m.converged || math.Abs(m.x[0]-7.0/3) > 1e-8 || m.x[1] != 5 {
		t.Errorf("at the box: %+v, %v", m, err)
	}
}

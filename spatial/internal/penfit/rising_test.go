package penfit

import (
	"context"
	"math"
	"testing"

	"drumlin/spatial/response"
)

// TestRisingFindsTheRoot of functions whose roots are known, from good starts and bad ones, with few calls where they
// are nearly straight; the last call is at what is returned.
func TestRisingFindsTheRoot(t *testing.T) {
	for name, c := range map[string]struct {
		f              func(u float64) float64
		slope, root    float64
		starts         []float64
		calls, farther int // at most, from the first start and from the others
	}{
		"a straight line":   {func(u float64) float64 { return 3*u - 6 }, 3, 2, []float64{1, 1e-9, 1e9}, 3, 16},
		"nearly straight":   {func(u float64) float64 { return u - 5 - 0.3*math.Exp(-u/5)*math.E }, 1, 5.283465, []float64{5, 0.1, 400}, 8, 14},
		"a logarithm":       {func(u float64) float64 { return math.Log(u / 1e-7) }, 1, 1e-7, []float64{2e-7, 1, 1e-20}, 14, 40},
		"a steep power":     {func(u float64) float64 { return math.Pow(u, 9) - 512 }, 0.01, 2, []float64{2.1, 0.001, 300}, 40, 120},
		"no guess of slope": {func(u float64) float64 { return u - 70 }, 0, 70, []float64{1}, 6, 6},
	} {
		for k, start := range c.starts {
			calls, last := 0, 0.0
			u := rising(func(u float64) float64 { calls++; last = u; return c.f(u) }, start, c.slope, 1e30)
			if last != u {
				t.Errorf("%s from %g: last called at %g, returned %g", name, start, last, u)
			}
			if v := math.Abs(c.f(u)) / math.Abs(c.f(1.5*u)-c.f(u)); !(v < 1e-13) || math.Abs(u/c.root-1) > 1e-4 {
				t.Errorf("%s from %g: %g, where it is %g", name, start, u, c.f(u))
			}
			if most := []int{c.calls, c.farther}[min(k, 1)]; calls > most {
				t.Errorf("%s from %g: %d calls", name, start, calls)
			}
		}
	}
	if u := rising(func(u float64) float64 { return -1 / u }, 1, 1, 1e6); u != 1e6 {
		t.Errorf("below zero all the way: %g", u)
	}
	if u := rising(func(u float64) float64 { return math.NaN() }, 3, 1, 1e6); u != 3 {
		t.Errorf("not a number: %g", u)
	}
}

// TestDispersionIsWhereTheCriterionIsLeast: the derivative of V in log phi, D_p/(2 phi) + sum dl_s/dlog phi + M/2 with the
// saturated likelihood differenced, vanishes at the dispersion that was found.
func TestDispersionIsWhereTheCriterionIsLeast(t *testing.T) {
	for _, name := range []string{"gamma", "tweedie"} {
		dist, err := response.New(name, "")
		if err != nil {
			t.Fatal(err)
		}
		p := problem(t, dist, 300, 3)
		r, err := Fit(context.Background(), p, REML, nil)
		if err != nil {
			t.Fatal(err)
		}
		v := func(logPhi float64) float64 {
			phi, sum := math.Exp(logPhi), 0.0
			for _, o := range p.Obs {
				sum -= r.Dist.Saturated(o, phi)
			}
			return sum + (r.Deviance+r.Penalty)/(2*phi) - float64(p.Engine.NullDim())/2*logPhi
		}
		const h = 1e-3
		at := math.Log(r.Phi)
		slope := richardson(func(d float64) float64 { return v(at + h*d) }) / h
		if bend := (v(at+0.1) - 2*v(at) + v(at-0.1)) / 0.01; !(math.Abs(slope) < 1e-7*bend) {
			t.Errorf("%s: slope %g with curvature %g at dispersion %g", name, slope, bend, r.Phi)
		}
	}
}

// TestGivenSmoothnessIsNoUncertainty: a lambda that was given adds nothing to the covariance.
func TestGivenSmoothnessIsNoUncertainty(t *testing.T) {
	p := problem(t, response.Poisson{}, 200, 4)
	for _, c := range []struct {
		lambda []float64
		want   int
	}{{nil, 2}, {[]float64{1, math.NaN()}, 1}, {[]float64{1, 1}, 0}} {
		criterion := Given
		if c.lambda == nil {
			criterion = REML
		}
		r, err := Fit(context.Background(), p, criterion, c.lambda)
		if err != nil {
			t.Fatal(err)
		}
		if _, k, extra, err := Uncertainty(context.Background(), p, r); err != nil || k != c.want || (extra > 0) != (k > 0) {
			t.Errorf("lambda %v: %d directions, %g degrees of freedom, %v", c.lambda, k, extra, err)
		}
	}
}

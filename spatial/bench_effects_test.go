package spatial

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// large is n spread counts (theta 3) of a surface, two curves and 50 groups.
func large(n int) (Data, Model) {
	random := rand.New(rand.NewPCG(61, 1))
	d := Data{Places: scattered(n, random)}
	a, b, g := Covariate{Name: "a"}, Covariate{Name: "b"}, Covariate{Name: "g"}
	level := make([]float64, 50)
	for k := range level {
		g.Level, level[k] = append(g.Level, fmt.Sprint(k)), 0.3*random.NormFloat64()
	}
	for i := 0; i < n; i++ {
		u, v, k := random.Float64(), random.Float64(), random.IntN(50)
		a.Number, b.Number, g.Code = append(a.Number, u), append(b.Number, v), append(g.Code, int32(k))
		mu := 3 * math.Exp(franke(d.Places.X[i], d.Places.Y[i])+0.6*math.Sin(5*u)+sq(v-0.5)+level[k])
		d.Response = append(d.Response, distuv.Poisson{Lambda: mu * gammaDraw(random, 3) / 3, Src: random}.Rand())
	}
	d.Covariates = []Covariate{a, b, g}
	return d, Model{Distribution: "negative-binomial", Effects: []Effect{{Name: "a", Role: Curve}, {Name: "b", Role: Curve}, {Name: "g", Role: Group}}}
}

// BenchmarkEffects is 5000 spread counts with 200 knots, two curves and 50 groups; wanted in under 5 s on two idle cores.
func BenchmarkEffects(b *testing.B) {
	d, m := large(5000)
	var r Report
	for b.Loop() {
		s, err := Fit(context.Background(), m, d, Options{})
		if err != nil {
			b.Fatal(err)
		}
		r = s.Report()
	}
	b.ReportMetric(float64(r.Passes), "passes")
	b.ReportMetric(float64(r.Iterations), "iterations")
}

// BenchmarkShapes is 2000 rows with 100 knots of each distribution with a shape, a dispersion or a link of its own.
func BenchmarkShapes(b *testing.B) {
	for k, c := range shapedTruths {
		b.Run(c.dist, func(b *testing.B) {
			random := rand.New(rand.NewPCG(62, uint64(k)))
			d := Data{Places: scattered(2000, random)}
			for i, x := range d.Places.X {
				d.Response = append(d.Response, c.draw(random, c.a+c.b*franke(x, d.Places.Y[i]), 1, 20))
			}
			if kind := c.dist; kind == "beta-binomial" || kind == "binomial" {
				d.Trials = repeatTo(2000, 20)
			}
			var r Report
			for b.Loop() {
				s, err := Fit(context.Background(), Model{Distribution: c.dist, Link: c.link, MaxKnots: 100}, d, Options{})
				if err != nil {
					b.Fatal(err)
				}
				r = s.Report()
			}
			b.ReportMetric(float64(r.Passes), "passes")
			b.ReportMetric(float64(r.Iterations), "iterations")
		})
	}
}

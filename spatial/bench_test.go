package spatial

import (
	"context"
	"fmt"
	"testing"

	"drumlin/spatial/response"
)

func BenchmarkFit(b *testing.B) {
	for _, c := range []struct {
		dist     string
		n, knots int
	}{{"poisson", 1000, 150}, {"poisson", 5000, 150}, {"binomial", 1000, 150}, {"gaussian", 20000, 200}} {
		b.Run(fmt.Sprintf("%s/n=%d/knots=%d", c.dist, c.n, c.knots), func(b *testing.B) {
			d := sample(c.dist, c.n, 7)
			m := Model{Distribution: c.dist, MaxKnots: c.knots}
			b.ReportAllocs()
			var r Report
			for b.Loop() {
				s, err := Fit(context.Background(), m, d, Options{})
				if err != nil {
					b.Fatal(err)
				}
				r = s.Report()
			}
			b.ReportMetric(float64(r.Passes), "passes")
		})
	}
}

func BenchmarkFitSets(b *testing.B) {
	dist, err := response.New("poisson", "")
	if err != nil {
		b.Fatal(err)
	}
	for _, c := range []struct{ rows, most, knots int }{{300, 8, 50}, {3000, 31, 200}} {
		d := strips(c.rows, c.most, 7, dist)
		b.Run(fmt.Sprintf("poisson/n=%d/points=%d/knots=%d", c.rows, len(d.Places.X), c.knots), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := Fit(context.Background(), Model{Distribution: "poisson", MaxKnots: c.knots}, d, Options{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkPredict(b *testing.B) {
	for _, cells := range []int{100, 300} {
		b.Run(fmt.Sprintf("cells=%dx%d", cells, cells), func(b *testing.B) {
			s := fit(b, Model{Distribution: "poisson", MaxKnots: 150}, sample("poisson", 1000, 7), Options{})
			at := grid(cells)
			eta, se := make([]float64, at.Len()), make([]float64, at.Len())
			b.ReportAllocs()
			for b.Loop() {
				if err := s.PredictTo(context.Background(), eta, se, at, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

package grids

import (
	"math"
	"slices"
	"testing"

	"github.com/paulmach/orb"
	"pgregory.net/rapid"
)

func TestConvexHullKnown(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		name string
		x, y []float64
		want orb.Ring
	}{
		{"none", nil, nil, nil},
		{"only lost ones", []float64{nan, inf, 1}, []float64{1, 1, nan}, nil},
		{"one, twice", []float64{2, 2}, []float64{3, 3}, orb.Ring{{2, 3}}},
		{"a line", []float64{0, 2, 1}, []float64{0, 2, 1}, orb.Ring{{0, 0}, {2, 2}, {0, 0}}},
		{"a square with its middle, edge and a lost one", []float64{0, 1, 1, 0, 0.5, 0.5, nan}, []float64{0, 1, 0, 1, 0.5, 0, 5},
			orb.Ring{{0, 0}, {1, 0}, {1, 1}, {0, 1}, {0, 0}}},
	} {
		if got := ConvexHull(c.x, c.y); !slices.Equal(got, c.want) {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
}

// What makes a hull: corners among the places, every turn a left one, no place outside.
func TestConvexHullIsOne(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		// a coarse grid of integers, so that ties and collinear places come up and turns are exact
		x := rapid.SliceOfN(rapid.IntRange(-9, 9), 3, 40).Draw(t, "x")
		y := rapid.SliceOfN(rapid.IntRange(-9, 9), len(x), len(x)).Draw(t, "y")
		fx, fy := make([]float64, len(x)), make([]float64, len(x))
		for i := range x {
			fx[i], fy[i] = float64(x[i]), float64(y[i])
		}
		h := ConvexHull(fx, fy)
		if len(h) < 4 {
			return // on one line
		}
		if h[0] != h[len(h)-1] {
			t.Fatalf("%v is not closed", h)
		}
		for v := range len(h) - 1 {
			if turn(h[v], h[v+1], h[(v+2)%(len(h)-1)]) <= 0 {
				t.Fatalf("%v does not turn left at %d", h, v+1)
			}
			for i := range fx {
				if turn(h[v], h[v+1], orb.Point{fx[i], fy[i]}) < 0 {
					t.Fatalf("%v: place %d is outside", h, i)
				}
			}
			if !slices.ContainsFunc(fx, func(a float64) bool { return a == h[v][0] }) {
				t.Fatalf("%v: corner %d is no place", h, v)
			}
		}
	})
}

package grids

import (
	"fmt"
	"math"
	"slices"
	"testing"
)

// slowNearest looks at every place.
func slowNearest(x, y []float64, atX, atY float64) float64 {
	best := math.NaN()
	for i := range x {
		if d := math.Sqrt((x[i]-atX)*(x[i]-atX) + (y[i]-atY)*(y[i]-atY)); d < best || math.IsNaN(best) {
			best = d
		}
	}
	return best
}

func TestNearestAgainstAll(t *testing.T) {
	for _, crowded := range []bool{false, true} {
		for _, side := range []float64{1, 1e5} {
			for _, n := range []int{1, 2, 8, 9, 17, 1000} {
				x, y := scattered(uint64(n), n, side, crowded)
				x, y = append(x, x[:n/2]...), append(y, y[:n/2]...) // the same places again
				atX, atY := scattered(7, 500, 3*side, false)
				for i := range atX {
					atX[i], atY[i] = atX[i]-side, atY[i]-side
				}
				atX, atY = append(atX, x[0], 1e9*side), append(atY, y[0], -1e9*side)
				got := Nearest(x, y, atX, atY)
				for i := range atX {
					if want := slowNearest(x, y, atX[i], atY[i]); got[i] != want {
						t.Fatalf("crowded %v, side %v, n %d, at %v %v: %v, want %v", crowded, side, n, atX[i], atY[i], got[i], want)
					}
				}
				slices.Reverse(x)
				slices.Reverse(y)
				if again := Nearest(x, y, atX, atY); !slices.Equal(got, again) {
					t.Fatal("the order of the places matters")
				}
			}
		}
	}
}

func TestNearestOddPlaces(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	d := Nearest([]float64{nan, 3, inf}, []float64{0, 4, 0}, []float64{0, nan, 0, 3}, []float64{0, 0, inf, 4})
	if d[0] != 5 || !math.IsNaN(d[1]) || !math.IsNaN(d[2]) || d[3] != 0 {
		t.Errorf("got %v", d)
	}
	if d := Nearest(nil, nil, []float64{1}, []float64{1}); !math.IsNaN(d[0]) {
		t.Errorf("without places: %v", d)
	}
	if d := Nearest([]float64{1e150, -1e150}, []float64{0, 0}, []float64{1e150}, []float64{1e150}); d[0] != 1e150 {
		t.Errorf("far places: %v", d)
	}
}

func TestMedianSpacing(t *testing.T) {
	// spacings of 0, 1, 3, 7 (twice the place at 1) on a line: 1, 1, 2, 4, median 1.5
	if got := MedianSpacing([]float64{7, 1, 0, 3, 1, math.NaN()}, []float64{0, 0, 0, 0, 0, 0}); got != 1.5 {
		t.Errorf("got %v, want 1.5", got)
	}
	for _, n := range []int{0, 1} {
		if got := MedianSpacing(make([]float64, 3*n), make([]float64, 3*n)); !math.IsNaN(got) {
			t.Errorf("%d distinct places: %v", n, got)
		}
	}
	for _, crowded := range []bool{false, true} {
		x, y := scattered(3, 501, 100, crowded)
		var d []float64
		for i := range x {
			others := slices.Concat(x[:i], x[i+1:])
			d = append(d, slowNearest(others, slices.Concat(y[:i], y[i+1:]), x[i], y[i]))
		}
		slices.Sort(d)
		if got := MedianSpacing(x, y); got != d[250] {
			t.Errorf("crowded %v: %v, want %v", crowded, got, d[250])
		}
	}
}

func BenchmarkNearest(b *testing.B) {
	l := Lattice{Cell: 0.1, NX: 1000, NY: 1000}
	_, cx, cy := l.Centres()
	rx, ry := scattered(2, 1_000_000, 300, false)
	for _, c := range []struct {
		name     string
		crowded  bool
		shift    float64
		atX, atY []float64
	}{
		{"even", false, 0, cx, cy},
		{"crowded", true, 0, cx, cy},
		{"far", false, 1000, cx, cy},
		{"even, asked in no order", false, 0, rx, ry},
	} {
		x, y := scattered(1, 10_000, 100, c.crowded)
		for i := range x {
			x[i] += c.shift
		}
		b.Run(fmt.Sprintf("%s/places=%d/at=%d", c.name, len(x), len(c.atX)), func(b *testing.B) {
			b.ReportAllocs()
			for range b.N {
				Nearest(x, y, c.atX, c.atY)
			}
		})
	}
}

package grids

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
)

// signed is the area of rings by their direction, by the shoelace formula.
func signed(shape orb.MultiPolygon) (sum float64) {
	for _, p := range shape {
		for _, r := range p {
			for i := 1; i < len(r); i++ {
				sum += (r[i-1][0]*r[i][1] - r[i][0]*r[i-1][1]) / 2
			}
		}
	}
	return sum
}

func length(shape orb.MultiPolygon) (sum float64) {
	for _, p := range shape {
		for _, r := range p {
			sum += planar.Length(r)
		}
	}
	return sum
}

// TestOuterEdges: what neighbours share goes, and the area that is enclosed stays.
func TestOuterEdges(t *testing.T) {
	tenth := 0.1 // not a constant, whose sums would be exact
	if 10.2+tenth == 10+3*tenth {
		t.Fatal("the two sums are the same number")
	}
	ring := orb.Polygon{box(0, 0, 3, 3)[0], {{1, 1}, {1, 2}, {2, 2}, {2, 1}, {1, 1}}}
	for _, c := range []struct {
		name         string
		shape        orb.MultiPolygon
		rings        int
		length, area float64
	}{
		{"one", orb.MultiPolygon{box(0, 0, 1, 1)}, 1, 4, 1},
		{"two side by side", orb.MultiPolygon{box(0, 0, 1, 1), box(1, 0, 2, 1)}, 1, 6, 2},
		{"two apart", orb.MultiPolygon{box(0, 0, 1, 1), box(5, 0, 6, 1)}, 2, 8, 2},
		{"touching at a corner", orb.MultiPolygon{box(0, 0, 1, 1), box(1, 1, 2, 2)}, 2, 8, 2},
		{"a hole that is filled", orb.MultiPolygon{ring, box(1, 1, 2, 2)}, 1, 12, 9},
		{"a hole that is not", orb.MultiPolygon{ring}, 2, 16, 8},
		{"the same twice", orb.MultiPolygon{box(0, 0, 1, 1), box(0, 0, 1, 1)}, 2, 8, 2},
		{"side by side up to rounding", orb.MultiPolygon{box(10, 0, 10.2+tenth, 1), box(10+3*tenth, 0, 11, 1)}, 1, 4, 1},
		{"with a gap", orb.MultiPolygon{box(0, 0, 1, 1), box(1.00001, 0, 2.00001, 1)}, 2, 8, 2},
		{"nothing", nil, 0, 0, 0},
	} {
		got := OuterEdges(c.shape)
		if len(got) != c.rings || math.Abs(length(got)-c.length) > 1e-12 || math.Abs(signed(got)-c.area) > 1e-12 {
			t.Errorf("%s: %d rings of length %g around %g, want %d, %g, %g", c.name, len(got), length(got), signed(got), c.rings, c.length, c.area)
		}
		for _, p := range got {
			if !p[0].Closed() {
				t.Errorf("%s: a ring is open", c.name)
			}
		}
	}
}

// TestOuterEdgesOfACheckerboard: squares of a lattice, some missing, against counting sides without a neighbour.
func TestOuterEdgesOfACheckerboard(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for range 50 {
		const n = 8
		var there [n + 2][n + 2]bool
		var shape orb.MultiPolygon
		for i := 1; i <= n; i++ {
			for j := 1; j <= n; j++ {
				if there[i][j] = random.IntN(3) > 0; there[i][j] {
					shape = append(shape, box(float64(i), float64(j), float64(i+1), float64(j+1)))
				}
			}
		}
		sides := 0
		for i := 1; i <= n; i++ {
			for j := 1; j <= n; j++ {
				for _, d := range [][2]int{{1, 0}, {-1, 0}, {0, 1}, {0, -1}} {
					if there[i][j] && !there[i+d[0]][j+d[1]] {
						sides++
					}
				}
			}
		}
		got := OuterEdges(shape)
		if math.Abs(length(got)-float64(sides)) > 1e-9 || math.Abs(signed(got)-float64(len(shape))) > 1e-9 {
			t.Fatalf("length %g around %g, want %d around %d", length(got), signed(got), sides, len(shape))
		}
	}
}

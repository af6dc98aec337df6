package vector

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"github.com/paulmach/orb"
)

func box(west, south, east, north float64) orb.Ring {
	return orb.Ring{{west, south}, {east, south}, {east, north}, {west, north}, {west, south}}
}

func TestCheckArea(t *testing.T) {
	tests := []struct {
		name string
		g    orb.Geometry
		want string
	}{
		{"box", orb.Polygon{box(0, 0, 4, 4)}, ""},
		{"far from 0", orb.Polygon{box(500000, 5000000, 500000.01, 5000000.01)}, ""},
		{"hole", orb.Polygon{box(0, 0, 4, 4), box(1, 1, 2, 2)}, ""},
		{"hole that touches", orb.Polygon{box(0, 0, 4, 4), {{0, 2}, {2, 4}, {4, 2}, {2, 0}, {0, 2}}}, ""},
		{"two boxes along an edge", orb.MultiPolygon{{box(0, 0, 4, 4)}, {box(4, 0, 8, 4)}}, ""},
		{"spike", orb.Polygon{{{0, 0}, {4, 0}, {4, 4}, {4, 9}, {4, 4}, {0, 4}, {0, 0}}}, ""},
		{"repeated position", orb.Polygon{{{0, 0}, {0, 0}, {4, 0}, {4, 4}, {4, 4}, {0, 0}}}, ""},
		{"nothing", nil, "has no geometry"},
		{"point", orb.Point{1, 2}, "is a Point, not an area"},
		{"no polygons", orb.MultiPolygon{}, "has no polygons"},
		{"no rings", orb.Polygon{}, "ring 1: is absent"},
		{"three positions", orb.Polygon{{{0, 0}, {1, 0}, {0, 0}}}, "ring 1: has 3 positions, and a ring needs 4 or more"},
		{"open", orb.Polygon{{{0, 0}, {1, 0}, {1, 1}, {0, 1}}}, "ring 1: is not closed: it starts at (0, 0) and ends at (0, 1)"},
		{"infinite", orb.Polygon{{{0, 0}, {1, 0}, {math.Inf(1), 1}, {0, 0}}}, "ring 1: has a position that is not finite"},
		{"line", orb.Polygon{{{0, 0}, {1, 0.1}, {3, 0.3}, {0, 0}}}, "ring 1: has no area, near (0, 0)"},
		{"one place", orb.Polygon{{{7, 7}, {7, 7}, {7, 7}, {7, 7}}}, "ring 1: has no area, near (7, 7)"},
		{"bow tie", orb.MultiPolygon{{box(9, 9, 10, 10)}, {{{0, 0}, {4, 4}, {4, 0}, {0, 3}, {0, 0}}}}, "polygon 2, ring 1: crosses itself near (1.714285714, 1.714285714)"},
		{"hole across", orb.Polygon{box(0, 0, 4, 4), box(1, 1, 2, 2), box(3, 1, 5, 2)}, "ring 3: crosses ring 1 near (4, 1)"},
		{"hole outside", orb.Polygon{box(0, 0, 4, 4), box(5, 1, 6, 2)}, "ring 2: is a hole that lies outside of the polygon, near (5, 1)"},
		{"hole around", orb.Polygon{box(0, 0, 4, 4), box(-1, -1, 6, 6)}, "ring 2: is a hole that lies outside of the polygon, near (-1, -1)"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got := ""
			if err := CheckArea(test.g); err != nil {
				got = err.Error()
				if hint(err) == "no hint" {
					t.Error("no advice")
				}
			}
			if got != test.want {
				t.Errorf("got  %s\nwant %s", got, test.want)
			}
		})
	}
}

// Rings of random positions, against a comparison of every edge with every other one.
func TestCheckAreaBruteForce(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 1))
	found := map[bool]int{}
	for range 400 {
		n := 4 + random.IntN(60)
		ring := make(orb.Ring, 0, n+1)
		wobble := random.Float64()
		for k := range n { // a star around 0, its positions moved so that some rings cross themselves
			turn := 2 * math.Pi * (float64(k) + wobble*random.NormFloat64()) / float64(n)
			far := 1 + random.Float64()
			ring = append(ring, orb.Point{far * math.Cos(turn), far * math.Sin(turn)})
		}
		ring = append(ring, ring[0])
		want := false
		for i := 1; i < len(ring); i++ {
			for k := 1; k < i; k++ {
				want = want || (&outlines{}).cross(edge{ring[i-1], ring[i], 0}, edge{ring[k-1], ring[k], 0})
			}
		}
		err := CheckArea(orb.Polygon{ring})
		if got := err != nil && strings.Contains(err.Error(), "crosses itself"); got != want {
			t.Fatalf("%v: %v", ring, err)
		}
		found[want]++
	}
	if found[true] < 50 || found[false] < 50 {
		t.Errorf("too few of one sort: %v", found)
	}
}

// A long coast is checked in time of the order n log n, and a tangle is given up instead of taking n squared.
func TestCheckAreaWork(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 2))
	const n = 100000
	coast := make(orb.Ring, 0, n+1)
	for k := range n {
		turn := 2 * math.Pi * float64(k) / n
		far := 1000 * (1 + 0.3*math.Sin(40*turn) + 1e-4*random.Float64())
		coast = append(coast, orb.Point{far * math.Cos(turn), far * math.Sin(turn)})
	}
	coast = append(coast, coast[0])
	outlines := newOutlines(orb.Polygon{coast})
	outlines.crossSelf(0, 0, len(outlines.edges))
	if outlines.crossed || outlines.work > 20*n {
		t.Errorf("crossed %v after %d comparisons", outlines.crossed, outlines.work)
	}
	if err := CheckArea(orb.Polygon{coast, box(-1, -1, 1, 1)}); err != nil {
		t.Error(err)
	}
	comb := orb.Ring{} // long teeth along a diagonal: every box overlaps every other
	for k := range 10000 {
		across := float64(k)
		up, down := orb.Point{1e6 - across, 1e6 + across}, orb.Point{-across, across}
		if k%2 == 0 {
			up, down = down, up
		}
		comb = append(comb, up, down)
	}
	comb = append(comb, orb.Point{-1e5, -1e5}, comb[0])
	if err := CheckArea(orb.Polygon{comb}); err == nil || !strings.Contains(err.Error(), "tangled") {
		t.Error(err)
	}
}

func TestOrient(t *testing.T) {
	g := orb.MultiPolygon{{box(0, 0, 4, 4), box(1, 1, 2, 2)}, {box(5, 5, 6, 6)}}
	g[0][0].Reverse()
	Orient(g)
	for _, p := range g {
		for i, r := range p {
			if want := map[bool]orb.Orientation{true: orb.CCW, false: orb.CW}[i == 0]; r.Orientation() != want {
				t.Errorf("%v", r)
			}
		}
	}
}

package observe

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/paulmach/orb"

	"drumlin/io/wkt"
)

func TestFlaws(t *testing.T) {
	for _, test := range []struct{ name, text, want string }{
		{"square", "POLYGON ((0 0, 1 0, 1 1, 0 1, 0 0))", ""},
		{"far from the origin", "POLYGON ((500000 4600000, 500001 4600000, 500001 4600001, 500000 4600000))", ""},
		{"bow-tie", "POLYGON ((0 0, 2 2, 2 0, 0 2, 0 0))", "the polygon crosses itself near (1.000, 1.000)"},
		{"bow-tie of unequal wings, in metres", "POLYGON ((500000 4600000, 500300 4600200, 500300 4600000, 500000 4600100, 500000 4600000))",
			"the polygon crosses itself near (500100.0, 4600066.7)"},
		{"in a hole", "POLYGON ((0 0, 9 0, 9 9, 0 9, 0 0), (1 1, 3 3, 3 1, 1 3, 1 1))", "the polygon crosses itself near (2.000, 2.000)"},
		{"in the second of two", "MULTIPOLYGON (((0 0, 1 0, 1 1, 0 0)), ((5 5, 7 7, 7 5, 5 7, 5 5)))", "the polygon crosses itself near (6.000, 6.000)"},
		{"through an edge and back", "POLYGON ((0 0, 4 0, 4 4, 2 4, 2 -1, 1 -1, 1 4, 0 4, 0 0))", "the polygon crosses itself near (2.000, 0.000)"},
		{"touches itself at a corner", "POLYGON ((0 0, 1 1, 2 0, 2 2, 1 1, 0 2, 0 0))", ""},
		{"touches an edge", "POLYGON ((0 0, 4 0, 4 4, 2 0, 0 4, 0 0))", ""},
		{"a needle out and back", "POLYGON ((0 0, 4 0, 4 2, 8 2, 4 2, 4 4, 0 4, 0 0))", ""},
		{"crosses by less than rounding", "POLYGON ((0 0, 4 0, 4 4, 2 -0.000001, 0 4, 0 0))", ""},
		{"a position twice", "POLYGON ((0 0, 1 0, 1 0, 1 1, 0 1, 0 0))", ""},

		{"no area, a line", "POLYGON ((10.1 50.1, 10.2 50.2, 10.3 50.3, 10.1 50.1))", noArea},
		{"no area, a point", "POLYGON ((3 4, 3 4, 3 4, 3 4))", noArea},
		{"no area beside one", "MULTIPOLYGON (((3 4, 3 4, 3 4, 3 4)), ((0 0, 1 0, 1 1, 0 0)))", ""},
		{"a narrow one", "POLYGON ((0 0, 1000000 0, 1000000 1, 0 1, 0 0))", ""},
		{"no length", "LINESTRING (1 2, 1 2)", noLength},
		{"no length, of two", "MULTILINESTRING ((1 2, 1 2), (3 4, 3 4))", noLength},
		{"length of one of two", "MULTILINESTRING ((1 2, 1 2), (3 4, 3 5))", ""},
		{"a line that crosses itself", "LINESTRING (0 0, 2 2, 2 0, 0 2)", ""},
		{"points", "MULTIPOINT (1 2, 1 2)", ""},
	} {
		p, err := wkt.Parse(test.text)
		if err != nil {
			t.Fatal(err)
		}
		if got := flawOf(p.Geometry); got != test.want {
			t.Errorf("%s: got %q, want %q", test.name, got, test.want)
		}
	}
}

// Crossings against the comparison of every pair of edges, by signs of areas alone: positions are whole numbers, so these
// are exact, and a ring crosses by more than rounding or not at all.
func TestCrossingIsEveryPair(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 6))
	crossed := 0
	for range 3000 {
		ring := make(orb.Ring, 4+random.IntN(6))
		for i := range ring {
			ring[i] = orb.Point{float64(random.IntN(12)), float64(random.IntN(12))}
		}
		ring = append(ring, ring[0])
		want := false
		for i := 1; i < len(ring); i++ {
			for k := 1; k < i; k++ {
				p, q, r, s := ring[i-1], ring[i], ring[k-1], ring[k]
				want = want || side(p, q, r)*side(p, q, s) < 0 && side(r, s, p)*side(r, s, q) < 0
			}
		}
		at, got := crossing(ring)
		if got != want {
			t.Fatalf("%v: got %v, want %v", ring, got, want)
		}
		if got {
			crossed++
			on := 0
			for i := 1; i < len(ring); i++ {
				p, q := ring[i-1], ring[i]
				if math.Hypot(at[0]-p[0], at[1]-p[1])+math.Hypot(q[0]-at[0], q[1]-at[1]) < math.Hypot(q[0]-p[0], q[1]-p[1])+1e-9 {
					on++
				}
			}
			if on < 2 {
				t.Fatalf("%v: %v lies on %d edges", ring, at, on)
			}
		}
	}
	if crossed < 500 || crossed > 2900 {
		t.Errorf("%d of 3000 rings cross themselves", crossed)
	}
}

// side is twice the area of a triangle: above 0 where r lies to the left of the way from p to q.
func side(p, q, r orb.Point) float64 {
	return (q[0]-p[0])*(r[1]-p[1]) - (q[1]-p[1])*(r[0]-p[0])
}

// The work on a long outline is bounded, whatever it looks like: a coast, a comb, a spiral.
func TestCrossingOfLongRings(t *testing.T) {
	const n = 100_000
	rings := map[string]orb.Ring{}
	for i := range n {
		a := 2 * math.Pi * float64(i) / n
		r := 10 + math.Sin(40*a) + 0.1*math.Sin(3000*a)
		rings["coast"] = append(rings["coast"], orb.Point{r * math.Cos(a), r * math.Sin(a)})
		rings["comb"] = append(rings["comb"], orb.Point{float64(i), float64(i % 2 * n)})
		spikes := 5 + 5*float64(i%2)
		rings["spikes"] = append(rings["spikes"], orb.Point{spikes * math.Cos(a), spikes * math.Sin(a)})
		if i < n/2 {
			b := float64(i) / 500
			rings["spiral"] = append(rings["spiral"], orb.Point{(1 + b) * math.Cos(b), (1 + b) * math.Sin(b)})
		}
	}
	for i := n/2 - 1; i >= 0; i-- {
		b := float64(i) / 500
		rings["spiral"] = append(rings["spiral"], orb.Point{(2 + b) * math.Cos(b), (2 + b) * math.Sin(b)})
	}
	rings["comb"] = append(rings["comb"], orb.Point{n, -1}, orb.Point{0, -1})
	for name, ring := range rings {
		ring = append(ring, ring[0])
		start := time.Now()
		if at, crosses := crossing(ring); crosses {
			t.Errorf("%s: crosses itself at %v", name, at)
		}
		if took := time.Since(start); took > 5*time.Second { // a tenth of a second on an idle core
			t.Errorf("%s: %v", name, took)
		}
		k := len(ring) / 3
		ring[k], ring[k+2000] = ring[k+2000], ring[k]
		if _, crosses := crossing(ring); !crosses && name != "spikes" {
			t.Errorf("%s: two positions are exchanged, and nothing crosses", name)
		}
		t.Logf("%s: %v", name, time.Since(start))
	}
}

package basis2d

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// lattice returns n x n points over the unit square times size.
func lattice(n int, size float64) (x, y []float64) {
	for j := 0; j < n; j++ {
		for i := 0; i < n; i++ {
			x = append(x, (float64(i)+0.5)*size/float64(n))
			y = append(y, (float64(j)+0.5)*size/float64(n))
		}
	}
	return x, y
}

func (k Knots) points() [][2]float64 {
	p := make([][2]float64, len(k.X))
	for i := range p {
		p[i] = [2]float64{k.X[i], k.Y[i]}
	}
	return p
}

// nearestTo returns the distance from (x, y) to the nearest of the points.
func nearestTo(x, y float64, px, py []float64) float64 {
	d := math.Inf(1)
	for i := range px {
		d = math.Min(d, math.Hypot(px[i]-x, py[i]-y))
	}
	return d
}

// TestKnotsKeepTheirPromises draws places with duplicates, in clumps and on lattices.
func TestKnotsKeepTheirPromises(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, most := rapid.IntRange(1, 80).Draw(t, "places"), rapid.IntRange(1, 60).Draw(t, "most")
		steps := rapid.IntRange(1, 30).Draw(t, "steps") // few steps make many duplicates and ties
		random := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 0))
		x, y := make([]float64, n), make([]float64, n)
		at := map[[2]float64]bool{}
		for i := range x {
			x[i], y[i] = float64(random.IntN(steps)), float64(random.IntN(steps))
			if rapid.Bool().Draw(t, "clump") {
				x[i], y[i] = x[i]/8, y[i]/8
			}
			at[[2]float64{x[i], y[i]}] = true
		}
		var fillX, fillY []float64
		if rapid.Bool().Draw(t, "area") {
			fillX, fillY = lattice(20, float64(steps)*2)
		}
		k := PlaceKnots(x, y, fillX, fillY, most)
		if len(k.X) != len(k.Y) || len(k.X) > most || len(k.X) < 1 || k.InGaps > len(k.X) {
			t.Fatalf("%d by %d knots, %d of them in gaps, where %d are allowed", len(k.X), len(k.Y), k.InGaps, most)
		}
		if k.Distinct != len(at) {
			t.Fatalf("%d distinct places, there are %d", k.Distinct, len(at))
		}
		own := len(k.X) - k.InGaps
		if own > k.Distinct || len(fillX) == 0 && own != min(most, k.Distinct) {
			t.Fatalf("%d knots at places, of %d places and %d allowed", own, k.Distinct, most)
		}
		seen := map[[2]float64]bool{}
		for i, p := range k.points() {
			if i < own && !at[p] {
				t.Fatalf("knot %v is not at a place", p)
			}
			if i >= own && nearestTo(p[0], p[1], fillX, fillY) != 0 {
				t.Fatalf("knot %v is not in the study area", p)
			}
			if seen[p] {
				t.Fatalf("knot %v twice", p)
			}
			seen[p] = true
		}
		// No knot in a gap may crowd another: the smallest spacing stays that of the places.
		for i := own; i < len(k.X); i++ {
			if d := nearestTo(k.X[i], k.Y[i], k.X[:own], k.Y[:own]); own >= Null && d <= medianSpacing(k.X[:own], k.Y[:own]) && own == k.Distinct {
				t.Fatalf("the knot in a gap %v is %g from a place's, nearer than is usual among them", k.points()[i], d)
			}
		}
		// The order of rows is of no consequence.
		order := random.Perm(n)
		px, py := make([]float64, n), make([]float64, n)
		for i, j := range order {
			px[i], py[i] = x[j], y[j]
		}
		if other := PlaceKnots(px, py, fillX, fillY, most); !slices.Equal(k.points(), other.points()) {
			t.Fatalf("another order of rows gives other knots")
		}
		// Said twice, places count once.
		if twice := PlaceKnots(append(px, x...), append(py, y...), fillX, fillY, most); !slices.Equal(k.points(), twice.points()) {
			t.Fatalf("every place twice gives other knots")
		}
	})
}

// TestKnotsFillSpace checks the defining property of the farthest-point rule: every place is nearer to a knot than any
// two knots are to each other.
func TestKnotsFillSpace(t *testing.T) {
	random := rand.New(rand.NewPCG(4, 4))
	var x, y []float64
	for i := 0; i < 900; i++ { // nine tenths in one corner
		x, y = append(x, 0.1*random.Float64()), append(y, 0.1*random.Float64())
	}
	for i := 0; i < 100; i++ {
		x, y = append(x, random.Float64()), append(y, random.Float64())
	}
	k := PlaceKnots(x, y, nil, nil, 60)
	if len(k.X) != 60 {
		t.Fatalf("%d knots", len(k.X))
	}
	cover, apart := 0.0, math.Inf(1)
	for i := range x {
		cover = math.Max(cover, nearestTo(x[i], y[i], k.X, k.Y))
	}
	corner := 0
	for i := range k.X {
		ox, oy := slices.Clone(k.X), slices.Clone(k.Y)
		apart = math.Min(apart, nearestTo(k.X[i], k.Y[i], slices.Delete(ox, i, i+1), slices.Delete(oy, i, i+1)))
		if k.X[i] < 0.1 && k.Y[i] < 0.1 {
			corner++
		}
	}
	if !(cover <= apart) {
		t.Errorf("a place is %g from the nearest knot, knots are %g apart", cover, apart)
	}
	if corner > 5 {
		t.Errorf("%d of 60 knots in the corner with nine tenths of the places", corner)
	}
}

// TestGapsGetKnots leaves a disc without places: it gets knots if the study area covers it, and only then.
func TestGapsGetKnots(t *testing.T) {
	x, y := scattered(500, 0, 1, 21)
	var ox, oy []float64
	inHole := func(x, y float64) bool { return math.Hypot(x-0.5, y-0.5) < 0.25 }
	for i := range x {
		if !inHole(x[i], y[i]) {
			ox, oy = append(ox, x[i]), append(oy, y[i])
		}
	}
	fx, fy := lattice(40, 1)
	for _, most := range []int{60, 150, 1000} {
		without := PlaceKnots(ox, oy, nil, nil, most)
		with := PlaceKnots(ox, oy, fx, fy, most)
		if without.InGaps != 0 {
			t.Errorf("%d knots in gaps without a study area", without.InGaps)
		}
		holes := 0
		for i := range with.X {
			if inHole(with.X[i], with.Y[i]) {
				holes++
			}
		}
		if with.InGaps == 0 || holes == 0 || len(with.X) > most {
			t.Errorf("%d allowed: %d knots, %d in gaps, %d in the hole", most, len(with.X), with.InGaps, holes)
		}
		if own := len(with.X) - with.InGaps; float64(own) < 0.8*math.Min(float64(most), float64(with.Distinct))-1 {
			t.Errorf("%d allowed: gaps took all but %d knots", most, own)
		}
		spacing := medianSpacing(without.X, without.Y)
		left := 0
		for i := range fx { // nothing is left farther than a gap is wide, unless the allowance ran out
			if nearestTo(fx[i], fy[i], with.X, with.Y) > gapFactor*spacing {
				left++
			}
		}
		if left > 0 && len(with.X) < most {
			t.Errorf("%d allowed: %d points of the area are still in a gap and %d knots are left", most, left, most-len(with.X))
		}
	}
}

// TestNearPlacesShareAKnot: places nearer than minSpacing of their spread count as one.
func TestNearPlacesShareAKnot(t *testing.T) {
	x, y := scattered(30, 4e5, 1e4, 22)
	n := len(x)
	for i := 0; i < n; i++ { // a millimetre beside each
		x, y = append(x, x[i]+1e-3), append(y, y[i])
	}
	k := PlaceKnots(x, y, nil, nil, 500)
	if len(k.X) != n || k.Distinct != 2*n {
		t.Errorf("%d knots at %d places, of which half are a millimetre apart", len(k.X), k.Distinct)
	}
	if _, err := NewThinPlate(k.X, k.Y); err != nil {
		t.Error(err)
	}
}

func TestFewPlaces(t *testing.T) {
	fx, fy := lattice(10, 1)
	for _, c := range []struct {
		name    string
		x, y    []float64
		want    int
		makes   bool
		comment string
	}{
		{name: "none", want: 0},
		{name: "one", x: []float64{3}, y: []float64{4}, want: 1},
		{name: "one three times", x: []float64{3, 3, 3}, y: []float64{4, 4, 4}, want: 1},
		{name: "two", x: []float64{0, 1}, y: []float64{0, 0}, want: 2},
		{name: "on a line", x: []float64{0, 1, 2, 3, 5}, y: []float64{1, 2, 3, 4, 6}, want: 5},
		{name: "a triangle", x: []float64{0, 1, 0}, y: []float64{0, 0, 1}, want: 3, makes: true},
	} {
		t.Run(c.name, func(t *testing.T) {
			k := PlaceKnots(c.x, c.y, nil, nil, 200)
			if len(k.X) != c.want {
				t.Fatalf("%d knots, want %d", len(k.X), c.want)
			}
			if _, err := NewThinPlate(k.X, k.Y); (err == nil) != c.makes {
				t.Errorf("the surface: %v", err)
			}
			PlaceKnots(c.x, c.y, fx, fy, 200) // no panic with a study area either
		})
	}
}

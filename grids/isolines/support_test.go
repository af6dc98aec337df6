package isolines

import (
	"flag"
	"math"
	"testing"

	"github.com/paulmach/orb"
	"pgregory.net/rapid"

	"drumlin/grids"
)

// Properties are tried at the same places in every run; -rapid.seed on the command line still wins.
func init() {
	if err := flag.Set("rapid.seed", "20250101"); err != nil {
		panic(err)
	}
}

var nan, inf = math.NaN(), math.Inf(1)

// surfaceOf gives a lattice over [0, nx cell] x [0, ny cell] the values of a function at its centres.
func surfaceOf(nx, ny int, cell float64, f func(x, y float64) float64) (grids.Lattice, []float64) {
	l := grids.Lattice{Cell: cell, NX: nx, NY: ny}
	v := make([]float64, l.Cells())
	for k := range v {
		v[k] = f(l.Centre(k))
	}
	return l, v
}

// rows gives a lattice of unit cells the values of a table that is written as it lies on a map, north above.
func rows(table ...[]float64) (grids.Lattice, []float64) {
	l := grids.Lattice{Cell: 1, NX: len(table[0]), NY: len(table)}
	var v []float64
	for j := len(table) - 1; j >= 0; j-- {
		v = append(v, table[j]...)
	}
	return l, v
}

func linesOf(t testing.TB, l grids.Lattice, v []float64, levels ...float64) []Line {
	t.Helper()
	lines, err := Lines(l, v, levels)
	if err != nil {
		t.Fatal(err)
	}
	return lines
}

func bandsOf(t testing.TB, l grids.Lattice, v []float64, edges ...float64) []Band {
	t.Helper()
	bands, err := Bands(l, v, edges)
	if err != nil {
		t.Fatal(err)
	}
	return bands
}

// fataler is what *testing.T and *rapid.T have in common.
type fataler interface {
	Helper()
	Fatalf(format string, args ...any)
}

func live(l grids.Lattice, v []float64, k int) bool {
	return l.In(k) && !math.IsNaN(v[k]) && !math.IsInf(v[k], 0)
}

// drawSurface makes small surfaces of every sort: few values, so that plateaus, saddles and values on levels are common, or
// any; with or without a mask and holes; at coordinates near the origin or far from it. Levels come with it.
func drawSurface(t *rapid.T) (grids.Lattice, []float64, []float64) {
	l := grids.Lattice{NX: rapid.IntRange(1, 9).Draw(t, "nx"), NY: rapid.IntRange(1, 9).Draw(t, "ny")}
	l.Cell = rapid.SampledFrom([]float64{1, 0.1, 250}).Draw(t, "cell")
	l.X0 = rapid.SampledFrom([]float64{0, -3.3, 512345.678}).Draw(t, "x0")
	l.Y0 = rapid.SampledFrom([]float64{0, -1, 5412345.678}).Draw(t, "y0")
	one := rapid.OneOf(rapid.SampledFrom([]float64{0, 1, 2, 3}), rapid.SampledFrom([]float64{0, 1, 2, 3, nan, inf}),
		rapid.Float64Range(0, 3), rapid.SampledFrom([]float64{0, 1, 1 + 2e-16, 1 - 1e-16, 1 + 1e-13, 2 - 1e-13, 3}),
		rapid.Float64Range(-1e3, 1e3))
	if rapid.Bool().Draw(t, "one sort") {
		one = rapid.SampledFrom([]*rapid.Generator[float64]{rapid.SampledFrom([]float64{0, 1, 2, 3}), rapid.Float64Range(0, 3)}).Draw(t, "sort")
	}
	v := rapid.SliceOfN(one, l.Cells(), l.Cells()).Draw(t, "v")
	if rapid.Bool().Draw(t, "masked") {
		l.Mask = rapid.SliceOfN(rapid.SampledFrom([]bool{true, true, true, false}), l.Cells(), l.Cells()).Draw(t, "mask")
	}
	levels := rapid.SampledFrom([][]float64{{1}, {0, 1, 2, 3}, {0.5, 1.5, 2.5}, {0.25, 1, 1.25, 1.5, 2.9}, {0, 2}, {1, 1 + 4e-16, 1 + 1e-13, 2},
		{-500, 0, 1, 500}}).Draw(t, "levels")
	return l, v, levels
}

// interpolated is the value of the surface on the way between two centres or along a cell's side at the edge, from its
// definition; ok is false at places inside a square, where only lines run.
func interpolated(l grids.Lattice, v []float64, p orb.Point) (value, spread float64, ok bool) {
	u, w := (p[0]-l.X0)/l.Cell*2, (p[1]-l.Y0)/l.Cell*2 // in half-steps
	i, j := math.Round(u), math.Round(w)
	onColumn, onRow := math.Abs(u-i) < digits(l.X0, l), math.Abs(w-j) < digits(l.Y0, l)
	switch {
	case onColumn && onRow:
		value, spread = node2(l, v, int(i), int(j))
		return value, spread, true
	case onRow:
		a, sa := node2(l, v, int(math.Floor(u)), int(j))
		b, sb := node2(l, v, int(math.Floor(u))+1, int(j))
		t := u - math.Floor(u)
		return a + t*(b-a), max(sa, sb), true
	case onColumn:
		a, sa := node2(l, v, int(i), int(math.Floor(w)))
		b, sb := node2(l, v, int(i), int(math.Floor(w))+1)
		t := w - math.Floor(w)
		return a + t*(b-a), max(sa, sb), true
	}
	return 0, 0, false
}

// digits is what coordinates near an origin cannot say, in cells.
func digits(origin float64, l grids.Lattice) float64 { return 1e-9 + 8e-15*math.Abs(origin)/l.Cell }

// node2 is the value at half-step (i, j): of a cell, the mean of the cells beside a side, or what a corner with a gap has.
func node2(l grids.Lattice, v []float64, i, j int) (value, spread float64) {
	var around []float64
	low, high := inf, -inf
	for dj := -3; dj <= 3; dj++ {
		for di := -3; di <= 3; di++ {
			p, q := i+di, j+dj
			if p < 0 || q < 0 || p > 2*l.NX || q > 2*l.NY || p%2 == 0 || q%2 == 0 || !live(l, v, q/2*l.NX+p/2) {
				continue
			}
			a := v[q/2*l.NX+p/2]
			low, high = min(low, a), max(high, a)
			if di*di <= 1 && dj*dj <= 1 && (i%2 == 0 || di == 0) && (j%2 == 0 || dj == 0) {
				around = append(around, a)
			}
		}
	}
	if i%2 == 0 && j%2 == 0 && len(around) == 3 { // leave out the one opposite the gap
		around = nil
		at := func(di, dj int) (float64, bool) {
			p, q := i+di, j+dj
			if p < 0 || q < 0 || p > 2*l.NX || q > 2*l.NY || !live(l, v, q/2*l.NX+p/2) {
				return 0, false
			}
			return v[q/2*l.NX+p/2], true
		}
		for _, d := range [][2]int{{-1, -1}, {1, -1}, {1, 1}, {-1, 1}} {
			if a, ok := at(d[0], d[1]); ok {
				if _, opposite := at(-d[0], -d[1]); opposite {
					around = append(around, a)
				}
			}
		}
	}
	sum := 0.0
	for _, a := range around {
		sum += a
	}
	return sum / float64(len(around)), high - low
}

// signed is the area of a ring by its direction, by the shoelace formula about its first point.
func signed(r orb.Ring) (sum float64) {
	for i := 1; i < len(r); i++ {
		a, b := orb.Point{r[i-1][0] - r[0][0], r[i-1][1] - r[0][1]}, orb.Point{r[i][0] - r[0][0], r[i][1] - r[0][1]}
		sum += (a[0]*b[1] - b[0]*a[1]) / 2
	}
	return sum
}

func areaOf(shape orb.MultiPolygon) (sum float64) {
	for _, p := range shape {
		for _, r := range p {
			sum += signed(r)
		}
	}
	return sum
}

func lengthOf(paths orb.MultiLineString) (sum float64) {
	for _, p := range paths {
		for i := 1; i < len(p); i++ {
			sum += math.Hypot(p[i][0]-p[i-1][0], p[i][1]-p[i-1][1])
		}
	}
	return sum
}

// inside is the even-odd rule with a ray to the east.
func inside(p orb.Point, shape orb.MultiPolygon) bool {
	in := false
	for _, polygon := range shape {
		for _, ring := range polygon {
			for i := 1; i < len(ring); i++ {
				a, b := ring[i-1], ring[i]
				if (a[1] > p[1]) != (b[1] > p[1]) && p[0] < a[0]+(p[1]-a[1])*(b[0]-a[0])/(b[1]-a[1]) {
					in = !in
				}
			}
		}
	}
	return in
}

// cross reports whether two segments meet within both, ends apart; collinear ones if they share more than a point.
func cross(a, b, c, d orb.Point) bool {
	o1, o2, o3, o4 := orientation(a, b, c), orientation(a, b, d), orientation(c, d, a), orientation(c, d, b)
	if o1 == 0 && o2 == 0 {
		axis := 0
		if math.Abs(b[1]-a[1]) > math.Abs(b[0]-a[0]) {
			axis = 1
		}
		return max(min(a[axis], b[axis]), min(c[axis], d[axis])) < min(max(a[axis], b[axis]), max(c[axis], d[axis]))
	}
	return o1*o2 < 0 && o3*o4 < 0
}

// touches reports whether an end of one segment lies within the other.
func touches(a, b, c, d orb.Point) bool {
	within := func(p, a, b orb.Point) bool {
		return p != a && p != b && orientation(a, b, p) == 0 && p[0] >= min(a[0], b[0]) && p[0] <= max(a[0], b[0]) &&
			p[1] >= min(a[1], b[1]) && p[1] <= max(a[1], b[1])
	}
	return within(c, a, b) || within(d, a, b) || within(a, c, d) || within(b, c, d)
}

// distanceTo is the distance from a place to the nearest edge of a shape.
func distanceTo(p orb.Point, shape orb.MultiPolygon) float64 {
	least := inf
	for _, polygon := range shape {
		for _, ring := range polygon {
			for i := 1; i < len(ring); i++ {
				a, b := ring[i-1], ring[i]
				dx, dy := b[0]-a[0], b[1]-a[1]
				t := max(0, min(1, ((p[0]-a[0])*dx+(p[1]-a[1])*dy)/(dx*dx+dy*dy)))
				least = min(least, math.Hypot(a[0]+t*dx-p[0], a[1]+t*dy-p[1]))
			}
		}
	}
	return least
}

package grids

import (
	"encoding/csv"
	"flag"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"testing"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// Properties are tried at the same places in every run; -rapid.seed on the command line still wins.
func init() {
	if err := flag.Set("rapid.seed", "20250101"); err != nil {
		panic(err)
	}
}

func system(t testing.TB, code string) crs.System {
	t.Helper()
	s, err := crs.Parse(code)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func readCSV(t *testing.T, name string) [][]string {
	t.Helper()
	f, err := os.Open(name)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows[1:]
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// scattered gives n places in a square, spread evenly or crowded into a few spots.
func scattered(seed uint64, n int, side float64, crowded bool) (x, y []float64) {
	rng := rand.New(rand.NewPCG(seed, 0))
	for range n {
		px, py := rng.Float64()*side, rng.Float64()*side
		if crowded {
			spot := rand.New(rand.NewPCG(seed, uint64(rng.IntN(5))))
			px = spot.Float64()*side + rng.NormFloat64()*side*1e-5
			py = spot.Float64()*side + rng.NormFloat64()*side*1e-5
		}
		x, y = append(x, px), append(y, py)
	}
	return x, y
}

func box(w, s, e, n float64) orb.Polygon {
	return orb.Polygon{{{w, s}, {e, s}, {e, n}, {w, n}, {w, s}}}
}

// inside is the even-odd rule with a ray to the east, one place at a time: slow, and written apart from the scanline.
func inside(x, y float64, shape orb.MultiPolygon) bool {
	for _, polygon := range shape {
		in := false
		for _, ring := range polygon {
			for v := range ring {
				a, b := ring[v], ring[(v+1)%len(ring)]
				if (a[1] > y) != (b[1] > y) && x < a[0]+(y-a[1])*(b[0]-a[0])/(b[1]-a[1]) {
					in = !in
				}
			}
		}
		if in {
			return true
		}
	}
	return false
}

func near(got, want, relative float64) bool { return math.Abs(got-want) <= relative*math.Abs(want) }

// CellsIn returns the cells of l's study area whose centres lie in z, ascending. Holes are left out whichever way their
// rings turn; a cell in two polygons of the zone comes once. A centre on the edge between two zones belongs to exactly
// one of them. A polygon with a vertex that is not finite holds no cell.
func CellsIn(l Lattice, z Zone) []int {
	var cells []int
	for _, s := range l.spans(z.Shape) {
		for k := s.row*l.NX + s.i0; k < s.row*l.NX+s.i1; k++ {
			if l.In(k) {
				cells = append(cells, k)
			}
		}
	}
	return cells
}

package grids

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/clip"
	"github.com/paulmach/orb/planar"

	"drumlin/grids/crs"
)

// TestSharesIn holds every cell's part against clipping by another library, for shapes with holes and islands that reach
// beyond the lattice on all sides.
func TestSharesIn(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, X0: -3, Y0: 2, Cell: 0.7, NX: 11, NY: 9}
	random := rand.New(rand.NewPCG(3, 1))
	star := func(x, y, r float64, n int) orb.Ring {
		var ring orb.Ring
		for i := range n {
			a := 2 * math.Pi * float64(i) / float64(n)
			d := r * (0.4 + 0.6*random.Float64())
			ring = append(ring, orb.Point{x + d*math.Cos(a), y + d*math.Sin(a)})
		}
		return append(ring, ring[0])
	}
	for trial := range 60 {
		shape := orb.MultiPolygon{{star(6*random.Float64()-2, 6*random.Float64()+2, 1+4*random.Float64(), 3+random.IntN(20))}}
		switch trial % 4 {
		case 1:
			x, y := shape[0][0][0][0], shape[0][0][0][1]
			shape = append(shape, orb.Polygon{star(x+30, y, 3, 9)}) // off the lattice
		case 2:
			shape = orb.MultiPolygon{{star(1, 5, 20, 12)}} // around it
		case 3:
			shape = orb.MultiPolygon{{{{-4, 1}, {6, 1}, {6, 9}, {-4, 9}, {-4, 1}}, star(1, 5, 2, 11)}}
		}
		got := make([]float64, l.Cells())
		cells, area := SharesIn(l, shape)
		for k, c := range cells {
			if k > 0 && c <= cells[k-1] {
				t.Fatal("cells do not ascend")
			}
			got[c] = area[k]
		}
		for c := range got {
			i, j := float64(c%l.NX), float64(c/l.NX)
			bound := orb.Bound{Min: orb.Point{l.X0 + i*l.Cell, l.Y0 + j*l.Cell}, Max: orb.Point{l.X0 + (i+1)*l.Cell, l.Y0 + (j+1)*l.Cell}}
			want := 0.0
			for _, p := range shape {
				for r, ring := range p {
					if part := clip.Ring(bound, ring.Clone()); len(part) > 3 {
						a := math.Abs(planar.Area(orb.Polygon{part}))
						if r > 0 {
							a = -a
						}
						want += a
					}
				}
			}
			if math.Abs(got[c]-want) > 1e-9 {
				t.Fatalf("trial %d: cell %d has %.12g in common, want %.12g", trial, c, got[c], want)
			}
		}
	}
}

// TestSharesAddUp: halves add to the whole, and the whole has the ground area of the shape where the plane is not true.
func TestSharesAddUp(t *testing.T) {
	utm, err := crs.Parse("EPSG:32633")
	if err != nil {
		t.Fatal(err)
	}
	whole := orb.MultiPolygon{{{{500100, 5000050}, {500950, 5000120}, {500800, 5000890}, {500230, 5000700}, {500100, 5000050}}}}
	west := orb.MultiPolygon{{{{500100, 5000050}, {500525, 5000085}, {500515, 5000795}, {500230, 5000700}, {500100, 5000050}}}}
	east := orb.MultiPolygon{{{{500525, 5000085}, {500950, 5000120}, {500800, 5000890}, {500515, 5000795}, {500525, 5000085}}}}
	l := Lattice{CRS: utm, X0: 500000, Y0: 5000000, Cell: 37, NX: 30, NY: 30}
	sum := func(shape orb.MultiPolygon) (s float64) {
		_, area := SharesIn(l, shape)
		for _, a := range area {
			s += a
		}
		return s
	}
	if a := sum(whole); math.Abs(a/AreaOf(Zone{Shape: whole}, utm)-1) > 1e-9 || math.Abs(sum(west)+sum(east)-a) > 1e-9*a {
		t.Errorf("whole %.9f, ground %.9f, halves %.9f", a, AreaOf(Zone{Shape: whole}, utm), sum(west)+sum(east))
	}
}

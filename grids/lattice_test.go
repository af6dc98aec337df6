package grids

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"drumlin/grids/crs"
)

func TestLocateFindsCentresAndEdges(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := Lattice{
			CRS:  crs.Local{},
			X0:   rapid.Float64Range(-1e7, 1e7).Draw(t, "x0"),
			Y0:   rapid.Float64Range(-1e7, 1e7).Draw(t, "y0"),
			Cell: rapid.Float64Range(1e-3, 1e5).Draw(t, "cell"),
			NX:   rapid.IntRange(1, 300).Draw(t, "nx"),
			NY:   rapid.IntRange(1, 300).Draw(t, "ny"),
		}
		k := rapid.IntRange(0, l.Cells()-1).Draw(t, "k")
		if got, ok := l.Locate(l.Centre(k)); !ok || got != k {
			t.Fatalf("centre of %d is in %d, %v", k, got, ok)
		}
		corner := l.Outline(k)
		if b := l.Bound(); !b.Contains(corner[0]) || !b.Contains(corner[2]) || b.Min != l.Outline(0)[0] || b.Max != l.Outline(l.Cells() - 1)[2] {
			t.Fatalf("bound %v does not hold cell %d", b, k)
		}
		if got, ok := l.Locate(corner[0][0], corner[0][1]); !ok || got != k {
			t.Fatalf("south-west corner of %d is in %d, %v", k, got, ok)
		}
	})
}

func TestLocateOffTheLattice(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, X0: 10, Y0: 20, Cell: 5, NX: 4, NY: 2}
	for _, c := range []struct {
		x, y float64
		k    int
		ok   bool
	}{
		{10, 20, 0, true}, {15, 20, 1, true}, {30, 30, 7, true}, {30, 20, 3, true}, {12, 30, 4, true},
		{9.999, 20, -1, false}, {30.001, 25, -1, false}, {12, 30.001, -1, false},
		{math.NaN(), 25, -1, false}, {12, math.Inf(1), -1, false}, {-1e300, 1e300, -1, false},
	} {
		if k, ok := l.Locate(c.x, c.y); k != c.k || ok != c.ok {
			t.Errorf("%v %v: %d %v, want %d %v", c.x, c.y, k, ok, c.k, c.ok)
		}
	}
	if _, ok := (Lattice{}).Locate(0, 0); ok {
		t.Error("a lattice of no cells holds a place")
	}
}

func TestAreas(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, Cell: 0.1, NX: 3, NY: 2, Mask: []bool{true, true, false, true, false, true}}
	if got, want := l.Area(), l.Cell*l.Cell*4; got != want || l.Inside() != 4 || l.AreaOf([]int{0, 1}) != l.Cell*l.Cell*2 {
		t.Errorf("area %v, want %v", got, want)
	}
	cells, x, y := l.Centres()
	if len(cells) != 4 || cells[2] != 3 || x[2] != 0.05 || math.Abs(y[2]-0.15) > 1e-15 {
		t.Errorf("centres %v %v %v", cells, x, y)
	}
	// On the central meridian of a UTM zone lengths are 0.9996 of the ground's (EPSG Guidance Note 7-2, from memory),
	// so a square kilometre of the plane is 1/0.9996^2 square kilometres; 0.5 km away the rest is below 1e-8.
	u := Lattice{CRS: system(t, "EPSG:32633"), X0: 499500, Y0: 5e6, Cell: 1000, NX: 1, NY: 1}
	if want := 1e6 / (0.9996 * 0.9996); !near(u.CellAreaAt(0), want, 1e-8) || !near(u.Area(), want, 1e-8) {
		t.Errorf("UTM cell %v and %v, want %v", u.CellAreaAt(0), u.Area(), want)
	}
}

func TestField(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, Cell: 1, NX: 2, NY: 2}
	f := NewField(l, "level")
	if _, _, ok := f.Extremes(); ok || !math.IsNaN(f.At(0.5, 0.5)) {
		t.Error("an empty field has values")
	}
	f.Value[1], f.Value[2] = 3, -1
	f.Value[3] = math.Inf(1)
	if lo, hi, ok := f.Extremes(); lo != -1 || hi != 3 || !ok {
		t.Errorf("extremes %v %v %v", lo, hi, ok)
	}
	if f.At(1.5, 0.5) != 3 || !math.IsNaN(f.At(9, 9)) {
		t.Error("values are not where they belong")
	}
	if f.Validate() != nil || (Field{Lattice: l, Value: make([]float64, 3)}).Validate() == nil {
		t.Error("the number of values is not checked")
	}
}

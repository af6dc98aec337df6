package grids

import (
	"errors"
	"math"
	"strings"
	"testing"

	"github.com/paulmach/orb"
	"pgregory.net/rapid"

	"drumlin/grids/crs"
)

func TestLatticeOverTheHull(t *testing.T) {
	for _, side := range []float64{1, 50000} {
		x, y := scattered(11, 200, side, false)
		l, err := NewLattice(crs.Local{}, Spec{X: x, Y: y})
		if err != nil {
			t.Fatal(err)
		}
		if max(l.NX, l.NY) != DefaultAcross {
			t.Errorf("side %v: %d x %d cells", side, l.NX, l.NY)
		}
		hull := orb.MultiPolygon{{ConvexHull(x, y)}}
		reach := 5 * MedianSpacing(x, y)
		for k := range l.Cells() {
			cx, cy := l.Centre(k)
			if want := inside(cx, cy, hull) && slowNearest(x, y, cx, cy) <= reach; l.In(k) != want {
				t.Fatalf("side %v: cell %d in is %v", side, k, !want)
			}
		}
		// the cells' area is the hull's but for the rim
		if !near(l.Area(), planeArea(hull), 0.01) {
			t.Errorf("side %v: area %v, hull %v", side, l.Area(), planeArea(hull))
		}
	}
}

// Two crowds far apart: the land between them is not mapped, the crowds are, although five spacings are far less than a
// cell.
func TestLatticeLeavesOutWhatIsFar(t *testing.T) {
	var x, y []float64
	for i := range 40 {
		x = append(x, float64(i%2)*10000+float64(i/2%4), float64(i%2)*10000+float64(i/2%4))
		y = append(y, float64(i/8), float64(i/8)+10)
	}
	l, err := NewLattice(crs.Local{}, Spec{X: x, Y: y, Cell: 4})
	if err != nil {
		t.Fatal(err)
	}
	if n := l.Inside(); n == 0 || n > 40 {
		t.Errorf("%d cells of %d", n, l.Cells())
	}
	if k, ok := l.Locate(5000, 10); !ok || l.In(k) {
		t.Error("the land between is mapped")
	}
	s, err := NewStudyArea(x, y, nil)
	if err != nil || s.Reach != 5 {
		t.Errorf("reach %v, %v", s.Reach, err)
	}
}

// Three tight crowds: five spacings are 2.5 m, a cell is 100 m, and still the cell that holds a crowd is mapped.
func TestCellsOfCrowdsAreMapped(t *testing.T) {
	var x, y []float64
	for i := range 9 {
		dx, dy := float64(i%3)/2, float64(i/3)/2
		x, y = append(x, dx, 9999+dx, dx), append(y, dy, dy, 9999+dy)
	}
	l, err := NewLattice(crs.Local{}, Spec{X: x, Y: y})
	if err != nil {
		t.Fatal(err)
	}
	if l.NX != 100 || !l.In(0) || l.Inside() > 3 {
		t.Errorf("%d columns, cell 0 in is %v, %d in all", l.NX, l.In(0), l.Inside())
	}
}

// Whatever the observations: an error or a lattice with a cell in it, of about the size that was asked for.
func TestLatticeIsNeverEmpty(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(0, 12).Draw(t, "n")
		value := rapid.OneOf(rapid.Float64Range(0, 1), rapid.Float64Range(0, 1e6), rapid.Float64(),
			rapid.SampledFrom([]float64{0, 1, math.NaN(), math.Inf(1), -1e300, 5e-324}))
		spec := Spec{X: rapid.SliceOfN(value, n, n).Draw(t, "x"), Y: rapid.SliceOfN(value, n, n).Draw(t, "y"),
			Across: rapid.IntRange(0, 200).Draw(t, "across")}
		l, err := NewLattice(crs.Local{}, spec)
		if err != nil {
			return
		}
		if l.Inside() == 0 || len(l.Mask) != l.Cells() || l.Cells() > MostCells {
			t.Fatalf("%d of %d x %d cells", l.Inside(), l.NX, l.NY)
		}
		if across := spec.Across; across > 0 && max(l.NX, l.NY) != across {
			t.Fatalf("%d x %d cells, asked for %d", l.NX, l.NY, across)
		}
	})
}

func TestLatticeWithin(t *testing.T) {
	// a square kilometre with a hole of a tenth, its rings turning the same way; observations do not matter
	within := orb.MultiPolygon{{box(0, 0, 1000, 1000)[0], box(100, 100, 600, 300)[0]}}
	l, err := NewLattice(crs.Local{}, Spec{X: []float64{5}, Y: []float64{5}, Within: within, Cell: 20})
	if err != nil {
		t.Fatal(err)
	}
	if l.NX != 50 || l.NY != 50 || l.Inside() != 2250 || l.Area() != 900000 {
		t.Errorf("%d x %d, %d inside, area %v", l.NX, l.NY, l.Inside(), l.Area())
	}
	// 1000 m are 33 1/3 cells of 30: the last stands out, its centre too
	if l, err = NewLattice(crs.Local{}, Spec{Within: orb.MultiPolygon{box(0, 0, 1000, 1000)}, Cell: 30}); err != nil {
		t.Fatal(err)
	}
	if l.NX != 34 || l.Inside() != 33*33 {
		t.Errorf("%d columns, %d inside", l.NX, l.Inside())
	}
}

func TestLatticeRefusals(t *testing.T) {
	nan := math.NaN()
	square := orb.MultiPolygon{box(0, 0, 40000, 30000)}
	line := []float64{0, 1, 2, 3}
	utm := system(t, "EPSG:32633")
	for _, c := range []struct {
		name string
		sys  crs.System
		spec Spec
		says string
	}{
		{"nothing", crs.Local{}, Spec{}, "no observation has a place"},
		{"lost places", crs.Local{}, Spec{X: []float64{nan}, Y: []float64{1}}, "no observation has a place"},
		{"one place", crs.Local{}, Spec{X: []float64{2, 2}, Y: []float64{1, 1}}, "at one place"},
		{"level line", crs.Local{}, Spec{X: line, Y: make([]float64, 4)}, "on one line"},
		{"upright line", crs.Local{}, Spec{X: make([]float64, 4), Y: line}, "on one line"},
		{"slanting line with rounding", crs.Local{}, Spec{X: []float64{0.1, 0.2, 0.3}, Y: []float64{0.3, 0.6, 0.9}}, "on one line"},
		{"no polygon with area", crs.Local{}, Spec{Within: orb.MultiPolygon{{{{0, 0}, {1, 1}, {0, 0}}}}}, "enclose no area"},
		{"empty polygon", crs.Local{}, Spec{Within: orb.MultiPolygon{nil}}, "enclose no area"},
		{"vertex lost", crs.Local{}, Spec{Within: orb.MultiPolygon{{{{0, 0}, {1, 0}, {nan, 1}}}}}, "not a finite place"},
		{"vertex beyond reckoning", crs.Local{}, Spec{Within: orb.MultiPolygon{{{{0, 0}, {1e308, 0}, {0, 1e308}}}}}, "not a finite place"},
		{"negative cell", crs.Local{}, Spec{Within: square, Cell: -5}, "cell size: -5"},
		{"cell NaN", crs.Local{}, Spec{Within: square, Cell: nan}, "cell size: NaN"},
		{"cell infinite", crs.Local{}, Spec{Within: square, Cell: math.Inf(1)}, "cell size: +Inf"},
		{"negative count", crs.Local{}, Spec{Within: square, Across: -1}, "cells across: -1"},
		{"cell too large", crs.Local{}, Spec{Within: square, Cell: 1e5}, "no cell of 100000 m"},
		{"too many", crs.Local{}, Spec{Within: square, Cell: 1}, "40000 x 30000 = 1200000000 cells, more than the 25000000 it may have; a cell size of 7 m would fit"},
		{"too many across", crs.Local{}, Spec{Within: square, Across: 1e9}, "a cell size of 7 m would fit"},
		{"far too many", crs.Local{}, Spec{Within: square, Cell: 5e-324}, "a cell size of 7 m would fit"},
		{"too fine for the coordinates", crs.Local{}, Spec{Within: orb.MultiPolygon{box(1e15, 0, 1e15+1, 1)}}, "cannot be told apart"},
		{"off the plane", utm, Spec{Within: orb.MultiPolygon{box(0, 0, 1, 1e8)}}, "not a place in EPSG:32633"},
	} {
		l, err := NewLattice(c.sys, c.spec)
		if err == nil || !strings.Contains(err.Error(), c.says) || l.Cells() != 0 {
			t.Errorf("%s: %v, want %q", c.name, err, c.says)
		}
		var hinting interface{ Hint() string }
		if errors.As(err, &hinting) && hinting.Hint() == "" {
			t.Errorf("%s: an empty hint", c.name)
		}
	}
	var none *NoAreaError
	if _, err := NewLattice(crs.Local{}, Spec{X: line, Y: line}); !errors.As(err, &none) || none.Given || none.Places != 4 {
		t.Errorf("%v", err)
	}
}

// The size a refusal names does fit, and one digit less does not.
func TestFittingSizeFits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		wide, high := rapid.Float64Range(1e-3, 1e7).Draw(t, "wide"), rapid.Float64Range(1e-3, 1e7).Draw(t, "high")
		fits := fitting(wide, high, math.Max(wide, high)/1e9)
		spec := Spec{Cell: fits}
		b := orb.Bound{Max: orb.Point{wide, high}}
		if l, err := spec.cover(b); err != nil || l.Cells() > MostCells {
			t.Fatalf("%v x %v: %v does not fit: %v", wide, high, fits, err)
		}
		if less := fits * 0.9; count(wide, less)*count(high, less) <= MostCells {
			t.Fatalf("%v x %v: %v would fit too", wide, high, less)
		}
	})
}

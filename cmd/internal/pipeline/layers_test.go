package pipeline

import (
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"testing"
)

// height is a plane, which is exact between the centres of cells.
func height(x, y float64) float64 { return 50 + x/40 - y/100 }

// heights is an ASCII grid raster of height over the plain field and its surroundings, with missing where gone says so.
func heights(gone func(x, y float64) bool) string {
	const cell, nx, ny = 25, 48, 40
	var b strings.Builder
	fmt.Fprintf(&b, "ncols %d\nnrows %d\nxllcorner -100\nyllcorner -100\ncellsize %d\nNODATA_value -9999\n", nx, ny, cell)
	for j := ny - 1; j >= 0; j-- {
		for i := range nx {
			x, y := -100+cell*(float64(i)+0.5), -100+cell*(float64(j)+0.5)
			if gone != nil && gone(x, y) {
				b.WriteString("-9999 ")
			} else {
				fmt.Fprintf(&b, "%v ", height(x, y))
			}
		}
		b.WriteByte('\n')
	}
	return b.String()
}

// withHeights is the plain field's table with the column that the layer would give.
func withHeights(t *testing.T, seed uint64) string {
	lines := strings.Split(strings.TrimSuffix(plain.table(seed), "\n"), "\n")
	s := readSheet(t, write(t, "obs.csv", strings.Join(lines, "\n")+"\n"))
	x, y := s.numbers("x"), s.numbers("y")
	lines[0] += ",height"
	for i := range x {
		lines[i+1] += fmt.Sprintf(",%v", height(x[i], y[i]))
	}
	return strings.Join(lines, "\n") + "\n"
}

// TestLayerIsAColumn: a layer gives observations and cells what a column and places of one's own would.
func TestLayerIsAColumn(t *testing.T) {
	layer := "layer=height=" + write(t, "height.asc", heights(nil))
	words := []string{"response=zinc", "curve=height", "write=csv", "cells-across=15", "max-knots=20", "shrink=true"}
	with := mapped(t, write(t, "obs.csv", plain.table(6)), append(words, layer)...)
	a := readSheet(t, filepath.Join(with, "surface.csv"))
	at := "x,y,height\n"
	x, y := a.numbers("x"), a.numbers("y")
	for k := range x {
		at += fmt.Sprintf("%v,%v,%v\n", x[k], y[k], height(x[k], y[k]))
	}
	column := mapped(t, write(t, "obs.csv", withHeights(t, 6)), append(words[:2:2], "write=csv", "max-knots=20", "shrink=true", "at="+write(t, "at.csv", at))...)
	b := readSheet(t, filepath.Join(column, "surface.csv"))
	if len(a.rows) < 100 || len(a.rows) != len(b.rows) {
		t.Fatalf("%d and %d places", len(a.rows), len(b.rows))
	}
	for k := range a.rows { // knots in gaps follow the study area, which is the same
		near(t, "estimate", a.numbers("estimate")[k], b.numbers("estimate")[k], 1e-6)
		near(t, "error", a.numbers("standard_error")[k], b.numbers("standard_error")[k], 1e-4)
	}
	if a.header[len(a.header)-1] != "outside" {
		t.Errorf("the last column is %s", a.header[len(a.header)-1])
	}
	// Outside is what lies beyond the heights of the observations, as there is one layer.
	heights := readSheet(t, write(t, "obs.csv", withHeights(t, 6))).numbers("height")
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range heights {
		low, high = math.Min(low, v), math.Max(high, v)
	}
	for k, v := range a.numbers("outside") {
		h := height(x[k], y[k])
		if (v == 1) != (h < low-1e-9 || h > high+1e-9) && math.Abs(h-low) > 1e-9 && math.Abs(h-high) > 1e-9 {
			t.Errorf("cell %d with height %g, observed %g to %g: outside %g", k, h, low, high, v)
		}
	}
}

// TestLayerWithHoles: rows where it has no value are set aside, and cells are left out and counted.
func TestLayerWithHoles(t *testing.T) {
	gone := func(x, y float64) bool { return x > 400 && x < 600 && y > 300 && y < 500 }
	dir := mapped(t, write(t, "obs.csv", plain.table(6)), "response=zinc", "linear=height", "write=csv", "cells-across=20", "max-knots=20",
		"layer=height="+write(t, "height.asc", heights(gone)))
	aside := readSheet(t, filepath.Join(dir, "set-aside.csv"))
	for k, reason := range aside.text("reason") {
		if reason != "the layer has no value there" || aside.text("column")[k] != "height" {
			t.Errorf("row %s: %s", aside.text("row")[k], reason)
		}
	}
	s := readSheet(t, filepath.Join(dir, "surface.csv"))
	for k, x := range s.numbers("x") {
		if y := s.numbers("y")[k]; gone(x, y) && x > 401 && x < 599 && y > 301 && y < 499 {
			t.Errorf("a cell at %g, %g is mapped", x, y)
		}
	}
	d := readSummary(t, dir)
	if len(aside.rows) == 0 || d.number(t, "lattice", "masked") < 5 {
		t.Errorf("%d rows set aside, %v cells left out", len(aside.rows), d["lattice"])
	}
	if got := fmt.Sprint(d["cautions"]); !strings.Contains(got, "cells of the study area are left out: a layer has no value there") {
		t.Errorf("cautions: %s", got)
	}
}

// TestLayerOfClasses: the nearest cell's class, and no average of two.
func TestLayerOfClasses(t *testing.T) {
	var b strings.Builder
	b.WriteString("ncols 12\nnrows 10\nxllcorner -100\nyllcorner -100\ncellsize 100\n")
	for range 10 {
		for i := range 12 {
			fmt.Fprintf(&b, "%d ", []int{1, 2, 7}[i/4])
		}
		b.WriteByte('\n')
	}
	dir := mapped(t, write(t, "obs.csv", plain.table(6)), "response=zinc", "category=ground", "write=csv", "cells-across=20",
		"layer=ground="+write(t, "ground.asc", b.String()), "surface=none")
	s := readSheet(t, filepath.Join(dir, "surface.csv"))
	level := map[int]float64{}
	for k, x := range s.numbers("x") {
		class := min(2, int(x+100)/400)
		v := s.numbers("estimate")[k]
		if w, seen := level[class]; seen && v != w {
			t.Fatalf("class %d has %g and %g", class, v, w)
		}
		level[class] = v
	}
	if len(level) != 3 {
		t.Errorf("%d classes", len(level))
	}
}

// TestLayerInAnotherSystem: degrees under observations in a UTM zone.
func TestLayerInAnotherSystem(t *testing.T) {
	f := plain
	f.xName, f.yName, f.x0, f.y0, f.scale = "easting", "northing", 500000, 5000000, 20
	var b strings.Builder // 15 degrees east is the zone's middle; the field is 20 km wide
	b.WriteString("ncols 60\nnrows 60\nxllcorner 14.9\nyllcorner 45.0\ncellsize 0.01\n")
	for j := 59; j >= 0; j-- {
		for i := range 60 {
			fmt.Fprintf(&b, "%v ", 100*(14.9+0.01*(float64(i)+0.5)-15)+10*(45.0+0.01*(float64(j)+0.5)))
		}
		b.WriteByte('\n')
	}
	words := []string{"response=zinc", "linear=slope", "write=csv", "cells-across=12", "surface=none", "crs=EPSG:32633"}
	// A text raster does not say that it is in degrees, and is taken for the observations' own coordinates.
	_, err := Run(t.Context(), settings(t, write(t, "obs.csv", f.table(6)), append(words, "layer=slope="+write(t, "slope.asc", b.String()))...),
		filepath.Join(t.TempDir(), "out"), silent{})
	if want := "slope.asc: the layer has no value at 60 of 60 observations"; err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
}

// TestLayersTogether: a place within the range of each of two layers and far from where they go together is outside.
func TestLayersTogether(t *testing.T) {
	data := [][]float64{{1, 2, 3, 4, 5, 6}, {1.1, 2.2, 2.9, 4.1, 4.9, 6.2}}
	distance, ok := mahalanobis(data)
	if !ok {
		t.Fatal("no distance")
	}
	var sxx, sxy, syy, mx, my float64
	for i := range data[0] {
		mx, my = mx+data[0][i]/6, my+data[1][i]/6
	}
	for i := range data[0] {
		u, v := data[0][i]-mx, data[1][i]-my
		sxx, sxy, syy = sxx+u*u/5, sxy+u*v/5, syy+v*v/5
	}
	u, v := 2-mx, 5-my
	want := (syy*u*u - 2*sxy*u*v + sxx*v*v) / (sxx*syy - sxy*sxy)
	near(t, "distance", distance([][]float64{{2}, {5}}, 0), want, 1e-9)
	if _, ok := mahalanobis([][]float64{{1, 2, 3}, {2, 4, 6}}); ok {
		t.Error("columns that are multiples have a distance")
	}
}

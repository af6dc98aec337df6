package isolines

import (
	"errors"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"github.com/paulmach/orb"

	"drumlin/grids"
)

// The lines of a plane are straight, up to half a cell from the edge, and run on to the edge.
func TestPlane(t *testing.T) {
	l, v := surfaceOf(20, 10, 1, func(x, y float64) float64 { return x })
	lines := linesOf(t, l, v, -5, 3.25, 7.75, 100)
	if len(lines) != 2 || lines[0].Level != 3.25 || lines[1].Level != 7.75 {
		t.Fatalf("%v", lines)
	}
	for _, line := range lines {
		if len(line.Paths) != 1 || math.Abs(lengthOf(line.Paths)-10) > 1e-12 {
			t.Errorf("%d paths of length %v", len(line.Paths), lengthOf(line.Paths))
		}
		path := line.Paths[0]
		if first, last := path[0], path[len(path)-1]; first[1] != 10 || last[1] != 0 { // south, with the higher east on the left
			t.Errorf("from %v to %v", first, last)
		}
		for _, p := range path {
			if math.Abs(p[0]-line.Level) > 1e-12 {
				t.Errorf("level %v at %v", line.Level, p)
			}
		}
	}
	l, v = surfaceOf(20, 20, 1, func(x, y float64) float64 { return 2*x + 3*y })
	for _, p := range linesOf(t, l, v, 41.7)[0].Paths[0] {
		if p[0] > 0.5 && p[1] > 0.5 && p[0] < 19.5 && p[1] < 19.5 && math.Abs(2*p[0]+3*p[1]-41.7) > 1e-12 {
			t.Errorf("%v is off the line", p)
		}
	}
}

// The lines of a cone are circles, off by no more than linear interpolation is on a side of length h at distance r from the
// top: h^2/(8 r) in value, which is the distance too, and as much again for the chord.
func TestCone(t *testing.T) {
	const n, cell = 60, 0.5
	l, v := surfaceOf(n, n, cell, func(x, y float64) float64 { return -math.Hypot(x-15.1, y-14.8) })
	for _, r := range []float64{2, 5.3, 9, 13.9} {
		lines := linesOf(t, l, v, -r)
		if len(lines) != 1 || len(lines[0].Paths) != 1 {
			t.Fatalf("radius %v: %v", r, lines)
		}
		path := lines[0].Paths[0]
		if path[0] != path[len(path)-1] {
			t.Fatalf("radius %v is open", r)
		}
		for _, p := range path {
			if d := math.Hypot(p[0]-15.1, p[1]-14.8) - r; math.Abs(d) > 1.05*cell*cell/(8*r) {
				t.Errorf("radius %v: off by %v", r, d)
			}
		}
		area, want := signed(orb.Ring(path)), math.Pi*r*r
		if math.Abs(area-want) > 2*math.Pi*r*2*cell*cell/(8*r) { // the top is on the left, so counter-clockwise
			t.Errorf("radius %v: area %v, want %v", r, area, want)
		}
	}
}

// Of a saddle those sides are joined on which the mean is.
func TestSaddle(t *testing.T) {
	l, v := rows([]float64{0, 4}, []float64{4, 0})
	joined := linesOf(t, l, v, 1)[0].Paths // mean 2 is above: lines go round the corners below
	want := orb.MultiLineString{{{1.25, 0}, {1.25, 0.5}, {1.5, 0.75}, {2, 0.75}}, {{0.75, 2}, {0.75, 1.5}, {0.5, 1.25}, {0, 1.25}}}
	if !sameSet(joined, want) {
		t.Errorf("below the mean: %v", joined)
	}
	apart := linesOf(t, l, v, 3)[0].Paths
	want = orb.MultiLineString{{{0.75, 0}, {0.75, 0.5}, {0.5, 0.75}, {0, 0.75}}, {{1.25, 2}, {1.25, 1.5}, {1.5, 1.25}, {2, 1.25}}}
	if !sameSet(apart, want) {
		t.Errorf("above the mean: %v", apart)
	}
	if onIt := linesOf(t, l, v, 2)[0].Paths; len(onIt) != 2 {
		t.Errorf("at the mean: %v", onIt)
	}
}

// sameSet compares paths in any order, by their first points.
func sameSet(a, b orb.MultiLineString) bool {
	if len(a) != len(b) {
		return false
	}
	for _, p := range a {
		found := false
		for _, q := range b {
			found = found || reflect.DeepEqual(p, q)
		}
		if !found {
			return false
		}
	}
	return true
}

// What a value on the level does: a plateau is inside, through its centres; what has no width is not there.
func TestValuesOnTheLevel(t *testing.T) {
	plateau, v := rows([]float64{0, 0, 0, 0}, []float64{0, 1, 1, 0}, []float64{0, 1, 1, 0}, []float64{0, 0, 0, 0})
	paths := linesOf(t, plateau, v, 1)[0].Paths
	if len(paths) != 1 || signed(orb.Ring(paths[0])) != 1 || lengthOf(paths) != 4 {
		t.Errorf("plateau: %v", paths)
	}
	hollow, v := rows([]float64{1, 1, 1, 1}, []float64{1, 0, 0, 1}, []float64{1, 0, 0, 1}, []float64{1, 1, 1, 1})
	paths = linesOf(t, hollow, v, 1)[0].Paths // through the rim of ones, with cut corners
	if len(paths) != 1 || signed(orb.Ring(paths[0])) != -(9-4*0.5) {
		t.Errorf("hollow: %v", paths)
	}
	bend, v := rows([]float64{0, 0, 0}, []float64{0, 1, 1}, []float64{0, 1, 0})
	if paths = linesOf(t, bend, v, 1)[0].Paths; len(paths) != 1 || signed(orb.Ring(paths[0])) != 0.5 { // three of four make a triangle
		t.Errorf("bend: %v", paths)
	}
	for name, table := range map[string][][]float64{
		"peak":  {{0, 0, 0}, {0, 1, 0}, {0, 0, 0}},
		"ridge": {{0, 0, 0, 0}, {0, 1, 1, 1}, {0, 0, 0, 0}},
		"all":   {{1, 1}, {1, 1}},
		"below": {{0, 0}, {0, 0}},
	} {
		l, v := rows(table...)
		if lines := linesOf(t, l, v, 1); len(lines) != 0 {
			t.Errorf("%s: %v", name, lines)
		}
		bands := bandsOf(t, l, v, -inf, 1, inf)
		if len(bands) != 1 || len(bands[0].Area) != 1 || len(bands[0].Area[0]) != 1 || len(bands[0].Area[0][0]) < 5 ||
			areaOf(bands[0].Area) != float64(len(v)) || (bands[0].Low == 1) != (name == "all") {
			t.Errorf("%s: %v", name, bands)
		}
	}
}

// Around every cell of a checkerboard there is a line, joined by the mean with those diagonal to it or not.
func TestCheckerboard(t *testing.T) {
	l, v := surfaceOf(8, 8, 1, func(x, y float64) float64 { return float64((int(x) + int(y)) % 2) })
	for _, c := range []struct {
		level         float64
		paths, closed int
	}{
		// 32 cells of each sort; inside, 18 of each are closed off; round the edge, 14, of which corners are shared out
		{0.4, 32, 18}, {0.6, 32, 18}, {0.5, 32, 18},
	} {
		closed := 0
		paths := linesOf(t, l, v, c.level)[0].Paths
		for _, p := range paths {
			if p[0] == p[len(p)-1] {
				closed++
			}
		}
		if len(paths) != c.paths || closed != c.closed {
			t.Errorf("level %v: %d paths, %d closed", c.level, len(paths), closed)
		}
	}
	for _, b := range bandsOf(t, l, v, -inf, 0.4, inf) {
		if b.Low == 0.4 && (len(b.Area) != 1 || len(b.Area[0]) != 1+18) {
			t.Errorf("%d polygons, %d rings", len(b.Area), len(b.Area[0]))
		}
		if b.High == 0.4 && len(b.Area) != 32 {
			t.Errorf("%d polygons", len(b.Area))
		}
	}
}

// Holes in the mask and in the values are holes in the bands; single cells and cells that touch in a corner are polygons of their own.
func TestHolesAndSingleCells(t *testing.T) {
	l, v := rows([]float64{5, 5, 5, nan}, []float64{5, inf, 5, nan}, []float64{5, 5, 5, nan}, []float64{nan, nan, nan, 7})
	bands := bandsOf(t, l, v, -inf, 6, inf)
	if len(bands) != 2 {
		t.Fatalf("%v", bands)
	}
	ring := orb.MultiPolygon{{{{0, 1}, {3, 1}, {3, 4}, {0, 4}, {0, 1}}, {{1, 2}, {1, 3}, {2, 3}, {2, 2}, {1, 2}}}}
	if areaOf(bands[0].Area) != 8 || len(bands[0].Area) != 1 || len(bands[0].Area[0]) != 2 || areaOf(ring) != areaOf(bands[0].Area) {
		t.Errorf("ring: %v", bands[0].Area)
	}
	if areaOf(bands[1].Area) != 1 || len(bands[1].Area) != 1 {
		t.Errorf("single: %v", bands[1].Area)
	}
	l.Mask = make([]bool, len(v))
	if bands := bandsOf(t, l, v, -inf, inf); bands != nil {
		t.Errorf("all masked: %v", bands)
	}
	l.Mask[4], l.Mask[9] = true, true // they touch in a corner; the second is infinite
	if bands := bandsOf(t, l, v, -inf, inf); len(bands) != 1 || areaOf(bands[0].Area) != 1 {
		t.Errorf("one of two: %v", bands)
	}
	if bands := bandsOf(t, l, v, 5.5, 6, 9); bands != nil {
		t.Errorf("below the first edge: %v", bands)
	}
}

// A polygon in a hole of another, three times over: holes go with the ring around them.
func TestNested(t *testing.T) {
	l, v := surfaceOf(41, 41, 1, func(x, y float64) float64 {
		return math.Cos(max(math.Abs(x-20.5), math.Abs(y-20.5)) * math.Pi / 5)
	})
	bands := bandsOf(t, l, v, -inf, 0, inf)
	for _, b := range bands {
		for _, polygon := range b.Area {
			if len(polygon) > 2 || len(polygon) == 2 && !(signed(polygon[0]) > -signed(polygon[1])) {
				t.Errorf("%d rings", len(polygon))
			}
		}
	}
	if len(bands) != 2 || len(bands[0].Area) != 2 || len(bands[1].Area) != 3 {
		t.Errorf("%d, %d polygons", len(bands[0].Area), len(bands[1].Area))
	}
}

// Values at the ends of what a number can be neither overflow nor hang.
func TestExtremes(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	sorts := []float64{-math.MaxFloat64, -1e308, -1, -5e-324, 0, 5e-324, 1e-320, 1, 1e308, math.MaxFloat64}
	for range 300 {
		l, v := surfaceOf(6, 5, 1, func(x, y float64) float64 { return sorts[random.IntN(len(sorts))] })
		area := 0.0
		for _, b := range bandsOf(t, l, v, -inf, -1e308, -0.5, 0, 5e-324, 1e-319, 1, 1.5e308, inf) {
			area += areaOf(b.Area)
		}
		if math.Abs(area-30) > 1e-9 {
			t.Fatalf("%v: area %v", v, area)
		}
	}
}

func TestRefusals(t *testing.T) {
	l, v := rows([]float64{0, 1}, []float64{1, 2})
	fine := l
	fine.X0 = 1e16
	for _, c := range []struct {
		name   string
		l      grids.Lattice
		levels []float64
		says   string
	}{
		{"NaN", l, []float64{0, nan}, "level 2: NaN is not a finite number"},
		{"infinite", l, []float64{0, inf}, "level 2: +Inf is not a finite number"},
		{"twice", l, []float64{1, 1}, "level 2: 1 does not ascend from 1 before it"},
		{"too many", l, make([]float64, 1001), "there are 1001, more than the 1000"},
		{"too fine", fine, []float64{1}, "cannot be told apart"},
	} {
		if lines, err := Lines(c.l, v, c.levels); err == nil || !strings.Contains(err.Error(), c.says) || lines != nil {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	for _, c := range []struct {
		edges []float64
		says  string
	}{
		{nil, "two or more"},
		{[]float64{1}, "two or more"},
		{[]float64{0, inf, inf}, "edge 2: +Inf is not a finite number"},
		{[]float64{inf, 0}, "edge 1: +Inf is not a finite number"},
		{[]float64{0, -inf}, "edge 2: -Inf is not a finite number"},
	} {
		if bands, err := Bands(l, v, c.edges); err == nil || !strings.Contains(err.Error(), c.says) || bands != nil {
			t.Errorf("%v: %v", c.edges, err)
		}
	}
	if lines, err := Lines(grids.Lattice{}, nil, []float64{1}); lines != nil || err != nil {
		t.Errorf("no cells: %v, %v", lines, err)
	}
	for _, broken := range []func(){func() { _, _ = Lines(l, v[1:], nil) }, func() {
		l := l
		l.Mask = []bool{true}
		_, _ = Bands(l, v, []float64{0, 1})
	}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Error("no panic for a wrong length")
				}
			}()
			broken()
		}()
	}
}

// More vertices than may be are refused while they are counted.
func TestTooManyVertices(t *testing.T) {
	if testing.Short() {
		t.Skip("takes a second")
	}
	l, v := surfaceOf(160, 160, 1, func(x, y float64) float64 { return float64((int(x) + int(y)) % 2) })
	levels := make([]float64, 1000)
	for i := range levels {
		levels[i] = float64(i+1) / 1001
	}
	s, err := newSurface(l, v, levels)
	if err != nil {
		t.Fatal(err)
	}
	var many *TooManyVerticesError
	if err := s.scan(func(int, segment) {}, nil); !errors.As(err, &many) || many.Levels != 1000 || many.Hint() == "" {
		t.Errorf("%v", err)
	}
}

func TestSameBytes(t *testing.T) {
	l, v := noise(60)
	a, b := bandsOf(t, l, v, -inf, 0.3, 0.6, inf), bandsOf(t, l, v, -inf, 0.3, 0.6, inf)
	if !reflect.DeepEqual(a, b) || !reflect.DeepEqual(linesOf(t, l, v, 0.3, 0.6), linesOf(t, l, v, 0.3, 0.6)) {
		t.Error("two runs differ")
	}
}

func noise(n int) (grids.Lattice, []float64) {
	random := rand.New(rand.NewPCG(1, 2))
	return surfaceOf(n, n, 1, func(x, y float64) float64 { return random.Float64() })
}

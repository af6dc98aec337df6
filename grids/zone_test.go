package grids

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
	"pgregory.net/rapid"

	"drumlin/grids/crs"
)

// Source: testdata/zone_totals/SOURCE.md. The lattice there is not quite square, so it and the zones are counted in
// cells: which centre lies in which polygon stays the same.
func TestZonesOfWholeCells(t *testing.T) {
	const x0, y0, wide, high = 0.020656999999999998, 0.024053000000000001, 0.0385116, 0.038737239999999999
	shape := map[string]orb.Polygon{}
	for _, row := range readCSV(t, "testdata/zone_totals/zones.csv") {
		ring := int(number(t, row[1]))
		if len(shape[row[0]]) < ring {
			shape[row[0]] = append(shape[row[0]], nil)
		}
		v := orb.Point{(number(t, row[2]) - x0) / wide, (number(t, row[3]) - y0) / high}
		shape[row[0]][ring-1] = append(shape[row[0]][ring-1], v)
	}
	want := map[string][]int{}
	for k, row := range readCSV(t, "testdata/zone_totals/cells.csv") {
		if int(number(t, row[0])) != k%25 || int(number(t, row[1])) != k/25 {
			t.Fatalf("row %d is cell %s, %s", k, row[0], row[1])
		}
		for z, name := range []string{"ell", "block", "ring"} {
			if row[4+z] == "1" {
				want[name] = append(want[name], k)
			}
		}
	}
	l := Lattice{CRS: crs.Local{}, Cell: 1, NX: 25, NY: 25}
	for name, area := range map[string]float64{"ell": 0.205872966693792, "block": 0.19393830195792, "ring": 0.110395648806816} {
		z := Zone{Name: name, Shape: orb.MultiPolygon{shape[name]}}
		got := CellsIn(l, z)
		if !slices.Equal(got, want[name]) || len(got) == 0 {
			t.Errorf("%s: %d cells, want %d", name, len(got), len(want[name]))
		}
		if !near(AreaOf(z, crs.Local{}), float64(len(got)), 1e-6) || !near(AreaOf(z, crs.Local{})*wide*high, area, 1e-6) ||
			!near(l.AreaOf(got)*wide*high, area, 1e-12) {
			t.Errorf("%s: area %v, %d cells", name, AreaOf(z, crs.Local{}), len(got))
		}
	}
}

// Density times area: 250 stems a hectare over 1200 ha is 300 000 (arithmetic).
func TestStemsOnWholeCells(t *testing.T) {
	within := orb.MultiPolygon{box(500, 700, 4500, 3700)}
	for _, cell := range []float64{10, 40, 100, 250} {
		l, err := NewLattice(crs.Local{}, Spec{Within: within, Cell: cell})
		if err != nil {
			t.Fatal(err)
		}
		z := Zone{Name: "all", Shape: within}
		cells := CellsIn(l, z)
		total := 0.0
		for _, k := range cells {
			total += 250 * l.CellAreaAt(k) / 10000
		}
		if !near(total, 300000, 1e-12) || l.AreaOf(cells) != 12e6 || l.Area() != 12e6 || AreaOf(z, l.CRS) != 12e6 {
			t.Errorf("cells of %v m: %v stems, area %v", cell, total, l.AreaOf(cells))
		}
	}
}

// The scanline against one place at a time, on polygons of any kind: crossing themselves, with holes, several.
func TestCellsInAgainstOneByOne(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, X0: -3, Y0: 2, Cell: 0.7, NX: 31, NY: 23}
	rapid.Check(t, func(t *rapid.T) {
		var z Zone
		for range rapid.IntRange(1, 3).Draw(t, "polygons") {
			var polygon orb.Polygon
			for range rapid.IntRange(1, 3).Draw(t, "rings") {
				var ring orb.Ring
				for range rapid.IntRange(0, 7).Draw(t, "vertices") {
					ring = append(ring, orb.Point{rapid.Float64Range(-8, 25).Draw(t, "x"), rapid.Float64Range(-2, 22).Draw(t, "y")})
				}
				polygon = append(polygon, ring) // closed or not is the same
			}
			z.Shape = append(z.Shape, polygon)
		}
		var want []int
		for k := range l.Cells() {
			if x, y := l.Centre(k); inside(x, y, z.Shape) {
				want = append(want, k)
			}
		}
		if got := CellsIn(l, z); !slices.Equal(got, want) {
			t.Fatalf("%v: %v, want %v", z.Shape, got, want)
		}
	})
}

// Zones that share edges share cells out among them, none twice and none lost, also where an edge runs through centres.
func TestNeighboursShareNoCell(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, Cell: 1, NX: 20, NY: 20}
	rapid.Check(t, func(t *rapid.T) {
		corner := orb.Polygon{{{-5, -5}, {25, -5}, {25, 25}, {-5, 25}}}[0]
		// halves, so that many fall on centres
		hub := orb.Point{float64(rapid.IntRange(0, 40).Draw(t, "x")) / 2, float64(rapid.IntRange(0, 40).Draw(t, "y")) / 2}
		count := make([]int, l.Cells())
		for v := range corner {
			triangle := orb.Ring{hub, corner[v], corner[(v+1)%4], hub}
			for _, k := range CellsIn(l, Zone{Shape: orb.MultiPolygon{{triangle}}}) {
				count[k]++
			}
		}
		for k, n := range count {
			if n != 1 {
				t.Fatalf("hub %v: cell %d is in %d triangles", hub, k, n)
			}
		}
	})
}

func TestCellsInRespectsTheMask(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, Cell: 1, NX: 3, NY: 1, Mask: []bool{true, false, true}}
	overlap := orb.MultiPolygon{box(0, 0, 3, 1), box(1, 0, 3, 1)}
	if got := CellsIn(l, Zone{Shape: overlap}); !slices.Equal(got, []int{0, 2}) {
		t.Errorf("got %v", got)
	}
}

func TestZonesOfBadVertices(t *testing.T) {
	l := Lattice{CRS: crs.Local{}, Cell: 1, NX: 3, NY: 3}
	for _, bad := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), 1e308} {
		p := box(0, 0, 3, 3)
		p[0][2][0] = bad
		z := Zone{Name: "z", Shape: orb.MultiPolygon{p, box(0, 0, 1, 1)}}
		if got := CellsIn(l, z); !slices.Equal(got, []int{0}) {
			t.Errorf("vertex at %v: cells %v", bad, got)
		}
		if z.Validate() == nil {
			t.Errorf("vertex at %v is taken", bad)
		}
	}
	for _, shape := range []orb.MultiPolygon{nil, {}, {nil}, {{nil}}, {{{{1, 1}}}}, {{{{1, 1}, {2, 2}, {1, 1}}}}} {
		z := Zone{Name: "z", Shape: shape}
		if got := CellsIn(l, z); len(got) != 0 || AreaOf(z, crs.Local{}) != 0 || z.Validate() == nil {
			t.Errorf("%v: cells %v, area %v", shape, got, AreaOf(z, crs.Local{}))
		}
	}
}

// In the plane the areas are those of orb, holes and all.
func TestAreaOfInThePlane(t *testing.T) {
	p := orb.Polygon{box(0, 0, 10, 10)[0], box(2, 2, 4, 5)[0], {{6, 6}, {6, 8}, {8, 8}, {6, 6}}}
	z := Zone{Shape: orb.MultiPolygon{p, box(20, 0, 21, 3)}}
	if got := AreaOf(z, crs.Local{}); got != 100-6-2+3 || !near(got, planar.Area(z.Shape), 1e-14) {
		t.Errorf("got %v", got)
	}
}

// bandArea is the area between two parallels and two meridians on WGS 84, in closed form (Snyder 1987, equation 3-12, from
// memory).
func bandArea(w, s, e, n float64) float64 {
	const a, f = 6378137, 1 / 298.257223563
	e2 := f * (2 - f)
	ecc := math.Sqrt(e2)
	q := func(lat float64) float64 {
		sin := math.Sin(lat * math.Pi / 180)
		return (1 - e2) * (sin/(1-e2*sin*sin) + math.Log((1+ecc*sin)/(1-ecc*sin))/(2*ecc))
	}
	return a * a / 2 * (q(n) - q(s)) * (e - w) * math.Pi / 180
}

// A zone of degrees keeps its ground area through projection, cutting of edges and the integral over the area scale: in
// UTM, far outside the zone too, and on the equal-area plane.
func TestAreaOfOnTheGround(t *testing.T) {
	for _, c := range []struct {
		code       string
		w, s, e, n float64
		limit      float64
	}{
		{"EPSG:32633", 14, 50, 16, 51, 1e-7},
		{"EPSG:32633", 17, 20, 18, 24, 1e-7},
		{"EPSG:32633", 22, 0, 25, 3, 1e-7},
		{"EPSG:32736", 30, -30, 36, -20, 1e-7},
		{"EPSG:32736", 30, -3, 31, 3, 1e-7},
		{"laea lon=8.5 lat=47.25", 7, 46, 10, 48, 1e-7},
		{"laea lon=179 lat=-17", 178, -19, 182, -16, 1e-7},
	} {
		sys := system(t, c.code)
		polygon := box(c.w, c.s, c.e, c.n)
		hole := box(c.w+0.4, c.s+0.4, c.w+0.6, c.s+0.6)[0]
		g, err := ProjectGeometry(orb.MultiPolygon{append(polygon, hole)}, sys)
		if err != nil {
			t.Fatal(err)
		}
		got := AreaOf(Zone{Shape: g.(orb.MultiPolygon)}, sys)
		want := bandArea(c.w, c.s, c.e, c.n) - bandArea(c.w+0.4, c.s+0.4, c.w+0.6, c.s+0.6)
		t.Logf("%s: off by %.2g", c.code, got/want-1)
		if !near(got, want, c.limit) {
			t.Errorf("%s: %.6g, want %.6g", c.code, got, want)
		}
	}
}

// Cells and polygon agree on how much ground a zone has: share covered is 1 up to the rim.
func TestShareCovered(t *testing.T) {
	sys := system(t, "EPSG:32633")
	z := Zone{Shape: orb.MultiPolygon{box(700000, 5.4e6, 760000, 5.44e6)}}
	l, err := NewLattice(sys, Spec{Within: z.Shape, Cell: 500})
	if err != nil {
		t.Fatal(err)
	}
	if share := l.AreaOf(CellsIn(l, z)) / AreaOf(z, sys); !near(share, 1, 1e-9) {
		t.Errorf("share covered %v", share)
	}
}

func BenchmarkCellsIn(b *testing.B) {
	l := Lattice{CRS: crs.Local{}, Cell: 1, NX: 1000, NY: 1000}
	for _, vertices := range []int{5, 1000} {
		zones := make([]Zone, 100)
		for z := range zones {
			var ring orb.Ring
			for v := range vertices {
				s, c := math.Sincos(2 * math.Pi * float64(v) / float64(vertices))
				r := 45 + 5*math.Sin(20*math.Pi*float64(v)/float64(vertices))
				ring = append(ring, orb.Point{float64(50+100*(z%10)) + r*c, float64(50+100*(z/10)) + r*s})
			}
			zones[z].Shape = orb.MultiPolygon{{ring}}
		}
		b.Run(fmt.Sprintf("cells=1000000/zones=100/vertices=%d", vertices), func(b *testing.B) {
			for range b.N {
				for _, z := range zones {
					CellsIn(l, z)
				}
			}
		})
	}
}

// A centre is the first from itself, and no longer the first from just beyond it, whatever the quotient rounds to.
func TestFirstFromIsExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := Lattice{X0: rapid.Float64Range(-1e7, 1e7).Draw(t, "x0"), Cell: rapid.Float64Range(1e-3, 1e3).Draw(t, "cell"), NX: 500}
		for i := range l.NX {
			c := l.centreX(i)
			at := firstFrom(l.centreX, c, l.X0, l.Cell, l.NX)
			beyond := firstFrom(l.centreX, math.Nextafter(c, math.Inf(1)), l.X0, l.Cell, l.NX)
			if at != i || beyond != i+1 {
				t.Fatalf("centre %d: %d and %d", i, at, beyond)
			}
		}
	})
}

// TestLengthOf: on the central meridian of a UTM zone the plane is 0.9996 of the ground (EPSG Guidance Note 7-2).
func TestLengthOf(t *testing.T) {
	utm, err := crs.Parse("EPSG:32633")
	if err != nil {
		t.Fatal(err)
	}
	line := orb.LineString{{500000, 5000000}, {500000, 5000300}, {500400, 5000300}}
	for _, c := range []struct {
		g    orb.Geometry
		sys  crs.System
		want float64
	}{
		{line, crs.Local{}, 700}, {line, utm, 700 / 0.9996}, {orb.MultiLineString{line, line}, crs.Local{}, 1400}, {orb.Point{1, 1}, crs.Local{}, 0}, {nil, crs.Local{}, 0},
	} {
		if got := LengthOf(c.g, c.sys); math.Abs(got-c.want) > 1e-5 {
			t.Errorf("length %.9g, want %.9g", got, c.want)
		}
	}
}

package grids

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/clip"
	"github.com/paulmach/orb/planar"
	"pgregory.net/rapid"

	"drumlin/grids/crs"
)

func quadrature(t testing.TB, g orb.Geometry, spacing float64) Quadrature {
	t.Helper()
	q, err := QuadratureOf(g, crs.Local{}, spacing)
	if err != nil {
		t.Fatal(err)
	}
	return q
}

// mean is what a quadrature gives for the mean of a function.
func (q Quadrature) mean(f func(x, y float64) float64) (total float64) {
	for i := range q.X {
		total += q.Share[i] * f(q.X[i], q.Y[i])
	}
	return total
}

// wellFormed checks what holds for every quadrature of an area: numbers, shares, and that places lie inside by orb's
// test, a ray for each ring, which is apart from the code here.
func wellFormed(t interface{ Errorf(string, ...any) }, name string, q Quadrature, shape orb.MultiPolygon) {
	if len(q.X) != len(q.Y) || len(q.X) != len(q.Share) || len(q.X) < 9 || len(q.X) > 400 {
		t.Errorf("%s: %d, %d and %d numbers", name, len(q.X), len(q.Y), len(q.Share))
		return
	}
	if total := sum(q.Share); math.Abs(total-1) > 1e-12 || slices.Min(q.Share) < 1e-9 {
		t.Errorf("%s: shares from %g sum to %.15g", name, slices.Min(q.Share), total)
	}
	for i := range q.X {
		if p := (orb.Point{q.X[i], q.Y[i]}); !planar.MultiPolygonContains(shape, p) {
			t.Errorf("%s: place %d, %v, with a share of %g, lies outside", name, i, p, q.Share[i])
		}
	}
}

func reversed(r orb.Ring) orb.Ring {
	r = r.Clone()
	r.Reverse()
	return r
}

// Shapes with their first moments, by hand: rectangles added and taken away, and triangles with the mean of their
// corners.
var momentShapes = []struct {
	name  string
	shape orb.MultiPolygon
	x, y  float64
	bays  bool
}{
	{"square", orb.MultiPolygon{box(0, 0, 3, 3)}, 1.5, 1.5, false},
	{"rectangle far out", orb.MultiPolygon{box(500000, 5e6, 500020, 5.00001e6)}, 500010, 5e6 + 5, false},
	{"triangle", orb.MultiPolygon{{{{0, 0}, {9, 0}, {3, 6}, {0, 0}}}}, 4, 2, false},
	{"triangle the other way", orb.MultiPolygon{{{{0, 0}, {3, 6}, {9, 0}, {0, 0}}}}, 4, 2, false},
	{"triangle not closed", orb.MultiPolygon{{{{0, 0}, {3, 6}, {9, 0}}}}, 4, 2, false},
	{"frame", orb.MultiPolygon{{box(0, 0, 4, 4)[0], box(1, 1, 2, 3)[0]}}, (16*2 - 2*1.5) / 14, 2, true},
	{"frame, hole the other way", orb.MultiPolygon{{box(0, 0, 4, 4)[0], reversed(box(1, 1, 2, 3)[0])}}, (16*2 - 2*1.5) / 14, 2, true},
	{"ell", orb.MultiPolygon{{{{0, 0}, {4, 0}, {4, 1}, {1, 1}, {1, 4}, {0, 4}, {0, 0}}}}, (4*2 + 3*0.5) / 7, (4*0.5 + 3*2.5) / 7, true},
	{"islands", orb.MultiPolygon{box(0, 0, 1, 1), box(5, 5, 7, 6), {{{9, 0}, {12, 0}, {9, 3}, {9, 0}}}},
		(0.5 + 2*6 + 4.5*10) / 7.5, (0.5 + 2*5.5 + 4.5*1) / 7.5, false},
}

// Linear functions are exact, to rounding of the coordinates.
func TestQuadratureMoments(t *testing.T) {
	for _, s := range momentShapes {
		b := s.shape.Bound()
		size := max(b.Max[0]-b.Min[0], b.Max[1]-b.Min[1])
		for _, spacing := range []float64{0, math.Inf(1), size / 5, size / 11.3, size / 1000, -1, math.NaN()} {
			q := quadrature(t, s.shape, spacing)
			name := fmt.Sprintf("%s by %g", s.name, spacing)
			wellFormed(t, name, q, s.shape)
			x, y := q.mean(func(x, _ float64) float64 { return x }), q.mean(func(_, y float64) float64 { return y })
			tolerance := 1e-12*size + 4e-15*max(b.Max[0], b.Max[1])
			if s.bays && spacing > 0 && spacing <= size/5 {
				tolerance = 0.01 * size // a cell that holds a corner of a bay may have its centroid in the bay
			}
			if math.Abs(x-s.x) > tolerance || math.Abs(y-s.y) > tolerance {
				t.Errorf("%s: centroid (%.15g, %.15g), want (%.15g, %.15g)", name, x, y, s.x, s.y)
			}
		}
		if p := s.shape[0]; len(s.shape) == 1 {
			one, all := quadrature(t, p, size/4), quadrature(t, s.shape, size/4)
			if !slices.Equal(one.X, all.X) || !slices.Equal(one.Share, all.Share) {
				t.Errorf("%s: a polygon is not the like of a multipolygon of it", s.name)
			}
		}
	}
}

// A square in thirds: the middles of its nine cells, by hand.
func TestQuadratureOfASquare(t *testing.T) {
	q := quadrature(t, box(10, 20, 13, 23), 0)
	want := map[orb.Point]bool{}
	for i := range 9 {
		want[orb.Point{10.5 + float64(i%3), 20.5 + float64(i/3)}] = true
	}
	for i := range q.X {
		p := orb.Point{math.Round(q.X[i]*1e9) / 1e9, math.Round(q.Y[i]*1e9) / 1e9}
		if !want[p] || math.Abs(q.Share[i]-1./9) > 1e-15 {
			t.Errorf("%v with %g", p, q.Share[i])
		}
		delete(want, p)
	}
	if len(want) > 0 {
		t.Errorf("without %v", want)
	}
}

// The numbers of places and the size of cells: no cell is longer than the spacing, unless that took more than 400.
func TestQuadratureSpacing(t *testing.T) {
	shape := box(0, 0, 100, 50)
	for _, test := range []struct {
		spacing float64
		want    int
	}{{1e9, 18}, {34, 18}, {25, 32}, {20, 15}, {12.5, 32}, {10, 50}, {9.9, 66}, {5, 200}} {
		q := quadrature(t, shape, test.spacing)
		if len(q.X) != test.want {
			t.Errorf("%g: %d places, want %d", test.spacing, len(q.X), test.want)
		}
	}
	for _, spacing := range []float64{3, 1, 1e-3, 1e-300} {
		if q := quadrature(t, shape, spacing); len(q.X) < 300 || len(q.X) > 400 {
			t.Errorf("%g: %d places, want nearly 400", spacing, len(q.X))
		}
	}
}

// gear is a star-shaped outline with teeth of random depth.
func gear(rng *rand.Rand, n int, x, y, radius, depth float64) orb.Ring {
	ring := make(orb.Ring, 0, n+1)
	for i := range n {
		angle := 2 * math.Pi * float64(i) / float64(n)
		r := radius * (1 - depth*rng.Float64())
		ring = append(ring, orb.Point{x + r*math.Cos(angle), y + r*math.Sin(angle)})
	}
	return append(ring, ring[0])
}

// Every cell against orb's clip of the polygon and its area and centroid: another algorithm altogether.
func TestQuadratureCells(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 0))
	for _, depth := range []float64{0, 0.3, 0.9} {
		polygon := orb.Polygon{gear(rng, 60, 0, 0, 10, depth), reversed(gear(rng, 20, 0.1, 0.2, 0.9, depth/2))}
		bound := polygon.Bound()
		for _, cell := range []float64{20, 7, 2.3, 1} {
			g := cut{side: sides(orb.MultiPolygon{polygon}, bound.Min), width: bound.Max[0] - bound.Min[0], height: bound.Max[1] - bound.Min[1]}
			g.ground = 1
			found, err := g.parts(cell)
			if err != nil {
				t.Fatal(err)
			}
			at := map[[2]int]portion{}
			for _, p := range found {
				at[[2]int{p.row, p.column}] = p
			}
			for j := range g.ny {
				for i := range g.nx {
					corner := orb.Point{bound.Min[0] + float64(i)*g.w, bound.Min[1] + float64(j)*g.h}
					piece := clip.Polygon(orb.Bound{Min: corner, Max: orb.Point{corner[0] + g.w, corner[1] + g.h}}, polygon.Clone())
					p := at[[2]int{j, i}]
					if piece == nil {
						if p.area != 0 {
							t.Errorf("cell %d, %d: %g, want nothing", i, j, p.area)
						}
						continue
					}
					centre, area := planar.CentroidArea(piece)
					if math.Abs(p.area*g.w*g.h-area) > 1e-12*g.w*g.h {
						t.Errorf("cell %d, %d of %g: area %g, want %g", i, j, cell, p.area*g.w*g.h, area)
					}
					if area < 1e-3*g.w*g.h {
						continue // the centroid is a quotient of small numbers
					}
					if x, y := corner[0]+p.mx/p.area*g.w, corner[1]+p.my/p.area*g.h; math.Hypot(x-centre[0], y-centre[1]) > 1e-10*g.w {
						t.Errorf("cell %d, %d of %g: centroid (%g, %g), want %v", i, j, cell, x, y, centre)
					}
				}
			}
		}
	}
}

// exp(x) over a triangle: the error falls as the square of the cell. By parts, the integral over the triangle
// (0,0), (1,0), (0,1) of exp(x) is e - 2.
func TestQuadratureConverges(t *testing.T) {
	triangle := orb.Polygon{{{0, 0}, {1, 0}, {0, 1}, {0, 0}}}
	want := 2 * (math.E - 2)
	failure := func(n int) float64 {
		return math.Abs(quadrature(t, triangle, 1/float64(n)).mean(func(x, _ float64) float64 { return math.Exp(x) }) - want)
	}
	for n := 4; n <= 12; n++ {
		coarse, fine := failure(n), failure(2*n)
		if ratio := coarse / fine; ratio < 3.6 || ratio > 4.4 || coarse > 0.1/float64(n*n) {
			t.Errorf("cells of 1/%d: error %g, %g with half of them, ratio %g", n, coarse, fine, ratio)
		}
	}
}

// Awkward shapes, each against the mean over the centres of a fine grid of the box that lie inside by the slow test.
func TestQuadratureAgainstAFineGrid(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 0))
	cee := orb.Polygon{{{0, 0}, {10, 0}, {10, 1}, {1, 1}, {1, 9}, {10, 9}, {10, 10}, {0, 10}, {0, 0}}}
	shapes := map[string]orb.MultiPolygon{
		"cee":      {cee},
		"thin cee": {{{{0, 0}, {9, 0}, {9, 0.2}, {0.2, 0.2}, {0.2, 8.8}, {9, 8.8}, {9, 9}, {0, 9}, {0, 0}}}},
		"gear":     {{gear(rng, 50, 0, 0, 5, 0.8)}},
		"annulus":  {{gear(rng, 90, 0, 0, 5, 0), gear(rng, 90, 0, 0, 4.6, 0)}},
		"islands":  {{gear(rng, 9, 0, 0, 1, 0.2)}, {gear(rng, 9, 8, 3, 2, 0.2)}, {gear(rng, 9, 3, 9, 0.5, 0.2)}, cee},
	}
	shapes["islands"][3] = box(9, 8, 10, 9)
	wave := func(x, y float64) float64 { return math.Exp(0.1*x - 0.07*y) }
	for name, shape := range shapes {
		b := shape.Bound()
		const n = 600
		total, count := 0.0, 0.0
		for k := range n * n {
			x := b.Min[0] + (float64(k%n)+0.5)/n*(b.Max[0]-b.Min[0])
			y := b.Min[1] + (float64(k/n)+0.5)/n*(b.Max[1]-b.Min[1])
			if inside(x, y, shape) {
				total, count = total+wave(x, y), count+1
			}
		}
		for _, spacing := range []float64{0, 1} {
			q := quadrature(t, shape, spacing)
			wellFormed(t, name, q, shape)
			// The grid is good to about 1e-3; cells of a third of the box, with places moved inside, to 2e-2.
			tolerance := 0.02
			if spacing > 0 {
				tolerance = 0.003
			}
			if got := q.mean(wave); math.Abs(got/(total/count)-1) > tolerance {
				t.Errorf("%s by %g: %g, want %g", name, spacing, got, total/count)
			}
		}
	}
}

// Shapes near to having no area, or with nearly all of their box empty.
func TestQuadratureSlivers(t *testing.T) {
	comb := orb.Ring{{0, 0}}
	for i := range 400 {
		x := float64(i)
		comb = append(comb, orb.Point{x, 100}, orb.Point{x + 0.001, 100}, orb.Point{x + 0.001, 0.001}, orb.Point{x + 1, 0.001})
	}
	comb = append(comb, orb.Point{400, 0})
	var specks orb.MultiPolygon
	for i := range 1000 {
		x, y := float64(i%37)*1000, float64(i*i%41)*900
		specks = append(specks, orb.Polygon{{{x, y}, {x + 0.1, y}, {x, y + 0.1}, {x, y}}})
	}
	far := orb.MultiPolygon{box(0, 0, 1, 1), box(1e6, 1e6, 1e6+1, 1e6+1)}
	for name, shape := range map[string]orb.MultiPolygon{
		"along x":                  {box(0, 0, 1e5, 1e-3)},
		"along y":                  {box(5e5, 5e6, 5e5+0.01, 5.01e6)},
		"slanted":                  {{{{0, 0}, {1000, 500}, {1000, 500.001}, {0, 0}}}},
		"needle":                   {{{{0, 0}, {1000, 1e-6}, {500, 1}, {0, 0}}}},
		"thin ring":                {{gear(rand.New(rand.NewPCG(1, 1)), 100, 0, 0, 1000, 0), gear(rand.New(rand.NewPCG(1, 1)), 100, 0, 0, 999.99, 0)}},
		"comb":                     {{comb}},
		"specks":                   specks,
		"far apart":                far,
		"with a spike":             {{{{0, 0}, {1, 0}, {1, 1}, {50, 1}, {1, 1}, {0, 1}, {0, 0}}}},
		"one speck and a mainland": {box(0, 0, 100, 100), box(300, 300, 300.1, 300.1)},
	} {
		for _, spacing := range []float64{0, 10, 1e-9} {
			wellFormed(t, fmt.Sprintf("%s by %g", name, spacing), quadrature(t, shape, spacing), shape)
		}
	}
	q := quadrature(t, far, 0)
	if got := q.mean(func(x, y float64) float64 { return x - 2*y }); math.Abs(got+500000.5) > 1e-3 {
		t.Errorf("far apart: %.9g, want -500000.5", got)
	}
}

// Random outlines with a bay and a hole: places inside, linear functions exact where no place had to be moved, and the
// same from any start in any direction.
func TestQuadratureProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 0))
		n := rapid.IntRange(3, 80).Draw(t, "vertices")
		x, y := rapid.Float64Range(-1e6, 1e6).Draw(t, "x"), rapid.Float64Range(0, 6e6).Draw(t, "y")
		depth := rapid.Float64Range(0, 0.95).Draw(t, "depth")
		size := 1000.0
		outer := gear(rng, n, x, y, size, depth)
		shape := orb.MultiPolygon{{outer}, {gear(rng, 5, x+3*size, y, size/3, 0.5)}}
		if depth < 0.8 && n > 20 {
			shape[0] = append(shape[0], gear(rng, 12, x, y, size*(1-depth)*0.9, 0.3))
		}
		spacing := rapid.SampledFrom([]float64{0, size, size / 3, size / 10, size / 100}).Draw(t, "spacing")
		q, err := QuadratureOf(shape, crs.Local{}, spacing)
		if err != nil {
			t.Fatal(err)
		}
		wellFormed(t, "gears", q, shape)

		turned := shape.Clone()
		for _, p := range turned {
			for r := range p {
				k := rng.IntN(len(p[r]) - 1)
				open := p[r][:len(p[r])-1]
				ring := append(append(orb.Ring{}, open[k:]...), open[:k]...)
				if p[r] = append(ring, ring[0]); rng.IntN(2) == 0 {
					p[r].Reverse()
				}
			}
		}
		again, err := QuadratureOf(turned, crs.Local{}, spacing)
		if err != nil || len(again.X) != len(q.X) {
			t.Fatalf("turned: %v, %d places, want %d", err, len(again.X), len(q.X))
		}
		for i := range q.X {
			moved := math.Hypot(again.X[i]-q.X[i], again.Y[i]-q.Y[i])
			// A part with a small share has a centroid with as much less of a say.
			if moved*q.Share[i] > 1e-9*size || math.Abs(again.Share[i]-q.Share[i]) > 1e-9 {
				t.Fatalf("turned: place %d moved by %g, share %g to %g", i, moved, q.Share[i], again.Share[i])
			}
		}
	})
}

// Without bays a centroid is never moved, so linear functions are exact.
func TestQuadratureOfConvexShapes(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(3, 40).Draw(t, "n")
		var x, y []float64
		for range n {
			x = append(x, rapid.Float64Range(0, 100).Draw(t, "x"))
			y = append(y, rapid.Float64Range(0, 100).Draw(t, "y"))
		}
		hull := orb.Polygon{ConvexHull(x, y)}
		centre, area := planar.CentroidArea(hull)
		if len(hull[0]) < 4 || area < 1 {
			t.Skip("next to no area")
		}
		q, err := QuadratureOf(hull, crs.Local{}, rapid.Float64Range(0, 50).Draw(t, "spacing"))
		if err != nil {
			t.Fatal(err)
		}
		wellFormed(t, "hull", q, orb.MultiPolygon{hull})
		gotX, gotY := q.mean(func(x, _ float64) float64 { return x }), q.mean(func(_, y float64) float64 { return y })
		// Up to what is dropped: at most 400 boundary cells with less than 2e-9 of the area each.
		if math.Hypot(gotX-centre[0], gotY-centre[1]) > 1e-5 {
			t.Fatalf("centroid (%g, %g), want %v", gotX, gotY, centre)
		}
	})
}

// On a plane with a scale, shares are those of the ground: of the western half of a box as AreaOf has it.
func TestQuadratureOnTheGlobe(t *testing.T) {
	utm := system(t, "EPSG:32633")
	whole, west := box(200000, 5e6, 900000, 5.7e6), box(200000, 5e6, 550000, 5.7e6)
	q, err := QuadratureOf(whole, utm, 50000)
	if err != nil {
		t.Fatal(err)
	}
	got := q.mean(func(x, _ float64) float64 {
		if x < 550000 {
			return 1
		}
		return 0
	})
	want := AreaOf(Zone{Shape: orb.MultiPolygon{west}}, utm) / AreaOf(Zone{Shape: orb.MultiPolygon{whole}}, utm)
	if math.Abs(got-want) > 1e-6 || math.Abs(got-0.5) < 1e-4 {
		t.Errorf("share of the west %.9g, want %.9g", got, want)
	}
	line := orb.LineString{{200000, 5e6}, {900000, 5e6}}
	if q, err = QuadratureOf(line, utm, 1000); err != nil {
		t.Fatal(err)
	}
	// 700 pieces are too many: 399 or 400.
	if len(q.X) != 399 || q.X[0] != 200000+700000./399/2 {
		t.Errorf("%d pieces, the first at %.9g", len(q.X), q.X[0])
	}
	// Far from the central meridian a metre in the plane is less on the ground: the scale there is
	// 0.9996 (1 + (x/k R)^2 / 2), with x from the meridian and R = 6.38e6 m (the leading term of the series for the scale).
	ground := func(x float64) float64 { x -= 500000; return 1 / (1 + x*x/(2*6.38e6*6.38e6)) }
	if got, want := q.Share[398]/q.Share[170], ground(q.X[398])/ground(q.X[170]); math.Abs(got-want) > 1e-5 {
		t.Errorf("a piece in the east is %.9g of one in the middle, want %.9g", got, want)
	}
}

func TestQuadratureOfLines(t *testing.T) {
	bent := orb.LineString{{0, 0}, {0, 0}, {6, 0}, {6, 3}}
	for _, spacing := range []float64{0, 100, 1} {
		q := quadrature(t, bent, spacing)
		if len(q.X) != 9 {
			t.Fatalf("by %g: %d pieces, want 9", spacing, len(q.X))
		}
		for i := range q.X {
			along := float64(i) + 0.5
			x, y := min(along, 6), max(0, along-6)
			if math.Hypot(q.X[i]-x, q.Y[i]-y) > 1e-14 || math.Abs(q.Share[i]-1./9) > 1e-15 {
				t.Errorf("piece %d at (%g, %g) with %g, want (%g, %g)", i, q.X[i], q.Y[i], q.Share[i], x, y)
			}
		}
	}
	if q := quadrature(t, bent, 0.7); len(q.X) != 13 {
		t.Errorf("%d pieces of at most 0.7, want 13", len(q.X))
	}
	// 10 of 11 in the long line, in pieces of at most 11/9: 9 and 1.
	lines := orb.MultiLineString{{{0, 0}, {10, 0}}, {{3, 3}}, {{50, 0}, {50, 1}}}
	q := quadrature(t, lines, 0)
	if len(q.X) != 10 || q.X[9] != 50 || math.Abs(q.Share[9]-1./11) > 1e-15 || math.Abs(q.Share[0]-10./99) > 1e-15 {
		t.Errorf("%v", q)
	}
	if q := quadrature(t, lines, 0.001); len(q.X) > 400 || len(q.X) < 395 {
		t.Errorf("%d pieces, want nearly 400", len(q.X))
	}
	var many orb.MultiLineString
	for i := range 1000 {
		many = append(many, orb.LineString{{float64(i), 0}, {float64(i), 1 + float64(i%3)}})
	}
	if q := quadrature(t, many, 0.01); len(q.X) != 1000 {
		t.Errorf("%d pieces of a thousand lines", len(q.X))
	}
}

func TestQuadratureOfPoints(t *testing.T) {
	q := quadrature(t, orb.Point{3, 4}, 1)
	if len(q.X) != 1 || q.X[0] != 3 || q.Y[0] != 4 || q.Share[0] != 1 {
		t.Errorf("%v", q)
	}
	q = quadrature(t, orb.MultiPoint{{1, 2}, {3, 4}, {1, 2}, {5, 6}}, 0)
	if !slices.Equal(q.X, []float64{1, 3, 1, 5}) || !slices.Equal(q.Share, []float64{0.25, 0.25, 0.25, 0.25}) {
		t.Errorf("%v", q)
	}
}

func TestQuadratureErrors(t *testing.T) {
	nan := math.NaN()
	plane := system(t, "EPSG:32633")
	square := box(0, 0, 1, 1)
	for name, test := range map[string]struct {
		shape orb.Geometry
		want  string
	}{
		"nil":              {nil, "there is no geometry"},
		"collection":       {orb.Collection{square}, "a GeometryCollection has no points to stand for it: only points, lines and polygons do"},
		"no points":        {orb.MultiPoint{}, "the geometry has no positions"},
		"nil line":         {orb.LineString(nil), "the geometry has no length"},
		"no length":        {orb.LineString{{1, 1}, {1, 1}}, "the geometry has no length"},
		"nil polygon":      {orb.Polygon(nil), "the geometry has no area"},
		"nil ring":         {orb.Polygon{nil}, "the geometry has no area"},
		"no polygons":      {orb.MultiPolygon{}, "the geometry has no area"},
		"there and back":   {orb.Polygon{{{0.1, 0.2}, {0.7, 0.9}, {0.3, 1.1}, {0.7, 0.9}, {0.1, 0.2}}}, "the geometry has no area"},
		"on a line":        {orb.Polygon{{{0, 0}, {0.1, 0.3}, {0.7, 2.1}, {0, 0}}}, "the geometry has no area"},
		"all hole":         {orb.Polygon{square[0], square[0]}, "the geometry has no area"},
		"point not finite": {orb.MultiPoint{{1, 1}, {nan, 1}}, "position 2 is not a finite place"},
		"line not finite":  {orb.MultiLineString{{{1, 1}, {2, 1}}, {{1, math.Inf(1)}}}, "line 2 has a vertex that is not a finite place"},
		"area not finite":  {orb.MultiPolygon{square, box(0, 0, nan, 1)}, "polygon 2 has a vertex that is not a finite place"},
		"point beyond":     {orb.Point{3e7, 1}, "the place (30000000, 1) lies beyond the plane of "},
		"line beyond":      {orb.LineString{{3e7, 1}, {3e7, 10}}, "the place (30000000, 1.5) lies beyond the plane of "},
		"area beyond":      {box(3e7, 0, 3e7+9, 9), "lies beyond the plane of "},
	} {
		q, err := QuadratureOf(test.shape, plane, 0)
		if err == nil || !strings.Contains(err.Error(), test.want) || q.X != nil {
			t.Errorf("%s: got %v and %v, want %q", name, q, err, test.want)
		}
	}
}

func BenchmarkQuadrature(b *testing.B) {
	for _, n := range []int{100, 100000} {
		for _, depth := range []float64{0.01, 0.9} {
			for _, spacing := range []float64{0, 1} {
				b.Run(fmt.Sprintf("vertices=%d/depth=%g/spacing=%g", n, depth, spacing), func(b *testing.B) {
					shape := orb.Polygon{gear(rand.New(rand.NewPCG(1, 0)), n, 0, 0, 1000, depth)}
					for b.Loop() {
						quadrature(b, shape, spacing)
					}
				})
			}
		}
	}
}

package isolines

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"github.com/paulmach/orb"
	"pgregory.net/rapid"

	"drumlin/grids"
)

// Every vertex lies where the surface has its level, to 1e-8 of what the cells around differ by and the digits of coordinates.
func TestVerticesHaveTheirLevel(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, levels := drawSurface(t)
		for _, line := range linesOf2(t, l, v, levels) {
			for _, path := range line.Paths {
				if len(path) < 2 {
					t.Fatalf("a path of %d", len(path))
				}
				for i, p := range path {
					value, spread, ok := interpolated(l, v, p)
					if !ok || !(math.Abs(value-line.Level) <= (1e-8+2*digits(max(math.Abs(l.X0), math.Abs(l.Y0)), l))*spread) {
						t.Fatalf("level %v, vertex %v: %v, %v", line.Level, p, value, ok)
					}
					if i > 0 && p == path[i-1] {
						t.Fatalf("level %v: no length at %v", line.Level, p)
					}
				}
			}
		}
	})
}

func linesOf2(t fataler, l grids.Lattice, v, levels []float64) []Line {
	t.Helper()
	lines, err := Lines(l, v, levels)
	if err != nil {
		t.Fatalf("%v", err)
	}
	return lines
}

func bandsOf2(t fataler, l grids.Lattice, v, levels []float64) []Band {
	t.Helper()
	bands, err := Bands(l, v, append(append([]float64{-inf}, levels...), inf))
	if err != nil {
		t.Fatalf("%v", err)
	}
	return bands
}

// Lines cross neither themselves nor others; those of one level meet in no more than vertices; an open one ends on the
// outer edge.
func TestLinesDoNotCross(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, levels := drawSurface(t)
		type piece struct {
			a, b  orb.Point
			level float64
		}
		var all []piece
		for _, line := range linesOf2(t, l, v, levels) {
			for _, path := range line.Paths {
				for i := 1; i < len(path); i++ {
					all = append(all, piece{path[i-1], path[i], line.Level})
				}
				if path[0] != path[len(path)-1] {
					for _, end := range []orb.Point{path[0], path[len(path)-1]} {
						if !onEdge(l, v, end) {
							t.Fatalf("level %v ends at %v", line.Level, end)
						}
					}
				}
			}
		}
		for i, p := range all {
			for _, q := range all[:i] {
				same := p.level != q.level && (p.a == q.a && p.b == q.b)
				if !same && cross(p.a, p.b, q.a, q.b) && !overlap(p.a, p.b, q.a, q.b) {
					t.Fatalf("%v crosses %v", p, q)
				}
				if p.level == q.level && (cross(p.a, p.b, q.a, q.b) || touches(p.a, p.b, q.a, q.b)) {
					t.Fatalf("%v meets %v", p, q)
				}
			}
		}
	})
}

// overlap reports whether segments run along each other the same way, as lines of levels too close to be told apart may.
func overlap(a, b, c, d orb.Point) bool {
	return orientation(a, b, c) == 0 && orientation(a, b, d) == 0 && (b[0]-a[0])*(d[0]-c[0])+(b[1]-a[1])*(d[1]-c[1]) > 0
}

// onEdge reports whether a place lies on a side of a cell that has a value beyond which there is none.
func onEdge(l grids.Lattice, v []float64, p orb.Point) bool {
	at := func(i, j int) bool { return i >= 0 && j >= 0 && i < l.NX && j < l.NY && live(l, v, j*l.NX+i) }
	for k := range v {
		if !live(l, v, k) {
			continue
		}
		i, j := k%l.NX, k/l.NX
		r := l.Outline(k)
		within := func(a, b, c float64) bool { return a <= b && b <= c }
		if p[0] == r[0][0] && within(r[0][1], p[1], r[2][1]) && !at(i-1, j) || p[0] == r[2][0] && within(r[0][1], p[1], r[2][1]) && !at(i+1, j) ||
			p[1] == r[0][1] && within(r[0][0], p[0], r[2][0]) && !at(i, j-1) || p[1] == r[2][1] && within(r[0][0], p[0], r[2][0]) && !at(i, j+1) {
			return true
		}
	}
	return false
}

// Bands cover the cells that have a value: areas add up, every place is in one band, and at a cell's centre that is its own.
func TestBandsTile(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, levels := drawSurface(t)
		bands := bandsOf2(t, l, v, levels)
		area, want := 0.0, 0.0
		for i, b := range bands {
			if a := areaOf(b.Area); !(a > -1e-12*l.Cell*l.Cell) {
				t.Fatalf("band from %v has area %v", b.Low, a)
			}
			area += areaOf(b.Area)
			if i > 0 && b.Low < bands[i-1].High {
				t.Fatalf("bands out of order")
			}
		}
		for k := range v {
			if live(l, v, k) {
				want += signed(l.Outline(k)) // with the digits that the coordinates have
			}
		}
		if math.Abs(area-want) > 1e-9*want {
			t.Fatalf("area %v, cells' %v", area, want)
		}
		clear := 1e-7*l.Cell + l.Cell*digits(max(math.Abs(l.X0), math.Abs(l.Y0)), l)
		for range 20 {
			p := orb.Point{l.X0 + rapid.Float64Range(0, float64(l.NX)).Draw(t, "x")*l.Cell, l.Y0 + rapid.Float64Range(0, float64(l.NY)).Draw(t, "y")*l.Cell}
			in, edge := 0, inf
			for _, b := range bands {
				if inside(p, b.Area) {
					in++
				}
				edge = min(edge, distanceTo(p, b.Area))
			}
			want := 0
			if k, ok := l.Locate(p[0], p[1]); ok && live(l, v, k) {
				want = 1
			}
			if in != want && edge > clear {
				t.Fatalf("%v is in %d bands, want %d", p, in, want)
			}
		}
		for k := range v {
			if !live(l, v, k) {
				continue
			}
			// A value on a level, as far as coordinates can say, need not have an area: a peak that reaches it and no more has none.
			x, y := l.Centre(k)
			if _, spread := node2(l, v, k%l.NX*2+1, k/l.NX*2+1); nearLevel(v[k], levels, 2*digits(max(math.Abs(l.X0), math.Abs(l.Y0)), l)*spread) {
				continue
			}
			for _, b := range bands {
				if want := b.Low <= v[k] && v[k] < b.High; inside(orb.Point{x, y}, b.Area) != want && distanceTo(orb.Point{x, y}, b.Area) > clear {
					t.Fatalf("cell %d of %v: in the band from %v to %v is %v", k, v[k], b.Low, b.High, !want)
				}
			}
		}
	})
}

func nearLevel(v float64, levels []float64, slack float64) bool {
	return slices.ContainsFunc(levels, func(level float64) bool { return math.Abs(v-level) <= slack })
}

// Rings are closed, wound by RFC 7946, meet themselves and others of their band in vertices alone, and visit no place twice; holes lie in
// the polygon that has them.
func TestRingsAreSimple(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, levels := drawSurface(t)
		for _, b := range bandsOf2(t, l, v, levels) {
			var all [][2]orb.Point
			for _, polygon := range b.Area {
				for h, ring := range polygon {
					if len(ring) < 4 || ring[0] != ring[len(ring)-1] {
						t.Fatalf("a ring of %d is not closed", len(ring))
					}
					if a := signed(ring); math.Abs(a) > 1e-9*l.Cell*l.Cell && a > 0 != (h == 0) {
						t.Fatalf("ring %d has area %v", h, a)
					}
					seen := map[orb.Point]bool{}
					for i := 1; i < len(ring); i++ {
						if seen[ring[i]] {
							t.Fatalf("twice at %v", ring[i])
						}
						seen[ring[i]] = true
						all = append(all, [2]orb.Point{ring[i-1], ring[i]})
					}
					if h > 0 {
						holeWithin(t, polygon, ring)
					}
				}
			}
			for i, p := range all {
				for _, q := range all[:i] {
					if cross(p[0], p[1], q[0], q[1]) || touches(p[0], p[1], q[0], q[1]) {
						t.Fatalf("band from %v: %v meets %v", b.Low, p, q)
					}
				}
			}
		}
	})
}

// holeWithin checks that the middle of each side of a hole that is not too small to tell lies within the outer ring.
func holeWithin(t fataler, polygon orb.Polygon, hole orb.Ring) {
	outer := orb.MultiPolygon{{polygon[0]}}
	for i := 1; i < len(hole); i++ {
		m := orb.Point{(hole[i][0] + hole[i-1][0]) / 2, (hole[i][1] + hole[i-1][1]) / 2}
		if !inside(m, outer) && distanceTo(m, outer) > 1e-9*(1+math.Abs(m[0])+math.Abs(m[1])) {
			t.Fatalf("a hole at %v is outside its polygon", m)
		}
	}
}

// Inside, what bounds a band is a line of one of its edges, and all of these bound bands: lengths agree.
func TestLinesBoundBands(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, levels := drawSurface(t)
		lines := map[[2]orb.Point]int{}
		for _, line := range linesOf2(t, l, v, levels) {
			for _, path := range line.Paths {
				for i := 1; i < len(path); i++ {
					lines[[2]orb.Point{path[i-1], path[i]}]++
				}
			}
		}
		sides := map[[2]orb.Point]int{}
		for _, b := range bandsOf2(t, l, v, levels) {
			for _, polygon := range b.Area {
				for _, ring := range polygon {
					for i := 1; i < len(ring); i++ {
						sides[[2]orb.Point{ring[i-1], ring[i]}]++
					}
				}
			}
		}
		for side, n := range sides {
			back := sides[[2]orb.Point{side[1], side[0]}]
			if back == 0 { // on the outer edge
				if !onEdge(l, v, side[0]) || !onEdge(l, v, side[1]) {
					t.Fatalf("%v bounds one band only", side)
				}
			} else if n != 1 || back != 1 {
				t.Fatalf("%v bounds %d and %d bands", side, n, back)
			} else if lines[side]+lines[[2]orb.Point{side[1], side[0]}] == 0 {
				t.Fatalf("%v is not a line", side)
			}
		}
		for piece, n := range lines {
			// Lines of different levels run together where they cannot be told apart; then no band is left between.
			if n > 0 && sides[piece] == 0 && lines[[2]orb.Point{piece[1], piece[0]}] == 0 {
				t.Fatalf("%v of a line bounds no band", piece)
			}
		}
	})
}

// canonical writes the segments of lines in order, so that where a path begins does not matter.
func canonical(lines []Line, change func(orb.Point) orb.Point, reversed bool) string {
	var all []string
	for _, line := range lines {
		for _, path := range line.Paths {
			for i := 1; i < len(path); i++ {
				a, b := change(path[i-1]), change(path[i])
				if reversed {
					a, b = b, a
				}
				all = append(all, fmt.Sprintf("%v: %v %v", math.Abs(line.Level), a, b))
			}
		}
	}
	slices.Sort(all)
	return strings.Join(all, "\n")
}

// The transposed surface has the transposed lines, the other way round since a transposition turns left into right.
func TestTransposition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, levels := drawSurface(t)
		m, w := l, make([]float64, len(v))
		m.X0, m.Y0, m.NX, m.NY = l.Y0, l.X0, l.NY, l.NX
		if l.Mask != nil {
			m.Mask = make([]bool, len(v))
		}
		for k := range v {
			i, j := k%l.NX, k/l.NX
			w[i*m.NX+j] = v[k]
			if l.Mask != nil {
				m.Mask[i*m.NX+j] = l.Mask[k]
			}
		}
		same, swap := func(p orb.Point) orb.Point { return p }, func(p orb.Point) orb.Point { return orb.Point{p[1], p[0]} }
		if a, b := canonical(linesOf2(t, l, v, levels), same, false), canonical(linesOf2(t, m, w, levels), swap, true); a != b {
			t.Fatalf("lines\n%s\ntransposed\n%s", a, b)
		}
	})
}

// The negative of a surface has the same lines reversed, if no value is on a level, where above and below differ.
func TestNegative(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, _ := drawSurface(t)
		levels := []float64{0.2511, 1.2533, 1.7077, 2.9091}
		w, negative := make([]float64, len(v)), []float64{-2.9091, -1.7077, -1.2533, -0.2511}
		for k := range v {
			w[k] = -v[k]
		}
		same := func(p orb.Point) orb.Point { return p }
		if a, b := canonical(linesOf2(t, l, v, levels), same, false), canonical(linesOf2(t, l, w, negative), same, true); a != b {
			t.Fatalf("lines\n%s\nof the negative\n%s", a, b)
		}
	})
}

// The higher side is on the left: each piece of a line is, in its direction, one of the sides of all from its level
// up (and rings are wound right, see above).
func TestHigherSideIsLeft(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, v, levels := drawSurface(t)
		for _, line := range linesOf2(t, l, v, levels) {
			above, err := Bands(l, v, []float64{line.Level, inf})
			if err != nil || len(above) != 1 {
				t.Fatalf("%d bands, %v", len(above), err)
			}
			sides := map[[2]orb.Point]bool{}
			for _, polygon := range above[0].Area {
				for _, ring := range polygon {
					for i := 1; i < len(ring); i++ {
						sides[[2]orb.Point{ring[i-1], ring[i]}] = true
					}
				}
			}
			for _, path := range line.Paths {
				for i := 1; i < len(path); i++ {
					if !sides[[2]orb.Point{path[i-1], path[i]}] {
						t.Fatalf("level %v: %v to %v has the lower side on its left", line.Level, path[i-1], path[i])
					}
				}
			}
		}
	})
}

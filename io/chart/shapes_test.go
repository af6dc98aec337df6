package chart

import (
	"bytes"
	"image"
	"image/color"
	"math"
	"slices"
	"strings"
	"testing"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
	"pgregory.net/rapid"

	"drumlin/grids"
)

// drawn is a picture of shapes with what is needed to look things up in it.
type drawn struct {
	page
	img image.Image
}

func picture(t *testing.T, m Map) drawn {
	t.Helper()
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	p := newPage(m)
	return drawn{p, paint(p)}
}

// at is the colour at a place of the plane.
func (d drawn) at(q orb.Point) color.RGBA {
	x, y := d.view.toPixel(q[0], q[1])
	return rgbaAt(d.img, d.frame.x0+x, d.frame.y0+y)
}

// legend are the colours of each class in the legend, two where it is hatched.
func (d drawn) legend() map[int][]color.RGBA {
	colours := map[int][]color.RGBA{}
	for _, s := range d.swatches {
		for x := s.x0 + 3; x < s.x1-3; x++ {
			if c := rgbaAt(d.img, x, (s.y0+s.y1)/2); !slices.Contains(colours[s.class], c) {
				colours[s.class] = append(colours[s.class], c)
			}
		}
	}
	return colours
}

func areas(value []float64, g ...orb.Geometry) Map {
	return Map{Title: "Areas", Legend: "value", Shapes: Shapes{Geometry: g, Value: value}}
}

func square(x, y, side float64) orb.Ring {
	return orb.Ring{{x, y}, {x + side, y}, {x + side, y + side}, {x, y + side}, {x, y}}
}

// Each area has the colours that the legend shows for its value, and one without a value those of "no value".
func TestAreasCarryTheLegendColour(t *testing.T) {
	for _, kind := range []Kind{Level, Uncertainty, Chance, Ratio} {
		s := valued(patchwork(6, 5, 4, 1000, 2), func(u, v float64) float64 { return math.Pow(math.Sin(math.Pi/2*(u*0.9+v*0.1)), 2) })
		if kind == Ratio {
			for k := range s.Value {
				s.Value[k] = math.Exp(4*s.Value[k] - 2)
			}
		}
		s.Value[7] = math.NaN()
		d := picture(t, Map{Title: "Areas", Legend: "value", Kind: kind, Shapes: s})
		legend, bounds, seen := d.legend(), d.classes.bounds(), map[int]bool{}
		for i, g := range s.Geometry {
			want := -1
			for k := range d.classes.tone {
				lo, hi := bounds[k], bounds[k+1]
				if (math.IsNaN(lo) || s.Value[i] >= lo) && (math.IsNaN(hi) || s.Value[i] < hi) && !math.IsNaN(s.Value[i]) {
					want = k
				}
			}
			seen[want] = true
			if got := d.at(g.Bound().Center()); !slices.Contains(legend[want], got) {
				t.Errorf("kind %d: area %d of %g is %v, not one of %v", kind, i, s.Value[i], got, legend[want])
			}
		}
		if len(seen) < 6 {
			t.Errorf("kind %d: %d classes seen", kind, len(seen))
		}
	}
}

// Each place counts once in the choice of classes, however large it is.
func TestClassesOfShapes(t *testing.T) {
	s := valued(patchwork(6, 5, 4, 1000, 2), skewed)
	s.Geometry[3] = orb.Polygon{square(0, 0, 1e6)}
	p := newPage(Map{Title: "Areas", Shapes: s})
	edge := Breaks(Level, s.Value)
	if want := edge[1 : len(edge)-1]; !slices.Equal(p.classes.edge, want) {
		t.Errorf("edges %v, want %v", p.classes.edge, want)
	}
}

// Through a hole one sees what lies under it: another place, whatever the order they come in, or the paper.
func TestHoles(t *testing.T) {
	outer, inner := square(0, 0, 100), square(30, 30, 30)
	clockwise := slices.Clone(inner)
	slices.Reverse(clockwise)
	with, below := orb.Polygon{outer, inner}, orb.Polygon{square(-50, -50, 250)}
	for _, hole := range []orb.Ring{inner, clockwise} {
		with[1] = hole
		d := picture(t, areas([]float64{1, 2}, with, orb.Point{300, 300}))
		if got := d.at(orb.Point{45, 45}); got != paper {
			t.Errorf("hole is %v", got)
		}
		if got, want := d.at(orb.Point{15, 45}), d.legend()[0][0]; got != want {
			t.Errorf("beside the hole: %v, want %v", got, want)
		}
	}
	// Island in a lake in an island, the large area named last.
	island := orb.Polygon{square(40, 40, 10)}
	m := areas([]float64{5, 15, 25}, island, with, below)
	m.Breaks = []float64{0, 10, 20, 30}
	d := picture(t, m)
	legend := d.legend()
	for _, c := range []struct {
		at    orb.Point
		class int
	}{{orb.Point{45, 45}, 0}, {orb.Point{35, 35}, 2}, {orb.Point{15, 45}, 1}, {orb.Point{150, 150}, 2}} {
		if got := d.at(c.at); got != legend[c.class][0] {
			t.Errorf("at %v: %v, want class %d, %v", c.at, got, c.class, legend[c.class])
		}
	}
}

// The parts of a place may lie on one another: that is no hole.
func TestPartsThatOverlap(t *testing.T) {
	d := picture(t, areas([]float64{1}, orb.MultiPolygon{{square(0, 0, 100)}, {square(40, 40, 100)}}))
	if got := d.at(orb.Point{70, 70}); got != d.legend()[0][0] {
		t.Errorf("where parts overlap: %v", got)
	}
}

func distance(a, b color.RGBA) float64 {
	return math.Abs(float64(a.R)-float64(b.R)) + math.Abs(float64(a.G)-float64(b.G)) + math.Abs(float64(a.B)-float64(b.B))
}

// Between two areas of one class there is a line that is seen and is thin, in each class; of small areas it leaves most.
func TestEdgesAreSeenAndThin(t *testing.T) {
	for _, kind := range []Kind{Level, Uncertainty, Ratio} {
		for class := range 6 {
			m := areas([]float64{5.5, 5.5, 5.5}, orb.Polygon{square(0, 0, 100)}, orb.Polygon{square(100, 0, 100)}, orb.Polygon{square(0, 100, 200)})
			m.Kind = kind
			for k := range 7 {
				m.Breaks = append(m.Breaks, math.Exp2(float64(k-class))*5)
			}
			d := picture(t, m)
			x0, _ := d.view.toPixel(70, 50)
			x1, y := d.view.toPixel(130, 50)
			own := d.legend()[d.classes.of(5.5)]
			changed, most := 0, 0.0
			for x := math.Floor(x0); x < x1; x++ {
				got := rgbaAt(d.img, d.frame.x0+x, d.frame.y0+y)
				if !slices.Contains(own, got) {
					changed++
					most = max(most, distance(got, own[0]))
				}
			}
			if changed < 1 || changed > 3 || most < 60 {
				t.Errorf("kind %d, class %d: %d pixels differ, by %g", kind, class, changed, most)
			}
		}
	}
	// Areas of some 24, 10, 5 and 2 pixels, and one far away.
	for across, least := range map[float64]float64{50: 0.75, 120: 0.8, 250: 0.9, 600: 0.99} {
		const n = 20
		all := valued(append(patchwork(n, n, 0, 100, 1), orb.Polygon{square(across*100, 0, 100)}), func(u, v float64) float64 { return 5 })
		d := picture(t, Map{Title: "Areas", Shapes: all})
		fill, _ := d.classes.colours()
		same, total := 0, 0
		for x := 100.0; x < 100*(n-1); x += 1 / d.view.scale {
			for y := 100.0; y < 100*(n-1); y += 1 / d.view.scale {
				total++
				if distance(d.at(orb.Point{x, y}), fill[0]) < 40 {
					same++
				}
			}
		}
		if share := float64(same) / float64(total); share < least {
			t.Errorf("%g areas across: %.2f of the map has their colour", across, share)
		}
	}
}

// A dark area is not made smaller by a light edge around it.
func TestDarkAreasKeepTheirSize(t *testing.T) {
	m := areas([]float64{1, 9}, orb.Polygon{square(0, 0, 100)}, orb.Polygon{square(200, 0, 100)})
	d := picture(t, m)
	x, _ := d.view.toPixel(200, 50)
	_, y := d.view.toPixel(200, 50)
	for dx := -1.0; dx <= 1; dx++ {
		if c := rgbaAt(d.img, d.frame.x0+x+dx, d.frame.y0+y); dx >= 0 && distance(c, paper) < 300 {
			t.Errorf("%g pixels from the edge: %v", dx, c)
		}
	}
}

// Areas that share their borders share out the pixels: each whose centre lies in one belongs to that one alone.
func TestSpansShareOutThePixels(t *testing.T) {
	const w, h = 97, 71
	all := patchwork(9, 7, 5, 11, 4)
	owner := make([]int, w*h)
	count := make([]int, w*h)
	var room []rowCrossing
	for i, g := range all {
		room = spans(g.(orb.Polygon), w, h, room, func(y, x0, x1 int) {
			for x := x0; x < x1; x++ {
				owner[y*w+x], count[y*w+x] = i, count[y*w+x]+1
			}
		})
	}
	for k := range count {
		centre := orb.Point{float64(k%w) + 0.5, float64(k/w) + 0.5}
		inside := -1
		for i, g := range all {
			if planar.PolygonContains(g.(orb.Polygon), centre) {
				inside = i
			}
		}
		switch {
		case inside < 0 && count[k] != 0:
			t.Fatalf("pixel %v is outside and drawn", centre)
		case inside >= 0 && (count[k] != 1 || owner[k] != inside):
			t.Fatalf("pixel %v of area %d is drawn %d times, last by area %d", centre, inside, count[k], owner[k])
		}
	}
}

// The coverage of a line is that of the distance to it, for every pixel.
func TestCoverageOfALine(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		const w, h = 40, 30
		var line orb.LineString
		for range rapid.IntRange(1, 5).Draw(t, "vertices") {
			line = append(line, orb.Point{rapid.Float64Range(-20, 60).Draw(t, "x"), rapid.Float64Range(-20, 50).Draw(t, "y")})
		}
		width := rapid.Float64Range(0.1, 12).Draw(t, "width")
		c := newCoverage(w, h)
		c.line(line, width)
		for k := range c.cover {
			centre := orb.Point{float64(k%w) + 0.5, float64(k/w) + 0.5}
			d := planar.Distance(line[0], centre)
			for i := 1; i < len(line); i++ {
				d = min(d, planar.DistanceFromSegment(line[i-1], line[i], centre))
			}
			want := 255 * min(width, 1) * ramped(max(width, 1)/2+0.5-d)
			// Vertices within half a pixel of one another are passed over.
			if slack := 2 + 255*0.5*shortest(line); math.Abs(float64(c.cover[k])-want) > slack {
				t.Fatalf("pixel %v: %d, want %.1f", centre, c.cover[k], want)
			}
		}
	})
}

// shortest is 1 when a line has an edge under half a pixel, 0 otherwise.
func shortest(line orb.LineString) float64 {
	for i := 1; i < len(line); i++ {
		if planar.Distance(line[i-1], line[i]) < 0.5 {
			return 1
		}
	}
	return 0
}

// A line has the colour of its class in a dark casing.
func TestLinesAreSeen(t *testing.T) {
	m := Map{Title: "Lines", Breaks: []float64{0, 10, 20, 30, 40, 50}}
	for k := range 5 {
		y := 20 * float64(k)
		m.Shapes.Geometry = append(m.Shapes.Geometry, orb.LineString{{0, y}, {100, y}})
		m.Shapes.Value = append(m.Shapes.Value, 10*float64(k)+5)
	}
	d := picture(t, m)
	legend := d.legend()
	for k := range 5 {
		at := orb.Point{37, 20 * float64(k)}
		if got := d.at(at); got != legend[k][0] {
			t.Errorf("line %d is %v, want %v", k, got, legend[k])
		}
		_, y := d.view.toPixel(at[0], at[1])
		x, _ := d.view.toPixel(at[0], at[1])
		darkest := paper
		for dy := -8.0; dy <= 8; dy++ {
			if c := rgbaAt(d.img, d.frame.x0+x, d.frame.y0+y+dy); distance(c, paper) > distance(darkest, paper) {
				darkest = c
			}
		}
		if distance(darkest, ink) > 60 && k < 4 {
			t.Errorf("line %d: its casing is %v", k, darkest)
		}
	}
}

// Points are drawn as dots are.
func TestPointsAreDots(t *testing.T) {
	at := scatter(grids.Lattice{X0: 100, Y0: -30, Cell: 7, NX: 50, NY: 40}, 60, 3)
	dots := Map{Title: "Points", Legend: "ppm", Dots: Dots{X: at.X, Y: at.Y}}
	points := Map{Title: "Points", Legend: "ppm"}
	for i := range at.X {
		dots.Dots.Value = append(dots.Dots.Value, at.X[i])
		points.Shapes.Geometry = append(points.Shapes.Geometry, orb.Point{at.X[i], at.Y[i]})
	}
	points.Shapes.Value = dots.Dots.Value
	var a, b bytes.Buffer
	if err := dots.WritePNG(&a); err != nil {
		t.Fatal(err)
	}
	if err := points.WritePNG(&b); err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(a.Bytes(), b.Bytes()) {
		t.Error("points and dots give different pictures")
	}
}

// An area too small or too thin to hold the centre of a pixel still leaves a mark, and a strip is not broken.
func TestSmallAreasLeaveAMark(t *testing.T) {
	far := orb.Polygon{square(5000, 5000, 100)}
	strip := orb.Polygon{{{0, 0}, {4000, 1000}, {4000, 1000.5}, {0, 0.5}, {0, 0}}}
	for name, small := range map[string]orb.Polygon{"speck": {square(2000, 2000, 0.01)}, "point": {{{2000, 2000}}}, "strip": strip, "line": {{{0, 0}, {4000, 1000}, {0, 0}}}} {
		for _, value := range []float64{1, 9} {
			d := picture(t, areas([]float64{value, 5}, small, far))
			fill, _ := d.classes.colours()
			mine := fill[d.classes.of(value)]
			b := small.Bound()
			x0, y0 := d.view.toPixel(b.Min[0], b.Max[1])
			x1, y1 := d.view.toPixel(b.Max[0], b.Min[1])
			for x := math.Floor(x0); x <= x1; x++ {
				found := false
				for y := math.Floor(y0) - 1; y <= y1+1; y++ {
					found = found || rgbaAt(d.img, d.frame.x0+x, d.frame.y0+y) == mine
				}
				if !found {
					t.Errorf("%s of %g: no mark in column %g from %g to %g", name, value, x, x0, x1)
					break
				}
			}
		}
	}
}

// A small place in a larger one is not hidden by the edge of its hole.
func TestTownInACounty(t *testing.T) {
	town := square(50, 50, 0.5) // some three pixels
	d := picture(t, areas([]float64{1, 9}, orb.Polygon{square(0, 0, 200), town}, orb.Polygon{town}))
	fill, _ := d.classes.colours()
	if got := d.at(orb.Point{50.25, 50.25}); got != fill[d.classes.of(9)] {
		t.Errorf("the town is %v", got)
	}
}

func TestNamesOfShapes(t *testing.T) {
	s, _ := parishes()
	p := newPage(Map{Title: "Parishes", Shapes: s})
	if len(p.names) < 20 {
		t.Errorf("%d names of %d have room", len(p.names), len(s.Name))
	}
	for _, n := range p.names {
		inside := false
		for i, g := range s.Geometry {
			shape, _ := partsOf(g)
			all := s.Name[i] == n.text
			for _, corner := range [][2]float64{{n.x0, n.y0}, {n.x1, n.y0}, {n.x0, n.y1}, {n.x1, n.y1}} {
				x, y := p.view.toPlane(corner[0], corner[1])
				all = all && planar.MultiPolygonContains(shape.area, orb.Point{x, y})
			}
			inside = inside || all
		}
		if !inside {
			t.Errorf("%q at %v is not in the place of that name", n.text, n.box)
		}
	}
	lines := transects()
	p = newPage(Map{Title: "Lines", Shapes: lines})
	if len(p.names) < 6 {
		t.Errorf("%d names of %d lines", len(p.names), len(lines.Name))
	}
	for _, n := range p.names {
		for _, g := range lines.Geometry {
			shape, _ := partsOf(g)
			for _, line := range shape.lines {
				for share := 0.0; share <= 1; share += 0.001 {
					q := along(line, share)
					if x, y := p.view.toPixel(q[0], q[1]); (box{x, y, x, y}).overlaps(n.box) {
						t.Fatalf("%q lies on a line", n.text)
					}
				}
			}
		}
	}
}

// Observations are not drawn over the places they belong to.
func TestNoMarksOverShapes(t *testing.T) {
	m := areas([]float64{1, 2}, orb.Polygon{square(0, 0, 100)}, orb.Polygon{square(100, 0, 100)})
	var a, b bytes.Buffer
	if err := m.WritePNG(&a); err != nil {
		t.Fatal(err)
	}
	m.Observations = Points{X: []float64{50}, Y: []float64{50}}
	if err := m.WritePNG(&b); err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(a.Bytes(), b.Bytes()) {
		t.Error("observations change a picture of shapes")
	}
}

func TestShapesThatCannotBeDrawn(t *testing.T) {
	good := func() Map {
		m := areas([]float64{1, 2}, orb.Polygon{square(0, 0, 100)}, orb.LineString{{0, 0}, {1, 1}})
		m.Shapes.Name = []string{"Mere", "Path"}
		return m
	}
	for _, c := range []struct {
		name string
		bend func(m *Map)
		want string
	}{
		{"none", func(m *Map) { m.Shapes.Geometry = []orb.Geometry{} }, "no shapes to draw"},
		{"no geometries", func(m *Map) { m.Shapes.Geometry = nil }, "neither cells nor dots nor shapes"},
		{"dots too", func(m *Map) { m.Dots = Dots{[]float64{1}, []float64{1}, []float64{1}} }, "both dots and shapes"},
		{"cells too", func(m *Map) { m.Value, m.Lattice = []float64{1}, grids.Lattice{Cell: 1, NX: 1, NY: 1} }, "both cells and shapes"},
		{"a value too few", func(m *Map) { m.Shapes.Value = m.Shapes.Value[1:] }, "2 shapes have 1 values"},
		{"a name too few", func(m *Map) { m.Shapes.Name = m.Shapes.Name[1:] }, "2 shapes have 1 names"},
		{"no geometry", func(m *Map) { m.Shapes.Geometry[1] = nil }, `shape 2 "Path": there is no geometry`},
		{"a collection", func(m *Map) { m.Shapes.Geometry[0] = orb.Collection{orb.Point{}} }, `shape 1 "Mere": a GeometryCollection cannot be drawn`},
		{"an empty one", func(m *Map) { m.Shapes.Geometry[0] = orb.MultiPolygon{{}, {{}}} }, `shape 1 "Mere": it has no vertex`},
		{"a vertex at infinity", func(m *Map) { m.Shapes.Geometry[1] = orb.LineString{{0, 0}, {0, math.Inf(1)}} }, `shape 2 "Path": vertex 2 is at (0, +Inf)`},
		{"a point without a name", func(m *Map) { m.Shapes.Name, m.Shapes.Geometry[1] = nil, orb.Point{math.NaN(), 0} }, "shape 2: vertex 1 is at (NaN, 0)"},
	} {
		m := good()
		c.bend(&m)
		var b bytes.Buffer
		if err := m.WritePNG(&b); err == nil || !strings.Contains(err.Error(), c.want) || b.Len() != 0 {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
	if err := good().Validate(); err != nil {
		t.Error(err)
	}
}

// Shapes that are odd but valid are drawn: all without a value, rings that are not closed, of one vertex or none, far away
// from the origin, very large and very small.
func TestOddShapes(t *testing.T) {
	for name, m := range map[string]Map{
		"no value":     areas([]float64{math.NaN(), math.Inf(1)}, orb.Polygon{square(0, 0, 1)}, orb.Point{3, 3}),
		"open":         areas([]float64{1}, orb.Polygon{{{0, 0}, {1, 0}, {0, 1}}}),
		"empty parts":  areas([]float64{1}, orb.MultiPolygon{{}, {{}, {}}, {square(0, 0, 1), {}}}),
		"empty line":   areas([]float64{1, 2}, orb.MultiLineString{{}, {{0, 0}}}, orb.LineString{{1, 1}, {1, 1}}),
		"far away":     areas([]float64{1, 2}, orb.Polygon{square(1e12, 1e12, 1)}, orb.Polygon{square(1e12, 1e12+1, 1)}),
		"huge":         areas([]float64{1, 2}, orb.Polygon{square(-1e299, -1e299, 1e299)}, orb.LineString{{1e299, 1e299}, {-1e299, 0}}),
		"tiny":         areas([]float64{1, 2}, orb.Polygon{square(0, 0, 1e-290)}, orb.Point{1e-290, 0}),
		"self-crossed": areas([]float64{1}, orb.Polygon{{{0, 0}, {1, 1}, {1, 0}, {0, 1}, {0, 0}}}),
	} {
		m.Shapes.Name = slices.Repeat([]string{"Mere"}, len(m.Shapes.Geometry))
		checkPage(&named{t, name}, newPage(m))
		if err := m.WritePNG(new(bytes.Buffer)); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
}

package chart

import (
	"bytes"
	"errors"
	"image"
	"image/color"
	"image/png"
	"math"
	"strings"
	"testing"

	"github.com/paulmach/orb"
	"pgregory.net/rapid"

	"drumlin/grids"
	"drumlin/grids/crs"
)

// mapOf draws an arbitrary map: any shape of area, size of values, kind, amount of text.
func mapOf(t *rapid.T, systems []crs.System) Map {
	word := rapid.SampledFrom([]string{"density", "of", "marsh", "kg⁻¹", "per", "1000", "people,", "Wasserschutzgebietsverordnung", "µg/m³", "standard", "error", "WWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWW"})
	text := func(name string, most int) string {
		return strings.Join(rapid.SliceOfN(word, 0, most).Draw(t, name), " ")
	}
	long := rapid.IntRange(1, 300).Draw(t, "long")
	short := max(1, long/rapid.IntRange(1, 24).Draw(t, "slimness"))
	l := grids.Lattice{CRS: rapid.SampledFrom(systems).Draw(t, "system"), NX: long, NY: short,
		Cell: math.Pow(10, rapid.Float64Range(-3, 3).Draw(t, "cell")) / float64(long) * 100}
	if rapid.Bool().Draw(t, "tall") {
		l.NX, l.NY = l.NY, l.NX
	}
	l.X0 = rapid.SampledFrom([]float64{0, -50, 431234.5}).Draw(t, "x0")
	l.Y0 = rapid.SampledFrom([]float64{0, -50, 5432101.25}).Draw(t, "y0")
	scale := math.Pow(10, rapid.Float64Range(-12, 12).Draw(t, "decade"))
	shape := rapid.SampledFrom([]func(u, v float64) float64{hills, skewed, func(u, v float64) float64 { return 1 }, func(u, v float64) float64 { return math.NaN() },
		func(u, v float64) float64 { return hills(u, v) - 12 }}).Draw(t, "shape")
	m := Map{
		Title: "Map " + text("title", 60), Subtitle: text("subtitle", 20), Legend: text("legend", 40), Kind: Kind(rapid.IntRange(0, 3).Draw(t, "kind")),
		Lattice: l, Value: field(l, func(u, v float64) float64 { return scale * shape(u, v) }),
		Stamp: text("stamp", 12),
	}
	if rapid.Bool().Draw(t, "shared") {
		m.Breaks, m.Shared = SharedBreaks(m.Kind, []Sample{NewSample(field(l, func(u, v float64) float64 { return scale * skewed(u, v) }), 50)}), true
	}
	for range rapid.IntRange(0, 5).Draw(t, "foot") {
		m.Foot = append(m.Foot, text("caution", 40))
	}
	if rapid.Bool().Draw(t, "outline") {
		m.Outline = blob(&m.Lattice)
	}
	m.Observations = scatter(grids.Lattice{X0: l.X0, Y0: l.Y0, Cell: l.Cell, NX: l.NX, NY: l.NY}, rapid.SampledFrom([]int{0, 1, 100, 1000}).Draw(t, "observations"), 5)
	if rapid.Bool().Draw(t, "zones") {
		m.Zones = bands(l, "North of the dyke", "", "South", text("zone", 5))
	}
	if rapid.Bool().Draw(t, "shapes") {
		m.Value, m.Shapes = nil, shapesOf(t, l, func(u, v float64) float64 { return scale * shape(u, v) })
	}
	return m
}

// shapesOf draws areas, lines and points that fill a lattice, some of them with names.
func shapesOf(t *rapid.T, l grids.Lattice, f func(u, v float64) float64) Shapes {
	nx, ny := rapid.IntRange(1, 5).Draw(t, "shapes across"), rapid.IntRange(1, 5).Draw(t, "shapes up")
	var s Shapes
	for k := range nx * ny {
		u, v := float64(k%nx)/float64(nx), float64(k/nx)/float64(ny)
		at := func(du, dv float64) orb.Point {
			return orb.Point{l.X0 + (u+du/float64(nx))*l.Cell*float64(l.NX), l.Y0 + (v+dv/float64(ny))*l.Cell*float64(l.NY)}
		}
		s.Geometry = append(s.Geometry, rapid.SampledFrom([]orb.Geometry{
			orb.Polygon{{at(0, 0), at(1, 0), at(1, 1), at(0, 1), at(0, 0)}, {at(0.2, 0.2), at(0.4, 0.2), at(0.2, 0.4), at(0.2, 0.2)}},
			orb.LineString{at(0, 0), at(0.5, 0.7), at(1, 1)}, orb.MultiPoint{at(0.1, 0.9), at(0.5, 0.5)}, orb.LineString{at(0.5, 0.5)}, orb.Polygon{{at(0, 1)}},
		}).Draw(t, "geometry"))
		s.Value = append(s.Value, f(u, v))
		s.Name = append(s.Name, rapid.SampledFrom([]string{"", "Mere", "Upper Tavish on the Marsh"}).Draw(t, "name"))
	}
	return s
}

func systems(t testing.TB) []crs.System {
	return []crs.System{nil, plane(t, "local"), plane(t, "EPSG:32633"), plane(t, "laea lon=-38.5 lat=47.25"), plane(t, "laea lon=179.99 lat=-85")}
}

// checkPage holds what a page promises: everything inside it, nothing on top of anything else, nothing left out of the text.
func checkPage(t interface{ Errorf(string, ...any) }, p page) {
	paper := box{0, 0, p.w, p.h}
	all, name := p.boxes()
	frame := box{p.frame.x0 - tickLength, p.frame.y0 - tickLength, p.frame.x1 + tickLength, p.frame.y1 + tickLength}
	all, name = append(all, frame), append(name, "frame")
	const slack = 1e-6 // sums of widths
	for i, b := range all {
		b = box{b.x0 + slack, b.y0 + slack, b.x1 - slack, b.y1 - slack}
		if !b.within(paper) {
			t.Errorf("%s %v is not on the page of %g x %g", name[i], b, p.w, p.h)
		}
		for j := range i {
			if b.overlaps(all[j]) {
				t.Errorf("%s %v overlaps %s %v", name[i], b, name[j], all[j])
			}
		}
	}
	inner := box{0, 0, float64(p.view.w), float64(p.view.h)}
	for i, n := range p.names {
		if !n.within(inner) {
			t.Errorf("name %q %v leaves the frame", n.text, n.box)
		}
		for _, o := range p.names[:i] {
			if n.overlaps(o.box) {
				t.Errorf("names %q and %q overlap", n.text, o.text)
			}
		}
	}
	written := ""
	for _, l := range p.labels {
		written += l.text
	}
	for _, s := range append([]string{p.m.Title, p.m.Subtitle, p.m.Legend}, p.m.Foot...) {
		// Labels keep the order of the text, so without blanks each text appears whole.
		if s = strings.Join(strings.Fields(s), ""); !strings.Contains(strings.ReplaceAll(written, " ", ""), s) {
			t.Errorf("%q is not written whole", s)
		}
	}
	if e, b := extent(p.m), p.view.bound(); !within(e, b, 1/p.view.scale) {
		t.Errorf("frame shows %v, the map needs %v", b, e)
	}
}

// within is true when a lies in b, up to a slack.
func within(a, b orb.Bound, slack float64) bool {
	return a.Min[0] >= b.Min[0]-slack && a.Min[1] >= b.Min[1]-slack && a.Max[0] <= b.Max[0]+slack && a.Max[1] <= b.Max[1]+slack
}

func TestNothingOverlapsNothingIsCut(t *testing.T) {
	all := systems(t)
	rapid.Check(t, func(t *rapid.T) { checkPage(t, newPage(mapOf(t, all))) })
}

func TestGalleryPages(t *testing.T) {
	for name, m := range gallery(t) {
		p := newPage(m)
		failures := &named{t, name}
		checkPage(failures, p)
		if long := max(p.w, p.h); long < 1580 || long > 1620 {
			t.Errorf("%s: %g x %g pixels", name, p.w, p.h)
		}
	}
}

type named struct {
	t    *testing.T
	name string
}

func (n *named) Errorf(format string, args ...any) {
	n.t.Helper()
	n.t.Errorf(n.name+": "+format, args...)
}

// Independent of the boxes' own arithmetic: on the painted page there is no ink outside the boxes.
func TestInkStaysInItsBoxes(t *testing.T) {
	t.Parallel()
	for name, m := range gallery(t) {
		p := newPage(m)
		img := paint(p)
		all, _ := p.boxes()
		all = append(all, box{p.frame.x0 - tickLength, p.frame.y0 - tickLength, p.frame.x1 + tickLength, p.frame.y1 + tickLength})
		// Blank the boxes, widened by the half width of a line; what is left must be paper.
		for _, b := range all {
			for y := int(b.y0) - 2; y <= int(b.y1)+2; y++ {
				for x := int(b.x0) - 2; x <= int(b.x1)+2; x++ {
					if image.Pt(x, y).In(img.Bounds()) {
						img.SetRGBA(x, y, paper)
					}
				}
			}
		}
		for i := 0; i < len(img.Pix); i += 4 {
			if img.Pix[i] != 255 || img.Pix[i+1] != 255 || img.Pix[i+2] != 255 {
				t.Errorf("%s: ink at (%d, %d)", name, i/4%img.Bounds().Dx(), i/4/img.Bounds().Dx())
				break
			}
		}
	}
}

func decoded(t *testing.T, m Map) image.Image {
	t.Helper()
	var b bytes.Buffer
	if err := m.WritePNG(&b); err != nil {
		t.Fatal(err)
	}
	img, err := png.Decode(&b)
	if err != nil {
		t.Fatal(err)
	}
	return img
}

func rgbaAt(img image.Image, x, y float64) color.RGBA {
	return color.RGBAModel.Convert(img.At(int(x), int(y))).(color.RGBA)
}

// A cell has the colour that the legend shows for its value, a masked or empty one that of the paper.
func TestCellsCarryTheLegendColour(t *testing.T) {
	for _, kind := range []Kind{Level, Uncertainty, Chance, Ratio} {
		l := grids.Lattice{Cell: 10, NX: 9, NY: 7}
		value := field(l, func(u, v float64) float64 { return math.Pow(math.Sin(math.Pi/2*(u*0.9+v*0.1)), 2) })
		if kind == Ratio {
			for k := range value {
				value[k] = math.Exp(4*value[k] - 2)
			}
		}
		l.Mask = make([]bool, l.Cells())
		for k := range l.Mask {
			l.Mask[k] = k%9 != 4
		}
		value[3] = math.NaN()
		m := Map{Title: "Cells", Legend: "value", Kind: kind, Lattice: l, Value: value}
		p := newPage(m)
		img := decoded(t, m)
		legend := map[color.RGBA]int{}
		for _, s := range p.swatches {
			for x := s.x0 + 3; x < s.x1-3; x++ {
				legend[rgbaAt(img, x, (s.y0+s.y1)/2)] = s.class
			}
		}
		classes := map[int]bool{}
		bounds := p.classes.bounds()
		for k := range value {
			px, py := p.view.toPixel(l.Centre(k))
			got := rgbaAt(img, p.frame.x0+px, p.frame.y0+py)
			if !l.Mask[k] || math.IsNaN(value[k]) {
				if got != paper {
					t.Errorf("kind %d: blank cell %d is %v", kind, k, got)
				}
				continue
			}
			class, known := legend[got]
			if !known || class < 0 {
				t.Fatalf("kind %d: cell %d is %v, not in the legend %v", kind, k, got, legend)
			}
			classes[class] = true
			if value[k] < bounds[class] || value[k] > bounds[class+1] {
				t.Errorf("kind %d: %g has the colour of %g to %g", kind, value[k], bounds[class], bounds[class+1])
			}
		}
		if len(classes) < 5 {
			t.Errorf("kind %d: %d classes seen", kind, len(classes))
		}
	}
}

// Cells are square on the page, and the scale bar is as long as it says.
func TestNeverStretched(t *testing.T) {
	for name, m := range gallery(t) {
		p := newPage(m)
		x0, y0 := p.view.toPixel(p.view.cx, p.view.cy)
		x1, y1 := p.view.toPixel(p.view.cx+100/p.view.scale, p.view.cy+100/p.view.scale)
		if math.Abs(x1-x0-100) > 1e-3 || math.Abs(y0-y1-100) > 1e-3 {
			t.Errorf("%s: 100 pixels' worth of metres are %g x %g", name, x1-x0, y0-y1)
		}
		bar := p.bars[1].x1 - p.bars[0].x0
		metres := bar / p.view.scale
		var said bool
		for _, l := range p.labels {
			said = said || l.text == length(round12(metres))
		}
		if !said {
			t.Errorf("%s: no label says %s", name, length(round12(metres)))
		}
		if digits := metres / math.Pow(10, math.Floor(math.Log10(metres)+1e-9)); math.Abs(digits-math.Round(digits)) > 1e-9 {
			t.Errorf("%s: scale bar of %g m", name, metres)
		}
	}
}

func TestSameMapSameBytes(t *testing.T) {
	t.Parallel()
	for name, m := range gallery(t) {
		var a, b bytes.Buffer
		if err := errors.Join(m.WritePNG(&a), m.WritePNG(&b)); err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(a.Bytes(), b.Bytes()) {
			t.Errorf("%s differs between two runs", name)
		}
	}
}

// The stamp lies over the map, and its letters stay within the frame.
func TestStamp(t *testing.T) {
	for name, m := range gallery(t) {
		if m.Stamp == "" {
			continue
		}
		p := newPage(m)
		plain := p
		plain.m.Stamp = ""
		with, without := paint(p), paint(plain)
		changed := 0
		bounds := image.Rectangle{}
		for y := range with.Bounds().Dy() {
			for x := range with.Bounds().Dx() {
				if with.RGBAAt(x, y) != without.RGBAAt(x, y) {
					changed++
					bounds = bounds.Union(image.Rect(x, y, x+1, y+1))
				}
			}
		}
		frame := image.Rect(int(p.frame.x0), int(p.frame.y0), int(p.frame.x1), int(p.frame.y1))
		if !bounds.In(frame.Inset(1)) {
			t.Errorf("%s: stamp covers %v of the frame %v", name, bounds, frame)
		}
		if share := float64(changed) / float64(frame.Dx()*frame.Dy()); share < 0.06 {
			t.Errorf("%s: stamp changes %.3f of the map", name, share)
		}
	}
}

// Along an edge of a plane around 47.25 N the ticks stand where the projection itself puts their degrees.
func TestDegreeTicksLieOnTheirDegrees(t *testing.T) {
	for _, code := range []string{"laea lon=-38.5 lat=47.25", "laea lon=179.9 lat=-16.6", "laea lon=8 lat=71"} {
		s := plane(t, code)
		v := fit(orb.Bound{Min: orb.Point{-40000, -60000}, Max: orb.Point{50000, 60000}}, 900, 1200)
		found := 0
		for _, k := range degreeTicks(v, s) {
			var px, py float64
			switch k.edge {
			case bottom:
				px, py = k.at, float64(v.h)
			case left:
				px, py = 0, k.at
			default:
				continue
			}
			lon, lat := s.Inverse(v.toPlane(px, py))
			value, east := lon, longitude
			if k.edge == left {
				value, east = lat, latitude
			}
			_, after, _ := strings.Cut(strings.TrimRight(k.text, "°NESW"), ".")
			// A tenth of a pixel in degrees.
			if r := math.Round(value*100) / 100; math.Abs(value-r) > 0.1/v.scale/111000/math.Cos(lat*math.Pi/180)+1e-9 || east(r, len(after)) != k.text {
				t.Errorf("%s: tick %s stands at %.6f", code, k.text, value)
			}
			found++
		}
		if found < 4 {
			t.Errorf("%s: %d ticks", code, found)
		}
	}
}

func TestValidate(t *testing.T) {
	good := func() Map {
		return Map{Title: "t", Lattice: grids.Lattice{Cell: 1, NX: 2, NY: 1}, Value: []float64{1, 2}}
	}
	for _, c := range []struct {
		name string
		bend func(*Map)
		want string
	}{
		{"nothing to draw", func(m *Map) { m.Value = nil }, "neither cells nor dots"},
		{"both", func(m *Map) { m.Dots = Dots{[]float64{1}, []float64{1}, []float64{1}} }, "both cells and dots"},
		{"wrong length", func(m *Map) { m.Value = m.Value[:1] }, "1 values for 2 x 1 cells"},
		{"overflowing lattice", func(m *Map) { m.Lattice.NX, m.Lattice.NY = 1<<62+1, 2 }, "2 values for"},
		{"mask", func(m *Map) { m.Lattice.Mask = []bool{true} }, "1 mask bits for 2 cells"},
		{"no cell side", func(m *Map) { m.Lattice.Cell = 0 }, "no extent"},
		{"NaN origin", func(m *Map) { m.Lattice.X0 = math.NaN() }, "no extent"},
		{"kind", func(m *Map) { m.Kind = 9 }, "unknown kind of map 9"},
		{"dots", func(m *Map) { m.Value, m.Dots = nil, Dots{[]float64{1}, []float64{1, 2}, []float64{1}} }, "1 x, 2 y and 1 values"},
		{"empty dots", func(m *Map) { m.Value, m.Dots = nil, Dots{[]float64{}, nil, nil} }, "no dots"},
		{"dot at NaN", func(m *Map) { m.Value, m.Dots = nil, Dots{[]float64{1}, []float64{math.NaN()}, []float64{1}} }, "dot 1 is at (1, NaN)"},
		{"observations", func(m *Map) { m.Observations = Points{[]float64{1}, nil} }, "1 x and 0 y"},
		{"observation at infinity", func(m *Map) { m.Observations = Points{[]float64{1}, []float64{math.Inf(1)}} }, "observation 1"},
		{"outline", func(m *Map) { m.Outline = orb.MultiPolygon{{{{0, 0}, {math.NaN(), 1}}}} }, "outline: vertex 2"},
		{"zone", func(m *Map) { m.Zones = []Zone{{"Mere", orb.MultiPolygon{{{{0, math.Inf(1)}}}}}} }, `zone 1 "Mere": vertex 1`},
		{"one break", func(m *Map) { m.Breaks = []float64{1} }, "1 breaks given"},
		{"breaks fall", func(m *Map) { m.Breaks = []float64{1, 3, 3} }, "number 3 is 3"},
		{"twelve breaks shared", func(m *Map) { m.Breaks, m.Shared = []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12}, true }, "12 breaks given, from 2 to 11 can be shared"},
		{"shared breaks fall", func(m *Map) { m.Breaks, m.Shared = []float64{math.Inf(-1), 3, 2}, true }, "number 3 is 2"},
		{"shared breaks end in infinity", func(m *Map) { m.Breaks, m.Shared = []float64{1, math.Inf(1)}, true }, "number 2 is +Inf"},
		{"minus infinity alone", func(m *Map) { m.Breaks = []float64{math.Inf(-1), 3} }, "number 1 is -Inf"},
		{"no words", func(m *Map) { m.Title = " " }, "title or a legend"},
		{"a book", func(m *Map) { m.Foot = []string{strings.Repeat("word ", 5000)} }, "letters of text"},
	} {
		m := good()
		c.bend(&m)
		var b bytes.Buffer
		err := m.WritePNG(&b)
		if err == nil || !strings.Contains(err.Error(), c.want) || b.Len() > 0 {
			t.Errorf("%s: error %v and %d bytes, want %q and none", c.name, err, b.Len(), c.want)
		}
	}
	if err := good().Validate(); err != nil {
		t.Error(err)
	}
}

// Things at the rim of what is allowed are drawn, not refused and not a panic.
func TestOddButValid(t *testing.T) {
	cells := func(nx, ny int) Map {
		l := grids.Lattice{Cell: 1, NX: nx, NY: ny}
		return Map{Title: "odd", Lattice: l, Value: field(l, hills)}
	}
	for name, m := range map[string]Map{
		"far zone":        {Title: "odd", Lattice: grids.Lattice{Cell: 1, NX: 3, NY: 3}, Value: make([]float64, 9), Zones: []Zone{{"far", orb.MultiPolygon{{{{-1e12, -1e12}, {1e12, -1e12}, {0, 1e12}, {-1e12, -1e12}}}}}, {"empty", nil}, {"point", orb.MultiPolygon{{{{1, 1}}, {}}}}}},
		"far observation": {Title: "odd", Lattice: grids.Lattice{Cell: 1, NX: 3, NY: 3}, Value: make([]float64, 9), Observations: Points{[]float64{1e200, 1}, []float64{-1e200, 1}}},
		"all masked":      {Title: "odd", Lattice: grids.Lattice{Cell: 1, NX: 2, NY: 1, Mask: make([]bool, 2)}, Value: []float64{1, 2}},
		"one dot":         {Legend: "odd", Dots: Dots{[]float64{0}, []float64{0}, []float64{math.NaN()}}},
		"collinear dots":  {Legend: "odd", Dots: Dots{[]float64{0, 0, 0}, []float64{0, 1, 2}, []float64{1, 2, 3}}, Kind: Ratio},
		"huge values":     {Legend: "odd", Lattice: grids.Lattice{Cell: 1, NX: 4, NY: 1}, Value: []float64{-9e299, 9e299, 1e-308, 1e301}},
		"tiny values":     {Legend: "odd", Lattice: grids.Lattice{Cell: 1, NX: 2, NY: 1}, Value: []float64{1e-310, 2e-310}},
		"negative ratio":  {Legend: "odd", Kind: Ratio, Lattice: grids.Lattice{Cell: 1, NX: 2, NY: 1}, Value: []float64{-1, 0}},
		"own breaks":      {Legend: "odd", Kind: Ratio, Breaks: []float64{0.5, 1, 2}, Lattice: grids.Lattice{Cell: 1, NX: 2, NY: 1}, Value: []float64{0.1, 7}},
		"one class":       {Legend: "odd", Breaks: []float64{0, 1}, Lattice: grids.Lattice{Cell: 1, NX: 2, NY: 1}, Value: []float64{-1, 7}},
		"no such letters": {Title: "東京 \xff\x00\n", Lattice: grids.Lattice{Cell: 1, NX: 2, NY: 1}, Value: []float64{-1, 7}},
		"a million wide":  cells(1000000, 1),
		"a line tall":     cells(1, 5000),
		"far out":         {Title: "odd", Lattice: grids.Lattice{Cell: 1e-6, X0: 1e12, Y0: -1e12, NX: 2, NY: 2}, Value: []float64{1, 2, 3, 4}},
		"world":           {Title: "odd", Lattice: grids.Lattice{CRS: plane(t, "laea lon=10 lat=89"), X0: -3e7, Y0: -3e7, Cell: 6e6, NX: 10, NY: 10}, Value: make([]float64, 100)},
	} {
		p := newPage(m)
		checkPage(&named{t, name}, p)
		decoded(t, m)
	}
}

func TestOwnBreaks(t *testing.T) {
	l := grids.Lattice{Cell: 1, NX: 4, NY: 1}
	m := Map{Legend: "x", Lattice: l, Value: []float64{-5, 1, 3, 99}, Breaks: []float64{0, 2, 4, 6}}
	c := cut(m)
	if got, want := strings.Join(c.ranges(), "; "), "under 2; 2 to 4; 4 and over"; got != want {
		t.Errorf("ranges %q, want %q", got, want)
	}
	for i, want := range []int{0, 0, 1, 2} {
		if got := c.of(m.Value[i]); got != want {
			t.Errorf("%g is in class %d, want %d", m.Value[i], got, want)
		}
	}
	m.Kind, m.Breaks, m.Value = Ratio, []float64{0.5, 0.8, 1, 1.25, 2}, []float64{0.7, 0.9, 1, 1.5}
	if got := places(cut(m).edge); len(got) != 4 || got[0] != -2 || got[1] != -1 || got[2] != 1 || got[3] != 2 {
		t.Errorf("with an edge at 1 the classes stand at %v, want no neutral one", got)
	}
}

func BenchmarkWritePNG(b *testing.B) {
	for _, size := range []struct {
		name string
		n    int
	}{{"100x100", 100}, {"1000x1000", 1000}} {
		l := grids.Lattice{Cell: 1, NX: size.n, NY: size.n}
		outline := blob(&l)
		m := Map{Title: "Stems in the Harrow valley forest", Legend: "stems per hectare", Lattice: l, Value: field(l, skewed), Outline: outline, Observations: scatter(l, 200, 1), Foot: []string{"A caution."}}
		b.Run(size.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				var out bytes.Buffer
				if err := m.WritePNG(&out); err != nil {
					b.Fatal(err)
				}
				b.SetBytes(int64(out.Len()))
			}
		})
	}
}

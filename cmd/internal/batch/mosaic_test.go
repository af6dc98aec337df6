package batch

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"
	"weak"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/chart"
	"drumlin/io/draft"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
)

// landOf is an invented region: the cells of a lattice whose centres lie in an outline (everywhere without one), with
// estimates that are a function of the place and one observation at the middle.
func landOf(l grids.Lattice, outline orb.MultiPolygon, estimate func(x, y float64) float64, atX, atY float64) draft.Draft {
	d := draft.Draft{Response: "gulls", Unit: "gulls per km2", Factor: 1, Lattice: l, Outline: outline,
		Foot: []string{"Limits hold for the mean.", "All of it is invented."}}
	for k := range l.Cells() {
		x, y := l.Centre(k)
		if outline != nil && !planar.MultiPolygonContains(outline, orb.Point{x, y}) {
			continue
		}
		v := estimate(x, y)
		d.Cells = append(d.Cells, int32(k))
		d.X, d.Y = append(d.X, x), append(d.Y, y)
		d.Estimate, d.StandardError, d.CV = append(d.Estimate, v), append(d.StandardError, v/10), append(d.CV, 0.1)
		d.Lower, d.Upper = append(d.Lower, v*0.8), append(d.Upper, v*1.2)
		d.Nearest = append(d.Nearest, math.Hypot(x-atX, y-atY))
	}
	return d
}

func constant(v float64) func(x, y float64) float64 {
	return func(x, y float64) float64 { return v }
}

func square(x0, y0, x1, y1 float64) orb.MultiPolygon {
	return orb.MultiPolygon{{{{x0, y0}, {x1, y0}, {x1, y1}, {x0, y1}, {x0, y0}}}}
}

// tileOf is a tile whose draft is there already.
func tileOf(name string, d draft.Draft) Tile {
	return Tile{Region: name, Open: func() (draft.Draft, error) { return d, nil }}
}

func buildMosaic(t *testing.T, tiles ...Tile) *Mosaic {
	t.Helper()
	m, err := BuildMosaic(t.Context(), tiles)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func csvOf(t *testing.T, m *Mosaic) string {
	t.Helper()
	var b bytes.Buffer
	if err := m.WriteCSV(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// mosaicRow is what a line of mosaic.csv says, by column; NaN where it says nothing.
type mosaicRow struct {
	region string
	value  map[string]float64
}

func rowsOf(t *testing.T, m *Mosaic) []mosaicRow {
	t.Helper()
	all, err := csv.NewReader(strings.NewReader(csvOf(t, m))).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var rows []mosaicRow
	for _, line := range all[1:] {
		r := mosaicRow{line[0], map[string]float64{}}
		for j, s := range line[1:] {
			v, err := strconv.ParseFloat(s, 64)
			if s == "" {
				v = math.NaN()
			} else if err != nil {
				t.Fatal(err)
			}
			r.value[all[0][j+1]] = v
		}
		rows = append(rows, r)
	}
	return rows
}

func pictureOf(t *testing.T, m *Mosaic) chart.Map {
	t.Helper()
	p, err := m.Picture(t.Context(), "Gulls", 0, nil)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// Two strips of cells of 10 m that share two cells, by hand. The west strip has its observation at x = 5, the east one at
// x = 55; the shared cells have their centres at 25 and 35, 20 m from the one and 30 m from the other.
func TestMosaicByHand(t *testing.T) {
	threshold := 5.0
	west := landOf(grids.Lattice{CRS: crs.Local{}, Cell: 10, NX: 4, NY: 1}, nil, constant(1), 5, 5)
	east := landOf(grids.Lattice{CRS: crs.Local{}, X0: 20, Cell: 10, NX: 4, NY: 1}, nil, constant(2), 55, 5)
	east.Threshold, east.Chance = &threshold, []float64{0.1, 0.2, 0.3, 0.4}
	m := buildMosaic(t, tileOf("west", west), tileOf("east, far", east))
	want := `region,x,y,lon,lat,area,estimate,standard_error,lower,upper,cv,chance,nearest_m
west,5,5,,,100,1,0.1,0.8,1.2,0.1,,0
west,15,5,,,100,1,0.1,0.8,1.2,0.1,,10
west,25,5,,,100,1,0.1,0.8,1.2,0.1,,20
"east, far",35,5,,,100,2,0.2,1.6,2.4,0.1,0.2,20
"east, far",45,5,,,100,2,0.2,1.6,2.4,0.1,0.3,10
"east, far",55,5,,,100,2,0.2,1.6,2.4,0.1,0.4,0
`
	if diff := cmp.Diff(want, csvOf(t, m)); diff != "" {
		t.Error(diff)
	}
	if m.Cells() != 6 || m.Response != "gulls" || m.Unit != "gulls per km2" || m.Why != "" || m.Notes() != nil {
		t.Errorf("%d cells of %q in %q, why %q, notes %v", m.Cells(), m.Response, m.Unit, m.Why, m.Notes())
	}

	var text bytes.Buffer
	if err := m.WriteGeoJSON(&text); err != nil {
		t.Fatal(err)
	}
	var shapes struct {
		Features []struct {
			Properties map[string]any
			Geometry   struct{ Coordinates orb.Polygon }
		}
	}
	if err := json.Unmarshal(text.Bytes(), &shapes); err != nil || len(shapes.Features) != 6 {
		t.Fatalf("%d features, %v", len(shapes.Features), err)
	}
	if f := shapes.Features[3]; !f.Geometry.Coordinates.Equal(orb.Polygon{{{30, 0}, {40, 0}, {40, 10}, {30, 10}, {30, 0}}}) {
		t.Errorf("the fourth cell is %v", f.Geometry)
	}
	properties := map[string]any{"region": "east, far", "x": 35., "y": 5., "area": 100., "estimate": 2., "standard_error": 0.2,
		"lower": 1.6, "upper": 2.4, "cv": 0.1, "chance": 0.2, "nearest_m": 20.}
	if diff := cmp.Diff(properties, shapes.Features[3].Properties); diff != "" {
		t.Error(diff)
	}
	properties = map[string]any{"region": "west", "x": 5., "y": 5., "area": 100., "estimate": 1., "standard_error": 0.1,
		"lower": 0.8, "upper": 1.2, "cv": 0.1, "chance": nil, "nearest_m": 0.}
	if diff := cmp.Diff(properties, shapes.Features[0].Properties); diff != "" {
		t.Error(diff)
	}

	p := pictureOf(t, m)
	if diff := cmp.Diff([]float64{1, 1, 1, 2, 2, 2}, p.Value); diff != "" ||
		p.Lattice.X0 != 0 || p.Lattice.Cell != 10 || p.Lattice.NX != 6 || p.Lattice.NY != 1 {
		t.Errorf("the picture has %v at %v", p.Value, p.Lattice)
	}
}

// At equal distances the earlier tile has the cell, whichever that is.
func TestMosaicTies(t *testing.T) {
	l := grids.Lattice{CRS: crs.Local{}, Cell: 10, NX: 3, NY: 1}
	a, b := landOf(l, nil, constant(1), 25, 5), landOf(l, nil, constant(2), 45, 5)
	b.Lattice.X0 = 20 // distances stay those of the cells from x = 25 on
	b.Nearest, a.Nearest = []float64{0, 10, 20}, []float64{20, 10, 0}
	for _, tiles := range [][]Tile{{tileOf("a", a), tileOf("b", b)}, {tileOf("b", b), tileOf("a", a)}} {
		rows := rowsOf(t, buildMosaic(t, tiles...))
		at := slices.IndexFunc(rows, func(r mosaicRow) bool { return r.value["x"] == 25 })
		if len(rows) != 5 || rows[at].region != tiles[0].Region {
			t.Errorf("%s first: %d cells, that at 25 is of %s", tiles[0].Region, len(rows), rows[at].region)
		}
		if p := pictureOf(t, buildMosaic(t, tiles...)); len(p.Value) != 5 || p.Value[2] != rows[at].value["estimate"] {
			t.Errorf("%s first: the picture has %v", tiles[0].Region, p.Value)
		}
	}
}

func TestMosaicRefuses(t *testing.T) {
	l := grids.Lattice{CRS: crs.Local{}, Cell: 10, NX: 4, NY: 4}
	a := tileOf("a", landOf(l, nil, constant(1), 0, 0))
	globe, _ := crs.NewAzimuthalEqualArea(-30, -40)
	changed := func(change func(*draft.Draft)) Tile {
		d := landOf(grids.Lattice{CRS: crs.Local{}, X0: 100, Cell: 10, NX: 4, NY: 4}, nil, constant(1), 0, 0)
		change(&d)
		return tileOf("b", d)
	}
	places := changed(func(d *draft.Draft) { d.Cells = nil })
	for _, test := range []struct {
		name  string
		tiles []Tile
		want  string
	}{
		{"nothing", nil, "fewer than two regions have a map of cells"},
		{"one", []Tile{a}, "fewer than two regions have a map of cells"},
		{"one with cells", []Tile{places, a, places}, "fewer than two regions have a map of cells"},
		{"responses", []Tile{a, changed(func(d *draft.Draft) { d.Response = "terns" })},
			`the regions show different things: a is about "gulls" in "gulls per km2", b about "terns" in "gulls per km2"`},
		{"units", []Tile{a, changed(func(d *draft.Draft) { d.Unit = "gulls per ha" })},
			`the regions show different things: a is about "gulls" in "gulls per km2", b about "gulls" in "gulls per ha"`},
		{"globe", []Tile{a, changed(func(d *draft.Draft) { d.Lattice.CRS = globe })},
			"some regions lie in local metres (a) and some on the globe (b), and nothing says how the two hang together"},
		{"globe first", []Tile{changed(func(d *draft.Draft) { d.Lattice.CRS = globe }), a},
			"some regions lie in local metres (a) and some on the globe (b), and nothing says how the two hang together"},
		{"years", []Tile{a, a, a}, "the regions lie on the same ground: more than half of all cells are also covered by another region"},
	} {
		m := buildMosaic(t, test.tiles...)
		if m.Why != test.want {
			t.Errorf("%s: %q", test.name, m.Why)
		}
		if err := m.WriteCSV(&bytes.Buffer{}); !errors.Is(err, errNoMosaic) {
			t.Errorf("%s: a table: %v", test.name, err)
		}
		if err := m.WriteGeoJSON(&bytes.Buffer{}); !errors.Is(err, errNoMosaic) {
			t.Errorf("%s: shapes: %v", test.name, err)
		}
		if _, err := m.Picture(t.Context(), "", 0, nil); !errors.Is(err, errNoMosaic) {
			t.Errorf("%s: a picture: %v", test.name, err)
		}
	}
	// Half of all cells is not more than half: 8 of 16 cells of either region are shared.
	half := changed(func(d *draft.Draft) { d.Lattice.X0 = 20 })
	if m := buildMosaic(t, a, half); m.Why != "" || m.Cells() != 24 {
		t.Errorf("half of the cells shared: %q, %d cells", m.Why, m.Cells())
	}
}

func TestMosaicErrors(t *testing.T) {
	l := grids.Lattice{CRS: crs.Local{}, Cell: 10, NX: 2, NY: 2}
	good := landOf(l, nil, constant(1), 0, 0)
	gone := errors.New("no such file")
	_, err := BuildMosaic(t.Context(), []Tile{tileOf("a", good), {Region: "b", Open: func() (draft.Draft, error) { return draft.Draft{}, gone }}})
	if !errors.Is(err, gone) || !strings.Contains(err.Error(), `region "b"`) {
		t.Errorf("a draft that cannot be opened: %v", err)
	}
	for want, change := range map[string]func(*draft.Draft){
		"its lattice has no extent":                     func(d *draft.Draft) { d.Lattice.NX = 0 },
		"3 values for 4 cells":                          func(d *draft.Draft) { d.Nearest = d.Nearest[:3] },
		"1 chances for 4 cells":                         func(d *draft.Draft) { d.Chance = []float64{1} },
		"cell 9 is not of its lattice or out of order":  func(d *draft.Draft) { d.Cells = []int32{0, 1, 2, 9} },
		"cell 1 is not of its lattice or out of order":  func(d *draft.Draft) { d.Cells = []int32{0, 2, 1, 3} },
		"cell -1 is not of its lattice or out of order": func(d *draft.Draft) { d.Cells = []int32{-1, 2, 1, 3} },
	} {
		bad := good
		change(&bad)
		if _, err := BuildMosaic(t.Context(), []Tile{tileOf("a", good), tileOf("b", bad)}); err == nil || err.Error() != `the draft of region "b": `+want {
			t.Errorf("want %s, got %v", want, err)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := BuildMosaic(ctx, []Tile{tileOf("a", good)}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// A draft that is another one when it is opened again is told so.
	opened := 0
	changing := Tile{Region: "c", Open: func() (draft.Draft, error) {
		if opened++; opened > 1 {
			return landOf(grids.Lattice{CRS: crs.Local{}, X0: 100, Cell: 10, NX: 3, NY: 3}, nil, constant(1), 0, 0), nil
		}
		return landOf(grids.Lattice{CRS: crs.Local{}, X0: 100, Cell: 10, NX: 2, NY: 2}, nil, constant(1), 0, 0), nil
	}}
	m := buildMosaic(t, tileOf("a", good), changing)
	if err := m.WriteCSV(&bytes.Buffer{}); err == nil || !strings.Contains(err.Error(), `the draft of region "c" changed while the mosaic was made`) {
		t.Errorf("a draft that changed: %v", err)
	}
}

// Regions that tile a square show all their cells, and their areas add up, although each region has a lattice of its own
// whose edge cells stand out over the border: 4 x 4 districts with slanted borders, cells of different sizes. The area is
// off by what edge cells gain and lose at the border, well below half of one cell for each of them.
func TestMosaicPartition(t *testing.T) {
	const across, side = 4, 1000.
	corner := func(i, j int) orb.Point {
		p := orb.Point{float64(i) * side, float64(j) * side}
		if i > 0 && i < across {
			p[0] += 130 * math.Sin(float64(3*i+5*j))
		}
		if j > 0 && j < across {
			p[1] += 130 * math.Cos(float64(7*i+2*j))
		}
		return p
	}
	var tiles []Tile
	cells, own := 0, 0.0
	for j := range across {
		for i := range across {
			outline := orb.MultiPolygon{{{corner(i, j), corner(i+1, j), corner(i+1, j+1), corner(i, j+1), corner(i, j)}}}
			l, err := grids.NewLattice(crs.Local{}, grids.Spec{Within: outline, Cell: float64(17 + 3*i + 2*j)})
			if err != nil {
				t.Fatal(err)
			}
			l.Mask = nil
			d := landOf(l, outline, constant(1), float64(i)*side+300, float64(j)*side+700)
			cells += len(d.Cells)
			own += float64(len(d.Cells)) * l.Cell * l.Cell
			tiles = append(tiles, tileOf(fmt.Sprint(i, j), d))
		}
	}
	m := buildMosaic(t, tiles...)
	if m.Why != "" || m.Cells() != cells {
		t.Fatalf("%d of %d cells are shown; why %q", m.Cells(), cells, m.Why)
	}
	area := 0.0
	for _, r := range rowsOf(t, m) {
		area += r.value["area"]
	}
	if math.Abs(area/own-1) > 1e-12 || math.Abs(area/(across*across*side*side)-1) > 0.002 {
		t.Errorf("area %v, the regions' own %v, the square's %v", area, own, across*across*side*side)
	}
	// The picture has no holes, and every spot of it belongs to the region it lies in.
	p := pictureOf(t, m)
	for k := range p.Value {
		x, y := p.Lattice.Centre(k)
		if inside := x > 1 && y > 1 && x < across*side-1 && y < across*side-1; inside && !p.Lattice.Mask[k] {
			t.Fatalf("a hole at %v, %v", x, y)
		}
	}
}

// Without outlines edge cells do cover the neighbour's, and lattices of one plane that stand on each other leave neither
// holes nor spots that are shown twice: on a common lattice every cell is shown by exactly one of three regions.
func TestMosaicEveryCellOnce(t *testing.T) {
	var tiles []Tile
	seen := map[[2]float64]int{}
	for i, at := range []orb.Point{{0, 0}, {250, 60}, {90, 240}} {
		d := landOf(grids.Lattice{CRS: crs.Local{}, X0: at[0], Y0: at[1], Cell: 10, NX: 32, NY: 30}, nil, constant(float64(i)), at[0]+160, at[1]+150)
		for k := range d.X {
			seen[[2]float64{d.X[k], d.Y[k]}] = 0
		}
		tiles = append(tiles, tileOf(fmt.Sprint(i), d))
	}
	m := buildMosaic(t, tiles...)
	for _, r := range rowsOf(t, m) {
		seen[[2]float64{r.value["x"], r.value["y"]}]++
	}
	for at, n := range seen {
		if n != 1 {
			t.Fatalf("the cell at %v is shown %d times", at, n)
		}
	}
	// What is drawn is what is written.
	p := pictureOf(t, m)
	for _, r := range rowsOf(t, m) {
		k, ok := p.Lattice.Locate(r.value["x"], r.value["y"])
		if !ok || p.Value[k] != r.value["estimate"] {
			t.Fatalf("the cell at %v, %v is %v in the table", r.value["x"], r.value["y"], r.value["estimate"])
		}
	}
}

// waves is an invented surface over the globe: 172 waves around it, which is 3 radians a degree.
func waves(lon, lat float64) float64 {
	return 50 + 8*math.Sin(172*lon*math.Pi/180) + 5*math.Cos(4*lat)
}

// disc is a region around a place of the globe, in a plane of its own, with the values of waves.
func disc(t *testing.T, lon, lat, radius float64, cells int) draft.Draft {
	t.Helper()
	system, err := crs.NewAzimuthalEqualArea(lon, lat)
	if err != nil {
		t.Fatal(err)
	}
	ring := orb.Ring{}
	for i := range 73 {
		sin, cos := math.Sincos(float64(i%72) * math.Pi / 36)
		ring = append(ring, orb.Point{radius * cos, radius * sin})
	}
	l := grids.Lattice{CRS: system, X0: -radius, Y0: -radius, Cell: 2 * radius / float64(cells), NX: cells, NY: cells}
	return landOf(l, orb.MultiPolygon{{ring}}, func(x, y float64) float64 { return waves(system.Inverse(x, y)) }, 0, 0)
}

// Two planes on the globe: wherever two discs of 20 km overlap, a cell belongs to the nearer middle, which is where its
// observation is. The middles are known, so the rule can be had from great-circle distances (on a sphere: good to half
// a percent here, so cells that near the line between the two are passed over). The same across the antimeridian.
func TestMosaicTwoPlanes(t *testing.T) {
	for _, lon := range []float64{-31, 179.9} {
		middle := [2]orb.Point{{lon, -40}, {math.Remainder(lon+0.3, 360), -40.1}}
		west, east := disc(t, middle[0][0], middle[0][1], 20000, 50), disc(t, middle[1][0], middle[1][1], 20000, 61)
		m := buildMosaic(t, tileOf("west", west), tileOf("east", east))
		if m.Why != "" || m.Cells() >= len(west.Cells)+len(east.Cells) {
			t.Fatalf("why %q; %d cells", m.Why, m.Cells())
		}
		shown := map[string]int{}
		for _, r := range rowsOf(t, m) {
			shown[r.region]++
			a, b := sphere(r.value["lon"], r.value["lat"], middle[0]), sphere(r.value["lon"], r.value["lat"], middle[1])
			if r.region == "east" {
				a, b = b, a
			}
			if a > b*1.03 && b < 20000*0.99 {
				t.Errorf("%s shows a place %.0f m from its middle and %.0f m from the other", r.region, a, b)
			}
			if !math.IsNaN(r.value["x"]) || math.Abs(r.value["estimate"]-waves(r.value["lon"], r.value["lat"])) > 1e-9 {
				t.Errorf("the row %v", r)
			}
			if want := map[string]float64{"west": 800. * 800, "east": 40000. / 61 * 40000 / 61}[r.region]; math.Abs(r.value["area"]-want) > 1e-6*want {
				t.Errorf("a cell of %s has %v m2, want %v", r.region, r.value["area"], want)
			}
		}
		if shown["west"] < len(west.Cells)/2 || shown["east"] < len(east.Cells)/2 {
			t.Errorf("shown: %v", shown)
		}
		if lon > 0 {
			checkAgainstWaves(t, pictureOf(t, m), 900)
		}
	}
}

// sphere is the distance on a sphere of the globe's mean radius.
func sphere(lon, lat float64, to orb.Point) float64 {
	rad := math.Pi / 180
	a := math.Pow(math.Sin((lat-to[1])*rad/2), 2) + math.Cos(lat*rad)*math.Cos(to[1]*rad)*math.Pow(math.Sin(math.Remainder(lon-to[0], 360)*rad/2), 2)
	return 2 * 6371008.8 * math.Asin(math.Sqrt(a))
}

// checkAgainstWaves holds every spot of a picture to the surface at its own centre: it may be off by what the surface changes
// over the distance to the centre of a region's cell, and no more.
func checkAgainstWaves(t *testing.T, p chart.Map, reach float64) {
	t.Helper()
	n := 0
	for k, in := range p.Lattice.Mask {
		if !in {
			continue
		}
		n++
		lon, lat := p.Lattice.CRS.Inverse(p.Lattice.Centre(k))
		perDegree := 6371008.8 * math.Pi / 180
		most := 24.1*reach/(perDegree*math.Cos(lat*math.Pi/180)) + 20*reach/perDegree // the steepest slopes of waves
		if math.Abs(p.Value[k]-waves(lon, lat)) > most {
			t.Fatalf("at %v, %v the picture says %v, the surface is %v", lon, lat, p.Value[k], waves(lon, lat))
		}
	}
	if n < 1000 {
		t.Errorf("only %d spots are shown", n)
	}
}

// A disc of 1500 km around a pole covers a small one at any longitude, though none of its edge comes near that.
func TestMosaicPole(t *testing.T) {
	for _, pole := range []float64{90, -90} {
		around, beside := disc(t, 0, pole, 1.5e6, 60), disc(t, 120, pole*87/90, 200000, 30)
		m := buildMosaic(t, tileOf("around", around), tileOf("beside", beside))
		share := math.Pow(200./1500, 2) * float64(len(around.Cells))
		if got := m.tiles[1].covered.len(); got != len(beside.Cells) {
			t.Errorf("%d of %d cells lie in the pole's region", got, len(beside.Cells))
		}
		if got := float64(m.tiles[0].covered.len()); math.Abs(got-share) > 0.15*share {
			t.Errorf("%v cells of the pole's region lie in the other, want about %.0f", got, share)
		}
	}
}

// Drafts are opened twice or so, 32 at most are alive, and their order along the list changes neither: 20 x 20 discs, each
// overlapping its eight neighbours a little, come in an order that is all over the place.
func TestMosaicMemory(t *testing.T) {
	const across = 20
	opened, alive, most := 0, []weak.Pointer[float64]{}, 0
	count := func() {
		runtime.GC()
		alive = slices.DeleteFunc(alive, func(p weak.Pointer[float64]) bool { return p.Value() == nil })
		most = max(most, len(alive))
	}
	var tiles []Tile
	for k := range across * across {
		at := k * 171 % (across * across)
		tiles = append(tiles, Tile{Region: fmt.Sprint(at), Open: func() (draft.Draft, error) {
			x, y := float64(at%across)*100, float64(at/across)*100
			d := landOf(grids.Lattice{CRS: crs.Local{}, X0: x, Y0: y, Cell: 11, NX: 10, NY: 10}, nil, constant(1), x+55, y+55)
			opened++
			alive = append(alive, weak.Make(&d.Nearest[0]))
			if opened%7 == 0 {
				count()
			}
			return d, nil
		}})
	}
	m := buildMosaic(t, tiles...)
	if m.Why != "" {
		t.Fatal(m.Why)
	}
	if opened > 3*len(tiles) {
		t.Errorf("%d drafts were opened %d times to build the mosaic", len(tiles), opened)
	}
	t.Logf("%d openings of %d drafts, at most %d alive", opened, len(tiles), most)
	if most > mostHeld+2 {
		t.Errorf("%d drafts were alive", most)
	}
	opened, most = 0, 0
	count()
	csvOf(t, m)
	if opened != len(tiles) || most > 8 { // between two counts there are seven
		t.Errorf("the table took %d openings, %d alive", opened, most)
	}
	opened, most = 0, 0
	pictureOf(t, m)
	if opened != len(tiles) || most > 8 {
		t.Errorf("the picture took %d openings, %d alive", opened, most)
	}
}

// Many years of one place are refused soon: not every year is compared with every other.
func TestMosaicManyYears(t *testing.T) {
	opened := 0
	var tiles []Tile
	for k := range 200 {
		d := landOf(grids.Lattice{CRS: crs.Local{}, Cell: 1, NX: 5, NY: 5}, nil, constant(1), 0, 0)
		tiles = append(tiles, Tile{Region: fmt.Sprint(k), Open: func() (draft.Draft, error) { opened++; return d, nil }})
	}
	if m := buildMosaic(t, tiles...); !strings.Contains(m.Why, "same ground") || opened > 2*len(tiles) {
		t.Errorf("why %q after %d openings", m.Why, opened)
	}
}

// The order of the tiles changes the order of the rows and who wins a tie, and nothing else; the same order gives the same bytes.
func TestMosaicOrder(t *testing.T) {
	var tiles []Tile
	for k := range 40 {
		x, y := float64(k%8)*97.3, float64(k/8)*101.7
		l := grids.Lattice{CRS: crs.Local{}, X0: x, Y0: y, Cell: 7 + float64(k%3), NX: 14, NY: 14}
		d := landOf(l, nil, constant(float64(k)), x+50+10*math.Sin(float64(k)), y+50) // no ties
		tiles = append(tiles, tileOf(fmt.Sprint(k), d))
	}
	first := csvOf(t, buildMosaic(t, tiles...))
	if again := csvOf(t, buildMosaic(t, tiles...)); again != first {
		t.Error("the same tiles gave another table")
	}
	drawn := pictureOf(t, buildMosaic(t, tiles...)).Value
	slices.Reverse(tiles)
	sorted := func(s string) []string { return slices.Sorted(strings.Lines(s)) }
	m := buildMosaic(t, tiles...)
	if diff := cmp.Diff(sorted(first), sorted(csvOf(t, m))); diff != "" {
		t.Error(diff)
	}
	for k, v := range pictureOf(t, m).Value {
		if v != drawn[k] && !(math.IsNaN(v) && math.IsNaN(drawn[k])) {
			t.Fatalf("spot %d is %v, and %v in the other order", k, v, drawn[k])
		}
	}
}

func TestMosaicWords(t *testing.T) {
	land := func(x float64) draft.Draft {
		return landOf(grids.Lattice{CRS: crs.Local{}, X0: x, Cell: 10, NX: 5, NY: 5}, square(x, 0, x+50, 50), constant(x), x, 0)
	}
	limit := []float64{3, 4}
	a, b := land(0), land(100)
	a.Foot = []string{"One.", "Two.", "Only a.", "Three.", "Four."}
	b.Foot = []string{"Four.", "Three.", "Two.", "One.", "Only b."}
	a.Subtitle, b.Subtitle = "adjusted to depth = 3", "adjusted to depth = 4"
	a.Threshold, b.Threshold = &limit[0], &limit[1]
	places := land(200)
	places.Cells = nil
	m := buildMosaic(t, tileOf("a", a), tileOf("p", places), tileOf("b", b))
	var names []string
	for k := range 15 {
		names = append(names, fmt.Sprintf("n%d", k+1))
	}
	p, err := m.Picture(t.Context(), "Gulls of Orrimay", 12500, names)
	if err != nil {
		t.Fatal(err)
	}
	want := []string{
		"Each region was fitted by itself: levels may jump at the borders between regions, and a jump is no finding." +
			" Rows of neighbouring regions within 12.5 km helped each fit.",
		"The regions are adjusted to values that are not the same everywhere.",
		"Left out as not to be used: n1, n2, n3, n4, n5, n6, n7, n8, n9, n10, n11, n12 and 3 more.",
		"Left out as their values stand at places of their own: p.",
		"One.", "Two.", "Three.",
	}
	if diff := cmp.Diff(want, p.Foot); diff != "" {
		t.Error(diff)
	}
	if p.Title != "Gulls of Orrimay" || p.Subtitle != "" || p.Legend != "gulls per km2" || p.Kind != chart.Level || p.Breaks != nil {
		t.Errorf("the picture is %+v", p)
	}
	if len(p.Zones) != 2 || p.Zones[1].Name != "b" || !p.Zones[1].Area.Equal(square(100, 0, 150, 50)) {
		t.Errorf("its zones are %v", p.Zones)
	}
	notes := []string{"Not in the mosaic, as their values stand at places of their own: p.",
		"The regions have different thresholds: their chances are not of the same thing."}
	if diff := cmp.Diff(notes, m.Notes()); diff != "" {
		t.Error(diff)
	}
	b.Subtitle, a.Ratio, b.Ratio = a.Subtitle, true, true
	p, err = buildMosaic(t, tileOf("a", a), tileOf("b", b)).Picture(t.Context(), "", 250, nil)
	if err != nil || p.Subtitle != a.Subtitle || p.Kind != chart.Ratio || len(p.Foot) != 4 || !strings.HasSuffix(p.Foot[0], "within 250 m helped each fit.") {
		t.Errorf("one subtitle, relative risks, 250 m: %v, %+v", err, p)
	}
	var tiles []Tile
	for k := range 61 {
		tiles = append(tiles, tileOf(fmt.Sprint(k), land(100*float64(k))))
	}
	if p := pictureOf(t, buildMosaic(t, tiles...)); len(p.Zones) != 61 || p.Zones[7].Name != "" {
		t.Errorf("61 regions: %d zones, one called %q", len(p.Zones), p.Zones[7].Name)
	}
	if p := pictureOf(t, buildMosaic(t, tiles[:60]...)); p.Zones[7].Name != "7" {
		t.Errorf("60 regions: one called %q", p.Zones[7].Name)
	}
}

// Above a million cells there is no GeoJSON, and a note says so; the picture stays within 1600 cells.
func TestMosaicLarge(t *testing.T) {
	land := func(x float64) draft.Draft {
		l := grids.Lattice{CRS: crs.Local{}, X0: x, Cell: 10, NX: 1001, NY: 500}
		d := draft.Draft{Response: "gulls", Unit: "gulls per km2", Lattice: l, Cells: make([]int32, l.Cells())}
		for k := range d.Cells {
			d.Cells[k] = int32(k)
		}
		v := make([]float64, l.Cells())
		d.Estimate, d.StandardError, d.Lower, d.Upper, d.CV, d.Nearest = v, v, v, v, v, v
		return d
	}
	m := buildMosaic(t, tileOf("a", land(0)), tileOf("b", land(10010)))
	var b bytes.Buffer
	if err := m.WriteGeoJSON(&b); err == nil || b.Len() != 0 || m.FitsGeoJSON() {
		t.Errorf("%v, %d bytes", err, b.Len())
	}
	if diff := cmp.Diff([]string{"mosaic.geojson is left out: it would hold 1001000 cells, and at most 1000000 are written."}, m.Notes()); diff != "" {
		t.Error(diff)
	}
	if p := pictureOf(t, m); p.Lattice.NX < 1590 || p.Lattice.NX > 1600 || p.Lattice.NY > 1600 {
		t.Errorf("the picture has %d x %d cells", p.Lattice.NX, p.Lattice.NY)
	}
}

var mosaicPictures = flag.String("mosaic-pictures", "", "folder to write the examples of mosaics to, for looking at")

// districts are invented districts with winding borders in the open ocean, each mapped in a plane of its own: across by across.
func districts(t *testing.T, across int) []Tile {
	side := 1.2 / float64(across)
	corner := func(i, j int) orb.Point {
		return orb.Point{-31 + side*(float64(i)+0.22*math.Sin(float64(3*i+5*j))), -40 + 0.75*side*(float64(j)+0.22*math.Cos(float64(4*i+2*j)))}
	}
	line := func(a, b orb.Point) (r orb.Ring) { // from a to b, bent the same way from either side
		low, sign := a[0]+a[1], 1.0
		if b[0]+b[1] < low {
			low, sign = b[0]+b[1], -1
		}
		for k := range 24 {
			f := float64(k) / 24
			g := 0.5 + sign*(f-0.5)
			bend := sign * 0.1 * math.Sin(math.Pi*g) * math.Sin(7*g*math.Pi+20*low)
			r = append(r, orb.Point{a[0] + f*(b[0]-a[0]) - bend*(b[1]-a[1]), a[1] + f*(b[1]-a[1]) + bend*(b[0]-a[0])})
		}
		return r
	}
	names := []string{"Ammerhal", "Brone", "Calder Sands", "Dunmarrow", "Ost", "Fennick", "Garra", "Hollin Deep", "Iverne"}
	var tiles []Tile
	for j := range across {
		for i := range across {
			c := [5]orb.Point{corner(i, j), corner(i+1, j), corner(i+1, j+1), corner(i, j+1), corner(i, j)}
			var ring orb.Ring
			for k := range 4 {
				ring = append(ring, line(c[k], c[k+1])...)
			}
			ring = append(ring, ring[0])
			system, err := crs.NewAzimuthalEqualArea(c[0][0]+side/2, c[0][1]+side/2)
			if err != nil {
				t.Fatal(err)
			}
			g, err := grids.ProjectGeometry(orb.MultiPolygon{{ring}}, system)
			if err != nil {
				t.Fatal(err)
			}
			outline := g.(orb.MultiPolygon)
			l, err := grids.NewLattice(system, grids.Spec{Within: outline, Across: 40 + 10*((i+j)%3)})
			if err != nil {
				t.Fatal(err)
			}
			l.Mask = nil
			lift := 1 + 0.2*math.Sin(float64(5*i+3*j))
			d := landOf(l, outline, func(x, y float64) float64 {
				lon, lat := system.Inverse(x, y)
				return lift * math.Exp(2+math.Sin(6*lon)+math.Cos(5*lat-lon))
			}, 0, 0)
			name := fmt.Sprintf("district %d", j*across+i+1)
			if across == 3 {
				name = names[j*across+i]
			}
			tiles = append(tiles, tileOf(name, d))
		}
	}
	return tiles
}

// Examples are drawn as they would be in earnest; to look at them: go test -run MosaicDrawn -mosaic-pictures FOLDER.
func TestMosaicDrawn(t *testing.T) {
	hulls := []Tile{tileOf("Ammerhal", disc(t, -31, -40, 20000, 60)), tileOf("Brone", disc(t, -30.7, -40.1, 23000, 50)),
		tileOf("Ost", disc(t, -30.85, -39.8, 15000, 30))}
	examples := map[string][]Tile{"hulls": hulls}
	if *mosaicPictures != "" {
		examples["districts"], examples["many"] = districts(t, 3), districts(t, 9)
	}
	for name, tiles := range examples {
		m := buildMosaic(t, tiles...)
		p, err := m.Picture(t.Context(), "Gulls on the Vessal Banks", 10000, []string{"Jorn", "Kelder Bank"})
		if err != nil {
			t.Fatal(err)
		}
		var b bytes.Buffer
		if err := p.WritePNG(&b); err != nil {
			t.Fatal(err)
		}
		if *mosaicPictures != "" {
			if err := os.WriteFile(filepath.Join(*mosaicPictures, name+".png"), b.Bytes(), 0o644); err != nil {
				t.Fatal(err)
			}
		}
	}
}

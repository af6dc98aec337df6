package vector

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
	"testing"

	"drumlin/grids"
	"drumlin/grids/crs"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
	"github.com/paulmach/orb/planar"
)

// plate is the equirectangular plane of a sphere around lon0: x and y are degrees times a length. Its inverse needs no
// formulas that could be wrong, which leaves what is written to be judged alone.
type plate struct{ lon0 float64 }

const perDegree = 1e5

func (p plate) Code() string     { return fmt.Sprintf("plate around %g", p.lon0) }
func (p plate) Geographic() bool { return true }
func (p plate) Forward(lon, lat float64) (x, y float64) {
	return (lon - p.lon0) * perDegree, lat * perDegree
}
func (p plate) Inverse(x, y float64) (lon, lat float64) {
	if math.Abs(y) > 90*perDegree {
		return math.NaN(), math.NaN()
	}
	return math.Remainder(x/perDegree+p.lon0, 360), y / perDegree
}
func (p plate) AreaScale(x, y float64) float64 { return 1 }

// polar looks down on a pole of a sphere: the distance from it is degrees times a length, north +1, south -1.
type polar float64

func (p polar) Code() string                            { return "polar" }
func (p polar) Geographic() bool                        { return true }
func (p polar) Forward(lon, lat float64) (x, y float64) { panic("not needed") }
func (p polar) Inverse(x, y float64) (lon, lat float64) {
	n := float64(p)
	return math.Atan2(x, -n*y) * 180 / math.Pi, n * (90 - math.Hypot(x, y)/perDegree)
}
func (p polar) AreaScale(x, y float64) float64 { return 1 }

// flat is a local plane.
type flat struct{}

func (flat) Code() string                        { return "local" }
func (flat) Geographic() bool                    { return false }
func (flat) Forward(_, _ float64) (_, _ float64) { return math.NaN(), math.NaN() }
func (flat) Inverse(_, _ float64) (_, _ float64) { return math.NaN(), math.NaN() }
func (flat) AreaScale(_, _ float64) float64      { return 1 }

var _ = []crs.System{plate{}, polar(1), flat{}}

// readBack decodes what was written with the standard decoder alone, into types of its own.
func readBack(t *testing.T, text []byte) []written {
	t.Helper()
	var c struct {
		Type     string
		Features []written
	}
	decoder := json.NewDecoder(bytes.NewReader(text))
	decoder.DisallowUnknownFields() // no members beside those of the standard
	if err := decoder.Decode(&c); err != nil || c.Type != "FeatureCollection" || c.Features == nil {
		t.Fatalf("%v: %s", err, text)
	}
	for _, f := range c.Features {
		if f.Type != "Feature" {
			t.Fatalf("a feature is a %q", f.Type)
		}
	}
	return c.Features
}

type written struct {
	Type       string
	Properties map[string]any
	Geometry   struct {
		Type        string
		Coordinates json.RawMessage
	}
}

func (f written) shape(t *testing.T) orb.MultiPolygon {
	t.Helper()
	var shape orb.MultiPolygon
	var err error
	switch f.Geometry.Type {
	case "Polygon":
		shape = make(orb.MultiPolygon, 1)
		err = json.Unmarshal(f.Geometry.Coordinates, &shape[0])
	case "MultiPolygon":
		err = json.Unmarshal(f.Geometry.Coordinates, &shape)
	default:
		err = fmt.Errorf("a %s", f.Geometry.Type)
	}
	if err != nil {
		t.Fatal(err)
	}
	checkRings(t, shape)
	return shape
}

// checkRings holds every ring to RFC 7946 section 3.1.6: closed, outer ones anticlockwise, holes clockwise. The area is
// by the trapezium rule, not by the code under test.
func checkRings(t *testing.T, shape orb.MultiPolygon) {
	t.Helper()
	for _, p := range shape {
		for i, r := range p {
			twice := 0.0
			for j := range r[1:] {
				twice += (r[j][0] - r[j+1][0]) * (r[j][1] + r[j+1][1])
			}
			if len(r) < 4 || r[0] != r[len(r)-1] || (twice > 0) != (i == 0) {
				t.Errorf("ring %d of %d positions, %v to %v, signed area %g", i, len(r), r[0], r[len(r)-1], twice/2)
			}
		}
	}
}

func TestWriteCellsText(t *testing.T) {
	l := grids.Lattice{CRS: flat{}, X0: 0.1, Y0: -1, Cell: 0.1, NX: 3, NY: 2}
	columns := []Column{
		{Name: "estimate", Value: []float64{1.0 / 3, math.NaN()}},
		{Name: "a \"b\" <&>", Text: []string{"é\n", ""}},
		{Name: "chance", Value: []float64{math.Inf(1), 123456789.0123456}},
	}
	var b bytes.Buffer
	if err := WriteCells(&b, l, []int{5, 0}, columns); err != nil {
		t.Fatal(err)
	}
	want := `{"type":"FeatureCollection","features":[
{"type":"Feature","properties":{"estimate":0.333333333333,"a \"b\" <&>":"é\n","chance":null},"geometry":{"type":"Polygon","coordinates":[[[0.3,-0.9],[0.4,-0.9],[0.4,-0.8],[0.3,-0.8],[0.3,-0.9]]]}},
{"type":"Feature","properties":{"estimate":null,"a \"b\" <&>":"","chance":123456789.012},"geometry":{"type":"Polygon","coordinates":[[[0.1,-1],[0.2,-1],[0.2,-0.9],[0.1,-0.9],[0.1,-1]]]}}
]}
`
	if diff := cmp.Diff(want, b.String()); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if got := readBack(t, b.Bytes()); len(got) != 2 || got[1].Properties["estimate"] != nil {
		t.Errorf("read back as %v", got)
	}
}

func TestWriteNothing(t *testing.T) {
	var b bytes.Buffer
	if err := WriteZones(&b, flat{}, nil, nil); err != nil {
		t.Fatal(err)
	}
	if got := readBack(t, b.Bytes()); len(got) != 0 {
		t.Errorf("read back as %v", got)
	}
}

// Cells on the globe: their centres lie at Inverse of the lattice's centres, neighbours share corners to the last digit,
// and together they cover the box. Rounding to 7 decimals moves a corner by 5e-8 degrees at most.
func TestWriteCellsOnTheGlobe(t *testing.T) {
	l := grids.Lattice{CRS: plate{lon0: 12}, X0: -123456.7, Y0: 4.5e6 + 1.0/3, Cell: 2500.1, NX: 7, NY: 5}
	var index []int
	for k := range l.Cells() {
		index = append(index, k)
	}
	var b bytes.Buffer
	if err := WriteCells(&b, l, index, nil); err != nil {
		t.Fatal(err)
	}
	features := readBack(t, b.Bytes())
	if len(features) != 35 {
		t.Fatalf("%d cells, want 35", len(features))
	}
	area := 0.0
	uses := map[orb.Point]int{}
	for k, f := range features {
		shape := f.shape(t)
		ring := shape[0][0]
		lon, lat := l.CRS.Inverse(l.Centre(k))
		c := ring.Bound().Center()
		if math.Abs(c[0]-lon) > 1e-7 || math.Abs(c[1]-lat) > 1e-7 || len(ring) != 5 {
			t.Errorf("cell %d: centre %v, want (%g, %g)", k, c, lon, lat)
		}
		for _, p := range ring[:4] {
			uses[p]++
		}
		area += planar.Area(shape)
	}
	if len(uses) != 8*6 {
		t.Errorf("%d distinct corners, want 48", len(uses))
	}
	if want := 35 * l.Cell * l.Cell / perDegree / perDegree; math.Abs(area/want-1) > 1e-5 {
		t.Errorf("area %g square degrees, want %g", area, want)
	}
}

// A cell over the antimeridian is as wide as any other: RFC 7946 section 3.1.9 is about what happens if it is not.
func TestWriteCellsOverTheAntimeridian(t *testing.T) {
	for _, lon0 := range []float64{180, -180, 179.5, -179.5} {
		l := grids.Lattice{CRS: plate{lon0}, X0: -2.5 * perDegree, Y0: -18 * perDegree, Cell: perDegree, NX: 5, NY: 1}
		var b bytes.Buffer
		if err := WriteCells(&b, l, []int{0, 1, 2, 3, 4}, nil); err != nil {
			t.Fatal(err)
		}
		for k, f := range readBack(t, b.Bytes()) {
			bound := f.shape(t).Bound()
			if width := bound.Max[0] - bound.Min[0]; math.Abs(width-1) > 2e-7 {
				t.Errorf("around %g, cell %d is %g degrees wide, want 1", lon0, k, width)
			}
			x, _ := l.Centre(k)
			middle := bound.Center()[0]
			if math.Abs(middle) > 180 || math.Abs(math.Remainder(middle-x/perDegree-lon0, 360)) > 1e-7 {
				t.Errorf("around %g, cell %d has its middle at %g", lon0, k, middle)
			}
		}
	}
}

// A cell that holds a pole is drawn as all longitudes from its corners up to the pole. The other cells around the pole
// touch it nowhere.
func TestWriteCellsAroundThePole(t *testing.T) {
	for _, pole := range []polar{1, -1} {
		l := grids.Lattice{CRS: pole, X0: -1.5 * perDegree, Y0: -1.5 * perDegree, Cell: perDegree, NX: 3, NY: 3}
		var b bytes.Buffer
		if err := WriteCells(&b, l, []int{4, 5}, nil); err != nil {
			t.Fatal(err)
		}
		features := readBack(t, b.Bytes())
		bound := features[0].shape(t).Bound()
		corner := float64(pole) * (90 - math.Sqrt(0.5)) // half a diagonal of a cell of 1 degree
		low, high := min(corner, float64(pole)*90), max(corner, float64(pole)*90)
		if bound.Max[0]-bound.Min[0] != 360 || math.Abs(bound.Min[1]-low) > 1e-7 || math.Abs(bound.Max[1]-high) > 1e-7 {
			t.Errorf("pole %g: the cell spans %v, want latitudes %g to %g", pole, bound, low, high)
		}
		if b := features[1].shape(t).Bound(); b.Max[0]-b.Min[0] > 91 {
			t.Errorf("pole %g: the next cell spans %v", pole, b)
		}
	}
}

// The plane drumlin itself uses for longitude and latitude: what is written comes back through Forward within the
// rounding, 5e-8 degrees or 6 mm.
func TestWritePoints(t *testing.T) {
	sys, err := crs.NewAzimuthalEqualArea(179.9, -16.5)
	if err != nil {
		t.Fatal(err)
	}
	x, y := []float64{0, 30000, -41000.25}, []float64{0, -12000, 250000}
	var b bytes.Buffer
	if err := WritePoints(&b, sys, x, y, []Column{{Name: "n", Value: []float64{1, 2, 3}}}); err != nil {
		t.Fatal(err)
	}
	for i, f := range readBack(t, b.Bytes()) {
		var p orb.Point
		if err := json.Unmarshal(f.Geometry.Coordinates, &p); err != nil || f.Geometry.Type != "Point" {
			t.Fatal(f.Geometry.Type, err)
		}
		if px, py := sys.Forward(p[0], p[1]); math.Hypot(px-x[i], py-y[i]) > 0.01 || f.Properties["n"] != float64(i+1) {
			t.Errorf("point %d: (%g, %g), n %v; want (%g, %g)", i, px, py, f.Properties["n"], x[i], y[i])
		}
	}
}

// Rings are wound whichever way they come, holes stay with their outline across the antimeridian, and the parts of a zone
// cut there stay on their own sides.
func TestWriteZones(t *testing.T) {
	box := func(west, south, east, north float64) orb.Ring {
		return orb.Ring{{west, south}, {east, south}, {east, north}, {west, north}, {west, south}}
	}
	backwards := func(r orb.Ring) orb.Ring { r.Reverse(); return r }
	// In degrees from 180 east on the equator; what is to be written beside it.
	zones := []struct {
		name string
		in   orb.MultiPolygon
		want []orb.Bound // of each ring
	}{
		{"backwards", orb.MultiPolygon{{backwards(box(-9, 1, -5, 4)), box(-8, 2, -7, 3)}},
			[]orb.Bound{{Min: orb.Point{171, 1}, Max: orb.Point{175, 4}}, {Min: orb.Point{172, 2}, Max: orb.Point{173, 3}}}},
		{"hole beyond", orb.MultiPolygon{{box(-5, 1, 3, 4), box(1, 2, 2, 3)}},
			[]orb.Bound{{Min: orb.Point{175, 1}, Max: orb.Point{183, 4}}, {Min: orb.Point{181, 2}, Max: orb.Point{182, 3}}}},
		{"cut", orb.MultiPolygon{{box(-2, 1, 0, 4)}, {box(0, 1, 2, 4)}},
			[]orb.Bound{{Min: orb.Point{178, 1}, Max: orb.Point{180, 4}}, {Min: orb.Point{-180, 1}, Max: orb.Point{-178, 4}}}},
	}
	var list []Zone
	for _, z := range zones {
		scaled := z.in.Clone()
		for _, p := range scaled {
			for _, r := range p {
				for i := range r {
					r[i] = orb.Point{r[i][0] * perDegree, r[i][1] * perDegree}
				}
			}
		}
		list = append(list, Zone{Name: z.name, Shape: scaled})
	}
	kept := list[0].Shape.Clone()
	var b bytes.Buffer
	if err := WriteZones(&b, plate{180}, list, []Column{{Name: "total", Value: []float64{1, 2, 3}}}); err != nil {
		t.Fatal(err)
	}
	for i, f := range readBack(t, b.Bytes()) {
		if f.Properties["zone"] != zones[i].name || f.Properties["total"] != float64(i+1) {
			t.Errorf("zone %d has properties %v", i, f.Properties)
		}
		var got []orb.Bound
		for _, p := range f.shape(t) {
			for _, r := range p {
				got = append(got, r.Bound())
			}
		}
		if diff := cmp.Diff(zones[i].want, got); diff != "" {
			t.Errorf("%s (-want +got):\n%s", zones[i].name, diff)
		}
	}
	if !kept.Equal(list[0].Shape) {
		t.Error("writing changed the zones")
	}
}

// What is written is read back by the reader of this package, to the metre's last digit in a local plane.
func TestZonesRoundTrip(t *testing.T) {
	s, err := read(collection(feature(polygon(`[[[181072.1,333611],[181025,333558.30000001],[181165,333537],[181072.1,333611]]]`), `{}`)))
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	if err := WriteZones(&b, flat{}, []Zone{{"a", s.Features[0].Shape}}, nil); err != nil {
		t.Fatal(err)
	}
	again, err := ReadPolygons(&b, "again")
	if err != nil {
		t.Fatal(err)
	}
	if !s.Features[0].Shape.Equal(again.Features[0].Shape) {
		t.Errorf("%v came back as %v", s.Features[0].Shape, again.Features[0].Shape)
	}
	if names, _, _ := again.Names(""); names[0] != "a" {
		t.Errorf("named %q", names)
	}
}

func TestWriteZonesText(t *testing.T) {
	square := func(x float64) orb.Polygon {
		return orb.Polygon{{{x, 0}, {x, 1}, {x + 1, 1}, {x + 1, 0}, {x, 0}}}
	}
	zones := []Zone{{"one", orb.MultiPolygon{square(0)}}, {"two", orb.MultiPolygon{square(2), square(4.5)}}, {"none", nil}}
	var b bytes.Buffer
	if err := WriteZones(&b, flat{}, zones, []Column{{Name: "total", Value: []float64{1, 2, math.NaN()}}}); err != nil {
		t.Fatal(err)
	}
	want := `{"type":"FeatureCollection","features":[
{"type":"Feature","properties":{"zone":"one","total":1},"geometry":{"type":"Polygon","coordinates":[[[0,0],[1,0],[1,1],[0,1],[0,0]]]}},
{"type":"Feature","properties":{"zone":"two","total":2},"geometry":{"type":"MultiPolygon","coordinates":[[[[2,0],[3,0],[3,1],[2,1],[2,0]]],[[[4.5,0],[5.5,0],[5.5,1],[4.5,1],[4.5,0]]]]}},
{"type":"Feature","properties":{"zone":"none","total":null},"geometry":{"type":"MultiPolygon","coordinates":[]}}
]}
`
	if diff := cmp.Diff(want, b.String()); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

// kinds has a shape of every kind with the coordinates that are to be written in a local plane.
var kinds = []struct {
	name string
	in   orb.Geometry
	kind string // "" for null
	want string
}{
	{"point", orb.Point{1, 2.5}, "Point", `[1,2.5]`},
	{"points", orb.MultiPoint{{1, 2}, {3, 4}}, "MultiPoint", `[[1,2],[3,4]]`},
	{"line", orb.LineString{{1, 2}, {3, 4}, {3, 9}}, "LineString", `[[1,2],[3,4],[3,9]]`},
	{"lines", orb.MultiLineString{{{1, 2}, {3, 4}}, {{5, 6}, {7, 8}}}, "MultiLineString", `[[[1,2],[3,4]],[[5,6],[7,8]]]`},
	{"area", orb.Polygon{{{0, 0}, {0, 1}, {1, 1}, {0, 0}}}, "Polygon", `[[[0,0],[1,1],[0,1],[0,0]]]`},
	{"areas", orb.MultiPolygon{{{{0, 0}, {1, 1}, {0, 1}, {0, 0}}}}, "MultiPolygon", `[[[[0,0],[1,1],[0,1],[0,0]]]]`},
	{"nothing", nil, "", ""},
	{"no polygons", orb.MultiPolygon{}, "", ""},
	{"no positions", orb.LineString(nil), "", ""},
}

func TestWritePlaces(t *testing.T) {
	var names []string
	var shapes []orb.Geometry
	var value []float64
	for i, k := range kinds {
		names, shapes, value = append(names, k.name), append(shapes, k.in), append(value, float64(i))
	}
	var b bytes.Buffer
	if err := WritePlaces(&b, flat{}, names, shapes, []Column{{Name: "observed", Value: value}}); err != nil {
		t.Fatal(err)
	}
	features := readBack(t, b.Bytes())
	if len(features) != len(kinds) {
		t.Fatalf("%d features, want %d", len(features), len(kinds))
	}
	for i, f := range features {
		k := kinds[i]
		if f.Properties["place"] != k.name || f.Properties["observed"] != float64(i) || len(f.Properties) != 2 {
			t.Errorf("%s: properties %v", k.name, f.Properties)
		}
		if f.Geometry.Type != k.kind || string(f.Geometry.Coordinates) != k.want {
			t.Errorf("%s: %s %s, want %s %s", k.name, f.Geometry.Type, f.Geometry.Coordinates, k.kind, k.want)
		}
	}
	if n := strings.Count(b.String(), `"geometry":null}`); n != 3 {
		t.Errorf("%d features without a location, want 3", n)
	}
}

// A line across the antimeridian runs on, parts lie each on their own side, and what was given stays as it was.
func TestWritePlacesOnTheGlobe(t *testing.T) {
	scaled := func(degrees ...orb.Point) []orb.Point { // from 180 east on the equator
		for i, p := range degrees {
			degrees[i] = orb.Point{p[0] * perDegree, p[1] * perDegree}
		}
		return degrees
	}
	shapes := []orb.Geometry{
		orb.MultiPoint(scaled(orb.Point{-2, 1}, orb.Point{2, 1})),
		orb.LineString(scaled(orb.Point{-3, 1}, orb.Point{1, 2}, orb.Point{-3, 3})),
		orb.LineString(scaled(orb.Point{-1, 1}, orb.Point{3, 2})),
		orb.MultiLineString{scaled(orb.Point{-2, 1}, orb.Point{-1, 1}), scaled(orb.Point{1, 1}, orb.Point{2, 1})},
		orb.Polygon{scaled(orb.Point{-1, 1}, orb.Point{-1, 4}, orb.Point{3, 4}, orb.Point{3, 1}, orb.Point{-1, 1})},
	}
	want := []string{
		`[[178,1],[-178,1]]`,
		`[[177,1],[181,2],[177,3]]`,
		`[[-181,1],[-177,2]]`,
		`[[[178,1],[179,1]],[[-179,1],[-178,1]]]`,
		`[[[-181,1],[-177,1],[-177,4],[-181,4],[-181,1]]]`,
	}
	kept := make([]orb.Geometry, len(shapes))
	for i, s := range shapes {
		kept[i] = orb.Clone(s)
	}
	var b bytes.Buffer
	if err := WritePlaces(&b, plate{180}, make([]string, len(shapes)), shapes, nil); err != nil {
		t.Fatal(err)
	}
	for i, f := range readBack(t, b.Bytes()) {
		if string(f.Geometry.Coordinates) != want[i] {
			t.Errorf("%s %d: %s, want %s", f.Geometry.Type, i, f.Geometry.Coordinates, want[i])
		}
		if !orb.Equal(shapes[i], kept[i]) {
			t.Errorf("writing changed shape %d", i)
		}
	}
}

func TestWritePlacesErrors(t *testing.T) {
	line := orb.LineString{{0, 0}, {1, 95 * perDegree}}
	for name, test := range map[string]struct {
		shape orb.Geometry
		want  string
	}{
		"beyond the plane": {line, `place "b": the place (1, 9.5e+06) lies beyond the plane of plate around 0`},
		"in a part":        {orb.MultiLineString{line}, `place "b": the place (1, 9.5e+06) lies beyond the plane of plate around 0`},
		"not finite":       {orb.MultiPoint{{math.Inf(1), 0}}, `place "b": the place (+Inf, 0) is not finite`},
		"other kind":       {orb.Collection{orb.Point{}}, `place "b": a GeometryCollection is not written`},
	} {
		err := WritePlaces(io.Discard, plate{}, []string{"a", "b"}, []orb.Geometry{nil, test.shape}, nil)
		if err == nil || err.Error() != test.want {
			t.Errorf("%s: got %v, want %s", name, err, test.want)
		}
	}
	var advice interface{ Hint() string }
	err := WritePlaces(io.Discard, flat{}, []string{"a"}, []orb.Geometry{orb.Collection{orb.Point{}}}, nil)
	if !errors.As(err, &advice) || advice.Hint() != adviceKinds {
		t.Errorf("another kind: no advice in %v", err)
	}
	err = WritePlaces(io.Discard, flat{}, nil, nil, []Column{{Name: "place"}})
	if err == nil || err.Error() != `two columns are called "place"` {
		t.Errorf("a column called place: got %v", err)
	}
	many := make([]orb.Geometry, 10000)
	if err := WritePlaces(&fullDisk{1 << 17}, flat{}, make([]string, len(many)), many, nil); !errors.Is(err, errFull) {
		t.Errorf("a full disk: got %v", err)
	}
}

type fullDisk struct{ room int }

var errFull = errors.New("no space left")

func (d *fullDisk) Write(p []byte) (int, error) {
	if d.room -= len(p); d.room < 0 {
		return 0, errFull
	}
	return len(p), nil
}

func TestWriteErrors(t *testing.T) {
	l := grids.Lattice{CRS: plate{}, X0: 0, Y0: 89.5 * perDegree, Cell: perDegree, NX: 1, NY: 1}
	err := WriteCells(io.Discard, l, []int{0}, nil)
	if err == nil || err.Error() != "the place (100000, 9.05e+06) lies beyond the plane of plate around 0" {
		t.Errorf("beyond the plane: got %v", err)
	}
	err = WritePoints(io.Discard, flat{}, []float64{math.NaN()}, []float64{1}, nil)
	if err == nil || err.Error() != "the place (NaN, 1) is not finite" {
		t.Errorf("not finite: got %v", err)
	}
	err = WriteZones(io.Discard, flat{}, nil, []Column{{Name: "zone"}})
	if err == nil || err.Error() != `two columns are called "zone"` {
		t.Errorf("a column called zone: got %v", err)
	}
	many := make([]float64, 100000)
	for _, room := range []int{0, 1 << 17, 1 << 20} {
		if err := WritePoints(&fullDisk{room}, flat{}, many, many, nil); !errors.Is(err, errFull) {
			t.Errorf("a disk with room for %d bytes: got %v", room, err)
		}
	}
}

func TestWritePanics(t *testing.T) {
	l := grids.Lattice{CRS: flat{}, Cell: 1, NX: 2, NY: 2}
	for name, call := range map[string]func(){
		"short column": func() { WriteCells(io.Discard, l, []int{0, 1}, []Column{{Name: "a", Value: []float64{1}}}) },
		"no text":      func() { WriteCells(io.Discard, l, []int{0}, []Column{{Name: "a"}}) },
		"no such cell": func() { WriteCells(io.Discard, l, []int{4}, nil) },
		"no name":      func() { WritePlaces(io.Discard, flat{}, nil, []orb.Geometry{nil}, nil) },
		"y too short":  func() { WritePoints(io.Discard, flat{}, []float64{1}, nil, nil) },
	} {
		func() {
			defer func() {
				if r := recover(); r == nil || !strings.HasPrefix(fmt.Sprint(r), "vector: ") {
					t.Errorf("%s: recovered %v", name, r)
				}
			}()
			call()
		}()
	}
}

func BenchmarkWriteCells(b *testing.B) {
	sys, err := crs.NewAzimuthalEqualArea(12, 45)
	if err != nil {
		b.Fatal(err)
	}
	for _, n := range []int{100, 1000} {
		b.Run(fmt.Sprintf("n=%d", n*n), func(b *testing.B) {
			l := grids.Lattice{CRS: sys, Cell: 100, NX: n, NY: n}
			index, value := make([]int, n*n), make([]float64, n*n)
			for k := range index {
				index[k], value[k] = k, math.Sqrt(float64(k))
			}
			columns := []Column{{Name: "estimate", Value: value}, {Name: "standard_error", Value: value}}
			b.ReportAllocs()
			for b.Loop() {
				if err := WriteCells(io.Discard, l, index, columns); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// TestWriteShapes: features without names, lines as lines and polygons wound as RFC 7946 has it.
func TestWriteShapes(t *testing.T) {
	var b bytes.Buffer
	err := WriteShapes(&b, crs.Local{}, []orb.Geometry{
		orb.MultiLineString{{{0, 0}, {1, 2}}}, orb.MultiPolygon{{{{0, 0}, {0, 1}, {1, 1}, {0, 0}}}},
	}, []Column{{Name: "level", Value: []float64{1.5, math.NaN()}}, {Name: "unit", Text: []string{"mg", "mg"}}})
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{`{"level":1.5,"unit":"mg"},"geometry":{"type":"MultiLineString","coordinates":[[[0,0],[1,2]]]}`,
		`{"level":null,"unit":"mg"},"geometry":{"type":"MultiPolygon","coordinates":[[[[0,0],[1,1],[0,1],[0,0]]]]}`} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("%s\nlacks %s", b.String(), want)
		}
	}
}

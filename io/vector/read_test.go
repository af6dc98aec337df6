package vector

import (
	"encoding/json"
	"errors"
	"math"
	"os"
	"slices"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
	"github.com/paulmach/orb/geo"
)

func read(text string) (*Shapes, error) {
	return ReadPolygons(strings.NewReader(text), "zones.geojson")
}

func hint(err error) string {
	var h interface{ Hint() string }
	if errors.As(err, &h) {
		return h.Hint()
	}
	return "no hint"
}

const square = `{"type":"Polygon","coordinates":[[[0,0],[1,0],[1,1],[0,0]]]}`

func feature(geometry, properties string) string {
	return `{"type":"Feature","geometry":` + geometry + `,"properties":` + properties + `}`
}

func collection(features ...string) string {
	return `{"type":"FeatureCollection","features":[` + strings.Join(features, ",\n") + `]}`
}

func polygon(coordinates string) string {
	return `{"type":"Polygon","coordinates":` + coordinates + `}`
}

// Each refusal is pinned word for word, since these sentences are all the user gets. No source: the contract is ours;
// what a ring must be is RFC 7946 section 3.1.6.
func TestReadPolygonsRefusals(t *testing.T) {
	tests := []struct{ name, text, err, hint string }{
		{"no bytes", "", `zones.geojson: the file is empty`, adviceWhole},
		{"blanks", "\xef\xbb\xbf \n", `zones.geojson: the file is empty`, adviceWhole},
		{"utf-16", "\xff\xfe{\x00", `zones.geojson: the file holds UTF-16 text or is not text, and only UTF-8 is read`, adviceFormat},
		{"latin-1", collection(feature(square, `{}`), feature(square, "{\"name\":\"M\xfcnster\"}")), `zones.geojson: line 2: the text is not UTF-8`, `save the file in UTF-8`},
		{"cut short", "{\"type\":\n\"Feature\"", `zones.geojson: line 2: not JSON at byte 18: unexpected end of JSON input`, adviceWhole},
		{"comma", "{\"type\":\n\"Feature\",}", `zones.geojson: line 2: not JSON at byte 20: invalid character '}' looking for beginning of object key string`, adviceWhole},
		{"comma after a mark", "\xef\xbb\xbf{\"type\":\n\"Feature\",}", `zones.geojson: line 2: not JSON at byte 23: invalid character '}' looking for beginning of object key string`, adviceWhole},
		{"two texts", square + "\n" + square, `zones.geojson: line 2: not JSON at byte 62: invalid character '{' after top-level value`, adviceWhole},
		{"CSV", "name,x,y\n", `zones.geojson: line 1: not JSON at byte 2: invalid character 'a' in literal null (expecting 'u')`, adviceWhole},
		{"deep", polygon("\n" + strings.Repeat("[", 64)), `zones.geojson: line 2: nested more than 64 deep`, adviceFormat},
		{"null", "null", `zones.geojson: the text is not a GeoJSON object`, adviceFormat},
		{"list", "[" + square + "]", `zones.geojson: the text is not a GeoJSON object`, adviceFormat},
		{"no type", `{"TYPE":"Polygon"}`, `zones.geojson: the object has no "type", so it is not GeoJSON`, adviceFormat},
		{"point", `{"type":"Point","coordinates":[0,0]}`, `zones.geojson: the object is a "Point", not polygons`, adviceFormat},
		{"no features", `{"type":"FeatureCollection","features":{}}`, `zones.geojson: the FeatureCollection has no list of "features"`, adviceFormat},
		{"empty collection", collection(), `zones.geojson: the FeatureCollection is empty`, adviceFormat},
		{"feature of another type", collection(feature(square, `{}`), square), `zones.geojson: feature 2: not an object of type "Feature"`, adviceFormat},
		{"no geometry", collection(feature(square, `{}`), feature(`null`, `{}`)), `zones.geojson: feature 2: has no geometry`, adviceFormat},
		{"geometry is text", collection(feature(`"square"`, `{}`)), `zones.geojson: feature 1: its geometry is not an object`, adviceFormat},
		{"line", collection(feature(square, `{}`), feature(`{"type":"LineString","coordinates":[[0,0],[1,1]]}`, `{}`)),
			`zones.geojson: feature 2: its geometry is a "LineString", not a Polygon or MultiPolygon`, adviceFormat},
		{"geometries", collection(feature(`{"type":"GeometryCollection","geometries":[`+square+`]}`, `{}`)),
			`zones.geojson: feature 1: its geometry is a "GeometryCollection", not a Polygon or MultiPolygon`, adviceFormat},
		{"properties are a list", collection(feature(square, `[]`)), `zones.geojson: feature 1: its "properties" are not an object`, adviceFormat},
		{"id is a list", collection(`{"type":"Feature","id":[1],"geometry":` + square + `}`), `zones.geojson: feature 1: its "id" is neither a string nor a number`, adviceFormat},
		{"no coordinates", `{"type":"Polygon"}`, `zones.geojson: feature 1: its geometry has no "coordinates"`, adviceFormat},
		{"coordinates are text", polygon(`"here"`), `zones.geojson: feature 1: its geometry is not a list`, adviceFormat},
		{"no rings", polygon(`[]`), `zones.geojson: feature 1: its geometry has no rings`, adviceFormat},
		{"no polygons", `{"type":"MultiPolygon","coordinates":[]}`, `zones.geojson: feature 1: its geometry has no polygons`, adviceFormat},
		{"one polygon empty", `{"type":"MultiPolygon","coordinates":[[[[0,0],[1,0],[1,1],[0,0]]],[]]}`, `zones.geojson: feature 1, polygon 2: has no rings`, adviceFormat},
		{"three positions", polygon(`[[[0,0],[1,0],[1,1],[0,0]],[[0,0],[1,1],[0,0]]]`), `zones.geojson: feature 1, ring 2: has 3 positions, and a ring needs 4 or more`, adviceFormat},
		{"open", polygon(`[[[0,0],[1,0],[1,1],[0.5,0]]]`), `zones.geojson: feature 1, ring 1: is not closed: it starts at [0 0] and ends at [0.5 0]`, adviceFormat},
		{"one number", `{"type":"MultiPolygon","coordinates":[[[[0,0],[1],[1,1],[0,0]]]]}`,
			`zones.geojson: feature 1, polygon 1, ring 1, position 2: has 1 number, and a position needs 2`, adviceFormat},
		{"text for a number", polygon(`[[[0,0],[1,"0"],[1,1],[0,0]]]`), `zones.geojson: feature 1, ring 1, position 2: holds something that is not a number`, adviceFormat},
		{"nested too deep", polygon(`[[[[0,0],[1,0],[1,1],[0,0]]]]`), `zones.geojson: feature 1, ring 1, position 1: holds something that is not a number`, adviceFormat},
		{"nested too little", `{"type":"MultiPolygon","coordinates":[[[0,0],[1,0],[1,1],[0,0]]]}`,
			`zones.geojson: feature 1, polygon 1, ring 1, position 1: is not a list`, adviceFormat},
		{"infinite", polygon(`[[[0,0],[1e999,0],[1,1],[0,0]]]`), `zones.geojson: feature 1, ring 1, position 2: holds 1e999, which is not finite`, adviceFormat},
	}
	seen := map[string]bool{}
	for _, test := range tests {
		if seen[test.name] {
			t.Fatalf("two tests are called %q", test.name)
		}
		seen[test.name] = true
		t.Run(test.name, func(t *testing.T) {
			s, err := read(test.text)
			if s != nil || err == nil {
				t.Fatalf("got %v, error %v; want an error alone", s, err)
			}
			if diff := cmp.Diff(test.err, err.Error()); diff != "" {
				t.Errorf("message (-want +got):\n%s", diff)
			}
			if diff := cmp.Diff(test.hint, hint(err)); diff != "" {
				t.Errorf("hint (-want +got):\n%s", diff)
			}
		})
	}
}

func TestReadPolygonsTooLarge(t *testing.T) {
	if _, err := readPolygons(strings.NewReader(square), "z", int64(len(square))); err != nil {
		t.Errorf("a text of exactly the limit is refused: %v", err)
	}
	_, err := readPolygons(strings.NewReader(square+" "), "z", int64(len(square)))
	if err == nil || err.Error() != "z: the file is larger than 60 bytes, the most that is read" {
		t.Errorf("one byte more: got %v", err)
	}
	broken := errors.New("the disk went away")
	if _, err := ReadPolygons(iotest.ErrReader(broken), "z"); !errors.Is(err, broken) {
		t.Errorf("got %v, want the reader's error", err)
	}
}

func TestReadPolygons(t *testing.T) {
	ring := orb.Ring{{0, 0}, {1, 0}, {1, 1}, {0, 0}}
	multi := `{"type":"MultiPolygon", "coordinates" : [ [[[0,0,7.5],[1,0,7],[1e0,1.0,7],[0,0,7.5]]] , [[[0,0],[1,0],[1,1],[0,0]],[[-0.5,2.5E-1],[0,0],[1,1],[-0.5,0.25]]] ]}`
	parts := orb.MultiPolygon{{ring}, {ring, {{-0.5, 0.25}, {0, 0}, {1, 1}, {-0.5, 0.25}}}}
	tests := []struct {
		name, text string
		want       Shapes
	}{
		{"bare polygon", square, Shapes{Features: []Feature{{Shape: orb.MultiPolygon{{ring}}}}}},
		{"bare multipolygon with heights", multi, Shapes{Features: []Feature{{Shape: parts}}}},
		{"feature", "\xef\xbb\xbf" + feature(square, `null`), Shapes{Features: []Feature{{Shape: orb.MultiPolygon{{ring}}}}}},
		{"collection", collection(feature(square, `{"name":"a","n":12345678901234567890}`), `{"type":"Feature","id":7,"geometry":`+multi+`}`),
			Shapes{Features: []Feature{
				{Properties: map[string]any{"name": "a", "n": json.Number("12345678901234567890")}, Shape: orb.MultiPolygon{{ring}}},
				{Index: 1, ID: json.Number("7"), Shape: parts},
			}}},
		{"brackets inside text", feature(square, `{"name":"`+strings.Repeat(`[\"{`, 100)+`"}`),
			Shapes{Features: []Feature{{Properties: map[string]any{"name": strings.Repeat(`["{`, 100)}, Shape: orb.MultiPolygon{{ring}}}}}},
		{"named CRS", `{"type":"FeatureCollection","crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG::28992"}},"features":[` + feature(square, `{}`) + `]}`,
			Shapes{CRS: "urn:ogc:def:crs:EPSG::28992", Features: []Feature{{Properties: map[string]any{}, Shape: orb.MultiPolygon{{ring}}}}}},
		{"linked CRS", `{"type":"Polygon","crs":{"type":"link"},"coordinates":[[[0,0],[1,0],[1,1],[0,0]]]}`,
			Shapes{CRS: `{"type":"link"}`, Features: []Feature{{Shape: orb.MultiPolygon{{ring}}}}}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got, err := read(test.text)
			if err != nil {
				t.Fatal(err)
			}
			test.want.Source = "zones.geojson"
			if diff := cmp.Diff(&test.want, got); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
}

func TestNames(t *testing.T) {
	f := func(properties string) string { return feature(square, properties) }
	withID := func(id string) string {
		return `{"type":"Feature","id":` + id + `,"geometry":` + square + `,"properties":{}}`
	}
	tests := []struct {
		name, property string
		features       []string
		names          []string
		from           string
		err, hint      string
	}{
		{"asked for", "code", []string{f(`{"name":"a","code":" N1 "}`), f(`{"name":"b","code":2}`)}, []string{"N1", "2"}, "code", "", ""},
		{"name first", "", []string{f(`{"id":1,"zone":"z","name":"a"}`), f(`{"id":2,"zone":"z","name":"b"}`)}, []string{"a", "b"}, "name", "", ""},
		{"name not everywhere", "", []string{f(`{"id":1,"zone":"y","name":"a"}`), f(`{"id":2,"zone":"z","name":null}`)}, []string{"y", "z"}, "zone", "", ""},
		{"id", "", []string{f(`{"id":1}`), f(`{"id":"1a","name":" "}`)}, []string{"1", "1a"}, "id", "", ""},
		{"member id", "", []string{withID(`"a"`), withID(`7`)}, []string{"a", "7"}, "id", "", ""},
		{"none", "", []string{withID(`"a"`), f(`{"name":true}`)}, []string{"zone 1", "zone 2"}, "", "", ""},
		{"absent", "nam", []string{f(`{"nam":"a"}`), f(`{"b":1,"a":2}`)}, nil, "", `zones.geojson: feature 2: has no property "nam"`, `its properties are "a", "b"`},
		{"absent, no properties", "name", []string{f(`null`)}, nil, "", `zones.geojson: feature 1: has no property "name"`, `the feature has no properties`},
		{"not a name", "name", []string{f(`{"name":null}`)}, nil, "", `zones.geojson: feature 1: its property "name" is not a name`,
			`name a property that is a text or a number in every zone with --zone-name`},
		{"twice", "name", []string{f(`{"name":"a"}`), f(`{"name":"b"}`), f(`{"name":"a"}`)}, nil, "", `zones.geojson: feature 3: has the same "name" as feature 1: "a"`,
			`name a property that differs between the zones with --zone-name, or join the parts of a zone in one MultiPolygon`},
		{"twice by itself", "", []string{f(`{"zone":"a"}`), f(`{"zone":"a"}`)}, nil, "", `zones.geojson: feature 2: has the same "zone" as feature 1: "a"`,
			`name a property that differs between the zones with --zone-name, or join the parts of a zone in one MultiPolygon`},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s, err := read(collection(test.features...))
			if err != nil {
				t.Fatal(err)
			}
			names, from, err := s.Names(test.property)
			if test.err != "" {
				if err == nil || err.Error() != test.err || hint(err) != test.hint {
					t.Fatalf("got %v (%s)\nwant %s (%s)", err, hint(err), test.err, test.hint)
				}
				return
			}
			if err != nil || from != test.from || !cmp.Equal(names, test.names) {
				t.Errorf("got %q from %q, %v; want %q from %q", names, from, err, test.names, test.from)
			}
		})
	}
}

// The counties as a whole: number, births and deaths as in testdata/README.md, and areas against the land areas that the
// Census gives in the same file (source there). The outlines are generalised to some twenty positions each, which moves
// a single county by up to a tenth, and the land area leaves out water, which is much only on the coast: the median
// ratio must be within 3 % of 1, and four in five counties, those off the coast, within 10 %.
func TestCounties(t *testing.T) {
	f, err := os.Open("../../testdata/nc_sids_counties.geojson")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	s, err := ReadPolygons(f, "nc_sids_counties.geojson")
	if err != nil {
		t.Fatal(err)
	}
	names, from, err := s.Names("county")
	if err != nil || from != "county" || len(names) != 100 || names[0] != "Ashe" {
		t.Fatalf("%d names from %q, first %q, %v", len(names), from, names[0], err)
	}
	births, deaths := 0.0, 0.0
	for _, f := range s.Features {
		births += number(t, f.Properties["bir74"])
		deaths += number(t, f.Properties["sid74"])
	}
	if births != 329962 || deaths != 667 {
		t.Errorf("%g births and %g deaths, want 329962 and 667", births, deaths)
	}
	const squareMile = 1609.344 * 1609.344 // international mile, exact by definition
	var ratio []float64
	near := 0
	for _, f := range s.Features {
		r := geo.Area(f.Shape) / squareMile / number(t, f.Properties["census_area_sq_mi"])
		ratio = append(ratio, r)
		if math.Abs(r-1) < 0.1 {
			near++
		}
	}
	slices.Sort(ratio)
	if median := (ratio[49] + ratio[50]) / 2; math.Abs(median-1) > 0.03 || near < 80 {
		t.Errorf("areas against the Census: median ratio %g, %d of 100 within 10 %%", median, near)
	}
	if b := s.Bound(); b.Min[0] < -84.4 || b.Max[0] > -75.4 || b.Min[1] < 33.8 || b.Max[1] > 36.6 {
		t.Errorf("bound %v is not that of North Carolina", b) // limits of the state to 0.1 degree: from memory
	}
}

func number(t *testing.T, v any) float64 {
	t.Helper()
	n, err := v.(json.Number).Float64()
	if err != nil {
		t.Fatal(err)
	}
	return n
}

// FuzzReadPolygons holds every shape to what its documentation promises, and every refusal to being one readable line.
func FuzzReadPolygons(f *testing.F) {
	f.Add(square)
	f.Add(collection(feature(square, `{"name":"a"}`), feature(polygon(`[[[0,0,1],[1e3,0],[1,1],[0,0]]]`), `{"name":"b"}`)))
	f.Add(`{"type":"MultiPolygon","coordinates":[[[[0,0],[1],[1,1],[0,0]]]]}`)
	f.Add(`{"type":"FeatureCollection","crs":{"type":"name","properties":{"name":"EPSG:4326"}},"features":[]}`)
	f.Add(strings.Repeat(`{"type":[`, 40))
	f.Fuzz(func(t *testing.T, text string) {
		s, err := read(text)
		if err == nil {
			checkShapes(t, s)
			_, _, err = s.Names("")
		} else if s != nil {
			t.Fatal("an error and shapes")
		}
		if err != nil {
			checkLine(t, err.Error())
			checkLine(t, hint(err))
		}
	})
}

func checkLine(t *testing.T, s string) {
	if s == "no hint" || strings.ContainsAny(s, "\n\r\x00") || strings.ToValidUTF8(s, "") != s {
		t.Fatalf("refused with %q", s)
	}
}

func checkShapes(t *testing.T, s *Shapes) {
	if len(s.Features) == 0 {
		t.Fatal("no features and no error")
	}
	for i, f := range s.Features {
		if f.Index != i || len(f.Shape) == 0 {
			t.Fatalf("feature %d: index %d, %d polygons", i, f.Index, len(f.Shape))
		}
		for _, p := range f.Shape {
			if len(p) == 0 {
				t.Fatalf("feature %d: a polygon without rings", i)
			}
			for _, r := range p {
				if len(r) < 4 || r[0] != r[len(r)-1] {
					t.Fatalf("feature %d: ring %v", i, r)
				}
				for _, q := range r {
					if sum := q[0] - q[0] + q[1] - q[1]; sum != 0 {
						t.Fatalf("feature %d: position %v", i, q)
					}
				}
			}
		}
	}
}

package observe

import (
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/paulmach/orb"
)

func readFile(name, text string, want Request) (*Table, error) {
	return Read(strings.NewReader(text), name, want)
}

// feature writes a feature with a geometry and properties, both as JSON.
func feature(geometry, properties string) string {
	return fmt.Sprintf(`{"type":"Feature","geometry":%s,"properties":%s}`, geometry, properties)
}

func at(coordinates string) string { return `{"type":"Point","coordinates":[` + coordinates + `]}` }

func collection(features ...string) string {
	return `{"type":"FeatureCollection","features":[` + "\n" + strings.Join(features, ",\n") + "\n]}"
}

const square = `{"type":"Polygon","coordinates":[[[0,0],[2,0],[2,2],[0,2],[0,0]]]}`

// The same rows are read from every way in which features come.
func TestReadGeoJSON(t *testing.T) {
	first, second := feature(at("10.5,-2,31.25"), `{"zinc":3.5,"soil":"lehm µ","id":"7"}`), feature(square, `{"zinc":"4","dug":true,"soil":"Ton"}`)
	want := Request{Response: "zinc", Kind: Measure, Category: []string{"soil"}, Keep: []string{"dug", "z"}}
	table := &Table{
		Source: "wells.geojson", Row: []int32{1, 2}, Rows: 2, Degrees: true, GeometryName: "geometry", Features: true, Encoding: "UTF-8",
		Columns: []Column{{Name: "zinc", Number: []float64{3.5, 4}}, {Name: "soil", Code: []int32{1, 0}, Level: []string{"Ton", "lehm µ"}},
			{Name: "dug", Code: []int32{-1, 0}, Level: []string{"true"}}, {Name: "z", Code: []int32{0, -1}, Level: []string{"31.25"}}},
		Geometry: []orb.Geometry{orb.Point{10.5, -2}, orb.Polygon{{{0, 0}, {2, 0}, {2, 2}, {0, 2}, {0, 0}}}},
	}
	for name, text := range map[string]string{
		"collection":       collection(first, second),
		"after a mark":     "\xef\xbb\xbf \n" + collection(first, second),
		"one a line":       first + "\n" + second + "\n",
		"sequence":         "\x1e" + first + "\n\x1e" + second + "\n",
		"packed":           zipped(t, collection(first, second)),
		"in UTF-16":        encoded(t, collection(first, second), "UTF-16 LE", true),
		"unmarked UTF-16":  encoded(t, collection(first, second), "UTF-16 BE", false),
		"in Windows-1252":  encoded(t, collection(first, second), "Windows-1252", false),
		"crs of the globe": `{"crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:OGC:1.3:CRS84"}},` + collection(first, second)[1:],
	} {
		t.Run(name, func(t *testing.T) {
			got, err := readFile("wells.geojson", text, want)
			if err != nil {
				t.Fatal(err)
			}
			if crs := map[bool]string{true: "OGC:CRS84"}[name == "crs of the globe"]; got.CRS != crs {
				t.Errorf("the system is %q, not %q", got.CRS, crs)
			}
			if diff := cmp.Diff(table, got, cmpopts.IgnoreFields(Table{}, "Line", "CRS", "Encoding")); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
}

// Features with and without what they need, one a line so that lines and rows can be told apart.
func TestGeoJSONAside(t *testing.T) {
	good := feature(at("1,2"), `{"n":1}`)
	for _, tt := range []struct {
		name, feature string
		aside         Aside
	}{
		{"null", feature("null", `{"n":1}`), Aside{Column: "geometry", Code: "missing-geometry", Reason: "geometry is missing"}},
		{"no positions", feature(`{"type":"Polygon","coordinates":[]}`, `{"n":1}`), Aside{Column: "geometry", Code: "missing-geometry", Reason: "geometry is missing"}},
		{"open ring", feature(`{"type":"Polygon","coordinates":[[[0,0],[1,0],[1,1],[0,1]]]}`, `{"n":1}`), Aside{Column: "geometry", Code: "bad-geometry",
			Reason: "geometry cannot be read: ring 1: is not closed: it starts at [0 0] and ends at [0 1]"}},
		{"one number", feature(at("5"), `{"n":1}`), Aside{Column: "geometry", Code: "bad-geometry",
			Reason: "geometry cannot be read: has 1 number, and a position needs 2"}},
		{"bow-tie", feature(`{"type":"Polygon","coordinates":[[[0,0],[2,2],[2,0],[0,2],[0,0]]]}`, `{"n":1}`), Aside{Column: "geometry", Code: "bad-geometry",
			Reason: "geometry cannot be read: the polygon crosses itself near (1.000, 1.000)"}},
		{"no area", feature(`{"type":"Polygon","coordinates":[[[0,0],[1,1],[2,2],[0,0]]]}`, `{"n":1}`), Aside{Column: "geometry", Code: "bad-geometry",
			Reason: "geometry cannot be read: the polygon has no area"}},
		{"no length", feature(`{"type":"LineString","coordinates":[[3,4],[3,4]]}`, `{"n":1}`), Aside{Column: "geometry", Code: "bad-geometry",
			Reason: "geometry cannot be read: the line has no length"}},
		{"no response, no place", feature("null", `{"n":null}`), Aside{Column: "n", Code: "missing-response", Reason: "response is missing"}},
		{"an object for a number", feature(at("1,2"), `{"n":{"a": [1, 2]}}`), Aside{Column: "n", Value: `{"a":[1,2]}`, Code: "not-a-number", Reason: "response is not a number"}},
		{"truth for a number", feature(at("1,2"), `{"n":true}`), Aside{Column: "n", Value: "true", Code: "not-a-number", Reason: "response is not a number"}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			got, err := readFile("f.geojson", good+"\n\n"+tt.feature+"\n"+good, measured("n"))
			if err != nil {
				t.Fatal(err)
			}
			tt.aside.Line, tt.aside.Row = 3, 2
			if diff := cmp.Diff([]Aside{tt.aside}, got.Aside) + cmp.Diff([]int32{1, 4}, got.Line) + cmp.Diff([]int32{1, 3}, got.Row); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
}

func measured(response string) Request { return Request{Response: response, Kind: Measure} }

func TestGeoJSONRefusals(t *testing.T) {
	with := func(change func(*Request)) Request {
		q := measured("n")
		change(&q)
		return q
	}
	inUTM := func(text string) string {
		return `{"crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG::32633"}},` + text[1:]
	}
	good := collection(feature(at("1,2,3"), `{"n":1,"Größe":2}`))
	for _, tt := range []struct {
		name, text string
		want       Request
		err, hint  string
	}{
		{"absent", good, measured("m"), `f.geojson: no column "m" for the response`, `did you mean "n"? the columns are n, Größe, z`},
		{"no properties", `{"type":"MultiPoint","coordinates":[[1,2],[3,4]]}`, measured("n"), `f.geojson: no column "n" for the response`, `the features have no properties`},
		{"NaN", strings.Replace(good, `"n":1`, `"n":NaN`, 1), measured("n"), `f.geojson: row 1 (line 2): not JSON: invalid character 'N' looking for beginning of value`,
			`JSON has no NaN and no infinite numbers: write null where there is no value`},
		{"infinite", strings.Replace(good, `"n":1`, `"n":-Infinity`, 1), measured("n"), `f.geojson: row 1 (line 2): not JSON: invalid character 'I' in numeric literal`,
			`JSON has no NaN and no infinite numbers: write null where there is no value`},
		{"no geometries", feature("null", `{"n":1}`), measured("n"), `f.geojson: 1 of 1 rows cannot be used, more than half: column "geometry", geometry is missing (1); ` +
			`for example row 1 (line 1), where geometry is missing`, `write the geometries of the features into the file, or name a file of places with --places`},
		{"bow-ties", feature(`{"type":"Polygon","coordinates":[[[0,0],[2,2],[2,0],[0,2],[0,0]]]}`, `{"n":1}`), measured("n"),
			`f.geojson: 1 of 1 rows cannot be used, more than half: column "geometry", geometry cannot be read (1); ` +
				`for example row 1 (line 1), where geometry cannot be read: the polygon crosses itself near (1.000, 1.000)`,
			`repair such polygons: a ring must not cross itself (OGC 06-103r4, section 6.1.11)`},
		{"a line without length", feature(`{"type":"LineString","coordinates":[[3,4],[3,4]]}`, `{"n":1}`), measured("n"),
			`f.geojson: 1 of 1 rows cannot be used, more than half: column "geometry", geometry cannot be read (1); ` +
				`for example row 1 (line 1), where geometry cannot be read: the line has no length`, `give places that are points as points, and correct the others`},
		{"absent, no heights", collection(feature(at("1,2"), `{"n":1}`)), with(func(q *Request) { q.Linear = []string{"z"} }),
			`f.geojson: no column "z" for a linear covariate`, `did you mean "n"? the columns are n`},
		{"x and y", good, with(func(q *Request) { q.X, q.Y = "n", "z" }), `f.geojson: column "n": cannot be both the response and the x coordinate`, ``},
		{"coordinates", good, with(func(q *Request) { q.X, q.Y = "x", "y" }),
			`f.geojson: the file is GeoJSON, whose features have geometries of their own, but coordinate columns are named`, `leave out --x and --y`},
		{"geometry", good, with(func(q *Request) { q.Geometry = "geom" }),
			`f.geojson: the file is GeoJSON, whose features have geometries of their own, but a column of geometries is named`, `leave out --geometry`},
		{"foreign system", inUTM(good), measured("n"),
			`f.geojson: the file says that its coordinates are in "EPSG:32633", and GeoJSON is in longitude and latitude (RFC 7946)`,
			`say with --crs what the coordinates are in`},
		{"latitude", collection(feature("null", `{"n":1}`), feature(`{"type":"LineString","coordinates":[[1,2],[3,97.5]]}`, `{}`)), measured("n"),
			`f.geojson: row 2 (line 3), column "geometry": 97.5 is not a latitude (-90 to 90)`, adviceGeometries},
		{"longitude", collection(feature(`{"type":"MultiPoint","coordinates":[[1,2],[-500000,3]]}`, `{"n":1}`)), measured("n"),
			`f.geojson: row 1 (line 2), column "geometry": -500000 is not a longitude (-360 to 360)`, adviceGeometries},
		{"hole", collection(feature(`{"type":"Polygon","coordinates":[[[0,0],[2,0],[2,2],[0,0]],[[0,0],[0,91],[1,1],[0,0]]]}`, `{"n":1}`)), measured("n"),
			`f.geojson: row 1 (line 2), column "geometry": 91 is not a latitude (-90 to 90)`, adviceGeometries},
		{"mostly aside", collection(feature(at("1"), `{"n":1}`), feature(`{"type":"Point","coordinates":[[1]]}`, `{"n":1}`), feature(at("1,2"), `{"n":1}`)), measured("n"),
			`f.geojson: 2 of 3 rows cannot be used, more than half: column "geometry", geometry cannot be read (2); for example row 1 (line 2), ` +
				`where geometry cannot be read: has 1 number, and a position needs 2`, adviceOutlines},
		{"strict", collection(feature("null", `{"n":1}`), feature(at("1,2"), `{"n":1}`)), with(func(q *Request) { q.Strict = true }),
			`f.geojson: row 1 (line 2), column "geometry": geometry is missing`, `correct the row, or leave out --strict to set such rows aside`},
		{"cut short", good[:len(good)-4], measured("n"), `f.geojson: row 1 (line 2): the file ends before what starts here does`, adviceWhole},
		{"no features", `{"type":"FeatureCollection","features":[]}`, measured("n"), `f.geojson: the file has no features`, adviceWhole},
		{"not GeoJSON", `{"a":1}`, measured("n"), `f.geojson: row 1 (line 1): the object has no "type", so it is not GeoJSON`,
			`give a GeoJSON file (RFC 7946) of features, one FeatureCollection or one feature a line`},
		{"decimal commas", collection(feature(at("1,2"), `{"n":"1,5"}`)), measured("n"),
			`f.geojson: row 1 (line 2), column "n": "1,5" has a decimal comma, like most values of the column`, adviceJSONNumber},
		{"groups", collection(feature(at("1,2"), `{"n":"1,500"}`), feature(at("1,2"), `{"n":2}`)), measured("n"),
			`f.geojson: row 1 (line 2), column "n": "1,500" has a mark between thousands, which is not read`, `write the number without it`},
		{"nul", collection(feature(at("1,2"), `{"n":"\u0000"}`)), measured("n"),
			`f.geojson: row 1 (line 2), column "n": "\x00" is not text: it holds a NUL character`, `correct the property, or leave it out`},
		{"damaged gzip", zipped(t, good)[:40], measured("n"), `f.geojson: the compressed file is cut short`, adviceWhole},
	} {
		t.Run(tt.name, func(t *testing.T) {
			_, err := readFile("f.geojson", tt.text, tt.want)
			if err == nil {
				t.Fatal("it is read")
			}
			if diff := cmp.Diff(tt.err, err.Error()) + cmp.Diff(tt.hint, hint(err)); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
			if _, ok := err.(*Error); !ok {
				t.Errorf("a %T", err)
			}
		})
	}
}

func TestGeoJSONAxes(t *testing.T) {
	text := func(crs string) string {
		return fmt.Sprintf(`{"crs":{"type":"name","properties":{"name":%q}},`, crs) + collection(feature(at("500000,4600000"), `{"n":1}`))[1:]
	}
	for _, tt := range []struct {
		crs     string
		axes    Axes
		degrees bool
		said    string
		ok      bool
	}{
		{"urn:ogc:def:crs:EPSG::32633", AxesPlane, false, "EPSG:32633", true},
		{"EPSG:4326", AxesPlane, false, "EPSG:4326", true},
		{"EPSG:4326", AxesByName, true, "", false},
		{"urn:ogc:def:crs:EPSG::32633", AxesDegrees, true, "", false},
		{"http://www.opengis.net/def/crs/EPSG/0/32633", AxesByName, false, "", false},
	} {
		got, err := readFile("f.geojson", text(tt.crs), Request{Response: "n", Kind: Measure, Axes: tt.axes})
		if (err == nil) != tt.ok || tt.ok && (got.Degrees != tt.degrees || got.CRS != tt.said) {
			t.Errorf("%s, axes %d: got %+v, %v", tt.crs, tt.axes, got, err)
		}
	}
}

func TestReaderOfFeaturesFails(t *testing.T) {
	broken := errors.New("the disk is gone")
	_, err := Read(io.MultiReader(strings.NewReader(feature(at("1,2"), `{"n":1}`)), iotest.ErrReader(broken)), "f", measured("n"))
	if !errors.Is(err, broken) || err.Error() != "f: cannot be read: the disk is gone" {
		t.Errorf("got %v", err)
	}
}

// Of two things called z, the property counts.
func TestGeoJSONHeights(t *testing.T) {
	want := Request{Response: "z", Kind: Measure}
	with, err := readFile("f", feature(at("1,2,3"), `{"z":9}`), want)
	if err != nil || with.Columns[0].Number[0] != 9 {
		t.Errorf("the property is read as %+v, %v", with, err)
	}
	got, err := readFile("f", feature(at("1,2,0.1"), `{}`)+feature(at("1,2,-7"), `{}`)+feature(square, `{}`), want)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]float64{0.1, -7}, got.Columns[0].Number) + cmp.Diff([]Aside{{Line: 1, Row: 3, Column: "z", Code: "missing-response", Reason: "response is missing"}}, got.Aside); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

// Identifiers are a column unless a property is called so.
func TestGeoJSONIdentifiers(t *testing.T) {
	text := `{"id":" a7 ",` + feature(at("1,2"), `{"n":1}`)[1:] + `{"id":12,` + feature(at("1,2"), `{"n":2}`)[1:] + feature(at("1,2"), `{"n":3}`)
	want := Request{Response: "n", Kind: Count, Keep: []string{"id"}, Optional: []string{"other"}}
	got, err := readBoth(t, text, want)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(&Column{Name: "id", Code: []int32{1, 0, -1}, Level: []string{"12", "a7"}}, got.Column("id")); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	got, err = readBoth(t, text, Request{Response: "n", Kind: Count, Optional: []string{"id"}})
	if err != nil || got.Len() != 2 || got.Aside[0].Code != "missing-covariate" {
		t.Errorf("as a category: %+v, %v", got, err)
	}
	if parts := split(t, text, "id"); len(parts) != 2 || parts["a7"].Rows != 1 {
		t.Errorf("split into %+v", parts)
	}
	if s := survey(t, text, SurveyRequest{}); s.Column("id").Values != 2 || len(s.Columns) != 2 {
		t.Errorf("surveyed as %+v", s.Columns)
	}
	got, err = readBoth(t, `{"id":1,`+feature(at("1,2"), `{"id":2,"n":3}`)[1:], want)
	if err != nil || got.Column("id").Level[0] != "2" {
		t.Errorf("beside a property: %+v, %v", got, err)
	}
}

// Rows without places of their own are read whatever is there for coordinates.
func TestNoPlaces(t *testing.T) {
	want := Request{Response: "n", Kind: Count, Keep: []string{"place"}, NoPlaces: true}
	for name, text := range map[string]string{
		"f.csv":       "place,n,x,y,easting,northing\nA,1,no,no,no,no\nB,2,,,,\n",
		"f.geojson":   collection(feature("null", `{"place":"A","n":1}`), feature(at("1,99"), `{"place":"B","n":2}`)),
		"foreign crs": `{"crs":{"properties":{"name":"EPSG:2056"}},` + feature(at("1,99"), `{"place":"A","n":1}`)[1:] + feature("null", `{"place":"B","n":2}`),
	} {
		got, err := readFile(name, text, want)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		x, y := got.XY()
		if got.Len() != 2 || len(got.Geometry) != 2 || got.Geometry[0] != nil || !math.IsNaN(x[1]) || !math.IsNaN(y[1]) || got.GeometryName != "" || got.XName != "" || got.Degrees || got.CRS != "" {
			t.Errorf("%s: got %+v", name, got)
		}
	}
}

func TestRequestsForPlaces(t *testing.T) {
	for _, tt := range []struct {
		want      Request
		err, hint string
	}{
		{Request{Geometry: "g", X: "x", Y: "y"}, `f: column "g": a column of geometries is named beside coordinate columns`, `name either --geometry or --x and --y`},
		{Request{NoPlaces: true, X: "x", Y: "y"}, `f: rows have no places of their own, but columns are named for them`, `leave out --x and --y, and --geometry`},
		{Request{NoPlaces: true, Geometry: "g"}, `f: rows have no places of their own, but columns are named for them`, `leave out --x and --y, and --geometry`},
		{Request{Response: "g", Kind: Measure, Geometry: "g"}, `f: column "g": cannot be both the response and the geometry`, ``},
	} {
		if _, err := readFile("f", "g,x,y\n1,2,3\n", tt.want); err == nil || err.Error() != tt.err || hint(err) != tt.hint {
			t.Errorf("got %v (%s), want %s (%s)", err, hint(err), tt.err, tt.hint)
		}
	}
}

func TestColumns(t *testing.T) {
	for text, want := range map[string][]string{
		" a ,b,,z\n":    {"a", "b", "", "z"},
		"a;b\n1;2;3;\n": {"a", "b"},
		feature(at("1,2"), `{"a":1}`) + feature(square, `{"ü":1,"a":2}`): {"a", "ü"},
		feature(at("1,2"), `{"a":1}`) + feature(at("1,2,3"), `{}`):       {"a", "z"},
		feature(at("1,2,3"), `{"z":1,"a":1}`):                            {"z", "a"},
		at("1,2"):                                                        {},
	} {
		got, err := Columns(strings.NewReader(text), "f", Format{})
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(want, got, cmpopts.EquateEmpty()); diff != "" {
			t.Errorf("%q (-want +got):\n%s", text, diff)
		}
		shared, err := Whole(strings.NewReader(text+"1,2,3,4\n"), "f")
		if err == nil {
			if diff := cmp.Diff(want, shared.Columns(), cmpopts.EquateEmpty()); diff != "" {
				t.Errorf("%q, shared (-want +got):\n%s", text, diff)
			}
		}
	}
	for text, want := range map[string]string{
		"":                       "f: the file is empty",
		"a,a\n":                  `f: line 1, column "a": the name appears twice, as columns 1 and 2`,
		`{"type":"Feature"} [1]`: `f: line 1: the text is a list, not a GeoJSON object`,
	} {
		if _, err := Columns(strings.NewReader(text), "f", Format{}); err == nil || err.Error() != want {
			t.Errorf("%q: got %v, want %s", text, err, want)
		}
	}
	if _, err := Columns(strings.NewReader("a,b\n"), "f", Format{Separator: '.'}); err == nil {
		t.Error("a separator that cannot be is taken")
	}
}

func BenchmarkReadGeoJSON(b *testing.B) {
	const n = 100_000
	var text strings.Builder
	for i := range n {
		fmt.Fprintf(&text, `{"type":"Feature","geometry":{"type":"Point","coordinates":[%.6f,%.6f]},"properties":{"name":"Ort %d","n":%d,"depth":%.3f}}`+"\n",
			float64(i%1000)/7, float64(i/1000)/7, i, i%9, float64(i)/3)
	}
	want := Request{Response: "n", Kind: Count, Linear: []string{"depth"}}
	b.SetBytes(int64(text.Len()))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := readFile("f", text.String(), want); err != nil {
			b.Fatal(err)
		}
	}
}

package vector

import (
	"errors"
	"fmt"
	"io"
	"math"
	"runtime"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/paulmach/orb"
)

func observations(text string) (*Observations, error) {
	return ReadObservations(strings.NewReader(text), "wells.geojson", nil)
}

// onePoint is a feature at (1, 2) without properties.
const onePoint = `{"type":"Feature","geometry":{"type":"Point","coordinates":[1,2]},"properties":null}`

func geometry(kind, coordinates string) string {
	return `{"type":"` + kind + `","coordinates":` + coordinates + `}`
}

// The example of RFC 7946 section 1.5.
const example = `{
       "type": "FeatureCollection",
       "features": [{
           "type": "Feature",
           "geometry": {
               "type": "Point",
               "coordinates": [102.0, 0.5]
           },
           "properties": {
               "prop0": "value0"
           }
       }, {
           "type": "Feature",
           "geometry": {
               "type": "LineString",
               "coordinates": [
                   [102.0, 0.0],
                   [103.0, 1.0],
                   [104.0, 0.0],
                   [105.0, 1.0]
               ]
           },
           "properties": {
               "prop0": "value0",
               "prop1": 0.0
           }
       }, {
           "type": "Feature",
           "geometry": {
               "type": "Polygon",
               "coordinates": [
                   [
                       [100.0, 0.0],
                       [101.0, 0.0],
                       [101.0, 1.0],
                       [100.0, 1.0],
                       [100.0, 0.0]
                   ]
               ]
           },
           "properties": {
               "prop0": "value0",
               "prop1": {
                   "this": "that"
               }
           }
       }]
   }`

func TestReadObservationsExample(t *testing.T) {
	got, err := observations(example)
	if err != nil {
		t.Fatal(err)
	}
	want := &Observations{
		Source: "wells.geojson", Names: []string{"prop0", "prop1"}, Line: []int32{3, 12, 27},
		Geometry: []orb.Geometry{orb.Point{102, 0.5}, orb.LineString{{102, 0}, {103, 1}, {104, 0}, {105, 1}},
			orb.Polygon{{{100, 0}, {101, 0}, {101, 1}, {100, 1}, {100, 0}}}},
		Z: []float64{math.NaN(), math.NaN(), math.NaN()}, Fault: make([]*Fault, 3),
	}
	if diff := cmp.Diff(want, got, cmpopts.EquateNaNs(), cmpopts.IgnoreUnexported(Observations{})); diff != "" {
		t.Error(diff)
	}
	cells := [][]string{{"value0", ""}, {"value0", "0.0"}, {"value0", `{"this":"that"}`}}
	for i, want := range cells {
		if diff := cmp.Diff(want, got.Cells(nil, i)); diff != "" {
			t.Error(diff)
		}
	}
}

// The geometries of RFC 7946 appendix A, and some more.
func TestReadObservationsGeometries(t *testing.T) {
	nan := math.NaN()
	tests := []struct {
		name, text string
		want       orb.Geometry
		z          float64
	}{
		{"A.1", geometry("Point", `[100.0, 0.0]`), orb.Point{100, 0}, nan},
		{"A.2", geometry("LineString", `[[100.0, 0.0],[101.0, 1.0]]`), orb.LineString{{100, 0}, {101, 1}}, nan},
		{"A.3 with a hole", geometry("Polygon", `[[[100.0, 0.0],[101.0, 0.0],[101.0, 1.0],[100.0, 1.0],[100.0, 0.0]],
			[[100.8, 0.8],[100.8, 0.2],[100.2, 0.2],[100.2, 0.8],[100.8, 0.8]]]`),
			orb.Polygon{{{100, 0}, {101, 0}, {101, 1}, {100, 1}, {100, 0}}, {{100.8, 0.8}, {100.8, 0.2}, {100.2, 0.2}, {100.2, 0.8}, {100.8, 0.8}}}, nan},
		{"A.4", geometry("MultiPoint", `[[100.0, 0.0],[101.0, 1.0]]`), orb.MultiPoint{{100, 0}, {101, 1}}, nan},
		{"A.5", geometry("MultiLineString", `[[[100.0, 0.0],[101.0, 1.0]],[[102.0, 2.0],[103.0, 3.0]]]`),
			orb.MultiLineString{{{100, 0}, {101, 1}}, {{102, 2}, {103, 3}}}, nan},
		{"two polygons", geometry("MultiPolygon", `[[[[0,0],[1,0],[1,1],[0,0]]],[[[5,5],[6,5],[6,6],[5,5]]]]`),
			orb.MultiPolygon{{{{0, 0}, {1, 0}, {1, 1}, {0, 0}}}, {{{5, 5}, {6, 5}, {6, 6}, {5, 5}}}}, nan},
		{"clockwise", geometry("Polygon", `[[[0,0],[9,9],[9,0],[0,0]],[[4,1],[5,1],[5,2],[4,1]]]`),
			orb.Polygon{{{0, 0}, {9, 0}, {9, 9}, {0, 0}}, {{4, 1}, {5, 2}, {5, 1}, {4, 1}}}, nan},
		{"height", geometry("Point", ` [ 1e2 , -5 , 12.75 , 9 ] `), orb.Point{100, -5}, 12.75},
		{"heights of points", geometry("MultiPoint", `[[1,2,3]]`), orb.MultiPoint{{1, 2}}, nan},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			for _, text := range []string{test.text, feature(test.text, "{}"), collection(feature(test.text, "{}"))} {
				got, err := observations(text)
				if err != nil {
					t.Fatal(err)
				}
				if diff := cmp.Diff([]any{test.want, test.z}, []any{got.Geometry[0], got.Z[0]}, cmpopts.EquateNaNs()); diff != "" || got.Fault[0] != nil {
					t.Errorf("%v %s", got.Fault[0], diff)
				}
			}
		})
	}
}

// Texts come one a line, one after the other, in sequences with record separators (RFC 8142 section 2), and mixed.
func TestReadObservationsSequences(t *testing.T) {
	for name, text := range map[string]string{
		"lines":      onePoint + "\n" + onePoint + "\r\n\r\n" + onePoint,
		"mark":       "\xef\xbb\xbf" + onePoint + "\n" + onePoint + "\n" + onePoint + "\n",
		"separators": "\x1e" + onePoint + "\n\x1e" + onePoint + "\n\x1e\x1e" + onePoint + "\n",
		"joined":     onePoint + onePoint + onePoint,
		"mixed":      collection(onePoint, onePoint) + "\n" + geometry("Point", "[1,2]"),
		"late type":  `{"features":[` + onePoint + "," + onePoint + "," + onePoint + `],"bbox":[1,2,1,2],"type":"FeatureCollection"}`,
	} {
		t.Run(name, func(t *testing.T) {
			got, err := ReadObservations(iotest.OneByteReader(strings.NewReader(text)), "a", nil)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff([]orb.Geometry{orb.Point{1, 2}, orb.Point{1, 2}, orb.Point{1, 2}}, got.Geometry); diff != "" {
				t.Error(diff)
			}
		})
	}
}

func TestReadObservationsCells(t *testing.T) {
	point := geometry("Point", "[1,2]")
	text := `{"type":"Feature","id":"a\"1","geometry":` + point + `,"properties":{"n":12345678901234567890.10,"ok":true,"no":null,"s":" \u00e9\\ "}}` +
		`{"type":"Feature","id":7,"geometry":` + point + `,"properties":{"new\tname":[1, {"a" : "]}"}],"n":"1","n":-1E+5,"skip":"x"}}` +
		onePoint
	got, err := ReadObservations(strings.NewReader(text), "a", func(name string) bool { return name != "skip" })
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]string{"n", "ok", "no", "s", "new\tname", "skip"}, got.Names); diff != "" {
		t.Error(diff)
	}
	want := [][]string{
		{"12345678901234567890.10", "true", "", " é\\ ", "", ""},
		{"-1E+5", "", "", "", `[1,{"a":"]}"}]`, ""},
		{"", "", "", "", "", ""},
	}
	var cells []string
	for i, id := range []string{`a"1`, "7", ""} {
		cells = got.Cells(cells, i)
		if diff := cmp.Diff(want[i], cells); diff != "" || got.ID(i) != id {
			t.Errorf("row %d, id %q: %s", i, got.ID(i), diff)
		}
	}
}

func TestReadObservationsCRS(t *testing.T) {
	const crs = `"crs":{"type":"name","properties":{"name":"EPSG:25832"}}`
	for name, text := range map[string]string{
		"collection before": `{"type":"FeatureCollection",` + crs + `,"features":[` + onePoint + `]}`,
		"collection behind": `{"type":"FeatureCollection","features":[` + onePoint + `],` + crs + `}`,
		"feature":           `{` + crs + `,` + onePoint[1:] + onePoint,
		"geometry":          feature(`{"type":"Point","coordinates":[1,2],`+crs+`}`, "{}"),
		"bare geometry":     `{"type":"Point","coordinates":[1,2],` + crs + `}`,
	} {
		if got, err := observations(text); err != nil || got.CRS != "EPSG:25832" {
			t.Errorf("%s: %v, %v", name, got, err)
		}
	}
}

// A feature with a fault is a row without geometry; those around it are read.
func TestReadObservationsFaults(t *testing.T) {
	tests := []struct{ name, geometry, code, want string }{
		{"null", `null`, faultMissing, `has no geometry`},
		{"no coordinates", `{"type":"Point"}`, faultBad, `its geometry has no "coordinates"`},
		{"null coordinates", geometry("Point", `null`), faultBad, `its geometry has no "coordinates"`},
		{"empty point", geometry("Point", `[]`), faultEmpty, `its geometry is empty`},
		{"empty polygons", geometry("MultiPolygon", ` [ ] `), faultEmpty, `its geometry is empty`},
		{"one number", geometry("Point", `[1]`), faultBad, `its geometry has 1 number, and a position needs 2`},
		{"text", geometry("Point", `["1",2]`), faultBad, `its geometry holds something that is not a number`},
		{"text for a height", geometry("Point", `[1,2,"3"]`), faultBad, `its geometry holds something that is not a number`},
		{"infinite", geometry("MultiPoint", `[[1,2],[1,1e999]]`), faultBad, `position 2: holds 1e999, which is not finite`},
		{"too flat", geometry("LineString", `[1,2]`), faultBad, `position 1: is not a list`},
		{"short line", geometry("MultiLineString", `[[[1,2],[3,4]],[[1,2]]]`), faultBad, `line 2: has 1 position, and a line needs 2 or more`},
		{"empty ring", geometry("Polygon", `[[]]`), faultBad, `ring 1: has 0 positions, and a ring needs 4 or more`},
		{"open ring", geometry("MultiPolygon", `[[[[0,0],[1,0],[1,1],[0,1]]]]`), faultBad,
			`polygon 1, ring 1: is not closed: it starts at [0 0] and ends at [0 1]`},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got, err := observations(collection(onePoint, feature(test.geometry, `{"a":1}`), onePoint))
			if err != nil {
				t.Fatal(err)
			}
			if got.Fault[0] != nil || got.Fault[2] != nil || got.Geometry[2] == nil || got.Geometry[1] != nil || !math.IsNaN(got.Z[1]) {
				t.Fatalf("%+v", got)
			}
			fault := got.Fault[1]
			message := strings.Replace(fault.Error(), "feature 2, ", "feature 2: ", 1)
			if want := "wells.geojson: line 2: feature 2: " + test.want; message != want || fault.Code != test.code || fault.Hint() != adviceSkip {
				t.Errorf("%s %s %s\nwant %s", fault.Code, message, fault.Hint(), want)
			}
			if got.Cells(nil, 1)[0] != "1" {
				t.Error("the properties are lost")
			}
		})
	}
}

// Each refusal is pinned word for word, since these sentences are all the user gets.
func TestReadObservationsRefusals(t *testing.T) {
	collected := `{"type":"GeometryCollection","geometries":[]}`
	tests := []struct{ name, text, err, hint string }{
		{"no bytes", "", `the file is empty`, adviceWhole},
		{"blanks", "\xef\xbb\xbf \n", `the file has no features`, adviceWhole},
		{"no features", collection(), `the file has no features`, adviceWhole},
		{"utf-16", "\xff\xfe{\x00", `the file is UTF-16 text, and only UTF-8 is read`, `save the file in UTF-8`},
		{"gzip", "\x1f\x8b\x08", `the file is compressed with gzip`, `unpack it first`},
		{"latin-1", onePoint + "\n{\"type\":\n\"\xe9\"}", `line 3: feature 2: the text is not UTF-8`, `save the file in UTF-8`},
		{"list", "\n[" + onePoint + "]", `line 2: the text is a list, not a GeoJSON object`, adviceFeatures},
		{"commas", onePoint + ",\n" + onePoint, `line 1: a comma stands between two GeoJSON objects`,
			`put the features into a FeatureCollection, or leave out the commas between them`},
		{"CSV", "name,x,y\n", `line 1: the text is not a GeoJSON object: it starts with 'n'`, adviceFeatures},
		{"no type", `{"TYPE":"Point"}`, `line 1: feature 1: the object has no "type", so it is not GeoJSON`, adviceFeatures},
		{"nothing", `{}`, `line 1: feature 1: the object has no "type", so it is not GeoJSON`, adviceFeatures},
		{"topology", `{"type":"Topology"}`, `line 1: feature 1: the object is a "Topology", which is not a kind of geometry in GeoJSON`, adviceFeatures},
		{"collection of geometries", collected, `line 1: feature 1: the object is a GeometryCollection, which is not read`, adviceMixed},
		{"feature of a collection", collection(onePoint, feature(collected, "{}")),
			`line 2: feature 2: its geometry is a GeometryCollection, which is not read`, adviceMixed},
		{"unknown geometry", feature(geometry("Circle", "[1,2]"), "{}"),
			`line 1: feature 1: its geometry is a "Circle", which is not a kind of geometry in GeoJSON`, adviceFeatures},
		{"geometry in a list", collection(onePoint, geometry("Point", "[1,2]")), `line 2: feature 2: not an object of type "Feature"`, adviceFeatures},
		{"number in a list", collection(onePoint, "7"), `line 2: feature 2: not an object of type "Feature"`, adviceFeatures},
		{"features are no list", `{"type":"FeatureCollection","features":{}}`,
			`line 1: an object of type "FeatureCollection", where a FeatureCollection has a list of "features" and nothing else has`, adviceFeatures},
		{"features of a feature", `{"type":"Feature","features":[` + onePoint + `]}`,
			`line 1: an object of type "Feature", where a FeatureCollection has a list of "features" and nothing else has`, adviceFeatures},
		{"geometry is text", feature(`"here"`, "{}"), `line 1: feature 1: its geometry is not an object`, adviceFeatures},
		{"properties are a list", feature(geometry("Point", "[1,2]"), "[]"), `line 1: feature 1: its "properties" are not an object`, adviceFeatures},
		{"id is a list", `{"id":[],` + onePoint[1:], `line 1: feature 1: its "id" is neither a string nor a number`, adviceFeatures},
		{"cut short", onePoint + "\n\n" + onePoint[:40], `line 3: feature 2: the file ends before what starts here does`, adviceWhole},
		{"cut short in a list", "{\"type\":\"FeatureCollection\",\n\"features\":[\n" + onePoint + ",", `line 3: feature 2: the file ends before what starts here does`, adviceWhole},
		{"cut short in a sequence", "\x1e" + onePoint + "\n\x1e{\"a\":[\x1e" + onePoint, `line 2: feature 2: is cut short: a record separator comes before its end`, adviceWhole},
		{"comma", collection(onePoint, "{\"type\":\n\"Feature\",}"),
			`line 3: feature 2: not JSON: invalid character '}' looking for beginning of object key string`, adviceWhole},
		{"comma at the end", collection(onePoint, ""), `line 2: feature 2: not JSON: a value was expected, and ']' stands there`, adviceWhole},
		{"comma at the end of a text", "{\"type\":\"Feature\",\n}", `line 2: feature 1: not JSON: a value was expected, and '}' stands there`, adviceWhole},
		{"no colon", `{"type" "Feature"}`, `line 1: feature 1: not JSON: ':' was expected, and '"' stands there`, adviceWhole},
		{"no name", `{7:8}`, `line 1: feature 1: not JSON: the name of a member was expected`, adviceWhole},
		{"no comma", strings.Replace(collection(onePoint, onePoint), "},\n{", "}\n{", 1), `line 2: not JSON: ']' was expected, and '{' stands there`, adviceWhole},
		{"deep", feature("\n"+strings.Repeat("[", 65), "{}"), `line 2: feature 1: nested more than 64 deep`, adviceFeatures},
		{"two systems", `{"crs":{"a":1},` + onePoint[1:] + "\n" + `{"crs":{"b":2},` + onePoint[1:],
			`line 2: feature 2: its "crs" is "{\"b\":2}", and that of features before is "{\"a\":1}"`, "bring all features into one reference system"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got, err := observations(test.text)
			if err == nil || got != nil {
				t.Fatalf("%v and %+v", err, got)
			}
			if want := "wells.geojson: " + test.err; err.Error() != want || hint(err) != test.hint {
				t.Errorf("got  %s\nwant %s\nhint %s", err, want, hint(err))
			}
		})
	}
}

func TestReadObservationsLimits(t *testing.T) {
	long := feature(geometry("Point", "[1,2]"), `{"s":"`+strings.Repeat("x", 300)+`"}`)
	_, err := readObservations(strings.NewReader(collection(onePoint, long)), "a", nil, 200)
	if want := "a: line 2: feature 2: takes more than 200 bytes, the most that is read of one feature"; err == nil || err.Error() != want {
		t.Error(err)
	}
	if _, err := readObservations(strings.NewReader(strings.Repeat(onePoint+"\n", 10)+collection(onePoint, onePoint)), "a", nil, 200); err != nil {
		t.Error(err)
	}
	var many []string
	for i := range maxNames + 1 {
		many = append(many, fmt.Sprintf(`"%d":1`, i))
	}
	_, err = observations(feature("null", "{"+strings.Join(many, ",")+"}"))
	if want := "wells.geojson: line 1: feature 1: there are more than 4096 different names of properties"; err == nil || err.Error() != want {
		t.Error(err)
	}
	broken := io.MultiReader(strings.NewReader(onePoint+"{"), iotest.ErrReader(io.ErrClosedPipe))
	if _, err := ReadObservations(broken, "a", nil); !errors.Is(err, io.ErrClosedPipe) {
		t.Error(err)
	}
}

// repeated gives a text over and over.
type repeated struct {
	text string
	left int
	rest string
}

func (r *repeated) Read(p []byte) (int, error) {
	if r.rest == "" {
		if r.left == 0 {
			return 0, io.EOF
		}
		r.left--
		r.rest = r.text
	}
	n := copy(p, r.rest)
	r.rest = r.rest[n:]
	return n, nil
}

// What is not kept takes no memory: here all but the places, the lines and an entry a row.
func TestReadObservationsMemory(t *testing.T) {
	text := feature(geometry("Point", "[1,2]"), `{"s":"`+strings.Repeat("x", 10000)+`"}`) + "\n"
	const n = 600
	var before, after runtime.MemStats
	runtime.GC()
	runtime.ReadMemStats(&before)
	got, err := ReadObservations(&repeated{text: text, left: n}, "a", func(string) bool { return false })
	runtime.ReadMemStats(&after)
	if err != nil || got.Len() != n {
		t.Fatal(err)
	}
	if grown := after.TotalAlloc - before.TotalAlloc; grown > 2*n*uint64(len(text)) {
		t.Errorf("%d bytes for %d features of %d bytes", grown, n, len(text))
	}
	runtime.GC()
	runtime.ReadMemStats(&after)
	if held := int64(after.HeapAlloc) - int64(before.HeapAlloc); held > 1000*n {
		t.Errorf("%d bytes held for %d features", held, n)
	}
	runtime.KeepAlive(got)
}

// Texts of many small parts take no more than 64 times their size.
func TestReadObservationsAllocates(t *testing.T) {
	var own []string
	for i := range 4000 {
		own = append(own, feature("null", fmt.Sprintf(`{"%d":1}`, i)))
	}
	for name, text := range map[string]string{
		"points":    geometry("MultiPoint", "["+strings.Repeat("[1,2],", 20000)+"[1,2]]"),
		"rings":     geometry("Polygon", "["+strings.Repeat("[],", 20000)+"[]]"),
		"features":  strings.Repeat(onePoint, 2000),
		"own names": collection(own...),
		"members":   feature("null", "{"+strings.Repeat(`"a":1,`, 20000)+`"a":2}`),
	} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		observations(text)
		runtime.ReadMemStats(&after)
		if grown := after.TotalAlloc - before.TotalAlloc; grown > uint64(1<<17+64*len(text)) {
			t.Errorf("%s: %d bytes took %d", name, len(text), grown)
		}
	}
}

// FuzzReadObservations holds every feature to what its documentation promises, and every refusal to being one
// readable line.
func FuzzReadObservations(f *testing.F) {
	f.Add(example)
	f.Add("\x1e" + onePoint + "\n\x1e" + `{"type":"MultiPolygon","coordinates":[[[[0,0],[1,0],[1,1],[0,0]]]]}`)
	f.Add(`{"features":[{"type":"Feature","id":1e3,"geometry":null,"properties":{"a":{"b":[null]},"c":"\ud800"}}],"type":"FeatureCollection"}`)
	f.Add(feature(geometry("LineString", "[[1,2,3],[4,5]]"), `{"a":true}`) + "\r\n" + geometry("Point", "[]"))
	f.Add(`{"type":"Feature","geometry":{"type":"GeometryCollection","geometries":[]}}`)
	f.Fuzz(func(t *testing.T, text string) {
		o, err := observations(text)
		if err != nil {
			if o != nil {
				t.Fatal("an error and features")
			}
			checkLine(t, err.Error())
			checkLine(t, hint(err))
			return
		}
		n := o.Len()
		if n == 0 || len(o.Line) != n || len(o.Geometry) != n || len(o.Z) != n || len(o.Fault) != n {
			t.Fatalf("%+v", o)
		}
		for i, g := range o.Geometry {
			if (g == nil) != (o.Fault[i] != nil) || math.IsInf(o.Z[i], 0) || len(o.Cells(nil, i)) != len(o.Names) {
				t.Fatalf("row %d: %v, %v, %v", i, g, o.Z[i], o.Fault[i])
			}
			if fault := o.Fault[i]; fault != nil {
				checkLine(t, fault.Error())
				continue
			}
			CheckArea(g)
			if b := g.Bound(); !(b.Min[0] <= b.Max[0]) || math.IsInf(b.Min[0], 0) || math.IsInf(b.Max[1], 0) {
				t.Fatalf("row %d: %v", i, g)
			}
		}
	})
}

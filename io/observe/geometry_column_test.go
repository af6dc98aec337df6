package observe

import (
	"encoding/binary"
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/ewkb"
	"github.com/paulmach/orb/encoding/wkt"
)

var shapesOfAllKinds = []orb.Geometry{
	orb.Point{10.25, -1e-7}, orb.MultiPoint{{1, 2}, {3, 4}}, orb.LineString{{0, 0}, {3, 4}}, orb.MultiLineString{{{0, 0}, {3, 4}}, {{1, 1}, {1, 2}}},
	orb.Polygon{{{0, 0}, {4, 0}, {4, 4}, {0, 4}, {0, 0}}, {{1, 1}, {1, 2}, {2, 2}, {1, 1}}},
	orb.MultiPolygon{{{{0, 0}, {4, 0}, {4, 4}, {0, 0}}}, {{{7, 7}, {8, 7}, {8, 8}, {7, 7}}}},
}

// What another library writes is read as what it wrote, in both texts, and points and polygons in one table.
func TestGeometryColumn(t *testing.T) {
	for _, axes := range []Axes{AxesByName, AxesDegrees, AxesPlane} {
		for _, srid := range []int{0, 4326, 32633} {
			var b strings.Builder
			b.WriteString("n;shape\n")
			for i, g := range shapesOfAllKinds {
				hex, err := ewkb.MarshalToHex(g, srid, []binary.ByteOrder{binary.LittleEndian, binary.BigEndian}[i%2])
				if err != nil {
					t.Fatal(err)
				}
				text := wkt.MarshalString(g)
				if srid > 0 {
					text = fmt.Sprintf("SRID=%d;%s", srid, text)
				}
				fmt.Fprintf(&b, "%d; %s\n%d;\"%s\"\n", i, hex, i, text)
			}
			want := Request{Response: "n", Kind: Count, Geometry: "shape", Axes: axes, Format: Format{Separator: ';'}}
			got, err := readBoth(t, b.String(), want)
			if err != nil {
				t.Fatal(err)
			}
			if len(got.Geometry) != 2*len(shapesOfAllKinds) {
				t.Fatalf("%d geometries", len(got.Geometry))
			}
			for i, g := range got.Geometry {
				if !orb.Equal(g, shapesOfAllKinds[i/2]) {
					t.Errorf("row %d is %v, not %v", i+1, g, shapesOfAllKinds[i/2])
				}
			}
			crs := map[int]string{4326: "EPSG:4326", 32633: "EPSG:32633"}[srid]
			if degrees := axes == AxesDegrees || axes == AxesByName && srid == 4326; got.Degrees != degrees || got.CRS != crs || got.GeometryName != "shape" || got.XName != "" {
				t.Errorf("axes %d, SRID %d: degrees %v, system %q, column %q", axes, srid, got.Degrees, got.CRS, got.GeometryName)
			}
		}
	}
}

func TestGeometryColumnAside(t *testing.T) {
	for _, tt := range []struct {
		name, field, n, code, reason, value string
	}{
		{"nothing", " ", "1", "missing-geometry", "geometry is missing", ""},
		{"a mark", "null", "1", "missing-geometry", "geometry is missing", "null"},
		{"no positions", "POLYGON EMPTY", "1", "missing-geometry", "geometry is missing", "POLYGON EMPTY"},
		{"a word", "Upper Vale", "1", "bad-geometry", `geometry cannot be read: character 1: "UPPER" is not a kind of geometry`, "Upper Vale"},
		{"cut short", "POINT (1", "1", "bad-geometry", "geometry cannot be read: character 9: a number was expected, and the text ends", "POINT (1"},
		{"a long one", "POINT (" + strings.Repeat("1", 80), "1", "bad-geometry", "geometry cannot be read: character 88: a number was expected, and the text ends",
			"POINT (" + strings.Repeat("1", 53) + "..."},
		{"one position", "LINESTRING (1 2 -2e9 0)", "1", "bad-geometry", "geometry cannot be read: character 23: the line that ends here has 1 position, and a line needs 2 or more",
			"LINESTRING (1 2 -2e9 0)"},
		{"bow-tie", "\"POLYGON ((0 0, 2 2, 2 0, 0 2, 0 0))\"", "1", "bad-geometry", "geometry cannot be read: the polygon crosses itself near (1.000, 1.000)",
			"POLYGON ((0 0, 2 2, 2 0, 0 2, 0 0))"},
		{"too far off", "POINT (2e9 0)", "1", "coordinates-out-of-range", "coordinate is beyond -1e9 to 1e9 metres", "POINT (2e9 0)"},
		{"no response before it", "nowhere", "", "missing-response", "response is missing", ""},
	} {
		t.Run(tt.name, func(t *testing.T) {
			text := "n,g\n1,POINT (1 2)\n" + tt.n + "," + tt.field + "\n3,POINT (3 4)\n"
			got, err := readBoth(t, text, Request{Response: "n", Kind: Measure, Geometry: "g"})
			if err != nil {
				t.Fatal(err)
			}
			if len(got.Aside) != 1 {
				t.Fatalf("set aside are %+v", got.Aside)
			}
			a := got.Aside[0]
			if a.Code != tt.code || a.Reason != tt.reason || a.Value != tt.value || a.Row != 2 {
				t.Errorf("got %+v", a)
			}
		})
	}
}

func TestGeometryColumnRefusals(t *testing.T) {
	for _, tt := range []struct {
		name, rows string
		axes       Axes
		err, hint  string
	}{
		{"absent", "1\tPOINT (1 2)\n", AxesByName, `wells.csv: line 1: no column "g" for the geometry`, `did you mean "n"? the columns are n, shape`},
		{"two systems", "1\tSRID=4326;POINT (1 2)\n2\tSRID=32633;POINT (1 2)\n", AxesByName,
			`wells.csv: row 2 (line 3), column "g": its reference system is SRID 32633, and that of row 1 is SRID 4326`, `bring all geometries into one reference system`},
		{"one system and none", "1\t\n1\tPOINT (1 2)\n2\tSRID=4326;POINT (1 2)\n", AxesPlane,
			`wells.csv: row 3 (line 4), column "g": its reference system is SRID 4326, and that of row 2 is not named`, `bring all geometries into one reference system`},
		{"also where the row is set aside", "1\tSRID=4326;POINT (1 2)\n\tPOINT (1 2)\n", AxesByName,
			`wells.csv: row 2 (line 3), column "g": its reference system is not named, and that of row 1 is SRID 4326`, `bring all geometries into one reference system`},
		{"latitude", "1\tSRID=4326;POINT (1 2)\n\tSRID=4326;POINT (48 91.5)\n", AxesByName,
			`wells.csv: row 2 (line 3), column "g": 91.5 is not a latitude (-90 to 90)`, adviceGeometries},
		{"latitude as said", "1\tPOINT (48 91.5)\n", AxesDegrees, `wells.csv: row 1 (line 2), column "g": 91.5 is not a latitude (-90 to 90)`, adviceGeometries},
		{"longitude", "1\tPOINT (480 1.5)\n", AxesDegrees, `wells.csv: row 1 (line 2), column "g": 480 is not a longitude (-360 to 360)`, adviceGeometries},
		{"curves", "1\tCIRCULARSTRING (0 0, 1 1, 2 0)\n", AxesByName,
			`wells.csv: 1 of 1 rows cannot be used, more than half: column "g", geometry cannot be read (1); ` +
				`for example row 1 (line 2), where geometry cannot be read: character 1: a CIRCULARSTRING is not read: "CIRCULARSTRING (0 0, 1 1, 2 0)"`,
			`read are points, lines and polygons, and several of one of these: straighten curves, and take collections apart`},
		{"the wrong column", "1\t7\n2\t8\n3\t\n", AxesByName,
			`wells.csv: 3 of 3 rows cannot be used, more than half: column "g", geometry cannot be read (2); column "g", geometry is missing (1); ` +
				`for example row 1 (line 2), where geometry cannot be read: character 1: the number of hexadecimal digits is odd, so the text is cut short: "7"`, adviceColumn},
	} {
		t.Run(tt.name, func(t *testing.T) {
			column := "g"
			if tt.name == "absent" {
				column = "shape"
			}
			_, err := readBoth(t, "n\t"+column+"\n"+tt.rows, Request{Response: "n", Kind: Measure, Geometry: "g", Axes: tt.axes})
			if diff := cmp.Diff(tt.err+"\nhint: "+tt.hint, message(err)); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
}

// The third coordinate of points is a column z, unless the table has one.
func TestGeometryColumnHeights(t *testing.T) {
	want := Request{Response: "n", Kind: Measure, Geometry: "g", Linear: []string{"z"}, Keep: []string{"z"}}
	got, err := readBoth(t, "n,g\n1,POINT Z (1 2 3.5)\n2,POINT (1 2)\n3,POINT ZM (1 2 -4 5)\n", want)
	if err != nil {
		t.Fatal(err)
	}
	aside := []Aside{{Line: 3, Row: 2, Column: "z", Code: "missing-covariate", Reason: "covariate is missing"}}
	if diff := cmp.Diff([]Column{{Name: "n", Number: []float64{1, 3}}, {Name: "z", Number: []float64{3.5, -4}, Code: []int32{1, 0}, Level: []string{"-4", "3.5"}}}, got.Columns) +
		cmp.Diff(aside, got.Aside); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if got, err = readBoth(t, "n,g,z\n1,POINT Z (1 2 3.5),9\n", want); err != nil || got.Column("z").Number[0] != 9 {
		t.Errorf("got %+v, %v", got, err)
	}
}

// A column of geometries is one of the file, also if it is called as heights are.
func TestGeometryColumnCalledHeight(t *testing.T) {
	_, err := readBoth(t, "n,g\n1,POINT Z (1 2 3.5)\n", Request{Response: "n", Kind: Measure, Geometry: "z"})
	if err == nil || err.Error() != `wells.csv: line 1: no column "z" for the geometry` {
		t.Errorf("got %v", err)
	}
	if _, err = ReadSurvey(strings.NewReader("n,g\n1,POINT (1 2)\n"), "f", SurveyRequest{Geometry: "z"}); err == nil {
		t.Error("a survey finds the column")
	}
	if got, err := readBoth(t, "n,z\n1,POINT Z (1 2 3.5)\n", Request{Response: "n", Kind: Measure, Geometry: "z"}); err != nil || got.GeometryName != "z" {
		t.Errorf("got %+v, %v", got, err)
	}
}

// An outline of some megabytes is one field.
func TestLongGeometry(t *testing.T) {
	ring := orb.Ring{}
	const positions = 150_000
	for i := range positions {
		angle := 2 * math.Pi * float64(i) / positions
		ring = append(ring, orb.Point{100 * math.Cos(angle), 100 * math.Sin(angle)})
	}
	ring = append(ring, ring[0])
	text := "n,g\n1,\"" + wkt.MarshalString(orb.Polygon{ring}) + "\"\n"
	if len(text) < 5<<20 {
		t.Fatalf("the text has %d bytes only", len(text))
	}
	got, err := readBoth(t, text, Request{Response: "n", Kind: Measure, Geometry: "g"})
	if err != nil || !orb.Equal(got.Geometry[0], orb.Polygon{ring}) {
		t.Errorf("not read as it is: %v", err)
	}
	x, y := got.XY()
	if math.Hypot(x[0], y[0]) > 1e-9 {
		t.Errorf("the middle of a circle around the origin is at %g, %g", x[0], y[0])
	}
}

// One place for each kind of geometry, by hand.
func TestMiddle(t *testing.T) {
	table := &Table{}
	for _, tt := range []struct {
		name string
		g    orb.Geometry
		want orb.Point
	}{
		{"point", orb.Point{3, 4}, orb.Point{3, 4}},
		{"points", orb.MultiPoint{{0, 0}, {3, 0}, {0, 6}}, orb.Point{1, 2}},
		{"line", orb.LineString{{0, 0}, {6, 0}, {6, 2}}, orb.Point{(6*3 + 2*6) / 8.0, 2 * 1 / 8.0}},
		{"lines", orb.MultiLineString{{{0, 0}, {6, 0}}, {{10, 10}, {10, 12}}, {{5, 5}, {5, 5}}}, orb.Point{(6*3 + 2*10) / 8.0, 2 * 11 / 8.0}},
		{"a line without length", orb.LineString{{7, 1}, {7, 1}}, orb.Point{7, 1}},
		{"square", orb.Polygon{{{0, 0}, {2, 0}, {2, 2}, {0, 2}, {0, 0}}}, orb.Point{1, 1}},
		{"a hole", orb.Polygon{{{0, 0}, {4, 0}, {4, 4}, {0, 4}, {0, 0}}, {{0, 0}, {0, 2}, {2, 2}, {2, 0}, {0, 0}}}, orb.Point{(16*2 - 4*1) / 12.0, (16*2 - 4*1) / 12.0}},
		{"polygons", orb.MultiPolygon{{{{0, 0}, {2, 0}, {2, 2}, {0, 2}, {0, 0}}}, {{{10, 0}, {11, 0}, {11, 1}, {10, 1}, {10, 0}}}}, orb.Point{(4*1 + 10.5) / 5, (4*1 + 0.5) / 5}},
		{"a polygon without area", orb.MultiPolygon{{{{5, 5}, {9, 5}, {5, 5}, {5, 5}}}}, orb.Point{7, 5}},
		{"a polygon without length", orb.Polygon{{{5, 5}, {5, 5}, {5, 5}, {5, 5}}}, orb.Point{5, 5}},
		{"none", nil, orb.Point{math.NaN(), math.NaN()}},
	} {
		table.Row, table.Geometry = []int32{1}, []orb.Geometry{tt.g}
		x, y := table.XY()
		if !(math.Hypot(x[0]-tt.want[0], y[0]-tt.want[1]) <= 1e-12) && !(tt.g == nil && math.IsNaN(x[0]) && math.IsNaN(y[0])) {
			t.Errorf("%s: got %v, %v, want %v", tt.name, x[0], y[0], tt.want)
		}
	}
}

func TestAppendInOneSystem(t *testing.T) {
	read := func(text string) *Table {
		got, err := Read(strings.NewReader("n,g\n1,"+text+"\n"), "f", Request{Response: "n", Kind: Measure, Geometry: "g"})
		if err != nil {
			t.Fatal(err)
		}
		return got
	}
	one, same := read("SRID=32633;POINT (1 2)"), read(`"SRID=32633;POLYGON ((0 0,1 0,1 1,0 0))"`)
	if err := one.Append(same); err != nil || len(one.Geometry) != 2 {
		t.Errorf("got %v, %v", one.Geometry, err)
	}
	for text, want := range map[string]string{
		"SRID=32634;POINT (1 2)": "f: its rows cannot be added to those of f: the coordinates are in EPSG:32634, those of the other table in EPSG:32633",
		"POINT (1 2)":            "f: its rows cannot be added to those of f: the coordinates are in a system that is not named, those of the other table in EPSG:32633",
	} {
		if err := one.Append(read(text)); err == nil || err.Error() != want {
			t.Errorf("got %v, want %s", err, want)
		}
	}
}

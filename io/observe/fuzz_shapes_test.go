package observe

import (
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/paulmach/orb"
)

// FuzzReadGeoJSON holds tables of features to what is said of them, and ReadPart, ReadSurvey and Columns to Read.
func FuzzReadGeoJSON(f *testing.F) {
	f.Add(collection(feature(at("1,2,3"), `{"n":1,"of":"a","soil":"x"}`), feature(square, `{"n":"2","soil":[1]}`)), uint8(2), uint8(0))
	f.Add(feature("null", `{"n":1}`)+"\n\x1e"+at("500,4")+square, uint8(0), uint8(2))
	f.Add(`{"crs":{"properties":{"name":"urn:ogc:def:crs:EPSG::32633"}},`+feature(at("1,2"), `{"n":1.5,"soil":null,"z":true}`)[1:], uint8(1), uint8(0))
	f.Add(feature(`{"type":"MultiLineString","coordinates":[[[1,2],[3,4]]]}`, `{"n":"1,5","soil":"\u0000"}`), uint8(1), uint8(1))
	f.Fuzz(func(t *testing.T, text string, kind, axes uint8) {
		want := Request{Kind: Kind(kind % 3), Category: []string{"soil"}, Keep: []string{"of", "z"}, Axes: Axes(axes % 3), NoPlaces: axes&4 > 0, Strict: axes&8 > 0}
		if want.Kind != None {
			want.Response = "n"
		}
		checkShapes(t, " {"+text, want)
	})
}

// FuzzReadGeometryColumn does the same for a table with a column of geometries.
func FuzzReadGeometryColumn(f *testing.F) {
	f.Add("POINT Z (1 2 3)", "polygon((0 0,1 0,1 1,0 0))", uint8(0))
	f.Add("SRID=4326;POINT (1 2)", pointHex, uint8(0))
	f.Add("SRID=32633;POINT EMPTY", "0106000000FFFFFFFF", uint8(2))
	f.Add("LINESTRING(1 2,500 99)", "\"", uint8(1))
	f.Fuzz(func(t *testing.T, first, second string, axes uint8) {
		for _, text := range []string{"soil\tg\tof\na\t" + first + "\t\nb\t" + second + "\t1\n", "soil,g,of\na,\"" + first + "\",\nb,\"" + second + "\",1\n"} {
			checkShapes(t, text, Request{Category: []string{"soil"}, Keep: []string{"of", "z"}, Geometry: "g", Axes: Axes(axes % 3)})
		}
	})
}

// checkShapes reads a text in every way, and checks that the ways agree and that a table is what it should be.
func checkShapes(t *testing.T, text string, want Request) {
	table, err := Read(strings.NewReader(text), "f", want)
	if err != nil {
		if s := err.Error() + hint(err); table != nil || !utf8.ValidString(s) || strings.ContainsAny(s, "\n\r\x00") {
			t.Fatalf("refused with %q and table %v", s, table)
		}
	} else {
		checkRows(t, table, want)
	}
	shared, wholeErr := Whole(strings.NewReader(text), "f")
	if wholeErr == nil {
		part, partErr := ReadPart(shared.All(), want)
		if diff := cmp.Diff(message(err), message(partErr)) + cmp.Diff(table, part, cmpopts.EquateNaNs()); diff != "" {
			t.Fatalf("(-Read +ReadPart):\n%s", diff)
		}
		names, err := Columns(strings.NewReader(text), "f", Format{})
		if diff := cmp.Diff(shared.Columns(), names, cmpopts.EquateEmpty()); diff != "" || err != nil {
			t.Fatalf("%v (-Whole +Columns):\n%s", err, diff)
		}
	} else if err == nil {
		t.Fatalf("Read took what Whole refuses: %v", wholeErr)
	}
	s, err := ReadSurvey(strings.NewReader(text), "f", SurveyRequest{Axes: want.Axes})
	if (err == nil) != (wholeErr == nil) {
		t.Fatalf("a survey ends in %v, and Whole in %v", err, wholeErr)
	}
	if err == nil && s.Shapes != nil {
		rows := s.Shapes.Missing + s.Shapes.Bad
		for _, k := range s.Shapes.Kinds {
			rows += k.Rows
		}
		if rows != s.Rows {
			t.Fatalf("%d geometries in %d rows: %+v", rows, s.Rows, s.Shapes)
		}
	}
}

// checkRows checks the rows and the geometries of a table.
func checkRows(t *testing.T, table *Table, want Request) {
	n := table.Len()
	if n == 0 || n+len(table.Aside) != table.Rows || len(table.Geometry) != n || len(table.Line) != n {
		t.Fatalf("%d rows, %d aside of %d, %d places", n, len(table.Aside), table.Rows, len(table.Geometry))
	}
	x, y := table.XY()
	for i, g := range table.Geometry {
		if want.NoPlaces != (g == nil) {
			t.Fatalf("row %d is at %v", table.Row[i], g)
		}
		if g == nil {
			continue
		}
		if !(x[i]-x[i] == 0) || !(y[i]-y[i] == 0) {
			t.Fatalf("the middle of %v is %g, %g", g, x[i], y[i])
		}
		eachPosition(g, func(p orb.Point) {
			if table.Degrees && (max(p[0], -p[0]) > 360 || max(p[1], -p[1]) > 90) || max(p[0], -p[0], p[1], -p[1]) > 1e9 {
				t.Fatalf("row %d has a position at %v", table.Row[i], p)
			}
		})
	}
	for _, a := range table.Aside {
		if a.Code == "" || a.Reason == "" || strings.ContainsAny(a.sentence(), "\n\r\x00") {
			t.Fatalf("set aside is %+v", a)
		}
	}
}

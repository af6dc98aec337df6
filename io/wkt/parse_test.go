package wkt

import (
	"encoding/binary"
	"math"
	"runtime"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/ewkb"
	"github.com/paulmach/orb/encoding/wkt"
)

var nan = math.NaN()

// The texts in capitals without a note are those of OGC 06-103r4 section 7.2.6 (table 6) and of ISO 19125-1, from
// memory; the others are in the manner of spatial databases.
func TestParseWords(t *testing.T) {
	square := orb.Polygon{{{10, 10}, {20, 20}, {10, 20}, {10, 10}}} // turned anticlockwise
	tests := []struct {
		name, text string
		want       Place
	}{
		{"point", "POINT (10 10)", Place{orb.Point{10, 10}, nan, 0}},
		{"line", "LINESTRING ( 10 10, 20 20, 30 40)", Place{orb.LineString{{10, 10}, {20, 20}, {30, 40}}, nan, 0}},
		{"polygon", "POLYGON ((10 10, 10 20, 20 20, 20 15, 10 10))",
			Place{orb.Polygon{{{10, 10}, {20, 15}, {20, 20}, {10, 20}, {10, 10}}}, nan, 0}},
		{"multipoint", "MULTIPOINT ((10 10), (20 20))", Place{orb.MultiPoint{{10, 10}, {20, 20}}, nan, 0}},
		{"multipoint without brackets", "MULTIPOINT (10 10, 20 20)", Place{orb.MultiPoint{{10, 10}, {20, 20}}, nan, 0}},
		{"multiline", "MULTILINESTRING ((10 10, 20 20), (15 15, 30 15))",
			Place{orb.MultiLineString{{{10, 10}, {20, 20}}, {{15, 15}, {30, 15}}}, nan, 0}},
		{"multipolygon", "MULTIPOLYGON (((10 10,20 20,10 20,10 10)),((10 10,10 20,20 20,10 10)))", Place{orb.MultiPolygon{square, square}, nan, 0}},
		{"hole turned clockwise", "POLYGON((0 0,9 0,9 9,0 9,0 0),(1 1,2 1,2 2,1 1))",
			Place{orb.Polygon{{{0, 0}, {9, 0}, {9, 9}, {0, 9}, {0, 0}}, {{1, 1}, {2, 2}, {2, 1}, {1, 1}}}, nan, 0}},
		{"height", "POINT Z (10 10 5)", Place{orb.Point{10, 10}, 5, 0}},
		{"height and measure", "POINT ZM (10 10 5 40)", Place{orb.Point{10, 10}, 5, 0}},
		{"measure", "POINT M (10 10 40)", Place{orb.Point{10, 10}, nan, 0}},
		{"tag without blank", "pointzm(1 2 3 4)", Place{orb.Point{1, 2}, 3, 0}},
		{"measure without blank", "PointM(1 2 3)", Place{orb.Point{1, 2}, nan, 0}},
		{"three numbers and no tag", "POINT(1 2 3)", Place{orb.Point{1, 2}, 3, 0}},
		{"heights of a line", "LINESTRING Z (1 2 3,4 5 6)", Place{orb.LineString{{1, 2}, {4, 5}}, nan, 0}},
		{"reference system", " srid = 4326 ; Point ( 1e1 -2.5E-1 ) ", Place{orb.Point{10, -0.25}, nan, 4326}},
		{"odd numbers", "POINT(.5 +5.)", Place{orb.Point{0.5, 5}, nan, 0}},
		{"empty", "POINT EMPTY", Place{nil, nan, 0}},
		{"empty with height", "SRID=32633;LineString Z empty", Place{nil, nan, 32633}},
		{"empty parts", "MULTIPOINT (EMPTY, (1 2), EMPTY)", Place{orb.MultiPoint{{1, 2}}, nan, 0}},
		{"nothing but empty parts", "MULTIPOLYGON (EMPTY)", Place{nil, nan, 0}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got, err := Parse(test.text)
			if diff := cmp.Diff(test.want, got, cmpopts.EquateNaNs()); err != nil || diff != "" {
				t.Errorf("%v %s", err, diff)
			}
		})
	}
}

// The first two are written by hand from OGC 06-103r4 section 8.2; the others follow the flags of EWKB. 3FF0... is 1,
// 4000... 2 and 4008... 3.
func TestParseHex(t *testing.T) {
	const one, two, three = "000000000000F03F", "0000000000000040", "0000000000000840"
	const bigOne, bigTwo, bigThree = "3FF0000000000000", "4000000000000000", "4008000000000000"
	tests := []struct {
		name, text string
		want       Place
	}{
		{"little end first", "0101000000" + one + two, Place{orb.Point{1, 2}, nan, 0}},
		{"big end first", "0000000001" + bigOne + bigTwo, Place{orb.Point{1, 2}, nan, 0}},
		{"small letters and prefix", `\x` + strings.ToLower("0101000000"+one+two), Place{orb.Point{1, 2}, nan, 0}},
		{"other prefix", "0x0101000000" + one + two, Place{orb.Point{1, 2}, nan, 0}},
		{"SRID", "0101000020E6100000" + one + two, Place{orb.Point{1, 2}, nan, 4326}},
		{"height by flag", "0101000080" + one + two + three, Place{orb.Point{1, 2}, 3, 0}},
		{"measure by flag", "0101000040" + one + two + three, Place{orb.Point{1, 2}, nan, 0}},
		{"both by flags, SRID", "01010000E0E6100000" + one + two + three + one, Place{orb.Point{1, 2}, 3, 4326}},
		{"height by thousand", "01E9030000" + one + two + three, Place{orb.Point{1, 2}, 3, 0}},
		{"measure by thousand", "00000007D1" + bigOne + bigTwo + bigThree, Place{orb.Point{1, 2}, nan, 0}},
		{"both by thousand", "0000000BB9" + bigOne + bigTwo + bigThree + bigOne, Place{orb.Point{1, 2}, 3, 0}},
		{"empty point", "0101000000" + "000000000000F87F" + "000000000000F87F", Place{nil, nan, 0}},
		{"empty line", "010200000000000000", Place{nil, nan, 0}},
		{"two orders", "010400000002000000" + "0101000000" + one + two + "0000000001" + bigTwo + bigThree,
			Place{orb.MultiPoint{{1, 2}, {2, 3}}, nan, 0}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got, err := Parse(test.text)
			if diff := cmp.Diff(test.want, got, cmpopts.EquateNaNs()); err != nil || diff != "" {
				t.Errorf("%v %s", err, diff)
			}
		})
	}
}

// Each refusal is pinned word for word, since these sentences are all the user gets.
func TestParseRefusals(t *testing.T) {
	tests := []struct{ name, text, want string }{
		{"nothing", "  ", "the text is empty"},
		{"number", "12.5", `neither WKT nor EWKB in hexadecimal: "12.5"`},
		{"word", "Circle(1 2)", `character 1: "CIRCLE" is not a kind of geometry`},
		{"collection", "GEOMETRYCOLLECTION (POINT (10 10))", "character 1: a GEOMETRYCOLLECTION is not read"},
		{"curve", "CircularString Z (1 2 3, 1 2 3, 4 5 6)", "character 1: a CIRCULARSTRING is not read"},
		{"cut short", "POINT (1", "character 9: a number was expected, and the text ends"},
		{"no brackets", "POINT 1 2", `character 7: "(" or EMPTY was expected, and "1" stands there`},
		{"comma for blank", "POINT (1,2)", `character 9: a number was expected, and "," stands there`},
		{"open", "POLYGON ((0 0,1 1,1 0,0 0)", `character 27: "," or ")" was expected, and the text ends`},
		{"behind", "POINT (1 2) é", `character 13: the end of the text was expected, and "é" stands there`},
		{"behind wide blanks", "\u2003POINT (1 2) x", `character 14: the end of the text was expected, and "x" stands there`},
		{"two points", "POINT (1 2, 3 4)", "character 12: there are more positions than the kind of geometry has"},
		{"not closed", "POLYGON ((0 0,1 1,1 0,0 1))", "character 26: the ring that ends here is not closed: it starts at [0 0] and ends at [0 1]"},
		{"short ring", "POLYGON ((0 0,1 1,0 0))", "character 22: the ring that ends here has 3 positions, and a ring needs 4 or more"},
		{"short line", "LINESTRING (0 0)", "character 16: the line that ends here has 1 position, and a line needs 2 or more"},
		{"mixed", "LINESTRING (0 0, 1 1 1)", "character 18: a position has 3 numbers, where the tag or the first position has 2"},
		{"tag", "POINT Z (0 0)", "character 10: a position has 2 numbers, where the tag or the first position has 3"},
		{"five", "POINT (1 2 3 4 5)", "character 8: a position has more than 4 numbers"},
		{"NaN", "POINT (nan nan)", `character 8: a number was expected, and "nan" stands there`},
		{"infinite", "POINT (1e999 0)", "character 8: 1e999 is not finite"},
		{"no number", "POINT (1-2 0)", `character 8: "1-2" is not a number`},
		{"SRID", "SRID=1000000;POINT (1 2)", "character 6: 1000000 is not a number of a reference system (0 to 999999)"},
		{"SRID cut", "SRID=4326", `character 10: ";" after the number of the reference system was expected, and the text ends`},
		{"odd", "01010", "character 5: the number of hexadecimal digits is odd, so the text is cut short"},
		{"digit", "0101000000g0", "character 11: a hexadecimal digit was expected"},
		{"order", "0201000000", "character 1: a byte order was expected, 00 or 01, and 02 stands there"},
		{"short", "0101000000", "character 11: a position was expected, and the text ends"},
		{"count", "0102000000FFFFFF7F", "character 11: 2147483647 positions are announced, and 0 bytes follow"},
		{"count of polygons", "0106000000FFFFFFFF", "character 11: 4294967295 polygons are announced, and 0 bytes follow"},
		{"binary collection", "010700000000000000", "character 3: a GeometryCollection is not read"},
		{"kind", "0100000000", "character 3: 0 is not a kind of geometry"},
		{"thousands", "01A10F0000", "character 3: 4001 is not a kind of geometry"},
		{"part", "010400000001000000" + "0102000000" + strings.Repeat("0", 32), "character 19: a Point was expected, and a LineString stands there"},
		{"rest", "0101000000" + strings.Repeat("0", 34), "character 43: 1 bytes follow the end of the geometry"},
		{"infinite binary", "0101000000" + "000000000000F07F" + "000000000000F07F", "character 11: a position is not finite"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			p, err := Parse(test.text)
			if err == nil {
				t.Fatalf("read as %v", p)
			}
			if _, hinted := err.(interface{ Hint() string }); !hinted || err.Error() != test.want {
				t.Errorf("got  %s\nwant %s", err, test.want)
			}
		})
	}
}

var geometries = []orb.Geometry{
	orb.Point{1.25, -7e-9},
	orb.MultiPoint{{1, 2}, {3, 4}},
	orb.LineString{{0.1, 2}, {3, 4}, {3, 1e20}},
	orb.MultiLineString{{{0, 0}, {1, 1}}, {{5, 5}, {6, 6}, {7, 5}}},
	orb.Polygon{{{0, 0}, {9, 0}, {9, 9}, {0, 9}, {0, 0}}, {{1, 1}, {2, 2}, {2, 1}, {1, 1}}},
	orb.MultiPolygon{{{{0, 0}, {1, 0}, {1, 1}, {0, 0}}}, {{{5, 5}, {6, 5}, {6, 6}, {5, 5}}}},
}

// What another library writes is read as it was.
func TestParseRoundTrip(t *testing.T) {
	for _, g := range geometries {
		got, err := Parse(wkt.MarshalString(g))
		if err != nil || !orb.Equal(g, got.Geometry) {
			t.Errorf("WKT of %v read as %v, %v", g, got, err)
		}
		for _, order := range []binary.ByteOrder{binary.LittleEndian, binary.BigEndian} {
			text, err := ewkb.MarshalToHex(g, 25832, order)
			if err != nil {
				t.Fatal(err)
			}
			if got, err = Parse(text); err != nil || !orb.Equal(g, got.Geometry) || got.SRID != 25832 {
				t.Errorf("EWKB of %v read as %v, %v", g, got, err)
			}
		}
	}
}

// A text cut anywhere is refused, and the place lies within it or just behind.
func TestParseCutShort(t *testing.T) {
	for _, g := range geometries {
		binary, _ := ewkb.MarshalToHex(g, 4326)
		for _, text := range []string{wkt.MarshalString(g), binary} {
			for end := range len(text) {
				p, err := Parse(text[:end])
				if e, ok := err.(*Error); !ok || e.At < 0 || e.At > end+1 {
					t.Fatalf("%q read as %v, %v", text[:end], p, err)
				}
			}
		}
	}
}

// Nothing is allocated for what a text only announces, and a small multiple of it for what it holds.
func TestParseAllocates(t *testing.T) {
	texts := []string{
		"0102000000FFFFFF7F", "0103000000FFFFFF7F", "0106000000FFFFFF7F", "010600000001000000" + "0103000000FFFFFF00",
		"MULTIPOINT(" + strings.Repeat("1 2,", 20000) + "1 2)",
		"MULTILINESTRING(" + strings.Repeat("(1 2,1 2),", 20000) + "(1 2,3 4))",
		"010300000000100000" + strings.Repeat("00000000", 1<<12),
		"010500000000200000" + strings.Repeat("010200000000000000", 1<<13),
	}
	for _, text := range texts {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		Parse(text)
		runtime.ReadMemStats(&after)
		if grown := after.TotalAlloc - before.TotalAlloc; grown > uint64(4096+32*len(text)) {
			t.Errorf("%.40s of %d bytes took %d bytes", text, len(text), grown)
		}
	}
}

// FuzzParse holds every place to what its documentation promises, and every refusal to being one readable line.
func FuzzParse(f *testing.F) {
	for _, g := range geometries {
		text, _ := ewkb.MarshalToHex(g, 4326)
		f.Add(wkt.MarshalString(g))
		f.Add(text)
	}
	f.Add("SRID=4326;MULTIPOINT ZM (EMPTY,(1 2 3 4), 1e3 .5 7 8)")
	f.Add("01EB030000010000000400000" + strings.Repeat("0", 97))
	f.Add("0106000000FFFFFFFF")
	f.Fuzz(func(t *testing.T, text string) {
		p, err := Parse(text)
		if err != nil {
			for _, s := range []string{err.Error(), err.(*Error).Hint()} {
				if strings.ContainsAny(s, "\n\r\x00") || !utf8.ValidString(s) || s == "" {
					t.Fatalf("refused with %q", s)
				}
			}
			if at := err.(*Error).At; at > utf8.RuneCountInString(text)+1 {
				t.Fatalf("character %d of %q", at, text)
			}
			return
		}
		if p.SRID < 0 || math.IsInf(p.Z, 0) {
			t.Fatalf("%+v", p)
		}
		if p.Geometry == nil {
			return
		}
		// What is read and written again is the same place.
		written, err := ewkb.MarshalToHex(p.Geometry, p.SRID)
		if err != nil {
			t.Fatal(err)
		}
		again, err := Parse(written)
		if err != nil || !orb.Equal(again.Geometry, p.Geometry) || again.SRID != p.SRID {
			t.Fatalf("%v and then %v, %v", p, again, err)
		}
	})
}

package observe

import (
	"math"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
)

// FuzzReadCSV holds every table to what its documentation promises, and every refusal to being one readable line.
func FuzzReadCSV(f *testing.F) {
	f.Add("x,y,n,of,soil\n1,2,3,4,clay\n5,6,NA,8,loam\n9,9,1,2,peat\n", uint8(2), false)
	f.Add("\xef\xbb\xbfLon,Lat,n,of,soil\r\n1,2,3,4,\"a \"\"b\"\"\"\r\n", uint8(3), true)
	f.Add("lon,lat,n,of,soil\n1,97,3,4,a\n", uint8(1), false)
	f.Add("x;y;n\n1;2;3\n", uint8(0), false)
	f.Add("x,y,n,n\n1,2,3\n\"", uint8(1), false)
	f.Fuzz(func(t *testing.T, text string, kind uint8, strict bool) {
		skipFeatures(t, text)
		want := Request{Kind: Kind(kind % 4), Category: []string{"soil"}, Keep: []string{"of"}, Strict: strict}
		if want.Kind != None {
			want.Response = "n"
		}
		if want.Kind == Positives {
			want.Trials = "of"
		}
		table, err := Read(strings.NewReader(text), "f.csv", want)
		if err != nil {
			for _, s := range []string{err.Error(), hint(err)} {
				if table != nil || s == "no hint" || !utf8.ValidString(s) || strings.ContainsAny(s, "\n\r\x00") {
					t.Fatalf("refused with %q and table %v", s, table)
				}
			}
			return
		}
		checkTable(t, table, want)
	})
}

// skipFeatures leaves GeoJSON to the targets that are about it.
func skipFeatures(t *testing.T, file string) {
	if _, from, err := openOrigin(strings.NewReader(file), "f", Format{}); err == nil && from.features {
		t.Skip()
	}
}

// FuzzFormats holds tables of every format, in any encoding and packed or not, to the same, and ReadPart to Read.
func FuzzFormats(f *testing.F) {
	f.Add([]byte("x;y;n\n1,5;2;<0,5\n1;2;3\n"), uint8(1), uint8(1), "n.d.", false)
	f.Add([]byte("x\ty\tn\n1\t\t3\n"), uint8(0), uint8(3), "", true)
	f.Add([]byte("x,y,n\n1,2,\"1,234\"\n1,2,\xe9\n"), uint8(0), uint8(0), "-", false)
	f.Add([]byte("\xff\xfex\x00,\x00y\x00,\x00n\x00\n\x001\x00,\x002\x00,\x003\x00"), uint8(0), uint8(2), "1", true)
	f.Add([]byte("\x1f\x8b\x08\x00\x00"), uint8(4), uint8(2), "1", false)
	f.Fuzz(func(t *testing.T, text []byte, separator, rules uint8, mark string, packed bool) {
		format := Format{Separator: []rune{0, ',', ';', '\t', '|', '¦'}[separator%6], DecimalComma: rules&4 > 0,
			BelowLimit: BelowLimit(rules % 4), Missing: []string{mark}}
		file := string(text)
		if packed {
			file = zipped(t, file)
		}
		skipFeatures(t, file)
		for _, kind := range []Kind{Measure, Count} {
			want := Request{Response: "n", Kind: kind, Category: []string{"soil"}, Keep: []string{"x"}, Linear: []string{"y"}, Format: format}
			if rules&8 > 0 {
				want.Category = nil
			}
			table, err := Read(strings.NewReader(file), "f.csv", want)
			if err == nil {
				checkTable(t, table, want)
			} else if s := err.Error() + hint(err); table != nil || !utf8.ValidString(s) || strings.ContainsAny(s, "\n\r\x00") {
				t.Fatalf("refused with %q and table %v", s, table)
			}
			shared, wholeErr := WholeAs(strings.NewReader(file), "f.csv", format)
			if wholeErr != nil {
				if err == nil {
					t.Fatalf("Read took what WholeAs refuses: %v", wholeErr)
				}
				continue
			}
			part, partErr := ReadPart(shared.All(), want)
			if diff := cmp.Diff(message(err), message(partErr)) + cmp.Diff(table, part); diff != "" {
				t.Fatalf("(-Read +ReadPart):\n%s", diff)
			}
		}
	})
}

func checkTable(t *testing.T, table *Table, want Request) {
	n := table.Len()
	if n == 0 || n+len(table.Aside) != table.Rows || 2*len(table.Aside) > table.Rows || want.Strict && len(table.Aside) > 0 {
		t.Fatalf("%d kept and %d aside of %d rows", n, len(table.Aside), table.Rows)
	}
	if len(table.Line) != n || len(table.Geometry) != n {
		t.Fatalf("%d rows, %d lines, %d places", n, len(table.Line), len(table.Geometry))
	}
	for i, g := range table.Geometry {
		p := g.(orb.Point)
		if !(math.Abs(p[0]) <= 1e9) || !(math.Abs(p[1]) <= 1e9) || table.Degrees && math.Abs(p[1]) > 90 {
			t.Fatalf("row %d: place %v", table.Row[i], p)
		}
		if table.Line[i] <= table.Row[i] {
			t.Fatalf("row %d on line %d", table.Row[i], table.Line[i])
		}
	}
	for _, c := range table.Columns {
		checkColumn(t, c, n, want)
	}
	if want.Kind == Positives {
		of := table.Column("of").Number
		for i, v := range table.Column("n").Number {
			if v > of[i] {
				t.Fatalf("%g positive of %g", v, of[i])
			}
		}
	}
}

func checkColumn(t *testing.T, c Column, n int, want Request) {
	if c.Number == nil && c.Code == nil || c.Number != nil && len(c.Number) != n || c.Code != nil && len(c.Code) != n {
		t.Fatalf("column %q has %d numbers and %d codes for %d rows", c.Name, len(c.Number), len(c.Code), n)
	}
	for _, v := range c.Number {
		if math.IsNaN(v) || math.IsInf(v, 0) || want.Kind > Measure && (v < 0 || v != math.Trunc(v)) {
			t.Fatalf("column %q holds %g", c.Name, v)
		}
	}
	used := make([]bool, len(c.Level))
	for _, code := range c.Code {
		if code >= 0 {
			used[code] = true
		} else if c.Name == "soil" {
			t.Fatal("a category without a value was kept")
		}
	}
	if slices.Contains(used, false) || !slices.IsSorted(c.Level) || len(slices.Compact(slices.Clone(c.Level))) != len(c.Level) {
		t.Fatalf("column %q: levels %q, used %v", c.Name, c.Level, used)
	}
}

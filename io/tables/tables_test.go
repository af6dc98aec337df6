package tables_test

import (
	"bytes"
	"encoding/csv"
	"errors"
	"math"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"

	"drumlin/io/tables"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func write(t interface{ Fatal(...any) }, n int, columns []tables.Column) string {
	var b bytes.Buffer
	if err := tables.Write(&b, n, columns); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestWrite(t *testing.T) {
	nan := math.NaN()
	for _, test := range []struct {
		name    string
		n       int
		columns []tables.Column
		want    string
	}{
		{"all kinds", 2, []tables.Column{
			{Name: "x", Number: []float64{1.5, -2}}, {Name: "cells", Whole: []int64{-7, math.MaxInt64}},
			{Name: "zone", Text: []string{"North", ""}}, {Name: "lon"}},
			"x,cells,zone,lon\n1.5,-7,North,\n-2,9223372036854775807,,\n"},
		{"no rows", 0, []tables.Column{{Name: "x", Number: []float64{}}, {Name: "y"}}, "x,y\n"},
		{"not finite", 1, []tables.Column{{Name: "a", Number: []float64{nan}}, {Name: "b", Number: []float64{math.Inf(1)}},
			{Name: "c", Number: []float64{math.Inf(-1)}}}, "a,b,c\n,,\n"},
		{"zero has no sign", 1, []tables.Column{{Name: "a", Number: []float64{math.Copysign(0, -1)}}, {Name: "b", Number: []float64{0}}}, "a,b\n0,0\n"},
		// RFC 4180, section 2, rules 5 to 7: fields with line breaks, quotes and commas are quoted, quotes doubled; blanks
		// belong to the field (rule 4).
		{"RFC 4180", 1, []tables.Column{{Name: `a "b"`, Text: []string{"x,y"}}, {Name: "c\nd", Text: []string{`"`}},
			{Name: "e", Text: []string{" f "}}, {Name: "g", Text: []string{"h\r\ni"}}},
			"\"a \"\"b\"\"\",\"c\nd\",e,g\n\"x,y\",\"\"\"\", f ,\"h\r\ni\"\n"},
		{"one column with empty cells", 3, []tables.Column{{Name: "a", Number: []float64{1, nan, 2}}}, "a\n1\n\"\"\n2\n"},
		{"not UTF-8", 1, []tables.Column{{Name: "file", Text: []string{"a\xff\xfeb"}}}, "file\na\uFFFDb\n"},
		{"letters", 1, []tables.Column{{Name: "zone", Text: []string{"Übersee 岛"}}}, "zone\nÜbersee 岛\n"},
	} {
		t.Run(test.name, func(t *testing.T) {
			if diff := cmp.Diff(test.want, write(t, test.n, test.columns)); diff != "" {
				t.Error(diff)
			}
		})
	}
}

func TestAppendNumber(t *testing.T) {
	for _, test := range []struct {
		v    float64
		want string
	}{
		{0.1, "0.1"}, {0.30000000000000004, "0.3"}, {1.0 / 3, "0.333333333333"}, {-2.0 / 3, "-0.666666666667"},
		{123456789012, "123456789012"}, {1234567890123, "1.23456789012e+12"}, {999999999999.6, "1e+12"},
		{6.50590438046e-05, "6.50590438046e-05"}, {0.00012345, "0.00012345"},
		{math.MaxFloat64, "1.79769313486e+308"}, {5e-324, "4.94065645841e-324"},
		{300000, "300000"}, {math.Copysign(0, -1), "0"}, {math.NaN(), ""}, {math.Inf(1), ""}, {math.Inf(-1), ""},
	} {
		if got := string(tables.AppendNumber([]byte("<"), test.v)); got != "<"+test.want {
			t.Errorf("%v is written as %q, want %q", test.v, got[1:], test.want)
		}
	}
}

// Coordinates read back as they were, without an exponent where people expect none.
func TestExact(t *testing.T) {
	for _, test := range []struct {
		v    float64
		want string
	}{
		{-123.482553016, "-123.482553016"}, {1.0 / 3, "0.3333333333333333"}, {5e6 + 1.0/3, "5000000.333333333"}, {1e20, "100000000000000000000"},
		{1e21, "1e+21"}, {1e-4, "0.0001"}, {1e-5, "1e-05"}, {0.30000000000000004, "0.30000000000000004"}, {math.Copysign(0, -1), "0"},
		{math.NaN(), ""}, {math.Inf(-1), ""},
	} {
		if got := write(t, 1, []tables.Column{{Name: "x", Number: []float64{test.v}, Exact: true}, {Name: "y"}}); got != "x,y\n"+test.want+",\n" {
			t.Errorf("%v is written as %q, want %q", test.v, got, test.want)
		}
	}
}

func TestWrongLengths(t *testing.T) {
	for name, columns := range map[string][]tables.Column{
		"too few numbers":         {{Name: "a", Number: []float64{1, 2, 3}}, {Name: "b", Number: []float64{1, 2}}},
		"too many numbers":        {{Name: "b", Number: make([]float64, 4)}},
		"no numbers":              {{Name: "b", Number: []float64{}}},
		"too few whole":           {{Name: "b", Whole: []int64{1}}},
		"no text":                 {{Name: "b", Text: []string{}}},
		"the first slice decides": {{Name: "b", Number: []float64{1}, Text: []string{"1", "2", "3"}}},
	} {
		var b bytes.Buffer
		err := tables.Write(&b, 3, columns)
		if err == nil || !strings.Contains(err.Error(), `column "b"`) || !strings.HasSuffix(err.Error(), "not 3") {
			t.Errorf("%s: %v", name, err)
		}
		if b.Len() != 0 {
			t.Errorf("%s: %q was written", name, b.String())
		}
	}
}

// Text from the user's files must not be computed by a spreadsheet that opens the result (common practice, no source;
// the characters are those that advice on the matter names, from memory).
func TestTextIsNotComputed(t *testing.T) {
	for _, test := range []struct{ text, want string }{
		{`=1+1`, `'=1+1`},
		{`=HYPERLINK("http://example.org";"Zone 1")`, `"'=HYPERLINK(""http://example.org"";""Zone 1"")"`},
		{`@SUM(A1:A9)`, `'@SUM(A1:A9)`},
		{`+cmd|' /C calc'!A0`, `'+cmd|' /C calc'!A0`},
		{`-A1`, `'-A1`},
		{`-`, `'-`},
		{`- unknown`, `'- unknown`},
		{"\t=1", "'\t=1"},
		{"\r=1", "\"'\r=1\""},
		{`-1+2`, `'-1+2`},
		{`-1e999`, `'-1e999`},
		{`+Inf`, `'+Inf`},
		{`-0x1p3`, `'-0x1p3`},
		// These are numbers, or no formulas.
		{`-3`, `-3`}, {`+7`, `+7`}, {`-1.5e-06`, `-1.5e-06`}, {`-.5`, `-.5`},
		{`North-East`, `North-East`}, {`a=b`, `a=b`}, {`'=1`, `'=1`}, {` =1`, ` =1`}, {`1=1`, `1=1`},
	} {
		got := write(t, 1, []tables.Column{{Name: "zone", Text: []string{test.text}}})
		if got != "zone\n"+test.want+"\n" {
			t.Errorf("%q is written as %q, want %q", test.text, got[len("zone\n"):], test.want)
		}
	}
	if got := write(t, 1, []tables.Column{{Name: "=a", Number: []float64{-1e-5}}, {Name: "b", Whole: []int64{-4}}}); got != "'=a,b\n-1e-05,-4\n" {
		t.Errorf("numbers did not stay numbers: %q", got)
	}
}

var errFull = errors.New("no space left")

type fullDisk struct{ room int }

func (d *fullDisk) Write(p []byte) (int, error) {
	if d.room -= len(p); d.room < 0 {
		return 0, errFull
	}
	return len(p), nil
}

func TestFullDisk(t *testing.T) {
	column := tables.Column{Name: "x", Number: make([]float64, 100000)}
	for _, room := range []int{0, 1 << 16, 150000} {
		if err := tables.Write(&fullDisk{room}, len(column.Number), []tables.Column{column}); !errors.Is(err, errFull) {
			t.Errorf("room for %d bytes: %v", room, err)
		}
	}
}

// What is written comes back from an independent reader: whole numbers, exact ones and text as they were, other
// numbers to twelve digits.
func TestReadBack(t *testing.T) {
	text := rapid.OneOf(rapid.String(), rapid.StringMatching(`[ ,"'=@+\-\n\r\t0-9a-zé]{0,6}`))
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(0, 5).Draw(t, "rows")
		columns := rapid.SliceOfN(rapid.Custom(func(t *rapid.T) tables.Column {
			c := tables.Column{Name: "n" + text.Draw(t, "name")}
			switch rapid.IntRange(0, 3).Draw(t, "kind") {
			case 0:
				c.Number = rapid.SliceOfN(rapid.Float64(), n, n).Draw(t, "numbers")
				c.Exact = rapid.Bool().Draw(t, "exact")
			case 1:
				c.Whole = rapid.SliceOfN(rapid.Int64(), n, n).Draw(t, "whole")
			case 2:
				c.Text = rapid.SliceOfN(text, n, n).Draw(t, "text")
			}
			return c
		}), 1, 4).Draw(t, "columns")
		raw := write(t, n, columns)
		if !utf8.ValidString(raw) || !strings.HasSuffix(raw, "\n") {
			t.Fatalf("no text of whole lines: %q", raw)
		}
		records, err := csv.NewReader(strings.NewReader(raw)).ReadAll()
		if err != nil || len(records) != n+1 {
			t.Fatalf("%d records, %v, in %q", len(records), err, raw)
		}
		for j, c := range columns {
			if want := asRead(c.Name); records[0][j] != want {
				t.Fatalf("header %q, want %q", records[0][j], want)
			}
			for i := range n {
				checkCell(t, c, i, records[i+1][j])
			}
		}
	})
}

// asRead is text as encoding/csv gives it back: it turns a carriage return and line feed into a line feed.
func asRead(s string) string { return strings.ReplaceAll(s, "\r\n", "\n") }

func checkCell(t *rapid.T, c tables.Column, i int, got string) {
	switch {
	case c.Number != nil:
		want := c.Number[i]
		if math.IsNaN(want) || math.IsInf(want, 0) {
			if got != "" {
				t.Fatalf("%g came back as %q", want, got)
			}
			return
		}
		v, err := strconv.ParseFloat(got, 64)
		if c.Exact && (err != nil || v != want) {
			t.Fatalf("%g came back as %q", want, got)
		}
		// Half a unit of the twelfth digit, and half a unit of the smallest numbers there are.
		if overflow := errors.Is(err, strconv.ErrRange); err != nil && !(overflow && math.Abs(want) > 1.79769313486e308) {
			t.Fatalf("%g came back as %q", want, got)
		} else if !overflow && math.Abs(v-want) > 5.0001e-12*math.Abs(want)+5e-324 {
			t.Fatalf("%g came back as %q", want, got)
		}
	case c.Whole != nil:
		if got != strconv.FormatInt(c.Whole[i], 10) {
			t.Fatalf("%d came back as %q", c.Whole[i], got)
		}
	case c.Text != nil:
		want := asRead(strings.ToValidUTF8(c.Text[i], "\uFFFD"))
		if got != want && got != "'"+want {
			t.Fatalf("%q came back as %q", want, got)
		}
		if got != want && !strings.ContainsAny(want[:1], "=+-@\t\r\n") {
			t.Fatalf("%q got an apostrophe", want)
		}
	default:
		if got != "" {
			t.Fatalf("an empty column has %q", got)
		}
	}
}

// A table written in pieces is the table written at once, wherever it is cut.
func TestWriterPieces(t *testing.T) {
	columns := func(from, to int) []tables.Column {
		return []tables.Column{
			{Name: "region", Text: []string{"a", "=b", "c,d", "", "e"}[from:to]},
			{Name: "x", Number: []float64{1.0 / 3, math.NaN(), -2, 0, 4e6}[from:to], Exact: true},
			{Name: "n", Whole: []int64{1, 2, 3, 4, 5}[from:to]}, {Name: "chance"},
		}
	}
	want := write(t, 5, columns(0, 5))
	for cut := 0; cut <= 5; cut++ {
		var b bytes.Buffer
		w := tables.NewWriter(&b, []string{"region", "x", "n", "chance"})
		for _, piece := range [][2]int{{0, cut}, {cut, cut}, {cut, 5}} {
			if err := w.Append(piece[1]-piece[0], columns(piece[0], piece[1])); err != nil {
				t.Fatal(err)
			}
		}
		if err := w.Flush(); err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(want, b.String()); diff != "" {
			t.Errorf("cut at %d: %s", cut, diff)
		}
	}
	var b bytes.Buffer
	w := tables.NewWriter(&b, []string{"a", "b"})
	if err := w.Flush(); err != nil || b.String() != "a,b\n" {
		t.Errorf("without rows: %q, %v", b.String(), err)
	}
}

func TestWriterRefuses(t *testing.T) {
	for _, test := range []struct {
		columns []tables.Column
		want    string
	}{
		{[]tables.Column{{Name: "a"}}, "1 columns, not 2"},
		{[]tables.Column{{Name: "b"}, {Name: "a"}}, `column 1 is "b", not "a"`},
		{[]tables.Column{{Name: "a"}, {Name: "b", Whole: []int64{1}}}, `column "b" has 1 rows, not 2`},
	} {
		var b bytes.Buffer
		w := tables.NewWriter(&b, []string{"a", "b"})
		if err := w.Append(2, test.columns); err == nil || err.Error() != test.want {
			t.Errorf("got %v, want %s", err, test.want)
		}
		if w.Flush(); b.String() != "a,b\n" {
			t.Errorf("%q was written", b.String())
		}
	}
}

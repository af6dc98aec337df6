package observe

import (
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
	"pgregory.net/rapid"
)

// Two tables put together hold what is read from one file with the rows of both.
func TestAppendIsTheFileOfBoth(t *testing.T) {
	want := Request{Response: "n", Kind: Count, Category: []string{"soil"}, Keep: []string{"note", "n"}}
	const header = "x,y,n,soil,note\n"
	draw := func(t *rapid.T, label string) string {
		text := ""
		for range rapid.IntRange(1, 12).Draw(t, label) {
			text += rapid.StringMatching(`[1-9],[1-9],[0-9],[a-f],([p-t]|NA)?\n`).Draw(t, "row")
		}
		return text
	}
	rapid.Check(t, func(t *rapid.T) {
		a, b := draw(t, "rows"), draw(t, "rows of the other")
		both, err := read(header+a+b, want)
		if err != nil {
			t.Fatal(err)
		}
		first, _ := read(header+a, want)
		second, _ := read(header+b, want)
		before, _ := read(header+b, want)
		if err := first.Append(second); err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(before, second); diff != "" {
			t.Fatalf("the other table (-before +after):\n%s", diff)
		}
		lines, rows := strings.Count(a, "\n"), strings.Count(b, "\n")
		if first.Rows != lines || !slices.Equal(first.Line[lines:], second.Line) || !slices.Equal(first.Row[lines:], second.Row) {
			t.Fatalf("%d rows, lines %v, numbers %v", first.Rows, first.Line, first.Row)
		}
		both.Rows -= rows
		both.Line, both.Row = first.Line, first.Row
		if diff := cmp.Diff(both, first, sameTable); diff != "" {
			t.Fatalf("(-one file +put together):\n%s", diff)
		}
	})
}

// A region and a neighbour's rows out of one table: lines are those of the file, and only the region's own rows are
// counted.
func TestAppendPart(t *testing.T) {
	const text = "at,x,y,z,soil\na,1,1,1,loam\nb,2,2,2,clay\na,3,3,NA,peat\nb,4,4,,loam\nb,5,5,5,peat\na,6,6,6,loam\n"
	parts := split(t, text, "at")
	want := Request{Response: "z", Kind: Measure, Category: []string{"soil"}}
	table, err := ReadPart(parts["a"], want)
	if err != nil {
		t.Fatal(err)
	}
	neighbours, err := ReadPart(parts["b"].Only([]int32{2, 4, 5}), want)
	if err != nil {
		t.Fatal(err)
	}
	if err := table.Append(neighbours); err != nil {
		t.Fatal(err)
	}
	soil := table.Column("soil")
	if !slices.Equal(table.Row, []int32{1, 6, 2, 5}) || !slices.Equal(table.Line, []int32{2, 7, 3, 6}) || table.Rows != 3 || len(table.Aside) != 1 {
		t.Errorf("rows %v, lines %v of %d, aside %v", table.Row, table.Line, table.Rows, table.Aside)
	}
	if !slices.Equal(soil.Level, []string{"clay", "loam", "peat"}) || !slices.Equal(soil.Code, []int32{1, 1, 0, 2}) {
		t.Errorf("levels %v, codes %v", soil.Level, soil.Code)
	}
	if !slices.Equal(table.Column("z").Number, []float64{1, 6, 2, 5}) || len(table.Geometry) != 4 || table.Geometry[3] != (orb.Point{5, 5}) {
		t.Errorf("numbers %v at %v", table.Column("z").Number, table.Geometry)
	}
}

func TestAppendRefusals(t *testing.T) {
	const base = "x,y,z,d\n1,2,3,4\n"
	linear := Request{Response: "z", Kind: Measure, Linear: []string{"d"}}
	tests := []struct {
		name, text string
		want       Request
		err        string
	}{
		{"degrees", "lon,lat,z,d\n1,2,3,4\n", linear, "the coordinates are in degrees, those of the other table in metres"},
		{"number of columns", base, measure, "1 columns were read, and 2 of the other table"},
		{"name", "x,y,z,e\n1,2,3,4\n", Request{Response: "z", Kind: Measure, Linear: []string{"e"}}, `column 2 is "e", and "d" in the other table`},
		{"text", base, Request{Response: "z", Kind: Measure, Category: []string{"d"}},
			`column "d" was read as numbers in one table and as text in the other`},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			table, _ := read(base, linear)
			before, _ := read(base, linear)
			other, err := read(test.text, test.want)
			if err != nil {
				t.Fatal(err)
			}
			err = table.Append(other)
			if want := "wells.csv: its rows cannot be added to those of wells.csv: " + test.err; err == nil || err.Error() != want {
				t.Errorf("got  %v\nwant %s", err, want)
			}
			if diff := cmp.Diff(before, table); diff != "" {
				t.Errorf("the table was changed (-before +after):\n%s", diff)
			}
		})
	}
}

package observe

import (
	"fmt"
	"math"
	"math/big"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
	"pgregory.net/rapid"
)

// Each case gives the whole table that comes out. No source: the contract is ours.
func TestSumBy(t *testing.T) {
	cases := []string{"cases"}
	tests := []struct {
		name, rows string
		sum        Summing
		want       string
		aside      string
		sums       Sums
	}{
		{"in order of first appearance", "cases# at/1 B/2 A/3 B/4 C/5 A", Summing{Add: cases}, "row cases at/1 4 B/2 7 A/4 4 C", "", Sums{5, 3}},
		{"one row", "cases# at/1 B", Summing{Add: cases}, "row cases at/1 1 B", "", Sums{1, 1}},
		{"nothing to sum", "cases# at/1 B/2 A", Summing{Add: cases}, "row cases at/1 1 B/2 2 A", "", Sums{2, 2}},
		{"all into one", "cases# at/1 B/2 B/-3 B", Summing{Add: cases}, "row cases at/1 0 B", "", Sums{3, 1}},
		{"several columns", "cases# people# at/1 10 B/2 20 B", Summing{Add: []string{"people", "cases"}}, "row cases people at/1 3 30 B", "", Sums{2, 1}},
		{"what is not summed is the same", "cases# people# at soil/1 10 B loam/4 20 A peat/2 10 B loam", Summing{Add: cases},
			"row cases people at soil/1 3 10 B loam/2 4 20 A peat", "", Sums{3, 2}},
		{"text may be missing everywhere", "cases# at note/1 B -/2 B -", Summing{Add: cases}, "row cases at note/1 3 B -", "", Sums{2, 1}},
		{"places are the same", "@ cases# at/7 1 B/8 4 A/7 2 B", Summing{Add: cases}, "row cases at/1 3 B @7/2 4 A @8", "", Sums{3, 2}},
		{"fractions", "cases# at/0.1 B/0.1 B/0.1 B/0.1 B/0.1 B/0.1 B/0.1 B/0.1 B/0.1 B/0.1 B", Summing{Add: cases}, "row cases at/1 1 B", "", Sums{10, 1}},
		{"large terms that cancel", "cases# at/1 B/1e100 B/1 B/-1e100 B", Summing{Add: cases}, "row cases at/1 2 B", "", Sums{4, 1}},
		{"no column is summed", "at soil/B loam/B loam/A peat", Summing{}, "row at soil/1 B loam/3 A peat", "", Sums{3, 2}},
		{"no key", "cases# at/1 B/2 -/3 B", Summing{Add: cases}, "row cases at/1 4 B", `2 missing-key at "": key is missing`, Sums{2, 1}},
		{"no row is lost", "cases# at/1 B/2 B", Summing{Add: cases, Whole: true}, "row cases at/1 3 B", "", Sums{2, 1}},
		{"whole sums only", "cases# at/1 B/2 A/3 B/4 B", Summing{Add: cases, Whole: true, Lost: Lost{"A": {Reason: "response is missing"}}}, "row cases at/1 8 B",
			`2 incomplete-sum at "A": another row to be summed with it cannot be used: response is missing`, Sums{3, 1}},
		{"not only whole sums", "cases# at/1 B/2 A/3 B", Summing{Add: cases, Lost: Lost{"A": {Reason: "response is missing"}}}, "row cases at/1 4 B/2 2 A", "", Sums{3, 2}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			table := sheet("cases.csv", test.rows)
			rows := table.Rows
			sums, err := table.SumBy("at", test.sum)
			if err != nil {
				t.Fatalf("%v\n%s", err, hint(err))
			}
			if got := words(table); got != test.want || sums != test.sums || table.Rows != rows {
				t.Errorf("got\n%s, want\n%s\n%+v of %d rows", got, test.want, sums, table.Rows)
			}
			if got := asides(table); got != test.aside {
				t.Errorf("aside\n%s, want\n%s", got, test.aside)
			}
			for _, c := range table.Columns {
				checkLevels(t, c)
			}
		})
	}
}

const (
	adviceSame  = "make the column the same in all rows to be summed, or leave it out: only the response, the trials and the denominator are added up"
	advicePlace = "give all rows to be summed the same place, or leave out --sum-by"
)

// Each refusal is pinned word for word, and leaves the table as it was.
func TestSumByRefusals(t *testing.T) {
	region := func(x float64) orb.Polygon { return orb.Polygon{{{0, 0}, {x, 0}, {0, 1}, {0, 0}}} }
	cases := []string{"cases"}
	tests := []struct {
		name, rows string
		places     []orb.Geometry
		sum        Summing
		err, hint  string
	}{
		{"numbers differ", "cases# depth# at/1 3 B/1 3 A/1 4.5 B", nil, Summing{Add: cases},
			`cases.csv: row 3 (line 4), column "depth": 4.5 where row 1 (line 2) has 3, and both are summed as at "B"`, adviceSame},
		{"text differs", "cases# at soil/1 B loam/1 B light_clay", nil, Summing{Add: cases},
			`cases.csv: row 2 (line 3), column "soil": "light clay" where row 1 (line 2) has "loam", and both are summed as at "B"`, adviceSame},
		{"text is there once", "cases# at soil/1 B -/1 B clay", nil, Summing{Add: cases},
			`cases.csv: row 2 (line 3), column "soil": "clay" where row 1 (line 2) has nothing, and both are summed as at "B"`, adviceSame},
		{"text is missing once", "cases# at soil/1 B clay/1 B -", nil, Summing{Add: cases},
			`cases.csv: row 2 (line 3), column "soil": nothing where row 1 (line 2) has "clay", and both are summed as at "B"`, adviceSame},
		{"the response is not summed", "cases# at/1 B/2 B", nil, Summing{},
			`cases.csv: row 2 (line 3), column "cases": 2 where row 1 (line 2) has 1, and both are summed as at "B"`, adviceSame},
		{"places differ", "@ cases# at/7 1 B/8 1 A/9 1 B", nil, Summing{Add: cases},
			`cases.csv: row 3 (line 4): the place 9 90 where row 1 (line 2) has the place 7 70, and both are summed as at "B"`, advicePlace},
		{"polygons differ", "cases# at/1 B/1 B/1 B", []orb.Geometry{region(1), region(1), region(2)}, Summing{Add: cases},
			`cases.csv: row 3 (line 4): another Polygon where row 1 (line 2) has a Polygon, and both are summed as at "B"`, advicePlace},
		{"a point and a polygon", "cases# at/1 B/1 B", []orb.Geometry{region(1), orb.Point{1, 2}}, Summing{Add: cases},
			`cases.csv: row 2 (line 3): the place 1 2 where row 1 (line 2) has a Polygon, and both are summed as at "B"`, advicePlace},
		{"a place once", "cases# at/1 B/1 B", []orb.Geometry{nil, orb.Point{1, 2}}, Summing{Add: cases},
			`cases.csv: row 2 (line 3): the place 1 2 where row 1 (line 2) has no place, and both are summed as at "B"`, advicePlace},
		{"strict", "cases# at/1 B/2 -", nil, Summing{Add: cases, Strict: true}, `cases.csv: row 2 (line 3), column "at": key is missing`, adviceStrict},
		{"mostly no key", "cases# at/1 B/2 -/3 -", nil, Summing{Add: cases},
			`cases.csv: 2 of 3 rows cannot be used, more than half: column "at", key is missing (2); for example row 2 (line 3), where key is missing`,
			"check that --sum-by names the right column"},
		{"too large", "cases# at/1e308 B/1e308 B", nil, Summing{Add: cases}, `cases.csv: column "cases": the sum for "B" is beyond the largest number`,
			"check the column for marks of missing values, and name them with --missing"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			table, before := sheet("cases.csv", test.rows), sheet("cases.csv", test.rows)
			if test.places != nil {
				table.Geometry, before.Geometry = test.places, test.places
			}
			_, err := table.SumBy("at", test.sum)
			checkRefusal(t, err, test.err, test.hint)
			if diff := cmp.Diff(before, table); diff != "" {
				t.Errorf("the table has changed (-before +after):\n%s", diff)
			}
		})
	}
}

// Polygons that are the same corner by corner are one place.
func TestSumByPolygons(t *testing.T) {
	table := sheet("cases.csv", "cases# at/1 B/2 B")
	for range 2 {
		table.Geometry = append(table.Geometry, orb.Polygon{{{0, 0}, {1, 0}, {0, 1}, {0, 0}}})
	}
	if _, err := table.SumBy("at", Summing{Add: []string{"cases"}}); err != nil || len(table.Geometry) != 1 {
		t.Errorf("error %v, %d places", err, len(table.Geometry))
	}
}

// A sum that lacks a row is refused, unless somebody knows whose it is.
func TestSumByWhole(t *testing.T) {
	cases := func() *Table {
		return lost(sheet("cases.csv", "cases# at/1 B/2 A/3 B/4 B"), 5, "cases", "NA", "missing-response", "response is missing")
	}
	sum := Summing{Add: []string{"cases"}, Whole: true}
	_, err := cases().SumBy("at", sum)
	checkRefusal(t, err, `cases.csv: row 5 (line 6), column "cases": response is missing: "NA", so the row is set aside; a sum without it would be too small`,
		"correct such rows, or take them out of the file")

	table := cases()
	sum.Lost = table.Lost(sheet("cases.csv", "at/B/A/B/B/A"), "at")
	if _, err := table.SumBy("at", sum); err != nil {
		t.Fatal(err)
	}
	if got, want := words(table), "row cases at/1 8 B"; got != want || len(table.Aside) != 2 {
		t.Errorf("got %s, want %s; aside %v", got, want, table.Aside)
	}
}

// Text that is kept of a column that is summed says nothing about the sum.
func TestSumByKeptText(t *testing.T) {
	table, err := read("x,y,z,at\n1,2,3,B\n1,2,4,B\n3,4,5.0,A\n", Request{Response: "z", Kind: Count, Keep: []string{"z", "at"}})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := table.SumBy("at", Summing{Add: []string{"z"}}); err != nil {
		t.Fatal(err)
	}
	want := Column{Name: "z", Number: []float64{7, 5}, Code: []int32{-1, 0}, Level: []string{"5.0"}}
	if diff := cmp.Diff(want, *table.Column("z")); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

// A place that is summed and then joined weighs one row against those that find no match.
func TestSumByThenJoin(t *testing.T) {
	table := sheet("cases.csv", "cases# district/1 A/2 A/3 A/4 A/5 A/6 A/7 A/8 B/9 D")
	if _, err := table.SumBy("district", Summing{Add: []string{"cases"}}); err != nil {
		t.Fatal(err)
	}
	joined := *table
	if _, err := joined.Join(Join{Key: "district", Response: "cases", Sides: []Side{places("@ NAME/1 A/2 B/3 C")}, Absent: AbsentMissing}); err != nil {
		t.Fatal(err)
	}
	if got, want := words(&joined), "row cases district/1 28 A @1/8 8 B @2"; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
	_, err := table.Join(Join{Key: "district", Sides: []Side{people("district/A")}})
	checkRefusal(t, err, `cases.csv: 2 of 3 rows cannot be used, more than half: column "district", population.csv has no row with this key (2); `+
		`for example row 8 (line 9), where population.csv has no row with this key: "B"`, "check that --key names the right column of each file")
}

// Sums against exact arithmetic: whole numbers to the last unit, fractions to the last place but one however they
// cancel (the bound of Neumaier 1974 has twice the rounding unit of the sum, and one of second order of the terms).
func TestSumByIsExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		whole := rapid.Bool().Draw(t, "whole")
		n := rapid.IntRange(1, 30).Draw(t, "rows")
		table := sheet("cases.csv", "at")
		values := make([]float64, n)
		table.Columns[0].Level = []string{"A", "B"}
		exact, size, rows := map[int32]*big.Float{}, map[int32]float64{}, map[int32]int{}
		for i := range n {
			if whole {
				values[i] = float64(rapid.Int64Range(0, 1<<48).Draw(t, "value"))
			} else {
				values[i] = rapid.Float64Range(-1, 1).Draw(t, "value") * math.Pow(10, float64(rapid.IntRange(-10, 10).Draw(t, "exponent")))
			}
			if !whole && i > 0 && rapid.Bool().Draw(t, "cancel") {
				values[i] = -values[rapid.IntRange(0, i-1).Draw(t, "what")]
			}
			code := int32(rapid.IntRange(0, 1).Draw(t, "at"))
			if exact[code] == nil {
				exact[code] = new(big.Float).SetPrec(2000)
			}
			exact[code].Add(exact[code], big.NewFloat(values[i]))
			size[code] += math.Abs(values[i])
			rows[code]++
			table.Columns[0].Code = append(table.Columns[0].Code, code)
			table.Row, table.Line = append(table.Row, int32(i+1)), append(table.Line, int32(i+2))
		}
		table.Rows, table.Columns = n, append(table.Columns, Column{Name: "cases", Number: values})
		codes := table.Columns[0].Code
		levels := []string{"A", "B"}
		if _, err := table.SumBy("at", Summing{Add: []string{"cases"}}); err != nil {
			t.Fatal(err)
		}
		if got, want := table.Len(), len(exact); got != want || table.Column("at").Level[table.Column("at").Code[0]] != levels[codes[0]] {
			t.Fatalf("%d rows of %v, want %d", got, table.Column("at"), want)
		}
		for k, got := range table.Column("cases").Number {
			code := codes[table.Row[k]-1]
			want, _ := exact[code].Float64()
			const unit = 0x1p-53
			bound := 2*unit*math.Abs(want) + 3*float64(rows[code]*rows[code])*unit*unit*size[code]
			if whole {
				bound = 0
			}
			if math.Abs(got-want) > bound {
				t.Fatalf("%s: %g, exactly %g", levels[code], got, want)
			}
		}
	})
}

// SumBy against a loop over all pairs of rows.
func TestSumByIsNestedLoops(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		keys := rapid.SliceOfN(rapid.SampledFrom([]string{"A", "B", "C", "-"}), 1, 8).Draw(t, "keys")
		soils := rapid.SliceOfN(rapid.SampledFrom([]string{"p", "p", "p", "q"}), len(keys), len(keys)).Draw(t, "soils")
		text, want := "cases# at soil", "row cases at soil"
		refused, missing := false, 0
		for i, key := range keys {
			text += fmt.Sprintf("/%d %s %s", i+1, key, soils[i])
			if key == "-" {
				missing++
				continue
			}
			sum, first := 0, true
			for k, other := range keys {
				if other != key {
					continue
				}
				sum += k + 1
				first = first && k >= i
				refused = refused || soils[k] != soils[i]
			}
			if first {
				want += fmt.Sprintf("/%d %d %s %s", i+1, sum, key, soils[i])
			}
		}
		refused = refused || missing > len(keys)/2
		table := sheet("cases.csv", text)
		_, err := table.SumBy("at", Summing{Add: []string{"cases"}})
		if refused != (err != nil) {
			t.Fatalf("error %v", err)
		}
		if got := words(table); err == nil && got != want {
			t.Fatalf("got\n%s, want\n%s", got, want)
		}
	})
}

func TestSumByPanics(t *testing.T) {
	tests := []struct {
		name, by, add, want string
	}{
		{"no such column", "place", "cases", `observe: cases.csv has no text column "place"`},
		{"a column of numbers", "cases", "cases", `observe: cases.csv has no text column "cases"`},
		{"text to add up", "at", "at", `observe: cases.csv has no column "at" of numbers`},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			defer func() {
				if got := recover(); got != test.want {
					t.Errorf("got %v, want %s", got, test.want)
				}
			}()
			sheet("cases.csv", "cases# at/5 A").SumBy(test.by, Summing{Add: []string{test.add}})
		})
	}
}

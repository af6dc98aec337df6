package observe

import (
	"errors"
	"fmt"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/paulmach/orb"
	"pgregory.net/rapid"
)

// sheet makes a table out of words: names of columns first, then rows after "/". A name with # is a column of numbers,
// @ stands for the place, of which 3 is the point 3 30. A - is a missing text.
func sheet(source, text string) *Table {
	lines := strings.Split(text, "/")
	t := &Table{Source: source, Rows: len(lines) - 1}
	for at, name := range strings.Fields(lines[0]) {
		c := Column{Name: strings.TrimSuffix(name, "#")}
		number, place := c.Name != name, name == "@"
		if number {
			c.Number = []float64{}
		} else {
			c.Code = []int32{}
		}
		for _, line := range lines[1:] {
			value := strings.ReplaceAll(strings.Fields(line)[at], "_", " ")
			v, _ := strconv.ParseFloat(value, 64)
			switch {
			case place:
				t.Geometry = append(t.Geometry, orb.Point{v, 10 * v})
			case number:
				c.Number = append(c.Number, v)
			case value == "-":
				c.Code = append(c.Code, -1)
			default:
				code := slices.Index(c.Level, value)
				if code < 0 {
					code = len(c.Level)
					c.Level = append(c.Level, value)
				}
				c.Code = append(c.Code, int32(code))
			}
		}
		if !place {
			t.Columns = append(t.Columns, c)
		}
	}
	for i := range t.Rows {
		t.Row, t.Line = append(t.Row, int32(i+1)), append(t.Line, int32(i+2))
	}
	t.sortLevels()
	return t
}

// words writes a table as sheet reads it, with the number of each row in front.
func words(t *Table) string {
	b := "row"
	for _, c := range t.Columns {
		b += " " + c.Name
	}
	for i := range t.Len() {
		b += fmt.Sprintf("/%d", t.Row[i])
		for _, c := range t.Columns {
			switch {
			case c.Number != nil:
				b += fmt.Sprintf(" %g", c.Number[i])
			case c.Code[i] < 0:
				b += " -"
			default:
				b += " " + strings.ReplaceAll(c.Level[c.Code[i]], " ", "_")
			}
		}
		if t.Geometry != nil {
			b += fmt.Sprintf(" @%g", t.Geometry[i].(orb.Point)[0])
		}
	}
	return b
}

// asides writes the rows set aside.
func asides(t *Table) string {
	var list []string
	for _, a := range t.Aside {
		list = append(list, fmt.Sprintf("%d %s %s %q: %s", a.Row, a.Code, a.Column, a.Value, a.Reason))
	}
	return strings.Join(list, "\n")
}

// lost sets a row of a source aside that sheet does not have.
func lost(t *Table, row int32, column, value, code, reason string) *Table {
	t.Aside = append(t.Aside, Aside{Line: row + 1, Row: row, Column: column, Value: value, Code: code, Reason: reason})
	t.Rows++
	return t
}

func places(text string) Side {
	return Side{Table: sheet("districts.geojson", text), Key: "NAME", Places: true}
}

func people(text string, take ...string) Side {
	return Side{Table: sheet("population.csv", text), Key: "district", Take: take}
}

// Each case gives the whole table that comes out. No source: the contract is ours.
func TestJoin(t *testing.T) {
	abc := places("@ NAME/1 A/2 B/3 C")
	abcPeople := people("district people#/C 30/A 10/B 20", "people")
	tests := []struct {
		name   string
		rows   string
		join   Join
		want   string
		aside  string
		report string
	}{
		{"places", "cases# district/5 B/6 A/7 C", Join{Sides: []Side{abc}}, "row cases district/1 5 B @2/2 6 A @1/3 7 C @3", "", ""},
		{"several rows a place", "cases# district/5 B/6 A/7 C/8 A", Join{Sides: []Side{abc}},
			"row cases district/1 5 B @2/2 6 A @1/3 7 C @3/4 8 A @1", "", ""},
		{"columns alone leave the places", "@ cases# district/1 5 B/2 6 A", Join{Sides: []Side{abcPeople}},
			"row cases district people/1 5 B 20 @1/2 6 A 10 @2", "", `population.csv 2 unused [C]`},
		{"places take the place of places", "@ cases# district/7 5 B/8 6 A/9 0 C", Join{Sides: []Side{abc}},
			"row cases district/1 5 B @2/2 6 A @1/3 0 C @3", "", ""},
		{"places and columns", "cases# district/5 B/6 A/7 C", Join{Sides: []Side{abc, abcPeople}},
			"row cases district people/1 5 B 20 @2/2 6 A 10 @1/3 7 C 30 @3", "", ""},
		{"text and numbers, levels that are used", "cases# district/5 B/6 B", Join{Sides: []Side{people("district soil people#/A peat 1/B loam 2/C clay 3", "people", "soil")}},
			"row cases district people soil/1 5 B 2 loam/2 6 B 2 loam", "", `population.csv 2 unused [A C]`},
		{"places give columns too", "cases# district/5 B/6 A", Join{Sides: []Side{{Table: sheet("d", "@ NAME h#/1 A 7/2 B 8"), Key: "NAME", Take: []string{"h"}, Places: true}}},
			"row cases district h/1 5 B 8 @2/2 6 A 7 @1", "", ""},
		{"missing text of a side", "cases# district/5 B/6 A", Join{Sides: []Side{people("district note/A -/B x", "note")}}, "row cases district note/1 5 B x/2 6 A -", "", ""},
		{"no sides", "cases# district/5 B/6 A", Join{}, "row cases district/1 5 B/2 6 A", "", ""},

		{"no place", "cases# district/5 B/6 D/7 A/8 C", Join{Sides: []Side{abc, abcPeople}}, "row cases district people/1 5 B 20 @2/3 7 A 10 @1/4 8 C 30 @3",
			`2 no-place district "D": districts.geojson has no such place`, "districts.geojson 3 without [D]; population.csv 3 without [D]"},
		{"no match", "cases# district/5 B/6 D/7 A/8 C", Join{Sides: []Side{abcPeople}}, "row cases district people/1 5 B 20/3 7 A 10/4 8 C 30",
			`2 no-match district "D": population.csv has no row with this key`, "population.csv 3 without [D]"},
		{"no key", "cases# district/5 B/6 -/7 A/8 C", Join{Sides: []Side{abc}}, "row cases district/1 5 B @2/3 7 A @1/4 8 C @3",
			`2 missing-key district "": key is missing`, ""},
		{"row of a side that was set aside", "cases# district/5 B/6 D/7 A",
			Join{Sides: []Side{{Table: lost(sheet("p.csv", "district people#/A 1/B 2"), 3, "people", "NA", "missing-denominator", "denominator is missing"), Key: "district"}}},
			"row cases district/1 5 B/3 7 A", `2 no-match district "D": p.csv has no usable row with this key`, "p.csv 2 without [D]"},
		{"row of a side that was set aside, known", "cases# district/5 B/6 D/7 A/8 E/9 B",
			Join{Sides: []Side{{Table: lost(sheet("p.csv", "district people#/A 1/B 2"), 3, "people", "NA", "missing-denominator", "denominator is missing"), Key: "district",
				Lost: Lost{"D": {Reason: "denominator is missing"}}}}},
			"row cases district/1 5 B/3 7 A/5 9 B",
			"2 unusable-match district \"D\": its row in p.csv cannot be used: denominator is missing\n" +
				`4 no-match district "E": p.csv has no row with this key`, "p.csv 3 without [D E]"},
		{"place that was set aside", "cases# district/5 B/6 D/7 A",
			Join{Sides: []Side{{Table: lost(sheet("p.csv", "@ district/1 A/2 B"), 3, "geometry", "", "missing-geometry", "geometry is missing"), Key: "district", Places: true}}},
			"row cases district/1 5 B @2/3 7 A @1", `2 no-place district "D": p.csv has no such place that can be used`, "p.csv 2 without [D]"},
		{"rows of a side without key", "cases# district/5 B", Join{Sides: []Side{people("district people#/- 1/B 2/- 3", "people")}},
			"row cases district people/1 5 B 2", "", "population.csv 1 unused [] 2 without key"},

		{"absent, missing", "cases# district/5 B", Join{Sides: []Side{abc}, Absent: AbsentMissing}, "row cases district/1 5 B @2", "",
			"districts.geojson 1 unused [A C]; absent [A C]"},
		{"absent, zero, in the order of the places", "cases# district/5 B", Join{Sides: []Side{places("@ NAME/1 C/2 B/3 A")}, Absent: AbsentZero},
			"row cases district/1 5 B @2/0 0 C @1/0 0 A @3", "", "districts.geojson 1 unused [A C]; absent [A C]; added 2"},
		{"absent, zero, with columns", "cases# district/5 B", Join{Sides: []Side{abcPeople, abc}, Absent: AbsentZero},
			"row cases district people/1 5 B 20 @2/0 0 A 10 @1/0 0 C 30 @3", "",
			"population.csv 1 unused [A C]; districts.geojson 1 unused [A C]; absent [A C]; added 2"},
		{"absent, zero, kept text", "cases# district note/5 B x", Join{Sides: []Side{abc}, Absent: AbsentZero, Keep: []string{"note"}},
			"row cases district note/1 5 B x @2/0 0 A - @1/0 0 C - @3", "", "districts.geojson 1 unused [A C]; absent [A C]; added 2"},
		{"absent, zero, none absent", "cases# depth# district/5 1 B/5 1 A/5 1 C", Join{Sides: []Side{abc}, Absent: AbsentZero},
			"row cases depth district/1 5 1 B @2/2 5 1 A @1/3 5 1 C @3", "", ""},
		{"absent, zero, none added beside a row without a key", "cases# district/5 B/6 -/7 A/8 C/9 Q", Join{Sides: []Side{abc}, Absent: AbsentZero},
			"row cases district/1 5 B @2/3 7 A @1/4 8 C @3", "2 missing-key district \"\": key is missing\n5 no-place district \"Q\": districts.geojson has no such place",
			"districts.geojson 3 without [Q]"},
		{"absent, missing beside a row without a key", "cases# district/5 B/6 -/5 B", Join{Sides: []Side{abc}, Absent: AbsentMissing},
			"row cases district/1 5 B @2/3 5 B @2", `2 missing-key district "": key is missing`, "districts.geojson 2 unused [A C]; absent [A C]"},
		{"absent, zero, beside a row of a place that cannot be used", "cases# district/5 B/6 D/5 B",
			Join{Sides: []Side{{Table: abc.Table, Key: "NAME", Places: true, Lost: Lost{"D": {Reason: "geometry is missing"}}}}, Absent: AbsentZero},
			"row cases district/1 5 B @2/3 5 B @2/0 0 A @1/0 0 C @3", `2 unusable-match district "D": its row in districts.geojson cannot be used: geometry is missing`,
			"districts.geojson 2 without [D] unused [A C]; absent [A C]; added 2"},
		{"a place whose row is set aside has a row", "cases# district/5 B/9 A/4 C", Join{Sides: []Side{abc, people("district t#/A 8/B 5/C 7", "t")}, Trials: "t", Absent: AbsentZero},
			"row cases district t/1 5 B 5 @2/3 4 C 7 @3", `2 positives-above-trials cases "9": response is above the number of trials`, ""},
		{"absent, a row was set aside before", "cases# district/5 B", Join{Sides: []Side{abc}, Absent: AbsentZero, Lost: Lost{"A": {Reason: "response is missing"}}},
			"row cases district/1 5 B @2/0 0 C @3", "", "districts.geojson 1 unused [A C]; absent [C]; added 1"},
		{"a place without key", "cases# district/5 B", Join{Sides: []Side{places("@ NAME/1 -/2 B")}}, "row cases district/1 5 B @2", "",
			"districts.geojson 1 unused [] 1 without key"},
		{"nothing is absent where there are no places", "cases# district/5 B", Join{Sides: []Side{abcPeople}, Absent: AbsentZero},
			"row cases district people/1 5 B 20", "", "population.csv 1 unused [A C]"},
		{"trials of absent places", "cases# district/5 B", Join{Sides: []Side{abc, people("district t#/A 8/B 5/C 7", "t")}, Trials: "t", Absent: AbsentZero},
			"row cases district t/1 5 B 5 @2/0 0 A 8 @1/0 0 C 7 @3", "", "districts.geojson 1 unused [A C]; population.csv 1 unused [A C]; absent [A C]; added 2"},

		{"alike, but matched elsewhere", "cases# district/5 Nord/6 nord/7 Nord", Join{Sides: []Side{places("@ NAME/1 Nord")}}, "row cases district/1 5 Nord @1/3 7 Nord @1",
			`2 no-place district "nord": districts.geojson has no such place`, `districts.geojson 2 without [nord] alike [{nord Nord in capitals}]`},
		{"keys apart by capitals alone", "cases# district/5 a1/6 A1", Join{Sides: []Side{places("@ NAME/1 A1/2 a1")}}, "row cases district/1 5 a1 @2/2 6 A1 @1", "", ""},
		{"one of two keys apart by capitals alone", "cases# district/5 a1", Join{Sides: []Side{places("@ NAME/1 A1/2 a1")}, Absent: AbsentMissing},
			"row cases district/1 5 a1 @2", "", "districts.geojson 1 unused [A1]; absent [A1]"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			table := sheet("cases.csv", test.rows)
			test.join.Key, test.join.Response = "district", "cases"
			report, err := table.Join(test.join)
			if err != nil {
				t.Fatalf("%v\n%s", err, hint(err))
			}
			if got := words(table); got != test.want {
				t.Errorf("got\n%s, want\n%s", got, test.want)
			}
			if got := asides(table); got != test.aside {
				t.Errorf("aside\n%s, want\n%s", got, test.aside)
			}
			if got := reported(report); got != test.report {
				t.Errorf("report\n%s, want\n%s", got, test.report)
			}
			for _, c := range table.Columns {
				checkLevels(t, c)
			}
		})
	}
}

// checkLevels demands what Column.Level promises.
func checkLevels(t interface{ Errorf(string, ...any) }, c Column) {
	used := map[int32]bool{}
	for _, code := range c.Code {
		if code >= 0 {
			used[code] = true
		}
	}
	if len(used) != len(c.Level) || !slices.IsSorted(c.Level) {
		t.Errorf("levels of %s are %q, of which %d are used", c.Name, c.Level, len(used))
	}
}

// reported writes what is worth telling: nothing where all keys match.
func reported(r JoinReport) string {
	var list []string
	for _, s := range r.Sides {
		text := fmt.Sprintf("%s %d", s.Source, s.Matched)
		if len(s.WithoutMatch) > 0 {
			text += fmt.Sprintf(" without %s", s.WithoutMatch)
		}
		if len(s.Alike) > 0 {
			text += fmt.Sprintf(" alike %v", s.Alike)
		}
		if len(s.Unused) > 0 || s.WithoutKey > 0 {
			text += fmt.Sprintf(" unused %s", s.Unused)
		}
		if s.WithoutKey > 0 {
			text += fmt.Sprintf(" %d without key", s.WithoutKey)
		}
		if text != fmt.Sprintf("%s %d", s.Source, s.Matched) {
			list = append(list, text)
		}
	}
	if len(r.Absent) > 0 {
		list = append(list, fmt.Sprintf("absent %s", r.Absent))
	}
	if r.Added > 0 {
		list = append(list, fmt.Sprintf("added %d", r.Added))
	}
	return strings.Join(list, "; ")
}

const (
	adviceAlike  = "make them alike in one of the two files: keys match where they are the same to the letter"
	adviceAbsent = "say with --absent zero that nothing was found there, or with --absent missing that nobody looked"
	adviceGap    = "give the column in a file with a row for every place, with --join, or say --absent missing"
	adviceStray  = "correct such rows or take them out of the file, or say --absent missing"
	adviceStrict = "correct the row, or leave out --strict to set such rows aside"
)

// Each refusal is pinned word for word, and leaves the table as it was.
func TestJoinRefusals(t *testing.T) {
	abc := places("@ NAME/1 A/2 B/3 C")
	tests := []struct {
		name      string
		rows      string
		join      Join
		err, hint string
	}{
		{"key twice in a side", "cases# district/5 B", Join{Sides: []Side{people("district people#/A 1/B 2/C 3/B 4", "people")}},
			`population.csv: row 4 (line 5), column "district": the key "B" also stands in row 2 (line 3)`, "leave one row for each key in the file"},
		{"key twice among places, used or not", "cases# district/5 B", Join{Sides: []Side{places("@ NAME/1 A/2 B/3 A")}},
			`districts.geojson: row 3 (line 4), column "NAME": the key "A" also stands in row 1 (line 2)`,
			"give each place one row: the parts of one place belong in one geometry"},

		{"capitals", "cases# district/5 nord/6 B", Join{Sides: []Side{places("@ NAME/1 Nord/2 B")}},
			`cases.csv: column "district": keys differ from those of districts.geojson only in how they are written: "nord" from "Nord" in capitals`, adviceAlike},
		{"near misses, more than five", "cases# district/1 a/2 b/3 c/4 d/5 e/6 f/7 g", Join{Sides: []Side{places("@ NAME/1 A/2 B/3 C/4 D/5 E/6 F/7 G")}},
			`cases.csv: column "district": keys differ from those of districts.geojson only in how they are written: "a" from "A" in capitals, "b" from "B" in capitals, ` +
				`"c" from "C" in capitals, "d" from "D" in capitals, "e" from "E" in capitals and 2 more`, adviceAlike},
		{"near misses come before all else", "cases# district/5 Q/6 -/6 b/6 S/7 T", Join{Sides: []Side{abc}, Strict: true},
			`cases.csv: column "district": keys differ from those of districts.geojson only in how they are written: "b" from "B" in capitals`, adviceAlike},
		{"near misses in the second side", "cases# district/5 A/6 B/7 C", Join{Sides: []Side{abc, people("district/a/B/C")}},
			`cases.csv: column "district": keys differ from those of population.csv only in how they are written: "A" from "a" in capitals`, adviceAlike},

		{"strict, no place", "cases# district/5 B/6 D/7 -/8 A/8 C", Join{Sides: []Side{abc}, Strict: true},
			`cases.csv: row 2 (line 3), column "district": districts.geojson has no such place: "D"`, adviceStrict},
		{"strict, no key", "cases# district/5 B/6 A/7 -/8 D/8 C", Join{Sides: []Side{abc}, Strict: true},
			`cases.csv: row 3 (line 4), column "district": key is missing`, adviceStrict},
		{"strict, positives", "cases# district/5 B/9 A/7 -", Join{Sides: []Side{people("district t#/A 8/B 5", "t")}, Trials: "t", Strict: true},
			`cases.csv: row 2 (line 3), column "cases": response is above the number of trials: "9"`, adviceStrict},

		{"nothing matches", "cases# district/5 101/6 102/7 103", Join{Sides: []Side{places("@ NAME/1 N/2 O/3 P/4 Q")}},
			`cases.csv: 3 of 3 rows cannot be used, more than half: column "district", districts.geojson has no such place (3); ` +
				`for example row 1 (line 2), where districts.geojson has no such place: "101"`,
			`check that --key names the right column of each file; keys of districts.geojson that no row has: "N", "O", "P" and 1 more`},
		{"more than half", "cases# district/5 B/6 -/7 D/8 E/5 B", Join{Sides: []Side{people("district/A/B")}},
			`cases.csv: 3 of 5 rows cannot be used, more than half: column "district", population.csv has no row with this key (2); column "district", key is missing (1); ` +
				`for example row 3 (line 4), where population.csv has no row with this key: "D"`,
			`check that --key names the right column of each file; keys of population.csv that no row has: "A"`},
		{"more than half, of two sides", "cases# district/5 1/6 2/7 3/8 4",
			Join{Sides: []Side{people("district/1/2/3/X"), places("@ NAME/1 1/2 Y"), people("district/1/2/Z")}},
			`cases.csv: 3 of 4 rows cannot be used, more than half: column "district", districts.geojson has no such place (2); column "district", ` +
				`population.csv has no row with this key (1); for example row 2 (line 3), where districts.geojson has no such place: "2"`,
			`check that --key names the right column of each file; keys of districts.geojson that no row has: "Y"`},
		{"more than half, more than three reasons", "cases# district/5 A/9 B/6 E/7 D/8 -",
			Join{Sides: []Side{places("@ NAME/1 A/2 B/3 D"), people("district t#/A 8/B 8/C 8/E 8", "t")}, Trials: "t"},
			`cases.csv: 4 of 5 rows cannot be used, more than half: column "district", districts.geojson has no such place (1); column "district", key is missing (1); ` +
				`column "district", population.csv has no row with this key (1); 1 more reasons; for example row 3 (line 4), where districts.geojson has no such place: "E"`,
			`check that --key names the right column of each file; keys of population.csv that no row has: "C"`},
		{"more than half without key", "cases# district/5 B/6 -/7 -", Join{Sides: []Side{people("district/B")}},
			`cases.csv: 2 of 3 rows cannot be used, more than half: column "district", key is missing (2); for example row 2 (line 3), where key is missing`,
			`check that --key names the right column of each file`},

		{"absent, one", "cases# district/5 B/6 A", Join{Sides: []Side{abc}}, `1 place of districts.geojson has no row in cases.csv: "C"`, adviceAbsent},
		{"absent, seven", "cases# district/5 B", Join{Sides: []Side{places("@ NAME/1 H/2 G/3 B/4 F/5 E/6 D/7 C/8 A")}},
			`7 places of districts.geojson have no row in cases.csv: "A", "C", "D", "E", "F" and 2 more`, adviceAbsent},
		{"absent, zero, a covariate", "cases# district depth#/5 B 1/6 C 2", Join{Sides: []Side{abc}, Absent: AbsentZero},
			`cases.csv: column "depth": has no value for places without a row, such as "A"`, adviceGap},
		{"absent, zero, a category", "cases# district soil/5 B loam", Join{Sides: []Side{abc}, Absent: AbsentZero, Keep: []string{"note"}},
			`cases.csv: column "soil": has no value for places without a row, such as "A"`, adviceGap},
		{"absent, zero, trials", "cases# examined# district/5 9 B", Join{Sides: []Side{abc}, Absent: AbsentZero, Trials: "examined"},
			`cases.csv: column "examined": has no value for places without a row, such as "A"`, adviceGap},

		{"absent, zero, unknown to a side", "cases# district/5 B", Join{Sides: []Side{abc, people("district people#/A 1/B 2", "people")}, Absent: AbsentZero},
			`1 place of districts.geojson has no row in population.csv, so nothing found there means nothing: "C"`, "add them to population.csv, or say --absent missing"},
		{"absent, zero, seven unknown to a side", "cases# district/5 B",
			Join{Sides: []Side{places("@ NAME/1 H/2 G/3 B/4 F/5 E/6 D/7 C/8 A"), people("district/B")}, Absent: AbsentZero},
			`7 places of districts.geojson have no row in population.csv, so nothing found there means nothing: "A", "C", "D", "E", "F" and 2 more`,
			"add them to population.csv, or say --absent missing"},
		{"absent, zero, unusable in a side", "cases# district/5 B", Join{Absent: AbsentZero,
			Sides: []Side{abc, {Table: sheet("p.csv", "district/A/B"), Key: "district", Lost: Lost{"C": {Reason: "people is not above 0"}}}}},
			`1 place of districts.geojson has no usable row in p.csv, so nothing found there means nothing: "C"`, "add them to p.csv, or say --absent missing"},
		{"absent, zero, a row without a key", "cases# district/5 B/6 A/7 -/8 B", Join{Sides: []Side{abc}, Absent: AbsentZero},
			`cases.csv: row 3 (line 4), column "district": key is missing, so the row is set aside; with --absent zero what is missing at its place would turn into 0`, adviceStray},
		{"absent, zero, rows of no place", "cases# district/5 B/6 Ashby/7 Ashbee/8 -/8 B/8 B/8 B", Join{Sides: []Side{places("@ NAME/1 Ashby/2 B/3 Ashbe")}, Absent: AbsentZero},
			`cases.csv: row 3 (line 4), column "district": districts.geojson has no such place: "Ashbee", so the row is set aside, one of 2; ` +
				`with --absent zero what is missing at its place would turn into 0`, `did you mean "Ashbe"? ` + adviceStray},
		{"absent, zero, a row of no place by another side", "cases# district/5 B/6 Q/7 B", Join{Sides: []Side{people("district/A/B/C"), abc}, Absent: AbsentZero},
			`cases.csv: row 2 (line 3), column "district": population.csv has no row with this key: "Q", so the row is set aside; ` +
				`with --absent zero what is missing at its place would turn into 0`, `did you mean "A"? ` + adviceStray},
		{"absent, zero, a row lost before that has no key", "cases# district/5 B", Join{Sides: []Side{abc}, Absent: AbsentZero,
			Lost: Lost{"": {Line: 4, Row: 3, Column: "cases", Reason: "response is missing"}, "A": {Line: 5, Row: 4}, "Q": {Line: 9, Row: 8}}},
			`cases.csv: row 3 (line 4), column "cases": response is missing, so the row is set aside, one of 2; with --absent zero what is missing at its place would turn into 0`,
			adviceStray},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			table := sheet("cases.csv", test.rows)
			test.join.Key, test.join.Response = "district", "cases"
			_, err := table.Join(test.join)
			checkRefusal(t, err, test.err, test.hint)
			if diff := cmp.Diff(sheet("cases.csv", test.rows), table); diff != "" {
				t.Errorf("the table has changed (-before +after):\n%s", diff)
			}
		})
	}
}

func checkRefusal(t *testing.T, err error, want, advice string) {
	t.Helper()
	var e *Error
	if !errors.As(err, &e) {
		t.Fatalf("got %v, want %s", err, want)
	}
	if err.Error() != want || e.Advice != advice {
		t.Errorf("got\n%s\n%s, want\n%s\n%s", err, e.Advice, want, advice)
	}
}

// What the rows set aside before the join mean for places without a row depends on whose they are.
func TestJoinRowsSetAsideBefore(t *testing.T) {
	cases := func() *Table {
		t := sheet("cases.csv", "cases# district/5 B/6 B/7 B")
		return lost(t, 4, "cases", "NA", "missing-response", "response is missing")
	}
	join := Join{Key: "district", Response: "cases", Sides: []Side{places("@ NAME/1 A/2 B/3 C")}}
	_, err := cases().Join(join)
	checkRefusal(t, err, `2 places of districts.geojson have no usable row in cases.csv: "A", "C"`, adviceAbsent)

	join.Absent = AbsentZero
	_, err = cases().Join(join)
	checkRefusal(t, err, `cases.csv: row 4 (line 5), column "cases": response is missing: "NA", so the row is set aside; `+
		`with --absent zero what is missing at its place would turn into 0`, "correct such rows or take them out of the file, or say --absent missing")

	_, err = lost(cases(), 5, "cases", "-1", "negative-count", "response is negative").Join(join)
	checkRefusal(t, err, `cases.csv: row 4 (line 5), column "cases": response is missing: "NA", so the row is set aside, one of 2; `+
		`with --absent zero what is missing at its place would turn into 0`, "correct such rows or take them out of the file, or say --absent missing")

	summed := sheet("cases.csv", "cases# district/5 B/6 B/7 -")
	if _, err := summed.SumBy("district", Summing{Add: []string{"cases"}}); err != nil {
		t.Fatal(err)
	}
	_, err = summed.Join(join)
	checkRefusal(t, err, `cases.csv: row 3 (line 4), column "district": key is missing, so the row is set aside; `+
		`with --absent zero what is missing at its place would turn into 0`, adviceStray)

	all := sheet("cases.csv", "district/B/B/B/C")
	table := cases()
	join.Lost = table.Lost(all, "district")
	if _, err = table.Join(join); err != nil {
		t.Fatal(err)
	}
	if got, want := words(table), "row cases district/1 5 B @2/2 6 B @2/3 7 B @2/0 0 A @1"; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
	if table.Rows != 4 || len(table.Aside) != 1 {
		t.Errorf("%d rows, aside %v", table.Rows, table.Aside)
	}
}

// Rows lost in reading and rows lost in joining count together, and are told in the order of the source.
func TestJoinCountsWithReading(t *testing.T) {
	table := sheet("cases.csv", "cases# district/5 B/6 D/7 B/8 B")
	table.Row, table.Line = []int32{1, 2, 4, 5}, []int32{2, 3, 5, 6}
	lost(table, 3, "cases", "", "missing-response", "response is missing")
	if _, err := table.Join(Join{Key: "district", Sides: []Side{people("district/B")}}); err != nil {
		t.Fatal(err)
	}
	if got, want := asides(table), "2 no-match district \"D\": population.csv has no row with this key\n3 missing-response cases \"\": response is missing"; got != want {
		t.Errorf("got\n%s, want\n%s", got, want)
	}

	table = sheet("cases.csv", "cases# district/5 B/6 D")
	table.Row, table.Line = []int32{1, 2}, []int32{2, 3}
	lost(table, 3, "cases", "", "missing-response", "response is missing")
	_, err := table.Join(Join{Key: "district", Sides: []Side{people("district/B")}})
	checkRefusal(t, err, `cases.csv: 2 of 3 rows cannot be used, more than half: column "district", population.csv has no row with this key (1); `+
		`column "cases", response is missing (1); for example row 2 (line 3), where population.csv has no row with this key: "D"`,
		"check that --key names the right column of each file")
}

// The places bring with them all that is said of coordinates.
func TestJoinTakesWhatPlacesSay(t *testing.T) {
	side := places("@ NAME/1 B")
	side.Table.XName, side.Table.YName, side.Table.GeometryName, side.Table.CRS = "lon", "lat", "shape", "EPSG:4326"
	side.Table.Degrees, side.Table.Recognised, side.Table.PassedOver = true, true, []string{"x/y"}
	table := sheet("cases.csv", "cases# district/5 B")
	table.Separator, table.Encoding = ';', "UTF-8"
	if _, err := table.Join(Join{Key: "district", Sides: []Side{side}}); err != nil {
		t.Fatal(err)
	}
	want := &Table{Source: "cases.csv", Rows: 1, XName: "lon", YName: "lat", GeometryName: "shape", CRS: "EPSG:4326", Degrees: true, Recognised: true,
		PassedOver: []string{"x/y"}, Separator: ';', Encoding: "UTF-8"}
	if diff := cmp.Diff(want, table, cmpopts.IgnoreFields(Table{}, "Line", "Row", "Columns", "Geometry")); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

// The readers drop blanks around keys, and no more.
func TestJoinKeysAsRead(t *testing.T) {
	table, err := read("x,y,z,at\n1,2,3, New  Town \n", Request{Response: "z", Kind: Measure, Keep: []string{"at"}})
	if err != nil {
		t.Fatal(err)
	}
	_, err = table.Join(Join{Key: "at", Sides: []Side{people("district/New_Town")}})
	checkRefusal(t, err, `wells.csv: column "at": keys differ from those of population.csv only in how they are written: "New  Town" from "New Town" in white space`,
		adviceAlike)
}

// The keys are made up; what is alike follows from Unicode's canonical equivalence and case folding (UAX 15; The
// Unicode Standard, 3.13), and the habits of spreadsheets are common practice, no source.
func TestNearMisses(t *testing.T) {
	tests := []struct{ a, b, differs string }{
		{"nord", "Nord", "in capitals"},
		{"NORD", "nord", "in capitals"},
		{"GROSSWEG", "Großweg", "in capitals"},
		{"ΠΛΑΤΟΣ", "πλατος", "in capitals"},
		{"İl", "il", "in capitals"},
		{"Be\u0301ry", "B\u00e9ry", "in how letters are composed"},
		{"be\u0301ry", "B\u00e9ry", "in capitals and in how letters are composed"},
		{"New Town", "New  Town", "in white space"},
		{"New\u00a0Town", "New Town", "in white space"},
		{"New\tTown", "New Town", "in white space"},
		{" Town", "Town", "in white space"},
		{"New\u200b Town", "New Town", "in white space"},
		{"new town", "New\u202fTown", "in capitals and in white space"},
		{"7", "007", "in leading zeros"},
		{"0", "000", "in leading zeros"},
		{"37001.0", "37001", "in how the number is written"},
		{"37001,00", "37001", "in how the number is written"},
		{"7.0", "007", "in how the number is written and in leading zeros"},

		{"7", "70", ""},
		{"1.1", "1.10", ""},
		{"1e3", "1000", ""},
		{"A7", "A07", ""},
		{"NewTown", "New Town", ""},
		{"Bery", "B\u00e9ry", ""},
		{"-7", "7", ""},
		{"v.0", "v", ""},
		{".0", "", ""},
		{"7.", "7", ""},
		{"North", "Nord", ""},
	}
	for _, test := range tests {
		for _, pair := range [][2]string{{test.a, test.b}, {test.b, test.a}} {
			m := match{unmatched: pair[:1], unused: pair[1:], key: &Column{}}
			misses, _ := m.nearMisses()
			switch {
			case test.differs == "" && len(misses) > 0:
				t.Errorf("%q and %q are alike: %v", pair[0], pair[1], misses)
			case test.differs != "" && !slices.Equal(misses, []Alike{{pair[0], pair[1], test.differs}}):
				t.Errorf("%q and %q: %v, want %q", pair[0], pair[1], misses, test.differs)
			}
		}
	}
}

// Two keys are the same in folded case wherever strings.EqualFold says so.
func TestFoldCaseIsNoFinerThanEqualFold(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		letters := rapid.SampledFrom([]rune("aAbBkK\u212asSſσςΣßẞǅǆǄéÉμµ"))
		a := rapid.SliceOfN(letters, 0, 3).Draw(t, "a")
		b := rapid.SliceOfN(letters, len(a), len(a)).Draw(t, "b")
		if strings.EqualFold(string(a), string(b)) && even(string(a), ways) != even(string(b), ways) {
			t.Fatalf("%q and %q differ", string(a), string(b))
		}
	})
}

// Join against nested loops over the rows of all tables.
func TestJoinIsNestedLoops(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		keys := rapid.SampledFrom([]string{"A", "B", "C", "D", "E", "-"})
		rows := rapid.SliceOfN(keys, 1, 8).Draw(t, "rows")
		distinct := rapid.SliceOfNDistinct(rapid.SampledFrom([]string{"A", "B", "C", "D", "E", "F"}), 0, 6, rapid.ID[string])
		at, with := distinct.Draw(t, "places"), distinct.Draw(t, "people")
		absent := rapid.SampledFrom([]Absent{AbsentRefused, AbsentZero, AbsentMissing}).Draw(t, "absent")

		text := "cases# district"
		for i, key := range rows {
			text += fmt.Sprintf("/%d %s", i+1, key)
		}
		table := sheet("cases.csv", text)
		a, b := "@ NAME", "t# district"
		for i, key := range at {
			a += fmt.Sprintf("/%d %s", i+1, key)
		}
		for i, key := range with {
			b += fmt.Sprintf("/%d %s", i+4, key)
		}

		want, kept, aside := "row cases district t", 0, 0
		for i, key := range rows {
			p, q := slices.Index(at, key), slices.Index(with, key)
			if p < 0 || q < 0 || i+1 > q+4 {
				aside++
				continue
			}
			kept++
			want += fmt.Sprintf("/%d %d %s %d @%d", i+1, i+1, key, q+4, p+1)
		}
		added, lacking, unknown := 0, 0, false
		for p, key := range at {
			if slices.Contains(rows, key) {
				continue
			}
			lacking++
			q := slices.Index(with, key)
			unknown = unknown || q < 0
			if q >= 0 && absent == AbsentZero {
				added++
				want += fmt.Sprintf("/0 0 %s %d @%d", key, q+4, p+1)
			}
		}
		stray := slices.ContainsFunc(rows, func(key string) bool { return !slices.Contains(at, key) })
		refused := aside > len(rows)/2 || lacking > 0 && (absent == AbsentRefused || absent == AbsentZero && (unknown || stray))

		report, err := table.Join(Join{Key: "district", Response: "cases", Trials: "t", Absent: absent, Sides: []Side{places(a), people(b, "t")}})
		if refused != (err != nil) {
			t.Fatalf("error %v", err)
		}
		if refused {
			return
		}
		if got := words(table); got != want {
			t.Fatalf("got\n%s, want\n%s", got, want)
		}
		if len(table.Aside) != aside || report.Added != added || len(report.Absent) != lacking {
			t.Fatalf("aside %v, report %v", table.Aside, report)
		}
		for _, c := range table.Columns {
			checkLevels(t, c)
		}
	})
}

// A mistake of the caller is no matter of the data.
func TestJoinPanics(t *testing.T) {
	tests := []struct {
		name string
		join Join
		want string
	}{
		{"no key", Join{Key: "at"}, `observe: cases.csv has no text column "at"`},
		{"key of numbers", Join{Key: "cases"}, `observe: cases.csv has no text column "cases"`},
		{"no key in a side", Join{Key: "district", Sides: []Side{{Table: sheet("p.csv", "at/A")}}}, `observe: p.csv has no text column ""`},
		{"no such column", Join{Key: "district", Sides: []Side{people("district/A", "people")}}, `observe: population.csv has no column "people"`},
		{"no response", Join{Key: "district", Response: "count"}, `observe: cases.csv has no column "count" of numbers`},
		{"taken twice", Join{Key: "district", Sides: []Side{people("district cases#/A 1", "cases")}},
			`observe: column "cases" would come from population.csv and from another table`},
		{"places twice", Join{Key: "district", Sides: []Side{places("@ NAME/1 A"), places("@ NAME/1 A")}}, `observe: places would come from two tables`},
		{"no places", Join{Key: "district", Sides: []Side{{Table: sheet("p.csv", "at/A"), Key: "at", Places: true}}}, `observe: p.csv has no places`},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			defer func() {
				if got := recover(); got != test.want {
					t.Errorf("got %v, want %s", got, test.want)
				}
			}()
			sheet("cases.csv", "cases# district/5 A").Join(test.join)
		})
	}
}

func TestLost(t *testing.T) {
	table := lost(sheet("cases.csv", "cases# district/5 B"), 2, "cases", "NA", "missing-response", "response is missing")
	lost(table, 3, "cases", "-1", "negative-count", "response is negative")
	lost(table, 4, "cases", "x", "not-a-number", "response is not a number")
	got := table.Lost(sheet("cases.csv", "district/B/C/C/-"), "district")
	if diff := cmp.Diff(Lost{"C": table.Aside[0], "": table.Aside[2]}, got); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if got := sheet("cases.csv", "cases#/5").Lost(nil, "district"); got == nil || len(got) != 0 {
		t.Errorf("nothing is lost, but got %v", got)
	}
}

// million returns a table of a million rows at 3000 districts, and the places.
func million() (*Table, Side) {
	const n, districts = 1_000_000, 3000
	random := rand.New(rand.NewPCG(1, 2))
	side := Side{Table: &Table{Source: "districts.geojson", Rows: districts}, Key: "NAME", Places: true}
	names := Column{Name: "NAME"}
	for i := range districts {
		names.Level = append(names.Level, fmt.Sprintf("District %04d", i))
		names.Code = append(names.Code, int32(i))
		side.Table.Row, side.Table.Line = append(side.Table.Row, int32(i+1)), append(side.Table.Line, int32(i+2))
		side.Table.Geometry = append(side.Table.Geometry, orb.Point{float64(i), 0})
	}
	side.Table.Columns = []Column{names}
	table := &Table{Source: "cases.csv", Rows: n, Row: make([]int32, n), Line: make([]int32, n)}
	district := Column{Name: "district", Level: names.Level, Code: make([]int32, n)}
	cases := Column{Name: "cases", Number: make([]float64, n)}
	for i := range n {
		table.Row[i], table.Line[i] = int32(i+1), int32(i+2)
		district.Code[i], cases.Number[i] = random.Int32N(districts), float64(random.IntN(10))
	}
	table.Columns = []Column{district, cases}
	return table, side
}

func BenchmarkJoin(b *testing.B) {
	table, side := million()
	for b.Loop() {
		again := *table
		if _, err := again.Join(Join{Key: "district", Response: "cases", Sides: []Side{side}}); err != nil {
			b.Fatal(err)
		}
	}
}

package observe

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"github.com/paulmach/orb"
)

// Summing says how rows of one place become one.
type Summing struct {
	Add []string // columns of numbers that are added up: response, trials, denominator

	// Whole says that a sum counts too little if any row of its place was set aside when the table was read, as it does
	// where the people or trials it is held against come from elsewhere. Lost tells these places. Where numerator and
	// denominator are both in Add, a row that lacks in both does no harm, and Whole is false.
	Whole bool
	Lost  Lost // with Whole: of the table; nil is not known

	Strict bool // refuse the first row that would be set aside
}

// Sums counts what SumBy did.
type Sums struct {
	From int // rows that were summed
	Into int // rows they became: the values of the column
}

// SumBy makes one row of all rows that have the same value in a column of text. Columns in Add are added up, whole
// numbers exactly (below 2^53) and fractions with compensation, so that their order hardly counts. Every other column
// and the geometry must be the same in all rows of a value. Rows come in the order in which their values appear; Line
// and Row are those of the first, and text that was kept of a column in Add is missing where rows were summed.
//
// SumBy is meant to come before Join, while the table has only columns of its own: denominators joined later belong to
// the place and are not added up. It may also come after. Table.Rows stays the number of rows in the source.
//
// Rows without a value are set aside (missing-key), and with Whole also the rows of values that lost a row before
// (incomplete-sum). An *Error is returned, and t stays as it is, if two rows of a value differ, if a sum is beyond the
// largest number, if more than half of the rows would be set aside, or any if strict, and if Whole is asked for a table
// with rows set aside whose values nobody knows. SumBy panics if a column is absent, or added up without being numbers.
func (t *Table) SumBy(by string, o Summing) (Sums, error) {
	g, err := t.group(by, o)
	if err != nil {
		return Sums{}, err
	}
	out := *t
	out.Aside = t.addAside(g.aside)
	out.Line, out.Row = pickSlice(t.Line, g.first), pickSlice(t.Row, g.first)
	out.Columns = nil
	for i := range t.Columns {
		c, err := g.column(&t.Columns[i], slices.Contains(o.Add, t.Columns[i].Name))
		if err != nil {
			return Sums{}, err
		}
		out.Columns = append(out.Columns, c)
	}
	if len(t.Geometry) > 0 {
		if err := g.sameGeometry(); err != nil {
			return Sums{}, err
		}
		out.Geometry = pickSlice(t.Geometry, g.first)
	}
	*t = out
	return Sums{From: len(g.row), Into: len(g.first)}, nil
}

// groups are the rows of a table by the values of a column.
type groups struct {
	table *Table
	by    *Column
	row   []int32 // rows that belong to a group, ascending
	of    []int32 // the group of each of them
	first []int32 // first row of each group
	rows  []int   // number of rows of each group
	aside []Aside
}

// group puts rows together and sets aside those that belong nowhere.
func (t *Table) group(by string, o Summing) (*groups, error) {
	g := &groups{table: t, by: t.text(by)}
	for _, name := range o.Add {
		t.number(name)
	}
	if o.Whole && o.Lost == nil && len(t.Aside) > 0 {
		a := t.Aside[0]
		return nil, &Error{File: t.Source, Line: int(a.Line), Row: int(a.Row), Column: a.Column, Value: a.Value,
			What:   a.alone(len(t.Aside)) + "; a sum without it would be too small",
			Advice: "correct such rows, or take them out of the file"}
	}
	number := make([]int32, len(g.by.Level))
	for i := range number {
		number[i] = -1
	}
	for r, code := range g.by.Code {
		if code < 0 {
			g.aside = append(g.aside, t.withoutKey(r, by))
			continue
		}
		if lost, is := o.Lost[g.by.Level[code]]; is && o.Whole {
			g.aside = append(g.aside, g.incomplete(r, lost))
			continue
		}
		if number[code] < 0 {
			number[code] = int32(len(g.first))
			g.first, g.rows = append(g.first, int32(r)), append(g.rows, 0)
		}
		g.row, g.of = append(g.row, int32(r)), append(g.of, number[code])
		g.rows[number[code]]++
	}
	return g, t.checkAside(g.aside, o.Strict, "check that --sum-by names the right column")
}

// incomplete sets a row aside because another of its value is lost.
func (g *groups) incomplete(row int, lost Aside) Aside {
	return Aside{Line: g.table.Line[row], Row: g.table.Row[row], Column: g.by.Name, Value: shorten(g.by.Level[g.by.Code[row]]),
		Code: "incomplete-sum", Reason: "another row to be summed with it cannot be used: " + lost.Reason}
}

// column returns the column of the groups: the sum of each, or the value that all rows of a group have.
func (g *groups) column(c *Column, add bool) (Column, error) {
	if !add {
		if err := g.same(c); err != nil {
			return Column{}, err
		}
		return c.pick(g.first), nil
	}
	out := c.pick(g.first)
	if out.Code != nil {
		for k, rows := range g.rows {
			if rows > 1 {
				out.Code[k] = -1
			}
		}
		out.dropUnused()
	}
	return out, g.sum(c, out.Number)
}

// sum adds up the rows of each group by the compensated summation of A. Neumaier (1974, Z. angew. Math. Mech.
// 54:39-51).
func (g *groups) sum(c *Column, to []float64) error {
	clear(to)
	lost := make([]float64, len(to)) // what rounding took from each sum
	for i, r := range g.row {
		k, v := g.of[i], c.Number[r]
		s := to[k] + v
		if math.Abs(to[k]) >= math.Abs(v) {
			lost[k] += to[k] - s + v
		} else {
			lost[k] += v - s + to[k]
		}
		to[k] = s
	}
	for k := range to {
		if to[k] += lost[k]; math.IsInf(to[k], 0) || math.IsNaN(to[k]) {
			level := g.by.Level[g.by.Code[g.first[k]]]
			return &Error{File: g.table.Source, Column: c.Name, What: fmt.Sprintf("the sum for %q is beyond the largest number", shorten(level)),
				Advice: "check the column for marks of missing values, and name them with --missing"}
		}
	}
	return nil
}

// same refuses a column that has two values in one group.
func (g *groups) same(c *Column) error {
	for i, r := range g.row {
		first := g.first[g.of[i]]
		if c.Number != nil && c.Number[r] != c.Number[first] {
			return g.refuse(first, r, c.Name, strconv.FormatFloat(c.Number[first], 'g', -1, 64), strconv.FormatFloat(c.Number[r], 'g', -1, 64))
		}
		if c.Code != nil && c.Code[r] != c.Code[first] {
			return g.refuse(first, r, c.Name, c.quoted(first), c.quoted(r))
		}
	}
	return nil
}

// quoted returns the text of a row for a message.
func (c *Column) quoted(row int32) string {
	if c.Code[row] < 0 {
		return "nothing"
	}
	return strconv.Quote(shorten(c.Level[c.Code[row]]))
}

// sameGeometry refuses a group whose rows were observed at two places.
func (g *groups) sameGeometry() error {
	at := g.table.Geometry
	for i, r := range g.row {
		first := g.first[g.of[i]]
		if !equalGeometry(at[first], at[r]) {
			has, got := geometryWord(at[first]), geometryWord(at[r])
			if has == got {
				got = "another" + strings.TrimPrefix(got, "a")
			}
			return g.refuse(first, r, "", has, got)
		}
	}
	return nil
}

func equalGeometry(a, b orb.Geometry) bool {
	if a == nil || b == nil {
		return a == nil && b == nil
	}
	return orb.Equal(a, b)
}

// geometryWord names a geometry in messages: a point by its coordinates.
func geometryWord(g orb.Geometry) string {
	switch g := g.(type) {
	case nil:
		return "no place"
	case orb.Point:
		return fmt.Sprintf("the place %s %s", strconv.FormatFloat(g[0], 'g', -1, 64), strconv.FormatFloat(g[1], 'g', -1, 64))
	}
	return "a " + g.GeoJSONType()
}

// refuse names two rows that cannot be summed, and what each of them has; no column is the geometry.
func (g *groups) refuse(first, second int32, column, has, got string) error {
	t := g.table
	e := &Error{File: t.Source, Line: int(t.Line[second]), Row: int(t.Row[second]), Column: column, Value: got,
		Advice: "make the column the same in all rows to be summed, or leave it out: only the response, the trials and the denominator are added up"}
	if column == "" {
		e.Value = ""
		e.Advice = "give all rows to be summed the same place, or leave out --sum-by"
	}
	e.What = fmt.Sprintf("%s where %s has %s, and both are summed as %s %s",
		got, rowWord(t.Row[first], t.Line[first]), has, plainOrQuoted(g.by.Name), g.by.quoted(first))
	return e
}

package observe

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
)

// ColumnKind is what all values of a column are, or most of them if they are geometries.
type ColumnKind string

// The kinds of columns.
const (
	WholeNumbers ColumnKind = "whole numbers"
	Numbers      ColumnKind = "numbers"
	TruthValues  ColumnKind = "truth values" // words such as yes and no; 0 and 1 are whole numbers
	Dates        ColumnKind = "dates"
	Geometries   ColumnKind = "geometry" // most of them are WKT or EWKB in hexadecimal
	Text         ColumnKind = "text"
	Empty        ColumnKind = "empty"
)

// SurveyColumn describes the values of a column. The figures of numbers are those of the values that are finite numbers,
// and NaN where there are none.
type SurveyColumn struct {
	Name string
	Kind ColumnKind
	Date DateForm // how dates are written; empty for other kinds

	Values, Missing int
	Distinct        int  // numbers count by their value, other values by their letters
	More            bool // there are more than Distinct
	Unique          bool // there is a value in every row, each once; not told of columns with more unless they ascend
	Ascending       bool // numbers, each above the one before it, at least two

	Levels    []string // distinct values in the order of their first rows; nil where there are more
	LevelRows []int    // rows of each

	Numbers, Whole, Zeros, Negatives int
	Least, Low, Median, High, Most   float64 // Low and High have 5 per cent of the numbers beyond them
	Mean                             float64
	Examples                         []string // the first three distinct values

	NotNumbers NotNumbers
	Shapes     *SurveyShapes // of Geometries; nil for other kinds

	Number []float64 // of the sampled rows; NaN where there is no number
	Code   []int32   // of the sampled rows, index into Levels; -1 where there is no value
}

// NotNumbers are the values of a column that are no finite numbers, and what they may have been meant as.
type NotNumbers struct {
	Values    int
	Line, Row int    // of the first
	Value     string // the first

	DecimalCommas int // as in 3,7
	Grouped       int // as in 12,500 or 12 500: thousands set apart, unless the comma is a decimal one
	Limits        int // as in <0.5
	Infinite      int
}

// mostExamples is how many values are shown of a column.
const mostExamples = 3

// columnSurvey makes the description of a column, value by value.
type columnSurvey struct {
	out     SurveyColumn
	format  *Format
	most    int              // distinct values, and numbers in the reservoir
	codes   map[string]int32 // nil once there are too many
	key     []byte
	drawn   []float64 // numbers behind the quantiles
	random  *rand.Rand
	truths  int
	dates   dateCounts
	last    float64 // the number of the row at hand, or NaN
	highest float64 // the number before
	rises   bool

	shapes  *shapeSurvey // nil as long as nothing looked like a geometry
	written int          // values that are geometries, with positions or without
	named   bool         // the column is said to be of geometries
	first   firstValue
}

// firstValue is the first value of a column, and where it stands; a zero row for none.
type firstValue struct {
	line, row int
	text      string
}

func newColumnSurvey(name string, format *Format, most int, random *rand.Rand) *columnSurvey {
	return &columnSurvey{out: SurveyColumn{Name: name, Least: math.Inf(1), Most: math.Inf(-1)}, format: format, most: most,
		codes: map[string]int32{}, random: random, highest: math.Inf(-1), rises: true}
}

// expectShapes makes the column one of geometries, whatever its values look like.
func (c *columnSurvey) expectShapes() *shapeSurvey {
	c.shapes, c.named = &shapeSurvey{}, true
	return c.shapes
}

// take counts a trimmed value, and puts it into the sample at a position that is not below 0.
func (c *columnSurvey) take(s string, line, row, slot int) {
	code := int32(-1)
	v, fault := c.format.number(s)
	if c.shape(s, line, row) {
		v, fault = notANumber, faultNumber
	}
	c.last = v
	if fault == faultMissing {
		c.out.Missing++
	} else {
		c.out.Values++
		if fault == "" {
			c.number(v)
		} else {
			c.text(s, line, row, fault)
		}
		code = c.level(s, v, fault == "")
	}
	if slot == len(c.out.Number) {
		c.out.Number, c.out.Code = append(c.out.Number, v), append(c.out.Code, code)
	} else if slot >= 0 {
		c.out.Number[slot], c.out.Code[slot] = v, code
	}
}

// shape looks at a value as a geometry, and reports whether it is one. Before the first that may be one, nothing is kept.
func (c *columnSurvey) shape(s string, line, row int) bool {
	switch {
	case c.shapes != nil:
	case couldBeShape(s):
		c.shapes = newShapeSurvey(c.out.Missing, c.out.Values, c.first, c.format)
	default:
		if c.first.row == 0 && !c.format.isMissing(s) {
			c.first = firstValue{line, row, shorten(s)}
		}
		return false
	}
	at := parseSite(s, c.format)
	c.shapes.take(&at, line, row)
	if at.code != faultGeometry && !c.format.isMissing(s) {
		c.written++
	}
	return at.geometry != nil
}

// number counts a finite number.
func (c *columnSurvey) number(v float64) {
	o := &c.out
	o.Numbers++
	if v == math.Trunc(v) {
		o.Whole++
	}
	switch {
	case v == 0:
		o.Zeros++
	case v < 0:
		o.Negatives++
	}
	o.Least, o.Most = min(o.Least, v), max(o.Most, v)
	o.Mean += v/float64(o.Numbers) - o.Mean/float64(o.Numbers)
	c.rises = c.rises && v > c.highest
	c.highest = v
	if len(c.drawn) < c.most {
		c.drawn = append(c.drawn, v)
	} else if at := c.random.IntN(o.Numbers); at < c.most {
		c.drawn[at] = v
	}
}

// text counts a value that is no finite number.
func (c *columnSurvey) text(s string, line, row int, fault string) {
	n := &c.out.NotNumbers
	if n.Values++; n.Values == 1 {
		n.Line, n.Row, n.Value = line, row, shorten(s)
	}
	if fault == faultInfinite {
		n.Infinite++
		return
	}
	switch {
	case isTruth(s):
		c.truths++
	case c.dates.take(s):
	case c.isLimit(s):
		n.Limits++
	case grouped(s):
		n.Grouped++
	case hasDecimalComma(s):
		n.DecimalCommas++
	}
}

func (c *columnSurvey) isLimit(s string) bool {
	_, is := c.format.limit(s)
	return is
}

// longestLevel is the length in bytes up to which a value is kept whole.
const longestLevel = 64

// level returns the code of a value, a new one if need be; -1 once there are too many.
func (c *columnSurvey) level(s string, v float64, isNumber bool) int32 {
	if c.codes == nil {
		return -1
	}
	switch {
	case isNumber:
		c.key = strconv.AppendFloat(c.key[:0], v+0, 'g', -1, 64)
	case len(s) > longestLevel:
		c.key = fmt.Appendf(c.key[:0], "%s%x", s[:longestLevel], hashed([]string{s}))
	default:
		c.key = append(c.key[:0], s...)
	}
	code, seen := c.codes[string(c.key)]
	if !seen {
		if len(c.codes) == c.most {
			c.codes, c.out.More = nil, true
			c.out.Levels, c.out.LevelRows = nil, nil
			return -1
		}
		code = int32(len(c.codes))
		c.codes[string(c.key)] = code
		c.out.Levels, c.out.LevelRows = append(c.out.Levels, shorten(s)), append(c.out.LevelRows, 0)
		c.out.Distinct++
		if len(c.out.Examples) < mostExamples {
			c.out.Examples = append(c.out.Examples, shorten(s))
		}
	}
	c.out.LevelRows[code]++
	return code
}

func (c *columnSurvey) finish() SurveyColumn {
	o := c.out
	o.Kind = c.kind()
	if o.Kind == Dates {
		o.Date = c.dates.form()
	}
	if o.Kind == Geometries {
		o.Shapes = c.shapes.finish()
	}
	o.Ascending = o.Numbers > 1 && o.Numbers == o.Values && c.rises
	o.Unique = o.Values > 0 && o.Missing == 0 && (o.Ascending || !o.More && o.Distinct == o.Values)
	slices.Sort(c.drawn)
	o.Low, o.Median, o.High = quantile(c.drawn, 0.05), quantile(c.drawn, 0.5), quantile(c.drawn, 0.95)
	if o.Numbers == 0 {
		o.Least, o.Most, o.Mean = math.NaN(), math.NaN(), math.NaN()
	}
	if o.More {
		for i := range o.Code {
			o.Code[i] = -1 // of levels that are not kept
		}
	}
	return o
}

func (c *columnSurvey) kind() ColumnKind {
	o := &c.out
	if c.named || 2*c.written > o.Values {
		return Geometries
	}
	switch o.Values {
	case 0:
		return Empty
	case o.Whole:
		return WholeNumbers
	case o.Numbers:
		return Numbers
	case c.truths:
		return TruthValues
	case c.dates.iso, c.dates.points, c.dates.slashes:
		return Dates
	}
	return Text
}

// quantile interpolates between the order statistics of sorted numbers (Hyndman & Fan 1996, Am. Stat. 50:361-365,
// definition 7); NaN for none.
func quantile(sorted []float64, p float64) float64 {
	if len(sorted) == 0 {
		return math.NaN()
	}
	at := p * float64(len(sorted)-1)
	i := int(at)
	if i+1 >= len(sorted) {
		return sorted[i]
	}
	share := at - float64(i)
	return sorted[i]*(1-share) + sorted[i+1]*share
}

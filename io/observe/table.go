package observe

import (
	"cmp"
	"fmt"
	"iter"
	"slices"

	"github.com/paulmach/orb"
)

// Table holds the rows that can be used, in the order of the source, and the rows that were set aside. All slices but
// Aside have one entry a kept row.
type Table struct {
	Source   string         // the name the source was given, as in messages
	Line     []int32        // line of the source on which the row starts; the header of a CSV table stands on line 1
	Row      []int32        // number of the row below the header, or of the feature, from 1
	Columns  []Column       // what the request asked for, each column once, in the order of Request
	Geometry []orb.Geometry // where the row was observed, in easting and northing or longitude and latitude; nil with Request.NoPlaces

	XName, YName string   // the columns the coordinates came from; empty where rows have geometries
	GeometryName string   // the column the geometries came from, "geometry" for those of features; empty for coordinates
	Features     bool     // the geometries are those of features (GeoJSON)
	CRS          string   // what the source says its coordinates are in, such as "EPSG:32633"; empty where it says nothing
	Degrees      bool     // the coordinates are longitude and latitude in degrees
	Recognised   bool     // the coordinate columns were found by their names, not named by the user
	PassedOver   []string // recognised pairs that were present but not used, such as "x/y"

	Separator rune   // what stands between the columns, named or found; 0 for features
	Encoding  string // of the text: "UTF-8", "UTF-16 LE", "UTF-16 BE" or "Windows-1252"

	BelowLimit []BelowCount // columns with values below a detection limit that a rule took care of, in the order of the checks

	Rows  int     // rows in the source, kept or not
	Aside []Aside // rows left out, in the order of the source
}

// Column is one column of a Table. A column asked for as a number has Number, one asked for as text has Code and
// Level; a column asked for as both has all three.
type Column struct {
	Name   string
	Number []float64 // finite values
	Code   []int32   // index into Level; -1 where a column that is only kept (Request.Keep) has no value
	Level  []string  // distinct values of the kept rows, sorted by their bytes
}

// BelowCount says how many values of a column are below a detection limit, and what became of them.
type BelowCount struct {
	Column string
	Rows   int        // kept rows in which the rule stands for the value; with AsideLimit rows set aside for it
	Rule   BelowLimit // HalfLimit, AtLimit or AsideLimit
}

// Aside is a row that was left out.
type Aside struct {
	Line, Row int32  // as in Table
	Column    string // the column that decided
	Value     string // what stood there, cut short after 60 characters
	Code      string // one word for programs, such as "missing-response"
	Reason    string // the same in words, such as "response is missing"
}

// AsideCount says how many rows were set aside for one reason in one column.
type AsideCount struct {
	Code, Column, Reason string // as in Aside
	Rows                 int
}

// Len returns the number of kept rows.
func (t *Table) Len() int { return len(t.Row) }

// Column returns the column of that name, or nil where the request did not ask for one.
func (t *Table) Column(name string) *Column {
	for i := range t.Columns {
		if t.Columns[i].Name == name {
			return &t.Columns[i]
		}
	}
	return nil
}

// XY returns one place for each kept row, newly allocated: easting and northing, or longitude and latitude. It is a
// point itself, the mean of several, the middle of lines by their length, and the centroid of polygons; NaN for a row
// without a place.
func (t *Table) XY() (x, y []float64) {
	x, y = make([]float64, t.Len()), make([]float64, t.Len())
	for i, g := range t.Geometry {
		p := middle(g)
		x[i], y[i] = p[0], p[1]
	}
	return x, y
}

// CountAside returns how many rows were set aside for each reason and column: the most frequent first, ties by
// reason and then by column.
func (t *Table) CountAside() []AsideCount { return countAside(slices.Values(t.Aside)) }

func countAside(all iter.Seq[Aside]) []AsideCount {
	type key struct{ code, column, reason string }
	at := map[key]int{}
	var counts []AsideCount
	for a := range all {
		k := key{a.Code, a.Column, a.commonReason()}
		i, seen := at[k]
		if !seen {
			i = len(counts)
			at[k] = i
			counts = append(counts, AsideCount{Code: a.Code, Column: a.Column, Reason: k.reason})
		}
		counts[i].Rows++
	}
	slices.SortFunc(counts, func(a, b AsideCount) int {
		return cmp.Or(-cmp.Compare(a.Rows, b.Rows), cmp.Compare(a.Reason, b.Reason), cmp.Compare(a.Column, b.Column))
	})
	return counts
}

// commonReason is the reason without what is of this row alone.
func (a Aside) commonReason() string {
	if a.Code == faultGeometry {
		return reasonGeometry
	}
	return a.Reason
}

// sortLevels puts the levels of every text column in order and renumbers the codes to match.
func (t *Table) sortLevels() {
	for i := range t.Columns {
		c := &t.Columns[i]
		sorted := slices.Clone(c.Level)
		slices.Sort(sorted)
		to := make([]int32, len(sorted))
		for old, level := range c.Level {
			at, _ := slices.BinarySearch(sorted, level)
			to[old] = int32(at)
		}
		for r, code := range c.Code {
			if code >= 0 {
				c.Code[r] = to[code]
			}
		}
		c.Level = sorted
	}
}

// Append adds the kept rows of another table that was read with the same request, such as those of a neighbouring
// region. Levels are merged and sorted. Rows, Aside, BelowLimit and how the source is written stay those of t, and Line
// and Row of the added rows are those of the source of other. It is an error, and t stays as it is, if only one of the two
// is in degrees, or if their reference systems or columns differ. Append does not change other and shares nothing with it
// but geometries.
func (t *Table) Append(other *Table) error {
	if err := t.checkAlike(other); err != nil {
		return err
	}
	t.Line = append(t.Line, other.Line...)
	t.Row = append(t.Row, other.Row...)
	t.Geometry = append(t.Geometry, other.Geometry...)
	for i := range t.Columns {
		t.Columns[i].append(&other.Columns[i])
	}
	t.sortLevels()
	return nil
}

// checkAlike refuses a table whose rows mean something else than those of t.
func (t *Table) checkAlike(other *Table) error {
	refuse := func(format string, args ...any) error {
		return &Error{File: other.Source, What: "its rows cannot be added to those of " + t.Source + ": " + fmt.Sprintf(format, args...)}
	}
	if t.Degrees != other.Degrees {
		return refuse("the coordinates are in %s, those of the other table in %s", axesWord(other.Degrees), axesWord(t.Degrees))
	}
	if t.CRS != other.CRS {
		return refuse("the coordinates are in %s, those of the other table in %s", systemWord(other.CRS), systemWord(t.CRS))
	}
	if len(t.Columns) != len(other.Columns) {
		return refuse("%d columns were read, and %d of the other table", len(other.Columns), len(t.Columns))
	}
	for i, c := range t.Columns {
		o := other.Columns[i]
		if c.Name != o.Name {
			return refuse("column %d is %q, and %q in the other table", i+1, shorten(o.Name), shorten(c.Name))
		}
		if (c.Number == nil) != (o.Number == nil) || (c.Code == nil) != (o.Code == nil) {
			return refuse("column %q was read as numbers in one table and as text in the other", shorten(c.Name))
		}
	}
	return nil
}

func systemWord(code string) string {
	if code == "" {
		return "a system that is not named"
	}
	return shorten(code)
}

func axesWord(degrees bool) string {
	if degrees {
		return "degrees"
	}
	return "metres"
}

// append adds the values of another column; its levels that are new come last.
func (c *Column) append(other *Column) {
	c.Number = append(c.Number, other.Number...)
	known := make(map[string]int32, len(c.Level))
	for code, level := range c.Level {
		known[level] = int32(code)
	}
	to := make([]int32, len(other.Level))
	for code, level := range other.Level {
		if _, seen := known[level]; !seen {
			known[level] = int32(len(c.Level))
			c.Level = append(c.Level, level)
		}
		to[code] = known[level]
	}
	for _, code := range other.Code {
		if code >= 0 {
			code = to[code]
		}
		c.Code = append(c.Code, code)
	}
}

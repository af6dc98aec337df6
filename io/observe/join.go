package observe

import (
	"fmt"
	"slices"

	"github.com/paulmach/orb"
)

// Join says which tables give the rows of another what they lack, and what becomes of rows and places that are left
// without a partner.
type Join struct {
	Key    string // column of the observations that holds the keys, kept as text
	Sides  []Side // the tables that give; at most one gives the places
	Absent Absent // what becomes of places without a row

	Response string   // column of the observations that is 0 in the rows that AbsentZero adds; empty without a response
	Trials   string   // where a side gives them, a response above them is set aside; empty without trials
	Keep     []string // text of the observations that may be missing, and is in the rows that AbsentZero adds

	Lost   Lost // of the observations: their places are not without a row. Nil is not known
	Strict bool // refuse the first row that would be set aside
}

// Side is a table that gives the rows of another what they lack: columns, places, or both.
type Side struct {
	Table  *Table
	Key    string   // column that holds the keys, kept as text
	Take   []string // columns it gives
	Places bool     // it gives the geometry, and all that is said of coordinates
	Lost   Lost     // of Table, to say in reasons why it has no usable row; nil is not known
}

// Absent says what becomes of a place that no row of the observations has.
type Absent int

const (
	AbsentRefused Absent = iota // nobody has said: the join is refused
	AbsentZero                  // nothing was found there: a row with response 0
	AbsentMissing               // nobody looked: it is told, and no more
)

// Join gives the rows of t the columns and the places of other tables whose key is the same, byte for byte. The
// readers have dropped blanks around keys; white space inside, capitals and zeros count. Any number of rows of t may
// have one key; each key of a side stands in one row. Sides are not changed, and t shares nothing with them but geometries.
//
// Rows of t are set aside that have no key (missing-key), whose key is not among the places (no-place) or in another
// side (no-match), or is there in a row that was itself set aside (unusable-match), and rows with a response above the
// trials of a side (positives-above-trials). The first side that lacks a key gives the reason. Rows of a side that have
// no key are passed over and counted.
//
// With AbsentZero each place without a row gets one, below the others and in the order of the places: Line and Row are
// 0, the columns of sides are those of its key, the response is 0. That is sound for counts, positives and amounts;
// of other measures 0 is a value like any, and it is the caller who must refuse it. Table.Rows stays the number of rows in
// the source.
//
// An *Error is returned, and t stays as it is, if a key stands twice in a side; if keys without a match differ from
// keys of a side only in how they are written, which is never mended; if more than half of the rows would be set aside,
// or any if strict; if places have no row and nobody has said what that means; and, with AbsentZero and such places, if
// another side has no row for one of them, if a column of the observations other than Key, Response and Keep has no value
// for them, or if a row was set aside of which nobody knows the place, now or before: what is missing there would turn
// into 0.
//
// Join panics if a table lacks a column that it is said to have, if a column is taken that t or another side gives, and
// if two sides give the places.
func (t *Table) Join(j Join) (JoinReport, error) {
	w, err := newJoining(t, j)
	if err != nil {
		return JoinReport{}, err
	}
	if err := w.refuseNearMisses(); err != nil {
		return JoinReport{}, err
	}
	w.dealRows()
	if err := t.checkAside(w.aside, j.Strict, w.adviceKeys()); err != nil {
		return JoinReport{}, err
	}
	if err := w.dealAbsent(); err != nil {
		return JoinReport{}, err
	}
	w.fill()
	return w.report, nil
}

// joining is the work of Join on one table. Keys are numbered as the levels of the key column of the observations;
// those of added rows come behind.
type joining struct {
	Join
	table  *Table
	key    *Column
	sides  []*match
	places *match // the side that gives the places, or nil

	levels []string // the keys by their numbers
	row    []int32  // of the observations, by joined rows; -1 for an added one
	code   []int32  // number of the key, by joined rows
	aside  []Aside
	report JoinReport

	asideCode []int32 // number of the key, by rows set aside; -1 without one
}

// newJoining looks every key up in every side.
func newJoining(t *Table, j Join) (*joining, error) {
	w := &joining{Join: j, table: t, key: t.text(j.Key)}
	w.levels = slices.Clone(w.key.Level)
	if j.Response != "" {
		t.number(j.Response)
	}
	w.checkTaken()
	rows := make([]int, len(w.levels))
	for _, code := range w.key.Code {
		if code >= 0 {
			rows[code]++
		}
	}
	for _, side := range j.Sides {
		m, err := newMatch(side)
		if err != nil {
			return nil, err
		}
		m.lookUp(w.levels, rows)
		if side.Places {
			w.places = m
		}
		w.sides = append(w.sides, m)
	}
	return w, nil
}

// checkTaken panics if a column or the places would come from two tables.
func (w *joining) checkTaken() {
	given := map[string]bool{}
	for _, c := range w.table.Columns {
		given[c.Name] = true
	}
	places := false
	for _, side := range w.Sides {
		for _, name := range side.Take {
			if given[name] {
				panic(fmt.Sprintf("observe: column %q would come from %s and from another table", name, side.Table.Source))
			}
			given[name] = true
		}
		if side.Places && places {
			panic("observe: places would come from two tables")
		}
		places = places || side.Places
	}
}

// dealRows keeps each row of the observations or sets it aside.
func (w *joining) dealRows() {
	t := w.table
	faults := w.faults()
	above := w.aboveTrials()
	w.row, w.code = make([]int32, 0, t.Len()), make([]int32, 0, t.Len())
	for r, code := range w.key.Code {
		var a Aside
		switch {
		case code < 0:
			a = t.withoutKey(r, w.Key)
		case faults[code].Code != "":
			a = faults[code]
		case above != nil:
			a = above(r, code)
		}
		if a.Code == "" {
			w.row, w.code = append(w.row, int32(r)), append(w.code, code)
			continue
		}
		a.Line, a.Row = t.Line[r], t.Row[r]
		w.aside, w.asideCode = append(w.aside, a), append(w.asideCode, code)
	}
}

// faults returns for each key why its rows are set aside: the zero Aside for those that every side has.
func (w *joining) faults() []Aside {
	faults := make([]Aside, len(w.levels))
	for code, level := range w.levels {
		for _, m := range w.sides {
			if m.row[code] < 0 {
				faults[code] = m.lacks(level)
				faults[code].Column, faults[code].Value = w.Key, shorten(level)
				break
			}
		}
	}
	return faults
}

// aboveTrials returns the check of a response against trials that another table gives, or nil if there are none.
func (w *joining) aboveTrials() func(row int, code int32) Aside {
	if w.Trials == "" || w.Response == "" {
		return nil
	}
	for _, m := range w.sides {
		if !slices.Contains(m.Take, w.Trials) {
			continue
		}
		positives, examined := w.table.number(w.Response).Number, m.Table.number(w.Trials).Number
		return func(row int, code int32) Aside {
			if positives[row] <= examined[m.row[code]] {
				return Aside{}
			}
			return Aside{Column: w.Response, Value: decimal(positives[row]), Code: "positives-above-trials", Reason: "response is above the number of trials"}
		}
	}
	return nil
}

// fill turns the table into what the rows and the sides make together.
func (w *joining) fill() {
	t := w.table
	out := *t
	out.Aside = t.addAside(w.aside)
	out.Line, out.Row = pickSlice(t.Line, w.row), pickSlice(t.Row, w.row)
	out.Columns = nil
	for i := range t.Columns {
		c := t.Columns[i].pick(w.row)
		if c.Name == w.Key {
			c.Code, c.Level = slices.Clone(w.code), w.levels
			c.dropUnused()
		}
		out.Columns = append(out.Columns, c)
	}
	if len(t.Geometry) > 0 {
		out.Geometry = pickSlice(t.Geometry, w.row)
	}
	for _, m := range w.sides {
		rows := pickSlice(m.row, w.code)
		for _, name := range m.Take {
			out.Columns = append(out.Columns, m.Table.Column(name).pick(rows))
		}
		if m.Places {
			out.takePlaces(m.Table, rows)
		}
		w.report.Sides = append(w.report.Sides, m.report)
	}
	out.sortLevels()
	*t = out
}

// takePlaces takes over the geometry of the given rows and all that says what its coordinates are.
func (t *Table) takePlaces(from *Table, rows []int32) {
	t.Geometry = pickSlice[orb.Geometry](from.Geometry, rows)
	t.XName, t.YName, t.GeometryName = from.XName, from.YName, from.GeometryName
	t.Features, t.CRS = from.Features, from.CRS
	t.Degrees, t.Recognised = from.Degrees, from.Recognised
	t.PassedOver = slices.Clone(from.PassedOver)
}

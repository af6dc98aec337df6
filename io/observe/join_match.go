package observe

import (
	"fmt"
	"slices"
	"strconv"
)

// match is a side and where the keys of the observations stand in it.
type match struct {
	Side
	key   *Column
	at    map[string]int32 // row of each key
	taken []bool           // rows whose key the observations have
	row   []int32          // row by the number of the key; -1 without one

	unmatched []string // keys of the observations that it lacks, sorted
	unused    []string // its keys that the observations lack, sorted
	report    SideReport
}

// newMatch finds the row of each key. A key that stands twice is refused.
func newMatch(side Side) (*match, error) {
	t := side.Table
	if side.Places && len(t.Geometry) != t.Len() {
		panic(fmt.Sprintf("observe: %s has no places", t.Source))
	}
	for _, name := range side.Take {
		if t.Column(name) == nil {
			panic(fmt.Sprintf("observe: %s has no column %q", t.Source, name))
		}
	}
	m := &match{Side: side, key: t.text(side.Key), at: make(map[string]int32, t.Len()), taken: make([]bool, t.Len())}
	m.report.Source = t.Source
	for r, code := range m.key.Code {
		if code < 0 {
			m.report.WithoutKey++
			continue
		}
		key := m.key.Level[code]
		if first, seen := m.at[key]; seen {
			return nil, m.twice(key, int(first), r)
		}
		m.at[key] = int32(r)
	}
	return m, nil
}

// twice refuses a key of which nobody could say which row is meant.
func (m *match) twice(key string, first, second int) error {
	t := m.Table
	advice := "leave one row for each key in the file"
	if m.Places {
		advice = "give each place one row: the parts of one place belong in one geometry"
	}
	return &Error{File: t.Source, Line: int(t.Line[second]), Row: int(t.Row[second]), Column: m.Side.Key, Value: shorten(key), Advice: advice,
		What: fmt.Sprintf("the key %q also stands in %s", shorten(key), rowWord(t.Row[first], t.Line[first]))}
}

// lookUp finds the rows of the keys of the observations, which are sorted and each of which so many of their rows have.
func (m *match) lookUp(keys []string, rows []int) {
	m.row = make([]int32, len(keys))
	for code, key := range keys {
		r, there := m.at[key]
		if !there {
			m.row[code] = -1
			m.unmatched = append(m.unmatched, key)
			continue
		}
		m.row[code], m.taken[r] = r, true
		m.report.Matched += rows[code]
	}
	for key, r := range m.at {
		if !m.taken[r] {
			m.unused = append(m.unused, key)
		}
	}
	slices.Sort(m.unused)
	m.report.WithoutMatch, m.report.Unused = m.unmatched, m.unused
}

// lacks says why the rows of a key find nothing here.
func (m *match) lacks(key string) Aside {
	source := m.Table.Source
	if lost, is := m.Lost[key]; is {
		return Aside{Code: "unusable-match", Reason: fmt.Sprintf("its row in %s cannot be used: %s", source, lost.Reason)}
	}
	unknown := m.Lost == nil && len(m.Table.Aside) > 0 // its row may be one of those set aside
	switch {
	case m.Places && unknown:
		return Aside{Code: "no-place", Reason: source + " has no such place that can be used"}
	case m.Places:
		return Aside{Code: "no-place", Reason: source + " has no such place"}
	case unknown:
		return Aside{Code: "no-match", Reason: source + " has no usable row with this key"}
	}
	return Aside{Code: "no-match", Reason: source + " has no row with this key"}
}

// adviceKeys is for keys that mostly find no match: it shows what the keys of the side look like that matches least.
func (w *joining) adviceKeys() string {
	advice := "check that --key names the right column of each file"
	var least *match
	for _, m := range w.sides {
		if len(m.unused) > 0 && len(m.unmatched) > 0 && (least == nil || m.report.Matched < least.report.Matched) {
			least = m
		}
	}
	if least == nil {
		return advice
	}
	return fmt.Sprintf("%s; keys of %s that no row has: %s", advice, least.Table.Source, fewQuoted(least.unused, 3))
}

// decimal writes a number for a message, without an exponent.
func decimal(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }

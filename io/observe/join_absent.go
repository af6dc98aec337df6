package observe

import (
	"fmt"
	"slices"
)

// dealAbsent does with the places that no row has what was said about them.
func (w *joining) dealAbsent() error {
	absent := w.absent()
	w.report.Absent = slices.Sorted(slices.Values(absent))
	switch {
	case len(absent) == 0 || w.Join.Absent == AbsentMissing:
		return nil
	case w.Join.Absent == AbsentRefused:
		return w.refuseAbsent()
	}
	return w.addAbsent(absent)
}

// absent returns the keys of the places that no row has, in the order of the places.
func (w *joining) absent() (keys []string) {
	if w.places == nil {
		return nil
	}
	for r, code := range w.places.key.Code {
		if code < 0 || w.places.taken[r] {
			continue
		}
		key := w.places.key.Level[code]
		if _, lost := w.Lost[key]; !lost {
			keys = append(keys, key)
		}
	}
	return keys
}

// refuseAbsent asks what it means that places have no row.
func (w *joining) refuseAbsent() error {
	n, places, have := len(w.report.Absent), "places", "have"
	if n == 1 {
		places, have = "place", "has"
	}
	row := "row"
	if w.lostUnknown() > 0 {
		row = "usable row"
	}
	return &Error{
		What:   fmt.Sprintf("%d %s of %s %s no %s in %s: %s", n, places, w.places.Table.Source, have, row, w.table.Source, fewQuoted(w.report.Absent, 5)),
		Advice: "say with --absent zero that nothing was found there, or with --absent missing that nobody looked",
	}
}

// lostUnknown counts the rows that were set aside before the join and may be of any place.
func (w *joining) lostUnknown() (n int) {
	if w.Lost != nil {
		return 0
	}
	for _, a := range w.table.Aside {
		if a.Code != "missing-key" {
			n++
		}
	}
	return n
}

// addAbsent adds a row with response 0 for each place that every side knows of.
func (w *joining) addAbsent(absent []string) error {
	if n := w.lostUnknown(); n > 0 {
		a := w.table.Aside[slices.IndexFunc(w.table.Aside, func(a Aside) bool { return a.Code != "missing-key" })]
		return &Error{File: w.table.Source, Line: int(a.Line), Row: int(a.Row), Column: a.Column, Value: a.Value,
			What:   a.alone(n) + "; with --absent zero what is missing at its place would turn into 0",
			Advice: "correct such rows or take them out of the file, or say --absent missing"}
	}
	for _, key := range absent {
		if !w.known(key) {
			w.report.LeftOut = append(w.report.LeftOut, key)
			continue
		}
		if err := w.refuseGaps(key); err != nil {
			return err
		}
		w.row, w.code = append(w.row, -1), append(w.code, int32(len(w.levels)))
		w.levels = append(w.levels, key)
		for _, m := range w.sides {
			m.row = append(m.row, m.at[key])
		}
		w.report.Added++
	}
	slices.Sort(w.report.LeftOut)
	return nil
}

// known reports whether every side has a key.
func (w *joining) known(key string) bool {
	return !slices.ContainsFunc(w.sides, func(m *match) bool {
		_, there := m.at[key]
		return !there
	})
}

// refuseGaps refuses columns of the observations that added rows would have no value for.
func (w *joining) refuseGaps(key string) error {
	for _, c := range w.table.Columns {
		numbers := c.Number != nil && c.Name != w.Response
		text := c.Code != nil && c.Name != w.Key && c.Name != w.Response && !slices.Contains(w.Keep, c.Name)
		if numbers || text {
			return &Error{File: w.table.Source, Column: c.Name, What: fmt.Sprintf("has no value for places without a row, such as %q", shorten(key)),
				Advice: "give the column in a file with a row for every place, with --join, or say --absent missing"}
		}
	}
	return nil
}

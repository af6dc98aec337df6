package observe

import (
	"cmp"
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
	n := len(w.report.Absent)
	places, have := placesHave(n)
	row := "row"
	if w.Lost == nil && len(w.table.Aside) > 0 {
		row = "usable row"
	}
	return &Error{
		What:   fmt.Sprintf("%d %s of %s %s no %s in %s: %s", n, places, w.places.Table.Source, have, row, w.table.Source, fewQuoted(w.report.Absent, 5)),
		Advice: "say with --absent zero that nothing was found there, or with --absent missing that nobody looked",
	}
}

// strays are the rows set aside of which nobody knows the place, in the order of the source: those without a key, those
// whose key is no place's, and those set aside before of which Lost does not tell.
func (w *joining) strays() []Aside {
	strays := w.straysBefore()
	for i, a := range w.aside {
		if code := w.asideCode[i]; code < 0 || !w.isPlace(w.levels[code]) {
			strays = append(strays, a)
		}
	}
	slices.SortFunc(strays, func(a, b Aside) int { return cmp.Compare(a.Row, b.Row) })
	return strays
}

// straysBefore are the strays that were set aside before the join; of those with one key, the first.
func (w *joining) straysBefore() (strays []Aside) {
	if w.Lost == nil {
		return slices.Clone(w.table.Aside)
	}
	for key, a := range w.Lost {
		if !w.isPlace(key) {
			strays = append(strays, a)
		}
	}
	return strays
}

// isPlace reports whether a key is that of a place, which may be one that cannot be used.
func (w *joining) isPlace(key string) bool {
	_, there := w.places.at[key]
	_, lost := w.places.Lost[key]
	return there || lost
}

// addAbsent adds a row with response 0 for each place without one.
func (w *joining) addAbsent(absent []string) error {
	if err := w.refuseUnknown(absent); err != nil {
		return err
	}
	if err := w.refuseStrays(absent); err != nil {
		return err
	}
	if err := w.refuseGaps(absent[0]); err != nil {
		return err
	}
	for _, key := range absent {
		w.row, w.code = append(w.row, -1), append(w.code, int32(len(w.levels)))
		w.levels = append(w.levels, key)
		for _, m := range w.sides {
			m.row = append(m.row, m.at[key])
		}
	}
	w.report.Added = len(absent)
	return nil
}

// refuseUnknown refuses places that another side does not have: of how many people nothing was found, nobody knows.
func (w *joining) refuseUnknown(absent []string) error {
	for _, m := range w.sides {
		var unknown []string
		row := "row"
		for _, key := range absent {
			if _, there := m.at[key]; !there {
				unknown = append(unknown, key)
			}
			if _, lost := m.Lost[key]; lost {
				row = "usable row"
			}
		}
		if len(unknown) == 0 {
			continue
		}
		slices.Sort(unknown)
		places, have := placesHave(len(unknown))
		return &Error{
			What: fmt.Sprintf("%d %s of %s %s no %s in %s, so nothing found there means nothing: %s",
				len(unknown), places, w.places.Table.Source, have, row, m.Table.Source, fewQuoted(unknown, 5)),
			Advice: fmt.Sprintf("add them to %s, or say --absent missing", m.Table.Source)}
	}
	return nil
}

// refuseStrays refuses rows whose place would be taken for one without a row.
func (w *joining) refuseStrays(absent []string) error {
	strays := w.strays()
	if len(strays) == 0 {
		return nil
	}
	a := strays[0]
	advice := "correct such rows or take them out of the file, or say --absent missing"
	if near := nearest(a.Value, absent); near != "" && a.Value != "" && a.Column == w.Key {
		advice = fmt.Sprintf("did you mean %q? %s", near, advice)
	}
	return &Error{File: w.table.Source, Line: int(a.Line), Row: int(a.Row), Column: a.Column, Value: a.Value, Advice: advice,
		What: a.alone(len(strays)) + "; with --absent zero what is missing at its place would turn into 0"}
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

// placesHave are the words for some places that have something.
func placesHave(n int) (places, have string) {
	if n == 1 {
		return "place", "has"
	}
	return "places", "have"
}

package observe

// Only drops the rows whose text in a column is not the given one, as if they were not in the source. It panics if the
// table has no such column of text.
func (t *Table) Only(column, text string) {
	c := t.text(column)
	var rows []int32
	for i, code := range c.Code {
		if code >= 0 && c.Level[code] == text {
			rows = append(rows, int32(i))
		}
	}
	t.keep(rows)
}

// keep drops all other rows.
func (t *Table) keep(rows []int32) {
	t.Line, t.Row = pickSlice(t.Line, rows), pickSlice(t.Row, rows)
	if len(t.Geometry) > 0 {
		t.Geometry = pickSlice(t.Geometry, rows)
	}
	for i := range t.Columns {
		t.Columns[i] = t.Columns[i].pick(rows)
	}
}

// SetAside takes rows out of the table, for the reason that what they lack could not be found elsewhere.
func (t *Table) SetAside(rows []int, column, code, reason string) {
	drop := make(map[int]bool, len(rows))
	var gone []Aside
	for _, i := range rows {
		drop[i] = true
		gone = append(gone, Aside{Line: t.Line[i], Row: t.Row[i], Column: column, Code: code, Reason: reason})
	}
	var kept []int32
	for i := range t.Row {
		if !drop[i] {
			kept = append(kept, int32(i))
		}
	}
	t.Aside = t.addAside(gone)
	t.keep(kept)
}

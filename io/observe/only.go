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
	t.Line, t.Row = pickSlice(t.Line, rows), pickSlice(t.Row, rows)
	if len(t.Geometry) > 0 {
		t.Geometry = pickSlice(t.Geometry, rows)
	}
	for i := range t.Columns {
		t.Columns[i] = t.Columns[i].pick(rows)
	}
}

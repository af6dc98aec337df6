package observe

import "strings"

// Unnamed says how many rows belong to no part of a table that was split, and which is the first of them.
type Unnamed struct {
	Rows      int    // 0 if every row belongs to a part
	Line, Row int32  // of the first, as in Table
	Value     string // what stands in the first, without the blanks around it: nothing, or a mark such as "NA"
}

// Split returns one part for each value of a column, in the order in which the values first appear. Blanks around a
// value do not count, capitals do. Rows in which the value is missing (nothing, NA, NaN, null, a mark of the format) belong to no part and
// are reported; if none has a value, there are no parts. An *Error is returned for a column that is absent.
func (s *Shared) Split(column string) ([]Part, Unnamed, error) {
	if column == "" {
		return nil, Unnamed{}, &Error{File: s.header.source, Line: s.header.line, Advice: s.header.columnList(),
			What: "no column is named for the names of the regions"}
	}
	at, err := s.header.find(column, "the names of the regions")
	if err != nil {
		return nil, Unnamed{}, err
	}
	d := deal{shared: s, numbers: map[string]int32{}, of: make([]int32, 0, s.rows)}
	if err := s.text.values(at, d.take); err != nil {
		return nil, Unnamed{}, err
	}
	d.hand()
	return d.parts, d.unnamed, nil
}

// deal is the splitting of a table.
type deal struct {
	shared  *Shared
	parts   []Part
	unnamed Unnamed
	numbers map[string]int32 // the part of each value so far; -1 for marks of a missing one
	of      []int32          // the part of each row so far
}

// take deals one row.
func (d *deal) take(value []byte, row, line int) {
	number, seen := d.numbers[string(value)]
	if !seen {
		number = d.add(string(value))
	}
	d.of = append(d.of, number)
	if number < 0 {
		d.leave(line, string(value))
		return
	}
	d.parts[number].Rows++
	d.parts[number].Bytes += d.shared.text.size(row)
}

// add starts the part of a value not met before, unless it is missing.
func (d *deal) add(value string) int32 {
	number := int32(-1)
	if !d.shared.header.origin.format.isMissing(value) {
		number = int32(len(d.parts))
		d.parts = append(d.parts, Part{Name: value, shared: d.shared})
	}
	d.numbers[value] = number
	return number
}

// leave counts the row at hand as one that belongs to no part.
func (d *deal) leave(line int, value string) {
	if d.unnamed.Rows++; d.unnamed.Rows == 1 {
		d.unnamed.Line, d.unnamed.Row, d.unnamed.Value = int32(line), int32(len(d.of)), strings.Clone(value)
	}
}

// hand gives each part its rows, all cut from one slice.
func (d *deal) hand() {
	all := make([]int32, d.shared.rows-d.unnamed.Rows)
	for i := range d.parts {
		n := d.parts[i].Rows
		d.parts[i].rows, all = all[:0:n], all[n:]
	}
	for row, number := range d.of {
		if number >= 0 {
			d.parts[number].rows = append(d.parts[number].rows, int32(row))
		}
	}
}

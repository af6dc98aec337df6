package observe

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"github.com/paulmach/orb"
)

// ReadCSV reads a table with one line of names, with quotes as in RFC 4180. The source is the name of the file in
// messages. The columns are separated as Request.Format says or the header shows; numbers are decimal with a point
// unless the format has a comma; empty fields and NA, NaN and null in any capitals are missing.
//
// The text is UTF-8, UTF-16 (told by its byte order mark, or by the zeros in every other byte) or Windows-1252 (told
// by the first character beyond ASCII, which is no UTF-8). A byte order mark is dropped. The file may be compressed
// with gzip. Lines and rows are those of the text, and it is never held as a whole.
//
// Rows that cannot be used are set aside, see Request for the order of the checks. An *Error is returned for a table
// that cannot be used as a whole: one that is not such a file, has no such column or two of a name, rows of the wrong
// length, a latitude beyond 90 degrees anywhere (coordinates were probably swapped, or are not degrees), digits in
// groups of three in a number, decimal commas or points against the format, more than half of its rows to set aside,
// or any such row if the request is strict.
func ReadCSV(r io.Reader, source string, want Request) (*Table, error) {
	if err := want.Validate(); err != nil {
		return nil, inFile(err, source)
	}
	in, err := openTextAs(r, source, want.Format)
	if err != nil {
		return nil, err
	}
	h, err := readHeader(in, source)
	if err != nil {
		return nil, err
	}
	return readTable(h, want, &stream{in: in, source: source})
}

// readTable makes a table of the records below a header.
func readTable(h header, want Request, from records) (*Table, error) {
	rows, err := newRows(h, want)
	if err != nil {
		return nil, err
	}
	if err := rows.readAll(from); err != nil {
		return nil, err
	}
	rows.finish()
	return rows.table, nil
}

// records gives the records below a header one by one, each with the line of the file on which it starts and the
// number of its row. The slice is good until the next call. The error is io.EOF after the last, else an *Error.
type records interface {
	next() (record []string, line, row int, err error)
}

// stream gives the records of a file as it is read.
type stream struct {
	in     *text // below the header
	source string
	row    int
}

func (s *stream) next() (record []string, line, row int, err error) {
	record, err = s.in.Read()
	if err == io.EOF {
		return nil, 0, 0, err
	}
	if err != nil {
		return nil, 0, 0, readError(s.source, err)
	}
	line, _ = s.in.FieldPos(0)
	s.row++
	return record, line, s.row, nil
}

func inFile(err error, source string) error {
	if e, ok := err.(*Error); ok {
		e.File = source
	}
	return err
}

// rows turns records into rows of the table. The slices value and text are the row at hand, by field.
type rows struct {
	header header
	format *Format
	want   Request
	fields []field // in the order of the checks
	x, y   int     // the fields of the coordinates
	table  *Table
	known  []map[string]int32 // for each column of the table, the code of each level so far

	value  []float64
	text   []string
	limits []int // fields of the row at hand in which a rule stands for a value below a limit

	lines, numbers pile[int32] // of the kept rows, as Line and Row of the table
	places         pile[orb.Geometry]
	columns        []filling

	below  []int    // for each field, the values below a limit that were kept or set aside as such
	commas []commas // for each field
	held   error    // the first refusal that decimal commas may explain better
}

// filling is what a column of the table has of the kept rows.
type filling struct {
	number pile[float64]
	code   pile[int32]
}

// field is one part that one column of the file plays.
type field struct {
	part   part
	name   string
	at     int  // position in the file
	column int  // position in Table.Columns; -1 for coordinates
	again  bool // another field already fills the column
}

// newRows finds the columns asked for and lays out the table.
func newRows(h header, want Request) (*rows, error) {
	c, err := h.coordinates(want)
	if err != nil {
		return nil, err
	}
	r := &rows{header: h, format: &h.origin.format, want: want, table: &Table{
		Source: h.source, Separator: h.origin.separator, XName: c.x, YName: c.y, Degrees: c.degrees, Recognised: c.recognised, PassedOver: c.passedOver,
	}}
	var lists = []struct {
		part  part
		names []string
	}{
		{response, named(want.Response)}, {trials, named(want.Trials)}, {denominator, named(want.Denominator)},
		{weight, named(want.Weight)}, {coordinateX, named(c.x)}, {coordinateY, named(c.y)},
		{linear, want.Linear}, {category, want.Category}, {category, h.among(want.Optional)}, {keep, want.Keep},
	}
	for _, list := range lists {
		for _, name := range list.names {
			if err := r.add(list.part, name); err != nil {
				return nil, err
			}
		}
	}
	r.value, r.text = make([]float64, len(r.fields)), make([]string, len(r.fields))
	r.columns = make([]filling, len(r.table.Columns))
	r.below, r.commas = make([]int, len(r.fields)), make([]commas, len(r.fields))
	return r, nil
}

func named(name string) []string {
	if name == "" {
		return nil
	}
	return []string{name}
}

// add appends a field, and a column for it unless there is one of the name.
func (r *rows) add(p part, name string) error {
	at, err := r.header.find(name, p.String())
	if err != nil {
		return err
	}
	f := field{part: p, name: name, at: at, column: -1}
	switch p {
	case coordinateX:
		r.x = len(r.fields)
	case coordinateY:
		r.y = len(r.fields)
	default:
		f.column = slices.IndexFunc(r.table.Columns, func(c Column) bool { return c.Name == name })
		if f.column < 0 {
			f.column = len(r.table.Columns)
			r.table.Columns = append(r.table.Columns, Column{Name: name})
			r.known = append(r.known, map[string]int32{})
		}
		f.again = slices.ContainsFunc(r.fields, func(g field) bool {
			return g.column == f.column && g.part.isText() == p.isText()
		})
	}
	r.fields = append(r.fields, f)
	return nil
}

// readAll reads the records to the end and refuses a table that is mostly unusable.
func (r *rows) readAll(from records) error {
	if err := r.explain(r.readRows(from)); err != nil {
		return err
	}
	switch {
	case r.table.Rows == 0:
		return r.header.noRows()
	case len(r.table.Aside) > r.table.Rows/2:
		return r.mostlyAside()
	}
	return nil
}

// readRows reads the records to the end.
func (r *rows) readRows(from records) error {
	for {
		record, line, row, err := from.next()
		if err == io.EOF {
			return nil
		}
		if err != nil {
			return err
		}
		r.table.Rows++
		if err := r.readRow(record, line, row); err != nil {
			return err
		}
	}
}

// readRow keeps one record or sets it aside. An error refuses the whole table.
func (r *rows) readRow(record []string, line, row int) error {
	here := Error{File: r.header.source, Line: line, Row: row}
	if err := r.header.checkRecord(record, here); err != nil {
		return err
	}
	if err := r.checkLatitude(record, here); err != nil {
		return err
	}
	if a, bad := r.firstFault(record, here); bad {
		a.Line, a.Row = int32(line), int32(row)
		if r.want.Strict && a.Code == faultNumber && hasDecimalComma(a.Value) {
			r.hold(r.refuse(a))
		} else if r.want.Strict {
			return r.refuse(a)
		}
		r.table.Aside = append(r.table.Aside, a)
		return nil
	}
	r.keepRow(line, row)
	return nil
}

// checkLatitude refuses a table with an impossible latitude, in usable rows or not: one is enough to doubt them all.
func (r *rows) checkLatitude(record []string, here Error) error {
	if !r.table.Degrees {
		return nil
	}
	s := strings.TrimSpace(record[r.fields[r.y].at])
	if v, fault := r.format.number(s); fault != "" || math.Abs(v) <= 90 {
		return nil
	}
	here.Column, here.Value = r.table.YName, shorten(s)
	here.What, here.Advice = here.Value+" is not a latitude (-90 to 90)", adviceDegrees
	return &here
}

// keepRow keeps the row at hand for the table.
func (r *rows) keepRow(line, row int) {
	r.lines.add(int32(line))
	r.numbers.add(int32(row))
	r.places.add(orb.Point{r.value[r.x], r.value[r.y]})
	for _, i := range r.limits {
		r.below[i]++
	}
	for i, f := range r.fields {
		switch {
		case f.column < 0 || f.again:
		case f.part.isText():
			r.columns[f.column].code.add(r.code(f.column, r.text[i]))
		default:
			r.columns[f.column].number.add(r.value[i])
		}
	}
}

// code returns the code of a level, a new one if need be; -1 for a missing one.
func (r *rows) code(column int, level string) int32 {
	if r.format.isMissing(level) {
		return -1
	}
	code, seen := r.known[column][level]
	if !seen {
		c := &r.table.Columns[column]
		code = int32(len(c.Level))
		level = strings.Clone(level) // the field is part of a whole record
		c.Level = append(c.Level, level)
		r.known[column][level] = code
	}
	return code
}

// finish fills the table after the last row.
func (r *rows) finish() {
	t := r.table
	t.Encoding = r.header.origin.encoding()
	t.Line, t.Row, t.Geometry = r.lines.join(), r.numbers.join(), r.places.join()
	for i := range r.columns {
		t.Columns[i].Number, t.Columns[i].Code = r.columns[i].number.join(), r.columns[i].code.join()
	}
	for i, n := range r.below {
		if n > 0 {
			t.BelowLimit = append(t.BelowLimit, BelowCount{Column: r.fields[i].name, Rows: n, Rule: r.format.BelowLimit})
		}
	}
	t.sortLevels()
}

// refuse turns a row to be set aside into an error.
func (r *rows) refuse(a Aside) error {
	return &Error{File: r.header.source, Line: int(a.Line), Row: int(a.Row), Column: a.Column, Value: a.Value,
		What: a.sentence(), Advice: "correct the row, or leave out --strict to set such rows aside"}
}

// sentence is the reason and the value.
func (a Aside) sentence() string {
	if a.Value == "" {
		return a.Reason
	}
	return fmt.Sprintf("%s: %q", a.Reason, a.Value)
}

// mostlyAside says why so many rows are unusable: up to three reasons, and the first row as an example.
func (r *rows) mostlyAside() error {
	counts := r.table.CountAside()
	var reasons []string
	for i, c := range counts {
		if i == 3 {
			reasons = append(reasons, fmt.Sprintf("%d more reasons", len(counts)-i))
			break
		}
		reasons = append(reasons, fmt.Sprintf("column %q, %s (%d)", c.Column, c.Reason, c.Rows))
	}
	i := slices.IndexFunc(r.table.Aside, func(a Aside) bool { return a.Code == counts[0].Code && a.Column == counts[0].Column })
	a := r.table.Aside[i]
	return &Error{File: r.header.source, Value: a.Value,
		What: fmt.Sprintf("%d of %d rows cannot be used, more than half: %s; for example row %d (line %d), where %s",
			len(r.table.Aside), r.table.Rows, strings.Join(reasons, "; "), a.Row, a.Line, a.sentence()),
		Advice: r.adviceFor(a)}
}

// adviceFor says what to do about rows that are mostly unusable for one reason.
func (r *rows) adviceFor(a Aside) string {
	below := func(f field) bool { return f.name == a.Column && f.mayBeBelow(r.want.Kind) }
	if a.Code == faultLimit || a.Code == faultNumber && strings.HasPrefix(a.Value, "<") && slices.ContainsFunc(r.fields, below) {
		return "say with --below-limit half or limit what stands for values below a detection limit"
	}
	if a.Code == "fractional-count" {
		return "amounts that are not whole numbers are no counts: use --distribution tweedie for them"
	}
	return "check that the right columns are named, and that missing values are written as empty fields or NA"
}

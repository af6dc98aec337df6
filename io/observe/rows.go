package observe

import (
	"cmp"
	"fmt"
	"io"
	"slices"
	"strings"

	"github.com/paulmach/orb"
)

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

// records gives the records below a header one by one. A record is good until the next call. The error is io.EOF after
// the last, else an *Error.
type records interface {
	next() (record, error)
}

// record is one row as it stands in its source.
type record struct {
	fields []string // one for each name of the header
	line   int      // line of the source on which it starts
	row    int      // its number, from 1
	site   *site    // where a feature is; nil for rows of a CSV table
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
	x, y   int     // the fields of the coordinates, where columns hold them
	shape  int     // the field of the geometry; -1 where rows have none of their own
	table  *Table
	known  []map[string]int32 // for each column of the table, the code of each level so far

	site   site // of the row at hand, by a geometry of its own
	srid   int  // reference system of the geometries, in a column
	tells  int  // the row that told of it; 0 before
	value  []float64
	text   []string
	limits []int // fields of the row at hand in which a rule stands for a value below a limit

	lines, numbers pile[int32] // of the kept rows, as Line and Row of the table
	places         pile[orb.Geometry]
	asides         pile[Aside]
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
	called string // what the part is called, by Request.Called
	name   string
	at     int  // position in the file, or one of atHeight, atID and atFeature
	column int  // position in Table.Columns; -1 for coordinates and geometries
	again  bool // another field already fills the column
}

// Positions of fields that no column of the file has.
const (
	atHeight  = -1 - iota // the third coordinate of a point
	atID                  // the identifier of a feature
	atFeature             // the geometry of a feature
)

// newRows finds the columns asked for and lays out the table.
func newRows(h header, want Request) (*rows, error) {
	c, err := h.places(want)
	if err != nil {
		return nil, err
	}
	h.heights = h.heights || want.Geometry != ""
	r := &rows{header: h, format: &h.origin.format, want: want, shape: -1, table: &Table{
		Source: h.source, Separator: h.origin.separator, XName: c.x, YName: c.y, GeometryName: c.geometry, Features: h.origin.features, CRS: c.crs,
		Degrees: c.degrees, Recognised: c.recognised, PassedOver: c.passedOver,
	}}
	var lists = []struct {
		part  part
		names []string
	}{
		{response, named(want.Response)}, {trials, named(want.Trials)}, {denominator, named(want.Denominator)},
		{factor, want.Factor}, {weight, named(want.Weight)}, {coordinateX, named(c.x)}, {coordinateY, named(c.y)}, {geometry, named(c.geometry)},
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
	f := field{part: p, name: name, column: -1}
	if p == factor || p == keep {
		f.called = r.want.Called[name]
	}
	var err error
	if f.at, err = r.position(f); err != nil {
		return err
	}
	switch p {
	case coordinateX:
		r.x = len(r.fields)
	case coordinateY:
		r.y = len(r.fields)
	case geometry:
		r.shape = len(r.fields)
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

// position returns where the values of a field stand.
func (r *rows) position(f field) (int, error) {
	h := r.header
	if f.part == geometry && h.shapes != nil {
		return atFeature, nil
	}
	h.heights = h.heights && f.part != geometry
	at, err := h.find(f.name, f.what())
	if e, is := err.(*Error); is && f.part == factor && isDigits(f.name[:min(1, len(f.name))]) {
		e.What = fmt.Sprintf("%q, for %s, is neither a number nor a column", shorten(f.name), f.what())
		e.Advice = "write the number alone, without a unit or a sign; " + e.Advice
	}
	return at, err
}

// readAll reads the records to the end and refuses a table that is mostly unusable.
func (r *rows) readAll(from records) error {
	if err := r.explain(r.readRows(from)); err != nil {
		return err
	}
	switch {
	case r.table.Rows == 0:
		return r.header.noRows()
	case r.asides.len() > r.table.Rows/2:
		return r.mostlyAside()
	}
	r.table.Aside = r.asides.join()
	return nil
}

// readRows reads the records to the end.
func (r *rows) readRows(from records) error {
	for {
		rec, err := from.next()
		if err == io.EOF {
			return nil
		}
		if err != nil {
			return err
		}
		r.table.Rows++
		if err := r.readRow(rec); err != nil {
			return err
		}
	}
}

// readRow keeps one record or sets it aside. An error refuses the whole table.
func (r *rows) readRow(rec record) error {
	here := Error{File: r.header.source, Line: rec.line, Row: rec.row}
	if err := r.checkRecord(rec, here); err != nil {
		return err
	}
	if err := r.locate(rec, here); err != nil {
		return err
	}
	if a, bad := r.firstFault(rec.fields, here); bad {
		a.Line, a.Row = int32(rec.line), int32(rec.row)
		if r.want.Strict && a.Code == faultNumber && hasDecimalComma(a.Value) {
			r.hold(r.refuse(a))
		} else if r.want.Strict {
			return r.refuse(a)
		}
		r.asides.add(a)
		return nil
	}
	r.keepRow(rec.line, rec.row)
	return nil
}

// checkRecord refuses records that are not what they should be. Of a feature, only the properties asked for are looked
// at.
func (r *rows) checkRecord(rec record, here Error) error {
	if rec.site == nil {
		return r.header.checkRecord(rec.fields, here)
	}
	for _, f := range r.fields {
		s := rec.site.id
		if f.at >= 0 {
			s = rec.fields[f.at]
		}
		if (f.at >= 0 || f.at == atID) && !clean(s) {
			return r.header.notClean(f.name, s, here)
		}
	}
	return nil
}

// keepRow keeps the row at hand for the table.
func (r *rows) keepRow(line, row int) {
	r.lines.add(int32(line))
	r.numbers.add(int32(row))
	r.places.add(r.where())
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

// where returns the place of the row at hand.
func (r *rows) where() orb.Geometry {
	switch {
	case r.want.NoPlaces:
		return nil
	case r.shape >= 0:
		return r.site.geometry
	}
	return orb.Point{r.value[r.x], r.value[r.y]}
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
		What: a.sentence(), Advice: cmp.Or(r.adviceForCell(a), "correct the row") + ", or leave out --strict to set such rows aside"}
}

// sentence is the reason and the value.
func (a Aside) sentence() string {
	if a.Value == "" {
		return a.Reason
	}
	return fmt.Sprintf("%s: %q", a.Reason, a.Value)
}

// mostlyAside says why so many rows are unusable.
func (r *rows) mostlyAside() error {
	e, a := mostlyAside(r.header.source, r.asides.all(), r.asides.len(), r.table.Rows)
	e.Advice = r.adviceFor(a)
	return e
}

const adviceBelow = "say with --below-limit half or limit what stands for values below a detection limit"

// adviceFor says what to do about rows that are mostly unusable for one reason.
func (r *rows) adviceFor(a Aside) string {
	if advice := r.adviceForCell(a); advice != "" {
		return advice
	}
	switch {
	case a.Code == faultLimit:
		return adviceBelow
	case a.Code == "fractional-count":
		return "amounts that are not whole numbers are no counts: use --distribution tweedie for them"
	case a.Code == faultGeometry:
		return adviceForGeometry(a.Reason, r.header.shapes != nil)
	case a.Code == faultNoGeometry && r.header.shapes != nil:
		return "write the geometries of the features into the file, or name a file of places with --places"
	}
	if strings.HasPrefix(a.Code, faultMissing+"-") {
		return "check that the right column is named, or take the rows without a value out of the file"
	}
	return "check that the right columns are named, and that missing values are written as empty fields or NA"
}

// adviceForCell says what to do about the value that a row is set aside for; "" where the value does not tell.
func (r *rows) adviceForCell(a Aside) string {
	below := func(f field) bool { return f.name == a.Column && f.mayBeBelow(r.want.Kind) }
	switch {
	case a.Code == faultNumber && strings.HasPrefix(a.Value, "<") && slices.ContainsFunc(r.fields, below):
		return adviceBelow
	case a.Code == faultNumber && !r.header.origin.features:
		return adviceForCell(a.Value, r.format)
	}
	return ""
}

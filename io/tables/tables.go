// Package tables writes results as CSV: comma, dot, one header row, line feed, UTF-8 (RFC 4180 but for the line end).
//
// # Text that a spreadsheet would compute
//
// Names of zones and values of unusable rows come from the user's files, and a spreadsheet takes text that begins with
// =, +, -, @, a tab or a carriage return for a formula, quoted or not. Such text gets an apostrophe in front, which a
// spreadsheet shows and does not compute, unless it is a plain number such as -3 or +1.5e6. Numbers themselves are never
// touched. Who joins a result to other data by a name that begins so must allow for the apostrophe. (Common practice, no
// source.)
package tables

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
)

// Digits is the number of significant digits that numbers are written with.
const Digits = 12

// Column is a named column of numbers, whole numbers, or text: one of the slices is set, or none for a column that
// stays empty.
type Column struct {
	Name   string
	Number []float64 // NaN and infinities leave the cell empty
	Whole  []int64
	Text   []string
	// Exact has numbers written with all their digits, so that they read back as they were: coordinates, from which
	// the other columns can then be had again.
	Exact bool
}

// rows returns the number of rows of a column; ok is false for a column that stays empty.
func (c Column) rows() (n int, ok bool) {
	switch {
	case c.Number != nil:
		return len(c.Number), true
	case c.Whole != nil:
		return len(c.Whole), true
	case c.Text != nil:
		return len(c.Text), true
	}
	return 0, false
}

// Write writes n rows under a header. It returns an error, before anything is written, if a column has another number
// of rows, and the errors of w.
func Write(w io.Writer, n int, columns []Column) error {
	names := make([]string, len(columns))
	for j, c := range columns {
		names[j] = c.Name
	}
	t := NewWriter(w, names)
	if err := t.Append(n, columns); err != nil {
		return err
	}
	return t.Flush()
}

// Writer writes a table some rows at a time, for tables that are better not held at once. It writes what Write writes.
type Writer struct {
	out   *bufio.Writer
	names []string
	row   []byte // the row being written; the header until there is a first one
}

// NewWriter returns a Writer of a table with these columns. Nothing is written before the first Append or Flush.
func NewWriter(w io.Writer, names []string) *Writer {
	t := &Writer{out: bufio.NewWriterSize(w, 1<<16), names: slices.Clone(names)}
	for j, name := range t.names {
		t.row = separate(t.row, j)
		t.row = appendText(t.row, name)
	}
	t.row = append(t.row, '\n')
	return t
}

// Append writes n more rows. It returns an error, before any of them is written, if the columns are not those of
// NewWriter in their order or if one has another number of rows, and the errors of w. A column that stays empty here may
// be filled in other rows.
func (t *Writer) Append(n int, columns []Column) error {
	if err := t.check(n, columns); err != nil {
		return err
	}
	for i := 0; i < n; i++ {
		if _, err := t.out.Write(t.row); err != nil {
			return err
		}
		t.row = t.row[:0]
		for j, c := range columns {
			t.row = separate(t.row, j)
			switch {
			case c.Number != nil && c.Exact:
				t.row = appendExact(t.row, c.Number[i])
			case c.Number != nil:
				t.row = AppendNumber(t.row, c.Number[i])
			case c.Whole != nil:
				t.row = strconv.AppendInt(t.row, c.Whole[i], 10)
			case c.Text != nil:
				t.row = appendText(t.row, c.Text[i])
			}
		}
		if len(t.row) == 0 {
			t.row = append(t.row, `""`...) // an empty line would be no row at all
		}
		t.row = append(t.row, '\n')
	}
	return nil
}

func (t *Writer) check(n int, columns []Column) error {
	if len(columns) != len(t.names) {
		return fmt.Errorf("%d columns, not %d", len(columns), len(t.names))
	}
	for j, c := range columns {
		if c.Name != t.names[j] {
			return fmt.Errorf("column %d is %q, not %q", j+1, c.Name, t.names[j])
		}
		if m, ok := c.rows(); ok && m != n {
			return fmt.Errorf("column %q has %d rows, not %d", c.Name, m, n)
		}
	}
	return nil
}

// Flush writes what is still held back. It comes after the last Append; without any, the table is a header.
func (t *Writer) Flush() error {
	if _, err := t.out.Write(t.row); err != nil {
		return err
	}
	t.row = t.row[:0]
	return t.out.Flush()
}

// AppendNumber appends v to dst with Digits significant digits, or nothing where v is not finite. Zero has no sign.
func AppendNumber(dst []byte, v float64) []byte {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return dst
	}
	if v == 0 {
		return append(dst, '0') // never -0
	}
	return strconv.AppendFloat(dst, v, 'g', Digits, 64)
}

// appendExact appends v with as many digits as tell it from its neighbours.
func appendExact(dst []byte, v float64) []byte {
	switch a := math.Abs(v); {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return dst
	case v == 0:
		return append(dst, '0')
	case a >= 1e-4 && a < 1e21:
		return strconv.AppendFloat(dst, v, 'f', -1, 64)
	}
	return strconv.AppendFloat(dst, v, 'g', -1, 64)
}

func separate(row []byte, j int) []byte {
	if j > 0 {
		return append(row, ',')
	}
	return row
}

// appendText appends s as a field. Bytes that are no UTF-8, which a file name may hold, become U+FFFD.
func appendText(row []byte, s string) []byte {
	s = strings.ToValidUTF8(s, "\uFFFD")
	if isFormula(s) {
		s = "'" + s
	}
	if !strings.ContainsAny(s, ",\"\r\n") {
		return append(row, s...)
	}
	row = append(row, '"')
	row = append(row, strings.ReplaceAll(s, `"`, `""`)...)
	return append(row, '"')
}

// isFormula reports whether a spreadsheet would compute s.
func isFormula(s string) bool {
	if s == "" || !strings.Contains("=+-@\t\r", s[:1]) {
		return false
	}
	if strings.Trim(s, "0123456789.eE+-") != "" {
		return true
	}
	_, err := strconv.ParseFloat(s, 64)
	return err != nil
}

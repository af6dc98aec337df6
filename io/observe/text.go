package observe

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"unicode"
	"unicode/utf8"
)

// maxRecord bounds one record, and with it the memory that a quote left open can take: everything up to the next
// quote belongs to one field. The outline of a country in full detail takes some megabytes.
const maxRecord = 8 << 20

// maxColumns bounds the columns of one record: each takes some 200 bytes while the record is read, however empty it is.
const maxColumns = 1 << 16

const (
	adviceText  = "save the table as CSV in UTF-8, with commas between the columns"
	adviceQuote = "put a field that holds a \" in quotes and write it twice inside them"
	adviceWhole = "check that this is the right file and that it was written completely"
)

// headSize is how much of a file is looked at to tell what it is.
const headSize = 1 << 16

// text gives the records of a file, the header first.
type text struct {
	*csv.Reader
	origin *origin
}

// openText looks at the start of a decoded text and finds how its columns are separated.
func openText(decoded io.Reader, from *origin) (*text, error) {
	buffered := bufio.NewReaderSize(newBounded(decoded, from), headSize)
	head, err := buffered.Peek(headSize)
	if err := from.look(head, err); err != nil {
		return nil, err
	}
	return &text{newCSV(buffered, from.separator), from}, nil
}

// look finds out how a table is written by the first headSize bytes of the text, or by those that came before err.
func (o *origin) look(head []byte, err error) error {
	if err != nil && err != io.EOF && len(head) == 0 {
		return readError(o.source, err)
	}
	if outsideQuotes(headerLine(head))['\r'] > 0 {
		return &Error{File: o.source, What: "the lines end in carriage returns alone, which are not read",
			Advice: "save the table with a line feed at the end of each line, alone or behind the carriage return"}
	}
	o.blank = len(head) > 0
	if o.separator, o.announced = announced(head); o.announced && o.format.Separator != 0 {
		o.separator = o.format.Separator
	}
	if !o.announced {
		if o.separator, err = o.format.separator(head, o.source); err != nil {
			return err
		}
	}
	o.first = o.start(head, o.separator)
	return o.titleAbove(head)
}

// announced returns the separator that the first line of a file names, as in "sep=;", and reports whether it does (common
// practice of spreadsheets, no source).
func announced(head []byte) (rune, bool) {
	name, mark, is := bytes.Cut(headerLine(head), []byte("="))
	c, size := utf8.DecodeRune(mark)
	if !is || !bytes.EqualFold(name, []byte("sep")) || size != len(mark) || !canSeparate(c) {
		return 0, false
	}
	return c, true
}

// newCSV returns a reader of records by the rules of the package: those of every table, however it is read.
func newCSV(r io.Reader, separator rune) *csv.Reader {
	in := csv.NewReader(r)
	in.Comma = separator
	in.FieldsPerRecord = -1 // counted by checkRecord, which can say how many there should be
	in.ReuseRecord = true
	// Or a quote after ", " would be an error; values are trimmed in any case. The reader takes leading tabs for blanks
	// even where they separate columns.
	in.TrimLeadingSpace = !unicode.IsSpace(separator)
	return in
}

// bounded passes bytes on until one record grows beyond maxRecord or maxColumns. It counts quotes as the CSV reader does for a
// file it accepts; where a stray quote makes the two differ, the CSV reader has an error of its own.
type bounded struct {
	from        io.Reader
	source      string
	line, start int // line being read, and line on which the record started
	size        int // bytes of the record so far
	columns     int // of the record so far, behind the first
	separates   [256]bool
	quoted      bool
	err         error // kept: a buffer above may ask again
}

// newBounded returns the bounded text of a table. Where the separator is still to be found, all that it may be count.
func newBounded(r io.Reader, from *origin) *bounded {
	b := &bounded{from: r, source: from.source, line: 1, start: 1}
	separators := []rune{from.format.Separator}
	if from.format.Separator == 0 {
		separators = found
	}
	for _, c := range separators {
		if c < utf8.RuneSelf { // others take more bytes a column
			b.separates[c] = true
		}
	}
	return b
}

// Read passes on what from gives.
func (b *bounded) Read(p []byte) (int, error) {
	if b.err != nil {
		return 0, b.err
	}
	n, err := b.from.Read(p)
	b.err = err
	for i, c := range p[:n] {
		switch c {
		case '"':
			b.quoted = !b.quoted
		case '\n':
			b.line++
			if !b.quoted {
				b.size, b.columns, b.start = 0, 0, b.line
				continue
			}
		default:
			if b.separates[c] && !b.quoted {
				b.columns++
			}
		}
		if b.size++; b.size > maxRecord || b.columns >= maxColumns {
			b.err = b.tooLong()
			return i, b.err
		}
	}
	return n, err
}

func (b *bounded) tooLong() error {
	e := &Error{File: b.source, Line: b.start, Advice: adviceWhole,
		What: fmt.Sprintf("the line is longer than %d bytes, the most that is read", maxRecord)}
	switch {
	case b.columns >= maxColumns:
		e.What = fmt.Sprintf("the line has more than %d columns, the most that is read", maxColumns)
	case b.quoted:
		e.What = fmt.Sprintf("a quoted field is not closed within %d bytes", maxRecord)
		e.Advice = adviceQuote + ", and give outlines as long as that in GeoJSON"
	}
	return e
}

// readError places an error of the CSV reader, or of the reader below it, in the file.
func readError(source string, err error) error {
	var placed *Error
	if errors.As(err, &placed) {
		return placed
	}
	var parse *csv.ParseError
	if !errors.As(err, &parse) {
		return &Error{File: source, What: "cannot be read: " + err.Error(), Cause: err}
	}
	e := &Error{File: source, Line: parse.Line, Cause: err, Advice: adviceQuote}
	switch {
	case errors.Is(err, csv.ErrBareQuote):
		e.What = fmt.Sprintf("a \" at character %d stands inside a field that is not quoted", parse.Column)
	case errors.Is(err, csv.ErrQuote) && parse.StartLine != parse.Line:
		e.Line = parse.StartLine
		e.What = fmt.Sprintf("a quoted field is not closed properly by line %d", parse.Line)
	case errors.Is(err, csv.ErrQuote):
		e.What = fmt.Sprintf("a quoted field is not closed properly at character %d", parse.Column)
	default:
		e.What = parse.Err.Error()
	}
	return e
}

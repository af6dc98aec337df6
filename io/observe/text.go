package observe

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
)

// maxRecord bounds one record, and with it the memory that a quote left open can take: everything up to the next
// quote belongs to one field.
const maxRecord = 1 << 20

const (
	adviceText  = "save the table as CSV in UTF-8, with commas between the columns"
	adviceQuote = "put a field that holds a \" in quotes and write it twice inside them"
	adviceWhole = "check that this is the right file and that it was written completely"
)

// headSize is how much of a file is looked at to tell what it is.
const headSize = 1 << 16

// openText looks at the start of r, refuses what is not comma-separated UTF-8 text, and returns a reader of records
// standing at the header.
func openText(r io.Reader, source string) (*csv.Reader, error) {
	buffered := bufio.NewReaderSize(newBounded(r, source), headSize)
	head, err := buffered.Peek(headSize)
	mark, err := checkHead(head, err, source)
	if err != nil {
		return nil, err
	}
	buffered.Discard(mark) // cannot fail: the bytes are in the buffer
	return newCSV(buffered), nil
}

// checkHead looks at the first headSize bytes of a file, or at those that came before err, and refuses what is not
// comma-separated UTF-8 text. It returns the length of the byte order mark, which may be 0.
func checkHead(head []byte, err error, source string) (int, error) {
	if err != nil && err != io.EOF && len(head) == 0 {
		return 0, readError(source, err)
	}
	if what, advice := notText(head); what != "" {
		return 0, &Error{File: source, What: what, Advice: advice}
	}
	text := bytes.TrimPrefix(head, []byte("\xef\xbb\xbf"))
	if what := notCommas(text); what != "" {
		return 0, &Error{File: source, What: what, Advice: adviceText}
	}
	return len(head) - len(text), nil
}

// newCSV returns a reader of records by the rules of the package: those of every table, however it is read.
func newCSV(r io.Reader) *csv.Reader {
	in := csv.NewReader(r)
	in.FieldsPerRecord = -1 // counted by checkRecord, which can say how many there should be
	in.ReuseRecord = true
	in.TrimLeadingSpace = true // or a quote after ", " would be an error; values are trimmed in any case
	return in
}

// notText names a file that is something other than text, by its first bytes.
func notText(head []byte) (what, advice string) {
	starts := func(mark string) bool { return bytes.HasPrefix(head, []byte(mark)) }
	switch {
	case len(head) == 0:
		return "the file is empty", adviceWhole
	case starts("\xff\xfe") || starts("\xfe\xff"), len(head) > 1 && (head[0] == 0) != (head[1] == 0):
		return "the file is UTF-16 text, and only UTF-8 is read", adviceText
	case starts("PK\x03\x04"):
		return "the file is a spreadsheet or a zip archive, not a CSV table", adviceText
	case starts("\x1f\x8b"):
		return "the file is compressed with gzip", "unpack it first"
	case bytes.IndexByte(head, 0) >= 0:
		return "the file holds NUL bytes, so it is not text", adviceText
	}
	return "", ""
}

// notCommas looks at the first line that is not blank and names a separator or a line end that is not read.
func notCommas(head []byte) string {
	head = bytes.TrimLeft(head, " \r\n")
	end := bytes.IndexByte(head, '\n')
	if end < 0 {
		end = len(head)
	}
	line := bytes.TrimRight(head[:end], "\r")
	count := map[byte]int{}
	quoted := false
	for _, c := range line {
		if c == '"' {
			quoted = !quoted
		} else if !quoted {
			count[c]++
		}
	}
	switch {
	case count['\r'] > 0:
		return "the lines end in carriage returns alone, which are not read"
	case count[';'] > count[',']:
		return "the columns are separated by semicolons, and only commas are read"
	case count['\t'] > count[',']:
		return "the columns are separated by tabs, and only commas are read"
	}
	return ""
}

// bounded passes bytes on until one record grows beyond maxRecord. It counts quotes as the CSV reader does for a
// file it accepts; where a stray quote makes the two differ, the CSV reader has an error of its own.
type bounded struct {
	from        io.Reader
	source      string
	line, start int // line being read, and line on which the record started
	size        int // bytes of the record so far
	quoted      bool
	err         error // kept: a buffer above may ask again
}

func newBounded(r io.Reader, source string) *bounded {
	return &bounded{from: r, source: source, line: 1, start: 1}
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
				b.size, b.start = 0, b.line
				continue
			}
		}
		if b.size++; b.size > maxRecord {
			b.err = b.tooLong()
			return i, b.err
		}
	}
	return n, err
}

func (b *bounded) tooLong() error {
	e := &Error{File: b.source, Line: b.start, Advice: adviceWhole,
		What: fmt.Sprintf("the line is longer than %d bytes, the most that is read", maxRecord)}
	if b.quoted {
		e.What = fmt.Sprintf("a quoted field is not closed within %d bytes", maxRecord)
		e.Advice = adviceQuote
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

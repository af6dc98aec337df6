package observe

import (
	"bytes"
	"encoding/csv"
	"io"
)

// parser reads single records out of memory, by the rules of every table.
type parser struct {
	lines     lines
	in        *csv.Reader // over lines
	separator []byte
}

func newParser(separator rune) *parser {
	p := &parser{separator: []byte(string(separator))}
	p.in = newCSV(&p.lines, separator)
	return p
}

// parse reads the record with which text starts, and returns its fields, good until the next call, and its size in
// bytes with the end of its line. What comes after the text is io.EOF or the failure of a reader. The lines in an
// error are counted by the parser, not in the file.
func (p *parser) parse(text []byte, after error) (fields []string, size int, err error) {
	p.lines = lines{text, after}
	fields, err = p.in.Read()
	return fields, len(text) - len(p.lines.text), err
}

// field returns the field at a position of a record known to have it, without the blanks around it.
func (p *parser) field(record []byte, at int) ([]byte, error) {
	rest := record
	for i := 0; ; i++ {
		field, behind, _ := bytes.Cut(rest, p.separator)
		if bytes.IndexByte(field, '"') >= 0 {
			break // separators may stand within quotes
		}
		if i == at {
			return bytes.TrimSpace(field), nil
		}
		rest = behind
	}
	fields, _, err := p.parse(record, io.EOF)
	if err != nil {
		return nil, err
	}
	return bytes.TrimSpace([]byte(fields[at])), nil
}

// lines gives text line by line. A buffer above it asks for more only when it has no whole line, so it never holds
// anything beyond the line at hand, and the text can be exchanged between records.
type lines struct {
	text  []byte // what remains
	after error  // what comes after it
}

// Read gives the rest of a line, or as much of it as fits.
func (l *lines) Read(p []byte) (int, error) {
	if len(l.text) == 0 {
		return 0, l.after
	}
	line := firstLine(l.text[:min(len(p), len(l.text))])
	l.text = l.text[copy(p, line):]
	return len(line), nil
}

// firstLine returns the first line with its end, or all of a text without one.
func firstLine(text []byte) []byte {
	if end := bytes.IndexByte(text, '\n'); end >= 0 {
		return text[:end+1]
	}
	return text
}

// content returns a record without the end of its line; at the end of a file that may be a carriage return alone.
func content(record []byte) []byte {
	record = bytes.TrimSuffix(record, []byte("\n"))
	return bytes.TrimSuffix(record, []byte("\r"))
}

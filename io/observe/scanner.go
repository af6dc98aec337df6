package observe

import (
	"bytes"
	"encoding/csv"
	"errors"
	"io"
	"math"
	"slices"
	"unicode/utf8"
)

// scanner finds the rows of a file, block by block.
type scanner struct {
	shared    *Shared
	held      *heldCSV
	line      int    // the line of the file at which the scanner stands
	announced bool   // a line that names the separator is to come
	spans     []span // the rows of the block at hand
	parser    *parser
}

func newScanner(from *origin) *scanner {
	shared := &Shared{header: header{source: from.source, origin: from}}
	held := &heldCSV{header: &shared.header}
	shared.text = held
	return &scanner{shared: shared, held: held, line: 1, announced: from.announced, parser: newParser(from.separator)}
}

// block takes the next block and what comes after it, as blocks.next gives them.
func (s *scanner) block(text []byte, after error) error {
	b := block{text: text, first: s.shared.rows}
	s.spans = s.spans[:0]
	for at := 0; at < len(text); {
		size, err := s.record(text, at, after)
		if err != nil {
			return err
		}
		s.line += bytes.Count(text[at:at+size], newline)
		at += size
	}
	if len(s.spans) > 0 {
		b.spans = slices.Clone(s.spans)
		s.held.blocks = append(s.held.blocks, b)
	}
	return nil
}

// record takes what starts at a position of the block, a blank line, the header or a row, and returns its size.
func (s *scanner) record(block []byte, at int, after error) (int, error) {
	text := block[at:]
	line := firstLine(text)
	if isBlank(line) {
		return len(line), nil
	}
	if mayBeEmpty(line, s.parser.separator) {
		fields, size, err := s.parse(text, after)
		if err != nil || isEmpty(fields) {
			return size, err
		}
	}
	if s.shared.header.names == nil {
		return s.readHeader(text, after)
	}
	size, err := s.checkRow(text, line, after)
	if err != nil {
		return 0, err
	}
	s.spans = append(s.spans, span{uint32(at), uint32(size), int32(s.line)})
	s.shared.rows++
	s.shared.bytes += len(content(text[:size])) + 1
	return size, nil
}

var newline = []byte("\n")

// isBlank reports whether the CSV reader passes over a line. A carriage return alone is a line only at the end of the
// file; elsewhere it is part of one.
func isBlank(line []byte) bool {
	switch string(line) {
	case "\n", "\r\n", "\r":
		return true
	}
	return false
}

// mayBeEmpty reports whether a record that starts with a line may be empty: most have a letter or a digit.
func mayBeEmpty(line, separator []byte) bool {
	return bytes.IndexFunc(line, func(c rune) bool {
		return c < utf8.RuneSelf && c > ' ' && c != '"' && !bytes.ContainsRune(separator, c)
	}) < 0
}

// readHeader takes the names from the record with which text starts, and returns its size.
func (s *scanner) readHeader(text []byte, after error) (int, error) {
	fields, size, err := s.parse(text, after)
	if err != nil {
		return 0, err
	}
	if s.announced {
		s.announced = false
		return size, nil
	}
	s.held.head = content(text[:size])
	s.shared.header, err = newHeader(fields, s.line, s.shared.header.origin)
	return size, err
}

// checkRow checks the record with which text starts, and returns its size. Most are one plain line, which is seen at a
// glance; the others go through the CSV reader, which also has the words for what is wrong with them.
func (s *scanner) checkRow(text, line []byte, after error) (int, error) {
	if s.isPlain(line, after) {
		return len(line), nil
	}
	fields, size, err := s.parse(text, after)
	if err != nil {
		return 0, err
	}
	here := Error{File: s.shared.header.source, Line: s.line, Row: s.shared.rows + 1}
	return size, s.shared.header.checkRecord(fields, here)
}

// isPlain reports whether a line is a whole record without quotes that checkRecord has nothing against.
func (s *scanner) isPlain(line []byte, after error) bool {
	whole := line[len(line)-1] == '\n' || after == io.EOF
	return whole && bytes.IndexByte(line, '"') < 0 && bytes.Count(line, s.parser.separator)+1 == len(s.shared.header.names) &&
		utf8.Valid(line) && bytes.IndexByte(line, 0) < 0 && s.line <= math.MaxInt32
}

// parse reads the record with which text starts. An error is placed in the file.
func (s *scanner) parse(text []byte, after error) ([]string, int, error) {
	if after == nil {
		after = io.ErrUnexpectedEOF // never met: a block that another follows ends with a whole record
	}
	fields, size, err := s.parser.parse(text, after)
	if err == nil {
		return fields, size, nil
	}
	if parse, ok := errors.AsType[*csv.ParseError](err); ok {
		moved := *parse
		moved.StartLine, moved.Line = s.line, s.line+parse.Line-parse.StartLine
		err = &moved
	}
	return nil, 0, readError(s.shared.header.source, err)
}

// finish returns the table once the reader has given all it has: io.EOF or a failure comes after the last block.
func (s *scanner) finish(after error) (*Shared, error) {
	switch {
	case after != io.EOF:
		return nil, readError(s.shared.header.source, after)
	case s.shared.header.names == nil:
		return nil, s.shared.header.origin.noHeader()
	case s.shared.rows == 0:
		return nil, s.shared.header.noRows()
	}
	return s.shared, nil
}

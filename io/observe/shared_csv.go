package observe

import (
	"io"
	"sort"
)

// heldCSV is a CSV table as it stands in its file.
type heldCSV struct {
	header *header
	head   []byte // the header as it stands in the file, without the end of its line
	blocks []block
}

// block is a piece of the file and where its rows stand.
type block struct {
	text  []byte
	first int // rows of the file before it
	spans []span
}

// span is where a row stands in its block, the end of its line included, and the line of the file on which it starts.
type span struct {
	offset, size uint32
	line         int32
}

// wholeCSV reads a CSV table to its end.
func wholeCSV(decoded io.Reader, origin *origin) (*Shared, error) {
	from := &blocks{from: newBounded(decoded, origin), size: headSize}
	text, after := from.next()
	if err := origin.look(text[:min(len(text), headSize)], after); err != nil {
		return nil, err
	}
	scan := newScanner(origin)
	for {
		if err := scan.block(text, after); err != nil {
			return nil, err
		}
		if after != nil {
			return scan.finish(after)
		}
		text, after = from.next()
	}
}

// row returns a row as it stands in the file and with the end of its line, and its line in the file.
func (h *heldCSV) row(i int) (text []byte, line int) {
	b := &h.blocks[sort.Search(len(h.blocks), func(k int) bool { return h.blocks[k].first > i })-1]
	return b.row(i - b.first)
}

func (b *block) row(i int) (text []byte, line int) {
	at := b.spans[i]
	return b.text[at.offset : at.offset+at.size], int(at.line)
}

func (h *heldCSV) appendHead(to []byte) []byte { return append(append(to, h.head...), '\n') }

func (h *heldCSV) appendRow(to []byte, row int) []byte {
	text, _ := h.row(row)
	return append(append(to, content(text)...), '\n')
}

func (h *heldCSV) size(row int) int {
	text, _ := h.row(row)
	return len(content(text)) + 1
}

func (h *heldCSV) records(p Part) records {
	return &scattered{held: h, part: p, parser: newParser(h.header.origin.separator)}
}

// values reads single fields; at is a column of the file.
func (h *heldCSV) values(at int, each func(value []byte, row, line int)) error {
	parser := newParser(h.header.origin.separator)
	for _, b := range h.blocks {
		for i := range b.spans {
			text, line := b.row(i)
			value, err := parser.field(text, at)
			if err != nil {
				return readError(h.header.source, err) // never met: Whole has parsed the same bytes
			}
			each(value, b.first+i, line)
		}
	}
	return nil
}

// scattered gives the records of a part, wherever they stand.
type scattered struct {
	held   *heldCSV
	part   Part
	at     int // rows given so far
	parser *parser
}

func (s *scattered) next() (record, error) {
	if s.at == s.part.Rows {
		return record{}, io.EOF
	}
	row := s.part.row(s.at)
	text, line := s.held.row(row)
	s.at++
	fields, _, err := s.parser.parse(text, io.EOF)
	if err != nil {
		return record{}, readError(s.held.header.source, err) // never met: Whole has parsed the same bytes
	}
	return record{fields: fields, line: line, row: row + 1}, nil
}

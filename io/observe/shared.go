package observe

import (
	"io"
	"slices"
	"sort"
)

// Shared is a table held in memory as it stands in its file, for parts of it to be read one by one or at the same
// time: it does not change. It takes the bytes of the text in UTF-8 once and 12 bytes a row.
type Shared struct {
	header header
	head   []byte // the header as it stands in the file, without the end of its line
	blocks []block
	rows   int
	bytes  int // of the rows, as in Part
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

// Whole reads a table to its end. It takes the same files as ReadCSV, and refuses with the same *Error what ReadCSV
// refuses whatever the request is: a file that is no such text, quotes out of place, a name that appears twice, a row
// of the wrong length, no rows at all. What a row holds is looked at by ReadPart.
func Whole(r io.Reader, source string) (*Shared, error) { return WholeAs(r, source, Format{}) }

// WholeAs is Whole for a table that is written in the given format.
func WholeAs(r io.Reader, source string, format Format) (*Shared, error) {
	if err := format.Validate(); err != nil {
		return nil, inFile(err, source)
	}
	decoded, origin, err := openOrigin(r, source, format)
	if err != nil {
		return nil, err
	}
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

// Columns returns the names in the header, in order and without the blanks around them. A blank name is "".
func (s *Shared) Columns() []string { return slices.Clone(s.header.names) }

// row returns a row, counted from 0, as it stands in the file and with the end of its line, and its line in the file.
func (s *Shared) row(i int) (text []byte, line int) {
	b := &s.blocks[sort.Search(len(s.blocks), func(k int) bool { return s.blocks[k].first > i })-1]
	return b.row(i - b.first)
}

func (b *block) row(i int) (text []byte, line int) {
	at := b.spans[i]
	return b.text[at.offset : at.offset+at.size], int(at.line)
}

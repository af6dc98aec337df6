package observe

import "io"

// Shared is a table held in memory, for parts of it to be read one by one or at the same time: it does not change. A
// CSV table is held as it stands in its file: it takes the bytes of the text in UTF-8 once and 12 bytes a row. Features
// are held as vector.Observations.
type Shared struct {
	header header
	text   held
	rows   int
	bytes  int // of the rows, as in Part
}

// held is the text of a table in memory. Rows are counted from 0.
type held interface {
	// appendHead and appendRow append what Part.SHA256 is the checksum of: what stands above the rows, and a row.
	appendHead(to []byte) []byte
	appendRow(to []byte, row int) []byte
	// size returns how many bytes appendRow appends.
	size(row int) int
	// records gives the rows of a part.
	records(p Part) records
	// values calls each with the trimmed values of a column, row by row, and the lines on which the rows start. A value is
	// good until the next call.
	values(at int, each func(value []byte, row, line int)) error
}

// Whole reads a table to its end. It takes the same files as Read, and refuses with the same *Error what Read refuses
// whatever the request is: a file that is no such text, quotes out of place, a name that appears twice, a row of the
// wrong length, no rows at all. What a row holds is looked at by ReadPart.
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
	if origin.features {
		return wholeFeatures(decoded, origin)
	}
	return wholeCSV(decoded, origin)
}

// Columns returns the names of the columns, as the function of that name does.
func (s *Shared) Columns() []string { return s.header.columns() }

package observe

import (
	"crypto/sha256"
	"encoding/hex"
	"slices"
)

// Part is some rows of a table that is held in memory, below the table's header. Parts come from All, Split and Only;
// the zero Part has no header and cannot be read. A Part is a value that shares the text of its table and may be used
// by several goroutines at once.
type Part struct {
	Name  string // the value of the column that was split by, without the blanks around it; empty for All
	Rows  int    // rows in the part, usable or not
	Bytes int    // of the rows as SHA256 takes them

	shared *Shared
	rows   []int32 // the rows, counted from 0 and ascending; nil for every row
}

// All returns the part that holds every row.
func (s *Shared) All() Part {
	return Part{Rows: s.rows, Bytes: s.bytes, shared: s}
}

// Only returns the rows of p whose numbers, as in Table.Row, are among those given, in the order of the file. The
// numbers may come in any order and more than once; those of rows that are not in p do not count. The part may come
// out empty. It takes time in proportion to the numbers given.
func (p Part) Only(numbers []int32) Part {
	if !slices.IsSorted(numbers) {
		numbers = slices.Sorted(slices.Values(numbers))
	}
	only := Part{Name: p.Name, shared: p.shared, rows: make([]int32, 0, len(numbers))}
	for k, number := range numbers {
		if k > 0 && number == numbers[k-1] || !p.has(int(number)-1) {
			continue
		}
		only.rows = append(only.rows, number-1)
		only.Bytes += p.shared.text.size(int(number) - 1)
	}
	only.Rows = len(only.rows)
	return only
}

// has reports whether a row, counted from 0, belongs to the part.
func (p Part) has(row int) bool {
	if row < 0 || row >= p.shared.rows {
		return false
	}
	if p.rows == nil {
		return true
	}
	_, found := slices.BinarySearch(p.rows, int32(row))
	return found
}

// row returns the row, counted from 0 in the file, that stands at position i of the part.
func (p Part) row(i int) int {
	if p.rows == nil {
		return i
	}
	return int(p.rows[i])
}

// SHA256 returns a checksum in hexadecimal. It does not depend on where the rows stand or on the rows of other parts.
// Of a CSV table it is that of a file that holds the header and the rows of the part as they stand in the table, in
// UTF-8 without a byte order mark, empty lines and a line that names the separator, and with a line feed at the end of
// each record. Of features it is that of their reference system, identifiers, properties and geometries, however they
// are written.
func (p Part) SHA256() string {
	sum := sha256.New()
	text := p.shared.text.appendHead(nil)
	sum.Write(text)
	for i := range p.Rows {
		text = p.shared.text.appendRow(text[:0], p.row(i))
		sum.Write(text)
	}
	return hex.EncodeToString(sum.Sum(nil))
}

// Check reports what ReadPart would refuse before it looks at a row: a request that no table could satisfy, a column
// that is absent, coordinates that are not found.
func (p Part) Check(want Request) error {
	if err := want.Validate(); err != nil {
		return inFile(err, p.shared.header.source)
	}
	_, err := newRows(p.shared.header, want)
	return err
}

// ReadPart reads the rows of a part as Read would read a file that held nothing else, but every line and row in the
// table, its rows set aside and errors is that of the whole file, and the columns are those of the whole file. Table.Rows
// is the number of rows in the part. The format is that of the table, whatever the request says. A part without rows is
// refused.
func ReadPart(p Part, want Request) (*Table, error) {
	if err := p.Check(want); err != nil {
		return nil, err
	}
	if p.Rows == 0 {
		return nil, &Error{File: p.shared.header.source, What: "none of its rows are left to read"}
	}
	return readTable(p.shared.header, want, p.shared.text.records(p))
}

// Source returns the name of the table that the part is of.
func (p Part) Source() string { return p.shared.header.source }

// Columns returns the names of the table's columns, as Shared.Columns does.
func (p Part) Columns() []string { return p.shared.Columns() }

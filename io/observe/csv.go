package observe

import "io"

// readCSV reads a table out of its decoded text.
func readCSV(decoded io.Reader, from *origin, want Request) (*Table, error) {
	in, err := openText(decoded, from)
	if err != nil {
		return nil, err
	}
	h, err := readHeader(in, from.source)
	if err != nil {
		return nil, err
	}
	return readTable(h, want, &stream{in: in, source: from.source})
}

// stream gives the records of a file as it is read.
type stream struct {
	in     *text // below the header
	source string
	row    int
}

func (s *stream) next() (record, error) {
	fields, err := s.in.Read()
	for err == nil && isEmpty(fields) {
		fields, err = s.in.Read()
	}
	if err == io.EOF {
		return record{}, err
	}
	if err != nil {
		return record{}, readError(s.source, err)
	}
	line, _ := s.in.FieldPos(0)
	s.row++
	return record{fields: fields, line: line, row: s.row}, nil
}

package observe

import (
	"io"
	"math"
	"math/rand/v2"
	"strings"
)

// The bounds of what a survey keeps in memory, whatever the length of the table.
const (
	mostDistinct = 10_000    // values of a column that are told apart, and values behind its quantiles
	mostPlaces   = 100_000   // places that are told apart
	mostRows     = 500_000   // rows that are told apart
	mostCells    = 2_000_000 // values of all columns together, where there are many columns
	fewestKept   = 50        // values of a column that are kept even so
)

// SurveyRequest says how a table is to be looked at. The zero value is a table of which nothing is known.
type SurveyRequest struct {
	X, Y string // coordinate columns; both empty to recognise them by their names, as ReadCSV does
	Axes Axes   // what the coordinates are

	Format Format // how the table is written; BelowLimit has no bearing

	// Guess is asked for coordinate columns where none are recognised. It is given the names of all columns and
	// returns two of them, or nothing. It may be nil.
	Guess func(names []string) (x, y string)
}

// Survey describes a table of which nothing is known yet.
type Survey struct {
	Source    string
	Rows      int
	Columns   []SurveyColumn // in the order of the file
	Separator string         // between the columns: "comma", "semicolon", "tab" or a quoted character
	Encoding  string         // of the file, such as "UTF-8"

	XName, YName string   // the coordinate columns; empty where there are none
	Degrees      bool     // they are longitude and latitude, by their names or as the request says
	Recognised   bool     // they were found by the rules of ReadCSV
	Guessed      bool     // they were found by SurveyRequest.Guess alone
	PassedOver   []string // recognised pairs that were present but not used, such as "x/y"
	Unrecognised error    // why ReadCSV would find no coordinate columns; nil where it does

	Places   SurveyPlaces
	Repeated RepeatedRows
	Sampled  int // rows behind SurveyColumn.Number and Code: all of them, or some drawn at random
}

// SurveyPlaces are the distinct places of a table, in the order in which they first appear.
type SurveyPlaces struct {
	X, Y []float64 // as they stand in the file
	Rows []int     // rows at each place

	Beyond  int // rows at further places, where there are too many to tell apart
	Without int // rows in which a coordinate is missing or no number
	Row     int // the first of these, from 1; 0 where there is none
}

// RepeatedRows are rows of which every value was met before, in one row.
type RepeatedRows struct {
	Rows          int
	Row, Original int  // the first such row and the one that it repeats, from 1; 0 where there is none
	Partly        bool // there are too many rows to tell apart, and the last were compared with the first only
}

// Column returns the column of that name, or nil.
func (s *Survey) Column(name string) *SurveyColumn {
	for i := range s.Columns {
		if s.Columns[i].Name == name {
			return &s.Columns[i]
		}
	}
	return nil
}

// ReadSurvey reads a table to its end, once, and describes its columns and places. It takes the same files as ReadCSV,
// and returns the same *Error for what ReadCSV refuses whatever the request is, and for coordinate columns that are
// named and absent; values of any kind are described, not refused. Memory is bounded but for the length of one row.
// Where a table is too long to be kept, quantiles and comparisons of columns are made from rows drawn at random with a
// fixed seed.
func ReadSurvey(r io.Reader, source string, want SurveyRequest) (*Survey, error) {
	if err := (Request{X: want.X, Y: want.Y, Format: want.Format}).Validate(); err != nil {
		return nil, inFile(err, source)
	}
	in, err := openTextAs(r, source, want.Format)
	if err != nil {
		return nil, err
	}
	h, err := readHeader(in, source)
	if err != nil {
		return nil, err
	}
	s, err := newSurveyor(h, want)
	if err != nil {
		return nil, err
	}
	if err := s.readAll(&stream{in: in, source: source}); err != nil {
		return nil, err
	}
	out := s.finish()
	out.Separator, out.Encoding = separatorWord(h.origin.separator), h.origin.encoding()
	return out, nil
}

// surveyor makes a survey row by row.
type surveyor struct {
	header  header
	survey  *Survey
	columns []*columnSurvey
	x, y    int // positions of the coordinates; -1 for none
	places  map[[2]float64]int
	rows    map[uint64]int // first row, by the hash of its values
	sample  int            // rows of the sample
	random  *rand.Rand
}

func newSurveyor(h header, want SurveyRequest) (*surveyor, error) {
	most := min(max(mostCells/len(h.names), fewestKept), mostDistinct)
	s := &surveyor{header: h, survey: &Survey{Source: h.source}, x: -1, y: -1, places: map[[2]float64]int{}, rows: map[uint64]int{},
		sample: most, random: seeded(0)}
	for i, name := range h.names {
		s.columns = append(s.columns, newColumnSurvey(name, &h.origin.format, most, seeded(uint64(i)+1)))
	}
	return s, s.findCoordinates(want)
}

// seeded is a source of random numbers that is the same at every run.
func seeded(stream uint64) *rand.Rand { return rand.New(rand.NewPCG(1, stream)) }

// findCoordinates finds the coordinate columns as ReadCSV does, or by the guess.
func (s *surveyor) findCoordinates(want SurveyRequest) error {
	t := s.survey
	c, err := s.header.coordinates(Request{X: want.X, Y: want.Y, Axes: want.Axes})
	if err != nil {
		t.Unrecognised = err
		if want.Guess == nil {
			return nil
		}
		c = coordinates{degrees: want.Axes == AxesDegrees}
		c.x, c.y = want.Guess(s.header.names)
		if c.x == "" || c.y == "" {
			return nil
		}
		t.Guessed = true
	}
	t.XName, t.YName, t.Degrees, t.Recognised, t.PassedOver = c.x, c.y, c.degrees, c.recognised, c.passedOver
	if s.x, err = s.header.find(c.x, coordinateX.String()); err != nil {
		return err
	}
	s.y, err = s.header.find(c.y, coordinateY.String())
	return err
}

func (s *surveyor) readAll(from records) error {
	for {
		record, line, row, err := from.next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return err
		}
		if err := s.header.checkRecord(record, Error{File: s.header.source, Line: line, Row: row}); err != nil {
			return err
		}
		s.survey.Rows++
		s.readRow(record, line, row)
	}
	if s.survey.Rows == 0 {
		return s.header.noRows()
	}
	return nil
}

func (s *surveyor) readRow(record []string, line, row int) {
	slot := s.slot(row)
	for i, field := range record {
		record[i] = strings.TrimSpace(field)
		s.columns[i].take(record[i], line, row, slot)
	}
	s.place(row)
	s.compare(record, row)
}

// slot is where the row goes in the sample; -1 if it does not (Vitter 1985, ACM Trans. Math. Softw. 11:37-57, algorithm
// R).
func (s *surveyor) slot(row int) int {
	if row <= s.sample {
		return row - 1
	}
	if at := s.random.IntN(row); at < s.sample {
		return at
	}
	return -1
}

// place counts the row at its place.
func (s *surveyor) place(row int) {
	if s.x < 0 {
		return
	}
	p := &s.survey.Places
	x, y := s.columns[s.x].last, s.columns[s.y].last
	if math.IsNaN(x) || math.IsNaN(y) {
		if p.Without++; p.Without == 1 {
			p.Row = row
		}
		return
	}
	at := [2]float64{x + 0, y + 0} // no negative 0
	i, seen := s.places[at]
	switch {
	case seen:
		p.Rows[i]++
	case len(p.Rows) == mostPlaces:
		p.Beyond++
	default:
		s.places[at] = len(p.Rows)
		p.X, p.Y, p.Rows = append(p.X, at[0]), append(p.Y, at[1]), append(p.Rows, 1)
	}
}

// compare looks for a row with the same values.
func (s *surveyor) compare(record []string, row int) {
	key := hashed(record)
	original, seen := s.rows[key]
	again := &s.survey.Repeated
	switch {
	case seen:
		if again.Rows++; again.Rows == 1 {
			again.Row, again.Original = row, original
		}
	case len(s.rows) == mostRows:
		again.Partly = true
	default:
		s.rows[key] = row
	}
}

// hashed is the hash of the values of a row (Fowler, Noll & Vo's FNV-1a, 64 bits; constants from memory, as in hash/fnv).
// Among half a million rows, two that differ have the same about once in a hundred million tables.
func hashed(record []string) uint64 {
	const offset, prime = 14695981039346656037, 1099511628211
	h := uint64(offset)
	for _, field := range record {
		for i := range len(field) {
			h = (h ^ uint64(field[i])) * prime
		}
		h = (h ^ 0xff) * prime // a byte that no text has
	}
	return h
}

func (s *surveyor) finish() *Survey {
	t := s.survey
	t.Sampled = min(t.Rows, s.sample)
	for _, c := range s.columns {
		t.Columns = append(t.Columns, c.finish())
	}
	return t
}

package observe

import (
	"io"
	"math/rand/v2"
	"strings"

	"drumlin/grids/crs"
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
	X, Y     string // coordinate columns; both empty to recognise them by their names, as Read does
	Geometry string // column of geometries, in place of X and Y
	Axes     Axes   // what the coordinates are

	Format Format // how the table is written; BelowLimit has no bearing

	// Guess is asked for coordinate columns where none are recognised. It is given the names of all columns and
	// returns two of them, or nothing. It may be nil.
	Guess func(names []string) (x, y string)
}

// Survey describes a table of which nothing is known yet.
type Survey struct {
	Source    string
	Rows      int
	Columns   []SurveyColumn // in the order of the file, or of Columns
	Features  bool           // it is GeoJSON: the columns are properties, and the rows have geometries of their own
	Separator string         // between the columns: "comma", "semicolon", "tab" or a quoted character; empty for features
	Encoding  string         // of the file, such as "UTF-8"

	XName, YName string        // the coordinate columns; empty where there are none
	GeometryName string        // the column of geometries, named or guessed, or "geometry" of features; empty with coordinate columns
	Shapes       *SurveyShapes // the geometries; nil without GeometryName
	CRS          string        // what the source says that they are in, as in Table
	Degrees      bool          // the coordinates are longitude and latitude, by what the source says or as the request does
	Recognised   bool          // the coordinate columns were found by the rules of Read
	Guessed      bool          // they were found by SurveyRequest.Guess alone, or the geometries by their looks
	PassedOver   []string      // recognised pairs that were present but not used, such as "x/y"
	Unrecognised error         // why Read would not know where the rows are; nil where it does

	Places   SurveyPlaces
	Repeated RepeatedRows
	Sampled  int // rows behind SurveyColumn.Number and Code: all of them, or some drawn at random
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

// ReadSurvey reads a table to its end, once, and describes its columns and places. It takes the same files as Read,
// and returns the same *Error for what Read refuses whatever the request is, and for columns of places that are named
// and absent, or named for features; values of any kind are described, not refused. Memory is bounded but for the length
// of one row, and for features, which are held as vector.Observations. Where a table is too long to be kept, quantiles
// and comparisons of columns are made from rows drawn at random with a fixed seed.
func ReadSurvey(r io.Reader, source string, want SurveyRequest) (*Survey, error) {
	if err := want.request().Validate(); err != nil {
		return nil, inFile(err, source)
	}
	decoded, from, err := openOrigin(r, source, want.Format)
	if err != nil {
		return nil, err
	}
	h, rows, err := openRecords(decoded, from)
	if err != nil {
		return nil, err
	}
	s, err := newSurveyor(h, want)
	if err != nil {
		return nil, err
	}
	if err := s.readAll(rows); err != nil {
		return nil, err
	}
	out := s.finish()
	out.Encoding = from.encoding()
	return out, nil
}

// request is the part of a request for a table that a survey has too.
func (q SurveyRequest) request() Request {
	return Request{X: q.X, Y: q.Y, Geometry: q.Geometry, Axes: q.Axes, Format: q.Format}
}

// openRecords reads what stands above the records of a decoded text of either sort.
func openRecords(decoded io.Reader, from *origin) (header, records, error) {
	if from.features {
		o, err := openFeatures(decoded, from, nil)
		if err != nil {
			return header{}, nil, err
		}
		return featureHeader(o, from), &featureRecords{from: o, part: Part{Rows: o.Len()}}, nil
	}
	in, err := openText(decoded, from)
	if err != nil {
		return header{}, nil, err
	}
	h, err := readHeader(in, from.source)
	return h, &stream{in: in, source: from.source}, err
}

// surveyor makes a survey row by row.
type surveyor struct {
	header  header
	axes    Axes
	survey  *Survey
	columns []*columnSurvey
	x, y    int            // positions of the coordinates; -1 for none
	shapes  *shapeSurvey   // of the features or of the column that is named; nil for none
	places  placeCounter   // by coordinates
	rows    map[uint64]int // first row, by the hash of its values
	sample  int            // rows of the sample
	random  *rand.Rand
}

func newSurveyor(h header, want SurveyRequest) (*surveyor, error) {
	names := h.columns()
	most := min(max(mostCells/max(1, len(names)), fewestKept), mostDistinct)
	s := &surveyor{header: h, axes: want.Axes, survey: &Survey{Source: h.source, Features: h.shapes != nil}, x: -1, y: -1, rows: map[uint64]int{},
		sample: most, random: seeded(0)}
	if h.shapes == nil {
		s.survey.Separator = separatorWord(h.origin.separator)
	}
	for i, name := range names {
		s.columns = append(s.columns, newColumnSurvey(name, &h.origin.format, most, seeded(uint64(i)+1)))
	}
	return s, s.findPlaces(want)
}

// seeded is a source of random numbers that is the same at every run.
func seeded(stream uint64) *rand.Rand { return rand.New(rand.NewPCG(1, stream)) }

// findPlaces finds out what tells the places, as Read does or by the guess.
func (s *surveyor) findPlaces(want SurveyRequest) error {
	c, err := s.header.places(want.request())
	switch {
	case err == nil:
	case s.header.shapes != nil && want.X+want.Geometry != "":
		return err
	case s.header.shapes != nil:
		s.survey.Unrecognised = err
		c = coordinates{geometry: geometry.word(), crs: s.header.shapes.crs}
	default:
		if c = s.guess(want, err); c.x == "" || c.y == "" {
			return nil
		}
	}
	t := s.survey
	t.XName, t.YName, t.GeometryName, t.CRS, t.Degrees, t.Recognised, t.PassedOver = c.x, c.y, c.geometry, c.crs, c.degrees, c.recognised, c.passedOver
	switch {
	case s.header.shapes != nil:
		s.shapes = &shapeSurvey{}
		return nil
	case c.geometry != "":
		at, err := s.header.find(c.geometry, geometry.String())
		if err == nil {
			s.shapes = s.columns[at].expectShapes()
		}
		return err
	}
	if s.x, err = s.header.find(c.x, coordinateX.String()); err != nil {
		return err
	}
	s.y, err = s.header.find(c.y, coordinateY.String())
	return err
}

// guess asks for coordinate columns that Read does not find, for the given reason.
func (s *surveyor) guess(want SurveyRequest, reason error) coordinates {
	s.survey.Unrecognised = reason
	c := coordinates{degrees: want.Axes == AxesDegrees}
	if want.Guess != nil {
		c.x, c.y = want.Guess(s.header.names)
	}
	s.survey.Guessed = c.x != "" && c.y != ""
	return c
}

func (s *surveyor) readAll(from records) error {
	for {
		rec, err := from.next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return err
		}
		if rec.site == nil {
			if err := s.header.checkRecord(rec.fields, Error{File: s.header.source, Line: rec.line, Row: rec.row}); err != nil {
				return err
			}
		}
		s.survey.Rows++
		s.readRow(rec)
	}
	if s.survey.Rows == 0 {
		return s.header.noRows()
	}
	return nil
}

func (s *surveyor) readRow(rec record) {
	fields := rec.fields
	for _, c := range s.columns[len(fields):] { // those that no property fills
		fields = append(fields, map[string]string{idName: rec.site.id, heightName: heightText(rec.site.z)}[c.out.Name])
	}
	slot := s.slot(rec.row)
	for i, field := range fields {
		fields[i] = strings.TrimSpace(field)
		s.columns[i].take(fields[i], rec.line, rec.row, slot)
	}
	switch {
	case rec.site != nil:
		s.shapes.take(rec.site, rec.line, rec.row)
		fields = append(fields, rec.site.key())
	case s.x >= 0:
		s.places.take(s.columns[s.x].last, s.columns[s.y].last, rec.row)
	}
	s.compare(fields, rec.row)
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
	t.Places = s.places.out
	s.finishShapes()
	return t
}

// finishShapes tells where the rows are by their geometries: those known for that, or those of the one column that
// looks like it where nothing else is known.
func (s *surveyor) finishShapes() {
	t := s.survey
	if t.XName == "" && s.shapes == nil {
		for i, c := range t.Columns {
			switch {
			case c.Kind != Geometries:
			case s.shapes != nil: // two of them
				s.shapes, t.GeometryName, t.Guessed = nil, "", false
				return
			default:
				s.shapes, t.GeometryName, t.Guessed = s.columns[i].shapes, c.Name, true
			}
		}
	}
	if s.shapes == nil {
		return
	}
	t.Shapes, t.Places = s.shapes.finish(), s.shapes.places.out
	if !t.Features {
		t.CRS = t.Shapes.CRS
		t.Degrees = s.axes == AxesDegrees || s.axes == AxesByName && crs.IsGeographic(t.CRS)
	}
}

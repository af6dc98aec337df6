package inspect

import (
	"math"

	"drumlin/io/observe"
	"drumlin/io/plan"
)

// Level says whether a finding needs somebody's eye.
type Level string

// The levels of findings.
const (
	Clear Level = "clear"
	Look  Level = "look"
)

// Finding is one thing that was found out about the table.
type Finding struct {
	Level    Level    `json:"level"`
	Code     string   `json:"code"`    // one word for programs, such as "repeated-rows"
	Columns  []string `json:"columns"` // that it is about; may be empty
	Sentence string   `json:"sentence"`
}

// Report is all that is said about a table. Its JSON has always the same keys; what is not known is null or empty.
type Report struct {
	File        string       `json:"file"` // as it was named
	Rows        int          `json:"rows"`
	Features    bool         `json:"features"`  // it is GeoJSON, whose features are the rows and properties the columns
	Separator   string       `json:"separator"` // "comma", "semicolon", "tab" or a quoted character; empty for features
	Encoding    string       `json:"encoding"`
	Sampled     int          `json:"rows_compared"` // rows behind comparisons of columns: all, or some drawn at random
	Columns     []Column     `json:"columns"`
	Coordinates *Coordinates `json:"coordinates"` // null where there are none
	Geometry    *Geometry    `json:"geometry"`    // null where no geometries tell the places
	Findings    []Finding    `json:"findings"`
	Regions     []string     `json:"regions"`    // columns that could name the regions of a batch, the likeliest first
	Candidates  []Candidate  `json:"candidates"` // for the response, the likeliest first
	Proposal    *Proposal    `json:"proposal"`   // null where no map can be proposed
	Undecided   []string     `json:"undecided"`  // what the table does not tell

	said plan.Settings
}

// Column is a column in the report. Figures are null in a column without numbers.
type Column struct {
	Name       string   `json:"name"`
	Kind       string   `json:"kind"` // "whole numbers", "numbers", "truth values", "dates", "geometry", "text" or "empty"
	DateForm   string   `json:"date_form"`
	Values     int      `json:"values"`
	Missing    int      `json:"missing"`
	Distinct   int      `json:"distinct"`
	More       bool     `json:"more_than_distinct"` // there are more distinct values than were counted
	Unique     bool     `json:"unique"`
	Ascending  bool     `json:"ascending"`
	NotNumbers int      `json:"not_numbers"` // values that are no numbers
	Zeros      *float64 `json:"share_of_zeros"`
	Least      *float64 `json:"least"`
	Median     *float64 `json:"median"`
	Mean       *float64 `json:"mean"`
	Most       *float64 `json:"most"`
	Examples   []string `json:"examples"`
}

// Coordinates are the places of the table.
type Coordinates struct {
	X          string     `json:"x"` // column; x and y are empty where rows have geometries
	Y          string     `json:"y"`
	Found      string     `json:"found"`    // "by name", "guessed", "named" or "features"
	Taken      string     `json:"taken_as"` // "degrees" or "plane", as map would take them
	Likely     string     `json:"likely"`   // what they seem to be, in words
	Least      [2]float64 `json:"least"`    // x and y
	Most       [2]float64 `json:"most"`
	Places     int        `json:"places"`
	MorePlaces bool       `json:"more_than_places"`
	Without    int        `json:"rows_without"`
	Sharing    int        `json:"rows_sharing_a_place"`
	Spacing    *float64   `json:"median_spacing"` // metres, or the unit of the plane; null where it cannot be told
}

// Geometry is what the geometries of the rows are.
type Geometry struct {
	Column      string         `json:"column"` // empty for those of features
	Kinds       []GeometryKind `json:"kinds"`
	Positions   int            `json:"positions"`
	Heights     int            `json:"heights"` // points with a third coordinate
	Missing     int            `json:"missing"`
	Unreadable  int            `json:"unreadable"`
	FirstBadRow int            `json:"first_unreadable_row"` // from 1; 0 where there is none
	Reason      string         `json:"reason"`               // why it cannot be read
	CRS         string         `json:"crs"`                  // as the file or the first SRID says; empty where nothing does
}

// GeometryKind says how many rows have a geometry of one kind.
type GeometryKind struct {
	Kind string `json:"kind"` // as in GeoJSON, such as "MultiPolygon"
	Rows int    `json:"rows"`
}

// Candidate is a column that could be the response.
type Candidate struct {
	Response string   `json:"response"`
	Kind     string   `json:"kind"` // "positives", "count" or "measurement"
	Word     string   `json:"word"` // what its denominator is named with: trials, people, area, effort or expected; may be empty
	Column   string   `json:"column"`
	Reasons  []string `json:"reasons"`

	score  float64
	unsure bool // whether the denominator is trials or people is taken from the share alone
}

// Proposal is a map that could be asked for.
type Proposal struct {
	Command  string         `json:"command"`  // to paste into a shell
	Settings map[string]any `json:"settings"` // the words of the command, by key
	Choices  []string       `json:"choices"`  // what map would choose, and why
	Open     []string       `json:"open"`     // what has to be filled in first

	settings plan.Settings
}

// Examine makes the report. What was said about the table is in said: its path as Observations, and words that go into
// the proposal as they are, such as X, Y and CRS.
func Examine(s *observe.Survey, said plan.Settings) Report {
	e := &examiner{survey: s, said: said, role: map[string]role{}}
	e.report = Report{said: said, File: *said.Observations, Rows: s.Rows, Features: s.Features, Separator: s.Separator, Encoding: s.Encoding, Sampled: s.Sampled,
		Columns: describe(s), Findings: []Finding{}, Regions: []string{}, Candidates: []Candidate{}, Undecided: []string{}}
	e.places()
	e.repeated()
	e.columns()
	e.regions()
	e.candidates()
	e.rates()
	e.unusable()
	e.placesOnly()
	e.propose()
	return e.report
}

// examiner collects what is found.
type examiner struct {
	survey *observe.Survey
	said   plan.Settings
	role   map[string]role // of columns that are not what a map is of
	report Report

	located []string // columns that tell the places; none for features
	crs     string   // to say of the coordinates beside what was said; empty for nothing
	first   []string // what has to be put right before a map can be had
	swapped bool     // the axes are proposed the other way round
	commas  []string // columns that would be numbers with a decimal comma
	atZero  bool     // rows at 0, 0 were found
}

// role is what a column is, when it is no response.
type role string

const (
	coordinate role = "a coordinate"
	identifier role = "an identifier"
	constant   role = "constant"
	coded      role = "a code"
)

func (e *examiner) find(level Level, code, sentence string, columns ...string) {
	if columns == nil {
		columns = []string{}
	}
	e.report.Findings = append(e.report.Findings, Finding{level, code, columns, sentence})
}

func (e *examiner) undecided(sentence string) {
	e.report.Undecided = append(e.report.Undecided, sentence)
}

func describe(s *observe.Survey) []Column {
	var list []Column
	for i := range s.Columns {
		c := &s.Columns[i]
		d := Column{Name: c.Name, Kind: string(c.Kind), DateForm: string(c.Date), Values: c.Values, Missing: c.Missing, Distinct: c.Distinct,
			More: c.More, Unique: c.Unique, Ascending: c.Ascending, Least: figure(c.Least), Median: figure(c.Median),
			Mean: figure(c.Mean), Most: figure(c.Most), Examples: append([]string{}, c.Examples...)}
		if c.Numbers > 0 {
			d.NotNumbers = c.NotNumbers.Values
			d.Zeros = figure(float64(c.Zeros) / float64(c.Numbers))
		}
		list = append(list, d)
	}
	return list
}

// figure is a number, or nil for none.
func figure(v float64) *float64 {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return nil
	}
	return &v
}

// numeric reports whether a column is made of numbers, or would be but for some values.
func numeric(c *observe.SurveyColumn) bool { return c.Numbers > 0 && 2*c.Numbers >= c.Values }

// whole reports whether the numbers of a numeric column are whole and not negative, all but one in twenty, which may be
// mistakes.
func whole(c *observe.SurveyColumn) bool {
	return numeric(c) && 20*(c.Numbers-c.Whole+c.Negatives) <= c.Numbers
}

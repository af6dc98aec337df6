package observe

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
	"testing"
)

func survey(t *testing.T, text string, want SurveyRequest) *Survey {
	t.Helper()
	s, err := ReadSurvey(strings.NewReader(text), "obs.csv", want)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// column surveys one column, its values separated by |, beside one that numbers the rows.
func column(t *testing.T, values string) SurveyColumn {
	t.Helper()
	var b strings.Builder
	b.WriteString("nr,v\n")
	for i, v := range strings.Split(values, "|") {
		fmt.Fprintf(&b, "%d,%q\n", i+1, v)
	}
	return survey(t, b.String(), SurveyRequest{}).Columns[1]
}

func TestSurveyKinds(t *testing.T) {
	for _, tt := range []struct {
		name, values string
		kind         ColumnKind
		date         DateForm
	}{
		{"whole", "3|1|2e2|-4", WholeNumbers, ""},
		{"numbers", "3|1.5|NA", Numbers, ""},
		{"truth", "yes|No|", TruthValues, ""},
		{"letters", "T|F|f", TruthValues, ""},
		{"truth and more", "yes|no|perhaps", Text, ""},
		{"0 and 1", "0|1", WholeNumbers, ""},
		{"nothing", "|NA|null|nan", Empty, ""},
		{"ISO", "2024-02-29|2024-12-31T23:59:59Z|2024-01-01 08:15", Dates, DateISO},
		{"no such day", "2023-02-29", Text, ""},
		{"points", "1.2.2024|31.12.24", Dates, DatePoints},
		{"points with a month of 13", "1.13.2024", Text, ""},
		{"day first", "1/2/2024|13/2/2024", Dates, DateDayFirst},
		{"month first", "1/2/2024|2/13/2024", Dates, DateMonthFirst},
		{"either first", "1/2/2024|3/4/2024", Dates, DateEitherFirst},
		{"both", "13/2/2024|2/13/2024", Dates, DateEitherFirst},
		{"no date", "13/13/2024", Text, ""},
		{"two forms", "2024-01-01|1.2.2024", Text, ""},
		{"a year is a number", "2024|2025", WholeNumbers, ""},
		{"numbers and text", "1|2|x", Text, ""},
		{"infinite", "1|inf", Text, ""},
	} {
		t.Run(tt.name, func(t *testing.T) {
			c := column(t, tt.values)
			if c.Kind != tt.kind || c.Date != tt.date {
				t.Errorf("got %q %q, want %q %q", c.Kind, c.Date, tt.kind, tt.date)
			}
		})
	}
}

func TestSurveyNotNumbers(t *testing.T) {
	for _, tt := range []struct {
		name, values string
		want         NotNumbers
	}{
		{"limit", "0.7|<0.5|< 1", NotNumbers{Values: 2, Line: 3, Row: 2, Value: "<0.5", Limits: 2}},
		{"decimal comma", "3,7|-0,25|12", NotNumbers{Values: 2, Line: 2, Row: 1, Value: "3,7", DecimalCommas: 2}},
		{"a small decimal", "0,125", NotNumbers{Values: 1, Line: 2, Row: 1, Value: "0,125", DecimalCommas: 1}},
		{"thousands", "12,500|1 250 000|3'000.5|999", NotNumbers{Values: 3, Line: 2, Row: 1, Value: "12,500", Grouped: 3}},
		{"neither", "1,2,3|12 m|4 5", NotNumbers{Values: 3, Line: 2, Row: 1, Value: "1,2,3"}},
		{"infinite", "1|-Inf|1e999", NotNumbers{Values: 2, Line: 3, Row: 2, Value: "-Inf", Infinite: 2}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if got := column(t, tt.values).NotNumbers; got != tt.want {
				t.Errorf("got %+v, want %+v", got, tt.want)
			}
		})
	}
}

// TestSurveyFigures: quantiles by hand, definition 7 of Hyndman & Fan.
func TestSurveyFigures(t *testing.T) {
	c := column(t, "4|0|NA|1.0|1|-2|x")
	if c.Values != 6 || c.Missing != 1 || c.Distinct != 5 || c.Numbers != 5 || c.Whole != 5 || c.Zeros != 1 || c.Negatives != 1 {
		t.Errorf("counts are %+v", c)
	}
	if c.Least != -2 || c.Most != 4 || c.Median != 1 || math.Abs(c.Mean-0.8) > 1e-15 || math.Abs(c.Low+1.6) > 1e-12 || math.Abs(c.High-3.4) > 1e-12 {
		t.Errorf("figures are %v %v %v %v %v %v", c.Least, c.Low, c.Median, c.High, c.Most, c.Mean)
	}
	if !slices.Equal(c.Examples, []string{"4", "0", "1.0"}) || !slices.Equal(c.LevelRows, []int{1, 1, 2, 1, 1}) {
		t.Errorf("examples %q, levels %q %v", c.Examples, c.Levels, c.LevelRows)
	}
	if c.Unique || c.Ascending {
		t.Error("unique or ascending")
	}
	if none := column(t, "a|b"); !none.Unique || none.Ascending || !math.IsNaN(none.Least) || !math.IsNaN(none.Median) || !math.IsNaN(none.Mean) {
		t.Errorf("of text: %+v", none)
	}
	for values, want := range map[string]bool{"1|2|3.5": true, "1|1|2": false, "1|NA|2": true, "2|1": false, "1|2|x": false, "1": false} {
		if column(t, values).Ascending != want {
			t.Errorf("%s: ascending is not %v", values, want)
		}
	}
}

// TestSurveyLongTable: what is kept of a long table is bounded, and what is counted is exact.
func TestSurveyLongTable(t *testing.T) {
	const rows = 30_000
	random := rand.New(rand.NewPCG(3, 4))
	var b strings.Builder
	b.WriteString("nr,x,y,twice,name\n")
	sum := 0.0
	for i := range rows {
		v := random.Float64()
		sum += v
		fmt.Fprintf(&b, "%d,%g,%d,%g,village %d\n", i, v, i%100, 2*v, i%250)
	}
	s := survey(t, b.String(), SurveyRequest{})
	if s.Rows != rows || s.Sampled != mostDistinct || len(s.Places.Rows) != rows || s.Repeated.Rows != 0 {
		t.Errorf("%d rows, %d sampled, %d places, %d repeated", s.Rows, s.Sampled, len(s.Places.Rows), s.Repeated.Rows)
	}
	nr, x, name := s.Column("nr"), s.Column("x"), s.Column("name")
	if !nr.More || nr.Distinct != mostDistinct || !nr.Unique || !nr.Ascending || nr.Levels != nil || nr.Most != rows-1 {
		t.Errorf("nr is %v %d %v %v", nr.More, nr.Distinct, nr.Unique, nr.Ascending)
	}
	if x.Unique || math.Abs(x.Mean-sum/rows) > 1e-12 {
		t.Errorf("x: unique %v, mean %v and not %v", x.Unique, x.Mean, sum/rows)
	}
	// The standard error of the median of 10 000 of U(0, 1) is 0.005; five of them.
	if math.Abs(x.Median-0.5) > 0.025 || math.Abs(x.Low-0.05) > 0.012 {
		t.Errorf("x: median %v, low %v", x.Median, x.Low)
	}
	if name.More || name.Distinct != 250 || slices.Max(name.LevelRows) != rows/250 {
		t.Errorf("name: %d levels", name.Distinct)
	}
	late := 0
	for i := range s.Sampled {
		row := int(nr.Number[i])
		if s.Column("twice").Number[i] != 2*x.Number[i] || name.Levels[name.Code[i]] != "village "+strconv.Itoa(row%250) {
			t.Fatalf("the sampled row %d is not one row", i)
		}
		if row >= 20_000 {
			late++
		}
	}
	// A third of the sample, of standard error 47 (binomial).
	if math.Abs(float64(late)-10_000.0/3) > 250 {
		t.Errorf("%d of the sample are of the last third", late)
	}
	again := survey(t, b.String(), SurveyRequest{})
	if !slices.Equal(again.Column("x").Number, x.Number) || again.Column("x").Median != x.Median {
		t.Error("another survey of the same table differs")
	}
}

// TestSurveyWideTable: many columns share what can be kept.
func TestSurveyWideTable(t *testing.T) {
	for columns, want := range map[int]int{3: mostDistinct, 1000: mostCells / 1000, 100_000: fewestKept} {
		s, err := newSurveyor(header{names: make([]string, columns), origin: &origin{}}, SurveyRequest{})
		if err != nil || s.sample != want || s.columns[columns-1].most != want {
			t.Errorf("%d columns: %d rows are kept, not %d; %v", columns, s.sample, want, err)
		}
	}
	c := newColumnSurvey("v", &Format{}, 2, seeded(1))
	for i, v := range []string{"5", "6", "5", "7", "6"} {
		c.take(v, i+2, i+1, min(i, 3))
	}
	if out := c.finish(); !out.More || out.Distinct != 2 || out.Levels != nil || out.Mean != 5.8 || len(out.Number) != 4 || !slices.Equal(out.Code, []int32{-1, -1, -1, -1}) {
		t.Errorf("got %+v", out)
	}
}

func TestSurveyPlaces(t *testing.T) {
	s := survey(t, "x,y,v\n1,2,a\n0,-0,b\n1,2,c\n,3,d\n-0,0,b\n1,two,d\n", SurveyRequest{})
	p := s.Places
	if !slices.Equal(p.X, []float64{1, 0}) || !slices.Equal(p.Y, []float64{2, 0}) || !slices.Equal(p.Rows, []int{2, 2}) || p.Without != 2 || p.Row != 4 {
		t.Errorf("places are %+v", p)
	}
	if s.XName != "x" || !s.Recognised || s.Degrees || s.Unrecognised != nil {
		t.Errorf("coordinates are %q %v %v", s.XName, s.Recognised, s.Degrees)
	}
}

func TestSurveyCoordinates(t *testing.T) {
	guess := func(names []string) (string, string) { return names[0], names[1] }
	for _, tt := range []struct {
		name, header string
		want         SurveyRequest
		x, y         string
		degrees      bool
		guessed      bool
		unrecognised string
	}{
		{"by name", "LON,LAT,x,y", SurveyRequest{}, "LON", "LAT", true, false, ""},
		{"named", "a,b,x,y", SurveyRequest{X: "a", Y: "b", Axes: AxesDegrees}, "a", "b", true, false, ""},
		{"none", "a,b", SurveyRequest{}, "", "", false, false, "no coordinate columns are recognised"},
		{"guessed", "a,b", SurveyRequest{Guess: guess}, "a", "b", false, true, "no coordinate columns are recognised"},
		{"nothing guessed", "a,b", SurveyRequest{Guess: func([]string) (string, string) { return "", "" }}, "", "", false, false, "no coordinate columns are recognised"},
		{"two pairs", "x,y,easting,northing", SurveyRequest{}, "", "", false, false, "could both be the coordinates"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			s := survey(t, tt.header+"\n"+strings.Repeat("1,", strings.Count(tt.header, ","))+"1\n", tt.want)
			if s.XName != tt.x || s.YName != tt.y || s.Degrees != tt.degrees || s.Guessed != tt.guessed {
				t.Errorf("got %q %q %v %v", s.XName, s.YName, s.Degrees, s.Guessed)
			}
			if tt.unrecognised == "" != (s.Unrecognised == nil) || s.Unrecognised != nil && !strings.Contains(s.Unrecognised.Error(), tt.unrecognised) {
				t.Errorf("unrecognised: %v", s.Unrecognised)
			}
		})
	}
}

func TestSurveyRepeatedRows(t *testing.T) {
	s := survey(t, "a,b\n1,23\n12,3\n 1 , 23\n1,23\n", SurveyRequest{})
	if s.Repeated != (RepeatedRows{Rows: 2, Row: 3, Original: 1}) {
		t.Errorf("got %+v", s.Repeated)
	}
}

func TestSurveyRefusals(t *testing.T) {
	for _, tt := range []struct{ name, text, want string }{
		{"empty", "", "obs.csv: the file is empty"},
		{"no rows", "a,b\n", "obs.csv: line 1: no rows stand below the header"},
		{"ragged", "a,b\n1,2\n1\n", "obs.csv: row 2 (line 3): 1 field where the header has 2"},
		{"twice", "a,a\n1,2\n", `obs.csv: line 1, column "a": the name appears twice, as columns 1 and 2`},
		{"quote", "a,b\n1,\"2\n", "obs.csv: line 2: a quoted field is not closed properly"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			_, err := ReadSurvey(strings.NewReader(tt.text), "obs.csv", SurveyRequest{})
			if err == nil || !strings.HasPrefix(err.Error(), tt.want) {
				t.Errorf("got %v, want %s", err, tt.want)
			}
		})
	}
	if _, err := ReadSurvey(strings.NewReader("a,b\n1,2\n"), "obs.csv", SurveyRequest{X: "a", Y: "c"}); err == nil || !strings.Contains(err.Error(), `no column "c"`) {
		t.Errorf("got %v for a column that is absent", err)
	}
}

// FuzzReadSurvey: a survey takes what Whole takes, and its figures hang together.
func FuzzReadSurvey(f *testing.F) {
	for _, text := range []string{"x,y,v\n1,2,3\n", "a,b\n\"1,5\",2024-01-01\n<3,1/2/2024\n", "a\n12,5\n", "lon,lat\n1e308,inf\n,\n"} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		s, err := ReadSurvey(strings.NewReader(text), "f", SurveyRequest{})
		if _, other := Whole(strings.NewReader(text), "f"); (err == nil) != (other == nil) {
			t.Fatalf("a survey ends in %v, and a reading in %v", err, other)
		}
		if err != nil {
			return
		}
		for _, c := range s.Columns {
			rows := 0
			for _, n := range c.LevelRows {
				rows += n
			}
			if c.Values+c.Missing != s.Rows || c.Numbers+c.NotNumbers.Values != c.Values || !c.More && rows != c.Values || len(c.Number) != s.Sampled {
				t.Fatalf("%q does not add up: %+v", text, c)
			}
			if c.Numbers > 0 && !(c.Least <= c.Low && c.Low <= c.Median && c.Median <= c.High && c.High <= c.Most) {
				t.Fatalf("%q: quantiles %v %v %v %v %v", text, c.Least, c.Low, c.Median, c.High, c.Most)
			}
		}
	})
}

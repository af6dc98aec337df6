package observe

import (
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
)

var measure = Request{Response: "z", Kind: Measure}

func read(text string, want Request) (*Table, error) {
	return Read(strings.NewReader(text), "wells.csv", want)
}

func hint(err error) string {
	var h interface{ Hint() string }
	if errors.As(err, &h) {
		return h.Hint()
	}
	return "no hint"
}

// Each refusal is pinned word for word, since these sentences are all the user gets. No source: the contract is ours.
const (
	adviceNames = `put a line with the names of the columns above the rows`
	adviceTitle = `take out the lines above the names of the columns`
	advicePairs = `name the coordinate columns with --x and --y, or a column of geometries with --geometry, or a file of places with --places; ` +
		`known by their names are longitude/latitude, lon/lat, easting/northing and x/y; the columns are `
)

func TestReadCSVRefusals(t *testing.T) {
	degrees := Request{Response: "z", Kind: Measure, Axes: AxesDegrees}
	plane := Request{Response: "z", Kind: Measure, Axes: AxesPlane}
	strict := func(q Request) Request { q.Strict = true; return q }
	wide := "x,y"
	for i := range 100 {
		wide += fmt.Sprintf(",band_%03d", i)
	}
	wide21 := strings.Split(wide, ",")[:21]
	const columnsXY = "the columns are x, y, z"
	tests := []struct {
		name, text string
		want       Request
		err, hint  string
	}{
		{"no bytes", "", measure, `wells.csv: the file is empty`, adviceWhole},
		{"blank lines only", "\n\r\n\n", measure, `wells.csv: the file holds only blank lines`, adviceWhole},
		{"mark only", "\xef\xbb\xbf", measure, `wells.csv: the file is empty`, adviceWhole},
		{"header only", "x,y,z\n", measure, `wells.csv: line 1: no rows stand below the header`, adviceWhole},
		{"header without line end", "x,y,z", measure, `wells.csv: line 1: no rows stand below the header`, adviceWhole},
		{"nul at the start", "x,y,z\n1,2,\x003\n", measure, `wells.csv: the file holds NUL bytes, so it is not text`, adviceText},
		{"nul far down", "x,y,z\n" + strings.Repeat("1,2,3\n", 20000) + "1,2,\x00\n", measure,
			`wells.csv: row 20001 (line 20002), column "z": "\x00" is not UTF-8 text`, adviceText},
		{"spreadsheet", "PK\x03\x04\x14\x00", measure, `wells.csv: the file is a spreadsheet or a zip archive, not a CSV table`, adviceUnzip},
		{"decimal commas", "x;y;z\n1,5;2,5;3\n", measure, `wells.csv: row 1 (line 2), column "x": "1,5" has a decimal comma, like most values of the column`,
			`say so with --decimal-comma`},
		{"old line ends", "x,y,z\r1,2,3\r", measure, `wells.csv: the lines end in carriage returns alone, which are not read`,
			`save the table with a line feed at the end of each line, alone or behind the carriage return`},
		{"no header", "1,2,3\n4,5,6\n", measure, `wells.csv: line 1: numbers stand where the names of the columns should be, so the line of names is missing`, adviceNames},
		{"no header, a value twice", "0,0,1.5\n4,5,6\n", measure, `wells.csv: line 1: numbers stand where the names of the columns should be, so the line of names is missing`, adviceNames},
		{"no header, a unit", "\n0;1,5;3 mg\n4;5;6 mg\n", measure, `wells.csv: line 2: numbers stand where the names of the columns should be, so the line of names is missing`, adviceNames},
		{"names with numbers in them", "x,y,pm10\n1,2,3\n", measure, `wells.csv: line 1: no column "z" for the response`, `did you mean "x"? the columns are x, y, pm10`},
		{"blanks only", "\n  \n\t\n,,\n\x1a", measure, `wells.csv: the file holds only blank lines`, adviceWhole},
		{"a separator and nothing else", "sep=;\n\n", measure, `wells.csv: nothing stands below the line that names the separator`, adviceWhole},

		{"title", "Survey of the moor\n\nx,y,z\n1,2,3\n", measure, `wells.csv: line 1: it looks like a title, and the names of the columns seem to stand on line 3`, adviceTitle},
		{"title and blank cells", "\nSurvey; 2031,,\nx,y,z\n1,2,3\n", measure, `wells.csv: line 2: it looks like a title, and the names of the columns seem to stand on line 3`, adviceTitle},
		{"title above semicolons", "Survey of the moor\nx;y;z\n1;2;3\n", measure, `wells.csv: line 1: it looks like a title, and the names of the columns seem to stand on line 2`, adviceTitle},
		{"comment", "# zinc, in mg/kg\n# by hand\nx,y,z\n1,2,3\n", measure, `wells.csv: line 1: it looks like a title, and the names of the columns seem to stand on line 3`, adviceTitle},
		{"title below the separator", "sep=;\nSurvey of the moor\nx;y;z\n1;2;3\n", measure, `wells.csv: line 2: it looks like a title, and the names of the columns seem to stand on line 3`, adviceTitle},
		{"no title above numbers", "zinc\n1,2,3\n", measure, `wells.csv: line 1: no coordinate columns are recognised`, advicePairs + `zinc`},

		{"columns of fixed width", "   x    y    z\n   1    2    3\n", Request{Response: "z", Kind: Measure, NoPlaces: true}, `wells.csv: line 1: no column "z" for the response`,
			`the header has no comma: columns of fixed width are not read, so put commas between them`},
		{"a line of semicolons", "x,y,z\n1,2,3\n1;2;3\n", measure, `wells.csv: row 2 (line 3): 1 field where the header has 3`,
			`the line has a semicolon where the others have a comma: separate all columns in one way`},
		{"bytes behind the end", "x,y,z\n1,2,3\n\xf0\x81\x8d\n", measure, `wells.csv: row 2 (line 3): 1 field where the header has 3`,
			`bytes that are no text stand on the line: the file may be damaged from there on, or something else is appended to it`},

		{"absent, near", "x,y,zinc\n1,2,3\n", Request{Response: "zink", Kind: Measure},
			`wells.csv: line 1: no column "zink" for the response`, `did you mean "zinc"? the columns are x, y, zinc`},
		{"absent, capitals", "x,y,Zinc (mg)\n1,2,3\n", Request{Response: "zinc (mg)", Kind: Measure},
			`wells.csv: line 1: no column "zinc (mg)" for the response`, `did you mean "Zinc (mg)"? the columns are x, y, "Zinc (mg)"`},
		{"absent, letters swapped", "x,y,z\n1,2,3\n", Request{Response: "z", Kind: Measure, X: "x", Y: "y", Linear: []string{"dpeth"}},
			`wells.csv: line 1: no column "dpeth" for a linear covariate`, columnsXY},
		{"absent, blank line above", "\nx,y,z,depth\n1,2,3,4\n", Request{Response: "z", Kind: Measure, Linear: []string{"dpeth"}},
			`wells.csv: line 2: no column "dpeth" for a linear covariate`, `did you mean "depth"? ` + columnsXY + ", depth"},
		{"absent, nothing near", "x,y,z\n1,2,3\n", Request{Response: "cadmium", Kind: Measure},
			`wells.csv: line 1: no column "cadmium" for the response`, columnsXY},
		{"absent, many columns", wide + "\n", Request{Response: "cadmium", Kind: Measure},
			`wells.csv: line 1: no column "cadmium" for the response`, `the columns are ` + strings.Join(wide21, ", ") + ` and 81 more`},
		{"absent coordinate", "x,y,z\n1,2,3\n", Request{Response: "z", Kind: Measure, X: "xx", Y: "y"},
			`wells.csv: line 1: no column "xx" for the x coordinate`, `did you mean "x"? ` + columnsXY},
		{"two of a name", "x,y,z,x\n1,2,3,4\n", measure, `wells.csv: line 1, column "x": the name appears twice, as columns 1 and 4`,
			`give each column a name of its own`},
		{"two of a name after blanks", "x,y,z, z\n1,2,3,4\n", measure, `wells.csv: line 1, column "z": the name appears twice, as columns 3 and 4`,
			`give each column a name of its own`},

		{"two of a long name", "x,y," + strings.Repeat("n", 70) + "," + strings.Repeat("n", 70) + "\n1,2,3,4\n", measure,
			`wells.csv: line 1, column "` + strings.Repeat("n", 60) + `...": the name appears twice, as columns 3 and 4`, `give each column a name of its own`},

		{"short row", "x,y,z\n1,2,3\n\n4,5\n", measure, `wells.csv: row 2 (line 4): 2 fields where the header has 3`,
			`check the line for a missing comma, or for one that belongs inside quotes`},
		{"long row", "x,y,z\n1,2,1,234\n", measure, `wells.csv: row 1 (line 2): 4 fields where the header has 3`,
			`check the line for a missing comma, or for one that belongs inside quotes`},
		{"stray quote", "x,y,z\n1,2,3\"\n", measure, `wells.csv: line 2: a " at character 6 stands inside a field that is not quoted`, adviceQuote},
		{"text after a quote", "x,y,z\n1,2,\"3\"4\n", measure, `wells.csv: line 2: a quoted field is not closed properly at character 7`, adviceQuote},
		{"open quote", "x,y,z\n1,2,3\n1,\"2,3\n4,5,6\n", measure, `wells.csv: line 3: a quoted field is not closed properly by line 4`, adviceQuote},
		{"endless quote", "x,y,z\n1,2,\"" + strings.Repeat("1,2,3\n", maxRecord/6), measure,
			`wells.csv: line 2: a quoted field is not closed within 8388608 bytes`, adviceQuote + `, and give outlines as long as that in GeoJSON`},
		{"endless line", "x,y,z\n1,2," + strings.Repeat("3", maxRecord), measure,
			`wells.csv: line 2: the line is longer than 8388608 bytes, the most that is read`, adviceWhole},

		{"too many columns", "x,y,z\n1,2,3" + strings.Repeat(",", maxColumns-2), measure,
			`wells.csv: line 2: the line has more than 65536 columns, the most that is read`, adviceWhole},
		{"as many columns as there may be", "x,y,z\n1,2,3" + strings.Repeat(",", maxColumns-3), measure,
			`wells.csv: row 1 (line 2): 65536 fields where the header has 3`, `check the line for a missing comma, or for one that belongs inside quotes`},
		{"no coordinates", "a,lon,z\n1,2,3\n", measure, `wells.csv: line 1: no coordinate columns are recognised`,
			advicePairs + `a, lon, z`},
		{"names of two pairs", "lon,latitude,z\n1,2,3\n", measure, `wells.csv: line 1: no coordinate columns are recognised`,
			advicePairs + `lon, latitude, z`},
		{"response called y", "x,y\n1,2\n", Request{Response: "y", Kind: Measure}, `wells.csv: line 1: no coordinate columns are recognised: "y" is named as the response`, advicePairs + `x, y`},
		{"trials called Lat", "lon,Lat,z\n1,2,3\n", Request{Response: "z", Kind: Positives, Trials: "Lat"},
			`wells.csv: line 1: no coordinate columns are recognised: "Lat" is named as the number of trials`, advicePairs + `lon, Lat, z`},
		{"a column of geometries", "z,shape\n1,\n1,POINT (1 2)\n", measure, `wells.csv: line 1: no coordinate columns are recognised`, `name the column of geometries with --geometry shape`},
		{"a column of words in brackets", "z,note\n1,Village (old)\n", measure, `wells.csv: line 1: no coordinate columns are recognised`, advicePairs + `z, note`},
		{"two pairs in degrees", "lon,lat,Longitude,Latitude,z\n1,2,3,4,5\n", measure,
			`wells.csv: line 1: columns Longitude/Latitude and lon/lat could both be the coordinates`, adviceXY},
		{"two pairs in a plane", "x,y,easting,northing,z\n1,2,3,4,5\n", measure,
			`wells.csv: line 1: columns easting/northing and x/y could both be the coordinates`, adviceXY},
		{"one name in two spellings", "X,x,y,z\n1,2,3,4\n", measure, `wells.csv: line 1: columns "X" and "x" could both be a coordinate`, adviceXY},
		{"degrees where a plane is said", "lon,lat,z\n1,2,3\n", plane,
			`wells.csv: line 1: columns lon/lat are longitude and latitude by their names, but the coordinates are said to be in a plane`, adviceDegrees},
		{"plane where degrees are said", "easting,northing,z\n1,2,3\n", degrees,
			`wells.csv: line 1: columns easting/northing are in a plane by their names, but the coordinates are said to be longitude and latitude`, adviceDegrees},
		{"latitude", "lon,lat,z\n5.1,97.3,3\n", measure, `wells.csv: row 1 (line 2), column "lat": 97.3 is not a latitude (-90 to 90)`, adviceDegrees},
		{"latitude in an unusable row", "lon,lat,z\n5,50,3\n5,50,4\n50,-90.001,NA\n", measure,
			`wells.csv: row 3 (line 4), column "lat": -90.001 is not a latitude (-90 to 90)`, adviceDegrees},
		{"latitude of x and y", "x,y,z\n5,333611,3\n", degrees, `wells.csv: row 1 (line 2), column "y": 333611 is not a latitude (-90 to 90)`, adviceDegrees},

		{"strict", "x,y,z\n1,2,3\n1,2,NA\n", strict(measure), `wells.csv: row 2 (line 3), column "z": response is missing: "NA"`,
			`correct the row, or leave out --strict to set such rows aside`},
		{"strict, empty", "x,y,z\n1,2,3\n1,2,\n", strict(measure), `wells.csv: row 2 (line 3), column "z": response is missing`,
			`correct the row, or leave out --strict to set such rows aside`},
		{"mostly unusable", "x,y,z,d\n1,2,,1\n1,2,3,1\n1,2,oak,\n1,2,NA,\n1,2,4,4\n", Request{Response: "z", Kind: Measure, Linear: []string{"d"}},
			`wells.csv: 3 of 5 rows cannot be used, more than half: column "z", response is missing (2); column "z", response is not a number (1); ` +
				`for example row 1 (line 2), where response is missing`,
			`check that the right column is named, or take the rows without a value out of the file`},
		{"four reasons", "x,y,z\n,2,3\n1,,3\n1,2,\n1,2,-\n", measure,
			`wells.csv: 4 of 4 rows cannot be used, more than half: column "x", coordinate is missing (1); column "y", coordinate is missing (1); ` +
				`column "z", response is missing (1); 1 more reasons; for example row 1 (line 2), where coordinate is missing`,
			`check that the right column is named, or take the rows without a value out of the file`},

		{"kind without response", "", Request{Kind: Count}, `wells.csv: no column is named for the response`, `name it with --response`},
		{"response without kind", "", Request{Response: "z"}, `wells.csv: column "z": a response is named, but places have none`, ``},
		{"positives without trials", "", Request{Response: "z", Kind: Positives},
			`wells.csv: column "z": a number positive needs a number of trials`, `name the column of the number examined with --trials`},
		{"trials without positives", "", Request{Response: "z", Kind: Count, Trials: "n"},
			`wells.csv: column "n": trials are named, but the response is not a number positive`, ``},
		{"trials and denominator", "", Request{Response: "z", Kind: Positives, Trials: "n", Denominator: "people"},
			`wells.csv: column "people": a number positive has trials and takes no other denominator`, ``},
		{"half the coordinates", "", Request{Response: "z", Kind: Measure, X: "e"},
			`wells.csv: column "e": one coordinate column is named without the other`, adviceXY},
		{"response as x", "", Request{Response: "z", Kind: Measure, X: "z", Y: "y"}, `wells.csv: column "z": cannot be both the response and the x coordinate`, ``},
		{"x as y", "", Request{Response: "z", Kind: Measure, X: "x", Y: "x"}, `wells.csv: column "x": cannot be both the x coordinate and the y coordinate`, ``},
		{"denominator as response", "", Request{Response: "z", Kind: Count, Denominator: "z"}, `wells.csv: column "z": cannot be both the response and the denominator`, ``},
		{"weight as response", "", Request{Response: "z", Kind: Measure, Weight: "z"}, `wells.csv: column "z": cannot be both the response and the weight`, ``},
		{"response as covariate", "", Request{Response: "z", Kind: Measure, Linear: []string{"z"}}, `wells.csv: column "z": cannot be both the response and a linear covariate`, ``},
		{"linear and category", "", Request{Response: "z", Kind: Measure, Linear: []string{"d"}, Category: []string{"d"}},
			`wells.csv: column "d": cannot be both a linear covariate and a category`, ``},
		{"covariate twice", "", Request{Response: "z", Kind: Measure, Category: []string{"d", "d"}}, `wells.csv: column "d": named twice as a category`, ``},
		{"text without name", "x,,y\n1,2,3\n", Request{Keep: []string{""}}, `wells.csv: an empty name is given for text to keep`, ``},
		{"covariate without name", "", Request{Response: "z", Kind: Measure, Linear: []string{""}}, `wells.csv: an empty name is given for a linear covariate`, ``},
	}
	seen := map[string]bool{}
	for _, test := range tests {
		if seen[test.name] {
			t.Fatalf("two tests are called %q", test.name)
		}
		seen[test.name] = true
		t.Run(test.name, func(t *testing.T) {
			table, err := read(test.text, test.want)
			if table != nil || err == nil {
				t.Fatalf("got table %v, error %v; want an error alone", table, err)
			}
			if diff := cmp.Diff(test.err, err.Error()); diff != "" {
				t.Errorf("message (-want +got):\n%s", diff)
			}
			if diff := cmp.Diff(test.hint, hint(err)); diff != "" {
				t.Errorf("hint (-want +got):\n%s", diff)
			}
			checkParts(t, test.text, test.want, err)
		})
	}
}

// A row fails at the first check in the order that Request states; one good row keeps it below half.
func TestReadCSVSetsAside(t *testing.T) {
	count := Request{Response: "n", Kind: Count, Denominator: "area", Weight: "w", Linear: []string{"d"}, Category: []string{"soil"}}
	positives := Request{Response: "n", Kind: Positives, Trials: "of"}
	const countHeader, countRow = "x,y,n,area,w,d,soil\n", "1,2,3,4,5,6,clay\n"
	const posHeader, posRow = "lon,lat,n,of\n", "1,2,3,4\n"
	tests := []struct {
		name, header, good, row string
		want                    Request
		column, value           string
		code, reason            string
	}{
		{"empty response", countHeader, countRow, ",,,,,0,", count, "n", "", "missing-response", "response is missing"},
		{"blank response", countHeader, countRow, "1,2, \t,4,5,6,clay", count, "n", "", "missing-response", "response is missing"},
		{"NaN response", countHeader, countRow, "1,2,NaN,4,5,6,clay", count, "n", "NaN", "missing-response", "response is missing"},
		{"null response", countHeader, countRow, "1,2,NULL,4,5,6,clay", count, "n", "NULL", "missing-response", "response is missing"},
		{"words", countHeader, countRow, "1,2,none,4,5,6,clay", count, "n", "none", "not-a-number", "response is not a number"},
		{"decimal comma", countHeader, countRow, `1,2,3,"4,5",5,6,clay`, count, "area", "4,5", "not-a-number", "denominator is not a number"},
		{"hexadecimal", countHeader, countRow, "1,2,0x1p4,4,5,6,clay", count, "n", "0x1p4", "not-a-number", "response is not a number"},
		{"underscore", countHeader, countRow, "1,2,1_000,4,5,6,clay", count, "n", "1_000", "not-a-number", "response is not a number"},
		{"infinite", countHeader, countRow, "1,2,-Inf,4,5,6,clay", count, "n", "-Inf", "not-finite", "response is not finite"},
		{"too large", countHeader, countRow, "1,2,1e999,4,5,6,clay", count, "n", "1e999", "not-finite", "response is not finite"},
		{"negative", countHeader, countRow, "1,2,-0.5,4,5,6,clay", count, "n", "-0.5", "negative-count", "response is negative"},
		{"fraction", countHeader, countRow, "1,2,2.5,4,5,6,clay", count, "n", "2.5", "fractional-count", "response is not a whole number"},
		{"denominator 0", countHeader, countRow, "1,2,3,0,5,6,clay", count, "area", "0", "denominator-not-positive", "denominator is not above 0"},
		{"denominator missing", countHeader, countRow, "1,2,3,NA,0,6,clay", count, "area", "NA", "missing-denominator", "denominator is missing"},
		{"weight 0", countHeader, countRow, "na,2,3,4,0,6,clay", count, "w", "0", "weight-not-positive", "weight is not above 0"},
		{"x missing", countHeader, countRow, "na,oak,3,4,5,6,clay", count, "x", "na", "missing-coordinate", "coordinate is missing"},
		{"y in words", countHeader, countRow, "1,oak,3,4,5,,clay", count, "y", "oak", "not-a-number", "coordinate is not a number"},
		{"y infinite", countHeader, countRow, "1,inf,3,4,5,,clay", count, "y", "inf", "not-finite", "coordinate is not finite"},
		{"y absurd", countHeader, countRow, "1,-9.9e20,3,4,5,,clay", count, "y", "-9.9e20", "coordinates-out-of-range", "coordinate is beyond -1e9 to 1e9 metres"},
		{"covariate missing", countHeader, countRow, "1,2,3,4,5,,", count, "d", "", "missing-covariate", "covariate is missing"},
		{"covariate in words", countHeader, countRow, "1,2,3,4,5,deep,", count, "d", "deep", "not-a-number", "covariate is not a number"},
		{"category missing", countHeader, countRow, "1,2,3,4,5,6,Na", count, "soil", "Na", "missing-covariate", "covariate is missing"},
		{"trials 0", posHeader, posRow, "1,2,0,0", positives, "of", "0", "trials-not-positive", "number of trials is not above 0"},
		{"trials fraction", posHeader, posRow, "1,2,0,1.5", positives, "of", "1.5", "fractional-trials", "number of trials is not a whole number"},
		{"trials missing", posHeader, posRow, "1,2,0,", positives, "of", "", "missing-trials", "number of trials is missing"},
		{"above trials", posHeader, posRow, "400,2, 5,4", positives, "n", "5", "positives-above-trials", "response is above the number of trials"},
		{"longitude", posHeader, posRow, "360.01,2,3,4", positives, "lon", "360.01", "coordinates-out-of-range", "longitude is beyond -360 to 360"},
		{"latitude missing", posHeader, posRow, "3,,3,4", positives, "lat", "", "missing-coordinate", "coordinate is missing"},
		{"long value", posHeader, posRow, strings.Repeat("é", 61) + ",1,3,4", positives, "lon", strings.Repeat("é", 60) + "...", "not-a-number", "coordinate is not a number"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			text := test.header + test.good + test.row + "\n"
			table, err := read(text, test.want)
			if err != nil {
				t.Fatal(err)
			}
			want := []Aside{{Line: 3, Row: 2, Column: test.column, Value: test.value, Code: test.code, Reason: test.reason}}
			if diff := cmp.Diff(want, table.Aside); diff != "" {
				t.Errorf("set aside (-want +got):\n%s", diff)
			}
			if table.Len() != 1 || table.Rows != 2 {
				t.Errorf("kept %d of %d rows, want 1 of 2", table.Len(), table.Rows)
			}
			test.want.Strict = true
			wantErr := fmt.Sprintf("wells.csv: row 2 (line 3), column %q: %s", test.column, test.reason)
			if test.value != "" {
				wantErr += fmt.Sprintf(": %q", test.value)
			}
			if _, err := read(text, test.want); err == nil || err.Error() != wantErr {
				t.Errorf("strict: got %v, want %s", err, wantErr)
			}
		})
	}
}

func TestReadCSVTable(t *testing.T) {
	text := "\xef\xbb\xbf\"id\", y ,x,n,,soil,area\r\n" +
		"a,2.50,1,3,,loam,.5\r\n" +
		"\r\n" +
		"\"b\nb\",-4e1,+3,0,,\" clay \",2\r\n" +
		"c,6,5,NA,,peat,1\r\n" +
		",8, \"7 \",1e2,,loam,1.\r\n"
	table, err := read(text, Request{Response: "n", Kind: Count, Denominator: "area", Linear: []string{"area", "y"}, Category: []string{"soil"}, Keep: []string{"id", "n"}})
	if err != nil {
		t.Fatal(err)
	}
	want := &Table{
		Source: "wells.csv", Line: []int32{2, 4, 7}, Row: []int32{1, 2, 4}, Rows: 4,
		Columns: []Column{
			{Name: "n", Number: []float64{3, 0, 100}, Code: []int32{2, 0, 1}, Level: []string{"0", "1e2", "3"}},
			{Name: "area", Number: []float64{0.5, 2, 1}},
			{Name: "y", Number: []float64{2.5, -40, 8}},
			{Name: "soil", Code: []int32{1, 0, 1}, Level: []string{"clay", "loam"}},
			{Name: "id", Code: []int32{0, 1, -1}, Level: []string{"a", "b\nb"}},
		},
		Geometry: []orb.Geometry{orb.Point{1, 2.5}, orb.Point{3, -40}, orb.Point{7, 8}},
		XName:    "x", YName: "y", Recognised: true, Separator: ',', Encoding: utf8Text,
		Aside: []Aside{{Line: 6, Row: 3, Column: "n", Value: "NA", Code: "missing-response", Reason: "response is missing"}},
	}
	if diff := cmp.Diff(want, table); diff != "" {
		t.Errorf("table (-want +got):\n%s", diff)
	}
	if table.Column("peat") != nil || table.Column("y").Number[1] != -40 {
		t.Error("Column finds the wrong one")
	}
	if x, y := table.XY(); !cmp.Equal(x, []float64{1, 3, 7}) || !cmp.Equal(y, []float64{2.5, -40, 8}) {
		t.Errorf("XY gives %v and %v", x, y)
	}
}

func TestCoordinates(t *testing.T) {
	type found struct {
		x, y                string
		degrees, recognised bool
		passed              []string
	}
	tests := []struct {
		name, header string
		want         Request
		found        found
	}{
		{"x and y", "x,y", Request{}, found{"x", "y", false, true, nil}},
		{"capitals", "LAT,Lon", Request{}, found{"Lon", "LAT", true, true, nil}},
		{"easting", "Northing,Easting", Request{}, found{"Easting", "Northing", false, true, nil}},
		{"degrees before a plane", "x,y,lon,lat", Request{}, found{"lon", "lat", true, true, []string{"x/y"}}},
		{"both planes passed over", "X,Y,easting,northing,longitude,latitude", Request{}, found{"longitude", "latitude", true, true, []string{"easting/northing", "X/Y"}}},
		{"plane said", "x,y,lon,lat", Request{Axes: AxesPlane}, found{"x", "y", false, true, []string{"lon/lat"}}},
		{"degrees said of x and y", "x,y,easting,northing", Request{Axes: AxesDegrees}, found{"x", "y", true, true, []string{"easting/northing"}}},
		{"named", "x,y,e,n", Request{X: "e", Y: "n"}, found{"e", "n", false, false, nil}},
		{"named, degrees by name", "x,y,Lon,LATITUDE", Request{X: "Lon", Y: "LATITUDE"}, found{"Lon", "LATITUDE", true, false, nil}},
		{"named, degrees said", "x,y,e,n", Request{X: "e", Y: "n", Axes: AxesDegrees}, found{"e", "n", true, false, nil}},
		{"named, plane said", "lon,lat", Request{X: "lon", Y: "lat", Axes: AxesPlane}, found{"lon", "lat", false, false, nil}},
		{"a response called y", "x,y,easting,northing", Request{Response: "y", Kind: Measure}, found{"easting", "northing", false, true, nil}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			columns := strings.Count(test.header, ",") + 1
			row := strings.TrimSuffix(strings.Repeat("1,", columns), ",")
			table, err := read(test.header+"\n"+row+"\n", test.want)
			if err != nil {
				t.Fatal(err)
			}
			got := found{table.XName, table.YName, table.Degrees, table.Recognised, table.PassedOver}
			if diff := cmp.Diff(test.found, got, cmp.AllowUnexported(found{})); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
}

// Longitudes at the limits are kept as they stand, and so is a latitude of exactly 90.
func TestDegreesAtTheLimits(t *testing.T) {
	table, err := read("lon,lat\n-360,90\n360,-90\n188.13,-20\n", Request{})
	if err != nil {
		t.Fatal(err)
	}
	want := []orb.Geometry{orb.Point{-360, 90}, orb.Point{360, -90}, orb.Point{188.13, -20}}
	if diff := cmp.Diff(want, table.Geometry); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

// Half of the rows may be set aside, not one more.
func TestHalfAside(t *testing.T) {
	table, err := read("x,y,z\n1,2,3\n1,2,\n1,2,x\n1,2,4\n", measure)
	if err != nil {
		t.Fatal(err)
	}
	want := []AsideCount{
		{Code: "missing-response", Column: "z", Reason: "response is missing", Rows: 1},
		{Code: "not-a-number", Column: "z", Reason: "response is not a number", Rows: 1},
	}
	if diff := cmp.Diff(want, table.CountAside()); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if _, err := read("x,y,z\n1,2,3\n1,2,\n1,2,x\n", measure); err == nil {
		t.Error("two of three rows were set aside without an error")
	}
}

// An error of the reader underneath is passed on, also from the middle of a quoted field.
func TestReaderFails(t *testing.T) {
	broken := errors.New("the disk went away")
	for _, text := range []string{"", "x,y,z\n1,2,3\n", "x,y,z\n1,2,\"3"} {
		r := io.MultiReader(strings.NewReader(text), iotest.ErrReader(broken))
		_, err := Read(r, "wells.csv", measure)
		if !errors.Is(err, broken) || err.Error() != "wells.csv: cannot be read: the disk went away" {
			t.Errorf("after %q: got %v", text, err)
		}
	}
}

// The table does not depend on how the bytes arrive.
func TestOneByteAtATime(t *testing.T) {
	data, err := os.ReadFile("../../testdata/meuse.csv")
	if err != nil {
		t.Fatal(err)
	}
	want := Request{Response: "zinc", Kind: Measure, Linear: []string{"om"}, Category: []string{"landuse"}}
	whole, err := read(string(data), want)
	if err != nil {
		t.Fatal(err)
	}
	crlf := strings.ReplaceAll(string(data), "\n", "\r\n")
	dripped, err := Read(iotest.OneByteReader(strings.NewReader(crlf)), "wells.csv", want)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(whole, dripped); diff != "" {
		t.Errorf("(-whole +dripped):\n%s", diff)
	}
}

// Distances by hand from the definition of F. Damerau (1964), restricted form; "ca" to "abc" is 3 only in that form.
func TestEdits(t *testing.T) {
	tests := []struct {
		a, b string
		want int
	}{{"", "", 0}, {"", "abc", 3}, {"zinc", "zink", 1}, {"depth", "dpeth", 1}, {"kitten", "sitting", 3}, {"ca", "abc", 3}, {"été", "ete", 2}}
	for _, test := range tests {
		for _, pair := range [][2]string{{test.a, test.b}, {test.b, test.a}} {
			if got := edits([]rune(pair[0]), []rune(pair[1])); got != test.want {
				t.Errorf("edits(%q, %q) = %d, want %d", pair[0], pair[1], got, test.want)
			}
		}
	}
}

func open(t *testing.T, name string, want Request) *Table {
	t.Helper()
	f, err := os.Open("../../testdata/" + name)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	table, err := Read(f, name, want)
	if err != nil {
		t.Fatal(err)
	}
	return table
}

func sum(v []float64) float64 {
	total := 0.0
	for _, x := range v {
		total += x
	}
	return total
}

// Expected sums and counts of the three tables: testdata/README.md, where they are given with their sources.
func TestMeuse(t *testing.T) {
	table := open(t, "meuse.csv", Request{Response: "zinc", Kind: Measure, Linear: []string{"dist"}})
	zinc := table.Column("zinc").Number
	if table.Len() != 155 || len(table.Aside) != 0 || sum(zinc) != 72806 {
		t.Errorf("%d rows, %d aside, zinc sum %g; want 155, 0, 72806", table.Len(), len(table.Aside), sum(zinc))
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, z := range zinc {
		lo, hi = min(lo, z), max(hi, z)
	}
	if lo != 113 || hi != 1839 {
		t.Errorf("zinc from %g to %g, want 113 to 1839", lo, hi)
	}
	if table.Degrees || !table.Recognised || table.Geometry[0] != (orb.Point{181072, 333611}) {
		t.Errorf("degrees %v, recognised %v, first place %v", table.Degrees, table.Recognised, table.Geometry[0])
	}
}

func TestMeuseMissing(t *testing.T) {
	table := open(t, "meuse.csv", Request{Response: "zinc", Kind: Measure, Linear: []string{"om"}, Category: []string{"landuse"}})
	want := []AsideCount{
		{Code: "missing-covariate", Column: "om", Reason: "covariate is missing", Rows: 2},
		{Code: "missing-covariate", Column: "landuse", Reason: "covariate is missing", Rows: 1},
	}
	if diff := cmp.Diff(want, table.CountAside()); diff != "" {
		t.Errorf("set aside (-want +got):\n%s", diff)
	}
	if table.Len()+len(table.Aside) != 155 || table.Rows != 155 {
		t.Errorf("%d kept and %d aside of %d, want 155 in all", table.Len(), len(table.Aside), table.Rows)
	}
	for _, a := range table.Aside {
		if a.Value != "NA" || a.Line != a.Row+1 {
			t.Errorf("set aside %+v: want the value NA and the line after the row", a)
		}
	}
}

func TestCarolina(t *testing.T) {
	table := open(t, "nc_sids.csv", Request{Response: "sid74", Kind: Count, Denominator: "bir74", Keep: []string{"county"}})
	deaths, births := sum(table.Column("sid74").Number), sum(table.Column("bir74").Number)
	if table.Len() != 100 || deaths != 667 || births != 329962 {
		t.Errorf("%d counties, %g deaths, %g births; want 100, 667, 329962", table.Len(), deaths, births)
	}
	county := table.Column("county")
	if len(county.Level) != 100 || county.Level[county.Code[0]] != "Ashe" || county.Level[0] != "Alamance" {
		t.Errorf("counties: %d names, first row %q, first name %q", len(county.Level), county.Level[county.Code[0]], county.Level[0])
	}
	if !table.Degrees || table.XName != "lon" {
		t.Errorf("coordinates %s/%s, degrees %v", table.XName, table.YName, table.Degrees)
	}
}

func TestBurkina(t *testing.T) {
	table := open(t, "burkina_faso_malaria.csv", Request{Response: "positive", Kind: Positives, Trials: "examined", Strict: true})
	positive, examined := sum(table.Column("positive").Number), sum(table.Column("examined").Number)
	if table.Len() != 109 || positive != 25674 || examined != 58463 {
		t.Errorf("%d villages, %g positive of %g; want 109, 25674 of 58463", table.Len(), positive, examined)
	}
}

func ExampleRead() {
	plots := "x,y,stems,ha\n120,40,31,0.04\n180,40,,0.04\n150,90,17,0.04\n"
	table, err := Read(strings.NewReader(plots), "plots.csv", Request{Response: "stems", Kind: Count, Denominator: "ha"})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(table.Column("stems").Number, "at", table.Geometry)
	for _, a := range table.Aside {
		fmt.Printf("row %d: %s\n", a.Row, a.Reason)
	}
	// Output:
	// [31 17] at [[120 40] [150 90]]
	// row 2: response is missing
}

func BenchmarkReadCSV(b *testing.B) {
	for _, n := range []int{10_000, 1_000_000} {
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			var text strings.Builder
			text.WriteString("x,y,z,d,e\n")
			for i := range n {
				fmt.Fprintf(&text, "%.2f,%.2f,%.4f,%.3f,%.3f\n", 180000+float64(i%1000)/7, 330000+float64(i/1000)/7, math.Sqrt(float64(i)),
					float64(i)/3, 1000+float64(i%999)/3)
			}
			want := Request{Response: "z", Kind: Measure, Linear: []string{"d", "e"}}
			b.SetBytes(int64(text.Len()))
			b.ReportAllocs()
			for b.Loop() {
				if _, err := read(text.String(), want); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// TestFractionsAreAmounts: a table of amounts read as counts is told what it is.
func TestFractionsAreAmounts(t *testing.T) {
	_, err := read("x,y,catch\n0,0,1.5\n1,0,0\n0,1,2.25\n1,1,3.5\n", Request{Response: "catch", Kind: Count})
	if err == nil || hint(err) != "amounts that are not whole numbers are no counts: use --distribution tweedie for them" {
		t.Errorf("%v, hint %q", err, hint(err))
	}
}

package observe

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"regexp"
	"slices"
	"strings"
	"sync"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func whole(t testing.TB, text string) *Shared {
	t.Helper()
	shared, err := Whole(strings.NewReader(text), "all.csv")
	if err != nil {
		t.Fatal(err)
	}
	return shared
}

func split(t testing.TB, text, column string) map[string]Part {
	t.Helper()
	parts, _, err := whole(t, text).Split(column)
	if err != nil {
		t.Fatal(err)
	}
	named := map[string]Part{}
	for _, p := range parts {
		named[p.Name] = p
	}
	return named
}

// drawnTable is a table of several districts and what its author knows of it.
type drawnTable struct {
	text, header string
	district     []string // of each row; "" where it is missing
	line         []int    // of each row
	content      []string // of each row, without the end of its line
}

// drawTable writes rows with every oddity: quotes, line ends within them, blank lines, blanks around values, values
// that cannot be used. The district stands in any of the columns.
func drawTable(t *rapid.T) (d drawnTable) {
	among := func(label string, values ...string) string { return rapid.SampledFrom(values).Draw(t, label) }
	columns := rapid.Permutation([]string{"district", "x", "y", "n", "soil", "note"}).Draw(t, "columns")
	d.header = strings.Join(columns, ",")
	end := func() string {
		return among("end", "\n", "\n", "\r\n") + among("blank lines", "", "", "", "\n", "\r\n\n")
	}
	d.text = among("mark", "", "\xef\xbb\xbf") + among("above", "", "\n") + d.header + end()
	rows := rapid.IntRange(1, 60).Draw(t, "rows")
	for range rows {
		name := among("district", "North", "South", "South", "West, \"old\"", "nowhere", "a\nb", "")
		value := map[string]string{
			"district": name, "x": among("x", "1", "2.5", "-3e1", " 4 ", "5", "6", "oak"), "y": among("y", "1", "8", "9", "NA"),
			"n": among("n", "0", "1", "2", "3", "17", "NA", "-1"), "soil": among("soil", "clay", "loam", "peat", " sand", "marl", ""),
			"note": among("note", "", "said \"so\"", "one\r\ntwo", "a,b", "höhe"),
		}
		var fields []string
		for _, c := range columns {
			s := value[c]
			if strings.ContainsAny(s, ",\"\n") || rapid.IntRange(0, 4).Draw(t, "quoted") == 0 {
				s = among("before", "", " ") + `"` + strings.ReplaceAll(s, `"`, `""`) + `"`
			} else {
				s += among("behind", "", " ")
			}
			fields = append(fields, s)
		}
		content := strings.Join(fields, ",")
		d.district, d.content = append(d.district, name), append(d.content, content)
		d.line = append(d.line, 1+strings.Count(d.text, "\n"))
		d.text += content + end()
	}
	if rapid.Bool().Draw(t, "cut") {
		d.text = strings.TrimRight(d.text, "\r\n")
	}
	return d
}

// alone is the file that holds the rows of one district and nothing else.
func (d drawnTable) alone(district string) string {
	text := d.header + "\n"
	for i, content := range d.content {
		if d.district[i] == district {
			text += content + "\n"
		}
	}
	return text
}

// filtered is what a table holds of some of its rows.
func filtered(full *Table, rows map[int32]bool) *Table {
	table := *full
	table.Line, table.Row, table.Geometry, table.Aside, table.Rows = nil, nil, nil, nil, len(rows)
	table.Columns = make([]Column, len(full.Columns))
	for k, c := range full.Columns {
		table.Columns[k].Name = c.Name
	}
	for i, row := range full.Row {
		if !rows[row] {
			continue
		}
		table.Line, table.Row = append(table.Line, full.Line[i]), append(table.Row, row)
		table.Geometry = append(table.Geometry, full.Geometry[i])
		for k, c := range full.Columns {
			to := &table.Columns[k]
			if c.Number != nil {
				to.Number = append(to.Number, c.Number[i])
			}
			if c.Code != nil && c.Code[i] >= 0 {
				to.Level = append(to.Level, c.Level[c.Code[i]])
			}
		}
	}
	for k := range table.Columns {
		to, from := &table.Columns[k], full.Columns[k]
		slices.Sort(to.Level)
		to.Level = slices.Compact(to.Level)
		for i, row := range full.Row {
			if from.Code == nil || !rows[row] {
				continue
			}
			code := -1
			if from.Code[i] >= 0 {
				code = slices.Index(to.Level, from.Level[from.Code[i]])
			}
			to.Code = append(to.Code, int32(code))
		}
	}
	for _, a := range full.Aside {
		if rows[a.Row] {
			table.Aside = append(table.Aside, a)
		}
	}
	return &table
}

var sameTable = cmp.Transformer("levels", func(c Column) Column {
	if len(c.Level) == 0 {
		c.Level = nil
	}
	return c
})

// Splitting a table and reading the parts gives what filtering the table gives, and what files of their own would
// give but for the numbers of lines and rows. Rows and lines are known from the writing of the table.
func TestPartsAreTheFilteredTable(t *testing.T) {
	want := Request{Response: "n", Kind: Count, Category: []string{"soil"}, Keep: []string{"note", "n"}}
	kept, refused := 0, 0
	rapid.Check(t, func(t *rapid.T) {
		d := drawTable(t)
		shared, err := Whole(strings.NewReader(d.text), "all.csv")
		if err != nil {
			t.Fatal(err)
		}
		parts, unnamed, err := shared.Split("district")
		if err != nil {
			t.Fatal(err)
		}
		full, fullErr := Read(strings.NewReader(d.text), "all.csv", want)
		rowsLeft := len(d.district) - unnamed.Rows
		for _, p := range parts {
			rows := map[int32]bool{}
			for i, name := range d.district {
				if name == p.Name {
					rows[int32(i+1)] = true
				}
			}
			rowsLeft -= p.Rows
			alone := d.alone(p.Name)
			sum := sha256.Sum256([]byte(alone))
			if p.SHA256() != hex.EncodeToString(sum[:]) || p.Bytes != len(alone)-len(d.header)-1 || p.Rows != len(rows) {
				t.Fatalf("part %q of %d rows and %d bytes, sum %s; its own file is %q", p.Name, p.Rows, p.Bytes, p.SHA256(), alone)
			}
			table, err := ReadPart(p, want)
			single, singleErr := Read(strings.NewReader(alone), "all.csv", want)
			if err != nil {
				refused++
				checkPlacedError(t, d, p.Name, err, singleErr)
				continue
			}
			kept++
			for i, row := range table.Row {
				if int(table.Line[i]) != d.line[row-1] {
					t.Fatalf("row %d on line %d, was written on line %d", row, table.Line[i], d.line[row-1])
				}
			}
			if fullErr == nil {
				if diff := cmp.Diff(filtered(full, rows), table, sameTable); diff != "" {
					t.Fatalf("part %q (-filtered +read):\n%s", p.Name, diff)
				}
			}
			if diff := cmp.Diff(unplaced(single), unplaced(table)); diff != "" {
				t.Fatalf("part %q (-file of its own +part):\n%s", p.Name, diff)
			}
		}
		if rowsLeft != 0 {
			t.Fatalf("%d rows belong to no part and are not reported", rowsLeft)
		}
	})
	if kept == 0 || refused == 0 {
		t.Errorf("%d parts were read and %d refused: the tables drawn do not test both", kept, refused)
	}
}

// unplaced is a table without its lines and rows.
func unplaced(t *Table) *Table {
	if t == nil {
		return nil
	}
	table := *t
	table.Line, table.Row = nil, nil
	table.Aside = slices.Clone(t.Aside)
	for i := range table.Aside {
		table.Aside[i].Line, table.Aside[i].Row = 0, 0
	}
	return &table
}

var place = regexp.MustCompile(`row (\d+) \(line (\d+)\)`)

// checkPlacedError demands the message of a file of its own, with a row of the district and its line in the table.
func checkPlacedError(t *rapid.T, d drawnTable, district string, err, single error) {
	if single == nil {
		t.Fatalf("a file of its own is read, the part is not: %v", err)
	}
	if got, want := place.ReplaceAllString(err.Error(), ""), place.ReplaceAllString(single.Error(), ""); got != want {
		t.Fatalf("the part is refused with %s\na file of its own with %s", err, single)
	}
	for _, found := range place.FindAllString(err.Error(), -1) {
		var row, line int
		fmt.Sscanf(found, "row %d (line %d)", &row, &line)
		if row < 1 || row > len(d.line) || d.line[row-1] != line || d.district[row-1] != district {
			t.Fatalf("%s is no row of %q in %q", found, district, d.text)
		}
	}
}

// What is refused in a part is placed in the whole file.
func TestPartErrors(t *testing.T) {
	const text = "district,lon,lat,z\n\"Lower\nEnd\",1,2,3\n\nNorth,1,2,3\nSouth,1,2,NA\nNorth,1,97,3\nSouth,1,2,3\nSouth,1,2,\n,1,2,3\n"
	parts := split(t, text, "district")
	plane := measure
	plane.Axes = AxesPlane
	strict := measure
	strict.Strict = true
	tests := []struct {
		name      string
		part      Part
		want      Request
		err, hint string
	}{
		{"latitude", parts["North"], measure, `all.csv: row 4 (line 7), column "lat": 97 is not a latitude (-90 to 90)`, adviceDegrees},
		{"strict", parts["South"], strict, `all.csv: row 3 (line 6), column "z": response is missing: "NA"`,
			`correct the row, or leave out --strict to set such rows aside`},
		{"mostly aside", parts["South"], measure, `all.csv: 2 of 3 rows cannot be used, more than half: column "z", response is missing (2); ` +
			`for example row 3 (line 6), where response is missing: "NA"`,
			`check that the right column is named, or take the rows without a value out of the file`},
		{"column", parts["North"], Request{Response: "zz", Kind: Measure}, `all.csv: line 1: no column "zz" for the response`,
			`did you mean "z"? the columns are district, lon, lat, z`},
		{"coordinates", parts["North"], plane, `all.csv: line 1: columns lon/lat are longitude and latitude by their names, but the coordinates are said to be in a plane`,
			adviceDegrees},
		{"request", parts["North"], Request{Kind: Measure}, `all.csv: no column is named for the response`, `name it with --response`},
		{"nothing left", parts["North"].Only(nil), measure, `all.csv: none of its rows are left to read`, ``},
		{"nothing left and no column", parts["North"].Only(nil), Request{Response: "zz", Kind: Measure}, `all.csv: line 1: no column "zz" for the response`,
			`did you mean "z"? the columns are district, lon, lat, z`},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			table, err := ReadPart(test.part, test.want)
			if table != nil || err == nil {
				t.Fatalf("got table %v, error %v; want an error alone", table, err)
			}
			if got := message(err); got != test.err+"\nhint: "+test.hint {
				t.Errorf("got  %s\nwant %s\nhint: %s", got, test.err, test.hint)
			}
			byHeader := strings.HasPrefix(test.err, "all.csv: line 1") || test.name == "request"
			if check := test.part.Check(test.want); byHeader && message(check) != message(err) || !byHeader && check != nil {
				t.Errorf("by the header alone: %v", check)
			}
		})
	}
	table, err := ReadPart(parts["Lower\nEnd"], measure)
	if err != nil || table.Line[0] != 2 || table.Row[0] != 1 || table.Rows != 1 {
		t.Errorf("got %+v, %v", table, err)
	}
}

// checkParts reads a text by way of Whole and expects the refusal of Read, except where the request and the file
// are both at fault: the file comes first here.
func checkParts(t *testing.T, text string, want Request, refused error) {
	t.Helper()
	shared := checkWhole(t, text)
	if shared == nil {
		return
	}
	if _, err := ReadPart(shared.All(), want); message(err) != message(refused) {
		t.Errorf("by way of Whole: %v\nwant %v", message(err), message(refused))
	}
}

func TestSplitRefusals(t *testing.T) {
	shared := whole(t, "District,x,,y\na,1,,2\n")
	for _, test := range []struct{ column, err string }{
		{"distrikt", "all.csv: line 1: no column \"distrikt\" for the names of the regions\n" +
			"hint: did you mean \"District\"? the columns are District, x, \"\", y"},
		{"", "all.csv: line 1: no column is named for the names of the regions\nhint: the columns are District, x, \"\", y"},
	} {
		parts, _, err := shared.Split(test.column)
		if parts != nil || message(err) != test.err {
			t.Errorf("%q: %d parts, %s\nwant %s", test.column, len(parts), message(err), test.err)
		}
	}
	if diff := cmp.Diff([]string{"District", "x", "", "y"}, shared.Columns()); diff != "" {
		t.Errorf("columns (-want +got):\n%s", diff)
	}
}

// Names are in order of first appearance, capitals make a difference, blanks around do not.
func TestSplitNames(t *testing.T) {
	const text = "x,y,at\n1,2,north\n1,2,\n1,2, South \n1,2,\"north\"\n1,2,North\n1,2,na\n1,2,\" south\"\n1,2,South\n1,2,NaN\n"
	parts, unnamed, err := whole(t, text).Split("at")
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, p := range parts {
		got = append(got, fmt.Sprintf("%s %v", p.Name, p.rows))
	}
	if diff := cmp.Diff([]string{"north [0 3]", "South [2 7]", "North [4]", "south [6]"}, got); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if unnamed != (Unnamed{Rows: 3, Line: 3, Row: 2}) {
		t.Errorf("unnamed: %+v", unnamed)
	}
	parts, unnamed, err = whole(t, "x,y,at\n1,2, NA\n1,2,\n").Split("at")
	if len(parts) != 0 || unnamed != (Unnamed{Rows: 2, Line: 2, Row: 1, Value: "NA"}) || err != nil {
		t.Errorf("without any name: %v, %+v, %v", parts, unnamed, err)
	}
}

func TestOnly(t *testing.T) {
	const text = "at,x,y\na,1,1\nb,22,2\na,333,3\n\na,4,4\nb,5,5\n"
	shared := whole(t, text)
	a := split(t, text, "at")["a"]
	tests := []struct {
		name    string
		part    Part
		numbers []int32
		rows    []int32
		bytes   int
	}{
		{"some of a part", a, []int32{1, 3}, []int32{1, 3}, len("a,1,1\na,333,3\n")},
		{"rows of another part", a, []int32{2, 4, 5}, []int32{4}, len("a,4,4\n")},
		{"in any order and twice", a, []int32{4, 3, 4, 3}, []int32{3, 4}, len("a,333,3\na,4,4\n")},
		{"beyond the file", a, []int32{-1 << 31, -1, 0, 6, 1<<31 - 1}, nil, 0},
		{"none", a, nil, nil, 0},
		{"of the whole file", shared.All(), []int32{0, 2, 5, 6}, []int32{2, 5}, len("b,22,2\nb,5,5\n")},
		{"of what is left", a.Only([]int32{1, 3}), []int32{3, 4}, []int32{3}, len("a,333,3\n")},
		{"of nothing", shared.All().Only(nil), []int32{1}, nil, 0},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			given := slices.Clone(test.numbers)
			only := test.part.Only(test.numbers)
			if !slices.Equal(given, test.numbers) {
				t.Errorf("the numbers given were changed to %v", test.numbers)
			}
			if only.Rows != len(test.rows) || only.Bytes != test.bytes || only.Name != test.part.Name {
				t.Errorf("%q of %d rows and %d bytes, want %d and %d", only.Name, only.Rows, only.Bytes, len(test.rows), test.bytes)
			}
			if len(test.rows) == 0 {
				return
			}
			table, err := ReadPart(only, Request{})
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(test.rows, table.Row); diff != "" {
				t.Errorf("rows (-want +got):\n%s", diff)
			}
		})
	}
}

// The checksum of a region stays when the rows of others change, come and go, and when line ends, blank lines and the
// byte order mark do; it changes with its own rows, their order and the header.
func TestPartSHA256(t *testing.T) {
	const text = "at,x,y\na,1,\"p\"\nb,2,q\na,3,r\n"
	sum := func(text string) string { return split(t, text, "at")["a"].SHA256() }
	same := map[string]string{
		"others change":    "at,x,y\na,1,\"p\"\nb,2222,\"q\nq\"\na,3,r\n",
		"others move":      "at,x,y\nb,2,q\na,1,\"p\"\na,3,r\n",
		"others are added": "at,x,y\nc,7,s\na,1,\"p\"\nc,8,t\nb,2,q\na,3,r\n,9,u\n",
		"others go":        "at,x,y\na,1,\"p\"\na,3,r",
		"windows":          "\xef\xbb\xbf\r\nat,x,y\r\na,1,\"p\"\r\n\r\nb,2,q\r\na,3,r\r",
	}
	for name, other := range same {
		if sum(other) != sum(text) {
			t.Errorf("%s: the checksum is another", name)
		}
	}
	differ := map[string]string{
		"a value":   "at,x,y\na,1,\"p\"\nb,2,q\na,3,s\n",
		"quotes":    "at,x,y\na,1,p\nb,2,q\na,3,r\n",
		"the order": "at,x,y\na,3,r\nb,2,q\na,1,\"p\"\n",
		"a row":     "at,x,y\na,1,\"p\"\na,3,r\na,3,r\n",
		"a name":    "at,x,z\na,1,\"p\"\nb,2,q\na,3,r\n",
	}
	for name, other := range differ {
		if sum(other) == sum(text) {
			t.Errorf("%s: the checksum is the same", name)
		}
	}
	all := sha256.Sum256([]byte(text))
	if got := whole(t, text).All().SHA256(); got != hex.EncodeToString(all[:]) {
		t.Errorf("of the whole file %s, want that of the file", got)
	}
}

// Parts of one table are read at the same time.
func TestPartsAtTheSameTime(t *testing.T) {
	parts, _, err := whole(t, largeTable(20_000, `"`)).Split("district")
	if err != nil {
		t.Fatal(err)
	}
	var group sync.WaitGroup
	for _, p := range parts[:20] {
		group.Go(func() {
			table, err := ReadPart(p, Request{Response: "z", Kind: Measure, Keep: []string{"district"}})
			if err != nil || table.Len() != 40 || !slices.Equal(table.Column("district").Level, []string{p.Name}) {
				t.Errorf("%s: %v", p.Name, err)
			}
		})
	}
	group.Wait()
}

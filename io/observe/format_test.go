package observe

import (
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// readBoth reads a text by Read and by WholeAs and ReadPart, which must agree.
func readBoth(t *testing.T, text string, want Request) (*Table, error) {
	t.Helper()
	table, err := read(text, want)
	var part *Table
	shared, partErr := WholeAs(strings.NewReader(text), "wells.csv", want.Format)
	if partErr == nil {
		other := want
		other.Format = Format{} // the format is that of the table
		part, partErr = ReadPart(shared.All(), other)
	}
	if diff := cmp.Diff(message(err), message(partErr)); diff != "" {
		t.Fatalf("error (-Read +ReadPart):\n%s", diff)
	}
	if diff := cmp.Diff(table, part); diff != "" {
		t.Fatalf("table (-Read +ReadPart):\n%s", diff)
	}
	return table, err
}

// outcome is what a small file comes to: the values of z, the separator and the rows set aside, or the refusal.
func outcome(table *Table, err error) string {
	if err != nil {
		return err.Error() + "\n" + hint(err)
	}
	var b strings.Builder
	fmt.Fprintf(&b, "%s %v", separatorWord(table.Separator), table.Column("z").Number)
	for _, c := range table.BelowLimit {
		fmt.Fprintf(&b, " %s:%d %s", c.Column, c.Rows, c.Rule)
	}
	for _, a := range table.Aside {
		fmt.Fprintf(&b, " | %d %s %s %q", a.Row, a.Column, a.Code, a.Value)
	}
	return b.String()
}

type formatCase struct {
	name, text string
	format     Format
	want       string
}

func checkFormats(t *testing.T, request Request, tests []formatCase) {
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			request.Format = test.format
			if diff := cmp.Diff(test.want, outcome(readBoth(t, test.text, request))); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
}

func TestSeparators(t *testing.T) {
	none := "wells.csv: line 1: no coordinate columns are recognised\n" +
		advicePairs
	checkFormats(t, measure, []formatCase{
		{"comma", "x,y,z\n1,2,3\n", Format{}, "comma [3]"},
		{"semicolon", "x;y;z\n1;2;3\n", Format{}, "semicolon [3]"},
		{"tab", "x\ty\tz\n1\t2\t3\n", Format{}, "tab [3]"},
		{"pipe", "x|y|z\n1|2|3\n", Format{}, `"|" [3]`},
		{"quoted names", "\"x\";\"y\";\"z, a; b\";z\n1;2;9;3\n", Format{}, "semicolon [3]"},
		{"commas within quotes do not count", "x;y;z;\"a,b,c,d,e\"\n1;2;3;4\n", Format{}, "semicolon [3]"},
		{"a quoted line end does not end the header", "\"a\n,,\";x;y;z\n1;1;2;3\n", Format{}, "semicolon [3]"},
		{"blank lines above", "\r\n\nx;y;z\n1;2;3\n", Format{}, "semicolon [3]"},
		{"most wins", "x;y;z;a,b\n1;2;3;4\n", Format{}, "semicolon [3]"},
		{"a tie is a comma", "x,y;z\n1,2;3\n", Format{}, "wells.csv: line 1: no coordinate columns are recognised\n" + none[strings.Index(none, "name the"):] + `x, "y;z"`},
		{"a tie without commas is one column", "z|a\tb\n1\n", Format{}, "wells.csv: line 1: no coordinate columns are recognised\n" +
			"the header has no comma, but a tab: name that with --separator, or leave out --separator"},
		{"named", "x,y,z;a;b;c\n1,2,3\n", Format{Separator: ','}, `wells.csv: line 1: no column "z" for the response` + "\n" + `did you mean "x"? the columns are x, y, "z;a;b;c"`},
		{"named and absent", "x;y;z\n1;2;3\n", Format{Separator: ','}, "wells.csv: line 1: no coordinate columns are recognised\n" +
			"the header has no comma, but a semicolon: name that with --separator, or leave out --separator"},
		{"named wins", "x;y;z;a,b,c,d,e\n1;2;3;4\n", Format{Separator: ';'}, "semicolon [3]"},
		{"named and odd", "x#y#z\n1#2#3\n", Format{Separator: '#'}, `"#" [3]`},
		{"named and beyond ASCII", "x¦y¦z\n1¦\"2\"¦3\n", Format{Separator: '¦'}, `"¦" [3]`},
		{"empty fields between tabs", "a\tx\ty\t\tz\n\t1\t2\t\t3\n\t 4\t5 \t\t 6\n\t7\t8\t\t\n", Format{}, `tab [3 6] | 3 z missing-response ""`},
		{"only tabs on a line", "x\ty\tz\n1\t2\t3\n\t\t\n", Format{}, "tab [3]"},
		{"told above the header", "sep=;\nx;y;z\n1;2;3\n", Format{}, "semicolon [3]"},
		{"told above the header, and odd", "\nSEP=#\r\n\nx#y#z\n1#2#3\n", Format{}, `"#" [3]`},
		{"told above the header, and named", "sep=,\nx;y;z\n1;2;3\n", Format{Separator: ';'}, "semicolon [3]"},
		{"a column called sep=", "sep=a,x,y,z\n9,1,2,3\n", Format{}, "comma [3]"},
		{"empty rows", "\n,,\nx,y,z\n , ,\n,\n1,2,3\n\"\",\" \",\n4,5,\n\x1a", Format{}, `comma [3] | 2 z missing-response ""`},
		{"quotes between tabs", "x\ty\tz\n1\t\"2\"\t\"3\"\n", Format{}, "tab [3]"},
		{"spaces and quotes between semicolons", "x; y; \"z\"\n1; \"2\"; 3\n", Format{}, "semicolon [3]"},
		{"field too few", "x;y;z\n1;2\n", Format{}, "wells.csv: row 1 (line 2): 2 fields where the header has 3\n" +
			"check the line for a missing semicolon, or for one that belongs inside quotes"},
		{"letter", "x,y,z\n1,2,3\n", Format{Separator: 'e'}, "wells.csv: \"e\" cannot stand between columns\n" +
			"name a character that is in no name and no number, such as a semicolon"},
		{"quote", "x,y,z\n1,2,3\n", Format{Separator: '"'}, "wells.csv: \"\\\"\" cannot stand between columns\n" +
			"name a character that is in no name and no number, such as a semicolon"},
		{"line end", "x,y,z\n1,2,3\n", Format{Separator: '\n'}, "wells.csv: \"\\n\" cannot stand between columns\n" +
			"name a character that is in no name and no number, such as a semicolon"},
	})
	for _, text := range []string{"id\n1\n2\n", "\"id\"\n1\n"} { // one column, which has no places but is a table
		if shared, err := Whole(strings.NewReader(text), "wells.csv"); err != nil || len(shared.Columns()) != 1 {
			t.Errorf("%q: %v", text, err)
		}
	}
}

func TestDecimalCommas(t *testing.T) {
	comma := Format{DecimalComma: true}
	grouped := func(where, value, advice string) string {
		return fmt.Sprintf("wells.csv: %s: %q has a mark between thousands, which is not read\nwrite the number without it%s", where, value, advice)
	}
	const orComma, orPoint = ", or say with --decimal-comma that the comma is decimal", ", or leave out --decimal-comma if the point is decimal"
	const zRow1, zRow2, zRow3 = `row 1 (line 2), column "z"`, `row 2 (line 3), column "z"`, `row 3 (line 4), column "z"`
	untold := func(where, value string) string {
		return fmt.Sprintf("wells.csv: %s: %q has a decimal comma, like most values of the column\nsay so with --decimal-comma", where, value)
	}
	tests := []formatCase{
		{"told", "x;y;z\n1,5;2;3,14\n-1e1;,5;+3,5e2\n", comma, "semicolon [3.14 350]"},
		{"three decimals", "x;y;z\n1;2;1,234\n", comma, "semicolon [1.234]"},
		{"commas named as separators", "x,y,z\n1,2,\"3,14\"\n", Format{DecimalComma: true, Separator: ','}, "comma [3.14]"},
		{"more commas than semicolons", "x;y;z;\"a\";b,c,d,e,f\n1;2;3,5;4;5\n", comma, "semicolon [3.5]"},
		{"tabs", "x\ty\tz\n1\t2\t3,5\n", comma, "tab [3.5]"},
		{"commas alone", "x,y,z\n1,2,3\n", comma, "wells.csv: the header has no separator but commas, and commas are said to be decimal\n" +
			"name the separator with --separator, or leave out --decimal-comma; both hold for all tables"},
		{"two commas", "x;y;z\n1;2;3\n1;2;1,2,3\n", comma, `semicolon [3] | 2 z not-a-number "1,2,3"`},
		{"words", "x;y;z\n1;2;3,5\n1;2;n.d.\n", comma, `semicolon [3.5] | 2 z not-a-number "n.d."`},
		{"infinite", "x;y;z\n1;2;3,5\n1;2;1e999\n", comma, `semicolon [3.5] | 2 z not-finite "1e999"`},
		{"thousands, told", "x;y;z\n1;2;3,5\n1;2;1.234,5\n", comma, grouped(zRow2, "1.234,5", "")},
		{"whole thousands, told", "x;y;z\n1;2;3,5\n1;2;1.234\n", comma, grouped(zRow2, "1.234", orPoint)},
		{"millions, told", "x;y;z\n1;2;3,5\n1;2;1.234.567\n", comma, grouped(zRow2, "1.234.567", "")},
		{"blank thousands, told", "x;y;z\n1;2;3,5\n1;2;12 345,5\n", comma, grouped(zRow2, "12 345,5", "")},
		{"point, told", "x;y;z\n1;2;3,5\n1;2;3.14\n", comma, "wells.csv: " + zRow2 + ": \"3.14\" has a decimal point, " +
			"where numbers are said to have a decimal comma\nwrite the numbers in one way, or leave out --decimal-comma, which holds for all tables"},

		{"thousands", "x,y,z\n1,2,\"1,234.5\"\n", Format{}, grouped(zRow1, "1,234.5", "")},
		{"whole thousands", "x,y,z\n1,2,\"1,234\"\n1,2,\"5,678\"\n", Format{}, grouped(zRow1, "1,234", orComma)},
		{"negative thousands", "x,y,z\n1,2,3\n1,2,\"-21,234\"\n", Format{}, grouped(zRow2, "-21,234", orComma)},
		{"millions", "x,y,z\n1,2,\"1,234,567\"\n", Format{}, grouped(zRow1, "1,234,567", "")},
		{"thousands of the other kind", "x;y;z\n1;2;3\n1;2;1.234,5\n", Format{}, grouped(zRow2, "1.234,5", ", and say with --decimal-comma that the comma is decimal")},
		{"blanks", "x,y,z\n1,2,3\n1,2,1\u202f234\n", Format{}, grouped(zRow2, "1\u202f234", "")},
		{"apostrophes", "x,y,z\n1,2,3\n1,2,1'234.5\n", Format{}, grouped(zRow2, "1'234.5", "")},
		{"thousands in a row that fails before", "x,y,z\n1,2,3\n\"1,234\",2,NA\n", Format{}, `comma [3] | 2 z missing-response "NA"`},
		{"no groups of three", "x,y,z\n1,2,3\n1,2,3\n1,2,3\n1,2,\"1,23\"\n1,2,\"1234,567.8\"\n", Format{},
			`comma [3 3 3] | 4 z not-a-number "1,23" | 5 z not-a-number "1234,567.8"`},
		{"a telephone number in a text column", "x,y,z,k\n1,2,3,\"1,234\"\n", Format{}, "comma [3]"},

		{"untold", "x;y;z\n1;2;3,5\n1;2;4\n1;2;5,25\n", Format{}, untold(zRow1, "3,5")},
		{"untold, first row whole", "x;y;z\n1;2;3\n1;2;4,5\n1;2;NA\n1;2;5,25\n", Format{}, untold(zRow2, "4,5")},
		{"untold coordinate", "x;y;z\n1,5;2;3\n1,5;2;4\n", Format{}, untold(`row 1 (line 2), column "x"`, "1,5")},
		{"untold with quotes", "x,y,z\n1,2,\"3,5\"\n1,2,\"4,5\"\n", Format{}, untold(zRow1, "3,5")},
		{"untold, all with three decimals, below 1 too", "x,y,z\n1,2,\"1,234\"\n1,2,\"0,512\"\n", Format{}, untold(zRow1, "1,234")},
		{"untold, all with three decimals, semicolons", "x;y;z\n1;2;1,234\n1;2;5,678\n", Format{}, untold(zRow1, "1,234")},
		{"untold before a latitude", "lon;lat;z\n1;2;3,5\n1;97;4,5\n", Format{}, untold(zRow1, "3,5")},
		{"half is not most", "x;y;z\n1;2;3\n1;2;3,5\n", Format{}, `semicolon [3] | 2 z not-a-number "3,5"`},
		{"half with thousands", "x;y;z\n1;2;3\n1;2;4\n1;2;1,234\n1;2;3,5\n", Format{}, grouped(zRow3, "1,234", orComma)},
	}
	checkFormats(t, measure, tests)
	if got := outcome(read("x,y,z\n1,2,\"1,234\"\n1,2\n", measure)); got != grouped(zRow1, "1,234", orComma) {
		t.Errorf("thousands before a short row: %s", got)
	}
	strict := measure
	strict.Strict = true
	checkFormats(t, strict, []formatCase{
		{"strict and untold", "x;y;z\n1;2;3\n1;2;4,5\n1;2;5,25\n", Format{}, untold(zRow2, "4,5")},
		{"strict and not most", "x;y;z\n1;2;3\n1;2;4,5\n1;2;5\n1;2;oak\n", Format{}, "wells.csv: " + zRow2 + ": response is not a number: \"4,5\"\n" +
			"correct the row, or leave out --strict to set such rows aside"},
	})
}

func TestMissingMarks(t *testing.T) {
	own := Format{Missing: []string{"-9999", "n.d.", "-", "0,0"}}
	checkFormats(t, measure, []formatCase{
		{"numbers", "x,y,z\n1,2,3\n1,2, n.d. \n1,2,5\n1,-9999,6\n", own, `comma [3 5] | 2 z missing-response "n.d." | 4 y missing-coordinate "-9999"`},
		{"capitals count", "x,y,z\n1,2,3\n1,2,N.D.\n", own, `comma [3] | 2 z not-a-number "N.D."`},
		{"everybody's stay, in any capitals", "x,y,z\n1,2,3\n1,2,3\n1,2,na\n1,2,NULL\n", own, `comma [3 3] | 3 z missing-response "na" | 4 z missing-response "NULL"`},
		{"exact", "x,y,z\n1,2,3\n1,2,-9999.0\n", own, "comma [3 -9999]"},
		{"no latitude", "lon,lat,z\n1,2,3\n1,-9999,4\n", own, `comma [3] | 2 lat missing-coordinate "-9999"`},
		{"no decimal comma", "x;y;z\n1;2;3\n1;2;0,0\n", own, `semicolon [3] | 2 z missing-response "0,0"`},
	})
	want := Request{Category: []string{"soil"}, Keep: []string{"note"}, Format: own}
	table, err := readBoth(t, "x,y,soil,note\n1,2,clay,n.d.\n1,2,n.d.,a\n1,2,-,b\n1,2,N.D.,c\n", want)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]Column{{Name: "soil", Code: []int32{1, 0}, Level: []string{"N.D.", "clay"}},
		{Name: "note", Code: []int32{-1, 0}, Level: []string{"c"}}}, table.Columns); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	shared, err := WholeAs(strings.NewReader("x;region\n1;a\n2; - \n3;b\n"), "wells.csv", own)
	if err != nil {
		t.Fatal(err)
	}
	parts, unnamed, err := shared.Split("region")
	if err != nil || len(parts) != 2 || unnamed != (Unnamed{Rows: 1, Line: 3, Row: 2, Value: "-"}) {
		t.Errorf("%d parts, %+v, %v", len(parts), unnamed, err)
	}
}

func TestBelowLimit(t *testing.T) {
	const text = "x,y,z\n1,2,3\n1,2,<0.5\n1,2,< 4\n1,2, <1e1 \n1,2,7\n1,2,8\n1,2,9\n"
	checkFormats(t, measure, []formatCase{
		{"nothing said", text, Format{}, `comma [3 7 8 9] | 2 z not-a-number "<0.5" | 3 z not-a-number "< 4" | 4 z not-a-number "<1e1"`},
		{"half", text, Format{BelowLimit: HalfLimit}, "comma [3 0.25 2 5 7 8 9] z:3 half"},
		{"limit", text, Format{BelowLimit: AtLimit}, "comma [3 0.5 4 10 7 8 9] z:3 limit"},
		{"aside", text, Format{BelowLimit: AsideLimit}, `comma [3 7 8 9] z:3 aside | 2 z below-limit "<0.5" | 3 z below-limit "< 4" | 4 z below-limit "<1e1"`},
		{"decimal comma", "x;y;z\n1;2;<0,5\n", Format{BelowLimit: AtLimit, DecimalComma: true}, "semicolon [0.5] z:1 limit"},
		{"a missing mark goes before", "x,y,z\n1,2,3\n1,2,<0.5\n", Format{BelowLimit: AtLimit, Missing: []string{"<0.5"}}, `comma [3] | 2 z missing-response "<0.5"`},
		{"no limit", "x,y,z\n1,2,3\n1,2,3\n1,2,3\n1,2,3\n1,2,3\n1,2,<\n1,2,<NA\n1,2,<0\n1,2,<-1\n1,2,<<1\n", Format{BelowLimit: HalfLimit},
			`comma [3 3 3 3 3] | 6 z not-a-number "<" | 7 z not-a-number "<NA" | 8 z not-a-number "<0" | 9 z not-a-number "<-1" | 10 z not-a-number "<<1"`},
		{"above", "x,y,z\n1,2,3\n1,2,>5\n", Format{BelowLimit: HalfLimit}, `comma [3] | 2 z not-a-number ">5"`},
		{"coordinates", "x,y,z\n1,2,3\n<1,2,3\n", Format{BelowLimit: HalfLimit}, `comma [3] | 2 x not-a-number "<1"`},
		{"a row lost for its coordinate does not count", "x,y,z\n1,2,<3\n1,,<3\n", Format{BelowLimit: HalfLimit}, `comma [1.5] z:1 half | 2 y missing-coordinate ""`},
		{"mostly below", "x,y,z\n1,2,<3\n", Format{}, "wells.csv: 1 of 1 rows cannot be used, more than half: column \"z\", response is not a number (1); " +
			"for example row 1 (line 2), where response is not a number: \"<3\"\nsay with --below-limit half or limit what stands for values below a detection limit"},
	})
	checkFormats(t, Request{Response: "z", Kind: Count}, []formatCase{{"counts mostly below", "x,y,z\n1,2,<3\n", Format{BelowLimit: HalfLimit},
		"wells.csv: 1 of 1 rows cannot be used, more than half: column \"z\", response is not a number (1); " +
			"for example row 1 (line 2), where response is not a number: \"<3\"\n" +
			"check that the right columns are named, and that missing values are written as empty fields or NA"}})
	counts := Request{Response: "z", Kind: Count, Denominator: "area", Weight: "w", Linear: []string{"d"}}
	checkFormats(t, counts, []formatCase{{"counts, denominators, weights and covariates",
		"x,y,z,area,w,d\n1,2,3,1,1,<4\n1,2,<3,1,1,1\n1,2,3,<1,1,1\n1,2,3,1,<1,1\n1,2,4,1,1,1\n1,2,5,1,1,2\n", Format{BelowLimit: AtLimit},
		`comma [3 4 5] d:1 limit | 2 z not-a-number "<3" | 3 area not-a-number "<1" | 4 w not-a-number "<1"`}})
	positives := Request{Response: "z", Kind: Positives, Trials: "n"}
	checkFormats(t, positives, []formatCase{{"trials", "x,y,z,n\n1,2,3,4\n1,2,3,<9\n", Format{BelowLimit: HalfLimit}, `comma [3] | 2 n not-a-number "<9"`}})
	strict := measure
	strict.Strict = true
	checkFormats(t, strict, []formatCase{
		{"strict, half", "x,y,z\n1,2,<3\n", Format{BelowLimit: HalfLimit}, "comma [1.5] z:1 half"},
		{"strict, aside", "x,y,z\n1,2,<3\n", Format{BelowLimit: AsideLimit}, "wells.csv: row 1 (line 2), column \"z\": response is below a detection limit: \"<3\"\n" +
			"correct the row, or leave out --strict to set such rows aside"},
	})
	if _, err := read("x,y,z\n1,2,3\n", Request{Response: "z", Kind: Measure, Format: Format{BelowLimit: 9}}); err == nil {
		t.Error("a rule that does not exist was taken")
	}
}

// Dates and other text stay as they stand, whatever is said about numbers.
func TestTextStaysAsItIs(t *testing.T) {
	want := Request{Keep: []string{"date", "code"}, Category: []string{"class"},
		Format: Format{DecimalComma: true, BelowLimit: HalfLimit}}
	table, err := readBoth(t, "x;y;date;code;class\n1,5;2;2021-03-04;007;<0,5\n1;2;4.3.2021;1.234,5;1.000\n1;2; 04/03/21 ;1,20;1,0\n", want)
	if err != nil {
		t.Fatal(err)
	}
	var got [][]string
	for i := range table.Len() {
		var row []string
		for _, c := range table.Columns {
			row = append(row, c.Level[c.Code[i]])
		}
		got = append(got, row)
	}
	expected := [][]string{{"<0,5", "2021-03-04", "007"}, {"1.000", "4.3.2021", "1.234,5"}, {"1,0", "04/03/21", "1,20"}}
	if diff := cmp.Diff(expected, got); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

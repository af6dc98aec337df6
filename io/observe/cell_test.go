package observe

import (
	"strings"
	"testing"
)

func TestAdviceForCell(t *testing.T) {
	const degrees = "write degrees as decimal numbers, west and south as negative ones"
	take := func(what string) string { return "take " + what + " out of the cells" }
	for advice, values := range map[string][]string{
		"say with --missing=n/a that it stands for a missing value":                                {"n/a"},
		"say with --missing=- that it stands for a missing value":                                  {"-"},
		"say with --missing=. that it stands for a missing value":                                  {"."},
		"say with --missing='#N/A' that it stands for a missing value":                             {"#N/A"},
		"say with --missing='?' that it stands for a missing value":                                {"?"},
		"correct the formula in the spreadsheet, or leave the cell empty":                          {"#DIV/0!", "#REF!"},
		"write 1 for true and 0 for false":                                                         {"TRUE", "no"},
		"a date is no number: write the days since a first day, or take the column for a category": {"2031-01-02", "1.2.2031", "3/4/31"},
		"write a plain hyphen as the minus sign":                                                   {"\u22121", "\u20131.5", "\u2212 3"},
		"take the % away, and divide by 100 if a share is meant":                                   {"1.5%", "80 %"},
		"write negative numbers with a minus sign":                                                 {"(6.5)"},
		degrees:                            {"12.5 N", "10.0E", "W 7", "46°12'", "10°00'E", "46º12′3″S", "9°"},
		take(`"mg"`):                       {"1.5 mg"},
		take(`"m2"`):                       {"3 m2", "3m2"},
		take(`"µg/m3"`):                    {"-0.5 µg/m3"},
		take(`"€"`):                        {"€ 5", "5€"},
		`"O" is a letter: write the digit`: {"24O"},
		"":                                 {"high", "", "<3", "~2", ">6", "1.2.3", "0x1F", "1_000", "village 7b", "12 W street", "a 3 b"},
	} {
		for _, s := range values {
			if got := adviceForCell(s, &Format{}); got != advice {
				t.Errorf("%q: got %q, want %q", s, got, advice)
			}
		}
	}
	if got := adviceForCell("1,5 mg", &Format{DecimalComma: true}); got != take(`"mg"`) {
		t.Errorf("with a decimal comma: %q", got)
	}
}

// What a cell tells is told where most rows are lost, and where one is refused.
func TestAdviceOfCellsIsTold(t *testing.T) {
	const text = "x,y,z\n1,2,1.5 mg\n3,4,2 mg\n5,6,7\n"
	_, err := readBoth(t, text, measure)
	if got, want := hint(err), `take "mg" out of the cells`; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
	strict := measure
	strict.Strict = true
	_, err = readBoth(t, text, strict)
	if got, want := hint(err), `take "mg" out of the cells, or leave out --strict to set such rows aside`; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

// Columns are called in messages and codes what the caller calls them.
func TestCalled(t *testing.T) {
	want := Request{Response: "z", Kind: Measure, Factor: []string{"w", "d", "f"}, Keep: []string{"k"}, Called: map[string]string{"w": "width", "d": "share detected", "k": "key", "20m": "width", "wide": "width"}}
	table, err := readBoth(t, "x,y,z,w,d,f,k\n1,2,3,0,1,1,a\n1,2,3,1,,1,a\n1,2,3,1,1,-1,a\n1,2,3,1,1,,a\n1,2,3,1,1,1,a\n1,2,3,1,1,1,a\n1,2,3,1,1,1,a\n1,2,3,1,1,1,a\n", want)
	if err != nil {
		t.Fatal(err)
	}
	if got, expected := asides(table), `1 width-not-positive w "0": width is not above 0
2 missing-share-detected d "": share detected is missing
3 factor-not-positive f "-1": factor of the denominator is not above 0
4 missing-factor f "": factor is missing`; got != expected {
		t.Errorf("got\n%s, want\n%s", got, expected)
	}
	for _, test := range []struct{ header, factor, err, hint string }{
		{"x,y,z,k", "wide", `wells.csv: line 1: no column "wide" for the width`, "the columns are x, y, z, k"},
		{"x,y,z,wide", "wide", `wells.csv: line 1: no column "k" for the key`, `did you mean "x"? the columns are x, y, z, wide`},
		{"x,y,z,k", "20m", `wells.csv: line 1: "20m", for the width, is neither a number nor a column`, "write the number alone, without a unit or a sign; the columns are x, y, z, k"},
	} {
		want.Factor = []string{test.factor}
		_, err := Read(strings.NewReader(test.header+"\n1,2,3,4\n"), "wells.csv", want)
		checkRefusal(t, err, test.err, test.hint)
	}
}

package plan

import (
	"reflect"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"
)

// source is the least that a plan needs.
const source = "[regions]\nfiles = \"data/*.csv\"\n"

func read(t *testing.T, text string) *Batch {
	t.Helper()
	b, err := ReadBatch([]byte(text), "plan.toml")
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// refusal holds an error to be a *PlanError with this message and hint.
func refusal(t *testing.T, err error, message, hint string) {
	t.Helper()
	e, ok := err.(*PlanError)
	if !ok {
		t.Fatalf("got %v, want %q", err, message)
	}
	if e.Error() != message || e.Hint() != hint {
		t.Errorf("got  %q\n     hint %q\nwant %q\n     hint %q", e.Error(), e.Hint(), message, hint)
	}
}

func TestReadBatch(t *testing.T) {
	b := read(t, `# what holds for every region
[defaults]
response = "cases"
people = 'residents'
smoothness = "pooled"
max_knots = 1_000
per = 1e5
strict = true
"seed" = 0x10
write = ["pictures", "csv"]
linear = [
	"height", # metres
	"slope",
]
category = "soil"
hold = ["height=mean", "slope=mean", "soil=clay"]

[regions]
files = ["data/*.csv", "more/?.csv"]
margin = "2.5 km"

[pictures]
breaks = [-1, 0, 2.5, 1e2]

[region.North]
title = "The North"

[ region . "Upper Vale" ]
observations = "upper.csv"
seed = 3

[region.2025]
`)
	want := say(t, "response cases", "people residents", "max-knots 1000", "per 100000", "strict true", "seed 16", "write csv,pictures",
		"linear height", "linear slope", "category soil", "hold height=mean", "hold slope=mean", "hold soil=clay")
	if !reflect.DeepEqual(b.Defaults, want) {
		t.Errorf("defaults: %v", b.Defaults.Effective())
	}
	if !b.Pooled || b.Own || b.File != "" || b.SplitBy != "" || b.Margin != 2500 || b.BreaksFile != "" {
		t.Errorf("got %+v", b)
	}
	if !slices.Equal(b.Patterns, []string{"data/*.csv", "more/?.csv"}) || !slices.Equal(b.Breaks, []float64{-1, 0, 2.5, 100}) {
		t.Errorf("patterns %q, breaks %v", b.Patterns, b.Breaks)
	}
	if len(b.Named) != 3 || b.Named[0].Name != "North" || b.Named[1].Name != "Upper Vale" || b.Named[2].Name != "2025" {
		t.Fatalf("regions: %+v", b.Named)
	}
	for i, want := range []Settings{say(t, "title The North"), say(t, "observations upper.csv", "seed 3"), {}} {
		if !reflect.DeepEqual(b.Named[i].Settings, want) {
			t.Errorf("%s: %v", b.Named[i].Name, b.Named[i].Settings.Effective())
		}
	}
	if !b.Names("Upper Vale") || b.Names("South") {
		t.Error("Names is wrong")
	}
}

func TestReadBatchOtherForms(t *testing.T) {
	b := read(t, "[regions]\nfile = 'all.csv'\nsplit_by = \"district\"\nmargin = 500\n[pictures]\nscale = \"own\"\n")
	if b.File != "all.csv" || b.SplitBy != "district" || b.Margin != 500 || !b.Own || b.Pooled || b.Patterns != nil || b.Breaks != nil {
		t.Errorf("got %+v", b)
	}
	b = read(t, "[pictures]\nscale = \"shared\"\nbreaks = \"2025/breaks.toml\"\n"+source+"[defaults]\nwrite = \"csv,pictures\"\nlinear = \"a, b\"\nhold = \"a, b=3\"")
	if b.Own || b.BreaksFile != "2025/breaks.toml" || b.Breaks != nil || !slices.Equal(b.Patterns, []string{"data/*.csv"}) ||
		!slices.Equal(b.Defaults.Write, []string{"csv", "pictures"}) || !slices.Equal(b.Defaults.Linear, []string{"a, b"}) {
		t.Errorf("got %+v", b)
	}
	// Regions with tables of their own need no other source, and may have a margin for all that.
	b = read(t, "\xef\xbb\xbf[regions]\r\nmargin = \"1km\"\r\n[region.A]\r\nobservations = \"a.csv\"\r\n")
	if b.Margin != 1000 || *b.Named[0].Settings.Observations != "a.csv" {
		t.Errorf("got %+v", b)
	}
	read(t, "[region.A]\nobservations = \"a.csv\"")
}

// TestReadBatchRefuses has each refusal with where it is, in what words, and with what advice.
func TestReadBatchRefuses(t *testing.T) {
	const (
		sections = "the sections are [defaults], [regions], [pictures] and [region.NAME]"
		regions  = "write [region.NAME] for a region by its name, or [regions] for where regions come from"
		quotes   = `text stands in quotes, as in response = "cases"`
		add      = `add files = "data/*.csv", or file and split_by, under [regions]`
		pool     = `leave it out, or leave out smoothness = "pooled" under [defaults]`
		stars    = "* stands for any letters, ? for one, [a-z] for one of those"
		inUTF8   = "save the plan as plain text in UTF-8"
	)
	tests := []struct{ name, text, message, hint string }{
		{"byte of 0", "[regions]\nfil\x00es", "line 2, column 4: is not text: there is a byte of 0", inUTF8},
		{"UTF-16", "\xff\xfe[\x00r\x00", "line 1, column 4: is not text: there is a byte of 0", inUTF8},
		{"Latin letters", "# für\n# f\xfcr", "line 2, column 4: is not text in UTF-8", inUTF8},

		{"bare text", "[defaults]\nresponse = cases", "line 2, column 12: cannot be read as TOML: unexpected character U+0063 'c' at start of value", quotes},
		{"bare text like nan", "[defaults]\nresponse = no", `line 2, column 12: cannot be read as TOML: expected keyword "nan"`, quotes},
		{"bare text like inf", "[defaults]\nresponse = infants", "line 2, column 15: cannot be read as TOML: expected newline but got U+0061 'a'", quotes},
		{"bare text like a number", "[defaults]\ntitle = 20s", "line 2, column 11: cannot be read as TOML: strings must be quoted", quotes},
		{"bare path", "[regions]\nfiles = ../x.csv", "line 2, column 9: cannot be read as TOML: unexpected character U+002E '.' at start of value", quotes},
		{"bare text in a list", "[defaults]\nwrite = [\"csv\", pictures]",
			"line 2, column 17: cannot be read as TOML: unexpected character U+0070 'p' at start of value", quotes},
		{"bare accent", "[defaults]\nresponse = élan", "line 2, column 12: cannot be read as TOML: unexpected character U+00E9 'é' at start of value", quotes},
		{"no value", "[defaults]\nresponse =\ntitle = \"x\"", "line 2, column 11: cannot be read as TOML: unexpected character U+000A at start of value", ""},
		{"two values", "[defaults]\ntitle = \"a\" \"b\"", `line 2, column 13: cannot be read as TOML: expected newline but got U+0022 '"'`, ""},
		{"leading zero", "[defaults]\nmax_knots = 012", "line 2, column 13: cannot be read as TOML: integers cannot have leading zeroes", ""},
		{"backslashes", "[regions]\nfiles = \"C:\\data\\*.csv\"", "line 2, column 12: cannot be read as TOML: invalid escape character U+0064 'd'",
			`a backslash in text is written twice, or the text stands in single quotes: 'C:\data\plots.csv'`},
		{"open quote", "[defaults]\ntitle = \"abc\npeople = \"n\"", "line 2, column 13: cannot be read as TOML: basic strings cannot have new lines", "a closing quote is missing"},
		{"open quotes", "[defaults]\ntitle = \"\"\"abc\n", `line 2, column 15: cannot be read as TOML: multiline basic string not terminated by """`, "a closing quote is missing"},
		{"open quote at the end", "[defaults]\ntitle = 'é", "line 2, column 10: cannot be read as TOML: unterminated literal string", "a closing quote is missing"},
		{"bare name", "[region.Upper Vale]", "line 1, column 15: cannot be read as TOML: expected ']' to close table name",
			`a name of more than letters a to z, digits, - and _ stands in quotes: [region."Upper Vale"]`},
		{"bare name with an accent", "[region.Ärva]", "line 1, column 9: cannot be read as TOML: invalid character at start of key: U+00C4 'Ä'",
			`a name of more than letters a to z, digits, - and _ stands in quotes: [region."Upper Vale"]`},
		{"open bracket", "[defaults", "line 1, column 9: cannot be read as TOML: expected ']' to close table name", ""},
		{"word behind a section", "[defaults] response = \"x\"", "line 1, column 12: cannot be read as TOML: expected newline but got U+0072 'r'", ""},

		{"nothing", "", "line 1, column 1: the plan names no regions", add + ", or a [region.NAME] with observations"},
		{"defaults alone", "\n[defaults]\nresponse = \"a\"", "line 1, column 1: the plan names no regions", add + ", or a [region.NAME] with observations"},
		{"sources without files", "[defaults]\n[regions]\nmargin = 3", "line 2, column 1: [regions]: names no files", add},
		{"region without a table", "[region.A]\nobservations = \"a.csv\"\n  [region.B]", "line 3, column 3: [region.B]: names no observations, and [regions] names no files",
			`add observations = "FILE" to it; or ` + add},
		{"files and file", "[regions]\nfiles = \"a\"\nfile = \"b\"", "line 3, column 1: file: stands beside files, and regions come from one of the two", "keep one of them"},
		{"file and files", "[regions]\nfile = \"b\"\nfiles = \"a\"", "line 3, column 1: files: stands beside file, and regions come from one of the two", "keep one of them"},
		{"files split", source + "split_by = \"a\"", "line 3, column 1: split_by: goes with file, and with files each file is a region", "leave it out, or name one table with file"},
		{"file not split", "[regions]\nfile = \"a\"", "line 2, column 1: file: is named without split_by",
			`add split_by = "COLUMN", the column that names the region of a row; for files that are a region each use files`},
		{"nothing split", "[regions]\nsplit_by = \"a\"", "line 2, column 1: split_by: is named without file", `add file = "FILE", the table with the rows of all regions`},

		{"unknown section", "[Upper]", "line 1, column 1: [Upper]: is no section of a plan", sections},
		{"unknown section of two names", "[Upper.Vale]", "line 1, column 1: [Upper.Vale]: is no section of a plan", sections},
		{"misspelt section", "[default]", "line 1, column 1: [default]: is no section of a plan", "did you mean [defaults]?"},
		{"misspelt region", "[regoin.\"Upper Vale\"]", `line 1, column 1: [regoin."Upper Vale"]: is no section of a plan`, `did you mean [region."Upper Vale"]?`},
		{"regions for region", "[regions.North]", "line 1, column 1: [regions.North]: has a section within a section", "did you mean [region.North]?"},
		{"region without a name", "[region]\ntitle = \"x\"", "line 1, column 1: [region]: names no region", regions},
		{"region of spaces", "[region.\"  \"]", `line 1, column 1: [region."  "]: has an empty name`, regions},
		{"region with a dot", "[region.St.Elm]", "line 1, column 1: [region.St.Elm]: has a section within a section", `a name with a dot in it stands in quotes: [region."St.Elm"]`},
		{"section in a section", "[pictures.x]", "line 1, column 1: [pictures.x]: has a section within a section", sections},
		{"two brackets", source + "\t[[region.\"a\\tb\"]]", `line 3, column 2: [[region."a\tb"]]: has two brackets, and a section has one`, `write [region."a\tb"]`},
		{"section twice", source + source, "line 3, column 1: [regions]: is there already, in line 1", "put its words together"},
		{"region twice", source + "[region.A]\n[region.\"A\"]", "line 4, column 1: [region.A]: is there already, in line 3", "put its words together"},
		{"word above sections", "max-knots = 3", "line 1, column 1: max-knots: stands before any section", "put it under [defaults]"},
		{"key above sections", " files = \"a\"", "line 1, column 2: files: stands before any section", "put it under [regions]"},
		{"banana above sections", "banana = 3", "line 1, column 1: banana: stands before any section", sections},
		{"inline section", "defaults = {response = \"x\"}", "line 1, column 1: defaults: stands before any section",
			"a section is a line of its own, such as [defaults] or [region.North], with its words below"},
		{"dotted section", "regions.files = \"x\"", "line 1, column 1: regions: stands before any section",
			"a section is a line of its own, such as [defaults] or [region.North], with its words below"},
		{"dotted key", "[region.A]\na.b = 1", "line 2, column 1: a: is followed by a dot, and no key here has parts", "a section has a line of its own; " + sections},

		{"hyphen", "[defaults]\nmax-knots = 3", "line 2, column 1: max-knots: is no word of [defaults]", "did you mean max_knots?"},
		{"misspelt", "[region.A]\nmax_knot = 3", "line 2, column 1: max_knot: is no word of [region.A]", "did you mean max_knots?"},
		{"hyphened key", "[regions]\nsplit-by = \"a\"", "line 2, column 1: split-by: is no word of [regions]", "did you mean split_by?"},
		{"misspelt key", "[pictures]\nscales = \"own\"", "line 2, column 1: scales: is no word of [pictures]", "did you mean scale?"},
		{"unknown key", "[pictures]\nbanana = \"own\"", "line 2, column 1: banana: is no word of [pictures]", "the keys of [pictures] are scale, breaks"},
		{"unknown word", "[defaults]\n\"b n\\n\" = 1", `line 2, column 1: "b n\n": is no word of [defaults]`, "drumlin map --help lists the words; in a plan they have underscores"},
		{"key of another section", "[defaults]\nfiles = \"x\"", "line 2, column 1: files: is no word of [defaults]", "it belongs under [regions]"},
		{"picture in a region", "[region.A]\nscale = \"own\"", "line 2, column 1: scale: is no word of [region.A]", "it belongs under [pictures]"},
		{"empty key", "[pictures]\n\"\" = 1", `line 2, column 1: "": is no word of [pictures]`, "the keys of [pictures] are scale, breaks"},
		{"word of another section", "[regions]\ntitle = \"x\"", "line 2, column 1: title: is no word of [regions]", "it belongs under [defaults]"},
		{"table of a source", "[regions]\nobservations = \"x\"", "line 2, column 1: observations: is no word of [regions]", "it belongs under a [region.NAME]"},
		{"table of all regions", "[defaults]\nobservations = \"x\"", "line 2, column 1: observations: cannot be the same for all regions",
			"name files under [regions], or observations in a [region.NAME]"},
		{"workers", "[defaults]\nworkers = 3", "line 2, column 1: workers: bears on how a batch is run, and is not said in a plan", "say --workers N on the command line"},
		{"force", "[region.A]\nforce = true", "line 2, column 1: force: bears on how a batch is run, and is not said in a plan", "say --force on the command line"},
		{"quiet", "[pictures]\nquiet = true", "line 2, column 1: quiet: bears on how a batch is run, and is not said in a plan", "say --quiet on the command line"},
		{"word twice", "[defaults]\nseed = 1\n\n\"seed\" = 2", "line 4, column 1: seed: is said already, in line 2", "keep one of the two"},
		{"key twice", source + "files = \"b\"", "line 3, column 1: files: is said already, in line 2", "keep one of the two"},

		{"number for text", "[defaults]\nresponse = 5", "line 2, column 12: response: takes text in quotes, not a number", `write response = "5"`},
		{"date for text", "[defaults]\ntitle = 2025-01-02", "line 2, column 9: title: takes text in quotes, not a date or a time", `write title = "2025-01-02"`},
		{"truth for text", "[defaults]\ntitle = true", "line 2, column 9: title: takes text in quotes, not true or false", `write title = "true"`},
		{"table for text", "[defaults]\nresponse = {a = 1}", "line 2, column 12: response: takes text in quotes, not a table", ""},
		{"list for text", "[defaults]\nresponse = [\"a\"]", "line 2, column 12: response: takes text in quotes, not a list", ""},
		{"text for a number", "[defaults]\nper = \"100\"", "line 2, column 7: per: takes a number without quotes, not text", ""},
		{"text for truth", "[defaults]\nstrict = \"yes\"", "line 2, column 10: strict: takes true or false without quotes, not text", ""},
		{"truth for either", "[defaults]\nmax_knots = true", "line 2, column 13: max_knots: takes a number or text in quotes, not true or false", ""},
		{"number for a list", "[defaults]\nlinear = 5", `line 2, column 10: linear: takes text in quotes, or a list of such, as in ["a", "b"], not a number`, `write linear = "5"`},
		{"number in a list", "[defaults]\nlinear = [\"a\",\n  5]", "line 3, column 3: linear: is a list of texts in quotes, and one is a number", `write "5"`},
		{"list in a list", "[defaults]\nlinear = [\"a\", [\"b\"]]", "line 2, column 10: linear: is a list of texts in quotes, and one is a list", ""},
		{"table in a list", "[defaults]\nlinear = [\"a\", {b = 1}]", "line 2, column 16: linear: is a list of texts in quotes, and one is a table", ""},
		{"empty list", "[defaults]\nwrite = []", "line 2, column 9: write: is an empty list", "leave it out"},
		{"long list", "[defaults]\nlinear = [" + strings.Repeat("'a',", 1001) + "]", "line 2, column 10: linear: is a list of 1001, and 1000 are the most", ""},
		{"bad value", "[defaults]\nmax_knots = 2", `line 2, column 13: max_knots: "2" is less than 4`, ""},
		{"bad value with a hint of flags", "[defaults]\nmax_knots = \"few\"", `line 2, column 13: max_knots: "few" is neither auto nor a whole number`, "leave out max_knots to let the fit decide"},
		{"bad element", "[defaults]\nwrite = [\"csv\", \"cvs\"]", `line 2, column 17: write: "cvs" is not one of csv, geojson, tif, pictures, saved`, "did you mean csv?"},
		{"bad part", "[defaults]\nwrite = \"csv,png\"", `line 2, column 9: write: "png" is not one of csv, geojson, tif, pictures, saved`, ""},
		{"bad hold", "[defaults]\nhold = [\"a=1\", \"b\"]", `line 2, column 16: hold: "b" is not of the form NAME=VALUE`, "for example depth=3.5, depth=mean or soil=commonest"},
		{"bad alternative", "[defaults]\nalso = \"max-knots=9; surface-pre=x\"", `line 2, column 8: also: "surface-pre" is no word in which a model can differ`, "did you mean surface_per?"},
		{"empty text", "[defaults]\ntitle = \"\"", "line 2, column 9: title: nothing is given", ""},
		{"part of a whole", "[defaults]\ncells_across = 2.0", `line 2, column 16: cells_across: "2.0" is not a whole number`, ""},
		{"beyond whole numbers", "[defaults]\nseed = 9223372036854775808", "line 2, column 8: seed: 9223372036854775808 is too large for a whole number of a plan", ""},
		{"no number", "[defaults]\nthreshold = nan", `line 2, column 13: threshold: "nan" is not a finite number`, ""},

		{"pattern", "[regions]\nfiles = \"a[\"", `line 2, column 9: files: "a[" is no pattern of file names`, stars},
		{"one of the patterns", "[regions]\nfiles = [\"é\", \"b[\"]", `line 2, column 15: files: "b[" is no pattern of file names`, stars},
		{"number of files", "[regions]\nfiles = 3", `line 2, column 9: files: takes text in quotes, or a list of such, as in ["a", "b"], not a number`, `write files = "3"`},
		{"blank pattern", "[regions]\nfiles = [\" \"]", `line 2, column 10: files: " " nothing is given`, ""},
		{"no patterns", "[regions]\nfiles = []", "line 2, column 9: files: is an empty list", "leave it out"},
		{"list of tables", "[regions]\nfile = [\"a.csv\"]", "line 2, column 8: file: takes text in quotes, not a list", ""},
		{"blank column", "[regions]\nsplit_by = \"\"", "line 2, column 12: split_by: nothing is given", ""},
		{"margin of 0", "[regions]\nmargin = 0", `line 2, column 10: margin: "0" is not above 0`, ""},
		{"margin below 0", "[regions]\nmargin = \"-5 km\"", `line 2, column 10: margin: "-5 km" is not above 0`, ""},
		{"margin in miles", "[regions]\nmargin = \"10 miles\"", `line 2, column 10: margin: "10 miles" is not a distance`, `write it as "10 km", "500 m" or a number of metres`},
		{"margin with a comma", "[regions]\nmargin = \"2,5 km\"", `line 2, column 10: margin: "2,5 km" is not a number`, "write a decimal point, not a comma"},
		{"margin without end", "[regions]\nmargin = inf", `line 2, column 10: margin: "inf" is not a distance`, `write it as "10 km", "500 m" or a number of metres`},
		{"margin beyond numbers", "[regions]\nmargin = \"1e308 km\"", `line 2, column 10: margin: "1e308 km" is not a finite number`, ""},
		{"margin beyond whole numbers", "[regions]\nmargin = 1_0000_0000_0000_0000_0000", "line 2, column 10: margin: 1_0000_0000_0000_0000_0000 is too large for a whole number of a plan", ""},
		{"margin or not", "[regions]\nmargin = true", "line 2, column 10: margin: takes a number or text in quotes, not true or false", ""},
		{"scale", "[pictures]\nscale = \"shred\"", `line 2, column 9: scale: "shred" is not one of shared, own`, "did you mean shared?"},
		{"number of a scale", "[pictures]\nscale = 3", "line 2, column 9: scale: takes text in quotes, not a number", `write scale = "3"`},
		{"one break", "[pictures]\nbreaks = [1]", "line 2, column 10: breaks: takes from 2 to 11 numbers", ""},
		{"12 breaks", "[pictures]\nbreaks = [1,2,3,4,5,6,7,8,9,10,11,12]", "line 2, column 10: breaks: takes from 2 to 11 numbers", ""},
		{"breaks that stay", "[pictures]\nbreaks = [1, 2.5, 2.5]", `line 2, column 19: breaks: "2.5" is not above 2.5, the one before it`, "let them rise"},
		{"breaks of text", "[pictures]\nbreaks = [1, \"2\"]", "line 2, column 14: breaks: takes numbers, not text", ""},
		{"breaks without end", "[pictures]\nbreaks = [1, inf]", `line 2, column 14: breaks: "inf" is not a finite number`, ""},
		{"break beyond numbers", "[pictures]\nbreaks = [1, 1e999]", `line 2, column 14: breaks: "1e999" is not a number`, ""},
		{"break beyond whole numbers", "[pictures]\nbreaks = [1, 99999999999999999999]", "line 2, column 14: breaks: 99999999999999999999 is too large for a whole number of a plan", ""},
		{"breaks or not", "[pictures]\nbreaks = false", "line 2, column 10: breaks: takes a list of numbers, or the path of a file in quotes, not true or false",
			"for example breaks = [0, 5, 10, 20]"},
		{"no file of breaks", "[pictures]\nbreaks = \"\"", "line 2, column 10: breaks: nothing is given", ""},
		{"breaks and scales", source + "[pictures]\nbreaks = [1, 2]\nscale = \"own\"", `line 4, column 1: breaks: are for all regions, and with scale = "own" each has its own`, "keep one of the two"},
		{"breaks of a file and scales", source + "[pictures]\nscale = \"own\"\nbreaks = \"b.toml\"", `line 5, column 1: breaks: are for all regions, and with scale = "own" each has its own`, "keep one of the two"},

		{"one region pooled", "[region.A]\nsmoothness = \"pooled\"", "line 2, column 14: smoothness: is pooled over all regions or not at all", `put smoothness = "pooled" under [defaults]`},
		{"pooled and own", source + "[region.A]\ntitle = \"A\"\nsmoothness = 3\n[defaults]\nsmoothness = \"pooled\"",
			"line 5, column 1: smoothness: is pooled under [defaults], and a region cannot have its own", pool},
		{"pooled without a surface", source + "[defaults]\nsmoothness = \"pooled\"\nsurface = \"none\"",
			"line 5, column 1: surface: is none, and smoothness is pooled: there is no surface to pool it with", pool},
		{"pooled and one without a surface", source + "[defaults]\nsmoothness = \"pooled\"\n[region.A]\nsurface = \"none\"",
			"line 6, column 1: surface: is none, and smoothness is pooled: there is no surface to pool it with", pool},
		{"pooled and each its own", source + "[defaults]\nsurface_smoothness = \"own\"\nsmoothness = \"pooled\"",
			"line 4, column 1: surface_smoothness: is own, and smoothness is pooled: one smoothness is for all surfaces", pool},
		{"pooled and uncertain", source + "[defaults]\nsmoothness_uncertainty = \"on\"\nsmoothness = \"pooled\"",
			"line 4, column 1: smoothness_uncertainty: is on, and smoothness is pooled: what all regions together have chosen is taken as known", pool},
		{"pooled and scaled", source + "[defaults]\nsmoothness = \"pooled\"\n[region.A]\nextra_variation = \"scale\"",
			"line 6, column 1: extra_variation: is scale, and smoothness is pooled: there is no restricted likelihood to pool where the variation is scaled", pool},

		{"column in letters", "[defaults]\n\t\"größe\"\t=\t3", `line 2, column 2: "größe": is no word of [defaults]`, "drumlin map --help lists the words; in a plan they have underscores"},
		{"column behind letters", "[defaults]\r\nlinear = ['größe', '木', '\t', 7]", `line 2, column 30: linear: is a list of texts in quotes, and one is a number`, `write "7"`},
		{"line behind lines", "\xef\xbb\xbf[defaults]\ntitle = \"\"\"\n\na\n\"\"\"\n\nseeds = 3", "line 7, column 1: seeds: is no word of [defaults]", "did you mean seed?"},
	}
	seen := map[string]bool{}
	for _, test := range tests {
		if seen[test.name] {
			t.Errorf("two cases named %q", test.name)
		}
		seen[test.name] = true
		t.Run(test.name, func(t *testing.T) {
			b, err := ReadBatch([]byte(test.text), "plan.toml")
			if b != nil {
				t.Error("a plan is returned beside the error")
			}
			refusal(t, err, "plan.toml: "+test.message, test.hint)
		})
	}
}

func TestReadBatchTooLarge(t *testing.T) {
	text := make([]byte, LargestPlan+1)
	for i := range text {
		text[i] = '\n'
	}
	_, err := ReadBatch(text, "plan.toml")
	refusal(t, err, "plan.toml: is larger than 64 MiB", "give regions their words by [defaults], and find their files with [regions]")
}

// TestFirstFaultCounts: a plan is refused for what comes first in it.
func TestFirstFaultCounts(t *testing.T) {
	_, err := ReadBatch([]byte("[defaults]\nseeds = 3\nresponse = cases"), "plan.toml")
	refusal(t, err, "plan.toml: line 2, column 1: seeds: is no word of [defaults]", "did you mean seed?")
}

func TestPlanErrorParts(t *testing.T) {
	_, err := ReadBatch([]byte("[defaults]\n max_knots = 2"), "plan.toml")
	e, ok := err.(*PlanError)
	if !ok || e.File != "plan.toml" || e.Line != 2 || e.Column != 14 || e.Key != "max_knots" || e.Message != `"2" is less than 4` || e.Hint() != "" {
		t.Errorf("got %+v", err)
	}
}

// TestInPlan: flags become keys, and what is somebody's own stays as it is.
func TestInPlan(t *testing.T) {
	for text, want := range map[string]string{
		"add --area-unit m2, ha or km2": "add area_unit m2, ha or km2",
		"cell-size is given as well":    "cell_size is given as well",
		"did you mean surface-per?":     "did you mean surface_per?",
		`"max-knots=few" has a part that cannot be: max-knots: "--max-knots \"" is it`: `"max-knots=few" has a part that cannot be: max_knots: "--max-knots \"" is it`,
		"add --hold max-knots=mean --hold b=mean, or --at":                             "add hold max-knots=mean hold b=mean, or at",
		"say --workers or --redo":                                                      "say --workers or --redo",
		"negative-binomial has no shape":                                               "negative-binomial has no shape",
		"(--per)":                                                                      "(per)",
		"":                                                                             "",
	} {
		if got := InPlan(text); got != want {
			t.Errorf("%s\ngot  %s\nwant %s", text, got, want)
		}
	}
}

// TestCursor counts places one by one, in whatever order they are asked for.
func TestCursor(t *testing.T) {
	text := []byte("\n[région]\r\n\t木 = 3\n\n")
	want := make([]place, len(text)+1)
	at := place{1, 1}
	for i, c := range text {
		want[i] = at
		switch {
		case c == '\n':
			at = place{at.line + 1, 1}
		case i+1 == len(text) || utf8.RuneStart(text[i+1]):
			at.column++
		}
	}
	want[len(text)] = at
	c := cursor{text: text}
	for _, step := range []int{1, 7, 5, len(text) - 1} { // none of them shares a factor with the number of offsets
		for k := range want {
			offset := k * step % len(want)
			if offset < len(text) && !utf8.RuneStart(text[offset]) {
				continue
			}
			if got := c.place(offset); got != want[offset] {
				t.Errorf("offset %d: got %v, want %v", offset, got, want[offset])
			}
		}
	}
}

package main

import (
	"bytes"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// laid writes files to a folder of their own, in which the test goes on.
func laid(t *testing.T, files map[string]string) {
	t.Helper()
	t.Chdir(t.TempDir())
	for name, text := range files {
		laidFile(t, name, text)
	}
}

func laidFile(t *testing.T, name, text string) {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(name), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(name, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

// typed carries out a command line within this process.
func typed(t *testing.T, args ...string) (code int, stdout, stderr string) {
	t.Helper()
	var out, told bytes.Buffer
	code = run(t.Context(), append([]string{"drumlin"}, args...), strings.NewReader(""), &out, &told)
	return code, out.String(), told.String()
}

// standing lists all that is below the current folder, with the texts of files.
func standing(t *testing.T) map[string]string {
	t.Helper()
	found := map[string]string{}
	err := filepath.WalkDir(".", func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			found[path] = "folder"
			return err
		}
		text, err := os.ReadFile(path)
		found[path] = string(text)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return found
}

// grove is a table of stems on plots, of n rows on a crooked lattice that begins at east.
func grove(east, n int) string {
	var b strings.Builder
	b.WriteString("x,y,stems,plot_ha\n")
	for k := range n {
		x, y := east+100*(k%6)+17*(k%4), 100*(k/6)+23*(k%5)
		b.WriteString(strings.Join([]string{strconv.Itoa(x), strconv.Itoa(y), strconv.Itoa(2 + (k*k+3*k)%7), "0.5"}, ",") + "\n")
	}
	return b.String()
}

// groves makes maps of them that take no time.
const groves = "[defaults]\nresponse = \"stems\"\narea = \"plot_ha\"\nmax_knots = 12\ncells_across = 10\nwrite = [\"csv\"]\n"

// TestBatchPlanRefused: what is wrong with a plan is told with its line and column and, unless the message says it all,
// with what to do; nothing is written.
func TestBatchPlanRefused(t *testing.T) {
	const files = "[regions]\nfiles = \"data/*.csv\"\n"
	const shared = "[regions]\nfile = \"all.csv\"\nsplit_by = \"district\"\n"
	laid(t, map[string]string{
		"data/ash.csv": grove(0, 24), "data/birch.csv": grove(700, 24), "more/ash.csv": grove(0, 24), "deep/.hidden.csv": grove(0, 24),
		"all.csv":     "district,x,y,stems,plot_ha\nUpper Vale,1,1,1,1\nLower Vale,1,1,1,1\n",
		"bare.csv":    "district,x,y,stem,plot_ha\nUpper Vale,1,1,1,1\n",
		"nobody.csv":  "district,x,y,stems,plot_ha\n,1,1,1,1\n NA,1,1,1,1\n",
		"header.csv":  "district,x,y,stems,plot_ha\n",
		"empty":       "",
		"breaks.toml": "[[breaks]]\npicture = \"map.png\"\nresponse = \"trees\"\nunit = \"trees\"\nedges = [0, 5, 10]\n",
	})
	for _, c := range []struct{ name, plan, message, hint string }{
		{"empty", "", "line 1, column 1: the plan names no regions", "under [regions]"},
		{"no regions", groves, "line 1, column 1: the plan names no regions", "under [regions]"},
		{"no TOML", groves + "[regions\nfiles = 1", "line 7, column 9: cannot be read as TOML", ""},
		{"no value", groves + "title =\n" + files, "line 7, column ", ""},
		{"a section twice", groves + files + "[defaults]\n", "line 9, column 1: [defaults]: is there already, in line 1", "put its words together"},
		{"a word outside", "response = \"stems\"\n" + files, "line 1, column 1: response: stands before any section", "under [defaults]"},
		{"no such word", groves + "max_nots = 3\n" + files, "line 7, column 1: max_nots: is no word of [defaults]", "did you mean max_knots?"},
		{"no such section", groves + "[regins]\nfiles = \"data/*.csv\"\n", "line 7, column 1: [regins]: is no section", "did you mean [regions]?"},
		{"a hyphen", groves + "max-knots = 3\n" + files, "line 7, column 1: max-knots: is no word", "did you mean max_knots?"},
		{"no region in brackets", groves + files + "[region]\n", "line 9, column 1: [region]: names no region", "write [region.NAME]"},
		{"a number for a text", "[defaults]\nresponse = 3\n" + files, "line 2, column 12: response: takes text in quotes, not a number", `write response = "3"`},
		{"a text for a number", groves + "per = \"many\"\n" + files, "line 7, column 7: per: takes a number without quotes, not text", ""},
		{"a list for a text", "[defaults]\nresponse = [\"a\"]\n" + files, "line 2, column 12: response: takes text in quotes, not a list", ""},
		{"too small", groves + "seed = -1\n" + files, "line 7, column 8: seed: \"-1\" is ", ""},
		{"not one of some", groves + "distribution = \"poison\"\n" + files, "line 7, column 16: distribution: \"poison\" is not one of", "did you mean poisson?"},
		{"two denominators", groves + "trials = \"n\"\n" + files, "line 7, column 1: trials: area is named as well", "keep"},
		{"two denominators by a region", groves + files + "[region.ash]\ntrials = \"n\"\n", "line 10, column 1: trials: area is named as well", "keep"},
		{"no response", "[defaults]\narea = \"plot_ha\"\n" + files, "line 1, column 1: response: the column with the response is not named", "response"},
		{"its own smoothness", groves + "smoothness = \"pooled\"\n" + files + "[region.ash]\nsmoothness = 3.0\n", "line 11, column 1: smoothness: is pooled under [defaults]", "leave it out"},

		{"no file", groves + "[regions]\nfiles = \"data/*.tsv\"\n", "line 8, column 9: files: \"data/*.tsv\" finds no file", "the folder of the plan"},
		{"no folder", groves + "[regions]\nfiles = [\"data/*.csv\", \"dat/*.csv\"]\n", "line 8, column 24: files: \"dat/*.csv\" finds no file: there is no folder dat", "the folder of the plan"},
		{"hidden files", groves + "[regions]\nfiles = \"deep/*.csv\"\n", "line 8, column 9: files: \"deep/*.csv\" finds no file", "the folder of the plan"},
		{"no pattern", groves + "[regions]\nfiles = \"data/[.csv\"\n", "line 8, column 9: files: \"data/[.csv\" is no pattern", "[a-z] for one of those"},
		{"one name twice", groves + "[regions]\nfiles = [\"data/*.csv\", \"more/*.csv\"]\n", "line 8, column 24: files: \"more/*.csv\" finds two regions called \"ash\": data/ash.csv and more/ash.csv", "rename one"},
		{"two tables", groves + files + "[region.ash]\nobservations = \"more/ash.csv\"\n", "line 10, column 1: observations: \"more/ash.csv\" is a second table", "leave it out"},
		{"a table that is not there", groves + files + "[region.elm]\nobservations = \"data/elm.csv\"\n", "line 10, column 1: observations: \"data/elm.csv\" is not there", "the folder of the plan"},
		{"a folder for a table", groves + files + "[region.elm]\nobservations = \"data\"\n", "line 10, column 1: observations: \"data\" is a folder", "name a file in it"},
		{"zones that are not there", groves + files + "[region.ash]\nzones = \"zones.geojson\"\n", "line 10, column 1: zones: \"zones.geojson\" is not there", "the folder of the plan"},
		{"zones below a file", groves + files + "[region.ash]\nzones = \"all.csv/zones.geojson\"\n", "line 10, column 1: zones: \"all.csv/zones.geojson\" is not there", "the folder of the plan"},
		{"zones of all that are not there", groves + "zones = \"zones.geojson\"\n" + files, "line 7, column 1: zones: \"zones.geojson\" is not there", "the folder of the plan"},
		{"a name that is no region", groves + files + "[region.ahs]\ntitle = \"x\"\n", "line 9, column 1: [region.ahs]: is no region of the plan", `did you mean "ash"?`},
		{"a name like none", groves + files + "[region.Marrowdale]\ntitle = \"x\"\n", "line 9, column 1: [region.Marrowdale]: is no region of the plan", "name its table with observations"},

		{"no shared table", groves + "[regions]\nfile = \"al.csv\"\nsplit_by = \"district\"\n", "line 8, column 1: file: \"al.csv\" is not there", "the folder of the plan"},
		{"a folder to share", groves + "[regions]\nfile = \"data\"\nsplit_by = \"district\"\n", "line 8, column 1: file: \"data\" is a folder", "name a file in it"},
		{"no column to split by", groves + "[regions]\nfile = \"all.csv\"\nsplit_by = \"distrct\"\n", `all.csv: line 1: no column "distrct" for the names of the regions`, `did you mean "district"?`},
		{"split by nothing", groves + "[regions]\nfile = \"all.csv\"\n", "line 8, column 1: file: is named without split_by", `add split_by = "COLUMN"`},
		{"split nothing", groves + "[regions]\nsplit_by = \"district\"\n", "line 8, column 1: split_by: is named without file", `add file = "FILE"`},
		{"shared and not", groves + files + "file = \"all.csv\"\n", "line 9, column 1: file: stands beside files", "keep one"},
		{"no response to share", groves + "[regions]\nfile = \"bare.csv\"\nsplit_by = \"district\"\n", `bare.csv: line 1: no column "stems" for the response`, `did you mean "stem"?`},
		{"no names in a shared table", groves + "[regions]\nfile = \"nobody.csv\"\nsplit_by = \"district\"\n", "line 9, column 1: split_by: \"district\" names no region", "check which column"},
		{"no rows to share", groves + "[regions]\nfile = \"header.csv\"\nsplit_by = \"district\"\n", "header.csv: line 1: no rows stand below the header", "check"},
		{"nothing to share", groves + "[regions]\nfile = \"empty\"\nsplit_by = \"district\"\n", "empty: the file is empty", "check"},
		{"no district of that name", groves + shared + "[region.\"uper vale\"]\ntitle = \"x\"\n", `line 10, column 1: [region."uper vale"]: is no region of the plan`, `did you mean "Upper Vale"?`},

		{"breaks of two units", groves + files + "[pictures]\nbreaks = [1, 2]\n[region.ash]\nunit_label = \"trees\"\n", "line 10, column 1: breaks: are one list, and the regions have 2 responses or units", "leave breaks out"},
		{"one break", groves + files + "[pictures]\nbreaks = [1]\n", "line 10, column 10: breaks: takes from 2 to 1", ""},
		{"breaks that fall", groves + files + "[pictures]\nbreaks = [3, 2]\n", "line 10, column 14: breaks: \"2\" is not above 3", "let them rise"},
		{"breaks beside their own", groves + files + "[pictures]\nscale = \"own\"\nbreaks = [1, 2]\n", "line 11, column 1: breaks: are for all regions", "keep one"},
		{"no scale", groves + files + "[pictures]\nscale = \"sharred\"\n", "line 10, column 9: scale: \"sharred\" is not one of shared, own", "did you mean shared?"},
		{"breaks that are not there", groves + files + "[pictures]\nbreaks = \"break.toml\"\n", "line 10, column 1: breaks: \"break.toml\" is not there", "the folder of the plan"},
		{"a folder of breaks", groves + files + "[pictures]\nbreaks = \"data\"\n", "line 10, column 1: breaks: \"data\" is a folder", "name a file in it"},
		{"no breaks", groves + files + "[pictures]\nbreaks = \"all.csv\"\n", "all.csv: line 1, column 9: ", "breaks are written like this"},
		{"breaks of something else", groves + files + "[pictures]\nbreaks = \"breaks.toml\"\n", "line 10, column 1: breaks: \"breaks.toml\" has no breaks for stems in stems per ha", "with this response and unit"},

		{"a margin in leagues", groves + files + "margin = \"10 leagues\"\n", "line 9, column 10: margin: \"10 leagues\" is not a distance", `write it as "10 km"`},
		{"a margin of a unit", groves + files + "margin = \"km\"\n", "line 9, column 10: margin: \"km\" is not a distance", `write it as "10 km"`},
		{"a margin below nothing", groves + files + "margin = -5\n", "line 9, column 10: margin: \"-5\" is not above 0", ""},
		{"a margin that is true", groves + files + "margin = true\n", "line 9, column 10: margin: takes a number or text in quotes, not true or false", ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			laidFile(t, "plan.toml", c.plan)
			before := standing(t)
			for _, args := range [][]string{{"--out", "maps"}, {"--check"}, {"--out", "maps", "--part", "1/2"}, {"--out", "maps", "--gather"}, {"--out", "maps", "--emit", "slurm"}} {
				code, stdout, stderr := typed(t, append([]string{"batch", "plan.toml"}, args...)...)
				first, advice, _ := strings.Cut(stderr, "\n")
				if code != exitRequest || stdout != "" || !message.MatchString(stderr) || insides.MatchString(stderr) ||
					!strings.Contains(first, c.message) || !strings.Contains(advice, c.hint) {
					t.Fatalf("%v: exit %d, standard output %q, told:\n%s", args, code, stdout, stderr)
				}
				if c.message[:4] == "line" && !strings.HasPrefix(first, "drumlin: plan.toml: line") {
					t.Errorf("the plan is not named: %s", first)
				}
			}
			if !maps.Equal(standing(t), before) {
				t.Errorf("something was written: %v", slices.Sorted(maps.Keys(standing(t))))
			}
		})
	}
}

// TestBatchPlanElsewhere: paths are taken from the folder of the plan, which may have signs in its name that stand for
// others in a pattern.
func TestBatchPlanElsewhere(t *testing.T) {
	laid(t, map[string]string{
		"Survey [2031] *?/plan.toml":    groves + "[regions]\nfiles = [\"data/*.csv\", \"../[o]ther/?ak.csv\"]\n[region.fir]\nobservations = \"../fir.csv\"\n",
		"Survey [2031] *?/data/ash.csv": grove(0, 24), "other/oak.csv": grove(700, 24), "other/.oak.csv": "", "fir.csv": grove(1400, 24),
	})
	code, stdout, stderr := typed(t, "batch", "Survey [2031] *?/plan.toml", "--out", "maps [a]", "--quiet")
	if code != exitDone || stdout+stderr != "" {
		t.Fatalf("exit %d: %s%s", code, stdout, stderr)
	}
	text, err := os.ReadFile("maps [a]/regions.csv")
	if err != nil {
		t.Fatal(err)
	}
	for _, start := range []string{"\nash,ash,", "\nother/oak,", "\nfir,fir,"} {
		if !strings.Contains(string(text), start) {
			t.Errorf("no row begins with %q:\n%s", start, text)
		}
	}
	laidFile(t, "Survey [2031] *?/plan.toml", groves+"[regions]\nfiles = \"dta/*.csv\"\n")
	if _, _, stderr := typed(t, "batch", "Survey [2031] *?/plan.toml", "--check"); !strings.Contains(stderr, "there is no folder dta\nhint: check the path: it is taken from the folder of the plan, Survey [2031] *?\n") {
		t.Errorf("told: %s", stderr)
	}
}

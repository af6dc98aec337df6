package draft_test

import (
	"bytes"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"drumlin/io/chart"
	"drumlin/io/draft"
)

func breaks(t testing.TB, list []draft.Breaks) string {
	t.Helper()
	var b bytes.Buffer
	if err := draft.WriteBreaks(&b, list); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// several breaks, in the order in which they are written.
func several() []draft.Breaks {
	return []draft.Breaks{
		{Picture: draft.MapFile, Response: "cases", Unit: "cases per 1000 people", Edges: []float64{0, 5, 10, 20}},
		{Picture: draft.UncertaintyFile, Response: "cases", Unit: "cases per 1000 people", Edges: []float64{1.0 / 3, math.Pi, 1e22}},
		{Picture: draft.RelativeFile, Response: "cases", Unit: "cases per 1000 people", Edges: []float64{0.33, 0.5, 0.67, 1.5, 2, 3}},
		{Picture: draft.MapFile, Response: "cases", Unit: `cases, "all" of 'them' µ`, Edges: []float64{math.Inf(-1), -2.5e-12, 5e-324, 1e299}},
		{Picture: draft.MapFile, Response: "line\nbreak \\ #", Unit: "", Edges: []float64{math.Nextafter(0.3, 0), 0.3, math.Nextafter(0.3, 1)}},
	}
}

func TestBreaksRoundTrip(t *testing.T) {
	text := breaks(t, several())
	got, err := draft.ReadBreaks([]byte(text), "breaks.toml")
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(several(), got, exactly...); diff != "" {
		t.Errorf("(-written +read):\n%s", diff)
	}
	random := rand.New(rand.NewPCG(1, 2))
	for range 20 {
		list := several()
		random.Shuffle(len(list), func(i, j int) { list[i], list[j] = list[j], list[i] })
		before := slices.Clone(list)
		if again := breaks(t, list); again != text {
			t.Fatalf("in another order the file differs:\n%s", again)
		}
		if diff := cmp.Diff(before, list, exactly...); diff != "" {
			t.Fatalf("writing changed the list:\n%s", diff)
		}
	}
	if list, err := draft.ReadBreaks([]byte(breaks(t, nil)), "breaks.toml"); err != nil || len(list) != 0 {
		t.Errorf("no breaks: %v %v", list, err)
	}
}

func TestBreaksFile(t *testing.T) {
	got := breaks(t, several()[:1])
	head, table, _ := strings.Cut(got, "\n\n")
	for _, line := range strings.Split(head, "\n") {
		if !strings.HasPrefix(line, "#") {
			t.Errorf("%q is no comment", line)
		}
	}
	if !strings.Contains(head, "#     [pictures]\n#     breaks = \"path/breaks.toml\"") {
		t.Errorf("the file does not say how it is pinned:\n%s", head)
	}
	const want = `[[breaks]]
picture = 'map.png'
response = 'cases'
unit = 'cases per 1000 people'
edges = [0.0, 5.0, 10.0, 20.0]
`
	if diff := cmp.Diff(want, table); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

// What SharedBreaks chooses is what the file takes.
func TestChosenBreaksAreTaken(t *testing.T) {
	sample := []chart.Sample{chart.NewSample(full(t).Relative, 20)}
	var list []draft.Breaks
	for picture, kind := range map[string]chart.Kind{draft.MapFile: chart.Level, draft.UncertaintyFile: chart.Uncertainty, draft.RelativeFile: chart.Ratio} {
		list = append(list, draft.Breaks{Picture: picture, Response: "r", Edges: chart.SharedBreaks(kind, sample)})
	}
	if _, err := draft.ReadBreaks([]byte(breaks(t, list)), "breaks.toml"); err != nil {
		t.Error(err)
	}
}

func TestReadBreaksByHand(t *testing.T) {
	const table = "[[breaks]]\npicture = \"map.png\"\nresponse = \"cases\"\n"
	for _, c := range []struct{ name, text, want string }{
		{"whole numbers and fractions", table + "edges = [0, 5, 7.5, 1e2, 1_000]", ""},
		{"in one line", `breaks = [{picture = "map.png", response = "cases", edges = [0, 5]}]`, ""},
		{"nothing", "", ""},
		{"cut short", table + "edges = [0, 5\n", "b.toml: line 4, column 14: array is incomplete"},
		{"not TOML", "[[breaks]]\npicture: map.png\n", "b.toml: line 2, column 8: "},
		{"not UTF-8", "\xff", "b.toml: line 1, column 1: "},
		{"a key twice", table + "edges = [0, 5]\nedges = [0, 6]\n", "b.toml: line 5, column 1: key edges is already defined"},
		{"an unknown key", table + "edge = [0, 5]\n", "b.toml: line 4, column 1: there is no key breaks.edge here; a table of breaks has picture, response, unit and edges"},
		{"an unknown table", "[pictures]\nscale = \"own\"\n", "b.toml: line 1, column 2: there is no key pictures here"},
		{"a number for a text", table + "unit = 5\nedges = [0, 5]\n", "b.toml: line 4, column 8: unit takes a text in quotes"},
		{"a number for a list", table + "edges = 5\n", "b.toml: line 4, column 9: edges takes a list of numbers"},
		{"a word in the list", table + "  edges = [0, \"five\"]\n", "b.toml: line 4, column 3: edges takes numbers, and number 2 is none"},
		{"lists in the list", table + "edges = [[0, 5]]\n", "b.toml: line 4, column 1: edges takes numbers, and number 1 is none"},
		{"breaks that are no tables", "breaks = [1]\n", "b.toml: line 1, column 11: breaks are tables"},
		{"edges that fall", table + "edges = [0, 5, 5]\n", "b.toml: line 4, column 1: breaks must increase: number 3 is 5"},
		{"one edge", table + "edges = [0]\n", "b.toml: line 4, column 1: 1 breaks given, from 2 to 11 can be shared"},
		{"no edges", table, "b.toml: line 1, column 3: 0 breaks given"},
		{"an edge that is no number", table + "edges = [0, nan]\n", "b.toml: line 4, column 1: breaks must increase: number 2 is NaN"},
		{"no response", "[[breaks]]\npicture = \"map.png\"\nedges = [0, 5]\n", "b.toml: line 1, column 3: no response is named"},
		{"an unknown picture", "[[breaks]]\n\tpicture = \"maps.png\"\nresponse = \"cases\"\nedges = [0, 5]\n",
			`b.toml: line 2, column 2: "maps.png" is none of the pictures that have breaks: map.png, uncertainty.png, relative-risk.png`},
		{"breaks of a chance", "[[breaks]]\npicture = \"chance.png\"\nresponse = \"cases\"\nedges = [0, 1]\n", "b.toml: line 2, column 1: chance.png always has the same classes"},
		{"the second of two", table + "edges = [0, 5]\n\n# as last year\n" + table + "unit = \"x\"\nedges = [5, 0]\n", "b.toml: line 11, column 1: breaks must increase"},
		{"the same twice", table + "edges = [0, 5]\n" + table + "edges = [0, 6]\n", "b.toml: line 5, column 3: breaks of map.png for cases in this unit stand here a second time"},
		{"wrong in one line", `breaks = [{picture = "map.png", response = "cases", edges = [5, 0]}]`, "b.toml: breaks must increase"},
	} {
		_, err := draft.ReadBreaks([]byte(c.text), "b.toml")
		if c.want == "" {
			if err != nil {
				t.Errorf("%s: %v", c.name, err)
			}
			continue
		}
		var located *draft.BreaksError
		if !errors.As(err, &located) || located.Hint() == "" || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("%s: %v, want %s", c.name, err, c.want)
		}
	}
}

func TestWriteBreaksRefusesWhatReadDoes(t *testing.T) {
	good := several()[0]
	for name, list := range map[string][]draft.Breaks{
		"a picture without breaks": {{Picture: "effects.png", Response: "cases", Edges: good.Edges}},
		"breaks of a chance":       {{Picture: draft.ChanceFile, Response: "cases", Edges: good.Edges}},
		"no response":              {{Picture: draft.MapFile, Edges: good.Edges}},
		"edges that fall":          {{Picture: draft.MapFile, Response: "cases", Edges: []float64{2, 1}}},
		"no edges":                 {{Picture: draft.MapFile, Response: "cases"}},
		"the same twice":           {good, several()[1], good},
	} {
		var b bytes.Buffer
		if err := draft.WriteBreaks(&b, list); err == nil || b.Len() != 0 {
			t.Errorf("%s: error %v with %d bytes written", name, err, b.Len())
		}
	}
}

// FuzzReadBreaks: what is taken is written and read again to the last bit; what is not says where in one line.
func FuzzReadBreaks(f *testing.F) {
	f.Add([]byte(breaks(f, several())))
	f.Add([]byte("[[breaks]]\npicture = \"map.png\"\nresponse = \"cases\"\nedges = [0, 5]\n"))
	f.Add([]byte("breaks = [{picture = \"map.png\", response = \"\\u00e9\", edges = [-inf, 0x5, 1_0.5]}]"))
	f.Add([]byte("[[breaks]]\n[[breaks.edges]]\n[breaks.\"e\\u0064ges\"]\na.b = 1\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		list, err := draft.ReadBreaks(text, "b.toml")
		if err != nil {
			var located *draft.BreaksError
			if !errors.As(err, &located) {
				t.Fatalf("%T %v", err, err)
			}
			return
		}
		again, err := draft.ReadBreaks([]byte(breaks(t, list)), "b.toml")
		if err != nil {
			t.Fatal(err)
		}
		less := func(a, b draft.Breaks) int {
			return strings.Compare(a.Response+"\x00"+a.Unit+"\x00"+a.Picture, b.Response+"\x00"+b.Unit+"\x00"+b.Picture)
		}
		slices.SortFunc(list, less)
		slices.SortFunc(again, less)
		if diff := cmp.Diff(list, again, exactly...); diff != "" {
			t.Fatal(diff)
		}
	})
}

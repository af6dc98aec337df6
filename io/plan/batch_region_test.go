package plan

import (
	"fmt"
	"reflect"
	"slices"
	"strings"
	"testing"
)

func region(t *testing.T, b *Batch, name, observations string) Settings {
	t.Helper()
	s, err := b.Region(name, observations, "plans")
	if err != nil {
		t.Fatal(err)
	}
	return s
}

const districts = `[defaults]
response = "cases"
people = "residents"
within = "edge.geojson"
[regions]
files = "data/*.csv"
[region.North]
title = "The North"
[region.South]
per = 1000
within = "/shapes/south.geojson"
[region.Vale]
observations = "vale.csv"
response = "pH"
`

func TestRegion(t *testing.T) {
	b := read(t, districts)
	resolved := func(said ...string) Settings {
		s, err := say(t, said...).Resolve()
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
	chosen := func(s Settings, title string) Settings {
		s.Choose("title", title, "each region's maps have its name behind what is mapped")
		return s
	}
	west := chosen(resolved("observations plans/data/west.csv", "response cases", "people residents", "within plans/edge.geojson"), "Cases, West")
	if got := region(t, b, "West", "data/west.csv"); !reflect.DeepEqual(got, west) {
		t.Errorf("west: %v", got.Effective())
	}
	north := resolved("observations /data/north.csv", "response cases", "people residents", "within plans/edge.geojson", "title The North")
	if got := region(t, b, "North", "/data/north.csv"); !reflect.DeepEqual(got, north) {
		t.Errorf("north: %v", got.Effective())
	}
	south := chosen(resolved("observations south.csv", "response cases", "people residents", "per 1000", "within /shapes/south.geojson"), "Cases, South")
	if got := region(t, b, "South", "../south.csv"); !reflect.DeepEqual(got, south) {
		t.Errorf("south: %v", got.Effective())
	}
	vale := chosen(resolved("observations plans/vale.csv", "response pH", "people residents", "within plans/edge.geojson"), "pH, Vale")
	if got := region(t, b, "Vale", "vale.csv"); !reflect.DeepEqual(got, vale) {
		t.Errorf("vale: %v", got.Effective())
	}
	if e, _ := entry(region(t, b, "West", "w.csv").Effective(), "title"); !e.Chosen || e.Value != "Cases, West" {
		t.Errorf("title recorded as %+v", e)
	}
	if e, _ := entry(region(t, b, "North", "n.csv").Effective(), "title"); e.Chosen || e.Value != "The North" {
		t.Errorf("title recorded as %+v", e)
	}
}

func TestRegionTitles(t *testing.T) {
	for _, test := range []struct{ defaults, own, want string }{
		{"response = 'cases'", "", "Cases, A"},
		{"response = 'élan'", "", "Élan, A"},
		{"response = 'pH'", "", "pH, A"},
		{"response = 'cases'\ntitle = 'Cases of flu'", "", "Cases of flu, A"},
		{"response = 'cases'\ntitle = 'Cases of flu'", "title = 'Here'", "Here"},
		{"response = 'cases'\ntitle = 'Cases of flu'", "seed = 3", "Cases of flu, A"},
		{"response = 'cases'", "response = 'deaths'", "Deaths, A"},
	} {
		b := read(t, source+"[defaults]\n"+test.defaults+"\n[region.A]\n"+test.own)
		if got := *region(t, b, "A", "a.csv").Title; got != test.want {
			t.Errorf("%q over %q: got %q, want %q", test.own, test.defaults, got, test.want)
		}
	}
}

// TestRegionPooled: a smoothness that is pooled is chosen elsewhere, so here it is what it is by default.
func TestRegionPooled(t *testing.T) {
	b := read(t, source+"[defaults]\nresponse = 'cases'\nsmoothness = 'pooled'\n[region.A]\nmax_knots = 9")
	for _, name := range []string{"A", "B"} {
		s := region(t, b, name, "x.csv")
		if *s.Smoothness != (Smoothness{By: ByREML}) || s.Said("smoothness") || !b.Pooled {
			t.Errorf("%s: %v", name, *s.Smoothness)
		}
	}
}

// TestRegionBothWays holds the settings that regions share to those that each would have by itself.
func TestRegionBothWays(t *testing.T) {
	b := read(t, districts+"[region.Hill]\nobservations = 'hill.csv'\n[region.Moor]\nobservations = 'moor.csv'\ntitle = 'The moor'\n")
	for _, name := range []string{"West", "North", "South", "Vale", "Hill", "Moor", "East"} {
		for _, dir := range []string{"", ".", "plans", "/plans/2025", "../plans/"} {
			for _, table := range []string{"a.csv", "data/../b.csv", "/data/c.csv", "./d e.csv"} {
				got, err := b.Region(name, table, dir)
				if err != nil {
					t.Fatal(err)
				}
				n := b.find(name)
				if n == nil {
					n = &Named{}
				}
				want, err := b.resolve(n, name, table, dir)
				if err != nil {
					t.Fatal(err)
				}
				if !reflect.DeepEqual(got, want) {
					t.Errorf("%s, %s in %s: got %v, want %v", name, table, dir, got.Effective(), want.Effective())
				}
			}
		}
	}
}

// TestRegionsAreApart: what is done to the settings of one region leaves those of others alone.
func TestRegionsAreApart(t *testing.T) {
	b := read(t, districts)
	one, two := region(t, b, "One", "one.csv"), region(t, b, "Two", "two.csv")
	one.Choose("distribution", "negative-binomial", "the counts scatter")
	one.Choose("title", "another", "for a test")
	if *two.Distribution != Poisson || *two.Title != "Cases, Two" || *two.Observations != "plans/two.csv" || two.why["distribution"] == "the counts scatter" {
		t.Errorf("got %v", two.Effective())
	}
	if three := region(t, b, "Three", "3.csv"); *three.Distribution != Poisson || *three.Title != "Cases, Three" {
		t.Errorf("got %v", three.Effective())
	}
}

// TestRegionRefuses has a combination of words refused at the word to blame.
func TestRegionRefuses(t *testing.T) {
	tests := []struct{ name, text, region, message, hint string }{
		{"no response", source + "[defaults]\npeople = 'n'", "A", "line 3, column 1: response: the column with the response is not named", "add response COLUMN"},
		{"no response and no defaults", source, "A", "line 1, column 1: response: the column with the response is not named", "add response COLUMN"},
		{"no response and no sections", "\n[region.B]\nobservations = 'b.csv'", "B", "line 1, column 1: response: the column with the response is not named", "add response COLUMN"},
		{"no response of a region", source + " [region.A]\nper = 3", "A", "line 3, column 2: response: the column with the response is not named", "add response COLUMN"},
		{"defaults among themselves", "[defaults]\nresponse = 'a'\n\tarea_unit = 'ha'\n" + source, "A", "line 3, column 2: area_unit: no area is named", "name the column with the area with area"},
		{"hint of keys", source + "[defaults]\nresponse = 'a'\narea = 'ground'", "A", `line 5, column 1: area: the unit of column "ground" is not given`, "add area_unit m2, ha or km2"},
		{"message of keys", source + "[defaults]\nresponse = 'a'\ncell_size = 5\ncells_across = 7", "A",
			"line 6, column 1: cells_across: cell_size is given as well and decides how many cells there are", "keep one of the two"},
		{"region over defaults", source + "[defaults]\nresponse = 'a'\nlink = 'logit'\n[region.A]\ntrials = 'n'\n[region.B]\nlink = 'log'\ntrials = 'n'", "B",
			"line 9, column 1: link: log does not go with binomial, which takes logit or complementary-log-log", "leave out link"},
		{"defaults under a region", source + "[defaults]\nresponse = 'a'\nthreshold = -1\n[region.\"A 1\"]\npeople = 'n'", "A 1",
			`line 5, column 1: threshold: the mean is above 0 everywhere, so it exceeds -1 with certainty, in region "A 1"`, "give a level above 0, in the unit of the map"},
		{"not said", source + "[defaults]\nresponse = 'a'\n[region.A]\nlinear = 'depth'", "A", "line 5, column 1: hold: the map has no values of depth",
			"add hold depth=mean, or name rasters that have them with layer, or a table of places with at"},
		{"not said by defaults", source + "[defaults]\nresponse = 'a'\nlinear = ['depth']", "A", "line 3, column 1: hold: the map has no values of depth",
			"add hold depth=mean, or name rasters that have them with layer, or a table of places with at"},
		{"alternative", source + "[defaults]\nresponse = 'a'\nalso = 'max-knots=few'", "A",
			`line 5, column 1: also: "max-knots=few" has a part that cannot be: max_knots: "few" is neither auto nor a whole number`, "leave out max_knots to let the fit decide"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			b := read(t, test.text)
			for range 2 { // the second time, what the regions share is there already
				s, err := b.Region(test.region, "a.csv", "")
				if !reflect.DeepEqual(s, Settings{}) {
					t.Error("settings are returned beside the error")
				}
				refusal(t, err, "plan.toml: "+test.message, test.hint)
			}
		})
	}
	// A region can make good what the defaults alone would be refused for.
	b := read(t, tests[7].text)
	if s := region(t, b, "A", "a.csv"); *s.Link != Logit {
		t.Errorf("got %v", s.Effective())
	}
}

func TestPositionAndFault(t *testing.T) {
	b := read(t, "[defaults]\n  seed = 3\n[regions]\nfiles = ['a/*.csv', # first\n\t'b/*.csv']\nmargin = 5\n[region.\"Upper.Vale\"]\ntitle = 'x'\n")
	for _, test := range []struct {
		section, key string
		line, column int
	}{
		{"defaults", "seed", 2, 3}, {"defaults", "", 1, 1}, {"regions", "files", 4, 1}, {"regions", "margin", 6, 1}, {"region.Upper.Vale", "title", 8, 1},
		{"region.Upper.Vale", "", 7, 1}, {"region.Upper.Vale", "seed", 0, 0}, {"regions", "file", 0, 0}, {"pictures", "", 0, 0}, {"region.A", "", 0, 0}, {"", "", 0, 0},
	} {
		line, column, ok := b.Position(test.section, test.key)
		if line != test.line || column != test.column || ok != (line > 0) {
			t.Errorf("%s %s: line %d, column %d, %v", test.section, test.key, line, column, ok)
		}
	}
	for _, test := range []struct{ section, key, value, message, want string }{
		{"regions", "files", "b/*.csv", "finds no file", `line 5, column 2: files: "b/*.csv" finds no file`},
		{"regions", "files", "", "find no file", "line 4, column 1: files: find no file"},
		{"regions", "margin", "5", "is more than there is", `line 6, column 1: margin: "5" is more than there is`},
		{"regions", "split_by", "district", "is no column", `line 3, column 1: split_by: "district" is no column`},
		{"region.Upper.Vale", "", "", "is no region", `line 7, column 1: [region."Upper.Vale"]: is no region`},
		{"region.Upper.Vale", "title", "x", "is long", `line 8, column 1: title: "x" is long`},
		{"pictures", "breaks", "", "cell-size counts, not --redo", "line 1, column 1: breaks: cell_size counts, not --redo"},
		{"pictures", "", "", "is not there", "line 1, column 1: [pictures]: is not there"},
	} {
		refusal(t, b.Fault(test.section, test.key, test.value, test.message, "say --max-knots"), "plan.toml: "+test.want, "say max_knots")
	}
}

func TestOrigin(t *testing.T) {
	b := read(t, districts+"zones = 'z.geojson'\n")
	for _, test := range []struct{ region, file, section, key string }{
		{"West", "plans/edge.geojson", "defaults", "within"},
		{"West", "plans/data/west.csv", "regions", "files"},
		{"South", "/shapes/south.geojson", "region.South", "within"},
		{"Vale", "plans/vale.csv", "region.Vale", "observations"},
		{"Vale", "plans/z.geojson", "region.Vale", "zones"},
	} {
		if section, key := b.Origin(test.region, test.file, "plans"); section != test.section || key != test.key {
			t.Errorf("%s of %s: %s %s", test.file, test.region, section, key)
		}
	}
	b = read(t, "[regions]\nfile = 'all.csv'\nsplit_by = 'd'")
	if section, key := b.Origin("A", "plans/all.csv", "plans"); section != "regions" || key != "file" {
		t.Errorf("got %s %s", section, key)
	}
}

// manyRegions is a plan with n regions of two keys each.
func manyRegions(n int) string {
	var b strings.Builder
	b.WriteString("[defaults]\nresponse = \"cases\"\npeople = \"residents\"\n")
	for i := range n {
		fmt.Fprintf(&b, "\n[region.\"District %d\"]\nobservations = \"data/%d.csv\"\ntitle = \"The district %d\"\n", i, i, i)
	}
	return b.String()
}

func TestManyRegions(t *testing.T) {
	const n = 3000
	b := read(t, manyRegions(n))
	if len(b.Named) != n {
		t.Fatalf("%d regions", len(b.Named))
	}
	for i, named := range b.Named {
		s := region(t, b, named.Name, *named.Settings.Observations)
		if *s.Observations != fmt.Sprintf("plans/data/%d.csv", i) || *s.Title != fmt.Sprintf("The district %d", i) {
			t.Fatalf("%s: %v", named.Name, s.Effective())
		}
		if line, column, _ := b.Position("region."+named.Name, "title"); line != 4*i+7 || column != 1 {
			t.Fatalf("%s: title in line %d, column %d", named.Name, line, column)
		}
	}
	names := b.Named
	if slices.ContainsFunc(names, func(n Named) bool { return !b.Names(n.Name) }) {
		t.Error("a region is not found by its name")
	}
}

func BenchmarkReadBatch(b *testing.B) {
	for _, n := range []int{1000, 100000} {
		text := []byte(manyRegions(n))
		b.Run(fmt.Sprintf("regions=%d", n), func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(len(text)))
			for range b.N {
				if _, err := ReadBatch(text, "plan.toml"); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkRegion resolves a region that says nothing of its own, one that has a title, and one with a word of the model.
func BenchmarkRegion(b *testing.B) {
	plan, err := ReadBatch([]byte(districts), "plan.toml")
	if err != nil {
		b.Fatal(err)
	}
	for _, name := range []string{"West", "North", "South"} {
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			for range b.N {
				if _, err := plan.Region(name, "data/a.csv", "/plans"); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// TestDefaultsGiveWay: a region's own words win over the defaults that they rule out. What is ruled out by another
// default, or by the region's own words among themselves, is refused as ever.
func TestDefaultsGiveWay(t *testing.T) {
	const plan = source + "[defaults]\nresponse = 'cases'\npeople = 'n'\nper = 1000\ncells_across = 50\nmax_knots = 40\nzones = 'z.geojson'\nzone_name = 'zone'\n"
	b := read(t, plan+"[region.A]\nat = 'posts.csv'\n[region.B]\nsurface = 'none'\n[region.C]\nat = 'posts.csv'\ncell_size = 5\n[region.D]\ntitle = 'D'\nmax_knots = 30")
	a, err := b.Region("A", "a.csv", ".")
	if err != nil || *a.At != "posts.csv" || a.Said("cells-across") || a.Zones != nil || a.ZoneName != nil || !a.Said("max-knots") {
		t.Errorf("with places of its own: %v, %+v", err, a)
	}
	without, err := b.Region("B", "b.csv", ".")
	if err != nil || *without.Surface != NoSurface || without.Said("max-knots") || !without.Said("cells-across") || without.Zones == nil {
		t.Errorf("without a surface: %v, %+v", err, without)
	}
	if _, err := b.Region("C", "c.csv", "."); err == nil || !strings.Contains(err.Error(), "cell_size") {
		t.Errorf("its own words against each other: %v", err)
	}
	other, err := b.Region("D", "d.csv", ".")
	if err != nil || other.Zones == nil || other.MaxKnots.N != 30 || *other.CellsAcross != 50 {
		t.Errorf("nothing is ruled out: %v, %+v", err, other)
	}
	b = read(t, source+"[defaults]\nresponse = 'cases'\nper = 1000\n[region.A]\nmax_knots = 9")
	if _, err := b.Region("A", "a.csv", "."); err == nil || !strings.Contains(err.Error(), "per") {
		t.Errorf("defaults that cannot be meant: %v", err)
	}
}

package main

import (
	"encoding/csv"
	"fmt"
	"maps"
	"os"
	"slices"
	"strings"
	"testing"
)

// ledgerOf reads ledger.csv: a map by column for each region.
func ledgerOf(t *testing.T, dir string) map[string]map[string]string {
	t.Helper()
	f, err := os.Open(dir + "/ledger.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	all, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	rows := map[string]map[string]string{}
	for _, record := range all[1:] {
		row := map[string]string{}
		for k, v := range record {
			row[all[0][k]] = v
		}
		rows[row["region"]] = row
	}
	return rows
}

// doneAgain are the regions that the last run did not find as they should be.
func doneAgain(t *testing.T, dir string) string {
	t.Helper()
	var list []string
	for name, row := range ledgerOf(t, dir) {
		if row["status"] != "unchanged" {
			list = append(list, name)
		}
	}
	slices.Sort(list)
	return strings.Join(list, " ")
}

// square is a file of one polygon that ends somewhere in the east.
func square(name string, east int) string {
	return fmt.Sprintf(`{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"name":%q},"geometry":{"type":"Polygon","coordinates":[[[120,60],[%d,60],[%d,350],[120,350],[120,60]]]}}]}`,
		name, east, east) + "\n"
}

// TestBatchChanges: a region is done again when a file changes that it uses, whichever that is, and no other region is.
func TestBatchChanges(t *testing.T) {
	// What is said of the cells of a lattice has no meaning with places, so it is not among the defaults.
	const plan = "[defaults]\nresponse = \"stems\"\narea = \"plot_ha\"\nmax_knots = 12\nwrite = [\"csv\"]\n" +
		"[region.ash]\nobservations = \"ash.csv\"\nzones = \"zones.geojson\"\ncells_across = 40\n" +
		"[region.birch]\nobservations = \"birch.csv\"\nwithin = \"land.geojson\"\ncells_across = 40\n" +
		"[region.cedar]\nobservations = \"cedar.csv\"\nwithin = \"land.geojson\"\ncells_across = 40\n" +
		"[region.elm]\nobservations = \"elm.csv\"\nat = \"posts.csv\"\n" +
		"[region.fir]\nobservations = \"fir.csv\"\ncells_across = 40\n" +
		"[region.gorse]\nobservations = \"gorse.csv\"\nzones = \"zones.geojson\"\nwithin = \"land.geojson\"\ncells_across = 40\n"
	laid(t, map[string]string{"plan.toml": plan, "zones.geojson": square("west", 300), "land.geojson": square("land", 500),
		"posts.csv": "post,x,y\nA,100,100\nB,300,200\n"})
	for k, name := range []string{"ash", "birch", "cedar", "elm", "fir", "gorse"} {
		laidFile(t, name+".csv", grove(20*k, 30))
	}
	batch := func(args ...string) string {
		t.Helper()
		code, stdout, stderr := typed(t, append([]string{"batch", "plan.toml", "--out", "maps"}, args...)...)
		if code != exitDone {
			t.Fatalf("exit %d: %s", code, stderr)
		}
		return stdout
	}
	batch()
	for _, c := range []struct {
		what, file, text, want string
	}{
		{"nothing", "notes.txt", "nothing to do with it", ""},
		{"observations", "fir.csv", grove(77, 31), "fir"},
		{"zones", "zones.geojson", square("west", 350), "ash gorse"},
		{"within", "land.geojson", square("land", 480), "birch cedar gorse"},
		{"places", "posts.csv", "post,x,y\nA,100,100\nB,300,201\n", "elm"},
		{"the plan, in what does not bear on results", "plan.toml", "# a comment\n" + plan, ""},
		{"the plan, in one region", "plan.toml", plan + "seed = 7\n", "gorse"},
		{"the plan, in all", "plan.toml", strings.Replace(plan, "max_knots = 12", "max_knots = 13", 1), "ash birch cedar elm fir gorse"},
	} {
		laidFile(t, c.file, c.text)
		told := batch("--check")
		n := len(strings.Fields(c.want))
		if changed := strings.Count(told, " changed\n"); changed != n {
			t.Errorf("%s: the check tells of %d changes, want %d:\n%s", c.what, changed, n, told)
		}
		before := standing(t)
		batch()
		if got := doneAgain(t, "maps"); got != c.want {
			t.Errorf("%s: done again are %q, want %q", c.what, got, c.want)
		}
		if n == 0 {
			after := standing(t)
			for _, files := range []map[string]string{before, after} {
				maps.DeleteFunc(files, func(name, _ string) bool { return strings.HasPrefix(name, "maps/ledger.") })
			}
			if !maps.Equal(before, after) {
				t.Errorf("%s: files have changed", c.what)
			}
		}
	}
}

// TestBatchCheckWritesNothing: not even a folder, a ledger or a lock, wherever the batch stands.
func TestBatchCheckWritesNothing(t *testing.T) {
	laid(t, map[string]string{"plan.toml": groves + "[regions]\nfiles = \"data/*.csv\"\nmargin = \"1 km\"\n",
		"data/ash.csv": grove(0, 24), "data/birch.csv": grove(700, 24), "data/cedar.csv": "x,y,stems,plot_ha\n"})
	check := func(when, want string, args ...string) {
		t.Helper()
		before := standing(t)
		code, stdout, stderr := typed(t, append([]string{"batch", "plan.toml", "--check"}, args...)...)
		if code != exitDone || stderr != "" || !strings.Contains(stdout, want) {
			t.Errorf("%s: exit %d, %q, %q", when, code, stdout, stderr)
		}
		if !maps.Equal(standing(t), before) {
			t.Errorf("%s: something was written", when)
		}
	}
	check("no folder is named", "3 regions, 3 new; nothing was run")
	check("there is no folder", "3 regions, 3 new; nothing was run", "--out", "deep/maps")
	if err := os.Mkdir("maps", 0o755); err != nil {
		t.Fatal(err)
	}
	check("the folder is empty", "3 regions, 3 new; nothing was run", "--out", "maps")
	typed(t, "batch", "plan.toml", "--out", "maps", "--part", "1/2", "--quiet")
	check("one part is done", "unchanged; nothing was run", "--out", "maps")
	check("one part is done, the other is asked", "2 regions, 2 new; nothing was run", "--out", "maps", "--part", "2/2")
	typed(t, "batch", "plan.toml", "--out", "maps", "--quiet")
	check("all is done", "3 regions, 1 failed before, 2 unchanged; nothing was run", "--out", "maps")
	check("one is to be done again", "1 to be done again, 1 unchanged", "--out", "maps", "--redo", "ash")
	laidFile(t, "data/ash.csv", grove(0, 25))
	check("a table has changed that lies within the margin of another", "3 regions, 2 changed, 1 failed before", "--out", "maps")
	if code, stdout, stderr := typed(t, "batch", "plan.toml", "--check", "--out", "maps", "--quiet"); code != exitDone || stdout+stderr != "" {
		t.Errorf("quiet: exit %d, %q, %q", code, stdout, stderr)
	}
}

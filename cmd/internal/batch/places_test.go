package batch

import (
	"encoding/json"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"drumlin/io/summary"
)

// twoShires are two blocks of 20 parishes side by side, a square kilometre each, with counts in all but one of each.
func twoShires() (counts, places string) {
	random := rand.New(rand.NewPCG(11, 4))
	var c, p strings.Builder
	c.WriteString("shire,parish,people,cases\n")
	p.WriteString(`{"type":"FeatureCollection","features":[`)
	for i := range 40 {
		x, y := float64(i/5), float64(i%5)
		shire := []string{"Upper", "Lower"}[i/20]
		if i > 0 {
			p.WriteString(",\n")
		}
		ring := fmt.Sprintf("[[%[1]v,%[2]v],[%[3]v,%[2]v],[%[3]v,%[4]v],[%[1]v,%[4]v],[%[1]v,%[2]v]]", 1000*x, 1000*y, 1000*x+1000, 1000*y+1000)
		fmt.Fprintf(&p, `{"type":"Feature","properties":{"name":"P%02d","shire":%q},"geometry":{"type":"Polygon","coordinates":[%s]}}`, i, shire, ring)
		if i%20 != 7 {
			fmt.Fprintf(&c, "%s,P%02d,%d,%d\n", shire, i, 500+random.IntN(3000), random.IntN(8))
		}
	}
	p.WriteString("]}")
	return c.String(), p.String()
}

const shiresPlan = `
[regions]
file = "counts.csv"
split_by = "shire"
[defaults]
response = "cases"
people = "people"
places = "parishes.geojson"
key = "parish=name"
crs = "local"
cells_across = 15
max_knots = 20
write = ["csv", "pictures"]
`

// TestPlacesOfRegions: a property of the name of split_by says which places are of a region; without it that a place has
// no row means nothing.
func TestPlacesOfRegions(t *testing.T) {
	counts, parishes := twoShires()
	plain := strings.ReplaceAll(parishes, `"shire":`, `"county":`)
	for _, c := range []struct {
		name, absent, places, want string
		rows                       int // of places.csv in each region
	}{
		{"missing", `absent = "missing"`, parishes, "Upper done, Lower done", 20},
		{"missing, not told apart", `absent = "missing"`, plain, "Upper done, Lower done", 19},
		{"not said, not told apart", "", plain, "Upper done, Lower done", 19},
		{"not said", "", parishes, "Upper failed, Lower failed", 0},
		{"zero, not told apart", `absent = "zero"`, plain, "Upper failed, Lower failed", 0},
	} {
		path := planted(t, shiresPlan+c.absent+"\n", map[string]string{"counts.csv": counts, "parishes.geojson": c.places})
		out := filepath.Join(t.TempDir(), "out")
		r := ran(t, path, out, Options{Workers: 2})
		if got := states(r); got != c.want {
			t.Errorf("%s: %s, want %s", c.name, got, c.want)
			for _, o := range r.Outcomes {
				t.Logf("%+v", o)
			}
			continue
		}
		for _, shire := range []string{"Upper", "Lower"} {
			if c.rows > 0 {
				if n := len(records(t, filepath.Join(out, shire, "places.csv"))); n != c.rows {
					t.Errorf("%s: %s has %d places, want %d", c.name, shire, n, c.rows)
				}
			}
		}
	}
}

// TestMarginOfPlaces: rows that lie where their places are have neighbours by them, and those are not reported.
func TestMarginOfPlaces(t *testing.T) {
	counts, parishes := twoShires()
	with := strings.Replace(shiresPlan, "[defaults]", "margin = \"1100 m\"\n[defaults]", 1) + "absent = \"missing\"\n"
	path := planted(t, with, map[string]string{"counts.csv": counts, "parishes.geojson": parishes})
	out := filepath.Join(t.TempDir(), "out")
	r := ran(t, path, out, Options{Workers: 1})
	for _, o := range r.Outcomes {
		var d summary.Document
		text, err := os.ReadFile(filepath.Join(out, o.Folder, "summary.json"))
		if err == nil {
			err = json.Unmarshal(text, &d)
		}
		if err != nil {
			t.Fatal(err)
		}
		if d.Region.MarginRows == 0 {
			t.Errorf("%s has no neighbours", o.Region)
		}
		if n := len(records(t, filepath.Join(out, o.Folder, "places.csv"))); n != 20 {
			t.Errorf("%s reports %d places", o.Region, n)
		}
	}
}

// TestLayersOfRegions: one raster serves all regions, and is part of what a region follows from.
func TestLayersOfRegions(t *testing.T) {
	raster := func(step float64) string {
		var b strings.Builder
		b.WriteString("ncols 30\nnrows 10\nxllcorner -500\nyllcorner -500\ncellsize 300\n")
		for j := range 10 {
			for i := range 30 {
				fmt.Fprintf(&b, "%v ", step*float64(i)+float64(j*j%7))
			}
			b.WriteByte('\n')
		}
		return b.String()
	}
	var both strings.Builder
	both.WriteString("vale,x,y,stems,plot_ha\n")
	for k, name := range []string{"ash", "birch"} {
		for _, line := range strings.Split(strings.TrimSuffix(vale(uint64(k+1), 50, 2500*float64(k)), "\n"), "\n")[1:] {
			both.WriteString(name + "," + line + "\n")
		}
	}
	path := planted(t, `
[regions]
file = "all.csv"
split_by = "vale"
[defaults]
response = "stems"
area = "plot_ha"
linear = "height"
layer = "height=height.asc"
max_knots = 20
cells_across = 15
write = "csv"
`, map[string]string{"all.csv": both.String(), "height.asc": raster(0.3)})
	out := filepath.Join(t.TempDir(), "out")
	if got := states(ran(t, path, out, Options{Workers: 2})); got != "ash look, birch look" && got != "ash done, birch done" {
		t.Fatal(got)
	}
	again := ran(t, path, out, Options{Workers: 1})
	rewrite(t, filepath.Join(filepath.Dir(path), "height.asc"), raster(0.5))
	changed := ran(t, path, out, Options{Workers: 1})
	if again.Tally.Unchanged != 2 || changed.Tally.Unchanged != 0 {
		t.Errorf("%d and %d regions unchanged", again.Tally.Unchanged, changed.Tally.Unchanged)
	}
}

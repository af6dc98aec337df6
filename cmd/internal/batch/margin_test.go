package batch

import (
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"drumlin/io/summary"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/geo"
)

// post is one row of an invented table on the globe.
type post struct {
	district string
	at       orb.Point
}

// posts are in four districts that meet at (lon, 60), some of them unusable for their coordinates.
func posts(lon float64, n int) ([]post, string) {
	random := rand.New(rand.NewPCG(11, 60))
	var list []post
	var b strings.Builder
	b.WriteString("district,lon,lat,cases,residents\n")
	for i := range n {
		dx, dy := 2*random.Float64()-1, 2*random.Float64()-1
		p := post{fmt.Sprintf("d%d%d", b2i(dx > 0), b2i(dy > 0)), orb.Point{math.Mod(lon+dx+540, 360) - 180, 60 + dy/2}}
		lat := fmt.Sprintf("%.6f", p.at[1])
		if i%40 == 7 {
			lat = "" // set aside, and nobody's neighbour
			p.at[1] = math.NaN()
		}
		list = append(list, p)
		fmt.Fprintf(&b, "%s,%.6f,%s,%d,%d\n", p.district, p.at[0], lat, random.IntN(9), 500+random.IntN(500))
	}
	return list, b.String()
}

func b2i(v bool) int {
	if v {
		return 1
	}
	return 0
}

const marginPlan = "[defaults]\nresponse = \"cases\"\npeople = \"residents\"\nmax_knots = 20\ncells_across = 10\nwrite = \"csv\"\n" +
	"[regions]\nfile = \"all.csv\"\nsplit_by = \"district\"\nmargin = %q\n"

// TestMargin: the rows that help a region are those of others within the distance, by great circles (haversine, of
// paulmach/orb), in the middle of the map and across the antimeridian; they are counted and not reported.
func TestMargin(t *testing.T) {
	for _, lon := range []float64{12, 180} {
		list, table := posts(lon, 400)
		path := planted(t, fmt.Sprintf(marginPlan, "9 km"), map[string]string{"all.csv": table})
		r := &runner{Batch: loaded(t, path), events: silent{}}
		if err := r.layMargin(t.Context()); err != nil {
			t.Fatal(err)
		}
		some := 0
		for i, g := range r.regions {
			parts, err := r.beyond(t.Context(), i)
			if err != nil {
				t.Fatal(err)
			}
			got := 0
			for _, p := range parts {
				got += p.Rows
			}
			want := 0
			for _, p := range list {
				near := slices.ContainsFunc(list, func(q post) bool {
					return q.district == g.name && geo.DistanceHaversine(p.at, q.at)*earth/orb.EarthRadius <= 9000
				})
				if p.district != g.name && near {
					want++
				}
			}
			if got != want {
				t.Errorf("at %g, %s: %d rows of neighbours, want %d", lon, g.name, got, want)
			}
			some += want
		}
		if some < 20 {
			t.Errorf("at %g: only %d rows help their neighbours", lon, some)
		}
	}
}

func TestMarginIsNotReported(t *testing.T) {
	_, table := posts(12, 400)
	out := filepath.Join(t.TempDir(), "maps")
	ran(t, planted(t, fmt.Sprintf(marginPlan, "9 km"), map[string]string{"all.csv": table}), out, Options{})
	apart := filepath.Join(t.TempDir(), "maps")
	ran(t, planted(t, strings.Replace(fmt.Sprintf(marginPlan, "1 km"), "margin = \"1 km\"\n", "", 1), map[string]string{"all.csv": table}), apart, Options{})
	read := func(dir string) (d summary.Document) {
		text, err := os.ReadFile(filepath.Join(dir, "d01", "summary.json"))
		if err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(text, &d); err != nil {
			t.Fatal(err)
		}
		return d
	}
	with, without := read(out), read(apart)
	if with.Region.MarginRows < 5 || without.Region.MarginRows != 0 {
		t.Errorf("%d and %d rows of neighbours", with.Region.MarginRows, without.Region.MarginRows)
	}
	if with.Input.Rows != without.Input.Rows || with.Input.Used != without.Input.Used || with.Input.SHA256 != without.Input.SHA256 {
		t.Errorf("the input is %+v and without a margin %+v", with.Input, without.Input)
	}
	if with.Lattice != without.Lattice && fmt.Sprint(with.Lattice) != fmt.Sprint(without.Lattice) {
		t.Errorf("the lattice is %+v and without a margin %+v", with.Lattice, without.Lattice)
	}
	if with.Estimates.Median == without.Estimates.Median {
		t.Error("the neighbours have not helped")
	}
	rows := records(t, filepath.Join(out, "d01", "residuals.csv"))
	if len(rows) != with.Input.Used {
		t.Errorf("%d residuals for %d rows", len(rows), with.Input.Used)
	}
	for _, row := range rows {
		if row["x"] > "12" || row["y"] < "60" { // d01 is west of 12 and north of 60; all have as many digits
			t.Fatalf("a residual of a neighbour's: %v", row)
		}
	}
	if !slices.ContainsFunc(with.Cautions, func(c string) bool { return strings.Contains(c, "observations of neighbouring regions") }) {
		t.Errorf("no caution of it: %q", with.Cautions)
	}
}

// TestMarginFollowsNeighbours: a changed row near the border redoes the neighbour too, one far from it does not.
func TestMarginFollowsNeighbours(t *testing.T) {
	tables := map[string]string{"data/ash.csv": vale(1, 60, 0), "data/birch.csv": vale(2, 60, 2000), "data/cedar.csv": vale(3, 60, 4000)}
	path := planted(t, strings.Replace(valesPlan, `["csv", "pictures"]`, `"csv"`, 1)+"margin = \"300 m\"\n", tables)
	out := filepath.Join(t.TempDir(), "maps")
	ran(t, path, out, Options{})
	ash := filepath.Join(filepath.Dir(path), "data", "ash.csv")
	for _, c := range []struct{ row, redone string }{{"1990.0,1000.0,7,0.5\n", "ash birch"}, {"100.0,100.0,7,0.5\n", "ash"}} {
		tables["data/ash.csv"] += c.row
		rewrite(t, ash, tables["data/ash.csv"])
		heard := &listener{}
		if _, err := loaded(t, path).Run(t.Context(), out, Options{}, heard); err != nil {
			t.Fatal(err)
		}
		slices.Sort(heard.fresh)
		if got := strings.Join(heard.fresh, " "); got != c.redone {
			t.Errorf("with the row %q: done again are %q, want %q", c.row, got, c.redone)
		}
	}
}

func TestMarginMixed(t *testing.T) {
	tables := map[string]string{"data/ash.csv": vale(1, 60, 0), "data/birch.csv": "lon,lat,stems,plot_ha\n12,60,3,1\n12.1,60,4,1\n12.1,60.1,4,1\n12,60.1,4,1\n"}
	path := planted(t, valesPlan+"margin = 300\n", tables)
	_, err := loaded(t, path).Run(t.Context(), filepath.Join(t.TempDir(), "maps"), Options{}, silent{})
	if err == nil || !strings.Contains(err.Error(), "plan.toml: line 10, column 1: margin: needs all regions in coordinates of one kind") {
		t.Error(err)
	}
}

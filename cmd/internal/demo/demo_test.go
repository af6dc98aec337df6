package demo

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// TestWrite: the files are there, well formed, and the same the second time.
func TestWrite(t *testing.T) {
	first, second := t.TempDir(), t.TempDir()
	for _, dir := range []string{first, second} {
		if err := Write(dir); err != nil {
			t.Fatal(err)
		}
	}
	var names []string
	err := filepath.WalkDir(first, func(path string, d os.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			name, _ := filepath.Rel(first, path)
			names = append(names, filepath.ToSlash(name))
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	want := []string{"commands.txt", "data/plots.csv", "data/villages.csv", "data/zones.geojson"}
	if !slices.Equal(names, want) {
		t.Fatalf("wrote %q", names)
	}
	for _, name := range names {
		a, b := read(t, first, name), read(t, second, name)
		if !bytes.Equal(a, b) {
			t.Errorf("%s differs from run to run", name)
		}
	}
	for name, rows := range map[string]int{"data/plots.csv": 1 + plotCount, "data/villages.csv": 1 + villageCount} {
		table, err := csv.NewReader(bytes.NewReader(read(t, first, name))).ReadAll()
		if err != nil || len(table) != rows {
			t.Errorf("%s: %d rows, %v", name, len(table), err)
		}
	}
	if err := Write(first); err == nil {
		t.Error("a folder that has data in it is written over")
	}
	if err := Write(filepath.Join(first, "missing")); err == nil {
		t.Error("a folder that is not there is no error")
	}
}

func read(t *testing.T, dir, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// TestUnusableRows counts the rows in which something other than a fitting number stands: between 3 and 5 of each.
func TestUnusableRows(t *testing.T) {
	plots := plotTable(Plots(seed, plotCount))
	villages := villageTable(Villages(seed, villageCount))
	for name, table := range map[string][][]string{"plots": plots, "villages": villages} {
		bad := 0
		for _, row := range table[1:] {
			for j, cell := range row[1:] {
				v, err := strconv.ParseFloat(cell, 64)
				positive := slices.Contains([]string{"plot_ha", "residents"}, table[0][j+1])
				if err != nil || (positive && v <= 0) {
					bad++
				}
			}
		}
		if bad < 3 || bad > 5 {
			t.Errorf("%s: %d unusable rows", name, bad)
		}
	}
}

// TestPlotsArePlausible checks the plots against what a survey of the kind would bring: sizes and depths as they occur,
// and counts that scatter about the density they were drawn from as Poisson counts do. The sum of (count - mean)^2 /
// mean over n plots has mean n and a variance of 2 n + sum 1/mean.
func TestPlotsArePlausible(t *testing.T) {
	plots := Plots(seed, plotCount)
	names := map[string]bool{}
	var pearson, variance, depth float64
	var none int
	for _, p := range plots {
		names[p.Name] = true
		if math.Hypot(p.X-islandX, p.Y-islandY) > 2800 || p.Depth < 3 || p.Depth > 150 || p.Hectares < 0.02 || p.Hectares > 0.0625 {
			t.Errorf("%+v", p)
		}
		mean := p.Hectares * Density(p.X, p.Y, p.Depth)
		pearson += (float64(p.Plants) - mean) * (float64(p.Plants) - mean) / mean
		variance += 2 + 1/mean
		depth += p.Depth / plotCount
		if p.Plants == 0 {
			none++
		}
	}
	if len(names) != plotCount {
		t.Error("plots share a name")
	}
	if math.Abs(pearson-plotCount) > 3*math.Sqrt(variance) {
		t.Errorf("scatter of the counts: %.0f for %d plots", pearson, plotCount)
	}
	if depth < 40 || depth > 80 {
		t.Errorf("mean depth %.1f", depth)
	}
	if none > plotCount/10 {
		t.Errorf("%d plots without a plant", none)
	}
}

func TestVillagesArePlausible(t *testing.T) {
	villages := Villages(seed, villageCount)
	names := map[string]bool{}
	places := map[[2]float64]bool{}
	var pearson, variance, residents, cases float64
	for _, v := range villages {
		names[v.Name] = true
		places[[2]float64{v.Lon, v.Lat}] = true
		// The banks lie within 60 km of a place in the open ocean.
		east, north := kilometres(v.Lon, v.Lat)
		if math.Hypot(east, north) > 60 || v.Residents < 40 || v.Residents > 9000 || v.Cases > v.Residents/10 {
			t.Errorf("%+v", v)
		}
		mean := float64(v.Residents) * Rate(v.Lon, v.Lat)
		pearson += (float64(v.Cases) - mean) * (float64(v.Cases) - mean) / mean
		variance += 2 + 1/mean
		residents += float64(v.Residents)
		cases += float64(v.Cases)
	}
	if len(names) != villageCount || len(places) != villageCount {
		t.Errorf("%d names and %d places for %d villages", len(names), len(places), villageCount)
	}
	if math.Abs(pearson-villageCount) > 3*math.Sqrt(variance) {
		t.Errorf("scatter of the cases: %.0f for %d villages", pearson, villageCount)
	}
	if rate := 1000 * cases / residents; rate < 2 || rate > 6 {
		t.Errorf("%.2f cases per 1000 residents", rate)
	}
}

func TestSeedsDiffer(t *testing.T) {
	if slices.Equal(Plots(1, 20), Plots(2, 20)) || !slices.Equal(Plots(1, 20), Plots(1, 20)) {
		t.Error("plots do not follow the seed")
	}
	if slices.Equal(Villages(1, 20), Villages(2, 20)) || !slices.Equal(Villages(1, 20), Villages(1, 20)) {
		t.Error("villages do not follow the seed")
	}
}

// TestZones: three closed rings, anticlockwise as RFC 7946 (section 3.1.6) wants them, that share their borders and
// hold most of the plots, no plot lying in two.
func TestZones(t *testing.T) {
	text, err := json.Marshal(zones())
	if err != nil {
		t.Fatal(err)
	}
	var back struct {
		Type     string
		Features []struct {
			Type       string
			Properties struct{ Zone string }
			Geometry   struct {
				Type        string
				Coordinates [][][2]float64
			}
		}
	}
	if err := json.Unmarshal(text, &back); err != nil {
		t.Fatal(err)
	}
	if back.Type != "FeatureCollection" || len(back.Features) != 3 {
		t.Fatalf("%s of %d", back.Type, len(back.Features))
	}
	var rings [][][2]float64
	var whole float64
	for _, f := range back.Features {
		if f.Type != "Feature" || f.Geometry.Type != "Polygon" || len(f.Geometry.Coordinates) != 1 || f.Properties.Zone == "" {
			t.Fatalf("%+v", f)
		}
		ring := f.Geometry.Coordinates[0]
		if ring[0] != ring[len(ring)-1] {
			t.Errorf("%s is not closed", f.Properties.Zone)
		}
		area := area(ring)
		if area < 2e6 {
			t.Errorf("%s: area %.0f, negative if clockwise", f.Properties.Zone, area)
		}
		whole += area
		rings = append(rings, ring)
	}
	for i, ring := range rings {
		next := rings[(i+1)%len(rings)]
		if ring[len(ring)-2] != next[1] {
			t.Errorf("zones %d and %d do not share a corner: %v, %v", i, (i+1)%len(rings), ring[len(ring)-2], next[1])
		}
	}
	inside := 0
	for _, p := range Plots(seed, plotCount) {
		in := 0
		for _, ring := range rings {
			if within(ring, p.X, p.Y) {
				in++
			}
		}
		if in > 1 {
			t.Errorf("%s lies in %d zones", p.Name, in)
		}
		inside += in
	}
	// The rings are the island shrunk to 0.9, so evenly spread plots lie in them with probability 0.81.
	if share := float64(inside) / plotCount; math.Abs(share-0.81) > 3*math.Sqrt(0.81*0.19/plotCount) {
		t.Errorf("%.2f of the plots lie in zones, of %.1f km2", share, whole/1e6)
	}
}

// area is the shoelace formula, positive for anticlockwise rings.
func area(ring [][2]float64) float64 {
	var sum float64
	for i := range ring[1:] {
		sum += ring[i][0]*ring[i+1][1] - ring[i+1][0]*ring[i][1]
	}
	return sum / 2
}

// within counts crossings of a ray to the east.
func within(ring [][2]float64, x, y float64) bool {
	in := false
	for i := range ring[1:] {
		a, b := ring[i], ring[i+1]
		if (a[1] > y) != (b[1] > y) && x < a[0]+(y-a[1])/(b[1]-a[1])*(b[0]-a[0]) {
			in = !in
		}
	}
	return in
}

// TestTruthIsSmooth: neither truth changes by more than a tenth over a fortieth of its range, and both vary at least
// fourfold, so that there is something to see.
func TestTruthIsSmooth(t *testing.T) {
	step := func(name string, at func(i, j int) float64) {
		least, most := math.Inf(1), 0.0
		for i := range 200 {
			for j := range 200 {
				v, east, north := at(i, j), at(i+1, j), at(i, j+1)
				least, most = min(least, v), max(most, v)
				if math.Abs(math.Log(east/v)) > 0.1 || math.Abs(math.Log(north/v)) > 0.1 {
					t.Fatalf("%s jumps at %d, %d", name, i, j)
				}
			}
		}
		if most/least < 4 || most/least > 40 {
			t.Errorf("%s runs from %.3g to %.3g", name, least, most)
		}
	}
	step("density", func(i, j int) float64 { return Density(600+26*float64(i), 26*float64(j), 60) })
	step("rate", func(i, j int) float64 { return Rate(middleLon-0.7+0.007*float64(i), middleLat-0.35+0.0035*float64(j)) })
}

func TestScript(t *testing.T) {
	script := Script(Commands())
	if strings.Count(script, "\ndrumlin map ") != len(Commands()) || strings.ContainsAny(script, "\r\t") {
		t.Error(script)
	}
	for _, c := range Commands() {
		for _, a := range c.Args {
			if strings.Contains(a, "'") {
				t.Errorf("%q cannot be quoted", a)
			}
		}
	}
	if got := (Command{Args: []string{"map", "a b", "", "x=-3", "per ha"}}).Line(); got != "drumlin map 'a b' '' x=-3 'per ha'" {
		t.Error(got)
	}
}

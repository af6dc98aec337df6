package demo

import (
	"bytes"
	"cmp"
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"drumlin/io/plan"

	"github.com/pelletier/go-toml/v2"
)

// The margin of the plan, in kilometres.
const margin = 10

// TestWriteBatch: the files are there, the same the second time, and nothing is written over.
func TestWriteBatch(t *testing.T) {
	first, second := t.TempDir(), t.TempDir()
	for _, dir := range []string{first, second} {
		if err := WriteBatch(dir); err != nil {
			t.Fatal(err)
		}
	}
	names := []string{"commands.txt", "data/posts.csv", "plan.toml"}
	for _, name := range names {
		if !bytes.Equal(read(t, first, name), read(t, second, name)) {
			t.Errorf("%s differs from run to run", name)
		}
	}
	if entries, err := os.ReadDir(first); err != nil || len(entries) != len(names) {
		t.Errorf("%v, %v", entries, err)
	}
	rows, err := csv.NewReader(bytes.NewReader(read(t, first, "data/posts.csv"))).ReadAll()
	if err != nil || len(rows) != 1+len(Posts(seed)) {
		t.Errorf("%d rows, %v", len(rows), err)
	}
	if err := WriteBatch(first); err == nil {
		t.Error("a folder that has data in it is written over")
	}
	if err := WriteBatch(filepath.Join(first, "missing")); err == nil {
		t.Error("a folder that is not there is no error")
	}
}

// byDistrict has the rows of the table under each name in the column district.
func byDistrict() map[string][][]string {
	rows := map[string][][]string{}
	for _, row := range postTable(Posts(seed))[1:] {
		rows[row[0]] = append(rows[row[0]], row)
	}
	return rows
}

func TestDistricts(t *testing.T) {
	rows := byDistrict()
	if blank := len(rows[""]); blank != 4 {
		t.Errorf("%d rows without a district", blank)
	}
	delete(rows, "")
	if len(rows) != 24 {
		t.Errorf("%d districts", len(rows))
	}
	all := 0
	least, most := math.MaxInt, 0
	for name, r := range rows {
		all += len(r)
		if name != tiny {
			least, most = min(least, len(r)), max(most, len(r))
		}
	}
	if least < 40 || least > 60 || most < 500 || most > 600 || len(rows[tiny]) != 3 || all < 3800 || all > 4300 {
		t.Errorf("%d rows, %d to %d in a district, %d in the smallest", all, least, most, len(rows[tiny]))
	}
	folded := map[string]int{}
	awkward := 0
	for name := range rows {
		folded[strings.ToLower(name)]++
		if strings.Contains(name, "/") {
			awkward++
		}
	}
	if len(folded) != 23 || folded["marrow"] != 2 || awkward != 1 {
		t.Errorf("%d names apart from case, %d with a slash", len(folded), awkward)
	}
}

// TestSlips: rows that cannot be used are in two districts only, a few per cent in the one, all but two in the other.
func TestSlips(t *testing.T) {
	for name, rows := range byDistrict() {
		bad := 0
		for _, row := range rows {
			if !usable(row) {
				bad++
			}
		}
		switch share := float64(bad) / float64(len(rows)); {
		case name == careless && (share < 0.02 || share > 0.05), name == tiny && len(rows)-bad != 2, name != careless && name != tiny && bad > 0:
			t.Errorf("%q: %d of %d rows cannot be used", name, bad, len(rows))
		}
	}
}

// usable tells whether lon, lat and cases are numbers, cases are 0 or more, and residents more than 0.
func usable(row []string) bool {
	var v [4]float64
	for j := range v {
		var err error
		if v[j], err = strconv.ParseFloat(row[2+j], 64); err != nil {
			return false
		}
	}
	return v[2] > 0 && v[3] >= 0
}

// TestPostsArePlausible: names and places are distinct, places are within 165 km east and 110 km north of the middle, and
// cases scatter about the rate as they were meant to. The sum of (cases - mean)^2 / variance over n posts has mean n; a
// term's own variance is 2 plus the excess kurtosis, which for a negative-binomial count is 6/theta + 1/variance (Johnson,
// Kemp & Kotz 2005, Univariate Discrete Distributions, section 5.4, from memory), and for a poisson one 1/variance.
func TestPostsArePlausible(t *testing.T) {
	posts := Posts(seed)
	names, places := map[string]bool{}, map[[2]float64]bool{}
	more := map[string]float64{} // 1/theta
	for _, d := range districts {
		if d.scatter > 0 {
			more[d.name] = 1 / d.scatter
		}
	}
	type sum struct{ count, squares, variance float64 }
	sums := map[bool]*sum{true: {}, false: {}} // whether a district has extra scatter
	var residents, cases float64
	for _, p := range posts {
		names[p.Name] = true
		places[[2]float64{p.Lon, p.Lat}] = true
		east, north := fromIsles(p.Lon, p.Lat)
		if math.Abs(east) > 165 || math.Abs(north) > 110 || p.Residents < 40 || p.Residents > 9000 || p.Cases > p.Residents/8 {
			t.Errorf("%+v", p)
		}
		mean, extra := float64(p.Residents)*FeverRate(p.Lon, p.Lat), more[p.District]
		variance := mean * (1 + mean*extra)
		of := sums[extra > 0]
		of.count++
		of.squares += (float64(p.Cases) - mean) * (float64(p.Cases) - mean) / variance
		of.variance += 2 + 6*extra + 1/variance
		residents += float64(p.Residents)
		cases += float64(p.Cases)
	}
	if len(names) != len(posts) || len(places) != len(posts) {
		t.Errorf("%d names and %d places for %d posts", len(names), len(places), len(posts))
	}
	for extra, of := range sums {
		if of.count < 400 || math.Abs(of.squares-of.count) > 3*math.Sqrt(of.variance) {
			t.Errorf("extra scatter %v: %.0f for %.0f posts, give or take %.0f", extra, of.squares, of.count, math.Sqrt(of.variance))
		}
	}
	if rate := 1000 * cases / residents; rate < 3 || rate > 7 {
		t.Errorf("%.2f cases per 1000 residents", rate)
	}
	if slices.Equal(posts, Posts(seed+1)) {
		t.Error("posts do not follow the seed")
	}
}

// TestFeverIsSmooth: the true rate runs from about 1 to about 15 per 1000, on both sides of the threshold of 5, and
// changes by less than a tenth over a kilometre.
func TestFeverIsSmooth(t *testing.T) {
	least, most, above, land := math.Inf(1), 0.0, 0, 0
	for east := -165.0; east < 165; east++ {
		for north := -110.0; north < 110; north++ {
			if !onLand(east, north) {
				continue
			}
			v := fever.at(east, north)
			if math.Abs(fever.at(east+1, north)-v) > 0.1 || math.Abs(fever.at(east, north+1)-v) > 0.1 {
				t.Fatalf("jump at %.0f, %.0f", east, north)
			}
			rate := 1000 * math.Exp(v)
			least, most = min(least, rate), max(most, rate)
			land++
			if rate > 5 {
				above++
			}
		}
	}
	if least < 1 || least > 3 || most < 9 || most > 18 {
		t.Errorf("%.2f to %.2f per 1000", least, most)
	}
	if share := float64(above) / float64(land); share < 0.2 || share > 0.6 || land < 25000 || land > 45000 {
		t.Errorf("%.2f above the threshold, %d km2 of land", share, land)
	}
}

// TestDistrictsAdjoin: the hulls of no two districts overlap, yet each has posts of others within the margin, but for the
// islet, which has none.
func TestDistrictsAdjoin(t *testing.T) {
	places := map[string][][2]float64{}
	for _, p := range Posts(seed) {
		east, north := fromIsles(p.Lon, p.Lat)
		places[p.District] = append(places[p.District], [2]float64{east, north})
	}
	hulls := map[string][][2]float64{}
	for name, at := range places {
		hulls[name] = hull(at)
	}
	for name, own := range places {
		near := 0
		for other, at := range places {
			if other == name {
				continue
			}
			if !separated(hulls[name], hulls[other]) && !separated(hulls[other], hulls[name]) {
				t.Errorf("%s and %s overlap", name, other)
			}
			for _, place := range at {
				if apart(place, own) < margin {
					near++
				}
			}
		}
		if (near < 3) != (name == tiny) || name == tiny && near > 0 {
			t.Errorf("%s: %d posts of others within %d km", name, near, margin)
		}
	}
}

// hull is the convex hull of some places, anticlockwise, its first corner not repeated (Andrew 1979, Information
// Processing Letters 9:216-219).
func hull(places [][2]float64) [][2]float64 {
	sorted := slices.SortedFunc(slices.Values(places), func(a, b [2]float64) int { return cmp.Or(cmp.Compare(a[0], b[0]), cmp.Compare(a[1], b[1])) })
	half := func() [][2]float64 {
		var chain [][2]float64
		for _, p := range sorted {
			for len(chain) > 1 && side(chain[len(chain)-2], chain[len(chain)-1], p) <= 0 {
				chain = chain[:len(chain)-1]
			}
			chain = append(chain, p)
		}
		return chain[:len(chain)-1]
	}
	lower := half()
	slices.Reverse(sorted)
	return append(lower, half()...)
}

// side is positive if c lies left of the line from a to b.
func side(a, b, c [2]float64) float64 {
	return (b[0]-a[0])*(c[1]-a[1]) - (b[1]-a[1])*(c[0]-a[0])
}

// separated tells whether all of b lies right of one of the edges of a, which is anticlockwise. Two convex polygons that
// do not overlap have such an edge in one of them.
func separated(a, b [][2]float64) bool {
	for i := range a {
		from, to := a[i], a[(i+1)%len(a)]
		if !slices.ContainsFunc(b, func(p [2]float64) bool { return side(from, to, p) > 0 }) {
			return true
		}
	}
	return false
}

// TestBatchPlan: plan.toml is TOML; its words are those of the flags, with values that they take; what it refers to is
// there.
func TestBatchPlan(t *testing.T) {
	var all struct {
		Defaults map[string]any
		Regions  struct {
			File    string
			SplitBy string `toml:"split_by"`
			Margin  string
		}
		Pictures struct{ Scale string }
		Region   map[string]map[string]any
	}
	reader := toml.NewDecoder(strings.NewReader(batchPlan)).DisallowUnknownFields()
	if err := reader.Decode(&all); err != nil {
		t.Fatal(err)
	}
	header := postTable(Posts(seed))[0]
	if all.Regions.File != "data/posts.csv" || all.Regions.SplitBy != header[0] || all.Regions.Margin != fmt.Sprint(margin, " km") ||
		all.Pictures.Scale != "shared" || len(all.Defaults) != 9 || len(all.Region) != 1 {
		t.Errorf("%+v", all)
	}
	for _, column := range []string{"response", "people"} {
		if name, _ := all.Defaults[column].(string); !slices.Contains(header, name) {
			t.Errorf("no column %q", name)
		}
	}
	takes(t, all.Defaults)
	for name, section := range all.Region {
		if !slices.ContainsFunc(districts, func(d district) bool { return d.name == name }) || len(section) == 0 {
			t.Errorf("a section for %q, of %d words", name, len(section))
		}
		takes(t, section)
	}
}

// takes hands the words of a section to those of package plan.
func takes(t *testing.T, section map[string]any) {
	t.Helper()
	var s plan.Settings
	for key, value := range section {
		text := fmt.Sprint(value)
		if _, list := value.([]any); list {
			text = strings.ReplaceAll(strings.Trim(text, "[]"), " ", ",")
		}
		i := slices.IndexFunc(plan.Words(), func(w plan.Word) bool { return strings.ReplaceAll(w.Name, "-", "_") == key })
		if i < 0 {
			t.Errorf("no word %q", key)
		} else if err := plan.Words()[i].Set(&s, text); err != nil {
			t.Errorf("%s = %v: %v", key, value, err)
		}
	}
}

func TestBatchScript(t *testing.T) {
	var got [][]string
	for _, c := range BatchCommands() {
		got = append(got, c.Args)
		if !strings.Contains(Script(BatchCommands()), "\n# "+c.Aim+"\n"+c.Line()+"\n") {
			t.Errorf("%q is not in the script", c.Aim)
		}
	}
	run := []string{"batch", "plan.toml", "--out", "maps"}
	want := [][]string{append(run[:4:4], "--check"), run, run, append(run[:4:4], "--gather")}
	if !slices.EqualFunc(got, want, slices.Equal) {
		t.Errorf("%q", got)
	}
}

package pipeline

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"gonum.org/v1/gonum/stat"
)

const placesHeader = "place,rows,observed,denominator,crude_rate,crude_lower,crude_upper,smoothed_rate,standard_error,lower,upper,cv," +
	"relative_risk,relative_risk_lower,relative_risk_upper,chance"

// TestCountiesAsPolygonsAndAsPoints: North Carolina sudden infant deaths 1974-78 (testdata/README.md) at the counties'
// centroids and at their polygons. The two maps differ in what they take for granted and not in what they say.
func TestCountiesAsPolygonsAndAsPoints(t *testing.T) {
	words := []string{"response=sid74", "people=bir74", "per=1000", "key=county", "write=csv,geojson", "threshold=3", "reference=overall"}
	areas := mapped(t, filepath.Join(repository, "nc_sids_counties.geojson"), words...)
	points := mapped(t, filepath.Join(repository, "nc_sids.csv"), append(words, "x=lon", "y=lat")...)
	a, p := readSheet(t, filepath.Join(areas, "places.csv")), readSheet(t, filepath.Join(points, "places.csv"))
	if got := strings.Join(a.header, ","); got != placesHeader {
		t.Errorf("places.csv begins with\n%s\nwant\n%s", got, placesHeader)
	}
	rate := map[string]float64{}
	for k, name := range p.text("place") {
		rate[name] = p.numbers("smoothed_rate")[k]
	}
	var x, y []float64
	for k, name := range a.text("place") {
		x, y = append(x, a.numbers("smoothed_rate")[k]), append(y, rate[name])
	}
	if r := stat.Correlation(x, y, nil); len(x) != 100 || !(r > 0.98) {
		t.Errorf("%d counties, correlation %.4f of their rates", len(x), r)
	}
	// Ashe: 1 death among 1091 births, exact limits from the tail sums of a count of 1.
	at := func(column string) float64 { return a.numbers(column)[0] }
	if a.text("place")[0] != "Ashe" {
		t.Fatalf("the first county is %s", a.text("place")[0])
	}
	near(t, "crude rate", at("crude_rate"), 1000./1091, 1e-10)
	near(t, "tail above the upper limit", poissonUpTo(1, at("crude_upper")*1.091), 0.025, 1e-9)
	near(t, "tail below the lower limit", 1-poissonUpTo(0, at("crude_lower")*1.091), 0.025, 1e-9)
	near(t, "relative risk", at("relative_risk"), at("smoothed_rate")/(1000*667./329962), 1e-9)
	eta, se := math.Log(at("smoothed_rate")), at("cv")
	near(t, "chance", at("chance"), 1-normalBelow((math.Log(3)-eta)/se), 1e-6)
	near(t, "upper", at("upper"), math.Exp(eta+1.959963984540054*se), 1e-6)

	text, err := os.ReadFile(filepath.Join(areas, "places.geojson"))
	if err != nil || strings.Count(string(text), `"place":`) != 100 || !strings.Contains(string(text), `"smoothed_rate":`) {
		t.Errorf("places.geojson: %v, %d places", err, strings.Count(string(text), `"place":`))
	}
	if d := readSummary(t, areas); d.number(t, "places", "areas") != 100 || d.number(t, "places", "unseen") != 0 {
		t.Error("the summary does not tell 100 areas")
	}
}

// poissonUpTo is the chance of at most k at a mean, by summing.
func poissonUpTo(k int, mean float64) (sum float64) {
	term := math.Exp(-mean)
	for i := 0; i <= k; i++ {
		sum += term
		term *= mean / float64(i+1)
	}
	return sum
}

// TestTinyAreasArePoints: squares of a tenth of a metre around points give the map of the points, but for where the knots
// go: there are nine points to a square to choose from. With the same knots they agree to rounding (package spatial).
func TestTinyAreasArePoints(t *testing.T) {
	points := write(t, "obs.csv", plain.table(7))
	s := readSheet(t, points)
	x, y := s.numbers("x"), s.numbers("y")
	var b strings.Builder
	b.WriteString("geom,cases,people,positive,examined,zinc\n")
	for i := range x {
		const h = 0.05
		fmt.Fprintf(&b, "\"POLYGON ((%v %v, %v %v, %v %v, %v %v, %v %v))\",%s,%s,%s,%s,%s\n", x[i]-h, y[i]-h, x[i]+h, y[i]-h, x[i]+h, y[i]+h, x[i]-h, y[i]+h, x[i]-h, y[i]-h,
			s.text("cases")[i], s.text("people")[i], s.text("positive")[i], s.text("examined")[i], s.text("zinc")[i])
	}
	areas := write(t, "areas.csv", b.String())
	at := write(t, "at.csv", "x,y\n200,200\n500,400\n700,300\n900,650\n")
	for _, words := range [][]string{
		{"response=cases", "people=people"}, {"response=positive", "trials=examined", "distribution=binomial"}, {"response=zinc"},
		{"response=positive", "trials=examined", "distribution=binomial", "link=complementary-log-log"},
	} {
		words = append(words, "at="+at, "write=csv", "smoothness=3e5", "max-knots=60", "extra-variation=none")
		if words[0] == "response=zinc" {
			words = append(words[:1], words[1:4]...)
		}
		p := readSheet(t, filepath.Join(mapped(t, points, words...), "surface.csv"))
		a := readSheet(t, filepath.Join(mapped(t, areas, append(words, "geometry=geom")...), "surface.csv"))
		for k := range p.rows {
			near(t, words[0]+": estimate", a.numbers("estimate")[k], p.numbers("estimate")[k], 2e-4)
			near(t, words[0]+": error", a.numbers("standard_error")[k], p.numbers("standard_error")[k], 0.15)
		}
	}
}

// districts are 36 squares of a kilometre with people and cases, as a table, and their places and people as files apart.
func districts(seed uint64) (whole, places, people, cases string) {
	random := rand.New(rand.NewPCG(seed, 3))
	var shapes, w, p, c strings.Builder
	w.WriteString("geom,district,people,cases\n")
	p.WriteString("district,people\n")
	c.WriteString("cases,district\n")
	for i := range 36 {
		x, y := float64(1000*(i%6)), float64(1000*(i/6))
		name := fmt.Sprintf("D%02d", i)
		n := 500 + random.IntN(4000)
		k := poisson(random, float64(n)*0.002*math.Exp(x/5000))
		ring := fmt.Sprintf("%[1]v %[2]v, %[3]v %[2]v, %[3]v %[4]v, %[1]v %[4]v, %[1]v %[2]v", x, y, x+1000, y+1000)
		fmt.Fprintf(&w, "\"POLYGON ((%s))\",%s,%d,%d\n", ring, name, n, k)
		fmt.Fprintf(&p, "%s,%d\n", name, n)
		fmt.Fprintf(&shapes, "%s;\"POLYGON ((%s))\"\n", name, ring)
		if k > 0 {
			half := k / 2
			fmt.Fprintf(&c, "%d,%s\n%d,%s\n", half, name, k-half, name)
		}
	}
	return w.String(), "name;geom\n" + shapes.String(), p.String(), c.String()
}

// TestJoinedFilesAreOneTable: cases, people and places in three files give the map of the one table that holds it all.
func TestJoinedFilesAreOneTable(t *testing.T) {
	whole, places, people, cases := districts(1)
	shared := []string{"response=cases", "people=people", "write=csv", "cells-across=12", "max-knots=30"}
	one := mapped(t, write(t, "whole.csv", whole), append(shared, "geometry=geom", "key=district")...)
	three := mapped(t, write(t, "cases.csv", cases), append(shared, "places="+write(t, "places.csv", places), "join="+write(t, "people.csv", people),
		"geometry=geom", "key=district=name", "absent=zero", "sum-by=district")...)
	a, b := readSheet(t, filepath.Join(one, "surface.csv")), readSheet(t, filepath.Join(three, "surface.csv"))
	if len(a.rows) != len(b.rows) {
		t.Fatalf("%d and %d cells", len(a.rows), len(b.rows))
	}
	for k := range a.rows {
		near(t, "estimate", b.numbers("estimate")[k], a.numbers("estimate")[k], 1e-7)
	}
	d := readSummary(t, three)
	zeros := strings.Count(whole, ",0\n")
	if got := d.number(t, "input", "rows"); got != d.number(t, "input", "used") || int(d.number(t, "input", "fitted")) != 36 || zeros == 0 {
		t.Errorf("%v rows read, %v used, %v fitted, %d zeros", got, d.number(t, "input", "used"), d.number(t, "input", "fitted"), zeros)
	}
	joined := d["input"].(map[string]any)["joined"].([]any)
	if added := joined[1].(map[string]any)["added"]; added != float64(zeros) {
		t.Errorf("%v rows added for %d places without one", added, zeros)
	}
	if rows := readSheet(t, filepath.Join(three, "places.csv")).text("observed"); strings.Join(rows, "") == "" || len(rows) != 36 {
		t.Errorf("%d places", len(rows))
	}
}

// TestPlacesNobodyLookedAt are predicted, and nothing is said to be observed there.
func TestPlacesNobodyLookedAt(t *testing.T) {
	_, places, people, cases := districts(2)
	lines := strings.SplitAfter(cases, "\n")
	kept := lines[0]
	for _, l := range lines[1:] {
		if !strings.Contains(l, "D07") && !strings.Contains(l, "D22") {
			kept += l
		}
	}
	words := []string{"response=cases", "people=people", "write=csv,geojson", "cells-across=12", "max-knots=30", "places=" + write(t, "places.csv", places),
		"join=" + write(t, "people.csv", people), "geometry=geom", "key=district=name", "sum-by=district"}
	dir := mapped(t, write(t, "cases.csv", kept), append(words, "absent=missing")...)
	s := readSheet(t, filepath.Join(dir, "places.csv"))
	unseen := 0
	for k, rows := range s.numbers("rows") {
		if !(s.numbers("smoothed_rate")[k] > 0 && s.numbers("standard_error")[k] > 0) {
			t.Errorf("%s has no rate", s.text("place")[k])
		}
		if rows == 0 {
			unseen++
			if s.text("observed")[k] != "" || s.text("crude_rate")[k] != "" || s.text("denominator")[k] != "" {
				t.Errorf("%s: something was observed where nobody looked", s.text("place")[k])
			}
		}
	}
	if unseen < 2 || len(s.rows) != 36 {
		t.Errorf("%d of %d places are without a row", unseen, len(s.rows))
	}
	_, err := Run(t.Context(), settings(t, write(t, "cases.csv", kept), words...), filepath.Join(t.TempDir(), "out"), silent{})
	if err == nil || !strings.Contains(err.Error(), "have no row in cases.csv") {
		t.Errorf("what a place without a row means was not asked: %v", err)
	}
}

// TestStripsAreAreas: length times width times the share detected is an area searched, whatever the units.
func TestStripsAreAreas(t *testing.T) {
	random := rand.New(rand.NewPCG(4, 4))
	var b strings.Builder
	b.WriteString("x,y,seen,walked_km,walked_m,wide,share,area_km2,area_ha\n")
	for range 40 {
		km, wide, share := 0.5+random.Float64(), 40+20*random.Float64(), 0.5+random.Float64()/2
		area := km * wide / 1000 * share
		fmt.Fprintf(&b, "%v,%v,%d,%v,%v,%v,%v,%v,%v\n", 5000*random.Float64(), 5000*random.Float64(), poisson(random, 100*area), km, 1000*km, wide, share, area, 100*area)
	}
	obs := write(t, "walks.csv", b.String())
	shared := []string{"response=seen", "write=csv", "cells-across=10", "max-knots=20"}
	read := func(words ...string) []float64 {
		return readSheet(t, filepath.Join(mapped(t, obs, append(shared, words...)...), "surface.csv")).numbers("estimate")
	}
	want := read("area=area_km2")
	for _, words := range [][]string{
		{"length=walked_km", "width=wide", "detection=share"}, {"length=walked_m", "width=wide", "detection=share", "area-unit=km2"},
	} {
		for k, v := range read(words...) {
			near(t, words[0], v, want[k], 1e-8)
		}
	}
	for k, v := range read("length=walked_m", "width=wide", "detection=share") { // per hectare
		near(t, "per hectare", v, want[k]/100, 1e-8)
	}
	half := read("length=walked_km", "width=wide", "detection=0.5")
	for k, v := range read("length=walked_km", "width=wide") {
		near(t, "half detected", half[k], 2*v, 1e-8)
	}
}

// TestSharedFactorReachesTotals: the coefficient of variation of a total with an uncertain detection is the root of the
// sum of squares (the delta-method rule of Buckland and others 2001, Introduction to Distance Sampling, section 3.6.1:
// cv(D)^2 = cv(n)^2 + cv(detection)^2), in zones as in every cell, and it does not average out between them.
func TestSharedFactorReachesTotals(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(9))
	zones := write(t, "zones.geojson", rectangles([]string{"west", "east", "all"}, [4]float64{100, 100, 500, 700}, [4]float64{500, 100, 900, 700}, [4]float64{100, 100, 900, 700}))
	words := []string{"response=n", "area=plot_ha", "zones=" + zones, "write=csv", "cells-across=20", "max-knots=40", "detection=0.8"}
	known := mapped(t, obs, words...)
	uncertain := mapped(t, obs, append(words, "exposure-cv=0.2")...)
	a, b := readSheet(t, filepath.Join(known, "zones.csv")), readSheet(t, filepath.Join(uncertain, "zones.csv"))
	for k, name := range a.text("zone") {
		want := math.Hypot(a.numbers("total_cv")[k], 0.2)
		near(t, name+": cv of the total", b.numbers("total_cv")[k], want, 0.05) // 2000 draws: 1.6 % each
		near(t, name+": total", b.numbers("total")[k], a.numbers("total")[k], 1e-9)
	}
	x, y := readSheet(t, filepath.Join(known, "surface.csv")), readSheet(t, filepath.Join(uncertain, "surface.csv"))
	factor := math.Log(1 + 0.2*0.2) // variance of a log-normal factor with that coefficient of variation
	for k := range x.rows {
		before, after := x.numbers("linear_standard_error")[k], y.numbers("linear_standard_error")[k]
		near(t, "variance of a cell", after*after, before*before+factor, 1e-6)
	}
	d := readSummary(t, uncertain)
	if got := fmt.Sprint(d["cautions"]); !strings.Contains(got, "coefficient of variation 20 %") {
		t.Errorf("cautions do not tell of the factor: %s", got)
	}
}

// TestStrataOfAFactor must agree within themselves.
func TestStrataOfAFactor(t *testing.T) {
	table := "x,y,n,area_ha,stratum,cv\n"
	for i := range 30 {
		table += fmt.Sprintf("%d,%d,%d,1,%s,%s\n", 100*(i%6), 100*(i/6), 3+i%4, []string{"wood", "field"}[i%2], []string{"0.1", "0.2"}[i%2])
	}
	words := []string{"response=n", "area=area_ha", "exposure-cv=cv", "exposure-strata=stratum", "write=csv", "cells-across=10", "max-knots=10"}
	mapped(t, write(t, "obs.csv", table), words...)
	for text, want := range map[string]string{
		strings.Replace(table, "wood,0.1\n200,0", "wood,0.3\n200,0", 1): "",
		strings.Replace(table, "0.2\n200,0", "0.4\n200,0", 1):           `obs.csv: row 4 (line 5), column "cv": 0.2 differs from 0.4 in row 2, and both are of stratum "field"`,
		strings.Replace(table, "wood,0.1", "wood,-1", 1):                `obs.csv: row 1 (line 2), column "cv": -1 is not between 0 and 2`,
	} {
		_, err := Run(t.Context(), settings(t, write(t, "obs.csv", text), words...), filepath.Join(t.TempDir(), "out"), silent{})
		got := ""
		if err != nil {
			got = err.Error()
		}
		if diff := cmp.Diff(want, got); diff != "" {
			t.Error(diff)
		}
	}
}

// TestKeysOfPoints: a key names the places of rows that have coordinates of their own, and must be true of them.
func TestKeysOfPoints(t *testing.T) {
	table := "site,x,y,n,ha\n"
	for i := range 20 {
		table += fmt.Sprintf("S%d,%d,%d,%d,1\n", i/2, 100*(i/2%4), 100*(i/2/4), 2+i%5)
	}
	words := []string{"response=n", "area=ha", "key=site", "write=csv", "cells-across=8", "max-knots=8"}
	dir := mapped(t, write(t, "obs.csv", table), words...)
	s := readSheet(t, filepath.Join(dir, "places.csv"))
	if len(s.rows) != 10 || s.numbers("rows")[0] != 2 || s.numbers("observed")[0] != 5 || s.numbers("denominator")[0] != 2 {
		t.Errorf("%v", s.rows)
	}
	res := readSheet(t, filepath.Join(dir, "residuals.csv"))
	if res.header[1] != "place" || res.text("place")[3] != "S1" {
		t.Errorf("residuals.csv: %v, %v", res.header, res.rows[3])
	}
	_, err := Run(t.Context(), settings(t, write(t, "obs.csv", strings.Replace(table, "S1,100,0,4", "S1,150,0,4", 1)), words...), filepath.Join(t.TempDir(), "out"), silent{})
	if want := `obs.csv: row 4 (line 5), column "site": "S1" lies elsewhere than in row 3`; err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
}

// TestSystemsOfGeometries: an SRID counts, --crs may repeat it and not contradict it.
func TestSystemsOfGeometries(t *testing.T) {
	table := "geom,z\n"
	for i := range 16 {
		table += fmt.Sprintf("\"SRID=32633;POINT (%d %d)\",%d\n", 500000+1000*(i%4), 5000000+900*(i/4), i*i%11)
	}
	words := []string{"response=z", "geometry=geom", "write=csv", "cells-across=8", "max-knots=8"}
	first := readSheet(t, filepath.Join(mapped(t, write(t, "obs.csv", table), words...), "surface.csv"))
	again := readSheet(t, filepath.Join(mapped(t, write(t, "obs.csv", table), append(words, "crs=EPSG:32633")...), "surface.csv"))
	if diff := cmp.Diff(first.rows, again.rows); diff != "" || first.text("lon")[0] == "" {
		t.Errorf("with --crs: %s", diff)
	}
	_, err := Run(t.Context(), settings(t, write(t, "obs.csv", table), append(words, "crs=EPSG:32634")...), filepath.Join(t.TempDir(), "out"), silent{})
	if want := "obs.csv: its geometries say that they are in EPSG:32633, and --crs says EPSG:32634"; err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
}

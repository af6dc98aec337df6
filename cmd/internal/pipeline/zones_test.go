package pipeline

import (
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"testing"
)

// zoneTable maps counts on plots over the given zones and returns zones.csv with surface.csv beside it.
func zoneTable(t *testing.T, observations, zones string, words ...string) (zoned, cells sheet, dir string) {
	t.Helper()
	words = append(words, "zones="+write(t, "zones.geojson", zones), "write=csv")
	dir = mapped(t, observations, words...)
	return readSheet(t, filepath.Join(dir, "zones.csv")), readSheet(t, filepath.Join(dir, "surface.csv")), dir
}

// TestTotalIsTheSumOfCells recomputes zones.csv from surface.csv: design.md, section 6.
func TestTotalIsTheSumOfCells(t *testing.T) {
	within := write(t, "within.geojson", rectangles([]string{"ground"}, [4]float64{0, 0, 1000, 800}))
	boxes := [][4]float64{{0, 0, 500, 800}, {500, 0, 1000, 800}, {0, 0, 1000, 800}, {200, 200, 400, 360}, {900, 700, 1400, 1000}}
	zoned, cells, dir := zoneTable(t, write(t, "obs.csv", plain.table(5)), rectangles([]string{"west", "east", "all", "patch", "beyond"}, boxes...),
		"response=n", "area=plot_ha", "within="+within, "cell-size=20", "threshold=7", "confidence=0.9")
	const hectares = 20. * 20 / 1e4
	x, y, estimate := cells.numbers("x"), cells.numbers("y"), cells.numbers("estimate")
	for k, b := range boxes {
		n, total := 0, 0.0
		for i := range x {
			if x[i] > b[0] && x[i] < b[2] && y[i] > b[1] && y[i] < b[3] {
				n++
				total += estimate[i] * hectares
			}
		}
		name := zoned.text("zone")[k]
		at := func(column string) float64 { return zoned.numbers(column)[k] }
		if int(at("cells")) != n {
			t.Errorf("%s: %g cells, counted %d", name, at("cells"), n)
		}
		area := float64(n) * hectares
		near(t, name+": area", at("area"), area, 1e-11)
		near(t, name+": total", at("total"), total, 1e-10)
		near(t, name+": mean", at("mean"), total/area, 1e-10)
		near(t, name+": share covered", at("share_covered"), area/((b[2]-b[0])*(b[3]-b[1])/1e4), 1e-10)
		cv := at("total_cv")
		near(t, name+": error of the total", at("total_standard_error"), cv*total, 1e-9)
		near(t, name+": error of the mean", at("mean_standard_error"), cv*total/area, 1e-9)
		// log-normal limits: Burnham and others (1987), Wildlife Monographs 99; 1.644854 is the normal quantile of 0.95
		f := math.Exp(1.6448536269514722 * math.Sqrt(math.Log(1+cv*cv)))
		near(t, name+": lower limit", at("total_lower"), total/f, 1e-9)
		near(t, name+": upper limit", at("total_upper"), total*f, 1e-9)
		near(t, name+": lower limit of the mean", at("mean_lower"), total/area/f, 1e-9)
		near(t, name+": upper limit of the mean", at("mean_upper"), total/area*f, 1e-9)
		// With errors this small the sum of draws is near normal, and so is the chance; 2000 draws are good to 0.035.
		if want := normalBelow(math.Log(total/area/7) / cv); math.Abs(at("chance")-want) > 0.06 {
			t.Errorf("%s: chance %g, and about %.3f is expected", name, at("chance"), want)
		}
	}
	// Neighbouring halves err together: the variance of the whole is not that of independent parts, and its root not more
	// than the sum of theirs.
	total, se := zoned.numbers("total"), zoned.numbers("total_standard_error")
	near(t, "the halves", total[0]+total[1], total[2], 1e-11)
	if !(se[2] <= se[0]+se[1]) || !(se[2] > math.Abs(se[0]-se[1])) {
		t.Errorf("errors of the halves %g and %g, of the whole %g", se[0], se[1], se[2])
	}
	checks := readSummary(t, dir)["checks"].([]any)
	last := checks[len(checks)-1].(map[string]any)
	if last["name"] != "zones" || last["level"] != "stop" || !strings.Contains(last["sentence"].(string), "only 6.67 % of zone beyond: ") {
		t.Errorf("a zone of which the map covers a fifteenth: %v", last)
	}
}

// constant is a survey of 9 x 9 plots over 4000 m x 3000 m with the same count on each; the plots are 0.04 ha.
func constant(unit string, perHectare float64) string {
	var b strings.Builder
	fmt.Fprintf(&b, "x,y,stems,plot_%s\n", unit)
	for i := range 81 {
		fmt.Fprintf(&b, "%d,%d,10,%v\n", 200+450*(i%9), 150+337*(i/9), 0.04*perHectare)
	}
	return b.String()
}

// TestTotalsByHand: 10 stems on each plot of 0.04 ha are 250 stems per hectare, and on 1200 ha there are 300000; with
// the area of the plots in another unit it is the same number (arithmetic).
func TestTotalsByHand(t *testing.T) {
	zones := rectangles([]string{"forest", "north", "south"}, [4]float64{0, 0, 4000, 3000}, [4]float64{0, 1500, 4000, 3000}, [4]float64{0, 0, 4000, 1500})
	within := write(t, "within.geojson", rectangles([]string{"ground"}, [4]float64{0, 0, 4000, 3000}))
	for _, c := range []struct {
		unit       string
		perHectare float64
	}{{"ha", 1}, {"km2", 0.01}, {"m2", 10000}} {
		zoned, cells, _ := zoneTable(t, write(t, "obs.csv", constant(c.unit, c.perHectare)), zones,
			"response=stems", "area=plot_"+c.unit, "within="+within, "cell-size=50")
		for _, v := range cells.numbers("estimate") {
			near(t, "stems per "+c.unit, v, 250/c.perHectare, 1e-9)
		}
		near(t, "area in "+c.unit, zoned.numbers("area")[0], 1200*c.perHectare, 1e-11)
		near(t, "stems in all, area in "+c.unit, zoned.numbers("total")[0], 300000, 1e-9)
		near(t, "stems in the north", zoned.numbers("total")[1], 150000, 1e-9)
		near(t, "the halves", zoned.numbers("total")[1]+zoned.numbers("total")[2], zoned.numbers("total")[0], 1e-11)
		// 810 stems were counted: the error of a level known from them alone is 1/sqrt(810). A tilted plane is not ruled
		// out by the data, which adds nothing to the total of evenly spread plots, to first order. 2000 draws are good to 2 %.
		near(t, "coefficient of variation", zoned.numbers("total_cv")[0], 1/math.Sqrt(810), 0.1)
	}
}

// TestUnitOfAreaDoesNotMatter: the same survey with plots in hectares and in square kilometres.
func TestUnitOfAreaDoesNotMatter(t *testing.T) {
	hectares := plain.table(6)
	lines := strings.Split(strings.TrimSpace(hectares), "\n")
	for i := range lines[1:] {
		f := strings.Split(lines[i+1], ",")
		f[4] += "e-2"
		lines[i+1] = strings.Join(f, ",")
	}
	lines[0] = strings.Replace(lines[0], "plot_ha", "plot_km2", 1)
	zones := rectangles([]string{"west", "east"}, [4]float64{0, 0, 500, 800}, [4]float64{500, 0, 1000, 800})
	a, _, _ := zoneTable(t, write(t, "obs.csv", hectares), zones, "response=n", "area=plot_ha", "cells-across=20")
	b, _, _ := zoneTable(t, write(t, "obs.csv", strings.Join(lines, "\n")+"\n"), zones, "response=n", "area=plot_km2", "cells-across=20")
	for k := range a.rows {
		for _, same := range []string{"cells", "total", "total_standard_error", "total_cv", "total_lower", "total_upper", "share_covered"} {
			near(t, same, b.numbers(same)[k], a.numbers(same)[k], 1e-6)
		}
		near(t, "area", 100*b.numbers("area")[k], a.numbers("area")[k], 1e-9)
		near(t, "mean", b.numbers("mean")[k], 100*a.numbers("mean")[k], 1e-6)
	}
}

// TestTotalsRefused: only counts with an area behind them add up, and only where no covariate is held.
func TestTotalsRefused(t *testing.T) {
	zones := rectangles([]string{"all"}, [4]float64{0, 0, 1000, 800})
	for _, words := range [][]string{
		{"response=cases", "people=people"},
		{"response=n", "effort=plot_ha"},
		{"response=n", "expected=plot_ha"},
		{"response=positive", "trials=examined"},
		{"response=zinc"},
		{"response=n", "area=plot_ha", "linear=depth", "hold=depth=mean"},
	} {
		zoned, _, dir := zoneTable(t, write(t, "obs.csv", plain.table(7)), zones, append(words, "cells-across=10")...)
		for _, empty := range []string{"total", "total_standard_error", "total_cv", "total_lower", "total_upper"} {
			if got := zoned.text(empty)[0]; got != "" {
				t.Errorf("%v: %s is %q", words, empty, got)
			}
		}
		mean, lower, upper := zoned.numbers("mean")[0], zoned.numbers("mean_lower")[0], zoned.numbers("mean_upper")[0]
		if !(lower < mean && mean < upper && zoned.numbers("mean_standard_error")[0] > 0) {
			t.Errorf("%v: mean %g (%g to %g)", words, mean, lower, upper)
		}
		z := readSummary(t, dir)["zones"].(map[string]any)
		if note := z["note"].(string); z["totals"] != false || !strings.HasPrefix(note, "no totals: ") {
			t.Errorf("%v: zones are told as %v", words, z)
		}
	}
}

// TestMeanOverCellsOfAMeasurement: for the identity link the mean's limits are symmetrical.
func TestMeanOverCellsOfAMeasurement(t *testing.T) {
	zones := rectangles([]string{"all", "patch"}, [4]float64{0, 0, 1000, 800}, [4]float64{300, 300, 600, 500})
	zoned, cells, _ := zoneTable(t, write(t, "obs.csv", plain.table(8)), zones, "response=zinc", "cells-across=20")
	sum := 0.0
	for _, v := range cells.numbers("estimate") {
		sum += v
	}
	near(t, "mean of the map", zoned.numbers("mean")[0], sum/float64(len(cells.rows)), 1e-10)
	for k := range zoned.rows {
		mean, lower, upper := zoned.numbers("mean")[k], zoned.numbers("mean_lower")[k], zoned.numbers("mean_upper")[k]
		near(t, "middle of the limits", (lower+upper)/2, mean, 1e-9)
		// t with about 50 degrees of freedom is 2.01 at 0.975; the error is from 2000 draws, good to 2 %
		near(t, "half width", (upper-lower)/2, 2.01*zoned.numbers("mean_standard_error")[k], 0.07)
	}
}

// TestZonesSayTheirCoordinates: polygons come in longitude and latitude or in the observations' own coordinates, and
// the file may say which in the way that programs write it.
func TestZonesSayTheirCoordinates(t *testing.T) {
	named := func(text, name string) string {
		return strings.Replace(text, `"features"`, `"crs":{"type":"name","properties":{"name":"`+name+`"}},"features"`, 1)
	}
	const degreesNamed, metresNamed = "urn:ogc:def:crs:OGC:1.3:CRS84", "urn:ogc:def:crs:EPSG::32633"
	degrees := rectangles([]string{"all"}, [4]float64{17.3, -33.1, 18.5, -32.2})
	metres := rectangles([]string{"all"}, [4]float64{431000, 5512000, 440000, 5519000})
	around := rectangles([]string{"all"}, [4]float64{14, 49.7, 14.2, 49.9})
	for _, c := range []struct {
		name   string
		f      field
		crs    string
		zones  string
		reason string // "" where it works
	}{
		{"degrees", lonLat, "", degrees, ""},
		{"degrees, said", lonLat, "", named(degrees, degreesNamed), ""},
		{"degrees, said shortly", lonLat, "", named(degrees, "EPSG:4326"), ""},
		{"degrees, said wrongly", lonLat, "", named(degrees, metresNamed), "the polygons are in EPSG:32633, which is not"},
		{"metres among degrees", lonLat, "", metres, "are not longitude and latitude"},
		{"metres", utm, "EPSG:32633", metres, ""},
		{"metres, said", utm, "EPSG:32633", named(metres, metresNamed), ""},
		{"metres of another zone", utm, "EPSG:32633", named(metres, "EPSG:32634"), "the polygons are in EPSG:32634, which is not"},
		{"degrees among metres", utm, "EPSG:32633", around, ""},
		{"local", plain, "local", rectangles([]string{"all"}, [4]float64{0, 0, 1000, 800}), ""},
		{"degrees among local metres", plain, "local", named(degrees, degreesNamed), "the polygons are in longitude and latitude, and the observations in local metres"},
		{"degrees among local metres, not said", plain, "local", degrees, "no cell of the map lies in any of the zones"},
	} {
		words := []string{"response=n", "area=plot_ha", "zones=" + write(t, "zones.geojson", c.zones), "cells-across=20", "write=csv"}
		if c.crs != "" {
			words = append(words, "crs="+c.crs)
		}
		dir := filepath.Join(t.TempDir(), "out")
		_, err := Run(t.Context(), settings(t, write(t, "obs.csv", c.f.table(1)), words...), dir, silent{})
		switch {
		case c.reason == "" && err != nil:
			t.Errorf("%s: %v", c.name, err)
		case c.reason == "":
			if n := readSheet(t, filepath.Join(dir, "zones.csv")).numbers("cells")[0]; n < 100 {
				t.Errorf("%s: %g cells", c.name, n)
			}
		case err == nil || !strings.Contains(err.Error(), c.reason) || hintOf(err) == "":
			t.Errorf("%s: %v", c.name, err)
		}
	}
}

// TestTotalsAreRightToTheEdge: with one level everywhere a total is that level times the polygon's own area, whatever its
// shape and however coarse the cells; parts that share no ground add up to the whole.
func TestTotalsAreRightToTheEdge(t *testing.T) {
	const triangle = `[[103.7,88.1],[871.3,142.9],[402.2,735.4],[103.7,88.1]]`
	// cut from the first vertex to the middle of the opposite side
	const south, north = `[[103.7,88.1],[871.3,142.9],[636.75,439.15],[103.7,88.1]]`, `[[103.7,88.1],[636.75,439.15],[402.2,735.4],[103.7,88.1]]`
	polygon := func(name, ring string) string {
		return fmt.Sprintf(`{"type":"Feature","properties":{"name":%q},"geometry":{"type":"Polygon","coordinates":[%s]}}`, name, ring)
	}
	zones := `{"type":"FeatureCollection","features":[` + polygon("all", triangle) + "," + polygon("south", south) + "," + polygon("north", north) + "]}"
	within := write(t, "within.geojson", polygon("ground", triangle))
	// half of |(b - a) x (c - a)|, in m2
	area := ((871.3-103.7)*(735.4-88.1) - (402.2-103.7)*(142.9-88.1)) / 2
	for _, unit := range []struct {
		name   string
		metres float64
	}{{"ha", 1e4}, {"km2", 1e6}} {
		table := strings.Replace(plain.table(3), "plot_ha", "plot", 1)
		zoned, cells, _ := zoneTable(t, write(t, "obs.csv", table), zones, "response=n", "area=plot", "area-unit="+unit.name,
			"surface=none", "within="+within, "cells-across=13", "distribution=poisson")
		level := cells.numbers("estimate")[0]
		total := zoned.numbers("total")
		near(t, unit.name+": total", total[0], level*area/unit.metres, 1e-9)
		near(t, unit.name+": halves", total[1]+total[2], total[0], 1e-10)
		near(t, unit.name+": area", zoned.numbers("area")[0], area/unit.metres, 1e-9)
		near(t, unit.name+": covered", zoned.numbers("share_covered")[0], 1, 1e-9)
	}
}

// TestUncertainZonesAreRemarkedOn: few rows far from a zone leave its level wide open, and the mean of a log-normal lies
// above its median by half the variance.
func TestUncertainZonesAreRemarkedOn(t *testing.T) {
	table := "x,y,n,ha\n"
	for i := range 12 {
		table += fmt.Sprintf("%d,%d,%d,1\n", 100+20*(i%4), 100+20*(i/4), i%3)
	}
	within := write(t, "within.geojson", rectangles([]string{"ground"}, [4]float64{0, 0, 1000, 800}))
	zones := rectangles([]string{"near", "far"}, [4]float64{90, 90, 170, 150}, [4]float64{800, 600, 1000, 800})
	_, _, dir := zoneTable(t, write(t, "obs.csv", table), zones, "response=n", "area=ha", "within="+within, "cells-across=25", "distribution=poisson")
	got := fmt.Sprint(readSummary(t, dir)["checks"])
	if !strings.Contains(got, "zone draws") || !strings.Contains(got, "the figure of zone far is so uncertain") {
		t.Errorf("checks: %s", got)
	}
	_, _, dir = zoneTable(t, write(t, "obs.csv", plain.table(5)), rectangles([]string{"all"}, [4]float64{100, 100, 900, 700}), "response=n", "area=plot_ha", "cells-across=20")
	if got := fmt.Sprint(readSummary(t, dir)["checks"]); strings.Contains(got, "zone draws") {
		t.Errorf("checks: %s", got)
	}
}

package pipeline

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"drumlin/io/geotiff"

	"github.com/google/go-cmp/cmp"
)

// What files and columns there are is design.md, section 6; here as the reader of a table meets it.

const (
	surfaceHeader = "x,y,lon,lat,estimate,standard_error,lower,upper,cv,chance,linear_predictor,linear_standard_error,nearest_m"
	zonesHeader   = "zone,cells,area,total,total_standard_error,total_cv,total_lower,total_upper,mean,mean_standard_error,mean_lower,mean_upper,share_covered,chance"
)

func TestHeaders(t *testing.T) {
	text := plain.table(1)
	text = strings.TrimSuffix(text, "\n") + "\n10,10,1,-3,1,1,100,1,10,1,clay,wet,A,1,1,1,1\n" // a negative count is set aside
	zones := write(t, "zones.geojson", rectangles([]string{"all"}, [4]float64{0, 0, 1000, 800}))
	dir := mapped(t, write(t, "obs.csv", text), "response=n", "area=plot_ha", "threshold=4", "zones="+zones, "cells-across=20", "write=csv")
	for file, want := range map[string]string{
		"surface.csv":   surfaceHeader,
		"zones.csv":     zonesHeader,
		"residuals.csv": "row,x,y,response,fitted,deviance_residual,quantile_residual,leverage",
		"set-aside.csv": "file,row,line,column,value,reason",
	} {
		if got := strings.Join(readSheet(t, filepath.Join(dir, file)).header, ","); got != want {
			t.Errorf("%s begins with\n%s\nwant\n%s", file, got, want)
		}
	}
	aside := readSheet(t, filepath.Join(dir, "set-aside.csv"))
	if diff := cmp.Diff([][]string{{"obs.csv", "61", "62", "n", "-3", "response is negative"}}, aside.rows); diff != "" {
		t.Error(diff)
	}
	if n := len(readSheet(t, filepath.Join(dir, "residuals.csv")).rows); n != 60 {
		t.Errorf("%d residuals for 60 rows", n)
	}

	dir = mapped(t, write(t, "obs.csv", plain.table(1)), "response=cases", "people=people", "reference=overall", "cells-across=20", "write=csv")
	want := surfaceHeader + ",relative_risk,relative_risk_lower,relative_risk_upper"
	s := readSheet(t, filepath.Join(dir, "surface.csv"))
	if got := strings.Join(s.header, ","); got != want {
		t.Errorf("with a reference surface.csv begins with\n%s\nwant\n%s", got, want)
	}
	for _, name := range []string{"lon", "lat", "chance"} {
		if strings.Join(s.text(name), "") != "" {
			t.Errorf("%s is not empty in a local plane without a threshold", name)
		}
	}
}

func TestSummaryKeys(t *testing.T) {
	dir := mapped(t, write(t, "obs.csv", plain.table(1)), "response=zinc", "linear=depth", "hold=depth=2", "cells-across=20", "write=csv")
	d := readSummary(t, dir)
	for where, want := range map[string][]string{
		"": {"version", "input", "settings", "lattice", "fit", "coefficients", "effects", "estimates", "tests", "candidates", "zones", "checks", "cautions",
			"rehearsal", "validation", "outputs"},
		"input": {"name", "sha256", "rows", "used", "set_aside", "distinct_places", "median_spacing_m", "coordinates"},
	} {
		at := map[string]any(d)
		if where != "" {
			at = at[where].(map[string]any)
		}
		var got []string
		for k := range at {
			got = append(got, k)
		}
		slices.Sort(got)
		slices.Sort(want)
		if diff := cmp.Diff(want, got); diff != "" {
			t.Errorf("keys of summary.json %q: %s", where, diff)
		}
	}
	fit := d["fit"].(map[string]any)
	for _, key := range []string{"converged", "iterations", "projected_gradient", "criterion", "criterion_value", "lambda", "degrees_of_freedom",
		"knots", "dispersion", "shape", "deviance", "deviance_share", "log_likelihood", "aic",
		"extra_variation", "knot_path", "smoothness_uncertainty", "aic_corrected"} {
		if _, ok := fit[key]; !ok {
			t.Errorf("fit has no %q", key)
		}
	}
	df := d.number(t, "fit", "degrees_of_freedom", "total")
	// aic = -2 l + 2 (degrees of freedom + the estimated variance): design.md, section 6
	near(t, "aic", d.number(t, "fit", "aic"), -2*d.number(t, "fit", "log_likelihood")+2*(df+1), 1e-12)
	near(t, "degrees of freedom in all", df, d.number(t, "fit", "degrees_of_freedom", "surface")+2, 1e-12)

	settings := d["settings"].(map[string]any)
	chosen := settings["distribution"].(map[string]any)
	if chosen["value"] != "gaussian" || !strings.Contains(chosen["chosen"].(string), "measurement") {
		t.Errorf("the chosen distribution is recorded as %v", chosen)
	}
	if _, marked := settings["response"].(map[string]any)["chosen"]; marked {
		t.Error("the response is marked as chosen by the program")
	}
}

// TestSums checks the checksums against the files on the disk.
func TestSums(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(1))
	dir := mapped(t, obs, "response=zinc", "cells-across=20")
	raw, err := os.ReadFile(filepath.Join(dir, "summary.json"))
	if err != nil {
		t.Fatal(err)
	}
	var d struct {
		Input   struct{ SHA256 string }
		Outputs []struct{ File, SHA256 string }
	}
	if err := json.Unmarshal(raw, &d); err != nil {
		t.Fatal(err)
	}
	if got := sumOf(t, obs); got != d.Input.SHA256 {
		t.Errorf("the input's sum is told as %s and is %s", d.Input.SHA256, got)
	}
	told := []string{"summary.json"}
	for _, o := range d.Outputs {
		told = append(told, o.File)
		if data := !strings.HasSuffix(o.File, ".png"); data != (o.SHA256 != "") {
			t.Errorf("%s: sum %q", o.File, o.SHA256)
		} else if data && sumOf(t, filepath.Join(dir, o.File)) != o.SHA256 {
			t.Errorf("the sum of %s is not that of the file", o.File)
		}
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var there []string
	for _, e := range entries {
		there = append(there, e.Name())
	}
	slices.Sort(told)
	if diff := cmp.Diff(told, there); diff != "" {
		t.Errorf("files told and files there: %s", diff)
	}
}

func sumOf(t *testing.T, path string) string {
	t.Helper()
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	sum := sha256.Sum256(raw)
	return hex.EncodeToString(sum[:])
}

// link is g^-1 and its derivative, written out here once more: McCullagh & Nelder (1989), Generalized Linear Models,
// table 2.1 (from memory).
type link struct{ mean, slope, linear func(float64) float64 }

var (
	identity = link{func(e float64) float64 { return e }, func(float64) float64 { return 1 }, func(m float64) float64 { return m }}
	logLink  = link{math.Exp, math.Exp, math.Log}
	logit    = link{
		func(e float64) float64 { return 1 / (1 + math.Exp(-e)) },
		func(e float64) float64 { return math.Exp(-e) / ((1 + math.Exp(-e)) * (1 + math.Exp(-e))) },
		func(m float64) float64 { return math.Log(m / (1 - m)) },
	}
	extreme = link{
		func(e float64) float64 { return -math.Expm1(-math.Exp(e)) },
		func(e float64) float64 { return math.Exp(e - math.Exp(e)) },
		func(m float64) float64 { return math.Log(-math.Log1p(-m)) },
	}
)

// normalBelow is the standard normal distribution function.
func normalBelow(z float64) float64 { return math.Erfc(-z/math.Sqrt2) / 2 }

// studentBelow is the distribution function of Student's t with nu degrees of freedom, its density integrated by Simpson's rule.
func studentBelow(nu float64) func(float64) float64 {
	a, _ := math.Lgamma((nu + 1) / 2)
	b, _ := math.Lgamma(nu / 2)
	c := math.Exp(a-b) / math.Sqrt(nu*math.Pi)
	density := func(x float64) float64 { return c * math.Pow(1+x*x/nu, -(nu+1)/2) }
	return func(z float64) float64 {
		const steps = 2000
		h, sum := z/steps, density(0)+density(z)
		for i := 1; i < steps; i++ {
			sum += float64(2+2*(i%2)) * density(float64(i)*h)
		}
		return math.Max(0, 0.5+sum*h/3)
	}
}

// TestSurfaceFollowsFromTheLinearPredictor recomputes every figure of surface.csv from its two linear columns.
func TestSurfaceFollowsFromTheLinearPredictor(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(2))
	for _, c := range []struct {
		name       string
		words      []string
		link       link
		per        float64
		confidence float64
		threshold  float64
		student    bool
	}{
		{"measurement", []string{"response=zinc", "threshold=32"}, identity, 1, 0.95, 32, true},
		{"measurement on a log scale", []string{"response=zinc", "distribution=gaussian", "link=log", "threshold=30", "confidence=0.8"}, logLink, 1, 0.8, 30, true},
		{"measurement with a covariate", []string{"response=zinc", "linear=depth", "hold=depth=0.3", "category=soil", "hold=soil=peat", "threshold=30"}, identity, 1, 0.95, 30, true},
		{"counts on plots", []string{"response=n", "area=plot_ha", "threshold=6"}, logLink, 1, 0.95, 6, false},
		{"cases per 1000", []string{"response=cases", "people=people", "per=1000", "threshold=3", "confidence=0.9", "reference=2.5"}, logLink, 1000, 0.9, 3, false},
		{"percent positive", []string{"response=positive", "trials=examined", "per=100", "threshold=40"}, logit, 100, 0.95, 40, false},
		{"counts that scatter", []string{"response=caught", "effort=plot_ha", "distribution=negative-binomial", "threshold=9", "confidence=0.8"}, logLink, 1, 0.8, 9, false},
		{"positives that scatter", []string{"response=seen", "trials=examined", "per=100", "threshold=40"}, logit, 100, 0.95, 40, false},
		{"positives of extremes", []string{"response=positive", "trials=examined", "link=complementary-log-log", "threshold=0.4"}, extreme, 1, 0.95, 0.4, false},
		{"scaled counts", []string{"response=caught", "effort=plot_ha", "extra-variation=scale", "threshold=9"}, logLink, 1, 0.95, 9, true},
		{"a dose", []string{"response=dose", "distribution=gamma", "threshold=4"}, logLink, 1, 0.95, 4, true},
		{"rainfall", []string{"response=rain", "distribution=tweedie", "threshold=2"}, logLink, 1, 0.95, 2, true},
		{"rainfall on ground", []string{"response=rain", "distribution=tweedie", "area=plot_ha", "per=10", "threshold=20"}, logLink, 10, 0.95, 20, true},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := mapped(t, obs, append(c.words, "cells-across=20", "write=csv")...)
			s, d := readSheet(t, filepath.Join(dir, "surface.csv")), readSummary(t, dir)
			below := normalBelow
			if c.student {
				below = studentBelow(d.number(t, "input", "used") - d.number(t, "fit", "degrees_of_freedom", "total"))
			}
			eta, se := s.numbers("linear_predictor"), s.numbers("linear_standard_error")
			estimate, standard, cv := s.numbers("estimate"), s.numbers("standard_error"), s.numbers("cv")
			lower, upper, chance := s.numbers("lower"), s.numbers("upper"), s.numbers("chance")
			if len(eta) < 100 {
				t.Fatalf("%d cells", len(eta))
			}
			q := (c.link.linear(upper[0]/c.per) - eta[0]) / se[0]
			if got := below(q); math.Abs(got-(0.5+c.confidence/2)) > 1e-7 {
				t.Errorf("limits are %g standard errors away, which holds %.9f and not %g", q, 2*got-1, c.confidence)
			}
			limit := c.link.linear(c.threshold / c.per)
			for i := range eta {
				mean := c.link.mean(eta[i])
				near(t, "estimate", estimate[i], mean*c.per, 1e-9)
				near(t, "standard error", standard[i], c.link.slope(eta[i])*se[i]*c.per, 1e-9)
				near(t, "coefficient of variation", cv[i], standard[i]/estimate[i], 1e-9)
				near(t, "lower", lower[i], c.link.mean(eta[i]-q*se[i])*c.per, 1e-9)
				near(t, "upper", upper[i], c.link.mean(eta[i]+q*se[i])*c.per, 1e-9)
				if want := below((eta[i] - limit) / se[i]); math.Abs(chance[i]-want) > 1e-9 {
					t.Errorf("chance %.12g, want %.12g", chance[i], want)
				}
			}
			if slices.Contains(s.header, "relative_risk") {
				for i, v := range s.numbers("relative_risk") {
					near(t, "relative risk", v, estimate[i]/2.5, 1e-9)
					near(t, "its lower limit", s.numbers("relative_risk_lower")[i], lower[i]/2.5, 1e-9)
					near(t, "its upper limit", s.numbers("relative_risk_upper")[i], upper[i]/2.5, 1e-9)
				}
			}
		})
	}
}

// TestResidualsFollowFromTheFit: the fitted value of a row is the estimate at its place times what is behind it; the
// deviance residuals' squares add up to the deviance (McCullagh & Nelder 1989, section 2.4; from memory), the leverages
// to the degrees of freedom.
func TestResidualsFollowFromTheFit(t *testing.T) {
	path := write(t, "obs.csv", plain.table(3))
	obs := readSheet(t, path)
	for _, c := range []struct {
		response, behind string
		words            []string
		part             func(y, m, of float64) float64
	}{
		{"cases", "people", []string{"people=people", "per=1000"}, func(y, m, _ float64) float64 { return 2 * (times(y, math.Log(y/m)) - (y - m)) }},
		{"positive", "examined", []string{"trials=examined", "per=1000"}, func(y, m, of float64) float64 {
			return 2 * (times(y, math.Log(y/m)) + times(of-y, math.Log((of-y)/(of-m))))
		}},
		{"positive", "examined", []string{"trials=examined", "per=1000", "link=complementary-log-log"}, func(y, m, of float64) float64 {
			return 2 * (times(y, math.Log(y/m)) + times(of-y, math.Log((of-y)/(of-m))))
		}},
		// with theta 1.5: twice the difference of the log-likelihoods at y and at m, Lawless (1987), Can. J. Statist. 15:209-225 (from memory)
		{"caught", "plot_ha", []string{"effort=plot_ha", "per=1000", "distribution=negative-binomial", "shape=1.5"}, func(y, m, _ float64) float64 {
			return 2 * (times(y, math.Log(y/m)) - (y+1.5)*math.Log((y+1.5)/(m+1.5)))
		}},
		// with power 1.6: Dunn & Smyth (2005), Stat. Comput. 15:267-280 (from memory)
		{"rain", "plot_ha", []string{"area=plot_ha", "per=1000", "distribution=tweedie", "shape=1.6"}, func(y, m, _ float64) float64 {
			return 2 * (math.Pow(y, 0.4)/(-0.6*0.4) - y*math.Pow(m, -0.6)/-0.6 + math.Pow(m, 0.4)/0.4)
		}},
	} {
		dir := mapped(t, path, append(c.words, "response="+c.response, "at="+path, "write=csv")...)
		s, r, d := readSheet(t, filepath.Join(dir, "surface.csv")), readSheet(t, filepath.Join(dir, "residuals.csv")), readSummary(t, dir)
		var deviance, leverage float64
		for i, level := range s.numbers("estimate") {
			y, of := obs.numbers(c.response)[i], obs.numbers(c.behind)[i]
			fitted, residual := r.numbers("fitted")[i], r.numbers("deviance_residual")[i]
			near(t, "fitted", fitted, level/1000*of, 1e-9)
			near(t, "square of the deviance residual", residual*residual, c.part(y, fitted, of), 1e-7)
			if (residual > 0) != (y > fitted) {
				t.Errorf("residual %g for %g against %g", residual, y, fitted)
			}
			deviance += residual * residual
			leverage += r.numbers("leverage")[i]
		}
		near(t, "deviance", d.number(t, "fit", "deviance"), deviance, 1e-9)
		near(t, "degrees of freedom", d.number(t, "fit", "degrees_of_freedom", "total"), leverage, 1e-8)
	}
}

func times(y, v float64) float64 {
	if y == 0 {
		return 0
	}
	return y * v
}

// TestFittedTotalsAreTheObservedOnes: with the usual link of counts or positives and a level that is not penalised, the
// fitted values add up to the observed ones (the score equation of a canonical link). The totals are those of the
// datasets' descriptions: 667 deaths, 25674 positive; see testdata/README.md.
func TestFittedTotalsAreTheObservedOnes(t *testing.T) {
	for _, c := range []struct {
		file  string
		words []string
		total float64
	}{
		{"nc_sids.csv", []string{"response=sid74", "people=bir74", "extra-variation=none", "cells-across=10", "write=csv"}, 667},
		{"burkina_faso_malaria.csv", []string{"response=positive", "trials=examined", "extra-variation=none", "cells-across=10", "write=csv"}, 25674},
	} {
		dir := mapped(t, filepath.Join(repository, c.file), c.words...)
		sum := 0.0
		for _, v := range readSheet(t, filepath.Join(dir, "residuals.csv")).numbers("fitted") {
			sum += v
		}
		near(t, c.file, sum, c.total, 1e-7)
	}
}

func TestWriteChooses(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(1))
	zones := write(t, "zones.geojson", rectangles([]string{"all"}, [4]float64{0, 0, 1000, 800}))
	for list, want := range map[string][]string{
		"csv":              {"residuals.csv", "summary.json", "surface.csv", "zones.csv"},
		"saved":            {"saved.surface", "summary.json"},
		"tif":              {"summary.json", "surface.tif"},
		"geojson":          {"isolines.geojson", "summary.json", "surface.geojson", "zones.geojson"},
		"pictures":         {"chance.png", "map.png", "summary.json", "uncertainty.png"},
		"saved,csv":        {"residuals.csv", "saved.surface", "summary.json", "surface.csv", "zones.csv"},
		"geojson,pictures": {"chance.png", "isolines.geojson", "map.png", "summary.json", "surface.geojson", "uncertainty.png", "zones.geojson"},
	} {
		dir := mapped(t, obs, "response=zinc", "threshold=30", "zones="+zones, "cells-across=10", "write="+list)
		entries, err := os.ReadDir(dir)
		if err != nil {
			t.Fatal(err)
		}
		var got []string
		for _, e := range entries {
			got = append(got, e.Name())
		}
		if diff := cmp.Diff(want, got); diff != "" {
			t.Errorf("--write %s: %s", list, diff)
		}
	}
}

// TestUnitSquareAsWellAsKilometres: the thin-plate penalty scales with the square of a length, so the data choose the
// same surface whatever the unit of length (Duchon 1977; follows from the penalty's definition). A power of two leaves
// every rounding as it was; with 1000 two gaps that are equally wide may change places in the order in which they get
// knots, which is seen in the standard errors there and hardly in the estimates.
func TestUnitSquareAsWellAsKilometres(t *testing.T) {
	small := field{n: 80, wide: 1, high: 0.8, scale: 1, xName: "x", yName: "y"}
	for scale, errors := range map[float64]float64{1024: 1e-7, 1000: 0.1} {
		large := small
		large.scale = scale
		for _, words := range [][]string{
			{"response=zinc"},
			{"response=zinc", "smoothness=gcv"},
			{"response=n", "area=plot_ha"},
			{"response=positive", "trials=examined", "linear=depth", "hold=depth=mean"},
		} {
			words = append(words, "cells-across=25", "write=csv")
			a, b := mapped(t, write(t, "obs.csv", small.table(4)), words...), mapped(t, write(t, "obs.csv", large.table(4)), words...)
			s, l := readSheet(t, filepath.Join(a, "surface.csv")), readSheet(t, filepath.Join(b, "surface.csv"))
			if len(s.rows) != len(l.rows) || len(s.rows) < 200 {
				t.Fatalf("%d cells and %d", len(s.rows), len(l.rows))
			}
			for name, tolerance := range map[string]float64{"estimate": 1e-6, "standard_error": errors} {
				for i, v := range s.numbers(name) {
					near(t, name, l.numbers(name)[i], v, tolerance)
				}
			}
			for _, name := range []string{"x", "y", "nearest_m"} {
				for i, v := range s.numbers(name) {
					near(t, name, l.numbers(name)[i], scale*v, 1e-9)
				}
			}
			// lambda is in metres: it goes with the square of the length (design.md, section 4)
			near(t, "lambda", readSummary(t, b).number(t, "fit", "lambda", "surface", "value"),
				scale*scale*readSummary(t, a).number(t, "fit", "lambda", "surface", "value"), 1e-4)
		}
	}
}

// TestSurfaceRaster: surface.tif has the figures of surface.csv at the same places, and nothing elsewhere.
func TestSurfaceRaster(t *testing.T) {
	f := plain
	f.xName, f.yName, f.scale, f.x0, f.y0 = "easting", "northing", 1, 500000, 5000000
	dir := mapped(t, write(t, "obs.csv", f.table(2)), "response=n", "area=plot_ha", "threshold=4", "crs=EPSG:32633", "cells-across=37", "write=csv,tif", "max-knots=20")
	file, err := os.Open(filepath.Join(dir, "surface.tif"))
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	info, err := file.Stat()
	if err != nil {
		t.Fatal(err)
	}
	r, err := geotiff.Open(file, info.Size(), "surface.tif")
	if err != nil {
		t.Fatal(err)
	}
	s := readSheet(t, filepath.Join(dir, "surface.csv"))
	x, y := s.numbers("x"), s.numbers("y")
	if r.EPSG != 32633 || len(r.Bands) != 7 {
		t.Errorf("EPSG:%d, bands %+v", r.EPSG, r.Bands)
	}
	for b, band := range r.Bands {
		want := s.numbers(band.Name)
		all := make([]float64, r.Width*r.Height)
		if err := r.Window(all, b, 0, 0, r.Width, r.Height); err != nil {
			t.Fatal(err)
		}
		filled := 0
		for _, v := range all {
			if !math.IsNaN(v) {
				filled++
			}
		}
		if filled != len(want) {
			t.Errorf("%s: %d cells have values, want %d", band.Name, filled, len(want))
		}
		for k := range want {
			i, j := int((x[k]-r.X0)/r.CellX), int((r.Y0-y[k])/r.CellY)
			near(t, band.Name, all[j*r.Width+i], want[k], 1e-6)
		}
	}
}

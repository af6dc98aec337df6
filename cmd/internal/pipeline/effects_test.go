package pipeline

import (
	"errors"
	"fmt"
	"image/png"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

const effectsHeader = "effect,role,level,value,estimate,standard_error,lower,upper"

// effectRows returns the rows of effects.csv of one effect and level: their values or levels, estimates and errors.
func effectRows(t *testing.T, s sheet, effect, level string) (value []string, estimate, se []float64) {
	t.Helper()
	for i, row := range s.rows {
		if row[0] == effect && (level == "" || row[2] == level) {
			v := row[3]
			if v == "" {
				v = row[2]
			}
			value, estimate, se = append(value, v), append(estimate, s.numbers("estimate")[i]), append(se, s.numbers("standard_error")[i])
		}
	}
	if value == nil {
		t.Fatalf("effects.csv has nothing of %s %s", effect, level)
	}
	return value, estimate, se
}

// placesWith writes places at one spot: for each value a row in which one covariate has it and the others stay.
func placesWith(t *testing.T, covariate string, values []string) string {
	t.Helper()
	base := map[string]string{"depth": "0.5", "plot": "0.8", "soil": "clay", "year": "wet", "observer": "A"}
	columns := []string{"depth", "plot", "soil", "year", "observer"}
	var b strings.Builder
	fmt.Fprintf(&b, "x,y,depth,plot_ha,soil,year,observer\n")
	for _, v := range values {
		b.WriteString("400,300")
		for _, c := range columns {
			if c == covariate {
				b.WriteString("," + v)
			} else {
				b.WriteString("," + base[c])
			}
		}
		b.WriteByte('\n')
	}
	return write(t, "at.csv", b.String())
}

// TestEffectsAreDifferencesOfTheMap: what effects.csv says of a covariate is by how much the linear predictor of map --at
// changes with it at a place, for every role.
func TestEffectsAreDifferencesOfTheMap(t *testing.T) {
	longer(t)
	f := plain
	f.n = 100
	obs := write(t, "obs.csv", f.table(31))
	for _, c := range []struct {
		name, covariate, effect, level, role string
		words                                []string
	}{
		{"slope", "depth", "depth", "", "linear", []string{"response=zinc", "linear=depth"}},
		{"steps", "soil", "soil", "", "category", []string{"response=zinc", "category=soil"}},
		{"curve", "depth", "depth", "", "curve", []string{"response=caught", "distribution=poisson", "curve=depth"}},
		{"curve of clay", "depth", "depth", "soil=clay", "curve", []string{"response=dose", "distribution=gamma", "curve-per=depth=soil"}},
		{"group", "observer", "observer", "", "group", []string{"response=caught", "group=observer", "linear=plot_ha", "distribution=negative-binomial"}},
		{"beside surfaces", "depth", "depth", "", "curve", []string{"response=zinc", "surface-per=year", "curve=depth", "group=observer"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			words := append(c.words, "max-knots=30", "write=csv")
			first := mapped(t, obs, append(words, "at="+obs)...)
			s := readSheet(t, filepath.Join(first, "effects.csv"))
			if got := strings.Join(s.header, ","); got != effectsHeader {
				t.Errorf("effects.csv begins with %s", got)
			}
			value, estimate, _ := effectRows(t, s, c.effect, c.level)
			at := placesWith(t, c.covariate, value)
			eta := readSheet(t, filepath.Join(mapped(t, obs, append(words, "at="+at)...), "surface.csv")).numbers("linear_predictor")
			scale := slices.Max(eta) - slices.Min(eta)
			for k := range value {
				if got, want := eta[k]-eta[0], estimate[k]-estimate[0]; math.Abs(got-want) > 1e-9*math.Max(1, scale) {
					t.Fatalf("%s = %s: the map changes by %.12g, the effect by %.12g", c.effect, value[k], got, want)
				}
			}
			if !(scale > 1e-6) {
				t.Error("nothing changes")
			}
			if role := s.text("role")[slices.IndexFunc(s.rows, func(r []string) bool { return r[0] == c.effect })]; role != c.role {
				t.Errorf("its role is %s", role)
			}
		})
	}
}

// TestEffectsTable: limits are estimate -+ quantile times error; a slope is zero at its mean, a category at its base, a
// curve sums to zero over the rows; numbers run over the range of the data.
func TestEffectsTable(t *testing.T) {
	path := write(t, "obs.csv", plain.table(32))
	obs := readSheet(t, path)
	dir := mapped(t, path, "response=caught", "distribution=negative-binomial", "linear=plot_ha", "category=soil", "curve=depth",
		"group=observer", "confidence=0.9", "at="+path, "write=csv,pictures")
	s, d := readSheet(t, filepath.Join(dir, "effects.csv")), readSummary(t, dir)
	for i, v := range s.numbers("estimate") {
		half := 1.6448536269514722 * s.numbers("standard_error")[i] // the normal quantile of 0.95
		if math.Abs(s.numbers("lower")[i]-(v-half)) > 1e-9 || math.Abs(s.numbers("upper")[i]-(v+half)) > 1e-9 {
			t.Errorf("row %d: %v", i+1, s.rows[i])
		}
		if se := s.numbers("standard_error")[i]; !(se > 0) && !(se == 0 && s.rows[i][1] == "category") {
			t.Errorf("row %d has an error of %g", i+1, se)
		}
	}
	value, estimate, _ := effectRows(t, s, "plot_ha", "")
	mean, slope := 0.0, 0.0
	for _, v := range obs.numbers("plot_ha") {
		mean += v / float64(len(obs.rows))
	}
	for _, c := range d["coefficients"].([]any) {
		if c := c.(map[string]any); c["name"] == "plot_ha" {
			slope = c["estimate"].(float64)
		}
	}
	for k, v := range value {
		var x float64
		fmt.Sscan(v, &x)
		if math.Abs(estimate[k]-slope*(x-mean)) > 1e-9 {
			t.Errorf("the slope at %g is %g", x, estimate[k])
		}
	}
	levels, steps, _ := effectRows(t, s, "soil", "")
	if !slices.Equal(levels, []string{"clay", "peat", "sand"}) || steps[0] != 0 {
		t.Errorf("steps %v of %v", steps, levels)
	}
	observers, _, _ := effectRows(t, s, "observer", "")
	if len(observers) != 7 {
		t.Errorf("observers %v", observers)
	}
	depths, curve, _ := effectRows(t, s, "depth", "")
	if lo, hi := slices.Min(obs.numbers("depth")), slices.Max(obs.numbers("depth")); depths[0] != fmt.Sprint(lo) || depths[100] != fmt.Sprint(hi) {
		t.Errorf("the curve runs from %s to %s, the data from %g to %g", depths[0], depths[100], lo, hi)
	}
	// Between two of its 101 values the curve is near straight.
	sum := 0.0
	for _, x := range obs.numbers("depth") {
		at := (x - slices.Min(obs.numbers("depth"))) / (slices.Max(obs.numbers("depth")) - slices.Min(obs.numbers("depth"))) * 100
		k := min(int(at), 99)
		sum += curve[k] + (at-float64(k))*(curve[k+1]-curve[k])
	}
	if math.Abs(sum/float64(len(obs.rows))) > 1e-3*(slices.Max(curve)-slices.Min(curve)) {
		t.Errorf("the curve's mean over rows is %g", sum/float64(len(obs.rows)))
	}
	f, err := os.Open(filepath.Join(dir, "effects.png"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if m, err := png.Decode(f); err != nil || m.Bounds().Dx() < 400 {
		t.Errorf("effects.png: %v", err)
	}

	// The record has one entry an effect, with what it takes and how it scatters.
	byName := map[string]map[string]any{}
	total := d.number(t, "fit", "degrees_of_freedom", "surface") + 1
	for _, e := range d["effects"].([]any) {
		e := e.(map[string]any)
		byName[e["name"].(string)] = e
		total += e["degrees_of_freedom"].(float64)
		if o, ok := e["overlap"].(float64); !ok || o < 0 || o > 1 {
			t.Errorf("overlap of %v: %v", e["name"], e["overlap"])
		}
	}
	near(t, "degrees of freedom in all", total, d.number(t, "fit", "degrees_of_freedom", "total"), 1e-9)
	if len(byName) != 4 || byName["observer"]["range"] != "7 levels" || byName["soil"]["range"] != "3 levels, clay the base" || byName["depth"]["role"] != "curve" {
		t.Errorf("effects: %v", byName)
	}
	lambda := d.number(t, "fit", "lambda", "group observer", "value")
	near(t, "standard deviation of observers", byName["observer"]["standard_deviation"].(float64), 1/math.Sqrt(lambda), 1e-12)
	if byName["depth"]["standard_deviation"] != nil {
		t.Errorf("a curve scatters by %v", byName["depth"]["standard_deviation"])
	}
}

// TestGroupsAtPlaces: a table without the group's column, and the lattice, show the average group; a level that the data
// did not have is average too, and its error has the groups' own scatter in it.
func TestGroupsAtPlaces(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(33))
	words := []string{"response=caught", "distribution=negative-binomial", "group=observer", "smoothness-uncertainty=off", "max-knots=30", "write=csv"}
	at := func(text string) (sheet, document) {
		dir := mapped(t, obs, append(words, "at="+write(t, "at.csv", text))...)
		return readSheet(t, filepath.Join(dir, "surface.csv")), readSummary(t, dir)
	}
	none, d := at("x,y\n400,300\n700,200\n")
	some, _ := at("x,y,observer\n400,300,Z\n700,200,Z\n400,300,A\n")
	eta, se := some.numbers("linear_predictor"), some.numbers("linear_standard_error")
	sd := 0.0
	for _, e := range d["effects"].([]any) {
		sd = e.(map[string]any)["standard_deviation"].(float64)
	}
	if !(sd > 0.05) {
		t.Fatalf("observers scatter by %g", sd)
	}
	for i := range none.rows {
		near(t, "an unseen level's linear predictor", eta[i], none.numbers("linear_predictor")[i], 1e-12)
		near(t, "an unseen level's error", se[i], math.Hypot(none.numbers("linear_standard_error")[i], sd), 1e-9)
	}
	if eta[2] == eta[0] || !(se[2] < se[0]) {
		t.Errorf("a known level has %g with an error of %g, an unseen one %g with %g", eta[2], se[2], eta[0], se[0])
	}
	lattice := readSheet(t, filepath.Join(mapped(t, obs, append(words, "cells-across=10")...), "surface.csv"))
	cells := strings.Builder{}
	cells.WriteString("x,y\n")
	for _, row := range lattice.rows {
		cells.WriteString(row[0] + "," + row[1] + "\n")
	}
	same, _ := at(cells.String())
	if fmt.Sprint(same.rows) != fmt.Sprint(lattice.rows) {
		t.Error("the lattice does not show the average group")
	}
}

// visits is a survey of the same 40 places in two years that have nothing to do with one another.
func visits(year string) string {
	all := strings.Split(strings.TrimSpace(field{n: 40, wide: 1000, high: 800, scale: 1, xName: "x", yName: "y"}.table(34)), "\n")
	other := strings.Split(strings.TrimSpace(field{n: 40, wide: 1000, high: 800, scale: 1, xName: "x", yName: "y"}.table(35)), "\n")
	var b strings.Builder
	b.WriteString("x,y,n,plot_ha,season\n")
	for i := 1; i < len(all); i++ {
		place, first, second := strings.Split(all[i], ","), strings.Split(all[i], ","), strings.Split(other[i], ",")
		for name, f := range map[string][]string{"late": second, "early": first} {
			if year == "" || year == name {
				fmt.Fprintf(&b, "%s,%s,%s,%s,%s\n", place[0], place[1], f[3], f[4], name)
			}
		}
	}
	lines := strings.SplitAfter(b.String(), "\n")
	slices.Sort(lines[1 : len(lines)-1])
	return strings.Join(lines, "")
}

// TestSurfacesPerLevelAreApart: surfaces with a smoothness each, or with one that is given, are those of fits to their own
// rows alone; counts have no variance in common, so nothing ties them together. Held on the lattice, a level is what it
// is at places of that level.
func TestSurfacesPerLevelAreApart(t *testing.T) {
	longer(t)
	both := write(t, "both.csv", visits(""))
	common := []string{"response=n", "area=plot_ha", "distribution=poisson", "smoothness-uncertainty=off", "max-knots=40", "cells-across=12", "write=csv"}
	for _, c := range []struct {
		name      string
		words     []string
		alone     string
		tolerance float64
	}{
		{"own", []string{"surface-smoothness=own"}, "", 1e-4}, // two searches end within their own tolerance
		{"given", nil, "smoothness=3000", 1e-9},
	} {
		words := append(common, c.words...)
		if c.alone != "" {
			words = append(words, c.alone)
		}
		for _, season := range []string{"early", "late"} {
			dir := mapped(t, both, append(words, "surface-per=season", "hold=season="+season)...)
			held := readSheet(t, filepath.Join(dir, "surface.csv"))
			alone := common
			if c.alone != "" {
				alone = append(alone, c.alone)
			}
			single := readSheet(t, filepath.Join(mapped(t, write(t, "one.csv", visits(season)), alone...), "surface.csv"))
			for _, name := range []string{"estimate", "standard_error"} {
				for i, v := range single.numbers(name) {
					near(t, c.name+": "+name, held.numbers(name)[i], v, c.tolerance)
				}
			}
			var cells strings.Builder
			cells.WriteString("x,y,season\n")
			for _, row := range held.rows {
				fmt.Fprintf(&cells, "%s,%s,%s\n", row[0], row[1], season)
			}
			at := readSheet(t, filepath.Join(mapped(t, both, append(slices.DeleteFunc(slices.Clone(words), func(w string) bool { return w == "cells-across=12" }),
				"surface-per=season", "at="+write(t, "at.csv", cells.String()))...), "surface.csv"))
			if fmt.Sprint(at.rows) != fmt.Sprint(held.rows) {
				t.Errorf("%s: season held at %s is not the map at places of that season", c.name, season)
			}
		}
	}
	dir := mapped(t, both, append(common, "surface-per=season", "hold=season=commonest")...)
	shared := readSummary(t, dir)
	if penalties := shared.at(t, "fit", "lambda").(map[string]any); len(penalties) != 1 {
		t.Errorf("shared smoothness has penalties %v", penalties)
	}
	effect := shared["effects"].([]any)[0].(map[string]any)
	if effect["name"] != "season" || effect["role"] != "surface-per" || effect["held"] != "early (commonest)" || effect["range"] != "2 levels" {
		t.Errorf("recorded as %v", effect)
	}
	own := readSummary(t, mapped(t, both, append(common, "surface-per=season", "hold=season=early", "surface-smoothness=own")...))
	if penalties := own.at(t, "fit", "lambda").(map[string]any); len(penalties) != 2 {
		t.Errorf("own smoothness has penalties %v", penalties)
	}
	if share := checkFigure(t, shared, "knots"); !(share > 0 && share < 1) {
		t.Errorf("the surfaces use %g of what their knots allow", share)
	}
}

func checkFigure(t *testing.T, d document, name string) float64 {
	t.Helper()
	for _, c := range d["checks"].([]any) {
		if c := c.(map[string]any); c["name"] == name {
			return c["figure"].(float64)
		}
	}
	t.Fatalf("no check of %s", name)
	return 0
}

// TestHeldValueIsExact: the record has the number at which a covariate was held to the last digit, so that the map can be
// made again from it.
func TestHeldValueIsExact(t *testing.T) {
	path := write(t, "obs.csv", plain.table(36))
	mean := 0.0
	depths := readSheet(t, path).numbers("depth")
	for _, v := range depths {
		mean += v / float64(len(depths))
	}
	held := func(words ...string) (map[string]map[string]any, []string) {
		dir := mapped(t, path, append(words, "response=zinc", "cells-across=10", "max-knots=20", "write=csv")...)
		byName := map[string]map[string]any{}
		for _, e := range readSummary(t, dir)["effects"].([]any) {
			e := e.(map[string]any)
			byName[e["name"].(string)+fmt.Sprint(e["per"])] = e
		}
		return byName, lines(t, filepath.Join(dir, "surface.csv"))
	}
	e, surface := held("curve=depth", "linear=plot_ha", "hold=depth=mean", "hold=plot_ha=0.123456789012345678")
	if got := e["depth"]["held_value"].(float64); math.Abs(got-mean) > 1e-15 {
		t.Errorf("the mean is %.17g, recorded as %.17g", mean, got)
	}
	if got := e["plot_ha"]["held_value"].(float64); got != 0.123456789012345678 || e["plot_ha"]["held"] != "0.123" || e["depth"]["held"] == "" {
		t.Errorf("recorded as %v", e["plot_ha"])
	}
	_, again := held("curve=depth", "linear=plot_ha", fmt.Sprintf("hold=depth=%v", e["depth"]["held_value"]), fmt.Sprintf("hold=plot_ha=%v", e["plot_ha"]["held_value"]))
	if !slices.Equal(surface, again) {
		t.Error("the recorded values give another map")
	}
	e, _ = held("curve-per=depth=soil", "hold=depth=0.25", "hold=soil=commonest")
	for _, name := range []string{"depthsoil=clay", "depthsoil=peat", "depthsoil=sand"} {
		if e[name]["held_value"] != 0.25 {
			t.Errorf("%s is held at %v", name, e[name]["held_value"])
		}
	}
	if e["soil"]["held_value"] != nil || e["soil"]["held"] == "" {
		t.Errorf("a level is held at %v, %v", e["soil"]["held_value"], e["soil"]["held"])
	}
}

// TestManyColumnsAreRefused: more columns beside the surface than can be fitted are a request that is too large, told
// before any work; data that do not carry an effect are a fit that cannot be had.
func TestManyColumnsAreRefused(t *testing.T) {
	var b strings.Builder
	b.WriteString("x,y,z,who,twice,street\n")
	for i := range 1100 {
		fmt.Fprintf(&b, "%d,%d,%d,w%d,%d,%s\n", i%37, i/37, i%5, i, i%2, []string{"one", "other"}[min(1, i/1098)])
	}
	obs := write(t, "obs.csv", b.String())
	for _, c := range []struct {
		name, want string
		fit        bool
		words      []string
	}{
		{"columns", "1100 columns of covariates beside ", false, []string{"group=who"}},
		{"a curve of two values", `a curve of "twice": a curve needs at least 3 distinct values, and there are 2`, true, []string{"curve=twice", "hold=twice=1"}},
		{"a level in two places", "places of street=other lie on one line", true, []string{"surface-per=street", "hold=street=one"}},
	} {
		_, err := Run(t.Context(), settings(t, obs, append(c.words, "response=z", "max-knots=10", "cells-across=5", "write=csv")...), filepath.Join(t.TempDir(), "out"), silent{})
		var fit interface{ FitFailed() bool }
		if err == nil || !strings.Contains(err.Error(), c.want) || hintOf(err) == "" || !errors.As(err, &fit) || fit.FitFailed() != c.fit {
			t.Errorf("%s: %v, hint %q", c.name, err, hintOf(err))
		}
	}
}

// TestEffectsSameBytes: with one worker and with two, every file is the same, pictures too.
func TestEffectsSameBytes(t *testing.T) {
	f := plain
	f.n = 150
	obs := write(t, "obs.csv", f.table(37))
	for _, words := range [][]string{
		{"response=caught", "effort=plot_ha", "curve=depth", "group=observer", "hold=depth=mean", "threshold=9"},
		{"response=seen", "trials=examined", "surface-per=year", "surface-smoothness=own", "curve-per=depth=soil", "hold=depth=mean", "hold=soil=clay", "hold=year=dry", "write=csv,geojson,saved"},
		{"response=rain", "distribution=tweedie", "area=plot_ha", "shrink", "write=csv,saved"},
		{"response=dose", "distribution=gamma", "linear=depth", "hold=depth=1", "write=csv,saved"},
		{"response=positive", "trials=examined", "link=complementary-log-log", "extra-variation=scale", "write=csv,saved"},
	} {
		var made [2]map[string]string
		for k := range made {
			made[k] = map[string]string{}
			dir := mapped(t, obs, append(words, fmt.Sprintf("workers=%d", k+1), "max-knots=40", "cells-across=12")...)
			entries, err := os.ReadDir(dir)
			if err != nil {
				t.Fatal(err)
			}
			for _, e := range entries {
				raw, err := os.ReadFile(filepath.Join(dir, e.Name()))
				if err != nil {
					t.Fatal(err)
				}
				made[k][e.Name()] = string(raw)
			}
		}
		for name, raw := range made[0] {
			if made[1][name] != raw || len(made[0]) != len(made[1]) {
				t.Errorf("%v: %s depends on the number of workers", words, name)
			}
		}
		for file, want := range map[string]bool{
			"effects.png": !strings.Contains(strings.Join(words, " "), "write="),
			"effects.csv": strings.Contains(strings.Join(words, " "), "depth"),
		} {
			if _, there := made[0][file]; there != want {
				t.Errorf("%v: %s is there: %v", words, file, there)
			}
		}
	}
}

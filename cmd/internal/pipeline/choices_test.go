package pipeline

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// at follows keys to whatever stands there.
func (d document) at(t *testing.T, keys ...string) any {
	t.Helper()
	var v any = map[string]any(d)
	for _, k := range keys {
		m, ok := v.(map[string]any)
		if !ok {
			t.Fatalf("summary.json has no %v", keys)
		}
		if v, ok = m[k]; !ok {
			t.Fatalf("summary.json has no %v", keys)
		}
	}
	return v
}

// chosen returns the value of a setting and why the program chose it.
func (d document) chosen(t *testing.T, key string) (value any, why string) {
	t.Helper()
	entry := d.at(t, "settings", key).(map[string]any)
	why, _ = entry["chosen"].(string)
	return entry["value"], why
}

func (d document) cautions(t *testing.T) string {
	t.Helper()
	return fmt.Sprint(d.at(t, "cautions"))
}

// longer skips a test with -short, with which the race detector runs: it has no goroutines that others do not have.
func longer(t *testing.T) {
	t.Helper()
	if testing.Short() {
		t.Skip("takes a second or more")
	}
}

// quick makes a map in no time: few cells and few knots, where neither matters.
func quick(t *testing.T, observations string, words ...string) (folder string, d document) {
	t.Helper()
	dir := mapped(t, observations, append(words, "write=csv")...)
	return dir, readSummary(t, dir)
}

// TestExtraVariationIsChosen: counts and positives that were drawn with extra variation get the distribution that has it,
// those drawn without keep the plain one, and the reason is recorded in words.
func TestExtraVariationIsChosen(t *testing.T) {
	longer(t)
	f := plain
	f.n = 120
	obs := write(t, "obs.csv", f.table(21))
	for _, c := range []struct {
		name, chosen, plain, extra, why string
		words                           []string
	}{
		{"counts that scatter", "negative-binomial", "poisson", "negative-binomial", "with extra variation (theta ", []string{"response=caught", "effort=plot_ha"}},
		{"counts that do not", "poisson", "poisson", "negative-binomial", "extra variation", []string{"response=n", "area=plot_ha"}},
		{"positives that scatter", "beta-binomial", "binomial", "beta-binomial", "with extra variation (correlation ", []string{"response=seen", "trials=examined"}},
		{"positives that do not", "binomial", "binomial", "beta-binomial", "extra variation", []string{"response=positive", "trials=examined"}},
		{"bare counts on request", "negative-binomial", "poisson", "negative-binomial", "with extra variation", []string{"response=caught", "distribution=poisson", "extra-variation=auto"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, d := quick(t, obs, append(c.words, "cells-across=10")...)
			if got := d.at(t, "fit", "distribution"); got != c.chosen {
				t.Fatalf("%v is chosen", got)
			}
			v, why := d.chosen(t, "distribution")
			if v != c.chosen || !strings.Contains(why, c.why) {
				t.Errorf("recorded as %v, because %s", v, why)
			}
			x := d.at(t, "fit", "extra_variation").(map[string]any)
			if x["plain"] != c.plain || x["extra"] != c.extra || x["chosen"] != c.chosen || x["reason"] != why {
				t.Errorf("the comparison is %v", x)
			}
			// The figures of the one that was chosen are those of the fit.
			side := "plain"
			if c.chosen == c.extra {
				side = "extra"
			}
			near(t, "AIC of the comparison", x[side+"_aic"].(float64), d.number(t, "fit", "aic"), 1e-6)
			near(t, "criterion of the comparison", x[side+"_criterion"].(float64), d.number(t, "fit", "criterion_value"), 1e-6)
			if how, why := d.chosen(t, "extra_variation"); how != "auto" || (why != "default") != (c.name == "bare counts on request") {
				t.Errorf("extra_variation is %v: %q", how, why)
			}
			if shape := d.at(t, "fit", "shape"); (shape == nil) != (side == "plain") {
				t.Errorf("shape: %v", shape)
			}
		})
	}
}

// TestMalariaIsNoisierThanBinomial: villages differ for reasons other than their place. The binomial takes nearly all
// degrees of freedom there are and calls that signal; the beta-binomial takes few. At the same smoothness the binomial's
// standard errors are too small by half or more.
func TestMalariaIsNoisierThanBinomial(t *testing.T) {
	longer(t)
	obs := filepath.Join(repository, "burkina_faso_malaria.csv")
	words := []string{"response=positive", "trials=examined", "per=100", "at=" + obs, "smoothness-uncertainty=off"}
	dir, d := quick(t, obs, words...)
	_, plain := quick(t, obs, append(words, "distribution=binomial")...)
	if got := d.at(t, "fit", "distribution"); got != "beta-binomial" {
		t.Fatalf("%v is chosen", got)
	}
	few, many := d.number(t, "fit", "degrees_of_freedom", "surface"), plain.number(t, "fit", "degrees_of_freedom", "surface")
	if !(few < 10) || !(many > 100) {
		t.Errorf("%g degrees of freedom for the beta-binomial, %g for the binomial of 109 places", few, many)
	}
	lambda := fmt.Sprintf("smoothness=%v", d.number(t, "fit", "lambda", "surface", "value"))
	knots := fmt.Sprintf("max-knots=%v", d.number(t, "fit", "knots"))
	same, _ := quick(t, obs, append(words, "distribution=binomial", lambda, knots)...)
	wide := readSheet(t, filepath.Join(dir, "surface.csv")).numbers("linear_standard_error")
	narrow := readSheet(t, filepath.Join(same, "surface.csv")).numbers("linear_standard_error")
	for i := range wide {
		if !(narrow[i] < wide[i]/2) {
			t.Errorf("row %d: an error of %g for the binomial and of %g for the beta-binomial", i+1, narrow[i], wide[i])
		}
	}
}

// TestScaledVariation: the scale leaves the estimates as they are at a given smoothness and widens every error by its
// root (McCullagh & Nelder 1989, section 4.5; from memory); it is the Pearson statistic over what is free.
func TestScaledVariation(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(22))
	words := []string{"response=caught", "effort=plot_ha", "smoothness=500", "max-knots=40", "cells-across=10"}
	a, none := quick(t, obs, append(words, "extra-variation=none")...)
	b, scaled := quick(t, obs, append(words, "extra-variation=scale")...)
	s, q := readSheet(t, filepath.Join(a, "surface.csv")), readSheet(t, filepath.Join(b, "surface.csv"))
	phi := scaled.number(t, "fit", "dispersion")
	if !(phi > 1.5) {
		t.Fatalf("dispersion %g of counts that scatter", phi)
	}
	for i, eta := range s.numbers("linear_predictor") {
		near(t, "linear predictor", q.numbers("linear_predictor")[i], eta, 1e-9)
		near(t, "its error", q.numbers("linear_standard_error")[i], math.Sqrt(phi)*s.numbers("linear_standard_error")[i], 1e-9)
	}
	if got := scaled.at(t, "fit", "dispersion_known"); got != false {
		t.Errorf("the scale is known: %v", got)
	}
	if how, _ := scaled.chosen(t, "extra_variation"); how != "scale" || scaled.at(t, "fit", "distribution") != "poisson" {
		t.Errorf("recorded as %v with %v", how, scaled.at(t, "fit", "distribution"))
	}
	// There is no likelihood, and the record does not pretend that there is.
	for _, key := range []string{"aic", "aic_corrected", "log_likelihood", "criterion_value"} {
		if v := scaled.at(t, "fit", key); v != nil {
			t.Errorf("%s is %v", key, v)
		}
	}
	if a, b := checkOf(none, "over-dispersion"), checkOf(scaled, "over-dispersion"); a == "" || b != "" {
		t.Errorf("the check of over-dispersion says %q of plain counts and %q of scaled ones", a, b)
	}
}

// checkOf returns the level of a check, or nothing where it was not made.
func checkOf(d document, name string) string {
	for _, c := range d["checks"].([]any) {
		if c := c.(map[string]any); c["name"] == name {
			return c["level"].(string)
		}
	}
	return ""
}

// TestShapeThatIsGiven: it is recorded as given and not counted, and one near its bound gives the simpler distribution,
// of which it is the limit.
func TestShapeThatIsGiven(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(23))
	for _, c := range []struct {
		shape, name, simpler string
		words                []string
	}{
		{"1e7", "theta", "poisson", []string{"response=n", "area=plot_ha", "distribution=negative-binomial"}},
		{"1e-7", "correlation", "binomial", []string{"response=positive", "trials=examined", "distribution=beta-binomial"}},
	} {
		words := append(c.words, "max-knots=40", "cells-across=10")
		a, d := quick(t, obs, append(words, "shape="+c.shape)...)
		b, _ := quick(t, obs, append(words, "distribution="+c.simpler)...)
		shape := d.at(t, "fit", "shape").(map[string]any)
		if shape["name"] != c.name || shape["estimated"] != false || fmt.Sprint(shape["value"]) != fmt.Sprint(d.number(t, "settings", "shape", "value")) {
			t.Errorf("%s: recorded as %v", c.name, shape)
		}
		near(t, "aic", d.number(t, "fit", "aic"), -2*d.number(t, "fit", "log_likelihood")+2*d.number(t, "fit", "degrees_of_freedom", "total"), 1e-12)
		want := readSheet(t, filepath.Join(b, "surface.csv")).numbers("estimate")
		for i, v := range readSheet(t, filepath.Join(a, "surface.csv")).numbers("estimate") {
			near(t, c.name+" at its end", v, want[i], 1e-4)
		}
	}
	_, d := quick(t, obs, "response=caught", "effort=plot_ha", "distribution=negative-binomial", "max-knots=40", "cells-across=10")
	if shape := d.at(t, "fit", "shape").(map[string]any); shape["estimated"] != true || !(shape["value"].(float64) > 0.5 && shape["value"].(float64) < 8) {
		t.Errorf("counts drawn with theta 2: %v", shape)
	}
	near(t, "aic", d.number(t, "fit", "aic"), -2*d.number(t, "fit", "log_likelihood")+2*(d.number(t, "fit", "degrees_of_freedom", "total")+1), 1e-12)
}

// TestPowerAtItsBound: positive doses with a gamma spread have no use for a power below 2, and the record says what the
// bound stands for.
func TestPowerAtItsBound(t *testing.T) {
	_, d := quick(t, filepath.Join(repository, "meuse.csv"), "response=zinc", "distribution=tweedie", "max-knots=40", "cells-across=10")
	shape := d.at(t, "fit", "shape").(map[string]any)
	if shape["simpler"] != "gamma" || shape["value"] != 1.99 || shape["name"] != "power" {
		t.Errorf("recorded as %v", shape)
	}
	_, d = quick(t, write(t, "obs.csv", plain.table(24)), "response=rain", "distribution=tweedie", "max-knots=40", "cells-across=10")
	// Portions with shape 2 make a power of (2 + 2)/(2 + 1): Dunn & Smyth (2005), section 2.
	if shape := d.at(t, "fit", "shape").(map[string]any); shape["simpler"] != "" || math.Abs(shape["value"].(float64)-4./3) > 0.15 {
		t.Errorf("rainfall drawn with power 1.33: %v", shape)
	}
}

// TestDistributionsRefuseWhatTheyCannotHave: the row is named, and nothing is left out behind the user's back.
func TestDistributionsRefuseWhatTheyCannotHave(t *testing.T) {
	text := strings.Replace(plain.table(25), "\n", "\n1,2,3,1,1,1,10,1,10,,clay,wet,A,1,1,1,1\n", 1) // a row that is set aside
	for _, c := range []struct{ dose, distribution, want string }{
		{"0", "gamma", `obs.csv: row 2 (line 3), column "dose": a gamma distribution has no 0`},
		{"-2.5", "gamma", `obs.csv: row 2 (line 3), column "dose": a gamma distribution has no negative values: "-2.5"`},
		{"-2.5", "tweedie", `obs.csv: row 2 (line 3), column "dose": a tweedie distribution has no negative values: "-2.5"`},
	} {
		lines := strings.Split(text, "\n")
		fields := strings.Split(lines[2], ",")
		fields[15] = c.dose
		lines[2] = strings.Join(fields, ",")
		s := settings(t, write(t, "obs.csv", strings.Join(lines, "\n")), "response=dose", "distribution="+c.distribution, "linear=depth", "hold=depth=1")
		_, err := Run(t.Context(), s, filepath.Join(t.TempDir(), "out"), silent{})
		if err == nil || err.Error() != c.want || hintOf(err) == "" {
			t.Errorf("%s of %s: %v, hint %q", c.distribution, c.dose, err, hintOf(err))
		}
	}
}

// TestKnotPath: the path doubles from 50 until the fit rests, and the record is that of the fit that was kept.
func TestKnotPath(t *testing.T) {
	longer(t)
	f := plain
	f.n = 500
	for _, c := range []struct {
		name string
		obs  string
		why  string
	}{
		{"settled", write(t, "obs.csv", f.table(26)), "the fit moved by no more than "},
		{"all places", write(t, "obs.csv", plain.table(26)), "every place has a knot (60 places, "},
	} {
		_, d := quick(t, c.obs, "response=zinc", "cells-across=10")
		path := d.at(t, "fit", "knot_path").([]any)
		step := func(k int, key string) any { return path[k].(map[string]any)[key] }
		knots := []any{}
		for k := range path {
			knots = append(knots, step(k, "knots"))
			if k == 0 {
				if step(k, "knots") != 50. || step(k, "rms_change") != nil || step(k, "largest_change") != nil {
					t.Errorf("%s: the path begins with %v", c.name, path[0])
				}
				continue
			}
			rms, most := step(k, "rms_change").(float64), step(k, "largest_change").(float64)
			if !(rms > 0 && rms <= most) {
				t.Errorf("%s: changes %g and %g", c.name, rms, most)
			}
			// The rule of issue and help: root mean square above 0.1 or largest above 0.5 goes on.
			if settled := rms <= 0.1 && most <= 0.5; settled != (k == len(path)-1) && c.name == "settled" {
				t.Errorf("%s: step %d of %d with changes %g and %g", c.name, k, len(path)-1, rms, most)
			}
		}
		last := len(path) - 1
		if last < 1 || step(last, "knots") != d.at(t, "fit", "knots") || step(last, "degrees_of_freedom") != d.at(t, "fit", "degrees_of_freedom", "total") {
			t.Errorf("%s: the path ends with %v and the fit has %v knots", c.name, path[last], d.at(t, "fit", "knots"))
		}
		for k := 1; k < last; k++ {
			if knots[k] != 2*knots[k-1].(float64) {
				t.Errorf("%s: %v", c.name, knots)
			}
		}
		if v, why := d.chosen(t, "max_knots"); v != d.at(t, "fit", "knots") || !strings.Contains(why, c.why) {
			t.Errorf("%s: max_knots is recorded as %v: %s", c.name, v, why)
		}
	}
	_, d := quick(t, write(t, "obs.csv", plain.table(26)), "response=zinc", "max-knots=20", "cells-across=10")
	if path := d.at(t, "fit", "knot_path").([]any); len(path) != 0 {
		t.Errorf("with a number there is a path: %v", path)
	}
	if v, why := d.chosen(t, "max_knots"); v != 20. || why != "" || d.number(t, "fit", "knots") != 20 {
		t.Errorf("a number is recorded as %v: %q", v, why)
	}
}

// TestSmoothnessUncertainty: on below 1000 rows, off from there on, as the help says; it widens every error and never
// narrows one, and leaves the estimates alone.
func TestSmoothnessUncertainty(t *testing.T) {
	longer(t)
	f := plain
	f.n = 1000
	thousand := f.table(27)
	fewer := thousand[:strings.LastIndex(strings.TrimSuffix(thousand, "\n"), "\n")+1]
	for _, c := range []struct {
		name, obs, said, value, why string
		words                       []string
	}{
		{"999 rows", fewer, "", "on", "999 rows are fewer than 1000", nil},
		{"1000 rows", thousand, "", "off", "with 1000 rows it hardly shows", nil},
		{"on all the same", thousand, "on", "on", "", nil},
		{"off all the same", fewer, "off", "off", "", nil},
		{"cross-validated", fewer, "", "off", "it is known for restricted likelihood only", []string{"smoothness=gcv"}},
		{"given", fewer, "", "off", "the smoothness is given", []string{"smoothness=800"}},
		{"scaled", fewer, "", "off", "it is not known where the variation is scaled", []string{"extra-variation=scale"}},
	} {
		words := append(c.words, "response=n", "area=plot_ha", "max-knots=8", "cells-across=5")
		if c.said != "" {
			words = append(words, "smoothness-uncertainty="+c.said)
		}
		_, d := quick(t, write(t, "obs.csv", c.obs), words...)
		if v, why := d.chosen(t, "smoothness_uncertainty"); v != c.value || why != c.why {
			t.Errorf("%s: %v, because %s", c.name, v, why)
		}
		on := c.value == "on"
		if d.at(t, "fit", "smoothness_uncertainty") != on || strings.Contains(d.cautions(t), "as if it were known") == on {
			t.Errorf("%s: the fit says %v; cautions %s", c.name, d.at(t, "fit", "smoothness_uncertainty"), d.cautions(t))
		}
		if corrected := d.at(t, "fit", "aic_corrected"); (corrected != nil) != on || on && !(corrected.(float64) > d.number(t, "fit", "aic")) {
			t.Errorf("%s: corrected AIC %v", c.name, corrected)
		}
	}
	obs := write(t, "obs.csv", plain.table(27))
	a, _ := quick(t, obs, "response=zinc", "cells-across=10", "smoothness-uncertainty=off")
	b, _ := quick(t, obs, "response=zinc", "cells-across=10", "smoothness-uncertainty=on")
	off, on := readSheet(t, filepath.Join(a, "surface.csv")), readSheet(t, filepath.Join(b, "surface.csv"))
	var ratio []float64
	for i, se := range off.numbers("linear_standard_error") {
		near(t, "estimate", on.numbers("estimate")[i], off.numbers("estimate")[i], 1e-12)
		ratio = append(ratio, on.numbers("linear_standard_error")[i]/se)
	}
	if slices.Min(ratio) < 1 || !(slices.Max(ratio) > 1.001) || slices.Max(ratio) > 3 {
		t.Errorf("errors grow by %g to %g", slices.Min(ratio), slices.Max(ratio))
	}
	// A regression has no smoothness, and nothing is said of it.
	_, d := quick(t, obs, "response=zinc", "surface=none", "linear=depth", "hold=depth=1", "cells-across=5")
	if _, there := d.at(t, "settings").(map[string]any)["smoothness_uncertainty"]; there || strings.Contains(d.cautions(t), "smoothness") {
		t.Errorf("a regression speaks of its smoothness: %v, %s", there, d.cautions(t))
	}
}

// TestShrink: where nothing varies between places the surface vanishes, where something does it stays.
func TestShrink(t *testing.T) {
	var board strings.Builder // black and white squares have no trend, and are rougher than chance
	board.WriteString("x,y,z\n")
	for i := range 64 {
		fmt.Fprintf(&board, "%d,%d,%d\n", 10*(i%8), 10*(i/8), 5+(i%8+i/8)%2)
	}
	dir, d := quick(t, write(t, "obs.csv", board.String()), "response=z", "shrink", "cells-across=10")
	if df := d.number(t, "fit", "degrees_of_freedom", "surface"); df > 0.05 {
		t.Errorf("%g degrees of freedom for a chess board", df)
	}
	if d.at(t, "fit", "surface_is_a_plane") != false {
		t.Error("a surface that vanished is called a plane")
	}
	level := readSheet(t, filepath.Join(dir, "surface.csv")).numbers("estimate")
	near(t, "the flat map", slices.Min(level), 5.5, 1e-3)
	near(t, "the flat map", slices.Max(level), 5.5, 1e-3)
	obs := write(t, "obs.csv", plain.table(28))
	a, _ := quick(t, obs, "response=zinc", "shrink", "cells-across=10")
	b, _ := quick(t, obs, "response=zinc", "cells-across=10")
	free := readSheet(t, filepath.Join(b, "surface.csv"))
	for i, v := range readSheet(t, filepath.Join(a, "surface.csv")).numbers("estimate") {
		if se := free.numbers("standard_error")[i]; math.Abs(v-free.numbers("estimate")[i]) > se {
			t.Errorf("cell %d: %g where it may vanish, %g where it may not, with an error of %g", i, v, free.numbers("estimate")[i], se)
		}
	}
	names := d.at(t, "fit", "lambda").(map[string]any)
	if _, surface := names["surface"]; len(names) != 2 || !surface {
		t.Errorf("penalties: %v", names)
	}
}

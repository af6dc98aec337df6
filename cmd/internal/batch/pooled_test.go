package batch

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"drumlin/io/summary"
	"drumlin/spatial"
)

// stations is an invented table of measurements at places that are the same every year; the level differs.
func stations(year uint64) string {
	places, noise := rand.New(rand.NewPCG(3, 3)), rand.New(rand.NewPCG(year, 4))
	var b strings.Builder
	b.WriteString("x,y,acidity\n")
	for range 45 {
		x, y := 1000*places.Float64(), 800*places.Float64()
		level := 5 + 0.1*float64(year) + math.Sin(x/220) + 0.6*math.Cos(y/150)
		fmt.Fprintf(&b, "%.1f,%.1f,%.4f\n", x, y, level+0.4*noise.NormFloat64())
	}
	return b.String()
}

const pooledPlan = "[defaults]\nresponse = \"acidity\"\nsmoothness = \"pooled\"\nmax_knots = 100\ncells_across = 12\nwrite = \"csv\"\n[regions]\nfiles = \"data/*.csv\"\n"

// TestPooled: the pooled lambda is where the restricted likelihoods of all regions, fitted here without the batch, add up
// to their best; every region's fit has that lambda and says so.
func TestPooled(t *testing.T) {
	tables := map[string]string{"data/none.csv": "x,y,acidity\n1,1,1\n"}
	for year := range uint64(5) {
		tables[fmt.Sprintf("data/year-%d.csv", year)] = stations(year)
	}
	path := planted(t, pooledPlan, tables)
	out := filepath.Join(t.TempDir(), "maps")
	report := ran(t, path, out, Options{})
	if report.Tally.Failed != 1 || report.Tally.Fresh != 5 {
		t.Fatalf("%+v", report.Tally)
	}
	var p pooled
	text, err := os.ReadFile(filepath.Join(out, "pooled.json"))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, &p); err != nil || p.Regions != 5 || !(p.Least <= p.Lambda && p.Lambda <= p.Most) || !(p.Loss >= 0) {
		t.Fatalf("%+v, %v", p, err)
	}
	together := func(lambda float64) (sum float64) {
		for name, text := range tables {
			if name == "data/none.csv" {
				continue
			}
			sum += criterionAt(t, text, lambda)
		}
		return sum
	}
	const step = 0.02 // in log lambda
	below, at, above := together(p.Lambda*math.Exp(-step)), together(p.Lambda), together(p.Lambda*math.Exp(step))
	curved := (below + above - 2*at) / step / step
	if slope := (above - below) / 2 / step; !(curved > 0.1) || math.Abs(slope/curved) > 1e-4 {
		t.Errorf("at lambda %g the criteria add up to %.9g with the slope %.3g and the curvature %.3g in log lambda", p.Lambda, at, slope, curved)
	}
	for _, o := range report.Outcomes {
		if o.Status == Failed {
			continue
		}
		var d summary.Document
		text, err := os.ReadFile(filepath.Join(out, o.Folder, "summary.json"))
		if err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(text, &d); err != nil {
			t.Fatal(err)
		}
		if got := float64(d.Fit.Lambda["surface"].Value); math.Abs(got-p.Lambda) > 1e-9*p.Lambda {
			t.Errorf("%s has lambda %g, not %g", o.Region, got, p.Lambda)
		}
		for _, s := range d.Settings {
			if s.Key == "smoothness" && (s.Value != p.Lambda || !strings.HasPrefix(s.Chosen, "pooled: ")) {
				t.Errorf("%s: smoothness %v, %s", o.Region, s.Value, s.Chosen)
			}
		}
	}
	want := tree(t, out)

	b := loaded(t, path)
	again, err := b.Run(t.Context(), out, Options{}, silent{})
	if err != nil || again.Tally.Unchanged != 5 {
		t.Errorf("run again: %+v, %v", again.Tally, err)
	}
	parts := filepath.Join(t.TempDir(), "maps")
	for k := 1; k <= 2; k++ {
		ran(t, path, parts, Options{Part: Part{k, 2}, Workers: k})
	}
	ran(t, path, parts, Options{Gather: true})
	sameTree(t, "parts gathered", want, tree(t, parts))

	rewrite(t, filepath.Join(filepath.Dir(path), "data", "year-1.csv"), stations(99))
	if _, err := b.Run(t.Context(), out, Options{Gather: true}, silent{}); err == nil || !strings.Contains(err.Error(), "is not known for the input as it is now") {
		t.Errorf("gathered after a change: %v", err)
	}
	if changed := ran(t, path, out, Options{}); changed.Tally.Fresh != 5 {
		t.Errorf("with another table for one year: %+v", changed.Tally)
	}
}

// criterionAt fits a table at one lambda.
func criterionAt(t *testing.T, table string, lambda float64) float64 {
	t.Helper()
	var d spatial.Data
	for _, line := range strings.Split(strings.TrimSpace(table), "\n")[1:] {
		f := strings.Split(line, ",")
		var v [3]float64
		for k := range v {
			v[k], _ = strconv.ParseFloat(f[k], 64)
		}
		d.Places.X, d.Places.Y = append(d.Places.X, v[0]), append(d.Places.Y, v[1])
		d.Response = append(d.Response, v[2])
	}
	s, err := spatial.Fit(t.Context(), spatial.Model{Distribution: "gaussian", Link: "identity", MaxKnots: 100,
		Smoothness: spatial.Smoothness{Method: spatial.Given, Lambda: lambda}}, d, spatial.Options{Workers: 1, Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	return s.Report().CriterionValue
}

func TestMinimise(t *testing.T) {
	for _, c := range []struct {
		name   string
		lo, hi float64
		f      func(x float64) float64
		want   float64
	}{
		{"a parabola", -1, 3, func(x float64) float64 { return (x - 0.7) * (x - 0.7) }, 0.7},
		{"beyond the range above", 0, 1, func(x float64) float64 { return math.Cosh(x - 9.25) }, 9.25},
		{"beyond the range below", 0, 1, func(x float64) float64 { return math.Cosh(x + 6.5) }, -6.5},
		{"no range", 2, 2, func(x float64) float64 { return math.Exp(x) - 5*x }, math.Log(5)},
		{"lopsided", -2, 8, func(x float64) float64 { return math.Log1p(math.Exp(3*(x-1))) - 0.3*x }, 1 + math.Log(0.1/0.9)/3},
	} {
		calls := 0
		x, value, err := minimise(c.lo, c.hi, func(x float64) (float64, error) {
			calls++
			return c.f(x), nil
		})
		if err != nil || math.Abs(x-c.want) > 2e-5 || math.Abs(value-c.f(c.want)) > 1e-8 || calls > 45 {
			t.Errorf("%s: %.9g where it is %.9g, after %d calls, %v; want %.9g", c.name, x, value, calls, err, c.want)
		}
	}
	fails := errors.New("no")
	if _, _, err := minimise(0, 1, func(x float64) (float64, error) { return 0, fails }); err != fails {
		t.Error(err)
	}
}

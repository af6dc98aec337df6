package pipeline

import (
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"drumlin/io/plan"
)

type silent struct{}

func (silent) Stage(string, int, int) {}

// repository is where the top-level testdata lies, seen from this package.
const repository = "../../../testdata"

// settings says the words, each as name=value, about the observations in a file.
func settings(t *testing.T, observations string, words ...string) plan.Settings {
	t.Helper()
	s := plan.Settings{Observations: &observations}
	for _, said := range words {
		name, value, _ := strings.Cut(said, "=")
		w, ok := plan.Lookup(name)
		if !ok {
			t.Fatalf("there is no word %q", name)
		}
		if err := w.Set(&s, value); err != nil {
			t.Fatal(err)
		}
	}
	s, err := s.Resolve()
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// mapped runs drumlin map and returns the folder it made.
func mapped(t *testing.T, observations string, words ...string) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "out")
	if _, err := Run(t.Context(), settings(t, observations, words...), dir, silent{}); err != nil {
		t.Fatal(err)
	}
	return dir
}

// sheet is a table that was read back.
type sheet struct {
	t      *testing.T
	header []string
	rows   [][]string
}

func readSheet(t *testing.T, path string) sheet {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	all, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return sheet{t, all[0], all[1:]}
}

func (s sheet) text(name string) []string {
	s.t.Helper()
	for j, h := range s.header {
		if h == name {
			column := make([]string, len(s.rows))
			for i, row := range s.rows {
				column[i] = row[j]
			}
			return column
		}
	}
	s.t.Fatalf("no column %q among %v", name, s.header)
	return nil
}

// numbers returns a column, NaN where it is empty.
func (s sheet) numbers(name string) []float64 {
	s.t.Helper()
	v := make([]float64, len(s.rows))
	for i, text := range s.text(name) {
		v[i] = math.NaN()
		if text == "" {
			continue
		}
		var err error
		if v[i], err = strconv.ParseFloat(text, 64); err != nil {
			s.t.Fatal(err)
		}
	}
	return v
}

// document is summary.json as a stranger would read it.
type document map[string]any

func readSummary(t *testing.T, dir string) document {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join(dir, "summary.json"))
	if err != nil {
		t.Fatal(err)
	}
	var d document
	if err := json.Unmarshal(raw, &d); err != nil {
		t.Fatal(err)
	}
	return d
}

// number follows keys to a number.
func (d document) number(t *testing.T, keys ...string) float64 {
	t.Helper()
	var at any = map[string]any(d)
	for _, k := range keys {
		m, _ := at.(map[string]any)
		at = m[k]
	}
	v, ok := at.(float64)
	if !ok {
		t.Fatalf("summary.json has no number at %v", keys)
	}
	return v
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Max(1e-300, math.Abs(want))) {
		t.Errorf("%s: %.15g, want %.15g within a share of %g", what, got, want, tolerance)
	}
}

// write puts a file into a fresh folder and returns its path.
func write(t *testing.T, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// field is an invented survey of n places on a ground of wide x high units: a measurement, a count on a plot, a count
// among people, a number positive among examined, a linear covariate and a category; then a second category, an observer
// whose catch is high or low, a count and a number positive that scatter more than poisson and binomial, a dose above 0
// and a rainfall that can be 0. The level rises from west to east with a hump in the middle. Every coordinate is times
// scale.
type field struct {
	n          int
	wide, high float64
	x0, y0     float64
	scale      float64
	xName      string
	yName      string
}

var plain = field{n: 60, wide: 1000, high: 800, scale: 1, xName: "x", yName: "y"}

func (f field) table(seed uint64) string {
	random, more := rand.New(rand.NewPCG(seed, 1)), rand.New(rand.NewPCG(seed, 2))
	var b strings.Builder
	fmt.Fprintf(&b, "%s,%s,zinc,n,plot_ha,cases,people,positive,examined,depth,soil,year,observer,caught,seen,dose,rain\n", f.xName, f.yName)
	for range f.n {
		u, v := random.Float64(), random.Float64()
		level := math.Exp(0.5 + u + math.Exp(-20*((u-0.5)*(u-0.5)+(v-0.5)*(v-0.5))))
		depth := math.Round(100*random.Float64()) / 100
		soil := []string{"clay", "peat", "sand"}[random.IntN(3)]
		plot := 0.5 + random.Float64()
		people := 200 + random.IntN(3000)
		examined := 20 + random.IntN(60)
		positive := 0
		for range examined {
			if random.Float64() < level/(level+8) {
				positive++
			}
		}
		fmt.Fprintf(&b, "%v,%v,%.3f,%d,%.3f,%d,%d,%d,%d,%v,%s,", f.x0+f.scale*u*f.wide, f.y0+f.scale*v*f.high,
			20+3*level+4*depth+random.NormFloat64(), poisson(random, 2*level*plot), plot,
			poisson(random, level*float64(people)/1000), people, positive, examined, depth, soil)
		b.WriteString(scattered(more, level, depth, examined))
	}
	return b.String()
}

// scattered is the second half of a row.
func scattered(random *rand.Rand, level, depth float64, examined int) string {
	year, observer := random.IntN(2), random.IntN(7)
	portion := gamma(random, 2) / 2 // a count with theta 2
	share := gamma(random, 2)
	share /= share + gamma(random, 3) // a share with correlation 1/(2 + 3 + 1)
	seen := 0
	for range examined {
		if random.Float64() < share {
			seen++
		}
	}
	rain := 0.0
	for range poisson(random, level/3) {
		rain += gamma(random, 2)
	}
	catch := level * math.Exp(float64(observer-3)/6+math.Sin(5*depth)/2+float64(year)/2)
	return fmt.Sprintf("%s,%s,%d,%d,%.4f,%.2f\n", []string{"wet", "dry"}[year], string(rune('A'+observer)),
		poisson(random, 2*catch*portion), seen, level*gamma(random, 3)/3, rain)
}

// gamma draws from a gamma distribution with a whole shape and scale 1.
func gamma(random *rand.Rand, shape int) (v float64) {
	for range shape {
		v += random.ExpFloat64()
	}
	return v
}

// poisson draws by counting exponential waiting times; mean must be moderate.
func poisson(random *rand.Rand, mean float64) int {
	n := 0
	for t := random.ExpFloat64(); t < mean; t += random.ExpFloat64() {
		n++
	}
	return n
}

// rectangles is GeoJSON with named rectangles, each as west, south, east, north.
func rectangles(names []string, boxes ...[4]float64) string {
	var features []string
	for i, b := range boxes {
		features = append(features, fmt.Sprintf(`{"type":"Feature","properties":{"name":%q},"geometry":{"type":"Polygon","coordinates":[[[%v,%v],[%v,%v],[%v,%v],[%v,%v],[%v,%v]]]}}`,
			names[i], b[0], b[1], b[2], b[1], b[2], b[3], b[0], b[3], b[0], b[1]))
	}
	return `{"type":"FeatureCollection","features":[` + strings.Join(features, ",") + `]}`
}

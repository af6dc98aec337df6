package batch

import (
	"fmt"
	"math"
	"math/rand/v2"
	"path/filepath"
	"strings"
	"testing"
)

// poissonVale is an invented table of 200 counts drawn from a poisson distribution about a wavy level.
func poissonVale(seed uint64) string {
	random := rand.New(rand.NewPCG(seed, 500))
	phase := 6 * random.Float64()
	var b strings.Builder
	b.WriteString("x,y,count,plot_ha\n")
	for range 200 {
		x, y := 10000*random.Float64(), 10000*random.Float64()
		mean := math.Exp(1 + 0.8*math.Sin(x/2500+phase) + 0.6*math.Cos(y/3000+phase))
		n := -1
		for at := 0.0; at < mean; n++ {
			at += random.ExpFloat64()
		}
		fmt.Fprintf(&b, "%.1f,%.1f,%d,1\n", x, y, n)
	}
	return b.String()
}

const poissonPlan = "[defaults]\nresponse = \"count\"\narea = \"plot_ha\"\ndistribution = \"poisson\"\nmax_knots = 60\ncells_across = 40\nwrite = %q\n" +
	"[regions]\nfiles = \"data/*.csv\"\n"

// BenchmarkRegions runs 500 regions of 200 counts each, with 60 knots and 40 x 40 cells, into CSV: an operation is the
// whole batch, everything on the disk. The pictures of 50 of them show what a picture costs.
func BenchmarkRegions(b *testing.B) {
	for _, kind := range []struct {
		write   string
		regions int
	}{{"csv", 500}, {"csv", 50}, {"csv,pictures", 50}} {
		tables := map[string]string{}
		for r := range kind.regions {
			tables[fmt.Sprintf("data/vale-%03d.csv", r)] = poissonVale(uint64(r))
		}
		path := planted(b, fmt.Sprintf(poissonPlan, kind.write), tables)
		for _, workers := range []int{1, 2} {
			b.Run(fmt.Sprintf("%s/regions=%d/workers=%d", kind.write, kind.regions, workers), func(b *testing.B) {
				for b.Loop() {
					r, err := loaded(b, path).Run(b.Context(), filepath.Join(b.TempDir(), "maps"), Options{Workers: workers}, silent{})
					if err != nil || r.Tally.Fresh != kind.regions {
						b.Fatal(err, r.Tally)
					}
				}
			})
		}
	}
}

// BenchmarkLoad checks a plan of 100 000 regions that each have a table and a word of their own.
func BenchmarkLoad(b *testing.B) {
	const n = 100_000
	var text strings.Builder
	text.WriteString("[defaults]\nresponse = \"count\"\narea = \"plot_ha\"\n")
	for i := range n {
		fmt.Fprintf(&text, "[region.vale-%06d]\nobservations = \"data/vale.csv\"\nmax_knots = %d\n", i, 20+i%50)
	}
	path := planted(b, text.String(), map[string]string{"data/vale.csv": "x,y,count,plot_ha\n1,2,3,1\n"})
	b.ReportAllocs()
	for b.Loop() {
		if loaded(b, path).Len() != n {
			b.Fatal("regions are missing")
		}
	}
}

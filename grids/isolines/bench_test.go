package isolines

import (
	"fmt"
	"math"
	"testing"

	"drumlin/grids"
)

// A thousand cells each way and ten levels: hills as a fitted surface has them, and noise, the worst there is.
func BenchmarkLevels(b *testing.B) {
	const n = 1000
	hills := func() (grids.Lattice, []float64) {
		return surfaceOf(n, n, 1, func(x, y float64) float64 { return math.Sin(x/70)*math.Cos(y/90) + 0.3*math.Sin((x+2*y)/40) })
	}
	levels := Round(-1.3, 1.3, 10)
	for _, c := range []struct {
		name string
		make func() (grids.Lattice, []float64)
		at   []float64
	}{{"hills", hills, levels}, {"noise", func() (grids.Lattice, []float64) { return noise(n) }, Round(0, 1, 10)}} {
		l, v := c.make()
		b.Run(fmt.Sprintf("%s/lines", c.name), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				linesOf(b, l, v, c.at...)
			}
		})
		edges := append(append([]float64{-inf}, c.at...), inf)
		b.Run(fmt.Sprintf("%s/bands", c.name), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				bandsOf(b, l, v, edges...)
			}
		})
	}
}

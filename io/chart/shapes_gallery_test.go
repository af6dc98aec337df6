package chart

import (
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/paulmach/orb"

	"drumlin/grids"
)

// patchwork cuts a plane of nx x ny squares of a side into irregular polygons that share their borders to the bit: the
// corners are moved at random, and each border bends some times on its way.
func patchwork(nx, ny, bends int, side float64, seed uint64) []orb.Geometry {
	all, _ := patchworkAndEdge(nx, ny, bends, side, seed)
	return all
}

// patchworkAndEdge returns the ring around them all as well.
func patchworkAndEdge(nx, ny, bends int, side float64, seed uint64) (all []orb.Geometry, edge orb.Ring) {
	random := rand.New(rand.NewPCG(seed, 1))
	corner := make([][]orb.Point, ny+1)
	for j := range corner {
		corner[j] = make([]orb.Point, nx+1)
		for i := range corner[j] {
			corner[j][i] = orb.Point{side * (float64(i) + 0.5*(random.Float64()-0.5)), side * (float64(j) + 0.5*(random.Float64()-0.5))}
		}
	}
	way := func(a, b orb.Point) []orb.Point {
		points := []orb.Point{a}
		for k := 1; k <= bends; k++ {
			t := float64(k) / float64(bends+1)
			bend := 0.12 * side * (random.Float64() - 0.5)
			points = append(points, orb.Point{a[0] + t*(b[0]-a[0]) + bend, a[1] + t*(b[1]-a[1]) - bend})
		}
		return append(points, b)
	}
	east, north := map[[2]int][]orb.Point{}, map[[2]int][]orb.Point{} // borders that start at a corner
	for j := range ny + 1 {
		for i := range nx + 1 {
			if i < nx {
				east[[2]int{i, j}] = way(corner[j][i], corner[j][i+1])
			}
			if j < ny {
				north[[2]int{i, j}] = way(corner[j][i], corner[j+1][i])
			}
		}
	}
	add := func(ring *orb.Ring, points []orb.Point, back bool) {
		for k := range len(points) - 1 {
			if back {
				k = len(points) - 1 - k
			}
			*ring = append(*ring, points[k])
		}
	}
	around := func(i0, j0, i1, j1 int) (ring orb.Ring) {
		for i := i0; i < i1; i++ {
			add(&ring, east[[2]int{i, j0}], false)
		}
		for j := j0; j < j1; j++ {
			add(&ring, north[[2]int{i1, j}], false)
		}
		for i := i1 - 1; i >= i0; i-- {
			add(&ring, east[[2]int{i, j1}], true)
		}
		for j := j1 - 1; j >= j0; j-- {
			add(&ring, north[[2]int{i0, j}], true)
		}
		return append(ring, ring[0])
	}
	for j := range ny {
		for i := range nx {
			all = append(all, orb.Polygon{around(i, j, i+1, j+1)})
		}
	}
	return all, around(0, 0, nx, ny)
}

// round is a closed ring of n vertices around a centre.
func round(x, y, r float64, n int) orb.Ring {
	ring := make(orb.Ring, n+1)
	for k := range ring {
		a := 2 * math.Pi * float64(k%n) / float64(n)
		ring[k] = orb.Point{x + r*math.Cos(a), y + r*math.Sin(a)}
	}
	return ring
}

func valued(all []orb.Geometry, f func(u, v float64) float64) Shapes {
	s := Shapes{Geometry: all}
	b := s.bound()
	for _, g := range all {
		c := g.Bound().Center()
		s.Value = append(s.Value, f((c[0]-b.Min[0])/(b.Max[0]-b.Min[0]), (c[1]-b.Min[1])/(b.Max[1]-b.Min[1])))
	}
	return s
}

// parishes are invented: a patchwork, one of them around a town that has a market in it, islands, and one without a value.
func parishes() (s Shapes, edge orb.MultiPolygon) {
	all, ring := patchworkAndEdge(9, 6, 5, 9000, 11)
	around := all[22].(orb.Polygon)
	c := around.Bound().Center()
	town := round(c[0], c[1], 2600, 40)
	market := round(c[0], c[1], 900, 30)
	all[22] = orb.Polygon{around[0], town}
	all = append(all, orb.Polygon{town, market}, orb.Polygon{market})
	islands := orb.MultiPolygon{{round(88000, 50000, 2500, 24)}, {round(93000, 46500, 1300, 16)}, {round(91000, 42000, 500, 9)}, {round(95000, 41000, 60, 7)}}
	all = append(all, islands)
	s = valued(all, hills)
	s.Value[22], s.Value[54], s.Value[55] = 12, 22, 6
	s.Value[30] = math.NaN()
	names := []string{"Ash", "Tavish", "Pellworm", "Upper Harrow", "Mere", "Ostrava", "Low Fen", "Birk", "Sandgate on the Marsh"}
	for i := range all {
		s.Name = append(s.Name, names[i%len(names)])
	}
	return s, append(orb.MultiPolygon{{ring}}, islands...)
}

// transects are lines walked from a path, some of them crossing, with wells beside them.
func transects() Shapes {
	random := rand.New(rand.NewPCG(5, 6))
	var s Shapes
	for k := range 14 {
		x := 420000 + 900*float64(k)
		line := orb.LineString{}
		for i := range 30 {
			line = append(line, orb.Point{x + 250*math.Sin(float64(i)/4+float64(k)), 5410000 + 260*float64(i)})
		}
		s.Geometry, s.Value, s.Name = append(s.Geometry, line), append(s.Value, 0.4*float64(k*k%23)), append(s.Name, fmt.Sprintf("Line %d", k+1))
	}
	s.Geometry = append(s.Geometry, orb.MultiLineString{{{419500, 5411500}, {432500, 5413000}}, {{419500, 5416400}, {426000, 5415200}}})
	s.Value, s.Name = append(s.Value, 4.4), append(s.Name, "Dyke")
	for range 12 {
		s.Geometry = append(s.Geometry, orb.Point{420000 + 11000*random.Float64(), 5410000 + 7500*random.Float64()})
		s.Value, s.Name = append(s.Value, 9*random.Float64()), append(s.Name, "")
	}
	s.Geometry = append(s.Geometry, orb.MultiPoint{{420450, 5417200}, {430950, 5410300}})
	s.Value, s.Name = append(s.Value, math.NaN()), append(s.Name, "Old wells")
	return s
}

// strips are long and thin, down to less than a pixel.
func strips() Shapes {
	var all []orb.Geometry
	for k := range 30 {
		y, thick := 60*float64(k), 56*math.Pow(0.83, float64(k))
		ring := orb.Ring{}
		for i := range 41 {
			x := 50 * float64(i)
			ring = append(ring, orb.Point{x, y + 12*math.Sin(x/160)})
		}
		for i := 40; i >= 0; i-- {
			x := 50 * float64(i)
			ring = append(ring, orb.Point{x, y + thick + 12*math.Sin(x/160)})
		}
		all = append(all, orb.Polygon{append(ring, ring[0])})
	}
	return valued(all, func(u, v float64) float64 { return 10 + 9*math.Sin(40*v) })
}

// shapePictures adds pictures of shapes to the gallery.
func shapePictures(t testing.TB, all map[string]Map) {
	azimuthal, utm := plane(t, "laea lon=-38.5 lat=47.25"), plane(t, "EPSG:32633")
	named, edge := parishes()
	all["shapes"] = Map{Title: "Malaria in children under five, Tavish coast", Subtitle: "the smoothed value of each place", Legend: "positives per 100 tested",
		Lattice: grids.Lattice{CRS: azimuthal}, Shapes: named, Outline: edge, Foot: []string{"Peaks are covered less often than the stated 95 %."}}
	risks := named
	risks.Value = nil
	for _, v := range named.Value {
		risks.Value = append(risks.Value, math.Exp((v-13)/9))
	}
	all["shapes-ratio"] = Map{Title: "Relative risk of malaria, Tavish coast", Legend: "risk relative to the overall rate", Kind: Ratio,
		Lattice: grids.Lattice{CRS: azimuthal}, Shapes: risks, Stamp: "NOT FOR USE: the fit did not converge"}
	all["shapes-lines"] = Map{Title: "Larks along the transects of Harrow valley", Legend: "birds per km", Lattice: grids.Lattice{CRS: utm}, Shapes: transects()}
	all["shapes-tiny"] = Map{Title: "Wards", Legend: "cases per 1000 people", Lattice: grids.Lattice{CRS: azimuthal}, Shapes: valued(patchwork(60, 50, 6, 1000, 3), hills)}
	// A town of blocks of two or three pixels, and a village far away.
	all["shapes-specks"] = Map{Title: "Blocks", Legend: "cases per 1000 people", Lattice: grids.Lattice{CRS: azimuthal}, Shapes: valued(append(patchwork(70, 60, 0, 100, 3), orb.Polygon{round(30000, 21000, 2000, 60)}), hills)}
	all["shapes-strips"] = Map{Title: "River reaches", Legend: "fish per 100 m", Kind: Uncertainty, Lattice: grids.Lattice{CRS: utm}, Shapes: strips()}
	chance := valued(patchwork(5, 12, 3, 500, 8), func(u, v float64) float64 { return 1 / (1 + math.Exp(12-hills(u, v))) })
	all["shapes-chance"] = Map{Title: "Zinc above the limit for gardens", Legend: "chance that the mean exceeds 400 mg kg⁻¹", Kind: Chance, Lattice: grids.Lattice{CRS: utm}, Shapes: chance,
		Zones: bands(grids.Lattice{Cell: 100, NX: 25, NY: 60}, "Lower Marsh", "Mere")}
	all["single-shape"] = Map{Title: "One place", Legend: "ppm", Lattice: grids.Lattice{CRS: utm}, Shapes: Shapes{Geometry: []orb.Geometry{orb.Point{455000, 5300000}}, Value: []float64{4}, Name: []string{"Well"}}}
}

// BenchmarkShapes draws as many areas as a country has counties and a large town has wards.
func BenchmarkShapes(b *testing.B) {
	for _, c := range []struct {
		name         string
		nx, ny, bend int
	}{{"n=100", 10, 10, 24}, {"n=3000", 60, 50, 24}} {
		m := Map{Title: "Wards", Shapes: valued(patchwork(c.nx, c.ny, c.bend, 1000, 3), hills)}
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for range b.N {
				if err := m.WritePNG(io.Discard); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

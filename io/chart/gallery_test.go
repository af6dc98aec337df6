package chart

import (
	"bytes"
	"flag"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"

	"github.com/paulmach/orb"

	"drumlin/grids"
	"drumlin/grids/crs"
)

var pictures = flag.String("pictures", "", "folder to write the pictures of the gallery to, for looking at")

func plane(t testing.TB, code string) crs.System {
	t.Helper()
	s, err := crs.Parse(code)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// field fills a lattice with an invented surface: hills of the given height on u, v in 0..1.
func field(l grids.Lattice, f func(u, v float64) float64) []float64 {
	value := make([]float64, l.Cells())
	for k := range value {
		value[k] = f((float64(k%l.NX)+0.5)/float64(l.NX), (float64(k/l.NX)+0.5)/float64(l.NY))
	}
	return value
}

func hills(u, v float64) float64 {
	return 12 + 9*math.Sin(5*u+1)*math.Cos(4*v) + 6*u*v
}

func skewed(u, v float64) float64 { return math.Exp(0.45 * hills(u, v)) }

// blob is an invented study area: a wavy ring that fills the lattice's box, and the lattice masked by it.
func blob(l *grids.Lattice) orb.MultiPolygon {
	w, h := float64(l.NX)*l.Cell, float64(l.NY)*l.Cell
	radius := func(a float64) float64 { return 0.43 + 0.05*math.Sin(3*a+0.5) + 0.015*math.Sin(8*a) }
	ring := orb.Ring{}
	for i := 0; i <= 360; i++ {
		a := float64(i%360) * math.Pi / 180
		ring = append(ring, orb.Point{l.X0 + w*(0.5+radius(a)*math.Cos(a)), l.Y0 + h*(0.5+radius(a)*math.Sin(a))})
	}
	l.Mask = make([]bool, l.Cells())
	for k := range l.Mask {
		x, y := l.Centre(k)
		dx, dy := (x-l.X0)/w-0.5, (y-l.Y0)/h-0.5
		l.Mask[k] = math.Hypot(dx, dy) <= radius(math.Atan2(dy, dx))
	}
	return orb.MultiPolygon{{ring}}
}

func scatter(l grids.Lattice, n int, seed uint64) Points {
	rng := rand.New(rand.NewPCG(seed, 1))
	p := Points{}
	for len(p.X) < n {
		k := rng.IntN(l.Cells())
		if !l.In(k) {
			continue
		}
		x, y := l.Centre(k)
		p.X = append(p.X, x+(rng.Float64()-0.5)*l.Cell)
		p.Y = append(p.Y, y+(rng.Float64()-0.5)*l.Cell)
	}
	return p
}

// bands cuts a lattice's box into n zones from south to north.
func bands(l grids.Lattice, names ...string) []Zone {
	w, h := float64(l.NX)*l.Cell, float64(l.NY)*l.Cell
	var z []Zone
	for i, name := range names {
		y0, y1 := l.Y0+h*float64(i)/float64(len(names)), l.Y0+h*float64(i+1)/float64(len(names))
		z = append(z, Zone{name, orb.MultiPolygon{{{{l.X0, y0}, {l.X0 + w, y0}, {l.X0 + w, y1}, {l.X0, y1}, {l.X0, y0}}}}})
	}
	return z
}

// gallery is one map for each thing that can be drawn; the places and numbers are invented.
func gallery(t testing.TB) map[string]Map {
	local, utm, azimuthal := plane(t, "local"), plane(t, "EPSG:32633"), plane(t, "laea lon=-38.5 lat=47.25")
	all := map[string]Map{}

	square := grids.Lattice{CRS: local, Cell: 0.01, NX: 100, NY: 100}
	all["unit-square"] = Map{Title: "Soil moisture on the trial field", Legend: "volumetric water content, %", Lattice: square, Value: field(square, hills), Observations: scatter(square, 60, 1)}

	wide := grids.Lattice{CRS: utm, X0: 421300, Y0: 5411200, Cell: 200, NX: 320, NY: 90}
	outline := blob(&wide)
	all["wide-utm"] = Map{Title: "Stems in the Harrow valley forest", Subtitle: "adjusted to depth = 12.5", Legend: "stems per hectare", Lattice: wide,
		Value: field(wide, skewed), Outline: outline, Observations: scatter(wide, 120, 2), Foot: []string{"Counts vary more than a Poisson model allows: intervals are too narrow by a factor of 1.4."}}

	tall := grids.Lattice{CRS: azimuthal, X0: -20000, Y0: -60000, Cell: 500, NX: 80, NY: 240}
	tallOutline := blob(&tall)
	all["tall-azimuthal"] = Map{Title: "Malaria in children under five, Tavish coast", Legend: "positives among those tested, standard error in percentage points", Kind: Uncertainty, Lattice: tall,
		Value: field(tall, func(u, v float64) float64 { return 1.5 + 4*math.Pow(math.Hypot(u-0.5, v-0.5), 2) }), Outline: tallOutline,
		Zones: bands(tall, "Lower Marsh", "Ostrava Reach", "Pellworm", "High Tavish"), Observations: scatter(tall, 200, 3)}

	all["chance"] = Map{Title: "Zinc above the limit for gardens", Subtitle: "limit 400 mg kg⁻¹", Legend: "chance that the mean exceeds 400 mg kg⁻¹", Kind: Chance, Lattice: wide,
		Value: field(wide, func(u, v float64) float64 { return 1 / (1 + math.Exp(12-hills(u, v))) }), Outline: outline, Foot: []string{"Peaks are covered less often than the stated 95 %."}}
	squareBlob := square
	blobOutline := blob(&squareBlob)
	all["chance-square"] = Map{Title: "Zinc above the limit for gardens", Legend: "chance that the mean exceeds 400 mg kg⁻¹", Kind: Chance, Lattice: squareBlob,
		Value: field(square, func(u, v float64) float64 { return 1 / (1 + math.Exp(12-hills(u, v))) }), Outline: blobOutline, Observations: scatter(squareBlob, 155, 9)}
	all["ratio"] = Map{Title: "Relative risk of asthma admission", Legend: "risk relative to the overall rate", Kind: Ratio, Lattice: squareBlob,
		Value: field(square, func(u, v float64) float64 { return math.Exp((hills(u, v) - 13) / 9) }), Outline: blobOutline, Zones: bands(square, "South", "Middle", "North"), Observations: scatter(squareBlob, 2500, 8)}
	all["ratio-wide"] = Map{Title: "Relative risk of asthma admission", Legend: "risk relative to the overall rate", Kind: Ratio, Lattice: wide,
		Value: field(wide, func(u, v float64) float64 { return math.Exp((hills(u, v) - 13) / 9) }), Outline: outline}

	places := scatter(tall, 250, 4)
	dots := Dots{X: places.X, Y: places.Y}
	for i := range dots.X {
		dots.Value = append(dots.Value, hills(dots.X[i]/20000, dots.Y[i]/60000))
	}
	dots.Value[7] = math.NaN()
	all["dots"] = Map{Title: "Predicted depth at the borehole sites", Legend: "metres below ground", Lattice: grids.Lattice{CRS: azimuthal}, Dots: dots, Outline: tallOutline}

	all["stamped"] = Map{Title: "Nitrate in shallow wells", Legend: "mg/l", Lattice: squareBlob, Value: field(square, skewed), Outline: blobOutline, Stamp: "NOT FOR USE: the fit did not converge",
		Foot: []string{"The fit stopped before it had converged; the numbers may be far off."}}
	all["stamped-strip"] = Map{Title: "Nitrate along the dyke", Legend: "mg/l", Lattice: grids.Lattice{CRS: local, Cell: 1, NX: 800, NY: 40}, Value: field(grids.Lattice{NX: 800, NY: 40}, skewed),
		Stamp: "NOT FOR USE: counts vary 14 times more than the model allows"}

	long := "Density of breeding pairs of the long-tailed marsh warbler on the northern and western reed beds, all visits of the spring survey taken together, both observers, after removing the plots that were flooded at the second visit and could not be walked"
	cautions := []string{
		"Counts vary more than a Poisson model allows: intervals are too narrow by a factor of 2.3, and so are the totals made from them.",
		"34 % of the cells are farther than five times the median spacing from any observation; there the map follows the shape of the model rather than the data.",
		"12 rows were set aside: 9 without a count, 3 with coordinates out of range (see set-aside.csv).",
		"All 150 basis functions allowed are in use: real detail may be smoothed away. Allow more with --max-knots and compare.",
	}
	all["long-texts"] = Map{Title: long, Subtitle: "adjusted to water depth = 0.35 m, reed height = 2.1 m, distance to the nearest dyke = 140 m, observer = first", Legend: "breeding pairs per square kilometre of reed bed above the mean water line, coefficient of variation",
		Kind: Uncertainty, Lattice: squareBlob, Value: field(square, func(u, v float64) float64 { return 0.1 + math.Abs(u-0.5) + v*v }), Outline: blobOutline, Foot: cautions}

	constant := field(square, func(u, v float64) float64 { return 12.5 })
	all["constant"] = Map{Title: "A flat field", Legend: "cases per 1000 people", Lattice: squareBlob, Value: constant, Outline: blobOutline}
	all["one-cell"] = Map{Title: "One cell", Legend: "ppm", Lattice: grids.Lattice{CRS: utm, X0: 500000, Y0: 4649776, Cell: 30, NX: 1, NY: 1}, Value: []float64{3.25}}
	holes := field(square, hills)
	for k := range holes {
		if k%100 > 60 && k/100 > 70 {
			holes[k] = math.NaN()
		}
	}
	all["holes"] = Map{Title: "A field with holes", Legend: "µg m⁻³", Lattice: square, Value: holes}
	all["nothing"] = Map{Title: "No value anywhere", Legend: "ppm", Lattice: grids.Lattice{CRS: nil, Cell: 3, NX: 2, NY: 1}, Value: []float64{math.NaN(), math.Inf(1)}}
	column := grids.Lattice{CRS: local, Cell: 5, NX: 6, NY: 120}
	all["column"] = Map{Title: "Transect along the cliff path, counted on foot", Legend: "plants per square metre", Lattice: column, Value: field(column, skewed), Foot: cautions[:2], Stamp: "NOT FOR USE: half of the rows were set aside"}
	tiny := grids.Lattice{CRS: azimuthal, X0: 3000, Y0: -800, Cell: 2, NX: 70, NY: 50}
	all["tiny-values"] = Map{Title: "Trace gas", Legend: "mol m⁻² s⁻¹", Lattice: tiny, Value: field(tiny, func(u, v float64) float64 { return 1e-12 * hills(u, v) }), Breaks: []float64{0, 5e-12, 1e-11, 1.5e-11, 2e-11}}
	// Two regions of one batch: the second has neither the highest class nor values near the last edge.
	high := Map{Title: "Stems in the Harrow valley forest", Legend: "stems per hectare", Lattice: wide, Value: field(wide, skewed), Outline: outline, Observations: scatter(wide, 80, 6), Shared: true}
	low := Map{Title: "Stems on the Pellworm slopes", Legend: "stems per hectare", Lattice: squareBlob, Outline: blobOutline, Observations: scatter(squareBlob, 150, 7), Shared: true,
		Value: field(square, func(u, v float64) float64 { return 0.1 * skewed(u, v) })}
	high.Breaks = SharedBreaks(Level, []Sample{NewSample(inside(high), 500), NewSample(inside(low), 500)})
	low.Breaks = high.Breaks
	all["shared-high"], all["shared-low"] = high, low
	flat := low
	flat.Title, flat.Value = "Stems at the Merrow gap", field(square, func(u, v float64) float64 { return 45 })
	all["shared-constant"] = flat
	risk := all["ratio"]
	risk.Breaks, risk.Shared = SharedBreaks(Ratio, []Sample{NewSample(inside(risk), 500)}), true
	risk.Value = field(square, func(u, v float64) float64 { return 1 + 0.2*u })
	all["shared-ratio"] = risk
	shapePictures(t, all)
	all["single-dot"] = Map{Title: "One place", Legend: "ppm", Lattice: grids.Lattice{CRS: utm}, Dots: Dots{X: []float64{455000}, Y: []float64{5300000}, Value: []float64{4}}}
	return all
}

// TestGallery leaves every variant to be looked at; that each can be drawn is seen by TestSameMapSameBytes.
func TestGallery(t *testing.T) {
	if *pictures == "" {
		t.Skip("no folder named with -pictures")
	}
	for name, m := range gallery(t) {
		var b bytes.Buffer
		if err := m.WritePNG(&b); err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if err := os.WriteFile(filepath.Join(*pictures, name+".png"), b.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

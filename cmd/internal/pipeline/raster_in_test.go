package pipeline

import (
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// maungaWhau is the elevation grid of that name (testdata/README.md) as an ASCII grid raster, with a fifth of its cells taken
// out, and a table of those.
func maungaWhau(t *testing.T) (raster, gone string, level []float64) {
	s := readSheet(t, filepath.Join(repository, "maunga_whau_elevation.csv"))
	const nx, ny = 87, 61
	var z [nx][ny]float64
	row, col, elevation := s.numbers("row"), s.numbers("col"), s.numbers("elev_m")
	for k := range row {
		z[int(row[k])-1][int(col[k])-1] = elevation[k]
	}
	random := rand.New(rand.NewPCG(1, 20))
	var r, g strings.Builder
	fmt.Fprintf(&r, "ncols %d\nnrows %d\nxllcenter 0\nyllcenter 0\ncellsize 10\nNODATA_value -9999\n", nx, ny)
	g.WriteString("x,y\n")
	for j := ny - 1; j >= 0; j-- {
		for i := range nx {
			if random.Float64() < 0.2 {
				r.WriteString("-9999 ")
				fmt.Fprintf(&g, "%d,%d\n", 10*i, 10*j)
				level = append(level, z[i][j])
			} else {
				fmt.Fprintf(&r, "%v ", z[i][j])
			}
		}
		r.WriteByte('\n')
	}
	return r.String(), g.String(), level
}

// TestRasterWithHoles: the cells of a raster are observations, and those that are gone are filled close to what was there.
// 200 knots cannot follow a crater in full, and the checks must say so.
func TestRasterWithHoles(t *testing.T) {
	raster, gone, level := maungaWhau(t)
	at := write(t, "gone.csv", gone)
	dir := mapped(t, write(t, "maunga.asc", raster), "response=band1", "at="+at, "write=csv", "max-knots=200")
	s := readSheet(t, filepath.Join(dir, "surface.csv"))
	square := 0.0
	for k, v := range s.numbers("estimate") {
		square += (v - level[k]) * (v - level[k])
	}
	rms := math.Sqrt(square / float64(len(level)))
	scatter := math.Sqrt(readSummary(t, dir).number(t, "fit", "dispersion"))
	if len(level) < 900 || rms > 1.5 || rms > 1.3*scatter {
		t.Errorf("%d cells filled with an error of %.3f m, residual scatter %.3f m; the range is 101 m", len(level), rms, scatter)
	}
	if got := fmt.Sprint(readSummary(t, dir)["checks"]); !strings.Contains(got, "neighbouring residuals are alike") {
		t.Errorf("the checks do not say that the surface is too smooth: %s", got)
	}
	d := readSummary(t, dir)
	if cells := d.number(t, "input", "raster", "cells"); int(cells)+len(level) != 87*61 || d.number(t, "input", "raster", "step") != 1 {
		t.Errorf("%v cells and %d gone", cells, len(level))
	}
}

// TestRasterOfTheReference: a GeoTIFF is read with its coordinate system, and its figures are those of its cells.
func TestRasterOfTheReference(t *testing.T) {
	dir := mapped(t, filepath.Join(repository, "reference", "geotiff", "float32_tile16_deflate.tif"), "response=band1", "write=csv", "cells-across=12", "max-knots=12", "smoothness-uncertainty=off")
	if rows := len(readSheet(t, filepath.Join(dir, "residuals.csv")).rows); rows != 64*48 {
		t.Errorf("%d rows of a raster of 64 x 48", rows)
	}
	_, err := Run(t.Context(), settings(t, filepath.Join(repository, "reference", "geotiff", "float32_tile16_deflate.tif"), "response=elevation"), filepath.Join(t.TempDir(), "out"), silent{})
	if want := `float32_tile16_deflate.tif: there is no column "elevation" for the response`; err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
}

// TestLargeRasterIsThinned evenly, and the summary and the cautions say so.
func TestLargeRasterIsThinned(t *testing.T) {
	const n = 250
	var b strings.Builder
	fmt.Fprintf(&b, "ncols %d\nnrows %d\nxllcorner 0\nyllcorner 0\ncellsize 2\n", n, n)
	for j := range n {
		for i := range n {
			fmt.Fprintf(&b, "%.3f ", math.Sin(float64(i)/40)+math.Cos(float64(j)/30)+0.01*float64((i*7+j*13)%11))
		}
		b.WriteByte('\n')
	}
	dir := mapped(t, write(t, "large.asc", b.String()), "response=band1", "write=csv", "cells-across=10", "max-knots=30", "smoothness-uncertainty=off")
	d := readSummary(t, dir)
	// 62500 cells over 10000 is 6.25, so one in 3 is taken.
	if d.number(t, "input", "raster", "cells") != n*n || d.number(t, "input", "raster", "step") != 3 || d.number(t, "input", "rows") != 83*83 {
		t.Errorf("%v", d["input"])
	}
	if got := fmt.Sprint(d["cautions"]); !strings.Contains(got, "Of the raster's 62500 cells with a value one in 3 in both directions is used") {
		t.Errorf("cautions: %s", got)
	}
}

// TestIsolinesFile: levels are round or as said, and bands cover the map.
func TestIsolinesFile(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(4))
	words := []string{"response=n", "area=plot_ha", "write=csv,geojson", "cells-across=30", "max-knots=30"}
	type properties struct {
		Level, Low, High *float64
		Unit             string
	}
	read := func(words ...string) (list []properties) {
		text, err := os.ReadFile(filepath.Join(mapped(t, obs, words...), "isolines.geojson"))
		if err != nil {
			t.Fatal(err)
		}
		var c struct {
			Features []struct{ Properties properties }
		}
		if err := json.Unmarshal(text, &c); err != nil {
			t.Fatal(err)
		}
		for _, f := range c.Features {
			list = append(list, f.Properties)
		}
		return list
	}
	round := read(words...)
	for k, p := range round {
		if p.Level == nil || k > 0 && *p.Level <= *round[k-1].Level || math.Mod(*p.Level, 0.5) != 0 || p.Unit != "n per ha" {
			t.Errorf("level %d: %+v", k, p)
		}
	}
	if len(round) < 3 {
		t.Errorf("%d levels", len(round))
	}
	if got := read(append(words, "isolines-at=5,8,1000")...); len(got) != 2 || *got[0].Level != 5 || *got[1].Level != 8 {
		t.Errorf("asked for 5, 8 and 1000: %+v", got)
	}
	bands := read(append(words, "isolines-at=5,8", "isolines=bands")...)
	if len(bands) != 3 || bands[0].Low != nil || *bands[0].High != 5 || *bands[1].Low != 5 || *bands[1].High != 8 || *bands[2].Low != 8 || bands[2].High != nil {
		t.Errorf("bands %+v", bands)
	}
}

// TestMarks: observations are marked on a map but for areas, whose borders are drawn, and cells, which are everywhere.
func TestMarks(t *testing.T) {
	areas, mixed := &placeResults{places: make([]place, 2), areas: 2}, &placeResults{places: make([]place, 2), areas: 1}
	for _, c := range []struct {
		step int
		by   *placeResults
		want bool
	}{{0, nil, true}, {1, nil, false}, {3, nil, false}, {0, areas, false}, {0, mixed, true}} {
		if got := (&run{obs: &observations{thinned: thinning{step: c.step}}, byPlace: c.by}).marked(); got != c.want {
			t.Errorf("step %d, %+v: %v", c.step, c.by, got)
		}
	}
}

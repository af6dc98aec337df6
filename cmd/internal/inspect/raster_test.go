package inspect

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"errors"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"drumlin/io/geotiff"
	"drumlin/io/plan"
)

// rasters is the reference of rasters and of their cells as text (testdata/reference/README.md).
const rasters = "../../../testdata/reference/geotiff"

func openedRaster(t *testing.T, name string) *geotiff.Raster {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join(rasters, name))
	if err != nil {
		t.Fatal(err)
	}
	r, err := geotiff.Open(bytes.NewReader(raw), int64(len(raw)), name)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// gridOf is a text raster of one row of cells, 10 wide.
func gridOf(t *testing.T, header string, cells ...string) *geotiff.Raster {
	t.Helper()
	text := "ncols " + strconv.Itoa(len(cells)) + "\nnrows 1\nxllcorner 500\nyllcorner 900\ncellsize 10\n" + header + strings.Join(cells, " ") + "\n"
	r, err := geotiff.OpenText(strings.NewReader(text), "grid.asc")
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func examinedRaster(t *testing.T, r *geotiff.Raster, name string, crs *string) RasterReport {
	t.Helper()
	report, err := ExamineRaster(context.Background(), r, plan.Settings{Observations: &name, CRS: crs})
	if err != nil {
		t.Fatal(err)
	}
	return report
}

func wordsOfRaster(t *testing.T, r RasterReport) string {
	t.Helper()
	var b strings.Builder
	if err := r.Words(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestRasterWords(t *testing.T) {
	for _, c := range []struct{ name, want string }{
		{"float32_three_band.tif", `float32_three_band.tif: 64 columns x 48 rows, 3 bands, GeoTIFF

  coordinate system  EPSG:32633, WGS 84 / UTM zone 33N
  cells              250 x 200 metres, values of whole cells
  edges              west 412000, south 5300400, east 428000, north 5310000
  stored             in blocks of 32 x 32 cells, no overviews

  band   kind     missing       least    mean    most
  band1  float32        0     -2.9855  1.0703  9.1944
  band2  float32        0    -0.49276  1.5352  5.5972
  band3  float32        0  1.2635e-06  9.4016  84.537

To try

  drumlin map float32_three_band.tif --response band1 --out map-band1
`},
		{"uint8_strip7_none.tif", `uint8_strip7_none.tif: 64 columns x 48 rows, 1 band, GeoTIFF

  coordinate system  EPSG:4326, longitude and latitude; the file says "WGS 84"
  cells              0.0125 x 0.01 degrees, values of their centres
  edges              west 14.2, south 48.22, east 15, north 48.7
  stored             in blocks of 64 x 7 cells, no overviews

  band   kind   missing  least    mean  most
  band1  uint8        0      2  82.069   235

To try

  drumlin map uint8_strip7_none.tif --response band1 --out map-band1
`},
	} {
		if got := wordsOfRaster(t, examinedRaster(t, openedRaster(t, c.name), c.name, nil)); got != c.want {
			t.Errorf("got\n%s\nwant\n%s", got, c.want)
		}
	}
}

// TestRasterFigures compares the figures of rasters in strips, tiles and interleaved bands with the cells of the reference.
// Least and most are exact; the mean may differ by the order of summation.
func TestRasterFigures(t *testing.T) {
	for _, c := range []struct {
		file  string
		mark  float64
		cells []string
	}{
		{"float32_three_band.tif", math.NaN(), []string{"cells_float32.csv", "cells_float32_band2.csv", "cells_float32_band3.csv"}},
		{"float32_three_pixel.tif", math.NaN(), []string{"cells_float32.csv", "cells_float32_band2.csv", "cells_float32_band3.csv"}},
		{"int16_nodata.tif", -9999, []string{"cells_int16_nodata.csv"}},
		{"float32_nodata.tif", math.NaN(), []string{"cells_float32_nodata.csv"}},
		{"int32_tile16_deflate.tif", math.NaN(), []string{"cells_int32.csv"}},
	} {
		report := examinedRaster(t, openedRaster(t, c.file), c.file, nil)
		for i, name := range c.cells {
			var sum float64
			var n, missing int
			least, most := math.Inf(1), math.Inf(-1)
			for _, v := range cellsOf(t, name) {
				if math.IsNaN(v) || v == c.mark {
					missing++
					continue
				}
				n, sum, least, most = n+1, sum+v, min(least, v), max(most, v)
			}
			b := report.Bands[i]
			narrow := func(v float64) float64 { // the reference prints float32 with nine digits
				if b.Kind == "float32" {
					return float64(float32(v))
				}
				return v
			}
			if b.Missing != missing || *b.Least != narrow(least) || *b.Most != narrow(most) || math.Abs(*b.Mean-sum/float64(n)) > 1e-8*math.Abs(sum/float64(n)) {
				t.Errorf("%s, band %d: missing %d, %v to %v, mean %v; want %d, %v to %v, %v", c.file, i+1, b.Missing, *b.Least, *b.Most, *b.Mean,
					missing, least, most, sum/float64(n))
			}
		}
	}
}

func cellsOf(t *testing.T, name string) (list []float64) {
	t.Helper()
	f, err := os.Open(filepath.Join(rasters, name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, row := range rows {
		for _, cell := range row {
			v, err := strconv.ParseFloat(strings.TrimSpace(cell), 64)
			if err != nil {
				t.Fatal(err)
			}
			list = append(list, v)
		}
	}
	return list
}

func TestRasterFindings(t *testing.T) {
	with := func(r *geotiff.Raster, change func(*geotiff.Raster)) *geotiff.Raster { change(r); return r }
	for _, c := range []struct {
		name     string
		raster   *geotiff.Raster
		crs      *string
		codes    []string
		sentence string // part of the words
		proposed bool
	}{
		{"in order", gridOf(t, "", "1", "2", "3"), nil, nil, "coordinate system  none: metres of its own\n", true},
		{"declared mark", gridOf(t, "nodata_value -9999\n", "1", "-9999", "3"), nil, nil, "band1  text        1      1     2     3\n", true},
		{"undeclared mark", gridOf(t, "", "1", "-9999", "-9999"), nil, []string{"missing-mark"}, "  - -9999 in 2 cells of band1: likely a mark", true},
		{"mark of 16 bits", gridOf(t, "", "1", "-32768", "2"), nil, []string{"missing-mark"}, "-32768 in 1 cell of band1", true},
		{"large mark", gridOf(t, "", "1", "1e20", "2"), nil, []string{"missing-mark"}, "1e+20 in 1 cell of band1", true},
		{"nothing but a mark", gridOf(t, "", "-9999", "-9999"), nil, []string{"missing-mark"}, "No map can be proposed: ", false},
		{"close to a mark", gridOf(t, "", "1", "-9998.5", "2"), nil, nil, "", true},
		{"scaled mark", with(gridOf(t, "", "1", "-9999", "2"), func(r *geotiff.Raster) { r.Bands[0].Scale, r.Bands[0].Offset = 0.1, 5 }), nil,
			[]string{"missing-mark"}, "-994.9 in 1 cell", true},
		{"large mark, small scale", with(gridOf(t, "", "1", "1e20", "2"), func(r *geotiff.Raster) { r.Bands[0].Scale = -1e-9 }), nil,
			[]string{"missing-mark"}, "in 1 cell of band1", true},
		{"no value", gridOf(t, "nodata_value 7\n", "7", "7"), nil, []string{"empty-band"}, "no cell of band1 has a value\n", false},
		{"constant", gridOf(t, "nodata_value 7\n", "7", "4", "4"), nil, []string{"constant-band"}, "the same value, 4, in every cell of band1 that has one\n", false},
		{"infinite", gridOf(t, "", "1", "inf", "2"), nil, []string{"infinite-values"}, "infinite in 1 cell of band1", true},
		{"unknown code", with(gridOf(t, "", "1", "2"), func(r *geotiff.Raster) { r.EPSG = 2263 }), nil, []string{"system"},
			"EPSG:2263, which is not known here\n  cells              10 x 10 units of that system", true},
		{"unknown code, another said", with(gridOf(t, "", "1", "2"), func(r *geotiff.Raster) { r.EPSG = 2263 }), new("EPSG:27700"), nil,
			"EPSG:2263, which is not known here; taken as EPSG:27700, as said\n  cells              10 x 10 metres", true},
		{"unknown degrees", with(gridOf(t, "", "1", "2"), func(r *geotiff.Raster) { r.EPSG, r.Geographic = 4267, true }), nil, []string{"system"},
			"EPSG:4267 is not known here, and map takes them for those of WGS 84", true},
		{"words alone", with(gridOf(t, "", "1", "2"), func(r *geotiff.Raster) { r.Citation = "Old Harbour Grid" }), nil, []string{"system"},
			`no code; the file says "Old Harbour Grid"`, true},
		{"local metres", with(gridOf(t, "", "1", "2"), func(r *geotiff.Raster) { r.Citation = "local metres" }), nil, nil, "none: metres of its own\n", true},
		{"plane around a place", with(gridOf(t, "", "1", "2"), func(r *geotiff.Raster) { r.Azimuthal = &geotiff.Azimuthal{Lon: 8.5, Lat: 47.25} }), nil, nil,
			"laea lon=8.5 lat=47.25, equal-area plane around that place\n", true},
	} {
		t.Run(c.name, func(t *testing.T) {
			report := examinedRaster(t, c.raster, "grid.asc", c.crs)
			var codes []string
			for _, f := range report.Findings {
				codes = append(codes, f.Code)
			}
			if !slices.Equal(codes, c.codes) || (report.Proposal != nil) != c.proposed {
				t.Errorf("findings %q, proposed %v; want %q, %v", codes, report.Proposal != nil, c.codes, c.proposed)
			}
			if words := wordsOfRaster(t, report); !strings.Contains(words, c.sentence) {
				t.Errorf("%q is not in\n%s", c.sentence, words)
			}
		})
	}
}

// TestRasterSize looks at the finding alone: so many cells are not read in a test.
func TestRasterSize(t *testing.T) {
	for _, c := range []struct{ height, findings int }{{5000, 0}, {5001, 1}} {
		e := &rasterExaminer{raster: &geotiff.Raster{Width: 5000, Height: c.height}}
		e.size()
		if len(e.report.Findings) != c.findings {
			t.Errorf("%d rows of 5000: %v", c.height, e.report.Findings)
		}
	}
}

func TestRasterSameNames(t *testing.T) {
	r := openedRaster(t, "float32_three_band.tif")
	r.Bands[0].Name, r.Bands[1].Name, r.Bands[2].Name = "zinc in soil", "zinc in soil", "zinc in soil"
	report := examinedRaster(t, r, "my soil.tif", new("EPSG:3857"))
	if len(report.Findings) != 1 || report.Findings[0].Code != "same-names" {
		t.Errorf("findings %v", report.Findings)
	}
	const want = "drumlin map 'my soil.tif' --response 'zinc in soil' --crs EPSG:3857 --out map-zinc-in-soil"
	if got := report.Proposal.Command; got != want {
		t.Errorf("command %s, want %s", got, want)
	}
}

// TestRasterJSON pins the keys, which are the same whatever is found.
func TestRasterJSON(t *testing.T) {
	want := strings.Fields("bands block_height block_width cell_height cell_width east file findings format height north overviews proposal " +
		"south system unit values_of west width")
	wantBand := strings.Fields("infinite kind least mean missing most name no_data offset scale")
	for _, r := range []*geotiff.Raster{openedRaster(t, "uint8_crs_3035.tif"), gridOf(t, "nodata_value nan\n", "nan", "nan")} {
		var b bytes.Buffer
		if err := examinedRaster(t, r, "r", nil).JSON(&b); err != nil {
			t.Fatal(err)
		}
		var got map[string]any
		if err := json.Unmarshal(b.Bytes(), &got); err != nil {
			t.Fatal(err)
		}
		if keys := keysOf(got); !slices.Equal(keys, want) {
			t.Errorf("keys %q, want %q", keys, want)
		}
		if keys := keysOf(got["bands"].([]any)[0].(map[string]any)); !slices.Equal(keys, wantBand) {
			t.Errorf("keys of a band %q, want %q", keys, wantBand)
		}
		if _, ok := got["findings"].([]any); !ok {
			t.Error("findings are no list")
		}
	}
}

func keysOf(m map[string]any) (list []string) {
	for k := range m {
		list = append(list, k)
	}
	slices.Sort(list)
	return list
}

// TestTallyOfLargeBlocks cuts a block larger than a window: a text raster is one block.
func TestTallyOfLargeBlocks(t *testing.T) {
	const width, height = 1500, 1000
	text := "ncols 1500\nnrows 1000\nxllcorner 0\nyllcorner 0\ncellsize 1\nnodata_value 9\n" + strings.Repeat("1 2 9 4 4 ", width*height/5)
	r, err := geotiff.OpenText(strings.NewReader(text), "grid.asc")
	if err != nil {
		t.Fatal(err)
	}
	list, err := tally(context.Background(), r)
	if err != nil {
		t.Fatal(err)
	}
	const fifth = width * height / 5
	if want := (bandTally{missing: fifth, finite: 4 * fifth, sum: 11 * fifth, least: 1, most: 4, atLeast: fifth, atMost: 2 * fifth}); list[0] != want {
		t.Errorf("%+v, want %+v", list[0], want)
	}
}

func TestRasterStops(t *testing.T) {
	ctx, stop := context.WithCancel(context.Background())
	stop()
	if _, err := ExamineRaster(ctx, gridOf(t, "", "1", "2"), plan.Settings{Observations: new("r")}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

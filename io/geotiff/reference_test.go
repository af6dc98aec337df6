package geotiff_test

import (
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"drumlin/io/geotiff"
)

// reference holds rasters that GDAL 3.6.2 wrote from numbers of our own, and those numbers (testdata/reference/README.md).
const reference = "../../testdata/reference/geotiff"

type expectation struct {
	Width, Height int
	Files         []struct {
		File, Type   string
		Bands        int
		Cells        []string
		GeoTransform [6]float64
		CRS          string
		NoData       any    // null, or a number or nan as text
		RasterType   string `json:"raster_type"`
	}
}

// TestReference reads every file of the reference: each cell of each band to the bit, size, kind, corner, sides, mark
// for cells without data, kind of places and code of the coordinate system.
func TestReference(t *testing.T) {
	var want expectation
	b, err := os.ReadFile(filepath.Join(reference, "expected.json"))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(b, &want); err != nil {
		t.Fatal(err)
	}
	if len(want.Files) != 84 {
		t.Fatalf("%d files in the reference, want 84", len(want.Files))
	}
	for _, w := range want.Files {
		t.Run(w.File, func(t *testing.T) {
			r := open(t, filepath.Join(reference, w.File))
			if r.Width != want.Width || r.Height != want.Height || len(r.Bands) != w.Bands {
				t.Fatalf("%d columns, %d rows, %d bands", r.Width, r.Height, len(r.Bands))
			}
			g := w.GeoTransform
			for i, pair := range [][2]float64{{r.X0, g[0]}, {r.CellX, g[1]}, {r.Y0, g[3]}, {r.CellY, -g[5]}} {
				if math.Abs(pair[0]-pair[1]) > 1e-12*math.Abs(pair[1]) {
					t.Errorf("corner and sides, number %d: %v, want %v", i, pair[0], pair[1])
				}
			}
			if r.PixelIsPoint != (w.RasterType == "point") {
				t.Errorf("pixel is point: %v, want %s", r.PixelIsPoint, w.RasterType)
			}
			if r.CRS() != w.CRS || r.Geographic != (w.CRS == "EPSG:4326") {
				t.Errorf("coordinate system %q, geographic %v; want %s", r.CRS(), r.Geographic, w.CRS)
			}
			for i, band := range r.Bands {
				if band.Kind.String() != w.Type {
					t.Errorf("band %d of type %v, want %s", i, band.Kind, w.Type)
				}
				mark, marked := noData(w.NoData)
				if band.HasNoData != marked || marked && !same(band.NoData, mark) {
					t.Errorf("band %d: cells without data %v %v, want %v", i, band.HasNoData, band.NoData, w.NoData)
				}
				compareCells(t, window(t, r, i, 0, 0, r.Width, r.Height), cellsOf(t, w.Cells[i], mark, marked), band.Kind)
			}
		})
	}
}

// TestWindows reads windows of every size and place that differ for blocks, against cuts from the whole raster.
func TestWindows(t *testing.T) {
	for _, name := range []string{"float32_strip7_none.tif", "float32_tile32_zstd_pred.tif", "float32_three_band.tif", "float32_three_pixel.tif", "int16_nodata.tif"} {
		r := open(t, filepath.Join(reference, name))
		band := len(r.Bands) - 1
		whole := window(t, r, band, 0, 0, r.Width, r.Height)
		for _, x := range []int{0, 1, 31, 32, 63} {
			for _, y := range []int{0, 6, 7, 31, 47} {
				for _, nx := range []int{0, 1, 33, r.Width - x} {
					for _, ny := range []int{1, 8, r.Height - y} {
						if nx > r.Width-x || ny > r.Height-y {
							continue
						}
						got := window(t, r, band, x, y, nx, ny)
						for k, v := range got {
							if w := whole[(y+k/nx)*r.Width+x+k%nx]; !same(v, w) {
								t.Fatalf("%s, window %d+%d, %d+%d, cell %d: %v, want %v", name, x, nx, y, ny, k, v, w)
							}
						}
					}
				}
			}
		}
	}
}

func open(t testing.TB, path string) *geotiff.Raster {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { f.Close() })
	info, err := f.Stat()
	if err != nil {
		t.Fatal(err)
	}
	r, err := geotiff.Open(f, info.Size(), path)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func window(t testing.TB, r *geotiff.Raster, band, x0, y0, nx, ny int) []float64 {
	t.Helper()
	v := make([]float64, nx*ny)
	if err := r.Window(v, band, x0, y0, nx, ny); err != nil {
		t.Fatal(err)
	}
	return v
}

// cellsOf reads the cells that a file should hold, with NaN for those without data.
func cellsOf(t *testing.T, name string, mark float64, marked bool) []float64 {
	t.Helper()
	f, err := os.Open(filepath.Join(reference, name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var v []float64
	for _, row := range rows {
		for _, word := range row {
			x, err := strconv.ParseFloat(word, 64)
			if err != nil {
				t.Fatal(err)
			}
			if marked && x == mark {
				x = math.NaN()
			}
			v = append(v, x)
		}
	}
	return v
}

// compareCells wants the same numbers; those of float32 rasters are written with as many digits as tell them apart.
func compareCells(t *testing.T, got, want []float64, kind geotiff.Kind) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("%d cells, want %d", len(got), len(want))
	}
	for i := range got {
		w := want[i]
		if kind == geotiff.Float32 {
			w = float64(float32(w))
		}
		if !same(got[i], w) {
			t.Fatalf("cell %d: %v, want %v", i, got[i], w)
		}
	}
}

func noData(v any) (float64, bool) {
	text, ok := v.(string)
	if !ok {
		return 0, false
	}
	mark, err := strconv.ParseFloat(text, 64)
	return mark, err == nil
}

func same(a, b float64) bool {
	return math.Float64bits(a) == math.Float64bits(b) || math.IsNaN(a) && math.IsNaN(b)
}

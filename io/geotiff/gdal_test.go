package geotiff_test

import (
	"encoding/binary"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"drumlin/grids/crs"
	"drumlin/io/geotiff"
)

// gdal runs one of GDAL's programs (Debian's gdal-bin), the other reader and writer that files are held against.
func gdal(t *testing.T, input, program string, args ...string) string {
	t.Helper()
	path, err := exec.LookPath(program)
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatalf("%s is missing: install gdal-bin", program)
		}
		t.Skipf("%s is missing: install gdal-bin to compare with it", program)
	}
	cmd := exec.Command(path, args...)
	cmd.Stdin = strings.NewReader(input)
	var complaints strings.Builder
	cmd.Stderr = &complaints
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("%s %v: %v\n%s", program, args, err, &complaints)
	}
	return string(out)
}

// gdalCells lets GDAL write all bands as bare numbers of 64 bits, one band after the other, and reads those.
func gdalCells(t *testing.T, path string, options ...string) []float64 {
	t.Helper()
	out := filepath.Join(t.TempDir(), "cells.bin")
	args := append([]string{"-q", "-of", "ENVI", "-ot", "Float64", "-co", "INTERLEAVE=BSQ"}, options...)
	gdal(t, "", "gdal_translate", append(args, path, out)...)
	b, err := os.ReadFile(out)
	if err != nil {
		t.Fatal(err)
	}
	v := make([]float64, len(b)/8)
	for i := range v {
		v[i] = math.Float64frombits(binary.LittleEndian.Uint64(b[8*i:]))
	}
	return v
}

type gdalInfo struct {
	Size             [2]int
	GeoTransform     [6]float64
	CoordinateSystem struct{ WKT string }
	Metadata         map[string]map[string]string
	Bands            []struct {
		Type, Description string
		NoDataValue       any
		Block             [2]int
		Overviews         []struct{ Size [2]int }
	}
	CornerCoordinates struct{ UpperLeft, LowerRight [2]float64 }
}

// TestGDALReads: what is written here, GDAL reads with the same values, place, coordinate system, mark for cells without
// data and names, as a file that is laid out as it says.
func TestGDALReads(t *testing.T) {
	names := []string{"estimate", "standard_error", `chance over 5 < x & "y" Ørevåg`}
	tests := []struct {
		name string
		set  func(*geotiff.Grid)
		wkt  []string // what must stand in GDAL's description of the coordinate system
	}{
		{"EPSG 32633", func(g *geotiff.Grid) {}, []string{"PROJCRS[", `ID["EPSG",32633]]`}},
		{"EPSG 27700", func(g *geotiff.Grid) { g.EPSG = 27700 }, []string{"PROJCRS[", `ID["EPSG",27700]]`}},
		{"EPSG 4258", func(g *geotiff.Grid) {
			g.EPSG, g.Geographic, g.X0, g.Y0, g.CellX, g.CellY = 4258, true, 14.2, 48.7, 0.0125, 0.01
		}, []string{"GEOGCRS[", `ID["EPSG",4258]]`}},
		{"azimuthal", func(g *geotiff.Grid) { g.EPSG, g.Azimuthal = 0, &geotiff.Azimuthal{Lon: -8.512345, Lat: 47.25} },
			[]string{"PROJCRS[", `METHOD["Lambert Azimuthal Equal Area"`, "-8.512345,", "47.25,", `ELLIPSOID["WGS 84",6378137,298.257223563`}},
		{"local", func(g *geotiff.Grid) { g.EPSG = 0 }, []string{`ENGCRS["local metres"`, `LENGTHUNIT["metre",1`}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			t.Parallel()
			g := grid(530, 270, names...)
			test.set(&g)
			file, values := encode(t, g, 2)
			path := filepath.Join(t.TempDir(), "made.tif")
			if err := os.WriteFile(path, file, 0o644); err != nil {
				t.Fatal(err)
			}
			var info gdalInfo
			if err := json.Unmarshal([]byte(gdal(t, "", "gdalinfo", "-json", path)), &info); err != nil {
				t.Fatal(err)
			}
			if want := [6]float64{g.X0, g.CellX, 0, g.Y0, 0, -g.CellY}; info.Size != [2]int{530, 270} || info.GeoTransform != want {
				t.Errorf("size %v, place %v; want %v", info.Size, info.GeoTransform, want)
			}
			east, south := g.X0+530*g.CellX, g.Y0-270*g.CellY
			if c := info.CornerCoordinates; c.UpperLeft != [2]float64{g.X0, g.Y0} || math.Abs(c.LowerRight[0]-east) > 1e-7 || math.Abs(c.LowerRight[1]-south) > 1e-7 {
				t.Errorf("corners %+v, want %v, %v to %v, %v", c, g.X0, g.Y0, east, south)
			}
			for _, part := range test.wkt {
				if !strings.Contains(info.CoordinateSystem.WKT, part) {
					t.Errorf("no %s in the coordinate system: %s", part, info.CoordinateSystem.WKT)
				}
			}
			if area := info.Metadata[""]["AREA_OR_POINT"]; area != "Area" {
				t.Errorf("cells are of kind %q", area)
			}
			if layout := info.Metadata["IMAGE_STRUCTURE"]; layout["COMPRESSION"] != "DEFLATE" || layout["INTERLEAVE"] != "BAND" {
				t.Errorf("layout %v", layout)
			}
			for i, band := range info.Bands {
				if band.Description != names[i] || band.Type != "Float32" || fmt.Sprint(band.NoDataValue) != "NaN" || band.Block != [2]int{256, 256} {
					t.Errorf("band %d: %+v", i, band)
				}
				if fmt.Sprint(band.Overviews) != "[{[265 135]} {[133 68]}]" {
					t.Errorf("band %d: overviews %v", i, band.Overviews)
				}
			}
			if test.name != "EPSG 32633" {
				return // the cells are laid out the same in every coordinate system
			}
			for k, v := range gdalCells(t, path) {
				if w := values[k/(530*270)][k%(530*270)]; !same(v, float64(w)) {
					t.Fatalf("cell %d: %v, want %v", k, v, w)
				}
			}
			pictures := takeApart(t, file)
			for level := range 2 {
				want := cellsOfPicture(t, file, pictures[1+level], 2)
				for k, v := range gdalCells(t, path, "-b", "3", "-oo", fmt.Sprintf("OVERVIEW_LEVEL=%d", level)) {
					if !same(v, float64(want[k])) {
						t.Fatalf("overview %d, cell %d: %v, want %v", level, k, v, want[k])
					}
				}
			}
		})
	}
}

// TestGDALPlacesAzimuthal: longitudes and latitudes that GDAL gives the corners of an azimuthal raster are those of the
// plane here, to 1e-8 degrees (about a millimetre).
func TestGDALPlacesAzimuthal(t *testing.T) {
	plane, err := crs.NewAzimuthalEqualArea(-8.512345, 47.25)
	if err != nil {
		t.Fatal(err)
	}
	g := grid(40, 30, "estimate")
	g.EPSG, g.X0, g.Y0, g.CellX, g.CellY = 0, -20000, 15000, 1000, 1000
	g.Azimuthal = &geotiff.Azimuthal{Lon: -8.512345, Lat: 47.25}
	file, _ := encode(t, g, 1)
	path := filepath.Join(t.TempDir(), "made.tif")
	if err := os.WriteFile(path, file, 0o644); err != nil {
		t.Fatal(err)
	}
	corners := [][2]float64{{0, 0}, {40, 0}, {0, 30}, {40, 30}, {20, 15}, {7.5, 22.25}}
	var input strings.Builder
	for _, c := range corners {
		fmt.Fprintln(&input, c[0], c[1])
	}
	out := strings.Fields(gdal(t, input.String(), "gdaltransform", "-t_srs", "OGC:CRS84", "-output_xy", path))
	if len(out) != 2*len(corners) {
		t.Fatalf("%q", out)
	}
	for i, c := range corners {
		lon, lat := plane.Inverse(g.X0+c[0]*g.CellX, g.Y0-c[1]*g.CellY)
		for k, want := range []float64{lon, lat} {
			if got, err := strconv.ParseFloat(out[2*i+k], 64); err != nil || math.Abs(got-want) > 1e-8 {
				t.Errorf("corner %v: %v; want %.10f", c, out[2*i+k], want)
			}
		}
	}
}

// TestGDALWrites: what GDAL writes in layouts that the reference lacks is read here cell by cell.
func TestGDALWrites(t *testing.T) {
	tests := []struct{ name, source, options string }{
		{"PackBits", "int16_strip_none.tif", "-co COMPRESS=PACKBITS"},
		{"PackBits, big-endian", "float64_strip_none.tif", "-co COMPRESS=PACKBITS -co ENDIANNESS=BIG"},
		{"Zstandard, long last strip", "float32_strip_none.tif", "-co COMPRESS=ZSTD -co BLOCKYSIZE=31"},
		{"predictor of 64 bits", "float64_strip_none.tif", "-co COMPRESS=LZW -co PREDICTOR=2"},
		{"predictor of decimals, 64 bits", "float64_strip_none.tif", "-co COMPRESS=ZSTD -co PREDICTOR=3 -co TILED=YES"},
		{"bands apart", "float32_three_pixel.tif", "-co INTERLEAVE=BAND -co COMPRESS=DEFLATE -co PREDICTOR=3 -co TILED=YES -co BLOCKXSIZE=16 -co BLOCKYSIZE=32"},
		{"bands side by side", "float32_three_band.tif", "-co INTERLEAVE=PIXEL -co COMPRESS=LZW -co PREDICTOR=3 -co BLOCKYSIZE=5"},
		{"empty blocks", "float32_nodata.tif", "-srcwin -100 -100 300 300 -co TILED=YES -co BLOCKXSIZE=16 -co BLOCKYSIZE=16 -co SPARSE_OK=TRUE"},
		{"cloud-optimised", "float32_strip_none.tif", "-of COG -outsize 300 200 -r bilinear -co BLOCKSIZE=128 -co COMPRESS=DEFLATE -co PREDICTOR=YES"},
		{"one long strip", "int16_strip_none.tif", "-outsize 500 400 -co BLOCKYSIZE=400"},
		{"scaled", "int16_nodata.tif", "-a_scale 0.5 -a_offset -10"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			t.Parallel()
			path := filepath.Join(t.TempDir(), "theirs.tif")
			gdal(t, "", "gdal_translate", append(append([]string{"-q"}, strings.Fields(test.options)...), filepath.Join(reference, test.source), path)...)
			r := open(t, path)
			source := open(t, filepath.Join(reference, test.source)) // whose cells are those of the reference
			var want []float64
			if resampled := strings.Contains(test.options, "-outsize") || strings.Contains(test.options, "-srcwin"); resampled {
				want = gdalCells(t, path)
			} else {
				for i := range source.Bands {
					want = append(want, window(t, source, i, 0, 0, source.Width, source.Height)...)
				}
			}
			for i, band := range r.Bands {
				for k, v := range window(t, r, i, 0, 0, r.Width, r.Height) {
					w := want[i*r.Width*r.Height+k]
					if w = w*band.Scale + band.Offset; !same(v, w) {
						t.Fatalf("band %d, cell %d: %v, want %v", i, k, v, w)
					}
				}
			}
			if scaled := r.Bands[0].Scale == 0.5 && r.Bands[0].Offset == -10; scaled != (test.name == "scaled") {
				t.Errorf("scale %v, offset %v", r.Bands[0].Scale, r.Bands[0].Offset)
			}
		})
	}
}

// TestGDALTexts: the text rasters that GDAL writes.
func TestGDALTexts(t *testing.T) {
	for name, options := range map[string]string{"float32_strip_none.tif": "-co FORCE_CELLSIZE=FALSE", "int16_nodata.tif": "-co DECIMAL_PRECISION=0"} {
		path := filepath.Join(t.TempDir(), "theirs.asc")
		gdal(t, "", "gdal_translate", append(append([]string{"-q", "-of", "AAIGrid"}, strings.Fields(options)...), filepath.Join(reference, name), path)...)
		r, source := open(t, path), open(t, filepath.Join(reference, name))
		if r.Width != 64 || r.Height != 48 || math.Abs(r.X0-source.X0) > 1e-9 || math.Abs(r.Y0-source.Y0) > 1e-6 || r.CellX != source.CellX || r.CellY != source.CellY {
			t.Errorf("%s: %+v, want %+v", name, r, source)
		}
		got, want := window(t, r, 0, 0, 0, 64, 48), window(t, source, 0, 0, 0, 64, 48)
		for k := range want {
			if !(math.Abs(got[k]-want[k]) <= 1e-9*math.Abs(want[k])) && !same(got[k], want[k]) {
				t.Fatalf("%s, cell %d: %v, want %v", name, k, got[k], want[k])
			}
		}
	}
}

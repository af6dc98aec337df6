package geotiff_test

import (
	"bytes"
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/geotiff"
)

// surface is a band with hills, holes and an edge without data.
func surface(band, width, height int) []float32 {
	v := make([]float32, width*height)
	east := make([]float64, width)
	for i := range east {
		east[i] = math.Sin(5 * float64(i) / float64(width))
	}
	for k := range v {
		i, j := k%width, k/width
		if i == 0 {
			north := float64(band+1) * math.Cos(7*float64(j)/float64(height))
			for n := range width {
				v[k+n] = float32(north*east[n] + 0.001*float64((k+n)%13))
			}
		}
		x, y := float64(i)/float64(width)-0.5, float64(j)/float64(height)-0.5
		if x*x+y*y > 0.36 || k%101 == 7 {
			v[k] = float32(math.NaN())
		}
	}
	return v
}

func grid(width, height int, bands ...string) geotiff.Grid {
	return geotiff.Grid{Width: width, Height: height, X0: 412000, Y0: 5310000, CellX: 250, CellY: 200, EPSG: 32633, Bands: bands}
}

func surfaces(g geotiff.Grid) (values [][]float32) {
	for band := range g.Bands {
		values = append(values, surface(band, g.Width, g.Height))
	}
	return values
}

// rowsOf gives out the rows of surfaces.
func rowsOf(g geotiff.Grid, values [][]float32) func(band, y int, dst []float32) error {
	return func(band, y int, dst []float32) error {
		copy(dst, values[band][y*g.Width:(y+1)*g.Width])
		return nil
	}
}

// encode writes surfaces and returns the file and what stands in it.
func encode(t testing.TB, g geotiff.Grid, workers int) ([]byte, [][]float32) {
	t.Helper()
	values := surfaces(g)
	var b bytes.Buffer
	err := geotiff.Write(context.Background(), &b, g, rowsOf(g, values), workers)
	if err != nil {
		t.Fatal(err)
	}
	return b.Bytes(), values
}

func openBytes(t testing.TB, b []byte) *geotiff.Raster {
	t.Helper()
	r, err := geotiff.Open(bytes.NewReader(b), int64(len(b)), "made.tif")
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// TestWriteReadsBack writes rasters whose sides are small, even, odd, or several tiles, and reads every cell again.
func TestWriteReadsBack(t *testing.T) {
	for _, size := range [][2]int{{1, 1}, {3, 2}, {256, 256}, {257, 1}, {1, 700}, {255, 511}, {600, 530}, {1025, 200}} {
		for _, names := range [][]string{{"estimate"}, {"estimate", "standard_error", "chance over 5 < x & \"y\""}} {
			g := grid(size[0], size[1], names...)
			b, values := encode(t, g, 2)
			r := openBytes(t, b)
			if r.Width != g.Width || r.Height != g.Height || r.X0 != g.X0 || r.Y0 != g.Y0 || r.CellX != g.CellX || r.CellY != g.CellY || r.PixelIsPoint {
				t.Errorf("%v: read as %+v", size, r)
			}
			if r.CRS() != "EPSG:32633" || r.Geographic {
				t.Errorf("%v: coordinate system %q", size, r.CRS())
			}
			if want := coarser(size[0], size[1]); r.Overviews != want {
				t.Errorf("%v: %d overviews, want %d", size, r.Overviews, want)
			}
			for i, name := range names {
				want := geotiff.Band{Name: name, Kind: geotiff.Float32, NoData: math.NaN(), HasNoData: true, Scale: 1}
				if got := r.Bands[i]; fmt.Sprint(got) != fmt.Sprint(want) {
					t.Errorf("%v: band %+v, want %+v", size, got, want)
				}
				for k, v := range window(t, r, i, 0, 0, r.Width, r.Height) {
					if !same(v, float64(values[i][k])) {
						t.Fatalf("%v, band %d, cell %d: %v, want %v", size, i, k, v, values[i][k])
					}
				}
			}
		}
	}
}

// coarser counts the halvings until a tile of 256 holds a raster.
func coarser(width, height int) int {
	n := 0
	for ; width > 256 || height > 256; n++ {
		width, height = (width+1)/2, (height+1)/2
	}
	return n
}

func TestBytesDoNotDependOnWorkers(t *testing.T) {
	g := grid(1100, 600, "estimate", "chance")
	sums := map[[32]byte]bool{}
	for _, workers := range []int{1, 2, 7, 0, 1} {
		b, _ := encode(t, g, workers)
		sums[sha256.Sum256(b)] = true
	}
	if len(sums) != 1 {
		t.Errorf("%d different files of the same cells", len(sums))
	}
}

// TestCoordinateSystems writes each kind and reads it again.
func TestCoordinateSystems(t *testing.T) {
	tests := []struct {
		name     string
		set      func(*geotiff.Grid)
		code     string
		citation string
	}{
		{"projected", func(g *geotiff.Grid) { g.EPSG = 3035 }, "EPSG:3035", ""},
		{"geographic", func(g *geotiff.Grid) { g.EPSG, g.Geographic = 4258, true }, "EPSG:4258", ""},
		{"with words", func(g *geotiff.Grid) { g.EPSG, g.Citation = 2056, "Swiss | grid" }, "EPSG:2056", "Swiss / grid"},
		{"azimuthal", func(g *geotiff.Grid) { g.Azimuthal = &geotiff.Azimuthal{Lon: -8.512345, Lat: 47.25} }, "laea lon=-8.512345 lat=47.25",
			"azimuthal equal-area plane around the data, WGS 84"},
		{"local", func(g *geotiff.Grid) {}, "", "local metres"},
		{"words alone", func(g *geotiff.Grid) { g.Citation = "site grid of the north field" }, "", "site grid of the north field"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			g := grid(5, 4, "estimate")
			g.EPSG = 0
			test.set(&g)
			b, _ := encode(t, g, 1)
			r := openBytes(t, b)
			if r.CRS() != test.code || r.Citation != test.citation || r.Geographic != g.Geographic {
				t.Errorf("%q, %q, geographic %v; want %q, %q, %v", r.CRS(), r.Citation, r.Geographic, test.code, test.citation, g.Geographic)
			}
			if g.Azimuthal != nil {
				if system, err := crs.Parse(r.CRS()); err != nil || system.Code() != test.code {
					t.Errorf("%q is parsed as %v, %v", r.CRS(), system, err)
				}
			}
		})
	}
}

func TestGridOf(t *testing.T) {
	utm, err := crs.NewUTM(33, false)
	if err != nil {
		t.Fatal(err)
	}
	plane, err := crs.NewAzimuthalEqualArea(-8.5, 47.25)
	if err != nil {
		t.Fatal(err)
	}
	want := geotiff.Grid{Width: 7, Height: 4, X0: 1000, Y0: 2100, CellX: 25, CellY: 25, Bands: []string{"estimate"}}
	for _, test := range []struct {
		system crs.System
		set    func(*geotiff.Grid)
	}{
		{utm, func(g *geotiff.Grid) { g.EPSG = 32633 }},
		{plane, func(g *geotiff.Grid) { g.Azimuthal = &geotiff.Azimuthal{Lon: -8.5, Lat: 47.25} }},
		{crs.Local{}, func(g *geotiff.Grid) {}},
	} {
		w := want
		test.set(&w)
		got := geotiff.GridOf(grids.Lattice{CRS: test.system, X0: 1000, Y0: 2000, Cell: 25, NX: 7, NY: 4}, want.Bands)
		if !reflect.DeepEqual(got, w) {
			t.Errorf("%s: %+v, want %+v", test.system.Code(), got, w)
		}
	}
}

func TestWriteRefuses(t *testing.T) {
	tests := []struct {
		name string
		set  func(*geotiff.Grid)
		want string
	}{
		{"no columns", func(g *geotiff.Grid) { g.Width = 0 }, "0 columns"},
		{"no side", func(g *geotiff.Grid) { g.CellY = 0 }, "not finite and positive"},
		{"no corner", func(g *geotiff.Grid) { g.X0 = math.NaN() }, "not finite and positive"},
		{"cells drowned", func(g *geotiff.Grid) { g.X0 = 1e30 }, "cannot be told apart"},
		{"code too large", func(g *geotiff.Grid) { g.EPSG = 102100 }, "EPSG code 102100"},
		{"two systems", func(g *geotiff.Grid) { g.Azimuthal = &geotiff.Azimuthal{} }, "one coordinate system"},
		{"centre off the globe", func(g *geotiff.Grid) { g.EPSG, g.Azimuthal = 0, &geotiff.Azimuthal{Lat: 91} }, "latitude 91 is not a place"},
		{"no bands", func(g *geotiff.Grid) { g.Bands = nil }, "0 bands"},
		{"no name", func(g *geotiff.Grid) { g.Bands = []string{""} }, "band 1"},
		{"two lines", func(g *geotiff.Grid) { g.Bands = []string{"a\nb"} }, "band 1"},
		{"same name", func(g *geotiff.Grid) { g.Bands = []string{"a", "a"} }, `two bands are called "a"`},
	}
	for _, test := range tests {
		g := grid(4, 3, "estimate")
		test.set(&g)
		var b bytes.Buffer
		err := geotiff.Write(context.Background(), &b, g, func(int, int, []float32) error { return nil }, 1)
		if err == nil || !strings.Contains(err.Error(), test.want) || b.Len() > 0 {
			t.Errorf("%s: %v, %d bytes written", test.name, err, b.Len())
		}
	}
}

// full is a disk with room for some bytes.
type full struct{ room int }

var errFull = errors.New("no space left")

func (w *full) Write(b []byte) (int, error) {
	if w.room -= len(b); w.room < 0 {
		return 0, errFull
	}
	return len(b), nil
}

func TestWriteStops(t *testing.T) {
	g := grid(300, 300, "estimate")
	ctx, cancel := context.WithCancel(context.Background())
	wrong := errors.New("no such row")
	noise := rand.New(rand.NewPCG(1, 2))
	fill := func(_, _ int, dst []float32) error {
		for i := range dst {
			dst[i] = float32(noise.NormFloat64())
		}
		return nil
	}
	if err := geotiff.Write(ctx, &full{room: 1000}, g, fill, 2); !errors.Is(err, errFull) {
		t.Errorf("on a full disk: %v", err)
	}
	if err := geotiff.Write(ctx, &full{room: 1 << 30}, g, func(_, y int, _ []float32) error {
		if y == 299 {
			return wrong
		}
		return nil
	}, 2); err != wrong {
		t.Errorf("without row 299: %v", err)
	}
	cancel()
	if err := geotiff.Write(ctx, &full{room: 1 << 30}, g, fill, 2); !errors.Is(err, context.Canceled) {
		t.Errorf("when told to stop: %v", err)
	}
}

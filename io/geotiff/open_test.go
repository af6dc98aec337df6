package geotiff_test

import (
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"

	"drumlin/basis2d/blocks"
	"drumlin/io/geotiff"
)

func plain() *maker { return newMaker(2, 2, 8, 1, []byte{1, 2, 3, 4}) }

// TestRefusals: every file that is sound but of no use, and every kind of damage, gets an error that says what and how
// to go on.
func TestRefusals(t *testing.T) {
	matrix := func(v ...float64) *maker {
		m := make([]float64, 16)
		m[0], m[1], m[3], m[4], m[5], m[7], m[15] = v[0], v[1], v[2], v[3], v[4], v[5], 1
		return plain().with(tagScale, nil).with(tagTie, nil).with(tagMatrix, m)
	}
	tests := []struct {
		name string
		m    *maker
		want string
	}{
		{"no place", plain().with(tagScale, nil).with(tagTie, nil), "does not say where on the earth"},
		{"single places", plain().with(tagScale, nil).with(tagTie, make([]float64, 18)), "single places only"},
		{"rotated", matrix(10, 1, 1000, 1, -5, 2000), "rotated or sheared"},
		{"south up", matrix(10, 0, 1000, 0, 5, 2000), "rows that run from the south"},
		{"south up by scale", plain().with(tagScale, []float64{10, -5, 0}), "rows that run from the south"},
		{"cells of no size", plain().with(tagScale, []float64{0, 5, 0}), "not finite and positive"},
		{"no number", plain().with(tagScale, []float64{nan, 5, 0}), "not finite and positive"},
		{"cells drowned", plain().with(tagTie, []float64{0, 0, 0, 1e20, 2000, 0}), "cannot be told apart"},
		{"one bit", plain().with(tagBits, []uint16{1}), "whole numbers of 1 bits, which are not read"},
		{"complex", plain().with(tagFormat, []uint16{6}).with(tagBits, []uint16{64}), "complex numbers of 64 bits"},
		{"unknown numbers", plain().with(tagFormat, []uint16{77}), "unknown format 77"},
		{"bands differ", plain().with(tagBands, []uint16{2}).with(tagBits, []uint16{8, 16}), "band 1 has a number of bits of 8 and band 2 has 16"},
		{"photograph", plain().with(tagCompression, []uint16{7}), "compressed by JPEG, which alters values"},
		{"unknown codec", plain().with(tagCompression, []uint16{12345}), "the unknown method 12345"},
		{"tints", plain().with(tagPhotometric, []uint16{6}), "brightness and tint"},
		{"bits backwards", plain().with(266, []uint16{2}), "bits run backwards"},
		{"predictor", plain().with(tagCompression, []uint16{8}).with(tagPredictor, []uint16{9}), "unknown predictor 9"},
		{"predictor of decimals", plain().with(tagCompression, []uint16{8}).with(tagPredictor, []uint16{3}), "but cells of type uint8"},
		{"bands laid out", plain().with(tagPlanar, []uint16{3}), "unknown way 3"},
		{"no width", plain().with(tagWidth, nil), "0 columns and 2 rows"},
		{"too wide", plain().with(tagWidth, []uint32{1<<32 - 1}), "4294967295 columns"},
		{"larger than the file", plain().with(tagWidth, []uint32{1 << 20}).with(tagHeight, []uint32{1 << 20}), "which a file of"},
		{"no bands", plain().with(tagBands, []uint16{0}), "0 bands"},
		{"no rows in a strip", plain().with(tagRows, []uint16{0}), "strips have no rows"},
		{"no tiles", plain().with(tagTileWidth, []uint16{0}).with(tagTileHeight, []uint16{16}), "tiles have 0 columns"},
		{"tiles too large", plain().with(tagTileWidth, []uint32{1 << 14}).with(tagTileHeight, []uint32{1 << 13}), "larger than the 64 MiB"},
		{"too few strips", plain().with(tagRows, []uint16{1}), "should have 2 strips, and says only where 1"},
		{"too few sizes", plain().with(tagStripCounts, []uint32{}), "gives only the size of 0"},
		{"beyond the end", plain().with(tagStripOffsets, []uint32{1 << 20}), "strip 1 would lie at bytes 1048576"},
		{"beyond any end", func() *maker {
			m := plain().with(tagStripOffsets, []uint64{math.MaxUint64 - 1})
			m.big = true
			return m
		}(), "strip 1 would lie at"},
		{"strip too short", newMaker(2, 2, 8, 1, []byte{1, 2, 3}), "rows 1 to 2 cannot be unpacked: it holds fewer cells"},
		{"runs too short", newMaker(2, 2, 8, 1, []byte{1, 2, 3}).with(tagCompression, []uint16{32773}), "fewer cells"},
		{"no Deflate", plain().with(tagCompression, []uint16{8}), "cannot be unpacked"},
		{"Deflate cut", newMaker(2, 2, 8, 1, inflatable([]byte{1, 2, 3, 4})[:6]).with(tagCompression, []uint16{8}), "fewer cells"},
		{"no LZW", newMaker(2, 2, 8, 1, []byte{255, 255, 255, 255}).with(tagCompression, []uint16{5}), "cannot be unpacked"},
		{"no Zstandard", plain().with(tagCompression, []uint16{50000}), "cannot be unpacked"},
		{"too long a block", newMaker(2, 2, 8, 1, make([]byte, 1<<17)).with(tagCompression, []uint16{8}), "more than can be needed"},
		{"a tile of", newMaker(20, 20, 8, 1, nil, nil, []byte{1}, nil).with(tagTileWidth, []uint16{16}).with(tagTileHeight, []uint16{16}),
			"the block of rows 17 to 20 and columns 1 to 16 cannot be unpacked"},
		{"mark", plain().with(tagNoData, "none"), `marks cells without data by "none"`},
		{"no XML", plain().with(tagMetadata, "<GDALMetadata><Item"), "XML that cannot be read"},
		{"scale 0", plain().with(tagMetadata, `<M><Item sample="0" role="scale">0</Item></M>`), `gives band 1 the scale "0"`},
		{"offset", plain().with(tagMetadata, `<M><Item sample="0" role="offset">x</Item></M>`), `gives band 1 the offset "x"`},
		{"keys cut short", plain().with(tagKeys, []uint16{1, 1, 0, 9}), "cut short or of an unknown version"},
		{"kind of value", plain().with(tagWidth, "2"), "kind 2"},
		{"whole scale", plain().with(tagScale, []uint32{1, 1}), "numbers with decimals"},
		{"only overviews", plain().with(254, []uint32{1}), "no directory of a raster at full resolution"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			e := refusal(t, test.m.file())
			if !strings.Contains(e.Error(), test.want) || e.Hint() == "" {
				t.Errorf("%v (%s), want %s", e, e.Hint(), test.want)
			}
		})
	}
}

// TestMatrix takes the place of a raster from a matrix, and from a tie elsewhere than in the corner.
func TestMatrix(t *testing.T) {
	matrix := make([]float64, 16)
	matrix[0], matrix[3], matrix[5], matrix[7], matrix[15] = 10, 1000, -5, 2000, 1
	point := []uint16{1, 1, 0, 1, 1025, 0, 1, 2}
	tests := []struct {
		name   string
		m      *maker
		x0, y0 float64
	}{
		{"matrix", plain().with(tagScale, nil).with(tagTie, nil).with(tagMatrix, matrix), 1000, 2000},
		{"matrix of centres", plain().with(tagScale, nil).with(tagTie, nil).with(tagMatrix, matrix).with(tagKeys, point), 995, 2002.5},
		{"tie in the corner", plain(), 1000, 2000},
		{"tie of a centre", plain().with(tagKeys, point), 995, 2002.5},
		{"tie in the middle", plain().with(tagTie, []float64{1, 2, 0, 1010, 1990, 0}), 1000, 2000},
	}
	for _, test := range tests {
		r := openBytes(t, test.m.file())
		if r.X0 != test.x0 || r.Y0 != test.y0 || r.CellX != 10 || r.CellY != 5 {
			t.Errorf("%s: corner (%v, %v), cells %v by %v", test.name, r.X0, r.Y0, r.CellX, r.CellY)
		}
		west, south, east, north := r.Bounds()
		if west != test.x0 || south != test.y0-10 || east != test.x0+20 || north != test.y0 {
			t.Errorf("%s: bounds %v %v %v %v", test.name, west, south, east, north)
		}
		if x, y := r.Centre(1, 0); x != test.x0+15 || y != test.y0-2.5 {
			t.Errorf("%s: centre (%v, %v)", test.name, x, y)
		}
	}
}

// TestKeys reads the coordinate system out of keys as files have them, the odd ones too.
func TestKeys(t *testing.T) {
	const model, citation, geodetic, projected, projectedCitation = 1024, 1026, 2048, 3072, 3073
	laea := func(center, units uint16) []uint16 {
		return []uint16{1, 1, 0, 7, model, 0, 1, 1, geodetic, 0, 1, center, projected, 0, 1, 32767, 3075, 0, 1, 10, 3076, 0, 1, units,
			3088, tagDoubles, 1, 1, 3089, tagDoubles, 1, 0}
	}
	tests := []struct {
		name       string
		keys       []uint16
		code       string
		geographic bool
		citation   string
	}{
		{"none", nil, "", false, ""},
		{"projected", []uint16{1, 1, 0, 2, model, 0, 1, 1, projected, 0, 1, 27700}, "EPSG:27700", false, ""},
		{"projected, model not said", []uint16{1, 1, 0, 1, projected, 0, 1, 27700}, "EPSG:27700", false, ""},
		{"geographic", []uint16{1, 1, 0, 2, model, 0, 1, 2, geodetic, 0, 1, 4326}, "EPSG:4326", true, ""},
		{"geographic, model not said", []uint16{1, 1, 0, 1, geodetic, 0, 1, 4326}, "EPSG:4326", true, ""},
		{"projected with its base", []uint16{1, 1, 0, 3, model, 0, 1, 1, geodetic, 0, 1, 4326, projected, 0, 1, 32633}, "EPSG:32633", false, ""},
		{"users' own", []uint16{1, 1, 0, 4, model, 0, 1, 1, citation, tagASCII, 8, 0, geodetic, 0, 1, 4326, projected, 0, 1, 32767}, "", false, "my grid"},
		{"two citations", []uint16{1, 1, 0, 3, model, 0, 1, 1, citation, tagASCII, 8, 0, projectedCitation, tagASCII, 7, 8}, "", false, "better"},
		{"citation out of reach", []uint16{1, 1, 0, 2, model, 0, 1, 1, citation, tagASCII, 8, 900}, "", false, ""},
		{"azimuthal", laea(4326, 9001), "laea lon=-8.5 lat=47.25", false, ""},
		{"azimuthal on another earth", laea(4258, 9001), "", false, ""},
		{"azimuthal in feet", laea(4326, 9002), "", false, ""},
	}
	for _, test := range tests {
		m := plain().with(tagDoubles, []float64{47.25, -8.5}).with(tagASCII, "my grid|better|")
		if test.keys != nil {
			m.with(tagKeys, test.keys)
		}
		r := openBytes(t, m.file())
		if r.CRS() != test.code || r.Geographic != test.geographic || r.Citation != test.citation {
			t.Errorf("%s: %q, geographic %v, %q; want %q, %v, %q", test.name, r.CRS(), r.Geographic, r.Citation, test.code, test.geographic, test.citation)
		}
	}
}

// TestNotRasters: what is no raster at all.
func TestNotRasters(t *testing.T) {
	for text, want := range map[string]string{
		"":                                "the file is empty",
		"x,y,z\n1,2,3\n":                  "neither a GeoTIFF nor an ASCII grid raster",
		"II*":                             "neither a GeoTIFF",
		"II*\x00":                         "the header would lie at bytes 0 to 8",
		"II*\x00\x00\x00\x00\x00":         "no directory",
		"II+\x00\x04\x00\x00\x00":         "the header would lie",
		"II+\x00\x04\x0000000000000":      "offsets have 4 bytes",
		"MM\x00*\x00\x00\x00\x08":         "a directory would lie",
		"MM\x00*\x00\x00\x00\x08\xff\xff": "has a directory of 65535 entries",
	} {
		if e := refusal(t, []byte(text)); !strings.Contains(e.Error(), want) {
			t.Errorf("%q: %v, want %s", text, e, want)
		}
	}
}

// TestChains: directories that go round in a circle, or on for ever, end in an error.
func TestChains(t *testing.T) {
	m := plain()
	file := m.file()
	m.next = uint64(binary.LittleEndian.Uint32(file[4:])) // itself
	if e := refusal(t, m.file()); !strings.Contains(e.Error(), "round in a circle") {
		t.Error(e)
	}
	long := []byte("II*\x00\x08\x00\x00\x00")
	for range 2000 { // empty directories, each of the next
		long = binary.LittleEndian.AppendUint16(long, 0)
		long = binary.LittleEndian.AppendUint32(long, uint32(len(long)+4))
	}
	if e := refusal(t, append(long, 0, 0, 0, 0, 0, 0)); !strings.Contains(e.Error(), "more than 1024 directories") {
		t.Error(e)
	}
}

// TestCutShort cuts files after every byte. What remains is never taken for the whole.
func TestCutShort(t *testing.T) {
	g := grid(20, 10, "estimate", "chance")
	file, _ := encode(t, g, 1)
	packed := newMaker(4, 2, 16, 2, raw(little, []int16{1, 2, 3, 4}), raw(little, []int16{5, 6, 7, 8})).with(tagRows, []uint16{1})
	for _, whole := range [][]byte{file, packed.file(), []byte(textRaster)} {
		readAll(t, whole, 0)
		for n := range whole {
			if bytes.HasPrefix(whole, []byte("ncols")) && n >= len(whole)-3 { // a text may lose the end of its last number unnoticed
				continue
			}
			refusal(t, whole[:n])
		}
	}
}

// failing is a disk that breaks down.
type failing struct {
	*bytes.Reader
	from int64
}

var errDisk = errors.New("the disk has gone")

func (f failing) ReadAt(b []byte, at int64) (int, error) {
	if at+int64(len(b)) > f.from {
		return 0, errDisk
	}
	return f.Reader.ReadAt(b, at)
}

func TestDiskFails(t *testing.T) {
	file, _ := encode(t, grid(20, 10, "estimate"), 1)
	for from := int64(0); from < int64(len(file)); from += 7 {
		r, err := geotiff.Open(failing{bytes.NewReader(file), from}, int64(len(file)), "made.tif")
		if err == nil {
			err = r.Window(make([]float64, 200), 0, 0, 0, 20, 10)
		}
		if !errors.Is(err, errDisk) {
			t.Fatalf("a disk that fails at byte %d: %v", from, err)
		}
	}
}

// TestLittleMemory: files of some hundred bytes that promise a great deal cost little.
func TestLittleMemory(t *testing.T) {
	bomb := inflatable(make([]byte, 32<<20))
	huge := func() *maker { return plain().with(tagWidth, []uint32{1 << 13}).with(tagHeight, []uint32{1 << 13}) }
	counts := func(tag uint16) []byte { // a tag that says it has 2^32-1 values
		m := plain().with(tag, []uint32{1, 2, 3})
		file := m.file()
		at := bytes.LastIndex(file, raw(little, []uint16{tag, 4}))
		copy(file[at+4:], []byte{255, 255, 255, 255})
		return file
	}
	for name, file := range map[string][]byte{
		"rows":         huge().with(tagRows, []uint32{1}).file(),
		"offsets":      counts(tagStripOffsets),
		"keys":         counts(tagKeys),
		"Deflate":      newMaker(2, 2, 8, 1, bomb).with(tagCompression, []uint16{8}).file(),
		"Zstandard":    newMaker(2, 2, 8, 1, zstdFarBack).with(tagCompression, []uint16{50000}).file(),
		"text":         []byte("ncols 30000 nrows 1000 xllcorner 0 yllcorner 0 cellsize 1 7"),
		"larger text":  []byte("ncols 300000 nrows 300000 xllcorner 0 yllcorner 0 cellsize 1 7"),
		"endless word": append([]byte("ncols "), bytes.Repeat([]byte("9"), 1<<20)...),
	} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		r, err := geotiff.Open(bytes.NewReader(file), int64(len(file)), name)
		if err == nil {
			v := make([]float64, 1)
			err = r.Window(v, 0, 0, 0, 1, 1)
		}
		runtime.ReadMemStats(&after)
		if used := after.TotalAlloc - before.TotalAlloc; used > 2<<20 {
			t.Errorf("%s: %d bytes taken (%v)", name, used, err)
		}
	}
}

// TestConcurrentWindows reads windows at once; the race detector watches the blocks they share.
func TestConcurrentWindows(t *testing.T) {
	r := open(t, filepath.Join(reference, "float32_three_band.tif"))
	var whole [3][]float64
	for band := range whole {
		whole[band] = window(t, r, band, 0, 0, 64, 48)
	}
	r = open(t, filepath.Join(reference, "float32_three_band.tif"))
	err := blocks.Do(context.Background(), 8, 400, func(_, task int) error {
		band, x, y := task%3, task*7%64, task*5%48
		v := make([]float64, 1)
		if err := r.Window(v, band, x, y, 1, 1); err != nil {
			return err
		}
		if v[0] != whole[band][y*64+x] {
			return errors.New("another cell")
		}
		return nil
	})
	if err != nil {
		t.Error(err)
	}
}

func TestWindowPanics(t *testing.T) {
	r := openBytes(t, plain().file())
	windows := [][6]int{ // band, x0, y0, nx, ny, length of the destination
		{1, 0, 0, 1, 1, 1}, {-1, 0, 0, 1, 1, 1}, {0, -1, 0, 1, 1, 1}, {0, 0, 2, 1, 1, 1}, {0, 1, 0, 2, 1, 2}, {0, 0, 0, 1, -1, 1}, {0, 0, 0, 2, 2, 3},
	}
	for _, w := range windows {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%v: no panic", w)
				}
			}()
			r.Window(make([]float64, w[5]), w[0], w[1], w[2], w[3], w[4])
		}()
	}
}

// FuzzOpen opens whatever comes and reads a few windows: an *Error or cells, never a panic, and little memory.
func FuzzOpen(f *testing.F) {
	for _, name := range []string{
		"uint8_tile16_deflate.tif", "int16_strip_lzw.tif", "float32_tile32_zstd_pred.tif", "float64_bigendian_deflate_pred.tif", "uint16_bigtiff_none.tif",
	} {
		b, err := os.ReadFile(filepath.Join(reference, name))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
	}
	small, _ := encode(f, grid(3, 2, "estimate", "chance"), 1)
	f.Add(small)
	f.Add(newMaker(6, 4, 8, 1, []byte{0xFE, 0xAA, 0x02, 0x80, 0x00, 0x2A, 0xFD, 0xAA}).with(tagCompression, []uint16{32773}).file())
	f.Add(newMaker(2, 4, 16, 2, raw(little, []int16{1, 2}), nil, nil, raw(little, []int16{7, 8})).with(tagRows, []uint16{1}).file())
	f.Add(newMaker(2, 2, 8, 1, zstdFarBack).with(tagCompression, []uint16{50000}).file())
	f.Add(newMaker(2, 2, 16, 2, inflatable(make([]byte, 8))).with(tagCompression, []uint16{8}).with(tagPredictor, []uint16{2}).with(tagNoData, "-1").file())
	f.Add(newMaker(2, 2, 8, 1, []byte{0, 3, 2, 4, 8, 16}).with(tagCompression, []uint16{5}).file())
	f.Add([]byte(textRaster))
	f.Fuzz(func(t *testing.T, b []byte) {
		r, err := geotiff.Open(bytes.NewReader(b), int64(len(b)), "made.tif")
		for i := 0; err == nil && i < 4; i++ {
			band := (len(r.Bands) - 1) * (i & 1)
			nx, ny := min(r.Width, 9), min(r.Height, 9)
			err = r.Window(make([]float64, nx*ny), band, (r.Width-nx)*(i>>1), (r.Height-ny)*(i>>1), nx, ny)
		}
		var refused *geotiff.Error
		if err != nil && !errors.As(err, &refused) {
			t.Fatalf("%T %v", err, err)
		}
	})
}

func TestRecognise(t *testing.T) {
	for head, want := range map[string]bool{
		"II*\x00\x08\x00\x00\x00": true, "MM\x00*": true, "II+\x00": true, "MM\x00+": true, "\uFEFF NCOLS 4\n": true, "xllcorner 5": true,
		"": false, "II": false, "II*": false, "x,y,zinc\n": false, "ncols,nrows\n": false, `{"type": "FeatureCollection"`: false, "\x1f\x8b\x08\x00": false,
	} {
		if got := geotiff.Recognise([]byte(head)); got != want {
			t.Errorf("%q: %v, want %v", head, got, want)
		}
	}
}

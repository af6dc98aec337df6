package geotiff_test

import (
	"bytes"
	stdlzw "compress/lzw"
	"compress/zlib"
	"encoding/binary"
	"math"
	"math/rand/v2"
	"testing"

	"drumlin/io/geotiff"
)

var little, big = binary.ByteOrder(binary.LittleEndian), binary.ByteOrder(binary.BigEndian)

func inflatable(b []byte) []byte {
	var out bytes.Buffer
	w := zlib.NewWriter(&out)
	w.Write(b)
	w.Close()
	return out.Bytes()
}

// TestKinds reads the extremes of every kind of number, in either order of bytes, in TIFF and BigTIFF.
func TestKinds(t *testing.T) {
	tests := []struct {
		kind         string
		bits, format int
		cells        any
		want         []float64
	}{
		{"uint8", 8, 1, []uint8{0, 1, 128, 255}, []float64{0, 1, 128, 255}},
		{"int8", 8, 2, []int8{0, 1, -128, 127}, []float64{0, 1, -128, 127}},
		{"uint16", 16, 1, []uint16{0, 258, 32768, 65535}, []float64{0, 258, 32768, 65535}},
		{"int16", 16, 2, []int16{0, 258, -32768, 32767}, []float64{0, 258, -32768, 32767}},
		{"uint32", 32, 1, []uint32{0, 66051, 1 << 31, 1<<32 - 1}, []float64{0, 66051, 1 << 31, 1<<32 - 1}},
		{"int32", 32, 2, []int32{0, 66051, -1 << 31, 1<<31 - 1}, []float64{0, 66051, -1 << 31, 1<<31 - 1}},
		{"uint64", 64, 1, []uint64{0, 1 << 53, 1 << 63, 66051}, []float64{0, 1 << 53, 1 << 63, 66051}},
		{"int64", 64, 2, []int64{0, 1 << 53, -1 << 63, -66051}, []float64{0, 1 << 53, -1 << 63, -66051}},
		{"float32", 32, 3, []float32{0, 1.5, -math.MaxFloat32, float32(nan)}, []float64{0, 1.5, -math.MaxFloat32, nan}},
		{"float64", 64, 3, []float64{0, 0.1, -math.MaxFloat64, nan}, []float64{0, 0.1, -math.MaxFloat64, nan}},
	}
	for _, test := range tests {
		for _, order := range []binary.ByteOrder{little, big} {
			for _, bigTIFF := range []bool{false, true} {
				m := newMaker(2, 2, test.bits, test.format, raw(order, test.cells))
				m.order, m.big = order, bigTIFF
				r := openBytes(t, m.file())
				if r.Bands[0].Kind.String() != test.kind {
					t.Errorf("%s is read as %v", test.kind, r.Bands[0].Kind)
				}
				wantCells(t, window(t, r, 0, 0, 0, 2, 2), test.want)
			}
		}
	}
}

// TestPackBits reads the example of TIFF 6.0, section 9: Apple's technical note on these runs.
func TestPackBits(t *testing.T) {
	packed := []byte{0xFE, 0xAA, 0x02, 0x80, 0x00, 0x2A, 0xFD, 0xAA, 0x03, 0x80, 0x00, 0x2A, 0x22, 0xF7, 0xAA}
	want := []float64{0xAA, 0xAA, 0xAA, 0x80, 0x00, 0x2A, 0xAA, 0xAA, 0xAA, 0xAA, 0x80, 0x00, 0x2A, 0x22,
		0xAA, 0xAA, 0xAA, 0xAA, 0xAA, 0xAA, 0xAA, 0xAA, 0xAA, 0xAA}
	wantCells(t, readAll(t, newMaker(6, 4, 8, 1, packed).with(tagCompression, []uint16{32773}).file(), 0), want)
	nothing := append([]byte{128, 128}, packed...)
	wantCells(t, readAll(t, newMaker(6, 4, 8, 1, nothing).with(tagCompression, []uint16{32773}).file(), 0), want)
}

// TestOldLZW reads what the standard library's packer makes: its order of bits and its widths of codes are the old ones.
// There are enough cells for codes of every width and for the table to start afresh.
func TestOldLZW(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	cells := make([]byte, 200*150)
	want := make([]float64, len(cells))
	for i := range cells {
		cells[i] = byte(random.IntN(1 + i*250/len(cells)))
		want[i] = float64(cells[i])
	}
	var packed bytes.Buffer
	w := stdlzw.NewWriter(&packed, stdlzw.LSB, 8)
	w.Write(cells)
	w.Close()
	wantCells(t, readAll(t, newMaker(200, 150, 8, 1, packed.Bytes()).with(tagCompression, []uint16{5}).file(), 0), want)
}

// zstdFarBack is a Zstandard frame (RFC 8878, section 3.1.1) that may refer 128 MiB back and holds one run of four sevens:
// magic number, no options, window of 2^(10+17) bytes, header of the last block of a run of 4, the byte.
var zstdFarBack = []byte{0x28, 0xB5, 0x2F, 0xFD, 0x00, 17 << 3, 4<<3 | 1<<1 | 1, 0, 0, 7}

// TestZstandardWindow: a strong packer asks for a large window even in a small block.
func TestZstandardWindow(t *testing.T) {
	wantCells(t, readAll(t, newMaker(2, 2, 8, 1, zstdFarBack).with(tagCompression, []uint16{50000}).file(), 0), []float64{7, 7, 7, 7})
	if e := refusal(t, newMaker(1, 3, 8, 1, zstdFarBack).with(tagCompression, []uint16{50000}).file()); e.Cause == nil {
		t.Errorf("four cells where three belong: %v", e)
	}
	if e := refusal(t, newMaker(1, 5, 8, 1, zstdFarBack).with(tagCompression, []uint16{50000}).file()); e.Cause == nil {
		t.Errorf("four cells where five belong: %v", e)
	}
}

// TestPredictors undoes differences made here one cell at a time, for every size of number, with bands side by side and
// apart, in either order of bytes. The oldest number for Deflate is used for half of them.
func TestPredictors(t *testing.T) {
	const width, height, bands = 5, 3, 2
	random := rand.New(rand.NewPCG(5, 6))
	for _, bits := range []int{8, 16, 32, 64} {
		for _, order := range []binary.ByteOrder{little, big} {
			for _, apart := range []bool{false, true} {
				var cells [bands][height][width]uint64
				mask := uint64(1)<<(bits-1)<<1 - 1
				for b := range cells {
					for y := range height {
						for x := range width {
							cells[b][y][x] = random.Uint64() & mask
						}
					}
				}
				difference := func(b, y, x int) uint64 {
					if x == 0 {
						return cells[b][y][x]
					}
					return (cells[b][y][x] - cells[b][y][x-1]) & mask
				}
				m := newMaker(width, height, bits, 1).with(tagPredictor, []uint16{2}).with(tagBands, []uint16{bands})
				m.order = order
				m.with(tagBits, []uint16{uint16(bits), uint16(bits)}).with(tagFormat, []uint16{1, 1})
				if apart {
					m.with(tagPlanar, []uint16{2}).with(tagCompression, []uint16{8})
					for b := range bands {
						var block []byte
						for y := range height {
							for x := range width {
								block = append(block, number(order, bits, difference(b, y, x))...)
							}
						}
						m.blocks = append(m.blocks, inflatable(block))
					}
				} else {
					m.with(tagCompression, []uint16{32946})
					var block []byte
					for y := range height {
						for x := range width {
							for b := range bands {
								block = append(block, number(order, bits, difference(b, y, x))...)
							}
						}
					}
					m.blocks = append(m.blocks, inflatable(block))
				}
				r := openBytes(t, m.file())
				for b := range bands {
					for k, v := range window(t, r, b, 0, 0, width, height) {
						if want := float64(cells[b][k/width][k%width]); v != want {
							t.Fatalf("%d bits, %v, apart %v, band %d, cell %d: %v, want %v", bits, order, apart, b, k, v, want)
						}
					}
				}
			}
		}
	}
}

func number(order binary.ByteOrder, bits int, v uint64) []byte {
	b := make([]byte, 8)
	order.PutUint64(b, v)
	if order == big {
		return b[8-bits/8:]
	}
	return b[:bits/8]
}

// TestFloatPredictor lays bytes out one at a time as Adobe's Technical Note 3 says, for both sizes, with two bands side
// by side: highest bytes of all numbers of a row first, and each byte less the one two before it.
func TestFloatPredictor(t *testing.T) {
	const width, height, bands = 4, 2, 2
	for _, size := range []int{4, 8} {
		for _, order := range []binary.ByteOrder{little, big} {
			var want [bands][]float64
			var block []byte
			for y := range height {
				row := make([]byte, size*width*bands)
				for n := range width * bands {
					v := math.Sin(float64(1 + y*width*bands + n))
					bytes := binary.BigEndian.AppendUint64(nil, math.Float64bits(v))
					if size == 4 {
						v = float64(float32(v))
						bytes = binary.BigEndian.AppendUint32(nil, math.Float32bits(float32(v)))
					}
					want[n%bands] = append(want[n%bands], v)
					for b := range size {
						row[b*width*bands+n] = bytes[b]
					}
				}
				for i := len(row) - 1; i >= bands; i-- {
					row[i] -= row[i-bands]
				}
				block = append(block, row...)
			}
			m := newMaker(width, height, 8*size, 3, inflatable(block)).with(tagPredictor, []uint16{3}).with(tagBands, []uint16{bands}).with(tagCompression, []uint16{8})
			m.with(tagBits, []uint16{uint16(8 * size), uint16(8 * size)}).with(tagFormat, []uint16{3, 3})
			m.order = order
			file := m.file()
			for b := range bands {
				wantCells(t, readAll(t, file, b), want[b])
			}
		}
	}
}

// TestAbsentBlocks have no data where the file has a mark for that, and are 0 otherwise.
func TestAbsentBlocks(t *testing.T) {
	for mark, empty := range map[string]float64{"-1": nan, "": 0} {
		m := newMaker(2, 4, 16, 2, raw(little, []int16{1, 2}), nil, raw(little, []int16{-1, 6}), raw(little, []int16{7, 8}))
		m.with(tagRows, []uint16{1}).with(tagNoData, mark)
		first := -1.0
		if mark != "" {
			first = nan
		}
		wantCells(t, readAll(t, m.file(), 0), []float64{1, 2, empty, empty, first, 6, 7, 8})
	}
}

// TestLongStrips reads strips that are not compressed and longer than what is read at a time, whole and as windows.
func TestLongStrips(t *testing.T) {
	const width, height = 300, 1000 // 600 kB
	cells := make([]uint16, width*height)
	for i := range cells {
		cells[i] = uint16(i * 7)
	}
	for _, rows := range []int{height, 2 * height, 500, 499, 7} {
		m := newMaker(width, height, 16, 1).with(tagRows, []uint32{uint32(rows)})
		for y := 0; y < height; y += rows {
			m.blocks = append(m.blocks, raw(little, cells[y*width:min(len(cells), (y+rows)*width)]))
		}
		for _, counts := range []bool{true, false} {
			file := m.file()
			if !counts {
				file = without(t, m, tagStripCounts) // as files were before the rule that they must be there
			}
			r := openBytes(t, file)
			if r.BlockWidth != width || r.BlockHeight > 500 {
				t.Errorf("strips of %d rows: blocks of %d columns and %d rows", rows, r.BlockWidth, r.BlockHeight)
			}
			for _, y := range []int{0, 1, 430, 437, 499, 500, 998} {
				for k, v := range window(t, r, 0, 3, y, 2, 2) {
					if want := float64(cells[(y+k/2)*width+3+k%2]); v != want {
						t.Fatalf("strips of %d rows, row %d, cell %d: %v, want %v", rows, y, k, v, want)
					}
				}
			}
		}
	}
}

// without makes a file that lacks a tag which maker would add: it is given a number that means nothing.
func without(t *testing.T, m *maker, tag uint16) []byte {
	t.Helper()
	file := m.file()
	at := bytes.LastIndex(file, raw(m.order, []uint16{tag, 4}))
	if at < 0 {
		t.Fatalf("tag %d is not there", tag)
	}
	copy(file[at:], raw(m.order, []uint16{60000}))
	return file
}

// TestNoData marks cells in each kind of number by texts found in files.
func TestNoData(t *testing.T) {
	tests := []struct {
		name, mark   string
		bits, format int
		cells        any
		want         []float64
	}{
		{"whole number", "-9999", 16, 2, []int16{-9999, 1, 2, 3}, []float64{nan, 1, 2, 3}},
		{"with decimals", "255.000", 8, 1, []uint8{255, 1, 2, 3}, []float64{nan, 1, 2, 3}},
		{"blanks around", " 0 ", 8, 1, []uint8{0, 1, 2, 3}, []float64{nan, 1, 2, 3}},
		{"outside of the kind", "-9999", 8, 1, []uint8{241, 1, 2, 3}, []float64{241, 1, 2, 3}}, // -9999 modulo 256
		{"between whole numbers", "1.5", 8, 1, []uint8{0, 1, 2, 3}, []float64{0, 1, 2, 3}},
		{"more digits than the kind", "0.1", 32, 3, []float32{0.1, 1, 2, 3}, []float64{nan, 1, 2, 3}},
		{"largest, few digits", "-3.40282e+38", 32, 3, []float32{-math.MaxFloat32, math.MaxFloat32, 2, 3}, []float64{nan, math.MaxFloat32, 2, 3}},
		{"largest, rounded up", "1.79769313486232e+308", 64, 3, []float64{math.MaxFloat64, -math.MaxFloat64, 2, 3}, []float64{nan, -math.MaxFloat64, 2, 3}},
		{"nan", "nan", 32, 3, []float32{float32(nan), 1, 2, 3}, []float64{nan, 1, 2, 3}},
		{"none", "", 32, 3, []float32{-9999, 1, 2, float32(nan)}, []float64{-9999, 1, 2, nan}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			wantCells(t, readAll(t, newMaker(2, 2, test.bits, test.format, raw(little, test.cells)).with(tagNoData, test.mark).file(), 0), test.want)
		})
	}
}

// TestDescriptions takes names, scales and offsets by band, and leaves items of the whole file alone.
func TestDescriptions(t *testing.T) {
	m := newMaker(1, 2, 8, 1, []byte{10, 20, 30, 255}).with(tagBands, []uint16{2}).with(tagBits, []uint16{8, 8}).with(tagFormat, []uint16{1, 1})
	m.with(tagNoData, "255").with(tagMetadata, `<GDALMetadata>
  <Item name="SOURCE">somewhere</Item>
  <Item name="DESCRIPTION" sample="1" role="description">height &amp;amp; depth</Item>
  <Item name="SCALE" sample="1" role="scale">0.5</Item>
  <Item name="OFFSET" sample="1" role="offset">-100</Item>
  <Item name="DESCRIPTION" sample="7" role="description">no such band</Item>
</GDALMetadata>`)
	r := openBytes(t, m.file())
	want := []geotiff.Band{
		{Name: "band1", Kind: geotiff.Uint8, NoData: 255, HasNoData: true, Scale: 1},
		{Name: "height & depth", Kind: geotiff.Uint8, NoData: 255, HasNoData: true, Scale: 0.5, Offset: -100},
	}
	for i := range want {
		if r.Bands[i] != want[i] {
			t.Errorf("%+v, want %+v", r.Bands[i], want[i])
		}
	}
	if i, ok := r.Band("height & depth"); i != 1 || !ok {
		t.Errorf("band %d, %v", i, ok)
	}
	wantCells(t, window(t, r, 0, 0, 0, 1, 2), []float64{10, 30})
	wantCells(t, window(t, r, 1, 0, 0, 1, 2), []float64{-90, nan})
}

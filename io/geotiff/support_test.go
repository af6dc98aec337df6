package geotiff_test

import (
	"bytes"
	"encoding/binary"
	"maps"
	"math"
	"slices"
	"testing"

	"drumlin/io/geotiff"
)

// maker builds TIFF files of any shape by a route of its own: header, blocks, then the directory with its values.
type maker struct {
	order  binary.ByteOrder
	big    bool
	tags   map[uint16]any // []uint16, []uint32, []uint64, []float64 or string
	blocks [][]byte       // nil for one that the file does not have
	next   uint64         // offset of the next directory
}

const (
	tagWidth, tagHeight, tagBits, tagCompression, tagPhotometric = 256, 257, 258, 259, 262
	tagBands, tagRows, tagPlanar, tagPredictor, tagFormat        = 277, 278, 284, 317, 339
	tagTileWidth, tagTileHeight                                  = 322, 323
	tagStripOffsets, tagStripCounts                              = 273, 279
	tagTileOffsets, tagTileCounts                                = 324, 325
	tagScale, tagTie, tagMatrix, tagKeys                         = 33550, 33922, 34264, 34735
	tagDoubles, tagASCII, tagMetadata, tagNoData                 = 34736, 34737, 42112, 42113
)

// newMaker starts a raster of one strip with a corner at (1000, 2000) and cells of 10 by 5.
func newMaker(width, height, bits, format int, blocks ...[]byte) *maker {
	return &maker{order: binary.LittleEndian, blocks: blocks, tags: map[uint16]any{
		tagWidth: []uint32{uint32(width)}, tagHeight: []uint32{uint32(height)}, tagBits: []uint16{uint16(bits)}, tagFormat: []uint16{uint16(format)},
		tagScale: []float64{10, 5, 0}, tagTie: []float64{0, 0, 0, 1000, 2000, 0},
	}}
}

// with sets a tag; nil takes it away.
func (m *maker) with(tag uint16, v any) *maker {
	m.tags[tag] = v
	if v == nil {
		delete(m.tags, tag)
	}
	return m
}

func (m *maker) file() []byte {
	word := func(b []byte, v uint64) []byte {
		if m.big {
			return m.append(b, v)
		}
		return m.append(b, uint32(v))
	}
	var data []byte
	start := uint64(8)
	if m.big {
		start = 16
	}
	var offsets, counts []uint64
	for _, b := range m.blocks {
		if b == nil {
			offsets, counts = append(offsets, 0), append(counts, 0)
			continue
		}
		offsets, counts = append(offsets, start+uint64(len(data))), append(counts, uint64(len(b)))
		data = append(data, b...)
	}
	tags := maps.Clone(m.tags)
	where, sizes := uint16(tagStripOffsets), uint16(tagStripCounts)
	if tags[tagTileWidth] != nil {
		where, sizes = tagTileOffsets, tagTileCounts
	}
	for tag, v := range map[uint16][]uint64{where: offsets, sizes: counts} {
		if _, given := tags[tag]; !given && m.big {
			tags[tag] = v
		} else if !given {
			short := make([]uint32, len(v))
			for i := range v {
				short[i] = uint32(v[i])
			}
			tags[tag] = short
		}
	}
	data = append(data, make([]byte, len(data)%2)...)

	mark := "II"
	if m.order == binary.BigEndian {
		mark = "MM"
	}
	b := []byte(mark)
	if m.big {
		b = m.append(m.append(m.append(b, uint16(43)), uint16(8)), uint16(0))
	} else {
		b = m.append(b, uint16(42))
	}
	b = append(word(b, start+uint64(len(data))), data...)

	beside := len(b) + 2 + 12*len(tags) + 4
	if m.big {
		beside = len(b) + 8 + 20*len(tags) + 8
		b = m.append(b, uint64(len(tags)))
	} else {
		b = m.append(b, uint16(len(tags)))
	}
	var values []byte
	for _, tag := range slices.Sorted(maps.Keys(tags)) {
		kind, count, raw := m.values(tags[tag])
		b = word(m.append(m.append(b, tag), kind), uint64(count))
		room := len(word(nil, 0))
		if len(raw) <= room {
			b = append(append(b, raw...), make([]byte, room-len(raw))...)
			continue
		}
		b = word(b, uint64(beside+len(values)))
		values = append(append(values, raw...), make([]byte, len(raw)%2)...)
	}
	return append(word(b, m.next), values...)
}

func (m *maker) values(v any) (kind uint16, count int, raw []byte) {
	switch v := v.(type) {
	case []uint16:
		return 3, len(v), m.append(nil, v)
	case []uint32:
		return 4, len(v), m.append(nil, v)
	case []uint64:
		return 16, len(v), m.append(nil, v)
	case []float64:
		return 12, len(v), m.append(nil, v)
	case string:
		return 2, len(v) + 1, append([]byte(v), 0)
	}
	panic("maker: an unknown kind of values")
}

func (m *maker) append(b []byte, v any) []byte {
	var out bytes.Buffer
	if err := binary.Write(&out, m.order, v); err != nil {
		panic(err)
	}
	return append(b, out.Bytes()...)
}

// raw lays numbers out in an order of bytes.
func raw(order binary.ByteOrder, v any) []byte { return (&maker{order: order}).append(nil, v) }

// readAll opens a file that must be sound and returns all cells of a band.
func readAll(t testing.TB, file []byte, band int) []float64 {
	t.Helper()
	r := openBytes(t, file)
	return window(t, r, band, 0, 0, r.Width, r.Height)
}

func wantCells(t testing.TB, got, want []float64) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("%d cells, want %d", len(got), len(want))
	}
	for i := range got {
		if !same(got[i], want[i]) {
			t.Fatalf("cell %d: %v, want %v", i, got[i], want[i])
		}
	}
}

var nan = math.NaN()

// refusal opens a file and reads all of it, and returns the error that must come.
func refusal(t testing.TB, file []byte) *geotiff.Error {
	t.Helper()
	r, err := geotiff.Open(bytes.NewReader(file), int64(len(file)), "made.tif")
	for band := 0; err == nil && band < len(r.Bands); band++ {
		err = r.Window(make([]float64, r.Width*r.Height), band, 0, 0, r.Width, r.Height)
	}
	if err == nil {
		t.Error("no error")
		return &geotiff.Error{}
	}
	e, ok := err.(*geotiff.Error)
	if !ok || e.File != "made.tif" {
		t.Errorf("%T %v, not an *Error of the file", err, err)
		return &geotiff.Error{What: err.Error()}
	}
	return e
}

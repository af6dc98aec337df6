package geotiff_test

import (
	"bytes"
	"compress/zlib"
	"encoding/binary"
	"io"
	"math"
	"testing"

	"drumlin/io/geotiff"
)

// dump is what a file written here holds, taken apart by a route of its own: little-endian, one directory after the
// other.
type dump struct {
	at, end uint64 // bytes of the directory and its values
	tags    map[uint16][]uint64
	kinds   map[uint16]uint16
}

func takeApart(t *testing.T, b []byte) (dumps []dump) {
	t.Helper()
	le := binary.LittleEndian
	isBig := le.Uint16(b[2:]) == 43
	word := func(b []byte) uint64 { return uint64(le.Uint32(b)) }
	count, each, room := uint64(2), uint64(12), uint64(4)
	next := word(b[4:])
	if isBig {
		word = le.Uint64
		count, each, room = 8, 20, 8
		next = word(b[8:])
	}
	for next != 0 {
		d := dump{at: next, tags: map[uint16][]uint64{}, kinds: map[uint16]uint16{}}
		n := uint64(le.Uint16(b[next:]))
		if d.at%2 != 0 {
			t.Errorf("directory at odd byte %d", d.at)
		}
		last := uint16(0)
		for i := range n {
			e := b[next+count+i*each:]
			tag, kind, values := le.Uint16(e), le.Uint16(e[2:]), word(e[4:])
			if tag <= last {
				t.Errorf("tag %d after tag %d", tag, last)
			}
			last = tag
			size := map[uint16]uint64{2: 1, 3: 2, 4: 4, 12: 8, 16: 8}[kind]
			data := e[each-room:]
			if size*values > room {
				at := word(data)
				if at%2 != 0 {
					t.Errorf("values of tag %d at odd byte %d", tag, at)
				}
				data = b[at:]
				d.end = max(d.end, at+size*values)
			}
			for k := range values {
				v := [8]byte{}
				copy(v[:], data[k*size:(k+1)*size])
				d.tags[tag] = append(d.tags[tag], le.Uint64(v[:]))
			}
			d.kinds[tag] = kind
		}
		end := next + count + n*each
		d.end = max(d.end, end+room)
		next = word(b[end:])
		dumps = append(dumps, d)
	}
	return dumps
}

// TestCloudOptimised checks the order that OGC 21-026 asks for, in TIFF and BigTIFF: tiles; directories at the start,
// the raster before its overviews, each of half the size of the last, marked as such, down to one tile; then the cells,
// those of the coarsest overview first, bands and tiles in order, nothing between them and nothing after.
func TestCloudOptimised(t *testing.T) {
	for _, test := range []struct {
		name          string
		width, height int
		bands         []string
		big           bool
	}{
		{"one tile", 100, 50, []string{"estimate"}, false},
		{"wide", 1500, 200, []string{"estimate"}, false},
		{"three bands", 700, 530, []string{"estimate", "standard_error", "chance"}, false},
		{"BigTIFF", 530, 700, []string{"estimate", "standard_error"}, true},
	} {
		t.Run(test.name, func(t *testing.T) {
			g := grid(test.width, test.height, test.bands...)
			file, _ := encode(t, g, 2)
			if test.big {
				var err error
				file, err = geotiff.WriteBig(g, rowsOf(g, surfaces(g)))
				if err != nil {
					t.Fatal(err)
				}
				if file[2] != 43 {
					t.Fatal("not a BigTIFF")
				}
			}
			pictures := takeApart(t, file)
			if len(pictures) != 1+coarser(g.Width, g.Height) {
				t.Errorf("%d directories", len(pictures))
			}
			at, width, height := uint64(8), uint64(g.Width), uint64(g.Height)
			if test.big {
				at = 16
			}
			for k, d := range pictures {
				if d.at < at || d.at > at+8 {
					t.Errorf("directory %d at byte %d, the one before ends at %d", k, d.at, at)
				}
				at = d.end
				if d.tags[tagWidth][0] != width || d.tags[tagHeight][0] != height {
					t.Errorf("directory %d: %d columns, %d rows; want %d, %d", k, d.tags[tagWidth][0], d.tags[tagHeight][0], width, height)
				}
				if reduced := len(d.tags[254]) == 1 && d.tags[254][0] == 1; reduced != (k > 0) {
					t.Errorf("directory %d: marked as overview %v", k, reduced)
				}
				if d.tags[tagTileWidth][0] != 256 || d.tags[tagTileHeight][0] != 256 || d.tags[tagCompression][0] != 8 || d.tags[tagPredictor][0] != 3 {
					t.Errorf("directory %d: %v", k, d.tags)
				}
				if tiles := (width + 255) / 256 * ((height + 255) / 256) * uint64(len(g.Bands)); uint64(len(d.tags[tagTileOffsets])) != tiles {
					t.Errorf("directory %d: %d tiles, want %d", k, len(d.tags[tagTileOffsets]), tiles)
				}
				width, height = (width+1)/2, (height+1)/2
			}
			for k := len(pictures) - 1; k >= 0; k-- {
				for i, offset := range pictures[k].tags[tagTileOffsets] {
					if offset < at || offset > at+8 || k < len(pictures)-1 && offset != at {
						t.Fatalf("directory %d, tile %d at byte %d, want %d", k, i, offset, at)
					}
					at = offset + pictures[k].tags[tagTileCounts][i]
				}
			}
			if at != uint64(len(file)) {
				t.Errorf("the last tile ends at byte %d of %d", at, len(file))
			}
			overviewsAreMeans(t, file, pictures, g)
		})
	}
}

// overviewsAreMeans compares each overview with plain means over the cells of the one before it.
func overviewsAreMeans(t *testing.T, file []byte, pictures []dump, g geotiff.Grid) {
	t.Helper()
	for band := range g.Bands {
		fine, width, height := surface(band, g.Width, g.Height), g.Width, g.Height
		for k := range pictures {
			got := cellsOfPicture(t, file, pictures[k], band)
			if k > 0 {
				coarse := make([]float32, (width+1)/2*((height+1)/2))
				for i := range coarse {
					x, y := 2*(i%((width+1)/2)), 2*(i/((width+1)/2))
					sum, n := 0.0, 0.0
					for yy := y; yy < min(y+2, height); yy++ {
						for xx := x; xx < min(x+2, width); xx++ {
							if v := float64(fine[yy*width+xx]); v == v {
								sum, n = sum+v, n+1
							}
						}
					}
					coarse[i] = float32(sum / n)
				}
				fine, width, height = coarse, (width+1)/2, (height+1)/2
			}
			for i, w := range fine {
				if !(math.Abs(float64(got[i]-w)) <= 1e-6*math.Abs(float64(w))) && !(w != w && got[i] != got[i]) {
					t.Fatalf("band %d, directory %d, cell %d: %v, want %v", band, k, i, got[i], w)
				}
			}
			fine = got // means of what is written, so that roundings do not add up
		}
	}
}

// cellsOfPicture unpacks the tiles of a picture.
func cellsOfPicture(t *testing.T, file []byte, d dump, band int) []float32 {
	t.Helper()
	width, height := int(d.tags[tagWidth][0]), int(d.tags[tagHeight][0])
	across, down := (width+255)/256, (height+255)/256
	cells := make([]float32, width*height)
	for j := range down {
		for i := range across {
			tile := (band*down+j)*across + i
			at, n := d.tags[tagTileOffsets][tile], d.tags[tagTileCounts][tile]
			r, err := zlib.NewReader(bytes.NewReader(file[at : at+n]))
			if err != nil {
				t.Fatal(err)
			}
			b, err := io.ReadAll(r)
			if err != nil || len(b) != 256*256*4 {
				t.Fatalf("tile of %d bytes, %v", len(b), err)
			}
			for y := range 256 {
				row := b[y*1024 : (y+1)*1024]
				for k := 1; k < len(row); k++ {
					row[k] += row[k-1]
				}
				for x := range 256 {
					bits := uint32(row[x])<<24 | uint32(row[256+x])<<16 | uint32(row[512+x])<<8 | uint32(row[768+x])
					if j*256+y < height && i*256+x < width {
						cells[(j*256+y)*width+i*256+x] = math.Float32frombits(bits)
					} else if bits != 0x7fc00000 {
						t.Fatalf("a cell beyond the raster is %v", math.Float32frombits(bits))
					}
				}
			}
		}
	}
	return cells
}

// TestBigTIFFReadsBack reads what is written when a file grows beyond 4 GiB.
func TestBigTIFFReadsBack(t *testing.T) {
	g := grid(600, 300, "estimate", "chance")
	file, err := geotiff.WriteBig(g, rowsOf(g, surfaces(g)))
	if err != nil {
		t.Fatal(err)
	}
	r := openBytes(t, file)
	if r.CRS() != "EPSG:32633" || r.Bands[1].Name != "chance" || r.Overviews != 2 {
		t.Errorf("%+v", r)
	}
	want := surface(1, g.Width, g.Height)
	for k, v := range window(t, r, 1, 0, 0, g.Width, g.Height) {
		if !same(v, float64(want[k])) {
			t.Fatalf("cell %d: %v, want %v", k, v, want[k])
		}
	}
}

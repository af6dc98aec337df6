package geotiff

import (
	"bytes"
	"context"
	"math"

	"github.com/klauspost/compress/zlib"

	"drumlin/basis2d/blocks"
)

// tileSide is the side of the tiles written: even, so that the rows averaged for an overview stand in the same tile, and
// a multiple of 16 as TIFF 6.0 asks.
const tileSide = 256

// level is a raster or an overview of it: what has been packed, and the strip of rows that is being filled.
type level struct {
	width, height int
	across, down  int        // tiles along the sides
	tiles         [][][]byte // packed, by band and then row after row from the north-west
	strip         []float32  // up to tileSide rows
	rows          int        // rows in the strip
}

// pyramid packs a raster and its overviews as the rows come in. It holds two rows of tiles of cells, as packed tiles a
// fraction of the rest.
type pyramid struct {
	levels  []*level // the raster, then ever coarser overviews until one tile holds the whole
	workers int
	packers []*packer // one a worker
}

func newPyramid(width, height, bands, workers int) *pyramid {
	p := &pyramid{workers: blocks.Workers(workers)}
	for range p.workers {
		p.packers = append(p.packers, newPacker())
	}
	for {
		l := &level{width: width, height: height, across: (width-1)/tileSide + 1, down: (height-1)/tileSide + 1}
		l.tiles = make([][][]byte, bands)
		l.strip = make([]float32, width*min(tileSide, height))
		p.levels = append(p.levels, l)
		if width <= tileSide && height <= tileSide {
			return p
		}
		width, height = (width+1)/2, (height+1)/2
	}
}

// next is where the next row of a level belongs. It is added once it has been filled.
func (p *pyramid) next(k int) []float32 {
	l := p.levels[k]
	return l.strip[l.rows*l.width : (l.rows+1)*l.width]
}

// add counts the row that next gave out. A strip that is full is packed and passed on to the next overview.
func (p *pyramid) add(ctx context.Context, k, band int) error {
	l := p.levels[k]
	l.rows++
	done := len(l.tiles[band])/l.across*tileSide + l.rows
	if l.rows < tileSide && done < l.height {
		return nil
	}
	packed := make([][]byte, l.across)
	err := blocks.Do(ctx, p.workers, l.across, func(worker, i int) error {
		var err error
		packed[i], err = p.packers[worker].pack(l, i)
		return err
	})
	if err != nil {
		return err
	}
	l.tiles[band] = append(l.tiles[band], packed...)
	if k+1 < len(p.levels) {
		for y := 0; y < l.rows; y += 2 {
			north := l.strip[y*l.width : (y+1)*l.width]
			south := north
			if y+1 < l.rows {
				south = l.strip[(y+1)*l.width : (y+2)*l.width]
			}
			average(p.next(k+1), north, south)
			if err := p.add(ctx, k+1, band); err != nil {
				return err
			}
		}
	}
	l.rows = 0
	return nil
}

// average fills a row of an overview: each cell is the mean of those of four that have data, NaN if none has. At an edge
// where cells are missing the ones there stand in for them.
func average(dst, north, south []float32) {
	for i := range dst {
		west, east := 2*i, min(2*i+1, len(north)-1)
		sum, n := 0.0, 0
		for _, v := range [4]float32{north[west], north[east], south[west], south[east]} {
			if v == v {
				sum += float64(v)
				n++
			}
		}
		dst[i] = float32(sum / float64(n)) // 0/0 is NaN
	}
}

// packer packs tiles, with scratch space of its own.
type packer struct {
	zip  *zlib.Writer
	out  bytes.Buffer
	row  [tileSide]uint32
	cell []byte
}

func newPacker() *packer {
	p := &packer{cell: make([]byte, tileSide*tileSide*4)}
	p.zip = zlib.NewWriter(&p.out)
	return p
}

// noDataBits is the one NaN that is written.
const noDataBits = 0x7fc00000

// pack returns tile i of a strip: the floating-point predictor, then Deflate. Cells beyond the raster are NaN.
func (p *packer) pack(l *level, i int) ([]byte, error) {
	left, right := i*tileSide, min((i+1)*tileSide, l.width)
	for y := range tileSide {
		for x := range p.row {
			p.row[x] = noDataBits
		}
		if y < l.rows {
			for x, v := range l.strip[y*l.width+left : y*l.width+right] {
				if v == v {
					p.row[x] = math.Float32bits(v)
				}
			}
		}
		scatter(p.cell[y*tileSide*4:(y+1)*tileSide*4], p.row[:])
	}
	p.out.Reset()
	p.zip.Reset(&p.out)
	if _, err := p.zip.Write(p.cell); err != nil {
		return nil, err
	}
	if err := p.zip.Close(); err != nil {
		return nil, err
	}
	return bytes.Clone(p.out.Bytes()), nil
}

package geotiff

import (
	"fmt"
	"math"
)

// cacheBytes is what decoded blocks may take beside the one at work: a row of tiles of a wide raster.
const cacheBytes = 64 << 20

// tiff is the cells of a TIFF file.
type tiff struct {
	file   *file
	layout *layout
	empty  float64 // stored number of cells in blocks that the file does not have
	cache  *cache
}

// fill writes the stored numbers of a window, block by block.
func (t *tiff) fill(dst []float64, band, x0, y0, nx, ny int) error {
	l := t.layout
	plane, skip := 0, band*l.kind.size()
	if l.separate {
		plane, skip = band, 0
	}
	for j := y0 / l.blockH; j*l.blockH < y0+ny; j++ {
		top, bottom := max(y0, j*l.blockH), min(y0+ny, (j+1)*l.blockH)
		for i := x0 / l.blockW; i*l.blockW < x0+nx; i++ {
			left, right := max(x0, i*l.blockW), min(x0+nx, (i+1)*l.blockW)
			b, err := t.block(plane, j, i)
			if err != nil {
				return err
			}
			for y := top; y < bottom; y++ {
				row := dst[(y-y0)*nx+left-x0 : (y-y0)*nx+right-x0]
				if b == nil {
					for k := range row {
						row[k] = t.empty
					}
					continue
				}
				at := (y-j*l.blockH)*l.rowBytes() + (left-i*l.blockW)*l.cellBytes() + skip
				cellsTo(row, b[at:], l.kind, l.cellBytes())
			}
		}
	}
	return nil
}

// block returns a decoded block: rows of cells, little-endian, without predictor; nil if the file does not have it.
func (t *tiff) block(plane, j, i int) ([]byte, error) {
	size := t.layout.rowsOf(j) * t.layout.rowBytes()
	return t.cache.get(blockKey{plane, j, i}, size, func() ([]byte, error) { return t.decode(plane, j, i, size) })
}

func (t *tiff) decode(plane, j, i, size int) ([]byte, error) {
	l := t.layout
	offset, n := l.where(plane, j, i)
	if n == 0 {
		return nil, nil
	}
	name := t.blockName(plane, j, i)
	// No codec makes a block much longer: more than that is not read. Without one the rest belongs to other blocks.
	most := uint64(2*l.blockH*l.rowBytes() + 1<<16)
	if l.compression == compressNone {
		n = min(n, uint64(size))
	} else if n > most {
		return nil, t.file.refuse(adviceDamaged, "%s takes %d bytes, more than can be needed", name, n)
	}
	packed, err := t.file.read(offset, n, name)
	if err != nil {
		return nil, err
	}
	b := make([]byte, size)
	if err := unpack(b, packed, l.compression, l.blockH*l.rowBytes()); err != nil {
		return nil, &Error{File: t.file.name, What: name + " cannot be unpacked", Advice: adviceDamaged, Cause: err}
	}
	t.settle(b)
	return b, nil
}

// settle makes little-endian numbers of an unpacked block.
func (t *tiff) settle(b []byte) {
	l := t.layout
	size := l.kind.size()
	if t.file.order.String() == "BigEndian" && size > 1 && l.predictor != predictFloat {
		swap(b, size)
	}
	switch l.predictor {
	case predictInteger:
		for ; len(b) > 0; b = b[l.rowBytes():] {
			addUp(b[:l.rowBytes()], size, l.side())
		}
	case predictFloat:
		scratch := make([]byte, l.rowBytes())
		for ; len(b) > 0; b = b[l.rowBytes():] {
			gather(b[:l.rowBytes()], scratch, size, l.side())
		}
	}
}

// blockName says where a block is, for a message.
func (t *tiff) blockName(plane, j, i int) string {
	l := t.layout
	text := fmt.Sprintf("the block of rows %d to %d", j*l.blockH+1, min((j+1)*l.blockH, l.height))
	if l.tiled {
		text += fmt.Sprintf(" and columns %d to %d", i*l.blockW+1, min((i+1)*l.blockW, l.width))
	}
	if l.separate {
		text += fmt.Sprintf(" of band %d", plane+1)
	}
	return text
}

// emptyValue is what cells hold that are in no block: no data where the file has a value for it, else 0.
func emptyValue(b Band) float64 {
	if b.HasNoData {
		return math.NaN()
	}
	return 0
}

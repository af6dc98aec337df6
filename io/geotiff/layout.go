package geotiff

import "fmt"

const (
	mostAcross    = 1<<31 - 1 // cells along a side
	mostBands     = 65535
	mostBlock     = 64 << 20 // bytes of one decoded block
	mostPerByte   = 1 << 18  // bytes of cells that a byte of the file may stand for; more than any codec or empty block gives
	piece         = 1 << 18  // bytes of cells that are read at a time from long strips that are not compressed
	adviceOneFile = "write the bands that are wanted to a file of their own"
)

// layout says how the cells of a raster lie in its file.
type layout struct {
	width, height int
	bands         int
	kind          Kind
	separate      bool // every band has its own blocks; otherwise the bands of a cell stand side by side
	tiled         bool
	blockW        int // columns of a block; the width of the raster in strips
	blockH        int // rows of a block
	stripRows     int // rows of a strip in the file, where a block is a part of one; otherwise 0
	across, down  int // blocks along the sides
	compression   uint64
	predictor     uint64
	offsets       []uint64 // of tiles or strips, band after band where separate
	counts        []uint64 // their sizes in bytes; 0 where the file has no such block
}

// layoutOf reads and checks how the cells of a directory lie. After it every block that the file has is known to lie
// within the file.
func (f *file) layoutOf(d directory) (*layout, error) {
	l := &layout{}
	for _, step := range []func(directory, *layout) error{f.readSize, f.readKind, f.readCodec, f.readBlocks, f.readOffsets} {
		if err := step(d, l); err != nil {
			return nil, err
		}
	}
	return l, nil
}

func (f *file) readSize(d directory, l *layout) error {
	width, err := f.one(d, tagWidth, 0)
	if err != nil {
		return err
	}
	height, err := f.one(d, tagHeight, 0)
	if err != nil {
		return err
	}
	bands, err := f.one(d, tagSamplesPerPixel, 1)
	if err != nil {
		return err
	}
	if width < 1 || height < 1 || width > mostAcross || height > mostAcross {
		return f.refuse(adviceDamaged, "says that it has %d columns and %d rows; both must be 1 to %d", width, height, mostAcross)
	}
	if bands < 1 || bands > mostBands {
		return f.refuse(adviceDamaged, "says that it has %d bands; there must be 1 to %d", bands, mostBands)
	}
	l.width, l.height, l.bands = int(width), int(height), int(bands)
	if float64(width)*float64(height)*float64(bands) > mostPerByte*float64(f.size) {
		return f.refuse(adviceDamaged, "says that it has %d columns, %d rows and %d bands, which a file of %d bytes cannot hold", width, height, bands, f.size)
	}
	planar, err := f.one(d, tagPlanar, 1)
	if err != nil {
		return err
	}
	if planar != 1 && planar != 2 {
		return f.refuse(adviceDamaged, "says that its bands are laid out in the unknown way %d", planar)
	}
	l.separate = planar == 2 && bands > 1
	return nil
}

func (f *file) readKind(d directory, l *layout) error {
	bits, err := f.same(d, tagBitsPerSample, l.bands, 1, "a number of bits of")
	if err != nil {
		return err
	}
	format, err := f.same(d, tagSampleFormat, l.bands, 1, "a sample format of")
	if err != nil {
		return err
	}
	kind, ok := kindOf(format, bits)
	if !ok {
		names := map[uint64]string{1: "whole numbers", 2: "whole numbers with a sign", 3: "numbers with decimals", 5: "complex whole numbers", 6: "complex numbers"}
		name := names[format]
		if name == "" {
			name = fmt.Sprintf("numbers of the unknown format %d", format)
		}
		return f.refuse("write the raster again with cells of type uint8, int16, int32, float32 or another of 8, 16, 32 or 64 bits",
			"has cells that are %s of %d bits, which are not read", name, bits)
	}
	l.kind = kind
	return nil
}

func (f *file) readCodec(d directory, l *layout) (err error) {
	if l.compression, err = f.one(d, tagCompression, compressNone); err != nil {
		return err
	}
	switch l.compression {
	case compressNone, compressLZW, compressDeflate, compressDeflate0, compressPackBits, compressZstd:
	default:
		return f.refuse(adviceRewrite, "is compressed by %s, which is not read", compressionName(l.compression))
	}
	if l.predictor, err = f.one(d, tagPredictor, predictNone); err != nil {
		return err
	}
	if l.compression == compressNone || l.compression == compressPackBits {
		l.predictor = predictNone // a predictor belongs to the other codecs alone (TIFF 6.0, section 14)
	}
	switch {
	case l.predictor == predictNone, l.predictor == predictInteger, l.predictor == predictFloat && l.kind.isFloat():
	case l.predictor == predictFloat:
		return f.refuse(adviceDamaged, "has the predictor for numbers with decimals, but cells of type %v", l.kind)
	default:
		return f.refuse(adviceRewrite, "has the unknown predictor %d", l.predictor)
	}
	const subsampled = 6
	for _, t := range []struct {
		tag     uint16
		refused uint64
		what    string
	}{
		{tagPhotometric, subsampled, "is a photograph stored by brightness and tint, whose cells are not measurements"},
		{tagFillOrder, 2, "has bytes whose bits run backwards, which is not read"},
	} {
		v, err := f.one(d, t.tag, 1)
		if err != nil {
			return err
		}
		if v == t.refused {
			return f.refuse(adviceRewrite, "%s", t.what)
		}
	}
	return nil
}

func compressionName(number uint64) string {
	switch number {
	case 2, 3, 4:
		return "a code for telefax"
	case 6, 7:
		return "JPEG, which alters values"
	case 34712:
		return "JPEG 2000"
	case 34887:
		return "LERC"
	case 34925:
		return "LZMA"
	case 50001:
		return "WebP"
	case 50002:
		return "JPEG XL"
	}
	return fmt.Sprintf("the unknown method %d", number)
}

// readBlocks reads the size of tiles or strips. Long strips that are not compressed become shorter blocks, so that a
// raster stored as one strip can still be read by windows.
func (f *file) readBlocks(d directory, l *layout) error {
	_, l.tiled = d[tagTileWidth]
	if l.tiled {
		w, err := f.one(d, tagTileWidth, 0)
		if err != nil {
			return err
		}
		h, err := f.one(d, tagTileHeight, 0)
		if err != nil {
			return err
		}
		if w < 1 || h < 1 || w > mostBlock || h > mostBlock {
			return f.refuse(adviceDamaged, "says that its tiles have %d columns and %d rows", w, h)
		}
		l.blockW, l.blockH = int(w), int(h)
	} else {
		rows, err := f.one(d, tagRowsPerStrip, uint64(l.height))
		if err != nil {
			return err
		}
		if rows < 1 {
			return f.refuse(adviceDamaged, "says that its strips have no rows")
		}
		l.blockW, l.blockH = l.width, int(min(rows, uint64(l.height)))
		if l.compression == compressNone && l.rowBytes() < mostBlock {
			l.shorten()
		}
	}
	if float64(l.rowBytes())*float64(l.blockH) > mostBlock {
		return f.refuse(adviceRewrite, "has blocks of %d columns and %d rows, which are larger than the %d MiB that are read at a time", l.blockW, l.blockH, mostBlock>>20)
	}
	l.across, l.down = (l.width-1)/l.blockW+1, (l.height-1)/l.blockH+1
	return nil
}

// shorten splits strips into blocks of whole rows that hold about one piece. Strips after another must be cut alike: the
// rows of a block divide those of a strip, unless there is only one.
func (l *layout) shorten() {
	rows := max(1, piece/l.rowBytes())
	if rows >= l.blockH {
		return
	}
	l.stripRows = l.blockH
	if l.blockH < l.height {
		for l.blockH%rows != 0 {
			rows--
		}
	}
	l.blockH = rows
}

// rowBytes is the number of bytes of a row of a block.
func (l *layout) rowBytes() int { return l.blockW * l.cellBytes() }

// cellBytes is the distance in bytes from a cell to the next one in a block.
func (l *layout) cellBytes() int { return l.kind.size() * l.side() }

// side is the number of bands that stand side by side in a block.
func (l *layout) side() int {
	if l.separate {
		return 1
	}
	return l.bands
}

// readOffsets fetches where the tiles or strips lie, as many as the size of the raster asks for, and checks that they
// are within the file. Size and file bound each other by then, and a value that is fetched stands in the file, so no
// more memory is taken than a few times the size of the file.
func (f *file) readOffsets(d directory, l *layout) (err error) {
	offsets, counts, word := uint16(tagStripOffsets), uint16(tagStripByteCounts), "strip"
	if l.tiled {
		offsets, counts, word = tagTileOffsets, tagTileByteCounts, "tile"
	}
	down, rows := l.down, l.blockH
	if l.stripRows > 0 {
		down, rows = (l.height-1)/l.stripRows+1, l.stripRows
	}
	n := uint64(l.across) * uint64(down)
	if l.separate {
		n *= uint64(l.bands)
	}
	if l.offsets, err = f.whole(d, offsets, n); err != nil {
		return err
	}
	if uint64(len(l.offsets)) < n {
		return f.refuse(adviceDamaged, "should have %d %ss, and says only where %d of them are", n, word, len(l.offsets))
	}
	if l.counts, err = f.whole(d, counts, n); err != nil {
		return err
	}
	if l.counts == nil && l.compression == compressNone {
		l.counts = l.plainCounts(down, rows)
	}
	if uint64(len(l.counts)) < n {
		return f.refuse(adviceDamaged, "should have %d %ss, and gives only the size of %d of them", n, word, len(l.counts))
	}
	for i, at := range l.offsets {
		if size := uint64(f.size); at > size || l.counts[i] > size-at {
			return f.refuse(adviceDamaged, "%s %d would lie at bytes %d to %d, but the file has %d", word, i+1, at, at+l.counts[i], size)
		}
	}
	return nil
}

// plainCounts are the sizes of tiles or strips that are not compressed, for files that do not give them.
func (l *layout) plainCounts(down, rows int) []uint64 {
	counts := make([]uint64, len(l.offsets))
	for i := range counts {
		n := rows
		if !l.tiled {
			n = min(rows, l.height-i/l.across%down*rows)
		}
		counts[i] = uint64(n) * uint64(l.rowBytes())
	}
	return counts
}

// rowsOf is the number of rows that block row j holds: tiles are padded, strips end with the raster.
func (l *layout) rowsOf(j int) int {
	if l.tiled {
		return l.blockH
	}
	return min(l.blockH, l.height-j*l.blockH)
}

// where returns the bytes of the file that hold a block; n is 0 if the file does not have it.
func (l *layout) where(plane, j, i int) (offset, n uint64) {
	if l.stripRows == 0 {
		k := (plane*l.down+j)*l.across + i
		return l.offsets[k], l.counts[k]
	}
	row := j * l.blockH
	strips := (l.height-1)/l.stripRows + 1
	k := plane*strips + row/l.stripRows
	skip := uint64(row%l.stripRows) * uint64(l.rowBytes())
	if l.counts[k] <= skip {
		return l.offsets[k] + l.counts[k], min(l.counts[k], 1) // a strip that is cut short, unless it is absent
	}
	return l.offsets[k] + skip, l.counts[k] - skip
}

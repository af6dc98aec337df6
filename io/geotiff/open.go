package geotiff

import "io"

// Open opens a raster of size bytes: a GeoTIFF, in TIFF or BigTIFF, or an ASCII grid raster. source is its name in
// messages. Of a GeoTIFF only the description is read, and r must stay open as long as the raster is in use; a text is
// read whole. An error is an *Error; it names a file that is damaged, or one that is sound but cannot be used: rotated,
// without a place on the earth, of complex numbers, or under a codec that alters values.
//
// Cells may be whole numbers of 8 to 64 bits with or without a sign, or numbers with decimals of 32 or 64 bits; in tiles
// or strips, bands apart or side by side, in either byte order; as they are or packed by LZW, Deflate, PackBits or
// Zstandard, with or without predictor. Of a file of several pictures the first at full resolution counts.
func Open(r io.ReaderAt, size int64, source string) (*Raster, error) {
	f := &file{r: r, size: size, name: source}
	head, err := f.read(0, uint64(max(0, min(size, headBytes))), "the header")
	if err != nil {
		return nil, err
	}
	switch {
	case isTIFF(head):
		return f.open()
	case isText(head):
		return OpenText(io.NewSectionReader(r, 0, size), source)
	case size == 0:
		return nil, f.refuse("check that it was written completely", "the file is empty")
	}
	return nil, f.refuse("give a GeoTIFF, or a text that starts with ncols and nrows", "the file is neither a GeoTIFF nor an ASCII grid raster")
}

// headBytes are enough to tell what a file is.
const headBytes = 64

// Recognise reports whether a file that starts with head is a raster by its first bytes, so that Open reads it or says what
// keeps it from doing so. The first 64 bytes are enough; fewer are taken for the start of the file as well.
func Recognise(head []byte) bool { return isTIFF(head) || isText(head) }

func (f *file) open() (*Raster, error) {
	d, overviews, err := f.pictures()
	if err != nil {
		return nil, err
	}
	l, err := f.layoutOf(d)
	if err != nil {
		return nil, err
	}
	keys, err := f.geoKeys(d)
	if err != nil {
		return nil, err
	}
	raster := &Raster{Width: l.width, Height: l.height, Overviews: overviews, BlockWidth: l.blockW, BlockHeight: l.blockH}
	if err := f.locate(d, keys, raster); err != nil {
		return nil, err
	}
	keys.name(raster)
	if raster.Bands, err = f.bandsOf(d, l); err != nil {
		return nil, err
	}
	raster.cells = &tiff{file: f, layout: l, empty: emptyValue(raster.Bands[0]), cache: newCache(cacheBytes)}
	return raster, nil
}

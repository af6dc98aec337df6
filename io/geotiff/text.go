package geotiff

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
)

const (
	mostTextCells = 1 << 25 // 256 MiB in memory
	longestWord   = 64      // bytes; a number takes some twenty
	adviceHeader  = "start the text with ncols, nrows, xllcorner, yllcorner and cellsize, each followed by a number"
)

// OpenText reads an ASCII grid raster: a header of words with a number each, in any case and order, and then the cells in
// rows from the north, apart by blanks and line ends of any kind. The words are ncols and nrows, xllcorner or xllcenter,
// yllcorner or yllcenter, cellsize or dx and dy, and NODATA_value, which may be absent (common practice, no source). The
// raster is held in memory and may have up to 33 554 432 cells; it says nothing of its coordinate system. source is its
// name in messages. An error is an *Error with the line.
func OpenText(r io.Reader, source string) (*Raster, error) {
	t := &textReader{r: bufio.NewReaderSize(r, 1<<16), name: source, line: 1}
	h, first, err := t.header()
	if err != nil {
		return nil, err
	}
	raster, err := t.raster(h)
	if err != nil {
		return nil, err
	}
	cells, err := t.cells(first, raster.Width, raster.Height)
	if err != nil {
		return nil, err
	}
	raster.BlockWidth, raster.BlockHeight = raster.Width, raster.Height
	raster.cells = &memory{width: raster.Width, cells: cells}
	return raster, nil
}

// isText reports whether head starts with a word of a header.
func isText(head []byte) bool {
	fields := strings.Fields(strings.TrimPrefix(string(head), byteOrderMark))
	return len(fields) > 0 && isHeaderWord(strings.ToLower(fields[0]))
}

const byteOrderMark = "\uFEFF"

func isHeaderWord(word string) bool {
	switch word {
	case "ncols", "nrows", "xllcorner", "xllcenter", "yllcorner", "yllcenter", "cellsize", "dx", "dy", "nodata_value":
		return true
	}
	return false
}

// textReader takes words off a text and knows the line.
type textReader struct {
	r    *bufio.Reader
	name string
	line int
}

func (t *textReader) refuse(advice, format string, args ...any) error {
	return &Error{File: t.name, Line: t.line, What: fmt.Sprintf(format, args...), Advice: advice}
}

// word returns the next word, "" at the end of the text. The line is that of the word until the next call.
func (t *textReader) word() (string, error) {
	var word []byte
	for {
		c, err := t.r.ReadByte()
		switch {
		case errors.Is(err, io.EOF):
			return string(word), nil
		case err != nil:
			return "", &Error{File: t.name, Line: t.line, What: "cannot be read", Cause: err}
		case c > ' ':
			if word = append(word, c); len(word) > longestWord {
				return "", t.refuse(adviceDamaged, "%q... is too long for a number", word)
			}
		case len(word) > 0:
			return string(word), t.r.UnreadByte()
		case c == '\n':
			t.line++
		}
	}
}

// header reads words and their numbers up to the first cell, which it returns as well.
func (t *textReader) header() (map[string]float64, string, error) {
	h := map[string]float64{}
	for {
		word, err := t.word()
		if err != nil {
			return nil, "", err
		}
		if len(h) == 0 {
			word = strings.TrimPrefix(word, byteOrderMark)
		}
		key := strings.ToLower(word)
		if !isHeaderWord(key) {
			return h, word, nil
		}
		if _, twice := h[key]; twice {
			return nil, "", t.refuse(adviceHeader, "%s is given twice", key)
		}
		value, err := t.word()
		if err != nil {
			return nil, "", err
		}
		if h[key], err = strconv.ParseFloat(value, 64); err != nil && !(key == "nodata_value" && errors.Is(err, strconv.ErrRange)) {
			return nil, "", t.refuse(adviceHeader, "%s is %q, which is not a number", key, value)
		}
	}
}

// raster makes a raster of a header.
func (t *textReader) raster(h map[string]float64) (*Raster, error) {
	raster := &Raster{Bands: []Band{{Name: "band1", Kind: Text, Scale: 1}}}
	for _, side := range []struct {
		key string
		n   *int
	}{{"ncols", &raster.Width}, {"nrows", &raster.Height}} {
		v, ok := h[side.key]
		if !ok {
			return nil, t.refuse(adviceHeader, "the header does not give %s", side.key)
		}
		if v != math.Trunc(v) || !(v >= 1 && v <= mostAcross) {
			return nil, t.refuse(adviceHeader, "%s is %v; it must be a whole number from 1", side.key, v)
		}
		*side.n = int(v)
	}
	if cells := raster.Width * raster.Height; cells > mostTextCells {
		return nil, t.refuse("write it as a GeoTIFF, which is read by parts", "a text raster of %d cells is too large; at most %d are read", cells, mostTextCells)
	}
	var err error
	if raster.CellX, raster.CellY, err = t.sides(h); err != nil {
		return nil, err
	}
	west, westIsCentre, err := t.edge(h, "xll")
	if err != nil {
		return nil, err
	}
	south, southIsCentre, err := t.edge(h, "yll")
	if err != nil {
		return nil, err
	}
	if westIsCentre {
		west -= raster.CellX / 2
	}
	if southIsCentre {
		south -= raster.CellY / 2
	}
	raster.PixelIsPoint = westIsCentre && southIsCentre
	raster.X0, raster.Y0 = west, south+float64(raster.Height)*raster.CellY
	raster.Bands[0].NoData, raster.Bands[0].HasNoData = h["nodata_value"], has(h, "nodata_value")
	return raster, raster.checkPlace(t.name)
}

func has(h map[string]float64, key string) bool {
	_, ok := h[key]
	return ok
}

// sides are those of a cell.
func (t *textReader) sides(h map[string]float64) (x, y float64, err error) {
	switch {
	case has(h, "cellsize") && (has(h, "dx") || has(h, "dy")):
		return 0, 0, t.refuse(adviceHeader, "the header gives cellsize and also dx or dy")
	case has(h, "cellsize"):
		return h["cellsize"], h["cellsize"], nil
	case has(h, "dx") && has(h, "dy"):
		return h["dx"], h["dy"], nil
	}
	return 0, 0, t.refuse(adviceHeader, "the header gives neither cellsize nor both dx and dy")
}

// edge is the western or southern edge, or the centre of the cells along it.
func (t *textReader) edge(h map[string]float64, axis string) (v float64, isCentre bool, err error) {
	corner, centre := axis+"corner", axis+"center"
	switch {
	case has(h, corner) && has(h, centre):
		return 0, false, t.refuse(adviceHeader, "the header gives both %s and %s", corner, centre)
	case has(h, corner):
		return h[corner], false, nil
	case has(h, centre):
		return h[centre], true, nil
	}
	return 0, false, t.refuse(adviceHeader, "the header gives neither %s nor %s", corner, centre)
}

// cells reads the numbers of width times height cells, of which the first has been taken off the text already. Memory
// grows with what is there.
func (t *textReader) cells(word string, width, height int) ([]float64, error) {
	n := width * height
	cells := make([]float64, 0, min(n, 1<<16))
	for len(cells) < n {
		row, column := len(cells)/width+1, len(cells)%width+1
		if word == "" {
			return nil, t.refuse(adviceDamaged, "ends after %d of %d cells, before row %d, column %d", len(cells), n, row, column)
		}
		v, err := strconv.ParseFloat(word, 64)
		if err != nil && !errors.Is(err, strconv.ErrRange) {
			advice := "correct the cell; cells without data hold the number that NODATA_value gives"
			if strings.Contains(word, ",") {
				advice = "write numbers with a decimal point"
			}
			return nil, t.refuse(advice, "row %d, column %d: %q is not a number", row, column, word)
		}
		cells = append(cells, v)
		if word, err = t.word(); err != nil {
			return nil, err
		}
	}
	if word != "" {
		return nil, t.refuse("correct ncols and nrows, or the rows", "goes on with %q after the last of %d columns and %d rows", word, width, height)
	}
	return cells, nil
}

// memory is the cells of a raster held in memory.
type memory struct {
	width int
	cells []float64
}

func (m *memory) fill(dst []float64, _, x0, y0, nx, ny int) error {
	for y := range ny {
		copy(dst[y*nx:(y+1)*nx], m.cells[(y0+y)*m.width+x0:])
	}
	return nil
}

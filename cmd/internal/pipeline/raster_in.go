package pipeline

import (
	"bytes"
	"context"
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strconv"

	"drumlin/grids/crs"
	"drumlin/io/geotiff"
	"drumlin/io/observe"
)

// mostRasterRows is about how many cells of a raster become rows: what the dense engine fits in seconds.
const mostRasterRows = 10_000

// thinning says which cells of a raster are rows: every step-th in both directions.
type thinning struct{ step, cells int }

// rasterSource is a raster whose cells are observations. Its checksum is told to sum, and what was left out to thin.
func rasterSource(path string, sum *string, thin *thinning) source {
	return source{
		name:    filepath.Base(path),
		columns: func(ctx context.Context) ([]string, error) { return columnsOf(ctx, path, observe.Format{}) },
		read: func(ctx context.Context, want observe.Request) (t *observe.Table, err error) {
			if t, *thin, err = readRaster(ctx, path, want); err != nil {
				return nil, err
			}
			*sum, err = FileSHA256(ctx, path)
			return t, err
		},
	}
}

// isRaster reports whether a file is a raster, by how it begins. What comes through a pipe is none: it can be read once, and
// a raster is read here and there.
func isRaster(path string) (bool, error) {
	if info, err := os.Stat(path); err == nil && !info.Mode().IsRegular() {
		return false, nil
	}
	f, err := openFile(path)
	if err != nil {
		return false, err
	}
	defer f.Close()
	head := make([]byte, 64)
	n, err := io.ReadFull(f, head)
	if err != nil && err != io.EOF && err != io.ErrUnexpectedEOF {
		return false, err
	}
	return geotiff.Recognise(head[:n]), nil
}

// openRaster opens a raster; closing what it returns closes the file.
func openRaster(path string) (*geotiff.Raster, *os.File, error) {
	f, err := openFile(path)
	if err != nil {
		return nil, nil, err
	}
	info, err := f.Stat()
	if err == nil {
		var r *geotiff.Raster
		if r, err = geotiff.Open(f, info.Size(), filepath.Base(path)); err == nil {
			return r, f, nil
		}
	}
	f.Close()
	return nil, nil, err
}

// cellX and cellY are the columns of the cells' centres: names that no band is likely to have.
const cellX, cellY = "centre x", "centre y"

// rasterColumns are the names of a raster's columns: the coordinates of the cells' centres, and the bands.
func rasterColumns(r *geotiff.Raster) []string {
	names := []string{cellX, cellY}
	for _, b := range r.Bands {
		names = append(names, b.Name)
	}
	return names
}

// readRaster reads the cells of a raster that have a value of the response as the rows of a table, thinned where they are
// too many. It goes the way of every table, so that the same is asked of cells as of rows.
func readRaster(ctx context.Context, path string, want observe.Request) (*observe.Table, thinning, error) {
	r, file, err := openRaster(path)
	if err != nil {
		return nil, thinning{}, err
	}
	defer file.Close()
	name := filepath.Base(path)
	if want.X != "" || want.Geometry != "" {
		return nil, thinning{}, refuse("leave out --x, --y and --geometry", "%s: the cells of a raster have places of their own", name)
	}
	band, there := r.Band(want.Response)
	if !there {
		return nil, thinning{}, absentColumn(name, want.Response, "the response", rasterColumns(r)[2:])
	}
	text, thin, err := cellsAsText(ctx, r, band)
	if err != nil {
		return nil, thinning{}, err
	}
	want.X, want.Y, want.Format = cellX, cellY, observe.Format{}
	if want.Axes == observe.AxesByName {
		want.Axes = observe.AxesPlane
		if r.Geographic || crs.IsGeographic(r.CRS()) {
			want.Axes = observe.AxesDegrees
		}
	}
	t, err := observe.Read(bytes.NewReader(text), name, want)
	if err == nil {
		t.CRS, t.Features = r.CRS(), true // what the file says gives way to --crs
	}
	return t, thin, err
}

// cellsAsText writes the cells with a value in a band as a table of text, every one or every step-th in both directions.
func cellsAsText(ctx context.Context, r *geotiff.Raster, band int) ([]byte, thinning, error) {
	cells, err := countCells(ctx, r, band)
	if err != nil {
		return nil, thinning{}, err
	}
	step := max(1, int(math.Ceil(math.Sqrt(float64(cells)/mostRasterRows))))
	var b bytes.Buffer
	out := csv.NewWriter(&b)
	out.Write(rasterColumns(r)) // into memory: it cannot fail
	record := make([]string, 2+len(r.Bands))
	rows := make([][]float64, len(r.Bands))
	for k := range rows {
		rows[k] = make([]float64, r.Width)
	}
	for y := step / 2; y < r.Height; y += step {
		if err := ctx.Err(); err != nil {
			return nil, thinning{}, err
		}
		for k := range rows {
			if err := r.Window(rows[k], k, 0, y, r.Width, 1); err != nil {
				return nil, thinning{}, err
			}
		}
		for x := step / 2; x < r.Width; x += step {
			if math.IsNaN(rows[band][x]) {
				continue
			}
			cx, cy := r.Centre(x, y)
			record[0], record[1] = written(cx), written(cy)
			for k := range rows {
				record[2+k] = written(rows[k][x])
			}
			out.Write(record)
		}
	}
	out.Flush()
	return b.Bytes(), thinning{step: step, cells: cells}, nil
}

// written is a number to all its digits, or nothing for one that is not there.
func written(v float64) string {
	if math.IsNaN(v) {
		return ""
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}

// countCells counts the cells that have a value.
func countCells(ctx context.Context, r *geotiff.Raster, band int) (n int, err error) {
	high := max(1, min(r.BlockHeight, 1<<22/max(1, r.Width)))
	window := make([]float64, r.Width*high)
	for y := 0; y < r.Height; y += high {
		if err := ctx.Err(); err != nil {
			return 0, err
		}
		part := window[:r.Width*min(high, r.Height-y)]
		if err := r.Window(part, band, 0, y, r.Width, min(high, r.Height-y)); err != nil {
			return 0, err
		}
		for _, v := range part {
			if !math.IsNaN(v) {
				n++
			}
		}
	}
	return n, nil
}

// words say which cells of a raster are rows.
func (t thinning) words() string {
	if t.step <= 1 {
		return ""
	}
	return fmt.Sprintf("Of the raster's %d cells with a value one in %d in both directions is used: what is finer than that is not in the map.", t.cells, t.step)
}

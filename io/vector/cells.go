package vector

import (
	"errors"
	"fmt"
	"io"

	"drumlin/grids"

	"github.com/paulmach/orb"
)

// WriteCells writes a polygon for each cell of l listed in index, with row k of each column as the properties of cell
// index[k]. Corners are turned into longitude and latitude where the plane of l is tied to the globe; a local plane is
// written in metres. It returns an error of w, or one for a corner that lies beyond the projection. It panics if a
// column is not as long as index or if index names a cell that is not there.
func WriteCells(w io.Writer, l grids.Lattice, index []int, columns []Column) error {
	out := NewCellWriter(w)
	if err := out.Append(l, index, columns); err != nil {
		return err
	}
	return out.Close()
}

// CellWriter writes the cells of several lattices into one FeatureCollection, one lattice after the other, so that they
// need not be in memory together.
type CellWriter struct {
	to  io.Writer
	out *writer // nil before the first lattice
}

// NewCellWriter returns a CellWriter that has written nothing yet.
func NewCellWriter(w io.Writer) *CellWriter { return &CellWriter{to: w} }

var errTwoGlobes = errors.New("cells in longitude and latitude and cells in a local plane do not go into one file")

// Append writes the cells of l listed in index, as WriteCells does. Beside the errors and panics of WriteCells it is an
// error if cells of a local plane and of one tied to the globe come together.
func (c *CellWriter) Append(l grids.Lattice, index []int, columns []Column) (err error) {
	switch {
	case c.out == nil:
		c.out, err = newWriter(c.to, l.CRS, len(index), columns)
	case c.out.globe != l.CRS.Geographic():
		err = errTwoGlobes
	default:
		err = c.out.describe(l.CRS, len(index), columns)
	}
	if err != nil {
		return err
	}
	return c.out.cells(l, index)
}

// Close ends the collection; it does not close the writer underneath. It is an error if there was no lattice at all.
func (c *CellWriter) Close() error {
	if c.out == nil {
		return errors.New("no lattice of cells to write")
	}
	return c.out.close()
}

// cells writes the cells listed in index, in its order.
func (out *writer) cells(l grids.Lattice, index []int) error {
	ring := make(orb.Ring, 5)
	for row, k := range index {
		if k < 0 || k >= l.Cells() {
			panic(fmt.Sprintf("vector: cell %d of a lattice of %d", k, l.Cells()))
		}
		// Neighbours compute their common corners from the same numbers, so that no gap opens between them.
		i, j := float64(k%l.NX), float64(k/l.NX)
		west, east := l.X0+i*l.Cell, l.X0+(i+1)*l.Cell
		south, north := l.Y0+j*l.Cell, l.Y0+(j+1)*l.Cell
		ring[0], ring[1] = orb.Point{west, south}, orb.Point{east, south}
		ring[2], ring[3] = orb.Point{east, north}, orb.Point{west, north}
		ring[4] = ring[0]
		if err := out.polygons(row, "", orb.MultiPolygon{{ring}}); err != nil {
			return err
		}
	}
	return nil
}

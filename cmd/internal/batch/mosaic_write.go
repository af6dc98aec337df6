package batch

import (
	"errors"
	"fmt"
	"io"
	"math"

	"drumlin/io/draft"
	"drumlin/io/tables"
	"drumlin/io/vector"
)

// mosaicFeatures is the number of cells up to which mosaic.geojson is written.
const mosaicFeatures = 1_000_000

// errNoMosaic is the error of writing from a mosaic that says why it is none.
var errNoMosaic = errors.New("there is no mosaic of these regions")

// WriteCSV writes mosaic.csv: the cells that the mosaic shows, region by region in the order of the tiles, each in the
// order of its lattice. x and y are filled where all regions share one plane, lon and lat where that is tied to the globe,
// chance where the region has a threshold. Area is the true one of the cell, in square metres. Errors are those of w and
// of opening the drafts.
func (m *Mosaic) WriteCSV(w io.Writer) error {
	if m.Why != "" {
		return errNoMosaic
	}
	var names []string
	for _, c := range m.columns(draft.Draft{}, 0, nil) {
		names = append(names, c.Name)
	}
	out := tables.NewWriter(w, names)
	for i := range m.tiles {
		d, err := m.reopen(i)
		if err != nil {
			return err
		}
		rows := m.tiles[i].shown()
		if err := out.Append(len(rows), m.columns(d, i, rows)); err != nil {
			return err
		}
	}
	return out.Flush()
}

// shown lists the rows of a tile that the mosaic shows.
func (t *mosaicTile) shown() []int {
	rows := make([]int, 0, t.cells-t.lost.len())
	for row := range t.cells {
		if !t.lost.has(row) {
			rows = append(rows, row)
		}
	}
	return rows
}

// columns returns mosaic.csv for the given rows of a draft.
func (m *Mosaic) columns(d draft.Draft, i int, rows []int) []tables.Column {
	n := len(rows)
	region, area := make([]string, n), make([]float64, n)
	x, y, lon, lat := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for k, row := range rows {
		cell := int(d.Cells[row])
		region[k], area[k] = m.tiles[i].Region, d.Lattice.CellAreaAt(cell)
		x[k], y[k] = d.Lattice.Centre(cell)
		lon[k], lat[k] = d.Lattice.CRS.Inverse(x[k], y[k])
		if m.common == nil {
			x[k], y[k] = math.NaN(), math.NaN()
		}
	}
	of := func(name string, v []float64) tables.Column {
		c := tables.Column{Name: name}
		if v != nil {
			c.Number = make([]float64, n)
			for k, row := range rows {
				c.Number[k] = v[row]
			}
		}
		return c
	}
	return []tables.Column{
		{Name: "region", Text: region},
		{Name: "x", Number: x, Exact: true}, {Name: "y", Number: y, Exact: true},
		{Name: "lon", Number: lon, Exact: true}, {Name: "lat", Number: lat, Exact: true},
		{Name: "area", Number: area},
		of("estimate", d.Estimate), of("standard_error", d.StandardError), of("lower", d.Lower), of("upper", d.Upper), of("cv", d.CV),
		of("chance", d.Chance), of("nearest_m", d.Nearest),
	}
}

// FitsGeoJSON reports whether mosaic.geojson is written: up to a million cells.
func (m *Mosaic) FitsGeoJSON() bool { return m.Cells() <= mosaicFeatures }

// WriteGeoJSON writes mosaic.geojson: the cells of WriteCSV as polygons with the columns of WriteCSV as properties, but
// for those that would be empty in all of them. Coordinates are as vector.WriteCells has them. It is an error, and nothing is
// written, if the cells are too many (see FitsGeoJSON).
func (m *Mosaic) WriteGeoJSON(w io.Writer) error {
	switch {
	case m.Why != "":
		return errNoMosaic
	case !m.FitsGeoJSON():
		return fmt.Errorf("the mosaic has %d cells, and at most %d are written as GeoJSON", m.Cells(), mosaicFeatures)
	}
	out := vector.NewCellWriter(w)
	for i := range m.tiles {
		d, err := m.reopen(i)
		if err != nil {
			return err
		}
		rows := m.tiles[i].shown()
		cells := make([]int, len(rows))
		for k, row := range rows {
			cells[k] = int(d.Cells[row])
		}
		if err := out.Append(d.Lattice, cells, m.properties(m.columns(d, i, rows))); err != nil {
			return fmt.Errorf("region %q: %w", m.tiles[i].Region, err)
		}
	}
	return out.Close()
}

// properties keeps the columns that some region fills, so that all features have the same ones.
func (m *Mosaic) properties(columns []tables.Column) []vector.Column {
	var list []vector.Column
	for _, c := range columns {
		switch c.Name {
		case "x", "y":
			if m.common == nil {
				continue
			}
		case "lon", "lat":
			if m.common != nil && !m.common.Geographic() {
				continue
			}
		case "chance":
			if !m.chances {
				continue
			}
			if c.Number == nil {
				c.Number = empty(len(columns[0].Text))
			}
		}
		list = append(list, vector.Column{Name: c.Name, Value: c.Number, Text: c.Text})
	}
	return list
}

// empty returns n numbers that are not there.
func empty(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = math.NaN()
	}
	return v
}

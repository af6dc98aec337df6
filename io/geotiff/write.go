package geotiff

import (
	"bufio"
	"context"
	"fmt"
	"io"
)

// Write writes a raster of float32 cells as a GeoTIFF in the order of a Cloud Optimized GeoTIFF: tiles of 256 by 256
// under Deflate, one band after the other, with overviews of half the size each, down to one tile, whose cells are means
// of the cells with data. It becomes a BigTIFF when it takes more than 4 GiB.
//
// rows fills dst with row y of a band, NaN for cells without data; row 0 is the northernmost. It is called in order, band
// after band and row after row from the north, never twice at once; an error of it ends the writing and is returned as it
// is. Memory is taken for the packed tiles and for two rows of tiles of cells, never for the whole raster. The same cells
// make the same bytes for any number of workers, which is one a processor where it is not positive.
func Write(ctx context.Context, w io.Writer, g Grid, rows func(band, y int, dst []float32) error, workers int) error {
	if err := g.Validate(); err != nil {
		return err
	}
	p := newPyramid(g.Width, g.Height, len(g.Bands), workers)
	for band := range g.Bands {
		for y := range g.Height {
			if err := rows(band, y, p.next(0)); err != nil {
				return err
			}
			if err := p.add(ctx, 0, band); err != nil {
				return err
			}
		}
	}
	return assemble(ctx, w, g, p.levels, false)
}

// assemble writes what has been packed: the header, the directories of the raster and of its overviews from fine to
// coarse, then the tiles from the coarsest overview to the raster. big asks for a BigTIFF, whatever the size.
func assemble(ctx context.Context, w io.Writer, g Grid, levels []*level, big bool) error {
	form := format{big: big}
	total := form.plan(g, levels)
	if !big && total > 1<<32-1 {
		form.big = true
		form.plan(g, levels)
	}
	out := bufio.NewWriterSize(w, 1<<20)
	if _, err := out.Write(form.head(g, levels)); err != nil {
		return fmt.Errorf("cannot write the raster: %w", err)
	}
	for k := len(levels) - 1; k >= 0; k-- {
		for _, band := range levels[k].tiles {
			for _, tile := range band {
				if err := ctx.Err(); err != nil {
					return err
				}
				if _, err := out.Write(tile); err != nil {
					return fmt.Errorf("cannot write the raster: %w", err)
				}
			}
		}
	}
	if err := out.Flush(); err != nil {
		return fmt.Errorf("cannot write the raster: %w", err)
	}
	return nil
}

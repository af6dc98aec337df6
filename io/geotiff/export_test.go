package geotiff

import (
	"bytes"
	"context"
)

// WriteBig writes a BigTIFF of any size.
func WriteBig(g Grid, rows func(band, y int, dst []float32) error) ([]byte, error) {
	p := newPyramid(g.Width, g.Height, len(g.Bands), 1)
	ctx := context.Background()
	for band := range g.Bands {
		for y := range g.Height {
			if err := rows(band, y, p.next(0)); err != nil {
				return nil, err
			}
			if err := p.add(ctx, 0, band); err != nil {
				return nil, err
			}
		}
	}
	var b bytes.Buffer
	err := assemble(ctx, &b, g, p.levels, true)
	return b.Bytes(), err
}

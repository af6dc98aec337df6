package spatial

import "drumlin/basis2d"

// design is the model matrix of the rows: the surface's columns, then the border's.
type design struct {
	x, y    []float64
	basis   *basis2d.ThinPlate // nil: a constant in its place
	border  [][]float64        // columns the fit sees, one value a row
	scratch []basis2d.Spread
}

func (d *design) Rows() int { return len(d.x) }

func (d *design) Cols() int { return surfaceColumns(d.basis) + len(d.border) }

func surfaceColumns(b *basis2d.ThinPlate) int {
	if b == nil {
		return 1
	}
	return b.Dim()
}

func (d *design) BlockTo(dst []float64, from, to, worker int) {
	p, k := d.Cols(), surfaceColumns(d.basis)
	surfaceRowsTo(dst, p, d.basis, d.x[from:to], d.y[from:to], &d.scratch[worker])
	for i := from; i < to; i++ {
		row := dst[(i-from)*p+k : (i-from+1)*p]
		for j, col := range d.border {
			row[j] = col[i]
		}
	}
}

func surfaceRowsTo(dst []float64, stride int, b *basis2d.ThinPlate, x, y []float64, s *basis2d.Spread) {
	if b != nil {
		b.RowsTo(dst, stride, x, y, s)
		return
	}
	for i := range x {
		dst[i*stride] = 1
	}
}

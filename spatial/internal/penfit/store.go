package penfit

import (
	"context"

	"drumlin/basis2d/blocks"

	"gonum.org/v1/gonum/blas/blas64"
)

// Design gives the rows of a model matrix, block by block.
type Design interface {
	Rows() int
	Cols() int
	// BlockTo writes rows [from, to), at most blocks.Size of them, to dst, row-major, Cols values a row. worker tells
	// which goroutine asks, so that scratch space can be kept for it.
	BlockTo(dst []float64, from, to, worker int)
}

// store gives the rows of a design, kept in memory or made afresh.
type store struct {
	design Design
	kept   []float64 // all rows, or nil
}

// keepRows is the number of matrix elements up to which rows are kept in memory rather than made afresh in every pass
// (128 MiB).
const keepRows = 16 << 20

func newStore(ctx context.Context, d Design, workers int) (store, error) {
	n, p := d.Rows(), d.Cols()
	if n*p > keepRows {
		return store{design: d}, nil
	}
	kept := make([]float64, n*p)
	err := blocks.Do(ctx, workers, blocks.Count(n), func(worker, b int) error {
		from, to := blocks.Range(b, n)
		d.BlockTo(kept[from*p:to*p], from, to, worker)
		return nil
	})
	return store{d, kept}, err
}

// rows returns rows [from, to) as a matrix, made in scratch unless they are kept.
func (s store) rows(scratch []float64, from, to, worker int) blas64.General {
	p := s.design.Cols()
	m := blas64.General{Rows: to - from, Cols: p, Stride: p}
	if s.kept != nil {
		m.Data = s.kept[from*p : to*p]
		return m
	}
	m.Data = scratch[:(to-from)*p]
	for b := 0; b < blocks.Count(m.Rows); b++ {
		i, j := blocks.Range(b, m.Rows)
		s.design.BlockTo(m.Data[i*p:j*p], from+i, from+j, worker)
	}
	return m
}

package spatial

import (
	"context"
	"math"

	"drumlin/basis2d/blocks"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// PredictTo writes the linear predictor and its standard error, both on the link scale, without offset, at each of the
// places to eta and se. z holds the covariates the model's effects name, one value a place. A level of a category that the
// data did not have gives NaN in both; such a level of a group has the average level and its variance; a group that z
// does not hold is taken at the average level, without error. It returns an error for a covariate that is missing, or when ctx is cancelled, and panics if
// eta, se, at and z differ in length. It is safe for concurrent use.
func (s *Surface) PredictTo(ctx context.Context, eta, se []float64, at Places, z []Covariate) error {
	n := at.Len()
	if len(eta) != n || len(se) != n {
		panic(lengths)
	}
	rows, err := s.rowMaker(at, z)
	if err != nil {
		return err
	}
	p := len(s.beta)
	workers := blocks.Workers(s.workers)
	scratch := make([]*rowScratch, workers)
	return blocks.Do(ctx, workers, blocks.Count(n), func(worker, b int) error {
		if scratch[worker] == nil {
			scratch[worker] = &rowScratch{rows: make([]float64, blocks.Size*p)}
		}
		from, to := blocks.Range(b, n)
		x := rows(scratch[worker], at.X[from:to], at.Y[from:to], func(k int) int { return from + k })
		blas64.Gemv(blas.NoTrans, 1, x, blas64.Vector{N: p, Inc: 1, Data: s.beta}, 0, blas64.Vector{N: to - from, Inc: 1, Data: eta[from:to]})
		var spread [blocks.Size]float64
		for i := 0; i < x.Rows && s.spread.Cols > 0; i++ {
			spread[i] = s.spreadOf(x.Data[i*p : (i+1)*p])
		}
		blas64.Trsm(blas.Right, blas.NoTrans, 1, s.triangle(), x)
		for i := range x.Rows {
			v := x.Data[i*p : (i+1)*p]
			se[from+i] = math.Sqrt(s.phi*(dot(v, v)+scratch[worker].unseen[i]) + spread[i])
		}
		return nil
	})
}

// rowScratch is one goroutine's space for rows of the model matrix.
type rowScratch struct {
	rows   []float64
	raw, t []float64
	unseen [blocks.Size]float64 // what each row's variance grows by for unseen groups, over phi
	core   coreScratch
}

// rows makes the model matrix's rows at places (x, y); of tells which row of the covariates belongs to the k-th of them.
type rows func(w *rowScratch, x, y []float64, of func(k int) int) blas64.General

// rowMaker returns the rows at new places with covariates z. It panics if slices differ in length.
func (s *Surface) rowMaker(at Places, z []Covariate) (rows, error) {
	at.check()
	checkLengths(z, at.Len())
	fill, err := s.border.filler(z)
	if err != nil {
		return nil, err
	}
	level, err := s.core.levels(z)
	if err != nil {
		return nil, err
	}
	p, k, q := len(s.beta), s.core.columns(), s.border.size()
	return func(w *rowScratch, x, y []float64, of func(k int) int) blas64.General {
		if w.t == nil {
			w.raw, w.t = make([]float64, q), make([]float64, s.border.null)
		}
		m := blas64.General{Rows: len(x), Cols: p, Stride: p, Data: w.rows[:len(x)*p]}
		s.core.rowsTo(m.Data, p, x, y, func(r int) int { return level(of(r)) }, &w.core)
		for i := 0; i < len(x) && p > k; i++ {
			row := m.Data[i*p : (i+1)*p]
			w.unseen[i] = fill(w.raw, row[k+q:], of(i))
			s.core.nullTo(w.t, row, s.border.keep)
			s.border.rowTo(row[k:k+q], w.t, w.raw)
		}
		return m
	}, nil
}

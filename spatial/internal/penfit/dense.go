package penfit

import (
	"context"

	"drumlin/basis2d/blocks"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// Dense is the engine for a model matrix without structure: the surface's columns and the border's in one matrix, up
// to about a thousand of them, and linear predictors that are linear in the coefficients.
type Dense struct {
	normal
	store
	n, workers int
	scratch    [][]float64 // a block of rows and one of weighted rows for each worker
}

// NewDense returns the engine for a design with the given penalties, which must not overlap.
func NewDense(ctx context.Context, d Design, ridges []Ridge, workers int) (*Dense, error) {
	e := &Dense{normal: newNormal(d.Cols(), ridges), n: d.Rows(), workers: blocks.Workers(workers)}
	e.scratch = make([][]float64, e.workers)
	for w := range e.scratch {
		e.scratch[w] = make([]float64, 2*blocks.Size*e.p)
	}
	var err error
	e.store, err = newStore(ctx, d, e.workers)
	return e, err
}

func (e *Dense) Rows() int    { return e.n }
func (e *Dense) Curved() bool { return false }

// block returns rows [from, to) as a matrix, and space for as many.
func (e *Dense) block(worker, from, to int) (x, space blas64.General) {
	x = e.rows(e.scratch[worker], from, to, worker)
	space = x
	space.Data = e.scratch[worker][blocks.Size*e.p:][:x.Rows*e.p]
	return x, space
}

// Pass visits every row once.
func (e *Dense) Pass(ctx context.Context, beta []float64, at RowFunc, gram Gram) error {
	p, sum := e.p, e.sums(gram)
	err := blocks.Sum(ctx, e.workers, e.n, sum, func(worker, from, to int, acc []float64) error {
		x, space := e.block(worker, from, to)
		var eta, weight, value [blocks.Size]float64
		m := to - from
		multiply(eta[:m], x, beta)
		for i := 0; i < m; i++ {
			weight[i], value[i] = at(from+i, eta[i], eta[i])
		}
		blas64.Gemv(blas.Trans, 1, x, vec(value[:m]), 1, vec(acc[:p]))
		if gram != NoGram {
			addGram(acc[p:], x, weight[:m], space.Data)
		}
		return nil
	})
	if err == nil {
		e.take(sum)
	}
	return err
}

// LinearTo writes X beta to dst.
func (e *Dense) LinearTo(ctx context.Context, dst, beta []float64) error {
	return e.each(ctx, func(x, _ blas64.General, from, to int) { multiply(dst[from:to], x, beta) })
}

// TangentTo writes X d to dst.
func (e *Dense) TangentTo(ctx context.Context, dst, d []float64) error {
	return e.LinearTo(ctx, dst, d)
}

// each calls f for every block of rows.
func (e *Dense) each(ctx context.Context, f func(x, space blas64.General, from, to int)) error {
	return blocks.Do(ctx, e.workers, blocks.Count(e.n), func(worker, b int) error {
		from, to := blocks.Range(b, e.n)
		x, space := e.block(worker, from, to)
		f(x, space, from, to)
		return nil
	})
}

// LeveragesTo writes x_i'H^-1 x_i to dst.
func (e *Dense) LeveragesTo(ctx context.Context, dst []float64) error {
	r := e.root()
	return e.each(ctx, func(x, space blas64.General, from, to int) {
		copy(space.Data, x.Data)
		squaresTo(dst[from:to], space, r)
	})
}

// GramTraces returns the sum over rows of dw_i x_i'H^-1 x_i.
func (e *Dense) GramTraces(ctx context.Context, moves []Motion) ([]float64, error) {
	h := make([]float64, e.n)
	if err := e.LeveragesTo(ctx, h); err != nil {
		return nil, err
	}
	out := make([]float64, len(moves))
	for j, m := range moves {
		out[j] = dot(m.Weight, h)
	}
	return out, nil
}

// EdfSlopes adds the sum over rows of dw_i x_i'M x_i.
func (e *Dense) EdfSlopes(ctx context.Context, lambda []float64, moves []Motion) ([]float64, error) {
	out, _, m := e.edfSlopes(lambda)
	if moves == nil {
		return out, nil
	}
	q := make([]float64, e.n)
	err := e.each(ctx, func(x, space blas64.General, from, to int) {
		blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, x, m, 0, space)
		for i := from; i < to; i++ {
			at := (i - from) * e.p
			q[i] = blas64.Dot(vec(x.Data[at:at+e.p]), vec(space.Data[at:at+e.p]))
		}
	})
	for j := range out {
		for i, d := range moves[j].Weight {
			out[j] += d * q[i]
		}
	}
	return out, err
}

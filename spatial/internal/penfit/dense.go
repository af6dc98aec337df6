package penfit

import (
	"context"
	"math"

	"drumlin/basis2d/blocks"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// Design gives the rows of a model matrix, block by block.
type Design interface {
	Rows() int
	Cols() int
	// BlockTo writes rows [from, to) to dst, row-major, Cols values a row. worker tells which goroutine asks, so that
	// scratch space can be kept for it.
	BlockTo(dst []float64, from, to, worker int)
}

// Span is a run of columns [First, First+Size) of the design.
type Span struct{ First, Size int }

// Ridge is a penalty with one lambda that is the identity on the columns of its spans. Bases whiten their own penalties,
// so that every penalty is of this kind.
type Ridge []Span

// size returns the number of columns the penalty touches.
func (r Ridge) size() (n int) {
	for _, s := range r {
		n += s.Size
	}
	return n
}

// columns calls f for every column the penalty touches.
func (r Ridge) columns(f func(k int)) {
	for _, s := range r {
		for k := s.First; k < s.First+s.Size; k++ {
			f(k)
		}
	}
}

// Dense is the engine for a model matrix without structure: the surface's columns and the border's in one matrix, up
// to about a thousand of them. The last columns' Cholesky pivots are those of the border's Schur complement.
type Dense struct {
	design  Design
	ridges  []Ridge
	workers int

	n, p    int
	rows    []float64   // n x p if small enough to keep, else nil
	scratch [][]float64 // a block of rows and one of weighted rows for each worker

	gram  []float64 // X'WX, upper triangle, p x p
	score []float64
	chol  blas64.Triangular // of H scaled to a unit diagonal
	unit  []float64         // 1/sqrt of H's diagonal
	inv   []float64         // H^-1 in full, or nil if not yet asked for
}

// keepRows is the number of matrix elements up to which rows are kept in memory rather than made afresh in every pass
// (128 MiB).
const keepRows = 16 << 20

// NewDense returns the engine for a design with the given penalties, which must not overlap.
func NewDense(ctx context.Context, d Design, ridges []Ridge, workers int) (*Dense, error) {
	e := &Dense{design: d, ridges: ridges, workers: blocks.Workers(workers), n: d.Rows(), p: d.Cols()}
	e.scratch = make([][]float64, e.workers)
	for w := range e.scratch {
		e.scratch[w] = make([]float64, 2*blocks.Size*e.p)
	}
	e.gram, e.score, e.unit = make([]float64, e.p*e.p), make([]float64, e.p), make([]float64, e.p)
	e.chol = blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: e.p, Stride: e.p, Data: make([]float64, e.p*e.p)}
	if e.n*e.p > keepRows {
		return e, nil
	}
	kept := make([]float64, e.n*e.p)
	err := blocks.Do(ctx, e.workers, blocks.Count(e.n), func(worker, b int) error {
		from, to := blocks.Range(b, e.n)
		d.BlockTo(kept[from*e.p:to*e.p], from, to, worker)
		return nil
	})
	if err != nil {
		return nil, err
	}
	e.rows = kept
	return e, nil
}

func (e *Dense) Rows() int        { return e.n }
func (e *Dense) Coefs() int       { return e.p }
func (e *Dense) Penalties() int   { return len(e.ridges) }
func (e *Dense) Score() []float64 { return e.score }

// NullDim returns the number of columns no penalty touches.
func (e *Dense) NullDim() int {
	m := e.p
	for _, r := range e.ridges {
		m -= r.size()
	}
	return m
}

// block returns rows [from, to) as a matrix, kept or made afresh.
func (e *Dense) block(worker, from, to int) blas64.General {
	m := blas64.General{Rows: to - from, Cols: e.p, Stride: e.p}
	if e.rows != nil {
		m.Data = e.rows[from*e.p : to*e.p]
		return m
	}
	m.Data = e.scratch[worker][:(to-from)*e.p]
	e.design.BlockTo(m.Data, from, to, worker)
	return m
}

// Pass visits every row once.
func (e *Dense) Pass(ctx context.Context, beta []float64, at RowFunc, gram bool) error {
	p := e.p
	sum := make([]float64, p+p*p)
	if !gram {
		sum = sum[:p]
	}
	err := blocks.Sum(ctx, e.workers, e.n, sum, func(worker, from, to int, acc []float64) error {
		x := e.block(worker, from, to)
		var eta, weight, value [blocks.Size]float64
		m := to - from
		multiply(eta[:m], x, beta)
		for i := 0; i < m; i++ {
			weight[i], value[i] = at(from+i, eta[i])
		}
		blas64.Gemv(blas.Trans, 1, x, vec(value[:m]), 1, vec(acc[:p]))
		if gram {
			e.addGram(acc[p:], x, weight[:m], e.scratch[worker][blocks.Size*p:])
		}
		return nil
	})
	if err != nil {
		return err
	}
	copy(e.score, sum)
	if gram {
		copy(e.gram, sum[p:])
	}
	return nil
}

// addGram adds X'WX to the upper triangle of acc. Observed weights may be negative: such rows are subtracted apart.
func (e *Dense) addGram(acc []float64, x blas64.General, weight, scratch []float64) {
	p := e.p
	gram := blas64.Symmetric{Uplo: blas.Upper, N: p, Stride: p, Data: acc}
	for _, sign := range []float64{1, -1} {
		m := 0
		for i, w := range weight {
			if w*sign <= 0 {
				continue
			}
			root := math.Sqrt(w * sign)
			dst := scratch[m*p : (m+1)*p]
			for j, v := range x.Data[i*p : (i+1)*p] {
				dst[j] = root * v
			}
			m++
		}
		if m > 0 {
			blas64.Syrk(blas.Trans, sign, blas64.General{Rows: m, Cols: p, Stride: p, Data: scratch[:m*p]}, 1, gram)
		}
	}
}

// Factor factors H, scaled to a unit diagonal first so that columns of any size lose no digits.
func (e *Dense) Factor(lambda []float64) bool {
	p, c := e.p, e.chol.Data
	e.inv = nil
	copy(c, e.gram)
	for j, r := range e.ridges {
		r.columns(func(k int) { c[k*p+k] += lambda[j] })
	}
	for k := 0; k < p; k++ {
		d := c[k*p+k]
		if !(d > 0) || math.IsInf(d, 0) {
			return false
		}
		e.unit[k] = 1 / math.Sqrt(d)
	}
	for i := 0; i < p; i++ {
		for j := i; j < p; j++ {
			c[i*p+j] *= e.unit[i] * e.unit[j]
		}
	}
	_, ok := lapack64.Potrf(blas64.Symmetric{Uplo: blas.Upper, N: p, Stride: p, Data: c})
	return ok
}

// LogDet returns log|H|.
func (e *Dense) LogDet() float64 {
	var l float64
	for k := 0; k < e.p; k++ {
		l += math.Log(e.chol.Data[k*e.p+k] / e.unit[k])
	}
	return 2 * l
}

// Solve overwrites b with H^-1 b.
func (e *Dense) Solve(b []float64) {
	e.scaleBy(b)
	blas64.Trsv(blas.Trans, e.chol, vec(b))
	blas64.Trsv(blas.NoTrans, e.chol, vec(b))
	e.scaleBy(b)
}

func (e *Dense) scaleBy(b []float64) {
	for k := range b {
		b[k] *= e.unit[k]
	}
}

// PenaltyTo writes S_j beta to dst.
func (e *Dense) PenaltyTo(dst []float64, j int, beta []float64) {
	clear(dst)
	e.ridges[j].columns(func(k int) { dst[k] = beta[k] })
}

// LogDetPenalty returns the sum over penalties of size times log lambda.
func (e *Dense) LogDetPenalty(lambda []float64) (value float64, slope []float64) {
	slope = make([]float64, len(e.ridges))
	for j, r := range e.ridges {
		slope[j] = float64(r.size())
		value += slope[j] * math.Log(lambda[j])
	}
	return value, slope
}

// inverse returns H^-1, p x p in full.
func (e *Dense) inverse() []float64 {
	if e.inv != nil {
		return e.inv
	}
	p := e.p
	e.inv = append([]float64(nil), e.chol.Data...)
	lapack64.Potri(blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: p, Stride: p, Data: e.inv})
	for i := 0; i < p; i++ {
		for j := i; j < p; j++ {
			v := e.inv[i*p+j] * e.unit[i] * e.unit[j]
			e.inv[i*p+j], e.inv[j*p+i] = v, v
		}
	}
	return e.inv
}

// Traces returns tr(H^-1 S_j).
func (e *Dense) Traces() []float64 {
	inv, t := e.inverse(), make([]float64, len(e.ridges))
	for j, r := range e.ridges {
		r.columns(func(k int) { t[j] += inv[k*e.p+k] })
	}
	return t
}

// LinearTo writes X beta to dst.
func (e *Dense) LinearTo(ctx context.Context, dst, beta []float64) error {
	return blocks.Do(ctx, e.workers, blocks.Count(e.n), func(worker, b int) error {
		from, to := blocks.Range(b, e.n)
		multiply(dst[from:to], e.block(worker, from, to), beta)
		return nil
	})
}

// LeveragesTo writes x_i'H^-1 x_i to dst: the squared length of R'^-1 x_i, with R'R = H.
func (e *Dense) LeveragesTo(ctx context.Context, dst []float64) error {
	p := e.p
	r := blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: p, Stride: p, Data: e.Factored()}
	return blocks.Do(ctx, e.workers, blocks.Count(e.n), func(worker, b int) error {
		from, to := blocks.Range(b, e.n)
		x := e.block(worker, from, to)
		v := blas64.General{Rows: x.Rows, Cols: p, Stride: p, Data: e.scratch[worker][blocks.Size*p:][:x.Rows*p]}
		copy(v.Data, x.Data)
		blas64.Trsm(blas.Right, blas.NoTrans, 1, r, v)
		for i := 0; i < x.Rows; i++ {
			row := vec(v.Data[i*p : (i+1)*p])
			dst[from+i] = blas64.Dot(row, row)
		}
		return nil
	})
}

// quadraticTo writes x_i'M x_i to dst for a symmetric M in full.
func (e *Dense) quadraticTo(ctx context.Context, dst, m []float64) error {
	p := e.p
	sym := blas64.General{Rows: p, Cols: p, Stride: p, Data: m}
	return blocks.Do(ctx, e.workers, blocks.Count(e.n), func(worker, b int) error {
		from, to := blocks.Range(b, e.n)
		x := e.block(worker, from, to)
		xm := blas64.General{Rows: x.Rows, Cols: p, Stride: p, Data: e.scratch[worker][blocks.Size*p:][:x.Rows*p]}
		blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, x, sym, 0, xm)
		for i := 0; i < x.Rows; i++ {
			dst[from+i] = blas64.Dot(vec(x.Data[i*p:(i+1)*p]), vec(xm.Data[i*p:(i+1)*p]))
		}
		return nil
	})
}

// EdfSlopes differentiates tr(H^-1 X'WX) = p - tr(H^-1 S_lambda): with M = H^-1 S_lambda H^-1,
//
//	d/d rho_j = lambda_j (tr(S_j M) - tr(H^-1 S_j)) + sum_i (dw_i/d rho_j) x_i'M x_i.
func (e *Dense) EdfSlopes(ctx context.Context, lambda []float64, slopes [][]float64) ([]float64, error) {
	p, inv := e.p, e.inverse()
	scaled := make([]float64, p*p) // S_lambda^(1/2) H^-1
	for j, r := range e.ridges {
		root := math.Sqrt(lambda[j])
		r.columns(func(k int) {
			for c := 0; c < p; c++ {
				scaled[k*p+c] = root * inv[k*p+c]
			}
		})
	}
	g := blas64.General{Rows: p, Cols: p, Stride: p, Data: scaled}
	m := make([]float64, p*p)
	blas64.Gemm(blas.Trans, blas.NoTrans, 1, g, g, 0, blas64.General{Rows: p, Cols: p, Stride: p, Data: m})
	out, traces := make([]float64, len(e.ridges)), e.Traces()
	for j, r := range e.ridges {
		r.columns(func(k int) { out[j] += lambda[j] * m[k*p+k] })
		out[j] -= lambda[j] * traces[j]
	}
	if slopes == nil {
		return out, nil
	}
	q := make([]float64, e.n)
	if err := e.quadraticTo(ctx, q, m); err != nil {
		return nil, err
	}
	for j := range out {
		for i, d := range slopes[j] {
			out[j] += d * q[i]
		}
	}
	return out, nil
}

// Range returns the search box of each log lambda, from the mean and the largest diagonal element of its part of the
// Gram matrix.
func (e *Dense) Range() (lo, hi []float64) {
	lo, hi = make([]float64, len(e.ridges)), make([]float64, len(e.ridges))
	for j, r := range e.ridges {
		var sum float64
		r.columns(func(k int) { sum += math.Abs(e.gram[k*e.p+k]) })
		level := math.Log(math.Max(sum, math.SmallestNonzeroFloat64))
		lo[j], hi[j] = level-35, level+16
	}
	return lo, hi
}

// Gram returns X'WX of the last pass that made one.
func (e *Dense) Gram() *mat.SymDense {
	return mat.NewSymDense(e.p, append([]float64(nil), e.gram...))
}

// Factored returns the upper triangular R with R'R = H, p x p row-major, which is what predictions need: the variance
// of x'b is phi times the squared length of R'^-1 x.
func (e *Dense) Factored() []float64 {
	p, r := e.p, make([]float64, e.p*e.p)
	for i := 0; i < p; i++ {
		for j := i; j < p; j++ {
			r[i*p+j] = e.chol.Data[i*p+j] / e.unit[j]
		}
	}
	return r
}

func multiply(dst []float64, x blas64.General, beta []float64) {
	blas64.Gemv(blas.NoTrans, 1, x, vec(beta), 0, vec(dst))
}

func vec(v []float64) blas64.Vector { return blas64.Vector{N: len(v), Inc: 1, Data: v} }

package penfit

import (
	"math"

	"drumlin/basis2d/blocks"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

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

// normal holds the normal equations H = G + S_lambda of an engine without structure: everything that is as large as the
// coefficients are many, and does not depend on the rows. The last columns' Cholesky pivots are those of the border's Schur
// complement.
type normal struct {
	ridges []Ridge
	p      int
	gram   []float64 // G, upper triangle, p x p
	score  []float64
	chol   blas64.Triangular // of H scaled to a unit diagonal
	unit   []float64         // 1/sqrt of H's diagonal
	inv    []float64         // H^-1 in full, or nil if not yet asked for
}

func newNormal(p int, ridges []Ridge) normal {
	return normal{
		ridges: ridges, p: p, gram: make([]float64, p*p), score: make([]float64, p), unit: make([]float64, p),
		chol: blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: p, Stride: p, Data: make([]float64, p*p)},
	}
}

func (e *normal) Coefs() int       { return e.p }
func (e *normal) Penalties() int   { return len(e.ridges) }
func (e *normal) Score() []float64 { return e.score }

// NullDim returns the number of columns no penalty touches.
func (e *normal) NullDim() int {
	m := e.p
	for _, r := range e.ridges {
		m -= r.size()
	}
	return m
}

// sums returns room for what a pass adds up: X'v, and G if that is made.
func (e *normal) sums(gram Gram) []float64 {
	if gram == NoGram {
		return make([]float64, e.p)
	}
	return make([]float64, e.p+e.p*e.p)
}

// take keeps the sums of a pass.
func (e *normal) take(sum []float64) {
	copy(e.score, sum)
	copy(e.gram, sum[e.p:])
}

// addGram adds X'WX to the upper triangle of acc, a block of rows at a time; scratch holds one. Observed weights may be
// negative: such rows are subtracted apart.
func addGram(acc []float64, x blas64.General, weight, scratch []float64) {
	p := x.Cols
	gram := blas64.Symmetric{Uplo: blas.Upper, N: p, Stride: p, Data: acc}
	for b := 0; b < blocks.Count(x.Rows); b++ {
		from, to := blocks.Range(b, x.Rows)
		for _, sign := range []float64{1, -1} {
			m := 0
			for i := from; i < to; i++ {
				w := weight[i] * sign
				if w <= 0 {
					continue
				}
				root := math.Sqrt(w)
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
}

// Factor factors H, scaled to a unit diagonal first so that columns of any size lose no digits.
func (e *normal) Factor(lambda []float64) bool {
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
func (e *normal) LogDet() float64 {
	var l float64
	for k := 0; k < e.p; k++ {
		l += math.Log(e.chol.Data[k*e.p+k] / e.unit[k])
	}
	return 2 * l
}

// Solve overwrites b with H^-1 b.
func (e *normal) Solve(b []float64) {
	e.scaleBy(b)
	blas64.Trsv(blas.Trans, e.chol, vec(b))
	blas64.Trsv(blas.NoTrans, e.chol, vec(b))
	e.scaleBy(b)
}

func (e *normal) scaleBy(b []float64) {
	for k := range b {
		b[k] *= e.unit[k]
	}
}

// PenaltyTo writes S_j beta to dst.
func (e *normal) PenaltyTo(dst []float64, j int, beta []float64) {
	clear(dst)
	e.ridges[j].columns(func(k int) { dst[k] = beta[k] })
}

// LogDetPenalty returns the sum over penalties of size times log lambda.
func (e *normal) LogDetPenalty(lambda []float64) (value float64, slope []float64) {
	slope = make([]float64, len(e.ridges))
	for j, r := range e.ridges {
		slope[j] = float64(r.size())
		value += slope[j] * math.Log(lambda[j])
	}
	return value, slope
}

// inverse returns H^-1, p x p in full.
func (e *normal) inverse() []float64 {
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
func (e *normal) Traces() []float64 {
	inv, t := e.inverse(), make([]float64, len(e.ridges))
	for j, r := range e.ridges {
		r.columns(func(k int) { t[j] += inv[k*e.p+k] })
	}
	return t
}

// edfSlopes differentiates tr(H^-1 G) = p - tr(H^-1 S_lambda) for a G that does not move: with M = H^-1 S_lambda H^-1,
//
//	d/d rho_j = lambda_j (tr(S_j M) - tr(H^-1 S_j)).
//
// To that comes tr(M dG) where G moves; M is returned in full, with half = S_lambda^(1/2) H^-1, of which it is half'half.
func (e *normal) edfSlopes(lambda []float64) (out []float64, half, m blas64.General) {
	p, inv := e.p, e.inverse()
	square := func() blas64.General {
		return blas64.General{Rows: p, Cols: p, Stride: p, Data: make([]float64, p*p)}
	}
	half, m = square(), square()
	for j, r := range e.ridges {
		root := math.Sqrt(lambda[j])
		r.columns(func(k int) {
			for c := 0; c < p; c++ {
				half.Data[k*p+c] = root * inv[k*p+c]
			}
		})
	}
	blas64.Gemm(blas.Trans, blas.NoTrans, 1, half, half, 0, m)
	out, traces := make([]float64, len(e.ridges)), e.Traces()
	for j, r := range e.ridges {
		r.columns(func(k int) { out[j] += lambda[j] * m.Data[k*p+k] })
		out[j] -= lambda[j] * traces[j]
	}
	return out, half, m
}

// squaresTo writes |R'^-1 x_i|^2 = x_i'H^-1 x_i for the rows of x to dst; it overwrites x.
func squaresTo(dst []float64, x blas64.General, r blas64.Triangular) {
	blas64.Trsm(blas.Right, blas.NoTrans, 1, r, x)
	for i := range dst {
		row := vec(x.Data[i*x.Cols : (i+1)*x.Cols])
		dst[i] = blas64.Dot(row, row)
	}
}

// Range returns the search box of each log lambda, from the mean and the largest diagonal element of its part of the
// Gram matrix.
func (e *normal) Range() (lo, hi []float64) {
	lo, hi = make([]float64, len(e.ridges)), make([]float64, len(e.ridges))
	for j, r := range e.ridges {
		var sum float64
		r.columns(func(k int) { sum += math.Abs(e.gram[k*e.p+k]) })
		level := math.Log(math.Max(sum, math.SmallestNonzeroFloat64))
		lo[j], hi[j] = level-35, level+16
	}
	return lo, hi
}

// Gram returns G of the last pass that made one.
func (e *normal) Gram() *mat.SymDense {
	return mat.NewSymDense(e.p, append([]float64(nil), e.gram...))
}

// Factored returns the upper triangular R with R'R = H, p x p row-major, which is what predictions need: the variance
// of x'b is phi times the squared length of R'^-1 x.
func (e *normal) Factored() []float64 {
	p, r := e.p, make([]float64, e.p*e.p)
	for i := 0; i < p; i++ {
		for j := i; j < p; j++ {
			r[i*p+j] = e.chol.Data[i*p+j] / e.unit[j]
		}
	}
	return r
}

// root returns R with R'R = H.
func (e *normal) root() blas64.Triangular {
	return blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: e.p, Stride: e.p, Data: e.Factored()}
}

func multiply(dst []float64, x blas64.General, beta []float64) {
	blas64.Gemv(blas.NoTrans, 1, x, vec(beta), 0, vec(dst))
}

func vec(v []float64) blas64.Vector { return blas64.Vector{N: len(v), Inc: 1, Data: v} }

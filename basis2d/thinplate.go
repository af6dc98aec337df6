package basis2d

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// Null is the dimension of the thin-plate null space: surfaces 1, x and y do not bend.
const Null = 3

// ThinPlate is the thin-plate basis of order 2 on given knots. Its K columns are 1, x* and y* in centred and scaled
// coordinates, then K-3 columns in which the penalty is the identity: a surface with coefficients (a, u) has
//
//	J(f) = u'u / Scale^2
//
// for J in the units of the places. The columns come from the radial functions by an orthogonal transform that absorbs
// the constraint and a triangular one that whitens the penalty, so that crossproducts keep their digits even where
// knots lie close together. A ThinPlate is immutable and safe for concurrent use.
type ThinPlate struct {
	CentreX, CentreY float64   // mean of the knots
	Scale            float64   // root mean square distance of the knots from the centre; the unit of x* and y*
	KnotX, KnotY     []float64 // in the units of the places
	Whiten           []float64 // K x (K-3), row-major: radial functions at the scaled knots to penalised columns

	sx, sy []float64 // scaled knots
}

// NewThinPlate returns the basis on the given knots, which must be distinct, at least three, and not on one line.
func NewThinPlate(knotX, knotY []float64) (*ThinPlate, error) {
	t := &ThinPlate{KnotX: knotX, KnotY: knotY}
	k := len(knotX)
	if k < Null {
		return nil, fmt.Errorf("a thin-plate surface needs at least %d distinct places, there are %d", Null, k)
	}
	t.CentreX, t.CentreY, t.Scale = centreAndScale(knotX, knotY)
	if !(t.Scale > 0) || math.IsInf(t.Scale, 0) {
		return nil, fmt.Errorf("the knots of a thin-plate surface have no extent")
	}
	t.scaleKnots()
	q2, err := t.constraint()
	if err != nil {
		return nil, err
	}
	if k > Null {
		if err := t.whiten(q2); err != nil {
			return nil, err
		}
	}
	return t, nil
}

// RestoreThinPlate returns the basis with the fields of t, as stored: nothing is computed afresh, so that a stored
// surface predicts the same numbers on any machine. It returns an error if shapes do not agree.
func RestoreThinPlate(t ThinPlate) (*ThinPlate, error) {
	k := len(t.KnotX)
	if k < Null || len(t.KnotY) != k || len(t.Whiten) != k*(k-Null) || !(t.Scale > 0) || math.IsInf(t.Scale, 1) {
		return nil, fmt.Errorf("thin-plate basis: %d by %d knots with %d transform values do not belong together",
			len(t.KnotX), len(t.KnotY), len(t.Whiten))
	}
	r := &ThinPlate{CentreX: t.CentreX, CentreY: t.CentreY, Scale: t.Scale, KnotX: t.KnotX, KnotY: t.KnotY, Whiten: t.Whiten}
	r.scaleKnots()
	return r, nil
}

// Dim returns the number of columns, which equals the number of knots.
func (t *ThinPlate) Dim() int { return len(t.KnotX) }

// Spread is scratch space for RowsTo, to be used by one goroutine at a time. The zero value is ready.
type Spread struct{ radial []float64 }

// RowsTo writes the basis at each place to dst, row-major with the given stride between rows: Dim values in each row,
// the three null-space columns first. It panics if dst is too short.
func (t *ThinPlate) RowsTo(dst []float64, stride int, x, y []float64, s *Spread) {
	m, k := len(x), t.Dim()
	wiggly := k - Null
	for i := range x {
		row := dst[i*stride : i*stride+Null]
		row[0], row[1], row[2] = 1, (x[i]-t.CentreX)/t.Scale, (y[i]-t.CentreY)/t.Scale
	}
	if wiggly == 0 || m == 0 {
		return
	}
	if cap(s.radial) < m*k {
		s.radial = make([]float64, m*k)
	}
	r := s.radial[:m*k]
	for i := range x {
		px, py := (x[i]-t.CentreX)/t.Scale, (y[i]-t.CentreY)/t.Scale
		row := r[i*k : (i+1)*k]
		for j := range row {
			row[j] = radial(px-t.sx[j], py-t.sy[j])
		}
	}
	blas64.Gemm(blas.NoTrans, blas.NoTrans, 1,
		blas64.General{Rows: m, Cols: k, Stride: k, Data: r},
		blas64.General{Rows: k, Cols: wiggly, Stride: wiggly, Data: t.Whiten}, 0,
		blas64.General{Rows: m, Cols: wiggly, Stride: stride, Data: dst[Null : (m-1)*stride+k]})
}

// NullSpaceTo writes 1, x* and y* at one place to dst.
func (t *ThinPlate) NullSpaceTo(dst []float64, x, y float64) {
	dst[0], dst[1], dst[2] = 1, (x-t.CentreX)/t.Scale, (y-t.CentreY)/t.Scale
}

// radial returns eta(r) = r^2 log r / (8 pi) for the vector (dx, dy) of length r.
func radial(dx, dy float64) float64 {
	d2 := dx*dx + dy*dy
	if d2 == 0 {
		return 0
	}
	return d2 * math.Log(d2) * (1 / (16 * math.Pi))
}

func centreAndScale(x, y []float64) (cx, cy, scale float64) {
	n := float64(len(x))
	for i := range x {
		cx += x[i] / n
		cy += y[i] / n
	}
	for i := range x {
		scale += ((x[i]-cx)*(x[i]-cx) + (y[i]-cy)*(y[i]-cy)) / n
	}
	return cx, cy, math.Sqrt(scale)
}

func (t *ThinPlate) scaleKnots() {
	k := t.Dim()
	t.sx, t.sy = make([]float64, k), make([]float64, k)
	for j := range t.KnotX {
		t.sx[j] = (t.KnotX[j] - t.CentreX) / t.Scale
		t.sy[j] = (t.KnotY[j] - t.CentreY) / t.Scale
	}
}

// collinear is the smallest ratio of the knots' spread across their main direction to that along it; below it the
// places lie on a line as far as a surface is concerned.
const collinear = 1e-6

// constraint returns an orthonormal basis (K x K-3) of the coefficients d with sum d_k (1, t_k) = 0.
func (t *ThinPlate) constraint() (*mat.Dense, error) {
	k := t.Dim()
	null := mat.NewDense(k, Null, nil)
	for j := 0; j < k; j++ {
		null.SetRow(j, []float64{1, t.sx[j], t.sy[j]})
	}
	var svd mat.SVD
	if !svd.Factorize(null, mat.SVDNone) {
		return nil, fmt.Errorf("thin-plate basis: no singular values of %d knots", k)
	}
	if v := svd.Values(nil); v[2] < collinear*v[0] {
		return nil, ErrCollinear
	}
	var qr mat.QR
	qr.Factorize(null)
	var q mat.Dense
	qr.QTo(&q)
	if k == Null {
		return nil, nil
	}
	return mat.DenseCopyOf(q.Slice(0, k, Null, k)), nil
}

// ErrCollinear says that the knots lie on one line, so that a plane is not determined by them.
var ErrCollinear = fmt.Errorf("the places lie on one line")

// leastPivot is the smallest share of its diagonal that a pivot of Q2'E Q2 may come to. Knots minSpacing apart leave
// 1e-11, coinciding ones rounding.
const leastPivot = 1e-13

// whiten sets Whiten = Q2 U^-1 with U'U = Q2'E Q2.
func (t *ThinPlate) whiten(q2 *mat.Dense) error {
	k := t.Dim()
	e := mat.NewSymDense(k, nil)
	for i := 0; i < k; i++ {
		for j := i; j < k; j++ {
			e.SetSym(i, j, radial(t.sx[i]-t.sx[j], t.sy[i]-t.sy[j]))
		}
	}
	var eq, qeq mat.Dense
	eq.Mul(e, q2)
	qeq.Mul(q2.T(), &eq)
	wiggly := k - Null
	sym := mat.NewSymDense(wiggly, nil)
	for i := 0; i < wiggly; i++ {
		for j := i; j < wiggly; j++ {
			sym.SetSym(i, j, (qeq.At(i, j)+qeq.At(j, i))/2)
		}
	}
	var chol mat.Cholesky
	var u mat.TriDense
	ok := chol.Factorize(sym)
	if ok {
		chol.UTo(&u)
	}
	for j := 0; j < wiggly && ok; j++ {
		ok = u.At(j, j)*u.At(j, j) > leastPivot*sym.At(j, j)
	}
	if !ok {
		return fmt.Errorf("thin-plate basis: two of the %d knots lie too close together", k)
	}
	w := mat.DenseCopyOf(q2)
	blas64.Trsm(blas.Right, blas.NoTrans, 1, u.RawTriangular(), w.RawMatrix())
	t.Whiten = w.RawMatrix().Data
	return nil
}

package spatial

import (
	"math"

	"drumlin/basis2d"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/distuv"
)

// CurveTest asks whether a curve, straight part included, is zero. It is the Wald test of Wood (2013, Biometrika
// 100:221-228) on the curve's values at the rows, with a pseudo-inverse of their covariance whose rank is the curve's
// degrees of freedom, whole or not.
type CurveTest struct {
	Name      string  // the covariate; for a curve of one level "depth, soil=loam"
	Statistic float64 // about DF on average if the curve is zero
	DF        float64 // reference degrees of freedom
	// ResidualDF are those of the dispersion where that is estimated; 0 where it is known.
	ResidualDF float64
	P          float64
}

// TestCurves tests each of the model's curves. z holds the covariates at the rows the model was fitted to. It returns an
// error for covariates that do not fit, and panics if they differ in length. It is safe for concurrent use.
//
// Not knowing the smoothness, or a shared factor, is not part of the covariance, whatever the model asks for.
func (s *Surface) TestCurves(z []Covariate) (list []CurveTest, err error) {
	q := s.border.size()
	free, bound := 0, s.core.columns()+q
	penalty := s.penalties()
	for _, e := range s.border.Effects {
		if e.Role == Curve {
			grams, err := e.curveGrams(z)
			if err != nil {
				return nil, err
			}
			for k, c := range e.Curve {
				t := CurveTest{Name: e.curveName(k)}
				t.DF = s.curveDF(penalty, bound+k*(c.Dim()-1), c.Dim()-1)
				if !s.knownDispersion() {
					t.ResidualDF = math.Max(float64(s.report.Rows)-s.report.DF, 1)
				}
				b, v := s.curveMoments(free+k, q, bound+k*(c.Dim()-1), c.Dim())
				t.wald(b, v, grams[k])
				list = append(list, t)
			}
		}
		free, bound = free+e.free(), bound+e.bound()
	}
	return list, nil
}

// curveGrams returns X'X of each curve's columns over its rows.
func (f fitted) curveGrams(z []Covariate) ([]*mat.SymDense, error) {
	c, err := find(z, f.Name, true)
	if err != nil {
		return nil, err
	}
	of := func(int) int { return 0 }
	if f.Per != "" {
		per, err := find(z, f.Per, false)
		if err != nil {
			return nil, err
		}
		to := lookUp(per.Level, f.Level)
		of = func(i int) int { return to[per.Code[i]] }
	}
	grams := make([]*mat.SymDense, len(f.Curve))
	for k, c := range f.Curve {
		grams[k] = mat.NewSymDense(c.Dim(), nil)
	}
	var row [basis2d.DefaultFunctions]float64
	for i, v := range c.Number {
		if k := of(i); k >= 0 {
			m := f.Curve[k].Dim()
			f.Curve[k].RowTo(row[:m], v)
			grams[k].SymRankOne(grams[k], 1, mat.NewVecDense(m, row[:m]))
		}
	}
	return grams, nil
}

// penalties returns the diagonal of S_lambda.
func (s *Surface) penalties() []float64 {
	penalty := make([]float64, len(s.beta))
	for j, t := range s.smooths() {
		for _, span := range t.ridge {
			for c := span.First; c < span.First+span.Size; c++ {
				penalty[c] = s.report.Smooths[j].Lambda / t.scale
			}
		}
	}
	return penalty
}

// curveDF returns the sum of the diagonal of 2F - FF, F = H^-1 X'WX = I - H^-1 S, over a curve's columns: of those that
// bend, size of them from first on, and one more for the straight column, which no penalty touches.
func (s *Surface) curveDF(penalty []float64, first, size int) float64 {
	df := 1.0
	column := make([]float64, len(s.beta))
	v := blas64.Vector{N: len(column), Inc: 1, Data: column}
	for i := first; i < first+size; i++ {
		clear(column)
		column[i] = 1
		blas64.Trsv(blas.Trans, s.triangle(), v)
		blas64.Trsv(blas.NoTrans, s.triangle(), v) // H^-1 e_i
		sum := 0.0
		for l, h := range column {
			sum += penalty[l] * h * h
		}
		df += 1 - penalty[i]*sum
	}
	return math.Min(math.Max(df, 1), float64(1+size))
}

// curveMoments returns a curve's coefficients in its own columns, the straight one first, and their covariance.
func (s *Surface) curveMoments(straight, q, bound, size int) ([]float64, *mat.SymDense) {
	p := len(s.beta)
	g := blas64.General{Rows: p, Cols: size, Stride: size, Data: make([]float64, p*size)} // functionals, one a column
	row := make([]float64, p)
	s.addFree(row, straight, q, 1)
	for i, v := range row {
		g.Data[i*size] = v
	}
	for j := 1; j < size; j++ {
		g.Data[(bound+j-1)*size+j] = 1
	}
	b := make([]float64, size)
	blas64.Gemv(blas.Trans, 1, g, blas64.Vector{N: p, Inc: 1, Data: s.beta}, 0, blas64.Vector{N: size, Inc: 1, Data: b})
	blas64.Trsm(blas.Left, blas.Trans, 1, s.triangle(), g)
	v := mat.NewSymDense(size, nil)
	v.SymOuterK(s.phi, mat.NewDense(p, size, g.Data).T())
	return b, v
}

// wald sets Statistic and P from the curve's coefficients b, their covariance v and the Gram matrix of its columns. With
// f = X b, V_f = X V X' = U diag(l) U', DF = k + nu, k a whole number and 0 <= nu < 1, the pseudo-inverse of rank DF is
//
//	U_{1..k-1} diag(1/l) U' + (u_k, u_k+1) D [1 rho; rho nu] D (u_k, u_k+1)',   D = diag(l^-1/2), rho^2 = nu (1-nu)/2,
//
// which gives the statistic mean DF and variance 2 DF. The sign of an eigenvector means nothing, but turns that of rho's
// term: Statistic and P are the averages over both. DF is cut to the rank of V_f.
func (t *CurveTest) wald(b []float64, v, gram *mat.SymDense) {
	m := len(b)
	var onRows, onF mat.EigenSym
	onRows.Factorize(gram, true)
	var e, root, half mat.Dense
	onRows.VectorsTo(&e)
	scale := make([]float64, m)
	for i, d := range onRows.Values(nil) {
		scale[i] = math.Sqrt(math.Max(d, 0))
	}
	root.Mul(mat.NewDiagDense(m, scale), e.T()) // root'root = X'X
	half.Mul(&root, v)
	full := mat.NewDense(m, m, nil)
	full.Mul(&half, root.T())
	covariance := mat.NewSymDense(m, nil)
	for i := 0; i < m; i++ {
		for j := i; j < m; j++ {
			covariance.SetSym(i, j, (full.At(i, j)+full.At(j, i))/2)
		}
	}
	onF.Factorize(covariance, true)
	var u mat.Dense
	onF.VectorsTo(&u)
	var f, along mat.VecDense
	f.MulVec(&root, mat.NewVecDense(m, b))
	along.MulVec(u.T(), &f)
	var c []float64 // components of f in units of their standard errors, the largest standard error first
	for i, values := m-1, onF.Values(nil); i >= 0 && values[i] > 1e-12*values[m-1]; i-- {
		c = append(c, along.AtVec(i)/math.Sqrt(values[i]))
	}
	t.DF = math.Min(t.DF, float64(len(c)))
	k := int(t.DF)
	nu := t.DF - float64(k)
	for _, x := range c[:k] {
		t.Statistic += x * x
	}
	if k == len(c) || nu < 1e-6 {
		t.P = mixedTail(t.Statistic, k, 0, t.ResidualDF)
		return
	}
	t.Statistic += nu * c[k] * c[k]
	cross := math.Sqrt(2*nu*(1-nu)) * c[k-1] * c[k]
	t.P = (mixedTail(t.Statistic+cross, k, nu, t.ResidualDF) + mixedTail(t.Statistic-cross, k, nu, t.ResidualDF)) / 2
}

// tailNodes is the number of nodes of mixedTail's integrals in either direction.
const tailNodes = 96

// mixedTail returns the chance that Q exceeds x, Q the sum of k-1 squared standard normal variables and of two more times
// (1 + nu +- sqrt(1 - nu^2))/2; or, if residual is not 0, that Q exceeds x times a chi-squared variable with residual
// degrees of freedom over these. Q is a chi-squared variable with k+1 degrees of freedom, the squared length of k+1 normal
// variables, times a weighted mean that depends on their direction alone, which is uniform (Ruben 1960, Ann. Math. Stat.
// 31:598-618); so the chance is the mean over directions of chi-squared or F tails: a smooth integral of positive numbers,
// good for the smallest chances too. Its relative error is below 1e-8.
func mixedTail(x float64, k int, nu, residual float64) float64 {
	if nu == 0 {
		return tail(x, float64(k), residual)
	}
	if x <= 0 {
		return 1
	}
	side := math.Sqrt(1 - nu*nu)
	high, low := (1+nu+side)/2, nu*(1+nu)/(1+nu+side)
	around := func(c float64) (sum float64) { // mean over angles in the plane of the two, c^2 the share of the k-1
		for j := 0; j < tailNodes; j++ {
			sin, cos := math.Sincos(math.Pi / 2 * (float64(j) + 0.5) / tailNodes)
			sum += tail(x/(c*c+(1-c*c)*(high*cos*cos+low*sin*sin)), float64(k+1), residual)
		}
		return sum / tailNodes
	}
	if k == 1 {
		return around(0)
	}
	// c has density (k-1) c^(k-2) on [0, 1].
	return quad.Fixed(func(c float64) float64 { return float64(k-1) * math.Pow(c, float64(k-2)) * around(c) }, 0, 1, tailNodes, quad.Legendre{}, 0)
}

// tail returns the chance that a chi-squared variable with k degrees of freedom exceeds x, or, if residual is not 0, x
// times another with residual degrees of freedom over these.
func tail(x, k, residual float64) float64 {
	if residual == 0 {
		return distuv.ChiSquared{K: k}.Survival(x)
	}
	return mathext.RegIncBeta(residual/2, k/2, residual/(residual+x))
}

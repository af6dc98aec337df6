package basis2d

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Curve is a basis for smooth functions of one covariate: cubic B-splines on uniform knots with a second-order
// difference penalty (Eilers & Marx 1996, Stat. Sci. 11:89-121). Its first column is the covariate, centred and
// scaled; the others are what bends, in which the penalty is the identity. Every column has mean zero over the rows
// the basis was made for, so that a curve says nothing about the level. Beyond the rows' range curves go on straight.
type Curve struct {
	Lo, Hi        float64   // range of the covariate
	Functions     int       // number of B-splines
	Whiten        []float64 // Functions x (Functions-2), row-major: B-splines to penalised columns
	Centre, Scale float64   // of the first column
	Mean          []float64 // of the penalised columns before they were centred
}

// DefaultFunctions is the number of B-splines a curve gets unless something else is said: more than curves need, since
// the penalty decides how much of them to use.
const DefaultFunctions = 20

// NewCurve makes the basis for covariate values z, one a row, with the given number of B-splines, at least 4. It
// returns an error if z has fewer than three distinct values, with which nothing can bend.
func NewCurve(z []float64, functions int) (*Curve, error) {
	if functions < 4 {
		return nil, fmt.Errorf("a curve needs at least 4 B-splines, not %d", functions)
	}
	c := &Curve{Functions: functions, Lo: math.Inf(1), Hi: math.Inf(-1)}
	seen := map[float64]bool{}
	for _, v := range z {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, fmt.Errorf("a value that is not a finite number")
		}
		c.Lo, c.Hi = math.Min(c.Lo, v), math.Max(c.Hi, v)
		if len(seen) < 3 {
			seen[v] = true
		}
	}
	if len(seen) < 3 {
		return nil, fmt.Errorf("a curve needs at least 3 distinct values, and there %s", [...]string{"is none", "is 1", "are 2"}[len(seen)])
	}
	if err := c.whiten(); err != nil {
		return nil, err
	}
	c.centre(z)
	return c, nil
}

// Dim returns the number of columns: one that is straight, Functions-2 that bend.
func (c *Curve) Dim() int { return c.Functions - 1 }

// Whole reports whether the fields of a stored curve belong together.
func (c *Curve) Whole() bool {
	k := c.Functions
	if k < 4 || len(c.Whiten) != k*(k-2) || len(c.Mean) != k-2 || !(c.Hi > c.Lo) || !(c.Scale > 0) {
		return false
	}
	for _, v := range append(append([]float64{c.Lo, c.Hi, c.Centre, c.Scale}, c.Whiten...), c.Mean...) {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}

// RowTo writes the columns at covariate value v to dst, which holds Dim values.
func (c *Curve) RowTo(dst []float64, v float64) {
	dst[0] = (v - c.Centre) / c.Scale
	bend := c.Functions - 2
	row := dst[1 : 1+bend]
	for j := range row {
		row[j] = -c.Mean[j]
	}
	first, b := c.splines(v)
	for i, w := range b {
		for j, u := range c.Whiten[(first+i)*bend : (first+i+1)*bend] {
			row[j] += w * u
		}
	}
}

// splines returns the four B-splines that are not zero at v, and the number of the first. Outside the range they are
// continued along their tangents.
func (c *Curve) splines(v float64) (first int, b [4]float64) {
	h := (c.Hi - c.Lo) / float64(c.Functions-3)
	inside := math.Min(c.Hi, math.Max(c.Lo, v))
	first = min(int((inside-c.Lo)/h), c.Functions-4)
	t := (inside-c.Lo)/h - float64(first)
	beyond := (v - inside) / h
	b, slope := CubicPieces(t)
	for i := range b {
		b[i] += beyond * slope[i]
	}
	return first, b
}

// CubicPieces returns the values and the derivatives in t of the four uniform cubic B-splines on a cell, at the
// position t in [0, 1] inside it (de Boor 1978).
func CubicPieces(t float64) (value, slope [4]float64) {
	u := 1 - t
	value = [4]float64{u * u * u / 6, (4 - 6*t*t + 3*t*t*t) / 6, (4 - 6*u*u + 3*u*u*u) / 6, t * t * t / 6}
	slope = [4]float64{-u * u / 2, (3*t - 4) * t / 2, (4 - 3*u) * u / 2, t * t / 2}
	return value, slope
}

// whiten sets Whiten = V diag(d)^-1/2 with V diag(d) V' the part of D'D that is not zero, D the second differences.
func (c *Curve) whiten() error {
	k := c.Functions
	s := mat.NewSymDense(k, nil)
	for r := 0; r+2 < k; r++ {
		d := [3]float64{1, -2, 1}
		for i, a := range d {
			for j, b := range d {
				if j >= i {
					s.SetSym(r+i, r+j, s.At(r+i, r+j)+a*b)
				}
			}
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(s, true) {
		return fmt.Errorf("curve basis: no eigenvalues of the penalty")
	}
	value := eigen.Values(nil)
	var v mat.Dense
	eigen.VectorsTo(&v)
	c.Whiten = make([]float64, k*(k-2))
	for j := 2; j < k; j++ { // ascending: the first two are zero, constant and line
		for i := 0; i < k; i++ {
			c.Whiten[i*(k-2)+j-2] = v.At(i, j) / math.Sqrt(value[j])
		}
	}
	return nil
}

// centre makes every column's mean over the rows zero.
func (c *Curve) centre(z []float64) {
	n := float64(len(z))
	c.Mean = make([]float64, c.Functions-2)
	c.Scale = 1
	for _, v := range z {
		c.Centre += v / n
	}
	var ss float64
	for _, v := range z {
		ss += (v - c.Centre) * (v - c.Centre) / n
	}
	c.Scale = math.Sqrt(ss)
	sum := make([]float64, c.Functions-2)
	row := make([]float64, c.Dim())
	for _, v := range z {
		c.RowTo(row, v)
		for j := range sum {
			sum[j] += row[1+j] / n
		}
	}
	c.Mean = sum
}

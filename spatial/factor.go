package spatial

import (
	"context"
	"math"

	"drumlin/spatial/internal/penfit"

	"gonum.org/v1/gonum/blas/blas64"
)

// Factor is what rows' exposures are known up to, such as the share of animals that observers detect: row i's exposure is
// to be multiplied by factor Of[i], which all its rows share; -1 is none. The log of factor k is normal about zero with
// variance log(1 + CV[k]^2), independent of the other factors, and its error goes into all standard errors to first order
// (Buckland et al. 2001, Introduction to Distance Sampling, ch. 3). It is no noise between rows: it does not average out.
type Factor struct {
	Of []int32
	CV []float64 // coefficients of variation; 0 is none
}

// check panics if there is not one factor a row, and returns an error for factors that cannot be.
func (f *Factor) check(rows int, exposure []float64) error {
	if f == nil {
		return nil
	}
	if len(f.Of) != rows {
		panic(lengths)
	}
	if exposure == nil {
		return unfit("name the denominator of the counts, or leave the factor out", "a factor of the exposure needs an exposure")
	}
	for k, cv := range f.CV {
		if !(cv >= 0) || bad(cv) {
			return unfit("give it as a number from 0 up", "factor %d: a coefficient of variation of %g", k+1, cv)
		}
	}
	for i, k := range f.Of {
		if k < -1 || int(k) >= len(f.CV) {
			return unfit("number the factors from 0, -1 for none", "row %d: there is no factor %d among %d", i+1, k, len(f.CV))
		}
	}
	return nil
}

// addFactor adds a column for each factor to the spread. Where the offsets of a factor's rows grow by one, the scores of
// these rows fall by their observed weights w, so that the mode moves by
//
//	u = -H^-1 sum_i w_i x_i,
//
// which the factor's standard deviation multiplies.
func (s *Surface) addFactor(ctx context.Context, f *Factor, p penfit.Problem, r *penfit.Result) error {
	if f == nil {
		return nil
	}
	for k, cv := range f.CV {
		if cv == 0 {
			continue
		}
		err := p.Engine.Pass(ctx, r.Beta, func(i int, _, _ float64) (weight, value float64) {
			if int(f.Of[i]) != k {
				return 0, 0
			}
			return 0, s.dist.At(p.Obs[i], r.Eta[i]).Weight
		}, penfit.NoGram)
		if err != nil {
			return err
		}
		u, sd := append([]float64(nil), p.Engine.Score()...), math.Sqrt(math.Log1p(cv*cv))
		p.Engine.Solve(u)
		for j := range u {
			u[j] *= -sd
		}
		s.spread = withColumn(s.spread, u)
	}
	return nil
}

// withColumn returns m with one more column.
func withColumn(m blas64.General, column []float64) blas64.General {
	wide := blas64.General{Rows: len(column), Cols: m.Cols + 1, Stride: m.Cols + 1, Data: make([]float64, len(column)*(m.Cols+1))}
	for i, v := range column {
		copy(wide.Data[i*wide.Stride:], m.Data[i*m.Stride:i*m.Stride+m.Cols])
		wide.Data[i*wide.Stride+m.Cols] = v
	}
	return wide
}

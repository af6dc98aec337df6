package spatial

import (
	"context"
	"math"
	"math/rand/v2"

	"drumlin/basis2d/blocks"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// Share is a weighted set of places: place Index[k] counts Weight[k] times, for example with its area.
type Share struct {
	Index  []int32
	Weight []float64
}

// Sum is the weighted sum of the means over a Share.
type Sum struct {
	Value float64 // plug-in: the sum of the places' own means, so that parts add up exactly
	Delta float64 // standard error by the delta method
	// Draws holds the sum in each of the joint posterior draws, from which intervals and chances are read.
	Draws []float64
}

// DrawSD returns the standard deviation of the draws.
func (s Sum) DrawSD() float64 {
	var mean, ss float64
	for _, v := range s.Draws {
		mean += v / float64(len(s.Draws))
	}
	for _, v := range s.Draws {
		ss += (v - mean) * (v - mean)
	}
	return math.Sqrt(ss / float64(len(s.Draws)-1))
}

// Sums returns sum_j Weight_j mu_j over each of the sets, mu the mean for one unit of exposure at place j, with its
// uncertainty from joint draws of all coefficients: neighbouring places err together, so their errors do not average
// out. The draws are the same for every set, so sums over different sets may be compared draw by draw. Places are points: it
// panics if they are sets of points, or if slices of at and z differ in length.
func (s *Surface) Sums(ctx context.Context, at Places, z []Covariate, sets []Share, draws int, seed uint64) ([]Sum, error) {
	if at.Start != nil {
		panic("spatial: sums are over points")
	}
	rows, err := s.rowMaker(at, z)
	if err != nil {
		return nil, err
	}
	betas := s.draw(draws, seed)
	out := make([]Sum, len(sets))
	for k, set := range sets {
		if out[k], err = s.sum(ctx, rows, at, set, betas); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// sum works through one set in blocks, added in order.
func (s *Surface) sum(ctx context.Context, rows rows, at Places, set Share, betas blas64.General) (Sum, error) {
	p, draws := betas.Rows, betas.Cols
	scratch := make([]*sumScratch, blocks.Workers(s.workers))
	acc := make([]float64, 1+p+draws) // value, gradient, draws
	err := blocks.Sum(ctx, s.workers, len(set.Index), acc, func(worker, from, to int, acc []float64) error {
		if scratch[worker] == nil {
			scratch[worker] = &sumScratch{rowScratch: rowScratch{rows: make([]float64, blocks.Size*p)}, drawn: make([]float64, blocks.Size*draws)}
		}
		w := scratch[worker]
		index, weight := set.Index[from:to], set.Weight[from:to]
		for k, i := range index {
			w.x[k], w.y[k] = at.X[i], at.Y[i]
		}
		x := rows(&w.rowScratch, w.x[:len(index)], w.y[:len(index)], func(k int) int { return int(index[k]) })
		drawn := blas64.General{Rows: x.Rows, Cols: draws, Stride: draws, Data: w.drawn[:x.Rows*draws]}
		if draws > 0 {
			blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, x, betas, 0, drawn)
		}
		for k, a := range weight {
			row := x.Data[k*p : (k+1)*p]
			eta := dot(row, s.beta)
			acc[0] += a * s.dist.Mean(eta)
			slope := a * s.dist.MeanSlope(eta)
			for j, v := range row {
				acc[1+j] += slope * v
			}
			for d, e := range drawn.Data[k*draws : (k+1)*draws] {
				acc[1+p+d] += a * s.dist.Mean(e)
			}
		}
		return nil
	})
	if err != nil {
		return Sum{}, err
	}
	return Sum{Value: acc[0], Delta: s.errorOf(acc[1 : 1+p]), Draws: acc[1+p:]}, nil
}

// sumScratch is one goroutine's space for a block of places and their draws.
type sumScratch struct {
	rowScratch
	x, y  [blocks.Size]float64
	drawn []float64
}

// draw returns coefficients drawn from their posterior, p x draws.
func (s *Surface) draw(draws int, seed uint64) blas64.General {
	p := len(s.beta)
	random := rand.New(rand.NewPCG(seed, 0x73757266616365))
	b := blas64.General{Rows: p, Cols: draws, Stride: draws, Data: make([]float64, p*draws)}
	if draws == 0 {
		return b
	}
	root := math.Sqrt(s.phi)
	for d := 0; d < draws; d++ {
		for k := 0; k < p; k++ {
			b.Data[k*draws+d] = root * random.NormFloat64()
		}
	}
	blas64.Trsm(blas.Left, blas.NoTrans, 1, s.triangle(), b)
	for d := 0; d < draws; d++ {
		for k := 0; k < p; k++ {
			b.Data[k*draws+d] += s.beta[k]
		}
		for c := 0; c < s.spread.Cols; c++ {
			z := random.NormFloat64()
			for k := 0; k < p; k++ {
				b.Data[k*draws+d] += z * s.spread.Data[k*s.spread.Stride+c]
			}
		}
	}
	return b
}

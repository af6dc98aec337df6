package spatial

import (
	"context"
	"math"
	"slices"

	"drumlin/basis2d/blocks"
	"drumlin/spatial/response"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// PredictTo writes the linear predictor and its standard error, both on the link scale, without offset, at each of the
// places to eta and se. Where places are sets of points the linear predictor is that of the points' mean for one unit of
// exposure, its error by the delta method. z holds the covariates the model's effects name, one value a row. A level of a
// category that the data did not have gives NaN in both; such a level of a group has the average level and its variance; a
// group that z does not hold is taken at the average level, without error. It returns an error for a covariate that is
// missing, for a row without points that count, or when ctx is cancelled, and panics if eta, se, at and z differ in length.
// It is safe for concurrent use.
func (s *Surface) PredictTo(ctx context.Context, eta, se []float64, at Places, z []Covariate) error {
	n := at.Len()
	if len(eta) != n || len(se) != n {
		panic(lengths)
	}
	rows, err := s.rowMaker(at, z)
	if err != nil {
		return err
	}
	if at, err = at.settled(); err != nil {
		return err
	}
	p := len(s.beta)
	workers := blocks.Workers(s.workers)
	scratch := make([]*predictScratch, workers)
	return blocks.Do(ctx, workers, blocks.Count(n), func(worker, b int) error {
		if scratch[worker] == nil {
			scratch[worker] = &predictScratch{rowScratch: rowScratch{rows: make([]float64, blocks.Size*p)}}
		}
		w := scratch[worker]
		from, to := blocks.Range(b, n)
		var x blas64.General
		if at.Start == nil {
			x = rows(&w.rowScratch, at.X[from:to], at.Y[from:to], func(k int) int { return from + k })
			s.linearTo(eta[from:to], x)
		} else {
			x = s.mixTo(eta[from:to], w, rows, at, from)
		}
		var spread [blocks.Size]float64
		for i := 0; i < x.Rows && s.spread.Cols > 0; i++ {
			spread[i] = s.spreadOf(x.Data[i*p : (i+1)*p])
		}
		blas64.Trsm(blas.Right, blas.NoTrans, 1, s.triangle(), x)
		for i := range x.Rows {
			v := x.Data[i*p : (i+1)*p]
			se[from+i] = math.Sqrt(s.phi*(dot(v, v)+w.unseen[i]) + spread[i])
		}
		return nil
	})
}

// linearTo writes the linear predictors of rows of the model matrix to eta.
func (s *Surface) linearTo(eta []float64, x blas64.General) {
	blas64.Gemv(blas.NoTrans, 1, x, blas64.Vector{N: len(s.beta), Inc: 1, Data: s.beta}, 0, blas64.Vector{N: len(eta), Inc: 1, Data: eta})
}

// predictScratch is one goroutine's space for predictions.
type predictScratch struct {
	rowScratch
	eta      []float64 // of one row's points
	mix      response.Mixture
	tangents []float64 // of a block of rows that are sets of points
}

// mixTo writes the linear predictors of rows that are sets of points, from row first on, to eta and returns their
// derivatives in the coefficients. It sets w.unseen.
func (s *Surface) mixTo(eta []float64, w *predictScratch, rows rows, at Places, first int) blas64.General {
	p, mixer := len(s.beta), response.MixerOf(s.dist.Link())
	if w.tangents == nil {
		w.tangents = make([]float64, blocks.Size*p)
	}
	x := blas64.General{Rows: len(eta), Cols: p, Stride: p, Data: w.tangents[:len(eta)*p]}
	clear(x.Data)
	var unseen [blocks.Size]float64
	for i := range eta {
		from, to := int(at.Start[first+i]), int(at.Start[first+i+1])
		share := at.Share[from:to]
		w.eta = slices.Grow(w.eta[:0], to-from)[:to-from]
		pieces := blocks.Count(to - from)
		points := func(b int) blas64.General {
			a, c := blocks.Range(b, to-from)
			return rows(&w.rowScratch, at.X[from+a:from+c], at.Y[from+a:from+c], func(int) int { return first + i })
		}
		var last blas64.General
		for b := range pieces {
			a, c := blocks.Range(b, to-from)
			last = points(b)
			s.linearTo(w.eta[a:c], last)
		}
		mixer.MixTo(&w.mix, share, w.eta)
		eta[i] = w.mix.Linear
		tangent := blas64.Vector{N: p, Inc: 1, Data: x.Data[i*p : (i+1)*p]}
		for b := pieces - 1; b >= 0; b-- { // backwards, since the last piece is at hand
			a, c := blocks.Range(b, to-from)
			if b < pieces-1 {
				last = points(b)
			}
			blas64.Gemv(blas.Trans, 1, last, blas64.Vector{N: c - a, Inc: 1, Data: w.mix.First[a:c]}, 1, tangent)
		}
		alike := 0.0 // what the linear predictor moves by where all points' do by one, as with a group's level
		for _, v := range w.mix.First {
			alike += v
		}
		unseen[i] = w.unseen[0] * alike * alike
	}
	copy(w.unseen[:], unseen[:len(eta)])
	return x
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

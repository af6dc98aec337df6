package penfit

import (
	"context"
	"slices"
	"sort"

	"drumlin/basis2d/blocks"
	"drumlin/spatial/response"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// Composite is the engine for rows that are weighted sets of points: with x_q the points' rows of the model matrix, a
// row's linear predictor L is the mixture of eta_q = x_q'b (response.Mixture). Its derivative in b is the tangent row
// sum_q p_q x_q, its second derivative k x x' + sum_q c_q x_q x_q', so that with rows' weights w and scores v
//
//	G = sum_i (w_i - v_i k_i) x_i x_i' - v_i sum_q c_q x_q x_q'.
//
// Where the link is the identity second derivatives are zero, and G is that of averaged rows.
type Composite struct {
	normal
	points  store
	start   []int32 // row i is the points [start[i], start[i+1])
	share   []float64
	mixer   response.Mixer
	workers int
	scratch []compositeScratch

	eta           []float64 // of each point at the coefficients of the last pass
	weight, value []float64 // of each row in the last pass that made a Gram matrix
	kind          Gram      // which one that was
}

// compositeScratch is one goroutine's space for the rows that begin within one block of points.
type compositeScratch struct {
	points, tangents, block []float64 // points' rows unless they are kept, rows' tangents, a block for addGram
	times                   []float64 // points' rows times a matrix; grown when asked for
	eta                     []float64
	mix                     [blocks.Size]response.Mixture
}

// NewComposite returns the engine for rows that are sets of points, given the points' design. Row i is the points
// [start[i], start[i+1]), at least one, whose shares sum to one. The ridges must not overlap.
func NewComposite(
	ctx context.Context, points Design, start []int32, share []float64, mixer response.Mixer, ridges []Ridge, workers int,
) (*Composite, error) {
	e := &Composite{
		normal: newNormal(points.Cols(), ridges), start: start, share: share, mixer: mixer, workers: blocks.Workers(workers),
		eta: make([]float64, len(share)), weight: make([]float64, len(start)-1), value: make([]float64, len(start)-1),
	}
	var err error
	if e.points, err = newStore(ctx, points, e.workers); err != nil {
		return nil, err
	}
	most := e.mostPoints()
	e.scratch = make([]compositeScratch, e.workers)
	for w := range e.scratch {
		s := &e.scratch[w]
		if e.points.kept == nil {
			s.points = make([]float64, most*e.p)
		}
		s.tangents, s.block, s.eta = make([]float64, blocks.Size*e.p), make([]float64, blocks.Size*e.p), make([]float64, most)
	}
	return e, nil
}

// mostPoints returns the largest number of points of the rows that begin within one block of points.
func (e *Composite) mostPoints() (most int) {
	for b := 0; b < blocks.Count(len(e.share)); b++ {
		from, to := blocks.Range(b, len(e.share))
		first, last := e.within(from, to)
		most = max(most, int(e.start[last]-e.start[first]))
	}
	return most
}

// within returns the rows [first, last) that begin among the points [from, to). Rows are shared out by blocks of points, so
// that a few large rows keep as many goroutines busy as many small ones.
func (e *Composite) within(from, to int) (first, last int) {
	begin := func(at int) int {
		return sort.Search(e.Rows(), func(i int) bool { return int(e.start[i]) >= at })
	}
	return begin(from), begin(to)
}

func (e *Composite) Rows() int    { return len(e.start) - 1 }
func (e *Composite) Curved() bool { return true }

// stretch is a run of rows with their points.
type stretch struct {
	*compositeScratch
	first, last int            // rows
	from, to    int            // points
	x           blas64.General // the points' rows of the model matrix
	tangent     blas64.General // the rows' tangents, once mixed
}

// stretch returns the rows that begin among the points [from, to).
func (e *Composite) stretch(worker, from, to int) stretch {
	s := stretch{compositeScratch: &e.scratch[worker]}
	s.first, s.last = e.within(from, to)
	s.from, s.to = int(e.start[s.first]), int(e.start[s.last])
	s.x = e.points.rows(s.points, s.from, s.to, worker)
	rows := s.last - s.first
	s.tangent = blas64.General{Rows: rows, Cols: e.p, Stride: e.p, Data: s.tangents[:rows*e.p]}
	return s
}

// inside returns which of the stretch's points are those of its r-th row.
func (e *Composite) inside(s stretch, r int) (from, to int) {
	return int(e.start[s.first+r]) - s.from, int(e.start[s.first+r+1]) - s.from
}

// mix sets the rows' mixtures from the points' linear predictors.
func (e *Composite) mix(s stretch, eta []float64) {
	for r := 0; r < s.last-s.first; r++ {
		from, to := e.inside(s, r)
		e.mixer.MixTo(&s.mix[r], e.share[s.from+from:s.from+to], eta[from:to])
	}
}

// bend sets the rows' tangents from their mixtures.
func (e *Composite) bend(s stretch) {
	for r := 0; r < s.tangent.Rows; r++ {
		from, to := e.inside(s, r)
		blas64.Gemv(blas.Trans, 1, slab(s.x, from, to), vec(s.mix[r].First), 0, vec(s.tangent.Data[r*e.p:(r+1)*e.p]))
	}
}

// slab returns rows [from, to) of x.
func slab(x blas64.General, from, to int) blas64.General {
	x.Data = x.Data[from*x.Stride : to*x.Stride]
	x.Rows = to - from
	return x
}

// Pass visits every row once.
func (e *Composite) Pass(ctx context.Context, beta []float64, at RowFunc, gram Gram) error {
	p, sum := e.p, e.sums(gram)
	err := blocks.Sum(ctx, e.workers, len(e.share), sum, func(worker, from, to int, acc []float64) error {
		s := e.stretch(worker, from, to)
		rows := s.tangent.Rows
		if rows == 0 {
			return nil
		}
		eta := e.eta[s.from:s.to]
		multiply(eta, s.x, beta)
		e.mix(s, eta)
		e.bend(s)
		var along, weight, value [blocks.Size]float64
		multiply(along[:rows], s.tangent, beta)
		for r := range s.mix[:rows] {
			weight[r], value[r] = at(s.first+r, s.mix[r].Linear, along[r])
		}
		blas64.Gemv(blas.Trans, 1, s.tangent, vec(value[:rows]), 1, vec(acc[:p]))
		if gram == NoGram {
			return nil
		}
		copy(e.weight[s.first:s.last], weight[:rows])
		copy(e.value[s.first:s.last], value[:rows])
		e.addGram(acc[p:], s, weight[:rows], value[:rows], gram)
		return nil
	})
	if err != nil {
		return err
	}
	if gram != NoGram {
		e.kind = gram
	}
	e.take(sum)
	return nil
}

// addGram adds the rows' part of G to the upper triangle of acc; it overwrites weight.
func (e *Composite) addGram(acc []float64, s stretch, weight, value []float64, kind Gram) {
	if kind == Newton {
		own := s.eta[:s.x.Rows]
		for r := range weight {
			m := &s.mix[r]
			weight[r] -= value[r] * m.Bend
			from, _ := e.inside(s, r)
			for q, c := range m.Second {
				own[from+q] = -value[r] * c
			}
		}
		addGram(acc, s.x, own, s.block)
	}
	addGram(acc, s.tangent, weight, s.block)
}

// LinearTo writes the rows' linear predictors at beta to dst.
func (e *Composite) LinearTo(ctx context.Context, dst, beta []float64) error {
	return e.each(ctx, func(s stretch) {
		eta := s.eta[:s.x.Rows]
		multiply(eta, s.x, beta)
		e.mix(s, eta)
		for r := range s.mix[:s.tangent.Rows] {
			dst[s.first+r] = s.mix[r].Linear
		}
	})
}

// each calls f for every stretch of rows.
func (e *Composite) each(ctx context.Context, f func(s stretch)) error {
	n := len(e.share)
	return blocks.Do(ctx, e.workers, blocks.Count(n), func(worker, b int) error {
		from, to := blocks.Range(b, n)
		if s := e.stretch(worker, from, to); s.tangent.Rows > 0 {
			f(s)
		}
		return nil
	})
}

// TangentTo writes X d to dst.
func (e *Composite) TangentTo(ctx context.Context, dst, d []float64) error {
	return e.each(ctx, func(s stretch) {
		along := s.eta[:s.x.Rows]
		multiply(along, s.x, d)
		e.mix(s, e.eta[s.from:s.to])
		for r := range s.mix[:s.tangent.Rows] {
			from, to := e.inside(s, r)
			dst[s.first+r] = dot(s.mix[r].First, along[from:to])
		}
	})
}

// LeveragesTo writes x_i'H^-1 x_i to dst.
func (e *Composite) LeveragesTo(ctx context.Context, dst []float64) error {
	r := e.root()
	return e.each(ctx, func(s stretch) {
		e.mix(s, e.eta[s.from:s.to])
		e.bend(s)
		squaresTo(dst[s.first:s.last], s.tangent, r)
	})
}

// GramTraces returns tr(H^-1 dG).
func (e *Composite) GramTraces(ctx context.Context, moves []Motion) ([]float64, error) {
	r := e.root()
	return e.traces(ctx, moves, func(v, x blas64.General) {
		copy(v.Data, x.Data)
		blas64.Trsm(blas.Right, blas.NoTrans, 1, r, v)
	})
}

// EdfSlopes adds tr(M dG).
func (e *Composite) EdfSlopes(ctx context.Context, lambda []float64, moves []Motion) ([]float64, error) {
	out, half, _ := e.edfSlopes(lambda)
	if moves == nil {
		return out, nil
	}
	along, err := e.traces(ctx, moves, func(v, x blas64.General) { blas64.Gemm(blas.NoTrans, blas.Trans, 1, x, half, 0, v) })
	for j, t := range along {
		out[j] += t
	}
	return out, err
}

// traces returns tr(M dG) along each motion, for M = A A'; times writes X A to v for rows X. With h = x'M x of a row's
// tangent x, u_q = x_q'M x and m_q = x_q'M x_q, and with a = w - v k the weight of x x' in G, a row's part is
//
//	da h + 2 a sum_q dp_q u_q - sum_q (dv c_q + v dc_q) m_q.
func (e *Composite) traces(ctx context.Context, moves []Motion, times func(v, x blas64.General)) ([]float64, error) {
	sum := make([]float64, len(moves))
	err := blocks.Sum(ctx, e.workers, len(e.share), sum, func(worker, from, to int, acc []float64) error {
		s := e.stretch(worker, from, to)
		if s.tangent.Rows == 0 {
			return nil
		}
		e.mix(s, e.eta[s.from:s.to])
		own, cross := e.products(s, times)
		for j, move := range moves {
			along := s.eta[:s.x.Rows]
			multiply(along, s.x, move.Beta)
			for r := range s.mix[:s.tangent.Rows] {
				a, b := e.inside(s, r)
				acc[j] += e.trace(s.first+r, &s.mix[r], move, along[a:b], own[a:b], cross[a:b])
			}
		}
		return nil
	})
	return sum, err
}

// products returns m_q and u_q of every point.
func (e *Composite) products(s stretch, times func(v, x blas64.General)) (own, cross []float64) {
	v, tangent := s.x, make([]float64, e.p)
	s.times = slices.Grow(s.times[:0], len(s.x.Data))
	v.Data = s.times[:len(s.x.Data)]
	times(v, s.x)
	own, cross = make([]float64, v.Rows), make([]float64, v.Rows)
	for r := range s.mix[:s.tangent.Rows] {
		from, to := e.inside(s, r)
		part := slab(v, from, to)
		blas64.Gemv(blas.Trans, 1, part, vec(s.mix[r].First), 0, vec(tangent))
		multiply(cross[from:to], part, tangent)
		for q := from; q < to; q++ {
			at := vec(v.Data[q*e.p : (q+1)*e.p])
			own[q] = blas64.Dot(at, at)
		}
	}
	return own, cross
}

// trace returns row i's part of tr(M dG), given how its points' linear predictors move.
func (e *Composite) trace(i int, mix *response.Mixture, move Motion, along, own, cross []float64) float64 {
	v, dv := e.value[i], move.Score[i]
	if e.kind == Working { // G has no part of the scores
		v, dv = 0, 0
	}
	linear := dot(mix.First, along)
	a := e.weight[i] - v*mix.Bend
	sum := (move.Weight[i] - dv*mix.Bend - v*mix.BendSlope*linear) * dot(mix.First, cross)
	for q, p := range mix.First {
		c := mix.Second[q]
		dp, dc := mix.Bend*p*linear+c*along[q], mix.Bend*c*linear+mix.Third[q]*along[q]
		sum += 2*a*dp*cross[q] - (dv*c+v*dc)*own[q]
	}
	return sum
}

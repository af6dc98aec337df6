package penfit

import (
	"math"
	"slices"

	"drumlin/basis2d/blocks"
	"drumlin/spatial/response"
)

// Criterion says how the smoothness is chosen.
type Criterion int

const (
	REML  Criterion = iota // exact Laplace restricted likelihood
	GCV                    // generalised cross-validation; its unbiased-risk form where phi is known
	Given                  // lambda is given
	Quasi                  // restricted likelihood of the working model, with phi estimated although the distribution knows it
)

// evaluation is the criterion at one point, with the slopes of the mode there.
type evaluation struct {
	criterion Criterion
	at        []float64 // log lambda, then the shape if it is searched
	value     float64
	gradient  []float64
	db        [][]float64 // d beta/d at_j
}

// score returns the criterion at a point of the search, log lambda and then the shape if that is searched, with its
// gradient. It moves the mode there and leaves H factored with the weights the distribution's Curvature asks for.
func (f *fitter) score(c Criterion, at []float64) (value float64, gradient []float64, err error) {
	if f.last.at != nil && f.last.criterion == c && slices.Equal(f.last.at, at) {
		return f.last.value, slices.Clone(f.last.gradient), nil
	}
	lambda := exp(at[:f.Engine.Penalties()])
	if err := f.foresee(at, lambda); err != nil {
		return 0, nil, err
	}
	f.last = evaluation{}
	if err := f.mode(lambda); err != nil {
		return 0, nil, err
	}
	sb, db, err := f.modeSlopes(lambda)
	if err != nil {
		return 0, nil, err
	}
	moves, err := f.curvature(c, lambda, db)
	if err != nil {
		return 0, nil, err
	}
	if c == GCV {
		value, gradient, err = f.gcv(lambda, sb, moves)
	} else {
		value, gradient, err = f.reml(lambda, sb, moves)
	}
	if err == nil {
		f.last = evaluation{c, slices.Clone(at), value, slices.Clone(gradient), db}
	}
	return value, gradient, err
}

// modeSlopes returns S_j b, and how the mode moves with each point of the search: by the implicit function theorem, with
// H of the observed weights, db/d rho_j = -lambda_j H^-1 S_j b and db/d shape = H^-1 X'(d score/d shape).
func (f *fitter) modeSlopes(lambda []float64) (sb, db [][]float64, err error) {
	sb = make([][]float64, len(lambda))
	for j, l := range lambda {
		sb[j] = make([]float64, len(f.beta))
		f.Engine.PenaltyTo(sb[j], j, f.beta)
		d := make([]float64, len(f.beta))
		for k, v := range sb[j] {
			d[k] = -l * v
		}
		f.Engine.Solve(d)
		db = append(db, d)
	}
	if f.shaped == nil {
		return sb, db, nil
	}
	err = f.Engine.Pass(f.ctx, f.beta, func(i int, _, _ float64) (weight, value float64) {
		f.shape[i] = f.shaped.ShapeAt(f.Obs[i], f.eta[i])
		return 0, f.shape[i].Score
	}, NoGram)
	d := slices.Clone(f.Engine.Score())
	f.Engine.Solve(d)
	return sb, append(db, d), err
}

// curvature leaves H factored with the weights that count for the determinant, and returns how the fit moves with each
// point of the search. Cross-validation of curved predictors counts degrees of freedom of the linearised model: the true G
// need not be positive, and would count them below zero where the penalty is weak.
func (f *fitter) curvature(c Criterion, lambda []float64, db [][]float64) ([]Motion, error) {
	moves := make([]Motion, len(db))
	for j := range db {
		moves[j].Beta = db[j]
	}
	if f.Dist.ConstantWeight() {
		return moves, nil
	}
	expected := f.Dist.Curvature() == response.Expected
	if expected || c == GCV && f.Engine.Curved() {
		if _, err := f.evaluate(f.beta, f.Dist.Curvature(), Working); err != nil {
			return nil, err
		}
		if !f.Engine.Factor(lambda) {
			return nil, ErrSingular
		}
	}
	for j := range moves {
		along := make([]float64, len(f.Obs))
		if err := f.Engine.TangentTo(f.ctx, along, db[j]); err != nil {
			return nil, err
		}
		moves[j].Weight, moves[j].Score = along, make([]float64, len(f.Obs))
		for i, d := range along {
			pt, own := f.point[i], response.ShapePoint{}
			if j == len(lambda) { // the shape moves weights and scores by itself as well
				own = f.shape[i]
			}
			moves[j].Score[i] = own.Score - pt.Weight*d
			if expected {
				moves[j].Weight[i] = d*pt.ExpectedSlope + own.Expected
			} else {
				moves[j].Weight[i] = d*pt.Slope + own.Weight
			}
		}
	}
	return moves, nil
}

// reml returns the restricted likelihood criterion with phi, where unknown, at its own minimum; by the envelope
// theorem the gradient is the partial one.
func (f *fitter) reml(lambda []float64, sb [][]float64, moves []Motion) (float64, []float64, error) {
	phi, err := f.remlScale()
	if err != nil {
		return 0, nil, err
	}
	sums, err := f.saturation(phi)
	if err != nil {
		return 0, nil, err
	}
	logdet, rank := f.Engine.LogDetPenalty(lambda)
	null := float64(f.Engine.NullDim())
	v := (f.deviance+f.penalty)/(2*phi) - sums.value + (f.Engine.LogDet()-logdet)/2 - null/2*math.Log(2*math.Pi*phi)
	g, trace := make([]float64, len(lambda)), f.Engine.Traces()
	for j, l := range lambda {
		g[j] = l*dot(sb[j], f.beta)/(2*phi) + (l*trace[j]-rank[j])/2
	}
	if f.shaped != nil {
		own := 0.0
		for _, s := range f.shape {
			own += s.Deviance / (2 * phi)
		}
		g = append(g, own-sums.shape)
	}
	if f.Dist.ConstantWeight() || len(g) == 0 {
		return v, g, nil
	}
	traces, err := f.Engine.GramTraces(f.ctx, moves)
	for j, t := range traces {
		g[j] += t / 2
	}
	return v, g, err
}

// remlScale returns phi: 1 where known, else where V is least for the mode at hand,
//
//	D_p/(2 phi) + sum_i dl_s/dlog phi + M/2 = 0.
//
// For the normal distribution, whose saturated likelihood depends on phi as -n/2 log phi, that is D_p/(n - M). A fit
// without any residual keeps a positive phi, so that the criterion stays finite.
func (f *fitter) remlScale() (float64, error) {
	if _, ok := f.Dist.(response.Dispersed); f.Dist.KnownDispersion() || !ok {
		return 1, nil
	}
	n, null := float64(len(f.Obs)), float64(f.Engine.NullDim())
	penalised := f.deviance + f.penalty
	least := 1e-24 * f.scale / n
	phi := math.Max(penalised/(n-null), least)
	if f.Dist.Name() == "gaussian" {
		return phi, nil
	}
	from := phi
	if f.sums.phi > least { // it moves little from one point of the search to the next
		from = f.sums.phi
	}
	var err error
	precision := rising(func(u float64) float64 { // nearly a straight line in 1/phi
		if err != nil {
			return 0
		}
		var s saturation
		s, err = f.saturation(1 / u)
		return (penalised*u+null)/2 + s.scale
	}, 1/from, penalised/2, 1/least)
	return 1 / precision, err
}

// rising returns the root of a rising function of u > 0, or most where it is below zero up to there, by secants inside a
// bracket; it begins at u with a guess of the slope. The last call of f is at what is returned.
func rising(f func(u float64) float64, u, slope, most float64) float64 {
	lo, hi := 0.0, math.Inf(1)
	var before, was float64 // the last u and its value
	for n := 0; n < 200; n++ {
		v := f(u)
		if v == 0 || math.IsNaN(v) {
			break
		}
		if v < 0 {
			lo = u
		} else {
			hi = u
		}
		if n > 0 && v != was {
			slope = (v - was) / (u - before)
		}
		next := u - v/slope
		if !(next > lo && next < hi) {
			next = (lo + hi) / 2
		}
		next = math.Min(most, math.Max(u/100, math.Min(100*u, next)))
		if math.Abs(next-u) <= 1e-14*u {
			break
		}
		before, was, u = u, v, next
	}
	return u
}

// saturation holds what the rows' saturated log-likelihoods sum to at a dispersion, with the derivatives of the sum in
// log phi and in the working shape, 0 where there is none.
type saturation struct {
	dist                     response.Distribution
	phi, value, scale, shape float64
}

// saturation returns the sums at phi; the last ones are remembered.
func (f *fitter) saturation(phi float64) (saturation, error) {
	if f.sums.dist == f.Dist && f.sums.phi == phi {
		return f.sums, nil
	}
	row := f.saturatedRow()
	sum := make([]float64, 3)
	err := blocks.Sum(f.ctx, f.Workers, len(f.Obs), sum, func(_, from, to int, acc []float64) error {
		for _, o := range f.Obs[from:to] {
			value, scale, shape := row(o, phi)
			acc[0] += value
			acc[1] += scale
			acc[2] += shape
		}
		return nil
	})
	if err != nil {
		return saturation{}, err
	}
	f.sums = saturation{f.Dist, phi, sum[0], sum[1], sum[2]}
	return f.sums, nil
}

// saturatedRow returns a row's part of them. A distribution whose three parts come from one sum says so.
func (f *fitter) saturatedRow() func(o response.Obs, phi float64) (value, scale, shape float64) {
	if d, ok := f.Dist.(interface {
		SaturatedSlopes(o response.Obs, phi float64) (value, scale, working float64)
	}); ok {
		return d.SaturatedSlopes
	}
	dispersed, _ := f.Dist.(response.Dispersed)
	return func(o response.Obs, phi float64) (value, scale, shape float64) {
		if dispersed != nil {
			scale = dispersed.ScaleSlope(o, phi)
		}
		if f.shaped != nil {
			shape = f.shaped.SaturatedSlope(o, phi)
		}
		return f.Dist.Saturated(o, phi), scale, shape
	}
}

// gcv returns n D/(n - edf)^2, or D/n - 1 + 2 edf/n where phi is known to be 1.
func (f *fitter) gcv(lambda []float64, sb [][]float64, moves []Motion) (float64, []float64, error) {
	n, edf := float64(len(f.Obs)), f.edf(lambda)
	along := moves
	if f.Dist.ConstantWeight() {
		along = nil
	}
	dEdf, err := f.Engine.EdfSlopes(f.ctx, lambda, along)
	if err != nil {
		return 0, nil, err
	}
	sum := make([]float64, len(f.beta)) // S_lambda b, which is X'u at the mode
	for j, l := range lambda {
		for k, v := range sb[j] {
			sum[k] += l * v
		}
	}
	g := make([]float64, len(lambda))
	if f.Dist.KnownDispersion() {
		for j := range g {
			g[j] = (-2*dot(sum, moves[j].Beta) + 2*dEdf[j]) / n
		}
		return f.deviance/n - 1 + 2*edf/n, g, nil
	}
	free := n - edf
	for j := range g {
		g[j] = n/(free*free)*-2*dot(sum, moves[j].Beta) + 2*n*f.deviance/(free*free*free)*dEdf[j]
	}
	return n * f.deviance / (free * free), g, nil
}

// edf returns tr(H^-1 G) for the H at hand.
func (f *fitter) edf(lambda []float64) float64 {
	edf := float64(f.Engine.Coefs())
	for j, t := range f.Engine.Traces() {
		edf -= lambda[j] * t
	}
	return edf
}

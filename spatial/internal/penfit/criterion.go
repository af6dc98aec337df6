package penfit

import (
	"math"
	"slices"

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
	weights, err := f.curvature(lambda, db)
	if err != nil {
		return 0, nil, err
	}
	if c == GCV {
		value, gradient, err = f.gcv(lambda, sb, db, weights)
	} else {
		value, gradient, err = f.reml(lambda, sb, weights)
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
	err = f.Engine.Pass(f.ctx, f.beta, func(i int, _ float64) (weight, value float64) {
		f.shape[i] = f.shaped.ShapeAt(f.Obs[i], f.eta[i])
		return 0, f.shape[i].Score
	}, false)
	d := slices.Clone(f.Engine.Score())
	f.Engine.Solve(d)
	return sb, append(db, d), err
}

// curvature leaves H factored with the weights that count for the determinant, and returns how the rows' weights move
// with each point of the search; nil where they do not.
func (f *fitter) curvature(lambda []float64, db [][]float64) ([][]float64, error) {
	if f.Dist.ConstantWeight() {
		return nil, nil
	}
	expected := f.Dist.Curvature() == response.Expected
	if expected {
		if _, err := f.evaluate(f.beta, response.Expected, true); err != nil {
			return nil, err
		}
		if !f.Engine.Factor(lambda) {
			return nil, ErrSingular
		}
	}
	moves := make([][]float64, len(db))
	for j := range db {
		moves[j] = make([]float64, len(f.Obs))
		if err := f.Engine.LinearTo(f.ctx, moves[j], db[j]); err != nil {
			return nil, err
		}
		for i := range moves[j] {
			slope, own := f.point[i].Slope, 0.0
			if expected {
				slope = f.point[i].ExpectedSlope
			}
			if j == len(lambda) { // the shape moves weights by itself as well
				own = f.shape[i].Weight
				if expected {
					own = f.shape[i].Expected
				}
			}
			moves[j][i] = moves[j][i]*slope + own
		}
	}
	return moves, nil
}

// reml returns the restricted likelihood criterion with phi, where unknown, at its own minimum; by the envelope
// theorem the gradient is the partial one.
func (f *fitter) reml(lambda []float64, sb, weights [][]float64) (float64, []float64, error) {
	phi := f.remlScale()
	logdet, rank := f.Engine.LogDetPenalty(lambda)
	null := float64(f.Engine.NullDim())
	v := (f.deviance+f.penalty)/(2*phi) - f.saturated(phi) + (f.Engine.LogDet()-logdet)/2 - null/2*math.Log(2*math.Pi*phi)
	g, trace := make([]float64, len(lambda)), f.Engine.Traces()
	for j, l := range lambda {
		g[j] = l*dot(sb[j], f.beta)/(2*phi) + (l*trace[j]-rank[j])/2
	}
	if f.shaped != nil {
		own := 0.0
		for i, o := range f.Obs {
			own += f.shape[i].Deviance/(2*phi) - f.shaped.SaturatedSlope(o, phi)
		}
		g = append(g, own)
	}
	if weights == nil || len(g) == 0 {
		return v, g, nil
	}
	h := make([]float64, len(f.Obs))
	if err := f.Engine.LeveragesTo(f.ctx, h); err != nil {
		return 0, nil, err
	}
	for j := range g {
		g[j] += dot(weights[j], h) / 2
	}
	return v, g, nil
}

// remlScale returns phi: 1 where known, else where V is least for the mode at hand,
//
//	D_p/(2 phi) + sum_i dl_s/dlog phi + M/2 = 0.
//
// For the normal distribution, whose saturated likelihood depends on phi as -n/2 log phi, that is D_p/(n - M). A fit
// without any residual keeps a positive phi, so that the criterion stays finite.
func (f *fitter) remlScale() float64 {
	dispersed, ok := f.Dist.(response.Dispersed)
	if f.Dist.KnownDispersion() || !ok {
		return 1
	}
	n, null := float64(len(f.Obs)), float64(f.Engine.NullDim())
	penalised := f.deviance + f.penalty
	least := 1e-24 * f.scale / n
	phi := math.Max(penalised/(n-null), least)
	if dispersed.Name() == "gaussian" {
		return phi
	}
	excess := func(logPhi float64) float64 {
		sum := penalised/(2*math.Exp(logPhi)) + null/2
		for _, o := range f.Obs {
			sum += dispersed.ScaleSlope(o, math.Exp(logPhi))
		}
		return sum
	}
	return math.Max(math.Exp(falling(excess, math.Log(phi))), least)
}

// falling returns the root of a falling function near x, to rounding: a bracket is widened from x, then closed by
// regula falsi (Illinois form) with bisection where that is slow.
func falling(f func(float64) float64, x float64) float64 {
	lo, hi, step := x, x, 0.5
	flo := f(lo)
	fhi := flo
	for ; flo < 0 && step < 1e3; step *= 2 {
		hi, fhi = lo, flo
		lo -= step
		flo = f(lo)
	}
	for step = 0.5; fhi > 0 && step < 1e3; step *= 2 {
		lo, flo = hi, fhi
		hi += step
		fhi = f(hi)
	}
	wlo, whi := flo, fhi // weights of the Illinois form
	for n := 0; n < 200 && hi-lo > 1e-15*math.Max(1, math.Abs(lo)); n++ {
		mid := (lo*whi - hi*wlo) / (whi - wlo)
		if !(mid > lo && mid < hi) || n%8 == 7 {
			mid = (lo + hi) / 2
		}
		switch v := f(mid); {
		case v == 0:
			return mid
		case v > 0:
			lo, wlo = mid, v
			whi /= 2
		default:
			hi, whi = mid, v
			wlo /= 2
		}
		if mid == lo && lo+1e-15*math.Max(1, math.Abs(lo)) >= hi {
			break
		}
	}
	return (lo + hi) / 2
}

func (f *fitter) saturated(phi float64) (l float64) {
	for _, o := range f.Obs {
		l += f.Dist.Saturated(o, phi)
	}
	return l
}

// gcv returns n D/(n - edf)^2, or D/n - 1 + 2 edf/n where phi is known to be 1.
func (f *fitter) gcv(lambda []float64, sb, db, weights [][]float64) (float64, []float64, error) {
	n, edf := float64(len(f.Obs)), f.edf(lambda)
	dEdf, err := f.Engine.EdfSlopes(f.ctx, lambda, weights)
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
			g[j] = (-2*dot(sum, db[j]) + 2*dEdf[j]) / n
		}
		return f.deviance/n - 1 + 2*edf/n, g, nil
	}
	free := n - edf
	for j := range g {
		g[j] = n/(free*free)*-2*dot(sum, db[j]) + 2*n*f.deviance/(free*free*free)*dEdf[j]
	}
	return n * f.deviance / (free * free), g, nil
}

// edf returns tr(H^-1 X'WX) for the H at hand.
func (f *fitter) edf(lambda []float64) float64 {
	edf := float64(f.Engine.Coefs())
	for j, t := range f.Engine.Traces() {
		edf -= lambda[j] * t
	}
	return edf
}

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
)

// evaluation is the criterion at one point, with the slopes of the mode there.
type evaluation struct {
	criterion Criterion
	rho       []float64
	value     float64
	gradient  []float64
	db        [][]float64 // d beta/d rho_j
}

// score returns the criterion at log lambda rho and its gradient. It moves the mode there and leaves H factored with
// the weights the distribution's Curvature asks for.
func (f *fitter) score(c Criterion, rho []float64) (value float64, gradient []float64, err error) {
	if f.last.rho != nil && f.last.criterion == c && slices.Equal(f.last.rho, rho) {
		return f.last.value, slices.Clone(f.last.gradient), nil
	}
	lambda := exp(rho)
	if f.last.rho != nil {
		step := make([]float64, len(rho))
		for j := range step {
			step[j] = rho[j] - f.last.rho[j]
		}
		if err := f.foresee(step, lambda); err != nil {
			return 0, nil, err
		}
	}
	f.last = evaluation{}
	if err := f.mode(lambda); err != nil {
		return 0, nil, err
	}
	sb, db := f.modeSlopes(lambda)
	slopes, err := f.curvature(lambda, db)
	if err != nil {
		return 0, nil, err
	}
	if c == GCV {
		value, gradient, err = f.gcv(lambda, sb, db, slopes)
	} else {
		value, gradient, err = f.reml(lambda, sb, slopes)
	}
	if err == nil {
		f.last = evaluation{c, slices.Clone(rho), value, slices.Clone(gradient), db}
	}
	return value, gradient, err
}

// modeSlopes returns S_j b and db/d rho_j = -lambda_j H^-1 S_j b with H of the observed weights, by the implicit
// function theorem.
func (f *fitter) modeSlopes(lambda []float64) (sb, db [][]float64) {
	sb, db = make([][]float64, len(lambda)), make([][]float64, len(lambda))
	for j, l := range lambda {
		sb[j], db[j] = make([]float64, len(f.beta)), make([]float64, len(f.beta))
		f.Engine.PenaltyTo(sb[j], j, f.beta)
		for k, v := range sb[j] {
			db[j][k] = -l * v
		}
		f.Engine.Solve(db[j])
	}
	return sb, db
}

// curvature leaves H factored with the weights that count for the determinant, and returns how the rows' weights move
// with each log lambda; nil where they do not.
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
	slopes := make([][]float64, len(lambda))
	for j := range lambda {
		slopes[j] = make([]float64, len(f.Obs))
		if err := f.Engine.LinearTo(f.ctx, slopes[j], db[j]); err != nil {
			return nil, err
		}
		for i := range slopes[j] {
			if expected {
				slopes[j][i] *= f.point[i].ExpectedSlope
			} else {
				slopes[j][i] *= f.point[i].Slope
			}
		}
	}
	return slopes, nil
}

// reml returns the restricted likelihood criterion with phi, where unknown, at its own minimum; by the envelope
// theorem the gradient in rho is the partial one.
func (f *fitter) reml(lambda []float64, sb, slopes [][]float64) (float64, []float64, error) {
	phi := f.remlScale()
	logdet, rank := f.Engine.LogDetPenalty(lambda)
	null := float64(f.Engine.NullDim())
	v := (f.deviance+f.penalty)/(2*phi) - f.saturated(phi) + (f.Engine.LogDet()-logdet)/2 - null/2*math.Log(2*math.Pi*phi)
	g, trace := make([]float64, len(lambda)), f.Engine.Traces()
	for j, l := range lambda {
		g[j] = l*dot(sb[j], f.beta)/(2*phi) + (l*trace[j]-rank[j])/2
	}
	if slopes == nil || len(lambda) == 0 {
		return v, g, nil
	}
	h := make([]float64, len(f.Obs))
	if err := f.Engine.LeveragesTo(f.ctx, h); err != nil {
		return 0, nil, err
	}
	for j := range g {
		g[j] += dot(slopes[j], h) / 2
	}
	return v, g, nil
}

// remlScale returns phi: 1 where known, else where V is least for the mode at hand. For the normal distribution the
// saturated likelihood depends on phi as -n/2 log phi, so that is D_p/(n - M). A fit without any residual keeps a
// positive phi, so that the criterion stays finite.
func (f *fitter) remlScale() float64 {
	if f.Dist.KnownDispersion() {
		return 1
	}
	n := float64(len(f.Obs))
	return math.Max((f.deviance+f.penalty)/(n-float64(f.Engine.NullDim())), 1e-24*f.scale/n)
}

func (f *fitter) saturated(phi float64) (l float64) {
	for _, o := range f.Obs {
		l += f.Dist.Saturated(o, phi)
	}
	return l
}

// gcv returns n D/(n - edf)^2, or D/n - 1 + 2 edf/n where phi is known to be 1.
func (f *fitter) gcv(lambda []float64, sb, db, slopes [][]float64) (float64, []float64, error) {
	n, edf := float64(len(f.Obs)), f.edf(lambda)
	dEdf, err := f.Engine.EdfSlopes(f.ctx, lambda, slopes)
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

package penfit

import (
	"context"
	"math"

	"drumlin/spatial/response"
)

// Result is a fit. The engine is left with H factored at it.
type Result struct {
	Beta   []float64
	Eta    []float64 // linear predictor at the rows, offset included
	Lambda []float64

	Deviance, Penalty float64
	Constant          float64   // deviance with one mean a unit of exposure
	Phi               float64   // dispersion: 1 if known, else estimated; NaN where nothing is left to estimate it from
	Pearson           float64   // sum of squared Pearson residuals over n - edf
	Edf               float64   // tr(H^-1 G)
	TermEdf           []float64 // the part of it that is each penalty's: rank - lambda_j tr(H^-1 S_j)
	Value             float64   // of the criterion, in the engine's own coefficients; NaN if lambda was given as 0
	Gradient          float64   // projected gradient at the end of the search
	AtUpper           []bool    // log lambda ended at the top of its box: the term is its null space
	Given             []bool    // lambda was given
	Iterations        int       // of the search
	Passes            int       // visits to the rows
	Converged         bool
	LogLikelihood     float64

	Dist                       response.Distribution // with the shape that was found
	ShapeAtLower, ShapeAtUpper bool                  // the shape ended at a bound of its box
}

// Fit fits p. For Given and Quasi, lambda may hold smoothing parameters, NaN for one that is to be chosen; otherwise it is
// nil. Trouble is ErrSeparated, ErrSingular or ErrNoMode; a search that stops early is a Result that is not
// Converged.
func Fit(ctx context.Context, p Problem, c Criterion, lambda []float64) (*Result, error) {
	f := newFitter(ctx, p)
	at, err := f.search(c, lambda)
	if err != nil {
		return nil, err
	}
	r := at.result
	if r.Value, _, err = f.final(c, at.x); err != nil {
		return nil, err
	}
	if f.flatten(at, r.AtUpper) {
		if r.Value, _, err = f.final(c, at.x); err != nil {
			return nil, err
		}
	}
	r.Beta, r.Eta, r.Lambda, r.Dist = f.beta, f.eta, exp(at.x[:p.Engine.Penalties()]), f.Dist
	r.Given = make([]bool, len(r.Lambda))
	for j, l := range lambda {
		r.Given[j] = !math.IsNaN(l)
	}
	r.Deviance, r.Penalty, r.Passes = f.deviance, f.penalty, f.passes
	r.Edf = f.edf(r.Lambda)
	_, rank := f.Engine.LogDetPenalty(r.Lambda)
	for j, t := range f.Engine.Traces() {
		r.TermEdf = append(r.TermEdf, rank[j]-r.Lambda[j]*t)
	}
	if r.Constant, err = f.constantDeviance(f.overall()); err != nil {
		return nil, err
	}
	return &r, f.scales(c, &r)
}

// found is where the search ended: log lambda, then the shape if it is searched.
type found struct {
	x, lo, hi []float64
	result    Result
}

// flatEdf is how many degrees of freedom beyond its null space a term may keep and still count as its null space.
const flatEdf = 1e-3

// flatten moves the terms that the search left on the plateau below the top of the box, where the criterion no longer
// changes, to the top, so that neither AtUpper nor lambda depends on where the search happened to stop. It reports
// whether any moved.
func (f *fitter) flatten(at found, upper []bool) (moved bool) {
	lambda := exp(at.x[:len(upper)])
	_, rank := f.Engine.LogDetPenalty(lambda)
	for j, t := range f.Engine.Traces() {
		if !upper[j] && at.lo[j] < at.hi[j] && rank[j]-lambda[j]*t < flatEdf {
			at.x[j], upper[j], moved = at.hi[j], true, true
		}
	}
	return moved
}

// search finds log lambda, where it is not given, and the shape, if that is to be estimated.
func (f *fitter) search(c Criterion, lambda []float64) (found, error) {
	if lambda == nil {
		lambda = make([]float64, f.Engine.Penalties())
		for j := range lambda {
			lambda[j] = math.NaN()
		}
	}
	rho, err := f.start(logs(lambda))
	if err != nil {
		return found{}, err
	}
	at := f.boxes(rho, logs(lambda))
	if !at.open() {
		at.result = Result{Converged: true, AtUpper: make([]bool, len(rho))}
		return at, nil
	}
	if c == Quasi {
		return f.quasi(at)
	}
	objective := f.objective(c)
	if c == GCV {
		at.x = f.scan(objective, at.x, at.lo, at.hi)
	}
	m, err := f.minimiseFrom(c, objective, at)
	if err != nil {
		return found{}, err
	}
	at.x = m.x
	at.result = Result{Gradient: m.projected, Iterations: m.iterations, Converged: m.converged, AtUpper: make([]bool, len(rho))}
	for j := range rho {
		at.result.AtUpper[j] = m.x[j] >= at.hi[j]-1e-9 && at.lo[j] < at.hi[j]
	}
	if k := len(rho); f.shaped != nil {
		at.result.ShapeAtLower, at.result.ShapeAtUpper = m.x[k] <= at.lo[k]+1e-9, m.x[k] >= at.hi[k]-1e-9
	}
	return at, nil
}

func logs(lambda []float64) []float64 {
	rho := make([]float64, len(lambda))
	for j, l := range lambda {
		rho[j] = math.Log(l)
	}
	return rho
}

// open reports whether there is anything to search.
func (at found) open() bool {
	for j := range at.x {
		if at.lo[j] < at.hi[j] {
			return true
		}
	}
	return false
}

// boxes lays out the search: its starting point and its bounds, which for a given lambda are one.
func (f *fitter) boxes(rho, given []float64) found {
	at := found{x: rho}
	at.lo, at.hi = f.Engine.Range()
	for j, g := range given {
		if !math.IsNaN(g) {
			at.lo[j], at.hi[j] = g, g
		}
	}
	if f.shaped != nil {
		lo, hi := f.shaped.Box()
		at.x, at.lo, at.hi = join(at.x, f.shaped.Working()), join(at.lo, lo), join(at.hi, hi)
	}
	if at.open() { // beside a search, an interpolation is one to rounding
		low, _ := f.Engine.Range()
		for j := range rho {
			at.x[j], at.lo[j], at.hi[j] = math.Max(at.x[j], low[j]), math.Max(at.lo[j], low[j]), math.Max(at.hi[j], low[j])
		}
	}
	return at
}

func join(v []float64, last float64) []float64 { return append(append([]float64(nil), v...), last) }

// minimiseFrom searches from a point. It may be out of reach of the iterations although smoother ones are not: then the
// search goes up until there is one that is not.
func (f *fitter) minimiseFrom(c Criterion, objective objective, at found) (minimum, error) {
	x := append([]float64(nil), at.x...)
	m, err := minimise(f.ctx, objective, x, at.lo, at.hi)
	for try := 0; try < 3 && err == nil && math.IsInf(m.value, 1); try++ {
		for j := 0; j < f.Engine.Penalties(); j++ {
			x[j] = math.Min(at.hi[j], x[j]+4)
		}
		m, err = minimise(f.ctx, objective, x, at.lo, at.hi)
	}
	if err == nil && math.IsInf(m.value, 1) {
		_, _, err = f.score(c, x)
	}
	return m, err
}

// objective wraps score for the search: numerical trouble at one point is an infinite value, so that the search halves
// its step, and cross-validation is put on the scale of a log-likelihood, so that step lengths suit both criteria.
func (f *fitter) objective(c Criterion) objective {
	if c == Given {
		c = REML // of the shape
	}
	return func(at []float64) (float64, []float64, error) {
		kept := append([]float64(nil), f.beta...)
		v, g, err := f.score(c, at)
		if err != nil && numerical(err) {
			copy(f.beta, kept)
			f.current = false
			return math.Inf(1), make([]float64, len(at)), nil
		}
		if err == nil && c == GCV {
			v, g = f.likelihoodScale(v, g)
		}
		return v, g, err
	}
}

// likelihoodScale turns a cross-validation score into n/2 times its logarithm, or n/2 times the unbiased-risk form,
// with its gradient.
func (f *fitter) likelihoodScale(v float64, g []float64) (float64, []float64) {
	half := float64(len(f.Obs)) / 2
	scale := half
	if f.Dist.KnownDispersion() {
		v *= half
	} else {
		scale /= v
		v = half * math.Log(v)
	}
	for j := range g {
		g[j] *= scale
	}
	return v, g
}

// scan guards cross-validation, which can have several minima, against a poor one where there is one log lambda: it
// returns the best of a coarse sweep through the box.
func (f *fitter) scan(objective objective, rho, lo, hi []float64) []float64 {
	if len(rho) != 1 {
		return rho
	}
	best, at := math.Inf(1), rho
	for r := hi[0] - 4; r > lo[0]+12; r -= 1.5 {
		v, _, err := objective([]float64{r})
		if err == nil && v < best {
			best, at = v, []float64{r}
		}
	}
	return at
}

// final evaluates everything at the chosen log lambda; the criterion of an interpolation, lambda 0, has no value.
func (f *fitter) final(c Criterion, at []float64) (value float64, gradient []float64, err error) {
	if c != GCV {
		c = REML
	}
	value, gradient, err = f.score(c, at)
	for _, r := range at[:f.Engine.Penalties()] {
		if math.IsInf(r, -1) {
			value = math.NaN()
		}
	}
	return value, gradient, err
}

// scales sets dispersion, Pearson statistic and log-likelihood.
func (f *fitter) scales(c Criterion, r *Result) (err error) {
	free := float64(len(f.Obs)) - r.Edf
	var pearson float64
	for i, o := range f.Obs {
		pearson += f.Dist.Pearson(o, f.eta[i])
	}
	r.Pearson = pearson / free
	if free < 1e-8*float64(len(f.Obs)) {
		r.Pearson = math.NaN()
	}
	r.Phi = r.Pearson
	if c != Quasi && (f.Dist.KnownDispersion() || c == REML) {
		if r.Phi, err = f.remlScale(); err != nil {
			return err
		}
	}
	for i, o := range f.Obs {
		r.LogLikelihood += f.Dist.LogLikelihood(o, f.eta[i], r.Phi)
	}
	return nil
}

package penfit

import (
	"context"
	"errors"
	"math"
	"slices"

	"drumlin/spatial/response"
)

// Problem is what is to be fitted.
type Problem struct {
	Engine Engine
	Dist   response.Distribution
	Obs    []response.Obs
	Offset []float64 // of the linear predictor, one a row; nil means none
	// Start is where the search begins, log lambda; nil means that a start is found.
	Start []float64
	// EstimateShape has the shape of a response.Shaped searched beside the smoothness; Dist's own is where it starts.
	EstimateShape bool
	Workers       int // goroutines; 0 means one a processor
}

// ErrSeparated says that the likelihood has no maximum: some linear predictors run off to infinity.
var ErrSeparated = errors.New("the likelihood grows without bound: the fit is separated")

// ErrSingular says that the penalised normal equations have no solution.
var ErrSingular = errors.New("the penalised normal equations are singular")

// ErrNoMode says that the iterations for the coefficients did not settle.
var ErrNoMode = errors.New("the coefficients did not settle")

const (
	modeSteps = 100   // Newton steps for one mode
	modeTol   = 1e-24 // squared length of the next step in the metric of H, against the deviances' size
	modeFloor = 1e-14 // below this a step that no longer shrinks counts as rounding
)

// fitter carries the state of a fit: the current coefficients with everything evaluated at them.
type fitter struct {
	Problem
	ctx context.Context

	beta     []float64
	eta      []float64 // offset included
	point    []response.Point
	deviance float64
	penalty  float64
	moved    float64 // largest change of a linear predictor in the last accepted step
	scale    float64 // deviance of a constant fit
	size     float64 // what a small deviance is measured against: scale, or the rows' weight where phi is known

	haveGram bool // a Gram matrix is at hand that stays true: constant weights
	current  bool // the last pass was at beta, with a Gram matrix of observed weights
	passes   int
	last     evaluation
	sums     saturation // at the last dispersion

	shaped response.Shaped       // Dist, where its shape is searched
	shape  []response.ShapePoint // of each row at the mode
}

func newFitter(ctx context.Context, p Problem) *fitter {
	n, k := len(p.Obs), p.Engine.Coefs()
	f := &fitter{Problem: p, ctx: ctx, beta: make([]float64, k), eta: make([]float64, n), point: make([]response.Point, n)}
	if shaped, ok := p.Dist.(response.Shaped); ok && p.EstimateShape {
		f.shaped, f.shape = shaped, make([]response.ShapePoint, n)
	}
	return f
}

func (f *fitter) offset(i int) float64 {
	if f.Offset == nil {
		return 0
	}
	return f.Offset[i]
}

// evaluate visits the rows at beta and leaves the Gram matrix asked for, with the given weights. Where weights are constant
// the matrix is made once.
func (f *fitter) evaluate(beta []float64, c response.Curvature, gram Gram) (deviance float64, err error) {
	f.current = false
	if f.haveGram {
		gram = NoGram
	}
	err = f.Engine.Pass(f.ctx, beta, func(i int, linear, _ float64) (weight, value float64) {
		eta := linear + f.offset(i)
		f.eta[i] = eta
		pt := f.Dist.At(f.Obs[i], eta)
		if math.IsNaN(pt.Deviance) || math.IsInf(pt.Weight, 0) || math.IsNaN(pt.Weight) {
			pt = response.Point{Deviance: math.Inf(1)}
		}
		f.point[i] = pt
		if c == response.Expected {
			return pt.Expected, pt.Score
		}
		return pt.Weight, pt.Score
	}, gram)
	if err != nil {
		return 0, err
	}
	f.passes++
	if gram != NoGram {
		f.haveGram = f.Dist.ConstantWeight()
	}
	for i := range f.point {
		deviance += f.point[i].Deviance
	}
	if math.IsNaN(deviance) {
		deviance = math.Inf(1)
	}
	return deviance, nil
}

// penaltyAt returns b'S_lambda b and writes S_lambda b to dst.
func (f *fitter) penaltyAt(dst, lambda, beta []float64) (value float64) {
	clear(dst)
	sb := make([]float64, len(beta))
	for j, l := range lambda {
		f.Engine.PenaltyTo(sb, j, beta)
		for k, v := range sb {
			dst[k] += l * v
			value += l * v * beta[k]
		}
	}
	return value
}

// mode moves beta to the minimum of the penalised deviance by Newton's method with step halving, and leaves H factored
// there with observed weights. Where observed weights make H indefinite the expected ones give the step.
func (f *fitter) mode(lambda []float64) error {
	k := len(f.beta)
	sb, step, trial := make([]float64, k), make([]float64, k), make([]float64, k)
	if !f.current {
		var err error
		if f.deviance, err = f.evaluate(f.beta, response.Observed, Newton); err != nil {
			return err
		}
		f.current = true
	}
	f.penalty = f.penaltyAt(sb, lambda, f.beta)
	before, moved := math.Inf(1), 0.0
	for n := 0; n < modeSteps; n++ {
		if err := f.factor(lambda); err != nil {
			return err
		}
		for i, s := range f.Engine.Score() {
			step[i] = s - sb[i]
		}
		gradient := append([]float64(nil), step...)
		f.Engine.Solve(step)
		length := dot(step, gradient)
		ref := f.size + f.deviance + f.penalty
		if length <= modeTol*ref || length < modeFloor*ref && length > before/4 {
			if moved > 0.1 && !f.Dist.ConstantWeight() {
				return ErrSeparated
			}
			return nil
		}
		before = length
		if math.IsNaN(length) {
			return ErrSingular
		}
		if err := f.advance(lambda, step, trial, sb, length < 1e-12*ref); err != nil {
			return err
		}
		moved = f.moved
	}
	if moved > 0.1 {
		return ErrSeparated
	}
	return ErrNoMode
}

// factor factors H at the current point, with expected weights if the observed ones will not do.
func (f *fitter) factor(lambda []float64) error {
	if f.Engine.Factor(lambda) {
		return nil
	}
	if f.Dist.ConstantWeight() {
		return ErrSingular
	}
	if _, err := f.evaluate(f.beta, response.Expected, Working); err != nil {
		return err
	}
	if !f.Engine.Factor(lambda) {
		return ErrSingular
	}
	return nil
}

// foresee takes the shape to its new value and moves beta to where the mode will be, to first order. The move is dropped
// if it makes matters worse.
func (f *fitter) foresee(at, lambda []float64) error {
	if f.shaped != nil {
		if s := at[len(lambda)]; s != f.shaped.Working() {
			f.reshape(f.shaped.WithWorking(s))
		}
	}
	if f.Dist.ConstantWeight() || f.last.at == nil {
		return nil // for constant weights one Newton step leads there from anywhere
	}
	trial := append([]float64(nil), f.beta...)
	for j, d := range f.last.db {
		for k, v := range d {
			trial[k] += (at[j] - f.last.at[j]) * v
		}
	}
	sb := make([]float64, len(trial))
	if !f.current {
		var err error
		if f.deviance, err = f.evaluate(f.beta, response.Observed, NoGram); err != nil {
			return err
		}
	}
	before := f.deviance + f.penaltyAt(sb, lambda, f.beta)
	d, err := f.evaluate(trial, response.Observed, Newton)
	if err != nil {
		return err
	}
	if d+f.penaltyAt(sb, lambda, trial) < before {
		copy(f.beta, trial)
		f.deviance, f.current = d, true
	}
	return nil
}

// reshape goes on with another shape.
func (f *fitter) reshape(d response.Shaped) {
	f.shaped, f.Dist, f.current, f.haveGram = d, d, false, false
}

// advance takes the step, halved until the penalised deviance does not grow; sure steps, too small to be judged by a
// difference of deviances, are taken as they are. It leaves sb = S_lambda beta.
func (f *fitter) advance(lambda, step, trial, sb []float64, sure bool) error {
	now := f.deviance + f.penalty
	from := append([]float64(nil), f.eta...)
	for t := 1.0; t > 1e-10; t /= 2 {
		for i := range trial {
			trial[i] = f.beta[i] + t*step[i]
		}
		d, err := f.evaluate(trial, response.Observed, Newton)
		if err != nil {
			return err
		}
		p := f.penaltyAt(sb, lambda, trial)
		if d+p <= now+1e-13*math.Abs(now) || sure && !math.IsInf(d, 0) {
			copy(f.beta, trial)
			f.deviance, f.penalty, f.current = d, p, true
			f.moved = 0
			for i, e := range f.eta {
				f.moved = math.Max(f.moved, math.Abs(e-from[i]))
			}
			return nil
		}
	}
	return ErrNoMode
}

// start sets beta from the distribution's starting means, and returns log lambda, where given holds NaN found on the
// working models: a few multiplicative steps (Wood & Fasiolo 2017, Biometrics 73:1071-1081) bring it near the optimum cheaply.
func (f *fitter) start(given []float64) (rho []float64, err error) {
	overall := f.overall()
	if f.scale, err = f.constantDeviance(overall); err != nil {
		return nil, err
	}
	f.size = f.scale
	if f.Dist.KnownDispersion() { // a row's deviance is about its weight, however well a constant fits
		f.size += f.weight()
	}
	zwz := make([]float64, len(f.Obs))
	working := func(i int, eta, curved float64) (float64, float64) { // curved: linear predictor less its tangent
		pt := f.Dist.At(f.Obs[i], eta)
		z := eta - f.offset(i) - curved
		if pt.Expected > 0 {
			z += pt.Score / pt.Expected
		}
		zwz[i] = pt.Expected * z * z
		return pt.Expected, pt.Expected * z
	}
	for round := 0; round < 2; round++ {
		at := func(i int, linear, tangent float64) (float64, float64) {
			return working(i, linear+f.offset(i), linear-tangent)
		}
		if round == 0 {
			at = func(i int, _, _ float64) (float64, float64) {
				o := f.Obs[i]
				return working(i, f.Dist.Linear(f.Dist.Start(o, overall*f.exposure(i))), 0)
			}
		}
		if err := f.Engine.Pass(f.ctx, f.beta, at, Working); err != nil {
			return nil, err
		}
		f.haveGram = f.Dist.ConstantWeight()
		var total float64
		for _, v := range zwz {
			total += v
		}
		if rho, err = f.working(rho, given, total); err != nil {
			return nil, err
		}
		if f.Dist.ConstantWeight() {
			break
		}
	}
	return rho, nil
}

// exposure is what the overall mean is multiplied by in row i.
func (f *fitter) exposure(i int) float64 {
	if f.Offset == nil {
		return 1
	}
	return math.Exp(f.Offset[i])
}

// working solves the working model at hand, moving log lambda towards its optimum where it is not given.
func (f *fitter) working(rho, given []float64, zwz float64) ([]float64, error) {
	e := f.Engine
	lo, hi := e.Range()
	if rho == nil {
		rho = slices.Clone(given)
		for j := range rho {
			if math.IsNaN(rho[j]) && f.Start != nil {
				rho[j] = math.Min(hi[j], math.Max(lo[j], f.Start[j]))
			} else if math.IsNaN(rho[j]) {
				rho[j] = hi[j] - 19 // a twentieth of the Gram matrix's trace
			}
		}
	}
	score := append([]float64(nil), e.Score()...)
	sb := make([]float64, len(f.beta))
	for step := 0; ; step++ {
		lambda := exp(rho)
		if !e.Factor(lambda) {
			return nil, ErrSingular
		}
		copy(f.beta, score)
		e.Solve(f.beta)
		if step == 15 || len(rho) == 0 || f.Start != nil {
			return rho, nil
		}
		phi := 1.0
		if !f.Dist.KnownDispersion() {
			phi = math.Max(zwz-dot(f.beta, score), 1e-12*zwz) / math.Max(1, float64(len(f.Obs)-e.NullDim()))
		}
		_, slope := e.LogDetPenalty(lambda)
		trace := e.Traces()
		next, largest := slices.Clone(rho), 0.0
		for j := range rho {
			share := slope[j]/lambda[j] - trace[j]
			if !math.IsNaN(given[j]) || share <= 1e-8*slope[j]/lambda[j] { // nothing left to it but rounding
				continue
			}
			e.PenaltyTo(sb, j, f.beta)
			ratio := phi * share / math.Max(dot(sb, f.beta), 1e-300)
			next[j] = math.Min(hi[j], math.Max(lo[j], rho[j]+clamp(math.Log(ratio), 6)))
			largest = math.Max(largest, math.Abs(next[j]-rho[j]))
		}
		if largest < 0.1 {
			return rho, nil
		}
		rho = next
	}
}

// overall returns the mean of all rows together for one unit of exposure.
func (f *fitter) overall() float64 {
	var y, m float64
	for i, o := range f.Obs {
		y += o.Weight * o.Y
		m += o.Weight * o.Trials * f.exposure(i)
	}
	return y / m
}

// constantDeviance returns the deviance of the best fit with one mean a unit of exposure, found by scoring from mean.
func (f *fitter) constantDeviance(mean float64) (float64, error) {
	eta := f.Dist.Linear(mean)
	if math.IsNaN(eta) || math.IsInf(eta, 0) {
		return 0, ErrSeparated
	}
	best := math.Inf(1)
	for n := 0; n < 100; n++ {
		var d, score, weight float64
		for i, o := range f.Obs {
			pt := f.Dist.At(o, eta+f.offset(i))
			d += pt.Deviance
			score += pt.Score
			weight += pt.Expected
		}
		step := score / weight
		if d >= best || !(weight > 0) || math.IsNaN(step) {
			break
		}
		best = d
		eta += step
	}
	if f.Dist.KnownDispersion() && best < 1e-12*f.weight() { // rounding
		best = 0
	}
	return best, nil
}

// weight returns the sum of the rows' prior weights.
func (f *fitter) weight() (sum float64) {
	for _, o := range f.Obs {
		sum += o.Weight
	}
	return sum
}

func clamp(v, most float64) float64 { return math.Min(most, math.Max(-most, v)) }

func dot(a, b []float64) (s float64) {
	for i, v := range a {
		s += v * b[i]
	}
	return s
}

func exp(rho []float64) []float64 {
	l := make([]float64, len(rho))
	for j, r := range rho {
		l[j] = math.Exp(r)
	}
	return l
}

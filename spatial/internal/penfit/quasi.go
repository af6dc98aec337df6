package penfit

import (
	"math"

	"drumlin/spatial/response"
)

// quasi chooses log lambda where the variance is phi times the distribution's with phi estimated, for which there is no
// likelihood: the restricted likelihood of the working model, gaussian with weights W and variance phi/w, is minimised
// with phi at its own minimum, the working model made afresh at the new coefficients, and so on until neither moves
// (Breslow & Clayton 1993, J. Am. Stat. Assoc. 88:9-25).
func (f *fitter) quasi(at found) (found, error) {
	at.result = Result{AtUpper: make([]bool, len(at.x))}
	for round := 0; round < quasiRounds; round++ {
		w, err := f.workingModel()
		if err != nil {
			return at, err
		}
		m, err := minimise(f.ctx, w.objective(f), at.x, at.lo, at.hi)
		if err != nil {
			return at, err
		}
		if math.IsInf(m.value, 1) {
			return at, ErrSingular
		}
		moved := 0.0
		for j := range at.x {
			moved = math.Max(moved, math.Abs(m.x[j]-at.x[j]))
		}
		at.x = m.x
		at.result.Gradient, at.result.Iterations = m.projected, at.result.Iterations+m.iterations
		if err := f.mode(exp(at.x)); err != nil {
			return at, err
		}
		if moved < 1e-9 && round > 0 {
			at.result.Converged = m.converged
			break
		}
	}
	for j := range at.x {
		at.result.AtUpper[j] = at.x[j] >= at.hi[j]-1e-9 && at.lo[j] < at.hi[j]
	}
	return at, nil
}

// quasiRounds is how often the working model is made afresh.
const quasiRounds = 200

// workingModel holds what the restricted likelihood of the working model needs beside the Gram matrix in the engine.
type workingModel struct {
	right []float64 // X'Wz
	size  float64   // z'Wz
}

// workingModel linearises at the current coefficients; the engine is left with its X'WX.
func (f *fitter) workingModel() (workingModel, error) {
	var err error
	if f.deviance, err = f.evaluate(f.beta, response.Expected, Working); err != nil {
		return workingModel{}, err
	}
	part := make([]float64, len(f.Obs))
	err = f.Engine.Pass(f.ctx, f.beta, func(i int, _, tangent float64) (weight, value float64) {
		pt := f.point[i]
		if !(pt.Expected > 0) {
			part[i] = 0
			return 0, pt.Score
		}
		z := tangent + pt.Score/pt.Expected
		part[i] = pt.Expected * z * z
		return 0, pt.Expected * z
	}, NoGram)
	w := workingModel{right: append([]float64(nil), f.Engine.Score()...)}
	for _, v := range part {
		w.size += v
	}
	f.current = false
	return w, err
}

// objective is the restricted likelihood of the working model, up to a constant.
func (w workingModel) objective(f *fitter) objective {
	e := f.Engine
	free := float64(len(f.Obs) - e.NullDim())
	sb := make([]float64, len(f.beta))
	return func(rho []float64) (float64, []float64, error) {
		lambda := exp(rho)
		g := make([]float64, len(rho))
		if !e.Factor(lambda) {
			return math.Inf(1), g, nil
		}
		b := append([]float64(nil), w.right...)
		e.Solve(b)
		phi := math.Max(w.size-dot(b, w.right), 1e-14*w.size) / free
		logdet, rank := e.LogDetPenalty(lambda)
		for j, t := range e.Traces() {
			e.PenaltyTo(sb, j, b)
			g[j] = lambda[j]*dot(sb, b)/(2*phi) + (lambda[j]*t-rank[j])/2
		}
		return free/2*(math.Log(phi)+1) + (e.LogDet()-logdet)/2, g, nil
	}
}

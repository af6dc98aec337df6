package penfit

import (
	"context"
	"math"

	"gonum.org/v1/gonum/mat"
)

// uncertaintyStep is the step in log lambda of the central differences of the exact gradient.
const uncertaintyStep = 1e-2

// Uncertainty returns what not knowing the smoothness and the shape adds to the covariance of the coefficients, to first
// order: J V J' with J = db/d(log lambda, shape) and V the inverse Hessian of the restricted likelihood there (Kass &
// Steffey 1989, J. Am. Stat. Assoc. 84:717-726; Wood, Pya & Saefken 2016, same journal 111:1548-1563). It comes as a
// root E, Coefs x k row-major, with J V J' = E E'. Parameters that were given or ended at a bound are left out; where the
// criterion is flat its curvature is floored, so that the step stays inside what the data can tell. extra is
// tr(E'G E)/phi, the degrees of freedom it adds. The engine is left factored at the fit.
func Uncertainty(ctx context.Context, p Problem, r *Result) (root []float64, k int, extra float64, err error) {
	p.Dist = r.Dist
	f := newFitter(ctx, p)
	copy(f.beta, r.Beta)
	f.scale, f.size = r.Constant, r.Constant+f.weight()
	at := logs(r.Lambda)
	open := make([]bool, len(at))
	for j := range open {
		open[j] = !r.AtUpper[j] && !r.Given[j] && !math.IsInf(at[j], 0)
	}
	if f.shaped != nil {
		at, open = join(at, f.shaped.Working()), append(open, !r.ShapeAtLower && !r.ShapeAtUpper)
	}
	var index []int
	for j, o := range open {
		if o {
			index = append(index, j)
		}
	}
	if k = len(index); k == 0 {
		return nil, 0, 0, nil
	}
	hessian, err := f.hessian(at, index)
	if err != nil {
		return nil, 0, 0, err
	}
	if _, _, err := f.score(REML, at); err != nil { // back at the fit, with its slopes
		return nil, 0, 0, err
	}
	root = f.rootOfSpread(hessian, index)
	return root, k, f.information(root, k) / r.Phi, nil
}

// hessian differences the exact gradient in the given components.
func (f *fitter) hessian(at []float64, index []int) (*mat.SymDense, error) {
	k := len(index)
	raw := mat.NewDense(k, k, nil)
	for a, j := range index {
		side := [2][]float64{}
		for s, sign := range []float64{1, -1} {
			x := append([]float64(nil), at...)
			x[j] += sign * uncertaintyStep
			_, g, err := f.score(REML, x)
			if err != nil {
				return nil, err
			}
			side[s] = g
		}
		for b, i := range index {
			raw.Set(a, b, (side[0][i]-side[1][i])/(2*uncertaintyStep))
		}
	}
	h := mat.NewSymDense(k, nil)
	for a := 0; a < k; a++ {
		for b := a; b < k; b++ {
			h.SetSym(a, b, (raw.At(a, b)+raw.At(b, a))/2)
		}
	}
	return h, nil
}

// leastCurvature is the smallest eigenvalue of the Hessian that is believed: a standard deviation of about 4 in log
// lambda, beyond which the first-order step means nothing.
const leastCurvature = 1.0 / 16

// rootOfSpread returns J U diag(1/sqrt(d)), U and d the eigenvectors and values of the Hessian.
func (f *fitter) rootOfSpread(h *mat.SymDense, index []int) []float64 {
	k := len(index)
	var eigen mat.EigenSym
	eigen.Factorize(h, true)
	var u mat.Dense
	eigen.VectorsTo(&u)
	root := make([]float64, len(f.beta)*k)
	for c, d := range eigen.Values(nil) {
		scale := 1 / math.Sqrt(math.Max(d, leastCurvature))
		for a, j := range index {
			w := u.At(a, c) * scale
			for i, v := range f.last.db[j] {
				root[i*k+c] += w * v
			}
		}
	}
	return root
}

// information returns tr(E'G E) with the Gram matrix at the fit.
func (f *fitter) information(root []float64, k int) float64 {
	e := mat.NewDense(len(f.beta), k, root)
	var half mat.Dense
	half.Mul(f.Engine.Gram(), e)
	sum := 0.0
	for i := range f.beta {
		for c := 0; c < k; c++ {
			sum += e.At(i, c) * half.At(i, c)
		}
	}
	return sum
}

package penfit

import (
	"context"
	"errors"
	"math"

	"gonum.org/v1/gonum/mat"
)

// objective returns a value and its gradient; a value of +Inf means that there is none at x.
type objective func(x []float64) (value float64, gradient []float64, err error)

// minimum is where a search ended.
type minimum struct {
	x, gradient []float64
	value       float64
	projected   float64 // largest component of the gradient that does not push against the box
	iterations  int
	converged   bool
}

const (
	searchSteps  = 80
	longestStep  = 4    // of a component in one step; log lambda is searched in units of e
	gradientTol  = 1e-9 // projected gradient, against 1 + |value|
	roundingTol  = 1e-5 // the same, where no step lowers the value any more
	valueLattice = 1e-11
)

// minimise finds a local minimum of f in the box [lo, hi] from x by a projected quasi-Newton method: BFGS on the
// components that are free, steps cut at the box. A component that ends at its bound is an answer, not a failure.
func minimise(ctx context.Context, f objective, x, lo, hi []float64) (minimum, error) {
	n := len(x)
	m := minimum{x: box(x, lo, hi)}
	var err error
	if m.value, m.gradient, err = f(m.x); err != nil {
		return m, err
	}
	h, fresh, err := firstCurvature(f, m, lo, hi)
	if err != nil {
		return m, err
	}
	for m.iterations = 0; ; m.iterations++ {
		free := m.project(lo, hi)
		if m.projected <= gradientTol*(1+math.Abs(m.value)) {
			m.converged = true
			return m, nil
		}
		if m.iterations == searchSteps {
			return m, nil
		}
		if err := ctx.Err(); err != nil {
			return m, err
		}
		next, ok, err := m.line(f, direction(h, m.gradient, free, n), lo, hi)
		if err != nil {
			return m, err
		}
		if !ok && !fresh { // the curvature learnt so far misleads: start it afresh
			h, fresh = identity(n), true
			continue
		}
		if !ok {
			m.converged = m.projected <= roundingTol*(1+math.Abs(m.value))
			return m, nil
		}
		update(h, m, next, fresh)
		fresh = false
		next.iterations = m.iterations
		m = next
	}
}

const (
	firstStep      = 0.1  // in each component, from which the first curvature is differenced
	leastFirstBend = 0.05 // and the least that is believed
)

// firstCurvature returns the inverse Hessian to begin with, from differences of the gradient: a shape bends the
// criterion hundreds of times as much as a smoothness does, and quasi-Newton steps alone take long to learn that. One
// component alone is learnt from its first step; then, and where a difference cannot be had, it is the identity, which
// is fresh: without a scale yet.
func firstCurvature(f objective, m minimum, lo, hi []float64) (h []float64, fresh bool, err error) {
	h = identity(len(m.x))
	var index []int
	for i, free := range m.project(lo, hi) {
		if free && lo[i] < hi[i] {
			index = append(index, i)
		}
	}
	if len(index) < 2 || math.IsInf(m.value, 0) {
		return h, true, nil
	}
	bend := mat.NewSymDense(len(index), nil)
	for a, i := range index {
		x := append([]float64(nil), m.x...)
		step := math.Min(firstStep, (hi[i]-lo[i])/4)
		if x[i]+step > hi[i] {
			step = -step
		}
		x[i] += step
		value, gradient, err := f(x)
		if err != nil {
			return nil, false, err
		}
		for b, j := range index {
			slope := (gradient[j] - m.gradient[j]) / step
			if math.IsInf(value, 0) || math.IsNaN(value+slope) {
				return h, true, nil
			}
			if a != b {
				slope = bend.At(a, b) + slope/2
			}
			bend.SetSym(a, b, slope)
		}
	}
	return h, !invert(h, bend, index), nil
}

// invert sets the elements of h that index picks to the inverse of a curvature. Directions that bend the wrong way
// count by how much they bend.
func invert(h []float64, bend *mat.SymDense, index []int) bool {
	var eigen mat.EigenSym
	if !eigen.Factorize(bend, true) {
		return false
	}
	var u mat.Dense
	eigen.VectorsTo(&u)
	n := int(math.Sqrt(float64(len(h))))
	for a, i := range index {
		for b, j := range index {
			sum := 0.0
			for c, v := range eigen.Values(nil) {
				sum += u.At(a, c) * u.At(b, c) / math.Max(math.Abs(v), leastFirstBend)
			}
			h[i*n+j] = sum
		}
	}
	return true
}

// project sets the projected gradient and says which components are free to move.
func (m *minimum) project(lo, hi []float64) (free []bool) {
	free = make([]bool, len(m.x))
	m.projected = 0
	for i, g := range m.gradient {
		free[i] = !(m.x[i] <= lo[i] && g > 0 || m.x[i] >= hi[i] && g < 0)
		if free[i] {
			m.projected = math.Max(m.projected, math.Abs(g))
		}
	}
	return free
}

// line looks along d for a point that lowers the value enough, or the gradient where values differ by rounding only.
func (m *minimum) line(f objective, d, lo, hi []float64) (minimum, bool, error) {
	for t, tries := 1.0, 0; tries < 25; t, tries = t/2.5, tries+1 {
		x := make([]float64, len(d))
		for i := range x {
			x[i] = m.x[i] + t*d[i]
		}
		x = box(x, lo, hi)
		var slope, moved float64
		for i := range x {
			slope += m.gradient[i] * (x[i] - m.x[i])
			moved = math.Max(moved, math.Abs(x[i]-m.x[i]))
		}
		if moved < 1e-13 {
			break
		}
		next := minimum{x: x}
		var err error
		next.value, next.gradient, err = f(x)
		if err != nil {
			return next, false, err
		}
		if math.IsInf(next.value, 0) || math.IsNaN(next.value) {
			continue
		}
		next.project(lo, hi)
		lower := next.value <= m.value+1e-4*slope
		level := next.value <= m.value+valueLattice*(1+math.Abs(m.value)) && next.projected < 0.5*m.projected
		if lower || level {
			return next, true, nil
		}
	}
	return minimum{}, false, nil
}

// direction returns -H g on the free components, cut to the longest step.
func direction(h, g []float64, free []bool, n int) []float64 {
	d := make([]float64, n)
	largest := 0.0
	for i := range d {
		if !free[i] {
			continue
		}
		for j := range d {
			if free[j] {
				d[i] -= h[i*n+j] * g[j]
			}
		}
		largest = math.Max(largest, math.Abs(d[i]))
	}
	if largest > longestStep {
		for i := range d {
			d[i] *= longestStep / largest
		}
	}
	return d
}

// update is the BFGS update of the inverse Hessian h; the first one after a fresh start sets its scale.
func update(h []float64, from, to minimum, fresh bool) {
	n := len(from.x)
	s, y := make([]float64, n), make([]float64, n)
	for i := range s {
		s[i], y[i] = to.x[i]-from.x[i], to.gradient[i]-from.gradient[i]
	}
	sy := dot(s, y)
	if sy <= 1e-14*math.Sqrt(dot(s, s)*dot(y, y)) { // curved the wrong way: only take longer steps
		for i := range h {
			h[i] *= 4
		}
		return
	}
	if fresh {
		scale := sy / dot(y, y)
		for i := range h {
			h[i] *= scale
		}
	}
	hy := make([]float64, n)
	for i := range hy {
		hy[i] = dot(h[i*n:(i+1)*n], y)
	}
	yhy := dot(y, hy)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			h[i*n+j] += (1+yhy/sy)*s[i]*s[j]/sy - (hy[i]*s[j]+s[i]*hy[j])/sy
		}
	}
}

func identity(n int) []float64 {
	h := make([]float64, n*n)
	for i := 0; i < n; i++ {
		h[i*n+i] = 1
	}
	return h
}

func box(x, lo, hi []float64) []float64 {
	b := make([]float64, len(x))
	for i := range b {
		b[i] = math.Min(hi[i], math.Max(lo[i], x[i]))
	}
	return b
}

// numerical reports whether err is trouble at one point of a search rather than the end of it.
func numerical(err error) bool {
	return errors.Is(err, ErrSingular) || errors.Is(err, ErrNoMode) || errors.Is(err, ErrSeparated)
}

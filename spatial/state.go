package spatial

import (
	"fmt"

	"drumlin/basis2d"
	"drumlin/spatial/response"

	"gonum.org/v1/gonum/blas/blas64"
)

// State is everything a surface predicts with, for storing: floats exact, the factor of H rather than its inverse, the
// basis as it was computed rather than how to compute it.
type State struct {
	Model  Model
	Basis  *basis2d.ThinPlate // nil without a surface
	Gaps   int                // knots in gaps
	Places int                // distinct places
	Level  []string           // for each of which there is a surface, of the category Model.SurfacePer
	Effect []StateEffect
	Mix, R []float64
	Beta   []float64
	Factor []float64
	Phi    float64
	Spread []float64 // root of what the smoothness' uncertainty and shared factors add, row-major, as many rows as Beta; may be empty
	Report Report
}

// StateEffect is an effect with what the data had of its covariate.
type StateEffect struct {
	Name   string
	Role   Role
	Per    string
	Level  []string
	Lo, Hi float64
	Curve  []*basis2d.Curve
	Unseen float64
}

// State returns what a restored surface needs. Slices are shared with s and must not be changed.
func (s *Surface) State() State {
	st := State{Model: s.model, Basis: s.core.basis, Level: s.core.level, Gaps: s.knots.InGaps, Places: s.knots.Distinct, Mix: s.border.Mix, R: s.border.R,
		Beta: s.beta, Factor: s.factor, Phi: s.phi, Spread: s.spread.Data, Report: s.report}
	for _, e := range s.border.Effects {
		st.Effect = append(st.Effect, StateEffect{e.Name, e.Role, e.Per, e.Level, e.Lo, e.Hi, e.Curve, e.Unseen})
	}
	return st
}

// Restore returns the surface of a stored state. It returns an error for parts that do not belong together; it never
// panics on one.
func Restore(st State, workers int) (*Surface, error) {
	dist, err := response.New(st.Model.Distribution, st.Model.Link)
	if err != nil {
		return nil, err
	}
	s := &Surface{model: st.Model, dist: dist, core: &core{per: st.Model.SurfacePer, level: st.Level},
		beta: st.Beta, factor: st.Factor, phi: st.Phi, report: st.Report, workers: workers}
	if st.Basis != nil {
		if s.core.basis, err = basis2d.RestoreThinPlate(*st.Basis); err != nil {
			return nil, err
		}
		s.knots = basis2d.Knots{X: s.core.basis.KnotX, Y: s.core.basis.KnotY, InGaps: st.Gaps, Distinct: st.Places}
	}
	if (s.core.per == "") != (len(st.Level) == 0) || st.Basis == nil && len(st.Level) > 0 {
		return nil, fmt.Errorf("%d surfaces and their levels do not belong together", len(st.Level))
	}
	keep := s.core.null()
	if st.Model.Shrink {
		keep = 1
	}
	s.border = &border{Mix: st.Mix, R: st.R, null: s.core.copies() * keep, keep: keep}
	for _, e := range st.Effect {
		f := fitted{Effect: Effect{e.Name, e.Role, e.Per}, Level: e.Level, Lo: e.Lo, Hi: e.Hi, Curve: e.Curve, Unseen: e.Unseen}
		if err := f.whole(); err != nil {
			return nil, err
		}
		s.border.Effects = append(s.border.Effects, f)
	}
	q := s.border.size()
	p := s.core.columns() + q + s.border.bound()
	if len(st.Beta) != p || len(st.Factor) != p*p || len(st.Mix) != s.border.null*q || len(st.R) != q*q || !(st.Phi >= 0) {
		return nil, fmt.Errorf("%d coefficients with a factor of %d values do not belong together", len(st.Beta), len(st.Factor))
	}
	if len(st.Spread)%p != 0 {
		return nil, fmt.Errorf("a spread of %d values does not belong to %d coefficients", len(st.Spread), p)
	}
	s.spread = blas64.General{Rows: p, Cols: len(st.Spread) / p, Stride: len(st.Spread) / p, Data: st.Spread}
	for _, v := range st.Spread {
		if bad(v) {
			return nil, fmt.Errorf("the spread holds no finite number")
		}
	}
	if !regular(st.Factor, p) {
		return nil, fmt.Errorf("the factor is singular")
	}
	if !regular(st.R, q) {
		return nil, fmt.Errorf("the covariates' transform is singular")
	}
	for _, v := range append([]float64{st.Phi, st.Report.DF}, st.Beta...) {
		if bad(v) {
			return nil, fmt.Errorf("a coefficient, the dispersion or the degrees of freedom are no finite number")
		}
	}
	return s, nil
}

// whole refuses an effect whose parts do not belong together.
func (f fitted) whole() error {
	curves := 0
	switch f.Role {
	case Category, Group:
		if len(f.Level) < 2 {
			return fmt.Errorf("effect %q has no levels", f.Name)
		}
	case Curve:
		if curves = 1; f.Per != "" {
			curves = len(f.Level)
		}
	case Linear:
	default:
		return fmt.Errorf("effect %q has a role that there is none of", f.Name)
	}
	if len(f.Curve) != curves || f.Role == Curve && curves == 0 || !(f.Unseen >= 0) {
		return fmt.Errorf("effect %q has %d curves", f.Name, len(f.Curve))
	}
	for _, c := range f.Curve {
		if c == nil || c.Functions != basis2d.DefaultFunctions || !c.Whole() {
			return fmt.Errorf("a curve of %q is damaged", f.Name)
		}
	}
	return nil
}

// regular reports whether an upper triangular matrix of order n can be divided by.
func regular(r []float64, n int) bool {
	for k := 0; k < n; k++ {
		if d := r[k*n+k]; d == 0 || bad(d) {
			return false
		}
	}
	return true
}

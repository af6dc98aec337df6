package spatial

import (
	"fmt"

	"drumlin/basis2d"
	"drumlin/spatial/response"
)

// State is everything a surface predicts with, for storing: floats exact, the factor of H rather than its inverse, the
// basis as it was computed rather than how to compute it.
type State struct {
	Model  Model
	Basis  *basis2d.ThinPlate // nil without a surface
	Gaps   int                // knots in gaps
	Places int                // distinct places
	Effect []StateEffect
	Mix, R []float64
	Beta   []float64
	Factor []float64
	Phi    float64
	Report Report
}

// StateEffect is an effect with what the data had of its covariate.
type StateEffect struct {
	Name   string
	Role   Role
	Level  []string
	Lo, Hi float64
}

// State returns what a restored surface needs. Slices are shared with s and must not be changed.
func (s *Surface) State() State {
	st := State{Model: s.model, Basis: s.basis, Gaps: s.knots.InGaps, Places: s.knots.Distinct, Mix: s.border.Mix, R: s.border.R,
		Beta: s.beta, Factor: s.factor, Phi: s.phi, Report: s.report}
	for _, e := range s.border.Effects {
		st.Effect = append(st.Effect, StateEffect{Name: e.Name, Role: e.Role, Level: e.Level, Lo: e.Lo, Hi: e.Hi})
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
	s := &Surface{model: st.Model, dist: dist, beta: st.Beta, factor: st.Factor, phi: st.Phi, report: st.Report, workers: workers}
	null := 1
	if st.Basis != nil {
		if s.basis, err = basis2d.RestoreThinPlate(*st.Basis); err != nil {
			return nil, err
		}
		null = basis2d.Null
		s.knots = basis2d.Knots{X: s.basis.KnotX, Y: s.basis.KnotY, InGaps: st.Gaps, Distinct: st.Places}
	}
	s.border = &border{Mix: st.Mix, R: st.R, null: null}
	for _, e := range st.Effect {
		if e.Role == Category && len(e.Level) < 2 || e.Role != Category && e.Role != Linear {
			return nil, fmt.Errorf("effect %q has no levels", e.Name)
		}
		s.border.Effects = append(s.border.Effects, fitted{Effect: Effect{Name: e.Name, Role: e.Role}, Level: e.Level, Lo: e.Lo, Hi: e.Hi})
	}
	q := s.border.size()
	p := surfaceColumns(s.basis) + q
	if len(st.Beta) != p || len(st.Factor) != p*p || len(st.Mix) != null*q || len(st.R) != q*q || !(st.Phi >= 0) {
		return nil, fmt.Errorf("%d coefficients with a factor of %d values do not belong together", len(st.Beta), len(st.Factor))
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

// regular reports whether an upper triangular matrix of order n can be divided by.
func regular(r []float64, n int) bool {
	for k := 0; k < n; k++ {
		if d := r[k*n+k]; d == 0 || bad(d) {
			return false
		}
	}
	return true
}

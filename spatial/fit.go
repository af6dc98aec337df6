package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"

	"drumlin/basis2d"
	"drumlin/basis2d/blocks"
	"drumlin/spatial/internal/penfit"
	"drumlin/spatial/response"
)

// Fit fits m to d. A fit that stops early is a Surface whose Report is not Converged; data from which no fit can be had
// give an *Error that says why. Fit panics if slices of d differ in length.
func Fit(ctx context.Context, m Model, d Data, o Options) (*Surface, error) {
	dist, err := response.New(m.Distribution, m.Link)
	if err != nil {
		return nil, err
	}
	if err := d.check(m); err != nil {
		return nil, err
	}
	if err := fittable(dist, d); err != nil {
		return nil, err
	}
	s := &Surface{model: m, dist: dist, workers: o.Workers}
	if m.Surface == ThinPlate {
		if err := s.lay(d.Places, o); err != nil {
			return nil, err
		}
	}
	dg, err := s.columns(d, o)
	if err != nil {
		return nil, err
	}
	if free := d.Places.Len() - s.nullDim(); !dist.KnownDispersion() && free < 1 {
		return nil, unfit("use more observations or fewer covariates",
			"%d observations cannot settle %d unpenalised coefficients and a variance", d.Places.Len(), s.nullDim())
	}
	engine, err := penfit.NewDense(ctx, dg, s.ridges(), o.Workers)
	if err != nil {
		return nil, err
	}
	problem := penfit.Problem{Engine: engine, Dist: dist, Obs: observations(d), Offset: offsets(d)}
	criterion, lambda := s.criterion()
	r, err := penfit.Fit(ctx, problem, criterion, lambda)
	if err != nil {
		return nil, explain(err, dist)
	}
	s.beta, s.factor, s.phi = r.Beta, engine.Factored(), r.Phi
	mean, err := meanRow(ctx, engine, surfaceColumns(s.basis))
	if err != nil {
		return nil, err
	}
	s.report = s.describe(r, d, mean)
	return s, s.settleRows(ctx, engine, problem, r, d, o.Seed)
}

// fittable refuses data whose likelihood has its maximum at the edge, or none.
func fittable(dist response.Distribution, d Data) error {
	n := len(d.Response)
	if n == 0 {
		return unfit("", "there are no observations")
	}
	var total, trials, weight, lo, hi float64 = 0, 0, 0, math.Inf(1), math.Inf(-1)
	for i, o := range observations(d) {
		y := o.Y
		if y < 0 && dist.Name() != "gaussian" {
			return unfit("leave the row out", "row %d: a count of %g is negative", i+1, y)
		}
		if dist.Name() == "binomial" && d.Trials != nil && !(positive(o.Trials) && y <= o.Trials) {
			return unfit("leave the row out", "row %d: %g positive of %g examined", i+1, y, o.Trials)
		}
		total += o.Weight * y
		trials += o.Weight * o.Trials
		weight += o.Weight
		lo, hi = math.Min(lo, y), math.Max(hi, y)
	}
	switch dist.Name() {
	case "poisson":
		if total == 0 {
			return unfit("nothing can be said but that the level is low: see the rule of three in any text on proportions",
				"every count is zero, so no level can be estimated")
		}
	case "binomial":
		if d.Trials == nil {
			return unfit("name the column with --trials", "positives need the number examined behind them")
		}
		if total == 0 || total == trials {
			return unfit("nothing can be said but that the share is near its end: see the rule of three in any text on proportions",
				"positives are separated: every row has %s positive, so no level can be estimated", map[bool]string{true: "none", false: "all"}[total == 0])
		}
	case "gaussian":
		if lo == hi {
			return unfit("", "the response is %g in every row: there is no variation to map", lo)
		}
		if dist.Link() == "log" && total <= 0 {
			return unfit("use --link identity", "the mean response is %g, and a log link needs a positive mean", total/weight)
		}
	}
	return nil
}

// lay chooses the knots and builds the surface's basis.
func (s *Surface) lay(at Places, o Options) error {
	most := s.model.MaxKnots
	if most == 0 {
		most = DefaultKnots
	}
	if most < basis2d.Null+1 {
		return unfit("allow more with --max-knots, or use --surface none", "a surface needs at least %d knots, %d were allowed", basis2d.Null+1, most)
	}
	s.knots = basis2d.PlaceKnots(at.X, at.Y, o.Area.X, o.Area.Y, most)
	if o.Knots.Len() > 0 {
		s.knots.X, s.knots.Y, s.knots.InGaps = o.Knots.X, o.Knots.Y, 0
	}
	if s.knots.Distinct < basis2d.Null {
		return unfit("a surface needs places spread in two directions: use --surface none, or more places",
			"a surface needs at least %d distinct places, and the rows have %d", basis2d.Null, s.knots.Distinct)
	}
	basis, err := basis2d.NewThinPlate(s.knots.X, s.knots.Y)
	if errors.Is(err, basis2d.ErrCollinear) {
		return unfit("a surface needs places spread in two directions: use --surface none, or more places",
			"the places lie on one line, so a surface over the plane cannot be had")
	}
	if err != nil {
		return &Error{Message: err.Error(), Cause: err}
	}
	s.basis = basis
	return nil
}

// How much of a column's own spread must be left when those before it are taken out: a Schur pivot of 1e-10 beside a
// surface. A plain regression goes through an orthogonal factorisation that bears far worse columns.
const (
	leastBesideSurface = 1e-5
	leastPlain         = 1e-13
)

// columns builds the model matrix and remembers what predictions need of it.
func (s *Surface) columns(d Data, o Options) (*design, error) {
	n := d.Places.Len()
	dg := &design{x: d.Places.X, y: d.Places.Y, basis: s.basis, scratch: make([]basis2d.Spread, blocks.Workers(o.Workers))}
	null := make([][]float64, min(surfaceColumns(s.basis), basis2d.Null))
	for k := range null {
		null[k] = make([]float64, n)
	}
	var t [basis2d.Null]float64
	for i := 0; i < n; i++ {
		s.nullTo(t[:], d.Places.X[i], d.Places.Y[i])
		for k := range null {
			null[k][i] = t[k]
		}
	}
	var err error
	if s.border, dg.border, err = newBorder(s.model.Effects, d.Covariates, len(null)); err != nil {
		return nil, err
	}
	if len(dg.border) > maxBorder {
		return nil, unfit("use fewer covariates or levels", "%d columns of covariates are more than the %d allowed", len(dg.border), maxBorder)
	}
	if n < s.nullDim() {
		return nil, unfit("use more observations or fewer covariates", "%d observations cannot settle %d unpenalised coefficients", n, s.nullDim())
	}
	least := leastPlain
	if s.basis != nil {
		least = leastBesideSurface
	}
	return dg, s.border.orthogonalise(null, dg.border, least)
}

// maxBorder is the most columns beside the surface.
const maxBorder = 1000

func (s *Surface) nullTo(t []float64, x, y float64) {
	if s.basis == nil {
		t[0] = 1
		return
	}
	s.basis.NullSpaceTo(t, x, y)
}

func (s *Surface) ridges() []penfit.Ridge {
	if s.basis == nil || s.basis.Dim() == basis2d.Null {
		return nil
	}
	return []penfit.Ridge{{{First: basis2d.Null, Size: s.basis.Dim() - basis2d.Null}}}
}

// nullDim returns the number of unpenalised coefficients.
func (s *Surface) nullDim() int { return min(surfaceColumns(s.basis), basis2d.Null) + s.border.size() }

// criterion turns the model's smoothness into the core's: its penalty is in scaled coordinates, so that
// lambda J = (lambda/Scale^2) u'u.
func (s *Surface) criterion() (penfit.Criterion, []float64) {
	if len(s.ridges()) == 0 {
		return penfit.REML, nil
	}
	switch s.model.Smoothness.Method {
	case GCV:
		return penfit.GCV, nil
	case Given:
		return penfit.Given, []float64{s.model.Smoothness.Lambda / (s.basis.Scale * s.basis.Scale)}
	}
	return penfit.REML, nil
}

func observations(d Data) []response.Obs {
	obs := make([]response.Obs, len(d.Response))
	for i, y := range d.Response {
		obs[i] = response.Obs{Y: y, Trials: 1, Weight: 1}
		if d.Trials != nil {
			obs[i].Trials = d.Trials[i]
		}
		if d.Weight != nil {
			obs[i].Weight = d.Weight[i]
		}
	}
	return obs
}

func offsets(d Data) []float64 {
	if d.Exposure == nil {
		return nil
	}
	o := make([]float64, len(d.Exposure))
	for i, e := range d.Exposure {
		o[i] = math.Log(e)
	}
	return o
}

// explain says in the user's words what the core ran into.
func explain(err error, dist response.Distribution) error {
	switch {
	case errors.Is(err, penfit.ErrSeparated) && dist.Name() == "binomial":
		return &Error{Cause: err, Message: "positives are separated: a straight line or a covariate parts the rows that are all positive from those that are not, so the chance runs off to 0 or 1",
			Advice: "leave covariates out, use --surface none, or gather more rows where both outcomes occur"}
	case dist.Name() == "gaussian" && dist.Link() == "log" && (errors.Is(err, penfit.ErrSeparated) || errors.Is(err, penfit.ErrSingular)):
		return &Error{Cause: err, Message: "the mean runs off to zero, or spans too many powers of ten for normal errors: the log link cannot follow",
			Advice: "use --link identity, look for a response that is far out of range, or allow fewer knots with --max-knots"}
	case errors.Is(err, penfit.ErrSeparated):
		return &Error{Cause: err, Message: "the level runs off to zero: a straight line or a covariate parts the rows with zero counts from the others",
			Advice: "leave covariates out, use --surface none, or gather more rows"}
	case errors.Is(err, penfit.ErrSingular):
		return &Error{Cause: err, Message: "the equations of the fit are singular to rounding",
			Advice: "allow fewer knots with --max-knots, ask for a larger smoothness, or leave covariates out"}
	case errors.Is(err, penfit.ErrNoMode):
		return &Error{Cause: err, Message: fmt.Sprintf("the %s fit did not settle", dist.Name()),
			Advice: "look for a response that is far out of range, or allow fewer knots with --max-knots"}
	}
	return err
}

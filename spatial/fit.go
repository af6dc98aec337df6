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
	s, finish, err := fitAlone(ctx, m, d, o)
	if err != nil {
		return nil, err
	}
	return s, finish()
}

// fitAlone fits without what is told of each row and effect; finish adds that. A fit that only leads to another one does
// without: leverages cost as much as a few visits to the rows.
func fitAlone(ctx context.Context, m Model, d Data, o Options) (s *Surface, finish func() error, err error) {
	dist, err := m.distribution()
	if err != nil {
		return nil, nil, err
	}
	if err := d.check(m, dist); err != nil {
		return nil, nil, err
	}
	if d.Places, err = d.Places.settled(); err != nil {
		return nil, nil, err
	}
	if err := fittable(dist, d); err != nil {
		return nil, nil, err
	}
	m.Effects = m.effects()
	s = &Surface{model: m, dist: dist, core: &core{}, workers: o.Workers}
	if m.Surface == ThinPlate {
		if err := s.lay(d, o); err != nil {
			return nil, nil, err
		}
	}
	dg, err := s.columns(ctx, d, o)
	if err != nil {
		return nil, nil, err
	}
	list := s.smooths()
	engine, err := s.engine(ctx, d.Places, dg, list, o.Workers)
	if err != nil {
		return nil, nil, err
	}
	if s.mean, err = meanRow(ctx, engine); err != nil {
		return nil, nil, err
	}
	problem := penfit.Problem{Engine: engine, Dist: dist, Obs: observations(d), Offset: offsets(d), EstimateShape: m.Shape == nil, Workers: o.Workers}
	if free := d.Places.Len() - engine.NullDim(); !dist.KnownDispersion() && free < 1 {
		return nil, nil, unfit(fewer(m), "%d observations cannot settle %d unpenalised coefficients and a variance", d.Places.Len(), engine.NullDim())
	}
	problem.Start = o.start.on(list)
	criterion, lambda := s.criterion(list)
	r, err := penfit.Fit(ctx, problem, criterion, lambda)
	if err != nil {
		return nil, nil, explain(err, dist)
	}
	s.dist, s.beta, s.factor, s.phi = r.Dist, r.Beta, engine.Factored(), r.Phi
	s.border.setUnseen(list, r.Lambda)
	spreadDF := 0.0
	if m.SmoothnessUncertainty {
		if s.spread.Data, s.spread.Cols, spreadDF, err = penfit.Uncertainty(ctx, problem, r); err != nil {
			return nil, nil, explain(err, dist)
		}
		s.spread.Rows, s.spread.Stride = len(s.beta), s.spread.Cols
	}
	if err := s.addFactor(ctx, d.Factor, problem, r); err != nil {
		return nil, nil, err
	}
	s.report = s.describe(r, d, list, spreadDF)
	return s, func() error {
		s.effects = s.figures(s.overlaps(engine.Gram(), list, r))
		return s.settleRows(ctx, engine, problem, r, d, o.Seed)
	}, nil
}

// fewer is the advice where there are too few rows.
func fewer(m Model) string {
	if len(m.Effects) > 0 {
		return "use more observations, or fewer covariates"
	}
	return "use more observations, or --surface none"
}

// distribution returns the model's distribution, with its shape where that is given.
func (m Model) distribution() (response.Distribution, error) {
	dist, err := response.New(m.Distribution, m.Link)
	if err != nil || m.Shape == nil {
		return dist, err
	}
	shaped, ok := dist.(response.Shaped)
	if !ok {
		return nil, unfit("leave the shape out", "the %s distribution has no shape to be given", m.Distribution)
	}
	return shaped.WithShape(*m.Shape)
}

// effects returns the model's effects with what they need of one another: a category that curves are per has its own
// steps as well, and one that surfaces are per has none, since each surface brings its own constant.
func (m Model) effects() []Effect {
	var list []Effect
	steps := map[string]bool{m.SurfacePer: true}
	for _, e := range m.Effects {
		if e.Role == Category && steps[e.Name] {
			continue
		}
		steps[e.Name] = steps[e.Name] || e.Role == Category
		list = append(list, e)
	}
	for _, e := range m.Effects {
		if e.Per != "" && !steps[e.Per] {
			steps[e.Per] = true
			list = append(list, Effect{Name: e.Per, Role: Category})
		}
	}
	return list
}

// fittable refuses data whose likelihood has its maximum at the edge, or none.
func fittable(dist response.Distribution, d Data) error {
	n := len(d.Response)
	switch n {
	case 0:
		return unfit("name a table with rows that can be used", "there are no observations")
	case 1:
		return unfit("a map needs more of them", "there is one observation, which says nothing of the variation between places")
	}
	var total, trials, weight, lo, hi float64 = 0, 0, 0, math.Inf(1), math.Inf(-1)
	kind := kindOf(dist)
	_, shaped := dist.(response.Shaped)
	for i, o := range observations(d) {
		y := o.Y
		switch {
		case y < 0 && kind == counts:
			return unfit("leave the row out", "row %d: a count of %g is negative", i+1, y)
		case y < 0 && kind != measurements:
			return unfit("leave the row out", "row %d: %g is negative", i+1, y)
		case shaped && kind != amounts && (y != math.Floor(y) || o.Trials != math.Floor(o.Trials)):
			return unfit("leave the row out, or use "+plainOf[dist.Name()], "row %d: %g is not a whole number, and %s needs one", i+1, y, dist.Name())
		case y == 0 && kind == positiveAmounts:
			return unfit("use tweedie where amounts can be 0, or leave the row out", "row %d: the gamma distribution has no 0", i+1)
		case kind == shares && d.Trials != nil && !(positive(o.Trials) && y <= o.Trials):
			return unfit("leave the row out", "row %d: %g positive of %g examined", i+1, y, o.Trials)
		}
		total += o.Weight * y
		trials += o.Weight * o.Trials
		weight += o.Weight
		lo, hi = math.Min(lo, y), math.Max(hi, y)
	}
	const ruleOfThree = "see the rule of three in any text on proportions"
	switch {
	case kind == counts && total == 0:
		return unfit("nothing can be said but that the level is low: "+ruleOfThree, "every count is zero, so no level can be estimated")
	case kind == amounts && total == 0:
		return unfit("nothing can be said but that the level is low", "every amount is zero, so no level can be estimated")
	case kind == shares && d.Trials == nil:
		return unfit("name the column with --trials", "positives need the number examined behind them")
	case kind == shares && (total == 0 || total == trials):
		return unfit("nothing can be said but that the share is near its end: "+ruleOfThree,
			"positives are separated: every row has %s positive, so no level can be estimated", map[bool]string{true: "none", false: "all"}[total == 0])
	case lo == hi && (kind == measurements || kind == positiveAmounts || kind == amounts):
		return unfit("check that it is the right column", "the response is %g in every row: there is no variation to map", lo)
	case kind == measurements && dist.Link() == "log" && total <= 0:
		return unfit("use --link identity", "the mean response is %g, and a log link needs a positive mean", total/weight)
	}
	return nil
}

// plainOf names the distribution that takes fractions where the one with extra variation does not.
var plainOf = map[string]string{"negative-binomial": "poisson", "beta-binomial": "binomial"}

// kind is what a distribution's responses are.
type kind int

const (
	measurements    kind = iota
	counts               // 0, 1, 2, ...
	shares               // positives among trials
	amounts              // 0 or more
	positiveAmounts      // more than 0
)

func kindOf(dist response.Distribution) kind {
	switch dist.Name() {
	case "poisson", "negative-binomial":
		return counts
	case "binomial", "beta-binomial":
		return shares
	case "tweedie":
		return amounts
	case "gamma":
		return positiveAmounts
	}
	return measurements
}

// lay chooses the knots and builds the surface's basis.
func (s *Surface) lay(d Data, o Options) error {
	most := s.model.MaxKnots
	if most == 0 {
		most = DefaultKnots
	}
	if most < basis2d.Null+1 {
		return unfit("allow more with --max-knots, or use --surface none", "a surface needs at least %d knots, %d were allowed", basis2d.Null+1, most)
	}
	s.knots = basis2d.PlaceKnots(d.Places.X, d.Places.Y, o.Area.X, o.Area.Y, most)
	if o.Knots.Len() > 0 {
		s.knots.X, s.knots.Y, s.knots.InGaps = o.Knots.X, o.Knots.Y, 0
	}
	if s.knots.Distinct < basis2d.Null {
		return unfit("a surface needs places spread in two directions: use --surface none, or more places",
			"a surface needs at least %d distinct places, and the rows have %d", basis2d.Null, s.knots.Distinct)
	}
	basis, err := basis2d.NewThinPlate(s.knots.X, s.knots.Y)
	if errors.Is(err, basis2d.ErrCollinear) {
		return onOneLine("")
	}
	if err != nil {
		return &Error{Message: err.Error(), Cause: err}
	}
	s.core.basis = basis
	if s.model.SurfacePer == "" {
		return nil
	}
	c, err := find(d.Covariates, s.model.SurfacePer, false)
	if err != nil {
		return err
	}
	f := fitted{}
	f.levels(c)
	if len(f.Level) < 2 {
		return unfit("leave --surface-per out", "covariate %q has one level only, %q: there is nothing to compare", c.Name, f.Level[0])
	}
	s.core.per, s.core.level = c.Name, f.Level
	return nil
}

// onOneLine refuses places, of all rows or of one level's, that do not spread in two directions.
func onOneLine(level string) error {
	where := ""
	if level != "" {
		where = " of " + level
	}
	return unfit("a surface needs places spread in two directions: use --surface none, or more places",
		"the places%s lie on one line, so a surface over the plane cannot be had", where)
}

// How much of a column's own spread must be left when those before it are taken out: a Schur pivot of 1e-10 beside a
// surface. A plain regression goes through an orthogonal factorisation that bears far worse columns.
const (
	leastBesideSurface = 1e-5
	leastPlain         = 1e-13
)

// The most columns beside the surface, and the most of them times the surface's own.
const (
	maxBorder  = 1000
	maxProduct = 2.5e7
)

// columns builds the model matrix and remembers what predictions need of it.
func (s *Surface) columns(ctx context.Context, d Data, o Options) (*design, error) {
	keep := s.core.null()
	if s.model.Shrink {
		keep = 1
	}
	var err error
	if s.border, err = newBorder(s.model.Effects, d.Covariates, s.core.copies(), keep); err != nil {
		return nil, err
	}
	q, bound, n := s.border.size(), s.border.bound(), d.Places.Len()
	if q+bound > maxBorder || float64(q+bound)*float64(s.core.columns()) > maxProduct {
		return nil, &Error{Message: fmt.Sprintf("%d columns of covariates beside %d of the surface are more than can be fitted (%d, and %.0f for the product)",
			q+bound, s.core.columns(), maxBorder, maxProduct), Advice: "use fewer covariates, levels or groups, or fewer knots", Request: true}
	}
	if free := s.border.null + q; n < free {
		return nil, unfit(fewer(s.model), "%d observations cannot settle %d unpenalised coefficients", n, free)
	}
	dg := &design{x: d.Places.X, y: d.Places.Y, owner: d.Places.owners(), core: s.core, bound: bound, scratch: make([]designScratch, blocks.Workers(o.Workers))}
	if dg.of, err = s.core.levels(d.Covariates); err != nil {
		return nil, err
	}
	if dg.fill, err = s.border.filler(d.Covariates); err != nil {
		return nil, err
	}
	null, raw, err := s.freeColumns(ctx, dg, q)
	if err != nil {
		return nil, err
	}
	least := leastPlain
	if s.core.basis != nil {
		least = leastBesideSurface
	}
	dg.free = raw
	if d.Places.Start == nil {
		return dg, s.border.orthogonalise(null, raw, least, s.core)
	}
	// What rows that are sets of points can tell apart is told by their means, at least to first order.
	if err := s.border.orthogonalise(d.Places.means(null), d.Places.means(raw), least, s.core); err != nil {
		return nil, err
	}
	s.border.columnsTo(raw, null)
	return dg, nil
}

// engine returns the core's engine for rows at given places, points the model matrix of their points.
func (s *Surface) engine(ctx context.Context, at Places, points penfit.Design, list []smooth, workers int) (penfit.Engine, error) {
	if at.Start == nil {
		return penfit.NewDense(ctx, points, ridges(list), workers)
	}
	return penfit.NewComposite(ctx, points, at.Start, at.Share, response.MixerOf(s.dist.Link()), ridges(list), workers)
}

// freeColumns returns the surface's free columns and the raw ones beside it, one value a point.
func (s *Surface) freeColumns(ctx context.Context, dg *design, q int) (null, raw [][]float64, err error) {
	n, p, t := dg.Rows(), dg.core.columns(), s.border.null
	all := make([][]float64, t+q)
	for j := range all {
		all[j] = make([]float64, n)
	}
	type space struct {
		core             coreScratch
		rows, free, bend []float64
	}
	scratch := make([]space, len(dg.scratch))
	err = blocks.Do(ctx, len(scratch), blocks.Count(n), func(worker, b int) error {
		w := &scratch[worker]
		if w.rows == nil {
			w.rows, w.free, w.bend = make([]float64, blocks.Size*p), make([]float64, t+q), make([]float64, dg.bound)
		}
		from, to := blocks.Range(b, n)
		dg.core.rowsTo(w.rows, p, dg.x[from:to], dg.y[from:to], func(r int) int { return dg.of(dg.row(from + r)) }, &w.core)
		for i := from; i < to; i++ {
			dg.core.nullTo(w.free[:t], w.rows[(i-from)*p:], s.border.keep)
			dg.fill(w.free[t:], w.bend, dg.row(i))
			for j, v := range w.free {
				all[j][i] = v
			}
		}
		return nil
	})
	return all[:t], all[t:], err
}

// criterion turns the model's smoothness into the core's: the surface's penalty is in scaled coordinates, so that
// lambda J = (lambda/Scale^2) u'u. A given smoothness is the surface's; the data choose that of curves and groups.
func (s *Surface) criterion(list []smooth) (penfit.Criterion, []float64) {
	var lambda []float64
	if s.model.Smoothness.Method == Given {
		for _, t := range list {
			given := math.NaN()
			if t.kind == SurfaceSmooth {
				given = s.model.Smoothness.Lambda / t.scale
			}
			lambda = append(lambda, given)
		}
	}
	switch {
	case s.model.ScaleVariation:
		return penfit.Quasi, lambda
	case len(list) == 0:
		return penfit.REML, nil
	case lambda != nil:
		return penfit.Given, lambda
	case s.model.Smoothness.Method == GCV:
		return penfit.GCV, nil
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
	case errors.Is(err, penfit.ErrSeparated) && kindOf(dist) == shares:
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

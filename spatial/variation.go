package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"drumlin/basis2d/blocks"
	"drumlin/spatial/internal/penfit"
	"drumlin/spatial/response"
)

// BootstrapTest asks whether the data need a part of the model: the model is fitted with the part and without it, to the
// data and to draws from the fit without it. It is the parametric bootstrap (Davison & Hinkley 1997, Bootstrap Methods and
// their Application, ch. 4). No chi-squared distribution will do in its place: under a plane more than half of all fits
// have no bend at all, so that the usual mixtures are wrong.
type BootstrapTest struct {
	Of string // what is tested: "surface", or "group NAME"
	// Statistic is twice the log-likelihood that the part gains, each fit with the dispersion and the shape that it finds
	// for itself; with a known dispersion and no shape to find that is the drop in deviance. Where the variance is scaled
	// there is no likelihood, and it is the drop in deviance over the dispersion of the fit without the part.
	Statistic float64
	Draws     int // 0 where the test was skipped
	Exceeded  int // draws whose statistic is as large, or that have none
	Failed    int // draws that could not be fitted both ways; they count as exceeding, which can only make P larger
	P         float64
	Skipped   string // why there is no test; then the figures are zero
}

// DefaultDraws is the number of draws of a bootstrap test unless something else is asked for.
const DefaultDraws = 199

// A fit costs about passes x rows x columns^2, and a test draws + 1 times that. mostTestWork is the most a test may cost:
// some ten minutes of one processor's time (measured: 3 to 4 operations a nanosecond). In a tweedie fit each visit to a row
// sums densities beside, at the cost of a good 400 columns; no fit is taken to need fewer than fewPasses.
const (
	mostTestWork    = 2e12
	testWorkMinute  = 2e11
	tweedieRowsWork = 2e5
	fewPasses       = 10
)

// TooLargeToTest says in words why a model of that size is not fitted to every one of DefaultDraws draws of a bootstrap
// test, whatever its distribution; empty if it may be. Where there are several surfaces the knots of all count, and where
// rows are sets of points it is these that count as rows. A fit that needs many passes over its rows may be too large all
// the same: then the test's Skipped says so.
func TooLargeToTest(rows, knots int) string {
	return tooLarge("rows", rows, knots, fewPasses, DefaultDraws, 0)
}

func tooLarge(what string, rows, columns, passes, draws int, rowWork float64) string {
	work := float64(draws+1) * float64(passes) * float64(rows) * (float64(columns)*float64(columns) + rowWork)
	if work <= mostTestWork {
		return ""
	}
	return fmt.Sprintf("%d draws of %d %s, each fitted again with %d coefficients in %d passes, would take some %.0f minutes of one processor's time; up to %.0f are spent",
		draws, rows, what, columns, passes, math.Ceil(work/testWorkMinute), mostTestWork/testWorkMinute)
}

// tooLargeToTest is TooLargeToTest for what the fit turned out to need. Where rows are sets of points it is these that cost.
func (s *Surface) tooLargeToTest(at Places, draws int) string {
	rowWork, what := 0.0, "rows"
	if at.Start != nil {
		what = "points"
	}
	if s.dist.Name() == "tweedie" {
		rowWork = tweedieRowsWork
	}
	return tooLarge(what, len(at.X), len(s.beta), max(fewPasses, s.report.Passes), draws, rowWork)
}

// TestVariation asks whether there is any spatial variation. The model without it has no surface at all, not even a plane:
// a constant and the effects, and where there is a surface for each level of a category a step for each. d are the data s
// was fitted to. Every draw is fitted with the surface and without, the smoothness and the shape chosen anew by the model's
// own method, on the knots that s has. draws of 0 means DefaultDraws. Draws are seeded one by one, so that the outcome
// does not depend on the number of workers.
//
// The answer is about the model's distribution: where that is too narrow for the data, extra variation from row to row
// counts as spatial.
//
// TestVariation returns an error for data that do not fit s, or when ctx is cancelled. It panics if slices of d differ in length.
func (s *Surface) TestVariation(ctx context.Context, d Data, draws int, seed uint64) (BootstrapTest, error) {
	if s.core.basis == nil {
		return BootstrapTest{Of: "surface", Skipped: "the model has no surface"}, nil
	}
	return s.testAgainst(ctx, s.model.withoutSurface(), "surface", d, draws, seed)
}

// TestGroups asks for each of the model's groups whether there is any variation between its levels, as TestVariation does
// for the surface: the model without the group keeps everything else. Levels of other groups are drawn anew.
func (s *Surface) TestGroups(ctx context.Context, d Data, draws int, seed uint64) (list []BootstrapTest, err error) {
	for k, e := range s.border.Effects {
		if e.Role != Group {
			continue
		}
		t, err := s.testAgainst(ctx, s.model.without(e.Name), "group "+e.Name, d, draws, seed+uint64(k)<<32)
		if err != nil {
			return nil, err
		}
		list = append(list, t)
	}
	return list, nil
}

// withoutSurface returns the model with effects alone.
func (m Model) withoutSurface() Model {
	if m.SurfacePer != "" {
		m.Effects = append(slices.Clone(m.Effects), Effect{Name: m.SurfacePer, Role: Category})
	}
	m.Surface, m.SurfacePer, m.OwnSmoothness, m.Shrink = None, "", false, false
	return m
}

// without returns the model without the group of that name.
func (m Model) without(group string) Model {
	m.Effects = slices.DeleteFunc(slices.Clone(m.Effects), func(e Effect) bool { return e.Role == Group && e.Name == group })
	return m
}

// testAgainst compares s with the smaller model m.
func (s *Surface) testAgainst(ctx context.Context, m Model, of string, d Data, draws int, seed uint64) (BootstrapTest, error) {
	skip := func(why string) (BootstrapTest, error) { return BootstrapTest{Of: of, Skipped: why}, nil }
	if draws <= 0 {
		draws = DefaultDraws
	}
	if why := s.tooLargeToTest(d.Places, draws); why != "" {
		return skip(why)
	}
	if why := s.undrawable(d); why != "" {
		return skip(why)
	}
	if d.Places.Len() != s.report.Rows {
		return BootstrapTest{}, unfit("", "a surface fitted to %d rows cannot be tested with %d", s.report.Rows, d.Places.Len())
	}
	if _, err := s.rowMaker(d.Places, d.Covariates); err != nil {
		return BootstrapTest{}, err
	}
	var err error
	if d.Places, err = d.Places.settled(); err != nil {
		return BootstrapTest{}, err
	}
	d.Factor = nil // a level that is off all over tells nothing of a part of the model
	m.SmoothnessUncertainty = false
	var cannot *Error
	null, err := Fit(ctx, m, d, Options{Workers: s.workers, Knots: Places{X: s.knots.X, Y: s.knots.Y}})
	if errors.As(err, &cannot) {
		return skip("the model without it cannot be fitted: " + cannot.Message)
	}
	if err != nil {
		return BootstrapTest{}, err
	}
	b := &bootstrap{full: s, null: null, data: d, obs: observations(d), offset: offsets(d)}
	pair, err := b.pair(ctx)
	if err != nil {
		return BootstrapTest{}, err
	}
	statistic, err := pair.statistic(ctx, b.obs)
	switch {
	case err != nil && !refused(err):
		return BootstrapTest{}, err
	case err != nil:
		return skip("the data cannot be fitted again: " + explain(err, s.dist).Error())
	case bad(statistic) || !positive(null.phi):
		return skip("the fits have no likelihood")
	}
	t := BootstrapTest{Of: of, Statistic: statistic, Draws: draws}
	drawn, err := b.statistics(ctx, draws, seed)
	if err != nil {
		return BootstrapTest{}, err
	}
	t.count(drawn)
	return t, nil
}

// undrawable says why draws would not be like the data: weights multiply the log-likelihood of a negative-binomial or
// beta-binomial row, which then is that of no distribution, and its shape is not that of the variance over the weight.
func (s *Surface) undrawable(d Data) string {
	if name := s.dist.Name(); name == "negative-binomial" || name == "beta-binomial" {
		for _, w := range d.Weight {
			if w != 1 {
				return fmt.Sprintf("rows have weights, and a weighted row has no %s distribution to draw from", name)
			}
		}
	}
	return ""
}

// evenly is by how little statistics may differ and count as equal: a part that vanishes leaves up to this much behind,
// since its smoothness ends at a bound that is not infinite.
const evenly = 0.01

// count compares the draws' statistics, NaN for those that have none, with that of the data.
func (t *BootstrapTest) count(drawn []float64) {
	for _, v := range drawn {
		if math.IsNaN(v) {
			t.Failed++
		}
		if !(v < t.Statistic-evenly) {
			t.Exceeded++
		}
	}
	t.P = float64(1+t.Exceeded) / float64(1+len(drawn))
}

// refused reports whether a fit could not be had, rather than was interrupted.
func refused(err error) bool {
	return errors.Is(err, penfit.ErrSeparated) || errors.Is(err, penfit.ErrSingular) || errors.Is(err, penfit.ErrNoMode)
}

// bootstrap draws from the fit without a part and fits the draws with it and without.
type bootstrap struct {
	full, null *Surface
	data       Data
	obs        []response.Obs
	offset     []float64
}

// statistics returns the statistic of every draw, NaN where it could not be fitted.
func (b *bootstrap) statistics(ctx context.Context, draws int, seed uint64) ([]float64, error) {
	out := make([]float64, draws)
	pairs := make([]*pair, blocks.Workers(b.full.workers))
	err := blocks.Do(ctx, len(pairs), draws, func(worker, k int) (err error) {
		if pairs[worker] == nil {
			if pairs[worker], err = b.pair(ctx); err != nil {
				return err
			}
		}
		p := pairs[worker]
		obs, err := b.draw(ctx, p, rand.New(rand.NewPCG(seed, uint64(k)+0x766172696174)))
		if err != nil {
			return err
		}
		if out[k], err = p.statistic(ctx, obs); err != nil && refused(err) {
			out[k], err = math.NaN(), nil
		}
		return err
	})
	return out, err
}

// draw returns responses drawn from the fit without the part. Curves and surfaces are as they were fitted; the levels of
// groups are drawn anew, since fitted ones, shrunken, differ too little from one another.
func (b *bootstrap) draw(ctx context.Context, p *pair, random *rand.Rand) ([]response.Obs, error) {
	s := b.null
	beta := slices.Clone(s.beta)
	at := s.core.columns() + s.border.size()
	for _, e := range s.border.Effects {
		for k := at; k < at+e.bound() && e.Role == Group; k++ {
			beta[k] = math.Sqrt(s.phi*e.Unseen) * random.NormFloat64()
		}
		at += e.bound()
	}
	eta := make([]float64, len(b.obs))
	if err := p.null.problem.Engine.LinearTo(ctx, eta, beta); err != nil {
		return nil, err
	}
	obs, sampler := slices.Clone(b.obs), s.dist.(response.Sampler)
	for i := range obs {
		if b.offset != nil {
			eta[i] += b.offset[i]
		}
		obs[i].Y = sampler.Draw(random, obs[i], eta[i], s.phi)
	}
	return obs, nil
}

// pair fits the same responses with the part and without it. One goroutine uses it at a time.
type pair struct {
	full, null *refitter
}

func (b *bootstrap) pair(ctx context.Context) (*pair, error) {
	full, err := newRefitter(ctx, b.full, b.data)
	if err != nil {
		return nil, err
	}
	null, err := newRefitter(ctx, b.null, b.data)
	return &pair{full, null}, err
}

// statistic is BootstrapTest's. A search that stopped early has its statistic too: what the data get, draws get.
func (p *pair) statistic(ctx context.Context, obs []response.Obs) (float64, error) {
	null, err := p.null.fit(ctx, obs)
	if err != nil {
		return 0, err
	}
	full, err := p.full.fit(ctx, obs)
	if err != nil {
		return 0, err
	}
	if p.full.criterion == penfit.Quasi {
		return (null.Deviance - full.Deviance) / null.Phi, nil
	}
	return 2 * (full.LogLikelihood - null.LogLikelihood), nil
}

// refitter fits a model again and again, to other responses of the same rows.
type refitter struct {
	problem   penfit.Problem
	criterion penfit.Criterion
	lambda    []float64
}

func newRefitter(ctx context.Context, s *Surface, d Data) (*refitter, error) {
	rows, err := s.rowMaker(d.Places, d.Covariates)
	if err != nil {
		return nil, err
	}
	dist, err := s.model.distribution()
	if err != nil {
		return nil, err
	}
	list := s.smooths()
	engine, err := s.engine(ctx, d.Places, &madeRows{at: d.Places, owner: d.Places.owners(), cols: len(s.beta), rows: rows}, list, 1)
	if err != nil {
		return nil, err
	}
	r := &refitter{problem: penfit.Problem{Engine: engine, Dist: dist, Offset: offsets(d), EstimateShape: s.model.Shape == nil}}
	r.criterion, r.lambda = s.criterion(list)
	return r, nil
}

func (r *refitter) fit(ctx context.Context, obs []response.Obs) (*penfit.Result, error) {
	p := r.problem
	p.Obs = obs
	return penfit.Fit(ctx, p, r.criterion, r.lambda)
}

// madeRows is the model matrix of a fit, made from what the fit remembers, for one goroutine.
type madeRows struct {
	at      Places
	owner   []int32 // as design has it
	cols    int
	rows    rows
	scratch rowScratch
}

func (m *madeRows) Rows() int { return len(m.at.X) }

func (m *madeRows) Cols() int { return m.cols }

func (m *madeRows) BlockTo(dst []float64, from, to, _ int) {
	m.scratch.rows = dst
	m.rows(&m.scratch, m.at.X[from:to], m.at.Y[from:to], func(k int) int {
		if m.owner == nil {
			return from + k
		}
		return int(m.owner[from+k])
	})
}

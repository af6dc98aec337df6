package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"

	"drumlin/basis2d/blocks"
	"drumlin/spatial/response"
)

// Candidate is a model with the name it goes by in a comparison.
type Candidate struct {
	Name  string
	Model Model
	// Fit fits the candidate in a way of its own; nil means as Compare is told to.
	Fit func(context.Context, Model, Data, Options) (*Surface, error)
}

// fitter returns how candidate k is fitted.
func (c *comparison) fitter(k int) func(context.Context, Model, Data, Options) (*Surface, error) {
	if own := c.list[k].Fit; own != nil {
		return own
	}
	return c.fit
}

// Comparison is what one candidate came to. A figure that would be meaningless is NaN, and Missing says why.
type Comparison struct {
	Name               string
	Distribution, Link string // empty where the candidate could not be fitted
	AIC, AICCorrected  float64
	// RestrictedLikelihood is Report.CriterionValue, of which less is better, where it can be held against that of the
	// first candidate: on one base measure, with one link and the same columns without a penalty.
	RestrictedLikelihood float64
	DevianceShare, DF    float64
	// LogScore is the mean over rows of the log density, or log probability, of a row under the fit to the blocks it
	// does not belong to, at that fit's mean and dispersion: what the fit itself does not know of them is not in it.
	// More is better. Its standard error is from the spread between blocks.
	LogScore, LogScoreSE float64
	// Difference is the log score less that of the first candidate, its standard error from the blocks' own
	// differences.
	Difference, DifferenceSE float64
	Blocks, Scored, LeftOut  int // rows are left out where a candidate has not seen their level of a category
	Missing                  []Missing
}

// Missing says why a figure is NaN.
type Missing struct{ Figure, Reason string }

// The figures of a comparison that may be missing.
const (
	FigureFit                  = "fit" // all of them
	FigureAIC                  = "aic"
	FigureAICCorrected         = "aic_corrected"
	FigureRestrictedLikelihood = "restricted_likelihood"
	FigureDevianceShare        = "deviance_share"
	FigureLogScore             = "log_score"
	FigureDifference           = "difference"
)

// comparisonBlocks is into how many blocks of neighbouring places the rows are cut for the log score.
const comparisonBlocks = 10

// Compare fits the candidates to the same rows, each by fit (nil means Fit), and once more without each of ten blocks of
// neighbouring rows, smoothness and shape chosen afresh, to score the rows left out: rows taken out one by one would
// leave their neighbours in, which tell too much of them. A level that a fit has not seen is taken at the average level
// if it is of a group; if it is of a category, the row counts for no candidate. A candidate that cannot be fitted says
// so and does not stop the others; the error is that of ctx, or of a panic in one of the fits without a block. Compare
// panics if slices of d differ in length.
func Compare(ctx context.Context, list []Candidate, d Data, o Options,
	fit func(context.Context, Model, Data, Options) (*Surface, error)) ([]Comparison, error) {
	if fit == nil {
		fit = Fit
	}
	c := comparison{list: list, d: d, o: o, fit: fit, out: make([]Comparison, len(list)), whole: make([]*Surface, len(list))}
	for k := range list {
		if err := c.fitWhole(ctx, k); err != nil {
			return nil, err
		}
	}
	for k := range list {
		c.figures(k)
	}
	if err := c.validate(ctx); err != nil {
		return nil, err
	}
	return c.out, nil
}

// comparison is a comparison under way.
type comparison struct {
	list  []Candidate
	d     Data
	o     Options
	fit   func(context.Context, Model, Data, Options) (*Surface, error)
	out   []Comparison
	whole []*Surface // fits to all rows; nil where there is none
	late  []string   // why the correction of the AIC could not be had
}

// stops reports whether err ends the comparison rather than a candidate.
func stops(ctx context.Context, err error) bool {
	var panicked *blocks.PanicError
	return err != nil && (ctx.Err() != nil || errors.As(err, &panicked))
}

// fitWhole fits candidate k to all rows, with the smoothness' uncertainty wherever it is known since the corrected AIC
// counts it.
func (c *comparison) fitWhole(ctx context.Context, k int) error {
	m, nan := c.list[k].Model, math.NaN()
	row := &c.out[k]
	*row = Comparison{Name: c.list[k].Name, AIC: nan, AICCorrected: nan, RestrictedLikelihood: nan, DevianceShare: nan, DF: nan,
		LogScore: nan, LogScoreSE: nan, Difference: nan, DifferenceSE: nan}
	c.late = append(c.late, "")
	own := m.SmoothnessUncertainty
	m.SmoothnessUncertainty = own || !m.ScaleVariation && m.Smoothness.Method != GCV
	s, err := c.fitter(k)(ctx, m, c.d, c.o)
	if err != nil && !stops(ctx, err) && m.SmoothnessUncertainty && !own {
		m.SmoothnessUncertainty = false
		late := err
		if s, err = c.fitter(k)(ctx, m, c.d, c.o); err == nil {
			c.late[k] = late.Error()
		}
	}
	if stops(ctx, err) {
		return err
	}
	if err != nil {
		row.miss(FigureFit, "%s", err.Error())
		return nil
	}
	c.whole[k] = s
	return nil
}

func (r *Comparison) miss(figure, format string, args ...any) {
	r.Missing = append(r.Missing, Missing{figure, fmt.Sprintf(format, args...)})
}

// figures fills in what the fits to all rows say.
func (c *comparison) figures(k int) {
	row, s := &c.out[k], c.whole[k]
	if s == nil {
		return
	}
	r := s.report
	row.Distribution, row.Link, row.DF = r.Distribution, r.Link, r.DF
	if row.DevianceShare = r.DevianceShare; !(r.ConstantDev > 0) {
		row.DevianceShare = math.NaN()
		row.miss(FigureDevianceShare, "a constant fits the rows exactly: there is no deviance to share")
	}
	switch apart := c.apart(k); {
	case s.model.ScaleVariation:
		row.miss(FigureAIC, "%s", noLikelihood)
	case apart != "":
		row.miss(FigureAIC, "%s", apart)
	default:
		row.AIC = r.AIC
	}
	switch {
	case math.IsNaN(row.AIC):
		row.miss(FigureAICCorrected, "there is no AIC to correct")
	case c.late[k] != "":
		row.miss(FigureAICCorrected, "the correction could not be had: %s", c.late[k])
	case math.IsNaN(r.AICCorrected):
		row.miss(FigureAICCorrected, "the smoothness' uncertainty is known for restricted likelihood only")
	default:
		row.AICCorrected = r.AICCorrected
	}
	if why := c.unlike(k); why != "" {
		row.miss(FigureRestrictedLikelihood, "%s", why)
	} else {
		row.RestrictedLikelihood = r.CriterionValue
	}
}

const noLikelihood = "with its variance scaled the fit has no likelihood"

// apart says why likelihoods of candidate k and the first one are not on one scale; empty if they are.
func (c *comparison) apart(k int) string {
	first := c.whole[0]
	if first == nil { // the first that can be fitted then sets the scale
		for _, first = range c.whole {
			if first != nil {
				break
			}
		}
	}
	if a, b := measure(first.dist, c.d), measure(c.whole[k].dist, c.d); a != b {
		return fmt.Sprintf("likelihoods of %s (%s) and %s (%s) are not on one scale", first.dist.Name(), a, c.whole[k].dist.Name(), b)
	}
	return ""
}

// measure names what a distribution's likelihoods are densities against.
func measure(dist response.Distribution, d Data) string {
	switch kindOf(dist) {
	case counts, shares:
		return "probabilities of whole numbers"
	case amounts:
		if slices.Contains(d.Response, 0) {
			return "densities with a probability at 0"
		}
	}
	return "densities"
}

// unlike says why the restricted likelihood of candidate k cannot be held against that of the first; empty if it can.
// Restricted likelihoods are integrals over the coefficients without a penalty, so these must be the same ones.
func (c *comparison) unlike(k int) string {
	first, s := c.whole[0], c.whole[k]
	switch {
	case first == nil:
		return "the first candidate could not be fitted"
	case s.model.ScaleVariation || first.model.ScaleVariation:
		return noLikelihood
	case s.model.Smoothness.Method == GCV || first.model.Smoothness.Method == GCV:
		return "cross-validation chose the smoothness"
	case bad(s.report.CriterionValue) || bad(first.report.CriterionValue):
		return "a fit without a penalty has none"
	case c.apart(k) != "":
		return c.apart(k)
	case s.report.Link != first.report.Link:
		return fmt.Sprintf("the link is %s, that of the first candidate %s", s.report.Link, first.report.Link)
	}
	mine, theirs := s.unpenalised(), first.unpenalised()
	if slices.Equal(mine, theirs) {
		return ""
	}
	return fmt.Sprintf("without a penalty it has %s, the first candidate %s", strings.Join(mine, " + "), strings.Join(theirs, " + "))
}

// unpenalised names the columns that no penalty touches, sorted. Constants of surfaces per level count as a constant and
// steps, which span the same with a determinant of one.
func (s *Surface) unpenalised() []string {
	list := []string{"1"}
	slopes := s.border.keep > 1
	switch {
	case s.core.per != "":
		for l, name := range s.core.level {
			at := s.core.per + "=" + name
			if l > 0 {
				list = append(list, at)
			}
			if slopes {
				list = append(list, "x, "+at, "y, "+at)
			}
		}
	case slopes:
		list = append(list, "x", "y")
	}
	for _, e := range s.border.Effects {
		for k, name := range e.names() {
			if e.Role == Curve {
				name = e.curveName(k) // straight, like a slope
			}
			list = append(list, name)
		}
	}
	sort.Strings(list[1:])
	return list
}

// validate sets the log scores.
func (c *comparison) validate(ctx context.Context) error {
	block, count := spatialBlocks(c.d.Places, comparisonBlocks)
	scores := make([]scored, len(c.list))
	var tasks [][2]int // candidate, block
	for k, s := range c.whole {
		if scores[k].why = c.unscored(k, count); s == nil || scores[k].why != "" {
			continue
		}
		scores[k].row, scores[k].failed = make([]float64, len(block)), make([]string, count)
		for b := 0; b < count; b++ {
			tasks = append(tasks, [2]int{k, b})
		}
	}
	o := c.o
	if len(tasks) > 1 {
		o.Workers = 1
	}
	err := blocks.Do(ctx, c.o.Workers, len(tasks), func(_, t int) error {
		k, b := tasks[t][0], tasks[t][1]
		err := c.score(ctx, k, scores[k].row, o, block, b)
		if err != nil && !stops(ctx, err) {
			scores[k].failed[b], err = fmt.Sprintf("without block %d of %d: %v", b+1, count, err), nil
		}
		return err
	})
	if err != nil {
		return err
	}
	c.tell(scores, block, count)
	return nil
}

// scored holds the rows' log scores under one candidate: NaN for a row of a level that the fit has not seen.
type scored struct {
	row    []float64
	failed []string // of each block, why it has no scores
	why    string   // why there are none at all
}

// unscored says why candidate k, which is fitted, gets no log score; empty if it does.
func (c *comparison) unscored(k, count int) string {
	switch s := c.whole[k]; {
	case s == nil:
		return ""
	case s.model.ScaleVariation:
		return noLikelihood
	case count < 2:
		return "all rows lie at one place: there are no blocks to leave out"
	}
	return c.apart(k)
}

// score writes the log scores of the rows of block b under candidate k fitted to the others.
func (c *comparison) score(ctx context.Context, k int, dst []float64, o Options, block []int, b int) error {
	var in, out []int
	for i, of := range block {
		if of == b {
			out = append(out, i)
		} else {
			in = append(in, i)
		}
	}
	m := c.list[k].Model
	m.SmoothnessUncertainty = false // errors are not scored
	s, err := c.fitter(k)(ctx, m, c.d.only(in), o)
	if err != nil {
		return err
	}
	held := c.d.only(out)
	eta, se := make([]float64, len(out)), make([]float64, len(out))
	if err := s.PredictTo(ctx, eta, se, held.Places, held.Covariates); err != nil {
		return err
	}
	offset := offsets(held)
	for j, obs := range observations(held) {
		if math.IsNaN(eta[j]) {
			dst[out[j]] = math.NaN()
			continue
		}
		if offset != nil {
			eta[j] += offset[j]
		}
		v := s.dist.LogLikelihood(obs, eta[j], s.phi)
		if bad(v) {
			return fmt.Errorf("row %d has no chance at all under the fit", out[j]+1)
		}
		dst[out[j]] = v
	}
	return nil
}

// only returns the rows of the given indices.
func (d Data) only(rows []int) Data {
	part := Data{Response: pick(d.Response, rows), Exposure: pick(d.Exposure, rows), Trials: pick(d.Trials, rows),
		Weight: pick(d.Weight, rows), Places: d.Places.only(rows)}
	if d.Factor != nil {
		part.Factor = &Factor{Of: pick(d.Factor.Of, rows), CV: d.Factor.CV}
	}
	for _, z := range d.Covariates {
		part.Covariates = append(part.Covariates, z.only(rows))
	}
	return part
}

// tell turns rows' scores into figures.
func (c *comparison) tell(scores []scored, block []int, count int) {
	out := make([]bool, len(block))
	left := 0
	for k := range scores {
		for _, why := range scores[k].failed {
			if why != "" && scores[k].why == "" {
				scores[k].why = why
			}
		}
		if scores[k].why != "" {
			scores[k].row = nil
		}
		for i, v := range scores[k].row {
			out[i] = out[i] || math.IsNaN(v)
		}
	}
	for _, o := range out {
		if o {
			left++
		}
	}
	for k := range scores {
		row, mine, first := &c.out[k], scores[k].row, scores[0].row
		if c.whole[k] == nil {
			continue
		}
		if scores[k].why == "" && left == len(block) {
			scores[k].why, mine = "every row has a level that the fit without its block has not seen", nil
		}
		if mine == nil {
			row.miss(FigureLogScore, "%s", scores[k].why)
			row.miss(FigureDifference, "there is no log score")
			continue
		}
		row.Blocks, row.Scored, row.LeftOut = count, len(block)-left, left
		row.LogScore, row.LogScoreSE = overBlocks(mine, out, block, count)
		if first == nil {
			row.miss(FigureDifference, "the first candidate has no log score")
			continue
		}
		difference := make([]float64, len(mine))
		for i := range mine {
			difference[i] = mine[i] - first[i]
		}
		row.Difference, row.DifferenceSE = overBlocks(difference, out, block, count)
	}
}

// overBlocks returns the mean of v over the rows that are not out, with its standard error as that of a ratio of block
// totals: rows of a block go together (Cochran 1977, Sampling Techniques, 3rd ed., ch. 6, without the correction for a finite
// population).
func overBlocks(v []float64, out []bool, block []int, count int) (mean, se float64) {
	total, rows := make([]float64, count), make([]float64, count)
	sum, n := 0.0, 0.0
	for i, x := range v {
		if out[i] {
			continue
		}
		total[block[i]] += x
		rows[block[i]]++
		sum += x
		n++
	}
	mean = sum / n
	used, ss := 0.0, 0.0
	for b, t := range total {
		if rows[b] > 0 {
			used++
			ss += (t - rows[b]*mean) * (t - rows[b]*mean)
		}
	}
	return mean, math.Sqrt(ss*used/(used-1)) / n
}

// spatialBlocks cuts the rows into at most want blocks of neighbouring places with about equally many rows, and returns
// the block of each row. Places are cut in two across their longer side, the parts again, and so on; rows of one place
// stay together, and a row that is a set of points counts as their mean place. The cut depends neither on the order of
// rows nor on the unit of the places.
func spatialBlocks(at Places, want int) (block []int, count int) {
	at = at.centres()
	row := make([]int, at.Len())
	for i := range row {
		row[i] = i
	}
	sort.SliceStable(row, func(a, b int) bool { return before(at.X, at.Y, row[a], row[b]) })
	var sites []site
	for _, i := range row {
		if n := len(sites); n == 0 || sites[n-1].x != at.X[i] || sites[n-1].y != at.Y[i] {
			sites = append(sites, site{x: at.X[i], y: at.Y[i]})
		}
		last := &sites[len(sites)-1]
		last.rows = append(last.rows, i)
	}
	block = make([]int, at.Len())
	count = min(want, len(sites))
	next := 0
	var cut func(part []site, k int)
	cut = func(part []site, k int) {
		if k <= 1 {
			for _, p := range part {
				for _, i := range p.rows {
					block[i] = next
				}
			}
			next++
			return
		}
		low := k / 2
		c := halve(part, low, k)
		cut(part[:c], low)
		cut(part[c:], k-low)
	}
	cut(sites, count)
	return block, count
}

// site is a place with its rows.
type site struct {
	x, y float64
	rows []int
}

// halve sorts the places along their longer side and returns where to cut so that low of k blocks come before: as near
// to their share of the rows as whole places allow, with at least one place for each block.
func halve(part []site, low, k int) int {
	var x, y []float64
	total := 0
	for _, p := range part {
		x, y, total = append(x, p.x), append(y, p.y), total+len(p.rows)
	}
	if slices.Max(x)-slices.Min(x) >= slices.Max(y)-slices.Min(y) {
		sort.SliceStable(part, func(a, b int) bool { return part[a].x < part[b].x || part[a].x == part[b].x && part[a].y < part[b].y })
	} else {
		sort.SliceStable(part, func(a, b int) bool { return part[a].y < part[b].y || part[a].y == part[b].y && part[a].x < part[b].x })
	}
	want := float64(total) * float64(low) / float64(k)
	best, at, sum := math.Inf(1), low, 0
	for c := 1; c <= len(part)-(k-low); c++ {
		sum += len(part[c-1].rows)
		if off := math.Abs(float64(sum) - want); c >= low && off < best {
			best, at = off, c
		}
	}
	return at
}

func before(x, y []float64, i, j int) bool {
	return x[i] < x[j] || x[i] == x[j] && y[i] < y[j]
}

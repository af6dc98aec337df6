package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strconv"
)

// Knots are added while the fit still moves: while its root mean square change at the rows is above SettledRMS mean
// standard errors of the linear predictor, or its largest one above SettledMost. More knots than that change degrees of
// freedom by some per cent and the fit by nothing that matters.
const (
	firstKnots  = 50
	SettledRMS  = 0.1
	SettledMost = 0.5
)

// MostKnots is where FitKnots stops in any case. With many rows it stops earlier, at the most knots of the sequence for
// which a visit to the rows costs no more than mostVisit multiplications, but not below leastMost.
const (
	MostKnots = 800
	mostVisit = 1e9
	leastMost = 100
)

// MostKnotsFor returns where FitKnots stops for a number of rows, or of points where rows are sets of them.
func MostKnotsFor(rows int) int {
	k := MostKnots
	for k > leastMost && float64(rows)*float64(k)*float64(k) > mostVisit {
		k /= 2
	}
	return k
}

// KnotStep is one fit on the way to enough knots.
type KnotStep struct {
	Knots     int
	DF        float64
	RMS, Most float64 // change from the step before, in mean standard errors; NaN for the first
}

// FitKnots fits m with more and more knots until the fit no longer moves, every place has one, or there are most of them
// (0 means MostKnotsFor the rows). Each search starts where the last one ended. It returns the last fit and the way to it.
func FitKnots(ctx context.Context, m Model, d Data, o Options, most int) (*Surface, []KnotStep, error) {
	if most == 0 {
		most = MostKnotsFor(len(d.Places.X))
		if m.SurfacePer != "" { // every level has as many
			most = max(firstKnots, most/levelsOf(d, m.SurfacePer))
		}
	}
	if m.Surface == None {
		s, err := Fit(ctx, m, d, o)
		return s, nil, err
	}
	var (
		last *Surface
		path []KnotStep
	)
	for k := min(firstKnots, most); ; k = min(2*k, most) {
		m.MaxKnots = k
		s, finish, err := fitAlone(ctx, m, d, o)
		if err != nil {
			return nil, path, err
		}
		step := KnotStep{Knots: s.report.Knots, DF: s.report.DF, RMS: math.NaN(), Most: math.NaN()}
		if last != nil {
			if step.RMS, step.Most, err = s.change(ctx, last, d); err != nil {
				return nil, path, err
			}
		}
		path = append(path, step)
		settled := step.RMS <= SettledRMS && step.Most <= SettledMost
		if full := s.report.Knots < k || s.knots.Distinct <= s.report.Knots-s.knots.InGaps; settled || full || k == most {
			return s, path, finish()
		}
		last, o.start = s, s.report.Smooths
	}
}

// changeRows is the number of rows that a change is measured at: evenly spaced ones where there are more.
const changeRows = 2000

// levelsOf returns how many levels a category has, at least 1.
func levelsOf(d Data, category string) int {
	for _, c := range d.Covariates {
		if c.Name == category {
			return max(1, len(c.Level))
		}
	}
	return 1
}

// change returns how far the linear predictor at the rows moved from another fit, in mean standard errors.
func (s *Surface) change(ctx context.Context, from *Surface, d Data) (rms, most float64, err error) {
	at, z := some(d.Places, d.Covariates, changeRows)
	n := at.Len()
	a, b, se, unused := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	if err := s.PredictTo(ctx, a, se, at, z); err != nil {
		return 0, 0, err
	}
	if err := from.PredictTo(ctx, b, unused, at, z); err != nil {
		return 0, 0, err
	}
	unit := mean(se)
	for i := range a {
		change := math.Abs(a[i]-b[i]) / unit
		rms += change * change / float64(n)
		most = math.Max(most, change)
	}
	return math.Sqrt(rms), most, nil
}

// some returns at most that many evenly spaced rows.
func some(at Places, z []Covariate, most int) (Places, []Covariate) {
	n := at.Len()
	if n <= most {
		return at, z
	}
	rows := make([]int, most)
	for j := range rows {
		rows[j] = j * n / most
	}
	few := make([]Covariate, len(z))
	for k, c := range z {
		few[k] = c.only(rows)
	}
	return at.only(rows), few
}

// Variation is the outcome of comparing a distribution of counts or positives with the one that has extra variation.
type Variation struct {
	Plain, Extra   string
	PlainCriterion float64 // restricted likelihood criteria; smaller is better
	ExtraCriterion float64
	PlainAIC       float64
	ExtraAIC       float64
	Chosen, Reason string
}

// clearGain is by how much the restricted likelihood must speak for one distribution to decide alone.
const clearGain = 2

// WithExtraVariation returns the distribution that has the same mean with extra variation; empty if there is none.
func WithExtraVariation(distribution string) string {
	switch distribution {
	case "poisson":
		return "negative-binomial"
	case "binomial":
		return "beta-binomial"
	}
	return ""
}

// FitVariation fits m as it is and with extra variation, each by fit, and returns the fit that the data ask for, with
// the reason in a sentence: the restricted likelihood decides, the AIC where that is about even. Over-dispersed data
// lure the plain distribution into taking noise for surface, which flatters its AIC but not its restricted likelihood.
// A fit with extra variation that cannot be had leaves the plain one.
func FitVariation(ctx context.Context, m Model, fit func(context.Context, Model) (*Surface, error)) (*Surface, Variation, error) {
	v := Variation{Plain: m.Distribution, Extra: WithExtraVariation(m.Distribution)}
	plain, err := fit(ctx, m)
	v.Chosen = v.Plain
	if err != nil || v.Extra == "" {
		return plain, v, err
	}
	m.Distribution = v.Extra
	extra, err := fit(ctx, m)
	var unfit *Error
	if errors.As(err, &unfit) {
		v.Reason = fmt.Sprintf("a %s fit could not be had: %s", v.Extra, unfit.Message)
		return plain, v, nil
	}
	if err != nil {
		return nil, v, err
	}
	if v.weigh(plain.report, extra.report) {
		return extra, v, nil
	}
	return plain, v, nil
}

// figure writes a gain in three digits, without an exponent.
func figure(v float64) string {
	if math.Abs(v) >= 100 {
		return strconv.FormatFloat(v, 'f', 0, 64)
	}
	return strconv.FormatFloat(v, 'g', 3, 64)
}

// weigh decides for extra variation or against, and words why.
func (v *Variation) weigh(plain, extra Report) bool {
	v.PlainCriterion, v.ExtraCriterion, v.PlainAIC, v.ExtraAIC = plain.CriterionValue, extra.CriterionValue, plain.AIC, extra.AIC
	gain, aic := v.PlainCriterion-v.ExtraCriterion, v.PlainAIC-v.ExtraAIC
	shape, even := fmt.Sprintf("%s %.3g", extra.ShapeName, extra.Shape), math.Round(100*gain)/100+0 // no negative zero
	switch {
	case extra.Simpler != "":
		v.Reason = fmt.Sprintf("the %s went back to the %s: there is no extra variation", v.Extra, v.Plain)
		return false
	case gain > clearGain:
		v.Reason = fmt.Sprintf("the restricted likelihood is better by %s with extra variation (%s)", figure(gain), shape)
	case gain < -clearGain:
		v.Reason = fmt.Sprintf("the restricted likelihood is better by %s without extra variation", figure(-gain))
		return false
	case aic > 0:
		v.Reason = fmt.Sprintf("the restricted likelihood is about even (%.2g) and the AIC better by %s with extra variation (%s)", even, figure(aic), shape)
	default:
		v.Reason = fmt.Sprintf("the restricted likelihood is about even (%.2g) and the AIC better by %s without extra variation", even, figure(-aic))
		return false
	}
	v.Chosen = v.Extra
	return true
}

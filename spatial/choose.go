package spatial

import (
	"context"
	"errors"
	"fmt"
	"math"

	"drumlin/spatial/response"
)

// Knots are added while the fit still moves: while its root mean square change at the rows is above settledRMS mean
// standard errors of the linear predictor, or its largest one above settledMost. More knots than that change degrees of
// freedom by some per cent and the fit by nothing that matters.
const (
	firstKnots  = 50
	settledRMS  = 0.1
	settledMost = 0.5
)

// MostKnots is where FitKnots stops in any case.
const MostKnots = 800

// KnotStep is one fit on the way to enough knots.
type KnotStep struct {
	Knots     int
	DF        float64
	RMS, Most float64 // change from the step before, in mean standard errors; NaN for the first
}

// FitKnots fits m with more and more knots until the fit no longer moves, every place has one, or there are most of them
// (0 means MostKnots). Each search starts where the last one ended. It returns the last fit and the way to it.
func FitKnots(ctx context.Context, m Model, d Data, o Options, most int) (*Surface, []KnotStep, error) {
	if most == 0 {
		most = MostKnots
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
		s, err := Fit(ctx, m, d, o)
		if err != nil {
			return last, path, err
		}
		step := KnotStep{Knots: s.report.Knots, DF: s.report.DF, RMS: math.NaN(), Most: math.NaN()}
		if last != nil {
			if step.RMS, step.Most, err = s.change(ctx, last, d); err != nil {
				return nil, path, err
			}
		}
		path = append(path, step)
		settled := step.RMS <= settledRMS && step.Most <= settledMost
		if full := s.report.Knots < k || s.knots.Distinct <= s.report.Knots-s.knots.InGaps; settled || full || k == most {
			return s, path, nil
		}
		last, o.start = s, s.report.Smooths
	}
}

// change returns how far the linear predictor at the rows moved from another fit, in mean standard errors.
func (s *Surface) change(ctx context.Context, from *Surface, d Data) (rms, most float64, err error) {
	n := d.Places.Len()
	a, b, se, unused := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	if err := s.PredictTo(ctx, a, se, d.Places, d.Covariates); err != nil {
		return 0, 0, err
	}
	if err := from.PredictTo(ctx, b, unused, d.Places, d.Covariates); err != nil {
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

// weigh decides for extra variation or against, and words why.
func (v *Variation) weigh(plain, extra Report) bool {
	v.PlainCriterion, v.ExtraCriterion, v.PlainAIC, v.ExtraAIC = plain.CriterionValue, extra.CriterionValue, plain.AIC, extra.AIC
	gain, aic := v.PlainCriterion-v.ExtraCriterion, v.PlainAIC-v.ExtraAIC
	shape := fmt.Sprintf("%s %.3g", extra.ShapeName, extra.Shape)
	switch {
	case extra.Simpler != "":
		v.Reason = fmt.Sprintf("the %s went back to the %s: there is no extra variation", v.Extra, v.Plain)
		return false
	case gain > clearGain:
		v.Reason = fmt.Sprintf("the restricted likelihood is better by %.3g with extra variation (%s)", gain, shape)
	case gain < -clearGain:
		v.Reason = fmt.Sprintf("the restricted likelihood is better by %.3g without extra variation", -gain)
		return false
	case aic > 0:
		v.Reason = fmt.Sprintf("the restricted likelihood is about even (%.2g) and the AIC better by %.3g with extra variation (%s)", gain, aic, shape)
	default:
		v.Reason = fmt.Sprintf("the restricted likelihood is about even (%.2g) and the AIC better by %.3g without extra variation", gain, -aic)
		return false
	}
	v.Chosen = v.Extra
	return true
}

// Distributions returns the words of the distributions that can be fitted.
func Distributions() []string { return response.Names() }

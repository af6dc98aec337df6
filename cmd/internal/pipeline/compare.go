package pipeline

import (
	"context"
	"io"
	"slices"

	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/io/tables"
	"drumlin/spatial"
)

// compare fits the alternatives to the same rows and scores all of them.
func (r *run) compare(ctx context.Context) error {
	if len(r.settings.Also) == 0 {
		return nil
	}
	candidates, err := r.asked.Candidates()
	if err != nil {
		return err
	}
	var list []spatial.Candidate
	for _, c := range candidates {
		list = append(list, spatial.Candidate{Name: c.Name, Model: model(c.Settings),
			Fit: func(ctx context.Context, m spatial.Model, d spatial.Data, o spatial.Options) (*spatial.Surface, error) {
				f, err := fitAs(ctx, c.Settings, m, d, o)
				return f.surface, err
			}})
	}
	r.comparison, err = spatial.Compare(ctx, list, r.obs.data, r.options(), nil)
	return err
}

// writeCandidates writes candidates.csv.
func (r *run) writeCandidates(w io.Writer) error {
	n := len(r.comparison)
	text := func(f func(spatial.Comparison) string) []string {
		v := make([]string, n)
		for i, c := range r.comparison {
			v[i] = f(c)
		}
		return v
	}
	number := func(f func(spatial.Comparison) float64) []float64 {
		v := make([]float64, n)
		for i, c := range r.comparison {
			v[i] = f(c)
		}
		return v
	}
	return tables.Write(w, n, []tables.Column{
		{Name: "candidate", Text: text(func(c spatial.Comparison) string { return c.Name })},
		{Name: "distribution", Text: text(func(c spatial.Comparison) string { return c.Distribution })},
		{Name: "link", Text: text(func(c spatial.Comparison) string { return c.Link })},
		{Name: "degrees_of_freedom", Number: number(func(c spatial.Comparison) float64 { return c.DF })},
		{Name: "deviance_share", Number: number(func(c spatial.Comparison) float64 { return c.DevianceShare })},
		{Name: "aic", Number: number(func(c spatial.Comparison) float64 { return c.AIC })},
		{Name: "aic_corrected", Number: number(func(c spatial.Comparison) float64 { return c.AICCorrected })},
		{Name: "restricted_likelihood", Number: number(func(c spatial.Comparison) float64 { return c.RestrictedLikelihood })},
		{Name: "log_score", Number: number(func(c spatial.Comparison) float64 { return c.LogScore })},
		{Name: "log_score_standard_error", Number: number(func(c spatial.Comparison) float64 { return c.LogScoreSE })},
		{Name: "difference", Number: number(func(c spatial.Comparison) float64 { return c.Difference })},
		{Name: "difference_standard_error", Number: number(func(c spatial.Comparison) float64 { return c.DifferenceSE })},
	})
}

// describeCandidates words the comparison for the summary.
func (r *run) describeCandidates() []summary.Candidate {
	list := []summary.Candidate{}
	for _, c := range r.comparison {
		s := summary.Candidate{Name: c.Name, Distribution: c.Distribution, Link: c.Link, DegreesOfFreedom: summary.Number(c.DF),
			DevianceShare: summary.Number(c.DevianceShare), AIC: summary.Number(c.AIC), AICCorrected: summary.Number(c.AICCorrected),
			RestrictedLikelihood: summary.Number(c.RestrictedLikelihood), LogScore: summary.Number(c.LogScore), LogScoreSE: summary.Number(c.LogScoreSE),
			Difference: summary.Number(c.Difference), DifferenceSE: summary.Number(c.DifferenceSE), Blocks: c.Blocks, Scored: c.Scored, LeftOut: c.LeftOut,
			Missing: map[string]string{}}
		for _, m := range c.Missing {
			s.Missing[m.Figure] = m.Reason
		}
		list = append(list, s)
	}
	return list
}

// allCovariates lists the covariates that the map's own model or an alternative needs, so that all are
// fitted to the same rows.
func allCovariates(s plan.Settings, of func(plan.Settings) []string) []string {
	list := of(s)
	if len(s.Also) == 0 {
		return list
	}
	candidates, err := s.Candidates()
	if err != nil {
		return list // Validate has said so
	}
	for _, c := range candidates {
		for _, name := range of(c.Settings) {
			if !slices.Contains(list, name) {
				list = append(slices.Clone(list), name)
			}
		}
	}
	return list
}

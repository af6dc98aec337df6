package pipeline

import (
	"context"

	"drumlin/io/summary"
	"drumlin/spatial"
)

// test asks whether there is any variation between places, between groups, and along curves.
func (r *run) test(ctx context.Context) error {
	if !*r.settings.TestVariation {
		return nil
	}
	seed := *r.settings.Seed
	surface, err := r.surface.TestVariation(ctx, r.obs.data, 0, seed)
	if err != nil {
		return err
	}
	groups, err := r.surface.TestGroups(ctx, r.obs.data, 0, seed)
	if err != nil {
		return err
	}
	for _, t := range append([]spatial.BootstrapTest{surface}, groups...) {
		r.tests = append(r.tests, summary.Test{Of: t.Of, Method: "parametric bootstrap of the gain in fit", Statistic: summary.Number(t.Statistic),
			Draws: t.Draws, Exceeded: t.Exceeded, Failed: t.Failed, P: bootstrapP(t), Skipped: t.Skipped})
	}
	curves, err := r.surface.TestCurves(r.obs.data.Covariates)
	if err != nil {
		return err
	}
	for _, t := range curves {
		r.tests = append(r.tests, summary.Test{Of: "curve " + t.Name, Method: "Wald statistic of reduced rank (Wood 2013)", Statistic: summary.Number(t.Statistic),
			DegreesOfFreedom: summary.Number(t.DF), P: summary.Number(t.P)})
	}
	return nil
}

func bootstrapP(t spatial.BootstrapTest) summary.Number {
	if t.Skipped != "" {
		return summary.Number(notKnown)
	}
	return summary.Number(t.P)
}

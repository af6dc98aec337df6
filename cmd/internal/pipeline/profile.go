package pipeline

import (
	"context"

	"drumlin/io/plan"
)

// Profiled is a region's fit at one smoothness, without a map.
type Profiled struct {
	Lambda    float64 // of the surface
	AtUpper   bool    // the surface came out as its plane: any larger lambda does as well
	Criterion float64 // restricted likelihood, of which less is better
	// Settings are those of the fit with the choices that the data made in them, so that a fit at another smoothness
	// differs in that alone.
	Settings plan.Settings
}

// Profile fits a region of a batch without mapping it: with the smoothness that s asks for, and for the criterion's sake
// without the uncertainty of it.
func Profile(ctx context.Context, s plan.Settings, g Region) (Profiled, error) {
	s.Choose("smoothness-uncertainty", plan.Off, "only the criterion is wanted")
	r := &run{settings: s, asked: s, region: &g}
	if err := r.read(ctx); err != nil {
		return Profiled{}, err
	}
	if err := r.layArea(); err != nil {
		return Profiled{}, err
	}
	if err := r.fit(ctx); err != nil {
		return Profiled{}, err
	}
	if r.settings.ChoosesVariation() {
		r.settings.Choose("extra-variation", plan.NoVariation, "the data have chosen")
	}
	rep := r.surface.Report()
	return Profiled{Lambda: rep.Lambda, AtUpper: rep.AtUpper, Criterion: rep.CriterionValue, Settings: r.settings}, nil
}

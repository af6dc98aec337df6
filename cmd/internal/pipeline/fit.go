package pipeline

import (
	"context"
	"fmt"
	"slices"
	"strconv"

	"drumlin/io/plan"
	"drumlin/spatial"
)

// fit fits the model, and makes the choices that the settings leave to the data. Places that cannot carry a surface are
// the fit's to refuse, before the lattice complains of them in its own terms.
func (r *run) fit(ctx context.Context) error {
	model := model(r.settings)
	model.SmoothnessUncertainty = r.uncertainSmoothness(model)
	if model.Smoothness.Method == spatial.Given && model.Smoothness.Lambda == 0 {
		return throughEveryRow()
	}
	f, err := fitAs(ctx, r.settings, model, r.obs.data, r.options())
	if err != nil {
		return err
	}
	r.surface, r.knotPath, r.variation = f.surface, f.knotPath, f.variation
	if v := f.variation; v != nil {
		r.settings.Choose("distribution", v.Chosen, v.Reason)
	}
	if r.area.problem != nil {
		return r.area.problem
	}
	rep := r.surface.Report()
	if !rep.KnownDispersion && !(rep.Dispersion > 0) {
		return throughEveryRow()
	}
	r.recordKnots(rep)
	return nil
}

// options are how the region is fitted.
func (r *run) options() spatial.Options {
	return spatial.Options{Workers: *r.settings.Workers, Seed: *r.settings.Seed, Area: r.area.knotPlaces}
}

// fitted is a surface with the choices that the data made on the way to it.
type fitted struct {
	surface   *spatial.Surface
	knotPath  []spatial.KnotStep // nil where the knots were given
	variation *spatial.Variation // nil where there was nothing to choose
}

// fitAs fits a model as the settings say: with the knots they allow, or with as many as the fit needs, and with the
// variation that the data ask for where they leave that open. Each distribution then has the knots it needs: with fewer,
// detail that the knots cannot follow would pass for extra variation.
func fitAs(ctx context.Context, s plan.Settings, m spatial.Model, d spatial.Data, o spatial.Options) (fitted, error) {
	paths := map[string][]spatial.KnotStep{}
	once := func(ctx context.Context, m spatial.Model) (*spatial.Surface, error) {
		if !s.MaxKnots.Auto {
			return spatial.Fit(ctx, m, d, o)
		}
		surface, path, err := spatial.FitKnots(ctx, m, d, o, 0)
		paths[m.Distribution] = path
		return surface, err
	}
	if !s.ChoosesVariation() {
		surface, err := once(ctx, m)
		return fitted{surface, paths[m.Distribution], nil}, err
	}
	surface, v, err := spatial.FitVariation(ctx, m, once)
	return fitted{surface, paths[v.Chosen], &v}, err
}

// recordKnots records how many knots were enough, and why.
func (r *run) recordKnots(rep spatial.Report) {
	n := len(r.knotPath)
	if n == 0 {
		return
	}
	last := r.knotPath[n-1]
	why := fmt.Sprintf("every place has a knot (%d places, %d knots in gaps)", rep.Knots-rep.KnotsInGaps, rep.KnotsInGaps)
	switch {
	case rep.Knots-rep.KnotsInGaps >= rep.DistinctPlaces:
	case last.RMS <= spatial.SettledRMS && last.Most <= spatial.SettledMost:
		why = fmt.Sprintf("from %d knots to %d the fit moved by no more than %.2g mean standard errors", r.knotPath[n-2].Knots, last.Knots, last.Most)
	default:
		why = fmt.Sprintf("the fit still moves, by %.2g mean standard errors, but this is the most", last.Most)
	}
	r.settings.Choose("max-knots", strconv.Itoa(max(4, last.Knots)), why)
}

// throughEveryRow refuses an interpolation, whose errors cannot be told.
func throughEveryRow() error {
	return &spatial.Error{Message: "the fit passes through every observation, so nothing is left to estimate its error from",
		Advice: "let the data choose the smoothness, or give a larger number with --smoothness"}
}

// uncertainRows is the number of rows below which the smoothness' uncertainty is in the errors unless the settings say
// otherwise: with more it hardly shows.
const uncertainRows = 1000

// model turns the settings into the model.
func model(s plan.Settings) spatial.Model {
	m := spatial.Model{Distribution: *s.Distribution, Link: *s.Link, Shape: s.Shape, MaxKnots: s.MaxKnots.N, Shrink: *s.Shrink}
	m.ScaleVariation = s.Said("extra-variation") && *s.ExtraVariation == plan.ScaleVariation
	if *s.Surface == plan.NoSurface {
		m.Surface = spatial.None
	}
	if s.SurfacePer != nil {
		m.SurfacePer = *s.SurfacePer
		m.OwnSmoothness = s.SurfaceSmoothness != nil && *s.SurfaceSmoothness == plan.OwnSmoothness
	}
	switch s.Smoothness.By {
	case plan.ByGCV:
		m.Smoothness.Method = spatial.GCV
	case plan.ByNumber:
		m.Smoothness = spatial.Smoothness{Method: spatial.Given, Lambda: s.Smoothness.Lambda}
	}
	m.Effects = effects(s)
	return m
}

// uncertainSmoothness decides whether errors include that the smoothness is not known, and records the choice.
func (r *run) uncertainSmoothness(m spatial.Model) bool {
	s := &r.settings
	switch *s.SmoothnessUncertainty {
	case plan.On:
		return true
	case plan.Off:
		return false
	}
	if !smooth(m) {
		return false
	}
	n, choice, why := r.obs.table.Len(), plan.Off, ""
	switch {
	case m.Smoothness.Method == spatial.Given:
		why = "the smoothness is given"
	case m.Smoothness.Method == spatial.GCV:
		why = "it is known for restricted likelihood only"
	case m.ScaleVariation:
		why = "it is not known where the variation is scaled"
	case n >= uncertainRows:
		why = fmt.Sprintf("with %d rows it hardly shows", n)
	default:
		choice, why = plan.On, fmt.Sprintf("%d rows are fewer than %d", n, uncertainRows)
	}
	s.Choose("smoothness-uncertainty", choice, why)
	return choice == plan.On
}

// smooth reports whether a model has a part whose smoothness has to be chosen.
func smooth(m spatial.Model) bool {
	return m.Surface != spatial.None || slices.ContainsFunc(m.Effects, func(e spatial.Effect) bool {
		return e.Role == spatial.Curve || e.Role == spatial.Group
	})
}

// effects lists the settings' covariates with their roles.
func effects(s plan.Settings) (list []spatial.Effect) {
	for _, name := range s.Linear {
		list = append(list, spatial.Effect{Name: name, Role: spatial.Linear})
	}
	for _, name := range s.Category {
		list = append(list, spatial.Effect{Name: name, Role: spatial.Category})
	}
	for _, name := range s.Curve {
		list = append(list, spatial.Effect{Name: name, Role: spatial.Curve})
	}
	for _, c := range s.CurvePer {
		list = append(list, spatial.Effect{Name: c.Curve, Role: spatial.Curve, Per: c.Category})
	}
	for _, name := range s.Group {
		list = append(list, spatial.Effect{Name: name, Role: spatial.Group})
	}
	return list
}

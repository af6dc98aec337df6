package pipeline

import (
	"fmt"
	"io"
	"math"

	"drumlin/io/chart"
	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/io/tables"
	"drumlin/spatial"
)

// writeEffects writes effects.csv: a row for each value or level that an effect is told at, on the link scale.
func (r *run) writeEffects(w io.Writer) error {
	var name, role, level []string
	var at, estimate, se, lower, upper []float64
	q := r.surface.Quantile(*r.settings.Confidence)
	for _, f := range r.surface.Effects() {
		for k, v := range f.Estimate {
			x, l := math.NaN(), f.Level
			if f.X != nil {
				x = f.X[k]
			} else {
				l = f.Label[k]
			}
			name, role, level, at = append(name, f.Covariate), append(role, roles[f.Role]), append(level, l), append(at, x)
			estimate, se = append(estimate, v), append(se, f.StandardError[k])
			lower, upper = append(lower, v-q*f.StandardError[k]), append(upper, v+q*f.StandardError[k])
		}
	}
	return tables.Write(w, len(name), []tables.Column{
		{Name: "effect", Text: name}, {Name: "role", Text: role}, {Name: "level", Text: level}, {Name: "value", Number: at},
		{Name: "estimate", Number: estimate}, {Name: "standard_error", Number: se}, {Name: "lower", Number: lower}, {Name: "upper", Number: upper},
	})
}

// effectsPicture is effects.png.
func (r *run) effectsPicture() chart.Effects {
	e := chart.Effects{Title: r.reporting.title + ": effects", SharedScale: true, Foot: effectCautions,
		Subtitle: fmt.Sprintf("%s %% intervals; those of slopes and curves include the uncertainty of the level", summary.Short(summary.Number(100**r.settings.Confidence)))}
	q := r.surface.Quantile(*r.settings.Confidence)
	for _, f := range r.surface.Effects() {
		p := chart.Panel{Name: f.Name, Scale: linkScale(*r.settings.Link), Estimate: f.Estimate, X: f.X, Label: f.Label}
		for k, v := range f.Estimate {
			p.Lower, p.Upper = append(p.Lower, v-q*f.StandardError[k]), append(p.Upper, v+q*f.StandardError[k])
		}
		switch f.Role {
		case spatial.Linear:
			p.Kind, p.At = chart.Line, r.numberOf(f.Covariate)
		case spatial.Curve:
			p.Kind, p.At = chart.Curve, r.numberOf(f.Covariate)
		case spatial.Category:
			p.Kind, p.Base = chart.Levels, f.Label[0]
		case spatial.Group:
			p.Kind = chart.Group
		}
		e.Panels = append(e.Panels, p)
	}
	return e
}

var effectCautions = []string{
	"An effect is what goes with a covariate when all else in the model stays as it is; it need not be its cause.",
	"Beyond the observed values an effect is not known.",
}

// linkScale says what the vertical axis of an effect is.
func linkScale(link string) string {
	switch link {
	case plan.Log:
		return "log scale: +0.69 doubles the level"
	case plan.Logit:
		return "logit scale: +0.69 doubles the odds"
	case plan.ComplementaryLogLog:
		return "complementary log-log scale"
	}
	return "in the unit of the response"
}

func (r *run) numberOf(name string) []float64 {
	for _, c := range r.obs.data.Covariates {
		if c.Name == name {
			return c.Number
		}
	}
	return nil
}

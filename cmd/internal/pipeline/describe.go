package pipeline

import (
	"fmt"
	"math"
	"slices"

	"drumlin/grids"
	"drumlin/io/summary"
	"drumlin/spatial"
)

// describe fills the document, but for the outputs.
func (r *run) describe() {
	o := r.obs
	x, _ := distinctPlaces(o.data.Places)
	d := &r.document
	d.Version = r.version
	d.Input = summary.Input{Name: o.table.Source, SHA256: o.sha256, Rows: o.table.Rows, Used: o.table.Len(), SetAside: map[string]int{},
		DistinctPlaces: len(x), Coordinates: o.said,
		MedianSpacing: summary.Number(grids.MedianSpacing(o.data.Places.X, o.data.Places.Y))}
	for _, a := range o.table.Aside {
		d.Input.SetAside[a.Code]++
	}
	for _, e := range r.settings.Effective() {
		d.Settings = append(d.Settings, summary.Setting{Key: e.Key, Value: e.Value, Chosen: e.Why})
	}
	d.Lattice = r.describeTarget()
	r.describeFit(d)
	d.Effects = r.describeEffects()
	d.Estimates = r.describeEstimates()
	if r.zones != nil {
		d.Zones = r.zones.describe(r.reporting.Unit)
	}
	d.Checks = r.checks()
	d.Cautions = r.cautions()
}

func (r *run) describeTarget() summary.Lattice {
	t := r.target
	if t.own() {
		return summary.Lattice{Kind: "places", CRS: r.obs.system.Code(), Count: t.places.Len(), Cell: summary.Number(math.NaN()), Area: summary.Number(math.NaN())}
	}
	return summary.Lattice{Kind: "cells", CRS: r.obs.system.Code(), Cell: summary.Number(t.lattice.Cell), Across: t.lattice.NX, Up: t.lattice.NY,
		Count: len(t.cells), Area: summary.Number(t.lattice.Area())}
}

func (r *run) describeFit(d *summary.Document) {
	rep := r.surface.Report()
	d.Fit = summary.Fit{
		Distribution: rep.Distribution, Link: rep.Link,
		Converged: rep.Converged, Iterations: rep.Iterations, Gradient: summary.Number(rep.ProjectedGradient),
		Criterion: criterionName(rep), CriterionValue: summary.Number(rep.CriterionValue),
		Lambda:           map[string]summary.Term{},
		DegreesOfFreedom: map[string]summary.Number{"intercept": 1, "total": summary.Number(rep.DF)},
		Knots:            rep.Knots, KnotsInGaps: rep.KnotsInGaps, Plane: rep.Knots > 0 && rep.SurfaceDF < 2.01,
		Dispersion: summary.Number(rep.Dispersion), DispersionKnown: rep.KnownDispersion, Pearson: summary.Number(rep.Pearson),
		Deviance: summary.Number(rep.Deviance), DevianceShare: summary.Number(rep.DevianceShare),
		LogLikelihood: summary.Number(rep.LogLikelihood), AIC: summary.Number(rep.AIC),
	}
	if rep.Knots > 0 {
		d.Fit.DegreesOfFreedom["surface"] = summary.Number(rep.SurfaceDF)
		d.Fit.Lambda["surface"] = summary.Term{Value: summary.Number(rep.Lambda),
			Convention: "deviance + lambda J(f), J the integral of f_xx^2 + 2 f_xy^2 + f_yy^2 with places in metres"}
	}
	q := r.surface.Quantile(*r.settings.Confidence)
	for _, c := range rep.Coefficients {
		d.Coefficients = append(d.Coefficients, summary.Coefficient{Name: c.Name, Estimate: summary.Number(c.Estimate), StandardError: summary.Number(c.StandardError),
			Lower: summary.Number(c.Estimate - q*c.StandardError), Upper: summary.Number(c.Estimate + q*c.StandardError)})
	}
	for _, e := range r.surface.Model().Effects {
		name := e.Name
		if _, taken := d.Fit.DegreesOfFreedom[name]; taken || name == "surface" {
			name += " (covariate)"
		}
		d.Fit.DegreesOfFreedom[name] = summary.Number(r.columnsOf(e))
	}
}

// columnsOf counts an effect's coefficients.
func (r *run) columnsOf(e spatial.Effect) int {
	if e.Role == spatial.Linear {
		return 1
	}
	for _, c := range r.obs.data.Covariates {
		if c.Name == e.Name {
			return len(c.Level) - 1
		}
	}
	return 0
}

func criterionName(rep spatial.Report) string {
	switch rep.Method {
	case spatial.GCV:
		if rep.KnownDispersion {
			return "unbiased risk, the cross-validation of a known dispersion"
		}
		return "generalised cross-validation"
	case spatial.Given:
		return "a given number"
	}
	return "restricted likelihood"
}

func (r *run) describeEffects() []summary.Effect {
	list := []summary.Effect{}
	for _, c := range r.obs.data.Covariates {
		e := summary.Effect{Name: c.Name, Role: "category", Held: r.target.held[c.Name]}
		if c.Number != nil {
			e.Role = "linear"
			e.Range = summary.Short(summary.Number(slices.Min(c.Number))) + " to " + summary.Short(summary.Number(slices.Max(c.Number)))
		} else {
			e.Range = fmt.Sprintf("%d levels, %s the base", len(c.Level), c.Level[0])
		}
		list = append(list, e)
	}
	return list
}

func (r *run) describeEstimates() summary.Estimates {
	sorted := slices.Sorted(slices.Values(r.estimates.estimate))
	errors := slices.Sorted(slices.Values(r.estimates.standardError))
	e := summary.Estimates{Unit: r.reporting.Unit, Confidence: summary.Number(*r.settings.Confidence),
		Threshold: summary.Number(math.NaN()), Above: summary.Number(math.NaN()), Reference: summary.Number(math.NaN())}
	if ref := r.reporting.Reference; ref > 0 {
		e.Reference = summary.Number(ref)
	}
	if n := len(sorted); n > 0 {
		e.Least, e.Median, e.Most = summary.Number(sorted[0]), summary.Number(sorted[n/2]), summary.Number(sorted[n-1])
		e.MedianStandardError = summary.Number(errors[n/2])
	}
	if t := r.reporting.Threshold; t != nil {
		n := 0
		for _, c := range r.estimates.chance {
			if c > 0.95 {
				n++
			}
		}
		e.Threshold, e.Above = summary.Number(*t), summary.Number(float64(n)/float64(len(sorted)))
	}
	return e
}

// wants reports whether a kind of file was asked for.
func (r *run) wants(kind string) bool { return slices.Contains(r.settings.Write, kind) }

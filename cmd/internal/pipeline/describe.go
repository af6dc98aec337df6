package pipeline

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"drumlin/io/summary"
	"drumlin/spatial"
)

// describe fills the document, but for the outputs.
func (r *run) describe() {
	o := r.obs
	d := &r.document
	d.Version = r.version
	d.Input = summary.Input{Name: o.table.Source, SHA256: o.sha256, Rows: o.table.Rows, Used: o.own, SetAside: map[string]int{},
		DistinctPlaces: len(o.placeX), Coordinates: o.said,
		MedianSpacing: summary.Number(o.spacing)}
	for _, a := range o.table.Aside {
		d.Input.SetAside[a.Code]++
	}
	d.Input.Format = o.written()
	for _, b := range o.table.BelowLimit {
		d.Input.BelowLimit = append(d.Input.BelowLimit, summary.BelowLimit{Column: b.Column, Rows: b.Rows, Rule: b.Rule.String()})
	}
	for _, e := range r.settings.Effective() {
		d.Settings = append(d.Settings, summary.Setting{Key: e.Key, Value: e.Value, Chosen: e.Why})
	}
	d.Lattice = r.describeTarget()
	r.describeFit(d)
	d.Effects = r.describeEffects()
	d.Tests = append([]summary.Test{}, r.tests...)
	d.Candidates = r.describeCandidates()
	d.Estimates = r.describeEstimates()
	d.Input.Summed = o.summed
	if o.thinned.step > 0 {
		d.Input.Raster = &summary.Raster{Cells: o.thinned.cells, Step: o.thinned.step}
	}
	if used := o.own + o.summed - o.joined.Added; used != o.own {
		d.Input.Used, d.Input.Fitted = used, o.own
	}
	d.Input.Joined = r.describeJoins()
	if r.byPlace != nil {
		d.Places = r.byPlace.describe()
	}
	if r.zones != nil {
		d.Zones = r.zones.describe(r.reporting.Unit)
	}
	d.Region = r.describeRegion()
	d.Checks = r.checks()
	d.Cautions = r.cautions()
}

// written says how the table is written, where it is not as it usually is.
func (o *observations) written() string {
	var parts []string
	between := map[rune]string{';': "semicolons", '\t': "tabs", '|': "bars"}[o.table.Separator]
	if between != "" {
		parts = append(parts, between+" between the columns")
	}
	if o.table.Encoding != "UTF-8" {
		parts = append(parts, o.table.Encoding+" text")
	}
	return strings.Join(parts, ", ")
}

func (r *run) describeTarget() summary.Lattice {
	t := r.target
	if t.own() {
		return summary.Lattice{Kind: "places", CRS: r.obs.system.Code(), Count: t.places.Len(), Cell: summary.Number(math.NaN()), Area: summary.Number(math.NaN())}
	}
	return summary.Lattice{Kind: "cells", CRS: r.obs.system.Code(), Cell: summary.Number(t.lattice.Cell), Across: t.lattice.NX, Up: t.lattice.NY,
		Count: len(t.cells), Masked: t.masked, Area: summary.Number(t.lattice.Area())}
}

func (r *run) describeFit(d *summary.Document) {
	rep := r.surface.Report()
	d.Fit = summary.Fit{
		Distribution: rep.Distribution, Link: rep.Link,
		Converged: rep.Converged, Iterations: rep.Iterations, Gradient: summary.Number(rep.ProjectedGradient),
		Criterion: criterionName(rep), CriterionValue: summary.Number(rep.CriterionValue),
		Lambda: map[string]summary.Term{}, DegreesOfFreedom: degreesOfFreedom(rep, r.surface),
		Knots: rep.Knots, KnotsInGaps: rep.KnotsInGaps, Plane: r.plane(),
		Dispersion: summary.Number(rep.Dispersion), DispersionKnown: rep.KnownDispersion, Pearson: summary.Number(rep.Pearson),
		Deviance: summary.Number(rep.Deviance), DevianceShare: summary.Number(rep.DevianceShare),
		LogLikelihood: summary.Number(rep.LogLikelihood), AIC: summary.Number(rep.AIC), AICCorrected: summary.Number(rep.AICCorrected),
		UncertainSmooth: r.surface.Model().SmoothnessUncertainty,
	}
	for _, t := range rep.Smooths {
		d.Fit.Lambda[t.Name] = summary.Term{Value: summary.Number(t.Lambda), Convention: conventions[t.Kind]}
	}
	if rep.ShapeName != "" {
		d.Fit.Shape = &summary.Shape{Name: rep.ShapeName, Value: summary.Number(rep.Shape), Estimated: rep.ShapeEstimated, Simpler: rep.Simpler}
	}
	if v := r.variation; v != nil {
		d.Fit.ExtraVariation = &summary.ExtraVariation{Plain: v.Plain, Extra: v.Extra,
			PlainCriterion: summary.Number(v.PlainCriterion), ExtraCriterion: summary.Number(v.ExtraCriterion),
			PlainAIC: summary.Number(v.PlainAIC), ExtraAIC: summary.Number(v.ExtraAIC), Chosen: v.Chosen, Reason: v.Reason}
	}
	d.Fit.KnotPath = []summary.KnotStep{}
	for _, k := range r.knotPath {
		d.Fit.KnotPath = append(d.Fit.KnotPath, summary.KnotStep{Knots: k.Knots, DegreesOfFreedom: summary.Number(k.DF),
			RMSChange: summary.Number(k.RMS), LargestChange: summary.Number(k.Most)})
	}
	q := r.surface.Quantile(*r.settings.Confidence)
	for _, c := range rep.Coefficients {
		d.Coefficients = append(d.Coefficients, summary.Coefficient{Name: c.Name, Estimate: summary.Number(c.Estimate), StandardError: summary.Number(c.StandardError),
			Lower: summary.Number(c.Estimate - q*c.StandardError), Upper: summary.Number(c.Estimate + q*c.StandardError)})
	}
}

// plane reports whether every surface came out as a tilted plane: two slopes each, and the levels of all but the first.
func (r *run) plane() bool {
	rep := r.surface.Report()
	return rep.Knots > 0 && !r.surface.Model().Shrink && rep.SurfaceDF < float64(3*r.surfaces())-1+0.01
}

// surfaces counts the surfaces: one, or one for each level of a category.
func (r *run) surfaces() int { return max(1, len(r.surface.State().Level)) }

// conventions say what a lambda multiplies.
var conventions = map[spatial.SmoothKind]string{
	spatial.SurfaceSmooth: "deviance + lambda J(f), J the integral of f_xx^2 + 2 f_xy^2 + f_yy^2 with places in metres",
	spatial.SlopeSmooth:   "deviance + lambda times the squared slope in units of the knots' spread",
	spatial.CurveSmooth:   "deviance + lambda times the sum of squared second differences of the B-spline coefficients",
	spatial.GroupSmooth:   "deviance + lambda times the sum of squared levels; dispersion over lambda is their variance",
}

// degreesOfFreedom lists them by term, with the total. A covariate whose name is taken is marked.
func degreesOfFreedom(rep spatial.Report, s *spatial.Surface) map[string]summary.Number {
	df := map[string]summary.Number{"intercept": 1, "total": summary.Number(rep.DF)}
	if rep.Knots > 0 {
		df["surface"] = summary.Number(rep.SurfaceDF)
	}
	for _, f := range s.Effects() {
		name := f.Name
		if _, taken := df[name]; taken || name == "surface" {
			name += " (covariate)"
		}
		df[name] = summary.Number(f.DF)
	}
	return df
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
	none := summary.Number(math.NaN())
	dispersion := r.surface.Report().Dispersion
	if per := r.settings.SurfacePer; per != nil {
		list = append(list, summary.Effect{Name: *per, Role: "surface-per", Held: r.target.held[*per], HeldValue: none, Deviation: none,
			Range: fmt.Sprintf("%d levels", r.surfaces()), DegreesOfFreedom: summary.Number(r.surface.Report().SurfaceDF), Overlap: none})
	}
	for _, f := range r.surface.Effects() {
		e := summary.Effect{Name: f.Covariate, Role: roles[f.Role], Per: f.Level, Held: r.target.held[f.Covariate], HeldValue: none, Deviation: none,
			DegreesOfFreedom: summary.Number(f.DF), Overlap: summary.Number(f.Overlap)}
		if v, ok := r.target.heldNumber[f.Covariate]; ok {
			e.HeldValue = summary.Number(v)
		}
		switch {
		case f.X != nil:
			e.Range = summary.Short(summary.Number(f.X[0])) + " to " + summary.Short(summary.Number(f.X[len(f.X)-1]))
		case f.Role == spatial.Group:
			e.Range = fmt.Sprintf("%d levels", len(f.Label))
			e.Deviation = summary.Number(math.Sqrt(dispersion / f.Lambda))
		default:
			e.Range = fmt.Sprintf("%d levels, %s the base", len(f.Label), f.Label[0])
		}
		list = append(list, e)
	}
	return list
}

var roles = map[spatial.Role]string{spatial.Linear: "linear", spatial.Category: "category", spatial.Curve: "curve", spatial.Group: "group"}

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

// notKnown is a figure that there is none of; null in JSON.
var notKnown = math.NaN()

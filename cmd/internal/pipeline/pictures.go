package pipeline

import (
	"maps"
	"slices"
	"strings"

	"drumlin/io/draft"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// DraftFile is the file in the folder of a region of a batch that its pictures and its part of the mosaic come from.
const DraftFile = "pictures.draft"

// draft gathers what the pictures show: the estimate, its uncertainty, the chance where there is a threshold, and the
// relative risk where there is a reference.
func (r *run) draft() draft.Draft {
	e, rep := r.estimates, r.reporting
	d := draft.Draft{Response: rep.Response, Unit: rep.Unit, Factor: rep.Factor, Ratio: rep.ratio, Spread: draft.Variation,
		Threshold: rep.Threshold, Reference: rep.Reference,
		Title: rep.title, Subtitle: r.subtitle(), Stamp: r.stamp(), Foot: r.document.Cautions,
		Lattice: r.target.lattice, X: r.target.places.X, Y: r.target.places.Y,
		Estimate: e.estimate, StandardError: e.standardError, Lower: e.lower, Upper: e.upper, CV: e.cv, Nearest: e.nearest,
		Chance: e.chance, Relative: e.relative, RelativeLower: e.relativeLower, RelativeUpper: e.relativeUpper,
		Outline: r.area.outline, PlaceX: r.obs.placeX, PlaceY: r.obs.placeY}
	d.Lattice.Mask = nil
	if *r.settings.Distribution == plan.Gaussian {
		d.Spread = draft.StandardError
	}
	if !r.target.own() {
		d.Cells = make([]int32, len(r.target.cells))
		for k, c := range r.target.cells {
			d.Cells[k] = int32(c)
		}
	}
	if r.zones != nil {
		d.Zones = r.zones.drawn()
	}
	if p := r.byPlace; p != nil {
		d.ShapeOf = p.shapes()
		if r.settings.Key != nil {
			d.ShapeName = p.names()
		}
		d.ShapeEstimate, d.ShapeRelative = p.smoothed.estimate, p.smoothed.relative
	}
	if !r.marked() {
		d.PlaceX, d.PlaceY = nil, nil
	}
	return d
}

// marked reports whether observations get a mark on the map: not areas, whose borders say more than a mark in the middle,
// and not the cells of a raster, which are everywhere.
func (r *run) marked() bool {
	areas := r.byPlace != nil && r.byPlace.areas == len(r.byPlace.places)
	return !areas && r.obs.thinned.step == 0
}

// subtitle says what the map is adjusted to.
func (r *run) subtitle() string {
	if len(r.target.held) == 0 {
		return ""
	}
	var parts []string
	for _, name := range slices.Sorted(maps.Keys(r.target.held)) {
		parts = append(parts, name+" = "+r.target.held[name])
	}
	return "adjusted to " + strings.Join(parts, ", ")
}

// stamp says what keeps the map from being used.
func (r *run) stamp() string {
	var names []string
	for _, c := range r.document.Checks {
		if c.Level == summary.Stop {
			names = append(names, c.Name)
		}
	}
	if names == nil {
		return ""
	}
	return "NOT FOR USE: " + strings.Join(names, ", ")
}

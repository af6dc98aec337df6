package pipeline

import (
	"context"
	"fmt"
	"math"
	"slices"

	"drumlin/grids"
	"drumlin/io/chart"
	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/io/tables"
	"drumlin/spatial"
)

// zoneDraws is the number of joint posterior draws behind a zone's errors: a standard error good to 2 %.
const zoneDraws = 2000

// zoneResults are the rows of zones.csv.
type zoneResults struct {
	source  string // file of the zones
	zones   []grids.Zone
	totals  bool
	note    string
	area    []float64 // of the zone's cells, in the unit of areas
	unit    string    // of areas
	covered []float64 // share of the zone that its cells cover

	cells                                        []int64
	total, totalError, totalCV, totalLo, totalHi []float64
	mean, meanError, meanLo, meanHi, chance      []float64
	excess                                       []float64 // by how much the mean of the draws is above the sum, as a share
}

// squareMetres says how many square metres an area unit has.
var squareMetres = map[string]float64{plan.SquareMetres: 1, plan.Hectares: 1e4, plan.SquareKilometres: 1e6}

// addUp totals or averages the estimates over the zones.
func (r *run) addUp(ctx context.Context) error {
	s := r.settings
	if s.Zones == nil {
		return nil
	}
	shapes, err := r.readShapes(*s.Zones)
	if err != nil {
		return err
	}
	property := ""
	if s.ZoneName != nil {
		property = *s.ZoneName
	}
	names, _, err := shapes.Names(property)
	if err != nil {
		return err
	}
	z := &zoneResults{source: shapes.Source, unit: plan.SquareMetres}
	for i, f := range shapes.Features {
		zone := grids.Zone{Name: names[i], Shape: f.Shape}
		if err := zone.Validate(); err != nil {
			return refuse("", "%s: zone %q: %w", shapes.Source, zone.Name, err)
		}
		z.zones = append(z.zones, zone)
	}
	r.decideTotals(z)
	r.zones = z
	return r.sumZones(ctx, z)
}

// decideTotals says whether a total has a meaning: only counts divided by an area add up over an area, and only where
// covariates have their own values.
func (r *run) decideTotals(z *zoneResults) {
	kind, _ := r.settings.Denominator()
	switch {
	case kind != "area" && kind != "":
		z.note = "no totals: a rate over " + kind + " does not add up over an area; the mean is over cells of the map, each counting with its area, not with its " + kind
	case kind == "":
		z.note = "no totals: only counts with an area behind them add up; the mean is over cells of the map, each counting with its area"
	case len(r.target.held) > 0:
		z.unit = *r.settings.AreaUnit
		z.note = "no totals: the map is adjusted to held covariates, so its cells are not what stands there; the mean is adjusted as well"
	default:
		z.unit, z.totals = *r.settings.AreaUnit, true
	}
}

// sumZones fills the columns. A zone's total is the sum of its cells' estimates, each times the area that the cell and the
// zone have in common, so that zones that share no ground add up exactly.
func (r *run) sumZones(ctx context.Context, z *zoneResults) error {
	l := r.target.lattice
	sums, err := r.summed(ctx)
	if err != nil {
		return err
	}
	var sets []spatial.Share
	for _, zone := range z.zones {
		var set spatial.Share
		ground := 0.0
		cells, area := grids.SharesIn(l, zone.Shape)
		for k, c := range cells {
			if place := sums.of[c]; place > 0 {
				ground += area[k]
				set.Index, set.Weight = append(set.Index, place-1), append(set.Weight, area[k]/squareMetres[z.unit])
			}
		}
		sets = append(sets, set)
		z.cells = append(z.cells, int64(len(set.Index)))
		z.area = append(z.area, ground/squareMetres[z.unit])
		z.covered = append(z.covered, math.Min(1, ground/grids.AreaOf(zone, l.CRS)))
	}
	if slices.Max(z.cells) == 0 {
		return refuse("check that the zones are in the coordinates of the observations or in longitude and latitude, ask for smaller cells, or widen the map with --within",
			"%s: no cell of the map lies in any of the zones", z.source)
	}
	list, err := r.surface.Sums(ctx, sums.places, sums.covariates, sets, zoneDraws, *r.settings.Seed)
	if err != nil {
		return err
	}
	for k, sum := range list {
		z.add(r, k, sum)
	}
	return nil
}

// summable are the cells that are added up: those of the map and, where polygons bound the study area, those beside it
// that reach into it, so that sums are right to the edge.
type summable struct {
	places     spatial.Places
	covariates []spatial.Covariate
	of         []int32   // place of each cell of the lattice, counted from 1; 0 for a cell that is not added up
	within     []int     // cells that the study area's polygons cover in part or whole; nil without polygons
	area       []float64 // of the study area in each of them, in square metres
}

// summed lists the cells that are added up.
func (r *run) summed(ctx context.Context) (summable, error) {
	t := r.target
	s := summable{places: t.places, covariates: t.covariates, of: t.placeOf()}
	if r.area.within == nil {
		return s, nil
	}
	s.within, s.area = grids.SharesIn(t.lattice, r.area.within)
	var beside []int
	var x, y []float64
	for _, c := range s.within {
		if s.of[c] == 0 {
			cx, cy := t.lattice.Centre(c)
			beside, x, y = append(beside, c), append(x, cx), append(y, cy)
		}
	}
	layers, whole, err := r.sampleCells(ctx, x, y)
	if err != nil {
		return s, err
	}
	s.places = spatial.Places{X: slices.Clone(t.places.X), Y: slices.Clone(t.places.Y)}
	for _, k := range whole {
		s.places.X, s.places.Y = append(s.places.X, x[k]), append(s.places.Y, y[k])
		s.of[beside[k]] = int32(s.places.Len())
	}
	s.covariates = append(join(t.layers, pick(layers, whole)), heldAt(t.covariates[len(t.layers):], s.places.Len())...)
	return s, nil
}

// add states one zone's sum.
func (z *zoneResults) add(r *run, k int, sum spatial.Sum) {
	rep := r.reporting
	none := math.NaN()
	if z.cells[k] == 0 {
		sum = spatial.Sum{Value: none, Delta: none}
	}
	sd, spread := sum.DrawSD(), r.limits(sum)
	z.excess = append(z.excess, excess(sum))
	if z.cells[k] == 0 {
		sd = none
	}
	if z.totals {
		z.total, z.totalError, z.totalCV = append(z.total, sum.Value), append(z.totalError, sd), append(z.totalCV, sd/sum.Value)
		z.totalLo, z.totalHi = append(z.totalLo, spread[0]), append(z.totalHi, spread[1])
	}
	scale := rep.Factor / z.area[k]
	z.mean, z.meanError = append(z.mean, sum.Value*scale), append(z.meanError, sd*scale)
	z.meanLo, z.meanHi = append(z.meanLo, spread[0]*scale), append(z.meanHi, spread[1]*scale)
	if rep.Threshold == nil {
		return
	}
	above := 0.0
	for _, d := range sum.Draws {
		if d*scale > *rep.Threshold {
			above++
		}
	}
	if len(sum.Draws) == 0 {
		above = none
	}
	z.chance = append(z.chance, above/float64(len(sum.Draws)))
}

// excess is how far the mean of the draws of a sum lies above the sum itself, as a share of it; 0 without draws.
func excess(sum spatial.Sum) float64 {
	if len(sum.Draws) == 0 || !(sum.Value > 0) {
		return 0
	}
	mean := 0.0
	for _, d := range sum.Draws {
		mean += d / float64(len(sum.Draws))
	}
	return mean/sum.Value - 1
}

// limits returns the interval of a sum: log-normal for a log link (Burnham et al. 1987, Wildlife Monographs 99), the
// draws' own quantiles for shares, and symmetrical for the identity link.
func (r *run) limits(sum spatial.Sum) [2]float64 {
	confidence := *r.settings.Confidence
	if len(sum.Draws) == 0 {
		return [2]float64{math.NaN(), math.NaN()}
	}
	switch *r.settings.Link {
	case plan.Log:
		lower, upper := r.limitsFrom(sum.Value, sum.DrawSD())
		return [2]float64{lower, upper}
	case plan.Identity:
		lower, upper := r.limitsFrom(sum.Value, sum.Delta)
		return [2]float64{lower, upper}
	}
	sorted := slices.Sorted(slices.Values(sum.Draws))
	at := func(p float64) float64 { // linear between order statistics
		h := p * float64(len(sorted)-1)
		i := min(int(h), len(sorted)-2)
		return sorted[i] + (h-float64(i))*(sorted[i+1]-sorted[i])
	}
	return [2]float64{at(0.5 - confidence/2), at(0.5 + confidence/2)}
}

// columns returns zones.csv after the zone's name.
func (z *zoneResults) columns() []tables.Column {
	return []tables.Column{
		{Name: "cells", Whole: z.cells}, {Name: "area", Number: z.area},
		{Name: "total", Number: z.total}, {Name: "total_standard_error", Number: z.totalError}, {Name: "total_cv", Number: z.totalCV},
		{Name: "total_lower", Number: z.totalLo}, {Name: "total_upper", Number: z.totalHi},
		{Name: "mean", Number: z.mean}, {Name: "mean_standard_error", Number: z.meanError},
		{Name: "mean_lower", Number: z.meanLo}, {Name: "mean_upper", Number: z.meanHi},
		{Name: "share_covered", Number: z.covered}, {Name: "chance", Number: z.chance},
	}
}

func (z *zoneResults) names() []string {
	names := make([]string, len(z.zones))
	for i, zone := range z.zones {
		names[i] = zone.Name
	}
	return names
}

// drawn are the zones as a map shows them.
func (z *zoneResults) drawn() []chart.Zone {
	var list []chart.Zone
	for _, zone := range z.zones {
		list = append(list, chart.Zone{Name: zone.Name, Area: zone.Shape})
	}
	return list
}

// describe words the zones for the summary.
func (z *zoneResults) describe(unit string) *summary.Zones {
	d := &summary.Zones{Count: len(z.zones), Totals: z.totals, Note: z.note}
	const most = 5
	for k, zone := range z.zones {
		if k == most {
			d.Lines = append(d.Lines, fmt.Sprintf("and %d more in zones.csv", len(z.zones)-most))
			break
		}
		short := func(v float64) string { return summary.Short(summary.Number(v)) }
		if z.cells[k] == 0 {
			d.Lines = append(d.Lines, zone.Name+": no cell of the map lies in it")
		} else if z.totals {
			d.Lines = append(d.Lines, fmt.Sprintf("%s: %s in all (%s to %s; coefficient of variation %s %%) on %s %s",
				zone.Name, short(z.total[k]), short(z.totalLo[k]), short(z.totalHi[k]), short(100*z.totalCV[k]), short(z.area[k]), z.unit))
		} else {
			d.Lines = append(d.Lines, fmt.Sprintf("%s: mean %s (%s to %s), %s", zone.Name, short(z.mean[k]), short(z.meanLo[k]), short(z.meanHi[k]), unit))
		}
	}
	return d
}

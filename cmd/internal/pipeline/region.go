package pipeline

import (
	"context"
	"math"

	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/spatial"

	"gonum.org/v1/gonum/stat/distuv"
)

// addUpRegion totals and averages over the whole map of a region of a batch. Errors are by the delta method: a region is
// added up on every run, and draws would cost more than its fit.
func (r *run) addUpRegion(ctx context.Context) error {
	if r.region == nil {
		return nil
	}
	none := summary.Number(notKnown)
	g := summary.Region{Total: none, TotalCV: none, TotalLower: none, TotalUpper: none, Mean: none, MeanCV: none, MeanLower: none, MeanUpper: none}
	if !r.target.own() {
		z := &zoneResults{unit: plan.SquareMetres}
		r.decideTotals(z)
		cells, err := r.summed(ctx)
		if err != nil {
			return err
		}
		all, ground := r.wholeMap(cells, squareMetres[z.unit])
		sums, err := r.surface.Sums(ctx, cells.places, cells.covariates, []spatial.Share{all}, 0, *r.settings.Seed)
		if err != nil {
			return err
		}
		value, cv := sums[0].Value, sums[0].Delta/math.Abs(sums[0].Value)
		lower, upper := r.limitsFrom(value/ground, sums[0].Delta/ground)
		if z.totals {
			g.Total, g.TotalCV = summary.Number(value), summary.Number(cv)
			g.TotalLower, g.TotalUpper = summary.Number(lower*ground), summary.Number(upper*ground)
		}
		per := r.reporting.Factor
		g.Mean, g.MeanCV = summary.Number(value/ground*per), summary.Number(cv)
		g.MeanLower, g.MeanUpper = summary.Number(lower*per), summary.Number(upper*per)
	}
	r.sums = g
	return nil
}

// wholeMap is the study area: what of each cell lies in its polygons, once where they overlap, and the whole of every cell
// of the map where there are none; with its area, both in units of so many square metres.
func (r *run) wholeMap(cells summable, unit float64) (all spatial.Share, ground float64) {
	list := r.target.cells
	if cells.within != nil {
		list = cells.within
	}
	for k, c := range list {
		if cells.of[c] == 0 {
			continue // a layer has no value there
		}
		a := r.target.lattice.CellAreaAt(c)
		if cells.within != nil {
			a = math.Min(a, cells.area[k])
		}
		ground += a / unit
		all.Index, all.Weight = append(all.Index, cells.of[c]-1), append(all.Weight, a/unit)
	}
	return all, ground
}

// limitsFrom returns the limits of a mean or a sum of means from its standard error: log-normal for a log link (Burnham et al. 1987,
// Wildlife Monographs 99), symmetrical in the logit for a share, and in the mean itself for the identity link.
func (r *run) limitsFrom(mean, se float64) (lower, upper float64) {
	confidence := *r.settings.Confidence
	q := distuv.UnitNormal.Quantile(0.5 + confidence/2)
	switch *r.settings.Link {
	case plan.Log:
		cv := se / mean
		f := math.Exp(q * math.Sqrt(math.Log1p(cv*cv)))
		return mean / f, mean * f
	case plan.Identity:
		q = r.surface.Quantile(confidence)
		return mean - q*se, mean + q*se
	}
	eta, d := math.Log(mean/(1-mean)), q*se/(mean*(1-mean))
	return 1 / (1 + math.Exp(d-eta)), 1 / (1 + math.Exp(-d-eta))
}

// describeRegion is nil for a map of its own.
func (r *run) describeRegion() *summary.Region {
	if r.region == nil {
		return nil
	}
	g := r.sums
	g.Name, g.Fingerprint, g.Response = r.region.Name, r.region.Fingerprint, *r.settings.Response
	g.MarginRows, g.Per = r.obs.table.Len()-r.obs.own, summary.Number(r.reporting.Factor)
	return &g
}

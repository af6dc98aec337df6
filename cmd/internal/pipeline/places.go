package pipeline

import (
	"context"
	"fmt"
	"io"
	"math"
	"slices"

	"drumlin/grids"
	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/io/tables"
	"drumlin/io/vector"
	"drumlin/spatial"
	"drumlin/spatial/rates"

	"github.com/paulmach/orb"
)

// placeResults are the rows of places.csv.
type placeResults struct {
	places []place

	rows                          []int64
	observed, denominator         []float64 // denominator is nil where there is none
	crude, crudeLower, crudeUpper []float64 // limits are nil where they are not exact
	smoothed                      *estimates
	unseen                        int // places where nobody looked
	fewest, most                  int // points that stand for an area or a line
	areas, lines, spots           int // places of each kind
}

// assess holds what was observed at each place beside what the map says of it.
func (r *run) assess(ctx context.Context) error {
	o := r.obs
	if o.places == nil {
		return nil
	}
	p := &placeResults{}
	for _, one := range o.places {
		if one.first < 0 || len(one.rows) > 0 {
			p.places = append(p.places, one)
		}
	}
	p.count(o)
	p.observe(r)
	eta, se, err := r.levelsOf(ctx, p.places)
	if err != nil {
		return err
	}
	p.smoothed = state(r.surface, r.reporting.Reporting, eta, se)
	r.byPlace = p
	return nil
}

// count says what the places are.
func (p *placeResults) count(o *observations) {
	for _, one := range p.places {
		p.rows = append(p.rows, int64(len(one.rows)))
		if one.first < 0 {
			p.unseen++
		}
		switch one.shape.(type) {
		case orb.Polygon, orb.MultiPolygon:
			p.areas++
		case orb.LineString, orb.MultiLineString:
			p.lines++
		default:
			p.spots++
		}
		if start := o.data.Places.Start; start != nil && one.first >= 0 {
			n := int(start[one.first+1] - start[one.first])
			if p.most == 0 || n < p.fewest {
				p.fewest = n
			}
			p.most = max(p.most, n)
		}
	}
}

// observe adds up what was observed, and sets crude rates beside it. Limits of counts are those of Garwood (1936) and of
// positives those of Clopper & Pearson (1934); what is measured has none that are exact.
func (p *placeResults) observe(r *run) {
	d, confidence, factor := r.obs.data, *r.settings.Confidence, r.reporting.Factor
	n := len(p.places)
	p.observed, p.crude = repeat(notKnown, n), repeat(notKnown, n)
	counted := *r.settings.Distribution == plan.Poisson || *r.settings.Distribution == plan.NegativeBinomial
	if counted || d.Trials != nil {
		p.crudeLower, p.crudeUpper = repeat(notKnown, n), repeat(notKnown, n)
	}
	if d.Exposure != nil || d.Trials != nil {
		p.denominator = repeat(notKnown, n)
	}
	for k, one := range p.places {
		if len(one.rows) == 0 {
			continue
		}
		y, e := 0.0, 0.0
		for _, i := range one.rows {
			y += d.Response[i]
			e += r.behind(i)
		}
		p.observed[k], p.crude[k] = y, y/e*factor
		if p.denominator != nil {
			p.denominator[k] = e
		}
		switch {
		case counted:
			lower, upper := rates.CountLimits(y, confidence)
			p.crudeLower[k], p.crudeUpper[k] = lower/e*factor, upper/e*factor
		case d.Trials != nil:
			lower, upper := rates.ShareLimits(y, e, confidence)
			p.crudeLower[k], p.crudeUpper[k] = lower*factor, upper*factor
		case measured(*r.settings.Distribution):
			p.observed[k] = y / e
		}
	}
}

// measured reports whether responses are measurements, which are averaged over rows and not added up.
func measured(distribution string) bool {
	return distribution == plan.Gaussian || distribution == plan.Gamma
}

// behind is what a row's response is out of.
func (r *run) behind(i int) float64 {
	switch d := r.obs.data; {
	case d.Exposure != nil:
		return d.Exposure[i]
	case d.Trials != nil:
		return d.Trials[i]
	}
	return 1
}

// levelsOf returns the linear predictor of the mean over each place and its standard error, by the delta method: the mean
// over its rows, each counting with what is behind it, and over the points of a row. They are NaN for a place without rows
// where the map needs covariates.
func (r *run) levelsOf(ctx context.Context, places []place) (eta, se []float64, err error) {
	var seen, unseen gathered
	for k, one := range places {
		if len(one.rows) > 0 {
			r.gather(&seen, k, one)
		} else if !r.needsCovariates() {
			if err := r.gatherUnseen(&unseen, k, one); err != nil {
				return nil, nil, err
			}
		}
	}
	eta, se = repeat(notKnown, len(places)), repeat(notKnown, len(places))
	for _, of := range []struct {
		gathered
		covariates []spatial.Covariate
	}{{seen, pick(r.obs.data.Covariates, seen.row)}, {unseen, nil}} {
		if len(of.sets) == 0 {
			continue
		}
		sums, err := r.surface.Sums(ctx, of.at, of.covariates, of.sets, 0, 0)
		if err != nil {
			return nil, nil, err
		}
		for n, sum := range sums {
			k := of.place[n]
			eta[k] = r.surface.Linear(sum.Value)
			se[k] = sum.Delta / math.Abs(r.surface.MeanSlope(eta[k]))
		}
	}
	return eta, se, nil
}

// gathered are points with the sets of them that are averaged.
type gathered struct {
	at    spatial.Places
	row   []int // of each point
	sets  []spatial.Share
	place []int // of each set
}

func (g *gathered) add(set *spatial.Share, x, y, weight float64, row int) {
	set.Index, set.Weight = append(set.Index, int32(len(g.row))), append(set.Weight, weight)
	g.at.X, g.at.Y, g.row = append(g.at.X, x), append(g.at.Y, y), append(g.row, row)
}

// close ends the set of a place.
func (g *gathered) close(set spatial.Share, place int) {
	g.sets, g.place = append(g.sets, set), append(g.place, place)
}

// gather adds the points of a place with rows.
func (r *run) gather(g *gathered, k int, one place) {
	var set spatial.Share
	all := 0.0
	for _, i := range one.rows {
		all += r.behind(i)
	}
	at := r.obs.data.Places
	for _, i := range one.rows {
		share := r.behind(i) / all
		if at.Start == nil {
			g.add(&set, at.X[i], at.Y[i], share, i)
			continue
		}
		for q := at.Start[i]; q < at.Start[i+1]; q++ {
			g.add(&set, at.X[q], at.Y[q], share*at.Share[q], i)
		}
	}
	g.close(set, k)
}

// gatherUnseen adds the points of a place where nobody looked.
func (r *run) gatherUnseen(g *gathered, k int, one place) error {
	q, err := grids.QuadratureOf(one.shape, r.obs.system, r.obs.apart)
	if err != nil {
		return refuse("correct the geometry", "%s: %q: %w", r.joins.placesSide().name, one.name, err)
	}
	var set spatial.Share
	for i := range q.X {
		g.add(&set, q.X[i], q.Y[i], q.Share[i], -1)
	}
	g.close(set, k)
	return nil
}

// needsCovariates reports whether the map's own model has covariates that a place without rows does not have.
func (r *run) needsCovariates() bool {
	return slices.ContainsFunc(r.obs.data.Covariates, func(c spatial.Covariate) bool { return r.mapNeeds(c.Name) })
}

// columns returns places.csv after the place's name.
func (p *placeResults) columns() []tables.Column {
	e := p.smoothed
	return []tables.Column{
		{Name: "rows", Whole: p.rows}, {Name: "observed", Number: p.observed}, {Name: "denominator", Number: p.denominator},
		{Name: "crude_rate", Number: p.crude}, {Name: "crude_lower", Number: p.crudeLower}, {Name: "crude_upper", Number: p.crudeUpper},
		{Name: "smoothed_rate", Number: e.estimate}, {Name: "standard_error", Number: e.standardError},
		{Name: "lower", Number: e.lower}, {Name: "upper", Number: e.upper}, {Name: "cv", Number: e.cv},
		{Name: "relative_risk", Number: e.relative}, {Name: "relative_risk_lower", Number: e.relativeLower},
		{Name: "relative_risk_upper", Number: e.relativeUpper}, {Name: "chance", Number: e.chance},
	}
}

func (p *placeResults) names() []string {
	names := make([]string, len(p.places))
	for k, one := range p.places {
		names[k] = one.name
	}
	return names
}

func (p *placeResults) shapes() []orb.Geometry {
	shapes := make([]orb.Geometry, len(p.places))
	for k, one := range p.places {
		shapes[k] = one.shape
	}
	return shapes
}

func (r *run) writePlaces(w io.Writer) error {
	columns := append([]tables.Column{{Name: "place", Text: r.byPlace.names()}}, r.byPlace.columns()...)
	return tables.Write(w, len(r.byPlace.places), columns)
}

func (r *run) writePlaceShapes(w io.Writer) error {
	return vector.WritePlaces(w, r.obs.system, r.byPlace.names(), r.byPlace.shapes(), shapeColumns(r.byPlace.columns()))
}

// describe words the places for the summary.
func (p *placeResults) describe() *summary.Places {
	d := &summary.Places{Count: len(p.places), Areas: p.areas, Lines: p.lines, Points: p.spots, Unseen: p.unseen}
	if p.most > 1 {
		d.Inside = fmt.Sprintf("%d to %d points stand for each", p.fewest, p.most)
		if p.fewest == p.most {
			d.Inside = fmt.Sprintf("%d points stand for each", p.most)
		}
	}
	return d
}

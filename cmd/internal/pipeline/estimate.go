package pipeline

import (
	"context"
	"math"
	"strconv"
	"strings"

	"drumlin/grids/crs"
	"drumlin/io/archive"
	"drumlin/io/plan"
	"drumlin/io/tables"
	"drumlin/spatial"
)

// reporting says how estimates are stated, and what the words around them are.
type reporting struct {
	archive.Reporting
	ratio bool   // the estimate itself is a relative risk
	title string // of the pictures
}

// report settles the reporting unit.
func (r *run) report() (reporting, error) {
	s := r.settings
	p := reporting{Reporting: archive.Reporting{CRS: r.obs.system.Code(), Degrees: r.obs.table.Degrees, Response: *s.Response,
		Factor: 1, Threshold: s.Threshold, Confidence: *s.Confidence}}
	if *s.Distribution != plan.Gaussian {
		p.Factor = *s.Per
	}
	p.Unit = Unit(s)
	kind, _ := s.Denominator()
	p.ratio = kind == "expected"
	if ref := s.Reference; ref != nil {
		p.Reference = ref.Level
		if ref.Overall {
			p.Reference = r.overall() * p.Factor
		}
	}
	p.title = *s.Response
	if s.Title != nil {
		p.title = *s.Title
	}
	if t := s.Threshold; t != nil {
		eta := r.surface.Linear(*t / p.Factor)
		if math.IsNaN(eta) || math.IsInf(eta, 0) {
			return p, refuse("give it in the reporting unit: "+p.Unit, "--threshold %g is out of reach of the mean", *t)
		}
	}
	return p, nil
}

// overall is the level of all the region's observations together.
func (r *run) overall() float64 {
	var y, e float64
	for i, v := range r.obs.data.Response[:r.obs.own] {
		y += v
		e += r.behind(i)
	}
	return y / e
}

// Unit words the reporting unit of resolved settings.
func Unit(s plan.Settings) string {
	if s.UnitLabel != nil {
		return *s.UnitLabel
	}
	per := ""
	if *s.Per != 1 {
		per = strconv.FormatFloat(*s.Per, 'f', -1, 64) + " "
	}
	kind, column := s.Denominator()
	switch {
	case s.Trials != nil && *s.Per == 1:
		return *s.Response + ", share of " + *s.Trials
	case s.Trials != nil && *s.Per == 100:
		return *s.Response + ", % of " + *s.Trials
	case s.Trials != nil:
		return *s.Response + " per " + per + *s.Trials
	case kind == "people" && per == "":
		return *s.Response + " per person"
	case kind == "people":
		return *s.Response + " per " + per + "people"
	case kind == "area":
		return *s.Response + " per " + per + *s.AreaUnit
	case kind == "expected":
		return *s.Response + ", observed over expected"
	case kind == "effort":
		return *s.Response + " per " + per + "unit of " + column
	case *s.Distribution == plan.Gaussian || *s.Distribution == plan.Gamma || *s.Distribution == plan.Tweedie:
		return *s.Response
	case per != "":
		return *s.Response + " per " + strings.TrimSpace(per) + " observations"
	}
	return *s.Response + " per observation"
}

// estimates are the columns of surface.csv, one value a place.
type estimates struct {
	estimate, standardError, lower, upper, cv []float64
	chance                                    []float64 // nil without a threshold
	relative, relativeLower, relativeUpper    []float64 // to the reference; nil without one
	eta, etaError                             []float64
	nearest                                   []float64
	outside                                   []float64 // 1 where covariates lie outside of what was observed, else 0; nil without numeric layers
}

// estimate predicts at places and states the result in the reporting unit: limits are the link's image of
// eta -+ quantile times its error, so they stay inside the response's range.
func estimate(ctx context.Context, s *spatial.Surface, rep archive.Reporting, at spatial.Places, z []spatial.Covariate) (*estimates, error) {
	eta, se := make([]float64, at.Len()), make([]float64, at.Len())
	if err := s.PredictTo(ctx, eta, se, at, z); err != nil {
		return nil, err
	}
	return state(s, rep, eta, se), nil
}

// state turns linear predictors and their errors into the reporting unit.
func state(s *spatial.Surface, rep archive.Reporting, eta, se []float64) *estimates {
	n := len(eta)
	columns := make([][]float64, 5)
	for k := range columns {
		columns[k] = make([]float64, n)
	}
	e := &estimates{estimate: columns[0], standardError: columns[1], lower: columns[2], upper: columns[3], cv: columns[4], eta: eta, etaError: se}
	q := s.Quantile(rep.Confidence)
	for i, eta := range e.eta {
		se := e.etaError[i]
		e.estimate[i] = s.Mean(eta) * rep.Factor
		e.standardError[i] = math.Abs(s.MeanSlope(eta)) * rep.Factor * se
		e.lower[i] = s.Mean(eta-q*se) * rep.Factor
		e.upper[i] = s.Mean(eta+q*se) * rep.Factor
		e.cv[i] = e.standardError[i] / math.Abs(e.estimate[i])
	}
	if rep.Reference > 0 {
		e.relate(rep.Reference)
	}
	if rep.Threshold != nil {
		e.chance = make([]float64, n)
		limit := s.Linear(*rep.Threshold / rep.Factor)
		for i, eta := range e.eta {
			e.chance[i] = s.Chance(eta, e.etaError[i], limit)
		}
	}
	return e
}

// relate sets the relative risk: the estimate and its limits over the reference level, which is taken as known.
func (e *estimates) relate(reference float64) {
	over := func(v []float64) []float64 {
		q := make([]float64, len(v))
		for i := range v {
			q[i] = v[i] / reference
		}
		return q
	}
	e.relative, e.relativeLower, e.relativeUpper = over(e.estimate), over(e.lower), over(e.upper)
}

// columns returns the figures of surface.csv after the coordinates, in its order; the relative risk comes last and only
// where there is a reference.
func (e *estimates) columns() []tables.Column {
	list := []tables.Column{
		{Name: "estimate", Number: e.estimate}, {Name: "standard_error", Number: e.standardError},
		{Name: "lower", Number: e.lower}, {Name: "upper", Number: e.upper}, {Name: "cv", Number: e.cv},
		{Name: "chance", Number: e.chance},
		{Name: "linear_predictor", Number: e.eta}, {Name: "linear_standard_error", Number: e.etaError},
		{Name: "nearest_m", Number: e.nearest},
	}
	if e.relative != nil {
		list = append(list, tables.Column{Name: "relative_risk", Number: e.relative},
			tables.Column{Name: "relative_risk_lower", Number: e.relativeLower}, tables.Column{Name: "relative_risk_upper", Number: e.relativeUpper})
	}
	if e.outside != nil {
		list = append(list, tables.Column{Name: "outside", Number: e.outside})
	}
	return list
}

// surfaceTable returns all columns of surface.csv.
func surfaceTable(system crs.System, at spatial.Places, e *estimates) []tables.Column {
	lonLat := []tables.Column{{Name: "lon", Exact: true}, {Name: "lat", Exact: true}}
	if system.Geographic() {
		lon, lat := make([]float64, at.Len()), make([]float64, at.Len())
		for i := range lon {
			lon[i], lat[i] = system.Inverse(at.X[i], at.Y[i])
		}
		lonLat[0].Number, lonLat[1].Number = lon, lat
	}
	all := []tables.Column{{Name: "x", Number: at.X, Exact: true}, {Name: "y", Number: at.Y, Exact: true}}
	return append(append(all, lonLat...), e.columns()...)
}

package pipeline

import (
	"fmt"
	"math"

	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/spatial"
)

// checks are the findings on the fit, each with its figure and what it means for the reader. The limits are common
// practice, no source, unless a comment says otherwise.
func (r *run) checks() []summary.Check {
	rep := r.surface.Report()
	list := []summary.Check{converged(rep)}
	if rep.Knots > 0 {
		list = append(list, knots(rep, r.surfaces()))
	}
	if rep.KnownDispersion {
		list = append(list, dispersion(rep))
	}
	if rep.Distribution == plan.Tweedie {
		list = append(list, amounts(r.obs.data.Response))
	}
	list = append(list, r.alike())
	if !r.target.own() {
		list = append(list, r.far())
	}
	list = append(list, r.aside())
	list = append(list, r.inputChecks()...)
	if len(r.surface.Effects()) > 0 {
		list = append(list, overlap(r.surface.Effects()))
	}
	if r.zones != nil {
		list = append(list, r.zones.covering())
		if c := r.zones.skewed(); c.Level != summary.Clear {
			list = append(list, c)
		}
	}
	return list
}

func level(figure, look, stop float64) summary.Level {
	switch {
	case figure > stop:
		return summary.Stop
	case figure > look:
		return summary.Look
	}
	return summary.Clear
}

func converged(rep spatial.Report) summary.Check {
	c := summary.Check{Name: "convergence", Level: summary.Clear, Figure: summary.Number(rep.ProjectedGradient),
		Sentence: "the search for the smoothness ended where its criterion is level"}
	if !rep.Converged {
		c.Level = summary.Stop
		c.Sentence = fmt.Sprintf("the search for the smoothness did not settle (gradient %.2g after %d steps): do not use the map", rep.ProjectedGradient, rep.Iterations)
	}
	return c
}

// knots warns when the surface uses most of what it was allowed, so that the limit rather than the data may be what
// makes it smooth; or when it follows nearly every place. Each of several surfaces has all the knots.
func knots(rep spatial.Report, surfaces int) summary.Check {
	share := rep.SurfaceDF / float64(surfaces*rep.Knots-1)
	followed := min(rep.Rows, surfaces*rep.DistinctPlaces)
	c := summary.Check{Name: "knots", Figure: summary.Number(share), Level: summary.Clear,
		Sentence: "the data use " + summary.Short(summary.Number(100*share)) + " % of the degrees of freedom that the knots allow"}
	places := rep.Knots - rep.KnotsInGaps
	switch {
	case places < rep.DistinctPlaces && share > 0.7:
		c.Level = summary.Look
		c.Sentence += ": the surface may be smoother than the data ask for; allow more with --max-knots"
	case places >= rep.DistinctPlaces && rep.SurfaceDF > 0.6*float64(followed):
		c.Level = summary.Look
		c.Sentence = fmt.Sprintf("the surface uses %s degrees of freedom for %d places: it follows single observations closely, and noise may be the cause",
			summary.Short(summary.Number(rep.SurfaceDF)), followed)
	}
	return c
}

// dispersion holds the Pearson statistic against 1 for distributions that fix it: beyond three of its own standard
// errors, sqrt(2/(n - df)), it is more than chance.
func dispersion(rep spatial.Report) summary.Check {
	free := float64(rep.Rows) - rep.DF
	phi := rep.Pearson
	chance := 1 + 3*math.Sqrt(2/math.Max(free, 1))
	c := summary.Check{Name: "over-dispersion", Figure: summary.Number(phi), Level: summary.Clear,
		Sentence: fmt.Sprintf("the scatter about the map is %s times what a %s allows (Pearson)", summary.Short(summary.Number(phi)), rep.Distribution)}
	switch {
	case math.IsNaN(phi):
		c.Level = summary.Look
		c.Sentence = "nothing is left to judge the scatter about the map from"
	case free < 0.3*float64(rep.Rows) && phi <= chance:
		c.Level = summary.Look
		c.Sentence = fmt.Sprintf("the fit uses %s of %d degrees of freedom, which leaves little to judge the scatter about the map from",
			summary.Short(summary.Number(rep.DF)), rep.Rows)
	case phi > chance && phi > 1.2:
		c.Level = level(phi, 1.2, 3)
		c.Sentence += fmt.Sprintf(": the intervals are too narrow by its square root, %s, and part of the surface may be noise",
			summary.Short(summary.Number(math.Sqrt(phi))))
	}
	return c
}

// amounts looks at what a tweedie distribution is for: amounts that are not whole numbers, some of them zero.
func amounts(response []float64) summary.Check {
	zeros, fractions := 0, 0
	for _, y := range response {
		if y == 0 {
			zeros++
		}
		if y != math.Floor(y) {
			fractions++
		}
	}
	c := summary.Check{Name: "amounts", Level: summary.Clear, Figure: summary.Number(float64(zeros) / float64(len(response))),
		Sentence: "the response is of amounts with zeros among them, which tweedie is for"}
	switch {
	case fractions == 0:
		c.Level = summary.Look
		c.Sentence = "every response is a whole number: tweedie is for amounts, and counts are for poisson or negative-binomial"
	case zeros == 0:
		c.Level = summary.Look
		c.Sentence = "no response is zero: tweedie is for amounts with zeros, and gamma does for those above 0"
	}
	return c
}

// alikeZ is how many standard deviations Moran's I of the residuals may lie above what it is without any likeness.
const alikeZ = 3

// alike reports whether neighbouring residuals are alike. It warns, and never decides anything.
func (r *run) alike() summary.Check {
	a := r.surface.ResidualAutocorrelation(r.obs.data.Places)
	c := summary.Check{Name: "residuals", Figure: summary.Number(a.I), Level: summary.Clear,
		Sentence: fmt.Sprintf("neighbouring residuals are not alike (Moran's I %s)", summary.Short(summary.Number(a.I)))}
	if math.IsNaN(a.I) {
		c.Sentence = "nothing is left to tell whether neighbouring residuals are alike"
	}
	if a.Z() > alikeZ {
		c.Level = summary.Look
		c.Sentence = fmt.Sprintf("neighbouring residuals are alike (Moran's I %s, %s standard deviations above chance): the surface misses something that neighbours share, and errors are too small",
			summary.Short(summary.Number(a.I)), summary.Short(summary.Number(a.Z())))
	}
	return c
}

// farFactor says what far from data is: more than this many times the median spacing.
const farFactor = 3

func (r *run) far() summary.Check {
	n := 0
	for _, d := range r.estimates.nearest {
		if d > farFactor*r.obs.spacing {
			n++
		}
	}
	share := float64(n) / float64(len(r.estimates.nearest))
	return summary.Check{Name: "distance", Figure: summary.Number(share), Level: level(share, 0.1, 0.5),
		Sentence: fmt.Sprintf("%s %% of the map lies farther than %d times the median spacing from any observation: there it rests on the model alone",
			summary.Short(summary.Number(100*share)), farFactor)}
}

// mostOverlap is the share of an effect's variation that the rest of the model may be able to take over.
const mostOverlap = 0.8

// overlap warns where the data cannot tell an effect from the rest of the model.
func overlap(effects []spatial.EffectFigure) summary.Check {
	worst := effects[0]
	for _, f := range effects {
		if f.Overlap > worst.Overlap {
			worst = f
		}
	}
	c := summary.Check{Name: "overlap", Figure: summary.Number(worst.Overlap), Level: summary.Clear,
		Sentence: "effects can be told apart from one another and from the surface"}
	if worst.Overlap > mostOverlap {
		c.Level = summary.Look
		c.Sentence = fmt.Sprintf("%s %% of the variation of the effect of %s could be put down to the surface or to other effects as well: its size depends on the model",
			summary.Short(summary.Number(100*worst.Overlap)), worst.Name)
	}
	return c
}

func (r *run) aside() summary.Check {
	t := r.obs.table
	share := float64(len(t.Aside)) / float64(t.Rows)
	c := summary.Check{Name: "rows set aside", Figure: summary.Number(share), Level: level(share, 0.05, 0.25), Sentence: "every row could be used"}
	if len(t.Aside) > 0 {
		c.Sentence = fmt.Sprintf("%d of %d rows were set aside, see set-aside.csv: if they differ from the others, so does the map from the truth", len(t.Aside), t.Rows)
	}
	return c
}

// leastCovered is the share of a zone that the map must cover for its figures to stand for it.
const leastCovered = 0.95

func (z *zoneResults) covering() summary.Check {
	worst, short := 0, 0
	for k, c := range z.covered {
		if c < z.covered[worst] {
			worst = k
		}
		if c < leastCovered {
			short++
		}
	}
	c := summary.Check{Name: "zones", Figure: summary.Number(z.covered[worst]), Level: summary.Clear, Sentence: "the map covers every zone"}
	if short == 0 {
		return c
	}
	c.Level = summary.Stop
	c.Sentence = fmt.Sprintf("the map covers only %s %% of zone %s", summary.Short(summary.Number(100*z.covered[worst])), z.zones[worst].Name)
	if z.cells[worst] == 0 {
		c.Sentence = fmt.Sprintf("the map has no cell in zone %s", z.zones[worst].Name)
	}
	if short > 1 {
		c.Sentence += fmt.Sprintf(" and covers less than %g %% of %d of the %d zones", 100*leastCovered, short, len(z.zones))
	}
	c.Sentence += ": figures are for the part that is covered; widen the map with --within, and where zones are small ask for smaller cells"
	return c
}

// mostExcess is the share by which the mean of the draws of a zone may be above its total.
const mostExcess = 0.1

// skewed warns of a zone whose level is so uncertain that its mean over all that could be lies well above what is likeliest.
func (z *zoneResults) skewed() summary.Check {
	worst := 0
	for k, v := range z.excess {
		if v > z.excess[worst] {
			worst = k
		}
	}
	c := summary.Check{Name: "zone draws", Figure: summary.Number(z.excess[worst]), Level: summary.Clear, Sentence: "totals and means are in the middle of what they could be"}
	if z.excess[worst] > mostExcess {
		c.Level = summary.Look
		c.Sentence = fmt.Sprintf("the figure of zone %s is so uncertain that the mean of what it could be is %s %% above it: hand on its limits, not the figure alone",
			z.zones[worst].Name, summary.Short(summary.Number(100*z.excess[worst])))
	}
	return c
}

// standsIn says what stands for a value below a detection limit.
var standsIn = map[observe.BelowLimit]string{observe.HalfLimit: "half of it", observe.AtLimit: "the limit"}

// cautions tell what the reader of the map must know.
func (r *run) cautions() []string {
	s := r.settings
	list := []string{"Limits hold for the mean, on average across the map; peaks and single places are covered less often."}
	kind, _ := s.Denominator()
	switch {
	case kind == "people" || kind == "expected" || s.Trials != nil:
		list = append(list,
			"Smoothed rates describe places, not persons, and prove no cause; small numbers can identify people: follow your data protection rules before you publish.",
			"Decisions on health belong to the responsible authority and to licensed practice.")
	case kind == "area" || kind == "effort":
		list = append(list, missed(s),
			"Where people or protected species depend on it, follow local rules and have the survey design checked by a qualified person.")
	default:
		list = append(list, "Not for decisions on safety or health without the checks that local rules and licensed practice ask for.")
	}
	list = append(list, r.exposureCautions()...)
	if n := r.target.masked; n > 0 {
		list = append(list, fmt.Sprintf("%d cells of the study area are left out: a layer has no value there, or a class that was not observed.", n))
	}
	if words := r.obs.thinned.words(); words != "" {
		list = append(list, words)
	}
	for _, b := range r.obs.table.BelowLimit {
		if stands, ok := standsIn[b.Rule]; ok {
			list = append(list, fmt.Sprintf("Of %s, %d values are below a detection limit; %s stands for them, which narrows the limits.", b.Column, b.Rows, stands))
		}
	}
	if s.Reference != nil {
		list = append(list, "The reference level is taken as known: its own error is not in the limits.")
	}
	if n := r.obs.table.Len() - r.obs.own; n > 0 {
		list = append(list, fmt.Sprintf("Near its edge the map rests on %d observations of neighbouring regions as well, which are not shown.", n))
	}
	if len(r.target.held) > 0 {
		list = append(list, "The map is adjusted to held covariates: it shows what would be found there at those values.")
	}
	if m := r.surface.Model(); smooth(m) && !m.SmoothnessUncertainty {
		list = append(list, "Intervals are for the smoothness at hand, as if it were known.")
	}
	return list
}

// missed says what becomes of what was not detected.
func missed(s plan.Settings) string {
	if s.Detection != nil {
		return "Counts are corrected for the share that is detected, as it was given; whoever relies on the map should know where that share comes from."
	}
	return "Counts are taken as complete: animals or plants that were missed are missing from the map and its totals."
}

// exposureCautions tell what is taken for granted of what is behind the counts.
func (r *run) exposureCautions() (list []string) {
	s := r.settings
	switch {
	case r.obs.data.Factor != nil:
		list = append(list, "Errors include that of "+factorWords(s)+", which its rows share: it is the same everywhere among them and does not average out.")
	case s.Detection != nil:
		list = append(list, "The share that is detected is taken as known; its own error is not in the limits (see --exposure-cv).")
	}
	if p := r.byPlace; p != nil && p.areas+p.lines > 0 {
		list = append(list, "Inside an area or along a line what is behind a count is taken as spread evenly.")
	}
	return list
}

// factorWords names the factor of the exposure that is known with an error.
func factorWords(s plan.Settings) string {
	what := "the denominator"
	if s.Detection != nil {
		what = "the share that is detected"
	}
	if s.ExposureCV.Column != "" {
		return what + " (coefficients of variation in " + s.ExposureCV.Column + ")"
	}
	return fmt.Sprintf("%s (coefficient of variation %g %%)", what, 100*s.ExposureCV.Number)
}

package batch

import (
	"math"
	"slices"
	"sort"

	"drumlin/io/plan"

	"gonum.org/v1/gonum/stat/distuv"
)

// standing is the rank of a region among those it can be compared with, 1 for the highest mean, and the limits of the
// rank. All are 0 where the region is not ranked.
type standing struct{ rank, lower, upper, among int }

// usualLevel is the joint level of ranks whose regions do not agree on a confidence.
const usualLevel = 0.95

// standings ranks the regions by their means, with the joint confidence region of Klein, Wright & Wieczorek (2020), A
// joint confidence region for an overall ranking of populations, J. R. Statist. Soc. C 69:589-606 (from memory): with
// simultaneous intervals L to U for the means, the rank of region k lies in 1 + #{j: L_j > U_k} to K - #{j: U_j < L_k}.
// All ranks of a cohort lie within their limits together with at least its joint level: the confidence of the regions'
// own limits where they agree, else 0.95. Regions are fitted apart, so K intervals of level joint^(1/K) each are
// simultaneous (with a margin they share rows and err together somewhat; for normal errors of that kind the product is
// still a lower bound: Sidak 1967, J. Am. Statist. Assoc. 62:626-633, from memory).
//
// Where some of two regions' true means are equal either order is true of them, and both may have either rank.
func standings(list []Outcome) []standing {
	out := make([]standing, len(list))
	members := map[cohort][]int{}
	for i, o := range list {
		if o.Status != Failed && o.Status != Stop && o.Figures.rankable() {
			c := cohort{o.Figures.Response, o.Figures.Unit, o.Figures.Link}
			members[c] = append(members[c], i)
		}
	}
	for _, index := range members { // the order does not matter: every cohort sets its own regions
		if len(index) >= 2 {
			rankCohort(list, index, out)
		}
	}
	return out
}

// cohort is what regions must have in common to be compared.
type cohort struct{ response, unit, link string }

// rankable reports whether a region has a mean between limits of a known confidence, on the scale of its link.
func (f Figures) rankable() bool {
	s, ok := f.scale()
	lower, mean, upper := s.to(float64(f.MeanLower)), s.to(float64(f.Mean)), s.to(float64(f.MeanUpper))
	confident := f.Confidence > 0 && f.Confidence < 1
	return ok && confident && lower <= mean && mean <= upper && !math.IsInf(mean, 0)
}

// rankCohort ranks one cohort. Sorted limits answer how many lie above or below: K log K for K regions.
func rankCohort(list []Outcome, index []int, out []standing) {
	n := len(index)
	tail := jointTail(jointLevel(list, index), n)
	mean, lower, upper := make([]float64, n), make([]float64, n), make([]float64, n)
	for a, i := range index {
		mean[a] = float64(list[i].Figures.Mean)
		lower[a], upper[a] = list[i].Figures.stretched(tail)
	}
	means, lowers, uppers := slices.Sorted(slices.Values(mean)), slices.Sorted(slices.Values(lower)), slices.Sorted(slices.Values(upper))
	for a, i := range index {
		out[i] = standing{
			rank:  1 + countAbove(means, mean[a]),
			lower: 1 + countAbove(lowers, upper[a]),
			upper: n - countBelow(uppers, lower[a]),
			among: n,
		}
	}
}

// countAbove counts how many of sorted are larger than v.
func countAbove(sorted []float64, v float64) int {
	return len(sorted) - sort.Search(len(sorted), func(i int) bool { return sorted[i] > v })
}

// countBelow counts how many of sorted are smaller than v.
func countBelow(sorted []float64, v float64) int { return sort.SearchFloat64s(sorted, v) }

// jointLevel is the confidence that the regions agree on, or the usual one.
func jointLevel(list []Outcome, index []int) float64 {
	level := float64(list[index[0]].Figures.Confidence)
	for _, i := range index {
		if float64(list[i].Figures.Confidence) != level {
			return usualLevel
		}
	}
	return level
}

// jointTail is the chance in either tail of each of n independent intervals that hold together with a level:
// (1 - level^(1/n))/2, without losing digits where n is large.
func jointTail(level float64, n int) float64 { return -math.Expm1(math.Log(level)/float64(n)) / 2 }

// stretched returns the limits of the mean with a smaller chance in either tail than their own. Each side is stretched by
// the ratio of the quantiles, on the scale on which limits are symmetrical: the logarithm for the link log, the logit
// of the share for logit and complementary log-log (whose limits are the draws' own quantiles, so the two sides differ),
// and the mean itself for identity. The quantiles are those of the limits: Student's t for identity, where
// the dispersion is estimated, else normal.
func (f Figures) stretched(tail float64) (lower, upper float64) {
	s, _ := f.scale()
	own := (1 - float64(f.Confidence)) / 2
	ratio := f.quantile(tail) / f.quantile(own)
	mean := s.to(float64(f.Mean))
	return s.from(mean + ratio*(s.to(float64(f.MeanLower))-mean)), s.from(mean + ratio*(s.to(float64(f.MeanUpper))-mean))
}

// quantile is how many standard errors a limit with this chance beyond it is from the mean.
func (f Figures) quantile(tail float64) float64 {
	if free := float64(f.Observations) - float64(f.DegreesOfFreedom); f.Link == plan.Identity && free > 0 {
		return -distuv.StudentsT{Mu: 0, Sigma: 1, Nu: free}.Quantile(tail)
	}
	return -distuv.UnitNormal.Quantile(tail)
}

// linkScale turns a mean into something with symmetrical limits and back.
type linkScale struct{ to, from func(float64) float64 }

// scale returns the scale of the link; ok is false if there is none for it. Numbers off the scale become NaN.
func (f Figures) scale() (s linkScale, ok bool) {
	same := func(v float64) float64 { return v }
	switch f.Link {
	case plan.Identity:
		return linkScale{same, same}, true
	case plan.Log:
		return linkScale{math.Log, math.Exp}, true
	case plan.Logit, plan.ComplementaryLogLog:
		per := float64(f.Per)
		return linkScale{
			to:   func(v float64) float64 { return math.Log(v) - math.Log(per-v) },
			from: func(v float64) float64 { return per / (1 + math.Exp(-v)) },
		}, per > 0
	}
	return linkScale{same, same}, false
}

package inspect

import (
	"math"
	"slices"

	"drumlin/io/observe"
)

// The least number of rows that a rate is recognised by, the share of them that must agree, and how well.
const (
	rateRows  = 8
	rateShare = 0.95
	rateNear  = 0.02
)

// quotient reports whether r is c per so many of d, a power of ten, in nearly all rows. Rates are rounded when they are
// written, so those that are small have as much leeway as a typical one.
func quotient(r, c, d *observe.SurveyColumn) (per float64, is bool) {
	var factors, rates []float64
	for i := range r.Number {
		if c.Number[i] > 0 && d.Number[i] > 0 && r.Number[i] > 0 {
			factors = append(factors, r.Number[i]*d.Number[i]/c.Number[i])
			rates = append(rates, r.Number[i])
		}
	}
	if len(factors) < rateRows {
		return 0, false
	}
	slices.Sort(factors)
	slices.Sort(rates)
	per = math.Pow(10, math.Round(math.Log10(factors[len(factors)/2])))
	typical := rates[len(rates)/2]
	agree, all, denominators := 0, 0, map[float64]bool{}
	for i, v := range r.Number {
		want := per * c.Number[i] / d.Number[i]
		if math.IsNaN(v) || math.IsNaN(want) || math.IsInf(want, 0) {
			continue
		}
		all++
		denominators[d.Number[i]] = true
		if math.Abs(v-want) <= rateNear*max(v, typical/2) {
			agree++
		}
	}
	return per, float64(agree) >= rateShare*float64(all) && len(denominators) > 2
}

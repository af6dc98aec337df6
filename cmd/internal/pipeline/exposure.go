package pipeline

import (
	"fmt"
	"slices"
	"strconv"

	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/spatial"
)

// metresIn says how many metres a unit of length has.
var metresIn = map[string]float64{plan.Metres: 1, plan.Kilometres: 1000}

// exposure is what is behind each count, in the unit that it is reported in: the denominator's column, a strip's length
// times its width, and the share of the area that detection leaves. It is nil where there is no denominator.
func exposure(t *observe.Table, s plan.Settings) ([]float64, error) {
	_, column := s.Denominator()
	if column == "" {
		return nil, nil
	}
	e := slices.Clone(t.Column(column).Number)
	if s.Length != nil {
		scale := metresIn[*s.LengthUnit] / squareMetres[*s.AreaUnit]
		for i, width := range amount(t, *s.Width) {
			e[i] *= width * scale
		}
	}
	if s.Detection != nil {
		share := amount(t, *s.Detection)
		for i, v := range share {
			if v > 1 {
				return nil, faultIn(t, i, s.Detection.Column, v, "is more than 1, and detection is a share",
					"give the share of what is there that is detected, for example 0.8")
			}
			e[i] *= v
		}
	}
	return e, nil
}

// amount is one number for each row.
func amount(t *observe.Table, a plan.Amount) []float64 {
	if a.Column != "" {
		return t.Column(a.Column).Number
	}
	return repeat(a.Number, t.Len())
}

// atRow is a fault of a row, whose place in the file it has.
func atRow(t *observe.Table, i int) *observe.Error {
	return &observe.Error{File: t.Source, Line: int(t.Line[i]), Row: int(t.Row[i])}
}

// faultIn blames a row's value in a column.
func faultIn(t *observe.Table, i int, column string, v float64, what, advice string) error {
	fault := atRow(t, i)
	fault.Column, fault.Value, fault.Advice = column, strconv.FormatFloat(v, 'g', -1, 64), advice
	fault.What = fault.Value + " " + what
	return fault
}

// sharedFactor is the factor of the exposure that rows share and that is known with an error; nil where none is named.
// Rows of a stratum share one; without strata those do that have the same coefficient of variation.
func sharedFactor(t *observe.Table, s plan.Settings) (*spatial.Factor, error) {
	if s.ExposureCV == nil {
		return nil, nil
	}
	cv := amount(t, *s.ExposureCV)
	for i, v := range cv {
		if v < 0 || v > plan.MostCV {
			return nil, faultIn(t, i, s.ExposureCV.Column, v, fmt.Sprintf("is not between 0 and %g", float64(plan.MostCV)),
				"give a coefficient of variation, for example 0.15 for 15 %")
		}
	}
	f := &spatial.Factor{Of: make([]int32, t.Len())}
	if s.ExposureStrata == nil {
		f.CV = slices.Compact(slices.Sorted(slices.Values(cv)))
		for i, v := range cv {
			k, _ := slices.BinarySearch(f.CV, v)
			f.Of[i] = int32(k)
		}
		return f, nil
	}
	strata := t.Column(*s.ExposureStrata)
	f.CV = make([]float64, len(strata.Level))
	first := repeat(-1, len(strata.Level))
	for i, k := range strata.Code {
		f.Of[i] = k
		if at := int(first[k]); at >= 0 && cv[i] != f.CV[k] {
			return nil, faultIn(t, i, s.ExposureCV.Column, cv[i],
				fmt.Sprintf("differs from %g in row %d, and both are of stratum %q", f.CV[k], t.Row[at], strata.Level[k]),
				"give every row of a stratum the same coefficient of variation")
		} else if at < 0 {
			first[k], f.CV[k] = float64(i), cv[i]
		}
	}
	return f, nil
}

package batch

import (
	"io"
	"math"

	"drumlin/io/tables"
)

// Outcome is what a region came to, as far as the result files tell: no times.
type Outcome struct {
	Region, Folder string
	Status         Status // done, look, stop or failed
	Reason         string
	Figures        Figures
}

// WriteRegions writes regions.csv: a row a region, in the order of list, with its figures and its rank (1 is the highest
// mean) between the limits of the rank. Regions are ranked among those of the same response, unit and link; failed and
// stop regions are not ranked, nor those without a mean within its limits, nor a region that has nobody to be compared
// with. See standings for what the limits of the ranks mean. A failed region has no figures but the numbers of its rows,
// where these are known.
func WriteRegions(w io.Writer, list []Outcome) error {
	columns := []tables.Column{
		textColumn("region", list, func(o Outcome) string { return o.Region }),
		textColumn("folder", list, func(o Outcome) string { return o.Folder }),
		textColumn("status", list, func(o Outcome) string { return string(o.Status) }),
		textColumn("reason", list, func(o Outcome) string { return o.Reason }),
		numberColumn("observations", list, func(o Outcome) float64 { return o.rows(o.Figures.Observations) }),
		numberColumn("set_aside", list, func(o Outcome) float64 { return o.rows(o.Figures.SetAside) }),
		textColumn("distribution", list, ofFitted(func(f Figures) string { return f.Distribution })),
		figureColumn("degrees_of_freedom", list, func(f Figures) float64 { return float64(f.DegreesOfFreedom) }),
		figureColumn("deviance_share", list, func(f Figures) float64 { return float64(f.DevianceShare) }),
		textColumn("unit", list, ofFitted(func(f Figures) string { return f.Unit })),
		figureColumn("total", list, func(f Figures) float64 { return float64(f.Total) }),
		figureColumn("total_cv", list, func(f Figures) float64 { return float64(f.TotalCV) }),
		figureColumn("total_lower", list, func(f Figures) float64 { return float64(f.TotalLower) }),
		figureColumn("total_upper", list, func(f Figures) float64 { return float64(f.TotalUpper) }),
		figureColumn("mean", list, func(f Figures) float64 { return float64(f.Mean) }),
		figureColumn("mean_cv", list, func(f Figures) float64 { return float64(f.MeanCV) }),
		figureColumn("mean_lower", list, func(f Figures) float64 { return float64(f.MeanLower) }),
		figureColumn("mean_upper", list, func(f Figures) float64 { return float64(f.MeanUpper) }),
	}
	columns = append(columns, rankColumns(standings(list))...)
	columns = append(columns,
		textColumn("worst_level", list, ofFitted(func(f Figures) string { return string(f.WorstLevel) })),
		textColumn("worst_check", list, ofFitted(func(f Figures) string { return f.WorstCheck })))
	return tables.Write(w, len(list), columns)
}

// rows is a number of rows; unknown for a failed region that nobody counted the rows of.
func (o Outcome) rows(n int) float64 {
	if o.Status == Failed && o.Figures.Observations == 0 && o.Figures.SetAside == 0 {
		return math.NaN()
	}
	return float64(n)
}

// ofFitted keeps the words of regions that were fitted.
func ofFitted(word func(Figures) string) func(Outcome) string {
	return func(o Outcome) string {
		if o.Status == Failed {
			return ""
		}
		return word(o.Figures)
	}
}

func textColumn(name string, list []Outcome, of func(Outcome) string) tables.Column {
	c := tables.Column{Name: name, Text: make([]string, len(list))}
	for i, o := range list {
		c.Text[i] = of(o)
	}
	return c
}

func numberColumn(name string, list []Outcome, of func(Outcome) float64) tables.Column {
	c := tables.Column{Name: name, Number: make([]float64, len(list))}
	for i, o := range list {
		c.Number[i] = of(o)
	}
	return c
}

// figureColumn is a column of figures of the regions that were fitted.
func figureColumn(name string, list []Outcome, of func(Figures) float64) tables.Column {
	return numberColumn(name, list, func(o Outcome) float64 {
		if o.Status == Failed {
			return math.NaN()
		}
		return of(o.Figures)
	})
}

func rankColumns(place []standing) []tables.Column {
	columns := []tables.Column{{Name: "rank"}, {Name: "rank_lower"}, {Name: "rank_upper"}, {Name: "ranked_among"}}
	for j := range columns {
		columns[j].Number = make([]float64, len(place))
	}
	for i, s := range place {
		for j, v := range [4]int{s.rank, s.lower, s.upper, s.among} {
			columns[j].Number[i] = float64(v)
			if s.among == 0 {
				columns[j].Number[i] = math.NaN()
			}
		}
	}
	return columns
}

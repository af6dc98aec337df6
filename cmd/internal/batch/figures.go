package batch

import (
	"math"

	"drumlin/io/summary"
)

// Status is what became of a region.
type Status string

const (
	Done      Status = "done"      // fitted, and no check found anything
	Look      Status = "look"      // fitted, and somebody should look before relying on it
	Stop      Status = "stop"      // fitted, and not to be used
	Failed    Status = "failed"    // no result; the reason says why
	Unchanged Status = "unchanged" // its folder was there already, from the same input, settings and program
)

// Figures are what is told of a fitted region. Numbers that have no meaning for it are NaN.
type Figures struct {
	Observations     int            `json:"observations"`
	SetAside         int            `json:"set_aside"`
	Knots            int            `json:"knots"`
	DegreesOfFreedom summary.Number `json:"degrees_of_freedom"`
	DevianceShare    summary.Number `json:"deviance_share"`
	Distribution     string         `json:"distribution"`
	Response         string         `json:"response"`
	Unit             string         `json:"unit"`       // of the mean
	Link             string         `json:"link"`       // scale on which the limits are symmetrical: log, identity or a share's
	Confidence       summary.Number `json:"confidence"` // of the limits
	Per              summary.Number `json:"per"`        // what the mean is for: a mean of a share lies between 0 and this
	Total            summary.Number `json:"total"`      // over the region's map; NaN where nothing adds up
	TotalCV          summary.Number `json:"total_cv"`
	TotalLower       summary.Number `json:"total_lower"`
	TotalUpper       summary.Number `json:"total_upper"`
	Mean             summary.Number `json:"mean"` // over the region's map, by area
	MeanCV           summary.Number `json:"mean_cv"`
	MeanLower        summary.Number `json:"mean_lower"`
	MeanUpper        summary.Number `json:"mean_upper"`
	WorstLevel       summary.Level  `json:"worst_level"` // of the checks
	WorstCheck       string         `json:"worst_check"` // name of the first check of that level; empty where all is clear
}

// noFigures are those of a region without a fit.
func noFigures() Figures {
	none := summary.Number(math.NaN())
	return Figures{DegreesOfFreedom: none, DevianceShare: none, Confidence: none, Per: none,
		Total: none, TotalCV: none, TotalLower: none, TotalUpper: none, Mean: none, MeanCV: none, MeanLower: none, MeanUpper: none}
}

// figures takes them from the summary of a region.
func figures(d summary.Document) Figures {
	f := noFigures()
	f.Observations, f.SetAside, f.Knots = d.Input.Used, d.Input.Rows-d.Input.Used, d.Fit.Knots
	f.DegreesOfFreedom, f.DevianceShare = d.Fit.DegreesOfFreedom["total"], d.Fit.DevianceShare
	f.Distribution, f.Link, f.Unit, f.Confidence = d.Fit.Distribution, d.Fit.Link, d.Estimates.Unit, d.Estimates.Confidence
	if g := d.Region; g != nil {
		f.Response, f.Per = g.Response, g.Per
		f.Total, f.TotalCV, f.TotalLower, f.TotalUpper = g.Total, g.TotalCV, g.TotalLower, g.TotalUpper
		f.Mean, f.MeanCV, f.MeanLower, f.MeanUpper = g.Mean, g.MeanCV, g.MeanLower, g.MeanUpper
	}
	f.WorstLevel = d.Worst()
	for _, c := range d.Checks {
		if c.Level == f.WorstLevel && c.Level != summary.Clear {
			f.WorstCheck = c.Name
			break
		}
	}
	return f
}

package summary_test

import (
	"flag"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"testing"

	"drumlin/io/summary"

	"github.com/google/go-cmp/cmp"
)

var update = flag.Bool("update", false, "write the golden files under testdata afresh")

var unknown = summary.Number(math.NaN())

// golden compares got with a file under testdata.
func golden(t *testing.T, name, got string) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), got); diff != "" {
		t.Errorf("%s (-golden +got):\n%s", path, diff)
	}
}

// Documents made by hand; every number is invented.

// measurements is a plain map of measurements.
func measurements() summary.Document {
	return summary.Document{
		Version: "v0.1.0",
		Input: summary.Input{Name: "wells.csv", SHA256: "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855",
			Rows: 64, Used: 64, DistinctPlaces: 63, MedianSpacing: 412.25, Coordinates: "columns x, y taken as local metres"},
		Settings: summary.Settings{
			{Key: "observations", Value: "wells.csv"},
			{Key: "response", Value: "nitrate"},
			{Key: "distribution", Value: "gaussian", Chosen: "no denominator and no trials are named, so the response is taken for a measurement"},
			{Key: "link", Value: "identity", Chosen: "the usual link of gaussian"},
			{Key: "confidence", Value: 0.95, Chosen: "default"},
		},
		Lattice: summary.Lattice{Kind: "cells", CRS: "local", Cell: 52.5, Across: 100, Up: 81, Count: 6120, Area: 16868250},
		Fit: summary.Fit{Distribution: "gaussian", Link: "identity", Converged: true, Iterations: 5, Gradient: 3.5e-10,
			Criterion: "restricted likelihood", CriterionValue: 183.25,
			Lambda:           map[string]summary.Term{"surface": {Value: 81000.5, Convention: "deviance + lambda J(f)"}},
			DegreesOfFreedom: map[string]summary.Number{"surface": 11.75, "intercept": 1, "total": 12.75},
			Knots:            63, Dispersion: 30.25, Pearson: 30.25, Deviance: 1550.5, DevianceShare: 0.8125, LogLikelihood: -201.5, AIC: 430.5},
		Coefficients: []summary.Coefficient{{Name: "intercept", Estimate: 24.5, StandardError: 0.5, Lower: 23.5, Upper: 25.5}},
		Estimates: summary.Estimates{Unit: "nitrate", Least: 3.25, Median: 22.125, Most: 61.0625, MedianStandardError: 2.4375,
			Threshold: unknown, Above: unknown, Confidence: 0.95},
		Checks: []summary.Check{
			{Name: "convergence", Level: summary.Clear, Figure: 3.5e-10, Sentence: "the search for the smoothness ended where its criterion is level"},
			{Name: "knots", Level: summary.Clear, Figure: 0.19, Sentence: "the data use 19 % of the degrees of freedom that the knots allow"},
			{Name: "distance", Level: summary.Clear, Figure: 0, Sentence: "0 % of the map lies far from any observation"},
			{Name: "rows set aside", Level: summary.Clear, Figure: 0, Sentence: "every row could be used"},
		},
		Cautions: []string{"Limits hold for the mean, on average across the map; peaks and single places are covered less often."},
		Outputs: []summary.Output{{File: "surface.csv", SHA256: "2c26b46b68ffc68ff99b453c1d30413413422d706483bfa0f98a5e886266e7ae"},
			{File: "map.png"}},
		Folder: "out/nitrate",
	}
}

// counts has a denominator, zones with totals, a threshold and covariates.
func counts() summary.Document {
	d := measurements()
	d.Input.Name, d.Input.Rows = "plots.csv", 300
	d.Input.Used, d.Input.DistinctPlaces = 284, 284
	d.Input.SetAside = map[string]int{"missing-response": 1, "not-a-number": 7, "missing-covariate": 2, "denominator-not-positive": 1, "fractional-count": 3, "missing-coordinate": 2}
	d.Settings = summary.Settings{{Key: "response", Value: "stems"}, {Key: "area", Value: "plot_ha"}, {Key: "area_unit", Value: "ha", Chosen: "the name of the area column ends in it"},
		{Key: "linear", Value: []string{"depth_cm"}}}
	d.Fit.Distribution, d.Fit.Link, d.Fit.DispersionKnown, d.Fit.Dispersion, d.Fit.Pearson = "poisson", "log", true, 1, 1.09375
	d.Fit.DegreesOfFreedom = map[string]summary.Number{"surface": 32.76, "depth_cm": 1, "intercept": 1, "total": 34.76}
	d.Fit.Knots, d.Fit.KnotsInGaps = 200, 3
	d.Coefficients = append(d.Coefficients, summary.Coefficient{Name: "depth_cm", Estimate: -0.00886, StandardError: 0.0025, Lower: -0.0138, Upper: -0.00394})
	d.Effects = []summary.Effect{{Name: "depth_cm", Role: "linear", Range: "19 to 109"}}
	d.Estimates = summary.Estimates{Unit: "stems per ha", Least: 118.4, Median: 208.1, Most: 524.1, MedianStandardError: 23.2, Threshold: 250, Above: 0.238, Confidence: 0.9}
	d.Zones = &summary.Zones{Count: 7, Totals: true}
	for k := range 5 {
		d.Zones.Lines = append(d.Zones.Lines, fmt.Sprintf("Zone %c: %d in all (%d to %d; coefficient of variation 4.21 %%) on 500 ha", 'A'+k, 89227+k, 82170+k, 96890+k))
	}
	d.Zones.Lines = append(d.Zones.Lines, "and 2 more in zones.csv")
	d.Cautions = append(d.Cautions, "Counts are taken as complete: animals or plants that were missed are missing from the map and its totals.")
	d.Outputs = append(d.Outputs, summary.Output{File: "zones.csv"}, summary.Output{File: "zones.geojson"}, summary.Output{File: "saved.surface"})
	return d
}

// stopped has findings of every level, from positives among trials.
func stopped() summary.Document {
	d := measurements()
	d.Input.Name = "clinics.csv"
	d.Settings = summary.Settings{{Key: "response", Value: "positive"}, {Key: "trials", Value: "examined"}}
	d.Fit.Distribution, d.Fit.Link, d.Fit.DispersionKnown, d.Fit.Pearson = "binomial", "logit", true, 4.8
	d.Estimates = summary.Estimates{Unit: "positive, % of examined", Least: 0.8, Median: 12.5, Most: 48.25, MedianStandardError: 1.875, Threshold: 60, Above: 0, Confidence: 0.95}
	d.Checks[0] = summary.Check{Name: "convergence", Level: summary.Look, Figure: 0.25, Sentence: "the search for the smoothness nearly settled"}
	d.Checks = append(d.Checks, summary.Check{Name: "over-dispersion", Level: summary.Stop, Figure: 4.8,
		Sentence: "the scatter about the map is 4.8 times what a binomial allows (Pearson): the intervals are too narrow by its square root, 2.19, and part of the surface may be noise"})
	d.Zones = &summary.Zones{Count: 1, Note: "no totals: only counts with an area behind them add up; the mean is over cells of the map, each counting with its area",
		Lines: []string{"Hill: mean 12.5 (8.25 to 18), positive, % of examined"}}
	return d
}

// places predicts at the user's own places.
func places() summary.Document {
	d := measurements()
	d.Lattice = summary.Lattice{Kind: "places", CRS: "EPSG:32633", Count: 3, Cell: unknown, Area: unknown}
	d.Settings = append(d.Settings, summary.Setting{Key: "weight", Value: "w"})
	d.Estimates.Threshold, d.Estimates.Above = 50, 1.0/3
	return d
}

// regression has no surface, one place and no spacing, and many coefficients.
func regression() summary.Document {
	d := measurements()
	d.Input.DistinctPlaces, d.Input.MedianSpacing = 1, unknown
	d.Fit.DegreesOfFreedom = map[string]summary.Number{"intercept": 1, "soil": 8, "total": 9}
	d.Fit.Lambda, d.Fit.Knots, d.Fit.Dispersion = nil, 0, unknown
	for k := range 8 {
		d.Coefficients = append(d.Coefficients, summary.Coefficient{Name: fmt.Sprintf("soil=kind %d", k), Estimate: summary.Number(k) - 3.5, StandardError: 1, Lower: -1, Upper: 1})
	}
	d.Effects = []summary.Effect{{Name: "soil", Role: "category", Held: "kind 3 (commonest)", Range: "9 levels, loam the base"}}
	return d
}

// plane is a surface that the data let bend no more than a plane.
func plane() summary.Document {
	d := measurements()
	d.Fit.Plane, d.Fit.Criterion = true, "a given number"
	d.Fit.DegreesOfFreedom["surface"] = 2
	d.Fit.Distribution, d.Fit.Link = "gamma", "log"
	return d
}

// chosen has a distribution that the data chose, knots that the fit chose, curves for each level of a category, and a
// group, with the map held at values.
func chosen() summary.Document {
	d := measurements()
	d.Input.Name = "traps.csv"
	reason := "the restricted likelihood is better by 31.2 with extra variation (theta 2.38)"
	d.Settings = summary.Settings{{Key: "response", Value: "caught"}, {Key: "effort", Value: "nights"},
		{Key: "distribution", Value: "negative-binomial", Chosen: reason},
		{Key: "max_knots", Value: 100, Chosen: "from 50 knots to 100 the fit moved by no more than 0.12 mean standard errors"},
		{Key: "curve_per", Value: []string{"slope=soil"}}, {Key: "group", Value: []string{"observer"}}}
	d.Fit.Distribution, d.Fit.Link, d.Fit.DispersionKnown, d.Fit.Dispersion, d.Fit.Pearson = "negative-binomial", "log", true, 1, 1.03125
	d.Fit.Shape = &summary.Shape{Name: "theta", Value: 2.375, Estimated: true}
	d.Fit.ExtraVariation = &summary.ExtraVariation{Plain: "poisson", Extra: "negative-binomial", PlainCriterion: 214.45, ExtraCriterion: 183.25,
		PlainAIC: 471.5, ExtraAIC: 430.5, Chosen: "negative-binomial", Reason: reason}
	d.Fit.KnotPath = []summary.KnotStep{{Knots: 50, DegreesOfFreedom: 11.5, RMSChange: unknown, LargestChange: unknown},
		{Knots: 100, DegreesOfFreedom: 12.75, RMSChange: 0.0625, LargestChange: 0.125}}
	d.Fit.Knots, d.Fit.UncertainSmooth, d.Fit.AICCorrected = 100, true, 433.25
	d.Effects = []summary.Effect{
		{Name: "slope", Role: "curve", Per: "soil=clay", Held: "12.3 (mean)", HeldValue: 12.34375, Range: "0 to 31", DegreesOfFreedom: 3.25, Deviation: unknown, Overlap: 0.25},
		{Name: "slope", Role: "curve", Per: "soil=peat", Held: "12.3 (mean)", HeldValue: 12.34375, Range: "0 to 28", DegreesOfFreedom: 1, Deviation: unknown, Overlap: 0.25},
		{Name: "observer", Role: "group", HeldValue: unknown, Range: "6 levels", DegreesOfFreedom: 4.5, Deviation: 0.3125, Overlap: 0.0625},
		{Name: "soil", Role: "category", Held: "peat", HeldValue: unknown, Range: "2 levels, clay the base", DegreesOfFreedom: 1, Deviation: unknown, Overlap: 0.5},
	}
	d.Coefficients = append(d.Coefficients, summary.Coefficient{Name: "soil=peat", Estimate: 0.75, StandardError: 0.25, Lower: 0.25, Upper: 1.25})
	return d
}

// levels has a surface for each level of a category, held at one of them, amounts behind an effort, and a shape at its
// bound.
func levels() summary.Document {
	d := measurements()
	d.Settings = summary.Settings{{Key: "response", Value: "kilograms"}, {Key: "effort", Value: "hours"}, {Key: "surface_per", Value: "year"}}
	d.Fit.Distribution, d.Fit.Link, d.Fit.Dispersion = "tweedie", "log", 0.0859375
	d.Fit.Shape = &summary.Shape{Name: "power", Value: 1.99, Estimated: true, Simpler: "gamma"}
	d.Effects = []summary.Effect{{Name: "year", Role: "surface-per", Held: "2021", HeldValue: unknown, Range: "3 levels", DegreesOfFreedom: 11.75, Deviation: unknown, Overlap: unknown}}
	return d
}

// nothing is a surface that was allowed to vanish and did.
func nothing() summary.Document {
	d := measurements()
	d.Fit.DegreesOfFreedom = map[string]summary.Number{"surface": 0.00048828125, "intercept": 1, "site": 0.0009765625, "total": 1.00146484375}
	d.Effects = []summary.Effect{{Name: "site", Role: "group", HeldValue: unknown, Range: "9 levels", DegreesOfFreedom: 0.0009765625, Deviation: 2.34e-5, Overlap: 0.25}}
	d.Fit.ExtraVariation = &summary.ExtraVariation{Plain: "poisson", Extra: "negative-binomial", Chosen: "poisson",
		Reason: "the negative-binomial went back to the poisson: there is no extra variation"}
	d.Fit.Distribution, d.Fit.Link, d.Fit.DispersionKnown, d.Fit.Pearson = "poisson", "log", true, 0.96875
	return d
}

package pipeline

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"drumlin/io/chart"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// picture is a map with the name of its file.
type picture struct {
	file string
	chart.Map
}

// pictures returns the maps of the region: the estimate, its uncertainty, the chance where there is a threshold, and the
// relative risk where there is a reference.
func (r *run) pictures() []picture {
	e, unit := r.estimates, r.reporting.Unit
	level := r.picture("map.png", unit, chart.Level, e.estimate)
	if r.reporting.ratio {
		level.Kind = chart.Ratio
	}
	list := []picture{level}
	if *r.settings.Distribution == plan.Gaussian {
		list = append(list, r.picture("uncertainty.png", "standard error of "+unit, chart.Uncertainty, e.standardError))
	} else {
		percent := make([]float64, len(e.cv))
		for i, v := range e.cv {
			percent[i] = 100 * v
		}
		list = append(list, r.picture("uncertainty.png", "coefficient of variation, %", chart.Uncertainty, percent))
	}
	if e.relative != nil {
		list = append(list, r.picture("relative-risk.png", fmt.Sprintf("relative risk (1 = %s %s)", summary.Short(summary.Number(r.reporting.Reference)), unit), chart.Ratio, e.relative))
	}
	if e.chance != nil {
		list = append(list, r.picture("chance.png", fmt.Sprintf("chance of more than %s, %s", summary.Short(summary.Number(*r.reporting.Threshold)), unit), chart.Chance, e.chance))
	}
	return list
}

func (r *run) picture(file, legend string, kind chart.Kind, value []float64) picture {
	m := chart.Map{Title: r.reporting.title, Subtitle: r.subtitle(), Legend: legend, Kind: kind, Lattice: r.target.lattice,
		Outline: r.area.outline, Stamp: r.stamp(), Foot: r.document.Cautions}
	m.Observations.X, m.Observations.Y = r.obs.placeX, r.obs.placeY
	if r.target.own() {
		m.Dots = chart.Dots{X: r.target.places.X, Y: r.target.places.Y, Value: value}
	} else {
		m.Value = make([]float64, r.target.lattice.Cells())
		for k := range m.Value {
			m.Value[k] = math.NaN()
		}
		for k, c := range r.target.cells {
			m.Value[c] = value[k]
		}
	}
	if r.zones != nil {
		for _, z := range r.zones.zones {
			m.Zones = append(m.Zones, chart.Zone{Name: z.Name, Area: z.Shape})
		}
	}
	return picture{file, m}
}

// subtitle says what the map is adjusted to.
func (r *run) subtitle() string {
	if len(r.target.held) == 0 {
		return ""
	}
	var parts []string
	for _, name := range slices.Sorted(maps.Keys(r.target.held)) {
		parts = append(parts, name+" = "+r.target.held[name])
	}
	return "adjusted to " + strings.Join(parts, ", ")
}

// stamp says what keeps the map from being used.
func (r *run) stamp() string {
	var names []string
	for _, c := range r.document.Checks {
		if c.Level == summary.Stop {
			names = append(names, c.Name)
		}
	}
	if names == nil {
		return ""
	}
	return "NOT FOR USE: " + strings.Join(names, ", ")
}

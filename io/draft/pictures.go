package draft

import (
	"fmt"
	"math"

	"drumlin/grids"
	"drumlin/io/chart"
	"drumlin/io/summary"
)

// Names of the pictures' files.
const (
	MapFile         = "map.png"
	UncertaintyFile = "uncertainty.png"
	RelativeFile    = "relative-risk.png"
	ChanceFile      = "chance.png"
)

// Picture is a map with the name of its file.
type Picture struct {
	File string
	chart.Map
}

// Pictures returns the maps of the region: the estimate, its uncertainty, the relative risk where there is a reference,
// and the chance where there is a threshold. d must be valid. The classes are left to each map; where they are shared,
// set Breaks and Shared.
func (d Draft) Pictures() []Picture {
	l := d.masked()
	level := chart.Level
	if d.Ratio {
		level = chart.Ratio
	}
	list := []Picture{d.picture(l, MapFile, d.Unit, level, d.Estimate)}
	if d.Spread == StandardError {
		list = append(list, d.picture(l, UncertaintyFile, "standard error of "+d.Unit, chart.Uncertainty, d.StandardError))
	} else {
		list = append(list, d.picture(l, UncertaintyFile, "coefficient of variation, %", chart.Uncertainty, percent(d.CV)))
	}
	if d.Relative != nil {
		legend := fmt.Sprintf("relative risk (1 = %s %s)", summary.Short(summary.Number(d.Reference)), d.Unit)
		list = append(list, d.picture(l, RelativeFile, legend, chart.Ratio, d.Relative))
	}
	if d.Chance != nil {
		legend := fmt.Sprintf("chance of more than %s, %s", summary.Short(summary.Number(*d.Threshold)), d.Unit)
		list = append(list, d.picture(l, ChanceFile, legend, chart.Chance, d.Chance))
	}
	return list
}

// masked is the lattice with the study area marked; without cells it is as it was.
func (d Draft) masked() grids.Lattice {
	l := d.Lattice
	if d.Cells == nil {
		return l
	}
	l.Mask = make([]bool, l.Cells())
	for _, c := range d.Cells {
		l.Mask[c] = true
	}
	return l
}

func (d Draft) picture(l grids.Lattice, file, legend string, kind chart.Kind, value []float64) Picture {
	m := chart.Map{Title: d.Title, Subtitle: d.Subtitle, Legend: legend, Kind: kind, Lattice: l, Outline: d.Outline, Zones: d.Zones,
		Observations: chart.Points{X: d.PlaceX, Y: d.PlaceY}, Stamp: d.Stamp, Foot: d.Foot}
	if d.Cells == nil {
		m.Dots = chart.Dots{X: d.X, Y: d.Y, Value: value}
		return Picture{file, m}
	}
	m.Value = make([]float64, l.Cells())
	for k := range m.Value {
		m.Value[k] = math.NaN()
	}
	for k, c := range d.Cells {
		m.Value[c] = value[k]
	}
	return Picture{file, m}
}

func percent(share []float64) []float64 {
	p := make([]float64, len(share))
	for i, v := range share {
		p[i] = 100 * v
	}
	return p
}

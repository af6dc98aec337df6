package draft

import (
	"fmt"
	"math"

	"drumlin/grids"
	"drumlin/io/chart"
	"drumlin/io/summary"

	"github.com/paulmach/orb"
)

// Names of the pictures' files.
const (
	MapFile            = "map.png"
	UncertaintyFile    = "uncertainty.png"
	RelativeFile       = "relative-risk.png"
	ChanceFile         = "chance.png"
	PlacesFile         = "places.png"
	PlacesRelativeFile = "places-relative-risk.png"
)

// Picture is a map with the name of its file.
type Picture struct {
	File string
	// Classes is the file of the picture whose breaks it takes where breaks are shared, so that the two can be compared:
	// its own, but MapFile and RelativeFile for the pictures of the places.
	Classes string
	chart.Map
}

// Pictures returns the maps of the region: the estimate, its uncertainty, the relative risk where there is a reference,
// the chance where there is a threshold, and where there are shapes the places themselves, by their smoothed values and
// by their relative risks. d must be valid. The classes are left to each map; where they are shared, set Breaks and Shared
// as Picture.Classes says.
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
		list = append(list, d.picture(l, RelativeFile, d.relativeLegend(), chart.Ratio, d.Relative))
	}
	if d.Chance != nil {
		legend := fmt.Sprintf("chance of more than %s, %s", summary.Short(summary.Number(*d.Threshold)), d.Unit)
		list = append(list, d.picture(l, ChanceFile, legend, chart.Chance, d.Chance))
	}
	if d.ShapeOf != nil {
		list = append(list, d.places(PlacesFile, MapFile, d.Unit, level, d.ShapeEstimate))
	}
	if d.ShapeRelative != nil {
		list = append(list, d.places(PlacesRelativeFile, RelativeFile, d.relativeLegend(), chart.Ratio, d.ShapeRelative))
	}
	return list
}

func (d Draft) relativeLegend() string {
	return fmt.Sprintf("relative risk (1 = %s %s)", summary.Short(summary.Number(d.Reference)), d.Unit)
}

// places is a picture of the places. Zones and observations stay away: the places' own edges and names are enough.
func (d Draft) places(file, classes, legend string, kind chart.Kind, value []float64) Picture {
	subtitle := "the smoothed value of each place"
	if d.Subtitle != "" {
		subtitle += ", " + d.Subtitle
	}
	return Picture{file, classes, chart.Map{Title: d.Title, Subtitle: subtitle, Legend: legend, Kind: kind, Lattice: grids.Lattice{CRS: d.Lattice.CRS},
		Shapes: chart.Shapes{Geometry: d.ShapeOf, Value: value, Name: d.ShapeName}, Outline: d.Outline, Stamp: d.Stamp, Foot: d.Foot}}
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
	if areas := d.areas(); d.Zones == nil && areas != nil {
		m.Zones, m.ZoneWord = areas, "place"
	}
	if d.Cells == nil {
		m.Dots = chart.Dots{X: d.X, Y: d.Y, Value: value}
		return Picture{file, file, m}
	}
	m.Value = make([]float64, l.Cells())
	for k := range m.Value {
		m.Value[k] = math.NaN()
	}
	for k, c := range d.Cells {
		m.Value[c] = value[k]
	}
	return Picture{file, file, m}
}

// mostAreas is the number of places up to which their borders are drawn over a surface: more would hide it.
const mostAreas = 300

// areas are the places that are areas, without their names: these are on the picture of the places.
func (d Draft) areas() (list []chart.Zone) {
	if len(d.ShapeOf) > mostAreas {
		return nil
	}
	for _, g := range d.ShapeOf {
		switch g := g.(type) {
		case orb.Polygon:
			list = append(list, chart.Zone{Area: orb.MultiPolygon{g}})
		case orb.MultiPolygon:
			list = append(list, chart.Zone{Area: g})
		}
	}
	return list
}

func percent(share []float64) []float64 {
	p := make([]float64, len(share))
	for i, v := range share {
		p[i] = 100 * v
	}
	return p
}

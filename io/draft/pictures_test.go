package draft_test

import (
	"bytes"
	"math"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"

	"drumlin/grids"
	"drumlin/io/chart"
	"drumlin/io/draft"
)

// mapOf is a map of the full draft made from the lattice as it was, mask and all.
func mapOf(t *testing.T, d draft.Draft, legend string, kind chart.Kind, value []float64) chart.Map {
	m := chart.Map{Title: `Stems in "Harrow" valley`, Subtitle: "adjusted to depth = 12.5", Legend: legend, Kind: kind, Lattice: masked(t),
		Outline: d.Outline, Zones: d.Zones, Observations: chart.Points{X: d.PlaceX, Y: d.PlaceY},
		Stamp: "NOT FOR USE: convergence", Foot: []string{"A caution.", ""}}
	m.Value = make([]float64, m.Lattice.Cells())
	n := 0
	for k := range m.Value {
		m.Value[k] = math.NaN()
		if m.Lattice.In(k) {
			m.Value[k] = value[n]
			n++
		}
	}
	return m
}

// placesOf is a picture of the places of the full draft, whose estimate is a relative risk as well.
func placesOf(d draft.Draft, legend string, value []float64) chart.Map {
	return chart.Map{Title: `Stems in "Harrow" valley`, Subtitle: "the smoothed value of each place, adjusted to depth = 12.5", Legend: legend, Kind: chart.Ratio,
		Lattice: grids.Lattice{CRS: d.Lattice.CRS}, Shapes: chart.Shapes{Geometry: d.ShapeOf, Value: value, Name: d.ShapeName}, Outline: d.Outline,
		Stamp: "NOT FOR USE: convergence", Foot: []string{"A caution.", ""}}
}

func percent(v []float64) []float64 {
	p := make([]float64, len(v))
	for i := range v {
		p[i] = 100 * v[i]
	}
	return p
}

func TestPictures(t *testing.T) {
	d := full(t)
	want := []draft.Picture{
		{File: "map.png", Classes: "map.png", Map: mapOf(t, d, "stems per ha", chart.Ratio, d.Estimate)},
		{File: "uncertainty.png", Classes: "uncertainty.png", Map: mapOf(t, d, "coefficient of variation, %", chart.Uncertainty, percent(d.CV))},
		{File: "relative-risk.png", Classes: "relative-risk.png", Map: mapOf(t, d, "relative risk (1 = 0.143 stems per ha)", chart.Ratio, d.Relative)},
		{File: "chance.png", Classes: "chance.png", Map: mapOf(t, d, "chance of more than 0.3, stems per ha", chart.Chance, d.Chance)},
		{File: "places.png", Classes: "map.png", Map: placesOf(d, "stems per ha", d.ShapeEstimate)},
		{File: "places-relative-risk.png", Classes: "relative-risk.png", Map: placesOf(d, "relative risk (1 = 0.143 stems per ha)", d.ShapeRelative)},
	}
	got := d.Pictures()
	if diff := cmp.Diff(want, got, exactly...); diff != "" {
		t.Fatalf("(-want +got):\n%s", diff)
	}
	again := read(t, write(t, d)).Pictures()
	for i := range want {
		var a, b bytes.Buffer
		if err := want[i].WritePNG(&a); err != nil {
			t.Fatal(err)
		}
		if err := again[i].WritePNG(&b); err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(a.Bytes(), b.Bytes()) {
			t.Errorf("%s: another picture after writing and reading the draft", want[i].File)
		}
	}
}

func TestPicturesOfOwnPlaces(t *testing.T) {
	d := own(t)
	base := chart.Map{Title: "zinc", Legend: "mg/kg", Lattice: d.Lattice, Dots: chart.Dots{X: d.X, Y: d.Y, Value: d.Estimate}}
	spread := base
	spread.Legend, spread.Kind, spread.Dots.Value = "standard error of mg/kg", chart.Uncertainty, d.StandardError
	want := []draft.Picture{{File: draft.MapFile, Classes: draft.MapFile, Map: base}, {File: draft.UncertaintyFile, Classes: draft.UncertaintyFile, Map: spread}}
	if diff := cmp.Diff(want, d.Pictures(), exactly...); diff != "" {
		t.Fatalf("(-want +got):\n%s", diff)
	}
	places := d
	places.ShapeOf, places.ShapeEstimate = shapes()[:2], []float64{3, 4}
	for i := range want { // the borders of areas are drawn where there are no zones
		for _, g := range shapes()[:2] {
			switch g := g.(type) {
			case orb.Polygon:
				want[i].Zones = append(want[i].Zones, chart.Zone{Area: orb.MultiPolygon{g}})
			case orb.MultiPolygon:
				want[i].Zones = append(want[i].Zones, chart.Zone{Area: g})
			}
		}
		want[i].ZoneWord = "place"
	}
	want = append(want, draft.Picture{File: draft.PlacesFile, Classes: draft.MapFile, Map: chart.Map{Title: "zinc", Subtitle: "the smoothed value of each place", Legend: "mg/kg",
		Lattice: d.Lattice, Shapes: chart.Shapes{Geometry: shapes()[:2], Value: []float64{3, 4}}}})
	if diff := cmp.Diff(want, places.Pictures(), exactly...); diff != "" {
		t.Fatalf("(-want +got):\n%s", diff)
	}
	for _, p := range places.Pictures() {
		if err := p.Validate(); err != nil {
			t.Errorf("%s: %v", p.File, err)
		}
	}
}

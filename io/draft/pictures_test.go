package draft_test

import (
	"bytes"
	"math"
	"testing"

	"github.com/google/go-cmp/cmp"

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
		{File: "map.png", Map: mapOf(t, d, "stems per ha", chart.Ratio, d.Estimate)},
		{File: "uncertainty.png", Map: mapOf(t, d, "coefficient of variation, %", chart.Uncertainty, percent(d.CV))},
		{File: "relative-risk.png", Map: mapOf(t, d, "relative risk (1 = 0.143 stems per ha)", chart.Ratio, d.Relative)},
		{File: "chance.png", Map: mapOf(t, d, "chance of more than 0.3, stems per ha", chart.Chance, d.Chance)},
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
	want := []draft.Picture{{File: draft.MapFile, Map: base}, {File: draft.UncertaintyFile, Map: spread}}
	if diff := cmp.Diff(want, d.Pictures(), exactly...); diff != "" {
		t.Fatalf("(-want +got):\n%s", diff)
	}
	for _, p := range d.Pictures() {
		if err := p.Validate(); err != nil {
			t.Errorf("%s: %v", p.File, err)
		}
	}
}

package pipeline

import (
	"io"
	"math"
	"slices"

	"drumlin/grids"
	"drumlin/grids/isolines"
	"drumlin/io/plan"
	"drumlin/io/vector"

	"github.com/paulmach/orb"
)

// levels are those of the isolines: as said, or round ones.
func (r *run) levels() []float64 {
	if at := r.settings.IsolinesAt; at != nil {
		return *at
	}
	if len(r.estimates.estimate) == 0 {
		return nil
	}
	return isolines.Round(slices.Min(r.estimates.estimate), slices.Max(r.estimates.estimate), isolines.DefaultLevels)
}

// writeIsolines writes lines of equal estimate, or the bands between them.
func (r *run) writeIsolines(w io.Writer) error {
	field := grids.NewField(r.target.lattice, "estimate")
	for k, c := range r.target.cells {
		field.Value[c] = r.estimates.estimate[k]
	}
	var shapes []orb.Geometry
	var columns []vector.Column
	if *r.settings.Isolines == plan.Bands {
		edges := slices.Concat([]float64{math.Inf(-1)}, r.levels(), []float64{math.Inf(1)})
		bands, err := isolines.Bands(field.Lattice, field.Value, edges)
		if err != nil {
			return refuse("ask for other levels with --isolines-at, or for larger cells", "isolines.geojson: %w", err)
		}
		var low, high []float64
		for _, b := range bands {
			shapes, low, high = append(shapes, b.Area), append(low, b.Low), append(high, b.High)
		}
		columns = []vector.Column{{Name: "low", Value: low}, {Name: "high", Value: high}}
	} else {
		lines, err := isolines.Lines(field.Lattice, field.Value, r.levels())
		if err != nil {
			return refuse("ask for other levels with --isolines-at, or for larger cells", "isolines.geojson: %w", err)
		}
		var level []float64
		for _, l := range lines {
			shapes, level = append(shapes, l.Paths), append(level, l.Level)
		}
		columns = []vector.Column{{Name: "level", Value: level}}
	}
	unit := make([]string, len(shapes))
	for i := range unit {
		unit[i] = r.reporting.Unit
	}
	return vector.WriteShapes(w, r.obs.system, shapes, append(columns, vector.Column{Name: "unit", Text: unit}))
}

package pipeline

import (
	"context"
	"io"
	"math"

	"drumlin/io/geotiff"
)

// rasterBands are the columns of surface.csv that are bands of surface.tif, where they have values.
var rasterBands = []string{"estimate", "standard_error", "lower", "upper", "cv", "chance", "relative_risk", "nearest_m"}

// writeRaster writes the map as a GeoTIFF, a band a figure.
func (r *run) writeRaster(ctx context.Context, w io.Writer) error {
	columns := map[string][]float64{}
	for _, c := range r.estimates.columns() {
		columns[c.Name] = c.Number
	}
	var names []string
	var values [][]float64
	for _, name := range rasterBands {
		if v := columns[name]; v != nil {
			names, values = append(names, name), append(values, v)
		}
	}
	l := r.target.lattice
	at := r.target.placeOf()
	return geotiff.Write(ctx, w, geotiff.GridOf(l, names), func(band, y int, dst []float32) error {
		for x := range dst {
			dst[x] = float32(math.NaN())
			if k := at[(l.NY-1-y)*l.NX+x]; k > 0 { // rows of a lattice go up from the south
				dst[x] = float32(values[band][k-1])
			}
		}
		return nil
	}, *r.settings.Workers)
}

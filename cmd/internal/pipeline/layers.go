package pipeline

import (
	"context"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"

	"drumlin/grids/crs"
	"drumlin/io/geotiff"
	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/spatial"

	"gonum.org/v1/gonum/mat"
)

// layer is a raster that gives a covariate.
type layer struct {
	name     string
	source   string // name of the file
	category bool   // values are classes: the nearest cell counts, and nothing in between
	raster   *geotiff.Raster
	file     *os.File
	band     int
	onto     func(x, y float64) (u, v float64) // from the plane to the raster's coordinates
}

// openLayers opens the layers. Close them when all is sampled.
func openLayers(s plan.Settings, o *observations) ([]layer, error) {
	var list []layer
	for _, l := range s.Layer {
		one, err := openLayer(l, s, o)
		if err != nil {
			closeLayers(list)
			return nil, err
		}
		list = append(list, one)
	}
	return list, nil
}

func closeLayers(list []layer) {
	for _, l := range list {
		l.file.Close()
	}
}

func openLayer(l plan.Layer, s plan.Settings, o *observations) (layer, error) {
	raster, file, err := openRaster(l.Path)
	if err != nil {
		return layer{}, err
	}
	one := layer{name: l.Name, source: filepath.Base(l.Path), category: slices.Contains(s.Categories(), l.Name), raster: raster, file: file}
	if one.band, err = one.bandFor(); err == nil {
		one.onto, err = ontoRaster(raster, o, one.source)
	}
	if err != nil {
		file.Close()
		return layer{}, err
	}
	return one, nil
}

// bandFor is the band of the covariate's name, or the only one.
func (l layer) bandFor() (int, error) {
	if band, there := l.raster.Band(l.name); there {
		return band, nil
	}
	if len(l.raster.Bands) == 1 {
		return 0, nil
	}
	return 0, absentColumn(l.source, l.name, "the layer", rasterColumns(l.raster)[2:])
}

// ontoRaster leads from the plane of the observations to the coordinates of a raster. One that does not say what its
// coordinates are has those that the observations came in.
func ontoRaster(r *geotiff.Raster, o *observations, name string) (func(x, y float64) (u, v float64), error) {
	same := func(x, y float64) (u, v float64) { return x, y }
	code := r.CRS()
	degrees := r.Geographic || code != "" && crs.IsGeographic(code) || code == "" && o.table.Degrees
	switch {
	case !degrees && (code == "" || sameSystem(code, o.system)):
		return same, nil
	case !o.system.Geographic():
		return nil, refuse("say with --crs what the coordinates of the observations are", "%s: the raster is in %s, and the observations in local metres", name, code)
	case degrees:
		return func(x, y float64) (u, v float64) {
			lon, lat := o.system.Inverse(x, y)
			west, _, east, _ := r.Bounds()
			if lon < west && lon+360 <= east { // longitudes counted to 360
				lon += 360
			}
			return lon, lat
		}, nil
	}
	system, err := crs.Parse(code)
	if err != nil {
		return nil, refuse("write the raster in longitude and latitude, or in the system of the observations", "%s: %w", name, err)
	}
	return func(x, y float64) (u, v float64) { return system.Forward(o.system.Inverse(x, y)) }, nil
}

// mostWindow bounds the part of a layer that is held in memory, in cells: 512 MiB.
const mostWindow = 1 << 26

// sample returns the values of a layer at places of the plane, NaN where it has none: between the centres of cells for a
// number, of the nearest cell for a class. A neighbour without a value does not count; a place whose own cell has none has none.
func (l layer) sample(ctx context.Context, x, y []float64) ([]float64, error) {
	r := l.raster
	column, row := make([]float64, len(x)), make([]float64, len(x)) // in cells, 0 at the centre of the first
	west, north, east, south := r.Width, r.Height, -1, -1
	for k := range x {
		u, v := l.onto(x[k], y[k])
		column[k], row[k] = (u-r.X0)/r.CellX-0.5, (r.Y0-v)/r.CellY-0.5
		if l.outside(column[k], row[k]) {
			continue
		}
		i, j := int(math.Floor(column[k])), int(math.Floor(row[k]))
		west, east = min(west, max(i, 0)), max(east, min(i+1, r.Width-1))
		north, south = min(north, max(j, 0)), max(south, min(j+1, r.Height-1))
	}
	value := repeat(notKnown, len(x))
	if east < west {
		return value, nil
	}
	wide, high := east-west+1, south-north+1
	if wide*high > mostWindow {
		return nil, refuse("cut it to the study area, or make its cells larger", "%s: %d x %d cells of the layer lie in the study area, more than can be held", l.source, wide, high)
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	cells := make([]float64, wide*high)
	if err := r.Window(cells, l.band, west, north, wide, high); err != nil {
		return nil, err
	}
	at := func(i, j int) float64 {
		return cells[(min(max(j, north), south)-north)*wide+min(max(i, west), east)-west]
	}
	for k := range x {
		if l.outside(column[k], row[k]) {
			continue
		}
		own := at(int(math.Round(column[k])), int(math.Round(row[k])))
		if l.category || math.IsNaN(own) {
			value[k] = own
			continue
		}
		value[k] = bilinear(at, column[k], row[k])
	}
	return value, nil
}

// outside reports whether a place lies off the raster.
func (l layer) outside(column, row float64) bool {
	return !(column >= -0.5 && row >= -0.5 && column < float64(l.raster.Width)-0.5 && row < float64(l.raster.Height)-0.5)
}

// bilinear is between the four cells around a place, those without a value left out.
func bilinear(at func(i, j int) float64, column, row float64) float64 {
	i, j := int(math.Floor(column)), int(math.Floor(row))
	p, q := column-float64(i), row-float64(j)
	sum, weight := 0.0, 0.0
	for _, c := range [4]struct {
		i, j int
		w    float64
	}{{i, j, (1 - p) * (1 - q)}, {i + 1, j, p * (1 - q)}, {i, j + 1, (1 - p) * q}, {i + 1, j + 1, p * q}} {
		if v := at(c.i, c.j); !math.IsNaN(v) {
			sum, weight = sum+c.w*v, weight+c.w
		}
	}
	return sum / weight
}

// sampleRows gives the observations the covariates that their table lacks. Rows for which a layer has no value are set
// aside; it reports whether there are any.
func (r *run) sampleRows(ctx context.Context, o *observations) (aside bool, err error) {
	list, err := openLayers(r.settings, o)
	if err != nil {
		return false, err
	}
	defer closeLayers(list)
	for _, l := range list {
		if o.table.Column(l.name) != nil {
			continue
		}
		value, err := l.sampleAt(ctx, o)
		if err != nil {
			return false, err
		}
		var lacking []int
		for i, v := range value {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				lacking = append(lacking, i)
			}
		}
		switch {
		case 2*len(lacking) > len(value):
			return false, refuse("check that the layer covers the observations and has their coordinate system",
				"%s: the layer has no value at %d of %d observations", l.source, len(lacking), len(value))
		case len(lacking) > 0 && *r.settings.Strict:
			fault := atRow(o.table, lacking[0])
			fault.Column, fault.What = l.name, "the layer has no value there"
			fault.Advice = "take the row out, or leave out --strict to set such rows aside"
			return false, fault
		case len(lacking) > 0:
			o.table.SetAside(lacking, l.name, "missing-layer", "the layer has no value there")
			own, _ := slices.BinarySearch(lacking, o.own)
			o.own -= own
			return true, nil
		}
		o.table.Columns = append(o.table.Columns, l.columnOf(value))
	}
	return false, nil
}

// sampleAt is the mean of a layer over the points that stand for each row.
func (l layer) sampleAt(ctx context.Context, o *observations) ([]float64, error) {
	at := o.data.Places
	value, err := l.sample(ctx, at.X, at.Y)
	if err != nil || at.Start == nil {
		return value, err
	}
	if l.category {
		return l.sample(ctx, o.x, o.y)
	}
	rows := make([]float64, at.Len())
	for i := range rows {
		sum, weight := 0.0, 0.0
		for q := at.Start[i]; q < at.Start[i+1]; q++ {
			if v := value[q]; !math.IsNaN(v) {
				sum, weight = sum+at.Share[q]*v, weight+at.Share[q]
			}
		}
		rows[i] = sum / weight
	}
	return rows, nil
}

// columnOf makes a column of values, all of which are there.
func (l layer) columnOf(value []float64) observe.Column {
	if !l.category {
		return observe.Column{Name: l.name, Number: value}
	}
	var level []string
	for _, v := range value {
		level = append(level, strconv.FormatFloat(v, 'g', -1, 64))
	}
	slices.Sort(level)
	level = slices.Compact(level)
	return observe.Column{Name: l.name, Code: codesOf(value, level), Level: level}
}

// codesOf finds each number among sorted levels, -1 where it is none of them.
func codesOf(value []float64, level []string) []int32 {
	code := make([]int32, len(value))
	for i, v := range value {
		code[i] = -1
		if k, found := slices.BinarySearch(level, strconv.FormatFloat(v, 'g', -1, 64)); found {
			code[i] = int32(k)
		}
	}
	return code
}

// sampleCells returns the layers' covariates at places of the plane, and the places that have all of them, of a level that
// was observed, ascending.
func (r *run) sampleCells(ctx context.Context, x, y []float64) (list []spatial.Covariate, whole []int, err error) {
	layers, err := openLayers(r.settings, r.obs)
	if err != nil {
		return nil, nil, err
	}
	defer closeLayers(layers)
	lacks := make([]bool, len(x))
	for _, l := range layers {
		value, err := l.sample(ctx, x, y)
		if err != nil {
			return nil, nil, err
		}
		c := spatial.Covariate{Name: l.name, Number: value}
		if l.category {
			c = spatial.Covariate{Name: l.name, Level: r.obs.table.Column(l.name).Level}
			c.Code = codesOf(value, c.Level)
		}
		for k, v := range value {
			lacks[k] = lacks[k] || math.IsNaN(v) || math.IsInf(v, 0) || l.category && c.Code[k] < 0
		}
		list = append(list, c)
	}
	for k, lack := range lacks {
		if !lack {
			whole = append(whole, k)
		}
	}
	return list, whole, nil
}

// firstMissing is the first number from 0 up that is not in an ascending list.
func firstMissing(list []int) int {
	for k, v := range list {
		if k != v {
			return k
		}
	}
	return len(list)
}

// join puts the values of covariates at further places behind those at the first.
func join(first, further []spatial.Covariate) []spatial.Covariate {
	var list []spatial.Covariate
	for k, c := range first {
		list = append(list, spatial.Covariate{Name: c.Name, Level: c.Level, Number: slices.Concat(c.Number, further[k].Number), Code: slices.Concat(c.Code, further[k].Code)})
	}
	return list
}

// layered reports whether a layer gives the covariate.
func layered(s plan.Settings, name string) bool {
	return slices.ContainsFunc(s.Layer, func(l plan.Layer) bool { return l.Name == name })
}

// withoutLayers leaves out covariates that a layer gives and none of the tables has.
func withoutLayers(s plan.Settings, want observe.Request, have []string) observe.Request {
	lacks := func(name string) bool { return layered(s, name) && !slices.Contains(have, name) }
	want.Linear = slices.DeleteFunc(slices.Clone(want.Linear), lacks)
	want.Category = slices.DeleteFunc(slices.Clone(want.Category), lacks)
	return want
}

// layCells gives the cells of the map the layers' covariates, and leaves out of it those that lack one.
func (r *run) layCells(ctx context.Context, t *target) error {
	if len(r.settings.Layer) == 0 {
		return nil
	}
	list, whole, err := r.sampleCells(ctx, t.places.X, t.places.Y)
	if err != nil {
		return err
	}
	if len(whole) == 0 {
		return refuse("check that the layers cover the study area and have its coordinate system, and that their classes are those of the observations",
			"no cell of the map has a value in every layer")
	}
	t.layers, t.masked = pick(list, whole), len(t.cells)-len(whole)
	kept := target{}
	for _, k := range whole {
		kept.cells = append(kept.cells, t.cells[k])
		kept.places.X, kept.places.Y = append(kept.places.X, t.places.X[k]), append(kept.places.Y, t.places.Y[k])
	}
	clear(t.lattice.Mask)
	for _, c := range kept.cells {
		t.lattice.Mask[c] = true
	}
	t.cells, t.places = kept.cells, kept.places
	return nil
}

// beyondData marks the cells whose covariates lie outside of what was observed: one by one, or together by their
// Mahalanobis distance (1936, Proc. Natl. Inst. Sci. India 2:49-55) from the mean of the observations, against the largest of
// theirs. It is nil without numeric layers.
func (r *run) beyondData() []float64 {
	var at, data [][]float64
	for _, c := range r.target.layers {
		if c.Number != nil {
			at, data = append(at, c.Number), append(data, r.obs.table.Column(c.Name).Number)
		}
	}
	if len(at) == 0 {
		return nil
	}
	outside := make([]float64, len(at[0]))
	for j := range at {
		low, high := slices.Min(data[j]), slices.Max(data[j])
		for k, v := range at[j] {
			if v < low || v > high {
				outside[k] = 1
			}
		}
	}
	distance, ok := mahalanobis(data)
	if len(at) < 2 || !ok {
		return outside
	}
	most := 0.0
	for i := range data[0] {
		most = math.Max(most, distance(data, i))
	}
	for k := range outside {
		if distance(at, k) > most*(1+1e-12) {
			outside[k] = 1
		}
	}
	return outside
}

// mahalanobis returns the squared distance of a place's values from the mean of the data; false where these do not spread.
func mahalanobis(data [][]float64) (distance func(at [][]float64, k int) float64, ok bool) {
	p, n := len(data), len(data[0])
	mean := make([]float64, p)
	for j, column := range data {
		for _, v := range column {
			mean[j] += v / float64(n)
		}
	}
	spread := mat.NewSymDense(p, nil)
	for a := range p {
		for b := a; b < p; b++ {
			sum := 0.0
			for i := range n {
				sum += (data[a][i] - mean[a]) * (data[b][i] - mean[b])
			}
			spread.SetSym(a, b, sum/float64(max(1, n-1)))
		}
	}
	var root mat.Cholesky
	if !root.Factorize(spread) {
		return nil, false
	}
	from, solved := mat.NewVecDense(p, nil), mat.NewVecDense(p, nil)
	return func(at [][]float64, k int) float64 {
		for j := range p {
			from.SetVec(j, at[j][k]-mean[j])
		}
		if err := root.SolveVecTo(solved, from); err != nil {
			return math.Inf(1)
		}
		return mat.Dot(from, solved)
	}, true
}

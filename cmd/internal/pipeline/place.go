package pipeline

import (
	"context"
	"errors"
	"path/filepath"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/observe"
	"drumlin/io/vector"
	"drumlin/spatial"

	"github.com/paulmach/orb"
)

// studyArea is the part of the plane that the map shows.
type studyArea struct {
	within     orb.MultiPolygon // nil: the observations' own
	outline    orb.MultiPolygon // for drawing
	knotPlaces spatial.Places   // cover it, for knots in gaps
	problem    error            // why there is none; told after the fit had its say
}

// target is where the surface is predicted: the lattice's cells in the study area, or the user's own places.
type target struct {
	lattice    grids.Lattice // without cells where the user named places
	cells      []int         // of the lattice, ascending
	places     spatial.Places
	covariates []spatial.Covariate
	held       map[string]string // covariates fixed at one value, as told
}

func (t *target) own() bool { return t.cells == nil }

// knotsAcross is the fineness, in cells along the longer side, at which the study area is searched for gaps. It is apart
// from the map's lattice so that errors do not depend on the map's resolution.
const knotsAcross = 60

// place lays the study area and what is predicted onto.
func (r *run) place(context.Context) error {
	r.area = &studyArea{}
	s, at := r.settings, r.obs.data.Places
	var err error
	if s.Within != nil {
		if r.area.within, err = r.polygons(*s.Within); err != nil {
			return err
		}
	}
	r.layKnotPlaces(at)
	if s.At != nil {
		return r.placeAt(*s.At)
	}
	spec := grids.Spec{X: at.X, Y: at.Y, Within: r.area.within, Across: *s.CellsAcross}
	if s.CellSize != nil {
		spec.Cell = *s.CellSize
	}
	l, err := grids.NewLattice(r.obs.system, spec)
	var none *grids.NoAreaError
	if errors.As(err, &none) {
		r.area.problem, r.target = err, &target{}
		return nil
	}
	if err != nil {
		return err
	}
	t := &target{lattice: l}
	t.cells, t.places.X, t.places.Y = l.Centres()
	r.target = t
	return r.holdAll()
}

func (r *run) layKnotPlaces(at spatial.Places) {
	area, err := grids.NewStudyArea(at.X, at.Y, r.area.within)
	if err != nil {
		return // the lattice will say so
	}
	r.area.outline = area.Outline
	l, err := grids.NewLattice(r.obs.system, grids.Spec{X: at.X, Y: at.Y, Within: r.area.within, Across: knotsAcross})
	if err == nil {
		_, r.area.knotPlaces.X, r.area.knotPlaces.Y = l.Centres()
	}
}

// polygons reads polygons into the plane and returns them as one shape.
func (r *run) polygons(path string) (orb.MultiPolygon, error) {
	shapes, err := r.readShapes(path)
	if err != nil {
		return nil, err
	}
	var all orb.MultiPolygon
	for _, f := range shapes.Features {
		all = append(all, f.Shape...)
	}
	return all, nil
}

// readShapes reads polygons and brings them into the plane: they come in the observations' own coordinates or in
// longitude and latitude.
func (r *run) readShapes(path string) (*vector.Shapes, error) {
	f, err := openFile(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	shapes, err := vector.ReadPolygons(f, filepath.Base(path))
	if err != nil {
		return nil, err
	}
	degrees, err := r.inDegrees(shapes)
	if err != nil || !degrees {
		return shapes, err
	}
	for i := range shapes.Features {
		g, err := grids.ProjectGeometry(shapes.Features[i].Shape, r.obs.system)
		if err != nil {
			return nil, refuse("", "%s: feature %d: %w", shapes.Source, i+1, err)
		}
		shapes.Features[i].Shape = g.(orb.MultiPolygon)
	}
	return shapes, nil
}

// inDegrees decides what the coordinates of polygons are, from the file's own word where it has one.
func (r *run) inDegrees(shapes *vector.Shapes) (bool, error) {
	b := shapes.Bound()
	small := b.Min[0] >= -360 && b.Max[0] <= 360 && b.Min[1] >= -90 && b.Max[1] <= 90
	geographic := r.obs.system.Geographic()
	switch {
	case shapes.CRS != "" && crs.IsGeographic(shapes.CRS):
		if !geographic {
			return false, refuse("give polygons in the observations' own coordinates, or say what those are with --crs",
				"%s: the polygons are in longitude and latitude, and the observations in local metres", shapes.Source)
		}
		return true, nil
	case shapes.CRS != "" && sameSystem(shapes.CRS, r.obs.system):
		return false, nil
	case shapes.CRS != "":
		return false, refuse("write them in longitude and latitude, or in the coordinates of the observations",
			"%s: the polygons are in %s, which is not that of the observations (%s)", shapes.Source, shapes.CRS, r.obs.system.Code())
	case !geographic:
		return false, nil
	case small:
		return true, nil
	case r.obs.table.Degrees:
		return false, refuse("write them in longitude and latitude",
			"%s: coordinates up to (%g, %g) are not longitude and latitude, as those of the observations are", shapes.Source, b.Max[0], b.Max[1])
	}
	return false, nil
}

func sameSystem(code string, system crs.System) bool {
	other, err := crs.Parse(code)
	return err == nil && other.Code() == system.Code()
}

// placeAt predicts at the places of a file, row by row.
func (r *run) placeAt(path string) error {
	s := r.settings
	want := observe.Request{Strict: true, Axes: observe.AxesPlane}
	if r.obs.table.Degrees {
		want.Axes = observe.AxesDegrees
	}
	if s.X != nil {
		want.X, want.Y = *s.X, *s.Y
	}
	held := r.heldNames()
	for _, name := range s.Linear {
		if !held[name] {
			want.Linear = append(want.Linear, name)
		}
	}
	for _, name := range s.Category {
		if !held[name] {
			want.Category = append(want.Category, name)
		}
	}
	table, _, err := readTable(path, want)
	if err != nil {
		return err
	}
	x, y, err := planeOf(table, r.obs.system)
	if err != nil {
		return err
	}
	r.target = &target{lattice: grids.Lattice{CRS: r.obs.system}, places: spatial.Places{X: x, Y: y}}
	return r.covariatesAt(table)
}

// planeOf brings a table's places into a plane.
func planeOf(t *observe.Table, system crs.System) (x, y []float64, err error) {
	x, y = t.XY()
	o := observations{table: t, system: system}
	if t.Degrees {
		for i := range x {
			x[i], y[i] = system.Forward(x[i], y[i])
		}
	}
	return x, y, o.onThePlane(x, y)
}

package pipeline

import (
	"context"
	"errors"
	"path/filepath"
	"slices"
	"strings"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/observe"
	"drumlin/io/plan"
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
	layers     []spatial.Covariate // those of them that layers give
	masked     int                 // cells of the study area without a value in some layer
	held       map[string]string   // covariates fixed at one value, as told
	heldNumber map[string]float64
}

func (t *target) own() bool { return t.cells == nil }

// placeOf tells which place each cell of the lattice is, counted from 1; 0 for a cell that is not of the map.
func (t *target) placeOf() []int32 {
	of := make([]int32, t.lattice.Cells())
	for k, c := range t.cells {
		of[c] = int32(k) + 1
	}
	return of
}

// knotsAcross is the fineness, in cells along the longer side, at which the study area is searched for gaps. It is apart
// from the map's lattice so that errors do not depend on the map's resolution.
const knotsAcross = 60

// place lays the study area and what is predicted onto.
func (r *run) place(ctx context.Context) error {
	if err := r.layArea(); err != nil {
		return err
	}
	s := r.settings
	if s.At != nil {
		return r.placeAt(ctx, *s.At)
	}
	spec := r.spec(*s.CellsAcross)
	if s.CellSize != nil {
		spec.Cell = *s.CellSize
	}
	l, err := grids.NewLattice(r.obs.system, spec)
	var none *grids.NoAreaError
	if errors.As(err, &none) && !none.Given {
		r.area.problem = refuse("give the study area with --within, or the places to predict at with --at", "%w", err)
		r.target = &target{}
		return nil
	}
	if err != nil {
		return r.obs.blameZero(err)
	}
	t := &target{lattice: l}
	t.cells, t.places.X, t.places.Y = l.Centres()
	if err := r.layCells(ctx, t); err != nil {
		return err
	}
	t.covariates = slices.Clone(t.layers)
	r.target = t
	return r.holdAll()
}

// blameZero adds to an error of the lattice that rows lie at 0, 0, which stretches the study area.
func (o *observations) blameZero(err error) error {
	rows := o.atZero()
	if len(rows) == 0 {
		return err
	}
	return refuse("take such rows out if their places are missing", "%s: %w; %s at exactly 0, 0, far from all others",
		o.table.Source, err, rowsLie(rows, o.table.Row))
}

// layArea finds the study area, and the places in it where knots may be wanted.
func (r *run) layArea() (err error) {
	r.area = &studyArea{}
	if w := r.settings.Within; w != nil {
		if r.area.within, err = r.polygons(*w); err != nil {
			return err
		}
	}
	if r.area.within == nil {
		r.area.within = r.obs.ownAreas()
	}
	spec := r.spec(knotsAcross)
	area, err := grids.NewStudyArea(spec.X, spec.Y, spec.Within)
	if err != nil {
		return nil // the lattice will say so
	}
	r.area.outline = area.Outline
	if r.settings.Within == nil && r.area.within != nil {
		r.area.outline = grids.OuterEdges(area.Outline)
	}
	l, err := grids.NewLattice(r.obs.system, spec)
	if err == nil {
		_, r.area.knotPlaces.X, r.area.knotPlaces.Y = l.Centres()
	}
	return nil
}

// spec asks for a lattice over the study area. Points along a line are close to one another, however far apart the lines
// are: how far a map reaches beyond them goes by the places of the rows.
func (r *run) spec(across int) grids.Spec {
	at := r.obs.ownPoints()
	spec := grids.Spec{X: at.X, Y: at.Y, Within: r.area.within, Across: across}
	if r.obs.apart > 0 {
		spec.Spacing = r.obs.spacing
	}
	return spec
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
	said := vector.PlainCode(shapes.CRS)
	switch {
	case said != "" && crs.IsGeographic(said):
		if !geographic {
			return false, refuse("give polygons in the observations' own coordinates, or say what those are with --crs",
				"%s: the polygons are in longitude and latitude, and the observations in local metres", shapes.Source)
		}
		return true, nil
	case said != "" && sameSystem(said, r.obs.system):
		return false, nil
	case said != "":
		return false, refuse("write them in longitude and latitude, or in the coordinates of the observations",
			"%s: the polygons are in %s, which is not that of the observations (%s)", shapes.Source, said, r.obs.system.Code())
	case !geographic:
		return false, nil
	case small:
		return true, nil
	case r.obs.table.Degrees:
		return false, refuse("write them in longitude and latitude",
			"%s: coordinates up to (%.10g, %.10g) are not longitude and latitude, as those of the observations are", shapes.Source, b.Max[0], b.Max[1])
	}
	return false, nil
}

func sameSystem(code string, system crs.System) bool {
	other, err := crs.Parse(code)
	return err == nil && other.Code() == system.Code()
}

// placeAt predicts at the places of a file, row by row.
func (r *run) placeAt(ctx context.Context, path string) error {
	s := r.settings
	want := placesRequest(r.obs.table.Degrees)
	want.Format = Format(s)
	if s.X != nil {
		want.X, want.Y = *s.X, *s.Y
	}
	held := r.heldNames()
	if len(s.Layer) > 0 {
		have, err := columnsOf(ctx, path, want.Format)
		if err != nil {
			return err
		}
		for _, l := range s.Layer {
			if !slices.Contains(have, l.Name) {
				held[l.Name] = true // not of the table: a layer gives it
			}
		}
	}
	want.Optional = s.Group
	for _, name := range s.Numbers() {
		if !held[name] {
			want.Linear = append(want.Linear, name)
		}
	}
	for _, name := range s.Categories() {
		if !held[name] {
			want.Category = append(want.Category, name)
		}
	}
	table, err := readPlaceTable(ctx, path, want, r.obs.system)
	if err != nil {
		return err
	}
	x, y, err := planeOf(table, r.obs.system)
	if err != nil {
		return err
	}
	r.target = &target{lattice: grids.Lattice{CRS: r.obs.system}, places: spatial.Places{X: x, Y: y}}
	return r.covariatesAt(ctx, table)
}

// placesRequest asks a table for places in the kind of coordinates that the observations had. Every one of them is to
// get its row in the result, so none is set aside.
func placesRequest(degrees bool) observe.Request {
	if degrees {
		return observe.Request{Strict: true, Axes: observe.AxesDegrees}
	}
	return observe.Request{Strict: true, Axes: observe.AxesPlane}
}

// readPlaceTable reads a table of places. What to do about its faults differs from what to do about those of
// observations: no row can be set aside, and --crs speaks of the observations.
func readPlaceTable(ctx context.Context, path string, want observe.Request, system crs.System) (*observe.Table, error) {
	t, _, err := readTable(ctx, path, want)
	var fault *observe.Error
	if !errors.As(err, &fault) {
		return t, err
	}
	advised := *fault
	switch {
	case fault.Row > 0 && fault.Column != "" && strings.Contains(fault.Advice, "--strict"):
		advised.Advice = "correct the row, or take it out: every place of this table gets its row in the result"
	case strings.Contains(fault.Advice, "--crs"):
		advised.Advice = "give the places as the observations were given: " + inWords(want.Axes, system) + "; --x and --y name the columns"
	}
	return nil, &advised
}

// inWords says what coordinates places come in.
func inWords(axes observe.Axes, system crs.System) string {
	switch {
	case axes == observe.AxesDegrees:
		return "in longitude and latitude"
	case system.Geographic():
		return "in metres of " + system.Code()
	}
	return "in local metres"
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

// Places returns where the rows of a part are, as longitude and latitude if their system is tied to the globe and in
// metres if not, with the number of each row. Of a line or an area it is the middle.
func Places(ctx context.Context, s plan.Settings, p observe.Part) (at [][2]float64, row []int32, geographic bool, err error) {
	t, err := tableOfPlaces(ctx, s, p)
	if err != nil {
		return nil, nil, false, err
	}
	x, y := t.XY()
	var system crs.System = crs.Local{}
	if code := codeOf(t, s); !t.Degrees && code != "" {
		if system, err = crs.Parse(code); err != nil {
			return nil, nil, false, err
		}
	}
	at = make([][2]float64, len(x))
	for i := range x {
		at[i] = [2]float64{x[i], y[i]}
		if system.Geographic() {
			at[i][0], at[i][1] = system.Inverse(x[i], y[i])
		}
	}
	return at, t.Row, t.Degrees || system.Geographic(), nil
}

// tableOfPlaces reads the places of a part and nothing else.
func tableOfPlaces(ctx context.Context, s plan.Settings, p observe.Part) (*observe.Table, error) {
	want := observe.Request{Format: Format(s)}
	locate(&want, s)
	var err error
	if want.Axes, err = Axes(s); err != nil {
		return nil, err
	}
	if s.Places == nil {
		return observe.ReadPart(p, want)
	}
	s.Join, s.Absent = nil, new(plan.AbsentMissing)
	joins, err := openJoins(ctx, s)
	if err != nil {
		return nil, err
	}
	want.Keep = []string{s.Key.Column}
	from := partSource(p)
	own, err := joins.shareOut(want, from, p.Columns(), *s.Key)
	if err != nil {
		return nil, err
	}
	t, err := from.read(ctx, own)
	if err == nil {
		_, err = joins.join(ctx, t, from, want, s.Key.Column)
	}
	return t, err
}

package pipeline

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/spatial"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/wkb"
)

// project puts the rows into the plane: degrees into an equal-area plane around them, a plane as it is. Rows that are
// lines or areas become sets of points.
func (o *observations) project(s plan.Settings) error {
	o.places, o.placeOf, o.data.Places = nil, nil, spatial.Places{}
	o.x, o.y = o.table.XY()
	if err := o.choosePlane(s); err != nil {
		return err
	}
	if o.table.Degrees {
		for i := range o.x {
			o.x[i], o.y[i] = o.system.Forward(o.x[i], o.y[i])
		}
	}
	if err := o.onThePlane(o.x, o.y); err != nil {
		return err
	}
	if s.Key != nil || o.areal() {
		if err := o.findPlaces(s); err != nil {
			return err
		}
	}
	if !o.areal() {
		o.data.Places = spatial.Places{X: o.x, Y: o.y}
		return nil
	}
	return o.layPoints(s)
}

// choosePlane settles the system of coordinates, and says how they were taken.
func (o *observations) choosePlane(s plan.Settings) error {
	whence := fmt.Sprintf("columns %s, %s", o.table.XName, o.table.YName)
	switch {
	case o.thinned.step > 0:
		whence = "centres of cells"
	case o.table.Features:
		whence = "coordinates of the features"
	case o.table.GeometryName != "":
		whence = "column " + o.table.GeometryName
	}
	if o.table.Degrees {
		system, err := crs.AzimuthalAround(o.x[:o.own], o.y[:o.own])
		if err != nil {
			return refuse("", "%s: %w", o.table.Source, err)
		}
		o.system, o.said = system, whence+" taken as longitude and latitude, in an equal-area plane around them"
		return nil
	}
	o.system, o.said = crs.Local{}, whence+" taken as local metres"
	code := codeOf(o.table, s)
	if code == "" {
		return nil
	}
	var err error
	if o.system, err = crs.Parse(code); err != nil {
		if s.CRS != nil {
			return refuse("", "--crs: %w", err)
		}
		return refuse("", "%s: %w", o.table.Source, err)
	}
	if own := o.table.CRS; own != "" && !o.table.Features && !sameSystem(own, o.system) {
		return refuse("leave out --crs, or correct the file", "%s: its geometries say that they are in %s, and --crs says %s", o.table.Source, own, o.system.Code())
	}
	if o.system.Geographic() && inRangeOfDegrees(o.x, o.y) {
		return refuse("leave out --crs for longitude and latitude, or name other columns with --x and --y",
			"%s: %s run from %.6g to %.6g and from %.6g to %.6g, which looks like degrees and not like metres of %s",
			o.table.Source, whence, slices.Min(o.x), slices.Max(o.x), slices.Min(o.y), slices.Max(o.y), o.system.Code())
	}
	if o.system.Geographic() {
		o.said = whence + " taken as " + o.system.Code() + " in metres"
	}
	return nil
}

// codeOf names the system that a table in metres is in: as the settings say, else as the table does; empty for metres of its own.
func codeOf(t *observe.Table, s plan.Settings) string {
	if s.CRS != nil {
		return *s.CRS
	}
	return t.CRS
}

// place is where rows were observed, a point, a line or an area, by its name.
type place struct {
	name  string
	shape orb.Geometry // in the plane
	rows  []int        // the region's own, ascending; none where nobody looked, or only a neighbour did
	first int          // the first row there, own or not; -1 where nobody looked
}

// findPlaces tells the places of the rows apart: by their key where there is one, else by what they are.
func (o *observations) findPlaces(s plan.Settings) error {
	o.placeOf = make([]int32, o.table.Len())
	at := map[string]int32{}
	for i, g := range o.table.Geometry {
		name := o.identity(i, s)
		k, seen := at[name]
		if !seen {
			k = int32(len(o.places))
			at[name] = k
			shape, err := inPlane(o.table, i, o.system)
			if err != nil {
				return err
			}
			o.places = append(o.places, place{name: o.nameOf(i, s), shape: shape, first: i})
		} else if first := o.places[k].first; !orb.Equal(o.table.Geometry[first], g) {
			fault := atRow(o.table, i)
			fault.Column, fault.Value = s.Key.Column, o.places[k].name
			fault.What = fmt.Sprintf("%q lies elsewhere than in row %d", o.places[k].name, o.table.Row[first])
			fault.Advice = "give every place one location, or a key of its own; without --key places are told apart by where they are"
			return fault
		}
		if i < o.own {
			o.places[k].rows = append(o.places[k].rows, i)
		}
		o.placeOf[i] = k
	}
	return nil
}

// identity is what rows at one place have in common. A neighbouring region may use the same keys for places of its own.
func (o *observations) identity(i int, s plan.Settings) string {
	whose := "own "
	if i >= o.own {
		whose = "neighbour "
	}
	if s.Key != nil && o.table.Column(s.Key.Column).Code[i] >= 0 {
		return whose + o.nameOf(i, s)
	}
	return whose + "at " + string(wkb.MustMarshal(o.table.Geometry[i]))
}

// nameOf is what the place of a row is called: its key, or the number of the row.
func (o *observations) nameOf(i int, s plan.Settings) string {
	if s.Key == nil {
		return fmt.Sprintf("row %d", o.table.Row[i])
	}
	c := o.table.Column(s.Key.Column)
	if c.Code[i] < 0 {
		return fmt.Sprintf("row %d", o.table.Row[i])
	}
	return c.Level[c.Code[i]]
}

// inPlane brings the geometry of a table's row into the plane.
func inPlane(t *observe.Table, i int, system crs.System) (orb.Geometry, error) {
	if !t.Degrees {
		return t.Geometry[i], nil
	}
	shape, err := grids.ProjectGeometry(t.Geometry[i], system)
	if err != nil {
		return nil, faultAt(t, i, err)
	}
	return shape, nil
}

// faultAt blames the geometry of a row.
func faultAt(t *observe.Table, i int, err error) error {
	fault := atRow(t, i)
	fault.What, fault.Cause, fault.Advice = err.Error(), err, "correct the geometry, or take the row out"
	var hinted interface{ Hint() string }
	if errors.As(err, &hinted) {
		fault.Advice = hinted.Hint()
	}
	return fault
}

// areal reports whether a row is more than a point.
func (o *observations) areal() bool {
	return slices.ContainsFunc(o.table.Geometry, func(g orb.Geometry) bool {
		_, point := g.(orb.Point)
		return !point
	})
}

// knotsForPoints is the number of knots that the points inside areas are laid for where the data choose how many there
// are: with two points between knots the sums over an area are those of the surface.
const knotsForPoints = 200

// layPoints has points stand for the rows.
func (o *observations) layPoints(s plan.Settings) error {
	knots := knotsForPoints
	if !s.MaxKnots.Auto {
		knots = s.MaxKnots.N
	}
	bound := o.places[0].shape.Bound()
	for _, p := range o.places[1:] {
		bound = bound.Union(p.shape.Bound())
	}
	apart := math.Sqrt((bound.Max[0]-bound.Min[0])*(bound.Max[1]-bound.Min[1])/float64(knots)) / 2
	at := &o.data.Places
	at.Start = make([]int32, 1, len(o.placeOf)+1)
	laid := make([]*grids.Quadrature, len(o.places))
	for i, k := range o.placeOf {
		if laid[k] == nil {
			q, err := grids.QuadratureOf(o.places[k].shape, o.system, apart)
			if err != nil {
				return faultAt(o.table, i, err)
			}
			laid[k] = &q
		}
		at.X, at.Y, at.Share = append(at.X, laid[k].X...), append(at.Y, laid[k].Y...), append(at.Share, laid[k].Share...)
		at.Start = append(at.Start, int32(len(at.X)))
	}
	o.apart = apart
	return nil
}

// addUnseen adds the places where nobody looked. They are predicted, and no row knows of them.
func (o *observations) addUnseen(j *joins) error {
	side := j.placesSide()
	if side == nil {
		return nil
	}
	unseen := map[string]bool{}
	for _, name := range j.unseen(o.joined) {
		unseen[name] = true
	}
	c := side.table.Column(side.key)
	for i, code := range c.Code {
		if code < 0 || !unseen[c.Level[code]] {
			continue
		}
		shape, err := inPlane(side.table, i, o.system)
		if err != nil {
			return err
		}
		o.places = append(o.places, place{name: c.Level[code], shape: shape, first: -1})
	}
	return nil
}

// points are the points of all rows, each for itself.
func (o *observations) points() spatial.Places {
	return spatial.Places{X: o.data.Places.X, Y: o.data.Places.Y}
}

// ownPoints are those of the rows that are reported.
func (o *observations) ownPoints() spatial.Places {
	n := o.own
	if start := o.data.Places.Start; start != nil {
		n = int(start[o.own])
	}
	return spatial.Places{X: o.data.Places.X[:n], Y: o.data.Places.Y[:n]}
}

// ownPlaces is a place for each row that is reported: of an area or a line, its middle.
func (o *observations) ownPlaces() spatial.Places {
	return spatial.Places{X: o.x[:o.own], Y: o.y[:o.own]}
}

// ownAreas are the areas of the rows that are reported, as one shape; nil where one of them is something else.
func (o *observations) ownAreas() orb.MultiPolygon {
	var all orb.MultiPolygon
	for _, p := range o.places {
		if p.first >= o.own {
			continue
		}
		switch g := p.shape.(type) {
		case orb.Polygon:
			all = append(all, g)
		case orb.MultiPolygon:
			all = append(all, g...)
		default:
			return nil
		}
	}
	return all
}

// inRangeOfDegrees reports whether all coordinates could be degrees. In a national or world-wide plane that would be one
// spot of some hundred metres at its origin, where nobody is.
func inRangeOfDegrees(x, y []float64) bool {
	for i := range x {
		if math.Abs(x[i]) > 360 || math.Abs(y[i]) > 90 {
			return false
		}
	}
	return true
}

// onThePlane refuses coordinates where the projection is not defined: they are in another system than was said.
func (o *observations) onThePlane(x, y []float64) error {
	for i := range x {
		if scale := o.system.AreaScale(x[i], y[i]); math.IsNaN(x[i]) || math.IsNaN(scale) {
			p := o.table.Geometry[i].Bound().Min
			fault := atRow(o.table, i)
			fault.What = fmt.Sprintf("the place (%g, %g) lies outside of %s", p[0], p[1], o.system.Code())
			fault.Advice = "say what the coordinates are with --crs, or name their columns with --x and --y"
			return fault
		}
	}
	return nil
}

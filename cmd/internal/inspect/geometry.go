package inspect

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"drumlin/io/observe"
	"drumlin/io/plan"
)

// form is what a geometry is for a map.
type form string

const (
	points form = "points"
	groups form = "groups of points"
	lines  form = "lines"
	areas  form = "areas"
)

// kinds are the kinds of geometries as GeoJSON names them, and what they are.
var kinds = map[string]struct {
	one, several string
	form         form
}{
	"Point": {"point", "points", points}, "MultiPoint": {"multipoint", "multipoints", groups},
	"LineString": {"line", "lines", lines}, "MultiLineString": {"multiline", "multilines", lines},
	"Polygon": {"polygon", "polygons", areas}, "MultiPolygon": {"multipolygon", "multipolygons", areas},
}

// geometries says where the rows of a table are that have geometries.
func (e *examiner) geometries() {
	s := e.survey
	e.report.Geometry = describeGeometry(s)
	if !s.Features {
		e.located = []string{s.GeometryName}
	}
	e.howFoundGeometry()
	e.kinds()
	e.unreadable()
	e.heights()
	if others := e.otherCoordinates(); len(others) > 0 {
		e.find(Clear, "coordinates", fmt.Sprintf("%s are coordinates by their names; the geometries are taken in their place", listed(others)), others...)
	}
	if len(s.Places.Rows) == 0 {
		e.find(Look, "no-places", "no geometry can be used, so it is not told where any row is", e.located...)
		return
	}
	all := e.extentOfShapes()
	c := e.placed(all)
	c.Found = e.foundGeometry()
	e.systemOfShapes(all, c)
	e.mixedSystems()
	e.spread(axisAlong(all.x.name, s.Places.X), axisAlong(all.y.name, s.Places.Y))
}

func describeGeometry(s *observe.Survey) *Geometry {
	g := &Geometry{Kinds: []GeometryKind{}, Positions: s.Shapes.Positions, Heights: s.Shapes.Heights, Missing: s.Shapes.Missing,
		Unreadable: s.Shapes.Bad, FirstBadRow: s.Shapes.Row, Reason: s.Shapes.Reason, CRS: s.CRS}
	if !s.Features {
		g.Column = s.GeometryName
	}
	for _, k := range s.Shapes.Kinds {
		g.Kinds = append(g.Kinds, GeometryKind{k.Kind, k.Rows})
	}
	return g
}

// foundGeometry says by what the geometries were found.
func (e *examiner) foundGeometry() string {
	switch {
	case e.survey.Features:
		return "features"
	case e.survey.Guessed:
		return "guessed"
	}
	return "named"
}

func (e *examiner) howFoundGeometry() {
	s := e.survey
	if !s.Guessed {
		return
	}
	e.find(Look, "geometry-guessed", fmt.Sprintf("%s; %s has geometries, which are likely the places", plainly(s.Unrecognised), s.GeometryName), s.GeometryName)
	e.undecided(fmt.Sprintf("whether the geometries of %s are where the rows were observed", s.GeometryName))
}

// kinds says what the geometries are.
func (e *examiner) kinds() {
	s := e.survey
	if len(s.Shapes.Kinds) == 0 {
		return
	}
	owner := "the features have "
	if !s.Features {
		owner = s.GeometryName + " has "
	}
	sentence := owner + kindsOf(s.Shapes)
	if e.spanning() {
		sentence += fmt.Sprintf(", with %d positions in all", s.Shapes.Positions)
	}
	e.find(Clear, "geometries", sentence, e.located...)
	var names []string
	for _, f := range e.forms() {
		names = append(names, string(f))
	}
	if len(names) > 1 {
		e.find(Look, "mixed-geometries", listed(names)+" are mixed, which may be a mistake; map would take each for what it is", e.located...)
	}
}

// kindsOf counts geometries by their kinds, in words.
func kindsOf(s *observe.SurveyShapes) string {
	var list []string
	for _, k := range s.Kinds {
		list = append(list, countOf(k.Rows, kinds[k.Kind].one, kinds[k.Kind].several))
	}
	return listed(list)
}

// forms are what the rows are for a map, points first; nothing without geometries.
func (e *examiner) forms() (list []form) {
	if e.survey.Shapes == nil {
		return nil
	}
	for _, k := range e.survey.Shapes.Kinds {
		if f := kinds[k.Kind].form; !slices.Contains(list, f) {
			list = append(list, f)
		}
	}
	return list
}

// spanning reports whether some rows are more than one point each.
func (e *examiner) spanning() bool {
	return slices.ContainsFunc(e.forms(), func(f form) bool { return f != points })
}

// onlyAreas reports whether all rows are areas.
func (e *examiner) onlyAreas() bool { return slices.Equal(e.forms(), []form{areas}) }

// unreadable says which rows have no geometry, and why.
func (e *examiner) unreadable() {
	s, p := e.survey.Shapes, e.survey.Places
	of, set := "", "such rows"
	if !e.survey.Features {
		of = " of " + e.survey.GeometryName
	}
	if s.Bad > 0 {
		first := ", the first"
		if s.Bad == 1 {
			first, set = ",", "the row"
		}
		e.find(Look, "unreadable-geometries", fmt.Sprintf("%s%s cannot be read%s in row %d (line %d): %s; map would set %s aside",
			countOf(s.Bad, "geometry", "geometries"), of, first, s.Row, s.Line, strings.TrimPrefix(s.Reason, "geometry cannot be read: "), set), e.located...)
	}
	if s.Missing > 0 {
		where, set := "", "such rows"
		if s.Bad == 0 || p.Row < s.Row {
			where = fmt.Sprintf(", the first being row %d", p.Row)
		}
		if s.Missing == 1 {
			where, set = strings.Replace(where, "the first being ", "", 1), "it"
		}
		e.find(Look, "missing-geometries", fmt.Sprintf("%s no geometry%s; map would set %s aside", rowsHave(s.Missing), where, set), e.located...)
	}
}

// heightColumn is what a map knows the third coordinate of points by.
const heightColumn = "z"

// heights says what the third coordinates are good for. Where another column has the name they cannot be asked for.
func (e *examiner) heights() {
	n := e.survey.Shapes.Heights
	if n == 0 {
		return
	}
	sentence := countOf(n, "point has a third coordinate", "points have a third coordinate")
	switch z := e.survey.Column(heightColumn); {
	case z == nil, e.survey.Features && z.Values == n:
		e.role[heightColumn] = coordinate
		sentence += ", which map has as the column z, such as for --linear z"
	default:
		sentence += ", which the column z hides: it is another"
	}
	e.find(Clear, "heights", sentence, e.located...)
}

// extentOfShapes is what all positions lie in. Middles of lines and areas have fractions whatever their corners have.
func (e *examiner) extentOfShapes() extent {
	s := e.survey
	names := [2]string{"x", "y"}
	if s.Degrees {
		names = [2]string{"longitude", "latitude"}
	}
	var at [2]axis
	for i, places := range [][]float64{s.Places.X, s.Places.Y} {
		least, most := s.Shapes.Least[i], s.Shapes.Most[i]
		at[i] = axis{name: names[i], least: least, most: most, fractions: least != math.Trunc(least) || most != math.Trunc(most)}
		if !e.spanning() {
			at[i].fractions = axisAlong("", places).fractions
		}
	}
	return extent{at[0], at[1]}
}

// mixedSystems looks for geometries that are in another system than the first.
func (e *examiner) mixedSystems() {
	s := e.survey.Shapes
	if s.Others == 0 {
		return
	}
	e.find(Look, "mixed-systems", fmt.Sprintf("%s another SRID than the first, or none, such as row %d; map takes one reference system, and refuses others",
		countOf(s.Others, "geometry has", "geometries have"), s.OtherRow), e.located...)
	e.before("the geometries are in several reference systems: bring them into one")
}

// geometryColumns are the columns that have geometries.
func (e *examiner) geometryColumns() (list []string) {
	for i := range e.survey.Columns {
		if c := &e.survey.Columns[i]; c.Kind == observe.Geometries && c.Name != "" {
			list = append(list, c.Name)
		}
	}
	return list
}

// geometriesBeside says that geometries could tell the places instead of the coordinate columns.
func (e *examiner) geometriesBeside(c *Coordinates) {
	level := Clear
	if c.Found == "guessed" {
		level = Look
	}
	for _, name := range e.geometryColumns() {
		s := e.survey.Column(name).Shapes
		if len(s.Kinds) > 0 {
			e.find(level, "geometry-column", fmt.Sprintf("%s has %s, which --geometry %s would take for the places instead of %s and %s", name, kindsOf(s), name, c.X, c.Y), name)
		}
	}
}

// spans says how rows enter that are more than a point, and what is told of them.
func (e *examiner) spans(s plan.Settings) string {
	var ways []string
	for _, f := range e.forms() {
		switch f {
		case groups:
			ways = append(ways, "each group of points by all of them")
		case lines:
			ways = append(ways, "each line by points along it")
		case areas:
			ways = append(ways, "each area by points inside it")
		}
	}
	named := "by the number of its row"
	if s.Key != nil {
		named = "by " + s.Key.Column
	}
	return fmt.Sprintf("%s; places.csv and places.png set what was observed on each beside what the map says, each named %s", listed(ways), named)
}

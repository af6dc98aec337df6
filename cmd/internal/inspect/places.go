package inspect

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/observe"
)

// fewPlaces is the number of distinct places below which hardly any surface can be told from noise (common practice, no
// source).
const fewPlaces = 10

// places says where the rows are.
func (e *examiner) places() {
	switch s := e.survey; {
	case s.Shapes != nil:
		e.geometries()
	case s.XName == "":
		e.noPlaces()
	default:
		e.coordinates()
	}
	for i := range e.survey.Columns {
		if c := &e.survey.Columns[i]; c.Kind == observe.Geometries {
			e.role[c.Name] = coordinate
		}
	}
}

// noPlaces says that nothing tells where the rows are.
func (e *examiner) noPlaces() {
	advice := "; name them with --x and --y"
	if list := e.geometryColumns(); len(list) > 0 {
		advice = fmt.Sprintf("; %s have geometries: name one of them with --geometry", listed(list))
	}
	e.find(Look, "no-coordinates", plainly(e.survey.Unrecognised)+advice)
}

// coordinates says where the rows of a table with coordinate columns are.
func (e *examiner) coordinates() {
	s := e.survey
	x, y := axisOf(s.Column(s.XName)), axisOf(s.Column(s.YName))
	e.role[x.name], e.role[y.name] = coordinate, coordinate
	e.located = []string{x.name, y.name}
	if len(s.Places.Rows) == 0 {
		e.find(Look, "no-places", fmt.Sprintf("no row has a number both in %s and in %s; name other columns with --x and --y", x.name, y.name), e.located...)
		return
	}
	c := e.placed(extent{x, y})
	c.X, c.Y, c.Found = x.name, y.name, "named"
	e.howFound(c)
	e.system(extent{x, y}, c)
	e.spread(x, y)
	e.geometriesBeside(c)
}

// placed begins the report on places that are known.
func (e *examiner) placed(all extent) *Coordinates {
	p := e.survey.Places
	c := &Coordinates{Taken: "plane", Least: [2]float64{all.x.least, all.y.least}, Most: [2]float64{all.x.most, all.y.most},
		Places: len(p.Rows), MorePlaces: p.Beyond > 0, Without: p.Without, Sharing: sharing(p)}
	if e.survey.Degrees {
		c.Taken = "degrees"
	}
	e.report.Coordinates = c
	return c
}

// spread says how the places lie, by their coordinates along both axes.
func (e *examiner) spread(x, y axis) {
	c := e.report.Coordinates
	c.Spacing = figure(spacing(e.survey))
	e.layout(c)
	e.heaps(c)
	e.farOff(x)
	e.farOff(y)
}

// plainly is what is wrong, without the name of the file.
func plainly(err error) string {
	if placed, ok := errors.AsType[*observe.Error](err); ok {
		return placed.What
	}
	return err.Error()
}

// howFound says by which rule the coordinate columns were found.
func (e *examiner) howFound(c *Coordinates) {
	s := e.survey
	both := c.X + " and " + c.Y
	switch {
	case s.Recognised:
		c.Found = "by name"
		sentence := both + " are the coordinates by their names"
		if len(s.PassedOver) > 0 {
			sentence += "; " + strings.Join(s.PassedOver, " and ") + " are passed over"
		}
		e.find(Clear, "coordinates", sentence, c.X, c.Y)
	case s.Guessed:
		c.Found = "guessed"
		e.find(Look, "coordinates-guessed", fmt.Sprintf("%s; %s are a guess by their names", plainly(s.Unrecognised), both), c.X, c.Y)
		e.undecided(fmt.Sprintf("whether %s are the coordinates", both))
	default:
		e.find(Clear, "coordinates", both+" are the coordinates, as named", c.X, c.Y)
	}
	e.otherCoordinates()
}

// otherCoordinates takes numbers that are named as coordinates for those of another system, or of the same places once
// more, and returns their names.
func (e *examiner) otherCoordinates() (list []string) {
	for _, pair := range pairsOfNames(names(e.survey)) {
		for _, name := range pair {
			e.role[name] = coordinate
			if !slices.Contains(list, name) {
				list = append(list, name)
			}
		}
	}
	return list
}

func names(s *observe.Survey) (list []string) {
	for i := range s.Columns {
		if numeric(&s.Columns[i]) {
			list = append(list, s.Columns[i].Name)
		}
	}
	return list
}

// sharing counts the rows at places where another row is too.
func sharing(p observe.SurveyPlaces) (rows int) {
	for _, n := range p.Rows {
		if n > 1 {
			rows += n
		}
	}
	return rows
}

// spacing is the median distance from a place to the next, in metres where the places are degrees.
func spacing(s *observe.Survey) float64 {
	x, y := s.Places.X, s.Places.Y
	if !s.Degrees {
		return grids.MedianSpacing(x, y)
	}
	system, err := crs.AzimuthalAround(x, y)
	if err != nil {
		return math.NaN()
	}
	east, north := make([]float64, len(x)), make([]float64, len(x))
	for i := range x {
		east[i], north[i] = system.Forward(x[i], y[i])
	}
	return grids.MedianSpacing(east, north)
}

// layout says how the places lie.
func (e *examiner) layout(c *Coordinates) {
	places := countOf(c.Places, "distinct place", "distinct places")
	if c.MorePlaces {
		places = "more than " + places
	}
	if c.Spacing != nil {
		unit := ""
		if c.Taken == "degrees" {
			unit = " m"
		}
		places += ", each about " + short(round(3, *c.Spacing)) + unit + " from the next (median)"
	}
	if c.Sharing > 0 {
		places += fmt.Sprintf("; %d rows share theirs with another, which repeated visits may and copies must not", c.Sharing)
	}
	level := Clear
	if c.Places < fewPlaces {
		level = Look
		places += "; too few for a surface that can be told from noise"
	}
	e.find(level, "places", places, e.located...)
	if c.Without > 0 && e.survey.Shapes == nil {
		e.find(Look, "missing-coordinates", fmt.Sprintf("%s no place; the first is row %d", rowsHave(c.Without), e.survey.Places.Row), e.located...)
	}
}

// heaps looks for rows at 0, 0 and for a place with many more rows than others.
func (e *examiner) heaps(c *Coordinates) {
	p := e.survey.Places
	origin, most := -1, 0
	counts := slices.Clone(p.Rows)
	slices.Sort(counts)
	left, right, low, high := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
	for i, n := range p.Rows {
		if n > p.Rows[most] {
			most = i
		}
		if p.X[i] == 0 && p.Y[i] == 0 {
			origin = i
			continue
		}
		left, right, low, high = min(left, p.X[i]), max(right, p.X[i]), min(low, p.Y[i]), max(high, p.Y[i])
	}
	if origin >= 0 {
		gapX, gapY := max(left, -right), max(low, -high) // above 0 where 0 lies outside of the others
		apart := gapX > (right-left)/2 || gapY > (high-low)/2
		if apart || c.Taken == "degrees" || p.Rows[origin] > 2 {
			e.atZero = true
			e.find(Look, "zero-place", fmt.Sprintf("%s at exactly 0, 0, which is likely a missing place", rowsStand(p.Rows[origin])), e.located...)
		}
	}
	usual := counts[len(counts)/2]
	if most != origin && p.Rows[most] >= 10 && p.Rows[most] > 10*usual {
		e.find(Look, "heap", fmt.Sprintf("%s at the one place %s, %s, and %d at most places", rowsStand(p.Rows[most]), short(p.X[most]), short(p.Y[most]), usual), e.located...)
	}
}

// farOff looks for coordinates that lie many times the width of the others away.
func (e *examiner) farOff(a axis) {
	width := a.high - a.low
	if a.numbers < 20 || width <= 0 {
		return
	}
	for _, v := range []float64{a.least, a.most} {
		if math.Abs(v-a.median) > 10*width && !(v == 0 && e.atZero) {
			e.find(Look, "far-off", fmt.Sprintf("%s %s lies far from all others, of which nine in ten are between %s and %s", a.name, short(v), short(a.low), short(a.high)), e.columnsOf(a)...)
		}
	}
}

// columnsOf are the columns that an axis is read from.
func (e *examiner) columnsOf(a axis) []string {
	if e.survey.Shapes != nil {
		return e.located
	}
	return []string{a.name}
}

// repeated says which rows repeat another whole.
func (e *examiner) repeated() {
	r := e.survey.Repeated
	if r.Rows == 0 {
		e.find(Clear, "repeated-rows", "no row repeats another")
		return
	}
	e.find(Look, "repeated-rows", fmt.Sprintf("%s another in every column, such as row %d that of row %d; copies make a map surer than it should be",
		countOf(r.Rows, "row repeats", "rows repeat"), r.Row, r.Original))
}

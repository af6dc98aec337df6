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
	s := e.survey
	if s.XName == "" {
		e.find(Look, "no-coordinates", plainly(s.Unrecognised)+"; name them with --x and --y")
		return
	}
	x, y := s.Column(s.XName), s.Column(s.YName)
	e.role[x.Name], e.role[y.Name] = coordinate, coordinate
	if len(s.Places.Rows) == 0 {
		e.find(Look, "no-places", fmt.Sprintf("no row has a number both in %s and in %s; name other columns with --x and --y", x.Name, y.Name), x.Name, y.Name)
		return
	}
	c := &Coordinates{X: x.Name, Y: y.Name, Found: "named", Taken: "plane", Least: [2]float64{x.Least, y.Least}, Most: [2]float64{x.Most, y.Most},
		Places: len(s.Places.Rows), MorePlaces: s.Places.Beyond > 0, Without: s.Places.Without, Sharing: sharing(s.Places)}
	e.report.Coordinates = c
	if s.Degrees {
		c.Taken = "degrees"
	}
	e.howFound(c)
	e.system(x, y, c)
	c.Spacing = figure(spacing(s))
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
	for _, pair := range pairsOfNames(names(s)) {
		for _, name := range pair {
			e.role[name] = coordinate // of another system, or of the same places once more
		}
	}
}

func names(s *observe.Survey) (list []string) {
	for i := range s.Columns {
		if numeric(&s.Columns[i]) {
			list = append(list, s.Columns[i].Name)
		}
	}
	return list
}

// within reports whether all numbers of a column lie in a range.
func within(c *observe.SurveyColumn, least, most float64) bool {
	return c.Least >= least && c.Most <= most
}

// The ranges in metres that coordinates of a UTM zone stay within, from memory.
const leastEasting, mostEasting, mostNorthing = 1e5, 9e5, 1e7

// system says what the coordinates seem to be.
func (e *examiner) system(x, y *observe.SurveyColumn, c *Coordinates) {
	both := []string{x.Name, y.Name}
	ranges := fmt.Sprintf("%s from %s to %s, %s from %s to %s", x.Name, short(x.Least), short(x.Most), y.Name, short(y.Least), short(y.Most))
	degrees := within(x, -360, 360) && within(y, -90, 90)
	degreesSwapped := within(y, -360, 360) && within(x, -90, 90)
	fractions := x.Whole < x.Numbers && y.Whole < y.Numbers
	unit, otherUnit := unitOfLength(x.Name)
	free := e.said.CRS == nil
	switch {
	case e.survey.Degrees && degrees:
		c.Likely = "longitude and latitude in degrees"
		e.find(Clear, "system", ranges+": degrees; the datum is not told, and WGS 84 is taken", both...)
	case e.survey.Degrees && degreesSwapped:
		c.Likely = "latitude and longitude in degrees, swapped"
		e.swapped = free
		e.find(Look, "swapped-axes", fmt.Sprintf("%s: latitudes end at 90, and %s goes beyond; the axes are likely swapped", ranges, y.Name), both...)
	case e.survey.Degrees:
		c.Likely = "no degrees"
		e.find(Look, "no-degrees", ranges+": these are no degrees; say what they are with --crs, or name other columns with --x and --y", both...)
	case !free:
		c.Likely = *e.said.CRS
		e.find(Clear, "system", ranges+": taken as "+*e.said.CRS+", as said", both...)
	case otherUnit:
		c.Likely = unit
		e.find(Look, "unit", fmt.Sprintf("%s: %s by their names, and coordinates in a plane are taken for metres", ranges, unit), both...)
	case degrees && fractions:
		c.Likely = "degrees"
		e.crs = "EPSG:4326"
		e.find(Look, "system", ranges+": likely degrees, which are taken for metres unless --crs EPSG:4326 says what they are", both...)
		e.undecided("whether the coordinates are degrees or metres")
	case degreesSwapped && fractions:
		c.Likely = "degrees, swapped"
		e.crs, e.swapped = "EPSG:4326", true
		e.find(Look, "swapped-axes", fmt.Sprintf("%s: these would fit degrees with the axes swapped; say --x %s --y %s --crs EPSG:4326 if they are", ranges, y.Name, x.Name), both...)
		e.undecided("whether the coordinates are degrees or metres")
	case within(x, leastEasting, mostEasting) && within(y, 0, mostNorthing):
		c.Likely = "metres of a plane such as a UTM zone or a national grid"
		e.find(Clear, "system", ranges+": likely metres of a UTM zone or a national grid; the numbers do not tell which, and without --crs they are local metres", both...)
	case within(y, leastEasting, mostEasting) && within(x, mostEasting, mostNorthing):
		c.Likely = "metres of a plane, swapped"
		e.swapped = true
		e.find(Look, "swapped-axes", ranges+": these would fit a UTM zone with the axes swapped", both...)
	default:
		c.Likely = "an unknown plane"
		e.find(Clear, "system", ranges+": an unknown plane; without --crs they are local metres", both...)
	}
}

// unitOfLength is the unit at the end of a name, where it is not metres.
func unitOfLength(name string) (string, bool) {
	list := parts(name)
	if len(list) < 2 {
		return "", false
	}
	unit, other := lengthUnits[list[len(list)-1]]
	return unit, other
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
	e.find(level, "places", places, c.X, c.Y)
	if c.Without > 0 {
		e.find(Look, "missing-coordinates", fmt.Sprintf("%s no place; the first is row %d", rowsHave(c.Without), e.survey.Places.Row), c.X, c.Y)
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
			e.find(Look, "zero-place", fmt.Sprintf("%s at exactly 0, 0, which is likely a missing place", rowsStand(p.Rows[origin])), c.X, c.Y)
		}
	}
	usual := counts[len(counts)/2]
	if most != origin && p.Rows[most] >= 10 && p.Rows[most] > 10*usual {
		e.find(Look, "heap", fmt.Sprintf("%s at the one place %s, %s, and %d at most places", rowsStand(p.Rows[most]), short(p.X[most]), short(p.Y[most]), usual), c.X, c.Y)
	}
}

// farOff looks for coordinates that lie many times the width of the others away.
func (e *examiner) farOff(c *observe.SurveyColumn) {
	width := c.High - c.Low
	if c.Numbers < 20 || width <= 0 {
		return
	}
	for _, v := range []float64{c.Least, c.Most} {
		if math.Abs(v-c.Median) > 10*width && !(v == 0 && e.atZero) {
			e.find(Look, "far-off", fmt.Sprintf("%s %s lies far from all others, of which nine in ten are between %s and %s", c.Name, short(v), short(c.Low), short(c.High)), c.Name)
		}
	}
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

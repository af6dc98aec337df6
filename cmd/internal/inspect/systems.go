package inspect

import (
	"fmt"
	"math"
	"slices"

	"drumlin/grids/crs"
	"drumlin/io/observe"
)

// axis is one coordinate of all places.
type axis struct {
	name                           string
	numbers                        int
	fractions                      bool // not all numbers are whole
	least, low, median, high, most float64
}

// axisOf is the coordinate that a column holds.
func axisOf(c *observe.SurveyColumn) axis {
	return axis{c.Name, c.Numbers, c.Whole < c.Numbers, c.Least, c.Low, c.Median, c.High, c.Most}
}

// axisAlong is one coordinate of places that are not read from a column.
func axisAlong(name string, at []float64) axis {
	sorted := slices.Sorted(slices.Values(at))
	part := func(share float64) float64 { return sorted[int(share*float64(len(sorted)-1))] }
	fractions := slices.ContainsFunc(at, func(v float64) bool { return v != math.Trunc(v) })
	return axis{name, len(at), fractions, part(0), part(0.05), part(0.5), part(0.95), part(1)}
}

// within reports whether all numbers lie in a range.
func (a axis) within(least, most float64) bool { return a.least >= least && a.most <= most }

// extent is what all coordinates lie in.
type extent struct{ x, y axis }

func (t extent) String() string {
	return fmt.Sprintf("%s from %s to %s, %s from %s to %s", t.x.name, short(t.x.least), short(t.x.most), t.y.name, short(t.y.least), short(t.y.most))
}

// degrees reports whether the coordinates can be longitude and latitude, as they are or the other way round.
func (t extent) degrees() bool        { return t.x.within(-360, 360) && t.y.within(-90, 90) }
func (t extent) degreesSwapped() bool { return extent{t.y, t.x}.degrees() }

// fractions reports whether there are fractions along both axes, which rows and columns of a field have not.
func (t extent) fractions() bool { return t.x.fractions && t.y.fractions }

// The ranges in metres that coordinates of a UTM zone stay within, from memory.
const leastEasting, mostEasting, mostNorthing = 1e5, 9e5, 1e7

// utm reports whether the coordinates can be metres of a UTM zone, and utmSwapped whether they can only be so the other
// way round.
func (t extent) utm() bool {
	return t.x.within(leastEasting, mostEasting) && t.y.within(0, mostNorthing)
}

func (t extent) utmSwapped() bool {
	return t.y.within(leastEasting, mostEasting) && t.x.within(mostEasting, mostNorthing)
}

// system says what the coordinates of columns seem to be.
func (e *examiner) system(all extent, c *Coordinates) {
	x, y := all.x.name, all.y.name
	ranges := all.String()
	unit, otherUnit := unitOfLength(x)
	free := e.said.CRS == nil
	switch {
	case e.survey.Degrees && all.degrees():
		c.Likely = "longitude and latitude in degrees"
		e.find(Clear, "system", ranges+": degrees; the datum is not told, and WGS 84 is taken", x, y)
	case e.survey.Degrees && all.degreesSwapped():
		c.Likely = "latitude and longitude in degrees, swapped"
		e.swapped = free
		e.find(Look, "swapped-axes", fmt.Sprintf("%s: latitudes end at 90, and %s goes beyond; the axes are likely swapped", ranges, y), x, y)
	case e.survey.Degrees:
		c.Likely = "no degrees"
		e.find(Look, "no-degrees", ranges+": these are no degrees; say what they are with --crs, or name other columns with --x and --y", x, y)
	case !free:
		e.systemAsSaid(ranges, c)
	case otherUnit:
		c.Likely = unit
		e.find(Look, "unit", fmt.Sprintf("%s: %s by their names, and coordinates in a plane are taken for metres", ranges, unit), x, y)
	case all.degrees() && all.fractions():
		e.likelyDegrees(ranges, c)
	case all.degreesSwapped() && all.fractions():
		c.Likely = "degrees, swapped"
		e.crs, e.swapped = "EPSG:4326", true
		e.find(Look, "swapped-axes", fmt.Sprintf("%s: these would fit degrees with the axes swapped; say --x %s --y %s --crs EPSG:4326 if they are", ranges, y, x), x, y)
		e.undecided("whether the coordinates are degrees or metres")
	case !all.utm() && all.utmSwapped():
		c.Likely = "metres of a plane, swapped"
		e.swapped = true
		e.find(Look, "swapped-axes", ranges+": these would fit a UTM zone with the axes swapped", x, y)
	default:
		e.plane(all, c)
	}
}

func (e *examiner) systemAsSaid(ranges string, c *Coordinates) {
	c.Likely = *e.said.CRS
	e.find(Clear, "system", ranges+": taken as "+*e.said.CRS+", as said", e.located...)
}

// likelyDegrees is for coordinates that nothing calls degrees.
func (e *examiner) likelyDegrees(ranges string, c *Coordinates) {
	c.Likely = "degrees"
	e.crs = "EPSG:4326"
	e.find(Look, "system", ranges+": likely degrees, which are taken for metres unless --crs EPSG:4326 says what they are", e.located...)
	e.undecided("whether the coordinates are degrees or metres")
}

// plane is for coordinates of which nothing is known.
func (e *examiner) plane(all extent, c *Coordinates) {
	if all.utm() {
		c.Likely = "metres of a plane such as a UTM zone or a national grid"
		e.find(Clear, "system", all.String()+": likely metres of a UTM zone or a national grid; the numbers do not tell which, and without --crs they are local metres", e.located...)
		return
	}
	c.Likely = "an unknown plane"
	e.find(Clear, "system", all.String()+": an unknown plane; without --crs they are local metres", e.located...)
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

// systemOfShapes says what the coordinates of geometries seem to be. They cannot be swapped by a flag.
func (e *examiner) systemOfShapes(all extent, c *Coordinates) {
	s := e.survey
	ranges := all.String()
	switch {
	case s.Features && s.Unrecognised != nil:
		e.foreignSystem(all, c)
	case s.Degrees && all.degrees():
		c.Likely = "longitude and latitude in degrees"
		e.find(Clear, "system", ranges+": degrees by "+e.whyDegrees(), e.located...)
	case s.Degrees:
		e.noDegrees(all, c)
	case e.said.CRS != nil:
		e.systemAsSaid(ranges, c)
		e.contradiction(c)
	case s.CRS != "":
		e.systemBySRID(all, c)
	case all.degrees() && all.fractions():
		e.likelyDegrees(ranges, c)
	case all.degreesSwapped() && all.fractions():
		c.Likely = "degrees, swapped"
		e.find(Look, "swapped-axes", ranges+": these would fit degrees with latitude before longitude; if they are, put longitude first and say --crs EPSG:4326", e.located...)
		e.undecided("whether the coordinates are degrees or metres")
	case !all.utm() && all.utmSwapped():
		c.Likely = "metres of a plane, swapped"
		e.find(Look, "swapped-axes", ranges+": these would fit a UTM zone with northing before easting", e.located...)
	default:
		e.plane(all, c)
	}
}

// noDegrees is for geometries that are taken for degrees and cannot all be.
func (e *examiner) noDegrees(all extent, c *Coordinates) {
	usual := axisAlong("", e.survey.Places.Y)
	switch {
	case extent{all.x, axis{least: usual.low, most: usual.high}}.degrees():
		c.Likely = "longitude and latitude in degrees"
		e.find(Look, "no-degrees", all.String()+": degrees end at 360 and 90, and a few of these go beyond", e.located...)
		e.before("a few positions are no longitude and latitude: correct them")
	case all.degreesSwapped():
		c.Likely = "latitude and longitude in degrees, swapped"
		e.find(Look, "swapped-axes", all.String()+": latitudes end at 90, and these go beyond; latitude likely stands before longitude", e.located...)
		e.before("latitude likely stands before longitude: put longitude first in every geometry")
	default:
		c.Likely = "no degrees"
		e.find(Look, "no-degrees", all.String()+": these are no degrees, and should be by "+e.whyDegrees(), e.located...)
		if e.survey.Features {
			e.before("what the coordinates are in is not told: say it with --crs")
		} else {
			e.before("the geometries are not in their reference system: correct it")
		}
	}
}

// whyDegrees says by what geometries are taken for degrees.
func (e *examiner) whyDegrees() string {
	switch s := e.survey; {
	case e.said.CRS != nil:
		return "--crs " + *e.said.CRS
	case !s.Features:
		return "their SRID, " + s.CRS
	case s.CRS != "":
		return "the file's own word, " + s.CRS
	}
	return "the rule of GeoJSON (RFC 7946)"
}

// before tells what has to be put right before a map can be had.
func (e *examiner) before(advice string) { e.first = append(e.first, advice) }

// foreignSystem is for GeoJSON that names a system which GeoJSON does not have.
func (e *examiner) foreignSystem(all extent, c *Coordinates) {
	code := e.survey.CRS
	says := fmt.Sprintf("%s: the file says that they are in %q, and GeoJSON is in longitude and latitude (RFC 7946)", all, code)
	_, err := crs.Parse(code)
	c.Likely = code
	switch {
	case all.degrees() && all.fractions():
		c.Likely = "degrees"
		e.crs = "EPSG:4326"
		e.find(Look, "foreign-system", says+"; these are likely degrees, which map takes only if --crs EPSG:4326 says so", e.located...)
		e.undecided("whether the coordinates are degrees, or in " + code)
	case err != nil:
		e.find(Look, "foreign-system", says+"; map needs --crs to say what they are, and does not know that name", e.located...)
		e.before("what the coordinates are in is not told: say it with --crs")
	default:
		e.crs = code
		e.find(Look, "foreign-system", says+"; map takes them only if --crs "+code+" says so", e.located...)
	}
}

// systemBySRID is for geometries with the SRID of a plane, or of a system that is not known.
func (e *examiner) systemBySRID(all extent, c *Coordinates) {
	code := e.survey.CRS
	system, err := crs.Parse(code)
	likelyDegrees := all.degrees() && all.fractions()
	c.Likely = code
	switch {
	case err != nil && likelyDegrees:
		c.Likely = "degrees"
		e.crs = "EPSG:4326"
		e.find(Look, "system", fmt.Sprintf("%s: likely degrees; their SRID says %s, which is not known here, and --crs EPSG:4326 takes them for WGS 84", all, code), e.located...)
		e.undecided("whether the coordinates are close enough to WGS 84")
	case err != nil:
		e.find(Look, "system", fmt.Sprintf("%s: their SRID says %s, which is not known here", all, code), e.located...)
		e.before("their reference system is not known here: bring the geometries into longitude and latitude or a UTM zone")
	case system.Geographic() && all.degrees():
		e.find(Look, "system", fmt.Sprintf("%s: these look like degrees and not like metres of %s, as their SRID says; map refuses them", all, code), e.located...)
		e.before("the geometries are not in their reference system: correct their SRID")
	default:
		e.find(Clear, "system", fmt.Sprintf("%s: metres of %s, as their SRID says", all, code), e.located...)
	}
}

// contradiction looks for a plane that geometries by their SRID are not in.
func (e *examiner) contradiction(c *Coordinates) {
	own := e.survey.CRS
	if own == "" || e.survey.Features {
		return
	}
	said, err := crs.Parse(*e.said.CRS)
	other, unknown := crs.Parse(own)
	if err == nil && (unknown != nil || other.Code() != said.Code()) {
		e.find(Look, "system", fmt.Sprintf("the geometries say by their SRID that they are in %s, and --crs says %s; map refuses that", own, *e.said.CRS), e.located...)
		e.before("the geometries say another reference system than --crs: leave that out, or correct their SRID")
	}
}

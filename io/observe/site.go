package observe

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"drumlin/grids/crs"
	"drumlin/io/wkt"

	"github.com/paulmach/orb"
)

// site is where a row was observed by a geometry of its own, and what else a feature is beside its properties.
type site struct {
	geometry     orb.Geometry // nil where there is none that can be used
	z            float64      // third coordinate of a point; NaN without one
	id           string       // identifier of a feature
	srid         int          // number of the reference system; 0 without one
	code, reason string       // why there is no geometry
}

const (
	faultGeometry   = "bad-geometry"
	reasonGeometry  = "geometry cannot be read" // and then what is wrong with it
	faultNoGeometry = faultMissing + "-geometry"
)

const (
	// adviceGeometries is adviceDegrees where geometries hold the coordinates.
	adviceGeometries = "put longitude before latitude, or say with --crs what the coordinates are in"
	adviceOutlines   = "check that the features were written completely: RFC 7946 says what their geometries are"
	adviceColumn     = "check that the right column is named: it holds WKT such as POINT (12.5 41.9), or EWKB in hexadecimal"
)

// adviceForGeometry says what to do about a geometry that cannot be read for a reason.
func adviceForGeometry(reason string, features bool) string {
	switch {
	case strings.HasSuffix(reason, "is not read"):
		return "read are points, lines and polygons, and several of one of these: straighten curves, and take collections apart"
	case strings.Contains(reason, crossesItself):
		return "repair such polygons: a ring must not cross itself (OGC 06-103r4, section 6.1.11)"
	case strings.HasSuffix(reason, noArea), strings.HasSuffix(reason, noLength):
		return "give places that are points as points, and correct the others"
	case features:
		return adviceOutlines
	}
	return adviceColumn
}

// locate finds out where the row at hand was observed, and refuses a table with a place that cannot be.
func (r *rows) locate(rec record, here Error) error {
	switch {
	case rec.site != nil:
		r.site = *rec.site
	case r.shape >= 0:
		r.site = parseSite(strings.TrimSpace(rec.fields[r.fields[r.shape].at]), r.format)
		if err := r.noteSRID(here); err != nil {
			return err
		}
	case r.want.NoPlaces:
		return nil
	default:
		return r.checkLatitude(rec.fields, here)
	}
	return r.checkDegrees(here)
}

// parseSite reads a trimmed field of WKT or EWKB.
func parseSite(s string, format *Format) site {
	none := site{z: math.NaN()}
	if format.isMissing(s) {
		none.code, none.reason = faultNoGeometry, "geometry is missing"
		return none
	}
	p, err := wkt.Parse(s)
	switch {
	case err != nil:
		none.code, none.reason = faultGeometry, reasonGeometry+": "+err.Error()
		return none
	case p.Geometry == nil:
		none.code, none.reason = faultNoGeometry, "geometry is missing"
		return none
	}
	return site{geometry: p.Geometry, z: p.Z, srid: p.SRID}.checked()
}

// checked takes a geometry away that has a flaw.
func (s site) checked() site {
	if flaw := flawOf(s.geometry); flaw != "" {
		s.geometry, s.z = nil, math.NaN()
		s.code, s.reason = faultGeometry, reasonGeometry+": "+flaw
	}
	return s
}

// noteSRID takes the reference system of the geometry at hand, which must be that of all others.
func (r *rows) noteSRID(here Error) error {
	srid := r.site.srid
	switch {
	case r.site.geometry == nil || r.tells > 0 && srid == r.srid:
		return nil
	case r.tells > 0:
		here.Column = r.table.GeometryName
		return here.because(fmt.Sprintf("its reference system is %s, and that of row %d is %s", sridWord(srid), r.tells, sridWord(r.srid)),
			"bring all geometries into one reference system")
	}
	r.srid, r.tells = srid, here.Row
	if srid > 0 {
		r.table.CRS = "EPSG:" + strconv.Itoa(srid)
		r.table.Degrees = r.want.Axes == AxesDegrees || r.want.Axes == AxesByName && crs.IsGeographic(r.table.CRS)
	}
	return nil
}

func sridWord(srid int) string {
	if srid == 0 {
		return "not named"
	}
	return "SRID " + strconv.Itoa(srid)
}

// checkDegrees refuses a table in degrees with a position that is none, as checkLatitude does.
func (r *rows) checkDegrees(here Error) error {
	if r.shape < 0 || !r.table.Degrees || r.site.geometry == nil {
		return nil
	}
	reach := farthest(r.site.geometry)
	here.Column = r.table.GeometryName
	for i, known := range []struct {
		most  float64
		words string
	}{{longestLongitude, "longitude (-360 to 360)"}, {90, "latitude (-90 to 90)"}} {
		if v := reach[i]; !(math.Abs(v) <= known.most) {
			here.Value = strconv.FormatFloat(v, 'g', -1, 64)
			return here.because(here.Value+" is not a "+known.words, adviceGeometries)
		}
	}
	return nil
}

// checkLatitude refuses a table with an impossible latitude, in usable rows or not: one is enough to doubt them all.
func (r *rows) checkLatitude(record []string, here Error) error {
	if !r.table.Degrees {
		return nil
	}
	s := strings.TrimSpace(record[r.fields[r.y].at])
	if v, fault := r.format.number(s); fault != "" || math.Abs(v) <= 90 {
		return nil
	}
	here.Column, here.Value = r.table.YName, shorten(s)
	return here.because(here.Value+" is not a latitude (-90 to 90)", adviceDegrees)
}

// cell returns the trimmed value of a field of the row at hand.
func (r *rows) cell(record []string, f field) string {
	switch f.at {
	case atFeature:
		return ""
	case atHeight:
		return heightText(r.site.z)
	case atID:
		return strings.TrimSpace(r.site.id)
	}
	return strings.TrimSpace(record[f.at])
}

// heightText writes a third coordinate as a field; empty for none.
func heightText(z float64) string {
	if math.IsNaN(z) {
		return ""
	}
	return strconv.FormatFloat(z, 'g', -1, 64)
}

// shapeFault returns the fault of the geometry of the row at hand, if it has one.
func (r *rows) shapeFault(f field, s string) (Aside, bool) {
	a := Aside{Column: f.name, Value: shorten(s), Code: r.site.code, Reason: r.site.reason}
	if r.site.code == "" {
		reach := farthest(r.site.geometry)
		if a.Code, a.Reason = beyondPlane(max(math.Abs(reach[0]), math.Abs(reach[1]))); a.Code == "" {
			return a, false
		}
	}
	return a, true
}

package crs

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// CodeError is the error of a code or a text that names no plane this package knows.
type CodeError struct {
	Code   string        // as it was given
	Reason string        // what is wrong with it
	hint   func() string // what to do, if there is something more particular than the general advice
}

// Error quotes the code and gives the reason.
func (e *CodeError) Error() string { return fmt.Sprintf("coordinate system %q: %s", e.Code, e.Reason) }

// Hint says what to do instead.
func (e *CodeError) Hint() string {
	switch {
	case IsGeographic(e.Code):
		return "longitude and latitude need no code: they are laid on an equal-area plane around the data"
	case e.hint != nil:
		return e.hint()
	}
	return "give local (metres of your own), an EPSG code of those that drumlin inspect --crs-list lists, such as EPSG:32633, or the plane's " +
		"parameters, as in \"" + exampleWords + "\"; otherwise give the coordinates as longitude and latitude"
}

// Parse returns the system that code names: "local", an EPSG code of those in Codes, the spelled-out "laea lon=8.5
// lat=47.25", or a plane in words:
//
//	transverse-mercator; lon0=15; lat0=0; scale=0.9996; east=500000; north=0; ellipsoid=GRS80
//
// Such a text begins with the projection; then come, in any order, what it needs: lon0 and, by projection, lat0, scale,
// parallel, parallel1 and parallel2, azimuth, bearing, axis; east and north, the false origin (0 if left out); ellipsoid,
// a name or semi-major axis and inverse flattening (WGS84); and shift, the seven numbers dx,dy,dz,rx,ry,rz,ds of a
// position vector to WGS 84, or three, or frame-shift, those of a coordinate frame (left out: longitude and latitude are
// those of WGS 84). Angles are in degrees, lengths in metres, turns in seconds of arc, ds in parts per million.
//
// Case and blanks are forgiven. Whatever the Code method of a System returns, Parse takes, and the result is equal to
// that System. Anything else is a *CodeError, and so is a code that says the coordinates are longitude and latitude (see
// IsGeographic), because these are not a plane.
func Parse(code string) (System, error) {
	switch word := squeeze(code); {
	case word == "local":
		return Local{}, nil
	case IsGeographic(code):
		return nil, &CodeError{Code: code, Reason: "longitude and latitude are not a plane"}
	case strings.HasPrefix(word, "epsg:"):
		return parseEPSG(code, strings.TrimPrefix(word, "epsg:"))
	case strings.HasPrefix(word, "laea"):
		return parseAzimuthal(code)
	case word == "":
		return nil, &CodeError{Code: code, Reason: "no code"}
	case !strings.ContainsAny(code, ";=") && nearestWord(word, methodWords()) == "":
		return nil, &CodeError{Code: code, Reason: "not known"}
	}
	p, err := parseParameters(code)
	if err != nil {
		return nil, &CodeError{Code: code, Reason: err.Error()}
	}
	return p, nil
}

// IsGeographic reports whether code says that coordinates are longitude and latitude on WGS 84 in degrees: EPSG:4326,
// OGC:CRS84, "longitude/latitude" or "lon/lat", or on a datum that is taken for it, such as EPSG:4258 (ETRS89) and
// EPSG:4269 (NAD83). Case and blanks are forgiven. Order is always longitude first here, whatever an authority says.
func IsGeographic(code string) bool {
	word := squeeze(code)
	switch word {
	case "ogc:crs84", "longitude/latitude", "lon/lat":
		return true
	}
	return isDegrees(word)
}

func squeeze(code string) string { return strings.ToLower(strings.Join(strings.Fields(code), "")) }

func parseAzimuthal(code string) (System, error) {
	word := strings.Fields(strings.ToLower(code))
	if len(word) != 3 || word[0] != "laea" {
		return nil, &CodeError{Code: code, Reason: "an azimuthal plane is written like laea lon=8.5 lat=47.25"}
	}
	lon, lat := degreesAfter("lon=", word[1]), degreesAfter("lat=", word[2])
	if !onGlobe(lon, lat) {
		return nil, &CodeError{Code: code, Reason: "its centre is not a place on the globe"}
	}
	return NewAzimuthalEqualArea(lon, lat)
}

// degreesAfter reads the number behind key; NaN if there is none.
func degreesAfter(key, word string) float64 {
	digits, ok := strings.CutPrefix(word, key)
	v, err := strconv.ParseFloat(digits, 64)
	if !ok || err != nil {
		return math.NaN()
	}
	return v
}

package crs

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// CodeError is the error of a code that names no plane this package knows.
type CodeError struct {
	Code   string // as it was given
	Reason string // what is wrong with it
}

// Error quotes the code and gives the reason.
func (e *CodeError) Error() string { return fmt.Sprintf("coordinate system %q: %s", e.Code, e.Reason) }

// Hint lists the codes that work.
func (e *CodeError) Hint() string {
	if IsGeographic(e.Code) {
		return "longitude and latitude need no code: they are laid on an equal-area plane around the data"
	}
	return "known are local (metres of your own) and EPSG:32601 to EPSG:32660 and EPSG:32701 to EPSG:32760 " +
		"(UTM north and south, WGS 84); otherwise give the coordinates as longitude and latitude"
}

// Parse returns the system that code names: "local", "EPSG:326xx" or "EPSG:327xx" for UTM, or the spelled-out "laea
// lon=8.5 lat=47.25"; case and blanks are forgiven. Whatever the Code method of a System returns, Parse takes, and the
// result is equal to that System. Any other code is a *CodeError, and so is one that says the coordinates are longitude
// and latitude (see IsGeographic), because these are not a plane.
func Parse(code string) (System, error) {
	switch word := squeeze(code); {
	case word == "local":
		return Local{}, nil
	case IsGeographic(code):
		return nil, &CodeError{code, "longitude and latitude are not a plane"}
	case strings.HasPrefix(word, "epsg:"):
		return parseEPSG(code, strings.TrimPrefix(word, "epsg:"))
	case strings.HasPrefix(word, "laea"):
		return parseAzimuthal(code)
	case word == "":
		return nil, &CodeError{code, "no code"}
	}
	return nil, &CodeError{code, "not known"}
}

// IsGeographic reports whether code says that coordinates are longitude and latitude on WGS 84 in degrees: EPSG:4326,
// OGC:CRS84, "longitude/latitude" or "lon/lat". Case and blanks are forgiven. Order is always longitude first here,
// whatever an authority says.
func IsGeographic(code string) bool {
	switch squeeze(code) {
	case "epsg:4326", "ogc:crs84", "longitude/latitude", "lon/lat":
		return true
	}
	return false
}

func squeeze(code string) string { return strings.ToLower(strings.Join(strings.Fields(code), "")) }

func parseEPSG(code, number string) (System, error) {
	n, err := strconv.Atoi(number)
	if err != nil || n < 0 || number[0] == '+' {
		return nil, &CodeError{code, "an EPSG code is a number"}
	}
	switch zone := n % 100; {
	case n/100 == 326 && zone >= 1 && zone <= 60:
		return NewUTM(zone, false)
	case n/100 == 327 && zone >= 1 && zone <= 60:
		return NewUTM(zone, true)
	}
	return nil, &CodeError{code, "not known"}
}

func parseAzimuthal(code string) (System, error) {
	word := strings.Fields(strings.ToLower(code))
	if len(word) != 3 || word[0] != "laea" {
		return nil, &CodeError{code, "an azimuthal plane is written like laea lon=8.5 lat=47.25"}
	}
	lon, lat := degreesAfter("lon=", word[1]), degreesAfter("lat=", word[2])
	if !onGlobe(lon, lat) {
		return nil, &CodeError{code, "its centre is not a place on the globe"}
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

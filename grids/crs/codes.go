package crs

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
)

// Code is an EPSG code that Parse takes.
type Code struct {
	EPSG int
	Name string // as the EPSG dataset has it
	Area string // where it is used, in plain words
}

// entry is a code with its plane in words (see parameters.go).
type entry struct {
	Code
	words string
}

// singles are the codes that stand alone; families has the others. The numbers behind both were written down from memory of
// the EPSG dataset and then checked: testdata/points.csv has at least three points of each from another library
// (testdata/SOURCE.md names the few that were corrected by it). Coordinates are always easting then northing here, also for
// codes whose authority has them the other way round. Longitude and latitude on ETRS89, NAD83, GDA94, GDA2020, NZGD2000,
// SIRGAS 2000, JGD, CGCS2000 and the like are taken for those of WGS 84, from which they differ by a metre or two at most,
// as WGS 84 itself has done over the years. All other datums have their published shift.
var singles = [][]entry{worldCodes, europeanCodes, americanCodes, otherCodes}

// Codes returns the EPSG codes that Parse takes, sorted. All are planes in metres.
func Codes() []Code {
	var list []Code
	for _, f := range families {
		for i := range f.count {
			list = append(list, f.entry(i).Code)
		}
	}
	for _, part := range singles {
		for _, e := range part {
			list = append(list, e.Code)
		}
	}
	slices.SortFunc(list, func(a, b Code) int { return a.EPSG - b.EPSG })
	return list
}

// find gives what is known of a code.
func find(n int) (entry, bool) {
	for _, f := range families {
		if n >= f.first && n < f.first+f.count {
			return f.entry(n - f.first), true
		}
	}
	for _, part := range singles {
		for _, e := range part {
			if e.EPSG == n {
				return e, true
			}
		}
	}
	return entry{}, false
}

// parseEPSG returns the plane of a code; number is what follows "epsg:".
func parseEPSG(code, number string) (System, error) {
	n, err := strconv.Atoi(number)
	if err != nil || n < 0 || number[0] == '+' {
		return nil, &CodeError{Code: code, Reason: "an EPSG code is a number"}
	}
	known, ok := find(n)
	if !ok {
		return nil, notOffered(code, n)
	}
	p, err := parseParameters(known.words)
	if err != nil {
		return nil, &CodeError{Code: code, Reason: err.Error()}
	}
	p.code = "EPSG:" + strconv.Itoa(n)
	return p, nil
}

func notOffered(code string, n int) error {
	e := &CodeError{Code: code, Reason: "this code is not offered", hint: func() string { return nearHint(n) }}
	switch {
	case n >= 2222 && n <= 2289:
		e.Reason = "this plane is in feet, and only planes in metres are offered"
		e.hint = func() string { return "turn the coordinates into metres, or into longitude and latitude" }
	case n >= 4000 && n < 5000:
		e.Reason = "this code is not offered; many codes from 4000 to 4999 are longitudes and latitudes and no plane"
	}
	return e
}

func nearHint(n int) string {
	near := nearestCode(n)
	return fmt.Sprintf("the nearest offered is EPSG:%d (%s); drumlin inspect --crs-list lists all, in metres; for another plane in metres "+
		"give its parameters, as in %q", near.EPSG, near.Name, exampleWords)
}

const exampleWords = "transverse-mercator; lon0=15; lat0=0; scale=0.9996; east=500000; north=0; ellipsoid=GRS80"

// nearestCode is the offered code that the fewest changes of a digit make out of n, and among these the nearest number.
func nearestCode(n int) Code {
	text := strconv.Itoa(n)
	return slices.MinFunc(Codes(), func(a, b Code) int {
		da, db := changes(text, strconv.Itoa(a.EPSG)), changes(text, strconv.Itoa(b.EPSG))
		if da != db {
			return da - db
		}
		return max(a.EPSG-n, n-a.EPSG) - max(b.EPSG-n, n-b.EPSG)
	})
}

// isDegrees reports whether an EPSG code is longitude and latitude on a datum that is taken for WGS 84: WGS 84 itself,
// ETRS89, NAD83 and its later forms, GDA94, GDA2020, NZGD2000, SIRGAS 2000, RGF93, JGD2000, JGD2011, CGCS2000.
func isDegrees(word string) bool {
	number, ok := strings.CutPrefix(word, "epsg:")
	n, err := strconv.Atoi(number)
	if !ok || err != nil || strconv.Itoa(n) != number {
		return false
	}
	switch n {
	case 4326, 4258, 4269, 4617, 6318, 4283, 7844, 4167, 4674, 4171, 4612, 6668, 4490:
		return true
	}
	return false
}

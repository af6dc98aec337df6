package observe

import (
	"fmt"
	"slices"
)

// Kind says what a response is, and so which of its values can be used.
type Kind int

const (
	None      Kind = iota // no response: a file of places
	Measure               // any finite number
	Count                 // a whole number, 0 or more
	Positives             // a whole number from 0 to the number of trials
)

// Axes says what the coordinates are.
type Axes int

const (
	AxesByName  Axes = iota // longitude and latitude where the columns are called so or geometries say so, otherwise a plane
	AxesDegrees             // longitude and latitude in degrees, whatever the columns are called
	AxesPlane               // easting and northing in metres; columns called longitude and latitude are not taken for them
)

// Request says which columns of a table play which part. Names are matched exactly, after blanks around the header's
// names are dropped. Empty names are parts nobody plays.
//
// A row is checked part by part in the order of the fields: response, trials, denominator, its factors, weight,
// coordinates (x, then y) or geometry, linear covariates, categories. The first check it fails is the reason it is set aside for.
//
// The features of GeoJSON have geometries of their own: a request that names columns for places is refused for them.
type Request struct {
	Response    string            // column of the response; empty with Kind None
	Kind        Kind              // what the response is
	Trials      string            // number examined, whole and above 0: with Positives, and only then
	Denominator string            // people, area, effort or expected: finite and above 0
	Factor      []string          // what the denominator is multiplied by: finite and above 0
	Weight      string            // finite and above 0
	X, Y        string            // coordinate columns; both empty to recognise them by their names
	Geometry    string            // column of geometries in WKT or hexadecimal EWKB, in place of X and Y
	NoPlaces    bool              // rows have no places of their own: none are looked for
	Axes        Axes              // what the coordinates are
	Linear      []string          // covariates that are finite numbers
	Category    []string          // covariates that are text, not missing
	Optional    []string          // categories that the table need not have: where it has the column, it is one of Category
	Keep        []string          // text to carry along; may be missing, is never a reason to set a row aside
	Called      map[string]string // what columns of Factor and Keep are in messages, such as "width" or "key"; may lack any
	Strict      bool              // refuse the first row that cannot be used instead of setting it aside
	Format      Format            // how the table is written; ReadPart goes by the format that WholeAs was given
}

// Validate reports the first thing about a request that no table could satisfy. Read calls it.
func (q Request) Validate() error {
	switch {
	case q.Kind != None && q.Response == "":
		return &Error{What: "no column is named for the response", Advice: "name it with --response"}
	case q.Kind == None && q.Response != "":
		return &Error{Column: q.Response, What: "a response is named, but places have none"}
	case q.Kind == Positives && q.Trials == "":
		return &Error{Column: q.Response, What: "a number positive needs a number of trials", Advice: "name the column of the number examined with --trials"}
	case q.Kind != Positives && q.Trials != "":
		return &Error{Column: q.Trials, What: "trials are named, but the response is not a number positive"}
	case q.Trials != "" && q.Denominator != "":
		return &Error{Column: q.Denominator, What: "a number positive has trials and takes no other denominator"}
	case q.NoPlaces && q.X+q.Y+q.Geometry != "":
		return &Error{What: "rows have no places of their own, but columns are named for them", Advice: "leave out --x and --y, and --geometry"}
	case q.Geometry != "" && q.X+q.Y != "":
		return &Error{Column: q.Geometry, What: "a column of geometries is named beside coordinate columns", Advice: "name either --geometry or --x and --y"}
	case (q.X == "") != (q.Y == ""):
		return &Error{Column: q.X + q.Y, What: "one coordinate column is named without the other", Advice: adviceXY}
	}
	if err := q.Format.Validate(); err != nil {
		return err
	}
	return q.overlap()
}

// asks reports whether the request names a column, whatever for.
func (q Request) asks(name string) bool {
	return slices.Contains([]string{q.Response, q.Trials, q.Denominator, q.Weight, q.X, q.Y, q.Geometry}, name) ||
		slices.Contains(slices.Concat(q.Factor, q.Linear, q.Category, q.Optional, q.Keep), name)
}

// overlap refuses a column asked to play two parts that exclude each other. The response is nothing else, a
// coordinate is no denominator, trials or weight, and a covariate is named once and as one kind. A coordinate or a
// denominator may also be a linear covariate.
func (q Request) overlap() error {
	main := []struct{ name, part string }{
		{q.Response, "the response"}, {q.Trials, "the number of trials"}, {q.Denominator, "the denominator"},
		{q.Weight, "the weight"}, {q.X, "the x coordinate"}, {q.Y, "the y coordinate"}, {q.Geometry, "the geometry"},
	}
	for i, a := range main {
		for _, b := range main[i+1:] {
			// What is counted may also be the precision it is known to.
			weighs := b.name == q.Weight && (a.name == q.Trials || a.name == q.Denominator)
			if a.name != "" && a.name == b.name && !weighs {
				return twice(a.name, a.part, b.part)
			}
		}
	}
	for _, a := range main {
		if slices.Contains(q.Factor, a.name) {
			return twice(a.name, a.part, "a factor of the denominator")
		}
	}
	covariate := map[string]string{}
	for _, list := range []struct {
		names []string
		part  string
	}{{q.Linear, "a linear covariate"}, {q.Category, "a category"}, {q.Optional, "a category"}} {
		for _, name := range list.names {
			switch before, seen := covariate[name]; {
			case name == "":
				return &Error{What: fmt.Sprintf("an empty name is given for %s", list.part)}
			case name == q.Response:
				return twice(name, "the response", list.part)
			case seen && before == list.part:
				return &Error{Column: name, What: "named twice as " + before}
			case seen:
				return twice(name, before, list.part)
			}
			covariate[name] = list.part
		}
	}
	if slices.Contains(q.Keep, "") {
		return &Error{What: "an empty name is given for text to keep"}
	}
	return nil
}

func twice(column, a, b string) error {
	return &Error{Column: column, What: fmt.Sprintf("cannot be both %s and %s", a, b)}
}

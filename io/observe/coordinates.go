package observe

import (
	"fmt"
	"slices"
	"strings"

	"drumlin/grids/crs"
)

// pair is two names by which coordinate columns are known.
type pair struct {
	x, y    string
	degrees bool
}

// pairs are looked for in this order, in any mixture of capitals, and both names must be there.
var pairs = []pair{
	{"longitude", "latitude", true}, {"lon", "lat", true},
	{"easting", "northing", false}, {"x", "y", false},
}

func (p pair) String() string { return p.x + "/" + p.y }

// coordinates says which columns hold the coordinates and what they are.
type coordinates struct {
	x, y       string
	geometry   string // the column of geometries, or "geometry" of features
	crs        string // what the source says that its geometries are in
	degrees    bool
	recognised bool
	passedOver []string
}

// places says where the rows are.
func (h header) places(want Request) (coordinates, error) {
	switch {
	case h.shapes != nil:
		return h.ofFeatures(want)
	case want.NoPlaces:
		return coordinates{}, nil
	case want.Geometry != "":
		return coordinates{geometry: want.Geometry, degrees: want.Axes == AxesDegrees}, nil
	}
	return h.coordinates(want)
}

// ofFeatures decides what the coordinates of features are.
func (h header) ofFeatures(want Request) (coordinates, error) {
	const own = "the file is GeoJSON, whose features have geometries of their own, but "
	crsOf := h.shapes.crs
	switch {
	case want.X != "":
		return coordinates{}, &Error{File: h.source, What: own + "coordinate columns are named", Advice: "leave out --x and --y"}
	case want.Geometry != "":
		return coordinates{}, &Error{File: h.source, What: own + "a column of geometries is named", Advice: "leave out --geometry"}
	case want.NoPlaces:
		return coordinates{}, nil
	case want.Axes == AxesByName && crsOf != "" && !crs.IsGeographic(crsOf):
		return coordinates{}, &Error{File: h.source, Advice: "say with --crs what the coordinates are in",
			What: fmt.Sprintf("the file says that its coordinates are in %q, and GeoJSON is in longitude and latitude (RFC 7946)", shorten(crsOf))}
	}
	return coordinates{geometry: geometry.word(), crs: crsOf, degrees: want.Axes != AxesPlane}, nil
}

// coordinates takes the columns the user named, or recognises them. A file with longitude and latitude beside an
// easting and northing is read by its longitude and latitude, since these say where on the globe they are and the
// others do not; two pairs of the same sort are ambiguous and refused.
func (h header) coordinates(want Request) (coordinates, error) {
	if want.X != "" {
		return coordinates{x: want.X, y: want.Y, degrees: degreesByName(want)}, nil
	}
	found, err := h.recognise(want)
	if err != nil {
		return coordinates{}, err
	}
	var usable, others []pair
	for _, p := range found {
		switch {
		case want.Axes == AxesPlane && p.degrees, want.Axes == AxesDegrees && !p.degrees && strings.ToLower(p.x) != "x":
			others = append(others, p)
		case len(usable) > 0 && usable[0].degrees && !p.degrees:
			others = append(others, p)
		default:
			usable = append(usable, p)
		}
	}
	if len(usable) != 1 {
		return coordinates{}, h.noSinglePair(want, usable, others)
	}
	c := coordinates{x: usable[0].x, y: usable[0].y, recognised: true}
	c.degrees = want.Axes == AxesDegrees || want.Axes == AxesByName && usable[0].degrees
	for _, p := range others {
		c.passedOver = append(c.passedOver, p.String())
	}
	return c, nil
}

// degreesByName decides what columns named by the user are.
func degreesByName(want Request) bool {
	if want.Axes != AxesByName {
		return want.Axes == AxesDegrees
	}
	x, y := strings.ToLower(want.X), strings.ToLower(want.Y)
	return (x == "lon" || x == "longitude") && (y == "lat" || y == "latitude")
}

// recognise returns the pairs the header has, spelled as there. Columns that play another main part do not count: in
// a table of x, y and a response y there is no pair.
func (h header) recognise(want Request) ([]pair, error) {
	taken := map[string]bool{want.Response: true, want.Trials: true, want.Denominator: true, want.Weight: true}
	spelled := map[string][]string{}
	for _, name := range h.names {
		if !taken[name] {
			low := strings.ToLower(name)
			spelled[low] = append(spelled[low], name)
		}
	}
	var found []pair
	for _, p := range pairs {
		xs, ys := spelled[p.x], spelled[p.y]
		if len(xs) == 0 || len(ys) == 0 {
			continue
		}
		for _, same := range [][]string{xs, ys} {
			if len(same) > 1 {
				return nil, &Error{File: h.source, Line: h.line, Advice: adviceXY,
					What: fmt.Sprintf("columns %q and %q could both be a coordinate", same[0], same[1])}
			}
		}
		found = append(found, pair{xs[0], ys[0], p.degrees})
	}
	return found, nil
}

// noSinglePair says why recognition came to nothing.
func (h header) noSinglePair(want Request, usable, others []pair) error {
	e := &Error{File: h.source, Line: h.line, Advice: adviceXY}
	switch {
	case len(usable) > 1:
		e.What = fmt.Sprintf("columns %s and %s could both be the coordinates", usable[0], usable[1])
	case len(others) > 0 && want.Axes == AxesPlane:
		e.What = fmt.Sprintf("columns %s are longitude and latitude by their names, but the coordinates are said to be in a plane", others[0])
		e.Advice = adviceDegrees
	case len(others) > 0:
		e.What = fmt.Sprintf("columns %s are in a plane by their names, but the coordinates are said to be longitude and latitude", others[0])
		e.Advice = adviceDegrees
	default:
		e.What = "no coordinate columns are recognised" + h.takenPair(want)
		e.Advice = h.advicePlaces()
	}
	return e
}

// takenPair says that a coordinate column is named for something else; "" if none is.
func (h header) takenPair(want Request) string {
	for _, part := range []struct{ name, word string }{
		{want.Response, "the response"}, {want.Trials, "the number of trials"}, {want.Denominator, "the denominator"}, {want.Weight, "the weight"},
	} {
		low := strings.ToLower(part.name)
		for _, p := range pairs {
			other := map[string]string{p.x: p.y, p.y: p.x}[low]
			if other != "" && slices.ContainsFunc(h.names, func(name string) bool { return strings.ToLower(name) == other }) {
				return fmt.Sprintf(": %q is named as %s", shorten(part.name), part.word)
			}
		}
	}
	return ""
}

// advicePlaces says what to do about a table that tells nobody where its rows are.
func (h header) advicePlaces() string {
	if advice := h.adviceUnseparated(); advice != "" {
		return advice
	}
	if name := h.geometryColumn(); name != "" {
		return fmt.Sprintf("name the column of geometries with --geometry %s", plainOrQuoted(shorten(name)))
	}
	return fmt.Sprintf("%s, or a column of geometries with --geometry, or a file of places with --places; known by their names are %s, %s, %s and %s; %s",
		adviceXY, pairs[0], pairs[1], pairs[2], pairs[3], h.columnList())
}

// geometryColumn returns the column that looks like one of geometries by the first rows; "" for none.
func (h header) geometryColumn() string {
	for _, r := range h.origin.first[min(1, len(h.origin.first)):] {
		for i, s := range r.fields {
			s = strings.TrimSpace(s)
			if i < len(h.names) && h.names[i] != "" && couldBeShape(s) && parseSite(s, &h.origin.format).code != faultGeometry {
				return h.names[i]
			}
		}
	}
	return ""
}

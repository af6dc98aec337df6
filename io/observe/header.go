package observe

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"drumlin/grids/crs"
)

// header is the line of names and where the request found its columns in it.
type header struct {
	source string
	line   int
	names  []string
	origin *origin

	shapes  *shapes // of the features that are the rows; nil for a table in columns
	ids     bool    // a column "id" that is not there is the identifier of features
	heights bool    // a column "z" that is not there is the third coordinate of points
}

// shapes is what a source says of the geometries that its rows have by themselves.
type shapes struct {
	crs string // authority and code; empty where it says nothing
}

// readHeader reads the names.
func readHeader(in *text, source string) (header, error) {
	record, err := in.Read()
	if err == io.EOF {
		return header{}, emptyFile(source)
	}
	if err != nil {
		return header{}, readError(source, err)
	}
	line, _ := in.FieldPos(0)
	return newHeader(record, line, in.origin)
}

func emptyFile(source string) error {
	return &Error{File: source, What: "the file is empty", Advice: adviceWhole}
}

// noRows says that nothing stands below the header.
func (h header) noRows() error {
	return &Error{File: h.source, Line: h.line, What: "no rows stand below the header", Advice: adviceWhole}
}

// newHeader takes the names from the first record, which starts on the given line. Blank names are let pass:
// spreadsheets leave them, and nobody can ask for one.
func newHeader(record []string, line int, from *origin) (header, error) {
	source := from.source
	h := header{source: source, line: line, names: make([]string, len(record)), origin: from}
	first := map[string]int{}
	numbers := 0
	for i, field := range record {
		name := strings.TrimSpace(field)
		if !clean(name) {
			return header{}, &Error{File: source, Line: line, What: fmt.Sprintf("the name of column %d is %s", i+1, from.notText(name)), Advice: adviceText}
		}
		if at, seen := first[name]; seen && name != "" {
			return header{}, &Error{File: source, Line: line, Column: name, Advice: "give each column a name of its own",
				What: fmt.Sprintf("the name appears twice, as columns %d and %d", at+1, i+1)}
		}
		first[name] = i
		if _, fault := parseNumber(name); fault == "" || hasDecimalComma(name) {
			numbers++
		}
		h.names[i] = strings.Clone(name)
	}
	if numbers == len(h.names) {
		return header{}, &Error{File: source, Line: line, What: "numbers stand where the names of the columns should be",
			Advice: "put the names of the columns on the first line"}
	}
	return h, nil
}

// checkRecord refuses records of the wrong length and fields that are not text, whether or not they are asked for.
func (h header) checkRecord(record []string, here Error) error {
	if len(record) != len(h.names) {
		return here.because(fmt.Sprintf("%d fields where the header has %d", len(record), len(h.names)),
			fmt.Sprintf("check the line for a missing %s, or for one that belongs inside quotes", separatorWord(h.origin.separator)))
	}
	if here.Line > math.MaxInt32 {
		return here.because("the file has more lines than can be counted", "")
	}
	for i, s := range record {
		if !clean(s) {
			return h.notClean(h.names[i], s, here)
		}
	}
	return nil
}

// notClean refuses a field that is not text.
func (h header) notClean(name, s string, here Error) error {
	here.Column, here.Value = name, shorten(s)
	advice := adviceText
	if h.origin.features {
		advice = "correct the property, or leave it out"
	}
	return here.because(fmt.Sprintf("%q is %s", here.Value, h.origin.notText(s)), advice)
}

// The columns that features have beside their properties, and heightName that of points in a column of geometries, where
// no other is called so.
const (
	idName     = "id" // their identifier
	heightName = "z"  // the third coordinate
)

// columns returns the names that a user is told of.
func (h header) columns() []string {
	names := slices.Clone(h.names)
	if h.ids && !slices.Contains(names, idName) {
		names = append(names, idName)
	}
	if h.shapes != nil && h.heights && !slices.Contains(names, heightName) {
		names = append(names, heightName)
	}
	return names
}

// find returns the position of a column, which must exist, or atID or atHeight.
func (h header) find(name, part string) (int, error) {
	for i, n := range h.names {
		if n == name {
			return i, nil
		}
	}
	switch {
	case h.ids && name == idName:
		return atID, nil
	case h.heights && name == heightName:
		return atHeight, nil
	}
	return 0, absent(h.source, h.line, name, part, h.columns())
}

// among returns those of names that are columns.
func (h header) among(names []string) (there []string) {
	for _, name := range names {
		if slices.Contains(h.columns(), name) {
			there = append(there, name)
		}
	}
	return there
}

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
		e.What = "no coordinate columns are recognised"
		e.Advice = fmt.Sprintf("%s; known by their names are %s, %s, %s and %s; %s",
			adviceXY, pairs[0], pairs[1], pairs[2], pairs[3], columnList(h.names))
	}
	return e
}

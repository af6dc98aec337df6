package wkt

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/paulmach/orb"
)

// words reads WKT. After the first error it does nothing more.
type words struct {
	text    string
	at      int  // byte at which it stands
	numbers int  // numbers of a position: 2 to 4; 0 until the first position tells
	measure bool // the third number of three is a measure
	z       float64
	refused *Error
}

// kinds read, in capitals.
var kinds = []string{"POINT", "MULTIPOINT", "LINESTRING", "MULTILINESTRING", "POLYGON", "MULTIPOLYGON"}

// others are kinds of the standards that are not read.
var others = []string{"GEOMETRYCOLLECTION", "GEOMETRY", "TRIANGLE", "TIN", "POLYHEDRALSURFACE", "CIRCULARSTRING", "COMPOUNDCURVE",
	"CURVEPOLYGON", "MULTICURVE", "MULTISURFACE", "CURVE", "SURFACE", "LINEARRING"}

func parseWords(text string) (Place, *Error) {
	w := &words{text: text, z: math.NaN()}
	p := Place{SRID: w.srid()}
	kind := w.kind()
	p.Geometry = w.geometry(kind)
	if w.blanks(); w.refused == nil && w.at < len(w.text) {
		w.expected("the end of the text")
	}
	p.Z = math.NaN()
	if kind == "POINT" {
		p.Z = w.z
	}
	return p, w.refused
}

// refuse records the first error, at a byte of the text.
func (w *words) refuse(at int, advice, format string, args ...any) {
	if w.refused == nil {
		w.refused = &Error{At: at + 1, What: fmt.Sprintf(format, args...), Advice: advice}
	}
}

// expected says what should stand where the reader stands, and what does.
func (w *words) expected(what string) {
	w.blanks()
	if w.at == len(w.text) {
		w.refuse(w.at, adviceText, "%s was expected, and the text ends", what)
		return
	}
	_, size := utf8.DecodeRuneInString(w.text[w.at:])
	there := w.text[w.at : w.at+size]
	if word := w.letters(); len(word) > 1 {
		there = shorten(word)
	}
	w.refuse(w.at, adviceText, "%s was expected, and %q stands there", what, there)
}

func (w *words) blanks() {
	for w.at < len(w.text) && strings.IndexByte(" \t\r\n", w.text[w.at]) >= 0 {
		w.at++
	}
}

// take steps over a byte, and blanks before it, if it comes next.
func (w *words) take(b byte) bool {
	w.blanks()
	if w.refused != nil || w.at == len(w.text) || w.text[w.at] != b {
		return false
	}
	w.at++
	return true
}

// letters returns the letters that come next, which stay.
func (w *words) letters() string {
	end := w.at
	for end < len(w.text) && (w.text[end]|0x20 >= 'a' && w.text[end]|0x20 <= 'z') {
		end++
	}
	return w.text[w.at:end]
}

// word steps over a word, and blanks before it, if it comes next. Case does not count.
func (w *words) word(want string) bool {
	w.blanks()
	if w.refused != nil || !strings.EqualFold(w.letters(), want) {
		return false
	}
	w.at += len(want)
	return true
}

// srid reads "SRID=number;", where that comes first.
func (w *words) srid() int {
	if !w.word("SRID") {
		return 0
	}
	if !w.take('=') {
		w.expected(`"=" after SRID`)
		return 0
	}
	w.blanks()
	start := w.at
	for w.at < len(w.text) && w.text[w.at] >= '0' && w.text[w.at] <= '9' {
		w.at++
	}
	number, err := strconv.Atoi(w.text[start:w.at])
	switch {
	case w.at == start:
		w.expected("the number of the reference system")
	case err != nil || number > largestSRID:
		w.refuse(start, "give an EPSG code, such as SRID=4326", "%s is not a number of a reference system (0 to %d)", shorten(w.text[start:w.at]), largestSRID)
	case !w.take(';'):
		w.expected(`";" after the number of the reference system`)
	}
	return number
}

// kind reads the kind of geometry and the tag that says what its positions hold.
func (w *words) kind() string {
	w.blanks()
	start, name := w.at, strings.ToUpper(w.letters())
	if w.refused != nil {
		return ""
	}
	if name == "" {
		w.expected("a kind of geometry")
		return ""
	}
	w.at += len(name)
	kind, tag := known(name, kinds)
	if kind == "" {
		if other, _ := known(name, others); other != "" {
			w.refuse(start, adviceOne, "a %s is not read", other)
		} else {
			w.refuse(start, adviceText, "%q is not a kind of geometry", shorten(name))
		}
		return ""
	}
	for _, t := range []string{"ZM", "Z", "M"} {
		if tag == "" && w.word(t) {
			tag = t
		}
	}
	w.measure = tag == "M"
	if tag != "" {
		w.numbers = 2 + len(tag)
	}
	return kind
}

// known finds a name among kinds, with or without a tag at its end.
func known(name string, kinds []string) (kind, tag string) {
	for _, t := range []string{"", "ZM", "Z", "M"} {
		bare, has := strings.CutSuffix(name, t)
		for _, k := range kinds {
			if has && bare == k {
				return k, t
			}
		}
	}
	return "", ""
}

// geometry reads what follows the kind; nil without positions.
func (w *words) geometry(kind string) orb.Geometry {
	switch kind {
	case "POINT":
		if points := w.points(1); len(points) == 1 {
			return points[0]
		}
	case "MULTIPOINT":
		return orNil(orb.MultiPoint(w.multiPoint()))
	case "LINESTRING":
		return orNil(w.line())
	case "MULTILINESTRING":
		var lines orb.MultiLineString
		w.list(func() { lines = appendSome(lines, w.line()) })
		return orNil(lines)
	case "POLYGON":
		return orNil(w.polygon())
	case "MULTIPOLYGON":
		var polygons orb.MultiPolygon
		w.list(func() { polygons = appendSome(polygons, w.polygon()) })
		return orNil(polygons)
	}
	return nil
}

// orNil returns nil for a geometry without parts.
func orNil[G interface {
	~[]E
	orb.Geometry
}, E any](g G) orb.Geometry {
	if len(g) == 0 {
		return nil
	}
	return g
}

// appendSome appends a part unless it is empty.
func appendSome[G ~[]E, E ~[]F, F any](g G, part E) G {
	if len(part) == 0 {
		return g
	}
	return append(g, part)
}

// list reads EMPTY, or elements between brackets with commas between them.
func (w *words) list(element func()) {
	if w.word("EMPTY") {
		return
	}
	if !w.take('(') {
		w.expected(`"(" or EMPTY`)
		return
	}
	for element(); w.refused == nil && w.take(','); {
		element()
	}
	if w.refused == nil && !w.take(')') {
		w.expected(`"," or ")"`)
	}
}

// points reads a list of positions; with most above 0 there may be no more than that.
func (w *words) points(most int) (points []orb.Point) {
	w.list(func() {
		if at := w.at; most > 0 && len(points) == most {
			w.refuse(at, adviceOne, "there are more positions than the kind of geometry has")
		}
		points = append(points, w.position())
	})
	return points
}

// multiPoint reads a list of positions, each in brackets of its own or not: both are common.
func (w *words) multiPoint() (points []orb.Point) {
	w.list(func() {
		switch {
		case w.word("EMPTY"):
		case w.take('('):
			points = append(points, w.position())
			if w.refused == nil && !w.take(')') {
				w.expected(`")"`)
			}
		default:
			points = append(points, w.position())
		}
	})
	return points
}

func (w *words) line() orb.LineString {
	l := orb.LineString(w.points(0))
	if what := lineFault(l); w.refused == nil && len(l) > 0 && what != "" {
		w.refuse(w.at-1, "give a line 2 positions or more", "%s", what)
	}
	return l
}

func (w *words) polygon() (p orb.Polygon) {
	w.list(func() {
		r := orb.Ring(w.points(0))
		if what := ringFault(r); w.refused == nil && what != "" {
			w.refuse(w.at-1, adviceRing, "%s", what)
		}
		p = append(p, r)
	})
	return p
}

// position reads 2 to 4 numbers with blanks between them, as many as the tag or the first position says.
func (w *words) position() (p orb.Point) {
	w.blanks()
	start, n := w.at, 0
	w.z = math.NaN()
	for w.refused == nil && n < 5 {
		w.blanks()
		if n >= 2 && (w.at == len(w.text) || strings.IndexByte("+-.0123456789", w.text[w.at]) < 0) {
			break
		}
		switch v := w.number(); {
		case n < 2:
			p[n] = v
		case n == 2 && !w.measure:
			w.z = v
		}
		n++
	}
	switch {
	case w.refused != nil:
	case n > 4:
		w.refuse(start, adviceText, "a position has more than 4 numbers")
	case w.numbers == 0:
		w.numbers = n
	case n != w.numbers:
		w.refuse(start, adviceText, "a position has %d numbers, where the tag or the first position has %d", n, w.numbers)
	}
	return p
}

// number reads a finite decimal number, with or without an exponent.
func (w *words) number() float64 {
	start := w.at
	for w.at < len(w.text) && strings.IndexByte("+-.0123456789eE", w.text[w.at]) >= 0 {
		w.at++
	}
	s := w.text[start:w.at]
	v, err := strconv.ParseFloat(s, 64)
	switch {
	case s == "":
		w.expected("a number")
	case math.IsInf(v, 0):
		w.refuse(start, adviceText, "%s is not finite", shorten(s))
	case err != nil:
		w.refuse(start, adviceText, "%q is not a number", shorten(s))
	}
	return v
}

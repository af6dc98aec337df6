package wkt

import (
	"fmt"
	"math"
	"strings"
	"unicode/utf8"

	"drumlin/io/vector"

	"github.com/paulmach/orb"
)

// Place is what a text stands for.
type Place struct {
	// Geometry is a Point, MultiPoint, LineString, MultiLineString, Polygon or MultiPolygon, its rings closed, of 4
	// positions or more and turned by vector.Orient; nil for a geometry without positions (EMPTY).
	Geometry orb.Geometry
	Z        float64 // third coordinate of a Point; NaN without one and for other kinds
	SRID     int     // number of the reference system, in practice an EPSG code; 0 where the text names none
}

// Error is a refusal of a text: what is wrong and where.
type Error struct {
	At     int    // the character at which it is seen, from 1; 0 for the text as a whole
	What   string // what is wrong, in words
	Advice string // what to do about it
}

// Error gives the place and then what is wrong, in one line.
func (e *Error) Error() string {
	if e.At == 0 {
		return e.What
	}
	return fmt.Sprintf("character %d: %s", e.At, e.What)
}

// Hint says what to do; it is empty where there is nothing to add.
func (e *Error) Hint() string { return e.Advice }

const (
	adviceText = "give WKT such as POINT (12.5 41.9), or EWKB in hexadecimal"
	adviceOne  = "give a Point, LineString or Polygon, or a Multi of these"
	adviceRing = "repeat the first position of each ring as its last"
	// largestSRID is the largest number of a reference system in spatial databases; EPSG codes end far below.
	largestSRID = 999999
)

// Parse reads a text that is WKT (any case, with or without "SRID=4326;" before it) or EWKB in hexadecimal (either byte
// order, dimensions as flags or in the thousands of ISO; a "\x" or "0x" before it is dropped). Heights are kept for
// points only, measures are dropped. An *Error is returned for anything else, with the place in the text. The memory
// taken is at most a small multiple of the text, whatever counts the text claims.
func Parse(text string) (Place, error) {
	trimmed := strings.TrimSpace(text)
	skipped := strings.Index(text, trimmed)
	var p Place
	var err *Error
	switch {
	case trimmed == "":
		return Place{Z: math.NaN()}, &Error{What: "the text is empty", Advice: adviceText}
	case looksHex(trimmed):
		p, err = parseHex(trimmed)
	default:
		p, err = parseWords(trimmed)
	}
	if err != nil {
		if err.At > 0 {
			// Counted in bytes from 0 so far.
			err.At += utf8.RuneCountInString(text[:skipped]) + utf8.RuneCountInString(trimmed[:err.At-1]) - (err.At - 1)
		}
		return Place{Z: math.NaN()}, err
	}
	if p.Geometry != nil {
		vector.Orient(p.Geometry)
	}
	return p, nil
}

// looksHex tells the two sorts of text apart: WKT begins with a letter, EWKB with the digits of its byte order.
func looksHex(s string) bool { return s[0] >= '0' && s[0] <= '9' || s[0] == '\\' }

// shorten cuts a text after 60 characters.
func shorten(s string) string {
	n := 0
	for i := range s {
		if n == 60 {
			return s[:i] + "..."
		}
		n++
	}
	return s
}

// ringFault says what is wrong with a ring; "" if nothing is.
func ringFault(r orb.Ring) string {
	switch {
	case len(r) < 4:
		return fmt.Sprintf("the ring that ends here has %d positions, and a ring needs 4 or more", len(r))
	case r[0] != r[len(r)-1]:
		return fmt.Sprintf("the ring that ends here is not closed: it starts at %v and ends at %v", r[0], r[len(r)-1])
	}
	return ""
}

// lineFault says what is wrong with a line; "" if nothing is.
func lineFault(l orb.LineString) string {
	if len(l) < 2 {
		return fmt.Sprintf("the line that ends here has %d position, and a line needs 2 or more", len(l))
	}
	return ""
}

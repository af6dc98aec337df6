package vector

import (
	"encoding/json"
	"fmt"
	"math"
	"strconv"
	"strings"

	"github.com/paulmach/orb"
)

// readGeometry reads a Polygon or a MultiPolygon.
func readGeometry(raw json.RawMessage) (orb.MultiPolygon, *Error) {
	if len(raw) == 0 || string(raw) == "null" {
		return nil, &Error{What: "has no geometry", Advice: adviceFormat}
	}
	members, err := object(raw)
	if err != nil {
		return nil, &Error{What: "its geometry is not an object", Advice: adviceFormat}
	}
	kind := word(members["type"])
	if kind != "Polygon" && kind != "MultiPolygon" {
		return nil, &Error{What: fmt.Sprintf("its geometry is a %q, not a Polygon or MultiPolygon", shorten(kind)), Advice: adviceFormat}
	}
	if members["coordinates"] == nil {
		return nil, &Error{What: `its geometry has no "coordinates"`, Advice: adviceFormat}
	}
	c := &coordinates{text: members["coordinates"]}
	var shape orb.MultiPolygon
	if kind == "Polygon" {
		c.parts = []part{{}, {"ring", 0}, {"position", 0}}
		shape = orb.MultiPolygon{c.polygon()}
	} else {
		c.parts = []part{{"polygon", 0}, {"ring", 0}, {"position", 0}}
		shape = c.multiPolygon()
	}
	if c.refused != nil {
		return nil, c.refused
	}
	return shape, nil
}

// coordinates reads nested lists of numbers from text that is known to be JSON. It is written out because decoding
// into slices of slices takes several times the memory of the text, and into arrays loses how many numbers there
// were. After the first error it does nothing more.
type coordinates struct {
	text    []byte
	at      int
	parts   []part // polygon, ring and position being read
	refused *Error
}

// part is a level of nesting and the number of the element being read there, from 1; 0 before the first.
type part struct {
	name   string
	number int
}

// The indices of coordinates.parts.
const (
	atPolygon = iota
	atRing
	atPosition
)

func (c *coordinates) multiPolygon() (shape orb.MultiPolygon) {
	c.list(atPolygon, func() { shape = append(shape, c.polygon()) })
	if c.refused == nil && len(shape) == 0 {
		c.refuse("has no polygons")
	}
	return shape
}

func (c *coordinates) polygon() (p orb.Polygon) {
	c.list(atRing, func() { p = append(p, c.ring()) })
	if c.refused == nil && len(p) == 0 {
		c.refuse("has no rings")
	}
	return p
}

// ring reads a linear ring: "a closed LineString with four or more positions" whose first and last "are equivalent,
// and they MUST contain identical values" (RFC 7946 section 3.1.6).
func (c *coordinates) ring() (r orb.Ring) {
	c.list(atPosition, func() { r = append(r, c.position()) })
	switch {
	case c.refused != nil:
	case len(r) < 4:
		c.refuse("has %s, and a ring needs 4 or more", several(len(r), "position"))
	case r[0] != r[len(r)-1]:
		c.refuse("is not closed: it starts at %v and ends at %v", r[0], r[len(r)-1])
	}
	return r
}

// position reads two numbers and passes over any others (RFC 7946 section 3.1.1: an altitude may follow).
func (c *coordinates) position() (p orb.Point) {
	n := 0
	c.list(-1, func() {
		if v := c.number(); n < 2 {
			p[n] = v
		}
		n++
	})
	if c.refused == nil && n < 2 {
		c.refuse("has %s, and a position needs 2", several(n, "number"))
	}
	return p
}

// list calls element at each element of a list, counting at a level of parts (-1: none).
func (c *coordinates) list(level int, element func()) {
	if c.refused != nil || !c.take('[') {
		c.refuse("is not a list")
		return
	}
	for n := 1; c.refused == nil && !c.take(']'); n++ {
		if level >= 0 {
			c.parts[level].number = n
		}
		element()
		c.take(',')
	}
	if level >= 0 && c.refused == nil {
		c.parts[level].number = 0
	}
}

// take steps over a byte, and blanks before it, if it comes next.
func (c *coordinates) take(b byte) bool {
	for c.at < len(c.text) && strings.IndexByte(" \t\r\n", c.text[c.at]) >= 0 {
		c.at++
	}
	if c.at == len(c.text) || c.text[c.at] != b {
		return false
	}
	c.at++
	return true
}

// number reads a finite number. Blanks before it have been passed by list.
func (c *coordinates) number() float64 {
	start := c.at
	for c.at < len(c.text) && strings.IndexByte("+-.0123456789eE", c.text[c.at]) >= 0 {
		c.at++
	}
	s := string(c.text[start:c.at])
	v, err := strconv.ParseFloat(s, 64)
	switch {
	case math.IsInf(v, 0):
		c.refuse("holds %s, which is not finite", shorten(s))
	case err != nil:
		c.refuse("holds something that is not a number")
	}
	return v
}

// refuse records the first error, with the place being read.
func (c *coordinates) refuse(format string, args ...any) {
	if c.refused != nil {
		return
	}
	var where []string
	for _, p := range c.parts {
		if p.name != "" && p.number > 0 {
			where = append(where, fmt.Sprintf("%s %d", p.name, p.number))
		}
	}
	c.refused = &Error{Part: strings.Join(where, ", "), What: fmt.Sprintf(format, args...), Advice: adviceFormat}
	if len(where) == 0 {
		c.refused.What = "its geometry " + c.refused.What
	}
}

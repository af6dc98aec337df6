package wkt

import (
	"encoding/binary"
	"encoding/hex"
	"fmt"
	"math"
	"strings"

	"github.com/paulmach/orb"
)

// header is the size in bytes of what stands before each geometry: its byte order and kind.
const header = 5

// Flags in the type of an EWKB geometry; the other bits are the kind, and in the thousands the dimensions of ISO.
const (
	flagZ    = 0x80000000
	flagM    = 0x40000000
	flagSRID = 0x20000000
)

// The codes of the kinds (OGC 06-103r4 table 7).
const (
	codePoint = 1 + iota
	codeLine
	codePolygon
	codeMultiPoint
	codeMultiLine
	codeMultiPolygon
)

// codeNames are the names of the kinds by their codes; those behind codeMultiPolygon are not read.
var codeNames = [...]string{"Geometry", "Point", "LineString", "Polygon", "MultiPoint", "MultiLineString", "MultiPolygon", "GeometryCollection",
	"CircularString", "CompoundCurve", "CurvePolygon", "MultiCurve", "MultiSurface", "Curve", "Surface", "PolyhedralSurface", "TIN", "Triangle"}

// bytesReader reads EWKB. After the first error it does nothing more and gives zeros.
type bytesReader struct {
	bytes   []byte
	at      int // byte at which it stands
	before  int // characters of the text before the first digit
	order   binary.ByteOrder
	numbers int  // numbers of a position: 2 to 4
	height  bool // the third is a height
	srid    int
	z       float64
	refused *Error
}

func parseHex(text string) (Place, *Error) {
	digits := text
	for _, prefix := range []string{`\x`, "0x", "0X"} {
		digits = strings.TrimPrefix(digits, prefix)
	}
	before := len(text) - len(digits)
	for i := range len(digits) {
		if !isHex(digits[i]) {
			if i < 2*header {
				return Place{}, &Error{What: "neither WKT nor EWKB in hexadecimal: " + fmt.Sprintf("%q", shorten(text)), Advice: adviceText}
			}
			return Place{}, &Error{At: before + i + 1, What: "a hexadecimal digit was expected", Advice: adviceText}
		}
	}
	if len(digits)%2 != 0 {
		return Place{}, &Error{At: len(text), What: "the number of hexadecimal digits is odd, so the text is cut short", Advice: adviceText}
	}
	b := &bytesReader{before: before}
	b.bytes, _ = hex.DecodeString(digits) // cannot fail: all are digits, and even in number
	code := b.header()
	p := Place{Geometry: b.geometry(code), Z: math.NaN(), SRID: b.srid}
	if code == codePoint && p.Geometry != nil {
		p.Z = b.z
	}
	if b.refused == nil && b.at < len(b.bytes) {
		b.refuse("%d bytes follow the end of the geometry", len(b.bytes)-b.at)
	}
	return p, b.refused
}

func isHex(c byte) bool { return c >= '0' && c <= '9' || c|0x20 >= 'a' && c|0x20 <= 'f' }

// refuse records the first error, at the byte at which the reader stands.
func (b *bytesReader) refuse(format string, args ...any) {
	if b.refused == nil {
		b.refused = &Error{At: b.before + 2*b.at + 1, What: fmt.Sprintf(format, args...), Advice: adviceText}
	}
}

// has reports whether n bytes follow, and refuses the text if not.
func (b *bytesReader) has(n int, what string) bool {
	if b.refused == nil && len(b.bytes)-b.at < n {
		b.refuse("%s was expected, and the text ends", what)
	}
	return b.refused == nil
}

func (b *bytesReader) uint32(what string) uint32 {
	if !b.has(4, what) {
		return 0
	}
	v := b.order.Uint32(b.bytes[b.at:])
	b.at += 4
	return v
}

// header reads the byte order, the kind and dimensions and the reference system of a geometry, and returns its kind.
func (b *bytesReader) header() (code uint32) {
	if !b.has(1, "a byte order") {
		return 0
	}
	switch b.bytes[b.at] {
	case 0:
		b.order = binary.BigEndian
	case 1:
		b.order = binary.LittleEndian
	default:
		b.refuse("a byte order was expected, 00 or 01, and %02x stands there", b.bytes[b.at])
		return 0
	}
	b.at++
	kind := b.uint32("a kind of geometry")
	if b.refused != nil {
		return 0
	}
	b.at -= 4
	code = kind &^ (flagZ | flagM | flagSRID)
	thousands := code / 1000
	code %= 1000
	height, measure := kind&flagZ != 0 || thousands == 1 || thousands == 3, kind&flagM != 0 || thousands == 2 || thousands == 3
	switch {
	case thousands > 3 || code == 0 || int(code) >= len(codeNames):
		b.refuse("%d is not a kind of geometry", kind)
	case code > codeMultiPolygon:
		b.refuse("a %s is not read", codeNames[code])
		b.refused.Advice = adviceOne
	}
	b.at += 4
	b.height, b.numbers = height, 2
	for _, more := range []bool{height, measure} {
		if more {
			b.numbers++
		}
	}
	if kind&flagSRID != 0 {
		b.readSRID()
	}
	return code
}

// readSRID reads the number of a reference system. One that is not positive stands for none, as in spatial databases.
func (b *bytesReader) readSRID() {
	number := int(int32(b.uint32("the number of a reference system")))
	switch {
	case b.refused != nil:
	case number > largestSRID:
		b.at -= 4
		b.refuse("%d is not a number of a reference system (0 to %d)", number, largestSRID)
	case number > 0 && b.srid > 0 && number != b.srid:
		b.at -= 4
		b.refuse("the reference system of a part is %d, and that of the geometry %d", number, b.srid)
	default:
		b.srid = max(b.srid, number)
	}
}

// count reads how many elements follow. One for which the rest of the text is too short is refused before anything is
// allocated for it; least is the size in bytes of the smallest element.
func (b *bytesReader) count(what string, least int) int {
	n := b.uint32("a number of " + what)
	if rest := len(b.bytes) - b.at; b.refused == nil && int64(n) > int64(rest/least) {
		b.at -= 4
		b.refuse("%d %s are announced, and %d bytes follow", n, what, rest)
	}
	if b.refused != nil {
		return 0
	}
	return int(n)
}

// geometry reads what follows the header; nil without positions.
func (b *bytesReader) geometry(code uint32) orb.Geometry {
	if b.refused != nil {
		return nil
	}
	switch code {
	case codePoint:
		if p, there := b.point(); there {
			return p
		}
	case codeLine:
		return orNil(b.line())
	case codePolygon:
		return orNil(b.polygon())
	case codeMultiPoint:
		var points orb.MultiPoint
		b.members(codePoint, "points", header+16, func() {
			if p, there := b.point(); there {
				points = append(points, p)
			}
		})
		return orNil(points)
	case codeMultiLine:
		var lines orb.MultiLineString
		b.members(codeLine, "lines", header+4, func() { lines = appendSome(lines, b.line()) })
		return orNil(lines)
	case codeMultiPolygon:
		var polygons orb.MultiPolygon
		b.members(codePolygon, "polygons", header+4, func() { polygons = appendSome(polygons, b.polygon()) })
		return orNil(polygons)
	}
	return nil
}

// members reads geometries of one kind, each with a header of its own.
func (b *bytesReader) members(want uint32, what string, least int, read func()) {
	for n := b.count(what, least); n > 0 && b.refused == nil; n-- {
		start := b.at
		if code := b.header(); b.refused == nil && code != want {
			b.at = start
			b.refuse("a %s was expected, and a %s stands there", codeNames[want], codeNames[code])
		}
		if b.refused == nil {
			read()
		}
	}
}

// position reads the numbers of a position. They must be finite, unless all are NaN and empty is allowed.
func (b *bytesReader) position(empty bool) (p orb.Point, there bool) {
	if !b.has(8*b.numbers, "a position") {
		return p, false
	}
	var v [4]float64
	for i := range b.numbers {
		v[i] = math.Float64frombits(b.order.Uint64(b.bytes[b.at+8*i:]))
	}
	p, b.z = orb.Point{v[0], v[1]}, math.NaN()
	if b.height {
		b.z = v[2]
	}
	switch {
	case empty && math.IsNaN(p[0]) && math.IsNaN(p[1]):
		b.at += 8 * b.numbers
		return orb.Point{}, false
	case !isFinite(p[0]) || !isFinite(p[1]) || math.IsInf(b.z, 0):
		b.refuse("a position is not finite")
		return orb.Point{}, false
	}
	b.at += 8 * b.numbers
	return p, true
}

func isFinite(v float64) bool { return v-v == 0 }

// point reads a point. One of NaN is empty: EWKB has no other way to write POINT EMPTY.
func (b *bytesReader) point() (orb.Point, bool) { return b.position(true) }

func (b *bytesReader) positions() []orb.Point {
	n := b.count("positions", 8*b.numbers)
	points := make([]orb.Point, 0, n)
	for ; n > 0 && b.refused == nil; n-- {
		p, _ := b.position(false)
		points = append(points, p)
	}
	return points
}

func (b *bytesReader) line() orb.LineString {
	l := orb.LineString(b.positions())
	if what := lineFault(l); len(l) > 0 && what != "" {
		b.refuse("%s", what)
	}
	return l
}

func (b *bytesReader) polygon() (p orb.Polygon) {
	for n := b.count("rings", 4); n > 0 && b.refused == nil; n-- {
		r := orb.Ring(b.positions())
		if what := ringFault(r); b.refused == nil && what != "" {
			b.refuse("%s", what)
			b.refused.Advice = adviceRing
		}
		p = append(p, r)
	}
	return p
}

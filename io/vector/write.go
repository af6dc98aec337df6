package vector

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strconv"

	"drumlin/grids/crs"

	"github.com/paulmach/orb"
)

// Column is a property of every feature written: numbers in Value, or words in Text where Value is nil.
type Column struct {
	Name  string
	Value []float64 // written with 12 significant digits; NaN and infinities, which JSON lacks, as null
	Text  []string
}

// Zone is a named area in a plane.
type Zone struct {
	Name  string
	Shape orb.MultiPolygon // metres, in the plane of the system it is written with; rings closed, the outer one first
}

const badLength = "vector: a column has another length than the features"

const (
	faultKind   = "other-kind"
	adviceKinds = "give points, lines or polygons, one kind a place"
)

// WritePoints writes a point for each of x and y, in metres in the plane of sys, with the columns as properties.
// Coordinates and errors are as in WriteCells. It panics if x, y and the columns differ in length.
func WritePoints(w io.Writer, sys crs.System, x, y []float64, columns []Column) error {
	if len(x) != len(y) {
		panic(badLength)
	}
	out, err := newWriter(w, sys, len(x), columns)
	if err != nil {
		return err
	}
	for row := range x {
		if err := out.feature(row, "", orb.Point{x[row], y[row]}); err != nil {
			return err
		}
	}
	return out.close()
}

// WriteZones writes the zones with their names as the property "zone" and the columns after it. Coordinates and
// errors are as in WriteCells. It panics if a column is not as long as zones.
func WriteZones(w io.Writer, sys crs.System, zones []Zone, columns []Column) error {
	out, err := newWriter(w, sys, len(zones), columns, "zone")
	if err != nil {
		return err
	}
	for row, z := range zones {
		if err := out.polygons(row, z.Name, z.Shape); err != nil {
			return err
		}
	}
	return out.close()
}

// WritePlaces writes the places with their names as the property "place" and the columns after it. A shape is in metres
// in the plane of sys: a Point, MultiPoint, LineString, MultiLineString, Polygon or MultiPolygon, written as the kind it
// is; one that is nil or has no positions is written as null, which is a feature without a location (RFC 7946 section
// 3.2). Coordinates are as in WriteCells; where a line crosses the antimeridian its longitudes run on past 180 or -180,
// as an outline's do, and its middle lies between them. Errors are those of WriteCells, with the name of the place, and
// one for a shape of another kind. It panics if names, shapes and the columns differ in length.
func WritePlaces(w io.Writer, sys crs.System, names []string, shapes []orb.Geometry, columns []Column) error {
	if len(names) != len(shapes) {
		panic(badLength)
	}
	out, err := newWriter(w, sys, len(shapes), columns, "place")
	if err != nil {
		return err
	}
	for row, shape := range shapes {
		if err := out.shape(row, names[row], shape); err != nil {
			return fmt.Errorf("place %q: %w", names[row], err)
		}
	}
	return out.close()
}

// WriteShapes writes shapes that have no names, with the columns as their properties. All else is as in WritePlaces.
func WriteShapes(w io.Writer, sys crs.System, shapes []orb.Geometry, columns []Column) error {
	out, err := newWriter(w, sys, len(shapes), columns)
	if err != nil {
		return err
	}
	for row, shape := range shapes {
		if err := out.shape(row, "", shape); err != nil {
			return fmt.Errorf("shape %d: %w", row+1, err)
		}
	}
	return out.close()
}

// shape writes a feature of any kind.
func (out *writer) shape(row int, name string, shape orb.Geometry) error {
	if shape != nil && shape.Bound().IsEmpty() {
		shape = nil
	}
	return out.feature(row, name, shape)
}

// writer writes a FeatureCollection, one feature a line.
type writer struct {
	to      *bufio.Writer
	sys     crs.System
	globe   bool // coordinates are turned into longitude and latitude
	columns []Column
	keys    [][]byte // the names of the columns as JSON, with the colon
	naming  []byte   // the key of the features' names; nil without one
	line    []byte   // the feature being written
	started bool
}

// newWriter checks the columns and writes the head. The names in reserved are taken.
func newWriter(w io.Writer, sys crs.System, n int, columns []Column, reserved ...string) (*writer, error) {
	out := &writer{to: bufio.NewWriterSize(w, 1<<16)}
	if err := out.describe(sys, n, columns, reserved...); err != nil {
		return nil, err
	}
	_, err := out.to.WriteString(`{"type":"FeatureCollection","features":[`)
	return out, err
}

// describe settles the plane and the properties of the n features that come next.
func (out *writer) describe(sys crs.System, n int, columns []Column, reserved ...string) error {
	out.sys, out.globe, out.columns, out.keys = sys, sys.Geographic(), columns, nil
	taken := map[string]bool{}
	for _, name := range reserved {
		taken[name] = true
		out.naming = append(quote(name), ':')
	}
	for _, c := range columns {
		if c.Value != nil && len(c.Value) != n || c.Value == nil && len(c.Text) != n {
			panic(badLength)
		}
		// "The names within an object SHOULD be unique" (RFC 8259 section 4): readers differ in what they make of others.
		if taken[c.Name] {
			return fmt.Errorf("two columns are called %q", c.Name)
		}
		taken[c.Name] = true
		out.keys = append(out.keys, append(quote(c.Name), ':'))
	}
	return nil
}

// quote writes a string as JSON. Characters that matter only inside HTML are left as they are.
func quote(s string) []byte {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.Encode(s) // cannot fail: a string into memory
	return bytes.TrimSuffix(b.Bytes(), []byte("\n"))
}

// polygons writes one feature: a Polygon if the shape is a single one, a MultiPolygon otherwise.
func (out *writer) polygons(row int, name string, shape orb.MultiPolygon) error {
	if len(shape) == 1 {
		return out.feature(row, name, shape[0])
	}
	return out.feature(row, name, shape)
}

// feature writes one feature with points or areas of the plane.
func (out *writer) feature(row int, name string, shape orb.Geometry) error {
	written, err := out.turned(shape)
	if err != nil {
		return err
	}
	return out.put(row, name, written)
}

// put writes one feature with a geometry as turned gives it.
func (out *writer) put(row int, name string, written orb.Geometry) error {
	out.begin(row, name)
	out.geometry(written)
	return out.end()
}

// turned returns a shape of the plane as it is written, each part on its own side of the antimeridian.
func (out *writer) turned(shape orb.Geometry) (orb.Geometry, error) {
	switch shape := shape.(type) {
	case nil:
		return nil, nil
	case orb.Point:
		return out.outward(shape)
	case orb.MultiPoint:
		return each(shape, out.outward)
	case orb.LineString:
		return out.path(shape)
	case orb.MultiLineString:
		return each(shape, out.path)
	case orb.Polygon:
		return out.polygon(shape)
	case orb.MultiPolygon:
		return each(shape, out.polygon)
	}
	return nil, &Fault{faultKind, &Error{What: fmt.Sprintf("a %s is not written", shape.GeoJSONType()), Advice: adviceKinds}}
}

// each turns the parts of a shape, and returns the first error.
func each[S ~[]P, P any](parts S, turn func(P) (P, error)) (S, error) {
	written := make(S, len(parts))
	for i, part := range parts {
		var err error
		if written[i], err = turn(part); err != nil {
			return nil, err
		}
	}
	return written, nil
}

// path returns a line as it is written. It is not cut at the antimeridian either, for the reasons polygon has.
func (out *writer) path(line orb.LineString) (orb.LineString, error) {
	written, err := each(line, out.outward)
	if err == nil && out.globe {
		shift(unroll(orb.Ring(written)), 0) // both in place
	}
	return written, err
}

// begin starts a feature with its properties. They come before the geometry so that a person paging through the file
// sees them.
func (out *writer) begin(row int, name string) {
	if out.started {
		out.line = append(out.line, ',')
	}
	out.started = true
	out.line = append(out.line, "\n"+`{"type":"Feature","properties":{`...)
	if out.naming != nil {
		out.line = append(out.line, out.naming...)
		out.line = append(out.line, quote(name)...)
	}
	for i, c := range out.columns {
		if i > 0 || out.naming != nil {
			out.line = append(out.line, ',')
		}
		out.line = append(out.line, out.keys[i]...)
		switch {
		case c.Value == nil:
			out.line = append(out.line, quote(c.Text[row])...)
		case math.IsNaN(c.Value[row]) || math.IsInf(c.Value[row], 0):
			out.line = append(out.line, "null"...)
		default:
			out.line = strconv.AppendFloat(out.line, c.Value[row], 'g', 12, 64)
		}
	}
	out.line = append(out.line, `},`...)
}

// end closes the feature and hands the line on.
func (out *writer) end() error {
	out.line = append(out.line, '}')
	_, err := out.to.Write(out.line)
	out.line = out.line[:0]
	return err
}

func (out *writer) close() error {
	out.to.WriteString("\n]}\n") // Flush gives the error
	return out.to.Flush()
}

// geometry writes what turned gave, null for nil.
func (out *writer) geometry(g orb.Geometry) {
	out.line = append(out.line, `"geometry":`...)
	if g == nil {
		out.line = append(out.line, "null"...)
		return
	}
	out.line = append(append(append(out.line, `{"type":"`...), g.GeoJSONType()...), `","coordinates":`...)
	switch g := g.(type) {
	case orb.Point:
		out.position(g)
	case orb.MultiPoint:
		positions(out, g)
	case orb.LineString:
		positions(out, g)
	case orb.MultiLineString:
		list(out, g, positions)
	case orb.Polygon:
		rings(out, g)
	case orb.MultiPolygon:
		list(out, g, rings)
	}
	out.line = append(out.line, '}')
}

func rings(out *writer, p orb.Polygon)              { list(out, p, positions) }
func positions[L ~[]orb.Point](out *writer, line L) { list(out, line, (*writer).position) }

// list writes parts between brackets.
func list[P any](out *writer, parts []P, write func(*writer, P)) {
	out.line = append(out.line, '[')
	for i, part := range parts {
		out.comma(i)
		write(out, part)
	}
	out.line = append(out.line, ']')
}

func (out *writer) comma(i int) {
	if i > 0 {
		out.line = append(out.line, ',')
	}
}

func (out *writer) position(p orb.Point) {
	out.line = append(out.line, '[')
	out.number(p[0])
	out.line = append(out.line, ',')
	out.number(p[1])
	out.line = append(out.line, ']')
}

// number writes a coordinate: 7 decimals of a degree, which is about a centimetre (RFC 7946 section 11.2 weighs 6
// against the size of the file), or 15 significant digits of metres, which keep a unit square as well as a country.
func (out *writer) number(v float64) {
	v += 0 // no minus before a zero
	if !out.globe {
		out.line = strconv.AppendFloat(out.line, v, 'g', 15, 64)
		return
	}
	out.line = strconv.AppendFloat(out.line, v, 'f', degreeDecimals, 64)
	out.line = bytes.TrimRight(out.line, "0")
	out.line = bytes.TrimSuffix(out.line, []byte("."))
}

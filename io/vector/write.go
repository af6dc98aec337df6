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
		p, err := out.outward(orb.Point{x[row], y[row]})
		if err != nil {
			return err
		}
		out.begin(row, "")
		out.line = append(out.line, `"geometry":{"type":"Point","coordinates":`...)
		out.position(p)
		if err := out.end(); err != nil {
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

// writer writes a FeatureCollection, one feature a line.
type writer struct {
	to      *bufio.Writer
	sys     crs.System
	globe   bool // coordinates are turned into longitude and latitude
	columns []Column
	keys    [][]byte // the names of the columns as JSON, with the colon
	zone    []byte   // the key of the zone's name; nil without one
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
		out.zone = append(quote(name), ':')
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
func (out *writer) polygons(row int, zone string, shape orb.MultiPolygon) error {
	parts := make(orb.MultiPolygon, len(shape))
	for i, p := range shape {
		var err error
		if parts[i], err = out.polygon(p); err != nil {
			return err
		}
	}
	out.begin(row, zone)
	if len(parts) == 1 {
		out.line = append(out.line, `"geometry":{"type":"Polygon","coordinates":`...)
		out.rings(parts[0])
		return out.end()
	}
	out.line = append(out.line, `"geometry":{"type":"MultiPolygon","coordinates":[`...)
	for i, p := range parts {
		out.comma(i)
		out.rings(p)
	}
	out.line = append(out.line, ']')
	return out.end()
}

// begin starts a feature with its properties. They come before the geometry so that a person paging through the file
// sees them.
func (out *writer) begin(row int, zone string) {
	if out.started {
		out.line = append(out.line, ',')
	}
	out.started = true
	out.line = append(out.line, "\n"+`{"type":"Feature","properties":{`...)
	if out.zone != nil {
		out.line = append(out.line, out.zone...)
		out.line = append(out.line, quote(zone)...)
	}
	for i, c := range out.columns {
		if i > 0 || out.zone != nil {
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

// end closes the geometry and the feature and hands the line on.
func (out *writer) end() error {
	out.line = append(out.line, `}}`...)
	_, err := out.to.Write(out.line)
	out.line = out.line[:0]
	return err
}

func (out *writer) close() error {
	out.to.WriteString("\n]}\n") // Flush gives the error
	return out.to.Flush()
}

func (out *writer) rings(p orb.Polygon) {
	out.line = append(out.line, '[')
	for i, ring := range p {
		out.comma(i)
		out.line = append(out.line, '[')
		for j, point := range ring {
			out.comma(j)
			out.position(point)
		}
		out.line = append(out.line, ']')
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

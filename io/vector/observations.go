package vector

import (
	"io"
	"slices"

	"github.com/paulmach/orb"
)

// maxNames bounds the properties that differ in name, and with them the width of a table made of features.
const maxNames = 4096

const (
	adviceFeatures = "give a GeoJSON file (RFC 7946) of features, one FeatureCollection or one feature a line"
	adviceSkip     = "correct the geometry of the feature, or leave the feature out"
	adviceMixed    = "give each feature one geometry: split the collection into features, each with the same properties"
)

// Observations are the features of a GeoJSON text as rows of a table. All slices but Names have one entry a feature,
// in the order of the text; the feature of row i is number i+1 in messages.
type Observations struct {
	Source string   // the name the source was given, as in messages
	CRS    string   // name in the "crs" member that RFC 7946 dropped and many files have; empty without one
	Names  []string // the properties of all features, each once, in the order in which they first appear

	Line     []int32        // line of the text on which the feature starts
	Geometry []orb.Geometry // a Point, MultiPoint, LineString, MultiLineString, Polygon or MultiPolygon, never empty; nil with a fault
	Z        []float64      // third coordinate of a Point; NaN without one, for other kinds and with a fault
	Fault    []*Fault       // why the feature has no geometry; nil where it has one

	rows  []row
	cells []cell // of all rows, one after the other
}

// row is what is kept of the properties of a feature: its own texts end to end, cut by its cells.
type row struct {
	text  string
	cells int // where its cells end; they start where those of the row before end
}

// cell is where the text of a property ends in its row.
type cell struct {
	name int32 // index into Names, or idCell
	end  uint32
}

// idCell marks the member "id" of a feature among its properties.
const idCell = -1

// Len returns the number of features.
func (o *Observations) Len() int { return len(o.rows) }

// Cells writes the properties of the feature at row i, from 0, to dst, one for each of Names, and returns it; dst is
// grown if it is too short, and may be nil. Numbers, true and false are written as they stand in the text, strings
// without quotes and escapes, lists and objects as JSON without blanks. A property is "" where it is absent or null,
// and where it was not to be kept.
func (o *Observations) Cells(dst []string, i int) []string {
	dst = slices.Grow(dst[:0], len(o.Names))[:len(o.Names)]
	clear(dst)
	o.each(i, func(name int32, text string) {
		if name != idCell {
			dst[name] = text
		}
	})
	return dst
}

// ID returns the member "id" of the feature at row i, from 0, written as Cells writes properties; "" without one.
func (o *Observations) ID(i int) (id string) {
	o.each(i, func(name int32, text string) {
		if name == idCell {
			id = text
		}
	})
	return id
}

// each calls do for the cells of a row. Of properties that share a name the last one counts, as in encoding/json.
func (o *Observations) each(i int, do func(name int32, text string)) {
	first, start := 0, uint32(0)
	if i > 0 {
		first = o.rows[i-1].cells
	}
	for _, c := range o.cells[first:o.rows[i].cells] {
		do(c.name, o.rows[i].text[start:c.end])
		start = c.end
	}
}

// ReadObservations reads the features of a GeoJSON text: a FeatureCollection, a Feature, a bare geometry (a feature
// without properties), or several of them one after the other, as with one feature a line or in a sequence with record
// separators (RFC 8142). There is at least one feature in what it returns. The source is the name of the file in
// messages. The properties kept are those for which keep returns true; all of them if keep is nil.
//
// Rings are closed, of 4 positions or more, and turned by Orient. A feature whose geometry is null, empty or breaks
// RFC 7946 section 3.1 has a fault instead of a geometry. An *Error is returned for what is not GeoJSON in UTF-8, for a
// GeometryCollection, for features that disagree in their "crs", for more than 4096 names of properties, and for a
// feature beyond 64 MiB or nested more than 64 deep. Beside one feature it holds what it returns.
func ReadObservations(r io.Reader, source string, keep func(name string) bool) (*Observations, error) {
	return readObservations(r, source, keep, maxFeature)
}

func readObservations(r io.Reader, source string, keep func(name string) bool, limit int) (*Observations, error) {
	p, err := newPieces(r, source, limit)
	if err != nil {
		return nil, err
	}
	f := &features{pieces: p, out: &Observations{Source: source}, keep: keep, known: map[string]property{}}
	for {
		c, err := p.peek(true)
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		if c != '{' {
			return nil, f.notObject(c)
		}
		if err := f.readText(); err != nil {
			return nil, err
		}
	}
	if f.out.Len() == 0 {
		return nil, &Error{File: source, What: "the file has no features", Advice: adviceWhole}
	}
	return f.out, nil
}

// notObject refuses what should be a GeoJSON object and starts with another byte than a brace.
func (f *features) notObject(c byte) error {
	f.feature = 0
	switch {
	case c == '[':
		return f.refuse(f.line, adviceFeatures, "the text is a list, not a GeoJSON object")
	case c == ',' && f.out.Len() > 0:
		return f.refuse(f.line, "put the features into a FeatureCollection, or leave out the commas between them",
			"a comma stands between two GeoJSON objects")
	}
	return f.refuse(f.line, adviceFeatures, "the text is not a GeoJSON object: it starts with %q", rune(c))
}

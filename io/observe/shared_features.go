package observe

import (
	"bytes"
	"encoding/binary"
	"io"
	"math"
	"slices"

	"drumlin/io/vector"

	"github.com/paulmach/orb"
)

// heldFeatures is a GeoJSON text as its features.
type heldFeatures struct {
	from   *vector.Observations
	crs    string
	sorted []int   // the properties by their names
	sizes  []int32 // of the rows
}

// wholeFeatures reads a GeoJSON text to its end.
func wholeFeatures(decoded io.Reader, from *origin) (*Shared, error) {
	o, err := openFeatures(decoded, from, nil)
	if err != nil {
		return nil, err
	}
	s := &Shared{header: featureHeader(o, from), rows: o.Len()}
	h := &heldFeatures{from: o, crs: s.header.shapes.crs, sorted: make([]int, len(o.Names)), sizes: make([]int32, o.Len())}
	for i := range h.sorted {
		h.sorted[i] = i
	}
	slices.SortFunc(h.sorted, func(a, b int) int { return bytes.Compare([]byte(o.Names[a]), []byte(o.Names[b])) })
	s.text = h
	var row []byte
	for i := range h.sizes {
		row = h.appendRow(row[:0], i)
		h.sizes[i] = int32(len(row)) // a feature is far smaller than 1 GiB
		s.bytes += len(row)
	}
	return s, nil
}

// endOfText is a byte that no text has.
const endOfText = 0xff

func (h *heldFeatures) appendHead(to []byte) []byte { return append(append(to, h.crs...), endOfText) }

// appendRow appends the identifier, the properties by their names, and the geometry of a feature. What the properties
// of other features are called, and in which order properties come, makes no difference.
func (h *heldFeatures) appendRow(to []byte, row int) []byte {
	o := h.from
	to = append(append(to, o.ID(row)...), endOfText)
	cells := o.Cells(nil, row)
	for _, i := range h.sorted {
		if cells[i] != "" {
			to = append(append(to, o.Names[i]...), endOfText)
			to = append(append(to, cells[i]...), endOfText)
		}
	}
	if o.Geometry[row] == nil {
		p := siteOf(o, row)
		return append(append(append(to, p.code...), p.reason...), endOfText)
	}
	return appendNumber(appendGeometry(to, o.Geometry[row]), o.Z[row])
}

// appendGeometry appends the kind and the positions of a geometry, each list of them with its length before it.
func appendGeometry(to []byte, g orb.Geometry) []byte {
	to = append(append(to, g.GeoJSONType()...), endOfText)
	switch g := g.(type) {
	case orb.Point:
		to = appendPositions(to, []orb.Point{g})
	case orb.MultiPoint:
		to = appendPositions(to, g)
	case orb.LineString:
		to = appendPositions(to, g)
	case orb.MultiLineString:
		to = appendCount(to, len(g))
		for _, l := range g {
			to = appendPositions(to, l)
		}
	case orb.Polygon:
		to = appendCount(to, len(g))
		for _, r := range g {
			to = appendPositions(to, r)
		}
	case orb.MultiPolygon:
		to = appendCount(to, len(g))
		for _, p := range g {
			to = appendGeometry(to, p)
		}
	}
	return to
}

func appendPositions(to []byte, points []orb.Point) []byte {
	to = appendCount(to, len(points))
	for _, p := range points {
		to = appendNumber(appendNumber(to, p[0]), p[1])
	}
	return to
}

func appendCount(to []byte, n int) []byte { return binary.LittleEndian.AppendUint64(to, uint64(n)) }

func appendNumber(to []byte, v float64) []byte {
	return binary.LittleEndian.AppendUint64(to, math.Float64bits(v))
}

func (h *heldFeatures) size(row int) int { return int(h.sizes[row]) }

func (h *heldFeatures) records(p Part) records { return &featureRecords{from: h.from, part: p} }

// values reads single properties; at is an index of Names, atHeight or atID.
func (h *heldFeatures) values(at int, each func(value []byte, row, line int)) error {
	var cells []string
	for i := range h.sizes {
		var value string
		switch at {
		case atHeight:
			value = heightText(h.from.Z[i])
		case atID:
			value = h.from.ID(i)
		default:
			cells = h.from.Cells(cells, i)
			value = cells[at]
		}
		each(bytes.TrimSpace([]byte(value)), i, int(h.from.Line[i]))
	}
	return nil
}

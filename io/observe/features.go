package observe

import (
	"errors"
	"io"
	"math"
	"slices"
	"strings"

	"drumlin/io/vector"
)

// readFeatures makes a table of the features of a decoded GeoJSON text.
func readFeatures(decoded io.Reader, from *origin, want Request) (*Table, error) {
	o, err := openFeatures(decoded, from, want.asks)
	if err != nil {
		return nil, err
	}
	return readTable(featureHeader(o, from), want, &featureRecords{from: o, part: Part{Rows: o.Len()}})
}

// openFeatures reads the features of a decoded GeoJSON text and the properties that are to be kept.
func openFeatures(decoded io.Reader, from *origin, keep func(name string) bool) (*vector.Observations, error) {
	o, err := vector.ReadObservations(decoded, from.source, keep)
	return o, featureError(err)
}

// featureError turns an error of the reader of features into one of this package.
func featureError(err error) error {
	if placed, ok := errors.AsType[*Error](err); ok {
		return placed // of the reader underneath
	}
	e, ok := errors.AsType[*vector.Error](err)
	if !ok {
		return err
	}
	advice := e.Advice
	for _, word := range []string{"invalid character 'N'", "invalid character 'I'"} {
		if strings.Contains(e.What, word) {
			advice = "JSON has no NaN and no infinite numbers: write null where there is no value"
		}
	}
	return &Error{File: e.File, Line: e.Line, Row: e.Feature, What: withPart(e), Advice: advice, Cause: e.Cause}
}

// withPart says what is wrong, and in which part of the geometry.
func withPart(e *vector.Error) string {
	return strings.TrimPrefix(e.Part+": "+e.What, ": ")
}

// featureHeader takes the names of properties for those of columns.
func featureHeader(o *vector.Observations, from *origin) header {
	h := header{source: from.source, names: o.Names, origin: from, shapes: &shapes{crs: vector.PlainCode(o.CRS)},
		heights: slices.ContainsFunc(o.Z, func(z float64) bool { return !math.IsNaN(z) })}
	for i := 0; i < o.Len() && !h.ids; i++ {
		h.ids = o.ID(i) != ""
	}
	return h
}

// featureRecords gives the features of a part as records.
type featureRecords struct {
	from  *vector.Observations
	part  Part
	at    int // features given so far
	cells []string
	site  site
}

func (f *featureRecords) next() (record, error) {
	if f.at == f.part.Rows {
		return record{}, io.EOF
	}
	i := f.part.row(f.at)
	f.at++
	f.cells = f.from.Cells(f.cells, i)
	f.site = siteOf(f.from, i)
	return record{fields: f.cells, line: int(f.from.Line[i]), row: i + 1, site: &f.site}, nil
}

// siteOf returns where the feature at row i, from 0, is.
func siteOf(o *vector.Observations, i int) site {
	p := site{geometry: o.Geometry[i], z: o.Z[i], id: o.ID(i)}
	switch fault := o.Fault[i]; {
	case fault == nil:
		return p.checked()
	case fault.Code == faultGeometry:
		p.code, p.reason = faultGeometry, reasonGeometry+": "+strings.TrimPrefix(withPart(fault.At), "its geometry ")
	default: // there is none, or none with a position
		p.code, p.reason = faultNoGeometry, "geometry is missing"
	}
	return p
}

package vector

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"unicode/utf8"

	"github.com/paulmach/orb"
)

const (
	// maxBytes bounds a text, which is held in memory while it is read.
	maxBytes = 256 << 20
	// maxDepth bounds the nesting of braces and brackets. The coordinates of a multipolygon in a collection take 8.
	maxDepth = 64
)

const (
	adviceFormat = "give a GeoJSON file (RFC 7946) of polygons"
	adviceWhole  = "check that this is the right file and that it was written completely"
)

// Shapes is the content of a GeoJSON text of polygons, in the order of the text.
type Shapes struct {
	Source   string // the name the source was given, as in messages
	CRS      string // name in the "crs" member that RFC 7946 dropped and many files have; empty without one
	Features []Feature
}

// Feature is a polygon, or several that belong together, with its properties.
type Feature struct {
	Index      int              // position in the text, from 0; messages count from 1
	ID         any              // the member "id": a string, a json.Number, or nil
	Properties map[string]any   // as decoded by encoding/json, numbers as json.Number; nil where there are none
	Shape      orb.MultiPolygon // rings as found: closed, of 4 positions or more, in either direction; heights are dropped
}

// Bound returns the smallest box around all features.
func (s *Shapes) Bound() orb.Bound {
	b := s.Features[0].Shape.Bound()
	for _, f := range s.Features[1:] {
		b = b.Union(f.Shape.Bound())
	}
	return b
}

// ReadPolygons reads a FeatureCollection, a Feature or a bare geometry of type Polygon or MultiPolygon. There is at
// least one feature in what it returns. The source is the name of the file in messages.
//
// An *Error is returned for malformed JSON, for any other kind of geometry or none, for rings that are not closed or
// have fewer than 4 positions (RFC 7946 section 3.1.6), and for a text beyond 256 MiB or nested more than 64 deep.
func ReadPolygons(r io.Reader, source string) (*Shapes, error) {
	return readPolygons(r, source, maxBytes)
}

func readPolygons(r io.Reader, source string, limit int64) (*Shapes, error) {
	text, err := readText(r, source, limit)
	if err != nil {
		return nil, err
	}
	top, err := object(text)
	if err != nil {
		return nil, &Error{File: source, What: "the text is not a GeoJSON object", Advice: adviceFormat}
	}
	s := &Shapes{Source: source, CRS: crsName(top["crs"])}
	features, err := s.members(text, top)
	if err != nil {
		return nil, err
	}
	for i, raw := range features {
		f, err := readFeature(raw, i)
		if err != nil {
			err.File, err.Feature = source, i+1
			return nil, err
		}
		s.Features = append(s.Features, f)
	}
	return s, nil
}

// readText reads all of r and makes sure that it is JSON that can be taken apart safely.
func readText(r io.Reader, source string, limit int64) ([]byte, error) {
	text, err := io.ReadAll(io.LimitReader(r, limit+1))
	if err != nil {
		return nil, &Error{File: source, What: "cannot be read: " + err.Error(), Cause: err}
	}
	read := len(text)
	text = bytes.TrimPrefix(text, []byte("\xef\xbb\xbf"))
	switch {
	case int64(read) > limit:
		return nil, &Error{File: source, What: fmt.Sprintf("the file is larger than %d bytes, the most that is read", limit),
			Advice: "leave out what lies outside the study area, or simplify the outlines"}
	case len(bytes.TrimSpace(text)) == 0:
		return nil, &Error{File: source, What: "the file is empty", Advice: adviceWhole}
	case bytes.HasPrefix(text, []byte("\xff\xfe")), bytes.HasPrefix(text, []byte("\xfe\xff")), bytes.IndexByte(text, 0) >= 0:
		return nil, &Error{File: source, What: "the file holds UTF-16 text or is not text, and only UTF-8 is read", Advice: adviceFormat}
	}
	if at := tooDeep(text); at >= 0 {
		return nil, &Error{File: source, Line: lineOf(text, at), What: fmt.Sprintf("nested more than %d deep", maxDepth), Advice: adviceFormat}
	}
	if at := firstInvalid(text); at >= 0 {
		return nil, &Error{File: source, Line: lineOf(text, at), What: "the text is not UTF-8", Advice: "save the file in UTF-8"}
	}
	// Nothing is kept of this pass; it is there for the place of an error, which later passes know only within a feature.
	var syntax *json.SyntaxError
	if err := json.Unmarshal(text, &struct{}{}); errors.As(err, &syntax) {
		return nil, &Error{File: source, Line: lineOf(text, int(syntax.Offset)-1), Advice: adviceWhole, Cause: err,
			What: fmt.Sprintf("not JSON at byte %d: %s", int(syntax.Offset)+read-len(text), syntax)}
	}
	return text, nil
}

// tooDeep returns the place where braces and brackets are nested too deeply, or -1.
func tooDeep(text []byte) int {
	depth, quoted := 0, false
	for i := 0; i < len(text); i++ {
		switch c := text[i]; {
		case quoted && c == '\\':
			i++
		case c == '"':
			quoted = !quoted
		case quoted:
		case c == '{' || c == '[':
			if depth++; depth > maxDepth {
				return i
			}
		case c == '}' || c == ']':
			depth--
		}
	}
	return -1
}

// firstInvalid returns the place of the first byte that is not UTF-8, or -1.
func firstInvalid(text []byte) int {
	if utf8.Valid(text) {
		return -1
	}
	for i := 0; ; {
		r, size := utf8.DecodeRune(text[i:])
		if r == utf8.RuneError && size == 1 {
			return i
		}
		i += size
	}
}

// lineOf returns the line on which byte number at stands, both from 0 up but the line counted from 1.
func lineOf(text []byte, at int) int {
	at = max(0, min(at, len(text)))
	return 1 + bytes.Count(text[:at], []byte{'\n'})
}

// object takes an object apart. It is stricter than decoding into a struct, which takes "TYPE" for "type".
func object(raw []byte) (map[string]json.RawMessage, error) {
	var members map[string]json.RawMessage
	if err := json.Unmarshal(raw, &members); err != nil {
		return nil, err
	}
	if members == nil {
		return nil, errors.New("null")
	}
	return members, nil
}

// word returns a member that is a string, and "" for any other.
func word(raw json.RawMessage) string {
	var s string
	if json.Unmarshal(raw, &s) != nil {
		return ""
	}
	return s
}

// members returns the features of the text; a bare geometry counts as one feature without properties.
func (s *Shapes) members(whole json.RawMessage, top map[string]json.RawMessage) ([]json.RawMessage, error) {
	switch kind := word(top["type"]); kind {
	case "FeatureCollection":
		var features []json.RawMessage
		if err := json.Unmarshal(top["features"], &features); err != nil || features == nil {
			return nil, &Error{File: s.Source, What: `the FeatureCollection has no list of "features"`, Advice: adviceFormat}
		}
		if len(features) == 0 {
			return nil, &Error{File: s.Source, What: "the FeatureCollection is empty", Advice: adviceFormat}
		}
		return features, nil
	case "Feature":
		return []json.RawMessage{whole}, nil
	case "Polygon", "MultiPolygon":
		return []json.RawMessage{enclose(`{"type":"Feature","geometry":`, whole, `}`)}, nil
	case "":
		return nil, &Error{File: s.Source, What: `the object has no "type", so it is not GeoJSON`, Advice: adviceFormat}
	default:
		return nil, &Error{File: s.Source, What: fmt.Sprintf("the object is a %q, not polygons", shorten(kind)), Advice: adviceFormat}
	}
}

// enclose puts text around a value.
func enclose(before string, raw json.RawMessage, after string) json.RawMessage {
	return append(append([]byte(before), raw...), after...)
}

// crsName returns the name in a "crs" member of the 2008 GeoJSON specification (section 3.1), the whole member where
// it names none, and "" where there is none.
func crsName(raw json.RawMessage) string {
	if len(raw) == 0 || string(raw) == "null" {
		return ""
	}
	var named struct {
		Properties struct {
			Name string `json:"name"`
		} `json:"properties"`
	}
	if json.Unmarshal(raw, &named) == nil && named.Properties.Name != "" {
		return named.Properties.Name
	}
	return shorten(string(raw))
}

// readFeature reads one feature. Its error lacks the file and the feature's number.
func readFeature(raw json.RawMessage, index int) (Feature, *Error) {
	f := Feature{Index: index}
	members, err := object(raw)
	if err != nil || word(members["type"]) != "Feature" {
		return f, &Error{What: `not an object of type "Feature"`, Advice: adviceFormat}
	}
	decoder := json.NewDecoder(bytes.NewReader(enclose(`[`, orNull(members["properties"]), `]`)))
	decoder.UseNumber()
	var properties []map[string]any
	if decoder.Decode(&properties) != nil {
		return f, &Error{What: `its "properties" are not an object`, Advice: adviceFormat}
	}
	f.Properties = properties[0]
	if f.ID, err = readID(members["id"]); err != nil {
		return f, &Error{What: `its "id" is neither a string nor a number`, Advice: adviceFormat}
	}
	shape, refused := readGeometry(members["geometry"])
	f.Shape = shape
	return f, refused
}

func orNull(raw json.RawMessage) json.RawMessage {
	if len(raw) == 0 {
		return json.RawMessage("null")
	}
	return raw
}

// readID reads the member "id" of a feature, "either a JSON string or number" (RFC 7946 section 3.2).
func readID(raw json.RawMessage) (any, error) {
	decoder := json.NewDecoder(bytes.NewReader(orNull(raw)))
	decoder.UseNumber()
	var id any
	if err := decoder.Decode(&id); err != nil {
		return nil, err
	}
	switch id.(type) {
	case nil, string, json.Number:
		return id, nil
	}
	return nil, errors.New("neither a string nor a number")
}

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

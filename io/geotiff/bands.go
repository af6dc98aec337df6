package geotiff

import (
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
)

// bandsOf reads names, scales and the value of cells without data. Both tags are common practice, not part of a
// standard: a text with a number, and a small XML text of items by band.
func (f *file) bandsOf(d directory, l *layout) ([]Band, error) {
	bands := make([]Band, l.bands)
	for i := range bands {
		bands[i] = Band{Name: fmt.Sprintf("band%d", i+1), Kind: l.kind, Scale: 1}
	}
	text, err := f.text(d, tagNoData)
	if err != nil {
		return nil, err
	}
	if text = strings.TrimSpace(text); text != "" {
		v, err := strconv.ParseFloat(text, 64)
		if err != nil && !errors.Is(err, strconv.ErrRange) {
			return nil, f.refuse("write the raster again with a number for cells without data", "marks cells without data by %q, which is not a number", clean(text))
		}
		for i := range bands {
			bands[i].NoData, bands[i].HasNoData = v, true
		}
	}
	if text, err = f.text(d, tagMetadata); err != nil {
		return nil, err
	}
	return bands, f.describe(bands, text)
}

// describe takes what the items say of the bands. A text that is no XML is refused: it might say how values are scaled.
func (f *file) describe(bands []Band, text string) error {
	decoder := xml.NewDecoder(strings.NewReader(strings.ToValidUTF8(text, "\uFFFD")))
	decoder.CharsetReader = func(_ string, r io.Reader) (io.Reader, error) { return r, nil }
	for {
		token, err := decoder.Token()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return &Error{File: f.name, What: "describes its bands in XML that cannot be read", Advice: adviceRewrite, Cause: err}
		}
		start, ok := token.(xml.StartElement)
		if !ok || start.Name.Local != "Item" {
			continue
		}
		var value string
		if err := decoder.DecodeElement(&value, &start); err != nil {
			return &Error{File: f.name, What: "describes its bands in XML that cannot be read", Advice: adviceRewrite, Cause: err}
		}
		if err := f.take(bands, start, value); err != nil {
			return err
		}
	}
}

// take applies one item: a description, a scale or an offset of a band.
func (f *file) take(bands []Band, item xml.StartElement, value string) error {
	attribute := map[string]string{}
	for _, a := range item.Attr {
		attribute[a.Name.Local] = a.Value
	}
	sample, err := strconv.Atoi(attribute["sample"])
	if err != nil || sample < 0 || sample >= len(bands) {
		return nil
	}
	band, role := &bands[sample], attribute["role"]
	switch role {
	case "description": // escaped once more than XML asks
		unescaped := strings.NewReplacer("&amp;", "&", "&lt;", "<", "&gt;", ">", "&quot;", `"`, "&apos;", "'")
		if name := clean(unescaped.Replace(value)); name != "" {
			band.Name = name
		}
	case "scale", "offset":
		v, err := strconv.ParseFloat(strings.TrimSpace(value), 64)
		if err != nil || math.IsInf(v, 0) || math.IsNaN(v) || role == "scale" && v == 0 {
			return f.refuse(adviceRewrite, "gives band %d the %s %q, which is not a number to count with", sample+1, role, clean(value))
		}
		if role == "scale" {
			band.Scale = v
		} else {
			band.Offset = v
		}
	}
	return nil
}

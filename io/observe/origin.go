package observe

import (
	"bufio"
	"io"
	"strings"
)

// origin is where a table comes from and how it is written there.
type origin struct {
	source    string
	format    Format
	separator rune
	features  bool     // it is GeoJSON, not a table in columns
	blank     bool     // there is something in it, if only ends of lines
	announced bool     // the first line of a table names the separator and nothing else
	first     []row    // the first records of a table, the header before them
	text      *decoder // knows the encoding as far as it has been read
}

func (o *origin) encoding() string { return o.text.encoding() }

// notText says what a field that is not clean is not.
func (o *origin) notText(field string) string {
	switch encoding := o.encoding(); {
	case o.features:
		return "not text: it holds a NUL character"
	case encoding == windows1252 && strings.IndexByte(field, 0) < 0:
		return "neither UTF-8 nor Windows-1252 text"
	case encoding == utf16Little || encoding == utf16Big:
		return "not UTF-16 text"
	}
	return "not UTF-8 text"
}

// openOrigin returns the text of a file, unpacked and in UTF-8 without a byte order mark. It refuses what is no text
// by the first headSize bytes.
func openOrigin(r io.Reader, source string, format Format) (io.Reader, *origin, error) {
	from := newLasting(r)
	if start, _ := from.Peek(len(gzipMark)); string(start) == gzipMark {
		unpacked, err := unpack(from, source)
		if err != nil {
			return nil, nil, err
		}
		from = newLasting(unpacked)
	}
	head, err := from.Peek(headSize)
	if err != nil && err != io.EOF && len(head) == 0 {
		return nil, nil, readError(source, err)
	}
	if what, advice := notTable(head); what != "" {
		return nil, nil, &Error{File: source, What: what, Advice: advice}
	}
	o := &origin{source: source, format: format, features: startsFeatures(head)}
	if o.features {
		o.format.Separator, o.format.DecimalComma = 0, false
	}
	text := decode(from, head, source)
	o.text = text
	return text, o, nil
}

// lasting repeats an error for ever, since a buffer above it may ask again.
type lasting struct {
	from io.Reader
	err  error
}

// newLasting returns a buffer with room for the head of a file.
func newLasting(from io.Reader) *bufio.Reader {
	return bufio.NewReaderSize(&lasting{from: from}, headSize)
}

func (l *lasting) Read(p []byte) (int, error) {
	if l.err != nil {
		return 0, l.err
	}
	n, err := l.from.Read(p)
	l.err = err
	return n, err
}

package observe

import (
	"bufio"
	"bytes"
	"io"
	"strings"
)

// origin is where a table comes from and how it is written there.
type origin struct {
	source    string
	format    Format
	separator rune
	features  bool     // it is GeoJSON, not a table in columns
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
	if what, advice := notText(head); what != "" {
		return nil, nil, &Error{File: source, What: what, Advice: advice}
	}
	o := &origin{source: source, format: format, features: startsFeatures(head)}
	if o.features {
		o.format.Separator, o.format.DecimalComma = 0, false
	}
	text := decode(from, head)
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

const gzipMark = "\x1f\x8b"

// notText names a file that is something other than text, by its first bytes.
func notText(head []byte) (what, advice string) {
	if len(head) == 0 {
		return "the file is empty", adviceWhole
	}
	for _, known := range []struct{ mark, what string }{
		{"PK\x03\x04", "a spreadsheet or a zip archive, not a CSV table"},
		{"\xd0\xcf\x11\xe0", "a spreadsheet or another office document, not a CSV table"},
		{"SQLite format 3\x00", "a database, not a CSV table"},
		{"PAR1\x15", "a Parquet table, not a CSV table"},
		{"%PDF-", "a PDF document, not a CSV table"},
		{"<!DOCTYPE", "a web page or another marked-up document, not a CSV table"},
		{"<?xml", "a web page or another marked-up document, not a CSV table"},
		{"<html", "a web page or another marked-up document, not a CSV table"},
		{"\xff\xfe\x00\x00", "UTF-32 text, which is not read"},
		{"\x00\x00\xfe\xff", "UTF-32 text, which is not read"},
	} {
		if bytes.HasPrefix(head, []byte(known.mark)) {
			return "the file is " + known.what, adviceText
		}
	}
	for _, known := range []struct{ mark, name string }{
		{gzipMark, "gzip twice"}, {"BZh91AY&SY", "bzip2"}, {"\xfd7zXZ\x00", "xz"}, {"\x28\xb5\x2f\xfd", "zstd"}, {"7z\xbc\xaf\x27\x1c", "7z"},
	} {
		if bytes.HasPrefix(head, []byte(known.mark)) {
			return "the file is compressed with " + known.name, "unpack it, or compress it with gzip"
		}
	}
	if utf16Order(head) == nil && bytes.IndexByte(head, 0) >= 0 {
		return "the file holds NUL bytes, so it is not text", adviceText
	}
	return "", ""
}

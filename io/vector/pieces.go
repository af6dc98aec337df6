package vector

import (
	"bufio"
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
)

const (
	// maxFeature bounds what is held of a stream at a time: a feature, or the members of a text around its features.
	maxFeature = 64 << 20
	// recordSeparator stands before each text of a sequence (RFC 8142 section 2, after RFC 7464).
	recordSeparator = 0x1e
)

// pieces cuts a stream of JSON texts into values, so that one of them is in memory at a time. Where a value ends is
// seen from its braces, brackets and quotes alone; what it then holds is known to be valid JSON.
type pieces struct {
	in      *bufio.Reader
	source  string
	line    int    // the line at which the stream stands, from 1
	feature int    // the feature being read, from 1; 0 outside of features
	limit   int    // bytes that a feature may take
	left    int    // bytes that the feature at hand may still take
	text    []byte // the value read last
}

// newPieces looks at the start of r and refuses what is not UTF-8 text.
func newPieces(r io.Reader, source string, limit int) (*pieces, error) {
	p := &pieces{in: bufio.NewReaderSize(r, 1<<16), source: source, line: 1, limit: limit, left: limit}
	head, err := p.in.Peek(3)
	if err != nil && err != io.EOF && len(head) == 0 {
		return nil, p.unreadable(err)
	}
	starts := func(mark string) bool { return bytes.HasPrefix(head, []byte(mark)) }
	switch {
	case len(head) == 0:
		return nil, &Error{File: source, What: "the file is empty", Advice: adviceWhole}
	case starts("\xff\xfe"), starts("\xfe\xff"), len(head) > 1 && (head[0] == 0) != (head[1] == 0):
		return nil, &Error{File: source, What: "the file is UTF-16 text, and only UTF-8 is read", Advice: "save the file in UTF-8"}
	case starts("\x1f\x8b"):
		return nil, &Error{File: source, What: "the file is compressed with gzip", Advice: "unpack it first"}
	case starts("PK"):
		return nil, &Error{File: source, What: "the file is a zip archive", Advice: "unpack it first, and give a GeoJSON file"}
	case starts("\xef\xbb\xbf"):
		p.in.Discard(3) // cannot fail: the bytes are in the buffer
	}
	return p, nil
}

// refuse places what is wrong at a line, in the feature being read.
func (p *pieces) refuse(line int, advice, format string, args ...any) *Error {
	return &Error{File: p.source, Line: line, Feature: p.feature, What: fmt.Sprintf(format, args...), Advice: advice}
}

func (p *pieces) unreadable(err error) *Error {
	return &Error{File: p.source, What: "cannot be read: " + err.Error(), Cause: err}
}

// peek passes over blanks and returns the byte that comes next, which stays; 0 and io.EOF at the end. Between texts it
// passes over record separators too.
func (p *pieces) peek(between bool) (byte, error) {
	for {
		c, err := p.in.ReadByte()
		switch {
		case err == io.EOF:
			return 0, io.EOF
		case err != nil:
			return 0, p.unreadable(err)
		case c == '\n':
			if p.line++; p.line > math.MaxInt32 {
				return 0, p.refuse(0, adviceWhole, "the file has more lines than can be counted")
			}
		case isBlank(c), between && c == recordSeparator:
		default:
			p.in.UnreadByte() // cannot fail: a byte was read
			return c, nil
		}
	}
}

func isBlank(c byte) bool { return c == ' ' || c == '\t' || c == '\r' || c == '\n' }

// take steps over a byte, and blanks before it, if it comes next.
func (p *pieces) take(want byte) (bool, error) {
	c, err := p.peek(false)
	if err == io.EOF {
		return false, p.endsEarly(p.line)
	}
	if err != nil || c != want {
		return false, err
	}
	p.in.ReadByte()
	return true, nil
}

// expect steps over a byte that must come next.
func (p *pieces) expect(want byte) error {
	took, err := p.take(want)
	if err != nil || took {
		return err
	}
	c, _ := p.peek(false)
	return p.refuse(p.line, adviceWhole, "not JSON: %q was expected, and %q stands there", want, rune(c))
}

func (p *pieces) endsEarly(line int) *Error {
	return p.refuse(line, adviceWhole, "the file ends before what starts here does")
}

// value reads the value that comes next and returns it with the line on which it starts. The text is valid JSON and
// good until the next call.
func (p *pieces) value() ([]byte, int, error) {
	c, err := p.peek(false)
	if err == io.EOF {
		return nil, 0, p.endsEarly(p.line)
	}
	if err != nil {
		return nil, 0, err
	}
	start := p.line
	p.text = p.text[:0]
	if err := p.cut(c, start); err != nil {
		return nil, 0, err
	}
	return p.text, start, p.check(start)
}

// cut copies the value that starts with c into text.
func (p *pieces) cut(first byte, start int) error {
	nested, text := first == '{' || first == '[', first == '"'
	depth, quoted, escaped := 0, false, false
	for {
		c, err := p.in.ReadByte()
		switch {
		case err == io.EOF && !nested && !text && len(p.text) > 0:
			return nil
		case err == io.EOF:
			return p.endsEarly(start)
		case err != nil:
			return p.unreadable(err)
		case c == recordSeparator:
			return p.refuse(start, adviceWhole, "is cut short: a record separator comes before its end")
		case !nested && !text && (isBlank(c) || c == ',' || c == ':' || c == ']' || c == '}'):
			p.in.UnreadByte()
			if len(p.text) == 0 {
				return p.refuse(p.line, adviceWhole, "not JSON: a value was expected, and %q stands there", rune(c))
			}
			return nil
		}
		if p.left--; p.left < 0 {
			return p.refuse(start, "check that every brace and bracket is closed, or simplify the outlines",
				"takes more than %d bytes, the most that is read of one feature", p.limit)
		}
		p.text = append(p.text, c)
		switch {
		case c == '\n':
			p.line++
		case escaped:
			escaped = false
			continue
		case quoted && c == '\\':
			escaped = true
		case c == '"':
			quoted = !quoted
			if text && !quoted {
				return nil
			}
		case quoted:
		case c == '{' || c == '[':
			if depth++; depth > maxDepth {
				return p.refuse(p.line, adviceFeatures, "nested more than %d deep", maxDepth)
			}
		case c == '}' || c == ']':
			if depth--; depth == 0 && nested {
				return nil
			}
		}
	}
}

// check makes sure that the value is JSON in UTF-8.
func (p *pieces) check(start int) error {
	if at := firstInvalid(p.text); at >= 0 {
		return p.refuse(start+bytes.Count(p.text[:at], []byte{'\n'}), "save the file in UTF-8", "the text is not UTF-8")
	}
	if json.Valid(p.text) {
		return nil
	}
	var syntax *json.SyntaxError
	err := json.Unmarshal(p.text, &struct{}{})
	if !errors.As(err, &syntax) {
		return p.refuse(start, adviceWhole, "not JSON")
	}
	e := p.refuse(start-1+lineOf(p.text, int(syntax.Offset)-1), adviceWhole, "not JSON: %s", syntax)
	e.Cause = err
	return e
}

// walk calls each for the members of an object that is known to be valid JSON, in the order of the text. Keys and
// values are as they stand there, quotes included.
func walk(object []byte, each func(key, value []byte) error) error {
	w := walker{text: object}
	w.blanks()
	w.at++ // the brace
	for w.blanks(); w.text[w.at] != '}'; w.blanks() {
		key := w.value()
		w.blanks()
		w.at++ // the colon
		if err := each(key, w.value()); err != nil {
			return err
		}
		if w.blanks(); w.text[w.at] == ',' {
			w.at++
		}
	}
	return nil
}

// walker steps through text that is known to be valid JSON.
type walker struct {
	text []byte
	at   int
}

func (w *walker) blanks() {
	for isBlank(w.text[w.at]) {
		w.at++
	}
}

// value steps over a value and returns it.
func (w *walker) value() []byte {
	w.blanks()
	start, depth, quoted := w.at, 0, false
	for ; w.at < len(w.text); w.at++ {
		switch c := w.text[w.at]; {
		case quoted && c == '\\':
			w.at++
		case c == '"':
			quoted = !quoted
		case quoted:
		case c == '{' || c == '[':
			depth++
		case (c == '}' || c == ']') && depth > 0:
			depth--
		case depth == 0 && (c == ',' || c == ':' || c == '}' || c == ']' || isBlank(c)):
			return w.text[start:w.at]
		}
	}
	return w.text[start:]
}

// unquote returns the text of a string that is valid JSON.
func unquote(raw []byte) []byte {
	inner := raw[1 : len(raw)-1]
	if bytes.IndexByte(inner, '\\') < 0 {
		return inner
	}
	var s string
	json.Unmarshal(raw, &s) // cannot fail: the text is valid, and escapes that pair with nothing become U+FFFD
	return []byte(s)
}

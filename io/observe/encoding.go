package observe

import (
	"bufio"
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"unicode/utf16"
	"unicode/utf8"

	"golang.org/x/text/encoding/charmap"
)

// Names of the encodings that are read.
const (
	utf8Text    = "UTF-8"
	utf16Little = "UTF-16 LE"
	utf16Big    = "UTF-16 BE"
	windows1252 = "Windows-1252"
)

const utf8Mark = "\xef\xbb\xbf"

// decoder gives a text in UTF-8. What is no character of the encoding becomes a byte that is no UTF-8, for the row and
// the column in which it stands to be told.
type decoder struct {
	from   *bufio.Reader // its errors last
	source string
	name   string     // of the encoding; empty as long as all is ASCII
	ready  []byte     // converted and not yet read
	buffer [4096]byte // under ready

	line  int   // of the next byte, while the text is ASCII or Windows-1252
	other other // the first byte that is no UTF-8
	err   error // the text is in two encodings
}

// other is a byte that is no UTF-8.
type other struct {
	line int
	byte byte
}

// decode returns the text of which head is the start, standing behind its byte order mark.
func decode(from *bufio.Reader, head []byte, source string) *decoder {
	d := &decoder{from: from, source: source, line: 1}
	mark := 0
	switch order := utf16Order(head); {
	case bytes.HasPrefix(head, []byte(utf8Mark)):
		d.name, mark = utf8Text, len(utf8Mark)
	case order == binary.LittleEndian:
		d.name = utf16Little
	case order == binary.BigEndian:
		d.name = utf16Big
	}
	if hasUTF16Mark(head) {
		mark = 2
	}
	from.Discard(mark) // cannot fail: the bytes are in the buffer
	return d
}

func hasUTF16Mark(head []byte) bool {
	return bytes.HasPrefix(head, []byte("\xff\xfe")) || bytes.HasPrefix(head, []byte("\xfe\xff"))
}

// utf16Order returns the order of the bytes if a file starts as UTF-16: with a byte order mark, or with a character
// of Latin-1 in a text most of whose zeros stand on the same side. It returns nil for other files.
func utf16Order(head []byte) binary.ByteOrder {
	switch {
	case bytes.HasPrefix(head, []byte("\xff\xfe")):
		return binary.LittleEndian
	case bytes.HasPrefix(head, []byte("\xfe\xff")):
		return binary.BigEndian
	case len(head) < 2 || (head[0] == 0) == (head[1] == 0):
		return nil
	}
	var zeros [2]int
	for i, c := range head {
		if c == 0 {
			zeros[i%2]++
		}
	}
	switch {
	case head[0] == 0 && zeros[0] > 4*zeros[1]:
		return binary.BigEndian
	case head[1] == 0 && zeros[1] > 4*zeros[0]:
		return binary.LittleEndian
	}
	return nil
}

func (d *decoder) encoding() string {
	if d.name == "" {
		return utf8Text
	}
	return d.name
}

// Read gives UTF-8.
func (d *decoder) Read(p []byte) (int, error) {
	for len(d.ready) == 0 {
		if d.err != nil {
			return 0, d.err
		}
		in, err := d.from.Peek(farSight) // no character of any encoding is longer
		if len(in) == 0 {
			return 0, err
		}
		// A byte of the file becomes at most 3 of UTF-8.
		in, _ = d.from.Peek(max(len(in), min(d.from.Buffered(), len(d.buffer)/3)))
		d.from.Discard(d.convert(in))
	}
	n := copy(p, d.ready)
	d.ready = d.ready[n:]
	return n, nil
}

// convert makes ready what it can of the bytes to come, and returns how many it took. A character that is cut off is
// the last of the file.
func (d *decoder) convert(in []byte) int {
	out := d.buffer[:0]
	taken := len(in)
	switch d.name {
	case "":
		if taken = beyondASCII(in); taken == 0 {
			d.name, d.other = beyondIs(in), other{d.line, in[0]}
			return d.convert(in)
		}
		out = append(out, in[:taken]...)
		d.line += bytes.Count(in[:taken], newline)
	case utf8Text:
		out = append(out, in...)
	case windows1252:
		taken = d.beforeUTF8(in)
		out = appendWindows(out, in[:taken])
		d.line += bytes.Count(in[:taken], newline)
	case utf16Little:
		out, taken = appendUTF16(out, in, binary.LittleEndian)
	case utf16Big:
		out, taken = appendUTF16(out, in, binary.BigEndian)
	}
	d.ready = out
	return taken
}

// beyondASCII returns how many bytes stand before the first that is not ASCII.
func beyondASCII(in []byte) int {
	for i, c := range in {
		if c >= utf8.RuneSelf {
			return i
		}
	}
	return len(in)
}

// beyondIs tells the encoding by the first character beyond ASCII.
func beyondIs(in []byte) string {
	if _, size := utf8.DecodeRune(in); size == 1 {
		return windows1252
	}
	return utf8Text
}

// errTwoEncodings is the cause of a refusal of text in two encodings.
var errTwoEncodings = errors.New("text in two encodings")

// beforeUTF8 returns how many bytes of text in Windows-1252 stand before the first character that was meant as UTF-8, or
// before one that cannot be told yet. Such a character ends the text: in a table of which some rows were written in another
// encoding, names would look alike and differ.
func (d *decoder) beforeUTF8(in []byte) int {
	for i, c := range in {
		switch {
		case c < utf8.RuneSelf:
		case i > 0 && len(in)-i < farSight:
			return i
		case isUTF8(in[i:]):
			r, _ := utf8.DecodeRune(in[i:])
			d.err = &Error{File: d.source, Cause: errTwoEncodings, Advice: "save the whole file in one encoding, UTF-8 for preference",
				What: fmt.Sprintf("the file is in two encodings: %q on line %d is UTF-8, and the byte %X on line %d is not",
					string(r), d.line+bytes.Count(in[:i], newline), d.other.byte, d.other.line)}
			return i
		}
	}
	return len(in)
}

// farSight is how many bytes isUTF8 looks at.
const farSight = 2 * utf8.UTFMax

// isUTF8 reports whether text said to be in Windows-1252 starts with a character that was meant as UTF-8: one that
// Windows-1252 has too, or one with another of UTF-8 behind it. Real text in Windows-1252 hardly ever has these: "Ã" would
// have to stand before a sign such as "©". Other sequences that happen to be UTF-8 are met, as in "Straß”".
func isUTF8(in []byte) bool {
	r, size := utf8.DecodeRune(in)
	if size == 1 {
		return false
	}
	if _, has := charmap.Windows1252.EncodeRune(r); has {
		return true
	}
	_, next := utf8.DecodeRune(in[size:])
	return next > 1
}

// appendWindows appends text in Windows-1252. The five bytes that mean nothing there stay as they are.
func appendWindows(out, in []byte) []byte {
	for _, c := range in {
		if r := charmap.Windows1252.DecodeByte(c); r != utf8.RuneError {
			out = utf8.AppendRune(out, r)
		} else {
			out = append(out, c)
		}
	}
	return out
}

// appendUTF16 appends text in UTF-16 and returns how many bytes it took: all but half a character at the end, if
// that is not all there is.
func appendUTF16(out, in []byte, order binary.ByteOrder) ([]byte, int) {
	at := 0
	for at+1 < len(in) {
		r, size := rune(order.Uint16(in[at:])), 2
		if utf16.IsSurrogate(r) {
			whole := at+3 < len(in)
			if !whole && at > 0 {
				break
			}
			r = noCharacter
			if whole {
				if both := utf16.DecodeRune(rune(order.Uint16(in[at:])), rune(order.Uint16(in[at+2:]))); both != utf8.RuneError {
					r, size = both, 4
				}
			}
		}
		out = appendCharacter(out, r)
		at += size
	}
	if len(in) == 1 {
		return appendCharacter(out, noCharacter), 1
	}
	return out, at
}

// noCharacter stands for what is no character of an encoding.
const noCharacter = -1

// appendCharacter appends a character in UTF-8, and for none a byte that never stands in UTF-8.
func appendCharacter(out []byte, r rune) []byte {
	if r == noCharacter {
		return append(out, 0xff)
	}
	return utf8.AppendRune(out, r)
}

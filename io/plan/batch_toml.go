package plan

import (
	"bytes"
	"errors"
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2/unstable"
)

// isText refuses what is no text at all.
func (r *planReader) isText() error {
	const advice = "save the plan as plain text in UTF-8"
	if len(r.text) > LargestPlan {
		return r.batch.fault(place{}, "", "is larger than 64 MiB", "give regions their words by [defaults], and find their files with [regions]")
	}
	if nul := bytes.IndexByte(r.text, 0); nul >= 0 {
		return r.fault(nul, "", "is not text: there is a byte of 0", advice)
	}
	if utf8.Valid(r.text) {
		return nil
	}
	return r.fault(letters(r.text), "", "is not text in UTF-8", advice)
}

// letters is how many bytes of text are UTF-8 before the first that is not.
func letters(text []byte) int {
	at := 0
	for at < len(text) {
		letter, size := utf8.DecodeRune(text[at:])
		if letter == utf8.RuneError && size == 1 {
			break
		}
		at += size
	}
	return at
}

// notTOML words what the parser could not read.
func (r *planReader) notTOML(err error) error {
	var fault *unstable.ParserError
	if !errors.As(err, &fault) {
		return r.batch.fault(place{}, "", "cannot be read as TOML: "+err.Error(), "")
	}
	offset := int(r.parser.Range(fault.Highlight).Offset)
	for !utf8.RuneStart(r.text[offset]) { // the last byte stands for the end of the text
		offset--
	}
	return r.fault(offset, "", "cannot be read as TOML: "+r.wholeLetter(fault.Message, offset), r.adviceAt(offset, fault.Message))
}

// wholeLetter puts the letter that stands at the offset where a message has its first byte for one.
func (r *planReader) wholeLetter(message string, offset int) string {
	letter, size := utf8.DecodeRune(r.text[offset:])
	if size < 2 {
		return message
	}
	return strings.Replace(message, fmt.Sprintf("%#U", r.text[offset]), fmt.Sprintf("%#U", letter), 1)
}

// adviceAt is what to do about the mistakes that are made most: text, names and paths that are not quoted as they should.
func (r *planReader) adviceAt(offset int, message string) string {
	line := r.text[bytes.LastIndexByte(r.text[:offset], '\n')+1 : offset]
	rest, _, _ := bytes.Cut(r.text[offset:], []byte{'\n'})
	_, value, said := bytes.Cut(line, []byte{'='})
	switch {
	case strings.Contains(message, "escape"):
		return `a backslash in text is written twice, or the text stands in single quotes: 'C:\data\plots.csv'`
	case strings.Contains(message, "new lines"), strings.Contains(message, "terminated"):
		return "a closing quote is missing"
	case said && isBare(value) && startsText(rest):
		return `text stands in quotes, as in response = "cases"`
	case !said && bytes.HasPrefix(bytes.TrimSpace(line), []byte{'['}) && bytes.ContainsRune(rest, ']'):
		return `a name of more than letters a to z, digits, - and _ stands in quotes: [region."Upper Vale"]`
	}
	return ""
}

// isBare reports whether the last part of a value, as far as it goes, has no quotes.
func isBare(value []byte) bool {
	return !bytes.ContainsAny(value[bytes.LastIndexAny(value, "[,")+1:], `"'`)
}

// startsText reports whether what stands here can only be meant as text: a letter or a sign of paths.
func startsText(text []byte) bool {
	first, _ := utf8.DecodeRune(text)
	return unicode.IsLetter(first) || strings.ContainsRune(`./\*~_`, first)
}

package observe

import (
	"bytes"
	"fmt"
	"slices"
	"strings"
)

// row is a record among the first of a table.
type row struct {
	line   int
	fields []string
}

// mostFirst is how many records are looked at beforehand.
const mostFirst = 10

// start returns the first records of a text that are not empty, as far as they can be read.
func (o *origin) start(head []byte, separator rune) (first []row) {
	in := newCSV(bytes.NewReader(head), separator)
	for len(first) < mostFirst {
		fields, err := in.Read()
		if err != nil {
			break
		}
		if line, _ := in.FieldPos(0); !isEmpty(fields) {
			first = append(first, row{line, slices.Clone(fields)})
		}
	}
	if o.announced && len(first) > 0 {
		first = first[1:]
	}
	return first
}

// isEmpty reports whether a record is passed over as a blank line is: nothing but blanks stands in it, or the end-of-file
// mark of old systems.
func isEmpty(fields []string) bool {
	const endOfFile = "\x1a"
	for _, s := range fields {
		if s = strings.TrimSpace(s); s != "" && (s != endOfFile || len(fields) > 1) {
			return false
		}
	}
	return true
}

// titleAbove refuses a table whose first line is no line of names, but has one below it.
func (o *origin) titleAbove(head []byte) error {
	if len(o.first) == 0 {
		return nil
	}
	names := namesBelow(o.first)
	if names == 0 && written(o.first[0].fields) == 1 && o.format.Separator == 0 && !o.announced {
		for _, separator := range found {
			if names = namesBelow(o.start(head, separator)); names > 0 {
				break
			}
		}
	}
	if names == 0 {
		return nil
	}
	return &Error{File: o.source, Line: o.first[0].line, Advice: "take out the lines above the names of the columns",
		What: fmt.Sprintf("it looks like a title, and the names of the columns seem to stand on line %d", names)}
}

// namesBelow returns the line of names below a title: the first line with more than one field, where all of the first
// record is one field, or a comment of fewer fields. It is 0 if there is no such line, or if there are numbers in it.
func namesBelow(first []row) int {
	for i, r := range first {
		if i == 0 || written(r.fields) < 2 {
			continue
		}
		title := first[0].fields
		comment := strings.HasPrefix(title[0], "#") && len(title) < len(r.fields)
		if !comment && written(title) > 1 || slices.ContainsFunc(r.fields, looksLikeNumber) {
			return 0
		}
		return r.line
	}
	return 0
}

// written counts the fields that are not blank.
func written(fields []string) (n int) {
	for _, s := range fields {
		if strings.TrimSpace(s) != "" {
			n++
		}
	}
	return n
}

// looksLikeNumber reports whether a field is a number as tables have them, with a unit or without.
func looksLikeNumber(s string) bool {
	s = strings.TrimSpace(s)
	_, fault := parseDecimal(s)
	withUnit := s != "" && isDigits(s[:1]) && unitOf(s, &Format{}) != "" // "pm10" is a name
	return fault == "" || hasDecimalComma(s) || grouped(s) || withUnit
}

package observe

import (
	"cmp"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
)

// header is the line of names and where the request found its columns in it.
type header struct {
	source string
	line   int
	names  []string
	origin *origin

	shapes  *shapes // of the features that are the rows; nil for a table in columns
	ids     bool    // a column "id" that is not there is the identifier of features
	heights bool    // a column "z" that is not there is the third coordinate of points
}

// shapes is what a source says of the geometries that its rows have by themselves.
type shapes struct {
	crs string // authority and code; empty where it says nothing
}

// readHeader reads the names.
func readHeader(in *text, source string) (header, error) {
	announced := in.origin.announced
	for {
		record, err := in.Read()
		switch {
		case err == io.EOF:
			return header{}, in.origin.noHeader()
		case err != nil:
			return header{}, readError(source, err)
		case isEmpty(record):
		case announced:
			announced = false
		default:
			line, _ := in.FieldPos(0)
			return newHeader(record, line, in.origin)
		}
	}
}

// noHeader says that a text has no line of names.
func (o *origin) noHeader() error {
	e := &Error{File: o.source, What: "the file is empty", Advice: adviceWhole}
	switch {
	case o.announced:
		e.What = "nothing stands below the line that names the separator"
	case o.blank:
		e.What = "the file holds only blank lines"
	}
	return e
}

// noRows says that nothing stands below the header.
func (h header) noRows() error {
	return &Error{File: h.source, Line: h.line, What: "no rows stand below the header", Advice: adviceWhole}
}

// newHeader takes the names from the first record, which starts on the given line. Blank names are let pass:
// spreadsheets leave them, and nobody can ask for one.
func newHeader(record []string, line int, from *origin) (header, error) {
	source := from.source
	h := header{source: source, line: line, names: make([]string, len(record)), origin: from}
	if areNumbers(record) {
		return header{}, &Error{File: source, Line: line, What: "numbers stand where the names of the columns should be, so the line of names is missing",
			Advice: "put a line with the names of the columns above the rows"}
	}
	first := map[string]int{}
	for i, field := range record {
		name := strings.TrimSpace(field)
		if !clean(name) {
			return header{}, &Error{File: source, Line: line, What: fmt.Sprintf("the name of column %d is %s", i+1, from.notText(name)), Advice: adviceText}
		}
		if at, seen := first[name]; seen && name != "" {
			return header{}, &Error{File: source, Line: line, Column: name, Advice: "give each column a name of its own",
				What: fmt.Sprintf("the name appears twice, as columns %d and %d", at+1, i+1)}
		}
		first[name] = i
		h.names[i] = strings.Clone(name)
	}
	return h, nil
}

// areNumbers reports whether a record is numbers alone, some of them with a unit perhaps, and not names.
func areNumbers(record []string) bool {
	plain := false
	for _, s := range record {
		if s = strings.TrimSpace(s); s == "" {
			continue
		}
		if !looksLikeNumber(s) {
			return false
		}
		_, fault := parseDecimal(s)
		plain = plain || fault == "" || hasDecimalComma(s)
	}
	return plain
}

// checkRecord refuses records of the wrong length and fields that are not text, whether or not they are asked for.
func (h header) checkRecord(record []string, here Error) error {
	if len(record) != len(h.names) {
		return here.because(fmt.Sprintf("%s where the header has %d", several(len(record), "field"), len(h.names)), h.adviceLength(record))
	}
	if here.Line > math.MaxInt32 {
		return here.because("the file has more lines than can be counted", "")
	}
	for i, s := range record {
		if !clean(s) {
			return h.notClean(h.names[i], s, here)
		}
	}
	return nil
}

// adviceLength says what to do about a record of the wrong length.
func (h header) adviceLength(record []string) string {
	separator := separatorWord(h.origin.separator)
	if slices.ContainsFunc(record, func(s string) bool { return !clean(s) }) {
		return "bytes that are no text stand on the line: the file may be damaged from there on, or something else is appended to it"
	}
	if len(record) == 1 {
		count := outsideQuotes([]byte(record[0]))
		for _, c := range found {
			if c != h.origin.separator && count[c] == len(h.names)-1 && count[c] > 0 {
				return fmt.Sprintf("the line has a %s where the others have a %s: separate all columns in one way", separatorWord(c), separator)
			}
		}
	}
	return fmt.Sprintf("check the line for a missing %s, or for one that belongs inside quotes", separator)
}

// notClean refuses a field that is not text.
func (h header) notClean(name, s string, here Error) error {
	here.Column, here.Value = name, shorten(s)
	advice := adviceText
	if h.origin.features {
		advice = "correct the property, or leave it out"
	}
	return here.because(fmt.Sprintf("%q is %s", here.Value, h.origin.notText(s)), advice)
}

// The columns that features have beside their properties, and heightName that of points in a column of geometries, where
// no other is called so.
const (
	idName     = "id" // their identifier
	heightName = "z"  // the third coordinate
)

// columns returns the names that a user is told of.
func (h header) columns() []string {
	names := slices.Clone(h.names)
	if h.ids && !slices.Contains(names, idName) {
		names = append(names, idName)
	}
	if h.shapes != nil && h.heights && !slices.Contains(names, heightName) {
		names = append(names, heightName)
	}
	return names
}

// find returns the position of a column, which must exist, or atID or atHeight.
func (h header) find(name, part string) (int, error) {
	for i, n := range h.names {
		if n == name {
			return i, nil
		}
	}
	switch {
	case h.ids && name == idName:
		return atID, nil
	case h.heights && name == heightName:
		return atHeight, nil
	}
	return 0, h.absent(name, part)
}

// among returns those of names that are columns.
func (h header) among(names []string) (there []string) {
	for _, name := range names {
		if slices.Contains(h.columns(), name) {
			there = append(there, name)
		}
	}
	return there
}

// adviceUnseparated says what to do about a header that is one name, but looks like several; "" for any other.
func (h header) adviceUnseparated() string {
	if len(h.names) != 1 || h.origin.features {
		return ""
	}
	count := outsideQuotes([]byte(h.names[0]))
	for _, c := range found {
		if count[c] > 0 {
			return fmt.Sprintf("the header has no %s, but a %s: name that with --separator, or leave out --separator", separatorWord(h.origin.separator), separatorWord(c))
		}
	}
	if len(strings.Fields(h.names[0])) > 1 {
		return fmt.Sprintf("the header has no %s: columns of fixed width are not read, so put commas between them", separatorWord(h.origin.separator))
	}
	return ""
}

// columnList lists the columns for a message.
func (h header) columnList() string {
	names := h.columns()
	switch {
	case len(names) > 0:
		return columnList(names)
	case h.origin.features:
		return "the features have no properties"
	}
	return "there are no columns"
}

// absent says that there is no such column, with the nearest name and the list of those there are.
func (h header) absent(name, part string) error {
	advice := cmp.Or(h.adviceUnseparated(), h.columnList())
	if near := nearest(name, h.columns()); near != "" {
		advice = fmt.Sprintf("did you mean %q? %s", near, advice)
	}
	return &Error{File: h.source, Line: h.line, What: fmt.Sprintf("no column %q for %s", name, part), Advice: advice}
}
